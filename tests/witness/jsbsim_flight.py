"""Flights simulated by JSBSim, an open flight dynamics model, and logs of them as a modest recorder would write them.

JSBSim (https://jsbsim.sourceforge.net, LGPL) solves six degrees of freedom over a rotating, oblate earth with its own
air data; nothing of it shares code, constants or conventions with the program. Deterministic: no turbulence, no clock.
Its units (ft, lb, deg R, psf) become SI here, by the exact factors written below and not by the program's table.
"""

from __future__ import annotations

import math
import tempfile
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import NamedTuple

import jsbsim
import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

FT = 0.3048
KT = 1852.0 / 3600.0
G0 = 9.80665
PSF = 0.45359237 * G0 / FT**2
RANKINE = 5.0 / 9.0
NOMINAL_RADIUS = 6_356_766.0  # m, of the geopotential altitude [US Standard Atmosphere 1976, from memory]

STEP = 1.0 / 120.0  # s, of the simulation
RATE = 8.0  # Hz, of the truth that is kept

# our quantity -> JSBSim's property and the factor to SI
PROPERTIES: dict[str, tuple[str, float]] = {
    "load_factor": ("accelerations/Nz", 1.0),  # at the CG, along the body's normal axis, up, over 32.174 ft/s2
    "calibrated_airspeed": ("velocities/vc-kts", KT),
    "equivalent_airspeed": ("velocities/ve-kts", KT),
    "true_airspeed": ("velocities/vt-fps", FT),
    "mach": ("velocities/mach", 1.0),
    "geometric_pressure_altitude": ("atmosphere/pressure-altitude", FT),  # JSBSim's altitudes are all geometric
    "static_pressure": ("atmosphere/P-psf", PSF),
    "dynamic_pressure": ("aero/qbar-psf", PSF),
    "static_air_temperature": ("atmosphere/T-R", RANKINE),
    "geometric_altitude": ("position/h-sl-ft", FT),
    "climb": ("velocities/h-dot-fps", FT),  # geometric
    "bank_angle": ("attitude/phi-rad", 1.0),
    "pitch_angle": ("attitude/theta-rad", 1.0),
    "heading": ("attitude/psi-rad", 1.0),
    "roll_rate": ("velocities/p-rad_sec", 1.0),
    "pitch_rate": ("velocities/q-rad_sec", 1.0),
    "yaw_rate": ("velocities/r-rad_sec", 1.0),
    "roll_acceleration": ("accelerations/pdot-rad_sec2", 1.0),
    "pitch_acceleration": ("accelerations/qdot-rad_sec2", 1.0),
    "yaw_acceleration": ("accelerations/rdot-rad_sec2", 1.0),
    "turn_rate": ("velocities/psidot-rad_sec", 1.0),
    "path_angle": ("flight-path/gamma-rad", 1.0),
    "ground_speed": ("velocities/vg-fps", FT),
}


class Leg(NamedTuple):
    """From `start` s on: hold a bank and either a path angle (`path`, deg) or a load factor (`pull`, g)."""

    start: float
    kind: str
    bank: float
    aim: float
    throttle: float


class Gains(NamedTuple):
    """Of the pilot: load factor proportional, integral, pitch damping; bank proportional, integral, roll damping."""

    n: float
    n_sum: float
    q: float
    bank: float
    bank_sum: float
    p: float


@dataclass(frozen=True, slots=True)
class Plan:
    """One flight: JSBSim's aircraft, where it starts, how warm the day is against the standard (K), and the legs."""

    model: str
    height_ft: float
    speed: tuple[str, float]  # JSBSim's initial condition
    warmer: float
    gains: Gains
    roll_rate: float  # deg/s, of changes of bank
    legs: tuple[Leg, ...]
    end: float


# a light single: climb, level, turns of 45, 30 and 60 degrees, a dive and a pull-up, a descent
TOURER = Plan("c172x", 4000.0, ("vc-kts", 100.0), 10.0, Gains(0.25, 0.5, 1.0, 2.0, 0.5, 0.8), 12.0, (
    Leg(0, "path", 0, 0, 0.78), Leg(20, "path", 0, 4, 1.0), Leg(70, "path", 0, 0, 0.78),
    Leg(85, "path", 45, 0, 1.0), Leg(125, "path", 0, 0, 0.75), Leg(140, "path", -30, 0, 0.8),
    Leg(185, "path", 0, 0, 0.8), Leg(195, "path", 0, -12, 0.8), Leg(210, "pull", 0, 2.6, 0.8),
    Leg(213, "path", 0, 0, 0.9), Leg(235, "path", 0, -4, 0.4), Leg(265, "path", 20, -4, 0.4),
    Leg(290, "path", -60, -2, 1.0), Leg(310, "path", 0, 0, 0.8),
), 330.0)  # fmt: skip

