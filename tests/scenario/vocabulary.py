"""Names and units that invented recorders use: trade terms, plain words, abbreviations. No maker's own list."""

from __future__ import annotations

from dataclasses import dataclass

from scenario.air import DEG, FT, FT_MIN, G0, KT

VOCABULARIES = ("trade", "plain", "upper", "snake")

# quantity -> (trade abbreviation, plain English, upper-case abbreviation, snake_case)
NAMES: dict[str, tuple[str, str, str, str]] = {
    "load_factor": ("NZ", "Normal acceleration", "NORM ACC", "load_factor"),
    "longitudinal_load_factor": ("NX", "Longitudinal acceleration", "LONG ACC", "longitudinal_acceleration"),
    "lateral_load_factor": ("NY", "Lateral acceleration", "LAT ACC", "lateral_acceleration"),
    "indicated_airspeed": ("IAS", "Indicated airspeed", "IND AIRSPEED", "indicated_airspeed"),
    "calibrated_airspeed": ("CAS", "Calibrated airspeed", "CAL AIRSPEED", "calibrated_airspeed"),
    "true_airspeed": ("TAS", "True airspeed", "TRUE AIRSPEED", "true_airspeed"),
    "ground_speed": ("GS", "Ground speed", "GND SPD", "ground_speed"),
    "mach": ("MACH", "Mach number", "MACH", "mach"),
    "pressure_altitude": ("PALT", "Pressure altitude", "PRESS ALT", "pressure_altitude"),
    "height_above_ground": ("RALT", "Radio height", "RAD ALT", "radio_height"),
    "vertical_speed": ("VS", "Vertical speed", "VERT SPD", "vertical_speed"),
    "bank_angle": ("ROLL", "Bank angle", "ROLL ANG", "roll_angle"),
    "pitch_angle": ("PITCH", "Pitch angle", "PITCH ANG", "pitch_angle"),
    "heading": ("HDG", "Heading", "HDG", "heading"),
    "track_angle": ("TRK", "Track", "TRACK ANG", "track_angle"),
    "roll_rate": ("P", "Roll rate", "ROLL RATE", "roll_rate"),
    "pitch_rate": ("Q", "Pitch rate", "PITCH RATE", "pitch_rate"),
    "yaw_rate": ("R", "Yaw rate", "YAW RATE", "yaw_rate"),
    "angle_of_attack": ("AOA", "Angle of attack", "ALPHA", "angle_of_attack"),
    "static_air_temperature": ("SAT", "Static air temperature", "SAT", "static_air_temperature"),
    "outside_air_temperature": ("OAT", "Outside air temperature", "OAT", "outside_air_temperature"),
    "total_air_temperature": ("TAT", "Total air temperature", "TAT", "total_air_temperature"),
    "static_pressure": ("PS", "Static pressure", "STATIC PRESS", "static_pressure"),
    "flap_angle": ("FLAP", "Flap angle", "FLAP ANG", "flap_angle"),
    "gear_down": ("GEAR", "Gear down", "GEAR DOWN", "gear_down"),
    "airbrakes_out": ("SPDBRK", "Airbrakes out", "AIRBRAKE", "airbrakes_out"),
    "weight_on_wheels": ("WOW", "Weight on wheels", "WOW", "weight_on_wheels"),
    "stall_warning": ("STALL", "Stall warning", "STALL WARN", "stall_warning"),
    "fuel_mass": ("FUEL", "Fuel quantity", "FUEL QTY", "fuel_quantity"),
    "fuel_flow": ("FF", "Fuel flow", "FUEL FLOW", "fuel_flow"),
    "engine_speed": ("RPM", "Engine speed", "ENG RPM", "engine_rpm"),
    "oil_temperature": ("OIL T", "Oil temperature", "OIL TEMP", "oil_temperature"),
    "mass": ("GW", "Gross mass", "GROSS MASS", "gross_mass"),
}


@dataclass(frozen=True, slots=True)
class Unit:
    """A unit as written in a log: SI value = written x scale + offset."""

    label: str
    scale: float
    offset: float
    decimals: int
    signs: str = ""  # the same in typographic signs, where they differ
    words: str = ""  # the same in words, where they differ


