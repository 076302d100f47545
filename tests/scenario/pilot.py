"""The pilot: control laws that turn a wanted vertical speed, bank and airspeed into commands."""

from __future__ import annotations

import math

from scenario.air import G0, KT, true_from_calibrated
from scenario.flight import Command, Sim, sound_speed


def wrap(angle: float) -> float:
    """An angle in rad between -pi and pi."""
    return (angle + math.pi) % (2.0 * math.pi) - math.pi


def configured(sim: Sim, **command: float) -> Command:
    """A command with the flaps, gear and airbrakes that are wanted now."""
    made = Command(**command)  # type: ignore[arg-type]
    made.flaps_deg, made.gear_down, made.airbrakes_out = sim.flaps_wanted, sim.gear_wanted, sim.airbrakes_wanted
    return made


def roll_to(sim: Sim, bank: float) -> float:
    """Roll rate towards a bank."""
    most = sim.airframe.roll_rate
    return max(-most, min(most, 2.0 * wrap(bank - sim.path_bank)))


def reach(sim: Sim) -> tuple[float, float]:
    """Longitudinal load factor with power off and with full power."""
    equivalent = max(sim.equivalent_airspeed, 15.0)
    idle = sim.airframe.longitudinal(equivalent, sim.load_factor, 0.0)
    if sim.airbrakes_wanted:
        idle -= 0.10
    full = sim.airframe.longitudinal(equivalent, sim.load_factor, 1.0)
    extended = 0.0012 * sim.flaps_deg + (0.03 * sim.gear if sim.airframe.retractable else 0.0)
    return idle - extended, full - extended


def true_target(sim: Sim, kcas: float, mach: float | None) -> float:
    """TAS in m/s for a calibrated airspeed in kt, or for the Mach number if that is slower."""
    target = true_from_calibrated(kcas * KT, sim.static_pressure, sim.static_temperature)
    return target if mach is None else min(target, mach * sound_speed(sim.static_temperature))


def steady(
    sim: Sim,
    rise: float,
    bank: float,
    kcas: float,
    mach: float | None = None,
    quick: float = 0.6,
    brake: bool = False,
) -> Command:
    """Hold a vertical speed in m/s, a bank in rad and a calibrated airspeed in kt (or a Mach number below it)."""
    speed_error = true_target(sim, kcas, mach) - sim.speed
    wanted_sine = rise / max(sim.speed, 10.0)
    idle, full = reach(sim)
    if wanted_sine > 0.0:  # speed before height: climb only as steeply as the thrust holds the speed
        most = full - 0.06 * max(speed_error, 0.0) / G0
        wanted_sine = min(wanted_sine, max(most, 0.01))
    elif brake and speed_error < 0.0:
        wanted_sine = max(wanted_sine, idle - 0.06 * speed_error / G0)
    wanted_path = math.asin(max(-0.6, min(0.6, wanted_sine)))
    path = sim.path_angle
    path_rate = max(-0.12, min(0.12, quick * (wanted_path - path)))
    cosine = math.cos(sim.path_bank)
    if abs(cosine) < 0.2:
        cosine = math.copysign(0.2, cosine)
    normal = (math.cos(path) + sim.speed * path_rate / G0) / cosine
    # rolling through the vertical nobody pushes for height
    normal = max(-1.3, min(3.2, normal))
    # propulsion cannot give more than it has, and the pilot does not slam it
    along = max(idle, min(full, math.sin(path) + max(-0.12, min(0.12, 0.15 * speed_error / G0))))
    power = max(0.0, min(1.0, (along - idle) / (full - idle)))
    return configured(sim, load_factor=normal, roll_rate=roll_to(sim, bank), longitudinal=along, power=power)
