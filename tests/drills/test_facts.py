"""How the facts of an aeroplane apply: flaps, gear, rows of load factor, speeds in their kind, mass, centre of gravity.

Each case is worked out by hand from the aircraft file that stands in it.
"""

from __future__ import annotations

from math import sqrt
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import exceed
from drills.sortie import (
    ALT,
    BANK,
    BRAKES,
    FLAPS,
    GEAR,
    IAS,
    NZ,
    ROLL,
    USUAL,
    Array,
    Columns,
    coverage,
    events,
    held,
    pulse,
    reason,
    scanned,
    state,
)  # fmt: skip

ROWS = [
    {"flaps": "0 deg", "mass_up_to": "880 kg", "maximum": "6 g", "minimum": "-3 g"},
    {"flaps": "0 deg", "mass_up_to": "960 kg", "maximum": "4.4 g", "minimum": "-1.76 g"},
    {"flaps": "30 deg", "maximum": "2 g", "minimum": "0 g"},
]
V_FE = [{"flaps": "10 deg", "maximum": "80 KIAS"}, {"flaps": "30 deg", "maximum": "70 KIAS"}]
CLEAN = tuple(name for name in USUAL if name != FLAPS)
BEYOND_30 = "flaps 40 deg are beyond the last listed setting, whose limit is used: 30 deg"


# --- flaps and gear ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("flaps", ["not_recorded", "recorded", None])
def test_flaps_that_are_not_recorded_are_taken_as_up_and_leave_their_rules_unassessed(
    tmp_path: Path, flaps: str | None
) -> None:
    facts = {"flaps": flaps, "load_factor": ROWS, "speeds": {"flaps_extended": V_FE}}
    found = scanned(tmp_path, [pulse(NZ, 4.6, width=3.0)], facts=facts, columns=CLEAN)
    (event,) = events(found, "load-factor-high")
    assert event["limit"]["value"] == 4.4
    assert "flaps not recorded: taken as up" in event["notes"]
    assert reason(found, "flaps-extended") == "flap angle not recorded"
    assert coverage(found, "flaps-extended")["unassessed_s"] == found["recorded_s"]


def test_an_aeroplane_without_flaps_has_no_rules_about_them(tmp_path: Path) -> None:
    facts = {"flaps": "none", "stall_speed": None, "load_factor": [{"maximum": "4.4 g", "minimum": "-1.76 g"}],
             "limits": {"flaps_altitude": "1000 ft"}}  # fmt: skip
    found = scanned(tmp_path, [pulse(NZ, 4.6, width=3.0)], rules=("airframe", "handling"), facts=facts, columns=CLEAN)
    (event,) = events(found, "load-factor-high")
    assert not any("flaps" in note for note in event["notes"])
    for rule in ("flaps-extended", "flaps-altitude", "airbrakes-with-flaps"):
        assert reason(found, rule) == "the aeroplane has no flaps"
        assert coverage(found, rule)["not_applicable_s"] == found["recorded_s"]


@pytest.mark.parametrize(
    ("gear", "columns", "key", "said"),
    [
        ("fixed", USUAL, "not_applicable_s", "the gear is fixed"),
        ("not_recorded", [one for one in USUAL if one != GEAR], "unassessed_s", "gear down not recorded"),
        (None, [one for one in USUAL if one != GEAR], "unassessed_s", "gear down not recorded"),
    ],
)
def test_gear_rules_go_by_what_is_known_of_the_gear(
    tmp_path: Path, gear: str | None, columns: Any, key: str, said: str
) -> None:
    speeds = {} if gear == "fixed" else {"gear_extended": "70 KIAS", "gear_operating": "70 KIAS"}
    found = scanned(tmp_path, rules=("airframe", "landing"), facts={"gear": gear, "speeds": speeds}, columns=columns)
    for rule in ("gear-extended", "landing-gear-up", "landing-gear-late"):
        assert reason(found, rule) == said, rule
        assert coverage(found, rule)[key] == found["recorded_s"]


