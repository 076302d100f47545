"""Least design speeds of the airworthiness codes, from wing loading and stall speeds.

The codes give them in lb, ft and kt; the functions take and give SI and convert with exact factors.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from exceed.core.constants import FOOT, KNOT, POUND
from exceed.physics._arrays import Array, finite, floats, quiet, where

_PSF = POUND / FOOT**2  # kg/m2 of one lb/ft2

_CRUISE_FACTOR = {"normal": 33.0, "utility": 33.0, "commuter": 33.0, "aerobatic": 36.0}
_DIVE_FACTOR = {"normal": 1.40, "commuter": 1.40, "utility": 1.50, "aerobatic": 1.55}


def _falling(wing_loading: Array, at_20: float, at_100: float) -> Array:
    return np.asarray(np.interp(wing_loading / _PSF, [20.0, 100.0], [at_20, at_100]))


def _factor(table: dict[str, float], category: str) -> float:
    if category not in table:
        raise ValueError(f"no such factor for category {category!r}; known: {', '.join(sorted(table))}")
    return table[category]


@quiet
def cruise_speed_minimum(wing_loading: ArrayLike, category: str) -> Array:
    """Least design cruise speed: 33 (aerobatic 36) sqrt(W/S) kt, the factor falling above 20 lb/ft2 to 28.6 at 100.

    Parameters: wing_loading : (n,) array, kg/m2; category : normal, utility, commuter or aerobatic.
    Returns: (n,) array, m/s EAS. NaN where the loading is not positive.
    Raises: ValueError for another category.
    Source: [14CFR23-OLD] 23.335(a).
    """
    loading = floats(wing_loading)
    factor = _falling(loading, _factor(_CRUISE_FACTOR, category), 28.6)
    return where(loading > 0.0, factor * np.sqrt(loading / _PSF) * KNOT)


@quiet
def dive_over_cruise_minimum(wing_loading: ArrayLike, category: str) -> Array:
    """Least V_D over the least V_C: 1.40, 1.50 or 1.55, falling above 20 lb/ft2 to 1.35 at 100.

    Parameters: as in `cruise_speed_minimum`.    Returns: (n,) array, 1. NaN where the loading is not positive.
    Raises: ValueError for another category.
    Source: [14CFR23-OLD] 23.335(b)(2), (3).
    """
    loading = floats(wing_loading)
    return where(loading > 0.0, _falling(loading, _factor(_DIVE_FACTOR, category), 1.35))


@quiet
def flap_design_speed_minimum(stall_speed_clean: ArrayLike, stall_speed_flaps: ArrayLike) -> Array:
    """Least design flap speed V_F: the greater of 1.4 V_S (flaps up) and 1.8 V_SF (flaps out).

    Parameters: stall_speed_clean, stall_speed_flaps : (n,) arrays, m/s.    Returns: (n,) array, m/s.
    Source: [14CFR23-OLD] 23.345(b).
    """
    return finite(np.maximum(1.4 * floats(stall_speed_clean), 1.8 * floats(stall_speed_flaps)))


@quiet
def reference_speed_minimum(stall_speed: ArrayLike, minimum_control_speed: ArrayLike = 0.0) -> Array:
    """Least landing reference speed V_REF: the greater of V_MC and 1.3 V_S1.

    Parameters: stall_speed, minimum_control_speed : (n,) arrays, m/s.    Returns: (n,) array, m/s.
    Source: [14CFR23-OLD] 23.73(a).
    """
    return finite(np.maximum(1.3 * floats(stall_speed), floats(minimum_control_speed)))


@quiet
def mass_of_load_factor(load_factor: float) -> float:
    """Maximum take-off mass at which 2.1 + 24000/(W + 10000) gives a load factor, W in lb.

    Parameters: load_factor : 1, between 2.1 and 4.5.    Returns: kg; NaN outside.
    Source: [14CFR23-OLD] 23.337(a), [14CFR25] 25.337(b), solved for the mass (3.8: 4118 lb; 2.5: 50 000 lb).
    """
    weight = 24000.0 / (load_factor - 2.1) - 10000.0 if load_factor > 2.1 else np.nan
    return float(weight * POUND) if weight > 0.0 else float("nan")
