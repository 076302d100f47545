"""The clock's columns, as read -> the recording's axis, its start in UTC, and what had to be done for it."""

from __future__ import annotations

import re
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from exceed.core.recording import Array, Rejected
from exceed.read import arrays, axis
from exceed.read.container import fail
from exceed.read.look import Survey
from exceed.read.parse import Parsed
from exceed.read.raw import RawChannel
from exceed.read.stamps import (
    DATE,
    DAY,
    FULL,
    NO_DATE,
    SECOND,
    TIME,
    UNKNOWN,
    ClockPlan,
    Stamps,
    date_order,
    days_of,
    parse,
    zone_offset,
)

# s between rows: quicker than any accelerometer's recorder, slower than any log of a flight
SHORTEST_STEP, LONGEST_STEP = 1e-6, 3600.0
NO_ZONE = "no time zone is stated: taken as UTC"


@dataclass(slots=True)
class Instants:
    """time : (n,) s, the axis. rows : (m,) places in the file of the rows kept, None for all; `fold` instants a row."""

    time: Array
    rows: NDArray[np.int64] | None
    fold: int
    kind: str
    start: float | None
    zone: str
    resets: int
    seams: tuple[tuple[float, float], ...]
    rejected: list[Rejected] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    clock_notes: list[str] = field(default_factory=list)


def instants(survey: Survey, parsed: Parsed, raws: list[RawChannel]) -> Instants:
    """Build the axis. Raises LogError where no row has a time."""
    plan = survey.clock
    notes = list(plan.notes)
    start0: float | None
    if plan.roles == ("row",):
        readings, start0, zone, kind = np.arange(parsed.rows, dtype=np.float64) * plan.unit, None, "", "frame"
    elif "hour" in plan.roles:
        readings, start0, zone, kind = _apart(parsed, plan, notes)
    elif plan.roles in (("number",), ("frame",)):
        readings, start0, zone, kind = _counted(survey, parsed, plan)
    else:
        readings, start0, zone, kind = _stamped(survey, parsed, plan, notes)
    slowest = _slowest(raws)
    made = axis.build(readings, kind=kind, slowest=slowest)
    if len(made.time) == 0:
        raise fail(
            survey.path,
            "no row has a time",
            expected="a clock column with figures or stamps",
            do="name the clock in a channels file",
        )
    if len(made.time) > 1 and parsed.rows > 1 and np.ptp(readings[np.isfinite(readings)]) == 0.0:
        raise fail(
            survey.path,
            "its clock stands still: every row has the same time",
            expected="a time that goes on",
            do="name another clock in a channels file, or check the recorder's clock",
        )
    _believable(survey, made.time)
    start = None if start0 is None else start0 + made.origin
    if start is None and plan.anchor is not None:
        start, zone = _anchored(survey, parsed, plan, made, notes)
    time, fold, seams = _folded(made.time, raws, made.seams)
    lost = made.without - parsed.repeats
    if lost > 0:
        notes.append(f"{lost} row{'s' * (lost != 1)} without a time {'are' if lost != 1 else 'is'} left out")
    notes += made.notes
    out = Instants(time, made.rows, fold, kind, start, zone, made.resets, seams, notes=[], clock_notes=notes)
    if len(made.doubled):
        out.rejected.append(_doubled(survey, made, raws, time, fold))
    return out


def _believable(survey: Survey, time: Array) -> None:
    """Raise LogError for rows nearer or further apart than any recorder writes them: unit or column is wrong."""
    if len(time) < 2:
        return
    step = float(np.median(np.diff(time)))
    if not SHORTEST_STEP <= step <= LONGEST_STEP:
        raise fail(
            survey.path,
            f"its clock goes on by {step:.3g} s a row, which no recorder does",
            expected=f"a clock that goes on by {SHORTEST_STEP:g} s to {LONGEST_STEP:g} s a row",
            do="name the clock and its unit in a channels file: clock: {column: NAME, kind: elapsed, unit: s}",
        )


def _counted(survey: Survey, parsed: Parsed, plan: ClockPlan) -> tuple[Array, float | None, str, str]:
    import pyarrow as pa

    column = parsed.columns.pop(plan.columns[0])
    if pa.types.is_string(column.type) or pa.types.is_dictionary(column.type):
        layout = survey.layout
        decimal, grouping = (layout.decimal, layout.grouping) if layout else (".", "")
        readings, _, _ = arrays.numbers_of_text(column, decimal, grouping, frozenset())
    elif plan.kind == "epoch" and pa.types.is_integer(column.type):
        # whole nanoseconds do not fit a double: take the first off before scaling
        whole, empty = arrays.whole_seconds(column.cast(pa.int64()))
        filled = np.flatnonzero(~empty)
        first = int(whole[filled[0]]) if len(filled) else 0
        readings = np.where(empty, np.nan, (whole - first) * plan.unit)
        return readings, first * plan.unit + plan.offset, "UTC", "epoch"
    else:
        readings, _ = arrays.floats(column)
    if plan.kind == "epoch":
        finite = readings[np.isfinite(readings)]
        base = float(finite[0]) if len(finite) else 0.0
        readings -= base
        readings *= plan.unit
        return readings, base * plan.unit + plan.offset, "UTC", "epoch"
    if plan.unit != 1.0:
        # a division keeps decimal steps exact: 125 ms is 0.125 s, 3 ms is 0.003 s
        inverse = 1.0 / plan.unit
        if abs(inverse - round(inverse)) < 1e-9 * inverse and inverse >= 1.0:
            readings /= round(inverse)
        else:
            readings *= plan.unit
    return readings, None, plan.zone, plan.kind


