"""What the engine makes of simple signals whose answer anyone can work out on paper."""

from __future__ import annotations

import numpy as np
import pytest
from byhand import aircraft_of, compile_text, make_trace
from hypothesis import given, settings
from hypothesis import strategies as st

from exceed.core.trace import Step
from exceed.judge.engine import judge

RULE = """
rules:
  - id: high
    quantity: load_factor
    limit: 4 g
    above: {{caution: 100 %, warning: 110 %}}
    when:
      - phase: [airborne]
    {more}
"""


def rule(more: str = "") -> str:
    return RULE.format(more=more)


def judged(trace, text, aircraft=None, **options):
    return judge(trace, compile_text(text, trace, aircraft), ["load_factor"], **options)


def ramps(points, step=0.125):
    """A signal of straight lines through (time, value) points, sampled every `step` s."""
    time = np.arange(points[0][0], points[-1][0] + step / 2, step)
    return time, np.interp(time, [p[0] for p in points], [p[1] for p in points])


def on_sample(text: str) -> str:
    return text.replace("quantity: load_factor", "quantity: load_factor\n    judge_on: sample")


def test_crossings_are_linear_and_the_peak_is_the_furthest_sample():
    time, n = ramps([(0, 1), (10, 1), (14, 5), (18, 1), (30, 1)])
    trace = make_trace(time, {"load_factor": n})
    (event,) = judged(trace, on_sample(rule())).events
    assert event.severity == "warning"
    assert event.start == pytest.approx(13.0, abs=1e-9)
    assert event.end == pytest.approx(15.0, abs=1e-9)
    assert event.peak.time == 14.0
    assert event.peak.value == 5.0
    warning = event.levels[1]
    assert (warning.limit, warning.start, warning.end) == pytest.approx((4.4, 13.4, 14.6), abs=1e-9)
    assert warning.beyond == pytest.approx(1.2, abs=1e-9)


def test_a_value_at_the_limit_is_no_excursion():
    time, n = ramps([(0, 1), (10, 4), (20, 4), (30, 1)])
    assert judged(make_trace(time, {"load_factor": n}), on_sample(rule())).events == ()


def test_release_keeps_one_event_until_the_value_came_back_far_enough():
    time, n = ramps([(0, 1), (10, 4.2), (12, 3.97), (14, 4.2), (16, 3.9), (18, 4.2), (20, 1), (40, 1)])
    trace = make_trace(time, {"load_factor": n})
    assert len(judged(trace, on_sample(rule())).events) == 3
    assert len(judged(trace, on_sample(rule("release: 0.05 g"))).events) == 2
    assert len(judged(trace, on_sample(rule("release: 5 %"))).events) == 1


def test_joining_joins_what_is_near_but_not_across_a_gap():
    time, n = ramps([(0, 1), (10, 4.2), (11, 3.8), (12, 4.2), (13, 1), (40, 1)])
    assert len(judged(make_trace(time, {"load_factor": n}), on_sample(rule("joining: 2 s"))).events) == 1
    hole = (time < 10.8) | (time > 11.4)
    trace = make_trace(time[hole], {"load_factor": n[hole]})
    found = judged(trace, on_sample(rule("joining: 2 s"))).events
    assert len(found) == 2
    assert judged(trace, on_sample(rule())).coverage[0].reasons[0][0] == "gap"


def test_lasting_counts_after_joining():
    time, n = ramps([(0, 1), (10, 4.2), (11, 3.8), (12, 4.2), (13, 1), (40, 1)])
    trace = make_trace(time, {"load_factor": n})
    assert len(judged(trace, on_sample(rule("lasting: 1.5 s"))).events) == 0
    assert len(judged(trace, on_sample(rule("joining: 2 s\n    lasting: 1.5 s"))).events) == 1


def test_an_event_cut_by_a_gap_says_so():
    time, n = ramps([(0, 1), (10, 5), (20, 5), (30, 1)])
    keep = (time < 12) | (time > 15)
    found = judged(make_trace(time[keep], {"load_factor": n[keep]}), on_sample(rule())).events
    assert [event.cut_by for event in found] == ["gap", "gap"]