@pytest.mark.parametrize(("angle", "limit"), [(0.9, None), (5.0, 80), (10.9, 80), (11.5, 70), (30.0, 70), (40.0, 70)])
def test_the_flap_speed_is_that_of_the_smallest_setting_at_or_above_the_angle_less_a_degree(
    tmp_path: Path, angle: float, limit: float | None
) -> None:
    found = scanned(tmp_path, [held(FLAPS, angle, 130, 150, 0.1)], facts={"speeds": {"flaps_extended": V_FE}})
    if limit is None:
        assert [event for event in events(found, "flaps-extended") if event["start_s"] < 200] == []
        return
    (event,) = (one for one in events(found, "flaps-extended") if one["start_s"] < 200)
    assert (event["limit"]["value"], event["peak"]["value"]) == (limit, 100.0)
    assert (BEYOND_30 in event["notes"]) == (angle == 40.0)


# --- load factor ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("mass", "flaps", "pull", "limit", "severity"),
    [
        (700, 0.0, 6.2, 6.0, "caution"),  # a limit is never raised for a low mass
        (880, 0.0, 6.2, 6.0, "caution"),
        (881, 0.0, 4.6, 4.4, "caution"),
        (960, 0.0, 4.6, 4.4, "caution"),
        (1000, 0.0, 4.4, 4.4 * 960 / 1000, "caution"),
        (1000, 0.0, 4.9, 4.4 * 960 / 1000, "warning"),
        (900, 0.9, 4.6, 4.4, "caution"),
        (900, 5.0, 2.1, 2.0, "caution"),
        (900, 31.0, 2.1, 2.0, "caution"),
        (900, 40.0, 2.1, 2.0, "caution"),
        (1000, 30.0, 2.1, 2.0, "caution"),  # its row has no mass
    ],
)
def test_the_row_with_the_tightest_matching_keys_gives_the_load_factor(
    tmp_path: Path, mass: float, flaps: float, pull: float, limit: float, severity: str
) -> None:
    story = [held(FLAPS, flaps, 130, 150)] if flaps else []
    found = scanned(tmp_path, [*story, pulse(NZ, pull, width=3.0)], facts={"load_factor": ROWS}, mass=f"{mass} kg")
    (event,) = events(found, "load-factor-high")
    assert event["limit"]["value"] == pytest.approx(limit, abs=1e-4)
    assert event["severity"] == severity
    assert len(events(found, "take-off-mass")) == (mass > 960)
    assert (BEYOND_30 in event["notes"]) == (flaps == 40.0)


def test_the_negative_limit_goes_by_rows_too_and_shrinks_towards_zero(tmp_path: Path) -> None:
    found = scanned(tmp_path, [pulse(NZ, -1.8, width=3.0)], facts={"load_factor": ROWS}, mass="1000 kg")
    (event,) = events(found, "load-factor-low")
    assert event["limit"]["value"] == pytest.approx(-1.76 * 0.96)
    assert event["severity"] == "caution"  # 110 % of -1.69 is -1.859


def test_per_cent_levels_collapse_where_the_limit_is_next_to_nothing(tmp_path: Path) -> None:
    """With flaps out the limit is 0 g: 100 and 110 % of it are the same line, and a push beyond it is a warning."""
    found = scanned(tmp_path, [held(FLAPS, 30, 130, 150), pulse(NZ, -0.2, width=3.0)], facts={"load_factor": ROWS})
    (event,) = events(found, "load-factor-low")
    assert [(level["severity"], level["limit"]) for level in event["levels"]] == [("caution", 0.0), ("warning", 0.0)]
    assert event["severity"] == "warning"


