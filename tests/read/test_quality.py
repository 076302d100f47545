"""What cannot be flight is rejected with its place; what may be flight stays, however sharp."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from read.made import DEG, FT, KT, log, of_flight, si, truth

from exceed.core.recording import Recording
from exceed.read import measure, quality
from exceed.read.quality import Series

NZ = si("load_factor")
COUNT = truth().count
TIME = np.arange(COUNT) / 8.0
BASE = {
    "IAS [kt]": si("indicated_airspeed") / KT,
    "PALT [ft]": si("pressure_altitude") / FT,
    "ROLL [deg]": si("bank_angle") / DEG,
    "PITCH [deg]": si("pitch_angle") / DEG,
    "Q [deg/s]": si("pitch_rate") / DEG,
}
AIRBORNE = 1200  # a row well inside the flight


def with_load(folder: Path, load: np.ndarray, **without: bool) -> Recording:
    rng = np.random.default_rng(7)
    columns = {"NZ [g]": load + 0.005 * rng.standard_normal(len(load)), **BASE}
    return log(folder, of_flight({k: v for k, v in columns.items() if k not in without.get("drop", ())}))  # type: ignore[operator]


def test_clean_flight_rejects_nothing(tmp_path: Path) -> None:
    assert with_load(tmp_path, NZ).rejected == ()


@pytest.mark.parametrize("size", [1.5, 3.0, 7.0, -3.0])
def test_a_lone_jump_that_the_pitch_rate_does_not_show_is_a_spike(tmp_path: Path, size: float) -> None:
    load = NZ.copy()
    load[AIRBORNE] += size
    recording = with_load(tmp_path, load)
    (row,) = recording.rejected
    assert (row.quantity, row.reason, row.samples, row.rows) == ("load_factor", "spike", 1, (AIRBORNE, AIRBORNE))
    assert row.extreme == pytest.approx(load[AIRBORNE], abs=0.03)
    values = recording.channels["load_factor"].values
    assert np.isnan(values[AIRBORNE])
    assert np.count_nonzero(np.isnan(values)) == 1


def pulse(width: float, phase: float, rate: float = 8.0) -> np.ndarray:
    """Half a sine of a width in seconds, sampled at a rate, its centre off the sample by a phase in samples."""
    at = (np.arange(41) - 20 - phase) / rate
    return np.where(np.abs(at) < width / 2, np.cos(np.pi * at / width), 0.0)


@given(width=st.floats(0.3, 1.2), phase=st.floats(-0.5, 0.5), size=st.floats(0.8, 7.0), noise=st.floats(0.0, 0.03))
@settings(max_examples=150, deadline=None)
def test_short_pulls_survive_without_any_companion(width: float, phase: float, size: float, noise: float) -> None:
    """0.3 s is shorter than any pull of an aeroplane; at 8 Hz it lifts at least one neighbour."""
    rng = np.random.default_rng(int(1e6 * (width + size)))
    values = 1.0 + noise * rng.standard_normal(400)
    values[180:221] += size * pulse(width, phase)
    before = values.copy()
    checked = quality.check(Series("load_factor", values, lambda: np.arange(400) / 8.0, 0.125, 0.001), None, {})
    assert checked.rejected == []
    assert np.array_equal(values, before)


@given(phase=st.floats(-0.5, 0.5), size=st.floats(0.6, 3.0))
@settings(max_examples=60, deadline=None)
def test_an_impact_on_the_ground_survives(phase: float, size: float) -> None:
    """A touchdown's jolt of a tenth of a second is one sample at 8 Hz."""
    values = np.ones(400)
    values[180:221] += size * pulse(0.12, phase)
    time = np.arange(400) / 8.0
    wheels = Series("weight_on_wheels", (time > 24.9).astype(float), lambda: time, 0.125, 0.0, True)
    pitch_rate = Series("pitch_rate", np.zeros(400), lambda: time, 0.125, 0.0)
    checked = quality.check(
        Series("load_factor", values, lambda: time, 0.125, 0.001),
        None,
        {"weight_on_wheels": wheels, "pitch_rate": pitch_rate},
    )
    assert checked.rejected == []


