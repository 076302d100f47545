"""Turns: the handbook's figures, identities, and mirrored turns."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from exceed.core.constants import KNOT, STANDARD_GRAVITY
from exceed.physics import turning

banks = st.floats(-np.radians(85.0), np.radians(85.0))
speeds = st.floats(1.0, 400.0)
angles = st.floats(0.0, 2 * np.pi, exclude_max=True)


@given(banks)
@example(0.0)
@example(-0.0)
@example(float(np.radians(85.0)))
def test_bank_to_load_factor_and_back(bank: float) -> None:
    n = turning.load_factor_level_turn(bank)
    assert n >= 1.0
    back = float(turning.bank_angle_from_load_factor(n))
    # arccos is flat at 1: there an error of one in the last place is 1.5e-8 rad
    assert back == pytest.approx(abs(bank), abs=5e-8)


@given(banks, speeds)
def test_a_mirrored_turn_has_the_same_load_factor_and_radius_and_the_opposite_rate(bank: float, speed: float) -> None:
    assert turning.load_factor_level_turn(-bank) == turning.load_factor_level_turn(bank)
    assert turning.turn_rate(-bank, speed) == -turning.turn_rate(bank, speed)
    np.testing.assert_equal(turning.turn_radius(-bank, speed), turning.turn_radius(bank, speed))
    rate = turning.turn_rate(bank, speed)
    assert turning.bank_angle_level_turn(speed, -rate) == -turning.bank_angle_level_turn(speed, rate)


@given(banks, speeds)
def test_turn_rate_to_bank_and_back(bank: float, speed: float) -> None:
    rate = turning.turn_rate(bank, speed)
    assert float(turning.bank_angle_level_turn(speed, rate)) == pytest.approx(bank, rel=1e-12, abs=1e-15)
    n = float(turning.load_factor_from_turn_rate(speed, rate))
    assert n == pytest.approx(float(turning.load_factor_level_turn(bank)), rel=1e-9)


@given(st.floats(0.01, 1.48), speeds)
def test_radius_is_speed_over_rate(bank: float, speed: float) -> None:
    rate = turning.turn_rate(bank, speed)
    radius = float(turning.turn_radius(bank, speed))
    assert radius == pytest.approx(float(turning.turn_radius_from_turn_rate(speed, rate)), rel=1e-12)
    assert radius * float(rate) == pytest.approx(speed, rel=1e-12)
    assert float(turning.true_airspeed_of_turn(bank, rate)) == pytest.approx(speed, rel=1e-12)


@given(st.floats(0.0, 1.4), st.floats(0.001, 0.05))
def test_load_factor_rises_with_bank(bank: float, more: float) -> None:
    assert turning.load_factor_level_turn(bank + more) > turning.load_factor_level_turn(bank)


def test_towards_knife_edge_there_is_no_level_turn() -> None:
    steep = np.radians([84.9, 85.0, 85.1, 90.0, 120.0, 180.0, -90.0])
    known = [True, True, False, False, False, False, False]
    for answer in (
        turning.load_factor_level_turn(steep),
        turning.turn_rate(steep, 60.0),
        turning.turn_radius(steep, 60.0),
        turning.load_factor_level_turn_uncertainty(steep, 0.01),
    ):
        np.testing.assert_array_equal(np.isfinite(answer), known)


def test_no_speed_no_turn_and_wings_level_no_circle() -> None:
    assert np.isnan(turning.turn_rate(0.5, 0.0))
    assert np.isnan(turning.turn_radius(0.0, 60.0))
    assert np.isnan(turning.turn_time(0.0))
    assert np.isnan(turning.bank_angle_from_load_factor([0.99, -1.0, 12.0])).all()
    assert float(turning.turn_rate(0.0, 60.0)) == 0.0


def test_standard_rate_at_120_knots_needs_about_18_degrees() -> None:
    """Pilots' rule of thumb V/10 + 7 gives 19 (common practice)."""
    assert float(np.degrees(turning.bank_angle_standard_rate(120 * KNOT))) == pytest.approx(18.24, abs=0.01)
    assert float(turning.turn_time(turning.STANDARD_RATE)) == pytest.approx(120.0)


def test_uncertainty_of_bank_carries_over_as_drawn_samples_say() -> None:
    rng = np.random.default_rng(3)
    for bank in (0.0, 0.5, 1.2):
        drawn = turning.load_factor_level_turn(bank + 0.02 * rng.standard_normal(200_000))
        said = float(turning.load_factor_level_turn_uncertainty(bank, 0.02))
        assert said == pytest.approx(float(np.std(drawn)), rel=0.03)


def test_a_loop_pulls_more_at_the_bottom_than_at_the_top_by_two() -> None:
    bottom, top = turning.load_factor_pull_up(60.0, 200.0, [0.0, np.pi])
    assert float(bottom - top) == pytest.approx(2.0)
    assert float(bottom) == pytest.approx(1.0 + 3600 / (STANDARD_GRAVITY * 200))
    assert turning.load_factor_pull_up(60.0, -400.0, 0.0) < 1.0


@given(angles, st.floats(0.0, 200.0), angles, st.floats(0.0, 60.0))
def test_the_wind_that_was_put_in_comes_out(heading: float, air: float, blows_from: float, wind: float) -> None:
    north = air * np.cos(heading) - wind * np.cos(blows_from)
    east = air * np.sin(heading) - wind * np.sin(blows_from)
    triangle = (heading, air, np.arctan2(east, north), np.hypot(north, east))
    assert float(turning.wind_speed(*triangle)) == pytest.approx(wind, abs=1e-9)
    if wind > 0.1:
        turned = float(turning.wind_direction(*triangle)) - blows_from
        assert np.cos(turned) == pytest.approx(1.0, abs=1e-9)


def test_a_westerly_comes_from_270() -> None:
    """Heading north at 100 kt in a 30 kt westerly the track drifts to the right."""
    triangle = (0.0, 100.0, np.arctan2(30.0, 100.0), np.hypot(30.0, 100.0))
    assert float(np.degrees(turning.wind_direction(*triangle))) == pytest.approx(270.0)
    assert float(turning.wind_east(*triangle)) == pytest.approx(30.0)
    assert float(turning.wind_north(*triangle)) == pytest.approx(0.0, abs=1e-12)
    assert np.isnan(turning.wind_direction(0.0, 100.0, 0.0, 100.0))