def _apart(parsed: Parsed, plan: ClockPlan, notes: list[str]) -> tuple[Array, float | None, str, str]:
    """Hours, minutes, seconds and perhaps the date in columns of their own."""
    part = {
        role: arrays.floats(parsed.columns.pop(place))[0] for role, place in zip(plan.roles, plan.columns, strict=True)
    }
    readings = part["hour"] * 3600.0 + part["minute"] * 60.0 + part.get("second", np.zeros(1))
    if "year" in part:
        whole = [np.nan_to_num(part[name]).astype(np.int64) for name in ("year", "month", "day")]
        whole[0] = np.where(whole[0] < 100, whole[0] + 2000, whole[0])
        days = days_of(whole[0], whole[1], whole[2])
        known = days != UNKNOWN
        base = int(days[known][0]) if known.any() else 0
        readings = readings + np.where(known, (days - base) * 86400.0, np.nan)
        zone, away = _zone(plan, False, notes, base * 86400.0)
        return readings, base * 86400.0 - away, zone, "date_time"
    zone, away = _zone(plan, False, notes, (plan.day or 0) * 86400.0)
    if plan.day is None:
        _undated(notes)
        return readings, None, zone, "time_of_day"
    notes.append("the date is the preamble's")
    return readings, plan.day * 86400.0 - away, zone, "time_of_day"


def _stamped(survey: Survey, parsed: Parsed, plan: ClockPlan, notes: list[str]) -> tuple[Array, float | None, str, str]:
    """Stamps in text or typed columns -> seconds from the first, and the UTC of that first."""
    columns = dict(zip(plan.roles, (parsed.columns.pop(place) for place in plan.columns), strict=False))
    shift: NDArray[np.int64] = np.zeros(1, np.int64)
    zoned = False
    kind = plan.kind
    if "full" in columns:
        whole, bad, shift, zoned, kind = _full(columns["full"], plan, notes)
    elif "date" in columns:
        clock, bad, shift, zoned = _time_of_day(columns["time"])
        days, known = _dates(columns["date"], plan, notes)
        if known and not bad.all() and not (days[~bad] != UNKNOWN).any():
            notes.append(NO_DATE)
            known = False
        if known:
            bad |= days == UNKNOWN
            whole = np.where(bad, 0, days) * DAY + clock
        else:
            whole, kind = clock, "time_of_day"
        if "offset" in columns:
            shift, zoned = _offsets(columns["offset"], notes)
    else:
        whole, bad, shift, zoned = _time_of_day(columns["time"])
        kind = "time_of_day"
    whole = whole - shift
    good = np.flatnonzero(~bad)
    if len(good) == 0:
        return np.full(len(whole), np.nan), None, "", kind
    base = int(whole[good[0]])
    readings = (whole - base) / 1e9
    readings[bad] = np.nan
    zone, away = _zone(plan, zoned, notes, base / 1e9 if kind != "time_of_day" else (plan.day or 0) * 86400.0)
    if kind == "time_of_day":
        readings += (base % DAY) / 1e9
        if plan.day is None:
            if not any("date" in note for note in notes):
                _undated(notes)
            return readings, None, zone, kind
        notes.append("the date is the preamble's")
        return readings, plan.day * 86400.0 - away, zone, kind
    return readings, base / 1e9 - away, zone, kind


def _undated(notes: list[str]) -> None:
    """Times of day alone give no UTC, so that it was to be taken as such is no longer worth saying."""
    if NO_ZONE in notes:
        notes.remove(NO_ZONE)
    notes.append("the stamps have no date, and no date is stated: times are elapsed, UTC is not given")


