"""The standard atmosphere against two open libraries, and there and back."""

from __future__ import annotations

import numpy as np
import pytest
from ambiance import Atmosphere
from fluids.atmosphere import ATMOSPHERE_1976
from hypothesis import example, given
from hypothesis import strategies as st

from exceed.core.constants import DENSITY_0, FOOT, PRESSURE_0, TEMPERATURE_0
from exceed.physics import atmosphere

altitudes = st.floats(-5000, 32000)


@pytest.mark.parametrize("geopotential", [-1000.0, 0.0, 5000.0, 10999.0, 11000.0, 11001.0, 15000.0, 20000.0, 25000.0])
def test_agrees_with_two_open_libraries(geopotential: float) -> None:
    """Both take geometric altitude; 3e-6 is the difference of their constants (R from molar mass)."""
    geometric = float(atmosphere.geometric_altitude(geopotential))
    theirs = Atmosphere(geometric)
    also = ATMOSPHERE_1976(geometric)
    pressure = float(atmosphere.static_pressure(geopotential))
    temperature = float(atmosphere.standard_temperature(geopotential))
    assert pressure == pytest.approx(float(theirs.pressure[0]), rel=3e-6)
    assert pressure == pytest.approx(also.P, rel=3e-6)
    assert temperature == pytest.approx(float(theirs.temperature[0]), rel=1e-9)
    assert temperature == pytest.approx(also.T, rel=1e-6)
    assert float(atmosphere.density(pressure, temperature)) == pytest.approx(float(theirs.density[0]), rel=5e-6)
    sound = float(atmosphere.speed_of_sound(temperature))
    assert sound == pytest.approx(float(theirs.speed_of_sound[0]), rel=3e-6)


@given(altitudes)
@example(0.0)
@example(-0.0)
@example(11000.0)
@example(20000.0)
@example(-5000.0)
@example(32000.0)
def test_pressure_and_back_returns_the_altitude(altitude: float) -> None:
    back = float(atmosphere.pressure_altitude(atmosphere.static_pressure(altitude)))
    assert back == pytest.approx(altitude, rel=1e-9, abs=1e-9)


@given(st.floats(900.0, 177000.0))
def test_altitude_and_back_returns_the_pressure(pressure: float) -> None:
    back = float(atmosphere.static_pressure(atmosphere.pressure_altitude(pressure)))
    assert back == pytest.approx(pressure, rel=1e-9)


@given(altitudes, altitudes)
def test_pressure_falls_with_altitude(one: float, other: float) -> None:
    low, high = sorted((one, other))
    if high - low > 1e-6:
        assert atmosphere.static_pressure(low) > atmosphere.static_pressure(high)


@given(st.floats(-4000, 19900))
def test_density_altitude_of_a_standard_day_is_the_pressure_altitude(altitude: float) -> None:
    pressure, temperature = atmosphere.static_pressure(altitude), atmosphere.standard_temperature(altitude)
    assert float(atmosphere.density_altitude(pressure, temperature)) == pytest.approx(altitude, abs=1e-6)


@given(st.floats(-5000, 80000))
def test_geometric_and_back_returns_the_geopotential(altitude: float) -> None:
    back = float(atmosphere.geopotential_altitude(atmosphere.geometric_altitude(altitude)))
    assert back == pytest.approx(altitude, rel=1e-9, abs=1e-9)


def test_layers_join_without_a_step() -> None:
    for edge in (11000.0, 20000.0):
        below, above = atmosphere.static_pressure([np.nextafter(edge, 0), np.nextafter(edge, 1e9)])
        assert below == pytest.approx(above, rel=1e-12)


def test_sea_level_is_the_definition() -> None:
    assert float(atmosphere.static_pressure(0.0)) == PRESSURE_0
    assert float(atmosphere.standard_temperature(0.0)) == TEMPERATURE_0
    assert float(atmosphere.standard_density(0.0)) == DENSITY_0
    assert float(atmosphere.pressure_altitude(PRESSURE_0)) == 0.0


def test_outside_its_range_the_atmosphere_is_not_known() -> None:
    assert np.isnan(atmosphere.static_pressure([-5000.1, 32000.1, np.inf, np.nan])).all()
    assert np.isnan(atmosphere.standard_temperature([-5000.1, 32000.1])).all()
    assert np.isnan(atmosphere.pressure_altitude([0.0, -1.0, 500.0, 2e5])).all()


def test_a_low_altimeter_setting_puts_pressure_altitude_above_the_reading() -> None:
    """980 hPa: 920 ft to add (27 ft a hectopascal near sea level, common practice)."""
    shifted = atmosphere.pressure_altitude_from_indicated(1000 * FOOT, 98000.0) / FOOT
    assert float(shifted) == pytest.approx(1920, abs=1)
    assert float(atmosphere.altimeter_shift(PRESSURE_0)) == 0.0


def test_high_and_low_samples_mixed_are_what_each_is_alone() -> None:
    mixed = np.array([-500.0, 12000.0, 3000.0, 21000.0, np.nan, 10999.9])
    alone = [float(atmosphere.static_pressure(altitude)) for altitude in mixed]
    np.testing.assert_array_equal(atmosphere.static_pressure(mixed), alone)