@pytest.mark.parametrize(
    ("rows", "story", "pull", "limit"),
    [
        ([{"speed_up_to": "90 KIAS", "maximum": "4.4 g"}, {"maximum": "3 g"}], [], 3.2, 3.0),
        ([{"speed_up_to": "110 KIAS", "maximum": "4.4 g"}, {"maximum": "3 g"}], [], 4.6, 4.4),
        ([{"airbrakes": "out", "maximum": "3.5 g"}, {"maximum": "5.3 g"}], [state(BRAKES, "OUT", 130, 150)], 3.7, 3.5),
        ([{"airbrakes": "out", "maximum": "3.5 g"}, {"maximum": "5.3 g"}], [], 5.5, 5.3),
    ],
    ids=["above the speed", "up to the speed", "airbrakes out", "airbrakes in"],
)
def test_rows_by_speed_and_by_airbrakes_hold_where_they_say(
    tmp_path: Path, rows: list[dict[str, str]], story: list[Any], pull: float, limit: float
) -> None:
    both = [{**row, "minimum": "-2 g"} for row in rows]
    found = scanned(tmp_path, [*story, pulse(NZ, pull, width=3.0)], facts={"load_factor": both})
    (event,) = events(found, "load-factor-high")
    assert event["limit"]["value"] == pytest.approx(limit)


def test_the_limit_is_lower_while_rolling_where_the_manual_says_so(tmp_path: Path) -> None:
    facts = {"load_factor": [{"maximum": "3.8 g", "minimum": "-1.5 g"}]}
    rolling = {"rolling": {"factor": 0.667, "above_roll_rate": "15 deg/s"}}
    story = [pulse(NZ, 3.0, width=3.0), held(ROLL, -20.0, 138, 142)]
    (event,) = events(scanned(tmp_path, story, facts=facts | rolling), "load-factor-high")
    assert event["limit"]["value"] == pytest.approx(3.8 * 0.667)
    assert event["context"]["roll_rate"]["value"] == pytest.approx(-20.0, abs=0.1)
    assert events(scanned(tmp_path, [story[0]], facts=facts | rolling), "load-factor-high") == []
    without_rule = scanned(tmp_path, story, facts=facts)
    assert events(without_rule, "load-factor-high") == []
    assert (
        "the aircraft file gives no reduction of the load factor while rolling: none is applied"
        in (without_rule["notes"])
    )
    blind = scanned(tmp_path, [pulse(NZ, 4.0, width=3.0)], facts=facts | rolling, columns=(NZ, IAS, ALT))
    (event,) = events(blind, "load-factor-high")
    assert any("roll rate not recorded: rolling limit not looked at" in note for note in event["notes"])


# --- speeds -----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("climb", "limit"), [(0.0, 118.0 - 8.0 * 0.31), (17000.0, 110.0 - 8.0)])
def test_a_speed_table_over_altitude_is_linear_and_held_beyond_its_end(
    tmp_path: Path, climb: float, limit: float
) -> None:
    """118 kt at sea level, 110 at 10 000 ft, 102 at 20 000 ft; the story is at 3100 ft, and 17 000 ft higher."""
    points = [["0 ft", "118 KIAS"], ["10000 ft", "110 KIAS"], ["20000 ft", "102 KIAS"]]
    facts = {"speeds": {"never_exceed": {"over": "pressure_altitude", "points": points}}}

    def higher(_time: Array, columns: Columns) -> None:
        columns[ALT] = columns[ALT] + climb

    found = scanned(tmp_path, [held(IAS, 120, 140, 150, 5), higher], facts=facts)
    (event,) = events(found, "never-exceed")
    assert event["limit"]["value"] == pytest.approx(limit, abs=0.01)
    blind = scanned(tmp_path, [held(IAS, 120, 140, 150, 5)], facts=facts, columns=(NZ, IAS))
    assert events(blind, "never-exceed") == []
    assert "pressure altitude" in reason(blind, "never-exceed")


def test_the_manoeuvring_speed_makes_no_event(tmp_path: Path) -> None:
    facts = {"speeds": {"manoeuvring": "70 KIAS"}}
    found = scanned(tmp_path, rules=("airframe", "aerobatic", "landing", "handling", "gust", "engine"), facts=facts)
    assert found["events"] == []
    assert found["undecided"] == []


