"""Outputs onto the disk, whole or not at all, and the summary's JSON text."""

from __future__ import annotations

import contextlib
import json
import os
import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from exceed.errors import OutputError, Problem

# a value that fits is written on one line; an event always is, so that files of thousands stay quick and diff well
_LINE = 110
_ONE_LINE = frozenset({"events", "undecided", "assessment", "channels", "methods", "rejected", "extremes"})


def to_json(summary: dict[str, Any]) -> str:
    """The summary as JSON text: the same bytes for the same dict, an event a line, no NaN (ValueError)."""
    return "".join(_lines(summary, 0, False)) + "\n"


def _flat(node: Any) -> str:
    return json.dumps(node, ensure_ascii=False, allow_nan=False)


def _lines(node: Any, depth: int, rows: bool) -> Iterator[str]:
    pad = " " * (depth + 1)
    if isinstance(node, dict) and node and not rows:
        if depth > 1 and len(node) < 12:
            flat = _flat(node)
            if len(flat) <= _LINE:
                yield flat
                return
        for turn, (key, value) in enumerate(node.items()):
            yield ("{\n" if turn == 0 else ",\n") + pad + json.dumps(key, ensure_ascii=False) + ": "
            # `events` of an inspection or of the totals are no rows of events
            yield from _lines(value, depth + 1, False) if key not in _ONE_LINE else _rows(value, depth + 1)
        yield "\n" + " " * depth + "}"
    elif isinstance(node, list) and node:
        flat = _flat(node) if not isinstance(node[0], dict) else ""
        if flat and len(flat) <= _LINE:
            yield flat
            return
        for turn, value in enumerate(node):
            yield ("[\n" if turn == 0 else ",\n") + pad
            yield from _lines(value, depth + 1, False)
        yield "\n" + " " * depth + "]"
    else:
        yield _flat(node)


def _rows(node: Any, depth: int) -> Iterator[str]:
    if not isinstance(node, list) or not node:
        yield _flat(node)
        return
    pad = " " * (depth + 1)
    yield "[\n" + pad + (",\n" + pad).join(_flat(value) for value in node) + "\n" + " " * depth + "]"


def write_whole(target: str | os.PathLike[str], text: str | bytes, *, encoding: str = "utf-8") -> None:
    """Write a file whole: into a new file beside it, then put in its place; `-` is stdout.

    A lone surrogate (a file name that is no UTF-8) is written as an escape. Raises OutputError, and leaves no half
    file, where the folder is missing, not writable or full.
    """
    data = text if isinstance(text, bytes) else text.encode(encoding, "backslashreplace")
    if str(target) == "-":
        _to_stdout(data)
        return
    path = Path(target)
    temporary: str | None = None
    try:
        if path.is_dir():
            raise IsADirectoryError(21, "Is a directory")
        if path.exists() and not path.is_file():  # a pipe or a device cannot be replaced
            path.write_bytes(data)
            return
        place = Path(os.path.realpath(path))  # a link stays a link, its target is replaced
        handle, temporary = tempfile.mkstemp(prefix=f".{place.name[:40]}.", suffix=".part", dir=place.parent)
        with os.fdopen(handle, "wb") as stream:
            stream.write(data)
            stream.flush()
            os.fsync(stream.fileno())
        os.chmod(temporary, place.stat().st_mode & 0o777 if place.exists() else 0o666 & ~_umask())
        os.replace(temporary, place)
        temporary = None
    except (OSError, ValueError) as error:
        raise OutputError(problem_of(error, str(target))) from error
    finally:
        if temporary is not None:
            with contextlib.suppress(OSError):
                os.unlink(temporary)


def check_target(target: str | os.PathLike[str] | None) -> None:
    """Raise the OutputError that writing there would end in, as far as it can be foreseen: before the work is done."""
    if target is None or str(target) == "-":
        return
    path = Path(target)
    folder = Path(os.path.realpath(path)).parent
    error: OSError | None = None
    if path.is_dir():
        error = IsADirectoryError(21, "Is a directory")
    elif not folder.is_dir():
        error = FileNotFoundError(2, "No such file or directory")
    elif not os.access(path if path.exists() and not path.is_file() else folder, os.W_OK):
        error = PermissionError(13, "Permission denied")
    if error is not None:
        raise OutputError(problem_of(error, str(target)))


def problem_of(error: OSError | ValueError, target: str) -> Problem:
    """What to tell about an output that could not be written."""
    if isinstance(error, FileNotFoundError):
        return Problem(target, "the folder does not exist", "a file in a folder that is there", "make the folder first")
    if isinstance(error, IsADirectoryError):
        return Problem(target, "this is a folder", "the name of a file", "add a file name")
    if isinstance(error, PermissionError):
        return Problem(target, "not allowed to write here", "a folder you may write to", "choose another place")
    if isinstance(error, OSError) and error.errno == 28:
        return Problem(target, "the disk is full", "room for the whole file", "make room or choose another disk")
    reason = (error.strerror if isinstance(error, OSError) else None) or str(error) or type(error).__name__
    return Problem(target, f"cannot be written: {reason}", "a file that can be written", "choose another place")


def _to_stdout(data: bytes) -> None:
    try:
        buffer = getattr(sys.stdout, "buffer", None)
        if buffer is None:
            sys.stdout.write(data.decode("utf-8", "backslashreplace"))
        else:
            sys.stdout.flush()
            buffer.write(data)
        sys.stdout.flush()
    except BrokenPipeError:
        raise
    except OSError as error:
        raise OutputError(problem_of(error, "standard output")) from error


def _umask() -> int:
    mask = os.umask(0o022)
    os.umask(mask)
    return mask
