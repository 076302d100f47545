"""Raw channels and their evidence -> channels in SI; what stays open, what lost a conflict, what was rejected."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from exceed.core.quantities import QUANTITIES
from exceed.core.recording import Array, Channel, Index, Rejected, Unresolved, frozen, median_interval
from exceed.read import evidence, probe, quality, rates
from exceed.read.instants import Instants
from exceed.read.look import Column, Survey
from exceed.read.measure import resolution
from exceed.read.raw import OddCells, RawChannel


@dataclass(slots=True)
class Result:
    """What becomes of the raw channels."""

    channels: dict[str, Channel] = field(default_factory=dict)
    unresolved: list[Unresolved] = field(default_factory=list)
    rejected: list[Rejected] = field(default_factory=list)
    used: list[int] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    registration: str | None = None


def needs_witness(column: Column) -> bool:
    """Does a column leave something open that other columns may settle?"""
    return evidence.is_open(column)


def placed(raw: RawChannel, time: Instants) -> RawChannel:
    """Put the figures of the file's rows on the axis; blanks are left out, held repeats thinned."""
    values = raw.values
    if time.rows is not None:
        values = values.reshape(-1, raw.fold)[time.rows].reshape(-1)
    rows: Index | None = None
    if time.fold != raw.fold:
        rows = np.arange(0, len(time.time), time.fold // raw.fold, dtype=np.int64)
    # an infinite figure is no blank: it is rejected with its reason later
    filled = ~np.isnan(values)
    missing = len(values) - int(np.count_nonzero(filled))
    if missing:
        keep = np.flatnonzero(filled)
        values = values[keep]
        rows = keep if rows is None else rows[keep]
        raw.blanks = missing
    quantity = QUANTITIES.get(raw.column.quantity or "")
    if rows is None and not (quantity is not None and quantity.discrete):
        pattern = rates.held(values)
        if pattern is not None:
            rows = rates.held_rows(values, *pattern)
            values = values[rows]
            raw.notes.append(f"each value is held for {pattern[0]} rows: taken as one sample each")
    raw.values, raw.rows = values, rows
    return raw


def settle(
    survey: Survey, raws: Sequence[RawChannel], time: Instants, known: dict[int, evidence.Settled] | None = None
) -> list[evidence.Settled]:
    """Place all, then let the data settle unit, sign and datum, unless windows of the log already did."""
    for raw in raws:
        placed(raw, time)
    if known is not None:
        found = probe.carried(raws, known)
        if found is not None:
            return found
    return evidence.settle(list(raws), time.time, survey.declared)


def finish(
    survey: Survey,
    settled: Sequence[evidence.Settled],
    wanted: set[str] | frozenset[str] | None,
    time: Instants,
    ranges: Mapping[str, tuple[float, float]],
    cells: Sequence[OddCells],
) -> Result:
    """Resolve conflicts, turn the winners into SI, look at their quality."""
    result = Result()
    by_quantity: dict[str, list[evidence.Settled]] = {}
    for one in settled:
        column = one.raw.column
        quantity = one.quantity
        if one.problem:
            if wanted is None or column.quantity in wanted:
                result.unresolved.append(Unresolved(column.name, one.problem, one.question))
            continue
        by_quantity.setdefault(quantity, []).append(one)
    total = len(time.time)
    ready: list[tuple[evidence.Settled, str]] = []
    for quantity, several in by_quantity.items():
        if wanted is not None and quantity not in wanted:
            continue
        best = max(several, key=lambda one: _merit(one, total))
        for other in several:
            if other is not best:
                reason = f"'{best.raw.column.name}' is taken for {quantity}: {_why(best, other, total)}"
                result.unresolved.append(Unresolved(other.raw.column.name, reason))
        ready.append((best, quantity))
        result.used += [best.raw.column.index, *best.raw.column.group]
    series: dict[str, quality.Series] = {}
    for one, quantity in ready:
        if len(one.raw.values) == 0:
            result.unresolved.append(Unresolved(one.raw.column.name, "holds no value"))
            continue
        series[quantity] = _series(one, quantity, time)
    for one, quantity in ready:
        if quantity in series:
            channel, rejected = _channel(one, series[quantity], time, ranges.get(quantity), series)
            result.channels[quantity] = channel
            result.rejected += rejected
    for channel in result.channels.values():
        frozen(channel.values)
    for column, places, texts, name in cells:
        if column.quantity in result.channels:
            result.rejected.append(_not_numbers(column, places, texts, name, time))
    result.rejected.sort(key=lambda row: (row.start, row.quantity, row.reason))
    return result


def _merit(one: evidence.Settled, total: int) -> tuple[float, ...]:
    """Named surely, unit written, plausible and mostly valid, faster, then the first."""
    column = one.raw.column
    filled = len(one.raw.values)
    return (
        float(one.forced),
        float(filled > 0),
        round(column.score, 1),
        float(bool(column.unit_text)),
        round(one.plausible, 2),
        filled / max(1, total),
        float(-column.index),
    )


def _why(best: evidence.Settled, other: evidence.Settled, total: int) -> str:
    if best.forced:
        return "the channels file names it"
    a, b = _merit(best, total), _merit(other, total)
    for place, text in (
        (1, "the other is empty"),
        (2, "its name is surer"),
        (3, "its unit is written"),
        (4, "its values are likelier"),
        (5, "it has more samples"),
    ):
        if a[place] > b[place]:
            return text
    return "it stands first"


def _series(one: evidence.Settled, quantity: str, time: Instants) -> quality.Series:
    """The figures as written become SI, in place where they may."""
    raw = one.raw
    values = raw.values
    step = abs(one.scale) * resolution(values)
    if not values.flags.writeable:
        values = values.copy()
    if one.scale != 1.0:
        values *= one.scale
    if one.offset != 0.0:
        values += one.offset
    row = QUANTITIES.get(quantity)
    discrete = row.discrete if row is not None else one.unit == "state"
    rows = raw.rows
    made: list[Array] = []

    def at() -> Array:
        if rows is None:
            return time.time
        if not made:
            made.append(time.time[rows])
        return made[0]

    interval = median_interval(time.time if rows is None else time.time[rows])
    return quality.Series(quantity, values, at, interval, step, discrete)


def _channel(
    one: evidence.Settled,
    series: quality.Series,
    time: Instants,
    sensor: tuple[float, float] | None,
    others: Mapping[str, quality.Series],
) -> tuple[Channel, list[Rejected]]:
    raw, column = one.raw, one.raw.column
    checked = quality.check(series, sensor, others)
    rejected = []
    if checked.rejected:
        at = series.at()
        for first, last, samples, reason, extreme in checked.rejected:
            rows = (first, last) if raw.rows is None else (int(raw.rows[first]), int(raw.rows[last]))
            rejected.append(
                Rejected(
                    series.quantity, column.name, float(at[first]), float(at[last]), samples, reason, extreme, rows
                )
            )
    expected = (
        len(time.time) / max(1, round(series.interval / median_interval(time.time))) if len(time.time) > 1 else 1.0
    )
    share = min(1.0, (len(series.values) - checked.lost) / max(1.0, expected))
    return Channel(
        quantity=series.quantity,
        column=column.name if not column.group else f"{column.name} (+{len(column.group) - 1})",
        values=series.values,
        rows=None if raw.rows is None else frozen(raw.rows),
        interval=series.interval,
        unit=one.unit,
        scale=one.scale,
        offset=one.offset,
        discrete=series.discrete,
        found_by=one.found_by,
        reason=one.reason,
        sign=one.sign,
        datum=one.datum,
        standard_uncertainty=_accuracy(column),
        uncertainty_source="channels file" if column.accuracy is not None else "",
        resolution=series.step,
        noise=checked.noise,
        saturation=checked.saturation,
        valid_share=round(share, 6),
        notes=(*raw.notes, *one.notes, *checked.notes),
    ), rejected


def _accuracy(column: Column) -> float | None:
    """Standard uncertainty from the channels file's accuracy, a 95 % half-width already in SI."""
    return None if column.accuracy is None else column.accuracy / 1.96


def _not_numbers(column: Column, places: Any, texts: list[str], name: str, time: Instants) -> Rejected:
    kept = time.rows if time.rows is not None else None
    first, last = int(places[0]), int(places[-1])
    if kept is not None:
        first, last = (min(int(np.searchsorted(kept, p)), len(kept) - 1) for p in (first, last))
    first, last = first * time.fold, last * time.fold
    last = min(last, len(time.time) - 1)
    first = min(first, last)
    return Rejected(
        column.quantity or "",
        name,
        float(time.time[first]),
        float(time.time[last]),
        len(places),
        "not_a_number",
        None,
        (first, last),
    )


def faulty(survey: Survey, time: Instants) -> list[tuple[str, float, float, str]]:
    """Stretches that the channels file declares faulty, in seconds of the axis."""
    out = []
    for entry in getattr(survey.channels, "faulty", None) or ():
        column = survey.column(entry.column)
        if column is None or not column.quantity:
            continue
        first, last = float(time.time[0]), float(time.time[-1])
        start = _moment(getattr(entry, "start", None), time, first)
        end = _moment(getattr(entry, "end", None), time, last)
        if end > first - 1e-9 and start < last + 1e-9:
            out.append(
                (column.quantity, max(start, first), min(end, last), str(getattr(entry, "reason", "") or "faulty"))
            )
    return out


def _moment(value: Any, time: Instants, default: float) -> float:
    if value is None:
        return default
    if isinstance(value, int | float):
        return float(value)
    if time.start is None:
        return default
    stamp = value.timestamp() if hasattr(value, "timestamp") else None
    return default if stamp is None else stamp - time.start
