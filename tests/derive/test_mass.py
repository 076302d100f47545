"""Mass and centre of gravity along the flight, from whatever tells them."""

from __future__ import annotations

import datetime

import numpy as np
import pytest
from derive.flown import SENSORS, aerobatics, larkspur, truth_at
from derive.logs import channel_of, make, recording_of, without
from derive.test_flights import CIRCUIT, joined, profile
from scenario.sensors import Sensor

from exceed.core.recording import Recording
from exceed.core.trace import Trace
from exceed.derive.mass import mass_summary
from exceed.derive.plan import build_trace
from exceed.documents.loading import LoadingSheet, load_loading

BARE = {name: sensor for name, sensor in SENSORS.items() if name != "fuel_mass"}
EPOCH = datetime.datetime(2031, 5, 2, 9, 0, tzinfo=datetime.UTC).timestamp()
PILOT, FUEL, BAGGAGE = 82.0, 50.4, 4.0


def sheet(take_off: str = "2031-05-02T09:02Z", fuel: str = "70 L") -> LoadingSheet:
    return load_loading(
        f"format: exceed-loading/1\nregistration: ZZ-NMA\ntake_off: \"{take_off}\"\n"
        f"stations: {{pilot: 82 kg, passenger: 0 kg, baggage: 4 kg, main_fuel: {fuel}}}\n"
    )  # fmt: skip


def mass_of(trace: Trace) -> tuple[np.ndarray, np.ndarray]:
    grid = trace.grid(["mass"])
    return grid.time, trace.evaluate(["mass"], grid)["mass"]


def at_take_off() -> float:
    flown = aerobatics()
    return float(np.interp(flown.marked("take_off")[0], flown.time, flown["mass"]))


@pytest.mark.parametrize(
    ("extra", "method", "within"),
    [
        ({"fuel_mass": Sensor(1, step=0.5)}, "fuel quantity", 0.3),
        ({"fuel_flow": Sensor(1)}, "fuel flow integrated", 0.05),
        ({}, "fuel consumption of the aircraft file", 2.0),
    ],
)
def test_fuel_used_comes_from_the_best_that_tells_it(extra: dict[str, Sensor], method: str, within: float) -> None:
    flown = aerobatics()
    recording = recording_of(flown, {**BARE, **extra})
    if "fuel_flow" in recording.channels:
        flow = recording.channels["fuel_flow"]
        renamed = channel_of("fuel_mass_flow", flow.values, flow.rows, recording.time)
        channels = {**recording.channels, "fuel_mass_flow": renamed}
        recording = without(make(recording.time, channels), "fuel_flow")
    trace = build_trace(recording, larkspur(), mass=at_take_off())
    assert method in trace.steps["mass"].method
    time, mass = mass_of(trace)
    error = mass - truth_at(flown, "mass", time)
    assert np.max(np.abs(error[trace.track.airborne.contains(time)])) < within
    (row,) = mass_summary(trace)
    assert row["take_off"] == pytest.approx(at_take_off(), abs=0.3)
    assert row["landing"] == pytest.approx(float(mass[np.searchsorted(time, trace.track.flights[0].end) - 1]), abs=0.1)


def test_without_any_fuel_figure_the_take_off_mass_is_held_and_said() -> None:
    aircraft = larkspur().model_copy(update={"fuel_consumption": None})
    trace = build_trace(recording_of(aerobatics(), BARE), aircraft, mass=900.0)
    assert set(mass_of(trace)[1]) == {900.0}
    assert "held" in (trace.steps["mass"].assumes or "")


def test_litres_of_flow_need_a_density_and_an_assumed_one_is_said() -> None:
    time = np.arange(0.0, 3600.0)
    channels = {
        "fuel_volume_flow": channel_of("fuel_volume_flow", np.full(len(time), 0.036 / 3600.0), None, time),
        "weight_on_wheels": channel_of("weight_on_wheels", (time < 10.0).astype(float), None, time),
    }
    trace = build_trace(make(time, channels), None, mass=1000.0)
    # 36 L/h for an hour less ten seconds at 6 lb a US gallon, 0.7189 kg/L [FAA-PHAK]
    assert 1000.0 - mass_of(trace)[1][-1] == pytest.approx(36.0 * 0.7189 * 3590 / 3600, abs=0.05)
    assert any("density" in note for note in trace.notes)


