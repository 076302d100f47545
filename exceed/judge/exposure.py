"""Rules that add up: allowances of time, totals, and counts within an event, a flight or a window."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np

from exceed.core.findings import SEVERITIES, Event
from exceed.core.intervals import Array
from exceed.judge.compiled import Allowance, Compiled
from exceed.judge.excursions import Index, group_by_window, used_up


def accumulate(rule: Compiled, events: list[Event], undecided: list[Event]) -> tuple[list[Event], list[Event]]:
    """What is left of a rule's excursions once its allowance, total or count is applied."""
    if rule.allowed:
        return _allowed(rule, events), undecided
    if rule.count is not None:
        least, _, window = rule.count
        return _grouped(events, window, lambda group: _counted(group, least)), []
    if rule.total is not None:
        seconds, _, longest = rule.total
        return _grouped(events, longest, lambda group: _totalled(group, seconds, longest)), []
    return events, undecided


def _flights(events: list[Event]) -> Index:
    return np.array([event.flight or 0 for event in events], dtype=np.int64)


def _spans(events: list[Event]) -> tuple[Array, Array]:
    return np.array([event.start for event in events]), np.array([event.end for event in events])


def _grouped(events: list[Event], window: float | None, make: Callable[[list[Event]], Event | None]) -> list[Event]:
    if not events:
        return []
    groups = group_by_window(_spans(events)[0], _flights(events), window)
    made = [make([events[index] for index in group]) for group in groups]
    return [event for event in made if event is not None]


def _counted(group: list[Event], least: int) -> Event | None:
    return _as_one(group, f"{len(group)} excursions; an event from {least} on") if len(group) >= least else None


def _totalled(group: list[Event], seconds: float, window: float | None) -> Event | None:
    starts, ends = _spans(group)
    if used_up(starts, ends, seconds, window) is None:
        return None
    return _as_one(group, f"{float(np.sum(ends - starts)):.1f} s in all; an event above {seconds:g} s")


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


def _allowed(rule: Compiled, events: list[Event]) -> list[Event]:
    """Within every allowance an excursion is a near-limit note; the one that uses it up, and those after, are events.

    Several allowances nest: an excursion draws on every one whose `up_to` it does not exceed, and beyond the furthest
    it is an event at once.
    """
    steps = sorted(rule.allowed, key=lambda step: step.share)
    reached = [_reached(rule, event) for event in events]
    over = [
        _overdrawn(
            step, events, [_covers(rule, step, value, event) for value, event in zip(reached, events, strict=True)]
        )
        for step in steps
    ]
    kept: list[Event] = []
    for number, event in enumerate(events):
        covering = [step for step in steps if _covers(rule, step, reached[number], event)]
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


def _overdrawn(step: Allowance, events: list[Event], draws: list[bool]) -> set[int]:
    """Which events find this allowance used up: the one that does it and, while it stays so, those after."""
    drawing = [index for index, draw in enumerate(draws) if draw]
    if step.within == "event":
        return {index for index in drawing if events[index].duration > step.seconds}
    over: set[int] = set()
    flights = _flights(events)
    for number in np.unique(flights):
        members = [index for index in drawing if flights[index] == number]
        starts, ends = _spans([events[index] for index in members])
        for last in range(len(members)):
            first = 0
            if step.window is not None:
                first = int(np.searchsorted(ends[: last + 1], ends[last] - step.window, side="right"))
            if used_up(starts[first : last + 1], ends[first : last + 1], step.seconds, step.window) is not None:
                over.add(members[last])
    return over
