"""Properties of the whole program: what must not change the verdict does not, and what is counted adds up.

One small flight, sampled without noise, is written in many ways. Events are compared by rule, severity, times and peak;
where an equal log is written (other order, other names, other container) they must be equal to the last digit.
"""

from __future__ import annotations

import copy
import gzip
import json
import math
import os
import random
import subprocess
import sys
from collections.abc import Iterable, Mapping
from functools import lru_cache
from itertools import pairwise
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from scenario import manoeuvres as do
from scenario.air import Array
from scenario.airframes import LARKSPUR
from scenario.flight import fly

import exceed

FT, KT, DEG, G0 = 0.3048, 1852.0 / 3600.0, math.pi / 180.0, 9.80665
RATE = 8.0
FEW = settings(max_examples=6, deadline=None, derandomize=True, suppress_health_check=list(HealthCheck), database=None)


class Column(NamedTuple):
    """A column of a log: heading, and SI of one unit and of its zero. Cells carry six decimals, so no step shows."""

    heading: str
    factor: float
    zero: float = 0.0


TRADE = {
    "load_factor": Column("Normal acceleration [g]", 1.0),
    "indicated_airspeed": Column("Indicated airspeed [kt]", KT),
    "pressure_altitude": Column("Pressure altitude [ft]", FT),
    "bank_angle": Column("Bank [deg]", DEG),
    "pitch_angle": Column("Pitch [deg]", DEG),
    "heading": Column("Heading [deg]", DEG),
    "static_air_temperature": Column("Static air temperature [degC]", 1.0, 273.15),
}
METRIC = {
    "load_factor": Column("Normal acceleration [m/s2]", 1.0 / G0),
    "indicated_airspeed": Column("Indicated airspeed [km/h]", 1.0 / 3.6),
    "pressure_altitude": Column("Pressure altitude [m]", 1.0),
    "bank_angle": Column("Bank [rad]", 1.0),
    "pitch_angle": Column("Pitch [rad]", 1.0),
    "heading": Column("Heading [rad]", 1.0),
    "static_air_temperature": Column("Static air temperature [K]", 1.0),
}
# words of the trade, common practice, no source
SYNONYMS = {
    "load_factor": ["NZ", "Normal load factor", "VERTICAL ACCELERATION"],
    "indicated_airspeed": ["IAS", "Airspeed indicated", "KIAS"],
    "pressure_altitude": ["PALT", "Pressure alt", "Altitude pressure"],
    "bank_angle": ["Roll", "ROLL ANGLE", "Angle of bank"],
    "pitch_angle": ["PITCH ATTITUDE", "Pitch angle"],
    "heading": ["HDG", "Magnetic heading"],
    "static_air_temperature": ["SAT", "OAT", "Outside air temperature"],
}

AIRCRAFT = """\
format: exceed-aircraft/1
registration: ZZ-PRP
type: Property
category: aerobatic
flaps: none
gear: fixed
mass: {empty: 640 kg, maximum_take_off: 960 kg}
stall_speed:
  - {flaps: 0 deg, mass: 960 kg, upright: 55 KCAS, inverted: 66 KCAS}
load_factor:
  - {flaps: 0 deg, maximum: 6 g, minimum: -3 g}
speeds:
  normal_operating: 140 KIAS
  never_exceed: {over: pressure_altitude, points: [[0 ft, 159 KIAS], [15000 ft, 150 KIAS]]}
position_error:
  - {flaps: 0 deg, points: [[50 KIAS, 54 KCAS], [100 KIAS, 101 KCAS], [180 KIAS, 180 KCAS]]}
recorder:
  accuracy: {load_factor: 0.05 g, indicated_airspeed: 2 kt}
source: "Invented for these tests"
"""
# every kind of rule that keeps time, all judged by sample so that a straight line between samples adds nothing
RULES = """\
format: exceed-rules/1
title: Properties
rules:
  - {id: pull, title: Pull, quantity: load_factor, limit: 3 g, above: {caution: 100 %, warning: 150 %}, joining: 1 s, release: 0.1 g, judge_on: sample, source: test}
  - {id: push, title: Push, quantity: load_factor, limit: 0.5 g, below: {advisory: 100 %}, when: [{phase: [airborne]}], judge_on: sample, source: test}
  - {id: steep, title: Steep, quantity: bank_angle, limit: 60 deg, above: {advisory: 100 %}, lasting: 2 s, judge_on: sample, source: test}
  - {id: fast, title: Fast, quantity: indicated_airspeed, limit: 120 kt, above: {advisory: 100 %, caution: {beyond_by: 20 kt}}, joining: 2 s, judge_on: sample, source: test}
  - {id: long, title: Long, quantity: indicated_airspeed, limit: 110 kt, above: {advisory: 100 %}, total: {above: 20 s, within: flight}, judge_on: sample, source: test}
  - {id: often, title: Often, quantity: load_factor, limit: 1.8 g, above: {advisory: 100 %}, count: {at_least: 2, within: flight}, judge_on: sample, source: test}
  - {id: high, title: High, quantity: pressure_altitude, limit: 1500 ft, above: {advisory: 100 %}, judge_on: sample, source: test}
"""  # noqa: E501


