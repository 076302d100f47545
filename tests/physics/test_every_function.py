"""One contract for every public function of physics: shape, inputs untouched, NaN in its own place, slices, no inf.

A new function gets these checks by being there; its parameters must be named in SAMPLES, or it be listed in OTHERWISE
with what checks it instead.
"""

from __future__ import annotations

import importlib
import inspect
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from exceed.physics.envelope import LoadFactorTable, StepTable, Table
from exceed.physics.loading import LoadingEnvelope
from exceed.physics.stall import StallTable

MODULES = (
    "atmosphere",
    "airspeed",
    "turning",
    "axes",
    "kinematics",
    "smoothing",
    "stall",
    "tables",
    "load_limits",
    "category",
    "envelope",
    "design_speeds",
    "gust",
    "loading",
    "counting",
    "uncertainty",
)

NAN = float("nan")
STALL = StallTable(np.radians([0, 30]), [960, 960], [28.0, 25.0], [34.0, 31.0])
LIMITS = LoadFactorTable(
    np.radians([0, 0, 30]), [880, 960, NAN], [NAN] * 3, [NAN] * 3, [6, 4.4, 2], [-3, -1.76, 0]
)  # fmt: skip
BY_MASS = Table([700, 960], [56, 66])
FLAPS = StepTable(np.radians([10, 30]), [56, 46])
ENVELOPE = LoadingEnvelope([640, 960], [0.90, 0.96], [1.10, 1.10])

# What a parameter is tried with: a range of ordinary values
SAMPLES: dict[str, tuple[float, float]] = {
    "pressure_altitude": (-900, 19000),
    "static_pressure": (6000, 110000),
    "static_air_temperature": (215, 310),
    "total_air_temperature": (215, 330),
    "altimeter_setting": (95000, 105000),
    "indicated_altitude": (0, 5000),
    "geometric_altitude": (-900, 20000),
    "geopotential_altitude": (-900, 20000),
    "calibrated_airspeed": (1, 250),
    "equivalent_airspeed": (1, 250),
    "true_airspeed": (20, 250),
    "ground_speed": (20, 250),
    "impact_pressure": (10, 150000),
    "mach": (0.05, 2.0),
    "recovery_factor": (0.8, 1.0),
    "bank_angle": (-1.4, 1.4),
    "bank_angle_uncertainty": (0.001, 0.05),
    "load_factor": (1.0, 6.0),
    "turn_rate": (0.01, 0.3),
    "turned": (0.1, 6.0),
    "pull_up_radius": (100, 900),
    "flight_path_angle": (-0.5, 0.5),
    "flight_path_angle_rate": (-0.2, 0.2),
    "heading": (0, 6.2),
    "track_angle": (0, 6.2),
    "roll_rate": (-2, 2),
    "pitch_rate": (0.01, 1),
    "yaw_rate": (0.01, 0.5),
    "roll_acceleration": (-3, 3),
    "pitch_acceleration": (-3, 3),
    "yaw_acceleration": (-1, 1),
    "longitudinal_load_factor": (-0.5, 0.5),
    "lateral_load_factor": (-0.5, 0.5),
    "angle_of_attack": (-0.1, 0.3),
    "vertical_speed": (-15, 15),
    "vertical_acceleration": (-20, 50),
    "pitch_angle": (-0.8, 0.8),
    "specific_force_down": (-60, 20),
    "amplitude": (0, 2),
    "frequency": (0.1, 2),
    "sample_rate": (8, 50),
    "touchdown_sink_rate": (0, 5),
    "stopping_time": (0.05, 0.5),
    "mass": (645, 955),
    "reference_mass": (700, 960),
    "flap_angle": (0, 0.5),
    "speed": (20, 60),
    "stall_speed": (20, 60),
    "stall_speed_inverted": (20, 60),
    "airspeed": (20, 90),
    "airbrakes_out": (0, 1),
    "load_factor_maximum": (2, 6),
    "load_factor_minimum": (-3, -1),
    "load_factor_maximum_at_dive": (1, 2),
    "load_factor_minimum_at_dive": (-1, 0),
    "load_factor_at_cruise": (-2, -1),
    "load_factor_at_dive": (-1, 0),
    "cruise_speed": (60, 70),
    "dive_speed": (80, 90),
    "speed_limit": (260, 290),
    "maximum_take_off_mass": (500, 60000),
    "wing_loading": (40, 400),
    "stall_speed_clean": (20, 40),
    "stall_speed_flaps": (20, 40),
    "minimum_control_speed": (0, 60),
    "wing_area": (10, 30),
    "mean_chord": (1, 3),
    "lift_curve_slope": (4, 6),
    "density": (0.2, 1.3),
    "mass_ratio": (2, 90),
    "gust_velocity": (-15, 15),
    "load_factor_increment": (-1, 1),
    "gust_constant": (0.6, 0.62),
    "reference_gust_velocity": (6, 17),
    "gust_gradient": (10, 100),
    "flight_profile_factor": (0.6, 1),
    "design_gust": (6, 17),
    "penetration": (0, 50),
    "gust_alleviation_factor": (0.3, 0.8),
    "duration": (0.5, 4),
    "centre_of_gravity": (0.9, 1.1),
    "added_mass": (-50, 50),
    "added_arm": (0.5, 1.5),
    "moved_mass": (0, 50),
    "distance": (-1, 1),
    "chord_leading_edge": (0.5, 0.6),
    "fuel_volume": (0, 0.2),
    "fuel_density": (700, 830),
    "fuel_mass_flow": (0, 0.01),
    "elapsed": (0, 7200),
    "maximum_mass": (800, 960),
    "damage": (0.01, 2),
    "half_width": (0, 1),
    "step": (0, 1),
    "standard_uncertainty": (0.01, 0.3),
    "share": (0, 0.1),
    "span": (1, 20),
    "bits": (8, 16),
    "z": (-4, 4),
    "value": (3, 7),
    "limit": (3, 7),
    "lower_limit": (3, 4),
    "upper_limit": (5, 7),
    "probability": (0.01, 0.99),
    "under_read": (0.01, 0.9),
    "sampled_increment": (0.1, 3),
    "at": (600, 1000),
}

