"""A kinematically consistent point-mass flight at 100 Hz.

The state is the air-relative velocity (its size and the orientation of the wind axes, as a quaternion) in an air
mass that moves with a constant wind. The pilot asks for a load factor, a roll rate and a longitudinal force; motion
follows from specific force and gravity alone, so that height, speed, attitude, rates and accelerations agree.
Gusts change the lift and the airspeed that is sensed, not the attitude. SI; everything is deterministic.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field

import numpy as np

from scenario.air import DENSITY_0, G0, GAMMA, GAS_CONSTANT, Array, standard_pressure, standard_temperature
from scenario.airframes import Airframe

STEP = 0.01


@dataclass(slots=True)
class Command:
    """What the pilot wants now. Rates and forces; the manoeuvres compute them from targets."""

    load_factor: float = 1.0
    roll_rate: float = 0.0
    longitudinal: float = 0.0  # thrust minus drag over weight; on the ground, acceleration over g
    lag: float = 0.25  # s, how quickly the load factor follows
    flaps_deg: float = 0.0
    gear_down: bool = True
    airbrakes_out: bool = False
    ground: bool = False
    yaw_rate: float = 0.0  # on the ground only
    ground_pitch: float = 0.02  # on the ground only
    power: float = 0.5


@dataclass(slots=True)
class Sim:
    """The state that manoeuvres read. `height` is above the aerodrome."""

    airframe: Airframe
    mass: float
    fuel: float
    field_altitude: float  # pressure altitude of the aerodrome, m
    temperature_deviation: float
    headwind: float  # m/s along the runway
    runway: float  # rad, also the direction the wind comes from
    time: float = 0.0
    speed: float = 0.0  # TAS in flight, ground speed on the ground
    quaternion: tuple[float, float, float, float] = (1.0, 0.0, 0.0, 0.0)
    height: float = 0.0
    pressure_altitude: float = 0.0
    sink: float = 0.0  # on the ground: remaining vertical speed in the impact
    load_factor: float = 1.0
    roll_rate: float = 0.0
    longitudinal: float = 0.0
    flaps_deg: float = 0.0
    gear: float = 1.0
    heading: float = 0.0
    on_ground: bool = True
    impact: tuple[float, float, float] | None = None  # start, duration, size in g
    impact_duration: float = 0.18
    stalled_until: float = -1.0
    stalled_since: float = -1.0
    turbulence: float = 0.0  # m/s rms, vertical
    gust: tuple[float, float, float] | None = None  # start, duration, upward speed
    label: str = "standing"
    flaps_wanted: float = 0.0  # deg
    gear_wanted: bool = True
    airbrakes_wanted: bool = False
    static_temperature: float = 288.15
    static_pressure: float = 101325.0
    density: float = DENSITY_0
    marks: list[tuple[float, str]] = field(default_factory=list)

    def down_components(self) -> tuple[float, float, float]:
        """Down components of the three wind axes: -sin(gamma), cos(gamma) sin(mu), cos(gamma) cos(mu)."""
        a, b, c, d = self.quaternion
        return 2.0 * (b * d - a * c), 2.0 * (c * d + a * b), a * a - b * b - c * c + d * d

    @property
    def path_angle(self) -> float:
        return -math.asin(max(-1.0, min(1.0, self.down_components()[0])))

    @property
    def path_bank(self) -> float:
        _, y, z = self.down_components()
        return math.atan2(y, z)

    @property
    def path_heading(self) -> float:
        if self.on_ground:
            return self.heading
        a, b, c, d = self.quaternion
        return math.atan2(2.0 * (b * c + a * d), a * a + b * b - c * c - d * d)

    @property
    def equivalent_airspeed(self) -> float:
        return self.airspeed * math.sqrt(self.density / DENSITY_0)

    @property
    def airspeed(self) -> float:
        """TAS without gusts."""
        if not self.on_ground:
            return self.speed
        return max(self.speed + self.headwind * math.cos(self.heading - self.runway), 0.0)

    def mark(self, name: str) -> None:
        """Note an instant by name, for the truth record."""
        self.marks.append((self.time, name))

    def lift_off(self) -> None:
        """Change from the ground to flight, along the runway."""
        self.speed = self.airspeed
        half = 0.5 * self.heading
        self.quaternion = (math.cos(half), 0.0, 0.0, math.sin(half))
        self.on_ground = False
        self.load_factor, self.roll_rate = 1.0, 0.0
        self.mark("take_off")

    def touch_down(self) -> None:
        """Change from flight to the ground; the impact takes the vertical speed away as a half sine."""
        self.sink = self.speed * self.down_components()[0]
        self.heading = self.path_heading
        ground = self.speed * math.cos(self.path_angle) - self.headwind * math.cos(self.heading - self.runway)
        size = math.pi * self.sink / (2.0 * self.impact_duration * G0)
        self.impact = (self.time, self.impact_duration, size)
        self.speed, self.on_ground = ground, True
        self.mark("touchdown")


Manoeuvre = Callable[[Sim], Iterator[Command]]


@dataclass(frozen=True, eq=False)
class Flight:
    """The truth: channels in SI at 100 Hz, and the instants that were marked while flying."""

    airframe: Airframe
    channels: dict[str, Array]
    labels: list[tuple[float, str]]
    marks: list[tuple[float, str]]

    @property
    def time(self) -> Array:
        return self.channels["time"]

    def __getitem__(self, name: str) -> Array:
        return self.channels[name]

    def marked(self, name: str) -> list[float]:
        """Times in s of the marks of one name."""
        return [time for time, what in self.marks if what == name]


def coloured_noise(count: int, seed: int, corner: float = 2.0) -> Array:
    """Unit-variance noise at 100 Hz with two real poles at `corner` Hz (deterministic for a seed)."""
    white = np.random.default_rng(seed).standard_normal(count + 400)
    keep = math.exp(-2.0 * math.pi * corner * STEP)
    # two cascaded first-order filters as one short kernel: no recursion needed, and no scipy
    lags = np.arange(400)
    kernel = (lags + 1.0) * keep**lags
    kernel /= math.sqrt(float(np.sum(kernel**2)))
    return np.convolve(white, kernel)[400 : 400 + count]


def fly(
    airframe: Airframe,
    manoeuvres: list[Manoeuvre],
    *,
    mass: float,
    fuel: float,
    seed: int = 1,
    field_altitude: float = 120.0,
    temperature_deviation: float = 0.0,
    headwind: float = 4.0,
    runway_deg: float = 240.0,
) -> Flight:
    """Fly the manoeuvres one after another and return the truth.

    Parameters: mass in kg with fuel at the start; fuel in kg; field_altitude: pressure altitude in m.
    """
    sim = Sim(airframe, mass, fuel, field_altitude, temperature_deviation, headwind, math.radians(runway_deg))
    sim.heading = math.radians(runway_deg - 90.0)
    sim.pressure_altitude = field_altitude
    noise = coloured_noise(300_000, seed)
    along = coloured_noise(300_000, seed + 7919, corner=0.6)
    rough = coloured_noise(300_000, seed + 104729, corner=6.0)
    rows: list[tuple[float, ...]] = []
    labels: list[tuple[float, str]] = []
    for manoeuvre in manoeuvres:
        for command in manoeuvre(sim):
            if not labels or labels[-1][1] != sim.label:
                labels.append((sim.time, sim.label))
            index = len(rows)
            rows.append(_step(sim, command, noise[index], along[index], rough[index]))
    from scenario.derived import channels_from_rows  # the second half of the model; it needs STEP from here

    return Flight(airframe, channels_from_rows(airframe, rows, sim), labels, list(sim.marks))


def _gust(sim: Sim, noise: float) -> float:
    up = sim.turbulence * noise
    if sim.gust is not None:
        start, duration, speed = sim.gust
        inside = sim.time - start
        if 0.0 <= inside <= duration:
            up += 0.5 * speed * (1.0 - math.cos(2.0 * math.pi * inside / duration))
    return up


def _step(sim: Sim, command: Command, noise: float, along: float, rough: float) -> tuple[float, ...]:
    """Record the state with the forces that act now, then move on by one step."""
    airframe = sim.airframe
    temperature = float(standard_temperature_fast(sim.pressure_altitude))
    sim.static_temperature = temperature + sim.temperature_deviation
    sim.static_pressure = standard_pressure_fast(sim.pressure_altitude)
    sim.density = sim.static_pressure / (GAS_CONSTANT * sim.static_temperature)
    equivalent = sim.equivalent_airspeed
    sim.flaps_deg += max(-0.06, min(0.06, command.flaps_deg - sim.flaps_deg))  # 6 deg/s
    if airframe.retractable:
        sim.gear += max(-STEP / 6.0, min(STEP / 6.0, (1.0 if command.gear_down else 0.0) - sim.gear))

    up = along_gust = 0.0
    limit = airframe.normal_force_limit(max(equivalent, 1.0), sim.mass, sim.flaps_deg, False)
    if sim.on_ground:
        normal, geometric = _ground_normal(sim, rough), command.ground_pitch
        aerodynamic = geometric
        longitudinal = command.longitudinal
        warning = False
    else:
        up, along_gust = _gust(sim, noise), sim.turbulence * 0.7 * along
        sim.load_factor += STEP / max(command.lag, STEP) * (command.load_factor - sim.load_factor)
        sim.longitudinal += STEP / 0.8 * (command.longitudinal - sim.longitudinal)
        longitudinal = sim.longitudinal
        ratio = 2.0 * sim.mass / (sim.density * airframe.chord * airframe.lift_slope * airframe.wing_area)
        alleviation = 0.88 * ratio / (5.3 + ratio)
        weight = sim.mass * G0
        increment = alleviation * sim.density * sim.speed * airframe.lift_slope * airframe.wing_area * up
        wanted = sim.load_factor + 0.5 * increment / weight
        normal = _stalled(sim, wanted, limit, noise)
        geometric = airframe.incidence(min(sim.load_factor, limit), equivalent, sim.mass, sim.flaps_deg)
        aerodynamic = airframe.incidence(min(wanted, 1.15 * limit), equivalent, sim.mass, sim.flaps_deg)
        warning = wanted > 0.86 * limit
    flow = airframe.fuel_flow_idle + command.power * (airframe.fuel_flow_full - airframe.fuel_flow_idle)
    row = (
        sim.time, sim.speed, *sim.quaternion, sim.height, sim.pressure_altitude, normal, longitudinal, geometric,
        aerodynamic, sim.roll_rate, sim.flaps_deg, sim.gear, float(command.airbrakes_out), float(sim.on_ground),
        sim.heading, -sim.sink if sim.on_ground else 0.0, sim.fuel, flow, sim.mass, float(warning), command.power,
        up, along_gust, sim.static_temperature, command.yaw_rate if sim.on_ground else 0.0,
    )  # fmt: skip
    burnt = flow * STEP
    sim.fuel, sim.mass = sim.fuel - burnt, sim.mass - burnt
    if sim.on_ground:
        _move_on_ground(sim, command, normal)
    else:
        _move_in_air(sim, command, normal, longitudinal, geometric)
    sim.time = round(sim.time + STEP, 6)
    return row


def standard_temperature_fast(pressure_altitude: float) -> float:
    return 288.15 - 0.0065 * min(pressure_altitude, 11000.0)


def standard_pressure_fast(pressure_altitude: float) -> float:
    if pressure_altitude > 11000.0:
        return float(standard_pressure(pressure_altitude))
    return float(101325.0 * (standard_temperature_fast(pressure_altitude) / 288.15) ** 5.255879812716677)


def _ground_normal(sim: Sim, rough: float) -> float:
    """Load factor along the vertical on the ground: 1, the surface's roughness, and an impact while it lasts."""
    normal = 1.0 + 0.02 * min(sim.speed / 20.0, 1.5) * rough
    if sim.impact is not None:
        start, duration, size = sim.impact
        inside = sim.time - start
        if inside <= duration:
            return 1.0 + size * math.sin(math.pi * inside / duration)
        sim.impact = None
        sim.sink = 0.0
        sim.height = 0.0
        sim.pressure_altitude = sim.field_altitude
    return normal


