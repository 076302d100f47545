"""How far a sampled signal truly went between its samples: the estimate of an extreme and its 95 % interval.

A recorder that samples a load factor eight times a second does not see its true peak. Here the samples about a recorded
extreme are taken as a Gaussian process whose smoothness, length and size are not known: a grid of them is weighted by
how well each explains the samples, and curves drawn from the mixture between the samples give the distribution of
the true extreme. Such a model trusts itself too much where the signal is short against the interval, so its spread is
widened with the *ratio* of two prediction errors: each sample near the peak is predicted from every second sample (E2)
and from every fourth (E4). A resolved signal is predicted far better from the nearer ones, an aliased one from neither.

The factors in `_UP`, `_DOWN` and their like were fitted by linear quantile regression on simulated truth (the FIT
families of tests/judge/yardstick.py, whose `fit_factors` repeats it) and checked on other families (CHECK) that had no
part in the fit.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

NEAR = 5  # samples each side of the extreme that the Gaussian process uses
HALO = 8  # samples each side that size_peak can use at all (E4 looks farthest)
ALIASED = 0.6  # ratio above which a channel slower than SLOW cannot size a peak
QUICKEST = 0.3  # s, the shortest excursion of a load factor that is flown; the fit's signals go down to it
SLOW = 0.25 * 1.1  # s; the yardstick shows that 8 and 4 Hz size what they see, with 10 % tolerance on the interval
_FINE = 8  # places a sampling interval at which curves are drawn
_DRAWS = 128  # curves a candidate; antithetic, so the medians are steady
_Z95, _Z_OUT = 1.959964, 1.644854

# Candidate processes: (smoothness, length in intervals, log prior weight). Smooth ones are preferred until the samples
# speak against them: manoeuvres are smooth, air is not.
_PRIOR = {"smooth": 0.0, "5/2": -2.0, "3/2": -4.0, "1/2": -3.0}
_CANDIDATES: tuple[tuple[str, float], ...] = tuple(
    (kind, length)
    for kind, lengths in (
        ("1/2", (2.2, 3.3, 5.0, 8.0)),
        ("3/2", (0.7, 1.0, 1.5, 2.2, 3.3, 5.0, 8.0)),
        ("5/2", (0.7, 1.0, 1.5, 2.2, 3.3, 5.0, 8.0)),
        ("smooth", (0.7, 1.0, 1.5, 2.2, 3.3, 5.0)),
    )
    for length in lengths
)
_AMPLITUDES = (0.4, 1.3)  # of the window's range
_MEAN_SPREAD = 9.0  # variance of the unknown mean, in squared ranges: wide enough to say nothing

# Widening, in the features of `_features`: see the module's docstring.
_UP_1 = (0.50, 0.19, 0.22, 0.14, 0.00)  # to the 84 % point
_OUT_95 = (0.81, 0.66, 0.60, 0.54, 0.00)  # to the 95 % point
_UP_95 = (1.38, 1.91, 2.04, 1.51, 0.00)  # to the upper end of the 95 % interval
_DOWN_1 = (0.38, 0.14, 0.27)
_DOWN_95 = (0.55, 0.53, 0.88)
_HARMLESS = 2.0  # prediction errors up to so many standard uncertainties of the sensor leave a peak sized
_DROWNED = 0.3  # so large a share of the sensor's error may lie between samples without being seen in the result
_NOISE_BELOW = 2.2  # the lower end lies at least so many times the noise below the recorded extreme


@dataclass(frozen=True, slots=True)
class Peak:
    """The true extreme behind a recorded one. All values in the unit of the samples, times in s.

    `recorded` is the sample; `estimate` the median of the true extreme, `time` when it was, `low` and `high` its 95 %
    interval, with `down` and `up` the distances to its 16 % and 84 % points (the two sides differ) and `outward` that
    to the point beyond which the truth lies with 5 %. On the open side the end is None where the sensor saturated
    (`saturated`) or the channel is too slow (`sized` False): the truth is then at least what was seen. `ratio` is E2/E4
    (near 0 for a resolved peak, towards 1 for an aliased one).
    """

    side: int
    recorded: float
    estimate: float
    low: float | None
    high: float | None
    time: float
    down: float
    up: float
    outward: float
    sized: bool
    saturated: bool
    ratio: float
    standard_uncertainty: float


@dataclass(frozen=True, slots=True)
class _Spread:
    """Quantiles of the largest value near the extreme, mirrored so that the extreme is a maximum."""

    low: float
    middle: float
    high: float
    time: float
    noise: float


def size_peak(
    time: Array,
    values: Array,
    side: int,
    index: int,
    *,
    standard_uncertainty: float,
    interval: float,
    resolution: float = 0.0,
    noise: float | None = None,
    saturation: float | None = None,
    quickest: float = QUICKEST,
) -> Peak:
    """Estimate the true extreme within one sampling interval of a recorded one.

    Parameters
    ----------
    time, values : (k,) arrays, s and any unit; ascending, finite, cut at gaps. HALO samples on either side are used
        where they are there; fewer make the answer wider, and below four samples nothing is sized.
    side : +1 for a maximum, -1 for a minimum.
    index : place of the recorded extreme in the window.
    standard_uncertainty : of the sensor, same unit, common to all samples (an accuracy a of 95 % is a/1.96).
    interval : s, the channel's sampling interval.
    resolution : step of quantisation.
    noise : standard deviation of white noise where it was measured; None: between nothing and `standard_uncertainty`,
        as the samples suggest.
    saturation : the sensor's end in this direction; an extreme that reaches it is "at least".
    quickest : s, the shortest excursion that the quantity can make: 0.3 for load factors, angular rates and angle of
        attack, about 1 for bank and pitch, about 3 for airspeed, Mach and height, which inertia keeps slow. A signal
        sampled well within it cannot be aliased.

    Returns
    -------
    Peak. Only the time inside the window is spoken of: what lies beyond a gap is not known.

    Raises
    ------
    ValueError : shapes differ, no sample, index outside the window, side not +1 or -1, interval not positive, values
        not finite or times not ascending.

    Source
    ------
    Own method, fitted and checked on simulated truth; sensor and sampling parts added in quadrature as in JCGM 100.
    """
    t, v = np.asarray(time, dtype=float), side * np.asarray(values, dtype=float)
    if t.shape != v.shape or t.ndim != 1 or not 0 <= index < t.size:
        raise ValueError(
            f"a window of equal one-dimensional arrays with index inside is needed, got {t.shape}, {v.shape}, {index}"
        )
    if side not in (1, -1) or not interval > 0:
        raise ValueError(f"side is +1 or -1 and interval positive, got {side}, {interval}")
    a, b = max(0, index - HALO), min(t.size, index + HALO + 1)
    u, v, place = (t[a:b] - t[index]) / interval, v[a:b], index - a
    if not (np.isfinite(v).all() and np.all(np.diff(u) > 0)):
        raise ValueError("a window of finite values at ascending times is needed")
    seen, step = float(v[place]), resolution / math.sqrt(12.0)
    known_noise = math.hypot(noise, step) if noise is not None else None
    clipped = saturation is not None and seen >= side * saturation - max(0.5 * resolution, 1e-9 * abs(saturation))
    few = v.size < 4
    if clipped or few:
        spread = math.hypot(standard_uncertainty, known_noise if known_noise is not None else step)
        ratio = 1.0 if few else _ratio(u, v, place, known_noise or step)[1]
        return _open(side, seen, float(t[index]), spread, ratio, clipped, standard_uncertainty)
    white = known_noise if known_noise is not None else step
    between = float(bend(u, v)[place])
    if noise is not None and math.hypot(between, white) <= _DROWNED * standard_uncertainty:
        return _plain(side, seen, float(t[index]), between, white, standard_uncertainty)
    s = _spread(u, v, place, step, known_noise, standard_uncertainty)
    error, ratio = _ratio(u, v, place, s.noise)
    pace = interval * QUICKEST / quickest
    if pace > SLOW and ratio > ALIASED and error > _HARMLESS * standard_uncertainty:
        return _open(
            side, seen, float(t[index]), math.hypot(standard_uncertainty, s.noise), ratio, False, standard_uncertainty
        )
    up_features, down_features = _features(seen, s, error, ratio, pace)
    up_1, up_95 = float(np.dot(_UP_1, up_features)), float(np.dot(_UP_95, up_features))
    down_1, down_95 = float(np.dot(_DOWN_1, down_features)), float(np.dot(_DOWN_95, down_features))
    room = between + 6.0 * s.noise
    # never beyond what the quick filter allows, or the filter would hide what this would show
    estimate = min(s.middle, seen + room)
    up_95 = min(up_95, seen + room - estimate)
    down_95 = max(down_95, estimate - (seen - _NOISE_BELOW * s.noise))
    outward = min(float(np.dot(_OUT_95, up_features)), 0.9 * up_95)
    up_1, down_1 = min(up_1, 0.8 * outward), min(down_1, 0.8 * down_95)
    low = estimate - math.hypot(down_95, _Z95 * standard_uncertainty)
    high = estimate + math.hypot(up_95, _Z95 * standard_uncertainty)
    down, up = math.hypot(down_1, standard_uncertainty), math.hypot(up_1, standard_uncertainty)
    if side < 0:
        low, high, down, up = -high, -low, up, down
    return Peak(
        side,
        side * seen,
        side * estimate,
        low,
        high,
        float(t[index] + interval * s.time),
        down,
        up,
        math.hypot(outward, _Z_OUT * standard_uncertainty),
        True,
        False,
        ratio,
        standard_uncertainty,
    )


def _plain(side: int, seen: float, time: float, between: float, white: float, uncertainty: float) -> Peak:
    """A peak whose part between samples drowns in the sensor's error: the sample, and that error about it."""
    spread = math.hypot(uncertainty, white)
    below, above = _Z95 * spread, math.hypot(_Z95 * spread, between)
    low, high = (seen - below, seen + above) if side > 0 else (-seen - above, -seen + below)
    outward = math.hypot(_Z_OUT * spread, 0.8 * between)
    return Peak(
        side, side * seen, side * seen, low, high, time, spread, spread, outward, True, False, 0.0, uncertainty
    )


