"""Probabilities, guard bands and sampling, against a statistics library and drawn samples."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st
from scipy.stats import norm

from exceed.physics import uncertainty

values = st.floats(-10, 10)
spreads = st.floats(0.001, 5)


@given(values, values, spreads)
@example(0.0, 8.0, 1.0)
def test_probabilities_are_those_of_a_statistics_library(value: float, limit: float, u: float) -> None:
    assert float(uncertainty.probability_above(value, limit, u)) == pytest.approx(
        norm.sf(limit, value, u), rel=1e-9, abs=1e-300
    )
    below = float(uncertainty.probability_below(value, limit, u))
    assert below == pytest.approx(norm.cdf(limit, value, u), rel=1e-9, abs=1e-300)
    assert below + float(uncertainty.probability_above(value, limit, u)) == pytest.approx(1.0)


@given(values, values, spreads, st.floats(0.001, 2))
def test_a_larger_value_is_more_surely_beyond(value: float, limit: float, u: float, more: float) -> None:
    assert uncertainty.probability_above(value + more, limit, u) >= uncertainty.probability_above(value, limit, u)


def test_without_uncertainty_it_is_sure_and_at_the_limit_even() -> None:
    np.testing.assert_array_equal(uncertainty.probability_above([5.9, 6.0, 6.1], 6.0, 0.0), [0.0, 0.5, 1.0])
    assert np.isnan(uncertainty.probability_above([6.0, np.nan, 6.0], 6.0, [np.nan, 1.0, -1.0])).all()


def test_between_limits() -> None:
    assert float(uncertainty.probability_between(0.0, -1.96, 1.96, 1.0)) == pytest.approx(0.95, abs=1e-4)
    assert float(uncertainty.probability_between(0.0, 2.0, -2.0, 1.0)) == 0.0


@given(st.floats(1e-9, 1 - 1e-9))
def test_the_guard_factor_is_the_quantile(p: float) -> None:
    assert float(uncertainty.guard_factor(p)) == pytest.approx(norm.ppf(p), rel=1e-6, abs=1e-9)
    assert float(uncertainty.normal_probability(uncertainty.guard_factor(p))) == pytest.approx(p, rel=1e-9)


def test_the_95_per_cent_factor_is_the_quantile() -> None:
    assert pytest.approx(norm.ppf(0.975), rel=1e-14) == uncertainty.NORMAL_95
    assert np.isnan(uncertainty.guard_factor([0.0, 1.0, np.nan])).all()


def test_rectangles_and_steps_scatter_as_drawn_samples_do() -> None:
    drawn = np.random.default_rng(9).uniform(-0.3, 0.3, 200_000)
    assert float(uncertainty.uncertainty_of_half_width(0.3)) == pytest.approx(drawn.std(), rel=0.01)
    rounded = np.round(drawn * 20) / 20 - drawn
    assert float(uncertainty.uncertainty_of_step(0.05)) == pytest.approx(rounded.std(), rel=0.02)
    assert float(uncertainty.uncertainty_of_95(1.96)) == pytest.approx(1.0, rel=1e-4)
    assert np.isnan(uncertainty.uncertainty_of_step(-0.1))


def test_quadrature() -> None:
    np.testing.assert_allclose(uncertainty.combined_uncertainty(3.0, [4.0, 0.0, np.nan]), [5.0, 3.0, np.nan])
    assert float(uncertainty.combined_uncertainty()) == 0.0
    assert np.isnan(uncertainty.combined_uncertainty(np.inf, 1.0))


@given(st.floats(0.05, 3.9), st.floats(8, 50), st.floats(0, 1))
def test_no_phase_of_a_sinusoid_reads_lower_than_the_worst_ratio(frequency: float, rate: float, phase: float) -> None:
    t = np.arange(0, 40 / frequency, 1 / rate)
    seen = np.cos(2 * np.pi * (frequency * t + phase)).max()
    assert seen >= float(uncertainty.worst_peak_ratio(frequency, rate)) - 1e-9


def test_the_worst_phase_reads_exactly_the_worst_ratio_and_the_mean_is_the_mean() -> None:
    rate, frequency = 8.0, 1.0
    phases = np.linspace(-0.5, 0.5, 2001) * frequency / rate
    nearest = np.cos(2 * np.pi * phases)
    assert nearest.min() == pytest.approx(float(uncertainty.worst_peak_ratio(frequency, rate)))
    assert nearest.mean() == pytest.approx(float(uncertainty.mean_peak_ratio(frequency, rate)), rel=1e-3)
    missed = float(uncertainty.worst_under_read(frequency, rate))
    assert missed == pytest.approx(1 - nearest.min())
    assert float(uncertainty.samples_per_cycle(missed)) == pytest.approx(rate / frequency)


def test_a_pulse_shorter_than_an_interval_may_be_missed_altogether() -> None:
    assert float(uncertainty.half_sine_worst_ratio(0.125, 8.0)) == pytest.approx(0.0, abs=1e-12)
    assert np.isnan(uncertainty.half_sine_worst_ratio(0.1, 8.0))
    assert float(uncertainty.half_sine_worst_ratio(1.0, 8.0)) == pytest.approx(np.cos(np.pi / 16))


def test_above_half_the_sample_rate_there_is_no_bound() -> None:
    assert np.isnan(uncertainty.true_peak_bound(1.0, [4.0, 4.1, 5.0], 8.0)).all()
    assert float(uncertainty.true_peak_bound(1.0, 0.0, 8.0)) == 1.0
    assert np.isnan(uncertainty.worst_peak_ratio(5.0, 8.0))
