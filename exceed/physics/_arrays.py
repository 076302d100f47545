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
    """A fresh result with NaN in place of infinities (a numpy scalar for a scalar).

    It is changed in place, so it must be no one's input; a read-only one is copied.
    """
    out = np.asarray(result, dtype=np.float64)
    if not out.flags.writeable:
        out = out.copy()
    if not np.isfinite(out).all():
        if out.ndim == 0:
            return np.float64(np.nan)  # type: ignore[return-value]
        out[np.isinf(out)] = np.nan
    return out[()]


def where(condition: NDArray[np.bool_] | np.bool_, result: ArrayLike) -> Array:
    """`finite(result)` where the condition holds, NaN elsewhere (a NaN input makes a condition False)."""
    # the mask is seldom needed and a select costs more than the look
    return finite(result) if np.all(condition) else finite(np.where(condition, result, np.nan))


def all_within(values: Array, low: float, high: float) -> bool:
    """Whether every value lies in a closed range; a NaN does not. Cheaper than two masks."""
    return values.size == 0 or bool(values.min() >= low and values.max() <= high)
