"""`exceed ledger ...`: the history of each airframe."""

from __future__ import annotations

import typer

from exceed.cli import ledger_acts as acts
from exceed.cli import ledger_lists as lists
from exceed.cli.ledger_scan import ScanLedger

app = typer.Typer(
    name="ledger",
    no_args_is_help=True,
    rich_markup_mode=None,
    help=(
        "The history of each airframe, in a database.\n\n"
        "Events, decisions, inspections, totals, trends.\n\n"
        "Start with:  exceed scan sample_logs --ledger default"
    ),
)


for command in (
    lists.events,
    lists.flights,
    lists.inspections,
    lists.totals,
    lists.trends,
    lists.judgements,
    acts.airframe,
    acts.decide,
    acts.close,
    acts.reopen,
    acts.reassign,
    acts.export,
    acts.blank_names,
    acts.backup,
):
    app.command(command.__name__.replace("_", "-"))(command)

__all__ = ["ScanLedger", "app"]
