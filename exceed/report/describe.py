"""What `exceed describe` says of a log, as a colleague would who has looked it through."""

from __future__ import annotations

from typing import Any

from exceed.core.outcome import DayOutcome, FeedRow, LogOutcome
from exceed.report import sections
from exceed.report.layout import Column, Screen, columns
from exceed.report.show import count, duration, elapsed, find_zone, local_text, number, shown, words
from exceed.report.summary import summarise
from exceed.report.unassessed import problem_lines

Dict = dict[str, Any]


def describe(
    log: LogOutcome,
    *,
    width: int | None = None,
    colour: bool = False,
    unicode: bool = True,
    units: str = "trade",
    time_zone: str | None = None,
) -> str:
    """The note on one log as text: clock, channels, quality, flights, extremes, the rules it can feed.

    `log.findings` needs only extremes and rejected; `log.feeds` names the rules. width None: a pipe.
    """
    screen = Screen(None if width is None else max(width, 40), colour, unicode, units, find_zone(time_zone))
    summary = summarise(DayOutcome((log,), created=""))
    recording = summary["recordings"][0]
    lines = [
        *_head(summary, recording, screen),
        *_clock(recording, screen),
        *_channels(recording, screen),
        *_columns_left(recording, screen),
        *_methods(recording, screen),
        *sections.quality(summary, screen),
        *sections.extremes(summary, screen),
        *_feeds(log.feeds, screen),
    ]
    return "\n".join(lines) + "\n"


def _head(summary: Dict, recording: Dict, screen: Screen) -> list[str]:
    lines = [screen.heading(line) for line in screen.wrap(screen.safe(recording["path"]))]
    if recording["status"] == "failed":
        return [*lines, *problem_lines(recording, "not read", screen)]
    text = f"{count(recording['rows'], 'row')}, {duration(recording['recorded_s'])} recorded"
    lines += screen.wrap(text, "  ")
    if recording["content_sha256"]:
        lines += screen.wrap(f"content sha256 {recording['content_sha256']}", "  ")
    registration = recording["registration"]
    row = next((row for row in summary["aircraft"] if row["registration"] == registration), None)
    if registration is None:
        lines += screen.wrap("no registration in the log, and none given: nothing is judged against its limits", "  ")
        return lines
    parts = [registration]
    if row is not None:
        parts += [row["type"] or "", f"category {row['category']}" if row["category"] else ""]
        parts.append(f"serial {row['serial']}" if row["serial"] else "")
        source = f" ({row['source']})" if row["source"] else ""
        said = {"own": "limits from its own file", "assumed": "limits assumed", "none": "no limits known"}
        parts.append(said[row["limits"]] + source)
    lines += screen.wrap(screen.safe(", ".join(part for part in parts if part)), "  ", "    ")
    if row is not None:
        for name, text in row["recorder"].items():
            lines += screen.wrap(screen.safe(f"{name}: {text}"), "  ", "    ")
    return lines


def _clock(recording: Dict, screen: Screen) -> list[str]:
    clock = recording["clock"]
    if clock is None:
        return []
    text = f"read as {words(clock['kind'])}"
    if clock["start"] is None:
        text += ", not absolute: times count from the first sample"
    else:
        text += f", from {clock['start']}"
        if screen.zone is not None:
            text += f" (local {local_text(clock['start'], screen.zone)})"
        text += f"; zone {clock['zone']}" if clock["zone"] else ""
    text += f"; {count(clock['resets'], 'reset')}; {count(len(clock['gaps']), 'gap')}"
    lines = ["", screen.heading("Clock"), *screen.wrap(screen.safe(text), "  ", "    ")]
    listed = clock["gaps"] if screen.width is None else clock["gaps"][:8]
    for gap in listed:
        length = duration(gap["end_s"] - gap["start_s"])
        lines.append(f"    gap {elapsed(gap['start_s'])} to {elapsed(gap['end_s'])}, {length}")
    if len(listed) < len(clock["gaps"]):
        lines.append(f"    and {len(clock['gaps']) - len(listed)} more")
    return lines


