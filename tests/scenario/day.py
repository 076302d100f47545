"""The invented day at Northmoor, 2 May 2031: eleven sorties, the recorders that wrote them, and why each is there."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from datetime import UTC, datetime

import numpy as np

from scenario import plans
from scenario.air import KT
from scenario.airframes import CORRAN, FENWICK, LARKSPUR, Airframe
from scenario.dialects import Habit, Truth, truth_from_flight
from scenario.flight import Flight, Manoeuvre, fly
from scenario.sensors import Sensor, sample


@dataclass(frozen=True, slots=True)
class Sortie:
    """One flight and its recording. `story` and `habit_words` go into the README."""

    path: str
    airframe: Airframe
    start: datetime | None  # of the first row; None: the recorder knows no date
    plan: Callable[[], list[Manoeuvre]]
    load: tuple[tuple[str, float], ...]  # station and kg; main_fuel in litres
    channels: tuple[str, ...]
    habit: Habit
    habit_words: str
    story: str
    rate_hz: float = 8.0
    rates: tuple[tuple[str, float], ...] = ()
    air: tuple[float, float] = (0.0, 4.0)  # temperature deviation in K, headwind in m/s
    spikes: tuple[tuple[float, float], ...] = ()  # load factor: s, g
    hide_peak: bool = False  # place the samples either side of the highest load factor
    gap_after_crossing: float | None = None  # s after the load factor crosses `gap_level` the rows stop
    gap_level: float = 0.0
    gap_seconds: float = 0.0
    facts: tuple[str, ...] = ()  # written into the log: registration, recorder_serial


def at(hour: int, minute: int, second: int = 0) -> datetime:
    return datetime(2031, 5, 2, hour, minute, second, tzinfo=UTC)


SLOW = {"outside_air_temperature": 1.0, "fuel_flow": 1.0, "fuel_mass": 1.0, "engine_speed": 1.0, "oil_temperature": 1.0}
LIGHT = ("load_factor", "indicated_airspeed", "pressure_altitude", "bank_angle", "pitch_angle", "heading",
         "outside_air_temperature", "engine_speed", "oil_temperature")  # fmt: skip
RATES = ("roll_rate", "pitch_rate", "yaw_rate")
TOURER = (*LIGHT, "flap_angle", "stall_warning", "fuel_flow")
JET = ("load_factor", "longitudinal_load_factor", "indicated_airspeed", "mach", "pressure_altitude",
       "height_above_ground", "bank_angle", "pitch_angle", "heading", "flap_angle", "gear_down", "airbrakes_out",
       "weight_on_wheels", "static_air_temperature", "fuel_mass", "ground_speed")  # fmt: skip
FINE = Habit(id="flint", clock="iso_z", spelling="plain")
SLOWER = tuple((name, 1.0) for name in (*TOURER, *JET) if name not in ("load_factor", "longitudinal_load_factor"))

DAY: tuple[Sortie, ...] = (
    Sortie(
        "zz-nma/nma-0810.txt",
        LARKSPUR,
        at(8, 10),
        plans.clean,
        (("pilot", 82.0), ("main_fuel", 70.0)),
        tuple(name for name in LIGHT if name not in ("engine_speed", "oil_temperature")),
        Habit(
            id="slate",
            delimiter=" ",
            header="name",
            units="metric",
            missing="-",
            clock="date_time_iso",
            names=(("load_factor", "NZ"), ("indicated_airspeed", "SPD"), ("pressure_altitude", "HT")),
        ),
        "text padded to columns, no units at all, ISO date and time; speed in km/h and height in m, which only "
        "`channels/larkspur.yaml` can tell",
        "A quiet local flight: turns, one gentle pull. Nothing beyond any limit.",
        rate_hz=4.0,
    ),
    Sortie(
        "zz-nma/nma-0902.csv",
        LARKSPUR,
        at(9, 2, 11),
        plans.clear_over_g,
        (("pilot", 82.0), ("baggage", 4.0), ("main_fuel", 70.0)),
        (*LIGHT, *RATES),
        FINE,
        "commas, units in brackets, ISO stamps with Z, everything at 8 Hz",
        "Solo aerobatics (loop, roll, inverted). The pull-out of the last dive goes well beyond 6 g.",
    ),
    Sortie(
        "zz-nma/nma-1020.csv",
        LARKSPUR,
        at(10, 20, 30),
        plans.hidden_over_g,
        (("pilot", 95.0), ("passenger", 98.0), ("baggage", 10.0), ("main_fuel", 90.0)),
        ("load_factor", "indicated_airspeed", "pressure_altitude", "bank_angle", "pitch_angle"),
        Habit(id="chert", delimiter="|", header="parens", rates="subframe", clock="iso_space", preamble="hash"),
        "pipes, units in parentheses, one row a second with eight load factors NZ1 to NZ8 in it, ISO stamps "
        "without a zone (UTC), facts in `#` lines",
        "Two aboard: above 880 kg the limit is 4.4 g. A short pull goes beyond it between two samples; every sample "
        "stays below.",
        hide_peak=True,
        rates=(("indicated_airspeed", 1.0), ("pressure_altitude", 1.0), ("bank_angle", 2.0), ("pitch_angle", 2.0)),
        facts=("registration", "recorder_serial"),
    ),
    Sortie(
        "zz-nma/nma-1145.csv",
        LARKSPUR,
        at(11, 45),
        plans.spikes,
        (("pilot", 86.0), ("main_fuel", 66.0)),
        (*LIGHT, *RATES),
        FINE,
        "as nma-0902",
        "Electrical spikes of one sample in quiet flight, two of them far beyond the limits; "
        "and one sharp pull beyond 6 g that is real.",
        spikes=((260.3, 8.6), (305.1, -5.2), (341.7, 4.9)),
    ),
    Sortie(
        "zz-nma/nma-1305.tsv",
        LARKSPUR,
        at(13, 5, 40),
        plans.gap,
        (("pilot", 84.0), ("main_fuel", 64.0)),
        LIGHT,
        Habit(
            id="marl",
            delimiter="\t",
            header="two-line",
            preamble="facts",
            clock="iso_space",
            vocabulary="upper",
            spelling="plain",
            newline="\r\n",
        ),
        "tabs, `key: value` lines first, a row of names and a row of units, CR LF",
        "The recorder stops for some seconds in the middle of a pull beyond 6 g: the start is seen, the end is not.",
        gap_after_crossing=0.3,
        gap_level=6.0,
        gap_seconds=6.0,
        facts=("registration",),
    ),
    Sortie(
        "zz-nmc/nmc_20310502_0840.csv.gz",
        FENWICK,
        at(8, 40),
        plans.gusty,
        (("pilot", 84.0), ("copilot", 76.0), ("rear", 70.0), ("main_fuel", 120.0)),
        TOURER,
        Habit(id="gneiss", clock="epoch_ms", vocabulary="snake", header="suffix", compression="gz"),
        "gzip; commas, snake_case names with the unit at the end, milliseconds since 1970",
        "Six minutes of rough air at 115 kt with four single gusts. Bumpy, within every limit.",
        rates=tuple(SLOW.items()),
    ),
    Sortie(
        "zz-nmc/nmc_20310502_1005.csv",
        FENWICK,
        at(10, 5),
        plans.stall,
        (("pilot", 84.0), ("copilot", 78.0), ("main_fuel", 118.0)),
        TOURER,
        Habit(id="basalt", rates="blanks", clock="iso_offset", spelling="words", quoting="text"),
        "commas, quoted names, ISO stamps with an offset of two hours; load factor at 8 Hz, "
        "all else at 1 Hz with empty cells between",
        "A steep turn that is tightened while the speed decays: stall warning, then the wing lets go "
        "(accelerated stall).",
        rates=(*SLOWER, ("fuel_flow", 1.0), ("engine_speed", 1.0), ("oil_temperature", 1.0)),
    ),
    Sortie(
        "zz-nmc/nmc_20310502_1215.csv",
        FENWICK,
        at(12, 15),
        plans.flap_overspeed,
        (("pilot", 80.0), ("copilot", 82.0), ("rear", 64.0), ("baggage", 8.0), ("main_fuel", 110.0)),
        TOURER,
        Habit(
            id="shale",
            delimiter=";",
            decimal_comma=True,
            units="metric",
            clock="date_time_dmy",
            encoding="latin-1",
            vocabulary="plain",
            spelling="signs",
        ),
        "semicolons, decimal commas, Latin-1, day-first date and time apart; km/h, m, m/s²",
        "Flaps 20 are lowered at 108 kt (limit 95 KIAS); then a go-around and a second approach.",
        rate_hz=4.0,
    ),
    Sortie(
        "zz-nmc/nmc_descent.csv",
        FENWICK,
        None,
        plans.fast_descent,
        (("pilot", 88.0), ("copilot", 72.0), ("rear", 60.0), ("main_fuel", 104.0)),
        TOURER,
        Habit(id="tuff", clock="elapsed_s", encoding="utf-8-sig"),
        "commas, units in brackets, UTF-8 with a byte-order mark, elapsed seconds only: no date",
        "A descent with power on goes beyond V_NE for a good while. No date: times count from the first row.",
        rate_hz=4.0,
    ),
    Sortie(
        "zz-nmj/C30-008_0930.parquet",
        CORRAN,
        at(9, 30),
        plans.mach,
        (("pilot", 84.0), ("copilot", 82.0), ("cabin", 300.0), ("baggage", 60.0), ("main_fuel", 1125.0)),
        JET,
        Habit(id="quartz", parquet="ms", unit_metadata=True, rates="blanks", states="words", vocabulary="trade"),
        "Parquet, UTC stamps, units and registration in the metadata, states as words, slow channels null between "
        "their values",
        "A leg at FL320 drifts beyond Mach 0.70 for about half a minute.",
        air=(5.0, 5.0),
        rates=(("fuel_mass", 1.0), ("static_air_temperature", 1.0), ("flap_angle", 1.0), ("gear_down", 1.0)),
        facts=("registration",),
    ),
    Sortie(
        "zz-nmj/C30-008_b.parquet",
        CORRAN,
        None,
        plans.hard_landing,
        (("pilot", 84.0), ("copilot", 82.0), ("cabin", 300.0), ("baggage", 40.0), ("main_fuel", 950.0)),
        JET,
        Habit(id="beryl", parquet="elapsed", units="si", vocabulary="upper", rates="same"),
        "Parquet, elapsed seconds, SI units, upper-case names; registration in the metadata",
        "Little flare: a hard landing. No date.",
        air=(-3.0, 6.0),
        facts=("registration", "recorder_serial"),
    ),
)

EMPTY = {"ZZ-NMA": 640.0, "ZZ-NMC": 720.0, "ZZ-NMJ": 2750.0}
FUEL_DENSITY = {"ZZ-NMA": 0.72, "ZZ-NMC": 0.72, "ZZ-NMJ": 0.80}
SERIALS = {"ZZ-NMA": "R-2201", "ZZ-NMC": "R-1187", "ZZ-NMJ": "R-3040"}


def flown(sortie: Sortie) -> Flight:
    """The truth of a sortie (its seed is its place in the day)."""
    deviation, headwind = sortie.air
    registration = sortie.airframe.registration
    fuel = dict(sortie.load)["main_fuel"] * FUEL_DENSITY[registration]
    mass = EMPTY[registration] + fuel + sum(kg for station, kg in sortie.load if station != "main_fuel")
    seed = 100 + [one.path for one in DAY].index(sortie.path)
    return fly(sortie.airframe, sortie.plan(), mass=mass, fuel=fuel, seed=seed, temperature_deviation=deviation,
               headwind=headwind)  # fmt: skip


def hiding_phase(flight: Flight, sensor: Sensor, rate_hz: float) -> float:
    """The recorder's clock is not the pilot's: here two samples fall equally far from the highest load factor."""
    fine, felt = sample(flight, "load_factor", replace(sensor, rate_hz=100.0, noise=0.0, step=0.0), 0)
    top = float(fine[int(np.argmax(felt))])
    return float(round((top - 0.5 / rate_hz) % (1.0 / rate_hz), 6))


def recorded(sortie: Sortie, flight: Flight) -> Truth:
    """What the sortie's recorder got of the flight: sampled, noisy, stepped, with its gaps and spikes."""
    seed = 100 + [one.path for one in DAY].index(sortie.path)
    sensors = {
        "load_factor": Sensor(bias=0.015, noise=0.006, step=0.004, low=-6.0, high=9.0,
                              position=sortie.airframe.accelerometer, spikes=sortie.spikes),
        "longitudinal_load_factor": Sensor(noise=0.004, step=0.002, position=sortie.airframe.accelerometer),
        "indicated_airspeed": Sensor(noise=0.15 * KT, low=0.0),
        "pressure_altitude": Sensor(noise=0.2),
        "bank_angle": Sensor(noise=0.002),
        "pitch_angle": Sensor(noise=0.002),
        "roll_rate": Sensor(noise=0.003),
        "pitch_rate": Sensor(noise=0.003),
        "yaw_rate": Sensor(noise=0.003),
        "engine_speed": Sensor(noise=4.0 if not sortie.airframe.jet else 0.05),
        "height_above_ground": Sensor(noise=0.05, low=0.0, high=762.0),
    }  # fmt: skip
    phase = 0.0
    if sortie.hide_peak:
        phase = hiding_phase(flight, sensors["load_factor"], sortie.rate_hz)
    gaps: tuple[tuple[float, float], ...] = ()
    if sortie.gap_after_crossing is not None:
        crossing = float(flight.time[int(np.argmax(flight["load_factor"] > sortie.gap_level))])
        begin = crossing + sortie.gap_after_crossing
        gaps = ((begin, begin + sortie.gap_seconds),)
    registration = sortie.airframe.registration
    return truth_from_flight(
        flight, list(sortie.channels), sortie.rate_hz, rates=dict(sortie.rates), sensors=sensors,
        start=sortie.start.timestamp() if sortie.start else None, phase_s=phase, seed=seed, gaps=gaps,
        registration=registration if "registration" in sortie.facts else None,
        recorder_serial=SERIALS[registration] if "recorder_serial" in sortie.facts else None,
    )  # fmt: skip
