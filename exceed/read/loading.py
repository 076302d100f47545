"""A surveyed log -> a Recording: read what is wanted, settle what is open, make one axis, look at the quality."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Any

from exceed.core.quantities import QUANTITIES
from exceed.core.recording import Clock, Recording, Rejected, Unresolved, frozen
from exceed.read import arrays, probe, settle
from exceed.read.container import fail
from exceed.read.evidence import Settled
from exceed.read.instants import Instants, instants
from exceed.read.look import Column, Survey
from exceed.read.parse import Parsed, Reader
from exceed.read.raw import raw_channels

# quantities that settle what other columns leave open, cheap to read along when something is open
WITNESSES = (
    "pressure_altitude",
    "vertical_speed",
    "bank_angle",
    "pitch_angle",
    "heading",
    "track_angle",
    "indicated_airspeed",
    "calibrated_airspeed",
    "true_airspeed",
    "ground_speed",
    "mach",
    "static_pressure",
    "static_air_temperature",
    "pitch_rate",
    "latitude",
    "longitude",
    "load_factor",
    "weight_on_wheels",
    "roll_rate",
    "yaw_rate",
    "turn_rate",
    "impact_pressure",
)


def load(
    survey: Survey,
    wanted: set[str] | frozenset[str] | None = None,
    *,
    ranges: Mapping[str, tuple[float, float]] | None = None,
) -> Recording:
    """Read the columns of the wanted quantities.

    Parameters
    ----------
    survey : what `survey` gave
    wanted : names of quantities, None for all that were recognised
    ranges : quantity -> (low, high) of the sensor in SI, where the aircraft file states it

    Raises
    ------
    LogError : the log holds no clock, no row with a time, or cannot be read as its first block promised.
    """
    if survey.clock.kind == "none":
        raise fail(
            survey.path,
            survey.clock.problem,
            expected="a column of time, or a counter and its rate",
            do="name the clock in a channels file: clock: {column: NAME, kind: elapsed, unit: s}",
        )
    chosen, witnesses = choose(survey, wanted)
    known: dict[int, Settled] | None = None
    if witnesses and probe.worth_it(survey):
        known = probe.probe(survey, [*chosen, *witnesses])
    if known is None:
        chosen = sorted([*chosen, *witnesses], key=lambda column: column.index)
    parsed = _parse(survey, chosen)
    count = parsed.rows
    if count == 0:
        raise fail(survey.path, "holds no rows of data", do="check that the export is complete")
    raws, notes, rejected_cells = raw_channels(survey, chosen, parsed)
    time = instants(survey, parsed, raws)
    parsed.columns.clear()
    arrays.give_back(parsed.rows)
    settled = settle.settle(survey, raws, time, known)
    return _recording(survey, wanted, parsed, settled, time, [*notes], rejected_cells, ranges or {})


def choose(survey: Survey, wanted: set[str] | frozenset[str] | None) -> tuple[list[Column], list[Column]]:
    """(columns of the wanted quantities, witnesses to read along where something is open)."""
    usable = [c for c in survey.columns if c.quantity and not c.problem and not c.ignored and c.part < 0]
    usable = [c for c in usable if c.index not in survey.clock.columns]
    if wanted is None:
        return usable, []
    first = [c for c in usable if c.quantity in wanted or set(c.alternatives) & wanted]
    if any(settle.needs_witness(c) for c in first):
        return first, [c for c in usable if c not in first and c.quantity in WITNESSES]
    return first, []


def _parse(survey: Survey, chosen: list[Column]) -> Parsed:
    if survey.source.parquet:
        from exceed.read.parquet import read_columns

        return read_columns(survey, chosen)
    return parse_text(survey, chosen)


def parse_text(survey: Survey, chosen: list[Column], data: bytes | None = None) -> Parsed:
    """The columns of a text log, or of some lines of it."""
    assert survey.layout is not None
    types: dict[int, str] = {}
    for column in chosen:
        for place in (column.index, *column.group):
            types[place] = _type_of(survey, column)
    clock = survey.clock
    for place, role in zip(clock.columns, clock.roles, strict=False):
        if role in ("number", "frame", "hour", "minute", "second", "year", "month", "day"):
            lettered = any(
                letter.isalpha() for cell in survey.columns[place].sample[:3] for letter in cell if letter not in "eE"
            )
            types[place] = "text" if lettered or (survey.layout.grouping and role in ("number", "frame")) else "number"
        elif role in ("full", "time"):
            types[place] = clock.typed if clock.typed != "number" else "text"
        else:
            types[place] = "word"
    if clock.anchor is not None:
        types.setdefault(clock.anchor, "text")
    if not types:
        # only the rows are counted
        types[0] = "text"
    return Reader(survey.source, survey.layout, tuple(getattr(survey.channels, "missing", None) or ()), data).read(
        types
    )


def _type_of(survey: Survey, column: Column) -> str:
    assert survey.layout is not None
    quantity = QUANTITIES.get(column.quantity or "")
    if quantity is not None and quantity.discrete and column.form != "number":
        return "word"
    if (
        survey.layout.grouping
        or column.form == "mixed"
        or (
            column.unit_text
            and any(ch.isalpha() for ch in "".join(column.sample[:3]))
            and not any("e" in c.lower() or "n" in c.lower() for c in column.sample[:3])
        )
    ):
        return "text"
    if survey.layout.decimal == "," and survey.layout.delimiter == ",":
        return "text"
    return "number"


def _recording(
    survey: Survey,
    wanted: set[str] | frozenset[str] | None,
    parsed: Parsed,
    settled: list[Settled],
    time: Instants,
    notes: list[str],
    cells: list[tuple[Column, Any, list[str], str]],
    ranges: Mapping[str, tuple[float, float]],
) -> Recording:
    result = settle.finish(survey, settled, wanted, time, ranges, cells)
    unresolved = [
        Unresolved(c.name, c.problem, c.question) for c in survey.columns if c.problem and c.question and not c.ignored
    ]
    unresolved += result.unresolved
    said = {row.column for row in unresolved}
    clock_columns = {*survey.clock.columns} | ({survey.clock.anchor} if survey.clock.anchor is not None else set())
    used = set(result.used)
    unused = []
    for column in survey.columns:
        if column.index in clock_columns or column.index in used or column.name in said:
            continue
        if (
            column.quantity
            and not column.problem
            and not column.ignored
            and (wanted is not None and column.quantity not in wanted)
        ):
            continue
        unused.append(column.name)
    status = "partial" if parsed.cut else "ok"
    all_notes = [*survey.notes, *notes, *time.notes, *result.notes, *parsed.cut]
    if survey.layout is not None:
        all_notes += _uneven(parsed)
    sha256, content_sha256 = parsed.digests()
    rejected: list[Rejected] = [*time.rejected, *result.rejected]
    return Recording(
        path=survey.path,
        time=frozen(time.time),
        channels=MappingProxyType(result.channels),
        clock=Clock(time.kind, time.start, time.resets, time.zone, tuple(time.clock_notes)),
        rows=parsed.rows,
        sha256=sha256,
        content_sha256=content_sha256,
        facts=MappingProxyType(dict(survey.facts)),
        registration=survey.registration or result.registration,
        recorder_serial=survey.recorder_serial,
        seams=time.seams,
        unused=tuple(unused),
        unresolved=tuple(unresolved),
        rejected=tuple(rejected),
        faulty=tuple(settle.faulty(survey, time)),
        notes=tuple(dict.fromkeys(note for note in all_notes if note)),
        status=status,
    )


def _uneven(parsed: Parsed) -> list[str]:
    if not parsed.uneven_count:
        return []
    first = parsed.uneven[0][:60] if parsed.uneven else ""
    many = parsed.uneven_count != 1
    return [
        f"{parsed.uneven_count} line{'s' * many} with another number of cells than the headings "
        f"{'are' if many else 'is'} left out "
        f"(the first: {first!r})"
    ]
