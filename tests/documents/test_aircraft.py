"""Aircraft files: every key, and every kind of mistake at its line and column."""

from __future__ import annotations

import datetime
import pickle

import pytest
from pydantic import ValidationError

from exceed.core.units import UNITS
from exceed.documents.aircraft import (
    CATEGORIES,
    Aircraft,
    category_aircraft,
    load_aircraft,
    same_registration,
)
from exceed.documents.facts import KNOWN, kind_of_fact, nearest_fact
from exceed.documents.lint import lint
from exceed.documents.schema import template
from exceed.documents.values import Value
from exceed.errors import DocumentError, UsageError

HEAD = "format: exceed-aircraft/1\n"
KT = UNITS["kt"].factor
DEG = UNITS["deg"].factor
FT = UNITS["ft"].factor


def test_every_key_of_the_starter_file_arrives_in_si() -> None:
    aircraft = load_aircraft(template("aircraft"))
    assert (aircraft.registration, aircraft.serial, aircraft.type) == ("ZZ-NMA", "L2-017", "Larkspur 200")
    assert (aircraft.category, aircraft.flaps, aircraft.gear) == ("aerobatic", "recorded", "recorded")
    mass = aircraft.mass
    assert [mass.empty, mass.maximum_take_off, mass.maximum_landing, mass.maximum_zero_fuel] == [640, 960, 960, 900]
    first, second = aircraft.stall_speed
    assert (first.flaps, first.mass, first.upright, first.inverted) == (0, 960, 55 * KT, 66 * KT)
    assert first.upright.airspeed == "calibrated_airspeed"
    assert second.inverted is None
    rows = [(row.flaps, row.mass_up_to, row.maximum, row.minimum) for row in aircraft.load_factor]
    assert rows == [(0, 880, 6, -3), (0, 960, 4.4, -1.76), (pytest.approx(30 * DEG), None, 2, 0)]
    assert aircraft.rolling is not None
    assert (aircraft.rolling.factor, aircraft.rolling.above_roll_rate) == (0.667, pytest.approx(15 * DEG))
    speeds = aircraft.speeds
    assert speeds.manoeuvring is not None
    assert (speeds.manoeuvring.over, speeds.manoeuvring.points) == ("mass", ((700, 110 * KT), (960, 128 * KT)))
    assert speeds.normal_operating is not None
    assert (speeds.normal_operating.value, speeds.normal_operating.airspeed) == (140 * KT, "indicated_airspeed")
    assert speeds.never_exceed is not None
    assert speeds.never_exceed.points[1] == (pytest.approx(15000 * FT), 160 * KT)
    assert [(row.flaps, row.maximum) for row in speeds.flaps_extended] == [
        (pytest.approx(10 * DEG), 110 * KT),
        (pytest.approx(30 * DEG), 90 * KT),
    ]
    for name, knots in (("gear_operating", 110), ("gear_extended", 120), ("turbulence", 130), ("airbrakes", 150),
                        ("aerotow", 95), ("winch", 75)):  # fmt: skip
        assert getattr(speeds, name).value == knots * KT
    assert aircraft.position_error[0].points[0] == (50 * KT, 54 * KT)
    assert (aircraft.wing.area, aircraft.wing.span, aircraft.wing.mean_chord) == (13.6, 9.2, 1.5)
    assert aircraft.wing.lift_curve_slope == 4.9
    sensor = aircraft.recorder.accelerometer
    assert sensor is not None
    assert (sensor.position, sensor.range) == ((0.35, 0, -0.1), (-6, 9))
    assert sensor.calibrated == datetime.date(2031, 1, 10)
    assert aircraft.recorder.accuracy == {"load_factor": 0.05, "indicated_airspeed": 2 * KT}
    assert {name: row.arm for name, row in aircraft.loading.stations.items()} == {
        "pilot": 1.12, "passenger": 1.12, "baggage": 1.8, "main_fuel": 0.9,
    }  # fmt: skip
    assert (aircraft.fuel_density, aircraft.loading.empty_arm) == (720, 0.98)
    assert aircraft.loading.stations["baggage"].maximum == 25
    assert aircraft.loading.envelope == ((640, 0.9, 1.1), (960, 0.96, 1.1))
    assert aircraft.fuel_consumption == pytest.approx(0.04 / 3600)
    assert aircraft.fuel_consumption is not None
    assert aircraft.fuel_consumption.kind == "volume flow"
    assert aircraft.limits["oil_temperature"] == pytest.approx(391.15)
    assert aircraft.source == "Invented for the demonstration"
    assert (aircraft.path, aircraft.assumed, len(aircraft.sha256)) == ("text", False, 64)


