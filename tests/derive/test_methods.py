"""The short way to a slope gives the numbers of the long one."""

from __future__ import annotations

import numpy as np
import pytest

from exceed.derive.methods import angle_slope, load_factor_level_turn, slope
from exceed.physics.smoothing import smooth_derivative


@pytest.mark.parametrize("missing", [0.0, 0.01, 0.3])
@pytest.mark.parametrize(("rate", "width"), [(1.0, 1.6), (8.0, 1.0), (8.0, 0.2), (50.0, 0.5)])
def test_even_samples_give_the_slope_of_uneven_ones(rate: float, width: float, missing: float) -> None:
    rng = np.random.default_rng(11)
    time = 1e5 + np.arange(800) / rate
    values = 500.0 + np.cumsum(rng.normal(0.0, 1.0, 800))
    values[rng.random(800) < missing] = np.nan
    values[300:340] = np.nan if missing else values[300:340]
    found, expected = slope(time, values, width, 4.0 / rate), smooth_derivative(time, values, width, 4.0 / rate)
    assert np.allclose(found, expected, rtol=1e-7, atol=1e-7, equal_nan=True)


def test_a_parabola_has_its_own_slope() -> None:
    time = np.arange(100) * 0.25
    assert np.allclose(slope(time, 3.0 + 2.0 * time + 0.5 * time**2, 1.0, 1.0), 2.0 + time)


def test_an_angle_turns_on_through_north() -> None:
    time = np.arange(200) * 0.5
    heading = np.mod(6.0 + 0.05 * time, 2 * np.pi)
    assert np.allclose(angle_slope(time, heading, 1.0, 2.0), 0.05)


def test_a_held_bank_is_a_level_turn_and_a_roll_is_none() -> None:
    """2 g at 60 degrees of bank [FAA-PHAK]."""
    time = np.arange(80) * 0.25
    held = np.full(80, np.radians(60.0))
    assert np.allclose(load_factor_level_turn(time, held, 0.5, 1.0), 2.0)
    rolling = np.radians(20.0) * time
    assert np.isnan(load_factor_level_turn(time, rolling, 0.5, 1.0)).all()
