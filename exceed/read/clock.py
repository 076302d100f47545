"""Which columns are the clock: found in the first block, by name, cells and unit, or told by a channels file."""

from __future__ import annotations

import re
from collections.abc import Sequence
from itertools import pairwise

from exceed.core.units import UNITS
from exceed.read.cells import NUMBER_COMMA, NUMBER_DOT, WITH_UNIT, is_missing
from exceed.read.look import Column
from exceed.read.recognise import is_clock
from exceed.read.stamps import DATE, FULL, TIME, ClockPlan, one_date, zone_offset
from exceed.read.units_in_text import unit_in

# seconds since 1970 of 1990 and 2100: a number between them, in its unit, is an epoch
_EPOCH_FROM, _EPOCH_TO = 6.3e8, 4.1e9
_FRAME_RATE = re.compile(
    r"(frame|sample|sampling|record|recording|data|log|logging|scan|update|row|acquisition)s?[ "
    r"_-]*(rate|frequency|freq)|^rate$|^frequency$|hz",
    re.I,
)
_FRAME_PERIOD = re.compile(
    r"(frame|sample|sampling|record|recording|log|logging|data|scan|row)[ "
    r"_-]*(interval|period|time|length|duration)|^interval$|^period$",
    re.I,
)


def _numbers(cells: Sequence[str], decimal: str) -> list[float]:
    out = []
    for cell in cells:
        text = cell.strip().strip('"')
        if match := WITH_UNIT.fullmatch(text):
            text = match.group(1)
        if (NUMBER_DOT if decimal == "." else NUMBER_COMMA).fullmatch(text):
            out.append(float(text.replace(",", ".")))
    return out


def _share(cells: Sequence[str], pattern: re.Pattern[str]) -> float:
    filled = [cell for cell in cells if not is_missing(cell)]
    return sum(bool(pattern.fullmatch(cell.strip())) for cell in filled) / len(filled) if filled else 0.0


def find_clock(
    columns: Sequence[Column], facts: Sequence[tuple[str, str]], decimal: str, cells: Sequence[Sequence[str]]
) -> ClockPlan:
    """The best clock that the first block shows. kind 'none' with the reason where there is none."""
    day, zone, notes = _facts(facts)
    full: list[int] = []
    dates: list[int] = []
    times: list[int] = []
    offsets: list[int] = []
    numbers: list[int] = []
    frames: list[int] = []
    parts: dict[str, int] = {}
    for column in columns:
        if column.ignored or (column.quantity and column.score > 0.5 and column.form == "number"):
            continue
        role = is_clock(column)
        some = cells[column.index]
        if column.form == "stamp" or (column.form == "mixed" and role):
            if _share(some, FULL) > 0.8:
                full.append(column.index)
            elif _share(some, TIME) > 0.8:
                (offsets if role == "offset" else times).append(column.index)
            elif _share(some, DATE) > 0.8:
                dates.append(column.index)
            continue
        if role == "offset":
            offsets.append(column.index)
        elif column.form == "number":
            values = _numbers(some, decimal)
            if role == "date" and values and _date_figures(some, values):
                dates.append(column.index)
            elif role in ("hour", "minute", "second", "year", "month"):
                parts[role] = column.index
            elif role == "time":
                numbers.append(column.index)
            elif role == "frame":
                frames.append(column.index)
    if not full and not times:
        apart = _apart(columns, cells, parts, numbers, dates, decimal, zone, day, notes)
        if apart is not None:
            return apart
        figures = [k for k in numbers if _clock_figures(cells[k], columns[k], alone=not dates)]
        if figures:
            times.append(figures[0])
            numbers.remove(figures[0])
    plan = _absolute(columns, cells, full, dates, times, offsets, zone, day, notes)
    counting = _numeric(columns, cells, numbers, frames, facts, decimal, notes, day, zone)
    if counting is not None and counting.kind == "epoch":
        return counting
    if plan is None and counting is None:
        guessed = _first_rising(columns, cells, decimal, notes)
        return guessed or _rows_as_clock(facts, notes)
    if plan is None or counting is None:
        return plan or counting  # type: ignore[return-value]
    # stamps that are as fine as the rows carry their own date; coarse ones only anchor a finer counter
    sample = [
        cell for cell in cells[plan.columns[-1] if plan.kind != "iso" else plan.columns[0]] if not is_missing(cell)
    ]
    fine = len(set(sample)) > 0.9 * len(sample)
    if fine or counting.kind in ("frame", "row") or plan.kind == "time_of_day":
        if not fine and counting.kind == "elapsed":
            return counting.with_(anchor=plan.columns[0] if plan.kind == "iso" else None)
        return plan
    return counting.with_(anchor=plan.columns[0]) if plan.kind == "iso" else plan


