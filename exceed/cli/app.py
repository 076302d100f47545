"""The command line: options become one call of the pipeline, its outcome becomes text and an exit code.

Heavy imports sit inside the commands, so that `exceed --help` costs typer alone.
"""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Annotated, Any

import typer

from exceed import __version__
from exceed.cli import ledger as ledger_commands
from exceed.cli import options as opt
from exceed.cli import streams
from exceed.cli.run import Terminal, guarded
from exceed.errors import OutputError
from exceed.lean import without_pandas

app = typer.Typer(
    name="exceed",
    no_args_is_help=True,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
    help=(
        "After a day's flying: did an aeroplane leave its limits, by how much, how long, how surely, and what must be "
        "done before it flies again?\n\nStart with:  exceed scan sample_logs\n\n"
        "It informs; it releases no aeroplane."
    ),
)
app.add_typer(ledger_commands.app)


def _version(value: bool) -> None:
    if value:
        typer.echo(f"exceed {__version__}")
        raise typer.Exit()


@app.callback()
def _main(
    version: Annotated[
        bool, typer.Option("--version", callback=_version, is_eager=True, help="Show the version and leave.")
    ] = False,
) -> None:
    pass


@app.command()
def scan(
    paths: Annotated[list[str], typer.Argument(metavar="PATH...", help="Logs, folders, globs, object-store URIs.")],
    fleet: opt.Fleet = None,
    aircraft: opt.Aircraft = None,
    rules: Annotated[
        list[str] | None,
        typer.Option(
            "--rules",
            metavar="FILE|NAME",
            help=(
                "Rules to judge by, may be repeated: a file, or airframe, aerobatic, handling, landing, gust, engine. "
                "Default: the fleet file's, else airframe."
            ),
        ),
    ] = None,
    channels: opt.Channels = None,
    loading: opt.Loading = None,
    registration: opt.Registration = None,
    mass: opt.Mass = None,
    json: Annotated[
        str | None, typer.Option("--json", metavar="FILE|-", help="Write the summary as JSON; - to stdout, no table.")
    ] = None,
    html: Annotated[
        Path | None, typer.Option("--html", metavar="FILE", help="Write a page with plots, one file.")
    ] = None,
    fail_at: Annotated[
        opt.Severity | None,
        typer.Option("--fail-at", help="Exit with 1 if an event or undecided stretch reaches this severity."),
    ] = None,
    certainty: Annotated[
        opt.Certainty,
        typer.Option("--certainty", help="Lowest certainty shown in table and page; what is hidden is counted."),
    ] = opt.Certainty.possible,
    units: Annotated[opt.Units, typer.Option("--units", help="Units of table and page.")] = opt.Units.trade,
    jobs: Annotated[
        int | None, typer.Option("--jobs", min=1, metavar="N", help="Processes; default: as many as cores.")
    ] = None,
    dask: Annotated[
        str | None, typer.Option("--dask", metavar="ADDRESS", help="Read the logs on the cluster of this scheduler.")
    ] = None,
    ledger: Annotated[
        str | None,
        typer.Option(
            "--ledger",
            metavar="URL|default",
            help="Add what was found to a ledger: sqlite:///FILE, postgresql+psycopg://..., or the default one.",
        ),
    ] = None,
    new_only: Annotated[
        bool, typer.Option("--new-only", help="With --ledger: leave out logs whose content is in it.")
    ] = False,
    quiet: Annotated[bool, typer.Option("--quiet", help="No table, only problems on stderr.")] = False,
    no_color: Annotated[bool, typer.Option("--no-color", help="Plain text without colour.")] = False,
    debug: Annotated[bool, typer.Option("--debug", help="Show the traceback of an internal error.")] = False,
) -> None:
    """Read logs, judge them, print the events and what is due.

    \b
    exceed scan sample_logs
    exceed scan day/ --rules airframe --rules aerobatic --json day.json
    exceed scan sortie.csv --aircraft larkspur.yaml --mass "900 kg" --fail-at caution

    Exit codes: 0 done; 1 an event or undecided stretch at or above --fail-at; 2 wrong use or a wrong YAML file,
    nothing was scanned; 3 some logs failed; 4 both 1 and 3; 130 interrupted.
    """
    settings = opt.settings(
        paths, fleet=fleet, aircraft=aircraft, rules=rules, channels=channels, loading=loading,
        registration=registration, mass=mass, jobs=jobs, dask=dask, plots=html is not None, debug=debug,
    )  # fmt: skip
    shown = {
        "json": json,
        "html": html,
        "fail_at": fail_at.value if fail_at else None,
        "certainty": certainty.value,
        "units": units.value,
        "quiet": quiet,
        "colour": not no_color,
        "ledger": ledger,
        "new_only": new_only,
    }
    with guarded(debug):
        from exceed.cli.run import run_scan

        raise typer.Exit(run_scan(settings, shown))


