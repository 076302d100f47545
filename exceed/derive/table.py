"""DERIVATIONS: every way to get a quantity, best first. Recorded beats derived, but for rows that correct it.

A function's parameters are named for quantities, for `recorded_X` (the channel of X beneath a correction), for `time`,
for `limit_X` (what the rows of a limit ask for) or for facts of the aeroplane or of the flights, so a row lists no
inputs. A parameter with a default is used where it can be had; `without` then says what its lack means.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any

import numpy as np

from exceed.core.constants import KNOT
from exceed.derive import corrections, encounters, margins, methods
from exceed.physics import airspeed, atmosphere, load_limits, loading, stall, turning

POSSIBLE = "possible"
# a channel of rotation slower than this does not show the rotation of an aerobatic aeroplane
QUICK = 0.26


def _quick(*names: str) -> Callable[[Mapping[str, float]], str | None]:
    """The rows' condition that these channels are recorded, and fast enough."""

    def check(intervals: Mapping[str, float]) -> str | None:
        for name in names:
            words = name.replace("_", " ")
            if name not in intervals:
                return f"{words} is not recorded"
            if intervals[name] > QUICK:
                return f"{words} is recorded too slowly"
        return None

    return check


def _turning(intervals: Mapping[str, float]) -> str | None:
    """The rows' condition that the turn is seen, not worked out from the bank."""
    seen = {"turn_rate", "heading", "track_angle"} & set(intervals) or {"latitude", "longitude"} <= set(intervals)
    return None if seen else "no heading and no track"


@dataclass(frozen=True, slots=True)
class Derivation:
    """One way to one quantity.

    width : half-width in s of the neighbourhood that it looks at (at least 1.6 intervals of its slowest input), 0 for
    sample by sample; it goes to the function as `width`, and `looks` times it is the row's reach. uncertainty : the
    method's own standard uncertainty in SI, besides what its inputs bring. one_sided : a bound by construction.
    cap : highest certainty. corrects : goes before what is recorded, which it corrects. when : why the row does not fit
    the channels' intervals. main : the parameters whose samples are the method's own; the others only correct them.
    spread : a function of the same parameters that gives the method's own standard uncertainty sample by sample.
    """

    quantity: str
    function: Callable[..., Any]
    method: str
    source: str
    assumes: str | None = None
    without: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))
    width: float = 0.0
    looks: float = 1.0
    uncertainty: float = 0.0
    one_sided: bool = False
    cap: str | None = None
    corrects: bool = False
    when: Callable[[Mapping[str, float]], str | None] | None = None
    main: tuple[str, ...] = ()
    spread: Callable[..., Any] | None = None


_FLAPS = "flaps not recorded: taken as up"
_ISA = "no temperature recorded: standard atmosphere"
_SEA_LEVEL = "no altitude recorded: taken as at sea level"
# 23.1323(b) allows the airspeed system 5 kt or 3 %, taken as uniform [14CFR23-OLD, from memory]
_SYSTEM_ERROR = 5.0 * KNOT / float(np.sqrt(3.0))
# air differs from the standard atmosphere by some 10 K; common practice, no source
_ISA_UNCERTAINTY = 10.0

# what differentiation leaves of noise and steps: orders of magnitude against the flight model; a constant error of the
# channel, which is what its accuracy mostly is, leaves nothing
_RISE, _TURN, _ROTATION, _SPIN = 0.3, float(np.radians(0.5)), float(np.radians(2.0)), float(np.radians(10.0))

_RATES = ("roll_rate", "pitch_rate", "yaw_rate")

