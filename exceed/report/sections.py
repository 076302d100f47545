"""What follows the events in the terminal's table: extremes, what was not assessed, quality, inspections, totals."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from exceed.report.arrange import aeroplane, flight_order, flight_times, share_text, titles
from exceed.report.layout import Column, Screen, columns
from exceed.report.show import count, duration, elapsed, moment, paint, shown, words

Dict = dict[str, Any]
_MOST_RULES = 8
# excursions shorter than this are worth a line: it is long for a pull
_SHORT_SIGHT = 1.0


def ordered(summary: Dict) -> list[Dict]:
    """Recordings in reading order."""
    return sorted(summary["recordings"], key=flight_order)


def extremes(summary: Dict, screen: Screen) -> list[str]:
    """Each flight's largest and smallest values, and how near a limit they came."""
    flights = [(recording, flight) for recording in ordered(summary) for flight in recording["flights"]]
    rows: list[list[str]] = []
    plan: list[tuple[Dict, Dict, int]] = []
    for recording, flight in flights:
        for row in flight["extremes"]:
            form = shown(row["quantity"], row["unit"], screen.units)
            cells = [screen.safe(words(row["quantity"]))]
            for end in ("maximum", "minimum"):
                found = row[end]
                cells.append(form.with_unit(found["value"]) if found is not None else "")
                cells.append(instant(recording, found["time_s"]) if found is not None else "")
            cells.append(share_text(row["closest_to_limit"]))
            rows.append(cells)
        plan.append((recording, flight, len(flight["extremes"])))
    if not plan:
        return []
    heads = [
        Column("", least=14),
        Column("maximum", right=True),
        Column("at", drop=2),
        Column("minimum", right=True),
        Column("at", drop=2),
        Column("of limit", right=True, drop=3),
    ]
    head, body = columns(screen, heads, rows, indent=4)
    lines = ["", screen.heading("Flights and their extremes")]
    if rows:
        lines.append(paint(head, "faint", screen.colour))
    place = 0
    for recording, flight, many in plan:
        lines += [
            screen.heading(line) for line in screen.wrap(_flight_line(summary, recording, flight, screen), " ", "   ")
        ]
        lines += body[place : place + many]
        if not many:
            lines.append("    no quantity to give extremes of")
        place += many
        for note in flight["notes"]:
            lines += screen.wrap(screen.safe(note), "    note: ")
    return lines


def instant(recording: Dict, time: float | None) -> str:
    """A time on a recording's axis: UTC of day where its clock is absolute, else elapsed."""
    clock = recording["clock"]
    if time is None:
        return ""
    if clock is None or clock["start"] is None:
        return elapsed(time)
    seconds = moment(clock["start"]).timestamp() + time
    return moment_text(seconds)


def moment_text(epoch: float) -> str:
    """Time of day in UTC with tenths, from seconds since 1970."""
    tenths = round(epoch * 10.0) % 864000
    hours, rest = divmod(tenths, 36000)
    minutes, rest = divmod(rest, 600)
    return f"{hours:02d}:{minutes:02d}:{rest // 10:02d}.{rest % 10}"


def _flight_line(summary: Dict, recording: Dict, flight: Dict, screen: Screen) -> str:
    parts = [aeroplane(summary, recording, screen)]
    if flight["flight"] is None:
        parts.append("nothing tells flights apart: all recorded time counts as airborne")
    else:
        parts.append(f"flight {flight['flight']}, {flight_times(recording, flight, screen)}")
        if flight["landings"] is not None and flight["landings"] != 1:
            parts.append(count(flight["landings"], "landing"))
    parts.append(mass_text(flight["mass"], screen))
    parts.append(screen.safe(recording["path"]))
    return ", ".join(part for part in parts if part)


def mass_text(mass: Dict | None, screen: Screen) -> str:
    """A flight's mass and how it was had; empty where nothing is known."""
    if mass is None:
        return ""
    form = shown("mass", mass["unit"], screen.units)
    method = f" ({screen.safe(mass['method'])})" if mass["method"] else ""
    if mass["take_off"] is not None:
        ends = [mass["take_off"]] + ([mass["landing"]] if mass["landing"] is not None else [])
        return " to ".join(form.text(end) for end in ends) + f" {form.unit}" + method
    if mass["low"] is not None and mass["high"] is not None:
        return f"mass between {form.text(mass['low'])} and {form.with_unit(mass['high'])}" + method
    return "mass not known" + method


