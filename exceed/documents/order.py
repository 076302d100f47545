"""Are the levels and allowances of a rule in order: the severer farther out, the farther for less time?"""

from __future__ import annotations

from itertools import pairwise
from typing import TYPE_CHECKING

from exceed.documents.faults import Faults
from exceed.documents.limits import ConstantLimit, FactLimit, RelativeLimit

if TYPE_CHECKING:
    from exceed.documents.rules import Level, Rule


def levels_in_order(rule: Rule, side: str, found: Faults) -> None:
    """A more severe level must not be reached before a less severe one, unless it asks for a longer time."""
    levels = [level for level in rule.levels if level.side == side]
    limit = float(rule.limit.value) if isinstance(rule.limit, ConstantLimit) else None
    for less, more in pairwise(levels):
        wait_less = float(rule.lasting) if less.lasting is None else less.lasting
        wait_more = float(rule.lasting) if more.lasting is None else more.lasting
        if wait_more > wait_less:
            continue
        step = _farther(less, more, side, limit, rule)
        if step is not None and step <= 0.0:
            where = "the same as" if step == 0.0 else "inside"
            found.note(
                (side, more.severity),
                f"{more.severity} at {_shown(more)} is {where} {less.severity} at {_shown(less)}",
                f"{more.severity} beyond {less.severity}",
                "swap them, or give the severer one a longer 'lasting'",
            )


def _shown(level: Level) -> str:
    if level.percent is not None:
        return f"'{level.percent * 100:g} %'"
    return f"'{level.absolute}'" if level.absolute is not None else f"'{level.beyond_by}' beyond"


def _farther(less: Level, more: Level, side: str, limit: float | None, rule: Rule) -> float | None:
    """How much farther out the severer level lies (sign only counts); None where it depends on the limit in force."""
    sign = 1.0 if side == "above" else -1.0
    if limit is not None:
        return sign * (float(more.value(limit)) - float(less.value(limit)))
    if less.absolute is not None and more.absolute is not None:
        return sign * (float(more.absolute) - float(less.absolute))
    if less.beyond_by is not None and more.beyond_by is not None:
        return float(more.beyond_by) - float(less.beyond_by)
    if less.percent is not None and more.percent is not None:
        step = more.percent - less.percent
        if side == "above":
            return step
        # below a negative limit farther means a greater per cent, below a positive one a smaller
        if isinstance(rule.limit, FactLimit) and rule.limit.fact == "aircraft.load_factor.minimum":
            return step
        return -step if isinstance(rule.limit, RelativeLimit) else (0.0 if step == 0.0 else None)
    return None
