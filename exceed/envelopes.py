"""The V-n diagram of an aeroplane at one mass, altitude and flap setting, from its documents, in all its figures.

What the manual says and what is computed are never mixed: every figure carries its source, what is missing its reason.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np

from exceed.boundary import (
    MEETS,
    UP_WITHIN,
    Air,
    SpeedEnd,
    boundary,
    finite,
    limits_of,
    mass_used,
    speed_end,
    speeds_of,
    stall_speeds,
)
from exceed.core.constants import FOOT
from exceed.core.diagrams import CornerRow, EnvelopeOutcome, GustRow, LimitRow, SpeedRow
from exceed.core.outcome import AircraftInfo, EnvelopeLine
from exceed.core.units import UNITS
from exceed.derive.facts import Facts, facts_of
from exceed.documents.aircraft import CATEGORIES, Aircraft, category_aircraft, load_aircraft
from exceed.documents.values import ValueFault, parse
from exceed.envelope_notes import Missing, what_is_missing, what_to_say
from exceed.errors import Problem, UsageError
from exceed.physics import atmosphere, category, envelope, gust, load_limits
from exceed.physics.atmosphere import LOWEST_ALTITUDE

HIGHEST_ALTITUDE = 25000.0  # m; the standard atmosphere reaches further, no manual does
# the categories whose gusts the formula of the older part 23 was written for; the very light codes took it over
GUST_CATEGORIES = (None, "normal", "utility", "aerobatic", "commuter", "very-light", "light-sport")


def envelope_at(aircraft: Aircraft, mass: float | None, flaps: float = 0.0) -> envelope.Envelope | None:
    """The V-n boundary of an aeroplane at a mass (kg) and flap angle (rad) at sea level; None where its facts do not
    give one (stall speed, positive limit and speed limit are needed)."""
    facts = facts_of(aircraft)
    air = Air(0.0, flaps, facts.values.get("position_error"))
    weight, _ = mass_used(facts, mass)
    speeds, machs, _ = speeds_of(aircraft, air, weight)
    end = speed_end(speeds, machs)
    stalls = stall_speeds(facts, weight, flaps)
    if end is None or not np.isfinite(stalls[0]):
        return None
    found = boundary(facts, air, weight, stalls, end.equivalent)
    return found if np.isfinite(found.upper).any() else None


def envelope_asked(
    aircraft: str, mass: str | None = None, altitude: str | None = None, flaps: str | None = None
) -> EnvelopeOutcome:
    """`envelope_of` from texts as a user gives them. aircraft : a file, or a category (mass is then its maximum
    take-off mass). Raises UsageError and DocumentError with all that is wrong."""
    problems: list[Problem] = []
    weight = _asked(problems, "--mass", mass, "mass", "900 kg", (1.0, 1e6))
    height = _asked(problems, "--altitude", altitude, "length", "5000 ft", (LOWEST_ALTITUDE, HIGHEST_ALTITUDE))
    angle = _asked(problems, "--flaps", flaps, "angle", "10 deg", (np.radians(-20.0), np.radians(90.0)))
    if problems:
        raise UsageError(*problems)
    word = not Path(aircraft).exists() and "/" not in aircraft and not aircraft.endswith((".yaml", ".yml"))
    if aircraft in CATEGORIES or word:
        try:
            known = category_aircraft(aircraft, weight)
        except UsageError as error:  # what is an option elsewhere is the argument here
            raise UsageError(*(replace(one, place="AIRCRAFT") for one in error.problems)) from error
    else:
        known = load_aircraft(Path(aircraft))
    if known.flaps == "none" and abs(angle or 0.0) > UP_WITHIN:
        raise UsageError(
            Problem(
                "--flaps", f"flaps are set to {flaps}, and this aeroplane has none", "no flaps", "leave --flaps out"
            )
        )
    return envelope_of(known, weight, height or 0.0, angle or 0.0)


def _asked(
    problems: list[Problem], option: str, text: str | None, kind: str, example: str, bounds: tuple[float, float]
) -> float | None:
    """An option's value in SI, within what can be meant; None where it is not given or wrong (then a problem more)."""
    if text is None:
        return None
    try:
        value = parse(text, kind, airspeed="refused")
    except ValueFault as error:
        problems.append(Problem(option, error.problem, error.expected, error.do or f"write it as '{example}'"))
        return None
    if not bounds[0] <= value <= bounds[1]:
        unit = UNITS[value.unit]
        low, high = ((bound - unit.offset) / unit.factor for bound in bounds)
        expected = f"{low:.6g} to {high:.6g} {value.unit}"
        problems.append(Problem(option, f"'{text}' is out of range", expected, f"write it as '{example}'"))
        return None
    return float(value)