def test_a_jump_that_the_pitch_rate_confirms_is_flown() -> None:
    time = np.arange(400) / 4.0
    values, rate = np.ones(400), np.zeros(400)
    values[200] += 3.0
    rate[200] = 0.6
    checked = quality.check(
        Series("load_factor", values, lambda: time, 0.25, 0.001),
        None,
        {"pitch_rate": Series("pitch_rate", rate, lambda: time, 0.25, 0.0)},
    )
    assert checked.rejected == []


def test_in_doubt_it_is_kept_and_said() -> None:
    time = np.arange(400) / 4.0
    values = np.ones(400)
    values[200] += 3.0
    checked = quality.check(Series("load_factor", values, lambda: time, 0.25, 0.001), None, {})
    assert checked.rejected == []
    assert checked.notes == [
        "1 lone sample far from its neighbours is kept: nothing else shows that it was not flown",
    ]


def test_gusts_in_rough_air_survive() -> None:
    rng = np.random.default_rng(4)
    time = np.arange(4000) / 8.0
    # second-order correlated vertical gusts, 0.35 g rms, with peaks of 1.5 g
    white = rng.standard_normal(4000)
    rough = np.convolve(white, np.exp(-np.arange(12) / 1.2), mode="same")
    values = 1.0 + 0.35 * rough / rough.std()
    quiet = Series("pitch_rate", np.zeros(4000), lambda: time, 0.125, 0.0)
    checked = quality.check(Series("load_factor", values, lambda: time, 0.125, 0.001), None, {"pitch_rate": quiet})
    assert checked.rejected == []


@pytest.mark.parametrize(
    ("column", "quantity", "jump"),
    [
        ("IAS [kt]", "indicated_airspeed", 60.0),
        ("PALT [ft]", "pressure_altitude", -2000.0),
        ("ROLL [deg]", "bank_angle", 90.0),
    ],
)
def test_lone_jumps_of_other_channels(tmp_path: Path, column: str, quantity: str, jump: float) -> None:
    columns = {name: values.copy() for name, values in BASE.items()}
    columns[column][AIRBORNE] += jump
    (row,) = log(tmp_path, of_flight(columns)).rejected
    assert (row.quantity, row.reason, row.rows) == (quantity, "spike", (AIRBORNE, AIRBORNE))


def test_a_heading_that_wraps_is_no_spike(tmp_path: Path) -> None:
    heading = np.where(np.arange(COUNT) % 2 == 0, 359.9, 0.1)
    assert log(tmp_path, of_flight({"HDG [deg]": heading})).rejected == ()


def test_out_of_range(tmp_path: Path) -> None:
    columns = {"IAS [kt]": BASE["IAS [kt]"].copy(), "NZ [g]": NZ.copy()}
    columns["IAS [kt]"][500:510] = 9999.0
    columns["NZ [g]"][AIRBORNE] = -327.68
    rows = {row.quantity: row for row in log(tmp_path, of_flight(columns)).rejected}
    assert (rows["indicated_airspeed"].reason, rows["indicated_airspeed"].samples) == ("out_of_range", 10)
    assert rows["indicated_airspeed"].extreme == pytest.approx(9999 * KT)
    assert (rows["load_factor"].reason, rows["load_factor"].extreme) == ("out_of_range", pytest.approx(-327.68))


def clipped(low: float, high: float) -> np.ndarray:
    load = NZ.copy()
    at = np.arange(60)
    load[AIRBORNE : AIRBORNE + 60] = 1.0 + 5.5 * np.sin(np.pi * at / 60.0) ** 4
    return np.clip(load, low, high)


def test_a_clipped_peak_is_kept_and_its_end_found(tmp_path: Path) -> None:
    recording = with_load(tmp_path, clipped(-3.0, 5.0) - 0.0, drop=())
    assert recording.channels["load_factor"].saturation == (
        -np.inf,
        np.inf,
    )  # the noise was added after clipping: no plateau
    columns = {"NZ [g]": clipped(-3.0, 5.0), **BASE}
    recording = log(tmp_path, of_flight(columns))
    channel = recording.channels["load_factor"]
    assert channel.saturation[1] == pytest.approx(5.0)
    assert channel.saturation[0] == -np.inf
    assert recording.rejected == ()


