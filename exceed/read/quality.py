"""What cannot be flight: rejected with its place and reason. What merely looks odd is kept and noted.

Real peaks look like spikes. A lone sample is rejected only if its neighbours agree with each other against it, if no
aeroplane moves so, and if the other channels show nothing; a touchdown's jolt, a short pull and a gust all stay.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from exceed.core.constants import STANDARD_GRAVITY
from exceed.core.quantities import QUANTITIES
from exceed.core.recording import Array
from exceed.read.measure import clipped_ends, noise_of

BLOCK = 1 << 16
_DEG = np.pi / 180.0
_MOST_ROWS = 500
# SI; of a quantity that only a file declares nothing is known but that no sensor reads this
_BEYOND_SENSE = 1e30

# how far a value can jump and come back within two sample intervals: constant + rate * interval, SI; and the longest
# interval at which that can be judged at all, s (common practice, no source: wide of what aerobatic aeroplanes do)
PHYSICS: dict[str, tuple[float, float, float]] = {
    "load_factor": (0.8, 0.0, 0.3),
    "longitudinal_load_factor": (0.8, 0.0, 0.3),
    "lateral_load_factor": (0.8, 0.0, 0.3),
    "bank_angle": (12.0 * _DEG, 200.0 * _DEG, 0.6),
    "pitch_angle": (8.0 * _DEG, 100.0 * _DEG, 0.6),
    "heading": (10.0 * _DEG, 150.0 * _DEG, 0.6),
    "track_angle": (20.0 * _DEG, 150.0 * _DEG, 0.6),
    "roll_rate": (60.0 * _DEG, 1500.0 * _DEG, 0.3),
    "pitch_rate": (40.0 * _DEG, 800.0 * _DEG, 0.3),
    "yaw_rate": (40.0 * _DEG, 800.0 * _DEG, 0.3),
    "angle_of_attack": (10.0 * _DEG, 200.0 * _DEG, 0.6),
    "indicated_airspeed": (12.0, 25.0, 1.1),
    "calibrated_airspeed": (12.0, 25.0, 1.1),
    "equivalent_airspeed": (12.0, 25.0, 1.1),
    "true_airspeed": (12.0, 25.0, 1.1),
    "ground_speed": (12.0, 25.0, 1.1),
    "mach": (0.05, 0.08, 1.1),
    "pressure_altitude": (40.0, 120.0, 1.1),
    "geometric_altitude": (60.0, 120.0, 1.1),
    "static_air_temperature": (6.0, 3.0, 2.1),
    "total_air_temperature": (6.0, 3.0, 2.1),
    "static_pressure": (500.0, 1500.0, 1.1),
    "flap_angle": (6.0 * _DEG, 15.0 * _DEG, 1.1),
}
_WRAPS = frozenset({"heading", "track_angle", "bank_angle", "longitude"})
_CLIPS = frozenset(
    {
        "load_factor",
        "longitudinal_load_factor",
        "lateral_load_factor",
        "roll_rate",
        "pitch_rate",
        "yaw_rate",
        "angle_of_attack",
        "indicated_airspeed",
    }
)
# a figure that does not change is stuck only if others say that it must have: for each quantity the seconds it has to
# last, the largest size of a figure that could be a true standstill (SI), and the companions' movements, all of a group
STUCK: dict[str, tuple[float, float, tuple[tuple[tuple[str, float], ...], ...]]] = {
    "load_factor": (10.0, np.inf, ((("bank_angle", 40.0 * _DEG),), (("pitch_rate", 8.0 * _DEG),))),
    "bank_angle": (10.0, np.inf, ((("roll_rate", 12.0 * _DEG),),)),
    "pitch_angle": (10.0, np.inf, ((("pitch_rate", 6.0 * _DEG), ("pressure_altitude", 60.0)),)),
    "roll_rate": (5.0, 2.0 * _DEG, ((("bank_angle", 20.0 * _DEG),),)),
    "pitch_rate": (5.0, 1.0 * _DEG, ((("pitch_angle", 10.0 * _DEG),),)),
    "indicated_airspeed": (20.0, np.inf, ((("pitch_angle", 12.0 * _DEG), ("pressure_altitude", 100.0)),)),
    "calibrated_airspeed": (20.0, np.inf, ((("pitch_angle", 12.0 * _DEG), ("pressure_altitude", 100.0)),)),
    "true_airspeed": (20.0, np.inf, ((("pitch_angle", 12.0 * _DEG), ("pressure_altitude", 100.0)),)),
    "angle_of_attack": (10.0, np.inf, ((("load_factor", 0.6),),)),
    "pressure_altitude": (30.0, np.inf, ((("vertical_speed", 5.0), ("pitch_angle", 8.0 * _DEG)),)),
}

Found = tuple[int, int, int, str, float | None]


@dataclass(slots=True, eq=False)
class Series:
    """A channel in SI on its own instants. `at` gives the instants (a function, so that none is made unasked)."""

    quantity: str
    values: Array
    at: Callable[[], Array]
    interval: float
    step: float
    discrete: bool = False

    def near(self, moment: float, reach: float) -> Array:
        """Finite values within `reach` of a moment."""
        when = self.at()
        first, last = np.searchsorted(when, (moment - reach, moment + reach))
        some = self.values[max(0, first - 1) : last + 1]
        return some[np.isfinite(some)]


@dataclass(slots=True)
class Checked:
    """rejected: (first, last, samples, reason, extreme), places among the channel's own samples."""

    rejected: list[Found] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    lost: int = 0
    noise: float | None = None
    saturation: tuple[float, float] = (-np.inf, np.inf)


