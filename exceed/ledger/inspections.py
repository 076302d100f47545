"""Which inspections are due, what they wait for, and before when they must be done."""

from __future__ import annotations

import json
import re
from collections import defaultdict
from datetime import UTC, datetime

from exceed.ledger import stretch as st
from exceed.ledger.history import DECIDED_AWAY, Decisions, Filters, Owners, event_rows
from exceed.ledger.store import Row, Table
from exceed.ledger.totals import Airframe, airframes
from exceed.report.show import count, iso_utc

_HOURS = re.compile(r"(\d+(?:\.\d+)?)\s*(?:flight |flying )?(?:h|hr|hrs|hours?)\b", re.IGNORECASE)
_LANDINGS = re.compile(r"(\d+)\s*(?:landings?|cycles?)\b", re.IGNORECASE)
_DAYS = re.compile(r"(\d+)\s*days?\b", re.IGNORECASE)
_FLIGHTS = re.compile(r"\bnext flight\b|\bfurther flight\b", re.IGNORECASE)
_DATE = re.compile(r"\b(\d{4}-\d{2}-\d{2})\b")
_DAY = 86400.0


def inspections(table: Table, filters: Filters, now: float) -> list[Row]:
    """Every inspection with its status: due, to_be_decided or closed. `now` in epoch seconds."""
    owners, decisions = Owners.read(table), Decisions.read(table)
    frames = airframes(table, owners)
    followers = _Followers(table)
    links: dict[int, list[int]] = defaultdict(list)
    for row in table.rows("SELECT inspection_row, event_row FROM inspection_events ORDER BY id"):
        links[row["inspection_row"]].append(row["event_row"])
    acts: dict[int, Row] = {
        row["inspection_row"]: row for row in table.rows("SELECT * FROM inspection_acts ORDER BY id")
    }
    asked = [one for rows in links.values() for one in rows]
    events = {row["id"]: row for row in event_rows(table, [*asked, *followers.all_after(asked)])}
    found = []
    for row in table.rows("SELECT * FROM inspections ORDER BY id"):
        if filters.key not in (None, row["reg_key"]) or filters.rule not in (None, row["rule"]):
            continue
        mine = [one for one in links[row["id"]] if owned(events[one], owners, row["reg_key"])]
        current = [events[one] for one in followers.current(mine)]
        if not _wanted(filters, [*current, *(events[one] for one in mine)]):
            continue
        found.append(_shown(row, mine, current, events, acts.get(row["id"]), owners, decisions, frames, now))
    order = {"due": 0, "to_be_decided": 1, "closed": 2}
    found.sort(key=lambda one: (one["registration"] or "", order[one["status"]]))
    if filters.state is not None:
        return [one for one in found if (one["status"] != "closed") == (filters.state == "open")]
    return found


def owned(event: Row, owners: Owners, key: str) -> bool:
    """Is an event (still) that aeroplane's?"""
    return owners.now(event["flight_id"], (event["registration"], event["reg_key"]))[1] == key


def _wanted(filters: Filters, rows: list[Row]) -> bool:
    if filters.since is None and filters.until is None:
        return True
    return any(filters.in_time(row["start_at"], row["end_at"]) for row in rows)


class _Followers:
    """From each event to what later judgements made of it."""

    def __init__(self, table: Table) -> None:
        self._later: dict[int, list[int | None]] = defaultdict(list)
        for row in table.rows("SELECT earlier_id, later_id FROM successions ORDER BY id"):
            self._later[row["earlier_id"]].append(row["later_id"])

    def current(self, rows: list[int]) -> list[int]:
        """The current events that these have become; removed ones are gone."""
        found: dict[int, None] = {}
        front = list(rows)
        seen: set[int] = set()
        while front:
            row = front.pop(0)
            if row in seen:
                continue
            seen.add(row)
            if row not in self._later:
                found[row] = None
            front += [one for one in self._later.get(row, []) if one is not None]
        return list(found)

    def all_after(self, rows: list[int]) -> set[int]:
        found: set[int] = set()
        front = list(rows)
        while front:
            for one in self._later.get(front.pop(), []):
                if one is not None and one not in found:
                    found.add(one)
                    front.append(one)
        return found


def about(table: Table, inspection: int) -> list[list[object]]:
    """What an inspection's events are now: row, severity, kind; kept with the act of closing it."""
    links = table.rows("SELECT event_row FROM inspection_events WHERE inspection_row = :id", id=inspection)
    current = _Followers(table).current([row["event_row"] for row in links])
    return [[row["id"], row["severity"], row["kind"]] for row in event_rows(table, current)]


