"""Specific force between points and axes, against a rotation library and motion built from its own path."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from exceed.core.constants import STANDARD_GRAVITY
from exceed.physics import kinematics, turning

small = st.floats(-3.0, 3.0)
triples = st.tuples(small, small, small)


@given(triples, triples, triples, triples)
def test_to_the_sensor_and_back_to_the_cg(
    force: tuple[float, ...], rates: tuple[float, ...], accelerations: tuple[float, ...], position: tuple[float, ...]
) -> None:
    there = kinematics.specific_force_at_sensor(force, rates, accelerations, position)
    back = kinematics.specific_force_at_cg(there, rates, accelerations, position)
    np.testing.assert_allclose(back, force, atol=1e-12)


@given(triples, triples, triples, triples)
def test_the_three_load_factors_are_the_components_of_the_vector(
    force: tuple[float, ...], rates: tuple[float, ...], accelerations: tuple[float, ...], position: tuple[float, ...]
) -> None:
    expected = kinematics.specific_force_at_cg(force, rates, accelerations, position) / STANDARD_GRAVITY
    nx, ny, nz = force[0] / STANDARD_GRAVITY, force[1] / STANDARD_GRAVITY, -force[2] / STANDARD_GRAVITY
    dp, dq, dr = accelerations
    along = kinematics.longitudinal_load_factor_at_cg(nx, *rates, dq, dr, position)
    across = kinematics.lateral_load_factor_at_cg(ny, *rates, dp, dr, position)
    up = kinematics.load_factor_at_cg(nz, *rates, dp, dq, position)
    np.testing.assert_allclose([along, across, -up], expected, atol=1e-12)


def test_a_sensor_on_a_spinning_body_feels_what_its_own_path_says() -> None:
    """A point of a body that turns about its CG (itself at rest, no gravity): second difference of where it goes."""
    rates = np.array([1.1, -0.7, 0.4])
    position = np.array([0.5, -0.2, 0.3])
    step = 1e-4

    def place(time: float) -> np.ndarray:
        return np.asarray(Rotation.from_rotvec(rates * time).apply(position))

    acceleration = (place(step) - 2 * place(0.0) + place(-step)) / step**2
    felt = kinematics.specific_force_at_sensor(np.zeros(3), rates, np.zeros(3), position)
    np.testing.assert_allclose(felt, acceleration, atol=1e-6)


@given(st.floats(-1.4, 1.4), st.floats(-np.pi, np.pi), st.floats(-np.pi, np.pi))
def test_at_rest_the_three_axes_show_gravity_as_a_rotation_library_turns_it(
    pitch: float, bank: float, heading: float
) -> None:
    up = np.array([0.0, 0.0, -1.0])  # the reaction to gravity, north-east-down
    body = Rotation.from_euler("ZYX", [heading, pitch, bank]).inv().apply(up)
    shown = [
        float(kinematics.longitudinal_load_factor_at_rest(pitch)),
        float(kinematics.lateral_load_factor_at_rest(pitch, bank)),
        -float(kinematics.load_factor_at_rest(pitch, bank)),
    ]
    np.testing.assert_allclose(shown, body, atol=1e-12)


@given(st.floats(-1.0, 1.0), st.floats(-1.0, 1.0), st.floats(-30.0, 30.0), small, small)
def test_vertical_acceleration_gives_the_body_load_factor_back(
    pitch: float, bank: float, upward: float, nx: float, ny: float
) -> None:
    """Put a specific force together in body axes, turn it to the earth, and ask for its normal part."""
    nz = 2.5
    body = np.array([nx, ny, -nz]) * STANDARD_GRAVITY
    earth = Rotation.from_euler("ZYX", [0.3, pitch, bank]).apply(body)
    vertical = -earth[2] - STANDARD_GRAVITY
    found = kinematics.load_factor_from_vertical_acceleration(vertical, pitch, bank, nx, ny)
    assert float(found) == pytest.approx(nz, abs=1e-9)
    assert np.isfinite(kinematics.load_factor_from_vertical_acceleration(upward, pitch, bank))


def test_near_knife_edge_the_vertical_says_nothing() -> None:
    assert np.isnan(kinematics.load_factor_from_vertical_acceleration(0.0, 0.0, np.radians([86, 90, -94]))).all()
    assert np.isnan(kinematics.load_factor_from_flight_path(60.0, 0.1, 0.0, np.pi / 2))
    assert float(kinematics.load_factor_from_vertical_acceleration(0.0, 0.0, np.pi)) == pytest.approx(-1.0)


@given(st.floats(0.0, 1.3), st.floats(20.0, 250.0), st.floats(-0.3, 0.3))
def test_a_level_turn_seen_from_the_path_is_the_level_turn(bank: float, speed: float, pitch: float) -> None:
    rate = turning.turn_rate(bank, speed)
    expected = float(turning.load_factor_level_turn(bank))
    assert float(kinematics.load_factor_from_path_rates(speed, 0.0, rate, 0.0)) == pytest.approx(expected, rel=1e-9)
    assert float(kinematics.bank_angle_from_path_rates(speed, 0.0, rate, 0.0)) == pytest.approx(bank, abs=1e-9)
    q = kinematics.pitch_rate_level_turn(rate, pitch, bank)
    r = kinematics.yaw_rate_level_turn(rate, pitch, bank)
    again = kinematics.turn_rate_from_body_rates(q, r, pitch, bank)
    assert float(again) == pytest.approx(float(rate), abs=1e-12)
    if bank > 1e-6:
        assert float(kinematics.bank_angle_from_body_rates(q, r)) == pytest.approx(bank, rel=1e-9)
        # mirrored: the yaw rate changes sign, the pitch rate does not
        assert float(kinematics.bank_angle_from_body_rates(q, -r)) == pytest.approx(-bank, rel=1e-9)


@given(small, small, st.floats(-3.0, 3.0))
def test_turning_the_axes_keeps_the_size(nx: float, nz: float, alpha: float) -> None:
    lift = float(kinematics.load_factor_lift_axis(nx, nz, alpha))
    drag = float(kinematics.longitudinal_load_factor_path_axis(nx, nz, alpha))
    assert np.hypot(lift, drag) == pytest.approx(np.hypot(nx, nz), abs=1e-12)


def test_no_speed_and_a_climb_faster_than_the_speed_give_no_path_angle() -> None:
    assert np.isnan(kinematics.flight_path_angle([1.0, 70.0, -70.0], [0.0, 60.0, 60.0])).all()
    assert float(kinematics.flight_path_angle(60.0, 60.0)) == pytest.approx(np.pi / 2)
    assert np.isnan(kinematics.turn_rate_from_body_rates(0.1, 0.1, np.pi / 2, 0.0))
    assert np.isnan(kinematics.bank_angle_from_body_rates(0.0, 0.0))


def test_an_unrecorded_lever_arm_is_as_uncertain_as_drawn_motion_says() -> None:
    rng = np.random.default_rng(5)
    arm = (2.0, 0.3, -0.4)
    sizes = {"roll_rate": 0.3, "pitch_rate": 0.2, "yaw_rate": 0.1, "roll_acceleration": 1.0, "pitch_acceleration": 0.8}
    drawn = {name: size * rng.standard_normal(100_000) for name, size in sizes.items()}
    moved = kinematics.load_factor_at_cg(1.0, accelerometer_position=arm, **drawn)
    said = float(kinematics.lever_arm_uncertainty(arm, **sizes))
    assert said == pytest.approx(float(np.std(moved)), rel=0.05)
    assert float(kinematics.lever_arm_uncertainty((0, 0, 0), **sizes)) == 0.0