def test_an_aircraft_is_frozen_and_survives_pickling() -> None:
    aircraft = load_aircraft(template("aircraft"))
    assert pickle.loads(pickle.dumps(aircraft)) == aircraft
    with pytest.raises(ValidationError):
        aircraft.type = "other"


def test_a_file_with_nothing_but_its_format_is_an_aircraft_of_which_nothing_is_known() -> None:
    aircraft = load_aircraft(HEAD)
    assert aircraft.load_factor == ()
    assert aircraft.mass.maximum_take_off is None
    assert aircraft.fact("load_factor.maximum").missing == "the aircraft file has no maximum load factor"


def test_an_aircraft_can_be_built_by_hand() -> None:
    aircraft = Aircraft(registration="ZZ-X", mass={"empty": "600 kg"}, speeds={"never_exceed": "175 KIAS"})
    assert aircraft.mass.empty == 600
    assert aircraft.speeds.never_exceed is not None
    assert aircraft.speeds.never_exceed.airspeed == "indicated_airspeed"


FORMS = [
    ("speeds: {never_exceed: 250 km/h IAS}\n", lambda a: a.speeds.never_exceed.value, 250 / 3.6),
    ("speeds: {manoeuvring: {value: 128 KIAS, mass: 960 kg, scale: sqrt_mass}}\n",
     lambda a: (a.speeds.manoeuvring.value, a.speeds.manoeuvring.mass, a.speeds.manoeuvring.scale),
     (128 * KT, 960.0, "sqrt_mass")),
    ("speeds: {never_exceed: {over: flaps, points: [[0 deg, 150 KIAS], [10 deg, 120 KIAS]]}}\n",
     lambda a: a.speeds.never_exceed.points[1], (10 * DEG, 120 * KT)),
    ("speeds: {flaps_extended: 90 KIAS}\n",
     lambda a: [(row.flaps, row.maximum) for row in a.speeds.flaps_extended], [(None, 90 * KT)]),
    ("speeds: {flaps_extended: {over: flaps, points: [[10 deg, 110 KIAS], [30 deg, 90 KIAS]]}}\n",
     lambda a: [row.maximum for row in a.speeds.flaps_extended], [110 * KT, 90 * KT]),
    ("speeds: {flaps_extended: [{flaps: 10 deg, maximum: 90 KIAS}, {flaps: 30 deg, maximum: 90 KIAS}]}\n",
     lambda a: [row.maximum for row in a.speeds.flaps_extended], [90 * KT, 90 * KT]),
    ("position_error: [[50 KIAS, 54 KCAS], [180 KIAS, 180 KCAS]]\n",
     lambda a: (a.position_error[0].flaps, a.position_error[0].points[0]), (None, (50 * KT, 54 * KT))),
    ("mach: {maximum_operating: 0.80}\n", lambda a: a.mach.maximum_operating.value, 0.8),
    ("mach: {maximum_operating: {over: pressure_altitude, points: [[0 ft, 0.7], [30000 ft, 0.8]]}}\n",
     lambda a: a.mach.maximum_operating.points[1][1], 0.8),
    ("load_factor: [{airbrakes: out, maximum: 3.5 g, minimum: -1.5 g}]\n", lambda a: a.load_factor[0].airbrakes, "out"),
    ("load_factor: [{speed_up_to: 140 KIAS, maximum: 6 g}]\n", lambda a: a.load_factor[0].speed_up_to, 140 * KT),
    ("rolling: {factor: 66.7 %, above_roll_rate: 15 deg/s}\n", lambda a: a.rolling.factor, 0.667),
    ("fuel_consumption: 30 kg/h\n", lambda a: a.fuel_consumption, 30 / 3600),
    ("limits: {oil_temperature: 244.4 degF, anything: 0.5}\n", lambda a: a.limits["anything"], 0.5),
    ("flaps: none\ngear: fixed\nmass: ~\n", lambda a: (a.flaps, a.gear, a.mass.empty), ("none", "fixed", None)),
]  # fmt: skip


