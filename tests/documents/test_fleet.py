"""Fleet files: every key, mistakes, and whose a log is."""

from __future__ import annotations

from pathlib import Path

import pytest

from exceed.documents.fleet import Fleet, belongs, load_fleet, matches
from exceed.documents.schema import template
from exceed.errors import DocumentError

HEAD = "format: exceed-fleet/1\n"
FLEET = HEAD + (
    "aircraft:\n"
    '  - {registration: ZZ-NMA, logs: ["zz-nma/*.csv", "shared-*.csv"], recorder_serial: "R-1"}\n'
    '  - {registration: ZZ-NMC, logs: ["zz-nmc/**", "shared-*.csv"], recorder_serial: "R-2"}\n'
)


@pytest.fixture
def fleet() -> Fleet:
    return load_fleet(FLEET)


def test_every_key_of_the_starter_file_arrives(tmp_path: Path) -> None:
    file = tmp_path / "fleet.yaml"
    file.write_text(template("fleet"))
    made = load_fleet(file)
    assert (made.operator, made.time_zone) == ("Northmoor Flying Group", "UTC")
    first, second = made.aircraft
    assert (first.registration, first.aircraft, first.rules, first.channels) == (
        "ZZ-NMA", "aircraft/larkspur.yaml", ("airframe", "aerobatic"), "channels/lark.yaml",
    )  # fmt: skip
    assert (first.loading, first.logs, first.recorder_serial) == (("loading/*.yaml",), ("zz-nma/*.csv",), "R-2201")
    assert second.rules == ("airframe",)
    # paths are relative to the file
    assert made.resolve("aircraft/larkspur.yaml") == tmp_path / "aircraft/larkspur.yaml"
    assert made.rules_of(first) == ("airframe", "aerobatic")
    own = first.model_copy(update={"rules": ("airframe", "rules/own.yaml")})
    assert made.rules_of(own) == ("airframe", str(tmp_path / "rules/own.yaml"))


@pytest.mark.parametrize(
    ("pattern", "path", "fits"),
    [
        ("zz-nma/*.csv", "zz-nma/a.csv", True),
        ("zz-nma/*.csv", "zz-nma/day/a.csv", False),
        ("zz-nma/**", "zz-nma/day/a.csv", True),
        ("**/a.csv", "a.csv", True),
        ("**/a.csv", "x/y/a.csv", True),
        ("*.csv", "a.csv", True),
        ("*.csv", "a.csvx", False),
        ("a?.csv", "a1.csv", True),
        ("a?.csv", "a/.csv", False),
        ("a[12].csv", "a2.csv", True),
        ("a[!12].csv", "a2.csv", False),
        ("a[1-3].csv", "a3.csv", True),
        ("a[.csv", "a[.csv", True),
        ("a+(b).csv", "a+(b).csv", True),
        ("./logs/*.csv", "logs/a.csv", True),
        ("logs/*.csv", "logs\\a.csv", True),
    ],
)
def test_patterns_fit_whole_paths(pattern: str, path: str, fits: bool) -> None:
    assert matches(pattern, path) is fits


def test_the_registration_written_in_the_log_comes_first(fleet: Fleet) -> None:
    found = belongs(fleet, "zz nma", None, ["elsewhere/a.csv"])
    assert (found.registration, found.found_by, found.problem) == ("ZZ-NMA", "registration", "")
    assert found.entry is fleet.aircraft[0]


def test_else_the_serial_of_the_recorder_else_the_patterns(fleet: Fleet) -> None:
    assert belongs(fleet, None, "R-2", ["x.csv"]).found_by == "recorder serial"
    assert belongs(fleet, None, "R-2", ["x.csv"]).registration == "ZZ-NMC"
    found = belongs(fleet, None, "R-9", ["zz-nmc/day/a.csv"])
    assert (found.registration, found.found_by) == ("ZZ-NMC", "path")
    # relative to the PATH given, or by name alone
    assert (
        belongs(
            load_fleet(HEAD + 'aircraft: [{registration: A-1, logs: ["a.csv"]}]\n'), None, None, ["x/y/a.csv"]
        ).registration
        == "A-1"
    )


def test_without_any_evidence_a_log_belongs_to_nobody(fleet: Fleet) -> None:
    found = belongs(fleet, None, None, ["x.csv"])
    assert (found.registration, found.entry, found.problem) == (None, None, "")


def test_a_registration_that_is_not_in_the_fleet_is_noted(fleet: Fleet) -> None:
    found = belongs(fleet, "ZZ-XXX", None, ["x.csv"])
    assert (found.registration, found.entry, found.note) == ("ZZ-XXX", None, "ZZ-XXX is not in the fleet file")


@pytest.mark.parametrize(
    ("written", "serial", "path", "problem"),
    [
        ("ZZ-NMA", "R-2", "x.csv", "the registration says ZZ-NMA and the recorder serial says ZZ-NMC"),
        ("ZZ-NMA", None, "zz-nmc/a.csv", "the registration says ZZ-NMA and the path says ZZ-NMC"),
        (None, "R-1", "zz-nmc/a.csv", "the recorder serial says ZZ-NMA and the path says ZZ-NMC"),
        ("ZZ-XXX", None, "zz-nmc/a.csv", "the registration says ZZ-XXX and the path says ZZ-NMC"),
        (None, None, "shared-1.csv", "the 'logs' patterns of ZZ-NMA, ZZ-NMC all fit this log"),
    ],
)
def test_evidence_that_disagrees_is_an_error_for_that_log(
    fleet: Fleet, written: str | None, serial: str | None, path: str, problem: str
) -> None:
    found = belongs(fleet, written, serial, [path])
    assert found.problem == problem
    assert found.entry is None


def test_a_shared_pattern_does_no_harm_where_the_log_says_whose_it_is(fleet: Fleet) -> None:
    found = belongs(fleet, "ZZ-NMC", None, ["shared-1.csv"])
    assert (found.registration, found.problem) == ("ZZ-NMC", "")


WRONG = [
    ("operator: x\n", "1:1", "key 'aircraft' is missing"),
    ("aircraft: x\n", "2:11", "'x' stands where a list is due"),
    ("aircraft: [{logs: [a]}]\n", "2:12", "key 'registration' is missing"),
    ("aircraft: [{registration: A, rules: []}]\n", "2:37", "no rules are named"),
    ("aircraft: [{registration: A, log: x}]\n", "2:30", "key 'log' is not known here"),
    ("aircraft: [{registration: A-1}, {registration: a1}]\n", "2:48", "registration 'a1' is there twice, first as aeroplane 1"),  # noqa: E501
    ("aircraft: [{registration: A, recorder_serial: R}, {registration: B, recorder_serial: R}]\n", "2:86", "recorder 'R' is in A as well"),  # noqa: E501
    ("time_zone: Nowhere\naircraft: [{registration: A}]\n", "2:12", "'Nowhere' is not a time zone"),
]  # fmt: skip


@pytest.mark.parametrize(("text", "place", "problem"), WRONG, ids=[row[2][:60] for row in WRONG])
def test_each_mistake_is_told_once_at_its_line_and_column(text: str, place: str, problem: str) -> None:
    with pytest.raises(DocumentError) as caught:
        load_fleet(HEAD + text)
    assert [(row.place, row.problem) for row in caught.value.problems] == [(f"text:{place}", problem)]
