"""The terminal's table: the summary in words, calm and complete, one line an event.

Works from the summary dict alone and sends no control character but colour.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from typing import Any

from exceed.report import sections, unassessed
from exceed.report.arrange import aeroplane, flight_times, grouped, limit_source
from exceed.report.gather import certainty_rank, certainty_word, severity_rank
from exceed.report.layout import Column, Screen, columns, on_point
from exceed.report.show import (
    MARKS,
    count,
    duration,
    elapsed,
    find_zone,
    local_text,
    peak_texts,
    probability,
    shown,
)

Dict = dict[str, Any]
Group = tuple[Dict, int | None, list[Dict]]
Heading = Callable[[Dict, Screen, Dict, int | None, list[Dict], bool], list[str]]
# narrower terminals than this get no fractions of a second, no local time, no probability
_ROOMY = 118
_MOST_NOTES = 6


def render_table(
    summary: Dict,
    *,
    width: int | None = None,
    colour: bool = False,
    unicode: bool = True,
    units: str = "trade",
    certainty_floor: str = "possible",
    time_zone: str | None = None,
) -> str:
    """The whole table as text that ends in a newline.

    Parameters
    ----------
    summary : the dict of `exceed/summary/1`
    width : columns of the terminal, or None for a pipe: then nothing is squeezed or wrapped
    colour, unicode : what the stream takes (`show.wants_colour`, `show.wants_unicode`)
    units : `trade` or `metric`
    certainty_floor : the lowest certainty that gets a line; what lies below is counted
    time_zone : shows local time beside UTC; the summary's own where None
    """
    screen = Screen(None if width is None else max(width, 40), colour, unicode, units)
    screen = Screen(screen.width, colour, unicode, units, find_zone(time_zone or summary.get("time_zone")))
    floor = certainty_rank(certainty_floor)
    lines = [
        *_events(summary, screen, floor),
        *_undecided(summary, screen),
        *sections.extremes(summary, screen),
        *unassessed.not_assessed(summary, screen),
        *sections.quality(summary, screen),
        *sections.inspections(summary, screen),
        *sections.totals(summary, screen),
        *sections.cautions(summary, screen),
    ]
    return "\n".join(lines) + "\n"


def _events(summary: Dict, screen: Screen, floor: int) -> list[str]:
    groups = grouped(summary, "events")
    events = [event for *_, found in groups for event in found]
    hidden = [event for event in events if certainty_rank(event["certainty"]) < floor]
    seen = [
        (recording, flight, [event for event in found if certainty_rank(event["certainty"]) >= floor])
        for recording, flight, found in groups
    ]
    seen = [group for group in seen if group[2]]
    lines = []
    if seen:
        lines += [screen.heading("Events"), *_table(summary, screen, seen, _group_heading)]
    elif not events:
        lines += _clean(summary, screen)
    else:
        lines += screen.wrap("No event at or above the certainty asked for.")
    lines += _hidden(hidden, screen)
    return lines


def _clean(summary: Dict, screen: Screen) -> list[str]:
    read = [recording for recording in summary["recordings"] if recording["status"] != "failed"]
    if not summary["recordings"]:
        return screen.wrap("No log was found, so nothing was assessed.")
    if not read:
        return screen.wrap("No log could be read, so nothing was assessed.")
    rules = {row["rule"] for recording in read for row in recording["assessment"] if row["assessed_s"] > 0.0}
    if not rules:
        return screen.wrap("No rule could be assessed, so nothing can be said about limits. The reasons stand below.")
    missed = {row["rule"] for recording in read for row in recording["assessment"] if row["unassessed_s"] > 0.0} | {
        row["rule"] for recording in read for row in recording["assessment"] if row["not_applicable_s"] > 0.0
    }
    totals = summary["totals"]
    flown = count(totals["flights"], "flight") if totals["flights"] else count(len(read), "log")
    text = (
        f"No event in what could be assessed: {count(len(rules), 'rule')} on {flown}, {duration(totals['flight_s'])}."
    )
    if summary["totals"]["undecided"]:
        text += f" {count(totals['undecided'], 'stretch', 'stretches')} stayed undecided."
    if missed or totals["failed"]:
        text += " What could not be assessed stands below."
    return screen.wrap(text)


def _hidden(hidden: list[Dict], screen: Screen) -> list[str]:
    lines = []
    doubtful = [event for event in hidden if event["certainty"] == "doubtful"]
    others = [event for event in hidden if event["certainty"] != "doubtful"]
    if doubtful:
        rules = Counter(event["title"] for event in doubtful)
        names = "; ".join(f"{screen.safe(title)} {many}" for title, many in sorted(rules.items()))
        text = f"{count(len(doubtful), 'doubtful event')} (the true value was probably inside the limit): {names}"
        lines += screen.wrap(text, "  ")
    if others:
        kinds = Counter((event["severity"], event["certainty"]) for event in others)
        order = sorted(kinds, key=lambda kind: (-severity_rank(kind[0]), -certainty_rank(kind[1])))
        names = ", ".join(f"{kinds[kind]} {kind[0]} ({kind[1]})" for kind in order)
        lines += screen.wrap(f"{count(len(others), 'event')} of lower certainty not shown: {names}", "  ")
    return lines


def _undecided(summary: Dict, screen: Screen) -> list[str]:
    groups = grouped(summary, "undecided")
    if not groups:
        return []
    text = "Undecided: the samples stayed inside, the true value may not have"
    return ["", *map(screen.heading, screen.wrap(text)), *_table(summary, screen, groups, _short_heading)]


def _table(summary: Dict, screen: Screen, groups: list[Group], heading: Heading) -> list[str]:
    piped, roomy = screen.width is None, screen.width is None or screen.width >= _ROOMY
    events = [event for *_, found in groups for event in found]
    texts = [peak_texts(event, screen.units) for event in events]
    peaks, limits = [text[0] for text in texts], [text[2] for text in texts]
    if roomy:
        peaks, limits = on_point(peaks), on_point(limits)
    heads = [
        Column("severity"),
        Column("certainty"),
        Column("p" if roomy else "", right=True, drop=2),
        Column("aircraft" if piped else ""),
        Column("flight" if piped else ""),
        Column("time UTC" if any(event["start"] for event in events) else "time"),
        Column("local" if roomy and screen.zone is not None else "", drop=1),
        Column("what", least=16 if roomy else 12 if screen.width is not None and screen.width >= 70 else 9),
        Column("peak", right=True),
        Column("95 %", drop=5),
        Column("limit", right=not roomy),
        Column("for", right=True, drop=4),
        Column("phase", drop=3),
        Column("limit from" if piped else ""),
        Column("file" if piped else ""),
    ]
    rows, place = [], 0
    for recording, flight, found in groups:
        for event in found:
            _, interval, _, unit = texts[place]
            assumed = " assumed" if event["limit"]["assumed"] and roomy else ""
            rows.append(
                [
                    f"{MARKS[event['severity']]:<2} {event['severity']}",
                    event["certainty"],
                    probability(event["probability"]) if roomy else "",
                    screen.safe(recording["registration"] or "-") if piped else "",
                    "-" if flight is None and piped else str(flight) if piped else "",
                    _time(event, roomy=roomy, dated=piped),
                    local_text(event["start"], screen.zone, digits=1) if roomy else "",
                    ("" if event["limit_exceeded"] or not roomy else "near limit: ") + screen.safe(event["title"]),
                    peaks[place],
                    interval,
                    (f"{limits[place]} {unit}" if unit else limits[place]).rstrip() + assumed,
                    duration(event["duration_s"])
                    + (f", cut by {event['cut_by']}" if event["cut_by"] and piped else ""),
                    event["phase"],
                    screen.safe(event["limit"]["source"]) if piped else "",
                    screen.safe(recording["path"]) if piped else "",
                ]
            )
            place += 1
    head, body = columns(screen, heads, rows)
    lines, place = [screen.paint(head, "faint")], 0
    named: set[str | None] = set()
    for recording, flight, found in groups:
        first = recording["registration"] not in named
        named.add(recording["registration"])
        lines += heading(summary, screen, recording, flight, found, first)
        for event in found:
            lines.append(_tinted(body[place], event["severity"], screen))
            place += 1
        lines += _shared(found, screen)
        lines += _notes(found, screen)
    return lines


def _tinted(line: str, severity: str, screen: Screen) -> str:
    if not screen.colour:
        return line
    word = f"{MARKS[severity]:<2} {severity}"
    return line.replace(word, screen.paint(word, severity), 1)


def _time(event: Dict, *, roomy: bool, dated: bool) -> str:
    if event["start"] is None:
        # without the tenths a line of 80 columns has room for how long it lasted
        return elapsed(event["start_s"]) if roomy else elapsed(event["start_s"])[:-2]
    if dated:
        return str(event["start"])
    clock = str(event["start"])[11:-1]
    return clock[:-2] if roomy else clock[:8]


def _group_heading(
    summary: Dict, screen: Screen, recording: Dict, flight: int | None, found: list[Dict], first: bool
) -> list[str]:
    parts = [aeroplane(summary, recording, screen)]
    if flight is not None:
        parts.append(f"flight {flight}")
    row = next((row for row in recording["flights"] if row["flight"] == flight), None)
    if row is not None and flight is not None:
        parts.append(flight_times(recording, row, screen))
    elif flight is None:
        parts.append(
            "outside any flight" if any(row["flight"] for row in recording["flights"]) else "flights not known"
        )
    parts.append(screen.safe(recording["path"]))
    if any(event["limit"]["assumed"] for event in found):
        parts.append("limits assumed")
    lines = [screen.heading(line) for line in screen.wrap(", ".join(part for part in parts if part), " ", "   ")]
    source = limit_source(summary, recording)
    if source and first:
        lines += [screen.paint(line, "faint") for line in screen.wrap(f"limits: {screen.safe(source)}", "   ", "     ")]
    return lines


def _short_heading(
    summary: Dict, screen: Screen, recording: Dict, flight: int | None, found: list[Dict], first: bool
) -> list[str]:
    owner = screen.safe(recording["registration"] or "no registration")
    parts = [owner, "" if flight is None else f"flight {flight}", screen.safe(recording["path"])]
    return [screen.heading(line) for line in screen.wrap(", ".join(part for part in parts if part), " ", "   ")]


def _shared(found: list[Dict], screen: Screen) -> list[str]:
    """Where the levels that an event crossed are not equally sure: the line above gives the highest one's certainty."""
    lines: list[str] = []
    for event in found:
        crossed = [row for row in event["levels"] if row["start_s"] is not None and row["probability"] is not None]
        if len({certainty_word(level["probability"]) for level in crossed}) < 2:
            continue
        form = shown(event["quantity"], event["peak"]["unit"], screen.units)
        said = ", ".join(
            f"{level['severity']} from {form.with_unit(level['limit'])} {certainty_word(level['probability'])}"
            f" ({probability(level['probability'])})"
            for level in crossed
        )
        when = _time(event, roomy=screen.width is None or screen.width >= _ROOMY, dated=False)
        lines += screen.wrap(f"{screen.safe(event['title'])} at {when}: {said}", "    level by level: ", "      ")
    return lines


def _notes(found: list[Dict], screen: Screen) -> list[str]:
    notes = Counter(note for event in found for note in event["notes"])
    lines: list[str] = []
    for note, many in list(notes.items())[: _MOST_NOTES if screen.width is not None else None]:
        share = "" if len(found) == 1 else f" ({count(many, 'event')})"
        lines += screen.wrap(screen.safe(note) + share, "    note: ")
    if screen.width is not None and len(notes) > _MOST_NOTES:
        lines.append(f"    note: {len(notes) - _MOST_NOTES} more in the JSON")
    return [screen.paint(line, "faint") for line in lines]
