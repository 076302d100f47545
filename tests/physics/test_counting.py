"""Counting: against an independent rainflow library, identities, and plain loops."""

from __future__ import annotations

import itertools
from collections import Counter

import numpy as np
import pytest
import rainflow as independent
from hypothesis import example, given
from hypothesis import strategies as st

from exceed.physics import counting

histories = st.lists(st.integers(-6, 9).map(float), max_size=60)


def table(cycles: counting.Cycles) -> dict[float, float]:
    found: Counter[float] = Counter()
    for span, count in zip(cycles.range.tolist(), cycles.count.tolist(), strict=True):
        found[span] += count
    return dict(found)


@given(histories)
@example([1.0, 1.0, 1.0])
@example([1.0, 4.0, 1.0, 4.0])
def test_rainflow_agrees_with_an_independent_library(history: list[float]) -> None:
    """rainflow 3.2 follows the same section of the standard; it says nothing of records of fewer than three samples."""
    theirs = {span: count for span, count in independent.count_cycles(history) if span > 0}
    if len(history) > 2:
        assert table(counting.rainflow(history)) == theirs


def test_an_equal_range_closes_the_cycle_at_once() -> None:
    """[ASTM-E1049] counts when X >= Y: 1-4 closes on the way down to 1, as one whole cycle and not as two halves."""
    cycles = counting.rainflow([0.0, 5.0, 1.0, 4.0, 1.0])
    assert list(zip(cycles.range.tolist(), cycles.count.tolist(), strict=True)) == [(3, 1), (5, 0.5), (4, 0.5)]


def test_two_samples_are_half_a_cycle() -> None:
    assert table(counting.rainflow([0.0, 1.0])) == {1.0: 0.5}


@given(histories)
def test_every_turn_is_used_twice_and_the_largest_range_is_counted(history: list[float]) -> None:
    turns = counting.turning_points(history)
    cycles = counting.rainflow(history)
    if turns.size > 1:
        assert 2 * cycles.count.sum() == turns.size - 1
        assert cycles.range.max() == max(history) - min(history)
        values = np.array(history)
        np.testing.assert_array_equal(np.abs(values[cycles.end] - values[cycles.start]), cycles.range)
        np.testing.assert_array_equal(0.5 * (values[cycles.end] + values[cycles.start]), cycles.mean)


@given(histories)
def test_turned_upside_down_the_ranges_stay(history: list[float]) -> None:
    assert table(counting.rainflow([-v for v in history])) == table(counting.rainflow(history))


@given(histories)
def test_values_on_the_way_and_missing_ones_change_nothing(history: list[float]) -> None:
    if len(history) < 2:
        return
    dense = np.repeat(history, 3).astype(float)
    dense[1::3] = np.nan
    halfway = np.column_stack((history[:-1], np.add(history[:-1], history[1:]) / 2)).ravel().tolist() + history[-1:]
    assert table(counting.rainflow(dense)) == table(counting.rainflow(history))
    assert table(counting.rainflow(halfway)) == table(counting.rainflow(history))
    np.testing.assert_array_equal(
        counting.level_crossings(halfway, [0.5, 1.5], 1.0), counting.level_crossings(history, [0.5, 1.5], 1.0)
    )


@given(histories)
def test_a_repeating_history_closes_every_cycle_wherever_it_begins(history: list[float]) -> None:
    cycles = counting.rainflow_repeating(history)
    halves = Counter(cycles.range[cycles.count == 0.5].tolist())
    assert all(number % 2 == 0 for number in halves.values())
    if len(history) > 2 and history[0] == history[-1]:
        turned = history[:-1]
        turned = turned[3:] + turned[:3] + turned[3 % len(turned) : 3 % len(turned) + 1]
        assert table(counting.rainflow_repeating(turned)) == table(cycles)


@given(histories, st.sampled_from([-3.0, -0.5, 0.0, 1.0, 2.5, 9.0]), st.sampled_from([0.0, 1.0]))
def test_crossings_and_peaks_are_those_of_a_plain_loop(history: list[float], level: float, reference: float) -> None:
    pairs = list(itertools.pairwise(history))
    crossings = sum((a < level <= b) if level >= reference else (a > level >= b) for a, b in pairs)
    assert counting.level_crossings(history, level, reference)[0] == crossings
    plain = [v for i, v in enumerate(history) if i == 0 or v != history[i - 1]]
    turns = [
        b
        for a, b, c in zip(plain, plain[1:], plain[2:], strict=False)
        if (b > reference and a < b > c) or (b < reference and a > b < c)
    ]
    assert counting.peak_counts(history, level, reference)[0] == turns.count(level)


@given(histories)
def test_simple_ranges_and_pairs_never_count_more_than_there_is(history: list[float]) -> None:
    ranges, pairs = counting.simple_ranges(history), counting.range_pairs(history)
    assert ranges.count.sum() == 0.5 * max(0, counting.turning_points(history).size - 1)
    assert pairs.count.sum() <= ranges.count.sum()


def test_turning_points_keep_ends_and_the_first_of_equals() -> None:
    np.testing.assert_array_equal(counting.turning_points([1, 1, 2, 3, 3, 0, 0, np.nan, 2, np.inf]), [0, 3, 5, 8])
    assert counting.turning_points([np.nan]).size == 0
    np.testing.assert_array_equal(counting.turning_points([5, 5, 5]), [0])


def test_damage_of_no_cycles_is_none_and_bad_allowables_are_unknown() -> None:
    assert counting.miner_damage([], []) == 0.0
    assert np.isnan(counting.miner_damage([1.0], [0.0]))
    assert np.isnan(counting.repeats_to_failure(0.0))
    none = counting.rainflow([])
    assert counting.damage_power_law(none, 5.0, 1e9) == 0.0
    assert np.isnan(counting.equivalent_range(none, 5.0))


def test_equal_ranges_are_their_own_equivalent() -> None:
    assert counting.equivalent_range(counting.rainflow([0, 3, 0, 3, 0]), 4.0) == pytest.approx(3.0)


def test_shapes_other_than_a_vector_are_refused() -> None:
    with pytest.raises(ValueError, match=r"shape \(n,\)"):
        counting.rainflow([[1.0, 2.0]])