# a jet where compressibility counts: level, a turn of 35 degrees, a descent
JET = Plan("737", 33000.0, ("mach", 0.78), 10.0, Gains(0.05, 0.1, 1.0, 1.0, 0.1, 0.8), 5.0, (
    Leg(0, "path", 0, 0, 0.85), Leg(20, "path", 35, 0, 0.9), Leg(95, "path", 0, 0, 0.85),
    Leg(105, "path", 0, -4, 0.5), Leg(155, "path", 0, 0, 0.8),
), 185.0)  # fmt: skip


def _within(value: float, least: float, most: float) -> float:
    return max(least, min(most, value))


def fly(plan: Plan) -> dict[str, Array]:
    """Fly a plan in JSBSim.

    Returns: `time` in s and every key of PROPERTIES in SI, each (n,) at 8 Hz; the truth, without any sensor.
    """
    sim = jsbsim.FGFDMExec(None)
    sim.set_debug_level(0)
    sim.set_output_path(tempfile.mkdtemp(prefix="jsbsim-"))  # some models write a file as soon as they are loaded
    assert sim.load_model(plan.model)
    sim.disable_output()
    sim.set_dt(STEP)
    sim["atmosphere/delta-T"] = plan.warmer / RANKINE
    for name, value in (("h-sl-ft", plan.height_ft), plan.speed, ("gamma-deg", 0.0), ("psi-true-deg", 40.0),
                        ("lat-geod-deg", 47.0)):  # fmt: skip
        sim[f"ic/{name}"] = value
    sim["propulsion/set-running"] = -1
    assert sim.run_ic()
    engines = [name for name in ("", "[1]") if sim.query_property_catalog(f"fcs/throttle-cmd-norm{name}")]
    for name in engines:
        sim[f"fcs/throttle-cmd-norm{name}"] = 0.7
        sim[f"fcs/mixture-cmd-norm{name}"] = 0.9
    sim["gear/gear-cmd-norm"] = sim["gear/gear-pos-norm"] = 0.0
    sim["simulation/do_simple_trim"] = 1
    kept = round(1.0 / (RATE * STEP))
    rows: list[list[float]] = []
    bank = path = pulled = rolled = 0.0
    asked = 1.0
    interval = 4 * STEP
    gains = plan.gains
    for step in range(round(plan.end / STEP)):
        leg = next(one for one in reversed(plan.legs) if one.start <= step * STEP + 1e-9)
        if step % kept == 0:
            rows.append([sim[name] for name, _ in PROPERTIES.values()])
        if step % 4 == 0:
            phi, gamma = sim["attitude/phi-rad"], sim["flight-path/gamma-rad"]
            turn = math.radians(plan.roll_rate) * interval
            bank += _within(math.radians(leg.bank) - bank, -turn, turn)
            if leg.kind == "path":
                bend = math.radians(1.5) * interval
                path += _within(math.radians(leg.aim) - path, -bend, bend)
                speed = sim["velocities/vt-fps"] * FT
                wanted = (math.cos(gamma) + 0.4 * speed * (path - gamma) / G0) / math.cos(phi)
            else:
                wanted, path = leg.aim, gamma
            # hands move with a finite speed: at most 2 g a second
            asked += _within(_within(wanted, 0.2, 3.2) - asked, -2.0 * interval, 2.0 * interval)
            error = asked - sim["accelerations/Nz"]
            pulled = _within(pulled + gains.n_sum * error * interval, -0.8, 0.8)
            rolled = _within(rolled + gains.bank_sum * (bank - phi) * interval, -0.3, 0.3)
            # JSBSim's elevator command is positive for nose down
            elevator = -(gains.n * error + pulled) + gains.q * sim["velocities/q-rad_sec"]
            aileron = gains.bank * (bank - phi) + rolled - gains.p * sim["velocities/p-rad_sec"]
            sim["fcs/elevator-cmd-norm"] = _within(elevator, -1.0, 1.0)
            sim["fcs/aileron-cmd-norm"] = _within(aileron, -1.0, 1.0)
            sim["fcs/rudder-cmd-norm"] = _within(-sim["aero/beta-rad"], -1.0, 1.0)
            for name in engines:
                sim[f"fcs/throttle-cmd-norm{name}"] = leg.throttle
        assert sim.run()
    table = np.array(rows)
    made = {name: table[:, i] * factor for i, (name, (_, factor)) in enumerate(PROPERTIES.items())}
    made["time"] = np.arange(len(table)) / RATE
    radius = NOMINAL_RADIUS
    geometric = made.pop("geometric_pressure_altitude")
    made["pressure_altitude"] = radius * geometric / (radius + geometric)
    # a rise through warm air crosses fewer isobars than one through standard air: dH_p / dH = T_standard / T
    standard = np.maximum(288.15 - 0.0065 * made["pressure_altitude"], 216.65)
    rise = made["climb"] * (radius / (radius + made["geometric_altitude"])) ** 2
    made["vertical_speed"] = rise * standard / made["static_air_temperature"]
    return made


