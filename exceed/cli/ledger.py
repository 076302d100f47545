"""`exceed ledger ...`: the history of each airframe. Options become one call, its rows become text or JSON."""

from __future__ import annotations

import sys
import time
from collections.abc import Sequence
from enum import StrEnum
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from exceed.cli import options as opt
from exceed.cli.run import Terminal, guarded
from exceed.errors import ExceedError, UsageError

if TYPE_CHECKING:
    from exceed.ledger.history import Filters
    from exceed.ledger.store import Ledger
    from exceed.read import LogPath, Skipped
    from exceed.report.layout import Screen

app = typer.Typer(
    name="ledger",
    no_args_is_help=True,
    rich_markup_mode=None,
    help=(
        "The history of each airframe: events, decisions, inspections, totals, trends.\n\n"
        "Start with:  exceed scan sample_logs --ledger default"
    ),
)

Place = Annotated[
    str, typer.Option("--ledger", metavar="URL|default", help="sqlite:///FILE, postgresql+psycopg://..., or default.")
]
Registration = Annotated[
    str | None, typer.Option("--registration", "--aircraft", metavar="REG", help="Only this aeroplane.")
]
Since = Annotated[str | None, typer.Option("--since", metavar="DATE", help="Only from this date on (UTC).")]
Until = Annotated[str | None, typer.Option("--until", metavar="DATE", help="Only up to the end of this date (UTC).")]
Rule = Annotated[str | None, typer.Option("--rule", metavar="ID", help="Only this rule.")]
Severity = Annotated[opt.Severity | None, typer.Option("--severity", help="Lowest severity wanted.")]
Json = Annotated[bool, typer.Option("--json", help="Print JSON only: a list of objects.")]
By = Annotated[str, typer.Option("--by", metavar="NAME", help="Who says so.")]
Note = Annotated[str | None, typer.Option("--note", metavar="TEXT", help="Why; can be blanked later.")]
Out = Annotated[Path, typer.Option("--out", metavar="FILE", help="The file to write.")]


class Certainty(StrEnum):
    doubtful = "doubtful"
    possible = "possible"
    likely = "likely"
    established = "established"


class Verdict(StrEnum):
    agreed = "agreed"
    sensor_fault = "sensor-fault"
    wrong_data = "wrong-data"
    not_an_exceedance = "not-an-exceedance"


def _filters(
    registration: str | None,
    since: str | None,
    until: str | None,
    rule: str | None = None,
    severity: opt.Severity | None = None,
    certainty: Certainty | None = None,
    state: str | None = None,
) -> Filters:
    from exceed.ledger.dates import instant
    from exceed.ledger.history import Filters

    return Filters(
        registration=registration,
        since=None if since is None else instant("--since", since),
        until=None if until is None else instant("--until", until, last=True),
        rule=rule,
        severity=severity.value if severity else None,
        certainty=certainty.value if certainty else None,
        state=state,
    )


def _screen() -> Screen:
    import os

    from exceed.report.layout import Screen
    from exceed.report.show import wants_colour, wants_unicode

    out = sys.stdout
    return Screen(
        width=Terminal.width(out),
        colour=wants_colour(dict(os.environ), terminal=out.isatty()),
        unicode=wants_unicode(out.encoding),
    )


def _print(text: str) -> None:
    encoding = sys.stdout.encoding or "utf-8"
    sys.stdout.write(text.encode(encoding, "replace").decode(encoding))
    sys.stdout.flush()


def _json(rows: Sequence[Any]) -> None:
    import json

    # ASCII, so that no control or direction mark in somebody's text reaches a terminal
    _print(json.dumps(list(rows), indent=1, allow_nan=False) + "\n")


def _state(open_only: bool, decided: bool) -> str | None:
    if open_only and decided:
        raise UsageError.one("--open", "cannot stand beside --decided", "one of them", "leave one out")
    return "open" if open_only else "decided" if decided else None


