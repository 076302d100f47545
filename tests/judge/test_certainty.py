"""Words, probabilities and times of certainty; what a peak's size must never do, whatever the samples."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st
from judge import yardstick

from exceed.judge import certainty
from exceed.judge.certainty import Peak, probability_beyond, size_peak, upward_room
from exceed.reference.rows import Row, all_rows

ROWS = {row.id: row for row in all_rows() if row.id.startswith("CRT")}


def rows_of(quantity: str) -> list[Row]:
    found = [row for row in ROWS.values() if row.quantity == quantity]
    assert found
    return found


def peak_of(values: list[float], index: int, side: int = 1, *, interval: float = 0.125, **facts: float | None) -> Peak:
    time = np.arange(len(values)) * interval
    known = {"standard_uncertainty": 0.01, "noise": 0.005, **facts}
    return size_peak(time, np.array(values), side, index, interval=interval, **known)  # type: ignore[arg-type]


# --- words ------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("probability", "word"),
    [
        (1.0, "established"), (0.95, "established"), (0.9499, "likely"), (0.5, "likely"), (0.4999, "possible"),
        (0.05, "possible"), (0.0499, "doubtful"), (0.0, "doubtful"),
    ],
)  # fmt: skip
def test_each_word_begins_at_its_probability(probability: float, word: str) -> None:
    assert certainty.certainty_word(probability) == word


@pytest.mark.parametrize("probability", [-0.01, 1.01, math.nan])
def test_what_is_no_probability_has_no_word(probability: float) -> None:
    with pytest.raises(ValueError, match="a probability lies between 0 and 1"):
        certainty.certainty_word(probability)


def test_a_capped_certainty_is_at_most_possible_and_a_lower_one_is_kept() -> None:
    assert certainty.certainty_word(certainty.cap_at_possible(1.0)) == "possible"
    assert round(certainty.cap_at_possible(0.7), 4) < 0.5
    assert certainty.cap_at_possible(0.2) == 0.2


# --- published values -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("row", rows_of("p_exceed_upper"), ids=lambda row: row.id)
def test_a_steady_value_exceeds_with_the_probability_of_the_normal_distribution(row: Row) -> None:
    """JCGM 106: p = 1 - Phi((T - y)/u). A steady, noiseless record leaves the sensor's uncertainty alone."""
    x = row.inputs
    y, u, limit = float(x["y"]), float(x["u"]), float(x["limit"])
    peak = peak_of([y] * 17, 8, standard_uncertainty=u, noise=0.0)
    assert probability_beyond(peak, limit) == pytest.approx(float(row.expected), abs=float(row.tolerance))
    assert peak.high == pytest.approx(y + 1.959964 * u)
    mirrored = peak_of([-y] * 17, 8, -1, standard_uncertainty=u, noise=0.0)
    assert probability_beyond(mirrored, -limit) == pytest.approx(float(row.expected), abs=float(row.tolerance))


@pytest.mark.parametrize("row", rows_of("worst_case_peak_ratio"), ids=lambda row: row.id)
def test_the_interval_holds_a_sinusoid_that_is_sampled_astride_its_top(row: Row) -> None:
    """The sampled-sinusoid identity gives the worst under-read, cos(pi f/fs); the interval must reach across it, and
    the estimate must stand closer to the truth than the sample wherever there are four samples a cycle or more."""
    x = row.inputs
    f, rate = float(x["f_hz"]), float(x["fs_hz"])
    time = (np.arange(-9, 9) + 0.5) / rate
    values = 1.0 + 2.0 * np.cos(2 * np.pi * f * time)
    index = int(np.argmax(values[8:10])) + 8
    assert (values[index] - 1.0) / 2.0 == pytest.approx(float(row.expected), abs=1e-9)
    peak = size_peak(time, values, 1, index, standard_uncertainty=0.001, interval=1 / rate, noise=0.0)
    assert yardstick.inside(peak, 3.0), (peak.low, peak.high, peak.ratio)
    if f / rate <= 0.25:
        assert abs(peak.estimate - 3.0) < 0.5 * abs(values[index] - 3.0)


# --- what holds for any samples ---------------------------------------------------------------------------------------

windows = st.lists(st.floats(-8, 8, allow_nan=False, width=32), min_size=1, max_size=21)


