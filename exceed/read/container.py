"""The bytes of a log: what packs them, how their letters are coded, and one bounded stream of UTF-8 out of them."""

from __future__ import annotations

import bz2
import codecs
import hashlib
import io
import lzma
import os
import re
import threading
import zipfile
import zlib
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import IO, Any

from exceed.errors import LogError, Problem

HEAD_BYTES = 256 * 1024
CHUNK = 1 << 20
# beyond these a packed file is taken for a trap, not for a log: flight logs pack 3 to 40 times
MOST_UNPACKED = 16 << 30
MOST_RATIO = 250
RATIO_FROM = 128 << 20

PACKED = {b"\x1f\x8b": "gzip", b"BZh": "bz2", b"\x28\xb5\x2f\xfd": "zstd", b"\xfd7zXZ\x00": "xz", b"PK\x03\x04": "zip"}
PARQUET_MAGIC = b"PAR1"


@dataclass(frozen=True, slots=True)
class Source:
    """A log's bytes, not yet read. `shown` is the path that outputs print; `head` the first block, unpacked."""

    location: str
    shown: str
    packed: str
    encoding: str
    bom: int
    head: bytes
    whole: bool
    size: int
    parquet: bool = False

    @property
    def direct(self) -> bool:
        """Can the parser take the file's own bytes?"""
        return not self.packed and self.encoding == "utf-8" and not is_uri(self.location)

    @property
    def text(self) -> str:
        """The first block as text."""
        decoder = codecs.getincrementaldecoder(self.encoding)(errors="replace")
        return decoder.decode(self.head[self.bom :], final=self.whole)


def is_uri(location: str) -> bool:
    """An object store's address (a Windows drive letter is none)."""
    return bool(re.match(r"[a-z][a-z0-9+]+://", location))


def fail(shown: str, problem: str, expected: str = "", do: str = "") -> LogError:
    """A log that cannot be read, as the one error of this room."""
    return LogError(Problem(shown, problem, expected, do))


def raw(location: str, shown: str) -> IO[bytes]:
    """The file's own bytes, from disk or an object store."""
    if is_uri(location):
        import pyarrow as pa
        import pyarrow.fs as fs

        try:
            system, path = fs.FileSystem.from_uri(location)
            return system.open_input_file(path)  # type: ignore[no-any-return]
        except (pa.ArrowException, OSError, ValueError) as error:
            raise fail(
                shown, f"cannot be opened: {_plain(error)}", do="check the address and the access rights"
            ) from error
    try:
        return open(location, "rb")
    except FileNotFoundError as error:
        raise fail(shown, "there is no such file", do="check the path") from error
    except IsADirectoryError as error:
        raise fail(shown, "is a folder, not a file", do="give the folder's path to scan the logs inside it") from error
    except OSError as error:
        raise fail(shown, f"cannot be opened: {_plain(error)}", do="check that you may read the file") from error


def _plain(error: BaseException) -> str:
    text = getattr(error, "strerror", None) or str(error) or type(error).__name__
    return " ".join(str(text).split())[:200]


def open_source(location: str, shown: str | None = None, most: int = HEAD_BYTES) -> Source:
    """Look at the first `most` bytes of a file, unpacked. Raises LogError for what cannot be a log."""
    shown = shown or location
    if not is_uri(location):
        path = Path(location)
        if path.exists() and not path.is_file():
            kind = "a folder" if path.is_dir() else "not a regular file"
            raise fail(shown, f"is {kind}", expected="a log file", do="give the path of a log")
    try:
        with raw(location, shown) as stream:
            first = stream.read(16)
            stream.seek(0, os.SEEK_END)
            size = stream.tell()
    except OSError as error:  # a card that is wearing out opens, and fails to read
        raise fail(
            shown, f"cannot be read: {_plain(error)}", "a readable file", "copy the log from the recorder again"
        ) from error
    if size == 0:
        raise fail(shown, "is empty", expected="a CSV or Parquet log", do="copy the log from the recorder again")
    if first.startswith(PARQUET_MAGIC):
        return Source(location, shown, "", "utf-8", 0, b"", False, size, parquet=True)
    packed = next((name for magic, name in PACKED.items() if first.startswith(magic)), "")
    pieces, length = [], 0
    whole = True
    cut: list[str] = []
    for piece in unpacked(location, shown, packed, size, cut=cut):
        pieces.append(piece)
        length += len(piece)
        if length >= most:
            whole = False
            break
    head = b"".join(pieces)
    if len(head) > most:
        head, whole = head[:most], False
    if cut and not head:
        raise fail(shown, cut[0], expected="a whole file", do="copy the log from the recorder again")
    if not head.strip(b"\x00\r\n\t \xef\xbb\xbf"):
        raise fail(shown, "holds no text", expected="a CSV or Parquet log", do="copy the log from the recorder again")
    if head.startswith(PARQUET_MAGIC):
        raise fail(shown, "is a packed Parquet file", expected="a Parquet file as it is", do="unpack it first")
    encoding, bom = _encoding(head, shown)
    return Source(location, shown, packed, encoding, bom, head, whole, size)


