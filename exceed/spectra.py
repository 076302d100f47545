"""Spectra of load factor over all logs: level crossings, peaks and rainflow cycles per ASTM E1049.

Only what was recorded is counted: at the samples, in flight, each stretch for itself. A gap, a rejected sample and a
flight's end part the history, and nothing is rebuilt between samples.
"""

from __future__ import annotations

import traceback
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from exceed.core.diagrams import SpectrumLog, SpectrumOutcome, SpectrumRow
from exceed.core.intervals import EMPTY, Array, Intervals, difference, intersection, normal, union
from exceed.core.outcome import JudgedWith
from exceed.core.phases import PHASE_CODE, PHASES
from exceed.core.recording import GAP_INTERVALS, GAP_LEAST
from exceed.core.trace import Grid, Trace
from exceed.documents.aircraft import plain_registration
from exceed.errors import ExceedError, LogError, Problem
from exceed.pipeline import Assigned, traced
from exceed.prepare import Run, prepare
from exceed.read import LogPath, find_logs
from exceed.settings import Settings
from exceed.tallies import REFERENCE, STEP, Counts, CycleCounts, count_stretch, stretches

Codes = NDArray[np.int8]
WANTED = ("load_factor", "gust_velocity", "mass")
CAUSES = ("gust", "manoeuvre", "not told apart")
BLOCK = 65536  # samples evaluated at a time


@dataclass(slots=True)
class Growing:
    """The spectrum of one aeroplane, or of all, as logs come in."""

    registration: str | None
    logs: int = 0
    flights: int = 0
    flights_known: bool = True
    airborne: float = 0.0
    stretches: int = 0
    samples: int = 0
    rates: set[float] = field(default_factory=set)
    whole: Counts = field(default_factory=Counts)
    cycles: CycleCounts = field(default_factory=CycleCounts)
    phases: dict[int, Counts] = field(default_factory=dict)
    causes: dict[int, Counts] = field(default_factory=dict)
    untold: dict[str, int] = field(default_factory=dict)
    weighted: Counts = field(default_factory=Counts)
    weighted_cycles: CycleCounts = field(default_factory=CycleCounts)
    weighted_logs: int = 0
    unweighted: dict[str, int] = field(default_factory=dict)
    reference_mass: float | None = None
    derived: bool = False
    # UTC of the airborne time that is counted already: a later download may hold it again
    flown: Intervals = field(default_factory=lambda: EMPTY)

    def add(self, other: Growing) -> None:
        """One more log."""
        self.logs += other.logs
        self.flights += other.flights
        self.flights_known = self.flights_known and other.flights_known
        self.airborne += other.airborne
        self.stretches += other.stretches
        self.samples += other.samples
        self.rates |= other.rates
        self.whole.add(other.whole)
        self.cycles.add(other.cycles)
        self.derived = self.derived or other.derived
        for mine, others in ((self.phases, other.phases), (self.causes, other.causes)):
            for code, counts in others.items():
                mine.setdefault(code, Counts()).add(counts)
        for told, more in ((self.untold, other.untold), (self.unweighted, other.unweighted)):
            for why, many in more.items():
                told[why] = told.get(why, 0) + many
        if other.weighted_logs:
            if self.reference_mass is None:
                self.reference_mass = other.reference_mass
            if self.reference_mass == other.reference_mass:
                self.weighted_logs += other.weighted_logs
                self.weighted.add(other.weighted)
                self.weighted_cycles.add(other.weighted_cycles)
            else:
                why = "another maximum take-off mass than the first log's"
                self.unweighted[why] = self.unweighted.get(why, 0) + 1

    def row(self, *, everything: bool = False) -> SpectrumRow:
        """What was counted, for the outputs."""
        weighted = self.weighted_logs > 0 and not everything
        return SpectrumRow(
            registration=self.registration,
            everything=everything,
            logs=self.logs,
            flights=self.flights if self.flights_known else None,
            airborne=self.airborne,
            stretches=self.stretches,
            samples=self.samples,
            rates=tuple(sorted(self.rates)),
            tally=self.whole.tally(),
            cycles=self.cycles.tally(),
            by_phase=tuple((PHASES[code], self.phases[code].tally()) for code in sorted(self.phases)),
            by_cause=tuple((CAUSES[code], self.causes[code].tally()) for code in sorted(self.causes)),
            cause_note=_logs_by_reason(self.untold),
            weighted=self.weighted.tally() if weighted else None,
            weighted_cycles=self.weighted_cycles.tally() if weighted else None,
            reference_mass=self.reference_mass if weighted else None,
            weighted_note="load factor x mass is not added up over aeroplanes"
            if everything
            else _logs_by_reason(self.unweighted),
            derived=self.derived,
        )


