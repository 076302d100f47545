"""What the commands do: call the pipeline, word its outcome, choose the exit code."""

from __future__ import annotations

import contextlib
import os
import sys
import time
import traceback
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

import typer

from exceed.errors import ExceedError

if TYPE_CHECKING:
    from exceed.core.outcome import DayOutcome
    from exceed.settings import Settings

DONE, FOUND, WRONG, FAILED, FOUND_AND_FAILED, INTERRUPTED = 0, 1, 2, 3, 4, 130


class Terminal:
    """What the two streams are. Each decides for itself whether it is a terminal."""

    @staticmethod
    def width(stream: Any) -> int | None:
        """Columns of a terminal, None for a pipe or a file."""
        if not stream.isatty():
            return None
        with contextlib.suppress(OSError, ValueError):
            columns = int(os.environ.get("COLUMNS", "0") or "0")
            return columns if columns > 0 else os.get_terminal_size(stream.fileno()).columns
        return 80

    @staticmethod
    def err(text: str) -> None:
        """A line on stderr, with control characters shown, not sent."""
        from exceed.report.show import visible

        for line in text.split("\n"):
            print(visible(line), file=sys.stderr)


@contextlib.contextmanager
def guarded(debug: bool) -> Iterator[None]:
    """A user's mistake becomes its message and exit code, a fault of ours one line; never a traceback unasked."""
    try:
        yield
    except (typer.Exit, typer.Abort):
        raise
    except KeyboardInterrupt:
        Terminal.err("exceed: interrupted")
        raise typer.Exit(INTERRUPTED) from None
    except ExceedError as error:
        Terminal.err(f"exceed: {error}")
        raise typer.Exit(error.exit_code) from None
    except MemoryError:
        Terminal.err("exceed: there is not enough memory for this\n  do: scan fewer or smaller logs at a time")
        raise typer.Exit(FAILED) from None
    except Exception as error:
        if debug:
            traceback.print_exc()
        Terminal.err(
            f"exceed: internal error, this is a fault of exceed: {type(error).__name__}: {error}\n"
            "  do: run again with --debug and report it"
        )
        raise typer.Exit(FAILED) from None


def run_scan(settings: Settings, shown: dict[str, Any]) -> int:
    """Scan, write what was asked for, and give the exit code."""
    from exceed import pipeline
    from exceed.cli.ledger import ScanLedger
    from exceed.report.summary import summarise
    from exceed.report.write import check_target, to_json, write_whole

    check_target(shown["json"])
    check_target(shown["html"])
    ledger = ScanLedger(shown["ledger"], shown["new_only"], shown["quiet"])
    with _progress(shown["quiet"]) as progress:
        outcome = pipeline.scan(settings, progress, ledger.sift)
    summary = summarise(outcome)
    ledger.record(summary)
    if shown["json"] is not None:
        write_whole(shown["json"], to_json(summary))
    if shown["html"] is not None:
        _write_page(outcome, summary, shown)
    if shown["json"] != "-" and not shown["quiet"]:
        _print_table(summary, shown)
    _say_failures(summary, shown)
    if settings.debug:
        for recording in summary["recordings"]:
            if recording["status"] == "failed":
                Terminal.err("\n".join(recording["notes"]))
    ledger.finish()
    if outcome.interrupted:
        Terminal.err(f"exceed: {summary['notes'][-1]}")
        return INTERRUPTED
    return exit_code(summary, shown["fail_at"])


def _print_table(summary: dict[str, Any], shown: dict[str, Any]) -> None:
    from exceed.report.show import wants_colour, wants_unicode
    from exceed.report.table import render_table

    out = sys.stdout
    text = render_table(
        summary,
        width=Terminal.width(out),
        colour=wants_colour(dict(os.environ), terminal=out.isatty(), no_colour=not shown["colour"]),
        unicode=wants_unicode(out.encoding),
        units=shown["units"],
        certainty_floor=shown["certainty"],
    )
    _out(text)