def not_assessed(summary: Dict, screen: Screen) -> list[str]:
    """Logs that failed, rules that could not be judged and why, stretches that were not seen."""
    names = titles(summary)
    lines: list[str] = []
    for recording in ordered(summary):
        if recording["status"] == "failed":
            lines += problem_lines(recording, "not read", screen)
    for row in summary["skipped"]:
        lines += screen.wrap(f"{screen.safe(row['path'])}: skipped: {screen.safe(row['reason'])}", "  ", "    ")
    lines += _no_limits(summary, screen)
    never: dict[tuple[str, str], tuple[dict[str, None], dict[str, None]]] = {}
    moot: dict[tuple[str, str], tuple[dict[str, None], dict[str, None]]] = {}
    partly: list[str] = []
    for recording in ordered(summary):
        owner = recording["registration"] or ""
        some: dict[tuple[float, str], dict[str, None]] = {}
        for row in recording["assessment"]:
            if row["flight"] is not None:
                continue
            title = names.get(row["rule"], row["rule"])
            if row["assessed_s"] > 0.0:
                if row["unassessed_s"] > 0.0:
                    reasons = _reasons(row["reasons"], row["not_applicable_s"] > 0.0)
                    some.setdefault((row["unassessed_s"], reasons), {})[title] = None
                continue
            table = never if row["unassessed_s"] > 0.0 else moot
            key = owner, ", ".join(reason["reason"] for reason in row["reasons"]) or "no reason given"
            rules, logs = table.setdefault(key, ({}, {}))
            rules[title] = None
            logs[recording["path"]] = None
        for (missed, reasons), rules in sorted(some.items(), key=lambda item: -item[0][0]):
            text = (
                f"{_owner(recording, screen)}, {screen.safe(recording['path'])}: {duration(missed)} of"
                f" {duration(recording['recorded_s'])} not assessed ({screen.safe(reasons)}): {_rules(rules, screen)}"
            )
            partly += screen.wrap(text, "  ", "    ")
    for table, what in ((never, "not assessed at all"), (moot, "does not apply")):
        for (owner, reason), (rules, logs) in table.items():
            where = screen.safe(owner or "no registration") + (f" ({count(len(logs), 'log')})" if len(logs) > 1 else "")
            text = f"{where}: {what}: {_rules(rules, screen)}: {screen.safe(reason)}"
            lines += screen.wrap(text, "  ", "    ")
        if table is never:
            lines += partly
    lines += _short_sight(summary, screen)
    if not any(recording["assessment"] for recording in summary["recordings"]):
        lines += screen.wrap("no rule was applied to any log", "  ")
    if not lines:
        return ["", screen.heading("Not assessed"), "  nothing: every rule saw all of the recorded time"]
    return ["", screen.heading("Not assessed"), *lines]


def _owner(recording: Dict, screen: Screen) -> str:
    return screen.safe(recording["registration"] or "no registration")


def problem_lines(recording: Dict, what: str, screen: Screen) -> list[str]:
    """Why a log was not read, or not wholly, and what to do."""
    problem = recording["problem"] or {"place": "", "problem": "no reason given", "expected": "", "do": ""}
    place = problem["place"] or recording["path"]
    lines = screen.wrap(f"{screen.safe(place)}: {what}: {screen.safe(problem['problem'])}", "  ", "    ")
    if place.split(":")[0] != recording["path"]:
        lines += screen.wrap(f"in {screen.safe(recording['path'])}", "    ")
    for key in ("expected", "do"):
        if problem[key]:
            lines += screen.wrap(f"{key}: {screen.safe(problem[key])}", "    ", "      ")
    return lines


def _no_limits(summary: Dict, screen: Screen) -> list[str]:
    lines: list[str] = []
    bare = [recording for recording in ordered(summary) if recording["status"] != "failed"]
    unnamed = [recording["path"] for recording in bare if recording["registration"] is None]
    if unnamed:
        lines += screen.wrap(f"no registration: {screen.listing(unnamed)}", "  ", "    ")
    owners = {recording["registration"] for recording in bare if recording["limits"] == "none"}
    named = sorted(owner for owner in owners if owner is not None)
    if owners:
        who = screen.listing(named) if named else "the logs without a registration"
        lines += screen.wrap(f"no limits known for this aeroplane: {who}", "  ", "    ")
        do = "do: write an aircraft file ('exceed template aircraft' starts one), or name a category with --aircraft"
        lines += screen.wrap(do, "    ", "      ")
    return lines


def _reasons(reasons: Sequence[Dict], always: bool) -> str:
    if len(reasons) == 1 and not always:
        return str(reasons[0]["reason"])
    return ", ".join(f"{row['reason']} {duration(row['seconds'])}" for row in reasons) or "no reason given"


def _rules(rules: dict[str, None], screen: Screen) -> str:
    found = list(rules)
    return (f"{len(found)} rules: " if len(found) > 3 else "") + screen.listing(found, _MOST_RULES)


def _short_sight(summary: Dict, screen: Screen) -> list[str]:
    lines: list[str] = []
    names = titles(summary)
    for recording in ordered(summary):
        blind: dict[float, dict[str, None]] = {}
        for row in recording["assessment"]:
            least = row["shortest_seen_s"]
            if row["flight"] is None and row["assessed_s"] > 0.0 and least is not None and least >= _SHORT_SIGHT:
                blind.setdefault(least, {})[names.get(row["rule"], row["rule"])] = None
        for least, rules in sorted(blind.items()):
            text = (
                f"{_owner(recording, screen)}, {screen.safe(recording['path'])}: peaks of less than {duration(least)}"
                f" cannot be sized: {_rules(rules, screen)}"
            )
            lines += screen.wrap(text, "  ", "    ")
    return lines


