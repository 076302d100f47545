"""The boundary of a V-n diagram and the speeds about it, from an aeroplane's documents at one mass, altitude, flaps."""

from __future__ import annotations

import itertools
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import numpy as np

from exceed.core.diagrams import Airspeeds, SpeedRow
from exceed.derive.corrections import PositionError, calibrated_from_indicated, indicated_from_calibrated
from exceed.derive.facts import Facts
from exceed.physics import airspeed, atmosphere, envelope, load_limits, stall, tables

if TYPE_CHECKING:
    from exceed.documents.aircraft import Aircraft, SpeedLimit

MEETS = "stall line meets positive limit"
MEETS_BELOW = "stall line meets negative limit"
UP_WITHIN = float(tables.FLAP_TOLERANCE)
# name in the aircraft file -> symbol and words; airbrakes, tow and winch have no limit of the plain diagram
SPEEDS: dict[str, tuple[str, str]] = {
    "manoeuvring": ("V_A", "manoeuvring speed"),
    "turbulence": ("V_B", "turbulence speed"),
    "normal_operating": ("V_NO", "normal operating speed"),
    "never_exceed": ("V_NE", "never-exceed speed"),
    "maximum_operating": ("V_MO", "maximum operating speed"),
    "gear_operating": ("V_LO", "gear operating speed"),
    "gear_extended": ("V_LE", "gear extended speed"),
    "airbrakes": ("", "airbrakes speed"),
    "aerotow": ("V_T", "aerotow speed"),
    "winch": ("V_W", "winch speed"),
}
MACHS: dict[str, tuple[str, str]] = {
    "maximum_operating": ("M_MO", "maximum operating Mach number"),
    "never_exceed": ("M_NE", "never-exceed Mach number"),
}
ENDS = ("never_exceed", "maximum_operating")
SHORT = {
    "indicated_airspeed": "IAS",
    "calibrated_airspeed": "CAS",
    "equivalent_airspeed": "EAS",
    "true_airspeed": "TAS",
}


def finite(value: float) -> float | None:
    """A number, or None for what is not known."""
    return float(value) if np.isfinite(value) else None


@dataclass(frozen=True, slots=True)
class Air:
    """Where the diagram is drawn, and the way between the kinds of airspeed there (standard atmosphere)."""

    pressure_altitude: float
    flaps: float
    position_error: PositionError | None

    def to_equivalent(self, value: float, kind: str | None) -> float:
        """m/s EAS of a speed of a kind (none named: indicated, as manuals mean it)."""
        if kind == "equivalent_airspeed":
            return value
        if kind == "true_airspeed":
            air = atmosphere.standard_temperature(self.pressure_altitude)
            return float(airspeed.equivalent_airspeed_from_true(value, self.pressure_altitude, air))
        calibrated = value
        if kind != "calibrated_airspeed" and self.position_error is not None:
            calibrated = float(calibrated_from_indicated(*self._at(value))[0])
        return float(airspeed.equivalent_airspeed(calibrated, self.pressure_altitude))

    def from_equivalent(self, value: float, kind: str | None) -> float:
        """A speed of a kind, m/s, of m/s EAS."""
        if kind == "equivalent_airspeed":
            return value
        if kind == "true_airspeed":
            air = atmosphere.standard_temperature(self.pressure_altitude)
            return float(airspeed.true_airspeed_from_equivalent(value, self.pressure_altitude, air))
        calibrated = float(airspeed.calibrated_airspeed_from_equivalent(value, self.pressure_altitude))
        if kind == "calibrated_airspeed" or self.position_error is None:
            return calibrated
        return float(indicated_from_calibrated(*self._at(calibrated))[0])

    def _at(self, value: float) -> tuple[Any, PositionError, Any]:
        assert self.position_error is not None
        return np.array([value]), self.position_error, np.array([self.flaps])

    def kinds(self, equivalent: float) -> Airspeeds:
        """The speed in all kinds; IAS is CAS where no position error is known, which the notes say."""
        return Airspeeds(
            finite(equivalent),
            finite(self.from_equivalent(equivalent, "calibrated_airspeed")),
            finite(self.from_equivalent(equivalent, "indicated_airspeed")),
        )

    def given(self, value: float, kind: str | None) -> Airspeeds:
        """A speed of a kind in all kinds; its own stays to the last digit as the manual has it."""
        found = self.kinds(self.to_equivalent(value, kind))
        own = {"equivalent_airspeed": "equivalent", "calibrated_airspeed": "calibrated", "true_airspeed": None}
        name = own.get(kind or "", "indicated")
        return found if name is None else replace(found, **{name: value})


@dataclass(frozen=True, slots=True)
class SpeedEnd:
    """Where the diagram ends: m/s EAS, the key it comes from, and its symbol."""

    equivalent: float
    source: str
    symbol: str


