"""Loading sheets: every key, mistakes, and which sheet belongs to which flight."""

from __future__ import annotations

import datetime

import pytest

from exceed.documents.aircraft import load_aircraft
from exceed.documents.loading import LoadingSheet, load_loading, overloaded, sheet_for_flights, station_masses
from exceed.documents.schema import template
from exceed.errors import DocumentError

HEAD = "format: exceed-loading/1\nlog: a.csv\n"
NINE = datetime.datetime(2031, 5, 2, 9, 0, tzinfo=datetime.UTC)


def at(minutes: float) -> datetime.datetime:
    return NINE + datetime.timedelta(minutes=minutes)


def sheet(take_off: str = "", log: str = "", registration: str = "ZZ-NMA", name: str = "s.yaml") -> LoadingSheet:
    text = f"format: exceed-loading/1\nregistration: {registration}\n"
    text += f'take_off: "{take_off}"\n' if take_off else ""
    text += f"log: {log}\n" if log else ""
    return load_loading(text, name)


def test_every_key_of_the_starter_file_arrives() -> None:
    made = load_loading(template("loading"))
    assert (made.registration, made.take_off, made.log) == ("ZZ-NMA", at(14), None)
    assert made.stations == {"pilot": 82, "passenger": 0, "baggage": 4, "main_fuel": pytest.approx(0.07)}
    assert (made.observed.load_factor_maximum, made.observed.load_factor_minimum) == (5.8, -2)


def test_litres_become_kilograms_by_the_density_of_the_station() -> None:
    masses = station_masses(load_loading(template("loading")), load_aircraft(template("aircraft")))
    # 70 L of 0.72 kg/L
    assert masses == {"pilot": 82, "passenger": 0, "baggage": 4, "main_fuel": pytest.approx(50.4)}


def test_a_station_that_is_not_there_or_has_no_density_is_said() -> None:
    aircraft = load_aircraft(template("aircraft"), "larkspur.yaml")
    made = load_loading(HEAD + "stations: {pilto: 80 kg, baggage: 4 L, tail: 1 kg}\n", "sheet.yaml")
    with pytest.raises(DocumentError) as caught:
        station_masses(made, aircraft)
    assert [(row.place, row.problem, row.do) for row in caught.value.problems] == [
        ("sheet.yaml", "station 'pilto' is not known", "write 'pilot' if that is meant"),
        ("sheet.yaml", "station 'baggage' is given as '4 L' and has no density",
         "write kilograms, or add 'density' to baggage in larkspur.yaml"),
        ("sheet.yaml", "station 'tail' is not known", "add the station to larkspur.yaml"),
    ]  # fmt: skip


def test_an_overloaded_station_is_noted() -> None:
    made = load_loading(HEAD + "stations: {baggage: 30 kg, pilot: 300 kg, passenger: 110 kg}\n")
    assert overloaded(made, load_aircraft(template("aircraft"))) == (
        "station baggage carries 30.0 kg, more than its maximum of 25 kg",
    )


WRONG = [
    ("stations: [a]\n", "3:11", "a list stands where stations are due"),
    ("stations: {pilot: 82}\n", "3:19", "'82' has no unit"),
    ("stations: {pilot: -82 kg}\n", "3:19", "'-82 kg' is no possible mass here"),
    ("stations: {pilot: 82 kt}\n", "3:19", "'82 kt' is a speed"),
    ("observed: {load_factor_maximum: 2 g, load_factor_minimum: 3 g}\n", "3:59", "minimum '3 g' is not below maximum '2 g'"),  # noqa: E501
    ("observed: {load_factor: 2 g}\n", "3:12", "key 'load_factor' is not known here"),
    ('take_off: "09:14"\n', "3:11", "'09:14' is not a time with its zone"),
    ('take_off: "2031-02-30T09:14Z"\n', "3:11", "'2031-02-30T09:14Z' is not a time with its zone"),
]  # fmt: skip


@pytest.mark.parametrize(("text", "place", "problem"), WRONG, ids=[row[2][:60] for row in WRONG])
def test_each_mistake_is_told_once_at_its_line_and_column(text: str, place: str, problem: str) -> None:
    with pytest.raises(DocumentError) as caught:
        load_loading(HEAD + text)
    assert [(row.place, row.problem) for row in caught.value.problems] == [(f"text:{place}", problem)]


def test_a_sheet_must_say_which_flight_it_is_for() -> None:
    with pytest.raises(DocumentError) as caught:
        load_loading("format: exceed-loading/1\nregistration: ZZ-NMA\n")
    assert [(row.place, row.problem) for row in caught.value.problems] == [
        ("text:1:1", "the sheet does not say which flight it is for")
    ]


def test_a_time_with_another_zone_is_turned_into_utc() -> None:
    assert sheet("2031-05-02T11:14+02:00").take_off == at(14)


def test_the_nearest_flight_within_a_quarter_of_an_hour_gets_the_sheet() -> None:
    one = sheet("2031-05-02T09:14Z")
    assert sheet_for_flights([one], "zznma", "a.csv", [at(0), at(20), at(200)]) == {1: one}
    assert sheet_for_flights([one], "zznma", "a.csv", [at(-1.1)]) == {}
    assert sheet_for_flights([one], "zznma", "a.csv", [at(-1)]) == {0: one}
    assert sheet_for_flights([one], "ZZ-NMB", "a.csv", [at(14)]) == {}
    assert sheet_for_flights([one], "ZZ-NMA", "a.csv", [None]) == {}


def test_a_tie_is_an_error() -> None:
    with pytest.raises(DocumentError) as caught:
        sheet_for_flights([sheet("2031-05-02T09:10Z")], "ZZ-NMA", "a.csv", [at(5), at(15)])
    assert caught.value.problems[0].problem == "flights 1 and 2 of a.csv are as near to 'take_off' as each other"


def test_a_sheet_may_name_the_log_by_name_or_by_the_end_of_its_path() -> None:
    for name in ("a.csv", "day/a.csv"):
        one = sheet(log=name)
        assert sheet_for_flights([one], "ZZ-NMA", "zz-nma/day/a.csv", [None]) == {0: one}
    assert sheet_for_flights([sheet(log="b/a.csv")], "ZZ-NMA", "zz-nma/day/a.csv", [None]) == {}
    with pytest.raises(DocumentError) as caught:
        sheet_for_flights([sheet(log="a.csv")], "ZZ-NMA", "a.csv", [at(0), at(60)])
    assert caught.value.problems[0].problem == "a.csv has 2 flights and the sheet does not say which"
    both = sheet("2031-05-02T10:00Z", "a.csv")
    assert sheet_for_flights([both], "ZZ-NMA", "a.csv", [at(0), at(60)]) == {1: both}


def test_two_sheets_for_one_flight_are_an_error() -> None:
    with pytest.raises(DocumentError) as caught:
        sheet_for_flights([sheet("2031-05-02T09:14Z", name="x.yaml"), sheet("2031-05-02T09:15Z", name="y.yaml")],
                          "ZZ-NMA", "a.csv", [at(14)])  # fmt: skip
    assert [(row.place, row.problem) for row in caught.value.problems] == [
        ("y.yaml", "flight 1 of a.csv has another sheet as well, x.yaml")
    ]
