"""The trace of simulated flights against JSBSim's own properties: an outside witness for signs, units, datums and g0.

Every margin says what it allows, and `test_a_margin_notices_what_it_is_for` spoils the truth with the error that the
margin is there to notice. The table of deviations is printed (`pytest -s`, or with any failure).
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache
from pathlib import Path
from typing import NamedTuple

import numpy as np
import pandas as pd
import pytest
from witness.jsbsim_flight import DEG, FT, G0, JET, KT, TOURER, Array, fly, load_factor_at, record, write_aircraft

import exceed

PLANS = {"tourer": TOURER, "jet": JET}
SENSOR = (1.2, 0.4, -0.2)  # m forward, right and down of the CG: further off than most, so that it counts
AT_CG = (0.0, 0.0, 0.0)
EVERYTHING = [
    "load_factor", "calibrated_airspeed", "pressure_altitude", "bank_angle", "pitch_angle", "heading", "roll_rate",
    "pitch_rate", "yaw_rate", "static_air_temperature",
]  # fmt: skip
ATTITUDE = ["calibrated_airspeed", "pressure_altitude", "bank_angle", "heading", "static_air_temperature"]
NO_BANK = ["load_factor", "calibrated_airspeed", "pressure_altitude", "heading", "static_air_temperature"]
BANK_ONLY = ["calibrated_airspeed", "bank_angle"]


@lru_cache(maxsize=2)
def flown(plan: str) -> dict[str, Array]:
    return fly(PLANS[plan])


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("jsbsim")


def traced(folder: Path, plan: str, names: list[str], *, noisy: bool, sensor: tuple[float, float, float] = SENSOR
           ) -> pd.DataFrame:  # fmt: skip
    stem = f"{plan}-{len(names)}-{names[0]}-{'noisy' if noisy else 'clean'}-{sensor[0]}"
    kept = folder / f"{stem}.pickle"
    if not kept.exists():
        record(flown(plan), folder / f"{stem}.csv", names, noisy=noisy, sensor=sensor)
        write_aircraft(folder / f"{stem}.yaml", sensor)
        frame = exceed.trace(folder / f"{stem}.csv", aircraft=folder / f"{stem}.yaml", mass="1100 kg")
        frame.to_pickle(kept)
    return pd.read_pickle(kept)


def inner(truth: dict[str, Array]) -> Array:
    """All but two seconds at either end, where slow channels have ended and slopes are one-sided."""
    time = truth["time"]
    return (time >= 2.0) & (time <= time[-1] - 2.0)


def steady(truth: dict[str, Array]) -> Array:
    """Neither rolling nor changing the vertical speed for two seconds either side: a slope then means an instant."""
    changing = np.abs(np.gradient(truth["bank_angle"], truth["time"])) > 1.5 * DEG
    changing |= np.abs(np.gradient(truth["vertical_speed"], truth["time"])) > 0.5
    return inner(truth) & (np.convolve(changing, np.ones(33), mode="same") < 0.5)


def turning(truth: dict[str, Array]) -> Array:
    """In a turn whose lift just carries the weight (vertical acceleration below 0.01 g), as the level turn has it."""
    balanced = np.abs(np.gradient(truth["vertical_speed"], truth["time"])) < 0.01 * G0
    return steady(truth) & balanced & (np.abs(truth["bank_angle"]) > 15.0 * DEG)


class Deviation(NamedTuple):
    mean: float
    rms: float
    most: float


def deviation(ours: Array, truth: Array, where: Array) -> Deviation:
    error = (ours - truth)[where]
    assert np.isfinite(error).all(), f"{np.count_nonzero(~np.isfinite(error))} of {len(error)} values are missing"
    return Deviation(float(np.mean(error)), float(np.sqrt(np.mean(error**2))), float(np.max(np.abs(error))))


def within(found: Deviation, margin: Deviation) -> bool:
    return abs(found.mean) <= margin.mean and found.rms <= margin.rms and found.most <= margin.most


Spoil = Callable[[dict[str, Array], Array], Array]


class Row(NamedTuple):
    """One compared quantity. Margins are in the column's unit; `notices` are errors that the clean one must notice."""

    column: str
    truth: str
    factor: float
    where: Callable[[dict[str, Array]], Array]
    clean: Deviation
    noisy: Deviation
    why: str
    notices: dict[str, Spoil]


