"""The parser at work: a text log's wanted columns, typed, through pyarrow; a slow second read finds a place."""

from __future__ import annotations

import contextlib
import os
import re
import sys
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from typing import Any

from exceed.read.cells import missing_spellings
from exceed.read.container import Digest, Source, Utf8Stream, fail
from exceed.read.table import Layout, split

BLOCK = 4 << 20


@dataclass(slots=True)
class Parsed:
    """Arrow columns by their place in the file, the digests, and what was said on the way."""

    columns: dict[int, Any]
    rows: int
    sha256: str
    content_sha256: str
    uneven: list[str] = field(default_factory=list)
    uneven_count: int = 0
    cut: list[str] = field(default_factory=list)
    texts: set[int] = field(default_factory=set)
    tail: bytes | None = None
    repeats: int = 0  # headings among the rows
    digest: Digest | None = None

    def digests(self) -> tuple[str, str]:
        """SHA-256 of the file and of its unpacked bytes; waits for the thread that makes them."""
        if self.digest is not None:
            self.sha256 = self.content_sha256 = self.digest.result()
            self.digest = None
        return self.sha256, self.content_sha256


def rewriter(layout: Layout, mend: bool = False) -> Callable[[Iterator[bytes]], Iterator[bytes]] | None:
    """A change of the lines that the parser needs, or None. `mend`: rows that lack or exceed empty cells are evened."""
    even = mend or layout.uneven
    if not layout.squeeze and not even:
        return None
    ends = re.compile(rb"\r\n|\r|\n")
    width, mark, delimiter = layout.width, layout.delimiter.encode(), layout.delimiter

    def lines(pieces: Iterator[bytes]) -> Iterator[bytes]:
        rest = b""
        for piece in pieces:
            block = rest + piece
            held = b""
            if block.endswith(b"\r"):  # its line feed may come with the next piece
                block, held = block[:-1], b"\r"
            parts = ends.split(block)
            rest = parts.pop() + held
            if parts:
                yield b"\n".join(changed(part) for part in parts) + b"\n"
        if rest.endswith(b"\r"):
            yield changed(rest[:-1]) + b"\n"
        elif rest:
            # a line without its end may be cut: it is not filled up, so that it shows
            yield squeezed(rest) if layout.squeeze else rest

    def squeezed(line: bytes) -> bytes:
        return b" ".join(cell for cell in line.split(b" ") if cell)

    def changed(line: bytes) -> bytes:
        if layout.squeeze:
            return squeezed(line)
        if b'"' in line:
            return quoted(line)
        count = line.count(mark) + 1
        if count == width or count == 1:
            return line
        if count < width:
            return line + mark * (width - count)
        cells = line.split(mark)
        return mark.join(cells[:width]) if not any(cell.strip() for cell in cells[width:]) else line

    def quoted(line: bytes) -> bytes:
        cells = split(line.decode("utf-8", "replace"), delimiter)
        if len(cells) == width or len(cells) == 1 or any(cell.strip() for cell in cells[width:]):
            return line
        cells = [*cells[:width], *[""] * (width - len(cells))]
        return delimiter.join('"' + cell.replace('"', '""') + '"' for cell in cells).encode()

    return lines


def mendable(stray: Sequence[str], layout: Layout) -> bool:
    """Is a line that was left out only longer by empty cells?"""
    for text in stray:
        cells = split(text, layout.delimiter)
        if len(cells) > layout.width and not any(cell.strip() for cell in cells[layout.width :]):
            return True
    return False


class _SpoiledError(Exception):
    """There are bytes that are no UTF-8: in a cell, or in a row of another length that arrow then cannot hand over."""


@contextlib.contextmanager
def _unheard(handler: Callable[[Any], str]) -> Iterator[list[bool]]:
    """Gather instead of print that arrow failed to hand a row to its handler; other faults go where they went."""
    found: list[bool] = []
    before = sys.unraisablehook

    def hook(fault: Any) -> None:
        if fault.object is handler and isinstance(fault.exc_value, UnicodeDecodeError):
            found.append(True)
        else:
            before(fault)

    sys.unraisablehook = hook
    try:
        yield found
    finally:
        sys.unraisablehook = before