def test_an_event_at_the_recordings_ends_says_so():
    time, n = ramps([(0, 5), (5, 1), (20, 1), (25, 5)])
    found = judged(make_trace(time, {"load_factor": n}), on_sample(rule())).events
    assert [event.cut_by for event in found] == ["recording_start", "recording_end"]


def test_a_false_condition_cuts_and_counts_as_assessed():
    time, n = ramps([(0, 1), (10, 5), (20, 5), (30, 1)])
    flap = np.where((time > 12) & (time < 14), 0.5, 0.0)
    text = on_sample(rule()) + "      - {quantity: flap_angle, below: 10 deg}\n"
    trace = make_trace(time, {"load_factor": n, "flap_angle": flap})
    found = judged(trace, text.replace("    \n", ""))
    assert [event.cut_by for event in found.events] == ["condition", "condition"]
    assert found.coverage[0].assessed == pytest.approx(30.0)


def test_an_unknown_condition_is_unassessed():
    time, n = ramps([(0, 1), (30, 1)])
    flap = np.where(time < 10, np.nan, 0.0)
    text = on_sample(rule()).replace("    \n", "") + "      - {quantity: flap_angle, below: 10 deg}\n"
    (row, _) = judged(make_trace(time, {"load_factor": n, "flap_angle": flap}), text).coverage
    assert row.unassessed == pytest.approx(9.9375)
    assert row.reasons == (("condition not known", pytest.approx(9.9375)),)


def test_a_lost_sample_is_stepped_over_but_its_time_is_not_assessed():
    time, n = ramps([(0, 1), (10, 5), (20, 5), (30, 1)])
    n = np.where(time == 15.0, np.nan, n)
    found = judged(make_trace(time, {"load_factor": n}), on_sample(rule()))
    assert len(found.events) == 1
    assert found.coverage[0].unassessed == pytest.approx(0.125)


def test_must_see_makes_a_slow_channel_unassessed_but_reports_what_it_shows():
    time, n = ramps([(0, 1), (10, 5), (20, 5), (30, 1)], step=0.25)
    found = judged(make_trace(time, {"load_factor": n}), on_sample(rule("must_see: 0.5 s")))
    assert len(found.events) == 1
    assert found.coverage[0].reasons == (("rate", pytest.approx(30.0)),)
    fast = ramps([(0, 1), (30, 1)], step=0.125)
    assert judged(make_trace(fast[0], {"load_factor": fast[1]}), on_sample(rule("must_see: 0.5 s"))).coverage[
        0
    ].assessed == pytest.approx(30.0)


def test_a_level_turn_can_show_but_never_clear():
    time = np.arange(0.0, 60.0, 0.125)
    bank = np.radians(np.interp(time, [0, 20, 30, 40, 60], [0, 0, 78, 0, 0]))

    def level_turn(bank_angle):
        return 1.0 / np.cos(bank_angle)

    step = Step("load_factor", "level turn", level_turn, {"bank_angle": "bank_angle"}, one_sided=True, cap="possible",
                assumes="level coordinated turn")  # fmt: skip
    trace = make_trace(time, {"bank_angle": bank}, steps={"load_factor": step})
    found = judged(trace, rule())
    (event,) = found.events
    assert event.certainty == "possible"
    assert event.probability < 0.5
    assert found.coverage[0].assessed == 0.0
    assert found.coverage[0].reasons == (("method", pytest.approx(59.875)),)
    assert "level coordinated turn" in event.notes


def test_a_method_that_smooths_cannot_clear_what_it_smooths_away():
    time = np.arange(0.0, 60.0, 0.125)
    step = Step("load_factor", "flight path", lambda pressure_altitude: 1.0 + 0.0 * pressure_altitude,
                {"pressure_altitude": "pressure_altitude"}, reach=1.5)  # fmt: skip
    trace = make_trace(time, {"pressure_altitude": 500.0 + time}, steps={"load_factor": step})
    row = judged(trace, rule("must_see: 0.5 s")).coverage[0]
    assert row.reasons == (("method", pytest.approx(59.875)),)
    assert row.shortest_seen == 3.0
    assert judged(trace, rule("must_see: 4 s")).coverage[0].assessed == pytest.approx(59.875)


