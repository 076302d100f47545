"""Measures of a channel from its own samples: step of quantisation, noise, the ends at which it is clipped."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from exceed.core.recording import Array


def _pieces(values: Array, most: int) -> list[Array]:
    """A few blocks spread over a long array."""
    if len(values) <= most:
        return [values]
    size = most // 8
    starts = np.linspace(0, len(values) - size, 8).astype(int)
    return [values[start : start + size] for start in starts]


def resolution(values: Array) -> float:
    """Step of quantisation in the figures as written, 0 where there is none to see."""
    some = np.concatenate(_pieces(values, 16384))
    some = some[np.isfinite(some)]
    levels = np.unique(some)
    if len(levels) < 3:
        return 0.0
    steps = np.diff(levels)
    # the usual size, not the largest: one cell of 1e200 must not become the step of all
    usual = float(np.median(np.abs(levels[levels != 0.0])))
    steps = steps[(steps > 1e-9 * max(usual, 1e-30)) & (steps < 1e15 * max(usual, 1e-30))]
    if not len(steps):
        return 0.0
    least = float(np.percentile(steps, 1)) if len(steps) > 200 else float(np.min(steps))
    counts = steps / least
    # decimals written as doubles differ in the last digits only
    whole = np.abs(counts - np.round(counts)) < 0.02 * np.maximum(1.0, np.round(counts)) ** 0.5
    return least if np.mean(whole) > 0.97 else 0.0


def noise_of(values: Array) -> float | None:
    """Robust standard deviation of the sample-to-sample noise, from second differences; None for a short channel."""
    found = []
    for piece in _pieces(values, 32768):
        if len(piece) < 16:
            continue
        second = piece[1:-1] - 0.5 * (piece[:-2] + piece[2:])
        second = second[np.isfinite(second)]
        if len(second):
            found.append(1.4826 * float(np.median(np.abs(second))) / np.sqrt(1.5))
    return float(np.median(found)) if found else None


def clipped_ends(values: Array, unit: float) -> tuple[float, float]:
    """(low, high) ends of the sensor that plateaus at the very extreme show, infinite where none is seen.

    A plateau counts if the curve on both sides aims well beyond it, by multiples of `unit`, the step or the noise.
    """
    low, high = -np.inf, np.inf
    if not np.isfinite(values).any():
        return low, high
    for side, extreme in ((1, float(np.nanmax(values))), (-1, float(np.nanmin(values)))):
        at = np.flatnonzero(values == extreme)
        if not 2 <= len(at) <= 0.05 * len(values):
            continue
        groups = np.split(at, np.flatnonzero(np.diff(at) > 1) + 1)
        some = [group for group in groups[:200] if len(group) >= 2]
        cut_off = [len(group) for group in some if _cut_off(values, group, side, 6 * unit)]
        if len(cut_off) >= 2 or any(length >= 3 for length in cut_off):
            if side > 0:
                high = extreme
            else:
                low = extreme
    return low, high


def _cut_off(values: Array, group: NDArray[np.int64], side: int, least: float) -> bool:
    """Does the curve on both sides of a plateau aim well beyond it? A flown peak flattens on one side at least."""
    first, last = int(group[0]), int(group[-1])
    if first < 3 or last + 3 >= len(values):
        return False
    extreme = float(values[first])
    for near, middle, far in (values[first - 3 : first][::-1], values[last + 1 : last + 4]):
        slope, bend = near - middle, (near - middle) - (middle - far)
        # carried on by a parabola to the plateau's second sample
        if not side * (near + 2.0 * slope + 3.0 * bend - extreme) > least or not side * (extreme - near) > least / 2:
            return False
    return True
