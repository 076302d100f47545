"""Many logs over a Dask cluster: the very same function a log as in `batch`, on other machines.

Workers must see the logs under the same paths and have the same version of exceed: both are looked at before anything
is scanned. Whoever holds the scheduler can run any code on this machine's behalf, so it must be one to trust.
"""

from __future__ import annotations

import contextlib
import logging
import os
import pickle
import queue
import time
import warnings
from collections import deque
from collections.abc import Iterator, Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

from exceed import __version__
from exceed.batch import Batch, Progress, Work, size
from exceed.core.outcome import LogOutcome
from exceed.errors import Problem, UsageError
from exceed.read.container import is_uri
from exceed.read.find import LogPath

if TYPE_CHECKING:
    from exceed.prepare import LoadedFleet, Run

# s: to reach the scheduler, to wait for a first worker, between looks at the cluster while nothing comes in
CONNECT = 5.0
LOOK = 2.0
# s without any worker, or without the scheduler, after which the rest is given up
PATIENCE = 60.0
# small logs go together, so that the scheduler handles fewer tasks; each core is to get at least so many turns
SMALL = 1_000_000
TOGETHER = 4
TURNS = 8
# logs of which every worker is asked whether it sees them
ASKED = 20


def each_on_cluster(
    logs: Sequence[LogPath],
    run: Run,
    address: str,
    progress: Progress | None = None,
    work: Work | None = None,
    *,
    patience: float = PATIENCE,
) -> Batch:
    """Every log's outcome, in the order of the logs, as `batch.each` gives it.

    address : of a running scheduler, as tcp://host:8786. Raises UsageError where the cluster cannot be used: not
    installed, not reached, no worker, another version, logs that a worker does not see. The others do the work of one
    that is lost; a log that ends its workers is a failed log.
    """
    if work is None:
        from exceed.pipeline import assess

        work = assess
    _installed()
    logs = list(logs)
    placed = [_absolute(log) for log in logs]
    absolute = _absolute_run(run, logs, placed)
    with _quiet(), _client(address) as client:
        _check(client, placed, address)
        if not logs:
            return Batch([])
        return _Spread(client, placed, absolute, progress, work, patience).go()


def _installed() -> None:
    try:
        import distributed  # noqa: F401
    except ImportError as error:
        raise UsageError(
            Problem(
                "--dask",
                "the package 'distributed', which talks to a cluster, is not installed here",
                "exceed with its extra 'cluster'",
                "pip install 'exceed[cluster]', here and on the cluster, or use --jobs",
            )
        ) from error


@contextlib.contextmanager
def _quiet() -> Iterator[None]:
    """What the library logs and warns of is said here in other words, or is none of a user's concern."""
    import distributed.client  # noqa: F401

    # its parts have levels of their own, set on import
    names = ["distributed", *(name for name in logging.root.manager.loggerDict if name.startswith("distributed."))]
    before = {name: logging.getLogger(name).level for name in names}
    for name in names:
        logging.getLogger(name).setLevel(logging.CRITICAL + 1)
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            yield
    finally:
        for name, level in before.items():
            logging.getLogger(name).setLevel(level)


@contextlib.contextmanager
def _client(address: str) -> Iterator[Any]:
    import asyncio

    from distributed import Client
    from distributed.comm import connect

    async def knock() -> None:
        # someone who takes the call and says nothing is not covered by the library's own timeout
        comm = await asyncio.wait_for(connect(address, timeout=CONNECT), 1.5 * CONNECT)
        await comm.close()

    try:
        # a client that never came up leaves threads and a traceback behind, so it is only made when someone answers
        asyncio.run(knock())
        client = Client(address, timeout=CONNECT, set_as_default=False)
    except (OSError, ValueError, TypeError, RuntimeError) as error:
        text = " ".join(str(error).split())[:160] or "no answer"
        raise UsageError(
            Problem(
                "--dask",
                f"no scheduler can be reached at '{address}': {text}",
                "the address of a running Dask scheduler, as in tcp://192.0.2.1:8786",
                "check that it runs ('dask scheduler') and that its port is open to this machine",
            )
        ) from error
    try:
        yield client
    finally:
        with contextlib.suppress(Exception):
            client.close(timeout=2)


