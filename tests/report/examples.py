"""A day of outcomes made by hand: several aeroplanes, all that a report must be able to word. Invented throughout.

ZZ-NMA flies aerobatics (a clear over-g, a saturated pull, an undecided one), ZZ-NMC tours (a gap, no flap channel), an
unnamed log has no clock, one log failed, and names and notes try to break out of whatever they are written into.
"""

from __future__ import annotations

import math

import numpy as np

from exceed.core.findings import (
    Coverage,
    Event,
    Extreme,
    Findings,
    Level,
    LimitValue,
    PeakValue,
    RejectedFinding,
    Task,
)
from exceed.core.outcome import (
    AircraftInfo,
    ChannelRow,
    ClockRow,
    DayOutcome,
    EnvelopeLine,
    EventPlot,
    FeedRow,
    FlightRow,
    JudgedWith,
    LogOutcome,
    LogPlots,
    MassRow,
    MethodRow,
    RuleSetRow,
    Series,
    SpectrumPlot,
    VnPlot,
)
from exceed.core.recording import Rejected, Unresolved
from exceed.errors import Problem

KT = 1852.0 / 3600.0
FT = 0.3048
START = 1935478931.0  # 2031-05-02T09:02:11Z
OVER_G = Task("Over-g inspection as the approved manual has it; consider before next flight", "05-50", "next flight")
HOSTILE = (
    "<script>alert('x')</script> [red]bold[/red] \x1b[31mred\x1b[0m =HYPERLINK(\"http://x.invalid\") \u202egpj.exe"
)

RULES = RuleSetRow(
    "airframe",
    "Airframe limits",
    5,
    (
        ("load-factor-high", "Positive load factor"),
        ("load-factor-low", "Negative load factor"),
        ("never-exceed", "Never-exceed speed"),
        ("flaps-extended", "Flaps-extended speed"),
        ("operating-mach", "Maximum operating Mach number"),
    ),
    (),
    (("load-factor-high", "load_factor"), ("never-exceed", "airspeed")),
)
LARKSPUR = AircraftInfo(
    "ZZ-NMA",
    "L2-017",
    "Larkspur 200",
    "aerobatic",
    "own",
    "Invented for the demonstration",
    (("accelerometer calibrated", "2031-01-10"), ("accelerometer range", "-6 g to 9 g")),
    "aircraft/larkspur.yaml",
)
FENWICK = AircraftInfo("ZZ-NMC", "F4-203", "Fenwick 4", "normal", "assumed", "14 CFR 23.337 before Amdt 23-64")


_NO_HEIGHT = ("height above ground not recorded", "vertical speed not recorded")


def digest(letter: str) -> str:
    return (letter * 64)[:64]


def event(
    rule: str,
    title: str,
    quantity: str,
    *,
    at: float,
    value: float,
    limit: float,
    levels: tuple[tuple[str, float, float], ...],
    severity: str,
    certainty: str,
    probability: float,
    estimate: float | None = None,
    low: float | None = None,
    high: float | None = None,
    recorded: float | None = None,
    recorded_unit: str | None = None,
    side: str = "above",
    phase: str = "manoeuvring",
    flight: int | None = 1,
    lasting: float = 0.81,
    row: int = 0,
    inside: bool = False,
    task: Task | None = None,
    notes: tuple[str, ...] = (),
    context: dict[str, float] | None = None,
    cut_by: str | None = None,
    assumed: bool = False,
    sized: bool = True,
    saturated: bool = False,
    source: str = "aircraft.load_factor.maximum",
) -> Event:
    """An event with its levels (severity, threshold, seconds beyond); everything in SI."""
    start = at - lasting / 2
    return Event(
        rule=rule,
        title=title,
        quantity=quantity,
        side=side,
        severity=severity,
        limit_exceeded=not inside,
        certainty=certainty,
        probability=probability,
        flight=flight,
        phase=phase,
        start=start,
        end=start + lasting,
        peak=PeakValue(at, value, estimate, low, high, recorded, recorded_unit, sized, saturated),
        limit=LimitValue(limit, source, assumed),
        levels=tuple(
            Level(
                name,
                threshold,
                start if beyond else None,
                start + beyond if beyond else None,
                beyond,
                probability if beyond else 0.02,
            )
            for name, threshold, beyond in levels
        ),
        rows=(max(row - 3, 0), row + 3),
        row=row or round(at * 8),
        context=context or {"indicated_airspeed": 131.0 * KT, "pressure_altitude": 3100.0 * FT, "mass": 871.0},
        cut_by=cut_by,
        task=task,
        notes=notes,
        set_name="airframe",
    )


