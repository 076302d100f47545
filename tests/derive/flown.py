"""Flights of the scenario's flight model that several tests of this folder share, and the aeroplane's file."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from scenario import manoeuvres as do
from scenario.airframes import FENWICK, LARKSPUR
from scenario.flight import Flight, fly
from scenario.sensors import Sensor

from exceed.documents.aircraft import Aircraft, load_aircraft

LARKSPUR_FILE = """
format: exceed-aircraft/1
registration: ZZ-NMA
category: aerobatic
flaps: recorded
gear: fixed
mass: {empty: 640 kg, maximum_take_off: 960 kg, maximum_landing: 960 kg, maximum_zero_fuel: 900 kg}
stall_speed:
  - {flaps: 0 deg, mass: 960 kg, upright: 55 KCAS, inverted: 66 KCAS}
  - {flaps: 30 deg, mass: 960 kg, upright: 48 KCAS}
load_factor:
  - {flaps: 0 deg, mass_up_to: 880 kg, maximum: 6 g, minimum: -3 g}
  - {flaps: 0 deg, mass_up_to: 960 kg, maximum: 4.4 g, minimum: -1.76 g}
  - {flaps: 30 deg, maximum: 2 g, minimum: 0 g}
rolling: {factor: 0.667, above_roll_rate: 15 deg/s}
speeds:
  manoeuvring: {over: mass, points: [[700 kg, 110 KIAS], [960 kg, 128 KIAS]]}
  never_exceed: 175 KIAS
position_error:
  - {flaps: 0 deg, points: [[50 KIAS, 54 KCAS], [100 KIAS, 101 KCAS], [180 KIAS, 180 KCAS]]}
  - {flaps: 30 deg, points: [[50 KIAS, 54 KCAS], [100 KIAS, 101 KCAS], [180 KIAS, 180 KCAS]]}
wing: {area: 13.6 m2, span: 9.2 m, mean_chord: 1.5 m, lift_curve_slope: 4.9 1/rad}
recorder:
  accelerometer: {position: [0.35 m, 0 m, -0.1 m]}
  accuracy: {load_factor: 0.05 g, indicated_airspeed: 2 kt}
loading:
  stations:
    {pilot: {arm: 1.12 m}, passenger: {arm: 1.12 m}, baggage: {arm: 1.8 m}, main_fuel: {arm: 0.9 m, density: 0.72 kg/L}}
  empty_arm: 0.98 m
  envelope: [[640 kg, 0.90 m, 1.10 m], [960 kg, 0.96 m, 1.10 m]]
fuel_consumption: 40 L/h
source: Invented
"""

# a recorder that writes nearly everything; load factor with a datum error, and ahead of the centre of gravity
SENSORS = {
    "load_factor": Sensor(8, noise=0.01, step=0.01, bias=0.04, position=(0.35, 0.0, -0.1)),
    "roll_rate": Sensor(8),
    "pitch_rate": Sensor(8),
    "yaw_rate": Sensor(8),
    "indicated_airspeed": Sensor(4, step=0.05),
    "pressure_altitude": Sensor(1, step=0.3048),
    "bank_angle": Sensor(4),
    "pitch_angle": Sensor(4),
    "heading": Sensor(1),
    "ground_speed": Sensor(1),
    "flap_angle": Sensor(1),
    "static_air_temperature": Sensor(1),
    "fuel_mass": Sensor(1, step=0.1),
    "weight_on_wheels": Sensor(4),
}


@lru_cache(maxsize=1)
def larkspur() -> Aircraft:
    return load_aircraft(LARKSPUR_FILE)


@lru_cache(maxsize=1)
def aerobatics() -> Flight:
    """One sortie: climb, a steep turn, a loop, a roll, inverted flight, a pull, a landing."""
    plan = [
        do.standing(30), do.taxi(60), do.take_off(), do.climb(3500, 85, 1400), do.level(60, 145, 3500),
        do.steep_turn(60, 25, None, 3500, 120), do.level(25, 140, 3500), do.loop(4.0), do.recover(3500, 125),
        do.roll(90), do.recover(3500, 120), do.inverted(8, 115), do.recover(3500, 140, 30), do.pull(4.5),
        do.recover(3500, 110), do.turn_to(240, 100, 3500), do.descend(1200, 95, 1500), do.turn_to(240, 80, 1200),
        do.level(5, 75, 1200), do.approach(68, [(900, 15), (500, 30)]), do.landing(120), do.taxi(40, 330),
        do.standing(15),
    ]  # fmt: skip
    return fly(LARKSPUR, plan, mass=905.0, fuel=50.0, temperature_deviation=8.0)


@lru_cache(maxsize=1)
def circuits() -> Flight:
    """A tour with rough air, a go-around, and a landing."""
    plan = [
        do.standing(30), do.taxi(60), do.take_off(10), do.climb(3000, 75, 700), do.level(60, 105, 3000),
        do.rough_air(60, 105, 3000, 1.0, [(20.0, 0.9, 7.0)]), do.level(60, 110, 3000), do.turn_to(60, 100, 3000),
        do.level(30, 100, 3000), do.turn_to(240, 100, 3000), do.descend(1200, 95, 500), do.level(5, 75, 1200),
        do.approach(66, [(900, 20), (500, 35)], 150.0), do.go_around(1300, 70, 600), do.turn_to(60, 80, 1300),
        do.level(60, 80, 1300), do.turn_to(240, 75, 1300), do.approach(66, [(900, 20), (500, 35)]), do.landing(120),
        do.taxi(40, 330), do.standing(30),
    ]  # fmt: skip
    return fly(FENWICK, plan, mass=1050.0, fuel=80.0)


def truth_at(flight: Flight, name: str, time: np.ndarray) -> np.ndarray:
    """A truth channel at other instants; angles without their jumps."""
    values = flight[name]
    if name in ("bank_angle", "heading"):
        values = np.unwrap(values)
    return np.interp(time, flight.time, values)
