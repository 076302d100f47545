"""Any clock column becomes one strictly ascending axis; what had to be done for it is said."""

from __future__ import annotations

import datetime
from pathlib import Path

import numpy as np
import pytest
from read.made import log, simple

from exceed.errors import LogError

UTC = datetime.UTC
START = datetime.datetime(2031, 5, 2, 9, 2, 11, tzinfo=UTC)


def stamps(form: str, count: int = 200, step: float = 0.125, start: datetime.datetime = START) -> list[str]:
    moments = [start + datetime.timedelta(seconds=k * step) for k in range(count)]
    return [m.strftime(form).replace("@@@", f"{m.microsecond // 1000:03d}") for m in moments]


@pytest.mark.parametrize(
    ("heading", "cells", "kind"),
    [
        ("UTC", stamps("%Y-%m-%dT%H:%M:%S.@@@"), "iso"),
        ("Timestamp", stamps("%Y-%m-%dT%H:%M:%S.@@@Z"), "iso"),
        ("Timestamp", stamps("%Y-%m-%d %H:%M:%S.@@@+00:00"), "iso"),
        ("t", stamps("%Y/%m/%d %H:%M:%S.@@@"), "iso"),
        ("t", stamps("%d-%b-%Y %H:%M:%S.@@@"), "iso"),
        ("t", stamps("%d %B %Y %I:%M:%S.@@@ %p"), "iso"),
        ("t", stamps("%Y%m%dT%H%M%S.@@@Z"), "iso"),
        ("t", stamps("%Y-%jT%H:%M:%S.@@@"), "iso"),
        ("t", stamps("%d.%m.%Y %H:%M:%S.@@@"), "iso"),
        ("epoch [s]", [f"{START.timestamp() + k / 8:.3f}" for k in range(200)], "epoch"),
        ("time", [f"{int(START.timestamp() * 1000 + k * 125)}" for k in range(200)], "epoch"),
        ("unix time (us)", [f"{int(START.timestamp() * 1e6 + k * 125000)}" for k in range(200)], "epoch"),
        ("timestamp_ns", [f"{int(START.timestamp()) * 10**9 + k * 125_000_000}" for k in range(200)], "epoch"),
    ],
)
def test_absolute_stamps_of_many_forms(tmp_path: Path, heading: str, cells: list[str], kind: str) -> None:
    recording = log(tmp_path, simple(heading=f"{heading},NZ [g],IAS [kt],PALT [ft]", stamps=cells))
    assert recording.clock.kind == kind
    assert recording.clock.start == pytest.approx(START.timestamp(), abs=1e-3)
    assert np.allclose(recording.time, np.arange(200) / 8, atol=1e-6)


@pytest.mark.parametrize(
    ("heading", "factor"),
    [
        ("time [s]", 1.0),
        ("Elapsed (ms)", 1e3),
        ("t_us", 1e6),
        ("TIME", 1e3),
        ("Elapsed", 1e6),
        ("time_min", 1 / 60),
        ("time_s", 1.0),
    ],
)
def test_elapsed_time_in_its_unit(tmp_path: Path, heading: str, factor: float) -> None:
    whole = factor > 1
    cells = [str(int(k * 0.125 * factor)) if whole else f"{k * 0.125 * factor:.8f}" for k in range(200)]
    recording = log(tmp_path, simple(heading=f"{heading},NZ [g],IAS [kt],PALT [ft]", stamps=cells))
    assert recording.clock.kind == "elapsed"
    assert recording.clock.start is None
    assert np.allclose(recording.time, np.arange(200) / 8, atol=1e-5)


def test_zone_offsets_are_taken_off(tmp_path: Path) -> None:
    recording = log(
        tmp_path, simple(heading="t,NZ [g],IAS [kt],PALT [ft]", stamps=stamps("%Y-%m-%dT%H:%M:%S.@@@+05:30"))
    )
    assert recording.clock.start == pytest.approx(START.timestamp() - 5.5 * 3600, abs=1e-3)


def test_zone_of_the_preamble(tmp_path: Path) -> None:
    text = "Time zone: UTC+2\n" + simple(heading="t,NZ [g],IAS [kt],PALT [ft]", stamps=stamps("%Y-%m-%d %H:%M:%S.@@@"))
    recording = log(tmp_path, text)
    assert recording.clock.start == pytest.approx(START.timestamp() - 7200, abs=1e-3)
    assert recording.clock.zone == "UTC+2"


