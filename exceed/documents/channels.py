"""A recorder's column names, units and signs, `exceed-channels/1`: what the user settles, the rest is recognised.

`load_channels(path or text) -> Channels`. Attributes: clock (.columns .kind .zone .offset .unit .interval) or None,
channels: rows .column .quantity .unit .positive .datum .accuracy, ignore, missing, faulty: rows .column .start .end
.reason (start and end are a datetime in UTC, or a Value in s from the log's first sample, or None), path, sha256.
"""

from __future__ import annotations

import datetime
import re
from pathlib import Path
from typing import Annotated, Any, ClassVar, Literal

from pydantic import Field, model_validator

from exceed.core.quantities import QUANTITIES
from exceed.core.units import AIRSPEED_UNITS, UNITS, nearest_unit, units_of
from exceed.documents.build import build, open_document
from exceed.documents.fields import (
    Choice,
    Faults,
    LongDuration,
    Marker,
    Model,
    Moment,
    Number,
    Text,
    Words,
    an,
    fault,
    kind_of,
    raise_any,
)
from exceed.documents.source import Document
from exceed.documents.values import Value, parse

CLOCK_KINDS = ("elapsed", "epoch", "iso", "date_time", "frame")
SIDES = ("up", "down", "forward", "aft", "right", "left")

_UP, _FORWARD, _RIGHT = ("up", "down"), ("forward", "aft"), ("right", "left")
# which words fit which quantity; the first is the sense in which our own values are positive
AXES: dict[str, tuple[str, str]] = {
    "load_factor": _UP,
    "longitudinal_load_factor": _FORWARD,
    "lateral_load_factor": _RIGHT,
    "bank_angle": _RIGHT,
    "pitch_angle": _UP,
    "roll_rate": _RIGHT,
    "pitch_rate": _UP,
    "yaw_rate": _RIGHT,
    "turn_rate": _RIGHT,
    "angle_of_attack": _UP,
    "sideslip_angle": _RIGHT,
    "vertical_speed": _UP,
    "flap_angle": ("down", "up"),
}
_LOAD_FACTORS = ("load_factor", "longitudinal_load_factor", "lateral_load_factor")
_ZONE = re.compile(r"(UTC|Z|[+-]\d{2}:\d{2}|[A-Za-z_]+(/[A-Za-z0-9_+-]+)+)$")


class TextsMark(Marker):
    """A list of texts, in which numbers are texts as well; one text alone is a list of one."""

    def read(self, value: Any) -> tuple[str, ...]:
        given = [value] if isinstance(value, str) else value
        if not isinstance(given, list | tuple):
            raise fault(
                f"{kind_of(value)} stands where a list is due", "a list of texts", "write the items in brackets"
            )
        found = Faults()
        made = []
        for index, item in enumerate(given):
            if not isinstance(item, str):
                found.note((index,), f"{kind_of(item)} stands where text is due", "text", "quote it")
            else:
                made.append(item)
        raise_any(found)
        return tuple(made)

    def schema(self) -> dict[str, Any]:
        text = {"type": ["string", "number"]}
        return {"anyOf": [text, {"type": "array", "items": text}]}


class UnitMark(Marker):
    """A unit of the table, or a unit that says which airspeed."""

    def read(self, value: Any) -> str:
        if isinstance(value, str) and (value.strip() in UNITS or value.strip() in AIRSPEED_UNITS):
            return value.strip()
        near = nearest_unit(value) if isinstance(value, str) else None
        if isinstance(value, str):
            try:
                parse(f"1 {value}")
            except Exception as error:
                do = getattr(error, "do", "")
                near = None if do else near
                raise fault(
                    f"unit {kind_of(value)} is not known",
                    f"one of {', '.join(sorted(UNITS))}",
                    do or "use one of these",
                ) from None
        raise fault(
            f"{kind_of(value)} stands where a unit is due",
            f"one of {', '.join(sorted(UNITS))}",
            "write the unit as text",
        )

    def schema(self) -> dict[str, Any]:
        return {"enum": [*sorted(UNITS), *sorted(AIRSPEED_UNITS), 1]}


