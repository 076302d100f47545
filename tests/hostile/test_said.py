"""What hostile input once made the program say wrongly, each held by the case that showed it."""

from __future__ import annotations

import json
import os
from pathlib import Path

import pytest
from typer.testing import CliRunner

from exceed.cli.app import app
from hostile import case


def scanned(folder: Path, text: str, *options: str) -> tuple[int, str]:
    """Exit code and table of a scan of one log."""
    (folder / "log.csv").write_text(text)
    done = CliRunner().invoke(app, ["scan", str(folder / "log.csv"), *options], prog_name="exceed")
    assert done.stderr == ""
    return done.exit_code, done.stdout


def test_a_log_of_one_row_has_no_time_in_which_a_rule_could_apply(tmp_path: Path) -> None:
    code, table = scanned(tmp_path, case.text(count=1), "--aircraft", "aerobatic", "--mass", "900 kg")
    assert code == 0
    assert table.startswith("No rule could be assessed")
    assert "not assessed at all: Positive load factor, Negative load factor" in table
    assert "there is no recorded time" in table
    assert "no reason given" not in table


def test_a_log_of_which_nothing_is_understood_is_not_assessed(tmp_path: Path) -> None:
    code, table = scanned(tmp_path, case.text("time [s],SPARE 1,SPARE 2,SPARE 3"))
    assert code == 3
    assert table.startswith("No log could be read, so nothing was assessed.")
    assert "log.csv: not read: none of its columns is understood: SPARE 1, SPARE 2, SPARE 3\n" in table
    assert "    do: name the columns in a channels file; 'exceed describe LOG --write FILE' starts one\n" in table
    done = CliRunner().invoke(app, ["describe", str(tmp_path / "log.csv"), "--write", str(tmp_path / "channels.yaml")])
    assert done.exit_code == 0


@pytest.mark.parametrize("value", ["1e200", "1e308", "-1e308"])
def test_figures_beyond_all_sense_are_rejected_without_a_warning(tmp_path: Path, value: str) -> None:
    code, _ = scanned(tmp_path, case.column(1, value, slice(0, 400, 3)), "--json", str(tmp_path / "out.json"))
    assert code == 0
    (found,) = json.loads((tmp_path / "out.json").read_text())["recordings"]
    rows = [one for one in found["rejected"] if one["quantity"] == "load_factor"]
    assert {row["reason"] for row in rows} == {"out_of_range"}
    assert sum(row["samples"] for row in rows) == 134
    # what was rejected once made the channel's step, and so its uncertainty, 1e200 g
    (method,) = (one for one in found["methods"] if one["quantity"] == "load_factor")
    assert method["standard_uncertainty"]["value"] < 0.1


def stamped(stamp: str) -> str:
    """A log whose stamps have this date, minutes and seconds running."""
    rows = [row.split(",", 1)[1] for row in case.rows()]
    lines = [f"{stamp}T10:{k // 60:02d}:{k % 60:02d}Z,{row}" for k, row in enumerate(rows)]
    return "\n".join(["UTC,NZ [g],IAS [kt],PALT [ft]", *lines]) + "\n"


@pytest.mark.parametrize("date", ["0000-01-01", "0001-01-01", "1600-01-01", "9999-12-31", "2031-02-29", "2031-00-00"])
def test_a_date_that_is_none_gives_no_date_and_keeps_the_time(tmp_path: Path, date: str) -> None:
    """Nanoseconds in 64 bits end with 2262: the year 9999 once came out as 1816, with nothing said."""
    code, _ = scanned(tmp_path, stamped(date), "--json", str(tmp_path / "out.json"))
    assert code == 0
    (found,) = json.loads((tmp_path / "out.json").read_text())["recordings"]
    assert found["clock"]["start"] is None
    assert found["recorded_s"] == 399.0
    said = "no date in the log is of the years 1900 to 2199: times are elapsed, UTC is not given"
    assert said in found["clock"]["notes"]


@pytest.mark.parametrize("date", ["1900-01-01", "2199-12-31"])
def test_the_first_and_last_years_of_dates_are_read_as_they_are(tmp_path: Path, date: str) -> None:
    scanned(tmp_path, stamped(date), "--json", str(tmp_path / "out.json"))
    (found,) = json.loads((tmp_path / "out.json").read_text())["recordings"]
    assert found["clock"]["start"] == f"{date}T10:00:00Z"


