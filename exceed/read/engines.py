"""Engines and tanks: quantities that rules declare, numbered by engine and cylinder; fuel of one tank is no total."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

from exceed.core.quantities import QUANTITIES
from exceed.read.look import Column
from exceed.read.names import Meaning, words_of
from exceed.read.units_in_text import split_unit
from exceed.read.words import SIDE, WORDS

_ENGINE = re.compile(r"^(e|eng|engine|no|cyl|cylinder|egt|cht|rpm|n|t|itt|tit)(\d{1,2})$")
_ENGINE_ROWS = {"engine_speed": "rpm"}


def _own_words(text: str) -> tuple[frozenset[str], str]:
    """Reduced words of a name, and its numbers joined: `E1 CHT3` -> cylinder head temperature, 1_3."""
    words: list[str] = []
    numbers: list[str] = []
    for word in words_of(text):
        match = _ENGINE.match(word)
        if match and not (match.group(1) == "n" and match.group(2) in "12"):
            numbers.append(match.group(2).lstrip("0") or "0")
            word = match.group(1)
        elif word.isdigit():
            numbers.append(word.lstrip("0") or "0")
            continue
        elif word in ("left", "l", "lh", "port"):
            numbers.append("1")
            continue
        elif word in ("right", "r", "rh", "starboard"):
            numbers.append("2")
            continue
        words.append({"t": "temperature", "p": "pressure", "rpm": "speed"}.get(word, WORDS.get(word, word)))
    # every engine quantity is of an engine; every reading is a value
    kept = frozenset(
        w for w in words if w not in ("engine", "e", "number", "cylinder") and not (w in SIDE and w not in ("a",))
    )
    return kept or frozenset(words), "_".join(numbers)


_LONG_FORMS = {
    frozenset({"egt"}): frozenset({"exhaust", "gas", "temperature"}),
    frozenset({"cht"}): frozenset(
        {"heading", "temperature"}
    ),  # 'head' reads as heading, 'cylinder' goes without saying
    frozenset({"itt"}): frozenset({"interstage", "turbine", "temperature"}),
    frozenset({"tit"}): frozenset({"turbine", "inlet", "temperature"}),
    frozenset({"map"}): frozenset({"manifold", "pressure"}),
    frozenset({"n1"}): frozenset({"fan", "speed"}),
}


def _same_words(a: frozenset[str], b: frozenset[str]) -> bool:
    return a == b or _LONG_FORMS.get(a, a) == _LONG_FORMS.get(b, b)


def declared_meaning(bare: str, name: str, declared: Mapping[str, str]) -> Meaning | None:
    """A quantity that a rules or channels file declares, by the same words; numbers in the name become its index."""
    for text in (bare, name):
        words, number = _own_words(text)
        if not words:
            continue
        for quantity in declared:
            own, own_number = _own_words(quantity)
            if _same_words(words, own) and (number == own_number or not own_number):
                return Meaning(
                    quantity,
                    0.95,
                    f"named like the declared quantity {quantity}",
                    side=(number,) if number != own_number else (),
                )
    return None


def indexed(columns: Sequence[Column], declared: dict[str, str]) -> list[Column]:
    """Several engines: columns of one engine quantity with different numbers become engine_speed_1, engine_speed_2.

    New names are added to `declared`. A single column keeps the plain name.
    """
    out = list(columns)
    by_quantity: dict[str, list[tuple[str, Column]]] = {}
    for column in columns:
        quantity = column.quantity or ""
        if column.problem or column.ignored or column.found_by == "channels file":
            continue
        if quantity in _ENGINE_ROWS or (quantity in declared and quantity not in QUANTITIES):
            by_quantity.setdefault(quantity, []).append(
                (_own_words(split_unit(column.name)[0] or column.name)[1], column)
            )
    for quantity, members in by_quantity.items():
        numbers = [number or _own_words(column.name)[1] for number, column in members]
        if len(members) < 2 or len(set(numbers)) < len(numbers) or len(members) > 16:
            continue
        for number, (_, column) in zip(numbers, members, strict=True):
            if not number:
                continue
            name = f"{quantity}_{number}"
            declared.setdefault(name, declared.get(quantity) or _ENGINE_ROWS[quantity])
            out[column.index] = column.with_(quantity=name)
    return out


def tanks(columns: Sequence[Column]) -> list[Column]:
    """Fuel of one tank is not the fuel on board: columns that name a tank or side are left open."""
    out = list(columns)
    for column in columns:
        if column.quantity not in ("fuel_mass", "fuel_volume") or column.problem or column.found_by == "channels file":
            continue
        words = set(words_of(split_unit(column.name)[0]))
        if words & {
            "l",
            "r",
            "left",
            "right",
            "lh",
            "rh",
            "aux",
            "main",
            "centre",
            "center",
            "ctr",
            "tip",
            "inner",
            "outer",
            "1",
            "2",
            "3",
            "4",
            "wing",
        }:
            out[column.index] = column.with_(
                quantity=None,
                problem="one tank's fuel, not all that is on board",
                question="Which column is the fuel on board?",
            )
    return out
