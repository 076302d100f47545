"""Physical constants and exact conversion factors: one row each, with unit and source.

The module-level names are plain floats for use in formulas; `CONSTANTS` lists the same numbers with unit and
source for everything that prints them. Only exact factors are typed; all others are computed from these.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

# Exact by definition
STANDARD_GRAVITY = 9.80665  # m/s2
FOOT = 0.3048  # m
NAUTICAL_MILE = 1852.0  # m
POUND = 0.45359237  # kg
INCH = 0.0254  # m
ZERO_CELSIUS = 273.15  # K
US_GALLON = 231.0 * INCH**3  # m3

# Made of the exact ones
KNOT = NAUTICAL_MILE / 3600.0  # m/s
POUND_FORCE = POUND * STANDARD_GRAVITY  # N
SLUG = POUND_FORCE / FOOT  # kg

# The dry standard atmosphere
GAMMA = 1.4  # ratio of specific heats, 1
GAS_CONSTANT = 287.05287  # J/(kg K)
TEMPERATURE_0 = 288.15  # K
PRESSURE_0 = 101325.0  # Pa
LAPSE_RATE_TROPOSPHERE = -0.0065  # K/m of geopotential altitude
LAPSE_RATE_UPPER = 0.001  # K/m, from 20 km to 32 km
TROPOPAUSE = 11000.0  # m geopotential
UPPER_LAYER_BASE = 20000.0  # m geopotential
UPPER_LAYER_TOP = 32000.0  # m geopotential
EARTH_RADIUS = 6356766.0  # m, the nominal radius that ties geopotential to geometric altitude
DENSITY_0 = PRESSURE_0 / (GAS_CONSTANT * TEMPERATURE_0)  # kg/m3
SPEED_OF_SOUND_0 = math.sqrt(GAMMA * GAS_CONSTANT * TEMPERATURE_0)  # m/s


@dataclass(frozen=True, slots=True)
class Constant:
    """One constant as it is printed: value in `unit`, `source` a key of `exceed.core.sources.SOURCES`."""

    name: str
    value: float
    unit: str
    source: str
    note: str = ""


CONSTANTS: dict[str, Constant] = {
    row.name: row
    for row in (
        Constant("STANDARD_GRAVITY", STANDARD_GRAVITY, "m/s2", "BIPM-SI", "conventional value, exact"),
        Constant("FOOT", FOOT, "m", "YARD-POUND-1959", "exact"),
        Constant("INCH", INCH, "m", "YARD-POUND-1959", "exact"),
        Constant("POUND", POUND, "kg", "YARD-POUND-1959", "exact"),
        Constant("NAUTICAL_MILE", NAUTICAL_MILE, "m", "BIPM-SI", "exact"),
        Constant("KNOT", KNOT, "m/s", "BIPM-SI", "one nautical mile an hour"),
        Constant("ZERO_CELSIUS", ZERO_CELSIUS, "K", "BIPM-SI", "exact"),
        Constant("US_GALLON", US_GALLON, "m3", "YARD-POUND-1959", "231 cubic inches"),
        Constant("POUND_FORCE", POUND_FORCE, "N", "YARD-POUND-1959", "pound times standard gravity"),
        Constant("SLUG", SLUG, "kg", "YARD-POUND-1959", "pound-force over one ft/s2"),
        Constant("GAMMA", GAMMA, "1", "ISO-2533"),
        Constant("GAS_CONSTANT", GAS_CONSTANT, "J/(kg K)", "ISO-2533", "dry air"),
        Constant("TEMPERATURE_0", TEMPERATURE_0, "K", "ISO-2533", "sea level"),
        Constant("PRESSURE_0", PRESSURE_0, "Pa", "ISO-2533", "sea level"),
        Constant("LAPSE_RATE_TROPOSPHERE", LAPSE_RATE_TROPOSPHERE, "K/m", "ISO-2533", "to 11 km geopotential"),
        Constant("LAPSE_RATE_UPPER", LAPSE_RATE_UPPER, "K/m", "ISO-2533", "20 km to 32 km geopotential"),
        Constant("TROPOPAUSE", TROPOPAUSE, "m", "ISO-2533", "geopotential"),
        Constant("UPPER_LAYER_BASE", UPPER_LAYER_BASE, "m", "ISO-2533", "geopotential"),
        Constant("UPPER_LAYER_TOP", UPPER_LAYER_TOP, "m", "ISO-2533", "geopotential"),
        Constant("EARTH_RADIUS", EARTH_RADIUS, "m", "ISO-2533", "nominal"),
        Constant("DENSITY_0", DENSITY_0, "kg/m3", "ISO-2533", "computed from the rows above"),
        Constant("SPEED_OF_SOUND_0", SPEED_OF_SOUND_0, "m/s", "ISO-2533", "computed from the rows above"),
    )
}
