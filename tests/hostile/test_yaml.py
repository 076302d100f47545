"""YAML that nobody should hand to a reader of ours: each file is answered by place, and nothing in it is obeyed.

The kinds of trap are those that are common knowledge of YAML (alias bombs, tags that call functions, merge keys,
recursion), from memory.
"""

from __future__ import annotations

import os
import re
from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from exceed.documents.lint import check
from exceed.documents.templates import template
from hostile import bounds, mutations

HEAD = "format: exceed-rules/1\ntitle: T\n"
SAMPLES = Path(__file__).resolve().parents[2] / "sample_logs"
PLACE = re.compile(r"(?::\d+:\d+)?\Z")


def laughs() -> str:
    """A list of nine, nine times over, nine levels deep: 387 million words."""
    lines = ["a: &a [x,x,x,x,x,x,x,x,x]"]
    lines += [f"{chr(98 + n)}: &{chr(98 + n)} [{','.join(['*' + chr(97 + n)] * 9)}]" for n in range(8)]
    return HEAD + "\n".join(lines) + "\n"


def rule(number: int) -> str:
    return f"  - {{id: r{number}, quantity: load_factor, limit: 6 g, above: {{caution: 100 %}}}}\n"


# name -> text, what a problem says behind the file's name
TRAPS: dict[str, tuple[str | bytes, str]] = {
    "alias bomb": (laughs(), ":7:4: aliases make this expand to more values or levels than are read"),
    "lists 100,000 deep": (HEAD + "rules: " + "[" * 100_000, ":3:1007: this is nested too deeply"),
    "mappings 50,000 deep": (HEAD + "rules: " + "{a: " * 50_000, ":3:132: more than 32 levels of nesting"),
    "dashes 50,000 deep": (HEAD + "rules:\n" + "- " * 50_000 + "1\n", ":4:63: more than 32 levels of nesting"),
    "a list in itself": (HEAD + "rules: &a [*a]\n", ":3:12: alias '*a' contains itself"),
    "merge keys": (
        HEAD + "rules:\n  - <<: {id: x}\n    <<: {id: y}\n",
        ":4:5: merge key '<<' is not read",
    ),
    "a tag that calls a function": (
        "!!python/object/new:os.system [touch owned]\n",
        ":1:1: tag 'tag:yaml.org,2002:python/object/new:os.system' is not known",
    ),
    "two documents": (HEAD + "rules:\n" + rule(1) + "---\n" + HEAD, ":5:1: a second document starts here"),
    "a key twice": (HEAD + "title: U\nrules:\n" + rule(1), ":3:1: key 'title' is there twice, first in line 2"),
    "a tab": (HEAD + "rules:\n\t- id: x\n", ":4:1: a tab stands where blanks are due"),
    "UTF-16": ((HEAD + "rules: []\n").encode("utf-16"), ":1:1: the text is UTF-16"),
    "no UTF-8": (HEAD.encode() + b"rules: \xff\xfe\n", ":3:8: byte 0xff is no UTF-8 text"),
    "a NUL": (HEAD + "rules: \0\n", ":3:8: a control character (U+0000) stands here"),
    "a terminal's escape": (HEAD + "\x1b[31mx: 1\n", ":3:1: a control character (U+001B) stands here"),
    "an escaped escape": (HEAD + '"\\e[31mx": 1\n', ":3:1: an escape makes a control character (U+001B) here"),
    "text that runs backward": (HEAD + "x: \u202e1\n", ":3:4: a control character (U+202E) stands here"),
    "5 MB": (HEAD + "source: " + "x" * 5_000_000, ": the file has 5000040 bytes, too many for one of our YAML files"),
    "50,000 keys": (
        HEAD + "".join(f"k{n}: 1\n" for n in range(50_000)),
        ":25000:9: the file has more than 50000 values",
    ),
    "20,000 rules": (
        HEAD + "rules:\n" + "".join(map(rule, range(20_000))),
        ":4548:60: the file has more than 50000 values",
    ),
    "nothing": ("", ":1:1: the file is empty"),
    "null": ("~\n", ":1:1: the file is empty"),
    "a number": ("7\n", ":1:1: the file is no mapping of keys to values"),
    "a list": ("- 1\n", ":1:1: the file is no mapping of keys to values"),
    "no format": ("title: x\n", ":1:1: key 'format' is missing"),
    "another format": ("format: exceed-rules/2\n", ":1:9: 'exceed-rules/2' is not a format known here"),
}