@pytest.mark.parametrize(("text", "read", "expected"), FORMS, ids=[row[0][:40].strip() for row in FORMS])
def test_every_written_form_is_read(text: str, read, expected) -> None:  # type: ignore[no-untyped-def]
    assert (
        read(load_aircraft(HEAD + text)) == pytest.approx(expected)
        if isinstance(expected, float)
        else (read(load_aircraft(HEAD + text)) == expected)
    )


# text after the format line, place, problem
WRONG = [
    ("masss: {empty: 1 kg}\n", "2:1", "key 'masss' is not known here"),
    ("mass: {empti: 1 kg}\n", "2:8", "key 'empti' is not known here"),
    ("path: x\n", "2:1", "key 'path' is not known here"),
    ("mass: 5 kg\n", "2:7", "'5 kg' stands where the mapping of masses is due"),
    ("mass: {empty: -640 kg}\n", "2:15", "'-640 kg' is no possible mass here"),
    ("mass: {empty: 0 kg}\n", "2:15", "'0 kg' is no possible mass here"),
    ("mass: {empty: 640}\n", "2:15", "'640' has no unit"),
    ("mass: {empty: 640 kt}\n", "2:15", "'640 kt' is a speed"),
    ("mass: {empty: 970 kg, maximum_take_off: 960 kg}\n", "2:15",
     "empty mass '970 kg' is not below maximum take-off mass '960 kg'"),
    ("mass: {maximum_landing: 970 kg, maximum_take_off: 960 kg}\n", "2:25",
     "maximum landing mass '970 kg' is above maximum take-off mass '960 kg'"),
    ("mass: {maximum_zero_fuel: 600 kg, empty: 640 kg}\n", "2:27",
     "maximum zero fuel mass '600 kg' is not above empty mass '640 kg'"),
    ("category: acrobatic\n", "2:11", "'acrobatic' is not a category"),
    ("flaps: fixed\n", "2:8", "'fixed' is not a state of the flaps"),
    ("gear: none\n", "2:7", "'none' is not a state of the gear"),
    ("registration: [a]\n", "2:15", "a list stands where text is due"),
    ('registration: ""\n', "2:15", "empty text stands where text is due"),
    ("stall_speed: 55 KCAS\n", "2:14", "'55 KCAS' stands where a list is due"),
    ("stall_speed: [{flaps: 0 deg}]\n", "2:15", "key 'upright' is missing"),
    ("stall_speed: [{upright: 55 kt}]\n", "2:25", "'55 kt' does not say which airspeed it is"),
    ("stall_speed: [{flaps: 30 deg, upright: 48 KCAS}, {flaps: 0 deg, upright: 55 KCAS}]\n", "2:50",
     "flaps '0 deg' are not above '30 deg' before them"),
    ("stall_speed: [{upright: 55 KCAS}, {flaps: 0 deg, upright: 48 KCAS}]\n", "2:35",
     "flaps '0 deg' are not above 'flaps up' before them"),
    ("stall_speed: [{flaps: 0 deg, upright: 48 KCAS}, {flaps: 30 deg, upright: 55 KCAS}]\n", "2:74",
     "stall speed '55 KCAS' with more flaps is above '48 KCAS' with fewer"),
    ("stall_speed: [{upright: 55 KCAS}]\nspeeds: {manoeuvring: 50 KIAS}\n", "3:23",
     "manoeuvring speed '50 KIAS' is not above stall speed '55 KCAS'"),
    ("stall_speed: [{upright: 55 KCAS}]\nspeeds: {never_exceed: 50 KIAS}\n", "3:24",
     "never-exceed speed '50 KIAS' is not above stall speed '55 KCAS'"),
    ("load_factor: [{flaps: 0 deg}]\n", "2:15", "this row has neither maximum nor minimum"),
    ("load_factor: [{maximum: 0.5 g}]\n", "2:25",
     "maximum '0.5 g' is below 1 g, so level flight would be beyond it"),
    ("load_factor: [{minimum: 3 g}]\n", "2:25", "minimum '3 g' is above 1 g, so level flight would be beyond it"),
    ("load_factor: [{maximum: 1 g, minimum: 1 g}]\n", "2:39", "minimum '1 g' is not below maximum '1 g'"),
    ("load_factor: [{maximum: 6 g}, {maximum: 5 g}]\n", "2:31", "this row has the same conditions as row 1"),
    ("load_factor: [{airbrakes: open, maximum: 5 g}]\n", "2:27", "'open' is not a state of the airbrakes"),
    ("rolling: {factor: 1.5, above_roll_rate: 15 deg/s}\n", "2:19", "'1.5' is no possible ratio here"),
    ("rolling: {factor: 0.667}\n", "2:10", "key 'above_roll_rate' is missing"),
    ("speeds: {normal_operating: 180 KIAS, never_exceed: 175 KIAS}\n", "2:28",
     "normal operating speed '180 KIAS' is above never exceed speed '175 KIAS'"),
    ("speeds: {manoeuvring: 180 KIAS, never_exceed: 175 KIAS}\n", "2:23",
     "manoeuvring speed '180 KIAS' is above never exceed speed '175 KIAS'"),
    ("speeds: {turbulence: 300 KIAS, maximum_operating: 275 KIAS}\n", "2:22",
     "turbulence speed '300 KIAS' is above maximum operating speed '275 KIAS'"),
    ("speeds: {never_exceed: 175 kph}\n", "2:24", "unit 'kph' is not known"),
    ("speeds: {never_exceed: 175 ft/min}\n", "2:24", "'175 ft/min' is no airspeed"),
    ("speeds: {never_exceed: {over: mas, points: [[1 kg, 1 KIAS], [2 kg, 1 KIAS]]}}\n", "2:31",
     "'mas' is not a quantity to give speeds over"),
    ("speeds: {never_exceed: {points: [[1 kg, 1 KIAS], [2 kg, 1 KIAS]]}}\n", "2:24",
     "points are given and 'over' is missing"),
    ("speeds: {never_exceed: {over: mass}}\n", "2:24", "'over' is given and the points are missing"),
    ("speeds: {never_exceed: {over: mass, points: [[1 kg, 1 KIAS]]}}\n", "2:45",
     "a list of pairs needs at least 2 of them, 1 given"),
    ("speeds: {never_exceed: {over: mass, points: [[1 kg, 1 KIAS], [2 kg]]}}\n", "2:62",
     "1 values stand where a pair, as in '[960 kg, 128 KIAS]' is due"),
    ("speeds: {never_exceed: {over: mass, points: [[1 ft, 1 KIAS], [2 kg, 1 KIAS]]}}\n", "2:47", "'1 ft' is a length"),
    ("speeds: {never_exceed: {over: mass, points: [[2 kg, 1 KIAS], [2 kg, 1 KIAS]]}}\n", "2:62",
     "mass '2 kg' is not above '2 kg' before it"),
    ("speeds: {never_exceed: {over: mass, points: [[1 kg, 1 KIAS], [2 kg, 1 KCAS]]}}\n", "2:69",
     "'1 KCAS' is another kind of airspeed than '1 KIAS'"),
    ("speeds: {never_exceed: {}}\n", "2:24", "neither a value nor points are given"),
    ("speeds: {never_exceed: {value: 1 KIAS, over: mass, points: [[1 kg, 1 KIAS], [2 kg, 1 KIAS]]}}\n", "2:60",
     "both a value and points are given"),
    ("speeds: {manoeuvring: {value: 128 KIAS, scale: sqrt_mass}}\n", "2:23",
     "scaling with mass needs 'value' and 'mass'"),
    ("speeds: {flaps_extended: [{flaps: 30 deg, maximum: 90 KIAS}, {flaps: 10 deg, maximum: 110 KIAS}]}\n", "2:62",
     "flaps '10 deg' are not above '30 deg' before them"),
    ("speeds: {flaps_extended: [{flaps: 10 deg, maximum: 90 KIAS}, {flaps: 30 deg, maximum: 110 KIAS}]}\n", "2:87",
     "'110 KIAS' with more flaps is above '90 KIAS' with fewer"),
    ("speeds: {flaps_extended: 90 kt}\n", "2:26", "'90 kt' does not say which airspeed it is"),
    ("flaps: none\nspeeds: {flaps_extended: 90 KIAS}\n", "3:26",
     "flap speeds are given and the aeroplane has no flaps"),
    ("flaps: none\nstall_speed: [{flaps: 10 deg, upright: 55 KCAS}]\n", "3:23",
     "flaps '10 deg' are given and the aeroplane has none"),
    ("gear: fixed\nspeeds: {gear_extended: 120 KIAS}\n", "3:25", "a gear speed is given and the gear is fixed"),
    ("mach: {maximum_operating: 80}\n", "2:27", "'80' is no possible ratio here"),
    ("mach: {maximum_operating: 0.8 kt}\n", "2:27", "'0.8 kt' is a speed"),
    ("position_error: [{points: [[50 KCAS, 54 KCAS]]}]\n", "2:29", "'50 KCAS' is no indicated airspeed"),
    ("position_error: [{points: [[50 KIAS, 54 KIAS]]}]\n", "2:38", "'54 KIAS' is no calibrated airspeed"),
    ("position_error: [[60 KIAS, 64 KCAS], [50 KIAS, 74 KCAS]]\n", "2:38",
     "indicated airspeed '50 KIAS' is not above '60 KIAS' before it"),
    ("position_error: [[60 KIAS, 64 KCAS], [70 KIAS, 54 KCAS]]\n", "2:38",
     "calibrated airspeed '54 KCAS' is not above '64 KCAS' before it"),
    ("position_error: [{points: [[50 KIAS, 54 KCAS]]}, {points: [[50 KIAS, 54 KCAS]]}]\n", "2:50",
     "a row for all flap settings stands beside another row"),
    ("wing: {area: -13 m2}\n", "2:14", "'-13 m2' is no possible area here"),
    ("recorder: {accelerometer: {position: [1 m, 2 m]}}\n", "2:38",
     "2 values stand where three lengths: forward, right, down of the CG is due"),
    ("recorder: {accelerometer: {range: [9 g, -6 g]}}\n", "2:35", "'9 g' is not below '-6 g'"),
    ('recorder: {accelerometer: {calibrated: "10.01.2031"}}\n', "2:40", "'10.01.2031' is not a date"),
    ('recorder: {accelerometer: {calibrated: "2031-02-30"}}\n', "2:40", "'2031-02-30' is not a date"),
    ("recorder: {accuracy: {load_facter: 0.05 g}}\n", "2:23", "key 'load_facter' is not known here"),
    ("recorder: {accuracy: {load_factor: 2 kt}}\n", "2:36", "'2 kt' is a speed"),
    ("recorder: {accuracy: {indicated_airspeed: 2 KIAS}}\n", "2:43", "'2 KIAS' is an airspeed"),
    ("loading: {stations: {pilot: {}}}\n", "2:29", "key 'arm' is missing"),
    ("loading: {envelope: [[640 kg, 1.1 m, 0.9 m]]}\n", "2:22",
     "forward limit '1.1 m' is not ahead of aft limit '0.9 m'"),
    ("loading: {envelope: [[960 kg, 0.9 m, 1.1 m], [640 kg, 0.9 m, 1.1 m]]}\n", "2:46",
     "mass '640 kg' is not above '960 kg' before it"),
    ("mass: {empty: 700 kg}\nloading: {envelope: [[640 kg, 0.9 m, 1.1 m]]}\n", "3:22",
     "the envelope ends at '640 kg', below empty mass '700 kg'"),
    ("fuel_consumption: 40 L\n", "2:19", "'40 L' is a volume"),
    ("limits: {oil_temperature: 118}\n", "2:27", "'118' has no unit"),
    ("limits: {oil_pressure_minimum: 2 degC}\n", "2:32", "'2 degC' is a temperature"),
    ("limits: {engine_speed: 2 kt}\n", "2:24", "'2 kt' is a speed"),
]  # fmt: skip


