"""One pass over a trace in blocks: only crossings, times and extremes are kept, never samples.

What a rule keeps of a block adds up: beginnings and ends of stretches pair up across block borders, seconds are sums,
extremes are maxima. So the size of the blocks changes nothing.
"""

from __future__ import annotations

from collections.abc import Mapping
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from exceed.core.intervals import Array
from exceed.core.trace import Grid, Trace
from exceed.judge import certainty
from exceed.judge.block import SIZE, Block
from exceed.judge.compiled import Compiled
from exceed.judge.excursions import CUT_END, CUT_START, Edges, Index, Runs, find_edges, pair

Mask = NDArray[np.bool_]

# why a sample's time was not assessed: codes of REASONS
REASONS: tuple[str, ...] = (
    "assessed",
    "rejected",
    "no value",
    "limit not known",
    "condition not known",
    "faulty",
    "rate",
)
ASSESSED, REJECTED, NO_VALUE, NO_LIMIT, NO_CONDITION, FAULTY, RATE = range(7)

# tolerance on the interval when a rule says what it must see
MUST_SEE_TOLERANCE = 1.1
# a channel so many times too slow for a rule may still show a peak beyond its limit
ALMOST = 2.0
# the room between samples is at most so many times the largest step between neighbours (see certainty.upward_room)
ROOM_PER_STEP = 4.0


def slowest_seeing(must_see: float) -> float:
    """The longest sampling interval, s, at which an excursion of `must_see` s is seen."""
    return must_see * MUST_SEE_TOLERANCE / certainty.INTERVALS_TO_SIZE


@dataclass(slots=True)
class RuleScan:
    """What one rule kept of the blocks seen so far, in order of time."""

    begins: list[list[Edges]] = field(default_factory=list)  # one list a level
    ends: list[list[Edges]] = field(default_factory=list)
    lines: list[tuple[list[Edges], list[Edges]]] = field(default_factory=list)  # one a line of the allowances
    band: tuple[list[Edges], list[Edges]] = field(default_factory=lambda: ([], []))
    breaks: list[Index] = field(default_factory=list)
    candidates: list[Index] = field(default_factory=list)
    seconds: dict[int, Array] = field(default_factory=dict)  # flight number (0: whole recording) -> (7,) by reason
    near: float = 0.0  # s within the sensor's error of the limit, yet inside
    closest: dict[int, float] = field(default_factory=dict)  # flight number -> largest share of the limit

    def runs(self, level: int) -> Runs:
        return pair(self.begins[level], self.ends[level])

    def beyond_lines(self) -> list[Runs]:
        """Stretches beyond the limit and beyond each allowance's end."""
        return [pair(*line) for line in self.lines]

    def release_band(self) -> Runs:
        return pair(*self.band)

    def add(self, other: RuleScan) -> None:
        """Take in what the next block kept."""
        if not self.begins:
            self.begins = [[] for _ in other.begins]
            self.ends = [[] for _ in other.ends]
        for mine, more in zip(self.begins, other.begins, strict=True):
            mine.extend(more)
        for mine, more in zip(self.ends, other.ends, strict=True):
            mine.extend(more)
        if not self.lines:
            self.lines = [([], []) for _ in other.lines]
        for (begins, ends), (more_begins, more_ends) in zip(self.lines, other.lines, strict=True):
            begins.extend(more_begins)
            ends.extend(more_ends)
        self.band[0].extend(other.band[0])
        self.band[1].extend(other.band[1])
        self.breaks.extend(other.breaks)
        self.candidates.extend(other.candidates)
        for number, seconds in other.seconds.items():
            self.seconds[number] = self.seconds.get(number, 0.0) + seconds
        self.near += other.near
        for number, share in other.closest.items():
            self.closest[number] = max(self.closest.get(number, -np.inf), share)


@dataclass(slots=True)
class ExtremeScan:
    """Largest and smallest value so far: (flight number, quantity) -> (value, time)."""

    maxima: dict[tuple[int, str], tuple[float, float]] = field(default_factory=dict)
    minima: dict[tuple[int, str], tuple[float, float]] = field(default_factory=dict)

    def add(self, other: ExtremeScan) -> None:
        for key, found in other.maxima.items():
            if key not in self.maxima or found[0] > self.maxima[key][0]:
                self.maxima[key] = found
        for key, found in other.minima.items():
            if key not in self.minima or found[0] < self.minima[key][0]:
                self.minima[key] = found