def plot_of(found: Event, rate: float = 8.0) -> EventPlot:
    """A smooth bump around the peak, sampled at `rate`, and a finer curve."""
    time = np.arange(found.peak.time - 6.0, found.peak.time + 6.0, 1.0 / rate)
    fine = np.linspace(time[0], time[-1], 240)

    def bump(t: np.ndarray, top: float) -> np.ndarray:
        base = 1.0 if "load" in found.quantity else 0.8 * top
        return base + (top - base) * np.exp(-(((t - found.peak.time) / 1.2) ** 2))

    top = found.peak.estimate if found.peak.estimate is not None else found.peak.value
    values = bump(time, found.peak.value)
    values[5] = math.nan
    speed = (60.0 + 8.0 * np.sin(time / 3.0)).astype(float)
    return EventPlot(
        found.rule,
        found.row,
        Series(found.quantity, time, values),
        Series(found.quantity, fine, bump(fine, top)),
        Series(found.quantity, time[[0, -1]], np.array([found.limit.value, found.limit.value])),
        (Series("indicated_airspeed", time, speed), Series("bank_angle", time, np.sin(time / 2.0))),
    )


def aerobatic() -> LogOutcome:
    """ZZ-NMA: two flights, one of each severity and certainty."""
    levels = (("advisory", 0.95 * 6.0, 1.4), ("caution", 6.0, 0.81), ("warning", 6.6, 0.0))
    over_g = event(
        "load-factor-high",
        "Positive load factor",
        "load_factor",
        at=812.5,
        value=6.21,
        estimate=6.243,
        low=6.12,
        high=6.37,
        recorded=6.21 * 9.80665,
        recorded_unit="m/s2",
        limit=6.0,
        levels=levels,
        severity="caution",
        certainty="established",
        probability=0.9999,
        task=OVER_G,
        notes=("roll rate not recorded: rolling limit not looked at",),
    )
    saturated = event(
        "load-factor-high",
        "Positive load factor",
        "load_factor",
        at=1420.25,
        value=8.98,
        estimate=8.98,
        low=8.9,
        high=None,
        limit=6.0,
        levels=(("advisory", 5.7, 2.2), ("caution", 6.0, 2.0), ("warning", 6.6, 1.6)),
        severity="warning",
        certainty="established",
        probability=1.0,
        lasting=2.2,
        saturated=True,
        task=OVER_G,
        notes=("the sensor was at the end of its range: at least this much",),
        context={"indicated_airspeed": 152.0 * KT, "flap_angle": 0.0, "gear_down": 1.0, "mass": math.nan},
    )
    near = event(
        "load-factor-high",
        "Positive load factor",
        "load_factor",
        at=2004.0,
        value=5.9996,
        estimate=5.9996,
        low=5.93,
        high=6.07,
        limit=6.0,
        levels=(("advisory", 5.7, 0.4), ("caution", 6.0, 0.0), ("warning", 6.6, 0.0)),
        severity="advisory",
        certainty="likely",
        probability=0.8,
        inside=True,
        lasting=0.4,
    )
    negative = event(
        "load-factor-low",
        "Negative load factor",
        "load_factor",
        at=3610.0,
        value=-3.05,
        estimate=-3.06,
        low=-3.21,
        high=-2.97,
        side="below",
        limit=-3.0,
        levels=(("caution", -3.0, 0.3), ("warning", -3.3, 0.0)),
        severity="caution",
        certainty="likely",
        probability=0.83,
        flight=2,
        lasting=0.3,
        task=OVER_G,
        source="aircraft.load_factor.minimum",
    )
    speed = event(
        "never-exceed",
        "Never-exceed speed",
        "indicated_airspeed",
        at=3702.0,
        value=175.4 * KT,
        estimate=175.3 * KT,
        low=173.4 * KT,
        high=177.2 * KT,
        limit=175.0 * KT,
        levels=(("caution", 175.0 * KT, 3.2),),
        severity="caution",
        certainty="possible",
        probability=0.42,
        flight=2,
        phase="descent",
        lasting=3.2,
        source="aircraft.speeds.never_exceed",
        cut_by="gap",
    )
    hidden = event(
        "load-factor-high",
        "Positive load factor",
        "load_factor",
        at=3200.0,
        value=5.88,
        estimate=6.02,
        low=5.83,
        high=6.24,
        limit=6.0,
        levels=(("advisory", 5.7, 0.5), ("caution", 6.0, 0.0), ("warning", 6.6, 0.0)),
        severity="caution",
        certainty="likely",
        probability=0.55,
        flight=2,
        lasting=0.5,
        task=OVER_G,
    )
    doubtful = event(
        "flaps-extended",
        "Flaps-extended speed",
        "indicated_airspeed",
        at=4100.0,
        value=110.1 * KT,
        estimate=109.2 * KT,
        low=107.0 * KT,
        high=110.9 * KT,
        limit=110.0 * KT,
        levels=(("caution", 110.0 * KT, 0.2),),
        severity="caution",
        certainty="doubtful",
        probability=0.03,
        flight=2,
        phase="approach",
        lasting=0.2,
        source="aircraft.speeds.flaps_extended",
    )
    flights = (
        FlightRow(1, 60.1, 2700.2, 1, mass=MassRow(905.0, 880.0, "loading sheet and fuel used")),
        FlightRow(
            2,
            3000.0,
            5000.2,
            0,
            landing_seen=False,
            mass=MassRow(None, None, "unknown", 640.0, 960.0),
            notes=("the recording ends in the air",),
        ),
    )
    findings = Findings(
        events=(doubtful, over_g, saturated, near, negative, speed),
        undecided=(hidden,),
        coverage=(
            Coverage("load-factor-high", None, 5100.0, 53.6, 0.0, 0.5, (("gap", 53.6),)),
            Coverage("load-factor-high", 1, 2640.1, 0.0, 0.0, 0.5, ()),
            Coverage("load-factor-high", 2, 1946.6, 53.6, 0.0, 0.5, (("gap", 53.6),)),
            Coverage("load-factor-low", None, 5100.0, 53.6, 0.0, 0.5, (("gap", 53.6),)),
            Coverage("never-exceed", None, 5100.0, 53.6, 0.0, 2.0, (("gap", 53.6),)),
            Coverage("flaps-extended", None, 0.0, 5153.6, 0.0, None, (("no flap channel", 5153.6),)),
            Coverage("operating-mach", None, 0.0, 0.0, 5153.6, None, (("no such limit in the aircraft file", 5153.6),)),
        ),
        extremes=(
            Extreme("load_factor", 1, (8.98, 1420.25), (-1.1, 901.2), 1.4967),
            Extreme("indicated_airspeed", 1, (152.0 * KT, 1421.0), None, 0.8686),
            Extreme("load_factor", 2, (5.88, 3200.0), (-3.05, 3610.0), 1.0167),
            Extreme("indicated_airspeed", 2, (175.4 * KT, 3702.0), None, 1.0023),
            Extreme("pressure_altitude", 2, (4550.0 * FT, 3100.0), (310.0 * FT, 4990.0), None),
        ),
        rejected=(
            RejectedFinding(
                Rejected("load_factor", "NORM ACC", 2100.0, 2100.1, 1, "spike", 14.2, (16800, 16800)),
                ("load-factor-high",),
            ),
            RejectedFinding(Rejected("bank_angle", "ROLL", 10.0, 250.0, 1920, "stuck", None, (80, 2000))),
        ),
        within_sensor_error=(("never-exceed", 4.0),),
        notes=("datum bias of 0.03 g taken off",),
    )
    return LogOutcome(
        path="zz-nma/a.csv",
        sha256=digest("a1"),
        content_sha256=digest("a1"),
        registration="ZZ-NMA",
        aircraft=LARKSPUR,
        rows=41230,
        recorded=5153.6,
        clock=ClockRow("date_time", START, 0, ((1200.0, 1253.6),), "UTC"),
        channels=(
            ChannelRow(
                "NORM ACC",
                "load_factor",
                "m/s2",
                8.0,
                "name and data",
                "median 9.8 in steady flight: m/s2, datum total",
                "up",
                "total",
                0.03,
                0.026,
                "aircraft file",
                0.004,
                0.999,
            ),
            ChannelRow("IAS", "indicated_airspeed", "kt", 1.0, "name", valid_share=1.0),
            ChannelRow("OAT", "static_air_temperature", "degC", 0.25, "name", bias=1.5, valid_share=0.98),
        ),
        unused=("SPARE 1", HOSTILE),
        unresolved=(Unresolved("SPD", "kt or km/h cannot be told", "which unit has SPD?"),),
        methods=(
            MethodRow("load_factor", "accelerometer", ("NORM ACC",), None, 0.026),
            MethodRow("calibrated_airspeed", "indicated airspeed", ("IAS",), "no position error known: CAS = IAS"),
        ),
        flights=flights,
        flights_method="speed and height",
        missing={"flap_angle": "no column gives it"},
        findings=findings,
        rule_sets=("airframe",),
        notes=("position error held beyond the ends of its table",),
        feeds=(
            FeedRow("airframe", "load-factor-high", "Positive load factor"),
            FeedRow("airframe", "never-exceed", "Never-exceed speed"),
            FeedRow("airframe", "flaps-extended", "Flaps-extended speed", ("flap angle not recorded",)),
            FeedRow("landing", "hard-landing", "Hard landing", _NO_HEIGHT),
            FeedRow("landing", "bounce", "Bounced landing", _NO_HEIGHT),
        ),
        plots=LogPlots(
            "zz-nma/a.csv",
            tuple(plot_of(found) for found in (over_g, saturated, near, negative, speed, hidden)),
            vn_plot(),
            SpectrumPlot(np.arange(-3.0, 9.01, 0.5), 400.0 * np.exp(-np.abs(np.arange(-3.0, 9.01, 0.5) - 1.0)), 1.3),
        ),
    )


