"""Killed, crowded, out of disk: what was committed stays, nothing is there half or twice."""

from __future__ import annotations

import contextlib
import os
import sqlite3
import subprocess
import sys
from pathlib import Path

import pytest

from exceed.errors import OutputError
from exceed.ledger.record import record
from exceed.ledger.store import open_ledger
from ledger import writer

WRITER = str(Path(writer.__file__))
KILLS = int(os.environ.get("EXCEED_KILLS", "20"))


def holds(folder: Path) -> tuple[list[str], list[str]]:
    """Recordings in the ledger and those known to be committed; the file is sound and every row set whole."""
    with contextlib.closing(sqlite3.connect(folder / "ledger.sqlite")) as raw:
        assert raw.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
        assert raw.execute("PRAGMA foreign_key_check").fetchall() == []
        paths = [row[0] for row in raw.execute("SELECT path FROM recordings ORDER BY id")]
        whole = raw.execute(
            "SELECT count(*) FROM recordings r JOIN judgements j ON j.recording_id = r.id GROUP BY r.id"
        ).fetchall()
        events = raw.execute("SELECT count(*) FROM events GROUP BY judgement_id").fetchall()
        asked = raw.execute("SELECT count(*) FROM inspection_events GROUP BY inspection_row").fetchall()
    assert whole == [(1,)] * len(paths)
    assert events == [(writer.EVENTS,)] * len(paths)
    assert asked == [(writer.EVENTS,)] * len(paths)
    committed = (folder / "committed.txt").read_text().split()
    return paths, committed


def test_a_writer_killed_at_any_instant_loses_and_doubles_nothing(tmp_path):
    done = subprocess.run(
        [sys.executable, WRITER, "kill", str(tmp_path), str(KILLS), "20310502"], capture_output=True, text=True
    )
    assert done.stdout.split() == [str(KILLS)], done.stderr
    paths, committed = holds(tmp_path)
    assert len(committed) > KILLS / 4, "the kills came before anything was written: the test shows nothing"
    assert len(paths) == len(set(paths))
    assert set(committed) <= set(paths)
    # between the commit and the note of it a writer may die too, but each only once
    assert len(set(paths) - set(committed)) <= KILLS
    with open_ledger(f"sqlite:///{tmp_path / 'ledger.sqlite'}") as book:
        again = record(book, writer.scan(committed[0], 0.0))
    assert again["recordings"]["added"] == 0
    print(f"{KILLS} kills, {len(committed)} scans known committed, {len(paths)} in the ledger")


def test_scans_that_write_at_once_wait_for_one_another(tmp_path):
    crowd = [
        subprocess.Popen([sys.executable, WRITER, "many", str(tmp_path), f"p{turn}", "8", str(100 * turn)])
        for turn in range(3)
    ]
    assert [one.wait(timeout=60) for one in crowd] == [0, 0, 0]
    paths, committed = holds(tmp_path)
    assert sorted(paths) == sorted(committed)
    assert len(paths) == 24


def test_a_backup_while_others_write_is_whole(tmp_path):
    writer_now = subprocess.Popen([sys.executable, WRITER, "many", str(tmp_path), "p", "12", "0"])
    taken = 0
    while writer_now.poll() is None:
        if not (tmp_path / "committed.txt").exists() or not (tmp_path / "committed.txt").read_text():
            continue
        folder = tmp_path / f"backup-{taken}"
        folder.mkdir()
        with open_ledger(f"sqlite:///{tmp_path / 'ledger.sqlite'}") as book:
            book.backup(folder / "ledger.sqlite")
        (folder / "committed.txt").write_text("")
        assert holds(folder)[0]
        taken += 1
    assert writer_now.returncode == 0
    assert taken


def test_one_scan_twice_at_once_is_one(tmp_path):
    crowd = [subprocess.Popen([sys.executable, WRITER, "many", str(tmp_path), "same", "5", "0"]) for _ in range(2)]
    assert [one.wait(timeout=60) for one in crowd] == [0, 0]
    paths, _ = holds(tmp_path)
    assert sorted(paths) == [f"same-{turn}.csv" for turn in range(5)]


def test_a_full_disk_is_said_and_the_ledger_stays_as_it_was(tmp_path):
    with open_ledger(f"sqlite:///{tmp_path / 'ledger.sqlite'}", create=True) as book:
        record(book, writer.scan("a.csv", 1.0))
    done = subprocess.run([sys.executable, WRITER, "full", str(tmp_path)], capture_output=True, text=True)
    assert "the disk is full or failing: nothing was added" in done.stdout, done.stderr
    (tmp_path / "committed.txt").write_text("a.csv\n")
    assert holds(tmp_path) == (["a.csv"], ["a.csv"])


def test_a_ledger_kept_locked_is_said(tmp_path, monkeypatch):
    from exceed.ledger import store

    place = f"sqlite:///{tmp_path / 'ledger.sqlite'}"
    with open_ledger(place, create=True) as book:
        record(book, writer.scan("a.csv", 1.0))
    monkeypatch.setattr(store, "BUSY_S", 0.05)
    monkeypatch.setattr(store, "_TRIES", 2)
    with contextlib.closing(sqlite3.connect(tmp_path / "ledger.sqlite", isolation_level=None)) as other:
        other.execute("BEGIN IMMEDIATE")
        with open_ledger(place) as book, pytest.raises(OutputError, match="another program keeps it locked"):
            record(book, writer.scan("b.csv", 2.0))
    with open_ledger(place) as book:
        assert record(book, writer.scan("b.csv", 2.0))["recordings"]["added"] == 1
