"""The ledger's lists: filters become one call, its rows become a table or JSON."""

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
from exceed.errors import UsageError

if TYPE_CHECKING:
    from exceed.ledger.history import Filters
    from exceed.report.layout import Screen

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


class Certainty(StrEnum):
    doubtful = "doubtful"
    possible = "possible"
    likely = "likely"
    established = "established"


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