@settings(deadline=None, max_examples=150)
@given(
    values=windows,
    place=st.integers(0, 20),
    side=st.sampled_from([1, -1]),
    interval=st.sampled_from([0.1, 0.125, 0.25, 1.0]),
)
@example(values=[1.0] * 9, place=4, side=1, interval=0.125)
@example(values=[0.0, 1e-30, 0.0, 0.0, 0.0], place=1, side=1, interval=1.0)
@example(values=[1e-6 * x for x in (1, 2, 3, 2, 1)], place=2, side=-1, interval=0.25)
def test_a_peak_is_ordered_and_within_the_filters_room(
    values: list[float], place: int, side: int, interval: float
) -> None:
    v = np.array(values, dtype=float)
    time = np.arange(v.size) * interval
    index = min(place, v.size - 1)
    peak = size_peak(time, v, side, index, standard_uncertainty=0.02, interval=interval, noise=0.01, resolution=0.01)
    assert peak.recorded == v[index]
    assert all(math.isfinite(x) for x in (peak.estimate, peak.down, peak.up, peak.outward, peak.ratio, peak.time))
    assert 0 <= peak.ratio <= 1
    assert min(peak.down, peak.up) > 0
    near, far = (peak.low, peak.high) if side > 0 else (peak.high, peak.low)
    assert near is not None
    assert side * near < side * peak.estimate
    assert side * near <= side * peak.recorded
    if peak.sized:
        assert far is not None
        assert side * far > side * peak.estimate
        room = upward_room(time, v, side, interval=interval, noise=0.01, resolution=0.01, standard_uncertainty=0.02)[
            index
        ]
        assert side * (far - peak.recorded) <= room + 1e-9
    else:
        assert far is None
    chances = [probability_beyond(peak, peak.recorded + side * x) for x in np.linspace(-3, 6, 37)]
    assert all(0 <= b <= a <= 1 for a, b in itertools.pairwise(chances))
    hidden = certainty.hidden_beyond(peak, peak.estimate + side * 0.5 * peak.up)
    assert hidden <= probability_beyond(peak, peak.estimate + side * 0.5 * peak.up) + 1e-12


@settings(deadline=None, max_examples=40)
@given(
    values=st.lists(st.floats(-8, 8, width=32), min_size=5, max_size=17), scale=st.sampled_from([0.01, 9.80665, 300.0]),
    shift=st.floats(-5, 5), later=st.sampled_from([0.0, 40_000.0]),
)  # fmt: skip
def test_units_datum_clock_and_sign_do_not_change_a_peak(
    values: list[float], scale: float, shift: float, later: float
) -> None:
    v = np.array(values)
    if np.ptp(v) < 1e-3:
        return  # below the sensor's last digit there is nothing to compare
    time, index = np.arange(v.size) * 0.125, int(np.argmax(v))
    one = size_peak(time, v, 1, index, standard_uncertainty=0.02, interval=0.125, noise=0.01, resolution=0.01)
    other = size_peak(
        time + later, -(scale * v + shift), -1, index, standard_uncertainty=0.02 * scale, interval=0.125,
        noise=0.01 * scale, resolution=0.01 * scale,
    )  # fmt: skip
    assert one.sized == other.sized
    assert other.time - later == pytest.approx(one.time, abs=1e-3)
    tolerance = 1e-4 * scale * (np.ptp(v) + 1)
    assert -other.estimate == pytest.approx(scale * one.estimate + shift, abs=tolerance)
    assert one.high is not None
    assert other.low is not None
    assert -other.low == pytest.approx(scale * one.high + shift, abs=tolerance)
    assert other.down == pytest.approx(scale * one.up, abs=tolerance)


def test_the_same_samples_give_the_same_peak() -> None:
    case = yardstick.record("ramp in", 8, 4)
    assert yardstick.size(case) == yardstick.size(case)


def test_the_room_of_a_block_is_the_room_of_the_whole_but_for_three_samples_at_its_ends() -> None:
    rng = np.random.default_rng(1)
    time, values = np.arange(200) * 0.125, rng.normal(size=200)
    whole = upward_room(time, values, 1, interval=0.125)
    part = upward_room(time[50:120], values[50:120], 1, interval=0.125)
    np.testing.assert_allclose(part[3:-3], whole[53:117], atol=1e-12)


