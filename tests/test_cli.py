"""The command line: what each command and option does, which exit code it ends with, and what it says when it cannot.

Most runs are in this process; what concerns streams, signals, folders and the environment is a process of its own.
"""

from __future__ import annotations

import contextlib
import errno
import html
import json
import os
import pty
import shutil
import subprocess
import sys
import textwrap
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import pyarrow.csv
import pyarrow.parquet as pq
import pytest
from typer.testing import CliRunner

from exceed import __version__
from exceed.cli.app import app
from exceed.cli.run import exit_code
from exceed.core.findings import CAUTIONS

SAMPLES = Path(__file__).resolve().parent.parent / "sample_logs"
LARK = "ZZ-NMA"


@dataclass(frozen=True, slots=True)
class Ended:
    """How a command ended."""

    code: int
    out: str
    err: str


@pytest.fixture(scope="session")
def desk(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with a log of each aeroplane, the aircraft files, a broken log; no fleet file."""
    folder = tmp_path_factory.mktemp("desk")
    shutil.copy(SAMPLES / "zz-nma" / "nma-1020.csv", folder / "lark.csv")  # says that it is of ZZ-NMA
    shutil.copy(SAMPLES / "zz-nmc" / "nmc_descent.csv", folder / "fenwick.csv")
    shutil.copy(SAMPLES / "aircraft" / "larkspur.yaml", folder / "larkspur.yaml")
    shutil.copy(SAMPLES / "aircraft" / "fenwick.yaml", folder / "fenwick.yaml")
    (folder / "empty.csv").write_text("")
    return folder


@pytest.fixture
def here(desk: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The desk as the working folder, and a folder of this test's own for outputs."""
    monkeypatch.chdir(desk)
    monkeypatch.delenv("COLUMNS", raising=False)
    return tmp_path


def call(*arguments: str) -> Ended:
    """A command in this process."""
    done = CliRunner().invoke(app, list(arguments), prog_name="exceed")
    if done.exception is not None and not isinstance(done.exception, SystemExit):
        raise done.exception
    return Ended(done.exit_code, done.stdout, done.stderr)


def process(*arguments: str, folder: Path, environment: dict[str, str] | None = None, **options: Any) -> Ended:
    """A command as a process of its own, in a folder."""
    done = subprocess.run(
        [sys.executable, "-m", "exceed", *arguments], cwd=folder, capture_output=True, text=True, check=False,
        timeout=60, encoding="utf-8", env={**os.environ, **(environment or {})}, **options,
    )  # fmt: skip
    return Ended(done.returncode, done.stdout, done.stderr)


def on_terminal(*arguments: str, folder: Path, environment: dict[str, str]) -> tuple[int, str]:
    """A command whose stdout is a terminal: its exit code and all it wrote there."""
    leader, follower = pty.openpty()
    started = subprocess.Popen(
        [sys.executable, "-m", "exceed", *arguments], cwd=folder, stdin=subprocess.DEVNULL, stdout=follower,
        stderr=subprocess.DEVNULL, env={**os.environ, "TERM": "xterm", "NO_COLOR": "", **environment},
    )  # fmt: skip
    os.close(follower)
    pieces = []
    while True:
        try:
            piece = os.read(leader, 65536)
        except OSError as error:
            if error.errno != errno.EIO:  # a terminal whose other end has gone says EIO
                raise
            break
        if not piece:
            break
        pieces.append(piece)
    os.close(leader)
    return started.wait(timeout=60), b"".join(pieces).decode("utf-8", "replace").replace("\r\n", "\n")


# --- help, version, near-misses -------------------------------------------------------------------------------------

COMMON = ["--fleet", "--aircraft", "--channels", "--loading", "--registration", "--mass"]
OPTIONS = {
    "scan": [*COMMON, "--rules", "--json", "--html", "--fail-at", "--certainty", "--units", "--ledger", "--new-only",
             "--jobs", "--quiet", "--debug"],
    "describe": [*COMMON, "--write"],
    "trace": [*COMMON, "--out"],
    "envelope": ["--mass", "--altitude", "--flaps", "--html"],
    "spectrum": [*COMMON, "--json", "--html"],
    "ledger": [],
    "lint": [],
    "template": [],
    "schema": [],
    "selfcheck": [],
}  # fmt: skip


@pytest.mark.parametrize("command", OPTIONS)
def test_help_names_every_option(command: str) -> None:
    done = call(command, "--help")
    assert done.code == 0
    assert done.err == ""
    assert [option for option in OPTIONS[command] if option not in done.out] == []


@pytest.mark.parametrize("command", [name for name in OPTIONS if name != "ledger"])
def test_help_gives_an_example(command: str) -> None:
    assert f"\n  exceed {command}" in call(command, "--help").out


def test_help_lists_the_commands() -> None:
    done = call("--help")
    assert done.code == 0
    listed = [line.split()[0] for line in done.out.split("Commands:\n")[1].splitlines() if line.strip()]
    assert sorted(listed) == sorted(OPTIONS)


def test_help_loads_no_heavy_library() -> None:
    code = textwrap.dedent("""
        import sys
        from exceed.cli.app import main
        try:
            main(["scan", "--help"])
        except SystemExit as end:
            assert end.code == 0
        print(sorted({"numpy", "pandas", "pyarrow", "scipy", "plotly", "sqlalchemy"} & set(sys.modules)))
    """)
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, timeout=60)
    assert done.stdout.splitlines()[-1] == "[]"


