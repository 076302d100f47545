"""Inspection requests: one sheet each, with all that an assessor asks for and lines to fill in."""

from __future__ import annotations

from typing import Any

from exceed.report.arrange import severity_order
from exceed.report.layout import Screen
from exceed.report.pageview import View
from exceed.report.sections import mass_text
from exceed.report.show import count, duration, shown, words

Dict = dict[str, Any]
_CONFIGURATION = (("flaps", "flap_angle"), ("gear", "gear_down"), ("airbrakes", "airbrakes_out"))


def sheets(view: View) -> list[Dict]:
    """One inspection request each: the worst event in full, the others listed."""
    places = {
        event["id"]: (recording, event, key)
        for recording in view.recordings
        for key in ("undecided", "events")
        for event in recording[key]
    }
    found = []
    for due in view.summary["inspections"]:
        events = sorted((places[name] for name in due["events"]), key=lambda place: severity_order(place[1]))
        recording, worst, key = events[0]
        found.append(
            {
                "due": due,
                "aircraft": view.aircraft.get(due["registration"], {"type": None, "category": None}),
                "rule": view.titles.get(due["rule"], due["rule"]),
                "worst": worst,
                "undecided": key == "undecided",
                "rows": _rows(view, recording, worst),
                "others": [_in_short(view, one, event) for one, event, _ in events[1:]],
                "recording": recording,
            }
        )
    return found


def _in_short(view: View, recording: Dict, event: Dict) -> str:
    peak, interval, limit, unit = view.peak(event)
    sure = f" ({interval})" if interval else ""
    return (
        f"{view.instant(event)}: {event['title']} {peak}{sure}, limit {limit} {unit}, {duration(event['duration_s'])}"
    )


def _rows(view: View, recording: Dict, event: Dict) -> list[tuple[str, str]]:
    peak = event["peak"]
    form = shown(event["quantity"], peak["unit"], view.system)
    local = view.local(event)
    flight = next((row for row in recording["flights"] if row["flight"] == event["flight"]), None)
    mass = flight["mass"] if flight is not None else None
    method = next((row for row in recording["methods"] if row["quantity"] == event["quantity"]), None)
    aircraft = view.aircraft.get(recording["registration"], {})
    speed = next((name for name in event["context"] if name.endswith("airspeed")), "indicated_airspeed")
    height = next((name for name in event["context"] if name.endswith("altitude")), "pressure_altitude")
    recorded = "derived, no cell of its own"
    if peak["recorded"] is not None:
        recorded = f"{peak['recorded']:g} {peak['recorded_unit'] or ''}".strip()
    same = sum(other["rule"] == event["rule"] and other["flight"] == event["flight"] for other in recording["events"])
    rows = [
        ("time", f"{view.instant(event)}" + (f", local {local}" if local else "")),
        ("flight", f"{event['flight']}" if event["flight"] is not None else "flights not known"),
        ("phase", event["phase"]),
        ("peak as recorded", recorded),
        ("peak corrected", form.with_unit(peak["value"], form.decimals + 1)),
        ("peak estimated", view.estimate(event)),
        *(
            (f"time beyond {level['severity']}", f"{form.with_unit(level['limit'])}: {view.beyond(level)}")
            for level in event["levels"]
        ),
        ("limit", view.limit_text(event)),
        ("source of the limit", _source(event, aircraft)),
        ("mass", _mass(view, event, mass)),
        ("centre of gravity", view.one(event, "centre_of_gravity")),
        ("fuel", view.one(event, "fuel_mass")),
        (words(speed), view.one(event, speed)),
        (words(height), view.one(event, height)),
        ("configuration", ", ".join(f"{word} {view.one(event, name)}" for word, name in _CONFIGURATION)),
        ("sensor", _sensor(method, aircraft, {row["column"] for row in recording["channels"]})),
        ("repeats in this flight", f"{count(same, 'event')} of this rule, this one among them"),
        ("judged with", _judged_with(view, recording, aircraft)),
        ("log", f"{recording['path']}, content sha256 {recording['content_sha256'] or 'not known'}"),
    ]
    return [*rows, *(("note", note) for note in event["notes"])]


def _source(event: Dict, aircraft: Dict) -> str:
    if not event["limit"]["source"].startswith("aircraft"):
        return f"the rule {event['rule']}" + (f" of {event['set']}" if event["set"] else "")
    return str(aircraft.get("source") or "not stated")


def _mass(view: View, event: Dict, mass: Dict | None) -> str:
    """At the event, else in the flight, and how it was had."""
    known = event["context"].get("mass")
    if known is not None and known["value"] is not None:
        return view.one(event, "mass") + (f" ({mass['method']})" if mass is not None and mass["method"] else "")
    return mass_text(mass, Screen(None, units=view.system)) or "not known"


def _judged_with(view: View, recording: Dict, aircraft: Dict) -> str:
    """The aeroplane's file, the rule sets and the options; every file stands under Evidence."""
    parts = []
    for row in view.summary["judged_with"]:
        if "path" not in row:
            parts.append(f"{row['name']} {row['value']}")
        elif row["path"] == aircraft.get("path") or (row["kind"] == "rules" and _used(row, view, recording)):
            parts.append(f"{row['kind']} {row['path']} {(row['sha256'] or '')[:16]}".strip())
    return "; ".join(parts) or "see the evidence"


def _used(row: Dict, view: View, recording: Dict) -> bool:
    """Whether a rules file was used on a log; where its names do not tell, it is listed."""
    known = {one["set"] for one in view.summary["rules"]}
    return row["path"] not in known or row["path"] in recording["rule_sets"]


def _sensor(method: Dict | None, aircraft: Dict, columns: set[str]) -> str:
    parts = []
    if method is not None:
        inputs = ", ".join(name if name in columns else words(name) for name in method["inputs"])
        parts.append(method["method"] + (f" from {inputs}" if inputs else ""))
        if method["standard_uncertainty"] is not None:
            spread = method["standard_uncertainty"]
            parts.append(f"standard uncertainty {spread['value']:.2g} {spread['unit']}")
    parts += [f"{name} {text}" for name, text in aircraft.get("recorder", {}).items()]
    return "; ".join(parts) or "not known"
