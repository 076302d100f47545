"""What one cell of a text log can be: a number, a stamp, a word, nothing."""

from __future__ import annotations

import re

NUMBER_DOT = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?")
NUMBER_COMMA = re.compile(r"[+-]?(\d+(,\d*)?|,\d+)([eE][+-]?\d+)?")
GROUPED = re.compile(r"[+-]?\d{1,3}(?:(?P<mark>[,.'’\u00a0\u202f ])\d{3})(?:(?P=mark)\d{3})*(?:(?P<point>[.,])\d+)?")
WITH_UNIT = re.compile(r"([+-]?(?:\d+(?:[.,]\d*)?|[.,]\d+))\s*([A-Za-z°%µ][A-Za-z°%µ/²2]{0,6})")
STAMP = re.compile(
    r"\d{1,4}[-/. ](?:\d{1,2}|[A-Za-z]{3,9})[-/. ]\d{1,4}.*"  # a date, with or without a time
    r"|\d{1,2}:\d{2}(:\d{2}([.,:]\d+)?)?\s*([aApP][mM])?(\s*(Z|UTC|GMT|[+-]\d{1,2}:?\d{0,2}))?"  # a time of day
    r"|\d{8}[T ]?\d{4,6}(\.\d+)?Z?|\d{4}-\d{3}T.*|\d{1,2}[A-Za-z]{3}\d{2,4}.*"
)

# cells that mean "no value", compared without case; runs of one mark as well
_NONE_WORDS = (
    "nan",
    "na",
    "n/a",
    "#n/a",
    "n.a.",
    "null",
    "none",
    "nil",
    "inv",
    "invalid",
    "err",
    "error",
    "fail",
    "failed",
    "ncd",
    "missing",
    "no data",
    "nodata",
    "unavail",
    "unavailable",
    "not available",
    "unknown",
    "x",
    "?",
    "ovf",
    "inop",
    "bad",
    "#value!",
    "#num!",
    "#div/0!",
    "#ref!",
    "-nan",
    "nan(ind)",
    "-nan(ind)",
    "1.#qnan",
    "-1.#ind",
    "1.#ind",
    "not valid",
)
_MARKS = re.compile(r"[-*#?._=~/xX\u2013\u2014]+|[-.]*-[-.]*")
_KNOWN = frozenset(_NONE_WORDS)


def is_missing(cell: str, more: frozenset[str] = frozenset()) -> bool:
    """Does a cell say that there is no value? `more`: what a channels file adds, as written."""
    text = cell.strip().strip('"').strip()
    return not text or text in more or text.lower() in _KNOWN or bool(_MARKS.fullmatch(text))


def missing_spellings(seen: set[str]) -> list[str]:
    """Spellings for the parser, which compares whole cells: known ones in several cases, runs of marks, those seen."""
    out = {""}
    for word in _NONE_WORDS:
        out |= {word, word.upper(), word.capitalize(), word.title()}
    for mark in "-*#?._=":
        out |= {mark * count for count in range(1, 13)}
    out |= {"NaN", "-NaN", "-.-", "--.-", "-.--", "--.--", "---.-", "---.--"}
    out |= {" " * count for count in range(1, 33)}
    out |= seen
    # a single point or mark may pad: ` ---`
    return sorted(out)


def is_number(cell: str, decimal: str = ".") -> bool:
    text = cell.strip()
    return bool((NUMBER_DOT if decimal == "." else NUMBER_COMMA).fullmatch(text))


def form(cell: str) -> str:
    """number, stamp, empty or word: enough to tell data from headings."""
    if is_missing(cell):
        return "empty"
    text = cell.strip().strip('"').strip()
    if NUMBER_DOT.fullmatch(text) or NUMBER_COMMA.fullmatch(text) or GROUPED.fullmatch(text):
        return "number"
    if STAMP.fullmatch(text):
        return "stamp"
    if WITH_UNIT.fullmatch(text):
        return "number"
    return "word"