def _stalled(sim: Sim, wanted: float, limit: float, noise: float) -> float:
    """Lift that the wing gives: beyond its limit it breaks, shakes, and comes back when the pilot eases."""
    lowest = -sim.airframe.normal_force_limit(sim.equivalent_airspeed, sim.mass, 0.0, True)
    if wanted > limit and sim.time > sim.stalled_until:
        sim.stalled_since, sim.stalled_until = sim.time, sim.time + 1.2
        sim.mark("stall")
    if sim.time < sim.stalled_until:
        since = sim.time - sim.stalled_since
        loss = 0.35 * min(since / 0.25, 1.0) * min((sim.stalled_until - sim.time) / 0.4, 1.0)
        return max(min(wanted, limit) * (1.0 - loss) + 0.12 * noise * min(since / 0.1, 1.0), lowest)
    return max(min(wanted, limit), lowest)


def _move_on_ground(sim: Sim, command: Command, normal: float) -> None:
    sim.speed = max(sim.speed + command.longitudinal * G0 * STEP, 0.0)
    sim.heading += command.yaw_rate * STEP
    if sim.impact is not None:
        sim.sink -= (normal - 1.0) * G0 * STEP
        sim.height -= sim.sink * STEP
        sim.pressure_altitude -= sim.sink * STEP


