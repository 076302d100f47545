"""A rule of the rules document, for one trace and one aeroplane -> rules made ready to scan."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np

from exceed.core.quantities import Quantity
from exceed.core.trace import Trace
from exceed.core.units import UNITS
from exceed.documents.limits import FactLimit
from exceed.documents.rules import RATES, Rule, find
from exceed.judge.compiled import Allowance, Compiled, LevelSpec, Series, TaskSpec
from exceed.judge.conditions import all_of, compile_condition
from exceed.judge.limits import FoundLimit, find_limit, why_missing
from exceed.judge.stalls import MARGINS

if TYPE_CHECKING:
    from collections.abc import Mapping

    from exceed.documents.aircraft import Aircraft
    from exceed.judge.block import Block

# shown unit of the rate of a kind of quantity
RATE_UNITS = {
    "load factor rate": "g/s",
    "angular rate": "deg/s",
    "angular acceleration": "deg/s2",
    "speed": "ft/min",
    "mass flow": "kg/h",
    "volume flow": "L/h",
}
SIDES = {"above": 1, "below": -1, "is": 1}


def compile_rule(
    rule: Rule, trace: Trace, aircraft: Aircraft | None, set_name: str, declared: Mapping[str, str]
) -> list[Compiled]:
    """One for each side with levels and each index of the quantity (engine 1, engine 2, ...).

    Where it cannot be assessed there is one that says why: `not_applicable` (a fact is missing) or `unassessed` (a
    channel is). declared : names of quantities that rule files declare -> unit.
    """
    limit = find_limit(rule.limit, trace, aircraft) if rule.limit is not None else FoundLimit()
    name = rule.quantity
    if name == "airspeed":
        name = limit.airspeed or rule.airspeed or "indicated_airspeed"
    names = rule.channels([*trace.steps]) if rule.quantity != "airspeed" else ((name,) if trace.has(name) else ())
    row = find(name, declared)
    if row is None:
        return [_empty(rule, set_name, _unknown(name), unassessed=f"quantity '{name}' is not known")]
    if limit.missing is not None:
        return [_empty(rule, set_name, row, limit, not_applicable=limit.missing)]
    if isinstance(rule.limit, FactLimit) and aircraft is not None:
        fact = rule.look_up(aircraft)
        if fact is not None and fact.value is None:
            return [_empty(rule, set_name, row, limit, not_applicable=fact.missing)]
    none = _has_none(name, aircraft)
    if none is not None:
        return [_empty(rule, set_name, row, limit, not_applicable=none)]
    if not names:
        return [_empty(rule, set_name, row, limit, unassessed=why_missing(trace, name))]
    if limit.unassessed is not None:
        return [_empty(rule, set_name, row, limit, unassessed=limit.unassessed)]
    span = _only_a_range(trace, names[0], row)
    if span is not None:
        return [_empty(rule, set_name, row, limit, unassessed=span)]
    never = _never(rule, trace, aircraft)
    if never is not None:
        return [_empty(rule, set_name, row, limit, **never)]
    return [
        _ready(rule, one, side, trace, aircraft, set_name, replace(row, name=one), limit)
        for one in names
        for side in rule.sides
    ]


def _only_a_range(trace: Trace, name: str, row: Quantity) -> str | None:
    """Why a mass that is itself only known as a range cannot be judged: its ends are what is assumed of it."""
    open_ = [one for one in trace.spans if one in trace.closure([name])]
    if row.kind != "mass" or not open_:
        return None
    low, high = trace.spans[open_[0]]
    return f"{open_[0].replace('_', ' ')} not known: only the range from {low:.0f} to {high:.0f} kg"


def _converted(rule: Rule, trace: Trace, name: str) -> str | None:
    """What to say where a limit's kind of airspeed is not the recorded one."""
    if rule.quantity != "airspeed" or name in trace.recording.channels:
        return None
    return f"{name.replace('_', ' ')} not recorded: converted by {trace.steps[name].method}"


def _has_none(name: str, aircraft: Aircraft | None) -> str | None:
    """Why there is nothing to judge about a gear that is fixed, or flaps that are not there."""
    if aircraft is not None and name in ("gear_down", "gear_moving") and aircraft.gear == "fixed":
        return "the gear is fixed"
    if aircraft is not None and name == "flap_angle" and aircraft.flaps == "none":
        return "the aeroplane has no flaps"
    return None


def _never(rule: Rule, trace: Trace, aircraft: Aircraft | None) -> dict[str, str] | None:
    """Why a condition can never be told (unassessed) or never hold (not applicable); None where it can."""
    for condition in rule.when:
        name = condition.quantity
        if name is None or condition.any:
            continue
        fixed = name == "gear_down" and aircraft is not None and aircraft.gear == "fixed"
        none = name == "flap_angle" and aircraft is not None and aircraft.flaps == "none"
        if fixed and condition.state_value == 0:
            return {"not_applicable": "the gear is fixed"}
        if none and (condition.above is not None or condition.within is not None):
            return {"not_applicable": "the aeroplane has no flaps"}
        if not fixed and not none and not trace.has(name):
            return {"unassessed": why_missing(trace, name)}
    return None


