"""What people add to the ledger, and what leaves it as a file: one command, one call, one line of what was done."""

from __future__ import annotations

import time
from enum import StrEnum
from pathlib import Path
from typing import Annotated

import typer

from exceed.cli.ledger_lists import Place
from exceed.cli.run import Terminal, guarded
from exceed.errors import UsageError

By = Annotated[str, typer.Option("--by", metavar="NAME", help="Who says so.")]
Note = Annotated[str | None, typer.Option("--note", metavar="TEXT", help="Why; can be blanked later.")]
Out = Annotated[Path, typer.Option("--out", metavar="FILE", help="The file to write.")]


class Verdict(StrEnum):
    agreed = "agreed"
    sensor_fault = "sensor-fault"
    wrong_data = "wrong-data"
    not_an_exceedance = "not-an-exceedance"


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
            counts, clean = acts.blank_names(book, moment)
        Terminal.err(f"{sum(counts.values())} rows blanked before {moment}; none was deleted")
        Terminal.err("  backups made earlier still hold what was blanked")
        if not clean:
            Terminal.err("  another program has the ledger open: run this again when it is done, to clear the log file")


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
