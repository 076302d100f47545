"""Tables over a quantity, and the one flap rule."""

from __future__ import annotations

import numpy as np
import pytest

from exceed.physics import tables
from exceed.physics.tables import StepTable, Table

NAN = float("nan")


def degrees(function: object, angles: list[float], settings: list[float]) -> list[float]:
    return list(np.degrees(function(np.radians(angles), np.radians(settings))))  # type: ignore[operator]


def test_the_flap_rule_takes_the_smallest_setting_not_below_the_angle_less_one_degree() -> None:
    angles = [0, 0.99, 1, 1.01, 9, 10, 11, 11.01, 20, 31, 35, -1, -0.5]
    expected = [0, 0, 0, 10, 10, 10, 10, 30, 30, 30, 30, 0, 0]
    np.testing.assert_allclose(degrees(tables.flap_setting_in_force, angles, [30, 10]), expected, atol=1e-9)


def test_the_rule_holds_at_the_edge_for_every_whole_degree_whatever_the_rounding() -> None:
    for setting in range(2, 60):
        at_edge, beyond = degrees(tables.flap_setting_in_force, [setting + 1, setting + 1.01], [setting, 70])
        assert (round(at_edge), round(beyond)) == (setting, 70)


def test_flaps_set_upwards_count_as_up_unless_a_negative_setting_is_listed() -> None:
    np.testing.assert_allclose(degrees(tables.flap_setting_in_force, [-10, -5], [10, 30]), [0, 0])
    np.testing.assert_allclose(degrees(tables.flap_setting_in_force, [-10, -5], [-10, 0, 10]), [-10, 0])


def test_unknown_flaps_and_an_empty_list() -> None:
    assert np.isnan(degrees(tables.flap_setting_in_force, [NAN], [10])[0])
    np.testing.assert_array_equal(degrees(tables.flap_setting_in_force, [0, 15], [NAN]), [0, NAN])


def test_past_the_last_setting_is_said() -> None:
    np.testing.assert_array_equal(
        tables.past_last_setting(np.radians([0, 30, 31, 31.1, NAN]), np.radians([10, 30])), [0, 0, 0, 1, 0]
    )
    assert not tables.past_last_setting(0.5, [NAN])


def test_flap_limit_speed_does_not_apply_with_flaps_up() -> None:
    limits = StepTable(np.radians([30, 10]), [46.0, 56.0])
    angles = np.radians([0, 0.9, 5, 10, 11, 12, 30, 40, NAN])
    np.testing.assert_array_equal(tables.flaps_extended_speed(angles, limits), [NAN, NAN, 56, 56, 56, 46, 46, 46, NAN])
    twice = StepTable(np.radians([10, 10]), [56.0, 50.0])
    assert float(tables.flaps_extended_speed(np.radians(10), twice)) == 50.0


def test_a_linear_table_is_held_at_its_ends_and_says_so() -> None:
    table = Table([700, 960], [110, 128])
    np.testing.assert_allclose(
        tables.table_value(table, [600, 700, 830, 960, 1000, NAN]), [110, 110, 119, 128, 128, NAN]
    )
    np.testing.assert_array_equal(tables.outside_table(table, [600, 700, 960, 961, NAN]), [1, 0, 0, 1, 0])


def test_a_step_table_holds_from_its_place_to_the_next() -> None:
    table = Table([0, 1000, 2000], [5, 6, 7], "step")
    np.testing.assert_array_equal(
        tables.table_value(table, [-1, 0, 999, 1000, 1999, 2000, 9e9, NAN]), [5, 5, 5, 6, 6, 7, 7, NAN]
    )


@pytest.mark.parametrize(
    ("at", "value", "between"),
    [([1, 1], [1, 2], "linear"), ([2, 1], [1, 2], "linear"), ([1, NAN], [1, 2], "linear"), ([1, 2], [1, 2], "cubic")],
)
def test_tables_that_make_no_sense_are_refused(at: list[float], value: list[float], between: str) -> None:
    with pytest.raises(ValueError, match="Table"):
        Table(at, value, between)  # type: ignore[arg-type]
