"""Interval algebra: sets of half-open stretches [start, end) on one axis.

An interval set is a pair of equally long float64 arrays, ascending, disjoint, not touching, no empty member.
Every function takes and gives such sets (`normal` makes one from anything). Stretches of no length vanish.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Intervals:
    """A set of half-open stretches; `start` and `end` are (n,) float64."""

    start: Array
    end: Array

    def __len__(self) -> int:
        return len(self.start)

    def __iter__(self) -> Iterator[tuple[float, float]]:
        return iter(zip(self.start.tolist(), self.end.tolist(), strict=True))

    def __eq__(self, other: object) -> bool:
        return (
            isinstance(other, Intervals)
            and np.array_equal(self.start, other.start)
            and np.array_equal(self.end, other.end)
        )

    __hash__ = None  # type: ignore[assignment]

    @property
    def total(self) -> float:
        """Length of all stretches together."""
        return float(np.sum(self.end - self.start))

    def contains(self, at: Array) -> NDArray[np.bool_]:
        """(k,) bool: does each instant lie in a stretch?"""
        at = np.asarray(at)
        if at.size > 1000 and at.size > 8 * len(self) and bool((at[1:] >= at[:-1]).all()):
            # ascending instants, as whole blocks are, need two look-ups a stretch and not one an instant
            inside = np.zeros(at.shape, dtype=bool)
            first, last = np.searchsorted(at, self.start), np.searchsorted(at, self.end)
            for low, high in zip(first.tolist(), last.tolist(), strict=True):
                inside[low:high] = True
            return inside
        index = np.searchsorted(self.start, at, side="right") - 1
        inside = np.zeros(np.shape(at), dtype=bool)
        some = index >= 0
        inside[some] = np.asarray(at)[some] < self.end[index[some]]
        return inside


EMPTY = Intervals(np.empty(0), np.empty(0))


def normal(start: Array | list[float], end: Array | list[float]) -> Intervals:
    """Any stretches, in any order, overlapping or touching -> the set that covers the same instants."""
    first = np.asarray(start, dtype=np.float64)
    last = np.asarray(end, dtype=np.float64)
    keep = last > first
    first, last = first[keep], last[keep]
    if len(first) == 0:
        return EMPTY
    order = np.argsort(first, kind="stable")
    first, last = first[order], np.maximum.accumulate(last[order])
    opens = np.empty(len(first), dtype=bool)
    opens[0] = True
    opens[1:] = first[1:] > last[:-1]
    closes = np.append(opens[1:], True)
    return Intervals(first[opens], last[closes])


def union(*sets: Intervals) -> Intervals:
    if not sets:
        return EMPTY
    return normal(np.concatenate([s.start for s in sets]), np.concatenate([s.end for s in sets]))


def at_least(count: int, sets: Iterable[Intervals]) -> Intervals:
    """Where at least `count` of the sets hold."""
    sets = list(sets)
    if not sets or count > len(sets):
        return EMPTY
    edges = np.concatenate([np.concatenate([s.start, s.end]) for s in sets])
    steps = np.concatenate([np.concatenate([np.ones(len(s)), -np.ones(len(s))]) for s in sets])
    if len(edges) == 0:
        return EMPTY
    # at one instant, ends come before starts would split touching stretches: `normal` joins them again
    order = np.argsort(edges, kind="stable")
    edges, depth = edges[order], np.cumsum(steps[order])
    holds = depth[:-1] >= count
    return normal(edges[:-1][holds], edges[1:][holds])


def intersection(*sets: Intervals) -> Intervals:
    return at_least(len(sets), sets)


def complement(of: Intervals, within: Intervals) -> Intervals:
    """The part of `within` that `of` leaves."""
    if len(of) == 0 or len(within) == 0:
        return within
    bounds = (min(of.start[0], within.start[0]), max(of.end[-1], within.end[-1]))
    starts = np.concatenate([[bounds[0]], of.end])
    ends = np.concatenate([of.start, [bounds[1]]])
    return intersection(normal(starts, ends), within)


difference = complement


def joined(of: Intervals, gap: float, never_across: Intervals = EMPTY) -> Intervals:
    """Stretches parted by less than `gap` become one, unless a stretch of `never_across` lies between them.

    A touching instant of `never_across` is enough to keep them apart.
    """
    if len(of) < 2 or gap <= 0.0:
        return of
    between_start, between_end = of.end[:-1], of.start[1:]
    close = between_end - between_start < gap
    if len(never_across):
        first = np.searchsorted(never_across.end, between_start, side="right")
        blocked = np.zeros(len(close), dtype=bool)
        some = first < len(never_across)
        blocked[some] = never_across.start[first[some]] < between_end[some]
        close &= ~blocked
    opens = np.concatenate([[True], ~close])
    closes = np.concatenate([~close, [True]])
    return Intervals(of.start[opens], of.end[closes])


def lasting(of: Intervals, at_least_s: float) -> Intervals:
    """Only the stretches that last at least so long."""
    keep = of.end - of.start >= at_least_s
    return Intervals(of.start[keep], of.end[keep])


def touching(of: Intervals, other: Intervals) -> NDArray[np.bool_]:
    """(n,) bool: which stretches of `of` overlap any of `other`."""
    if len(other) == 0 or len(of) == 0:
        return np.zeros(len(of), dtype=bool)
    first = np.searchsorted(other.end, of.start, side="right")
    found = np.zeros(len(of), dtype=bool)
    some = first < len(other)
    found[some] = other.start[first[some]] < of.end[some]
    return found


def runs(mask: NDArray[np.bool_]) -> NDArray[np.int64]:
    """(k, 2) int64 of half-open index ranges in which a (n,) mask is true."""
    if len(mask) == 0:
        return np.empty((0, 2), dtype=np.int64)
    edges = np.flatnonzero(mask[1:] != mask[:-1]) + 1
    if mask[0]:
        edges = np.concatenate([[0], edges])
    if mask[-1]:
        edges = np.concatenate([edges, [len(mask)]])
    return edges.reshape(-1, 2).astype(np.int64)
