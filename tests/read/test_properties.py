"""What must not matter does not: order of columns, unknown columns, units, row or text form, splitting into Parquet."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path
from tempfile import TemporaryDirectory

import numpy as np
import pyarrow as pa
import pyarrow.csv as arrow_csv
import pyarrow.parquet as pq
from hypothesis import given, settings
from hypothesis import strategies as st
from read.made import DEG, FT, G0, KT, of_flight, si, written

from exceed.core.recording import Recording
from exceed.read import read_log

COLUMNS = {
    "NZ [g]": si("load_factor"),
    "IAS [kt]": si("indicated_airspeed") / KT,
    "PALT [ft]": si("pressure_altitude") / FT,
    "ROLL [deg]": si("bank_angle") / DEG,
    "HDG [deg]": si("heading") / DEG,
    "VS [ft/min]": si("vertical_speed") / FT * 60,
}
OTHER_UNITS = {
    "NZ [g]": ("NZ [m/s2]", G0),
    "IAS [kt]": ("IAS [km/h]", 1.852),
    "PALT [ft]": ("PALT [m]", FT),
    "ROLL [deg]": ("ROLL [rad]", DEG),
    "HDG [deg]": ("HDG [rad]", DEG),
    "VS [ft/min]": ("VS [m/s]", FT / 60),
}
SOURCES = {
    "NZ [g]": "load_factor",
    "IAS [kt]": "indicated_airspeed",
    "PALT [ft]": "pressure_altitude",
    "ROLL [deg]": "bank_angle",
    "HDG [deg]": "heading",
    "VS [ft/min]": "vertical_speed",
}


def read(columns: dict[str, np.ndarray], **more: object) -> Recording:
    with TemporaryDirectory() as folder:
        return read_log(written(Path(folder), of_flight(columns)), **more)  # type: ignore[arg-type]


@lru_cache(maxsize=1)
def plain() -> Recording:
    return read(COLUMNS)


def same(recording: Recording, tolerance: float = 0.0) -> None:
    assert set(recording.channels) == set(plain().channels)
    assert np.array_equal(recording.time, plain().time)
    for name, channel in recording.channels.items():
        assert np.allclose(channel.values, plain().channels[name].values, rtol=0, atol=tolerance), name


@given(order=st.permutations(list(COLUMNS)))
@settings(max_examples=8, deadline=None)
def test_order_of_columns(order: list[str]) -> None:
    same(read({name: COLUMNS[name] for name in order}))


@given(
    name=st.text(st.characters(exclude_characters='",\r\n\0', exclude_categories=("Cs",)), min_size=3, max_size=12),
    place=st.integers(0, 6),
)
@settings(max_examples=12, deadline=None)
def test_an_unknown_column_changes_nothing(name: str, place: int) -> None:
    from exceed.read.names import clock_name, meanings
    from exceed.read.units_in_text import split_unit

    if any(meanings(part)[0] or clock_name(part) for part in (name, split_unit(name)[0])):
        return
    items = list(COLUMNS.items())
    items.insert(place, (f"zz{name}", np.arange(len(si("load_factor"))) % 17))
    recording = read(dict(items))
    same(recording)


@given(changed=st.sets(st.sampled_from(sorted(COLUMNS))))
@settings(max_examples=10, deadline=None)
def test_units(changed: set[str]) -> None:
    columns = {}
    for name, values in COLUMNS.items():
        other, factor = OTHER_UNITS[name]
        columns[other if name in changed else name] = values * (factor if name in changed else 1.0)
    recording = read(columns)
    # six figures are written
    same(recording, tolerance=5e-3)
    for name in changed:
        assert recording.channels[SOURCES[name]].unit == OTHER_UNITS[name][0].split("[")[1][:-1]


@given(wanted=st.sets(st.sampled_from(sorted(SOURCES.values())), min_size=1))
@settings(max_examples=10, deadline=None)
def test_a_part_is_read_as_in_the_whole(wanted: set[str]) -> None:
    recording = read(COLUMNS, wanted=wanted)
    assert set(recording.channels) == wanted
    for name in wanted:
        whole, part = plain().channels[name], recording.channels[name]
        assert np.array_equal(whole.values, part.values)
        assert (whole.unit, whole.sign, whole.datum) == (part.unit, part.sign, part.datum)


def test_parquet_and_csv_are_the_same(tmp_path: Path) -> None:
    path = written(tmp_path, of_flight(COLUMNS))
    pq.write_table(arrow_csv.read_csv(path), tmp_path / "log.parquet", row_group_size=700)
    same(read_log(tmp_path / "log.parquet"))


def test_windows_of_a_large_log_settle_what_the_whole_would(tmp_path: Path, monkeypatch: object) -> None:
    from exceed.read import probe

    text = of_flight({"NZ": -G0 * si("load_factor"), **{k: v for k, v in COLUMNS.items() if k != "NZ [g]"}})
    path = written(tmp_path, text)
    whole = read_log(path, wanted={"load_factor", "bank_angle"})
    monkeypatch.setattr(probe, "LARGE", 1000)  # type: ignore[attr-defined]
    monkeypatch.setattr(probe, "WINDOW", 4096)  # type: ignore[attr-defined]
    parts = read_log(path, wanted={"load_factor", "bank_angle"})
    for name in ("load_factor", "bank_angle"):
        a, b = whole.channels[name], parts.channels[name]
        assert np.array_equal(a.values, b.values)
        assert (a.unit, a.sign, a.datum, a.scale, a.offset) == (b.unit, b.sign, b.datum, b.scale, b.offset)


def test_pandas_index_columns_do_not_disturb(tmp_path: Path) -> None:
    table = pa.table(
        {"time_s": np.arange(400) / 8, "nz_g": 1 + 0.1 * np.sin(np.arange(400)), "__index_level_0__": np.arange(400)}
    )
    pq.write_table(table, tmp_path / "a.parquet")
    recording = read_log(tmp_path / "a.parquet")
    assert set(recording.channels) == {"load_factor"}
    assert np.allclose(recording.time, np.arange(400) / 8)
