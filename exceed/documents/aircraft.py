"""Aircraft facts, `exceed-aircraft/1`: frozen models, every number a float in SI that keeps its text (`Value`).

`load_aircraft(path or text) -> Aircraft`, `category_aircraft(category, mass) -> Aircraft` (all limits assumed).
Attributes of `Aircraft` (None or () where the file has nothing):
registration, serial, type, category, flaps, gear ('none'|'fixed'|'recorded'|'not_recorded'|None),
mass.empty|maximum_take_off|maximum_landing|maximum_zero_fuel,
stall_speed: rows .flaps .mass .upright .inverted,
load_factor: rows .flaps .mass_up_to .speed_up_to .airbrakes ('out'|'in'|None) .maximum .minimum,
rolling.factor .above_roll_rate, speeds.NAME: SpeedLimit (.points .over .value .mass .scale .airspeed),
speeds.flaps_extended: rows .flaps .maximum, mach.maximum_operating|never_exceed: MachLimit,
position_error: rows .flaps .points (indicated, calibrated), wing.area .span .mean_chord .lift_curve_slope,
recorder.accelerometer.position .range .calibrated, recorder.accuracy[quantity],
loading.stations[name].arm .density, loading.empty_arm, loading.envelope: rows (mass, forward, aft),
fuel_consumption, limits[name], source; and, set by the loader, path, sha256, assumed.
`aircraft.fact("speeds.never_exceed") -> Fact(.value, .kind, .missing, ...)` is how rules look limits up.
"""

from __future__ import annotations

import re
from pathlib import Path
from typing import Annotated, Any, ClassVar, Literal

from pydantic import Field, model_validator

from exceed.core.units import UNITS
from exceed.documents import facts
from exceed.documents.aircraft_parts import (
    Accelerometer,
    LoadFactorRow,
    Loading,
    Masses,
    PositionErrorRow,
    Recorder,
    Rolling,
    StallRow,
    Station,
    Wing,
)
from exceed.documents.build import build, open_document
from exceed.documents.facts import Fact
from exceed.documents.fields import (
    Any_,
    Choice,
    Faults,
    Model,
    Number,
    Words,
    make,
    nearest,
    raise_any,
)
from exceed.documents.source import Document
from exceed.documents.speeds import FlapSpeedRow, MachLimit, MachLimits, SpeedLimit, Speeds, pairs
from exceed.documents.values import Value
from exceed.errors import Problem, UsageError

CATEGORIES = (
    "normal",
    "utility",
    "aerobatic",
    "commuter",
    "transport",
    "very-light",
    "light-sport",
    "sailplane-utility",
    "sailplane-aerobatic",
)


class Aircraft(Model):
    """All that is known of one aeroplane. `assumed`: limits are those of a published category, not its own."""

    HIDDEN: ClassVar[tuple[str, ...]] = ("path", "sha256", "assumed")
    WHAT: ClassVar[str] = "an aircraft file"
    format: Annotated[str, Choice(("exceed-aircraft/1",), "the format")] = Field(
        default="exceed-aircraft/1", description="first key of the file"
    )
    registration: Words | None = Field(default=None, description="compared without case and punctuation")
    serial: Words | None = Field(default=None, description="serial number of the airframe")
    type: Words | None = Field(default=None, description="free text")
    category: Annotated[str, Choice(CATEGORIES, "a category")] | None = Field(
        default=None, description="airworthiness category"
    )
    flaps: (
        Annotated[
            Literal["none", "recorded", "not_recorded"],
            Choice(("none", "recorded", "not_recorded"), "a state of the flaps"),
        ]
        | None
    ) = Field(default=None, description="omitted: recorded if a channel is there")
    gear: (
        Annotated[
            Literal["fixed", "recorded", "not_recorded"],
            Choice(("fixed", "recorded", "not_recorded"), "a state of the gear"),
        ]
        | None
    ) = Field(default=None, description="omitted: recorded if a channel is there")
    mass: Masses = Field(default_factory=Masses, description="masses")
    stall_speed: tuple[StallRow, ...] = Field(default=(), description="rows by flaps")
    load_factor: tuple[LoadFactorRow, ...] = Field(
        default=(), description="limit load factors, as the manual gives them"
    )
    rolling: Rolling | None = Field(
        default=None, description="reduction of the positive limit while rolling; only where the manual says so"
    )
    speeds: Speeds = Field(default_factory=Speeds, description="speed limits")
    mach: MachLimits = Field(default_factory=MachLimits, description="Mach limits")
    position_error: tuple[PositionErrorRow, ...] = Field(
        default=(), description="rows by flaps, or one plain list of points"
    )
    wing: Wing = Field(default_factory=Wing, description="needed for gusts")
    recorder: Recorder = Field(default_factory=Recorder, description="the recorder in this aeroplane")
    loading: Loading = Field(default_factory=Loading, description="stations and envelope")
    fuel_consumption: Annotated[Value, Number(("mass flow", "volume flow"), sign="positive")] | None = Field(
        default=None, description="used only where no fuel channel is there"
    )
    limits: dict[str, Any_] = Field(default_factory=dict, description="further named facts a rule may point at")
    source: Words | None = Field(default=None, description="manual, section, revision; shown with every limit")
    path: str = ""
    sha256: str = ""
    assumed: bool = False

    @classmethod
    def prepare(cls, value: Any) -> Any:
        """One plain list of points is one row for all flap settings."""
        rows = value.get("position_error") if isinstance(value, dict) else None
        if isinstance(rows, list) and rows and isinstance(rows[0], list):
            found = Faults()
            row = make(found, ("position_error",), PositionErrorRow, {"points": rows})
            # the row's own 'points' is no key of the text
            raise_any([((path[0], *path[2:]), *texts) for path, *texts in found])  # type: ignore[misc]
            value = {**value, "position_error": [row]}
        return value

    @classmethod
    def written(cls, name: str, schema: dict[str, Any]) -> dict[str, Any]:
        if name != "position_error":
            return schema
        return {
            "anyOf": [schema, pairs(Number(("speed",), airspeed="required"), Number(("speed",), airspeed="required"))],
            "description": schema.get("description", ""),
        }

    @model_validator(mode="after")
    def _possible(self) -> Aircraft:
        raise_any(facts.contradictions(self))
        return self

    def fact(self, name: str) -> Fact:
        """The fact that `aircraft.NAME` in a rule points at; see `facts.KNOWN` for the names."""
        return facts.look_up(self, name)

    @property
    def fuel_density(self) -> Value | None:
        """Density of the first tank that states one, kg/m3."""
        return next((row.density for row in self.loading.stations.values() if row.density is not None), None)