@app.command()
def describe(
    log: Annotated[str, typer.Argument(metavar="LOG", help="One log.")],
    write: Annotated[
        Path | None, typer.Option("--write", metavar="FILE", help="Write a channels file to edit.")
    ] = None,
    fleet: opt.Fleet = None,
    aircraft: opt.Aircraft = None,
    channels: opt.Channels = None,
    loading: opt.Loading = None,
    registration: opt.Registration = None,
    mass: opt.Mass = None,
    no_color: Annotated[bool, typer.Option("--no-color", help="Plain text without colour.")] = False,
    debug: Annotated[bool, typer.Option("--debug", help="Show the traceback of an internal error.")] = False,
) -> None:
    """What is in a log and how each column was understood.

    Clock, channels, quality, flights, extremes, and which rules it can feed.

    \b
    exceed describe sortie.csv
    exceed describe sortie.csv --write channels.yaml
    """
    settings = opt.settings(
        [log], fleet=fleet, aircraft=aircraft, channels=channels, loading=loading, registration=registration,
        mass=mass, debug=debug,
    )  # fmt: skip
    with guarded(debug):
        from exceed.cli.run import run_describe

        raise typer.Exit(run_describe(settings, write, colour=not no_color))


@app.command()
def trace(
    log: Annotated[str, typer.Argument(metavar="LOG", help="One log.")],
    out: Annotated[Path, typer.Option("--out", metavar="FILE", help="A .parquet or .csv file.")],
    fleet: opt.Fleet = None,
    aircraft: opt.Aircraft = None,
    channels: opt.Channels = None,
    loading: opt.Loading = None,
    registration: opt.Registration = None,
    mass: opt.Mass = None,
    debug: Annotated[bool, typer.Option("--debug", help="Show the traceback of an internal error.")] = False,
) -> None:
    """Every quantity, recorded or derived, sample by sample.

    \b
    exceed trace sortie.csv --out sortie-trace.parquet
    """
    settings = opt.settings(
        [log], fleet=fleet, aircraft=aircraft, channels=channels, loading=loading, registration=registration,
        mass=mass, debug=debug,
    )  # fmt: skip
    with guarded(debug):
        from exceed.cli.run import run_trace

        raise typer.Exit(run_trace(settings, out))


@app.command()
def envelope(
    aircraft: Annotated[str, typer.Argument(metavar="AIRCRAFT", help="Aircraft file, or a category.")],
    mass: Annotated[
        str | None, typer.Option("--mass", metavar='"905 kg"', help="Mass; of a category the maximum take-off mass.")
    ] = None,
    altitude: Annotated[
        str | None, typer.Option("--altitude", metavar='"5000 ft"', help="Pressure altitude; default: sea level.")
    ] = None,
    flaps: Annotated[
        str | None, typer.Option("--flaps", metavar='"10 deg"', help="Flap setting; default: flaps up.")
    ] = None,
    html: Annotated[
        Path | None, typer.Option("--html", metavar="FILE", help="Write a page with the diagram, one file.")
    ] = None,
    json: Annotated[
        str | None, typer.Option("--json", metavar="FILE|-", help="Write the figures as JSON; - to stdout, no table.")
    ] = None,
    units: Annotated[opt.Units, typer.Option("--units", help="Units of table and page.")] = opt.Units.trade,
    debug: Annotated[bool, typer.Option("--debug", help="Show the traceback of an internal error.")] = False,
) -> None:
    """The V-n diagram of an aeroplane as figures and a plot.

    Corners, limits, stall and gust speeds, each with its source.

    \b
    exceed envelope aircraft.yaml --mass "905 kg" --altitude "5000 ft"
    exceed envelope normal --mass "1100 kg"
    """
    with guarded(debug):
        from exceed.cli.run import run_envelope

        shown = {"html": html, "json": json, "units": units.value}
        raise typer.Exit(run_envelope(aircraft, {"mass": mass, "altitude": altitude, "flaps": flaps}, shown))


