"""Many logs: one after the other here, or over processes; the outcome is in the order of the logs either way."""

from __future__ import annotations

import os
from collections.abc import Callable
from typing import TYPE_CHECKING

from exceed.core.outcome import LogOutcome
from exceed.errors import LogError, Problem

if TYPE_CHECKING:
    from exceed.prepare import Run
    from exceed.read.find import LogPath

Progress = Callable[[int, int], None]

_run: Run | None = None


def each(logs: list[LogPath], run: Run, jobs: int | None, progress: Progress | None = None) -> list[LogOutcome]:
    """Every log's outcome. jobs : processes, None for as many as cores; fewer logs than two stay here."""
    count = min(jobs or len(os.sched_getaffinity(0)), len(logs))
    sizes = [_size(log) for log in logs]
    small = jobs is None and sum(sizes) < SMALL
    if count <= 1 or small:
        return _here(logs, run, progress)
    return _over_processes(logs, sizes, run, count, progress)


# starting a process with its imports costs about as much as assessing so many bytes of logs
SMALL = 16_000_000


def _here(logs: list[LogPath], run: Run, progress: Progress | None) -> list[LogOutcome]:
    from exceed.pipeline import assess

    outcomes = []
    for log in logs:
        outcomes.append(assess(log, run))
        if progress is not None:
            progress(len(outcomes), len(logs))
    return outcomes


def _over_processes(
    logs: list[LogPath], sizes: list[int], run: Run, count: int, progress: Progress | None
) -> list[LogOutcome]:
    """Over a pool of processes. A worker that dies costs the logs it was given a second try each, then only its own."""
    from concurrent.futures import ProcessPoolExecutor, as_completed
    from concurrent.futures.process import BrokenProcessPool
    from multiprocessing import get_context

    outcomes: dict[int, LogOutcome] = {}
    todo = list(range(len(logs)))
    # largest first: the last log to finish decides
    todo.sort(key=lambda index: (-sizes[index], index))
    alone = False
    while todo:
        batch = todo[:1] if alone else todo
        broken = False
        with ProcessPoolExecutor(
            1 if alone else count, get_context("spawn"), initializer=_start, initargs=(run,)
        ) as pool:
            futures = {pool.submit(_one, logs[index]): index for index in batch}
            for future in as_completed(futures):
                index = futures[future]
                try:
                    outcomes[index] = future.result()
                except BrokenProcessPool:
                    broken = True
                    continue
                if progress is not None:
                    progress(len(outcomes), len(logs))
        left = [index for index in todo if index not in outcomes]
        if broken and alone:
            # this one log killed its own process twice, with nothing else to blame
            index = left.pop(0)
            outcomes[index] = LogOutcome(
                logs[index].shown,
                "failed",
                Problem(logs[index].shown, "the process that read this log ended without a word",
                        "a log that fits into memory", "scan it alone with --jobs 1"),
            )  # fmt: skip
        alone = broken or (alone and bool(left))
        todo = left
    return [outcomes[index] for index in range(len(logs))]


def _size(log: LogPath) -> int:
    """Bytes of a log, 0 where that cannot be told (an object store)."""
    try:
        return os.path.getsize(log.location)
    except OSError:
        return 0


def _start(run: Run) -> None:
    global _run
    _run = run


def _one(log: LogPath) -> LogOutcome:
    from exceed.pipeline import assess

    if _run is None:
        raise LogError(Problem(log.shown, "the worker was started without a run"))
    return assess(log, _run)
