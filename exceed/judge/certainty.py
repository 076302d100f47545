"""How sure an exceedance is: probabilities, their words, what hides between samples, how sure a duration is.

Method of [JCGM-106]: the chance that the true value lies beyond a limit, given what was measured and how well. Peaks
are sized in `peaks.py`; here their distribution is asked questions.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Literal

import numpy as np

from exceed.judge.peaks import HALO, Array, Peak, bend, size_peak

__all__ = [
    "HALO", "Peak", "Word", "cap_at_possible", "certainty_word", "crossing_time", "duration_uncertainty",
    "estimated_span", "hidden_beyond", "is_undecided", "probability_beyond", "probability_lasting",
    "shortest_sized", "size_peak", "upward_room", "white_noise",
]  # fmt: skip

Word = Literal["established", "likely", "possible", "doubtful"]
ESTABLISHED, LIKELY, POSSIBLE = 0.95, 0.5, 0.05
CAPPED = 0.499  # a method that can make nothing more than possible: below likely, also as it is printed
INTERVALS_TO_SIZE = 4.0
WORTH_ASKING = 0.2  # of the sensor's standard uncertainty: less between samples is no question of its own; judgement
_Z95 = 1.959964
# Where the known points of a peak's distribution stand, as standard scores. The ends of the interval were fitted at 2 %
# and 98.5 %, so that shapes unlike those fitted are covered 95 times in 100 as well.
_SCORES = (-2.0537, -1.0, 0.0, 1.0, 1.644854, 2.1701)


# --- words ------------------------------------------------------------------------------------------------------------


def certainty_word(probability: float) -> Word:
    """The word for P(the true value went beyond a level). Raises ValueError outside 0..1 and for NaN."""
    if not 0.0 <= probability <= 1.0:
        raise ValueError(f"a probability lies between 0 and 1, got {probability}")
    if probability >= ESTABLISHED:
        return "established"
    if probability >= LIKELY:
        return "likely"
    return "possible" if probability >= POSSIBLE else "doubtful"


def cap_at_possible(probability: float) -> float:
    """The probability where the method allows no more than `possible`: just below one half at most."""
    return min(probability, CAPPED)


def shortest_sized(interval: float) -> float:
    """The shortest excursion, s from base to base, whose peak a channel of this sampling interval (s) can size.

    Four intervals. On simulated raised cosines and half sines sampled at 8 Hz, 2, 3, 4 and 6 intervals long, the sample
    under-reads by 20, 9, 5 and 2 % of the height (rms), the estimate errs by 16, 4, 1 and 0.4 %, and the interval's
    half-width is 61, 36, 13 and 4 %: from four on a peak is sized, below it is bounded at best (`shortest_table` in
    tests/judge/yardstick.py).
    """
    return INTERVALS_TO_SIZE * interval


# --- probabilities ----------------------------------------------------------------------------------------------------


def _normal(score: float) -> float:
    return 0.5 * math.erfc(-score / math.sqrt(2.0))


def _ends(peak: Peak, sensor: bool) -> tuple[float, ...]:
    """The values at _SCORES, mirrored so that the extreme is a maximum; without the sensor's common error if asked."""
    u = peak.standard_uncertainty
    if peak.low is None or peak.high is None:
        spread = peak.up if sensor else math.sqrt(max(peak.up**2 - u**2, 0.0))
        return tuple(peak.side * peak.recorded + score * spread for score in _SCORES)
    below, above = peak.estimate - peak.low, peak.high - peak.estimate
    down, up = peak.down, peak.up
    if peak.side < 0:
        below, above, down, up = above, below, up, down

    def width(total: float, stated: float, score: float) -> float:
        sampling = math.sqrt(max(total**2 - (stated * u) ** 2, 0.0))
        return math.hypot(sampling, score * u) if sensor else sampling

    middle = peak.side * peak.estimate
    return (
        middle - width(below, _Z95, _SCORES[0]),
        middle - width(down, 1.0, 1.0),
        middle,
        middle + width(up, 1.0, 1.0),
        middle + width(peak.outward, _SCORES[4], _SCORES[4]),
        middle + width(above, _Z95, _SCORES[-1]),
    )


