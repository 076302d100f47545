"""Counting a load history in parts that add up: level crossings, peaks and rainflow cycles in steps of a quarter g."""

from __future__ import annotations

import itertools
from collections.abc import Iterable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from exceed.core.diagrams import CycleTally, Tally
from exceed.core.intervals import Array
from exceed.core.quantities import QUANTITIES
from exceed.physics import counting

STEP = 0.25
REFERENCE = 1.0  # the level of rest: steady level flight
_LOW, _HIGH = QUANTITIES["load_factor"].plausible
# multiples of a quarter are exact in binary, so a level never misses a value that lies on it
LEVELS: Array = np.arange(_LOW, _HIGH + 0.5 * STEP, STEP)
RANGES = int((_HIGH - _LOW) / STEP) + 1
_ROUNDING = 1e-9  # a range of 0.25 that came out as 0.2499999 belongs to the bin from 0.25 up


@dataclass(slots=True)
class Counts:
    """A tally that grows."""

    crossings: NDArray[np.int64] = field(default_factory=lambda: np.zeros(len(LEVELS), dtype=np.int64))
    peaks: NDArray[np.int64] = field(default_factory=lambda: np.zeros(len(LEVELS), dtype=np.int64))
    lowest: float = np.inf
    highest: float = -np.inf
    seconds: float = 0.0

    def add_steps(self, before: Array, after: Array, seconds: Array) -> None:
        """Steps of a history: the values at either end, and how long each takes."""
        if len(after) == 0:
            return
        self.crossings += counting.level_crossings_of_steps(before, after, LEVELS, REFERENCE)
        self.lowest = min(self.lowest, float(after.min()))
        self.highest = max(self.highest, float(after.max()))
        self.seconds += float(seconds.sum())

    def add_turns(self, peaks: Array, valleys: Array) -> None:
        """Peaks and valleys, each counted at every level that it reaches on its own side of rest."""
        above = len(peaks) - np.searchsorted(np.sort(peaks), LEVELS, side="left")
        below = np.searchsorted(np.sort(valleys), LEVELS, side="right")
        self.peaks += np.where(LEVELS >= REFERENCE, above, below)

    def add(self, other: Counts) -> None:
        """Everything that another one counted."""
        self.crossings += other.crossings
        self.peaks += other.peaks
        self.lowest, self.highest = min(self.lowest, other.lowest), max(self.highest, other.highest)
        self.seconds += other.seconds

    def tally(self) -> Tally:
        """What was counted, at the levels within what was flown."""
        low, high = np.searchsorted(LEVELS, self.lowest), np.searchsorted(LEVELS, self.highest, side="right")
        flown = slice(int(low), int(high)) if self.lowest <= self.highest else slice(0, 0)
        some = np.isfinite(self.lowest)
        return Tally(
            LEVELS[flown],
            self.crossings[flown].astype(np.float64),
            self.peaks[flown].astype(np.float64),
            self.lowest if some else float("nan"),
            self.highest if some else float("nan"),
            self.seconds,
        )


@dataclass(slots=True)
class CycleCounts:
    """A table of rainflow cycles that grows, by range and mean."""

    whole: NDArray[np.int64] = field(default_factory=lambda: np.zeros((RANGES, len(LEVELS)), dtype=np.int64))
    half: NDArray[np.int64] = field(default_factory=lambda: np.zeros((RANGES, len(LEVELS)), dtype=np.int64))

    def add_history(self, values: Array) -> None:
        """The cycles of one stretch; what stays open at its end are half cycles."""
        cycles = counting.rainflow(values)
        row = np.clip(np.floor(cycles.range / STEP + _ROUNDING).astype(np.int64), 0, RANGES - 1)
        mean = np.clip(np.floor((cycles.mean - _LOW) / STEP + _ROUNDING).astype(np.int64), 0, len(LEVELS) - 1)
        whole = cycles.count == 1.0
        np.add.at(self.whole, (row[whole], mean[whole]), 1)
        np.add.at(self.half, (row[~whole], mean[~whole]), 1)

    def add(self, other: CycleCounts) -> None:
        """Everything that another one counted."""
        self.whole += other.whole
        self.half += other.half

    def tally(self) -> CycleTally:
        """What was counted, from the smallest bin to the largest range, and the means met."""
        found = (self.whole + self.half) > 0
        rows = int(np.flatnonzero(found.any(axis=1))[-1]) + 1 if found.any() else 0
        met = np.flatnonzero(found.any(axis=0))
        part = slice(int(met[0]), int(met[-1]) + 1) if len(met) else slice(0, 0)
        whole, half = (table[:rows, part].astype(np.float64) for table in (self.whole, self.half))
        return CycleTally(np.arange(rows, dtype=np.float64) * STEP, LEVELS[part], whole, half)


def stretches(time: Array, known: NDArray[np.bool_], gap: float) -> list[tuple[int, int]]:
    """Index ranges [first, last) of samples that follow one another: no gap and no unknown sample inside."""
    rows = np.flatnonzero(known)
    if len(rows) == 0:
        return []
    breaks = np.flatnonzero((np.diff(rows) != 1) | (np.diff(time[rows]) > gap)) + 1
    edges = np.concatenate(([0], breaks, [len(rows)]))
    return [(int(rows[low]), int(rows[high - 1]) + 1) for low, high in itertools.pairwise(edges.tolist()) if high > low]


def count_stretch(time: Array, values: Array, labels: Iterable[tuple[NDArray[np.int8], dict[int, Counts]]]) -> Counts:
    """Crossings and peaks of one stretch, and the same by label.

    time, values : (n,). labels : (n,) codes and the counts that grow by code. A step belongs to the label of the sample
    it ends at, a peak to that of its own sample.
    """
    whole = Counts()
    before, after, seconds = values[:-1], values[1:], np.diff(time)
    turns = counting.turning_points(values)
    inner = turns[1:-1]
    rising = values[inner] > values[turns[:-2]] if len(inner) else np.empty(0, dtype=bool)
    peaks = inner[rising & (values[inner] > REFERENCE)]
    valleys = inner[~rising & (values[inner] < REFERENCE)]
    whole.add_steps(before, after, seconds)
    whole.add_turns(values[peaks], values[valleys])
    # the first sample ends no step, and is flown all the same
    whole.lowest, whole.highest = min(whole.lowest, float(values[0])), max(whole.highest, float(values[0]))
    for codes, growing in labels:
        for code in np.unique(codes).tolist():
            part = growing.setdefault(code, Counts())
            mine = codes[1:] == code
            part.add_steps(before[mine], after[mine], seconds[mine])
            part.add_turns(values[peaks[codes[peaks] == code]], values[valleys[codes[valleys] == code]])
    return whole