def test_limits_of_small_size_collapse_per_cent_levels():
    time, n = ramps([(0, 1), (10, -0.5), (20, 1)])
    text = (
        "rules:\n  - id: low\n    quantity: load_factor\n    judge_on: sample\n    limit: -0.1 g\n"
        "    below: {caution: 100 %, warning: 110 %}\n"
    )
    (event,) = judged(make_trace(time, {"load_factor": n}), text).events
    assert [level.limit for level in event.levels] == [-0.1, -0.1]


def test_below_a_negative_limit_per_cent_goes_further_down():
    time, n = ramps([(0, 1), (10, -3.2), (20, 1)])
    text = (
        "rules:\n  - id: low\n    quantity: load_factor\n    judge_on: sample\n    limit: -3 g\n"
        "    below: {advisory: 90 %, caution: 100 %, warning: 110 %}\n"
    )
    (event,) = judged(make_trace(time, {"load_factor": n}), text).events
    assert event.severity == "caution"
    assert [level.limit for level in event.levels] == pytest.approx([-2.7, -3.0, -3.3])


def test_sided_quantities_are_judged_by_magnitude():
    time, bank = ramps([(0, 0), (10, -70), (20, 0), (30, 70), (40, 0)])
    text = "rules:\n  - id: bank\n    quantity: bank_angle\n    above: {advisory: 60 deg}\n    judge_on: sample\n"
    found = judge_one(make_trace(time, {"bank_angle": np.radians(bank)}), text)
    assert len(found.events) == 2


def judge_one(trace, text, aircraft=None):
    return judge(trace, compile_text(text, trace, aircraft), [])


def test_a_relative_limit_follows_the_other_quantity():
    time, cas = ramps([(0, 80), (10, 50), (20, 80)])
    text = (
        "rules:\n  - id: slow\n    quantity: calibrated_airspeed\n    judge_on: sample\n"
        "    limit: {quantity: stall_speed, times: 1.2, plus: 5 kt}\n    below: {caution: 100 %}\n"
    )
    knot = 1852 / 3600
    trace = make_trace(time, {"calibrated_airspeed": cas * knot, "stall_speed": np.full(len(time), 45 * knot)})
    (event,) = judge_one(trace, text).events
    assert event.limit.value / knot == pytest.approx(59.0)
    assert event.start == pytest.approx(7.0)


def test_a_state_is_dated_by_its_samples():
    time = np.arange(0.0, 20.0, 0.5)
    gear = np.where((time >= 5) & (time < 8), 0.0, 1.0)
    text = "rules:\n  - id: gear\n    quantity: gear_down\n    is: {caution: up}\n"
    (event,) = judge_one(make_trace(time, {"gear_down": gear}, discrete={"gear_down"}), text).events
    assert (event.start, event.end, event.severity) == (5.0, 8.0, "caution")
    assert event.certainty == "established"


def test_a_rate_is_judged_between_samples():
    time, n = ramps([(0, 1), (10, 1), (10.5, 4), (20, 4)])
    text = (
        "rules:\n  - id: onset\n    quantity: {rate_of: load_factor}\n    judge_on: sample\n"
        "    above: {advisory: 5 g/s}\n"
    )
    (event,) = judge_one(make_trace(time, {"load_factor": n}), text).events
    assert event.peak.value == pytest.approx(6.0)


