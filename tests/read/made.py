"""Small logs written by hand for the reader's tests, and one flight whose truth is known."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path

import numpy as np
from scenario import manoeuvres as do
from scenario.airframes import FENWICK
from scenario.dialects import Truth, truth_from_flight
from scenario.flight import Flight, fly

from exceed.core.recording import Recording
from exceed.read import read_log

NAMES = [
    "load_factor",
    "indicated_airspeed",
    "pressure_altitude",
    "bank_angle",
    "pitch_angle",
    "heading",
    "roll_rate",
    "pitch_rate",
    "vertical_speed",
    "ground_speed",
    "outside_air_temperature",
    "flap_angle",
    "weight_on_wheels",
    "stall_warning",
    "fuel_mass",
    "fuel_flow",
    "engine_speed",
]
SLOW = {
    "indicated_airspeed": 4.0,
    "pressure_altitude": 1.0,
    "heading": 4.0,
    "outside_air_temperature": 1.0,
    "flap_angle": 1.0,
    "fuel_mass": 1.0,
    "fuel_flow": 1.0,
    "engine_speed": 1.0,
    "ground_speed": 1.0,
}
# the scenario's words where ours differ
OURS = {"outside_air_temperature": "static_air_temperature", "fuel_flow": "fuel_mass_flow"}
# the scenario keeps engine speed in rpm, we in turns a second
TO_SI = {"engine_speed": 1.0 / 60.0}


@lru_cache(maxsize=1)
def flight() -> Flight:
    """Eleven minutes of a tourer: climb, turns both ways, one pull, approach and landing."""
    plan = [
        do.standing(10),
        do.taxi(25),
        do.take_off(10.0),
        do.climb(2500, 78, 800),
        do.level(20, 112, 2500),
        do.steep_turn(45, 30, None, 2500, 108),
        do.turn_to(240, 108, 2500),
        do.turn_to(60, 108, 2500),
        do.pull(2.8, 0.8, 0.2, 0.8),
        do.recover(2400, 108, 20),
        do.descend(1300, 90, 600),
        do.approach(66, [(450, 35)]),
        do.landing(140),
        do.taxi(20, 330),
        do.standing(10),
    ]
    return fly(FENWICK, plan, mass=1036.0, fuel=86.0, seed=5)


@lru_cache(maxsize=1)
def truth() -> Truth:
    """That flight at 8 Hz."""
    return truth_from_flight(
        flight(), NAMES, 8.0, rates=SLOW, start=1_937_640_000.0, registration="ZZ-NMC", recorder_serial="R-1180"
    )


def si(name: str) -> np.ndarray:
    """The truth of a channel in our SI."""
    return truth().channels[name] * TO_SI.get(name, 1.0)


def log(folder: Path, text: str | bytes, name: str = "log.csv", **more: object) -> Recording:
    """Write a log and read it."""
    return read_log(written(folder, text, name), **more)  # type: ignore[arg-type]


def written(folder: Path, text: str | bytes, name: str = "log.csv") -> Path:
    path = folder / name
    path.write_bytes(text.encode() if isinstance(text, str) else text)
    return path


def rows(count: int = 200, step: float = 0.125) -> list[tuple[float, float, float, float]]:
    """(time, load factor, airspeed in kt, altitude in ft) of a flight that moves a little."""
    return [
        (k * step, 1.0 + 0.2 * np.sin(k / 9.0), 100.0 + 5.0 * np.sin(k / 40.0), 3000.0 + 2.0 * k) for k in range(count)
    ]


def simple(
    count: int = 200, heading: str = "time [s],NZ [g],IAS [kt],PALT [ft]", stamps: list[str] | None = None
) -> str:
    """A plain log; `stamps` replace the time's cells."""
    lines = [heading]
    for k, (when, load, speed, height) in enumerate(rows(count)):
        lines.append(f"{stamps[k] if stamps else f'{when:.3f}'},{load:.3f},{speed:.1f},{height:.0f}")
    return "\n".join(lines) + "\n"


FT, KT, DEG, G0 = 0.3048, 1852.0 / 3600.0, np.pi / 180.0, 9.80665


def of_flight(columns: dict[str, np.ndarray], time: np.ndarray | None = None, clock: str = "time [s]") -> str:
    """A log of the flight: heading -> figures as written, at 8 Hz."""
    when = np.arange(truth().count) / 8.0 if time is None else time
    table = np.column_stack([when, *columns.values()])
    lines = [",".join([clock, *columns])]
    lines += [",".join("" if cell != cell else f"{cell:.6g}" for cell in row) for row in table.tolist()]
    return "\n".join(lines) + "\n"