def check(series: Series, sensor: tuple[float, float] | None, others: Mapping[str, Series]) -> Checked:
    """Judge one channel; its rejected samples become NaN in `series.values`.

    Parameters
    ----------
    series : the channel; its values must be writeable
    sensor : (low, high) of the sensor in SI where the aircraft file states it
    others : all channels of the log, to see what else moved
    """
    out = Checked()
    values = series.values
    if len(values) == 0 or series.discrete:
        return out
    _out_of_range(series, sensor, out)
    if not np.isfinite(values).any():
        out.lost = len(values)
        return out
    out.noise = noise_of(values)
    if sensor is not None:
        out.saturation = sensor
    if series.quantity in _CLIPS:
        low, high = clipped_ends(series.values, max(series.step, out.noise or 0.0, 1e-12))
        out.saturation = (max(low, out.saturation[0]), min(high, out.saturation[1]))
    if series.quantity in PHYSICS:
        _spikes(series, others, out)
    if series.quantity in STUCK:
        _stuck(series, others, out)
    if series.quantity == "load_factor" and series.interval > 0.26:
        out.notes.append(
            f"recorded every {series.interval:.3g} s: peaks shorter than about {4 * series.interval:.2g} s are "
            f"not sized"
        )
    out.lost = sum(samples for _, _, samples, _, _ in out.rejected)
    return out


def _reject(values: Array, mask_rows: NDArray[np.int64], reason: str, out: Checked, joined: bool = True) -> None:
    """Rows become NaN, listed run by run; beyond a few hundred runs the rest is one entry."""
    if len(mask_rows) == 0:
        return
    breaks = np.flatnonzero(np.diff(mask_rows) > 1) + 1 if joined else np.arange(1, len(mask_rows))
    groups = np.split(mask_rows, breaks)
    if len(groups) > _MOST_ROWS:
        groups = [*groups[: _MOST_ROWS - 1], np.concatenate(groups[_MOST_ROWS - 1 :])]
    for group in groups:
        figures = values[group]
        finite = figures[np.isfinite(figures)]
        extreme = float(finite[np.argmax(np.abs(finite))]) if len(finite) else None
        out.rejected.append((int(group[0]), int(group[-1]), len(group), reason, extreme))
    values[mask_rows] = np.nan


def _out_of_range(series: Series, sensor: tuple[float, float] | None, out: Checked) -> None:
    values = series.values
    low, high = float(np.min(values)), float(np.max(values))
    if not (np.isfinite(low) and np.isfinite(high)):
        _reject(values, np.flatnonzero(~np.isfinite(values)), "not_a_number", out)
        if not np.isfinite(values).any():
            return
        low, high = float(np.nanmin(values)), float(np.nanmax(values))
    row = QUANTITIES.get(series.quantity)
    bounds = (
        sorted((row.unit.to_si(row.plausible[0]), row.unit.to_si(row.plausible[1])))
        if row is not None
        else [-_BEYOND_SENSE, _BEYOND_SENSE]
    )
    if sensor is not None:
        # a sample at the end of the range, a step or a hundredth of it beyond, is clipped and stays
        slack = max(2 * series.step, 0.01 * (sensor[1] - sensor[0]))
        bounds = [max(bounds[0], sensor[0] - slack), min(bounds[1], sensor[1] + slack)]
    if low >= bounds[0] and high <= bounds[1]:
        return
    with np.errstate(invalid="ignore"):
        _reject(values, np.flatnonzero((values < bounds[0]) | (values > bounds[1])), "out_of_range", out)