def _open(side: int, seen: float, time: float, spread: float, ratio: float, clipped: bool, uncertainty: float) -> Peak:
    end = side * (seen - _Z95 * spread)
    low, high = (end, None) if side > 0 else (None, end)
    return Peak(
        side,
        side * seen,
        side * seen,
        low,
        high,
        time,
        spread,
        spread,
        _Z_OUT * spread,
        False,
        clipped,
        ratio,
        uncertainty,
    )


def _features(seen: float, s: _Spread, error: float, ratio: float, pace: float) -> tuple[list[float], list[float]]:
    """What the widths upward and downward are made of. `pace`: the interval, s, as load factors go."""
    beyond, spread = max(s.middle - seen, 0.0), s.high - s.middle
    slower = max(pace / 0.125 - 1.0, 0.0)
    up = [spread, error * ratio**2, error * ratio**2 * slower, beyond, s.noise]
    return up, [s.middle - s.low, beyond, s.noise]


# --- prediction errors -----------------------------------------------------------------------------------------------


def _ratio(u: Array, v: Array, place: int, noise: float) -> tuple[float, float]:
    """E2 near the extreme, and the ratio E2/E4 with the noise's share taken out (0 where only noise is seen)."""
    near, far = _error(u, v, place, 1), _error(u, v, place, 2)
    far = float(np.ptp(v)) if far is None else far
    near = far if near is None else near
    clean_near = math.sqrt(max(near**2 - (2 * noise) ** 2, 0.0))
    clean_far = math.sqrt(max(far**2 - (2 * noise) ** 2, 0.0))
    if clean_near <= noise:
        return near, 0.0
    return near, min(1.0, clean_near / max(clean_far, 1e-300))


