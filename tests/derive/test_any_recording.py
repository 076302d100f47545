"""Whatever was recorded, at any rate, with whatever holes: a trace comes of it, in order and without infinities."""

from __future__ import annotations

import numpy as np
import pytest
from derive.flown import larkspur
from derive.logs import channel_of, make, only

from exceed.core.quantities import QUANTITIES
from exceed.core.recording import Recording
from exceed.derive.export import methods_of, trace_blocks
from exceed.derive.plan import build_trace, needed_channels

RECORDED = [name for name, row in QUANTITIES.items() if row.recorded]


def axis(rng: np.random.Generator) -> np.ndarray:
    """Even, jittered, random, or with gaps of up to eleven days."""
    count, step = int(rng.choice([0, 1, 2, 3, 10, 60, 400, 2000])), float(rng.choice([0.01, 0.125, 0.25, 1, 5, 20]))
    kind = rng.integers(0, 4)
    if kind == 0:
        time = np.arange(count) * step
    elif kind == 1:
        time = np.cumsum(rng.exponential(step, count))
    elif kind == 2:
        time = np.cumsum(np.where(rng.random(count) < 0.01, rng.uniform(1.0, 1e6, count), step))
    else:
        time = np.arange(count) * step + np.round(rng.normal(0.0, 0.001, count), 3) * step
    time = np.unique(time)
    return time - time[0] if len(time) else time


def values(name: str, count: int, rng: np.random.Generator) -> np.ndarray:
    row = QUANTITIES[name]
    low, high = (row.unit.to_si(limit) for limit in row.plausible)
    made = [
        rng.uniform(low, high, count), np.full(count, rng.uniform(low, high)), np.zeros(count), np.full(count, np.nan),
        np.cumsum(rng.normal(0.0, (high - low) / 1e4, count)), rng.normal(0.0, 1.0, count) * rng.choice([1, 10, 100]),
    ][rng.integers(0, 6)]  # fmt: skip
    if row.discrete:
        made = (made > (high + low) / 2).astype(float)
    if rng.random() < 0.5:
        made = np.where(rng.random(count) < rng.random(), np.nan, made)
    return made


def any_recording(seed: int) -> Recording:
    rng = np.random.default_rng(seed)
    time = axis(rng)
    channels = {}
    for name in rng.choice(RECORDED, rng.integers(1, 14), replace=False).tolist():
        every = int(rng.integers(1, 5)) if rng.random() < 0.3 else 1
        rows = None if every == 1 else np.arange(0, len(time), every, dtype=np.int64)
        channels[name] = channel_of(name, values(name, len(time[::every]), rng), rows, time)
    seams = ()
    if len(time) > 10 and rng.random() < 0.2:
        place = int(rng.integers(1, len(time) - 1))
        seams = ((float(time[place]), float(time[place + 1])),)
    return make(time, channels, clock=None if rng.random() < 0.5 else 1.9e9, seams=seams)


@pytest.mark.parametrize("batch", range(8))
def test_a_trace_comes_of_any_recording(batch: int) -> None:
    for seed in range(25 * batch, 25 * batch + 25):
        recording = any_recording(seed)
        aircraft = larkspur() if seed % 3 else None
        trace = build_trace(recording, aircraft, mass=900.0 if seed % 2 else None)
        rows = 0
        for block in trace_blocks(trace, size=500):
            rows += len(block.time)
            for name, found in block.values.items():
                assert not np.isinf(found).any(), (seed, name)
        assert rows == len(recording.time)
        assert len(methods_of(trace)) == len(trace.steps)
        last = -np.inf
        for flight in trace.track.flights:
            assert last <= flight.start <= flight.end, seed
            last = flight.end
            assert flight.landings >= 0, seed
            assert list(flight.touchdowns) == sorted(flight.touchdowns), seed
            assert all(flight.start <= when <= flight.end for when in flight.touchdowns), seed
        assert (np.diff(trace.track.phases.start) > 0).all(), seed
        for name in (*trace.steps, *trace.missing):
            assert (name in trace.steps) != (name in trace.missing), (seed, name)
        wanted = [sorted(QUANTITIES)[seed % len(QUANTITIES)]]
        pruned = only(recording, *needed_channels(wanted, recording.channels, aircraft))
        assert wanted[0] in {**build_trace(pruned, aircraft, quantities=wanted).steps, **trace.missing, **trace.steps}
