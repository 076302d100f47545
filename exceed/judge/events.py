"""Stretches beyond a level become events: sized, dated, with how surely each level was passed."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from exceed.core.findings import CERTAINTIES, Event, Level, LimitValue, PeakValue
from exceed.core.intervals import Array
from exceed.core.trace import Grid, Trace
from exceed.judge import certainty
from exceed.judge.block import Block
from exceed.judge.compiled import Compiled
from exceed.judge.excursions import CUTS, Runs, joined, parts, released
from exceed.judge.scan import RuleScan

Index = NDArray[np.int64]

# samples on either side of an extreme that its sizing looks at
AROUND = 12
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


@dataclass(frozen=True, slots=True, eq=False)
class Stretch:
    """One event in the making: its stretch of samples, the runs of each level in it, and how surely it lasted."""

    start: float
    end: float
    first: int
    last: int
    cut: str | None
    sampled: bool  # False: no sample is beyond, the event comes from between samples
    lasted: float = 1.0  # probability that it lasted as long as the rule asks


def build_events(
    rule: Compiled,
    trace: Trace,
    grid: Grid,
    scan: RuleScan,
    context: list[str],
    fixed: Mapping[str, float] | None = None,
) -> tuple[list[Event], list[Event]]:
    """(events, undecided) of one rule in one trace."""
    level_runs = [scan.runs(index) for index in range(len(rule.levels))]
    breaks = np.unique(np.concatenate(scan.breaks)) if scan.breaks else np.empty(0, np.int64)
    whole = joined(released(level_runs[0], scan.release_band()), rule.joining, breaks)
    stretches = [_stretch(whole, index) for index in range(len(whole))]
    places = np.unique(np.concatenate(scan.candidates)) if scan.candidates else np.empty(0, np.int64)
    stretches += _hidden(places, whole, grid)
    if not stretches:
        return [], []
    sized = _size_all(rule, trace, grid, stretches, level_runs, context, fixed)
    events: list[Event] = []
    undecided: list[Event] = []
    for stretch, event in zip(stretches, sized, strict=True):
        if event is None:
            continue
        kind, kept = _sort(rule, stretch, event)
        if kind == "event":
            events.append(kept)
        elif kind == "undecided":
            undecided.append(kept)
    undecided = _one_a_place(undecided, max(rule.joining, 1.0))
    return sorted(events, key=lambda event: event.start), undecided


def _stretch(runs: Runs, index: int) -> Stretch:
    cuts = [int(runs.cut_start[index]), int(runs.cut_end[index])]
    cut = CUTS[min((code for code in cuts if code), default=0)]
    return Stretch(
        float(runs.start[index]),
        float(runs.end[index]),
        int(runs.first[index]),
        int(runs.last[index]),
        cut,
        sampled=True,
    )


def _hidden(places: Index, whole: Runs, grid: Grid) -> list[Stretch]:
    """Candidates that lie in no stretch of the lowest level, nor at the shoulder of one."""
    if len(places) == 0:
        return []
    if len(whole):
        home = np.searchsorted(whole.first, places, side="right") - 1
        before = (home >= 0) & (places <= whole.last[np.maximum(home, 0)] + 2)
        after = (home + 1 < len(whole)) & (places >= whole.first[np.minimum(home + 1, len(whole) - 1)] - 2)
        places = places[~before & ~after]
    return [
        Stretch(float(grid.time[place]), float(grid.time[place]), int(place), int(place), None, sampled=False)
        for place in places
    ]


def _size_all(
    rule: Compiled,
    trace: Trace,
    grid: Grid,
    stretches: list[Stretch],
    level_runs: list[Runs],
    context: list[str],
    fixed: Mapping[str, float] | None,
) -> list[Event | None]:
    whole = len(grid.time)
    patches = [(max(item.first - AROUND, 0), min(item.last + AROUND + 1, whole)) for item in stretches]
    block = Block.patched(trace, grid, patches, sorted(rule.names), fixed)
    value = np.broadcast_to(rule.value.of(block), (len(block),))
    limit = np.broadcast_to(_limit(rule, block), (len(block),))
    live = np.isfinite(value) & ~np.isnan(limit)
    if rule.condition is not None:
        holds, known = rule.condition.of(block)
        live = live & holds & known
    where = np.concatenate([[0], np.cumsum([stop - start for start, stop in patches])])
    worst = np.empty(len(stretches), dtype=np.int64)
    found = np.zeros(len(stretches), dtype=bool)
    decision = rule.levels[rule.decision]
    beyond = np.where(live, rule.side * (value - rule.threshold(decision, limit)), -np.inf)
    for index, (item, patch) in enumerate(zip(stretches, patches, strict=True)):
        low = int(where[index]) + item.first - patch[0]
        high = int(where[index]) + item.last - patch[0] + 1
        worst[index] = low + int(np.argmax(beyond[low:high]))
        found[index] = bool(live[worst[index]])
    places = np.array(
        [patch[0] + worst[index] - where[index] for index, patch in enumerate(patches)], dtype=np.int64
    )
    uncertainty = _uncertainty(rule, trace, grid, places)
    around = trace.evaluate_at(context, grid, places, fixed) if context else {}
    events: list[Event | None] = []
    for index, item in enumerate(stretches):
        if not found[index]:
            events.append(None)
            continue
        low, high = int(where[index]), int(where[index + 1])
        events.append(
            _event(
                rule, trace, grid, item, level_runs, block, value, limit, live, slice(low, high), int(worst[index]),
                int(places[index]), float(uncertainty[index]),
                {name: float(values[index]) for name, values in around.items() if np.isfinite(values[index])},
            )
        )  # fmt: skip
    return events


def _limit(rule: Compiled, block: Block) -> Array | float:
    if rule.limit is not None:
        return rule.limit.of(block)
    return rule.levels[rule.decision].value


def _uncertainty(rule: Compiled, trace: Trace, grid: Grid, places: Index) -> Array:
    """(k,) standard uncertainty of the judged value (and of a limit that is itself derived) at places."""
    name = rule.judged.removeprefix("rate_of:")
    if not trace.has(name) or rule.discrete:
        return np.zeros(len(places))
    own = trace.uncertainty_at(name, grid, places)
    if rule.judged.startswith("rate_of:"):
        noise = next((trace.channels[leaf].noise for leaf in sorted(trace.leaves([name]))), None) or 0.0
        return np.full(len(places), noise / (np.sqrt(2.0) * max(grid.interval, 1e-9)))
    for other in rule.grid_names:
        if other != rule.judged and trace.has(other):
            own = np.hypot(own, trace.uncertainty_at(other, grid, places))
    return own


def _event(
    rule: Compiled,
    trace: Trace,
    grid: Grid,
    item: Stretch,
    level_runs: list[Runs],
    block: Block,
    value: Array,
    limit: Array,
    live: NDArray[np.bool_],
    patch: slice,
    at: int,
    place: int,
    uncertainty: float,
    context: dict[str, float],
) -> Event:
    here, bound = float(value[at]), float(limit[at])
    thresholds = [float(np.asarray(rule.threshold(level, bound))) for level in rule.levels]
    notes: list[str] = list(rule.notes)
    peak: certainty.Peak | None = None
    if rule.judge_on == "estimate" and not rule.discrete:
        window, centre = _window(block, live, patch, at)
        channel = trace.channels.get(_main_channel(trace, rule))
        ends = (None, None) if channel is None or rule.magnitude else channel.saturation
        peak = certainty.size_peak(
            block.time[window],
            value[window],
            rule.side,
            centre,
            standard_uncertainty=uncertainty,
            interval=grid.interval,
            resolution=channel.resolution if channel is not None and channel.quantity == rule.judged else 0.0,
            noise=channel.noise if channel is not None and channel.quantity == rule.judged else None,
            saturation=ends[1] if rule.side > 0 else ends[0],
        )
        chances = [certainty.probability_beyond(peak, threshold) for threshold in thresholds]
        if not peak.sized:
            notes.append("not sized: the channel is too slow for the peak between its samples")
        if peak.saturated:
            notes.append("the sensor was at the end of its range: at least this much")
        peak_value = PeakValue(
            time=peak.time if not item.sampled else float(block.time[at]),
            value=here,
            estimate=peak.estimate,
            low=peak.low,
            high=peak.high,
            sized=peak.sized,
            saturated=peak.saturated,
        )
        estimate = peak.estimate
    elif rule.discrete:
        peak_value = PeakValue(time=item.start, value=here)
        chances = [1.0 if item.sampled else 0.0] * len(thresholds)
        estimate = here
    else:
        chances = [certainty.beyond_by_sensor(rule.side * (here - threshold), uncertainty) for threshold in thresholds]
        half = 1.96 * uncertainty
        peak_value = PeakValue(time=float(block.time[at]), value=here, estimate=here, low=here - half, high=here + half)
        estimate = here
    peak_value = _with_cell(rule, trace, grid, place, peak_value)
    cap = _cap(rule, trace)
    if cap:
        chances = [certainty.capped(chance, cap) for chance in chances]
    levels = []
    for index, level in enumerate(rule.levels):
        inside = _inside(level_runs[index], item)
        start, end, total = _when(inside)
        if start is None and rule.side * (estimate - thresholds[index]) > 0.0 and peak is not None:
            found = certainty.curve_beyond(
                block.time[_window(block, live, patch, at)[0]], value[_window(block, live, patch, at)[0]], rule.side,
                thresholds[index], _window(block, live, patch, at)[1], estimate,
            )  # fmt: skip
            if found is not None:
                start, end, total = found[0], found[1], found[1] - found[0]
        if level.lasting > 0.0 and (len(inside) == 0 or float(np.max(inside.duration)) < level.lasting):
            start, end = None, None
            chances[index] = 0.0
        levels.append(Level(level.severity, thresholds[index], start, end, total, chances[index]))
    larger = _larger_elsewhere(rule, value, live, item, patch, at, place)
    if larger:
        notes.append(larger)
    when = peak_value.time
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
        peak=peak_value,
        limit=LimitValue(bound, rule.limit_source, rule.limit_assumed),
        levels=tuple(levels),
        rows=(grid.axis_row(item.first), grid.axis_row(item.last)),
        row=grid.axis_row(place),
        context=context,
        cut_by=item.cut,
        notes=tuple(notes),
        set_name=rule.set_name,
    )


def _window(block: Block, live: NDArray[np.bool_], patch: slice, at: int) -> tuple[slice, int]:
    """The samples about an extreme that hang together, and the extreme's place among them."""
    low = at
    while low > patch.start and at - low < AROUND and block.linked[low - 1] and np.isfinite(block.time[low - 1]):
        if not live[low - 1]:
            break
        low -= 1
    high = at + 1
    while high < patch.stop and high - at <= AROUND and block.linked[high - 1] and live[high]:
        high += 1
    return slice(low, high), at - low