def _error(u: Array, v: Array, place: int, step: int) -> float | None:
    """Largest error of the three samples about the extreme, each predicted by a cubic through samples 2*step apart.

    Near an end of the window those stand in that are the nearest with neighbours on both sides.
    """
    if v.size < 2 * step + 1:
        return None
    worst = 0.0
    for j in sorted({min(max(place + k, step), v.size - 1 - step) for k in (-1, 0, 1)}):
        nodes = sorted({max(j - 3 * step, 0), j - step, j + step, min(j + 3 * step, v.size - 1)})
        x = u[nodes] - u[j]
        predicted = 0.0
        for i, node in enumerate(nodes):
            others = np.delete(x, i)
            predicted += float(v[node]) * float(np.prod(others / (others - x[i])))
        error = abs(float(v[j]) - predicted)
        worst = max(worst, error)
    return worst


# --- Gaussian processes ----------------------------------------------------------------------------------------------


def _correlation(kind: str, distance: Array) -> Array:
    if kind == "smooth":
        return np.asarray(np.exp(-0.5 * distance**2))
    if kind == "1/2":
        return np.asarray(np.exp(-distance))
    a = math.sqrt(3.0 if kind == "3/2" else 5.0) * distance
    return np.asarray((1 + a) * np.exp(-a) if kind == "3/2" else (1 + a + a * a / 3) * np.exp(-a))