class ZoneMark(Marker):
    """UTC, an offset as +02:00, or a zone name as Europe/Paris."""

    def read(self, value: Any) -> str:
        if isinstance(value, str) and _ZONE.match(value.strip()) and _known_zone(value.strip()):
            return value.strip()
        raise fault(
            f"{kind_of(value)} is not a time zone",
            "UTC, an offset as '+02:00', or a name as 'Europe/Paris'",
            "write one of these forms",
        )

    def schema(self) -> dict[str, Any]:
        return {"type": "string", "pattern": r"^(UTC|Z|[+-]\d{2}:\d{2}|[A-Za-z_]+(/[A-Za-z0-9_+-]+)+)$"}


def _known_zone(text: str) -> bool:
    if text in ("UTC", "Z"):
        return True
    if text[0] in "+-":
        return int(text[1:3]) <= 14 and int(text[4:6]) < 60
    from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

    try:
        ZoneInfo(text)
    except (ZoneInfoNotFoundError, ValueError, OSError):
        return False
    return True


def time_zone(text: str) -> datetime.tzinfo:
    """The zone that a checked zone text means."""
    if text in ("UTC", "Z"):
        return datetime.UTC
    if text[0] in "+-":
        step = datetime.timedelta(hours=int(text[1:3]), minutes=int(text[4:6]))
        return datetime.timezone(step if text[0] == "+" else -step)
    from zoneinfo import ZoneInfo

    return ZoneInfo(text)


class MomentOrElapsed(Marker):
    """A time with its zone, or a duration from the log's first sample."""

    def read(self, value: Any) -> datetime.datetime | Value:
        if isinstance(value, str) and re.match(r"\s*[+-]?\d+(\.\d*)?\s*[a-z]+\s*$", value):
            return Number(("time",), sign="not negative").read(value)
        return Moment().read(value)

    def schema(self) -> dict[str, Any]:
        return {"anyOf": [Moment().schema(), Number(("time",)).schema()]}


class Clock(Model):
    """Which columns give the time, and how."""

    WHAT: ClassVar[str] = "the clock"
    columns: Annotated[tuple[str, ...], TextsMark()] = Field(
        default=(), description="columns that together give the time"
    )
    column: Annotated[str, Text("a column's name")] | None = Field(
        default=None, description="the one column that gives the time"
    )
    kind: Annotated[
        Literal["elapsed", "epoch", "iso", "date_time", "frame"], Choice(CLOCK_KINDS, "a kind of clock")
    ] = Field(description="elapsed, epoch, iso, date_time or frame")
    zone: Annotated[str, ZoneMark()] | None = Field(default=None, description="zone of the written times")
    offset: Annotated[Value, Number(("time",))] = Field(
        default=Value(0.0, "time", "s", "0 s"), description="added to every time"
    )
    unit: Annotated[str, Choice(units_of("time"), "a unit of time")] | None = Field(
        default=None, description="unit of elapsed or epoch"
    )
    interval: LongDuration | None = Field(default=None, description="for a frame counter: time of one frame")

    @classmethod
    def prepare(cls, value: Any) -> Any:
        """`column: t` is `columns: [t]`."""
        if isinstance(value, dict) and isinstance(value.get("column"), str) and "columns" not in value:
            return {**value, "columns": [value["column"]]}
        return value

    @model_validator(mode="after")
    def _fits(self) -> Clock:
        found = Faults()
        if self.column is not None and self.columns != (self.column,):
            found.note(("column",), "both 'column' and 'columns' are given", "one of them", "remove one")
        if not self.columns:
            found.note((), "no column is named", "'column' or 'columns'", "name the column")
        if len(self.columns) > (3 if self.kind == "date_time" else 1):
            most = "at most three columns" if self.kind == "date_time" else "one column"
            found.note(
                ("columns",), f"{len(self.columns)} columns are too many for the kind {self.kind}", most, "name fewer"
            )
        if self.kind in ("iso", "date_time", "frame") and self.unit is not None:
            found.note(
                ("unit",),
                f"a clock of the kind {self.kind} has no unit",
                "'unit' only for elapsed or epoch",
                "remove it",
            )
        if self.kind in ("elapsed", "frame") and self.zone is not None:
            found.note(
                ("zone",),
                f"a clock of the kind {self.kind} has no zone",
                "'zone' for iso, date_time or epoch",
                "remove it",
            )
        if self.kind != "frame" and self.interval is not None:
            found.note(("interval",), "only a frame counter has an interval", "'kind: frame'", "remove it")
        raise_any(found)
        return self


