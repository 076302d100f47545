"""What the models of our files are made of: their base, and the types of common keys."""

from __future__ import annotations

import datetime
from typing import Annotated, Any, ClassVar, TypeVar

from pydantic import BaseModel, ConfigDict, GetJsonSchemaHandler, ValidationError, ValidationInfo, model_validator
from pydantic_core import CoreSchema

from exceed.documents.faults import Faults, Path, an, choose, collect, fault, faults_of, kind_of, nearest, raise_any
from exceed.documents.markers import (
    Choice,
    Day,
    Id,
    Many,
    Marker,
    Moment,
    Number,
    Ready,
    Text,
    Tuple,
    Whole,
    YesNo,
)
from exceed.documents.values import Value

__all__ = [
    "Airspeed",
    "Angle",
    "AngularRate",
    "Any_",
    "Area",
    "Choice",
    "Date",
    "Density",
    "Duration",
    "Faults",
    "Flag",
    "Ident",
    "Instant",
    "Length",
    "LoadFactor",
    "LongDuration",
    "Many",
    "Marker",
    "Mass",
    "Model",
    "Moment",
    "Number",
    "Path",
    "Ready",
    "Size",
    "Slope",
    "Text",
    "Tuple",
    "Whole",
    "Words",
    "an",
    "choose",
    "collect",
    "fault",
    "faults_of",
    "kind_of",
    "make",
    "nearest",
    "raise_any",
]


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
        found = Faults()
        for key in value:
            if key not in known_keys:
                near = nearest(str(key), cls.keys())
                do = f"write '{near}' if that is meant" if near else "remove it"
                if str(key).partition(":")[0] in known_keys:
                    do = "write a blank after the ':'"
                found.note((key,), f"key '{key}' is not known here", f"one of {', '.join(sorted(cls.keys()))}", do)
        raise_any(found)
        return cls.prepare(value)

    @classmethod
    def __get_pydantic_json_schema__(cls, schema: CoreSchema, handler: GetJsonSchemaHandler) -> dict[str, Any]:
        """The model's schema without hidden attributes, and with its shorter form beside the mapping."""
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


def make(found: Faults, path: Path, model: type[M], value: Any) -> M | None:
    """Validate a part by its own model; its faults go to `found` with `path` before theirs."""
    try:
        return model.model_validate(value, context={})
    except ValidationError as error:
        for row in error.errors(include_url=False):
            for inner, problem, expected, do in faults_of(row):
                found.note((*path, *row["loc"], *inner), problem, expected, do)
        return None