def test_the_room_agrees_with_an_obvious_loop() -> None:
    rng = np.random.default_rng(2)
    values = rng.normal(size=60)
    room = upward_room(np.arange(60) * 0.5, values, -1, interval=0.5, noise=0.1)
    for i in range(3, 57):
        bends = [abs(values[j - 1] - 2 * values[j] + values[j + 1]) for j in range(i - 2, i + 3)]
        assert room[i] == pytest.approx(max(bends) + 0.6)


# --- open ends --------------------------------------------------------------------------------------------------------

PULL = [1.0, 1.0, 1.0, 1.1, 1.5, 2.4, 3.6, 4.7, 5.1, 4.6, 3.5, 2.3, 1.5, 1.1, 1.0, 1.0, 1.0]


def test_a_saturated_peak_is_at_least_what_was_seen() -> None:
    peak = peak_of(PULL, 8, saturation=5.1)
    assert (peak.saturated, peak.sized, peak.high) == (True, False, None)
    assert peak.low is not None
    assert 5.0 < peak.low < 5.1
    assert probability_beyond(peak, 5.1) == pytest.approx(0.5)
    assert probability_beyond(peak, 5.0) > 0.999
    assert certainty.is_undecided(peak, 6.0)  # recorded inside, and nothing says how far it went
    low = peak_of([-x for x in PULL], 8, -1, saturation=-5.1)
    assert (low.low, low.high) == (None, -peak.low)
    assert not peak_of(PULL, 8, saturation=6.0).saturated


def test_a_single_sample_at_one_hertz_is_not_sized_and_at_eight_it_is() -> None:
    spike = [1.0] * 8 + [4.0] + [1.0] * 8
    slow, quick = peak_of(spike, 8, interval=1.0), peak_of(spike, 8, interval=0.125)
    assert (slow.sized, slow.high, slow.saturated) == (False, None, False)
    assert slow.ratio > certainty.probability_beyond(slow, 99.0)
    assert not certainty.is_undecided(slow, 4.5)  # unassessed rather than undecided
    assert quick.high is not None
    assert quick.high > 5.0


def test_an_airspeed_at_one_hertz_is_sized_and_its_sensor_decides() -> None:
    time = np.arange(17.0)
    values = np.round(80.0 + 2.0 * np.cos((time - 8.3) / 6.0), 1)
    peak = size_peak(time, values, 1, 8, standard_uncertainty=1.0, interval=1.0, resolution=0.1, quickest=3.0)
    assert peak.sized
    assert peak.high is not None
    assert peak.high - peak.estimate == pytest.approx(1.96, rel=0.05)
    # recorded within the sensor's error of a limit: that alone leaves nothing undecided
    assert probability_beyond(peak, peak.recorded + 1.0) > 0.1
    assert not certainty.is_undecided(peak, peak.recorded + 1.0)


def test_a_peak_hidden_between_samples_is_undecided() -> None:
    time = (np.arange(17) - 8) * 0.125 + 0.0625
    values = 1.0 + 5.0 * np.cos(np.pi * time / 1.0) ** 2 * (np.abs(time) < 0.5)
    peak = size_peak(time, values, 1, int(np.argmax(values)), standard_uncertainty=0.01, interval=0.125, noise=0.0)
    assert peak.recorded < 5.9
    assert certainty.is_undecided(peak, 5.9)
    assert not certainty.is_undecided(peak, 7.5)
    assert not certainty.is_undecided(peak, 5.0)  # a sample is beyond: an event


@pytest.mark.parametrize("count", [1, 2, 3])
def test_below_four_samples_nothing_is_sized(count: int) -> None:
    peak = peak_of([2.0] * count, count - 1)
    assert (peak.sized, peak.high, peak.estimate) == (False, None, 2.0)


@pytest.mark.parametrize("bad", [{"side": 0}, {"index": 9}, {"interval": 0.0}])
def test_wrong_arguments_are_refused(bad: dict[str, float]) -> None:
    given = {"side": 1, "index": 2, "interval": 0.125, **bad}
    with pytest.raises(ValueError, match=r"is needed|interval positive"):
        size_peak(
            np.arange(5.0),
            np.ones(5),
            given["side"],
            given["index"],
            standard_uncertainty=0.1,
            interval=given["interval"],
        )  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("time", "values"), [([0, 1, 1, 2, 3], [1, 2, 3, 2, 1]), ([0, 1, 2, 3, 4], [1, 2, 3, np.nan, 1])]
)
def test_a_window_with_holes_or_doubled_times_is_refused(time: list[float], values: list[float]) -> None:
    with pytest.raises(ValueError, match="finite values at ascending times"):
        size_peak(np.array(time, float), np.array(values, float), 1, 2, standard_uncertainty=0.1, interval=1.0)


