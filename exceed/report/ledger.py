"""The ledger's lists as text: events, flights, inspections, totals, trends; and what a scan added."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from exceed.report.layout import Column, Screen, columns, on_point
from exceed.report.show import MARKS, count, duration, elapsed, number, peak_texts

Dict = dict[str, Any]
_STATUS = {"due": "due", "to_be_decided": "to be decided", "closed": "closed"}


def _table(screen: Screen, heads: Sequence[Column], rows: Sequence[Sequence[str]], painted: Sequence[str]) -> list[str]:
    """Heading and rows; `painted` is the colour of each row's first cell, or empty."""
    head, lines = columns(screen, heads, rows)
    out = [screen.heading(head)]
    for line, row, kind in zip(lines, rows, painted, strict=True):
        first = row[0]
        coloured = line.replace(first, screen.paint(first, kind), 1) if kind and first in line else line
        out.append(coloured)
    return out


def _text(lines: Sequence[str]) -> str:
    return "\n".join(lines) + "\n"


def _when(screen: Screen, start: str | None, start_s: float | None = None) -> str:
    if start is not None:
        narrow = screen.width is not None and screen.width < 100
        return screen.safe(start[: 16 if narrow else 19].replace("T", " ") + "Z")
    return f"+{elapsed(start_s)}" if start_s is not None else "-"


def render_events(rows: Sequence[Dict], screen: Screen, undated: int = 0) -> str:
    """The list of events. Undecided stretches are among them and say so."""
    heads = (
        Column("severity"), Column("certainty", drop=3), Column("id"), Column("plane"), Column("time"),
        Column("what", least=10), Column("peak", right=True), Column("limit", right=True, drop=4),
        Column("for", right=True, drop=2), Column("state", least=5), Column("recording", drop=1, least=10),
    )  # fmt: skip
    cells = []
    for row in rows:
        peak, _, limit, unit = peak_texts(row)
        cells.append(
            [
                f"{row['severity']} {MARKS[row['severity']]}" + (" ?" if row["undecided"] else ""),
                ("undecided, " if row["undecided"] else "") + row["certainty"],
                row["id"],
                screen.safe(row["registration"] or "no registration"),
                _when(screen, row["start"], row["start_s"]),
                screen.safe(row["title"]),
                f"{peak} {unit}".strip(),
                limit,
                duration(row["duration_s"]),
                _decision(screen, row),
                screen.safe(row["recording"]["path"]),
            ]
        )
    lines = _table(screen, heads, cells, [row["severity"] for row in rows]) if rows else ["no events"]
    still = sum(row["open"] for row in rows)
    lines.append(f"{count(len(rows), 'event')}, {still} open")
    if undated:
        lines.append(f"{count(undated, 'event')} without a date left out")
    return _text(lines)


def _decision(screen: Screen, row: Dict) -> str:
    decision = row["decision"]
    if decision is None:
        return "open"
    words = f"{decision['as']} ({decision['by'] or 'name blanked'})"
    if decision["carried"]:
        words += ", on an earlier judgement"
    if decision["worse_since"]:
        words += ": worse now, open"
    return screen.safe(words)


def render_flights(rows: Sequence[Dict], screen: Screen) -> str:
    """The list of flights; its ids are what `reassign` takes."""
    heads = (
        Column("id"), Column("aeroplane"), Column("start"), Column("airborne", right=True),
        Column("landings", right=True, drop=2), Column("note", drop=1), Column("recording", least=10),
    )  # fmt: skip
    cells = [
        [
            row["id"],
            screen.safe(row["registration"] or "no registration"),
            _when(screen, row["start"]),
            duration(row["flight_s"]),
            "-" if row["landings"] is None else str(row["landings"]),
            "overlaps another flight: clock or registration wrong?" if row["clash"]
            else "" if row["told_apart"] else "flights not told apart",
            ", ".join(screen.safe(path) for path in row["recordings"]),
        ]
        for row in rows
    ]  # fmt: skip
    lines = _table(screen, heads, cells, [""] * len(rows)) if rows else []
    return _text([*lines, count(len(rows), "flight")])


