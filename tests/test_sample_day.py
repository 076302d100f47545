"""The whole program on the invented day: each log's story is found, and nothing that is not true.

The truth (`tests/scenario/truth.json`) comes from the flight model at 100 Hz, before any recorder saw it.
"""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Iterator
from functools import lru_cache
from pathlib import Path
from typing import Any

import pytest

HERE = Path(__file__).resolve().parent
LOGS = HERE.parent / "sample_logs"
TRUTH: dict[str, Any] = json.loads((HERE / "scenario" / "truth.json").read_text())["logs"]

# family of the truth -> the rules that look at it
FAMILIES = {
    "positive load factor": ("load-factor-high",),
    "negative load factor": ("load-factor-low",),
    "maximum speed": ("never-exceed", "maximum-operating"),
    "flap speed": ("flaps-extended",),
    "maximum Mach number": ("maximum-operating-mach",),
    "gear speed": ("gear-extended", "gear-operating"),
}
PEAKS = [
    pytest.param(path, row, id=f"{path}-{row['family']}")
    for path, facts in TRUTH.items()
    for row in facts["expected"]
    if row["family"] != "stall"
]


def run(*options: str) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "exceed", "scan", str(LOGS), "--json", "-", *options]
    return subprocess.run(command, capture_output=True, text=True, check=False, timeout=300)


@lru_cache(maxsize=1)
def summary() -> dict[str, Any]:
    done = run()
    assert done.returncode == 0, done.stderr
    return json.loads(done.stdout)  # type: ignore[no-any-return]


def recording(path: str) -> dict[str, Any]:
    (found,) = (one for one in summary()["recordings"] if one["path"] == path)
    return found  # type: ignore[no-any-return]


def of_family(events: list[dict[str, Any]], family: str) -> Iterator[dict[str, Any]]:
    return (event for event in events if event["rule"] in FAMILIES[family])


def near(event: dict[str, Any], row: dict[str, Any], slack: float = 0.5) -> bool:
    return bool(event["start_s"] - slack <= row["true_peak_s"] <= event["end_s"] + slack)


def test_every_log_is_read_and_belongs_to_its_aeroplane() -> None:
    assert {one["path"]: one["registration"] for one in summary()["recordings"]} == {
        path: facts["registration"] for path, facts in TRUTH.items()
    }
    assert {one["path"]: one["status"] for one in summary()["recordings"]} == dict.fromkeys(TRUTH, "ok")
    assert summary()["totals"]["failed"] == 0


@pytest.mark.parametrize("path", TRUTH)
def test_rows_time_and_clock_are_those_that_were_written(path: str) -> None:
    found, facts = recording(path), TRUTH[path]
    assert found["rows"] == facts["rows"]
    assert found["recorded_s"] == pytest.approx(facts["recorded_s"], abs=1.01)  # a sub-frame's last second may count
    if facts["start"] is None:
        assert found["clock"]["start"] is None
    else:
        assert found["clock"]["start"][:19] == facts["start"][:19]
    assert len(found["clock"]["gaps"]) == len(facts["gaps"])


@pytest.mark.parametrize("path", TRUTH)
def test_the_flight_is_told_from_the_ground(path: str) -> None:
    (flight,) = recording(path)["flights"]
    (true,) = TRUTH[path]["flights"] if len(TRUTH[path]["flights"]) == 1 else (None,)
    assert true is not None
    assert flight["start_s"] == pytest.approx(true["take_off_s"], abs=8.0)
    assert flight["end_s"] == pytest.approx(true["landing_s"], abs=15.0)


@pytest.mark.parametrize(("path", "row"), PEAKS)
def test_what_truly_went_beyond_a_limit_is_found_where_it_was(path: str, row: dict[str, Any]) -> None:
    found, facts = recording(path), TRUTH[path]
    events = found["events"] + (found["undecided"] if row["expect"] == "hidden" else [])
    (event,) = (one for one in of_family(events, row["family"]) if near(one, row))
    assert event["limit"]["value"] == pytest.approx(row["limit"], abs=1e-3)
    assert event["limit_exceeded"] or row["expect"] == "hidden"
    peak = event["peak"]
    assert peak["low"] <= row["true_peak"]
    # no sensor of the day came to its end, and every channel is quick enough to size its peak
    assert row["true_peak"] <= peak["high"]
    interval = 1.0 / facts["rate_hz"]
    if row["expect"] == "found":
        # sensors are out by some hundredths of g or tenths of kt, which moves a crossing by a little
        assert event["start_s"] == pytest.approx(row["true_start_s"], abs=max(2.0 * interval, 0.8))
        assert event["certainty"] in ("established", "likely")
    if row["expect"] == "found" and row["cut_by"] is None:
        assert event["end_s"] == pytest.approx(row["true_end_s"], abs=max(2.0 * interval, 0.8))
    assert event["cut_by"] == row["cut_by"]


