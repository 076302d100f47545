"""A day's outcome -> the summary dict `exceed/summary/1`, in trade units, rounded, in one deterministic order.

The summary is the only source of table, page and ledger. Built from plain dicts: a day may hold thousands of events.
"""

from __future__ import annotations

import hashlib
import math
from collections.abc import Iterable, Mapping
from typing import Any

from exceed import __version__
from exceed.core.findings import CAUTIONS, Coverage, Event, Extreme, RejectedFinding
from exceed.core.outcome import ChannelRow, DayOutcome, FlightRow, LogOutcome, MethodRow
from exceed.core.quantities import QUANTITIES
from exceed.core.units import UNITS
from exceed.report.gather import (
    CERTAINTY_BOUNDS,
    aircraft_rows,
    inspection_rows,
    ordered_events,
    plain_registration,
    seconds,
    totals_of,
)
from exceed.report.show import iso_utc

Dict = dict[str, Any]
FORMAT = "exceed/summary/1"


class Scale:
    """How one quantity is shown: unit, digits, and the way there from SI."""

    __slots__ = ("decimals", "factor", "offset", "unit")

    def __init__(self, name: str, declared: Mapping[str, str]) -> None:
        row = QUANTITIES.get(name)
        unit = row.shown if row is not None else declared.get(name, "")
        known = UNITS.get(unit)
        self.unit = unit or "SI"
        self.decimals = (row.decimals if row is not None else 1) + 2
        self.factor = known.factor if known is not None else 1.0
        self.offset = known.offset if known is not None else 0.0

    def value(self, si: float | None) -> float | None:
        """A value in SI in the shown unit, rounded; None for what is not finite."""
        if si is None or not math.isfinite(si):
            return None
        return round((si - self.offset) / self.factor, self.decimals) + 0.0  # + 0.0: no negative zero

    def difference(self, si: float | None) -> float | None:
        """A difference (a bias, an uncertainty) in the shown unit: the offset of a temperature does not enter."""
        if si is None or not math.isfinite(si):
            return None
        return significant(si / self.factor, 4)


def significant(value: float, digits: int) -> float:
    """A number rounded to so many significant digits."""
    return float(f"{value:.{digits}g}") + 0.0


def summarise(day: DayOutcome) -> Dict:
    """The summary dict of a day. Finite numbers or None only; the same outcome gives the same dict."""
    logs = sorted(day.logs, key=lambda log: log.path)
    recordings = [_recording(log) for log in logs]
    return {
        "format": FORMAT,
        "tool": {"name": "exceed", "version": __version__},
        "created": day.created,
        "replaces": day.replaces,
        "cautions": list(CAUTIONS),
        "operator": day.operator,
        "fleet": day.fleet,
        "time_zone": day.time_zone,
        "judged_with": [
            {"kind": row.kind, "path": row.path, "sha256": row.sha256}
            if row.name is None
            else {"kind": row.kind, "name": row.name, "value": row.value}
            for row in day.judged_with
        ],
        "aircraft": aircraft_rows(day, logs),
        "rules": [
            {
                "set": row.name,
                "title": row.title,
                "rules": row.rules,
                "titles": dict(row.titles),
                "overrides": list(row.overrides),
                "quantities": dict(row.quantities),
            }
            for row in day.rules
        ],
        "recordings": recordings,
        "skipped": [{"path": path, "reason": reason} for path, reason in sorted(day.skipped)],
        "totals": totals_of(recordings),
        "inspections": inspection_rows(logs, recordings),
        "notes": list(day.notes),
    }


