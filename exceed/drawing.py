"""What the page draws of one log: a stretch about each event, the V-n diagram with the flown points, the spectrum.

Values only: nothing is judged again, the stretches come from the rows that findings carry.
"""

from __future__ import annotations

import numpy as np

from exceed.core.findings import Event, Findings
from exceed.core.intervals import Array
from exceed.core.outcome import EnvelopeLine, EventPlot, LogPlots, Series, SpectrumPlot, VnPlot
from exceed.core.trace import Grid, Trace
from exceed.documents.aircraft import Aircraft
from exceed.envelopes import envelope_at
from exceed.judge.block import SIZE, Block
from exceed.judge.compiled import Compiled
from exceed.physics import counting

# s drawn on either side of an event, and places a second of the smooth estimate
MARGIN = 6.0
SMOOTH = 8
MORE = (
    "load_factor",
    "indicated_airspeed",
    "pressure_altitude",
    "height_above_ground",
    "bank_angle",
    "pitch_angle",
    "roll_rate",
    "flap_angle",
    "gear_down",
    "mach",
    "stall_margin",
    "vertical_speed",
)
# a page stays usable with so many samples a curve
MOST_SAMPLES = 4_000
LEVELS = np.arange(-4.0, 8.01, 0.25)


def log_plots(
    path: str, trace: Trace, rules: list[Compiled], findings: Findings, aircraft: Aircraft | None
) -> LogPlots:
    """Everything the page draws of one log."""
    by_id: dict[tuple[str, str], Compiled] = {}
    for rule in rules:
        by_id.setdefault((rule.id, rule.judged), rule)
    plots = []
    for event in (*findings.events, *findings.undecided):
        found = by_id.get((event.rule, event.quantity))
        if found is not None:
            plots.append(event_plot(trace, found, event))
    declared = {rule.judged: rule.quantity.shown for rule in rules}
    return LogPlots(path, tuple(plots), vn_plot(trace, aircraft), spectrum_plot(trace), declared)


def event_plot(trace: Trace, rule: Compiled, event: Event) -> EventPlot:
    """The judged quantity about an event as samples, smooth estimate and limit, and what else was recorded."""
    grid = trace.grid(rule.grid_names)
    low, high = _places(grid, event)
    block = Block.patched(trace, grid, [(low, high)], sorted(rule.names))
    value = np.array(np.broadcast_to(rule.value.of(block), (len(block),)))
    bound = rule.limit.of(block) if rule.limit is not None else event.limit.value
    limit = np.array(np.broadcast_to(bound, (len(block),)), dtype=np.float64)
    limit[~np.isfinite(limit)] = np.nan
    time = np.array(block.time)
    more = [name for name in MORE if trace.has(name) and name != rule.judged]
    others = trace.evaluate(more, grid, low, high) if more else {}
    estimate = None if rule.discrete else _smooth(time, value, block.gap)
    return EventPlot(
        rule.id,
        event.row,
        Series(rule.judged, time, value),
        Series(rule.judged, *estimate) if estimate is not None else None,
        Series(rule.judged, time, limit),
        tuple(Series(name, time, np.array(values)) for name, values in others.items() if np.isfinite(values).any()),
    )