def _write_page(outcome: DayOutcome, summary: dict[str, Any], shown: dict[str, Any]) -> None:
    from exceed.report.page import render_page
    from exceed.report.write import write_whole

    plots = [log.plots for log in outcome.logs if log.plots is not None]
    page = render_page(summary, plots, units=shown["units"], certainty_floor=shown["certainty"])
    write_whole(shown["html"], page)


def _out(text: str) -> None:
    """Text to stdout, whatever its encoding can take."""
    encoding = sys.stdout.encoding or "utf-8"
    sys.stdout.write(text.encode(encoding, "replace").decode(encoding))
    sys.stdout.flush()


def _say_failures(summary: dict[str, Any], shown: dict[str, Any]) -> None:
    """Failed logs on stderr too, where the table does not say them."""
    if not shown["quiet"] and shown["json"] != "-":
        return
    if not summary["recordings"]:
        left = len(summary.get("skipped") or ())
        why = f"{left} {'file' if left == 1 else 'files'} left out, no log to read" if left else "no log was found"
        Terminal.err(f"exceed: {why}, so nothing was assessed")
    for recording in summary["recordings"]:
        if recording["status"] == "failed":
            Terminal.err(f"exceed: {_problem_text(recording)}")


def _problem_text(recording: dict[str, Any]) -> str:
    problem = recording["problem"]
    if isinstance(problem, str):
        return problem
    text = f"{problem['place']}: {problem['problem']}" if problem.get("place") else str(problem["problem"])
    if problem.get("expected"):
        text += f"\n  expected: {problem['expected']}"
    if problem.get("do"):
        text += f"\n  do: {problem['do']}"
    return text


def exit_code(summary: dict[str, Any], fail_at: str | None) -> int:
    """0 done, 1 found at or above `fail_at`, 3 some logs failed, 4 both."""
    from exceed.core.findings import SEVERITIES

    found = False
    if fail_at is not None:
        least = SEVERITIES.index(fail_at)
        found = any(
            SEVERITIES.index(event["severity"]) >= least
            for recording in summary["recordings"]
            for event in (*recording["events"], *recording["undecided"])
        )
    bad = any(recording["status"] == "failed" for recording in summary["recordings"])
    return {(False, False): DONE, (True, False): FOUND, (False, True): FAILED, (True, True): FOUND_AND_FAILED}[
        found, bad
    ]


@contextlib.contextmanager
def _progress(quiet: bool) -> Iterator[Any]:
    """A progress bar on stderr for a terminal, nothing else."""
    if quiet or not sys.stderr.isatty():
        yield None
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn

    columns = (
        TextColumn("reading logs"), BarColumn(), MofNCompleteColumn(), TextColumn("{task.fields[rate]}"),
        TimeRemainingColumn(),
    )  # fmt: skip
    started = time.monotonic()
    with Progress(*columns, console=Console(stderr=True), transient=True) as bar:
        task = bar.add_task("logs", total=None, rate="")

        def show(done: int, total: int) -> None:
            rate = done / max(time.monotonic() - started, 1e-3)
            bar.update(task, completed=done, total=total, rate=f"{rate:.3g}/s")

        yield show


def run_describe(settings: Settings, write: Path | None, colour: bool) -> int:
    """Print a note on one log; write a channels file if asked."""
    from exceed import pipeline
    from exceed.report.describe import describe
    from exceed.report.show import wants_colour, wants_unicode
    from exceed.report.write import check_target

    check_target(write)
    outcome, survey, recording = pipeline.describe(settings)
    out = sys.stdout
    _out(
        describe(
            outcome,
            width=Terminal.width(out),
            colour=wants_colour(dict(os.environ), terminal=out.isatty(), no_colour=not colour),
            unicode=wants_unicode(out.encoding),
        )
    )
    if write is not None:
        from exceed.read import channels_file
        from exceed.report.write import write_whole

        write_whole(write, channels_file(survey, recording))
        Terminal.err(f"channels file written: {write}")
    return DONE


