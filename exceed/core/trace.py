"""Trace: a recording with every way to have its derived quantities, evaluated on demand, block by block.

A trace holds no derived samples. It holds *steps* (one chosen method a quantity) and works them out on the stretch
that is asked for, with as much neighbourhood as the steps reach. So a log of any length is judged in cache-sized
blocks, a page can draw one stretch later, and both see the same numbers.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from exceed.core.phases import FlightTrack
from exceed.core.quantities import QUANTITIES
from exceed.core.recording import Array, Channel, Index, Recording

TIME = "time"
# a slower continuous input is interpolated over at most two of its own intervals (and a tenth, for jitter)
BRIDGE = 2.1
# neighbourhoods are worked out together only if so many seconds lie between them: longer than any gap a step bridges
APART = 120.0


@dataclass(frozen=True, slots=True)
class Step:
    """One chosen way to one quantity.

    inputs : parameter name -> quantity (or "time", or "recorded:QUANTITY" for the channel beneath a correction).
    facts : parameter name -> aircraft fact, bound. reach : s on either side that the function looks at; 0 means sample
    by sample. uncertainty : the method's own standard uncertainty in SI, besides what its inputs bring. one_sided : the
    value is a bound by construction, so it can never clear a limit (a level turn's 1/cos Φ). cap : highest certainty.
    main : the inputs whose samples are the method's own; the others only correct them and are interpolated onto these
    (none named: all). spread : a function of the same parameters that gives the method's own standard uncertainty
    sample by sample, where it is not the same everywhere.
    """

    quantity: str
    method: str
    function: Callable[..., Any] | None
    inputs: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))
    facts: Mapping[str, Any] = field(default_factory=lambda: MappingProxyType({}))
    reach: float = 0.0
    assumes: str | None = None
    uncertainty: float = 0.0
    one_sided: bool = False
    cap: str | None = None
    constant: float | None = None
    source: str = ""
    main: tuple[str, ...] = ()
    spread: Callable[..., Any] | None = None


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """The instants a rule runs at: those of the fastest channel its quantities use. rows is None for every instant."""

    rows: Index | None
    time: Array
    interval: float
    channel: str

    def axis_row(self, position: int) -> int:
        """Place on the recording's axis of a place on the grid."""
        return int(position if self.rows is None else self.rows[position])


@dataclass(frozen=True, slots=True)
class FlightMass:
    """Masses of one flight, kg; `zero_fuel` and the centres of gravity (m, by the same words) where they are known."""

    flight: int
    take_off: float
    landing: float
    method: str
    zero_fuel: float | None = None
    centre_of_gravity: Mapping[str, float] = field(default_factory=lambda: MappingProxyType({}))


@dataclass(frozen=True, slots=True, eq=False)
class Trace:
    """A recording, the steps to everything that can be had, and what the first pass found.

    channels : the recording's channels after the first pass (datum corrected), and the whole-log series it made (mass,
    centre of gravity, ...). missing : quantity -> why it cannot be had. spans : quantity -> (low, high) in SI where the
    value is only known as a range (an unknown mass); the step then holds the one that is conservative for most uses.
    masses : of each flight, where they are known.
    """

    recording: Recording
    channels: Mapping[str, Channel]
    steps: Mapping[str, Step]  # in an order in which each step's inputs come before it
    track: FlightTrack
    missing: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))
    spans: Mapping[str, tuple[float, float]] = field(default_factory=lambda: MappingProxyType({}))
    notes: tuple[str, ...] = ()
    masses: tuple[FlightMass, ...] = ()
    _grids: dict[str, Grid] = field(default_factory=dict)

    def has(self, name: str) -> bool:
        return name == TIME or name in self.steps

    def closure(self, names: Iterable[str]) -> set[str]:
        """The quantities that these rest on, themselves included."""
        found: set[str] = set()
        todo = list(names)
        while todo:
            name = todo.pop()
            if name == TIME or name.startswith("recorded:") or name in found:
                continue
            found.add(name)
            todo.extend(self.steps[name].inputs.values())
        return found

    def leaves(self, names: Iterable[str], main_only: bool = False) -> set[str]:
        """Names of the channels that these rest on; `main_only` leaves out those that only correct."""
        found: set[str] = set()
        seen: set[str] = set()
        todo = list(names)
        while todo:
            name = todo.pop()
            if name == TIME or name in seen:
                continue
            seen.add(name)
            if name.startswith("recorded:"):
                found.add(name.removeprefix("recorded:"))
                continue
            step = self.steps[name]
            if step.function is None and step.constant is None:
                found.add(name)
            todo.extend(step.main if main_only and step.main else step.inputs.values())
        return found

    def reach(self, name: str) -> float:
        """How far the value at an instant looks to either side, all its inputs included, s."""
        if name == TIME or name.startswith("recorded:"):
            return 0.0
        step = self.steps[name]
        return step.reach + max((self.reach(value) for value in step.inputs.values()), default=0.0)

    def smoothing(self, name: str) -> float:
        """How far to either side a value is smoothed over, s: an excursion shorter than that is not seen whole.

        What only corrects a value (an accelerometer moved by differentiated rates) smooths nothing of it.
        """
        if name == TIME or name.startswith("recorded:"):
            return 0.0
        step = self.steps[name]
        if step.main:
            return max((self.smoothing(source) for source in step.main if source in self.steps), default=0.0)
        return step.reach + max((self.smoothing(source) for source in step.inputs.values()), default=0.0)

    def grid(self, names: Iterable[str]) -> Grid:
        """The instants of the fastest channel that these quantities use (of equally fast ones the first by name)."""
        leaves = self.leaves(names, main_only=True)
        if not leaves:
            return self._grid_of("")

        def order(name: str) -> tuple[float, bool, str]:
            channel = self.channels[name]
            return round(channel.interval, 6), channel.discrete, name

        return self._grid_of(min(leaves, key=order))

    def _grid_of(self, name: str) -> Grid:
        rows = self.channels[name].rows if name else None
        key = name if rows is not None else ""
        if key not in self._grids:
            time = self.recording.time if rows is None else self.recording.time[rows]
            interval = self.channels[name].interval if name else self.recording.interval
            self._grids[key] = Grid(rows, time, interval, name)
        return self._grids[key]

    def evaluate(
        self,
        names: Iterable[str],
        grid: Grid,
        start: int = 0,
        stop: int | None = None,
        fixed: Mapping[str, float] | None = None,
        shifted: Mapping[str, float] | None = None,
    ) -> dict[str, Array]:
        """Values of quantities on grid places [start, stop). SI, NaN where not known.

        fixed : quantity -> a constant to take instead of its step. shifted : channel -> added to its samples (for
        uncertainty by finite differences).
        """
        names = list(names)
        stop = len(grid.time) if stop is None else min(stop, len(grid.time))
        reach = max((self.reach(name) for name in names), default=0.0)
        low, high = start, stop
        if reach > 0.0 and stop > start:
            low = int(np.searchsorted(grid.time, grid.time[start] - reach, side="left"))
            high = int(np.searchsorted(grid.time, grid.time[stop - 1] + reach, side="right"))
        values = self._work_out(names, grid, slice(low, high), fixed or {}, shifted or {})
        if (low, high) == (start, stop):
            return {name: values[name] for name in names}
        return {name: values[name][start - low : stop - low] for name in names}

    def evaluate_at(
        self,
        names: Iterable[str],
        grid: Grid,
        places: NDArray[np.int64],
        fixed: Mapping[str, float] | None = None,
        shifted: Mapping[str, float] | None = None,
    ) -> dict[str, Array]:
        """Values at scattered grid places (k,), ascending or not.

        Where a step reaches beyond the sample, each place is worked out with its own neighbourhood; all neighbourhoods
        go through together, parted by more time than any step bridges.
        """
        names = list(names)
        near = [name for name in names if self.reach(name) == 0.0]
        far = [name for name in names if self.reach(name) > 0.0]
        found: dict[str, Array] = {}
        if near:
            values = self._work_out(near, grid, places, fixed or {}, shifted or {})
            found = {name: values[name] for name in near}
        if far and len(places):
            around = neighbourhoods(grid.time, places, max(self.reach(name) for name in far))
            values = self._work_out(far, grid, around, fixed or {}, shifted or {})
            at = np.searchsorted(around, places)
            found.update({name: values[name][at] for name in far})
        else:
            found.update({name: np.empty(0) for name in far})
        return found

    def uncertainty_at(self, name: str, grid: Grid, places: NDArray[np.int64]) -> Array:
        """Standard uncertainty of a quantity at scattered places, (k,) in SI.

        Each channel is moved by its own standard uncertainty and the changes are added in quadrature (GUM 5.1.2, with
        5.1.3's note on numerical evaluation); methods' own uncertainties are added where they enter. [JCGM-100]
        """
        base = self.evaluate_at([name], grid, places)[name]
        total = np.zeros(len(places))
        for leaf in self.leaves([name]):
            step = self.channels[leaf].standard_uncertainty
            if not step or self.channels[leaf].discrete:
                continue
            moved = self.evaluate_at([name], grid, places, shifted={leaf: step})[name]
            change = np.abs(moved - base)
            total += np.where(np.isfinite(change), change, 0.0) ** 2
        for inner in self.closure([name]):
            own = self._own_uncertainty(inner, grid, places)
            most = float(np.max(own, initial=0.0))
            if most <= 0.0:
                continue
            if inner == name:
                total += own**2
            else:
                moved = self.evaluate_at([name], grid, places, shifted={f"step:{inner}": most})[name]
                change = np.abs(moved - base) * own / most
                total += np.where(np.isfinite(change), change, 0.0) ** 2
        return np.sqrt(total)

    def _own_uncertainty(self, name: str, grid: Grid, places: NDArray[np.int64]) -> Array:
        """(k,) a step's own standard uncertainty at places, besides what its inputs bring."""
        step = self.steps[name]
        own = np.full(len(places), step.uncertainty)
        if step.spread is None:
            return own
        if len(places) == 0:
            return own
        around = neighbourhoods(grid.time, places, self.reach(name))
        needed = [source for source in step.inputs.values() if source != TIME and not source.startswith("recorded:")]
        values = self._work_out(needed, grid, around, {}, {}) if needed else {TIME: grid.time[around]}
        arguments: dict[str, Any] = dict(step.facts)
        for parameter, source in step.inputs.items():
            if source.startswith("recorded:"):
                arguments[parameter] = self._channel(source[9:], grid, around, grid.time[around], {})
            else:
                arguments[parameter] = values[source]
        found = np.broadcast_to(np.asarray(step.spread(**arguments), dtype=np.float64), around.shape)
        spread = np.abs(found[np.searchsorted(around, places)])
        total: Array = np.hypot(own, np.where(np.isfinite(spread), spread, 0.0))
        return total

    def _work_out(
        self,
        names: list[str],
        grid: Grid,
        places: slice | NDArray[np.int64],
        fixed: Mapping[str, float],
        shifted: Mapping[str, float],
    ) -> dict[str, Array]:
        time = grid.time[places]
        values: dict[str, Array] = {TIME: time}
        needed = self.closure(names)
        for name, step in self.steps.items():
            if name not in needed:
                continue
            if name in fixed:
                values[name] = np.full(len(time), fixed[name])
                continue
            if step.constant is not None:
                values[name] = np.full(len(time), step.constant)
            elif step.function is None:
                values[name] = self._channel(name, grid, places, time, shifted)
            else:
                arguments: dict[str, Any] = dict(step.facts)
                for parameter, source in step.inputs.items():
                    if source.startswith("recorded:"):
                        arguments[parameter] = self._channel(source[9:], grid, places, time, shifted)
                    else:
                        arguments[parameter] = values[source]
                result = np.asarray(step.function(**arguments), dtype=np.float64)
                values[name] = result if result.shape == time.shape else np.broadcast_to(result, time.shape)
            if f"step:{name}" in shifted:
                values[name] = values[name] + shifted[f"step:{name}"]
        return values

    def _channel(
        self, name: str, grid: Grid, places: slice | NDArray[np.int64], time: Array, shifted: Mapping[str, float]
    ) -> Array:
        channel = self.channels[name]
        if channel.rows is grid.rows:
            values = channel.values[places]
        else:
            values = between_samples(self.recording.time, channel, time)
        return values + shifted[name] if name in shifted else values


