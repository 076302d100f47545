"""What data settle."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from exceed.core.recording import Array
from exceed.core.units import UNITS
from exceed.read.raw import RawChannel
from exceed.read.look import Column


@dataclass(slots=True, eq=False)
class Settled:
    """A raw channel whose quantity, unit, sign and datum stand; or, with `problem`, do not."""

    raw: RawChannel
    quantity: str
    unit: str = ""
    scale: float = 1.0
    offset: float = 0.0
    sign: str | None = None
    datum: str | None = None
    found_by: str = ""
    reason: str = ""
    plausible: float = 1.0
    forced: bool = False
    problem: str = ""
    question: str = ""
    notes: list[str] = field(default_factory=list)


def is_open(column: Column) -> bool:
    return column.unit is None or bool(column.alternatives)


def settle(raws: Sequence[RawChannel], time: Array, declared: Mapping[str, str]) -> list[Settled]:
    out = []
    for raw in raws:
        column = raw.column
        one = Settled(raw, column.quantity or "", column.unit or "", found_by=column.found_by, reason=column.reason)
        if column.unit is None:
            one.problem = "no unit"
        else:
            one.scale, one.offset = UNITS[column.unit].factor, UNITS[column.unit].offset
        out.append(one)
    return out
