"""The promise that peaks carry: their intervals hold the truth, on simulated signals that the fit never saw.

Some 500 excursions a rate in the normal run; EXCEED_YARDSTICK=600 takes 600 of each family and rate (minutes).
"""

from __future__ import annotations

import os

import numpy as np
import pytest
from judge import yardstick

from exceed.judge import peaks

CASES = int(os.environ.get("EXCEED_YARDSTICK", "75"))
CHECK_GUSTS = tuple(f for f in yardstick.CHECK if f in yardstick.GUSTS)
CHECK_MANOEUVRES = tuple(f for f in yardstick.CHECK if f not in yardstick.GUSTS)


def shortfall(share: float, cases: int) -> float:
    """What is allowed below a share for having looked at so many cases only: two standard deviations."""
    return 2.0 * (share * (1 - share) / cases) ** 0.5


@pytest.fixture(scope="module")
def covered() -> dict[tuple[str, float], yardstick.Coverage]:
    return {(f, r): yardstick.coverage(f, r, CASES) for f in yardstick.CHECK for r in (8.0, 4.0, 2.0, 1.0)}


def test_no_family_of_the_check_was_fitted() -> None:
    assert not set(yardstick.FIT) & set(yardstick.CHECK)


@pytest.mark.parametrize("families", [CHECK_MANOEUVRES, CHECK_GUSTS], ids=["manoeuvres", "gusts"])
@pytest.mark.parametrize("rate", [8.0, 4.0])
def test_the_interval_holds_the_truth_95_times_in_100(
    covered: dict[tuple[str, float], yardstick.Coverage], families: tuple[str, ...], rate: float
) -> None:
    every = [covered[f, rate] for f in families]
    assert all(c.sized == 1.0 for c in every)  # at these rates nothing is left open
    assert np.mean([c.covered for c in every]) >= 0.95
    assert np.mean([c.event_covered for c in every]) >= 0.95
    for c in every:  # the worst family too
        assert c.covered >= 0.95 - shortfall(0.95, CASES), c


@pytest.mark.parametrize("rate", [2.0, 1.0])
def test_a_slow_channel_sizes_what_it_can_and_leaves_the_rest_open(
    covered: dict[tuple[str, float], yardstick.Coverage], rate: float
) -> None:
    every = [covered[f, rate] for f in yardstick.CHECK]
    assert 0.1 < np.mean([c.sized for c in every]) < 0.7
    assert np.mean([c.covered for c in every]) >= 0.95
    sized = sum(c.sized * c.cases for c in every)
    held = sum(c.covered_sized * c.sized * c.cases for c in every) / sized
    assert held >= 0.95 - shortfall(0.95, int(sized))


