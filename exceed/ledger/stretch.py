"""When two stretches of time are one and the same, and how two judgements of it differ. Pure functions."""

from __future__ import annotations

import hashlib
import json
import re
from bisect import bisect_right
from collections.abc import Iterable, Mapping, Sequence
from datetime import UTC, datetime
from itertools import accumulate
from typing import Any

from exceed.core.findings import SEVERITIES

Row = dict[str, Any]
# times are written to the millisecond, so two roundings may part what touches
SLACK = 0.002
# a flight that one download breaks off and the next takes up: the recorder's pause between them, s
TAKEN_UP = 5.0
# one aeroplane cannot take off twice while it flies: take-offs of one flight, seen twice, lie within this, s
SAME_TAKE_OFF = 120.0
# a later start or earlier end than this, s, is a shorter stretch and not another rounding
SHORTER = 1.0


def registration_key(registration: str | None) -> str:
    """A registration without case and punctuation, as registrations are compared; empty where there is none."""
    return "".join(letter for letter in (registration or "").upper() if letter.isalnum())


def epoch(text: str | None) -> float | None:
    """Seconds since 1970 of a UTC text of ours."""
    if text is None:
        return None
    moment = datetime.fromisoformat(text)
    return (moment if moment.tzinfo else moment.replace(tzinfo=UTC)).timestamp()


def digest(data: Any) -> str:
    """SHA-256 of plain data, however its keys are ordered."""
    text = json.dumps(data, sort_keys=True, separators=(",", ":"), allow_nan=False)
    return hashlib.sha256(text.encode()).hexdigest()


def short_name(*parts: object) -> str:
    """Twelve letters that name a row to the user."""
    return hashlib.sha256("\x1f".join(str(part) for part in parts).encode("utf-8", "backslashreplace")).hexdigest()[:12]


def part(quantity: str) -> str:
    """Which of several (engines) a quantity is of: `2` for `engine_speed_2`, else empty.

    The quantity itself may change from one judgement to the next (a limit given in another kind of airspeed).
    """
    found = re.search(r"_(\d+)$", quantity)
    return found.group(1) if found else ""


def touch(one: tuple[float, float], other: tuple[float, float]) -> bool:
    """Do two stretches share an instant? Both ends count: a touchdown may last no time."""
    return one[0] <= other[1] + SLACK and other[0] <= one[1] + SLACK


def overlap(one: tuple[float, float], other: tuple[float, float]) -> float:
    """Seconds that two stretches share, negative for the gap between them."""
    return min(one[1], other[1]) - max(one[0], other[0])


def same_occurrence(one: Mapping[str, Any], other: Mapping[str, Any], *, same_recording: bool) -> bool:
    """Are two events (rule, part, start_s, end_s, start_at, end_at) of one aeroplane one and the same occurrence?"""
    if one["rule"] != other["rule"] or one["part"] != other["part"]:
        return False
    if same_recording:
        return touch((one["start_s"], one["end_s"]), (other["start_s"], other["end_s"]))
    if one["start_at"] is None or other["start_at"] is None:
        return False
    return touch((one["start_at"], one["end_at"]), (other["start_at"], other["end_at"]))


class Occurrences:
    """Events (rows with id, rule, part, start, end) in which those that share an instant with another are found fast.

    `clock` says whose times count: `_s` of one recording, `_at` of different ones; rows without them are left out.
    """

    def __init__(self, rows: Iterable[Row], clock: str) -> None:
        self._start, self._end = f"start{clock}", f"end{clock}"
        self._rows: dict[tuple[str, str], list[Row]] = {}
        for row in rows:
            if row[self._start] is not None:
                self._rows.setdefault((row["rule"], row["part"]), []).append(row)
        self._starts: dict[tuple[str, str], list[float]] = {}
        self._reach: dict[tuple[str, str], list[float]] = {}
        for key, group in self._rows.items():
            group.sort(key=lambda row: (row[self._start], row["id"]))
            self._starts[key] = [row[self._start] for row in group]
            # the latest end up to each row: where it lies before an event, no earlier row can touch that
            self._reach[key] = list(accumulate((row[self._end] for row in group), max))

    def of(self, event: Mapping[str, Any]) -> list[Row]:
        """The rows that are the same occurrence as an event, in the order they were added."""
        key = (event["rule"], event["part"])
        if key not in self._rows or event[self._start] is None:
            return []
        found = []
        place = bisect_right(self._starts[key], event[self._end] + SLACK) - 1
        while place >= 0 and self._reach[key][place] + SLACK >= event[self._start]:
            row = self._rows[key][place]
            if touch((row[self._start], row[self._end]), (event[self._start], event[self._end])):
                found.append(row)
            place -= 1
        return sorted(found, key=lambda row: int(row["id"]))