def _logs_by_reason(reasons: dict[str, int]) -> str:
    return "; ".join(f"{why} ({many} log{'s' if many > 1 else ''})" for why, many in sorted(reasons.items()))


def spectrum(settings: Settings, progress: Callable[[int, int], None] | None = None) -> SpectrumOutcome:
    """The spectra of all logs. Raises ExceedError for wrong wishes or documents; a log that fails is in the outcome.

    progress : called with (done, all) after each log.
    """
    logs, skipped = find_logs(settings.paths)
    run = prepare(settings, [(str(Path(log.location).parent), log.root) for log in logs])
    growing: dict[str | None, Growing] = {}
    seen: dict[str, str] = {}
    rows: list[SpectrumLog] = []
    for done, log in enumerate(logs, 1):
        rows.append(_one(log, run, growing, seen))
        if progress is not None:
            progress(done, len(logs))
    groups = [growing[key] for key in sorted(growing, key=lambda key: (key is None, key or ""))]
    found = [group.row() for group in groups]
    if len(groups) > 1:
        everything = Growing(None)
        for group in groups:
            everything.add(group)
        found.append(everything.row(everything=True))
    return SpectrumOutcome(
        logs=tuple(rows),
        rows=tuple(found),
        step=STEP,
        reference=REFERENCE,
        # rules bear on no count
        judged_with=tuple(row for row in run.judged_with if _bears(row)),
        skipped=tuple(skipped),
        notes=run.notes,
    )


def _bears(row: JudgedWith) -> bool:
    return row.kind != "rules"


def _one(log: LogPath, run: Run, growing: dict[str | None, Growing], seen: dict[str, str]) -> SpectrumLog:
    """One log, counted into its aeroplane's spectrum. Never raises: a log that cannot be counted is a failed one."""
    try:
        assigned, trace = traced(log, run, WANTED)
        return _count(log, assigned, trace, growing, seen)
    except ExceedError as error:
        first, *more = error.problems or (Problem(log.shown, "failed"),)
        return SpectrumLog(log.shown, "failed", first, notes=tuple(str(problem) for problem in more))
    except MemoryError:
        do = "split the log, or give the machine more memory"
        return SpectrumLog(log.shown, "failed", Problem(log.shown, "there is not enough memory for this log", "", do))
    except Exception as error:  # a bug met in one log must not lose the others
        words = traceback.format_exc() if run.settings.debug else f"{type(error).__name__}: {error}"
        problem = f"internal error, this is a fault of exceed: {words}"
        do = "run again with --debug and report it with the log"
        return SpectrumLog(log.shown, "failed", Problem(log.shown, problem, "", do))