def test_no_zone_is_said(tmp_path: Path) -> None:
    recording = log(tmp_path, simple(heading="t,NZ [g],IAS [kt],PALT [ft]", stamps=stamps("%Y-%m-%d %H:%M:%S.@@@")))
    assert recording.clock.zone == "UTC, assumed"
    assert "no time zone is stated: taken as UTC" in recording.clock.notes


def split_log(dates: list[str], times: list[str], extra: str = "", cells: list[str] | None = None) -> str:
    heading = f"Date,Time{extra},NZ [g]"
    lines = [heading] + [
        f"{dates[k]},{times[k]}{',' + cells[k] if cells else ''},{1 + 0.2 * np.sin(k / 9):.3f}"
        for k in range(len(dates))
    ]
    return "\n".join(lines) + "\n"


def test_date_and_time_and_offset_in_three_columns(tmp_path: Path) -> None:
    local = stamps("%H:%M:%S", step=1.0)
    recording = log(tmp_path, split_log(["2031-05-02"] * 200, local, ",UTC Offset", ["+02:00"] * 200))
    assert recording.clock.kind == "date_time"
    assert recording.clock.start == pytest.approx(START.timestamp() - 7200, abs=1e-3)


@pytest.mark.parametrize(
    ("dates", "start"),
    [
        (["25/04/2031"] * 100, (2031, 4, 25)),
        (["04/25/2031"] * 100, (2031, 4, 25)),
        (["02/05/2031"] * 50 + ["03/05/2031"] * 50, (2031, 5, 2)),  # the day steps at midnight
        (["05/02/2031"] * 50 + ["05/03/2031"] * 50, (2031, 5, 2)),
        (["02.05.2031"] * 100, (2031, 5, 2)),  # points are only written day first
        (["05/05/2031"] * 100, (2031, 5, 5)),
    ],
)
def test_day_or_month_first_by_evidence(tmp_path: Path, dates: list[str], start: tuple[int, int, int]) -> None:
    begin = datetime.datetime(2031, 1, 1, 23, 59, 10, tzinfo=UTC)
    recording = log(tmp_path, split_log(dates, stamps("%H:%M:%S", 100, 1.0, begin)[: len(dates)]))
    wanted = datetime.datetime(*start, 23, 59, 10, tzinfo=UTC).timestamp()
    if len(set(dates)) == 1:
        # the date is the same on both sides of midnight: a recorder that steps its date late; only the start
        # is compared
        assert recording.clock.start == pytest.approx(wanted, abs=1e-3)
        return
    assert recording.clock.start == pytest.approx(wanted, abs=1e-3)
    assert recording.duration == pytest.approx(99.0)


def test_an_open_date_gives_elapsed_time_and_is_said(tmp_path: Path) -> None:
    recording = log(tmp_path, split_log(["02/05/2031"] * 100, stamps("%H:%M:%S", 100, 1.0)))
    assert recording.clock.start is None
    assert "the date may be day first or month first: times are elapsed, UTC is not given" in recording.clock.notes
    assert recording.duration == pytest.approx(99.0)


def test_the_preamble_settles_an_open_date(tmp_path: Path) -> None:
    text = "Recording started: 2 May 2031\n" + split_log(["02/05/2031"] * 100, stamps("%H:%M:%S", 100, 1.0))
    assert log(tmp_path, text).clock.start == pytest.approx(START.timestamp(), abs=1e-3)


def test_time_of_day_alone_is_not_absolute(tmp_path: Path) -> None:
    recording = log(tmp_path, simple(heading="TIME,NZ [g],IAS [kt],PALT [ft]", stamps=stamps("%H:%M:%S.@@@")))
    assert (recording.clock.kind, recording.clock.start) == ("time_of_day", None)
    assert np.allclose(recording.time, np.arange(200) / 8)


def test_time_of_day_with_the_preambles_date_is_absolute_and_passes_midnight(tmp_path: Path) -> None:
    begin = datetime.datetime(2031, 5, 2, 23, 59, 50, tzinfo=UTC)
    text = "# Date: 2031-05-02\n" + simple(
        heading="TIME,NZ [g],IAS [kt],PALT [ft]", stamps=stamps("%H:%M:%S.@@@", start=begin)
    )
    recording = log(tmp_path, text)
    assert recording.clock.start == pytest.approx(begin.timestamp(), abs=1e-3)
    assert np.allclose(recording.time, np.arange(200) / 8)
    assert "the clock passed midnight 1 time" in recording.clock.notes


