"""A summary into the ledger: what is new is added, what is known is left, what a newer judgement changed is said."""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from exceed.ledger import stretch as st
from exceed.ledger.asked import lineage, place_inspections
from exceed.ledger.flights import flight_of, place_flights
from exceed.ledger.store import Ledger, Row, Table, chunks, named, utc_now

_UNREAD = "not read or assessed, so not in the ledger"


def record(ledger: Ledger, summary: Row) -> Row:
    """Record one scan, whole or not at all. Raises ExceedError.

    Returns a dict: `scan` (its key, None where nothing was added), `replaces` (the scan whose judgements the newest
    ones here replace, or None), `recordings` {added, known, judged_anew}, `flights` {added, known, longer, clashes},
    `events` {added, known, standing: of earlier judgements, by rules that were not assessed this time},
    `inspections` {added, known}, `changes` (added, removed, changed events of judgements anew: kind, event, rule,
    title, severity, registration, start, start_s, path, difference, decision), `left_out` (path, reason).
    """
    return ledger.writing(lambda table: _Scan(table, summary).run())


def known_digests(ledger: Ledger, digests: Iterable[str]) -> set[str]:
    """Which of these SHA-256, of files as they lie or unpacked, are in the ledger."""
    wanted = sorted(set(digests))

    def look(table: Table) -> set[str]:
        found: set[str] = set()
        for piece in chunks(wanted):
            places, values = named(piece)
            for sql in (
                f"SELECT sha256 AS d FROM copies WHERE sha256 IN ({places})",
                f"SELECT content_sha256 AS d FROM recordings WHERE content_sha256 IN ({places})",
            ):
                found |= {row["d"] for row in table.rows(sql, **values)}
        return found

    return ledger.reading(look)


