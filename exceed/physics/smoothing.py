"""Smoothing and differentiation on uneven times: a local least-squares parabola round each sample.

The result at a sample depends on nothing but the samples within `width` (the half-width, s) of it, so a block that
holds this reach on either side gives the same result as the whole. No fit reaches across a gap: an interval between
usable samples above `max_gap`, or time running back.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from exceed.physics._arrays import Array, finite, floats, quiet


@dataclass(frozen=True, slots=True, eq=False)
class _Fit:
    """Per sample: fitted value, slope, and what multiplies the noise variance in each. NaN where there is no fit."""

    value: Array
    slope: Array
    value_gain: Array
    slope_gain: Array


def _fit(times: Array, values: Array, width: float, max_gap: float) -> _Fit:
    if times.ndim != 1 or times.shape != values.shape:
        raise ValueError(f"times and values must be arrays of one shape (n,), not {times.shape} and {values.shape}")
    if not (width > 0.0 and max_gap > 0.0):
        raise ValueError(f"width and max_gap must be positive, not {width} and {max_gap}")
    out = np.full((4, times.size), np.nan)
    kept = np.flatnonzero(np.isfinite(times) & np.isfinite(values))
    if kept.size:
        out[:, kept] = _fit_usable(times[kept], values[kept], width, max_gap)
    return _Fit(*out)


# samples fitted at a time: the sums then stay in the processor's cache, which halves the time
_CHUNK = 8192


def _fit_usable(t: Array, v: Array, width: float, max_gap: float) -> Array:
    n = t.size
    step = np.diff(t)
    apart = (step > max_gap) | (step < 0.0)
    segment = np.concatenate(([0], np.cumsum(apart)))
    # a clock that never runs back, to find each chunk's neighbours by
    rising = np.concatenate(([0.0], np.cumsum(np.where(apart, 3.0 * width, step))))
    out = np.empty((4, n))
    for low in range(0, n, _CHUNK):
        high = min(n, low + _CHUNK)
        first = int(np.searchsorted(rising, rising[low] - 1.1 * width))
        last = int(np.searchsorted(rising, rising[high - 1] + 1.1 * width, side="right"))
        part = _fit_chunk(t[first:last], v[first:last], segment[first:last], width)
        out[:, low:high] = part[:, low - first : high - first]
    return out


def _fit_chunk(t: Array, v: Array, segment: NDArray[np.intp], width: float) -> Array:
    n = t.size
    reach = width * (1.0 + 1e-6)  # so that a sample meant to sit on the edge is in, whatever its rounding
    # Sums of powers of u = dt/width over the window: s0..s4, and of (v - v_i) times them: a0..a2
    s = np.zeros((5, n))
    s[0] = 1.0
    a = np.zeros((3, n))
    for offset in range(1, n):
        u = (t[offset:] - t[:-offset]) / width
        near = (segment[offset:] == segment[:-offset]) & (u <= reach / width)
        if not near.any():
            break
        u = np.where(near, u, 0.0)
        # far values do not enter, but 0 times an overflow would
        dv = np.where(near, v[offset:] - v[:-offset], 0.0)
        power = near.astype(np.float64)
        for k in range(5):
            s[k, :-offset] += power
            s[k, offset:] += power if k % 2 == 0 else -power
            if k < 3:
                a[k, :-offset] += power * dv
                # seen from the later sample both dv and u change sign
                a[k, offset:] += -power * dv if k % 2 == 0 else power * dv
            power = power * u
    s0, s1, s2, s3, s4 = s
    # cofactors of the symmetric 3 x 3 normal matrix
    c00, c01, c02 = s2 * s4 - s3 * s3, s2 * s3 - s1 * s4, s1 * s3 - s2 * s2
    c11, c12 = s0 * s4 - s2 * s2, s1 * s2 - s0 * s3
    determinant = s0 * c00 + s1 * c01 + s2 * c02
    parabola = determinant > 1e-9 * s0 * s2 * s4
    value = (c00 * a[0] + c01 * a[1] + c02 * a[2]) / determinant
    slope = (c01 * a[0] + c11 * a[1] + c12 * a[2]) / determinant
    value_gain, slope_gain = c00 / determinant, c11 / determinant
    # two distinct times carry a straight line, one carries its value and no slope
    line_determinant = s0 * s2 - s1 * s1
    line = ~parabola & (line_determinant > 1e-9 * s0 * s2)
    point = ~parabola & ~line
    value = np.where(line, (s2 * a[0] - s1 * a[1]) / line_determinant, value)
    slope = np.where(line, (s0 * a[1] - s1 * a[0]) / line_determinant, slope)
    value_gain = np.where(line, s2 / line_determinant, value_gain)
    slope_gain = np.where(line, s0 / line_determinant, slope_gain)
    value = np.where(point, a[0] / s0, value)
    value_gain = np.where(point, 1.0 / s0, value_gain)
    slope = np.where(point, np.nan, slope)
    slope_gain = np.where(point, np.nan, slope_gain)
    return np.stack([v + value, slope / width, value_gain, slope_gain / width**2])


@quiet
def smooth_derivative(times: ArrayLike, values: ArrayLike, width: float, max_gap: float) -> Array:
    """Rate of change of a channel by local least-squares parabolas on its own, possibly uneven, times.

    Parameters
    ----------
    times : (n,) array, s, rising (equal times allowed); NaN is left out
    values : (n,) array, any unit; NaN is left out
    width : half-width of the window, s; this is the reach
    max_gap : s; no fit reaches across a longer interval between usable samples

    Returns
    -------
    (n,) array, unit/s. NaN where time or value is NaN and where a window holds no second time.

    Raises
    ------
    ValueError : shapes other than (n,), or width or max_gap not positive.

    Source
    ------
    [SAVITZKY-GOLAY] on uneven times.
    """
    return finite(_fit(floats(times), floats(values), width, max_gap).slope)


@quiet
def smooth(times: ArrayLike, values: ArrayLike, width: float, max_gap: float) -> Array:
    """A channel smoothed by local least-squares parabolas on its own, possibly uneven, times.

    Parameters, Raises and Source as in `smooth_derivative`: [SAVITZKY-GOLAY].
    Returns: (n,) array, unit of the values. NaN where time or value is NaN; a lone sample keeps its value.
    """
    return finite(_fit(floats(times), floats(values), width, max_gap).value)


@quiet
def smooth_derivative_uncertainty(
    times: ArrayLike, values: ArrayLike, width: float, max_gap: float, noise: float
) -> Array:
    """Standard uncertainty of `smooth_derivative` when each sample carries independent noise.

    Parameters: as there, and noise : standard deviation of one sample, unit of the values.
    Returns: (n,) array, unit/s; larger at the ends of a stretch, where the window has one side. NaN as there.
    Source: [JCGM-100] propagation through the least-squares weights. The curvature that a parabola cannot follow
    is not in it.
    """
    return finite(noise * np.sqrt(_fit(floats(times), floats(values), width, max_gap).slope_gain))


@quiet
def smooth_uncertainty(times: ArrayLike, values: ArrayLike, width: float, max_gap: float, noise: float) -> Array:
    """Standard uncertainty of `smooth` when each sample carries independent noise.

    Parameters: as in `smooth_derivative_uncertainty`.    Returns: (n,) array, unit of the values.
    Source: [JCGM-100] propagation through the least-squares weights.
    """
    return finite(noise * np.sqrt(_fit(floats(times), floats(values), width, max_gap).value_gain))


@quiet
def unwrap_angle(angle: ArrayLike) -> Array:
    """An angle without its jumps of a full turn, so that it can be differentiated.

    Parameters: angle : (n,) array, rad; NaN is passed over, so that the count of turns goes on after it.
    Returns: (n,) array, rad, equal to the input but for whole turns. NaN at its own places.
    Raises: ValueError for another shape than (n,).
    Source: [DEFINITION]; a change above half a turn between samples is taken for a jump.
    """
    raw = floats(angle)
    if raw.ndim != 1:
        raise ValueError(f"angle must be an array of shape (n,), not {raw.shape}")
    out = np.full(raw.shape, np.nan)
    kept = np.isfinite(raw)
    out[kept] = np.unwrap(raw[kept])
    return out
