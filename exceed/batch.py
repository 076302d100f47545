"""Many logs: one after the other here, or over processes; the outcome is in the order of the logs either way.

Each worker is given one log at a time, the largest first, so a slow log keeps nobody waiting and the process that ends
without a word has named the log that ended it. That log is tried once more with nothing beside it.
"""

from __future__ import annotations

import contextlib
import os
import pickle
import signal
import subprocess
from collections import deque
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from multiprocessing.connection import Connection, wait
from typing import TYPE_CHECKING

from exceed import worker
from exceed.core.outcome import LogOutcome
from exceed.errors import Problem

if TYPE_CHECKING:
    from exceed.prepare import Run
    from exceed.read.find import LogPath

Progress = Callable[[int, int], None]
Work = Callable[["LogPath", "Run"], LogOutcome]

# measured on the sample logs: what a log costs whatever its size, and how much text a second of one core takes
LOG_SECONDS = 0.05
BYTES_A_SECOND = 5_000_000
# a packed byte or one of Parquet stands for so many of text
PACKED = 3
# a worker's start with its imports, and what a second process must save to be worth it
WORTH_SECONDS = 2.0
# memory that a byte of a narrow text log may take while it is read: two logs of which this is more than a worker's
# share are not read at the same time
HEAVY = 20
# s between looks at processes that might have ended with their pipe left open
LOOK = 5.0
# workers that may end before they are ready, one after the other, before the rest is given up
STILLBORN = 4


@dataclass(frozen=True, slots=True)
class Batch:
    """Outcomes in the order of the logs; `left` are those not done because the run was interrupted."""

    outcomes: list[LogOutcome]
    left: list[LogPath] = field(default_factory=list)
    notes: tuple[str, ...] = ()


