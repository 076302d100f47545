"""What makes a stall more than possible: the stall warning, or a load factor that breaks at the margin's end.

The margin to the computed stall speed moves with power and with a wrong mass, so alone it proves no stall.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from exceed.core.intervals import Array
from exceed.core.trace import Grid, Trace

# judged by one of these alone, a stall is possible at most
MARGINS = ("stall_margin", "stall_speed_ratio")
# common practice, no source: the warning may come so long before the stall, s; a break takes this share of the load
# factor off within so many s, and a slower channel does not show it
WARNED_BEFORE, BREAK_SHARE, BREAK_TIME, BREAK_INTERVAL = 3.0, 0.2, 0.5, 0.26
# below this load factor a fall of it is no break, but easing off near level flight
BREAK_FROM = 1.3


def sign_of_stall(
    trace: Trace, grid: Grid, first: int, last: int, fixed: Mapping[str, float] | None = None
) -> str | None:
    """What else shows a stall about the grid places [first, last], in words; None where nothing does."""
    time = grid.time
    low = int(np.searchsorted(time, time[first] - WARNED_BEFORE))
    high = int(np.searchsorted(time, time[last] + 1.0, side="right"))
    names = [name for name in ("stall_warning", "load_factor") if trace.has(name)]
    if not names:
        return None
    values = trace.evaluate(names, grid, low, high, fixed)
    if "stall_warning" in values and np.nanmax(values["stall_warning"], initial=0.0) > 0.5:
        return "the stall warning was on"
    if "load_factor" in values and grid.interval <= BREAK_INTERVAL:
        inside = slice(first - low, last + 1 - low)
        if _breaks(time[low:high], values["load_factor"], inside):
            return "the load factor broke"
    return None


def _breaks(time: Array, load_factor: Array, inside: slice) -> bool:
    """Whether the load factor falls away from a sample inside, faster than it is usually eased off."""
    lost = np.zeros(len(time), dtype=bool)
    for ahead in range(1, len(time)):
        # samples so far ahead, as long as one of them is within the time a break takes
        near = time[ahead:] - time[:-ahead] <= BREAK_TIME + 1e-9
        if not near.any():
            break
        here = load_factor[:-ahead]
        with np.errstate(invalid="ignore"):
            falls = (here >= BREAK_FROM) & (load_factor[ahead:] <= here - BREAK_SHARE * here)
        lost[:-ahead] |= near & falls
    return bool(lost[inside].any())
