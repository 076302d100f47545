"""The summary as the page's template wants it: every figure already worded, every row already in order."""

from __future__ import annotations

from collections import Counter
from typing import Any

from exceed.core.findings import SEVERITIES
from exceed.report import sections, unassessed
from exceed.report.arrange import flight_order, flight_times, grouped, limit_source, share_text, titles
from exceed.report.gather import certainty_rank
from exceed.report.layout import Screen
from exceed.report.show import (
    STATES,
    count,
    duration,
    elapsed,
    local_text,
    number,
    peak_texts,
    probability,
    shown,
    words,
)

Dict = dict[str, Any]
_SECTIONS = {"not_assessed": unassessed.not_assessed, "quality": sections.quality}
_CERTAIN = {
    "established": "went beyond it",
    "likely": "more likely than not went beyond it",
    "possible": "may have gone beyond it",
    "doubtful": "probably stayed inside it",
}


class View:
    """Words for one summary in one system of units and one time zone (None: UTC only)."""

    def __init__(self, summary: Dict, system: str, zone: Any, floor: str) -> None:
        self.summary, self.system, self.zone = summary, system, zone
        self.floor = certainty_rank(floor)
        self.titles = titles(summary)
        self.aircraft = {row["registration"]: row for row in summary["aircraft"]}
        self.recordings = sorted(summary["recordings"], key=flight_order)
        self.anchors: set[str] = set()

    def listing(self, lines: list[str]) -> list[tuple[int, str]]:
        """Lines of a terminal section as (depth, text), its heading left out."""
        return [(0 if len(line) - len(line.lstrip()) < 4 else 1, line.strip()) for line in lines if line.strip()][1:]

    def section(self, name: str) -> list[tuple[int, str]]:
        """One of the terminal's sections as a list."""
        # the page has a table of every rule below: what was not assessed is grouped as on a (very wide) terminal
        width = 100_000 if name == "not_assessed" else None
        screen = Screen(width, units=self.system, zone=self.zone)
        return self.listing(_SECTIONS[name](self.summary, screen))

    def groups(self, key: str) -> list[Dict]:
        """Events (or undecided stretches) by recording and flight, with what stands above each group."""
        found = []
        for recording, flight, events in grouped(self.summary, key):
            kept = [event for event in events if key == "undecided" or certainty_rank(event["certainty"]) >= self.floor]
            if kept:
                rows = [self.event_row(recording, event, key) for event in kept]
                found.append({"title": self.group_title(recording, flight), "rows": rows})
        return found

    def hidden(self) -> str:
        """How many events lie below the floor, by severity and certainty."""
        events = [event for recording in self.recordings for event in recording["events"]]
        below = Counter(
            (event["severity"], event["certainty"])
            for event in events
            if certainty_rank(event["certainty"]) < self.floor
        )
        if not below:
            return ""
        order = sorted(below, key=lambda kind: (-SEVERITIES.index(kind[0]), -certainty_rank(kind[1])))
        listed = ", ".join(f"{below[kind]} {kind[0]} ({kind[1]})" for kind in order)
        return f"{count(sum(below.values()), 'event')} of lower certainty not shown: {listed}."

    def group_title(self, recording: Dict, flight: int | None) -> str:
        """`ZZ-NMA Larkspur 200, flight 1, zz-nma/a.csv`."""
        parts = [self.owner(recording)]
        clock = recording["clock"]
        if clock is not None and clock["start"] is not None:
            row = next((row for row in recording["flights"] if row["flight"] == flight), None)
            parts.append(str((row["take_off"] if row is not None else None) or clock["start"])[:10])
        if flight is not None:
            parts.append(f"flight {flight}")
        elif not any(row["flight"] for row in recording["flights"]):
            parts.append("flights not known")
        return ", ".join([*parts, recording["path"]])

    def owner(self, recording: Dict) -> str:
        registration = recording["registration"]
        if registration is None:
            return "no registration"
        row = self.aircraft.get(registration)
        return f"{registration} {row['type']}" if row is not None and row["type"] else str(registration)

    def instant(self, event: Dict) -> str:
        """When an event begins: UTC of day, else elapsed."""
        if event["start"] is None:
            return f"{elapsed(event['start_s'])} elapsed"
        return f"{event['start'][:10]} {event['start'][11:-3]} UTC"

    def clock(self, event: Dict) -> str:
        """The same without the date, which stands above the group."""
        return self.instant(event) if event["start"] is None else f"{event['start'][11:-3]} UTC"

    def local(self, event: Dict) -> str:
        return local_text(event["start"], self.zone, digits=1)

    def peak(self, event: Dict) -> tuple[str, str, str, str]:
        """Peak, interval, limit, unit, the interval as prose has it."""
        peak, interval, limit, unit = peak_texts(event, self.system)
        return peak, interval.replace("..", " to ").replace(">=", "at least").replace("<=", "at most"), limit, unit

    def event_row(self, recording: Dict, event: Dict, key: str) -> Dict:
        """The row of the table of events."""
        peak, interval, limit, unit = self.peak(event)
        anchor = f"{'u' if key == 'undecided' else 'e'}-{event['id']}"
        while anchor in self.anchors:  # the same content may have been scanned twice
            anchor += "-x"
        self.anchors.add(anchor)
        return {
            "anchor": anchor,
            "event": event,
            "recording": recording,
            "severity": event["severity"],
            "near": not event["limit_exceeded"] and key == "events",
            "certainty": event["certainty"],
            "p": probability(event["probability"]),
            "time": self.instant(event),
            "clock": self.clock(event),
            "local": self.local(event),
            "title": event["title"],
            "peak": peak,
            "interval": interval,
            "limit": f"{limit} {unit}".strip(),
            "assumed": event["limit"]["assumed"],
            "level": self.level_text(event),
            "lasting": duration(event["duration_s"]),
            "phase": event["phase"],
        }

    def level_text(self, event: Dict) -> str:
        """The level that the certainty speaks of, where it is not the limit itself."""
        level = next((row for row in event["levels"] if row["severity"] == event["severity"]), None)
        if level is None or level["limit"] is None or level["limit"] == event["limit"]["value"]:
            return ""
        form = shown(event["quantity"], event["peak"]["unit"], self.system)
        return f"{event['severity']} from {form.with_unit(level['limit'])}"

    def sentence(self, recording: Dict, event: Dict, *, undecided: bool) -> str:
        """What happened, in one or two plain sentences."""
        peak, interval, limit, unit = self.peak(event)
        gap = f" {unit}" if unit else ""
        owner = recording["registration"] or "the aeroplane of an unnamed log"
        where = f" in flight {event['flight']}" if event["flight"] is not None else ""
        doing = "" if event["phase"] == "unknown" else f", {event['phase']}"
        if event["side"] == "is" or event["quantity"] in STATES:
            text = f"{owner}{where}{doing}: {words(event['quantity'])} {peak} for {duration(event['duration_s'])}."
        else:
            way = "fell to" if event["side"] == "below" else "reached"
            sure = f" (95 %: {interval}{gap})" if interval else ""
            text = (
                f"{owner}{where}{doing}: {words(event['quantity'])} {way} {peak}{gap}{sure}"
                f" against a limit of {limit}{gap}, {duration(event['duration_s'])} beyond the lowest level reached."
            )
        level = next((row for row in event["levels"] if row["severity"] == event["severity"]), None)
        if undecided:
            text += " The samples stayed inside; the true value may not have."
        if level is not None and level["limit"] is not None:
            form = shown(event["quantity"], event["peak"]["unit"], self.system)
            text += (
                f" The {event['severity']} level is {form.with_unit(level['limit'])}: the true value"
                f" {_CERTAIN[event['certainty']]} (probability {probability(event['probability'])},"
                f" {event['certainty']})."
            )
        return text

    def values(self, recording: Dict, event: Dict) -> list[tuple[str, str]]:
        """The judgement at the peak, as rows of a table."""
        peak = event["peak"]
        form = shown(event["quantity"], peak["unit"], self.system)
        rows = [("instant of the peak", elapsed(peak["time_s"]) + " after the first sample")]
        if peak["recorded"] is not None:
            rows.append(("as recorded", f"{peak['recorded']:g} {peak['recorded_unit'] or ''}".strip()))
        rows.append(("corrected", form.with_unit(peak["value"], form.decimals + 1)))
        rows.append(("estimated true extreme", self.estimate(event)))
        rows.append(("limit in force", self.limit_text(event)))
        source = limit_source(self.summary, recording)
        if source and event["limit"]["source"].startswith("aircraft"):
            rows.append(("source of the limit", source))
        rows += [
            (f"beyond {level['severity']}, {form.with_unit(level['limit'])}", self.beyond(level))
            for level in event["levels"]
        ]
        if event["cut_by"]:
            rows.append(("cut by", words(event["cut_by"])))
        rows.append(("rule", f"{event['rule']} ({event['set']})" if event["set"] else event["rule"]))
        return rows

    def estimate(self, event: Dict) -> str:
        peak = event["peak"]
        form = shown(event["quantity"], peak["unit"], self.system)
        if peak["saturated"]:
            tail = ": the sensor was at the end of its range, at least this much"
        elif not peak["sized"]:
            tail = ": not sized, the channel is too slow for this peak"
        else:
            tail = ""
        _, interval, _, unit = self.peak(event)
        if peak["estimate"] is None and not interval:
            return "none" + tail
        sure = f" (95 %: {interval}{' ' + unit if unit else ''})" if interval else ""
        best = peak["estimate"] if peak["estimate"] is not None else peak["value"]
        return form.with_unit(best, form.decimals + 1) + sure + tail

    def limit_text(self, event: Dict) -> str:
        limit = event["limit"]
        form = shown(event["quantity"], limit["unit"], self.system)
        return f"{form.with_unit(limit['value'])}, {limit['source']}" + (", assumed" if limit["assumed"] else "")

    def beyond(self, level: Dict) -> str:
        if level["beyond_s"] <= 0.0:
            return f"not in the samples (probability {probability(level['probability'])})"
        return f"{duration(level['beyond_s'])} (probability {probability(level['probability'])})"

    def context(self, event: Dict) -> list[tuple[str, str]]:
        """What else held at the peak, as far as known."""
        return [
            (words(name), shown(name, row["unit"], self.system).with_unit(row["value"]))
            for name, row in event["context"].items()
            if row["value"] is not None
        ]

    def one(self, event: Dict, name: str) -> str:
        """One value of the context, or that it is not recorded."""
        row = event["context"].get(name)
        if row is None or row["value"] is None:
            return "not known"
        return shown(name, row["unit"], self.system).with_unit(row["value"])

    def flights(self) -> list[Dict]:
        """Each flight's extremes as rows."""
        return [
            {
                "title": self.group_title(recording, flight["flight"]),
                "when": self.flight_times(recording, flight),
                "rows": [self._extreme(recording, row) for row in flight["extremes"]],
                "notes": flight["notes"],
            }
            for recording in self.recordings
            for flight in recording["flights"]
        ]

    def flight_times(self, recording: Dict, flight: Dict) -> str:
        if flight["flight"] is None:
            return "nothing tells flights apart: all recorded time counts as airborne"
        text = flight_times(recording, flight, Screen(None, zone=self.zone))
        mass = sections.mass_text(flight["mass"], Screen(None, units=self.system))
        return ", ".join(part for part in (text, duration(flight["end_s"] - flight["start_s"]), mass) if part)

    def _extreme(self, recording: Dict, row: Dict) -> Dict:
        form = shown(row["quantity"], row["unit"], self.system)
        cells = {"quantity": words(row["quantity"]), "share": share_text(row["closest_to_limit"])}
        for end in ("maximum", "minimum"):
            found = row[end]
            cells[end] = form.with_unit(found["value"]) if found is not None else ""
            cells[f"{end}_at"] = sections.instant(recording, found["time_s"]) if found is not None else ""
        return cells

    def fleet(self) -> list[Dict]:
        """One row an aeroplane: what was flown and what was found."""
        rows: dict[str | None, Dict] = {}
        for recording in self.recordings:
            if recording["status"] == "failed":
                continue
            row = rows.setdefault(
                recording["registration"],
                {
                    "owner": self.owner(recording),
                    "limits": recording["limits"],
                    "logs": 0,
                    "flights": 0,
                    "seconds": 0.0,
                    "counts": Counter(),
                    "undecided": 0,
                    "inspections": 0,
                },
            )
            row["logs"] += 1
            row["flights"] += sum(flight["flight"] is not None for flight in recording["flights"])
            row["seconds"] += sum(flight["end_s"] - flight["start_s"] for flight in recording["flights"])
            row["counts"].update(event["severity"] for event in recording["events"])
            row["undecided"] += len(recording["undecided"])
        for due in self.summary["inspections"]:
            if due["registration"] in rows:
                rows[due["registration"]]["inspections"] += 1
        for row in rows.values():
            row["flown"] = duration(row.pop("seconds"))
        return list(rows.values())

    def verdict(self) -> list[str]:
        """The day in two or three sentences."""
        totals = self.summary["totals"]
        events = totals["events"]
        names = (("warning", None), ("caution", None), ("advisory", "advisories"))
        said = [count(events[one], one, more) for one, more in names if events[one]]
        read = totals["recordings"] - totals["failed"]
        if not read:
            return ["No log could be read, so nothing was assessed."]
        flown = count(totals["flights"], "flight") if totals["flights"] else count(read, "log")
        first = f"{flown}, {duration(totals['flight_s'])}: " + (
            f"{', '.join(said)}." if said else "no event in what could be assessed."
        )
        rest = []
        if totals["undecided"]:
            rest.append(f"{count(totals['undecided'], 'stretch', 'stretches')} stayed undecided.")
        due = sum(row["status"] == "due" for row in self.summary["inspections"])
        rest.append(f"{count(due, 'inspection')} due." if due else "No inspection is asked for by these rules.")
        if totals["failed"]:
            rest.append(f"{count(totals['failed'], 'log')} could not be read.")
        return [first, *rest]

    def assessment(self) -> list[Dict]:
        """One row a recording and rule: seconds assessed, unassessed, not applicable, and why."""
        return [
            {
                "log": recording["path"],
                "rule": self.titles.get(row["rule"], row["rule"]),
                "assessed": number(row["assessed_s"], 1),
                "unassessed": number(row["unassessed_s"], 1),
                "moot": number(row["not_applicable_s"], 1),
                "shortest": duration(row["shortest_seen_s"]) if row["shortest_seen_s"] is not None else "",
                "reasons": "; ".join(f"{why['reason']} {duration(why['seconds'])}" for why in row["reasons"]),
            }
            for recording in self.recordings
            for row in recording["assessment"]
            if row["flight"] is None
        ]