@app.command()
def events(
    ledger: Place = "default",
    registration: Registration = None,
    since: Since = None,
    until: Until = None,
    rule: Rule = None,
    severity: Severity = None,
    certainty: Annotated[Certainty | None, typer.Option("--certainty", help="Lowest certainty wanted.")] = None,
    open_only: Annotated[bool, typer.Option("--open", help="Only those still to be decided.")] = False,
    decided: Annotated[bool, typer.Option("--decided", help="Only those decided.")] = False,
    json: Json = False,
) -> None:
    """Events, as the newest judgement has them, and what was decided.

    \b
    exceed ledger events --open --severity caution
    exceed ledger events --registration ZZ-NMA --since 2031-05-01 --json
    """
    with guarded(False):
        from exceed.ledger import history
        from exceed.ledger.store import open_ledger
        from exceed.report.ledger import render_events

        filters = _filters(registration, since, until, rule, severity, certainty, _state(open_only, decided))
        with open_ledger(ledger) as book:
            rows, undated = book.reading(lambda table: history.events(table, filters))
        if json:
            _json(rows)
            if undated:
                Terminal.err(f"{undated} without a date left out")
        else:
            _print(render_events(rows, _screen(), undated))


@app.command()
def flights(
    ledger: Place = "default",
    registration: Registration = None,
    since: Since = None,
    until: Until = None,
    json: Json = False,
) -> None:
    """Flights and their ids.

    \b
    exceed ledger flights --registration ZZ-NMA
    """
    with guarded(False):
        from exceed.ledger.store import open_ledger
        from exceed.ledger.totals import flight_list
        from exceed.report.ledger import render_flights

        filters = _filters(registration, since, until)
        with open_ledger(ledger) as book:
            rows = book.reading(lambda table: flight_list(table, filters))
        _json(rows) if json else _print(render_flights(rows, _screen()))


@app.command()
def inspections(
    ledger: Place = "default",
    registration: Registration = None,
    since: Since = None,
    until: Until = None,
    rule: Rule = None,
    open_only: Annotated[bool, typer.Option("--open", help="Only those not closed.")] = False,
    decided: Annotated[bool, typer.Option("--decided", help="Only those closed.")] = False,
    json: Json = False,
) -> None:
    """Inspections: due, to be decided, closed, and before when.

    \b
    exceed ledger inspections --open
    """
    with guarded(False):
        from exceed.ledger import inspections as room
        from exceed.ledger.store import open_ledger
        from exceed.report.ledger import render_inspections

        filters = _filters(registration, since, until, rule, state=_state(open_only, decided))
        with open_ledger(ledger) as book:
            rows = book.reading(lambda table: room.inspections(table, filters, time.time()))
        _json(rows) if json else _print(render_inspections(rows, _screen()))


@app.command()
def totals(
    ledger: Place = "default",
    registration: Registration = None,
    since: Since = None,
    until: Until = None,
    json: Json = False,
) -> None:
    """Hours, flights, landings, events and time beyond limits of each airframe.

    \b
    exceed ledger totals
    """
    with guarded(False):
        from exceed.ledger import totals as room
        from exceed.ledger.store import open_ledger
        from exceed.report.ledger import render_totals

        filters = _filters(registration, since, until)
        with open_ledger(ledger) as book:
            rows = book.reading(lambda table: room.totals(table, filters))
        _json(rows) if json else _print(render_totals(rows, _screen()))


@app.command()
def trends(
    ledger: Place = "default",
    registration: Registration = None,
    since: Since = None,
    until: Until = None,
    rule: Rule = None,
    severity: Severity = None,
    certainty: Annotated[Certainty, typer.Option("--certainty", help="Lowest certainty counted.")] = Certainty.possible,
    html: Annotated[Path | None, typer.Option("--html", metavar="FILE", help="Write a page with the plot.")] = None,
    json: Json = False,
) -> None:
    """Events per 1,000 flights and per 1,000 h by month, with exact bounds.

    \b
    exceed ledger trends --severity caution --html trends.html
    """
    with guarded(False):
        from exceed.ledger import trends as room
        from exceed.ledger.store import open_ledger
        from exceed.report.ledger import render_trends, trends_page
        from exceed.report.write import write_whole

        filters = _filters(registration, since, until, rule, severity, certainty)
        with open_ledger(ledger) as book:
            rows = book.reading(lambda table: room.trends(table, filters))
        if html is not None:
            parts = ["Trends", registration, rule, f"{severity.value} and above" if severity else None]
            write_whole(html, trends_page(rows, ", ".join(part for part in parts if part), room.SOURCE))
        _json(rows) if json else _print(render_trends(rows, _screen(), room.SOURCE))