def _clock_figures(cells: Sequence[str], column: Column, alone: bool) -> bool:
    """hhmmss as a number: no pair of digits above 59. Without a date beside it, it must also skip from 59 to 100."""
    stated = unit_in(column.unit_text)
    if stated is not None and any(UNITS[unit].kind == "time" for unit in stated.units):
        return False
    filled = [cell.strip() for cell in cells if not is_missing(cell)]
    if not filled or not all(re.fullmatch(r"(0?\d|1\d|2[0-3])[0-5]\d[0-5]\d([.,]\d+)?", text) for text in filled):
        return False
    if not alone or any(text.startswith("0") and len(re.split("[.,]", text)[0]) == 6 for text in filled):
        return True
    # elapsed seconds would pass through endings from 60 to 99; a clock's figures never do
    return len({re.split("[.,]", text)[0] for text in filled}) > 100


def _date_figures(cells: Sequence[str], values: Sequence[float]) -> bool:
    """yyyymmdd, ddmmyy, or a day of the month."""
    if not all(value == int(value) for value in values):
        return False
    if all(19700101 <= value < 21000101 for value in values) or all(1 <= value <= 31 for value in values):
        return True
    return all(re.fullmatch(r"\d{6}", cell.strip()) for cell in cells if not is_missing(cell))


def _apart(
    columns: Sequence[Column],
    cells: Sequence[Sequence[str]],
    parts: dict[str, int],
    numbers: list[int],
    dates: list[int],
    decimal: str,
    zone: str,
    day: int | None,
    notes: list[str],
) -> ClockPlan | None:
    """Hours, minutes and seconds (and year, month, day) in columns of their own."""
    if "hour" not in parts or "minute" not in parts:
        return None
    second = parts.get("second")
    if second is None:
        second = next((k for k in numbers if max(_numbers(cells[k], decimal), default=99.0) < 61.0), None)
    picked = {"hour": parts["hour"], "minute": parts["minute"]}
    if second is not None:
        picked["second"] = second
    days = [k for k in dates if all(1 <= v <= 31 for v in _numbers(cells[k], decimal)) and _numbers(cells[k], decimal)]
    if "year" in parts and "month" in parts and days:
        picked |= {"year": parts["year"], "month": parts["month"], "day": days[0]}
    heading = columns[parts["hour"]].name.lower()
    where = "UTC" if re.search("utc|gmt|zulu", heading) else zone
    kind = "date_time" if "year" in picked else "time_of_day"
    return ClockPlan(
        kind, tuple(picked.values()), zone=where, typed="number", day=day, roles=tuple(picked), notes=tuple(notes)
    )


def _facts(facts: Sequence[tuple[str, str]]) -> tuple[int | None, str, list[str]]:
    """Date and zone that a preamble gives."""
    day, zone, notes = None, "", []
    for key, value in facts:
        plain = key.strip().lower()
        if (
            day is None
            and re.search(r"date|start|begin|day|flight|recorded", plain)
            and not re.search(r"calib|expir|install|manufact|firmware|software|version|build|birth|service", plain)
        ):
            found, open_date = one_date(value)
            if found is not None:
                day = found
            elif open_date:
                notes.append(f"the preamble's date '{value}' may be day first or month first")
        if (
            re.search(r"zone|utc|gmt|\btz\b", plain)
            and not zone
            and (zone_offset(value) is not None or re.search(r"zone|\btz\b", plain))
        ):
            zone = value.strip()
    return day, zone, notes