# --- several humps ----------------------------------------------------------------------------------------------------


# --- noise ------------------------------------------------------------------------------------------------------------


def test_white_noise_is_measured_beneath_a_manoeuvre() -> None:
    rng = np.random.default_rng(5)
    time = np.arange(0, 600, 0.125)
    clean = 1.0 + 2.0 * np.sin(time / 3.0)
    assert certainty.white_noise(clean + 0.01 * rng.normal(size=time.size)) == pytest.approx(0.01, rel=0.25)
    assert certainty.white_noise(clean) < 1e-4
    assert certainty.white_noise(np.ones(10)) == 0.0


# --- times ------------------------------------------------------------------------------------------------------------


def test_a_crossing_lies_on_the_line_between_two_samples() -> None:
    assert certainty.crossing_time(10.0, 3.0, 10.5, 4.0, 3.25) == pytest.approx(10.125)
    assert certainty.crossing_time(0.0, -1.0, 1.0, -3.0, -3.0) == 1.0
    with pytest.raises(ValueError, match="is not between"):
        certainty.crossing_time(0.0, 1.0, 1.0, 2.0, 2.5)


def test_the_estimates_span_beyond_a_level_no_sample_reached_lies_between_the_samples() -> None:
    case = yardstick.record("bell", 8, 11, noise=0.0, resolution=0.0)
    peak = yardstick.size(case)
    if case.side < 0 or peak.estimate <= peak.recorded:
        pytest.fail("the drawn case is not the one meant")
    before, after = (case.index - 1, case.index) if peak.time < case.time[case.index] else (case.index, case.index + 1)
    level = 0.5 * (peak.estimate + peak.recorded)
    start, end = certainty.estimated_span(
        peak, case.time[before], case.values[before], case.time[after], case.values[after], level
    )
    assert case.time[before] < start < peak.time < end < case.time[after]
    assert certainty.estimated_span(peak, 0.0, 0.0, 9.0, 0.0, peak.estimate) == (peak.time, peak.time)


@pytest.mark.parametrize("rate", [8.0, 4.0])
def test_durations_lie_within_twice_their_uncertainty(rate: float) -> None:
    """Excursions of raised cosines beyond a level: the truth's duration against the linear crossings'."""
    within, widths = [], []
    for seed in range(300):
        rng = np.random.default_rng(seed)
        t = np.arange(-8, 8, 1 / 400)
        length = rng.uniform(6, 20) / rate
        x = 1.0 + 3.0 * yardstick.raised_cosine(t, length, rng)
        level = 1.0 + 3.0 * rng.uniform(0.2, 0.8)
        time = np.arange(-7 + rng.random() / rate, 7, 1 / rate)
        values = np.interp(time, t, x) + 0.02 * rng.normal() + 0.01 * rng.normal(size=time.size)
        beyond = np.flatnonzero(values > level)
        if beyond.size == 0:
            continue
        first, last = int(beyond[0]), int(beyond[-1])
        start = certainty.crossing_time(time[first - 1], values[first - 1], time[first], values[first], level)
        end = certainty.crossing_time(time[last], values[last], time[last + 1], values[last + 1], level)
        u = certainty.duration_uncertainty(time, values, first, last, level, standard_uncertainty=0.02, noise=0.01)
        within.append(abs((end - start) - (x > level).sum() / 400) <= 1.96 * u)
        widths.append(u)
    assert np.mean(within) >= 0.93
    assert np.median(widths) < 0.15 / rate  # and not by being wide


def test_lasting_is_judged_by_the_durations_uncertainty() -> None:
    assert certainty.probability_lasting(2.0, 0.1, 2.0) == pytest.approx(0.5)
    assert certainty.probability_lasting(2.0, 0.1, 1.8) == pytest.approx(0.97725, abs=1e-5)  # Phi(2), normal table
    assert certainty.probability_lasting(0.0, 0.1, 0.0) == 1.0
    assert certainty.probability_lasting(1.9, 0.0, 2.0) == 0.0


def test_the_shortest_excursion_is_four_intervals() -> None:
    assert certainty.shortest_sized(0.125) == 0.5