@pytest.mark.parametrize(("step", "told"), [(1e12, "1e+12"), (1e-12, "1e-12"), (7200.0, "7.2e+03")])
def test_a_clock_that_no_recorder_has_is_refused(tmp_path: Path, step: float, told: str) -> None:
    rows = [f"{k * step!r},{row.split(',', 1)[1]}" for k, row in enumerate(case.rows())]
    code, table = scanned(tmp_path, "\n".join([case.HEADING, *rows]) + "\n")
    assert code == 3
    assert f"log.csv: not read: its clock goes on by {told} s a row, which no recorder does\n" in table


def test_a_log_cut_in_the_middle_of_a_letter_keeps_its_rows(tmp_path: Path) -> None:
    (tmp_path / "log.csv").write_bytes(case.text().encode() + "50.0,é".encode()[:-1])
    done = CliRunner().invoke(app, ["scan", str(tmp_path / "log.csv"), "--json", "-"], prog_name="exceed")
    assert (done.exit_code, done.stderr) == (0, "")
    (found,) = json.loads(done.stdout)["recordings"]
    assert found["rows"] in (400, 401)
    assert found["recorded_s"] == 49.875
    assert any("another number of cells" in note for note in found["notes"])


@pytest.mark.parametrize("cell", [b"\xff", b"1.0\xff", b"\xed\xa0\x80"])
def test_a_cell_that_is_no_letter_costs_its_cell_only(tmp_path: Path, cell: bytes) -> None:
    """Beyond the first block, where the coding of letters is told."""
    lines = case.text(count=20_000).encode().splitlines()
    lines[15_000] = b"1874.875," + cell + b",100.0,17999"
    (tmp_path / "log.csv").write_bytes(b"\n".join(lines) + b"\n")
    done = CliRunner().invoke(app, ["scan", str(tmp_path / "log.csv"), "--json", "-"], prog_name="exceed")
    assert (done.exit_code, done.stderr) == (0, "")
    (found,) = json.loads(done.stdout)["recordings"]
    assert found["rows"] == 20_000
    (row,) = (one for one in found["rejected"] if one["quantity"] == "load_factor")
    assert (row["reason"], row["samples"], row["start_s"]) == ("not_a_number", 1, 1874.875)


def test_a_file_that_opens_and_cannot_be_read_is_said(tmp_path: Path) -> None:
    (tmp_path / "log.csv").symlink_to("/proc/self/mem")
    done = CliRunner().invoke(app, ["scan", str(tmp_path / "log.csv"), "--quiet"], prog_name="exceed")
    assert (done.exit_code, done.stdout) == (3, "")
    assert done.stderr == (
        "exceed: log.csv: cannot be read: Input/output error\n  expected: a readable file\n"
        "  do: copy the log from the recorder again\n"
    )


def test_a_name_that_is_no_utf8_is_read_and_written(tmp_path: Path) -> None:
    path = tmp_path / os.fsdecode(b"\xff\xfe.csv")
    path.write_text(case.text())
    for command in (["describe", str(path)], ["trace", str(path), "--out", str(tmp_path / "t.parquet")]):
        assert CliRunner().invoke(app, command, prog_name="exceed").exit_code == 0
    done = CliRunner().invoke(app, ["scan", str(tmp_path)], prog_name="exceed")
    assert done.exit_code == 0
    assert "\\xff\\xfe.csv" in done.stdout


def test_figures_beyond_all_sense_of_a_declared_quantity_are_rejected_too(tmp_path: Path) -> None:
    (tmp_path / "channels.yaml").write_text(
        'format: exceed-channels/1\nchannels:\n  - {column: "OIL T", quantity: oil_temperature, unit: degC}\n'
    )
    (tmp_path / "rules.yaml").write_text(
        "format: exceed-rules/1\ntitle: T\nquantities: {oil_temperature: degC}\nrules:\n  - id: oil\n"
        "    quantity: oil_temperature\n    limit: 118 degC\n    above: {caution: 100 %}\n"
    )
    text = case.column(2, "90").replace("IAS [kt]", "OIL T").splitlines()
    text[100] = "12.375,1.0,1e200,3099"
    code, _ = scanned(
        tmp_path, "\n".join(text) + "\n", "--channels", str(tmp_path / "channels.yaml"), "--rules",
        str(tmp_path / "rules.yaml"), "--json", str(tmp_path / "out.json"), "--html", str(tmp_path / "out.html"),
    )  # fmt: skip
    assert code == 0
    (found,) = json.loads((tmp_path / "out.json").read_text())["recordings"]
    (row,) = (one for one in found["rejected"] if one["quantity"] == "oil_temperature")
    assert (row["reason"], row["samples"], row["extreme"]["value"]) == ("out_of_range", 1, 1e200)
    assert row["would_exceed"] == ["oil"]
    assert found["events"] == []
