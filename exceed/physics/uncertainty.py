"""How sure: standard uncertainties, probabilities of conformity, guard bands, and what sampling hides.

"Conforming" is the standard's word for being inside a limit. Normal distributions throughout, no prior knowledge.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from exceed.core.constants import FOOT, KNOT
from exceed.physics._arrays import Array, finite, floats, quiet, where

NORMAL_95 = 1.959963984540054  # half-width of a 95 % interval over the standard deviation

_erfc = np.frompyfunc(math.erfc, 1, 1)


@dataclass(frozen=True, slots=True)
class Accuracy:
    """Default accuracy of a recorded quantity: a uniform half-width, SI, or where `relative` the greater of it and that
    share of the value. `source` is a key of SOURCES; `note` says what the figure is and what it leaves out."""

    half_width: float
    source: str
    relative: float = 0.0
    note: str = ""

    def at(self, value: ArrayLike) -> Array:
        """Half-width at a value: (n,) array in SI, NaN where the value is NaN and the accuracy depends on it."""
        if self.relative == 0.0:
            return np.full(np.shape(value), self.half_width)[()]
        return finite(np.maximum(self.half_width, self.relative * np.abs(floats(value))))


_DEGREE = math.radians(1.0)

# Ranges that the recording rules ask for, 1 (g): the spans of which accuracies are shares
RECORDED_RANGE: dict[str, tuple[float, float]] = {
    "load_factor": (-3.0, 6.0),
    "longitudinal_load_factor": (-1.0, 1.0),
    "lateral_load_factor": (-1.0, 1.0),
}


def _span(quantity: str) -> float:
    low, high = RECORDED_RANGE[quantity]
    return high - low


_DATUM = "1 % of the 9 g span; the datum error of 5 % is left out, for it is found from the data"
_HORIZONTAL = "1.5 % of the 2 g span; the datum error of 5 % is left out, for it is found from the data"
_NOT_PUBLISHED = "not in the tables at hand"

# What recording rules ask of the whole chain from sensor to read-out. Quantities not listed here have no published
# figure at hand: see NO_PUBLISHED_ACCURACY.
DEFAULT_ACCURACY: dict[str, Accuracy] = {
    "load_factor": Accuracy(0.01 * _span("load_factor"), "14CFR121-M", note=_DATUM),
    "longitudinal_load_factor": Accuracy(0.015 * _span("longitudinal_load_factor"), "14CFR121-M", note=_HORIZONTAL),
    "lateral_load_factor": Accuracy(0.015 * _span("lateral_load_factor"), "14CFR125-D", note=_HORIZONTAL),
    "pitch_angle": Accuracy(2.0 * _DEGREE, "14CFR121-M"),
    "bank_angle": Accuracy(2.0 * _DEGREE, "14CFR121-M"),
    "heading": Accuracy(2.0 * _DEGREE, "14CFR121-M"),
    "angle_of_attack": Accuracy(2.0 * _DEGREE, "14CFR135-B"),
    "indicated_airspeed": Accuracy(0.0, "14CFR121-M", relative=0.03, note="3 % from V_S0 to 1.2 V_D (5 % below V_S0)"),
    "calibrated_airspeed": Accuracy(0.0, "14CFR121-M", relative=0.03, note="3 % from V_S0 to 1.2 V_D (5 % below V_S0)"),
    "pressure_altitude": Accuracy(
        100.0 * FOOT, "14CFR121-M", note="100 to 700 ft by altitude; the least of that range, the table is not at hand"
    ),
    "flap_angle": Accuracy(3.0 * _DEGREE, "14CFR125-D", note="or as the pilot's indicator"),
    "static_air_temperature": Accuracy(2.0, "ICAO-ANNEX-6-2001", note="outside air temperature"),
    "total_air_temperature": Accuracy(2.0, "ICAO-ANNEX-6-2001", note="given for outside air temperature"),
    "height_above_ground": Accuracy(2.0 * FOOT, "ICAO-ANNEX-6-2001", relative=0.03, note="below 500 ft; 5 % above"),
}

# The older rule for light aeroplanes, much coarser
OLDER_ACCURACY: dict[str, Accuracy] = {
    "load_factor": Accuracy(0.2, "14CFR135-B", note="the datum error of 0.3 g is left out"),
    "indicated_airspeed": Accuracy(10.0 * KNOT, "14CFR135-B", relative=0.05),
    "calibrated_airspeed": Accuracy(10.0 * KNOT, "14CFR135-B", relative=0.05),
    "heading": Accuracy(5.0 * _DEGREE, "14CFR135-B", note="magnetic"),
    "bank_angle": Accuracy(2.0 * _DEGREE, "14CFR135-B"),
}

# Quantities a rule may want for which no published accuracy was at hand, and why
NO_PUBLISHED_ACCURACY: dict[str, str] = {
    "roll_rate": _NOT_PUBLISHED,
    "pitch_rate": _NOT_PUBLISHED,
    "yaw_rate": _NOT_PUBLISHED,
    "sideslip_angle": _NOT_PUBLISHED,
    "track_angle": _NOT_PUBLISHED,
    "ground_speed": _NOT_PUBLISHED,
    "true_airspeed": "derived from calibrated airspeed",
    "mach": "derived from airspeed and altitude",
    "vertical_speed": "derived from altitude",
    "fuel_mass": _NOT_PUBLISHED,
    "engine_speed": _NOT_PUBLISHED,
}


@quiet
def uncertainty_of_half_width(half_width: ArrayLike) -> Array:
    """Standard uncertainty of a tolerance taken as uniform: a / sqrt(3).

    Parameters: half_width : (n,) array.    Returns: (n,) array, same unit. NaN where negative.
    Source: [JCGM-100] rectangular distribution.
    """
    a = floats(half_width)
    return where(a >= 0.0, a / math.sqrt(3.0))


@quiet
def uncertainty_of_95(half_width: ArrayLike) -> Array:
    """Standard uncertainty of a stated 95 % interval: a / 1.96.

    Parameters: half_width : (n,) array.    Returns: (n,) array, same unit. NaN where negative.
    Source: [JCGM-100] normal distribution.
    """
    a = floats(half_width)
    return where(a >= 0.0, a / NORMAL_95)


@quiet
def uncertainty_of_step(step: ArrayLike) -> Array:
    """Standard uncertainty of a resolution step: step / sqrt(12).

    Parameters: step : (n,) array.    Returns: (n,) array, same unit. NaN where negative.
    Source: [JCGM-100] rectangular distribution of half a step either way.
    """
    s = floats(step)
    return where(s >= 0.0, s / math.sqrt(12.0))


@quiet
def combined_uncertainty(*uncertainties: ArrayLike) -> Array:
    """Unrelated standard uncertainties in quadrature.

    Parameters: uncertainties : arrays that broadcast, one unit.    Returns: array, same unit. NaN where one is NaN.
    Source: [JCGM-100].
    """
    total = floats(0.0)
    for u in uncertainties:
        total = np.hypot(total, floats(u))
    return finite(total)


@quiet
def expanded_uncertainty(standard_uncertainty: ArrayLike, coverage_factor: float = 2.0) -> Array:
    """Expanded uncertainty U = k u.

    Parameters: standard_uncertainty : (n,) array; coverage_factor : 1.    Returns: (n,) array, same unit.
    Source: [JCGM-100].
    """
    return finite(coverage_factor * floats(standard_uncertainty))


@quiet
def accuracy_band(share: ArrayLike, span: ArrayLike) -> Array:
    """Half-width of an accuracy given as a share of a range.

    Parameters: share : 1 (0.01 for one per cent); span : of the range.    Returns: unit of the span.
    Source: [DEFINITION].
    """
    return finite(floats(share) * floats(span))


@quiet
def quantisation_step(span: ArrayLike, bits: ArrayLike) -> Array:
    """Step of a range divided in 2^bits.

    Parameters: span : of the range; bits : number.    Returns: unit of the span.
    Source: [QUANTISATION].
    """
    return finite(floats(span) / 2.0 ** floats(bits))


@quiet
def normal_probability(z: ArrayLike) -> Array:
    """Probability that a standard normal variable is below z.

    Parameters: z : (n,) array, 1; infinities allowed.    Returns: (n,) array, 0 to 1. NaN where z is NaN.
    Source: [DEFINITION].
    """
    # the complementary function keeps the digits of a small tail
    return finite(0.5 * np.asarray(_erfc(-floats(z) / math.sqrt(2.0)), dtype=np.float64))


def _standardised(distance: Array, uncertainty: Array) -> Array:
    """distance / u; without uncertainty the answer is sure, and at the limit itself it is even."""
    z = distance / uncertainty
    sure = np.where(distance == 0.0, 0.0, np.sign(distance) * np.inf)
    return np.asarray(np.where(uncertainty > 0.0, z, np.where(uncertainty == 0.0, sure, np.nan)))


@quiet
def probability_below(value: ArrayLike, limit: ArrayLike, standard_uncertainty: ArrayLike) -> Array:
    """Probability that the true value is below a limit.

    Parameters: value, limit : (n,) arrays, one unit; standard_uncertainty : (n,) array, same unit; 0 is sure.
    Returns: (n,) array, 0 to 1; one half at the limit. NaN where an input is NaN or the uncertainty negative.
    Source: [JCGM-106] conformance probability, upper limit.
    """
    distance = floats(limit) - floats(value)
    return normal_probability(_standardised(distance, floats(standard_uncertainty)))


@quiet
def probability_above(value: ArrayLike, limit: ArrayLike, standard_uncertainty: ArrayLike) -> Array:
    """Probability that the true value is above a limit.

    Parameters and Returns: as in `probability_below`.
    Source: [JCGM-106] conformance probability, lower limit; for an upper limit its complement, the exceedance.
    """
    distance = floats(value) - floats(limit)
    return normal_probability(_standardised(distance, floats(standard_uncertainty)))


@quiet
def probability_between(
    value: ArrayLike, lower_limit: ArrayLike, upper_limit: ArrayLike, standard_uncertainty: ArrayLike
) -> Array:
    """Probability that the true value is between two limits.

    Parameters: value, lower_limit, upper_limit : (n,) arrays, one unit; standard_uncertainty : same unit.
    Returns: (n,) array, 0 to 1. NaN where an input is NaN.
    Source: [JCGM-106] two-sided tolerance interval.
    """
    below = probability_below(value, upper_limit, standard_uncertainty)
    return finite(np.maximum(0.0, below - probability_below(value, lower_limit, standard_uncertainty)))


@quiet
def guard_factor(probability: ArrayLike) -> Array:
    """How many standard uncertainties inside a limit a value must lie to conform with a probability.

    Parameters: probability : (n,) array, between 0 and 1.
    Returns: (n,) array, 1: 1.645 for 0.95. NaN outside 0 to 1 and at its ends.
    Source: [JCGM-106]; the inverse of `normal_probability`, by bisection.
    """
    p = np.asarray(floats(probability))
    low, high = np.full(p.shape, -40.0), np.full(p.shape, 40.0)
    for _ in range(64):
        middle = 0.5 * (low + high)
        under = normal_probability(middle) < p
        low, high = np.where(under, middle, low), np.where(under, high, middle)
    return where((p > 0.0) & (p < 1.0), 0.5 * (low + high))


@quiet
def guarded_acceptance_limit(
    limit: ArrayLike, standard_uncertainty: ArrayLike, coverage_factor: float = 2.0, guard_share: float = 1.0
) -> Array:
    """Upper limit less a guard band r k u: values below it are accepted.

    Parameters: limit : (n,); standard_uncertainty : (n,), same unit; coverage_factor k; guard_share r.
    Returns: (n,) array, unit of the limit.
    Source: [JCGM-106] guarded acceptance.
    """
    return finite(floats(limit) - guard_share * expanded_uncertainty(standard_uncertainty, coverage_factor))


@quiet
def guarded_rejection_limit(
    limit: ArrayLike, standard_uncertainty: ArrayLike, coverage_factor: float = 2.0, guard_share: float = 1.0
) -> Array:
    """Upper limit plus a guard band r k u: only above it is an exceedance claimed.

    Parameters and Returns: as in `guarded_acceptance_limit`.    Source: [JCGM-106] guarded rejection.
    """
    return finite(floats(limit) + guard_share * expanded_uncertainty(standard_uncertainty, coverage_factor))


def _half_turn_per_sample(frequency: ArrayLike, rate: ArrayLike) -> Array:
    f, fs = floats(frequency), floats(rate)
    return np.asarray(np.where((f >= 0.0) & (fs > 0.0) & (2.0 * f <= fs), np.pi * f / fs, np.nan))


@quiet
def worst_peak_ratio(frequency: ArrayLike, sample_rate: ArrayLike) -> Array:
    """Largest sample over true peak of a sinusoid in the worst case, two samples astride the top: cos(pi f / fs).

    Parameters: frequency, sample_rate : Hz.    Returns: 0 to 1, about the mean of the oscillation. NaN above fs / 2.
    Source: [SAMPLED-SINE].
    """
    return finite(np.cos(_half_turn_per_sample(frequency, sample_rate)))


@quiet
def worst_under_read(frequency: ArrayLike, sample_rate: ArrayLike) -> Array:
    """Share of the peak that the samples of a sinusoid may miss: 1 - cos(pi f / fs).

    Parameters: frequency, sample_rate : Hz.    Returns: 0 to 1. NaN above fs / 2.
    Source: [SAMPLED-SINE].
    """
    # twice the squared sine of the half keeps the digits of small shares
    return finite(2.0 * np.sin(0.5 * _half_turn_per_sample(frequency, sample_rate)) ** 2)


@quiet
def mean_peak_ratio(frequency: ArrayLike, sample_rate: ArrayLike) -> Array:
    """Largest sample over true peak of a sinusoid on average: sin(x) / x, x = pi f / fs.

    Parameters: frequency, sample_rate : Hz.    Returns: 0 to 1. NaN above fs / 2.
    Source: [SAMPLED-SINE].
    """
    return finite(np.sinc(_half_turn_per_sample(frequency, sample_rate) / np.pi))


@quiet
def samples_per_cycle(under_read: ArrayLike) -> Array:
    """Samples a cycle needed for the worst under-read to stay within a share.

    Parameters: under_read : share, above 0 and up to 1.    Returns: number, 2 or more. NaN outside.
    Source: [SAMPLED-SINE].
    """
    share = floats(under_read)
    # arccos(1 - s) by half angles, which keeps the digits of small shares
    return where((share > 0.0) & (share <= 1.0), np.pi / (2.0 * np.arcsin(np.sqrt(0.5 * share))))


@quiet
def half_sine_worst_ratio(duration: ArrayLike, sample_rate: ArrayLike) -> Array:
    """Largest sample over true peak of a half-sine pulse in the worst case: cos(pi / (2 d fs)).

    Parameters: duration : s; sample_rate : Hz.
    Returns: 0 to 1. NaN where the pulse is shorter than one interval, for it may be missed altogether.
    Source: [SAMPLED-SINE] with f = 1 / (2 d).
    """
    length = floats(duration)
    return where(length > 0.0, worst_peak_ratio(0.5 / length, sample_rate))


@quiet
def true_peak_bound(sampled_increment: ArrayLike, frequency: ArrayLike, sample_rate: ArrayLike) -> Array:
    """Largest true peak of an oscillation behind a sampled one, when nothing in it is faster than a frequency.

    Parameters: sampled_increment : about the mean of the oscillation; frequency, sample_rate : Hz.
    Returns: unit of the increment. NaN at and above fs / 2, where there is no bound.
    Source: [SAMPLED-SINE].
    """
    ratio = worst_peak_ratio(frequency, sample_rate)
    return where(np.asarray(ratio) > 1e-12, floats(sampled_increment) / ratio)
