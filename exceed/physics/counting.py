"""Counting a load history: level crossings, peaks, ranges, rainflow cycles; damage sums.

NaN splits a history only where the caller splits it: these functions pass over NaN samples, as if the record went
straight on. Half cycles (the residue) are given as such, never rounded to whole ones.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from exceed.physics._arrays import Array, finite, floats, quiet


@dataclass(frozen=True, slots=True, eq=False)
class Cycles:
    """Counted cycles, one row each (k,): `range` peak to valley, `mean`, `count` (1 whole, 0.5 half cycle), and
    `start`, `end`: rows of the history at which the two ends lie."""

    range: Array
    mean: Array
    count: Array
    start: NDArray[np.intp]
    end: NDArray[np.intp]

    def total(self, at_range: float, tolerance: float = 1e-9) -> float:
        """Sum of counts of one range (absolute tolerance)."""
        return float(self.count[np.abs(self.range - at_range) <= tolerance].sum())


def _vector(history: ArrayLike) -> Array:
    values = floats(history)
    if values.ndim != 1:
        raise ValueError(f"history must be an array of shape (n,), not {values.shape}")
    return values


@quiet
def turning_points(history: ArrayLike) -> NDArray[np.intp]:
    """Rows of the history at which it turns, with its first and last value.

    Parameters: history : (n,) array; NaN and infinities are passed over.
    Returns: (k,) array of rows, rising. Of equal values side by side the first one stands for all; a constant history
    has one.
    Raises: ValueError for another shape.
    Source: [ASTM-E1049].
    """
    values = _vector(history)
    rows = np.flatnonzero(np.isfinite(values))
    if not rows.size:
        return rows
    rows = rows[np.concatenate(([True], np.diff(values[rows]) != 0.0))]
    if rows.size < 3:
        return rows
    rising = np.diff(values[rows]) > 0.0
    return rows[np.concatenate(([True], rising[1:] != rising[:-1], [True]))]


@quiet
def level_crossings(history: ArrayLike, levels: ArrayLike, reference: float = 1.0) -> NDArray[np.intp]:
    """How often each level is crossed: upwards at and above the reference, downwards below it.

    Parameters: history : (n,) array; levels : (k,) array, same unit; reference : the level of rest (1 g in flight).
    Returns: (k,) array of counts. Reaching a level counts; staying on it does not count again.
    Raises: ValueError for another shape.
    Source: [ASTM-E1049] level-crossing counting.
    """
    values = _vector(history)
    values = values[np.isfinite(values)]
    return level_crossings_of_steps(values[:-1], values[1:], levels, reference)


@quiet
def level_crossings_of_steps(
    before: ArrayLike, after: ArrayLike, levels: ArrayLike, reference: float = 1.0
) -> NDArray[np.intp]:
    """Level crossings in some of a history's steps, so that a history can be told apart by what happens in each.

    Parameters: before, after : (m,) arrays, the history's values at either end of each step; levels, reference : as in
    `level_crossings`, whose counts those of all steps add up to.
    Returns: (k,) array of counts. A step with a NaN at either end counts nothing.
    Source: [ASTM-E1049] level-crossing counting.
    """
    before, after = floats(before), floats(after)
    wanted = np.atleast_1d(floats(levels))
    up, down = after > before, after < before
    # crossing upwards: before < level <= after, so count the levels at or below each end
    rise = _passed(wanted, before[up], after[up])
    fall = _passed(-wanted, -before[down], -after[down])
    return np.where(np.isnan(wanted), 0, np.where(wanted >= reference, rise, fall))


def _passed(levels: Array, before: Array, after: Array) -> NDArray[np.intp]:
    """For each level the number of steps with before < level <= after, by sorting rather than level by level."""
    lower = np.searchsorted(np.sort(before), levels, side="left")  # before < level
    upper = np.searchsorted(np.sort(after), levels, side="left")  # after < level
    return lower - upper


@quiet
def peak_counts(history: ArrayLike, levels: ArrayLike, reference: float = 1.0) -> NDArray[np.intp]:
    """How often the history turns exactly at each value: peaks above the reference, valleys below it.

    Parameters: history : (n,) array; levels : (k,) array; reference : the level of rest.
    Returns: (k,) array of counts; the first and last value of the history are no turns.
    Raises: ValueError for another shape.
    Source: [ASTM-E1049] peak counting.
    """
    values = _vector(history)
    turns = values[turning_points(values)]
    if turns.size < 3:
        turns = np.empty(0)
    else:
        inner, peak = turns[1:-1], turns[1:-1] > turns[:-2]
        turns = inner[(peak & (inner > reference)) | (~peak & (inner < reference))]
    ordered = np.sort(turns)
    wanted = np.atleast_1d(floats(levels))
    return np.searchsorted(ordered, wanted, side="right") - np.searchsorted(ordered, wanted, side="left")


def _cycles(values: Array, starts: list[int], ends: list[int], counts: list[float]) -> Cycles:
    start, end = np.array(starts, dtype=np.intp), np.array(ends, dtype=np.intp)
    low, high = values[start], values[end]
    return Cycles(np.abs(high - low), 0.5 * (low + high), np.array(counts, dtype=np.float64), start, end)


@quiet
def rainflow(history: ArrayLike) -> Cycles:
    """Rainflow cycles of a history, half cycles and all.

    Parameters: history : (n,) array; NaN is passed over.
    Returns: Cycles, in the order in which they close; the residue's half cycles last.
    Raises: ValueError for another shape.
    Source: [ASTM-E1049] rainflow counting, 5.4.4.
    """
    values = _vector(history)
    rows = turning_points(values)
    series = values[rows].tolist()
    names = rows.tolist()
    starts: list[int] = []
    ends: list[int] = []
    counts: list[float] = []
    stack: list[float] = []
    place: list[int] = []
    for value, name in zip(series, names, strict=True):
        stack.append(value)
        place.append(name)
        while len(stack) >= 3:
            previous = abs(stack[-2] - stack[-3])
            if abs(stack[-1] - stack[-2]) < previous:
                break
            starts.append(place[-3])
            ends.append(place[-2])
            if len(stack) == 3:  # the range holds the starting point: half a cycle, and the start moves on
                counts.append(0.5)
                del stack[0], place[0]
            else:
                counts.append(1.0)
                del stack[-3:-1], place[-3:-1]
    for start, end in itertools.pairwise(place):
        starts.append(start)
        ends.append(end)
        counts.append(0.5)
    return _cycles(values, starts, ends, counts)


@quiet
def rainflow_repeating(history: ArrayLike) -> Cycles:
    """Rainflow cycles of a history that repeats itself: rearranged to begin at its maximum, whole cycles only.

    Parameters, Raises: as in `rainflow`.    Returns: Cycles; the half cycles that the rearranged history leaves are the
    same range twice and come out as two halves.
    Source: [ASTM-E1049] simplified rainflow counting for repeating histories, 5.4.5.
    """
    values = _vector(history)
    rows = turning_points(values)
    if rows.size < 2:
        return _cycles(values, [], [], [])
    if values[rows[0]] == values[rows[-1]]:
        rows = rows[:-1]
    top = int(np.argmax(values[rows]))
    order = np.concatenate((rows[top:], rows[:top], rows[top : top + 1]))
    cycles = rainflow(values[order])
    return Cycles(cycles.range, cycles.mean, cycles.count, order[cycles.start], order[cycles.end])


@quiet
def simple_ranges(history: ArrayLike) -> Cycles:
    """Every range from turn to turn, as half a cycle each.

    Parameters, Raises: as in `rainflow`.    Returns: Cycles of count 0.5, in order.
    Source: [ASTM-E1049] simple-range counting.
    """
    values = _vector(history)
    rows = turning_points(values).tolist()
    return _cycles(values, rows[:-1], rows[1:], [0.5] * max(0, len(rows) - 1))


@quiet
def range_pairs(history: ArrayLike) -> Cycles:
    """Range pairs: a range and the equal return of a later one make one cycle; what finds no pair is left out.

    Parameters, Raises: as in `rainflow`.    Returns: Cycles of count 1.
    Source: [ASTM-E1049] range-pair counting.
    """
    values = _vector(history)
    rows = turning_points(values)
    starts: list[int] = []
    ends: list[int] = []
    stack: list[float] = []
    place: list[int] = []
    for value, name in zip(values[rows].tolist(), rows.tolist(), strict=True):
        stack.append(value)
        place.append(name)
        while len(stack) >= 3 and abs(stack[-1] - stack[-2]) >= abs(stack[-2] - stack[-3]):
            starts.append(place[-3])
            ends.append(place[-2])
            del stack[-3:-1], place[-3:-1]
    while len(place) >= 3:  # ranges only shrink now: each pairs with the one before it, from the end
        starts.append(place[-2])
        ends.append(place[-1])
        del place[-2:]
    return _cycles(values, starts, ends, [1.0] * len(starts))


@quiet
def miner_damage(applied: ArrayLike, allowable: ArrayLike) -> float:
    """Linear damage sum: applied over allowable cycles, summed.

    Parameters: applied, allowable : (k,) arrays of cycle counts.
    Returns: 1 at the end of the life; NaN where an allowable count is not positive.
    Source: [PALMGREN-MINER].
    """
    permitted = floats(allowable)
    share = np.where(permitted > 0.0, floats(applied) / permitted, np.nan)
    return float(finite(np.sum(share)))


@quiet
def repeats_to_failure(damage: ArrayLike) -> Array:
    """How often a history can be repeated until the damage sum is 1.

    Parameters: damage : (n,) array, 1.    Returns: (n,) array, 1. NaN where the damage is not positive.
    Source: [PALMGREN-MINER].
    """
    value = floats(damage)
    return finite(np.where(value > 0.0, 1.0 / value, np.nan))


@quiet
def damage_power_law(cycles: Cycles, exponent: float, constant: float) -> float:
    """Damage sum with allowable cycles N = constant / range^exponent.

    Parameters: cycles : Cycles; exponent : 1; constant : range unit ^ exponent.    Returns: 1 at the end of the life.
    Source: [PALMGREN-MINER].
    """
    return float(finite(np.sum(cycles.count * cycles.range**exponent) / constant))


@quiet
def equivalent_range(cycles: Cycles, exponent: float) -> float:
    """Constant range that does the same damage in the same number of cycles.

    Parameters: cycles : Cycles; exponent : of the power law, 1.    Returns: range unit; NaN without cycles.
    Source: [PALMGREN-MINER].
    """
    return float(finite((np.sum(cycles.count * cycles.range**exponent) / np.sum(cycles.count)) ** (1.0 / exponent)))