def _difference(values: Array, wraps: bool) -> Array:
    steps = values[1:] - values[:-1]
    if wraps:
        steps = (steps + np.pi) % (2 * np.pi) - np.pi
    return steps


def _spikes(series: Series, others: Mapping[str, Series], out: Checked) -> None:
    constant, rate, longest = PHYSICS[series.quantity]
    if series.interval > longest or len(series.values) < 7:
        return
    values, wraps = series.values, series.quantity in _WRAPS
    least = max(constant + rate * series.interval, 10.0 * (out.noise or 0.0), 3 * series.step)
    candidates: list[int] = []
    for start in range(0, len(values) - 2, BLOCK):
        piece = values[max(0, start - 1) : start + BLOCK + 2]
        steps = _difference(piece, wraps)
        large = np.abs(steps) > least
        if not large.any():
            continue
        both = large[:-1] & large[1:] & (np.sign(steps[:-1]) != np.sign(steps[1:]))
        candidates += (np.flatnonzero(both) + max(0, start - 1) + 1).tolist()
    if len(candidates) > max(2000, 0.03 * len(values)):
        # lone errors are rare by nature: this is how the channel is
        out.notes.append(f"{len(candidates)} samples jump to and fro: too many for lone errors, all are kept")
        return
    found = [] if series.quantity.endswith("load_factor") else _at_the_ends(values, least, wraps)
    doubtful = 0
    if not candidates and not found:
        return
    when = series.at()
    for place in sorted(set(candidates)):
        verdict = _verdict(series, place, when, others, wraps)
        if verdict == "spike":
            found.append(place)
        elif verdict == "doubt":
            doubtful += 1
    _reject(values, np.array(found, np.int64), "spike", out, joined=False)
    if doubtful:
        out.notes.append(
            f"{doubtful} lone sample{'s' * (doubtful != 1)} far from {'their' if doubtful != 1 else 'its'} neighbours "
            f"{'are' if doubtful != 1 else 'is'} kept: nothing else shows that "
            f"{'they were' if doubtful != 1 else 'it was'} not flown"
        )


def _at_the_ends(values: Array, least: float, wraps: bool) -> list[int]:
    """First or last sample, far from the four beside it, which agree: there is but one neighbour to ask."""
    found = []
    for place, near in ((0, values[1:5]), (len(values) - 1, values[-5:-1])):
        off = np.append(near, values[place]) - near[0]
        if wraps:
            off = (off + np.pi) % (2 * np.pi) - np.pi
        size = abs(float(off[-1] - np.median(off[:-1])))
        if size > 3.0 * least and float(np.ptp(off[:-1])) < 0.1 * size:
            found.append(place)
    return found


def _verdict(series: Series, place: int, when: Array, others: Mapping[str, Series], wraps: bool) -> str:
    """spike, doubt (kept, noted) or flown."""
    values = series.values
    if place < 2 or place + 2 >= len(values):
        return "doubt"
    # the neighbours must be neighbours in time as well
    if when[place + 1] - when[place - 1] > 3.0 * series.interval:
        return "doubt"
    around = values[max(0, place - 4) : place + 5] - values[place - 1]
    if wraps:
        around = (around + np.pi) % (2 * np.pi) - np.pi
    middle = min(4, place)
    lone = around[middle]
    near = np.delete(around, middle)
    near = near[np.isfinite(near)]
    if len(near) < 4:
        return "doubt"
    base = float(np.median(near))
    size = float(lone - base)
    # a flown peak, however short, lifts at least one neighbour; a spike leaves both where the rest is
    left, right = float(around[middle - 1] - base), float(around[middle + 1] - base)
    if max(abs(left), abs(right)) > 0.1 * abs(size):
        return "flown"
    # in rough air the rest is scattered as well
    scatter = 1.4826 * float(np.median(np.abs(near - base)))
    if abs(size) < 8.0 * scatter:
        return "flown"
    if series.quantity.endswith("load_factor"):
        return _load_verdict(series, float(when[place]), size, others)
    return "spike"


