"""The ledger's tables, and the steps from each version of them to the next.

Rows are only added. The database itself refuses to delete a row, or to change anything but a name or a note, so that
no later program can do it by mistake. Each step is text, never changed once released: the next version is a new step.
"""

from __future__ import annotations

from dataclasses import dataclass

# marks an SQLite file as a ledger of ours ("EXLG")
APPLICATION_ID = 0x45584C47
# on a server the tables have a schema of their own, beside whatever else the database holds
SERVER_SCHEMA = "exceed_ledger"


@dataclass(frozen=True, slots=True)
class Dialect:
    """How one database writes what differs: key column, double precision, end of a table, and the two guards."""

    name: str
    key: str
    real: str
    end: str
    before: tuple[str, ...]
    keep_rows: str
    keep_columns: str


SQLITE = Dialect(
    name="sqlite",
    key="INTEGER PRIMARY KEY AUTOINCREMENT",
    real="REAL",
    end=" STRICT",
    before=(f"PRAGMA application_id = {APPLICATION_ID}",),
    keep_rows=(
        "CREATE TRIGGER {table}_keep BEFORE DELETE ON {table} "
        "BEGIN SELECT RAISE(ABORT, 'rows of the ledger are never deleted'); END"
    ),
    keep_columns=(
        "CREATE TRIGGER {table}_fixed BEFORE UPDATE OF {columns} ON {table} "
        "BEGIN SELECT RAISE(ABORT, 'rows of the ledger are never changed'); END"
    ),
)
POSTGRESQL = Dialect(
    name="postgresql",
    key="BIGINT GENERATED ALWAYS AS IDENTITY PRIMARY KEY",
    real="DOUBLE PRECISION",
    end="",
    before=(
        "CREATE FUNCTION refuse_change() RETURNS trigger LANGUAGE plpgsql AS "
        "$$ BEGIN RAISE EXCEPTION 'rows of the ledger are never deleted or changed'; END $$",
    ),
    keep_rows="CREATE TRIGGER {table}_keep BEFORE DELETE ON {table} FOR EACH ROW EXECUTE FUNCTION refuse_change()",
    keep_columns=(
        "CREATE TRIGGER {table}_fixed BEFORE UPDATE OF {columns} ON {table} "
        "FOR EACH ROW EXECUTE FUNCTION refuse_change()"
    ),
)
DIALECTS = {one.name: one for one in (SQLITE, POSTGRESQL)}

