"""What could be assessed, second by second: assessed + unassessed + not applicable = recorded time."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from exceed.core.findings import Coverage, Extreme, RejectedFinding
from exceed.core.recording import Rejected
from exceed.core.trace import Grid, Trace
from exceed.judge import certainty
from exceed.judge.block import Block, gap_of
from exceed.judge.compiled import Compiled
from exceed.judge.scan import MUST_SEE_TOLERANCE, REASONS, ExtremeScan, RuleScan
from exceed.judge.sizing import levels_at


def coverage_rows(trace: Trace, rule: Compiled, scan: RuleScan | None) -> list[Coverage]:
    """One row for the recording and one for each flight. scan : None where the rule could not be run at all."""
    spans: list[tuple[int | None, float]] = [(None, trace.recording.duration)]
    spans += [(flight.number, _without_seams(trace, flight.start, flight.end)) for flight in trace.track.flights]
    if scan is None:
        return [_nothing(rule, number, seconds) for number, seconds in spans]
    grid = trace.grid(rule.grid_names)
    return [_row(trace, rule, scan, grid, number, seconds) for number, seconds in spans]


def least_assessed(rows: list[list[Coverage]]) -> list[Coverage]:
    """Of a rule that was run for several engines or sides, the rows of the one that could assess least."""
    return min(rows, key=lambda one: one[0].assessed)


def _nothing(rule: Compiled, number: int | None, seconds: float) -> Coverage:
    if rule.not_applicable is not None:
        return Coverage(rule.id, number, 0.0, 0.0, seconds, None, ((rule.not_applicable, seconds),))
    return Coverage(rule.id, number, 0.0, seconds, 0.0, None, ((rule.unassessed or "", seconds),))


def _row(trace: Trace, rule: Compiled, scan: RuleScan, grid: Grid, number: int | None, recorded: float) -> Coverage:
    seconds = scan.seconds.get(number or 0, np.zeros(len(REASONS)))
    missing = recorded - float(np.sum(seconds))
    if number is None:
        owned = _owned_ends(trace, grid)
    else:
        # a flight begins and ends between samples: what half an interval leaves over belongs to the samples there
        owned = min(max(missing, -grid.interval), grid.interval)
    reasons: dict[str, float] = {}
    gap = missing - owned
    if gap > 1e-6:
        reasons["gap"] = gap
    for code, name in enumerate(REASONS):
        if code and seconds[code] > 1e-9:
            reasons[name] = float(seconds[code])
    excess = sum(reasons.values()) - recorded
    if excess > 0.0:
        # samples at the ends of a flight own time beyond it, which is not the flight's
        largest = max(reasons, key=lambda name: reasons[name])
        reasons[largest] = max(reasons[largest] - excess, 0.0)
    assessed = max(recorded - sum(reasons.values()), 0.0)
    shortest = max(certainty.shortest_sized(grid.interval), 2.0 * _smoothing(trace, rule))
    blind = rule.must_see is not None and 2.0 * _smoothing(trace, rule) > rule.must_see * MUST_SEE_TOLERANCE
    if assessed > 0.0 and (blind or _one_sided(trace, rule)):
        reasons["method"] = assessed
        assessed = 0.0
    return Coverage(
        rule=rule.id,
        flight=number,
        assessed=assessed,
        unassessed=recorded - assessed,
        not_applicable=0.0,
        shortest_seen=shortest,
        reasons=tuple(sorted(reasons.items(), key=lambda item: (-item[1], item[0]))),
    )


def _owned_ends(trace: Trace, grid: Grid) -> float:
    """Time before the grid's first and after its last sample that those samples own: as long as it makes no gap."""
    if len(grid.time) == 0:
        return 0.0
    axis = trace.recording.time
    before, after = float(grid.time[0] - axis[0]), float(axis[-1] - grid.time[-1])
    return sum(part for part in (before, after) if part <= gap_of(grid))


def _without_seams(trace: Trace, start: float, end: float) -> float:
    cut = sum(max(min(end, b) - max(start, a), 0.0) for a, b in trace.recording.seams)
    return end - start - cut


def _smoothing(trace: Trace, rule: Compiled) -> float:
    name = rule.judged.removeprefix("rate_of:")
    return trace.smoothing(name) if trace.has(name) else 0.0


def _one_sided(trace: Trace, rule: Compiled) -> bool:
    """A value that is a bound by construction can show an excursion but never clear a limit."""
    name = rule.judged.removeprefix("rate_of:")
    return trace.has(name) and any(trace.steps[one].one_sided for one in trace.closure([name]))


def extreme_rows(
    trace: Trace, rules: list[Compiled], scans: Mapping[int, RuleScan], most: ExtremeScan
) -> tuple[Extreme, ...]:
    """Each quantity's extremes in each flight, with the largest share of a limit that it reached."""
    numbers = [flight.number for flight in trace.track.flights] if trace.track.known else [0]
    rows = []
    for number in numbers:
        for name in sorted({name for _, name in most.maxima}):
            top, low = most.maxima.get((number, name)), most.minima.get((number, name))
            shares = [
                scans[index].closest[number]
                for index, rule in enumerate(rules)
                if index in scans and rule.judged == name and np.isfinite(scans[index].closest.get(number, -np.inf))
            ]
            if top is not None or low is not None:
                rows.append(Extreme(name, number or None, top, low, max(shares, default=None)))
    return tuple(rows)


def rejected_rows(trace: Trace, rules: list[Compiled]) -> tuple[RejectedFinding, ...]:
    """Each rejected stretch with the rules whose limit its extreme would have passed, had it been believed."""
    return tuple(
        RejectedFinding(row, tuple(sorted({rule.id for rule in rules if _would_pass(trace, rule, row)})))
        for row in trace.recording.rejected
    )


def _would_pass(trace: Trace, rule: Compiled, row: Rejected) -> bool:
    if row.extreme is None or rule.judged != row.quantity or rule.discrete:
        return False
    grid = trace.grid(rule.grid_names)
    if len(grid.time) == 0:
        return False
    at = int(np.clip(np.searchsorted(grid.time, row.start), 0, len(grid.time) - 1))
    block = Block(trace, grid, at, at + 1, sorted(rule.names))
    bound = rule.limit.of(block) if rule.limit is not None else rule.levels[rule.decision].value
    # the limit about the rejected sample: its own may rest on it and so be unknown
    bounds = np.broadcast_to(np.asarray(bound, dtype=np.float64), (len(block),))
    bounds = bounds[~np.isnan(bounds)]
    if len(bounds) == 0:
        return False
    threshold = levels_at(rule, float(bounds[len(bounds) // 2]))[rule.decision]
    value = abs(row.extreme) if rule.magnitude else row.extreme
    return rule.side * (value - threshold) > 0.0