def mirrored(_: dict[str, Array], truth: Array) -> Array:
    return -truth


def scaled(by: float) -> Spoil:
    return lambda _, truth: truth * by


ZERO = {"static_air_temperature_degC": 273.15}
ISA_0, RHO_0 = 288.15, 1.225

ROWS = [
    Row("load_factor_g", "load_factor", 1.0, inner, Deviation(2e-4, 0.002, 0.06), Deviation(0.002, 0.012, 0.08),
        "clean: the pull's onset, where a pitch acceleration differentiated at 4 Hz carries the lever of 1.2 m; noisy: "
        "0.006 g of noise and what differentiated rates add",
        {"g0 of 9.81": scaled(9.80665 / 9.81), "datum of an increment": lambda _, n: n - 1.0,
         "not moved to the CG": lambda t, _: load_factor_at(t, SENSOR),
         "moved the wrong way": lambda t, n: 2.0 * load_factor_at(t, SENSOR) - n,
         "unit ft/s2 for m/s2": scaled(FT)}),
    Row("calibrated_airspeed_kt", "calibrated_airspeed", KT, inner, Deviation(0.01, 0.03, 0.15),
        Deviation(0.05, 0.2, 0.8), "interpolation over half a second while the speed changes; noise 0.15 kt",
        {"mph for kt": scaled(1.1508), "equivalent": lambda t, _: t["equivalent_airspeed"] - 0.02 * KT}),
    Row("equivalent_airspeed_kt", "equivalent_airspeed", KT, inner, Deviation(0.01, 0.03, 0.15),
        Deviation(0.05, 0.2, 0.8), "as calibrated airspeed",
        {"calibrated taken as equivalent": lambda t, _: t["calibrated_airspeed"] + 0.02 * KT}),
    Row("true_airspeed_kt", "true_airspeed", KT, inner, Deviation(0.02, 0.05, 0.2), Deviation(0.15, 0.5, 2.0),
        "as calibrated airspeed, grown by density; noisy: the temperature's steps of 0.5 K besides",
        {"standard air on a warm day": lambda t, v: v * np.sqrt(
            (t["static_air_temperature"] - 10.0) / t["static_air_temperature"]),
         "geometric altitude taken as pressure altitude": lambda t, v: v * (1.0 + 1.5e-3)}),
    Row("mach", "mach", 1.0, inner, Deviation(3e-5, 1e-4, 4e-4), Deviation(2e-4, 5e-4, 2e-3),
        "as calibrated airspeed, over the speed of sound",
        {"incompressible": lambda t, m: t["equivalent_airspeed"] / 340.294 / np.sqrt(
            t["static_pressure"] / 101325.0) * 1.001,
         "speed of sound at sea level": lambda t, _: t["true_airspeed"] / 340.294}),
    Row("pressure_altitude_ft", "pressure_altitude", FT, inner, Deviation(0.1, 0.5, 3.0), Deviation(0.3, 1.5, 6.0),
        "interpolation over half a second in the pull-up (50 ft/s that change by 30 ft/s2); noise 1 ft, steps 1 ft",
        {"geometric": lambda t, h: h * 6_356_766.0 / (6_356_766.0 - h), "metres": scaled(1.0 / FT)}),
    Row("vertical_speed_ft_min", "vertical_speed", FT / 60.0, steady, Deviation(1.0, 12.0, 60.0),
        Deviation(4.0, 60.0, 200.0),
        "a slope over seconds rounds off what bends slowly; noise of 1 ft twice a second is some 30 ft/min",
        {"sign": mirrored, "geometric rise on a warm day": lambda t, _: t["climb"], "ft/s for ft/min": scaled(60.0),
         "down to zero": scaled(0.0)}),
    Row("static_pressure_hPa", "static_pressure", 100.0, inner, Deviation(0.01, 0.02, 0.12), Deviation(0.03, 0.06, 0.3),
        "half a Pascal of JSBSim's pressure at sea level (2116.23 psf); altitude's interpolation, 3.6 Pa a metre",
        {"geometric": lambda t, p: p - t["pressure_altitude"] ** 2 / 6_356_766.0 * 4.0}),
    Row("dynamic_pressure_hPa", "dynamic_pressure", 100.0, inner, Deviation(0.005, 0.02, 0.1),
        Deviation(0.03, 0.15, 0.7), "twice the relative deviation of equivalent airspeed",
        {"impact pressure": lambda t, q: q * (1.0 + t["mach"] ** 2 / 4.0) + 1.0,
         "of calibrated airspeed": lambda t, _: 0.5 * RHO_0 * (t["calibrated_airspeed"] + 0.1) ** 2}),
    Row("static_air_temperature_degC", "static_air_temperature", 1.0, inner, Deviation(0.01, 0.01, 0.05),
        Deviation(0.06, 0.35, 1.2), "interpolation over a second; noise 0.2 K and steps of 0.5 K",
        {"zero of 273 K": lambda _, t: t + 0.15}),
    Row("bank_angle_deg", "bank_angle", DEG, inner, Deviation(0.01, 0.04, 0.3), Deviation(0.03, 0.2, 0.7),
        "interpolation over a quarter of a second at roll rates to 15 deg/s; noise and steps of 0.1 deg",
        {"sign": mirrored, "gradient": scaled(0.9)}),
    Row("turn_rate_deg_s", "turn_rate", DEG, steady, Deviation(0.004, 0.03, 0.3), Deviation(0.01, 0.1, 0.4),
        "a slope of heading over a second, rounded off where the turn tightens; steps of 0.1 deg four times a second",
        {"sign": mirrored, "yaw rate": lambda t, _: t["yaw_rate"]}),
]  # fmt: skip
BOTH = [pytest.param(plan, row, id=f"{plan}-{row.column}") for plan in PLANS for row in ROWS]


