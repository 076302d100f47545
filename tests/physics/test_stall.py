"""Stall speed: the square root law in equivalent airspeed, flaps, inverted flight, and what happens near zero g."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from exceed.core.constants import KNOT
from exceed.physics import airspeed, stall, turning
from exceed.physics.stall import StallTable

NAN = float("nan")
# 55 and 48 kt at 960 kg, inverted 66 kt flaps up (invented)
TABLE = StallTable(np.radians([0, 30]), [960, 960], np.array([55, 48]) * KNOT, np.array([66, NAN]) * KNOT)
factors = st.floats(0.0, 12.0)
masses = st.floats(600.0, 1000.0)
flaps = st.floats(0.0, float(np.radians(40)))


def speed(n: float, mass: float = 960.0, flap_deg: float = 0.0, altitude: float = 0.0) -> float:
    return float(stall.stall_speed(n, mass, np.radians(flap_deg), altitude, TABLE)) / KNOT


def test_at_the_manuals_own_condition_it_is_the_manuals_figure() -> None:
    assert speed(1.0) == pytest.approx(55.0, rel=1e-12)
    assert speed(1.0, flap_deg=30) == pytest.approx(48.0, rel=1e-12)
    assert speed(-1.0) == pytest.approx(66.0, rel=1e-12)


@given(factors, masses, flaps)
@example(0.0, 960.0, 0.0)
def test_it_goes_with_the_root_of_load_factor_and_mass(n: float, mass: float, flap: float) -> None:
    one_g = float(stall.stall_speed_1g(mass, flap, TABLE))
    assert float(stall.stall_speed_equivalent(n, mass, flap, TABLE)) == pytest.approx(one_g * np.sqrt(n), rel=1e-12)
    heavier = float(stall.stall_speed_1g(4 * mass, flap, TABLE))
    assert heavier == pytest.approx(2 * one_g, rel=1e-12)
    assert float(stall.speed_at_mass(one_g, 4 * mass, mass)) == pytest.approx(heavier, rel=1e-12)


@given(st.floats(0.0, 8.0), st.floats(0.01, 4.0), masses, st.floats(0.0, 6000.0))
def test_more_load_is_a_higher_stall_speed_and_so_is_altitude_in_calibrated(
    n: float, more: float, mass: float, altitude: float
) -> None:
    low, high = stall.stall_speed([n, n + more], mass, 0.0, altitude, TABLE)
    assert low < high
    if n > 0.01:
        assert low >= float(stall.stall_speed_equivalent(n, mass, 0.0, TABLE)) * (1 - 1e-12)


def test_four_g_doubles_it_in_equivalent_but_not_quite_in_calibrated_airspeed_up_high() -> None:
    """[FAA-PHAK]: twice the 1 g speed at 4 g; compressibility adds a little at 10 000 ft and 110 kt."""
    assert speed(4.0) == pytest.approx(110.0, rel=1e-12)
    high = speed(4.0, altitude=3048.0)
    assert 110.0 < high < 110.5
    equivalent = airspeed.equivalent_airspeed(high * KNOT, 3048.0) / KNOT
    assert float(equivalent) == pytest.approx(110.0, rel=1e-9)


def test_in_a_60_degree_turn_it_rises_by_the_root_of_two() -> None:
    n = turning.load_factor_level_turn(np.radians(60.0))
    assert speed(float(n)) == pytest.approx(55.0 * np.sqrt(2.0), rel=1e-9)


def test_towards_zero_g_it_tends_to_zero_and_is_a_number() -> None:
    n = np.array([1e-3, 1e-9, 0.0, -0.0, -1e-9])
    values = stall.stall_speed(n, 960.0, 0.0, 0.0, TABLE)
    assert np.isfinite(values).all()
    assert (values[2:4] == 0.0).all()
    assert (values < 2.0 * KNOT).all()


def test_negative_g_needs_an_inverted_speed() -> None:
    assert speed(-2.25) == pytest.approx(66.0 * 1.5)
    assert speed(-1.0, flap_deg=0.9) == pytest.approx(66.0)
    assert np.isnan(speed(-1.0, flap_deg=30)), "no inverted speed is given with flaps out"
    assert np.isnan(speed(-1.0, flap_deg=15))
    upright_only = StallTable([0.0], [960], [28.0], [NAN])
    answer = stall.stall_speed([1.0, -1.0], 960.0, 0.0, 0.0, upright_only)
    np.testing.assert_array_equal(np.isnan(answer), [False, True])


def test_between_flap_settings_it_is_interpolated_and_held_beyond() -> None:
    assert speed(1.0, flap_deg=15) == pytest.approx(51.5)
    assert speed(1.0, flap_deg=40) == pytest.approx(48.0)
    assert speed(1.0, flap_deg=-5) == pytest.approx(55.0)
    shuffled = StallTable(np.radians([30, 0]), [960, 960], np.array([48, 55]) * KNOT, np.array([NAN, 66]) * KNOT)
    assert float(stall.stall_speed_1g(960.0, np.radians(15), shuffled)) / KNOT == pytest.approx(51.5)


def test_rows_at_different_masses_are_brought_to_the_mass_at_hand() -> None:
    """Flaps 30 given at a lighter mass: 48 kt at 800 kg is 52.6 kt at 960 kg."""
    table = StallTable(np.radians([0, 30]), [960, 800], [55.0, 48.0], [NAN, NAN])
    assert float(stall.stall_speed_1g(960.0, np.radians(30), table)) == pytest.approx(48 * np.sqrt(1.2))
    two = StallTable([0.0, 0.0], [800, 1000], [50.0, 57.0], [NAN, NAN])
    assert float(stall.stall_speed_1g(800.0, 0.0, two)) == pytest.approx(50.0)
    assert float(stall.stall_speed_1g(1000.0, 0.0, two)) == pytest.approx(57.0)
    assert 50.0 < float(stall.stall_speed_1g(900.0, 0.0, two)) < 57.0


def test_margin_and_ratio() -> None:
    assert float(stall.stall_margin(60.0, 55.0)) == 5.0
    assert float(stall.stall_speed_ratio(71.5, 55.0)) == pytest.approx(1.3)
    assert float(stall.stall_margin_fraction(71.5, 55.0)) == pytest.approx(0.3)
    assert np.isnan(stall.stall_speed_ratio(60.0, 0.0)), "no lift is asked at zero g, so no ratio"
    assert float(stall.stall_margin(60.0, 0.0)) == 60.0


def test_unknown_inputs_stay_unknown() -> None:
    for bad in ((NAN, 960, 0, 0), (1, NAN, 0, 0), (1, 960, NAN, 0), (1, 960, 0, NAN), (1, 0, 0, 0), (-1, 960, NAN, 0)):
        assert np.isnan(stall.stall_speed(*bad, TABLE))


@pytest.mark.parametrize(
    "columns",
    [
        ([0.0], [0.0], [28.0], [NAN]),
        ([0.0], [960.0], [-28.0], [NAN]),
        ([NAN], [960.0], [28.0], [NAN]),
        ([0.0], [960.0], [28.0], [-1.0]),
        ([0.0, 0.1], [960.0], [28.0], [NAN]),
        ([], [], [], []),
    ],
)
def test_tables_that_make_no_sense_are_refused(columns: tuple[list[float], ...]) -> None:
    with pytest.raises(ValueError, match="StallTable"):
        StallTable(*columns)


def test_a_table_cannot_be_changed_after_it_was_made() -> None:
    column = np.array([960.0])
    table = StallTable([0.0], column, [28.0], [NAN])
    column[0] = 1.0
    assert table.mass[0] == 960.0
    with pytest.raises(ValueError, match="read-only"):
        table.mass[0] = 1.0
