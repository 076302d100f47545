"""Gusts: there and back, in SI as in the rule's own units, and peaks counted as a plain loop counts them."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from exceed.core.constants import DENSITY_0, FOOT, KNOT, STANDARD_GRAVITY
from exceed.physics import gust

WING = {"mass": 900.0, "wing_area": 13.6, "mean_chord": 1.5, "lift_curve_slope": 4.9}


@given(st.floats(-20, 20), st.floats(1, 150), st.floats(0.3, 1.3))
def test_load_factor_of_a_gust_and_back(velocity: float, speed: float, density: float) -> None:
    increment = gust.gust_load_factor_increment(velocity, speed, density=density, **WING)
    back = gust.derived_gust_velocity(increment, speed, density=density, **WING)
    assert float(back) == pytest.approx(velocity, rel=1e-9, abs=1e-12)


def test_with_an_infinitely_heavy_wing_the_gust_tends_to_the_sharp_edged_one_of_the_textbook() -> None:
    """dn = rho0 V U a S / (2 W) for a sharp-edged gust, times K_g = 0.88 for a mass ratio without bound."""
    facts = {"mass": 1e9, "wing_area": 1.0, "mean_chord": 1.0, "lift_curve_slope": 5.0}
    found = gust.gust_load_factor_increment(10.0, 100.0, density=1.0, gust_constant=gust.EXACT_CONSTANT, **facts)
    expected = 0.88 * DENSITY_0 * 100.0 * 10.0 * 5.0 / (2 * 1e9 * STANDARD_GRAVITY)
    assert float(found) == pytest.approx(expected, rel=1e-6)


def test_the_printed_constant_is_a_thousandth_off_the_exact_one() -> None:
    assert pytest.approx(1.001077, abs=1e-5) == gust.PRINTED_CONSTANT / gust.EXACT_CONSTANT


def test_level_flight_is_no_gust_and_no_speed_is_no_answer() -> None:
    air = {"pressure_altitude": 1000.0, "static_air_temperature": 281.65}
    assert float(gust.gust_velocity(1.0, 50.0, **air, **WING)) == 0.0
    assert gust.gust_velocity(1.5, 50.0, **air, **WING) > 0
    assert gust.gust_velocity(0.5, 50.0, **air, **WING) < 0
    assert np.isnan(gust.gust_velocity(1.5, 0.0, **air, **WING))


@given(st.floats(0, 200))
def test_the_gust_factor_rises_towards_0_88(mass_ratio: float) -> None:
    low, high = gust.gust_alleviation_factor([mass_ratio, mass_ratio + 1])
    assert 0 <= low < high < 0.88


def test_a_gust_profile_is_zero_outside_and_highest_in_its_middle() -> None:
    profile = gust.gust_profile(15.0, 30.0, [-1.0, 0.0, 30.0, 60.0, 61.0])
    np.testing.assert_allclose(profile, [0, 0, 15, 0, 0], atol=1e-12)
    np.testing.assert_allclose(np.mean(gust.gust_profile(15.0, 30.0, np.linspace(0, 60, 1001))), 7.5, rtol=2e-3)


def test_design_gusts_have_a_name() -> None:
    with pytest.raises(ValueError, match="known: cruise, dive, flaps, rough-air"):
        gust.design_gust_velocity(0.0, "storm")
    assert float(gust.design_gust_velocity(50000 * FOOT, "rough-air")) == pytest.approx(38 * FOOT)
    assert np.isnan(gust.design_gust_velocity(np.nan, "cruise"))


def test_rough_air_speed_without_gusts_is_the_stall_speed() -> None:
    assert float(gust.rough_air_speed_minimum(50 * KNOT, 0.0, 15.0, 100.0, 5.0, 300.0)) == pytest.approx(50 * KNOT)


def obvious_peaks(values: np.ndarray, zone: float) -> list[tuple[int, float]]:
    out: list[tuple[int, float]] = []
    side = 0
    for i, v in enumerate(values):
        now = 0 if not abs(v) > zone else (1 if v > 0 else -1)
        if now and now == side:
            if abs(v) > abs(out[-1][1]):
                out[-1] = (i, float(v))
        elif now:
            out.append((i, float(v)))
        side = now
    return out


@given(st.lists(st.sampled_from([-0.6, -0.2, -0.05, 0.0, 0.03, 0.05, 0.1, 0.1, 0.7, float("nan")]), max_size=40))
def test_peaks_between_means_are_those_of_a_plain_loop(series: list[float]) -> None:
    values = np.array(series)
    found = gust.peaks_between_means(np.arange(values.size) * 0.25, values, 0.05)
    assert list(zip(found.row.tolist(), found.extreme.tolist(), strict=True)) == obvious_peaks(values, 0.05)
    assert (found.duration >= 0).all()
    assert (found.first <= found.row).all()
    assert (found.row <= found.last).all()


def test_duration_runs_from_mean_to_mean() -> None:
    t = np.arange(0, 10, 0.01)
    found = gust.peaks_between_means(t, 0.5 * np.sin(2 * np.pi * t / 3.0), 0.05)
    np.testing.assert_allclose(found.duration[:-1], 1.5, atol=0.011)
    assert gust.is_gust(found.duration)[:-1].all()
    slow = gust.peaks_between_means(t, 0.5 * np.sin(2 * np.pi * t / 5.0), 0.05)
    np.testing.assert_allclose(slow.duration[:3], 2.5, atol=0.011)
    assert not gust.is_gust(slow.duration[:3]).any()


def test_duration_stops_where_the_record_does_or_a_sample_is_missing() -> None:
    found = gust.peaks_between_means(np.arange(5.0), [0.5, 0.6, np.nan, 0.4, 0.4], 0.05)
    np.testing.assert_array_equal(found.duration, [1.0, 1.0])
    np.testing.assert_array_equal(found.extreme, [0.6, 0.4])


def test_wrong_shapes_are_refused() -> None:
    with pytest.raises(ValueError, match="one shape"):
        gust.peaks_between_means([0.0, 1.0], [0.1], 0.05)
    with pytest.raises(ValueError, match="not negative"):
        gust.peaks_between_means([0.0], [0.1], -1.0)