def test_flap_speeds_hold_for_the_next_larger_setting_and_not_with_flaps_up():
    aircraft = aircraft_of(
        "speeds:\n  flaps_extended: [{flaps: 10 deg, maximum: 110 KIAS}, {flaps: 30 deg, maximum: 90 KIAS}]\n"
    )
    knot = 1852 / 3600
    time = np.arange(0.0, 50.0, 1.0)
    flap = np.radians(np.array([0.5, 10.9, 12.0, 40.0, 0.0])[(time // 10).astype(int)])
    speed = np.full(len(time), 100 * knot)
    text = (
        "rules:\n  - id: flaps\n    quantity: airspeed\n    judge_on: sample\n"
        "    limit: aircraft.speeds.flaps_extended\n    above: {caution: 100 %}\n"
    )
    trace = make_trace(time, {"indicated_airspeed": speed, "flap_angle": flap})
    (event,) = judge_one(trace, text, aircraft).events
    assert event.rows == (20, 39)
    assert event.limit.value / knot == pytest.approx(90.0)
    assert judge_one(trace, text, aircraft).coverage[0].assessed == pytest.approx(49.0)


def test_a_missing_fact_is_not_applicable_and_a_missing_channel_unassessed():
    time, n = ramps([(0, 1), (30, 1)])
    trace = make_trace(time, {"load_factor": n})
    text = (
        "rules:\n  - id: vne\n    quantity: airspeed\n    limit: aircraft.speeds.never_exceed\n"
        "    above: {caution: 100 %}\n"
    )
    without = judge_one(trace, text, aircraft_of("")).coverage[0]
    assert (without.not_applicable, without.unassessed) == (30.0, 0.0)
    assert without.reasons[0][0] == "the aircraft file has no never-exceed speed"
    blind = judge_one(trace, text, aircraft_of("speeds: {never_exceed: 175 KIAS}\n")).coverage[0]
    assert (blind.not_applicable, blind.unassessed) == (0.0, 30.0)
    assert blind.reasons[0][0] == "indicated airspeed not recorded"


def test_allowed_time_is_a_note_until_it_is_used_up():
    time, n = ramps([(0, 1), (9, 1), (10, 4.2), (20, 4.2), (21, 1), (39, 1), (40, 4.2), (55, 4.2), (56, 1), (70, 1)])
    trace = make_trace(time, {"load_factor": n})
    text = on_sample(rule("allowed: [{up_to: 107 %, for: 20 s, within: flight}]"))
    first, second = judged(trace, text).events
    assert (first.severity, first.limit_exceeded) == ("advisory", False)
    assert (second.severity, second.limit_exceeded) == ("caution", True)
    window = on_sample(rule("allowed: [{up_to: 107 %, for: 20 s, within: 16 s}]"))
    assert [event.severity for event in judged(trace, window).events] == ["advisory", "advisory"]


def test_beyond_what_is_allowed_is_an_event_at_once():
    time, n = ramps([(0, 1), (9, 1), (10, 4.4), (11, 1), (20, 1)])
    text = on_sample(rule("allowed: [{up_to: 107 %, for: 20 s, within: flight}]"))
    (event,) = judged(make_trace(time, {"load_factor": n}), text).events
    assert event.severity == "caution"


def test_so_many_excursions_make_one_event():
    time, n = ramps([(0, 1), (5, 4.2), (10, 1), (15, 4.2), (20, 1), (25, 4.3), (30, 1)])
    trace = make_trace(time, {"load_factor": n})
    (event,) = judged(trace, on_sample(rule("count: {at_least: 3, within: flight}"))).events
    assert event.rows[1] - event.rows[0] > 150
    assert event.peak.value == pytest.approx(4.3)
    assert judged(trace, on_sample(rule("count: {at_least: 4, within: flight}"))).events == ()


def test_accumulated_time_makes_one_event():
    time, n = ramps([(0, 1), (9, 1), (10, 5), (15, 5), (16, 1), (29, 1), (30, 5), (35, 5), (36, 1), (40, 1)])
    trace = make_trace(time, {"load_factor": n})
    assert len(judged(trace, on_sample(rule("total: {above: 9 s, within: flight}"))).events) == 1
    assert len(judged(trace, on_sample(rule("total: {above: 12 s, within: flight}"))).events) == 0


def test_unknown_mass_gives_both_verdicts_and_is_at_most_possible():
    time = np.arange(0.0, 30.0, 0.5)
    speed = np.interp(time, [0, 15, 30], [40, 30, 40])

    def stall_speed(mass):
        return 28.0 * np.sqrt(mass / 900.0)

    steps = {
        "mass": Step("mass", "not known", None, constant=960.0, assumes="heaviest"),
        "stall_speed": Step("stall_speed", "by mass", stall_speed, {"mass": "mass"}),
    }
    trace = make_trace(time, {"calibrated_airspeed": speed}, steps=steps, spans={"mass": (600.0, 960.0)})
    text = (
        "rules:\n  - id: slow\n    quantity: calibrated_airspeed\n    judge_on: sample\n"
        "    limit: {quantity: stall_speed, times: 1.1}\n    below: {caution: 100 %}\n"
    )
    (event,) = judge_one(trace, text).events
    assert event.certainty == "possible"
    assert "the verdict depends on what is not known: at mass 960 kg: caution; at mass 600 kg: none" in event.notes


def test_what_exists_only_at_moments_is_neither_cut_nor_unassessed_elsewhere():
    time = np.arange(0.0, 60.0, 0.125)
    sink = np.where((time >= 30) & (time < 30.5), 3.5, np.nan)
    text = (
        "rules:\n  - id: sink\n    quantity: touchdown_sink_rate\n    limit: 500 ft/min\n"
        "    above: {caution: 100 %}\n"
    )
    found = judge_one(make_trace(time, {"touchdown_sink_rate": sink}), text)
    (event,) = found.events
    assert event.cut_by is None
    assert found.coverage[0].assessed == pytest.approx(59.875)


def test_saturation_is_at_least():
    time = np.arange(0.0, 20.0, 0.125)
    n = np.minimum(1 + 6 * np.exp(-(((time - 10) / 1.5) ** 2)), 5.0)
    trace = make_trace(time, {"load_factor": n}, more={"load_factor": {"saturation": (-np.inf, 5.0)}})
    (event,) = judged(trace, rule()).events
    assert event.peak.saturated
    assert event.peak.high is None
    assert event.severity == "warning"


SIGNALS = st.lists(st.floats(-1.0, 6.0, allow_nan=False), min_size=2, max_size=60)
HOLES = st.lists(st.integers(0, 59), max_size=8)


def naive_excursions(time, n, limit, gap):
    """Runs of samples above the limit that hang together, one sample after the other."""
    found, previous = [], None
    for t, x in zip(time, n, strict=True):
        if np.isnan(x):
            continue
        if x > limit:
            if previous is not None and previous[1] > limit and t - previous[0] <= gap:
                found[-1][1] = t
            else:
                found.append([t, t])
        previous = (t, x)
    return found


@settings(max_examples=60)
@given(SIGNALS, HOLES, st.integers(2, 30))
def test_fast_agrees_with_obvious_whatever_the_block_size(signal, holes, size):
    n = np.array(signal)
    n[[hole for hole in holes if hole < len(n)]] = np.nan
    time = np.arange(len(n)) * 0.25
    time = time + np.where(np.arange(len(n)) > len(n) // 2, 2.0, 0.0)  # one gap
    trace = make_trace(time, {"load_factor": n}, interval=0.25)
    found = judged(trace, on_sample(rule()), size=size)
    slow = naive_excursions(time, n, 4.0 * (1 + 1e-9), 0.625)
    assert [(time[event.rows[0]], time[event.rows[1]]) for event in found.events] == [tuple(row) for row in slow]
    whole = judged(trace, on_sample(rule()), size=10_000)
    assert repr(whole.events) == repr(found.events)
    for row in found.coverage:
        assert row.assessed + row.unassessed + row.not_applicable == pytest.approx(trace.recording.duration, abs=1e-6)


@settings(max_examples=40)
@given(SIGNALS, st.floats(2.0, 5.0), st.floats(0.0, 1.0))
def test_lowering_a_limit_never_removes_an_excursion(signal, limit, less):
    n = np.array(signal)
    time = np.arange(len(n)) * 0.25
    trace = make_trace(time, {"load_factor": n})
    text = on_sample(rule())
    high = judged(trace, text.replace("4 g", f"{limit:.3f} g")).events
    low = judged(trace, text.replace("4 g", f"{limit - less:.3f} g")).events
    for event in high:
        assert any(one.rows[0] <= event.rows[0] and event.rows[1] <= one.rows[1] for one in low)


@settings(max_examples=40)
@given(SIGNALS)
def test_levels_are_nested_and_a_shift_in_time_shifts_alike(signal):
    n = np.array(signal)
    time = np.arange(len(n)) * 0.25
    found = judged(make_trace(time, {"load_factor": n}), on_sample(rule())).events
    moved = judged(make_trace(time + 1024.0, {"load_factor": n}), on_sample(rule())).events
    assert [event.start + 1024.0 for event in found] == pytest.approx([event.start for event in moved])
    for event in found:
        caution, warning = event.levels
        assert warning.beyond <= caution.beyond
        if warning.start is not None:
            assert caution.start <= warning.start
            assert warning.end <= caution.end
