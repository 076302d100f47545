"""How the keys of our files are read: markers for pydantic that take text and give checked values.

A key's type is `Annotated[what it becomes, marker]`. A marker raises `fault(...)`, which carries problem, expected and
do; `documents.build` adds file, line and column. The same markers describe themselves in the JSON Schema.
"""

from __future__ import annotations

import datetime
import difflib
import re
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import Annotated, Any, ClassVar, NoReturn, TypeVar

from pydantic import (
    BaseModel,
    ConfigDict,
    GetCoreSchemaHandler,
    GetJsonSchemaHandler,
    ValidationError,
    ValidationInfo,
    model_validator,
)
from pydantic_core import CoreSchema, PydanticCustomError, core_schema

from exceed.core.units import AIRSPEED_UNITS, AIRSPEED_WORDS, units_of
from exceed.documents import values
from exceed.documents.values import Value, ValueFault

Path = tuple[str | int, ...]
Faults = list[tuple[Path, str, str, str]]

NUMBER_PATTERN = r"[+-]?([0-9]+(\.[0-9]*)?|\.[0-9]+)([eE][+-]?[0-9]+)?"


def fault(problem: str, expected: str = "", do: str = "") -> PydanticCustomError:
    """The error of one value."""
    return faults([((), problem, expected, do)])


def faults(found: Faults) -> PydanticCustomError:
    """Several errors at once, each at a path below the value that is being read."""
    return PydanticCustomError("exceed", "{text}", {"text": "; ".join(row[1] for row in found), "faults": found})


def raise_any(found: Faults) -> None:
    if found:
        raise faults(found)


def nearest(word: str, known: Iterable[str]) -> str | None:
    """The known word whose spelling is nearest, or None."""
    choices = sorted(known)
    flat = {choice.lower().replace("-", "_"): choice for choice in choices}
    found = difflib.get_close_matches(word.lower().replace("-", "_").replace(" ", "_"), flat, n=1, cutoff=0.6)
    return flat[found[0]] if found else None


def choose(word: str, known: Iterable[str], what: str) -> NoReturn:
    """Refuse a word that is none of `known`, with the nearest of them."""
    choices = sorted(known)
    near = nearest(word, choices)
    shown = word if len(word) <= 60 else word[:57] + "..."
    listed = ", ".join(choices) if len(choices) <= 24 else ", ".join(choices[:24]) + " ..."
    raise fault(
        f"'{shown}' is not {what}",
        f"one of {listed}",
        f"write '{near}' if that is meant" if near else "use one of these",
    )


def kind_of(value: object) -> str:
    """What a piece of a document is, in a user's words."""
    if isinstance(value, dict):
        return "a mapping"
    if isinstance(value, list | tuple):
        return "a list"
    return "nothing" if value is None else f"'{value if len(str(value)) <= 60 else str(value)[:57] + '...'}'"


def an(what: str) -> str:
    return f"{'an' if what[:1] in 'aeiou' else 'a'} {what}"


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
        found: Faults = []
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
        found: Faults = []
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


def collect(found: Faults, path: Path, read: Callable[[Any], Any], item: Any) -> Any:
    """Call `read`; its faults go to `found` with `path` before theirs, and None comes back."""
    try:
        return read(item)
    except PydanticCustomError as error:
        for inner, problem, expected, do in (error.context or {}).get("faults", []):
            found.append(((*path, *inner), problem, expected, do))
        return None