def _score(ends: Sequence[float], level: float) -> float:
    """Standard score of a level, linear between the known points and beyond them as the outer pair goes."""
    if level <= ends[1]:
        a = 0
    elif level >= ends[-2]:
        a = len(ends) - 2
    else:
        a = max(i for i in range(len(ends) - 1) if ends[i] <= level)
    width = ends[a + 1] - ends[a]
    if width <= 1e-12 * max(abs(ends[a]), abs(ends[a + 1]), 1e-300):
        # nothing is uncertain: what stands at the level to the last digit is not beyond it
        level_is_above = level >= ends[a] - 1e-12 * max(abs(level), abs(ends[a]))
        return math.inf if level_is_above else -math.inf
    return _SCORES[a] + (level - ends[a]) / width * (_SCORES[a + 1] - _SCORES[a])


def probability_beyond(peak: Peak, level: float) -> float:
    """P(the true extreme went beyond `level`), beyond in the sense of the peak's side.

    For an open peak (saturated, or the channel too slow) it is that of the recorded value: a lower bound.
    Source: [JCGM-106] for the normal case; the peak's distribution has two unlike sides.
    """
    return _normal(-_score(_ends(peak, True), peak.side * level))


def hidden_beyond(peak: Peak, level: float) -> float:
    """P(beyond) from sampling and noise alone, as if the sensor's common error were nothing."""
    return _normal(-_score(_ends(peak, False), peak.side * level))


def is_undecided(peak: Peak, level: float) -> bool:
    """Whether an extreme recorded inside `level` may truly have been beyond, and sampling or saturation is why.

    The sensor's accuracy alone does not make a stretch undecided: of a slow, well-sampled channel near its limit that
    is said in one line. A peak too slow to size is not undecided but unassessed. Of a saturated one nothing better
    can be said, whatever the lower bound of its probability.
    """
    if peak.side * (peak.recorded - level) > 0:
        return False
    if peak.saturated:
        return True
    # at a limit to the digit the least of spreads would do: what sampling hides must count beside the sensor's error
    hides = _ends(peak, False)[-1] - peak.side * peak.recorded >= WORTH_ASKING * peak.standard_uncertainty
    sure = probability_beyond(peak, level) >= POSSIBLE and hidden_beyond(peak, level) >= POSSIBLE
    return peak.sized and hides and sure


# --- what may hide between samples ------------------------------------------------------------------------------------


def upward_room(
    time: Array,
    values: Array,
    side: int,
    *,
    interval: float,
    noise: float = 0.0,
    resolution: float = 0.0,
    standard_uncertainty: float = 0.0,
) -> Array:
    """How far, at most, the truth may lie beyond each sample and its two neighbours, in the direction of `side`.

    A quick filter before `size_peak`, which never gives more at a local extreme. It depends on three samples on either
    side (a block needs that halo) and takes a few passes over the array.

    Parameters
    ----------
    time, values : (n,) arrays, s and any unit, one stretch without a gap (of a stretch's first and last three samples
        less is known than within).
    side : +1 or -1; the room is a positive distance either way.
    interval : s.
    noise, resolution, standard_uncertainty : as for `size_peak`; where noise is not known there, give the larger of
        it and the standard uncertainty.

    Returns
    -------
    (n,) array, unit of the values. NaN where one of the samples it rests on is NaN.

    Source
    ------
    The largest second difference of five samples. A sinusoid's peak lies at most an eighth of its own above the sample
    beside it; a peak of a single sample has twice its height.
    """
    v = np.asarray(values, dtype=float)
    white = math.hypot(noise, resolution / math.sqrt(12.0))
    return bend(np.asarray(time, dtype=float) / interval, v) + 6.0 * white + _Z95 * standard_uncertainty


