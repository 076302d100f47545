"""How a wrong value is told: problem, expected, do, at a path below the value that is being read.

`fault(...)` makes the error of one value and `faults(...)` of several; `documents.build` adds file, line and column.
"""

from __future__ import annotations

import difflib
from collections.abc import Callable, Iterable, Sequence
from typing import Any, NoReturn

from pydantic_core import PydanticCustomError

Path = tuple[str | int, ...]


class Faults(list[tuple[Path, str, str, str]]):
    """Faults in the order they were found: path, problem, expected, do."""

    def note(self, path: Path, problem: str, expected: str = "", do: str = "") -> None:
        self.append((path, _short(problem), expected, _short(do)))


def fault(problem: str, expected: str = "", do: str = "") -> PydanticCustomError:
    """The error of one value."""
    return faults([((), _short(problem), expected, _short(do))])


def faults(found: Sequence[tuple[Path, str, str, str]]) -> PydanticCustomError:
    """Several errors at once, each at a path below the value that is being read."""
    return PydanticCustomError("exceed", "{text}", {"text": "; ".join(row[1] for row in found), "faults": list(found)})


def _short(text: str) -> str:
    return text if len(text) <= 240 else text[:200] + "..."


def raise_any(found: Sequence[tuple[Path, str, str, str]]) -> None:
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


def collect(found: Faults, path: Path, read: Callable[[Any], Any], item: Any) -> Any:
    """Call `read`; its faults go to `found` with `path` before theirs, and None comes back."""
    try:
        return read(item)
    except PydanticCustomError as error:
        for inner, problem, expected, do in (error.context or {}).get("faults", []):
            found.note((*path, *inner), problem, expected, do)
        return None


def faults_of(row: Any) -> Sequence[tuple[Path, str, str, str]]:
    """One row of a pydantic error in our words."""
    kind, given = row["type"], row.get("input")
    if kind == "exceed":
        return list(row["ctx"]["faults"])
    if kind == "missing":
        key = row["loc"][-1]
        return [((), f"key '{key}' is missing", f"a value for '{key}'", f"add '{key}: ...' here")]
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
