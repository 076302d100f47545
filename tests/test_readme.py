"""What a newcomer reads first is true: the README, the help, the starter files.

`python tests/test_readme.py` writes the README's excerpt of real output anew (then read the diff).
"""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path

import pytest
import typer
from typer.testing import CliRunner

import exceed
from exceed.cli.app import app, main
from exceed.core.quantities import QUANTITIES
from exceed.documents.templates import template
from exceed.report.table import render_table

ROOT = Path(__file__).resolve().parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")
SAMPLES = ROOT / "sample_logs"
OVER_G = SAMPLES / "zz-nma" / "nma-0902.csv"
COMMANDS = typer.main.get_command(app).commands  # type: ignore[attr-defined]


def fenced(language: str) -> list[str]:
    """The README's blocks of one language."""
    return re.findall(rf"^```{language}\n(.*?)^```$", README, re.MULTILINE | re.DOTALL)


def table(head: str) -> list[str]:
    """First cells of the README's table whose first heading is `head`."""
    rows = README.partition(f"\n| {head} |")[2].partition("\n\n")[0].splitlines()[2:]
    return [row.split("|")[1].strip() for row in rows]


# --- the two commands -------------------------------------------------------------------------------------------------


def test_there_are_exactly_two_commands_and_they_are_the_main_job_and_the_tests() -> None:
    lines = [line for block in fenced("sh") for line in block.splitlines()]
    assert lines == [
        "python3 -m venv .venv && .venv/bin/pip install . && .venv/bin/exceed scan sample_logs",
        "python3 -m venv .venv && .venv/bin/pip install '.[test]' && .venv/bin/pytest",
    ]


def test_the_script_that_runs_them_finds_those_two() -> None:
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    taking = re.search(r"^mapfile -t commands < <\((.*)\)$", script, re.MULTILINE)
    assert taking is not None
    found = subprocess.run(["bash", "-c", taking[1]], cwd=ROOT, capture_output=True, text=True, check=True, timeout=30)
    assert found.stdout.splitlines() == [line for block in fenced("sh") for line in block.splitlines()]


def test_the_excerpt_of_the_main_job_is_what_it_prints() -> None:
    (shown,) = fenced("text")
    printed = scanned()
    for part in shown.rstrip("\n").split("\n…\n"):
        assert f"\n{part}\n" in printed, "stale: python tests/test_readme.py, and read the diff"


def scanned() -> str:
    """What `exceed scan sample_logs` prints on a terminal of 80 columns, heading and end marked by an empty line."""
    return "\n" + render_table(exceed.scan(SAMPLES).summary, width=80)


# --- commands, options, exit codes ------------------------------------------------------------------------------------


def test_the_list_of_commands_is_whole_and_names_no_other() -> None:
    listed = [name for cell in table("command") for name in re.findall(r"`exceed (\w+)", cell)]
    assert sorted(listed) == sorted(COMMANDS)


def test_every_line_that_the_readme_shows_uses_commands_and_options_that_exist() -> None:
    lines = re.findall(r"(?:^ {4}|`)(exceed [a-z][^\n`]*)", README, re.MULTILINE)
    assert len(lines) > 15
    for line in lines:
        command = COMMANDS[line.split()[1]]
        if line.split()[1] == "ledger" and line.split()[2:3] not in ([], ["…"]):
            command = command.commands[line.split()[2]]
        known = {option for parameter in command.params for option in parameter.opts}
        assert set(re.findall(r"(?<!\S)--[a-z-]+", line)) <= known, line


def test_the_help_cuts_no_line_short_and_names_every_rule_set() -> None:
    shown = CliRunner().invoke(app, ["--help"], env={"COLUMNS": "80"}).output
    listed = shown.partition("Commands:")[2]
    assert "scan" in listed
    assert "..." not in listed
    said = CliRunner().invoke(app, ["scan", "--help"], env={"COLUMNS": "80"}).output
    words = set(re.findall(r"\w+", said))
    assert {path.stem for path in (ROOT / "rules").glob("*.yaml")} <= words
    named = set(re.findall(r"\b\d+\b", said.partition("Exit codes:")[2].partition("Arguments")[0]))
    assert named >= set(table("exit code"))


@pytest.mark.parametrize(
    ("code", "arguments"),
    [
        ("0", ["scan", str(OVER_G)]),
        ("1", ["scan", str(OVER_G), "--fail-at", "caution"]),
        ("2", ["scan", str(OVER_G), "--rules", "no-such-set"]),
        ("3", ["scan", str(OVER_G), "empty.csv"]),
        ("4", ["scan", str(OVER_G), "empty.csv", "--fail-at", "caution"]),
        ("130", ["scan", str(OVER_G)]),
    ],
)
def test_the_table_of_exit_codes_is_true(
    code: str, arguments: list[str], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(ROOT)  # the fleet file is looked for up to the working folder
    (tmp_path / "empty.csv").write_text("")
    arguments = [str(tmp_path / word) if word == "empty.csv" else word for word in arguments]
    if code == "130":

        def interrupted(*_: object) -> int:
            raise KeyboardInterrupt

        monkeypatch.setattr("exceed.cli.run.run_scan", interrupted)
    with pytest.raises(SystemExit) as ended:
        main([*arguments, "--quiet", "--jobs", "1"])
    assert str(ended.value.code or 0) == code
    assert table("exit code") == ["0", "1", "2", "3", "4", "130"]


# --- Python, starter files --------------------------------------------------------------------------------------------


def test_the_python_example_runs() -> None:
    (example,) = fenced("python")
    done = subprocess.run([sys.executable, "-W", "error", "-c", example], cwd=ROOT, capture_output=True, text=True,
                          check=False, timeout=300, env={**os.environ, "PYTHONUTF8": "1"})  # fmt: skip
    assert (done.returncode, done.stderr) == (0, "")
    *rows, most = done.stdout.splitlines()
    assert rows[0].split() == ["registration", "title", "severity", "certainty", "peak_estimate"]
    assert any("Positive load factor" in row and "ZZ-NMA" in row and "established" in row for row in rows)
    assert not any("advisory" in row for row in rows)
    assert 6.0 < float(most) < 7.0  # the over-g of that sortie, above the limit of 6 g


def test_the_starter_file_of_rules_lists_every_quantity() -> None:
    text = " ".join(line.lstrip("# ") for line in template("rules").splitlines() if line.startswith("#"))
    listed = text.partition("declared below: ")[2].partition(".")[0]
    assert listed.split(", ") == list(QUANTITIES)


def test_the_starter_file_of_an_aeroplane_warns_of_its_figures() -> None:
    assert "INVENTED" in template("aircraft").partition("format:")[0]


def rewrite() -> None:
    """The excerpt anew: the first flight with an event, and the end from the inspections on."""
    lines = scanned().splitlines()[1:]
    heading = next(place for place, line in enumerate(lines) if line.startswith(" ZZ-NMA"))
    first = next(place for place, line in enumerate(lines) if line.startswith(" !"))
    due = lines.index("Inspections")
    parts = [lines[: first + 1], lines[due : due + 4], lines[len(lines) - 6 - (len(lines[-5]) > 0) :]]
    assert heading < first
    shown = "\n…\n".join("\n".join(part).strip("\n") for part in parts)
    (old,) = fenced("text")
    (ROOT / "README.md").write_text(README.replace(f"```text\n{old}```", f"```text\n{shown}\n```"), encoding="utf-8")


if __name__ == "__main__":
    rewrite()
