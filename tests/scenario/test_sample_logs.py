"""The sample logs are what the script makes, tell the stories they are meant to tell, and agree with their sheets."""

from __future__ import annotations

import gzip
import json
from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow.parquet as pq
import pytest
import yaml

from scenario import big_log, limits
from scenario.day import DAY, EMPTY, FUEL_DENSITY, SERIALS, Sortie, flown, recorded
from scenario.dialects import write
from scenario.make_sample_logs import readme, truth_of

HERE = Path(__file__).resolve().parent
LOGS = HERE.parents[1] / "sample_logs"
TYPES = {"ZZ-NMA": "larkspur", "ZZ-NMC": "fenwick", "ZZ-NMJ": "corran"}


@lru_cache(maxsize=1)
def truth() -> dict[str, Any]:
    return json.loads((HERE / "truth.json").read_text())  # type: ignore[no-any-return]


def expected(path: str, family: str) -> list[dict[str, Any]]:
    return [row for row in truth()["logs"][path]["expected"] if row["family"] == family]


@pytest.mark.parametrize("sortie", DAY, ids=lambda sortie: sortie.path)
def test_making_a_log_again_gives_the_same_content_and_truth(sortie: Sortie, tmp_path: Path) -> None:
    flight = flown(sortie)
    made = recorded(sortie, flight)
    path = tmp_path / Path(sortie.path).name
    written = write(made, path, sortie.habit)
    kept = LOGS / sortie.path
    if sortie.habit.parquet:
        assert pq.read_table(path).equals(pq.read_table(kept), check_metadata=True)
    elif sortie.habit.compression == "gz":  # compressors differ, what they hold may not
        assert gzip.decompress(path.read_bytes()) == gzip.decompress(kept.read_bytes())
    else:
        assert path.read_bytes() == kept.read_bytes()
    again = {**truth_of(sortie, flight, made), "rows": written.rows}
    assert json.loads(json.dumps(again)) == truth()["logs"][sortie.path]


def test_readme_is_the_one_the_truth_gives() -> None:
    assert (LOGS / "README.md").read_text() == readme(truth())


def test_the_day_has_at_least_eleven_logs_in_at_least_eight_habits() -> None:
    assert len(DAY) >= 11
    assert len({sortie.habit.id for sortie in DAY}) >= 8
    assert {str(path.relative_to(LOGS)) for path in LOGS.glob("zz-*/*")} == {sortie.path for sortie in DAY}
    assert sum((LOGS / sortie.path).stat().st_size for sortie in DAY) < 8e6


def test_every_sortie_lasts_ten_to_twenty_five_minutes() -> None:
    assert all(600 < facts["recorded_s"] < 1500 for facts in truth()["logs"].values())


@pytest.mark.parametrize(
    ("path", "family"),
    [
        ("zz-nma/nma-0902.csv", "positive load factor"),
        ("zz-nma/nma-1020.csv", "positive load factor"),
        ("zz-nma/nma-1145.csv", "positive load factor"),
        ("zz-nma/nma-1305.tsv", "positive load factor"),
        ("zz-nmc/nmc_20310502_1005.csv", "stall"),
        ("zz-nmc/nmc_20310502_1215.csv", "flap speed"),
        ("zz-nmc/nmc_descent.csv", "maximum speed"),
        ("zz-nmj/C30-008_0930.parquet", "maximum Mach number"),
    ],
)
def test_each_story_has_its_one_event_and_no_other(path: str, family: str) -> None:
    assert [row["family"] for row in truth()["logs"][path]["expected"]] == [family]


@pytest.mark.parametrize("path", ["zz-nma/nma-0810.txt", "zz-nmc/nmc_20310502_0840.csv.gz", "zz-nmj/C30-008_b.parquet"])
def test_the_quiet_the_gusty_and_the_hard_landing_flight_keep_the_airframe_limits(path: str) -> None:
    assert truth()["logs"][path]["expected"] == []


def test_the_hidden_peak_is_beyond_the_limit_and_every_sample_below() -> None:
    (row,) = expected("zz-nma/nma-1020.csv", "positive load factor")
    assert row["expect"] == "hidden"
    assert row["largest_sample"] < row["limit"] < row["true_peak"]
    assert row["limit"] - row["largest_sample"] < 0.1


def test_the_gap_cuts_the_event() -> None:
    (row,) = expected("zz-nma/nma-1305.tsv", "positive load factor")
    ((begin, finish),) = truth()["logs"]["zz-nma/nma-1305.tsv"]["gaps"]
    assert row["true_start_s"] < begin < row["true_end_s"] < finish


def test_the_hard_landing_is_hard() -> None:
    (touch,) = truth()["logs"]["zz-nmj/C30-008_b.parquet"]["touchdowns"]
    assert touch["sink_rate_ft_min"] > 500
    assert touch["peak_load_factor_g"] > touch["recorded_load_factor_g"] > 2.0


