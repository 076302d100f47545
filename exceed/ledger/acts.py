"""What people add to the ledger: totals, decisions, closings, reassignments. Each is a new row."""

from __future__ import annotations

import json
import math

from exceed.errors import UsageError
from exceed.ledger import stretch as st
from exceed.ledger.history import Decisions, Owners, event_rows
from exceed.ledger.inspections import about, owned
from exceed.ledger.schema import BLANKABLE
from exceed.ledger.store import Ledger, Row, Table, utc_now
from exceed.ledger.totals import airframes
from exceed.report.show import iso_utc

_LEAST = 4


def _some(name: str, text: str | None) -> str:
    if text is None or not text.strip():
        raise UsageError.one(name, "is empty", "a text", "say it")
    return text.strip()


def _named(table: Table, sql: str, name: str, what: str, listing: str) -> list[Row]:
    """Rows whose name is, or alone begins with, what the user wrote. Raises UsageError."""
    wanted = name.strip().lower()
    if not wanted.isascii() or not wanted.isalnum() or len(wanted) < _LEAST:
        raise UsageError.one(name, f"is no {what}", f"at least {_LEAST} letters of an id", f"'{listing}' lists them")
    found = table.rows(sql, name=wanted, prefix=wanted + "%")
    if not found:
        raise UsageError.one(name, f"there is no such {what}", f"an id of the {what}s", f"'{listing}' lists them")
    names = sorted({row["name"] for row in found})
    if len(names) > 1 and wanted not in names:
        raise UsageError.one(name, f"is the beginning of {len(names)}", ", ".join(names[:6]), "write more of it")
    return [row for row in found if row["name"] == (wanted if wanted in names else names[0])]


def find_event(table: Table, name: str) -> Row:
    """The newest judgement of the event of this id, whichever of its judgements or downloads the id is of."""
    sql = (
        "SELECT id, event_id AS name FROM events WHERE event_id LIKE :prefix UNION "
        "SELECT event_row AS id, event_id AS name FROM sightings WHERE event_id LIKE :prefix ORDER BY id DESC"
    )
    row = _named(table, sql, name, "event", "exceed ledger events")[0]["id"]
    while True:
        later = table.one(
            "SELECT later_id FROM successions WHERE earlier_id = :row AND later_id IS NOT NULL ORDER BY id DESC",
            row=row,
        )
        if later is None:
            return event_rows(table, [row])[0]
        row = later["later_id"]


def decide(ledger: Ledger, event: str, verdict: str, by: str, note: str | None) -> Row:
    """A decision about an event's occurrence: registration, rule and time, whatever id it has now or later."""
    by = _some("--by", by)

    def work(table: Table) -> Row:
        row = find_event(table, event)
        owners = Owners.read(table)
        registration, key = owners.now(row["flight_id"], (row["registration"], row["reg_key"]))
        earlier = Decisions.read(table).of(row, owners)
        table.add(
            "decisions", event_row=row["id"], event_id=row["event_id"], reg_key=key, rule=row["rule"],
            part=row["part"], recording_id=row["recording_id"], start_s=row["start_s"], end_s=row["end_s"],
            start_at=row["start_at"], end_at=row["end_at"], verdict=verdict, by_name=by, note=note,
            added_at=utc_now(),
        )  # fmt: skip
        body = json.loads(row["body"])
        gone = table.one("SELECT id FROM successions WHERE earlier_id = :row", row=row["id"]) is not None
        return {
            "event": row["event_id"], "asked": event, "registration": registration, "title": body["title"],
            "start": body["start"], "start_s": body["start_s"], "as": verdict, "earlier": earlier, "removed": gone,
        }  # fmt: skip

    return ledger.writing(work)


def _find_inspection(table: Table, name: str) -> Row:
    sql = "SELECT *, inspection_id AS name FROM inspections WHERE inspection_id LIKE :prefix"
    return _named(table, sql, name, "inspection", "exceed ledger inspections")[0]