@pytest.mark.parametrize(("text", "place", "problem"), WRONG, ids=[row[2][:50] for row in WRONG])
def test_each_mistake_is_told_once_at_its_line_and_column(text: str, place: str, problem: str) -> None:
    with pytest.raises(DocumentError) as caught:
        load_aircraft(HEAD + text)
    assert [(row.place, row.problem) for row in caught.value.problems] == [(f"text:{place}", problem)]
    assert all(row.expected and row.do for row in caught.value.problems)


def test_all_mistakes_of_a_file_are_listed_at_once_in_the_order_of_the_text() -> None:
    text = template("aircraft")
    for old, new in (
        ("empty: 640 kg", "empty: -640 kg"),
        ("maximum_landing: 960 kg", "maximum_landing: 990 kg"),
        ("maximum: 4.4 g", "maximum: 4,4 g"),
        ("[[700 kg, 110 KIAS]", "[[700 kg, 110 kph]"),
        ("normal_operating: 140 KIAS", "normal_operating: 190 KIAS"),
        ("fuel_consumption: 40 L/h", "fuel_consumption: 40"),
        ("source:", "sauce:"),
    ):
        assert old in text
        text = text.replace(old, new, 1)
    with pytest.raises(DocumentError) as caught:
        load_aircraft(text, "a.yaml")
    assert [row.problem for row in caught.value.problems] == [
        "'-640 kg' is no possible mass here",
        "maximum landing mass '990 kg' is above maximum take-off mass '960 kg'",
        "'4,4 g' has a decimal comma",
        "unit 'kph' is not known",
        "normal operating speed '190 KIAS' is above never exceed speed '175 KIAS'",
        "'40' has no unit",
        "key 'sauce' is not known here",
    ]
    lines = text.splitlines()
    for row in caught.value.problems:
        name, line, column = row.place.split(":")
        assert name == "a.yaml"
        assert lines[int(line) - 1][int(column) - 1] not in " "


