"""The trace table in blocks."""

from __future__ import annotations

import numpy as np
import pytest
from derive.flown import SENSORS, aerobatics, larkspur
from derive.logs import channel_of, make, recording_of

from exceed.core.phases import PHASES
from exceed.core.quantities import TRACE_ORDER
from exceed.core.trace import Trace
from exceed.derive.export import methods_of, trace_blocks, trace_columns
from exceed.derive.plan import build_trace


def trace() -> Trace:
    return build_trace(recording_of(aerobatics(), SENSORS), larkspur(), mass=905.0)


def test_columns_come_in_the_order_of_the_quantities_and_name_their_unit() -> None:
    columns = trace_columns(trace())
    places = [TRACE_ORDER.index(column.quantity) for column in columns]
    assert places == sorted(places)
    names = {column.quantity: column.name for column in columns}
    assert names["load_factor"] == "load_factor_g"
    assert names["roll_rate"] == "roll_rate_deg_s"
    assert names["mach"] == "mach"
    assert names["vertical_speed"] == "vertical_speed_ft_min"
    assert names["weight_on_wheels"] == "weight_on_wheels"
    row = next(column for column in columns if column.quantity == "stall_margin")
    assert "LOAD_FACTOR" in row.inputs
    assert "INDICATED_AIRSPEED" in row.inputs


def test_every_row_of_the_log_is_a_row_of_the_table() -> None:
    one = trace()
    blocks = list(trace_blocks(one, size=1000))
    assert np.array_equal(np.concatenate([block.time for block in blocks]), one.recording.time)
    flight = np.concatenate([block.flight for block in blocks])
    start, end = one.track.flights[0].start, one.track.flights[0].end
    inside = (one.recording.time >= start) & (one.recording.time <= end)
    assert np.array_equal(flight == 1, inside)
    phase = np.concatenate([block.phase for block in blocks])
    assert np.array_equal(phase, one.track.phases.at(one.recording.time))
    assert PHASES[phase[0]] == "standing"


@pytest.mark.parametrize("size", [100, 4096])
def test_values_do_not_depend_on_the_blocks(size: int) -> None:
    one = trace()
    whole = next(iter(trace_blocks(one)))
    for block in trace_blocks(one, size=size):
        for name, values in block.values.items():
            expected = whole.values[name][block.start : block.stop]
            assert np.allclose(values, expected, rtol=1e-9, atol=1e-6, equal_nan=True), name


def test_values_are_in_the_units_of_their_names() -> None:
    time = np.arange(0.0, 20.0)
    channels = {
        "indicated_airspeed": channel_of("indicated_airspeed", np.full(20, 51.4444), None, time),
        "static_air_temperature": channel_of("static_air_temperature", np.full(20, 288.15), None, time),
        "pressure_altitude": channel_of("pressure_altitude", np.full(20, 304.8), None, time),
        "oil_temperature": channel_of("oil_temperature", np.full(20, 373.15), None, time, unit="degC"),
    }
    (block,) = trace_blocks(build_trace(make(time, channels)))
    assert block.values["indicated_airspeed_kt"] == pytest.approx(np.full(20, 100.0), abs=1e-3)
    assert block.values["static_air_temperature_degC"] == pytest.approx(np.full(20, 15.0))
    assert block.values["pressure_altitude_ft"] == pytest.approx(np.full(20, 1000.0))
    assert block.values["oil_temperature_degC"] == pytest.approx(np.full(20, 100.0))


def test_an_empty_recording_has_columns_and_no_rows() -> None:
    empty = build_trace(make(np.empty(0), {"load_factor": channel_of("load_factor", np.empty(0))}))
    assert list(trace_blocks(empty)) == []


def test_methods_say_what_was_assumed_and_how_sure_it_is() -> None:
    rows = {row["quantity"]: row for row in methods_of(trace())}
    assert rows["load_factor"]["method"] == "accelerometer moved to the centre of gravity"
    assert "LOAD_FACTOR" in rows["load_factor"]["inputs"]
    assert rows["height_above_aerodrome"]["assumes"] == "pressure does not change during the flight"
    assert rows["indicated_airspeed"]["standard_uncertainty"]["unit"] == "kt"
    assert rows["indicated_airspeed"]["standard_uncertainty"]["value"] == pytest.approx(2 / 1.96, rel=0.01)