class _Scan:
    """One summary on its way into the ledger, inside one transaction."""

    def __init__(self, table: Table, summary: Row) -> None:
        self.table = table
        self.summary = summary
        self.tool = f"{summary['tool']['name']} {summary['tool']['version']}"
        self.scan_id: int | None = None
        self.scan_key: str | None = None
        self.seen: dict[str, tuple[str, str]] = {}  # content -> path and registration in this summary
        self.rows_of: dict[str, int] = {}  # event id of this summary -> row of the ledger
        self.result: Row = {
            "scan": None,
            "replaces": None,
            "recordings": {"added": 0, "known": 0, "judged_anew": 0},
            "flights": {"added": 0, "known": 0, "longer": 0, "clashes": []},
            "events": {"added": 0, "known": 0, "standing": 0},
            "changes": [],
            "left_out": [],
        }

    def run(self) -> Row:
        for recording in self.summary["recordings"]:
            if recording["status"] == "failed" or not recording["content_sha256"]:
                self.result["left_out"].append({"path": recording["path"], "reason": _UNREAD})
            elif (other := self._twice(recording)) is not None:
                reason = f"the same content as {other}, which goes under another registration: only that one is in"
                self.result["left_out"].append({"path": recording["path"], "reason": reason})
            else:
                self._recording(recording)
        self.result["inspections"] = place_inspections(self.table, self.summary["inspections"], self.rows_of)
        self.result["scan"] = self.scan_key
        return self.result

    def _twice(self, recording: Row) -> str | None:
        """The log of this scan that has the same content and is said to be another aeroplane's."""
        key = st.registration_key(recording["registration"])
        path, first = self.seen.setdefault(recording["content_sha256"], (recording["path"], key))
        return path if first != key else None

    def _scan(self) -> int:
        """The row of this scan, made when the first thing is added."""
        if self.scan_id is None:
            last = self.table.one("SELECT max(id) AS last FROM scans")
            self.scan_key = st.short_name(self.summary["created"], (last or {}).get("last"), utc_now())
            self.scan_id = self.table.add(
                "scans", scan_key=self.scan_key, created=self.summary["created"], tool=self.tool,
                operator=self.summary.get("operator"), added_at=utc_now(),
            )  # fmt: skip
        return self.scan_id

    def _recording(self, recording: Row) -> None:
        table, counts = self.table, self.result["recordings"]
        found = table.one("SELECT id FROM recordings WHERE content_sha256 = :sha", sha=recording["content_sha256"])
        if found is None:
            clock = recording["clock"]
            row = table.add(
                "recordings", content_sha256=recording["content_sha256"], path=recording["path"],
                row_count=recording["rows"], recorded_s=float(recording["recorded_s"]),
                clock_start=st.epoch(clock["start"]) if clock is not None else None, scan_id=self._scan(),
            )  # fmt: skip
            counts["added"] += 1
        else:
            row = int(found["id"])
        self._copy(row, recording["sha256"])
        history = table.rows("SELECT * FROM judgements WHERE recording_id = :id ORDER BY turn", id=row)
        rules = st.rules_digest(self.summary["judged_with"], recording["rule_sets"], self.tool)
        outcome = st.result_digest(recording)
        same = self._same(history, rules, outcome)
        if same is not None:
            counts["known"] += 1
            self.result["flights"]["known"] += len(recording["flights"])
            self._known_events(recording, row)
            return
        counts["judged_anew"] += bool(history)
        self._judgement(recording, row, history, rules, outcome)

    def _copy(self, recording_id: int, sha256: str | None) -> None:
        if sha256 is None:
            return
        sql = "SELECT id FROM copies WHERE recording_id = :id AND sha256 = :sha"
        if self.table.one(sql, id=recording_id, sha=sha256) is None:
            self.table.add("copies", recording_id=recording_id, sha256=sha256)

    def _same(self, history: Sequence[Row], rules: str, outcome: str) -> Row | None:
        """The judgement that says just this and still stands."""
        holds: dict[str, int] = {}
        for judgement in history:
            able = _able(json.loads(judgement["assessment"]))
            for rule in _rules(judgement):
                # one that could not assess a rule does not take the place of one that could
                if rule in able or rule not in holds:
                    holds[rule] = judgement["id"]
        for judgement in reversed(history):
            if judgement["rules_sha256"] != rules or judgement["result_sha256"] != outcome:
                continue
            if st.documents_changed(json.loads(judgement["judged_with"]), self.summary["judged_with"]):
                continue
            if judgement is history[-1] or self._stands(judgement, holds):
                return judgement
        return None

    def _stands(self, judgement: Row, holds: Mapping[str, int]) -> bool:
        """Has no later judgement found anything else by the rules that this one assessed?"""
        said = self._said(judgement["id"])
        for rule in _able(json.loads(judgement["assessment"])):
            holder = holds[rule]
            if holder != judgement["id"] and self._said(holder).get(rule) != said.get(rule):
                return False
        return True

    def _said(self, judgement: int) -> dict[str, list[tuple[str, str]]]:
        """What a judgement found, by rule: ids, and the finding where it is not one that another download shows."""
        found: dict[str, list[tuple[str, str]]] = {}
        for sql in (
            "SELECT e.rule, e.event_id, e.kind, e.body FROM events e WHERE e.judgement_id = :id ORDER BY e.event_id",
            "SELECT e.rule, s.event_id, '' AS kind, '' AS body FROM sightings s JOIN events e ON e.id = s.event_row "
            "WHERE s.judgement_id = :id ORDER BY s.event_id",
        ):
            for row in self.table.rows(sql, id=judgement):
                found.setdefault(row["rule"], []).append((row["event_id"], row["kind"] + row["body"]))
        return found

    def _known_events(self, recording: Row, recording_id: int) -> None:
        """Find this summary's events among those that are there."""
        there: dict[str, int] = {}
        for sql in (
            "SELECT s.event_id, s.event_row AS id FROM sightings s JOIN judgements j ON j.id = s.judgement_id "
            "WHERE j.recording_id = :recording ORDER BY s.id",
            "SELECT e.event_id, e.id FROM events e JOIN judgements j ON j.id = e.judgement_id "
            "WHERE j.recording_id = :recording ORDER BY e.id",
        ):
            for row in self.table.rows(sql, recording=recording_id):
                there[row["event_id"]] = int(row["id"])
        for body in _events(recording):
            if body["id"] in there:
                self.rows_of[body["id"]] = there[body["id"]]
                self.result["events"]["known"] += 1

    def _judgement(self, recording: Row, row: int, history: Sequence[Row], rules: str, outcome: str) -> None:
        table = self.table
        assessment = recording["assessment"]
        judged = {one["rule"] for one in assessment} | {one["rule"] for one in _events(recording)}
        replaced = next((one for one in reversed(history) if judged & _rules(one) or not _rules(one)), None)
        judgement = table.add(
            "judgements", recording_id=row, turn=len(history) + 1, scan_id=self._scan(),
            replaces=replaced["id"] if replaced is not None else None, registration=recording["registration"],
            limits=recording["limits"], tool=self.tool, judged_with=_json(self.summary["judged_with"]),
            rules_sha256=rules, result_sha256=outcome, assessment=_json(assessment),
        )  # fmt: skip
        if replaced is not None:
            scan = table.one("SELECT scan_key FROM scans WHERE id = :id", id=replaced["scan_id"])
            self.result["replaces"] = scan["scan_key"] if scan is not None else None
        placed, counts = place_flights(table, recording, row, judgement)
        for key in ("added", "known", "longer"):
            self.result["flights"][key] += counts[key]
        self.result["flights"]["clashes"] += [{"path": recording["path"], "flight": one} for one in counts["clashes"]]
        if history and recording["registration"]:
            was = next((one["registration"] for one in reversed(history) if one["registration"]), None)
            self._rename(was, recording["registration"], placed)
        self._events(recording, row, judgement, rules, placed, anew=bool(history))

    def _rename(self, was: str | None, now: str, placed: Sequence[Row]) -> None:
        """The same recording is judged as another aeroplane's now: its flights go there, unless a person moved them."""
        before, after = st.registration_key(was), st.registration_key(now)
        if before == after:
            return
        for flight in {one["flight_id"] for one in placed}:
            owner = self.table.one(
                "SELECT reg_key FROM reassignments WHERE flight_id = :id ORDER BY id DESC", id=flight
            ) or self.table.one("SELECT reg_key FROM flights WHERE id = :id", id=flight)
            if owner is not None and owner["reg_key"] == before:
                self.table.add(
                    "reassignments", flight_id=flight, registration=now, reg_key=after, by_name=None,
                    note="the recording was judged anew under this registration", added_at=utc_now(),
                )  # fmt: skip

    def _events(
        self,
        recording: Row,
        row: int,
        judgement: int,
        rules: str,
        placed: Sequence[Row],
        *,
        anew: bool,
    ) -> None:
        """New events beside the old: the same occurrence succeeds, what is no longer found is removed (as a row)."""
        key = st.registration_key(recording["registration"])
        own = self._own(row) if anew else []
        known, twins = st.Occurrences(own, "_s"), st.Occurrences(self._twins(recording, key, row), "_at")
        matched: set[int] = set()
        for kind, body in _kinds(recording):
            new = _event_row(kind, body, key)
            fits = known.of(new)
            matched |= {old["id"] for old in fits}
            if not fits:
                fits = twins.of(new)[:1]
                twin = fits[0] if fits else None
                if twin is not None and not _supersedes(new, body, twin, rules):
                    self.table.add("sightings", event_row=twin["id"], judgement_id=judgement, event_id=body["id"])
                    self.rows_of[body["id"]] = int(twin["id"])
                    self.result["events"]["known"] += 1
                    continue
            event = self.table.add(
                "events", event_id=body["id"], judgement_id=judgement, flight_id=flight_of(placed, body),
                registration=body["registration"], body=_json(body), **new,
            )  # fmt: skip
            self.rows_of[body["id"]] = event
            for old in fits:
                words = st.difference(json.loads(old["body"]), body, old["kind"], kind)
                self._succeed(old, event, judgement, "changed" if words else "same", "; ".join(words))
                if words:
                    self._change("changed", body, recording["path"], "; ".join(words), old)
            self.result["events"]["known" if fits else "added"] += 1
            if anew and not fits:
                self._change("added", body, recording["path"], "", None)
        able = _able(recording["assessment"])
        for old in own:
            if old["id"] in matched:
                continue
            # a rule that was not applied or could not be assessed this time takes nothing back
            if old["rule"] not in able:
                self.result["events"]["standing"] += 1
            else:
                self._succeed(old, None, judgement, "removed", "")
                self._change("removed", json.loads(old["body"]), recording["path"], "", old)

    def _own(self, recording_id: int) -> list[Row]:
        return self.table.rows(
            "SELECT e.* FROM events e JOIN judgements j ON j.id = e.judgement_id WHERE j.recording_id = :recording "
            "AND NOT EXISTS (SELECT 1 FROM successions s WHERE s.earlier_id = e.id) ORDER BY e.id",
            recording=recording_id,
        )

    def _twins(self, recording: Row, key: str, recording_id: int) -> list[Row]:
        """The current events that other recordings of the same aeroplane, as it is or ever was named, show then."""
        times = [st.epoch(one[end]) for one in _events(recording) for end in ("start", "end")]
        known = [time for time in times if time is not None]
        if not key or not known:
            return []
        moved = (
            "SELECT r.flight_id FROM reassignments r JOIN flights f ON f.id = r.flight_id "
            "WHERE r.reg_key = :reg OR f.reg_key = :reg"
        )
        found = {}
        for owner in ("e.reg_key = :reg", f"e.flight_id IN ({moved})"):
            for row in self.table.rows(
                "SELECT e.*, j.rules_sha256 FROM events e JOIN judgements j ON j.id = e.judgement_id "
                f"WHERE {owner} AND e.end_at >= :first AND e.start_at <= :last AND j.recording_id <> :recording "
                "AND NOT EXISTS (SELECT 1 FROM successions s WHERE s.earlier_id = e.id)",
                reg=key, first=min(known) - st.SLACK, last=max(known) + st.SLACK, recording=recording_id,
            ):  # fmt: skip
                found[row["id"]] = row
        return list(found.values())

    def _succeed(self, old: Row, later: int | None, judgement: int, kind: str, words: str) -> None:
        self.table.add("successions", earlier_id=old["id"], later_id=later, judgement_id=judgement, kind=kind,
                       difference=words)  # fmt: skip

    def _change(self, kind: str, body: Row, path: str, words: str, old: Row | None) -> None:
        decision = None if old is None else _decision(self.table, old["id"])
        self.result["changes"].append(
            {
                "kind": kind, "event": body["id"], "rule": body["rule"], "title": body["title"],
                "severity": body["severity"], "registration": body["registration"], "start": body["start"],
                "start_s": body["start_s"], "path": path, "difference": words, "decision": decision,
            }
        )  # fmt: skip