def test_version() -> None:
    assert call("--version") == Ended(0, f"exceed {__version__}\n", "")


@pytest.mark.parametrize(
    ("arguments", "text"),
    [
        (["scann", "x.csv"], "No such command 'scann'. Did you mean 'scan'?"),
        (["scan", "--fail-att", "caution", "lark.csv"], "--fail-at"),
        (["scan", "--certanty", "likely", "lark.csv"], "--certainty"),
        (["scan"], "Missing argument 'PATH...'"),
        (["trace", "lark.csv"], "Missing option '--out'"),
        (["describe", "lark.csv", "fenwick.csv"], "unexpected extra argument"),
        (["scan", "lark.csv", "--fail-at", "loud"], "'loud' is not one of 'advisory', 'caution', 'warning'"),
        (["scan", "lark.csv", "--certainty", "doubtful"],
         "'doubtful' is not one of 'possible', 'likely', 'established'"),
        (["scan", "lark.csv", "--units", "si"], "'si' is not one of 'trade', 'metric'"),
        (["template", "summary"],
         "'summary' is not one of 'aircraft', 'rules', 'channels', 'loading', 'fleet'"),
        (["schema", "rule"],
         "'rule' is not one of 'aircraft', 'rules', 'channels', 'loading', 'fleet', 'summary'"),
    ],
)  # fmt: skip
def test_what_the_command_line_does_not_know_is_said(here: Path, arguments: list[str], text: str) -> None:
    done = call(*arguments)
    assert done.code == 2
    assert done.out == ""
    assert text in " ".join(done.err.split())


# --- wrong wishes: exit code 2, nothing scanned, the whole text ------------------------------------------------------

CATEGORIES = (
    "aerobatic, commuter, light-sport, normal, sailplane-aerobatic, sailplane-utility, transport, utility, very-light"
)
NO_FILE = "exceed: nope.yaml: there is no such file\n  expected: a YAML file\n  do: check the path\n"
WRONG = {
    "no such log": (
        ["nope.csv"],
        "exceed: nope.csv: there is no such file or folder\n"
        "  expected: a file, a folder or a pattern\n  do: check the path\n",
    ),
    "all missing paths at once": (
        ["lark.csv", "nope.csv", "x*.csv"],
        "exceed: nope.csv: there is no such file or folder\n"
        "  expected: a file, a folder or a pattern\n  do: check the path\n"
        "x*.csv: matches no file\n  expected: a pattern that fits a log\n  do: check the pattern and its quotes\n",
    ),
    "an empty path": (
        [""],
        "exceed: an empty path is given\n  expected: a file, a folder or a pattern\n  do: give the path of a log\n",
    ),
    "no aircraft file": (["lark.csv", "--aircraft", "nope.yaml"], NO_FILE),
    "no rules file": (["lark.csv", "--rules", "nope.yaml"], NO_FILE),
    "no channels file": (["lark.csv", "--channels", "nope.yaml"], NO_FILE),
    "no loading sheet": (["lark.csv", "--loading", "nope.yaml"], NO_FILE),
    "no fleet file": (["lark.csv", "--fleet", "nope.yaml"], NO_FILE),
    "a category misspelt": (
        ["lark.csv", "--aircraft", "aerobattic"],
        f"exceed: --aircraft: 'aerobattic' is neither a file nor a category\n"
        f"  expected: a file, or one of {CATEGORIES}\n"
        "  do: write 'aerobatic' if that is meant\n",
    ),
    "a rule set misspelt": (
        ["lark.csv", "--rules", "airfram"],
        "exceed: airfram: there is no rule set and no file of this name\n"
        "  expected: a file, or one of aerobatic, airframe, engine, gust, handling, landing\n"
        "  do: write 'airframe' if that is meant\n",
    ),
    "a mass without unit": (
        ["lark.csv", "--mass", "900"],
        "exceed: --mass: '900' has no unit\n  expected: a mass in kg, lb\n"
        "  do: write the unit after the number, as in '900 kg'\n",
    ),
    "a speed for a mass": (
        ["lark.csv", "--mass", "900 kt"],
        "exceed: --mass: '900 kt' is a speed\n  expected: a mass in kg, lb\n  do: give a value of that kind\n",
    ),
    "a mass below zero": (
        ["lark.csv", "--mass", "-9 kg"],
        "exceed: --mass: '-9 kg' is not above zero\n  expected: a mass in kg or lb\n  do: write it as '900 kg'\n",
    ),
}


@pytest.mark.parametrize("name", WRONG)
def test_a_wrong_wish_ends_with_2_and_its_message(here: Path, name: str) -> None:
    arguments, text = WRONG[name]
    assert call("scan", *arguments, "--json", str(here / "out.json")) == Ended(2, "", text)
    assert not (here / "out.json").exists()


