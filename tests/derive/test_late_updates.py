"""Cells that a recorder did not renew in time: what a load factor from the flight path makes of them."""

from __future__ import annotations

import numpy as np

from exceed.derive import methods

WIDTH, GAP = 1.6, 2.5


def load_factor(vertical_speed):
    time = np.arange(len(vertical_speed), dtype=float)
    speed = np.full(len(time), 150.0)
    return methods.load_factor_from_path_and_turn(
        time, speed, np.asarray(vertical_speed, dtype=float), np.zeros(len(time)), np.zeros(len(time)), WIDTH, GAP
    )


def test_a_late_update_beside_held_values_gives_no_load_factor_instead_of_a_false_one():
    # 20 m/s held for four seconds, then the 60 m/s that were reached meanwhile at 1 g more
    climb = [0.0, 10.0, 20.0, 20.0, 20.0, 20.0, 60.0, 61.0, 62.0, 62.0, 62.0]
    found = load_factor(climb)
    assert np.isnan(found[5])
    assert np.isnan(found[6])
    assert np.nanmax(found) < 2.2


def test_a_pull_from_steady_flight_keeps_its_load_factor():
    # 0.8 g more, smoothly begun: no step of a second asks for more than 1 g
    climb = np.concatenate([np.zeros(6), np.cumsum([2.0, 5.0, 8.0, 8.0, 8.0, 5.0, 2.0]), np.full(6, 38.0)])
    found = load_factor(climb)
    assert np.isfinite(found).all()
    assert 1.6 < found.max() < 1.85


def test_the_spread_is_small_in_a_smooth_pull_and_large_at_a_step():
    time = np.arange(40.0)
    args = (np.full(40, 150.0),)
    smooth = methods.path_spread(time, *args, 20.0 * np.sin(time / 8.0), np.zeros(40), WIDTH, GAP)
    step = methods.path_spread(time, *args, np.where(time < 20, 0.0, 30.0), np.zeros(40), WIDTH, GAP)
    assert np.nanmax(smooth[5:-5]) < 0.02
    assert np.nanmax(step) > 0.4