def run_trace(settings: Settings, out: Path) -> int:
    """Write the derived table."""
    from exceed import pipeline
    from exceed.tables import check_table, write_trace

    check_table(out)
    trace, outcome = pipeline.trace_of(settings)
    rows, columns = write_trace(trace, outcome, out)
    from exceed.core.findings import CAUTIONS

    Terminal.err(f"{rows} rows and {columns} columns written: {out}")
    for name, why in sorted(trace.missing.items()):
        Terminal.err(f"  {name.replace('_', ' ')}: null, {why}")
    for caution in CAUTIONS:
        Terminal.err(caution)
    return DONE


def run_envelope(aircraft: str, asked: dict[str, str | None], shown: dict[str, Any]) -> int:
    """The V-n diagram of an aeroplane as table, JSON, page."""
    from exceed.envelopes import envelope_asked
    from exceed.report.envelope import envelope_page, envelope_summary, render_envelope
    from exceed.report.show import wants_unicode
    from exceed.report.write import to_json, write_whole

    found = envelope_asked(aircraft, **asked)
    summary = envelope_summary(found)
    if shown["json"] is not None:
        write_whole(shown["json"], to_json(summary))
    if shown["html"] is not None:
        write_whole(shown["html"], envelope_page(summary, found, units=shown["units"]))
    if shown["json"] != "-":
        out = sys.stdout
        unicode = wants_unicode(out.encoding)
        _out(render_envelope(summary, width=Terminal.width(out), unicode=unicode, units=shown["units"]))
    return DONE


def run_spectrum(settings: Settings, shown: dict[str, Any]) -> int:
    """Spectra of load factor as tables, JSON, page; 3 if a log could not be counted."""
    from exceed import spectra
    from exceed.report.show import wants_unicode
    from exceed.report.spectrum import render_spectrum, spectrum_page, spectrum_summary
    from exceed.report.write import check_target, to_json, write_whole

    check_target(shown["json"])
    check_target(shown["html"])
    with _progress(False) as progress:
        found = spectra.spectrum(settings, progress)
    summary = spectrum_summary(found)
    if shown["json"] is not None:
        write_whole(shown["json"], to_json(summary))
    if shown["html"] is not None:
        write_whole(shown["html"], spectrum_page(summary, found))
    if shown["json"] == "-":
        _say_failures(summary, {"quiet": True, **shown})
    else:
        out = sys.stdout
        _out(render_spectrum(summary, width=Terminal.width(out), unicode=wants_unicode(out.encoding)))
    return FAILED if any(log["status"] == "failed" for log in summary["recordings"]) else DONE


def run_lint(files: list[Path]) -> int:
    """Every problem of every file, and advice; 2 if there is a problem."""
    from exceed.documents.lint import check
    from exceed.report.show import visible

    bad = False
    for path in files:
        problems, advice = check(path)
        bad = bad or bool(problems)
        for problem in (*problems, *advice):
            print("\n".join(visible(line) for line in str(problem).split("\n")))
        if not problems:
            print(f"{visible(path)}: no problem found")
    return WRONG if bad else DONE


def run_schema(kind: str) -> int:
    import json

    if kind == "summary":
        from exceed.report.model import schema_summary

        found = schema_summary()
    else:
        from exceed.documents.schema import schema

        found = schema(kind)
    _out(json.dumps(found, indent=1, ensure_ascii=False) + "\n")
    return DONE


def run_selfcheck(all_lines: bool) -> int:
    """The published check values, recomputed here; 1 if one fails."""
    from exceed.reference.check import run_checks
    from exceed.report.checks import render_checks

    results = run_checks()
    _out(render_checks(results, all_lines=all_lines))
    return DONE if all(result.passed for result in results) else FOUND
