"""How recording departs from the truth: sampling, place, bias, noise, steps, range, dropouts, spikes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from scenario.air import G0, Array
from scenario.flight import STEP, Flight


@dataclass(frozen=True, slots=True)
class Sensor:
    """How one channel is recorded. Everything in the channel's SI unit (load factors in g)."""

    rate_hz: float = 1.0
    phase_s: float = 0.0
    bias: float = 0.0
    noise: float = 0.0  # standard deviation
    step: float = 0.0  # resolution; 0 for none
    low: float = -np.inf
    high: float = np.inf
    position: tuple[float, float, float] | None = None  # of an accelerometer from the CG: forward, right, down, m
    dropouts: tuple[tuple[float, float], ...] = ()  # stretches (s) that come back empty
    spikes: tuple[tuple[float, float], ...] = ()  # (time in s, value): the nearest sample becomes the value


def accelerations_at(flight: Flight, position: tuple[float, float, float]) -> dict[str, Array]:
    """Load factors at a place off the CG, at 100 Hz: a + dw/dt x r + w x (w x r).

    Source: rigid-body kinematics, any mechanics textbook (from memory).
    """
    p, q, r = (flight[name] for name in ("roll_rate", "pitch_rate", "yaw_rate"))
    dp, dq, dr = (np.gradient(rate, STEP) for rate in (p, q, r))
    x, y, z = position
    forward = dq * z - dr * y + q * (p * y - q * x) - r * (r * x - p * z)
    right = dr * x - dp * z + r * (q * z - r * y) - p * (p * y - q * x)
    down = dp * y - dq * x + p * (r * x - p * z) - q * (q * z - r * y)
    return {
        "longitudinal_load_factor": flight["longitudinal_load_factor"] + forward / G0,
        "lateral_load_factor": flight["lateral_load_factor"] + right / G0,
        "load_factor": flight["load_factor"] - down / G0,
    }


ANGLES_ROUND = ("heading", "track_angle", "wind_direction")
STATES = ("gear_down", "airbrakes_out", "weight_on_wheels", "stall_warning")


def sample(
    flight: Flight, name: str, sensor: Sensor, seed: int, start: float = 0.0, end: float | None = None
) -> tuple[Array, Array]:
    """Sample a channel of a flight.

    Parameters: name of a truth channel; start, end: the recorder's first and last time in s of the flight.
    Returns: times in s of the flight, values in SI (NaN in dropouts), both (n,).
    """
    last = flight.time[-1] if end is None else end
    count = int(np.floor((last - start - sensor.phase_s) * sensor.rate_hz + 1e-9)) + 1
    time = start + sensor.phase_s + np.arange(count) / sensor.rate_hz
    truth = flight[name]
    if sensor.position is not None:
        truth = accelerations_at(flight, sensor.position)[name]
    if name in STATES:
        values = truth[np.clip(np.floor(time / STEP + 1e-6).astype(int), 0, len(truth) - 1)].copy()
        return time, _blanked(time, values, sensor)
    if name in ANGLES_ROUND:
        values = np.mod(np.interp(time, flight.time, np.unwrap(truth)), 2 * np.pi)
    elif name == "bank_angle":
        values = np.interp(time, flight.time, np.unwrap(truth))
        values = np.mod(values + np.pi, 2 * np.pi) - np.pi
    else:
        values = np.interp(time, flight.time, truth)
    rng = np.random.default_rng(seed)
    values = values + sensor.bias + sensor.noise * rng.standard_normal(count)
    for when, value in sensor.spikes:
        values[int(np.argmin(np.abs(time - when)))] = value
    values = np.clip(values, sensor.low, sensor.high)
    if sensor.step:
        values = np.round(values / sensor.step) * sensor.step
    return time, _blanked(time, values, sensor)


def _blanked(time: Array, values: Array, sensor: Sensor) -> Array:
    for begin, finish in sensor.dropouts:
        values[(time >= begin) & (time < finish)] = np.nan
    return values


def beyond(time: Array, values: Array, limit: float, *, above: bool = True) -> list[tuple[float, float, float, float]]:
    """Stretches beyond a limit as (start, end, peak, time of the peak), by linear crossings: the truth's yardstick."""
    sign = 1.0 if above else -1.0
    over = sign * (values - limit) > 0.0
    edges = np.flatnonzero(np.diff(over.astype(int)))
    found: list[tuple[float, float, float, float]] = []
    starts = [0] if over[0] else []
    starts += [int(i) + 1 for i in edges if not over[i]]
    for first in starts:
        after = first
        while after < len(over) and over[after]:
            after += 1
        begin = float(time[first])
        if first:
            begin = float(np.interp(0.0, sign * (values[first - 1 : first + 1] - limit), time[first - 1 : first + 1]))
        finish = float(time[after - 1])
        if after < len(over):
            part = -sign * (values[after - 1 : after + 1] - limit)
            finish = float(np.interp(0.0, part, time[after - 1 : after + 1]))
        top = first + int(np.argmax(sign * values[first:after]))
        found.append((begin, finish, float(values[top]), float(time[top])))
    return found
