"""One contract for every row of DERIVATIONS; a new row gets these tests for nothing."""

from __future__ import annotations

import inspect

import numpy as np
import pytest
from derive.flown import larkspur

from exceed.core.intervals import normal
from exceed.core.phases import PhaseTrack
from exceed.core.quantities import QUANTITIES
from exceed.core.sources import SOURCES
from exceed.derive.facts import WORDS, facts_of
from exceed.derive.resolve import COMPUTED, FOUND_FACTS, INTERVALS_EITHER_SIDE, parameters
from exceed.derive.table import DERIVATIONS, Derivation

COUNT = 960
TIME = np.arange(COUNT) / 8.0
FOUND = {
    "airborne": normal([5.0], [115.0]),
    "phases": PhaseTrack(np.array([0.0]), np.array([6], dtype=np.int8)),
    "field_levels": (np.array([5.0, 115.0]), np.array([100.0, 90.0])),
    "touchdown_windows": normal([40.0], [44.0]),
    "touchdowns": np.array([42.0]),
}
IDS = [f"{row.quantity} by {row.method}" for row in DERIVATIONS]


def wave(low: float, high: float, period: float, phase: float = 0.0) -> np.ndarray:
    return low + (high - low) * (0.5 + 0.5 * np.sin(2 * np.pi * TIME / period + phase))


# within flight, so that every formula has an answer; load factor with excursions as short as gusts
QUANTITY = {
    "load_factor": wave(0.8, 1.2, 1.6),
    "roll_rate": wave(-0.3, 0.3, 9.0),
    "pitch_rate": wave(-0.1, 0.1, 7.0),
    "yaw_rate": wave(-0.1, 0.1, 11.0),
    "roll_acceleration": wave(-0.3, 0.3, 5.0),
    "pitch_acceleration": wave(-0.3, 0.3, 6.0),
    "bank_angle": wave(-0.4, 0.45, 40.0),
    "pitch_angle": wave(-0.2, 0.2, 30.0),
    "heading": np.mod(wave(-1.0, 1.0, 100.0), 2 * np.pi),
    "track_angle": np.mod(wave(-1.0, 1.0, 100.0), 2 * np.pi),
    "turn_rate": wave(-0.1, 0.11, 50.0),
    "indicated_airspeed": wave(40.0, 70.0, 60.0),
    "calibrated_airspeed": wave(40.0, 70.0, 60.0),
    "equivalent_airspeed": wave(40.0, 70.0, 60.0),
    "true_airspeed": wave(45.0, 75.0, 60.0),
    "mach": wave(0.15, 0.25, 60.0),
    "pressure_altitude": wave(500.0, 900.0, 90.0),
    "geometric_altitude": wave(500.0, 900.0, 90.0),
    "height_above_ground": wave(5.0, 60.0, 90.0),
    "vertical_speed": wave(-5.0, 5.0, 35.0),
    "static_air_temperature": wave(280.0, 286.0, 90.0),
    "total_air_temperature": wave(281.0, 288.0, 90.0),
    "static_pressure": wave(90000.0, 95000.0, 90.0),
    "impact_pressure": wave(1000.0, 3000.0, 60.0),
    "latitude": 0.9 + 1e-5 * TIME,
    "longitude": 0.1 + 1e-5 * TIME,
    "flap_angle": np.zeros(COUNT),
    "gear_down": (TIME < 60.0).astype(float),
    "airbrakes_out": np.zeros(COUNT),
    "mass": wave(860.0, 900.0, 1000.0),
    "fuel_mass": wave(20.0, 50.0, 1000.0),
    "fuel_volume": wave(0.02, 0.05, 1000.0),
    "stall_speed": wave(25.0, 29.0, 8.0),
    "load_factor_maximum": np.full(COUNT, 4.4),
    "load_factor_minimum": np.full(COUNT, -1.76),
}


def source_of(name: str) -> str:
    """The quantity that a parameter stands for."""
    return (facts_of(larkspur()).aliases.get(name) or name).removeprefix("recorded_")


def width_of(row: Derivation) -> float:
    """As the resolver does it for channels of eight samples a second."""
    return max(row.width, INTERVALS_EITHER_SIDE / 8.0)


def arguments(row: Derivation, part: slice = slice(None), **changed: np.ndarray) -> dict[str, object]:
    facts = facts_of(larkspur()).values
    made: dict[str, object] = {}
    for name, _ in parameters(row.function):
        quantity = source_of(name)
        if name == "time":
            made[name] = TIME[part].copy()
        elif name == "width":
            made[name] = width_of(row)
        elif name == "max_gap":
            made[name] = 0.5
        elif quantity in QUANTITY:
            made[name] = changed.get(name, QUANTITY[quantity])[part].copy()
        elif name in facts:
            made[name] = facts[name]
        elif name in FOUND:
            made[name] = FOUND[name]
    return made


