"""The first pass: datum of the accelerometer, accuracy of channels, time spent inverted."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from derive.flown import SENSORS, aerobatics, circuits, larkspur
from derive.logs import channel_of, make, only, recording_of
from scenario.sensors import Sensor

from exceed.core.intervals import normal
from exceed.core.recording import Recording
from exceed.derive.first_pass import FirstPass, first_pass, inverted_time, with_uncertainty


def passed(bias: float, *names: str, **sensor: float) -> FirstPass:
    sensors = {**SENSORS, "load_factor": Sensor(8, noise=0.01, step=0.01, bias=bias, **sensor)}
    recording = recording_of(aerobatics(), sensors)
    return first_pass(only(recording, *names) if names else recording)


@pytest.mark.parametrize("bias", [-0.12, 0.04, 0.3])
def test_a_datum_error_is_found_and_taken_off(bias: float) -> None:
    first = passed(bias)
    channel = first.channels["load_factor"]
    assert channel.bias is not None
    assert channel.bias.value == pytest.approx(bias, abs=0.006)
    truth = np.interp(first.coarse.recording.time, aerobatics().time, aerobatics()["load_factor"])
    assert np.median(channel.values - truth) == pytest.approx(0.0, abs=0.006)
    assert any("taken off" in note for note in first.notes)


def test_a_datum_error_within_its_own_uncertainty_is_left_and_said() -> None:
    first = passed(0.0)
    assert first.channels["load_factor"].bias is None
    assert np.array_equal(first.channels["load_factor"].values, first.coarse.recording.channels["load_factor"].values)
    assert any("not corrected" in note for note in first.notes)


def test_the_cell_as_written_comes_back_after_the_correction() -> None:
    recording = recording_of(aerobatics(), SENSORS)
    raw = recording.channels["load_factor"]
    in_metres = replace(raw, scale=1 / 9.80665, offset=0.0, unit="m/s2")
    changed = replace(recording, channels={**recording.channels, "load_factor": in_metres})
    channel = first_pass(changed).channels["load_factor"]
    place = int(np.argmax(channel.values))
    assert channel.cell(channel.values[place]) == pytest.approx(raw.values[place] * 9.80665, abs=1e-9)


def test_the_sensors_range_moves_with_the_datum() -> None:
    recording = recording_of(aerobatics(), SENSORS)
    ranged = replace(recording.channels["load_factor"], saturation=(-6.0, 9.0))
    changed = replace(recording, channels={**recording.channels, "load_factor": ranged})
    channel = first_pass(changed).channels["load_factor"]
    assert channel.bias is not None
    assert channel.saturation == pytest.approx((-6.0 - channel.bias.value, 9.0 - channel.bias.value))


def test_level_flight_tells_the_datum_where_there_is_no_standstill() -> None:
    flown = circuits()
    sensors = {**SENSORS, "load_factor": Sensor(8, noise=0.01, bias=0.08)}
    recording = recording_of(flown, sensors, start=230.0, end=900.0)
    first = first_pass(recording)
    bias = first.channels["load_factor"].bias
    assert bias is not None
    assert bias.value == pytest.approx(0.08, abs=0.012)
    assert "steady level flight" in " ".join(first.notes)


def test_a_bare_accelerometer_is_corrected_only_for_a_large_datum_error() -> None:
    small = passed(0.03, "load_factor").channels["load_factor"]
    assert small.bias is None
    large = passed(0.15, "load_factor").channels["load_factor"]
    assert large.bias is not None
    assert large.bias.value == pytest.approx(0.15, abs=0.03)


@pytest.mark.parametrize("with_bank", [True, False])
def test_a_steep_turn_held_for_long_is_no_datum_error(with_bank: bool) -> None:
    """Two short level stretches about a turn of 45 degrees (eased to 1.21 g), as quiet and four times as long."""
    time = np.arange(0.0, 200.0, 0.125)
    turning = (time > 25.0) & (time < 170.0)
    noise = 0.01 * np.random.default_rng(1).standard_normal(len(time))
    channels = {"load_factor": channel_of("load_factor", np.where(turning, 2**0.5 - 0.2, 1.0) + noise, None, time)}
    if with_bank:
        bank = np.where(turning, np.radians(45.0), 0.0)
        channels["bank_angle"] = channel_of("bank_angle", bank, None, time)
    assert first_pass(make(time, channels)).channels["load_factor"].bias is None


def test_nothing_quiet_leaves_the_datum_alone_and_says_so() -> None:
    time = np.arange(0.0, 100.0, 0.125)
    shaken = 1.3 + 0.5 * np.sin(time)
    first = first_pass(make(time, {"load_factor": channel_of("load_factor", shaken, None, time)}))
    assert first.channels["load_factor"].bias is None
    assert any("to tell it by" in note for note in first.notes)


def one(quantity: str, **more: object) -> Recording:
    time = np.arange(0.0, 10.0, 0.125)
    return make(time, {quantity: channel_of(quantity, np.full(len(time), 50.0), None, time, **more)})


def test_accuracy_comes_from_the_channels_file_first_then_the_aircraft_then_the_rules() -> None:
    """a / 1.96 for a stated 95 % interval, a / sqrt 3 for a tolerance of a regulation [JCGM-100]."""
    plain = one("load_factor").channels["load_factor"]
    stated = with_uncertainty(replace(plain, standard_uncertainty=0.01, uncertainty_source="channels file"), larkspur())
    assert (stated.standard_uncertainty, stated.uncertainty_source) == (pytest.approx(0.01), "channels file")
    aircraft = with_uncertainty(plain, larkspur())
    assert (aircraft.standard_uncertainty, aircraft.uncertainty_source) == (pytest.approx(0.05 / 1.96), "aircraft file")
    # 1 % of the 9 g span that 14 CFR 121 Appendix M asks for: 0.09 g
    rules = with_uncertainty(plain, None)
    assert rules.standard_uncertainty == pytest.approx(0.09 / np.sqrt(3.0))
    assert "14CFR121-M" in rules.uncertainty_source


def test_resolution_adds_a_twelfth_and_is_all_there_is_for_an_unknown_sensor() -> None:
    coarse = with_uncertainty(replace(one("roll_rate").channels["roll_rate"], resolution=0.1), None)
    assert coarse.standard_uncertainty == pytest.approx(0.1 / np.sqrt(12.0))
    assert coarse.uncertainty_source == "resolution only: no accuracy is known"


def test_airspeed_accuracy_is_a_share_of_the_greatest_reading() -> None:
    """3 % of the reading [14CFR121-M]."""
    channel = with_uncertainty(one("indicated_airspeed").channels["indicated_airspeed"], None)
    assert channel.standard_uncertainty == pytest.approx(0.03 * 50.0 / np.sqrt(3.0))


def test_inverted_time_counts_from_the_roll_past_ninety_degrees() -> None:
    time = np.arange(0.0, 60.0, 0.5)
    bank = np.where((time >= 10.0) & (time < 30.0), np.pi, 0.1)
    bank[44] = np.nan
    found = inverted_time(channel_of("bank_angle", bank, None, time), time, normal([2.0], [58.0])).values
    assert found[20] == pytest.approx(0.5)
    assert found[59] == pytest.approx(20.0)
    assert found[60] == 0.0
    assert np.isnan(found[44])
    assert found[45] == pytest.approx(13.0)


def test_the_first_pass_does_not_depend_on_unrelated_channels() -> None:
    recording = recording_of(aerobatics(), SENSORS)
    oil = channel_of("oil_temperature", np.full(len(recording.time), 350.0), None, recording.time)
    more = {**recording.channels, "oil_temperature": oil}
    one_, other = first_pass(recording), first_pass(replace(recording, channels=more))
    assert one_.track.flights == other.track.flights
    assert one_.channels["load_factor"].bias == other.channels["load_factor"].bias