# Facts and options: one value for the whole call
FACTS: dict[str, Any] = {
    "stall_table": STALL,
    "load_factor_table": LIMITS,
    "loading_envelope": ENVELOPE,
    "table": BY_MASS,
    "flaps_extended": FLAPS,
    "flap_settings": np.radians([0, 10, 30]),
    "accelerometer_position": (0.35, 0.05, -0.1),
    "rolling_factor": 0.667,
    "rolling_above": 0.26,
    "coverage_factor": 2.0,
    "guard_share": 1.0,
    "category": "utility",
}

# A key that no row of the table asks for may be NaN, and `where a condition is stated` changes follow
MAY_BE_NAN = {
    ("load_factor_maximum", "airspeed"),
    ("load_factor_maximum", "airbrakes_out"),
    ("load_factor_minimum", "airspeed"),
    ("load_factor_minimum", "airbrakes_out"),
    ("envelope_upper", "cruise_speed"),  # NaN there means that there is none
    ("envelope_upper", "load_factor_maximum_at_dive"),
    ("envelope_lower", "cruise_speed"),
    ("envelope_lower", "load_factor_minimum_at_dive"),
}
# 30 degrees of flaps have no mass key: an unknown mass does not hide that limit
CONDITIONAL = {("load_factor_maximum", "mass"), ("load_factor_minimum", "mass")}

# Not sample by sample, or answering with something other than an array of floats; each has its own test file
OTHERWISE = {
    "specific_force_at_cg",
    "specific_force_at_sensor",
    "smooth",
    "smooth_derivative",
    "smooth_derivative_uncertainty",
    "smooth_uncertainty",
    "unwrap_angle",
    "freeze",
    "outside_table",
    "past_last_setting",
    "overweight_for_limits",
    "category_load_factors",
    "envelope",
    "mass_of_load_factor",
    "design_gust_velocity",
    "peaks_between_means",
    "is_gust",
    "total_mass",
    "total_moment",
    "centre_of_gravity_of_stations",
    "fuel_burnt",
    "overweight",
    "turning_points",
    "level_crossings",
    "level_crossings_of_steps",  # the sum of its steps is the whole: tests/test_spectra.py
    "peak_counts",
    "rainflow",
    "rainflow_repeating",
    "simple_ranges",
    "range_pairs",
    "miner_damage",
    "damage_power_law",
    "equivalent_range",
    "combined_uncertainty",
}


def _public() -> dict[str, Callable[..., Any]]:
    found = {}
    for name in MODULES:
        module = importlib.import_module(f"exceed.physics.{name}")
        for key, value in vars(module).items():
            if inspect.isfunction(value) and not key.startswith("_") and value.__module__ == module.__name__:
                found[f"{name}.{key}"] = value
    return found


