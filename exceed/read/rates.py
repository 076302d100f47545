"""At which instants a channel was really sampled: blanks left out, sub-frames placed, held repeats recognised."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from exceed.core.recording import Array
from exceed.read.look import Column
from exceed.read.recognise import recognise
from exceed.read.units_in_text import split_unit

_NUMBER = re.compile(r"^(.*?)[\s_\-.]*[\[(]?(\d{1,3})[\])]?$")
_OFFSET = re.compile(r"^(.*?)\s*[@+_ ]\s*(0?\.\d+|0|0\.0+)\s*s?$")
_LETTER = re.compile(r"^(.*?[A-Za-z0-9])[\s_\-.]?([a-h])$")
# so many changes, all on one phase of the period, that chance would do it once in a million times
_LEAST_CHANGES = 8
_LEAST_BITS = 20.0
_HELD_AT_MOST = 64


def groups(columns: Sequence[Column], declared: Mapping[str, str]) -> list[Column]:
    """Mark sub-frame groups: `NZ1 .. NZ8`, `NZ_1`, `NZ(1)`, `NZ a .. NZ d`, `NZ@0.125`: one base, one unit.

    Numbers count from 0 or 1 without a hole, letters from a, offsets are even.
    """
    out = list(columns)
    for pattern in (_OFFSET, _NUMBER, _LETTER):
        bases: dict[tuple[str, str], list[tuple[str, Column]]] = {}
        for column in out:
            if (
                column.ignored
                or column.part >= 0
                or column.group
                or column.found_by == "channels file"
                or column.form == "stamp"
            ):
                continue
            if pattern is _NUMBER and not column.quantity:
                continue
            for name in (split_unit(column.name)[0], column.name):
                match = pattern.match(name.strip())
                if match and match.group(1).strip(" _-.@+"):
                    bases.setdefault((match.group(1).strip(" _-.@+").lower(), column.unit_text), []).append(
                        (match.group(2), column)
                    )
                    break
        for (base, _), named in bases.items():
            members = _in_order(pattern, named)
            if not members:
                continue
            lead = members[0].with_(group=tuple(column.index for column in members))
            if pattern is not _NUMBER:
                known = recognise(
                    lead.index,
                    base.upper() if len(base) < 4 else base,
                    lead.unit_text,
                    lead.source,
                    lead.sample,
                    declared,
                )
                if not known.quantity or known.problem:
                    continue
                lead = known.with_(name=lead.name, group=lead.group)
            elif any(column.quantity != lead.quantity or column.problem for column in members):
                continue
            out[lead.index] = lead
            for column in members[1:]:
                out[column.index] = out[column.index].with_(
                    part=lead.index,
                    quantity=lead.quantity,
                    unit=lead.unit,
                    units=lead.units,
                    problem="",
                    question="",
                    score=lead.score,
                    reason=lead.reason,
                    found_by=lead.found_by,
                )
    return out


def _in_order(pattern: re.Pattern[str], members: list[tuple[str, Column]]) -> list[Column]:
    """The members in order of time, or none if they are no whole group."""
    if pattern is _LETTER:
        members = sorted(members, key=lambda item: item[0])
        letters = "".join(letter for letter, _ in members)
        return [column for _, column in members] if len(letters) >= 3 and letters == "abcdefgh"[: len(letters)] else []
    numbered = sorted(((float(text), column) for text, column in members), key=lambda item: item[0])
    values = [number for number, _ in numbered]
    if len(values) < 2:
        return []
    if pattern is _NUMBER:
        whole = values[0] in (0.0, 1.0) and values == [values[0] + k for k in range(len(values))]
        return [column for _, column in numbered] if whole else []
    step = values[1] - values[0]
    even = values[0] == 0.0 and step > 0 and all(abs(value - k * step) < 0.02 * step for k, value in enumerate(values))
    return [column for _, column in numbered] if even and len(values) >= 2 and step < 1.0 else []


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
