"""Many small logs: one process against several, in wall and in CPU seconds. Prints a table, judges nothing.

Run: python tests/benchmarks/many_logs.py [--copies 200] [--jobs 1 2]
Neighbours on the machine stretch the wall time; the critical path (the parent's own CPU and that of its busiest worker)
says what a machine of one's own would take.
"""

from __future__ import annotations

import argparse
import json
import os
import resource
import shutil
import subprocess
import sys
import tempfile
import time
from pathlib import Path

SAMPLES = Path(__file__).resolve().parents[2] / "sample_logs"
LOGS = ("zz-nma", "zz-nmc", "zz-nmj")


def many(folder: Path, copies: int) -> int:
    """Copies of the sample logs in turn, with the fleet's documents beside; gives their bytes."""
    for name in ("fleet.yaml", "aircraft", "channels", "loading"):
        source = SAMPLES / name
        (shutil.copytree if source.is_dir() else shutil.copy)(source, folder / name)
    logs = sorted(path for name in LOGS for path in (SAMPLES / name).iterdir())
    total = 0
    for number in range(copies):
        log = logs[number % len(logs)]
        target = folder / log.parent.name / f"{number:05d}-{log.name}"
        target.parent.mkdir(exist_ok=True)
        shutil.copy(log, target)
        total += log.stat().st_size
    return total


def measure(folder: Path, jobs: int, target: Path) -> None:
    """One scan in this process; prints a line of JSON."""
    from exceed import batch
    from exceed.cli.run import run_scan
    from exceed.settings import Settings

    workers: list[float] = []
    end = batch._Worker.end

    def ended(one: batch._Worker) -> None:
        stat = Path(f"/proc/{one.process.pid}/stat").read_text().rsplit(")", 1)[1].split()
        workers.append((int(stat[11]) + int(stat[12])) / os.sysconf("SC_CLK_TCK"))
        end(one)

    batch._Worker.end = ended  # type: ignore[method-assign]
    shown = {"ledger": None, "new_only": False, "quiet": True, "json": str(target), "html": None, "fail_at": None,
             "certainty": "possible", "units": "trade", "colour": False}  # fmt: skip
    before = time.monotonic()
    code = run_scan(Settings((str(folder),), jobs=jobs), shown)
    wall = time.monotonic() - before
    own = resource.getrusage(resource.RUSAGE_SELF)
    mine = own.ru_utime + own.ru_stime
    print(
        json.dumps(
            {
                "jobs": jobs, "code": code, "wall_s": round(wall, 1), "cpu_s": round(mine + sum(workers), 1),
                "critical_s": round(mine + max(workers, default=0.0), 1), "parent_mb": own.ru_maxrss // 1024,
                "worker_mb": resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss // 1024,
                "summary_bytes": target.stat().st_size,
            }
        )
    )  # fmt: skip


def main() -> None:
    """From the command line."""
    wishes = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    wishes.add_argument("--copies", type=int, default=200)
    wishes.add_argument("--jobs", type=int, nargs="+", default=[1, 2])
    wishes.add_argument("--one", nargs=3, help=argparse.SUPPRESS)
    asked = wishes.parse_args()
    if asked.one:
        measure(Path(asked.one[0]), int(asked.one[1]), Path(asked.one[2]))
        return
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name) / "day"
        folder.mkdir()
        print(f"{asked.copies} logs, {many(folder, asked.copies)} bytes")
        for jobs in asked.jobs:
            words = [sys.executable, __file__, "--one", str(folder), str(jobs), str(Path(name) / f"{jobs}.json")]
            print(subprocess.run(words, capture_output=True, text=True, check=True).stdout, end="")
        found = [json.loads((Path(name) / f"{jobs}.json").read_text()) for jobs in asked.jobs]
        same = all({**one, "created": ""} == {**found[0], "created": ""} for one in found)
        print("the summaries are the same" if same else "THE SUMMARIES DIFFER")


if __name__ == "__main__":
    main()
