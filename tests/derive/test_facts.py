"""The aircraft file as numpy facts, each missing one with its reason."""

from __future__ import annotations

import numpy as np
import pytest
from derive.flown import larkspur
from derive.logs import channel_of, make

from exceed.derive.corrections import PositionError, calibrated_from_indicated, indicated_from_calibrated
from exceed.derive.facts import WORDS, facts_of
from exceed.derive.plan import build_trace
from exceed.documents.aircraft import Aircraft, load_aircraft

KT = 1852 / 3600


def aircraft(text: str) -> Aircraft:
    return load_aircraft(f"format: exceed-aircraft/1\n{text}\n")


def test_no_aircraft_and_a_bare_file_give_a_reason_for_every_fact() -> None:
    assert set(facts_of(None).missing) == set(WORDS)
    bare = facts_of(aircraft("registration: ZZ-NMA"))
    assert set(bare.missing) == set(WORDS)
    assert bare.missing["stall_table"] == "the aircraft file has no stall speed"
    assert set(facts_of(larkspur()).missing) == set()


def test_indicated_stall_speeds_become_calibrated_by_the_position_error() -> None:
    text = (
        "mass: {maximum_take_off: 900 kg}\nstall_speed: [{flaps: 0 deg, upright: 50 KIAS}]\n"
        "position_error: [[50 KIAS, 54 KCAS], [100 KIAS, 101 KCAS]]"
    )
    facts = facts_of(aircraft(text))
    assert facts.values["stall_table"].upright[0] == pytest.approx(54 * KT)
    # the mass of a row without one is the maximum take-off mass
    assert facts.values["stall_table"].mass[0] == 900.0
    without = facts_of(aircraft("mass: {maximum_take_off: 900 kg}\nstall_speed: [{flaps: 0 deg, upright: 50 KIAS}]"))
    assert without.values["stall_table"].upright[0] == pytest.approx(50 * KT)
    assert any("taken as calibrated" in note for note in without.notes)


def test_a_stall_speed_of_no_mass_is_not_used_and_said() -> None:
    facts = facts_of(aircraft("stall_speed: [{flaps: 0 deg, upright: 50 KCAS}]"))
    assert "stall_table" in facts.missing
    assert any("without its mass" in note for note in facts.notes)


def test_limits_rest_only_on_what_their_rows_ask_for() -> None:
    plain = facts_of(aircraft("load_factor: [{maximum: 4.4 g, minimum: -1.8 g}]"))
    assert {name for name, target in plain.aliases.items() if target} == set()
    asked = facts_of(aircraft("load_factor: [{speed_up_to: 120 KEAS, maximum: 4.4 g}, {maximum: 3 g, airbrakes: out}]"))
    assert asked.aliases["limit_airspeed"] == "equivalent_airspeed"
    assert asked.aliases["limit_airbrakes"] == "airbrakes_out"
    assert asked.aliases["limit_mass"] is None


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("128 KIAS", [128.0, 128.0]),
        ("{over: mass, points: [[700 kg, 110 KIAS], [960 kg, 128 KIAS]]}", [110.0, 128.0]),
        # root of mass only where the file says so: 128 sqrt(700/960) = 109.3
        ("{value: 128 KIAS, mass: 960 kg, scale: sqrt_mass}", [128 * np.sqrt(700 / 960), 128.0]),
        ("{over: pressure_altitude, points: [[0 ft, 128 KIAS], [10000 ft, 118 KIAS]]}", [123.0, 123.0]),
    ],
)
def test_manoeuvring_speed_in_all_its_forms(text: str, expected: list[float]) -> None:
    time = np.arange(2.0)
    channels = {
        "mass": channel_of("mass", [700.0, 960.0], None, time),
        "pressure_altitude": channel_of("pressure_altitude", [1524.0, 1524.0], None, time),
    }
    trace = build_trace(make(time, channels), aircraft(f"speeds: {{manoeuvring: {text}}}"))
    found = trace.evaluate(["manoeuvring_speed"], trace.grid(["pressure_altitude"]))["manoeuvring_speed"]
    assert found / KT == pytest.approx(expected)


def test_position_error_goes_there_and_back_and_holds_its_last_correction() -> None:
    table = PositionError(
        (0.0, 0.5),
        (np.array([25.0, 50.0, 90.0]), np.array([25.0, 50.0])),
        (np.array([27.0, 50.5, 90.0]), np.array([28.0, 51.0])),
    )
    speed = np.linspace(0.0, 120.0, 50)
    for flaps in (None, np.zeros(50), np.full(50, 0.5)):
        back = indicated_from_calibrated(calibrated_from_indicated(speed, table, flaps), table, flaps)
        assert np.allclose(back, speed, atol=1e-9)
    assert calibrated_from_indicated(np.array([5.0]), table)[0] == pytest.approx(7.0)
    assert calibrated_from_indicated(np.array([100.0]), table)[0] == pytest.approx(100.0)
    half = calibrated_from_indicated(np.array([25.0]), table, np.array([0.25]))[0]
    assert half == pytest.approx(27.5)
    assert np.isnan(calibrated_from_indicated(np.array([25.0]), table, np.array([np.nan]))[0])