def render_inspections(rows: Sequence[Dict], screen: Screen) -> str:
    """One inspection a paragraph: a task is a sentence."""
    lines = []
    for row in rows:
        kind = "warning" if row["due"] and row["due"]["passed"] else "caution" if row["status"] == "due" else "faint"
        head = f"{_STATUS[row['status']]}  {row['registration'] or 'no registration'}  {row['id']}"
        lines.append(screen.paint(screen.safe(head), kind))
        lines += screen.wrap(
            screen.safe(row["task"]) + (f" (ATA {screen.safe(row['ata'])})" if row["ata"] else ""), "  "
        )
        due = row["due"]
        if due is not None:
            passed = "PASSED: " if due["passed"] else ""
            lines += screen.wrap(f"before: {passed}{screen.safe(due['words'])}", "  ")
        lines += screen.wrap(f"for {screen.safe(row['rule'])}: {', '.join(row['events'])}", "  ")
        if row["status"] == "closed" and row["closed_at"]:
            by = screen.safe(row["closed_by"] or "name blanked")
            lines += screen.wrap(f"closed by {by}, {row['closed_at']}, {screen.safe(row['reference'])}", "  ")
        lines += [line for note in row["notes"] for line in screen.wrap(screen.safe(note), "  ")]
    many = {status: sum(row["status"] == status for row in rows) for status in _STATUS}
    lines.append(", ".join(f"{many[status]} {words}" for status, words in _STATUS.items()))
    return _text(lines)


def render_totals(rows: Sequence[Dict], screen: Screen) -> str:
    """Hours, flights, landings, events and time beyond limits, an airframe a row."""
    heads = (
        Column("aeroplane"), Column("flights", right=True), Column("hours", right=True), Column("landings", right=True),
        Column("advisory", right=True), Column("caution", right=True), Column("warning", right=True),
        Column("undecided", right=True, drop=2), Column("open", right=True),
        Column("no exceedance", right=True, drop=1), Column("airframe", drop=3),
    )  # fmt: skip
    cells = [
        [
            screen.safe(row["registration"] or "no registration"), str(row["flights"]), number(row["flight_h"], 2),
            str(row["landings"]), *(str(row["events"][name]) for name in ("advisory", "caution", "warning")),
            str(row["undecided"]), str(row["open"]), str(row["decided_away"]), _airframe(row["airframe"]),
        ]
        for row in rows
    ]  # fmt: skip
    lines = _table(screen, heads, cells, [""] * len(rows)) if rows else ["no flights"]
    for row in rows:
        name = screen.safe(row["registration"] or "no registration")
        for one in row["beyond"]:
            words = f"{screen.safe(one['rule'])}: beyond {duration(one['seconds'])} in {count(one['events'], 'event')}"
            lines += screen.wrap(words, f"  {name}  ")
        for many, words in (
            (row["undated_flights"], "without a date"),
            (row["landings_unknown_flights"], "whose landings are not known"),
            (row["undivided_recordings"], "that may be several: nothing told flights apart"),
            (row["clashes"], "overlapping another: is a clock or a registration wrong?"),
        ):
            if many:
                lines.append(f"  {name}  {count(many, 'flight')} {words}")
    return _text(lines)


def _airframe(row: Dict | None) -> str:
    if row is None:
        return "totals not set"
    parts = [f"{row['hours']:.1f} h"] if row["hours"] is not None else []
    parts += [count(int(row["landings"]), "landing")] if row["landings"] is not None else []
    tail = (
        f", {row['undated_flights_not_counted']} undated flights not in it"
        if row["undated_flights_not_counted"]
        else ""
    )
    return ", ".join(parts) + tail


def render_trends(rows: Sequence[Dict], screen: Screen, source: str) -> str:
    """Rates by month, with bounds."""
    heads = (
        Column("month"), Column("events", right=True), Column("flights", right=True), Column("hours", right=True),
        Column("per 1000 flights"), Column("per 1000 h"), Column("no exceedance", right=True, drop=1),
    )  # fmt: skip
    per_flight = on_point([_rate(row["per_1000_flights"]) for row in rows])
    per_hour = on_point([_rate(row["per_1000_hours"]) for row in rows])
    cells = [
        [
            row["period"],
            str(row["events"]),
            str(row["flights"]),
            number(row["hours"], 2),
            one,
            other,
            str(row["decided_away"]),
        ]
        for row, one, other in zip(rows, per_flight, per_hour, strict=True)
    ]
    return _text([*_table(screen, heads, cells, [""] * len(rows)), *screen.wrap(source)])


def _rate(rate: Dict | None) -> str:
    if rate is None:
        return "-"
    # three digits say all that so few events can
    digits = 0 if rate["value"] >= 100.0 else 1 if rate["value"] >= 10.0 else 2
    return f"{number(rate['value'], digits)} ({number(rate['low'], digits)}..{number(rate['high'], digits)})"


