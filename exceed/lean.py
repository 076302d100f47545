"""Keeps pandas out of the processes that are ours alone: the command line and its workers."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from importlib.machinery import ModuleSpec
from types import ModuleType


class _NotHere:
    """Finds nothing, and says of pandas that it is not installed."""

    @staticmethod
    def find_spec(name: str, path: Sequence[str] | None, target: ModuleType | None = None) -> ModuleSpec | None:
        if name == "pandas":
            raise ModuleNotFoundError("pandas is not used here", name=name)
        return None


def without_pandas() -> None:
    """From here on `import pandas` fails.

    For the first array that it makes, pyarrow imports pandas if it can, to know its series when it meets one. That
    takes a third of a worker's start, and no log needs it. Never called in a process that others program in.
    """
    if "pandas" not in sys.modules and _NotHere not in sys.meta_path:
        sys.meta_path.insert(0, _NotHere)
