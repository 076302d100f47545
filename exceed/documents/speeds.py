"""Speed and Mach limits of an aircraft file: values, tables, rows by flaps."""

from __future__ import annotations

from typing import Annotated, Any, ClassVar, Literal

from pydantic import Field, model_validator

from exceed.documents.facts import flaps_in_order
from exceed.documents.fields import (
    Airspeed,
    Angle,
    Choice,
    Faults,
    Many,
    Mass,
    Model,
    Number,
    Ready,
    Tuple,
    collect,
    raise_any,
)
from exceed.documents.values import Value

_MASS = Number(("mass",), sign="positive")
_LENGTH = Number(("length",))
_ANGLE = Number(("angle",))
_AIRSPEED = Number(("speed",), airspeed="required", sign="positive")
_MACH = Number(("ratio",), bare=True, sign="positive", at_most=5.0)
_OVER: dict[str, Number] = {"pressure_altitude": _LENGTH, "mass": _MASS, "flaps": _ANGLE}


def pairs(first: Number, second: Number) -> dict[str, Any]:
    return Many(Tuple((first, second), "a pair"), "a list of pairs").schema()


def check_ascending(points: Any, what: str, found: Faults, path: tuple[str | int, ...] = ()) -> None:
    """Note every point whose first value is not above the one before it."""
    for index in range(1, len(points)):
        before, here = points[index - 1][0], points[index][0]
        if not here > before:
            found.note(
                (*path, index),
                f"{what} '{here}' is not above '{before}' before it",
                "rows in ascending order",
                "put the rows in order, each value once",
            )


class SpeedLimit(Model):
    """A speed limit: one value, a table `over` a quantity, or a value that goes with the root of mass.

    `airspeed` is the kind of airspeed it is given in. `points` are (x, speed) pairs, linear between, held beyond.
    """

    WHAT: ClassVar[str] = "a speed, or a table of speeds"
    value: Airspeed | None = Field(default=None, description="one speed for all conditions, or the one at `mass`")
    over: (
        Annotated[Literal["pressure_altitude", "mass", "flaps"], Choice(tuple(_OVER), "a quantity to give speeds over")]
        | None
    ) = Field(default=None, description="quantity the table is over")
    points: Annotated[tuple[tuple[Value, Value], ...], Ready(lambda: pairs(Number(), _AIRSPEED))] = Field(
        default=(), description="pairs of `over` and speed, ascending"
    )
    mass: Mass | None = Field(default=None, description="mass at which `value` holds")
    scale: Annotated[Literal["sqrt_mass"], Choice(("sqrt_mass",), "a way to scale a speed")] | None = Field(
        default=None, description="only where the manual says so"
    )
    MARK: ClassVar[Number] = _AIRSPEED

    @classmethod
    def shorthand(cls, value: Any) -> Any:
        return {"value": value} if isinstance(value, str | int | float) else value

    @classmethod
    def short_schema(cls) -> dict[str, Any]:
        return cls.MARK.schema()

    @classmethod
    def prepare(cls, value: Any) -> Any:
        value = cls.shorthand(value)
        if not isinstance(value, dict) or "points" not in value:
            return value
        x = _OVER.get(str(value.get("over")), Number())
        pairs = Many(Tuple((x, cls.MARK), "a pair, as in '[960 kg, 128 KIAS]'"), "a list of pairs", least=2)
        found = Faults()
        points = collect(found, ("points",), pairs.read, value["points"])
        raise_any(found)
        return {**value, "points": points}

    @model_validator(mode="after")
    def _one_form(self) -> SpeedLimit:
        found = Faults()
        if self.value is None and not self.points and self.over is None:
            found.note((), "neither a value nor points are given", "a speed, or 'over' and 'points'", "add them")
        if self.value is not None and self.points:
            found.note(("points",), "both a value and points are given", "one of them", "remove one")
        if self.points and self.over is None:
            found.note(
                (), "points are given and 'over' is missing", f"over: one of {', '.join(sorted(_OVER))}", "add 'over'"
            )
        if self.over is not None and not self.points:
            found.note((), "'over' is given and the points are missing", "a list of pairs", "add 'points'")
        if self.scale is not None and (self.mass is None or self.value is None):
            found.note(
                (),
                "scaling with mass needs 'value' and 'mass'",
                "{value: 128 KIAS, mass: 960 kg, scale: sqrt_mass}",
                "add the missing one",
            )
        if self.points:
            check_ascending(self.points, str(self.over).replace("_", " "), found, ("points",))
            first = self.points[0][1]
            for index, (_, speed) in enumerate(self.points):
                if speed.airspeed != first.airspeed:
                    found.note(
                        ("points", index, 1),
                        f"'{speed}' is another kind of airspeed than '{first}'",
                        "one kind of airspeed in a table",
                        "give all in the same kind",
                    )
        raise_any(found)
        return self

    @property
    def airspeed(self) -> str | None:
        """Quantity the limit is given in, e.g. 'indicated_airspeed'."""
        return self.value.airspeed if self.value is not None else self.points[0][1].airspeed

    @property
    def greatest(self) -> Value:
        return self.value if self.value is not None else max((pair[1] for pair in self.points), key=float)

    @property
    def least(self) -> Value:
        return self.value if self.value is not None else min((pair[1] for pair in self.points), key=float)


