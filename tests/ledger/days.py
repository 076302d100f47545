"""Summaries made by hand, as small as the form allows: invented flights of ZZ-NMA and ZZ-NMC in May 2031."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from datetime import UTC, datetime, timedelta
from typing import Any

Dict = dict[str, Any]
DAY = datetime(2031, 5, 2, tzinfo=UTC)
TASK = "Over-g inspection as the approved manual has it"


def sha(text: str) -> str:
    return hashlib.sha256(text.encode()).hexdigest()


def utc(seconds: float, day: datetime = DAY) -> str:
    return (day + timedelta(seconds=seconds)).strftime("%Y-%m-%dT%H:%M:%S.%f")[:-3] + "Z"


def event(
    start_s: float,
    end_s: float,
    *,
    rule: str = "load-factor-high",
    severity: str = "caution",
    certainty: str = "established",
    value: float = 6.2173,
    limit: float = 6.0,
    quantity: str = "load_factor",
    task: str | None = TASK,
    cut_by: str | None = None,
    notes: Sequence[str] = (),
    flight: int | None = 1,
) -> Dict:
    """An event but for what its recording says: id, registration, times of day."""
    return {
        "id": "", "rule": rule, "title": f"Title of {rule}", "quantity": quantity, "side": "above",
        "severity": severity, "limit_exceeded": True, "certainty": certainty, "probability": 0.99,
        "registration": None, "flight": flight, "phase": "manoeuvring", "start": None, "end": None,
        "start_s": start_s, "end_s": end_s, "duration_s": round(end_s - start_s, 3),
        "peak": {
            "time_s": start_s, "recorded": value, "recorded_unit": "g", "value": value, "estimate": value,
            "low": value - 0.1, "high": value + 0.1, "unit": "g", "sized": True, "saturated": False,
        },
        "limit": {"value": limit, "unit": "g", "source": "aircraft.load_factor.maximum", "assumed": False},
        "levels": [
            {
                "severity": severity, "limit": limit, "start_s": start_s, "end_s": end_s,
                "beyond_s": round(end_s - start_s, 3), "probability": 0.99,
            }
        ],
        "context": {"latitude": {"value": 51.98765, "unit": "deg"}}, "cut_by": cut_by, "inspection": task,
        "notes": list(notes), "set": "airframe", "row": round(start_s * 8),
    }  # fmt: skip


def flight(start_s: float, end_s: float, number: int | None = 1, *, landings: int | None = 1, broken: str = "") -> Dict:
    """A flight; `broken` holds `start` or `end` where the recording does not show the take-off or the landing."""
    return {
        "flight": number, "start_s": start_s, "end_s": end_s, "take_off": None, "landing": None, "landings": landings,
        "take_off_recorded": number is not None and "start" not in broken,
        "landing_recorded": number is not None and "end" not in broken,
        "bounces": 0, "go_arounds": 0, "mass": None, "extremes": [], "notes": [],
    }  # fmt: skip


def recording(
    path: str,
    *,
    start: float | None = 9 * 3600.0,
    length: float = 4000.0,
    registration: str | None = "ZZ-NMA",
    flights: Sequence[Dict] = (),
    events: Sequence[Dict] = (),
    undecided: Sequence[Dict] = (),
    content: str | None = None,
    rules: Sequence[str] = ("load-factor-high", "never-exceed"),
    unassessed: Sequence[str] = (),
    day: datetime = DAY,
) -> Dict:
    """One recording that begins `start` seconds into the day (None: its clock is not absolute)."""
    digest = sha(content or path)
    found: dict[str, list[Dict]] = {"events": [], "undecided": []}
    for name, rows in (("events", events), ("undecided", undecided)):
        for row in rows:
            made = {**row, "registration": registration}
            made["id"] = sha(f"{registration}{row['rule']}{digest}{row['row']}{row['quantity']}")[:12]
            if start is not None:
                made["start"], made["end"] = utc(start + row["start_s"], day), utc(start + row["end_s"], day)
            found[name].append(made)
    return {
        "path": path, "sha256": digest, "content_sha256": digest, "registration": registration, "limits": "own",
        "rows": int(length * 8), "recorded_s": length, "status": "ok", "problem": None,
        "clock": {
            "kind": "iso" if start is not None else "elapsed", "start": utc(start, day) if start is not None else None,
            "resets": 0, "gaps": [], "zone": "UTC", "notes": [],
        },
        "channels": [], "unused_columns": [], "unresolved_columns": [], "methods": [], "missing": {},
        "flights_by": "weight on wheels", "flights": list(flights or [flight(100.0, length - 100.0)]), **found,
        "rejected": [], "within_sensor_error": [],
        "assessment": [
            {
                "rule": rule, "flight": None, "assessed_s": 0.0 if rule in unassessed else length,
                "unassessed_s": length if rule in unassessed else 0.0, "not_applicable_s": 0.0,
                "shortest_seen_s": 0.5, "reasons": [],
            }
            for rule in rules
        ],
        "rule_sets": ["airframe"], "notes": [],
    }  # fmt: skip


def summary(
    *recordings: Dict, rules: str = "rules 1", documents: Sequence[Dict] = (), before: str | None = None
) -> Dict:
    """A scan of these recordings, judged by rules of that content, with the inspections their events ask for."""
    asked: dict[tuple[Any, ...], Dict] = {}
    for status, key in (("due", "events"), ("to_be_decided", "undecided")):
        for one in recordings:
            for row in one[key]:
                if row["inspection"] is None:
                    continue
                name = (one["registration"] or one["path"], row["rule"], row["inspection"])
                made = asked.setdefault(
                    name,
                    {
                        "id": "", "registration": one["registration"], "serial": None, "task": row["inspection"],
                        "ata": "05-50", "before": before, "status": status, "certainty": row["certainty"],
                        "rule": row["rule"], "events": [],
                    },
                )  # fmt: skip
                made["events"].append(row["id"])
                made["id"] = sha(f"{name}{made['events'][0]}")[:12]
    return {
        "format": "exceed/summary/1", "tool": {"name": "exceed", "version": "0.1.0"},
        "created": "2031-05-02T18:00:00Z", "replaces": None, "cautions": ["This informs; it releases no aeroplane."],
        "operator": "Northmoor Flying Group", "fleet": None, "time_zone": "UTC",
        "judged_with": [{"kind": "rules", "path": "airframe", "sha256": sha(rules)}, *documents],
        "aircraft": [], "rules": [], "recordings": list(recordings), "skipped": [],
        "totals": {
            "recordings": len(recordings), "failed": 0, "flights": sum(len(one["flights"]) for one in recordings),
            "flight_s": 0.0, "events": {"advisory": 0, "caution": 0, "warning": 0}, "near_limit": 0, "doubtful": 0,
            "undecided": 0,
        },
        "inspections": list(asked.values()), "notes": [],
    }  # fmt: skip