def white_noise(values: Array, block: int = 32) -> float:
    """Standard deviation of a channel's white noise, from its quietest fifth of blocks; 0 if there are too few samples.

    Fourth differences leave nothing of a smooth signal and sqrt(70) times the noise. Of a slow channel in rough air the
    signal passes for noise: give `size_peak` then no more than the sensor's standard uncertainty.
    """
    v = np.asarray(values, dtype=float)
    fourth = np.diff(v, 4)
    count = fourth.size // block
    if count == 0:
        return 0.0
    squares = (fourth[: count * block].reshape(count, block) ** 2).mean(axis=1)
    squares = squares[np.isfinite(squares)]
    return float(np.sqrt(np.quantile(squares, 0.2) / 70.0)) if squares.size else 0.0


# --- times ------------------------------------------------------------------------------------------------------------


def crossing_time(time_0: float, value_0: float, time_1: float, value_1: float, level: float) -> float:
    """When the straight line between two samples meets `level`. Raises ValueError if the level is not between them."""
    if not min(value_0, value_1) <= level <= max(value_0, value_1):
        raise ValueError(f"the level {level} is not between {value_0} and {value_1}")
    if value_0 == value_1:
        return time_0
    return time_0 + (level - value_0) / (value_1 - value_0) * (time_1 - time_0)


def estimated_span(
    peak: Peak, time_before: float, value_before: float, time_after: float, value_after: float, level: float
) -> tuple[float, float]:
    """Start and end, s, of the estimate's curve beyond a level that no sample is beyond.

    A parabola on each side, from the last sample before the estimate's time and the first one after it to the estimate.
    Both are the estimate's time where the estimate itself is not beyond the level.
    """
    height = peak.side * (peak.estimate - level)
    if height <= 0:
        return peak.time, peak.time

    def reach(distance: float, value: float) -> float:
        drop = peak.side * (peak.estimate - value)
        return distance * math.sqrt(min(1.0, height / drop)) if drop > 0 else distance

    return (
        peak.time - reach(max(peak.time - time_before, 0.0), value_before),
        peak.time + reach(max(time_after - peak.time, 0.0), value_after),
    )


def duration_uncertainty(
    time: Array,
    values: Array,
    first: int,
    last: int,
    level: float,
    *,
    standard_uncertainty: float = 0.0,
    noise: float = 0.0,
    resolution: float = 0.0,
) -> float:
    """Standard uncertainty, s, of a duration beyond `level` between two linear crossings.

    Parameters
    ----------
    time, values : (k,) arrays of one stretch.
    first, last : first and last sample beyond the level. At an end of the window there is no crossing to add.
    level : same unit as the values.
    standard_uncertainty, noise, resolution : as for `size_peak`.

    Returns
    -------
    s. At each crossing: noise over slope, the curve's departure from the straight line, and never more than a place
    anywhere in the sampling interval, which the two samples prove; the sensor's common error moves both ends outward or
    inward together.
    """
    t, v = np.asarray(time, dtype=float), np.asarray(values, dtype=float)
    white = math.hypot(noise, resolution / math.sqrt(12.0))
    apart, common = 0.0, 0.0
    for inside, outside in ((first - 1, first), (last + 1, last)):
        if not 0 <= inside < t.size:
            continue
        width = abs(float(t[outside] - t[inside]))
        rise = max(abs(float(v[outside] - v[inside])), 1e-300)
        share = (
            min(max((level - float(v[inside])) / float(v[outside] - v[inside]), 0.0), 1.0)
            if v[outside] != v[inside]
            else 0.5
        )
        a, b = max(0, min(inside, outside) - 1), min(t.size, max(inside, outside) + 2)
        rates = np.diff(v[a:b]) / np.diff(t[a:b])
        curve = float(np.abs(np.diff(rates)).max()) * width if rates.size > 1 else 0.0  # second difference
        bow = 0.5 * share * (1 - share) * curve + 0.05 * curve
        error = width / rise * math.hypot(white, bow)
        apart += min(error, width / math.sqrt(12.0)) ** 2
        common += min(width / rise * standard_uncertainty, width)
    return math.hypot(math.sqrt(apart), common)


def probability_lasting(duration: float, uncertainty: float, lasting: float) -> float:
    """P(a duration known with a standard uncertainty reached `lasting`), all s. [JCGM-106]"""
    if lasting <= 0:
        return 1.0
    if uncertainty <= 0:
        return 1.0 if duration >= lasting else 0.0
    return _normal((duration - lasting) / uncertainty)