DOCUMENTS = {
    "--aircraft": (
        "format: exceed-aircraft/1\nregistration: ZZ-NMA\nmass: {empty: 640 kg, maximum_take_of: 960 kg}\n",
        ":3:23: key 'maximum_take_of' is not ",
    ),
    "--rules": (
        "format: exceed-rules/1\ntitle: T\nrules:\n  - id: a\n    quantity: load_factor\n    limit: 6 kph\n"
        "    above: {caution: 100 %}\n",
        ":6:12: ",
    ),
    "--channels": (
        'format: exceed-channels/1\nchannels:\n  - {column: "NZ", quantity: load_factor, unit: gee}\n',
        ":3:49: ",
    ),
    "--fleet": (
        "format: exceed-fleet/1\noperator: X\ntime_zone: Nowhere/Land\naircraft:\n  - {registration: ZZ-NMA}\n",
        ":3:12: ",
    ),
    "--loading": (
        'format: exceed-loading/1\nregistration: ZZ-NMA\ntake_off: "2031-05-02T09:14Z"\nstations: {pilot: 82}\n',
        ":4:19: ",
    ),
}


@pytest.mark.parametrize("option", DOCUMENTS)
def test_a_wrong_document_is_named_with_line_and_column(here: Path, option: str) -> None:
    text, place = DOCUMENTS[option]
    path = here / "wrong.yaml"
    path.write_text(text)
    done = call("scan", "lark.csv", option, str(path), "--json", str(here / "out.json"))
    assert (done.code, done.out) == (2, "")
    assert done.err.startswith(f"exceed: {path}{place}")
    assert "\n  expected: " in done.err
    assert "\n  do: " in done.err
    assert not (here / "out.json").exists()
    linted = call("lint", str(path))
    assert (linted.code, linted.err) == (2, "")
    assert linted.out == done.err.removeprefix("exceed: ")


def test_all_wrong_documents_are_told_at_once(here: Path) -> None:
    names = []
    for option, (text, _) in DOCUMENTS.items():
        path = here / f"wrong{option}.yaml"
        path.write_text(text)
        names += [option, str(path)]
    done = call("scan", "lark.csv", *names)
    assert done.code == 2
    assert all(f"wrong{option}.yaml:" in done.err for option in DOCUMENTS if option != "--fleet")


# --- scan ---------------------------------------------------------------------------------------------------------


def test_without_an_aircraft_file_there_are_extremes_and_what_to_do(here: Path) -> None:
    done = call("scan", "lark.csv")
    assert (done.code, done.err) == (0, "")
    assert done.out.startswith("No rule could be assessed, so nothing can be said about limits.")
    assert "load factor             4.38 g" in done.out
    assert (
        f"  no limits known for this aeroplane: {LARK}\n    do: write an aircraft file ('exceed template aircraft' "
        "starts one), or name a category with --aircraft\n"
    ) in done.out


@pytest.mark.parametrize(("level", "code"), [("advisory", 1), ("caution", 1), ("warning", 0)])
def test_fail_at_decides_between_0_and_1(here: Path, level: str, code: int) -> None:
    done = call("scan", "lark.csv", "--aircraft", "larkspur.yaml", "--mass", "905 kg", "--fail-at", level)
    assert (done.code, done.err) == (code, "")
    assert "!  caution" in done.out
    assert "!! warning" not in done.out


def test_without_fail_at_an_event_is_no_failure(here: Path) -> None:
    assert call("scan", "fenwick.csv", "--aircraft", "fenwick.yaml").code == 0


def test_undecided_stretches_count_for_fail_at() -> None:
    def one(**rows: Any) -> dict[str, Any]:
        return {"recordings": [{"status": "ok", "events": [], "undecided": [], **rows}]}

    row = [{"severity": "caution"}]
    assert exit_code(one(undecided=row), "caution") == 1
    assert exit_code(one(undecided=row), "warning") == 0
    assert exit_code(one(events=row), None) == 0
    assert exit_code(one(), "advisory") == 0
    assert exit_code(one(status="failed"), "advisory") == 3
    assert exit_code(one(status="failed", events=row), "advisory") == 4


@pytest.mark.parametrize(("level", "code"), [("caution", 4), ("warning", 3)])
def test_a_failed_log_leaves_the_others_done(here: Path, level: str, code: int) -> None:
    options = ["--aircraft", "larkspur.yaml", "--mass", "905 kg", "--fail-at", level]
    done = call("scan", "empty.csv", "lark.csv", *options)
    assert done.code == code
    assert "Positive load factor" in done.out
    assert "empty.csv: not read: is empty\n    expected: a CSV or Parquet log\n" in done.out
    assert "2 logs (1 failed)" in done.out
    quiet = call("scan", "empty.csv", "lark.csv", *options, "--quiet")
    assert quiet == Ended(
        code, "", "exceed: empty.csv: is empty\n  expected: a CSV or Parquet log\n"
        "  do: copy the log from the recorder again\n",
    )  # fmt: skip


def test_all_logs_failed_is_3_and_claims_nothing(here: Path) -> None:
    done = call("scan", "empty.csv")
    assert done.code == 3
    assert done.out.startswith("No log could be read, so nothing was assessed.")
    assert "No event" not in done.out


def test_a_folder_without_logs_is_said_even_when_quiet(here: Path) -> None:
    done = call("scan", str(here))
    assert done.code == 0
    assert done.out.startswith("No log was found, so nothing was assessed.")
    quiet = call("scan", str(here), "--quiet")
    assert (quiet.code, quiet.out) == (0, "")
    assert quiet.err == "exceed: no log was found, so nothing was assessed\n"


