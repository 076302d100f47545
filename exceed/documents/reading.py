"""Bytes of a YAML file -> clean text, and the parser's complaints in our words."""

from __future__ import annotations

import os
import re
from pathlib import Path
from typing import Any

import yaml

from exceed.errors import DocumentError, Problem

MAXIMUM_BYTES = 2_000_000

# control characters, lone surrogates, and marks that turn the direction of writing
NOT_TEXT = re.compile(
    "[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x84\x86-\x9f\u202a-\u202e\u2066-\u2069\ud800-\udfff\ufeff\ufffe\uffff]"
)


def read_text(path: Path | str, name: str | None = None) -> tuple[str, bytes]:
    """Text and bytes of a file. Raises DocumentError for what is not there or is no UTF-8 text."""
    shown = name or str(path)
    path = Path(path)
    try:
        if path.is_dir():
            raise DocumentError(Problem(shown, "this is a folder", "a YAML file", "name the file in it"))
        size = path.stat().st_size
        if size > MAXIMUM_BYTES:
            raise DocumentError(
                Problem(
                    shown,
                    f"the file has {size} bytes, too many for one of our YAML files",
                    f"at most {MAXIMUM_BYTES} bytes",
                    "check that this is the right file",
                )
            )
        with open(path, "rb", opener=_unblocked) as stream:
            data = stream.read(MAXIMUM_BYTES + 1)
    except FileNotFoundError:
        raise DocumentError(Problem(shown, "there is no such file", "a YAML file", "check the path")) from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or "the name is not possible"
        raise DocumentError(
            Problem(
                shown,
                f"the file cannot be read: {reason}",
                "a readable YAML file",
                "check the path and its permissions",
            )
        ) from error
    return decode(data, shown), data


def _unblocked(path: str, flags: int) -> int:
    """A descriptor of a file; of a pipe into which nobody writes too, which then reads as empty instead of for ever."""
    descriptor = os.open(path, flags | os.O_NONBLOCK)
    os.set_blocking(descriptor, True)
    return descriptor


def decode(data: bytes, name: str) -> str:
    """Bytes as text. Raises DocumentError with the place for anything but clean UTF-8."""
    if len(data) > MAXIMUM_BYTES:
        raise DocumentError(
            Problem(
                name,
                f"more than {MAXIMUM_BYTES} bytes are too many for one of our YAML files",
                f"at most {MAXIMUM_BYTES} bytes",
                "check that this is the right file",
            )
        )
    save = "save the file as UTF-8 text"
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        raise DocumentError(Problem(f"{name}:1:1", "the text is UTF-16", "UTF-8 text", save))
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        before = data[: error.start].decode("utf-8-sig", errors="replace")
        place = f"{name}:{_position(before)}"
        raise DocumentError(
            Problem(place, f"byte 0x{data[error.start]:02x} is no UTF-8 text", "UTF-8 text", save)
        ) from None
    return clean(text, name)


def clean(text: str, name: str) -> str:
    """The text itself. Raises DocumentError with the place of the first character that no YAML text may have."""
    found = NOT_TEXT.search(text)
    if found:
        raise DocumentError(
            Problem(
                f"{name}:{_position(text[: found.start()])}",
                f"a control character (U+{ord(found.group()):04X}) stands here",
                "plain UTF-8 text",
                "remove it, or check that this is the right file",
            )
        )
    return text


def _position(before: str) -> str:
    line = before.count("\n") + 1
    return f"{line}:{len(before) - (before.rfind(chr(10)) + 1) + 1}"


# what the parser says -> our words, and what to do
_SYNTAX: tuple[tuple[str, str, str], ...] = (
    (
        "mapping values are not allowed",
        "a ': ' stands where none can be",
        "quote the text if the colon belongs to it, else start a new line",
    ),
    ("cannot start any token", "a character stands here that cannot start a value", "quote the value"),
    (
        "did not find expected ',' or '}'",
        "the braces are not closed, or a comma is missing",
        "write '{key: value, key: value}'",
    ),
    (
        "did not find expected ',' or ']'",
        "the brackets are not closed, or a comma is missing",
        "write '[value, value]'",
    ),
    ("did not find expected key", "a key is due here", "align the keys of a mapping in one column, as in 'key: value'"),
    (
        "did not find expected '-' indicator",
        "a list item is due here",
        "start every item of the list with '- ' in one column",
    ),
    ("could not find expected ':'", "a ':' is missing after a key", "write 'key: value'"),
    ("found unexpected end of stream", "a quote is opened and never closed", "close the quote"),
    ("did not find expected node content", "a value is due here", "write the value"),
    ("block sequence entries are not allowed", "a list item cannot stand here", "start the list on a line of its own"),
    ("found unknown escape character", "a backslash in double quotes starts an unknown escape", "use single quotes"),
    ("found duplicate anchor", "an anchor is there twice", "give each anchor its own name"),
    ("found undefined tag handle", "a tag is not known", "remove the tag"),
    (
        "did not find expected <document start>",
        "text follows after the end of the document",
        "keep one document in a file",
    ),
    ("exceeded maximum nesting depth", "this is nested too deeply", "check that this is the right file"),
    ("found undefined alias", "an alias has no anchor before it", "write the value out"),
)


def syntax(error: yaml.YAMLError, name: str, text: str) -> Problem:
    """What the parser complains about, in our words, at the place where it can be mended."""
    mark: Any = getattr(error, "problem_mark", None)
    start: Any = getattr(error, "context_mark", None)
    said = str(getattr(error, "problem", "") or "")
    if mark is None:
        return Problem(name, "this is no YAML text", "YAML", "check that this is the right file")
    # where it begins is where it can be mended
    if start is not None and ("unexpected end of stream" in said or "could not find expected ':'" in said):
        mark = start
    place = f"{name}:{mark.line + 1}:{mark.column + 1}"
    lines = text.splitlines()
    line = lines[mark.line] if mark.line < len(lines) else ""
    at = line[mark.column : mark.column + 1]
    if at == "%":
        return Problem(
            place, "'%' stands unquoted where a value starts", "a quoted per cent sign", "write '\"%\"' with its quotes"
        )
    if at == "\t" or "\t" in line[: len(line) - len(line.lstrip())]:
        return Problem(
            place, "a tab stands where blanks are due", "blanks for indentation", "replace the tab by blanks"
        )
    for words, ours, do in _SYNTAX:
        if words in said:
            if at and "character" in ours:
                ours += f" ('{at}')"
            if ours.startswith("the br") and start is not None:
                ours = ours.replace("are not closed", f"opened in line {start.line + 1} are not closed")
            return Problem(place, ours, "valid YAML", do)
    return Problem(
        place, "the text is no valid YAML here", "valid YAML", "check quotes, brackets and indentation near here"
    )
