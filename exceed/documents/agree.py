"""Do the parts of one rule agree? Kinds of unit, levels in order, conditions that can hold."""

from __future__ import annotations

import itertools
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from exceed.core.phases import AIRBORNE
from exceed.core.quantities import QUANTITIES, Quantity
from exceed.documents import facts
from exceed.documents.conditions import Condition, never, state_words
from exceed.documents.fields import Faults, Path, an, nearest
from exceed.documents.limits import ConstantLimit, FactLimit, RelativeLimit, TableLimit
from exceed.documents.order import levels_in_order
from exceed.documents.values import Value, expected_of, usual_unit

if TYPE_CHECKING:
    from exceed.documents.rules import Rule


def check(rule: Rule, own: Mapping[str, str] | None) -> tuple[str, Faults]:
    """Kind of quantity that the rule judges, and what does not agree. `own`: declared names; None: any name goes."""
    found = Faults()
    row = _row(rule.quantity, rule.rate, own, found, ("quantity",))
    kind = _kind(rule.quantity, rule.rate, row, found, ("quantity",))
    if row is not None and row.discrete:
        _discrete(rule, found)
    else:
        _continuous(rule, kind, own, found)
    for index, condition in enumerate(rule.when):
        _condition(condition, own, found, ("when", index))
    last = never(rule.when)
    if last is not None:
        found.note(
            ("when", last),
            "no phase is left by this and the phases before it, so the rule never looks",
            "phases that can hold together",
            "name all phases in one list, or use {any: [...]}",
        )
    touchdown = rule.quantity.startswith("touchdown_")
    for index, condition in enumerate(rule.when):
        if touchdown and condition.phase and not {"landing", "unknown"} & set(condition.phase):
            found.note(
                ("when", index),
                f"a touchdown is never in the phase {' or '.join(condition.phase)}",
                "landing, or no phase",
                "remove the condition",
            )
    return kind, found


def _row(name: str, rate: bool, own: Mapping[str, str] | None, found: Faults, path: Path) -> Quantity | None:
    from exceed.documents.rules import find

    if name == "airspeed":
        return QUANTITIES["indicated_airspeed"]
    row = find(name, own or {})
    if row is None and own is not None:
        known = {*QUANTITIES, *own, "airspeed"}
        near = nearest(name, known)
        found.note(
            path,
            f"'{name}' is not a quantity",
            "a quantity that 'exceed template rules' lists, 'airspeed', or one declared under 'quantities'",
            f"write '{near}' if that is meant" if near else f"declare it: 'quantities: {{{name}: UNIT}}'",
        )
    return row


def _kind(name: str, rate: bool, row: Quantity | None, found: Faults, path: Path) -> str:
    from exceed.documents.rules import RATES

    if row is None:
        return ""
    if not rate:
        return row.kind
    # the rate of any length is a speed, of any speed something that has no unit here
    if row.kind not in RATES or row.discrete:
        found.note(
            path,
            f"there is no unit for the rate of {name}",
            f"the rate of {an('quantity')} that is one of {', '.join(sorted(RATES))}",
            "judge the quantity itself",
        )
        return ""
    return RATES[row.kind]


def _right(value: Value, kind: str, quantity: str, found: Faults, path: Path, *, percent: bool = False) -> bool:
    """Note a value of the wrong kind of unit, or of another airspeed than the quantity; whether it is right."""
    if not kind or (value.unit == "%" and percent):
        return True
    if value.kind != kind:
        what = "a bare number" if value.bare else "a per cent" if value.unit == "%" else an(value.kind)
        expected = expected_of((kind,), bare=kind == "ratio") + (", or a per cent of the limit" if percent else "")
        do = (
            f"write the unit, as in '{value} {_example(quantity, kind)}'" if value.bare else "give a value of that kind"
        )
        found.note(path, f"'{value}' is {what} and {quantity} is {an(kind)}", expected, do)
        return False
    if kind == "ratio" and value.bare and quantity in QUANTITIES and QUANTITIES[quantity].shown == "%":
        return True
    named = quantity if quantity in QUANTITIES and quantity.endswith("_airspeed") else None
    if value.airspeed is not None and named is not None and value.airspeed != named:
        found.note(
            path,
            f"'{value}' is {an(value.airspeed.replace('_', ' '))} and the rule is about {named.replace('_', ' ')}",
            named.replace("_", " "),
            "give it in that kind, or write 'quantity: airspeed'",
        )
        return False
    if quantity == "airspeed" and value.airspeed is None:
        found.note(
            path,
            f"'{value}' does not say which airspeed it is",
            expected_of((), airspeed=True),
            f"write '{value} IAS' if indicated airspeed is meant",
        )
        return False
    return True


