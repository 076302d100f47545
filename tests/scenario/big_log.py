"""The benchmark log: N rows of 31 columns at 8 Hz, tiled from one flight so that it holds a few hundred true events.

Run: python tests/scenario/big_log.py FOLDER [ROWS] [csv|parquet|both]
Writes big.csv and big.parquet (the same figures) and big.json (what is true of them). Invented.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import Any

HERE = Path(__file__).resolve().parent
if __name__ == "__main__":
    sys.path.insert(0, str(HERE.parent))

import numpy as np  # noqa: E402
import pyarrow as pa  # noqa: E402
import pyarrow.csv  # noqa: E402
import pyarrow.parquet as pq  # noqa: E402

from scenario import manoeuvres as do  # noqa: E402
from scenario.air import Array  # noqa: E402
from scenario.airframes import FENWICK  # noqa: E402
from scenario.dialects import truth_from_flight  # noqa: E402
from scenario.flight import Flight, fly  # noqa: E402
from scenario.limits import excesses  # noqa: E402
from scenario.sensors import Sensor  # noqa: E402
from scenario.vocabulary import name_of, unit_of  # noqa: E402

RATE_HZ = 8.0

# the quantities that a limit may need, then what else such a recorder keeps
FLOWN = (
    "load_factor", "indicated_airspeed", "pressure_altitude", "bank_angle", "flap_angle", "roll_rate", "pitch_rate",
    "yaw_rate", "pitch_angle", "heading", "longitudinal_load_factor", "lateral_load_factor", "vertical_speed",
    "ground_speed", "track_angle", "angle_of_attack", "outside_air_temperature", "stall_warning", "fuel_flow",
    "fuel_mass", "engine_speed", "oil_temperature",
)  # fmt: skip
# name, mean, share of the engine speed, slow wander: plain engine and electrical readings that no limit asks for
OTHERS = (
    ("OIL PRESS [psi]", 52.0, 0.006, 1.0), ("MAP [inHg]", 14.0, 0.005, 0.1), ("EGT 1 [degC]", 420.0, 0.12, 4.0),
    ("EGT 2 [degC]", 415.0, 0.12, 4.0), ("CHT 1 [degC]", 140.0, 0.015, 2.0), ("CHT 2 [degC]", 138.0, 0.015, 2.0),
    ("BUS [V]", 27.8, 0.0, 0.05), ("AMP [A]", 12.0, 0.0, 0.6),
)  # fmt: skip


def benchmark_flight() -> Flight:
    """A tourer's flight that goes beyond a flap speed, V_NE and the load factor once or more each."""
    plan = [
        do.standing(15), do.taxi(40), do.take_off(10.0), do.climb(3500, 78, 800), do.level(60, 112, 3500),
        do.rough_air(120, 115, 3500, 1.2, [(40.0, 1.1, 8.0)]), do.turn_to(60, 110, 3500),
        do.dive(20, 124), do.pull(4.02, 0.8, 0.2, 0.8), do.recover(3300, 108, 40),
        do.steep_turn(50, 30, None, 3300, 108), do.recover(3300, 115, 20), do.descend(2200, 167, 2500),
        do.level(45, 110, 2200), do.turn_to(240, 108, 2200), do.configure(20.0), do.level(8, 106, 2200),
        do.descend(1300, 80, 600), do.approach(66, [(450, 35)]), do.landing(140), do.taxi(30, 330), do.standing(10),
    ]  # fmt: skip
    return fly(FENWICK, plan, mass=1036.0, fuel=86.0, seed=77)


def columns(flight: Flight, rows: int) -> dict[str, Array]:
    """The table: elapsed time, the flown channels tiled with fresh noise, and the other readings."""
    sensors = {"load_factor": Sensor(position=FENWICK.accelerometer)}
    one = truth_from_flight(flight, list(FLOWN), RATE_HZ, sensors=sensors)
    rng = np.random.default_rng(31)
    tiles = -(-rows // one.count)
    out: dict[str, Array] = {"TIME [s]": np.round(np.arange(rows) / RATE_HZ, 3)}
    for quantity, values in one.channels.items():
        unit = unit_of(quantity, "trade")
        label = f"{name_of(quantity, 'trade')} [{unit.label}]" if unit.label else name_of(quantity, "trade")
        written = np.tile((values - unit.offset) / unit.scale, tiles)[:rows]
        decimals = unit.decimals
        if quantity not in ("stall_warning", "flap_angle", "engine_speed"):
            decimals += 1  # real recorders write more digits than they know
            written = written + 0.3 * 10.0**-unit.decimals * rng.standard_normal(rows)
        if quantity == "load_factor":
            written = written + 0.005 * rng.standard_normal(rows)
        if quantity in ("indicated_airspeed", "ground_speed", "fuel_flow", "fuel_mass"):
            written = np.maximum(written, 0.0)
        out[label] = np.round(written, decimals) + 0.0  # no minus zero
    speed = np.tile(one.channels["engine_speed"], tiles)[:rows]
    for name, mean, share, wander in OTHERS:
        slow = np.repeat(rng.standard_normal(rows // 64 + 1), 64)[:rows]
        out[name] = np.round(mean + share * speed / 10.0 + wander * (slow + 0.3 * rng.standard_normal(rows)), 2)
    return out


def make(folder: Path, rows: int = 2_000_000, kind: str = "both") -> dict[str, Any]:
    """Write the log and return what is true of it (also in big.json)."""
    flight = benchmark_flight()
    table = pa.table(columns(flight, rows))
    folder.mkdir(parents=True, exist_ok=True)
    if kind in ("csv", "both"):
        pyarrow.csv.write_csv(table, folder / "big.csv", pyarrow.csv.WriteOptions(quoting_style="needed"))
    if kind in ("parquet", "both"):
        pq.write_table(table, folder / "big.parquet", row_group_size=262_144)
    count = int(np.floor(flight.time[-1] * RATE_HZ + 1e-9)) + 1
    found = excesses(flight)
    whole = rows // count
    truth = {
        "rows": rows, "columns": table.num_columns, "rate_hz": RATE_HZ, "rows_in_a_flight": count,
        "registration": "ZZ-NMC", "whole_flights": whole,
        "events_in_a_flight": [{"family": one.family, "peak": round(one.peak, 3), "limit": one.limit,
                                "start_s": round(one.start_s, 3), "end_s": round(one.end_s, 3)} for one in found],
        "events_in_whole_flights": whole * len(found),
    }  # fmt: skip
    (folder / "big.json").write_text(json.dumps(truth, indent=1) + "\n")
    return truth


def main() -> None:
    """From the command line."""
    if len(sys.argv) < 2:
        sys.exit(__doc__)
    rows = int(sys.argv[2]) if len(sys.argv) > 2 else 2_000_000
    kind = sys.argv[3] if len(sys.argv) > 3 else "both"
    print(json.dumps(make(Path(sys.argv[1]), rows, kind), indent=1))


if __name__ == "__main__":
    main()