@lru_cache(maxsize=1)
def flown() -> dict[str, Array]:
    """Channels in SI at 8 Hz: take-off, a dive beyond V_NE, a pull beyond 6 g, a steep turn, a push; ends in flight."""
    flight = fly(LARKSPUR, [
        do.standing(12), do.taxi(25), do.take_off(), do.climb(1400, 85, 1400), do.level(12, 130, 1500),
        do.dive(20, 158, 0.9), do.pull(6.3, 0.9, 0.0, 0.9), do.recover(1600, 100, 25),
        do.steep_turn(68, 12, None, 1600, 125), do.recover(1600, 115, 18), do.pull(-0.4, 0.9, 0.3, 0.9),
        do.recover(1600, 110, 15),
    ], mass=860.0, fuel=50.0)  # fmt: skip
    time = np.arange(0.0, float(flight.time[-1]), 1.0 / RATE)
    truth = {name: np.unwrap(flight[name]) if name == "heading" else flight[name] for name in TRADE}
    return {"time": time, **{name: np.interp(time, flight.time, values) for name, values in truth.items()}}


def cells(columns: Mapping[str, Column], channels: Mapping[str, Array]) -> dict[str, list[str]]:
    """Heading -> cells; NaN is an empty cell."""
    table = {"Time [s]": [f"{value:.6f}" for value in channels["time"].tolist()]}
    for name, column in columns.items():
        shown = (channels[name] - column.zero) / column.factor
        table[column.heading] = ["" if value != value else f"{value:.6f}" for value in shown.tolist()]
    return table


def text(table: Mapping[str, list[str]]) -> str:
    rows = zip(*table.values(), strict=True)
    return "\n".join([",".join(table), *(",".join(row) for row in rows)]) + "\n"


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    made = tmp_path_factory.mktemp("properties")
    (made / "aircraft.yaml").write_text(AIRCRAFT, encoding="utf-8")
    (made / "rules.yaml").write_text(RULES, encoding="utf-8")
    (made / "log.csv").write_text(text(cells(TRADE, flown())), encoding="utf-8")
    return made


def scan(
    folder: Path, *logs: str, rules: Iterable[str] = ("airframe", "rules.yaml"), jobs: int = 1, **more: Any
) -> dict[str, Any]:
    named = [folder / rule if rule.endswith(".yaml") else rule for rule in rules]
    paths = [folder / log for log in logs]
    summary = exceed.scan(paths, aircraft=folder / "aircraft.yaml", rules=named, mass="860 kg", jobs=jobs,
                          **more).summary  # fmt: skip
    for one in summary["recordings"]:
        assert one["status"] == "ok", one["problem"]
        assert_adds_up(one)
        for event in (*one["events"], *one["undecided"]):
            assert_sound(event, one["recorded_s"])
    return summary


