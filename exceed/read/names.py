"""A heading's words -> the quantities it can mean, with how sure and why."""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache

from exceed.read.synonyms import PHRASES
from exceed.read.units_in_text import split_unit
from exceed.read.words import CLOCK_NAMES, OPEN_SPEED, REFUSED, SIDE, WORDS

_CAMEL = re.compile(
    r"(?<=[a-z0-9])(?=[A-Z])|(?<=[A-Z])(?=[A-Z][a-z]{2,})|(?<=[A-Za-z]{2})(?=\d)|(?<=\d)(?=[A-Za-z]{2})"
)


@dataclass(frozen=True, slots=True)
class Meaning:
    """One quantity that a name can mean. `side` are words that only say which sensor it is."""

    quantity: str
    score: float
    reason: str
    side: tuple[str, ...] = ()
    open: bool = False


def words_of(name: str) -> list[str]:
    """Words of a heading, lower case: `NormAcc_2` -> norm, acc, 2."""
    text = re.sub(r"[''`\"]", "", name).replace("&", " and ")
    text = _CAMEL.sub(" ", text)
    # a body rate's letter and the number of its sub-frame or sensor; N1, T1, V1 are names of their own
    text = re.sub(r"(?<![A-Za-z0-9])([PQRpqr])(?=\d{1,2}(?![A-Za-z0-9]))", r"\1 ", text)
    return [word for word in re.split(r"[^A-Za-z0-9]+", text.lower()) if word]


def _is_side(word: str) -> bool:
    """A word that only says which of several sensors it is."""
    return word in SIDE or word.isdigit()


def _reduced(words: list[str]) -> tuple[str, ...]:
    return tuple(WORDS.get(word, word) for word in words)


def _index() -> tuple[dict[frozenset[str], list[tuple[str, float, str]]], dict[str, list[tuple[str, float, str]]]]:
    by_set: dict[frozenset[str], list[tuple[str, float, str]]] = {}
    by_join: dict[str, list[tuple[str, float, str]]] = {}
    for quantity, phrase, score in PHRASES:
        row = (quantity, score, phrase)
        by_set.setdefault(frozenset(_reduced(phrase.split())), []).append(row)
        by_join.setdefault(phrase.replace(" ", ""), []).append(row)
        by_join.setdefault("".join(_reduced(phrase.split())), []).append(row)
    return by_set, by_join


_BY_SET, _BY_JOIN = _index()
_LONGEST = max(len(words) for words in _BY_SET)


@lru_cache(maxsize=4096)
def meanings(name: str) -> tuple[tuple[Meaning, ...], str]:
    """(meanings, best first; why there is none). The unit must be taken off the name before."""
    words = words_of(name)
    if not words:
        return (), "the name holds no letters"
    refused = [word for word in words if word in REFUSED]
    joined = "".join(words)
    found = _exact(words, joined)
    if found:
        return tuple(found), ""
    if joined in OPEN_SPEED or [w for w in _reduced(words) if w not in SIDE] == ["speed"]:
        return (Meaning("indicated_airspeed", 0.5, f"'{name}' does not say which speed it is", open=True),), ""
    if refused and not _exact([w for w in words if w not in REFUSED], ""):
        return (), f"'{refused[0]}' is not a recorded state of the aeroplane" if refused else ""
    if refused:
        return (), f"'{refused[0]}' makes it something else than the flown value"
    # without the words that only name a sensor
    bare = [word for word in words if not _is_side(word)]
    side = tuple(word for word in words if _is_side(word))
    if bare and side:
        found = _exact(bare, "".join(bare))
        if found:
            return tuple(Meaning(m.quantity, m.score * 0.95, m.reason, side) for m in found), ""
    # a phrase within a longer name: weaker for every word that was not understood
    best: list[Meaning] = []
    reduced = [word for word in _reduced(words) if not _is_side(word)] or list(_reduced(words))
    for size in range(min(_LONGEST, len(reduced) - 1), 0, -1):
        for start in range(len(reduced) - size + 1):
            key = frozenset(reduced[start : start + size])
            rest = [word for word in reduced if word not in key]
            for quantity, score, phrase in _BY_SET.get(key, []):
                if len(rest) > 1 or (size == 1 and (len(phrase) < 3 or score < 0.8)):
                    continue
                best.append(
                    Meaning(
                        quantity,
                        score * 0.6,
                        f"'{phrase}' stands in the name; '{' '.join(rest)}' was not understood",
                        side,
                    )
                )
        if best:
            break
    if best:
        top = max(m.score for m in best)
        return tuple(m for m in best if m.score == top), ""
    return (), "the name is not in the table of synonyms"


def _exact(words: list[str], joined: str) -> list[Meaning]:
    rows = list(_BY_JOIN.get(joined, []))
    rows += _BY_SET.get(frozenset(_reduced(words)), []) if words else []
    reduced = "".join(_reduced(words))
    rows += _BY_JOIN.get(reduced, [])
    kept: dict[str, tuple[float, str]] = {}
    for quantity, score, phrase in rows:
        if score > kept.get(quantity, (0.0, ""))[0]:
            kept[quantity] = (score, phrase)
    ordered = sorted(kept.items(), key=lambda item: -item[1][0])
    return [Meaning(quantity, score, f"named '{phrase}'") for quantity, (score, phrase) in ordered]


@lru_cache(maxsize=4096)
def clock_name(name: str) -> str | None:
    """What a heading suggests as a clock: time, date, offset, frame, hour, minute, second, year, month."""
    words = words_of(name)
    text = " ".join(words)
    if text in CLOCK_NAMES:
        return CLOCK_NAMES[text]
    joined = "".join(words)
    if joined in CLOCK_NAMES:
        return CLOCK_NAMES[joined]
    bare = [word for word in words if word not in SIDE and word not in ("fdr", "qar", "utc", "gmt")]
    if " ".join(bare) in CLOCK_NAMES and bare != words:
        return CLOCK_NAMES[" ".join(bare)]
    if "time" in words or "timestamp" in words:
        return (
            "time"
            if not any(word in REFUSED or word in ("to", "engine", "remaining", "flown", "left") for word in words)
            else None
        )
    return None


@lru_cache(maxsize=4096)
def understood(cell: str) -> bool:
    """Is a heading's cell the name of a quantity or a clock?"""
    if not cell.strip():
        return False
    name, _ = split_unit(cell)
    return bool(meanings(name)[0]) or clock_name(name) is not None or clock_name(cell) is not None
