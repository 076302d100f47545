"""Flights are told from whatever was recorded, and what cannot be told is said."""

from __future__ import annotations

import numpy as np
import pytest
from derive.flown import SENSORS, aerobatics, circuits
from derive.logs import channel_of, make, only, recording_of, without

from exceed.core.intervals import normal
from exceed.core.recording import Recording
from exceed.derive.coarse import coarse_of
from exceed.derive.evidence import signals_of
from exceed.derive.flights import Found, flights_of
from exceed.derive.plan import build_trace

KT = 0.514444
STALL = 55.0 * KT


def flights(recording: Recording, stall: float | None = None) -> Found:
    coarse = coarse_of(recording)
    return flights_of(coarse, signals_of(coarse), stall)


def profile(points: list[tuple[float, float, float]], rate: float = 4.0, noise: float = 0.0) -> Recording:
    """A log of (time s, IAS kt, height m) corner points, straight between."""
    at = np.array(points, dtype=float)
    time = np.arange(at[0, 0], at[-1, 0], 1.0 / rate)
    rng = np.random.default_rng(3)
    speed = np.interp(time, at[:, 0], at[:, 1]) * KT + noise * rng.standard_normal(len(time))
    height = np.interp(time, at[:, 0], at[:, 2]) + 0.3 * noise * rng.standard_normal(len(time))
    return make(
        time, {"indicated_airspeed": channel_of("indicated_airspeed", np.maximum(speed, 0.0), None, time),
               "pressure_altitude": channel_of("pressure_altitude", height, None, time)},
    )  # fmt: skip


# (time, kt, m): a circuit of a light aeroplane; lift-off at 120 s, touchdown at 600 s
CIRCUIT = [
    (0, 0, 100), (90, 0, 100), (110, 50, 100), (120, 62, 100), (180, 75, 330), (300, 100, 400), (480, 90, 400),
    (600, 60, 100), (620, 25, 100), (640, 10, 100), (700, 0, 100),
]  # fmt: skip


def joined(*parts: list[tuple[float, float, float]], pause: float = 1.0) -> list[tuple[float, float, float]]:
    """Profiles one after another on one clock."""
    made: list[tuple[float, float, float]] = []
    for part in parts:
        start = made[-1][0] + pause if made else 0.0
        made += [(t + start, v, h) for t, v, h in part]
    return made


@pytest.mark.parametrize("stall", [STALL, None], ids=["stall speed known", "not known"])
@pytest.mark.parametrize(
    ("channels", "within"),
    [
        (("weight_on_wheels",), 0.3),
        (("indicated_airspeed", "pressure_altitude", "load_factor"), 3.0),
        (("indicated_airspeed", "pressure_altitude"), 3.5),
        (("ground_speed", "pressure_altitude"), 3.5),
        (("indicated_airspeed",), 7.0),
        (("pressure_altitude",), 7.0),
    ],
)
def test_one_flight_is_found_from_any_subset(channels: tuple[str, ...], within: float, stall: float | None) -> None:
    for flown in (aerobatics(), circuits()):
        found = flights(only(recording_of(flown, SENSORS), *channels), stall)
        assert found.known
        (flight,) = found.flights
        (take_off,), (touch,) = flown.marked("take_off"), flown.marked("touchdown")
        assert flight.start == pytest.approx(take_off, abs=within)
        assert flight.end == pytest.approx(touch, abs=within)
        assert (flight.take_off_seen, flight.landing_seen, flight.landings, flight.bounces) == (True, True, 1, 0)


def test_the_accelerometer_finds_the_touchdown_that_speed_and_height_only_bracket() -> None:
    flown = aerobatics()
    found = flights(without(recording_of(flown, SENSORS), "weight_on_wheels"), STALL)
    assert found.flights[0].end == pytest.approx(flown.marked("touchdown")[0], abs=0.3)