@app.command()
def spectrum(
    paths: Annotated[list[str], typer.Argument(metavar="PATH...", help="Logs, folders, globs, object-store URIs.")],
    fleet: opt.Fleet = None,
    aircraft: opt.Aircraft = None,
    channels: opt.Channels = None,
    loading: opt.Loading = None,
    registration: opt.Registration = None,
    mass: opt.Mass = None,
    json: Annotated[
        str | None, typer.Option("--json", metavar="FILE|-", help="Write the spectra as JSON; - to stdout, no table.")
    ] = None,
    html: Annotated[
        Path | None, typer.Option("--html", metavar="FILE", help="Write a page with plots, one file.")
    ] = None,
    debug: Annotated[bool, typer.Option("--debug", help="Show the traceback of an internal error.")] = False,
) -> None:
    """Load factor counted: level crossings, peaks, rainflow cycles.

    Per ASTM E1049, per flight hour and per 1,000 h.

    \b
    exceed spectrum sample_logs
    exceed spectrum season/ --json season.json --html season.html
    """
    settings = opt.settings(
        paths, fleet=fleet, aircraft=aircraft, channels=channels, loading=loading, registration=registration,
        mass=mass, debug=debug,
    )  # fmt: skip
    with guarded(debug):
        from exceed.cli.run import run_spectrum

        raise typer.Exit(run_spectrum(settings, {"html": html, "json": json}))


@app.command()
def lint(
    files: Annotated[list[Path], typer.Argument(metavar="FILE...", help="Aircraft, rules, channels, loading, fleet.")],
) -> None:
    """Check YAML files of ours: what is wrong, where, what to do.

    \b
    exceed lint aircraft.yaml my-rules.yaml
    """
    with guarded(False):
        from exceed.cli.run import run_lint

        raise typer.Exit(run_lint(files))


@app.command()
def template(
    kind: Annotated[opt.Kind, typer.Argument(help="aircraft, rules, channels, loading or fleet.")],
) -> None:
    """Print a commented starter file.

    \b
    exceed template aircraft > my-aircraft.yaml
    """
    with guarded(False):
        from exceed.documents.templates import template as text

        typer.echo(text(kind.value), nl=False)


@app.command()
def schema(
    kind: Annotated[opt.SchemaKind, typer.Argument(help="aircraft, rules, channels, loading, fleet or summary.")],
) -> None:
    """Print the JSON Schema of a file, for editors and checkers.

    \b
    exceed schema rules > rules.schema.json
    """
    with guarded(False):
        from exceed.cli.run import run_schema

        raise typer.Exit(run_schema(kind.value))


@app.command()
def selfcheck(
    all_lines: Annotated[
        bool, typer.Option("--all", help="A line for every value, not only a summary a source.")
    ] = False,
) -> None:
    """Recompute the published check values on this machine.

    \b
    exceed selfcheck
    """
    with guarded(False):
        from exceed.cli.run import run_selfcheck

        raise typer.Exit(run_selfcheck(all_lines))


def main(arguments: list[str] | None = None) -> Any:
    """Entry point. A closed pipe changes nothing of a run; an output that fails is said; an interrupt ends with 130."""
    streams.install()
    if arguments is None:
        without_pandas()
    try:
        try:
            return app(args=arguments, standalone_mode=True)
        finally:
            sys.stdout.flush()
    except KeyboardInterrupt:
        Terminal.err("interrupted")
        sys.exit(130)
    except OutputError as error:
        Terminal.err(f"exceed: {error}")
        sys.exit(error.exit_code)


if __name__ == "__main__":
    main()