def run(row: Derivation, part: slice = slice(None), **changed: np.ndarray) -> np.ndarray:
    made = arguments(row, part, **changed)
    time = TIME[part]
    return np.broadcast_to(np.asarray(row.function(**made), dtype=float), time.shape)


@pytest.mark.parametrize("row", DERIVATIONS, ids=IDS)
def test_row_names_known_things(row: Derivation) -> None:
    assert row.quantity in QUANTITIES
    known = {"time", *COMPUTED, *FOUND_FACTS, *WORDS, "rolling", "recovery_factor"}
    for name, optional in parameters(row.function):
        quantity = source_of(name)
        assert quantity in QUANTITIES or name in known or name.startswith("limit_"), name
        if name in row.without:
            assert optional, f"{name} has a text for its lack and no default"
    assert set(row.without) <= {name for name, _ in parameters(row.function)}
    assert set(row.main) <= {name for name, _ in parameters(row.function)}


@pytest.mark.parametrize("row", DERIVATIONS, ids=IDS)
def test_row_cites_a_source_and_says_its_method(row: Derivation) -> None:
    assert row.source in SOURCES
    assert row.method
    assert row.method == row.method.strip()
    assert row.uncertainty >= 0.0
    assert row.cap in (None, "possible")
    if row.one_sided:
        assert row.cap == "possible"


@pytest.mark.parametrize("row", DERIVATIONS, ids=IDS)
def test_row_gives_one_value_a_sample_and_leaves_its_inputs_alone(row: Derivation) -> None:
    made = arguments(row)
    before = {name: value.copy() for name, value in made.items() if isinstance(value, np.ndarray)}
    with np.errstate(all="raise"):
        result = np.asarray(row.function(**made), dtype=float)
    assert result.shape in ((COUNT,), ())
    for name, value in before.items():
        assert np.array_equal(made[name], value, equal_nan=True), name  # type: ignore[arg-type]
    assert np.isfinite(run(row)).any()
    assert not np.isinf(run(row)).any()


@pytest.mark.parametrize("row", DERIVATIONS, ids=IDS)
def test_row_gives_a_slice_the_slice_of_the_whole(row: Derivation) -> None:
    """With as many samples on either side as the row says it reaches."""
    whole = run(row)
    reach = row.looks * width_of(row) * (1.0 + 1e-5) + 1e-6 if row.width else 0.0
    assert np.isfinite(whole[300:420]).any() or row.quantity == "touchdown_sink_rate"
    for low, high in ((300, 420), (330, 338), (337, 338)):
        first = int(np.searchsorted(TIME, TIME[low] - reach, side="left"))
        last = int(np.searchsorted(TIME, TIME[high - 1] + reach, side="right"))
        part = run(row, slice(first, last))[low - first : high - first]
        assert np.allclose(part, whole[low:high], rtol=1e-9, atol=1e-9, equal_nan=True)


def sample_by_sample() -> list[tuple[Derivation, str]]:
    cases = []
    for row in DERIVATIONS:
        if row.width:
            continue
        for name, _ in parameters(row.function):
            if source_of(name) in QUANTITY:
                cases.append((row, name))
    return cases


@pytest.mark.parametrize(("row", "name"), sample_by_sample(), ids=lambda value: getattr(value, "quantity", value))
def test_missing_stays_missing_at_its_own_place_only(row: Derivation, name: str) -> None:
    whole = run(row)
    holed = QUANTITY[source_of(name)].copy()
    holed[[333, 334, 400]] = np.nan
    result = run(row, **{name: holed})
    assert np.isnan(result[[333, 334, 400]]).all()
    others = np.ones(COUNT, dtype=bool)
    others[[333, 334, 400]] = False
    assert np.array_equal(result[others], whole[others], equal_nan=True)


@pytest.mark.parametrize("row", [row for row in DERIVATIONS if row.width], ids=lambda row: row.method)
def test_missing_stays_missing_at_its_own_place_in_rows_that_look_round(row: Derivation) -> None:
    for name, _ in parameters(row.function):
        if source_of(name) not in QUANTITY or row.quantity == "touchdown_sink_rate":
            continue
        holed = QUANTITY[source_of(name)].copy()
        holed[[333, 334, 400]] = np.nan
        assert np.isnan(run(row, **{name: holed})[[333, 334, 400]]).all(), name


def test_every_derived_quantity_of_the_trace_table_has_a_row() -> None:
    made_elsewhere = {"centre_of_gravity", "inverted_time", "mass"}
    rows = {row.quantity for row in DERIVATIONS}
    derived = {row.name for row in QUANTITIES.values() if not row.recorded}
    assert derived - made_elsewhere <= rows


def test_no_row_makes_true_airspeed_from_ground_speed() -> None:
    for row in DERIVATIONS:
        if row.quantity in ("true_airspeed", "calibrated_airspeed", "mach", "equivalent_airspeed"):
            assert not {"ground_speed", "recorded_ground_speed"} & set(inspect.signature(row.function).parameters)
