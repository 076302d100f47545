"""The one closed table of units: unit -> kind of quantity, factor and offset to SI.

Only exact definitions are typed (international foot, pound, knot, standard gravity, US gallon); the rest is computed.
A reading x in a unit is x * factor + offset in SI.
"""

from __future__ import annotations

import difflib
import math
from dataclasses import dataclass

FOOT = 0.3048
INCH = 0.0254
POUND = 0.45359237
KNOT = 1852.0 / 3600.0
MILE_PER_HOUR = 1609.344 / 3600.0
GRAVITY = 9.80665
US_GALLON = 231.0 * INCH**3
# conventional inch of mercury at 0 degC: 25.4 mm times 133.322387415 Pa [BIPM SI brochure's mmHg]
INCH_OF_MERCURY = 25.4 * 133.322387415
POUND_PER_SQUARE_INCH = POUND * GRAVITY / INCH**2


@dataclass(frozen=True, slots=True)
class Unit:
    """One row: SI = reading * factor + offset."""

    name: str
    kind: str
    factor: float
    offset: float = 0.0

    def to_si(self, reading: float) -> float:
        return reading * self.factor + self.offset

    def from_si(self, value: float) -> float:
        return (value - self.offset) / self.factor


# kind -> the SI unit in which values of that kind travel inside
KINDS: dict[str, str] = {
    "speed": "m/s",
    "load factor": "1",
    "load factor rate": "1/s",
    "length": "m",
    "angle": "rad",
    "angular rate": "rad/s",
    "angular acceleration": "rad/s2",
    "temperature": "K",
    "mass": "kg",
    "time": "s",
    "pressure": "Pa",
    "rotation": "1/s",
    "ratio": "1",
    "volume": "m3",
    "density": "kg/m3",
    "mass flow": "kg/s",
    "volume flow": "m3/s",
    "area": "m2",
    "torque": "N.m",
    "slope": "1/rad",
    "state": "",
}

_ROWS: tuple[Unit, ...] = (
    Unit("kt", "speed", KNOT),
    Unit("m/s", "speed", 1.0),
    Unit("km/h", "speed", 1.0 / 3.6),
    Unit("mph", "speed", MILE_PER_HOUR),
    Unit("ft/min", "speed", FOOT / 60.0),
    Unit("ft/s", "speed", FOOT),
    Unit("g", "load factor", 1.0),
    Unit("m/s2", "load factor", 1.0 / GRAVITY),
    Unit("ft/s2", "load factor", FOOT / GRAVITY),
    Unit("g/s", "load factor rate", 1.0),
    Unit("ft", "length", FOOT),
    Unit("m", "length", 1.0),
    Unit("in", "length", INCH),
    Unit("km", "length", 1000.0),
    Unit("deg", "angle", math.pi / 180.0),
    Unit("rad", "angle", 1.0),
    Unit("deg/s", "angular rate", math.pi / 180.0),
    Unit("rad/s", "angular rate", 1.0),
    Unit("deg/s2", "angular acceleration", math.pi / 180.0),
    Unit("rad/s2", "angular acceleration", 1.0),
    Unit("degC", "temperature", 1.0, 273.15),
    Unit("degF", "temperature", 5.0 / 9.0, 273.15 - 32.0 * 5.0 / 9.0),
    Unit("K", "temperature", 1.0),
    Unit("kg", "mass", 1.0),
    Unit("lb", "mass", POUND),
    Unit("s", "time", 1.0),
    Unit("ms", "time", 1e-3),
    Unit("us", "time", 1e-6),
    Unit("ns", "time", 1e-9),
    Unit("min", "time", 60.0),
    Unit("h", "time", 3600.0),
    Unit("Pa", "pressure", 1.0),
    Unit("kPa", "pressure", 1000.0),
    Unit("hPa", "pressure", 100.0),
    Unit("mbar", "pressure", 100.0),
    Unit("bar", "pressure", 1e5),
    Unit("inHg", "pressure", INCH_OF_MERCURY),
    Unit("psi", "pressure", POUND_PER_SQUARE_INCH),
    Unit("rpm", "rotation", 1.0 / 60.0),
    Unit("%", "ratio", 0.01),
    Unit("1", "ratio", 1.0),
    Unit("L", "volume", 1e-3),
    Unit("USG", "volume", US_GALLON),
    Unit("m3", "volume", 1.0),
    Unit("kg/L", "density", 1000.0),
    Unit("kg/m3", "density", 1.0),
    Unit("kg/h", "mass flow", 1.0 / 3600.0),
    Unit("lb/h", "mass flow", POUND / 3600.0),
    Unit("kg/s", "mass flow", 1.0),
    Unit("L/h", "volume flow", 1e-3 / 3600.0),
    Unit("USG/h", "volume flow", US_GALLON / 3600.0),
    Unit("m2", "area", 1.0),
    Unit("ft2", "area", FOOT**2),
    Unit("N.m", "torque", 1.0),
    Unit("lb.ft", "torque", POUND * GRAVITY * FOOT),
    Unit("1/rad", "slope", 1.0),
    Unit("1/deg", "slope", 180.0 / math.pi),
    Unit("state", "state", 1.0),
)

UNITS: dict[str, Unit] = {row.name: row for row in _ROWS}

# a speed unit that also says which airspeed is meant
AIRSPEED_UNITS: dict[str, tuple[str, str]] = {
    "KIAS": ("kt", "indicated_airspeed"),
    "KCAS": ("kt", "calibrated_airspeed"),
    "KEAS": ("kt", "equivalent_airspeed"),
    "KTAS": ("kt", "true_airspeed"),
}
AIRSPEED_WORDS: dict[str, str] = {
    "IAS": "indicated_airspeed",
    "CAS": "calibrated_airspeed",
    "EAS": "equivalent_airspeed",
    "TAS": "true_airspeed",
}


def units_of(kind: str) -> tuple[str, ...]:
    """Names of the units of a kind, sorted."""
    return tuple(sorted(row.name for row in _ROWS if row.kind == kind))


def nearest_unit(name: str) -> str | None:
    """The known unit whose spelling is nearest, or None."""
    known = [*UNITS, *AIRSPEED_UNITS]
    same = [unit for unit in known if unit.lower() == name.lower()]
    found = same or difflib.get_close_matches(name, known, n=1, cutoff=0.6)
    return found[0] if found else None
