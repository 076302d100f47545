"""Writes logs and golden outputs anew: `python tests/golden/regenerate.py` (then read the diff; it is for people)."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

HERE = Path(__file__).resolve().parent
if __name__ == "__main__":
    sys.path.insert(0, str(HERE.parent))

from golden.logs import LOGS  # noqa: E402

from exceed.report.table import render_table  # noqa: E402
from exceed.report.write import to_json  # noqa: E402

# name of the run -> folder in which it happens, arguments of `exceed scan`
RUNS: dict[str, tuple[str, list[str]]] = {
    "day": ("day", [".", "--mass", "860 kg"]),
    "bare": ("bare", ["bare.csv"]),
}
# of a terminal; in a pipe nothing is squeezed
WIDTHS: dict[str, int] = {"day": 80, "bare": 80}


def scanned(name: str, *more: str) -> str:
    """What one run prints, in an environment that says nothing."""
    folder, arguments = RUNS[name]
    kept = {key: value for key, value in os.environ.items() if key in ("PATH", "LD_LIBRARY_PATH", "VIRTUAL_ENV")}
    environment = {**kept, "LC_ALL": "C.UTF-8", "TZ": "UTC", "PYTHONUTF8": "1", "PYTHONHASHSEED": "0"}
    done = subprocess.run([sys.executable, "-m", "exceed", "scan", *arguments, *more], cwd=HERE / folder, check=False,
                          env=environment, capture_output=True, text=True, timeout=300)  # fmt: skip
    if done.returncode:
        raise RuntimeError(f"{name}: exit code {done.returncode}\n{done.stderr}")
    return done.stdout


def pinned(name: str) -> dict[str, Any]:
    """The summary of a run, with the clock, the version and the digests of built-in rules pinned."""
    summary: dict[str, Any] = json.loads(scanned(name, "--json", "-"))
    summary["created"] = "2031-05-02T18:00:00Z"
    summary["tool"]["version"] = "0"
    for one in summary["judged_with"]:
        if one["kind"] == "rules" and not one["path"].endswith(".yaml"):
            one["sha256"] = "0" * 64
    return summary


def outputs() -> dict[str, str]:
    """File name -> text, of every run."""
    made = {}
    for name in RUNS:
        summary = pinned(name)
        made[f"{name}.json"] = to_json(summary)
        made[f"{name}-piped.txt"] = scanned(name)
        made[f"{name}-80.txt"] = render_table(summary, width=WIDTHS[name])
    return made


def main() -> None:
    for name, written in LOGS.items():
        (HERE / name).write_text(written(), encoding="utf-8")
    for name, text in outputs().items():
        (HERE / name).write_text(text, encoding="utf-8")


if __name__ == "__main__":
    main()