def _move_in_air(sim: Sim, command: Command, normal: float, longitudinal: float, incidence: float) -> None:
    down_x, down_y, down_z = sim.down_components()
    # `normal` lies along the body's axis; lift stands on the path
    lift = (normal + longitudinal * math.sin(incidence)) / math.cos(incidence)
    rise_before = -sim.speed * down_x
    speed = max(sim.speed, 8.0)
    turn_y = (lift - down_z) * G0 / speed
    turn_z = down_y * G0 / speed
    sim.roll_rate += STEP / 0.25 * (command.roll_rate - sim.roll_rate)
    a, b, c, d = sim.quaternion
    x, y, z = sim.roll_rate * 0.5 * STEP, turn_y * 0.5 * STEP, turn_z * 0.5 * STEP
    scale = 1.0 - 0.5 * (x * x + y * y + z * z)
    a, b, c, d = (
        a * scale - b * x - c * y - d * z,
        b * scale + a * x + c * z - d * y,
        c * scale + a * y - b * z + d * x,
        d * scale + a * z + b * y - c * x,
    )
    size = math.sqrt(a * a + b * b + c * c + d * d)
    sim.quaternion = (a / size, b / size, c / size, d / size)
    sim.speed = max(sim.speed + (longitudinal + down_x) * G0 * STEP, 5.0)
    rise = 0.5 * (rise_before - sim.speed * sim.down_components()[0])
    sim.height += rise * STEP
    warm = sim.static_temperature - sim.temperature_deviation
    sim.pressure_altitude += rise * STEP * warm / sim.static_temperature


def sound_speed(static_temperature: float) -> float:
    return math.sqrt(GAMMA * GAS_CONSTANT * static_temperature)


__all__ = ["STEP", "Command", "Flight", "Manoeuvre", "Sim", "coloured_noise", "fly", "standard_temperature"]
