"""Parquet of any writer: schema, metadata and a few spread rows tell what a text log's first block tells."""

from __future__ import annotations

import json
import os
from collections.abc import Sequence
from typing import Any

import numpy as np

from exceed.read.container import Digest, Source, fail, is_uri, raw
from exceed.read.look import Column, Survey
from exceed.read.parse import Parsed
from exceed.read.recognise import columns_of
from exceed.read.table import MOST_COLUMNS, registration_in, serial_in

SAMPLE_ROWS = 200
SAMPLE_GROUPS = 4
_UNIT_KEYS = ("unit", "units", "uom", "unit_of_measure", "unitofmeasure")


def _open(source: Source) -> Any:
    import pyarrow as pa
    import pyarrow.parquet as pq

    try:
        if is_uri(source.location):
            return pq.ParquetFile(raw(source.location, source.shown))
        # bytes: a name that is no UTF-8 has no text that arrow would take
        return pq.ParquetFile(pa.memory_map(os.fsencode(source.location)))
    except (pa.ArrowException, OSError, ValueError, NotImplementedError) as error:
        text = " ".join(str(error).split())[:160]
        raise fail(
            source.shown,
            f"is no whole Parquet file: {text}",
            expected="a Parquet file with its footer",
            do="copy the log from the recorder again",
        ) from error


def survey_parquet(source: Source, channels: object | None, declared: dict[str, str]) -> Survey:
    """Look at schema, metadata and sample rows."""
    from exceed.read.surveying import assemble

    file = _open(source)
    schema = file.schema_arrow
    if len(schema) == 0 or file.metadata.num_rows == 0:
        raise fail(source.shown, "holds no rows", expected="a table of recorded samples", do="check the export")
    if len(schema) > MOST_COLUMNS:
        raise fail(
            source.shown, f"has {len(schema)} columns", expected=f"at most {MOST_COLUMNS}", do="export fewer channels"
        )
    nested = [not _flat(field.type) for field in schema]
    cells = _cells(
        source, file, [field.name for field, deep in zip(schema, nested, strict=True) if not deep], schema, nested
    )
    units = [_unit(field) for field in schema]
    columns = columns_of([field.name for field in schema], units, [""] * len(schema), cells, declared)
    columns = [_typed(column, schema.field(k), nested[k]) for k, column in enumerate(columns)]
    facts = tuple(_facts(schema, file))
    return assemble(
        source,
        None,
        columns,
        cells,
        facts,
        registration_in(facts),
        serial_in(facts),
        channels,
        declared,
        ".",
        (),
        rows=file.metadata.num_rows,
    )


def _flat(kind: Any) -> bool:
    import pyarrow as pa

    if pa.types.is_dictionary(kind):
        kind = kind.value_type
    return not (
        pa.types.is_nested(kind)
        or pa.types.is_binary(kind)
        or pa.types.is_large_binary(kind)
        or pa.types.is_fixed_size_binary(kind)
    )


def _typed(column: Column, field: Any, deep: bool) -> Column:
    import pyarrow as pa

    kind = field.type
    if deep:
        return column.with_(
            quantity=None,
            problem=f"nested or binary ({kind}): not read",
            question="",
            form="mixed",
            field_type=str(kind),
        )
    if pa.types.is_boolean(kind):
        column = column.with_(form="number")
    if pa.types.is_timestamp(kind) or pa.types.is_time(kind) or pa.types.is_date(kind):
        column = column.with_(form="stamp", quantity=None)
    return column.with_(field_type=str(kind))


def _cells(source: Source, file: Any, names: Sequence[str], schema: Any, nested: Sequence[bool]) -> list[list[str]]:
    """Sample cells as text, from the first rows and the first rows of spread row groups."""
    import pyarrow as pa

    out: list[list[str]] = [[] for _ in schema]
    count = file.num_row_groups
    places = sorted({round(k * (count - 1) / max(1, SAMPLE_GROUPS - 1)) for k in range(SAMPLE_GROUPS)}) if count else []
    try:
        for place in places:
            batch = next(file.iter_batches(batch_size=SAMPLE_ROWS, row_groups=[place], columns=list(names)), None)
            if batch is None:
                continue
            for k, field in enumerate(schema):
                if not nested[k] and field.name in batch.schema.names:
                    out[k] += [_text(value) for value in _plain(batch.column(batch.schema.get_field_index(field.name)))]
    except (pa.ArrowException, OSError, NotImplementedError) as error:
        text = " ".join(str(error).split())[:160]
        raise fail(source.shown, f"is damaged: {text}", do="copy the log from the recorder again") from error
    return out