def scan_grid(
    trace: Trace,
    grid: Grid,
    rules: list[Compiled],
    extremes: list[str],
    uncertainty: Mapping[str, float],
    fixed: Mapping[str, float] | None = None,
    size: int = SIZE,
    threads: int = 1,
) -> tuple[list[RuleScan], ExtremeScan]:
    """All blocks of a grid through all its rules.

    uncertainty : quantity -> a typical standard uncertainty in SI, for the time within sensor error of a limit.
    """
    names = sorted(set().union(*(rule.names for rule in rules), extremes) if rules else set(extremes))
    whole = len(grid.time)
    borders = [(start, min(start + size, whole)) for start in range(0, whole, size)]

    def one(border: tuple[int, int]) -> tuple[list[RuleScan], ExtremeScan]:
        block = Block(trace, grid, border[0], border[1], names, fixed)
        found = [scan_rule(rule, block, uncertainty.get(rule.judged, 0.0)) for rule in rules]
        return found, scan_extremes(block, extremes)

    totals = [RuleScan() for _ in rules]
    most = ExtremeScan()
    if threads > 1 and len(borders) > 1:
        with ThreadPoolExecutor(threads) as pool:
            results = pool.map(one, borders)
            for found, extreme in results:
                _gather(totals, most, found, extreme)
    else:
        for border in borders:
            _gather(totals, most, *one(border))
    return totals, most


def _gather(totals: list[RuleScan], most: ExtremeScan, found: list[RuleScan], extreme: ExtremeScan) -> None:
    for mine, more in zip(totals, found, strict=True):
        mine.add(more)
    most.add(extreme)


def scan_rule(rule: Compiled, block: Block, uncertainty: float = 0.0) -> RuleScan:
    """What one rule sees in one block."""
    scan = RuleScan([[] for _ in rule.levels], [[] for _ in rule.levels])
    n = len(block)
    value = np.broadcast_to(rule.value.of(block), (n,))
    limit = rule.limit.of(block) if rule.limit is not None else 0.0
    holds, holds_known = rule.condition.of(block) if rule.condition is not None else (None, None)

    has_value = np.isfinite(value)
    known = has_value if np.ndim(limit) == 0 else has_value & ~np.isnan(limit)
    if rule.limit is not None and np.ndim(limit) == 0 and np.isnan(limit):
        known = np.zeros(n, dtype=bool)
    if holds_known is not None:
        known = known & holds_known
    live = known if holds is None else known & holds

    # of what exists only at moments, none elsewhere is nothing that was missed
    lacking = known | ~has_value if rule.quantity.momentary else known
    _count_seconds(scan, rule, block, has_value, lacking, holds, holds_known)

    lowest = rule.excess(value, rule.threshold(rule.levels[0], limit))
    passed = live & (lowest > 0.0)
    decision = rule.decision
    deciding = lowest if decision == 0 else rule.excess(value, rule.threshold(rule.levels[decision], limit))
    release = rule.release if rule.release_share is None else rule.release_share * np.abs(limit)

    core = block.core
    if passed[core].any():
        where = _Places(block, known)
        for index, level in enumerate(rule.levels):
            excess = lowest if index == 0 else rule.excess(value, rule.threshold(level, limit))
            begins, ends = where.edges(excess, live, crossing=not rule.discrete)
            scan.begins[index].append(begins)
            scan.ends[index].append(ends)
    for line in rule.allowance_levels:
        begins, ends = _Places(block, known).edges(rule.excess(value, rule.threshold(line, limit)), live, crossing=True)
        scan.lines.append(([begins], [ends]))
    if np.any(release > 0.0) and (live & (lowest > -release))[core].any():
        begins, ends = _Places(block, known).edges(lowest + release, live, crossing=False)
        scan.band[0].append(begins)
        scan.band[1].append(ends)
    _find_breaks(scan, rule, block, known, live)
    if rule.judge_on == "estimate" and not rule.discrete:
        _find_candidates(scan, rule, block, live, value, deciding, uncertainty)
    if uncertainty > 0.0:
        inside = live & (deciding <= 0.0) & (deciding > -1.96 * uncertainty)
        if inside[core].any():
            scan.near += float(np.sum(block.shares[core][inside[core]]))
    _find_closest(scan, rule, block, live, value, limit)
    return scan