class Channel(Model):
    """One column: what it is."""

    WHAT: ClassVar[str] = "a channel"
    column: Annotated[str, Text("a column's name")] = Field(description="heading of the column as the log has it")
    quantity: Words = Field(description="a quantity of the trace table, or any further name")
    unit: Annotated[str, UnitMark()] | None = Field(default=None, description="unit of the cells")
    positive: Annotated[str, Choice(SIDES, "a side")] | None = Field(
        default=None, description="sense in which the cells are positive"
    )
    datum: Annotated[Literal["total", "increment"], Choice(("total", "increment"), "a datum")] | None = Field(
        default=None, description="load factor 1 (total) or 0 (increment) in level flight"
    )
    accuracy: Annotated[Value, Number(bare=True, difference=True, sign="positive", airspeed="refused")] | None = Field(
        default=None, description="half-width of a 95 % interval"
    )

    @model_validator(mode="after")
    def _fits(self) -> Channel:
        found = Faults()
        row = QUANTITIES.get(
            re.sub(r"(_\d+){1,2}$", "", self.quantity) if self.quantity not in QUANTITIES else self.quantity
        )
        if not re.fullmatch(r"[a-z][a-z0-9_]*", self.quantity):
            found.note(
                ("quantity",),
                f"'{self.quantity}' is no name for a quantity",
                "lower-case letters, digits and '_'",
                "rename it",
            )
        unit_kind = (
            UNITS[AIRSPEED_UNITS[self.unit][0] if self.unit in AIRSPEED_UNITS else self.unit].kind
            if self.unit
            else None
        )
        kind = row.kind if row is not None else unit_kind
        if (
            row is not None
            and unit_kind is not None
            and unit_kind != row.kind
            and not (row.kind == "ratio" and unit_kind == "state")
        ):
            found.note(
                ("unit",),
                f"'{self.unit}' is a unit of {unit_kind} and {self.quantity} is {an(row.kind)}",
                f"one of {', '.join(units_of(row.kind))}",
                "check quantity and unit",
            )
        if self.unit in AIRSPEED_UNITS and row is not None and AIRSPEED_UNITS[self.unit][1] != row.name:
            found.note(
                ("unit",),
                f"'{self.unit}' is {AIRSPEED_UNITS[self.unit][1].replace('_', ' ')} and not {self.quantity}",
                "the unit of the quantity, as in 'kt'",
                "check quantity and unit",
            )
        words = AXES.get(row.name if row is not None else "")
        if self.positive is not None and words is None:
            found.note(
                ("positive",),
                f"{self.quantity} has no sense to choose",
                "'positive' only where there are two senses",
                "remove it",
            )
        elif self.positive is not None and words is not None and self.positive not in words:
            found.note(
                ("positive",),
                f"'{self.positive}' does not fit {self.quantity}",
                f"one of {', '.join(sorted(words))}",
                "use one of these",
            )
        if self.datum is not None and self.quantity not in _LOAD_FACTORS:
            found.note(
                ("datum",), f"{self.quantity} has no datum to choose", "'datum' only for load factors", "remove it"
            )
        if self.accuracy is not None and kind is not None and self.accuracy.kind != kind:
            found.note(
                ("accuracy",),
                f"'{self.accuracy}' is {an(self.accuracy.kind)} and {self.quantity} is {an(kind)}",
                f"one of {', '.join(units_of(kind))}",
                "give a value of that kind",
            )
        raise_any(found)
        return self

    @property
    def sign(self) -> int | None:
        """+1 or -1: the factor to our own positive sense; None where the file does not say."""
        words = AXES.get(self.quantity)
        return None if self.positive is None or words is None else 1 if self.positive == words[0] else -1


