"""Arrow columns -> numpy, one column at a time and without second copies; text cells -> numbers, the bad ones found."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from exceed.core.recording import Array
from exceed.read.cells import is_missing

LARGE = 200_000  # rows
MOST_NANOSECONDS = 2**63 - 1


def floats(column: Any) -> tuple[Array, int]:
    """(n,) float64 with NaN for empty cells, and how many are empty. Takes any arrow number column."""
    import pyarrow as pa
    import pyarrow.compute as pc

    chunks = column.chunks if isinstance(column, pa.ChunkedArray) else [column]
    kind = column.type
    if pa.types.is_decimal(kind) or pa.types.is_float16(kind) or pa.types.is_boolean(kind):
        chunks = [pc.cast(chunk, pa.uint8() if pa.types.is_boolean(kind) else pa.float64()) for chunk in chunks]
    out = np.empty(len(column), np.float64)
    at = 0
    for chunk in chunks:
        size = len(chunk)
        out[at : at + size] = chunk.to_numpy(zero_copy_only=False)
        at += size
    return out, int(column.null_count)


def give_back(rows: int) -> None:
    """The parser's pool keeps what it no longer needs; of a large log that is worth returning, column by column."""
    if rows > LARGE:
        import pyarrow as pa

        pa.default_memory_pool().release_unused()


def numbers_of_text(
    column: Any, decimal: str, grouping: str, missing: frozenset[str]
) -> tuple[Array, NDArray[np.int64], list[str]]:
    """Text cells -> (values with NaN, places of cells that are neither a number nor empty, those cells)."""
    import pyarrow as pa
    import pyarrow.compute as pc

    column = column.cast(pa.large_string())
    text = pc.utf8_trim_whitespace(column)
    if grouping:
        for mark in {grouping, "\u00a0", "\u202f"} if grouping in " \u00a0\u202f" else {grouping}:
            text = pc.replace_substring(text, mark, "")
    if decimal == ",":
        text = pc.replace_substring(text, ",", ".")
    text = pc.replace_substring_regex(
        text, r"^([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*[A-Za-z°%µ/²]{1,7}[2]?$", r"\1"
    )
    text = pc.utf8_ltrim(text, "+")
    good = pc.match_substring_regex(text, r"^-?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?$")
    good = pc.fill_null(good, False)
    values, _ = floats(pc.cast(pc.if_else(good, text, pa.scalar(None, pa.large_string())), pa.float64()))
    odd = pc.and_(pc.invert(good), pc.is_valid(column))
    places = np.flatnonzero(
        np.asarray(
            odd.to_numpy() if isinstance(odd, pa.ChunkedArray) else odd.to_numpy(zero_copy_only=False), dtype=bool
        )
    )
    cells = column.take(pa.array(places)).to_pylist() if len(places) else []
    keep = [k for k, cell in enumerate(cells) if not is_missing(cell, missing)]
    return values, places[keep], [cells[k].strip() for k in keep]


def coded(column: Any) -> tuple[NDArray[np.int64], list[str]]:
    """Text cells -> (n,) code of each (-1 where empty) and the texts."""
    import pyarrow as pa
    import pyarrow.compute as pc

    if not pa.types.is_dictionary(column.type):
        column = pc.dictionary_encode(column.cast(pa.string()))
    if isinstance(column, pa.ChunkedArray):
        column = column.unify_dictionaries().combine_chunks()
        if isinstance(column, pa.ChunkedArray):
            column = column.chunk(0) if column.num_chunks else pa.array([], pa.string()).dictionary_encode()
    codes = pc.fill_null(column.indices, -1).to_numpy(zero_copy_only=False).astype(np.int64)
    return codes, [str(text) for text in column.dictionary.cast(pa.string()).to_pylist()]


def of_the_day(column: Any) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
    """A timestamp column -> (n,) int64 ns since midnight, whatever the date, and where it is empty."""
    import pyarrow as pa

    factor = {"s": 10**9, "ms": 10**6, "us": 10**3, "ns": 1}[column.type.unit]
    empty = (
        column.is_null().to_numpy(zero_copy_only=False) if isinstance(column, pa.Array) else column.is_null().to_numpy()
    )
    whole = column.cast(pa.int64()).fill_null(0).to_numpy()
    return whole % (86400 * 10**9 // factor) * factor, empty


def whole_seconds(column: Any) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
    """A timestamp or time column -> (n,) int64 ns, and where it is empty; dates beyond 1678 to 2262 count as empty."""
    import pyarrow as pa

    out = np.empty(len(column), np.int64)
    empty = np.zeros(len(column), bool)
    at = 0
    kind = column.type
    for chunk in column.chunks if isinstance(column, pa.ChunkedArray) else [column]:
        size = len(chunk)
        if chunk.null_count:
            empty[at : at + size] = chunk.is_null().to_numpy(zero_copy_only=False)
            chunk = chunk.fill_null(0)
        width = pa.int32() if pa.types.is_time32(kind) or pa.types.is_date32(kind) else pa.int64()
        out[at : at + size] = chunk.cast(width).to_numpy(zero_copy_only=False)
        at += size
    unit = "d" if pa.types.is_date32(kind) else getattr(kind, "unit", "ns")
    factor = {"d": 86400 * 10**9, "s": 10**9, "ms": 10**6, "us": 10**3, "ns": 1}[unit]
    if factor != 1:
        # nanoseconds in 64 bits reach from 1678 to 2262: what lies beyond would come out as another date
        beyond = np.abs(out) > MOST_NANOSECONDS // factor
        empty |= beyond
        out[beyond] = 0
        out *= factor
    return out, empty