def _absolute(
    columns: Sequence[Column],
    cells: Sequence[Sequence[str]],
    full: list[int],
    dates: list[int],
    times: list[int],
    offsets: list[int],
    zone: str,
    day: int | None,
    notes: list[str],
) -> ClockPlan | None:
    def heading_zone(index: int) -> str:
        text = f"{columns[index].name} {columns[index].unit_text} {columns[index].source}".lower()
        if re.search(r"utc|gmt|zulu", text):
            return "UTC"
        return "local" if re.search(r"local|lcl", text) else ""

    if full:
        # UTC before local time, finer before coarser
        def merit(index: int) -> tuple[int, int, int]:
            filled = [cell for cell in cells[index] if not is_missing(cell)]
            zoned = any(m.group("zone") for cell in filled[:20] if (m := FULL.fullmatch(cell.strip())))
            return (
                int(zoned) + 2 * (heading_zone(index) == "UTC") - 2 * (heading_zone(index) == "local"),
                len(set(filled)),
                -index,
            )

        index = max(full, key=merit)
        sample = [cell.strip() for cell in cells[index] if not is_missing(cell)]
        matches = [FULL.fullmatch(text) for text in sample]
        zoned = any(m and m.group("zone") for m in matches)
        iso = all(
            re.fullmatch(r"\d{4}-\d{2}-\d{2}[T ]\d{2}:\d{2}(:\d{2}(\.\d{1,9})?)?(Z|[+-]\d{2}(:?\d{2})?)?", text)
            for text in sample
        )
        every = all(m and m.group("zone") for m in matches)
        typed = ("stamp_zone" if every else "text" if zoned else "stamp") if iso else "text"
        return ClockPlan(
            "iso",
            (index,),
            zone="in the cells" if zoned else heading_zone(index) or zone,
            typed=typed,
            day=day,
            roles=("full",),
            notes=tuple(notes),
        )
    if times:
        merit_time = sorted(times, key=lambda i: (-len({c for c in cells[i] if c}), i))
        utc = [i for i in merit_time if heading_zone(i) == "UTC"]
        index = (utc or merit_time)[0]
        sample = [cell.strip() for cell in cells[index] if not is_missing(cell)]
        plain = all(re.fullmatch(r"\d{2}:\d{2}(:\d{2}(\.\d{1,9})?)?", text) and text < "24" for text in sample)
        typed = "time" if plain else "text"
        if dates:
            same = [i for i in dates if heading_zone(i) == heading_zone(index)]
            date = (same or dates)[0]
            picked = (
                (date, index, *offsets[:1])
                if heading_zone(index) != "UTC" and heading_zone(date) != "UTC"
                else (date, index)
            )
            roles = ("date", "time", "offset")[: len(picked)]
            where = "in the cells" if len(picked) == 3 else heading_zone(index) or heading_zone(date) or zone
            return ClockPlan("date_time", picked, zone=where, typed=typed, day=day, roles=roles, notes=tuple(notes))
        return ClockPlan(
            "time_of_day",
            (index,),
            zone=heading_zone(index) or zone,
            typed=typed,
            day=day,
            roles=("time",),
            notes=tuple(notes),
        )
    return None


def _numeric(
    columns: Sequence[Column],
    cells: Sequence[Sequence[str]],
    numbers: list[int],
    frames: list[int],
    facts: Sequence[tuple[str, str]],
    decimal: str,
    notes: list[str],
    day: int | None,
    zone: str,
) -> ClockPlan | None:
    best: tuple[float, ClockPlan] | None = None
    for index in numbers:
        values = _numbers(cells[index], decimal)
        if not values:
            continue
        column = columns[index]
        steps = [b - a for a, b in pairwise(values)]
        rising = sum(step >= 0 for step in steps) >= 0.8 * len(steps) if steps else True
        if not rising:
            continue
        stated = unit_in(column.unit_text) if column.unit_text else None
        unit = next((UNITS[u].factor for u in (stated.units if stated else ()) if UNITS[u].kind == "time"), None)
        if unit is None:
            unit = _unit_in_name(column.name)
        top = max(values)
        epoch = [s for s in (1.0, 1e-3, 1e-6, 1e-9) if _EPOCH_FROM <= top * s <= _EPOCH_TO]
        named = re.search(r"epoch|unix|posix", column.name, re.I)
        if (
            epoch
            and (unit is None or named or any(abs(unit / s - 1) < 1e-9 for s in epoch))
            and (top > 1e8 and (unit != 1e-9 or epoch[0] == 1e-9))
        ):
            scale = next((s for s in epoch if unit is not None and abs(unit / s - 1) < 1e-9), epoch[0])
            if unit is None or abs(unit / scale - 1) < 1e-9 or named:
                return ClockPlan(
                    "epoch", (index,), unit=scale, zone="UTC", typed="number", roles=("number",), notes=tuple(notes)
                )
        more = list(notes)
        if unit is None:
            unit, said = _unit_by_steps(values, steps)
            more.append(said)
        distinct = len(set(values)) / len(values)
        score = distinct + (0.1 if stated else 0.0)
        plan = ClockPlan(
            "elapsed", (index,), unit=unit, zone=zone, typed="number", day=None, roles=("number",), notes=tuple(more)
        )
        if best is None or score > best[0]:
            best = (score, plan)
    if best is not None:
        return best[1]
    for index in frames:
        period = stated_period(facts)
        if period is None:
            continue
        values = _numbers(cells[index], decimal)
        rising = sum(b >= a for a, b in pairwise(values)) >= 0.8 * max(1, len(values) - 1)
        if values and rising:
            note = f"time from the frame counter, {1.0 / period:g} frames a second as the preamble says"
            return ClockPlan("frame", (index,), unit=period, typed="number", roles=("frame",), notes=(*notes, note))
    return None


