"""Which inspection an occurrence has asked for already, and which it asks for now."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from exceed.ledger import stretch as st
from exceed.ledger.store import Row, Table, chunks, named, utc_now


def place_inspections(table: Table, inspections: Sequence[Row], rows_of: Mapping[str, int]) -> dict[str, int]:
    """Add a summary's inspections that are new; `rows_of` gives the row of each of its events. Returns counts."""
    counts = {"added": 0, "known": 0}
    for inspection in inspections:
        _place(table, inspection, rows_of, counts)
    return counts


def _place(table: Table, inspection: Row, rows_of: Mapping[str, int], counts: dict[str, int]) -> None:
    """An inspection is known by its rule, its task, and the occurrences that ask for it."""
    rows = [rows_of[name] for name in inspection["events"] if name in rows_of]
    there = _asked(table, rows, inspection)
    fresh = [row for row in dict.fromkeys(rows) if row not in there]
    if not fresh:
        counts["known"] += bool(rows)
        return
    still_open = [one for one in dict.fromkeys(there.values()) if not _closed(table, one)]
    known = False
    # a flight that was reassigned asks its duties of the aeroplane it is of now
    for key, (registration, events) in _owners(table, fresh).items():
        target = next((one for one in still_open if _of(table, one) == key), None)
        known |= target is not None
        if target is None:
            target = _new_inspection(table, inspection, (registration, key), events)
            counts["added"] += 1
        table.add_many("inspection_events", [{"inspection_row": target, "event_row": row} for row in events])
    counts["known"] += known


def _owners(table: Table, rows: Sequence[int]) -> dict[str, tuple[str | None, list[int]]]:
    """Events by the key of the registration that they go under now, which is given too as it is written."""
    found: dict[str, tuple[str | None, list[int]]] = {}
    for piece in chunks(list(rows)):
        places, values = named(piece)
        for row in table.rows(
            "SELECT e.id, e.registration, e.reg_key, r.registration AS now, r.reg_key AS now_key FROM events e "
            "LEFT JOIN reassignments r ON r.id = (SELECT max(m.id) FROM reassignments m "
            f"WHERE m.flight_id = e.flight_id) WHERE e.id IN ({places}) ORDER BY e.id",
            **values,
        ):
            moved = row["now_key"] is not None
            owner = (row["now"], row["now_key"]) if moved else (row["registration"], row["reg_key"])
            found.setdefault(owner[1], (owner[0], []))[1].append(row["id"])
    return found


def _of(table: Table, inspection: int) -> str:
    row = table.one("SELECT reg_key FROM inspections WHERE id = :id", id=inspection)
    return str(row["reg_key"]) if row is not None else ""


def _asked(table: Table, rows: Sequence[int], inspection: Row) -> dict[int, int]:
    """Event row -> the inspection that its occurrence, in any of its judgements, has asked for already."""
    judged_before: set[int] = set()
    for piece in chunks(sorted(set(rows))):
        places, values = named(piece)
        for end in ("earlier_id", "later_id"):
            sql = f"SELECT {end} AS row_id FROM successions WHERE {end} IN ({places})"
            judged_before |= {found["row_id"] for found in table.rows(sql, **values)}
    kin = {row: sorted(lineage(table, row)) if row in judged_before else [row] for row in set(rows)}
    asked: dict[int, int] = {}
    for piece in chunks(sorted({one for family in kin.values() for one in family})):
        places, values = named(piece)
        for found in table.rows(
            "SELECT ie.event_row, i.id FROM inspections i JOIN inspection_events ie ON ie.inspection_row = i.id "
            f"WHERE ie.event_row IN ({places}) AND i.rule = :rule AND i.task = :task ORDER BY i.id",
            rule=inspection["rule"], task=inspection["task"], **values,
        ):  # fmt: skip
            asked[found["event_row"]] = int(found["id"])
    newest = {row: max((asked[one] for one in family if one in asked), default=0) for row, family in kin.items()}
    return {row: found for row, found in newest.items() if found}


def _new_inspection(table: Table, inspection: Row, owner: tuple[str | None, str], fresh: Sequence[int]) -> int:
    name = inspection["id"]
    while table.one("SELECT id FROM inspections WHERE inspection_id = :name", name=name) is not None:
        name = st.short_name(name, *fresh)
    own = owner[1] == st.registration_key(inspection["registration"])
    return table.add(
        "inspections", inspection_id=name, registration=owner[0], reg_key=owner[1],
        serial=inspection["serial"] if own else None, rule=inspection["rule"], task=inspection["task"],
        ata=inspection["ata"], due_before=inspection.get("before"), added_at=utc_now(),
    )  # fmt: skip


def lineage(table: Table, row: int) -> set[int]:
    """An event's row and those of all earlier and later judgements of the same occurrence."""
    found, front = {row}, {row}
    while front:
        places, values = named(sorted(front)[:500])
        rest = set(sorted(front)[500:])
        links = table.rows(
            f"SELECT earlier_id, later_id FROM successions WHERE earlier_id IN ({places}) OR later_id IN ({places})",
            **values,
        )
        linked = {one[end] for one in links for end in ("earlier_id", "later_id") if one[end] is not None}
        front = rest | (linked - found)
        found |= linked
    return found


def _closed(table: Table, inspection: int) -> bool:
    last = table.one("SELECT kind FROM inspection_acts WHERE inspection_row = :id ORDER BY id DESC", id=inspection)
    return last is not None and last["kind"] == "close"
