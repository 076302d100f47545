"""Spectra of load factor in words: `exceed/spectrum/1` as JSON, tables for a terminal, curves on a page."""

from __future__ import annotations

from typing import Any

import numpy as np

from exceed import __version__
from exceed.core.diagrams import CycleTally, SpectrumLog, SpectrumOutcome, SpectrumRow, Tally
from exceed.core.findings import CAUTIONS
from exceed.core.outcome import SpectrumPlot
from exceed.report import figures
from exceed.report.plots import Paper, Part, render_paper, render_text
from exceed.report.show import count, duration
from exceed.report.spectrum_tables import name_of, part_of

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
            plots.append((name_of(part), SpectrumPlot(row.tally.level, rates, hours)))
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
                "name": name_of(row),
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


def _paper(summary: Dict, *, figure: bool = False) -> Paper:
    parts = []
    if figure:
        captions = (
            ("crossings", "level crossings per flight hour: upwards at and above 1 g, downwards below"),
            ("cycles", "rainflow cycles of at least this range per flight hour, half cycles as halves"),
        )
        parts.append(Part("Curves", (), captions))
    parts += [part_of(row) for row in summary["spectra"]]
    totals = summary["totals"]
    said = [f"per {STANDARD}: level crossings, peaks, rainflow cycles; {count(totals['counted'], 'log')} counted"]
    if not totals["recordings"]:
        said[0] = "No log was found, so nothing was counted."
    if totals["not_counted"]:
        said[0] += f", {totals['not_counted']} not counted"
    if totals["failed"]:
        said[0] += f", {totals['failed']} failed"
    lists = (
        ("Failed or skipped", tuple(_failures(summary))),
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
        reasons = [f"{row['reason']}, {duration(row['seconds'])}" for row in log["not_counted"]]
        return f"{log['path']}: not counted: {'; '.join([*reasons, *log['notes']])}"
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
