"""`exceed spectrum` as a whole, on logs written here: a known load history has known counts.

Witnesses: the worked example of ASTM E1049-85(2017) (counts as in exceed/reference/counting.csv), the library
`rainflow`, and a loop that anyone can check.
"""

from __future__ import annotations

import datetime
import itertools
import json
from collections import Counter
from pathlib import Path

import numpy as np
import pytest
import rainflow
from hypothesis import given, settings
from hypothesis import strategies as st
from typer.testing import CliRunner

from exceed.cli.app import app
from exceed.physics import counting
from exceed.report.spectrum import spectrum_summary
from exceed.settings import Settings
from exceed.spectra import spectrum
from exceed.tallies import LEVELS, Counts, count_stretch

RATE = 16
# the example of the standard, half as large and about 1 g: every turn a multiple of a quarter
E1049 = [1.0 + 0.5 * turn for turn in (-2, 1, -3, 5, -1, 3, -4, 4, -2)]
SAMPLES = Path(__file__).parent.parent / "sample_logs"


def flown(turns: list[float], samples: int = 10) -> list[float]:
    """A smooth history through these turns."""
    made = [turns[0]]
    for low, high in itertools.pairwise(turns):
        made += [low + (high - low) * (1.0 - np.cos(np.pi * i / samples)) / 2.0 for i in range(1, samples + 1)]
    return made


def write_log(path: Path, values: list[float], *, start: float = 0.0, without: range = range(0)) -> Path:
    """A bare accelerometer log with UTC stamps from 9:00 plus `start` s; rows of `without` are left out."""
    zero = datetime.datetime(2031, 5, 2, 9, tzinfo=datetime.UTC) + datetime.timedelta(seconds=start)
    rows = ["UTC,Normal load factor (g)"]
    for place, value in enumerate(values):
        if place not in without:
            stamp = (zero + datetime.timedelta(seconds=place / RATE)).strftime("%Y-%m-%dT%H:%M:%S.%fZ")
            rows.append(f"{stamp},{value:.6f}")
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text("\n".join(rows) + "\n", "utf-8")
    return path


def counted(*paths: Path, **options: str) -> dict:
    return spectrum_summary(spectrum(Settings(tuple(map(str, paths)), **options)))


def by_range(cycles: dict) -> dict[float, float]:
    return {row["range_from_g"]: row["cycles"] for row in cycles["by_range"]}


def levels(part: dict, key: str = "crossings") -> dict[float, int]:
    return {row["level_g"]: row[key] for row in part["levels"]}


def witnessed(values: list[float]) -> tuple[Counter[tuple[float, float]], Counter[tuple[float, float]]]:
    """Whole and half cycles by bins of range and mean, from the library."""
    whole: Counter[tuple[float, float]] = Counter()
    half: Counter[tuple[float, float]] = Counter()
    for size, mean, count, *_ in rainflow.extract_cycles(values):
        cell = (np.floor(size / 0.25 + 1e-9) * 0.25, np.floor(mean / 0.25 + 1e-9) * 0.25)
        (whole if count == 1.0 else half)[cell] += 1
    return whole, half


def cells(cycles: dict) -> tuple[Counter[tuple[float, float]], Counter[tuple[float, float]]]:
    found = [
        Counter(
            {(row["range_from_g"], row["mean_from_g"]): row[key] for row in cycles["by_range_and_mean"] if row[key]}
        )
        for key in ("whole", "half")
    ]
    return found[0], found[1]


def test_the_standards_example_flown_as_a_log_gives_its_printed_cycles(tmp_path: Path) -> None:
    found = counted(write_log(tmp_path / "a.csv", flown(E1049)))
    row = found["spectra"][0]
    # ASTM E1049-85 figure 6: ranges 3, 4, 6, 8, 9 count 0.5, 1.5, 0.5, 1.0, 0.5; here half as large
    assert by_range(row["cycles"]) == {1.5: 0.5, 2.0: 1.5, 3.0: 0.5, 4.0: 1.0, 4.5: 0.5}
    assert (row["cycles"]["whole"], row["cycles"]["half"]) == (1, 6)
    assert (row["stretches"], row["samples"], row["counted_s"], row["rates_hz"]) == (1, 81, 5.0, [16.0])
    assert levels(row)[3.0] == 2  # 1 to 3.5 and -1 to 3
    assert levels(row)[-0.5] == 2
    # peaks of the example at 1, 5, 3, 4: here 1.5, 3.5, 2.5, 3; valleys at -0.5, 0.5, -1
    assert levels(row, "peaks") == {
        level: sum(p >= level for p in (1.5, 3.5, 2.5, 3.0))
        if level >= 1.0
        else sum(v <= level for v in (-0.5, 0.5, -1.0))
        for level in np.arange(-1.0, 3.51, 0.25).tolist()
    }
    assert row["levels"][0]["crossings_per_h"] == pytest.approx(720.0)
    assert row["levels"][0]["crossings_per_1000_h"] == pytest.approx(720_000.0)


