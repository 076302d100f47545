"""The trace table: one row an instant of the recording's axis, block by block, in shown units. Writes no file."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from exceed.core.quantities import QUANTITIES, TRACE_ORDER, Quantity, declared
from exceed.core.recording import Array
from exceed.core.trace import Grid, Trace
from exceed.core.units import UNITS

BLOCK = 65_536
LEADING = ("time_s", "flight", "phase")


@dataclass(frozen=True, slots=True)
class Column:
    """One column of the trace table and where it comes from; `inputs` are names of columns of the log."""

    name: str
    quantity: str
    unit: str
    method: str
    inputs: tuple[str, ...]
    assumes: str | None
    source: str
    discrete: bool
    factor: float
    offset: float


@dataclass(frozen=True, slots=True, eq=False)
class Block:
    """Rows [start, stop) of the axis: time (k,) s, flight (k,) int64 with 0 for none, phase (k,) int8 codes of PHASES,
    and each column's values (k,) float64 in its unit, NaN for null."""

    start: int
    stop: int
    time: Array
    flight: NDArray[np.int64]
    phase: NDArray[np.int8]
    values: dict[str, Array]


def trace_columns(trace: Trace) -> list[Column]:
    """Columns after time_s, utc, flight and phase: quantities in their order, then declared ones."""
    names = [name for name in TRACE_ORDER if name in trace.steps]
    names += sorted(name for name in trace.steps if name not in QUANTITIES)
    return [_column(trace, name) for name in names]


def _column(trace: Trace, name: str) -> Column:
    step = trace.steps[name]
    row = QUANTITIES.get(name) or _declared(trace, name)
    unit = row.unit
    used = {trace.channels[leaf].column or leaf for leaf in trace.leaves([name])}
    return Column(
        row.column,
        name,
        row.shown,
        step.method,
        tuple(sorted(used)),
        step.assumes,
        step.source,
        row.discrete,
        unit.factor,
        unit.offset,
    )


def _declared(trace: Trace, name: str) -> Quantity:
    """A quantity of the channels file's own naming: shown in the unit its channel was written in."""
    unit = trace.channels[name].unit
    return declared(name, unit if unit in UNITS else "1")


def trace_blocks(trace: Trace, columns: list[Column] | None = None, size: int = BLOCK) -> Iterator[Block]:
    """The table's rows in blocks. columns : those wanted, None for all. Values do not depend on the size of a block."""
    columns = trace_columns(trace) if columns is None else columns
    names = [column.quantity for column in columns]
    time = trace.recording.time
    grid = Grid(None, time, trace.recording.interval, "")
    starts = np.array([flight.start for flight in trace.track.flights])
    ends = np.array([flight.end for flight in trace.track.flights])
    numbers = np.array([flight.number for flight in trace.track.flights], dtype=np.int64)
    for start in range(0, len(time), size):
        stop = min(start + size, len(time))
        when = time[start:stop]
        found = trace.evaluate(names, grid, start, stop)
        values = {}
        for column in columns:
            shown = found[column.quantity]
            if (column.factor, column.offset) != (1.0, 0.0):
                shown = (shown - column.offset) / column.factor if column.offset else shown / column.factor
            values[column.name] = shown
        flight = np.zeros(len(when), dtype=np.int64)
        if len(starts):
            place = np.searchsorted(starts, when, side="right") - 1
            inside = (place >= 0) & (when <= ends[np.maximum(place, 0)])
            flight = np.where(inside, numbers[np.maximum(place, 0)], 0)
        yield Block(start, stop, when, flight, trace.track.phases.at(when), values)


def methods_of(trace: Trace) -> list[dict[str, Any]]:
    """For the summary: each quantity's method, columns, assumption and own standard uncertainty in shown units."""
    rows = []
    for column in trace_columns(trace):
        step = trace.steps[column.quantity]
        own = step.uncertainty
        channel = trace.channels.get(column.quantity) if step.function is None else None
        if channel is not None and channel.standard_uncertainty:
            own = float(np.hypot(own, channel.standard_uncertainty))
        rows.append(
            {
                "quantity": column.quantity,
                "method": column.method,
                "inputs": list(column.inputs),
                "assumes": column.assumes,
                "standard_uncertainty": {"value": own / column.factor, "unit": column.unit} if own else None,
            }
        )
    return rows