@app.command()
def judgements(
    ledger: Place = "default",
    registration: Registration = None,
    since: Since = None,
    until: Until = None,
    json: Json = False,
) -> None:
    """What each recording was judged with, and what a newer judgement changed.

    \b
    exceed ledger judgements --registration ZZ-NMA
    """
    with guarded(False):
        from exceed.ledger import history
        from exceed.ledger.store import open_ledger
        from exceed.report.ledger import render_judgements

        filters = _filters(registration, since, until)
        with open_ledger(ledger) as book:
            rows = book.reading(lambda table: history.judgements(table, filters))
        _json(rows) if json else _print(render_judgements(rows, _screen()))


@app.command()
def airframe(
    registration: Annotated[str, typer.Argument(metavar="REG", help="The aeroplane.")],
    hours: Annotated[float | None, typer.Option("--hours", metavar="H", help="Total airframe hours.")] = None,
    landings: Annotated[int | None, typer.Option("--landings", metavar="N", help="Total landings.")] = None,
    at: Annotated[str | None, typer.Option("--at", metavar="DATE", help="When that stood so; default: now.")] = None,
    by: Annotated[str | None, typer.Option("--by", metavar="NAME", help="Who says so.")] = None,
    ledger: Place = "default",
) -> None:
    """Set an airframe's total hours and landings.

    \b
    exceed ledger airframe ZZ-NMA --hours 1234.5 --landings 2210 --at 2031-05-01
    """
    with guarded(False):
        from exceed.ledger.acts import set_totals
        from exceed.ledger.dates import instant
        from exceed.ledger.store import open_ledger

        moment = time.time() if at is None else instant("--at", at)
        with open_ledger(ledger, create=True) as book:
            done = set_totals(book, registration, hours, landings, moment, by)
        parts = [f"{hours:g} h"] if hours is not None else []
        parts += [f"{landings} landings"] if landings is not None else []
        Terminal.err(f"{done['registration']}: {', '.join(parts)} at {done['at']}")
        for note in done["notes"]:
            Terminal.err(f"  {note}")


@app.command()
def decide(
    event: Annotated[str, typer.Argument(metavar="EVENT", help="Its id, or the beginning of it.")],
    verdict: Annotated[Verdict, typer.Option("--as", help="What was decided.")],
    by: By,
    note: Note = None,
    ledger: Place = "default",
) -> None:
    """Decide about an event. A later decision is a new row; the newest holds.

    \b
    exceed ledger decide 6f3a91c04b2e --as agreed --by "A. Miller" --note "felt and logged"
    """
    with guarded(False):
        from exceed.ledger import acts
        from exceed.ledger.store import open_ledger

        with open_ledger(ledger) as book:
            done = acts.decide(book, event, verdict.value, by, note)
        when = done["start"] or f"{done['start_s']} s into the recording"
        who = done["registration"] or "no registration"
        Terminal.err(f"{done['event']}: {who}, {done['title']}, {when}: {done['as']}")
        if done["event"] != done["asked"].lower() and not done["event"].startswith(done["asked"].lower()):
            Terminal.err("  this is what the newest judgement made of the event you named")
        if done["removed"]:
            Terminal.err("  the newest judgement no longer finds this event")
        if done["earlier"] is not None:
            Terminal.err(f"  was decided before: {done['earlier']['as']}, {done['earlier']['at']}")