def ours_and_truth(folder: Path, plan: str, row: Row, *, noisy: bool) -> tuple[Array, Array, dict[str, Array]]:
    frame, truth = traced(folder, plan, EVERYTHING, noisy=noisy), flown(plan)
    assert np.array_equal(frame["time_s"], truth["time"])
    return frame[row.column].to_numpy(float), truth[row.truth] / row.factor - ZERO.get(row.column, 0.0), truth


@pytest.mark.parametrize("noisy", [False, True], ids=["clean", "noisy"])
@pytest.mark.parametrize(("plan", "row"), BOTH)
def test_the_trace_agrees_with_the_simulation(folder: Path, plan: str, row: Row, noisy: bool) -> None:
    ours, true, truth = ours_and_truth(folder, plan, row, noisy=noisy)
    found = deviation(ours, true, row.where(truth))
    margin = row.noisy if noisy else row.clean
    print(f"{plan:7}{row.column:28} mean {found.mean:+9.5f} rms {found.rms:9.5f} max {found.most:9.5f} of {margin}")
    assert within(found, margin), row.why


def test_a_margin_notices_what_it_is_for(folder: Path) -> None:
    """Each error is noticed in at least one of the two flights: compressibility, for one, shows in the jet alone."""
    for row in ROWS:
        for error, spoil in row.notices.items():
            seen = []
            for plan in PLANS:
                ours, _, truth = ours_and_truth(folder, plan, row, noisy=False)
                false = spoil(truth, truth[row.truth]) / row.factor - ZERO.get(row.column, 0.0)
                seen.append(not within(deviation(ours, false, row.where(truth)), row.clean))
            assert any(seen), f"{row.column}: {error}"


