"""The only place that joins the stages: read -> derive -> judge, for one log and for a day of logs.

`assess` is the unit of work: one log and a Run in, a LogOutcome out, both picklable, so that the same function serves
this process, others, and other machines.
"""

from __future__ import annotations

import datetime
import traceback
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

from exceed.core.outcome import DayOutcome, FeedRow, LogOutcome
from exceed.core.quantities import QUANTITIES
from exceed.core.recording import Recording
from exceed.core.trace import Trace
from exceed.derive.plan import build_trace, needed_channels
from exceed.documents.aircraft import Aircraft, same_registration
from exceed.documents.fleet import belongs
from exceed.errors import ExceedError, LogError, Problem, UsageError
from exceed.judge.compile import compile_rule
from exceed.judge.compiled import Compiled
from exceed.judge.engine import judge
from exceed.judge.events import CONTEXT
from exceed.outcomes import outcome
from exceed.prepare import Member, Run, prepare
from exceed.read import find_logs, load, survey
from exceed.read.find import Skipped
from exceed.read.memory import require
from exceed.settings import Settings

if TYPE_CHECKING:
    from exceed.read.find import LogPath
    from exceed.read.look import Survey

# every flight's extremes are given for these, as far as they can be had
EXTREMES: tuple[str, ...] = (
    "load_factor",
    "bank_angle",
    "indicated_airspeed",
    "calibrated_airspeed",
    "true_airspeed",
    "mach",
    "pressure_altitude",
    "stall_margin",
    "mass",
)
# the page draws these besides
PLOTTED: tuple[str, ...] = ("equivalent_airspeed", "pitch_angle", "vertical_speed")
# and for these where a rule has their columns read anyway
MORE_EXTREMES: tuple[str, ...] = ("lateral_load_factor", "pitch_angle", "vertical_speed", "ground_speed")
# threads for blocks of one log; a log of fewer samples is not worth a second one
THREADS = 2
WORTH_THREADS = 200_000
UNDONE = "not read: the run was interrupted"


@dataclass(frozen=True, slots=True)
class Assigned:
    """Whose a log is: the documents it is judged with, the registration, what is to be said of it."""

    member: Member
    registration: str | None
    survey: Survey
    notes: tuple[str, ...] = ()


def scan(
    settings: Settings,
    progress: Callable[[int, int], None] | None = None,
    sift: Callable[[Sequence[LogPath]], tuple[list[LogPath], list[Skipped]]] | None = None,
) -> DayOutcome:
    """The main job. Raises ExceedError for wrong wishes or documents; a log that fails is in the outcome.

    progress : called with (done, all) after each log. Interrupted while logs are read, the day holds those done.
    sift : given the logs found, those to read and those to leave out with the reason.
    """
    if settings.dask is not None and settings.jobs is not None:
        do = "leave --jobs out: the cluster has its own"
        raise UsageError(Problem("--jobs", "cannot go with --dask", "one of the two", do))
    logs, skipped = find_logs(settings.paths)
    if sift is not None:
        logs, known = sift(logs)
        skipped = [*skipped, *known]
    run = prepare(settings, [(str(Path(log.location).parent), log.root) for log in logs])
    if settings.dask is not None:
        from exceed.cluster import each_on_cluster

        done = each_on_cluster(logs, run, settings.dask, progress)
    else:
        from exceed.batch import each

        done = each(logs, run, settings.jobs, progress)
    found = day(run, done.outcomes, [*skipped, *(Skipped(log.shown, UNDONE) for log in done.left)])
    notes = list(done.notes)
    if done.left:
        notes.append(f"interrupted: {len(done.outcomes)} of {len(logs)} logs were done, this holds for these alone")
    return replace(found, notes=(*found.notes, *notes), interrupted=bool(done.left))


