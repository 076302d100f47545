"""Hours, flights and landings of each airframe, as far as the ledger saw them and as the user set them."""

from __future__ import annotations

import json
from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass, field, replace

from exceed.core.findings import SEVERITIES
from exceed.ledger.flights import NEWEST
from exceed.ledger.history import DECIDED_AWAY, Decisions, Filters, Owners, event_rows, open_event
from exceed.ledger.store import Row, Table
from exceed.ledger.stretch import SAME_TAKE_OFF
from exceed.report.show import iso_utc

Span = tuple[float, float]


@dataclass(frozen=True, slots=True)
class Flown:
    """One flight as all recordings of it show it. `spans` are on the clock; without one only `length` is known."""

    key: str
    registration: str | None
    reg_key: str
    spans: tuple[Span, ...]
    length: float
    landings: int | None
    numbered: bool
    apart: bool
    recordings: tuple[str, ...]
    take_off_seen: bool = True

    @property
    def start(self) -> float | None:
        return self.spans[0][0] if self.spans else None

    @property
    def end(self) -> float | None:
        return max(last for _, last in self.spans) if self.spans else None


def union(spans: list[Span]) -> list[Span]:
    """Stretches of time as the fewest that cover the same."""
    found: list[Span] = []
    for first, last in sorted(spans):
        if found and first <= found[-1][1]:
            found[-1] = (found[-1][0], max(found[-1][1], last))
        else:
            found.append((first, last))
    return found


def flown(table: Table, owners: Owners) -> list[Flown]:
    """All flights, in order of time, those without a date last."""
    seen: dict[int, list[Row]] = defaultdict(list)
    for row in table.rows(
        "SELECT s.*, f.apart, r.path FROM flight_stretches s JOIN judgements j ON j.id = s.judgement_id "
        "JOIN flights f ON f.id = s.flight_id JOIN recordings r ON r.id = j.recording_id "
        f"WHERE {NEWEST} ORDER BY s.id"
    ):
        seen[row["flight_id"]].append(row)
    found = []
    for flight, rows in seen.items():
        registration, key = owners.names[flight][-1]
        spans = union([(row["start_at"], row["end_at"]) for row in rows if row["start_at"] is not None])
        length = sum(last - first for first, last in spans) or max(row["end_s"] - row["start_s"] for row in rows)
        landings = [row["landings"] for row in rows if row["landings"] is not None]
        found.append(
            Flown(
                owners.keys[flight], registration, key, tuple(spans), length, max(landings, default=None),
                any(row["flight_number"] is not None for row in rows), bool(rows[0]["apart"]),
                tuple(dict.fromkeys(row["path"] for row in rows)),
                any(row["take_off_seen"] for row in rows),
            )
        )  # fmt: skip
    return sorted(found, key=lambda one: (one.start is None, one.start or 0.0, one.key))


def distinct(flights: Iterable[Flown]) -> list[Flown]:
    """Flights without doubles: of one aeroplane's that share time with the same take-off, only one is counted.

    Two rows of one flight come about where it was first known without a registration, or was reassigned.
    """
    found: list[Flown] = []
    for one in sorted(flights, key=lambda one: (one.start is None, one.start or 0.0)):
        twin = next((other for other in reversed(found[-3:]) if _same_flight(other, one)), None)
        if twin is None:
            found.append(one)
            continue
        spans = union([*twin.spans, *one.spans])
        known = [row.landings for row in (twin, one) if row.landings is not None]
        found[found.index(twin)] = replace(
            twin, spans=tuple(spans), length=sum(last - first for first, last in spans),
            landings=max(known, default=None), numbered=twin.numbered or one.numbered,
        )  # fmt: skip
    return found


def _same_flight(one: Flown, other: Flown) -> bool:
    if not one.reg_key or one.reg_key != other.reg_key or one.apart or other.apart or not (one.spans and other.spans):
        return False
    shared = any(min(a[1], b[1]) > max(a[0], b[0]) for a in one.spans for b in other.spans)
    seen = one.take_off_seen and other.take_off_seen
    return shared and not (seen and abs(one.spans[0][0] - other.spans[0][0]) > SAME_TAKE_OFF)


def flight_list(table: Table, filters: Filters) -> list[Row]:
    """The flights as their list shows them; `id` is what `reassign` takes."""
    return [
        {
            "id": one.key,
            "registration": one.registration,
            "start": iso_utc(one.start),
            "end": iso_utc(one.end),
            "flight_s": round(one.length, 3),
            "landings": one.landings,
            "told_apart": one.numbered,
            "clash": one.apart,
            "recordings": list(one.recordings),
        }
        for one in flown(table, Owners.read(table))
        if (filters.key is None or one.reg_key == filters.key) and filters.in_time(one.start, one.end)
    ]


