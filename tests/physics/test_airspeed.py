"""Airspeeds there and back, above Mach 1 against printed tables, and against independent libraries."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st
from openap import aero
from scipy.optimize import brentq

from exceed.core.constants import FOOT, KNOT, PRESSURE_0, SPEED_OF_SOUND_0
from exceed.physics import airspeed, atmosphere

speeds = st.floats(0.0, 700.0)
altitudes = st.floats(-1000.0, 20000.0)
temperatures = st.floats(190.0, 330.0)
machs = st.floats(0.0, 5.0)


@given(speeds, altitudes, temperatures)
@example(0.0, 0.0, 288.15)
@example(1e-6, 20000.0, 216.65)
@example(float(SPEED_OF_SOUND_0), 0.0, 288.15)
@example(340.3, 11000.0, 216.65)
def test_calibrated_to_true_and_back(speed: float, altitude: float, temperature: float) -> None:
    true = airspeed.true_airspeed(speed, altitude, temperature)
    back = float(airspeed.calibrated_airspeed_from_true(true, altitude, temperature))
    assert back == pytest.approx(speed, rel=1e-9, abs=1e-12)


@given(speeds, altitudes)
def test_calibrated_to_equivalent_and_back(speed: float, altitude: float) -> None:
    back = airspeed.calibrated_airspeed_from_equivalent(airspeed.equivalent_airspeed(speed, altitude), altitude)
    assert float(back) == pytest.approx(speed, rel=1e-9, abs=1e-12)


@given(machs, altitudes)
@example(1.0, 0.0)
@example(np.nextafter(1.0, 2.0), 0.0)
@example(np.nextafter(1.0, 0.0), 0.0)
def test_mach_to_calibrated_and_back(mach: float, altitude: float) -> None:
    back = float(airspeed.mach(airspeed.calibrated_airspeed_from_mach(mach, altitude), altitude))
    assert back == pytest.approx(mach, rel=1e-9, abs=1e-12)


@given(machs, altitudes, temperatures)
def test_equivalent_true_and_mach_agree_with_one_another(mach: float, altitude: float, temperature: float) -> None:
    equivalent = airspeed.equivalent_airspeed_from_mach(mach, altitude)
    true = airspeed.true_airspeed_from_mach(mach, temperature)
    assert float(airspeed.mach_from_equivalent(equivalent, altitude)) == pytest.approx(mach, rel=1e-9, abs=1e-12)
    again = airspeed.equivalent_airspeed_from_true(true, altitude, temperature)
    assert float(again) == pytest.approx(float(equivalent), rel=1e-9, abs=1e-12)
    forth = airspeed.true_airspeed_from_equivalent(equivalent, altitude, temperature)
    assert float(forth) == pytest.approx(float(true), rel=1e-9, abs=1e-12)
    q = airspeed.dynamic_pressure(mach, atmosphere.static_pressure(altitude))
    assert float(q) == pytest.approx(float(airspeed.dynamic_pressure_from_equivalent(equivalent)), rel=1e-9, abs=1e-12)


@given(machs, temperatures, st.floats(0.5, 1.0))
def test_static_from_total_temperature_and_back(mach: float, temperature: float, recovery: float) -> None:
    total = airspeed.total_air_temperature(temperature, mach, recovery)
    assert float(airspeed.static_air_temperature(total, mach, recovery)) == pytest.approx(temperature, rel=1e-12)
    assert total >= temperature


@given(st.floats(0.0, 690.0), st.floats(0.001, 10.0), altitudes)
def test_mach_rises_with_calibrated_airspeed(speed: float, more: float, altitude: float) -> None:
    assert airspeed.mach(speed + more, altitude) > airspeed.mach(speed, altitude)


@given(speeds)
@example(350.0)
def test_at_sea_level_on_a_standard_day_all_airspeeds_are_one(speed: float) -> None:
    assert float(airspeed.true_airspeed(speed, 0.0, 288.15)) == pytest.approx(speed, rel=1e-12, abs=1e-12)
    assert float(airspeed.equivalent_airspeed(speed, 0.0)) == pytest.approx(speed, rel=1e-12, abs=1e-12)


@given(st.floats(1.0, 300.0), st.floats(10.0, 20000.0))
def test_equivalent_is_below_calibrated_airspeed_above_sea_level(speed: float, altitude: float) -> None:
    assert airspeed.equivalent_airspeed(speed, altitude) < speed * (1 + 1e-12)


@pytest.mark.parametrize(
    ("mach", "pitot_over_static"),
    [(1.0, 1.8929), (1.2, 2.4075), (1.5, 3.4133), (2.0, 5.6404), (3.0, 12.061)],
)
def test_above_mach_1_the_pitot_pressure_is_that_of_the_tables(mach: float, pitot_over_static: float) -> None:
    """NACA Report 1135, table II, p02/p1 (from memory)."""
    ratio = float(airspeed.impact_pressure_from_mach(mach, 1.0)) + 1.0
    assert ratio == pytest.approx(pitot_over_static, rel=5e-5)


@pytest.mark.parametrize("ratio", [0.9, 1.0, 2.0, 5.0, 30.0])
def test_the_inverse_above_mach_1_is_that_of_a_bracketing_solver(ratio: float) -> None:
    def rayleigh(mach: float) -> float:
        """A normal shock, then isentropic: stagnation pressure behind it over static ahead."""
        behind = ((mach**2 + 5) / (7 * mach**2 - 1)) ** 0.5
        jump = 1 + 7 / 6 * (mach**2 - 1)
        return jump * (1 + behind**2 / 5) ** 3.5 - 1 - ratio

    expected = brentq(rayleigh, 1.0, 50.0, xtol=1e-13)
    assert float(airspeed.mach_from_impact_pressure(ratio, 1.0)) == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize("altitude_ft", [0, 5000, 20000, 35000, 41000])
@pytest.mark.parametrize("speed_kt", [60, 140, 250, 300])
def test_agrees_with_an_open_performance_library(altitude_ft: int, speed_kt: int) -> None:
    """openap rounds its constants (R 287.05287, but p0 and a0 of its own): 2e-4 covers them."""
    height, speed = altitude_ft * FOOT, speed_kt * KNOT
    assert float(airspeed.mach(speed, height)) == pytest.approx(float(aero.cas2mach(speed, height)), rel=2e-4)
    true = airspeed.true_airspeed(speed, height, atmosphere.standard_temperature(height))
    assert float(true) == pytest.approx(float(aero.cas2tas(speed, height)), rel=2e-4)


def test_crossover_is_where_both_speeds_are_one() -> None:
    altitude = float(airspeed.crossover_altitude(300 * KNOT, 0.78))
    assert float(airspeed.mach(300 * KNOT, altitude)) == pytest.approx(0.78, rel=1e-10)
    assert np.isnan(airspeed.crossover_altitude(300 * KNOT, 0.0))


def test_low_speeds_keep_their_digits() -> None:
    """Below a metre a second plain powers lose ten of sixteen digits."""
    for speed in (1e-8, 1e-4, 0.5):
        assert float(airspeed.impact_pressure(speed)) == pytest.approx(0.5 * 1.2250000 * speed**2, rel=1e-5)
        back = airspeed.calibrated_airspeed_from_impact_pressure(airspeed.impact_pressure(speed))
        assert float(back) == pytest.approx(speed, rel=1e-12)


def test_a_negative_airspeed_is_none_and_zero_is_zero() -> None:
    assert np.isnan(airspeed.mach([-1.0, np.nan], 0.0)).all()
    assert np.isnan(airspeed.true_airspeed(-0.1, 0.0, 288.15))
    assert float(airspeed.mach(-0.0, 0.0)) == 0.0
    assert np.isnan(airspeed.calibrated_airspeed_from_impact_pressure(-1.0))
    assert np.isnan(airspeed.mach_from_impact_pressure(100.0, 0.0))


def test_slow_and_fast_samples_mixed_are_what_each_is_alone() -> None:
    mixed = np.array([50.0, 400.0, np.nan, 340.0, 600.0])
    alone = [float(airspeed.mach(speed, 9000.0)) for speed in mixed]
    np.testing.assert_array_equal(airspeed.mach(mixed, 9000.0), alone)
    ratio = airspeed.impact_pressure(mixed) / PRESSURE_0
    assert np.isfinite(ratio[[0, 1, 3, 4]]).all()
