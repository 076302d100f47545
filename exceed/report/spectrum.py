"""Spectra of load factor in words: `exceed/spectrum/1` as JSON, tables for a terminal, curves on a page."""

from __future__ import annotations

from typing import Any

import numpy as np

from exceed import __version__
from exceed.core.diagrams import CycleTally, SpectrumLog, SpectrumOutcome, SpectrumRow, Tally
from exceed.core.findings import CAUTIONS
from exceed.core.outcome import SpectrumPlot
from exceed.report import figures
from exceed.report.layout import Column
from exceed.report.plots import Paper, Part, Sheet, render_paper, render_text
from exceed.report.show import count, duration, number

Dict = dict[str, Any]
FORMAT = "exceed/spectrum/1"
STANDARD = "ASTM E1049"
HOW = (
    "counted at the recorded samples, corrected as listed: what lies between samples is not rebuilt, so true peaks are"
    " higher and small turns fewer than at a faster rate",
    "a gap, a rejected sample and a flight's end part the history: each stretch is counted for itself, and the change"
    " between ground and air is not in it",
    "close to 1 g and in the smallest ranges the sensor's noise is counted with the rest",
    "per 1,000 h is the count over the time counted, times 1,000: from few hours it is no forecast",
)
NO_LIFE = (
    "No fatigue life is claimed: life used is worked out by the method approved for the type, from data that the method"
    " accepts."
)
# most columns of levels in the table by phase
_MOST_LEVELS = 8


def spectrum_summary(found: SpectrumOutcome) -> Dict:
    """The dict of `exceed/spectrum/1`; finite or None, in a fixed order, the same for the same logs."""
    return {
        "format": FORMAT,
        "tool": {"name": "exceed", "version": __version__},
        "cautions": [NO_LIFE, *CAUTIONS],
        "standard": STANDARD,
        "counted_as": list(HOW),
        "level_step_g": found.step,
        "reference_g": found.reference,
        "judged_with": [
            {"kind": row.kind, "path": row.path, "sha256": row.sha256}
            if row.name is None
            else {"kind": row.kind, "name": row.name, "value": row.value}
            for row in found.judged_with
        ],
        "spectra": [_row(row, found.step) for row in found.rows],
        "recordings": [_log(log) for log in found.logs],
        "skipped": [{"path": path, "reason": reason} for path, reason in found.skipped],
        "totals": {
            "recordings": len(found.logs),
            "counted": sum(log.status in ("counted", "partial") for log in found.logs),
            "not_counted": sum(log.status == "not counted" for log in found.logs),
            "failed": sum(log.status == "failed" for log in found.logs),
        },
        "notes": list(found.notes),
    }


def _row(row: SpectrumRow, step: float) -> Dict:
    hours = row.tally.seconds / 3600.0
    weighted: Dict | None = None
    if row.weighted is not None and row.weighted_cycles is not None:
        weighted = {
            "reference_mass": {"value": _rounded(row.reference_mass, 1), "unit": "kg"},
            "meaning": "load factor x mass / reference mass",
            **_tally(row.weighted, peaks=False),
            "cycles": _cycles(row.weighted_cycles, step, row.weighted.seconds / 3600.0),
        }
    return {
        "registration": row.registration,
        "everything": row.everything,
        "recordings": row.logs,
        "flights": row.flights,
        "airborne_s": _rounded(row.airborne, 3),
        "stretches": row.stretches,
        "samples": row.samples,
        "rates_hz": list(row.rates),
        "derived": row.derived,
        **_tally(row.tally),
        "cycles": _cycles(row.cycles, step, hours),
        "by_phase": [{"phase": name, **_tally(tally)} for name, tally in row.by_phase],
        "by_cause": [{"cause": name, **_tally(tally)} for name, tally in row.by_cause],
        "by_cause_note": row.cause_note or None,
        "mass_weighted": weighted,
        "mass_weighted_note": row.weighted_note or None,
    }


def _tally(tally: Tally, *, peaks: bool = True) -> Dict:
    hours = tally.seconds / 3600.0
    levels = []
    for level, crossings, turns in zip(
        tally.level.tolist(), tally.crossings.tolist(), tally.peaks.tolist(), strict=True
    ):
        levels.append(
            {
                "level_g": level,
                "crossings": int(crossings),
                "crossings_per_h": _rate(crossings, hours),
                "crossings_per_1000_h": _rate(1000.0 * crossings, hours),
            }
            | (
                {
                    "peaks": int(turns),
                    "peaks_per_h": _rate(turns, hours),
                    "peaks_per_1000_h": _rate(1000.0 * turns, hours),
                }
                if peaks
                else {}
            )
        )
    return {
        "counted_s": _rounded(tally.seconds, 3),
        "counted_h": _rounded(hours, 6),
        "lowest_g": _rounded(tally.lowest, 4),
        "highest_g": _rounded(tally.highest, 4),
        "levels": levels,
    }