def _main_channel(trace: Trace, rule: Compiled) -> str:
    """The channel whose samples the judged value is, or '' where it is made of several."""
    name = rule.judged.removeprefix("rate_of:")
    if not trace.has(name):
        return ""
    leaves = trace.leaves([name], main_only=True)
    return next(iter(leaves)) if len(leaves) == 1 else ""


def _with_cell(rule: Compiled, trace: Trace, grid: Grid, place: int, peak: PeakValue) -> PeakValue:
    """The cell as written, where the judged quantity is itself recorded."""
    channel = trace.channels.get(rule.judged)
    if channel is None or not channel.column or rule.judged not in trace.leaves([rule.judged], main_only=True):
        return peak
    row = grid.axis_row(place)
    if channel.rows is None:
        index = row
    else:
        index = int(np.searchsorted(channel.rows, row))
        if index >= len(channel.rows) or channel.rows[index] != row:
            return peak
    value = float(channel.values[index])
    if not np.isfinite(value):
        return peak
    return replace(peak, recorded=channel.cell(value), recorded_unit=channel.unit)


def _cap(rule: Compiled, trace: Trace) -> str | None:
    """The lowest cap of the rule and of the methods beneath its value."""
    caps = [rule.cap] if rule.cap else []
    names = [name for name in (rule.judged.removeprefix("rate_of:"), *rule.grid_names) if trace.has(name)]
    caps += [step.cap for name in trace.closure(names) if (step := trace.steps[name]).cap]
    return min(caps, key=CERTAINTIES.index) if caps else None