def test_a_position_logger_tells_flights_too() -> None:
    """Latitude, longitude and geometric height once a second, as a handheld receiver writes them."""
    flown = circuits()
    rows = np.arange(0, len(flown.time), 100)
    time = flown.time[rows]
    radius = 6_371_000.0
    latitude = 0.9 + np.round(flown["north"][rows] / radius, 7)
    longitude = np.round(flown["east"][rows] / radius / np.cos(0.9), 7) - 0.05
    height = flown["height_above_aerodrome"][rows]
    channels = {"latitude": latitude, "longitude": longitude, "geometric_altitude": height}
    recording = make(time, {name: channel_of(name, row, None, time) for name, row in channels.items()})
    (flight,) = flights(recording).flights
    assert flight.start == pytest.approx(flown.marked("take_off")[0], abs=5.0)
    assert flight.end == pytest.approx(flown.marked("touchdown")[0], abs=5.0)
    trace = build_trace(recording)
    assert trace.steps["load_factor"].method == "vertical acceleration"
    values = trace.evaluate(["ground_speed", "track_angle"], trace.grid(["ground_speed"]))
    inside = trace.track.airborne.contains(time)
    error = (values["ground_speed"] - flown["ground_speed"][rows])[inside]
    assert np.sqrt(np.mean(error**2)) < 1.0
    turned = np.mod(values["track_angle"] - flown["track_angle"][rows] + np.pi, 2 * np.pi) - np.pi
    assert np.percentile(np.abs(turned[inside]), 95) < np.radians(3.0)


def test_a_go_around_is_counted_and_is_no_landing() -> None:
    for channels in (("weight_on_wheels", "pressure_altitude"), ("indicated_airspeed", "pressure_altitude")):
        (flight,) = flights(only(recording_of(circuits(), SENSORS), *channels)).flights
        assert (flight.go_arounds, flight.landings) == (1, 1)


def test_a_bare_accelerometer_is_airborne_all_the_time_and_says_so() -> None:
    recording = only(recording_of(aerobatics(), SENSORS), "load_factor")
    found = flights(recording)
    assert not found.known
    assert found.flights == ()
    assert found.airborne.total == pytest.approx(recording.duration)
    assert "all recorded time counts as airborne" in found.notes[-1]


def test_the_impact_of_the_touchdown_is_no_airborne_time() -> None:
    flown = aerobatics()
    recording = recording_of(flown, SENSORS)
    (touch,) = flown.marked("touchdown")
    for one in (recording, without(recording, "weight_on_wheels")):
        found = flights(one, STALL)
        assert not found.airborne.contains(np.arange(touch - 0.2, touch + 1.0, 0.05)).any()
        assert found.windows.contains(np.arange(touch, touch + 0.3, 0.05)).all()
        assert found.airborne.contains(np.array([touch - 10.0])).all()


def test_recordings_that_begin_and_end_in_the_air_say_so() -> None:
    flown = aerobatics()
    for channels in (("weight_on_wheels",), ("indicated_airspeed", "pressure_altitude"), ("indicated_airspeed",)):
        middle = only(recording_of(flown, SENSORS, start=160.0, end=500.0), *channels)
        (flight,) = flights(middle, STALL).flights
        assert (flight.take_off_seen, flight.landing_seen, flight.landings) == (False, False, 0)
        assert flight.start == 0.0
        assert flight.end == middle.time[-1]
        assert flights(middle, STALL).airborne.contains(middle.time).all()
        ending = only(recording_of(flown, SENSORS, start=160.0), *channels)
        (flight,) = flights(ending, STALL).flights
        assert (flight.take_off_seen, flight.landing_seen, flight.landings) == (False, True, 1)


def test_a_recording_that_stops_in_the_air_is_flown_to_its_last_sample() -> None:
    recording = profile([point for point in CIRCUIT if point[0] <= 480])
    found = flights(recording, STALL)
    assert found.flights[-1].end == recording.time[-1]
    assert found.airborne.contains(recording.time[-5:]).all()


@pytest.mark.parametrize("stall", [STALL, None])
def test_several_flights_in_one_log_are_told_apart(stall: float | None) -> None:
    recording = profile(joined(CIRCUIT, CIRCUIT, CIRCUIT), noise=0.2)
    found = flights(recording, stall)
    assert [flight.number for flight in found.flights] == [1, 2, 3]
    for place, flight in enumerate(found.flights):
        assert flight.start == pytest.approx(120 + 701 * place, abs=6.0)
        assert flight.end == pytest.approx(600 + 701 * place, abs=8.0)
    assert not found.airborne.contains(np.array([50.0, 680.0, 750.0])).any()


def test_a_touch_and_go_is_one_flight_with_two_landings() -> None:
    touch = [*CIRCUIT[:8], (606, 50, 100), (612, 58, 100), (670, 75, 330), (800, 100, 400), (900, 90, 400),
             (1020, 60, 100), (1040, 25, 100), (1060, 10, 100), (1120, 0, 100)]  # fmt: skip
    recording = profile(touch)
    (flight,) = flights(recording, STALL).flights
    assert flight.landings == 2
    assert flight.touchdowns[0] == pytest.approx(600.0, abs=6.0)
    assert flight.touchdowns[1] == pytest.approx(1020.0, abs=6.0)
    assert flight.go_arounds == 0


