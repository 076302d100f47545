"""What is in a log, as plain facts, and a channels file to edit with the open questions in it."""

from __future__ import annotations

from dataclasses import dataclass

from exceed.core.quantities import QUANTITIES
from exceed.core.recording import Channel, Recording
from exceed.documents.reading import NOT_TEXT
from exceed.read.look import Survey


@dataclass(frozen=True, slots=True)
class ColumnFacts:
    """One column of the log: what it is taken for, or why it is not."""

    column: str
    quantity: str | None
    unit: str
    rate_hz: float | None
    found_by: str
    reason: str
    question: str
    sign: str | None = None
    datum: str | None = None
    resolution: float | None = None
    noise: float | None = None
    valid_share: float | None = None
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class LogFacts:
    """A log's container, shape, clock and columns."""

    path: str
    packed: str
    encoding: str
    delimiter: str
    decimal: str
    skipped_lines: int
    rows: int
    clock: str
    clock_columns: tuple[str, ...]
    start: float | None
    duration_s: float
    columns: tuple[ColumnFacts, ...]
    facts: tuple[tuple[str, str], ...]
    notes: tuple[str, ...]


def describe(survey: Survey, recording: Recording) -> LogFacts:
    """Facts of a log, one row a column in the log's order."""
    by_column = _channels_by_index(survey, recording)
    open_columns = {row.column: row for row in recording.unresolved}
    clock = {*survey.clock.columns} | ({survey.clock.anchor} if survey.clock.anchor is not None else set())
    rows = []
    for column in survey.columns:
        if column.index in clock:
            continue
        channel = by_column.get(column.index)
        if channel is not None:
            rate = 1.0 / channel.interval if channel.interval > 0 else None
            rows.append(
                ColumnFacts(
                    column.name,
                    channel.quantity,
                    channel.unit,
                    rate,
                    channel.found_by,
                    channel.reason,
                    "",
                    channel.sign,
                    channel.datum,
                    channel.resolution,
                    channel.noise,
                    channel.valid_share,
                    channel.notes,
                )
            )
        elif column.part >= 0:
            rows.append(
                ColumnFacts(
                    column.name,
                    survey.columns[column.part].quantity,
                    "",
                    None,
                    "name",
                    "a sub-frame of the column before",
                    "",
                )
            )
        else:
            said = open_columns.get(column.name)
            reason = said.reason if said else column.problem or "not read"
            rows.append(
                ColumnFacts(
                    column.name, None, column.unit_text, None, "", reason, said.question if said else column.question
                )
            )
    layout = survey.layout
    return LogFacts(
        survey.path,
        "parquet" if survey.source.parquet else survey.source.packed or "plain",
        survey.source.encoding,
        layout.delimiter if layout else "",
        layout.decimal if layout else "",
        layout.skip if layout else 0,
        recording.rows,
        recording.clock.kind,
        tuple(survey.columns[place].name for place in survey.clock.columns),
        recording.clock.start,
        recording.duration,
        tuple(rows),
        survey.facts,
        (*recording.clock.notes, *recording.notes),
    )


def _channels_by_index(survey: Survey, recording: Recording) -> dict[int, Channel]:
    names = {channel.column.rsplit(" (+", 1)[0]: channel for channel in recording.channels.values()}
    return {
        column.index: names[column.name]
        for column in survey.columns
        if column.name in names
        and (names[column.name].quantity == column.quantity or column.quantity is None or column.alternatives)
    }


def _quoted(text: str) -> str:
    """A YAML double-quoted scalar: what a heading may hold must not break the file."""
    out = ['"']
    for letter in text:
        if letter in '"\\':
            out.append("\\" + letter)
        elif letter == "\t":
            out.append("\\t")
        elif ord(letter) < 32 or 0x7F <= ord(letter) < 0xA0:
            out.append(f"\\x{ord(letter):02x}")
        elif NOT_TEXT.search(letter):
            out.append(f"\\u{ord(letter):04x}")
        else:
            out.append(letter)
    return "".join(out) + '"'


def _comment(text: str) -> str:
    """Text that is safe behind a #."""
    return " ".join("".join(letter if letter.isprintable() else " " for letter in text).split())


