"""What is to be said of a V-n diagram: what is not known and why, and what was taken for granted."""

from __future__ import annotations

import numpy as np

from exceed.boundary import ENDS, UP_WITHIN, Air, SpeedEnd
from exceed.core.diagrams import GustRow, LimitRow, SpeedRow
from exceed.derive.facts import Facts
from exceed.documents.aircraft import Aircraft
from exceed.physics import load_limits, stall, tables

Missing = list[tuple[str, str]]


def what_is_missing(
    aircraft: Aircraft,
    facts: Facts,
    air: Air,
    mass: float | None,
    stalls: tuple[float, float],
    limits: tuple[LimitRow, ...],
    speeds: dict[str, SpeedRow],
    end: SpeedEnd | None,
) -> Missing:
    silent = "only the category is known" if aircraft.assumed else "the aircraft file does not give it"
    found: Missing = []
    if not np.isfinite(stalls[0]):
        found.append(("stall line, corners at it", silent if "stall_table" in facts.missing else "mass not known"))
    lowest = min((row.minimum for row in limits if row.minimum is not None), default=-1.0)
    if not np.isfinite(stalls[1]) and lowest < 0.0:
        where = "" if "stall_table" in facts.missing or abs(air.flaps) <= UP_WITHIN else " with these flaps"
        found.append(("negative stall line", f"inverted stall speed{where} not known"))
    for side in ("maximum", "minimum"):
        if not any(getattr(row, side) is not None for row in limits):
            why = "no row holds at this mass and these flaps" if limits else silent
            if limits and mass is None and facts.aliases.get("limit_mass"):
                why = "the rows go by mass, and the mass is not known"
            found.append(("positive limit" if side == "maximum" else "negative limit", why))
    if end is None:
        found.append(("speed limit, corners at it", f"V_NE, V_MO: {silent}"))
    if aircraft.speeds.manoeuvring is None:
        found.append(("V_A, manoeuvring speed", silent))
    if aircraft.speeds.normal_operating is None and not any(name in speeds for name in ENDS[1:]):
        found.append(("V_NO, normal operating speed", silent))
    if abs(air.flaps) > UP_WITHIN and "flaps_extended" not in speeds:
        found.append(("V_FE, flaps extended speed", silent))
    if aircraft.rolling is None:
        found.append(("limit while rolling", f"{silent}; many manuals lower the positive limit"))
    return found


def what_to_say(
    aircraft: Aircraft,
    facts: Facts,
    air: Air,
    mass: float | None,
    speeds: dict[str, SpeedRow],
    stalls: tuple[float, float],
    limits: tuple[LimitRow, ...],
    gusts: tuple[GustRow, ...],
) -> list[str]:
    notes = list(facts.notes)
    if aircraft.assumed:
        notes.append("limit load factors are assumed: those of the category, not of the aeroplane's own manual")
    if mass is not None and not aircraft.assumed:
        top, empty = facts.maximum_take_off, facts.empty_mass
        if top is not None and mass > top:
            notes.append(f"this mass is above the maximum take-off mass of {top:.0f} kg")
        if empty is not None and mass < empty:
            notes.append(f"this mass is below the empty mass of {empty:.0f} kg")
    limit_table = facts.values.get("load_factor_table")
    if limit_table is not None:
        if mass is not None and bool(load_limits.overweight_for_limits(mass, limit_table)):
            notes.append("this mass is above all masses listed for the limit load factors: they shrink as m_last / m")
        if bool(tables.past_last_setting(air.flaps, limit_table.flap_angle)):
            notes.append("flaps past the last setting listed for the limit load factors: the last one holds")
        elif abs(air.flaps) > UP_WITHIN and np.isfinite(limit_table.flap_angle).any():
            row = np.degrees(float(tables.flap_setting_in_force(air.flaps, limit_table.flap_angle)))
            words = "flaps out" if aircraft.assumed else f"flaps {row:.0f} deg"
            notes.append(f"limit load factors are those listed for {words}")
    stall_table = facts.values.get("stall_table")
    if stall_table is not None and mass is not None and (stall_table.mass != mass).any():
        notes.append(f"stall speeds are taken to {mass:.0f} kg with the root of mass")
    if air.position_error is None:
        notes.append("no position error is known: IAS is taken as CAS")
    elif any(_beyond(air, row) for row in speeds.values()) or _beyond_speed(air, stalls):
        notes.append("beyond the ends of the position error's table its last correction is held")
    if abs(air.flaps) <= UP_WITHIN:  # the manual's V_A is one of flaps up
        notes += _manoeuvring_note(speeds, stalls, limits)
    if gusts:
        notes.append(
            "gusts of 14 CFR 23.333(c), formula of 23.341(c), standard atmosphere; V_NO (or V_MO) stands for the design"
            " cruise speed, V_NE for the design dive speed, which no manual gives"
        )
    notes.append("limit, not ultimate, load factors; symmetric flight but for the rows that say otherwise")
    return notes


def _beyond(air: Air, row: SpeedRow) -> bool:
    return row.speed.indicated is not None and _outside(air, row.speed.indicated)


def _beyond_speed(air: Air, stalls: tuple[float, float]) -> bool:
    return any(_outside(air, air.from_equivalent(speed, None)) for speed in stalls if np.isfinite(speed))


def _outside(air: Air, indicated: float) -> bool:
    error = air.position_error
    return error is not None and not any(row[0] - 1e-9 <= indicated <= row[-1] + 1e-9 for row in error.indicated)


def _manoeuvring_note(
    speeds: dict[str, SpeedRow], stalls: tuple[float, float], limits: tuple[LimitRow, ...]
) -> list[str]:
    """What a full pull at the manual's V_A gives: V_A is no promise that the wing stalls before the limit."""
    row = speeds.get("manoeuvring")
    limit = next((one.maximum for one in limits if one.condition == "" and one.maximum is not None), None)
    if row is None or row.speed.equivalent is None or not np.isfinite(stalls[0]) or limit is None:
        return []
    gives = float(stall.load_factor_at_stall(row.speed.equivalent, stalls[0]))
    side = "beyond" if gives > limit else "inside"
    return [f"at the manual's V_A the wing stalls at {gives:.2f} g, {abs(gives - limit):.2f} g {side} the limit"]