def test_a_message_is_composed_of_place_problem_expected_and_do() -> None:
    (problem,) = lint(HEAD + "speeds: {never_exceed: 175 kph}\n")
    assert str(problem) == (
        "text:2:24: unit 'kph' is not known\n"
        "  expected: an airspeed in KCAS, KEAS, KIAS, KTAS, or a speed and its kind, as in '250 km/h IAS'\n"
        "  do: write 'km/h' if you meant kilometres per hour"
    )


def test_a_near_miss_is_suggested() -> None:
    (problem,) = lint(HEAD + "registratoin: ZZ-X\n")
    assert problem.do == "write 'registration' if that is meant"


def test_another_kind_of_file_is_refused() -> None:
    with pytest.raises(DocumentError) as caught:
        load_aircraft("format: exceed-rules/1\nrules: []\n")
    assert str(caught.value) == (
        "text:1:9: 'exceed-rules/1' is not the format due here\n  expected: exceed-aircraft/1\n"
        "  do: give this file where it belongs"
    )


# ---------------------------------------------------------------------------- facts


def test_every_known_fact_is_there_or_says_why_not() -> None:
    whole, bare = load_aircraft(template("aircraft")), load_aircraft(HEAD)
    for name, kind in KNOWN.items():
        assert kind_of_fact(f"aircraft.{name}") == kind
        missing = bare.fact(name)
        assert (missing.value, missing.kind) == (None, kind)
        assert missing.missing.startswith("the aircraft file has no ")
        found = whole.fact(f"aircraft.{name}")
        if name.startswith(("mach.", "speeds.maximum_operating")):
            assert found.missing
        else:
            assert found.value is not None, name
            assert (found.kind, found.missing, found.source) == (kind, "", "Invented for the demonstration")