def scan_table(folder: Path, table: Mapping[str, list[str]], **more: Any) -> dict[str, Any]:
    (folder / "changed.csv").write_text(text(table), encoding="utf-8")
    return scan(folder, "changed.csv", **more)


def assert_adds_up(recording: Mapping[str, Any]) -> None:
    """assessed + unassessed + not applicable = recorded_s for each rule, and over each flight."""
    whole = [row for row in recording["assessment"] if row["flight"] is None]
    assert whole
    for row in whole:
        parts = row["assessed_s"] + row["unassessed_s"] + row["not_applicable_s"]
        assert parts == pytest.approx(recording["recorded_s"], abs=0.02), row
        assert min(row["assessed_s"], row["unassessed_s"], row["not_applicable_s"]) >= 0.0
    for row in recording["assessment"]:
        explained = sum(reason["seconds"] for reason in row["reasons"])
        assert explained == pytest.approx(row["unassessed_s"] + row["not_applicable_s"], abs=0.02), row


def assert_sound(event: Mapping[str, Any], recorded_s: float) -> None:
    """What is true of every event: order in time, in its interval, and from level to level."""
    assert 0.0 <= event["start_s"] <= event["end_s"] <= recorded_s + 0.001
    assert event["duration_s"] == pytest.approx(event["end_s"] - event["start_s"], abs=0.02)
    peak, levels = event["peak"], event["levels"]
    assert event["start_s"] - 0.5 <= peak["time_s"] <= event["end_s"] + 0.5
    ends = [peak["low"], peak["estimate"], peak["high"]]
    known = [end for end in ends if end is not None]
    assert known == sorted(known)
    certain = [level["probability"] for level in levels]
    assert certain == sorted(certain, reverse=True)
    beyond = [level["beyond_s"] for level in levels]
    assert beyond == sorted(beyond, reverse=True)
    assert max(beyond) <= event["end_s"] - event["start_s"] + 0.01
    words = {"established": 0.95, "likely": 0.5, "possible": 0.05, "doubtful": 0.0}
    assert event["probability"] >= words[event["certainty"]] - 1e-9
    crossed = [level["severity"] for level in levels if level["beyond_s"] > 0.0]
    if crossed:
        assert event["severity"] in crossed


def judged(summary: Mapping[str, Any], recording: int = 0) -> list[dict[str, Any]]:
    """Events and undecided stretches, less what may differ between equal logs: id, cell as written, rules' path."""
    out = []
    for kind in ("events", "undecided"):
        for event in summary["recordings"][recording][kind]:
            one = copy.deepcopy(event)
            one.pop("id"), one.pop("set")
            for word in ("recorded", "recorded_unit"):
                one["peak"].pop(word)
            out.append({"kind": kind, **one})
    return sorted(out, key=lambda one: (one["rule"], one["start_s"], one["kind"]))


def assert_near(
    found: list[dict[str, Any]], expected: list[dict[str, Any]], *, time: float = 0.01, peak: float = 0.01,
    bounds: float | None = None, shift: float = 0.0,
) -> None:  # fmt: skip
    """Same rules, severities, certainties; times within `time` s after `shift`, peaks within `peak` of their unit, the
    interval's ends within `bounds`."""

    def words(events: list[dict[str, Any]]) -> list[tuple[str, ...]]:
        return [(one["kind"], one["rule"], one["severity"], one["certainty"]) for one in events]

    assert words(found) == words(expected)
    for one, other in zip(found, expected, strict=True):
        for edge in ("start_s", "end_s"):
            assert one[edge] - shift == pytest.approx(other[edge], abs=time), one["rule"]
        ends = peak if bounds is None else bounds
        for figure, slack in (("value", peak), ("estimate", peak), ("low", ends), ("high", ends)):
            assert one["peak"][figure] == pytest.approx(other["peak"][figure], abs=slack), (one["rule"], figure)


@pytest.fixture(scope="module")
def base(folder: Path) -> dict[str, Any]:
    return scan(folder, "log.csv")


