"""The terminal's table: fits, says everything, sends no control character."""

from __future__ import annotations

import re
from dataclasses import replace
from typing import Any

import pytest

from exceed.core.findings import Coverage
from exceed.core.outcome import DayOutcome
from exceed.report.show import MARKS, breadth
from exceed.report.summary import summarise
from exceed.report.table import render_table
from report import examples, golden

SGR = re.compile(r"\x1b\[[0-9;]*m")


@pytest.fixture(scope="module")
def summary() -> dict[str, Any]:
    return summarise(examples.day())


@pytest.mark.parametrize("name", sorted(golden.TABLES))
def test_the_golden_tables_have_not_changed(name: str) -> None:
    assert golden.table(name) == (golden.FOLDER / name).read_text(encoding="utf-8")


@pytest.mark.parametrize("colour", [False, True])
@pytest.mark.parametrize("units", ["trade", "metric"])
@pytest.mark.parametrize("width", [60, 72, 80, 100, 118, 160])
def test_no_line_is_wider_than_the_terminal(summary: dict[str, Any], width: int, units: str, colour: bool) -> None:
    text = SGR.sub("", render_table(summary, width=width, units=units, colour=colour))
    assert max(breadth(line) for line in text.splitlines()) <= width


@pytest.mark.parametrize("width", [None, 60, 80, 160])
def test_no_control_character_and_no_hidden_one_reaches_the_terminal(
    summary: dict[str, Any], width: int | None
) -> None:
    text = render_table(summary, width=width)
    assert [letter for letter in text if not letter.isprintable() and letter != "\n"] == []
    assert "\\x1b[31m" in text
    assert "[red]" in text


def test_a_poor_encoding_gets_ascii_only(summary: dict[str, Any]) -> None:
    assert render_table(summary, width=80, unicode=False).isascii()
    assert "größe" in render_table(summary, width=80)


def test_without_colour_severity_still_has_word_and_mark(summary: dict[str, Any]) -> None:
    text = render_table(summary, width=80)
    assert "\x1b" not in text
    for severity, mark in MARKS.items():
        assert f"{mark:<2} {severity}" in text


def test_colour_changes_nothing_but_colour(summary: dict[str, Any]) -> None:
    coloured = render_table(summary, width=80, colour=True)
    assert coloured != render_table(summary, width=80)
    assert SGR.sub("", coloured) == render_table(summary, width=80)
    assert "\x1b[1;31m!! warning\x1b[0m" in coloured
    assert "\x1b[33m!  caution\x1b[0m" in coloured
    assert "\x1b[36m*  advisory\x1b[0m" in coloured


@pytest.mark.parametrize("width", [None, 60, 80])
def test_one_event_takes_one_line(width: int | None) -> None:
    text = render_table(summarise(examples.long_day(40)), width=width)
    assert sum(line.lstrip().startswith(("!! warning", "!  caution")) for line in text.splitlines()) == 40


def test_in_a_pipe_a_line_says_everything_about_its_event(summary: dict[str, Any]) -> None:
    line = next(line for line in render_table(summary).splitlines() if "09:15:43" in line)
    for part in (
        "caution",
        "established",
        "ZZ-NMA",
        "2031-05-02T09:15:43.095Z",
        "11:15:43.0 +02:00",
        "Positive load factor",
        "6.24",
        "6.12..6.37",
        "6.00",
        "0.81 s",
        "manoeuvring",
        "zz-nma/a.csv",
    ):
        assert part in line


def test_events_stand_most_severe_and_surest_first(summary: dict[str, Any]) -> None:
    lines = [line for line in render_table(summary).splitlines() if " ZZ-NMA    1 " in line]
    assert [line.split()[1] for line in lines[:3]] == ["warning", "caution", "advisory"]


def test_peak_and_limit_get_digits_until_they_differ(summary: dict[str, Any]) -> None:
    line = next(line for line in render_table(summary).splitlines() if "near limit: " in line)
    assert "5.9996" in line
    assert "6.0000" in line


def test_events_below_the_floor_are_counted(summary: dict[str, Any]) -> None:
    text = render_table(summary, certainty_floor="established")
    assert (
        "4 events of lower certainty not shown: 1 caution (likely), 2 caution (possible), 1 advisory (likely)" in text
    )
    assert "1 doubtful event (the true value was probably inside the limit): Flaps-extended speed 1" in text


def test_a_clean_day_says_what_was_checked_and_what_could_not_be() -> None:
    text = render_table(summarise(examples.clean_day()))
    assert text.startswith("No event in what could be assessed: 2 rules on 1 flight, 1 h 55 min.")
    assert "ZZ-NMC: does not apply: Never-exceed speed: the category gives no such limit" in text
    assert "1.62 g" in text


def test_no_log_or_only_failed_ones_never_read_as_clean() -> None:
    assert render_table(summarise(examples.empty_day())).startswith("No log was found, so nothing was assessed.")
    only = DayOutcome((examples.failed(),), "")
    assert render_table(summarise(only)).startswith("No log could be read, so nothing was assessed.")
    log = examples.touring()
    unseen = replace(
        log.findings, coverage=tuple(replace(c, assessed=0.0, unassessed=7199.0) for c in log.findings.coverage)
    )
    text = render_table(summarise(DayOutcome((replace(log, findings=unseen),), "")))
    assert text.startswith("No rule could be assessed, so nothing can be said about limits.")


