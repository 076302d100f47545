"""At which instants a channel was really sampled: blanks left out, sub-frames placed, held repeats recognised."""

from __future__ import annotations

import re
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from exceed.core.recording import Array
from exceed.read.look import Column

_SUFFIX = re.compile(r"^(.*?)[\s_\-.]*[\[(]?(\d{1,3})[\])]?$")
# so many changes, all on one phase of the period, that chance would do it once in a million times
_LEAST_CHANGES = 8
_LEAST_BITS = 20.0
_HELD_AT_MOST = 64


def groups(columns: Sequence[Column]) -> list[Column]:
    """Mark sub-frame groups: `NZ1 .. NZ8`, `NZ_1`, `NZ(1)`: one base, counted from 0 or 1 without a hole, in this order."""
    from exceed.read.units_in_text import split_unit

    bases: dict[tuple[str, str], list[tuple[int, Column]]] = {}
    for column in columns:
        if not column.quantity or column.problem or column.ignored or column.part >= 0:
            continue
        name = split_unit(column.name)[0]
        match = _SUFFIX.match(name) or _SUFFIX.match(column.name)
        if match and match.group(1).strip():
            bases.setdefault((match.group(1).strip().lower(), column.quantity), []).append(
                (int(match.group(2)), column)
            )
    out = list(columns)
    for members in bases.values():
        members.sort(key=lambda item: item[0])
        numbers = [number for number, _ in members]
        if (
            len(members) < 2
            or numbers[0] not in (0, 1)
            or numbers != list(range(numbers[0], numbers[0] + len(numbers)))
        ):
            continue
        places = tuple(column.index for _, column in members)
        lead = places[0]
        out[lead] = out[lead].with_(group=places)
        for place in places[1:]:
            out[place] = out[place].with_(part=lead)
    return out


def held(values: Array) -> tuple[int, int] | None:
    """(every, phase) if a dense column repeats each value a fixed number of times, else None.

    The pattern must be clear: changes fall on one phase of a period of 2 to 64 rows and nowhere else (bar one row in
    a hundred, where rows were lost), and often enough that a steady value cannot look the same.
    """
    count = len(values)
    if count < 8 * _LEAST_CHANGES:
        return None
    block = values[: 1 << 16]
    # most columns change at neighbouring rows: that settles it at once
    changed = np.flatnonzero(block[1:] != block[:-1]) + 1
    if len(changed) < _LEAST_CHANGES or len(changed) > 0.6 * len(block):
        return None
    spacing = np.diff(changed)
    if np.count_nonzero(spacing == 1) > 0.02 * len(spacing):
        return None
    every = 0
    for period in range(_HELD_AT_MOST, 1, -1):
        if np.mean(spacing % period == 0) > 0.97:
            every = period
            break
    if not every or len(spacing) * np.log2(every) < _LEAST_BITS:
        return None
    phases = np.bincount(changed % every, minlength=every)
    phase = int(np.argmax(phases))
    if phases[phase] < 0.97 * len(changed):
        return None
    if count > len(block):
        rest = np.flatnonzero(values[1:] != values[:-1]) + 1
        if np.mean(rest % every == phase) < 0.9:
            return None
    return every, phase


def held_rows(values: Array, every: int, phase: int) -> NDArray[np.int64]:
    """Rows at which a held column took a new sample: its phase, and wherever it changed off it."""
    regular = np.zeros(len(values), bool)
    regular[phase::every] = True
    regular[0] = True
    regular[1:] |= values[1:] != values[:-1]
    return np.flatnonzero(regular)