def envelope_of(
    aircraft: Aircraft, mass: float | None = None, pressure_altitude: float = 0.0, flaps: float = 0.0
) -> EnvelopeOutcome:
    """Everything that the documents of an aeroplane say of its V-n diagram.

    Parameters: mass : kg, None for the maximum take-off mass; pressure_altitude : m; flaps : rad.
    Returns: EnvelopeOutcome; what is not known is in `missing`, what was taken for granted in `notes`.
    """
    facts = facts_of(aircraft)
    weight, mass_source = mass_used(facts, mass)
    air = Air(pressure_altitude, flaps, facts.values.get("position_error"))
    speeds, machs, unknown = speeds_of(aircraft, air, weight)
    end = speed_end(speeds, machs)
    stalls = stall_speeds(facts, weight, flaps)
    found = boundary(facts, air, weight, stalls, end.equivalent) if end is not None else None
    limits = _limit_rows(aircraft, facts, air, weight)
    corners = _corner_rows(found, air, end)
    gusts, no_gusts = _gusts(aircraft, air, weight, speeds, end)
    rows = [*speeds.values(), *machs]
    meeting = next((row for row in corners if row.name == MEETS), None)
    if meeting is not None:
        rows.insert(0, SpeedRow("V_S sqrt(n)", f"{MEETS}; computed, not V_A", meeting.speed, "computed"))
    missing = [*unknown, *what_is_missing(aircraft, facts, air, weight, stalls, limits, speeds, end), *no_gusts]
    return EnvelopeOutcome(
        aircraft=info_of(aircraft),
        mass=weight,
        mass_source=mass_source,
        pressure_altitude=pressure_altitude,
        flaps=flaps,
        corners=corners,
        speeds=tuple(rows),
        limits=limits,
        stalls=_stall_rows(air, stalls),
        gusts=gusts,
        missing=tuple(dict.fromkeys(missing)),
        notes=tuple(dict.fromkeys(what_to_say(aircraft, facts, air, weight, speeds, stalls, limits, gusts))),
        lines=_lines(found, end, stalls, limits, gusts, speeds.get("manoeuvring")),
    )


def info_of(aircraft: Aircraft) -> AircraftInfo:
    """What the outputs say of the aeroplane."""
    return AircraftInfo(
        registration=aircraft.registration,
        serial=aircraft.serial,
        type=aircraft.type,
        category=aircraft.category,
        limits="assumed" if aircraft.assumed else "own",
        source=aircraft.source,
        path=aircraft.path or None,
    )


def _corner_rows(found: envelope.Envelope | None, air: Air, end: SpeedEnd | None) -> tuple[CornerRow, ...]:
    if found is None or end is None:
        return ()
    rows = []
    for corner in found.corners:
        source = "load_factor"
        if "stall" in corner.name:
            source = "computed" if "meets" in corner.name or "line" in corner.name else "stall_speed"
        if corner.name.startswith("speed limit"):
            source = end.source
        speed = air.kinds(corner.equivalent_airspeed)
        # the corner says which speed limit ends the diagram
        name = corner.name.replace("speed limit", end.symbol)
        rows.append(CornerRow(name, speed, finite(corner.load_factor), source))
    return tuple(rows)


def _stall_rows(air: Air, stalls: tuple[float, float]) -> tuple[CornerRow, ...]:
    named = (("upright, level, 1 g", stalls[0], 1.0), ("inverted, level, -1 g", stalls[1], -1.0))
    return tuple(
        CornerRow(name, air.kinds(speed), load, "stall_speed") for name, speed, load in named if np.isfinite(speed)
    )