class Faulty(Model):
    """A time in which a column says nothing; omitted ends are those of the recording."""

    WHAT: ClassVar[str] = "a faulty stretch"
    column: Annotated[str, Text("a column's name")] = Field(description="heading of the column")
    start: Annotated[datetime.datetime | Value, MomentOrElapsed()] | None = Field(
        default=None, alias="from", description="time or time since first sample"
    )
    end: Annotated[datetime.datetime | Value, MomentOrElapsed()] | None = Field(
        default=None, alias="to", description="likewise"
    )
    reason: Words | None = Field(default=None, description="said in every output")

    @model_validator(mode="after")
    def _ordered(self) -> Faulty:
        start, end = self.start, self.end
        if start is not None and end is not None:
            if isinstance(start, Value) != isinstance(end, Value):
                raise_any(
                    [
                        (
                            ("to",),
                            "one end is a time of day and the other is counted from the first sample",
                            "both of one kind",
                            "use one kind",
                        )
                    ]
                )
            if not start < end:  # type: ignore[operator]
                raise_any([(("to",), "the end is not after the start", "'to' after 'from'", "swap them")])
        return self


class Channels(Model):
    """What a channels file settles; all of it may be omitted."""

    HIDDEN: ClassVar[tuple[str, ...]] = ("path", "sha256")
    WHAT: ClassVar[str] = "a channels file"
    format: Annotated[str, Choice(("exceed-channels/1",), "the format")] = Field(
        default="exceed-channels/1", description="first key of the file"
    )
    clock: Clock | None = Field(default=None, description="omitted: recognised")
    channels: tuple[Channel, ...] = Field(default=(), description="columns that the file settles")
    ignore: Annotated[tuple[str, ...], TextsMark()] = Field(default=(), description="columns to leave out")
    missing: Annotated[tuple[str, ...], TextsMark()] = Field(default=(), description="cells that mean: no value")
    faulty: tuple[Faulty, ...] = Field(default=(), description="stretches that are not to be believed")
    path: str = ""
    sha256: str = ""

    @model_validator(mode="after")
    def _once(self) -> Channels:
        found = Faults()
        columns: dict[str, int] = {}
        quantities: dict[str, int] = {}
        for index, row in enumerate(self.channels):
            for seen, what, key in ((columns, "column", row.column), (quantities, "quantity", row.quantity)):
                if key in seen:
                    found.note(
                        ("channels", index, what),
                        f"{what} '{key}' is there twice, first as channel {seen[key] + 1}",
                        f"each {what} once",
                        "remove one, or add an index as in 'engine_speed_2'" if what == "quantity" else "remove one",
                    )
                seen.setdefault(key, index)
        for index, name in enumerate(self.ignore):
            if name in columns or (self.clock is not None and name in self.clock.columns):
                found.note(
                    ("ignore", index),
                    f"column '{name}' is both used and ignored",
                    "one of the two",
                    "remove it here or there",
                )
        raise_any(found)
        return self


def load_channels(origin: Path | str | Document, name: str | None = None) -> Channels:
    """Read and check a channels file, or text with line breaks. Raises DocumentError with all its problems."""
    document = open_document(origin, name)
    return build(Channels, document, "channels").model_copy(update={"path": document.name, "sha256": document.sha256})


__all__ = ["AXES", "CLOCK_KINDS", "Channel", "Channels", "Clock", "Faulty", "load_channels", "time_zone"]
