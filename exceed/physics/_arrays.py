"""What every function of this folder shares: inputs to float64, and never an infinity out."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]

# Beyond this bank a level turn is not flown and 1/cos says nothing.
STEEPEST_BANK = float(np.radians(85.0))

# Puts silence on overflow, 0/0 and the like: their results are NaN by `finite`, so nothing is hidden.
quiet = np.errstate(all="ignore")


def floats(value: ArrayLike) -> Array:
    """`value` as float64 without copying where it is that already; never written to."""
    return np.asarray(value, dtype=np.float64)


def finite(result: ArrayLike) -> Array:
    """`result` with NaN in place of infinities; a fresh array (or a numpy scalar for scalar input)."""
    out = np.array(result, dtype=np.float64)
    if not np.isfinite(out).all():
        out[np.isinf(out)] = np.nan
    return out[()]


def where(condition: NDArray[np.bool_] | np.bool_, result: ArrayLike) -> Array:
    """`finite(result)` where the condition holds, NaN elsewhere (a NaN input makes a condition False)."""
    out = np.asarray(result, dtype=np.float64)
    # the mask is seldom needed and a select costs more than the look
    return finite(out) if np.all(condition) else finite(np.where(condition, out, np.nan))