def _matrices(u: Array) -> tuple[Array, Array, Array, Array]:
    """Grid of places (m,) within one interval of 0 and inside u; correlations (H,n,n), (H,m,n), (H,m,m)."""
    grid = np.linspace(max(u[0], -1.0), min(u[-1], 1.0), 2 * _FINE + 1)

    def stack(x: Array, y: Array) -> Array:
        distance = np.abs(x[:, None] - y[None, :])
        return np.stack([_correlation(kind, distance / length) for kind, length in _CANDIDATES])

    return grid, stack(u, u), stack(grid, u), stack(grid, grid)


@lru_cache(maxsize=64)
def _regular_matrices(before: int, after: int) -> tuple[Array, Array, Array, Array]:
    return _matrices(np.arange(-before, after + 1, dtype=float))


@lru_cache(maxsize=4)
def _normals(m: int) -> Array:
    """(m, _DRAWS) standard normal numbers, the same every time: the same samples give the same peak."""
    half = np.random.default_rng(7).normal(size=(m, _DRAWS // 2))
    return np.hstack([half, -half])


def _root(spread: Array) -> Array:
    """(k,m,m) a square root of each; where rounding left a matrix slightly indefinite, its negative part is nothing."""
    try:
        return np.asarray(np.linalg.cholesky(spread))
    except np.linalg.LinAlgError:
        values, vectors = np.linalg.eigh(spread)
        return np.asarray(vectors * np.sqrt(np.maximum(values, 0.0))[:, None, :])


_LOG_PRIOR = np.array([_PRIOR[kind] for kind, _ in _CANDIDATES])


def _noises(step: float, known: float | None, uncertainty: float) -> list[float]:
    """Standard deviations of white noise to try, the largest last.

    A noise measured above the sensor's own uncertainty is likely rough air or a slow channel's own signal: the samples
    about the peak may speak for less.
    """
    if known is None:
        return [step, math.hypot(step, 0.35 * uncertainty), math.hypot(step, uncertainty)]
    floor = math.hypot(step, uncertainty)
    return [known] if known <= floor else [floor, math.sqrt(floor * known), known]


def _spread(u: Array, v: Array, place: int, step: float, known_noise: float | None, uncertainty: float) -> _Spread:
    a, b = max(0, place - NEAR), min(v.size, place + NEAR + 1)
    u, v = u[a:b], v[a:b]
    before, after = place - a, b - 1 - place
    scale = float(np.ptp(v))
    noises = _noises(step, known_noise, uncertainty)
    if scale <= 1e-12 * float(np.abs(v).max()) or scale == 0.0:
        return _Spread(float(v[0]) - noises[0], float(v[0]), float(v[0]) + noises[0], 0.0, noises[0])
    base = float(v.mean())
    y = (v - base) / scale
    regular = bool(np.abs(u - np.arange(-before, after + 1)).max() < 0.03)
    grid, near, across, fine = _regular_matrices(before, after) if regular else _matrices(u)
    size, white = (
        x.ravel()
        for x in np.meshgrid(np.square(_AMPLITUDES), [max(x / scale, 1e-4) ** 2 for x in noises], indexing="ij")
    )
    n, m = u.size, grid.size
    diagonal = (white + 1e-7 * size)[None, :, None, None] * np.eye(n)
    covariance = size[None, :, None, None] * near[:, None] + diagonal + _MEAN_SPREAD
    root = np.linalg.cholesky(covariance)  # the diagonal added is far above rounding, so it exists
    whitened = np.linalg.solve(root, np.broadcast_to(y[:, None], (*root.shape[:-1], 1)))[..., 0]
    evidence = (
        -0.5 * (whitened**2).sum(-1) - np.log(np.diagonal(root, axis1=-2, axis2=-1)).sum(-1) + _LOG_PRIOR[:, None]
    )
    weight = np.exp(evidence - evidence.max())
    weight /= weight.sum()
    mean_noise = float((weight.sum(0) * np.tile(noises, len(_AMPLITUDES))).sum())
    order = np.argsort(-weight, axis=None, kind="stable")[:12]
    which, how = np.unravel_index(order, weight.shape)
    keep = weight[which, how] > 0.01 * weight[which[0], how[0]]
    which, how = which[keep], how[keep]
    share = weight[which, how] / weight[which, how].sum()
    large = size[how][:, None, None]
    cross = large * across[which] + _MEAN_SPREAD
    gain = np.linalg.solve(covariance[which, how], np.swapaxes(cross, 1, 2))
    mean = np.swapaxes(gain, 1, 2) @ y
    spread = large * fine[which] + _MEAN_SPREAD - cross @ gain + 1e-6 * large * np.eye(m)
    curves = mean[:, :, None] + _root(spread) @ _normals(m)
    top, where = curves.max(axis=1).ravel(), grid[curves.argmax(axis=1)].ravel()
    each = np.repeat(share / _DRAWS, _DRAWS)
    order = np.argsort(top, kind="stable")
    level = np.cumsum(each[order]) - 0.5 * each[order]
    low, middle, high = base + scale * np.interp([0.025, 0.5, 0.975], level, top[order])
    return _Spread(float(low), float(middle), float(high), float((each * where).sum()), mean_noise)


# --- the quick filter ------------------------------------------------------------------------------------------------


def bend(u: Array, v: Array) -> Array:
    """(n,) the largest second difference of the five samples about each, in the values' unit; u: times in intervals."""
    bent = np.zeros_like(v)
    if v.size >= 3:
        steps = np.maximum(np.diff(u), 1e-3)
        bent[1:-1] = np.abs(np.diff(np.diff(v) / steps)) * np.maximum(0.5 * (steps[1:] + steps[:-1]), 0.5)
    if v.size >= 2:
        bent[0], bent[-1] = abs(v[1] - v[0]), abs(v[-1] - v[-2])
    widest = bent.copy()
    for k in (1, 2):
        np.maximum(widest[k:], bent[:-k], out=widest[k:])
        np.maximum(widest[:-k], bent[k:], out=widest[:-k])
    return widest