POSITION_ERROR = [
    {"flaps": "0 deg", "points": [["40 KIAS", "44 KCAS"], ["60 KIAS", "64 KCAS"], ["160 KIAS", "164 KCAS"]]}
]


def as_calibrated(_time: Array, columns: Columns) -> None:
    columns["CAS (kt)"] = columns.pop(IAS)


@pytest.mark.parametrize(
    ("limit", "story", "quantity", "value", "note"),
    [
        ("120 KIAS", [], "indicated_airspeed", 125.0, None),
        ("120 KCAS", [], "calibrated_airspeed", 129.0,
         "calibrated airspeed not recorded: converted by position error table"),
        ("120 KIAS", [as_calibrated], "indicated_airspeed", 121.0,
         "indicated airspeed not recorded: converted by position error table"),
        ("120 KCAS", [as_calibrated], "calibrated_airspeed", 125.0, None),
    ],
    ids=["KIAS by IAS", "KCAS by IAS", "KIAS by CAS", "KCAS by CAS"],
)  # fmt: skip
def test_a_speed_is_compared_in_the_kind_of_its_limit_and_converted_only_where_that_is_not_recorded(
    tmp_path: Path, limit: str, story: list[Any], quantity: str, value: float, note: str | None
) -> None:
    facts = {"speeds": {"never_exceed": limit}, "position_error": POSITION_ERROR}
    found = scanned(tmp_path, [held(IAS, 125, 140, 150, 5), *story], facts=facts)
    (event,) = events(found, "never-exceed")
    assert event["quantity"] == quantity
    assert event["peak"]["value"] == pytest.approx(value, abs=0.1)
    assert (event["peak"]["recorded"] is not None) == (note is None)
    assert [one for one in event["notes"] if "converted" in one] == ([note] if note else [])


def test_without_a_position_error_calibrated_is_taken_as_indicated_and_that_is_said(tmp_path: Path) -> None:
    found = scanned(tmp_path, [held(IAS, 125, 140, 150, 5)], facts={"speeds": {"never_exceed": "120 KCAS"}})
    (event,) = events(found, "never-exceed")
    assert "no position error given: calibrated airspeed taken as indicated" in event["notes"]


def test_beyond_the_position_error_table_the_last_correction_is_held_and_that_is_said(tmp_path: Path) -> None:
    short = [{"flaps": "0 deg", "points": [["40 KIAS", "44 KCAS"], ["110 KIAS", "112 KCAS"]]}]
    facts = {"speeds": {"never_exceed": "120 KCAS"}, "position_error": short}
    found = scanned(tmp_path, [held(IAS, 125, 140, 150, 5)], facts=facts)
    (event,) = events(found, "never-exceed")
    assert event["peak"]["value"] == pytest.approx(127.0, abs=0.1)
    said = "its table goes from 40 to 110 kt: beyond its ends the last correction is held"
    assert any(said in one for one in found["notes"])
    inside = scanned(tmp_path, facts=facts)
    assert not any("last correction is held" in one for one in inside["notes"])


def test_mach_is_worked_out_from_airspeed_and_altitude(tmp_path: Path) -> None:
    """M from calibrated airspeed and pressure altitude: ICAO standard atmosphere, subsonic pitot-static relations."""
    found = scanned(tmp_path, [held(IAS, 125, 140, 150, 5)], facts={"mach": {"maximum_operating": "0.19"}})
    (event,) = events(found, "maximum-operating-mach")
    pressure = (1.0 - 0.0065 * 3100 * 0.3048 / 288.15) ** 5.25588  # share of that at sea level
    impact = (1.0 + 0.2 * (125 * 1852 / 3600 / 340.294) ** 2) ** 3.5 - 1.0
    mach = sqrt(5.0 * ((impact / pressure + 1.0) ** (2 / 7) - 1.0))
    assert event["peak"]["value"] == pytest.approx(mach, rel=1e-3)