class Reader:
    """One text log, read as often as needed. Types: column -> number, text, stamp, stamp_zone or time."""

    def __init__(self, source: Source, layout: Layout, missing: Sequence[str] = (), data: bytes | None = None) -> None:
        """`data`: lines to read instead of the file's."""
        self.source, self.layout, self.missing, self.data = source, layout, missing, data

    def read(self, types: dict[int, str]) -> Parsed:
        """Read the columns; a column that does not parse as it should is read as text instead."""
        types = dict(types)
        texts: set[int] = {place for place, kind in types.items() if kind == "text"}
        digest = Digest(self.source.location) if self.source.direct and self.data is None else None
        mend = clean = False
        for attempt in range(8):
            try:
                parsed = self._once(types, mend, clean)
            except _SpoiledError:
                clean = True
                continue
            except _Retry as retry:
                # one column first; if a third fails, most probably all have the same stray rows
                failing = (
                    [retry.column]
                    if attempt < 2 and retry.column in types
                    else [p for p, k in types.items() if k != "text"]
                )
                for place in failing:
                    types[place] = "text"
                    texts.add(place)
                continue
            if parsed.uneven_count and not mend and mendable(parsed.uneven, self.layout):
                mend = True
                continue
            parsed.texts = texts
            parsed.digest = digest
            return parsed
        raise fail(
            self.source.shown, "its columns cannot be read as numbers or as text", do="export the log as CSV again"
        )

    def _once(self, types: dict[int, str], mend: bool, clean: bool) -> Parsed:
        import pyarrow as pa
        import pyarrow.csv as arrow_csv

        layout = self.layout
        kinds = {
            "number": pa.float64(),
            "text": pa.string(),
            "stamp": pa.timestamp("ns"),
            "stamp_zone": pa.timestamp("ns", tz="UTC"),
            "time": pa.time64("ns"),
            "word": pa.dictionary(pa.int32(), pa.string()),
        }
        stray: list[str] = []
        count = [0]

        def uneven(row: Any) -> str:
            count[0] += 1
            if len(stray) < 50:
                stray.append(row.text)
            return "skip"

        stream: Any = None
        handle: Any
        skip = layout.skip
        if self.data is not None:
            handle, skip = pa.BufferReader(self.data), 0
        elif self.source.direct and rewriter(layout, mend) is None and not clean:
            # read, not mapped: pages of a mapped file count as this process's memory
            handle = pa.OSFile(os.fsencode(self.source.location))
        else:
            stream = Utf8Stream(self.source, rewriter(layout, mend), clean)
            handle = pa.PythonFile(stream, mode="r")
        convert = arrow_csv.ConvertOptions(
            column_types={str(k): kinds[kind] for k, kind in types.items()},
            include_columns=[str(k) for k in types],
            null_values=missing_spellings(set(self.missing)),
            strings_can_be_null=True,
            decimal_point=layout.decimal if layout.decimal != layout.delimiter else ".",
            check_utf8=True,
        )
        reading = arrow_csv.ReadOptions(
            column_names=[str(k) for k in range(layout.width)], skip_rows=skip, block_size=BLOCK
        )
        parsing = arrow_csv.ParseOptions(delimiter=layout.delimiter, invalid_row_handler=uneven)
        try:
            with _unheard(uneven) as spoiled:
                table = arrow_csv.read_csv(handle, reading, parsing, convert)
        except pa.ArrowInvalid as error:
            if stream is not None and stream.error is not None:
                raise stream.error from error
            if (spoiled or "invalid UTF8" in str(error)) and not clean:
                raise _SpoiledError from error
            match = re.search(r"CSV column #(\d+)", str(error))
            if match and types.get(int(match.group(1))) != "text":
                raise _Retry(int(match.group(1))) from error
            raise self._refused(error) from error
        except (pa.ArrowException, OSError) as error:
            if stream is not None and stream.error is not None:
                raise stream.error from error
            raise self._refused(error) from error
        cut: list[str] = []
        digests = ("", "")
        tail = None
        if stream is not None:
            digests = stream.digests()
            cut = stream.cut
            tail = stream.tail
        # the table lets go of its columns one by one, so that each can be freed once it is converted
        columns = {int(name): table.column(name) for name in table.column_names}
        return Parsed(columns, table.num_rows, digests[0], digests[1], stray, count[0], cut, tail=tail)

    def _refused(self, error: BaseException) -> Exception:
        text = " ".join(str(error).split())
        if "straddling" in text or "block" in text:
            return fail(
                self.source.shown,
                f"a line is longer than {BLOCK >> 20} MB",
                expected="one row a line",
                do="export the log as CSV again",
            )
        return fail(self.source.shown, f"cannot be read as a table: {text[:160]}", do="export the log as CSV again")

    def find(self, texts: Sequence[str], column: int, most: int = 1) -> list[tuple[int, str]]:
        """(line number, cell) of the first lines in which a column holds one of the texts. Slow: goes line by line."""
        wanted = {text.strip() for text in texts}
        needles = [text.strip().encode() for text in wanted if text.strip()]
        found: list[tuple[int, str]] = []
        number = 0
        for line in self._lines():
            number += 1
            if number <= self.layout.skip or not any(needle in line for needle in needles):
                continue
            cells = split(line.decode("utf-8", "replace"), self.layout.delimiter)
            if column < len(cells) and cells[column].strip().strip('"').strip() in wanted:
                found.append((number, cells[column].strip()))
                if len(found) >= most:
                    break
        return found

    def _lines(self) -> Iterator[bytes]:
        ends = re.compile(rb"\r\n|\r|\n")
        stream = Utf8Stream(self.source)
        rest = b""
        while piece := stream.read(1 << 20):
            block = rest + piece
            held = b""
            if block.endswith(b"\r"):
                block, held = block[:-1], b"\r"
            parts = ends.split(block)
            rest = parts.pop() + held
            yield from parts
        if rest:
            yield rest


class _Retry(Exception):  # noqa: N818
    """A column that does not parse as it should."""

    def __init__(self, column: int) -> None:
        super().__init__(column)
        self.column = column