def _decision(table: Table, row: int) -> str | None:
    places, values = named(sorted(lineage(table, row)))
    found = table.one(f"SELECT verdict FROM decisions WHERE event_row IN ({places}) ORDER BY id DESC", **values)
    return found["verdict"] if found is not None else None


def _supersedes(new: Row, body: Row, twin: Row, rules: str) -> bool:
    """Does another download's view of a known event take its place: it says worse, sees more, or by other rules?"""
    if st.worse(new, twin):
        return True
    old = json.loads(twin["body"])
    broken = ("gap", "recording_start", "recording_end")
    if old.get("cut_by") in broken and st.longer(new, twin):
        return True
    return twin["rules_sha256"] != rules and not (body.get("cut_by") in broken and st.longer(twin, new))


def _event_row(kind: str, body: Row, key: str) -> Row:
    return {
        "kind": kind, "rule": body["rule"], "part": st.part(body["quantity"]), "reg_key": key,
        "start_s": float(body["start_s"]), "end_s": float(body["end_s"]), "start_at": st.epoch(body["start"]),
        "end_at": st.epoch(body["end"]), "severity": body["severity"], "certainty": body["certainty"],
    }  # fmt: skip


def _kinds(recording: Row) -> Iterable[tuple[str, Row]]:
    yield from (("event", body) for body in recording["events"])
    yield from (("undecided", body) for body in recording["undecided"])


def _events(recording: Row) -> Iterable[Row]:
    return (body for _, body in _kinds(recording))


def _able(assessment: Sequence[Row]) -> set[str]:
    """The rules that were assessed for some of the time."""
    return {one["rule"] for one in assessment if one["flight"] is None and one["assessed_s"] > 0.0}


def _rules(judgement: Row) -> set[str]:
    return {row["rule"] for row in json.loads(judgement["assessment"])}


def _json(data: Any) -> str:
    # ASCII: a lone surrogate of a file name is written as an escape, which every database takes
    return json.dumps(data, separators=(",", ":"), allow_nan=False)