def _example(quantity: str, kind: str) -> str:
    row = QUANTITIES.get(quantity)
    return row.shown if row is not None and row.kind == kind else usual_unit(kind)


def _discrete(rule: Rule, found: Faults) -> None:
    words = state_words(_base(rule.quantity))
    for name in ("above", "below"):
        if getattr(rule, name):
            found.note(
                (name,),
                f"{rule.quantity} is a state, so it is neither above nor below a level",
                "'is', as in 'is: {caution: up}'",
                "use 'is'",
            )
    if rule.limit is not None:
        found.note(
            ("limit",), f"{rule.quantity} is a state and has no limit", "'is', as in 'is: {caution: up}'", "remove it"
        )
    if rule.rate:
        found.note(("quantity",), "there is no unit for the rate of a state", "the state itself", "remove 'rate_of'")
    if not rule.is_state and not (rule.above or rule.below):
        found.note((), "no level is given", "'is', as in 'is: {caution: up}'", "add 'is'")
    for severity, word in rule.is_state.items():
        if word not in words:
            near = nearest(word, words)
            found.note(
                ("is", severity),
                f"'{word}' is no state of {rule.quantity}",
                f"one of {', '.join(sorted(words))}",
                f"write '{near}' if that is meant" if near else "use one of these",
            )
    if len({words.get(word) for word in rule.is_state.values()}) > 1:
        text = "two states in one rule cannot be told apart"
        found.note(("is",), text, "one state in a rule", "make a rule of each state")
    for name in ("release", "allowed"):
        if getattr(rule, name):
            found.note(
                (name,), f"'{name}' says nothing about a state", "a rule about a continuous quantity", "remove it"
            )


def _base(name: str) -> str:
    from exceed.documents.rules import base_name

    return base_name(name)


def _continuous(rule: Rule, kind: str, own: Mapping[str, str] | None, found: Faults) -> None:
    if rule.is_state:
        found.note(("is",), f"{rule.quantity} is no state", "'above' or 'below'", "use 'above' or 'below'")
    elif not rule.above and not rule.below:
        found.note((), "no level is given", "'above' or 'below', as in 'above: {caution: 100 %}'", "add one")
    _limit(rule, kind, own, found)
    ratio = kind == "ratio"
    for side in ("above", "below"):
        for key in getattr(rule, side):
            path: Path = (side, key.severity)
            if key.beyond_by is not None:
                if rule.limit is None:
                    found.note(path, "'beyond_by' counts from the limit, and there is none", "'limit'", "add the limit")
                elif key.beyond_by.unit == "%" and not ratio:
                    found.note(
                        path,
                        f"'{key.beyond_by}' is a per cent",
                        "a value with the unit of the quantity",
                        "write the per cent of the limit itself, as in '105 %'",
                    )
                else:
                    # a step away from a limit has a unit and no kind of airspeed to disagree with
                    _right(
                        _without_airspeed(key.beyond_by),
                        kind,
                        "" if rule.quantity == "airspeed" else rule.quantity,
                        found,
                        path,
                    )
            elif key.at is not None and key.at.unit == "%" and kind == "temperature" and key.at != 1.0:
                found.note(
                    path,
                    f"'{key.at}' of a temperature depends on the scale, so it says nothing",
                    "100 %, an absolute value, or {beyond_by: 5 degC}",
                    "say how far beyond the limit",
                )
            elif key.at is not None and key.at.unit == "%" and not ratio and rule.limit is None:
                found.note(
                    path,
                    f"'{key.at}' is a per cent of the limit, and there is none",
                    "'limit', or an absolute level",
                    "add the limit",
                )
            elif key.at is not None:
                _right(key.at, kind, rule.quantity, found, path, percent=rule.limit is not None)
    if not found:
        for side in ("above", "below"):
            levels_in_order(rule, side, found)
    if rule.release is not None:
        if rule.release.unit == "%" and not ratio and rule.limit is None:
            found.note(
                ("release",),
                f"'{rule.release}' is a per cent of the limit, and there is none",
                "an absolute value",
                "give it with its unit",
            )
        else:
            _right(
                _without_airspeed(rule.release),
                kind,
                "" if rule.quantity == "airspeed" else rule.quantity,
                found,
                ("release",),
                percent=rule.limit is not None,
            )
    _allowed(rule, kind, found)


def _without_airspeed(value: Value) -> Value:
    return Value(float(value), value.kind, value.unit, value.text)


