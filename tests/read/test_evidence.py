"""Data settle what they can: unit, sign, datum. What they cannot settle stays unresolved, with a question."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from read.made import DEG, FT, G0, KT, log, of_flight, si

NZ = si("load_factor")


@pytest.mark.parametrize("unit", ["", " [g]", " [m/s2]"])
@pytest.mark.parametrize("scale", [1.0, G0])
@pytest.mark.parametrize("sign", [1, -1])
def test_total_load_factor_by_its_level_reading(tmp_path: Path, unit: str, scale: float, sign: int) -> None:
    recording = log(tmp_path, of_flight({f"NZ{unit}": sign * scale * NZ}))
    channel = recording.channels["load_factor"]
    assert np.allclose(channel.values, NZ, atol=1e-5)
    assert (channel.datum, channel.sign) == ("total", "up" if sign > 0 else "down")
    assert channel.unit == ("g" if scale == 1.0 else "m/s2")
    # the cell as the recorder wrote it comes back
    assert channel.cell(channel.values[1000]) == pytest.approx(sign * scale * NZ[1000], rel=1e-5)
    wrong = (unit == " [g]") != (scale == 1.0) and unit != ""
    assert any("is written, but the level reading" in note for note in channel.notes) == wrong


@pytest.mark.parametrize("sign", [1, -1])
@pytest.mark.parametrize("witness", ["ROLL [deg]", "VS [ft/min]", "none"])
def test_increment_with_its_sign_by_what_else_moved(tmp_path: Path, sign: int, witness: str) -> None:
    columns = {"NORM ACC [g]": sign * (NZ - 1.0)}
    if witness == "ROLL [deg]":
        columns[witness] = si("bank_angle") / DEG
    if witness == "VS [ft/min]":
        columns[witness] = si("vertical_speed") / FT * 60
    channel = log(tmp_path, of_flight(columns)).channels["load_factor"]
    assert (channel.datum, channel.sign) == ("increment", "up" if sign > 0 else "down")
    assert np.allclose(channel.values, NZ, atol=1e-5)
    assert channel.cell(2.0) == pytest.approx(sign * 1.0)


def test_an_increment_without_unit_takes_it_from_turns(tmp_path: Path) -> None:
    for scale, unit in ((1.0, "g"), (G0, "m/s2")):
        channel = log(
            tmp_path, of_flight({"NORM ACC": scale * (NZ - 1.0), "ROLL [deg]": si("bank_angle") / DEG})
        ).channels["load_factor"]
        assert (channel.unit, channel.datum) == (unit, "increment")
        assert np.allclose(channel.values, NZ, atol=1e-5)


def test_an_increment_that_nothing_settles_is_asked_about(tmp_path: Path) -> None:
    rng = np.random.default_rng(3)
    recording = log(tmp_path, of_flight({"NORM ACC [g]": 0.02 * rng.standard_normal(len(NZ))}))
    (row,) = recording.unresolved
    assert row.reason == "reads 0 in level flight, an increment, but whether up or down is positive cannot be told"
    assert row.question == "Is it positive up or down?"
    assert not recording.channels


def test_a_bare_speed_is_never_guessed(tmp_path: Path) -> None:
    recording = log(tmp_path, of_flight({"NZ [g]": NZ, "SPD": si("indicated_airspeed") / KT}))
    (row,) = recording.unresolved
    assert (row.column, row.reason) == ("SPD", "kt, km/h, mph or m/s cannot be told, nor which speed it is")
    assert row.question.startswith("Is it indicated airspeed, true airspeed or ground speed?")


def test_an_airspeed_without_unit_and_witness_is_asked_about(tmp_path: Path) -> None:
    recording = log(
        tmp_path,
        of_flight({"NZ [g]": NZ, "IAS": si("indicated_airspeed") / KT, "PALT [ft]": si("pressure_altitude") / FT}),
    )
    (row,) = recording.unresolved
    assert (row.column, row.reason, row.question) == (
        "IAS",
        "kt, km/h, mph or m/s cannot be told",
        "Is it in kt, km/h, mph or m/s?",
    )
    assert "indicated_airspeed" not in recording.channels


@pytest.mark.parametrize(("unit", "factor"), [("kt", KT), ("km/h", 1 / 3.6), ("m/s", 1.0)])
def test_an_airspeed_follows_from_turns(tmp_path: Path, unit: str, factor: float) -> None:
    columns = {
        "IAS": si("indicated_airspeed") / factor,
        "PALT [ft]": si("pressure_altitude") / FT,
        "ROLL [deg]": si("bank_angle") / DEG,
        "HDG [deg]": si("heading") / DEG,
    }
    channel = log(tmp_path, of_flight(columns)).channels["indicated_airspeed"]
    assert channel.unit == unit
    assert f"{unit} by the rate of turn at the recorded bank, within" in channel.reason


@pytest.mark.parametrize(("height", "factor"), [("ft", FT), ("m", 1.0)])
@pytest.mark.parametrize(("rise", "step"), [("ft/min", FT / 60), ("m/s", 1.0)])
def test_altitude_and_vertical_speed_settle_each_other(
    tmp_path: Path, height: str, factor: float, rise: str, step: float
) -> None:
    recording = log(tmp_path, of_flight({"ALT": si("pressure_altitude") / factor, "VS": si("vertical_speed") / step}))
    if (height, rise) == ("m", "m/s"):
        # ft with ft/s would look the same
        assert {row.column for row in recording.unresolved} == {"ALT", "VS"}
        return
    assert recording.channels["pressure_altitude"].unit == height
    assert recording.channels["vertical_speed"].unit == rise


def test_one_written_unit_settles_the_other(tmp_path: Path) -> None:
    recording = log(tmp_path, of_flight({"ALT": si("pressure_altitude"), "VS [m/s]": si("vertical_speed")}))
    assert recording.channels["pressure_altitude"].unit == "m"


@pytest.mark.parametrize(("unit", "factor"), [("deg", DEG), ("rad", 1.0)])
def test_angles_and_rates_without_units(tmp_path: Path, unit: str, factor: float) -> None:
    columns = {
        "ROLL": si("bank_angle") / factor,
        "PITCH": si("pitch_angle") / factor,
        "HDG": si("heading") / factor,
        "P": si("roll_rate") / factor,
        "Q": si("pitch_rate") / factor,
        "PALT [ft]": si("pressure_altitude") / FT,
        "IAS [kt]": si("indicated_airspeed") / KT,
    }
    recording = log(tmp_path, of_flight(columns))
    for name in ("bank_angle", "pitch_angle", "heading"):
        assert recording.channels[name].unit == unit, name
    for name in ("roll_rate", "pitch_rate"):
        assert recording.channels[name].unit == f"{unit}/s", name


def test_signs_that_are_the_other_way_round(tmp_path: Path) -> None:
    columns = {
        "ROLL [deg]": -si("bank_angle") / DEG,
        "PITCH [deg]": -si("pitch_angle") / DEG,
        "HDG [deg]": si("heading") / DEG,
        "PALT [ft]": si("pressure_altitude") / FT,
        "ROLL RATE [deg/s]": -si("roll_rate") / DEG,
        "VS [ft/min]": -si("vertical_speed") / FT * 60,
    }
    recording = log(tmp_path, of_flight(columns))
    for name, sign in (
        ("bank_angle", "left"),
        ("pitch_angle", "down"),
        ("roll_rate", "left"),
        ("vertical_speed", "down"),
    ):
        channel = recording.channels[name]
        assert channel.sign == sign, name
        assert np.allclose(channel.values, si(name), atol=2e-4), name
    assert recording.channels["bank_angle"].cell(0.1) == pytest.approx(-0.1 / DEG)


def test_temperature_scale(tmp_path: Path) -> None:
    kelvin = si("outside_air_temperature") + 15.0
    for column, written in (("OAT", kelvin), ("OAT [°]", kelvin)):
        assert log(tmp_path, of_flight({column: written})).channels["static_air_temperature"].unit == "K"
    fahrenheit = (kelvin - 273.15) * 1.8 + 32.0
    recording = log(tmp_path, of_flight({"OAT": fahrenheit, "PALT [ft]": si("pressure_altitude") / FT}))
    assert recording.channels["static_air_temperature"].unit == "degF"
    recording = log(tmp_path, of_flight({"OAT": fahrenheit}))
    assert [row.reason for row in recording.unresolved] == ["degC, degF or K cannot be told"]


def test_pressures_by_their_size_near_the_ground(tmp_path: Path) -> None:
    pascal = 101325.0 * (1 - 0.0065 * si("pressure_altitude") / 288.15) ** 5.2559
    for factor, unit in ((1.0, "Pa"), (100.0, "hPa"), (1000.0, "kPa"), (3386.389, "inHg"), (6894.757, "psi")):
        channel = log(tmp_path, of_flight({"PS": pascal / factor})).channels["static_pressure"]
        assert channel.unit == unit
        assert np.allclose(channel.values, pascal, rtol=1e-5)


def test_static_pressure_settles_the_altitude(tmp_path: Path) -> None:
    pascal = 101325.0 * (1 - 0.0065 * si("pressure_altitude") / 288.15) ** 5.2559
    for factor, unit in ((FT, "ft"), (1.0, "m")):
        recording = log(tmp_path, of_flight({"PS [hPa]": pascal / 100, "PALT": si("pressure_altitude") / factor}))
        assert recording.channels["pressure_altitude"].unit == unit


def test_weight_on_wheels_the_other_way_round(tmp_path: Path) -> None:
    wheels, speed = si("weight_on_wheels"), si("indicated_airspeed") / KT
    for name, written in (
        ("WOW", wheels),
        ("WOW", 1 - wheels),
        ("AIR/GND", wheels),
        ("AIR_GND", 1 - wheels),
        ("AIRBORNE", 1 - wheels),
    ):
        recording = log(tmp_path, of_flight({name: written, "IAS [kt]": speed}))
        assert np.array_equal(recording.channels["weight_on_wheels"].values, wheels), name
    recording = log(tmp_path, of_flight({"AIR/GND": wheels}))
    assert [row.reason for row in recording.unresolved] == ["whether 1 means air or ground cannot be told"]


def test_gear_by_what_it_shows_on_the_ground(tmp_path: Path) -> None:
    speed = si("indicated_airspeed") / KT
    down = (si("pressure_altitude") < 300.0).astype(float)
    for name, written in (
        ("GEAR", down),
        ("GEAR", 1 - down),
        ("GEAR UP", 1 - down),
        ("GEAR DOWN", down),
        ("LDG GEAR [%]", 100 * down),
    ):
        recording = log(tmp_path, of_flight({name: written, "IAS [kt]": speed}))
        assert np.array_equal(recording.channels["gear_down"].values, down), name
    recording = log(tmp_path, of_flight({"GEAR": down}))
    assert [row.reason for row in recording.unresolved] == ["whether 1 means down or up cannot be told"]


def test_flaps_that_are_detents_are_asked_about(tmp_path: Path) -> None:
    flaps = si("flap_angle") / DEG
    recording = log(tmp_path, of_flight({"FLAP": np.round(flaps / 10)}))
    (row,) = recording.unresolved
    assert row.question == "What is the flap angle in deg for each figure?"
    assert log(tmp_path, of_flight({"FLAP": flaps})).channels["flap_angle"].unit == "deg"


def test_of_two_columns_the_better_evidenced_wins(tmp_path: Path) -> None:
    speed = si("indicated_airspeed") / KT
    holes = np.where(np.arange(len(speed)) % 3 == 0, speed, np.nan)
    recording = log(tmp_path, of_flight({"IAS 1 [kt]": holes, "IAS 2 [kt]": speed}))
    assert recording.channels["indicated_airspeed"].column == "IAS 2 [kt]"
    (row,) = recording.unresolved
    assert row.reason == "'IAS 2 [kt]' is taken for indicated_airspeed: it has more samples"


def test_a_bare_speed_that_the_position_confirms_is_ground_speed(tmp_path: Path) -> None:
    heading, speed = si("heading"), si("ground_speed")
    latitude = 55.0 + np.cumsum(speed * np.cos(heading)) / 8 / 6.371e6 / DEG
    longitude = -3.0 + np.cumsum(speed * np.sin(heading)) / 8 / 6.371e6 / DEG / np.cos(55 * DEG)
    lines = ["time,lat,lon,speed"] + [
        f"{k / 8},{latitude[k]:.7f},{longitude[k]:.7f},{speed[k] / KT:.1f}" for k in range(len(speed))
    ]
    channel = log(tmp_path, "\n".join(lines) + "\n").channels["ground_speed"]
    assert (channel.unit, channel.column) == ("kt", "speed")


def test_long_is_an_acceleration_or_a_longitude(tmp_path: Path) -> None:
    nx = 0.1 * np.sin(np.arange(len(NZ)) / 20.0) + np.sin(si("pitch_angle"))
    recording = log(tmp_path, of_flight({"VRTG": NZ, "LONG": nx, "PITCH [deg]": si("pitch_angle") / DEG}))
    assert recording.channels["longitudinal_load_factor"].unit == "g"
    place = 12.0 + np.cumsum(si("ground_speed")) * 1e-6
    assert "longitude" in log(tmp_path, of_flight({"VRTG": NZ, "LONG": place})).channels