def day(run: Run, outcomes: Iterable[LogOutcome], skipped: Iterable[Skipped] = ()) -> DayOutcome:
    """Outcomes of logs as one day."""
    fleets = [run.fleets[path] for path in sorted(run.fleets)]
    one = fleets[0].fleet if len(fleets) == 1 else None
    created = datetime.datetime.now(datetime.UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    return DayOutcome(
        logs=tuple(outcomes),
        created=created,
        judged_with=run.judged_with,
        rules=run.rule_sets,
        skipped=tuple((one.shown, one.reason) for one in skipped),
        fleet=", ".join(row.path or "" for row in run.judged_with if row.kind == "fleet") or None,
        operator=one.operator if one is not None else None,
        time_zone=one.time_zone if one is not None else None,
        notes=run.notes,
    )


def assess(log: LogPath, run: Run) -> LogOutcome:
    """One log, from file to outcome. Never raises: a log that cannot be read or assessed is a failed outcome."""
    try:
        return _assess(log, run)
    except ExceedError as error:
        return failed(log.shown, error)
    except MemoryError:
        return failed(log.shown, LogError(Problem(log.shown, "there is not enough memory for this log", "",
                                                  "split the log, or give the machine more memory")))  # fmt: skip
    except Exception as error:  # a bug met in one log must not lose the others
        words = f"internal error, this is a fault of exceed: {type(error).__name__}: {error}"
        problem = Problem(log.shown, words, "", "run again with --debug and report it with the log")
        traced = [Problem(log.shown, traceback.format_exc())] if run.settings.debug else []
        return failed(log.shown, LogError(problem, *traced))


def failed(path: str, error: ExceedError) -> LogOutcome:
    """The outcome of a log that could not be done."""
    first, *more = error.problems or (Problem(path, "failed"),)
    return LogOutcome(path, "failed", first, notes=tuple(str(problem) for problem in more))


def _assess(log: LogPath, run: Run) -> LogOutcome:
    assigned = assign(log, run)
    member = assigned.member
    _possible_mass(log, run, member)
    names = wanted(member, plots=run.settings.plots)
    recording = read(assigned, names)
    _something_recorded(assigned.survey)
    trace = build_trace(recording, member.aircraft, quantities=names, mass=run.mass, loading=list(member.loading))
    compiled = ready_rules(trace, member)
    threads = THREADS if len(recording.time) > WORTH_THREADS else 1
    findings = judge(trace, compiled, extremes_of(trace, names), threads=threads)
    plots = None
    if run.settings.plots:
        from exceed.drawing import log_plots

        plots = log_plots(log.shown, trace, compiled, findings, member.aircraft)
    notes = [*assigned.notes, *_mass_not_used(run, trace)]
    return outcome(log.shown, member, assigned.registration, trace, findings, compiled, notes=notes, plots=plots)


def _possible_mass(log: LogPath, run: Run, member: Member) -> None:
    """Raise LogError for a take-off mass that this aeroplane cannot have: a slip would pick the wrong limits."""
    empty = member.aircraft.mass.empty if member.aircraft is not None else None
    if run.mass is not None and empty is not None and run.mass < empty:
        raise LogError(
            Problem(
                log.shown,
                f"--mass {run.settings.mass} is less than the empty mass of {empty}",
                f"a take-off mass above {empty}",
                "correct --mass",
            )
        )


def _mass_not_used(run: Run, trace: Trace) -> list[str]:
    """What to say where loading sheets went before --mass."""
    sheets = [str(row.flight) for row in trace.masses if row.method.startswith("loading sheet")]
    if run.mass is None or not sheets:
        return []
    return [f"--mass is not used for flight {', '.join(sheets)}: the loading sheet goes before it"]


def _something_recorded(found: Survey) -> None:
    """Raise LogError for a log of which nothing but the clock is understood: not assessed, which is no all clear."""
    if found.quantities:
        return
    columns = [column.name for column in found.columns if column.index not in found.clock.columns]
    named = ", ".join(columns[:6]) + (f" and {len(columns) - 6} more" if len(columns) > 6 else "")
    raise LogError(
        Problem(
            found.path,
            f"none of its columns is understood: {named or 'there is only a clock'}",
            "a column of load factor, airspeed, height or attitude",
            "name the columns in a channels file; 'exceed describe LOG --write FILE' starts one",
        )
    )


def assign(log: LogPath, run: Run) -> Assigned:
    """Whose log is it? What is written in it, else its recorder's serial, else the fleet's patterns.

    Raises LogError where the evidence disagrees.
    """
    settings = run.settings
    loaded = run.fleet_of(log.location)
    member = run.default
    first = survey(log, channels=member.channels, declared=member.book.quantities)
    written = first.registration
    notes: list[str] = []
    if settings.registration and written and not same_registration(settings.registration, written):
        raise LogError(
            Problem(
                log.shown,
                f"the log says it is of {written}, and --registration says {settings.registration}",
                "one registration",
                "leave --registration out, or choose the logs of one aeroplane",
            )
        )
    registration = written or settings.registration
    if loaded is not None:
        relative = _relative(log.location, loaded.fleet.folder)
        found = belongs(
            loaded.fleet, registration, first.recorder_serial, [path for path in (relative, log.shown) if path]
        )
        if found.problem:
            raise LogError(
                Problem(
                    log.shown, found.problem, "evidence that agrees", "correct the fleet file, or name the aeroplane"
                )
            )
        if found.note:
            notes.append(found.note)
        if found.entry is not None:
            member = loaded.members[found.entry.registration]
        registration = found.registration or registration
    own = member.aircraft
    if settings.aircraft and own is not None and not own.assumed:
        if written and not same_registration(written, own.registration):
            raise LogError(
                Problem(
                    log.shown,
                    f"the log says it is of {written}, and {own.path} is the file of {own.registration}",
                    f"a log of {own.registration}",
                    "give the aeroplane's own file, or use a fleet file",
                )
            )
        registration = registration or own.registration
    if member is not run.default and (member.channels or member.book.quantities):
        first = survey(log, channels=member.channels, declared=member.book.quantities)
    if registration is None:
        notes.append("no registration: neither the log nor its recorder's serial nor the fleet file says whose it is")
    return Assigned(member, registration, first, tuple(notes))


def _relative(location: str, folder: Path) -> str | None:
    try:
        return Path(location).resolve().relative_to(folder.resolve()).as_posix()
    except ValueError:
        return None


def wanted(member: Member, *, plots: bool = False) -> list[str]:
    """The quantities that rules, context and extremes ask for, and the page's plots."""
    names: dict[str, None] = {}
    for rule in member.book.rules:
        for name in rule.needs(member.aircraft):
            names[name] = None
        if rule.quantity != "airspeed":
            names[rule.quantity] = None
    for name in (*EXTREMES, *CONTEXT, *(PLOTTED if plots else ())):
        names[name] = None
    return list(names)


def read(assigned: Assigned, names: Iterable[str] | None) -> Recording:
    """The recording, with no more columns than these quantities need (None: all)."""
    found = assigned.survey
    aircraft = assigned.member.aircraft
    ranges = sensor_ranges(aircraft)
    needed = None
    if names is not None:
        available = set(found.quantities)
        needed = needed_channels(_indexed(names, available), available, aircraft)
    require(found, needed)
    return load(found, needed, ranges=ranges)


def sensor_ranges(aircraft: Aircraft | None) -> dict[str, tuple[float, float]]:
    """The ends of the sensors' ranges that the aircraft file states, SI: at them a reading means at least."""
    sensor = aircraft.recorder.accelerometer if aircraft is not None else None
    if sensor is None or not sensor.range:
        return {}
    low, high = sensor.range
    return {"load_factor": (float(low), float(high))}


def extremes_of(trace: Trace, names: Iterable[str] | None = None) -> list[str]:
    """The quantities whose extremes are given: of `names` (None: all), those that are known and not only as a range."""
    asked = None if names is None else set(names)
    return [
        name
        for name in (*EXTREMES, *MORE_EXTREMES)
        if trace.has(name) and name not in trace.spans and (asked is None or name in asked)
    ]


def _indexed(names: Iterable[str], available: set[str]) -> list[str]:
    """Names, and for one like engine_speed every engine_speed_1, engine_speed_2 that is there."""
    from exceed.documents.rules import base_name

    wanted_names = dict.fromkeys(names)
    for name in sorted(available):
        if base_name(name) in wanted_names:
            wanted_names[name] = None
    return list(wanted_names)


def ready_rules(trace: Trace, member: Member) -> list[Compiled]:
    """The member's rules, ready for this trace."""
    return [
        one
        for rule in member.book.rules
        for one in compile_rule(rule, trace, member.aircraft, rule.rule_set, member.book.quantities)
    ]


def trace_of(settings: Settings) -> tuple[Trace, LogOutcome]:
    """The trace of one log with every quantity, and its outcome without events. Raises ExceedError."""
    log, run = _one_log(settings)
    assigned = assign(log, run)
    recording = read(assigned, None)
    trace = build_trace(recording, assigned.member.aircraft, mass=run.mass, loading=list(assigned.member.loading))
    findings = judge(trace, [], extremes_of(trace))
    return trace, outcome(log.shown, assigned.member, assigned.registration, trace, findings, [], notes=assigned.notes)


def describe(settings: Settings) -> tuple[LogOutcome, Survey, Recording]:
    """What is in one log, and which built-in rules it can feed. Raises ExceedError."""
    from exceed.documents.rulebook import BUILT_IN, load_rules

    log, run = _one_log(settings)
    assigned = assign(log, run)
    recording = read(assigned, None)
    aircraft = assigned.member.aircraft
    trace = build_trace(recording, aircraft, mass=run.mass, loading=list(assigned.member.loading))
    findings = judge(trace, [], extremes_of(trace))
    feeds = []
    for name in BUILT_IN:
        rules = load_rules(name)
        for rule in rules.rules:
            rows = compile_rule(rule, trace, aircraft, name, rules.quantities)
            lacks = tuple(dict.fromkeys(text for row in rows if (text := row.unassessed or row.not_applicable)))
            feeds.append(FeedRow(name, rule.id, rule.title or rule.id, lacks))
    made = outcome(log.shown, assigned.member, assigned.registration, trace, findings, [], notes=assigned.notes)
    return replace(made, feeds=tuple(feeds)), assigned.survey, recording


def _one_log(settings: Settings) -> tuple[LogPath, Run]:
    logs, skipped = find_logs(settings.paths)
    run = prepare(settings, [(str(Path(log.location).parent), log.root) for log in logs])
    if not logs:
        reason = skipped[0].reason if skipped else "no such log"
        raise LogError(Problem(settings.paths[0], reason, "one log", "name a log file"))
    if len(logs) > 1:
        raise LogError(Problem(settings.paths[0], f"there are {len(logs)} logs here", "one log", "name one of them"))
    return logs[0], run


def traced(log: LogPath, run: Run, names: Iterable[str]) -> tuple[Assigned, Trace]:
    """One log's trace of some quantities, and whose it is. Raises ExceedError."""
    names = list(names)
    assigned = assign(log, run)
    recording = read(assigned, names)
    member = assigned.member
    return assigned, build_trace(
        recording, member.aircraft, quantities=names, mass=run.mass, loading=list(member.loading)
    )


__all__ = ["QUANTITIES", "assess", "day", "describe", "failed", "scan", "trace_of", "traced"]