def _load_verdict(series: Series, moment: float, size: float, others: Mapping[str, Series]) -> str:
    """A jolt of the accelerometer: an impact on the ground is real, and so is what the attitude confirms."""
    if _near_ground(moment, others, abs(size)):
        return "doubt"
    if series.quantity != "load_factor":
        return "spike" if series.interval <= 0.15 and abs(size) > 2.0 else "doubt"
    speed = next(
        (others[name] for name in ("true_airspeed", "calibrated_airspeed", "indicated_airspeed") if name in others),
        None,
    )
    fast = 60.0
    if speed is not None:
        there = speed.near(moment, 2 * speed.interval + 0.5)
        if len(there):
            fast = max(25.0, float(np.median(there)))
    # the pitch rate that so much load factor takes at this speed
    expected = STANDARD_GRAVITY * abs(size) / fast
    seen = False
    rate = others.get("pitch_rate")
    if rate is not None and rate.interval <= 2.1 * series.interval:
        there = rate.near(moment, 2 * rate.interval)
        if len(there) >= 3:
            seen = True
            if float(np.ptp(there)) > 0.25 * expected:
                return "flown"
    pitch = others.get("pitch_angle")
    if pitch is not None and pitch.interval <= 2.1 * series.interval:
        there = pitch.near(moment, 2 * pitch.interval)
        if len(there) >= 3:
            seen = True
            if float(np.ptp(there)) > 0.25 * expected * 2 * series.interval + 0.3 * _DEG:
                return "flown"
    if seen:
        return "spike"
    # alone, only a jump that no aeroplane can make within two intervals of an eighth of a second
    return "spike" if series.interval <= 0.15 and abs(size) > 2.5 else "doubt"


def _near_ground(moment: float, others: Mapping[str, Series], size: float) -> bool:
    """Could it be a landing's impact?"""
    wheels = others.get("weight_on_wheels")
    if wheels is not None:
        return bool(np.any(wheels.near(moment, 4.0) > 0.5))
    radio = others.get("height_above_ground")
    if radio is not None:
        there = radio.near(moment, 4.0)
        return len(there) == 0 or bool(np.min(there) < 30.0)
    height = others.get("pressure_altitude") or others.get("geometric_altitude")
    if height is not None:
        there = height.near(moment, 4.0)
        if len(there):
            # aerodromes differ in height: the lowest of the log, and ten minutes around, with 100 m to spare
            around = height.near(moment, 600.0)
            return bool(np.min(there) < min(float(np.nanmin(height.values)) + 100.0, float(np.min(around)) + 100.0))
    speed = others.get("indicated_airspeed") or others.get("ground_speed")
    if speed is not None:
        there = speed.near(moment, 4.0)
        return len(there) == 0 or bool(
            np.median(there) < 0.6 * float(np.nanpercentile(speed.values[:: max(1, len(speed.values) // 5000)], 90))
        )
    return size < 6.0


def _stuck(series: Series, others: Mapping[str, Series], out: Checked) -> None:
    """The very same figure for long, from a channel that is otherwise seldom still, while others say that it moved."""
    values = series.values
    lasting, still, groups = STUCK[series.quantity]
    groups = tuple(group for group in groups if all(name in others for name, _ in group))
    long = int(max(lasting / max(series.interval, 1e-6), 20))
    if len(values) < 3 * long or not groups or np.nanmin(values) == np.nanmax(values):
        return
    # a stretch longer than twice the spacing of these probes shows equal figures at two of them
    step = max(1, long // 2)
    probes = values[::step]
    spans: list[tuple[int, int]] = []
    for place in np.flatnonzero(probes[1:] == probes[:-1]).tolist():
        first, last = place * step, min((place + 1) * step, len(values) - 1)
        if (spans and first <= spans[-1][1]) or not np.all(values[first : last + 1] == values[first]):
            continue
        # the run's ends, looked for a stretch at a time
        while first > 0 and values[first - 1] == values[first]:
            first -= 1
        while last + 1 < len(values) and values[last + 1] == values[last]:
            last += 1
        spans.append((first, last))
    if not spans:
        return
    usual = _usual_run(values)
    when = series.at()
    for first, last in spans:
        if last - first < max(long, 20 * usual) or abs(float(values[first])) > still:
            continue
        begin, end = float(when[first]), float(when[last])
        if any(all(_moved(others[name], begin, end) > least for name, least in group) for group in groups):
            _reject(values, np.arange(first + 1, last + 1), "stuck", out)


def _moved(other: Series, begin: float, end: float) -> float:
    """Range of a companion within a stretch."""
    first, last = np.searchsorted(other.at(), (begin, end))
    there = other.values[first:last]
    there = there[np.isfinite(there)]
    return float(np.ptp(there)) if len(there) > 3 else 0.0


def _usual_run(values: Array) -> float:
    """How many samples in a row are usually equal (99 of 100 runs are shorter)."""
    some = values[: 1 << 16]
    changes = np.flatnonzero(some[1:] != some[:-1])
    return float(np.percentile(np.diff(changes), 99)) if len(changes) > 2 else float(len(some))