@dataclass(slots=True)
class Airframe:
    """One airframe's flights and the totals that the user set for it."""

    registration: str | None
    key: str
    flights: list[Flown] = field(default_factory=list)
    bases: list[Row] = field(default_factory=list)

    def hours_flown(self, since: float | None = None, until: float | None = None) -> float:
        """Hours on the clock between two instants; what two recordings show of one time counts once."""
        low = since if since is not None else float("-inf")
        high = until if until is not None else float("inf")
        together = union([span for one in self.flights if not one.apart for span in one.spans])
        apart = [span for one in self.flights if one.apart for span in one.spans]
        clipped = [(max(first, low), min(last, high)) for first, last in [*together, *apart]]
        return sum(last - first for first, last in clipped if last > first) / 3600.0

    def undated(self) -> list[Flown]:
        return [one for one in self.flights if not one.spans]

    def landings_made(self, since: float, until: float | None = None) -> int:
        high = until if until is not None else float("inf")
        flights = distinct(self.flights)
        return sum(one.landings or 0 for one in flights if one.end is not None and since <= one.end <= high)

    def total(self, name: str, at: float | None = None) -> float | None:
        """Total `hours` or `landings` at an instant (None: now), from the newest total set before it.

        Before the first total that was set, counted back from it. None where none was set.
        """
        known = [row for row in self.bases if row[name] is not None]
        if not known:
            return None
        earlier = [row for row in known if at is None or row["valid_at"] <= at]
        if earlier:
            base = max(earlier, key=lambda row: (row["valid_at"], row["id"]))
            flown = (
                self.hours_flown(base["valid_at"], at) if name == "hours" else self.landings_made(base["valid_at"], at)
            )
            return float(base[name] + flown)
        base = min(known, key=lambda row: (row["valid_at"], -row["id"]))
        flown = (
            self.hours_flown(at, base["valid_at"])
            if name == "hours"
            else self.landings_made(at or 0.0, base["valid_at"])
        )
        return float(base[name] - flown)

    def flights_after(self, moment: float) -> int:
        """Flights that began after an instant."""
        return sum(one.start is not None and one.start > moment for one in distinct(self.flights))


def airframes(table: Table, owners: Owners) -> dict[str, Airframe]:
    """All airframes by the key of their registration; the flights of none under the empty key."""
    found: dict[str, Airframe] = {}
    for one in flown(table, owners):
        found.setdefault(one.reg_key, Airframe(one.registration, one.reg_key)).flights.append(one)
    for row in table.rows("SELECT * FROM airframe_totals ORDER BY id"):
        found.setdefault(row["reg_key"], Airframe(row["registration"], row["reg_key"])).bases.append(row)
    return found


def totals(table: Table, filters: Filters) -> list[Row]:
    """One row an airframe: hours, flights, landings, events and time beyond each limit.

    Events that were decided to be no exceedance are counted apart and give no time beyond a limit.
    """
    owners, decisions = Owners.read(table), Decisions.read(table)
    found = {
        key: _empty(frame, filters)
        for key, frame in sorted(airframes(table, owners).items())
        if filters.key in (None, key)
    }
    for row in event_rows(table):
        registration, key = owners.now(row["flight_id"], (row["registration"], row["reg_key"]))
        if filters.key not in (None, key) or not filters.in_time(row["start_at"], row["end_at"]):
            continue
        if key not in found:  # nothing but runs on the ground
            found[key] = _empty(Airframe(registration, key), filters)
        target = found[key]
        decision = decisions.of(row, owners)
        target["open"] += open_event(row, decision)
        if decision is not None and decision["as"] in DECIDED_AWAY and not decision["worse_since"]:
            target["decided_away"] += 1
        elif row["kind"] == "undecided":
            target["undecided"] += 1
        else:
            target["doubtful"] += row["certainty"] == "doubtful"
            target["events"][row["severity"]] += 1
            _beyond(target["beyond"], row)
    for target in found.values():
        rows = target["beyond"].items()
        target["beyond"] = [
            {"rule": rule, "events": many, "seconds": round(time, 3)} for rule, (many, time) in sorted(rows)
        ]
    return list(found.values())


def _empty(frame: Airframe, filters: Filters) -> Row:
    """An airframe's row, its events not yet counted."""
    flights = distinct(one for one in frame.flights if filters.in_time(one.start, one.end))
    part = Airframe(frame.registration, frame.key, flights)
    undated = part.undated()
    numbered = [one for one in flights if one.numbered]
    base = max(frame.bases, key=lambda row: (row["valid_at"], row["id"]), default=None)
    return {
        "registration": frame.registration,
        "flights": len(numbered),
        "flight_h": round(part.hours_flown() + sum(one.length for one in undated) / 3600.0, 4),
        "landings": sum(one.landings or 0 for one in numbered),
        "landings_unknown_flights": sum(one.landings is None for one in flights),
        "undated_flights": len(undated),
        "undivided_recordings": len(flights) - len(numbered),
        "clashes": sum(one.apart for one in flights),
        "events": dict.fromkeys(SEVERITIES, 0),
        "undecided": 0,
        "doubtful": 0,
        "open": 0,
        "decided_away": 0,
        "beyond": {},
        "airframe": None
        if base is None
        else {
            "hours": _rounded(frame.total("hours"), 2),
            "landings": _rounded(frame.total("landings"), 0),
            "set_hours": base["hours"],
            "set_landings": base["landings"],
            "set_at": iso_utc(base["valid_at"], trim=True),
            "undated_flights_not_counted": len(frame.undated()),
        },
    }


def _beyond(found: dict[str, tuple[int, float]], row: Row) -> None:
    body = json.loads(row["body"])
    if not body["limit_exceeded"]:
        return
    many, time = found.get(row["rule"], (0, 0.0))
    found[row["rule"]] = (many + 1, time + max((level["beyond_s"] for level in body["levels"]), default=0.0))


def _rounded(value: float | None, digits: int) -> float | int | None:
    if value is None:
        return None
    return round(value, digits) if digits else round(value)