def _zone(plan: ClockPlan, zoned: bool, notes: list[str], moment: float) -> tuple[str, float]:
    """(zone as outputs say it, seconds to take off to get UTC) at a local moment, s since 1970."""
    if zoned:
        return "UTC, from the zone in the log", plan.offset * -1.0 if plan.offset else 0.0
    if plan.zone == "in the cells":
        return "UTC, from the zone in the log", 0.0
    known = zone_offset(plan.zone) if plan.zone else None
    if known is not None:
        return plan.zone, known - plan.offset
    if plan.zone == "local":
        notes.append("the stamps are local time and no offset is stated: taken as UTC")
    elif plan.zone:
        place = _place(plan.zone, moment)
        if place is not None:
            return plan.zone, place - plan.offset
        notes.append(f"the zone '{plan.zone}' is not understood: taken as UTC")
    else:
        notes.append(NO_ZONE)
    return "UTC, assumed", -plan.offset


def _place(name: str, moment: float) -> float | None:
    """Offset of a place's zone at a local moment, s; None for an unknown place."""
    from datetime import UTC, datetime
    from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

    try:
        zone = ZoneInfo(name.strip())
        local = datetime.fromtimestamp(moment, UTC).replace(tzinfo=zone)
    except (ZoneInfoNotFoundError, ValueError, OSError, OverflowError):
        return None
    offset = local.utcoffset()
    return None if offset is None else offset.total_seconds()


def _full(
    column: object, plan: ClockPlan, notes: list[str]
) -> tuple[NDArray[np.int64], NDArray[np.bool_], NDArray[np.int64], bool, str]:
    import pyarrow as pa

    kind = column.type  # type: ignore[attr-defined]
    if pa.types.is_timestamp(kind):
        whole, bad = arrays.whole_seconds(column)
        if bad.all() and column.null_count < len(column):  # type: ignore[arg-type, attr-defined]
            notes.append(NO_DATE)
            whole, bad = arrays.of_the_day(column)
            return whole, bad, np.zeros(1, np.int64), False, "time_of_day"
        return whole, bad, np.zeros(1, np.int64), kind.tz is not None, plan.kind
    read = parse(column, FULL)
    bad = read.bad | (read.clock == UNKNOWN)
    days, known = _ordered(read, bad, plan, notes)
    if not known:
        return read.clock, bad, read.shift, read.zoned, "time_of_day"
    if not bad.all() and not (days[~bad] != UNKNOWN).any():
        notes.append(NO_DATE)
        return read.clock, bad, read.shift, read.zoned, "time_of_day"
    bad |= days == UNKNOWN
    return np.where(bad, 0, days) * DAY + read.clock, bad, read.shift, read.zoned, plan.kind


def _time_of_day(column: object) -> tuple[NDArray[np.int64], NDArray[np.bool_], NDArray[np.int64], bool]:
    import pyarrow as pa

    kind = column.type  # type: ignore[attr-defined]
    if pa.types.is_time(kind):
        whole, bad = arrays.whole_seconds(column)
        return whole, bad, np.zeros(1, np.int64), False
    if pa.types.is_floating(kind) or pa.types.is_integer(kind):
        column = column.cast(pa.int64()).cast(pa.string())  # type: ignore[attr-defined]
    read = parse(column, TIME)
    return read.clock, read.bad, read.shift, read.zoned


