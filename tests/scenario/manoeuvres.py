"""Manoeuvres: each is a function of the simulation that yields commands until it is over.

Arguments are in the units pilots use and say so: kt calibrated, ft pressure altitude, deg, g, s, ft/min.
Sustained manoeuvres are flown by simple control laws, pulls by shapes that are prescribed.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator

from scenario.air import FT, FT_MIN, G0, KT
from scenario.flight import Command, Manoeuvre, Sim
from scenario.pilot import configured, roll_to, steady, wrap

Shape = Callable[[float], float]


def standing(seconds: float) -> Manoeuvre:
    def run(sim: Sim) -> Iterator[Command]:
        sim.label, end = "standing", sim.time + seconds
        while sim.time < end:
            yield configured(sim, ground=True, power=0.0)

    return run


def taxi(seconds: float, to_deg: float | None = None, speed_kt: float = 12.0) -> Manoeuvre:
    """Taxi with gentle turns and end standing on a heading (the runway's if none is given)."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, end = "taxi", sim.time + seconds
        final = sim.runway if to_deg is None else math.radians(to_deg)
        turn = wrap(final - sim.heading)
        start = sim.time
        while sim.time < end or sim.speed > 0.05 or abs(wrap(final - sim.heading)) > 0.001:
            left = end - sim.time
            inside = (sim.time - start) / seconds
            wanted = 0.0 if left < 8.0 else speed_kt * KT
            acceleration = max(-0.8, min(0.5, 0.6 * (wanted - sim.speed)))
            if wanted == 0.0 and sim.speed < 0.4:
                acceleration = -0.4
            yaw = 0.0
            if 0.2 < inside < 0.7:
                yaw = turn / (0.5 * seconds) * (1.0 - math.cos(2.0 * math.pi * (inside - 0.2) / 0.5))
            elif left < 0.0:
                sim.heading, acceleration = final, -0.8
            yield configured(sim, longitudinal=acceleration / G0, yaw_rate=yaw, power=0.12)

    return run


def take_off(flaps_deg: float = 0.0) -> Manoeuvre:
    """Roll along the runway, rotate and lift off."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label = "take-off"
        sim.flaps_wanted = flaps_deg
        airframe = sim.airframe
        sim.heading = sim.runway
        pitch = 0.02
        while True:
            equivalent = sim.equivalent_airspeed
            along = max(0.08, airframe.longitudinal(max(equivalent, 5.0), 0.5, 1.0) - 0.02)
            if equivalent > airframe.rotate_kcas * KT:
                pitch = min(pitch + 0.0008, airframe.incidence(1.0, equivalent, sim.mass, sim.flaps_deg))
                if pitch >= airframe.incidence(1.0, equivalent, sim.mass, sim.flaps_deg) - 1e-9:
                    break
            yield configured(sim, longitudinal=along, ground_pitch=pitch, power=1.0)
        sim.longitudinal = along
        sim.lift_off()

    return run


def climb(
    to_ft: float, kcas: float, rate_ft_min: float, mach: float | None = None, clean_at_ft: float = 500.0
) -> Manoeuvre:
    """Climb on the present heading; gear and flaps come up a certain height above the aerodrome."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label = "climb"
        while sim.pressure_altitude < to_ft * FT - 40.0 * rate_ft_min / 2000.0:
            if sim.height > 0.3 * clean_at_ft * FT:
                sim.gear_wanted = False
            if sim.height > clean_at_ft * FT:
                sim.flaps_wanted = 0.0
            left = to_ft * FT - sim.pressure_altitude
            rise = min(rate_ft_min * FT_MIN, 0.25 * left, 1.5 + 0.12 * max(sim.height, 0.0))
            yield steady(sim, rise, 0.0, kcas, mach)

    return run


def level(seconds: float, kcas: float, alt_ft: float, mach: float | None = None, bank_deg: float = 0.0) -> Manoeuvre:
    """Hold height, speed and bank for a time."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, end = ("cruise" if bank_deg == 0.0 else "turn"), sim.time + seconds
        while sim.time < end:
            rise = max(-5.0, min(5.0, 0.25 * (alt_ft * FT - sim.pressure_altitude)))
            yield steady(sim, rise, math.radians(bank_deg), kcas, mach)

    return run


def rough_air(
    seconds: float, kcas: float, alt_ft: float, rms: float, gusts: list[tuple[float, float, float]]
) -> Manoeuvre:
    """Level flight in turbulence of an rms vertical speed in m/s, with 1-cosine gusts (after s, lasting s, m/s up)."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, start = "rough air", sim.time
        left = sorted(gusts)
        while sim.time < start + seconds:
            inside = sim.time - start
            sim.turbulence = rms * min(1.0, inside / 10.0, (seconds - inside) / 10.0)
            if left and inside >= left[0][0]:
                sim.gust = (sim.time, left[0][1], left[0][2])
                sim.mark("gust")
                left.pop(0)
            rise = max(-3.0, min(3.0, 0.15 * (alt_ft * FT - sim.pressure_altitude)))
            yield steady(sim, rise, 0.0, kcas, quick=0.35)
        sim.turbulence, sim.gust = 0.0, None

    return run


def turn_to(heading_deg: float, kcas: float, alt_ft: float, bank_deg: float = 25.0) -> Manoeuvre:
    """Turn the shorter way to a heading and roll out."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, wanted = "turn", math.radians(heading_deg)
        most = math.radians(bank_deg)
        while abs(wrap(wanted - sim.path_heading)) > 0.01 or abs(sim.path_bank) > 0.02:
            bank = max(-most, min(most, 1.4 * wrap(wanted - sim.path_heading)))
            rise = max(-4.0, min(4.0, 0.25 * (alt_ft * FT - sim.pressure_altitude)))
            yield steady(sim, rise, bank, kcas)

    return run


def steep_turn(bank_deg: float, seconds: float, n: float | None, alt_ft: float, kcas: float) -> Manoeuvre:
    """A steep turn; with `n` the pilot pulls to that load factor whatever the height does, else height is held."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, start = "steep turn", sim.time
        bank = math.radians(bank_deg)
        while sim.time < start + seconds:
            rise = max(-4.0, min(4.0, 0.3 * (alt_ft * FT - sim.pressure_altitude)))
            command = steady(sim, rise, bank, kcas)
            if n is not None and abs(sim.path_bank) > 0.8 * abs(bank):
                share = min(1.0, (sim.time - start) / 6.0)
                easing = sim.time < sim.stalled_until
                if not easing and sim.stalled_since > start:
                    return  # the wing has let go once; the pilot has had enough
                command.load_factor = 1.2 if easing else command.load_factor + share * (n - command.load_factor)
            yield command

    return run


def pulse(rise_s: float, hold_s: float, fall_s: float) -> Shape:
    """0 to 1 and back with raised-cosine flanks; of time in s from its start."""

    def shape(inside: float) -> float:
        if inside < rise_s:
            return 0.5 - 0.5 * math.cos(math.pi * inside / rise_s)
        if inside < rise_s + hold_s:
            return 1.0
        if inside < rise_s + hold_s + fall_s:
            return 0.5 + 0.5 * math.cos(math.pi * (inside - rise_s - hold_s) / fall_s)
        return 0.0

    return shape


def pull(n: float, rise_s: float = 1.0, hold_s: float = 0.4, fall_s: float = 1.0, power: float = 0.8) -> Manoeuvre:
    """A pull (or, with n below 1, a push) to a load factor, wings as they are; the path is whatever follows."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, start, before = "pull", sim.time, sim.load_factor
        shape = pulse(rise_s, hold_s, fall_s)
        while sim.time < start + rise_s + hold_s + fall_s:
            wanted = before + (n - before) * shape(sim.time - start)
            along = sim.airframe.longitudinal(sim.equivalent_airspeed, sim.load_factor, power)
            yield configured(sim, load_factor=wanted, longitudinal=along, power=power, lag=0.01)

    return run


def loop(n: float, top_n: float = 1.8) -> Manoeuvre:
    """An inside loop: the pilot pulls to n, eases over the top, pulls again and stops level."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, turned, last = "loop", 0.0, sim.path_angle
        while turned < 2.0 * math.pi - 0.12:
            wanted = top_n + (n - top_n) * (0.5 + 0.5 * math.cos(turned)) ** 0.7
            if turned > 5.2:
                wanted = 1.0 + (wanted - 1.0) * max(0.0, (2.0 * math.pi - turned) / 1.083)
            limit = sim.airframe.normal_force_limit(sim.equivalent_airspeed, sim.mass, sim.flaps_deg, False)
            wanted = min(wanted, 0.8 * limit)  # a pilot who flies by the shaking of the wing
            power = 1.0 if turned < math.pi else 0.15
            along = sim.airframe.longitudinal(sim.equivalent_airspeed, sim.load_factor, power)
            now = sim.path_angle
            turned, last = turned + abs(now - last), now
            yield configured(sim, load_factor=wanted, longitudinal=along, power=power, lag=0.35)

    return run


def roll(rate_deg_s: float, n: float = 1.0, turns: float = 1.0) -> Manoeuvre:
    """Roll through whole or half turns at a rate (positive to the right) while holding a load factor."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, turned, last = "roll", 0.0, sim.path_bank
        rate = math.radians(rate_deg_s)
        goal = 2.0 * math.pi * turns - 0.25 * abs(rate)
        while turned < goal:
            now = sim.path_bank
            turned, last = turned + abs(wrap(now - last)), now
            along = sim.airframe.longitudinal(sim.equivalent_airspeed, sim.load_factor, 0.9)
            yield configured(sim, load_factor=n, roll_rate=rate, longitudinal=along, power=0.9)

    return run


def inverted(seconds: float, kcas: float) -> Manoeuvre:
    """Level inverted flight, held by pushing; then half a roll back."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, start = "inverted", sim.time
        while sim.time < start + seconds:
            command = steady(sim, 0.0, math.pi, kcas)
            if abs(wrap(sim.path_bank - math.pi)) > 0.8:
                command.load_factor = 0.3
            yield command

    return run


def dive(angle_deg: float, to_kcas: float, power: float = 0.4) -> Manoeuvre:
    """Push over to a steep descent and stay in it until a speed is reached; the pull comes as the next manoeuvre."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, wanted = "dive", -math.radians(angle_deg)
        while sim.equivalent_airspeed < to_kcas * KT or sim.path_angle > 0.8 * wanted:
            rate = max(-0.12, min(0.12, 1.0 * (wanted - sim.path_angle)))
            normal = math.cos(sim.path_angle) + sim.speed * rate / G0
            along = sim.airframe.longitudinal(sim.equivalent_airspeed, sim.load_factor, power)
            roll_rate = roll_to(sim, 0.0)
            yield configured(sim, load_factor=normal, roll_rate=roll_rate, longitudinal=along, power=power)

    return run


def recover(alt_ft: float, kcas: float, seconds: float = 20.0) -> Manoeuvre:
    """Back to level flight after a manoeuvre, gently."""
    return level(seconds, kcas, alt_ft)


def descend(
    to_ft: float, kcas: float, rate_ft_min: float, mach: float | None = None, airbrakes: bool = False
) -> Manoeuvre:
    """Descend on the present heading."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, sim.airbrakes_wanted = "descent", airbrakes
        while sim.pressure_altitude > to_ft * FT + 15.0:
            rise = -min(rate_ft_min * FT_MIN, 1.0 + 0.2 * (sim.pressure_altitude - to_ft * FT))
            yield steady(sim, rise, 0.0, kcas, mach, brake=True)
        sim.airbrakes_wanted = False

    return run


def configure(flaps_deg: float | None = None, gear_down: bool | None = None) -> Manoeuvre:
    """Set flaps or gear; takes no time itself."""

    def run(sim: Sim) -> Iterator[Command]:
        if flaps_deg is not None:
            sim.flaps_wanted = flaps_deg
        if gear_down is not None:
            sim.gear_wanted = gear_down
        yield from ()

    return run


def approach(
    kcas: float, flaps: list[tuple[float, float]], down_to_ft: float = 40.0, angle_deg: float = 3.0
) -> Manoeuvre:
    """Final approach along a glide path; flaps: (height in ft, setting in deg), highest first."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, sim.gear_wanted = "approach", True
        schedule = list(flaps)
        while sim.height > down_to_ft * FT:
            while schedule and sim.height < schedule[0][0] * FT:
                sim.flaps_wanted = schedule.pop(0)[1]
            yield steady(sim, -sim.speed * math.sin(math.radians(angle_deg)), 0.0, kcas)

    return run


def landing(sink_ft_min: float, impact_s: float = 0.18) -> Manoeuvre:
    """Flare to a sink rate, touch down, roll out to taxi speed."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.label, sim.impact_duration = "landing", impact_s
        start_height = max(sim.height, 1.0)
        start_rise = -sim.speed * sim.down_components()[0]
        final = -sink_ft_min * FT_MIN
        kcas = sim.airframe.final_kcas
        while sim.height > 0.5 * impact_s * -min(final, -0.2):
            share = max(0.0, min(1.0, sim.height / start_height))
            # steep at first, then the asked rate over the last quarter
            rise = final + (start_rise - final) * max(0.0, (share - 0.25) / 0.75)
            yield steady(sim, rise, 0.0, kcas - 4.0, quick=2.0)
        sim.touch_down()
        incidence = sim.airframe.incidence(1.0, sim.equivalent_airspeed, sim.mass, sim.flaps_deg)
        start, pitch = sim.time, max(0.02, incidence)
        while sim.speed > 10.0 * KT:
            inside = sim.time - start
            nose = 0.02 + (pitch - 0.02) * max(0.0, 1.0 - inside / 2.5)
            yield configured(sim, longitudinal=-0.05 - 0.15 * min(1.0, inside / 4.0), ground_pitch=nose, power=0.05)
        sim.mark("landed")
        sim.flaps_wanted = 0.0

    return run


def go_around(to_ft: float, kcas: float, rate_ft_min: float) -> Manoeuvre:
    """Power, a step of flaps up, climb away."""

    def run(sim: Sim) -> Iterator[Command]:
        sim.mark("go_around")
        sim.flaps_wanted = 0.5 * sim.flaps_wanted
        yield from climb(to_ft, kcas, rate_ft_min, clean_at_ft=600.0)(sim)

    return run