def test_tanks_and_engines_add_up() -> None:
    time = np.arange(0.0, 1000.0)
    tanks = {f"fuel_mass_{i}": channel_of(f"fuel_mass_{i}", 50.0 - 0.01 * i * time, None, time) for i in (1, 2)}
    trace = build_trace(make(time, tanks), None, mass=1000.0)
    # 10 kg and 20 kg used; the averaging of thirty seconds lacks half a window at either end
    assert mass_of(trace)[1][-1] == pytest.approx(970.0, abs=1.0)


def test_a_loading_sheet_gives_mass_centre_of_gravity_and_zero_fuel_mass() -> None:
    recording = recording_of(aerobatics(), BARE, clock=EPOCH)
    trace = build_trace(recording, larkspur(), loading=[sheet()])
    (row,) = mass_summary(trace)
    zero = 640.0 + PILOT + BAGGAGE
    assert row["zero_fuel"] == pytest.approx(zero)
    assert row["take_off"] == pytest.approx(zero + FUEL, abs=0.05)
    assert "loading sheet" in row["method"]
    # moments about the datum: 640 at 0.98 m, pilot at 1.12, baggage at 1.8, fuel at 0.9
    moment = 640 * 0.98 + PILOT * 1.12 + BAGGAGE * 1.8
    assert row["centre_of_gravity"]["zero_fuel"] == pytest.approx(moment / zero)
    assert row["centre_of_gravity"]["take_off"] == pytest.approx((moment + FUEL * 0.9) / (zero + FUEL), abs=1e-5)
    burnt = row["take_off"] - row["landing"]
    # 40 L/h of 0.72 kg/L while airborne
    flown = trace.track.flights[0].end - trace.track.flights[0].start
    assert burnt == pytest.approx(40 * 0.72 * flown / 3600, rel=0.01)
    expected = (moment + (FUEL - burnt) * 0.9) / (zero + FUEL - burnt)
    assert row["centre_of_gravity"]["landing"] == pytest.approx(expected, abs=1e-5)
    grid = trace.grid(["zero_fuel_mass"])
    assert set(trace.evaluate(["zero_fuel_mass"], grid)["zero_fuel_mass"]) == {zero}


def test_each_flight_takes_its_own_sheet() -> None:
    recording = two_flights()
    sheets = [sheet("2031-05-02T09:02Z"), sheet("2031-05-02T09:14Z", "30 L")]
    first, second = mass_summary(build_trace(recording, larkspur(), loading=sheets))
    assert first["take_off"] - second["take_off"] == pytest.approx(40 * 0.72, abs=0.05)
    assert (first["flight"], second["flight"]) == (1, 2)


def two_flights() -> Recording:
    recording = profile(joined(CIRCUIT, CIRCUIT))
    return make(recording.time, recording.channels, clock=EPOCH)


def test_a_flight_without_its_sheet_makes_the_mass_a_range_and_it_is_said() -> None:
    trace = build_trace(two_flights(), larkspur(), loading=[sheet("2031-05-02T09:02Z")])
    assert trace.spans == {"mass": (640.0, 960.0)}
    assert any("flight 2" in note for note in trace.notes)
    trace = build_trace(two_flights(), larkspur(), loading=[sheet("2031-05-02T09:02Z")], mass=800.0)
    first, second = mass_summary(trace)
    assert first["take_off"] == pytest.approx(640 + PILOT + BAGGAGE + FUEL, abs=0.05)
    assert second["take_off"] == pytest.approx(800.0, abs=0.05)


def test_a_recorded_mass_beats_everything() -> None:
    recording = profile(CIRCUIT)
    mass = channel_of("mass", 800.0 - 0.01 * recording.time, None, recording.time)
    trace = build_trace(make(recording.time, {**recording.channels, "mass": mass}), larkspur(), mass=950.0)
    assert trace.steps["mass"].method == "recorded"
    (row,) = mass_summary(trace)
    assert row["take_off"] == pytest.approx(798.8, abs=0.2)
    assert row["method"] == "recorded"


def test_mass_of_a_log_whose_flights_cannot_be_told_counts_from_its_beginning() -> None:
    time = np.arange(0.0, 600.0, 0.125)
    trace = build_trace(make(time, {"load_factor": channel_of("load_factor", np.ones(len(time)), None, time)}),
                        larkspur(), mass=900.0)  # fmt: skip
    when, mass = mass_of(trace)
    assert mass[0] == pytest.approx(900.0)
    assert 900.0 - mass[-1] == pytest.approx(40 * 0.72 * when[-1] / 3600, rel=0.01)
    assert mass_summary(trace)[0]["flight"] == 0