def test_a_long_random_history_gives_what_the_library_gives_and_a_loop_counts(tmp_path: Path) -> None:
    chance = np.random.default_rng(41)
    turns = (1.0 + 0.25 * chance.integers(-8, 20, 300)).tolist()
    values = [round(value, 6) for value in flown(turns, 6)]
    row = counted(write_log(tmp_path / "a.csv", values))["spectra"][0]
    assert cells(row["cycles"]) == witnessed(values)
    for level, many in levels(row).items():
        pairs = itertools.pairwise(values)
        assert many == sum((a < level <= b) if level >= 1.0 else (a > level >= b) for a, b in pairs)
    assert min(levels(row)) == min(turns)
    assert max(levels(row)) == max(turns)


def test_a_gap_parts_the_history(tmp_path: Path) -> None:
    values = flown(E1049)
    lost = range(25, 46)  # the largest peak among them
    row = counted(write_log(tmp_path / "a.csv", values, without=lost))["spectra"][0]
    assert row["stretches"] == 2
    parts = [witnessed(values[: lost.start]), witnessed(values[lost.stop :])]
    assert cells(row["cycles"]) == (parts[0][0] + parts[1][0], parts[0][1] + parts[1][1])
    joined = witnessed(values[: lost.start] + values[lost.stop :])
    assert cells(row["cycles"]) != joined
    log = counted(tmp_path / "a.csv")["recordings"][0]
    assert log["not_counted"] == [{"reason": "gap", "seconds": pytest.approx(22 / RATE)}]
    assert log["airborne_s"] == pytest.approx(log["counted_s"] + 22 / RATE)


def test_a_rejected_sample_parts_the_history_and_is_no_peak(tmp_path: Path) -> None:
    values = flown([1.0, 1.5, 0.5] * 8)
    values[100] = 55.0  # no accelerometer of an aeroplane reads that
    found = counted(write_log(tmp_path / "a.csv", values))
    row = found["spectra"][0]
    assert row["stretches"] == 2
    assert row["samples"] == len(values) - 1
    assert row["highest_g"] == 1.5
    assert found["recordings"][0]["not_counted"] == [{"reason": "rejected, or no value", "seconds": 2 / RATE}]


def test_the_same_content_and_an_overlapping_download_count_once(tmp_path: Path) -> None:
    values = flown(E1049 * 3)
    half = len(values) // 2
    one = counted(write_log(tmp_path / "one" / "a.csv", values), registration="ZZ-NMA")
    write_log(tmp_path / "two" / "a.csv", values[:half])
    write_log(tmp_path / "two" / "b.csv", values[:half])
    write_log(tmp_path / "two" / "c.csv", values)
    two = counted(tmp_path / "two", registration="ZZ-NMA")
    assert [log["status"] for log in two["recordings"]] == ["counted", "not counted", "counted"]
    assert "the same content as a.csv" in two["recordings"][1]["notes"][-1]
    again = two["recordings"][2]["not_counted"][0]
    assert (again["reason"], again["seconds"]) == ("counted in an earlier log", pytest.approx(half / RATE, abs=0.2))
    seconds = [found["spectra"][0]["counted_s"] for found in (one, two)]
    assert seconds[1] == pytest.approx(seconds[0], abs=2.1 / RATE)
    # without a registration nobody knows that it is the same aeroplane
    three = counted(tmp_path / "two")
    assert [log["status"] for log in three["recordings"]] == ["counted", "not counted", "counted"]
    assert three["spectra"][0]["counted_s"] > 1.4 * seconds[0]


def test_load_times_mass_is_counted_where_the_mass_is_known(tmp_path: Path) -> None:
    log = write_log(tmp_path / "a.csv", flown(E1049))
    (tmp_path / "larkspur.yaml").write_text(
        "format: exceed-aircraft/1\nregistration: ZZ-NMA\nmass: {empty: 640 kg, maximum_take_off: 960 kg}\n", "utf-8"
    )
    aircraft = {"aircraft": str(tmp_path / "larkspur.yaml")}
    row = counted(log, mass="720 kg", **aircraft)["spectra"][0]
    weighted = row["mass_weighted"]
    assert weighted["reference_mass"] == {"value": 960.0, "unit": "kg"}
    assert (weighted["lowest_g"], weighted["highest_g"]) == (-0.75, 2.625)  # three quarters of -1 and 3.5
    scaled = witnessed([0.75 * value for value in flown(E1049)])
    assert cells(weighted["cycles"]) == scaled
    unknown = counted(log, **aircraft)["spectra"][0]
    assert unknown["mass_weighted"] is None
    assert unknown["mass_weighted_note"] == "mass known only as a range (1 log)"