def test_a_frame_counter_needs_its_rate(tmp_path: Path) -> None:
    text = simple(heading="FRAME,NZ [g],IAS [kt],PALT [ft]", stamps=[str(k) for k in range(200)])
    with pytest.raises(LogError) as caught:
        log(tmp_path, text)
    assert str(caught.value).endswith(
        "no clock: no column of time was found, and no frame rate is stated\n"
        "  expected: a column of time, or a counter and its rate\n"
        "  do: name the clock in a channels file: clock: {column: NAME, kind: elapsed, unit: s}"
    )
    assert np.allclose(log(tmp_path, "Sample rate: 8 Hz\n" + text).time, np.arange(200) / 8)


def test_a_frame_counter_runs_over(tmp_path: Path) -> None:
    cells = [str((k + 4000) % 4096) for k in range(200)]
    text = "Frame rate: 8 Hz\n" + simple(heading="FRAME,NZ [g],IAS [kt],PALT [ft]", stamps=cells)
    recording = log(tmp_path, text)
    assert np.allclose(recording.time, np.arange(200) / 8)
    assert (recording.clock.resets, recording.seams) == (0, ())


def test_a_reset_starts_a_new_stretch_behind_a_seam(tmp_path: Path) -> None:
    cells = [f"{k * 0.125:.3f}" for k in range(120)] + [f"{k * 0.125:.3f}" for k in range(80)]
    recording = log(tmp_path, simple(stamps=cells))
    assert recording.clock.resets == 1
    ((start, end),) = recording.seams
    assert (start, end - start) == (pytest.approx(119 * 0.125), pytest.approx(60.0))
    assert recording.duration == pytest.approx(119 * 0.125 + 79 * 0.125)
    assert np.all(np.diff(recording.time) > 0)


def test_a_single_stamp_astray_is_left_out(tmp_path: Path) -> None:
    cells = [f"{k * 0.125:.3f}" for k in range(200)]
    cells[50], cells[90] = "900.000", "1.000"
    recording = log(tmp_path, simple(stamps=cells))
    assert len(recording.time) == 198
    assert recording.clock.resets == 0
    assert "2 rows with a stamp out of order are left out" in recording.clock.notes


def test_doubled_stamps_keep_the_first_and_are_listed(tmp_path: Path) -> None:
    cells = [f"{k * 0.125:.3f}" for k in range(200)]
    cells[60] = cells[59]
    recording = log(tmp_path, simple(stamps=cells))
    assert len(recording.time) == 199
    (row,) = recording.rejected
    assert (row.quantity, row.reason, row.samples, row.start) == (
        "time",
        "duplicate_time",
        1,
        pytest.approx(59 * 0.125),
    )


@pytest.mark.parametrize(("per", "offset"), [(8, 0), (8, 3), (4, 1), (2, 0), (16, 5)])
def test_coarse_stamps_are_spread(tmp_path: Path, per: int, offset: int) -> None:
    cells = [
        f"12:00:{(k + offset) // per:02d}" if (k + offset) // per < 60 else f"12:01:{(k + offset) // per - 60:02d}"
        for k in range(200)
    ]
    recording = log(tmp_path, simple(heading="TIME,NZ [g],IAS [kt],PALT [ft]", stamps=cells))
    assert np.allclose(recording.time, np.arange(200) / per, atol=1e-9)
    assert any("stamps are coarser than the rows" in note for note in recording.clock.notes)


def test_rows_without_a_time_are_counted(tmp_path: Path) -> None:
    cells = [f"{k * 0.125:.3f}" for k in range(200)]
    cells[10] = cells[11] = ""
    recording = log(tmp_path, simple(stamps=cells))
    assert len(recording.time) == 198
    assert "2 rows without a time are left out" in recording.clock.notes


def test_a_gap_stays_a_gap(tmp_path: Path) -> None:
    cells = [f"{k * 0.125 + (30.0 if k >= 100 else 0.0):.3f}" for k in range(200)]
    recording = log(tmp_path, simple(stamps=cells))
    assert np.max(np.diff(recording.time)) == pytest.approx(30.125)
    assert recording.duration == pytest.approx(199 * 0.125 + 30.0)