def mass_used(facts: Facts, mass: float | None) -> tuple[float | None, str]:
    """The mass asked for, else the heaviest that the documents know, and which it is."""
    if mass is not None:
        return mass, "as asked for"
    if facts.maximum_take_off is not None:
        return facts.maximum_take_off, "maximum take-off mass"
    table = facts.values.get("stall_table")
    return (float(table.mass[0]), "mass of the stall speeds") if table is not None else (None, "not known")


# --- speeds ------------------------------------------------------------------------------------------------------


def speeds_of(
    aircraft: Aircraft, air: Air, mass: float | None
) -> tuple[dict[str, SpeedRow], tuple[SpeedRow, ...], list[tuple[str, str]]]:
    """The manual's speeds and its Mach numbers at the conditions, and those that cannot be had: (which, why)."""
    found: dict[str, SpeedRow] = {}
    unknown: list[tuple[str, str]] = []
    for name, (symbol, title) in SPEEDS.items():
        limit = getattr(aircraft.speeds, name)
        if limit is None:
            continue
        value, said = _limit_value(limit, air, mass)
        if value is None:
            unknown.append((f"{symbol}, {title}".removeprefix(", "), said))
            continue
        speed = air.given(value, limit.airspeed)
        found[name] = SpeedRow(symbol, title, speed, f"speeds.{name}", limit.airspeed, notes=(said,) if said else ())
    if abs(air.flaps) > UP_WITHIN and aircraft.speeds.flaps_extended:
        rows = aircraft.speeds.flaps_extended
        settings = [np.pi if row.flaps is None else float(row.flaps) for row in rows]
        table = tables.StepTable(np.array(settings), np.array([float(row.maximum) for row in rows]))
        value = float(tables.flaps_extended_speed(air.flaps, table))
        kind = rows[0].maximum.airspeed
        past = bool(tables.past_last_setting(air.flaps, table.flap_angle))
        said = "past the last setting listed: the last one holds" if past else ""
        speed = air.given(value, kind)
        found["flaps_extended"] = SpeedRow(
            "V_FE", "flaps extended speed", speed, "speeds.flaps_extended", kind, notes=(said,) if said else ()
        )
    machs = []
    for name, (symbol, title) in MACHS.items():
        limit = getattr(aircraft.mach, name)
        if limit is None:
            continue
        value, said = _limit_value(limit, air, mass)
        if value is None:
            unknown.append((f"{symbol}, {title}", said))
            continue
        equivalent = float(airspeed.equivalent_airspeed_from_mach(value, air.pressure_altitude))
        machs.append(
            SpeedRow(symbol, title, air.kinds(equivalent), f"mach.{name}", "mach", value, notes=(said,) if said else ())
        )
    return found, tuple(machs), unknown


def _limit_value(limit: SpeedLimit, air: Air, mass: float | None) -> tuple[float | None, str]:
    """A speed limit at the conditions, in its own kind; None with the reason where it cannot be had."""
    if limit.value is not None:
        if limit.scale == "sqrt_mass" and limit.mass is not None:
            if mass is None:
                return None, "goes with the root of mass, and the mass is not known"
            said = f"{limit.value} at {limit.mass}, with the root of mass as the manual says"
            return float(limit.value) * float(np.sqrt(mass / float(limit.mass))), said
        return float(limit.value), f"given at {limit.mass}, not scaled" if limit.mass is not None else ""
    at = np.array([float(x) for x, _ in limit.points])
    values = np.array([float(y) for _, y in limit.points])
    if limit.over == "flaps":
        setting = float(tables.flap_setting_in_force(air.flaps, at))
        place = np.flatnonzero(at == setting)
        if place.size:
            return float(values[place[0]]), f"row {limit.points[int(place[0])][0]}"
        return float(values[0]), f"no row for flaps up: that of {limit.points[0][0]}"
    where = mass if limit.over == "mass" else air.pressure_altitude
    if where is None:
        return None, "given over mass, and the mass is not known"
    table = tables.Table(at, values)
    words = str(limit.over).replace("_", " ")
    said = f"from its table over {words}"
    if bool(tables.outside_table(table, where)):
        said += ", beyond whose ends the last value is held"
    return float(tables.table_value(table, where)), said


def speed_end(speeds: dict[str, SpeedRow], machs: tuple[SpeedRow, ...]) -> SpeedEnd | None:
    """The lowest speed limit that holds: V_NE, V_MO, their Mach numbers, with flaps out V_FE."""
    rows = [speeds[name] for name in (*ENDS, "flaps_extended") if name in speeds] + list(machs)
    known = [(row.speed.equivalent, row) for row in rows if row.speed.equivalent is not None]
    if not known:
        return None
    value, row = min(known, key=lambda pair: pair[0])
    return SpeedEnd(value, row.source, row.symbol)


# --- boundary ----------------------------------------------------------------------------------------------------


def stall_speeds(facts: Facts, mass: float | None, flaps: float) -> tuple[float, float]:
    """1 g stall speeds upright and inverted, m/s EAS; NaN where not known."""
    table = facts.values.get("stall_table")
    if table is None or mass is None:
        return float("nan"), float("nan")
    return float(stall.stall_speed_1g(mass, flaps, table)), float(stall.stall_speed_1g_inverted(mass, flaps, table))


