"""Parts of a rule that say how much: limits, levels, allowances, counts; read from their several written forms."""

from __future__ import annotations

from typing import Annotated, Any, ClassVar, Literal

from pydantic import Field, model_validator

from exceed.documents import facts
from exceed.documents.fields import (
    Any_,
    Choice,
    Duration,
    Faults,
    LongDuration,
    Many,
    Marker,
    Model,
    Number,
    Tuple,
    Whole,
    Words,
    collect,
    fault,
    kind_of,
    make,
    nearest,
    raise_any,
)
from exceed.documents.values import Value

SEVERITIES = ("advisory", "caution", "warning")
CERTAINTIES = ("doubtful", "possible", "likely", "established")
Severity = Annotated[Literal["advisory", "caution", "warning"], Choice(SEVERITIES, "a severity")]
Certainty = Annotated[
    Literal["doubtful", "possible", "likely", "established"], Choice(CERTAINTIES, "a word for certainty")
]

_ANY = Number(bare=True)
_ANY_DIFFERENCE = Number(bare=True, difference=True)
_SLOTS = "'6 g', 'aircraft.load_factor.maximum', {over: QUANTITY, points: [...]} or {quantity: QUANTITY, times: 1.2}"


class ConstantLimit(Model):
    """`limit: 6 g`"""

    WHAT: ClassVar[str] = "a value"
    value: Any_


class FactLimit(Model):
    """`limit: aircraft.NAME.NAME`; `fact` is the name with 'aircraft.' before it."""

    WHAT: ClassVar[str] = "an aircraft fact"
    fact: str


class TableLimit(Model):
    """`limit: {over: QUANTITY, points: [[x, y], ...], between: linear}`.

    Linear between the points, or `step`: each value holds from its x up to the next one. Beyond the ends the last value
    is held.
    """

    WHAT: ClassVar[str] = "a table over a quantity"
    over: Words = Field(description="the quantity the table is over")
    points: Annotated[
        tuple[tuple[Value, Value], ...],
        Many(Tuple((_ANY, _ANY), "a pair, as in '[1000 ft, 60 deg]'"), "a list of pairs", least=2),
    ] = Field(description="pairs of the quantity and the limit, ascending")
    between: Annotated[Literal["linear", "step"], Choice(("linear", "step"), "a way to go between points")] = Field(
        default="linear", description="linear, or step: each value holds from its x up to the next"
    )

    @model_validator(mode="after")
    def _ascending(self) -> TableLimit:
        found = Faults()
        for column, first in ((0, self.points[0][0]), (1, self.points[0][1])):
            for index, pair in enumerate(self.points):
                if pair[column].kind != first.kind or pair[column].airspeed != first.airspeed:
                    text = f"'{pair[column]}' is another kind of value than '{first}'"
                    found.note(("points", index, column), text, "one kind in each column", "give all in the same kind")
        if not found:
            for index in range(1, len(self.points)):
                before, here = self.points[index - 1][0], self.points[index][0]
                if not here > before:
                    text = f"'{here}' is not above '{before}' before it"
                    found.note(("points", index), text, "points in ascending order", "put them in order, each once")
        raise_any(found)
        return self


class RelativeLimit(Model):
    """`limit: {quantity: stall_speed, times: 1.2, plus: 5 kt}`: a derived quantity, sample by sample."""

    WHAT: ClassVar[str] = "a limit relative to a quantity"
    quantity: Words = Field(description="the quantity it goes with")
    times: Annotated[Value, Number(("ratio",), bare=True)] = Field(
        default=Value(1.0, "ratio", "1", "1"), description="factor"
    )
    plus: Annotated[Value, _ANY_DIFFERENCE] | None = Field(default=None, description="added after the factor")


Limit = ConstantLimit | FactLimit | TableLimit | RelativeLimit


