"""Markers for pydantic that take what a document has and give checked values.

A key's type is `Annotated[what it becomes, marker]`; a marker also describes itself in the JSON Schema.
"""

from __future__ import annotations

import datetime
import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler
from pydantic_core import CoreSchema, core_schema

from exceed.core.units import AIRSPEED_UNITS, AIRSPEED_WORDS, units_of
from exceed.documents import values
from exceed.documents.faults import Faults, an, choose, collect, fault, kind_of, raise_any
from exceed.documents.values import Value, ValueFault

NUMBER_PATTERN = r"[+-]?([0-9]+(\.[0-9]*)?|\.[0-9]+)([eE][+-]?[0-9]+)?"


class Marker:
    """Base: `read` takes what the document has and gives the value; `schema` says the same for editors."""

    def read(self, value: Any) -> Any:
        raise NotImplementedError

    def schema(self) -> dict[str, Any]:
        raise NotImplementedError

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(self, schema: CoreSchema, handler: GetJsonSchemaHandler) -> dict[str, Any]:
        return self.schema()


@dataclass(frozen=True)
class Number(Marker):
    """A value with its unit; `sign` is '' for any, 'positive' or 'not negative'."""

    kinds: tuple[str, ...] = ()
    bare: bool = False
    difference: bool = False
    airspeed: str = "allowed"
    sign: str = ""
    at_most: float | None = None

    def read(self, value: Any) -> Value:
        try:
            found = values.parse(
                value, self.kinds or None, bare=self.bare, difference=self.difference, airspeed=self.airspeed
            )
        except ValueFault as error:
            raise fault(error.problem, error.expected, error.do) from None
        what = self.kinds[0] if self.kinds else "value"
        if (self.sign == "positive" and found <= 0.0) or (self.sign == "not negative" and found < 0.0):
            least = "above zero" if self.sign == "positive" else "zero or above"
            raise fault(f"'{found}' is no possible {what} here", f"{an(what)} {least}", "check the figure")
        if self.at_most is not None and found > self.at_most:
            raise fault(f"'{found}' is no possible {what} here", f"at most {self.at_most:g}", "check the figure")
        return found

    def schema(self) -> dict[str, Any]:
        expected = values.expected_of(self.kinds, bare=self.bare, airspeed=self.airspeed == "required")
        names = [name for kind in self.kinds for name in units_of(kind) if name != "1"]
        if self.airspeed == "required":
            names = []
        if "speed" in self.kinds and self.airspeed != "refused":
            names += AIRSPEED_UNITS
            names += [f"{unit} {word}" for unit in values.AIRSPEED_SPEED_UNITS for word in AIRSPEED_WORDS]
        units = "|".join(re.escape(name) for name in names)
        tail = rf"\s*({units})" if names else r"\s*\S.*"
        pattern = f"^\\s*{NUMBER_PATTERN}{f'({tail})?' if self.bare else tail}\\s*$"
        text = {"type": "string", "pattern": pattern, "description": expected}
        return {"anyOf": [text, {"type": "number"}], "description": expected} if self.bare else text


@dataclass(frozen=True)
class Choice(Marker):
    """One of a few words."""

    words: tuple[str, ...]
    what: str = "one of the words known here"

    def read(self, value: Any) -> str:
        if not isinstance(value, str):
            raise fault(
                f"{kind_of(value)} stands where a word is due",
                f"one of {', '.join(sorted(self.words))}",
                "write one of these",
            )
        word = " ".join(value.split())
        if word not in self.words:
            choose(word, self.words, self.what)
        return word

    def schema(self) -> dict[str, Any]:
        return {"type": "string", "enum": list(self.words)}


@dataclass(frozen=True)
class Text(Marker):
    """Free text, not empty."""

    what: str = "text"

    def read(self, value: Any) -> str:
        if not isinstance(value, str):
            raise fault(
                f"{kind_of(value)} stands where {self.what} is due", self.what, "write it as text; quote it if in doubt"
            )
        if not value.strip():
            raise fault(f"empty text stands where {self.what} is due", self.what, "write it, or leave the key out")
        return value.strip()

    def schema(self) -> dict[str, Any]:
        # a careless 17 or 2031-05-02 is text to us, so an editor shall not object
        return {"type": ["string", "number"]}


@dataclass(frozen=True)
class Id(Marker):
    """A short name that other places point at."""

    what: str = "an id"

    def read(self, value: Any) -> str:
        if not isinstance(value, str) or not re.fullmatch(r"[A-Za-z0-9][A-Za-z0-9_.-]{0,79}", value.strip()):
            raise fault(
                f"{kind_of(value)} is not {self.what}",
                "letters, digits, '-', '_' and '.', as in 'load-factor-high'",
                "write a name of this form",
            )
        return value.strip()

    def schema(self) -> dict[str, Any]:
        return {"type": "string", "pattern": "^[A-Za-z0-9][A-Za-z0-9_.-]{0,79}$"}