@given(
    size=st.floats(1.5, 6.0), width=st.floats(0.8, 4.0), phase=st.floats(0, 1), step=st.sampled_from([0.004, 0.02, 0.1])
)
@settings(max_examples=200, deadline=None)
def test_a_flown_peak_is_not_called_clipped(size: float, width: float, phase: float, step: float) -> None:
    """Rounded to the recorder's step, the top of a smooth peak may be the same figure three times over."""
    at = (np.arange(800) + phase) / 8.0
    values = np.round((1.0 + size * np.exp(-(((at - 50.0) / (0.42 * width)) ** 2))) / step) * step
    checked = quality.check(Series("load_factor", values, lambda: np.arange(800) / 8.0, 0.125, step), None, {})
    assert checked.saturation == (-np.inf, np.inf)


def test_the_stated_range_rejects_only_what_lies_beyond(tmp_path: Path) -> None:
    load = clipped(-3.0, 5.0)
    load[2000] = 9.0
    recording = log(tmp_path, of_flight({"NZ [g]": load, **BASE}), ranges={"load_factor": (-3.0, 5.0)})
    channel = recording.channels["load_factor"]
    assert channel.saturation == (-3.0, 5.0)
    assert [(row.reason, row.samples) for row in recording.rejected] == [("out_of_range", 1)]
    assert np.nanmax(channel.values) == pytest.approx(5.0)


def test_a_stuck_accelerometer_while_the_aeroplane_turns(tmp_path: Path) -> None:
    rng = np.random.default_rng(2)
    load = NZ + 0.01 * rng.standard_normal(COUNT)
    load[1500:1800] = load[1500]  # the bank goes from 0 to 46 degrees meanwhile
    recording = log(tmp_path, of_flight({"NZ [g]": load, **BASE}))
    (row,) = recording.rejected
    assert (row.reason, row.samples, row.rows) == ("stuck", 299, (1501, 1799))


def test_what_may_be_steady_is_not_called_stuck(tmp_path: Path) -> None:
    rng = np.random.default_rng(2)
    still = NZ + 0.01 * rng.standard_normal(COUNT)
    still[1200:1450] = still[1200]  # in a climb without a bank
    assert log(tmp_path, of_flight({"NZ [g]": still, **BASE})).rejected == ()


def test_noise_and_step_are_measured() -> None:
    rng = np.random.default_rng(5)
    slow = np.sin(np.arange(20_000) / 300.0)
    assert measure.noise_of(slow + 0.02 * rng.standard_normal(20_000)) == pytest.approx(0.02, rel=0.05)
    for step in (0.004, 0.1, 1.0, 0.25):
        assert measure.resolution(np.round(50 * slow / step) * step) == pytest.approx(step)
    assert measure.resolution(slow) == 0.0


def test_a_slow_accelerometer_is_said(tmp_path: Path) -> None:
    slow = NZ[::8]
    lines = ["time [s],NZ [g]"] + [f"{k},{value:.3f}" for k, value in enumerate(slow)]
    notes = log(tmp_path, "\n".join(lines) + "\n").channels["load_factor"].notes
    assert "recorded every 1 s: peaks shorter than about 4 s are not sized" in notes


def test_a_channel_that_always_jumps_is_kept_and_said() -> None:
    values = np.where(np.arange(30_000) % 10 == 5, 100.0, 60.0)
    checked = quality.check(Series("indicated_airspeed", values, lambda: np.arange(30_000) / 8.0, 0.125, 0.1), None, {})
    assert checked.rejected == []
    assert checked.notes == ["3000 samples jump to and fro: too many for lone errors, all are kept"]


def test_the_first_sample_has_one_neighbour_to_ask() -> None:
    values = 50.0 + np.sin(np.arange(400) / 30.0)
    values[0] = 514.0
    checked = quality.check(Series("indicated_airspeed", values, lambda: np.arange(400) / 8.0, 0.125, 0.1), None, {})
    assert [(first, reason) for first, _, _, reason, _ in checked.rejected] == [(0, "spike")]
