"""The shape of a text log, found in its first block: delimiter, decimal mark, headings, units, facts, first row."""

from __future__ import annotations

import csv
import re
from collections import Counter
from dataclasses import dataclass
from typing import Any

from exceed.read.cells import GROUPED, form, is_missing
from exceed.read.container import Source, fail
from exceed.read.units_in_text import is_unit_cell, says_nothing, unit_in

DELIMITERS = (",", ";", "\t", "|", " ")
MOST_COLUMNS = 8192
LOOKED_AT = 400
_LINE = re.compile(r"\r\n|\n|\r")


@dataclass(frozen=True, slots=True)
class Layout:
    """How the text stands. `skip` lines come before the data; `sample` holds rows of cells of the first block."""

    delimiter: str
    decimal: str
    grouping: str
    squeeze: bool
    skip: int
    names: tuple[str, ...]
    units: tuple[str, ...]
    sources: tuple[str, ...]
    heading_rows: tuple[tuple[str, ...], ...]
    facts: tuple[tuple[str, str], ...]
    preamble: tuple[str, ...]
    sample: tuple[tuple[str, ...], ...]
    comment: str = ""
    uneven: bool = False
    notes: tuple[str, ...] = ()

    @property
    def width(self) -> int:
        return len(self.names)


def split(line: str, delimiter: str) -> list[str]:
    """Cells of one line; a blank as delimiter means any run of blanks."""
    if delimiter == " ":
        return [cell for cell in line.split(" ") if cell]
    if '"' not in line:
        return line.split(delimiter)
    return next(csv.reader([line], delimiter=delimiter), [])


def spread(rows: list[Any], most: int) -> list[Any]:
    """At most so many rows, as three stretches: single rows at even steps would all meet one phase of slow channels."""
    if len(rows) <= most:
        return rows
    size = most // 3
    middle = (len(rows) - size) // 2
    return rows[:size] + rows[middle : middle + size] + rows[-size:]


def layout(source: Source) -> Layout:
    """Find the shape of a text log. Raises LogError where there is no table."""
    text = source.text
    lines = _LINE.split(text)
    if not source.whole:
        if len(lines) < 2:
            raise fail(
                source.shown,
                f"no line ends within the first {len(source.head) // 1024} kB",
                expected="a table of one row a line",
                do="export the log as CSV again",
            )
        lines.pop()
    elif lines and not lines[-1]:
        lines.pop()
    delimiter, width = _delimiter(source, lines)
    if width > MOST_COLUMNS:
        raise fail(source.shown, f"has {width} columns", expected=f"at most {MOST_COLUMNS}", do="export fewer channels")
    rows = _rows(lines, delimiter)
    usual = _usual_forms(rows, width)
    start = _data_start(rows, usual, width)
    if start is None:
        raise fail(
            source.shown,
            "no rows of numbers were found",
            expected="a heading and rows of numbers",
            do="check that the export holds data, not only settings",
        )
    data = [row for row in (rows[i] for i in range(start, len(rows))) if _like(row, usual, width)]
    headings, above = _headings(rows, lines, start, width, usual)
    names, units, sources = _roles(headings, width)
    decimal, grouping = _marks(data, delimiter)
    comment = next(
        (m for m in ("#", "//", "%", ";") if delimiter != m and any(line.startswith(m) for line in lines[:start])), ""
    )
    preamble = tuple(lines[:above])
    short = sum(1 for row in data if len(row) < width)
    notes = [] if headings else ["no headings: columns are counted"]
    return Layout(
        delimiter,
        decimal,
        grouping,
        delimiter == " ",
        start,
        names,
        units,
        sources,
        tuple(tuple(h) for h in headings),
        (*facts_in(preamble, delimiter), *_facts_among(headings, names, delimiter)),
        preamble,
        tuple(tuple(c.strip() for c in row) for row in spread(data, LOOKED_AT)),
        comment,
        short > 0.01 * len(data) + 1,
        tuple(notes),
    )


def _rows(lines: list[str], delimiter: str) -> list[list[str]]:
    return [split(line, delimiter) for line in lines]