def _unit_in_name(name: str) -> float | None:
    words = re.split(r"[^a-z]+", name.lower())
    for spellings, factor in (
        (("ms", "msec", "millis", "milliseconds"), 1e-3),
        (("us", "usec", "micros", "microseconds"), 1e-6),
        (("ns", "nanos", "nanoseconds"), 1e-9),
        (("s", "sec", "secs", "seconds", "tsec"), 1.0),
        (("min", "minutes"), 60.0),
        (("h", "hours"), 3600.0),
    ):
        if any(word in spellings for word in words):
            return factor
    return None


def _unit_by_steps(values: Sequence[float], steps: Sequence[float]) -> tuple[float, str]:
    """Seconds or milliseconds, by the step: no recorder writes 5 rows an hour or a million a second."""
    positive = sorted(step for step in steps if step > 0)
    step = positive[len(positive) // 2] if positive else 1.0
    whole = all(v == int(v) for v in values)
    if whole and step >= 1000.0 and step < 20000.0:
        if step >= 1e4:
            return 1e-6, f"no unit of time is written: the step of {step:g} is taken as microseconds"
        return 1e-3, f"no unit of time is written: the step of {step:g} is taken as milliseconds"
    if whole and step >= 2e4:
        factor = 1e-6 if step < 5e6 else 1e-9
        return (
            factor,
            f"no unit of time is written: the step of {step:g} is taken as "
            f"{'micro' if factor == 1e-6 else 'nano'}seconds",
        )
    if whole and step >= 10.0:
        return 1e-3, f"no unit of time is written: the step of {step:g} is taken as milliseconds"
    return 1.0, f"no unit of time is written: the step of {step:g} is taken as seconds"


def stated_period(facts: Sequence[tuple[str, str]]) -> float | None:
    """Seconds a frame, as the preamble states it."""
    for key, value in facts:
        text = f"{value}".strip()
        match = re.search(r"(\d+(?:[.,]\d+)?(?:[eE][+-]?\d+)?)\s*([A-Za-z/]*)", text)
        if not match:
            continue
        figure = float(match.group(1).replace(",", "."))
        unit = match.group(2).lower() or key.lower()
        if figure <= 0:
            continue
        if _FRAME_PERIOD.search(key):
            factor = 1e-3 if re.search(r"ms|milli", unit) else 1e-6 if re.search(r"us\b|micro", unit) else 1.0
            return figure * factor
        if _FRAME_RATE.search(key):
            return 1.0 / (figure * (1000.0 if unit.startswith("khz") else 1.0))
    return None


def _first_rising(
    columns: Sequence[Column], cells: Sequence[Sequence[str]], decimal: str, notes: list[str]
) -> ClockPlan | None:
    """A first column that rises evenly is the clock even if its heading does not say so."""
    for column in columns[:2]:
        if column.quantity or column.form != "number" or column.ignored:
            continue
        values = _numbers(cells[column.index], decimal)
        steps = [b - a for a, b in pairwise(values)]
        if len(steps) < 4 or min(steps) <= 0:
            continue
        middle = sorted(steps)[len(steps) // 2]
        if sum(abs(step - middle) <= 0.2 * middle for step in steps) < 0.8 * len(steps):
            continue
        if (
            all(v == int(v) for v in values)
            and middle == 1.0
            and values[0] in (0.0, 1.0)
            and column.name.startswith("column ") is False
        ):
            return None  # a counter without a rate
        unit, said = _unit_by_steps(values, steps)
        note = f"'{column.name}' rises evenly and is taken as the clock; {said}"
        return ClockPlan("elapsed", (column.index,), unit=unit, typed="number", roles=("number",), notes=(*notes, note))
    return None


def _rows_as_clock(facts: Sequence[tuple[str, str]], notes: list[str]) -> ClockPlan:
    period = stated_period(facts)
    if period is not None:
        note = f"no clock column: rows are counted, {1.0 / period:g} a second as the preamble says"
        return ClockPlan("frame", (), unit=period, roles=("row",), notes=(*notes, note))
    return ClockPlan(
        "none", problem="no clock: no column of time was found, and no frame rate is stated", notes=tuple(notes)
    )
