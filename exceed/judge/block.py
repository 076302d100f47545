"""Block: one stretch of a grid with its neighbours, evaluated once and looked at by every rule."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from exceed.core.intervals import Array
from exceed.core.recording import GAP_INTERVALS, GAP_LEAST
from exceed.core.trace import Grid, Trace

Mask = NDArray[np.bool_]

# samples on either side that a block sees beyond its own: crossings need one, the room between samples eight
HALO = 8
SIZE = 131072


def gap_of(grid: Grid) -> float:
    """An interval of a grid longer than this is a gap, s."""
    return max(GAP_INTERVALS * grid.interval, GAP_LEAST)


def neighbourhood(grid: Grid, start: int, stop: int) -> tuple[int, int]:
    """Grid places that a block must see beyond its own: HALO samples, and as far as a stretch may bridge a lost one."""
    gap = gap_of(grid)
    low = min(start - HALO, int(np.searchsorted(grid.time, grid.time[start] - gap)) - 1)
    high = max(stop + HALO, int(np.searchsorted(grid.time, grid.time[stop - 1] + gap)) + 1)
    return max(low, 0), min(high, len(grid.time))


class Block:
    """Values of quantities on grid places [start, stop) with a neighbourhood on either side.

    Everything is worked out when first asked for and kept, so that rules share it. `core` is the block's own part of
    every (n,) array, `offset` the grid place of element 0.
    """

    def __init__(
        self,
        trace: Trace,
        grid: Grid,
        start: int,
        stop: int,
        names: list[str],
        fixed: Mapping[str, float] | None = None,
    ) -> None:
        low, high = neighbourhood(grid, start, stop)
        self.trace = trace
        self.grid = grid
        self.offset = low
        self.whole = len(grid.time)
        self.core = slice(start - low, stop - low)
        self.time = grid.time[low:high]
        self.values = trace.evaluate(names, grid, low, high, fixed)
        self.seams: NDArray[np.int64] = np.empty(0, np.int64)
        self._kept: dict[object, object] = {}

    @classmethod
    def patched(
        cls,
        trace: Trace,
        grid: Grid,
        patches: list[tuple[int, int]],
        names: list[str],
        fixed: Mapping[str, float] | None = None,
    ) -> Block:
        """Several stretches [start, stop) of a grid as one block: what many short events need, at the price of one.

        No sample is linked to the next across patches; `core` is everything.
        """
        block = cls.__new__(cls)
        places = np.concatenate([np.arange(start, stop) for start, stop in patches])
        block.trace, block.grid, block.offset, block.whole = trace, grid, 0, len(grid.time)
        block.core = slice(0, len(places))
        block.time = grid.time[places]
        block.values = trace.evaluate_at(names, grid, places, fixed)
        block.seams = np.cumsum([stop - start for start, stop in patches])[:-1] - 1
        block._kept = {}
        return block

    def __len__(self) -> int:
        return len(self.time)

    @property
    def gap(self) -> float:
        return gap_of(self.grid)

    @property
    def linked(self) -> Mask:
        """(n - 1,) no gap between a sample and the next."""

        def find() -> Mask:
            spacing = np.diff(self.time)
            linked = (spacing > 0.0) & (spacing <= self.gap)
            linked[self.seams] = False
            return linked

        return self._keep("linked", find)  # type: ignore[no-any-return]

    @property
    def phase(self) -> NDArray[np.int8]:
        """(n,) codes of PHASES."""
        return self._keep("phase", lambda: self.trace.track.phases.at(self.time))  # type: ignore[no-any-return]

    @property
    def airborne(self) -> Mask:
        return self._keep("airborne", lambda: self.trace.track.airborne.contains(self.time))  # type: ignore[no-any-return]

    @property
    def flight(self) -> NDArray[np.int64]:
        """(n,) number of the flight, 0 outside any."""

        def find() -> NDArray[np.int64]:
            numbers = np.zeros(len(self.time), dtype=np.int64)
            for flight in self.trace.track.flights:
                if len(self.time) and flight.end >= np.min(self.time) and flight.start <= np.max(self.time):
                    numbers[(self.time >= flight.start) & (self.time <= flight.end)] = flight.number
            return numbers

        return self._keep("flight", find)  # type: ignore[no-any-return]

    @property
    def flight_edges(self) -> Mask:
        """(n,) the first sample of a flight, and the first after one."""

        def find() -> Mask:
            edges = np.zeros(len(self.time), dtype=bool)
            flight = self.flight
            edges[1:] = flight[1:] != flight[:-1]
            return edges

        return self._keep("flight edges", find)  # type: ignore[no-any-return]

    @property
    def flight_parts(self) -> list[tuple[int, slice]]:
        """(number, part of the core) for each flight that has a sample in the core."""

        def find() -> list[tuple[int, slice]]:
            time = self.time[self.core]
            parts = []
            for flight in self.trace.track.flights:
                if len(time) and flight.end >= time[0] and flight.start <= time[-1]:
                    low = int(np.searchsorted(time, flight.start, side="left"))
                    high = int(np.searchsorted(time, flight.end, side="right"))
                    if high > low:
                        parts.append((flight.number, slice(low, high)))
            return parts

        return self._keep("flight parts", find)  # type: ignore[no-any-return]

    @property
    def shares(self) -> Array:
        """(n, ) seconds that each sample of the block owns: half the interval to each neighbour, none of a gap."""

        def find() -> Array:
            spacing = np.diff(self.time)
            half = np.where(self.linked, 0.5 * spacing, 0.0)
            owned = np.zeros(len(self.time))
            owned[:-1] += half
            owned[1:] += half
            return owned

        return self._keep("shares", find)  # type: ignore[no-any-return]

    def too_slow(self, longest: float) -> Array:
        """(n,) the part of `shares` that lies in intervals longer than `longest` s (yet no gap)."""

        def find() -> Array:
            spacing = np.diff(self.time)
            half = np.where(self.linked & (spacing > longest), 0.5 * spacing, 0.0)
            owned = np.zeros(len(self.time))
            owned[:-1] += half
            owned[1:] += half
            return owned

        return self._keep(("slow", longest), find)  # type: ignore[no-any-return]

    def rate(self, name: str) -> Array:
        """(n,) rate of change per s by central differences; one-sided beside a gap; NaN for a lone sample."""

        def find() -> Array:
            values = self.values[name]
            spacing = np.diff(self.time)
            slope = np.where(self.linked, np.diff(values) / np.where(self.linked, spacing, 1.0), np.nan)
            before = np.concatenate([[np.nan], slope])
            after = np.concatenate([slope, [np.nan]])
            both = 0.5 * (before + after)
            return np.where(np.isfinite(both), both, np.where(np.isfinite(before), before, after))

        return self._keep(("rate", name), find)  # type: ignore[no-any-return]

    def keep(self, key: object, make):  # type: ignore[no-untyped-def]
        """The result of `make`, worked out once for this block."""
        return self._keep(key, make)

    def _keep(self, key: object, make):  # type: ignore[no-untyped-def]
        if key not in self._kept:
            self._kept[key] = make()
        return self._kept[key]