def trends_page(rows: Sequence[Dict], title: str, source: str) -> str:
    """A page of its own with the rates by month and their bounds."""
    from exceed.report.page import _figure_page

    months = [row for row in rows if row["period"] not in ("undated", "all")]
    data = []
    for turn, (key, name) in enumerate((("per_1000_flights", "per 1,000 flights"), ("per_1000_hours", "per 1,000 h"))):
        shown = [row for row in months if row[key] is not None]
        data.append(
            {
                "type": "scatter",
                "mode": "markers+lines",
                "name": name,
                "x": [row["period"] for row in shown],
                "y": [row[key]["value"] for row in shown],
                "error_y": {
                    "type": "data",
                    "symmetric": False,
                    "array": [round(row[key]["high"] - row[key]["value"], 3) for row in shown],
                    "arrayminus": [round(row[key]["value"] - row[key]["low"], 3) for row in shown],
                },
                "line": {"color": f"$series{turn}", "dash": ("solid", "dash")[turn]},
                "marker": {"symbol": turn, "size": 7},
                "hovertemplate": "%{x}: %{y}<extra></extra>",
            }
        )
    layout = {
        "height": 420,
        "margin": {"l": 64, "r": 12, "t": 12, "b": 60},
        "xaxis": {"title": {"text": "month"}, "type": "category"},
        "yaxis": {"title": {"text": "events"}, "rangemode": "tozero"},
        "legend": {"orientation": "h", "y": 1.02, "yanchor": "bottom"},
        "showlegend": True,
    }
    table = [
        (
            row["period"],
            f"{count(row['events'], 'event')}, {count(row['flights'], 'flight')}, {number(row['hours'], 2)} h; "
            f"{_rate(row['per_1000_flights'])} per 1,000 flights; {_rate(row['per_1000_hours'])} per 1,000 h",
        )
        for row in rows
    ]
    return _figure_page(title, {"data": data, "layout": layout}, source, table)


def render_judgements(rows: Sequence[Dict], screen: Screen) -> str:
    """Who judged what when, and what a newer judgement changed."""
    lines = []
    for row in rows:
        name = f"{row['recording']['path']}  {row['registration'] or 'no registration'}"
        lines += screen.wrap(f"{screen.safe(name)}  judgement {row['turn']}, scan {row['scan']}, {row['recorded_at']}")
        if row["replaces"] is not None:
            before = row["replaces"]
            lines.append(f"  replaces judgement {before['turn']} of scan {before['scan']}")
        files = [one for one in row["judged_with"] if one["kind"] == "rules"]
        lines += screen.wrap("rules " + ", ".join(f"{one['path']} {one['sha256'][:8]}" for one in files), "  ")
        for one in row["changes"]:
            text = f"{one['kind']}: {one['rule']} {one['earlier'] or one['later']}"
            lines += screen.wrap(screen.safe(text + (f" ({one['difference']})" if one["difference"] else "")), "  ")
    return _text([*lines, count(len(rows), "judgement")])


def _news(result: Dict) -> list[Any]:
    """What of a scan's result somebody should look at."""
    return [*result["changes"], *result["flights"]["clashes"], *result["left_out"], *[1] * result["events"]["standing"]]


def recorded_lines(result: Dict, place: str, *, quiet: bool = False) -> list[str]:
    """What a scan added to the ledger, for stderr; `quiet` leaves only what somebody should look at."""
    made, flights, events, work = (result[key] for key in ("recordings", "flights", "events", "inspections"))
    lines = [
        f"ledger {place}: {count(made['added'], 'recording')} added, {made['known']} known, "
        f"{made['judged_anew']} judged anew",
        f"  {count(flights['added'], 'flight')} added, {flights['known']} known"
        + (f", {flights['longer']} of them longer now" if flights["longer"] else "")
        + f"; {count(events['added'], 'event')} added, {events['known']} known"
        + f"; {count(work['added'], 'inspection')} added, {work['known']} known",
    ]
    if quiet:
        lines = [f"ledger {place}:"] if len(_news(result)) else []
    elif result["replaces"] is not None:
        lines.append(f"  this replaces judgements of scan {result['replaces']}")
    for one in result["changes"]:
        when = one["start"] or f"+{elapsed(one['start_s'])}"
        text = f"  {one['kind']}: {one['registration'] or 'no registration'} {when} {one['title']} ({one['event']})"
        if one["difference"]:
            text += f": {one['difference']}"
        if one["decision"]:
            text += f"; was decided: {one['decision']}"
        lines.append(text)
    for one in flights["clashes"]:
        lines.append(
            f"  {one['path']}: a flight overlaps flight {one['flight']} but took off at another time: "
            "is a clock or a registration wrong? It is counted as a flight of its own"
        )
    if events["standing"]:
        stand = count(events["standing"], "event")
        lines.append(f"  {stand} of earlier judgements stand: their rules were not applied or not assessed this time")
    lines += [f"  {one['path']}: {one['reason']}" for one in result["left_out"]]
    return lines
