"""Many logs over processes: order, equality, processes that end, logs that linger, what is left behind."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from batch import strange
from exceed import batch
from exceed.batch import each

EIGHT = [f"log-{number}.csv" for number in range(8)]


def children() -> set[str]:
    """Process ids of this process's children, zombies included."""
    found = set()
    for task in Path("/proc/self/task").iterdir():
        found |= set((task / "children").read_text().split())
    return found


@pytest.fixture(autouse=True)
def _nothing_left_behind():
    before = children()
    yield
    assert children() <= before


@pytest.mark.parametrize("jobs", [1, 2, 5])
def test_outcomes_are_in_the_order_of_the_logs_whatever_their_size(named, run, jobs):
    logs = named(*EIGHT)
    for index, log in enumerate(logs):
        Path(log.location).write_bytes(b"x" * (index * 37 % 11))
    done = each(logs, run, jobs, work=strange.answer)
    assert [one.path for one in done.outcomes] == EIGHT
    assert done.left == []
    assert done.notes == ()


def test_two_jobs_are_two_other_processes_in_the_same_folder(named, run):
    done = each(named("slow.csv", *EIGHT), run, 2, work=strange.linger)
    assert done.outcomes[0].notes == ("8 others done",), "a slow log must hold up no other"
    done = each(named(*EIGHT), run, 2, work=strange.where)
    assert os.getpid() not in {int(one.notes[0]) for one in done.outcomes}
    assert {one.notes[1] for one in done.outcomes} == {os.getcwd()}


def test_few_small_logs_stay_here_unless_processes_are_asked_for(named, run):
    logs = named(*EIGHT)
    assert {one.notes[0] for one in each(logs, run, None, work=strange.where).outcomes} == {str(os.getpid())}
    assert {one.notes[0] for one in each(logs, run, 1, work=strange.where).outcomes} == {str(os.getpid())}


def test_no_log_gives_no_outcome(run):
    assert each([], run, 4).outcomes == []


def test_progress_counts_up_to_all(named, run):
    for jobs in (1, 3):
        seen: list[tuple[int, int]] = []
        each(named(*EIGHT), run, jobs, lambda done, total: seen.append((done, total)), strange.answer)  # noqa: B023
        assert seen == [(number, 8) for number in range(1, 9)]


@pytest.mark.parametrize(
    ("ending", "said"),
    [
        ("exits", "the process that read this log ended with exit code 7 before it was done, twice"),
        ("killed", "the process that read this log was ended by the signal SIGKILL, twice"),
        ("out-of-memory", "the process that read this log ended with exit code 1 before it was done, twice"),
        ("raises", "the process that read this log ended with exit code 1 before it was done, twice"),
        ("stopped", "the process that read this log stopped answering, twice"),
    ],
)
def test_a_log_that_ends_its_process_is_one_failed_log(named, run, ending, said):
    names = [*EIGHT[:3], f"{ending}.csv", *EIGHT[3:]]
    done = each(named(*names), run, 2, work=strange.end)
    assert [one.path for one in done.outcomes] == names
    failed = [one for one in done.outcomes if one.status == "failed"]
    assert [one.path for one in failed] == [f"{ending}.csv"]
    assert failed[0].problem.problem == said
    assert failed[0].problem.do


def test_several_logs_that_end_their_processes_fail_alone(named, run):
    done = each(named("exits-1", "a", "killed-1", "b", "exits-2", "killed-2", "c"), run, 3, work=strange.end)
    assert [one.path for one in done.outcomes if one.status != "failed"] == ["a", "b", "c"]


def test_a_process_that_was_killed_once_costs_no_log_and_is_told(named, run):
    done = each(named(*EIGHT, "killed.csv"), run, 2, work=strange.end_once)
    assert {one.status for one in done.outcomes} == {"ok"}
    assert done.notes == ("killed.csv: read at the second try, the first ended its process",)


def test_where_no_process_starts_the_logs_fail_and_nothing_hangs(named, run, monkeypatch):
    monkeypatch.setattr(sys, "executable", "/no/such/interpreter")
    done = each(named(*EIGHT), run, 2, work=strange.answer)
    assert {one.problem.problem for one in done.outcomes} == {"no process to read this log could be started"}
    monkeypatch.setattr(sys, "executable", "/bin/false")
    done = each(named(*EIGHT), run, 2, work=strange.answer)
    assert {one.problem.problem for one in done.outcomes} == {"no process to read this log could be started"}


def test_two_logs_too_heavy_for_their_share_are_not_read_at_the_same_time(named, run, monkeypatch):
    monkeypatch.setenv("EXCEED_MEMORY", "1 MB")
    logs = named("heavy-1", "heavy-2", *EIGHT)
    for log in logs[:2]:
        Path(log.location).write_bytes(b"x" * 40_000)
    crew = batch._Crew(logs, run, [batch.size(log) for log in logs], 500_000, 2, None, strange.answer)
    taken = []
    for _ in range(3):
        index = crew._next()
        taken.append(index)
        crew.workers.append(batch._Worker(None, None, True, index))
    assert taken == [0, 2, 3], "the second heavy log waits"
    del crew.workers[0]
    assert crew._next() == 1


def test_a_script_without_a_guard_scans_with_processes(day):
    """A worker never runs the caller's main module: that would start workers without end."""
    script = day / "script.py"
    script.write_text(
        "import exceed, json\n"
        f"found = exceed.scan({str(day)!r}, jobs=2)\n"
        "print(json.dumps([found.summary['totals']['recordings'], found.summary['totals']['failed']]))\n"
    )
    ended = subprocess.run([sys.executable, str(script)], capture_output=True, text=True, check=True, timeout=120)
    assert json.loads(ended.stdout) == [5, 1]
    assert ended.stderr == ""
