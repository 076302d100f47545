"""What follows the events in the terminal's table: extremes, what was not assessed, quality, inspections, totals."""

from __future__ import annotations

from typing import Any

from exceed.report.arrange import aeroplane, flight_times, ordered, owner, share_text, titles
from exceed.report.layout import Column, Screen, columns
from exceed.report.show import count, duration, elapsed, moment, paint, shown, words

Dict = dict[str, Any]
# extremes that are worth a line though no limit is known
_ALWAYS = ("load_factor", "indicated_airspeed", "pressure_altitude")


def extremes(summary: Dict, screen: Screen) -> list[str]:
    """Each flight's largest and smallest values, and how near a limit they came."""
    flights = [(recording, flight) for recording in ordered(summary) for flight in recording["flights"]]
    rows: list[list[str]] = []
    plan: list[tuple[Dict, Dict, int]] = []
    left = 0
    for recording, flight in flights:
        kept = [row for row in flight["extremes"] if screen.width is None or _telling(row)]
        left += len(flight["extremes"]) - len(kept)
        for row in kept:
            form = shown(row["quantity"], row["unit"], screen.units)
            cells = [screen.safe(words(row["quantity"]))]
            for end in ("maximum", "minimum"):
                found = row[end]
                cells.append(form.with_unit(found["value"]) if found is not None else "")
                cells.append(instant(recording, found["time_s"]) if found is not None else "")
            cells.append(share_text(row["closest_to_limit"]))
            rows.append(cells)
        plan.append((recording, flight, len(kept)))
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
    if any(row[-1] for row in rows):
        text = "of limit: the nearest that a value came to a limit while its rule applied"
        lines += [screen.paint(line, "faint") for line in screen.wrap(text, "  ")]
    if left:
        text = "quantities without a limit are left out here; the JSON and the page have them all"
        lines += [screen.paint(line, "faint") for line in screen.wrap(text, "  ")]
    return lines


def _telling(row: Dict) -> bool:
    return row["closest_to_limit"] is not None or row["quantity"] in _ALWAYS


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
            lines += screen.wrap(f"{owner(recording, screen)}, {screen.safe(recording['path'])}", "  ", "    ")
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
        who = screen.safe(row["registration"] or "no registration")
        serial = f" (serial {screen.safe(row['serial'])})" if row["serial"] else ""
        parts = [f"{status}: {who}{serial}", row["certainty"]]
        if row["ata"]:
            parts.append(f"ATA {screen.safe(row['ata'])}")
        parts.append(f"{screen.safe(names.get(row['rule'], row['rule']))}, {count(len(row['events']), 'event')}")
        if row["before"]:
            parts.append(f"before {screen.safe(row['before'])}")
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
