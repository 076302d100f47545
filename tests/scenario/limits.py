"""The limits of the three invented aeroplanes as arrays over a flight: what the truth is held against.

The figures repeat `sample_logs/aircraft/*.yaml` by hand (a test compares them); the rules for using them are those
of the aircraft file's format: flaps within 1 deg of zero are up, beyond that the smallest listed setting holds.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from scenario.air import DEG, FT, KT, Array
from scenario.flight import Flight
from scenario.sensors import beyond

LOAD_FACTOR: dict[str, list[tuple[float, float | None, float, float]]] = {
    "ZZ-NMA": [(0.0, 880.0, 6.0, -3.0), (0.0, 960.0, 4.4, -1.76), (30.0, None, 2.0, 0.0)],
    "ZZ-NMC": [(0.0, None, 3.8, -1.52), (35.0, None, 2.0, 0.0)],
    "ZZ-NMJ": [(0.0, None, 3.4, -1.36), (35.0, None, 2.0, 0.0)],
}
FLAPS_EXTENDED = {
    "ZZ-NMA": [(10.0, 110.0), (30.0, 90.0)],
    "ZZ-NMC": [(10.0, 110.0), (20.0, 95.0), (35.0, 85.0)],
    "ZZ-NMJ": [(15.0, 190.0), (35.0, 155.0)],
}
MAXIMUM_SPEED = {  # (pressure altitude in ft, KIAS): V_NE, or V_MO of the jet
    "ZZ-NMA": [(0.0, 175.0), (15000.0, 160.0)],
    "ZZ-NMC": [(0.0, 163.0)],
    "ZZ-NMJ": [(0.0, 265.0)],
}
MAXIMUM_MACH = {"ZZ-NMJ": 0.70}
GEAR_EXTENDED = {"ZZ-NMJ": 180.0}
FLAPS_NOT_RECORDED = {"ZZ-NMA"}


def load_factor_limits(flight: Flight) -> tuple[Array, Array]:
    """Positive and negative limit at each instant, by flaps (as the program can know them) and mass."""
    registration = flight.airframe.registration
    flaps, mass = flight["flap_angle"] / DEG, flight["mass"]
    if registration in FLAPS_NOT_RECORDED:
        flaps = np.zeros_like(flaps)
    highest, lowest = np.full(len(mass), np.nan), np.full(len(mass), np.nan)
    up = flaps <= 1.0
    for setting, mass_up_to, most, least in LOAD_FACTOR[registration]:
        rows = up if setting == 0.0 else ~up
        rows = rows & np.isnan(highest) & (mass <= (mass_up_to or np.inf))
        highest[rows], lowest[rows] = most, least
    return highest, lowest


def flap_speed(flight: Flight) -> Array:
    """V_FE in m/s IAS at each instant, infinite with flaps up."""
    flaps = flight["flap_angle"] / DEG
    out = np.full(len(flaps), np.inf)
    for setting, speed in reversed(FLAPS_EXTENDED[flight.airframe.registration]):
        out[flaps - 1.0 <= setting] = speed * KT
    out[flaps <= 1.0] = np.inf
    return out


def maximum_speed(flight: Flight) -> Array:
    table = np.asarray(MAXIMUM_SPEED[flight.airframe.registration])
    return np.asarray(np.interp(flight["pressure_altitude"] / FT, table[:, 0], table[:, 1]) * KT)


@dataclass(frozen=True, slots=True)
class Excess:
    """A true stretch beyond a limit, in the units of the trade; times in s of the flight."""

    family: str
    quantity: str
    unit: str
    side: str
    limit: float
    peak: float
    peak_s: float
    start_s: float
    end_s: float


def excesses(flight: Flight, joining: float = 1.0) -> list[Excess]:
    """Every true stretch beyond an airframe limit in flight; stretches nearer than `joining` s count as one."""
    airborne = (flight["weight_on_wheels"] < 0.5) & (flight.time > 0)
    highest, lowest = load_factor_limits(flight)
    indicated = flight["indicated_airspeed"] / KT
    cases = [
        ("positive load factor", "load_factor", "g", "above", flight["load_factor"], highest),
        ("negative load factor", "load_factor", "g", "below", flight["load_factor"], lowest),
        ("maximum speed", "indicated_airspeed", "kt", "above", indicated, maximum_speed(flight) / KT),
    ]
    registration = flight.airframe.registration
    if registration not in FLAPS_NOT_RECORDED:
        cases.append(("flap speed", "indicated_airspeed", "kt", "above", indicated, flap_speed(flight) / KT))
    if registration in MAXIMUM_MACH:
        limit = np.full(len(indicated), MAXIMUM_MACH[registration])
        cases.append(("maximum Mach number", "mach", "", "above", flight["mach"], limit))
        gear = np.where(flight["gear_down"] > 0.5, GEAR_EXTENDED[registration], np.inf)
        cases.append(("gear speed", "indicated_airspeed", "kt", "above", indicated, gear))
    found: list[Excess] = []
    for family, quantity, unit, side, values, limit in cases:
        sign = 1.0 if side == "above" else -1.0
        over = np.where(airborne & np.isfinite(limit), sign * (values - np.nan_to_num(limit, posinf=1e9)), -1.0)
        stretches: list[tuple[float, float, float, float]] = []
        for begin, finish, most, when in beyond(flight.time, over, 0.0):
            if stretches and begin - stretches[-1][1] < joining:
                old = stretches[-1]
                best = old if old[2] >= most else (begin, finish, most, when)
                stretches[-1] = (old[0], finish, best[2], best[3])
            else:
                stretches.append((begin, finish, most, when))
        for begin, finish, _, when in stretches:
            at = round(when * 100)
            found.append(Excess(family, quantity, unit, side, float(limit[at]), float(values[at]), when, begin, finish))
    return found
