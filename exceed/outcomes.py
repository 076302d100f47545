"""A judged trace -> the values that the outputs word: how each column, clock, method, flight and limit was had."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from exceed.core.findings import Findings
from exceed.core.outcome import (
    AircraftInfo,
    ChannelRow,
    ClockRow,
    FlightRow,
    LogOutcome,
    LogPlots,
    MassRow,
    MethodRow,
)
from exceed.core.quantities import QUANTITIES
from exceed.core.recording import GAP_INTERVALS, GAP_LEAST, Channel, Recording
from exceed.core.trace import Step, Trace
from exceed.documents.aircraft import Aircraft
from exceed.judge.compiled import Compiled
from exceed.judge.telltales import telltale_notes
from exceed.prepare import Member

# samples of a log at which a method's typical uncertainty is taken
SPREAD = 5


def outcome(
    path: str,
    member: Member,
    registration: str | None,
    trace: Trace,
    findings: Findings,
    compiled: list[Compiled],
    *,
    notes: Iterable[str] = (),
    plots: LogPlots | None = None,
) -> LogOutcome:
    """Everything that the outputs say of one log."""
    recording = trace.recording
    declared = dict(member.book.quantities)
    declared.update({rule.judged: rule.quantity.shown for rule in compiled if rule.judged not in QUANTITIES})
    return LogOutcome(
        path=path,
        status=recording.status,
        sha256=recording.sha256,
        content_sha256=recording.content_sha256,
        registration=registration,
        aircraft=aircraft_info(member.aircraft, registration),
        rows=recording.rows,
        recorded=recording.duration,
        clock=clock_row(recording),
        channels=tuple(channel_row(recording, one) for one in _recorded(trace)),
        unused=recording.unused,
        unresolved=recording.unresolved,
        methods=method_rows(trace),
        flights=flight_rows(trace),
        flights_method=trace.track.method,
        missing=dict(trace.missing),
        findings=findings,
        rule_sets=tuple(one.name for one in member.book.sets),
        declared=declared,
        notes=tuple(
            dict.fromkeys(
                (
                    *notes,
                    *recording.notes,
                    *trace.notes,
                    *trace.track.notes,
                    *findings.notes,
                    *telltale_notes(trace, findings.extremes, member.loading, registration),
                    *member.book.notes,
                    *(str(one) for one in member.book.replaced),
                )
            )
        ),
        plots=plots,
    )


def aircraft_info(aircraft: Aircraft | None, registration: str | None) -> AircraftInfo:
    """The aeroplane as its file has it; without one nothing but its registration."""
    if aircraft is None:
        return AircraftInfo(registration)
    recorder: list[tuple[str, str]] = []
    sensor = aircraft.recorder.accelerometer
    if sensor is not None and sensor.calibrated is not None:
        recorder.append(("accelerometer calibrated", str(sensor.calibrated)))
    return AircraftInfo(
        registration=aircraft.registration or registration,
        serial=aircraft.serial,
        type=aircraft.type,
        category=aircraft.category,
        limits="assumed" if aircraft.assumed else "own",
        source=aircraft.source,
        recorder=tuple(recorder),
        path=aircraft.path or None,
    )


def clock_row(recording: Recording) -> ClockRow:
    clock = recording.clock
    return ClockRow(clock.kind, clock.start, clock.resets, gaps(recording), clock.zone, clock.notes)


def gaps(recording: Recording) -> tuple[tuple[float, float], ...]:
    """Stretches of the axis without any row: intervals above 2.5 medians and half a second, seams left out."""
    time = recording.time
    if len(time) < 2:
        return ()
    longest = max(GAP_INTERVALS * recording.interval, GAP_LEAST)
    at = np.flatnonzero(np.diff(time) > longest)
    seams = set(recording.seams)
    pairs = [(float(time[index]), float(time[index + 1])) for index in at]
    return tuple(pair for pair in pairs if pair not in seams)


def _recorded(trace: Trace) -> list[Channel]:
    """The recorded channels, as the first pass left them, in the log's order of columns."""
    return [trace.channels.get(name, channel) for name, channel in trace.recording.channels.items()]


def channel_row(recording: Recording, channel: Channel) -> ChannelRow:
    return ChannelRow(
        column=channel.column,
        quantity=channel.quantity,
        unit=channel.unit,
        rate_hz=1.0 / channel.interval if channel.interval > 0.0 else None,
        found_by=channel.found_by,
        reason=channel.reason,
        sign=channel.sign,
        datum=channel.datum,
        bias=channel.bias.value if channel.bias is not None else None,
        standard_uncertainty=channel.standard_uncertainty,
        uncertainty_source=channel.uncertainty_source,
        resolution=channel.resolution or None,
        valid_share=channel.valid_share,
        notes=channel.notes,
    )


def method_rows(trace: Trace) -> tuple[MethodRow, ...]:
    """How each quantity was had, with a typical uncertainty."""
    return tuple(_method(trace, name, step) for name, step in trace.steps.items() if not name.startswith("_"))


def _method(trace: Trace, name: str, step: Step) -> MethodRow:
    inputs: list[str] = []
    if step.function is None and step.constant is None:
        channel = trace.channels.get(name)
        inputs.append(channel.column or name if channel is not None else name)
    for source in step.inputs.values():
        if source.startswith("recorded:"):
            inputs.append(trace.channels[source.removeprefix("recorded:")].column)
        elif source != "time":
            channel = trace.channels.get(source)
            direct = channel is not None and trace.steps[source].function is None and channel.column
            inputs.append(channel.column if channel is not None and direct else source)
    return MethodRow(
        quantity=name,
        method=step.method,
        inputs=tuple(dict.fromkeys(inputs)),
        assumes=step.assumes,
        standard_uncertainty=_typical(trace, name),
        source=step.source,
    )


def _typical(trace: Trace, name: str) -> float | None:
    """The median of the standard uncertainty at a few samples that have a value; None where it is not known."""
    row = QUANTITIES.get(name)
    if row is not None and row.discrete:
        return None
    grid = trace.grid([name])
    count = len(grid.time)
    if count == 0:
        return None
    places = np.unique(np.linspace(0, count - 1, SPREAD + 2).astype(np.int64)[1:-1])
    spread = trace.uncertainty_at(name, grid, places)
    known = spread[np.isfinite(trace.evaluate_at([name], grid, places)[name]) & (spread > 0.0)]
    return float(np.median(known)) if len(known) else None


def flight_rows(trace: Trace) -> tuple[FlightRow, ...]:
    """Each flight with its mass; one row without a number where nothing tells flights apart."""
    masses = {row.flight: row for row in trace.masses}
    span = trace.spans.get("mass")

    def mass(number: int) -> MassRow | None:
        found = masses.get(number)
        if span is not None:
            return MassRow(None, None, trace.steps["mass"].method if "mass" in trace.steps else "unknown", *span)
        return MassRow(found.take_off, found.landing, found.method) if found is not None else None

    if not trace.track.flights and not trace.track.known:
        duration = float(trace.recording.time[-1]) if len(trace.recording.time) else 0.0
        return (FlightRow(None, 0.0, duration, mass=mass(0)),)
    return tuple(FlightRow.of(flight, mass(flight.number)) for flight in trace.track.flights)