def test_the_log_has_something_of_every_kind(base: dict[str, Any]) -> None:
    """Else that nothing changes would mean nothing."""
    found = {one["rule"] for one in base["recordings"][0]["events"]}
    built_in = {"load-factor-high", "never-exceed", "normal-operating"}
    assert found == {*built_in, "pull", "push", "steep", "fast", "long", "often", "high"}
    (recording,) = base["recordings"]
    assert len(recording["flights"]) == 1
    (cut,) = (one for one in recording["events"] if one["rule"] == "high" and one["cut_by"])
    assert cut["cut_by"] == "recording_end"


# --- writing the same log in another way ---------------------------------------------------------------------------


@FEW
@given(order=st.permutations(range(len(TRADE) + 1)))
def test_the_order_of_columns_changes_nothing(folder: Path, base: dict[str, Any], order: list[int]) -> None:
    table = cells(TRADE, flown())
    names = list(table)
    found = scan_table(folder, {names[place]: table[names[place]] for place in order})
    assert judged(found) == judged(base)


@FEW
@given(words=st.fixed_dictionaries({name: st.sampled_from(SYNONYMS[name]) for name in TRADE}))
def test_another_name_of_the_trade_changes_nothing(folder: Path, base: dict[str, Any], words: dict[str, str]) -> None:
    renamed = {
        name: column._replace(heading=f"{words[name]} [{column.heading.split('[')[1]}")
        for name, column in TRADE.items()
    }
    assert judged(scan_table(folder, cells(renamed, flown()))) == judged(base)


@FEW
@given(metric=st.sets(st.sampled_from(list(TRADE)), min_size=1))
def test_another_unit_changes_nothing(folder: Path, base: dict[str, Any], metric: set[str]) -> None:
    columns = {name: METRIC[name] if name in metric else TRADE[name] for name in TRADE}
    # six decimals of each unit differ in the seventh digit, which shows in the last printed one
    assert_near(judged(scan_table(folder, cells(columns, flown()))), judged(base), time=0.002, peak=0.002)


@pytest.mark.parametrize("unit", ["g", "m/s2"])
@pytest.mark.parametrize("down", [False, True], ids=["up", "down"])
@pytest.mark.parametrize("increment", [False, True], ids=["total", "increment"])
def test_sign_datum_and_unit_of_the_accelerometer_change_nothing(
    folder: Path, base: dict[str, Any], unit: str, down: bool, increment: bool
) -> None:
    """Standing and steady flight tell the datum, and with a total the sign; of an increment nothing tells the sign."""
    table = cells(TRADE, flown())
    written = (flown()["load_factor"] - increment) * (-1.0 if down else 1.0) * (G0 if unit == "m/s2" else 1.0)
    table = {name: column for name, column in table.items() if name != TRADE["load_factor"].heading}
    table[f"Normal acceleration [{unit}]"] = [f"{value:.6f}" for value in written.tolist()]
    channels: dict[str, Any] = {}
    if increment and down:
        (folder / "channels.yaml").write_text(
            "format: exceed-channels/1\nchannels:\n"
            f'  - {{column: "Normal acceleration [{unit}]", quantity: load_factor, positive: down, '
            "datum: increment}\n",
            encoding="utf-8",
        )
        channels = {"channels": folder / "channels.yaml"}
    found = scan_table(folder, table, **channels)
    assert_near(judged(found), judged(base), time=0.01, peak=0.01)


def test_a_mirrored_flight_has_the_same_events(folder: Path, base: dict[str, Any]) -> None:
    left = {**flown(), "bank_angle": -flown()["bank_angle"], "heading": -flown()["heading"] % (2.0 * math.pi)}
    # what has a left and a right is judged by its size
    assert_near(judged(scan_table(folder, cells(TRADE, left))), judged(base))


def test_an_unrelated_column_changes_nothing(folder: Path, base: dict[str, Any]) -> None:
    rng = random.Random(7)
    table = cells(TRADE, flown())
    count = len(table["Time [s]"])
    more = {"Cabin mood": [str(rng.randrange(9)) for _ in range(count)], **table, "Note": ["x"] * count}
    found = scan_table(folder, more)
    assert judged(found) == judged(base)
    (recording,) = found["recordings"]
    said = {*recording["unused_columns"], *(one["column"] for one in recording["unresolved_columns"])}
    assert {"Cabin mood", "Note"} <= said


