"""Rules and rule sets, `exceed-rules/1`: frozen models, every number a float in SI that keeps its text (`Value`).

Attributes of `Rule`: id, title, quantity (a name, or 'airspeed'), rate (True for {rate_of: ...}), kind (kind of
quantity of what is judged), limit (None | ConstantLimit .value | FactLimit .fact | TableLimit .over .points .between |
RelativeLimit .quantity .times .plus), levels (tuple of Level), states (tuple of StateLevel, for `is`), when (tuple of
Condition: .phase | .quantity .rate .above .below .within .state_value | .any), lasting, joining (floats, s), release
(Value | None) with release_is_percent, allowed (.up_to .for_time .within), count (.at_least .within), total (.above
.within), must_see (Value | None), judge_on ('estimate' | 'sample'), override, inspection (.from_severity .certainty
.task .ata .before), source, notes (tuple of text), place ('file:line:column'), rule_set (name of its set).
`rule.needs()` lists the quantities it asks for; `rule.look_up(aircraft) -> Fact | None`; `rule.channels(names)` the
recorded names it matches, by index.
`RuleSet`: name, title, rules, quantities {name: unit}, path, sha256. See `rulebook` for loading and layering.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from typing import Annotated, Any, ClassVar, Literal

from pydantic import Field, ValidationInfo, model_validator

from exceed.core.phases import AIRBORNE
from exceed.core.quantities import QUANTITIES, Quantity, declared
from exceed.core.units import UNITS
from exceed.documents import facts
from exceed.documents.aircraft import Aircraft
from exceed.documents.conditions import RATE_OF, Condition, never, split_rate, state_words
from exceed.documents.facts import Fact
from exceed.documents.fields import (
    Choice,
    Duration,
    Faults,
    Flag,
    Ident,
    Model,
    Number,
    Words,
    an,
    nearest,
    raise_any,
)
from exceed.documents.limits import (
    Allowance,
    ConstantLimit,
    Count,
    FactLimit,
    Inspection,
    LevelKey,
    LevelsMark,
    Limit,
    LimitMark,
    RelativeLimit,
    TableLimit,
    Total,
)
from exceed.documents.rule_parts import Level, NotesMark, StateLevel, StatesMark, UnitsMark
from exceed.documents.values import Value

AIRSPEEDS = ("indicated_airspeed", "calibrated_airspeed", "equivalent_airspeed", "true_airspeed")

# what the rate of a kind of quantity is; the table of units has no unit for the others
RATES = {
    "load factor": "load factor rate",
    "angle": "angular rate",
    "angular rate": "angular acceleration",
    "length": "speed",
    "mass": "mass flow",
    "volume": "volume flow",
}

_INDEX = re.compile(r"(_\d+){1,2}$")
_ZERO = Value(0.0, "time", "s", "0 s")


def base_name(name: str) -> str:
    """The name without its index or indices: engine_speed_2 -> engine_speed."""
    return name if name in QUANTITIES else _INDEX.sub("", name)


def find(name: str, own: Mapping[str, str]) -> Quantity | None:
    """Row of a quantity that is known or declared in `own` (name -> unit), with or without an index; else None."""
    for one in (name, base_name(name)):
        if one in QUANTITIES:
            return QUANTITIES[one]
        if one in own and own[one] in UNITS:
            return declared(one, own[one])
    return None


class Rule(Model):
    """One rule; see the module's first lines for its attributes."""

    HIDDEN: ClassVar[tuple[str, ...]] = ("rate", "kind", "place", "rule_set")
    WHAT: ClassVar[str] = "a rule"
    id: Ident = Field(description="short name, once in a file")
    title: Words | None = Field(default=None, description="what readers see")
    quantity: Annotated[str, Words] = Field(
        description="a quantity, 'airspeed' (in the kind of the limit), or {rate_of: QUANTITY}"
    )
    rate: bool = False
    limit: Annotated[Limit, LimitMark()] | None = Field(default=None, description="the limit")
    above: Annotated[tuple[LevelKey, ...], LevelsMark()] = Field(default=(), description="levels on the high side")
    below: Annotated[tuple[LevelKey, ...], LevelsMark()] = Field(default=(), description="levels on the low side")
    is_state: Annotated[dict[str, str], StatesMark()] = Field(
        default_factory=dict, alias="is", description="levels of a discrete quantity"
    )
    when: tuple[Condition, ...] = Field(default=(), description="conditions that must all hold")
    lasting: Duration = Field(default=_ZERO, description="shortest event")
    joining: Duration = Field(default=_ZERO, description="excursions nearer than this are one event")
    release: Annotated[Value, Number(bare=True, difference=True, sign="not negative")] | None = Field(
        default=None,
        description="how far back inside before a next event may begin; per cent of the limit, or absolute",
    )
    allowed: tuple[Allowance, ...] = Field(default=(), description="time beyond the limit that is allowed")
    count: Count | None = Field(default=None, description="so many excursions make one event")
    total: Total | None = Field(default=None, description="accumulated time makes one event")
    must_see: Duration | None = Field(default=None, description="shortest excursion that must be visible")
    judge_on: Annotated[Literal["estimate", "sample"], Choice(("estimate", "sample"), "something to judge on")] = Field(
        default="estimate", description="estimate of the true extreme, or the sample as recorded"
    )
    override: Flag = Field(default=False, description="replaces an earlier file's rule of the same id")
    inspection: Inspection | None = Field(default=None, description="what must be done")
    source: Words | None = Field(default=None, description="publication, or 'common practice, no source'")
    notes: Annotated[tuple[str, ...], NotesMark()] = Field(default=(), description="shown with the rule")
    kind: str = ""
    place: str = ""
    rule_set: str = ""

    @classmethod
    def written(cls, name: str, schema: dict[str, Any]) -> dict[str, Any]:
        if name != "quantity":
            return schema
        return {"anyOf": [{"type": "string"}, RATE_OF], "description": "a quantity, or {rate_of: QUANTITY}"}

    @classmethod
    def prepare(cls, value: Any) -> Any:
        value = split_rate(value)
        if (
            isinstance(value, dict)
            and "judge_on" not in value
            and str(value.get("quantity", "")).startswith("touchdown_")
        ):
            value = {**value, "judge_on": "sample"}
        return value

    @model_validator(mode="after")
    def _agrees(self, info: ValidationInfo) -> Rule:
        from exceed.documents import agree

        # by hand in Python nothing is declared and any name goes
        own = (info.context or {}).get("declared")
        kind, found = agree.check(self, own)
        raise_any(found)
        self.__dict__["kind"] = kind
        if self.title is None:
            self.__dict__["title"] = self.id.replace("-", " ").replace("_", " ")
        return self

    @property
    def levels(self) -> tuple[Level, ...]:
        """All levels of both sides, above first, least severe first."""
        made = []
        for side, keys in (("above", self.above), ("below", self.below)):
            for key in keys:
                lasting = None if key.lasting is None else float(key.lasting)
                if key.beyond_by is not None:
                    made.append(Level(key.severity, side, beyond_by=key.beyond_by, lasting=lasting))
                elif key.at is not None and key.at.unit == "%" and self.limit is not None:
                    made.append(Level(key.severity, side, percent=float(key.at), lasting=lasting))
                else:
                    made.append(Level(key.severity, side, absolute=key.at, lasting=lasting))
        return tuple(made)

    @property
    def states(self) -> tuple[StateLevel, ...]:
        words = state_words(base_name(self.quantity))
        return tuple(StateLevel(severity, word, words[word]) for severity, word in self.is_state.items())

    @property
    def release_is_percent(self) -> bool:
        """Whether `release` is a share of the limit (0.01 for 1 %), not an absolute width."""
        return self.release is not None and self.release.unit == "%" and self.limit is not None

    @property
    def sides(self) -> tuple[str, ...]:
        """'above', 'below', 'is': the sides it has levels on."""
        names = (("above", self.above), ("below", self.below), ("is", self.is_state))
        return tuple(name for name, keys in names if keys)

    @property
    def airspeed(self) -> str | None:
        """For `quantity: airspeed` with limits written in the rule: which airspeed; None if a fact decides."""
        if self.quantity != "airspeed":
            return None
        written: list[Value] = [level.absolute for level in self.levels if level.absolute is not None]
        if isinstance(self.limit, ConstantLimit):
            written.append(self.limit.value)
        if isinstance(self.limit, TableLimit):
            written.append(self.limit.points[0][1])
        if isinstance(self.limit, RelativeLimit):
            return self.limit.quantity if self.limit.quantity in AIRSPEEDS else "calibrated_airspeed"
        return next((value.airspeed for value in written if value.airspeed), None)

    def look_up(self, aircraft: Aircraft) -> Fact | None:
        """The aircraft fact its limit points at, or None. One that does not fit the rule counts as missing."""
        if not isinstance(self.limit, FactLimit):
            return None
        fact = aircraft.fact(self.limit.fact)
        text = ""
        if fact.value is not None and self.kind and fact.kind != self.kind:
            text = f"{fact.name} is {an(fact.kind)} and the rule is about {an(self.kind)}"
        elif fact.value is not None and self.quantity == "airspeed" and fact.airspeed is None:
            text = f"{fact.name} does not say which airspeed it is"
        elif fact.airspeed is not None and self.quantity in AIRSPEEDS and fact.airspeed != self.quantity:
            text = f"{fact.name} is {an(fact.airspeed.replace('_', ' '))} and the rule is about {self.quantity}"
        if text:
            return Fact(fact.name, fact.kind, missing=text, assumed=fact.assumed, source=fact.source)
        return fact

    def needs(self, aircraft: Aircraft | None = None) -> tuple[str, ...]:
        """Quantities it asks for: judged, in conditions, in the limit; with `aircraft`, those of its fact too."""
        names: list[str] = []
        if self.quantity != "airspeed":
            names.append(self.quantity)
        elif self.airspeed:
            names.append(self.airspeed)
        for condition in _flat(self.when):
            if condition.quantity is not None:
                names.append(condition.quantity)
        if isinstance(self.limit, TableLimit):
            names.append(self.limit.over)
        if isinstance(self.limit, RelativeLimit):
            names.append(self.limit.quantity)
        fact = self.look_up(aircraft) if aircraft is not None else None
        if fact is not None and fact.value is not None:
            if self.quantity == "airspeed" and fact.airspeed:
                names.append(fact.airspeed)
            over = getattr(fact.value, "over", None) or ("mass" if getattr(fact.value, "scale", None) else None)
            if over is not None:
                names.append("flap_angle" if over == "flaps" else over)
            short = facts.plain_name(fact.name)
            if short.startswith("load_factor."):
                names.append(f"load_factor_{short.partition('.')[2]}")
            elif short == "speeds.flaps_extended":
                names.append("flap_angle")
            elif short.startswith("loading."):
                names.append("mass")
        return tuple(dict.fromkeys(names))

    def channels(self, names: Iterable[str]) -> tuple[str, ...]:
        """Those of `names` it judges: its quantity, and each with an index after it, as in engine_speed_2."""
        pattern = re.compile(re.escape(self.quantity) + r"(_\d+){0,2}$")
        return tuple(sorted((name for name in names if pattern.match(name)), key=natural))


