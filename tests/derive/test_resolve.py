"""Which derivation is taken: the first whose inputs can be had without the quantity itself."""

from __future__ import annotations

import numpy as np
import pytest

from exceed.core.trace import Step
from exceed.derive.facts import Facts
from exceed.derive.resolve import Resolver, base_name, closure, leaves
from exceed.derive.table import Derivation


def resolver(*channels: str, interval: float = 0.125, **more: object) -> Resolver:
    return Resolver(dict.fromkeys(channels, interval), Facts(), {}, **more)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("channels", "wanted", "method"),
    [
        (("calibrated_airspeed",), "calibrated_airspeed", "recorded"),
        (("indicated_airspeed",), "calibrated_airspeed", "indicated airspeed"),
        (("mach", "pressure_altitude"), "calibrated_airspeed", "Mach number and altitude"),
        (("true_airspeed", "pressure_altitude"), "calibrated_airspeed", "true airspeed and temperature"),
        (("impact_pressure",), "indicated_airspeed", "calibrated airspeed"),
        (("impact_pressure", "static_pressure"), "mach", "recorded pressures"),
        (("static_pressure",), "pressure_altitude", "static pressure"),
        (("geometric_altitude",), "pressure_altitude", "geometric altitude"),
        (("total_air_temperature", "mach"), "static_air_temperature", "total temperature and Mach number"),
        (("pressure_altitude",), "static_air_temperature", "standard atmosphere"),
        (("heading",), "turn_rate", "heading differentiated"),
        (("bank_angle", "true_airspeed"), "turn_rate", "level turn"),
        (("turn_rate", "true_airspeed"), "bank_angle", "turn rate and true airspeed"),
        (("bank_angle",), "load_factor", "level turn"),
        (("load_factor", "bank_angle"), "load_factor", "accelerometer"),
    ],
)
def test_the_best_method_that_can_be_had_is_taken(channels: tuple[str, ...], wanted: str, method: str) -> None:
    made = resolver(*channels)
    assert made.resolve(wanted)
    assert made.steps[wanted].method == method


def test_inverse_pairs_do_not_go_round_in_circles() -> None:
    made = resolver("heading")
    for name in ("calibrated_airspeed", "indicated_airspeed", "mach", "true_airspeed", "bank_angle"):
        assert not made.resolve(name)
        assert made.missing[name]


def test_a_reason_names_what_is_missing() -> None:
    made = resolver("pressure_altitude")
    assert not made.resolve("stall_margin")
    assert "no calibrated airspeed" in made.missing["stall_margin"]
    assert not made.resolve("touchdown_load_factor")
    assert "load factor is not recorded" in made.missing["touchdown_load_factor"]
    made = resolver("bank_angle", interval=1.0)
    assert not made.resolve("roll_rate")
    assert "too slowly" in made.missing["roll_rate"]


def test_windows_are_wide_enough_for_the_slowest_input() -> None:
    assert resolver_width(0.125) == pytest.approx(1.5)
    assert resolver_width(4.0) == pytest.approx(6.4)


def resolver_width(interval: float) -> float:
    made = resolver("pressure_altitude", interval=interval)
    made.resolve("vertical_speed")
    step = made.steps["vertical_speed"]
    assert step.reach >= float(step.facts["width"])
    return float(step.facts["width"])


def test_leaves_look_through_steps_and_beneath_corrections() -> None:
    steps = {
        "a": Step("a", "recorded", None),
        "b": Step("b", "made", np.add, {"x": "a", "y": "recorded:c"}),
        "d": Step("d", "given", None, constant=1.0),
    }
    assert closure(steps, ["b", "d"]) == {"a", "b", "d"}
    assert leaves(steps, ["b", "d"]) == {"a", "c"}


def test_an_index_is_no_part_of_the_quantity() -> None:
    assert base_name("engine_speed_2") == "engine_speed"
    assert base_name("fuel_mass_1_2") == "fuel_mass"
    assert base_name("mach") == "mach"


def test_a_new_row_is_all_it_takes() -> None:
    """One function and one row give a quantity, and everything that rests on it."""

    def half(heading: np.ndarray) -> np.ndarray:
        return 0.5 * heading

    row = Derivation("mach", half, "half the heading", "DEFINITION")
    made = resolver("heading", "pressure_altitude", rows=(row,))
    assert made.resolve("mach")
    assert made.steps["mach"].inputs == {"heading": "heading"}