@app.command()
def close(
    inspection: Annotated[str, typer.Argument(metavar="INSPECTION", help="Its id, or the beginning of it.")],
    by: By,
    reference: Annotated[str, typer.Option("--reference", metavar="TEXT", help="Where the work is recorded.")],
    note: Note = None,
    ledger: Place = "default",
) -> None:
    """Close an inspection that was done.

    \b
    exceed ledger close bf4fb73aec6b --by "R. Singh" --reference "work order 31-204"
    """
    with guarded(False):
        from exceed.ledger import acts
        from exceed.ledger.store import open_ledger

        with open_ledger(ledger) as book:
            done = acts.close(book, inspection, by, reference, note)
        Terminal.err(f"{done['id']}: {done['registration'] or 'no registration'}, {done['task']}: closed")


@app.command()
def reopen(
    inspection: Annotated[str, typer.Argument(metavar="INSPECTION", help="Its id, or the beginning of it.")],
    by: By,
    note: Note = None,
    ledger: Place = "default",
) -> None:
    """Open a closed inspection again; the closing stays on record.

    \b
    exceed ledger reopen bf4fb73aec6b --by "R. Singh" --note "wrong wing looked at"
    """
    with guarded(False):
        from exceed.ledger import acts
        from exceed.ledger.store import open_ledger

        with open_ledger(ledger) as book:
            done = acts.reopen(book, inspection, by, note)
        Terminal.err(f"{done['id']}: {done['registration'] or 'no registration'}, {done['task']}: open again")


@app.command()
def reassign(
    flight: Annotated[str, typer.Argument(metavar="FLIGHT", help="Its id from 'exceed ledger flights'.")],
    to: Annotated[str, typer.Option("--to", metavar="REG", help="The aeroplane that flew it.")],
    by: Annotated[str | None, typer.Option("--by", metavar="NAME", help="Who says so.")] = None,
    note: Note = None,
    ledger: Place = "default",
) -> None:
    """Give a flight, its events and what they ask for to another aeroplane.

    \b
    exceed ledger reassign 0c1d2e3f4a5b --to ZZ-NMC
    """
    with guarded(False):
        from exceed.ledger import acts
        from exceed.ledger.store import open_ledger

        with open_ledger(ledger) as book:
            done = acts.reassign(book, flight, to, by, note)
        Terminal.err(f"{done['flight']}: from {done['from'] or 'no registration'} to {done['to']}")
        Terminal.err("  its events were judged by the limits of the aeroplane it was taken for")
        for name in done["inspections"]:
            Terminal.err(f"  inspection {name} is now {done['to']}'s")
        for name in done["clashes"]:
            Terminal.err(f"  {done['to']} has flight {name} at the same time: is one of them wrong?")


@app.command()
def export(
    out: Out,
    deidentify: Annotated[
        bool, typer.Option("--deidentify", help="Without registrations, dates, names, paths, positions, texts.")
    ] = False,
    key: Annotated[
        Path | None,
        typer.Option("--key", metavar="FILE", help="Key of the hashes, to tell exports apart or together."),
    ] = None,
    least: Annotated[int, typer.Option("--least", min=1, metavar="N", help="Smallest count that is given.")] = 5,
    ledger: Place = "default",
) -> None:
    """Write the ledger as one JSON file.

    \b
    exceed ledger export --out shared.json --deidentify
    """
    with guarded(False):
        import json as library

        from exceed.ledger import export as room
        from exceed.ledger.store import open_ledger
        from exceed.report.write import write_whole

        if key is not None and not deidentify:
            raise UsageError.one("--key", "is of use only with --deidentify", "--deidentify", "add it")
        secret = room.read_key(key) if deidentify else b""
        now = time.time()
        with open_ledger(ledger) as book:
            found = book.reading(
                lambda table: (
                    room.export_deidentified(table, secret, least, now) if deidentify else room.export(table, now)
                )
            )
        write_whole(out, library.dumps(found, indent=1, allow_nan=False) + "\n")
        Terminal.err(f"written: {out}")
        for line in (*found.get("removed", ()), found.get("suppressed", "")):
            if line:
                Terminal.err(f"  {line}")