def _recording(log: LogOutcome) -> Dict:
    scales = _Scales(log.declared)
    findings = log.findings
    start = log.clock.start if log.clock is not None else None
    used: set[str] = set()
    events = [_event(log, event, scales, start, used) for event in ordered_events(findings.events)]
    undecided = [_event(log, event, scales, start, used) for event in ordered_events(findings.undecided)]
    recorded = seconds(log.recorded)
    clock = log.clock
    return {
        "path": log.path,
        "sha256": log.sha256,
        "content_sha256": log.content_sha256,
        "registration": log.registration,
        "limits": log.aircraft.limits if log.aircraft is not None else "none",
        "rows": log.rows,
        "recorded_s": recorded,
        "status": log.status,
        "problem": None
        if log.problem is None
        else {
            "place": log.problem.place,
            "problem": log.problem.problem,
            "expected": log.problem.expected,
            "do": log.problem.do,
        },
        "clock": None
        if clock is None
        else {
            "kind": clock.kind,
            "start": iso_utc(clock.start, trim=True),
            "resets": clock.resets,
            "gaps": [{"start_s": seconds(first), "end_s": seconds(last)} for first, last in clock.gaps],
            "zone": clock.zone,
            "notes": list(clock.notes),
        },
        "channels": [_channel(row, scales) for row in log.channels],
        "unused_columns": list(log.unused),
        "unresolved_columns": [
            {"column": row.column, "reason": row.reason, "question": row.question} for row in log.unresolved
        ],
        "methods": [_method(row, scales) for row in log.methods],
        "missing": dict(sorted(log.missing.items())),
        "flights_by": log.flights_method,
        "flights": [_flight(row, findings.extremes, scales, start) for row in log.flights],
        "events": events,
        "undecided": undecided,
        "rejected": [_rejected(row, scales) for row in findings.rejected],
        "within_sensor_error": [
            {"rule": rule, "seconds": seconds(time)} for rule, time in sorted(findings.within_sensor_error)
        ],
        "assessment": [_coverage(row, recorded) for row in findings.coverage],
        "rule_sets": list(log.rule_sets),
        "notes": list(dict.fromkeys((*log.notes, *findings.notes))),
    }


class _Scales(dict[str, Scale]):
    def __init__(self, declared: Mapping[str, str]) -> None:
        super().__init__()
        self._declared = declared

    def __missing__(self, name: str) -> Scale:
        self[name] = scale = Scale(name, self._declared)
        return scale


def _seconds_or_none(value: float | None) -> float | None:
    return None if value is None or not math.isfinite(value) else round(value, 3) + 0.0


def _probability(p: float | None) -> float | None:
    if p is None or not math.isfinite(p):
        return None
    for digits in (4, 6, 9):
        rounded = round(p, digits)
        # rounding never carries it over the begin of a certainty
        if all((p >= step) == (rounded >= step) for step in CERTAINTY_BOUNDS):
            return rounded
    return p


def event_id(registration: str | None, rule: str, digest: str, row: int, turn: int = 0) -> str:
    """Short hash that names an event; `turn` parts two events of one rule with one extreme row (several engines)."""
    parts = [plain_registration(registration), rule, digest, str(row)] + ([str(turn)] if turn else [])
    return hashlib.sha256("\x1f".join(parts).encode()).hexdigest()[:12]


def _event(log: LogOutcome, event: Event, scales: _Scales, clock_start: float | None, used: set[str]) -> Dict:
    scale = scales[event.quantity]
    value = scale.value
    peak = event.peak
    digest = log.content_sha256 or log.sha256 or log.path
    turn = 0
    name = event_id(log.registration, event.rule, digest, event.row)
    while name in used:
        turn += 1
        name = event_id(log.registration, event.rule, digest, event.row, turn)
    used.add(name)
    start, end = seconds(event.start), seconds(event.end)
    recorded = peak.recorded
    return {
        "id": name,
        "rule": event.rule,
        "title": event.title,
        "quantity": event.quantity,
        "side": event.side,
        "severity": event.severity,
        "limit_exceeded": bool(event.limit_exceeded),
        "certainty": event.certainty,
        "probability": _probability(event.probability),
        "registration": log.registration,
        "flight": event.flight,
        "phase": event.phase,
        "start": None if clock_start is None else iso_utc(clock_start + event.start),
        "end": None if clock_start is None else iso_utc(clock_start + event.end),
        "start_s": start,
        "end_s": end,
        "duration_s": round(end - start, 3) + 0.0,
        "peak": {
            "time_s": seconds(peak.time),
            "recorded": None if recorded is None or not math.isfinite(recorded) else significant(recorded, 9),
            "recorded_unit": peak.recorded_unit,
            "value": value(peak.value),
            "estimate": value(peak.estimate),
            "low": value(peak.low),
            "high": value(peak.high),
            "unit": scale.unit,
            "sized": bool(peak.sized),
            "saturated": bool(peak.saturated),
        },
        "limit": {
            "value": value(event.limit.value),
            "unit": scale.unit,
            "source": event.limit.source,
            "assumed": bool(event.limit.assumed),
        },
        "levels": [
            {
                "severity": level.severity,
                "limit": value(level.limit),
                "start_s": _seconds_or_none(level.start),
                "end_s": _seconds_or_none(level.end),
                "beyond_s": seconds(level.beyond),
                "probability": _probability(level.probability),
            }
            for level in event.levels
        ],
        "context": {
            key: {"value": scales[key].value(found), "unit": scales[key].unit} for key, found in event.context.items()
        },
        "cut_by": event.cut_by,
        "inspection": event.task.text if event.task is not None and event.task.wanted else None,
        "notes": list(event.notes),
        "set": event.set_name,
        "row": int(event.row),
    }


