"""Parts of an aircraft file: masses, rows of stall speeds and load factors, speed limits, wing, recorder, loading."""

from __future__ import annotations

from typing import Annotated, Any, ClassVar, Literal

from pydantic import Field, model_validator

from exceed.core.quantities import QUANTITIES, nearest_quantity
from exceed.documents.fields import (
    Airspeed,
    Angle,
    AngularRate,
    Area,
    Choice,
    Date,
    Density,
    Faults,
    Length,
    LoadFactor,
    Many,
    Mass,
    Model,
    Number,
    Ready,
    Size,
    Slope,
    Tuple,
    collect,
    raise_any,
)
from exceed.documents.speeds import check_ascending
from exceed.documents.values import Value

_MASS = Number(("mass",), sign="positive")
_LENGTH = Number(("length",))
_ANGLE = Number(("angle",))
_AIRSPEED = Number(("speed",), airspeed="required", sign="positive")
_MACH = Number(("ratio",), bare=True, sign="positive", at_most=5.0)
_OVER: dict[str, Number] = {"pressure_altitude": _LENGTH, "mass": _MASS, "flaps": _ANGLE}


class Masses(Model):
    WHAT: ClassVar[str] = "the mapping of masses"
    empty: Mass | None = Field(default=None, description="empty mass")
    maximum_take_off: Mass | None = Field(default=None, description="maximum take-off mass")
    maximum_landing: Mass | None = Field(default=None, description="maximum landing mass")
    maximum_zero_fuel: Mass | None = Field(default=None, description="maximum zero fuel mass")

    @model_validator(mode="after")
    def _possible(self) -> Masses:
        found = Faults()
        top = self.maximum_take_off
        for name in ("empty", "maximum_landing", "maximum_zero_fuel"):
            value = getattr(self, name)
            if value is not None and top is not None and (value > top or (name == "empty" and value == top)):
                words = name.replace("_", " ")
                found.note(
                    (name,),
                    f"{words} mass '{value}' is not below maximum take-off mass '{top}'"
                    if name == "empty"
                    else f"{words} mass '{value}' is above maximum take-off mass '{top}'",
                    f"at most {top}",
                    "check both figures",
                )
        for name in ("maximum_landing", "maximum_zero_fuel"):
            value = getattr(self, name)
            if value is not None and self.empty is not None and value <= self.empty:
                found.note(
                    (name,),
                    f"{name.replace('_', ' ')} mass '{value}' is not above empty mass '{self.empty}'",
                    f"above {self.empty}",
                    "check both figures",
                )
        raise_any(found)
        return self


class StallRow(Model):
    WHAT: ClassVar[str] = "a row of stall speeds"
    flaps: Angle | None = Field(default=None, description="flap setting; omitted: flaps up or none")
    mass: Mass | None = Field(default=None, description="mass the figures are for; omitted: maximum take-off mass")
    upright: Airspeed = Field(description="level, 1 g, idle")
    inverted: Airspeed | None = Field(default=None, description="inverted, at -1 g")


class LoadFactorRow(Model):
    """One row of limit load factors; a key that is None matches always."""

    WHAT: ClassVar[str] = "a row of load factors"
    flaps: Angle | None = Field(default=None, description="flap setting this row is for")
    mass_up_to: Mass | None = Field(default=None, description="this row holds up to and with this mass")
    speed_up_to: Airspeed | None = Field(default=None, description="this row holds up to and with this airspeed")
    airbrakes: Annotated[Literal["out", "in"], Choice(("out", "in"), "a state of the airbrakes")] | None = Field(
        default=None, description="this row holds with airbrakes out or in"
    )
    maximum: LoadFactor | None = Field(default=None, description="positive limit load factor")
    minimum: LoadFactor | None = Field(default=None, description="negative limit load factor, with its sign")

    @model_validator(mode="after")
    def _possible(self) -> LoadFactorRow:
        found = Faults()
        if self.maximum is None and self.minimum is None:
            found.note((), "this row has neither maximum nor minimum", "'maximum', 'minimum' or both", "add the limit")
        if self.maximum is not None and self.maximum < 1.0:
            found.note(
                ("maximum",),
                f"maximum '{self.maximum}' is below 1 g, so level flight would be beyond it",
                "a positive limit load factor of 1 g or more",
                "check the figure and its sign",
            )
        if self.minimum is not None and self.minimum > 1.0:
            found.note(
                ("minimum",),
                f"minimum '{self.minimum}' is above 1 g, so level flight would be beyond it",
                "a limit load factor of 1 g or less, as in '-1.76 g'",
                "check the figure and its sign",
            )
        if self.maximum is not None and self.minimum is not None and self.minimum >= self.maximum:
            found.note(
                ("minimum",),
                f"minimum '{self.minimum}' is not below maximum '{self.maximum}'",
                "a minimum below the maximum",
                "check both figures and their signs",
            )
        raise_any(found)
        return self


class Rolling(Model):
    WHAT: ClassVar[str] = "the rolling reduction"
    factor: Annotated[Value, Number(("ratio",), bare=True, sign="positive", at_most=1.0)] = Field(
        description="share of the positive limit that is left while rolling"
    )
    above_roll_rate: AngularRate = Field(description="roll rate from which it counts")


