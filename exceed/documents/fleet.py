"""The fleet file, `exceed-fleet/1`: which log belongs to which aeroplane, and what it is judged with.

`load_fleet(path or text) -> Fleet`: operator, time_zone, aircraft: rows .registration .aircraft .rules .channels
.loading .logs .recorder_serial, path, sha256, folder. Paths stand as written; `fleet.resolve(path)` makes them whole.
`belongs(fleet, ...)` says, from facts alone, whose a log is.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, ClassVar

from pydantic import Field, model_validator

from exceed.documents.aircraft import same_registration
from exceed.documents.build import build, open_document
from exceed.documents.channels import TextsMark, ZoneMark
from exceed.documents.fields import Choice, Faults, Model, Words, raise_any
from exceed.documents.rulebook import BUILT_IN
from exceed.documents.source import Document


class FleetAircraft(Model):
    """One aeroplane of the fleet."""

    WHAT: ClassVar[str] = "an aeroplane of the fleet"
    registration: Words = Field(description="compared without case and punctuation")
    aircraft: Words | None = Field(default=None, description="aircraft file, relative to this file")
    rules: Annotated[tuple[str, ...], TextsMark()] = Field(default=("airframe",), description="built-in sets or files")
    channels: Words | None = Field(default=None, description="channels file")
    loading: Annotated[tuple[str, ...], TextsMark()] = Field(default=(), description="loading sheets, patterns allowed")
    logs: Annotated[tuple[str, ...], TextsMark()] = Field(
        default=(), description="patterns that select among the logs being scanned"
    )
    recorder_serial: Words | None = Field(default=None, description="serial number of its recorder")

    @model_validator(mode="after")
    def _some(self) -> FleetAircraft:
        if not self.rules:
            raise_any(
                [
                    (
                        ("rules",),
                        "no rules are named",
                        f"files, or some of {', '.join(sorted(BUILT_IN))}",
                        "name one, or leave the key out",
                    )
                ]
            )
        return self


class Fleet(Model):
    """All aeroplanes of one operator."""

    HIDDEN: ClassVar[tuple[str, ...]] = ("path", "sha256")
    WHAT: ClassVar[str] = "a fleet file"
    format: Annotated[str, Choice(("exceed-fleet/1",), "the format")] = Field(
        default="exceed-fleet/1", description="first key of the file"
    )
    operator: Words | None = Field(default=None, description="shown in outputs")
    time_zone: Annotated[str, ZoneMark()] = Field(
        default="UTC", description="outputs give local time where it is not UTC; it bounds the day"
    )
    aircraft: tuple[FleetAircraft, ...] = Field(description="the aeroplanes")
    path: str = ""
    sha256: str = ""

    @model_validator(mode="after")
    def _once(self) -> Fleet:
        found = Faults()
        for index, row in enumerate(self.aircraft):
            for before in range(index):
                other = self.aircraft[before]
                if same_registration(row.registration, other.registration):
                    found.note(
                        ("aircraft", index, "registration"),
                        f"registration '{row.registration}' is there twice, first as aeroplane {before + 1}",
                        "each registration once",
                        "remove one of them",
                    )
                if row.recorder_serial is not None and row.recorder_serial == other.recorder_serial:
                    found.note(
                        ("aircraft", index, "recorder_serial"),
                        f"recorder '{row.recorder_serial}' is in {other.registration} as well",
                        "each recorder in one aeroplane",
                        "correct one of the serial numbers",
                    )
        raise_any(found)
        return self

    @property
    def folder(self) -> Path:
        """Where the paths in the file start."""
        return Path(self.path).parent if self.path else Path()

    def resolve(self, path: str) -> Path:
        """A path of the file made whole."""
        return self.folder / path

    def rules_of(self, row: FleetAircraft) -> tuple[str, ...]:
        """What to load as rules: names of built-in sets as they are, paths made whole."""
        return tuple(name if name in BUILT_IN else str(self.resolve(name)) for name in row.rules)

    def find(self, registration: str | None) -> FleetAircraft | None:
        return next((row for row in self.aircraft if same_registration(row.registration, registration)), None)


def load_fleet(origin: Path | str | Document, name: str | None = None) -> Fleet:
    """Read and check a fleet file, or text with line breaks. Raises DocumentError with all its problems."""
    document = open_document(origin, name)
    return build(Fleet, document, "fleet").model_copy(update={"path": document.name, "sha256": document.sha256})


@dataclass(frozen=True, slots=True)
class Belonging:
    """Whose a log is. `registration` as the fleet writes it where it knows it; `entry` its row, or None.

    `found_by`: 'registration', 'recorder serial', 'path' or ''. `problem` is set where the evidence disagrees: an error
    for that log. `note` says what else there is to say.
    """

    registration: str | None
    entry: FleetAircraft | None
    found_by: str = ""
    problem: str = ""
    note: str = ""


def matches(pattern: str, path: str) -> bool:
    """Whether a path with forward slashes fits a pattern: `*` and `?` within a folder, `**` over folders, `[ab]`."""
    return re.fullmatch(_expression(pattern.replace("\\", "/").removeprefix("./")), path.replace("\\", "/")) is not None


def _expression(pattern: str) -> str:
    made, index = "", 0
    while index < len(pattern):
        rest = pattern[index:]
        if rest.startswith("**/"):
            made, index = made + "(?:[^/]+/)*", index + 3
        elif rest.startswith("**"):
            made, index = made + ".*", index + 2
        elif rest[0] == "*":
            made, index = made + "[^/]*", index + 1
        elif rest[0] == "?":
            made, index = made + "[^/]", index + 1
        elif rest[0] == "[" and (end := rest.find("]", 2)) > 0:
            inside = rest[1:end].replace("\\", r"\\")
            inside = "^" + inside[1:] if inside[0] == "!" else inside.replace("^", r"\^")
            made, index = made + f"[{inside}]", index + end + 1
        else:
            made, index = made + re.escape(rest[0]), index + 1
    return made


def by_path(fleet: Fleet, paths: Iterable[str]) -> list[FleetAircraft]:
    """Rows whose `logs` patterns fit one of the paths, or the file name at its end."""
    forms = [path for path in paths if path]
    forms += [path.replace("\\", "/").rsplit("/", 1)[-1] for path in forms]
    return [row for row in fleet.aircraft if any(matches(pattern, form) for pattern in row.logs for form in forms)]


def belongs(fleet: Fleet, written: str | None, serial: str | None, paths: Iterable[str]) -> Belonging:
    """Whose a log is: the registration written in it, else its recorder's serial, else the `logs` patterns.

    Parameters: written : registration in the log, or None.  serial : recorder's serial in the log, or None.
    paths : the log's paths relative to the fleet file and to the PATH given; its file name is tried as well.
    """
    by_serial = next(
        (row for row in fleet.aircraft if serial is not None and row.recorder_serial == serial.strip()), None
    )
    fitting = by_path(fleet, paths)
    if len(fitting) > 1:
        kept = [row for row in fitting if same_registration(row.registration, written) or row is by_serial]
        if not (written or by_serial) or not kept:
            names = ", ".join(row.registration for row in fitting)
            return Belonging(written, None, problem=f"the 'logs' patterns of {names} all fit this log")
        fitting = kept
    said: list[tuple[str, str]] = []
    if written is not None and written.strip():
        said.append(("registration", written.strip()))
    if by_serial is not None:
        said.append(("recorder serial", by_serial.registration))
    said += [("path", row.registration) for row in fitting]
    if not said:
        return Belonging(None, None)
    how, name = said[0]
    for other_how, other in said[1:]:
        if not same_registration(name, other):
            text = f"the {how} says {name} and the {other_how} says {other}"
            return Belonging(name, None, how, problem=text)
    entry = fleet.find(name)
    if entry is None:
        return Belonging(name, None, how, note=f"{name} is not in the fleet file")
    return Belonging(entry.registration, entry, how)


__all__ = ["Belonging", "Fleet", "FleetAircraft", "belongs", "by_path", "load_fleet", "matches"]
