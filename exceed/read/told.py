"""What a channels file says overrules recognition: columns, units, senses, the clock, what to ignore."""

from __future__ import annotations

import difflib
from collections.abc import Mapping, Sequence
from typing import Any

from exceed.core.quantities import QUANTITIES
from exceed.core.units import AIRSPEED_UNITS, UNITS
from exceed.errors import LogError, Problem
from exceed.read.cells import is_missing
from exceed.read.clock import _numbers
from exceed.read.look import Column
from exceed.read.stamps import DATE, FULL, TIME, ClockPlan, zone_offset

# which words of `positive` are the quantity's own sense; their opposites turn the sign
OPPOSITE = {"down": "up", "aft": "forward", "left": "right"}


def matching(columns: Sequence[Column], name: str) -> list[Column]:
    """Columns of a name: as written, else without case and blanks, else without the unit in it."""
    from exceed.read.units_in_text import split_unit

    def plain(text: str) -> str:
        return " ".join(text.lower().split())

    for test in (
        lambda c: c.name.strip() == name.strip(),
        lambda c: plain(c.name) == plain(name),
        lambda c: plain(split_unit(c.name)[0]) == plain(name),
    ):
        found = [c for c in columns if test(c)]
        if found:
            return found
    return []


def _near(name: str, columns: Sequence[Column]) -> str | None:
    """The heading that a name most probably means."""
    from exceed.read.units_in_text import split_unit

    by_plain = {split_unit(column.name)[0].lower(): column.name for column in reversed(columns)}
    found = difflib.get_close_matches(split_unit(name)[0].lower(), by_plain, n=1, cutoff=0.5)
    return by_plain[found[0]] if found else None


def apply_channels(
    columns: Sequence[Column], channels: Any, declared: Mapping[str, str], shown: str
) -> tuple[list[Column], list[str]]:
    """Columns as the channels file settles them, and notes for names that are not in the log."""
    out = list(columns)
    notes: list[str] = []
    taken: set[str] = set()
    for entry in getattr(channels, "channels", None) or ():
        found = matching(out, entry.column)
        if not found:
            near = _near(entry.column, out)
            notes.append(
                f"the channels file names column '{entry.column}', which is not in the log"
                + (f"; it has '{near}'" if near else "")
            )
            continue
        column = found[0]
        unit = getattr(entry, "unit", None) or None
        unit = AIRSPEED_UNITS[unit][0] if unit in AIRSPEED_UNITS else unit
        quantity = str(entry.quantity)
        row = QUANTITIES.get(quantity)
        if unit is None and row is not None and row.discrete:
            unit = "state"
        accuracy = getattr(entry, "accuracy", None)
        unit = unit or (column.unit if column.quantity == quantity else None)
        datum = getattr(entry, "datum", None) or None
        out[column.index] = column.with_(
            quantity=quantity,
            unit=unit,
            units=() if unit else column.units or (),
            alternatives=(),
            score=2.0,
            problem="",
            question="",
            found_by="channels file",
            reason="named in the channels file",
            positive=getattr(entry, "positive", None) or None,
            datum=datum,
            accuracy=_si(accuracy),
            declared=row is None,
            group=(),
            part=-1,
        )
        if unit is None:
            from exceed.read.recognise import kind_of, open_units

            out[column.index] = out[column.index].with_(units=open_units(quantity, kind_of(quantity, declared)))
        taken.add(quantity)
    for name in getattr(channels, "ignore", None) or ():
        for column in matching(out, name):
            out[column.index] = out[column.index].with_(
                ignored=True, quantity=None, problem="ignored by the channels file", question=""
            )
    return out, notes


def _si(accuracy: Any) -> float | None:
    """An accuracy as the documents give it: a plain figure in SI, or an object with `.si` or `.value`."""
    if accuracy is None:
        return None
    for name in ("si", "value"):
        if hasattr(accuracy, name):
            return float(getattr(accuracy, name))
    return float(accuracy)


def told_clock(
    columns: Sequence[Column],
    channels: Any,
    cells: Sequence[Sequence[str]],
    decimal: str,
    shown: str,
    period: float | None = None,
) -> ClockPlan | None:
    """The clock that the channels file names."""
    clock = getattr(channels, "clock", None)
    if clock is None:
        return None
    names = list(getattr(clock, "columns", None) or ()) or [getattr(clock, "column", None)]
    places = []
    for name in names:
        found = matching(columns, str(name)) if name else []
        if not found:
            near = _near(str(name), columns)
            raise LogError(
                Problem(
                    shown,
                    f"the channels file names the clock column '{name}', which is not in the log",
                    expected="one of its columns" + (f", for example '{near}'" if near else ""),
                    do="correct 'clock' in the channels file",
                )
            )
        places.append(found[0].index)
    kind = str(clock.kind)
    zone = str(getattr(clock, "zone", None) or "")
    offset = _si(getattr(clock, "offset", None)) or 0.0
    unit = getattr(clock, "unit", None)
    factor = UNITS[str(unit)].factor if unit else 1.0
    interval = getattr(clock, "interval", None)
    if kind in ("elapsed", "epoch", "frame"):
        if kind == "epoch" and not unit:
            top = max(_numbers(cells[places[0]], decimal), default=0.0)
            factor = next((s for s in (1.0, 1e-3, 1e-6, 1e-9) if 6.3e8 <= top * s <= 4.1e9), 1.0)
        if kind == "frame" and interval is not None:
            factor = _si(interval) or 1.0
        elif kind == "frame" and period is not None:
            factor = period
        role = "frame" if kind == "frame" else "number"
        return ClockPlan(
            kind,
            (places[0],),
            unit=factor,
            zone=zone or ("UTC" if kind == "epoch" else ""),
            offset=offset,
            typed="number",
            roles=(role,),
            notes=("the clock is the channels file's",),
        )
    if len(places) == 1:
        some = [cell for cell in cells[places[0]] if not is_missing(cell)]
        full = sum(bool(FULL.fullmatch(cell.strip())) for cell in some) >= sum(
            bool(TIME.fullmatch(cell.strip())) for cell in some
        )
        roles: tuple[str, ...] = ("full",) if full else ("time",)
        made = ClockPlan(
            "iso" if full else "time_of_day", tuple(places), zone=zone, offset=offset, typed="text", roles=roles
        )
        return made.with_(notes=("the clock is the channels file's",))
    first = [cell.strip() for cell in cells[places[0]] if not is_missing(cell)]
    if first and not DATE.fullmatch(first[0]) and TIME.fullmatch(first[0]):
        places[0], places[1] = places[1], places[0]
    roles = ("date", "time", "offset")[: len(places)]
    if zone and zone_offset(zone) is not None:
        roles = roles[:2]
        places = places[:2]
    return ClockPlan(
        "date_time",
        tuple(places),
        zone=zone,
        offset=offset,
        typed="text",
        roles=roles,
        notes=("the clock is the channels file's",),
    )
