"""Mass and balance: sums, shifts, fuel, and the loading envelope."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import cumulative_trapezoid

from exceed.physics import loading
from exceed.physics.loading import LoadingEnvelope

NAN = float("nan")
ENVELOPE = LoadingEnvelope([640, 960], [0.90, 0.96], [1.10, 1.10])


@given(st.lists(st.floats(1, 500), min_size=1, max_size=6), st.floats(-2, 2), st.floats(-1, 1))
def test_moving_the_datum_moves_the_cg_by_the_same(masses: list[float], arm: float, shift: float) -> None:
    arms = arm + 0.1 * np.arange(len(masses))
    here = loading.centre_of_gravity_of_stations(masses, arms)
    there = loading.centre_of_gravity_of_stations(masses, arms + shift)
    assert float(there - here) == pytest.approx(shift, abs=1e-9)
    assert arms.min() - 1e-9 <= here <= arms.max() + 1e-9


@given(st.floats(500, 2000), st.floats(0.5, 1.5), st.floats(1, 200), st.floats(0, 3))
def test_adding_and_taking_out_again_returns_the_cg(mass: float, cg: float, added: float, arm: float) -> None:
    there = loading.centre_of_gravity_after_change(mass, cg, added, arm)
    back = loading.centre_of_gravity_after_change(mass + added, there, -added, arm)
    assert float(back) == pytest.approx(cg, rel=1e-9)
    both = loading.centre_of_gravity_of_stations([mass, added], [cg, arm])
    assert float(there) == pytest.approx(float(both), rel=1e-12)


def test_stations_over_samples_give_one_cg_each_and_an_unknown_item_hides_it() -> None:
    masses = np.array([[640.0, 80.0, 70.0], [640.0, 80.0, 40.0], [640.0, NAN, 40.0]])
    arms = [0.98, 1.12, 0.9]
    cg = loading.centre_of_gravity_of_stations(masses, arms)
    assert cg.shape == (3,)
    assert cg[0] == pytest.approx((640 * 0.98 + 80 * 1.12 + 70 * 0.9) / 790)
    assert np.isnan(cg[2])
    assert np.isnan(loading.total_mass(masses)[2])
    assert np.isnan(loading.total_moment([NAN, 1.0], [1.0, 1.0]))
    assert np.isnan(loading.centre_of_gravity_of_stations([0.0], [1.0]))


def test_fuel_burnt_is_the_integral_and_bridges_dropouts() -> None:
    rng = np.random.default_rng(8)
    t = np.cumsum(rng.uniform(0.5, 2, 50))
    flow = rng.uniform(0.005, 0.01, 50)
    np.testing.assert_allclose(loading.fuel_burnt(t, flow), cumulative_trapezoid(flow, t, initial=0))
    steady = np.full(50, 0.01)
    steady[20:30] = NAN
    burnt = loading.fuel_burnt(t, steady)
    np.testing.assert_array_equal(np.isnan(burnt), np.isnan(steady))
    assert burnt[-1] == pytest.approx(0.01 * (t[-1] - t[0]))
    assert np.isnan(loading.fuel_burnt([0.0, 1.0], [NAN, NAN])).all()
    with pytest.raises(ValueError, match="one shape"):
        loading.fuel_burnt([0.0], [1.0, 2.0])


def test_limits_are_linear_between_rows_and_unknown_outside() -> None:
    np.testing.assert_allclose(
        loading.centre_of_gravity_forward_limit([639, 640, 800, 960, 961], ENVELOPE), [NAN, 0.90, 0.93, 0.96, NAN]
    )
    np.testing.assert_allclose(loading.centre_of_gravity_aft_limit([800, NAN], ENVELOPE), [1.10, NAN])


def test_margin_is_negative_outside_and_unknown_with_the_mass_outside() -> None:
    margin = loading.centre_of_gravity_margin([800, 800, 800, 1000], [1.0, 0.92, 1.15, 1.0], ENVELOPE)
    np.testing.assert_allclose(margin, [0.07, -0.01, -0.05, NAN])


def test_masses_that_would_be_negative_are_unknown() -> None:
    assert np.isnan(loading.mass_after_burn(10.0, 1.0, 11.0))
    assert np.isnan(loading.fuel_mass_of_volume(-1.0, 720.0))
    assert list(loading.overweight([960.0, 960.01, NAN], 960.0)) == [False, True, False]


def test_a_tank_of_100_litres_of_avgas_weighs_about_72_kg() -> None:
    """6 lb a US gallon is 0.719 kg a litre [FAA-PHAK]."""
    assert float(loading.fuel_mass_of_volume(0.1, loading.AVGAS_DENSITY)) == pytest.approx(71.9, abs=0.05)


@pytest.mark.parametrize(
    "columns", [([960, 640], [0.9, 0.9], [1, 1]), ([640, 960], [1.2, 0.9], [1, 1]), ([640, NAN], [0.9, 0.9], [1, 1])]
)
def test_envelopes_that_make_no_sense_are_refused(columns: tuple[list[float], ...]) -> None:
    with pytest.raises(ValueError, match="LoadingEnvelope"):
        LoadingEnvelope(*columns)