def worse(new: Mapping[str, Any], old: Mapping[str, Any]) -> bool:
    """Does the newer event say more against the aeroplane: a higher severity, or decided where it was undecided?"""
    rank = SEVERITIES.index(new["severity"]) - SEVERITIES.index(old["severity"])
    return rank > 0 or (rank == 0 and new["kind"] == "event" and old["kind"] == "undecided")


def longer(new: Mapping[str, Any], old: Mapping[str, Any]) -> bool:
    """Does the newer event reach over an end at which the older one was broken off?"""
    if new["start_at"] is None or old["start_at"] is None:
        return False
    return bool(new["start_at"] < old["start_at"] - SHORTER or new["end_at"] > old["end_at"] + SHORTER)


def difference(old: Row, new: Row, old_kind: str, new_kind: str) -> list[str]:
    """What differs between two judgements of one event, each as `what: before -> after`."""
    found: list[str] = []

    def note(name: str, before: Any, after: Any) -> None:
        if before != after:
            found.append(f"{name}: {_text(before)} -> {_text(after)}")

    note("list", old_kind, new_kind)
    for key in ("severity", "certainty", "limit_exceeded", "quantity", "registration", "flight"):
        note(key.replace("_", " "), old.get(key), new.get(key))
    for name, key, inner in (("peak", "peak", "value"), ("estimate", "peak", "estimate"), ("limit", "limit", "value")):
        note(name, old[key][inner], new[key][inner])
    for name, key in (("start", "start_s"), ("end", "end_s")):
        if old.get("start") is None and abs(old[key] - new[key]) > 0.05:
            found.append(f"{name}: {old[key]:.2f} s -> {new[key]:.2f} s")
        elif old.get("start") is not None and new.get("start") is not None:
            before, after = epoch(old[name]), epoch(new[name])
            if before is not None and after is not None and abs(before - after) > 0.05:
                found.append(f"{name}: {old[name]} -> {new[name]}")
    note("inspection", old.get("inspection"), new.get("inspection"))
    return found


def _text(value: Any) -> str:
    return "none" if value is None else str(value)


def documents(judged_with: Sequence[Row], kinds: Sequence[str]) -> dict[str, str]:
    """Path -> digest of the files of these kinds that a judgement rests on."""
    return {row["path"]: row["sha256"] for row in judged_with if row["kind"] in kinds and row.get("path")}


def rules_digest(judged_with: Sequence[Row], rule_sets: Sequence[str], tool: str) -> str:
    """One digest for the rules that one recording was judged by, the options, and the program's version.

    Sets are found by name; where one cannot be found, all rules files of the scan count.
    """
    rows = documents(judged_with, ("rules",))
    chosen: set[str] = set()
    for name in rule_sets:
        fits = [sha for path, sha in rows.items() if name == path or path.endswith("/" + name)]
        if not fits:
            chosen = set(rows.values())
            break
        chosen |= set(fits)
    options = sorted((row["name"], row["value"]) for row in judged_with if row["kind"] == "option")
    return digest([sorted(chosen), options, tool])


# what may differ without the finding being another: where the file lies, and words that may name a path
_ASIDE = ("path", "sha256", "notes", "problem", "rule_sets")


def result_digest(recording: Row) -> str:
    """One digest for all that a judgement found in a recording, whatever the file was called."""
    kept = {key: value for key, value in recording.items() if key not in _ASIDE}
    for key in ("events", "undecided"):
        kept[key] = [{name: value for name, value in event.items() if name != "set"} for event in recording[key]]
    return digest(kept)


def documents_changed(old: Sequence[Row], new: Sequence[Row]) -> bool:
    """Does a file that both judgements name have another content now? Files of other aeroplanes may come and go."""
    kinds = ("aircraft", "loading", "channels", "fleet")
    before, after = documents(old, kinds), documents(new, kinds)
    return any(path in after and after[path] != sha for path, sha in before.items())
