"""Recording: what was recorded, in SI, on the log's own instants, with the history of what was done to it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.int64]

# a gap is an interval above GAP_INTERVALS of the channel's own median interval and of at least GAP_LEAST seconds
GAP_INTERVALS = 2.5
GAP_LEAST = 0.5


def frozen(array: NDArray) -> NDArray:  # type: ignore[type-arg]
    """The same array, made read-only."""
    array.flags.writeable = False
    return array


@dataclass(frozen=True, slots=True)
class Figure:
    """A value that goes with its unit to the outputs (in SI here)."""

    value: float
    uncertainty: float | None = None


@dataclass(frozen=True, slots=True, eq=False)
class Channel:
    """One quantity as one column (or several sub-frame columns) recorded it, in SI.

    values : (k,) float64, NaN where a sample was rejected. rows : (k,) int64, strictly ascending places on the
    recording's time axis, or None where every instant has a sample. `cell = (value - offset) / scale` gives back the
    reading as written; `bias` (already taken off `values`) is part of `offset`.
    """

    quantity: str
    column: str
    values: Array
    rows: Index | None = None
    interval: float = 1.0
    unit: str = ""
    scale: float = 1.0
    offset: float = 0.0
    discrete: bool = False
    found_by: str = ""
    reason: str = ""
    sign: str | None = None
    datum: str | None = None
    bias: Figure | None = None
    standard_uncertainty: float | None = None
    uncertainty_source: str = ""
    resolution: float = 0.0
    noise: float | None = None
    saturation: tuple[float, float] = (-np.inf, np.inf)
    valid_share: float = 1.0
    notes: tuple[str, ...] = ()

    @property
    def gap(self) -> float:
        """An interval longer than this is a gap, s."""
        return max(GAP_INTERVALS * self.interval, GAP_LEAST)

    def cell(self, value: float) -> float:
        """The reading as the recorder wrote it, from the value in SI."""
        return (value - self.offset) / self.scale


@dataclass(frozen=True, slots=True)
class Rejected:
    """Samples that cannot be flight: `rows` are places on the time axis [first, last]."""

    quantity: str
    column: str
    start: float
    end: float
    samples: int
    reason: str  # spike, stuck, out_of_range, not_a_number, duplicate_time
    extreme: float | None
    rows: tuple[int, int]


@dataclass(frozen=True, slots=True)
class Unresolved:
    """A column that was not understood, and why; `question` is put to the user in a channels file."""

    column: str
    reason: str
    question: str = ""


@dataclass(frozen=True, slots=True)
class Clock:
    """How time was had. `start` is UTC seconds since 1970 at time 0, None where the clock is not absolute."""

    kind: str
    start: float | None = None
    resets: int = 0
    zone: str = ""
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class Recording:
    """A log as it was recorded.

    time : (n,) float64, s from the first sample, strictly ascending, one entry per row of the log that has a time,
    after unfolding sub-frames. `seams` are made-up stretches of the axis that part what a clock reset parts: they hold
    no time, and being longer than any gap nothing is ever interpolated across them.
    """

    path: str
    time: Array
    channels: Mapping[str, Channel]
    clock: Clock
    rows: int = 0
    sha256: str = ""
    content_sha256: str = ""
    facts: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))
    registration: str | None = None
    recorder_serial: str | None = None
    seams: tuple[tuple[float, float], ...] = ()
    unused: tuple[str, ...] = ()
    unresolved: tuple[Unresolved, ...] = ()
    rejected: tuple[Rejected, ...] = ()
    faulty: tuple[tuple[str, float, float, str], ...] = ()  # quantity, start, end, reason
    notes: tuple[str, ...] = ()
    status: str = "ok"  # ok or partial

    @property
    def duration(self) -> float:
        """Last minus first time, gaps included, seams left out, s."""
        if len(self.time) == 0:
            return 0.0
        return float(self.time[-1] - self.time[0]) - sum(end - start for start, end in self.seams)

    @property
    def interval(self) -> float:
        """Median interval of the axis, s."""
        return median_interval(self.time)

    def channel_time(self, channel: Channel) -> Array:
        """(k,) instants of a channel's samples, s."""
        return self.time if channel.rows is None else self.time[channel.rows]


def median_interval(time: Array) -> float:
    """Median spacing of instants, s; 1.0 where there is none."""
    if len(time) < 2:
        return 1.0
    spacing = np.diff(time)
    # a hundred thousand intervals settle a median; a partition of millions costs more than it tells
    return float(np.median(spacing[:: max(1, len(spacing) // 100_000)]))