def _shown(
    row: Row,
    mine: list[int],
    current: list[Row],
    events: dict[int, Row],
    act: Row | None,
    owners: Owners,
    decisions: Decisions,
    frames: dict[str, Airframe],
    now: float,
) -> Row:
    notes: list[str] = []
    status = _status(mine, current, act, owners, decisions, notes)
    closed = act is not None and act["kind"] == "close"
    first = min(
        (events[one] for one in mine), key=lambda one: (one["start_at"] is None, one["start_at"] or 0.0), default=None
    )
    due = None
    if first is not None and status != "closed":
        due = resolve(row["due_before"], first["start_at"], first["end_at"], frames.get(row["reg_key"]), now)
    return {
        "id": row["inspection_id"],
        "registration": row["registration"],
        "serial": row["serial"],
        "status": status,
        "task": row["task"],
        "ata": row["ata"],
        "rule": row["rule"],
        "before": row["due_before"],
        "due": due,
        "events": [one["event_id"] for one in current] or [events[one]["event_id"] for one in mine],
        "closed_by": act["by_name"] if closed and act is not None else None,
        "closed_at": act["added_at"] if closed and act is not None else None,
        "reference": act["reference"] if closed and act is not None else None,
        "notes": notes,
    }


def _status(
    mine: list[int], current: list[Row], act: Row | None, owners: Owners, decisions: Decisions, notes: list[str]
) -> str:
    """due, to_be_decided or closed. Only a person closes; what speaks against a duty asks for a decision."""
    if not mine:
        notes.append("its flights were reassigned to another registration; the inspection is listed there")
        return "closed"
    if act is not None and act["kind"] == "close":
        # rows of a judgement later than the closing, judged worse than anything that was known then
        known = {one[0] for one in json.loads(act["about"])}
        before = [{"severity": one[1], "kind": one[2]} for one in json.loads(act["about"])]
        later = [row for row in current if row["id"] not in known]
        if any(all(st.worse(row, old) for old in before) for row in later if before):
            notes.append("closed, but a newer judgement finds it worse than what was inspected: decide again")
            return "to_be_decided"
        return "closed"
    if act is not None:
        notes.append(f"reopened {act['added_at']}")
    if not current:
        notes.append("the newest judgement no longer finds its events: decide, and close it")
        return "to_be_decided"
    verdicts = [decisions.of(row, owners) for row in current]
    standing = [
        row
        for row, verdict in zip(current, verdicts, strict=True)
        if verdict is None or verdict["as"] not in DECIDED_AWAY or verdict["worse_since"]
    ]
    if not standing:
        notes.append("all its events were decided to be no exceedance: close it with that reference")
        return "to_be_decided"
    agreed = {
        row["id"] for row, verdict in zip(current, verdicts, strict=True) if verdict and verdict["as"] == "agreed"
    }
    return "due" if any(row["kind"] == "event" or row["id"] in agreed for row in standing) else "to_be_decided"


def resolve(
    before: str | None, start: float | None, end: float | None, frame: Airframe | None, now: float
) -> Row | None:
    """What `before` (words, hours, landings, days or a date) means for this airframe.

    Returns {kind, words, passed (None: not known), at (hours, landings or date), left}; None where nothing is said.
    """
    if before is None:
        return None
    if found := _DATE.search(before):
        try:
            limit = datetime.fromisoformat(found.group(1)).replace(tzinfo=UTC).timestamp() + _DAY
        except ValueError:
            return _due("words", before, None, None, None)
        return _due(
            "date",
            f"before {found.group(1)}",
            limit - _DAY <= now,
            found.group(1),
            round((limit - _DAY - now) / _DAY, 1),
        )
    if found := _DAYS.search(before):
        if end is None:
            return _due("date", f"{before} (the event has no date)", None, None, None)
        limit = end + int(found.group(1)) * _DAY
        date = (iso_utc(limit) or "")[:10]
        return _due("date", f"by {date}", limit < now, date, round((limit - now) / _DAY, 1))
    for kind, pattern in (("hours", _HOURS), ("landings", _LANDINGS)):
        if found := pattern.search(before):
            return _by_total(kind, before, float(found.group(1)), end, frame)
    if _FLIGHTS.search(before):
        if start is None or end is None or frame is None:
            return _due("next flight", f"{before} (the event has no date)", None, None, None)
        since = frame.flights_after(end)
        words = before if not since else f"{before}; {count(since, 'flight')} flown since"
        return _due("next flight", words, since > 0, None, None)
    return _due("words", before, None, None, None)


def _by_total(kind: str, before: str, allowed: float, end: float | None, frame: Airframe | None) -> Row:
    """So many hours or landings after the event; with totals set, also where the airframe's own count then stands."""
    unit = "h" if kind == "hours" else "landings"
    if end is None or frame is None:
        return _due(kind, f"{before} (the event has no date)", None, None, None)
    used = frame.hours_flown(end) if kind == "hours" else float(frame.landings_made(end))
    left = round(allowed - used, 2)
    total = frame.total(kind, end)
    words = f"{before}: {left:g} {unit} left of what the ledger saw flown"
    if total is None:
        return _due(kind, words + ", airframe totals not set", left < 0, None, left)
    limit = round(total + allowed, 2)
    now_total = frame.total(kind)
    left = round(limit - (now_total if now_total is not None else 0.0), 2)
    words = f"at {limit:g} {unit} on the airframe, {left:g} left"
    return _due(kind, words, left < 0, limit, left)


def _due(kind: str, words: str, passed: bool | None, at: float | str | None, left: float | None) -> Row:
    return {"kind": kind, "words": words, "passed": passed, "at": at, "left": left}