def close(ledger: Ledger, inspection: str, by: str, reference: str, note: str | None = None) -> Row:
    """An inspection was done, by whom and where that is written."""
    return _act(ledger, inspection, "close", _some("--by", by), _some("--reference", reference), note)


def reopen(ledger: Ledger, inspection: str, by: str, note: str | None) -> Row:
    """A closed inspection is due again: a new row, the closing stays."""
    return _act(ledger, inspection, "reopen", _some("--by", by), None, note)


def _act(ledger: Ledger, inspection: str, kind: str, by: str, reference: str | None, note: str | None) -> Row:
    def work(table: Table) -> Row:
        row = _find_inspection(table, inspection)
        last = table.one("SELECT * FROM inspection_acts WHERE inspection_row = :id ORDER BY id DESC", id=row["id"])
        closed = last is not None and last["kind"] == "close"
        name = row["inspection_id"]
        if kind == "reopen" and not closed:
            raise UsageError.one(name, "is open", "a closed inspection", "nothing to do")
        events = about(table, row["id"])
        known = {one[0] for one in json.loads(last["about"])} if closed and last is not None else set()
        if kind == "close" and closed and {one[0] for one in events} <= known:
            raise UsageError.one(
                name, "is closed already", "an open inspection", f"'exceed ledger reopen {name}' opens it again"
            )
        table.add(
            "inspection_acts", inspection_row=row["id"], kind=kind, by_name=by, reference=reference, note=note,
            about=json.dumps(events), added_at=utc_now(),
        )  # fmt: skip
        return {"id": name, "registration": row["registration"], "task": row["task"], "kind": kind}

    return ledger.writing(work)


def set_totals(
    ledger: Ledger, registration: str, hours: float | None, landings: int | None, at: float, by: str | None = None
) -> Row:
    """An airframe's total hours and landings as they stood at an instant (epoch s)."""
    key = st.registration_key(registration)
    if not key:
        raise UsageError.one(registration or "REG", "is no registration", "letters and digits", "write it as painted")
    if hours is None and landings is None:
        raise UsageError.one("airframe", "nothing is set", "--hours, --landings or both", "add --hours 1234.5")
    if hours is not None and not (math.isfinite(hours) and 0.0 <= hours < 1e6):
        raise UsageError.one("--hours", f"{hours} cannot be", "0 to 999999 h", "correct it")
    if landings is not None and not 0 <= landings < 10**7:
        raise UsageError.one("--landings", f"{landings} cannot be", "0 to 9999999", "correct it")

    def work(table: Table) -> Row:
        earlier = table.rows(
            "SELECT hours, landings, valid_at FROM airframe_totals WHERE reg_key = :reg AND valid_at <= :at "
            "ORDER BY valid_at DESC, id DESC",
            reg=key, at=at,
        )  # fmt: skip
        frame = airframes(table, Owners.read(table)).get(key)
        notes = []
        for name, value in (("hours", hours), ("landings", landings)):
            before = next((row for row in earlier if row[name] is not None), None)
            if value is not None and before is not None and value < before[name]:
                notes.append(
                    f"{value:g} {name} is less than the {before[name]:g} set for {iso_utc(before['valid_at'])}"
                )
        if frame is None:
            notes.append("the ledger has no flight of this registration yet")
        table.add("airframe_totals", registration=registration, reg_key=key, hours=hours, landings=landings,
                  valid_at=at, by_name=by, note=None, added_at=utc_now())  # fmt: skip
        return {"registration": registration, "hours": hours, "landings": landings, "at": iso_utc(at, trim=True),
                "notes": notes}  # fmt: skip

    return ledger.writing(work)


