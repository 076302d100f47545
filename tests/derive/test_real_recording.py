"""Derived quantities against what a real aeroplane's own systems reported (see tests/data/real/SOURCES.md)."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path

import numpy as np
import pyarrow.csv
from derive.logs import channel_of, make, without

from exceed.core.phases import PHASES
from exceed.core.recording import Recording
from exceed.derive.plan import build_trace

KT, FT, DEG = 1852 / 3600, 0.3048, np.pi / 180
COLUMNS = {
    "IAS": ("indicated_airspeed", KT),
    "altitude": ("pressure_altitude", FT),
    "TAS": ("true_airspeed", KT),
    "Mach": ("mach", 1.0),
    "roll": ("bank_angle", DEG),
    "track": ("track_angle", DEG),
    "track_rate": ("turn_rate", DEG),
    "vertical_rate": ("vertical_speed", FT / 60),
}


@lru_cache(maxsize=1)
def recording() -> Recording:
    table = pyarrow.csv.read_csv(Path(__file__).parents[1] / "data" / "real" / "parabolas.csv.gz")
    time = np.array(table["timestamp"].to_numpy(), dtype=float) / 1000.0
    time -= time[0]
    channels = {
        name: channel_of(name, np.array(table[column].to_numpy(), dtype=float) * factor, None, time)
        for column, (name, factor) in COLUMNS.items()
    }
    return make(time, channels)


def derived(*dropped: str) -> tuple[dict[str, np.ndarray], dict[str, str], np.ndarray]:
    trace = build_trace(without(recording(), *dropped))
    names = ("load_factor", "bank_angle", "mach")
    values = trace.evaluate(names, trace.grid(["pressure_altitude"]))
    return values, {name: trace.steps[name].method for name in names}, trace.track.phases.at(recording().time)


def stretches(mask: np.ndarray, least: float) -> list[tuple[float, float]]:
    edges = np.flatnonzero(np.diff(np.concatenate([[0], mask.astype(int), [0]]))).reshape(-1, 2)
    return [(float(a), float(b)) for a, b in edges if b - a >= least]  # one row a second


def test_parabolas_show_near_nothing_and_near_two_g() -> None:
    values, methods, phases = derived()
    assert methods["load_factor"] == "attitude and flight path"
    n = values["load_factor"]
    floating = stretches(n < 0.35, 8.0)
    pulling = stretches(n > 1.5, 8.0)
    assert len(floating) >= 20
    assert len(pulling) >= 25
    assert np.median([np.median(n[int(a) : int(b)]) for a, b in floating]) < 0.1
    assert 1.6 < np.median([np.median(n[int(a) : int(b)]) for a, b in pulling]) < 1.95
    assert 10.0 < np.median([b - a for a, b in floating]) < 25.0
    # every stretch of weightlessness is manoeuvring
    assert all(PHASES[phases[int(0.5 * (a + b))]] == "manoeuvring" for a, b in floating)


def test_bank_from_turn_rate_and_airspeed_agrees_with_the_recorded_roll() -> None:
    values, methods, _ = derived("bank_angle")
    assert methods["bank_angle"] == "turn rate and true airspeed"
    error = (values["bank_angle"] - recording().channels["bank_angle"].values) / DEG
    # the cells of track rate, speed and roll are seconds apart: most of the error is theirs
    assert np.median(np.abs(error)) < 0.8
    assert np.sqrt(np.mean(error**2)) < 3.0


def test_mach_from_indicated_airspeed_and_altitude_agrees_with_the_recorded_one() -> None:
    values, methods, _ = derived("mach", "true_airspeed")
    assert methods["mach"] == "calibrated airspeed and altitude"
    altitude = recording().channels["pressure_altitude"].values
    level = np.zeros(len(altitude), dtype=bool)
    windows = np.lib.stride_tricks.sliding_window_view(altitude, 31)
    level[15:-15] = np.ptp(windows, axis=1) < 100 * FT
    error = (values["mach"] - recording().channels["mach"].values)[level]
    assert level.sum() > 3000
    # steps of the cells: Mach 0.004, IAS 1 kt
    assert abs(np.median(error)) < 0.001
    assert np.percentile(np.abs(error), 90) < 0.004