def each(
    logs: Sequence[LogPath],
    run: Run,
    jobs: int | None,
    progress: Progress | None = None,
    work: Work | None = None,
) -> Batch:
    """Every log's outcome. Never raises for a log, and a KeyboardInterrupt leaves what was done.

    Raises UsageError where EXCEED_MEMORY is no size.

    jobs : processes, None for as many as cores where that is worth their start. progress : called with (done, all) for
    each log. work : instead of `pipeline.assess`; a function of a module, since it goes to other processes by its name.
    """
    from exceed.read.memory import available

    if work is None:
        from exceed.pipeline import assess

        work = assess
    count = min(jobs or cores(), len(logs))
    sizes = [size(log) for log in logs]
    free = available()
    if count <= 1 or (jobs is None and seconds(logs, sizes) < WORTH_SECONDS):
        return _here(logs, run, progress, work)
    return _Crew(logs, run, sizes, free // count, count, progress, work).go()


def cores() -> int:
    """Cores that this process may use."""
    return len(os.sched_getaffinity(0))


def size(log: LogPath) -> int:
    """Bytes of a log, 0 where that cannot be told (an object store)."""
    try:
        return os.path.getsize(log.location)
    except OSError:
        return 0


def seconds(logs: Sequence[LogPath], sizes: Sequence[int]) -> float:
    """About what the logs will take on one core."""
    text = sum(many * (1 if _plain(log) else PACKED) for log, many in zip(logs, sizes, strict=True))
    return LOG_SECONDS * len(logs) + text / BYTES_A_SECOND


def _plain(log: LogPath) -> bool:
    return not log.location.lower().endswith((".parquet", ".pq", ".parq", ".gz", ".bz2", ".zst", ".xz", ".zip"))


def _here(logs: Sequence[LogPath], run: Run, progress: Progress | None, work: Work) -> Batch:
    outcomes: list[LogOutcome] = []
    try:
        for log in logs:
            outcomes.append(work(log, run))
            if progress is not None:
                progress(len(outcomes), len(logs))
    except KeyboardInterrupt:
        return Batch(outcomes, list(logs[len(outcomes) :]))
    return Batch(outcomes)


@dataclass(eq=False, slots=True)
class _Worker:
    process: subprocess.Popen[bytes]
    connection: Connection
    ready: bool = False
    at: int | None = None

    def end(self) -> None:
        # it holds nothing that could be lost: what it has done has been sent
        with contextlib.suppress(OSError):
            self.connection.close()
        self.process.kill()
        self.process.wait()


class _Crew:
    """Workers, what is still to do, what was done."""

    def __init__(
        self,
        logs: Sequence[LogPath],
        run: Run,
        sizes: list[int],
        share: int,
        count: int,
        progress: Progress | None,
        work: Work,
    ) -> None:
        self.logs = logs
        self.progress = progress
        self.count = count
        self.blob = pickle.dumps((work, run))
        self.talks = run.settings.debug
        self.threads = max(1, cores() // count)
        # largest first: the last log to finish decides
        order = sorted(range(len(logs)), key=lambda index: (-sizes[index], index))
        weight = [sizes[i] * HEAVY * (1 if _plain(log) else PACKED) for i, log in enumerate(logs)]
        self.heavy = {index for index in order if weight[index] > share}
        self.light_queue = deque(index for index in order if index not in self.heavy)
        self.heavy_queue = deque(index for index in order if index in self.heavy)
        self.again: deque[int] = deque()
        self.tried: set[int] = set()
        self.workers: list[_Worker] = []
        self.stillborn = 0
        self.outcomes: dict[int, LogOutcome] = {}
        self.notes: list[str] = []

    def go(self) -> Batch:
        try:
            while len(self.outcomes) < len(self.logs):
                self._man()
                self._hand_out()
                self._collect()
        except KeyboardInterrupt:
            pass
        finally:
            for one in self.workers:
                one.end()
        done = [self.outcomes[index] for index in sorted(self.outcomes)]
        left = [log for index, log in enumerate(self.logs) if index not in self.outcomes]
        return Batch(done, left, tuple(self.notes))

    def _busy(self) -> list[_Worker]:
        return [one for one in self.workers if one.at is not None]

    def _waiting(self) -> int:
        return len(self.light_queue) + len(self.heavy_queue) + len(self.again)

    def _man(self) -> None:
        """As many workers as there is work for; with only second tries left one is enough."""
        wanted = min(self.count, len(self._busy()) + self._waiting())
        fresh: list[_Worker] = []
        while len(self.workers) < wanted and self.stillborn < STILLBORN:
            try:
                made = _Worker(*worker.start(self.threads, talks=self.talks))
            except OSError:
                self.stillborn += 1
                break
            self.workers.append(made)
            fresh.append(made)
        for made in fresh:
            # a worker that ended already is met by `_collect`
            with contextlib.suppress(OSError):
                made.connection.send_bytes(self.blob)
        if not self.workers and self.stillborn >= STILLBORN:
            self._give_up()

    def _give_up(self) -> None:
        for index in (*self.light_queue, *self.heavy_queue, *self.again):
            self._fail(index, "no process to read this log could be started", "a process that starts")
        self.light_queue.clear()
        self.heavy_queue.clear()
        self.again.clear()

    def _hand_out(self) -> None:
        for one in self.workers:
            if not one.ready or one.at is not None:
                continue
            index = self._next()
            if index is None:
                return
            one.at = index
            # if it has just ended, `_collect` finds out whose turn it was
            with contextlib.suppress(OSError):
                one.connection.send(self.logs[index])

    def _next(self) -> int | None:
        busy = {one.at for one in self._busy()}
        if self.heavy_queue and not busy & self.heavy:
            return self.heavy_queue.popleft()
        if self.light_queue:
            return self.light_queue.popleft()
        # a second try has the machine to itself
        if self.again and not busy and not self.heavy_queue:
            return self.again.popleft()
        return None

    def _collect(self) -> None:
        """Whatever has come in; waits for the first."""
        if not self.workers:
            return
        heard = wait([one.connection for one in self.workers], timeout=LOOK)
        for one in list(self.workers):
            if one.connection in heard:
                self._hear(one)
            elif one.process.poll() is not None:
                self._bury(one)

    def _hear(self, one: _Worker) -> None:
        try:
            if not one.ready:
                one.ready = one.connection.recv_bytes() == worker.READY
                self.stillborn = 0
                return
            outcome = one.connection.recv()
        except (EOFError, OSError):
            self._bury(one)
            return
        index, one.at = one.at, None
        if index is not None:
            if index in self.tried:
                self.notes.append(f"{self.logs[index].shown}: read at the second try, the first ended its process")
            self._done(index, outcome)

    def _bury(self, one: _Worker) -> None:
        """A worker has ended by itself: once its log is tried again alone, twice it is the log's own fault."""
        self.workers.remove(one)
        with contextlib.suppress(subprocess.TimeoutExpired):
            one.process.wait(timeout=1.0)
        code = one.process.poll()
        one.end()
        if not one.ready:
            self.stillborn += 1
        if one.at is None:
            return
        if one.at in self.tried:
            self._fail(one.at, f"the process that read this log {_ending(code)}, twice", "a log that fits into memory")
        else:
            self.tried.add(one.at)
            self.again.append(one.at)

    def _fail(self, index: int, what: str, expected: str) -> None:
        shown = self.logs[index].shown
        self._done(index, LogOutcome(shown, "failed", Problem(shown, what, expected, "scan it alone with --jobs 1")))

    def _done(self, index: int, outcome: LogOutcome) -> None:
        self.outcomes[index] = outcome
        if self.progress is not None:
            self.progress(len(self.outcomes), len(self.logs))


def _ending(code: int | None) -> str:
    """How a process ended, in words."""
    if code is None:
        return "stopped answering"
    if code >= 0:
        return f"ended with exit code {code} before it was done"
    with contextlib.suppress(ValueError):
        return f"was ended by the signal {signal.Signals(-code).name}"
    return f"was ended by the signal {-code}"
