"""What is no log is refused clearly and cheaply; what is damaged is read as far as it goes, and said."""

from __future__ import annotations

import bz2
import gzip
import io
import lzma
import os
import pickle
import zipfile
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from read.made import log, simple, written

from exceed.errors import LogError
from exceed.read import container, read_log


def refused(path: Path) -> str:
    with pytest.raises(LogError) as caught:
        read_log(path)
    assert pickle.loads(pickle.dumps(caught.value)).problems == caught.value.problems
    return str(caught.value).replace(str(path), "FILE")


@pytest.mark.parametrize(
    ("data", "text"),
    [
        (b"", "FILE: is empty\n  expected: a CSV or Parquet log\n  do: copy the log from the recorder again"),
        (
            b"\n \r\n\t\n",
            "FILE: holds no text\n  expected: a CSV or Parquet log\n  do: copy the log from the recorder again",
        ),
        (
            bytes(range(256)) * 40,
            "FILE: is not text: it looks like a binary recording\n  expected: CSV or Parquet\n"
            "  do: export the log as CSV with the recorder's own program",
        ),
        (
            b"Dear all,\nplease find the log attached.\nKind regards\n" * 5,
            "FILE: is not a table: no delimiter gives even rows of numbers\n"
            "  expected: CSV with commas, semicolons, tabs, bars or blanks, or Parquet\n  do: export the log as CSV",
        ),
        (
            b"x" * 300_000,
            "FILE: no line ends within the first 256 kB\n  expected: a table of one row a line\n  do: export the "
            "log as CSV again",
        ),
        (
            b"time [s],NZ [g]\n",
            "FILE: is not a table: no delimiter gives even rows of numbers\n"
            "  expected: CSV with commas, semicolons, tabs, bars or blanks, or Parquet\n  do: export the log as CSV",
        ),
        (
            b",".join(b"c%d" % k for k in range(20_000)) + b"\n" + b",".join(b"1" for _ in range(20_000)) + b"\n",
            "FILE: has 20000 columns\n  expected: at most 8192\n  do: export fewer channels",
        ),
        (
            b"PAR1 and then nothing",
            "FILE: is no whole Parquet file: Parquet magic bytes not found in footer. Either the file is "
            "corrupted or this is not a "
            "parquet file.\n  expected: a Parquet file with its footer\n  do: copy the log from the recorder again",
        ),
    ],
    ids=["empty", "blank", "binary", "letter", "one-line", "heading-only", "wide", "broken-parquet"],
)
def test_what_is_no_log_is_refused(tmp_path: Path, data: bytes, text: str) -> None:
    assert refused(written(tmp_path, data)) == text


def test_a_huge_line_in_the_middle_is_refused(tmp_path: Path) -> None:
    text = simple(2000) + "9" * (9 << 20) + "\n" + simple(10)
    assert refused(written(tmp_path, text)) == (
        "FILE: a line is longer than 4 MB\n  expected: one row a line\n  do: export the log as CSV again"
    )