def wheels(edges: list[float], end: float, speed: tuple[list[float], list[float]]) -> Recording:
    """A weight-on-wheels log that begins on the ground and changes at each edge, with a ground speed."""
    time = np.arange(0.0, end, 0.125)
    state = 1.0 - np.searchsorted(edges, time, side="right") % 2
    rolling = np.interp(time, *speed) * KT
    return make(time, {"weight_on_wheels": channel_of("weight_on_wheels", state, None, time),
                       "ground_speed": channel_of("ground_speed", rolling, None, time)})  # fmt: skip


def test_a_bounce_is_a_touchdown_and_no_landing_of_its_own() -> None:
    recording = wheels([100, 500, 501.5, 503], 600, ([0, 90, 100, 500, 520, 600], [0, 0, 60, 60, 20, 0]))
    (flight,) = flights(recording).flights
    assert len(flight.touchdowns) == 2
    assert (flight.landings, flight.bounces) == (1, 1)
    assert flight.end == pytest.approx(503, abs=0.2)


def test_wheels_that_keep_rolling_make_a_touch_and_go_and_a_stop_makes_two_flights() -> None:
    rolling = ([0, 90, 100, 500, 510, 900, 930, 1000], [0, 0, 60, 60, 55, 60, 20, 0])
    (flight,) = flights(wheels([100, 500, 520, 900], 1000, rolling)).flights
    assert flight.landings == 2
    stopping = ([0, 90, 100, 500, 510, 560, 590, 600, 900, 930, 1000], [0, 0, 60, 60, 30, 0, 0, 60, 60, 20, 0])
    found = flights(wheels([100, 500, 600, 900], 1000, stopping)).flights
    assert [(round(one.start), round(one.end)) for one in found] == [(100, 500), (600, 900)]


def test_a_hop_on_the_take_off_run_is_no_flight_of_its_own() -> None:
    recording = wheels([95, 96, 100, 500], 600, ([0, 80, 100, 500, 520, 600], [0, 0, 60, 60, 20, 0]))
    (flight,) = flights(recording).flights
    assert flight.start == pytest.approx(100, abs=0.2)
    assert flight.landings == 1


def test_a_switch_that_speed_and_height_contradict_is_not_believed() -> None:
    recording = profile(joined(CIRCUIT))
    stuck = channel_of("weight_on_wheels", np.ones(len(recording.time)), None, recording.time)
    found = flights(make(recording.time, {**recording.channels, "weight_on_wheels": stuck}), STALL)
    assert len(found.flights) == 1
    assert "contradicts" in " ".join(found.notes)


def test_a_rejected_take_off_is_no_flight() -> None:
    rejected = [(0, 0, 100), (60, 0, 100), (80, 65, 100), (84, 65, 100), (100, 0, 100), (200, 0, 100)]
    found = flights(profile(rejected), STALL)
    assert found.flights == ()
    assert found.known
    assert len(found.airborne) == 0


def test_a_log_of_taxiing_only_has_no_flight() -> None:
    taxi = [(0, 0, 100), (60, 12, 100), (200, 15, 101), (300, 0, 101)]
    for stall in (STALL, None):
        found = flights(profile(taxi), stall)
        assert (found.flights, found.known) == ((), True)


def test_a_stall_turn_is_not_a_landing() -> None:
    """Speed near zero for seconds at the top of a vertical climb, with and without height."""
    vertical = [*CIRCUIT[:6], (400, 130, 900), (406, 60, 1080), (410, 15, 1130), (414, 15, 1130), (420, 90, 950),
                (500, 90, 400), *[(t + 100, v, h) for t, v, h in CIRCUIT[7:]]]  # fmt: skip
    for recording in (profile(vertical), only(profile(vertical), "indicated_airspeed")):
        (flight,) = flights(recording, STALL).flights
        assert flight.landings == 1


def test_a_sailplane_and_a_jet_are_found_without_their_stall_speeds() -> None:
    sailplane = [(0, 0, 300), (60, 0, 300), (75, 40, 300), (80, 45, 302), (400, 60, 900), (1500, 48, 1500),
                 (2400, 55, 500), (2600, 45, 300), (2612, 15, 300), (2700, 0, 300)]  # fmt: skip
    jet = [(0, 0, 50), (120, 0, 50), (140, 80, 50), (148, 112, 50), (200, 180, 1000), (600, 290, 6000),
           (2400, 260, 11000), (3600, 280, 5000), (4200, 150, 700), (4400, 110, 50),
           (4430, 40, 50), (4500, 5, 50)]  # fmt: skip
    for points, start, end in ((sailplane, 80, 2600), (jet, 148, 4400)):
        (flight,) = flights(profile(points, rate=1.0)).flights
        assert flight.start == pytest.approx(start, abs=8.0)
        assert flight.end == pytest.approx(end, abs=8.0)