def test_facts_say_what_does_not_apply_to_the_aeroplane() -> None:
    aircraft = load_aircraft(HEAD + "flaps: none\ngear: fixed\n")
    assert aircraft.fact("speeds.flaps_extended").missing == "the aeroplane has no flaps"
    assert aircraft.fact("speeds.gear_extended").missing == "the gear is fixed"
    assert aircraft.fact("limits.anything").missing == "the aircraft file has no limits.anything"
    with pytest.raises(KeyError, match=r"'aircraft\.speeds\.nothing' is not a fact"):
        aircraft.fact("speeds.nothing")
    assert nearest_fact("aircraft.speeds.never_exeed") == "aircraft.speeds.never_exceed"


def test_a_fact_knows_its_airspeed() -> None:
    fact = load_aircraft(template("aircraft")).fact("speeds.never_exceed")
    assert fact.airspeed == "indicated_airspeed"


# ---------------------------------------------------------------------------- categories, registrations


def test_the_limits_of_a_category_are_marked_assumed() -> None:
    # 14 CFR 23.337 before Amdt 23-64: utility 4.4, negative 0.4 of it; 23.345: 2.0 with flaps
    aircraft = category_aircraft("utility")
    assert aircraft.assumed
    rows = [(row.maximum, row.minimum) for row in aircraft.load_factor]
    assert rows[0] == (4.4, pytest.approx(-1.76))
    assert rows[1][0] == 2.0
    assert aircraft.fact("load_factor.maximum").assumed
    assert "assumed" in (aircraft.source or "")


