"""Excursions: where a sampled signal is beyond a level, and what a rule makes of such stretches.

Pure functions on arrays. A `Runs` is a set of stretches in order of time that do not overlap; unlike plain intervals a
stretch may hold a single instant (one sample between two gaps), and it remembers its samples and what cut it.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from exceed.core.intervals import Array

Index = NDArray[np.int64]
Mask = NDArray[np.bool_]

# what ended a stretch before the value came back: codes of CUTS
CUTS: tuple[str | None, ...] = (None, "gap", "condition", "recording_start", "recording_end")
CUT_GAP, CUT_CONDITION, CUT_START, CUT_END = 1, 2, 3, 4


@dataclass(frozen=True, slots=True, eq=False)
class Edges:
    """One side (beginnings or ends) of stretches: place of the sample beyond, instant of the crossing, what cut it."""

    place: Index
    time: Array
    cut: NDArray[np.int8]


@dataclass(frozen=True, slots=True, eq=False)
class Runs:
    """Stretches beyond a level: instants start/end (k,) s, first/last sample beyond (k,), cuts (k,) codes."""

    start: Array
    end: Array
    first: Index
    last: Index
    cut_start: NDArray[np.int8]
    cut_end: NDArray[np.int8]

    def __len__(self) -> int:
        return len(self.start)

    def pick(self, which: Mask | Index | slice) -> Runs:
        return Runs(
            self.start[which],
            self.end[which],
            self.first[which],
            self.last[which],
            self.cut_start[which],
            self.cut_end[which],
        )

    @property
    def duration(self) -> Array:
        return self.end - self.start


NO_RUNS = Runs(
    np.empty(0),
    np.empty(0),
    np.empty(0, np.int64),
    np.empty(0, np.int64),
    np.empty(0, np.int8),
    np.empty(0, np.int8),
)


def find_edges(
    time: Array,
    excess: Array,
    known: Mask,
    live: Mask,
    linked: Mask,
    core: slice,
    offset: int,
    whole: int,
    crossing: bool = True,
) -> tuple[Edges, Edges]:
    """Beginnings and ends of the stretches with excess > 0, for samples of `core`.

    Parameters
    ----------
    time, excess : (n,) instants and signed distance beyond the level, of a block with its neighbours.
    known : (n,) the value and its limit are known. live : (n,) known and the rule's conditions hold.
    linked : (n - 1,) no gap between a sample and the next.
    core : the block's own samples within the arrays. offset : place of element 0. whole : samples of the whole grid.
    crossing : interpolate the instant; False dates a stretch by its samples (states do not pass through values).

    Returns
    -------
    (Edges, Edges). Beginnings and ends of consecutive blocks, put one after the other, pair up one to one.
    """
    beyond = live & (excess > 0.0)
    n = len(time)
    joined = np.zeros(n + 1, dtype=bool)  # joined[i]: sample i goes on from sample i - 1
    joined[1:n] = linked & beyond[1:] & beyond[:-1]
    begins = np.flatnonzero(beyond[core] & ~joined[core.start : core.stop]) + core.start
    ends = np.flatnonzero(beyond[core] & ~joined[core.start + 1 : core.stop + 1]) + core.start
    return (
        _edges(time, excess, known, live, linked, begins, -1, offset, whole, crossing),
        _edges(time, excess, known, live, linked, ends, +1, offset, whole, crossing),
    )


def _edges(
    time: Array,
    excess: Array,
    known: Mask,
    live: Mask,
    linked: Mask,
    at: Index,
    step: int,
    offset: int,
    whole: int,
    crossing: bool,
) -> Edges:
    neighbour = at + step
    n = len(time)
    there = (neighbour >= 0) & (neighbour < n)
    safe = np.clip(neighbour, 0, n - 1)
    link = np.zeros(len(at), dtype=bool)
    link[there] = linked[np.minimum(at, safe)[there]]
    cut = np.zeros(len(at), dtype=np.int8)
    cut[~link | ~known[safe]] = CUT_GAP
    cut[link & known[safe] & ~live[safe]] = CUT_CONDITION
    outermost = (at + offset == 0) if step < 0 else (at + offset == whole - 1)
    cut[outermost] = CUT_START if step < 0 else CUT_END
    when = time[at].copy()
    if crossing:
        other = excess[safe]
        meets = link & live[safe] & np.isfinite(other) & np.isfinite(excess[at])
        rise = np.where(meets, excess[at] - other, 1.0)
        share = np.where(meets & (rise > 0.0), excess[at] / np.where(rise > 0.0, rise, 1.0), 0.0)
        when = when + share * (time[safe] - time[at])
    elif step > 0:
        # a state holds until the next sample says otherwise
        holds = link & live[safe]
        when = np.where(holds, time[safe], when)
    return Edges(at + offset, when, cut)


def pair(begins: list[Edges], ends: list[Edges]) -> Runs:
    """Beginnings and ends of all blocks in order -> stretches."""
    if not begins:
        return NO_RUNS
    first = np.concatenate([edge.place for edge in begins])
    if len(first) == 0:
        return NO_RUNS
    return Runs(
        np.concatenate([edge.time for edge in begins]),
        np.concatenate([edge.time for edge in ends]),
        first.astype(np.int64),
        np.concatenate([edge.place for edge in ends]).astype(np.int64),
        np.concatenate([edge.cut for edge in begins]),
        np.concatenate([edge.cut for edge in ends]),
    )


def merge(runs: Runs, together: Mask) -> Runs:
    """Stretches i and i + 1 become one where together[i]. together : (k - 1,) bool."""
    if len(runs) < 2 or not together.any():
        return runs
    opens = np.concatenate([[True], ~together])
    closes = np.concatenate([~together, [True]])
    return Runs(
        runs.start[opens],
        runs.end[closes],
        runs.first[opens],
        runs.last[closes],
        runs.cut_start[opens],
        runs.cut_end[closes],
    )


def released(runs: Runs, band: Runs, breaks: Index) -> Runs:
    """A next stretch begins only after the value came back inside by the release: within one run of `band` all is one.

    `band` are the stretches beyond the level moved inwards by the release, so each of `runs` lies in one of them. A
    break (see `joined`), the end of a flight above all, lets the next one begin as well.
    """
    if len(runs) < 2 or len(band) == 0:
        return runs
    home = np.searchsorted(band.first, runs.first, side="right") - 1
    return merge(runs, (home[1:] == home[:-1]) & _unbroken(runs, breaks))


def joined(runs: Runs, gap: float, breaks: Index) -> Runs:
    """Stretches parted by less than `gap` s become one, never across a break.

    breaks : ascending places i such that something parts sample i from sample i - 1 (gap, condition, flight boundary).
    """
    if len(runs) < 2 or gap <= 0.0:
        return runs
    close = runs.start[1:] - runs.end[:-1] < gap
    return merge(runs, close & _unbroken(runs, breaks))


def _unbroken(runs: Runs, breaks: Index) -> Mask:
    """(k - 1,) no break between a stretch and the next."""
    after = np.searchsorted(breaks, runs.first[1:], side="right")
    before = np.searchsorted(breaks, runs.last[:-1], side="right")
    return np.asarray(after == before)


def enough_in_window(start: Array, flight: Index, window: float | None, least: int) -> list[Index]:
    """Groups of stretches of which `least` begin within `window` s (None: in one flight), wherever the window lies.

    Windows that share a stretch make one group.
    """
    groups: list[Index] = []
    for number in np.unique(flight):
        members = np.flatnonzero(flight == number)
        if window is None:
            groups += [members] if len(members) >= least else []
            continue
        begins = start[members]
        full = [
            (first, int(np.searchsorted(begins, begins[first] + window, side="right"))) for first in range(len(members))
        ]
        groups += _merged([(a, b) for a, b in full if b - a >= least], members)
    return groups


def much_in_window(start: Array, end: Array, flight: Index, window: float | None, most: float) -> list[Index]:
    """Groups of stretches whose time within some `window` s (None: within one flight) adds up to more than `most` s."""
    groups: list[Index] = []
    for number in np.unique(flight):
        members = np.flatnonzero(flight == number)
        begins, ends = start[members], end[members]
        if window is None:
            groups += [members] if float(np.sum(ends - begins)) > most else []
            continue
        full = []
        for last in range(len(members)):
            first = int(np.searchsorted(ends, ends[last] - window, side="right"))
            if used_up(begins[first : last + 1], ends[first : last + 1], most, window) is not None:
                full.append((first, last + 1))
        groups += _merged(full, members)
    return groups


def _merged(spans: list[tuple[int, int]], members: Index) -> list[Index]:
    """Index ranges [first, stop) that overlap become one."""
    joined_: list[list[int]] = []
    for first, stop in spans:
        if joined_ and first < joined_[-1][1]:
            joined_[-1][1] = max(stop, joined_[-1][1])
        else:
            joined_.append([first, stop])
    return [members[first:stop] for first, stop in joined_]


def used_up(start: Array, end: Array, allowance: float, window: float | None) -> int | None:
    """Which stretch (in order) first makes the accumulated time exceed an allowance; None where none does.

    window : s, sliding: at each instant only the time within the last `window` s counts; None: all of it.
    """
    spent = 0.0
    for index in range(len(start)):
        if window is None:
            spent += float(end[index] - start[index])
            if spent > allowance:
                return index
            continue
        # the fullest window ends with a stretch's end, or where an earlier stretch slides out: at an end is enough,
        # since time within the window only grows while a stretch lasts (or stays, when as much slides out)
        since = float(end[index]) - window
        inside = np.minimum(end[: index + 1], end[index]) - np.maximum(start[: index + 1], since)
        if float(np.sum(np.maximum(inside, 0.0))) > allowance:
            return index
    return None