@dataclass(frozen=True)
class Whole(Marker):
    """A whole number."""

    least: int = 0

    def read(self, value: Any) -> int:
        text = str(value).strip() if isinstance(value, str | int) and not isinstance(value, bool) else ""
        if not re.fullmatch(r"\d{1,9}", text) or int(text) < self.least:
            raise fault(
                f"{kind_of(value)} is not a whole number of {self.least} or more",
                f"a whole number, at least {self.least}",
                "write digits only",
            )
        return int(text)

    def schema(self) -> dict[str, Any]:
        return {"type": "integer", "minimum": self.least}


@dataclass(frozen=True)
class YesNo(Marker):
    def read(self, value: Any) -> bool:
        if isinstance(value, bool):
            return value
        if isinstance(value, str) and value.strip().lower() in ("true", "yes"):
            return True
        if isinstance(value, str) and value.strip().lower() in ("false", "no"):
            return False
        raise fault(f"{kind_of(value)} is neither true nor false", "true or false", "write 'true' or 'false'")

    def schema(self) -> dict[str, Any]:
        return {"type": "boolean"}


@dataclass(frozen=True)
class Day(Marker):
    def read(self, value: Any) -> datetime.date:
        if isinstance(value, datetime.date):
            return value
        try:
            if isinstance(value, str) and re.fullmatch(r"\d{4}-\d{2}-\d{2}", value.strip()):
                return datetime.date.fromisoformat(value.strip())
        except ValueError:
            pass
        raise fault(
            f"{kind_of(value)} is not a date", 'year-month-day in quotes, as in "2031-01-10"', "write it in this form"
        )

    def schema(self) -> dict[str, Any]:
        return {"type": "string", "pattern": r"^\d{4}-\d{2}-\d{2}$"}


@dataclass(frozen=True)
class Moment(Marker):
    """An instant in UTC; a zone other than Z is taken into account."""

    def read(self, value: Any) -> datetime.datetime:
        if isinstance(value, datetime.datetime) and value.tzinfo is not None:
            return value.astimezone(datetime.UTC)
        form = r"\d{4}-\d{2}-\d{2}[T ]\d{2}:\d{2}(:\d{2}(\.\d{1,6})?)?(Z|[+-]\d{2}:?\d{2})"
        try:
            if isinstance(value, str) and re.fullmatch(form, value.strip()):
                return datetime.datetime.fromisoformat(value.strip()).astimezone(datetime.UTC)
        except (ValueError, OverflowError):
            pass
        raise fault(
            f"{kind_of(value)} is not a time with its zone",
            'date and time in quotes, as in "2031-05-02T09:14Z"',
            "write it in this form; 'Z' means UTC",
        )

    def schema(self) -> dict[str, Any]:
        return {
            "type": "string",
            "pattern": r"^\d{4}-\d{2}-\d{2}[T ]\d{2}:\d{2}(:\d{2}(\.\d{1,6})?)?(Z|[+-]\d{2}:?\d{2})$",
        }


@dataclass(frozen=True)
class Tuple(Marker):
    """A list of fixed length, each place with its own marker."""

    parts: tuple[Marker, ...]
    what: str

    def read(self, value: Any) -> tuple[Any, ...]:
        if not isinstance(value, list | tuple):
            raise fault(f"{kind_of(value)} stands where {self.what} is due", self.what, "write it in brackets")
        if len(value) != len(self.parts):
            raise fault(
                f"{len(value)} values stand where {self.what} is due",
                self.what,
                f"write {len(self.parts)} values in brackets",
            )
        found = Faults()
        made = []
        for index, (part, item) in enumerate(zip(self.parts, value, strict=True)):
            made.append(collect(found, (index,), part.read, item))
        raise_any(found)
        return tuple(made)

    def schema(self) -> dict[str, Any]:
        return {
            "type": "array",
            "prefixItems": [part.schema() for part in self.parts],
            "minItems": len(self.parts),
            "maxItems": len(self.parts),
            "description": self.what,
        }


@dataclass(frozen=True)
class Many(Marker):
    """A list of any length (at least `least`) of one marker."""

    part: Marker
    what: str
    least: int = 1

    def read(self, value: Any) -> tuple[Any, ...]:
        if not isinstance(value, list | tuple):
            raise fault(f"{kind_of(value)} stands where {self.what} is due", self.what, "write a list")
        if len(value) < self.least:
            raise fault(
                f"{self.what} needs at least {self.least} of them, {len(value)} given", self.what, "add to the list"
            )
        found = Faults()
        made = [collect(found, (index,), self.part.read, item) for index, item in enumerate(value)]
        raise_any(found)
        return tuple(made)

    def schema(self) -> dict[str, Any]:
        return {"type": "array", "items": self.part.schema(), "minItems": self.least, "description": self.what}


@dataclass(frozen=True)
class Ready(Marker):
    """A value that the model's `prepare` has read already; here only its schema is left to say."""

    written: Callable[[], dict[str, Any]]

    def read(self, value: Any) -> Any:
        return value

    def schema(self) -> dict[str, Any]:
        return self.written()
