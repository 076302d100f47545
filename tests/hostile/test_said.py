"""What hostile input once made the program say wrongly, each held by the case that showed it."""

from __future__ import annotations

from pathlib import Path

from typer.testing import CliRunner

from exceed.cli.app import app
from hostile import corpus


def scanned(folder: Path, text: str, *options: str) -> tuple[int, str]:
    """Exit code and table of a scan of one log."""
    (folder / "log.csv").write_text(text)
    done = CliRunner().invoke(app, ["scan", str(folder / "log.csv"), *options], prog_name="exceed")
    assert done.stderr == ""
    return done.exit_code, done.stdout


def test_a_log_of_one_row_has_no_time_in_which_a_rule_could_apply(tmp_path: Path) -> None:
    code, table = scanned(tmp_path, corpus.text(count=1), "--aircraft", "aerobatic", "--mass", "900 kg")
    assert code == 0
    assert table.startswith("No rule could be assessed")
    assert "not assessed at all: Positive load factor, Negative load factor" in table
    assert "there is no recorded time" in table
    assert "no reason given" not in table


def test_a_log_of_which_nothing_is_understood_is_not_assessed(tmp_path: Path) -> None:
    code, table = scanned(tmp_path, corpus.text("time [s],SPARE 1,SPARE 2,SPARE 3"))
    assert code == 3
    assert table.startswith("No log could be read, so nothing was assessed.")
    assert "log.csv: not read: none of its columns is understood: SPARE 1, SPARE 2, SPARE 3\n" in table
    assert "    do: name the columns in a channels file; 'exceed describe LOG --write FILE' starts one\n" in table
    done = CliRunner().invoke(app, ["describe", str(tmp_path / "log.csv"), "--write", str(tmp_path / "channels.yaml")])
    assert done.exit_code == 0
