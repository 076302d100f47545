"""Stand-ins for the reading of a log, known to other processes by name: they end, linger, or just answer."""

from __future__ import annotations

import os
import signal
import time
from pathlib import Path

from exceed.core.outcome import LogOutcome
from exceed.read.find import LogPath

# a worker's folder for marks is said by the log itself: its root
ENDINGS = ("exits", "killed", "stopped", "out-of-memory", "raises")


def answer(log: LogPath, run: object) -> LogOutcome:
    """Done at once."""
    return LogOutcome(log.shown)


def end(log: LogPath, run: object) -> LogOutcome:
    """Ends its process in the way that the log is named for."""
    if "exits" in log.shown:
        os._exit(7)
    if "killed" in log.shown:
        os.kill(os.getpid(), signal.SIGKILL)
    if "stopped" in log.shown:
        # the pipe is gone, the process is not
        os.closerange(3, 64)
        time.sleep(300)
    if "out-of-memory" in log.shown:
        raise MemoryError
    if "raises" in log.shown:
        raise RuntimeError("a fault of the work itself")
    return answer(log, run)


def end_once(log: LogPath, run: object) -> LogOutcome:
    """Ends its process the first time that a log called `killed` is met."""
    mark = Path(log.root) / "met"
    if "killed" in log.shown and not mark.exists():
        mark.touch()
        os.kill(os.getpid(), signal.SIGKILL)
    return answer(log, run)


def linger(log: LogPath, run: object) -> LogOutcome:
    """A log called `slow` waits until all others are done, so it can only end if it blocks none of them."""
    folder = Path(log.root)
    if "slow" in log.shown:
        until = time.monotonic() + 60
        while len(list(folder.glob("*.done"))) < 8 and time.monotonic() < until:
            time.sleep(0.02)
        return LogOutcome(log.shown, notes=(f"{len(list(folder.glob('*.done')))} others done",))
    (folder / f"{log.shown}.done").touch()
    return answer(log, run)


def wait_for_ever(log: LogPath, run: object) -> LogOutcome:
    """A log called `slow` never ends, and one called `pause` until it is told; a mark says that it has begun."""
    folder = Path(log.root)
    if "slow" in log.shown:
        (folder / "begun").write_text(f"{os.getpid()}\n")
        time.sleep(300)
    if "pause" in log.shown:
        (folder / "pause-begun").touch()
        while not (folder / "go").exists():
            time.sleep(0.02)
    (folder / f"{log.shown}.done").touch()
    return answer(log, run)


def where(log: LogPath, run: object) -> LogOutcome:
    """Says which process it was."""
    return LogOutcome(log.shown, notes=(str(os.getpid()), os.getcwd()))


def wait_the_first_time(log: LogPath, run: object) -> LogOutcome:
    """A log called `slow` never ends in the process that meets it first."""
    if "slow" in log.shown:
        try:
            with (Path(log.root) / "begun").open("x") as mark:
                mark.write(f"{os.getpid()}\n")
        except FileExistsError:
            return answer(log, run)
        time.sleep(300)
    return answer(log, run)
