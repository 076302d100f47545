"""Read columns -> raw channels: figures as written, one a row of the file, with the cells that were no figures."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from exceed.core.quantities import QUANTITIES
from exceed.core.recording import Array
from exceed.errors import LogError
from exceed.read import arrays, states
from exceed.read.container import Utf8Stream
from exceed.read.look import Column, Survey
from exceed.read.parse import Parsed, Reader
from exceed.read.table import Layout, split

# bytes converted before memory is given back to the system: each time costs as much as converting a column
BETWEEN_RETURNS = 96 << 20
OddCells = tuple[Column, NDArray[np.int64], list[str], str]


@dataclass(slots=True, eq=False)
class RawChannel:
    """A column as it was written. values : (m,) raw figures; rows : places on the time axis, None for every one.

    Until the axis is known, `rows` is None and `values` has one entry a row of the file (or, unfolded, `fold` of them).
    """

    column: Column
    values: Array
    blanks: int = 0
    fold: int = 1
    rows: NDArray[np.int64] | None = None
    sense_sure: bool = True
    notes: list[str] = field(default_factory=list)


def missing_of(survey: Survey) -> frozenset[str]:
    """What a channels file lists as missing."""
    return frozenset(str(text).strip() for text in (getattr(survey.channels, "missing", None) or ()))


def raw_channels(
    survey: Survey, chosen: Sequence[Column], parsed: Parsed, quiet: bool = False
) -> tuple[list[RawChannel], list[str], list[OddCells]]:
    """Convert column by column, letting go of each arrow column once it is converted. `quiet`: look for no places."""
    notes: list[str] = []
    odd: list[OddCells] = []
    repeats = 0
    made: list[RawChannel] = []
    converted = 0
    last = not quiet and _cut_last_cell(survey, parsed)
    if last:
        notes.append("the last line has no end: its last cell may be cut and is not used")
    for column in chosen:
        pieces = []
        for place in column.group or (column.index,):
            values, cells, repeated, sure = _values(survey, column, parsed, place)
            repeats = max(repeats, repeated)
            if last and survey.layout is not None and place == survey.layout.width - 1 and len(values):
                values = values if values.flags.writeable else values.copy()
                values[-1] = np.nan
            pieces.append(values)
            converted += values.nbytes
            if converted > BETWEEN_RETURNS:
                arrays.give_back(len(values))
                converted = 0
            if cells is not None:
                name = survey.columns[place].name
                odd.append((survey.columns[place], cells[0], cells[1], name))
        if len(pieces) > 1:
            made += _unfolded(survey, column, pieces)
            continue
        made.append(RawChannel(column, pieces[0], sense_sure=sure))
    parsed.repeats = repeats
    if repeats:
        notes.append(f"the headings are repeated {repeats} time{'s' * (repeats != 1)} between the rows: left out")
    if odd and survey.layout is not None and not quiet:
        notes += _places(survey, odd)
    return made, notes, odd


def _values(
    survey: Survey, column: Column, parsed: Parsed, place: int
) -> tuple[Array, tuple[NDArray[np.int64], list[str]] | None, int, bool]:
    import pyarrow as pa

    arrow = parsed.columns.pop(place)
    quantity = QUANTITIES.get(column.quantity or "")
    layout = survey.layout
    kind = arrow.type
    text = pa.types.is_string(kind) or pa.types.is_large_string(kind) or pa.types.is_dictionary(kind)
    heads = {row[place] for row in layout.heading_rows} if layout is not None else set()
    if quantity is not None and quantity.discrete:
        sense = states.heading_sense(quantity.name, column.name)
        if not text:
            values, _ = arrays.floats(arrow)
            return _flag(values, sense), None, 0, False
        codes, texts = arrays.coded(arrow)
        table, unknown, sure = states.mapping(texts, quantity.name, sense)
        values = np.array([*table, np.nan])[codes]
        stray = [t for t in unknown if t.strip() not in heads]
        repeated = sum(int(np.count_nonzero(codes == texts.index(t))) for t in unknown if t.strip() in heads)
        if not stray:
            return values, None, repeated, sure
        places = np.flatnonzero(np.isin(codes, [texts.index(t) for t in stray]))
        return values, (places, [texts[codes[p]] for p in places[:1000]]), repeated, sure
    if not text:
        values, _ = arrays.floats(arrow)
        return values, None, 0, True
    decimal, grouping = (layout.decimal, layout.grouping) if layout is not None else (".", "")
    values, places, cells = arrays.numbers_of_text(arrow, decimal, grouping, missing_of(survey))
    strange = [k for k, cell in enumerate(cells) if cell not in heads]
    repeated = len(cells) - len(strange)
    if not strange:
        return values, None, repeated, True
    return values, (places[strange], [cells[k] for k in strange]), repeated, True


def _flag(values: Array, sense: int) -> Array:
    """Figures of a state: 0 and 1 as they are, else a share of the full travel; beyond 5 % of it is 'not 0'."""
    finite = values[np.isfinite(values)]
    top = float(np.max(np.abs(finite))) if len(finite) else 1.0
    with np.errstate(invalid="ignore"):
        on = (np.abs(values) > (0.5 if top <= 1.0 else 0.05 * top)).astype(np.float64)
    if sense < 0:
        on = 1.0 - on
    on[~np.isfinite(values)] = np.nan
    return on


def _unfolded(survey: Survey, column: Column, pieces: list[Array]) -> list[RawChannel]:
    """Sub-frame columns become one channel; columns that repeat each other are several sensors."""
    if _redundant(pieces):
        members = [survey.columns[place] for place in column.group]
        return [
            RawChannel(
                member.with_(group=(), part=-1),
                piece,
                notes=["one of several columns for the same quantity at the same instants"],
            )
            for member, piece in zip(members, pieces, strict=True)
        ]
    values = np.stack(pieces, axis=1).reshape(-1)
    note = f"{len(pieces)} sub-frame columns a row, taken as evenly spaced from the row's time"
    return [RawChannel(column, values, fold=len(pieces), notes=[note])]


def _redundant(pieces: list[Array]) -> bool:
    """Do the columns of a row say the same instant? The last one then lies nearer to the first of its own row than to
    the first of the next row; in a sub-frame it is the other way round, or (two columns) as near."""
    first, last = pieces[0], pieces[-1]
    step = max(1, (len(first) - 1) // 20_000)
    rows = np.arange(0, len(first) - 1, step)
    own, following = np.abs(last[rows] - first[rows]), np.abs(last[rows] - first[rows + 1])
    own, following = own[np.isfinite(own)], following[np.isfinite(following)]
    if min(len(own), len(following)) < 8:
        return False
    # without the jumps of an angle that wraps
    limit = float(np.percentile(np.concatenate([own, following]), 97))
    here = float(np.mean(np.minimum(own, limit)))
    there = float(np.mean(np.minimum(following, limit)))
    if here == 0.0 and there == 0.0:
        return False
    return here < 0.6 * there


def tail_of(survey: Survey, parsed: Parsed) -> bytes:
    """The last bytes of the text, as UTF-8."""
    source = survey.source
    if source.parquet:
        return b"\n"
    if parsed.tail is not None:
        return parsed.tail
    if source.whole:
        return source.text.encode("utf-8")[-65536:]
    if source.direct:
        with open(source.location, "rb") as stream:
            stream.seek(max(0, source.size - 65536))
            return stream.read()
    stream2 = Utf8Stream(source)
    kept = b""
    try:
        while piece := stream2.read(1 << 20):
            kept = (kept + piece)[-65536:]
    except LogError:
        return b"\n"
    return kept


def _cut_last_cell(survey: Survey, parsed: Parsed) -> bool:
    """Has the last line no end, and does its last cell look shorter than those before it?"""
    layout = survey.layout
    if layout is None:
        return False
    tail = tail_of(survey, parsed)
    if tail.endswith((b"\n", b"\r")) or not tail:
        return False
    lines = re.split(r"\r\n|\r|\n", tail.decode("utf-8", "replace"))
    cells = split(lines[-1], layout.delimiter)
    if len(cells) != layout.width:
        return False
    before = [split(line, layout.delimiter) for line in lines[-40:-1]]
    shapes = {_shape(row[-1]) for row in before if len(row) == layout.width}
    return _shape(cells[-1]) not in shapes or len(shapes) > 1


def _shape(cell: str) -> tuple[int, bool]:
    """Digits after the mark, and whether the quotes are closed."""
    match = re.search(r"[.,](\d*)", cell)
    return (len(match.group(1)) if match else -1), cell.count('"') % 2 == 0


def _places(survey: Survey, odd: Sequence[OddCells]) -> list[str]:
    """file:line:column of the first cell that is no figure, and how many there are."""
    assert survey.layout is not None
    reader = Reader(survey.source, survey.layout)
    notes = []
    for column, places, cells, name in odd[:20]:
        found = reader.find(list(dict.fromkeys(cells))[:50], column.index)
        where = f"{survey.path}:{found[0][0]}:{column.index + 1}: " if found else ""
        text = found[0][1] if found else cells[0]
        many = f" ({len(places)} cells)" if len(places) > 1 else ""
        notes.append(f"{where}{text!r} in column {name!r} is not a number{many}: taken as missing")
    return notes


__all__ = ["Layout", "RawChannel", "raw_channels"]
