"""YAML text -> data with places: what is handed on, and what is refused where."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from exceed.documents import source
from exceed.documents.build import build
from exceed.documents.fields import Model
from exceed.documents.lint import lint
from exceed.documents.reading import MAXIMUM_BYTES, decode
from exceed.documents.source import Mapping, Scalar, Sequence, parse, plain
from exceed.errors import DocumentError

HEAD = "format: exceed-aircraft/1\n"


def test_every_scalar_is_handed_on_as_text() -> None:
    text = "a: 0123\nb: no\nc: 12:30\nd: 1e3\ne: 2031-05-02\nf: 0x10\ng: 1_000\nh: .5\ni: 'x'\nj: \"null\"\n"
    assert plain(parse(text).root) == {
        "a": "0123", "b": "no", "c": "12:30", "d": "1e3", "e": "2031-05-02", "f": "0x10", "g": "1_000", "h": ".5",
        "i": "x", "j": "null",
    }  # fmt: skip


@pytest.mark.parametrize("absent", ["", "~", "null", "Null", "NULL"])
def test_nothing_after_a_key_means_absent(absent: str) -> None:
    assert plain(parse(f"a: {absent}\nb: [x, {absent or 'null'}]\n").root) == {"b": ["x", None]}


def test_every_key_and_value_remembers_its_place() -> None:
    root = parse("first: 1\nsecond:\n  - {third: x}\n  - ünï: y\n").root
    assert (root.keys["second"].line, root.keys["second"].column) == (2, 1)
    listed = root.entries["second"]
    assert isinstance(listed, Sequence)
    inner = listed.items[0]
    assert isinstance(inner, Mapping)
    assert (inner.entries["third"].line, inner.entries["third"].column) == (3, 13)
    other = listed.items[1]
    assert isinstance(other, Mapping)
    value = other.entries["ünï"]
    assert isinstance(value, Scalar)
    # columns count characters, not bytes
    assert (value.line, value.column) == (4, 10)


def test_windows_line_ends_and_a_byte_order_mark_change_no_place() -> None:
    data = ("\ufeff" + HEAD + "mass: {empty: 6 kgg}\n").replace("\n", "\r\n").encode()
    assert [problem.place for problem in lint(decode(data, "f.yaml"))] == ["text:2:15"]


# (name, text, place, problem, expected, do)
REFUSED = [
    ("two documents", HEAD + "---\n" + HEAD, "2:1", "a second document starts here", "one document in a file",
     "put it in a file of its own, or remove the '---'"),
    ("a tag", HEAD + "type: !!python/object:os.system x\n", "2:7",
     "tag 'tag:yaml.org,2002:python/object:os.system' is not known", "plain YAML without tags", "remove the tag"),
    ("a duplicate key", HEAD + "type: a\nserial: b\ntype: c\n", "4:1", "key 'type' is there twice, first in line 2",
     "each key once", "remove one of them"),
    ("a decimal comma in braces", HEAD + "load_factor: [{maximum: 4,4 g, minimum: -2 g}]\n", "2:25",
     "'4,4 g' has a decimal comma", "a decimal point; inside braces and brackets a comma parts the values",
     "write '4.4 g'"),
    ("a decimal comma in brackets", HEAD + "loading: {envelope: [[640 kg, 0,9 m, 1.1 m]]}\n", "2:31",
     "'0,9 m' has a decimal comma", "a decimal point; inside braces and brackets a comma parts the values",
     "write '0.9 m'"),
    ("an unquoted per cent sign", "format: exceed-rules/1\nquantities: {torque: %}\nrules: []\n", "2:22",
     "'%' stands unquoted where a value starts", "a quoted per cent sign", "write '\"%\"' with its quotes"),
    ("a tab as indentation", HEAD + "mass:\n\tempty: 600 kg\n", "3:1", "a tab stands where blanks are due",
     "blanks for indentation", "replace the tab by blanks"),
    ("an open brace", HEAD + "mass: {empty: 1 kg\ntype: 2\n", "3:5",
     "the braces opened in line 2 are not closed, or a comma is missing", "valid YAML",
     "write '{key: value, key: value}'"),
    ("an open quote", HEAD + 'source: "abc\n', "2:9", "a quote is opened and never closed", "valid YAML",
     "close the quote"),
    ("a colon in text", HEAD + "source: a: b\n", "2:10", "a ': ' stands where none can be", "valid YAML",
     "quote the text if the colon belongs to it, else start a new line"),
    ("a key without a colon", HEAD + "mass\n", "2:1", "a ':' is missing after a key", "valid YAML",
     "write 'key: value'"),
    ("a colon without a blank", HEAD + "type:{a: b}\n", "2:1", "key 'type:{a' is not known here",
     "one of category, flaps, format, fuel_consumption, gear, limits, load_factor, loading, mach, mass, "
     "position_error, recorder, registration, rolling, serial, source, speeds, stall_speed, type, wing",
     "write a blank after the ':'"),
    ("a crooked indent", HEAD + "mass:\n  empty: 600 kg\n maximum_take_off: 900 kg\n", "4:2", "a key is due here",
     "valid YAML", "align the keys of a mapping in one column, as in 'key: value'"),
    ("a merge key", HEAD + "limits: &b {a: 1 g}\nmass: {<<: *b}\n", "3:8", "merge key '<<' is not read",
     "keys written out", "write the merged keys out"),
    ("a list as key", HEAD + "? [a, b]\n: c\n", "2:3", "a list or mapping stands where a key is due",
     "a key that is a word", "write 'key: value'"),
    ("an alias without anchor", HEAD + "type: *b\n", "2:7", "alias '*b' has no anchor before it", "'&b' further up",
     "write the value out"),
    ("an alias in itself", HEAD + "limits: &a {x: *a}\n", "2:16", "alias '*a' contains itself", "a value that ends",
     "write the value out"),
    ("a list as file", "- a\n- b\n", "1:1", "the file is no mapping of keys to values", "a first key 'format'",
     "'exceed template KIND' prints a file to start from"),
    ("an empty file", "# nothing\n\n", "1:1", "the file is empty", "a first key 'format'",
     "'exceed template KIND' prints a file to start from"),
    ("a control character", HEAD + "source: a\x07b\n", "2:10", "a control character (U+0007) stands here",
     "plain UTF-8 text", "remove it, or check that this is the right file"),
    ("deep flow nesting", HEAD + "type: " + "{a: " * 40 + "\n", "2:131", "more than 32 levels of nesting",
     "at most 32", "check that this is the right file"),
    ("very deep flow nesting", HEAD + "type: " + "[" * 100_000 + "\n", "2:1006", "this is nested too deeply",
     "valid YAML", "check that this is the right file"),
    ("deep block nesting", HEAD + "".join(" " * depth + "a:\n" for depth in range(60)), "34:33",
     "more than 32 levels of nesting", "at most 32", "check that this is the right file"),
    ("an unknown escape", HEAD + 'source: "\\q"\n', "2:10", "a backslash in double quotes starts an unknown escape",
     "valid YAML", "use single quotes"),
]  # fmt: skip


@pytest.mark.parametrize(("text", "place", "problem", "expected", "do"), [row[1:] for row in REFUSED],
                         ids=[row[0] for row in REFUSED])  # fmt: skip
def test_bad_text_is_refused_at_its_place(text: str, place: str, problem: str, expected: str, do: str) -> None:
    found = [row for row in lint(text) if row.problem == problem]
    assert found, [str(row) for row in lint(text)]
    assert (found[0].place, found[0].expected, found[0].do) == (f"text:{place}", expected, do)


@pytest.mark.parametrize("text", ['"\\e[31m"', '"\\u202e"', '"a\\0b"'])
def test_an_escape_cannot_smuggle_a_control_character_into_messages(text: str) -> None:
    found = lint(HEAD + f"type: {text}\n{text}: 1\n")
    assert [row.place for row in found if row.problem.startswith("an escape makes a control character (U+")] == [
        "text:2:7",
        "text:3:1",
    ]
    assert all(part.isprintable() for row in found for part in str(row).split("\n"))


def test_two_plain_numbers_in_brackets_are_no_decimal_comma() -> None:
    text = "a: [0,10]\nb: [0,0.5]\nc: [1 g,2 g]\nd: [1, 5 g]\ne: {x: 1,y: 2}\n"
    document = parse(text)
    assert document.problems == ()
    assert plain(document.root)["a"] == ["0", "10"]


def test_a_decimal_comma_in_a_plain_number_in_braces_is_told() -> None:
    (problem,) = lint(HEAD + "mach: {maximum_operating: 0,80}\n")
    assert (problem.place, problem.problem, problem.do) == (
        "text:2:27", "'0,80' has a decimal comma", "write '0.80'",
    )  # fmt: skip


def test_aliases_that_expand_hugely_are_refused_at_once() -> None:
    lines = ["a: &a [x, x, x, x, x, x, x, x, x]"]
    for before, here in zip("abcdefgh", "bcdefghi", strict=True):
        lines.append(f"{here}: &{here} [{', '.join([f'*{before}'] * 9)}]")
    (problem,) = lint("\n".join(lines) + "\n")
    assert problem.problem == "aliases make this expand to more values or levels than are read"
    assert problem.place == "text:5:4"


def test_a_modest_alias_is_read() -> None:
    text = "a: &a {x: 1 g}\nb: [*a, *a]\n"
    assert plain(parse(text).root) == {"a": {"x": "1 g"}, "b": [{"x": "1 g"}, {"x": "1 g"}]}


def test_too_many_values_are_refused() -> None:
    (problem,) = lint(HEAD + "a: [" + "x, " * 60_000 + "x]\n")
    assert problem.problem == "the file has more than 50000 values"


@pytest.mark.parametrize(
    ("data", "place", "problem"),
    [
        (b"\xff\xfef\x00", "f.yaml:1:1", "the text is UTF-16"),
        (b"format: x\nsource: caf\xe9\n", "f.yaml:2:12", "byte 0xe9 is no UTF-8 text"),
        (b"\x89PNG\r\n\x1a\n", "f.yaml:1:1", "byte 0x89 is no UTF-8 text"),
        (b"PK\x03\x04", "f.yaml:1:3", "a control character (U+0003) stands here"),
        (
            b"x" * (MAXIMUM_BYTES + 1),
            "f.yaml",
            f"more than {MAXIMUM_BYTES} bytes are too many for one of our YAML files",
        ),
    ],
)
def test_what_is_no_utf8_text_is_refused_at_its_place(data: bytes, place: str, problem: str) -> None:
    with pytest.raises(DocumentError) as caught:
        decode(data, "f.yaml")
    assert [(row.place, row.problem) for row in caught.value.problems] == [(place, problem)]


def test_a_file_that_is_not_there_or_a_folder_is_said(tmp_path: Path) -> None:
    missing = tmp_path / "none.yaml"
    assert [str(row) for row in lint(missing)] == [
        f"{missing}: there is no such file\n  expected: a YAML file\n  do: check the path"
    ]
    assert [row.problem for row in lint(tmp_path)] == ["this is a folder"]
    assert next(row.problem for row in lint(tmp_path / ("x" * 5000))).startswith("the file cannot be read: ")
    big = tmp_path / "big.yaml"
    big.write_bytes(b"#" * (MAXIMUM_BYTES + 1))
    assert [row.problem for row in lint(big)] == [
        f"the file has {MAXIMUM_BYTES + 1} bytes, too many for one of our YAML files"
    ]


def test_an_unquoted_date_is_read_and_lint_says_to_quote_it() -> None:
    text = HEAD + "recorder:\n  accelerometer: {calibrated: 2031-01-10}\n"
    assert [str(row) for row in lint(text)] == [
        'text:3:31: date 2031-01-10 is not quoted\n  expected: "2031-01-10"\n'
        "  do: quote it, so that every YAML reader keeps it as written"
    ]
    assert lint(text.replace("2031-01-10", '"2031-01-10"')) == []


def test_a_format_that_is_not_the_first_key_is_read_and_lint_says_so() -> None:
    text = "type: Larkspur\n" + HEAD
    assert [(row.place, row.problem) for row in lint(text)] == [("text:2:1", "'format' is not the first key")]
    assert lint(HEAD + "type: Larkspur\n") == []
    # without the key there is nothing to move
    assert [row.problem for row in lint("type: Larkspur\n")] == ["key 'format' is missing"]


def test_the_digest_is_that_of_the_bytes(tmp_path: Path) -> None:
    import hashlib

    file = tmp_path / "a.yaml"
    file.write_bytes(b"a: b\r\n")
    assert source.load(file).sha256 == hashlib.sha256(b"a: b\r\n").hexdigest()


@settings(deadline=None, max_examples=200)
@given(st.text(alphabet=" \n\t:-{}[]&*!|>'\"%@`#,?ab1g.~", max_size=60))
@example("a: &a\n  b: *a\n")
@example("? \n")
@example("{a: 1,1 g}")
@example("[1,1]: 2")
@example("a: !<x> y")
def test_any_text_gives_data_or_problems_with_words(text: str) -> None:
    try:
        document = parse(text)
    except DocumentError as error:
        problems = error.problems
        assert problems
    else:
        plain(document.root)
        problems = document.problems
    for problem in problems:
        assert problem.place.startswith("text")
        assert problem.problem
        assert problem.do


def test_a_model_that_fails_for_no_listed_reason_cannot_pass_silently() -> None:
    class Tiny(Model):
        format: str
        number: int

    with pytest.raises(DocumentError) as caught:
        build(Tiny, parse("format: exceed-rules/1\nnumber: abc\n"), "rules")
    assert [row.place for row in caught.value.problems] == ["text:2:9"]