def _count(
    log: LogPath, assigned: Assigned, trace: Trace, growing: dict[str | None, Growing], seen: dict[str, str]
) -> SpectrumLog:
    recording = trace.recording
    key = plain_registration(assigned.registration) if assigned.registration else None
    about = SpectrumLog(
        path=log.shown,
        status="counted" if recording.status == "ok" else "partial",
        registration=assigned.registration,
        sha256=recording.sha256 or None,
        content_sha256=recording.content_sha256 or None,
        notes=assigned.notes,
    )
    if recording.content_sha256 and recording.content_sha256 in seen:
        note = f"the same content as {seen[recording.content_sha256]}: counted once"
        return replace(about, status="not counted", notes=(*about.notes, note))
    _must_have_load_factor(log, trace)
    airborne, again = _not_yet_counted(trace, growing.get(key))
    if recording.content_sha256:
        seen[recording.content_sha256] = log.shown
    member = assigned.member.aircraft
    reference = member.mass.maximum_take_off if member is not None else None
    mine = Growing(assigned.registration, logs=1, airborne=_in_air(trace, airborne))
    mine.derived = "load_factor" not in trace.leaves(["load_factor"])
    grid = trace.grid(["load_factor"])
    gaps, edges = _add_flights(mine, trace, grid, airborne, None if reference is None else float(reference))
    mine.flights_known = trace.track.known
    mine.flights = sum(
        len(intersection(airborne, normal([flight.start], [flight.end]))) > 0 for flight in trace.track.flights
    )
    if mine.samples:
        mine.rates.add(round(1.0 / grid.interval, 3))
        growing.setdefault(key, Growing(assigned.registration)).add(mine)
        if key is not None and recording.clock.start is not None:
            start = recording.clock.start
            shifted = Intervals(airborne.start + start, airborne.end + start)
            growing[key].flown = union(growing[key].flown, shifted)
    return replace(
        about,
        method=_method(trace),
        interval=grid.interval,
        flights=mine.flights if trace.track.known else None,
        flights_by=trace.track.method,
        airborne=_in_air(trace, trace.track.airborne),
        counted=mine.whole.seconds,
        stretches=mine.stretches,
        samples=mine.samples,
        not_counted=_not_counted(trace, airborne, again, gaps, edges, mine),
        at_end=_at_sensor_end(trace, airborne),
        status=about.status if mine.samples or again <= 0.0 else "not counted",
        notes=tuple(dict.fromkeys((*about.notes, *trace.track.notes, *trace.notes))),
    )


def _must_have_load_factor(log: LogPath, trace: Trace) -> None:
    if not trace.has("load_factor"):
        why = trace.missing.get("load_factor") or "load factor not recorded"
        do = "name its column in a channels file, if the log has one"
        raise LogError(Problem(log.shown, f"no load factor: {why}", "a recorded load factor", do))
    step = trace.steps["load_factor"]
    if step.one_sided:
        problem = f"load factor is only known as a least value ({step.method}), which cannot be counted"
        raise LogError(Problem(log.shown, problem, "a recorded load factor", "leave this log out"))


def _method(trace: Trace) -> str:
    step = trace.steps["load_factor"]
    return step.method + (f"; {step.assumes}" if step.assumes else "")


def _not_yet_counted(trace: Trace, before: Growing | None) -> tuple[Intervals, float]:
    """The airborne time that no earlier log of this aeroplane held, and the seconds that one did."""
    airborne = trace.track.airborne
    start = trace.recording.clock.start
    if before is None or before.registration is None or start is None or len(before.flown) == 0:
        return airborne, 0.0
    known = Intervals(before.flown.start - start, before.flown.end - start)
    left = difference(known, airborne)
    return left, airborne.total - left.total


def _in_air(trace: Trace, airborne: Intervals) -> float:
    """Airborne seconds, without the made-up time of clock resets."""
    seams = normal([start for start, _ in trace.recording.seams], [end for _, end in trace.recording.seams])
    return airborne.total - (intersection(airborne, seams).total if len(seams) else 0.0)


