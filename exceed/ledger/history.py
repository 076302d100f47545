"""The current state, read from rows that are only ever added: newest judgements, owners, decisions."""

from __future__ import annotations

import json
from collections import defaultdict
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field

from exceed.core.findings import CERTAINTIES, SEVERITIES
from exceed.ledger import stretch as st
from exceed.ledger.store import Row, Table

# verdicts, as the user gives them; the last three say that no exceedance took place
VERDICTS = ("agreed", "sensor-fault", "wrong-data", "not-an-exceedance")
DECIDED_AWAY = VERDICTS[1:]
# a current event is one that no later judgement has succeeded or removed
CURRENT = "NOT EXISTS (SELECT 1 FROM successions s WHERE s.earlier_id = e.id)"


@dataclass(frozen=True, slots=True)
class Filters:
    """What of a list is wanted. Times are epoch seconds; severity and certainty are the lowest wanted."""

    registration: str | None = None
    since: float | None = None
    until: float | None = None
    rule: str | None = None
    severity: str | None = None
    certainty: str | None = None
    state: str | None = None  # open, decided

    @property
    def key(self) -> str | None:
        return None if self.registration is None else st.registration_key(self.registration)

    def in_time(self, start: float | None, end: float | None) -> bool:
        """Does a stretch lie in the time wanted? One without a date does not, once a time is wanted."""
        if self.since is None and self.until is None:
            return True
        if start is None or end is None:
            return False
        return (self.since is None or end >= self.since) and (self.until is None or start < self.until)


@dataclass(frozen=True, slots=True)
class Owners:
    """Whose each flight is, and was: flight row -> registrations, oldest first."""

    names: Mapping[int, list[tuple[str | None, str]]]
    keys: Mapping[int, str]

    @classmethod
    def read(cls, table: Table) -> Owners:
        names: dict[int, list[tuple[str | None, str]]] = {}
        keys: dict[int, str] = {}
        for row in table.rows("SELECT id, flight_key, registration, reg_key FROM flights"):
            names[row["id"]] = [(row["registration"], row["reg_key"])]
            keys[row["id"]] = row["flight_key"]
        for row in table.rows("SELECT flight_id, registration, reg_key FROM reassignments ORDER BY id"):
            names[row["flight_id"]].append((row["registration"], row["reg_key"]))
        return cls(names, keys)

    def now(self, flight: int | None, otherwise: tuple[str | None, str]) -> tuple[str | None, str]:
        """Registration and its key, of a flight or of an event that belongs to none."""
        return otherwise if flight is None else self.names[flight][-1]

    def ever(self, flight: int | None, key: str) -> set[str]:
        return {key} if flight is None else {key, *(name for _, name in self.names[flight])}


@dataclass(slots=True)
class Decisions:
    """Decisions by rule and part; they attach to registration, rule and overlapping time."""

    rows: dict[tuple[str, str], list[Row]] = field(default_factory=lambda: defaultdict(list))

    @classmethod
    def read(cls, table: Table) -> Decisions:
        found = cls()
        sql = (
            "SELECT d.*, e.severity AS was_severity, e.certainty AS was_certainty, e.kind AS was_kind, "
            "e.judgement_id AS was_judgement FROM decisions d JOIN events e ON e.id = d.event_row ORDER BY d.id"
        )
        for row in table.rows(sql):
            found.rows[row["rule"], row["part"]].append(row)
        return found

    def of(self, event: Row, owners: Owners) -> Row | None:
        """The newest decision about an event's occurrence, and whether it was made on another judgement of it."""
        ever = owners.ever(event["flight_id"], event["reg_key"])
        for row in reversed(self.rows.get((event["rule"], event["part"]), [])):
            same = row["recording_id"] == event["recording_id"]
            if not same and (not row["reg_key"] or row["reg_key"] not in ever):
                continue
            if row["event_row"] != event["id"] and not st.same_occurrence(row, event, same_recording=same):
                continue
            carried = row["was_judgement"] != event["judgement_id"]
            was = {"severity": row["was_severity"], "kind": row["was_kind"]}
            return {
                "as": row["verdict"],
                "by": row["by_name"],
                "note": row["note"],
                "at": row["added_at"],
                "carried": carried,
                "about": {
                    "event": row["event_id"],
                    "severity": row["was_severity"],
                    "certainty": row["was_certainty"],
                    "undecided": row["was_kind"] == "undecided",
                },
                "worse_since": carried and st.worse(event, was),
            }
        return None


_EVENTS = (
    "SELECT e.*, j.recording_id, j.turn, j.tool, r.path, r.content_sha256, sc.scan_key, sc.added_at AS judged_at, "
    "(SELECT min(c.sha256) FROM copies c WHERE c.recording_id = r.id) AS sha256 "
    "FROM events e JOIN judgements j ON j.id = e.judgement_id JOIN recordings r ON r.id = j.recording_id "
    "JOIN scans sc ON sc.id = j.scan_id "
)


