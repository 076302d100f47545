"""Whatever habit a recorder has, the truth that it wrote down is read back."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from read.made import NAMES, OURS, si, truth
from scenario.dialects import Habit, write
from scenario.habits import HABITS

from exceed.read import read_log

# what no data can tell where no unit is written, and of what a question has to be asked
UNTOLD = {
    "ground_speed": "kt, km/h, mph or m/s cannot be told",
    "outside_air_temperature": "degC, degF or K cannot be told",
    "fuel_mass": "kg, lb, L or USG cannot be told",
    "fuel_flow": "kg/h, lb/h, L/h or USG/h cannot be told",
}


@pytest.mark.parametrize("habit", HABITS, ids=lambda habit: habit.id)
def test_the_truth_is_read_back(habit: Habit, tmp_path: Path) -> None:
    written = write(truth(), tmp_path / ("log" + habit.extension), habit)
    recording = read_log(written.path)
    per_row = 8 if habit.rates == "subframe" else 1
    count = truth().count - truth().count % per_row - (per_row if written.last_row_cut else 0)
    assert len(recording.time) == count
    assert np.max(np.abs(recording.time - np.arange(count) / 8.0)) < 1e-3
    assert (recording.clock.start is not None) == written.absolute
    if written.start is not None:
        assert recording.clock.start == pytest.approx(written.start, abs=1e-3)
    assert recording.registration == ("ZZ-NMC" if habit.preamble != "none" or habit.parquet else None)
    open_columns = {row.column: row for row in recording.unresolved}
    for name in NAMES:
        channel = recording.channels.get(OURS.get(name, name))
        column = written.columns[name][0]
        if channel is None:
            assert not written.units_told, f"{name}: {open_columns.get(column)}"
            assert open_columns[column].reason == UNTOLD[name]
            assert open_columns[column].question
            continue
        place = np.round(recording.channel_time(channel) * 8.0).astype(int)
        error = np.abs(channel.values - si(name)[place])
        if name == "heading":
            error = np.minimum(error, 2 * np.pi - error)
        unit = written.units[name]
        scale = unit.scale / 60.0 if name == "engine_speed" else unit.scale
        # half the last digit written; a NaN, a sample lost, fails too
        assert np.all(error <= scale * 10.0**-unit.decimals * 0.51 + 1e-6), name
        every = 8.0 / written.rates[name] if habit.rates != "same" else 1.0
        assert channel.interval == pytest.approx(every / 8.0, rel=1e-3), name
    assert not recording.rejected


def test_enough_habits_are_met() -> None:
    assert len(HABITS) >= 60