def _limit_rows(aircraft: Aircraft, facts: Facts, air: Air, mass: float | None) -> tuple[LimitRow, ...]:
    """Limits in force by stretches of speed; while rolling and with airbrakes out where the manual says so."""
    table = facts.values.get("load_factor_table")
    if table is None:
        return ()
    kind = facts.aliases.get("limit_airspeed")
    places = np.unique(table.speed_up_to[np.isfinite(table.speed_up_to)]).tolist()
    bounds = list(zip([None, *places], [*places, None], strict=True))
    rows = []
    source = f"category {aircraft.category}" if aircraft.assumed else "load_factor"
    for low, high in bounds:
        # the middle of a stretch stands for it; beyond the last bound any speed does
        inside = 0.5 * ((low or 0.0) + high) if high is not None else (low or 0.0) + 1.0
        most, least = limits_of(facts, air, mass, inside)
        about = {"speed_from": low, "speed_to": high, "kind": kind if places else None}
        rows.append(LimitRow("", finite(most), finite(least), source, **about))
        if aircraft.rolling is not None and np.isfinite(most):
            rolling = aircraft.rolling
            words = f"rolling faster than {rolling.above_roll_rate}"
            reduced = load_limits.load_factor_maximum_rolling(
                most, 2.0 * rolling.above_roll_rate, rolling.factor, rolling.above_roll_rate
            )
            rows.append(LimitRow(words, finite(float(reduced)), finite(least), "load_factor, rolling", **about))
        if (table.airbrakes == 1.0).any():
            most, least = limits_of(facts, air, mass, inside, 1.0)
            rows.append(LimitRow("airbrakes out", finite(most), finite(least), source, **about))
    return tuple(_to_dive_speed(aircraft, rows) if aircraft.assumed and abs(air.flaps) <= UP_WITHIN else rows)


def _to_dive_speed(aircraft: Aircraft, rows: list[LimitRow]) -> list[LimitRow]:
    """A category's limits as published: one pair up to a design speed, from there in a line to another at V_D."""
    if aircraft.category is None:
        return rows
    figures = category.category_load_factors(aircraft.category, aircraft.mass.maximum_take_off)
    first, *others = rows
    ends = (finite(figures.maximum_at_dive), finite(figures.minimum_at_dive))
    if ends == (first.maximum, first.minimum):
        return rows
    speed = "V_A" if aircraft.category.startswith("sailplane") else "V_C"
    if ends == (None, None):
        return [replace(first, condition=f"up to {speed}; beyond, the figures are not at hand"), *others]
    most, least = (first.maximum if ends[0] is None else ends[0]), (first.minimum if ends[1] is None else ends[1])
    return [
        replace(first, condition=f"up to {speed}"),
        LimitRow(f"at V_D, from {speed} in a line", most, least, first.source),
        *others,
    ]


# --- gusts -------------------------------------------------------------------------------------------------------


