"""Where wheels met the ground: touch-and-goes, go-arounds and the instant of a touchdown."""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from exceed.core.recording import Recording
from exceed.derive.evidence import AIRSPEEDS

if TYPE_CHECKING:
    from exceed.derive.evidence import Signals, Thresholds

# common practice of the trade, no source
ON_RUNWAY = 4.0  # m above the runway's level: pressure height near the ground tells no better
LOW = 120.0  # m: an approach that came below and went away again is a go-around
WALKING = 5.0  # m/s over the ground: below, the aeroplane has stopped or turned off
FEWEST_SECONDS = 3.0  # of level rolling that make a touch where only height tells


def rolls_on(signals: Signals, limits: Thresholds | None, touched: float, left: float) -> bool:
    """Did the aeroplane keep rolling between a touchdown and the next lift-off (touch-and-go), or did it stop?"""
    inside = signals.coarse.part(touched, left)
    speed, least = signals.rolling, WALKING
    if (speed is None or not np.isfinite(speed[inside]).any()) and limits is not None:
        speed, least = signals.speed, 0.5 * limits.ground
    if speed is not None:
        there = speed[inside]
        there = there[np.isfinite(there)]
        if len(there):
            return bool(np.min(there) > least)
    return left - touched < 30.0


def touchdown_near(recording: Recording, when: float, within: float) -> float:
    """The jolt of the touchdown near an instant that speed and height gave; that instant where none stands out."""
    channel = recording.channels.get("load_factor")
    if channel is None or within <= 0.0 or channel.interval > 0.6:
        return when
    time = recording.channel_time(channel)
    low, high = np.searchsorted(time, [when - within, when + within])
    values = channel.values[low:high]
    good = np.isfinite(values)
    if good.sum() < 8:
        return when
    change = np.abs(values - np.median(values[good]))
    change[~good] = 0.0
    scatter = float(np.median(change[good]))
    place = int(np.argmax(change))
    if change[place] < max(0.15, 5.0 * scatter):
        return when
    # the jolt's first sample beyond half its height is nearest to the contact
    first = place
    while first > 0 and change[first - 1] > 0.5 * change[place]:
        first -= 1
    return float(time[low + first]) - 0.5 * channel.interval


def _low_stretches(signals: Signals, limits: Thresholds | None, start: float, end: float, below: float) -> list[slice]:
    """Stretches of cells inside a flight (not its ends) that came down near the field and went up again.

    The field is that of the take-off in the flight's first half, that of the landing in its second.
    """
    coarse = signals.coarse
    if signals.height is None or end - start < 120.0:
        return []
    cells = coarse.part(start, end)
    time, height = coarse.time[cells], signals.height[cells]
    ends = [coarse.median_near(signals.height, when, 3.0) for when in (start, end)]
    levels = np.where(time < 0.5 * (start + end), ends[0], ends[1])
    low = height <= levels + below
    edges = np.flatnonzero(np.diff(np.concatenate([[0], low.astype(np.int8), [0]]))).reshape(-1, 2)
    found = []
    for first, last in edges.tolist():
        if time[first] <= start + 20.0 or time[last - 1] >= end - 20.0:
            continue
        before, after = max(first - 1, 0), min(last, len(time) - 1)
        if not (np.isfinite(height[before]) and np.isfinite(height[after])):
            continue
        part = slice(cells.start + first, cells.start + last)
        if limits is not None and signals.speed is not None and signals.speed_name in AIRSPEEDS[:3]:
            speed = signals.speed[part]
            if np.isfinite(speed).any() and np.nanmin(speed) > 1.7 * limits.airborne:
                continue
        found.append(part)
    return found


def touches_between(signals: Signals, limits: Thresholds | None, start: float, end: float) -> list[float]:
    """Touch-and-goes that speed alone did not show: level rolling at the field's level inside a flight."""
    found = []
    time = signals.coarse.time
    for part in _low_stretches(signals, limits, start, end, ON_RUNWAY):
        assert signals.height is not None
        height, lasted = signals.height[part], time[part.stop - 1] - time[part.start]
        if lasted >= FEWEST_SECONDS and np.nanmax(height) - np.nanmin(height) <= 1.5 * ON_RUNWAY:
            found.append(touchdown_near(signals.coarse.recording, float(time[part.start]), 5.0))
    return found


def go_arounds(
    signals: Signals, limits: Thresholds | None, start: float, end: float, touchdowns: Sequence[float]
) -> list[float]:
    """Instants at which the aeroplane had come down near the field, and went away without touching."""
    time = signals.coarse.time
    found = []
    for part in _low_stretches(signals, limits, start, end, LOW):
        low, high = float(time[part.start]) - 5.0, float(time[part.stop - 1]) + 5.0
        assert signals.height is not None
        depth = float(np.nanmin(signals.height[part]))
        around = signals.height[max(part.start - 180, 0) : part.start], signals.height[part.stop : part.stop + 180]
        far = all(len(side) and np.isfinite(side).any() and np.nanmax(side) > depth + 0.75 * LOW for side in around)
        touched = bisect_left(touchdowns, low) < bisect_right(touchdowns, high)
        if far and not touched:
            found.append(float(time[part][np.nanargmin(signals.height[part])]))
    return found