class PositionErrorRow(Model):
    """Indicated against calibrated airspeed at a flap setting (None: all)."""

    WHAT: ClassVar[str] = "a row of position errors"
    flaps: Angle | None = Field(default=None, description="flap setting; omitted: all")
    points: Annotated[
        tuple[tuple[Value, Value], ...],
        Many(Tuple((_AIRSPEED, _AIRSPEED), "a pair, as in '[50 KIAS, 54 KCAS]'"), "a list of pairs"),
    ] = Field(description="pairs of indicated and calibrated airspeed, ascending")

    @model_validator(mode="after")
    def _possible(self) -> PositionErrorRow:
        found = Faults()
        for index, pair in enumerate(self.points):
            for place, wanted, letters in ((0, "indicated_airspeed", "KIAS"), (1, "calibrated_airspeed", "KCAS")):
                if pair[place].airspeed != wanted:
                    found.note(
                        ("points", index, place),
                        f"'{pair[place]}' is no {wanted.replace('_', ' ')}",
                        "indicated airspeed first, calibrated airspeed second",
                        f"give it in {letters}",
                    )
        if not found:
            check_ascending(self.points, "indicated airspeed", found, ("points",))
            check_ascending([pair[::-1] for pair in self.points], "calibrated airspeed", found, ("points",))
        raise_any(found)
        return self


class Wing(Model):
    WHAT: ClassVar[str] = "the wing's data"
    area: Area | None = Field(default=None, description="wing area")
    span: Size | None = Field(default=None, description="wing span")
    mean_chord: Size | None = Field(default=None, description="mean geometric chord")
    lift_curve_slope: Slope | None = Field(default=None, description="of the aeroplane, per angle")


class Accelerometer(Model):
    WHAT: ClassVar[str] = "the accelerometer's data"
    position: (
        Annotated[tuple[Value, Value, Value], Tuple((_LENGTH,) * 3, "three lengths: forward, right, down of the CG")]
        | None
    ) = Field(default=None, description="from the centre of gravity: forward, right, down")
    range: (
        Annotated[tuple[Value, Value], Tuple((Number(("load factor",)),) * 2, "two load factors: lowest, highest")]
        | None
    ) = Field(default=None, description="lowest and highest reading the sensor can give")
    calibrated: Date | None = Field(default=None, description="day of the last calibration")

    @model_validator(mode="after")
    def _possible(self) -> Accelerometer:
        if self.range is not None and not self.range[0] < self.range[1]:
            raise_any(
                [(("range",), f"'{self.range[0]}' is not below '{self.range[1]}'", "lowest reading first", "swap them")]
            )
        return self


class Recorder(Model):
    WHAT: ClassVar[str] = "the recorder's data"
    accelerometer: Accelerometer | None = Field(
        default=None, description="where the accelerometer sits and what it can read"
    )
    accuracy: Annotated[
        dict[str, Value], Ready(lambda: {"type": "object", "additionalProperties": Number(bare=True).schema()})
    ] = Field(default_factory=dict, description="half-width of a 95 % interval, by quantity")

    @classmethod
    def prepare(cls, value: Any) -> Any:
        if not isinstance(value, dict) or not isinstance(value.get("accuracy"), dict):
            return value
        found = Faults()
        made: dict[str, Any] = {}
        for name, text in value["accuracy"].items():
            row = QUANTITIES.get(name)
            path = ("accuracy", name)
            if row is None:
                near = nearest_quantity(name)
                # further names are allowed, as in a channels file; a near miss of a known one is a slip
                if near is not None:
                    found.note(
                        path, f"key '{name}' is not known here", "a quantity", f"write '{near}' if that is meant"
                    )
                    continue
                mark = Number(bare=True, difference=True, sign="positive")
            else:
                mark = Number(
                    (row.kind,), bare=row.kind == "ratio", difference=True, airspeed="refused", sign="positive"
                )
            made[name] = collect(found, path, mark.read, text)
        raise_any(found)
        return {**value, "accuracy": made}


class Station(Model):
    WHAT: ClassVar[str] = "a station's data"
    arm: Length = Field(description="from the manual's datum, aft positive")
    density: Density | None = Field(default=None, description="for a tank: density of the fuel")
    maximum: Mass | None = Field(default=None, description="most this station may carry")


class Loading(Model):
    WHAT: ClassVar[str] = "the loading data"
    stations: dict[str, Station] = Field(default_factory=dict, description="where load and fuel sit")
    empty_arm: Length | None = Field(default=None, description="arm of the empty aeroplane")
    envelope: Annotated[
        tuple[tuple[Value, Value, Value], ...],
        Many(Tuple((_MASS, _LENGTH, _LENGTH), "a row of mass, forward limit, aft limit"), "rows of the envelope"),
    ] = Field(default=(), description="rows of mass, forward limit, aft limit; linear between")

    @model_validator(mode="after")
    def _possible(self) -> Loading:
        found = Faults()
        check_ascending(self.envelope, "mass", found, ("envelope",))
        for index, (_, forward, aft) in enumerate(self.envelope):
            if not forward < aft:
                found.note(
                    ("envelope", index),
                    f"forward limit '{forward}' is not ahead of aft limit '{aft}'",
                    "mass, forward limit, aft limit; arms count aft",
                    "check the order of the row",
                )
        raise_any(found)
        return self
