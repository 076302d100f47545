"""Changes to good bytes: a few edits anywhere, of the kinds that break parsers, drawn by Hypothesis."""

from __future__ import annotations

import os
from typing import Any

from hypothesis import Phase
from hypothesis import strategies as st

# explaining a failure imports what warns
PHASES = (Phase.explicit, Phase.generate, Phase.shrink)

# numbers, words and marks that parsers of tables and clocks trip over
LOG_WORDS: tuple[bytes, ...] = (
    b"", b"nan", b"NaN", b"inf", b"-inf", b"1e308", b"-1e308", b"1e999", b"5e-324", b"-0", b"0", b"-1",
    b"99999999999999999999", b"1,5", b"1.2.3", b"0x1p3", b"--", b"n/a", b"null", b"true", b"\"", b"\"\"", b"'",
    b",", b",,,,", b";", b"\t", b"|", b"\n", b"\r", b"\r\n", b"\n\n", b"\0", b"\x1a", b"\x1b[2J", b"\xff",
    b"\xef\xbb\xbf", b"\xc3", b"\xe2\x80\xae", b"\xed\xa0\x80", b"#", b"# Registration: ZZ-X\n",
    b"0000-01-01T00:00:00Z", b"9999-12-31T23:59:60Z", b"2031-02-29", b"24:00:00", b"25:61:61", b"12:30",
    b"1e18", b"253402300800", b"time", b"NZ [g]", b"[kt]", b"[m/s]", b"g", b"=1+1", b"<b>", b"[red]", b"%s",
    b"9" * 400, b" " * 400,
)  # fmt: skip
# marks, tags, numbers and units that our YAML has to answer
YAML_WORDS: tuple[bytes, ...] = (
    b"", b"~", b"null", b"yes", b"no", b"12:30", b"0x10", b"1e3", b"nan g", b"inf kt", b"-0 g", b"1e999 kg",
    b"-9 kg", b"0 kt", b"99999999999999999999 ft", b"6 g", b"6", b"54 KIAS", b"54 KCAS", b"250 km/h IAS",
    b"100 %", b"6,5 g", b"6 kph", b"g", b"\"", b"'", b"|", b">", b"{", b"}", b"[", b"]", b"[[[[[[[[", b"{{{{",
    b"- ", b"- - - -", b": ", b":", b"? ", b"# ", b"&a ", b"*a", b"&a [*a]", b"<<: *a", b"!!int ",
    b"!!python/object:os.system ", b"---\n", b"...\n", b"%YAML 9.9\n", b"\t", b"\n", b"\r", b"\0", b"\x1b[2J",
    b"\xff", b"\xef\xbb\xbf", b"\xe2\x80\xae", b"\xed\xa0\x80", b"\xe2\x80\xa8", b"format: exceed-fleet/1\n",
    b"aircraft.load_factor.maximum", b"aircraft.", b"quantity: ", b"rate_of: ", b"times: ", b"over: mass",
    b"points: []", b"points: [[0 ft, 1 kt]]", b"x" * 400, b" " * 400, b"../../../etc/passwd", b"/dev/zero",
    b"**/*",
)  # fmt: skip


def examples(few: int) -> int:
    """How many examples: few, or as many times more as EXCEED_FUZZ says."""
    return few * int(os.environ.get("EXCEED_FUZZ", "1"))


def edits(words: tuple[bytes, ...]) -> st.SearchStrategy[list[tuple[Any, ...]]]:
    """A few edits; places are shares of the whole, so that they fit any length."""
    place = st.floats(0.0, 1.0)
    word = st.sampled_from(words)
    one = st.one_of(
        st.tuples(st.just("insert"), place, word),
        st.tuples(st.just("byte"), place, st.integers(0, 255)),
        st.tuples(st.just("drop"), place, st.integers(1, 400)),
        st.tuples(st.just("repeat"), place, st.integers(1, 400), st.integers(1, 40)),
        st.tuples(st.just("cut"), place),
        st.tuples(st.just("behead"), st.floats(0.0, 0.2)),
        st.tuples(st.just("word"), place, word),
        st.tuples(st.just("words"), place, word, st.integers(1, 60)),
        st.tuples(st.just("line"), place, place),
        st.tuples(st.just("drop line"), place),
        st.tuples(st.just("column"), place, word),
    )
    return st.lists(one, min_size=1, max_size=4)


def apply(data: bytes, changes: list[tuple[Any, ...]]) -> bytes:
    """The bytes after the edits, one after the other."""
    for kind, where, *how in changes:
        at = min(int(where * len(data)), max(len(data) - 1, 0))
        if kind == "insert":
            data = data[:at] + how[0] + data[at:]
        elif kind == "byte":
            data = data[:at] + bytes([how[0]]) + data[at + 1 :]
        elif kind == "drop":
            data = data[:at] + data[at + how[0] :]
        elif kind == "repeat":
            data = data[:at] + data[at : at + how[0]] * how[1] + data[at:]
        elif kind == "cut":
            data = data[:at]
        elif kind == "behead":
            data = data[at:]
        elif kind in ("word", "words"):
            for _ in range(how[1] if kind == "words" else 1):
                data, at = _replaced(data, at, how[0])
        elif kind in ("line", "drop line"):
            lines = data.split(b"\n")
            line = lines.pop(min(int(where * len(lines)), len(lines) - 1))
            if kind == "line":
                lines.insert(int(how[0] * len(lines)), line)
            data = b"\n".join(lines)
        elif kind == "column":
            data = _column(data, where, how[0])
    return data


_ENDS = b",;\t| \n\r"


def _replaced(data: bytes, at: int, word: bytes) -> tuple[bytes, int]:
    """The cell or word at a place replaced; the place of the next one a few lines on."""
    start = at
    while start > 0 and data[start - 1] not in _ENDS:
        start -= 1
    end = at
    while end < len(data) and data[end] not in _ENDS:
        end += 1
    data = data[:start] + word + data[end:]
    following = data.find(b"\n", start + len(word))
    return data, min(start + len(word) + 37 if following < 0 else following + 1 + (start % 7), max(len(data) - 1, 0))


def _column(data: bytes, where: float, word: bytes) -> bytes:
    """One cell of every line replaced."""
    lines = data.split(b"\n")
    mark = max(b",;\t|", key=data.count)
    separator = bytes([mark])
    for number, line in enumerate(lines):
        cells = line.split(separator)
        if len(cells) > 1:
            cells[int(where * (len(cells) - 1))] = word
            lines[number] = separator.join(cells)
    return b"\n".join(lines)
