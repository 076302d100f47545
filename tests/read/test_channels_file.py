"""A channels file overrules recognition in what it names, and the one that is written out reads back the same."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from read.made import DEG, FT, G0, KT, log, of_flight, rows, si, simple, truth, written
from scenario.dialects import Habit, write

from exceed.documents.channels import Channels, load_channels
from exceed.errors import LogError
from exceed.read import channels_file, describe, load, read_log, survey


def told(*lines: str) -> Channels:
    return load_channels("\n".join(["format: exceed-channels/1", *lines]) + "\n")


def test_it_settles_unit_sense_and_datum(tmp_path: Path) -> None:
    text = of_flight({"CH 7": -(si("load_factor") - 1.0) * G0, "SPD": si("indicated_airspeed") * 3.6})
    channels = told(
        "channels:",
        "  - {column: CH 7, quantity: load_factor, unit: m/s2, positive: down, datum: increment, accuracy: 0.05 g}",
        "  - {column: SPD, quantity: indicated_airspeed, unit: km/h}",
    )
    recording = log(tmp_path, text, channels=channels)
    load_factor = recording.channels["load_factor"]
    assert np.allclose(load_factor.values, si("load_factor"), atol=1e-5)
    assert load_factor.cell(2.0) == pytest.approx(-G0)
    assert (load_factor.found_by, load_factor.sign, load_factor.datum) == ("channels file", "down", "increment")
    assert load_factor.standard_uncertainty == pytest.approx(0.05 / 1.96)
    assert load_factor.uncertainty_source == "channels file"
    assert np.allclose(recording.channels["indicated_airspeed"].values, si("indicated_airspeed"), atol=1e-3)
    assert recording.unresolved == ()


def test_its_clock_is_used(tmp_path: Path) -> None:
    text = simple(heading="k,NZ [g],IAS [kt],PALT [ft]", stamps=[str(k) for k in range(200)])
    recording = log(tmp_path, text, channels=told("clock: {column: k, kind: frame, interval: 0.125 s}"))
    assert np.allclose(recording.time, np.arange(200) / 8)
    recording = log(tmp_path, text, channels=told("clock: {column: k, kind: elapsed, unit: ms}"))
    assert np.allclose(recording.time, np.arange(200) / 1000)
    dates = ["Day,Time,NZ [g]"] + [f"02/05/2031,09:00:{k:02d},1.0{k % 7}" for k in range(60)]
    zoned = told("clock: {columns: [Day, Time], kind: date_time, zone: '+02:00', offset: 1.5 s}")
    recording = log(tmp_path, "\n".join(dates) + "\n", channels=zoned)
    assert recording.clock.start is None  # the file names zone and columns, but day or month first stays open
    dates = [line.replace("02/05/2031", "25/05/2031") for line in dates]
    recording = log(tmp_path, "\n".join(dates) + "\n", channels=zoned)
    assert recording.clock.start == pytest.approx(1937458801.5)  # 2031-05-25T07:00:01.5Z


def test_a_place_with_summer_time_is_a_zone(tmp_path: Path) -> None:
    lines = ["Day,Time,NZ [g]"] + [f"25/05/2031,09:00:{k:02d},1.0{k % 7}" for k in range(60)]
    recording = log(
        tmp_path,
        "\n".join(lines) + "\n",
        channels=told("clock: {columns: [Day, Time], kind: date_time, zone: Europe/Paris}"),
    )
    assert recording.clock.start == pytest.approx(1937458800.0, abs=1e-3)
    assert recording.clock.zone == "Europe/Paris"


def test_a_clock_column_that_is_not_there(tmp_path: Path) -> None:
    path = written(tmp_path, simple())
    with pytest.raises(LogError) as caught:
        read_log(path, channels=told("clock: {column: tyme, kind: elapsed, unit: s}"))
    assert str(caught.value) == (
        f"{path}: the channels file names the clock column 'tyme', which is not in the log\n"
        "  expected: one of its columns, for example 'time [s]'\n  do: correct 'clock' in the channels file"
    )


def test_ignore_missing_and_faulty(tmp_path: Path) -> None:
    text = simple().replace("100.0,", "VOID,")
    channels = told(
        "ignore: [PALT [ft]]" if False else 'ignore: ["PALT [ft]"]',
        'missing: ["VOID"]',
        'faulty: [{column: "NZ [g]", from: 5 s, to: 8 s, reason: "loose"}]',
    )
    recording = log(tmp_path, text, channels=channels)
    assert "pressure_altitude" not in recording.channels
    assert recording.unused == ("PALT [ft]",)
    assert recording.faulty == (("load_factor", 5.0, 8.0, "loose"),)
    gone = sum(f"{row[2]:.1f}" == "100.0" for row in rows())
    assert gone > 0
    assert len(recording.channels["indicated_airspeed"].values) == 200 - gone
    assert recording.rejected == ()


def test_a_column_that_is_not_in_the_log_is_said(tmp_path: Path) -> None:
    recording = log(
        tmp_path, simple(), channels=told("channels:", "  - {column: NX, quantity: longitudinal_load_factor, unit: g}")
    )
    assert "the channels file names column 'NX', which is not in the log; it has 'NZ [g]'" in recording.notes


def test_further_names_are_declared_and_read(tmp_path: Path) -> None:
    text = of_flight({"NZ [g]": si("load_factor"), "OT": np.full(len(si("load_factor")), 90.0)})
    channels = told("channels:", "  - {column: OT, quantity: oil_temperature, unit: degC}")
    recording = log(tmp_path, text, channels=channels)
    assert recording.channels["oil_temperature"].values[0] == pytest.approx(363.15)


def test_engines_by_index(tmp_path: Path) -> None:
    ones = np.ones(len(si("load_factor")))
    text = of_flight(
        {"E1 RPM": 2400 * ones, "E2 RPM": 2500 * ones, "OIL T 1 [degC]": 90 * ones, "OIL T 2 [degC]": 91 * ones}
    )
    recording = log(tmp_path, text, declared={"oil_temperature": "degC"})
    assert set(recording.channels) == {"engine_speed_1", "engine_speed_2", "oil_temperature_1", "oil_temperature_2"}
    assert recording.channels["engine_speed_2"].values[0] == pytest.approx(2500 / 60)


def test_one_tank_is_not_the_fuel_on_board(tmp_path: Path) -> None:
    ones = np.ones(len(si("load_factor")))
    recording = log(
        tmp_path, of_flight({"FUEL QTY L [kg]": 40 * ones, "FUEL QTY R [kg]": 41 * ones, "NZ [g]": si("load_factor")})
    )
    assert "fuel_mass" not in recording.channels
    assert {row.reason for row in recording.unresolved} == {"one tank's fuel, not all that is on board"}


@pytest.mark.parametrize(
    "habit",
    [
        Habit(),
        Habit(header="name", units="trade"),
        Habit(delimiter=";", decimal_comma=True, units="metric", clock="date_time_dmy"),
        Habit(parquet="ms", units="si"),
        Habit(clock="epoch_us", header="suffix", vocabulary="snake"),
    ],
    ids=str,
)
def test_the_written_file_reads_back_the_same(habit: Habit, tmp_path: Path) -> None:
    path = write(truth(), tmp_path / ("log" + habit.extension), habit).path
    first = survey(path)
    recording = load(first)
    text = channels_file(first, recording)
    again = read_log(path, channels=load_channels(text))
    assert set(again.channels) == set(recording.channels)
    for name, channel in recording.channels.items():
        assert np.array_equal(again.channels[name].values, channel.values), name
        assert again.channels[name].found_by == "channels file"
    assert np.array_equal(again.time, recording.time)
    assert again.clock.start == recording.clock.start
    for row in recording.unresolved:
        assert f"# {row.column}: {row.reason}. {row.question}" in text


def test_headings_that_would_break_yaml_are_quoted(tmp_path: Path) -> None:
    path = written(tmp_path, simple(heading='time [s],"NZ ""x"": {#} [g]",IAS\t\\n [kt],- !!python'))
    first = survey(path)
    recording = load(first)
    channels = load_channels(channels_file(first, recording))
    assert {row.column for row in channels.channels} >= {c.column for c in recording.channels.values()}


def test_describe_tells_each_column(tmp_path: Path) -> None:
    text = of_flight(
        {
            "NZ": si("load_factor"),
            "SPD": si("indicated_airspeed") / KT,
            "XYZ": si("bank_angle") / DEG,
            "PALT [ft]": si("pressure_altitude") / FT,
        }
    )
    path = written(tmp_path, "Registration: ZZ-NMC\n" + text)
    first = survey(path)
    facts = describe(first, load(first))
    assert (facts.packed, facts.encoding, facts.delimiter, facts.skipped_lines, facts.clock) == (
        "plain",
        "utf-8",
        ",",
        2,
        "elapsed",
    )
    assert facts.clock_columns == ("time [s]",)
    by_name = {row.column: row for row in facts.columns}
    assert list(by_name) == ["NZ", "SPD", "XYZ", "PALT [ft]"]
    assert (by_name["NZ"].quantity, by_name["NZ"].rate_hz, by_name["NZ"].datum) == ("load_factor", 8.0, "total")
    assert by_name["SPD"].question.startswith("Is it indicated airspeed")
    assert by_name["XYZ"].reason == "not understood: the name is not in the table of synonyms"
    assert facts.facts == (("Registration", "ZZ-NMC"),)
