"""Some two hundred hostile files at once: each is read or refused by name, and none costs the others anything."""

from __future__ import annotations

import html
import json
import os
import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

from hostile import bounds, corpus
from hostile.case import Case
from hostile.every_command import drawn

CASES = corpus.cases()
# a control character, or one that turns or hides text (Unicode TR36): none may reach a terminal
UNSAFE = re.compile("[\x00-\x08\x0b-\x1f\x7f-\x9f\u200b-\u200f\u2028-\u202e\u2066-\u2069]")


@dataclass(frozen=True, slots=True)
class Scan:
    """One scan of the whole corpus."""

    code: int
    table: str
    errors: str
    summary: dict[str, Any]
    page: str


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    place = tmp_path_factory.mktemp("hostile") / "corpus"
    corpus.write(place)
    return place


@pytest.fixture(scope="module")
def scan(folder: Path, tmp_path_factory: pytest.TempPathFactory) -> Scan:
    out = tmp_path_factory.mktemp("out")
    done = bounds.run(
        "-m", "exceed", "scan", str(folder), "--aircraft", "aerobatic", "--mass", "900 kg", "--jobs", "1",
        "--rules", "airframe", "--rules", "aerobatic", "--rules", "handling", "--rules", "landing", "--rules", "gust",
        "--json", str(out / "day.json"), "--html", str(out / "day.html"), folder=out, seconds=120,
    )  # fmt: skip
    errors = done.stderr.decode("utf-8", "backslashreplace")
    assert (out / "day.json").exists(), errors
    summary = json.loads((out / "day.json").read_text(), parse_constant=lambda word: pytest.fail(f"{word} in JSON"))
    page = (out / "day.html").read_text()
    return Scan(done.returncode, done.stdout.decode(), errors, summary, page)


@pytest.fixture(scope="module")
def answers(folder: Path, tmp_path_factory: pytest.TempPathFactory) -> dict[str, list[dict[str, Any]]]:
    """What describe, trace and lint said of every file."""
    out = tmp_path_factory.mktemp("answers")
    program = str(Path(__file__).with_name("every_command.py"))
    done = bounds.run(program, str(folder), str(out), folder=out, seconds=240)
    assert done.returncode == 0, done.stderr.decode()[-3000:]
    found: dict[str, list[dict[str, Any]]] = {}
    for line in done.stdout.decode().splitlines():
        answer = json.loads(line)
        found.setdefault(answer["name"], []).append(answer)
    return found


def shown(name: str) -> str:
    """A name as JSON has it: bytes that are no UTF-8 as escapes."""
    return name.encode("utf-8", "surrogateescape").decode("utf-8", "backslashreplace")


def text_of(problem: Any) -> str:
    if problem is None:
        return ""
    return problem if isinstance(problem, str) else " ".join(str(part) for part in problem.values())


def recordings(scan: Scan) -> dict[str, dict[str, Any]]:
    return {one["path"]: one for one in scan.summary["recordings"]}


def name_of(case: Case) -> str:
    return ascii(case.name)[1:-1][:50]


def test_the_run_ends_with_3_and_says_nothing_beside_its_outputs(scan: Scan) -> None:
    assert scan.code == 3
    assert scan.errors == ""


def test_no_case_has_the_name_of_another() -> None:
    assert len({case.name for case in CASES}) == len(CASES) > 200


@pytest.mark.parametrize("case", [case for case in CASES if case.outcome in ("done", "failed")], ids=name_of)
def test_each_file_is_read_or_refused(scan: Scan, case: Case) -> None:
    found = recordings(scan)[case.name]
    said = f"{text_of(found['problem'])} {found['notes']}"
    assert "internal error" not in said
    assert "not enough memory" not in said
    assert ("failed" if found["status"] == "failed" else "done") == case.outcome, said
    assert case.says in said
    if case.outcome == "failed":
        assert len(text_of(found["problem"])) < 1000
    else:
        rows = [row for row in found["assessment"] if row["flight"] is None]
        for row in rows:
            total = row["assessed_s"] + row["unassessed_s"] + row["not_applicable_s"]
            assert total == pytest.approx(found["recorded_s"], rel=1e-6, abs=0.02), row


@pytest.mark.parametrize("case", [case for case in CASES if case.outcome == "skipped"], ids=name_of)
def test_what_is_no_log_is_skipped_with_its_reason(scan: Scan, case: Case) -> None:
    (row,) = (one for one in scan.summary["skipped"] if one["path"] == case.name)
    assert case.says in row["reason"]


def test_what_lies_in_folders_is_found_once(scan: Scan) -> None:
    deep = [path for path in recordings(scan) if path.startswith("deep/")]
    assert deep == ["deep/" + "d/" * 60 + "deep.csv"]
    reasons = {one["path"]: one["reason"] for one in scan.summary["skipped"] if one["path"].startswith("loop/")}
    assert reasons["loop/again"] == "a link back to a folder above it"
    assert reasons["loop/self.csv"].startswith("cannot be looked at")
    assert len(scan.summary["recordings"]) == len([case for case in CASES if case.outcome in ("done", "failed")]) + 1


def test_nothing_reaches_the_terminal_that_it_would_obey(scan: Scan) -> None:
    assert UNSAFE.findall(scan.table) == []


def test_nothing_in_the_page_is_obeyed_by_a_browser(scan: Scan) -> None:
    for text in ("<script>alert(1)</script>", "<img src=x onerror=alert(1)>", "<b>[red]ZZ-X"):
        assert text not in scan.page
    assert "<img src=x onerror=alert(1)>" in html.unescape(scan.page)  # said all the same


def test_no_file_name_was_obeyed(folder: Path, scan: Scan) -> None:
    assert not Path("/tmp/exceed-was-here.csv").exists()
    assert not (folder / "owned").exists()
    assert {case.name for case in CASES} == set(os.listdir(folder))


NAMES = sorted(case.name for case in CASES if case.outcome in ("done", "failed") and drawn(case.name))


@pytest.mark.parametrize("name", NAMES, ids=lambda name: ascii(name)[1:-1][:50])
def test_describe_trace_and_lint_answer(answers: dict[str, list[dict[str, Any]]], name: str) -> None:
    assert {answer["command"] for answer in answers[shown(name)]} == drawn(name)
    for answer in answers[shown(name)]:
        assert answer["fault"] == ""
        assert answer["code"] in (0, 2, 3)
        assert "internal error" not in answer["err"], answer["err"]
        assert "Traceback" not in answer["err"]
        assert UNSAFE.findall(answer["out"] + answer["err"]) == []
        assert answer["seconds"] < 30.0
        if answer["code"] == 3:
            (case,) = (case for case in CASES if case.name == name)
            assert case.outcome == "failed"
            assert answer["err"].startswith("exceed: ")
            assert "\n  do: " in answer["err"]
        if answer["command"] == "lint":
            assert answer["code"] == 2
        # a channels file that we wrote is one that we read
        assert answer.get("channels", "") == ""
