"""Random aerobatic flights, noisy recorders, any habit of writing: nothing truly beyond a limit is lost without a word.

The truth is the flight model's at 100 Hz. What was beyond must be found, or be undecided, or lie in a recording whose
rule has unassessed time; what is established must have been so, within the sensor's accuracy.
"""

from __future__ import annotations

import random
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scenario import manoeuvres as do
from scenario.airframes import LARKSPUR
from scenario.dialects import truth_from_flight, write
from scenario.flight import Flight, Manoeuvre, fly
from scenario.habits import HABITS
from scenario.sensors import Sensor, beyond

import exceed

FT, KT = 0.3048, 1852.0 / 3600.0
CHANNELS = ["load_factor", "indicated_airspeed", "pressure_altitude", "bank_angle", "pitch_angle"]
# without any unit written a log's speed is rightly left unresolved
TOLD = [habit for habit in HABITS if habit.header != "name"]
NEVER_EXCEED = ([0.0, 15_000.0], [159.0, 150.0])  # ft, KIAS
ACCURACY = {"load_factor": 0.05, "indicated_airspeed": 2.0}  # g, kt
AIRCRAFT = """\
format: exceed-aircraft/1
registration: ZZ-RND
type: Random
category: aerobatic
flaps: none
gear: fixed
mass: {empty: 640 kg, maximum_take_off: 960 kg}
stall_speed:
  - {flaps: 0 deg, mass: 960 kg, upright: 55 KCAS, inverted: 66 KCAS}
load_factor:
  - {flaps: 0 deg, maximum: 6 g, minimum: -3 g}
speeds:
  never_exceed: {over: pressure_altitude, points: [[0 ft, 159 KIAS], [15000 ft, 150 KIAS]]}
recorder:
  accuracy: {load_factor: 0.05 g, indicated_airspeed: 2 kt}
source: "Invented for these tests"
"""


def plan(draw: random.Random) -> list[Manoeuvre]:
    """Take-off, then three dives and pulls about the limits of speed and load factor, some pushes and rolls."""
    made = [do.standing(12), do.taxi(25), do.take_off(), do.climb(2500, 85, 1500), do.level(12, 130, 2600)]
    for _ in range(3):
        hold = draw.choice([0.0, 0.0, 0.2, 0.5])
        made += [do.dive(draw.uniform(18, 30), draw.uniform(140, 162), 0.9),
                 do.pull(draw.uniform(5.2, 6.8), draw.uniform(0.4, 1.1), hold, draw.uniform(0.4, 1.1)),
                 do.recover(2500, 110, draw.uniform(10, 20))]  # fmt: skip
        if draw.random() < 0.5:
            made += [do.pull(draw.uniform(-3.3, -2.6), 0.7, 0.1, 0.7), do.recover(2500, 110, 12)]
        if draw.random() < 0.4:
            made += [do.roll(draw.choice([-100, 100])), do.recover(2500, 110, 10)]
    return made


def excesses(flight: Flight) -> dict[str, list[tuple[float, float, float, float]]]:
    """Rule -> true stretches (start, end, most beyond the limit, its time), in flight."""
    air = flight["weight_on_wheels"] < 0.5
    speed = flight["indicated_airspeed"] / KT - np.interp(flight["pressure_altitude"] / FT, *NEVER_EXCEED)
    over = {
        "load-factor-high": flight["load_factor"] - 6.0,
        "load-factor-low": -3.0 - flight["load_factor"],
        "never-exceed": speed,
    }
    return {rule: beyond(flight.time, np.where(air, values, -1.0), 0.0) for rule, values in over.items()}


@pytest.mark.parametrize("seed", range(8))
def test_what_was_truly_beyond_is_not_lost_and_what_is_established_was_so(tmp_path: Path, seed: int) -> None:
    draw = random.Random(seed)
    flight = fly(LARKSPUR, plan(draw), mass=860.0, fuel=50.0, seed=seed)
    rate, habit = draw.choice([4.0, 8.0, 8.0, 16.0]), draw.choice(TOLD)
    sensors = {
        "load_factor": Sensor(bias=draw.uniform(-0.03, 0.03), noise=draw.choice([0.0, 0.005, 0.02]), step=0.004,
                              low=-6.0, high=9.0),
        "indicated_airspeed": Sensor(noise=0.1),
        "pressure_altitude": Sensor(noise=0.2),
    }  # fmt: skip
    truth = truth_from_flight(
        flight, CHANNELS, rate, sensors=sensors, start=1_935_565_200.0, seed=seed,
        phase_s=draw.uniform(0.0, 1.0 / rate), rates={"indicated_airspeed": 2.0, "pressure_altitude": 2.0},
    )  # fmt: skip
    log = tmp_path / f"log{habit.extension}"
    write(truth, log, habit)
    (tmp_path / "aircraft.yaml").write_text(AIRCRAFT, encoding="utf-8")
    (found,) = exceed.scan(log, aircraft=tmp_path / "aircraft.yaml", mass="860 kg").summary["recordings"]
    assert found["status"] == "ok", (habit.id, found["problem"])
    unassessed = {row["rule"]: row["unassessed_s"] for row in found["assessment"] if row["flight"] is None}

    def near(event: dict[str, Any], stretch: tuple[float, float, float, float]) -> bool:
        start, end = stretch[0] - truth.phase_s, stretch[1] - truth.phase_s
        return bool(event["start_s"] <= end + 1.0 and event["end_s"] >= start - 1.0)

    for rule, stretches in excesses(flight).items():
        said = [one for one in (*found["events"], *found["undecided"]) if one["rule"] == rule]
        for stretch in stretches:
            assert any(near(one, stretch) for one in said) or unassessed[rule] > 0.0, (habit.id, rate, rule, stretch)
            # quick enough channels, clearly beyond: found as an event
            if rate >= 8.0 and stretch[2] > 2.0 * ACCURACY["load_factor"] and rule != "never-exceed":
                assert any(near(one, stretch) and one["limit_exceeded"] for one in said), (habit.id, rule, stretch)
        for one in found["events"]:
            if one["rule"] == rule and one["certainty"] == "established":
                least = ACCURACY[one["quantity"]]
                assert one["peak"]["estimate"] is not None
                close = abs(one["peak"]["value"] - one["limit"]["value"]) <= least
                assert close or any(near(one, stretch) for stretch in stretches), (habit.id, rule, one["peak"])


def test_the_random_flights_go_beyond_each_limit_and_stay_within() -> None:
    """Else nothing would be asked above."""
    counts: dict[str, list[int]] = {}
    for seed in range(8):
        flight = fly(LARKSPUR, plan(random.Random(seed)), mass=860.0, fuel=50.0, seed=seed)
        for rule, stretches in excesses(flight).items():
            counts.setdefault(rule, []).append(len(stretches))
    for rule, many in counts.items():
        assert sum(many) >= 2, rule