class MachLimit(SpeedLimit):
    """A Mach limit in the same forms."""

    points: Annotated[tuple[tuple[Value, Value], ...], Ready(lambda: pairs(Number(), _MACH))] = Field(
        default=(), description="pairs of `over` and Mach number, ascending"
    )

    WHAT: ClassVar[str] = "a Mach number, or a table of Mach numbers"
    value: Annotated[Value, _MACH] | None = Field(default=None, description="one Mach number for all conditions")
    MARK: ClassVar[Number] = _MACH


class FlapSpeedRow(Model):
    WHAT: ClassVar[str] = "a row of flap speeds"
    flaps: Angle | None = Field(default=None, description="flap setting; None for one speed at all settings")
    maximum: Airspeed = Field(description="maximum speed with this setting")


class Speeds(Model):
    WHAT: ClassVar[str] = "the mapping of speeds"
    manoeuvring: SpeedLimit | None = Field(default=None, description="V_A; no speed limit by itself")
    normal_operating: SpeedLimit | None = Field(default=None, description="V_NO")
    never_exceed: SpeedLimit | None = Field(default=None, description="V_NE")
    maximum_operating: SpeedLimit | None = Field(default=None, description="V_MO")
    flaps_extended: tuple[FlapSpeedRow, ...] = Field(
        default=(), description="V_FE: rows of flaps and maximum, or one speed"
    )
    gear_operating: SpeedLimit | None = Field(default=None, description="V_LO")
    gear_extended: SpeedLimit | None = Field(default=None, description="V_LE")
    turbulence: SpeedLimit | None = Field(default=None, description="V_B or V_RA")
    airbrakes: SpeedLimit | None = Field(default=None, description="maximum speed with airbrakes out")
    aerotow: SpeedLimit | None = Field(default=None, description="V_T")
    winch: SpeedLimit | None = Field(default=None, description="V_W")

    @classmethod
    def prepare(cls, value: Any) -> Any:
        """One speed and a table over flaps become rows."""
        if not isinstance(value, dict):
            return value
        given = value.get("flaps_extended")
        if isinstance(given, str):
            found = Faults()
            speed = collect(found, ("flaps_extended",), _AIRSPEED.read, given)
            raise_any(found)
            return {**value, "flaps_extended": (FlapSpeedRow(maximum=speed),)}
        if isinstance(given, dict) and given.get("over") == "flaps" and isinstance(given.get("points"), list):
            found = Faults()
            pair = Many(Tuple((_ANGLE, _AIRSPEED), "a pair, as in '[30 deg, 90 KIAS]'"), "a list of pairs")
            rows = collect(found, ("flaps_extended", "points"), pair.read, given["points"])
            raise_any(found)
            return {**value, "flaps_extended": tuple(FlapSpeedRow(flaps=flaps, maximum=speed) for flaps, speed in rows)}
        return value

    @model_validator(mode="after")
    def _possible(self) -> Speeds:
        found = Faults()
        rows = self.flaps_extended
        for index in range(1, len(rows)):
            here, before = rows[index], rows[index - 1]
            flaps_in_order(here.flaps, before.flaps, found, ("flaps_extended", index))
            ordered = here.flaps is not None and before.flaps is not None and here.flaps > before.flaps
            if ordered and here.maximum > before.maximum and here.maximum.airspeed == before.maximum.airspeed:
                found.note(
                    ("flaps_extended", index, "maximum"),
                    f"'{here.maximum}' with more flaps is above '{before.maximum}' with fewer",
                    "a speed that does not grow with flaps",
                    "check both figures",
                )
        for lower, upper in (
            ("normal_operating", "never_exceed"),
            ("manoeuvring", "never_exceed"),
            ("turbulence", "never_exceed"),
            ("turbulence", "maximum_operating"),
            ("manoeuvring", "maximum_operating"),
        ):
            low, high = getattr(self, lower), getattr(self, upper)
            if low is None or high is None or low.airspeed != high.airspeed:
                continue
            # tables may cross the constant elsewhere; only what holds nowhere is impossible
            if low.least > high.greatest:
                found.note(
                    (lower,),
                    f"{lower.replace('_', ' ')} speed '{low.least}' is above "
                    f"{upper.replace('_', ' ')} speed '{high.greatest}'",
                    f"at most {high.greatest}",
                    "check both figures",
                )
        raise_any(found)
        return self

    @classmethod
    def written(cls, name: str, schema: dict[str, Any]) -> dict[str, Any]:
        if name != "flaps_extended":
            return schema
        table = {
            "type": "object",
            "properties": {"over": {"const": "flaps"}, "points": pairs(_ANGLE, _AIRSPEED)},
            "required": ["over", "points"],
            "additionalProperties": False,
        }
        return {"anyOf": [schema, _AIRSPEED.schema(), table], "description": schema.get("description", "")}


class MachLimits(Model):
    WHAT: ClassVar[str] = "the mapping of Mach limits"
    maximum_operating: MachLimit | None = Field(default=None, description="M_MO")
    never_exceed: MachLimit | None = Field(default=None, description="M_NE")