def _cycles(cycles: CycleTally, step: float, hours: float) -> Dict:
    """By range, and the cells of range and mean that hold something."""
    whole, half = cycles.whole.sum(axis=1), cycles.half.sum(axis=1)
    total = whole + 0.5 * half
    ranges = [
        {
            "range_from_g": float(low),
            "range_below_g": float(low) + step,
            "whole": int(whole[place]),
            "half": int(half[place]),
            "cycles": float(total[place]),
            "per_h": _rate(float(total[place]), hours),
            "per_1000_h": _rate(1000.0 * float(total[place]), hours),
        }
        for place, low in enumerate(cycles.range.tolist())
        if total[place] > 0.0
    ]
    cells = [
        {
            "range_from_g": float(cycles.range[row]),
            "mean_from_g": float(cycles.mean[column]),
            "whole": int(cycles.whole[row, column]),
            "half": int(cycles.half[row, column]),
        }
        for row, column in zip(*np.nonzero(cycles.whole + cycles.half), strict=True)
    ]
    return {
        "whole": int(whole.sum()),
        "half": int(half.sum()),
        "residue": "half cycles are what a stretch leaves open; they are given as such and count one half",
        "by_range": ranges,
        "by_range_and_mean": cells,
    }


def _log(log: SpectrumLog) -> Dict:
    problem = log.problem
    return {
        "path": log.path,
        "sha256": log.sha256,
        "content_sha256": log.content_sha256,
        "registration": log.registration,
        "status": log.status,
        "problem": None
        if problem is None
        else {"place": problem.place, "problem": problem.problem, "expected": problem.expected, "do": problem.do},
        "method": log.method or None,
        "rate_hz": None if log.interval is None else _rounded(1.0 / log.interval, 3),
        "flights": log.flights,
        "flights_by": log.flights_by or None,
        "airborne_s": _rounded(log.airborne, 3),
        "counted_s": _rounded(log.counted, 3),
        "not_counted": [{"reason": why, "seconds": _rounded(seconds, 3)} for why, seconds in log.not_counted],
        "stretches": log.stretches,
        "samples": log.samples,
        "samples_at_sensor_end": log.at_end,
        "notes": list(log.notes),
    }


def _rounded(value: float | None, digits: int) -> float | None:
    return None if value is None or not np.isfinite(value) else round(value, digits) + 0.0


def _rate(many: float, hours: float) -> float | None:
    """A rate to four digits; None where no time was counted."""
    return None if hours <= 0.0 else float(f"{many / hours:.4g}")


# --- words -------------------------------------------------------------------------------------------------------


def render_spectrum(summary: Dict, *, width: int | None = None, unicode: bool = True) -> str:
    """The spectra as plain text. summary : of `spectrum_summary`."""
    return render_text(_paper(summary), width=width, unicode=unicode)


def spectrum_page(summary: Dict, found: SpectrumOutcome) -> str:
    """The spectra as one HTML page with the level crossings drawn."""
    drawn: dict[str, Dict] = {}
    plots = []
    for part, row in zip(summary["spectra"], found.rows, strict=True):
        hours = row.tally.seconds / 3600.0
        if hours > 0.0:
            rates = row.tally.crossings / hours
            plots.append((_name(part), SpectrumPlot(row.tally.level, rates, hours)))
    if plots:
        drawn["crossings"] = figures.spectrum(plots)
        drawn["cycles"] = _cycles_figure(summary["spectra"])
    return render_paper(_paper(summary, figure=bool(plots)), drawn)