def neighbourhoods(time: Array, places: NDArray[np.int64], reach: float) -> NDArray[np.int64]:
    """Ascending places of all samples within `reach` s of any of the given ones.

    Two neighbourhoods with less than APART s between them become one: so where samples are left out, the step in time
    is longer than any gap, and no function joins what is not joined.
    """
    centres = np.unique(places)
    low = np.searchsorted(time, time[centres] - reach, side="left")
    high = np.searchsorted(time, time[centres] + reach, side="right")
    apart = time[low[1:]] - time[high[:-1] - 1] > APART
    starts = low[np.concatenate([[True], apart])]
    stops = high[np.concatenate([apart, [True]])]
    return np.concatenate([np.arange(start, stop) for start, stop in zip(starts, stops, strict=True)])


def between_samples(axis: Array, channel: Channel, at: Array) -> Array:
    """A channel at any instants: (n,) values, NaN where it has none.

    Continuous ones are interpolated over at most two of their own intervals, angles the short way round, states held
    until the next sample; nothing reaches across a gap. Beyond its last sample before a gap a channel holds for one
    interval. axis (m,) s; at (n,) s ascending or scattered.
    """
    source = axis if channel.rows is None else axis[channel.rows]
    count = len(source)
    if count == 0 or len(at) == 0:
        return np.full(len(at), np.nan)
    low = max(int(np.searchsorted(source, np.min(at), side="right")) - 2, 0)
    high = min(int(np.searchsorted(source, np.max(at), side="left")) + 2, count)
    source, values = source[low:high], channel.values[low:high]
    right = np.searchsorted(source, at, side="left")
    after = np.minimum(right, len(source) - 1)
    before = np.maximum(right - 1, 0)
    exact = source[after] == at
    span = source[after] - source[before]
    inside = (right > 0) & (right < len(source))
    hold = 1.05 * channel.interval
    if channel.discrete:
        fits = inside & (span <= channel.gap)
        result = np.where(fits | (at - source[before] <= hold), values[before], np.nan)
        result = np.where(right == 0, np.where(source[0] - at <= hold, values[0], np.nan), result)
    else:
        bridged = inside & (span <= BRIDGE * channel.interval)
        share = np.divide(at - source[before], span, out=np.zeros(len(at)), where=span > 0)
        change = values[after] - values[before]
        if _wraps(channel.quantity):
            change = (change + np.pi) % (2.0 * np.pi) - np.pi
        result = np.where(bridged, values[before] + share * change, np.nan)
        stale = ~bridged & (right > 0) & (at - source[before] <= hold)
        early = ~bridged & ~stale & (right < len(source)) & (source[after] - at <= hold)
        result = np.where(stale, values[before], np.where(early, values[after], result))
    return np.where(exact, values[after], result)


def _wraps(name: str) -> bool:
    row = QUANTITIES.get(name)
    return row is not None and row.sort == "angle"