@pytest.mark.parametrize("noisy", [False, True], ids=["clean", "noisy"])
@pytest.mark.parametrize("plan", PLANS)
def test_turn_radius_is_ground_speed_over_turn_rate(folder: Path, plan: str, noisy: bool) -> None:
    """Still air: V / (dψ/dt). Allowed: sideslip, and 0.01 g of vertical acceleration (3 % of tan Φ at 30 degrees)."""
    truth = flown(plan)
    where = turning(truth)
    frame = traced(folder, plan, EVERYTHING, noisy=noisy)
    error = (frame["turn_radius_m"].to_numpy(float) * np.abs(truth["turn_rate"]) / truth["ground_speed"])[where] - 1.0
    print(f"{plan:7}turn_radius (relative) mean {np.mean(error):+.4f} max {np.max(np.abs(error)):.4f}")
    assert abs(float(np.mean(error))) < 0.05
    assert float(np.max(np.abs(error))) < 0.12


@pytest.mark.parametrize("noisy", [False, True], ids=["clean", "noisy"])
@pytest.mark.parametrize("plan", PLANS)
def test_load_factor_from_path_and_turn_is_that_of_the_simulation(folder: Path, plan: str, noisy: bool) -> None:
    """No accelerometer. Allowed: angle of attack and weaker gravity aloft, up to 0.013 g; slopes next to a pull."""
    truth = flown(plan)
    ours = traced(folder, plan, ATTITUDE, noisy=noisy)["load_factor_g"].to_numpy(float)
    for name, where, margin in (("steady", steady(truth), Deviation(0.012, 0.025, 0.09)),
                                ("turning", turning(truth), Deviation(0.016, 0.03, 0.09))):  # fmt: skip
        found = deviation(ours, truth["load_factor"], where)
        print(f"{plan:7}load factor by path, {name:8} {found}")
        assert within(found, margin)
    assert np.corrcoef(ours[inner(truth)], truth["load_factor"][inner(truth)])[0, 1] > 0.95


@pytest.mark.parametrize("noisy", [False, True], ids=["clean", "noisy"])
@pytest.mark.parametrize("plan", PLANS)
def test_bank_from_turn_rate_is_that_of_the_simulation(folder: Path, plan: str, noisy: bool) -> None:
    """No attitude. Allowed: sideslip, worth a degree in the jet's turn, and 0.01 g of vertical acceleration."""
    truth = flown(plan)
    ours = traced(folder, plan, NO_BANK, noisy=noisy, sensor=AT_CG)["bank_angle_deg"].to_numpy(float)
    found = deviation(ours, truth["bank_angle"] / DEG, turning(truth))
    print(f"{plan:7}bank by turn rate {found}")
    assert within(found, Deviation(1.3, 2.0, 5.0))


@pytest.mark.parametrize("plan", PLANS)
def test_load_factor_from_bank_alone_holds_in_level_turns(folder: Path, plan: str) -> None:
    """1/cos Φ of a turn that neither climbs nor sinks. Allowed: 0.01 g of vertical acceleration, the angle of attack,
    weaker gravity aloft: some hundredths of g."""
    truth = flown(plan)
    level = turning(truth) & (np.abs(truth["vertical_speed"]) < 1.5)
    assert level.sum() > 80
    ours = traced(folder, plan, BANK_ONLY, noisy=False)["load_factor_g"].to_numpy(float)
    found = deviation(ours, truth["load_factor"], level)
    print(f"{plan:7}load factor by level turn {found}")
    assert within(found, Deviation(0.03, 0.035, 0.1))


def test_the_flight_does_what_it_is_for() -> None:
    """A climb, a descent, turns both ways, a pull and a push: else agreement would mean little."""
    truth = flown("tourer")
    bank = truth["bank_angle"] / DEG
    assert bank.max() > 40.0
    assert bank.min() < -55.0
    assert truth["load_factor"].max() > 2.3
    assert truth["load_factor"].min() < 0.8
    assert truth["vertical_speed"].max() > 3.0
    assert truth["vertical_speed"].min() < -3.0
    # on a warm day, off the standard atmosphere, and compressible where it counts
    assert np.median(flown("jet")["calibrated_airspeed"] - flown("jet")["equivalent_airspeed"]) > 8.0 * KT
    assert np.median(truth["static_air_temperature"] - (ISA_0 - 0.0065 * truth["pressure_altitude"])) > 8.0
