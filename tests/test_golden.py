"""Golden runs: invented logs, aircraft and rules give this JSON and these tables, whole.

A difference is no fault by itself: `python tests/golden/regenerate.py` writes them anew, and its diff is for people to
read. The runs are few and plain, so that an honest improvement changes little.
"""

from __future__ import annotations

import json
from functools import lru_cache
from typing import Any

import pytest
from golden.logs import LOGS
from golden.regenerate import HERE, RUNS, outputs

DO = "read the diff of `python tests/golden/regenerate.py`"
NAMES = [f"{name}{ending}" for name in RUNS for ending in (".json", "-piped.txt", "-80.txt")]


@lru_cache(maxsize=1)
def made() -> dict[str, str]:
    return outputs()


def golden(name: str) -> str:
    return (HERE / name).read_text(encoding="utf-8")


def recording(run: str, path: str) -> dict[str, Any]:
    (found,) = (one for one in json.loads(golden(f"{run}.json"))["recordings"] if one["path"] == path)
    return found  # type: ignore[no-any-return]


@pytest.mark.parametrize("name", LOGS)
def test_the_logs_are_those_that_their_script_writes(name: str) -> None:
    assert golden(name) == LOGS[name](), DO


@pytest.mark.parametrize("name", NAMES)
def test_a_run_gives_what_it_gave(name: str) -> None:
    assert made()[name].splitlines() == golden(name).splitlines(), DO


def test_no_golden_file_is_left_over() -> None:
    assert {path.name for path in HERE.glob("*.txt")} | {path.name for path in HERE.glob("*.json")} == set(NAMES)


def test_the_golden_texts_fit_and_carry_no_colour() -> None:
    for name in NAMES:
        assert "\x1b" not in golden(name)
        if name.endswith("-80.txt"):
            assert max(map(len, golden(name).splitlines())) <= 80, name


# --- what the golden files hold must also be true, whoever regenerated them ----------------------------------------


def test_the_sortie_is_judged_as_it_was_written() -> None:
    """The pull: 1 g and half a sine of 5.4 g over 2.2 s from 119 s on."""
    found = recording("day", "sortie.csv")
    (event,) = (one for one in found["events"] if one["rule"] == "load-factor-high")
    assert event["peak"]["low"] <= 6.4 <= event["peak"]["high"]
    assert event["peak"]["estimate"] == pytest.approx(6.4, abs=0.03)
    assert event["peak"]["time_s"] == pytest.approx(120.1, abs=0.13)
    # above 6 g while sin > 5 / 5.4
    assert (event["start_s"], event["end_s"]) == (pytest.approx(119.83, abs=0.05), pytest.approx(120.37, abs=0.05))
    assert (event["severity"], event["certainty"], event["phase"]) == ("caution", "established", "manoeuvring")
    (gap,) = found["clock"]["gaps"]
    assert (gap["start_s"], gap["end_s"]) == (150.0, 154.0)
    (fast,) = (one for one in found["events"] if one["rule"] == "normal-operating")
    # 140 kt at 90 s + 20 s * 50 / 60, and at 110 s + 14 s / 2
    assert (fast["start_s"], fast["end_s"]) == (pytest.approx(106.67, abs=0.1), pytest.approx(117.0, abs=0.1))
    assert fast["peak"]["estimate"] == pytest.approx(150.0, abs=0.3)
    (flight,) = found["flights"]
    assert (flight["landings"], flight["take_off"]) == (1, None)


def test_the_descent_is_judged_as_it_was_written() -> None:
    found = recording("day", "descent.csv")
    events = {one["rule"]: one for one in found["events"]}
    fastest = 318.0 / 1.852
    assert events["never-exceed"]["peak"]["estimate"] == pytest.approx(fastest, abs=0.2)
    assert events["never-exceed"]["severity"] == "warning"
    assert events["never-exceed"]["start"].startswith("2031-05-02T09:30:5")
    # 185 km/h and less with flaps of 20 deg: 100 kt at the start, 90 kt at 150 s + 30 s * (185 - 166.68) / 35
    assert events["flaps-extended"]["end_s"] == pytest.approx(165.7, abs=0.6)
    assert events["flaps-extended"]["limit"]["value"] == pytest.approx(90.0)
    assert found["unused_columns"] == ["Setting 4"]


def test_the_bare_log_is_judged_by_nothing_and_says_so() -> None:
    summary = json.loads(golden("bare.json"))
    assert summary["totals"]["events"] == {"advisory": 0, "caution": 0, "warning": 0}
    (found,) = summary["recordings"]
    assert found["registration"] is None
    assert [one["column"] for one in found["unresolved_columns"]] == ["SPD"]
    assert [(one["reason"], one["start_s"]) for one in found["rejected"]] == [("spike", 75.0)]
    assert "no limits known for this aeroplane" in golden("bare-piped.txt")
