"""Rules that add up: allowances of time, totals, and counts within an event, a flight or a window."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from exceed.core.findings import SEVERITIES, Event
from exceed.core.intervals import Array, Intervals, complement, normal
from exceed.judge.compiled import Allowance, Compiled
from exceed.judge.excursions import Index, Runs, enough_in_window, much_in_window
from exceed.judge.scan import RuleScan


def accumulate(
    rule: Compiled, events: list[Event], undecided: list[Event], scan: RuleScan
) -> tuple[list[Event], list[Event]]:
    """What is left of a rule's excursions once its allowance, total or count is applied."""
    if rule.allowed:
        return _allowed(rule, events, scan.beyond_lines()), undecided
    starts, ends = _spans(events)
    if rule.count is not None:
        least, _, window = rule.count
        groups = enough_in_window(starts, _flights(events), window, least)
        return [_as_one([events[i] for i in group], _counted(group, least)) for group in groups], []
    if rule.total is not None:
        seconds, _, window = rule.total
        groups = much_in_window(starts, ends, _flights(events), window, seconds)
        return [
            _as_one([events[i] for i in group], _totalled(ends[group] - starts[group], seconds)) for group in groups
        ], []
    return events, undecided


def _flights(events: list[Event]) -> Index:
    return np.array([event.flight or 0 for event in events], dtype=np.int64)


def _spans(events: list[Event]) -> tuple[Array, Array]:
    return np.array([event.start for event in events]), np.array([event.end for event in events])


def _counted(group: Index, least: int) -> str:
    return f"{len(group)} excursions; an event from {least} on"


def _totalled(durations: Array, seconds: float) -> str:
    return f"{float(np.sum(durations)):.1f} s in all; an event above {seconds:g} s"


def _as_one(group: list[Event], note: str) -> Event:
    """Several excursions as one event: the worst of them, over the whole stretch."""
    worst = max(group, key=lambda event: (SEVERITIES.index(event.severity), _beyond(event)))
    return replace(
        worst,
        start=group[0].start,
        end=group[-1].end,
        rows=(group[0].rows[0], group[-1].rows[1]),
        notes=(*worst.notes, note),
    )


def _beyond(event: Event) -> float:
    """How far the sample lies beyond the limit in force then."""
    return (event.peak.value - event.limit.value) * (-1.0 if event.side == "below" else 1.0)


def _allowed(rule: Compiled, events: list[Event], lines: list[Runs]) -> list[Event]:
    """Within every allowance an excursion is a near-limit note; the one that uses one up, and those after, are events.

    Several allowances nest: `up_to 107 % for 20 s, up_to 115 % for 5 s` is 20 s beyond the limit, of which 5 s beyond
    107 %. Beyond the furthest it is an event at once.
    """
    steps = sorted(rule.allowed, key=lambda step: step.share)
    drawn = [[_drawn(event, beyond, lines[-1]) for event in events] for beyond in lines[:-1]]
    over = [_overdrawn(step, events, draws) for step, draws in zip(steps, drawn, strict=True)]
    kept: list[Event] = []
    for number, event in enumerate(events):
        reached = _reached(rule, event)
        covering = [step for step in steps if _covers(rule, step, reached, event)]
        spent = next((step for step, used in zip(steps, over, strict=True) if number in used), None)
        if not covering:
            kept.append(replace(event, notes=(*event.notes, "beyond what is allowed for any time")))
        elif spent is not None:
            kept.append(replace(event, notes=(*event.notes, f"used up: {_words(rule, spent)}")))
        else:
            task = replace(event.task, wanted=False) if event.task is not None else None
            note = f"near limit, allowed: {_words(rule, covering[0])}"
            kept.append(
                replace(event, severity="advisory", limit_exceeded=False, task=task, notes=(*event.notes, note))
            )
    return kept


def _drawn(event: Event, beyond: Runs, furthest: Runs) -> Intervals:
    """The time that an excursion spent beyond a line, and not beyond the furthest one."""
    mine = (beyond.end >= event.start) & (beyond.start <= event.end)
    time = normal(beyond.start[mine], beyond.end[mine])
    return complement(normal(furthest.start, furthest.end), time)


def _reached(rule: Compiled, event: Event) -> float:
    values = [event.peak.value] if event.peak.estimate is None else [event.peak.value, event.peak.estimate]
    return max(rule.side * value for value in values) * rule.side


def _covers(rule: Compiled, step: Allowance, value: float, event: Event) -> bool:
    bound = step.share * event.limit.value if step.of_limit else step.share
    return rule.side * (value - bound) <= 1e-9 * max(1.0, abs(bound))


def _words(rule: Compiled, step: Allowance) -> str:
    if step.of_limit:
        bound = f"{100.0 * step.share:.4g} %"
    else:
        bound = f"{rule.quantity.unit.from_si(step.share):.{rule.quantity.decimals}f} {rule.quantity.shown}"
    span = (
        f"{step.window:g} s" if step.window is not None else ("one event" if step.within == "event" else "one flight")
    )
    return f"up to {bound} for {step.seconds:g} s within {span}"


def _overdrawn(step: Allowance, events: list[Event], drawn: list[Intervals]) -> set[int]:
    """Which events find this allowance used up: the one that does it and, while it stays so, those after."""
    over: set[int] = set()
    flights = _flights(events)
    for index, own in enumerate(drawn):
        if len(own) == 0:
            continue
        parts = [own]
        if step.within != "event":
            parts = [drawn[i] for i in range(index + 1) if flights[i] == flights[index]]
        starts = np.concatenate([part.start for part in parts])
        ends = np.concatenate([part.end for part in parts])
        if step.window is not None:
            # within a stretch the time in the window only grows, so its ends are enough
            used = any(
                float(np.sum(np.maximum(np.minimum(ends, at) - np.maximum(starts, at - step.window), 0.0)))
                > step.seconds
                for at in own.end
            )
        else:
            used = float(np.sum(ends - starts)) > step.seconds
        if used:
            over.add(index)
    return over
