"""How far one excursion went: the extreme sample, the true extreme behind it, and how surely each level was passed."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from exceed.core.findings import PeakValue
from exceed.core.intervals import Array
from exceed.core.recording import Channel
from exceed.core.trace import Grid, Trace
from exceed.judge import certainty
from exceed.judge.block import Block
from exceed.judge.compiled import Compiled

Mask = NDArray[np.bool_]

# samples on either side of an extreme that its sizing looks at
AROUND = 12
# s in which a quantity can go up and come back at the quickest, by kind: a body's loads and rates follow the stick, its
# attitude takes longer, its speed and height longer still (judgement; the load factor's is what the yardstick holds)
QUICKEST = {"load factor": 0.3, "angular rate": 0.3, "angle": 1.0, "rotation": 1.0}
QUICKEST_OTHERS = 3.0
# samples in the quickest excursion from which on nothing hides between them: twice those that size one
WELL_SAMPLED = 2.0 * certainty.INTERVALS_TO_SIZE
NOT_SIZED = "not sized: the channel is too slow for the peak between its samples"
SATURATED = "the sensor was at the end of its range: at least this much"


@dataclass(frozen=True, slots=True, eq=False)
class Strip:
    """The samples of one excursion and their neighbourhood: values, limit in force, where the rule looks.

    All (n,). inside : the excursion's own samples.
    """

    block: Block
    value: Array
    limit: Array
    live: Mask
    patch: slice
    inside: slice

    def neighbourhood(self, at: int) -> tuple[slice, int]:
        """The samples about one that hang together, and its place among them."""
        low, high = at, at + 1
        linked = self.block.linked
        while low > self.patch.start and at - low < AROUND and linked[low - 1] and self.live[low - 1]:
            low -= 1
        while high < self.patch.stop and high - at <= AROUND and linked[high - 1] and self.live[high]:
            high += 1
        return slice(low, high), at - low


@dataclass(frozen=True, slots=True, eq=False)
class Sized:
    """What is known of an excursion's extreme. chances : P(beyond) for each level; peak : None for states."""

    value: PeakValue
    chances: tuple[float, ...]
    estimate: float
    peak: certainty.Peak | None = None
    notes: tuple[str, ...] = ()


def size(rule: Compiled, trace: Trace, grid: Grid, strip: Strip, at: int, uncertainty: float, sampled: bool) -> Sized:
    """Size the excursion whose furthest sample is element `at` of the strip.

    uncertainty : standard uncertainty of the value there, SI. sampled : False where no sample is beyond any level.
    """
    here, bound = float(strip.value[at]), float(strip.limit[at])
    thresholds = levels_at(rule, bound)
    when = float(strip.block.time[at])
    if rule.discrete:
        return Sized(PeakValue(when, here), tuple(1.0 if sampled else 0.0 for _ in thresholds), here)
    if rule.judge_on == "sample":
        half = 1.96 * uncertainty
        chances = tuple(by_sensor(rule.side * (here - threshold), uncertainty) for threshold in thresholds)
        return Sized(PeakValue(when, here, here, here - half, here + half), chances, here)
    channel = judged_channel(rule, trace)
    peak = _peak(rule, channel, grid, strip, at, uncertainty)
    chances = tuple(certainty.probability_beyond(peak, threshold) for threshold in thresholds)
    notes = []
    if peak.saturated:
        notes.append(SATURATED)
    elif not peak.sized:
        notes.append(NOT_SIZED)
    shown = PeakValue(
        time=when if sampled else peak.time,
        value=here,
        estimate=peak.estimate,
        low=peak.low,
        high=peak.high,
        sized=peak.sized,
        saturated=peak.saturated,
    )
    return Sized(shown, chances, peak.estimate, peak, tuple(notes))


def hides_nothing(rule: Compiled, trace: Trace, grid: Grid) -> bool:
    """Whether the value is too slow for its channel to hide an excursion between samples, unlike what follows a pull.

    Then no sample beyond a level means none was; what is left is the sensor's error, which opens no question.
    """
    name = rule.judged.removeprefix("rate_of:")
    if trace.has(name) and "load_factor" in trace.closure([name]):
        return False
    return WELL_SAMPLED * grid.interval <= QUICKEST.get(rule.quantity.kind, QUICKEST_OTHERS)