# --- mass and centre of gravity ---------------------------------------------------------------------------------------

LOADED = {
    "loading": {
        "empty_arm": "0.98 m",
        "stations": {"pilot": {"arm": "1.12 m"}, "baggage": {"arm": "1.80 m"},
                     "main_fuel": {"arm": "0.90 m", "density": "0.72 kg/L"}},
        "envelope": [["640 kg", "0.90 m", "1.05 m"], ["960 kg", "0.96 m", "1.05 m"]],
    },
    "mass": {"maximum_zero_fuel": "900 kg"},
}  # fmt: skip


@pytest.mark.parametrize(
    ("stations", "rule", "peak", "limit"),
    [
        # (640 * 0.98 + 82 * 1.12 + 100 * 1.8 + 50.4 * 0.9) / 872.4
        ({"pilot": "82 kg", "baggage": "100 kg", "main_fuel": "70 L"}, "centre-of-gravity-aft", 1.0825, 1.05),
        ({"pilot": "82 kg", "baggage": "200 kg", "main_fuel": "70 L"}, "take-off-mass", 972.4, 960),
        ({"pilot": "82 kg", "baggage": "200 kg", "main_fuel": "20 L"}, "zero-fuel-mass", 922, 900),
        ({"pilot": "0 kg", "baggage": "0 kg", "main_fuel": "400 L"}, "centre-of-gravity-forward", 0.9552, 0.955),
    ],
)  # fmt: skip
def test_a_loading_sheet_gives_mass_and_centre_of_gravity(
    tmp_path: Path, stations: dict[str, str], rule: str, peak: float, limit: float
) -> None:
    facts = LOADED
    if rule == "centre-of-gravity-forward":
        # 928 kg with its fuel well ahead: the forward limit there is 0.954 m, so the tank is put at 0.84 m
        facts = {**LOADED, "loading": {**LOADED["loading"], "stations": {
            **LOADED["loading"]["stations"], "main_fuel": {"arm": "0.84 m", "density": "0.72 kg/L"}}}}  # fmt: skip
        peak, limit = (640 * 0.98 + 288 * 0.84) / 928, 0.90 + 0.06 * (928 - 640) / 320
    found = scanned(tmp_path, facts=facts, loading={"stations": stations})
    (event,) = events(found, rule)
    assert event["peak"]["value"] == pytest.approx(peak, abs=1e-4 if peak < 2 else 0.5)
    assert event["limit"]["value"] == pytest.approx(limit, abs=1e-3)
    assert found["flights"][0]["mass"]["method"].startswith("loading sheet")


def test_a_loading_sheet_within_all_limits_is_silent(tmp_path: Path) -> None:
    found = scanned(
        tmp_path, facts=LOADED, loading={"stations": {"pilot": "82 kg", "baggage": "4 kg", "main_fuel": "70 L"}}
    )
    assert found["events"] == found["undecided"] == []
    for rule in ("take-off-mass", "zero-fuel-mass", "centre-of-gravity-aft", "centre-of-gravity-forward"):
        assert coverage(found, rule)["assessed_s"] == found["recorded_s"]


def test_a_loading_that_only_fuel_keeps_within_limits_is_said(tmp_path: Path) -> None:
    """(640 * 0.98 + 82 * 1.12 + 45 * 1.8) / 767 = 1.0430 m against 1.02 m; 50.4 kg of fuel at 0.9 m do not mend it."""
    envelope = [["640 kg", "0.90 m", "1.02 m"], ["960 kg", "0.96 m", "1.05 m"]]
    stations = {**LOADED["loading"]["stations"], "baggage": {"arm": "1.80 m", "maximum": "40 kg"}}
    facts = {"loading": {**LOADED["loading"], "envelope": envelope, "stations": stations}}
    found = scanned(
        tmp_path, facts=facts, loading={"stations": {"pilot": "82 kg", "baggage": "45 kg", "main_fuel": "70 L"}}
    )
    limit = 1.02 + 0.03 * (767 - 640) / 320
    arm = (640 * 0.98 + 82 * 1.12 + 45 * 1.8) / 767
    assert (
        f"flight 1: without fuel, at 767 kg, the centre of gravity would be at {arm:.3f} m, outside its limits from "
        f"{0.90 + 0.06 * 127 / 320:.3f} to {limit:.3f} m"
    ) in found["notes"]
    assert "flight 1: station baggage carries 45.0 kg, more than its maximum of 40 kg" in found["notes"]