def _encoding(head: bytes, shown: str) -> tuple[str, int]:
    for mark, name in (
        (codecs.BOM_UTF8, "utf-8"),
        (codecs.BOM_UTF32_LE, "utf-32-le"),
        (codecs.BOM_UTF16_LE, "utf-16-le"),
        (codecs.BOM_UTF16_BE, "utf-16-be"),
    ):
        if head.startswith(mark):
            return name, len(mark)
    block = head[:8192]
    zeros = block.count(0)
    if zeros:
        even, odd = block[0::2].count(0), block[1::2].count(0)
        half = len(block) / 2
        if odd > 0.7 * half and even < 0.05 * half:
            return "utf-16-le", 0
        if even > 0.7 * half and odd < 0.05 * half:
            return "utf-16-be", 0
    odd_bytes = zeros + sum(block.count(code) for code in (*range(1, 9), *range(14, 27), *range(28, 32)))
    if odd_bytes > 0.02 * len(block):
        raise fail(
            shown,
            "is not text: it looks like a binary recording",
            expected="CSV or Parquet",
            do="export the log as CSV with the recorder's own program",
        )
    try:
        codecs.getincrementaldecoder("utf-8")().decode(head)
    except UnicodeDecodeError:
        return "cp1252", 0
    return "utf-8", 0


def unpacked(
    location: str,
    shown: str,
    packed: str,
    size: int,
    seen: Callable[[bytes], None] | None = None,
    cut: list[str] | None = None,
) -> Iterator[bytes]:
    """The unpacked bytes in pieces, bounded. `seen` gets the file's own bytes; `cut` a note if the end is missing."""
    total = 0
    for piece in _pieces(location, shown, packed, seen, cut if cut is not None else []):
        total += len(piece)
        if total > MOST_UNPACKED or (total > RATIO_FROM and total > MOST_RATIO * max(size, 1)):
            raise fail(
                shown,
                f"unpacks to more than {total // (1 << 20)} MB from {size} bytes, which no log does",
                expected=f"at most {MOST_RATIO} times its size",
                do="unpack it by hand and look at it, if you trust it",
            )
        yield piece


def _pieces(
    location: str, shown: str, packed: str, seen: Callable[[bytes], None] | None, cut: list[str]
) -> Iterator[bytes]:
    broken = (zlib.error, OSError, lzma.LZMAError, EOFError, zipfile.BadZipFile, NotImplementedError, RuntimeError)
    started = False
    try:
        for piece in _decoder(packed)(location, shown, seen, cut):
            if piece:
                started = True
                yield piece
    except LogError:
        raise
    except broken as error:
        if not started:
            raise fail(
                shown,
                f"cannot be unpacked ({packed}): {_plain(error)}" if packed else f"cannot be read: {_plain(error)}",
                do="copy the log from the recorder again",
            ) from error
        # what came before the damage stands; the damage is said
        cut.append(f"the packed file is damaged or cut short ({_plain(error)}): what follows could not be read")


def _decoder(packed: str) -> Callable[[str, str, Callable[[bytes], None] | None, list[str]], Iterator[bytes]]:
    return {"": _as_is, "gzip": _stepwise, "bz2": _stepwise, "xz": _stepwise, "zstd": _zstd, "zip": _zip}[packed]


def _as_is(location: str, shown: str, seen: Callable[[bytes], None] | None, cut: list[str]) -> Iterator[bytes]:
    with raw(location, shown) as stream:
        while piece := stream.read(CHUNK):
            if seen:
                seen(piece)
            yield piece


def _stepwise(location: str, shown: str, seen: Callable[[bytes], None] | None, cut: list[str]) -> Iterator[bytes]:
    """gzip, bz2 and xz, members one after the other, never more than a chunk unpacked at a time."""
    with raw(location, shown) as stream:
        magic = stream.read(2)
        stream.seek(0)
        gzipped = magic == b"\x1f\x8b"
        make: Callable[[], Any] = (
            (lambda: zlib.decompressobj(31))
            if gzipped
            else bz2.BZ2Decompressor
            if magic == b"BZ"
            else lzma.LZMADecompressor
        )
        engine = make()
        fresh = True
        while block := stream.read(CHUNK):
            if seen:
                seen(block)
            rest = block
            while rest or (not gzipped and not engine.eof and not engine.needs_input):
                out = engine.decompress(rest, CHUNK)
                fresh = False
                yield out
                rest = engine.unconsumed_tail if gzipped else b""
                if engine.eof:
                    rest = engine.unused_data.lstrip(b"\x00")
                    engine, fresh = make(), True
                elif gzipped and not rest and not out:
                    break
        if not fresh and not engine.eof:
            if gzipped:
                yield engine.flush()
            cut.append("the packed file is cut short: what follows could not be read")


