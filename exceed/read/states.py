"""Words and figures of discrete channels -> 0, 1 or NaN in our sense, inverted headings understood."""

from __future__ import annotations

import re
from collections.abc import Sequence

from exceed.read.cells import is_missing
from exceed.read.names import words_of

_TRUE = frozenset(["1", "1.0", "on", "true", "yes", "y", "t", "active", "act", "set", "high", "hi"])
_FALSE = frozenset(["0", "0.0", "off", "false", "no", "n", "f", "inactive", "reset", "low", "clear"])

# words that name the state itself, whatever the heading
_OWN: dict[str, tuple[frozenset[str], frozenset[str]]] = {
    "gear_down": (
        frozenset(
            [
                "down",
                "dn",
                "ext",
                "extended",
                "dnlk",
                "locked",
                "down locked",
                "dn lk",
                "dn locked",
                "gear down",
                "lowered",
                "d",
            ]
        ),
        frozenset(
            [
                "up",
                "ret",
                "retr",
                "retracted",
                "uplk",
                "up locked",
                "transit",
                "in transit",
                "trans",
                "moving",
                "gear up",
                "u",
                "not down",
                "unlocked",
                "not locked",
            ]
        ),
    ),
    "airbrakes_out": (
        frozenset(["out", "ext", "extended", "open", "deployed", "depl", "full", "half", "opened"]),
        frozenset(["in", "ret", "retr", "retracted", "closed", "stowed", "stow", "armed", "arm", "shut", "locked"]),
    ),
    "weight_on_wheels": (
        frozenset(["gnd", "ground", "grd", "on ground", "on gnd", "grnd", "wow", "ong", "compressed", "g"]),
        frozenset(["air", "flt", "flight", "in air", "airborne", "in flight", "inflight", "extended", "a", "fly"]),
    ),
    "stall_warning": (
        frozenset(["warn", "warning", "stall", "alert", "shake", "shaker", "alarm", "stall warning"]),
        frozenset(["norm", "normal", "ok", "none", "no stall", "quiet", "no warning", "nowarn"]),
    ),
    "on_tow": (
        frozenset(["tow", "on tow", "attached", "hooked", "towed"]),
        frozenset(["free", "released", "free flight", "release"]),
    ),
}
# words in a heading that turn the figure's meaning round
_INVERTS: dict[str, frozenset[str]] = {
    "gear_down": frozenset(["up", "retracted", "uplk", "uplock", "retr"]),
    "airbrakes_out": frozenset(["in", "retracted", "stowed", "closed", "retr"]),
    "weight_on_wheels": frozenset(["airborne", "inflight", "flight", "off"]),
    "stall_warning": frozenset(),
    "on_tow": frozenset(["released", "free"]),
}
# headings whose figures say by themselves what 1 means
_SAYS: dict[str, frozenset[str]] = {
    "gear_down": frozenset(["down", "dn", "extended", "ext", "dnlk", "locked", "lock", "lk"]),
    "airbrakes_out": frozenset(
        [
            "out",
            "extended",
            "ext",
            "deployed",
            "open",
            "airbrake",
            "airbrakes",
            "speedbrake",
            "speedbrakes",
            "spoiler",
            "spoilers",
            "spdbrk",
            "brake",
            "brakes",
        ]
    ),
    "weight_on_wheels": frozenset(["wow", "ground", "gnd", "wheels", "squat", "weight", "oleo", "compressed"]),
    "stall_warning": frozenset(["stall", "shaker", "stallwarn", "warning"]),
    "on_tow": frozenset(["tow", "towing"]),
}


def heading_sense(quantity: str, name: str) -> int:
    """+1: a figure of 1 means our 1; -1: it means our 0; 0: the heading does not say."""
    words = set(words_of(name))
    if quantity == "weight_on_wheels":
        if (
            words & {"airborne", "inflight"}
            or ("air" in words and not words & {"gnd", "ground", "grnd", "grd"})
            or ("flight" in words)
            or ("off" in words and words & {"wheels", "weight"})
        ):
            return -1
        if ("air" in words or words & {"airgnd", "gndair", "airgrnd"}) and words & {
            "gnd",
            "ground",
            "airgnd",
            "gndair",
            "grnd",
            "airgrnd",
            "grd",
            "air",
        }:
            return 0
    if words & _INVERTS.get(quantity, frozenset()) and not words & {"down", "dn", "out"}:
        return -1
    return 1 if words & _SAYS.get(quantity, frozenset()) else 0


def value_of(text: str, quantity: str, sense: int) -> float | None:
    """0, 1, NaN (the cell says nothing) or None (the word is not understood)."""
    plain = re.sub(r"[\s_&/\-]+", " ", text.strip().lower()).strip()
    ons, offs = _OWN.get(quantity, (frozenset(), frozenset()))
    if plain in ons:
        return 1.0
    if plain in offs:
        return 0.0
    turn = sense < 0
    if plain in _TRUE or plain in _FALSE:
        return float((plain in _TRUE) != turn)
    if is_missing(text):
        return float("nan")
    try:
        figure = float(plain.replace(",", "."))
    except ValueError:
        return None
    return float((figure > 0.5) != turn)


def mapping(texts: Sequence[str], quantity: str, sense: int) -> tuple[list[float], list[str], bool]:
    """Values of the texts, the ones not understood, and whether any names the state itself (so that sense is sure)."""
    values, odd, sure = [], [], False
    ons, offs = _OWN.get(quantity, (frozenset(), frozenset()))
    for text in texts:
        value = value_of(text, quantity, sense)
        plain = re.sub(r"[\s_&/\-]+", " ", text.strip().lower()).strip()
        sure = sure or plain in ons or plain in offs
        if value is None:
            odd.append(text)
            value = float("nan")
        values.append(value)
    return values, odd, sure
