"""The V-n diagram: its corners lie where its lines meet."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from exceed.core.constants import POUND
from exceed.physics import category, design_speeds, envelope

NAN = float("nan")


def test_corners_of_a_plain_diagram() -> None:
    """Stall 25 m/s, 4 g and -1 g inverted at 32 m/s, limit 80 m/s, cruise 60 m/s (invented)."""
    found = envelope.envelope(25.0, 32.0, 4.0, -1.0, 80.0, cruise_speed=60.0)
    expected = [
        ("stall at 1 g", 25.0, 1.0),
        ("stall line meets positive limit", 50.0, 4.0),
        ("cruise speed, positive limit", 60.0, 4.0),
        ("speed limit, positive limit", 80.0, 4.0),
        ("speed limit, negative limit", 80.0, -1.0),
        ("cruise speed, negative limit", 60.0, -1.0),
        ("stall line meets negative limit", 32.0, -1.0),
        ("inverted stall at -1 g", 32.0, -1.0),
    ]
    assert [
        (c.name, pytest.approx(c.equivalent_airspeed), pytest.approx(c.load_factor)) for c in found.corners
    ] == expected


def test_a_taper_to_the_dive_speed_bends_both_sides() -> None:
    """Utility category: -1.76 at V_C to -1.0 at V_D [14CFR23-OLD]."""
    found = envelope.envelope(25.0, 32.0, 4.4, -1.76, 90.0, 60.0, 4.4, -1.0)
    at = {corner.name: corner for corner in found.corners}
    assert at["speed limit, negative limit"].load_factor == pytest.approx(-1.0)
    assert at["cruise speed, negative limit"].load_factor == pytest.approx(-1.76)
    middle = float(envelope.envelope_lower(75.0, 32.0, -1.76, 90.0, 60.0, -1.0))
    assert middle == pytest.approx(-1.38)


def test_a_stall_line_that_meets_the_taper_meets_it_on_the_curve() -> None:
    found = envelope.envelope(25.0, 45.0, 4.0, -2.5, 90.0, 60.0, 4.0, -1.0)
    corner = next(c for c in found.corners if c.name == "stall line meets negative limit")
    assert 60 < corner.equivalent_airspeed < 90
    assert -((corner.equivalent_airspeed / 45.0) ** 2) == pytest.approx(corner.load_factor)
    assert corner.load_factor == pytest.approx(-2.5 + 1.5 * (corner.equivalent_airspeed - 60) / 30)


def test_a_speed_limit_below_the_stall_corner_cuts_the_stall_line() -> None:
    found = envelope.envelope(25.0, NAN, 9.0, -3.0, 60.0)
    names = [corner.name for corner in found.corners]
    assert "stall line meets positive limit" not in names
    assert found.corners[-1].load_factor == pytest.approx((60 / 25) ** 2)
    assert np.isnan(found.lower).all()
    assert not any("negative" in name or "inverted" in name for name in names)


@given(st.floats(15, 40), st.floats(1.5, 8), st.floats(-5, -0.5), st.floats(60, 150))
def test_the_boundary_is_within_the_limits_and_ends_at_the_speed_limit(
    stall: float, top: float, bottom: float, end: float
) -> None:
    found = envelope.envelope(stall, 1.2 * stall, top, bottom, end)
    assert found.equivalent_airspeed[0] == 0.0
    assert found.equivalent_airspeed[-1] == end
    assert (found.upper <= top).all()
    assert (found.lower >= bottom).all()
    assert (found.upper >= found.lower).all()
    assert (np.diff(found.upper) >= 0).all()
    assert np.isnan(envelope.envelope_upper([end * 1.001, -1.0], stall, top, end)).all()


def test_unknown_stall_or_limit_is_refused_with_its_name() -> None:
    for name, facts in (
        ("stall_speed", (NAN, NAN, 4.0, -1.0, 80.0)),
        ("load_factor_maximum", (25.0, NAN, NAN, -1.0, 80.0)),
        ("speed_limit", (25.0, NAN, 4.0, -1.0, 0.0)),
    ):
        with pytest.raises(ValueError, match=name):
            envelope.envelope(*facts)


def test_every_contract_category_has_a_row_and_gives_what_is_known() -> None:
    names = "normal utility aerobatic commuter transport very-light light-sport sailplane-utility sailplane-aerobatic"
    assert set(category.CATEGORIES) == set(names.split())
    for name in names.split():
        limits = category.category_load_factors(name, 2000.0)
        assert limits.maximum > 2
        assert limits.minimum < 0
        assert limits.category == name


def test_mass_dependent_categories_say_nothing_without_the_mass() -> None:
    for name in ("normal", "commuter", "transport"):
        assert np.isnan(category.category_load_factors(name).maximum)
        assert category.category_load_factors(name).needs_mass
    assert category.category_load_factors("transport", 30000.0).minimum == -1.0
    heavy = category.category_load_factors("normal", 12500 * POUND)
    assert heavy.maximum == pytest.approx(2.1 + 24000 / 22500)
    assert heavy.minimum == pytest.approx(-0.4 * heavy.maximum)
    with pytest.raises(ValueError, match="known: aerobatic, commuter"):
        category.category_load_factors("heavy")


@given(st.floats(2.6, 3.7))
def test_the_mass_of_a_load_factor_gives_it_back(n: float) -> None:
    mass = design_speeds.mass_of_load_factor(n)
    assert float(category.load_factor_maximum_by_mass(mass)) == pytest.approx(n)
    assert np.isnan(design_speeds.mass_of_load_factor(2.0))


def test_unknown_category_for_design_speeds_is_refused() -> None:
    with pytest.raises(ValueError, match="known: aerobatic"):
        design_speeds.cruise_speed_minimum(50.0, "transport")