def load_aircraft(origin: Path | str | Document, name: str | None = None) -> Aircraft:
    """Read and check an aircraft file, or text with line breaks. Raises DocumentError with all its problems."""
    document = open_document(origin, name)
    return build(Aircraft, document, "aircraft").model_copy(update={"path": document.name, "sha256": document.sha256})


def category_aircraft(category: str, maximum_take_off: float | None = None) -> Aircraft:
    """An aeroplane of which only the category is known: its published limit load factors, marked assumed.

    Parameters: category : one of CATEGORIES.  maximum_take_off : kg, where the category's formula needs it.
    Raises: UsageError for an unknown category, or where the mass is needed and missing.
    """
    from exceed.core.sources import SOURCES
    from exceed.physics.envelope import CATEGORIES as FIGURES
    from exceed.physics.envelope import category_load_factors

    if category not in CATEGORIES:
        near = nearest(category, CATEGORIES)
        do = f"write '{near}' if that is meant" if near else "name a file or one of these"
        problem = f"'{category}' is neither a file nor a category"
        raise UsageError(Problem("--aircraft", problem, f"a file, or one of {', '.join(sorted(CATEGORIES))}", do))
    if FIGURES[category].needs_mass and maximum_take_off is None:
        problem = f"the limits of the category {category} depend on the maximum take-off mass"
        raise UsageError(Problem("--aircraft", problem, "a mass", "add --mass, as in '--mass \"900 kg\"'"))
    figures = category_load_factors(category, maximum_take_off)
    rows = [LoadFactorRow(flaps=_degrees(0.0), maximum=_g(figures.maximum), minimum=_g(figures.minimum))]
    flaps = _g(figures.maximum_flaps), _g(figures.minimum_flaps)
    if flaps != (None, None):
        # one figure for any flaps: the smallest listed setting at or above the angle is always this row
        rows.append(LoadFactorRow(flaps=_degrees(90.0), maximum=flaps[0], minimum=flaps[1]))
    airbrakes = _g(figures.maximum_airbrakes), _g(figures.minimum_airbrakes)
    if airbrakes != (None, None):
        rows.append(LoadFactorRow(airbrakes="out", maximum=airbrakes[0], minimum=airbrakes[1]))
    mass = Masses()
    if maximum_take_off is not None:
        # the mass of the option feeds the formula; it is not the aeroplane's own limit
        mass = Masses(maximum_take_off=Value(maximum_take_off, "mass", "kg", f"{maximum_take_off:g} kg"))
    title = SOURCES[figures.source].title if figures.source in SOURCES else figures.source
    source = f"limit load factors of the category {category}, assumed: {title} ({figures.note})"
    return Aircraft(category=category, mass=mass, load_factor=tuple(rows), assumed=True, path=category, source=source)


def _g(number: float) -> Value | None:
    return None if number != number else Value(float(number), "load factor", "g", f"{number:.3g} g")


def _degrees(number: float) -> Value:
    return Value(number * UNITS["deg"].factor, "angle", "deg", f"{number:g} deg")


def plain_registration(text: str) -> str:
    """A registration without case and punctuation."""
    return re.sub(r"[^a-z0-9]", "", text.casefold())


def same_registration(one: str | None, other: str | None) -> bool:
    """Whether two registrations are the same; case and punctuation do not count, and nothing equals nothing known."""
    first, second = plain_registration(one or ""), plain_registration(other or "")
    return bool(first) and first == second


__all__ = [
    "CATEGORIES",
    "Accelerometer",
    "Aircraft",
    "Fact",
    "FlapSpeedRow",
    "LoadFactorRow",
    "Loading",
    "MachLimit",
    "MachLimits",
    "Masses",
    "PositionErrorRow",
    "Recorder",
    "Rolling",
    "SpeedLimit",
    "Speeds",
    "StallRow",
    "Station",
    "Wing",
    "category_aircraft",
    "load_aircraft",
    "plain_registration",
    "same_registration",
]
