"""Facts of an aeroplane as plain arrays: limits by flap setting, tables over a quantity.

The flap rule of all of them: within one degree of zero the flaps are up; beyond, the smallest listed setting that is
not below the angle less one degree holds, never interpolated; past the last setting the last one.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from exceed.physics._arrays import Array, all_within, finite, floats, quiet, where

FLAP_TOLERANCE = float(np.radians(1.0))
_ROUNDING = 1e-9  # rad; 11 deg less 1 deg is to find the 10 deg row whatever the rounding


def freeze(facts: object) -> None:
    """Turn the array fields of a frozen dataclass into read-only float64 vectors of one length (for __post_init__)."""
    lengths = set()
    for field in fields(facts):  # type: ignore[arg-type]
        value = getattr(facts, field.name)
        if isinstance(value, str):
            continue
        array = np.array(value, dtype=np.float64, ndmin=1)
        array.flags.writeable = False
        object.__setattr__(facts, field.name, array)
        lengths.add(array.shape)
    if len(lengths) != 1 or next(iter(lengths))[0] == 0 or len(next(iter(lengths))) != 1:
        raise ValueError(f"{type(facts).__name__}: columns must be vectors of one length of at least 1, not {lengths}")


@dataclass(frozen=True, slots=True, eq=False)
class Table:
    """A value over a quantity: `at` (k,) rising, `value` (k,).

    `between` is 'linear', or 'step': a value holds from its own place up to the next. Beyond either end the end's
    value is held.
    """

    at: Array
    value: Array
    between: Literal["linear", "step"] = "linear"

    def __post_init__(self) -> None:
        freeze(self)
        if not (np.isfinite(self.at).all() and np.isfinite(self.value).all() and (np.diff(self.at) > 0).all()):
            raise ValueError("Table: places must rise and all numbers be finite")
        if self.between not in ("linear", "step"):
            raise ValueError(f"Table: between must be 'linear' or 'step', not {self.between!r}")


@dataclass(frozen=True, slots=True, eq=False)
class StepTable:
    """A value for each flap setting: `flap_angle` (k,) rad, `value` (k,), in any order."""

    flap_angle: Array
    value: Array

    def __post_init__(self) -> None:
        freeze(self)


@quiet
def table_value(table: Table, at: ArrayLike) -> Array:
    """The table's value at a place; ends held.

    Parameters: table : Table; at : (n,) array, unit of the table's places.
    Returns: (n,) array, unit of the table's values. NaN where `at` is NaN.
    Source: [DEFINITION].
    """
    x = floats(at)
    if table.between == "linear":
        return finite(np.interp(x, table.at, table.value))
    row = np.clip(np.searchsorted(table.at, x, side="right") - 1, 0, table.at.size - 1)
    return where(~np.isnan(x), table.value[row])


@quiet
def outside_table(table: Table, at: ArrayLike) -> NDArray[np.bool_]:
    """Whether a place lies beyond the table's ends, where the end's value is held (say it).

    Parameters: as in `table_value`.    Returns: (n,) array of bool; False for NaN.
    Source: [DEFINITION].
    """
    x = floats(at)
    return np.asarray((x < table.at[0]) | (x > table.at[-1]))


@quiet
def flap_setting_in_force(flap_angle: ArrayLike, flap_settings: ArrayLike) -> Array:
    """The listed setting that a flap angle is judged by, or 0 for flaps up.

    Parameters
    ----------
    flap_angle : (n,) array, rad, positive down
    flap_settings : (k,) array, rad, the settings listed; NaN entries are passed over

    Returns
    -------
    (n,) array, rad. 0 within one degree of zero, whether listed or not, and for a flap set upwards where nothing
    below zero is listed; the smallest listed setting >= angle - 1 degree; past the last one the last. NaN where the
    angle is NaN, or beyond one degree with nothing listed.

    Source
    ------
    [COMMON-PRACTICE]: the limit of the next larger setting protects.
    """
    angle = np.asarray(floats(flap_angle))
    listed = floats(flap_settings).ravel()
    settings = np.unique(listed[np.isfinite(listed)])
    if all_within(angle, -FLAP_TOLERANCE, FLAP_TOLERANCE):
        return np.zeros(angle.shape)[()]
    up = np.abs(angle) <= FLAP_TOLERANCE + _ROUNDING
    if settings.size == 0:
        return finite(np.where(up, 0.0, np.nan))
    row = np.searchsorted(settings, angle - FLAP_TOLERANCE - _ROUNDING, side="left")
    chosen = settings[np.minimum(row, settings.size - 1)]
    if not (settings < -FLAP_TOLERANCE).any():
        up = up | (angle < 0.0)
    return finite(np.where(np.isnan(angle), np.nan, np.where(up, 0.0, chosen)))


@quiet
def past_last_setting(flap_angle: ArrayLike, flap_settings: ArrayLike) -> NDArray[np.bool_]:
    """Whether a flap angle lies past the last listed setting, so that the last one is used for want of better (say it).

    Parameters: as in `flap_setting_in_force`.    Returns: (n,) array of bool; False for NaN.
    Source: [COMMON-PRACTICE].
    """
    listed = floats(flap_settings).ravel()
    settings = listed[np.isfinite(listed)]
    angle = floats(flap_angle)
    if settings.size == 0:
        return np.zeros(angle.shape, dtype=bool)
    beyond = angle > settings.max() + FLAP_TOLERANCE + _ROUNDING
    return np.asarray(beyond & (np.abs(angle) > FLAP_TOLERANCE + _ROUNDING))


@quiet
def flaps_extended_speed(flap_angle: ArrayLike, flaps_extended: StepTable) -> Array:
    """Flap limit speed V_FE in force at a flap angle, in the kind of airspeed the table is given in.

    Parameters: flap_angle : (n,) array, rad; flaps_extended : StepTable of speeds, m/s.
    Returns: (n,) array, m/s. NaN with flaps up (within one degree of zero), where it does not apply, and for NaN.
    Two rows of one setting: the lower speed.
    Source: [COMMON-PRACTICE], see `flap_setting_in_force`.
    """
    setting = np.asarray(flap_setting_in_force(flap_angle, flaps_extended.flap_angle))
    up = np.abs(floats(flap_angle)) <= FLAP_TOLERANCE + _ROUNDING
    speed = np.full(setting.shape, np.nan)
    for angle, value in zip(flaps_extended.flap_angle, flaps_extended.value, strict=True):
        speed = np.where(setting == angle, np.fmin(speed, value), speed)
    return where(~up, speed)