def vn_plot(points: int = 5000) -> VnPlot:
    """Flown points scattered in a plausible envelope."""
    random = np.random.default_rng(7)
    speed = 40.0 + 15.0 * random.standard_normal(points)
    load = 1.0 + 0.8 * random.standard_normal(points)
    stall = np.linspace(0.0, 66.0, 30)
    return VnPlot(
        "equivalent_airspeed",
        speed,
        load,
        (
            EnvelopeLine("stall, upright", "stall", stall, (stall / 27.0) ** 2),
            EnvelopeLine("maximum 6 g", "load factor", np.array([66.0, 90.0]), np.array([6.0, 6.0])),
            EnvelopeLine("never exceed", "speed", np.array([90.0, 90.0]), np.array([-3.0, 6.0])),
            EnvelopeLine("minimum -3 g", "load factor", np.array([47.0, 90.0]), np.array([-3.0, -3.0])),
        ),
        "at 960 kg, sea level",
    )


def touring() -> LogOutcome:
    """ZZ-NMC: a clean flight on assumed limits."""
    return LogOutcome(
        path="zz-nmc/2031-05-02.parquet",
        sha256=digest("c3"),
        content_sha256=digest("c3"),
        registration="ZZ-NMC",
        aircraft=FENWICK,
        rows=7200,
        recorded=7199.0,
        clock=ClockRow("epoch", START + 3600.0),
        channels=(ChannelRow("nz", "load_factor", "g", 1.0, "name"),),
        flights=(FlightRow(1, 100.0, 7000.0, 1, mass=MassRow(1110.0, 1060.0, "--mass")),),
        flights_method="speed and height",
        findings=Findings(
            coverage=(
                Coverage("load-factor-high", None, 7199.0, 0.0, 0.0, 4.0),
                Coverage("load-factor-low", None, 7199.0, 0.0, 0.0, 4.0),
                Coverage("never-exceed", None, 0.0, 0.0, 7199.0, None, (("the category gives no such limit", 7199.0),)),
            ),
            extremes=(Extreme("load_factor", 1, (1.62, 3000.0), (0.55, 3300.0), 0.4263),),
        ),
        rule_sets=("airframe",),
    )


