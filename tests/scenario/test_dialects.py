"""The dialect writer writes what it says it writes; readers are tested elsewhere with what it makes."""

from __future__ import annotations

import csv
import gzip
import io
from dataclasses import replace
from itertools import combinations
from pathlib import Path

import numpy as np
import pyarrow.parquet as pq
import pytest

from scenario.air import G0, KT
from scenario.dialects import CLOCKS, Habit, Truth, number, write
from scenario.habits import HABITS, OPTIONS, allowed
from scenario.vocabulary import NAMES, VOCABULARIES, kind_of


def truth() -> Truth:
    count = 8 * 40
    time = np.arange(count) / 8.0
    return Truth(
        8.0,
        {
            "load_factor": 1.0 + np.sin(time),
            "indicated_airspeed": (100.0 + time) * KT,
            "pressure_altitude": 1000.0 + time,
            "outside_air_temperature": np.full(count, 283.15),
            "weight_on_wheels": (time > 20.0).astype(float),
        },
        rates={"indicated_airspeed": 4.0, "pressure_altitude": 1.0, "outside_air_temperature": 1.0},
        start=1_937_640_000.0,
        registration="ZZ-NMA",
        recorder_serial="R-2201",
    )


def rows_of(path: Path, delimiter: str = ",") -> list[list[str]]:
    return list(csv.reader(io.StringIO(path.read_text(encoding="utf-8")), delimiter=delimiter))


def test_there_are_at_least_sixty_habits_with_ids_of_their_own() -> None:
    assert len(HABITS) >= 60
    assert len({habit.id for habit in HABITS}) == len(HABITS)
    assert all(allowed(habit) for habit in HABITS if not habit.parquet)


def test_habits_meet_every_value_of_every_option_and_most_pairs() -> None:
    text = [habit for habit in HABITS if not habit.parquet]
    for name, options in OPTIONS.items():
        assert {getattr(habit, name) for habit in text} == set(options), name
    assert {habit.clock for habit in text} == set(CLOCKS)
    shown = wanted = 0
    for a, b in combinations(OPTIONS, 2):
        pairs = {(x, y) for x in OPTIONS[a] for y in OPTIONS[b]}
        wanted += len(pairs)
        shown += len({(getattr(habit, a), getattr(habit, b)) for habit in text} & pairs)
    assert shown / wanted > 0.85  # the rest is forbidden by `allowed` or left out by the greedy choice


@pytest.mark.parametrize("habit", HABITS, ids=lambda habit: habit.id)
def test_every_habit_writes(habit: Habit, tmp_path: Path) -> None:
    written = write(truth(), tmp_path / ("log" + habit.extension), habit)
    assert written.path.stat().st_size > 500
    assert set(written.columns) == set(truth().channels)
    assert written.rows in (320, 40)


def test_plain_habit_holds_the_values(tmp_path: Path) -> None:
    written = write(truth(), tmp_path / "a.csv", Habit())
    rows = rows_of(written.path)
    assert rows[0] == ["TIME [s]", "NZ [g]", "IAS [kt]", "PALT [ft]", "OAT [degC]", "WOW"]
    table = np.array(rows[1:], dtype=float)
    assert np.allclose(table[:, 1], truth().channels["load_factor"], atol=6e-4)
    assert np.allclose(table[:, 2] * KT, truth().channels["indicated_airspeed"], atol=0.06 * KT)
    assert set(table[:, 4]) == {10.0}


def test_decimal_comma_and_metric_units(tmp_path: Path) -> None:
    habit = Habit(delimiter=";", decimal_comma=True, units="metric", header="two-line", clock="date_time_dmy")
    rows = rows_of(write(truth(), tmp_path / "a.csv", habit).path, ";")
    assert rows[1] == ["", "", "m/s2", "km/h", "m", "degC", ""]
    assert rows[2][:2] == ["27.05.2031", "09:20:00.000"]
    assert float(rows[2][2].replace(",", ".")) == pytest.approx(G0, abs=0.006)


