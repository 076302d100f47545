"""A log file becomes a Recording: find it, look at it, read what is wanted, settle what is open, judge its quality."""

from __future__ import annotations

import os
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from exceed.core.recording import Recording
    from exceed.read.look import Survey

__all__ = ["channels_file", "describe", "find_logs", "load", "read_log", "survey"]


def survey(path: Any, *, channels: object | None = None, declared: Mapping[str, str] | None = None) -> Survey:
    """Look at a log without reading it; see `surveying.survey`."""
    from exceed.read.surveying import survey as look

    return look(path, channels=channels, declared=declared)


def load(
    survey: Survey, wanted: set[str] | frozenset[str] | None = None, *, ranges: Mapping[str, tuple[float, float]] | None = None
) -> Recording:
    """Read the columns of the wanted quantities; see `loading.load`."""
    from exceed.read.loading import load as read

    return read(survey, wanted, ranges=ranges)


def read_log(
    path: str | os.PathLike[str], wanted: set[str] | None = None, channels: object | None = None, *,
    declared: Mapping[str, str] | None = None, ranges: Mapping[str, tuple[float, float]] | None = None,
) -> Recording:  # fmt: skip
    """Survey and load in one. Raises LogError."""
    return load(survey(path, channels=channels, declared=declared), wanted, ranges=ranges)