@pytest.mark.parametrize("path", TRUTH)
def test_nothing_is_found_that_was_not_so(path: str) -> None:
    found, facts = recording(path), TRUTH[path]
    for family in FAMILIES:
        true = [row for row in facts["expected"] if row["family"] == family]
        for event in of_family(found["events"], family):
            beyond = event["limit_exceeded"] and event["certainty"] != "doubtful"
            assert not beyond or any(near(event, row) for row in true), event


@pytest.mark.parametrize("path", ["zz-nma/nma-0810.txt", "zz-nmc/nmc_20310502_0840.csv.gz"])
def test_clean_and_gusty_flights_stay_without_undecided_load_factors(path: str) -> None:
    assert [one for one in recording(path)["undecided"] if one["quantity"] == "load_factor"] == []


def test_spikes_are_rejected_and_said() -> None:
    found = recording("zz-nma/nma-1145.csv")
    spikes = [one for one in found["rejected"] if one["quantity"] == "load_factor" and one["reason"] == "spike"]
    for true in TRUTH["zz-nma/nma-1145.csv"]["spikes"]:
        (one,) = (one for one in spikes if abs(one["start_s"] - true["time_s"]) < 0.2)
        assert one["extreme"]["value"] == pytest.approx(true["load_factor_g"], abs=0.1)
        # -5.2 g and 8.6 g are beyond the limits, 4.9 g is not beyond 6 g
        assert bool(one["would_exceed"]) == (true["load_factor_g"] in (8.6, -5.2))
    pull = TRUTH["zz-nma/nma-1145.csv"]["expected"][0]
    assert not any(abs(one["start_s"] - pull["true_peak_s"]) < 2.0 for one in spikes)


def test_the_gap_is_counted_as_unassessed() -> None:
    found = recording("zz-nma/nma-1305.tsv")
    ((begin, finish),) = TRUTH["zz-nma/nma-1305.tsv"]["gaps"]
    (gap,) = found["clock"]["gaps"]
    assert gap["start_s"] == pytest.approx(begin, abs=0.126)
    assert gap["end_s"] == pytest.approx(finish, abs=0.126)
    (event,) = of_family(found["events"], "positive load factor")
    rows = [row for row in found["assessment"] if row["rule"] == event["rule"] and row["flight"] is None]
    assert sum(reason["seconds"] for row in rows for reason in row["reasons"] if reason["reason"] == "gap") > 5.0


def test_the_accelerated_stall_is_seen_and_its_warning() -> None:
    path = "zz-nmc/nmc_20310502_1005.csv"
    (true,) = TRUTH[path]["expected"]
    for rule in ("stall-warning", "accelerated-stall"):
        events = [one for one in recording(path)["events"] if one["rule"] == rule]
        # warning and margin are recorded once a second
        assert any(one["start_s"] - 2.0 <= true["time_s"] <= one["end_s"] + 3.0 for one in events), rule
        # away from the steep turn there is no such thing
        assert all(abs(one["start_s"] - true["time_s"]) < 10.0 for one in events), rule


def test_the_hard_landing_is_measured() -> None:
    path = "zz-nmj/C30-008_b.parquet"
    (touch,) = TRUTH[path]["touchdowns"]
    events = {one["rule"]: one for one in recording(path)["events"]}
    load, sink = events["touchdown-load-factor"], events["touchdown-sink-rate"]
    assert load["peak"]["value"] == pytest.approx(touch["recorded_load_factor_g"], abs=0.1)
    assert abs(sink["peak"]["value"]) == pytest.approx(touch["sink_rate_ft_min"], rel=0.25)
    for event in (load, sink):
        assert event["start_s"] == pytest.approx(touch["time_s"], abs=2.0)


def test_mass_follows_the_loading_sheets() -> None:
    for path, facts in TRUTH.items():
        mass = recording(path)["flights"][0]["mass"]
        if path == "zz-nma/nma-0810.txt":  # no sheet for that one
            continue
        # the sheet counts the fuel that taxiing burns before take-off
        assert 0.0 <= mass["take_off"] - facts["mass_kg"]["take_off"] < 0.0015 * facts["mass_kg"]["take_off"] + 1.0, (
            path
        )


def test_fail_at_turns_events_into_an_exit_code() -> None:
    assert run("--fail-at", "caution").returncode == 1
