"""Judge a trace by ready-made rules: scan once, build events, account for every second."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from exceed.core.findings import SEVERITIES, Coverage, Event, Findings
from exceed.core.quantities import QUANTITIES
from exceed.core.trace import Grid, Trace
from exceed.judge import certainty
from exceed.judge.block import SIZE
from exceed.judge.compiled import Compiled
from exceed.judge.coverage import coverage_rows, extreme_rows, least_assessed, rejected_rows
from exceed.judge.events import CONTEXT, build_events
from exceed.judge.exposure import accumulate
from exceed.judge.scan import ExtremeScan, RuleScan, scan_grid

# a typical uncertainty is the median at so many samples spread over the log
SPREAD = 5
Spans = Mapping[str, tuple[float, float]]


def judge(trace: Trace, rules: list[Compiled], extremes: list[str], *, size: int = SIZE, threads: int = 1) -> Findings:
    """Events, undecided stretches, coverage and extremes of one trace.

    rules : ready-made, also those that cannot be assessed. extremes : quantities whose extremes are wanted.
    size : samples a block; threads : blocks worked on at a time. Neither changes the findings.
    """
    ready = {index: rule for index, rule in enumerate(rules) if rule.unassessed is None and rule.not_applicable is None}
    scans, most = _scan_all(trace, ready, extremes, size, threads)
    context = [name for name in CONTEXT if trace.has(name)]
    # what is only known as a range is judged at its other end too, all rules that rest on it in one more pass
    low = {name: span[0] for name, span in trace.spans.items()}
    open_rules = {index: rule for index, rule in ready.items() if _rests_on(trace, rule, low)}
    others, _ = _scan_all(trace, open_rules, [], size, threads, low) if open_rules else ({}, None)
    events: list[Event] = []
    undecided: list[Event] = []
    for index, rule in ready.items():
        grid = trace.grid(rule.grid_names)
        found, maybe = build_events(rule, trace, grid, scans[index], context)
        if index in others:
            light = build_events(rule, trace, grid, others[index], context, low)
            found, maybe = _both_ends((found, maybe), light, trace.spans)
        found, maybe = accumulate(rule, found, maybe, scans[index])
        events += found
        undecided += maybe
    near: dict[str, float] = {}
    for index, rule in ready.items():
        if scans[index].near > 0.0:
            near[rule.id] = near.get(rule.id, 0.0) + scans[index].near
    return Findings(
        events=tuple(sorted(events, key=_place)),
        undecided=tuple(sorted(undecided, key=_place)),
        coverage=tuple(_coverage(trace, rules, scans)),
        extremes=extreme_rows(trace, rules, scans, most),
        rejected=rejected_rows(trace, list(ready.values())),
        within_sensor_error=tuple(sorted(near.items())),
    )


def _place(event: Event) -> tuple[float, str, str, str]:
    return event.start, event.rule, event.quantity, event.side


def _coverage(trace: Trace, rules: list[Compiled], scans: Mapping[int, RuleScan]) -> list[Coverage]:
    by_rule: dict[str, list[list[Coverage]]] = {}
    for index, rule in enumerate(rules):
        by_rule.setdefault(rule.id, []).append(coverage_rows(trace, rule, scans.get(index)))
    return [row for rows in by_rule.values() for row in least_assessed(rows)]


def _scan_all(
    trace: Trace,
    rules: Mapping[int, Compiled],
    extremes: list[str],
    size: int,
    threads: int,
    fixed: Mapping[str, float] | None = None,
) -> tuple[dict[int, RuleScan], ExtremeScan]:
    """Each rule scanned on its own grid; rules of one grid share the pass."""
    groups: dict[int, tuple[Grid, list[int], list[str]]] = {}
    for index, rule in rules.items():
        grid = trace.grid(rule.grid_names)
        groups.setdefault(id(grid), (grid, [], []))[1].append(index)
    for name in extremes:
        grid = trace.grid([name])
        groups.setdefault(id(grid), (grid, [], []))[2].append(name)
    scans: dict[int, RuleScan] = {}
    most = ExtremeScan()
    for grid, members, names in groups.values():
        own = [rules[index] for index in members]
        typical = {} if fixed else _typical_uncertainty(trace, grid, sorted({rule.judged for rule in own}))
        found, extreme = scan_grid(trace, grid, own, names, typical, fixed, size, threads)
        scans.update(zip(members, found, strict=True))
        most.add(extreme)
    return scans, most


def _typical_uncertainty(trace: Trace, grid: Grid, names: list[str]) -> dict[str, float]:
    count = len(grid.time)
    if count == 0:
        return {}
    places = np.unique(np.linspace(0, count - 1, SPREAD + 2).astype(np.int64)[1:-1])
    return {
        name: float(np.median(trace.uncertainty_at(name, grid, places)))
        for name in names
        if trace.has(name) and not (name in QUANTITIES and QUANTITIES[name].discrete)
    }


def _rests_on(trace: Trace, rule: Compiled, names: Mapping[str, float]) -> bool:
    """Whether a rule's value, limit or condition rests on one of these quantities."""
    return bool(names) and not names.keys().isdisjoint(trace.closure([name for name in rule.names if trace.has(name)]))


def _both_ends(
    heavy: tuple[list[Event], list[Event]], light: tuple[list[Event], list[Event]], spans: Spans
) -> tuple[list[Event], list[Event]]:
    """The verdicts (events, undecided) at the high and at the low end of what is only known as a range.

    Where they agree the event stands; where they differ both are given and it is at most `possible`.
    """
    low, high = _end_words(spans)
    kept: list[Event] = []
    used: set[int] = set()
    for event in heavy[0]:
        match = next((i for i, one in enumerate(light[0]) if i not in used and _overlap(one, event)), None)
        if match is None:
            kept.append(_differing(event, f"{high}: {event.severity}; {low}: none"))
            continue
        used.add(match)
        one = light[0][match]
        if one.severity == event.severity:
            chance = min(one.probability, event.probability)
            kept.append(replace(event, probability=chance, certainty=certainty.certainty_word(chance)))
        else:
            worse = max((event, one), key=lambda item: SEVERITIES.index(item.severity))
            kept.append(_differing(worse, f"{high}: {event.severity}; {low}: {one.severity}"))
    kept += [
        _differing(one, f"{low}: {one.severity}; {high}: none")
        for index, one in enumerate(light[0])
        if index not in used
    ]
    maybe = [one for one in heavy[1] if not any(_overlap(one, event) for event in kept)]
    more = [one for one in light[1] if not any(_overlap(one, event) for event in (*maybe, *kept))]
    return kept, [*maybe, *(_differing(one, f"{low}: undecided; {high}: none") for one in more)]


def _end_words(spans: Spans) -> tuple[str, str]:
    def words(end: int) -> str:
        shown = []
        for name, span in sorted(spans.items()):
            row = QUANTITIES[name]
            shown.append(f"{name.replace('_', ' ')} {row.unit.from_si(span[end]):.{row.decimals}f} {row.shown}")
        return "at " + ", ".join(shown)

    return words(0), words(1)


def _overlap(one: Event, other: Event) -> bool:
    return one.rows[0] <= other.rows[1] and other.rows[0] <= one.rows[1]


def _differing(event: Event, words: str) -> Event:
    chance = certainty.cap_at_possible(event.probability)
    levels = tuple(replace(level, probability=certainty.cap_at_possible(level.probability)) for level in event.levels)
    return replace(
        event,
        probability=chance,
        certainty=certainty.certainty_word(chance),
        levels=levels,
        notes=(*event.notes, f"the verdict depends on what is not known: {words}"),
    )


__all__ = ["judge"]
