"""The Parquet habits: kinds of time column, zones, numbers as float, decimal or text, row groups, units in metadata."""

from __future__ import annotations

from decimal import Decimal
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq

from scenario.dialects import Habit, Truth, Written, start_of
from scenario.vocabulary import STATE_WORDS, name_of, spelled, suffix, unit_of


def write_parquet(truth: Truth, path: Path, habit: Habit) -> Written:
    """Write a truth as one Parquet file; slower channels are null between their values if the habit says `blanks`."""
    rows = np.arange(truth.count)
    keep = np.ones(truth.count, dtype=bool)
    for begin, finish in truth.gaps:
        keep &= ~((truth.time >= begin) & (truth.time < finish))
    rows = rows[keep]
    fields, arrays = [], []
    start = start_of(truth, habit)
    if habit.parquet == "elapsed":
        name = "time" if habit.unit_metadata else "time_s"
        fields.append(pa.field(name, pa.float64(), metadata={"unit": "s"} if habit.unit_metadata else None))
        arrays.append(pa.array(rows / truth.rate_hz))
    else:
        per_second = {"s": 1, "ms": 10**3, "us": 10**6, "ns": 10**9}[habit.parquet]
        whole = int(np.floor(start))
        parts = np.round((start - whole + rows / truth.rate_hz) * per_second)
        if habit.parquet == "s":
            parts = np.floor(start - whole + rows / truth.rate_hz)
        ticks = whole * per_second + parts.astype(np.int64)
        kind = pa.timestamp(habit.parquet, tz=habit.zone or None)
        fields.append(pa.field("UTC" if habit.vocabulary in ("trade", "upper") else "utc", kind))
        arrays.append(pa.array(ticks, type=pa.int64()).cast(kind))
    columns, units, rates = {}, {}, {}
    for quantity, values in truth.channels.items():
        unit = unit_of(quantity, habit.units)
        every = truth.every(quantity) if habit.rates in ("blanks", "held") else 1
        label = spelled(unit, habit.spelling)
        name = name_of(quantity, habit.vocabulary)
        if not habit.unit_metadata and unit.label and habit.header != "name":
            name = f"{name}_{suffix(unit)}" if habit.header == "suffix" else f"{name} [{label}]"
        told = {"unit": label} if habit.unit_metadata and unit.label else None
        written = np.round((values - unit.offset) / unit.scale, unit.decimals + 1)[rows]
        if habit.rates == "held":
            written = np.round((values - unit.offset) / unit.scale, unit.decimals + 1)[rows - rows % every]
        missing = ~np.isfinite(written)
        if habit.rates == "blanks":
            missing |= rows % every != 0
        array = _array(quantity, written, missing, habit, unit.decimals + 1)
        fields.append(pa.field(name, array.type, metadata=told))
        arrays.append(array)
        columns[quantity], units[quantity], rates[quantity] = [name], unit, truth.rate_hz / every
    facts = {"registration": truth.registration, "recorder_serial": truth.recorder_serial}
    schema = pa.schema(fields, metadata={k: v for k, v in facts.items() if v})
    table = pa.Table.from_arrays(arrays, schema=schema)
    pq.write_table(table, path, row_group_size=habit.row_group or None, compression="zstd")
    absolute = habit.parquet != "elapsed"
    return Written(path, habit, columns, units, rates, habit.unit_metadata or habit.header != "name", absolute,
                   start if absolute else None, len(rows), False)  # fmt: skip


def _array(quantity: str, values: np.ndarray, missing: np.ndarray, habit: Habit, places: int) -> pa.Array:
    if habit.states == "words" and quantity in STATE_WORDS:
        off, on = STATE_WORDS[quantity]
        words = [None if gone else (on if value > 0.5 else off) for value, gone in zip(values, missing, strict=True)]
        return pa.array(words, type=pa.string()).dictionary_encode()
    if habit.numbers == "float":
        return pa.array(values.astype(np.float32), mask=missing)
    if habit.numbers == "decimal":
        exact = [None if gone else Decimal(f"{value:.{places}f}") for value, gone in zip(values, missing, strict=True)]
        return pa.array(exact, type=pa.decimal128(18, places))
    if habit.numbers == "text":
        text = [None if gone else f"{value:.{places}f}" for value, gone in zip(values, missing, strict=True)]
        return pa.array(text, type=pa.string())
    return pa.array(values, mask=missing)
