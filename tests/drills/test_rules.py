"""Each built-in rule end to end: found beyond its limit, silent inside it, and what it says where it cannot judge."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
import yaml

from drills.sortie import NZ, USUAL, coverage, events, gap, pulse, reason, scanned
from drills.table import DRILLS, LIMITS, Drill

RULES = Path(__file__).resolve().parents[2] / "rules"

each = pytest.mark.parametrize("drill", DRILLS, ids=lambda drill: f"{drill.rules}-{drill.rule}")
CERTAINTIES = ("doubtful", "possible", "likely", "established")


def fly(folder: Path, drill: Drill, changes: Any, **more: Any) -> dict[str, Any]:
    asked = {"rules": drill.rules, "facts": drill.facts, "mass": drill.mass}
    return scanned(folder, changes, **{**asked, **more})


@each
def test_a_story_beyond_the_limit_is_one_event_with_its_figures(tmp_path: Path, drill: Drill) -> None:
    found = fly(tmp_path, drill, drill.beyond)
    (event,) = events(found, drill.rule)
    assert (event["severity"], event["limit_exceeded"]) == (drill.severity, drill.exceeded)
    assert event["limit"]["source"] == drill.source
    assert event["limit"]["value"] == pytest.approx(drill.limit, rel=1e-4)
    assert event["peak"]["value"] == pytest.approx(drill.peak, rel=drill.tolerance, abs=0.01)
    if drill.start is not None:
        assert event["start_s"] == pytest.approx(drill.start, abs=drill.slack)
    if drill.end is not None:
        assert event["end_s"] == pytest.approx(drill.end, abs=drill.slack)
    assert event["phase"] in drill.phase
    assert event["flight"] == 1
    assert event["certainty"] == drill.most
    assert event["cut_by"] == drill.cut_by
    assert {"indicated_airspeed", "pressure_altitude"} <= set(event["context"])
    due = [row for row in found["inspections"] if row["rule"] == drill.rule]
    assert [row["status"] for row in due] == ["due"] * drill.inspection
    assert (event["inspection"] is not None) == drill.inspection
    assert all(row["events"] == [event["id"]] and row["task"] == event["inspection"] for row in due)


@each
def test_a_story_inside_the_limit_is_silent_and_assessed(tmp_path: Path, drill: Drill) -> None:
    found = fly(tmp_path, drill, drill.inside, mass=drill.mass_inside)
    assert events(found, drill.rule) == []
    assert events(found, drill.rule, undecided=True) == []
    row = coverage(found, drill.rule)
    assert row["assessed_s"] == pytest.approx(found["recorded_s"], abs=1e-6)


SETS = ("airframe", "aerobatic", "landing", "handling", "gust", "engine")


def test_every_built_in_rule_has_a_drill() -> None:
    written = {
        (name, rule["id"]) for name in SETS for rule in yaml.safe_load((RULES / f"{name}.yaml").read_text())["rules"]
    }
    drilled = {(drill.rules, drill.rule) for drill in DRILLS}
    assert written - drilled == {("airframe", "centre-of-gravity-forward"), ("airframe", "centre-of-gravity-aft")}
    assert drilled <= written


@pytest.mark.parametrize("columns", [USUAL, USUAL[:4], USUAL[2:3]], ids=["all", "four", "airspeed"])
def test_time_adds_up_for_every_rule_and_flight(tmp_path: Path, columns: tuple[str, ...]) -> None:
    found = scanned(tmp_path, [gap(100, 130), pulse(NZ, 4.0)], rules=SETS, facts=LIMITS, columns=columns)
    assert found["flights"]
    for row in found["assessment"]:
        flight = None if row["flight"] is None else found["flights"][row["flight"] - 1]
        whole = found["recorded_s"] if flight is None else flight["end_s"] - flight["start_s"]
        assert row["assessed_s"] + row["unassessed_s"] + row["not_applicable_s"] == pytest.approx(whole, abs=2e-3)
        assert sum(one["seconds"] for one in row["reasons"]) == pytest.approx(whole - row["assessed_s"], abs=2e-3)


@pytest.mark.parametrize("drill", [drill for drill in DRILLS if drill.fact_missing], ids=lambda drill: drill.rule)
def test_a_rule_without_its_fact_is_not_applicable_and_says_why(tmp_path: Path, drill: Drill) -> None:
    found = fly(tmp_path, drill, drill.beyond, facts={})
    assert events(found, drill.rule) == []
    row = coverage(found, drill.rule)
    assert row["not_applicable_s"] == found["recorded_s"]
    assert reason(found, drill.rule) == drill.fact_missing


@pytest.mark.parametrize("drill", [drill for drill in DRILLS if drill.lacks[0]], ids=lambda drill: drill.rule)
def test_a_rule_without_its_channel_is_unassessed_and_says_why(tmp_path: Path, drill: Drill) -> None:
    dropped, word = drill.lacks
    kept = [name for name in USUAL if name not in dropped]
    story = [change for change in drill.beyond if _column(change) not in dropped]
    found = fly(tmp_path, drill, [] if len(story) < len(drill.beyond) else story, columns=kept)
    assert events(found, drill.rule) == []
    row = coverage(found, drill.rule)
    assert row["unassessed_s"] == found["recorded_s"]
    assert word in reason(found, drill.rule)


def _column(change: Any) -> str:
    """The column that a change of `sortie` writes."""
    return next((cell.cell_contents for cell in change.__closure__ or () if isinstance(cell.cell_contents, str)), "")