class LimitMark(Marker):
    """Tells the four forms of a limit apart."""

    def read(self, value: Any) -> Limit:
        if isinstance(value, ConstantLimit | FactLimit | TableLimit | RelativeLimit):
            return value
        found = Faults()
        made: Limit | None = None
        if isinstance(value, dict):
            if "over" in value or "points" in value:
                made = make(found, (), TableLimit, value)
            elif "quantity" in value or "times" in value:
                made = make(found, (), RelativeLimit, value)
            else:
                raise fault("this mapping is no form of a limit", _SLOTS, "use one of these forms")
        elif isinstance(value, str) and value.strip().startswith("aircraft"):
            name = value.strip()
            if facts.kind_of_fact(name) is None:
                near = facts.nearest_fact(name)
                known = ", ".join(f"aircraft.{one}" for one in sorted([*facts.KNOWN, "limits.NAME"]))
                do = f"write '{near}' if that is meant" if near else "use one of these"
                raise fault(f"'{name}' is not a fact of an aeroplane", f"one of {known}", do)
            made = FactLimit(fact=name if name.startswith("aircraft.") else f"aircraft.{name}")
        elif isinstance(value, list | tuple):
            raise fault("a list stands where a limit is due", _SLOTS, "use one of these forms")
        else:
            number = collect(found, (), _ANY.read, value)
            made = None if found else ConstantLimit(value=number)
        raise_any(found)
        assert made is not None
        return made

    def schema(self) -> dict[str, Any]:
        fact = {
            "type": "string",
            "pattern": r"^aircraft\.[a-z_]+\.[A-Za-z0-9_.-]+$",
            "description": "a fact of the aeroplane",
        }
        pair = {"type": "array", "prefixItems": [_ANY.schema(), _ANY.schema()], "minItems": 2, "maxItems": 2}
        table = {
            "type": "object",
            "properties": {
                "over": {"type": "string", "description": "quantity the table is over"},
                "points": {"type": "array", "items": pair, "minItems": 2},
                "between": {"enum": ["linear", "step"]},
            },
            "required": ["over", "points"],
            "additionalProperties": False,
        }
        relative = {
            "type": "object",
            "properties": {
                "quantity": {"type": "string"},
                "times": Number(("ratio",), bare=True).schema(),
                "plus": _ANY.schema(),
            },
            "required": ["quantity"],
            "additionalProperties": False,
        }
        return {"anyOf": [_ANY.schema(), fact, table, relative], "description": f"one of {_SLOTS}"}


class LevelKey(Model):
    """One level as written: `at` (per cent of the limit, or absolute) or `beyond_by`, and its own `lasting`."""

    HIDDEN: ClassVar[tuple[str, ...]] = ("severity",)
    WHAT: ClassVar[str] = "a level"
    severity: str = "advisory"
    at: Any_ | None = Field(default=None, description="per cent of the limit, or an absolute value")
    beyond_by: Annotated[Value, _ANY_DIFFERENCE] | None = Field(default=None, description="so far beyond the limit")
    lasting: Duration | None = Field(default=None, description="least duration for this level; omitted: the rule's")

    @classmethod
    def shorthand(cls, value: Any) -> Any:
        return value if isinstance(value, dict) else {"at": value}

    @model_validator(mode="after")
    def _one(self) -> LevelKey:
        if (self.at is None) == (self.beyond_by is None):
            raise fault(
                "a level needs one of 'at' and 'beyond_by'",
                "'110 %', '6 g', {beyond_by: 10 kt} or {at: 105 %, lasting: 20 s}",
                "use one of these forms",
            )
        return self


def unknown_severity(found: Faults, name: str) -> None:
    near = nearest(name, SEVERITIES)
    do = f"write '{near}' if that is meant" if near else "use one of these"
    found.note((name,), f"key '{name}' is not a severity", f"one of {', '.join(sorted(SEVERITIES))}", do)