class _Places:
    """The known samples of a block. A lost one in between is stepped over, as far as that makes no gap."""

    def __init__(self, block: Block, known: Mask) -> None:
        self.block = block
        self.all = bool(known.all())
        self.index = np.flatnonzero(known)

    def edges(self, excess: Array, live: Mask, crossing: bool) -> tuple[Edges, Edges]:
        block = self.block
        if self.all:
            everything = np.ones(len(block), dtype=bool)
            return find_edges(
                block.time, excess, everything, live, block.linked, block.core, block.offset, block.whole, crossing
            )
        index = self.index
        time = block.time[index]
        core = slice(int(np.searchsorted(index, block.core.start)), int(np.searchsorted(index, block.core.stop)))
        linked = np.diff(time) <= block.gap
        everything = np.ones(len(index), dtype=bool)
        begins, ends = find_edges(time, excess[index], everything, live[index], linked, core, 0, -1, crossing)
        return self._placed(begins, first=True), self._placed(ends, first=False)

    def _placed(self, edges: Edges, first: bool) -> Edges:
        """Back to grid places; a stretch at the recording's very first or last sample is cut by that."""
        place = self.index[edges.place] + self.block.offset
        cut = edges.cut.copy()
        cut[place == (0 if first else self.block.whole - 1)] = CUT_START if first else CUT_END
        return Edges(place, edges.time, cut)


def _count_seconds(
    scan: RuleScan,
    rule: Compiled,
    block: Block,
    has_value: Mask,
    known: Mask,
    holds: Mask | None,
    holds_known: Mask | None,
) -> None:
    core = block.core
    shares = block.shares[core]
    slow = None
    if rule.must_see is not None:
        slow = block.too_slow(slowest_seeing(rule.must_see))[core]
        if holds is not None:
            slow = np.where((known & ~holds)[core], 0.0, slow)
    codes: NDArray[np.int8] | None = None
    if not known[core].all():
        codes = np.zeros(len(block), dtype=np.int8)
        if holds_known is not None:
            codes[~holds_known] = NO_CONDITION
        looked = ~known & (codes == 0) if holds is None else ~known & holds & (codes == 0)
        codes[looked & has_value] = NO_LIMIT
        codes[looked & ~has_value] = NO_VALUE
        lost = looked & ~has_value
        if lost.any():
            lost_to, faulty = _why_lost(rule, block)
            codes[lost & lost_to] = REJECTED
            codes[lost & faulty] = FAULTY
        codes = codes[core]

    def add(number: int, part: slice) -> None:
        seconds = scan.seconds.setdefault(number, np.zeros(len(REASONS)))
        owned = shares[part] if slow is None else shares[part] - slow[part]
        if codes is None:
            seconds[ASSESSED] += float(np.sum(owned))
        else:
            seconds += np.bincount(codes[part], weights=owned, minlength=len(REASONS))
        if slow is not None:
            seconds[RATE] += float(np.sum(slow[part]))

    add(0, slice(0, len(shares)))
    for number, part in block.flight_parts:
        add(number, part)


def _why_lost(rule: Compiled, block: Block) -> tuple[Mask, Mask]:
    """(n,) masks: the value is lost to a rejected sample; to a stretch the user called faulty."""

    def find() -> tuple[Mask, Mask]:
        lost = np.zeros(len(block), dtype=bool)
        faulty = np.zeros(len(block), dtype=bool)
        under = block.trace.leaves([name for name in rule.names if block.trace.has(name)])
        # a rejected sample leaves its interpolated neighbours without a value too
        for row in block.trace.recording.rejected:
            if row.quantity in under:
                reach = block.trace.channels[row.quantity].interval if row.quantity in block.trace.channels else 0.0
                lost |= (block.time >= row.start - reach) & (block.time <= row.end + reach)
        for quantity, start, end, _ in block.trace.recording.faulty:
            if quantity in under:
                faulty |= (block.time >= start) & (block.time <= end)
        return lost, faulty

    return block.keep(("lost", rule.names), find)  # type: ignore[no-any-return]