def reassign(ledger: Ledger, flight: str, to: str, by: str | None = None, note: str | None = None) -> Row:
    """A flight is another aeroplane's: its events go with it, and what they ask for is asked of that aeroplane."""
    key = st.registration_key(to)
    if not key:
        raise UsageError.one(to or "--to", "is no registration", "letters and digits", "write it as painted")

    def work(table: Table) -> Row:
        sql = "SELECT id, flight_key AS name FROM flights WHERE flight_key LIKE :prefix"
        row = _named(table, sql, flight, "flight", "exceed ledger flights")[0]
        owners = Owners.read(table)
        was, was_key = owners.names[row["id"]][-1]
        if was_key == key:
            raise UsageError.one(row["name"], f"is {to}'s already", "another registration", "nothing to do")
        frames = airframes(table, owners)
        moved = (
            next((one for one in frames[was_key].flights if one.key == row["name"]), None)
            if was_key in frames
            else None
        )
        clash = [
            one.key
            for one in (frames[key].flights if key in frames else [])
            for span in (moved.spans if moved is not None else ())
            if any(min(span[1], other[1]) > max(span[0], other[0]) for other in one.spans)
        ]
        table.add("reassignments", flight_id=row["id"], registration=to, reg_key=key, by_name=by, note=note,
                  added_at=utc_now())  # fmt: skip
        inspections = _move_inspections(table, row["id"], to, key)
        return {"flight": row["name"], "from": was, "to": to, "clashes": sorted(set(clash)), "inspections": inspections}

    return ledger.writing(work)


def _move_inspections(table: Table, flight: int, registration: str, key: str) -> list[str]:
    """The new owner gets an inspection of its own for each that the flight's events had asked for."""
    rows = table.rows(
        "SELECT ie.inspection_row, ie.event_row, i.* FROM inspection_events ie JOIN inspections i ON "
        "i.id = ie.inspection_row JOIN events e ON e.id = ie.event_row WHERE e.flight_id = :flight "
        "AND i.reg_key <> :reg ORDER BY ie.id",
        flight=flight, reg=key,
    )  # fmt: skip
    owners = Owners.read(table)
    by_inspection: dict[int, list[Row]] = {}
    for row in rows:
        by_inspection.setdefault(row["inspection_row"], []).append(row)
    made = []
    for linked in by_inspection.values():
        first = linked[0]
        events = [row["event_row"] for row in linked]
        there = table.one(
            "SELECT i.id FROM inspections i JOIN inspection_events ie ON ie.inspection_row = i.id "
            "WHERE i.reg_key = :reg AND i.rule = :rule AND i.task = :task AND ie.event_row = :event",
            reg=key, rule=first["rule"], task=first["task"], event=events[0],
        )  # fmt: skip
        if there is not None or not any(owned(row, owners, key) for row in event_rows(table, events)):
            continue
        name = st.short_name(first["inspection_id"], key, *events)
        target = table.add(
            "inspections", inspection_id=name, registration=registration, reg_key=key, serial=None,
            rule=first["rule"], task=first["task"], ata=first["ata"], due_before=first["due_before"],
            added_at=utc_now(),
        )  # fmt: skip
        for event in events:
            table.add("inspection_events", inspection_row=target, event_row=event)
        made.append(name)
    return made


def blank_names(ledger: Ledger, before: str) -> tuple[dict[str, int], bool]:
    """Blank names and notes of acts before an instant (UTC text). No row goes.

    Returns how many rows of each table were blanked, and whether no older page of the file can hold them any more.
    """

    def work(table: Table) -> dict[str, int]:
        counts = {}
        for name, columns in BLANKABLE.items():
            assignments = ", ".join(f"{column} = NULL" for column in columns)
            filled = " OR ".join(f"{column} IS NOT NULL" for column in columns)
            rows = table.rows(
                f"UPDATE {name} SET {assignments} WHERE added_at < :before AND ({filled}) RETURNING id", before=before
            )
            counts[name] = len(rows)
        return counts

    return ledger.writing(work), ledger.forget()
