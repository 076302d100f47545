"""Folders of logs by name only, a run to go with them, and a day of real ones."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from pathlib import Path

import pytest

from exceed.prepare import Run, prepare
from exceed.read.find import LogPath
from exceed.settings import Settings

SAMPLES = Path(__file__).resolve().parents[2] / "sample_logs"


@pytest.fixture
def named(tmp_path: Path) -> Callable[..., list[LogPath]]:
    """Empty files of these names, as logs."""

    def make(*names: str) -> list[LogPath]:
        for name in names:
            (tmp_path / name).touch()
        return [LogPath(name, str(tmp_path / name), str(tmp_path)) for name in names]

    return make


@pytest.fixture
def run() -> Run:
    return prepare(Settings(()), [])


@pytest.fixture
def day(tmp_path: Path) -> Path:
    """A fleet with its documents, four logs of it, one that is none: each is quick to read."""
    folder = tmp_path / "day"
    folder.mkdir()
    for name in ("fleet.yaml", "aircraft", "channels", "loading"):
        source = SAMPLES / name
        (shutil.copytree if source.is_dir() else shutil.copy)(source, folder / name)
    for path in ("zz-nmj/C30-008_0930.parquet", "zz-nmj/C30-008_b.parquet", "zz-nma/nma-1020.csv"):
        (folder / path).parent.mkdir(exist_ok=True)
        shutil.copy(SAMPLES / path, folder / path)
    shutil.copy(SAMPLES / "zz-nma/nma-1020.csv", folder / "zz-nma/again.csv")
    (folder / "broken.csv").write_text("no log at all\n")
    return folder