def test_without_a_sheet_there_is_no_centre_of_gravity_to_judge(tmp_path: Path) -> None:
    found = scanned(tmp_path, facts=LOADED)
    assert reason(found, "centre-of-gravity-aft") == "centre of gravity: no loading sheet"


def test_an_unknown_mass_gives_both_verdicts_and_is_possible_at_most(tmp_path: Path) -> None:
    found = scanned(tmp_path, [pulse(NZ, 5.0, width=3.0)], facts={"load_factor": ROWS}, mass=None)
    (event,) = events(found, "load-factor-high")
    assert (event["severity"], event["certainty"]) == ("warning", "possible")
    assert all(level["probability"] < 0.5 for level in event["levels"])
    assert any("at mass 960 kg: warning; at mass 640 kg: none" in note for note in event["notes"])
    assert found["flights"][0]["mass"]["low"] == 640.0
    assert found["flights"][0]["mass"]["high"] == 960.0


def test_where_an_unknown_mass_changes_nothing_the_event_is_as_sure_as_ever(tmp_path: Path) -> None:
    found = scanned(tmp_path, [pulse(NZ, 7.0, width=3.0)], facts={"load_factor": ROWS}, mass=None)
    (event,) = events(found, "load-factor-high")
    assert (event["severity"], event["certainty"]) == ("warning", "established")
    assert not any("depends on what is not known" in note for note in event["notes"])


def test_an_unknown_mass_clears_no_limit_of_mass(tmp_path: Path) -> None:
    found = scanned(tmp_path, [], rules=("airframe", "landing"), mass=None)
    for rule in ("take-off-mass", "landing-mass"):
        assert events(found, rule) == []
        assert coverage(found, rule)["assessed_s"] == 0.0
        assert reason(found, rule) == "mass not known: only the range from 640 to 960 kg"


def test_limits_of_a_category_are_marked_assumed(tmp_path: Path) -> None:
    """Acrobatic category: 6 g, 14 CFR 23.337 before Amdt 23-64."""
    scanned(tmp_path, [pulse(NZ, 6.3, width=3.0)])
    result = exceed.scan(tmp_path / "log.csv", aircraft="aerobatic", mass="900 kg")
    (event,) = (one for one in result.summary["recordings"][0]["events"] if one["rule"] == "load-factor-high")
    assert event["limit"] == {
        "value": 6.0, "unit": "g", "source": "aircraft.load_factor.maximum", "assumed": True,
    }  # fmt: skip
    assert event["severity"] == "caution"
    assert result.summary["recordings"][0]["limits"] == "assumed"
    # what the category says nothing of is not applicable
    assert coverage(result.summary["recordings"][0], "never-exceed")["not_applicable_s"] > 0


def test_without_any_aircraft_nothing_is_judged_and_the_extremes_are_there(tmp_path: Path) -> None:
    found = scanned(tmp_path, [pulse(NZ, 6.3, width=3.0)], aircraft=False)
    assert found["events"] == []
    assert found["limits"] == "none"
    (extreme,) = (one for one in found["flights"][0]["extremes"] if one["quantity"] == "load_factor")
    assert extreme["maximum"]["value"] == pytest.approx(6.3)
    assert reason(found, "load-factor-high") == "no limits known for this aeroplane"
    assert np.isfinite(extreme["minimum"]["value"])
    assert BANK in [row["column"] for row in found["channels"]]
