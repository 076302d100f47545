"""Numbers with units as a user writes them -> floats in SI that remember how they were written.

`parse("54 KCAS")` gives a `Value`: a float (27.78, m/s) with `.text` ('54 KCAS'), `.unit` ('kt'), `.kind` ('speed')
and `.airspeed` ('calibrated_airspeed', or None). What cannot be read raises `ValueFault` with problem, expected, do.
"""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Iterable
from typing import Any

from exceed.core.units import AIRSPEED_UNITS, AIRSPEED_WORDS, KINDS, UNITS, nearest_unit, units_of

AIRSPEED_SPEED_UNITS = ("km/h", "kt", "m/s", "mph")

# ASCII: other digits look like numbers and are not what an editor or another reader takes for one
_NUMBER = re.compile(r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?", re.ASCII)
_NOT_FINITE = re.compile(r"[+-]?\.?(?:nan|inf(?:inity)?)(?![a-z])", re.IGNORECASE)
_THOUSANDS = re.compile(r"[+-]?\d{1,3}(?:([ '’_,.\u00a0\u202f])\d{3})(?:\1\d{3})*(?![\d.])")
_DECIMAL_COMMA = re.compile(r"[+-]?\d+,\d+")

# spellings of the trade that are not in the table, and what they most likely mean
_MEANT = {
    "kph": ("km/h", "kilometres per hour"),
    "kmh": ("km/h", "kilometres per hour"),
    "kmph": ("km/h", "kilometres per hour"),
    "knots": ("kt", "knots"),
    "knot": ("kt", "knots"),
    "kts": ("kt", "knots"),
    "kn": ("kt", "knots"),
    "fpm": ("ft/min", "feet per minute"),
    "feet": ("ft", "feet"),
    "lbs": ("lb", "pounds"),
    "pounds": ("lb", "pounds"),
    "kgs": ("kg", "kilograms"),
    "sec": ("s", "seconds"),
    "secs": ("s", "seconds"),
    "seconds": ("s", "seconds"),
    "minutes": ("min", "minutes"),
    "hours": ("h", "hours"),
    "hr": ("h", "hours"),
    "°": ("deg", "degrees"),
    "degrees": ("deg", "degrees"),
    "°c": ("degC", "degrees Celsius"),
    "c": ("degC", "degrees Celsius"),
    "°f": ("degF", "degrees Fahrenheit"),
    "f": ("degF", "degrees Fahrenheit"),
    "gs": ("g", "multiples of standard gravity"),
    "m/s²": ("m/s2", "metres per second squared"),
    "m/s^2": ("m/s2", "metres per second squared"),
    "m²": ("m2", "square metres"),
    "m^2": ("m2", "square metres"),
    "percent": ("%", "per cent"),
    "gal": ("USG", "US gallons"),
    "usgal": ("USG", "US gallons"),
    "gph": ("USG/h", "US gallons per hour"),
    "l": ("L", "litres"),
    "nm": ("N.m", "newton metres"),
    "mb": ("mbar", "millibars"),
}

# the unit an example is given in
_USUAL = {
    "speed": "kt",
    "load factor": "g",
    "length": "ft",
    "angle": "deg",
    "angular rate": "deg/s",
    "temperature": "degC",
    "mass": "kg",
    "time": "s",
    "pressure": "hPa",
    "ratio": "%",
    "volume": "L",
    "mass flow": "kg/h",
    "volume flow": "L/h",
}


def usual_unit(kind: str) -> str:
    """The unit in which an example of a kind is given."""
    return _USUAL.get(kind) or next(name for name in units_of(kind) if name != "1")


class ValueFault(ValueError):  # noqa: N818
    """One value that cannot be read; the text is composed where its place is known."""

    def __init__(self, problem: str, expected: str = "", do: str = "") -> None:
        super().__init__(problem, expected, do)
        self.problem, self.expected, self.do = problem, expected, do

    def __str__(self) -> str:
        return self.problem


class Value(float):
    """A float in SI that remembers its kind of quantity, unit and text as written, and which airspeed it is."""

    __slots__ = ("airspeed", "kind", "text", "unit")
    kind: str
    unit: str
    text: str
    airspeed: str | None

    def __new__(cls, si: float, kind: str, unit: str = "", text: str = "", airspeed: str | None = None) -> Value:
        self = super().__new__(cls, si)
        for name, content in (("kind", kind), ("unit", unit), ("text", text), ("airspeed", airspeed)):
            object.__setattr__(self, name, content)
        return self

    def __setattr__(self, name: str, content: object) -> None:
        raise AttributeError(f"a Value does not change ({name})")

    def __reduce__(self) -> tuple[Any, ...]:
        return Value, (float(self), self.kind, self.unit, self.text, self.airspeed)

    def __copy__(self) -> Value:
        return self

    def __deepcopy__(self, memo: object) -> Value:
        return self

    def __repr__(self) -> str:
        return f"<{self}>"

    def __str__(self) -> str:
        """The text as written, else the SI value with its unit."""
        return self.text or f"{float(self):g} {KINDS.get(self.kind, '')}".strip()

    @property
    def bare(self) -> bool:
        """Whether it was written without any unit."""
        return self.unit == "1"


def expected_of(kinds: Iterable[str], *, bare: bool = False, airspeed: bool = False) -> str:
    """What is due where a value of these kinds is: 'a mass in kg, lb'."""
    if airspeed:
        return "an airspeed in KCAS, KEAS, KIAS, KTAS, or a speed and its kind, as in '250 km/h IAS'"
    parts = []
    for kind in kinds:
        names = [name for name in units_of(kind) if name != "1"]
        if kind == "ratio" and bare:
            parts.append("a number or a per cent" if names else "a number")
        elif kind == "ratio":
            parts.append("a per cent, as in '110 %'")
        else:
            article = "an" if kind[0] in "aeiou" else "a"
            parts.append(f"{article} {kind} in {', '.join(names)}")
    return ", or ".join(parts) if parts else "a number with its unit"


def _tidy(text: str) -> str:
    return " ".join(text.replace("\u2212", "-").split())


def _number(text: str, shown: str, expected: str) -> tuple[float, str]:
    """The number that `text` starts with, and the rest of the text."""
    if _NOT_FINITE.match(text):
        raise ValueFault(f"{shown} is not a finite number", expected, "give the figure, or leave the key out")
    thousands = _THOUSANDS.match(text)
    comma = _DECIMAL_COMMA.match(text)
    if thousands and thousands.group(1) == ",":
        one, other = text.replace(",", ""), text.replace(",", ".", 1).replace(",", "")
        raise ValueFault(
            f"{shown} has a comma in the number",
            "digits with a point for decimals and no thousands marks",
            f"write '{one}' or '{other}', whichever is meant",
        )
    if thousands and (thousands.group(1) != "." or thousands.group().count(".") > 1):
        mark = thousands.group(1)
        whole = thousands.group().replace(mark, "") + text[thousands.end() :]
        raise ValueFault(
            f"{shown} has thousands marks",
            "digits with a point for decimals and no thousands marks",
            f"write '{whole}'",
        )
    if comma:
        raise ValueFault(f"{shown} has a decimal comma", "a decimal point", f"write '{text.replace(',', '.', 1)}'")
    found = _NUMBER.match(text)
    if not found:
        raise ValueFault(f"{shown} does not start with a number", expected, "write a number and its unit")
    number = float(found.group())
    if not math.isfinite(number):
        raise ValueFault(f"{shown} is too large a number", expected, "check the exponent")
    return number, text[found.end() :].strip()


def _unknown_unit(name: str, expected: str, wanted: tuple[str, ...]) -> ValueFault:
    meant = _MEANT.get(name.lower().replace(" ", ""))
    if meant:
        return ValueFault(f"unit '{name}' is not known", expected, f"write '{meant[0]}' if you meant {meant[1]}")
    fitting = [unit for kind in wanted for unit in units_of(kind)]
    near = next(iter(difflib.get_close_matches(name, fitting, n=1, cutoff=0.5)), None) or nearest_unit(name)
    right = near is not None and (not wanted or near in fitting or ("speed" in wanted and near in AIRSPEED_UNITS))
    return ValueFault(
        f"unit '{name}' is not known",
        expected,
        f"write '{near}' if that is meant" if right else "use a unit of the list",
    )


def _split_unit(text: str, expected: str, wanted: tuple[str, ...]) -> tuple[str, str | None]:
    """Unit name of the table and the airspeed it says, if any."""
    if text in UNITS:
        return text, None
    if text in AIRSPEED_UNITS:
        return AIRSPEED_UNITS[text]
    first, _, word = text.partition(" ")
    if word in AIRSPEED_WORDS and first in UNITS:
        if first not in AIRSPEED_SPEED_UNITS:
            raise ValueFault(
                f"'{text}' is no unit of an airspeed",
                expected_of((), airspeed=True),
                f"give the {word} in one of {', '.join(AIRSPEED_SPEED_UNITS)}",
            )
        return first, AIRSPEED_WORDS[word]
    if word and first in UNITS and first in AIRSPEED_SPEED_UNITS:
        near = difflib.get_close_matches(word.upper(), AIRSPEED_WORDS, n=1)
        raise ValueFault(
            f"'{word}' is not a kind of airspeed",
            f"one of {', '.join(sorted(AIRSPEED_WORDS))}",
            f"write '{first} {near[0]}' if that is meant" if near else "name the kind, or leave it out",
        )
    if word in AIRSPEED_WORDS:
        raise _unknown_unit(first, expected, wanted)
    raise _unknown_unit(text, expected, wanted)


def parse(
    text: object,
    kinds: str | Iterable[str] | None = None,
    *,
    bare: bool = False,
    difference: bool = False,
    airspeed: str = "allowed",
) -> Value:
    """A value with its unit, in SI.

    Parameters
    ----------
    text : what was written; anything but text is an error of its own.
    kinds : kinds of quantity that are right here; None for any.
    bare : a plain number is right as well (its kind is then 'ratio', its unit '1').
    difference : it is a difference or a width: an offset unit (degC) counts by its size only.
    airspeed : 'required' (the text must say which airspeed), 'allowed', or 'refused'.

    Raises
    ------
    ValueFault : with what is wrong, what was expected, and what to do.
    """
    wanted = (kinds,) if isinstance(kinds, str) else tuple(kinds) if kinds is not None else ()
    expected = expected_of(wanted, bare=bare, airspeed=airspeed == "required")
    if isinstance(text, Value):
        if wanted and text.kind not in wanted:
            raise ValueFault(f"'{text}' is a {text.kind}", expected, "give a value of that kind")
        return text
    if isinstance(text, bool) or not isinstance(text, str | int | float):
        what = {list: "a list", tuple: "a list", dict: "a mapping", bool: "true or false"}.get(type(text), "nothing")
        raise ValueFault(f"{what} stands where a value is due", expected, "write a number and its unit")
    if not isinstance(text, str):
        # only Python code hands over numbers; a document hands on text
        if not math.isfinite(text):
            raise ValueFault(f"'{text}' is not a finite number", expected, "give the figure, or leave the key out")
        return Value(float(text), wanted[0] if wanted else "ratio", "", "")
    tidy = _tidy(text)
    shown = f"'{text if len(text) <= 60 else text[:57] + '...'}'"
    if not tidy:
        raise ValueFault("no value is given", expected, "write a number and its unit")
    number, rest = _number(tidy, shown, expected)
    if not rest:
        if bare:
            return Value(number, "ratio", "1", tidy)
        example = usual_unit(wanted[0]) if wanted else "kt"
        if airspeed == "required":
            example = "KIAS"
        raise ValueFault(f"{shown} has no unit", expected, f"write the unit after the number, as in '{tidy} {example}'")
    unit_name, which = _split_unit(rest, expected, wanted)
    unit = UNITS[unit_name]
    if (wanted and unit.kind not in wanted) or unit.kind == "state" or unit_name == "1":
        article = "an" if unit.kind[0] in "aeiou" else "a"
        what = "per cent" if unit_name == "%" else f"{article} {unit.kind}"
        raise ValueFault(f"{shown} is {what}", expected, "give a value of that kind")
    if airspeed == "required" and unit_name not in AIRSPEED_SPEED_UNITS:
        raise ValueFault(f"{shown} is no airspeed", expected, "give the speed in one of these")
    if airspeed == "required" and which is None:
        raise ValueFault(
            f"{shown} does not say which airspeed it is",
            expected,
            f"write '{tidy} IAS' if the manual means indicated airspeed",
        )
    if airspeed == "refused" and which is not None:
        raise ValueFault(f"{shown} is an airspeed", expected_of(wanted), "leave the kind of airspeed out")
    # 95 / 100 is the nearest float to 0.95, 95 * 0.01 is not
    si = number / 100.0 if unit_name == "%" else number * unit.factor if difference else unit.to_si(number)
    if not math.isfinite(si):
        raise ValueFault(f"{shown} is too large a number", expected, "check the exponent")
    if unit.kind == "temperature" and not difference and si < 0.0:
        raise ValueFault(f"{shown} is below absolute zero", expected, "check the figure and its unit")
    return Value(si, unit.kind, unit_name, tidy, which)