def _channels(recording: Dict, screen: Screen) -> list[str]:
    rows = recording["channels"]
    if recording["status"] == "failed" and not rows:
        return []
    if not rows:
        return ["", screen.heading("Channels"), "  none: no column was understood"]
    heads = [
        Column("column", least=10),
        Column("quantity", least=18),
        Column("unit"),
        Column("rate", right=True),
        Column("valid", right=True),
        Column("found by", drop=2, least=6),
        Column("positive", drop=3),
        Column("datum", drop=3),
        Column("bias", right=True, drop=4),
        Column("std unc.", right=True, drop=1),
    ]
    cells = [
        [
            screen.safe(row["column"]),
            screen.safe(words(row["quantity"])),
            screen.safe(row["unit"]),
            f"{row['rate_hz']:g} Hz" if row["rate_hz"] is not None else "",
            _per_cent(row["valid_share"]),
            screen.safe(row["found_by"]),
            screen.safe(row["sign"] or ""),
            screen.safe(row["datum"] or ""),
            _measured(row["bias"]),
            _measured(row["standard_uncertainty"]),
        ]
        for row in rows
    ]
    head, body = columns(screen, heads, cells)
    lines = ["", screen.heading("Channels"), screen.paint(head, "faint")]
    for row, line in zip(rows, body, strict=True):
        lines.append(line)
        said = [row["reason"], f"uncertainty: {row['uncertainty_source']}" if row["uncertainty_source"] else ""]
        for text in [*said, *row["notes"]]:
            if text:
                lines += screen.wrap(screen.safe(text), "      ")
    return lines


def _per_cent(share: float | None) -> str:
    if share is None:
        return ""
    # 99.97 % is not 100 %: a sample was lost
    text = number(share * 100.0, 1)
    return "100 %" if share == 1.0 else f"{'99.9' if text == '100.0' else text} %"


def _measured(row: Dict | None) -> str:
    if row is None:
        return ""
    unit = shown("", row["unit"]).unit
    # an uncertainty says nothing with more than two digits
    return f"{row['value']:.2g} {unit}".strip()


def _columns_left(recording: Dict, screen: Screen) -> list[str]:
    lines: list[str] = []
    for row in recording["unresolved_columns"]:
        lines += screen.wrap(screen.safe(f"{row['column']}: not understood: {row['reason']}"), "  ", "    ")
        if row["question"]:
            lines += screen.wrap(screen.safe(row["question"]), "    ask: ")
    if recording["unused_columns"]:
        lines += screen.wrap(f"not used: {', '.join(map(screen.safe, recording['unused_columns']))}", "  ", "    ")
    if lines:
        do = "do: 'exceed describe LOG --write FILE' writes a channels file in which these can be settled"
        lines += screen.wrap(do, "  ", "    ")
    return lines


def _methods(recording: Dict, screen: Screen) -> list[str]:
    lines: list[str] = []
    # a column is shown as the log writes it, a quantity as words
    names = {row["column"] for row in recording["channels"]}
    for row in recording["methods"]:
        text = f"{words(row['quantity'])}: {row['method']}"
        inputs = [name if name in names else words(name) for name in row["inputs"]]
        text += f" from {', '.join(inputs)}" if inputs else ""
        text += f"; assumes: {row['assumes']}" if row["assumes"] else ""
        text += (
            f"; standard uncertainty {_measured(row['standard_uncertainty'])}" if row["standard_uncertainty"] else ""
        )
        lines += screen.wrap(screen.safe(text), "  ", "    ")
    for quantity, reason in recording["missing"].items():
        lines += screen.wrap(screen.safe(f"{words(quantity)}: cannot be had: {reason}"), "  ", "    ")
    return ["", screen.heading("Where quantities come from"), *lines] if lines else []


def _feeds(feeds: tuple[FeedRow, ...], screen: Screen) -> list[str]:
    if not feeds:
        return []
    lines = ["", screen.heading("Rules it can feed")]
    for name in dict.fromkeys(row.rule_set for row in feeds):
        rows = [row for row in feeds if row.rule_set == name]
        able = [row.title for row in rows if not row.lacks]
        head = f"{screen.safe(name)}: {len(able)} of {count(len(rows), 'rule')}"
        listed = f": {', '.join(map(screen.safe, able))}" if able else ""
        lines += screen.wrap(head + listed, "  ", "    ")
        reasons: dict[tuple[str, ...], list[str]] = {}
        for row in rows:
            if row.lacks:
                reasons.setdefault(row.lacks, []).append(row.title)
        for lacks, names in reasons.items():
            lines += screen.wrap(screen.safe(f"not: {', '.join(names)}: {', '.join(lacks)}"), "    ", "      ")
    return lines
