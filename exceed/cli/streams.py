"""The program's own output streams: a reader that has gone (`| head`) is no error, a full disk is one, said once."""

from __future__ import annotations

import io
import os
import sys
from typing import Any, TextIO

from exceed.errors import OutputError


class Outlet(io.FileIO):
    """A descriptor that takes everything: once its reader has gone, or once it has failed, the rest goes nowhere.

    So the exit code of a run is that of the run, whoever listens. `failed` holds what went wrong, for who must say it.
    """

    failed: OSError | None = None

    def __init__(self, descriptor: int, name: str) -> None:
        super().__init__(descriptor, "wb", closefd=False)
        self.shown = name

    def write(self, data: Any, /) -> int:
        """Write, or swallow. Raises OutputError once where the descriptor fails for another reason than its reader."""
        try:
            return super().write(data) or 0
        except BrokenPipeError:
            self._give_up()
        except OSError as error:
            self._give_up()
            self.failed = error
            from exceed.report.write import problem_of

            raise OutputError(problem_of(error, self.shown)) from None
        return memoryview(data).nbytes

    def _give_up(self) -> None:
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, self.fileno())
        os.close(nowhere)


def install() -> None:
    """Put outlets under stdout and stderr. A stream that was closed before the start becomes one that goes nowhere."""
    sys.stdout = _outlet(sys.stdout, "standard output")
    sys.stderr = _outlet(sys.stderr, "standard error")


def _outlet(stream: TextIO | None, name: str) -> TextIO:
    if stream is None:
        return open(os.devnull, "w", encoding="utf-8")
    try:
        descriptor = stream.fileno()
    except (OSError, ValueError):
        return stream  # somebody catches the output in memory
    stream.flush()
    return io.TextIOWrapper(
        io.BufferedWriter(Outlet(descriptor, name)),
        encoding=stream.encoding,
        errors=stream.errors,
        line_buffering=stream.isatty() or name == "standard error",
    )