DERIVATIONS: tuple[Derivation, ...] = (
    # airspeed
    Derivation("calibrated_airspeed", corrections.calibrated_from_indicated, "position error table", "DEFINITION",
               main=("indicated_airspeed",),
               without={"error_flap_angle": "flaps not recorded: position error of the clean row"}),
    Derivation("calibrated_airspeed", methods.calibrated_taken_as_indicated, "indicated airspeed", "COMMON-PRACTICE",
               assumes="no position error given: calibrated airspeed taken as indicated", uncertainty=_SYSTEM_ERROR),
    Derivation("calibrated_airspeed", airspeed.calibrated_airspeed_from_impact_pressure, "impact pressure",
               "PITOT-STATIC"),
    Derivation("calibrated_airspeed", methods.calibrated_airspeed_of_equivalent, "equivalent airspeed",
               "PITOT-STATIC"),
    Derivation("calibrated_airspeed", methods.calibrated_airspeed_of_mach, "Mach number and altitude",
               "PITOT-STATIC"),
    Derivation("calibrated_airspeed", methods.calibrated_airspeed_of_true, "true airspeed and temperature",
               "PITOT-STATIC"),
    Derivation("indicated_airspeed", corrections.indicated_from_calibrated, "position error table", "DEFINITION",
               main=("calibrated_airspeed",),
               without={"error_flap_angle": "flaps not recorded: position error of the clean row"}),
    Derivation("indicated_airspeed", methods.indicated_taken_as_calibrated, "calibrated airspeed", "COMMON-PRACTICE",
               assumes="no position error given: indicated airspeed taken as calibrated", uncertainty=_SYSTEM_ERROR),
    Derivation("mach", methods.mach_from_pressures, "recorded pressures", "PITOT-STATIC"),
    Derivation("mach", airspeed.mach, "calibrated airspeed and altitude", "PITOT-STATIC",
               main=("calibrated_airspeed",)),
    Derivation("mach", airspeed.mach_from_equivalent, "equivalent airspeed and altitude", "PITOT-STATIC"),
    Derivation("mach", airspeed.mach_from_true_airspeed, "true airspeed and temperature", "PITOT-STATIC"),
    Derivation("equivalent_airspeed", airspeed.equivalent_airspeed, "calibrated airspeed and altitude", "PITOT-STATIC",
               main=("calibrated_airspeed",)),
    Derivation("equivalent_airspeed", airspeed.equivalent_airspeed_from_mach, "Mach number and altitude",
               "PITOT-STATIC"),
    Derivation("equivalent_airspeed", airspeed.equivalent_airspeed_from_true, "true airspeed and temperature",
               "PITOT-STATIC"),
    Derivation("true_airspeed", airspeed.true_airspeed, "calibrated airspeed, altitude, temperature", "PITOT-STATIC",
               main=("calibrated_airspeed",)),
    Derivation("true_airspeed", airspeed.true_airspeed_from_mach, "Mach number and temperature", "PITOT-STATIC"),
    Derivation("true_airspeed", airspeed.true_airspeed_from_equivalent, "equivalent airspeed and temperature",
               "PITOT-STATIC"),
    # air
    Derivation("pressure_altitude", atmosphere.pressure_altitude, "static pressure", "ISO-2533"),
    Derivation("pressure_altitude", methods.pressure_altitude_from_geometric, "geometric altitude", "COMMON-PRACTICE",
               assumes="pressure altitude taken as the geometric one", uncertainty=150.0),
    Derivation("static_pressure", atmosphere.static_pressure, "pressure altitude", "ISO-2533"),
    Derivation("impact_pressure", airspeed.impact_pressure, "calibrated airspeed", "PITOT-STATIC"),
    Derivation("dynamic_pressure", airspeed.dynamic_pressure_from_equivalent, "equivalent airspeed", "PITOT-STATIC"),
    Derivation("static_air_temperature", airspeed.static_air_temperature, "total temperature and Mach number",
               "STAGNATION",
               assumes="an ideal total-temperature probe"),
    Derivation("static_air_temperature", methods.standard_air_temperature, "standard atmosphere", "ISO-2533",
               assumes=_ISA, uncertainty=_ISA_UNCERTAINTY),
    Derivation("total_air_temperature", methods.total_air_temperature, "static temperature and Mach number",
               "STAGNATION"),
    # height and speed over the ground
    Derivation("height_above_aerodrome", methods.height_above_aerodrome, "pressure altitude less that of the field",
               "DEFINITION", assumes="pressure does not change during the flight"),
    Derivation("height_above_aerodrome", methods.height_above_aerodrome_geometric,
               "geometric altitude less the field's",
               "DEFINITION"),
    Derivation("vertical_speed", methods.vertical_speed, "pressure altitude differentiated", "SAVITZKY-GOLAY",
               width=1.5, uncertainty=_RISE),
    Derivation("vertical_speed", methods.vertical_speed_geometric, "geometric altitude differentiated",
               "SAVITZKY-GOLAY",
               width=1.5, uncertainty=_RISE),
    Derivation("ground_speed", methods.ground_speed, "position differentiated", "SAVITZKY-GOLAY",
               width=1.5, uncertainty=1.0),
    Derivation("track_angle", methods.track_angle, "position differentiated", "SAVITZKY-GOLAY",
               width=1.5, uncertainty=float(np.radians(1.0))),
    # turning
    Derivation("turn_rate", methods.turn_rate_from_heading, "heading differentiated", "SAVITZKY-GOLAY",
               width=1.0, uncertainty=_TURN),
    Derivation("turn_rate", methods.turn_rate_from_track, "track differentiated", "SAVITZKY-GOLAY",
               width=1.0, uncertainty=_TURN,
               assumes="still air: the track turns as the aeroplane does"),
    Derivation("turn_rate", turning.turn_rate, "level turn", "LEVEL-TURN", assumes="level coordinated turn"),
    Derivation("bank_angle", turning.bank_angle_level_turn, "turn rate and true airspeed", "LEVEL-TURN",
               assumes="level coordinated turn", uncertainty=float(np.radians(3.0))),
    Derivation("turn_radius", turning.turn_radius, "level turn", "LEVEL-TURN", assumes="level coordinated turn"),
    Derivation("turn_radius", turning.turn_radius_from_turn_rate, "turn rate and true airspeed", "LEVEL-TURN"),
    Derivation("roll_rate", methods.roll_rate, "bank differentiated", "AXES",
               width=0.25, uncertainty=_ROTATION, when=_quick("bank_angle")),
    Derivation("pitch_rate", methods.pitch_rate, "attitude differentiated", "AXES", width=0.25, uncertainty=_ROTATION,
               when=_quick("pitch_angle", "bank_angle", "heading")),
    Derivation("yaw_rate", methods.yaw_rate, "attitude differentiated", "AXES", width=0.25, uncertainty=_ROTATION,
               when=_quick("pitch_angle", "bank_angle", "heading")),
    Derivation("roll_acceleration", methods.roll_acceleration, "roll rate differentiated", "SAVITZKY-GOLAY",
               width=0.1, uncertainty=_SPIN),
    Derivation("pitch_acceleration", methods.pitch_acceleration, "pitch rate differentiated", "SAVITZKY-GOLAY",
               width=0.1, uncertainty=_SPIN),
    Derivation("yaw_acceleration", methods.yaw_acceleration, "yaw rate differentiated", "SAVITZKY-GOLAY",
               width=0.1, uncertainty=_SPIN),
    # load factor
    Derivation("load_factor", methods.load_factor_moved, "accelerometer moved to the centre of gravity", "RIGID-BODY",
               corrects=True, when=_quick("load_factor", *_RATES), main=("recorded_load_factor",),
               spread=methods.load_factor_moved_spread),
    # their own uncertainties: root mean square against the flight model in aerobatics, at one sample a second
    # (besides, what a wider window makes of the same path); without an accelerometer an event is possible at most
    Derivation("load_factor", methods.load_factor_from_path_and_turn, "attitude and flight path", "FLIGHT-PATH",
               width=1.0, looks=methods.PATH_LOOKS, assumes="coordinated flight in still air", uncertainty=0.2,
               when=_turning, cap=POSSIBLE, spread=methods.path_and_turn_spread),
    Derivation("load_factor", methods.load_factor_from_path_and_bank, "flight path and bank", "FLIGHT-PATH", width=1.0,
               looks=methods.PATH_LOOKS, assumes="coordinated flight in still air", uncertainty=0.25, cap=POSSIBLE,
               spread=methods.path_and_bank_spread),
    Derivation("load_factor", methods.load_factor_from_path, "flight path", "FLIGHT-PATH", width=1.0,
               looks=methods.PATH_LOOKS, assumes="upright coordinated flight in still air", uncertainty=0.35,
               when=_turning, cap=POSSIBLE, spread=methods.path_spread),
    Derivation("load_factor", methods.load_factor_level_turn, "level turn", "LEVEL-TURN", width=0.5,
               assumes="level coordinated turn", uncertainty=0.05, one_sided=True, cap=POSSIBLE),
    Derivation("load_factor", methods.load_factor_wings_level, "vertical acceleration", "FLIGHT-PATH", width=1.0,
               assumes="wings level: turns are not seen", uncertainty=0.15, one_sided=True, cap=POSSIBLE),
    # mass
    Derivation("zero_fuel_mass", margins.zero_fuel_mass, "mass less fuel", "FAA-WB"),
    Derivation("fuel_mass", loading.fuel_mass_of_volume, "fuel quantity and density", "DEFINITION"),
    # stall and limits
    Derivation("stall_speed", margins.stall_speed, "constant maximum lift coefficient", "CONSTANT-CL",
               without={"flap_angle": _FLAPS, "pressure_altitude": _SEA_LEVEL}, main=("load_factor",)),
    Derivation("stall_margin", stall.stall_margin, "calibrated airspeed less the stall speed", "DEFINITION"),
    Derivation("stall_speed_ratio", margins.stall_speed_ratio, "calibrated airspeed over the 1 g stall speed",
               "CONSTANT-CL",
               without={"flap_angle": _FLAPS}, main=("calibrated_airspeed",)),
    Derivation("load_factor_maximum", margins.load_factor_maximum, "limit in force", "COMMON-PRACTICE",
               without={"limit_flap_angle": _FLAPS, "limit_airbrakes": "airbrakes not recorded: taken as in",
                        "limit_roll_rate": "roll rate not recorded: rolling limit not looked at"}),
    Derivation("load_factor_minimum", margins.load_factor_minimum, "limit in force", "COMMON-PRACTICE",
               without={"limit_flap_angle": _FLAPS, "limit_airbrakes": "airbrakes not recorded: taken as in"}),
    Derivation("load_factor_margin", load_limits.load_factor_margin, "distance to the nearer limit", "DEFINITION",
               main=("load_factor",)),
    Derivation("manoeuvring_speed", margins.manoeuvring_speed, "the manual's figure", "DEFINITION"),
    # configuration
    Derivation("gear_moving", margins.gear_moving, "near a change of gear down", "COMMON-PRACTICE", width=8.0,
               assumes="the gear moves for 8 s before it is down and after it leaves that", cap=POSSIBLE),
    # gusts and touchdown
    Derivation("gust_velocity", encounters.gust_velocity, "gust alleviation formula", "NACA-1206", width=2.5,
               assumes="excursions below two seconds outside manoeuvres are gusts",
               without={"static_air_temperature": _ISA, "pressure_altitude": _SEA_LEVEL,
                        "bank_angle": "bank not recorded: steep turns cannot be left out",
                        "flap_angle": "flaps not recorded: taken as up"},
               when=_quick("load_factor"), main=("load_factor",)),
    Derivation("touchdown_load_factor", encounters.touchdown_load_factor, "accelerometer as recorded",
               "COMMON-PRACTICE"),
    Derivation("touchdown_sink_rate", encounters.touchdown_sink_rate_radio, "radio height over the last second",
               "SAVITZKY-GOLAY", width=1.0, looks=1.6, uncertainty=0.15),
    Derivation("touchdown_sink_rate", encounters.touchdown_sink_rate, "vertical speed over the last second",
               "COMMON-PRACTICE", width=1.0, looks=1.6, cap=POSSIBLE, uncertainty=0.5,
               assumes="static pressure near the ground is little disturbed"),
)  # fmt: skip
