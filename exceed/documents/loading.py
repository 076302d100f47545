"""A loading sheet, `exceed-loading/1`: what was on board, and what the cockpit g-meter said.

`load_loading(path or text) -> LoadingSheet`: registration, take_off (UTC) or None, log or None, stations (name -> mass
in kg or volume in m3), observed.load_factor_maximum / load_factor_minimum, path, sha256.
`sheet_for_flights` says which sheet belongs to which flight; `station_masses` turns litres into kilograms.
"""

from __future__ import annotations

import datetime
from collections.abc import Iterable, Sequence
from pathlib import Path, PurePosixPath
from typing import Annotated, Any, ClassVar

from pydantic import Field, model_validator

from exceed.documents.aircraft import Aircraft, same_registration
from exceed.documents.build import build, open_document
from exceed.documents.fields import (
    Faults,
    Instant,
    LoadFactor,
    Marker,
    Model,
    Number,
    Words,
    collect,
    fault,
    kind_of,
    nearest,
    raise_any,
)
from exceed.documents.source import Document
from exceed.documents.values import Value
from exceed.errors import DocumentError, Problem

WINDOW_S = 15.0 * 60.0  # a sheet belongs to the nearest flight within this


class StationsMark(Marker):
    """Station -> mass, or volume for a tank."""

    part = Number(("mass", "volume"), sign="not negative")

    def read(self, value: Any) -> dict[str, Value]:
        if not isinstance(value, dict):
            raise fault(
                f"{kind_of(value)} stands where stations are due",
                "a mapping, as in '{pilot: 82 kg}'",
                "write 'station: mass'",
            )
        found = Faults()
        made = {name: collect(found, (name,), self.part.read, load) for name, load in value.items()}
        raise_any(found)
        return made

    def schema(self) -> dict[str, Any]:
        return {"type": "object", "additionalProperties": self.part.schema(), "description": "station: mass or volume"}


class Observed(Model):
    """The tell-tales of the cockpit g-meter."""

    WHAT: ClassVar[str] = "the tell-tales"
    load_factor_maximum: LoadFactor | None = Field(default=None, description="highest reading")
    load_factor_minimum: LoadFactor | None = Field(default=None, description="lowest reading")

    @model_validator(mode="after")
    def _ordered(self) -> Observed:
        high, low = self.load_factor_maximum, self.load_factor_minimum
        if high is not None and low is not None and low >= high:
            raise_any(
                [
                    (
                        ("load_factor_minimum",),
                        f"minimum '{low}' is not below maximum '{high}'",
                        "a minimum below the maximum",
                        "check both figures and their signs",
                    )
                ]
            )
        return self


class LoadingSheet(Model):
    """What was on board at one take-off."""

    HIDDEN: ClassVar[tuple[str, ...]] = ("path", "sha256")
    WHAT: ClassVar[str] = "a loading sheet"
    format: Annotated[str, Field(description="first key of the file")] = "exceed-loading/1"
    registration: Words | None = Field(default=None, description="which aeroplane; omitted: the log's")
    take_off: Instant | None = Field(default=None, description="the nearest flight within 15 min is meant")
    log: Words | None = Field(default=None, description="or the log's file name")
    stations: Annotated[dict[str, Value], StationsMark()] = Field(
        default_factory=dict, description="station: mass or volume"
    )
    observed: Observed = Field(default_factory=lambda: Observed(), description="the cockpit g-meter's tell-tales")
    path: str = ""
    sha256: str = ""

    @model_validator(mode="after")
    def _belongs(self) -> LoadingSheet:
        if self.take_off is None and self.log is None:
            raise_any([((), "the sheet does not say which flight it is for", "'take_off' or 'log'", "add one of them")])
        return self


def load_loading(origin: Path | str | Document, name: str | None = None) -> LoadingSheet:
    """Read and check a loading sheet, or text with line breaks. Raises DocumentError with all its problems."""
    document = open_document(origin, name)
    return build(LoadingSheet, document, "loading").model_copy(
        update={"path": document.name, "sha256": document.sha256}
    )


