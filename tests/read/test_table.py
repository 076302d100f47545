"""The shape of a text log is found in its first block; names, units and facts stand where recorders put them."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from read.made import log, rows, simple, written

from exceed.core.units import UNITS
from exceed.read import survey
from exceed.read.cells import form, is_missing
from exceed.read.names import meanings
from exceed.read.table import registration_in, serial_in
from exceed.read.units_in_text import fitting, split_unit

BODY = "".join(f"{t:.3f},{n:.3f},{v:.1f},{h:.0f}\n" for t, n, v, h in rows())


@pytest.mark.parametrize(
    "top",
    [
        "sep=,\ntime [s],NZ [g],IAS [kt],PALT [ft]\n",
        "TIME,NZ,IAS,ALT\ns,g,kt,ft\n",
        "TIME,NZ,IAS,ALT\n[s],[g],[kt],[ft]\n",
        "TIME,NZ,IAS,ALT\nFDAU,ACC1,ADC1,ADC1\ns,g,kt,ft\n",
        "ch01,ch02,ch03,ch04\nTIME,NZ,IAS,ALT\ns,g,kt,ft\n",
        "# made by: hand\n# time [s],NZ [g],IAS [kt],PALT [ft]\n",
        "Flight report\n\nA line, with a comma\n\n\ntime [s],NZ [g],IAS [kt],PALT [ft]\n\n",
        "\n".join(f"Setting {k}: {k}" for k in range(300)) + "\ntime [s],NZ [g],IAS [kt],PALT [ft]\n",
        "Time_s,Nz_g,IAS_kts,PressAlt_ft\n",
        "time(s),nz(G),ias(KT),palt(FEET)\n",
        '"Time, s","Nz, g","IAS, knots","Pressure altitude, ft"\n',
        "time s,Nz in g,IAS in kt,Pressure altitude in ft\n",
    ],
    ids=str,
)
def test_headings_wherever_they_stand(tmp_path: Path, top: str) -> None:
    recording = log(tmp_path, top + BODY)
    assert {k: c.unit for k, c in recording.channels.items()} == {
        "load_factor": "g",
        "indicated_airspeed": "kt",
        "pressure_altitude": "ft",
    }
    assert len(recording.time) == 200


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "utf-16-be", "latin-1"])
@pytest.mark.parametrize("newline", ["\n", "\r\n", "\r"])
def test_letters_and_line_ends(tmp_path: Path, encoding: str, newline: str) -> None:
    text = simple(heading="time [s],NZ [m/s²],ROLL [°],PALT [ft]").replace("\n", newline)
    recording = log(tmp_path, text.encode(encoding))
    assert len(recording.time) == 200
    assert recording.channels["bank_angle"].unit == "deg"


def test_the_same_content_has_the_same_digest_however_packed(tmp_path: Path) -> None:
    import bz2
    import gzip
    import hashlib

    text = simple().encode()
    digest = hashlib.sha256(text).hexdigest()
    for name, data in (("a.csv", text), ("a.csv.gz", gzip.compress(text)), ("a.csv.bz2", bz2.compress(text))):
        recording = log(tmp_path, data, name)
        assert recording.content_sha256 == digest
        assert recording.sha256 == hashlib.sha256(data).hexdigest()


@pytest.mark.parametrize(
    ("cell", "kind"),
    [
        ("1.5", "number"),
        ("-1,5", "number"),
        ("+3e-4", "number"),
        ("1'234.5", "number"),
        ("12 kt", "number"),
        ("", "empty"),
        ("---", "empty"),
        ("****", "empty"),
        ("N/A", "empty"),
        ("NaN", "empty"),
        ("-", "empty"),
        ("2031-05-02", "stamp"),
        ("09:02:11.125", "stamp"),
        ("02/05/31 9:02", "stamp"),
        ("GROUND", "word"),
        ("20310502", "number"),
    ],
)
def test_forms_of_cells(cell: str, kind: str) -> None:
    assert form(cell) == kind
    assert is_missing(cell) == (kind == "empty")


def test_european_and_english_marks(tmp_path: Path) -> None:
    for delimiter, decimal, group in (
        (";", ",", "."),
        (";", ".", ","),
        ("\t", ",", " "),
        ("\t", ".", "'"),
        (";", ",", "\u00a0"),
    ):
        lines = [delimiter.join(["time [s]", "NZ [g]", "PALT [ft]"])]
        for t, n, _, h in rows():
            written_height = f"{h + 9000:,.1f}".replace(",", "#").replace(".", decimal).replace("#", group)
            lines.append(
                delimiter.join([f"{t:.3f}".replace(".", decimal), f"{n:.3f}".replace(".", decimal), written_height])
            )
        recording = log(tmp_path, "\n".join(lines) + "\n")
        height = recording.channels["pressure_altitude"].values / UNITS["ft"].factor
        assert np.allclose(height, [row[3] + 9000 for row in rows()], atol=0.06), (delimiter, decimal, group)


def test_facts_in_many_forms(tmp_path: Path) -> None:
    for top in (
        "Registration: ZZ-NMA\nRecorder serial: R-2201\n",
        "# Reg = ZZ-NMA\n# Logger S/N = R-2201\n",
        "Aircraft Reg;ZZ-NMA\nUnit serial no;R-2201\n",
        "Tail No,ZZ-NMA,Recorder Serial Number,R-2201\n",
    ):
        recording = log(tmp_path, top + simple())
        assert (recording.registration, recording.recorder_serial) == ("ZZ-NMA", "R-2201"), top


def test_an_airframes_serial_is_not_the_recorders() -> None:
    facts = (
        ("Aircraft serial", "L2-017"),
        ("Recorder serial", "R-1"),
        ("Registration date", "2031-05-02"),
        ("Reg", "ZZ-NMA"),
    )
    assert serial_in(facts) == "R-1"
    assert registration_in(facts) == "ZZ-NMA"
    assert serial_in(facts[:1]) is None


def test_a_registration_in_a_column(tmp_path: Path) -> None:
    lines = simple().splitlines()
    text = "\n".join([lines[0] + ",Registration", *(line + ",ZZ-NMC" for line in lines[1:])]) + "\n"
    assert log(tmp_path, text).registration == "ZZ-NMC"


@pytest.mark.parametrize(
    ("heading", "name", "unit"),
    [
        ("NZ [g]", "NZ", "g"),
        ("Roll rate (deg/s)", "Roll rate", "deg/s"),
        ("alt_ft", "alt", "ft"),
        ("vs_ft_min", "vs", "ft_min"),
        ("acc_m_s2", "acc", "m_s2"),
        ("IAS, kt", "IAS", "kt"),
        ("OAT/°C", "OAT", "°C"),
        ("N1", "N1", ""),
        ("GEAR UP", "GEAR UP", ""),
        ("Heading {deg}", "Heading", "deg"),
        ("WOW (1=gnd)", "WOW (1=gnd)", ""),
    ],
)
def test_units_in_headings(heading: str, name: str, unit: str) -> None:
    found, text = split_unit(heading)
    assert (found, text.replace("/", "_") if "_" in unit else text) == (name, unit)


@pytest.mark.parametrize(
    ("text", "kind", "unit"),
    [
        ("KTS", "speed", "kt"),
        ("knots", "speed", "kt"),
        ("KPH", "speed", "km/h"),
        ("kph", "mass flow", "kg/h"),
        ("m/s²", "load factor", "m/s2"),
        ("m·s⁻²", "load factor", "m/s2"),
        ("G", "load factor", "g"),
        ("°", "angle", "deg"),
        ("°/s", "angular rate", "deg/s"),
        ("FPM", "speed", "ft/min"),
        ("ft/mn", "speed", "ft/min"),
        ("°C", "temperature", "degC"),
        ("C", "temperature", "degC"),
        ("mb", "pressure", "mbar"),
        ("lbs", "mass", "lb"),
        ("GAL", "volume", "USG"),
        ("GPH", "volume flow", "USG/h"),
        ("PPH", "mass flow", "lb/h"),
        ("ms", "time", "ms"),
        ("ms", "speed", "m/s"),
        ("inHg", "pressure", "inHg"),
        ("furlong", "length", None),
        ("kt", "length", None),
    ],
)
def test_spellings_of_units(text: str, kind: str, unit: str | None) -> None:
    assert fitting(text, (kind,)) == unit


@pytest.mark.parametrize(
    ("heading", "quantity"),
    [
        ("VRTG", "load_factor"),
        ("Normal Acceleration", "load_factor"),
        ("NormAcc", "load_factor"),
        ("nz_cg", "load_factor"),
        ("G-LOAD", "load_factor"),
        ("LATG", "lateral_load_factor"),
        ("Lat Acc", "lateral_load_factor"),
        ("Long. accel.", "longitudinal_load_factor"),
        ("Roll Attitude", "bank_angle"),
        ("AOB", "bank_angle"),
        ("PTCH", "pitch_angle"),
        ("HDG MAG", "heading"),
        ("GndSpd", "ground_speed"),
        ("Radio Height", "height_above_ground"),
        ("ALT STD", "pressure_altitude"),
        ("PressureAltitude", "pressure_altitude"),
        ("GPS Altitude", "geometric_altitude"),
        ("IVV", "vertical_speed"),
        ("Rate of climb", "vertical_speed"),
        ("Total Air Temp", "total_air_temperature"),
        ("OAT", "static_air_temperature"),
        ("Air/Ground", "weight_on_wheels"),
        ("Stick shaker", "stall_warning"),
        ("Speed brake", "airbrakes_out"),
        ("Gross Weight", "mass"),
        ("CAS", "calibrated_airspeed"),
        ("True Airspeed", "true_airspeed"),
        ("IAS_2", "indicated_airspeed"),
        ("Airspeed Indicated (capt)", "indicated_airspeed"),
        ("TE Flap Position", "flap_angle"),
        ("LDG GEAR DOWN", "gear_down"),
        ("Sideslip", "sideslip_angle"),
        ("ROT", "turn_rate"),
    ],
)
def test_trade_terms(heading: str, quantity: str) -> None:
    found, why = meanings(split_unit(heading)[0])
    assert found, why
    assert found[0].quantity == quantity


@pytest.mark.parametrize(
    "heading",
    [
        "SEL ALT",
        "Target IAS",
        "MCP SPD",
        "CABIN ALT",
        "Wind speed",
        "Flap lever",
        "Elevator trim",
        "Max G",
        "IAS limit",
        "AP PITCH MODE",
        "Brake pressure",
        "Altitude bug",
        "VOR1 bearing",
        "Hyd press",
        "Oil pressure",
        "GPS HDOP",
    ],
)
def test_what_is_set_or_of_a_system_is_not_the_flown_value(heading: str) -> None:
    assert meanings(split_unit(heading)[0])[0] == ()


def test_a_name_and_a_unit_that_disagree_are_asked_about(tmp_path: Path) -> None:
    recording = log(tmp_path, simple(heading="time [s],NZ [kt],IAS [kt],PALT [ft]"))
    (row,) = recording.unresolved
    assert row.reason == "named like load_factor, but its unit 'kt' is not one of load factor"


def test_a_unit_can_name_the_airspeed(tmp_path: Path) -> None:
    recording = log(tmp_path, simple(heading="time [s],NZ [g],SPD [KCAS],PALT [ft]"))
    assert recording.channels["calibrated_airspeed"].column == "SPD [KCAS]"


def test_a_survey_reads_one_block(tmp_path: Path) -> None:
    path = written(tmp_path, simple(40_000))
    found = survey(path)
    assert len(found.source.head) == 256 * 1024
    assert found.quantities == ("indicated_airspeed", "load_factor", "pressure_altitude")
    assert found.clock.kind == "elapsed"


def test_a_preamble_longer_than_the_first_block(tmp_path: Path) -> None:
    top = "".join(f"Setting {k}: {'x' * 200}\n" for k in range(2000))
    recording = log(tmp_path, top + "Registration: ZZ-NMA\n" + simple())
    assert len(recording.time) == 200
    assert recording.registration == "ZZ-NMA"


def test_a_name_can_say_the_unit(tmp_path: Path) -> None:
    recording = log(tmp_path, simple(heading="time [s],NZ [g],KIAS,PALT [ft]"))
    assert recording.channels["indicated_airspeed"].unit == "kt"


@pytest.mark.parametrize("unit", ["x100 ft", "ft x 100", "FL", "0.01 ft"])
def test_a_multiple_of_a_unit_is_no_unit(tmp_path: Path, unit: str) -> None:
    recording = log(tmp_path, simple(heading=f"time [s],NZ [g],IAS [kt],PALT [{unit}]"))
    (row,) = recording.unresolved
    assert row.reason == f"written in '{unit}', a multiple of a unit"
    assert "pressure_altitude" not in recording.channels


def test_words_where_figures_are_due_are_asked_about(tmp_path: Path) -> None:
    lines = ["time [s],NZ [g],FLAPS"] + [f"{k / 8},1.0{k % 7},{'UP' if k % 90 < 60 else 'LDG'}" for k in range(300)]
    (row,) = log(tmp_path, "\n".join(lines) + "\n").unresolved
    assert row.reason == "its cells are words ('LDG', 'UP'), not figures"
    assert row.question == "What is the flap_angle for each of them?"


@pytest.mark.parametrize(
    "names",
    [
        ["NZ1", "NZ2", "NZ3", "NZ4"],
        ["NZ_0", "NZ_1", "NZ_2", "NZ_3"],
        ["NZ(1)", "NZ(2)", "NZ(3)", "NZ(4)"],
        ["NZa", "NZb", "NZc", "NZd"],
        ["NZ@0.0", "NZ@0.125", "NZ@0.25", "NZ@0.375"],
    ],
)
def test_sub_frames_by_number_letter_and_offset(tmp_path: Path, names: list[str]) -> None:
    load = [row[1] for row in rows(400)]
    lines = [",".join(["time [s]", "IAS [kt]", *names])]
    lines += [f"{k / 8},{100 + k % 9}," + ",".join(f"{load[k + j]:.4f}" for j in range(4)) for k in range(0, 400, 4)]
    recording = log(tmp_path, "\n".join(lines) + "\n")
    channel = recording.channels["load_factor"]
    assert np.allclose(channel.values, load, atol=6e-5)
    assert channel.rows is None
    assert recording.channels["indicated_airspeed"].rows is not None
    assert np.array_equal(recording.channels["indicated_airspeed"].rows, np.arange(0, 400, 4))
    assert recording.unused == ()


def test_sensors_beside_each_other_are_no_sub_frames(tmp_path: Path) -> None:
    load = [row[1] for row in rows(400)]
    lines = ["time [s],NZ1 [g],NZ2 [g],NZ3 [m/s2]"] + [
        f"{k / 8},{n:.4f},{n + 0.002:.4f},{n * 9.80665:.4f}" for k, n in enumerate(load)
    ]
    recording = log(tmp_path, "\n".join(lines) + "\n")
    assert recording.channels["load_factor"].column == "NZ1 [g]"
    assert len(recording.time) == 400
    assert {row.column for row in recording.unresolved} == {"NZ2 [g]", "NZ3 [m/s2]"}