def _delimiter(source: Source, lines: list[str]) -> tuple[str, int]:
    """The delimiter under which the later lines are most even and most like data."""
    filled = [line for line in lines if line.strip()]
    tail = spread(filled[len(filled) // 3 :] if len(filled) > 30 else filled, 150)
    best = _most_even(tail)
    # a long preamble may outweigh the rows that the block still shows
    for last in (150, 30):
        if (best is None or best[0] < 0.5) and len(filled) > last:
            other = _most_even(filled[-last:])
            if other is not None and (best is None or other[0] > best[0]):
                best, tail = other, filled[-last:]
    if best is None:
        single = [form(line) for line in tail]
        if single and single.count("number") > 0.8 * len(single):
            return ",", 1
        raise fail(
            source.shown,
            "is not a table: no delimiter gives even rows of numbers",
            expected="CSV with commas, semicolons, tabs, bars or blanks, or Parquet",
            do="export the log as CSV",
        )
    return best[1], best[2]


def _most_even(tail: list[str]) -> tuple[float, str, int] | None:
    """(score, delimiter, width) of the delimiter that splits these lines best, None if none gives numbers."""
    best: tuple[float, str, int] | None = None
    for delimiter in DELIMITERS:
        if len(tail) > 3 and sum(delimiter in line for line in tail) < 0.3 * len(tail):
            continue
        split_rows = [split(line, delimiter) for line in tail]
        counts = Counter(len(row) for row in split_rows)
        # rows may lack their empty end: the widest common count is the table's
        common = [count for count, times in counts.items() if times >= max(1, 0.05 * len(tail))]
        width = max(common) if common else counts.most_common(1)[0][0]
        modal = counts.most_common(1)[0][0]
        if width < 2:
            continue
        even = [row for row in split_rows if len(row) in (width, modal)]
        cells = [cell for row in even[-40:] for cell in row[:300]]
        forms = Counter(form(cell) for cell in cells)
        data = forms["number"] + forms["stamp"] + 0.6 * forms["empty"]
        score = len(even) / len(tail) * data / max(1, len(cells))
        # more columns are better evidence, but only a little: 1,5;2,5 splits on both marks
        score *= 1.0 + 0.02 * min(width, 20)
        if forms["number"] + forms["stamp"] == 0:
            continue
        if best is None or score > best[0] * 1.001:
            best = (score, delimiter, width)
    return best


def _usual_forms(rows: list[list[str]], width: int) -> list[set[str]]:
    """For each column the forms that its cells usually have, from the later half of the block."""
    full = [row for row in rows if len(row) in (width, width - 1)] or [row for row in rows if len(row) > 1]
    later = spread(full[len(full) // 2 :] if len(full) > 6 else full[-4:], 96)
    counts = [Counter[str]() for _ in range(width)]
    for row in later:
        for place, cell in enumerate(row[:width]):
            counts[place][form(cell)] += 1
    usual = []
    for count in counts:
        count.pop("empty", None)
        total = sum(count.values())
        usual.append({kind for kind, times in count.items() if times >= 0.2 * total})
    return usual


def _like(row: list[str], usual: list[set[str]], width: int) -> bool:
    """Is a row like the data? Its filled cells have their column's usual form, and one is a number or stamp."""
    if not row or len(row) > width + 1 or (len(row) < 2 and width > 1):
        return False
    agree = against = firm = 0
    for place, cell in enumerate(row[:width]):
        kind = form(cell)
        if kind == "empty":
            continue
        if kind in usual[place] or (not usual[place] and kind == "number"):
            agree += 1
            firm += kind != "word"
        else:
            against += 1
    return firm > 0 and against <= 0.4 * (agree + against) and (firm > 1 or width < 3 or len(row) >= 0.5 * width)


def _data_start(rows: list[list[str]], usual: list[set[str]], width: int) -> int | None:
    for start, row in enumerate(rows):
        if _like(row, usual, width) and len(row) >= min(width, 2):
            after = [_like(later, usual, width) for later in rows[start + 1 : start + 6] if later and later != [""]]
            if sum(after) >= 0.5 * len(after):
                return start
    return None


def _headings(
    rows: list[list[str]], lines: list[str], start: int, width: int, usual: list[set[str]]
) -> tuple[list[list[str]], int]:
    """The one to four rows over the data that name its columns, and the line where they begin."""
    found: list[list[str]] = []
    above = start
    place = start - 1
    blanks = 0
    while place >= 0 and len(found) < 4:
        cells = list(rows[place])
        if cells and cells[0].lstrip().startswith(("#", "//", "%")):
            bare = re.sub(r"^\s*(#|//|%)+\s*", "", lines[place])
            cells = split(bare, _delimiter_of(rows, lines, place))
        filled = [cell for cell in cells if cell.strip()]
        if not filled:
            blanks += 1
            if found or blanks > 3:
                break
            place -= 1
            continue
        if len(filled) <= 2 and width != 2 and _PAIR.match(lines[place].strip()):
            break
        words = sum(form(cell) in ("word", "empty") or is_unit_cell(cell) for cell in filled)
        enough = len(cells) >= max(1, 0.6 * width) and (len(cells) <= width + 1 or len(filled) <= width + 1)
        if not enough or len(filled) < min(width, max(2, 0.15 * width)) or words < 0.5 * len(filled):
            break
        if found and len(filled) < 0.3 * width and not any(is_unit_cell(cell) for cell in filled):
            break
        if len(cells) < width and len(filled) == 2 and width > 3:
            break
        found.insert(0, [cell.strip().strip('"').strip() for cell in cells[:width]] + [""] * (width - len(cells)))
        above = place
        place -= 1
    return found, above


def _delimiter_of(rows: list[list[str]], lines: list[str], place: int) -> str:
    """The delimiter of the line below, seen from how it was split."""
    for delimiter in DELIMITERS:
        if rows[place] == split(lines[place], delimiter) and (len(rows[place]) > 1):
            return delimiter
    return ","


def _roles(headings: list[list[str]], width: int) -> tuple[tuple[str, ...], tuple[str, ...], tuple[str, ...]]:
    """Which heading row holds names, which units, which the sources."""
    from exceed.read.names import understood

    blank = ("",) * width
    if not headings:
        return tuple(f"column {place + 1}" for place in range(width)), blank, blank
    rows = list(headings)
    units: list[str] | None = None
    for row in reversed(rows[1:] if len(rows) > 1 else []):
        filled = [cell for cell in row if cell]
        real = sum(unit_in(cell) is not None for cell in filled)
        if (
            filled
            and sum(is_unit_cell(cell) for cell in filled) >= 0.6 * len(filled)
            and real >= 1
            and (sum(understood(cell) for cell in filled) <= real)
        ):
            units = row
            break
    rest = [row for row in rows if row is not units]
    scores = [
        (sum(understood(cell) for cell in row), len({c for c in row if c}), -place) for place, row in enumerate(rest)
    ]
    best = max(range(len(rest)), key=lambda place: scores[place])
    names = rest[best]
    others = [row for place, row in enumerate(rest) if place != best]
    sources = [" ".join(row[place] for row in others if row[place]) for place in range(width)]
    # a cell left empty under a name row takes what stands in the other rows, so that the column keeps a name
    named = [name or sources[place] or f"column {place + 1}" for place, name in enumerate(names)]
    return tuple(named), tuple("" if says_nothing(u) else u for u in (units or blank)), tuple(sources)


def _marks(data: list[list[str]], delimiter: str) -> tuple[str, str]:
    """Decimal mark and thousands mark, from all cells of the block."""
    comma = dot = 0
    firm_comma = firm_dot = 0
    group: Counter[str] = Counter()
    for row in spread(data, 300):
        for cell in row:
            text = cell.strip().strip('"').strip()
            if not text or not (text[0].isdigit() or text[0] in "+-.,") or ":" in text:
                continue
            grouped = GROUPED.fullmatch(text)
            if grouped and grouped.group("mark"):
                mark, point = grouped.group("mark"), grouped.group("point")
                if point and point != mark:
                    group[mark] += 1
                    firm_comma += point == ","
                    firm_dot += point == "."
                    continue
                if text.count(mark) > 1 or mark not in ",.":
                    group[mark] += 1
                    continue
            if re.fullmatch(r"[+-]?\d*,\d+([eE][+-]?\d+)?", text):
                comma += 1
                digits, _, after = text.lstrip("+-").partition(",")
                firm_comma += len(after) != 3 or len(digits) > 3 or digits in ("", "0")
            elif re.fullmatch(r"[+-]?\d*\.\d+([eE][+-]?\d+)?", text):
                dot += 1
                digits, _, after = text.lstrip("+-").partition(".")
                firm_dot += len(after) != 3 or len(digits) > 3 or digits in ("", "0")
    if firm_comma and not firm_dot:
        decimal = ","
    elif firm_dot or not comma:
        decimal = "."
    else:
        decimal = "," if not dot else "."
    marks = [mark for mark in group if mark != decimal]
    grouping = max(marks, key=lambda mark: group[mark]) if marks else ""
    if not grouping and decimal == "." and comma and firm_comma == 0:
        grouping = ","
    if not grouping and decimal == "," and dot and firm_dot == 0:
        grouping = "."
    return decimal, grouping


_PAIR = re.compile(r"^([^:=\d][^:=]{0,60}?)\s*[:=]\s*(.+)$")


def facts_in(lines: tuple[str, ...], delimiter: str) -> list[tuple[str, str]]:
    """`key: value`, `key;value` and `# key = value` of a preamble, in order."""
    found: list[tuple[str, str]] = []
    for line in lines:
        text = re.sub(r"^\s*(#|//|%|;|\*)+\s*", "", line).strip().strip('"').strip()
        if not text or len(text) > 2000:
            continue
        cells = [cell.strip().strip('"').strip() for cell in split(text, delimiter)] if delimiter != " " else [text]
        if len(cells) == 1 and not _PAIR.match(text):
            other = next((mark for mark in (";", "\t", "|", ",") if mark in text), None)
            cells = [cell.strip() for cell in split(text, other)] if other else cells
        while cells and not cells[-1]:
            cells.pop()
        single = [_PAIR.match(cell) for cell in cells]
        if cells and all(single):
            found += [(m.group(1).strip(), m.group(2).strip().strip('"')) for m in single if m]
        elif len(cells) >= 2 and len(cells) % 2 == 0 and all(cells[0::2]):
            found += [
                (key.rstrip(":= "), value)
                for key, value in zip(cells[0::2], cells[1::2], strict=True)
                if not is_missing(value)
            ]
        elif match := _PAIR.match(text):
            found.append((match.group(1).strip(), match.group(2).strip().strip('"').rstrip(delimiter).strip()))
    return found


def _facts_among(headings: list[list[str]], names: tuple[str, ...], delimiter: str) -> list[tuple[str, str]]:
    """A row of facts as wide as the table may be taken for a heading: its registration and serial count."""
    found = []
    for row in headings:
        if tuple(row) != names:
            pairs = facts_in((delimiter.join(row),), delimiter)
            found += [(key, value) for key, value in pairs if _REGISTRATION.search(key) or _SERIAL.search(key)]
    return found


_REGISTRATION = re.compile(
    r"\b(registration|reg(\.|n|istr)?|tail( ?(no|num|number|id))?|immatriculation|aircraft ?(id|ident|reg)|ac "
    r"?reg|a/c( ?reg)?|glider ?id)\b",
    re.I,
)
_SERIAL = re.compile(r"\b(serial|s/?n|ser\.?)( ?(no|number|nr))?\b", re.I)
_RECORDER = re.compile(r"recorder|logger|unit|device|box|dau|fdr|instrument", re.I)
_AIRFRAME = re.compile(r"aircraft|airframe|aeroplane|airplane|glider|a/c|engine|prop", re.I)


def registration_in(facts: tuple[tuple[str, str], ...]) -> str | None:
    """The registration that a preamble or metadata names."""
    for key, value in facts:
        plain = re.sub(r"[_\-]+", " ", key)
        if (_REGISTRATION.search(plain) and not re.search(r"time|date|type", plain, re.I)) or plain.strip().lower() in (
            "aircraft",
            "airplane",
            "aeroplane",
            "ident",
        ):
            text = value.strip()
            if re.fullmatch(r"[A-Za-z0-9]{1,6}([- ]?[A-Za-z0-9]{1,7})?", text) and any(
                ch.isalpha() or ch.isdigit() for ch in text
            ):
                if not _REGISTRATION.search(plain) and "-" not in text:
                    continue
                return text
    return None


def serial_in(facts: tuple[tuple[str, str], ...]) -> str | None:
    """The recorder's serial number that a preamble names."""
    loose = None
    for key, value in facts:
        plain = re.sub(r"[_\-]+", " ", key)
        if _SERIAL.search(plain) and not _AIRFRAME.search(plain):
            if _RECORDER.search(plain):
                return value.strip()
            loose = loose or value.strip()
    return loose