@app.command("blank-names")
def blank_names(
    before: Annotated[str, typer.Option("--before", metavar="DATE", help="Acts recorded before this date (UTC).")],
    ledger: Place = "default",
) -> None:
    """Blank the names of people and the notes of older acts; the acts stay.

    \b
    exceed ledger blank-names --before 2029-01-01
    """
    with guarded(False):
        from exceed.ledger import acts
        from exceed.ledger.dates import instant, utc_text
        from exceed.ledger.store import open_ledger

        moment = utc_text(instant("--before", before))
        with open_ledger(ledger) as book:
            counts = acts.blank_names(book, moment)
        Terminal.err(f"{sum(counts.values())} rows blanked before {moment}; none was deleted")


@app.command()
def backup(out: Out, ledger: Place = "default") -> None:
    """Copy an SQLite ledger into one file, also while a scan writes.

    \b
    exceed ledger backup --out ledger-2031-05-02.sqlite
    """
    with guarded(False):
        from exceed.ledger.store import open_ledger

        with open_ledger(ledger) as book:
            book.backup(out)
        Terminal.err(f"written: {out}")


class ScanLedger:
    """The ledger of one scan: opened before any log is read, written after the judging, its failure said last."""

    def __init__(self, place: str | None, new_only: bool) -> None:
        self._book: Ledger | None = None
        self._error: ExceedError | None = None
        # what the pipeline asks which logs to leave out, None where all are wanted
        self.sift = self._sift if new_only else None
        if place is None:
            if new_only:
                raise UsageError.one(
                    "--new-only", "needs a ledger to know what is new", "--ledger URL|default", "add it"
                )
            return
        from exceed.ledger.store import open_ledger

        self._book = open_ledger(place, create=True)
    def _sift(self, logs: Sequence[LogPath]) -> tuple[list[LogPath], list[Skipped]]:
        """The logs whose content is not in the ledger, and the others with the reason."""
        from exceed.ledger.record import known_digests
        from exceed.read import Skipped

        assert self._book is not None
        found = {log.location: _file_digest(log) for log in logs}
        known = known_digests(self._book, [one for one in found.values() if one])
        # a known recording may come packed anew: look inside those that are packed
        inside = {place: _content_digest(place) for place, one in found.items() if one and one not in known}
        known |= known_digests(self._book, [one for one in inside.values() if one])
        old = [log for log in logs if found[log.location] in known or inside.get(log.location) in known]
        Terminal.err(f"ledger: {len(old)} of {len(logs)} logs skipped, their content is in it")
        gone = {log.location for log in old}
        kept = [log for log in logs if log.location not in gone]
        return kept, [Skipped(log.shown, "its content is in the ledger already") for log in old]

    def record(self, summary: dict[str, Any]) -> None:
        """Add the summary; `replaces` is filled in. A failure waits until the outputs are written."""
        if self._book is None:
            return
        from exceed.ledger.record import record
        from exceed.report.ledger import recorded_lines

        try:
            result = record(self._book, summary)
        except ExceedError as error:
            self._error = error
            return
        finally:
            self._book.close()
        summary["replaces"] = result["replaces"]
        for line in recorded_lines(result, self._book.where.shown):
            Terminal.err(line)

    def finish(self) -> None:
        """Raise what went wrong with the ledger."""
        if self._error is not None:
            raise self._error


def _file_digest(log: LogPath) -> str | None:
    """SHA-256 of a log's bytes as they lie; None where it cannot be read (the scan will say why)."""
    import hashlib

    from exceed.errors import LogError
    from exceed.read.container import CHUNK, raw

    digest = hashlib.sha256()
    try:
        with raw(log.location, log.shown) as stream:
            while piece := stream.read(CHUNK):
                digest.update(piece)
    except (LogError, OSError):
        return None
    return digest.hexdigest()


def _content_digest(location: str) -> str | None:
    """SHA-256 of what a packed file holds; None for one that is not packed or cannot be read."""
    import hashlib

    from exceed.errors import LogError
    from exceed.read.container import open_source, unpacked

    digest = hashlib.sha256()
    try:
        source = open_source(location)
        if not source.packed:
            return None
        for piece in unpacked(location, location, source.packed, source.size):
            digest.update(piece)
    except (LogError, OSError):
        return None
    return digest.hexdigest()