def _dates(column: object, plan: ClockPlan, notes: list[str]) -> tuple[NDArray[np.int64], bool]:
    """Days of a date column, parsed text by text (there are few)."""
    import pyarrow as pa

    if pa.types.is_date(column.type) or pa.types.is_timestamp(column.type):  # type: ignore[attr-defined]
        whole, empty = arrays.whole_seconds(column)
        return np.where(empty, UNKNOWN, whole // DAY), True
    codes, texts = arrays.coded(column)
    read = parse(pa.array(texts, pa.string()), DATE)
    bad = read.bad.copy()
    # the texts are in order of appearance, so that a step of one day can be seen
    days, known = _ordered(read, bad, plan, notes)
    if not known:
        return np.zeros(len(codes), np.int64), False
    table = np.append(np.where(bad, UNKNOWN, days), UNKNOWN)
    return _held(table[codes], notes), True


def _held(days: NDArray[np.int64], notes: list[str]) -> NDArray[np.int64]:
    """A date that is written only now and then holds until the next."""
    known = days != UNKNOWN
    share = np.count_nonzero(known) / max(1, len(days))
    if 0 < share < 0.9:
        place = np.maximum.accumulate(np.where(known, np.arange(len(days)), -1))
        notes.append("the date is not written on each row and held between")
        return np.where(place >= 0, days[np.maximum(place, 0)], days[np.flatnonzero(known)[0]])
    return days


def _ordered(read: Stamps, bad: NDArray[np.bool_], plan: ClockPlan, notes: list[str]) -> tuple[NDArray[np.int64], bool]:
    """Days, once day-first or month-first is settled; False where it stays open."""
    open_rows = ~bad & (read.first > 0)
    if not open_rows.any():
        return read.days, True
    first, second, year = read.first[open_rows], read.second[open_rows], read.year[open_rows]
    order, why = (plan.order or None), "the channels file"
    if order is None:
        order, why = date_order(first, second), "numbers above 12 or the step at midnight"
    if order is None and all(re.search(r"\d{1,2}\.\d{1,2}\.\d", form) for form in read.forms):
        order, why = "dmy", "being written with points"
    if order is None and plan.day is not None:
        both = {"dmy": days_of(year, second, first), "mdy": days_of(year, first, second)}
        fits = [name for name, days in both.items() if abs(int(days[0]) - plan.day) <= 1 and days[0] != UNKNOWN]
        order, why = (fits[0], "the preamble's date") if len(fits) == 1 else (None, "")
    if order is None and bool(np.all(first == second)):
        order, why = "dmy", "equal numbers"
    if order is None:
        notes.append("the date may be day first or month first: times are elapsed, UTC is not given")
        return read.days, False
    days = read.days.copy()
    days[open_rows] = days_of(year, second, first) if order == "dmy" else days_of(year, first, second)
    notes.append(f"dates are {'day' if order == 'dmy' else 'month'} first, by {why}")
    return days, True


def _offsets(column: object, notes: list[str]) -> tuple[NDArray[np.int64], bool]:
    """A column of zone offsets: +02:00, or hours as figures."""
    import pyarrow as pa

    if pa.types.is_floating(column.type) or pa.types.is_integer(column.type):  # type: ignore[attr-defined]
        hours, _ = arrays.floats(column)
        return np.where(np.isfinite(hours), hours * 3600e9, 0).astype(np.int64), True
    codes, texts = arrays.coded(column)
    found = [zone_offset(text if text[:1] in "+-" or not text[:1].isdigit() else "+" + text) for text in texts]
    if any(value is None for value in found) or not found:
        notes.append("the column of zone offsets is not understood: taken as UTC")
        return np.zeros(len(codes), np.int64), False
    table = np.array([*(value or 0.0 for value in found), found[0] or 0.0]) * SECOND
    return table.astype(np.int64)[codes], True


def _anchored(
    survey: Survey, parsed: Parsed, plan: ClockPlan, made: axis.Axis, notes: list[str]
) -> tuple[float | None, str]:
    """UTC of time 0, from coarser stamps beside an elapsed clock: the latest start that no stamp forbids."""
    assert plan.anchor is not None
    column = parsed.columns.pop(plan.anchor, None)
    if column is None:
        return None, ""
    whole, bad, shift, zoned, kind = _full(column, plan, notes)
    if kind == "time_of_day":
        return None, ""
    whole = whole - shift
    rows = made.rows if made.rows is not None else np.arange(len(whole))
    good = ~bad[rows]
    if not good.any() or made.resets:
        return None, ""
    zone, away = _zone(plan, zoned, notes, float(whole[rows][good][0]) / 1e9)
    # a stamp cut to whole seconds is late by less than its step, so the largest difference is the nearest
    return float(np.max(whole[rows][good] / 1e9 - made.time[good])) - away, zone


def _slowest(raws: list[RawChannel]) -> int:
    """Rows between the samples of the slowest channel."""
    most = 1
    for raw in raws:
        if raw.fold == 1 and len(raw.values) > 1:
            some = raw.values[: 1 << 18]
            filled = np.count_nonzero(np.isfinite(some))
            if filled > 1:
                most = max(most, int(len(some) / filled))
    return most


def _folded(
    time: Array, raws: list[RawChannel], seams: tuple[tuple[float, float], ...]
) -> tuple[Array, int, tuple[tuple[float, float], ...]]:
    """The union of the instants of rows and sub-frames."""
    fold = int(np.lcm.reduce([raw.fold for raw in raws])) if raws else 1
    if fold == 1:
        return time, 1, seams
    steps = np.diff(time)
    usual = float(np.median(steps)) if len(steps) else 1.0
    width = np.append(np.where(steps > 1.5 * usual, usual, steps), usual)
    out = (time[:, None] + width[:, None] * (np.arange(fold) / fold)).reshape(-1)
    # a seam begins with the last instant of its row
    moved = tuple((start + usual * (fold - 1) / fold, end) for start, end in seams)
    return out, fold, moved


def _doubled(survey: Survey, made: axis.Axis, raws: list[RawChannel], time: Array, fold: int) -> Rejected:
    """Rows whose stamp came before: the first stands."""
    kept = made.rows if made.rows is not None else np.arange(len(made.time))
    place = np.searchsorted(kept, made.doubled)
    place = np.clip(place - 1, 0, len(made.time) - 1)
    first, last = int(place[0]) * fold, int(place[-1]) * fold
    name = survey.columns[survey.clock.columns[-1]].name if survey.clock.columns else ""
    return Rejected(
        "time", name, float(time[first]), float(time[last]), len(made.doubled), "duplicate_time", None, (first, last)
    )