class Model(BaseModel):
    """Base of all documents: frozen, built from text; unknown keys are refused with the nearest known one.

    `HIDDEN` are attributes that the loader fills and no file may set.
    """

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True, arbitrary_types_allowed=True)
    HIDDEN: ClassVar[tuple[str, ...]] = ()
    WHAT: ClassVar[str] = "a mapping"

    @classmethod
    def keys(cls) -> list[str]:
        """The keys a file may use."""
        return [row.alias or name for name, row in cls.model_fields.items() if name not in cls.HIDDEN]

    @model_validator(mode="before")
    @classmethod
    def _known_keys(cls, value: Any, info: ValidationInfo) -> Any:
        if isinstance(value, BaseModel):
            return value
        value = cls.shorthand(value)
        if not isinstance(value, dict):
            known = ", ".join(sorted(cls.keys()))
            raise fault(
                f"{kind_of(value)} stands where {cls.WHAT} is due", f"a mapping of {known}", "write 'key: value'"
            )
        known_keys = set(cls.keys())
        if info.context is None:
            known_keys |= set(cls.model_fields)  # built by hand in Python
        found: Faults = []
        for key in value:
            if key not in known_keys:
                near = nearest(str(key), cls.keys())
                found.append(
                    (
                        (key,),
                        f"key '{key}' is not known here",
                        f"one of {', '.join(sorted(cls.keys()))}",
                        f"write '{near}' if that is meant" if near else "remove it",
                    )
                )
        raise_any(found)
        return cls.prepare(value)

    @classmethod
    def __get_pydantic_json_schema__(cls, schema: CoreSchema, handler: GetJsonSchemaHandler) -> dict[str, Any]:
        """The model's schema without hidden attributes, and with its shorter form, if it has one, beside the mapping."""
        made = handler(schema)
        target = handler.resolve_ref_schema(made)
        names = {row.alias or name: name for name, row in cls.model_fields.items()}
        properties = target.get("properties", {})
        for name in [name for name in properties if names.get(name, name) in cls.HIDDEN]:
            del properties[name]
        for name in properties:
            properties[name] = cls.written(name, properties[name])
        target.pop("title", None)
        target["description"] = cls.WHAT
        short = cls.short_schema()
        if short is not None:
            whole = dict(target)
            target.clear()
            target.update({"anyOf": [short, whole], "description": cls.WHAT})
        return made

    @classmethod
    def short_schema(cls) -> dict[str, Any] | None:
        """The schema of the shorter form that `shorthand` accepts, if there is one."""
        return None

    @classmethod
    def written(cls, name: str, schema: dict[str, Any]) -> dict[str, Any]:
        """The schema of one key as files may write it, where that is more than what the model holds."""
        return schema

    @classmethod
    def prepare(cls, value: Any) -> Any:
        """A model may turn several written forms of a key into one here, after unknown keys were refused."""
        return value

    @classmethod
    def shorthand(cls, value: Any) -> Any:
        """A model may accept a shorter form than a mapping and make the mapping of it here."""
        return value


M = TypeVar("M", bound=Model)

# what the keys of several files are made of
Words = Annotated[str, Text()]
Ident = Annotated[str, Id()]
Flag = Annotated[bool, YesNo()]
Date = Annotated[datetime.date, Day()]
Instant = Annotated[datetime.datetime, Moment()]
Mass = Annotated[Value, Number(("mass",), sign="positive")]
MassOrZero = Annotated[Value, Number(("mass",), sign="not negative")]
Length = Annotated[Value, Number(("length",))]
Size = Annotated[Value, Number(("length",), sign="positive")]
Area = Annotated[Value, Number(("area",), sign="positive")]
Slope = Annotated[Value, Number(("slope",), sign="positive")]
Density = Annotated[Value, Number(("density",), sign="positive")]
Angle = Annotated[Value, Number(("angle",))]
AngularRate = Annotated[Value, Number(("angular rate",), sign="positive")]
LoadFactor = Annotated[Value, Number(("load factor",))]
Airspeed = Annotated[Value, Number(("speed",), airspeed="required", sign="positive")]
Duration = Annotated[Value, Number(("time",), sign="not negative")]
LongDuration = Annotated[Value, Number(("time",), sign="positive")]
Any_ = Annotated[Value, Number(bare=True)]


def faults_of(row: Any) -> Faults:
    """One row of a pydantic error in our words."""
    kind, given = row["type"], row.get("input")
    if kind == "exceed":
        return list(row["ctx"]["faults"])
    if kind == "missing":
        key = row["loc"][-1]
        return [((), f"key '{key}' is missing", f"'{key}'", f"add '{key}: ...' here")]
    if kind in ("tuple_type", "list_type", "iterable_type"):
        return [
            (
                (),
                f"{kind_of(given)} stands where a list is due",
                "a list",
                "write the items in brackets or each after '- '",
            )
        ]
    if kind in ("dict_type", "model_type", "mapping_type", "model_attributes_type"):
        return [((), f"{kind_of(given)} stands where a mapping is due", "a mapping", "write 'key: value'")]
    if kind in ("too_short", "too_long"):
        return [
            (
                (),
                "this list is too short" if kind == "too_short" else "this list is too long",
                str(row["msg"]).split(", not")[0].lower(),
                "add or remove items",
            )
        ]
    return [
        ((), f"{kind_of(given)} cannot stand here", str(row["msg"]).lower(), "see 'exceed template' for an example")
    ]


def make(found: Faults, path: Path, model: type[M], value: Any) -> M | None:
    """Validate a part by its own model; its faults go to `found` with `path` before theirs."""
    try:
        return model.model_validate(value, context={})
    except ValidationError as error:
        for row in error.errors(include_url=False):
            for inner, problem, expected, do in faults_of(row):
                found.append(((*path, *row["loc"], *inner), problem, expected, do))
        return None
