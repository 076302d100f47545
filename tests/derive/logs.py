"""Recordings made by hand from the flight model's truth, for the tests of this folder."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from types import MappingProxyType

import numpy as np
from scenario.flight import Flight
from scenario.sensors import Sensor, sample

from exceed.core.quantities import QUANTITIES
from exceed.core.recording import Channel, Clock, Recording, frozen, median_interval

STATES = ("gear_down", "airbrakes_out", "weight_on_wheels", "stall_warning")


def recording_of(
    flight: Flight,
    sensors: Mapping[str, Sensor],
    *,
    start: float = 0.0,
    end: float | None = None,
    clock: float | None = None,
    path: str = "log.csv",
) -> Recording:
    """A recording of some truth channels; all rates must divide the greatest one."""
    rate = max(sensor.rate_hz for sensor in sensors.values())
    columns = {
        name: sample(flight, name, sensor, seed=7 + place, start=start, end=end)
        for place, (name, sensor) in enumerate(sensors.items())
    }
    fastest = next(name for name, sensor in sensors.items() if sensor.rate_hz == rate and sensor.phase_s == 0.0)
    axis = columns[fastest][0]
    channels = {}
    for name, sensor in sensors.items():
        every = round(rate / sensor.rate_hz)
        rows = None if every == 1 else np.arange(0, len(axis), every, dtype=np.int64)
        values = columns[name][1][: len(axis) if rows is None else len(rows)]
        channels[name] = channel_of(name, values, rows, axis)
    return make(axis - axis[0], channels, clock=clock, path=path)


def channel_of(name: str, values, rows=None, axis=None, **more) -> Channel:
    values = np.asarray(values, dtype=np.float64)
    time = np.arange(len(values), dtype=float) if axis is None else (axis if rows is None else axis[rows])
    row = QUANTITIES.get(name)
    about = {"unit": row.shown if row else "", "discrete": name in STATES} | more
    return Channel(name, name.upper(), frozen(values.copy()), rows, median_interval(time), **about)


def make(time, channels: Mapping[str, Channel], clock: float | None = None, path: str = "log.csv", **more) -> Recording:
    time = frozen(np.asarray(time, dtype=np.float64).copy())
    return Recording(path, time, MappingProxyType(dict(channels)), Clock("elapsed", clock), rows=len(time), **more)


def without(recording: Recording, *names: str) -> Recording:
    return replace(recording, channels={k: v for k, v in recording.channels.items() if k not in names})


def only(recording: Recording, *names: str) -> Recording:
    return replace(recording, channels={k: v for k, v in recording.channels.items() if k in names})
