"""Logs are found in one order, shown relative to the path given; what is left out is counted with its reason."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from exceed.errors import UsageError
from exceed.read import find_logs


@pytest.fixture
def day(tmp_path: Path) -> Path:
    for name in (
        "b/2.csv",
        "b/10.csv.gz",
        "a/1.TSV",
        "a/deep/x.parquet",
        "README.md",
        "fleet.yaml",
        "a/.hidden.csv",
        "a/page.html",
        "b/summary.json",
        "b/photo.jpg",
        "LICENSE.txt",
        ".git/config.csv",
    ):
        path = tmp_path / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text("x")
    return tmp_path


def test_a_folder_is_searched_in_order(day: Path) -> None:
    logs, skipped = find_logs([day])
    assert [log.shown for log in logs] == ["a/1.TSV", "a/deep/x.parquet", "b/10.csv.gz", "b/2.csv"]
    assert {log.root for log in logs} == {str(day)}
    assert all(os.path.samefile(log.location, day / log.shown) for log in logs)
    assert dict(skipped) == {
        "README.md": "a text about the logs",
        "LICENSE.txt": "a text about the logs",
        "fleet.yaml": "a YAML file",
        "a/.hidden.csv": "a hidden file",
        "a/page.html": "a page",
        "b/summary.json": "a JSON file",
        "b/photo.jpg": "no known extension of a log",
    }


def test_a_file_given_by_name_is_read_whatever_its_extension(day: Path) -> None:
    logs, skipped = find_logs([day / "b" / "photo.jpg"])
    assert [log.shown for log in logs] == ["photo.jpg"]
    assert skipped == []


def test_patterns_and_addresses(day: Path) -> None:
    logs, _ = find_logs([f"{day}/*/*.csv*"])
    assert [log.shown for log in logs] == ["b/10.csv.gz", "b/2.csv"]
    logs, _ = find_logs([f"file://{day}/b/2.csv"])
    assert [log.shown for log in logs] == ["2.csv"]
    logs, _ = find_logs([f"{day}/**/*.parquet"])
    assert [log.shown for log in logs] == ["a/deep/x.parquet"]


def test_a_log_met_twice_is_read_once(day: Path) -> None:
    os.symlink(day / "b" / "2.csv", day / "again.csv")
    logs, _ = find_logs([day / "b", day])
    assert [log.shown for log in logs] == ["10.csv.gz", "2.csv", "a/1.TSV", "a/deep/x.parquet"]


def test_loops_pipes_and_folders_that_look_like_logs(day: Path) -> None:
    os.symlink(day, day / "a" / "loop")
    os.mkfifo(day / "pipe.csv")
    (day / "folder.csv").mkdir()
    os.symlink(day / "nowhere.csv", day / "broken.csv")
    logs, skipped = find_logs([day])
    assert len(logs) == 4
    said = dict(skipped)
    assert said["a/loop"] == "a link back to a folder above it"
    assert said["pipe.csv"] == "no regular file"
    assert said["broken.csv"] == "cannot be looked at (No such file or directory)"


def test_all_wrong_paths_are_told_at_once(day: Path) -> None:
    with pytest.raises(UsageError) as caught:
        find_logs([day / "no.csv", f"{day}/*.nothing", day / "b"])
    assert str(caught.value) == (
        f"{day}/no.csv: there is no such file or folder\n  expected: a file, a folder or a pattern\n  do: check "
        f"the path\n"
        f"{day}/*.nothing: matches no file\n  expected: a pattern that fits a log\n  do: check the pattern and "
        f"its quotes"
    )


def test_a_name_with_brackets_is_a_file_first(day: Path) -> None:
    (day / "log[red].csv").write_text("x")
    logs, _ = find_logs([day / "log[red].csv"])
    assert [log.shown for log in logs] == ["log[red].csv"]