def test_the_stall_comes_at_the_stall_speed_after_a_warning() -> None:
    (row,) = expected("zz-nmc/nmc_20310502_1005.csv", "stall")
    assert row["calibrated_airspeed_kt"] == pytest.approx(row["stall_speed_kt"], abs=0.7)
    assert row["load_factor_g"] > 2.0
    assert min(begin for begin, _ in row["warning_s"]) < row["time_s"] - 0.3


@pytest.mark.parametrize("registration", sorted(TYPES))
def test_the_limits_of_the_truth_are_those_of_the_aircraft_file(registration: str) -> None:
    facts = yaml.safe_load((LOGS / "aircraft" / f"{TYPES[registration]}.yaml").read_text())
    assert facts["registration"] == registration

    def figure(text: object) -> float:
        return float(str(text).split()[0])

    rows = [
        (figure(row["flaps"]), figure(row["mass_up_to"]) if "mass_up_to" in row else None, figure(row["maximum"]),
         figure(row["minimum"])) for row in facts["load_factor"]
    ]  # fmt: skip
    assert rows == limits.LOAD_FACTOR[registration]
    flaps = [(figure(row["flaps"]), figure(row["maximum"])) for row in facts["speeds"]["flaps_extended"]]
    assert flaps == limits.FLAPS_EXTENDED[registration]
    most = facts["speeds"].get("never_exceed") or facts["speeds"]["maximum_operating"]
    points = [(figure(x), figure(y)) for x, y in most["points"]] if isinstance(most, dict) else [(0.0, figure(most))]
    assert points == limits.MAXIMUM_SPEED[registration]
    if registration in limits.MAXIMUM_MACH:
        assert figure(facts["mach"]["maximum_operating"]) == limits.MAXIMUM_MACH[registration]
        assert figure(facts["speeds"]["gear_extended"]) == limits.GEAR_EXTENDED[registration]
    assert figure(facts["mass"]["empty"]) == EMPTY[registration]
    assert figure(facts["loading"]["stations"]["main_fuel"]["density"]) == FUEL_DENSITY[registration]
    airframe = next(one.airframe for one in DAY if one.airframe.registration == registration)
    assert [(figure(row["flaps"]), figure(row["upright"])) for row in facts["stall_speed"]] == list(airframe.stall_kcas)
    table = [(figure(x), figure(y)) for x, y in facts["position_error"][0]["points"]]
    assert table == list(airframe.position_error)
    place = [figure(x) for x in facts["recorder"]["accelerometer"]["position"]]
    assert place == list(airframe.accelerometer)
    assert figure(facts["wing"]["area"]) == airframe.wing_area


def test_loading_sheets_lie_inside_the_envelope_and_belong_to_a_log() -> None:
    sheets = sorted((LOGS / "loading").glob("*.yaml"))
    assert len(sheets) == len(DAY) - 1
    for sheet in sheets:
        data = yaml.safe_load(sheet.read_text())
        facts = yaml.safe_load((LOGS / "aircraft" / f"{TYPES[data['registration']]}.yaml").read_text())["loading"]
        mass = EMPTY[data["registration"]]
        moment = mass * float(facts["empty_arm"].split()[0])
        for station, text in data["stations"].items():
            amount, unit = text.split()
            kilograms = float(amount) * (FUEL_DENSITY[data["registration"]] if unit == "L" else 1.0)
            mass += kilograms
            moment += kilograms * float(facts["stations"][station]["arm"].split()[0])
        table = np.array([[float(cell.split()[0]) for cell in row] for row in facts["envelope"]])
        forward, aft = (np.interp(mass, table[:, 0], table[:, column]) for column in (1, 2))
        assert table[0, 0] <= mass <= table[-1, 0], sheet.name
        assert forward <= moment / mass <= aft, sheet.name
        assert ("log" in data) != ("take_off" in data)
        if "log" in data:
            assert any(path.name == data["log"] for path in LOGS.glob("zz-*/*"))


def test_the_fleet_file_knows_every_recorder() -> None:
    fleet = yaml.safe_load((LOGS / "fleet.yaml").read_text())
    assert {row["registration"]: row["recorder_serial"] for row in fleet["aircraft"]} == SERIALS
    for row in fleet["aircraft"]:
        assert (LOGS / row["aircraft"]).is_file()


def test_the_benchmark_log_holds_its_events(tmp_path: Path) -> None:
    facts = big_log.make(tmp_path, rows=10_000)
    table = pq.read_table(tmp_path / "big.parquet")
    assert (table.num_rows, table.num_columns) == (10_000, 31)
    assert {row["family"] for row in facts["events_in_a_flight"]} == {
        "positive load factor", "maximum speed", "flap speed"
    }  # fmt: skip
    load = table["NZ [g]"].to_numpy()
    assert np.max(load) > 3.8
    (pull,) = (row for row in facts["events_in_a_flight"] if row["family"] == "positive load factor")
    beyond = np.flatnonzero(load > 3.8) / 8.0
    first_flight = beyond[beyond < facts["rows_in_a_flight"] / 8.0]
    assert first_flight.min() == pytest.approx(pull["start_s"], abs=0.2)
    assert first_flight.max() == pytest.approx(pull["end_s"], abs=0.2)
    assert (tmp_path / "big.csv").read_text().count("\n") == 10_001
