"""Local parabolas: exact on parabolas, the same in blocks, never across a gap, as a plain loop does it."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.signal import savgol_filter

from exceed.physics import kinematics, smoothing


def obvious(t: np.ndarray, v: np.ndarray, width: float, gap: float) -> tuple[np.ndarray, np.ndarray]:
    """One sample at a time, with a general least-squares routine: value and slope."""
    value, slope = np.full(t.size, np.nan), np.full(t.size, np.nan)
    good = np.flatnonzero(np.isfinite(t) & np.isfinite(v))
    for at, i in enumerate(good):
        window = [i]
        for side in (good[:at][::-1], good[at + 1 :]):
            last = i
            for j in side:
                if abs(t[j] - t[last]) > gap or abs(t[j] - t[i]) > width * (1 + 1e-6):
                    break
                window.append(j)
                last = j
        x, y = t[window] - t[i], v[window]
        degree = min(2, np.unique(x).size - 1)
        coefficients = np.polynomial.polynomial.polyfit(x, y, degree)
        value[i] = coefficients[0]
        if degree:
            slope[i] = coefficients[1]
    return value, slope


@settings(max_examples=40)
@given(st.integers(1, 60), st.integers(0, 2**31))
def test_agrees_with_a_plain_loop_on_random_records(n: int, seed: int) -> None:
    rng = np.random.default_rng(seed)
    t = np.cumsum(rng.choice([0.1, 0.13, 0.25, 0.9], n, p=[0.5, 0.2, 0.2, 0.1]))
    v = rng.normal(size=n)
    v[rng.random(n) < 0.1] = np.nan
    value, slope = obvious(t, v, 0.5, 0.6)
    np.testing.assert_allclose(smoothing.smooth(t, v, 0.5, 0.6), value, atol=1e-9)
    np.testing.assert_allclose(smoothing.smooth_derivative(t, v, 0.5, 0.6), slope, rtol=1e-7, atol=1e-7)


def test_on_even_times_it_is_the_filter_of_a_signal_library() -> None:
    v = np.random.default_rng(2).normal(size=200)
    t = np.arange(200) * 0.125
    ours = smoothing.smooth_derivative(t, v, 0.5, 1.0)
    theirs = savgol_filter(v, 9, 2, deriv=1, delta=0.125)
    np.testing.assert_allclose(ours[4:-4], theirs[4:-4], atol=1e-10)
    np.testing.assert_allclose(smoothing.smooth(t, v, 0.5, 1.0)[4:-4], savgol_filter(v, 9, 2)[4:-4], atol=1e-10)


@given(st.floats(-5, 5), st.floats(-5, 5), st.floats(-5, 5), st.floats(0, 1e9))
def test_a_parabola_is_returned_with_its_exact_slope_to_the_very_ends(
    a: float, b: float, c: float, start: float
) -> None:
    t = np.cumsum(np.random.default_rng(1).uniform(0.05, 0.2, 80))
    v = a + b * t + c * t**2
    shifted = t + start  # a clock that began long ago costs digits of time, not of the fit
    slack = 1e-7 + 1e-14 * start * 100
    np.testing.assert_allclose(smoothing.smooth_derivative(shifted, v, 0.6, 1.0), b + 2 * c * t, atol=slack * 100)
    np.testing.assert_allclose(smoothing.smooth(shifted, v, 0.6, 1.0), v, atol=slack * 100)


def test_blocks_that_hold_the_reach_give_the_whole() -> None:
    rng = np.random.default_rng(4)
    t = np.cumsum(rng.uniform(0.05, 0.3, 500))
    v = rng.normal(size=500)
    whole = smoothing.smooth_derivative(t, v, 1.0, 2.0)
    for low, high in ((100, 200), (233, 321)):
        inside = (t >= t[low] - 1.001) & (t <= t[high] + 1.001)
        part = smoothing.smooth_derivative(t[inside], v[inside], 1.0, 2.0)
        offset = np.flatnonzero(inside)[0]
        np.testing.assert_array_equal(part[low - offset : high - offset], whole[low:high])


def test_a_record_of_many_chunks_is_fitted_as_if_it_were_one(monkeypatch: pytest.MonkeyPatch) -> None:
    rng = np.random.default_rng(11)
    t = np.cumsum(rng.choice([0.05, 0.3, 2.0], 700, p=[0.6, 0.37, 0.03]))
    t[400:] -= 30.0  # the clock runs back
    v = rng.normal(size=700)
    whole = smoothing.smooth_derivative(t, v, 1.0, 1.5)
    monkeypatch.setattr(smoothing, "_CHUNK", 64)
    np.testing.assert_array_equal(smoothing.smooth_derivative(t, v, 1.0, 1.5), whole)


def test_a_step_across_a_gap_leaves_both_sides_flat() -> None:
    t = np.concatenate((np.arange(0, 5, 0.1), np.arange(6, 11, 0.1)))
    v = np.where(t < 5.5, 1.0, 9.0)
    np.testing.assert_allclose(smoothing.smooth_derivative(t, v, 2.0, 0.5), 0.0, atol=1e-9)
    assert np.abs(smoothing.smooth_derivative(t, v, 2.0, 2.0)).max() > 1.0


def test_a_run_of_missing_values_is_a_gap_and_time_running_back_too() -> None:
    t = np.arange(0, 10, 0.1)
    v = np.where(t < 5, 1.0, 9.0)
    v[(t > 4.5) & (t < 5.5)] = np.nan
    slope = smoothing.smooth_derivative(t, v, 2.0, 0.5)
    np.testing.assert_array_equal(np.isnan(slope), np.isnan(v))
    np.testing.assert_allclose(slope[np.isfinite(v)], 0.0, atol=1e-9)
    back = np.concatenate((t[:50], t[:50]))
    np.testing.assert_allclose(smoothing.smooth_derivative(back, np.repeat([1.0, 9.0], 50), 2.0, 0.5), 0.0, atol=1e-9)


def test_few_samples_give_what_they_can() -> None:
    assert smoothing.smooth_derivative([], [], 1.0, 1.0).shape == (0,)
    assert np.isnan(smoothing.smooth_derivative([0.0], [3.0], 1.0, 1.0))[0]
    assert smoothing.smooth([0.0], [3.0], 1.0, 1.0)[0] == 3.0
    np.testing.assert_allclose(smoothing.smooth_derivative([0.0, 0.5], [3.0, 4.0], 1.0, 1.0), 2.0)
    assert np.isnan(smoothing.smooth_derivative([1.0, 1.0], [3.0, 4.0], 1.0, 1.0)).all()
    np.testing.assert_allclose(smoothing.smooth([1.0, 1.0], [3.0, 4.0], 1.0, 1.0), 3.5)


def test_infinite_and_huge_values_give_no_warning_and_no_infinity() -> None:
    t = np.arange(6.0)
    for v in ([1, np.inf, 2, 3, 4, 5], [1e308, -1e308, 1e308, 0, 1, 2]):
        assert not np.isinf(smoothing.smooth_derivative(t, v, 2.5, 2.0)).any()


def test_stated_uncertainty_is_the_scatter_of_drawn_noise() -> None:
    rng = np.random.default_rng(6)
    t = np.cumsum(rng.uniform(0.1, 0.2, 30))
    drawn = np.array([smoothing.smooth_derivative(t, 0.3 * rng.standard_normal(30), 0.7, 1.0) for _ in range(4000)])
    said = smoothing.smooth_derivative_uncertainty(t, np.zeros(30), 0.7, 1.0, 0.3)
    np.testing.assert_allclose(drawn.std(axis=0), said, rtol=0.06)
    drawn = np.array([smoothing.smooth(t, 0.3 * rng.standard_normal(30), 0.7, 1.0) for _ in range(4000)])
    np.testing.assert_allclose(
        drawn.std(axis=0), smoothing.smooth_uncertainty(t, np.zeros(30), 0.7, 1.0, 0.3), rtol=0.06
    )
    assert said[0] > 2 * said[15], "one-sided windows know less"


def test_wrong_shapes_and_widths_are_refused() -> None:
    with pytest.raises(ValueError, match="one shape"):
        smoothing.smooth([0.0, 1.0], [1.0], 1.0, 1.0)
    with pytest.raises(ValueError, match="must be positive"):
        smoothing.smooth([0.0], [1.0], 0.0, 1.0)
    with pytest.raises(ValueError, match=r"shape \(n,\)"):
        smoothing.unwrap_angle(1.0)


def test_unwrapping_passes_over_missing_samples_and_turns_on() -> None:
    angle = np.radians([350, 355, np.nan, 5, 10, 20])
    unwrapped = np.degrees(kinematics.unwrap_angle(angle))
    np.testing.assert_allclose(unwrapped, [350, 355, np.nan, 365, 370, 380])
    turns = np.linspace(0, 20, 200)
    np.testing.assert_allclose(kinematics.unwrap_angle(np.mod(turns, 2 * np.pi)), turns, atol=1e-9)
    assert np.isnan(kinematics.unwrap_angle([np.nan, np.nan])).all()
