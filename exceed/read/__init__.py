"""A log file becomes a Recording: find it, look at it, read what is wanted, settle what is open, judge its quality."""

from __future__ import annotations

import os
from collections.abc import Iterable, Mapping
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from exceed.core.recording import Recording
    from exceed.read.describing import LogFacts
    from exceed.read.find import LogPath, Skipped
    from exceed.read.look import Survey

__all__ = [
    "LogFacts",
    "LogPath",
    "Skipped",
    "Survey",
    "channels_file",
    "describe",
    "find_logs",
    "load",
    "read_log",
    "survey",
]

_WHERE = {"LogFacts": "describing", "LogPath": "find", "Skipped": "find", "Survey": "look"}


def __getattr__(name: str) -> Any:
    # numpy and pyarrow are loaded when something is read, not when this package is named
    if name in _WHERE:
        from importlib import import_module

        return getattr(import_module(f"exceed.read.{_WHERE[name]}"), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")


def survey(path: Any, *, channels: object | None = None, declared: Mapping[str, str] | None = None) -> Survey:
    """Look at a log without reading it; see `surveying.survey`."""
    import numpy as np

    from exceed.read.surveying import survey as look

    with np.errstate(over="ignore"):  # as in `load`
        return look(path, channels=channels, declared=declared)


def load(
    survey: Survey,
    wanted: set[str] | frozenset[str] | None = None,
    *,
    ranges: Mapping[str, tuple[float, float]] | None = None,
) -> Recording:
    """Read the columns of the wanted quantities; see `loading.load`."""
    import numpy as np

    from exceed.read.loading import load as read

    # a log may hold figures near 1e308; what overflows on the way is infinite, and told as out of range
    with np.errstate(over="ignore"):
        return read(survey, wanted, ranges=ranges)


def read_log(
    path: str | os.PathLike[str],
    wanted: set[str] | None = None,
    channels: object | None = None,
    *,
    declared: Mapping[str, str] | None = None,
    ranges: Mapping[str, tuple[float, float]] | None = None,
) -> Recording:
    """Survey and load in one. Raises LogError."""
    return load(survey(path, channels=channels, declared=declared), wanted, ranges=ranges)


def find_logs(paths: Iterable[str | os.PathLike[str]]) -> tuple[list[LogPath], list[Skipped]]:
    """Logs under paths, folders, patterns and addresses; see `find.find_logs`."""
    from exceed.read.find import find_logs as find

    return find(paths)


def describe(survey: Survey, recording: Recording) -> LogFacts:
    """What is in a log, as plain facts; see `describing.describe`."""
    from exceed.read.describing import describe as tell

    return tell(survey, recording)


def channels_file(survey: Survey, recording: Recording) -> str:
    """The text of a channels file to edit, open questions as comments; see `describing.channels_file`."""
    from exceed.read.describing import channels_file as write

    return write(survey, recording)
