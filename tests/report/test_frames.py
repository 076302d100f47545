"""The frames of the Python API carry the JSON's names and values."""

from __future__ import annotations

import subprocess
import sys

import pandas as pd

from exceed.report import frames
from exceed.report.summary import summarise
from report import examples


def test_the_frame_of_events_holds_every_event_with_the_names_of_the_json() -> None:
    summary = summarise(examples.day())
    frame = frames.events(summary)
    written = [(row["path"], event) for row in summary["recordings"] for event in row["events"]]
    assert list(frame["id"]) == [event["id"] for _, event in written]
    assert list(frame["recording"]) == [path for path, _ in written]
    for name in set(frames.EVENT_COLUMNS) - {"recording", "start", "end", "flight"}:
        for found, (_, event) in zip(frame[name], written, strict=True):
            assert found == event[name] or (event[name] is None and pd.isna(found)), name
    first = frame[frame["registration"] == "ZZ-NMA"].iloc[0]
    assert first["start"] == pd.Timestamp("2031-05-02T09:15:43.095Z")
    assert first["peak_estimate"] == 6.243
    assert frame["start"].isna().sum() == 1  # the log without an absolute clock
    assert frame["flight"].isna().sum() == 1


def test_undecided_stretches_have_a_frame_of_the_same_form() -> None:
    summary = summarise(examples.day())
    found = frames.events(summary, undecided=True)
    assert len(found) == 1
    assert list(found.columns) == list(frames.events(summary).columns)


def test_the_frame_of_the_assessment_adds_up_to_the_recorded_time() -> None:
    summary = summarise(examples.day())
    frame = frames.assessment(summary)
    whole = frame[frame["flight"].isna() & (frame["recording"] == "zz-nma/a.csv")]
    total = whole["assessed_s"] + whole["unassessed_s"] + whole["not_applicable_s"]
    assert total.round(3).unique().tolist() == [5153.6]


def test_an_empty_day_gives_frames_with_the_same_columns_and_kinds() -> None:
    empty, full = summarise(examples.empty_day()), summarise(examples.day())
    assert len(frames.events(empty)) == 0
    assert list(frames.events(empty).columns) == list(frames.events(full).columns)
    for name in ("start", "flight", "peak_value", "limit_value"):
        assert frames.events(empty)[name].dtype == frames.events(full)[name].dtype
    assert list(frames.assessment(empty).columns) == list(frames.ASSESSMENT_COLUMNS)


def test_the_table_needs_no_heavy_library() -> None:
    code = (
        "import sys, exceed.report.table; print({'pandas', 'rich', 'pyarrow', 'scipy', 'pydantic'} & set(sys.modules))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "set()"