def test_quiet_prints_nothing_where_nothing_failed(here: Path) -> None:
    assert call("scan", "lark.csv", "--quiet") == Ended(0, "", "")


def test_json_to_stdout_is_nothing_but_json(here: Path) -> None:
    done = call("scan", "lark.csv", "empty.csv", "--json", "-", "--html", str(here / "page.html"))
    assert done.code == 3
    summary = json.loads(done.out, parse_constant=lambda word: pytest.fail(f"{word} in JSON"))
    assert summary["format"] == "exceed/summary/1"
    assert summary["totals"]["failed"] == 1
    assert done.err.startswith("exceed: empty.csv: is empty\n")
    assert (here / "page.html").read_text().startswith("<!")


def test_json_and_page_are_written_beside_the_table(here: Path) -> None:
    done = call("scan", "lark.csv", "--json", str(here / "a.json"), "--html", str(here / "a.html"))
    assert (done.code, done.err) == (0, "")
    assert done.out.rstrip().endswith(CAUTIONS[-1])
    for caution in CAUTIONS:
        assert caution in (here / "a.json").read_text()
        assert caution in html.unescape((here / "a.html").read_text())


def test_the_same_run_writes_the_same_json_but_for_its_time(here: Path) -> None:
    def once() -> dict[str, Any]:
        summary = json.loads(call("scan", "lark.csv", "--aircraft", "larkspur.yaml", "--json", "-").out)
        summary.pop("created")
        return summary

    assert json.dumps(once()) == json.dumps(once())


def test_certainty_hides_only_in_the_table_and_counts(here: Path) -> None:
    options = ["scan", "lark.csv", "--aircraft", "larkspur.yaml", "--mass", "905 kg"]
    everything, sure = call(*options), call(*options, "--certainty", "established")
    assert "Positive load factor     " in everything.out  # likely, as the sample day's story has it
    events = sure.out.split("Flights and their extremes")[0]
    assert "Positive load factor     " not in events
    assert "not shown" in sure.out
    assert "not shown" not in everything.out
    assert call(*options, "--certainty", "established", "--fail-at", "caution").code == 1
    summaries = [
        json.loads(call(*options, "--certainty", word, "--json", "-").out) for word in ("possible", "established")
    ]
    for summary in summaries:
        summary.pop("created")
    assert summaries[0] == summaries[1]


def test_metric_units_in_the_table_and_not_in_json(here: Path) -> None:
    options = ["scan", "lark.csv", "--aircraft", "larkspur.yaml"]
    trade, metric = call(*options), call(*options, "--units", "metric")
    assert " kt " in trade.out
    assert " km/h " not in trade.out
    assert " km/h " in metric.out
    assert " kt " not in metric.out
    assert '"kt"' in call(*options, "--units", "metric", "--json", "-").out


def test_a_log_of_another_aeroplane_fails_by_itself(here: Path) -> None:
    done = call("scan", "lark.csv", "--aircraft", "fenwick.yaml", "--quiet")
    assert done == Ended(
        3, "", "exceed: lark.csv: the log says it is of ZZ-NMA, and fenwick.yaml is the file of ZZ-NMC\n"
        "  expected: a log of ZZ-NMC\n  do: give the aeroplane's own file, or use a fleet file\n",
    )  # fmt: skip
    done = call("scan", "lark.csv", "--registration", "ZZ-XXX", "--quiet")
    assert done == Ended(
        3, "", "exceed: lark.csv: the log says it is of ZZ-NMA, and --registration says ZZ-XXX\n"
        "  expected: one registration\n  do: leave --registration out, or choose the logs of one aeroplane\n",
    )  # fmt: skip
    assert call("scan", "lark.csv", "--registration", "zznma", "--quiet").code == 0


def test_a_category_needs_a_mass_only_where_its_formula_does(here: Path) -> None:
    done = call("scan", "lark.csv", "--aircraft", "normal")
    assert (done.code, done.out) == (2, "")
    assert done.err.startswith("exceed: --aircraft: ")
    assert "--mass" in done.err
    assumed = call("scan", "lark.csv", "--aircraft", "normal", "--mass", "960 kg")
    assert assumed.code == 0
    assert "assumed" in assumed.out
    summary = json.loads(call("scan", "lark.csv", "--aircraft", "aerobatic", "--json", "-").out)
    assert {one["limits"] for one in summary["aircraft"]} == {"assumed"}


def test_rules_by_name_and_file_together(here: Path) -> None:
    mine = here / "mine.yaml"
    mine.write_text(
        "format: exceed-rules/1\ntitle: Mine\nrules:\n  - id: gentle\n    title: Gentle\n    quantity: load_factor\n"
        "    limit: 2 g\n    above: {advisory: 100 %}\n"
    )
    summary = json.loads(call("scan", "lark.csv", "--rules", "airframe", "--rules", str(mine), "--json", "-").out)
    assert [one["title"] for one in summary["rules"]] == ["Mine", "Airframe limits"] or {
        one["title"] for one in summary["rules"]
    } == {"Mine", "Airframe limits"}
    assert "gentle" in {event["rule"] for one in summary["recordings"] for event in one["events"]}