@FEW
@given(shift=st.sampled_from([0.5, 86_400.0, 1e6]) | st.integers(1, 100_000).map(float))
def test_a_shifted_elapsed_clock_changes_nothing(folder: Path, base: dict[str, Any], shift: float) -> None:
    """Times count from the first sample. The last digit of a shifted stamp may be another."""
    later = {**flown(), "time": flown()["time"] + shift}
    assert_near(judged(scan_table(folder, cells(TRADE, later))), judged(base), time=0.002, peak=0.002)


def test_a_shifted_date_shifts_the_times_alike(folder: Path, base: dict[str, Any]) -> None:
    table = cells(TRADE, flown())
    found = []
    for day in (2, 9):
        start = pd.Timestamp(f"2031-05-0{day}T09:00:00Z")
        instants = [start + pd.Timedelta(seconds=seconds) for seconds in flown()["time"].tolist()]
        stamps = [instant.strftime("%Y-%m-%dT%H:%M:%S.%fZ") for instant in instants]
        rest = {name: column for name, column in table.items() if name != "Time [s]"}
        found.append(judged(scan_table(folder, {"UTC": stamps, **rest})))
    for one, other in zip(*found, strict=True):
        for edge in ("start", "end"):
            assert pd.Timestamp(other[edge]) - pd.Timestamp(one[edge]) == pd.Timedelta(days=7)
            one[edge] = other[edge] = None
        assert one == other
    assert found[0] == judged(base)


def test_parquet_is_as_good_as_csv(folder: Path, base: dict[str, Any]) -> None:
    table = cells(TRADE, flown())
    frame = pd.DataFrame({name: pd.to_numeric(pd.Series(column)) for name, column in table.items()})
    frame.to_parquet(folder / "log.parquet")
    assert_near(judged(scan(folder, "log.parquet")), judged(base), time=0.001, peak=0.001)


def test_a_packed_log_is_the_same_log(folder: Path, base: dict[str, Any]) -> None:
    (folder / "log.csv.gz").write_bytes(gzip.compress((folder / "log.csv").read_bytes(), mtime=0))
    found = scan(folder, "log.csv.gz")
    assert found["recordings"][0]["events"] == base["recordings"][0]["events"]  # ids, too
    for word in ("content_sha256", "assessment", "flights", "channels"):
        assert found["recordings"][0][word] == base["recordings"][0][word]
    assert found["recordings"][0]["sha256"] != base["recordings"][0]["sha256"]


# --- the same judging in another way ------------------------------------------------------------------------------


def test_the_order_of_rule_files_changes_nothing(folder: Path, base: dict[str, Any]) -> None:
    lines = RULES.splitlines()
    reordered = "\n".join([*lines[:3], *reversed(lines[3:])]) + "\n"
    (folder / "reordered.yaml").write_text(reordered, encoding="utf-8")
    for rules in (("rules.yaml", "airframe"), ("airframe", "reordered.yaml"), ("reordered.yaml", "airframe")):
        found = scan(folder, "log.csv", rules=rules)
        assert judged(found) == judged(base)
        (one,), (other,) = found["recordings"], base["recordings"]
        key = [sorted(part["assessment"], key=lambda row: (row["rule"], row["flight"] or 0)) for part in (one, other)]
        assert key[0] == key[1]


def test_two_processes_say_what_one_says(folder: Path) -> None:
    names = [f"copy-{number}.csv" for number in range(3)]
    for name in names:
        (folder / name).write_bytes((folder / "log.csv").read_bytes())
    one, two = (scan(folder, *names, jobs=jobs) for jobs in (1, 2))
    one.pop("created"), two.pop("created")
    assert json.dumps(one) == json.dumps(two)


