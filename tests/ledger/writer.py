"""Writers for the safety tests, run as a program: `writer.py kill|many|full FOLDER ...`. Not a test itself.

kill: forks one writer after the other, each recording one scan after the other and writing down every scan that was
committed, and kills each (SIGKILL) after a random time. many: records so many scans of its own, then ends. full:
records a large scan with little room left (the kernel's limit on a file's size), and prints what it was told.
"""

from __future__ import annotations

import os
import random
import resource
import signal
import sys
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

from exceed.errors import ExceedError
from exceed.ledger.record import record
from exceed.ledger.store import open_ledger
from ledger.days import event, recording, summary

# events in each recording: a recording with fewer would be half a row set
EVENTS = 5


def scan(name: str, hour: float) -> dict:
    rows = [event(100.0 + 10.0 * turn, 101.0 + 10.0 * turn) for turn in range(EVENTS)]
    return summary(recording(name, start=hour * 3600.0, length=3000.0, events=rows, registration="ZZ-NMA"))


def write(folder: Path, stem: str, many: int, first: int = 0) -> None:
    place = f"sqlite:///{folder / 'ledger.sqlite'}"
    with open(folder / "committed.txt", "a", buffering=1) as told:
        for turn in range(first, first + many):
            with open_ledger(place, create=True) as book:
                record(book, scan(f"{stem}-{turn}.csv", turn))
            told.write(f"{stem}-{turn}.csv\n")


def kill(folder: Path, kills: int, seed: int) -> None:
    chance = random.Random(seed)
    turn = 0
    for number in range(kills):
        child = os.fork()
        if child == 0:
            write(folder, f"w{number}", 10**6, first=number * 1000)
            os._exit(0)
        time.sleep(chance.uniform(0.0, 0.25))
        os.kill(child, signal.SIGKILL)
        os.waitpid(child, 0)
        turn += 1
    print(turn)


def full(folder: Path) -> None:
    notes = ["x" * 2000]
    rows = [event(10.0 * turn, 10.0 * turn + 1.0, notes=notes) for turn in range(300)]
    with open_ledger(f"sqlite:///{folder / 'ledger.sqlite'}") as book:
        room = (folder / "ledger.sqlite").stat().st_size + 50_000
        resource.setrlimit(resource.RLIMIT_FSIZE, (room, room))
        try:
            record(book, summary(recording("big.csv", events=rows)))
        except ExceedError as error:
            print(error)


if __name__ == "__main__":
    what, where, *rest = sys.argv[1:]
    if what == "kill":
        kill(Path(where), int(rest[0]), int(rest[1]))
    elif what == "full":
        full(Path(where))
    else:
        write(Path(where), rest[0], int(rest[1]), int(rest[2]))
