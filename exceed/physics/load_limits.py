"""Limit load factors of an aeroplane by rows, and what reduces them.

A row may be keyed by flap setting, mass, speed and airbrakes; the row with the tightest matching keys holds. Above the
last mass the limit shrinks with mass (the wing's load stays), and no limit is ever raised for a low mass.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from exceed.physics._arrays import Array, finite, floats, quiet, where
from exceed.physics.tables import flap_setting_in_force, freeze, past_last_setting

Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class LoadFactorTable:
    """Limit (not ultimate) load factors as a manual gives them. Columns of one length (k,), NaN where a row has no such
    key: then the row holds for any.

    flap_angle : rad; mass_up_to : kg; speed_up_to : m/s, in the kind of airspeed the caller passes; airbrakes : 1 out,
    0 in; maximum, minimum : 1, NaN where the row does not give it.
    """

    flap_angle: Array
    mass_up_to: Array
    speed_up_to: Array
    airbrakes: Array
    maximum: Array
    minimum: Array

    def __post_init__(self) -> None:
        freeze(self)
        if (self.mass_up_to <= 0).any() or (self.speed_up_to <= 0).any():
            raise ValueError("LoadFactorTable: mass_up_to and speed_up_to must be positive, or NaN for any")


def _same(a: float, b: float) -> bool:
    return a == b or (np.isnan(a) and np.isnan(b))


def _looser_or_equal(a: float, b: float) -> bool:
    """Whether an exact key `a` holds wherever the exact key `b` does."""
    return bool(np.isnan(a)) or a == b


def _limit(
    values: Array, flap_angle: Array, mass: Array, speed: Array, brakes: Array, table: LoadFactorTable, size: float
) -> Array:
    """Limit of one side; `size` +1 for maxima, -1 for minima, so that the smaller `size * limit` protects."""
    rows = [i for i in range(values.size) if np.isfinite(values[i])]
    shape = np.broadcast_shapes(flap_angle.shape, mass.shape, speed.shape, brakes.shape)
    if not rows:
        return np.full(shape, np.nan)[()]
    # masks keep the shape of the keys they ask for: a table keyed by flaps alone costs nothing for the rest
    flaps, heavy, fast, out = (
        table.flap_angle.tolist(),
        table.mass_up_to.tolist(),
        table.speed_up_to.tolist(),
        table.airbrakes.tolist(),
    )
    setting = _one(_setting_in_force(flap_angle, table.flap_angle[rows]))
    brakes, mass, speed = _one(brakes), _one(mass), _one(speed)

    exact_keys = {}  # flaps and airbrakes
    exact = {}
    for i in rows:
        match = np.asarray(True)
        if not np.isnan(flaps[i]):
            match = match & (setting == flaps[i])
        if not np.isnan(out[i]):
            match = match & (brakes == out[i])
        exact_keys[i] = match
        if not np.isnan(heavy[i]):
            match = match & (mass <= heavy[i])
        if not np.isnan(fast[i]):
            match = match & (speed <= fast[i])
        exact[i] = match

    def tighter(j: int, i: int) -> bool:
        """Row j is at least as tight as row i in every key, and tighter in one, where both match."""
        pairs = ((flaps, _exact_tight), (out, _exact_tight), (heavy, _ordered_tight), (fast, _ordered_tight))
        order = [how(column[j], column[i]) for column, how in pairs]
        return min(order) >= 0 and max(order) > 0

    best = np.asarray(np.inf)
    for i in rows:
        holds = exact[i]
        for j in rows:
            if j != i and tighter(j, i):
                holds = holds & ~exact[j]
        if np.any(holds):
            best = np.where(holds, np.minimum(best, size * values[i]), best)

    # The last mass, and the last speed, of a group of rows go on holding beyond themselves. A row for any mass is then
    # no leave to fly heavier with more than the shrunken limit: the more protective of both holds.
    for i in rows:
        group = [j for j in rows if _same(flaps[i], flaps[j]) and _same(out[i], out[j])]
        over_mass = np.asarray(False)
        over_speed = np.asarray(False)
        if not np.isnan(heavy[i]) and not any(heavy[j] > heavy[i] for j in group):
            over_mass = mass > heavy[i]
        if not np.isnan(fast[i]) and not any(np.isnan(fast[j]) or fast[j] > fast[i] for j in group if j != i):
            over_speed = speed > fast[i]
        beyond = exact_keys[i] & (over_mass | over_speed)
        if not beyond.any():
            continue
        beyond = beyond & (over_mass | np.isnan(heavy[i]) | (mass <= heavy[i]))
        beyond = beyond & (over_speed | np.isnan(fast[i]) | (speed <= fast[i]))
        for j in rows:  # a row that does list this mass or speed is the manual's word on it
            if j != i and _looser_or_equal(flaps[j], flaps[i]) and _looser_or_equal(out[j], out[i]):
                says_mass = ~over_mass | (not np.isnan(heavy[j]))
                says_speed = ~over_speed | (not np.isnan(fast[j]))
                beyond = beyond & ~(exact[j] & says_mass & says_speed)
        shrink = np.where(over_mass, heavy[i] / mass, 1.0)
        best = np.where(beyond, np.minimum(best, size * values[i] * shrink), best)

    # an unknown key hides the limit only where some row that could hold depends on it
    unknown = np.asarray(False)
    for i in rows:
        possible = np.asarray(True)
        asked = np.asarray(False)
        for column, value, match in (
            (flaps, setting, setting == flaps[i]),
            (out, brakes, brakes == out[i]),
            (heavy, mass, np.asarray(True)),
            (fast, speed, np.asarray(True)),
        ):
            if not np.isnan(column[i]):
                missing = np.isnan(value)
                possible = possible & (match | missing)
                asked = asked | missing
        unknown = unknown | (possible & asked)
    return where(np.broadcast_to(~unknown & np.isfinite(best), shape), np.broadcast_to(size * best, shape))


def _exact_tight(a: float, b: float) -> int:
    return int(np.isnan(b)) - int(np.isnan(a))


def _ordered_tight(a: float, b: float) -> int:
    high, low = (np.inf if np.isnan(x) else x for x in (b, a))
    return int(np.sign(high - low)) if high != low else 0


def _one(key: Array) -> Array:
    """A key that is the same at every sample as a single number: flaps seldom move."""
    return np.asarray(key.flat[0]) if key.size and key.min() == key.max() else key


def _setting_in_force(flap_angle: Array, listed: Array) -> Array:
    """Row setting that holds; past a last setting that is "up" nothing does, unless no row is without flaps."""
    setting = np.asarray(flap_setting_in_force(flap_angle, listed))
    if np.isnan(listed).any():
        # rows for any flaps exist: a table that lists only "up" is not stretched to flaps that are out
        only_up = ~(listed[np.isfinite(listed)] > 0.0).any()
        if only_up:
            setting = np.where(past_last_setting(flap_angle, listed), np.inf, setting)
        if not np.isfinite(listed).any():
            setting = np.zeros_like(setting)
    return setting


@quiet
def load_factor_maximum(
    flap_angle: ArrayLike,
    mass: ArrayLike,
    airspeed: ArrayLike,
    airbrakes_out: ArrayLike,
    load_factor_table: LoadFactorTable,
) -> Array:
    """Positive limit load factor in force.

    Parameters
    ----------
    flap_angle : (n,) array, rad
    mass : (n,) array, kg
    airspeed : (n,) array, m/s, in the kind of `speed_up_to`
    airbrakes_out : (n,) array, 1 out, 0 in
    load_factor_table : LoadFactorTable

    Returns
    -------
    (n,) array, 1. Above the last `mass_up_to` the limit is last x m_last / m; above the last `speed_up_to` the last
    row holds. Where no row is the tightest the most protective of the tight ones holds. NaN where no row holds, and
    where a key that could decide is NaN; a key that no row asks for may be NaN.

    Source
    ------
    [COMMON-PRACTICE]; shrinking with mass: [NAVWEPS-00-80T-80] n = n_ref m_ref / m.
    """
    flaps, m, speed, brakes = floats(flap_angle), floats(mass), floats(airspeed), floats(airbrakes_out)
    return _limit(load_factor_table.maximum, flaps, m, speed, brakes, load_factor_table, 1.0)


@quiet
def load_factor_minimum(
    flap_angle: ArrayLike,
    mass: ArrayLike,
    airspeed: ArrayLike,
    airbrakes_out: ArrayLike,
    load_factor_table: LoadFactorTable,
) -> Array:
    """Negative limit load factor in force.

    Parameters, Returns and Source: as in `load_factor_maximum` ("protective" is the greater value here).
    """
    flaps, m, speed, brakes = floats(flap_angle), floats(mass), floats(airspeed), floats(airbrakes_out)
    return _limit(load_factor_table.minimum, flaps, m, speed, brakes, load_factor_table, -1.0)


@quiet
def overweight_for_limits(mass: ArrayLike, load_factor_table: LoadFactorTable) -> Mask:
    """Whether the mass is above every `mass_up_to` of the table, so that the limit is a shrunken one (say it).

    Parameters: mass : (n,) array, kg; load_factor_table : LoadFactorTable.
    Returns: (n,) array of bool; False for NaN and where no row is keyed by mass.
    Source: [COMMON-PRACTICE].
    """
    listed = load_factor_table.mass_up_to
    m = floats(mass)
    if not np.isfinite(listed).any():
        return np.zeros(m.shape, dtype=bool)
    return np.asarray(m > np.nanmax(listed))


@quiet
def load_factor_maximum_rolling(
    load_factor_maximum: ArrayLike, roll_rate: ArrayLike, rolling_factor: float, rolling_above: float
) -> Array:
    """Positive limit load factor with the reduction while rolling.

    Parameters
    ----------
    load_factor_maximum : (n,) array, 1
    roll_rate : (n,) array, rad/s, either side
    rolling_factor : of the positive limit, 0 to 1
    rolling_above : rad/s; the reduction holds above this size of the roll rate

    Returns
    -------
    (n,) array, 1. NaN where an input is: an unknown roll rate leaves the limit unknown; where the rate is not
    recorded at all, do not call this, and say so.

    Source
    ------
    [14CFR23-OLD] 23.349(b) and [14CFR25] 25.349(a) use two thirds; the figure is the manual's.
    """
    limit, rate = floats(load_factor_maximum), np.abs(floats(roll_rate))
    return where(~np.isnan(rate), np.where(rate > rolling_above, limit * rolling_factor, limit))


@quiet
def load_factor_at_mass(load_factor: ArrayLike, mass: ArrayLike, reference_mass: ArrayLike) -> Array:
    """Load factor that loads the wing alike at another mass: n m_ref / m.

    Parameters: load_factor : (n,) array, 1, at reference_mass; mass, reference_mass : (n,) arrays, kg.
    Returns: (n,) array, 1. NaN where a mass is not positive. Says nothing on parts of fixed mass (engine mounts), so no
    limit may be raised by it.
    Source: [NAVWEPS-00-80T-80].
    """
    m, reference = floats(mass), floats(reference_mass)
    return where((m > 0.0) & (reference > 0.0), floats(load_factor) * reference / m)


@quiet
def load_factor_margin(load_factor: ArrayLike, load_factor_maximum: ArrayLike, load_factor_minimum: ArrayLike) -> Array:
    """Distance to the nearer limit; negative outside.

    Parameters: load_factor, load_factor_maximum, load_factor_minimum : (n,) arrays, 1.
    Returns: (n,) array, 1. NaN where the load factor is NaN or either limit is: one side alone could hide the other.
    Source: [DEFINITION].
    """
    n = floats(load_factor)
    return finite(np.minimum(floats(load_factor_maximum) - n, n - floats(load_factor_minimum)))