def test_an_unmeasured_noise_within_the_stated_accuracy_costs_no_coverage() -> None:
    every = [yardstick.coverage(f, 8.0, CASES // 3, noise_known=False) for f in yardstick.CHECK]
    assert np.mean([c.covered for c in every]) >= 0.95


def test_a_noise_measured_in_rough_air_widens_the_interval_little() -> None:
    """Rough air passes for noise where it is measured from the whole log: eight times too much here."""
    found = []
    for family in yardstick.CHECK:
        for k in range(CASES // 3):
            c = yardstick.record(family, 8.0, 700_000 + k, noise=0.005, resolution=0.004, accuracy=0.01)
            sized = [
                peaks.size_peak(
                    c.time, c.values, c.side, c.index, standard_uncertainty=c.standard_uncertainty, interval=0.125,
                    resolution=c.resolution, noise=noise,
                )
                for noise in (0.005, 0.04)
            ]  # fmt: skip
            found.append((yardstick.inside(sized[1], c.true_peak), *(yardstick.half_width(p) for p in sized)))
    held, right, wrong = np.array(found).T
    assert held.mean() >= 0.95
    assert np.median(wrong) < 1.6 * np.median(right)


@pytest.mark.parametrize("noise_known", [True, False])
def test_at_8_hz_the_interval_of_a_manoeuvre_is_narrow(noise_known: bool) -> None:
    """Pulls and pushes of 0.3 to 6 s, a sensor of 0.005 g: half-width at most 0.05 g in the middle."""
    widths = [
        yardstick.half_width(
            yardstick.size(yardstick.record(f, 8.0, 900_000 + k, noise=0.005, accuracy=0.0098), noise_known=noise_known)
        )
        for f in CHECK_MANOEUVRES
        for k in range(CASES)
    ]
    assert np.median(widths) <= 0.05


def test_at_8_hz_the_estimate_halves_the_samples_error() -> None:
    """For noise up to 0.01 g and at least five samples above half height; the sensor's common error set aside."""
    raw, error = [], []
    for family in CHECK_MANOEUVRES:
        for k in range(CASES):
            c = yardstick.record(family, 8.0, 800_000 + k, noise=(0.0, 0.005, 0.01)[k % 3], accuracy=1e-9)
            if c.above_half >= 5:
                raw.append(c.values[c.index] - c.true_peak)
                error.append(yardstick.size(c).estimate - c.true_peak)
    assert len(raw) > CASES
    assert np.sqrt(np.mean(np.square(error))) <= 0.5 * np.sqrt(np.mean(np.square(raw)))


def test_a_stated_probability_is_how_often_it_happens() -> None:
    """In tenths of probability with 50 levels or more. Aimed at 0.05; between 0.1 and 0.4 it is on the safe side
    (it says more than happens) by up to 0.09, since the check's shapes are smoother than those of the fit."""
    table = yardstick.calibration((8.0, 4.0), CASES)
    for count, stated, seen, apart in table:
        if count >= 50:
            slack = 2.0 * (stated * (1 - stated) / count * 3) ** 0.5  # three levels share a case
            low = -0.10 if 0.1 < stated < 0.4 else -0.06
            assert low - slack <= apart <= 0.06 + slack, (stated, seen)
    assert abs(np.average(table[:, 3], weights=table[:, 0])) <= 0.03


@pytest.mark.parametrize("rate", [8.0, 4.0])
@pytest.mark.parametrize("gusts", [0.0, 0.02])
def test_calm_flight_with_turns_near_the_limit_leaves_at_most_two_undecided_an_hour(rate: float, gusts: float) -> None:
    hours = max(1.0, CASES / 75)
    undecided, calls = yardstick.undecided_per_hour(rate, gusts, hours)
    assert undecided <= 2.0
    assert calls > 0  # the filter let some through, so the count is no accident


def test_a_steady_cruise_leaves_nothing_undecided() -> None:
    undecided, calls = yardstick.undecided_per_hour(8.0, 0.05, 0.5, limit=6.0)
    assert (undecided, calls) == (0.0, 0.0)


def test_from_four_intervals_on_a_peak_is_sized() -> None:
    table = yardstick.shortest_table(8.0, 60)
    raw, error, width = table[4.0]
    assert error < 0.5 * raw
    assert error < 0.02
    assert width < 0.2
    assert table[2.0][1] > 0.1  # below, the estimate is no better than a guess and the interval says so
    assert table[2.0][2] > 0.3


def test_the_factors_are_those_of_the_fit() -> None:
    """A fit on a quarter of the cases comes near the factors in use; the fit itself takes `fit_factors(500)`."""
    fitted = yardstick.fit_factors(60, (8.0, 4.0))
    features, _, scale, _, _ = yardstick.fit_features(("skewed", "dryden"), 30, (8.0, 4.0), yardstick.FIT_SEEDS)
    for name, tolerance in (("_UP_1", 0.25), ("_OUT_95", 0.35)):
        used = features @ np.array(getattr(peaks, name))
        again = features @ fitted[name]
        assert np.median(again / np.maximum(used, 1e-12)) == pytest.approx(1.0, abs=tolerance)
    assert np.all(scale > 0)