def test_a_failed_log_is_said_and_the_others_are_done(tmp_path: Path) -> None:
    write_log(tmp_path / "day" / "a.csv", flown(E1049))
    (tmp_path / "day" / "b.csv").write_text("time (s),Indicated airspeed (kt)\n0,60\n1,61\n2,62\n3,60\n", "utf-8")
    told = CliRunner().invoke(app, ["spectrum", str(tmp_path / "day"), "--json", "-"])
    assert told.exit_code == 3
    found = json.loads(told.stdout)
    assert found["totals"] == {"recordings": 2, "counted": 1, "not_counted": 0, "failed": 1}
    assert found["recordings"][1]["problem"]["problem"].startswith("no load factor")
    assert "b.csv" in told.stderr
    text = CliRunner().invoke(app, ["spectrum", str(tmp_path / "day")])
    assert text.exit_code == 3
    assert "b.csv: failed: no load factor" in text.stdout
    nothing = CliRunner().invoke(app, ["spectrum", str(tmp_path / "nowhere")])
    assert nothing.exit_code in (2, 3)
    assert "Traceback" not in nothing.output


def test_a_folder_without_logs_is_said_to_be_one(tmp_path: Path) -> None:
    told = CliRunner().invoke(app, ["spectrum", str(tmp_path)])
    assert told.exit_code == 0
    assert "No log was found, so nothing was counted." in told.stdout


def test_flights_of_the_sample_day_are_counted_in_the_air_and_the_parts_add_up() -> None:
    found = counted(SAMPLES / "zz-nmc", fleet=str(SAMPLES / "fleet.yaml"))
    (row,) = found["spectra"]
    assert row["registration"] == "ZZ-NMC"
    assert row["flights"] == len(found["recordings"])
    assert {part["phase"] for part in row["by_phase"]} >= {"climb", "cruise", "approach"}
    assert {part["cause"] for part in row["by_cause"]} == {"gust", "manoeuvre", "not told apart"}
    for parts in (row["by_phase"], row["by_cause"]):
        for key in ("crossings", "peaks"):
            for level, many in levels(row, key).items():
                assert many == sum(levels(part, key).get(level, 0) for part in parts)
        assert sum(part["counted_s"] for part in parts) == pytest.approx(row["counted_s"])
        assert min(part["lowest_g"] for part in parts) == row["lowest_g"]
    for log in found["recordings"]:
        lost = sum(part["seconds"] for part in log["not_counted"])
        assert log["counted_s"] + lost == pytest.approx(log["airborne_s"], abs=0.6)


def test_the_whole_is_the_sum_of_its_aeroplanes(tmp_path: Path) -> None:
    chosen = [SAMPLES / "zz-nma" / "nma-0902.csv", SAMPLES / "zz-nmj" / "C30-008_0930.parquet"]
    found = counted(*chosen, fleet=str(SAMPLES / "fleet.yaml"))
    *each, everything = found["spectra"]
    assert [row["registration"] for row in each] == ["ZZ-NMA", "ZZ-NMJ"]
    assert everything["everything"]
    for level, many in levels(everything).items():
        assert many == sum(levels(row).get(level, 0) for row in each)
    assert everything["cycles"]["half"] == sum(row["cycles"]["half"] for row in each)
    assert everything["mass_weighted"] is None


def test_the_same_logs_give_the_same_bytes(tmp_path: Path) -> None:
    log = write_log(tmp_path / "a.csv", flown(E1049))
    first, second = (CliRunner().invoke(app, ["spectrum", str(log), "--json", "-"]).stdout for _ in range(2))
    assert first == second
    assert json.loads(first)["format"] == "exceed/spectrum/1"


values = st.lists(st.floats(-4.0, 8.0, allow_nan=False, width=16), min_size=2, max_size=60)


@settings(deadline=None, max_examples=60)
@given(history=values, labels=st.data())
def test_steps_of_parts_add_up_to_the_whole(history: list[float], labels: st.DataObject) -> None:
    codes = np.array(
        labels.draw(st.lists(st.integers(0, 2), min_size=len(history), max_size=len(history))), dtype=np.int8
    )
    load, parts = np.array(history), {}
    whole = count_stretch(np.arange(len(load)) / RATE, load, [(codes, parts)])
    np.testing.assert_array_equal(whole.crossings, counting.level_crossings(load, LEVELS))
    total = Counts()
    for part in parts.values():
        total.add(part)
    np.testing.assert_array_equal(total.crossings, whole.crossings)
    np.testing.assert_array_equal(total.peaks, whole.peaks)
    # peaks at or above a level are the turns that E1049 peak counting has at all values from there up
    turns = np.unique(load)
    many = counting.peak_counts(load, turns)
    for level, found in zip(LEVELS.tolist(), whole.peaks.tolist(), strict=True):
        reach = turns >= level if level >= 1.0 else turns <= level
        side = turns > 1.0 if level >= 1.0 else turns < 1.0
        assert found == many[reach & side].sum()