def run(folder: Path, *options: str, seed: str) -> str:
    command = [sys.executable, "-m", "exceed", "scan", "log.csv", "--aircraft", "aircraft.yaml", "--mass", "860 kg",
               "--rules", "airframe", "--rules", "rules.yaml", *options]  # fmt: skip
    seeded = {**os.environ, "PYTHONHASHSEED": seed}
    done = subprocess.run(command, cwd=folder, env=seeded, capture_output=True, text=True, timeout=120, check=False)
    assert done.returncode == 0, done.stderr
    return done.stdout


def test_two_runs_write_the_same_bytes_and_what_is_read_back_is_what_was_said(folder: Path) -> None:
    printed = [run(folder, "--json", "-", seed=seed) for seed in ("1", "2")]
    lines = [[line for line in text.splitlines() if '"created"' not in line] for text in printed]
    if len(lines[0]) > 10:
        assert lines[0] == lines[1]
    read = [json.loads(text, parse_constant=lambda word: pytest.fail(f"{word} in JSON")) for text in printed]
    for one in read:
        one.pop("created")
    assert json.dumps(read[0]) == json.dumps(read[1])
    # the same through the Python API, from the same place
    before = Path.cwd()
    try:
        os.chdir(folder)
        summary = exceed.scan("log.csv", aircraft="aircraft.yaml", rules=["airframe", "rules.yaml"],
                              mass="860 kg").summary  # fmt: skip
    finally:
        os.chdir(before)
    summary.pop("created")
    assert read[0] == summary


# --- more samples, fewer samples, parts ---------------------------------------------------------------------------


def test_samples_on_the_straight_line_between_two_change_nothing(folder: Path, base: dict[str, Any]) -> None:
    """Rules judged by sample: crossings are linear, so that a sample on the line moves none."""
    channels = flown()
    time = np.sort(np.concatenate([channels["time"], 0.5 * (channels["time"][1:] + channels["time"][:-1])]))
    finer = {"time": time, **{name: np.interp(time, channels["time"], channels[name]) for name in TRADE}}
    found = judged(scan_table(folder, cells(TRADE, finer), rules=["rules.yaml"]))
    built_in = ("load-factor-high", "never-exceed", "normal-operating")
    expected = [one for one in judged(base) if one["rule"] not in built_in]
    assert_near(found, expected, time=0.02, peak=0.02)


@pytest.mark.parametrize("cut", [102.0, 137.0])
def test_the_parts_of_a_log_have_the_events_of_the_whole(folder: Path, base: dict[str, Any], cut: float) -> None:
    """Cut where nothing is beyond a limit. What counts over a flight (`total`, `count`) differs in parts."""
    channels = flown()
    place = int(np.searchsorted(channels["time"], cut))
    for name, part in (("first.csv", slice(None, place)), ("second.csv", slice(place, None))):
        some = {quantity: values[part] for quantity, values in channels.items()}
        (folder / name).write_text(text(cells(TRADE, some)), encoding="utf-8")
    parts = scan(folder, "first.csv", "second.csv")
    assert [one["path"] for one in parts["recordings"]] == ["first.csv", "second.csv"]
    plain = [one for one in judged(base) if one["rule"] not in ("long", "often")]
    assert not any(one["start_s"] <= cut <= one["end_s"] for one in plain)
    for number, shift in ((0, 0.0), (1, -float(channels["time"][place]))):
        expected = [one for one in plain if (one["start_s"] < cut) == (number == 0)]
        found = [one for one in judged(parts, number) if one["rule"] not in ("long", "often")]
        # the datum of the accelerometer and its uncertainty are found anew in each part
        assert_near(found, expected, time=0.03, peak=0.02, bounds=0.06, shift=shift)


def test_an_event_across_the_cut_is_cut_in_both_parts(folder: Path) -> None:
    channels = flown()
    place = int(np.searchsorted(channels["time"], 115.3))
    for name, part in (("first.csv", slice(None, place)), ("second.csv", slice(place, None))):
        some = {quantity: values[part] for quantity, values in channels.items()}
        (folder / name).write_text(text(cells(TRADE, some)), encoding="utf-8")
    parts = scan(folder, "first.csv", "second.csv")
    for number, cut_by in ((0, "recording_end"), (1, "recording_start")):
        found = {one["rule"]: one for one in judged(parts, number) if one["kind"] == "events"}
        for rule in ("load-factor-high", "never-exceed", "pull"):
            assert found[rule]["cut_by"] == cut_by, rule


