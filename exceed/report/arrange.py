"""The summary's rows in the order in which people read them, and the names that go above them."""

from __future__ import annotations

from typing import Any

from exceed.report.gather import certainty_rank, severity_rank
from exceed.report.layout import Screen
from exceed.report.show import elapsed, local_text, number

Dict = dict[str, Any]


def grouped(summary: Dict, key: str) -> list[tuple[Dict, int | None, list[Dict]]]:
    """Events by recording and flight, aeroplanes in order (unnamed last), the most severe event first."""
    groups = []
    for recording in summary["recordings"]:
        flights: dict[int | None, list[Dict]] = {}
        for event in recording[key]:
            flights.setdefault(event["flight"], []).append(event)
        for flight, found in flights.items():
            found.sort(key=severity_order)
            groups.append((recording, flight, found))
    groups.sort(key=lambda group: (flight_order(group[0]), min(event["start_s"] for event in group[2])))
    return groups


def severity_order(event: Dict) -> tuple[Any, ...]:
    """Most severe, then surest, then earliest first."""
    p = event["probability"]
    return (
        -severity_rank(event["severity"]),
        -certainty_rank(event["certainty"]),
        -(p if p is not None else 0.0),
        event["start_s"],
    )


def flight_order(recording: Dict) -> tuple[Any, ...]:
    """Recordings of named aeroplanes first, each by its clock, else by its path."""
    clock = recording["clock"]
    start = clock["start"] if clock is not None and clock["start"] is not None else "~"
    return recording["registration"] is None, recording["registration"] or "", start, recording["path"]


def aeroplane(summary: Dict, recording: Dict, screen: Screen) -> str:
    """Registration and type of a recording's aeroplane."""
    registration = recording["registration"]
    if registration is None:
        return "no registration"
    row = next((row for row in summary["aircraft"] if row["registration"] == registration), None)
    kind = f" {screen.safe(row['type'])}" if row is not None and row["type"] else ""
    return screen.safe(registration) + kind


def limit_source(summary: Dict, recording: Dict) -> str:
    """Where the limits of a recording's aeroplane come from, as its file has it; empty where none are known."""
    row = next((row for row in summary["aircraft"] if row["registration"] == recording["registration"]), None)
    return str(row["source"]) if row is not None and row["source"] and row["limits"] != "none" else ""


def flight_times(recording: Dict, flight: Dict, screen: Screen) -> str:
    """Take-off to landing: UTC (and local time), else elapsed."""
    begin, end = flight["take_off"], flight["landing"]
    if begin is None and end is None:
        return f"{elapsed(flight['start_s'])} to {elapsed(flight['end_s'])}"
    date = str(begin or end)[:10]
    if begin is None:
        return f"{date} until {end[11:19]} UTC, take-off not recorded"
    text = f"{date} {begin[11:19]}" + (f" to {end[11:19]} UTC" if end else " UTC, landing not recorded")
    if screen.zone is not None:
        text += f" (local {local_text(begin, screen.zone)[:5]})"
    return text


def share_text(share: float | None) -> str:
    """How much of a limit was used, in per cent; a digit more rather than 100 for what is not."""
    if share is None:
        return ""
    for decimals in (0, 1, 2):
        text = number(share * 100.0, decimals)
        if share == 1.0 or float(text) != 100.0:
            break
    return f"{text} %"


def titles(summary: Dict) -> dict[str, str]:
    """Rule id -> title, of all rule sets."""
    return {rule: title for row in summary["rules"] for rule, title in row["titles"].items()}


def ordered(summary: Dict) -> list[Dict]:
    """Recordings in reading order."""
    return sorted(summary["recordings"], key=flight_order)


def owner(recording: Dict, screen: Screen) -> str:
    """A recording's registration, or that it has none."""
    return screen.safe(recording["registration"] or "no registration")
