"""A real parabolic flight through scan and trace (source and licence: tests/data/real/SOURCES.md).

What is known of such flights (common practice, from memory): a pull-up near 1.8 g, some 20 s near 0 g, a pull-out near
1.8 g. There is no accelerometer: load factor comes from the flight path, out of cells that are often late.
"""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path

import numpy as np
import pandas as pd

import exceed

REAL = Path(__file__).parent / "data" / "real"
LOG, CHANNELS = REAL / "parabolas.csv.gz", REAL / "channels.yaml"


@lru_cache(maxsize=1)
def trace() -> pd.DataFrame:
    return exceed.trace(LOG, channels=CHANNELS)


def stretches(mask: np.ndarray, least: int) -> list[tuple[int, int]]:
    edges = np.flatnonzero(np.diff(np.concatenate([[0], mask.astype(int), [0]]))).reshape(-1, 2)
    return [(int(a), int(b)) for a, b in edges if b - a >= least]


def test_weightlessness_and_pulls_are_there_many_times():
    # measured: 23 stretches of at least 8 s within 0.35 g of zero, 55 of at least 4 s between 1.5 and 2.2 g
    n = trace()["load_factor_g"].to_numpy(dtype=float)
    floating = stretches(np.abs(n) < 0.35, 8)
    pulling = stretches((n > 1.5) & (n < 2.2), 4)
    assert len(floating) >= 15
    assert len(pulling) >= 40
    # between a pull-up and a pull-out (measured: 16 of 23; the others lost one to late cells)
    starts, ends = np.array([a for a, _ in pulling]), np.array([b for _, b in pulling])
    framed = [((a - ends >= 0) & (a - ends < 30)).any() and ((starts - b >= 0) & (starts - b < 30)).any()
              for a, b in floating]  # fmt: skip
    assert np.mean(framed) > 0.6
    assert set(trace()["phase"].iloc[[(a + b) // 2 for a, b in floating]]) == {"manoeuvring"}


def test_a_level_turn_of_the_track_rate_and_speed_agrees_with_the_recorded_roll():
    # measured: median 0.9 deg, 90 % within 2.7 deg, where it turns at a kept height; a sign or unit would show tens
    table = trace()
    turning = (table["turn_rate_deg_s"].abs() > 0.5) & (table["vertical_speed_ft_min"].abs() < 500)
    speed = table["true_airspeed_kt"] * 1852 / 3600
    bank = np.degrees(np.arctan(speed * np.radians(table["turn_rate_deg_s"]) / 9.80665))
    error = (bank - table["bank_angle_deg"])[turning].dropna()
    assert len(error) > 300
    assert error.abs().median() < 1.5
    assert error.abs().quantile(0.9) < 4.0


def test_scan_finds_one_flight_and_makes_nothing_established_of_a_path(tmp_path):
    found = exceed.scan(LOG, channels=CHANNELS, aircraft="transport", mass="140000 kg", rules="airframe")
    (recording,) = found.summary["recordings"]
    assert recording["status"] == "ok"
    assert recording["unresolved_columns"] == []
    assert len(recording["flights"]) == 1
    assert 10_300 < recording["recorded_s"] < 10_400
    method = next(row for row in recording["methods"] if row["quantity"] == "load_factor")
    assert method["method"] == "attitude and flight path"
    load = [event for event in recording["events"] if event["rule"].startswith("load-factor")]
    assert {event["certainty"] for event in load} <= {"possible", "doubtful"}
    # a path smoothed over seconds at one sample a second clears no load factor
    row = next(row for row in recording["assessment"] if row["rule"] == "load-factor-high" and row["flight"] is None)
    assert row["assessed_s"] == 0.0