def limits_of(values: Iterable[float], side: str) -> str:
    rules = [
        f"  - {{id: r{number}, title: R, quantity: load_factor, limit: {value:.4f} g, {side}: {{advisory: 100 %}}, "
        f"joining: {joining} s, source: test}}"
        for number, (value, joining) in enumerate((value, joining) for joining in (0, 1) for value in values)
    ]
    return "\n".join(["format: exceed-rules/1", "title: Limits", "rules:", *rules]) + "\n"


@FEW
@given(values=st.lists(st.floats(1.25, 6.5), min_size=6, max_size=6, unique=True).map(sorted))
def test_loosening_an_upper_limit_never_lengthens_the_excess(folder: Path, values: list[float]) -> None:
    (folder / "limits.yaml").write_text(limits_of(values, "above"), encoding="utf-8")
    assert_never_longer(scan(folder, "log.csv", rules=["limits.yaml"]), len(values))


@FEW
@given(values=st.lists(st.floats(-0.5, 0.8), min_size=6, max_size=6, unique=True).map(sorted))
def test_loosening_a_lower_limit_never_lengthens_the_excess(folder: Path, values: list[float]) -> None:
    (folder / "limits.yaml").write_text(limits_of(values[::-1], "below"), encoding="utf-8")
    assert_never_longer(scan(folder, "log.csv", rules=["limits.yaml"]), len(values))


def assert_never_longer(summary: dict[str, Any], count: int) -> None:
    beyond: dict[str, float] = {}
    for event in summary["recordings"][0]["events"]:
        if event["limit_exceeded"]:
            seconds = sum(level["beyond_s"] for level in event["levels"])
            beyond[event["rule"]] = beyond.get(event["rule"], 0.0) + seconds
    for joined in (0, count):
        seconds = [beyond.get(f"r{joined + number}", 0.0) for number in range(count)]
        assert all(later <= earlier + 0.002 for earlier, later in pairwise(seconds)), seconds
    assert any(beyond.values())


HOLES = st.lists(st.tuples(st.integers(0, 1400), st.integers(1, 60)), min_size=1, max_size=6)


def assessed(summary: Mapping[str, Any]) -> dict[str, float]:
    return {row["rule"]: row["assessed_s"] for row in summary["recordings"][0]["assessment"] if row["flight"] is None}


@FEW
@given(holes=HOLES, name=st.sampled_from(["load_factor", "indicated_airspeed", "bank_angle", "pressure_altitude"]))
def test_emptied_cells_are_never_assessed(
    folder: Path, base: dict[str, Any], holes: list[tuple[int, int]], name: str
) -> None:
    """Not known stays not known: assessed seconds never grow, and a rule of the channel loses the hole."""
    values = flown()[name].copy()
    for first, length in holes:
        values[first : first + length] = np.nan
    found = assessed(scan_table(folder, cells(TRADE, {**flown(), name: values})))
    for rule, seconds in assessed(base).items():
        assert found[rule] <= seconds + 0.01, rule
    missing = np.isnan(values)
    missing[1:] &= missing[:-1]  # a hole of one sample is bridged by none, yet costs at most its own interval
    direct = {"load_factor": "pull", "indicated_airspeed": "fast", "bank_angle": "steep", "pressure_altitude": "high"}
    if int(missing.sum()) > 8:
        assert found[direct[name]] < assessed(base)[direct[name]]