@pytest.mark.parametrize("width", [None, 60, 160])
def test_nothing_is_silent(summary: dict[str, Any], width: int | None) -> None:
    text = " ".join(render_table(summary, width=width).split())
    for said in (
        "not read: no column looks like time",
        "do: name it",
        "1 file skipped (not a log: no table in it): notes.txt",
        "no registration: other/log",
        "no limits known for this aeroplane",
        "Flaps-extended speed: no flap channel",
        "53.6 s of 1 h 26 min not assessed (gap)" if width is None else "1 h 26 min recorded 53.6 s not assessed (gap)",
        "does not apply: Maximum operating Mach number",
        "1 sample rejected (spike)",
        "1920 samples rejected (stuck)",
        "within sensor error of the limit for 4.00 s",
        "column SPD not understood: kt or km/h cannot be told",
        "2 columns not used: SPARE 1",
        "1 gap, 53.6 s together",
        "read in part: ",
        "nothing tells flights apart",
        "landing not recorded",
        "mass between 640 and 960 kg",
        "3 inspections due",
        "limits assumed",
    ):
        assert said in text, said
    for caution in summary["cautions"]:
        assert text.count(caution) == 1


def test_the_order_of_the_sections_is_fixed(summary: dict[str, Any]) -> None:
    text = render_table(summary, width=80)
    heads = [
        "Events",
        "Undecided:",
        "Flights and their extremes",
        "Not assessed",
        "Data quality",
        "Inspections",
        "4 logs",
    ]
    places = [text.index(("\n" if place else "") + head) for place, head in enumerate(heads)]
    assert places == sorted(places)


def test_metric_units_change_speeds_and_heights_and_nothing_else(summary: dict[str, Any]) -> None:
    text = render_table(summary, units="metric")
    line = next(line for line in text.splitlines() if "Never-exceed speed " in line and "caution" in line)
    assert "324.7" in line  # 175.3 kt of exactly 1.852 km/h
    assert "324.1 km/h" in " ".join(line.split())
    assert " kt" not in text.replace("kt or km/h cannot be told", "")
    assert "1387 m" in text  # 4550 ft of exactly 0.3048 m
    assert "6.24" in text


def test_on_a_terminal_what_an_aircraft_file_does_not_have_is_one_row() -> None:
    log = examples.touring()
    names = [f"limits.number_{number}" for number in range(20)]
    coverage = tuple(
        Coverage(name, None, 0.0, 0.0, 7199.0, None, ((f"the aircraft file has no {name}", 7199.0),)) for name in names
    )
    made = summarise(DayOutcome((replace(log, findings=replace(log.findings, coverage=coverage)),), ""))
    wide = [line for line in render_table(made, width=200).splitlines() if "does not apply" in line]
    assert len(wide) == 1
    text = " ".join(render_table(made, width=200).split())
    assert "20 rules" in text
    assert "the aircraft file has no limits.number_0, limits.number_1," in text
    assert "and 12 more" in text
    piped = [line for line in render_table(made).splitlines() if "does not apply" in line]
    assert len(piped) == 20


def test_where_the_levels_are_not_equally_sure_each_is_said() -> None:
    """The line's certainty is that of the highest level, so `likely` beside a limit surely passed would mislead."""
    day = summarise(examples.day())
    event = next(row for recording in day["recordings"] for row in recording["events"] if row["severity"] == "warning")
    assert "level by level" not in render_table(day)
    event.update(certainty="likely", probability=0.6572)
    event["levels"] = [
        {"severity": "caution", "limit": 6.0, "start_s": 1.0, "end_s": 2.0, "beyond_s": 1.0, "probability": 1.0},
        {"severity": "warning", "limit": 6.6, "start_s": 1.4, "end_s": 1.6, "beyond_s": 0.2, "probability": 0.6572},
    ]
    said = "caution from 6.00 g established (> 99.9 %), warning from 6.60 g likely (65.7 %)"
    for width in (None, 80, 160):
        assert said in " ".join(render_table(day, width=width).split())


def test_an_inspection_says_before_what(summary: dict[str, Any]) -> None:
    assert summary["inspections"][0]["before"] == "next flight"
    line = next(line for line in render_table(summary).splitlines() if line.startswith("  due: ZZ-NMA"))
    assert "before next flight: Over-g inspection" in line


def test_eighty_columns_have_room_for_how_long() -> None:
    """By how much, how long and how surely: on a common terminal all three stand in the line."""
    summary = summarise(examples.day())
    for recording in summary["recordings"]:
        recording["events"] = [row for row in recording["events"] if row["rule"] == "never-exceed"]
    head = next(line for line in render_table(summary, width=80).splitlines() if "severity" in line)
    assert all(word in head for word in ("certainty", "peak", "95 %", "limit", "for"))