def _gusts(
    aircraft: Aircraft, air: Air, mass: float | None, speeds: dict[str, SpeedRow], end: SpeedEnd | None
) -> tuple[tuple[GustRow, ...], Missing]:
    """Load factors of the design gusts of 14 CFR 23.333(c) by the formula of 23.341(c), and why some are missing."""
    wing = aircraft.wing
    if aircraft.category not in GUST_CATEGORIES:
        return (), [("gust lines", f"the gusts of 14 CFR 23.333(c) are not those of category {aircraft.category}")]
    lacks = [
        words
        for words, value in (
            ("wing area", wing.area),
            ("mean chord", wing.mean_chord),
            ("lift curve slope", wing.lift_curve_slope),
            ("mass", mass),
        )
        if value is None
    ]
    if lacks:
        return (), [("gust lines", f"{', '.join(lacks)} not known")]
    area, chord, slope = (float(value or 0.0) for value in (wing.area, wing.mean_chord, wing.lift_curve_slope))
    if abs(air.flaps) > UP_WITHIN:
        wanted = [("flaps", "flaps_extended", "V_FE")]
    else:
        wanted = [("cruise", "normal_operating", "V_NO"), ("dive", "never_exceed", "V_NE")]
        if "normal_operating" not in speeds and "maximum_operating" in speeds:
            wanted[0] = ("cruise", "maximum_operating", "V_MO")
        if aircraft.category == "commuter":
            wanted.insert(0, ("rough-air", "turbulence", "V_B"))
    rows: list[GustRow] = []
    missing: Missing = []
    density = atmosphere.density(
        atmosphere.static_pressure(air.pressure_altitude), atmosphere.standard_temperature(air.pressure_altitude)
    )
    for sort, name, symbol in wanted:
        velocity = float(gust.design_gust_velocity(air.pressure_altitude, sort))
        equivalent = speeds[name].speed.equivalent if name in speeds else None
        if equivalent is None:
            missing.append((f"gust line of {velocity / FOOT:.0f} ft/s", f"no {symbol} known"))
            continue
        speed = speeds[name].speed
        if end is not None and end.equivalent < equivalent:  # high up a Mach number ends the diagram before
            equivalent, symbol, speed = end.equivalent, end.symbol, air.kinds(end.equivalent)
        change = float(
            gust.gust_load_factor_increment(velocity, equivalent, float(mass or 0.0), area, chord, slope, density)
        )
        if np.isfinite(change):
            rows.append(GustRow(velocity, symbol, speed, 1.0 + change, 1.0 - change))
    return tuple(rows), missing


# --- lines for the page ------------------------------------------------------------------------------------------


def _lines(
    found: envelope.Envelope | None,
    end: SpeedEnd | None,
    stalls: tuple[float, float],
    limits: tuple[LimitRow, ...],
    gusts: tuple[GustRow, ...],
    manoeuvring: SpeedRow | None,
) -> tuple[EnvelopeLine, ...]:
    if found is None or end is None:
        return ()
    speed = found.equivalent_airspeed
    rows: list[EnvelopeLine] = []
    plain = [row for row in limits if row.condition == ""]
    for label, values, side in (
        ("positive boundary", found.upper, "maximum"),
        ("negative boundary", found.lower, "minimum"),
    ):
        if np.isfinite(values).any():
            rows.append(EnvelopeLine(label, "load factor", speed, values))
        elif plain and getattr(plain[0], side) is not None:
            # without a stall line only the limit itself is known, and not from which speed on it can be reached
            limit = getattr(plain[0], side)
            words = label.replace("boundary", "limit, stall line not known")
            rows.append(EnvelopeLine(words, "limit alone", np.array([0.0, end.equivalent]), np.array([limit, limit])))
    ends = [float(row.load_factor[-1]) for row in rows]
    low, high = min([0.0, *ends]), max([0.0, *ends])
    edge = np.array([end.equivalent, end.equivalent])
    rows.append(EnvelopeLine(f"{end.symbol} speed limit", "speed", edge, np.array([low, high])))
    rolling = next((row.maximum for row in limits if row.condition.startswith("rolling")), None)
    if rolling is not None and stalls[0] * np.sqrt(rolling) < end.equivalent:
        # without a stall line the limit alone, from standstill
        start = stalls[0] * np.sqrt(rolling) if np.isfinite(stalls[0]) else 0.0
        at = np.array([start, end.equivalent])
        rows.append(EnvelopeLine("limit while rolling", "rolling", at, np.array([rolling, rolling])))
    if manoeuvring is not None and manoeuvring.speed.equivalent is not None:
        at = np.array([manoeuvring.speed.equivalent, manoeuvring.speed.equivalent])
        rows.append(EnvelopeLine("V_A of the manual", "V_A", at, np.array([0.0, high])))
    for row in gusts:
        if row.speed.equivalent is None:
            continue
        words = f"gust {row.velocity / FOOT:.0f} ft/s to {row.at}"
        at = np.array([row.speed.equivalent, 0.0, row.speed.equivalent])
        rows.append(EnvelopeLine(words, "gust", at, np.array([row.up, 1.0, row.down])))
    return tuple(rows)
