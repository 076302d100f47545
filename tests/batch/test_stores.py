"""Logs at addresses: file:// and an object store, which here is a folder or the memory of this process."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path
from urllib.parse import unquote

import fsspec
import pyarrow.fs as fs
import pytest

from exceed import pipeline
from exceed.errors import UsageError
from exceed.prepare import prepare
from exceed.read import find_logs, read_log
from exceed.report.summary import summarise
from exceed.settings import Settings


class Store:
    """Stands for pyarrow's file systems of a known scheme: `store://bucket/...` lies in this process's memory."""

    FileSystem: type

    @staticmethod
    def from_uri(address: str) -> tuple[fs.FileSystem, str]:
        scheme, _, path = address.partition("?")[0].partition("://")
        path = unquote(path)
        if scheme != "store":
            return REAL.from_uri(address)
        return fs.PyFileSystem(fs.FSSpecHandler(fsspec.filesystem("memory"))), "/" + path.lstrip("/")


REAL = fs.FileSystem


@pytest.fixture
def store(day: Path, monkeypatch: pytest.MonkeyPatch):
    """The day's folder, also at store://bucket/day."""
    memory = fsspec.filesystem("memory")
    for path in day.rglob("*"):
        if path.is_file():
            memory.pipe_file(f"/bucket/day/{path.relative_to(day).as_posix()}", path.read_bytes())
    monkeypatch.setattr(fs, "FileSystem", Store)
    yield "store://bucket/day"
    memory.rm("/bucket", recursive=True)


def summary(path: str | Path, **wishes) -> dict:
    found = summarise(pipeline.scan(Settings((str(path),), **wishes)))
    found.pop("created")
    return found


def test_logs_of_a_store_give_what_the_same_files_give(store, day):
    fleet = str(day / "fleet.yaml")
    here, there = summary(day, fleet=fleet), summary(store, fleet=fleet)
    assert [one["path"] for one in there["recordings"]] == [one["path"] for one in here["recordings"]]
    assert [one["status"] for one in there["recordings"]].count("failed") == 1
    # where the fleet file lies is told from the folder given, and a store's is none
    for summary_ in (here, there):
        for key in ("fleet", "judged_with", "aircraft"):
            summary_.pop(key)
    assert there == here


def test_one_object_of_a_store_is_one_log(store, day):
    logs, skipped = find_logs([f"{store}/zz-nma/nma-1020.csv"])
    assert [log.shown for log in logs] == ["nma-1020.csv"]
    assert skipped == []
    recording = read_log(f"{store}/zz-nma/nma-1020.csv")
    assert recording.sha256 == read_log(day / "zz-nma/nma-1020.csv").sha256


def test_what_is_no_log_in_a_store_is_said(store):
    _, skipped = find_logs([store])
    assert ("fleet.yaml", "a YAML file") in [tuple(one) for one in skipped]


def test_a_stores_options_and_odd_names_stay_in_the_address_of_each_object(store, day):
    name = "50% of day 1?.csv"
    fsspec.filesystem("memory").pipe_file(f"/bucket/day/odd/{name}", (day / "zz-nma/nma-1020.csv").read_bytes())
    logs, _ = find_logs([f"{store}/odd?region=here&scheme=http://x"])
    assert [log.shown for log in logs] == [name]
    assert logs[0].location == f"{store}/odd/50%25%20of%20day%201%3F.csv?region=here&scheme=http://x"
    assert read_log(logs[0]).rows == read_log(day / "zz-nma/nma-1020.csv").rows


def test_nothing_at_an_address_is_a_users_mistake(store):
    with pytest.raises(UsageError, match="there is nothing at this address"):
        find_logs([f"{store}/no-such-folder"])


@pytest.mark.parametrize("address", ["nothing://bucket/log.csv", "store2://x"])
def test_a_scheme_that_nobody_knows_is_a_users_mistake(address):
    with pytest.raises(UsageError, match="cannot be opened"):
        find_logs([address])


def test_file_addresses_are_files_also_for_other_processes(day):
    """A blank in the name is written as %20 in an address."""
    spaced = day.with_name("my day")
    day.rename(spaced)

    def scanned(*words: str) -> dict:
        ended = subprocess.run(
            [sys.executable, "-m", "exceed", "scan", *words, "--json", "-"], capture_output=True, text=True, timeout=120
        )
        assert ended.returncode == 3
        found = json.loads(ended.stdout)
        found.pop("created")
        return found

    assert scanned(spaced.as_uri(), "--jobs", "2") == scanned(str(spaced), "--jobs", "1")


def test_a_run_of_logs_from_a_store_goes_to_other_processes(store):
    import pickle

    logs, _ = find_logs([store])
    run = prepare(Settings((store,)), [(str(Path(log.location).parent), log.root) for log in logs])
    assert pickle.loads(pickle.dumps((logs, run)))[0] == logs