def bare() -> LogOutcome:
    """A bare accelerometer log: no clock, no registration, nothing tells flights apart; hostile text all over."""
    found = event(
        "load-factor-high",
        HOSTILE,
        "load_factor",
        at=33.0,
        value=4.2,
        limit=3.8,
        levels=(("caution", 3.8, 0.5),),
        severity="caution",
        certainty="possible",
        probability=0.3,
        flight=None,
        phase="unknown",
        sized=False,
        low=4.1,
        high=None,
        lasting=0.5,
        assumed=True,
        task=Task(HOSTILE, None),
        notes=("not sized: the channel is too slow for this peak", HOSTILE),
        context={"load_factor": 4.2},
    )
    return LogOutcome(
        path="other/log[red]\x1b[31m.csv",
        status="partial",
        problem=Problem("other/log[red].csv:2051:6", "the last line is cut off", "a whole line", "nothing"),
        sha256=digest("b7"),
        content_sha256=digest("b7"),
        rows=480,
        recorded=60.0,
        clock=ClockRow("elapsed"),
        channels=(ChannelRow("=cmd|' /C calc'!A0", "load_factor", "g", 8.0, "data"),),
        unused=("\u2028", "größe"),
        flights=(FlightRow(None, 0.0, 60.0),),
        findings=Findings(
            events=(found,),
            coverage=(Coverage("load-factor-high", None, 60.0, 0.0, 0.0, 0.5),),
            extremes=(Extreme("load_factor", None, (4.2, 33.0), (0.2, 30.0), 1.1053),),
        ),
        rule_sets=("airframe",),
        notes=("nothing tells flights apart: all recorded time counts as airborne",),
        plots=LogPlots("other/log[red]\x1b[31m.csv", (plot_of(found),)),
    )