def event_rows(table: Table, only: Iterable[int] | None = None) -> list[Row]:
    """Current events, bodies still text; `only` gives the rows of these numbers, current or not."""
    if only is None:
        order = "e.start_at IS NULL, e.start_at, r.path, e.start_s, e.rule, e.id"
        return table.rows(f"{_EVENTS} WHERE {CURRENT} ORDER BY {order}")
    from exceed.ledger.store import chunks, named

    found: list[Row] = []
    for piece in chunks(sorted(set(only))):
        places, values = named(piece)
        found += table.rows(f"{_EVENTS} WHERE e.id IN ({places}) ORDER BY e.id", **values)
    return found


def at_least(word: str, least: str | None, order: tuple[str, ...]) -> bool:
    return least is None or order.index(word) >= order.index(least)


def open_event(row: Row, decision: Row | None) -> bool:
    """Is an event still to be decided? One that a newer judgement calls worse than what was decided is, again."""
    return decision is None or bool(decision["worse_since"])


def events(table: Table, filters: Filters) -> tuple[list[Row], int]:
    """The current events as the list shows them, and how many were left out for want of a date."""
    owners, decisions = Owners.read(table), Decisions.read(table)
    found: list[Row] = []
    undated = 0
    for row in event_rows(table):
        registration, key = owners.now(row["flight_id"], (row["registration"], row["reg_key"]))
        if filters.key is not None and key != filters.key:
            continue
        if filters.rule is not None and row["rule"] != filters.rule:
            continue
        if not at_least(row["severity"], filters.severity, SEVERITIES):
            continue
        if not at_least(row["certainty"], filters.certainty, CERTAINTIES):
            continue
        decision = decisions.of(row, owners)
        if filters.state is not None and open_event(row, decision) != (filters.state == "open"):
            continue
        if not filters.in_time(row["start_at"], row["end_at"]):
            undated += row["start_at"] is None
            continue
        found.append(shown(row, registration, owners, decision))
    return found, undated


def shown(row: Row, registration: str | None, owners: Owners, decision: Row | None) -> Row:
    """An event as the list gives it: the summary's fields, then where it comes from and what was decided."""
    body: Row = json.loads(row["body"])
    was = body["registration"]
    body["registration"] = registration
    return {
        **body,
        "undecided": row["kind"] == "undecided",
        "recorded_as": was if was != registration else None,
        "ledger_flight": owners.keys.get(row["flight_id"]),
        "recording": {"path": row["path"], "sha256": row["sha256"], "content_sha256": row["content_sha256"]},
        "judgement": {
            "scan": row["scan_key"],
            "turn": row["turn"],
            "tool": row["tool"],
            "recorded_at": row["judged_at"],
        },
        "decision": decision,
        "open": open_event(row, decision),
    }


def judgements(table: Table, filters: Filters) -> list[Row]:
    """Every judgement, oldest first: what it rests on, what it replaces, what it changed."""
    sql = (
        "SELECT j.*, r.path, r.content_sha256, r.clock_start, r.recorded_s, sc.scan_key, sc.added_at, "
        "p.turn AS replaced_turn, ps.scan_key AS replaced_scan FROM judgements j JOIN recordings r ON "
        "r.id = j.recording_id JOIN scans sc ON sc.id = j.scan_id LEFT JOIN judgements p ON p.id = j.replaces "
        "LEFT JOIN scans ps ON ps.id = p.scan_id ORDER BY j.id"
    )
    changes: dict[int, list[Row]] = defaultdict(list)
    for row in table.rows(
        "SELECT s.judgement_id, s.kind, s.difference, e.event_id AS earlier, e.rule, l.event_id AS later "
        "FROM successions s JOIN events e ON e.id = s.earlier_id LEFT JOIN events l ON l.id = s.later_id "
        "WHERE s.kind <> 'same' ORDER BY s.id"
    ):
        changes[row.pop("judgement_id")].append(row)
    added = (
        "SELECT e.judgement_id, e.event_id AS later, e.rule FROM events e JOIN judgements j ON j.id = e.judgement_id "
    )
    for row in table.rows(
        added + "WHERE j.turn > 1 AND NOT EXISTS (SELECT 1 FROM successions s WHERE s.later_id = e.id) ORDER BY e.id"
    ):
        changes[row.pop("judgement_id")].append({"kind": "added", "difference": "", "earlier": None, **row})
    found = []
    for row in table.rows(sql):
        if filters.key is not None and st.registration_key(row["registration"]) != filters.key:
            continue
        start = row["clock_start"]
        if not filters.in_time(start, None if start is None else start + row["recorded_s"]):
            continue
        replaces = None if row["replaces"] is None else {"scan": row["replaced_scan"], "turn": row["replaced_turn"]}
        found.append(
            {
                "recording": {"path": row["path"], "content_sha256": row["content_sha256"]},
                "registration": row["registration"],
                "turn": row["turn"],
                "scan": row["scan_key"],
                "recorded_at": row["added_at"],
                "tool": row["tool"],
                "judged_with": json.loads(row["judged_with"]),
                "replaces": replaces,
                "changes": changes.get(row["id"], []),
            }
        )
    return found
