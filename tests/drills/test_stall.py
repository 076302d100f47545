"""A stall is possible at most where only the margin shows it; the warning or a break of the load factor say more."""

from __future__ import annotations

from pathlib import Path

import pytest

from drills.sortie import BANK, GEAR, IAS, NZ, USUAL, WARNING, Change, events, held, scanned, state

# 50 KCAS at 960 kg, so 48.4 at 900 kg, and 68.5 at 2 g
SLOW = held(IAS, 65, 130, 160, 8)
EASED_OFF = held(NZ, 2.0, 140, 146, 4)
BROKE = held(NZ, 2.0, 140, 146, 0.25)
WARNED = state(WARNING, "ON", 139, 147)


@pytest.mark.parametrize(
    ("story", "highest", "said"),
    [
        ([SLOW, EASED_OFF], "possible", None),
        ([SLOW, BROKE], "likely", "more than the margin shows it: the load factor broke"),
        ([SLOW, EASED_OFF, WARNED], "likely", "more than the margin shows it: the stall warning was on"),
    ],
    ids=["margin", "break", "warning"],
)
def test_an_accelerated_stall_is_as_sure_as_its_evidence(
    tmp_path: Path, story: list[Change], highest: str, said: str | None
) -> None:
    (event,) = events(scanned(tmp_path, story, rules="handling"), "accelerated-stall")
    assert event["certainty"] == highest
    assert event["peak"]["value"] == pytest.approx(-3.5, abs=0.4)
    assert (said in event["notes"]) if said else not any("more than the margin" in note for note in event["notes"])
    assert all(level["probability"] < 0.5 for level in event["levels"]) == (said is None)


def test_a_condition_that_rests_on_a_capped_method_caps_the_event(tmp_path: Path) -> None:
    """When the gear moved is only taken from when it was down."""
    found = scanned(
        tmp_path, [state(GEAR, "DOWN", 140, 500)], facts={"speeds": {"gear_operating": "90 KIAS"}}, columns=USUAL
    )
    (event,) = events(found, "gear-operating")
    assert event["certainty"] == "possible"
    assert 0.49 < event["levels"][0]["probability"] < 0.5


def test_a_load_factor_of_a_level_turn_is_possible_at_most_and_clears_nothing(tmp_path: Path) -> None:
    """1 / cos 75 deg is 3.86."""
    found = scanned(
        tmp_path,
        [held(BANK, 75.0, 140, 160, 4)],
        facts={"load_factor": [{"maximum": "3.8 g", "minimum": "-1.5 g"}]},
        columns=(BANK, IAS),
    )
    (method,) = (row for row in found["methods"] if row["quantity"] == "load_factor")
    assert method["method"] == "level turn"
    (event,) = events(found, "load-factor-high")
    assert event["certainty"] == "possible"
    (row,) = (one for one in found["assessment"] if one["rule"] == "load-factor-high" and one["flight"] is None)
    assert row["assessed_s"] == 0.0
    assert row["reasons"][0]["reason"] == "method"
