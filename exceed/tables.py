"""The trace table (every quantity, sample by sample) to Parquet or CSV, block by block."""

from __future__ import annotations

import json
import os
import tempfile
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
import pyarrow as pa
import pyarrow.csv as pc
import pyarrow.parquet as pq

from exceed import __version__
from exceed.core.outcome import LogOutcome
from exceed.core.phases import PHASES
from exceed.core.trace import Trace
from exceed.derive.export import trace_blocks, trace_columns
from exceed.errors import OutputError, Problem
from exceed.report.write import check_target, problem_of

if TYPE_CHECKING:
    from collections.abc import Iterator

KINDS = (".parquet", ".csv")


def check_table(out: Path) -> None:
    """Raise OutputError where no table can be written to this name; to be asked before the log is read."""
    if out.suffix.lower() not in KINDS:
        raise OutputError(
            Problem(str(out), f"'{out.suffix}' is no kind of table", "a name that ends in .parquet or .csv",
                    "choose one of these")
        )  # fmt: skip
    check_target(out)


def write_trace(trace: Trace, outcome: LogOutcome, out: Path) -> tuple[int, int]:
    """Write the table whole or not at all. Returns (rows, columns). Raises OutputError."""
    check_table(out)
    schema = table_schema(trace, outcome)
    rows = 0
    temporary = None
    try:
        if out.is_dir():
            raise IsADirectoryError(21, "Is a directory")
        handle, temporary = tempfile.mkstemp(prefix=f".{out.name[:40]}.", suffix=".part", dir=out.parent)
        os.close(handle)
        writer = _writer(temporary, schema, out.suffix.lower())
        with writer:
            for batch in batches(trace, schema):
                writer.write_batch(batch)
                rows += batch.num_rows
        os.chmod(temporary, 0o644)
        os.replace(temporary, out)
        temporary = None
    except (OSError, pa.ArrowException) as error:
        failure = error if isinstance(error, OSError) else OSError(str(error))
        raise OutputError(problem_of(failure, str(out))) from error
    finally:
        if temporary is not None and os.path.exists(temporary):
            os.unlink(temporary)
    return rows, len(schema)


def _writer(path: str, schema: pa.Schema, suffix: str) -> Any:
    return pq.ParquetWriter(path, schema, compression="zstd") if suffix == ".parquet" else pc.CSVWriter(path, schema)


def table_schema(trace: Trace, outcome: LogOutcome) -> pa.Schema:
    """Columns with their unit, method and inputs in the metadata; version, digests and cautions in the table's."""
    fields = [pa.field("time_s", pa.float64(), metadata={"unit": "s"})]
    if trace.recording.clock.start is not None:
        fields.append(pa.field("utc", pa.timestamp("us", tz="UTC")))
    fields.append(pa.field("flight", pa.int32()))
    fields.append(pa.field("phase", pa.dictionary(pa.int8(), pa.string())))
    methods = {row.quantity: row for row in outcome.methods}
    for column in trace_columns(trace):
        row = methods.get(column.quantity)
        about = {"unit": column.unit, "method": column.method}
        if row is not None:
            about["inputs"] = ", ".join(row.inputs)
            about["assumes"] = row.assumes or ""
            about["source"] = row.source
        fields.append(pa.field(column.name, pa.float64(), metadata=about))
    from exceed.core.findings import CAUTIONS

    table = {
        "exceed": __version__,
        # a name that is no UTF-8 as escapes
        "log": outcome.path.encode("utf-8", "backslashreplace").decode(),
        "sha256": outcome.sha256 or "",
        "content_sha256": outcome.content_sha256 or "",
        "registration": outcome.registration or "",
        "missing": json.dumps(dict(trace.missing), sort_keys=True),
        "cautions": " ".join(CAUTIONS),
    }
    return pa.schema(fields, metadata=table)


def batches(trace: Trace, schema: pa.Schema) -> Iterator[pa.RecordBatch]:
    """The table in record batches, null where a value could not be had."""
    start = trace.recording.clock.start
    names = pa.array(PHASES)
    for block in trace_blocks(trace):
        arrays: list[pa.Array] = []
        for field in schema:
            if field.name == "utc":
                micro = np.round((block.time + (start or 0.0)) * 1e6).astype(np.int64)
                arrays.append(pa.array(micro, pa.timestamp("us", tz="UTC")))
            elif field.name == "time_s":
                arrays.append(pa.array(block.time))
            elif field.name == "flight":
                arrays.append(pa.array(block.flight, pa.int32(), mask=block.flight == 0))
            elif field.name == "phase":
                arrays.append(pa.DictionaryArray.from_arrays(pa.array(block.phase, pa.int8()), names))
            else:
                values = block.values[field.name]
                arrays.append(pa.array(values, pa.float64(), mask=~np.isfinite(values)))
        yield pa.RecordBatch.from_arrays(arrays, schema=schema)


def frame(trace: Trace, outcome: LogOutcome) -> Any:
    """The table as a pandas frame, for the Python API."""
    schema = table_schema(trace, outcome)
    return pa.Table.from_batches(batches(trace, schema), schema=schema).to_pandas()
