"""One large log: the whole program against a bare pyarrow read of the same columns. Prints a table, judges nothing.

Run: python tests/benchmarks/large_log.py [--rows 2000000] [--pairs 9] [--folder DIR]
Whole processes in interleaved pairs, the median of the pair ratios; CPU time and peak memory beside wall time.
"""

from __future__ import annotations

import argparse
import os
import statistics
import subprocess
import sys
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

TESTS = Path(__file__).resolve().parent.parent
AIRCRAFT = TESTS.parent / "sample_logs" / "aircraft" / "fenwick.yaml"
COLUMNS = ["TIME [s]", "NZ [g]", "IAS [kt]", "PALT [ft]", "ROLL [deg]", "FLAP [deg]", "P [deg/s]"]
BARE_CSV = (
    "import sys, pyarrow as pa, pyarrow.csv as c\n"
    f"names = {COLUMNS!r}\n"
    "types = {name: pa.float64() for name in names}\n"
    "t = c.read_csv(sys.argv[1], convert_options=c.ConvertOptions(include_columns=names, column_types=types))\n"
    "print(t.num_rows)\n"
)
BARE_PARQUET = f"import sys, pyarrow.parquet as q\nprint(q.read_table(sys.argv[1], columns={COLUMNS!r}).num_rows)\n"
HAND_PANDAS = (
    "import sys, pandas as pd\n"
    f"d = pd.read_csv(sys.argv[1], usecols={COLUMNS!r})\n"
    "n, v, f = d['NZ [g]'], d['IAS [kt]'], d['FLAP [deg]']\n"
    "masks = [n > 3.8, n < -1.52, v > 163, v > 128, (f > 1) & (v > 95)]\n"
    "print([int((m & ~m.shift(1, fill_value=False)).sum()) for m in masks])\n"
)


@dataclass(frozen=True)
class Run:
    wall: float
    cpu: float
    memory: float  # MB


def measured(command: list[str]) -> Run:
    """One whole process, with the operating system's own accounting."""
    begun = time.perf_counter()
    process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    _, status, usage = os.wait4(process.pid, 0)
    wall = time.perf_counter() - begun
    if os.waitstatus_to_exitcode(status) != 0:
        raise SystemExit(f"{' '.join(command[:4])} ... ended with {os.waitstatus_to_exitcode(status)}")
    return Run(wall, usage.ru_utime + usage.ru_stime, usage.ru_maxrss / 1024.0)


def pairs(ours: list[str], theirs: list[str], count: int) -> list[tuple[Run, Run]]:
    measured(ours), measured(theirs)  # the files into the cache, the bytecode onto the disk
    return [(measured(ours), measured(theirs)) for _ in range(count)]


def line(name: str, rows: list[tuple[Run, Run]]) -> str:
    def middle(values: list[float]) -> float:
        return statistics.median(values)

    wall = middle([a.wall / b.wall for a, b in rows])
    cpu = middle([a.cpu / b.cpu for a, b in rows])
    memory = middle([a.memory / b.memory for a, b in rows])
    return (
        f"{name:34s} {middle([a.wall for a, _ in rows]):7.2f} s {middle([b.wall for _, b in rows]):7.2f} s"
        f" {wall:6.2f} {cpu:6.2f} {memory:6.2f}   {middle([a.memory for a, _ in rows]):6.0f} MB"
    )


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--rows", type=int, default=2_000_000)
    parser.add_argument("--pairs", type=int, default=9)
    parser.add_argument("--folder", type=Path, default=Path(tempfile.gettempdir()) / "exceed-benchmark")
    given = parser.parse_args()
    marker = given.folder / f"made-{given.rows}"
    if not marker.exists():
        script = TESTS / "scenario" / "big_log.py"
        subprocess.run([sys.executable, str(script), str(given.folder), str(given.rows)], check=True, stdout=sys.stderr)
        marker.touch()
    python = sys.executable
    out = str(given.folder / "out.json")
    sets = [text for name in ("airframe", "handling", "aerobatic") for text in ("--rules", name)]
    print(f"{'':34s} {'exceed':>9s} {'other':>9s} {'wall':>6s} {'cpu':>6s} {'memory':>6s}   exceed's peak")
    for kind, bare in (("csv", BARE_CSV), ("parquet", BARE_PARQUET)):
        log = str(given.folder / f"big.{kind}")
        ours = [python, "-m", "exceed", "scan", log, "--aircraft", str(AIRCRAFT), *sets, "--json", out, "--quiet",
                "--registration", "ZZ-NMC", "--jobs", "1"]  # fmt: skip
        print(line(f"{kind}: bare read of 7 columns", pairs(ours, [python, "-c", bare, log], given.pairs)), flush=True)
        if kind == "csv":
            hand = pairs(ours, [python, "-c", HAND_PANDAS, log], max(given.pairs // 3, 1))
            print(line("csv: five limits by hand in pandas", hand), flush=True)
    nothing = [python, "-c", "pass"]
    help_text = [python, "-m", "exceed", "--help"]
    rows = pairs(help_text, nothing, given.pairs)
    more = statistics.median([a.wall - b.wall for a, b in rows])
    print(f"exceed --help: {more:.3f} s more than python -c pass")
    sample = str(TESTS.parent / "sample_logs" / "zz-nma" / "nma-0902.csv")
    one = [measured([python, "-m", "exceed", "scan", sample]).wall for _ in range(given.pairs)]
    print(f"one sample log: {statistics.median(one):.2f} s")


if __name__ == "__main__":
    main()
