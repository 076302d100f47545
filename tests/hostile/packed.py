"""Hostile archives: cut, damaged, bombs, names that lead elsewhere."""

from __future__ import annotations

import bz2
import gzip
import io
import lzma
import struct
import zipfile
import zlib
from collections.abc import Callable, Iterator
from pathlib import Path

from hostile.case import HEADING, Case, holding, text


def streamed(pieces: Callable[[], Iterator[bytes]]) -> Callable[[Path], None]:
    """A maker that packs a long stream piece by piece: the unpacked bytes are never together."""

    def make(path: Path) -> None:
        with gzip.open(path, "wb", compresslevel=6) as stream:
            for piece in pieces():
                stream.write(piece)

    return make


def one_long_line() -> Iterator[bytes]:
    """200 MB without a line end, after a good start."""
    yield text().encode()
    for _ in range(200):
        yield b"1" * (1 << 20)


def long_first_line() -> Iterator[bytes]:
    for _ in range(200):
        yield b"a," * (1 << 19)


def zip_of(*members: tuple[str, bytes]) -> bytes:
    box = io.BytesIO()
    with zipfile.ZipFile(box, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, data in members:
            archive.writestr(name, data)
    return box.getvalue()


def zip_with_false_sizes() -> bytes:
    """A zip whose directory claims 4 GB and a false checksum."""
    data = bytearray(zip_of(("log.csv", text().encode())))
    at = data.rindex(b"PK\x01\x02")
    data[at + 16 : at + 20] = b"\xde\xad\xbe\xef"
    data[at + 24 : at + 28] = b"\xff\xff\xff\x7f"
    return bytes(data)


def zip_bomb(path: Path) -> None:
    """160 MB of one row, 300 kB packed."""
    with (
        zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED, compresslevel=6) as archive,
        archive.open("a.csv", "w") as out,
    ):
        out.write((HEADING + "\n").encode())
        block = b"0,1,100,3000\n" * 80_000
        for _ in range(160):
            out.write(block)


def gz_bomb() -> Iterator[bytes]:
    yield (HEADING + "\n").encode()
    block = b"0,1,100,3000\n" * 80_000
    for _ in range(160):
        yield block


def gz_of_zeros() -> Iterator[bytes]:
    for _ in range(160):
        yield bytes(1 << 20)


def gz_many_members(path: Path) -> None:
    """Twenty thousand empty gzip members, then a good one."""
    path.write_bytes(gzip.compress(b"", mtime=0) * 20_000 + gzip.compress(text().encode(), mtime=0))


def gz_long_name(path: Path) -> None:
    """A gzip header whose name field never seems to end."""
    deflate = zlib.compressobj(9, zlib.DEFLATED, -15)
    body = deflate.compress(text().encode()) + deflate.flush()
    tail = struct.pack("<II", zlib.crc32(text().encode()), len(text()))
    path.write_bytes(b"\x1f\x8b\x08\x08\0\0\0\0\0\xff" + b"../../../etc/" * 20_000 + b"\0" + body + tail)


def packed_cases() -> list[Case]:
    good = text().encode()
    gz = gzip.compress(good, mtime=0)
    wrong_sum = bytearray(gz)
    wrong_sum[-8:-4] = b"\0\0\0\0"
    return [
        Case("gz-truncated.csv.gz", holding(gz[: len(gz) // 2]), "done", "cut short"),
        Case("gz-header-only.csv.gz", holding(gz[:10]), "failed", ""),
        Case("gz-two-bytes.csv.gz", holding(gz[:2]), "failed", ""),
        Case("gz-wrong-sum.csv.gz", holding(bytes(wrong_sum)), "failed", "cannot be unpacked"),
        Case("gz-garbage-behind.csv.gz", holding(gz + b"garbage" * 100), "done", ""),
        Case("gz-text.csv.gz", holding(good), "done", ""),
        Case("gz-in-gz.csv.gz", holding(gzip.compress(gz)), "failed", ""),
        Case("gz-of-nothing.csv.gz", holding(gzip.compress(b"")), "failed", ""),
        Case("gz-method-9.csv.gz", holding(gz[:2] + b"\x09" + gz[3:]), "failed", ""),
        Case("gz-members.csv.gz", gz_many_members, "done", ""),
        Case("gz-name.csv.gz", gz_long_name, "done", ""),
        Case("gz-bomb.csv.gz", streamed(gz_bomb), "failed"),
        Case("gz-zeros.csv.gz", streamed(gz_of_zeros), "failed", ""),
        Case("gz-long-line.csv.gz", streamed(one_long_line), "failed", ""),
        Case("gz-long-first-line.csv.gz", streamed(long_first_line), "failed", "no line ends"),
        Case("bz2-truncated.csv.bz2", holding(bz2.compress(good)[:-20]), "failed", ""),
        Case("bz2-damaged.csv.bz2", holding(bz2.compress(good)[:30] + b"\0" * 400), "failed", ""),
        Case("xz-truncated.csv.xz", holding(lzma.compress(good)[:-30]), "done", ""),
        Case("xz-header.csv.xz", holding(lzma.compress(good)[:12]), "failed", ""),
        Case("xz-big-memory.csv.xz", holding(lzma.compress(good, preset=9)), "done", ""),
        Case("zst-header.csv.zst", holding(b"\x28\xb5\x2f\xfd"), "failed", ""),
        Case("zst-garbage.csv.zst", holding(b"\x28\xb5\x2f\xfd" + b"\xff" * 300), "failed", ""),
        Case("zst-window.csv.zst", holding(b"\x28\xb5\x2f\xfd\x00\xff" + b"\0" * 300), "failed", ""),
        Case("zip-two.zip", holding(zip_of(("a.csv", good), ("b.csv", good))), "failed", "holds 2 files"),
        Case("zip-none.zip", holding(zip_of()), "failed", ""),
        Case("zip-path.zip", holding(zip_of(("../../../tmp/exceed-was-here.csv", good))), "done", ""),
        Case("zip-absolute.zip", holding(zip_of(("/tmp/exceed-was-here.csv", good))), "done", ""),
        Case("zip-escape.zip", holding(zip_of(("\x1b[2J\n.csv", good), ("b.csv", good))), "failed", "holds 2 files"),
        Case("zip-in-zip.zip", holding(zip_of(("a.zip", zip_of(("a.csv", good))))), "failed", ""),
        Case("zip-truncated.zip", holding(zip_of(("a.csv", good))[:-30]), "failed", "cannot be unpacked"),
        Case("zip-false-sizes.zip", holding(zip_with_false_sizes()), "failed", "cannot be unpacked"),
        Case("zip-many.zip", holding(zip_of(*((f"f{n}.csv", b"") for n in range(5000)))), "failed", "5000 files"),
        Case("zip-bomb.zip", zip_bomb, "failed"),
    ]