def _check(client: Any, logs: Sequence[LogPath], address: str) -> None:
    """Workers there, of this version, that see the logs. Raises UsageError with every problem."""
    try:
        client.wait_for_workers(1, timeout=CONNECT)
    except TimeoutError as error:
        raise UsageError(
            Problem("--dask", f"the scheduler at '{address}' has no worker", "one worker at least",
                    f"start some: dask worker {address} --nthreads 1 --nworkers auto")
        ) from error  # fmt: skip
    found = client.get_versions(packages=["exceed"])
    problems = []
    for name, place in [("the scheduler", found["scheduler"]), *sorted(found["workers"].items())]:
        version = (place.get("packages") or {}).get("exceed")
        if version != __version__:
            problems.append(
                Problem(
                    "--dask",
                    f"{name} has " + (f"exceed {version}" if version else "no exceed"),
                    f"exceed {__version__}, as here",
                    f"pip install 'exceed[cluster]=={__version__}' there",
                )
            )
    if problems:
        raise UsageError(*problems)
    step = max(1, len(logs) // ASKED)
    asked = [(log.location, size(log)) for log in logs[::step] if not is_uri(log.location)]
    for name, unseen in sorted(client.run(_unseen, asked, on_error="return").items()):
        if isinstance(unseen, BaseException) or unseen:
            what = f"cannot look for the logs ({unseen})" if isinstance(unseen, BaseException) else (
                f"does not see {unseen[0]} as it is here" + (f", nor {len(unseen) - 1} more" if unseen[1:] else "")
            )  # fmt: skip
            problems.append(
                Problem(
                    "--dask",
                    f"{name} {what}",
                    "logs under the same path on every worker",
                    "put them on a shared file system, or give the address of an object store",
                )
            )
    if problems:
        raise UsageError(*problems)


def _unseen(asked: Sequence[tuple[str, int]]) -> list[str]:
    """On a worker: those of the files that are not there with the same size."""
    return [location for location, many in asked if not os.path.isfile(location) or os.path.getsize(location) != many]


def _do(logs: Sequence[LogPath], blob: tuple[Work, Run], version: str) -> list[LogOutcome]:
    """On a worker: some logs, one after the other."""
    if version != __version__:
        # it joined after the others were asked
        raise RuntimeError(f"a worker has exceed {__version__}, not {version}")
    work, run = blob
    return [work(log, run) for log in logs]


def _absolute(log: LogPath) -> LogPath:
    """The log as another process finds it, wherever that was started."""
    return log if is_uri(log.location) else replace(log, location=os.path.abspath(log.location))


def _absolute_run(run: Run, logs: Sequence[LogPath], placed: Sequence[LogPath]) -> Run:
    """The run with the folders of logs, and of fleet files, as another process finds them."""

    def fleet(one: LoadedFleet) -> LoadedFleet:
        return replace(one, fleet=one.fleet.model_copy(update={"path": os.path.abspath(one.fleet.path)}))

    folders = {}
    for log, there in zip(logs, placed, strict=True):
        path = run.by_folder.get(str(Path(log.location).parent))
        if path is not None:
            folders[str(Path(there.location).parent)] = path
    return replace(run, by_folder=folders, fleets={path: fleet(one) for path, one in run.fleets.items()})


class _Spread:
    """Tasks out, outcomes in."""

    def __init__(
        self, client: Any, logs: list[LogPath], run: Run, progress: Progress | None, work: Work, patience: float
    ) -> None:
        self.client = client
        self.logs = logs
        self.progress = progress
        self.patience = patience
        # a task like any other: if the worker that holds it is lost, the scheduler makes it anew
        self.blob = client.submit(pickle.loads, pickle.dumps((work, run)), pure=False)
        self.heard: queue.SimpleQueue[Any] = queue.SimpleQueue()
        self.running: dict[str, tuple[Any, list[int]]] = {}
        self.again: deque[int] = deque()
        self.tried: set[int] = set()
        self.outcomes: dict[int, LogOutcome] = {}

    def go(self) -> Batch:
        try:
            for indices in self._tasks():
                self._submit(indices)
            alone_since = time.monotonic()
            while self.running:
                try:
                    self._take(self.heard.get(timeout=LOOK))
                    alone_since = time.monotonic()
                except queue.Empty:
                    if self._alive():
                        alone_since = time.monotonic()
                    elif time.monotonic() - alone_since > self.patience:
                        self._give_up()
                if not self.running and self.again:
                    # a second try has the cluster to itself, so that no other log can be to blame
                    self._submit([self.again.popleft()])
        except KeyboardInterrupt:
            with contextlib.suppress(Exception):
                self.client.cancel([future for future, _ in self.running.values()], force=True)
        done = [self.outcomes[index] for index in sorted(self.outcomes)]
        return Batch(done, [log for index, log in enumerate(self.logs) if index not in self.outcomes])

    def _tasks(self) -> Iterator[list[int]]:
        """Indices of logs a task, the largest first."""
        sizes = [size(log) for log in self.logs]
        order = sorted(range(len(self.logs)), key=lambda index: (-sizes[index], index))
        turns = max(1, sum(self.client.nthreads().values())) * TURNS
        together = max(1, min(TOGETHER, len(order) // turns))
        large = [index for index in order if sizes[index] >= SMALL]
        small = [index for index in order if sizes[index] < SMALL]
        yield from ([index] for index in large)
        yield from (small[at : at + together] for at in range(0, len(small), together))

    def _submit(self, indices: list[int]) -> None:
        future = self.client.submit(_do, [self.logs[index] for index in indices], self.blob, __version__, pure=False)
        self.running[future.key] = (future, indices)
        future.add_done_callback(self.heard.put)

    def _take(self, future: Any) -> None:
        known = self.running.pop(future.key, None)
        if known is None:
            return
        _, indices = known
        try:
            outcomes = future.result(timeout=self.patience)
        except Exception as error:
            self._lost(indices, error)
            return
        for index, outcome in zip(indices, outcomes, strict=True):
            self._done(index, outcome)

    def _lost(self, indices: list[int], error: Exception) -> None:
        """A task without a result: each of its logs is tried once more, alone."""
        for index in indices:
            if index in self.tried:
                what = "ended every worker that read it" if type(error).__name__ == "KilledWorker" else (
                    f"got no result from the cluster ({type(error).__name__}: {' '.join(str(error).split())[:160]})"
                )  # fmt: skip
                self._fail(index, what, "scan it alone with --jobs 1")
            else:
                self.tried.add(index)
                self.again.append(index)

    def _alive(self) -> bool:
        """Is there a scheduler with a worker? Then whatever takes long is being worked on."""
        if self.client.status != "running":
            return False
        try:
            return bool(self.client.nthreads())
        except Exception:
            return False

    def _give_up(self) -> None:
        left = [index for _, indices in self.running.values() for index in indices]
        with contextlib.suppress(Exception):
            self.client.cancel([future for future, _ in self.running.values()], force=True)
        self.running.clear()
        for index in (*left, *self.again):
            self._fail(index, "was not read: the cluster's scheduler or its last worker was lost", "scan it again")
        self.again.clear()

    def _fail(self, index: int, what: str, do: str) -> None:
        shown = self.logs[index].shown
        self._done(index, LogOutcome(shown, "failed", Problem(shown, what, "", do)))

    def _done(self, index: int, outcome: LogOutcome) -> None:
        self.outcomes[index] = outcome
        if self.progress is not None:
            self.progress(len(self.outcomes), len(self.logs))
