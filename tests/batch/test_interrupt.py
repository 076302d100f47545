"""Ctrl-C in the middle: what was done is complete and whole, marked so, and no process is left."""

from __future__ import annotations

import json
import os
import pty
import re
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from batch import strange
from exceed import api, batch, pipeline
from exceed.settings import Settings

# `exceed scan` with another reading of logs, so that the moment of the interrupt is known
SCRIPT = """
import sys
from batch import strange
from exceed import pipeline
pipeline.assess = strange.{work}
from exceed.cli.app import main
main(sys.argv[1:])
"""

BOTH = {"stdout": subprocess.PIPE, "stderr": subprocess.PIPE}


def start(work: str, *words: str, **more) -> subprocess.Popen[bytes]:
    return subprocess.Popen(
        [sys.executable, "-c", SCRIPT.format(work=work), "scan", *words],
        env={**os.environ, "PYTHONPATH": str(Path(__file__).resolve().parents[1])},
        stdin=subprocess.DEVNULL,
        # a shell's background job would have it ignored
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.default_int_handler),
        **more,
    )


def group_of(pid: int) -> list[str]:
    """Ids of all processes that a process has started."""
    return Path(f"/proc/{pid}/task/{pid}/children").read_text().split()


def wait_for(what, seconds: float = 60.0) -> None:
    until = time.monotonic() + seconds
    while not what():
        assert time.monotonic() < until, "it never came"
        time.sleep(0.02)


@pytest.mark.parametrize("jobs", ["1", "2"])
def test_an_interrupt_writes_what_was_done_and_exits_with_130(tmp_path, jobs):
    folder = tmp_path / "day"
    folder.mkdir()
    for name in ("a.csv", "b.csv", "slow.csv", "z.csv"):
        (folder / name).write_text("x")
    target = tmp_path / "day.json"
    process = start(
        "wait_for_ever",
        str(folder),
        "--jobs",
        jobs,
        "--json",
        str(target),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
    )
    # with two, the other process goes on to the last log
    done_before = ["a.csv", "b.csv"] if jobs == "1" else ["a.csv", "b.csv", "z.csv"]
    wait_for((folder / "begun").exists)
    if jobs == "2":
        wait_for(lambda: (folder / "z.csv.done").exists())
    workers = group_of(process.pid)
    assert len(workers) == int(jobs) if jobs != "1" else workers == []
    process.send_signal(signal.SIGINT)
    out, err = process.communicate(timeout=30)
    assert process.returncode == 130
    said = f"interrupted: {len(done_before)} of 4 logs were done, this holds for these alone"
    assert err.decode() == f"exceed: {said}\n"
    assert said in out.decode().replace("\n", " ")
    summary = json.loads(target.read_text())
    assert [one["path"] for one in summary["recordings"]] == done_before
    assert said in summary["notes"]
    left = [one["path"] for one in summary["skipped"] if one["reason"] == pipeline.UNDONE]
    assert sorted([*done_before, *left]) == ["a.csv", "b.csv", "slow.csv", "z.csv"]
    assert [pid for pid in workers if Path(f"/proc/{pid}").exists()] == []


def test_workers_end_when_their_parent_is_killed(tmp_path):
    folder = tmp_path / "day"
    folder.mkdir()
    for name in ("a.csv", "b.csv", "pause.csv"):
        (folder / name).write_text("x")
    process = start("wait_for_ever", str(folder), "--jobs", "2", "--quiet")
    wait_for((folder / "pause-begun").exists)
    workers = group_of(process.pid)
    assert len(workers) == 2
    process.kill()
    process.wait()
    (folder / "go").touch()
    wait_for(lambda: not any(running(pid) for pid in workers), 30)


def running(pid: str) -> bool:
    """Not ended; a zombie, which only the machine's first process can take away then, has ended."""
    try:
        return Path(f"/proc/{pid}/stat").read_text().rsplit(")", 1)[1].split()[0] != "Z"
    except OSError:
        return False


def test_the_python_api_raises_what_it_was_interrupted_by(monkeypatch, day):
    def stop(logs, run, jobs, progress):
        return batch.Batch([strange.answer(logs[0], run)], list(logs[1:]))

    monkeypatch.setattr(batch, "each", stop)
    assert pipeline.scan(Settings((str(day),))).interrupted
    with pytest.raises(KeyboardInterrupt):
        api.scan(day)


def test_a_terminal_sees_counts_rate_and_what_remains(day, tmp_path):
    """On stderr, which is a terminal here; stdout is none and stays clean."""
    parent, child = pty.openpty()
    with (tmp_path / "out.txt").open("wb") as out:
        process = subprocess.Popen(
            [sys.executable, "-m", "exceed", "scan", str(day), "--jobs", "2"],
            stdout=out,
            stderr=child,
            stdin=subprocess.DEVNULL,
            env={**os.environ, "TERM": "xterm", "COLUMNS": "100"},
        )
        os.close(child)
        shown = b""
        while True:
            try:
                piece = os.read(parent, 4096)
            except OSError:
                break
            if not piece:
                break
            shown += piece
        process.wait(timeout=60)
        os.close(parent)
    text = re.sub(r"\x1b\[[0-9;?]*[a-zA-Z]", "", shown.decode())
    assert "reading logs" in text
    assert re.search(r"[0-5]/5", text)
    assert re.search(r"[0-9.]+/s", text)
    assert re.search(r"[0-9-]:[0-9-]{2}:[0-9-]{2}", text)
    assert "reading logs" not in (tmp_path / "out.txt").read_text()


def test_nothing_but_problems_is_said_where_stderr_is_no_terminal(day):
    (day / "broken.csv").unlink()
    done = subprocess.run(
        [sys.executable, "-m", "exceed", "scan", str(day), "--jobs", "2"], capture_output=True, text=True, timeout=60
    )
    assert done.stderr == ""
