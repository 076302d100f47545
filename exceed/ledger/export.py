"""The ledger as one JSON file: as it is, or so that nobody can tell whose flights these were.

De-identified, only what stands in a short list of plain facts goes out (nothing is struck from a copy: what is not
listed is not there). Aeroplanes and rules get names by a keyed hash; counts below a least number are not given.
"""

from __future__ import annotations

import hashlib
import hmac
import secrets
from collections import Counter
from collections.abc import Callable
from pathlib import Path
from typing import Any

from exceed import __version__
from exceed.core.findings import CAUTIONS, SEVERITIES
from exceed.core.quantities import QUANTITIES
from exceed.errors import UsageError
from exceed.ledger.history import DECIDED_AWAY, Filters, events, judgements
from exceed.ledger.inspections import inspections
from exceed.ledger.store import Row, Table
from exceed.ledger.totals import flight_list, totals

FORMAT = "exceed/ledger-export/1"
KEY_LEAST = 16
# the words of the phases, sides and reasons; any other word would be somebody's own
_WORDS = {
    "phase": {"standing", "taxi", "take-off", "initial climb", "climb", "cruise", "descent", "manoeuvring", "approach",
              "landing", "unknown"},
    "side": {"above", "below", "is"},
    "certainty": {"doubtful", "possible", "likely", "established"},
    "cut_by": {"gap", "condition", "recording_start", "recording_end"},
}  # fmt: skip
REMOVED = (
    "registrations and serial numbers: replaced by a keyed hash",
    "rules' names and titles: replaced by a keyed hash, the quantity is kept where it is one of exceed's own",
    "dates and times of day: removed",
    "ids and digests of events, flights, recordings, inspections: removed",
    "file names, paths, operator: removed",
    "positions and all other context of an event: removed",
    "names of people, references, notes, tasks and all other free text: removed",
    "peaks and limits: kept only as their ratio, to 0.05",
    "durations: coarsened to 0.5, 1, 2, 5, 10, 20, 50, 100 s ... ; hours to 1, 2, 5, 10 ...",
)


def read_key(file: Path | None) -> bytes:
    """The key of the hash: a file's bytes, or one made for this export and kept nowhere."""
    if file is None:
        return secrets.token_bytes(32)
    try:
        key = file.read_bytes().strip()
    except OSError as error:
        raise UsageError.one(
            str(file), f"cannot be read: {error.strerror or error}", "a key file", "check the path"
        ) from error
    if len(key) < KEY_LEAST:
        raise UsageError.one(str(file), f"holds {len(key)} bytes", f"at least {KEY_LEAST}", "make it of random bytes")
    return key


def export(table: Table, now: float) -> Row:
    """Everything, as the lists show it."""
    every = Filters()
    return {
        "format": FORMAT,
        "tool": {"name": "exceed", "version": __version__},
        "deidentified": False,
        "cautions": list(CAUTIONS),
        "flights": flight_list(table, every),
        "events": events(table, every)[0],
        "inspections": inspections(table, every, now),
        "totals": totals(table, every),
        "judgements": judgements(table, every),
    }


def export_deidentified(table: Table, key: bytes, least: int, now: float) -> Row:
    """What may be given away: events as ratios, counts by kind and by aeroplane, small ones not given."""
    every = Filters()

    def alias(kind: str, text: str | None) -> str:
        name = hmac.new(key, f"{kind}\x1f{text or ''}".encode("utf-8", "backslashreplace"), hashlib.sha256)
        return f"{kind}-{name.hexdigest()[:10]}"

    rows = [_event(event, alias) for event in events(table, every)[0]]
    kinds = Counter(_kind(row) for row in rows)
    kept = [row for row in rows if kinds[_kind(row)] >= least]
    for row in kept:
        # an aeroplane with few such events could be told by them
        same = sum(_kind(one) == _kind(row) and one["aeroplane"] == row["aeroplane"] for one in rows)
        row["aeroplane_given"] = same >= least
    for row in kept:
        if not row.pop("aeroplane_given"):
            row["aeroplane"] = None
    kept.sort(key=lambda row: repr(sorted(row.items(), key=lambda item: item[0])))
    work = inspections(table, every, now)
    return {
        "format": FORMAT,
        "tool": {"name": "exceed", "version": __version__},
        "deidentified": True,
        "cautions": list(CAUTIONS),
        "removed": list(REMOVED),
        "suppressed": f"counts from 1 to {least - 1} are given as null, and their events are left out",
        "events_left_out": _count(len(rows) - len(kept), least),
        "events": kept,
        "counts": [
            {
                "quantity": kind[0], "rule": kind[1], "side": kind[2], "severity": kind[3], "undecided": kind[4],
                "events": _count(many, least),
            }
            for kind, many in sorted(kinds.items(), key=lambda item: str(item[0]))
        ],
        "aeroplanes": sorted(
            (
                {
                    "aeroplane": alias("aeroplane", row["registration"]),
                    "flights": _count(row["flights"], least),
                    "flight_h": _step(row["flight_h"]) if row["flights"] >= least else None,
                    "landings": _count(row["landings"], least),
                    "events": {name: _count(row["events"][name], least) for name in SEVERITIES},
                    "undecided": _count(row["undecided"], least),
                    "decided_away": _count(row["decided_away"], least),
                }
                for row in totals(table, every)
            ),
            key=lambda row: str(row["aeroplane"]),
        ),
        "inspections": {
            status: _count(sum(row["status"] == status for row in work), least)
            for status in ("due", "to_be_decided", "closed")
        },
    }  # fmt: skip


def _event(event: Row, alias: Callable[[str, str | None], str]) -> Row:
    decision = event["decision"]
    return {
        "aeroplane": alias("aeroplane", event["registration"]),
        "rule": alias("rule", event["rule"]),
        "quantity": event["quantity"] if event["quantity"] in QUANTITIES else None,
        "side": _word("side", event["side"]),
        "severity": event["severity"] if event["severity"] in SEVERITIES else None,
        "certainty": _word("certainty", event["certainty"]),
        "undecided": bool(event["undecided"]),
        "limit_exceeded": bool(event["limit_exceeded"]),
        "phase": _word("phase", event["phase"]),
        "cut_by": _word("cut_by", event["cut_by"]),
        "share_of_limit": _share(event),
        "duration_s": _step(event["duration_s"]),
        "decided": None if decision is None else "away" if decision["as"] in DECIDED_AWAY else "agreed",
    }


def _word(key: str, value: Any) -> str | None:
    return value if value in _WORDS[key] else None


def _kind(row: Row) -> tuple[Any, ...]:
    return row["quantity"], row["rule"], row["side"], row["severity"], row["undecided"]


def _share(event: Row) -> float | None:
    peak, limit = event["peak"]["value"], event["limit"]["value"]
    if peak is None or not limit or abs(limit) < 0.2:
        return None
    return round(round(float(peak) / float(limit) / 0.05) * 0.05, 2)


def _step(value: float) -> float:
    """The next of 0.5, 1, 2, 5, 10, 20, 50 ... that is not smaller; 0 stays 0."""
    if value <= 0.0:
        return 0.0
    step = 0.5
    for factor in _factors():
        if step >= value:
            return step
        step = round(step * factor, 6)
    return step


def _factors() -> list[float]:
    return [2.0, 2.0, 2.5] * 12


def _count(many: int, least: int) -> int | None:
    return None if 0 < many < least else many