PUBLIC = _public()
SAMPLE_BY_SAMPLE = {key: f for key, f in PUBLIC.items() if f.__name__ not in OTHERWISE}
each = pytest.mark.parametrize("function", SAMPLE_BY_SAMPLE.values(), ids=SAMPLE_BY_SAMPLE.keys())


def _arrays(function: Callable[..., Any], n: int = 40) -> tuple[dict[str, Any], dict[str, Any]]:
    rng = np.random.default_rng(7)
    arrays, facts = {}, {}
    for name in inspect.signature(function).parameters:
        if name in FACTS:
            facts[name] = FACTS[name]
        else:
            low, high = SAMPLES[name]
            arrays[name] = rng.uniform(low, high, n)
    return arrays, facts


def test_every_public_function_is_checked_here_or_listed() -> None:
    assert {f.__name__ for f in PUBLIC.values()} >= OTHERWISE
    for function in SAMPLE_BY_SAMPLE.values():
        for name in inspect.signature(function).parameters:
            assert name in SAMPLES or name in FACTS, f"{function.__name__}: no sample for {name}"


@each
def test_ordinary_inputs_give_finite_answers_of_the_right_shape_and_stay_as_they_were(
    function: Callable[..., Any],
) -> None:
    arrays, facts = _arrays(function)
    before = {name: array.copy() for name, array in arrays.items()}
    for array in arrays.values():
        array.flags.writeable = False
    answer = function(**arrays, **facts)
    assert np.shape(answer) == (40,)
    assert answer.dtype == np.float64
    assert answer.flags.writeable, "an answer is the caller's own"
    if function.__name__ != "flaps_extended_speed":  # not applicable with flaps up
        assert np.isfinite(answer).mean() > 0.4, "the samples of this test say too little about this function"
    for name, array in arrays.items():
        np.testing.assert_array_equal(array, before[name])
        assert not np.shares_memory(array, answer)


@each
def test_nan_comes_out_where_it_went_in_and_only_there(function: Callable[..., Any]) -> None:
    arrays, facts = _arrays(function)
    clean = function(**arrays, **facts)
    for name in arrays:
        if (function.__name__, name) in MAY_BE_NAN:
            continue
        dirty = {key: array.copy() for key, array in arrays.items()}
        dirty[name][11] = np.nan
        answer = function(**dirty, **facts)
        if (function.__name__, name) not in CONDITIONAL:
            assert np.isnan(answer[11]), f"NaN in {name} vanished"
        np.testing.assert_array_equal(np.delete(answer, 11), np.delete(clean, 11), err_msg=name)


@each
def test_a_slice_gives_the_slice_of_the_whole_and_a_scalar_the_same_number(function: Callable[..., Any]) -> None:
    arrays, facts = _arrays(function)
    whole = function(**arrays, **facts)
    part = function(**{name: array[13:29] for name, array in arrays.items()}, **facts)
    np.testing.assert_allclose(part, whole[13:29], rtol=1e-12, atol=1e-300)
    one = function(**{name: float(array[17]) for name, array in arrays.items()}, **facts)
    assert np.ndim(one) == 0
    np.testing.assert_allclose(one, whole[17], rtol=1e-12, atol=1e-300)


@each
def test_hostile_numbers_give_no_warning_and_no_infinity(function: Callable[..., Any]) -> None:
    """Warnings are errors in these tests."""
    hostile = np.array([0.0, -0.0, np.nan, np.inf, -np.inf, 1e308, -1e308, 1e-308, -1.0, 90.0, np.pi / 2])
    hostile.flags.writeable = False
    arrays, facts = _arrays(function, hostile.size)
    for name in arrays:
        answer = function(**{**arrays, name: hostile}, **facts)
        assert not np.isinf(answer).any(), name
    answer = function(**dict.fromkeys(arrays, hostile), **facts)
    assert not np.isinf(answer).any()


SEVERAL = {key: f for key, f in SAMPLE_BY_SAMPLE.items() if len(_arrays(f)[0]) > 1}


@pytest.mark.parametrize("function", SEVERAL.values(), ids=SEVERAL.keys())
def test_shapes_that_do_not_broadcast_are_refused(function: Callable[..., Any]) -> None:
    arrays, facts = _arrays(function)
    names = list(arrays)
    with pytest.raises(ValueError, match=r"broadcast|shape"):
        function(**{**arrays, names[0]: np.ones(7)}, **facts)


@each
def test_an_empty_array_gives_an_empty_array(function: Callable[..., Any]) -> None:
    arrays, facts = _arrays(function, 0)
    assert np.shape(function(**arrays, **facts)) == (0,)
