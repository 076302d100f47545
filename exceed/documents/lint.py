"""Check any of our YAML files: every problem with its place, and advice where a file works but should be mended."""

from __future__ import annotations

import difflib
from pathlib import Path
from typing import Any

from exceed.core.quantities import QUANTITIES
from exceed.documents import source
from exceed.documents.build import KINDS
from exceed.documents.fields import nearest
from exceed.documents.rules import base_name
from exceed.documents.source import Document, Mapping, Scalar, Sequence
from exceed.errors import DocumentError, Problem


def kind_of_document(document: Document) -> str:
    """The kind that `format:` says. Raises DocumentError for anything but exceed-KIND/1."""
    node = document.root.entries.get("format")
    formats = {f"exceed-{kind}/1": kind for kind in KINDS}
    expected = f"one of {', '.join(sorted(formats))}"
    if node is None:
        do = "write it as first line; 'exceed template KIND' prints a file to start from"
        raise DocumentError(Problem(document.place(document.root), "key 'format' is missing", expected, do))
    said = document.format
    if said not in formats:
        near = nearest(said, formats)
        do = f"write '{near}' if that is meant" if near else "use one of these"
        raise DocumentError(Problem(document.place(node), f"'{said}' is not a format known here", expected, do))
    return formats[said]


def load_any(origin: Path | str | Document) -> Any:
    """Load a file by what its `format:` says. Raises DocumentError with all problems."""
    from exceed.documents.aircraft import load_aircraft
    from exceed.documents.build import open_document
    from exceed.documents.channels import load_channels
    from exceed.documents.fleet import load_fleet
    from exceed.documents.loading import load_loading
    from exceed.documents.rulebook import load_rules

    loaders = {
        "aircraft": load_aircraft,
        "rules": load_rules,
        "channels": load_channels,
        "loading": load_loading,
        "fleet": load_fleet,
    }
    document = open_document(origin)
    return loaders[kind_of_document(document)](document)


def check(origin: Path | str) -> tuple[tuple[Problem, ...], tuple[Problem, ...]]:
    """Errors and advice of one file, each in the order of the text. A file with advice only can be used."""
    from exceed.documents.build import open_document

    try:
        document = open_document(origin)
    except DocumentError as error:
        return error.problems, ()
    errors: tuple[Problem, ...] = ()
    try:
        load_any(document)
    except DocumentError as error:
        errors = error.problems
    return errors, tuple(advice(document))


def lint(origin: Path | str) -> list[Problem]:
    """All there is to say about one file: errors first, then advice. Empty: nothing."""
    errors, more = check(origin)
    return [*errors, *more]


def advice(document: Document) -> list[Problem]:
    """What works and should be mended all the same."""
    found = source.unquoted_dates(document)
    first = next(iter(document.root.entries), None)
    if first is not None and first != "format" and "format" in document.root.entries:
        place = document.place(document.root.keys["format"])
        found.append(Problem(place, "'format' is not the first key", "'format' in the first line", "move it up"))
    if document.format == "exceed-channels/1":
        found += _near_misses(document)
    return found


def _near_misses(document: Document) -> list[Problem]:
    """Any further name is allowed in a channels file; one letter beside a known one is most likely a slip."""
    found: list[Problem] = []
    rows = document.root.entries.get("channels")
    for row in rows.items if isinstance(rows, Sequence) else []:
        node = row.entries.get("quantity") if isinstance(row, Mapping) else None
        if not isinstance(node, Scalar) or base_name(node.text) in QUANTITIES:
            continue
        near = difflib.get_close_matches(node.text, QUANTITIES, n=1, cutoff=0.85)
        if near:
            text = f"'{node.text}' is a name of your own, and close to '{near[0]}'"
            do = f"write '{near[0]}' if that is meant"
            found.append(Problem(document.place(node), text, "a quantity, or another name", do))
    return found