def channels_file(survey: Survey, recording: Recording) -> str:
    """The text of a channels file for this recorder: what was found is written out, what is open is a comment."""
    lines = [
        f"# What was found in {_comment(recording.path)}. Keep what is right, correct what is not; what you "
        f"delete is recognised as usual.",
        "format: exceed-channels/1",
        "",
        *_clock_lines(survey, recording),
        "",
    ]
    by_column = _channels_by_index(survey, recording)
    known: list[str] = []
    barred: list[str] = []
    for column in survey.columns:
        channel = by_column.get(column.index)
        if channel is not None and NOT_TEXT.search(column.name):
            barred.append(f"# {_comment(column.name)}: {channel.quantity}")
            continue
        # sub-frame columns are one channel of several columns: the file has no word for that, and recognition
        # finds them
        if channel is None or column.group:
            continue
        parts = [f"column: {_quoted(column.name)}", f"quantity: {channel.quantity}"]
        row = QUANTITIES.get(channel.quantity)
        if channel.unit and channel.unit not in ("state", "1") and not (row is not None and row.discrete):
            parts.append(f"unit: {_unit(channel.unit)}")
        if channel.sign and _has_sense(channel.quantity, channel.sign):
            parts.append(f"positive: {channel.sign}")
        if channel.datum:
            parts.append(f"datum: {channel.datum}")
        known.append(f"  - {{{', '.join(parts)}}}" + (f"   # {_comment(channel.reason)}" if channel.reason else ""))
    if known:
        lines += ["channels:", *known]
    if barred:
        lines += ["", "# Recognised as usual: a name with a control character cannot stand in this file.", *barred]
    asked = [row for row in recording.unresolved if row.question]
    if asked:
        lines += ["", "# Open: answer the question, take the # away and move the line under 'channels'."]
        if not known:
            lines.append("# channels:")
        for question in asked:
            lines += [
                f"# {_comment(question.column)}: {_comment(question.reason)}. {_comment(question.question)}",
                f"#  - {{column: {_quoted(question.column)}, quantity: {_guess(survey, question.column)}, unit: ...}}",
            ]
    lost = [row for row in recording.unresolved if not row.question]
    if lost:
        lines += ["", "# Not used:"] + [f"# {_comment(row.column)}: {_comment(row.reason)}" for row in lost]
    if recording.unused:
        lines += [
            "",
            "# Not understood; name them above if a rule needs them, or ignore them:",
            "# ignore: [" + ", ".join(_quoted(name) for name in recording.unused) + "]",
        ]
    lines += [
        "",
        '# missing: ["---"]              # further cells that mean: no value',
        "# faulty:",
        '#  - {column: "NAME", from: 120 s, to: 180 s, reason: "why"}',
    ]
    return "\n".join(lines) + "\n"


def _clock_lines(survey: Survey, recording: Recording) -> list[str]:
    plan = survey.clock
    names = [survey.columns[place].name for place in plan.columns]
    notes = [f"# {_comment(note)}" for note in recording.clock.notes]
    if not names or plan.kind == "time_of_day" or any(map(NOT_TEXT.search, names)):
        return [*notes, "# clock: {column: NAME, kind: elapsed, unit: s}"]
    if plan.kind == "date_time":
        zone = "UTC" if recording.clock.zone.startswith("UTC") else recording.clock.zone
        text = f"columns: [{', '.join(_quoted(name) for name in names)}], kind: date_time"
        return [*notes, "clock: {" + text + (f", zone: {_quoted(zone)}" if zone and len(names) < 3 else "") + "}"]
    text = f"column: {_quoted(names[0])}, kind: {plan.kind}"
    if plan.kind in ("elapsed", "epoch"):
        unit = {1.0: "s", 1e-3: "ms", 1e-6: "us", 1e-9: "ns", 60.0: "min", 3600.0: "h"}.get(plan.unit, "s")
        text += f", unit: {unit}"
    elif plan.kind == "frame":
        text += f", interval: {plan.unit:.9g} s"
    if plan.anchor is not None:
        # a second column of stamps gives the date: the file can name only one clock, so it is left to recognition
        return [*notes, "# clock: {" + text + "}"]
    return [*notes, "clock: {" + text + "}"]


def _unit(unit: str) -> str:
    return '"%"' if unit == "%" else unit


def _has_sense(quantity: str, sign: str) -> bool:
    senses = {
        "load_factor": ("up", "down"),
        "longitudinal_load_factor": ("forward", "aft"),
        "lateral_load_factor": ("right", "left"),
        "bank_angle": ("right", "left"),
        "pitch_angle": ("up", "down"),
        "roll_rate": ("right", "left"),
        "pitch_rate": ("up", "down"),
        "yaw_rate": ("right", "left"),
        "turn_rate": ("right", "left"),
        "vertical_speed": ("up", "down"),
    }
    return sign in senses.get(quantity, ())


def _guess(survey: Survey, name: str) -> str:
    column = survey.column(name)
    return (column.quantity if column is not None else None) or "..."