def _places(grid: Grid, event: Event) -> tuple[int, int]:
    """Grid places from MARGIN before an event to MARGIN after it; of a long one the part about its peak."""
    start, end = event.start - MARGIN, event.end + MARGIN
    low = int(np.searchsorted(grid.time, start))
    high = int(np.searchsorted(grid.time, end, side="right"))
    if high - low > MOST_SAMPLES:
        middle = int(np.searchsorted(grid.time, event.peak.time))
        low, high = max(low, middle - MOST_SAMPLES // 2), min(high, middle + MOST_SAMPLES // 2)
    return max(low, 0), max(high, low + 1)


def _smooth(time: Array, value: Array, gap: float) -> tuple[Array, Array] | None:
    """A cubic spline through the samples of each stretch without a gap, NaN between stretches."""
    from scipy.interpolate import CubicSpline

    known = np.isfinite(value)
    if np.count_nonzero(known) < 4:
        return None
    t, v = time[known], value[known]
    breaks = np.flatnonzero(np.diff(t) > gap) + 1
    times: list[Array] = []
    curves: list[Array] = []
    for part_t, part_v in zip(np.split(t, breaks), np.split(v, breaks), strict=True):
        if len(part_t) < 4:
            continue
        fine = np.linspace(part_t[0], part_t[-1], (len(part_t) - 1) * SMOOTH + 1)
        times += [fine, fine[-1:]]
        curves += [CubicSpline(part_t, part_v)(fine), np.array([np.nan])]
    return (np.concatenate(times), np.concatenate(curves)) if times else None


def vn_plot(trace: Trace, aircraft: Aircraft | None) -> VnPlot | None:
    """Flown points, equivalent airspeed against load factor, and the envelope at the mass of the moment."""
    if not (trace.has("load_factor") and trace.has("equivalent_airspeed")):
        return None
    grid = trace.grid(["load_factor"])
    speeds: list[Array] = []
    loads: list[Array] = []
    for start in range(0, len(grid.time), SIZE):
        stop = min(start + SIZE, len(grid.time))
        found = trace.evaluate(["load_factor", "equivalent_airspeed"], grid, start, stop)
        speed, load = found["equivalent_airspeed"], found["load_factor"]
        keep = np.isfinite(speed) & np.isfinite(load) & trace.track.airborne.contains(grid.time[start:stop])
        speeds.append(speed[keep])
        loads.append(load[keep])
    speed, load = np.concatenate(speeds), np.concatenate(loads)
    if len(speed) == 0:
        return None
    lines, note = envelope_lines(trace, aircraft)
    return VnPlot("equivalent_airspeed", speed, load, lines, note)


def envelope_lines(trace: Trace, aircraft: Aircraft | None) -> tuple[tuple[EnvelopeLine, ...], str]:
    """The V-n boundary at the take-off mass of the first flight (else the heaviest), flaps up, at sea level."""
    if aircraft is None:
        return (), "no limits known for this aeroplane"
    mass = trace.masses[0].take_off if trace.masses else aircraft.mass.maximum_take_off
    drawn = envelope_at(aircraft, float(mass) if mass is not None else None)
    if drawn is None:
        return (), "stall speed, positive limit or speed limit not known: no envelope drawn"
    speed = drawn.equivalent_airspeed
    lines = [EnvelopeLine("positive boundary", "load factor", speed, drawn.upper)]
    if np.isfinite(drawn.lower).any():
        lines.append(EnvelopeLine("negative boundary", "load factor", speed, drawn.lower))
    end = float(speed[-1])
    lowest = float(drawn.lower[-1]) if np.isfinite(drawn.lower[-1]) else 0.0
    lines.append(EnvelopeLine("speed limit", "speed", np.array([end, end]), np.array([lowest, float(drawn.upper[-1])])))
    words = f"{float(mass):.0f} kg" if mass is not None else "the mass of the stall speeds"
    return tuple(lines), f"envelope at {words}, flaps up, sea level"


def spectrum_plot(trace: Trace) -> SpectrumPlot | None:
    """Level crossings of load factor per flight hour, over the flights of the log."""
    hours = trace.track.airborne.total / 3600.0
    if not trace.has("load_factor") or hours <= 0.0:
        return None
    grid = trace.grid(["load_factor"])
    counts = np.zeros(len(LEVELS), dtype=np.int64)
    for start, end in trace.track.airborne:
        low, high = (int(np.searchsorted(grid.time, edge)) for edge in (start, end))
        values = trace.evaluate(["load_factor"], grid, low, high)["load_factor"] if high > low else np.empty(0)
        values = values[np.isfinite(values)]
        if len(values) > 1:
            counts += counting.level_crossings(values, LEVELS)
    return SpectrumPlot(LEVELS, counts / hours, hours, "level crossings, ASTM E1049; no fatigue life is claimed")
