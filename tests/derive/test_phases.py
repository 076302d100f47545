"""Phases of flight in the taxonomy's words; unknown where it cannot be told."""

from __future__ import annotations

import numpy as np
import pytest
from derive.flown import SENSORS, aerobatics, circuits
from derive.logs import only, recording_of, without
from derive.test_flights import CIRCUIT, STALL, profile

from exceed.core.phases import PHASES, PhaseTrack
from exceed.core.recording import Recording
from exceed.derive.coarse import coarse_of
from exceed.derive.evidence import signals_of
from exceed.derive.flights import flights_of
from exceed.derive.phases import phases_of


def phases(recording: Recording) -> tuple[PhaseTrack, list[tuple[float, float]], tuple[str, ...]]:
    coarse = coarse_of(recording)
    signals = signals_of(coarse)
    track, standing, notes = phases_of(coarse, signals, flights_of(coarse, signals, STALL))
    return track, list(standing), notes


def order(track: PhaseTrack) -> list[str]:
    return [PHASES[code] for code in track.code]


def test_aerobatics_go_through_the_phases_in_order() -> None:
    track, standing, notes = phases(recording_of(aerobatics(), SENSORS))
    assert order(track) == [
        "standing", "taxi", "take-off", "initial climb", "climb", "cruise", "manoeuvring", "descent", "approach",
        "landing", "taxi", "standing",
    ]  # fmt: skip
    assert standing[0][1] == pytest.approx(31.0, abs=2.0)
    assert notes == ()


def test_every_pull_and_roll_of_aerobatics_is_manoeuvring() -> None:
    flown = aerobatics()
    track, _, _ = phases(recording_of(flown, SENSORS))
    for name in ("loop", "roll", "inverted", "pull"):
        assert track.name_at(flown.labels[[label for _, label in flown.labels].index(name)][0] + 2.0) == "manoeuvring"
    strong = np.abs(flown["load_factor"] - 1.0) > 1.0
    strong &= flown["weight_on_wheels"] < 0.5
    assert set(track.at(flown.time[strong])) == {PHASES.index("manoeuvring")}


def test_gusty_cruise_is_no_manoeuvring() -> None:
    flown = circuits()
    track, _, _ = phases(recording_of(flown, SENSORS))
    start = flown.labels[[label for _, label in flown.labels].index("rough air")][0]
    assert np.max(flown["load_factor"][(flown.time > start) & (flown.time < start + 60)]) > 1.7
    assert set(track.at(np.arange(start, start + 58))) == {PHASES.index("cruise")}


def test_a_missed_approach_belongs_to_the_approach() -> None:
    flown = circuits()
    (around,) = flown.marked("go_around")
    track, _, _ = phases(recording_of(flown, SENSORS))
    assert track.name_at(around) == "approach"


def test_take_off_ends_at_35_feet_and_approach_begins_at_1000() -> None:
    """35 ft and 1000 ft above the runway: the taxonomy's own figures [CICTT-PHASE]."""
    track, _, _ = phases(profile(CIRCUIT))
    ends = dict(zip(order(track), [*track.start[1:], np.nan], strict=True))
    # 230 m in 60 s from lift-off at 120 s: 35 ft (10.7 m) after 2.8 s
    assert ends["take-off"] == pytest.approx(122.8, abs=2.5)
    names = order(track)
    # the circuit's top, 300 m, is below 1000 ft: all of it after the climb belongs to the approach
    assert names[names.index("initial climb") + 1] == "approach"
    assert names[names.index("approach") + 1] == "landing"


def test_speed_alone_leaves_the_flight_unknown_and_says_why() -> None:
    track, _, notes = phases(only(recording_of(aerobatics(), SENSORS), "indicated_airspeed"))
    assert track.name_at(300.0) == "unknown"
    assert any("no height" in note for note in notes)
    assert any("manoeuvring cannot be told" in note for note in notes)


def test_a_bare_accelerometer_knows_only_manoeuvring() -> None:
    track, standing, _ = phases(only(recording_of(aerobatics(), SENSORS), "load_factor"))
    assert set(order(track)) == {"unknown", "manoeuvring"}
    assert standing == []


def test_without_ground_speed_standing_is_not_claimed() -> None:
    track, standing, _ = phases(without(recording_of(aerobatics(), SENSORS), "ground_speed", "heading"))
    assert standing == []
    assert track.name_at(10.0) == "unknown"


def test_short_legs_do_not_flicker() -> None:
    """A wavering climb of 300 ft/min stays one climb."""
    points = [(0.0, 80.0, 500.0)]
    for step in range(1, 60):
        points.append((10.0 * step, 80.0, 500.0 + 20.0 * step + (3.0 if step % 2 else -3.0)))
    track, _, _ = phases(profile(points))
    assert order(track).count("climb") == 1


def test_a_touch_and_go_lands_and_takes_off_again() -> None:
    touch = [*CIRCUIT[:8], (606, 50, 100), (612, 58, 100), (670, 75, 330), (800, 100, 700), (900, 90, 700),
             (1100, 60, 100), (1120, 25, 100), (1140, 10, 100), (1200, 0, 100)]  # fmt: skip
    track, _, _ = phases(profile(touch))
    names = order(track)
    first = names.index("landing")
    assert names[first - 1] == "approach"
    assert names[first + 1 : first + 3] == ["take-off", "initial climb"]
    assert names.count("landing") == 2


def test_a_wavering_airspeed_indicator_does_not_flicker_between_taxi_and_unknown() -> None:
    recording = only(profile([(0, 0, 100), (60, 0, 100), (70, 16, 100), (200, 16, 100), (220, 0, 100), (300, 0, 100)],
                             noise=0.6), "indicated_airspeed")  # fmt: skip
    track, _, _ = phases(recording)
    assert order(track) == ["unknown", "taxi", "unknown"]