@pytest.mark.parametrize("packing", ["gz", "bz2", "xz"])
def test_a_bomb_is_refused_before_it_bursts(tmp_path: Path, packing: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(container, "RATIO_FROM", 1 << 20)
    row = b"0,1,2,3\n" * (1 << 18)
    data = {"gz": gzip.compress, "bz2": bz2.compress, "xz": lzma.compress}[packing](
        b"time [s],NZ [g],IAS [kt],PALT [ft]\n" + row * 2
    )
    path = written(tmp_path, data, f"log.csv.{packing}")
    assert "MB from" in refused(path)
    assert refused(path).endswith("do: unpack it by hand and look at it, if you trust it")


@pytest.mark.parametrize("packing", ["gz", "bz2", "xz"])
def test_a_packed_log_cut_short_is_read_as_far_as_it_goes(tmp_path: Path, packing: str) -> None:
    rng = np.random.default_rng(1)
    text = "time [s],NZ [g]\n" + "".join(f"{k / 8:.3f},{1 + rng.normal(0, 0.1):.6f}\n" for k in range(100_000))
    data = {"gz": gzip.compress, "bz2": bz2.compress, "xz": lzma.compress}[packing](text.encode())
    recording = log(tmp_path, data[: int(len(data) * 0.8)], f"log.csv.{packing}")
    assert recording.status == "partial"
    assert 10_000 < len(recording.time) < 100_000
    assert any("cut short" in note or "damaged" in note for note in recording.notes)
    values = recording.channels["load_factor"].values
    truth = np.array([float(line.split(",")[1]) for line in text.splitlines()[1 : len(values) + 1]])
    # never a wrong number, not even in the last line
    assert np.array_equal(values[np.isfinite(values)], truth[: len(values)][np.isfinite(values)])


def test_gzip_members_one_after_the_other_are_one_log(tmp_path: Path) -> None:
    text = simple().encode()
    half = text.index(b"\n", len(text) // 2) + 1
    recording = log(tmp_path, gzip.compress(text[:half]) + gzip.compress(text[half:]), "log.csv.gz")
    assert len(recording.time) == 200
    assert recording.status == "ok"


def zipped(*members: tuple[str, bytes]) -> bytes:
    box = io.BytesIO()
    with zipfile.ZipFile(box, "w") as archive:
        for name, data in members:
            archive.writestr(name, data)
    return box.getvalue()


def test_zip_holds_one_log(tmp_path: Path) -> None:
    data = zipped(("log.csv", simple().encode()), ("__MACOSX/._log.csv", b"junk"))
    assert len(log(tmp_path, data, "log.zip").time) == 200
    path = written(tmp_path, zipped(("a.csv", simple().encode()), ("b.csv", b"")), "two.zip")
    assert (
        refused(path)
        == "FILE: holds 2 files (a.csv, b.csv)\n  expected: a zip file with one log in it\n  do: unpack it into "
        "a folder"
    )


def test_a_last_line_cut_in_its_last_cell_gives_no_wrong_number(tmp_path: Path) -> None:
    text = "time [s],NZ [g],IAS [kt]\n" + "".join(f"{k / 8:.3f},1.000,{100 + k / 10:.1f}\n" for k in range(100))
    recording = log(tmp_path, text[:-3])  # 109.9 -> 109
    assert len(recording.time) == 100
    speed = recording.channels["indicated_airspeed"]
    assert speed.rows is not None
    assert len(speed.values) == 99
    assert "the last line has no end: its last cell may be cut and is not used" in recording.notes
    whole = log(tmp_path, text[:-1])
    assert whole.channels["indicated_airspeed"].rows is None
    assert "the last line has no end: its last cell may be cut and is not used" not in whole.notes


def test_a_last_line_cut_earlier_is_left_out(tmp_path: Path) -> None:
    recording = log(tmp_path, simple()[:-9])
    assert len(recording.time) == 199
    assert any(
        note.startswith("1 line with another number of cells than the headings is left out") for note in recording.notes
    )


def test_cells_that_are_no_numbers_are_found_and_missing(tmp_path: Path) -> None:
    lines = simple().splitlines()
    lines[50] = "6.125,1.0o5,101.0,3100"
    lines[70] = "8.625,bad!,101.0,3140"
    recording = log(tmp_path, "\n".join(lines) + "\n")
    load = recording.channels["load_factor"]
    assert len(load.values) == 198
    (row,) = recording.rejected
    assert (row.reason, row.samples, row.quantity, row.start, row.end) == (
        "not_a_number",
        2,
        "load_factor",
        6.125,
        8.625,
    )
    assert (
        f"{recording.path}:51:2: '1.0o5' in column 'NZ [g]' is not a number (2 cells): taken as missing"
        in recording.notes
    )


def test_infinite_cells_are_rejected(tmp_path: Path) -> None:
    lines = simple().splitlines()
    lines[50] = "6.125,inf,101.0,3100"
    recording = log(tmp_path, "\n".join(lines) + "\n")
    assert [(row.reason, row.samples) for row in recording.rejected] == [("not_a_number", 1)]
    assert np.isnan(recording.channels["load_factor"].values[49])


def test_extreme_figures_do_not_warn(tmp_path: Path) -> None:
    lines = simple().splitlines()
    lines[50] = "6.125,1e308,-1e308,1e300"
    recording = log(tmp_path, "\n".join(lines) + "\n")
    assert {row.reason for row in recording.rejected} == {"out_of_range"}


def test_parquet_with_nested_columns_says_so_and_reads_the_rest(tmp_path: Path) -> None:
    table = pa.table(
        {"time_s": np.arange(100) / 8, "nz_g": np.ones(100) + 0.01 * np.arange(100), "raw": [[1, 2]] * 100}
    )
    pq.write_table(table, tmp_path / "a.parquet")
    recording = read_log(tmp_path / "a.parquet")
    assert set(recording.channels) == {"load_factor"}
    assert recording.unused == ("raw",)


def test_an_empty_parquet_is_refused(tmp_path: Path) -> None:
    pq.write_table(pa.table({"time_s": pa.array([], pa.float64())}), tmp_path / "a.parquet")
    assert (
        refused(tmp_path / "a.parquet")
        == "FILE: holds no rows\n  expected: a table of recorded samples\n  do: check the export"
    )


def test_no_such_file_a_folder_and_a_pipe(tmp_path: Path) -> None:
    assert refused(tmp_path / "none.csv") == "FILE: there is no such file\n  do: check the path"
    (tmp_path / "x.csv").mkdir()
    assert refused(tmp_path / "x.csv").startswith("FILE: is a folder")
    os.mkfifo(tmp_path / "pipe.csv")
    assert refused(tmp_path / "pipe.csv").startswith("FILE: is not a regular file")


def test_control_characters_in_headings_are_kept_as_data(tmp_path: Path) -> None:
    recording = log(tmp_path, simple(heading="time [s],NZ [g],\x1b[31mIAS\x1b[0m [kt],[bold]X[/bold]"))
    assert "load_factor" in recording.channels
    assert "[bold]X[/bold]" in recording.unused
