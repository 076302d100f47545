"""The first look at a log: its shape, its columns, its clock. Cheap: one block is read."""

from __future__ import annotations

import os
from collections.abc import Mapping, Sequence

from exceed.core.units import AIRSPEED_UNITS
from exceed.errors import LogError
from exceed.read.clock import find_clock, stated_period
from exceed.read.container import Source, open_source
from exceed.read.engines import indexed, tanks
from exceed.read.look import Column, Survey
from exceed.read.rates import groups
from exceed.read.recognise import columns_of, is_clock
from exceed.read.stamps import ClockPlan
from exceed.read.table import Layout, layout, registration_in, serial_in

# how far a table is looked for behind a long preamble
LONG_HEAD = 8 << 20


def survey(
    path: str | os.PathLike[str] | object, *, channels: object | None = None, declared: Mapping[str, str] | None = None
) -> Survey:
    """Look at a log without reading it.

    Parameters
    ----------
    path : a path, an object store's address, or a `LogPath` of `find_logs`
    channels : a channels file's model; it overrules what would be recognised
    declared : further quantities by name, each with its unit, that rules declare

    Raises
    ------
    LogError : the file is no log.
    """
    location, shown = _address(path)
    source = open_source(location, shown)
    known = dict(declared or {})
    for entry in getattr(channels, "channels", None) or ():
        _declare(entry, known)
    if source.parquet:
        from exceed.read.parquet import survey_parquet

        return survey_parquet(source, channels, known)
    try:
        found = layout(source)
    except LogError:
        # a preamble may be longer than the first block
        if source.whole or (b"\n" not in source.head and b"\r" not in source.head):
            raise
        source = open_source(location, shown, LONG_HEAD)
        found = layout(source)
    cells = [[row[k] if k < len(row) else "" for row in found.sample] for k in range(found.width)]
    columns = columns_of(found.names, found.units, found.sources, cells, known)
    registration, serial = registration_in(found.facts), serial_in(found.facts)
    return assemble(
        source, found, columns, cells, found.facts, registration, serial, channels, known, found.decimal, found.notes
    )


def _address(path: object) -> tuple[str, str]:
    location = getattr(path, "location", None)
    if location is not None:
        return str(location), str(getattr(path, "shown", location))
    text = os.fspath(path)  # type: ignore[call-overload]
    if text.startswith("file://"):
        from urllib.parse import unquote, urlsplit

        text = unquote(urlsplit(text).path)
    return text, text


def _declare(entry: object, known: dict[str, str]) -> None:
    from exceed.core.quantities import QUANTITIES

    quantity, unit = getattr(entry, "quantity", None), getattr(entry, "unit", None)
    unit = AIRSPEED_UNITS[unit][0] if unit in AIRSPEED_UNITS else unit
    if quantity and quantity not in QUANTITIES and quantity not in known and unit:
        known[str(quantity)] = str(unit)


def assemble(
    source: Source,
    found: Layout | None,
    columns: Sequence[Column],
    cells: Sequence[Sequence[str]],
    facts: Sequence[tuple[str, str]],
    registration: str | None,
    serial: str | None,
    channels: object | None,
    declared: dict[str, str],
    decimal: str,
    notes: Sequence[str],
    clock: ClockPlan | None = None,
    rows: int | None = None,
) -> Survey:
    """Put the parts together: channels file over recognition, clock, sub-frame groups, facts in columns."""
    from exceed.read.told import apply_channels, told_clock

    columns = _without_clocks(columns)
    more: list[str] = []
    if channels is not None:
        columns, more = apply_channels(columns, channels, declared, source.shown)
    plan = (
        (
            told_clock(columns, channels, cells, decimal, source.shown, stated_period(facts))
            if channels is not None
            else None
        )
        or clock
        or find_clock(columns, facts, decimal, cells)
    )
    columns = [
        c.with_(quantity=None, problem="") if c.index in plan.columns or c.index == plan.anchor else c for c in columns
    ]
    columns = groups(indexed(tanks(columns), declared), declared)
    registration = registration or _in_column(columns, cells)
    return Survey(
        source,
        found,
        tuple(columns),
        plan,
        tuple(facts),
        registration,
        serial,
        channels,
        declared,
        rows,
        (*notes, *more),
    )


def _without_clocks(columns: Sequence[Column]) -> list[Column]:
    """A column of stamps is no quantity, whatever a synonym says; a counter named like one neither."""
    out = []
    for column in columns:
        if column.form == "stamp" or (
            is_clock(column) and column.score < 0.9 and column.unit in (None, "s", "ms", "us", "ns", "h", "min")
        ):
            column = column.with_(quantity=None, problem=column.problem or "a column of time", question="")
        out.append(column)
    return out


def _in_column(columns: Sequence[Column], cells: Sequence[Sequence[str]]) -> str | None:
    """A registration that stands in a column of its own."""
    for column in columns:
        if column.form in ("word", "mixed", "number") and column.quantity is None:
            texts = {cell.strip() for cell in cells[column.index] if cell.strip()}
            if len(texts) == 1:
                found = registration_in(((column.name, next(iter(texts))),))
                if found:
                    return found
    return None


__all__ = ["survey"]
