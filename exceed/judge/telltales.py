"""The cockpit g-meter's tell-tales, as a loading sheet has them, against what was recorded of the same flight."""

from __future__ import annotations

import datetime
from collections.abc import Iterable, Sequence

from exceed.core.findings import Extreme
from exceed.core.trace import Trace
from exceed.documents.loading import LoadingSheet, sheet_for_flights


def telltale_notes(
    trace: Trace, extremes: Iterable[Extreme], sheets: Sequence[LoadingSheet], registration: str | None
) -> tuple[str, ...]:
    """One line for each flight whose sheet gives a tell-tale: both values and their difference, in g.

    Raises DocumentError where it cannot be told which flight a sheet is for.
    """
    read = [sheet for sheet in sheets if _observed(sheet)]
    if not read:
        return ()
    start = trace.recording.clock.start
    flights = trace.track.flights
    take_offs: list[datetime.datetime | None] = [
        None if start is None else datetime.datetime.fromtimestamp(start + flight.start, datetime.UTC)
        for flight in flights
    ] or [None]
    of_flight = {row.flight: row for row in extremes if row.quantity == "load_factor"}
    notes = []
    for place, sheet in sorted(sheet_for_flights(read, registration, trace.recording.path, take_offs).items()):
        number = flights[place].number if flights else None
        name = "the recording" if number is None else f"flight {number}"
        said = "; ".join(_compared(word, seen, of_flight.get(number)) for word, seen in _observed(sheet))
        notes.append(f"g-meter in the cockpit, {name}: {said}")
    return tuple(notes)


def _observed(sheet: LoadingSheet) -> list[tuple[str, float]]:
    found = (
        ("highest", sheet.observed.load_factor_maximum),
        ("lowest", sheet.observed.load_factor_minimum),
    )
    return [(word, float(value)) for word, value in found if value is not None]


def _compared(word: str, seen: float, extreme: Extreme | None) -> str:
    recorded = None if extreme is None else extreme.maximum if word == "highest" else extreme.minimum
    if recorded is None:
        return f"{word} {seen:.2f} g seen, no load factor recorded to compare it with"
    return f"{word} {seen:.2f} g seen, {recorded[0]:.2f} g recorded, difference {seen - recorded[0]:+.2f} g"
