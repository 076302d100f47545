"""What else is to be said of an event: what caps its certainty, and notes that depend on where it lay."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from exceed.core.trace import Trace
from exceed.judge.compiled import Compiled
from exceed.judge.limits import FLAP_SLACK
from exceed.judge.sizing import Strip
from exceed.judge.stalls import MARGINS


def capped(rule: Compiled, trace: Trace) -> bool:
    """Whether the rule, or a method beneath its value, limit or condition, makes an event at most `possible`."""
    return rule.cap is not None or _method_caps(rule, trace)


def _method_caps(rule: Compiled, trace: Trace) -> bool:
    wanted = (rule.judged.removeprefix("rate_of:"), *rule.grid_names, *rule.names)
    return any(trace.steps[name].cap for name in trace.closure([name for name in wanted if trace.has(name)]))


def by_margin_only(rule: Compiled, trace: Trace) -> bool:
    return rule.judged in MARGINS and not _method_caps(rule, trace)


def beyond_rows(rule: Compiled, strip: Strip, context: Mapping[str, float]) -> str | None:
    """Past the last listed flap setting its limit holds, and that is said."""
    if rule.last_flaps is None:
        return None
    angle = abs(context.get("flap_angle", 0.0))
    if "flap_angle" in strip.block.values:
        angle = float(np.nanmax(np.abs(strip.block.values["flap_angle"][strip.inside]), initial=angle))
    if angle <= rule.last_flaps + FLAP_SLACK:
        return None
    here, last = np.degrees(angle), np.degrees(rule.last_flaps)
    return f"flaps {here:.0f} deg are beyond the last listed setting, whose limit is used: {last:.0f} deg"


def larger_elsewhere(rule: Compiled, strip: Strip, at: int) -> str | None:
    """A larger value than the peak's may stand where the limit in force was further out."""
    if rule.discrete:
        return None
    part = np.where(strip.live[strip.inside], rule.side * strip.value[strip.inside], -np.inf)
    most = rule.side * float(np.max(part))
    unit, decimals = rule.quantity.unit, rule.quantity.decimals
    here, there = round(unit.from_si(float(strip.value[at])), decimals + 1), round(unit.from_si(most), decimals + 1)
    if rule.side * (there - here) <= 0.0:
        return None
    way = "larger" if rule.side > 0.0 else "lower"
    return f"a {way} value, {there:.{decimals + 1}f} {rule.quantity.shown}, stands elsewhere under another limit"