def _channel(row: ChannelRow, scales: _Scales) -> Dict:
    scale = scales[row.quantity]
    return {
        "column": row.column,
        "quantity": row.quantity,
        "unit": row.unit,
        "rate_hz": None if row.rate_hz is None or not math.isfinite(row.rate_hz) else significant(row.rate_hz, 6),
        "found_by": row.found_by,
        "reason": row.reason,
        "sign": row.sign,
        "datum": row.datum,
        "bias": _difference(row.bias, scale),
        "standard_uncertainty": _difference(row.standard_uncertainty, scale),
        "uncertainty_source": row.uncertainty_source,
        "valid_share": round(row.valid_share, 6) if math.isfinite(row.valid_share) else None,
        "notes": list(row.notes),
    }


def _difference(si: float | None, scale: Scale) -> Dict | None:
    value = scale.difference(si)
    return None if value is None else {"value": value, "unit": scale.unit}


def _method(row: MethodRow, scales: _Scales) -> Dict:
    return {
        "quantity": row.quantity,
        "method": row.method,
        "inputs": list(row.inputs),
        "assumes": row.assumes,
        "standard_uncertainty": _difference(row.standard_uncertainty, scales[row.quantity]),
        "source": row.source,
    }


def _flight(row: FlightRow, extremes: Iterable[Extreme], scales: _Scales, clock_start: float | None) -> Dict:
    mass = row.mass
    value = scales["mass"].value
    absolute = clock_start is not None and row.number is not None
    return {
        "flight": row.number,
        "start_s": seconds(row.start),
        "end_s": seconds(row.end),
        "take_off": iso_utc((clock_start or 0.0) + row.start, trim=True) if absolute and row.take_off_seen else None,
        "landing": iso_utc((clock_start or 0.0) + row.end, trim=True) if absolute and row.landing_seen else None,
        "landings": row.landings,
        "take_off_recorded": bool(row.take_off_seen and row.number is not None),
        "landing_recorded": bool(row.landing_seen and row.number is not None),
        "bounces": row.bounces,
        "go_arounds": row.go_arounds,
        "mass": None
        if mass is None
        else {
            "take_off": value(mass.take_off),
            "landing": value(mass.landing),
            "unit": scales["mass"].unit,
            "method": mass.method,
            "low": value(mass.low),
            "high": value(mass.high),
        },
        "extremes": [_extreme(found, scales) for found in extremes if found.flight == row.number],
        "notes": list(row.notes),
    }


def _extreme(row: Extreme, scales: _Scales) -> Dict:
    scale = scales[row.quantity]
    share = row.closest_to_limit
    return {
        "quantity": row.quantity,
        "maximum": _at(row.maximum, scale),
        "minimum": _at(row.minimum, scale),
        "unit": scale.unit,
        "closest_to_limit": None if share is None or not math.isfinite(share) else round(share, 4) + 0.0,
    }


def _at(found: tuple[float, float] | None, scale: Scale) -> Dict | None:
    if found is None:
        return None
    value = scale.value(found[0])
    return None if value is None else {"value": value, "time_s": _seconds_or_none(found[1])}


def _rejected(row: RejectedFinding, scales: _Scales) -> Dict:
    found = row.rejected
    scale = scales[found.quantity]
    extreme = scale.value(found.extreme)
    return {
        "quantity": found.quantity,
        "column": found.column,
        "start_s": seconds(found.start),
        "end_s": seconds(found.end),
        "samples": int(found.samples),
        "reason": found.reason,
        "extreme": None if extreme is None else {"value": extreme, "unit": scale.unit},
        "would_exceed": list(row.would_exceed),
    }


def _coverage(row: Coverage, recorded: float) -> Dict:
    unassessed, not_applicable = seconds(row.unassessed), seconds(row.not_applicable)
    assessed = seconds(row.assessed)
    # three roundings may miss the sum by a millisecond; more than that would be an error that must stay visible
    rest = round(recorded - unassessed - not_applicable, 3) + 0.0
    if row.flight is None and assessed > 0.0 and rest >= 0.0 and abs(rest - assessed) < 0.0025:
        assessed = rest
    return {
        "rule": row.rule,
        "flight": row.flight,
        "assessed_s": assessed,
        "unassessed_s": unassessed,
        "not_applicable_s": not_applicable,
        "shortest_seen_s": _seconds_or_none(row.shortest_seen),
        "reasons": [{"reason": reason, "seconds": seconds(time)} for reason, time in row.reasons],
    }
