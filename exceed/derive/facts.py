"""An aircraft document -> facts by the names that derivations ask for; each one that is missing with its reason."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import numpy as np

from exceed.derive.corrections import PositionError, calibrated_from_indicated
from exceed.physics.load_limits import LoadFactorTable
from exceed.physics.stall import StallTable
from exceed.physics.tables import Table

if TYPE_CHECKING:
    from exceed.documents.aircraft import Aircraft, SpeedLimit

NO_AIRCRAFT = "no facts of the aeroplane are given"
# fact -> what it is called where it is missing
WORDS: dict[str, str] = {
    "position_error": "position error",
    "stall_table": "stall speed",
    "load_factor_table": "limit load factor",
    "manoeuvring": "manoeuvring speed",
    "wing_area": "wing area",
    "mean_chord": "mean chord of the wing",
    "lift_curve_slope": "lift curve slope",
    "accelerometer_position": "position of the accelerometer",
    "fuel_density": "density of the fuel",
}


@dataclass(frozen=True, slots=True, eq=False)
class Facts:
    """What derivations may ask of the aeroplane.

    values : fact -> numpy table or number in SI. missing : fact -> why. aliases : parameter of a limit ('limit_mass')
    -> the quantity that its rows ask for, or None where no row asks, so that nothing rests on a channel in vain.
    """

    values: Mapping[str, Any] = field(default_factory=lambda: MappingProxyType({}))
    missing: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))
    aliases: Mapping[str, str | None] = field(default_factory=lambda: MappingProxyType({}))
    flaps: str | None = None
    gear: str | None = None
    empty_mass: float | None = None
    maximum_take_off: float | None = None
    stall_speed: float | None = None  # clean, upright, at the heaviest: calibrated, m/s
    notes: tuple[str, ...] = ()

    def why_missing(self, name: str) -> str:
        return self.missing.get(name, f"no {WORDS.get(name, name.replace('_', ' '))} is known")


def facts_of(aircraft: Aircraft | None) -> Facts:
    """Facts by name. A category alone, or no aircraft at all, are usual cases: what is missing has its reason."""
    if aircraft is None:
        return Facts(missing=dict.fromkeys(WORDS, NO_AIRCRAFT))
    values: dict[str, Any] = {}
    notes: list[str] = []
    aliases: dict[str, str | None] = {}
    heaviest = _number(aircraft.mass.maximum_take_off)
    if aircraft.position_error:
        values["position_error"] = PositionError(
            tuple(float(row.flaps or 0.0) for row in aircraft.position_error),
            tuple(np.array([float(x) for x, _ in row.points]) for row in aircraft.position_error),
            tuple(np.array([float(y) for _, y in row.points]) for row in aircraft.position_error),
        )
        aliases["error_flap_angle"] = "flap_angle" if len(aircraft.position_error) > 1 else None
    stall = _stall_table(aircraft, values.get("position_error"), heaviest, notes)
    if stall is not None:
        values["stall_table"] = stall
    if aircraft.load_factor:
        values["load_factor_table"] = _load_factor_table(aircraft, aliases, notes)
    if aircraft.rolling is not None:
        values["rolling"] = (float(aircraft.rolling.factor), float(aircraft.rolling.above_roll_rate))
        aliases["limit_roll_rate"] = "roll_rate"
    else:
        aliases["limit_roll_rate"] = None
        if aircraft.load_factor:
            notes.append("the aircraft file gives no reduction of the load factor while rolling: none is applied")
    limit = aircraft.speeds.manoeuvring
    if limit is not None:
        values["manoeuvring"], aliases["manoeuvring_over"] = _speed_table(limit)
    for name, value in (
        ("wing_area", aircraft.wing.area),
        ("mean_chord", aircraft.wing.mean_chord),
        ("lift_curve_slope", aircraft.wing.lift_curve_slope),
        ("fuel_density", aircraft.fuel_density),
    ):
        if value is not None:
            values[name] = float(value)
    sensor = aircraft.recorder.accelerometer
    if sensor is not None and sensor.position is not None and any(float(x) != 0.0 for x in sensor.position):
        values["accelerometer_position"] = np.array([float(x) for x in sensor.position])
    missing = {name: f"the aircraft file has no {words}" for name, words in WORDS.items() if name not in values}
    return Facts(
        MappingProxyType(values),
        MappingProxyType(missing),
        MappingProxyType(aliases),
        aircraft.flaps,
        aircraft.gear,
        _number(aircraft.mass.empty),
        heaviest,
        _clean_stall(stall, heaviest),
        tuple(notes),
    )


def _number(value: float | None) -> float | None:
    return None if value is None else float(value)


def _stall_table(
    aircraft: Aircraft, position_error: PositionError | None, heaviest: float | None, notes: list[str]
) -> StallTable | None:
    rows = []
    for row in aircraft.stall_speed:
        mass = _number(row.mass) or heaviest
        if mass is None:
            notes.append("a stall speed without its mass, and no maximum take-off mass: the row is not used")
            continue
        flaps = float(row.flaps or 0.0)
        speeds = []
        for speed in (row.upright, row.inverted):
            if speed is None:
                speeds.append(np.nan)
                continue
            value = float(speed)
            if speed.airspeed == "indicated_airspeed":
                if position_error is None:
                    notes.append("stall speeds are indicated and no position error is given: taken as calibrated")
                else:
                    value = float(calibrated_from_indicated(np.array([value]), position_error, np.array([flaps]))[0])
            speeds.append(value)
        rows.append((flaps, mass, *speeds))
    if not rows:
        return None
    columns = [np.array(column) for column in zip(*rows, strict=True)]
    return StallTable(*columns)


def _clean_stall(table: StallTable | None, heaviest: float | None) -> float | None:
    if table is None:
        return None
    clean = int(np.argmin(np.abs(table.flap_angle)))
    mass = float(table.mass[clean])
    return float(table.upright[clean]) * float(np.sqrt((heaviest or mass) / mass))


def _load_factor_table(aircraft: Aircraft, aliases: dict[str, str | None], notes: list[str]) -> LoadFactorTable:
    def column(name: str) -> list[float]:
        found = (getattr(row, name) for row in aircraft.load_factor)
        return [np.nan if value is None else float(value) for value in found]

    rows = aircraft.load_factor
    brakes = [np.nan if row.airbrakes is None else float(row.airbrakes == "out") for row in rows]
    kinds = sorted({row.speed_up_to.airspeed or "indicated_airspeed" for row in rows if row.speed_up_to is not None})
    if len(kinds) > 1:
        notes.append(f"load factor rows name several kinds of airspeed: all are compared with {kinds[0]}")
    aliases["limit_flap_angle"] = "flap_angle" if any(row.flaps is not None for row in rows) else None
    aliases["limit_mass"] = "mass" if any(row.mass_up_to is not None for row in rows) else None
    aliases["limit_airspeed"] = kinds[0] if kinds else None
    aliases["limit_airbrakes"] = "airbrakes_out" if any(row.airbrakes is not None for row in rows) else None
    return LoadFactorTable(
        np.array(column("flaps")),
        np.array(column("mass_up_to")),
        np.array(column("speed_up_to")),
        np.array(brakes),
        np.array(column("maximum")),
        np.array(column("minimum")),
    )


def _speed_table(limit: SpeedLimit) -> tuple[Any, str | None]:
    """A speed limit as a number, a Table over a quantity, or ('sqrt_mass', value, mass)."""
    if limit.value is not None:
        if limit.scale == "sqrt_mass" and limit.mass is not None:
            return ("sqrt_mass", float(limit.value), float(limit.mass)), "mass"
        return float(limit.value), None
    over = "flap_angle" if limit.over == "flaps" else limit.over
    at = np.array([float(x) for x, _ in limit.points])
    return Table(at, np.array([float(y) for _, y in limit.points])), over
