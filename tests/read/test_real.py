"""A real recording (source and licence in tests/data/real/SOURCES.md) without units: the data settle them all."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from exceed.read import read_log

LOG = Path(__file__).parents[1] / "data" / "real" / "parabolas.csv.gz"

# the units that the source of the file states
STATED = {
    "pressure_altitude": "ft",
    "indicated_airspeed": "kt",
    "true_airspeed": "kt",
    "ground_speed": "kt",
    "mach": "1",
    "bank_angle": "deg",
    "heading": "deg",
    "track_angle": "deg",
    "turn_rate": "deg/s",
    "vertical_speed": "ft/min",
    "latitude": "deg",
    "longitude": "deg",
}


def test_the_data_settle_every_unit_as_the_source_states_it() -> None:
    recording = read_log(LOG)
    assert {name: channel.unit for name, channel in recording.channels.items()} == STATED
    assert recording.unresolved == ()
    assert recording.unused == ("selected_mcp",)
    assert (recording.rows, recording.clock.kind, recording.clock.start) == (10367, "epoch", 1593069386.0)


def test_most_of_it_is_believed() -> None:
    recording = read_log(LOG)
    for row in recording.rejected:
        assert row.reason in ("spike", "out_of_range"), row
    for channel in recording.channels.values():
        assert channel.valid_share > 0.99, channel.quantity
    assert 250 < np.nanmax(recording.channels["true_airspeed"].values) * 3600 / 1852 < 600