def levels_at(rule: Compiled, limit: float) -> list[float]:
    """Each level's threshold where the limit in force is `limit`."""
    return [float(np.asarray(rule.threshold(level, limit))) for level in rule.levels]


def _peak(
    rule: Compiled, channel: Channel | None, grid: Grid, strip: Strip, at: int, uncertainty: float
) -> certainty.Peak:
    window, centre = strip.neighbourhood(at)
    own = channel if channel is not None and channel.quantity == rule.judged else None
    end = None
    if own is not None and not rule.magnitude:
        end = own.saturation[1] if rule.side > 0 else own.saturation[0]
        end = end if math.isfinite(end) else None
    return certainty.size_peak(
        strip.block.time[window],
        strip.value[window],
        rule.side,
        centre,
        standard_uncertainty=uncertainty,
        interval=grid.interval,
        resolution=own.resolution if own is not None else 0.0,
        noise=own.noise if own is not None else None,
        saturation=end,
        quickest=QUICKEST.get(rule.quantity.kind, QUICKEST_OTHERS),
    )


def estimated_span(
    rule: Compiled, strip: Strip, at: int, peak: certainty.Peak, level: float
) -> tuple[float, float] | None:
    """Start and end of the estimate's curve beyond a level that no sample is beyond; None where it is not beyond."""
    # what prints alike is no excursion: flown along a limit, the curve between samples is beyond it by a hair
    if rule.side * (peak.estimate - level) <= 0.5 * rule.quantity.unit.factor * 10.0 ** -(rule.quantity.decimals + 1):
        return None
    window, centre = strip.neighbourhood(at)
    time, value = strip.block.time[window], strip.value[window]
    before = centre if time[centre] <= peak.time else centre - 1
    after = before + 1
    first, last = max(before, 0), min(after, len(time) - 1)
    return certainty.estimated_span(
        peak, float(time[first]), float(value[first]), float(time[last]), float(value[last]), level
    )


def by_sensor(beyond: float, uncertainty: float) -> float:
    """P(the true value is beyond), the sample's own error alone. [JCGM-106]"""
    if uncertainty <= 0.0:
        return 1.0 if beyond > 0.0 else 0.0
    return 0.5 * math.erfc(-beyond / (uncertainty * math.sqrt(2.0)))


def judged_channel(rule: Compiled, trace: Trace) -> Channel | None:
    """The channel whose samples the judged value is, or None where it is made of several."""
    name = rule.judged.removeprefix("rate_of:")
    if not trace.has(name):
        return None
    leaves = trace.leaves([name], main_only=True)
    return trace.channels[next(iter(leaves))] if len(leaves) == 1 else None


def with_cell(rule: Compiled, trace: Trace, row: int, peak: PeakValue) -> PeakValue:
    """The cell as written, where the judged quantity is itself recorded at this row of the axis."""
    channel = judged_channel(rule, trace)
    if channel is None or channel.quantity != rule.judged or not channel.column:
        return peak
    index = row
    if channel.rows is not None:
        index = int(np.searchsorted(channel.rows, row))
        if index >= len(channel.rows) or channel.rows[index] != row:
            return peak
    value = float(channel.values[index])
    if not math.isfinite(value):
        return peak
    return replace(peak, recorded=channel.cell(value), recorded_unit=channel.unit)


def duration_uncertainty(rule: Compiled, trace: Trace, strip: Strip, threshold: float, uncertainty: float) -> float:
    """Standard uncertainty of how long the value was beyond a threshold, s."""
    channel = judged_channel(rule, trace)
    low = max(strip.inside.start - 2, strip.patch.start)
    high = min(strip.inside.stop + 2, strip.patch.stop)
    keep = strip.live[low:high]
    time, value = strip.block.time[low:high][keep], strip.value[low:high][keep]
    first = int(np.count_nonzero(strip.live[low : strip.inside.start]))
    last = first + int(np.count_nonzero(strip.live[strip.inside])) - 1
    if last < first or len(time) < 2:
        return 0.0
    return certainty.duration_uncertainty(
        time,
        value,
        first,
        last,
        threshold,
        standard_uncertainty=uncertainty,
        noise=(channel.noise or 0.0) if channel is not None else 0.0,
        resolution=channel.resolution if channel is not None else 0.0,
    )