def test_blanks_and_held_values_follow_the_rates(tmp_path: Path) -> None:
    blank = rows_of(write(truth(), tmp_path / "a.csv", Habit(rates="blanks", missing="n/a")).path)
    assert [row[3] != "n/a" for row in blank[1:18]] == [i % 8 == 0 for i in range(17)]
    assert [row[2] != "n/a" for row in blank[1:6]] == [True, False, True, False, True]
    held = rows_of(write(truth(), tmp_path / "b.csv", Habit(rates="held")).path)
    assert len({row[3] for row in held[1:9]}) == 1
    assert held[3][2] == blank[3][2]


def test_sub_frames_unfold_to_the_same_samples(tmp_path: Path) -> None:
    written = write(truth(), tmp_path / "a.csv", Habit(rates="subframe"))
    rows = rows_of(written.path)
    assert written.columns["load_factor"] == [f"NZ{k} [g]" for k in range(1, 9)]
    first = rows[0].index("NZ1 [g]")
    unfolded = np.array([row[first : first + 8] for row in rows[1:]], dtype=float).ravel()
    assert np.allclose(unfolded, truth().channels["load_factor"], atol=6e-4)


@pytest.mark.parametrize(
    ("value", "habit", "text"),
    [
        (1234.5, Habit(thousands=","), "1,234.5"),
        (1234.5, Habit(thousands=".", decimal_comma=True), "1.234,5"),
        (-0.0001, Habit(), "0.0"),
        (12.3, Habit(decimal_comma=True), "12,3"),
        (12000.0, Habit(thousands="'"), "12'000.0"),
    ],
)
def test_numbers_are_written_in_the_habit(value: float, habit: Habit, text: str) -> None:
    assert number(value, 1, habit) == text


def test_midnight_falls_inside_the_log(tmp_path: Path) -> None:
    rows = rows_of(write(truth(), tmp_path / "a.csv", Habit(clock="time_only", midnight=True)).path)
    assert rows[1][0] == "23:59:40.000"
    assert rows[-1][0] == "00:00:19.875"


def test_gaps_leave_rows_out(tmp_path: Path) -> None:
    cut = replace(truth(), gaps=((10.0, 12.0),))
    rows = rows_of(write(cut, tmp_path / "a.csv", Habit()).path)
    stamps = np.array([row[0] for row in rows[1:]], dtype=float)
    assert len(stamps) == 320 - 16
    assert np.max(np.diff(stamps)) == 2.125


def test_last_line_can_be_cut(tmp_path: Path) -> None:
    rows = rows_of(write(truth(), tmp_path / "a.csv", Habit(tail="cut")).path)
    assert len(rows[-1]) < len(rows[1])


def test_compressed_and_encoded_text_is_the_same_text(tmp_path: Path) -> None:
    plain = write(truth(), tmp_path / "a.csv", Habit(spelling="signs")).path.read_text()
    packed = write(truth(), tmp_path / "b.csv.gz", Habit(spelling="signs", compression="gz", encoding="utf-16")).path
    assert gzip.decompress(packed.read_bytes()).decode("utf-16") == plain


def test_parquet_holds_values_units_and_facts(tmp_path: Path) -> None:
    habit = Habit(parquet="ms", unit_metadata=True, units="metric", rates="blanks")
    table = pq.read_table(write(truth(), tmp_path / "a.parquet", habit).path)
    assert table.schema.metadata[b"registration"] == b"ZZ-NMA"
    assert table.schema.field("IAS").metadata[b"unit"] == b"km/h"
    assert table["PALT"].null_count == 320 - 40
    assert str(table.schema.field("UTC").type) == "timestamp[ms, tz=UTC]"


def test_every_quantity_has_a_name_in_every_vocabulary_and_a_unit() -> None:
    for quantity, names in NAMES.items():
        assert len(names) == len(VOCABULARIES)
        assert kind_of(quantity)


def test_the_example_in_the_readme_runs(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    text = (Path(__file__).resolve().parent / "README.md").read_text()
    code = text.split("```python")[1].split("```")[0]
    monkeypatch.chdir(tmp_path)
    names: dict[str, object] = {}
    exec(code, names)
    assert (tmp_path / "log.csv").stat().st_size > 1000
    assert set(names["written"].columns) == {"load_factor", "indicated_airspeed"}  # type: ignore[attr-defined]
