"""The same logs on a Dask cluster: a real scheduler and two workers, started from the command line on loopback."""

from __future__ import annotations

import contextlib
import json
import os
import signal
import socket
import subprocess
import sys
import threading
import time
from pathlib import Path

import pytest

import exceed
from batch import strange
from exceed import cluster, pipeline
from exceed.cluster import each_on_cluster
from exceed.errors import UsageError
from exceed.settings import Settings

TESTS = Path(__file__).resolve().parents[1]
# the library leaves sockets to the collector
pytestmark = pytest.mark.filterwarnings("ignore::ResourceWarning", "ignore::pytest.PytestUnraisableExceptionWarning")

# should the tests themselves be killed
ENDS = ("--idle-timeout", "120s")


class Cluster:
    """A scheduler and its workers, as processes of their own, in another folder than the tests'."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.log = (folder / "log.txt").open("wb")
        where = folder / "scheduler.json"
        self.scheduler = self._start(
            "scheduler", "--port", "0", "--host", "127.0.0.1", "--scheduler-file", str(where), *ENDS
        )
        until = time.monotonic() + 60
        while not where.exists() and time.monotonic() < until:
            time.sleep(0.05)
        self.address = json.loads(where.read_text())["address"]
        self.workers: list[subprocess.Popen[bytes]] = []

    def _start(self, *words: str) -> subprocess.Popen[bytes]:
        path = os.pathsep.join([str(TESTS), *filter(None, [os.environ.get("PYTHONPATH")])])
        return subprocess.Popen(
            [sys.executable, "-m", "dask", *words, "--no-dashboard"],
            cwd=self.folder,
            stdin=subprocess.DEVNULL,
            stdout=self.log,
            stderr=self.log,
            start_new_session=True,
            env={**os.environ, "PYTHONPATH": path, "DASK_DISTRIBUTED__SCHEDULER__ALLOWED_FAILURES": "1"},
        )

    def hire(self, *, nanny: bool = False) -> None:
        words = ["worker", self.address, "--nthreads", "1", "--host", "127.0.0.1", "--death-timeout", "30"]
        self.workers.append(self._start(*words, "--nanny" if nanny else "--no-nanny"))

    def end(self) -> None:
        for process in (*self.workers, self.scheduler):
            # its session: a worker that is started again when it ends is a child of the process that does so
            with contextlib.suppress(ProcessLookupError):
                os.killpg(process.pid, signal.SIGKILL)
            process.wait()
        self.log.close()


@contextlib.contextmanager
def running(folder: Path, workers: int, *, nanny: bool = False):
    folder.mkdir(exist_ok=True)
    made = Cluster(folder)
    try:
        for _ in range(workers):
            made.hire(nanny=nanny)
        yield made
    finally:
        made.end()


@pytest.fixture(scope="module")
def two(tmp_path_factory):
    """Two workers that are started again when they end."""
    with running(tmp_path_factory.mktemp("cluster"), 2, nanny=True) as made:
        yield made


def summary_of(text: str) -> dict:
    found = json.loads(text)
    found.pop("created")
    return found


def scan(*words: str, **more) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "exceed", "scan", *words], capture_output=True, text=True, timeout=120, **more
    )


def test_a_cluster_gives_the_same_summary_as_this_machine(two, day):
    """The paths are relative to a folder in which no worker was started, and the fleet file is found by them."""
    # this log says not whose it is: only a pattern relative to the fleet file does
    log = day / "zz-nma" / "again.csv"
    log.write_text("".join(line for line in log.read_text().splitlines(keepends=True) if not line.startswith("#")))
    paths = ("day/zz-nma", "day/zz-nmj", "day/broken.csv")
    here = scan(*paths, "--jobs", "1", "--json", "-", cwd=day.parent)
    there = scan(*paths, "--dask", two.address, "--json", "-", cwd=day.parent)
    assert there.stderr == here.stderr
    assert there.returncode == here.returncode == 3
    owners = {one["path"]: one["registration"] for one in summary_of(here.stdout)["recordings"]}
    assert len(owners) == 5
    assert owners["again.csv"] == "ZZ-NMA"
    assert summary_of(there.stdout) == summary_of(here.stdout)


def test_the_python_api_takes_a_cluster_too(two, day):
    here, there = exceed.scan(day), exceed.scan(day, dask=two.address)
    assert {**there.summary, "created": ""} == {**here.summary, "created": ""}


def test_every_worker_works_and_order_stays(two, named, run):
    names = [f"log-{number}" for number in range(60)]
    seen: list[int] = []
    done = each_on_cluster(named(*names), run, two.address, lambda k, n: seen.append(k), strange.where)
    assert [one.path for one in done.outcomes] == names
    assert seen == list(range(1, 61))
    assert os.getpid() not in {int(one.notes[0]) for one in done.outcomes}


def test_no_log_gives_no_outcome(two, run):
    assert each_on_cluster([], run, two.address).outcomes == []


def test_a_log_that_ends_its_workers_is_one_failed_log(two, named, run):
    names = ["a", "b", "killed", "c", "d"]
    done = each_on_cluster(named(*names), run, two.address, None, strange.end)
    assert [one.path for one in done.outcomes] == names
    assert [one.path for one in done.outcomes if one.status == "failed"] == ["killed"]
    assert done.outcomes[2].problem.problem == "ended every worker that read it"


def test_an_error_of_the_work_itself_is_a_failed_log(two, named, run):
    done = each_on_cluster(named("a", "raises", "b"), run, two.address, None, strange.end)
    assert [one.status for one in done.outcomes] == ["ok", "failed", "ok"]
    assert "a fault of the work itself" in done.outcomes[1].problem.problem


def lose(begun: Path, process: subprocess.Popen[bytes] | None = None) -> threading.Thread:
    """Kills the worker that has begun with the slow log, or another process then."""

    def wait() -> None:
        while not begun.exists() or not begun.read_text().endswith("\n"):
            time.sleep(0.02)
        if process is not None:
            process.kill()
        else:
            os.kill(int(begun.read_text()), signal.SIGKILL)

    helper = threading.Thread(target=wait)
    helper.start()
    return helper


def test_a_lost_worker_is_made_up_for_and_a_lost_cluster_fails_what_is_left(tmp_path, named, run, monkeypatch):
    logs = named("slow", *[f"log-{number}" for number in range(6)])
    begun = tmp_path / "begun"
    with running(tmp_path / "cluster", 1) as made:
        helper = lose(begun)
        hired = threading.Timer(0.0, made.hire)
        hired.start()
        done = each_on_cluster(logs, run, made.address, None, strange.wait_the_first_time)
        helper.join()
        hired.join()
        assert [one.status for one in done.outcomes] == ["ok"] * 7

        begun.unlink()
        helper = lose(begun)
        done = each_on_cluster(logs, run, made.address, None, strange.wait_for_ever, patience=1.0)
        helper.join()
        said = "was not read: the cluster's scheduler or its last worker was lost"
        assert {one.problem.problem for one in done.outcomes if one.status == "failed"} == {said}
        assert done.outcomes[0].status == "failed"

        monkeypatch.setattr(cluster, "CONNECT", 1.0)
        with pytest.raises(UsageError, match="has no worker"):
            each_on_cluster(logs, run, made.address, None, strange.answer)


def test_a_lost_scheduler_fails_what_is_left_without_a_traceback(tmp_path, named, run, capfd):
    logs = named("slow", "other")
    with running(tmp_path / "cluster", 2) as made:
        helper = lose(tmp_path / "begun", made.scheduler)
        done = each_on_cluster(logs, run, made.address, None, strange.wait_for_ever, patience=1.0)
        helper.join()
    assert done.outcomes[0].problem.problem == "was not read: the cluster's scheduler or its last worker was lost"
    assert capfd.readouterr() == ("", "")


def test_an_interrupt_leaves_what_was_done(two, day):
    process = subprocess.Popen(
        [sys.executable, "-c", INTERRUPTED, two.address, str(day)], stdout=subprocess.PIPE, stderr=subprocess.PIPE
    )
    out, err = process.communicate(timeout=60)
    assert (process.returncode, out.decode(), err.decode()) == (0, "1 of 5 done, 4 left\n", "")


INTERRUPTED = """
import os, signal, sys
from pathlib import Path
from exceed import cluster, pipeline
from exceed.settings import Settings
def stop(done, total):
    if done == 1:
        os.kill(os.getpid(), signal.SIGINT)