def test_a_category_whose_formula_needs_a_mass_asks_for_it() -> None:
    # 2.1 + 24000 / (W + 10000) with W in lb, at most 3.8: 14 CFR 23.337(a)
    with pytest.raises(UsageError) as caught:
        category_aircraft("normal")
    assert str(caught.value) == (
        "--aircraft: the limits of the category normal depend on the maximum take-off mass\n"
        "  expected: a mass\n  do: add --mass, as in '--mass \"900 kg\"'"
    )
    light = category_aircraft("normal", 900.0)
    assert light.load_factor[0].maximum == pytest.approx(3.8)
    heavy = category_aircraft("normal", 5000 * 0.45359237)
    assert heavy.load_factor[0].maximum == pytest.approx(2.1 + 24000 / 15000)
    assert light.mass.maximum_take_off == 900


@pytest.mark.parametrize("category", CATEGORIES)
def test_every_category_gives_an_aeroplane(category: str) -> None:
    aircraft = category_aircraft(category, 1000.0)
    assert aircraft.category == category
    assert isinstance(aircraft.load_factor[0].maximum, Value)


def test_an_unknown_category_suggests_the_nearest() -> None:
    with pytest.raises(UsageError) as caught:
        category_aircraft("utilty")
    assert caught.value.problems[0].do == "write 'utility' if that is meant"


@pytest.mark.parametrize(
    ("one", "other", "same"),
    [("ZZ-NMA", "zznma", True), ("ZZ NMA.", "zz-nma", True), ("ZZ-NMA", "ZZ-NMB", False), (None, None, False),
     ("", "", False), ("-", "", False), ("ZZ-NMA", None, False)],
)  # fmt: skip
def test_registrations_are_compared_without_case_and_punctuation(
    one: str | None, other: str | None, same: bool
) -> None:
    assert same_registration(one, other) is same