def _ready(
    rule: Rule,
    name: str,
    side: str,
    trace: Trace,
    aircraft: Aircraft | None,
    set_name: str,
    row: Quantity,
    limit: FoundLimit,
) -> Compiled:
    judged = name
    magnitude = row.sided and not rule.rate and side != "is"
    if rule.rate:
        judged = f"rate_of:{name}"
        row = _rate_row(row)
        value = Series(frozenset({name}), lambda block: block.rate(name))
    elif side == "is":
        value = _state_series(name, rule.states[0].value)
    elif magnitude:
        value = Series(frozenset({name}), lambda block: np.abs(block.values[name]))
    else:
        value = Series(frozenset({name}), lambda block: block.values[name])
    condition = all_of([compile_condition(one, trace, aircraft) for one in rule.when])
    names = value.names
    if limit.series is not None:
        names |= limit.series.names
    if condition is not None:
        names |= condition.names
    notes = tuple(note for note in (*limit.notes, _converted(rule, trace, name), trace.steps[name].assumes) if note)
    release, share = 0.0, None
    if rule.release is not None:
        release, share = (0.0, float(rule.release)) if rule.release_is_percent else (float(rule.release), None)
    return Compiled(
        id=rule.id,
        title=rule.title or rule.id,
        set_name=set_name,
        quantity=row,
        judged=judged,
        side=SIDES[side],
        side_word=side,
        value=value,
        limit=limit.series,
        levels=_levels(rule, side),
        condition=condition,
        grid_names=(name, *limit.grid_names),
        names=frozenset(names),
        limit_source=limit.source or "the rule",
        limit_assumed=limit.assumed,
        last_flaps=limit.last_flaps,
        lasting=float(rule.lasting),
        joining=float(rule.joining),
        release=release,
        release_share=share,
        allowed=tuple(_allowance(one, limit) for one in rule.allowed),
        count=None if rule.count is None else (rule.count.at_least, *_span(rule.count.within)),
        total=None if rule.total is None else (float(rule.total.above), *_span(rule.total.within)),
        must_see=None if rule.must_see is None else float(rule.must_see),
        # a difference of two samples has no smooth curve between them to estimate a peak from
        judge_on="sample" if rule.rate else rule.judge_on,
        magnitude=magnitude,
        cap="possible" if judged in MARGINS and side == "below" else None,
        discrete=side == "is" or row.discrete,
        task=_task(rule),
        notes=notes,
    )


def _state_series(name: str, state: int) -> Series:
    """1 in the state, 0 out of it, NaN where not known: judged against one half."""

    def of(block: Block) -> Any:
        value = block.values[name]
        return np.where(np.isnan(value), np.nan, (value == state).astype(float))

    return Series(frozenset({name}), of)


def _levels(rule: Rule, side: str) -> tuple[LevelSpec, ...]:
    if side == "is":
        return tuple(LevelSpec(state.severity, "at", 0.5) for state in rule.states)
    made = []
    for level in rule.levels:
        if level.side != side:
            continue
        lasting = level.lasting or 0.0
        if level.percent is not None:
            made.append(LevelSpec(level.severity, "share", float(level.percent), lasting))
        elif level.beyond_by is not None:
            made.append(LevelSpec(level.severity, "beyond", float(level.beyond_by), lasting))
        elif level.absolute is not None:
            made.append(LevelSpec(level.severity, "at", float(level.absolute), lasting))
    return tuple(made)


def _allowance(one: Any, limit: FoundLimit) -> Allowance:
    within, window = _span(one.within)
    share = float(one.up_to)
    return Allowance(share, float(one.for_time), within, window, one.up_to.unit == "%" and limit.series is not None)


def _span(within: Any) -> tuple[str, float | None]:
    return (within, None) if isinstance(within, str) and within in ("event", "flight") else ("window", float(within))


def _task(rule: Rule) -> TaskSpec | None:
    inspection = rule.inspection
    if inspection is None:
        return None
    return TaskSpec(inspection.task, inspection.ata, inspection.before, inspection.from_severity, inspection.certainty)


def _rate_row(row: Quantity) -> Quantity:
    kind = RATES.get(row.kind, "")
    unit = RATE_UNITS.get(kind, "1")
    return Quantity(f"rate_of:{row.name}", "", UNITS[unit].kind, unit, 2, (-1e9, 1e9), row.positive)


def _unknown(name: str) -> Quantity:
    return Quantity(name, "", "ratio", "1", 2, (-1e9, 1e9))


def _empty(
    rule: Rule,
    set_name: str,
    row: Quantity,
    limit: FoundLimit | None = None,
    unassessed: str | None = None,
    not_applicable: str | None = None,
) -> Compiled:
    return Compiled(
        id=rule.id,
        title=rule.title or rule.id,
        set_name=set_name,
        quantity=row,
        judged=row.name,
        side=1,
        side_word=rule.sides[0] if rule.sides else "above",
        value=Series(frozenset(), lambda block: np.nan),
        limit=None,
        levels=(),
        condition=None,
        grid_names=(),
        names=frozenset(),
        limit_source=limit.source if limit is not None else "",
        unassessed=unassessed,
        not_applicable=not_applicable,
    )