def _find_breaks(scan: RuleScan, rule: Compiled, block: Block, known: Mask, live: Mask) -> None:
    """Places that joining must not span. Only needed near stretches, so blocks without any are left out."""
    if rule.joining <= 0.0 and rule.release <= 0.0 and rule.release_share is None:
        return
    parts = block.flight_edges.copy()
    false = known & ~live
    parts[1:] |= false[1:] & ~false[:-1]
    if known.all():
        parts[1:] |= ~block.linked
    else:
        # a lost sample is stepped over, as far as that makes no gap
        index = np.flatnonzero(known)
        parts[index[1:][np.diff(block.time[index]) > block.gap]] = True
    scan.breaks.append(np.flatnonzero(parts[block.core]) + block.core.start + block.offset)


def _find_candidates(
    scan: RuleScan, rule: Compiled, block: Block, live: Mask, value: Array, deciding: Array, uncertainty: float
) -> None:
    """Samples inside the limit near which the truth between samples may lie beyond it: one a local extreme."""
    core = block.core
    inside = live & (deciding <= 0.0)
    if not inside[core].any():
        return
    near = np.where(inside, deciding, -np.inf)
    # the room between samples cannot exceed a few times the largest step in the block: a bound that costs one pass
    step = block.keep(("step", rule.judged), lambda: _largest_step(value))
    if float(np.max(near[core])) + ROOM_PER_STEP * step + 6.0 * _white(block, rule, uncertainty) <= 0.0:
        return
    room = block.keep(
        ("room", rule.judged, rule.side),
        lambda: certainty.upward_room(
            block.time, value, rule.side, interval=block.grid.interval, noise=_white(block, rule, uncertainty)
        ),
    )
    hopeful = inside & (deciding + room > 0.0)
    if rule.must_see is not None:
        # where the channel is far too slow for the rule no peak can be sized; where it is a little, one still may be
        hopeful &= block.too_slow(ALMOST * slowest_seeing(rule.must_see)) <= 0.0
    if not hopeful[core].any():
        return
    n = len(block)
    padded = np.concatenate([[-np.inf], np.where(live, deciding, -np.inf), [-np.inf]])
    peak = (padded[1:-1] >= padded[:-2]) & (padded[1:-1] > padded[2:])
    places = np.flatnonzero(hopeful & peak)
    places = places[(places >= core.start) & (places < core.stop)]
    if len(places) and n:
        scan.candidates.append(places + block.offset)


def _white(block: Block, rule: Compiled, uncertainty: float) -> float:
    """Noise and resolution of the judged channel, in its unit; the value's uncertainty where they are not known."""
    channel = block.trace.channels.get(rule.judged)
    if channel is None or channel.noise is None:
        return uncertainty
    return float(np.hypot(channel.noise, channel.resolution / np.sqrt(12.0)))


def _largest_step(value: Array) -> float:
    steps = np.abs(np.diff(value))
    return float(np.nanmax(steps)) if np.isfinite(steps).any() else 0.0


def _find_closest(scan: RuleScan, rule: Compiled, block: Block, live: Mask, value: Array, limit: Array | float) -> None:
    """The largest share of the limit reached, by flight; only where value and limit lie on the same side of zero."""
    if rule.limit is None or rule.discrete:
        return
    core = block.core
    bound = np.broadcast_to(limit, (len(block),))[core]
    usable = live[core] & np.isfinite(bound) & (bound * rule.side > 0.0)
    if not usable.any():
        return
    share = np.where(usable, value[core] / np.where(usable, bound, 1.0), -np.inf)
    if not block.trace.track.flights:
        scan.closest[0] = float(np.max(share))
        return
    for number, part in block.flight_parts:
        scan.closest[number] = float(np.max(share[part]))


def scan_extremes(block: Block, names: list[str]) -> ExtremeScan:
    """Largest and smallest value of each quantity in each flight (number 0: where nothing tells flights apart)."""
    found = ExtremeScan()
    core = block.core
    time = block.time[core]
    parts = block.flight_parts if block.trace.track.known else [(0, slice(0, len(time)))]
    for number, part in parts:
        for name in names:
            values = block.values[name][core][part]
            most = np.fmax.reduce(values)
            if not np.isfinite(most):
                continue
            least = np.fmin.reduce(values)
            found.maxima[number, name] = (float(most), float(time[part][int(np.argmax(values == most))]))
            found.minima[number, name] = (float(least), float(time[part][int(np.argmax(values == least))]))
    return found
