"""A recording seen once a second: what whole-log decisions (flights, phases, datum, mass) are made from.

Each cell is a second that holds at least one row of the axis, so gaps and seams cost nothing, however long. A channel
costs one pick a cell; only the accelerometer is read in full, for the statistics of each second.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from exceed.core.recording import Array, Channel, Index, Recording

CELL = 1.0
# a reading stands for this long where the channel is slow, at least
HOLD = 3.0


@dataclass(frozen=True, slots=True, eq=False)
class Cells:
    """Statistics of a channel over each cell, (m,) each; NaN where it has no sample there."""

    mean: Array
    low: Array
    high: Array
    count: Array


@dataclass(frozen=True, slots=True, eq=False)
class Coarse:
    """The cells of a recording: `time` (m,) s of the first row of each cell, `first` (m,) its row."""

    recording: Recording
    time: Array
    first: Index
    _picked: dict[str, Array] = field(default_factory=dict)
    _counted: dict[str, Cells] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.time)

    def has(self, name: str) -> bool:
        """Is there a channel of the quantity with any reading in the cells?"""
        return name in self.recording.channels and bool(np.isfinite(self.pick(name)).any())

    def pick(self, name: str) -> Array:
        """(m,) reading of a channel at each cell, the one before held where the cell has none; NaN if none is near."""
        if name not in self._picked:
            channel = self.recording.channels.get(name)
            self._picked[name] = np.full(len(self), np.nan) if channel is None else self._pick(channel)
        return self._picked[name]

    def _pick(self, channel: Channel) -> Array:
        if len(channel.values) == 0 or len(self) == 0:
            return np.full(len(self), np.nan)
        if channel.rows is None:
            values = channel.values[self.first].copy()
            when = self.time
        else:
            # a cell's first sample may come a few rows after its first row: look as far as the next cell
            following = np.append(self.first[1:], len(self.recording.time)) - 1
            place = np.searchsorted(channel.rows, following, side="right") - 1
            early = np.searchsorted(channel.rows, self.first, side="left")
            place = np.where(early <= place, early, place)
            place = np.maximum(place, 0)
            when = self.recording.time[channel.rows[place]]
            values = channel.values[place].copy()
        age = np.abs(self.time - when)
        values[age > max(HOLD, channel.gap)] = np.nan
        return _held(values, self.time, max(HOLD, channel.gap))

    def statistics(self, name: str) -> Cells:
        """Mean, least and greatest of each cell's own samples."""
        if name not in self._counted:
            self._counted[name] = self._count(name)
        return self._counted[name]

    def _count(self, name: str) -> Cells:
        channel = self.recording.channels[name]
        last = len(self.recording.time)
        starts, stops = self.first, np.append(self.first[1:], last)
        if channel.rows is not None:
            starts = np.searchsorted(channel.rows, starts, side="left")
            stops = np.searchsorted(channel.rows, stops, side="left")
        values = channel.values
        good = np.isfinite(values)
        some = np.flatnonzero(stops > starts)
        shape = len(self)
        mean, low, high, count = (np.full(shape, np.nan) for _ in range(4))
        if len(some) == 0:
            return Cells(mean, low, high, np.zeros(shape))
        # cells are contiguous, so the starts of the filled ones part the samples exactly
        at = starts[some]
        every = bool(good.all())
        clean = values if every else np.where(good, values, 0.0)
        number = (stops - starts)[some].astype(np.float64) if every else np.add.reduceat(good.astype(np.float64), at)
        total = np.add.reduceat(clean, at)
        with np.errstate(divide="ignore", invalid="ignore"):
            mean[some] = total / number
        least = np.minimum.reduceat(clean if every else np.where(good, values, np.inf), at)
        most = np.maximum.reduceat(clean if every else np.where(good, values, -np.inf), at)
        low[some] = np.where(number > 0, least, np.nan)
        high[some] = np.where(number > 0, most, np.nan)
        count[:] = 0.0
        count[some] = number
        return Cells(mean, low, high, count)

    def part(self, start: float, end: float) -> slice:
        """The cells whose first rows lie in [start, end)."""
        low, high = np.searchsorted(self.time, [start, end])
        return slice(int(low), int(high))

    def median_near(self, values: Array, when: float, within: float) -> float:
        """Median of readings within `within` s of an instant; NaN if there are none."""
        near = values[self.part(when - within, when + within)]
        near = near[np.isfinite(near)]
        return float(np.median(near)) if len(near) else float("nan")

    def slope(self, values: Array, half: float = 5.0) -> Array:
        """(m,) rate of change over `half` seconds to either side; NaN where there is nothing to compare."""
        if len(self) < 2:
            return np.full(len(self), np.nan)
        left, right = self.window(half)
        span = self.time[right] - self.time[left]
        rise = values[right] - values[left]
        fits = (span > 0.0) & (span <= 4.0 * half)
        return np.where(fits, np.divide(rise, span, out=np.full(len(self), np.nan), where=fits), np.nan)

    def window(self, half: float) -> tuple[Index, Index]:
        """First and last cell within `half` seconds of each cell, at least its neighbours."""
        own = np.arange(len(self))
        left = np.searchsorted(self.time, self.time - half, side="left")
        right = np.searchsorted(self.time, self.time + half, side="right") - 1
        left = np.where(left == own, np.maximum(own - 1, 0), left)
        right = np.where(right == own, np.minimum(own + 1, len(self) - 1), right)
        return left, right

    def spread(self, values: Array, half: float) -> Array:
        """(m,) greatest minus least over `half` seconds to either side (NaN readings left out)."""
        left, right = self.window(half)
        reach = int(np.max(right - left)) if len(self) else 0
        own = np.arange(len(self))
        low, high = values.copy(), values.copy()
        for step in range(-reach, reach + 1):
            place = own + step
            inside = (place >= left) & (place <= right)
            other = values[np.clip(place, 0, len(self) - 1)]
            low = np.where(inside, np.fmin(low, other), low)
            high = np.where(inside, np.fmax(high, other), high)
        return high - low

    @property
    def step(self) -> Array:
        """(m,) s that each cell stands for: to the next one, at most a few seconds."""
        if len(self) == 0:
            return np.empty(0)
        last = self.recording.interval
        step: Array = np.minimum(np.append(np.diff(self.time), last), max(3.0, 2.5 * last))
        return step


def coarse_of(recording: Recording) -> Coarse:
    """The cells of a recording."""
    time = recording.time
    if len(time) == 0:
        return Coarse(recording, np.empty(0), np.empty(0, dtype=np.int64))
    if recording.interval >= CELL:
        first = np.arange(len(time), dtype=np.int64)
        return Coarse(recording, time, first)
    cell = np.floor((time - time[0]) / CELL)
    first = np.concatenate([[0], np.flatnonzero(cell[1:] != cell[:-1]) + 1]).astype(np.int64)
    return Coarse(recording, time[first], first)


def _held(values: Array, time: Array, longest: float) -> Array:
    """Missing readings take the one before, where that is not older than `longest` s."""
    missing = ~np.isfinite(values)
    if not missing.any():
        return values
    place = np.where(missing, -1, np.arange(len(values)))
    place = np.maximum.accumulate(place)
    known = place >= 0
    source = np.maximum(place, 0)
    fresh = known & (time - time[source] <= longest)
    return np.where(missing & fresh, values[source], values)