# name -> columns, constraints; `key`, `real` as the dialect has them. *_at of acts: UTC text; start_at, end_at: epoch s
_FIRST: dict[str, tuple[str, ...]] = {
    "schema_version": ("id {key}", "version INTEGER NOT NULL UNIQUE", "applied_at TEXT NOT NULL"),
    # one call of `exceed scan --ledger` that added something
    "scans": (
        "id {key}", "scan_key TEXT NOT NULL UNIQUE", "created TEXT NOT NULL", "tool TEXT NOT NULL",
        "operator TEXT", "added_at TEXT NOT NULL",
    ),
    "recordings": (
        "id {key}", "content_sha256 TEXT NOT NULL UNIQUE", "path TEXT NOT NULL", "row_count INTEGER NOT NULL",
        "recorded_s {real} NOT NULL", "clock_start {real}", "scan_id INTEGER NOT NULL REFERENCES scans(id)",
    ),
    # the files, packed or plain, that hold one recording
    "copies": (
        "id {key}", "recording_id INTEGER NOT NULL REFERENCES recordings(id)", "sha256 TEXT NOT NULL",
        "UNIQUE (recording_id, sha256)",
    ),
    "judgements": (
        "id {key}", "recording_id INTEGER NOT NULL REFERENCES recordings(id)", "turn INTEGER NOT NULL",
        "scan_id INTEGER NOT NULL REFERENCES scans(id)", "replaces INTEGER REFERENCES judgements(id)",
        "registration TEXT", "limits TEXT NOT NULL", "tool TEXT NOT NULL", "judged_with TEXT NOT NULL",
        "rules_sha256 TEXT NOT NULL", "result_sha256 TEXT NOT NULL", "assessment TEXT NOT NULL",
        "UNIQUE (recording_id, turn)",
    ),
    "flights": (
        "id {key}", "flight_key TEXT NOT NULL UNIQUE", "registration TEXT", "reg_key TEXT NOT NULL",
        "apart INTEGER NOT NULL",
    ),
    # where a judgement saw a flight, or a part of one, in its recording
    "flight_stretches": (
        "id {key}", "flight_id INTEGER NOT NULL REFERENCES flights(id)",
        "judgement_id INTEGER NOT NULL REFERENCES judgements(id)", "flight_number INTEGER",
        "start_s {real} NOT NULL", "end_s {real} NOT NULL", "start_at {real}", "end_at {real}",
        "take_off_seen INTEGER NOT NULL", "landing_seen INTEGER NOT NULL", "landings INTEGER",
    ),
    "reassignments": (
        "id {key}", "flight_id INTEGER NOT NULL REFERENCES flights(id)", "registration TEXT NOT NULL",
        "reg_key TEXT NOT NULL", "by_name TEXT", "note TEXT", "added_at TEXT NOT NULL",
    ),
    "events": (
        "id {key}", "event_id TEXT NOT NULL", "judgement_id INTEGER NOT NULL REFERENCES judgements(id)",
        "flight_id INTEGER REFERENCES flights(id)", "kind TEXT NOT NULL CHECK (kind IN ('event', 'undecided'))",
        "rule TEXT NOT NULL", "part TEXT NOT NULL", "registration TEXT", "reg_key TEXT NOT NULL",
        "start_s {real} NOT NULL", "end_s {real} NOT NULL", "start_at {real}", "end_at {real}",
        "severity TEXT NOT NULL", "certainty TEXT NOT NULL", "body TEXT NOT NULL", "UNIQUE (judgement_id, event_id)",
    ),
    # an event that a later judgement of the same stretch gave anew, or (later_id null) no longer found
    "successions": (
        "id {key}", "earlier_id INTEGER NOT NULL REFERENCES events(id)", "later_id INTEGER REFERENCES events(id)",
        "judgement_id INTEGER NOT NULL REFERENCES judgements(id)",
        "kind TEXT NOT NULL CHECK (kind IN ('same', 'changed', 'removed'))", "difference TEXT NOT NULL",
        "UNIQUE (earlier_id, later_id)",
    ),
    # the same event seen in another download: its id there
    "sightings": (
        "id {key}", "event_row INTEGER NOT NULL REFERENCES events(id)",
        "judgement_id INTEGER NOT NULL REFERENCES judgements(id)", "event_id TEXT NOT NULL",
        "UNIQUE (judgement_id, event_id)",
    ),
    "decisions": (
        "id {key}", "event_row INTEGER NOT NULL REFERENCES events(id)", "event_id TEXT NOT NULL",
        "reg_key TEXT NOT NULL", "rule TEXT NOT NULL", "part TEXT NOT NULL",
        "recording_id INTEGER NOT NULL REFERENCES recordings(id)",
        "start_s {real} NOT NULL", "end_s {real} NOT NULL", "start_at {real}", "end_at {real}",
        "verdict TEXT NOT NULL", "by_name TEXT", "note TEXT", "added_at TEXT NOT NULL",
    ),
    "inspections": (
        "id {key}", "inspection_id TEXT NOT NULL UNIQUE", "registration TEXT", "reg_key TEXT NOT NULL", "serial TEXT",
        "rule TEXT NOT NULL", "task TEXT NOT NULL", "ata TEXT", "due_before TEXT", "added_at TEXT NOT NULL",
    ),
    "inspection_events": (
        "id {key}", "inspection_row INTEGER NOT NULL REFERENCES inspections(id)",
        "event_row INTEGER NOT NULL REFERENCES events(id)", "UNIQUE (inspection_row, event_row)",
    ),
    # `about` is what the events were when it was closed: event rows and their severities
    "inspection_acts": (
        "id {key}", "inspection_row INTEGER NOT NULL REFERENCES inspections(id)",
        "kind TEXT NOT NULL CHECK (kind IN ('close', 'reopen'))", "by_name TEXT", "reference TEXT", "note TEXT",
        "about TEXT NOT NULL", "added_at TEXT NOT NULL",
    ),
    "airframe_totals": (
        "id {key}", "registration TEXT NOT NULL", "reg_key TEXT NOT NULL", "hours {real}", "landings INTEGER",
        "valid_at {real} NOT NULL", "by_name TEXT", "note TEXT", "added_at TEXT NOT NULL",
    ),
}  # fmt: skip
_FIRST_INDEXES = (
    "CREATE INDEX copies_sha256 ON copies (sha256)",
    "CREATE INDEX judgements_scan ON judgements (scan_id)",
    "CREATE INDEX flights_reg ON flights (reg_key)",
    "CREATE INDEX stretches_flight ON flight_stretches (flight_id)",
    "CREATE INDEX stretches_when ON flight_stretches (end_at)",
    "CREATE INDEX stretches_judgement ON flight_stretches (judgement_id)",
    "CREATE INDEX reassignments_flight ON reassignments (flight_id)",
    "CREATE INDEX events_when ON events (reg_key, end_at)",
    "CREATE INDEX events_judgement ON events (judgement_id)",
    "CREATE INDEX events_name ON events (event_id)",
    "CREATE INDEX events_flight ON events (flight_id)",
    "CREATE INDEX successions_earlier ON successions (earlier_id)",
    "CREATE INDEX successions_later ON successions (later_id)",
    "CREATE INDEX sightings_name ON sightings (event_id)",
    "CREATE INDEX inspection_events_event ON inspection_events (event_row)",
)
# what may be blanked, and nothing else changed
BLANKABLE: dict[str, tuple[str, ...]] = {
    "reassignments": ("by_name", "note"),
    "decisions": ("by_name", "note"),
    "inspection_acts": ("by_name", "note"),
    "airframe_totals": ("by_name", "note"),
}
TABLES = tuple(_FIRST)
COLUMNS: dict[str, tuple[str, ...]] = {
    table: tuple(column.split()[0] for column in columns if not column.startswith("UNIQUE"))
    for table, columns in _FIRST.items()
}


def _first(dialect: Dialect) -> list[str]:
    steps = list(dialect.before)
    for table, columns in _FIRST.items():
        body = ", ".join(columns).replace("{key}", dialect.key).replace("{real}", dialect.real)
        steps.append(f"CREATE TABLE {table} ({body}){dialect.end}")
    steps += _FIRST_INDEXES
    for table, names in COLUMNS.items():
        fixed = [name for name in names if name not in BLANKABLE.get(table, ())]
        steps.append(dialect.keep_rows.format(table=table))
        steps.append(dialect.keep_columns.format(table=table, columns=", ".join(fixed)))
    return steps


# version 1 first; a new version is one more function
MIGRATIONS = (_first,)