def _zstd(location: str, shown: str, seen: Callable[[bytes], None] | None, cut: list[str]) -> Iterator[bytes]:
    import pyarrow as pa

    if seen:
        for block in _as_is(location, shown, seen, cut):
            del block
    with raw(location, shown) as stream, pa.CompressedInputStream(pa.PythonFile(stream, mode="r"), "zstd") as inner:
        while piece := inner.read(CHUNK):
            yield piece


def _zip(location: str, shown: str, seen: Callable[[bytes], None] | None, cut: list[str]) -> Iterator[bytes]:
    if seen:
        for block in _as_is(location, shown, seen, cut):
            del block
    with raw(location, shown) as stream, zipfile.ZipFile(stream) as archive:
        members = [
            m
            for m in archive.infolist()
            if not m.is_dir() and not Path(m.filename).name.startswith(".") and "__MACOSX" not in m.filename
        ]
        if len(members) != 1:
            names = ", ".join(sorted(m.filename for m in members)[:4]) or "none"
            raise fail(
                shown,
                f"holds {len(members)} files ({names})",
                expected="a zip file with one log in it",
                do="unpack it into a folder",
            )
        if members[0].flag_bits & 1:
            raise fail(shown, "is locked by a password", expected="an open zip file", do="unpack it first")
        with archive.open(members[0]) as inner:
            while piece := inner.read(CHUNK):
                yield piece


class Utf8Stream(io.RawIOBase):
    """A file-like stream of UTF-8 for the parser: unpacks, recodes, rewrites lines, and hashes on the way."""

    def __init__(
        self,
        source: Source,
        rewrite: Callable[[Iterator[bytes]], Iterator[bytes]] | None = None,
        clean: bool = False,
    ) -> None:
        """`clean`: bytes of a UTF-8 log that are none become marks of replacement."""
        super().__init__()
        self._clean = clean
        self._file_hash = hashlib.sha256()
        self._content_hash = hashlib.sha256()
        self.cut: list[str] = []
        self.error: BaseException | None = None
        pieces = self._recoded(source)
        self._pieces = rewrite(pieces) if rewrite else pieces
        self._rest = b""
        self.tail = b""

    def _recoded(self, source: Source) -> Iterator[bytes]:
        decoder = None
        if source.encoding != "utf-8" or self._clean:
            decoder = codecs.getincrementaldecoder(source.encoding)(errors="replace")
        skip = source.bom
        for piece in unpacked(
            source.location, source.shown, source.packed, source.size, self._file_hash.update, self.cut
        ):
            self._content_hash.update(piece)
            if skip:
                piece, skip = piece[skip:], max(0, skip - len(piece))
            yield decoder.decode(piece).encode("utf-8", "replace") if decoder else piece

    def readable(self) -> bool:
        return True

    def read(self, size: int = -1, /) -> bytes:
        """At least one byte until the end; a short read is normal."""
        out, length = [self._rest], len(self._rest)
        try:
            while size < 0 or length < size:
                piece = next(self._pieces, None)
                if piece is None:
                    break
                out.append(piece)
                length += len(piece)
        except BaseException as error:  # kept: the parser may wrap it in its own
            self.error = error
            raise
        data = b"".join(out)
        if data:
            self.tail = (self.tail + data)[-65536:] if len(data) < 65536 else data[-65536:]
        if size < 0:
            self._rest = b""
            return data
        self._rest = data[size:]
        return data[:size]

    def digests(self) -> tuple[str, str]:
        """SHA-256 of the file's bytes and of the unpacked bytes; reads on to the end first."""
        for piece in self._pieces:
            del piece
        return self._file_hash.hexdigest(), self._content_hash.hexdigest()


class Digest(threading.Thread):
    """SHA-256 of a plain file, beside the parse: hashing lets go of the interpreter's lock."""

    def __init__(self, location: str) -> None:
        super().__init__(daemon=True)
        self._location = location
        self.hexdigest = ""
        self.start()

    def run(self) -> None:
        digest = hashlib.sha256()
        try:
            with open(self._location, "rb", buffering=0) as stream:
                buffer = bytearray(CHUNK)
                view = memoryview(buffer)
                while count := stream.readinto(buffer):
                    digest.update(view[:count])
        except OSError:
            return
        self.hexdigest = digest.hexdigest()

    def result(self) -> str:
        self.join()
        return self.hexdigest
