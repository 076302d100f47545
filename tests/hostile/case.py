"""A hostile file: its name, how it is made, what must come of it; and the good log that the others are bent from.

`Case.outcome` is `done` (read, perhaps in part), `failed` (refused, with the file's name), `skipped` (never opened,
with its name) or `folder` (no file). `Case.says` is a text that the output must hold beside the file's name.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

HEADING = "time [s],NZ [g],IAS [kt],PALT [ft]"


@dataclass(frozen=True, slots=True)
class Case:
    """One hostile file: its name in the corpus, how to make it, what must come of it."""

    name: str
    make: Callable[[Path], None]
    outcome: str
    says: str = ""


def rows(count: int = 400, rate: float = 8.0, start: float = 0.0) -> list[str]:
    """Rows of a calm flight that no limit is near."""
    return [
        f"{start + k / rate:.3f},{1.0 + 0.3 * math.sin(k / 7):.4f},{100 + 8 * math.sin(k / 31):.2f},{3000 + k}"
        for k in range(count)
    ]


def text(heading: str = HEADING, count: int = 400, **changed: str) -> str:
    """A good log as text; `changed` maps r12=... to another row 12."""
    lines = rows(count)
    for key, row in changed.items():
        lines[int(key[1:])] = row
    return "\n".join([heading, *lines]) + "\n"


def column(index: int, value: str, where: slice | None = None) -> str:
    """The good log with one column's cells replaced, in all rows or in some."""
    lines = rows()
    for k in range(*(where or slice(None)).indices(len(lines))):
        cells = lines[k].split(",")
        cells[index] = value
        lines[k] = ",".join(cells)
    return "\n".join([HEADING, *lines]) + "\n"


def holding(data: bytes | str) -> Callable[[Path], None]:
    """A maker that writes these bytes."""
    return lambda path: path.write_bytes(data if isinstance(data, bytes) else data.encode("utf-8", "surrogateescape"))
