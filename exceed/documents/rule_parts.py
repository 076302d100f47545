"""Parts of a rule: a level ready to judge, states, notes, and the units of declared quantities."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Any

from exceed.core.quantities import QUANTITIES
from exceed.core.units import UNITS, nearest_unit, units_of
from exceed.documents.fields import (
    Faults,
    Marker,
    an,
    fault,
    kind_of,
    raise_any,
)
from exceed.documents.limits import (
    SEVERITIES,
    unknown_severity,
)
from exceed.documents.values import Value

_NAME = re.compile(r"[a-z][a-z0-9_]*$")


@dataclass(frozen=True, slots=True)
class Level:
    """One level of a rule, ready to judge. Exactly one of `percent` (1.1 for 110 % of the limit), `absolute` (SI) and
    `beyond_by` (SI, away from the limit in the sense of `side`) is set. `lasting` in s, None: the rule's.
    """

    severity: str
    side: str
    percent: float | None = None
    absolute: Value | None = None
    beyond_by: Value | None = None
    lasting: float | None = None

    def value(self, limit: Any) -> Any:
        """The level where the limit in force is `limit` (a float or an array, SI)."""
        if self.absolute is not None:
            return self.absolute + 0.0 * limit if limit is not None else float(self.absolute)
        if self.percent is not None:
            return self.percent * limit
        step = float(self.beyond_by or 0.0)
        return limit + step if self.side == "above" else limit - step


@dataclass(frozen=True, slots=True)
class StateLevel:
    """One level of a discrete rule: `severity` when the quantity is in the state `word` (`value` 1 or 0)."""

    severity: str
    word: str
    value: int


class StatesMark(Marker):
    """`is`: a mapping of severities to words for a state."""

    def read(self, value: Any) -> dict[str, str]:
        if not isinstance(value, dict) or not value:
            raise fault(
                f"{kind_of(value)} stands where states are due", "a mapping, as in '{caution: up}'", "name the severity"
            )
        found = Faults()
        made: dict[str, str] = {}
        for name, word in value.items():
            if name not in SEVERITIES:
                unknown_severity(found, name)
            if not isinstance(word, str) or not word.strip():
                found.note(
                    (name,), f"{kind_of(word)} stands where a state is due", "a word, as in 'up'", "write the state"
                )
            else:
                made[name] = word.strip().lower()
        raise_any(found)
        return {name: made[name] for name in SEVERITIES if name in made}

    def schema(self) -> dict[str, Any]:
        word = {"type": ["string", "boolean", "integer"]}
        return {"type": "object", "properties": dict.fromkeys(SEVERITIES, word), "additionalProperties": False}


class NotesMark(Marker):
    """One note or a list of them."""

    def read(self, value: Any) -> tuple[str, ...]:
        given = [value] if isinstance(value, str) else value
        if not isinstance(given, list | tuple) or not all(isinstance(one, str) and one.strip() for one in given):
            raise fault(f"{kind_of(value)} stands where notes are due", "text, or a list of texts", "write text")
        return tuple(one.strip() for one in given)

    def schema(self) -> dict[str, Any]:
        return {"anyOf": [{"type": "string"}, {"type": "array", "items": {"type": "string"}}]}


class UnitsMark(Marker):
    """`quantities`: names a file declares, each with its unit."""

    def read(self, value: Any) -> dict[str, str]:
        if not isinstance(value, dict):
            raise fault(
                f"{kind_of(value)} stands where quantities are due",
                "a mapping, as in '{oil_temperature: degC}'",
                "write 'name: unit'",
            )
        found = Faults()
        for name, unit in value.items():
            if not _NAME.match(name):
                found.note(
                    (name,),
                    f"key '{name}' is no name for a quantity",
                    "lower-case letters, digits and '_'",
                    "rename it",
                )
            elif name == "airspeed":
                found.note((name,), "key 'airspeed' is known already", "a name of your own", "remove this line")
            elif (
                name in QUANTITIES
                and isinstance(unit, str)
                and unit in UNITS
                and UNITS[unit].kind != QUANTITIES[name].kind
            ):
                kind = QUANTITIES[name].kind
                found.note(
                    (name,),
                    f"'{name}' is known already as {an(kind)}, and {unit} is no unit of it",
                    f"one of {', '.join(units_of(kind))}",
                    "remove this line, or choose another name",
                )
            if not isinstance(unit, str) or unit not in UNITS:
                near = nearest_unit(unit) if isinstance(unit, str) else None
                do = f"write '{near}' if that is meant" if near else "use a unit of the list"
                found.note((name,), f"unit {kind_of(unit)} is not known", f"one of {', '.join(sorted(UNITS))}", do)
        raise_any(found)
        return dict(value)

    def schema(self) -> dict[str, Any]:
        return {"type": "object", "additionalProperties": {"enum": [*sorted(UNITS), 1]}, "description": "name: unit"}
