"""A few thousand instants of a log, at which columns are held against each other: values and rates, as written."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from exceed.core.recording import Array
from exceed.read.raw import RawChannel

POINTS = 4000
HALF = 1.0  # s either side for a rate


class Grid:
    """Instants spread over the log, and each raw channel's value and rate there (NaN where it has none near)."""

    def __init__(self, time: Array, raws: Sequence[RawChannel]) -> None:
        self._time = time
        # rates need room on both sides; instants are taken among the log's own
        inner = np.linspace(0, max(0, len(time) - 1), min(POINTS, len(time))).round().astype(np.int64)
        self.at = time[inner] if len(time) else np.empty(0)
        self._values: dict[int, Array] = {}
        self._pairs: dict[int, tuple[Array, Array, Array]] = {}
        self._raws = list(raws)

    def _places(self, raw: RawChannel, wanted: Array) -> tuple[NDArray[np.int64], Array]:
        """Sample at or before each instant, and its time."""
        if raw.rows is None:
            place = np.searchsorted(self._time, wanted, side="right") - 1
            place = np.clip(place, 0, len(self._time) - 1)
            return place, self._time[place]
        # the rows of millions of samples need no copy of their times: search in the axis, then among the rows
        on_axis = np.clip(np.searchsorted(self._time, wanted, side="right") - 1, 0, len(self._time) - 1)
        place = np.clip(np.searchsorted(raw.rows, on_axis, side="right") - 1, 0, len(raw.rows) - 1)
        return place, self._time[raw.rows[place]]

    def value(self, raw: RawChannel) -> Array:
        """(n,) figures as written."""
        key = id(raw)
        if key not in self._values:
            if len(raw.values) == 0:
                self._values[key] = np.full(len(self.at), np.nan)
            else:
                place, when = self._places(raw, self.at)
                found = raw.values[place].astype(np.float64)
                found[np.abs(self.at - when) > 5.0] = np.nan
                found[~np.isfinite(found)] = np.nan
                self._values[key] = found
        return self._values[key]

    def pair(self, raw: RawChannel) -> tuple[Array, Array, Array]:
        """(before, after, seconds between) around each instant, NaN seconds where there is a gap."""
        key = id(raw)
        if key not in self._pairs:
            if len(raw.values) < 3:
                nothing = np.full(len(self.at), np.nan)
                self._pairs[key] = (nothing, nothing, nothing)
            else:
                first, at_first = self._places(raw, self.at - HALF)
                last, at_last = self._places(raw, self.at + HALF)
                same = last <= first
                last = np.where(same, np.minimum(first + 1, len(raw.values) - 1), last)
                at_last = self._time[last] if raw.rows is None else self._time[raw.rows[last]]
                width = at_last - at_first
                width = np.where((width > 0) & (width < 12.0), width, np.nan)
                self._pairs[key] = (raw.values[first], raw.values[last], width)
        return self._pairs[key]

    def long_rate(self, raw: RawChannel, half: float = 10.0) -> Array:
        """(n,) change a second over a long stretch: what late and coarse updates cannot hide."""
        if len(raw.values) < 3:
            return np.full(len(self.at), np.nan)
        first, at_first = self._places(raw, self.at - half)
        last, at_last = self._places(raw, self.at + half)
        width = at_last - at_first
        with np.errstate(invalid="ignore", divide="ignore"):
            return np.where((width > half) & (width < 3 * half), (raw.values[last] - raw.values[first]) / width, np.nan)

    def long_mean(self, raw: RawChannel, half: float = 10.0) -> Array:
        """(n,) mean of the figures over the same stretch."""
        total = np.zeros(len(self.at))
        for shift in np.linspace(-half, half, 11):
            place, _ = self._places(raw, self.at + shift)
            total += raw.values[place] if len(raw.values) else np.nan
        return total / 11.0

    def rate(self, raw: RawChannel, turn: float = 0.0) -> Array:
        """(n,) change a second, as written; `turn` is the full circle of an angle that wraps."""
        before, after, width = self.pair(raw)
        change = after - before
        if turn:
            change = (change + turn / 2) % turn - turn / 2
        with np.errstate(invalid="ignore"):
            return np.where(np.isfinite(change), change / width, np.nan)


def middle(values: Array) -> float:
    """Median of the finite ones, NaN if there are none."""
    finite = values[np.isfinite(values)]
    with np.errstate(over="ignore"):  # of two figures near 1e308 the middle is infinite, and so is told
        return float(np.median(finite)) if len(finite) else float("nan")


def slope(x: Array, y: Array) -> tuple[float, float, int]:
    """(slope of y on x through their means, correlation, how many instants)."""
    good = np.isfinite(x) & np.isfinite(y)
    count = int(np.count_nonzero(good))
    if count < 12:
        return float("nan"), 0.0, count
    a, b = x[good] - np.mean(x[good]), y[good] - np.mean(y[good])
    xx, yy, xy = float(a @ a), float(b @ b), float(a @ b)
    if xx <= 0.0 or yy <= 0.0:
        return float("nan"), 0.0, count
    return xy / xx, xy / float(np.sqrt(xx * yy)), count


def origin_slope(x: Array, y: Array) -> tuple[float, float, int]:
    """(slope of y on x through the origin, cosine between them, how many instants)."""
    good = np.isfinite(x) & np.isfinite(y)
    count = int(np.count_nonzero(good))
    xx, yy, xy = float(x[good] @ x[good]), float(y[good] @ y[good]), float(x[good] @ y[good])
    if count < 12 or xx <= 0.0 or yy <= 0.0:
        return float("nan"), 0.0, count
    # total least squares: noise on either side must not pull the ratio down
    return (yy / xx) ** 0.5 * (1.0 if xy >= 0 else -1.0), xy / float(np.sqrt(xx * yy)), count


def ratio_of(x: Array, y: Array) -> tuple[float, float, int]:
    """(median of y/x where x is large, share with the same sign less the share with the other, how many)."""
    size = np.abs(x)
    finite = np.isfinite(x) & np.isfinite(y)
    if np.count_nonzero(finite) < 30:
        return float("nan"), 0.0, 0
    large = finite & (size >= max(float(np.percentile(size[finite], 75)), 1e-9))
    share = y[large] / x[large]
    if len(share) < 12:
        return float("nan"), 0.0, len(share)
    return float(np.median(share)), float(np.mean(np.sign(share))), len(share)


def decide(distances: dict[str, float], close: float, apart: float) -> str | None:
    """The unit whose reading is close (in the logarithm) while the next is clearly further off."""
    ranked = sorted((abs(value), unit) for unit, value in distances.items() if np.isfinite(value))
    if not ranked or ranked[0][0] > close:
        return None
    if len(ranked) > 1 and ranked[1][0] - ranked[0][0] < apart:
        return None
    return ranked[0][1]