_G = Unit("g", 1.0, 0.0, 3, words="G")
_MS2 = Unit("m/s2", 1.0 / G0, 0.0, 2, signs="m/s²", words="m/s^2")
_KT = Unit("kt", KT, 0.0, 1, words="knots")
_KMH = Unit("km/h", 1.0 / 3.6, 0.0, 1, words="kph")
_MS = Unit("m/s", 1.0, 0.0, 2)
_FT = Unit("ft", FT, 0.0, 0, words="feet")
_M = Unit("m", 1.0, 0.0, 1)
_FTMIN = Unit("ft/min", FT_MIN, 0.0, 0, words="fpm")
_DEG = Unit("deg", DEG, 0.0, 2, signs="°", words="degrees")
_RAD = Unit("rad", 1.0, 0.0, 4)
_DEGS = Unit("deg/s", DEG, 0.0, 2, signs="°/s")
_RADS = Unit("rad/s", 1.0, 0.0, 4)
_C = Unit("degC", 1.0, 273.15, 1, signs="°C", words="C")
_K = Unit("K", 1.0, 0.0, 1)
_F = Unit("degF", 5.0 / 9.0, 273.15 - 32.0 * 5.0 / 9.0, 1, signs="°F", words="F")
_ONE = Unit("", 1.0, 0.0, 4)
_STATE = Unit("", 1.0, 0.0, 0)
_KG = Unit("kg", 1.0, 0.0, 2)
_LB = Unit("lb", 0.45359237, 0.0, 1)
_KGH = Unit("kg/h", 1.0 / 3600.0, 0.0, 1)
_LBH = Unit("lb/h", 0.45359237 / 3600.0, 0.0, 1)
_HPA = Unit("hPa", 100.0, 0.0, 2)
_PA = Unit("Pa", 1.0, 0.0, 0)
_RPM = Unit("rpm", 1.0, 0.0, 0)

UNIT_SETS = ("trade", "metric", "si", "mixed")

_KINDS: dict[str, tuple[Unit, Unit, Unit, Unit]] = {
    "load": (_G, _MS2, _MS2, _G),
    "speed": (_KT, _KMH, _MS, _KMH),
    "height": (_FT, _M, _M, _FT),
    "rise": (_FTMIN, _MS, _MS, _MS),
    "angle": (_DEG, _DEG, _RAD, _DEG),
    "rate": (_DEGS, _DEGS, _RADS, _RADS),
    "temperature": (_C, _C, _K, _F),
    "ratio": (_ONE, _ONE, _ONE, _ONE),
    "state": (_STATE, _STATE, _STATE, _STATE),
    "mass": (_KG, _KG, _KG, _LB),
    "flow": (_LBH, _KGH, _KGH, _KGH),
    "pressure": (_HPA, _HPA, _PA, _HPA),
    "revolutions": (_RPM, _RPM, _RPM, _RPM),
}

STATE_WORDS: dict[str, tuple[str, str]] = {
    "gear_down": ("UP", "DOWN"),
    "airbrakes_out": ("IN", "OUT"),
    "weight_on_wheels": ("AIR", "GROUND"),
    "stall_warning": ("OFF", "ON"),
}


def kind_of(quantity: str) -> str:
    """The kind of quantity, which says the unit in each set."""
    if quantity in STATE_WORDS:
        return "state"
    endings = {
        "load_factor": "load", "airspeed": "speed", "ground_speed": "speed", "altitude": "height",
        "height_above_ground": "height", "vertical_speed": "rise", "angle": "angle", "heading": "angle",
        "attack": "angle", "rate": "rate", "temperature": "temperature", "mach": "ratio", "pressure": "pressure",
        "fuel_flow": "flow", "engine_speed": "revolutions", "mass": "mass",
    }  # fmt: skip
    for ending, kind in endings.items():
        if quantity.endswith(ending):
            return kind
    raise KeyError(quantity)


def unit_of(quantity: str, unit_set: str) -> Unit:
    return _KINDS[kind_of(quantity)][UNIT_SETS.index(unit_set)]


def name_of(quantity: str, vocabulary: str) -> str:
    return NAMES[quantity][VOCABULARIES.index(vocabulary)]


def spelled(unit: Unit, spelling: str) -> str:
    """The unit's label in a spelling: plain, signs or words."""
    if spelling == "signs" and unit.signs:
        return unit.signs
    if spelling == "words" and unit.words:
        return unit.words
    return unit.label


def suffix(unit: Unit) -> str:
    """The unit as a suffix of a snake_case name."""
    return {"m/s2": "ms2", "km/h": "kmh", "m/s": "ms", "ft/min": "ft_min", "deg/s": "deg_s", "rad/s": "rad_s",
            "kg/h": "kg_h", "lb/h": "lb_h"}.get(unit.label, unit.label)  # fmt: skip