def _add_flights(
    mine: Growing, trace: Trace, grid: Grid, airborne: Intervals, reference: float | None
) -> tuple[float, float]:
    """Count every stretch of the airborne time; the seconds that gaps take, and those between a flight's ends and its
    first and last sample."""
    weigh = _why_not_weighted(trace, reference)
    if weigh:
        mine.unweighted[weigh] = 1
    if not trace.has("gust_velocity"):
        why = f"gusts not told: {trace.missing.get('gust_velocity') or 'gust velocity not known'}"
        mine.untold[why] = 1
    gap = max(GAP_INTERVALS * grid.interval, GAP_LEAST)
    lost = edges = 0.0
    for start, end in airborne:
        low, high = (int(np.searchsorted(grid.time, edge)) for edge in (start, end))
        if high <= low:
            lost += end - start
            continue
        time = grid.time[low:high]
        values = _values(trace, grid, low, high)
        steps = np.diff(time)
        lost += float(steps[steps > gap].sum())
        for edge in (float(time[0]) - start, end - float(time[-1])):
            if edge > gap:
                lost += edge
            else:
                edges += edge
        load = values["load_factor"]
        phases = trace.track.phases.at(time)
        causes = _causes(phases, values.get("gust_velocity"))
        for first, last in stretches(time, np.isfinite(load), gap):
            part = slice(first, last)
            labels = ((phases[part], mine.phases), (causes[part], mine.causes))
            mine.whole.add(count_stretch(time[part], load[part], labels))
            mine.cycles.add_history(load[part])
            mine.stretches += 1
            mine.samples += last - first
        if not weigh and reference:
            heavy = load * values["mass"] / reference
            for first, last in stretches(time, np.isfinite(heavy), gap):
                part = slice(first, last)
                mine.weighted.add(count_stretch(time[part], heavy[part], ()))
                mine.weighted_cycles.add_history(heavy[part])
                mine.weighted_logs, mine.reference_mass = 1, reference
    return lost - (airborne.total - _in_air(trace, airborne)), edges


def _values(trace: Trace, grid: Grid, low: int, high: int) -> dict[str, Array]:
    names = [name for name in WANTED if trace.has(name)]
    parts = [trace.evaluate(names, grid, at, min(at + BLOCK, high)) for at in range(low, high, BLOCK)]
    return {name: np.concatenate([part[name] for part in parts]) for name in names}


def _causes(phases: Codes, gusts: Array | None) -> Codes:
    """Places in CAUSES: gust where a gust velocity could be derived, manoeuvre in that phase, else not told apart."""
    codes = np.where(phases == PHASE_CODE["manoeuvring"], 1, 2)
    if gusts is not None:
        codes = np.where(np.isfinite(gusts), 0, codes)
    return codes.astype(np.int8)


def _why_not_weighted(trace: Trace, reference: float | None) -> str:
    """Why load factor x mass cannot be counted; empty where it can."""
    if not trace.has("mass"):
        return trace.missing.get("mass") or "mass not known"
    if "mass" in trace.spans:
        return "mass known only as a range"
    return "" if reference is not None else "maximum take-off mass not known"


def _not_counted(
    trace: Trace, airborne: Intervals, again: float, gaps: float, edges: float, mine: Growing
) -> tuple[tuple[str, float], ...]:
    """Why airborne time was not counted, the longest first; a flight's ends between two samples are no loss."""
    left = _in_air(trace, airborne) - mine.whole.seconds - gaps - edges
    rows = (("counted in an earlier log", again), ("gap", gaps), ("rejected, or no value", left))
    return tuple(sorted((row for row in rows if row[1] > 1e-6), key=lambda row: -row[1]))


def _at_sensor_end(trace: Trace, airborne: Intervals) -> int:
    """Samples at which the accelerometer reads its end, so that the true load lies beyond."""
    channel = trace.channels.get("load_factor")
    if channel is None or "load_factor" not in trace.leaves(["load_factor"]):
        return 0
    low, high = channel.saturation
    slack = 0.5 * channel.resolution
    with np.errstate(invalid="ignore"):
        clipped = (channel.values <= low + slack) | (channel.values >= high - slack)
    return int(np.count_nonzero(clipped & airborne.contains(trace.recording.channel_time(channel))))