def natural(name: str) -> list[Any]:
    """Sort key that puts _2 before _10."""
    return [int(part) if part.isdigit() else part for part in re.split(r"(\d+)", name)]


def _flat(conditions: Iterable[Condition]) -> list[Condition]:
    made: list[Condition] = []
    for condition in conditions:
        made += [condition, *_flat(condition.any)]
    return made


class RuleSet(Model):
    """One rules file: `name` is what `--rules` says for it."""

    HIDDEN: ClassVar[tuple[str, ...]] = ("path", "sha256", "name")
    WHAT: ClassVar[str] = "a rules file"
    format: Annotated[str, Choice(("exceed-rules/1",), "the format")] = Field(
        default="exceed-rules/1", description="first key of the file"
    )
    title: Words | None = Field(default=None, description="what readers see")
    quantities: Annotated[dict[str, str], UnitsMark()] = Field(
        default_factory=dict, description="further names, each with its unit"
    )
    rules: tuple[Rule, ...] = Field(description="the rules")
    source: Words | None = Field(default=None, description="source of the set as a whole")
    notes: Annotated[tuple[str, ...], NotesMark()] = Field(default=(), description="shown with the set")
    name: str = ""
    path: str = ""
    sha256: str = ""

    @model_validator(mode="after")
    def _once(self) -> RuleSet:
        found = Faults()
        seen: dict[str, int] = {}
        for index, rule in enumerate(self.rules):
            if rule.id in seen:
                text = f"id '{rule.id}' is there twice, first as rule {seen[rule.id] + 1}"
                found.note(("rules", index, "id"), text, "each id once in a file", "give one of them another id")
            seen.setdefault(rule.id, index)
        if not self.rules:
            found.note(("rules",), "there is no rule", "a list of rules", "'exceed template rules' prints examples")
        raise_any(found)
        return self


__all__ = [
    "AIRBORNE",
    "AIRSPEEDS",
    "RATES",
    "Level",
    "Rule",
    "RuleSet",
    "StateLevel",
    "base_name",
    "find",
    "nearest",
    "never",
]
