"""Which flight is which: known by registration and overlapping time, else by the content of the recording."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from exceed.ledger.store import Row, Table
from exceed.ledger.stretch import SAME_TAKE_OFF, TAKEN_UP, epoch, overlap, registration_key, short_name

# the flights that ever bore a registration
BORNE = "(SELECT id FROM flights WHERE reg_key = :reg UNION SELECT flight_id FROM reassignments WHERE reg_key = :reg)"
# Only what the newest judgement of each recording says of its flights counts, and one that could tell them apart
# counts before one that could not (as without the aircraft file). For a stretch `s` of a judgement `j`.
NEWEST = (
    "NOT EXISTS (SELECT 1 FROM judgements later JOIN flight_stretches seen ON seen.judgement_id = later.id "
    "WHERE later.recording_id = j.recording_id AND ("
    "(seen.flight_number IS NOT NULL AND (s.flight_number IS NULL OR later.turn > j.turn)) OR "
    "(seen.flight_number IS NULL AND s.flight_number IS NULL AND later.turn > j.turn)))"
)


def place_flights(table: Table, recording: Row, recording_id: int, judgement_id: int) -> tuple[list[Row], Row]:
    """Link the flights that a new judgement shows to the ledger's flights, making those that are new.

    Returns the stretches (flight_id, flight_number, start_s, end_s) and counts: added, known, longer, clashes (list).
    """
    key = registration_key(recording["registration"])
    start = epoch(recording["clock"]["start"]) if recording["clock"] is not None else None
    counts: Row = {"added": 0, "known": 0, "longer": 0, "clashes": []}
    placed: list[Row] = []
    earlier = table.rows(
        "SELECT s.flight_id, s.start_s, s.end_s FROM flight_stretches s JOIN judgements j ON j.id = s.judgement_id "
        "WHERE j.recording_id = :recording AND j.id <> :judgement ORDER BY j.turn DESC, s.id",
        recording=recording_id, judgement=judgement_id,
    )  # fmt: skip
    for flight in recording["flights"]:
        stretch = _stretch(flight, start)
        found, clash = _find(table, stretch, key, earlier, {row["flight_id"] for row in placed}, recording_id)
        if clash is not None:
            counts["clashes"].append(clash)
        if found is None:
            found = _new(table, recording, stretch, key, apart=clash is not None)
            counts["added"] += 1
        else:
            counts["known"] += 1
            counts["longer"] += _reaches_further(table, found, stretch)
        table.add("flight_stretches", flight_id=found, judgement_id=judgement_id, **stretch)
        placed.append({"flight_id": found, **stretch})
    return placed, counts


def _stretch(flight: Row, clock_start: float | None) -> Row:
    absolute = clock_start is not None
    return {
        "flight_number": flight["flight"],
        "start_s": float(flight["start_s"]),
        "end_s": float(flight["end_s"]),
        "start_at": clock_start + flight["start_s"] if absolute and clock_start is not None else None,
        "end_at": clock_start + flight["end_s"] if absolute and clock_start is not None else None,
        "take_off_seen": int(flight["take_off_recorded"]),
        "landing_seen": int(flight["landing_recorded"]),
        "landings": flight["landings"],
    }


def _find(
    table: Table, stretch: Row, key: str, earlier: Sequence[Row], taken: set[int], recording_id: int
) -> tuple[int | None, str | None]:
    """The ledger's flight that this stretch belongs to; or what speaks against it."""
    span = (stretch["start_s"], stretch["end_s"])
    for row in earlier:
        if row["flight_id"] not in taken and overlap((row["start_s"], row["end_s"]), span) > 0.0:
            return int(row["flight_id"]), None
    if not key or stretch["start_at"] is None:
        return None, None
    at = (stretch["start_at"], stretch["end_at"])
    # the plus keeps the planner on the index of times: few stretches end after a new flight begins
    rows = table.rows(
        "SELECT s.*, f.flight_key, j.recording_id FROM flight_stretches s JOIN judgements j ON j.id = s.judgement_id "
        f"JOIN flights f ON f.id = s.flight_id WHERE +s.flight_id IN {BORNE} AND j.recording_id <> :recording "
        f"AND s.start_at <= :last AND s.end_at >= :first AND {NEWEST} ORDER BY s.id",
        reg=key, recording=recording_id, first=at[0] - TAKEN_UP, last=at[1] + TAKEN_UP,
    )  # fmt: skip
    best, most, clash = None, float("-inf"), None
    for row in rows:
        shared = overlap((row["start_at"], row["end_at"]), at)
        if not (shared > 0.0 or _taken_up(row, stretch)):
            continue
        if row["take_off_seen"] and stretch["take_off_seen"] and abs(row["start_at"] - at[0]) > SAME_TAKE_OFF:
            clash = row["flight_key"]
            continue
        if shared > most:
            best, most = int(row["flight_id"]), shared
    return best, (clash if best is None else None)


def _taken_up(one: Mapping[str, Any], other: Mapping[str, Any]) -> bool:
    """Does one stretch go on where the other broke off in the air?"""
    first, second = (one, other) if one["start_at"] <= other["start_at"] else (other, one)
    broken = not first["landing_seen"] and not second["take_off_seen"]
    numbered = first["flight_number"] is not None and second["flight_number"] is not None
    return broken and numbered and -TAKEN_UP <= second["start_at"] - first["end_at"] <= TAKEN_UP


def _reaches_further(table: Table, flight_id: int, stretch: Row) -> int:
    if stretch["start_at"] is None:
        return 0
    known = table.one(
        "SELECT min(start_at) AS first, max(end_at) AS last FROM flight_stretches WHERE flight_id = :id", id=flight_id
    )
    if known is None or known["first"] is None:
        return 0
    return int(stretch["start_at"] < known["first"] - 1.0 or stretch["end_at"] > known["last"] + 1.0)


def _new(table: Table, recording: Row, stretch: Row, key: str, *, apart: bool) -> int:
    name = short_name(recording["content_sha256"], stretch["flight_number"], stretch["start_s"])
    turn = 0
    while table.one("SELECT id FROM flights WHERE flight_key = :name", name=name) is not None:
        turn += 1
        name = short_name(recording["content_sha256"], stretch["flight_number"], stretch["start_s"], turn)
    return table.add("flights", flight_key=name, registration=recording["registration"], reg_key=key, apart=int(apart))


def flight_of(placed: Sequence[Row], event: Row) -> int | None:
    """The flight that an event belongs to: by number, else (before take-off, at and after landing) the nearest."""
    numbered = [row for row in placed if row["flight_number"] == event["flight"]]
    if event["flight"] is None and not numbered:
        numbered = list(placed)
    if not numbered:
        return None
    span = (event["start_s"], event["end_s"])
    return int(max(numbered, key=lambda row: overlap((row["start_s"], row["end_s"]), span))["flight_id"])