def limits_of(facts: Facts, air: Air, mass: float | None, speed: float, brakes: float = 0.0) -> tuple[float, float]:
    """Limit load factors at a speed in the kind that the rows ask for."""
    table = facts.values.get("load_factor_table")
    if table is None:
        return float("nan"), float("nan")
    keys = (air.flaps, np.nan if mass is None else mass, speed, brakes, table)
    return float(load_limits.load_factor_maximum(*keys)), float(load_limits.load_factor_minimum(*keys))


def steps_of(facts: Facts, air: Air, end: float) -> list[tuple[float, float, float, float]]:
    """Stretches of speed with the same row: from and to in EAS, and in the kind that the rows ask for."""
    table = facts.values.get("load_factor_table")
    kind = facts.aliases.get("limit_airspeed")
    places = [] if table is None else np.unique(table.speed_up_to[np.isfinite(table.speed_up_to)]).tolist()
    edges = [(0.0, 0.0)]
    for place in places:
        equivalent = air.to_equivalent(place, kind)
        if edges[-1][0] < equivalent < end:
            edges.append((equivalent, place))
    edges.append((end, air.from_equivalent(end, kind) if places else end))
    return [(low[0], high[0], low[1], high[1]) for low, high in itertools.pairwise(edges)]


def boundary(
    facts: Facts, air: Air, mass: float | None, stalls: tuple[float, float], end: float, points: int = 201
) -> envelope.Envelope:
    """The boundary by stretches of speed, each with its own limits, and its corners from the 1 g stall clockwise.

    Unlike `physics.envelope.envelope` limits may step with speed, and sides that are not known are left out.
    """
    upright, inverted = stalls
    steps = steps_of(facts, air, end)
    limits = [limits_of(facts, air, mass, 0.5 * (low + high)) for _, _, low, high in steps]
    top: list[envelope.Corner] = []
    bottom: list[envelope.Corner] = []
    if upright <= end:
        top.append(envelope.Corner("stall at 1 g", upright, 1.0))
    if inverted <= end and limits[0][1] <= -1.0:
        bottom.append(envelope.Corner("inverted stall at -1 g", inverted, -1.0))
    marked = [*(step[1] for step in steps), *(speed for speed in stalls if speed <= end)]
    speed = np.unique(np.concatenate([np.linspace(0.0, end, points), marked]))
    pieces: list[tuple[Any, Any, Any]] = []
    for turn, ((low, high, *_), (most, least)) in enumerate(zip(steps, limits, strict=True)):
        last = turn == len(steps) - 1
        inside = [low, *speed[(speed > low) & (speed < high)].tolist(), high]
        for side, stall_at, limit, meets, corners in (
            (1.0, upright, most, MEETS, top),
            (-1.0, inverted, least, MEETS_BELOW, bottom),
        ):
            words = "positive" if side > 0 else "negative"
            size = side * limit
            meeting = stall_at * np.sqrt(size) if size > 0.0 else float("nan")
            if low < meeting <= high:
                corners.append(envelope.Corner(meets, float(meeting), limit))
                inside.append(float(meeting))
            for edge, wanted, name in (
                (low, turn > 0, f"{words} limit from here"),
                (high, not last, f"{words} limit up to here"),
                (high, last, f"speed limit, {words} limit"),
            ):
                value = _at(edge, stall_at, limit, side)
                if wanted and np.isfinite(value) and meeting != edge:
                    # where the stall line lies below the limit, the corner is the stall line's
                    on_stall = abs(value) < abs(limit) - 1e-12
                    title = name.replace(f"{words} limit", f"{words} stall line") if on_stall else name
                    corners.append(envelope.Corner(title, edge, value))
        at = np.unique(np.array(inside))
        upper = np.array([_at(v, upright, most, 1.0, line=True) for v in at])
        lower = np.array([_at(v, inverted, least, -1.0, line=True) for v in at])
        pieces.append((at, upper, lower))
    corners = _in_order(top) + _in_order(bottom)[::-1]
    return envelope.Envelope(
        np.concatenate([piece[0] for piece in pieces]),
        np.concatenate([piece[1] for piece in pieces]),
        np.concatenate([piece[2] for piece in pieces]),
        tuple(corners),
    )


def _at(speed: float, stall_at: float, limit: float, side: float, *, line: bool = False) -> float:
    """Boundary at a speed, NaN where not known; `line` asks for the stall line too, not for the limit alone."""
    if not np.isfinite(limit):
        return float("nan")
    if side * limit <= 0.0:
        return limit  # a limit at or across zero lift needs no stall line
    if not np.isfinite(stall_at):
        return float("nan") if line else limit
    return side * min(float(stall.load_factor_at_stall(speed, stall_at)), side * limit)


def _in_order(corners: list[envelope.Corner]) -> list[envelope.Corner]:
    """By speed; corners of one speed, where a limit steps, stay as they were made: before the step, then after."""
    return sorted(corners, key=lambda corner: corner.equivalent_airspeed)
