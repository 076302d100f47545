"""What the terminal's table says of logs that were not read, rules that could not judge, and time that was not seen."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from exceed.report.arrange import ordered, owner, titles
from exceed.report.layout import Screen
from exceed.report.show import count, duration

Dict = dict[str, Any]
# (registration, reason) -> rules, logs; both in their order
Reasons = dict[tuple[str, str], tuple[dict[str, None], dict[str, None]]]
_MOST_RULES = 8
# reasons that are one word in the JSON
_WORDS = {"rate": "channel too slow", "method": "method cannot show it"}
# what changes so slowly that no channel is too slow for it
_SLOW = ("mass", "centre_of_gravity")
# excursions shorter than this are worth a line: it is long for a pull
_SHORT_SIGHT = 1.0


def not_assessed(summary: Dict, screen: Screen) -> list[str]:
    """Logs that failed, rules that could not be judged and why, stretches that were not seen."""
    names = titles(summary)
    lines: list[str] = []
    for recording in ordered(summary):
        if recording["status"] == "failed":
            lines += problem_lines(recording, "not read", screen)
    skipped: dict[str, list[str]] = {}
    for row in summary["skipped"]:
        skipped.setdefault(row["reason"], []).append(row["path"])
    for reason, paths in skipped.items():
        text = f"{count(len(paths), 'file')} skipped ({screen.safe(reason)}): {screen.listing(paths, _MOST_RULES)}"
        lines += screen.wrap(text, "  ", "    ")
    lines += _no_limits(summary, screen)
    never: Reasons = {}
    moot: Reasons = {}
    partly: list[str] = []
    for recording in ordered(summary):
        registered = recording["registration"] or ""
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
            # a recording of one row has no time in which a rule could apply or not
            timeless = not row["reasons"] and row["not_applicable_s"] == 0.0
            table = never if row["unassessed_s"] > 0.0 or timeless else moot
            reason = "there is no recorded time" if timeless else "no reason given"
            key = registered, ", ".join(map(_worded, row["reasons"])) or reason
            rules, logs = table.setdefault(key, ({}, {}))
            rules[title] = None
            logs[recording["path"]] = None
        partly += _partly(recording, some, screen)
    merged, shortened = _merged(moot, screen)
    for table, what in ((never, "not assessed at all"), (merged, "does not apply")):
        for (name, reason), (rules, logs) in table.items():
            where = screen.safe(name or "no registration") + (f" ({count(len(logs), 'log')})" if len(logs) > 1 else "")
            listed = count(len(rules), "rule") if reason in shortened else _rules(rules, screen)
            text = f"{where}: {what}: {listed}: {screen.safe(reason)}"
            lines += screen.wrap(text, "  ", "    ")
        if table is never:
            lines += partly
    lines += _short_sight(summary, screen)
    if not any(recording["assessment"] for recording in summary["recordings"]):
        lines += screen.wrap("no rule was applied to any log", "  ")
    if not lines:
        return ["", screen.heading("Not assessed"), "  nothing: every rule saw all of the recorded time"]
    return ["", screen.heading("Not assessed"), *lines]


def _partly(recording: Dict, some: dict[tuple[float, str], dict[str, None]], screen: Screen) -> list[str]:
    """The rules of a log that saw a part of it, most missed first; in a pipe each line stands for itself."""
    if not some:
        return []
    log = f"{owner(recording, screen)}, {screen.safe(recording['path'])}"
    whole = duration(recording["recorded_s"])
    lines = [] if screen.width is None else screen.wrap(f"{log}, {whole} recorded", "  ", "    ")
    for (missed, reasons), rules in sorted(some.items(), key=lambda item: -item[0][0]):
        said = f"not assessed ({screen.safe(reasons)}): {_rules(rules, screen)}"
        if screen.width is None:
            lines.append(f"  {log}: {duration(missed)} of {whole} {said}")
        else:
            lines += screen.wrap(f"{duration(missed)} {said}", "    ", "      ")
    return lines


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
        return _worded(reasons[0])
    return ", ".join(f"{_worded(row)} {duration(row['seconds'])}" for row in reasons) or "no reason given"


def _worded(row: Dict) -> str:
    return _WORDS.get(row["reason"], str(row["reason"]))


def _rules(rules: dict[str, None], screen: Screen) -> str:
    found = list(rules)
    return (f"{len(found)} rules: " if len(found) > 3 else "") + screen.listing(found, _MOST_RULES)


def _merged(moot: Reasons, screen: Screen) -> tuple[Reasons, set[str]]:
    """On a terminal, what an aircraft's file does not have in one row: `the aircraft file has no A, B and 5 more`.

    Gives the rows and those of their reasons that name what the rules want.
    """
    if screen.width is None:
        return moot, set()
    found: dict[tuple[str, str], tuple[dict[str, None], dict[str, None], list[str]]] = {}
    for (name, reason), (rules, logs) in moot.items():
        head, has, what = reason.partition(" has no ")
        row = found.setdefault((name, (head + has).rstrip()), ({}, {}, []))
        row[0].update(rules)
        row[1].update(logs)
        if what:
            row[2].append(what)
    merged: Reasons = {}
    shortened: set[str] = set()
    for (name, head), (rules, logs, items) in found.items():
        reason = f"{head} {screen.listing(items, _MOST_RULES)}" if items else head
        merged[name, reason] = rules, logs
        if items:
            shortened.add(reason)
    return merged, shortened


def _short_sight(summary: Dict, screen: Screen) -> list[str]:
    names = titles(summary)
    judged = {rule: quantity for row in summary["rules"] for rule, quantity in row["quantities"].items()}
    blind: dict[tuple[str, float, tuple[str, ...]], list[str]] = {}
    for recording in ordered(summary):
        rules: dict[float, dict[str, None]] = {}
        for row in recording["assessment"]:
            least = row["shortest_seen_s"]
            seen = row["flight"] is None and row["assessed_s"] > 0.0 and judged.get(row["rule"]) not in _SLOW
            if seen and least is not None and least >= _SHORT_SIGHT:
                rules.setdefault(least, {})[names.get(row["rule"], row["rule"])] = None
        for least, found in sorted(rules.items()):
            blind.setdefault((owner(recording, screen), least, tuple(found)), []).append(recording["path"])
    lines: list[str] = []
    for (name, least, titled), paths in blind.items():
        text = (
            f"{name}, {screen.listing(paths, 3)}: peaks of less than {duration(least)} cannot be sized:"
            f" {_rules(dict.fromkeys(titled), screen)}"
        )
        lines += screen.wrap(text, "  ", "    ")
    return lines