def load_factor_at(flown: Mapping[str, Array], position: tuple[float, float, float]) -> Array:
    """What an accelerometer forward, right and down (m) of the CG feels along the normal axis, up.

    a = a_cg + dw/dt x r + w x (w x r), with JSBSim's own angular accelerations. Source: rigid-body kinematics, from
    memory.
    """
    x, y, z = position
    p, q, r = (flown[f"{axis}_rate"] for axis in ("roll", "pitch", "yaw"))
    dp, dq = flown["roll_acceleration"], flown["pitch_acceleration"]
    down = dp * y - dq * x + p * (r * x - p * z) - q * (q * z - r * y)
    return flown["load_factor"] - down / G0


class Column(NamedTuple):
    """A column of a log: heading, SI of one unit and of its zero, samples a second; noise (rms), step in the unit."""

    heading: str
    factor: float
    zero: float
    rate: float
    noise: float
    step: float


DEG = math.pi / 180.0
# noise and steps of a fair general aviation recorder; common practice, no source
COLUMNS: dict[str, Column] = {
    "load_factor": Column("Normal acceleration [m/s2]", 1.0 / G0, 0.0, 8, 0.06, 0.04),
    "calibrated_airspeed": Column("Indicated airspeed [kt]", KT, 0.0, 2, 0.15, 0.1),
    "pressure_altitude": Column("Pressure altitude [ft]", FT, 0.0, 2, 1.0, 1.0),
    "bank_angle": Column("Bank [deg]", DEG, 0.0, 4, 0.1, 0.1),
    "pitch_angle": Column("Pitch [deg]", DEG, 0.0, 4, 0.1, 0.1),
    "heading": Column("Heading [deg]", DEG, 0.0, 4, 0.1, 0.1),
    "roll_rate": Column("Roll rate [deg/s]", DEG, 0.0, 4, 0.15, 0.1),
    "pitch_rate": Column("Pitch rate [deg/s]", DEG, 0.0, 4, 0.15, 0.1),
    "yaw_rate": Column("Yaw rate [deg/s]", DEG, 0.0, 4, 0.15, 0.1),
    "static_air_temperature": Column("Outside air temperature [degC]", 1.0, 273.15, 1, 0.2, 0.5),
}


def record(
    flown: Mapping[str, Array], path: Path, names: list[str], *, noisy: bool, sensor: tuple[float, float, float]
) -> None:
    """Write a log of these quantities: one row an eighth of a second, empty cells where a channel is slower."""
    noise = np.random.default_rng(20310502)
    count = len(flown["time"])
    cells: list[list[str]] = [[f"{time:.3f}" for time in flown["time"]]]
    for name in names:
        column = COLUMNS[name]
        truth = load_factor_at(flown, sensor) if name == "load_factor" else flown[name]
        shown = (truth - column.zero) / column.factor
        if noisy:
            shown = np.round((shown + column.noise * noise.standard_normal(count)) / column.step) * column.step
        every = round(RATE / column.rate)
        cells.append([f"{value:.6f}" if row % every == 0 else "" for row, value in enumerate(shown.tolist())])
    heading = ",".join(["Time [s]", *(COLUMNS[name].heading for name in names)])
    path.write_text("\n".join([heading, *(",".join(row) for row in zip(*cells, strict=True))]) + "\n", encoding="utf-8")


AIRCRAFT = """\
# Invented: stands for no aeroplane. Position error: none, so indicated and calibrated airspeed are the same.
format: exceed-aircraft/1
registration: ZZ-JSB
type: Witness
category: normal
flaps: none
gear: fixed
mass: {{empty: {empty} kg, maximum_take_off: {most} kg}}
stall_speed:
  - {{flaps: 0 deg, mass: {most} kg, upright: 50 KCAS, inverted: 60 KCAS}}
load_factor:
  - {{flaps: 0 deg, maximum: 3.8 g, minimum: -1.52 g}}
position_error:
  - {{flaps: 0 deg, points: [[20 KIAS, 20 KCAS], [600 KIAS, 600 KCAS]]}}
recorder:
  accelerometer: {{position: [{forward} m, {right} m, {down} m]}}
source: "Invented for a comparison"
"""


def write_aircraft(path: Path, sensor: tuple[float, float, float]) -> None:
    """An aircraft file whose accelerometer is where the log's was."""
    forward, right, down = sensor
    text = AIRCRAFT.format(empty=700, most=1150, forward=forward, right=right, down=down)
    path.write_text(text, encoding="utf-8")
