"""Which row of the limit load factors holds."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from exceed.physics import load_limits
from exceed.physics.load_limits import LoadFactorTable, load_factor_maximum, load_factor_minimum

NAN = float("nan")


def table(*rows: dict[str, float]) -> LoadFactorTable:
    keys = ("flaps", "mass", "speed", "airbrakes", "maximum", "minimum")
    columns = [[row.get(key, NAN) for row in rows] for key in keys]
    return LoadFactorTable(np.radians(columns[0]), *columns[1:])


def limits(
    facts: LoadFactorTable, flaps: float = 0.0, mass: float = NAN, speed: float = NAN, airbrakes: float = NAN
) -> tuple[float, float]:
    keys = (np.radians(flaps), mass, speed, airbrakes, facts)
    return float(load_factor_maximum(*keys)), float(load_factor_minimum(*keys))


# an aerobatic two-seater (invented)
AEROBATIC = table(
    {"flaps": 0, "mass": 880, "maximum": 6, "minimum": -3},
    {"flaps": 0, "mass": 960, "maximum": 4.4, "minimum": -1.76},
    {"flaps": 30, "maximum": 2, "minimum": 0},
)


def test_mass_steps_hold_up_to_and_including_their_mass() -> None:
    assert limits(AEROBATIC, mass=500) == (6, -3), "never raised for a low mass"
    assert limits(AEROBATIC, mass=880) == (6, -3)
    assert limits(AEROBATIC, mass=880.1) == (4.4, -1.76)
    assert limits(AEROBATIC, mass=960) == (4.4, -1.76)


def test_above_the_last_mass_the_limit_shrinks_with_it() -> None:
    assert limits(AEROBATIC, mass=1200) == pytest.approx((4.4 * 0.8, -1.76 * 0.8))
    assert list(load_limits.overweight_for_limits([960.0, 960.1, NAN], AEROBATIC)) == [False, True, False]
    assert not load_limits.overweight_for_limits(9e9, table({"maximum": 6}))


def test_the_flap_rule_picks_the_row() -> None:
    assert limits(AEROBATIC, flaps=1, mass=800) == (6, -3)
    assert limits(AEROBATIC, flaps=1.5, mass=800) == (2, 0)
    assert limits(AEROBATIC, flaps=31, mass=800) == (2, 0)
    assert limits(AEROBATIC, flaps=45, mass=1500) == (2, 0), "past the last setting the last row; it has no mass key"


def test_an_unknown_key_hides_the_limit_only_where_it_could_decide() -> None:
    assert all(np.isnan(limits(AEROBATIC)))
    assert limits(AEROBATIC, flaps=30) == (2, 0)
    assert all(np.isnan(limits(AEROBATIC, flaps=NAN, mass=800)))
    assert limits(table({"maximum": 6, "minimum": -3}), flaps=NAN) == (6, -3)


def test_a_row_without_flaps_is_for_any_flaps_that_no_row_names() -> None:
    facts = table({"maximum": 3.8, "minimum": -1.52}, {"flaps": 40, "maximum": 2, "minimum": 0})
    assert limits(facts) == (3.8, -1.52)
    assert limits(facts, flaps=20) == (2, 0)
    assert limits(facts, flaps=60) == (2, 0)
    only_up = table({"maximum": 2}, {"flaps": 0, "maximum": 6})
    assert limits(only_up)[0] == 6
    assert limits(only_up, flaps=20)[0] == 2, "a row for flaps up is not stretched to flaps out"
    alone = table({"flaps": 0, "maximum": 6})
    assert limits(alone, flaps=20)[0] == 6, "past the last setting the last one, for want of better"


def test_clean_without_a_row_for_it_is_unknown() -> None:
    assert np.isnan(limits(table({"flaps": 20, "maximum": 2}))[0])


def test_airbrakes_and_speed_are_keys_too() -> None:
    sailplane = table(
        {"speed": 45, "maximum": 5.3, "minimum": -2.65},
        {"speed": 70, "maximum": 4, "minimum": -1.5},
        {"airbrakes": 1, "maximum": 3.5},
    )
    assert limits(sailplane, speed=40, airbrakes=0) == (5.3, -2.65)
    assert limits(sailplane, speed=45.1, airbrakes=0) == (4, -1.5)
    assert limits(sailplane, speed=90, airbrakes=0) == (4, -1.5), "beyond the last speed its row goes on holding"
    assert limits(sailplane, speed=40, airbrakes=1) == (3.5, -2.65), "neither key is tighter: the more protective"
    assert limits(sailplane, speed=60, airbrakes=1) == (3.5, -1.5), "a row that gives no minimum leaves it to others"
    assert np.isnan(limits(sailplane, speed=40)[0]), "unknown airbrakes could be out"
    assert np.isnan(limits(sailplane, airbrakes=0)[0])


def test_the_tighter_row_holds_even_where_its_limit_is_the_higher_one() -> None:
    facts = table({"maximum": 3.8}, {"mass": 800, "maximum": 6})
    assert limits(facts, mass=700)[0] == 6
    assert limits(facts, mass=800.1)[0] == 3.8, "the row for any mass, below the shrunken 6"
    assert limits(facts, mass=1600)[0] == pytest.approx(3.0), "where the shrunken one is lower it protects"


def test_a_lighter_rows_speed_does_not_reach_into_the_heavier_row() -> None:
    facts = table({"mass": 880, "speed": 50, "maximum": 6}, {"mass": 960, "maximum": 4.4})
    assert limits(facts, mass=850, speed=40)[0] == 6
    assert limits(facts, mass=900, speed=40)[0] == 4.4
    assert limits(facts, mass=850, speed=60)[0] == 4.4
    assert limits(facts, mass=1200, speed=40)[0] == pytest.approx(4.4 * 0.8)


def test_a_row_that_lists_the_mass_is_the_manuals_word_on_it() -> None:
    facts = table({"flaps": 0, "mass": 880, "maximum": 3}, {"mass": 960, "maximum": 4.4})
    assert limits(facts, mass=850)[0] == 3
    assert limits(facts, mass=900)[0] == 4.4, "not the lighter row's 3, shrunken"
    assert limits(facts, mass=1200)[0] == pytest.approx(3 * 880 / 1200), "nobody lists it: the more protective"


def test_beyond_the_last_mass_and_speed_it_is_the_last_row_that_holds_not_an_earlier_one() -> None:
    by_mass = table({"mass": 880, "speed": 50, "maximum": 3}, {"mass": 960, "maximum": 4.4})
    assert limits(by_mass, mass=1200, speed=40)[0] == pytest.approx(4.4 * 0.8)
    by_speed = table({"speed": 45, "maximum": 3}, {"speed": 70, "maximum": 4})
    assert limits(by_speed, speed=90)[0] == 4
    for_any = table({"speed": 45, "maximum": 3}, {"maximum": 4})
    assert limits(for_any, speed=90)[0] == 4, "the row for any speed, not the slower row's"


@given(st.floats(300, 3000), st.floats(0, 500), st.sampled_from([0.0, 15.0, 30.0, 45.0]))
def test_more_mass_never_raises_a_limit(mass: float, more: float, flaps: float) -> None:
    light, heavy = limits(AEROBATIC, flaps, mass), limits(AEROBATIC, flaps, mass + more)
    assert heavy[0] <= light[0]
    assert heavy[1] >= light[1]


@given(st.integers(0, 2**31))
def test_arrays_give_what_a_loop_over_samples_gives(seed: int) -> None:
    rng = np.random.default_rng(seed)
    flaps = np.radians(rng.choice([0.0, 0.5, 15, 30, 50, NAN], 12))
    mass, speed = rng.choice([700.0, 880, 900, 960, 1100, NAN], 12), rng.choice([30.0, 60, NAN], 12)
    facts = table(
        {"flaps": 0, "mass": 880, "maximum": 6},
        {"flaps": 0, "mass": 960, "speed": 50, "maximum": 4.4},
        {"mass": 960, "maximum": 3.8},
        {"flaps": 30, "maximum": 2},
    )
    whole = load_factor_maximum(flaps, mass, speed, NAN, facts)
    each = [float(load_factor_maximum(f, m, v, NAN, facts)) for f, m, v in zip(flaps, mass, speed, strict=True)]
    np.testing.assert_array_equal(whole, each)


def test_rolling_reduces_the_positive_limit_above_its_rate_on_either_side() -> None:
    reduced = load_limits.load_factor_maximum_rolling(6.0, np.radians([0, 15, 16, -16, NAN]), 2 / 3, np.radians(15))
    np.testing.assert_allclose(reduced, [6, 6, 4, 4, NAN])


def test_margin_is_to_the_nearer_limit_and_unknown_where_either_is() -> None:
    np.testing.assert_allclose(load_limits.load_factor_margin([1, 5, -2, 7], 6, -3), [4, 1, 1, -1])
    assert np.isnan(load_limits.load_factor_margin(7.0, 6.0, NAN))


def test_masses_and_speeds_that_are_not_positive_are_refused() -> None:
    with pytest.raises(ValueError, match="must be positive"):
        table({"mass": 0, "maximum": 6})