def failed() -> LogOutcome:
    return LogOutcome(
        path="zz-nmj/broken.csv",
        status="failed",
        problem=Problem("zz-nmj/broken.csv:1:1", "no column looks like time", "a column of time", "name it"),
        sha256=digest("d9"),
    )


def day() -> DayOutcome:
    """All of it."""
    return DayOutcome(
        logs=(touring(), aerobatic(), failed(), bare()),
        created="2031-05-02T18:00:00Z",
        judged_with=(
            JudgedWith("rules", "airframe", digest("e1")),
            JudgedWith("aircraft", "aircraft/larkspur.yaml", digest("e2")),
            JudgedWith("option", name="--mass", value="900 kg"),
        ),
        rules=(RULES,),
        skipped=(("notes.txt", "not a log: no table in it"),),
        operator="Northmoor Flying Group",
        fleet="fleet.yaml",
        time_zone="Europe/Paris",
    )


def clean_day() -> DayOutcome:
    """One clean flight."""
    return DayOutcome(logs=(touring(),), created="2031-05-02T18:00:00Z", rules=(RULES,), time_zone="UTC")


def empty_day() -> DayOutcome:
    return DayOutcome(logs=(), created="2031-05-02T18:00:00Z")


def long_day(events: int = 3000) -> DayOutcome:
    """Thousands of events in one log."""
    log = aerobatic()
    template = log.findings.events[1]
    many = tuple(
        event(
            template.rule,
            template.title,
            template.quantity,
            at=100.0 + place,
            value=6.0 + (place % 17) / 10.0 + 0.01,
            estimate=6.02 + (place % 17) / 10.0,
            low=5.95,
            high=8.1,
            limit=6.0,
            levels=(("caution", 6.0, 0.5), ("warning", 6.6, 0.2)),
            severity=("caution", "warning")[place % 3 == 0],
            certainty=("possible", "likely", "established")[place % 3],
            probability=(0.2, 0.6, 0.97)[place % 3],
            task=OVER_G,
            row=800 + 8 * place,
        )
        for place in range(events)
    )
    return DayOutcome(
        logs=(
            LogOutcome(
                path="long.csv",
                registration="ZZ-NMA",
                aircraft=LARKSPUR,
                rows=events * 8,
                recorded=events + 200.0,
                clock=ClockRow("epoch", START),
                flights=(FlightRow(1, 50.0, events + 150.0, 1),),
                findings=Findings(events=many),
            ),
        ),
        created="2031-05-02T18:00:00Z",
        rules=(RULES,),
    )