def test_one_process_or_two_find_the_same(desk: Path) -> None:
    def found(jobs: str) -> dict[str, Any]:
        done = process("scan", "lark.csv", "fenwick.csv", "empty.csv", "--jobs", jobs, "--json", "-", folder=desk)
        assert done.code == 3
        summary: dict[str, Any] = json.loads(done.out)
        summary.pop("created")
        summary["judged_with"] = [one for one in summary["judged_with"] if one.get("name") != "--jobs"]
        return summary

    assert found("1") == found("2")


def test_a_log_met_twice_is_read_once(here: Path) -> None:
    summary = json.loads(call("scan", "lark.csv", "./lark.csv", "l*.csv", "--json", "-").out)
    assert summary["totals"]["recordings"] == 1


def test_the_nearest_fleet_file_is_used_and_named(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    day = tmp_path / "day"
    shutil.copytree(SAMPLES / "aircraft", day / "aircraft")
    inner = day / "zz-nma" / "may"
    inner.mkdir(parents=True)
    shutil.copy(SAMPLES / "zz-nma" / "nma-1020.csv", inner)
    row = "  - {registration: ZZ-NMA, aircraft: aircraft/larkspur.yaml}\n"
    (day / "fleet.yaml").write_text(f"format: exceed-fleet/1\noperator: Outer\ntime_zone: UTC\naircraft:\n{row}")
    monkeypatch.chdir(day)
    done = call("scan", "zz-nma")
    assert done.code == 0
    assert "fleet file used: ../fleet.yaml" in done.out
    assert "Positive load factor" in done.out
    (inner / "fleet.yaml").write_text(
        "format: exceed-fleet/1\noperator: Inner\naircraft:\n  - {registration: ZZ-NMA}\n"
    )
    nearer = call("scan", "zz-nma")
    assert "fleet file used: may/fleet.yaml" in nearer.out
    assert f"no limits known for this aeroplane: {LARK}" in nearer.out
    # above the PATH given and outside the working folder nothing is looked for
    (inner / "fleet.yaml").unlink()
    (tmp_path / "elsewhere").mkdir()
    monkeypatch.chdir(tmp_path / "elsewhere")
    assert "fleet file used" not in call("scan", str(inner)).out


# --- outputs ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("option", ["--json", "--html"])
def test_an_output_that_cannot_be_written_is_said_before_the_logs_are_read(here: Path, option: str) -> None:
    done = call("scan", "lark.csv", option, str(here / "no" / "x"))
    assert done == Ended(
        2, "", f"exceed: {here}/no/x: the folder does not exist\n  expected: a file in a folder that is there\n"
        "  do: make the folder first\n",
    )  # fmt: skip
    done = call("scan", "lark.csv", option, str(here))
    assert done == Ended(
        2, "", f"exceed: {here}: this is a folder\n  expected: the name of a file\n  do: add a file name\n",
    )  # fmt: skip


def test_an_existing_output_is_replaced_whole_and_a_link_stays_one(here: Path) -> None:
    old = here / "old.json"
    old.write_text("x" * 10_000_000)
    (here / "link.json").symlink_to(old)
    assert call("scan", "lark.csv", "--json", str(here / "link.json")).code == 0
    assert (here / "link.json").is_symlink()
    assert json.loads(old.read_text())["totals"]["recordings"] == 1
    assert sorted(path.name for path in here.iterdir()) == ["link.json", "old.json"]


def test_a_failed_run_leaves_the_old_output(here: Path) -> None:
    old = here / "old.json"
    old.write_text("old")
    assert call("scan", "nope.csv", "--json", str(old)).code == 2
    assert old.read_text() == "old"


def unprivileged() -> Callable[[], None] | None:
    """What a child does first so that folder modes bind it even as root; None where nothing is needed."""
    if os.geteuid() != 0:
        return None
    import ctypes

    library = ctypes.CDLL(None, use_errno=True)

    def drop() -> None:
        for capability in (1, 2):  # CAP_DAC_OVERRIDE, CAP_DAC_READ_SEARCH; 24 is PR_CAPBSET_DROP (linux/prctl.h)
            if library.prctl(24, capability, 0, 0, 0) != 0:
                os._exit(77)

    return drop


@pytest.fixture
def closed_folder(tmp_path: Path) -> Iterator[Path]:
    """A folder in which nothing may be written, with a log that may be read and one that may not."""
    folder = tmp_path / "closed"
    folder.mkdir()
    shutil.copy(SAMPLES / "zz-nma" / "nma-1020.csv", folder / "lark.csv")
    shutil.copy(SAMPLES / "zz-nma" / "nma-1020.csv", folder / "secret.csv")
    (folder / "secret.csv").chmod(0)
    folder.chmod(0o555)
    yield folder
    folder.chmod(0o755)


def test_a_folder_that_may_not_be_written_is_scanned_and_keeps_its_files(closed_folder: Path) -> None:
    before = sorted(path.name for path in closed_folder.iterdir())
    done = process("scan", ".", folder=closed_folder, preexec_fn=unprivileged())
    if done.code == 77:
        pytest.skip("root here may not give up its rights, so no folder is closed to it")
    assert done.code == 3
    assert (
        "secret.csv: not read: cannot be opened: Permission denied\n    do: check that you may read the file"
        in done.out
    )
    assert "2 logs (1 failed), 1 flight" in done.out
    done = process("scan", "lark.csv", "--json", "out.json", folder=closed_folder, preexec_fn=unprivileged())
    assert done == Ended(
        2, "", "exceed: out.json: not allowed to write here\n  expected: a folder you may write to\n"
        "  do: choose another place\n",
    )  # fmt: skip
    assert sorted(path.name for path in closed_folder.iterdir()) == before


# --- streams, signals, environment ----------------------------------------------------------------------------------


@pytest.mark.parametrize("width", [60, 80, 160])
def test_a_terminal_gets_its_width_and_colour(desk: Path, width: int) -> None:
    code, text = on_terminal(
        "scan", "lark.csv", "--aircraft", "larkspur.yaml", "--mass", "905 kg",
        folder=desk, environment={"COLUMNS": str(width), "LC_ALL": "C.UTF-8"},
    )  # fmt: skip
    assert code == 0
    assert "\x1b[33m" in text  # caution is yellow, and a word besides
    plain = text
    for part in ("\x1b[0m", "\x1b[1m", "\x1b[2m", "\x1b[33m", "\x1b[36m", "\x1b[1;31m"):
        plain = plain.replace(part, "")
    assert "\x1b" not in plain
    assert "caution" in plain
    assert max(map(len, plain.split("\n"))) <= width


@pytest.mark.parametrize("width", ["1", "-5", "abc"])
def test_an_absurd_width_is_survived(desk: Path, width: str) -> None:
    code, text = on_terminal("envelope", "larkspur.yaml", folder=desk, environment={"COLUMNS": width})
    assert code == 0
    assert "Larkspur" in text
    assert CAUTIONS[-1].split()[-1] in text


@pytest.mark.parametrize("environment", [{"NO_COLOR": "1"}, {"TERM": "dumb"}])
def test_no_colour_where_nobody_wants_it(desk: Path, environment: dict[str, str]) -> None:
    code, text = on_terminal(
        "scan", "lark.csv", "--aircraft", "larkspur.yaml", folder=desk, environment={"COLUMNS": "80", **environment}
    )
    assert code == 0
    assert "caution" in text
    assert "\x1b" not in text


def test_a_pipe_gets_one_event_a_line_whatever_columns_says(desk: Path) -> None:
    options = ("scan", "lark.csv", "--aircraft", "larkspur.yaml", "--mass", "905 kg")
    done = process(*options, folder=desk, environment={"COLUMNS": "40"})
    assert "\x1b" not in done.out
    (line,) = (line for line in done.out.splitlines() if "Positive load factor  " in line)
    assert all(word in line for word in ("caution", "likely", LARK, "2031-05-02T10:29:20", "manoeuvring", "lark.csv"))


def test_a_plain_c_locale_gets_plain_letters(desk: Path, tmp_path: Path) -> None:
    shutil.copy(desk / "lark.csv", tmp_path / "Flug-Übung.csv")
    environment = {"LC_ALL": "C", "PYTHONUTF8": "0", "PYTHONCOERCECLOCALE": "0"}
    done = process("scan", ".", "--aircraft", str(desk / "larkspur.yaml"), folder=tmp_path, environment=environment)
    assert (done.code, done.err) == (0, "")
    assert done.out.isascii()
    assert "Positive load factor" in done.out


def test_any_folder_will_do_and_the_path_is_shown_from_the_one_given(desk: Path, tmp_path: Path) -> None:
    done = process("scan", str(desk), "--json", "-", folder=tmp_path)
    assert done.code == 3
    assert [one["path"] for one in json.loads(done.out)["recordings"]] == ["empty.csv", "fenwick.csv", "lark.csv"]
    assert str(desk) not in done.out


# a closed pipe, a full disk and a stream closed before the start must change nothing of the run but what is shown
TALKS = {
    "scan": (["scan", "lark.csv", "--aircraft", "larkspur.yaml", "--mass", "905 kg", "--fail-at", "caution"], 1),
    "json": (["scan", "lark.csv", "--json", "-"], 0),
    "template": (["template", "rules"], 0),
    "help": (["--help"], 0),
}
FULL = (
    "exceed: standard output: the disk is full\n  expected: room for the whole file\n"
    "  do: make room or choose another disk\n"
)


@pytest.mark.parametrize("name", TALKS)
def test_a_reader_that_has_gone_changes_nothing(desk: Path, name: str) -> None:
    arguments, code = TALKS[name]
    reading, writing = os.pipe()
    os.close(reading)
    with os.fdopen(writing, "wb") as gone:
        done = subprocess.run(
            [sys.executable, "-m", "exceed", *arguments], cwd=desk, stdout=gone, stderr=subprocess.PIPE, check=False,
            timeout=60,
        )  # fmt: skip
    assert (done.returncode, done.stderr) == (code, b"")


@pytest.mark.parametrize("name", ["scan", "help"])
def test_a_full_disk_behind_stdout_is_said(desk: Path, name: str) -> None:
    arguments, _ = TALKS[name]
    with open("/dev/full", "wb") as full:
        done = subprocess.run(
            [sys.executable, "-m", "exceed", *arguments], cwd=desk, stdout=full, stderr=subprocess.PIPE, check=False,
            timeout=60, text=True,
        )  # fmt: skip
    assert (done.returncode, done.stderr) == (2, FULL)


@pytest.mark.parametrize("closing", [">&-", "2>&-", ">&- 2>&-"])
def test_streams_closed_before_the_start_do_no_harm(desk: Path, closing: str) -> None:
    arguments, code = TALKS["scan"]
    command = " ".join(f"'{word}'" for word in [sys.executable, "-m", "exceed", *arguments])
    done = subprocess.run(["sh", "-c", f"{command} {closing}"], cwd=desk, capture_output=True, check=False, timeout=60)
    assert done.returncode == code
    assert done.stderr == b""


def test_an_interrupt_ends_with_130(desk: Path, tmp_path: Path) -> None:
    code = textwrap.dedent("""
        import os, signal
        from exceed import pipeline
        pipeline.assess = lambda log, run: os.kill(os.getpid(), signal.SIGINT)
        from exceed.cli.app import main
        main(["scan", "lark.csv", "--jobs", "1"])
    """)
    done = subprocess.run(
        [sys.executable, "-c", code], cwd=desk, capture_output=True, text=True, check=False, timeout=60,
        env={**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)},
    )  # fmt: skip
    assert done.returncode == 130
    assert "Traceback" not in done.stderr
    assert "interrupted" in done.stderr