found = pipeline.scan(Settings((sys.argv[2],), dask=sys.argv[1]), stop)
assert found.interrupted
left = [path for path, why in found.skipped if why == pipeline.UNDONE]
print(f"{len(found.logs)} of 5 done, {len(left)} left")
"""


def free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])


@pytest.mark.parametrize("address", ["tcp://127.0.0.1:{port}", "127.0.0.1:{port}", "nowhere", "odd://127.0.0.1:1", ""])
def test_a_scheduler_that_is_not_there_is_said_and_nothing_is_scanned(address, run, named, monkeypatch):
    monkeypatch.setattr(cluster, "CONNECT", 0.5)
    address = address.format(port=free_port())
    with pytest.raises(UsageError, match="no scheduler can be reached at") as caught:
        each_on_cluster(named("a"), run, address, None, strange.answer)
    problem = caught.value.problems[0]
    assert problem.place == "--dask"
    assert address in problem.problem
    assert problem.expected
    assert problem.do


def test_the_command_line_says_it_in_three_lines_and_exits_with_2(day, tmp_path):
    ended = scan(str(day), "--dask", f"tcp://127.0.0.1:{free_port()}", "--json", str(tmp_path / "day.json"))
    assert ended.returncode == 2
    assert ended.stdout == ""
    first, *rest = ended.stderr.splitlines()
    assert first.startswith("exceed: --dask: no scheduler can be reached at 'tcp://127.0.0.1:")
    assert [line.split(":")[0] for line in rest] == ["  expected", "  do"]
    assert not (tmp_path / "day.json").exists()


def test_something_else_at_the_address_is_no_scheduler(run, named, monkeypatch):
    monkeypatch.setattr(cluster, "CONNECT", 1.0)
    with socket.create_server(("127.0.0.1", 0)) as server:
        address = f"tcp://127.0.0.1:{server.getsockname()[1]}"
        with pytest.raises(UsageError, match="no scheduler can be reached"):
            each_on_cluster(named("a"), run, address, None, strange.answer)


def test_another_version_there_is_said_of_each_place(two, run, named, monkeypatch):
    monkeypatch.setattr(cluster, "__version__", "9.9.9")
    with pytest.raises(UsageError) as caught:
        each_on_cluster(named("a"), run, two.address, None, strange.answer)
    assert len(caught.value.problems) == 3
    assert caught.value.problems[0].problem == f"the scheduler has exceed {exceed.__version__}"
    assert {problem.expected for problem in caught.value.problems} == {"exceed 9.9.9, as here"}


def test_logs_that_a_worker_does_not_see_are_said_before_anything_is_scanned(two, run, named, monkeypatch):
    """Here the files are gone between the search and the question, as they are on a machine that never had them."""
    logs = named("a", "b")
    for log in logs:
        Path(log.location).unlink()
    with pytest.raises(UsageError, match=r"does not see .*/a as it is here, nor 1 more") as caught:
        each_on_cluster(logs, run, two.address, None, strange.answer)
    assert {problem.expected for problem in caught.value.problems} == {"logs under the same path on every worker"}


def test_without_the_extra_the_way_to_install_it_is_said(run, named, monkeypatch):
    monkeypatch.setitem(sys.modules, "distributed", None)
    with pytest.raises(UsageError, match=r"'distributed'.* is not installed here") as caught:
        each_on_cluster(named("a"), run, "tcp://127.0.0.1:8786", None, strange.answer)
    assert "pip install 'exceed[cluster]'" in caught.value.problems[0].do


def test_jobs_and_a_cluster_exclude_each_other(day):
    with pytest.raises(UsageError, match="cannot go with --dask"):
        pipeline.scan(Settings((str(day),), jobs=2, dask="tcp://127.0.0.1:8786"))