def station_masses(sheet: LoadingSheet, aircraft: Aircraft) -> dict[str, float]:
    """Mass at each station, kg; litres by the station's density.

    Raises DocumentError for a station the aeroplane has not, a volume without density, and an overloaded station.
    """
    problems: list[Problem] = []
    made: dict[str, float] = {}
    known = aircraft.loading.stations
    for name, load in sheet.stations.items():
        station = known.get(name)
        if station is None:
            near = nearest(name, known)
            do = (
                f"write '{near}' if that is meant"
                if near
                else f"add the station to {aircraft.path or 'the aircraft file'}"
            )
            expected = (
                f"one of {', '.join(sorted(known))}" if known else "stations under 'loading' in the aircraft file"
            )
            problems.append(Problem(sheet.path, f"station '{name}' is not known", expected, do))
        elif load.kind == "mass":
            made[name] = float(load)
        elif station.density is None:
            problems.append(
                Problem(
                    sheet.path,
                    f"station '{name}' is given as '{load}' and has no density",
                    "a mass, or a density in the aircraft file",
                    f"write kilograms, or add 'density' to {name} in {aircraft.path or 'the aircraft file'}",
                )
            )
        else:
            made[name] = float(load) * float(station.density)
    if problems:
        raise DocumentError(*problems)
    return made


def overloaded(sheet: LoadingSheet, aircraft: Aircraft) -> tuple[str, ...]:
    """Notes on stations that carry more than the aircraft file allows."""
    notes = []
    for name, mass in station_masses(sheet, aircraft).items():
        most = aircraft.loading.stations[name].maximum
        if most is not None and mass > most:
            notes.append(f"station {name} carries {mass:.1f} kg, more than its maximum of {most}")
    return tuple(notes)


def sheet_for_flights(
    sheets: Iterable[LoadingSheet],
    registration: str | None,
    log: str,
    take_offs: Sequence[datetime.datetime | None],
) -> dict[int, LoadingSheet]:
    """Which sheet belongs to which flight of one log.

    Parameters
    ----------
    sheets : all that could be meant.  registration : the log's, or None.  log : its relative path.
    take_offs : instants of the log's flights, None where the clock is not absolute.

    Returns
    -------
    index of the flight -> sheet; flights without one are left out.

    Raises
    ------
    DocumentError : a tie: two flights as near as each other, a log with several flights and no time, or two sheets for
    one flight.
    """
    made: dict[int, LoadingSheet] = {}
    problems: list[Problem] = []
    for sheet in sheets:
        if (
            sheet.registration is not None
            and registration is not None
            and not same_registration(sheet.registration, registration)
        ):
            continue
        index = _flight_of(sheet, log, take_offs, problems)
        if index is None:
            continue
        if index in made:
            problems.append(
                Problem(
                    sheet.path,
                    f"flight {index + 1} of {log} has another sheet as well, {made[index].path}",
                    "one sheet a flight",
                    "correct 'take_off' or remove one sheet",
                )
            )
            continue
        made[index] = sheet
    if problems:
        raise DocumentError(*problems)
    return made


def _flight_of(
    sheet: LoadingSheet, log: str, take_offs: Sequence[datetime.datetime | None], problems: list[Problem]
) -> int | None:
    if sheet.log is not None:
        wanted, here = PurePosixPath(sheet.log), PurePosixPath(log)
        if here.parts[-len(wanted.parts) :] != wanted.parts:
            return None
        if sheet.take_off is None:
            if len(take_offs) > 1:
                problems.append(
                    Problem(
                        sheet.path,
                        f"{log} has {len(take_offs)} flights and the sheet does not say which",
                        "'take_off' as well",
                        "add 'take_off' with the time of the flight",
                    )
                )
                return None
            return 0 if take_offs else None
    if sheet.take_off is None:
        return None
    apart = [
        (abs((one - sheet.take_off).total_seconds()), index) for index, one in enumerate(take_offs) if one is not None
    ]
    near = sorted(pair for pair in apart if pair[0] <= WINDOW_S)
    if not near:
        return None
    if len(near) > 1 and near[0][0] == near[1][0]:
        problems.append(
            Problem(
                sheet.path,
                f"flights {near[0][1] + 1} and {near[1][1] + 1} of {log} are as near to 'take_off' as each other",
                "a time nearer to one of them",
                "correct 'take_off'",
            )
        )
        return None
    return near[0][1]
