"""Commented starter files, one a kind of document; each lints clean."""

from __future__ import annotations

from collections.abc import Iterable
from importlib import resources

from exceed.documents.build import KINDS
from exceed.documents.fields import nearest
from exceed.errors import Problem, UsageError


def template(kind: str) -> str:
    """A complete, commented starter file. Raises UsageError for a kind that is not known."""
    check_kind(kind, KINDS)
    return resources.files(__name__).joinpath(f"{kind}.yaml").read_text(encoding="utf-8")


def check_kind(kind: str, kinds: Iterable[str]) -> None:
    """Raises UsageError, with the nearest, for a kind that is none of `kinds`."""
    known = sorted(kinds)
    if kind not in known:
        near = nearest(kind, known)
        do = f"write '{near}' if that is meant" if near else "use one of these"
        raise UsageError(Problem("", f"'{kind}' is not a kind of file", f"one of {', '.join(known)}", do))
