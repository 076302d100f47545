"""When a rule looks: phases, quantities, and any-of; the words of phases and of discrete states."""

from __future__ import annotations

from typing import Annotated, Any, ClassVar

from pydantic import Field, model_validator

from exceed.core.phases import AIRBORNE, PHASES
from exceed.documents.fields import (
    Any_,
    Faults,
    Marker,
    Model,
    Number,
    Tuple,
    Words,
    choose,
    fault,
    kind_of,
    raise_any,
)
from exceed.documents.values import Value

# take-off and landing are partly airborne
_IN_AIRBORNE = frozenset(PHASES) - {"standing", "taxi"}

# words for the two states of a discrete quantity, beside the common ones; a declared state takes the last row
STATES: dict[str, dict[str, int]] = {
    "gear_down": {"down": 1, "up": 0, "extended": 1, "retracted": 0},
    "airbrakes_out": {"out": 1, "in": 0, "extended": 1, "retracted": 0},
    "weight_on_wheels": {"ground": 1, "air": 0},
    "stall_warning": {},
    "on_tow": {},
    "on_winch": {},
    "gear_moving": {"moving": 1, "still": 0},
    "": {"up": 0, "down": 1, "in": 0, "out": 1, "closed": 0, "open": 1},
}
_COMMON = {"on": 1, "off": 0, "yes": 1, "no": 0, "true": 1, "false": 0, "1": 1, "0": 0}


def state_words(quantity: str) -> dict[str, int]:
    """Words for the states of a discrete quantity -> 1 or 0."""
    return {**_COMMON, **STATES.get(quantity, STATES[""])}


RATE_OF = {
    "type": "object",
    "properties": {"rate_of": {"type": "string"}},
    "required": ["rate_of"],
    "additionalProperties": False,
}


class PhaseMark(Marker):
    def read(self, value: Any) -> tuple[str, ...]:
        given = [value] if isinstance(value, str) else value
        if not isinstance(given, list | tuple):
            raise fault(
                f"{kind_of(value)} stands where phases are due",
                "a list, as in '[approach, landing]'",
                "write it in brackets",
            )
        if not given:
            raise fault(
                "no phase is given",
                "a list, as in '[approach, landing]'",
                "name the phases, or leave the condition out",
            )
        found = Faults()
        made = []
        for index, word in enumerate(given):
            plain = " ".join(word.split()) if isinstance(word, str) else word
            if plain in PHASES or plain == AIRBORNE:
                made.append(plain)
                continue
            try:
                choose(str(plain), (*PHASES, AIRBORNE), "a phase")
            except Exception as error:
                path = (index,) if isinstance(value, list | tuple) else ()
                found += [((*path, *row[0]), *row[1:]) for row in getattr(error, "context", {})["faults"]]
        raise_any(found)
        return tuple(dict.fromkeys(made))

    def schema(self) -> dict[str, Any]:
        word = {"type": "string", "enum": [*PHASES, AIRBORNE]}
        return {"anyOf": [word, {"type": "array", "items": word, "minItems": 1}]}


class StateMark(Marker):
    """A word for a state; which words there are depends on the quantity, so the rule checks it."""

    def read(self, value: Any) -> str:
        if isinstance(value, str) and value.strip():
            return value.strip().lower()
        raise fault(
            f"{kind_of(value)} stands where a state is due", "a word, as in 'up' or 'out'", "write one of these"
        )

    def schema(self) -> dict[str, Any]:
        return {"type": ["string", "boolean", "integer"], "description": "up, down, in, out, on, off, yes, no"}


class Condition(Model):
    """One condition: `phase`, or `quantity` with above, below, within or is, or `any` of several conditions.

    `state` is the word after `is`, `state_value` its 1 or 0; `rate` tells `{rate_of: ...}`.
    """

    HIDDEN: ClassVar[tuple[str, ...]] = ("rate",)
    WHAT: ClassVar[str] = "a condition"
    phase: Annotated[tuple[str, ...], PhaseMark()] = Field(default=(), description="one of these phases")
    quantity: Annotated[str, Words] | None = Field(default=None, description="a quantity, or {rate_of: QUANTITY}")
    rate: bool = False
    above: Any_ | None = Field(default=None, description="true above this value")
    below: Any_ | None = Field(default=None, description="true below this value")
    within: Annotated[tuple[Value, Value], Tuple((Number(bare=True),) * 2, "two values, lowest first")] | None = Field(
        default=None, description="true from the first to the second value"
    )
    state: Annotated[str, StateMark()] | None = Field(default=None, alias="is", description="true in this state")
    any: tuple[Condition, ...] = Field(default=(), description="true where any of these is")

    @classmethod
    def written(cls, name: str, schema: dict[str, Any]) -> dict[str, Any]:
        if name != "quantity":
            return schema
        return {"anyOf": [{"type": "string"}, RATE_OF], "description": "a quantity, or {rate_of: QUANTITY}"}

    @classmethod
    def prepare(cls, value: Any) -> Any:
        return split_rate(value)

    @model_validator(mode="after")
    def _one_form(self) -> Condition:
        found = Faults()
        tests = [name for name in ("above", "below", "within", "state") if getattr(self, name) is not None]
        forms = [bool(self.phase), self.quantity is not None, bool(self.any)]
        if sum(forms) != 1:
            text = "a condition needs one of 'phase', 'quantity' and 'any'"
            found.note(
                (), text, "{phase: [approach]}, {quantity: Q, above: X} or {any: [...]}", "use one of these forms"
            )
        elif self.quantity is not None and not tests:
            found.note(
                (), "this condition compares with nothing", "one of above, below, is, within", "add one of these"
            )
        elif self.quantity is None and tests:
            found.note((), "this condition has a value and no quantity", "{quantity: Q, above: X}", "name the quantity")
        if self.within is not None and not self.within[0] < self.within[1]:
            found.note(
                ("within",),
                f"'{self.within[0]}' is not below '{self.within[1]}'",
                "two values, lowest first",
                "swap them",
            )
        low, high = self.above, self.below
        if low is not None and high is not None and low >= high:
            text = f"above '{low}' and below '{high}' can never both hold"
            found.note(("below",), text, "'below' greater than 'above'", "swap them, or use {any: [...]}")
        raise_any(found)
        return self

    @property
    def state_value(self) -> int | None:
        return None if self.state is None else state_words(self.quantity or "").get(self.state)


def split_rate(value: Any) -> Any:
    """`quantity: {rate_of: Q}` becomes quantity Q and rate True."""
    if not isinstance(value, dict) or not isinstance(value.get("quantity"), dict):
        return value
    inner = value["quantity"]
    if set(inner) != {"rate_of"} or not isinstance(inner["rate_of"], str):
        text = "this is neither a quantity nor the rate of one"
        raise_any([(("quantity",), text, "a name, or {rate_of: QUANTITY}", "use one of these forms")])
    return {**value, "quantity": inner["rate_of"], "rate": True}


def never(conditions: tuple[Condition, ...]) -> int | None:
    """Index of the phase condition that, with those before it, leaves no phase at all; None if some phase is left."""
    left: set[str] | None = None
    for index, condition in enumerate(conditions):
        if not condition.phase:
            continue
        here: set[str] = set()
        for word in condition.phase:
            here |= _IN_AIRBORNE if word == AIRBORNE else {word}
        left = here if left is None else left & here
        if not left:
            return index
    return None
