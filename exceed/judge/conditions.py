"""When a rule looks: conditions with three answers (holds, does not hold, not known), sample by sample."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from exceed.core.phases import AIRBORNE, PHASE_CODE
from exceed.core.quantities import QUANTITIES
from exceed.core.trace import Trace
from exceed.judge.compiled import Condition

if TYPE_CHECKING:
    from exceed.documents.aircraft import Aircraft
    from exceed.judge.block import Block

Mask = NDArray[np.bool_]


def all_of(conditions: list[Condition]) -> Condition | None:
    """Every one must hold: not known where one is not known and none is known not to hold."""
    if not conditions:
        return None
    if len(conditions) == 1:
        return conditions[0]

    def of(block: Block) -> tuple[Mask, Mask]:
        answers = [condition.of(block) for condition in conditions]
        holds = np.ones(len(block), dtype=bool)
        known = np.ones(len(block), dtype=bool)
        refuted = np.zeros(len(block), dtype=bool)
        for one_holds, one_known in answers:
            holds &= one_holds & one_known
            known &= one_known
            refuted |= one_known & ~one_holds
        return holds, known | refuted

    names: frozenset[str] = frozenset().union(*(condition.names for condition in conditions))
    return Condition(names, of, any(condition.uses_flights for condition in conditions))


def any_of(conditions: list[Condition]) -> Condition:
    """One is enough: not known where none is known to hold and one is not known."""

    def of(block: Block) -> tuple[Mask, Mask]:
        holds = np.zeros(len(block), dtype=bool)
        known = np.ones(len(block), dtype=bool)
        for condition in conditions:
            one_holds, one_known = condition.of(block)
            holds |= one_holds & one_known
            known &= one_known
        return holds, known | holds

    names: frozenset[str] = frozenset().union(*(condition.names for condition in conditions))
    return Condition(names, of, any(condition.uses_flights for condition in conditions))


def compile_condition(condition: Any, trace: Trace, aircraft: Aircraft | None) -> Condition:
    """One condition of the rules document. A quantity that cannot be had makes it not known throughout."""
    if condition.any:
        return any_of([compile_condition(one, trace, aircraft) for one in condition.any])
    if condition.phase:
        return _phase(condition.phase)
    name = condition.quantity
    if name == "gear_down" and aircraft is not None and aircraft.gear == "fixed":
        return _state(condition.state_value == 1)
    if name == "flap_angle" and aircraft is not None and aircraft.flaps == "none":
        return _compare(condition, lambda block: np.zeros(len(block)), frozenset(), sided=False)
    if not trace.has(name):
        return Condition(frozenset(), _never_known)
    row = QUANTITIES.get(name)
    sided = row is not None and row.sided
    if row is not None and row.momentary:
        # none at this moment is no gust, no touchdown: the condition is known not to hold
        return _at_moments(_compare(condition, lambda block: block.values[name], frozenset({name}), sided))
    if condition.rate:
        return _compare(condition, lambda block: block.rate(name), frozenset({name}), sided)
    return _compare(condition, lambda block: block.values[name], frozenset({name}), sided)


def _never_known(block: Block) -> tuple[Mask, Mask]:
    return np.zeros(len(block), dtype=bool), np.zeros(len(block), dtype=bool)


def _at_moments(condition: Condition) -> Condition:
    def of(block: Block) -> tuple[Mask, Mask]:
        holds, known = condition.of(block)
        return holds & known, np.ones(len(block), dtype=bool)

    return Condition(condition.names, of)


def _state(holds: bool) -> Condition:
    return Condition(
        frozenset(), lambda block: (np.full(len(block), holds, dtype=bool), np.ones(len(block), dtype=bool))
    )


def _phase(words: tuple[str, ...]) -> Condition:
    codes = np.array([PHASE_CODE[word] for word in words if word != AIRBORNE], dtype=np.int8)
    airborne = AIRBORNE in words
    unknown = PHASE_CODE["unknown"]

    def of(block: Block) -> tuple[Mask, Mask]:
        if airborne and len(codes) == 0:
            return block.airborne, np.ones(len(block), dtype=bool)
        phase = block.phase
        holds = np.isin(phase, codes)
        known = np.ones(len(block), dtype=bool) if unknown in codes else phase != unknown
        if airborne:
            holds = holds | block.airborne
            known = known | holds
        return holds, known

    return Condition(frozenset(), of, uses_flights=True)


def _compare(condition: Any, values: Any, names: frozenset[str], sided: bool) -> Condition:
    low = condition.above if condition.within is None else condition.within[0]
    high = condition.below if condition.within is None else condition.within[1]
    closed = condition.within is not None
    # a limit on one side of a sided quantity means both sides, unless it is itself signed to the left
    magnitude = sided and all(bound is None or float(bound) >= 0.0 for bound in (low, high))

    def of(block: Block) -> tuple[Mask, Mask]:
        value = values(block)
        known = np.isfinite(value)
        if magnitude:
            value = np.abs(value)
        holds = known.copy()
        if condition.state is not None:
            return known & (value == condition.state_value), known
        if low is not None:
            holds &= value >= float(low) if closed else value > float(low)
        if high is not None:
            holds &= value <= float(high) if closed else value < float(high)
        return holds, known

    return Condition(names, of)
