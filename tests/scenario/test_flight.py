"""The flight model agrees with itself and with the mechanics that everybody knows."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
import pytest

from scenario import manoeuvres as do
from scenario.air import DEG, FT, G0, KT, standard_pressure, standard_temperature
from scenario.airframes import LARKSPUR
from scenario.flight import STEP, Flight, fly
from scenario.sensors import Sensor, accelerations_at, beyond, sample


@lru_cache(maxsize=1)
def aerobatic_flight() -> Flight:
    plan = [
        do.standing(10), do.taxi(40), do.take_off(), do.climb(3500, 85, 1400), do.level(25, 145, 3500),
        do.steep_turn(60, 25, None, 3500, 120), do.level(25, 140, 3500), do.loop(4.0), do.recover(3500, 125),
        do.roll(90), do.recover(3500, 120), do.inverted(8, 115), do.recover(3500, 140, 30), do.pull(4.5),
        do.recover(3500, 110), do.turn_to(240, 100, 3500), do.descend(1200, 95, 1500), do.turn_to(240, 80, 1200),
        do.level(5, 75, 1200), do.approach(68, [(900, 15), (500, 30)]), do.landing(120), do.taxi(40, 330),
        do.standing(5),
    ]  # fmt: skip
    return fly(LARKSPUR, plan, mass=905.0, fuel=50.0, temperature_deviation=8.0)


def stretch(flight: Flight, label: str, skip: float = 0.0) -> slice:
    """Samples of the first stretch of one label, without its first `skip` seconds."""
    names = [*flight.labels, (float(flight.time[-1]), "end")]
    first = next(i for i, (_, name) in enumerate(names) if name == label)
    return slice(round((names[first][0] + skip) / STEP), round(names[first + 1][0] / STEP))


def airborne(flight: Flight) -> np.ndarray:
    return flight["weight_on_wheels"] < 0.5


def test_height_changes_by_the_vertical_speed() -> None:
    flight = aerobatic_flight()
    rate = np.gradient(flight["height_above_aerodrome"], STEP)
    inside = airborne(flight) & np.roll(airborne(flight), 2) & np.roll(airborne(flight), -2)
    assert np.max(np.abs(rate - flight["vertical_speed"])[inside]) < 0.02


def test_pressure_altitude_changes_less_than_height_in_warm_air() -> None:
    flight = aerobatic_flight()
    inside = stretch(flight, "climb", 20.0)
    gained = np.ptp(flight["height_above_aerodrome"][inside])
    pressure_gained = np.ptp(flight["pressure_altitude"][inside])
    middle = np.mean(flight["pressure_altitude"][inside])
    ratio = (standard_temperature(middle) + 8.0) / standard_temperature(middle)
    assert gained / pressure_gained == pytest.approx(float(ratio), rel=2e-3)


def test_static_pressure_is_that_of_the_pressure_altitude() -> None:
    # ISO 2533: 5000 m -> 54 020 Pa, 255.65 K (from memory)
    assert float(standard_pressure(5000.0)) == pytest.approx(54020.0, abs=5.0)
    assert float(standard_temperature(5000.0)) == pytest.approx(255.65)


def test_specific_force_and_gravity_give_the_acceleration() -> None:
    """Body load factors turned into the horizon plus gravity equal the change of velocity."""
    flight = aerobatic_flight()
    phi, theta, psi = flight["bank_angle"], flight["pitch_angle"], flight["heading"]
    forward, up = flight["longitudinal_load_factor"] * G0, -flight["load_factor"] * G0
    # third and first row of the body-to-horizon rotation (ISO 1151-2 angles)
    down = -np.sin(theta) * forward + np.cos(phi) * np.cos(theta) * up + G0
    north = (
        np.cos(theta) * np.cos(psi) * forward
        + (np.cos(phi) * np.sin(theta) * np.cos(psi) + np.sin(phi) * np.sin(psi)) * up
    )
    inside = airborne(flight)
    for edge in np.flatnonzero(np.diff(inside.astype(int))):
        inside[max(edge - 60, 0) : edge + 60] = False
    fall = -np.gradient(flight["vertical_speed"], STEP)
    northward = np.gradient(flight["velocity_north"], STEP)
    assert np.sqrt(np.mean((down - fall)[inside] ** 2)) < 0.05
    assert np.sqrt(np.mean((north - northward)[inside] ** 2)) < 0.05
    assert np.percentile(np.abs(down - fall)[inside], 99.9) < 0.4


def test_body_rates_are_those_of_the_attitude() -> None:
    """Euler kinematics: dphi/dt = p + tan(theta) (q sin phi + r cos phi), away from the vertical."""
    flight = aerobatic_flight()
    phi, theta = np.unwrap(flight["bank_angle"]), flight["pitch_angle"]
    p, q, r = flight["roll_rate"], flight["pitch_rate"], flight["yaw_rate"]
    inside = airborne(flight) & (np.abs(theta) < 60 * DEG)
    for edge in np.flatnonzero(np.diff(inside.astype(int))):
        inside[max(edge - 10, 0) : edge + 10] = False
    roll = p + np.tan(theta) * (q * np.sin(phi) + r * np.cos(phi))
    pitch = q * np.cos(phi) - r * np.sin(phi)
    assert np.percentile(np.abs(np.gradient(phi, STEP) - roll)[inside], 99.9) < 0.04
    assert np.percentile(np.abs(np.gradient(theta, STEP) - pitch)[inside], 99.9) < 0.04


def test_level_turn_has_the_load_factor_and_rate_of_its_bank() -> None:
    """FAA-H-8083-25: 2 g at 60 degrees; turn rate g tan(bank) / V."""
    flight = aerobatic_flight()
    inside = stretch(flight, "steep turn", 12.0)
    bank, speed = flight["bank_angle"][inside], flight["true_airspeed"][inside]
    assert np.median(bank) / DEG == pytest.approx(60.0, abs=0.5)
    assert np.median(flight["load_factor"][inside]) == pytest.approx(2.0, abs=0.03)
    velocity_heading = np.unwrap(np.arctan2(flight["velocity_east"][inside] + 4.0 * np.sin(240 * DEG),
                                            flight["velocity_north"][inside] + 4.0 * np.cos(240 * DEG)))  # fmt: skip
    rate = np.gradient(velocity_heading, STEP)
    assert np.median(rate / (G0 * np.tan(bank) / speed)) == pytest.approx(1.0, abs=0.01)


def test_stands_with_one_g_and_no_speed() -> None:
    flight = aerobatic_flight()
    inside = stretch(flight, "standing")
    assert np.allclose(flight["load_factor"][inside], 1.0, atol=1e-3)
    assert np.all(flight["ground_speed"][inside] == 0.0)


def test_loop_and_inverted_flight_have_the_signs_of_the_trade() -> None:
    flight = aerobatic_flight()
    assert 3.6 < np.max(flight["load_factor"][stretch(flight, "loop")]) < 4.3
    assert np.max(np.abs(flight["pitch_angle"][stretch(flight, "loop")])) > 80 * DEG
    inverted = stretch(flight, "inverted", 5.0)
    assert np.median(flight["load_factor"][inverted]) == pytest.approx(-1.0, abs=0.1)
    assert np.median(np.abs(flight["bank_angle"][inverted])) > 170 * DEG


def test_pull_peaks_where_it_was_asked() -> None:
    flight = aerobatic_flight()
    assert np.max(flight["load_factor"][stretch(flight, "pull")]) == pytest.approx(4.5, abs=0.06)


def test_impact_takes_the_sink_rate_away() -> None:
    flight = aerobatic_flight()
    (touch,) = flight.marked("touchdown")
    inside = slice(round(touch / STEP), round(touch / STEP) + 18)
    sink = -flight["vertical_speed"][inside.start]
    gained = np.sum((flight["load_factor"][inside] - 1.0) * G0 * STEP)
    assert sink == pytest.approx(0.6, abs=0.2)
    assert gained == pytest.approx(sink, rel=0.1)


def test_airspeeds_agree_at_sea_level_and_part_aloft() -> None:
    flight = aerobatic_flight()
    low = int(np.flatnonzero(airborne(flight))[50])
    assert flight["calibrated_airspeed"][low] == pytest.approx(flight["equivalent_airspeed"][low], rel=1e-3)
    high = stretch(flight, "inverted").start
    assert flight["true_airspeed"][high] > 1.04 * flight["calibrated_airspeed"][high]
    assert flight["pressure_altitude"][high] / FT > 2500
    # position error of the Larkspur at 100 KIAS is +1 kt
    near = np.argmin(np.abs(flight["indicated_airspeed"] - 100 * KT))
    assert (flight["calibrated_airspeed"] - flight["indicated_airspeed"])[near] / KT == pytest.approx(1.0, abs=0.02)


def test_sensor_off_the_centre_of_gravity_feels_the_pitching() -> None:
    flight = aerobatic_flight()
    same = accelerations_at(flight, (0.0, 0.0, 0.0))["load_factor"]
    assert np.array_equal(same, flight["load_factor"])
    ahead = accelerations_at(flight, (1.0, 0.0, 0.0))["load_factor"]
    expected = (np.gradient(flight["pitch_rate"], STEP) - flight["roll_rate"] * flight["yaw_rate"]) / G0
    assert np.allclose(ahead - flight["load_factor"], expected, atol=1e-9)
    # a place ahead moves up when the nose is raised faster: the sensor reads more
    raised = int(np.argmax(np.gradient(flight["pitch_rate"], STEP)))
    assert ahead[raised] > flight["load_factor"][raised]


def test_sampling_keeps_to_its_rate_step_range_and_gaps() -> None:
    flight = aerobatic_flight()
    sensor = Sensor(rate_hz=8.0, step=0.01, high=4.0, dropouts=((100.0, 101.0),), spikes=((50.0, 3.9),))
    time, values = sample(flight, "load_factor", sensor, seed=3)
    assert np.allclose(np.diff(time), 0.125)
    assert np.nanmax(values) == 4.0
    assert np.isnan(values[(time >= 100.0) & (time < 101.0)]).all()
    assert values[400] == pytest.approx(3.9)
    good = values[np.isfinite(values)]
    assert np.allclose(good * 100, np.round(good * 100))


def test_beyond_gives_linear_crossings() -> None:
    time = np.arange(6.0)
    values = np.array([0.0, 2.0, 4.0, 2.0, 0.0, 0.0])
    assert beyond(time, values, 3.0) == [(1.5, 2.5, 4.0, 2.0)]
    assert beyond(time, -values, -3.0, above=False) == [(1.5, 2.5, -4.0, 2.0)]