def _cycles_figure(rows: list[Dict]) -> Dict:
    """Rainflow cycles at or above each range, per flight hour, one line an aeroplane."""
    data = []
    for turn, row in enumerate(rows):
        ranges = row["cycles"]["by_range"]
        hours = row["counted_h"]
        if not ranges or not hours:
            continue
        beyond = np.cumsum([one["cycles"] for one in ranges][::-1])[::-1] / hours
        data.append(
            {
                "type": "scatter",
                "mode": "lines+markers",
                "name": _name(row),
                "x": [one["range_from_g"] for one in ranges],
                "y": [float(f"{value:.5g}") for value in beyond],
                "line": {"color": f"$series{turn % 4}", "dash": ("solid", "dash", "dot", "dashdot")[turn // 4 % 4]},
                "marker": {"symbol": turn % 8, "size": 6},
                "hovertemplate": "%{x} g and more: %{y} per hour<extra></extra>",
            }
        )
    layout = {
        "height": 400,
        "margin": {"l": 64, "r": 12, "t": 12, "b": 48},
        "xaxis": {"title": {"text": "range at least, g"}, "rangemode": "tozero"},
        "yaxis": {"title": {"text": "cycles per flight hour"}, "type": "log"},
        "legend": {"orientation": "h", "y": 1.02, "yanchor": "bottom"},
        "showlegend": True,
    }
    return {"data": data, "layout": layout}


def _name(row: Dict) -> str:
    if row["everything"]:
        return "altogether"
    return row["registration"] or "no registration"


def _paper(summary: Dict, *, figure: bool = False) -> Paper:
    parts = []
    if figure:
        captions = (
            ("crossings", "level crossings per flight hour: upwards at and above 1 g, downwards below"),
            ("cycles", "rainflow cycles of at least this range per flight hour, half cycles as halves"),
        )
        parts.append(Part("Curves", (), captions))
    parts += [_part(row) for row in summary["spectra"]]
    totals = summary["totals"]
    said = [f"per {STANDARD}: level crossings, peaks, rainflow cycles; {count(totals['counted'], 'log')} counted"]
    if totals["not_counted"]:
        said[0] += f", {totals['not_counted']} not counted"
    if totals["failed"]:
        said[0] += f", {totals['failed']} failed"
    lists = (
        ("Not counted, failed", tuple(_failures(summary))),
        ("Logs", tuple(_log_line(log) for log in summary["recordings"] if log["status"] != "failed")),
        ("How it was counted", (*summary["counted_as"], *summary["notes"])),
    )
    return Paper("Spectrum of load factor", tuple(said), tuple(parts), lists, tuple(summary["cautions"]))


def _failures(summary: Dict) -> list[str]:
    texts = []
    for log in summary["recordings"]:
        problem = log["problem"]
        if problem is not None:
            text = (
                problem["problem"] if problem["place"] == log["path"] else f"{problem['place']}: {problem['problem']}"
            )
            tail = "".join(f"; {key}: {problem[key]}" for key in ("expected", "do") if problem[key])
            texts.append(f"{log['path']}: failed: {text}{tail}")
            texts += log["notes"]
    texts += [f"{row['path']}: {row['reason']}" for row in summary["skipped"]]
    return texts


def _log_line(log: Dict) -> str:
    if log["status"] == "not counted":
        return f"{log['path']}: not counted: {'; '.join(log['notes']) or 'counted in earlier logs'}"
    parts = [
        f"{duration(log['counted_s'])} counted of {duration(log['airborne_s'])} airborne",
        count(log["stretches"], "stretch", "stretches"),
        f"{log['rate_hz']:g} Hz",
        log["method"],
    ]
    parts += [f"not counted: {row['reason']}, {duration(row['seconds'])}" for row in log["not_counted"]]
    if log["samples_at_sensor_end"]:
        many = count(log["samples_at_sensor_end"], "sample")
        parts.append(f"{many} at the sensor's end: the true load lies beyond")
    if log["status"] == "partial":
        parts.append("read in part")
    return f"{log['path']}: " + "; ".join([*parts, *log["notes"]])


def _part(row: Dict) -> Part:
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
    return Part(_name(row), tuple(said), (), tuple(sheets))


def _hours(seconds: float) -> str:
    return f"{seconds / 3600.0:.2f} h" if seconds >= 360.0 else duration(seconds)


def _levels(row: Dict, title: str = "Level crossings and peaks", said: tuple[str, ...] = ()) -> Sheet:
    levels = row["levels"]
    heads = [Column("level g", right=True), Column("crossings", right=True), Column("per h", right=True)]
    heads.append(Column("per 1,000 h", right=True))
    keys = [("crossings", "crossings_per_h", "crossings_per_1000_h")]
    if levels and "peaks" in levels[0]:
        heads += [Column("peaks", right=True), Column("per h", right=True), Column("per 1,000 h", right=True)]
        keys.append(("peaks", "peaks_per_h", "peaks_per_1000_h"))
    cells = []
    for one in reversed(levels):
        cell = [number(one["level_g"], 2)]
        for many, hourly, thousand in keys:
            cell += [str(one[many]), _figure(one[hourly]), _figure(one[thousand])]
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
        Column("per h", right=True),
        Column("per 1,000 h", right=True),
    )
    cells = tuple(
        (
            f"{number(one['range_from_g'], 2)} to {number(one['range_below_g'], 2)}",
            str(one["whole"]),
            str(one["half"]),
            f"{one['cycles']:.1f}",
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
        cells.append(tuple(cell + [str(counts.get(level, 0)) for level in chosen]))
    return Sheet(title, tuple(heads), tuple(cells), said)