def test_a_fault_of_ours_is_one_line_and_with_debug_its_traceback(here: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def broken(*_: Any, **__: Any) -> None:
        raise RuntimeError("wheels fell off")

    monkeypatch.setattr("exceed.pipeline.assign", broken)
    done = call("scan", "lark.csv", "--jobs", "1")
    assert done.code == 3
    assert "lark.csv: not read: internal error, this is a fault of exceed: RuntimeError: wheels fell off" in done.out
    assert "Traceback" not in done.out + done.err
    traced = call("scan", "lark.csv", "--jobs", "1", "--debug")
    assert traced.code == 3
    assert "lark.csv: Traceback (most recent call last):\n  File " in traced.err
    assert "\nRuntimeError: wheels fell off\n" in traced.err
    described = call("describe", "lark.csv")
    assert (described.code, described.out) == (3, "")
    assert described.err == (
        "exceed: internal error, this is a fault of exceed: RuntimeError: wheels fell off\n"
        "  do: run again with --debug and report it\n"
    )


# --- describe, trace, envelope, spectrum ------------------------------------------------------------------------------


def test_describe_writes_a_channels_file_that_scan_takes(here: Path) -> None:
    path = here / "channels.yaml"
    done = call("describe", "fenwick.csv", "--write", str(path))
    assert done.code == 0
    assert done.err == f"channels file written: {path}\n"
    assert call("lint", str(path)) == Ended(0, f"{path}: no problem found\n", "")
    options = ["scan", "fenwick.csv", "--aircraft", "fenwick.yaml", "--json", "-"]
    plain, told = json.loads(call(*options).out), json.loads(call(*options, "--channels", str(path)).out)
    # told what it found by itself, it finds the same
    for one, other in zip(plain["recordings"], told["recordings"], strict=True):
        assert [event["id"] for event in one["events"]] == [event["id"] for event in other["events"]]
        assert [row["quantity"] for row in one["channels"]] == [row["quantity"] for row in other["channels"]]
    assert {row["kind"] for row in told["judged_with"]} >= {"channels", "aircraft", "rules"}


def test_describe_says_clock_channels_extremes_and_what_the_log_can_feed(here: Path) -> None:
    done = call("describe", "lark.csv")
    assert (done.code, done.err) == (0, "")
    for word in ("load factor", "2031-05-02", "airframe", "4.38"):
        assert word in done.out


@pytest.mark.parametrize("command", [["describe", "."], ["trace", ".", "--out", "x.csv"]])
def test_one_log_is_wanted_and_a_folder_holds_three(here: Path, command: list[str]) -> None:
    assert call(*command) == Ended(
        3, "", "exceed: .: there are 3 logs here\n  expected: one log\n  do: name one of them\n"
    )


@pytest.mark.parametrize("suffix", [".parquet", ".csv"])
def test_trace_writes_a_table(here: Path, suffix: str) -> None:
    path = here / f"trace{suffix}"
    done = call("trace", "lark.csv", "--out", str(path), "--aircraft", "larkspur.yaml", "--mass", "905 kg")
    assert (done.code, done.out) == (0, "")
    assert f"written: {path}\n" in done.err
    assert all(caution in done.err for caution in CAUTIONS)
    table = pq.read_table(path) if suffix == ".parquet" else pyarrow.csv.read_csv(path)
    names = table.column_names
    assert names[:4] == ["time_s", "utc", "flight", "phase"]
    assert {"load_factor_g", "indicated_airspeed_kt", "mass_kg", "stall_margin_kt"} <= set(names)
    highest = max(value for value in table["load_factor_g"].to_pylist() if value is not None)
    assert highest == pytest.approx(4.38, abs=0.02)
    assert list(here.iterdir()) == [path]
    if suffix == ".parquet":
        about = {key.decode(): value.decode() for key, value in table.schema.metadata.items()}
        assert about["exceed"] == __version__
        assert about["registration"] == LARK
        assert CAUTIONS[0] in about["cautions"]
        column = table.schema.field("stall_margin_kt").metadata
        assert column[b"unit"] == b"kt"
        assert column[b"method"]
        assert column[b"inputs"]


def test_trace_refuses_a_kind_it_cannot_write_before_it_reads(here: Path) -> None:
    assert call("trace", "empty.csv", "--out", str(here / "t.xlsx")) == Ended(
        2, "", f"exceed: {here}/t.xlsx: '.xlsx' is no kind of table\n"
        "  expected: a name that ends in .parquet or .csv\n  do: choose one of these\n",
    )  # fmt: skip
    assert call("trace", "empty.csv", "--out", str(here / "no" / "t.csv")).err == (
        f"exceed: {here}/no/t.csv: the folder does not exist\n  expected: a file in a folder that is there\n"
        "  do: make the folder first\n"
    )


def test_envelope_of_a_file_and_of_a_category(here: Path) -> None:
    done = call(
        "envelope", "larkspur.yaml", "--mass", "905 kg", "--altitude", "5000 ft", "--html", str(here / "vn.html")
    )
    assert (done.code, done.err) == (0, "")
    assert "never exceed" in done.out.lower().replace("-", " ")
    assert (here / "vn.html").stat().st_size > 1000
    assert json.loads(call("envelope", "larkspur.yaml", "--json", "-").out)
    assert call("envelope", "normal", "--mass", "1100 kg").code == 0
    wrong = call("envelope", "larkspur.yaml", "--mass", "905")
    assert (wrong.code, wrong.out) == (2, "")
    assert wrong.err.startswith("exceed: --mass: '905' has no unit\n")


def test_spectrum_counts_and_fails_by_log(here: Path) -> None:
    done = call("spectrum", "lark.csv", "--json", str(here / "s.json"), "--html", str(here / "s.html"))
    assert (done.code, done.err) == (0, "")
    assert "1,000 h" in done.out
    assert json.loads((here / "s.json").read_text())
    assert call("spectrum", "lark.csv", "empty.csv").code == 3


# --- lint, template, schema, selfcheck --------------------------------------------------------------------------------

KINDS = ["aircraft", "rules", "channels", "loading", "fleet"]


@pytest.mark.parametrize("kind", KINDS)
def test_a_template_lints_and_its_schema_fits(here: Path, kind: str) -> None:
    import jsonschema
    import yaml

    made = call("template", kind)
    assert (made.code, made.err) == (0, "")
    path = here / f"{kind}.yaml"
    path.write_text(made.out)
    linted = call("lint", str(path))
    assert linted.code == 0, linted.out
    assert linted.out.endswith(f"{path}: no problem found\n")
    schema = call("schema", kind)
    assert (schema.code, schema.err) == (0, "")
    jsonschema.validate(yaml.safe_load(made.out), json.loads(schema.out))


def test_templates_run_as_they_are(here: Path) -> None:
    for kind in ("aircraft", "rules"):
        (here / f"{kind}.yaml").write_text(call("template", kind).out)
    done = call("scan", "fenwick.csv", "--aircraft", str(here / "aircraft.yaml"), "--rules", str(here / "rules.yaml"))
    assert done.code == 0, done.err


def test_the_summary_fits_its_schema(here: Path) -> None:
    import jsonschema

    schema = json.loads(call("schema", "summary").out)
    summary = json.loads(call("scan", "lark.csv", "empty.csv", "--aircraft", "larkspur.yaml", "--json", "-").out)
    jsonschema.validate(summary, schema)


def test_lint_goes_through_all_files_and_lists_all_problems(here: Path) -> None:
    bad = here / "bad.yaml"
    bad.write_text("format: exceed-fleet/1\noperator: A\noperator: B\nplanes: []\n")
    done = call("lint", "larkspur.yaml", str(bad), str(here / "none.yaml"))
    assert (done.code, done.err) == (2, "")
    assert "larkspur.yaml: no problem found" in done.out
    assert f"{bad}:3:1: " in done.out
    assert f"{here}/none.yaml: there is no such file" in done.out


def test_selfcheck_passes_and_names_its_sources() -> None:
    done = call("selfcheck")
    assert (done.code, done.err) == (0, "")
    assert "NACA" in done.out
    every = call("selfcheck", "--all")
    assert len(every.out.splitlines()) > len(done.out.splitlines())


def test_selfcheck_can_fail(monkeypatch: pytest.MonkeyPatch) -> None:
    from exceed.reference import check

    rows = check.run_checks()
    monkeypatch.setattr(check, "run_checks", lambda: [replace(rows[0], passed=False), *rows[1:]])
    assert call("selfcheck").code == 1


def test_nothing_is_left_behind(desk: Path) -> None:
    """No command of this file wrote into the folder it worked in: no ledger, no half file."""
    with contextlib.suppress(FileNotFoundError):
        shutil.rmtree(desk / "__pycache__")
    assert sorted(path.name for path in desk.iterdir()) == [
        "empty.csv", "fenwick.csv", "fenwick.yaml", "lark.csv", "larkspur.yaml",
    ]  # fmt: skip
