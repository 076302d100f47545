"""Outputs appear whole or not at all."""

from __future__ import annotations

import errno
import os
from pathlib import Path

import pytest

from exceed.errors import OutputError
from exceed.report.write import write_whole


def test_a_file_is_written_whole_and_nothing_else_is_left(tmp_path: Path) -> None:
    target = tmp_path / "out.json"
    target.write_text("old")
    write_whole(target, "new é\n")
    assert target.read_text(encoding="utf-8") == "new é\n"
    assert os.listdir(tmp_path) == ["out.json"]


def test_a_link_stays_a_link(tmp_path: Path) -> None:
    (tmp_path / "real.json").write_text("old")
    (tmp_path / "link.json").symlink_to("real.json")
    write_whole(tmp_path / "link.json", "new")
    assert (tmp_path / "link.json").is_symlink()
    assert (tmp_path / "real.json").read_text() == "new"


def test_a_full_disk_leaves_the_old_file_and_no_half_one(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    target = tmp_path / "out.json"
    target.write_text("old")

    def full(_: int) -> None:
        raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(OutputError) as caught:
        write_whole(target, "new")
    assert str(caught.value) == (
        f"{target}: the disk is full\n  expected: room for the whole file\n  do: make room or choose another disk"
    )
    assert target.read_text() == "old"
    assert os.listdir(tmp_path) == ["out.json"]


def test_a_missing_folder_and_a_folder_as_target_are_told_plainly(tmp_path: Path) -> None:
    with pytest.raises(OutputError, match="the folder does not exist"):
        write_whole(tmp_path / "no" / "out.json", "x")
    with pytest.raises(OutputError, match="this is a folder"):
        write_whole(tmp_path, "x")
    with pytest.raises(OutputError, match="cannot be written"):
        write_whole("a\x00b", "x")


def test_a_dash_is_stdout(capfdbinary: pytest.CaptureFixture[bytes]) -> None:
    write_whole("-", "größe \udcff\n")
    assert capfdbinary.readouterr().out == "größe \\udcff\n".encode()
