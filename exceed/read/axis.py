"""Raw clock readings -> one strictly ascending axis in seconds: roll-over, resets, doubled and coarse stamps."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from exceed.core.recording import Array

SEAM_LEAST = 60.0
DAY_S = 86400.0
# a forward step this much longer than usual, answered by a step back, is one wrong stamp
_MOST_REPAIRS = 20_000


@dataclass(slots=True)
class Axis:
    """time : (n,) seconds from the first row kept. rows : (n,) places of these rows in the file, None if all were kept.

    `origin` is the first row's reading in seconds; `doubled` places in the file of rows whose stamp came before.
    """

    time: Array
    rows: NDArray[np.int64] | None
    origin: float
    resets: int = 0
    seams: tuple[tuple[float, float], ...] = ()
    doubled: NDArray[np.int64] = field(default_factory=lambda: np.empty(0, np.int64))
    without: int = 0
    astray: int = 0
    notes: list[str] = field(default_factory=list)


def build(readings: Array, *, kind: str, slowest: int = 1, origin: float = 0.0, resolution: float = 0.0) -> Axis:
    """Readings in seconds, NaN where a row has none, in the order of the file -> the axis.

    Parameters
    ----------
    readings : (n,) s, from any origin; changed in place where it spares a copy
    kind : the clock's kind; only a time of day rolls over at midnight
    slowest : rows between the samples of the slowest channel, for the length of a seam
    origin : s, added to `Axis.origin`
    resolution : s, smallest step of the stamps where it is known

    Returns
    -------
    Axis. A row without a time is left out; so is one whose stamp stands alone against its neighbours.
    """
    count = len(readings)
    rows: NDArray[np.int64] | None = None
    notes: list[str] = []
    without = astray = 0
    steps = np.diff(readings)
    if not bool(np.all(steps > 0)):  # NaN fails too
        finite = np.isfinite(readings)
        if not finite.all():
            rows = np.flatnonzero(finite)
            without = count - len(rows)
            readings = readings[rows]
        if kind == "time_of_day":
            readings, rolled = _rolled(readings)
            if rolled:
                notes.append(f"the clock passed midnight {rolled} time{'s' * (rolled != 1)}")
        wrong = _astray(readings)
        if len(wrong):
            astray = len(wrong)
            keep = np.ones(len(readings), bool)
            keep[wrong] = False
            rows = np.flatnonzero(keep) if rows is None else rows[keep]
            readings = readings[keep]
            notes.append(
                f"{astray} row{'s' * (astray != 1)} with a stamp out of order {'are' if astray != 1 else 'is'} left out"
            )
        steps = np.diff(readings)
    if len(readings) == 0:
        return Axis(
            np.empty(0), rows if rows is not None else np.empty(0, np.int64), origin, without=without, notes=notes
        )
    doubled = np.empty(0, np.int64)
    seams: tuple[tuple[float, float], ...] = ()
    resets = 0
    if len(steps) and not bool(np.all(steps > 0)):
        if kind == "frame":
            readings, wrapped = _unwrapped(readings, steps)
            steps = np.diff(readings)
            if wrapped:
                notes.append(f"the counter ran over {wrapped} time{'s' * (wrapped != 1)}")
        same = steps == 0
        if np.count_nonzero(same) > 0.3 * len(steps):
            readings, said = _spread(readings)
            notes.append(said)
            steps = np.diff(readings)
        elif same.any():
            again = _repeated(readings)
            doubled = again if rows is None else rows[again]
            keep = np.ones(len(readings), bool)
            keep[again] = False
            rows = np.flatnonzero(keep) if rows is None else rows[keep]
            readings = readings[keep]
            steps = np.diff(readings)
        back = np.flatnonzero(steps <= 0)
        if len(back):
            readings, seams = _parted(readings, steps, back, slowest)
            resets = len(back)
            notes.append(
                f"the clock was set back {resets} time{'s' * (resets != 1)}: each stretch stands after the one "
                f"before, "
                "the time between them is not known"
            )
    first = float(readings[0])
    time = readings if first == 0.0 else readings - first
    if seams:
        seams = tuple((start - first, end - first) for start, end in seams)
    return Axis(time, rows, origin + first, resets, seams, doubled, without, astray, notes)


def _rolled(readings: Array) -> tuple[Array, int]:
    """Time of day: a fall of more than twelve hours is midnight."""
    falls = np.diff(readings) < -DAY_S / 2
    days = int(np.count_nonzero(falls))
    if not days:
        return readings, 0
    rise = np.diff(readings) > DAY_S / 2
    # a wrong stamp falls and rises again: count both ways
    return readings + DAY_S * np.concatenate(
        [[0], np.cumsum(falls.astype(np.int64) - rise.astype(np.int64))]
    ), days - int(rise.sum())


def _astray(readings: Array) -> NDArray[np.int64]:
    """Rows whose stamp disagrees with both neighbours, which agree with each other."""
    steps = np.diff(readings)
    back = np.flatnonzero(steps < 0)
    if len(back) == 0 or len(back) > _MOST_REPAIRS:
        return np.empty(0, np.int64)
    positive = steps[steps > 0]
    usual = float(np.median(positive)) if len(positive) else 1.0
    wrong = []
    last = len(readings) - 1
    for at in back.tolist():
        # at+1 fell below: is row `at` too high, or row `at+1` too low?
        before = readings[at - 1] if at > 0 else -np.inf
        after = readings[at + 2] if at + 2 <= last else np.inf
        if at > 0 and before <= readings[at + 1] <= before + 10 * usual and readings[at] - before > 2.5 * usual:
            wrong.append(at)
        elif (
            at + 2 <= last
            and readings[at] <= after <= readings[at] + 10 * usual
            and after - readings[at + 1] > 2.5 * usual
        ):
            wrong.append(at + 1)
    return np.unique(np.array(wrong, dtype=np.int64))


def _repeated(readings: Array) -> NDArray[np.int64]:
    """Places whose reading equals the one before."""
    return np.flatnonzero(np.diff(readings) == 0) + 1


def _unwrapped(readings: Array, steps: Array) -> tuple[Array, int]:
    """A counter that runs over at its full size goes on; any other fall is a reset and stays.

    It ran over if it fell from near its top to near its bottom, with the same top each time, a round one.
    """
    back = np.flatnonzero(steps < 0)
    positive = steps[steps > 0]
    if len(back) == 0 or len(positive) == 0:
        return readings, 0
    usual = float(np.median(positive))
    size = round((float(readings[back].max()) - float(readings.min())) / usual) + 1
    power_of_two = size & (size - 1) == 0
    power_of_ten = str(size).rstrip("0") == "1"
    if size < 4 or not (power_of_two or power_of_ten) or np.any(-steps[back] < (size - 4) * usual):
        return readings, 0
    jumps = np.zeros(len(readings))
    jumps[back + 1] = size * usual
    return readings + np.cumsum(jumps), len(back)


def _spread(readings: Array) -> tuple[Array, str]:
    """Stamps coarser than the rows: the rows that share one are spread evenly up to the next.

    The usual number of rows a stamp gives the interval. A first group that is short stood at the end of its stamp.
    """
    opens = np.concatenate([[0], np.flatnonzero(np.diff(readings) != 0) + 1])
    sizes = np.diff(np.concatenate([opens, [len(readings)]]))
    stamps = readings[opens]
    steps = np.diff(stamps)
    forward = steps[steps > 0]
    step = float(np.median(forward)) if len(forward) else 1.0
    inner = sizes[1:-1] if len(sizes) > 2 else sizes
    usual = float(np.median(inner))
    mean = float(np.mean(inner[inner <= 2 * usual])) if len(inner) else usual
    # where group sizes alternate (16 rows a second under tenths) the mean tells the rate, else the median
    per = mean if usual < 4 and abs(mean - usual) > 0.05 else usual
    interval = step / per
    width = np.full(len(sizes), step)
    width[:-1] = np.where((steps > 0) & (steps < 1.5 * step), steps, step)
    group = np.repeat(np.arange(len(sizes)), sizes)
    place = np.arange(len(readings)) - opens[group]
    spacing = np.where(sizes < per, np.minimum(interval, width / np.maximum(sizes, 1)), width / sizes)
    # a last group that is cut short keeps the usual interval
    if sizes[-1] < per:
        spacing[-1] = interval
    out = stamps[group] + place * spacing[group]
    if sizes[0] < usual:
        out[: sizes[0]] = stamps[0] + step - (sizes[0] - np.arange(sizes[0])) * interval
    return out, f"stamps are coarser than the rows: about {per:.3g} rows share one and are spread evenly over it"


def _parted(
    readings: Array, steps: Array, back: NDArray[np.int64], slowest: int
) -> tuple[Array, tuple[tuple[float, float], ...]]:
    """Each stretch after a reset is placed behind the one before, a seam between them."""
    positive = steps[steps > 0]
    usual = float(np.median(positive)) if len(positive) else 1.0
    seam = max(SEAM_LEAST, 10.0 * usual * max(1, slowest))
    jumps = np.zeros(len(readings))
    jumps[back + 1] = -steps[back] + seam
    moved = readings + np.cumsum(jumps)
    return moved, tuple((float(moved[at]), float(moved[at + 1])) for at in back.tolist())