class LevelsMark(Marker):
    """`above` and `below`: a mapping of severities to levels, made into a tuple, least severe first."""

    def read(self, value: Any) -> tuple[LevelKey, ...]:
        if isinstance(value, tuple) and all(isinstance(one, LevelKey) for one in value):
            return value
        expected = "a mapping, as in '{caution: 100 %, warning: 110 %}'"
        if not isinstance(value, dict):
            raise fault(f"{kind_of(value)} stands where levels are due", expected, "name the severity of each level")
        if not value:
            raise fault("no level is given", expected, "add a level")
        found = Faults()
        made: list[LevelKey] = []
        for name, level in value.items():
            if name not in SEVERITIES:
                unknown_severity(found, name)
                continue
            key = make(found, (name,), LevelKey, level)
            if key is not None:
                made.append(key.model_copy(update={"severity": name}))
        raise_any(found)
        return tuple(sorted(made, key=lambda one: SEVERITIES.index(one.severity)))

    def schema(self) -> dict[str, Any]:
        long = {
            "type": "object",
            "properties": {"at": _ANY.schema(), "beyond_by": _ANY.schema(), "lasting": Number(("time",)).schema()},
            "additionalProperties": False,
        }
        level = {
            "anyOf": [_ANY.schema(), long],
            "description": "'110 %', '6 g', {beyond_by: 10 kt} or {at: 105 %, lasting: 20 s}",
        }
        return {
            "type": "object",
            "properties": dict.fromkeys(SEVERITIES, level),
            "additionalProperties": False,
            "minProperties": 1,
        }


class WithinMark(Marker):
    """`within`: 'event', 'flight', or a duration as sliding window."""

    def __init__(self, *words: str) -> None:
        self.words = words

    def read(self, value: Any) -> str | Value:
        if isinstance(value, str) and value.strip() in self.words:
            return value.strip()
        try:
            return Number(("time",), sign="positive").read(value)
        except Exception:
            expected = f"{', '.join(self.words)}, or a duration, as in '10 min'"
            raise fault(f"{kind_of(value)} is no span to count within", expected, "write one of these") from None

    def schema(self) -> dict[str, Any]:
        return {"anyOf": [{"enum": list(self.words)}, Number(("time",)).schema()]}


class Allowance(Model):
    """Time that is allowed above 100 % and up to `up_to`, accumulated within an event, a flight or a sliding window."""

    WHAT: ClassVar[str] = "an allowance"
    up_to: Any_ = Field(description="per cent of the limit, or an absolute value")
    for_time: LongDuration = Field(alias="for", description="how long in all")
    within: Annotated[str | Value, WithinMark("event", "flight")] = Field(
        default="event", description="event, flight, or a duration as sliding window"
    )


class Count(Model):
    """So many excursions make one event."""

    WHAT: ClassVar[str] = "a count"
    at_least: Annotated[int, Whole(1)] = Field(description="number of excursions")
    within: Annotated[str | Value, WithinMark("flight")] = Field(
        default="flight", description="flight, or a sliding window"
    )


class Total(Model):
    """Accumulated time makes one event."""

    WHAT: ClassVar[str] = "a total"
    above: LongDuration = Field(description="accumulated time from which it is an event")
    within: Annotated[str | Value, WithinMark("flight")] = Field(
        default="flight", description="flight, or a sliding window"
    )

    @model_validator(mode="after")
    def _fits(self) -> Total:
        if isinstance(self.within, Value) and self.above >= self.within:
            raise_any(
                [
                    (
                        ("above",),
                        f"'{self.above}' can never add up within '{self.within}'",
                        f"less than {self.within}",
                        "check both figures",
                    )
                ]
            )
        return self


class Inspection(Model):
    """What must be done when the rule finds an event at or above `from_severity` and `certainty`."""

    WHAT: ClassVar[str] = "an inspection"
    from_severity: Severity = Field(default="caution", alias="from", description="least severity that calls for it")
    certainty: Certainty = Field(default="possible", description="least certainty that calls for it")
    task: Words = Field(description="what to do, in words; the approved manual has the task itself")
    ata: Words | None = Field(default=None, description="ATA chapter, as in 05-50")
    before: Words | None = Field(default=None, description="by when, as in 'next flight'")
