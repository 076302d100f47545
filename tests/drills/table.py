"""Every built-in rule with a story that goes beyond its limit, one that stays inside, and what it lacks at times.

Crossings are worked out by hand from the straight ramps of `sortie.held` and the raised cosine of `sortie.pulse`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from math import acos, pi
from typing import Any

import numpy as np

from drills.sortie import (
    ALT,
    BANK,
    BRAKES,
    CRUISE,
    FLAPS,
    GEAR,
    IAS,
    NZ,
    PITCH,
    TOUCHDOWN,
    WARNING,
    WHEELS,
    Change,
    held,
    level,
    more,
    pulse,
    state,
)  # fmt: skip
from drills.sortie import NY as SIDE_LOAD


@dataclass(frozen=True)
class Drill:
    """One rule. start, end None: not checked to the sample. lacks : (columns dropped, part of the reason)."""

    rule: str
    rules: str
    beyond: tuple[Change, ...]
    inside: tuple[Change, ...]
    severity: str
    source: str
    peak: float
    limit: float
    start: float | None = None
    end: float | None = None
    phase: tuple[str, ...] = ("cruise",)
    facts: Mapping[str, Any] = field(default_factory=dict)
    fact_missing: str = ""  # reason where the facts are taken away; '' for a rule that needs none
    lacks: tuple[tuple[str, ...], str] = ((), "")
    inspection: bool = False
    exceeded: bool = True
    tolerance: float = 0.01  # of the peak, as a share
    slack: float = 0.13  # s: one sample
    cut_by: str | None = None
    mass: str | None = "900 kg"
    mass_inside: str | None = "900 kg"
    most: str = "established"  # the highest certainty that the method allows


def over(value: float, limit: float, start: float, end: float, base: float, ramp: float = 1.0) -> dict[str, Any]:
    """What a plateau that `held` makes on a channel at `base` gives."""
    share = (limit - base) / (value - base)
    return {"peak": value, "limit": limit, "start": start - ramp * (1 - share), "end": end + ramp * (1 - share)}


def cosine(value: float, limit: float, base: float, width: float = 2.0, middle: float = CRUISE) -> dict[str, Any]:
    """What a bump that `pulse` makes on a channel at `base` gives."""
    half = width * acos(2.0 * (limit - base) / (value - base) - 1.0) / (2.0 * pi)
    return {"peak": value, "limit": limit, "start": middle - half, "end": middle + half}


NZ_BASE = 1.0 + 0.004 * -0.966  # sin(2.1 * 140)
LIMITS = {"load_factor": [{"maximum": "3.8 g", "minimum": "-1.5 g"}]}


def speeds(**named: str) -> dict[str, Any]:
    return {"speeds": named}


def limits(**named: str) -> dict[str, Any]:
    return {"limits": named}


AIRFRAME = (
    Drill("load-factor-high", "airframe", (pulse(NZ, 4.0, width=3.0),), (pulse(NZ, 3.6, width=3.0),), "caution",
          "aircraft.load_factor.maximum", **cosine(4.0, 3.8, NZ_BASE, 3.0), phase=("manoeuvring",), facts=LIMITS,
          fact_missing="the aircraft file has no maximum load factor", lacks=((NZ, BANK, PITCH, ALT,
          "Heading (deg)"), "load factor"),
          inspection=True),
    Drill("load-factor-low", "airframe", (pulse(NZ, -1.6, width=3.0),), (pulse(NZ, -1.3, width=3.0),), "caution",
          "aircraft.load_factor.minimum", **cosine(-1.6, -1.5, NZ_BASE, 3.0), phase=("manoeuvring",), facts=LIMITS,
          fact_missing="the aircraft file has no minimum load factor", lacks=((NZ, BANK, PITCH, ALT,
          "Heading (deg)"), "load factor"),
          inspection=True),
    Drill("never-exceed", "airframe", (held(IAS, 125, 140, 150, 5),), (held(IAS, 118, 140, 150, 5),), "warning",
          "aircraft.speeds.never_exceed", **over(125, 120, 140, 150, 100, 5), facts=speeds(never_exceed="120 KIAS"),
          fact_missing="the aircraft file has no never-exceed speed", lacks=((IAS,), "airspeed"), inspection=True),
    Drill("maximum-operating", "airframe", (held(IAS, 125, 140, 150, 5),), (held(IAS, 118, 140, 150, 5),), "caution",
          "aircraft.speeds.maximum_operating", **over(125, 120, 140, 150, 100, 5),
          facts=speeds(maximum_operating="120 KIAS"), fact_missing="the aircraft file has no maximum operating speed",
          lacks=((IAS,), "airspeed"), inspection=True),
    Drill("maximum-operating-mach", "airframe", (more("Mach", lambda t: t * 0 + 0.15), held("Mach", 0.20, 140, 150)),
          (more("Mach", lambda t: t * 0 + 0.15), held("Mach", 0.175, 140, 150)), "caution",
          "aircraft.mach.maximum_operating", **over(0.20, 0.18, 140, 150, 0.15),
          facts={"mach": {"maximum_operating": "0.18"}},
          fact_missing="the aircraft file has no maximum operating Mach number", lacks=(("Mach", IAS), "mach"),
          inspection=True),
    Drill("never-exceed-mach", "airframe", (more("Mach", lambda t: t * 0 + 0.15), held("Mach", 0.20, 140, 150)),
          (more("Mach", lambda t: t * 0 + 0.15), held("Mach", 0.175, 140, 150)), "warning",
          "aircraft.mach.never_exceed", **over(0.20, 0.18, 140, 150, 0.15),
          facts={"mach": {"never_exceed": "0.18"}}, fact_missing="the aircraft file has no never exceed Mach number",
          lacks=(("Mach", IAS), "mach"), inspection=True),
    Drill("normal-operating", "airframe", (held(IAS, 125, 140, 150, 5),), (held(IAS, 125, 140, 140.5, 2),),
          "advisory",
          "aircraft.speeds.normal_operating", **over(125, 120, 140, 150, 100, 5),
          facts=speeds(normal_operating="120 KIAS"), fact_missing="the aircraft file has no normal operating speed",
          lacks=((IAS,), "airspeed")),
    Drill("flaps-extended", "airframe", (held(FLAPS, 10, 140, 150),), (held(FLAPS, 10, 140, 150), held(IAS, 85, 135,
          155)),
          "caution", "aircraft.speeds.flaps_extended", peak=100, limit=90, start=139.125, end=150.875,
          facts={"speeds": {"flaps_extended": [{"flaps": "10 deg", "maximum": "90 KIAS"}, {"flaps": "30 deg",
          "maximum": "85 KIAS"}]}},
          fact_missing="the aircraft file has no flaps extended speed", lacks=((FLAPS,), "flap"), inspection=True),
    Drill("gear-extended", "airframe", (state(GEAR, "DOWN", 140, 150),), (state(GEAR, "DOWN", 140, 150), held(IAS,
          85, 125, 165)),
          "caution", "aircraft.speeds.gear_extended", peak=100, limit=90, start=140, end=149.875, cut_by="condition",
          facts=speeds(gear_extended="90 KIAS"), fact_missing="the aircraft file has no gear extended speed",
          lacks=((GEAR,), "gear"), inspection=True),
    Drill("gear-operating", "airframe", (state(GEAR, "DOWN", 140, 500),), (state(GEAR, "DOWN", 140, 500), held(IAS,
          85, 120, 500)),
          "caution", "aircraft.speeds.gear_operating", peak=100, limit=90, start=132, end=140, cut_by="condition",
          facts=speeds(gear_operating="90 KIAS"), fact_missing="the aircraft file has no gear operating speed",
          lacks=((GEAR,), "gear"), inspection=True, most="possible"),
    Drill("airbrakes", "airframe", (state(BRAKES, "OUT", 140, 150),), (state(BRAKES, "OUT", 140, 150), held(IAS, 85,
          125, 165)),
          "caution", "aircraft.speeds.airbrakes", peak=100, limit=90, start=140, end=149.875, cut_by="condition",
          facts=speeds(airbrakes="90 KIAS"), fact_missing="the aircraft file has no airbrakes speed",
          lacks=((BRAKES,), "airbrakes"), inspection=True),
    Drill("aerotow", "airframe", (more("On Tow", lambda t: (t < 120).astype(int)), held(IAS, 80, 100, 104)),
          (more("On Tow", lambda t: (t < 120).astype(int)), held(IAS, 85, 100, 125)),
          "caution", "aircraft.speeds.aerotow", peak=100, limit=90, start=105, end=119.875, cut_by="condition",
          phase=("cruise", "climb"), facts=speeds(aerotow="90 KIAS"),
          fact_missing="the aircraft file has no aerotow speed", lacks=(("On Tow",), "on tow"), inspection=True),
    Drill("winch", "airframe", (more("On Winch", lambda t: (t < 60).astype(int)),), (more("On Winch",
          lambda t: (t < 50).astype(int)),),
          "caution", "aircraft.speeds.winch", peak=80, limit=75, start=55, end=59.875, cut_by="condition",
          phase=("initial climb",), facts=speeds(winch="75 KIAS"),
          fact_missing="the aircraft file has no winch speed", lacks=(("On Winch",), "on winch"), inspection=True),
    Drill("take-off-mass", "airframe", (), (), "caution", "aircraft.mass.maximum_take_off", peak=980, limit=960,
          start=40, end=319.2, slack=0.7, cut_by="condition", phase=("initial climb", "take-off"), mass="980 kg",
          inspection=True),
    Drill("landing-mass", "airframe", (), (), "caution", "aircraft.mass.maximum_landing", peak=955, limit=950,
          cut_by="condition", phase=("landing",), mass="955 kg", inspection=True),
    Drill("zero-fuel-mass", "airframe", (level("Fuel Mass (kg)", 50),), (level("Fuel Mass (kg)", 60),), "caution",
          "aircraft.mass.maximum_zero_fuel", peak=850, limit=845, start=40, end=319.2, slack=0.7, cut_by="condition",
          phase=("initial climb", "take-off"), facts={"mass": {"maximum_zero_fuel": "845 kg"}},
          fact_missing="the aircraft file has no maximum zero fuel mass", lacks=(("Fuel Mass (kg)",), "fuel"),
          inspection=True),
)  # fmt: skip

WITHOUT_NZ = (NZ, BANK, PITCH, ALT, "Heading (deg)")
SLIP, RADIO, SINKS, ANGLE = (
    "Sideslip Angle (deg)", "Radio Altitude (ft)", "Vertical Speed (ft/min)", "deg",
)  # fmt: skip


AEROBATIC = (
    replace(AIRFRAME[0], rules="aerobatic"),
    replace(AIRFRAME[1], rules="aerobatic"),
    # a raised cosine of height 3 g and 1.5 s climbs at most 3 pi / 1.5 g/s; differences over 0.25 s see 0.955 of it
    Drill("load-factor-onset", "aerobatic", (pulse(NZ, 4.0, width=1.5),), (pulse(NZ, 4.0, width=3.0),), "advisory",
          "the rule", peak=6.0, limit=5.0, start=139.485, end=139.765, tolerance=0.03, phase=("cruise",
          "manoeuvring"),
          lacks=(WITHOUT_NZ, "load factor")),
    Drill("load-factor-onset-negative", "aerobatic", (pulse(NZ, 4.0, width=1.5),), (pulse(NZ, 4.0, width=3.0),),
          "advisory", "the rule", peak=-6.0, limit=-5.0, start=140.235, end=140.515, tolerance=0.03,
          phase=("cruise", "manoeuvring"), lacks=(WITHOUT_NZ, "load factor")),
    # 60 KCAS at 960 kg is 58.1 at 900 kg and -1 g
    Drill("inverted-stall-margin", "aerobatic", (held(IAS, 55, 130, 160, 10), held(NZ, -1.0, 140, 150, 4)),
          (held(IAS, 70, 130, 160, 10), held(NZ, -1.0, 140, 150, 4)), "advisory", "the rule", peak=-3.1, limit=0.0,
          tolerance=0.05, phase=("manoeuvring",), lacks=((IAS,), "stall"), most="possible"),
    Drill("inverted-time", "aerobatic", (held(BANK, 170, 140, 155),), (held(BANK, 170, 140, 147),), "caution",
          "aircraft.limits.inverted_time", peak=15.93, limit=10.0, start=149.5, end=155.5, phase=("manoeuvring",),
          facts=limits(inverted_time="10 s"), fact_missing="the aircraft file has no limits.inverted_time",
          lacks=((BANK,), "inverted time")),
    Drill("snap-sideslip", "aerobatic", (level(SLIP, 1.0), held(SLIP, -20, 140, 145)),
          (level(SLIP, 1.0), held(SLIP, -12, 140, 145)), "caution", "aircraft.limits.sideslip_angle",
          **over(20, 15, 140, 145, 0), slack=0.2, facts=limits(sideslip_angle="15 deg"),
          fact_missing="the aircraft file has no limits.sideslip_angle", lacks=((SLIP,), "sideslip")),
)  # fmt: skip

LANDING = (
    Drill("touchdown-load-factor", "landing", (pulse(NZ, 2.2, TOUCHDOWN + 0.25, 0.75),),
          (pulse(NZ, 1.6, TOUCHDOWN + 0.25, 0.75),), "caution", "aircraft.limits.touchdown_load_factor",
          **cosine(2.2, 1.8, 1.0, 0.75, TOUCHDOWN + 0.25), phase=("landing",),
          facts=limits(touchdown_load_factor="1.8 g"),
          fact_missing="the aircraft file has no limits.touchdown_load_factor",
          lacks=(WITHOUT_NZ, "load factor"), inspection=True),
    Drill("touchdown-sink-rate", "landing",
          (more(RADIO, lambda t: np.interp(t, [0, 40, 50, 290, 320], [0, 0, 400, 250, 0])),),
          (more(RADIO, lambda t: np.interp(t, [0, 40, 50, 290, 320], [0, 0, 400, 120, 0])),), "caution",
          "aircraft.limits.touchdown_sink_rate", peak=500, limit=300, phase=("landing",),
          facts=limits(touchdown_sink_rate="300 ft/min"),
          fact_missing="the aircraft file has no limits.touchdown_sink_rate",
          lacks=((RADIO, ALT), "touchdown sink rate"), inspection=True),
    Drill("landing-mass", "landing", (), (), "caution", "aircraft.mass.maximum_landing", peak=900, limit=890,
          cut_by="condition", phase=("landing",), facts={"mass": {"maximum_landing": "890 kg"}},
          mass_inside="889 kg", inspection=True),
    Drill("bounce", "landing", (state(WHEELS, "GROUND", 318, 319),), (), "advisory", "the rule", peak=1, limit=0.5,
          cut_by="condition", phase=("landing",), lacks=((WHEELS,), "weight on wheels")),
    Drill("landing-gear-up", "landing", (state(GEAR, "UP", 55, 400),), (), "caution", "the rule", peak=1, limit=0.5,
          cut_by="condition", phase=("landing",), lacks=((GEAR,), "gear")),
    # 500 ft above the field is passed at 240 + 400 / 880 * 75 = 274.1 s
    Drill("landing-gear-late", "landing", (state(GEAR, "UP", 55, 300),), (state(GEAR, "UP", 55, 270),), "advisory",
          "the rule", peak=1, limit=0.5, start=274.1, end=300, cut_by="condition", phase=("approach",),
          lacks=((GEAR,), "gear")),
    Drill("landing-flaps", "landing", (held(FLAPS, 20, 290, 345),), (), "advisory", "aircraft.limits.landing_flaps",
          peak=20, limit=30, cut_by="condition", phase=("landing",), facts=limits(landing_flaps="30 deg"),
          fact_missing="the aircraft file has no limits.landing_flaps", lacks=((FLAPS,), "flap")),
    Drill("landing-flaps-late", "landing", (held(FLAPS, 20, 250, 295),), (held(FLAPS, 20, 250, 270),), "advisory",
          "aircraft.limits.landing_flaps", peak=20, limit=30, start=274.1, end=295.9, cut_by="condition",
          phase=("approach",),
          facts=limits(landing_flaps="30 deg"), fact_missing="the aircraft file has no limits.landing_flaps",
          lacks=((FLAPS,), "flap")),
    Drill("landing-pitch-high", "landing", (pulse(PITCH, 12, TOUCHDOWN + 1, 4),), (pulse(PITCH, 9, TOUCHDOWN + 1,
          4),),
          "caution", "aircraft.limits.landing_pitch", peak=12, limit=10, phase=("landing",), tolerance=0.02,
          facts=limits(landing_pitch="10 deg"), fact_missing="the aircraft file has no limits.landing_pitch",
          lacks=((PITCH,), "pitch"), inspection=True),
    Drill("landing-side-load", "landing", (pulse(SIDE_LOAD, -0.4, 323.0, 2.0),), (pulse(SIDE_LOAD, -0.25, 323.0,
          2.0),),
          "caution", "aircraft.limits.landing_lateral_load_factor", **cosine(0.4, 0.3, 0.0, 2.0, 323.0),
          phase=("landing",), facts=limits(landing_lateral_load_factor="0.3 g"),
          fact_missing="the aircraft file has no limits.landing_lateral_load_factor",
          lacks=((SIDE_LOAD,), "lateral load factor"), inspection=True),
)  # fmt: skip

HANDLING = (
    # 90 to 43 ft above the field, where the table says 15 deg
    Drill("bank-low", "handling", (held(BANK, 20, 309, 313),), (held(BANK, 12, 309, 313),), "advisory",
          "table over height above aerodrome", peak=20, limit=15, start=308.75, end=313.25, phase=("approach",
          "landing"),
          lacks=((BANK, "Heading (deg)"), "bank")),
    Drill("bank-steep", "handling", (held(BANK, 65, 140, 145),), (held(BANK, 50, 140, 145),), "advisory", "60 deg",
          **over(65, 60, 140, 145, 0), phase=("manoeuvring",), lacks=((BANK, "Heading (deg)"), "bank")),
    Drill("pitch-up", "handling", (held(PITCH, 35, 140, 145),), (held(PITCH, 25, 140, 145),), "advisory", "30 deg",
          **over(35, 30, 140, 145, 1), phase=("manoeuvring",), lacks=((PITCH,), "pitch")),
    Drill("pitch-down", "handling", (held(PITCH, -35, 140, 145),), (held(PITCH, -25, 140, 145),), "advisory",
          "-30 deg",
          **over(-35, -30, 140, 145, 1), phase=("manoeuvring",), lacks=((PITCH,), "pitch")),
    # 50 KCAS at 960 kg is 48.4 at 900 kg
    Drill("stall-margin", "handling", (held(IAS, 51, 140, 150, 12),), (held(IAS, 60, 140, 150, 12),), "advisory",
          "the rule", peak=2.44, limit=5.0, tolerance=0.05, start=139.4, end=150.6, slack=0.4,
          lacks=((IAS,), "stall"), most="possible"),
    # 48.4 kt times the root of 2 is 68.5; eased off slowly, so nothing breaks
    Drill("accelerated-stall", "handling", (held(IAS, 65, 130, 160, 8), held(NZ, 2.0, 140, 146, 4)),
          (held(IAS, 75, 130, 160, 8), held(NZ, 2.0, 140, 146, 4)), "advisory", "the rule", peak=-3.5, limit=0.0,
          tolerance=0.1, phase=("manoeuvring",), lacks=((IAS,), "stall"), most="possible"),
    Drill("stall-warning", "handling", (state(WARNING, "ON", 140, 142),), (state(WARNING, "ON", 140, 140.2),),
          "caution", "the rule", peak=1, limit=0.5, start=140, end=142, lacks=((WARNING,), "stall warning")),
    Drill("approach-sink-rate", "handling", (level(SINKS, -700), held(SINKS, -1300, 270, 280, 4)),
          (level(SINKS, -700), held(SINKS, -900, 270, 280, 4)), "advisory", "-1000 ft/min",
          **over(-1300, -1000, 270, 280, -700, 4), phase=("approach",), lacks=((SINKS, ALT), "vertical speed")),
    # 65 KIAS and 20 kt; 67.2 kt without the story
    Drill("approach-speed-high", "handling", (held(IAS, 90, 285, 292, 4),), (held(IAS, 80, 285, 292, 4),), "advisory",
          "aircraft.limits.approach_speed", peak=90, limit=65, start=284.1, end=292.9, slack=0.2, phase=("approach",),
          facts=limits(approach_speed="65 KIAS"), fact_missing="the aircraft file has no limits.approach_speed",
          lacks=((IAS,), "airspeed")),
    Drill("approach-speed-low", "handling", (held(IAS, 56, 285, 292, 4),), (), "advisory",
          "aircraft.limits.approach_speed", peak=56, limit=60, start=283.5, end=293.5, slack=0.25,
          phase=("approach",),
          facts=limits(approach_speed="60 KIAS"), fact_missing="the aircraft file has no limits.approach_speed",
          lacks=((IAS,), "airspeed")),
    Drill("take-off-pitch", "handling", (pulse(PITCH, 15, 39.5, 2),), (pulse(PITCH, 10, 39.5, 2),), "caution",
          "aircraft.limits.take_off_pitch", peak=15, limit=12, phase=("take-off",), tolerance=0.02,
          facts=limits(take_off_pitch="12 deg"), fact_missing="the aircraft file has no limits.take_off_pitch",
          lacks=((PITCH,), "pitch")),
    Drill("operating-altitude", "handling", (held(ALT, 3500, 140, 150, 10),), (), "caution",
          "aircraft.limits.operating_altitude", peak=3500, limit=3200, start=132.5, end=157.5, slack=0.2,
          facts=limits(operating_altitude="3200 ft"),
          fact_missing="the aircraft file has no limits.operating_altitude",
          phase=("cruise", "climb", "descent"), lacks=((ALT,), "pressure altitude")),
    Drill("flaps-altitude", "handling", (held(FLAPS, 10, 140, 150),), (), "caution", "aircraft.limits.flaps_altitude",
          peak=3100, limit=2900, start=139.125, end=150.875, cut_by="condition",
          facts=limits(flaps_altitude="2900 ft"),
          fact_missing="the aircraft file has no limits.flaps_altitude", lacks=((FLAPS,), "flap")),
    Drill("airbrakes-with-flaps", "handling", (state(BRAKES, "OUT", 140, 150), held(FLAPS, 10, 138, 152)),
          (state(BRAKES, "OUT", 140, 150),), "advisory", "the rule", peak=1, limit=0.5, start=140, end=150,
          lacks=((BRAKES,), "airbrakes")),
)  # fmt: skip

WING = {"wing": {"area": "13.6 m2", "mean_chord": "1.5 m", "lift_curve_slope": "4.9 1/rad"}}


def gust(change: float) -> float:
    """Derived gust velocity, ft/s, of a change of load factor at 100 KEAS, 900 kg and 3100 ft.

    14 CFR 23.341(c) before Amdt 23-64: n = 1 + K_g U V a / (498 W/S), in pounds, feet and knots.
    """
    loading = 900 / 0.45359237 / (13.6 / 0.3048**2)
    density = 0.0023769 * (1.0 - 6.8756e-6 * 3100.0) ** 4.2559
    ratio = 2.0 * loading / (density * 1.5 / 0.3048 * 4.9 * 32.174)
    alleviation = 0.88 * ratio / (5.3 + ratio)
    return change * 498.0 * loading / (alleviation * 100.0 * 4.9)


GUST = (
    Drill("gust-up", "gust", (pulse(NZ, 4.0, 140.5, 0.8),), (pulse(NZ, 3.0, 140.5, 0.8),), "advisory",
          "table over pressure altitude", peak=gust(3.0), limit=50, tolerance=0.03, facts=WING,
          lacks=(WITHOUT_NZ, "gust velocity")),
    Drill("gust-down", "gust", (pulse(NZ, -2.0, 140.5, 0.8),), (pulse(NZ, -0.9, 140.5, 0.8),), "advisory",
          "table over pressure altitude", peak=gust(-3.0), limit=-50, tolerance=0.03, facts=WING,
          lacks=(WITHOUT_NZ, "gust velocity")),
    Drill("rough-air-turbulence-speed", "gust", (pulse(NZ, 2.5, 140.5, 0.8),), (pulse(NZ, 1.5, 140.5, 0.8),),
          "advisory", "aircraft.speeds.turbulence", peak=100, limit=90, facts={**WING,
          **speeds(turbulence="90 KIAS")},
          cut_by="condition", fact_missing="the aircraft file has no turbulence speed", lacks=((IAS,), "airspeed")),
    Drill("rough-air-normal-operating", "gust", (pulse(NZ, 2.5, 140.5, 0.8),), (pulse(NZ, 1.5, 140.5, 0.8),),
          "advisory", "aircraft.speeds.normal_operating", peak=100, limit=90,
          facts={**WING, **speeds(normal_operating="90 KIAS")}, cut_by="condition",
          fact_missing="the aircraft file has no normal operating speed", lacks=((IAS,), "airspeed")),
)  # fmt: skip


def engine(
    rule: str, column: str, usual: float, value: float, limit: str, inspection: bool = False, fact: str = "",
    inside: float | None = None,
) -> Drill:  # fmt: skip
    """A rule of the engine set: a column at `usual` that goes to `value` for ten seconds."""
    at, name = float(limit.split()[0]), fact or rule.replace("-", "_")
    halfway = 0.5 * (usual + at) if inside is None else inside
    return Drill(
        rule, "engine", (level(column, usual), held(column, value, 140, 150, 4)),
        (level(column, usual), held(column, halfway, 140, 150, 4)), "caution", f"aircraft.limits.{name}",
        **over(value, at, 140, 150, usual, 4), facts=limits(**{name: limit}), inspection=inspection,
        fact_missing=f"the aircraft file has no limits.{name}",
        lacks=((column,), rule.removesuffix("-high").removesuffix("-low").replace("-", " ")),
    )  # fmt: skip


RUNNING = level("Engine Speed (rpm)", 2300)


def running(drill: Drill) -> Drill:
    return replace(drill, beyond=(RUNNING, *drill.beyond), inside=(RUNNING, *drill.inside))


ENGINE = (
    engine("engine-speed", "Engine Speed (rpm)", 2300, 2800, "2700 rpm", inspection=True),
    engine("propeller-speed", "Propeller Speed (rpm)", 1900, 2200, "2100 rpm", inspection=True),
    engine("gas-generator-speed", "Gas Generator Speed (%)", 90, 105, "101.5 %", inspection=True),
    engine("fan-speed", "Fan Speed (%)", 90, 105, "100 %", inspection=True),
    engine("torque", "Torque (%)", 80, 110, "100 %", inspection=True),
    engine("turbine-temperature", "Turbine Temperature (degC)", 650, 790, "750 degC", inspection=True),
    engine("exhaust-gas-temperature", "Exhaust Gas Temperature (degC)", 700, 900, "850 degC"),
    engine("cylinder-head-temperature", "Cylinder Head Temperature (degC)", 170, 245, "235 degC", inspection=True),
    engine("coolant-temperature", "Coolant Temperature (degC)", 90, 130, "120 degC", inspection=True),
    engine("oil-temperature", "Oil Temperature (degC)", 90, 125, "118 degC"),
    engine("oil-pressure-high", "Oil Pressure (bar)", 4.0, 7.5, "7 bar", fact="oil_pressure"),
    running(engine("oil-pressure-low", "Oil Pressure (bar)", 4.0, 1.2, "1.7 bar", fact="oil_pressure_minimum")),
    engine("fuel-pressure-high", "Fuel Pressure (bar)", 0.3, 0.5, "0.4 bar", fact="fuel_pressure"),
    running(engine("fuel-pressure-low", "Fuel Pressure (bar)", 0.3, 0.1, "0.15 bar", fact="fuel_pressure_minimum")),
    engine("manifold-pressure", "Manifold Pressure (inHg)", 24, 42, "39 inHg", inspection=True),
)  # fmt: skip

DRILLS = (*AIRFRAME, *AEROBATIC, *LANDING, *HANDLING, *GUST, *ENGINE)
