"""Stretches beyond a level become events: sized, dated, with how surely each level was passed."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from exceed.core.findings import Event, Level, LimitValue
from exceed.core.intervals import Array
from exceed.core.trace import Grid, Trace
from exceed.judge import certainty
from exceed.judge.block import Block
from exceed.judge.compiled import Compiled
from exceed.judge.excursions import CUTS, Runs, joined, released
from exceed.judge.remarks import beyond_rows, by_margin_only, capped, larger_elsewhere
from exceed.judge.scan import RuleScan, slowest_seeing
from exceed.judge.sizing import (
    AROUND,
    Sized,
    Strip,
    duration_uncertainty,
    estimated_span,
    hides_nothing,
    size,
    with_cell,
)
from exceed.judge.stalls import sign_of_stall

Index = NDArray[np.int64]

# what stands in an event's context, as far as known
CONTEXT: tuple[str, ...] = (
    "indicated_airspeed",
    "calibrated_airspeed",
    "mach",
    "pressure_altitude",
    "height_above_ground",
    "height_above_aerodrome",
    "load_factor",
    "bank_angle",
    "roll_rate",
    "flap_angle",
    "gear_down",
    "airbrakes_out",
    "mass",
    "centre_of_gravity",
    "static_air_temperature",
    "stall_margin",
)
# a sample so few intervals from an event is its shoulder
SHOULDER = 2.5
# undecided ones closer together than this are one question, s
ONE_QUESTION = 1.0


@dataclass(frozen=True, slots=True)
class Stretch:
    """One event in the making: from crossing to crossing, first and last sample beyond (grid places), what cut it.

    sampled : False where no sample is beyond a level and the event, if it is one, comes from between samples.
    """

    start: float
    end: float
    first: int
    last: int
    cut: str | None
    sampled: bool = True


def build_events(
    rule: Compiled,
    trace: Trace,
    grid: Grid,
    scan: RuleScan,
    context: list[str],
    fixed: Mapping[str, float] | None = None,
) -> tuple[list[Event], list[Event]]:
    """(events, undecided) of one rule in one trace, each in order of time."""
    runs = [scan.runs(index) for index in range(len(rule.levels))]
    breaks = np.unique(np.concatenate(scan.breaks)) if scan.breaks else np.empty(0, np.int64)
    whole = joined(released(runs[0], scan.release_band(), breaks), rule.joining, breaks)
    places = np.unique(np.concatenate(scan.candidates)) if scan.candidates else np.empty(0, np.int64)
    stretches = [_stretch(rule, whole, index) for index in range(len(whole))]
    stretches += _hidden(places, whole, grid, rule.joining)
    if not stretches:
        return [], []
    events: list[Event] = []
    between: list[Event] = []  # those of which no sample is beyond a level
    undecided: list[Event] = []
    well_sampled = hides_nothing(rule, trace, grid)
    for stretch, (event, sized, lasted) in zip(
        stretches, _all(rule, trace, grid, stretches, runs, context, fixed), strict=True
    ):
        if event is None or sized is None:
            continue
        if well_sampled and not stretch.sampled and not (sized.peak and sized.peak.saturated):
            continue
        kind, kept = _sorted(rule, stretch, event, sized, lasted)
        if kind == "event":
            (events if stretch.sampled else between).append(kept)
            question = _open_question(rule, kept, sized, lasted)
            if question is not None:
                undecided.append(question)
        elif kind == "undecided" and not _unassessed(rule, grid, stretch.first):
            undecided.append(kept)
    events += _one_a_place(between, rule.joining)
    return _one_a_place(events, 0.0), _one_a_place(undecided, max(rule.joining, ONE_QUESTION))


def _unassessed(rule: Compiled, grid: Grid, place: int) -> bool:
    """Whether the channel is too slow there for what the rule must see: nothing was cleared, nothing is left open."""
    if rule.must_see is None:
        return False
    around = grid.time[max(place - 1, 0) : place + 2]
    return len(around) > 1 and float(np.max(np.diff(around))) > slowest_seeing(rule.must_see)


def _stretch(rule: Compiled, runs: Runs, index: int) -> Stretch:
    cuts = [] if rule.quantity.momentary else [int(runs.cut_start[index]), int(runs.cut_end[index])]
    cut = CUTS[min((code for code in cuts if code), default=0)]
    start, end = float(runs.start[index]), float(runs.end[index])
    return Stretch(start, end, int(runs.first[index]), int(runs.last[index]), cut)


def _hidden(places: Index, whole: Runs, grid: Grid, joining: float) -> list[Stretch]:
    """Candidates that lie in no stretch of the lowest level, nor so near to one that they would be joined to it."""
    if len(places) and len(whole):
        near = max(joining, SHOULDER * grid.interval)
        time = grid.time[places]
        home = np.searchsorted(whole.first, places, side="right") - 1
        before = (home >= 0) & (time - whole.end[np.maximum(home, 0)] <= near)
        following = np.minimum(home + 1, len(whole) - 1)
        after = (home + 1 < len(whole)) & (whole.start[following] - time <= near)
        places = places[~before & ~after]
    return [
        Stretch(float(grid.time[place]), float(grid.time[place]), int(place), int(place), None, sampled=False)
        for place in places
    ]


def _all(
    rule: Compiled,
    trace: Trace,
    grid: Grid,
    stretches: list[Stretch],
    runs: list[Runs],
    context: list[str],
    fixed: Mapping[str, float] | None,
) -> list[tuple[Event | None, Sized | None, float]]:
    """Every stretch worked out; values, limits, uncertainties and context are had in one go for all of them."""
    count = len(grid.time)
    patches = [(max(item.first - AROUND, 0), min(item.last + AROUND + 1, count)) for item in stretches]
    block = Block.patched(trace, grid, patches, sorted(rule.names), fixed)
    value = np.broadcast_to(rule.value.of(block), (len(block),))
    bound = rule.limit.of(block) if rule.limit is not None else rule.levels[rule.decision].value
    limit = np.broadcast_to(bound, (len(block),))
    live = np.isfinite(value) & ~np.isnan(limit)
    if rule.condition is not None:
        holds, known = rule.condition.of(block)
        live = live & holds & known
    furthest = np.where(live, rule.side * (value - rule.threshold(rule.levels[rule.decision], limit)), -np.inf)
    begins = np.concatenate([[0], np.cumsum([stop - start for start, stop in patches])]).tolist()
    strips, at = [], []
    for index, item in enumerate(stretches):
        shift = begins[index] - patches[index][0]
        inside = slice(item.first + shift, item.last + shift + 1)
        strips.append(Strip(block, value, limit, live, slice(begins[index], begins[index + 1]), inside))
        at.append(inside.start + int(np.argmax(furthest[inside])))
    places = np.array([at[i] - begins[i] + patches[i][0] for i in range(len(stretches))], dtype=np.int64)
    uncertainty = _uncertainty(rule, trace, grid, places)
    around = trace.evaluate_at(context, grid, places, fixed) if context else {}
    made: list[tuple[Event | None, Sized | None, float]] = []
    for index, item in enumerate(stretches):
        if not live[at[index]]:
            made.append((None, None, 0.0))
            continue
        known_here = {name: float(values[index]) for name, values in around.items() if np.isfinite(values[index])}
        sized = size(rule, trace, grid, strips[index], at[index], float(uncertainty[index]), item.sampled)
        made.append(
            (
                _event(
                    rule,
                    trace,
                    grid,
                    item,
                    runs,
                    strips[index],
                    at[index],
                    int(places[index]),
                    sized,
                    known_here,
                    fixed,
                ),
                sized,
                _lasted(rule, trace, item, strips[index], at[index], float(uncertainty[index])),
            )
        )
    return made


def _uncertainty(rule: Compiled, trace: Trace, grid: Grid, places: Index) -> Array:
    """(k,) standard uncertainty of the judged value, and of a limit that is itself derived, at places."""
    name = rule.judged.removeprefix("rate_of:")
    if rule.discrete or not trace.has(name):
        return np.zeros(len(places))
    if rule.judged.startswith("rate_of:"):
        noises = [trace.channels[leaf].noise or 0.0 for leaf in trace.leaves([name], main_only=True)]
        return np.full(len(places), max(noises, default=0.0) / (np.sqrt(2.0) * max(grid.interval, 1e-9)))
    own = trace.uncertainty_at(name, grid, places)
    for other in rule.grid_names:
        if other != name and trace.has(other):
            own = np.hypot(own, trace.uncertainty_at(other, grid, places))
    return own


def _lasted(rule: Compiled, trace: Trace, item: Stretch, strip: Strip, at: int, uncertainty: float) -> float:
    """P(the excursion lasted as long as the rule asks)."""
    if rule.lasting <= 0.0:
        return 1.0
    threshold = float(np.asarray(rule.threshold(rule.levels[0], float(strip.limit[at]))))
    spread = 0.0 if rule.discrete else duration_uncertainty(rule, trace, strip, threshold, uncertainty)
    return certainty.probability_lasting(item.end - item.start, spread, rule.lasting)


def _event(
    rule: Compiled,
    trace: Trace,
    grid: Grid,
    item: Stretch,
    runs: list[Runs],
    strip: Strip,
    at: int,
    place: int,
    sized: Sized,
    context: dict[str, float],
    fixed: Mapping[str, float] | None = None,
) -> Event:
    bound = float(strip.limit[at])
    at_most_possible, sign = capped(rule, trace), None
    if at_most_possible and by_margin_only(rule, trace):
        sign = sign_of_stall(trace, grid, item.first, item.last, fixed)
        at_most_possible = sign is None
    levels = []
    for index, level in enumerate(rule.levels):
        threshold = float(np.asarray(rule.threshold(level, bound)))
        chance = certainty.cap_at_possible(sized.chances[index]) if at_most_possible else sized.chances[index]
        inside = _inside(runs[index], item)
        start, end, beyond = _when(inside)
        if start is None and sized.peak is not None and level.lasting <= 0.0:
            span = estimated_span(rule, strip, at, sized.peak, threshold)
            if span is not None:
                start, end, beyond = span[0], span[1], span[1] - span[0]
        if level.lasting > 0.0 and (len(inside) == 0 or float(np.max(inside.duration)) < level.lasting):
            start, end, chance = None, None, 0.0
        levels.append(Level(level.severity, threshold, start, end, beyond, chance))
    notes = [*rule.notes, *sized.notes]
    if sign is not None:
        notes.append(f"more than the margin shows it: {sign}")
    notes += [note for note in (beyond_rows(rule, strip, context), larger_elsewhere(rule, strip, at)) if note]
    when = sized.value.time
    row = grid.axis_row(place)
    return Event(
        rule=rule.id,
        title=rule.title,
        quantity=rule.judged,
        side=rule.side_word,
        severity=rule.levels[0].severity,
        limit_exceeded=False,
        certainty="doubtful",
        probability=0.0,
        flight=trace.track.number_at(when),
        phase=trace.track.phases.name_at(when),
        start=item.start,
        end=item.end,
        peak=with_cell(rule, trace, row, sized.value),
        limit=LimitValue(bound, rule.limit_source, rule.limit_assumed),
        levels=tuple(levels),
        rows=(grid.axis_row(item.first), grid.axis_row(item.last)),
        row=row,
        context=context,
        cut_by=item.cut,
        notes=tuple(notes),
        set_name=rule.set_name,
    )


def _inside(runs: Runs, item: Stretch) -> Runs:
    if not item.sampled or len(runs) == 0:
        return runs.pick(slice(0, 0))
    return runs.pick((runs.first >= item.first) & (runs.last <= item.last))


def _when(runs: Runs) -> tuple[float | None, float | None, float]:
    if len(runs) == 0:
        return None, None, 0.0
    return float(runs.start[0]), float(runs.end[-1]), float(np.sum(runs.duration))


def _open_question(rule: Compiled, event: Event, sized: Sized, lasted: float) -> Event | None:
    """An event that is only near the limit may truly have passed it, between samples: that stays to be decided."""
    decision = rule.decision
    crossed = [index for index, level in enumerate(event.levels) if level.start is not None]
    if not crossed or crossed[-1] >= decision or sized.peak is None:
        return None
    level = event.levels[decision]
    if level.probability < certainty.POSSIBLE or not certainty.is_undecided(sized.peak, level.limit):
        return None
    return _finished(rule, event, crossed, decision, lasted)


def _sorted(rule: Compiled, stretch: Stretch, event: Event, sized: Sized, lasted: float) -> tuple[str | None, Event]:
    """'event', 'undecided' or None, and the event with its severity, certainty, dates and task."""
    crossed = [index for index, level in enumerate(event.levels) if level.start is not None]
    if crossed and lasted >= 0.5:
        return "event", _finished(rule, event, crossed, crossed[-1], lasted)
    if crossed:
        finished = _finished(rule, event, crossed, crossed[-1], lasted)
        return ("undecided" if finished.probability >= certainty.POSSIBLE else None), finished
    if stretch.sampled or sized.peak is None:
        return None, event
    level = event.levels[rule.decision]
    if not certainty.is_undecided(sized.peak, level.limit) or (lasted < 1.0 and level.probability * lasted < 0.05):
        return None, event
    return "undecided", _finished(rule, event, crossed, rule.decision, lasted)


def _finished(rule: Compiled, event: Event, crossed: list[int], top: int, lasted: float) -> Event:
    chance = event.levels[top].probability * lasted
    word = certainty.certainty_word(chance)
    severity = event.levels[top].severity
    reached = [event.levels[index] for index in sorted({*(step for step in crossed if step <= top), top})]
    steps = [(level.severity, certainty.certainty_word(level.probability * lasted)) for level in reached]
    start, end = event.start, event.end
    if crossed and event.levels[crossed[0]].start is not None:
        lowest = event.levels[crossed[0]]
        start, end = lowest.start or 0.0, lowest.end or 0.0
    return replace(
        event,
        severity=severity,
        limit_exceeded=_exceeded(rule, event),
        probability=chance,
        certainty=word,
        start=start,
        end=end,
        task=rule.task.of(steps) if rule.task is not None else None,
    )


def _exceeded(rule: Compiled, event: Event) -> bool:
    """Beyond the limit itself, not just near it."""
    if rule.discrete:
        return True
    values = [event.peak.value] if event.peak.estimate is None else [event.peak.value, event.peak.estimate]
    slack = 1e-9 * max(1.0, abs(event.limit.value))
    return any(rule.side * (value - event.limit.value) > slack for value in values)


def _one_a_place(events: list[Event], gap: float) -> list[Event]:
    """In order of time; of those closer together than `gap` s, or of overlapping ones, only the likeliest stays."""
    kept: list[Event] = []
    for event in sorted(events, key=lambda item: (item.start, item.end)):
        near = kept and event.flight == kept[-1].flight and event.start - kept[-1].end < gap
        if not near:
            kept.append(event)
        elif event.probability > kept[-1].probability:
            kept[-1] = event
    return kept


__all__ = ["CONTEXT", "build_events"]