def quality(summary: Dict, screen: Screen) -> list[str]:
    """What was rejected, unused or not understood; gaps, resets, notes."""
    lines: list[str] = []
    names = titles(summary)
    for recording in ordered(summary):
        if recording["status"] == "failed":
            continue
        found: list[str] = []
        if recording["status"] == "partial" and recording["problem"] is not None:
            found.append(f"read in part: {recording['problem']['place']}: {recording['problem']['problem']}")
        clock = recording["clock"]
        if clock is not None:
            if clock["start"] is None:
                found.append("the clock is not absolute: times count from the first sample")
            if clock["gaps"]:
                missing = sum(gap["end_s"] - gap["start_s"] for gap in clock["gaps"])
                found.append(f"{count(len(clock['gaps']), 'gap')}, {duration(missing)} together")
            if clock["resets"]:
                found.append(f"the clock was reset {count(clock['resets'], 'time')}")
            found += clock["notes"]
        found += [_rejected(row, screen) for row in recording["rejected"]]
        found += [
            f"{names.get(row['rule'], row['rule'])}: within sensor error of the limit for {duration(row['seconds'])}"
            for row in recording["within_sensor_error"]
        ]
        found += [
            f"column {row['column']!s} not understood: {row['reason']}"
            + (f" ({row['question']})" if row["question"] else "")
            for row in recording["unresolved_columns"]
        ]
        if recording["unused_columns"]:
            unused = recording["unused_columns"]
            found.append(f"{count(len(unused), 'column')} not used: " + screen.listing(unused))
        found += recording["notes"]
        if found:
            lines += screen.wrap(f"{_owner(recording, screen)}, {screen.safe(recording['path'])}", "  ", "    ")
            for text in found:
                lines += screen.wrap(screen.safe(text), "    ", "      ")
    for note in summary["notes"]:
        lines += screen.wrap(screen.safe(note), "  ", "    ")
    return ["", screen.heading("Data quality"), *lines] if lines else []


def _rejected(row: Dict, screen: Screen) -> str:
    stretch = elapsed(row["start_s"])
    if row["end_s"] - row["start_s"] >= 1.0:
        stretch += f" to {elapsed(row['end_s'])}"
    text = f"{words(row['quantity'])}: {count(row['samples'], 'sample')} rejected ({words(row['reason'])}) at {stretch}"
    if row["extreme"] is not None:
        form = shown(row["quantity"], row["extreme"]["unit"], screen.units)
        text += f", up to {form.with_unit(row['extreme']['value'])}"
    if row["would_exceed"]:
        text += f"; taken as flight this would exceed: {', '.join(row['would_exceed'])}"
    return text


def inspections(summary: Dict, screen: Screen) -> list[str]:
    """What is due before the next flight, and what somebody must decide on."""
    names = titles(summary)
    lines: list[str] = []
    for row in summary["inspections"]:
        status = "due" if row["status"] == "due" else "to be decided"
        owner = screen.safe(row["registration"] or "no registration")
        serial = f" (serial {screen.safe(row['serial'])})" if row["serial"] else ""
        parts = [f"{status}: {owner}{serial}", row["certainty"]]
        if row["ata"]:
            parts.append(f"ATA {screen.safe(row['ata'])}")
        parts.append(f"{screen.safe(names.get(row['rule'], row['rule']))}, {count(len(row['events']), 'event')}")
        task = screen.safe(row["task"])
        if screen.width is None:
            lines.append("  " + ", ".join(parts) + f": {task}")
        else:
            head = screen.wrap(", ".join(parts), "  ", "    ")
            lines += [screen.heading(line) for line in head] if row["status"] == "due" else head
            lines += screen.wrap(task, "    ")
    return ["", screen.heading("Inspections"), *lines] if lines else []


def totals(summary: Dict, screen: Screen) -> list[str]:
    """One line of totals."""
    found = summary["totals"]
    logs = count(found["recordings"], "log") + (f" ({found['failed']} failed)" if found["failed"] else "")
    events = ", ".join(f"{found['events'][severity]} {severity}" for severity in ("warning", "caution", "advisory"))
    if found["near_limit"]:
        events += f" ({found['near_limit']} near limit)"
    due = sum(row["status"] == "due" for row in summary["inspections"])
    open_ = len(summary["inspections"]) - due
    parts = [f"{logs}, {count(found['flights'], 'flight')}, {duration(found['flight_s'])}", events]
    parts.append(f"{found['undecided']} undecided" + (f", {found['doubtful']} doubtful" if found["doubtful"] else ""))
    parts.append(f"{count(due, 'inspection')} due" + (f", {open_} to be decided" if open_ else ""))
    return ["", *screen.wrap("; ".join(parts))]


def cautions(summary: Dict, screen: Screen) -> list[str]:
    """The cautions, once."""
    lines = [""]
    for text in summary["cautions"]:
        lines += screen.wrap(screen.safe(text))
    return lines
