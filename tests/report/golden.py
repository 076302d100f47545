"""Writes the golden texts anew: `python tests/report/golden.py` (then read the diff)."""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import Any

HERE = Path(__file__).parent
FOLDER = HERE / "golden"
if __name__ == "__main__":
    sys.path.insert(0, str(HERE.parent))

from exceed.report.describe import describe  # noqa: E402
from exceed.report.summary import summarise  # noqa: E402
from exceed.report.table import render_table  # noqa: E402
from exceed.report.write import to_json  # noqa: E402
from report import examples  # noqa: E402

# file name -> day, width, further arguments of render_table
TABLES: dict[str, tuple[str, int | None, dict[str, Any]]] = {
    "day-60.txt": ("day", 60, {}),
    "day-80.txt": ("day", 80, {}),
    "day-160-metric.txt": ("day", 160, {"units": "metric"}),
    "day-piped.txt": ("day", None, {}),
    "day-80-ascii-colour.txt": ("day", 80, {"unicode": False, "colour": True, "certainty_floor": "likely"}),
    "clean-80.txt": ("clean_day", 80, {}),
    "empty-80.txt": ("empty_day", 80, {}),
}


def table(name: str) -> str:
    """The table that a golden file should hold."""
    day, width, more = TABLES[name]
    return render_table(summarise(getattr(examples, day)()), width=width, **more)


# file name -> log, width
NOTES: dict[str, tuple[str, int | None]] = {
    "describe-80.txt": ("aerobatic", 80),
    "describe-piped.txt": ("aerobatic", None),
    "describe-bare-60.txt": ("bare", 60),
    "describe-failed-80.txt": ("failed", 80),
}


def note(name: str) -> str:
    """The description that a golden file should hold."""
    log, width = NOTES[name]
    return describe(getattr(examples, log)(), width=width)


def summary_text() -> str:
    """The example day's JSON, our version left out."""
    summary = summarise(examples.day())
    summary["tool"]["version"] = "0"
    return to_json(json.loads(json.dumps(summary)))


def main() -> None:
    FOLDER.mkdir(exist_ok=True)
    for name in TABLES:
        (FOLDER / name).write_text(table(name), encoding="utf-8")
    for name in NOTES:
        (FOLDER / name).write_text(note(name), encoding="utf-8")
    (FOLDER / "day.json").write_text(summary_text(), encoding="utf-8")


if __name__ == "__main__":
    main()