def _limit(rule: Rule, kind: str, own: Mapping[str, str] | None, found: Faults) -> None:
    limit = rule.limit
    if isinstance(limit, ConstantLimit):
        if limit.value.unit == "%" and kind != "ratio":
            found.note(
                ("limit",),
                f"'{limit.value}' is a per cent of nothing",
                expected_of((kind,)),
                "give the limit with its unit",
            )
        else:
            _right(limit.value, kind, rule.quantity, found, ("limit",))
    elif isinstance(limit, FactLimit):
        fact_kind = facts.kind_of_fact(limit.fact)
        if fact_kind and kind and fact_kind != kind:
            found.note(
                ("limit",),
                f"{limit.fact} is {an(fact_kind)} and {rule.quantity} is {an(kind)}",
                f"a fact that is {an(kind)}",
                "point at another fact, or judge another quantity",
            )
    elif isinstance(limit, TableLimit):
        row = _row(limit.over, False, own, found, ("limit", "over"))
        for index, (x, y) in enumerate(limit.points):
            wrong_x = row is not None and not _right(x, row.kind, limit.over, found, ("limit", "points", index, 0))
            wrong_y = not _right(y, kind, rule.quantity, found, ("limit", "points", index, 1))
            if wrong_x or wrong_y:
                break
    elif isinstance(limit, RelativeLimit):
        row = _row(limit.quantity, False, own, found, ("limit", "quantity"))
        if row is not None and kind and row.kind != kind:
            found.note(
                ("limit", "quantity"),
                f"{limit.quantity} is {an(row.kind)} and {rule.quantity} is {an(kind)}",
                f"a quantity that is {an(kind)}",
                "name another quantity",
            )
        if limit.plus is not None:
            _right(
                _without_airspeed(limit.plus),
                kind,
                "" if rule.quantity == "airspeed" else rule.quantity,
                found,
                ("limit", "plus"),
            )


def _allowed(rule: Rule, kind: str, found: Faults) -> None:
    steps: list[tuple[float, float, int]] = []
    for index, step in enumerate(rule.allowed):
        path: Path = ("allowed", index, "up_to")
        if rule.limit is None:
            found.note(path, "an allowance counts beyond the limit, and there is none", "'limit'", "add the limit")
            return
        percent = step.up_to.unit == "%"
        if percent and (step.up_to <= 1.0 if rule.above else step.up_to == 1.0):
            found.note(path, f"'{step.up_to}' leaves nothing beyond the limit", "more than 100 %", "check the figure")
        elif not _right(step.up_to, kind, rule.quantity, found, path, percent=True):
            continue
        steps.append((float(step.up_to), float(step.for_time), index))
    if len({step.up_to.unit == "%" for step in rule.allowed}) > 1:
        return
    sign = 1.0 if rule.above else (-1.0 if isinstance(rule.limit, RelativeLimit) else 0.0)
    for before, here in itertools.pairwise(steps):
        if sign and sign * (here[0] - before[0]) <= 0.0:
            found.note(
                ("allowed", here[2], "up_to"),
                f"'{rule.allowed[here[2]].up_to}' is not beyond '{rule.allowed[before[2]].up_to}' before it",
                "steps in order, each farther out",
                "put them in order",
            )
        if here[1] > before[1]:
            found.note(
                ("allowed", here[2], "for"),
                f"'{rule.allowed[here[2]].for_time}' is longer than "
                f"'{rule.allowed[before[2]].for_time}' of the step inside it",
                "less time farther out",
                "check both figures",
            )


def _condition(condition: Condition, own: Mapping[str, str] | None, found: Faults, path: Path) -> None:
    for index, inner in enumerate(condition.any):
        _condition(inner, own, found, (*path, "any", index))
    name = condition.quantity
    if name is None:
        return
    if name == "airspeed":
        found.note(
            (*path, "quantity"),
            "'airspeed' has no limit here to say which it is",
            "the airspeed's full name",
            "write 'indicated_airspeed' or 'calibrated_airspeed'",
        )
        return
    row = _row(name, condition.rate, own, found, (*path, "quantity"))
    if row is None:
        return
    if row.discrete and not condition.rate:
        words = state_words(_base(name))
        if condition.state is None:
            found.note(path, f"{name} is a state", f"'is' with one of {', '.join(sorted(words))}", "use 'is'")
        elif condition.state not in words:
            near = nearest(condition.state, words)
            found.note(
                (*path, "is"),
                f"'{condition.state}' is no state of {name}",
                f"one of {', '.join(sorted(words))}",
                f"write '{near}' if that is meant" if near else "use one of these",
            )
        return
    kind = _kind(name, condition.rate, row, found, (*path, "quantity"))
    if condition.state is not None:
        found.note((*path, "is"), f"{name} is no state", "one of above, below, within", "use one of these")
    values: list[tuple[Path, Any]] = [((*path, "above"), condition.above), ((*path, "below"), condition.below)]
    if condition.within is not None:
        values += [((*path, "within", index), value) for index, value in enumerate(condition.within)]
    for where, value in values:
        if value is not None:
            _right(value, kind, name, found, where)


__all__ = ["AIRBORNE", "check"]