@FEW
@given(holes=HOLES)
def test_rows_taken_out_are_never_assessed(folder: Path, base: dict[str, Any], holes: list[tuple[int, int]]) -> None:
    keep = np.ones(len(flown()["time"]), dtype=bool)
    keep[[0, -1]] = True
    for first, length in holes:
        keep[max(first, 1) : min(first + length, len(keep) - 1)] = False
    fewer = {name: values[keep] for name, values in flown().items()}
    summary = scan_table(folder, cells(TRADE, fewer))
    assert summary["recordings"][0]["recorded_s"] == base["recordings"][0]["recorded_s"]
    for rule, seconds in assessed(base).items():
        assert assessed(summary)[rule] <= seconds + 0.01, rule
    spacing = np.diff(fewer["time"])
    lost = float(np.sum(spacing[spacing > 0.5]))  # what is longer than half a second is a gap, and nobody's time
    assert assessed(summary)["pull"] <= assessed(base)["pull"] - 0.7 * lost + 0.01


def assert_not_lost(summary: dict[str, Any], base: dict[str, Any], names: set[str]) -> None:
    """What was beyond for a second and more is still found, or undecided, or lies in time that is not assessed."""
    left = {row["rule"]: row["unassessed_s"] for row in summary["recordings"][0]["assessment"] if row["flight"] is None}
    for event in judged(base):
        if event["rule"] not in names or event["duration_s"] < 1.0 or not event["limit_exceeded"]:
            continue
        still = [
            one for one in judged(summary) if one["rule"] == event["rule"]
            and one["start_s"] <= event["end_s"] and one["end_s"] >= event["start_s"]
        ]  # fmt: skip
        assert still or left[event["rule"]] > 0.5, event["rule"]


PLAIN = {"pull", "push", "steep", "fast", "high", "never-exceed", "normal-operating"}


@FEW
@given(first=st.integers(840, 1100), length=st.integers(1, 200), name=st.sampled_from(list(TRADE)[:4]))
def test_no_event_is_lost_in_a_hole_without_a_word(
    folder: Path, base: dict[str, Any], first: int, length: int, name: str
) -> None:
    """The hole lies somewhere about the events between 105 s and 138 s."""
    values = flown()[name].copy()
    values[first : first + length] = np.nan
    assert_not_lost(scan_table(folder, cells(TRADE, {**flown(), name: values})), base, PLAIN)


@pytest.mark.parametrize("every", [2, 4, 8, 16, 40])
def test_no_event_is_lost_in_a_slow_log_without_a_word(folder: Path, base: dict[str, Any], every: int) -> None:
    fewer = {name: values[::every] for name, values in flown().items()}
    names = PLAIN if every <= 8 else {"never-exceed", "normal-operating"}  # which have a must_see
    assert_not_lost(scan_table(folder, cells(TRADE, fewer)), base, names)


@pytest.mark.parametrize("every", [2, 4, 8, 16])
def test_a_slower_channel_assesses_no_more_and_says_what_it_can_hide(
    folder: Path, base: dict[str, Any], every: int
) -> None:
    values = np.where(np.arange(len(flown()["time"])) % every == 0, flown()["load_factor"], np.nan)
    summary = scan_table(folder, cells(TRADE, {**flown(), "load_factor": values}))
    found = assessed(summary)
    for rule, seconds in assessed(base).items():
        assert found[rule] <= seconds + 0.01, rule
    (row,) = (
        row for row in summary["recordings"][0]["assessment"]
        if row["rule"] == "load-factor-high" and row["flight"] is None
    )  # fmt: skip
    assert row["shortest_seen_s"] == pytest.approx(4.0 * every / RATE, rel=0.1)
    # its must_see is 0.5 s: slower than twice that a second, nothing in the air is assessed
    if every >= 8:
        assert found["load-factor-high"] < 60.0


def test_every_event_of_the_sample_day_is_sound_and_all_time_is_accounted_for() -> None:
    every = ["airframe", "aerobatic", "handling", "landing", "gust", "engine"]
    summary = exceed.scan(Path(__file__).parents[1] / "sample_logs", rules=every).summary
    assert sum(len(one["events"]) for one in summary["recordings"]) > 15
    for one in summary["recordings"]:
        assert one["status"] == "ok", one["problem"]
        assert_adds_up(one)
        for event in (*one["events"], *one["undecided"]):
            assert_sound(event, one["recorded_s"])
