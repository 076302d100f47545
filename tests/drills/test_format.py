"""Every key of a rules file in a story of its own, with a user's own rules file.

The airspeed of the quiet flight is 100 kt from 110 to 180 s; `humps` lay straight-sided hills on it, 5 kt a second up
and down, so that every crossing can be worked out in the head.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

import exceed
from drills.sortie import (
    ALT,
    BANK,
    BRAKES,
    END,
    FLAPS,
    IAS,
    NZ,
    PITCH,
    USUAL,
    Array,
    Change,
    Columns,
    coverage,
    events,
    gap,
    held,
    level,
    more,
    plateau,
    pulse,
    reason,
    scanned,
    state,
)  # fmt: skip


def humps(*hills: tuple[float, float, float]) -> Change:
    """(top kt, start s, end s): the airspeed goes to the top at 5 kt/s, stays from start to end, and comes back."""

    def change(time: Array, columns: Columns) -> None:
        speed = np.full(len(time), -np.inf)
        for top, start, end in hills:
            ramp = (top - 100.0) / 5.0
            hill = 100.0 + (top - 100.0) * plateau(time, start, end, ramp)
            speed = np.maximum(speed, hill)
        cruise = (time > 112) & (time < 178)
        # a recorder's last digit is never still
        columns[IAS] = np.where(cruise, speed - 0.004 * (1 + np.sin(7.0 * time)), columns[IAS])

    return change


def ruled(
    keys: str, quantity: str = "airspeed", limit: str = "limit: 110 KIAS", levels: str = "above: {caution: 100 %}"
) -> str:
    """A rules file of one rule, judged on samples unless it says otherwise."""
    on = "" if "judge_on" in keys else "judge_on: sample, "
    return (
        "format: exceed-rules/1\ntitle: Mine\nquantities: {oil_temperature: degC}\nrules:\n"
        f"  - {{id: mine, quantity: {quantity}, {limit + ', ' if limit else ''}{levels + ', ' if levels else ''}{on}"
        f"{keys or 'source: mine'}}}\n"
    )


def found(folder: Path, text: str, *story: Change, **more_of: Any) -> list[dict[str, Any]]:
    return events(scanned(folder, story, rules=text, **more_of), "mine")


# --- lasting, joining, release ----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("keys", "count"),
    [
        # two hills of 115 kt, 120..122 and 128..130 s: beyond 110 kt from 119 to 123 and from 127 to 131 s
        ("joining: 0 s", 2),
        ("joining: 3.9 s", 2),
        ("joining: 4.1 s", 1),
        ("lasting: 3.9 s", 2),
        ("lasting: 4.1 s", 0),
        ("joining: 4.1 s, lasting: 11 s", 1),  # joined first, then long enough: 119 to 131 s
        ("joining: 4.1 s, lasting: 12.2 s", 0),
        ("release: 9.9 kt", 2),  # between them it falls to 100 kt
        ("release: 10.1 kt", 1),
        ("release: 8.9 %", 2),  # of 110 kt: 9.8
        ("release: 9.2 %", 1),
        ("release: 10.1 kt, lasting: 11 s", 1),  # release, then lasting
        ("release: 9.9 kt, joining: 4.1 s, lasting: 11 s", 1),
    ],
)
def test_release_then_joining_then_lasting_make_events(tmp_path: Path, keys: str, count: int) -> None:
    made = found(tmp_path, ruled(keys), humps((115, 120, 122), (115, 128, 130)))
    assert len(made) == count
    if count == 1:
        assert made[0]["start_s"] == pytest.approx(119, abs=0.05)
        assert made[0]["end_s"] == pytest.approx(131, abs=0.05)
        # the time truly beyond is that of the two hills alone
        assert made[0]["levels"][0]["beyond_s"] == pytest.approx(8, abs=0.1)
    if count == 2:
        assert [event["start_s"] for event in made] == pytest.approx([119, 127], abs=0.05)


def test_a_released_stretch_may_drift_between_the_limit_and_the_release(tmp_path: Path) -> None:
    """Down to 107 kt and up again: one event with a release of 4 kt, two with 2 kt, however long it takes."""
    story = humps((115, 120, 122), (107, 115, 160), (115, 150, 152))
    assert len(found(tmp_path, ruled("release: 4 kt"), story)) == 1
    assert len(found(tmp_path, ruled("release: 2 kt"), story)) == 2


def test_joining_spans_no_false_condition_and_no_gap(tmp_path: Path) -> None:
    story = humps((115, 120, 122), (115, 128, 130))
    assert len(found(tmp_path, ruled("joining: 10 s"), story)) == 1
    assert len(found(tmp_path, ruled("joining: 10 s"), story, gap(124, 126))) == 2
    brakes = "joining: 10 s, when: [{quantity: airbrakes_out, is: in}]"
    assert len(found(tmp_path, ruled(brakes), story, state(BRAKES, "OUT", 124, 125))) == 2


def test_a_false_condition_cuts_an_excursion(tmp_path: Path) -> None:
    text = ruled("when: [{quantity: airbrakes_out, is: in}]")
    first, second = found(tmp_path, text, humps((115, 120, 130)), state(BRAKES, "OUT", 124, 125))
    assert (first["start_s"], first["end_s"], first["cut_by"]) == (pytest.approx(119, abs=0.05), 123.875, "condition")
    assert (second["start_s"], second["end_s"], second["cut_by"]) == (125.0, pytest.approx(131, abs=0.05), "condition")


def test_a_gap_cuts_an_excursion_and_is_not_assessed(tmp_path: Path) -> None:
    whole = scanned(tmp_path, [humps((115, 120, 130)), gap(124, 127)], rules=ruled(""))
    first, second = events(whole, "mine")
    assert (first["end_s"], first["cut_by"]) == (124.0, "gap")
    assert (second["start_s"], second["cut_by"]) == (127.0, "gap")
    row = coverage(whole, "mine")
    assert row["reasons"] == [{"reason": "gap", "seconds": 3.0}]


def test_the_ends_of_a_recording_cut(tmp_path: Path) -> None:
    def always(_time: Array, columns: Columns) -> None:
        columns[IAS] = columns[IAS] + 120.0

    (event,) = found(tmp_path, ruled(""), always)
    assert (event["start_s"], event["end_s"], event["cut_by"]) == (0.0, END, "recording_start")

    def late(time: Array, columns: Columns) -> None:
        columns["Oil Temperature (degC)"] = np.interp(time, [0, 360, 370], [90, 90, 130.0])

    (event,) = found(tmp_path, ruled("", "oil_temperature", "limit: 120 degC"), late)
    assert (event["start_s"], event["end_s"], event["cut_by"]) == (pytest.approx(367.5, abs=0.05), END, "recording_end")


# --- levels and limits ------------------------------------------------------------------------------------------------


def test_levels_hold_each_their_own_time_and_probability(tmp_path: Path) -> None:
    """118 kt against 110: 100 % passed, 105 % (115.5 kt) passed, 110 % (121 kt) not."""
    text = ruled("", levels="above: {advisory: 100 %, caution: 105 %, warning: 110 %}")
    (event,) = found(tmp_path, text, humps((118, 120, 130)))
    assert event["severity"] == "caution"
    rows = {row["severity"]: row for row in event["levels"]}
    assert [rows[name]["limit"] for name in ("advisory", "caution", "warning")] == [110, 115.5, 121]
    assert (rows["advisory"]["start_s"], rows["advisory"]["end_s"]) == pytest.approx((118.4, 131.6), abs=0.05)
    assert (rows["caution"]["start_s"], rows["caution"]["end_s"]) == pytest.approx((119.5, 130.5), abs=0.05)
    assert rows["caution"]["beyond_s"] == pytest.approx(11.0, abs=0.05)
    assert (rows["warning"]["start_s"], rows["warning"]["beyond_s"]) == (None, 0.0)
    assert 1.0 >= rows["advisory"]["probability"] >= rows["caution"]["probability"] > rows["warning"]["probability"]
    assert (event["start_s"], event["end_s"]) == (rows["advisory"]["start_s"], rows["advisory"]["end_s"])


def test_the_next_level_has_a_probability_of_its_own_where_it_is_near(tmp_path: Path) -> None:
    """120.75 kt against 121: half the accuracy of 0.5 kt (two standard uncertainties and a bit) below it."""
    text = ruled("", levels="above: {caution: 100 %, warning: 110 %}")
    (event,) = found(tmp_path, text, humps((120.75, 120, 130)))
    warning = event["levels"][1]
    assert warning["start_s"] is None
    # [JCGM-106]: Phi(-0.25 / (0.5 / 1.96)) = Phi(-0.98) = 0.164
    assert warning["probability"] == pytest.approx(0.164, abs=0.015)
    assert event["severity"] == "caution"


def test_a_level_inside_the_limit_is_near_it_and_does_not_exceed_it(tmp_path: Path) -> None:
    text = ruled("", levels="above: {advisory: 95 %, caution: 100 %}")
    (event,) = found(tmp_path, text, humps((107, 120, 130)))
    assert (event["severity"], event["limit_exceeded"]) == ("advisory", False)
    (event,) = found(tmp_path, text, humps((112, 120, 130)))
    assert (event["severity"], event["limit_exceeded"]) == ("caution", True)
    assert event["start_s"] == pytest.approx(120 - (112 - 104.5) / 5, abs=0.05)  # of the lowest level


def test_per_cent_of_a_negative_limit(tmp_path: Path) -> None:
    """90 % of -3 g is -2.7 g, 110 % is -3.3 g."""
    text = ruled("", "load_factor", "limit: -3 g", "below: {advisory: 90 %, caution: 100 %, warning: 110 %}")
    (event,) = found(tmp_path, text, pulse(NZ, -2.8, width=4.0))
    assert [row["limit"] for row in event["levels"]] == pytest.approx([-2.7, -3.0, -3.3])
    assert (event["severity"], event["limit_exceeded"], event["side"]) == ("advisory", False, "below")
    (event,) = found(tmp_path, text, pulse(NZ, -3.4, width=4.0))
    assert event["severity"] == "warning"


@pytest.mark.parametrize(("limit", "lines"), [("0.19 g", [0.19, 0.19]), ("0.21 g", [0.1995, 0.231])])
def test_small_load_factors_have_one_line_for_all_per_cents(tmp_path: Path, limit: str, lines: list[float]) -> None:
    text = ruled("", "longitudinal_load_factor", f"limit: {limit}", "above: {advisory: 95 %, caution: 110 %}")
    story = (level("Longitudinal Acceleration (g)", 0.01), pulse("Longitudinal Acceleration (g)", 0.3, width=4.0))
    (event,) = found(tmp_path, text, *story)
    assert [row["limit"] for row in event["levels"]] == pytest.approx(lines)


def test_a_sink_rate_below_5_kt_is_no_small_one(tmp_path: Path) -> None:
    """300 ft/min is 3 kt, but an airspeed is what is meant by small."""
    text = ruled("", "vertical_speed", "limit: -300 ft/min", "below: {caution: 100 %, warning: 150 %}")
    (event,) = found(
        tmp_path, text, more("Vertical Speed (ft/min)", lambda t: 5.0 * np.sin(t)),
        held("Vertical Speed (ft/min)", -400, 140, 150),
    )  # fmt: skip
    assert [row["limit"] for row in event["levels"]] == pytest.approx([-300, -450], abs=0.1)
    assert event["severity"] == "caution"


def test_beyond_by_and_absolute_levels(tmp_path: Path) -> None:
    text = ruled("", levels="above: {advisory: {beyond_by: 4 kt}, caution: 117 KIAS, warning: {beyond_by: 12 kt}}")
    (event,) = found(tmp_path, text, humps((118, 120, 130)))
    assert [row["limit"] for row in event["levels"]] == [114, 117, 122]
    assert event["severity"] == "caution"


@pytest.mark.parametrize(("end", "severity"), [(139.0, "caution"), (142.0, "warning")])
def test_a_level_with_a_duration_of_its_own(tmp_path: Path, end: float, severity: str) -> None:
    """115.5 kt (105 %) for 20 s; passed from 119.5 s to 0.5 s after the end."""
    text = ruled("", levels="above: {caution: 100 %, warning: {at: 105 %, lasting: 20.5 s}}")
    (event,) = found(tmp_path, text, humps((118, 120, end)))
    assert event["severity"] == severity
    warning = event["levels"][1]
    assert (warning["start_s"] is not None) == (severity == "warning")
    assert warning["beyond_s"] == pytest.approx(end - 120 + 1.0, abs=0.1)


@pytest.mark.parametrize(("between", "limit"), [("linear", 105.0), ("step", 110.0)])
def test_a_table_goes_straight_or_in_steps(tmp_path: Path, between: str, limit: float) -> None:
    """100 kt at 5100 ft, 110 kt at 1100 ft; the cruise is half-way between, at 3100 ft."""
    points = "[[1100 ft, 110 KIAS], [5100 ft, 100 KIAS]]"
    table = f"limit: {{over: pressure_altitude, points: {points}, between: {between}}}"
    (event,) = found(tmp_path, ruled("", limit=table), humps((118, 120, 130)))
    assert event["limit"] == {
        "value": pytest.approx(limit), "unit": "kt", "source": "table over pressure altitude", "assumed": False,
    }  # fmt: skip


def test_a_limit_relative_to_another_quantity(tmp_path: Path) -> None:
    """1.2 times 48.4 KCAS (50 KCAS at 960 kg, now 900 kg) and 5 kt is 63.1 kt."""
    text = ruled(
        "when: [{phase: cruise}]", "calibrated_airspeed", "limit: {quantity: stall_speed, times: 1.2, plus: 5 kt}",
        "below: {caution: 100 %}",
    )  # fmt: skip
    (event,) = found(tmp_path, text, held(IAS, 61, 140, 150, 10))
    assert event["limit"]["value"] == pytest.approx(1.2 * 50 * (900 / 960) ** 0.5 + 5, abs=0.3)
    assert event["limit"]["source"] == "1.2 x stall speed + 5 kt"
    assert event["peak"]["value"] == pytest.approx(60.95, abs=0.1)


def test_left_and_right_are_judged_alike(tmp_path: Path) -> None:
    text = ruled("", "bank_angle", "limit: 40 deg")
    made = found(tmp_path, text, held(BANK, 45, 120, 125), held(BANK, -45, 140, 145))
    assert [event["peak"]["value"] for event in made] == pytest.approx([45, 45], abs=0.2)
    assert [event["context"]["bank_angle"]["value"] for event in made] == pytest.approx([45, -45], abs=0.2)
    signed = ruled("", "pitch_angle", "limit: 20 deg")
    assert len(found(tmp_path, signed, held(PITCH, 25, 120, 125), held(PITCH, -25, 140, 145))) == 1


def test_the_peak_is_where_the_limit_in_force_was_left_furthest(tmp_path: Path) -> None:
    """115 kt where 90 kt is the limit beats 118 kt where it is 110 kt; the larger value is noted."""
    rows = [{"flaps": "10 deg", "maximum": "110 KIAS"}, {"flaps": "30 deg", "maximum": "90 KIAS"}]
    facts = {"speeds": {"flaps_extended": rows}}
    story = (humps((115, 120, 135), (118, 137, 145)), held(FLAPS, 10, 115, 160), held(FLAPS, 30, 122, 126))
    (event,) = (one for one in events(scanned(tmp_path, story, facts=facts), "flaps-extended") if one["start_s"] < 130)
    assert (event["peak"]["value"], event["limit"]["value"]) == (pytest.approx(115, abs=0.01), 90.0)
    assert 121 < event["peak"]["time_s"] < 127
    assert "a larger value, 118.00 kt, stands elsewhere under another limit" in event["notes"]


# --- counting and adding up -------------------------------------------------------------------------------------------

THREE = humps((115, 120, 122), (115, 140, 142), (115, 150, 152))  # each 4 s beyond 110 kt: at 119, 139 and 149 s


@pytest.mark.parametrize(
    ("keys", "spans"),
    [
        ("count: {at_least: 3, within: flight}", [(119, 153)]),
        ("count: {at_least: 4, within: flight}", []),
        ("count: {at_least: 3, within: 31 s}", [(119, 153)]),
        ("count: {at_least: 3, within: 29 s}", []),
        ("count: {at_least: 2, within: 15 s}", [(139, 153)]),  # wherever the window lies
        ("total: {above: 11.5 s, within: flight}", [(119, 153)]),
        ("total: {above: 12.5 s, within: flight}", []),
        ("total: {above: 7.5 s, within: 15 s}", [(139, 153)]),
        ("total: {above: 7.5 s, within: 13 s}", []),
        ("total: {above: 11.5 s, within: 40 s}", [(119, 153)]),
    ],
)
def test_excursions_count_and_add_up_within_a_flight_or_a_sliding_window(
    tmp_path: Path, keys: str, spans: list[tuple[float, float]]
) -> None:
    made = found(tmp_path, ruled(keys), THREE)
    assert [(event["start_s"], event["end_s"]) for event in made] == [pytest.approx(span, abs=0.05) for span in spans]


def severities(made: list[dict[str, Any]]) -> list[tuple[str, bool]]:
    return [(event["severity"], event["limit_exceeded"]) for event in made]


NEAR, GONE = ("advisory", False), ("caution", True)


@pytest.mark.parametrize(
    ("allowed", "expected"),
    [
        # three excursions to 104.5 % (115 kt), 4 s each
        ("{up_to: 107 %, for: 20 s, within: flight}", [NEAR, NEAR, NEAR]),
        ("{up_to: 107 %, for: 10 s, within: flight}", [NEAR, NEAR, GONE]),
        ("{up_to: 107 %, for: 5 s, within: flight}", [NEAR, GONE, GONE]),
        ("{up_to: 107 %, for: 5 s, within: event}", [NEAR, NEAR, NEAR]),
        ("{up_to: 107 %, for: 3 s, within: event}", [GONE, GONE, GONE]),
        ("{up_to: 107 %, for: 7 s, within: 15 s}", [NEAR, NEAR, GONE]),
        ("{up_to: 107 %, for: 7 s, within: 12 s}", [NEAR, NEAR, NEAR]),
        ("{up_to: 103 %, for: 99 s, within: flight}", [GONE, GONE, GONE]),
        ("{up_to: 116 KIAS, for: 10 s, within: flight}", [NEAR, NEAR, GONE]),
    ],
)
def test_allowed_time_is_used_up_within_event_flight_or_window(
    tmp_path: Path, allowed: str, expected: list[tuple[str, bool]]
) -> None:
    made = found(tmp_path, ruled(f"allowed: [{allowed}], inspection: {{from: caution, task: Look}}"), THREE)
    assert severities(made) == expected
    assert [event["inspection"] for event in made] == ["Look" if one == GONE else None for one in expected]


@pytest.mark.parametrize(
    ("hills", "expected"),
    [
        # 107 % of 110 kt is 117.7, 115 % is 126.5 kt; 20 s beyond the limit, of which 5 s beyond 107 %
        ([(115, 120, 130)], [NEAR]),  # 12 s, none of it beyond 107 %
        ([(120, 120, 122)], [NEAR]),  # 6 s beyond the limit, 2.9 s beyond 107 %
        ([(120, 120, 126)], [GONE]),  # 6.9 s beyond 107 %
        ([(128, 120, 121)], [GONE]),  # beyond 115 %: at once
        ([(115, 120, 127), (120, 145, 149)], [NEAR, NEAR]),  # 9 and 8 s
        ([(115, 120, 131), (120, 145, 149)], [NEAR, GONE]),  # 13 and 8 s: together more than 20
        ([(120, 120, 121), (120, 145, 147.5)], [NEAR, GONE]),  # 1.9 and 3.4 s beyond 107 %
    ],
)
def test_several_allowances_nest(tmp_path: Path, hills: list[Any], expected: list[tuple[str, bool]]) -> None:
    steps = "allowed: [{up_to: 107 %, for: 20 s, within: flight}, {up_to: 115 %, for: 5 s, within: flight}]"
    assert severities(found(tmp_path, ruled(steps), humps(*hills))) == expected


# --- must_see, judge_on, is, when, rates ------------------------------------------------------------------------------


def test_what_a_channel_is_too_slow_to_see_is_unassessed_and_events_are_reported_all_the_same(tmp_path: Path) -> None:
    """At 4 Hz, 1 s is the shortest that is seen whole: 0.5 s is not, with ten per cent of tolerance 0.91 s is."""
    for see, assessed in (("0.5 s", False), ("0.95 s", True)):
        whole = scanned(tmp_path, [humps((115, 120, 130))], rules=ruled(f"must_see: {see}"), rate=4.0)
        assert len(events(whole, "mine")) == 1
        row = coverage(whole, "mine")
        assert (row["assessed_s"] == whole["recorded_s"]) == assessed
        assert [one["reason"] for one in row["reasons"]] == ([] if assessed else ["rate"])
        assert row["shortest_seen_s"] == 1.0


def test_judged_on_the_estimate_a_peak_between_samples_counts(tmp_path: Path) -> None:
    """At 4 Hz a bump of 1.2 s to 4.03 g lies between two samples, which show less than the limit of 3.95 g."""
    story = pulse(NZ, 4.03, 140.125, 1.2)
    (event,) = found(
        tmp_path, ruled("judge_on: estimate", "load_factor", "limit: 3.85 g"), story, rate=4.0, columns=USUAL
    )
    assert event["peak"]["value"] < 3.85 < event["peak"]["estimate"]
    assert event["peak"]["low"] <= 4.03 <= event["peak"]["high"]
    assert event["limit_exceeded"]
    assert 139.9 < event["start_s"] < event["end_s"] < 140.35
    assert found(tmp_path, ruled("judge_on: sample", "load_factor", "limit: 3.85 g"), story, rate=4.0) == []


def test_states_are_judged_by_word(tmp_path: Path) -> None:
    text = ruled("when: [{quantity: flap_angle, below: 1 deg}]", "airbrakes_out", "", "is: {warning: out}")
    (event,) = found(tmp_path, text, state(BRAKES, "OUT", 140, 145))
    assert (event["severity"], event["start_s"], event["end_s"], event["side"]) == ("warning", 140.0, 145.0, "is")


@pytest.mark.parametrize(
    ("when", "seen"),
    [
        ("{phase: [cruise]}", True),
        ("{phase: [approach, landing]}", False),
        ("{phase: airborne}", True),
        ("{quantity: pressure_altitude, above: 3000 ft}", True),
        ("{quantity: pressure_altitude, below: 3000 ft}", False),
        ("{quantity: pressure_altitude, within: [3000 ft, 3200 ft]}", True),
        ("{quantity: pressure_altitude, within: [3200 ft, 3300 ft]}", False),
        ("{quantity: gear_down, is: up}", True),
        ("{quantity: gear_down, is: down}", False),
        ("{any: [{quantity: gear_down, is: down}, {phase: [cruise]}]}", True),
        ("{any: [{quantity: gear_down, is: down}, {phase: [approach]}]}", False),
        ("{quantity: {rate_of: pressure_altitude}, below: 100 ft/min}", True),
        ("{quantity: {rate_of: pressure_altitude}, above: 100 ft/min}", False),
    ],
)
def test_conditions_say_when_a_rule_looks(tmp_path: Path, when: str, seen: bool) -> None:
    whole = scanned(tmp_path, [humps((115, 120, 130))], rules=ruled(f"when: [{when}]"))
    assert len(events(whole, "mine")) == seen
    # time in which a condition is known to be false counts as assessed
    assert coverage(whole, "mine")["assessed_s"] == pytest.approx(whole["recorded_s"], abs=0.2)


def test_several_conditions_must_all_hold(tmp_path: Path) -> None:
    both = "when: [{phase: [cruise]}, {quantity: gear_down, is: down}]"
    assert found(tmp_path, ruled(both), humps((115, 120, 130))) == []


def test_an_unknown_condition_is_unassessed(tmp_path: Path) -> None:
    def lost(time: Array, columns: Columns) -> None:
        columns[ALT] = np.where((time > 123) & (time < 127), np.nan, columns[ALT])

    text = ruled("when: [{quantity: pressure_altitude, above: 3000 ft}]")
    whole = scanned(tmp_path, [humps((115, 120, 130)), lost], rules=text)
    assert coverage(whole, "mine")["unassessed_s"] == pytest.approx(4.0, abs=0.4)
    assert len(events(whole, "mine")) == 2
    nothing = scanned(tmp_path, [humps((115, 120, 130))], rules=text, columns=[one for one in USUAL if one != ALT])
    assert events(nothing, "mine") == []
    assert reason(nothing, "mine").startswith("pressure altitude not recorded")


def test_rates_are_judged_in_their_own_unit(tmp_path: Path) -> None:
    """The climb of 3000 ft in 60 s is 3000 ft/min."""
    text = ruled("joining: 2 s", "{rate_of: pressure_altitude}", "", "above: {caution: 2500 ft/min}")
    (event,) = found(tmp_path, text)
    assert event["peak"]["unit"] == "ft/min"
    assert event["peak"]["value"] == pytest.approx(3000, rel=0.01)
    assert (event["start_s"], event["end_s"]) == pytest.approx((40, 100), abs=0.2)


# --- files ------------------------------------------------------------------------------------------------------------


def test_a_declared_quantity_is_read_from_its_own_name_and_judged_an_engine_at_a_time(tmp_path: Path) -> None:
    story = [
        level("Oil Temperature 1 (degC)", 90), level("Oil Temperature 2 (degF)", 190),
        held("Oil Temperature 2 (degF)", 257, 140, 150, 5),
    ]  # fmt: skip
    (event,) = found(tmp_path, ruled("", "oil_temperature", "limit: 118 degC"), *story)
    assert event["quantity"] == "oil_temperature_2"
    assert event["peak"]["value"] == pytest.approx(125, abs=0.2)  # 257 degF
    assert event["peak"]["unit"] == "degC"


def test_a_later_file_overrides_a_rule_and_the_output_says_so(tmp_path: Path) -> None:
    mine = (
        "format: exceed-rules/1\ntitle: Stricter\nrules:\n  - {id: never-exceed, override: true, quantity: airspeed, "
        "limit: aircraft.speeds.never_exceed, above: {caution: 90 %, warning: 100 %}}\n"
    )
    facts = {"speeds": {"never_exceed": "120 KIAS"}}
    whole = scanned(tmp_path, [humps((112, 120, 130))], rules=["airframe", mine], facts=facts)
    (event,) = events(whole, "never-exceed")
    assert (event["severity"], event["limit_exceeded"]) == ("caution", False)
    assert any("never-exceed" in note and "airframe" in note for note in whole["notes"])
    assert len([row for row in whole["assessment"] if row["rule"] == "never-exceed" and row["flight"] is None]) == 1
    with pytest.raises(exceed.ExceedError, match="never-exceed"):
        scanned(tmp_path, rules=["airframe", mine.replace("override: true, ", "")], facts=facts)


def test_two_sides_of_one_rule(tmp_path: Path) -> None:
    text = ruled("", "vertical_speed", "", "above: {advisory: 1000 ft/min}, below: {caution: -1000 ft/min}")
    story = (
        more("Vertical Speed (ft/min)", lambda t: 5.0 * np.sin(t)), held("Vertical Speed (ft/min)", 1500, 120, 125),
        held("Vertical Speed (ft/min)", -1500, 140, 145),
    )  # fmt: skip
    first, second = found(tmp_path, text, *story)
    assert (first["side"], first["severity"]) == ("above", "advisory")
    assert (second["side"], second["severity"]) == ("below", "caution")