@pytest.mark.parametrize("name", TRAPS)
def test_a_trap_is_answered_with_its_place(tmp_path: Path, name: str) -> None:
    text, said = TRAPS[name]
    path = tmp_path / "x.yaml"
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    problems, _ = check(path)
    assert f"{path}{said}" in [str(problem).split("\n")[0] for problem in problems]
    for problem in problems:
        assert problem.place.startswith(str(path))
        assert problem.expected
        assert problem.do
    assert not Path("owned").exists()


NO_FILES: dict[str, tuple[Callable[[Path], None], str]] = {
    "folder": (lambda path: path.mkdir(), "this is a folder"),
    "pipe": (lambda path: os.mkfifo(path), "the file is empty"),
    "zeros without end": (lambda path: path.symlink_to("/dev/zero"), "more than 2000000 bytes are too many"),
    "noise without end": (lambda path: path.symlink_to("/dev/urandom"), "more than 2000000 bytes are too many"),
    "link to itself": (lambda path: path.symlink_to(path.name), "the file cannot be read: Too many levels"),
    "link to nothing": (lambda path: path.symlink_to("nowhere"), "there is no such file"),
}


def test_what_is_no_file_is_said_and_nothing_waits_or_fills_the_memory(tmp_path: Path) -> None:
    for name, (make, _) in NO_FILES.items():
        make(tmp_path / f"{name}.yaml")
    (tmp_path / "a.csv").write_text("time,NZ\n")
    names = [f"{name}.yaml" for name in NO_FILES]
    done = bounds.run("-m", "exceed", "lint", *names, folder=tmp_path, seconds=30)
    assert (done.returncode, done.stderr) == (2, b"")
    for name, (_, said) in NO_FILES.items():
        assert re.search(rf"^{name}\.yaml(:1:1)?: {said}", done.stdout.decode(), re.M), name
    for name in NO_FILES:
        done = bounds.run("-m", "exceed", "scan", "a.csv", "--rules", f"./{name}.yaml", folder=tmp_path, seconds=30)
        assert (done.returncode, done.stdout) == (2, b""), name


def test_a_pipe_that_somebody_writes_into_is_read(tmp_path: Path) -> None:
    reading, writing = os.pipe()
    os.write(writing, template("rules").encode())
    os.close(writing)
    problems, _ = check(Path(f"/dev/fd/{reading}"))
    os.close(reading)
    assert problems == ()


BASES = {
    **{kind: template(kind).encode() for kind in ("aircraft", "rules", "channels", "loading", "fleet")},
    **{path.stem: path.read_bytes() for path in sorted((SAMPLES / "aircraft").glob("*.yaml"))},
    **{path.stem: path.read_bytes() for path in sorted((SAMPLES.parent / "rules").glob("*.yaml"))},
}


@settings(
    max_examples=mutations.examples(600), deadline=None, derandomize=True, database=None,
    suppress_health_check=list(HealthCheck), phases=mutations.PHASES,
)  # fmt: skip
@given(st.data())
def test_whatever_happens_to_a_good_file_it_is_answered(
    tmp_path_factory: pytest.TempPathFactory, data: st.DataObject
) -> None:
    base = BASES[data.draw(st.sampled_from(sorted(BASES)))]
    changed = mutations.apply(base, data.draw(mutations.edits(mutations.YAML_WORDS)))
    path = tmp_path_factory.getbasetemp() / "changed.yaml"
    path.write_bytes(changed)
    problems, advice = check(path)
    for problem in (*problems, *advice):
        # the place is this file or one that it names
        assert problem.place
        assert problem.problem
        assert len(problem.problem) < 2000
    for problem in problems:
        assert problem.expected, problem
        assert problem.do, problem
    # asked again, the same is said
    assert check(path) == (problems, advice)
