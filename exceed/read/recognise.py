"""Column headings, units and first cells -> quantities, each with its reason and what is still open."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

from exceed.core.quantities import QUANTITIES
from exceed.core.units import UNITS, units_of
from exceed.read.cells import form, is_missing
from exceed.read.engines import declared_meaning
from exceed.read.look import Column
from exceed.read.names import Meaning, clock_name, meanings, words_of
from exceed.read.units_in_text import RAW, plain, says_nothing, split_unit, unit_in

# what a heading means when its unit is of another kind than the name's first meaning
_BY_KIND: dict[tuple[str, str], str] = {
    ("bank_angle", "angular rate"): "roll_rate",
    ("pitch_angle", "angular rate"): "pitch_rate",
    ("heading", "angular rate"): "yaw_rate",
    ("track_angle", "angular rate"): "turn_rate",
    ("sideslip_angle", "load factor"): "lateral_load_factor",
    ("yaw_rate", "angle"): "heading",
    ("fuel_mass", "volume"): "fuel_volume",
    ("fuel_volume", "mass"): "fuel_mass",
    ("fuel_mass_flow", "volume flow"): "fuel_volume_flow",
    ("height_above_ground", "pressure"): "",
    ("altimeter_setting", "length"): "pressure_altitude",
    ("pressure_altitude", "speed"): "vertical_speed",
    ("static_pressure", "length"): "pressure_altitude",
    ("pressure_altitude", "pressure"): "static_pressure",
    ("longitude", "load factor"): "longitudinal_load_factor",
    ("latitude", "load factor"): "lateral_load_factor",
    ("load_factor", "angular rate"): "",
    ("mach", "length"): "",
}

QUESTIONS = {
    "speed": "Is it in kt, km/h, mph or m/s?",
    "length": "Is it in ft or m?",
    "angle": "Is it in deg or rad?",
    "angular rate": "Is it in deg/s or rad/s?",
    "load factor": "Is it in g or m/s2?",
    "temperature": "Is it in degC, degF or K?",
    "pressure": "Is it in hPa, kPa, Pa, inHg or psi?",
    "mass": "Is it in kg or lb?",
    "volume": "Is it in L or USG?",
    "mass flow": "Is it in kg/h or lb/h?",
    "volume flow": "Is it in L/h or USG/h?",
    "rotation": "Is it in rpm?",
}

# units that recorders really write, by kind: what evidence chooses among
OPEN_UNITS: dict[str, tuple[str, ...]] = {
    "speed": ("kt", "km/h", "mph", "m/s"),
    "length": ("ft", "m"),
    "angle": ("deg", "rad"),
    "angular rate": ("deg/s", "rad/s"),
    "load factor": ("g", "m/s2", "ft/s2"),
    "temperature": ("degC", "degF", "K"),
    "pressure": ("hPa", "Pa", "kPa", "inHg", "psi"),
    "rotation": ("rpm",),
    "mass": ("kg", "lb"),
    "volume": ("L", "USG"),
    "mass flow": ("kg/h", "lb/h"),
    "volume flow": ("L/h", "USG/h"),
    "ratio": ("1",),
    "state": ("state",),
}


def kind_of(quantity: str, declared: Mapping[str, str]) -> str:
    """The kind of a known or declared quantity."""
    if quantity in declared:
        return UNITS[declared[quantity]].kind
    return QUANTITIES[quantity].kind if quantity in QUANTITIES else ""


def open_units(quantity: str, kind: str) -> tuple[str, ...]:
    """Units that a column of unstated unit may have."""
    if quantity == "vertical_speed":
        return ("ft/min", "m/s", "ft/s")
    if quantity == "centre_of_gravity":
        return ("m", "in")
    return OPEN_UNITS.get(kind, units_of(kind))


def column_form(cells: Sequence[str]) -> str:
    """number, stamp, word, empty or mixed, by the filled cells of a column."""
    kinds = [form(cell) for cell in cells if not is_missing(cell)]
    if not kinds:
        return "empty"
    for kind in ("number", "stamp", "word"):
        if kinds.count(kind) >= 0.8 * len(kinds):
            return kind
    return "number" if kinds.count("number") >= 0.5 * len(kinds) else "mixed"


def columns_of(
    names: Sequence[str],
    units: Sequence[str],
    sources: Sequence[str],
    cells: Sequence[Sequence[str]],
    declared: Mapping[str, str],
) -> list[Column]:
    """Recognise every column on its own. `cells[k]` are sample cells of column k."""
    made = []
    for index, name in enumerate(names):
        source = sources[index] if index < len(sources) else ""
        made.append(
            recognise(index, name, units[index] if index < len(units) else "", source, tuple(cells[index]), declared)
        )
    return made


def recognise(
    index: int, name: str, unit_cell: str, source: str, cells: tuple[str, ...], declared: Mapping[str, str]
) -> Column:
    """One column: the quantity by its name, the unit from every place where it can stand."""
    shape = column_form(cells)
    bare, in_name = split_unit(name)
    unit_text, unit_from = (unit_cell, "units row") if unit_cell else (in_name, "heading")
    if not unit_text and source:
        for part in re.split(r"\s+", source):
            if unit_in(part) and not says_nothing(part) and not part.isdigit() and len(part) > 1:
                unit_text, unit_from = part, "second heading"
    if not unit_text:
        unit_text, unit_from = _unit_of_cells(cells)
    column = Column(index, name, unit_text, source, shape, cells[:40])
    if unit_text and plain(unit_text) in RAW and not unit_in(unit_text):
        return column.with_(problem=f"written in {unit_text}: raw sensor output, no physical quantity")
    if not unit_text:
        # KIAS as a name says the unit as well
        unit_text = next(
            (
                word
                for word in words_of(name)
                if (told := unit_in(word)) is not None and told.quantity and word[0] == "k"
            ),
            "",
        )
        unit_from = "name"
    multiple = _multiple(name, unit_cell)
    if multiple:
        return column.with_(
            problem=f"written in '{multiple}', a multiple of a unit",
            question="Which quantity is it, and in which unit?",
        )
    own = declared_meaning(bare, name, declared)
    found, why = ((own,), "") if own else meanings(bare)
    whole, _ = meanings(name) if not own else ((), "")
    # a unit may be part of the name after all: `E1 RPM`, `LONG G`, `G`
    if whole and (
        not found
        or whole[0].score > found[0].score + 0.1
        or (bare != name and whole[0].score >= found[0].score and not unit_cell)
    ):
        found = whole
    if not found and source:
        found, _ = meanings(source)
    spoken = unit_in(unit_text) if in_name or unit_cell else None
    if not found and spoken and spoken.quantity:
        found = (Meaning(spoken.quantity, 0.8, f"its unit {unit_text} names the speed"),)
    if not found:
        return column.with_(problem=f"not understood: {why}" if why else "not understood")
    made = _with_unit(column, found, unit_text, unit_from, declared)
    row = QUANTITIES.get(made.quantity or "")
    if shape == "word" and made.quantity and not made.problem and row is not None and not row.discrete:
        seen = ", ".join(f"'{cell}'" for cell in sorted({cell for cell in cells if cell})[:4])
        return made.with_(
            problem=f"its cells are words ({seen}), not figures", question=f"What is the {row.name} for each of them?"
        )
    return made


_MULTIPLE = re.compile(
    r"(?:[x×*/]\s*\d[\d.,eE+\-^]*|\d[\d.,]*\s*[x×*]?)\s*([A-Za-z°%/²2]+)"
    r"|([A-Za-z°%/]+)\s*[x×*/]\s*\d+(?:[.,]\d+)?|\bFL\b|flight level",
    re.I,
)


def _multiple(name: str, unit_cell: str) -> str:
    """`x100 ft`, `ft*10`, `0.01 g`, FL: figures that are a multiple of a unit are no figures in it."""
    for text in (unit_cell, *re.findall(r"[\[({]\s*([^\[\](){}]*?)\s*[\])}]", name)):
        match = _MULTIPLE.fullmatch(text.strip())
        if match and not unit_in(text) and (match.group(1) is None or unit_in(match.group(1))):
            return str(text).strip()
    return ""


def _with_unit(
    column: Column, found: tuple[Meaning, ...], unit_text: str, unit_from: str, declared: Mapping[str, str]
) -> Column:
    stated = None if says_nothing(unit_text) else unit_in(unit_text)
    first = found[0]
    if stated is not None and stated.quantity:
        kinds = {"indicated_airspeed", "calibrated_airspeed", "equivalent_airspeed", "true_airspeed", "ground_speed"}
        if first.quantity in kinds:
            clash = first.quantity != stated.quantity and not first.open and first.score > 0.9
            if clash:
                return column.with_(
                    problem=f"named {first.quantity} but its unit {unit_text} says {stated.quantity}",
                    question="Which airspeed is it?",
                )
            return column.with_(
                quantity=stated.quantity,
                unit=stated.units[0],
                score=max(first.score, 0.9),
                found_by="name and unit",
                reason=f"{first.reason}; {unit_text} in the {unit_from}",
            )
    if first.quantity in QUANTITIES and QUANTITIES[first.quantity].discrete:
        return _state(column, first, stated, unit_text)
    mismatch = ""
    if stated is not None:
        for meaning in found:
            kind = kind_of(meaning.quantity, declared)
            unit = next((u for u in stated.units if UNITS[u].kind == kind), None)
            if unit is not None:
                return _open(column, meaning).with_(
                    quantity=meaning.quantity,
                    unit=unit,
                    score=meaning.score + 0.05,
                    found_by="name and unit",
                    reason=f"{meaning.reason}; {unit_text} in the {unit_from}",
                )
            if kind == "temperature" and "deg" in stated.units:
                return column.with_(
                    quantity=meaning.quantity,
                    units=open_units(meaning.quantity, kind),
                    score=meaning.score,
                    found_by="name and data",
                    reason=f"{meaning.reason}; '{unit_text}' does not say which scale",
                )
        for meaning in found:
            for unit in stated.units:
                other = _BY_KIND.get((meaning.quantity, UNITS[unit].kind))
                if other:
                    return column.with_(
                        quantity=other,
                        unit=unit,
                        score=meaning.score,
                        found_by="name and unit",
                        reason=f"{meaning.reason}; its unit {unit_text} makes it {other}",
                    )
        mismatch = (
            f"named like {first.quantity}, but its unit '{unit_text}' is not one of {kind_of(first.quantity, declared)}"
        )
    elif unit_text and not says_nothing(unit_text):
        # a unit row's text that is no unit we know: data may still settle it, but say so
        mismatch = f"its unit '{unit_text}' is not known"
    if mismatch:
        return column.with_(
            problem=mismatch,
            question=f"Which quantity is it, and in which unit? ({', '.join(m.quantity for m in found[:3])})",
        )
    if len(found) > 1 and found[1].score >= found[0].score:
        names = tuple(m.quantity for m in found if m.score >= found[0].score)
        return column.with_(
            quantity=names[0],
            alternatives=names,
            score=first.score,
            reason=first.reason,
            found_by="name and data",
            units=tuple(u for q in names for u in open_units(q, kind_of(q, declared))),
        )
    kind = kind_of(first.quantity, declared)
    units = ("%", "1") if kind == "ratio" and first.quantity in declared else open_units(first.quantity, kind)
    if len(units) == 1:
        return _open(column, first).with_(
            quantity=first.quantity,
            unit=units[0],
            score=first.score,
            reason=f"{first.reason}; {units[0]}, the only unit it has" if units[0] != "1" else first.reason,
            found_by="name",
        )
    if first.quantity in declared:
        return column.with_(
            quantity=first.quantity,
            units=units,
            score=first.score,
            reason=first.reason,
            found_by="name and data",
            declared=True,
        )
    return _open(column, first).with_(
        quantity=first.quantity,
        units=units,
        score=first.score,
        reason=f"{first.reason}; no unit is written",
        found_by="name and data",
    )


def _open(column: Column, meaning: Meaning) -> Column:
    """A speed that does not say which: kept as a candidate, with the question."""
    if meaning.open:
        return column.with_(
            alternatives=("indicated_airspeed", "ground_speed"),
            question="Is it indicated airspeed, true airspeed or ground speed?",
        )
    return column


def _state(column: Column, meaning: Meaning, stated: object, unit_text: str) -> Column:
    if (
        stated is not None
        and "state" not in getattr(stated, "units", ())
        and "%" not in getattr(stated, "units", ())
        and "deg" not in getattr(stated, "units", ())
        and "1" not in getattr(stated, "units", ())
    ):
        return column.with_(problem=f"named like {meaning.quantity}, but its unit '{unit_text}' is none of a state")
    return column.with_(
        quantity=meaning.quantity, unit="state", score=meaning.score, reason=meaning.reason, found_by="name"
    )


def _unit_of_cells(cells: Sequence[str]) -> tuple[str, str]:
    """`123.4 kt` in each cell."""
    from exceed.read.cells import WITH_UNIT

    found = [match.group(2) for cell in cells if (match := WITH_UNIT.fullmatch(cell.strip()))]
    filled = [cell for cell in cells if not is_missing(cell)]
    if found and len(found) >= 0.8 * len(filled) and len(set(found)) == 1 and unit_in(found[0]):
        return found[0], "cells"
    return "", ""


def is_clock(column: Column) -> str | None:
    """What a column can be to the clock."""
    return clock_name(column.name) or clock_name(split_unit(column.name)[0])
