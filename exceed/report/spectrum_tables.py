"""Spectra as tables: one aeroplane's level crossings, peaks and cycles, by phase and by cause."""

from __future__ import annotations

from typing import Any

from exceed.report.layout import Column
from exceed.report.plots import Part, Sheet
from exceed.report.show import count, duration, number

Dict = dict[str, Any]
# most columns of levels in the table by phase
_MOST_LEVELS = 8


def name_of(row: Dict) -> str:
    if row["everything"]:
        return "altogether"
    return row["registration"] or "no registration"


def part_of(row: Dict) -> Part:
    rates = ", ".join(f"{rate:g}" for rate in row["rates_hz"])
    flights = "flights not known, all recorded time counts as airborne"
    if row["flights"] is not None:
        flights = count(row["flights"], "flight")
    stretches = count(row["stretches"], "stretch", "stretches")
    said = [
        f"{count(row['recordings'], 'log')}, {flights}: {_hours(row['airborne_s'])} airborne,"
        f" {_hours(row['counted_s'])} counted in {stretches} at {rates} Hz",
    ]
    if row["lowest_g"] is not None:
        said.append(f"from {number(row['lowest_g'], 2)} to {number(row['highest_g'], 2)} g")
    if row["derived"]:
        said.append("load factor was derived, not recorded, in some of these logs: short and small loads are missing")
    sheets = [_levels(row), _ranges("Rainflow cycles by range", row["cycles"]), _phases(row), _causes(row)]
    weighted = row["mass_weighted"]
    if weighted is not None:
        mass = weighted["reference_mass"]
        title = f"Load factor x mass / {mass['value']:g} kg, {weighted['counted_h']:.2f} h"
        note = (f"without mass: {row['mass_weighted_note']}",) if row["mass_weighted_note"] else ()
        sheets.append(_levels(weighted, title, note))
        sheets.append(_ranges(f"Rainflow cycles of load factor x mass / {mass['value']:g} kg", weighted["cycles"]))
    elif row["mass_weighted_note"]:
        sheets.append(Sheet("Load factor x mass", said=(f"not counted: {row['mass_weighted_note']}",)))
    return Part(name_of(row), tuple(said), (), tuple(sheets))


def _hours(seconds: float) -> str:
    return f"{seconds / 3600.0:.2f} h" if seconds >= 360.0 else duration(seconds)


def _levels(row: Dict, title: str = "Level crossings and peaks", said: tuple[str, ...] = ()) -> Sheet:
    levels = row["levels"]
    rates = [Column("per h", right=True, drop=2), Column("per 1,000 h", right=True, drop=1)]
    heads = [Column("level g", right=True), Column("crossings", right=True), *rates]
    keys = [("crossings", "crossings_per_h", "crossings_per_1000_h")]
    if levels and "peaks" in levels[0]:
        heads += [Column("peaks", right=True), *rates]
        keys.append(("peaks", "peaks_per_h", "peaks_per_1000_h"))
    cells = []
    for one in reversed(levels):
        cell = [number(one["level_g"], 2)]
        for many, hourly, thousand in keys:
            cell += [f"{one[many]:,}", _figure(one[hourly]), _figure(one[thousand])]
        cells.append(tuple(cell))
    return Sheet(title, tuple(heads), tuple(cells), said)


def _figure(value: float | None) -> str:
    """Three digits at least, no exponent."""
    if value is None:
        return "-"
    decimals = 0 if value >= 100.0 else 1 if value >= 10.0 else 2
    return f"{value:,.{decimals}f}"


def _ranges(title: str, cycles: Dict) -> Sheet:
    heads = (
        Column("range g"),
        Column("whole", right=True),
        Column("half", right=True),
        Column("cycles", right=True),
        *(Column("per h", right=True, drop=2), Column("per 1,000 h", right=True, drop=1)),
    )
    cells = tuple(
        (
            f"{number(one['range_from_g'], 2)} to {number(one['range_below_g'], 2)}",
            f"{one['whole']:,}",
            f"{one['half']:,}",
            f"{one['cycles']:,.1f}",
            _figure(one["per_h"]),
            _figure(one["per_1000_h"]),
        )
        for one in reversed(cycles["by_range"])
    )
    residue = f"residue: {count(cycles['half'], 'half cycle')} that the stretches leave open"
    return Sheet(title, heads, cells, (residue,))


def _phases(row: Dict) -> Sheet:
    told = any(part["phase"] != "unknown" for part in row["by_phase"])
    said = "peaks at or beyond a level, by phase; rainflow cycles close across phases and are not told apart"
    if not told:
        return Sheet("By phase", said=("phases are not known",))
    return _parts("Peaks by phase", row["by_phase"], "phase", row["levels"], (said,))


def _causes(row: Dict) -> Sheet:
    said = ["gust: where a gust velocity could be derived; manoeuvre: in the phase manoeuvring"]
    if row["by_cause_note"]:
        said.append(row["by_cause_note"])
    return _parts("Peaks by cause", row["by_cause"], "cause", row["levels"], tuple(said))


def _parts(title: str, parts: list[Dict], key: str, levels: list[Dict], said: tuple[str, ...]) -> Sheet:
    """Parts as rows, some of the levels as columns."""
    known = [one["level_g"] for one in levels if one["level_g"] != 1.0]
    for step in (0.25, 0.5, 1.0, 2.0):
        chosen = [level for level in known if level % step == 0.0]
        if len(chosen) <= _MOST_LEVELS:
            break
    heads = [Column(key, least=8), Column("h", right=True), Column("min g", right=True), Column("max g", right=True)]
    heads += [Column(f"{level:g} g", right=True) for level in chosen]
    cells = []
    for part in parts:
        counts = {one["level_g"]: one["peaks"] for one in part["levels"]}
        low, high = ("-" if part[name] is None else number(part[name], 2) for name in ("lowest_g", "highest_g"))
        cell = [part[key], number(part["counted_h"], 2), low, high]
        cells.append(tuple(cell + [f"{counts.get(level, 0):,}" for level in chosen]))
    return Sheet(title, tuple(heads), tuple(cells), said)
