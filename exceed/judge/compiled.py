"""A rule made ready: names of the quantities it needs and small functions from a block's values to arrays.

`limits.compile_rule` makes these from a rule document and an aeroplane's facts; scan, events and engine know nothing of
either.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from exceed.core.findings import CERTAINTIES, SEVERITIES, Task
from exceed.core.intervals import Array
from exceed.core.quantities import Quantity

if TYPE_CHECKING:
    from exceed.judge.block import Block

Mask = NDArray[np.bool_]

# per-cent levels collapse onto the limit where the limit in force is smaller than this (SI): 0.2 g, 5 kt
COLLAPSE = {"load factor": 0.2, "speed": 5.0 * 1852.0 / 3600.0}
# two readings that print alike are no excursion: rounding of unit factors stays below this share
ROUNDING = 1e-9


@dataclass(frozen=True, slots=True)
class Series:
    """A value along a block: `names` are the quantities it needs, `of` gives (n,) values or one for all."""

    names: frozenset[str]
    of: Callable[[Block], Array | float]


@dataclass(frozen=True, slots=True)
class LevelSpec:
    """One severity level: `kind` share (of the limit), at (a value), beyond (the limit and so much further)."""

    severity: str
    kind: str
    value: float
    lasting: float = 0.0


@dataclass(frozen=True, slots=True)
class Allowance:
    """Time above the limit and up to `share` of it (or up to a value, where not `of_limit`) that is allowed.

    within : event, flight or window (of `window` s, sliding).
    """

    share: float
    seconds: float
    within: str
    window: float | None = None
    of_limit: bool = True


@dataclass(frozen=True, slots=True)
class TaskSpec:
    """The inspection a rule asks for, and from which severity and certainty on."""

    text: str
    ata: str | None = None
    before: str | None = None
    severity: str = "caution"
    certainty: str = "possible"

    def of(self, steps: Sequence[tuple[str, str]]) -> Task:
        """What an event asks for that reached these levels, (severity, certainty): one that suffices is enough.

        A limit surely passed asks for its inspection though a higher level may only have been passed.
        """
        words = [
            certainty for severity, certainty in steps if SEVERITIES.index(severity) >= SEVERITIES.index(self.severity)
        ]
        surest = max(words, key=CERTAINTIES.index, default="doubtful")
        wanted = bool(words) and CERTAINTIES.index(surest) >= CERTAINTIES.index(self.certainty)
        return Task(self.text, self.ata, self.before, wanted, self.severity)


@dataclass(frozen=True, slots=True)
class Condition:
    """When a rule looks: `of` gives (holds, known) masks (n,)."""

    names: frozenset[str]
    of: Callable[[Block], tuple[Mask, Mask]]
    uses_flights: bool = False


@dataclass(frozen=True, slots=True)
class Compiled:
    """Everything the engine needs of a rule."""

    id: str
    title: str
    set_name: str
    quantity: Quantity  # of the judged value
    judged: str  # the trace's name of it (rate_of:X for a rate)
    side: int  # +1 above, -1 below
    side_word: str  # above, below, is
    value: Series
    limit: Series | None
    levels: tuple[LevelSpec, ...]  # lowest first
    condition: Condition | None
    grid_names: tuple[str, ...]
    names: frozenset[str]
    limit_source: str = ""
    limit_assumed: bool = False
    last_flaps: float | None = None  # largest setting that the limit has a row for, rad
    lasting: float = 0.0
    joining: float = 0.0
    release: float = 0.0
    release_share: float | None = None
    allowed: tuple[Allowance, ...] = ()
    count: tuple[int, str, float | None] | None = None
    total: tuple[float, str, float | None] | None = None
    must_see: float | None = None
    judge_on: str = "estimate"
    magnitude: bool = False
    discrete: bool = False
    cap: str | None = None
    task: TaskSpec | None = None
    notes: tuple[str, ...] = ()
    unassessed: str | None = None  # the whole recording cannot be assessed, and why
    not_applicable: str | None = None  # nothing to assess, and why

    @property
    def decision(self) -> int:
        """Which level says that the limit is passed: the lowest from caution up, else the lowest there is."""
        for index, level in enumerate(self.levels):
            if level.severity != "advisory":
                return index
        return 0

    @property
    def allowance_levels(self) -> tuple[LevelSpec, ...]:
        """The lines that allowances count between, lowest first: the limit itself, then each `up_to`."""
        if not self.allowed:
            return ()
        steps = sorted(self.allowed, key=lambda step: step.share)
        lines = [LevelSpec("", "share" if step.of_limit else "at", step.share) for step in steps]
        return (LevelSpec("", "share", 1.0), *lines)

    def threshold(self, level: LevelSpec, limit: Array | float) -> Array | float:
        """The value of a level where the limit in force is `limit`."""
        if level.kind == "at":
            return level.value if np.ndim(limit) == 0 else np.full(np.shape(limit), level.value)
        if level.kind == "beyond":
            return limit + self.side * level.value
        scaled = limit * level.value
        # a sink rate of 300 ft/min is below 5 kt and no small one
        airspeed = self.quantity.kind != "speed" or self.quantity.shown == "kt"
        small = COLLAPSE.get(self.quantity.kind, 0.0) if airspeed else 0.0
        if small:
            return (
                np.where(np.abs(limit) < small, limit, scaled)
                if np.ndim(limit)
                else (limit if abs(float(limit)) < small else scaled)
            )
        return scaled

    def excess(self, value: Array, threshold: Array | float) -> Array:
        """How far the value is beyond a threshold; not positive where they agree but for rounding."""
        gap = self.side * (value - threshold)
        slack = ROUNDING * np.maximum(1.0, np.abs(threshold))
        result: Array = np.where(gap > slack, gap, np.minimum(gap, 0.0)) if np.any(gap > 0.0) else gap
        return result