def test_a_coarse_date_beside_a_fine_counter_anchors_it(tmp_path: Path) -> None:
    lines = ["elapsed [s],UTC,NZ [g]"]
    for k in range(200):
        stamp = (START + datetime.timedelta(seconds=k // 8)).isoformat().replace("+00:00", "Z")
        lines.append(f"{k * 0.125:.3f},{stamp},{1 + 0.1 * np.sin(k):.3f}")
    recording = log(tmp_path, "\n".join(lines) + "\n")
    assert np.allclose(recording.time, np.arange(200) / 8)
    assert recording.clock.start == pytest.approx(START.timestamp(), abs=1e-3)


def test_no_row_with_a_time_is_an_error(tmp_path: Path) -> None:
    text = simple(30) + "\n".join(f",{1.0:.3f},100,3000" for _ in range(30)) + "\n"
    assert len(log(tmp_path, text).time) == 30
    with pytest.raises(LogError, match="no clock"):
        log(tmp_path, "NZ [g],IAS [kt]\n" + "\n".join("1.0,100" for _ in range(30)) + "\n")


def cut(k: int) -> tuple[int, int, float]:
    """Hours, minutes, seconds from 09:58:30."""
    second = 35910.0 + k * 0.125
    return int(second // 3600), int(second % 3600 // 60), second % 60


@pytest.mark.parametrize("order", ["ymd", "dmy"])
def test_figures_without_marks(tmp_path: Path, order: str) -> None:
    """hhmmss is no count of seconds: read as one, each minute would last 100 s."""
    date = {"ymd": "20310525", "dmy": "250531"}[order]
    lines = ["DATE,TIME,NZ [g]"] + ["{},{:02d}{:02d}{:06.3f},1.00{}".format(date, *cut(k), k % 10) for k in range(900)]
    recording = log(tmp_path, "\n".join(lines) + "\n")
    assert recording.clock.start == pytest.approx(
        datetime.datetime(2031, 5, 25, 9, 58, 30, tzinfo=UTC).timestamp(), abs=1e-3
    )
    assert np.allclose(recording.time, np.arange(900) / 8, atol=1e-6)


def test_hours_minutes_and_seconds_apart(tmp_path: Path) -> None:
    lines = ["GMT HOUR,GMT MIN,GMT SEC,NZ [g]"] + ["{},{},{:.3f},1.00{}".format(*cut(k), k % 10) for k in range(900)]
    recording = log(tmp_path, "\n".join(lines) + "\n")
    assert (recording.clock.kind, recording.clock.start) == ("time_of_day", None)
    assert np.allclose(recording.time, np.arange(900) / 8, atol=1e-6)
    lines = ["YEAR,MONTH,DAY," + lines[0]] + ["2031,5,2," + line for line in lines[1:]]
    recording = log(tmp_path, "\n".join(lines) + "\n")
    assert recording.clock.start == pytest.approx(
        datetime.datetime(2031, 5, 2, 9, 58, 30, tzinfo=UTC).timestamp(), abs=1e-3
    )


def test_rows_alone_with_a_stated_rate(tmp_path: Path) -> None:
    text = "Sample rate: 8 Hz\nNZ [g]\n" + "".join(f"1.00{k % 10}\n" for k in range(200))
    recording = log(tmp_path, text)
    assert np.allclose(recording.time, np.arange(200) / 8)
    assert "no clock column: rows are counted, 8 a second as the preamble says" in recording.clock.notes


def test_a_clock_that_stands_still_is_an_error(tmp_path: Path) -> None:
    with pytest.raises(LogError) as caught:
        log(tmp_path, simple(stamps=["5.0"] * 200))
    assert str(caught.value).endswith(
        "its clock stands still: every row has the same time\n  expected: a time that goes on\n"
        "  do: name another clock in a channels file, or check the recorder's clock"
    )


def test_times_of_day_without_a_date_are_not_said_to_be_utc(tmp_path: Path) -> None:
    recording = log(tmp_path, simple(heading="Elapsed,NZ [g],IAS [kt],PALT [ft]", stamps=stamps("%H:%M:%S.@@@")))
    assert recording.clock.start is None
    assert any("UTC is not given" in note for note in recording.clock.notes)
    assert "no time zone is stated: taken as UTC" not in recording.clock.notes