def with_gap(recording: Recording, start: float, end: float) -> Recording:
    keep = (recording.time < start) | (recording.time > end)
    time = recording.time[keep]
    channels = {name: channel_of(name, row.values[keep], None, time) for name, row in recording.channels.items()}
    return make(time, channels)


def test_a_gap_in_the_air_does_not_cut_the_flight() -> None:
    found = flights(with_gap(profile(CIRCUIT), 300.0, 360.0), STALL)
    (flight,) = found.flights
    assert flight.end == pytest.approx(600.0, abs=8.0)


def test_a_clock_reset_parts_flights_and_the_seam_is_nobodys_time() -> None:
    recording = profile(CIRCUIT)
    keep = (recording.time < 300.0) | (recording.time > 360.0)
    time = recording.time[keep]
    channels = {name: channel_of(name, row.values[keep], None, time) for name, row in recording.channels.items()}
    parted = make(time, channels, seams=((299.75, 360.25),))
    found = flights(parted, STALL)
    first, second = found.flights
    assert (first.take_off_seen, first.landing_seen, first.landings) == (True, False, 0)
    assert (second.take_off_seen, second.landing_seen) == (False, True)
    assert not found.airborne.contains(np.array([300.0, 330.0, 360.0])).any()


def test_noise_and_steps_do_not_make_flights() -> None:
    recording = profile(joined(CIRCUIT, CIRCUIT), noise=1.5)
    assert len(flights(recording, STALL).flights) == 2
    height = np.round(recording.channels["pressure_altitude"].values / 7.62) * 7.62  # 25 ft
    stepped = {**recording.channels, "pressure_altitude": channel_of("pressure_altitude", height, None, recording.time)}
    assert len(flights(make(recording.time, stepped), STALL).flights) == 2


@pytest.mark.parametrize("count", [0, 1, 2, 5])
def test_a_handful_of_samples_raises_nothing(count: int) -> None:
    time = np.arange(count) * 0.25
    for names in (("load_factor",), ("indicated_airspeed",), ("pressure_altitude",), ("weight_on_wheels",),
                  ("indicated_airspeed", "pressure_altitude", "weight_on_wheels")):  # fmt: skip
        for value in (0.0, 60.0, np.nan):
            found = flights(make(time, {name: channel_of(name, np.full(count, value), None, time) for name in names}))
            assert found.airborne.total >= 0.0


def test_the_same_flights_come_from_a_later_clock() -> None:
    recording = profile(CIRCUIT)
    moved = make(recording.time + 5000.0, {
        name: channel_of(name, row.values, None, recording.time) for name, row in recording.channels.items()
    })  # fmt: skip
    (one,), (other,) = flights(recording, STALL).flights, flights(moved, STALL).flights
    assert other.start - 5000.0 == pytest.approx(one.start, abs=1e-6)
    assert other.end - 5000.0 == pytest.approx(one.end, abs=1e-6)


def test_ground_time_and_airborne_time_do_not_overlap() -> None:
    found = flights(recording_of(circuits(), SENSORS), STALL)
    both = normal(np.concatenate([found.ground.start, found.airborne.start]),
                  np.concatenate([found.ground.end, found.airborne.end]))  # fmt: skip
    assert both.total == pytest.approx(found.ground.total + found.airborne.total)


def test_a_blocked_pitot_in_cruise_is_no_landing() -> None:
    """The reading falls to nothing within a second, for two minutes, in level flight."""
    recording = profile(CIRCUIT)
    speed = recording.channels["indicated_airspeed"].values.copy()
    speed[(recording.time > 330) & (recording.time < 450)] = 0.0
    height = recording.channels["pressure_altitude"].values
    level = np.where((recording.time > 300) & (recording.time < 480), 400.0, height)
    channels = {"indicated_airspeed": channel_of("indicated_airspeed", speed, None, recording.time),
                "pressure_altitude": channel_of("pressure_altitude", level, None, recording.time)}  # fmt: skip
    for one in (make(recording.time, channels), only(make(recording.time, channels), "indicated_airspeed")):
        found = flights(one, STALL)
        assert len(found.flights) == 1
        assert found.airborne.contains(np.array([400.0])).all()
        assert any("failed reading" in note for note in found.notes)
