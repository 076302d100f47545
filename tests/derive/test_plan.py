"""A trace against the flight model's truth, the choice of methods, and what is needed for what."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from derive.flown import SENSORS, aerobatics, circuits, larkspur, truth_at
from derive.logs import channel_of, make, only, recording_of, without
from scenario.sensors import Sensor

from exceed.core.quantities import TRACE_ORDER
from exceed.core.recording import Recording
from exceed.core.trace import Trace
from exceed.derive.plan import build_trace, needed_channels
from exceed.documents.aircraft import category_aircraft, load_aircraft

KT = 0.514444


def whole(trace: Trace, *names: str) -> tuple[np.ndarray, dict[str, np.ndarray]]:
    grid = trace.grid(names)
    return grid.time, trace.evaluate(names, grid)


def full() -> Trace:
    flown = aerobatics()
    take_off = float(np.interp(flown.marked("take_off")[0], flown.time, flown["mass"]))
    return build_trace(recording_of(flown, SENSORS), larkspur(), mass=take_off)


def airborne_error(trace: Trace, name: str, flown: object, truth: str | None = None) -> np.ndarray:
    time, values = whole(trace, name)
    inside = trace.track.airborne.contains(time)
    error = values[name] - truth_at(flown, truth or name, time)  # type: ignore[arg-type]
    return error[inside]


@pytest.mark.parametrize(
    ("name", "rms"),
    [
        ("load_factor", 0.012),  # noise 0.01 g and steps of 0.01 g, off the centre of gravity, datum error taken off
        ("calibrated_airspeed", 0.05),
        ("equivalent_airspeed", 0.05),
        ("true_airspeed", 0.08),
        ("mach", 0.0003),
        ("static_pressure", 4.0),
        ("mass", 0.05),
    ],
)
def test_derived_quantities_agree_with_the_truth(name: str, rms: float) -> None:
    error = airborne_error(full(), name, aerobatics())
    assert np.isfinite(error).all()
    assert np.sqrt(np.mean(error**2)) < rms


def test_vertical_speed_of_pressure_altitude_agrees_in_standard_air() -> None:
    recording = recording_of(circuits(), {"pressure_altitude": Sensor(4, step=0.3048), "indicated_airspeed": Sensor(4)})
    error = airborne_error(build_trace(recording), "vertical_speed", circuits())
    assert np.sqrt(np.nanmean(error**2)) < 0.35


def test_height_above_aerodrome_is_that_of_the_field_and_grows_with_pressure_altitude() -> None:
    recording = recording_of(circuits(), {"pressure_altitude": Sensor(1, step=0.3048), "indicated_airspeed": Sensor(4)})
    trace = build_trace(recording)
    error = airborne_error(trace, "height_above_aerodrome", circuits())
    assert np.max(np.abs(error)) < 8.0


def test_stall_speed_is_that_of_load_factor_mass_and_flaps() -> None:
    """V_s = 55 KCAS sqrt(n m / 960 kg) clean, 66 inverted, EAS taken as CAS below 4000 ft (0.1 kt)."""
    flown, trace = aerobatics(), full()
    time, values = whole(trace, "stall_speed")
    n, mass, flaps = (truth_at(flown, name, time) for name in ("load_factor", "mass", "flap_angle"))
    clean = (flaps < 1e-6) & trace.track.airborne.contains(time) & (n > 0.3)
    expected = 55 * KT * np.sqrt(np.maximum(n, 0.0) * mass / 960.0)
    assert np.percentile(np.abs(values["stall_speed"] - expected)[clean], 95) < 0.4
    below = trace.track.airborne.contains(time) & (n < -0.5)
    expected = 66 * KT * np.sqrt(np.maximum(-n, 0.0) * mass / 960.0)
    assert below.sum() > 20
    assert np.percentile(np.abs(values["stall_speed"] - expected)[below], 95) < 0.8


def test_stall_speed_and_margin_are_null_on_the_ground() -> None:
    trace = full()
    time, values = whole(trace, "stall_speed", "stall_margin", "stall_speed_ratio")
    ground = ~trace.track.airborne.contains(time)
    for name in values:
        assert np.isnan(values[name][ground]).all()
        assert np.isfinite(values[name][~ground]).mean() > 0.95


def test_limits_in_force_follow_mass_flaps_and_rolling() -> None:
    flown, trace = aerobatics(), full()
    time, values = whole(trace, "load_factor_maximum", "load_factor_minimum")
    flaps, rate = truth_at(flown, "flap_angle", time), np.abs(truth_at(flown, "roll_rate", time))
    # flaps are recorded once a second: look where they have stood still for two
    steady = np.abs(truth_at(flown, "flap_angle", time - 2.0) - truth_at(flown, "flap_angle", time + 2.0)) < 1e-9
    out = (flaps > np.radians(1.5)) & steady
    assert set(np.round(values["load_factor_maximum"][out & (rate < 0.2)], 6)) == {2.0}
    clean = (flaps == 0.0) & steady
    rolling, still = clean & (rate > np.radians(16)), clean & (rate < np.radians(14))
    assert set(np.round(values["load_factor_maximum"][rolling], 6)) == {round(4.4 * 0.667, 6)}
    assert set(np.round(values["load_factor_maximum"][still], 6)) == {4.4}
    assert set(np.round(values["load_factor_minimum"][clean], 6)) == {-1.76}
    light = build_trace(recording_of(aerobatics(), SENSORS), larkspur(), mass=850.0)
    assert whole(light, "load_factor_maximum")[1]["load_factor_maximum"].max() == pytest.approx(6.0)


def test_an_accelerometer_is_moved_to_the_centre_of_gravity_and_it_helps() -> None:
    ahead = {**SENSORS, "load_factor": Sensor(8, position=(3.0, 0.0, -0.5))}
    flown = aerobatics()
    text = "    position: [3 m, 0 m, -0.5 m]"
    aircraft = load_aircraft(f"format: exceed-aircraft/1\nrecorder:\n  accelerometer:\n{text}\n")
    moved = build_trace(recording_of(flown, ahead), aircraft)
    assert moved.steps["load_factor"].method == "accelerometer moved to the centre of gravity"
    left = build_trace(recording_of(flown, ahead), None)
    time, values = whole(moved, "load_factor")
    truth = truth_at(flown, "load_factor", time)
    # inside the pull, away from the instants at which the model's pilot changes his mind in no time
    (start,) = (when for when, label in flown.labels if label == "pull")
    inside = (time > start + 0.3) & (time < start + 2.0)
    both = values["load_factor"], whole(left, "load_factor")[1]["load_factor"]
    error = [np.sqrt(np.mean((one - truth)[inside] ** 2)) for one in both]
    assert error[1] > 0.2
    assert error[0] < 0.2 * error[1]
    # without the rates it stays where it is, with more uncertainty, and says so
    still = build_trace(without(recording_of(flown, ahead), "pitch_rate"), aircraft)
    assert still.steps["load_factor"].method == "accelerometer"
    assert still.steps["load_factor"].uncertainty > 0.05
    assert "off the centre of gravity" in (still.steps["load_factor"].assumes or "")


PATH = {
    "indicated_airspeed": Sensor(4, step=0.05),
    "pressure_altitude": Sensor(4, step=0.3),
    "bank_angle": Sensor(4),
    "heading": Sensor(4),
    "static_air_temperature": Sensor(1),
}


@pytest.mark.parametrize(
    ("drop", "method", "rms"),
    [
        ((), "attitude and flight path", 0.1),
        (("heading",), "flight path and bank", 0.1),
        (("bank_angle",), "flight path", 0.1),
        (("indicated_airspeed",), "level turn", 0.1),
        (("bank_angle", "heading"), "vertical acceleration", 0.1),
    ],
)
def test_load_factor_is_had_without_an_accelerometer(drop: tuple[str, ...], method: str, rms: float) -> None:
    recording = without(recording_of(circuits(), PATH), *drop)
    trace = build_trace(recording)
    assert trace.steps["load_factor"].method == method
    error = airborne_error(trace, "load_factor", circuits())
    assert np.sqrt(np.nanmean(error**2)) < rms
    step = trace.steps["load_factor"]
    assert step.uncertainty > 0.0
    if method in ("level turn", "vertical acceleration"):
        assert step.one_sided
        assert step.cap == "possible"


def test_bank_is_had_from_heading_and_airspeed() -> None:
    recording = without(recording_of(circuits(), PATH), "bank_angle")
    trace = build_trace(recording)
    assert trace.steps["bank_angle"].method == "turn rate and true airspeed"
    error = airborne_error(trace, "bank_angle", circuits())
    assert np.sqrt(np.nanmean(error**2)) < np.radians(2.5)


def test_a_roll_is_no_level_turn() -> None:
    recording = only(recording_of(aerobatics(), {**PATH, "bank_angle": Sensor(8)}), "bank_angle")
    trace = build_trace(recording)
    _, values = whole(trace, "load_factor")
    assert np.nanmax(values["load_factor"]) < 2.3


def test_gusts_are_found_in_level_flight_and_not_in_aerobatics() -> None:
    fenwick = load_aircraft(
        "format: exceed-aircraft/1\nmass: {empty: 700 kg, maximum_take_off: 1150 kg}\n"
        "wing: {area: 16.2 m2, mean_chord: 1.47 m, lift_curve_slope: 4.7 1/rad}\n"
    )
    flown = circuits()
    trace = build_trace(recording_of(flown, SENSORS), fenwick, mass=1050.0)
    time, values = whole(trace, "gust_velocity")
    speed = values["gust_velocity"]
    (start,) = (when for when, label in flown.labels if label == "rough air")
    rough = (time > start) & (time < start + 60)
    # the discrete gust of 7 m/s up: twenty seconds into the rough air, derived within a third (turbulence adds)
    peak = time[rough][np.nanargmax(speed[rough])]
    assert peak == pytest.approx(start + 20.45, abs=1.0)
    assert np.nanmax(speed[rough]) == pytest.approx(7.0, rel=0.35)
    trace = build_trace(recording_of(aerobatics(), SENSORS), larkspur(), mass=905.0)
    time, values = whole(trace, "gust_velocity")
    acting = trace.track.phases.at(time) == 8
    assert np.isnan(values["gust_velocity"][acting]).all()


def test_touchdown_values_stand_at_the_touchdown_only() -> None:
    flown, trace = aerobatics(), full()
    (touch,) = flown.marked("touchdown")
    time, values = whole(trace, "touchdown_load_factor")
    there = np.isfinite(values["touchdown_load_factor"])
    assert np.abs(time[there] - touch).max() < 3.0
    truth = np.max(flown["load_factor"][(flown.time > touch) & (flown.time < touch + 0.5)])
    assert np.nanmax(values["touchdown_load_factor"]) <= truth + 0.06
    time, values = whole(trace, "touchdown_sink_rate")
    there = np.isfinite(values["touchdown_sink_rate"])
    assert np.abs(time[there] - touch).max() < 2.0
    sink = -flown["vertical_speed"][np.searchsorted(flown.time, touch) - 1]
    assert np.nanmax(values["touchdown_sink_rate"]) == pytest.approx(sink, abs=0.35)
    radio = build_trace(recording_of(flown, {**SENSORS, "height_above_ground": Sensor(8, step=0.03)}), larkspur())
    assert radio.steps["touchdown_sink_rate"].cap is None
    _, values = whole(radio, "touchdown_sink_rate")
    assert np.nanmax(values["touchdown_sink_rate"]) == pytest.approx(sink, abs=0.2)


def test_gear_moves_before_it_is_down_and_after_it_leaves() -> None:
    time = np.arange(0.0, 200.0)
    down = ((time < 50) | (time >= 120)).astype(float)
    trace = build_trace(make(time, {"gear_down": channel_of("gear_down", down, None, time)}))
    _, values = whole(trace, "gear_moving")
    assert set(time[values["gear_moving"] > 0.5]) == {*range(50, 59), *range(112, 121)}


def test_unknown_mass_is_a_range_and_the_heaviest_is_taken() -> None:
    trace = build_trace(recording_of(aerobatics(), SENSORS), larkspur())
    assert trace.spans == {"mass": (640.0, 960.0)}
    assert trace.steps["mass"].constant == 960.0
    assert "mass not known" in (trace.steps["mass"].assumes or "")


def test_a_category_or_no_aeroplane_at_all_is_no_error() -> None:
    recording = recording_of(aerobatics(), SENSORS)
    bare = build_trace(recording)
    assert "no facts of the aeroplane" in bare.missing["load_factor_maximum"]
    assert "load_factor" in bare.steps
    category = build_trace(recording, category_aircraft("aerobatic"))
    _, values = whole(category, "load_factor_maximum")
    # 6 g flaps up [14CFR23-OLD 23.337], 2 g with flaps out [23.345]
    assert set(values["load_factor_maximum"]) == {2.0, 6.0}
    assert "stall speed" in category.missing["stall_speed"]


def test_every_missing_quantity_has_its_reason_and_nothing_is_both() -> None:
    trace = build_trace(recording_of(aerobatics(), SENSORS), larkspur())
    for name in TRACE_ORDER:
        assert (name in trace.steps) != (name in trace.missing), name
    assert all(trace.missing.values())


def test_flaps_none_rests_on_no_flap_channel_and_assumes_nothing() -> None:
    aircraft = larkspur().model_copy(update={"flaps": "none"})
    trace = build_trace(recording_of(aerobatics(), SENSORS), aircraft, mass=905.0)
    for name in ("stall_speed", "load_factor_maximum", "calibrated_airspeed"):
        assert "flap_angle" not in trace.leaves([name])
        assert trace.steps[name].assumes is None


def test_flaps_not_recorded_are_taken_as_up_and_it_is_said() -> None:
    trace = build_trace(without(recording_of(aerobatics(), SENSORS), "flap_angle"), larkspur(), mass=905.0)
    for name in ("stall_speed", "load_factor_maximum", "calibrated_airspeed"):
        assert "flaps not recorded" in (trace.steps[name].assumes or "")


def test_an_unheard_of_quantity_passes_through_as_recorded() -> None:
    time = np.arange(50.0)
    oil = channel_of("oil_temperature", 350.0 + time, None, time)
    trace = build_trace(make(time, {"oil_temperature": oil}), quantities=["oil_temperature"])
    assert list(trace.steps) == ["oil_temperature"]
    assert np.array_equal(whole(trace, "oil_temperature")[1]["oil_temperature"], oil.values)


def test_channels_of_several_engines_come_with_their_common_name() -> None:
    time = np.arange(50.0)
    both = {f"engine_speed_{i}": channel_of(f"engine_speed_{i}", 40.0 + time + i, None, time) for i in (1, 2)}
    trace = build_trace(make(time, both), quantities=["engine_speed"])
    assert set(trace.steps) == set(both)
    assert needed_channels(["engine_speed_1"], both) == {"engine_speed_1"}


ALTERNATIVES = [
    "load_factor", "roll_rate", "pitch_rate", "yaw_rate", "indicated_airspeed", "true_airspeed", "pressure_altitude",
    "bank_angle", "heading", "vertical_speed", "weight_on_wheels", "flap_angle", "static_air_temperature",
]  # fmt: skip


def short(names: tuple[str, ...]) -> Recording:
    flown = aerobatics()
    return recording_of(flown, {name: Sensor(8) for name in names}, start=80.0, end=140.0)


@pytest.mark.parametrize("wanted", ["load_factor", "stall_margin", "mach", "load_factor_margin", "gust_velocity"])
def test_reading_only_what_is_needed_changes_no_step_and_no_value(wanted: str) -> None:
    rng = np.random.default_rng(5)
    for _ in range(12):
        names = tuple(name for name in ALTERNATIVES if rng.random() < 0.6) or ("load_factor",)
        everything = short(names)
        needed = needed_channels([wanted], names, larkspur(), mass_known=True)
        assert needed <= set(names)
        pruned = only(everything, *needed) if needed else None
        one = build_trace(everything, larkspur(), quantities=[wanted], mass=905.0)
        if pruned is None:
            assert wanted in one.missing
            continue
        other = build_trace(pruned, larkspur(), quantities=[wanted], mass=905.0)
        assert one.steps.keys() == other.steps.keys()
        assert one.missing.keys() == other.missing.keys()
        for name in one.steps:
            assert one.steps[name].method == other.steps[name].method, (names, name)
        if wanted in one.steps:
            grid = one.grid([wanted])
            assert np.array_equal(
                one.evaluate([wanted], grid)[wanted], other.evaluate([wanted], other.grid([wanted]))[wanted],
                equal_nan=True,
            )  # fmt: skip


def test_steps_never_go_round_in_circles() -> None:
    for first, second in itertools.combinations(ALTERNATIVES, 2):
        trace = build_trace(short((first, second)), larkspur())
        done: set[str] = set()
        for name, step in trace.steps.items():
            for source in step.inputs.values():
                assert source == "time" or source.startswith("recorded:") or source in done, (name, source)
            done.add(name)


@pytest.mark.parametrize("size", [37, 1000, 65536])
def test_the_size_of_a_block_changes_no_value(size: int) -> None:
    trace = full()
    names = list(trace.steps)
    grid = trace.grid(["load_factor"])
    once = trace.evaluate(names, grid)
    for start in range(0, 4000, size):
        part = trace.evaluate(names, grid, start, min(start + size, 4000))
        for name in names:
            expected = once[name][start : min(start + size, 4000)]
            assert np.allclose(part[name], expected, rtol=1e-9, atol=1e-7, equal_nan=True), name


def test_uncertainty_of_load_factor_is_that_of_the_accelerometer() -> None:
    trace = full()
    grid = trace.grid(["load_factor"])
    found = trace.uncertainty_at("load_factor", grid, np.array([1000, 3000]))
    # 0.05 g stated as a 95 % interval, and the datum's own
    assert np.allclose(found, 0.05 / 1.96, rtol=0.05)