def _inside(runs: Runs, item: Stretch) -> Runs:
    if not item.sampled or len(runs) == 0:
        return runs.pick(slice(0, 0))
    return runs.pick((runs.first >= item.first) & (runs.last <= item.last))


def _when(runs: Runs) -> tuple[float | None, float | None, float]:
    if len(runs) == 0:
        return None, None, 0.0
    return float(runs.start[0]), float(runs.end[-1]), float(np.sum(runs.duration))


def _larger_elsewhere(
    rule: Compiled, value: Array, live: NDArray[np.bool_], item: Stretch, patch: slice, at: int, place: int
) -> str | None:
    """A larger value than the peak's may stand where the limit in force was further out."""
    if rule.discrete or not item.sampled:
        return None
    low = at - (place - item.first)
    part = np.where(live[low : low + item.last - item.first + 1], value[low : low + item.last - item.first + 1], np.nan)
    most = float(np.nanmax(rule.side * part)) * rule.side
    if rule.side * (most - value[at]) > 1e-9:
        shown = rule.quantity.unit.from_si(most)
        text = f"{shown:.{rule.quantity.decimals + 1}f} {rule.quantity.shown}"
        return f"a larger value, {text}, stands elsewhere in the event, under another limit"
    return None


def _sort(rule: Compiled, stretch: Stretch, event: Event) -> tuple[str, Event]:
    """Is it an event, undecided, or nothing? Gives it severity, certainty and its lasting."""
    crossed = [index for index, level in enumerate(event.levels) if level.start is not None]
    lasted = certainty.lasted(event.duration, rule.lasting) if rule.lasting > 0.0 else 1.0
    decision = rule.decision

    def finished(index: int, chance: float) -> Event:
        word = certainty.certainty_word(chance)
        severity = event.levels[index].severity
        lowest = event.levels[crossed[0]] if crossed else None
        return replace(
            event,
            severity=severity,
            limit_exceeded=_exceeded(rule, event),
            probability=chance,
            certainty=word,
            start=event.start if lowest is None or lowest.start is None else lowest.start,
            end=event.end if lowest is None or lowest.end is None else lowest.end,
            task=rule.task.of(severity, word) if rule.task is not None else None,
        )

    if crossed:
        if lasted >= 0.5:
            top = crossed[-1]
            return "event", finished(top, event.levels[top].probability * lasted)
        chance = event.levels[crossed[-1]].probability * lasted
        return ("undecided", finished(crossed[-1], chance)) if chance >= 0.05 else ("nothing", event)
    chance = event.levels[decision].probability * lasted
    if not stretch.sampled and chance >= 0.05:
        return "undecided", finished(decision, chance)
    return "nothing", event


def _exceeded(rule: Compiled, event: Event) -> bool:
    """Beyond the limit itself, not just near it."""
    value = event.peak.value if event.peak.estimate is None else event.peak.estimate
    furthest = max(rule.side * value, rule.side * event.peak.value)
    return furthest > rule.side * event.limit.value + 1e-9 if not rule.discrete else True


def _one_a_place(events: list[Event], gap: float) -> list[Event]:
    """Of undecided ones closer together than `gap` s only the likeliest stays."""
    kept: list[Event] = []
    for event in sorted(events, key=lambda item: item.start):
        if kept and event.start - kept[-1].end < gap and event.flight == kept[-1].flight:
            if event.probability > kept[-1].probability:
                kept[-1] = event
            continue
        kept.append(event)
    return kept


__all__ = ["CONTEXT", "build_events", "parts"]
