"""What a summary says of the day as a whole: aeroplanes, totals, inspections; and the orders that it keeps."""

from __future__ import annotations

import hashlib
import math
from collections.abc import Iterable
from functools import lru_cache
from typing import Any

from exceed.core.findings import CERTAINTIES, SEVERITIES, Event
from exceed.core.outcome import AircraftInfo, DayOutcome, LogOutcome

Dict = dict[str, Any]


def seconds(value: float) -> float:
    """A time in s to the millisecond; 0 for what is not finite, which no time of an axis is."""
    return round(value, 3) + 0.0 if math.isfinite(value) else 0.0


def ordered_events(events: Iterable[Event]) -> list[Event]:
    """Events in time, then by rule: one order for the same findings."""
    return sorted(events, key=lambda event: (event.start, event.rule, event.row, event.quantity))


def plain_registration(registration: str | None) -> str:
    """A registration without case and punctuation, as registrations are compared."""
    return "".join(letter for letter in (registration or "").upper() if letter.isalnum())


def aircraft_rows(day: DayOutcome, logs: Iterable[LogOutcome]) -> list[Dict]:
    """The aeroplanes of a day by registration; of one with and one without limits the first."""
    found: dict[str, AircraftInfo] = {}
    gathered = [log.aircraft for log in logs if log.aircraft is not None]
    for info in [*day.aircraft, *gathered]:
        if info.registration is not None:
            key = plain_registration(info.registration)
            known = found.get(key)
            # the one with limits says more than one that was met in a log without
            if known is None or (known.limits == "none" and info.limits != "none"):
                found[key] = info
    return [
        {
            "registration": info.registration,
            "serial": info.serial,
            "type": info.type,
            "category": info.category,
            "limits": info.limits,
            "source": info.source,
            "recorder": dict(info.recorder),
            "path": _file_of(info, day),
        }
        for _, info in sorted(found.items())
    ]


def _file_of(info: AircraftInfo, day: DayOutcome) -> str | None:
    """An aeroplane's file as it stands in `judged_with`, however much of the way to it either of them gives."""
    if info.path is None:
        return None
    wanted = info.path.replace("\\", "/").split("/")
    for row in day.judged_with:
        if row.kind == "aircraft" and row.path is not None:
            there = row.path.split("/")
            short = min(len(wanted), len(there))
            if wanted[-short:] == there[-short:]:
                return row.path
    return None


def totals_of(recordings: list[Dict]) -> Dict:
    """What the recordings hold, counted."""
    events = [event for recording in recordings for event in recording["events"]]
    flights = [flight for recording in recordings for flight in recording["flights"]]
    return {
        "recordings": len(recordings),
        "failed": sum(recording["status"] == "failed" for recording in recordings),
        "flights": sum(flight["flight"] is not None for flight in flights),
        "flight_s": seconds(sum(flight["end_s"] - flight["start_s"] for flight in flights)),
        "events": {severity: sum(event["severity"] == severity for event in events) for severity in SEVERITIES},
        "near_limit": sum(not event["limit_exceeded"] for event in events),
        "doubtful": sum(event["certainty"] == "doubtful" for event in events),
        "undecided": sum(len(recording["undecided"]) for recording in recordings),
    }


# p at which possible, likely, established begin; a test compares them with the judgement's
CERTAINTY_BOUNDS = (0.05, 0.5, 0.95)


@lru_cache(maxsize=16)
def certainty_rank(certainty: str) -> int:
    """Place of a certainty in its order, doubtful 0."""
    return CERTAINTIES.index(certainty)


def certainty_word(probability: float) -> str:
    """The word for a probability that the true value went beyond a level; the bounds are those of the judgement."""
    return CERTAINTIES[sum(probability >= least for least in CERTAINTY_BOUNDS)]


@lru_cache(maxsize=16)
def severity_rank(severity: str) -> int:
    """Place of a severity in its order, advisory 0."""
    return SEVERITIES.index(severity)


def _surest(event: Event) -> str:
    """The certainty with which an inspection is asked for: that of the surest crossed level that asks for it."""
    least = severity_rank(event.task.severity) if event.task is not None else 0
    words = [
        certainty_word(level.probability)
        for level in event.levels
        if level.start is not None and least <= severity_rank(level.severity) < severity_rank(event.severity)
    ]
    return max([event.certainty, *words], key=certainty_rank)


def inspection_rows(logs: list[LogOutcome], recordings: list[Dict]) -> list[Dict]:
    """What is due, one row per aeroplane, rule and task: to be decided where only undecided stretches ask for it."""
    rows: dict[tuple[str, str, str], Dict] = {}
    for log, recording in zip(logs, recordings, strict=True):
        for status, found, shown in (
            ("due", log.findings.events, recording["events"]),
            ("to_be_decided", log.findings.undecided, recording["undecided"]),
        ):
            for event, written in zip(ordered_events(found), shown, strict=True):
                if event.task is None or not event.task.wanted:
                    continue
                sure = _surest(event)
                # logs without a registration may come from different aeroplanes
                owner = plain_registration(log.registration) or f"log {log.path}"
                row = rows.setdefault(
                    (owner, event.rule, event.task.text),
                    {
                        "id": "",
                        "registration": log.registration,
                        "serial": log.aircraft.serial if log.aircraft is not None else None,
                        "task": event.task.text,
                        "ata": event.task.ata,
                        "before": event.task.before,
                        "status": status,
                        "certainty": sure,
                        "rule": event.rule,
                        "events": [],
                    },
                )
                if written["id"] not in row["events"]:  # the same content may lie in the folder twice
                    row["events"].append(written["id"])
                if status == "due":
                    row["status"] = "due"
                if certainty_rank(sure) > certainty_rank(row["certainty"]):
                    row["certainty"] = sure
    for (owner, rule, task), row in rows.items():
        text = "\x1f".join([owner, rule, task, row["events"][0]])
        row["id"] = hashlib.sha256(text.encode()).hexdigest()[:12]
    return [row for _, row in sorted(rows.items(), key=lambda item: (item[0][0], item[1]["status"], item[0][1:]))]