def _plain(column: Any) -> list[Any]:
    import pyarrow as pa

    if pa.types.is_timestamp(column.type) or pa.types.is_time(column.type) or pa.types.is_duration(column.type):
        # nanoseconds do not fit Python's own times: let arrow write them
        if pa.types.is_duration(column.type):
            return column.cast(pa.int64()).to_pylist()  # type: ignore[no-any-return]
        naive = column.cast(pa.timestamp(column.type.unit)) if pa.types.is_timestamp(column.type) else column
        texts = naive.cast(pa.string()).to_pylist()
        zoned = pa.types.is_timestamp(column.type) and column.type.tz is not None
        return [text + "Z" if zoned and text is not None else text for text in texts]
    if pa.types.is_date32(column.type):
        # Python's dates end with the year 9999
        return [None if day is None else str(np.datetime64(day, "D")) for day in column.cast(pa.int32()).to_pylist()]
    if pa.types.is_date64(column.type):
        return [None if ms is None else str(np.datetime64(ms, "ms")) for ms in column.cast(pa.int64()).to_pylist()]
    return column.to_pylist()  # type: ignore[no-any-return]


def _text(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return "1" if value else "0"
    if isinstance(value, float):
        return "" if value != value else repr(value)
    return str(value)


def _unit(field: Any) -> str:
    for key, value in (field.metadata or {}).items():
        if key.decode("utf-8", "replace").lower() in _UNIT_KEYS:
            return str(value.decode("utf-8", "replace"))
    return ""


def _facts(schema: Any, file: Any) -> list[tuple[str, str]]:
    """Key-value metadata that is plain text; a writer's own bookkeeping is none."""
    found: list[tuple[str, str]] = []
    merged = {**(file.metadata.metadata or {}), **(schema.metadata or {})}
    for key, value in merged.items():
        name = key.decode("utf-8", "replace")
        if name in ("ARROW:schema", "pandas", "org.apache.spark.sql.parquet.row.metadata"):
            continue
        text = value.decode("utf-8", "replace")
        if text.startswith("{"):
            try:
                inner = json.loads(text)
            except ValueError:
                continue
            found += [(str(k), str(v)) for k, v in inner.items() if isinstance(v, str | int | float)]
        elif len(text) < 500:
            found.append((name, text))
    return found


def read_columns(survey: Survey, chosen: Sequence[Column]) -> Parsed:
    """The wanted columns, and the digest beside."""
    import pyarrow as pa

    places = {place for column in chosen for place in (column.group or (column.index,))}
    places |= set(survey.clock.columns)
    if survey.clock.anchor is not None:
        places.add(survey.clock.anchor)
    file = _open(survey.source)
    digest = None if is_uri(survey.source.location) else Digest(survey.source.location)
    names = {place: survey.columns[place].name for place in places}
    if len(set(names.values())) < len(names):
        raise fail(
            survey.path, "has two columns of one name", expected="columns with names of their own", do="rename them"
        )
    try:
        table = file.read(columns=list(names.values()), use_threads=True)
    except (pa.ArrowException, OSError, NotImplementedError) as error:
        text = " ".join(str(error).split())[:160]
        raise fail(survey.path, f"is damaged: {text}", do="copy the log from the recorder again") from error
    columns = {}
    for place, name in names.items():
        column = table.column(name)
        if pa.types.is_duration(column.type):
            column = column.cast(pa.int64())
        elif pa.types.is_dictionary(column.type) and not pa.types.is_string(column.type.value_type):
            column = column.cast(column.type.value_type)
        columns[place] = column
    rows = table.num_rows
    del table
    if digest is not None:
        return Parsed(columns, rows, "", "", digest=digest)
    both = _digest(survey.source)
    return Parsed(columns, rows, both, both)


def _digest(source: Source) -> str:
    import hashlib

    digest = hashlib.sha256()
    with raw(source.location, source.shown) as stream:
        while piece := stream.read(1 << 20):
            digest.update(piece)
    return digest.hexdigest()
