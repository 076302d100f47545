"""A short flight written by hand, an aeroplane's facts, and what `exceed.scan` says of them.

The flight is arithmetic, not aerodynamics: each channel is a line through a few points, so that whoever reads a drill
can work out its answer. Times are s from the first row; a bump put on a channel is the drill's own story.
"""

from __future__ import annotations

import copy
from collections.abc import Callable, Iterable, Mapping
from pathlib import Path
from typing import Any

import numpy as np
import yaml
from numpy.typing import NDArray

import exceed

Array = NDArray[np.float64]
Columns = dict[str, Any]  # heading -> (n,) values or words
Change = Callable[[Array, Columns], None]

RATE = 8.0
# the story: s
LIFT_OFF, CLIMBED, DESCENDS, LOW, TOUCHDOWN, STOPPED, END = 40.0, 100.0, 180.0, 240.0, 320.0, 350.0, 370.0
CRUISE = 140.0  # a quiet instant in the cruise, where most bumps go
# headings of the columns
NZ, NY, IAS, ALT, BANK, PITCH, HEADING, ROLL = (
    "Normal Acceleration (g)", "Lateral Acceleration (g)", "Indicated Airspeed (kt)", "Pressure Altitude (ft)",
    "Bank Angle (deg)", "Pitch Angle (deg)", "Heading (deg)", "Roll Rate (deg/s)",
)  # fmt: skip
FLAPS, GEAR, BRAKES, WHEELS, WARNING = (
    "Flap Angle (deg)", "Gear Down", "Airbrakes Out", "Weight On Wheels", "Stall Warning",
)  # fmt: skip
GONE = ""  # no column: which rows are left out
USUAL = (NZ, NY, IAS, ALT, BANK, PITCH, HEADING, ROLL, FLAPS, GEAR, BRAKES, WHEELS, WARNING)


def times(rate: float = RATE, end: float = END) -> Array:
    return np.arange(round(end * rate) + 1) / rate


def quiet(time: Array) -> Columns:
    """All channels of an uneventful flight: off at 40 s, 3000 ft at 100 s, down again to touch at 320 s."""

    def line(*points: tuple[float, float]) -> Array:
        return np.interp(time, [at for at, _ in points], [value for _, value in points])

    on_ground = (time < LIFT_OFF) | (time >= TOUCHDOWN)
    rolling = np.where(on_ground & (line((20, 0), (21, 1), (STOPPED, 1), (STOPPED + 1, 0)) > 0.5), 1.0, 0.0)
    return {
        # wheels on a runway shake the needle a little, as everything that runs does
        NZ: 1.0 + 0.004 * np.sin(2.1 * time) + 0.01 * rolling * np.sin(9.0 * time),
        NY: 0.003 * np.sin(1.7 * time),
        IAS: line((20, 0), (LIFT_OFF, 60), (60, 80), (CLIMBED, 80), (110, 100), (DESCENDS, 100), (LOW, 75),
                  (TOUCHDOWN - 5, 62), (TOUCHDOWN, 55), (STOPPED, 0)),
        ALT: line((LIFT_OFF, 100), (CLIMBED, 3100), (DESCENDS, 3100), (LOW, 1000), (TOUCHDOWN - 5, 120),
                  (TOUCHDOWN, 100)),
        BANK: 0.5 * np.sin(0.3 * time),
        PITCH: line((LIFT_OFF - 2, 0), (LIFT_OFF + 3, 7), (CLIMBED, 7), (CLIMBED + 5, 1), (DESCENDS, 1),
                    (DESCENDS + 5, -4), (TOUCHDOWN - 5, -2), (TOUCHDOWN, 4), (TOUCHDOWN + 3, 0)),
        HEADING: 90.0 + 0.4 * np.sin(0.2 * time),
        ROLL: 0.3 * np.cos(0.9 * time),
        FLAPS: line((245, 0), (250, 30), (STOPPED, 30), (STOPPED + 5, 0)),
        GEAR: np.where((time > 55) & (time < 230), "UP", "DOWN"),
        BRAKES: np.full(len(time), "IN"),
        WHEELS: np.where(on_ground, "GROUND", "AIR"),
        WARNING: np.full(len(time), "OFF"),
    }  # fmt: skip


def plateau(time: Array, start: float, end: float, ramp: float = 1.0) -> Array:
    """(n,) 1 from start to end, 0 outside, with straight ramps of `ramp` s before and after."""
    return np.interp(time, [start - ramp, start, end, end + ramp], [0.0, 1.0, 1.0, 0.0])


def bump(time: Array, middle: float, width: float) -> Array:
    """(n,) a raised cosine of height 1 and `width` s from foot to foot."""
    away = np.abs(time - middle) / (0.5 * width)
    return np.where(away < 1.0, 0.5 * (1.0 + np.cos(np.pi * np.minimum(away, 1.0))), 0.0)


def held(column: str, value: float, start: float, end: float, ramp: float = 1.0) -> Change:
    """The channel goes to `value` from start to end, and stays within a thousandth of it there.

    The ripple matters: a value that stands still to the last digit at its highest is a sensor at the end of its range.
    """

    def change(time: Array, columns: Columns) -> None:
        share = plateau(time, start, end, ramp)
        shaken = value * (1.0 - 0.0005 * (1.0 + np.sin(1.3 * time)))
        columns[column] = columns[column] * (1.0 - share) + shaken * share

    return change


def pulse(column: str, value: float, middle: float = CRUISE, width: float = 2.0) -> Change:
    """The channel rises to `value` and comes back, smoothly."""

    def change(time: Array, columns: Columns) -> None:
        columns[column] = columns[column] + (value - float(np.interp(middle, time, columns[column]))) * bump(
            time, middle, width
        )

    return change


def state(column: str, word: str, start: float, end: float) -> Change:
    """The channel shows the word from start up to end."""

    def change(time: Array, columns: Columns) -> None:
        columns[column] = np.where((time >= start) & (time < end), word, columns[column])

    return change


def more(column: str, values: Callable[[Array], Any]) -> Change:
    """One column more."""

    def change(time: Array, columns: Columns) -> None:
        columns[column] = values(time)

    return change


def level(column: str, value: float) -> Change:
    """A column more that stays at one value, a little shaken."""
    return more(column, lambda time: value * (1.0 - 0.0005 * (1.0 + np.sin(1.3 * time))))


def without(*names: str) -> Change:
    def change(_time: Array, columns: Columns) -> None:
        for name in names:
            del columns[name]

    return change


def gap(start: float, end: float) -> Change:
    """No rows from start to end."""

    def change(time: Array, columns: Columns) -> None:
        columns[GONE] = columns.get(GONE, np.zeros(len(time), dtype=bool)) | ((time > start) & (time < end))

    return change


def write(path: Path, time: Array, columns: Mapping[str, Any], head: str = "") -> Path:
    """A CSV with the time in s; numbers to five digits, None and NaN as empty cells."""

    def cells(values: Any) -> list[str]:
        array = np.asarray(values)
        if array.dtype.kind != "f":
            return ["" if value is None else str(value) for value in values]
        return ["" if np.isnan(value) else f"{value:.5f}" for value in array]

    table = [[f"{at:.3f}" for at in time], *(cells(values) for values in columns.values())]
    lines = [",".join(["Time (s)", *columns])] + [",".join(row) for row in zip(*table, strict=True)]
    path.write_text(head + "\n".join(lines) + "\n")
    return path


AIRCRAFT: dict[str, Any] = {
    "format": "exceed-aircraft/1",
    "registration": "ZZ-NMD",
    "type": "Drill",
    "flaps": "recorded",
    "gear": "recorded",
    "mass": {"empty": "640 kg", "maximum_take_off": "960 kg", "maximum_landing": "950 kg"},
    "stall_speed": [{"flaps": "0 deg", "mass": "960 kg", "upright": "50 KCAS", "inverted": "60 KCAS"},
                    {"flaps": "30 deg", "mass": "960 kg", "upright": "44 KCAS"}],
    "recorder": {"accuracy": {"load_factor": "0.02 g", "indicated_airspeed": "0.5 kt"}},
    "source": "Invented",
}  # fmt: skip


def merged(base: Mapping[str, Any], changes: Mapping[str, Any] | None) -> dict[str, Any]:
    """The mapping with changes; nested ones go into one another, None takes a key away."""
    made = copy.deepcopy(dict(base))
    for key, value in (changes or {}).items():
        if value is None:
            made.pop(key, None)
        elif isinstance(value, Mapping) and isinstance(made.get(key), dict):
            made[key] = merged(made[key], value)
        else:
            made[key] = copy.deepcopy(value)
    return made


def scanned(
    folder: Path,
    changes: Iterable[Change] = (),
    *,
    rules: str | Iterable[str] = "airframe",
    facts: Mapping[str, Any] | None = None,
    columns: Iterable[str] = USUAL,
    rate: float = RATE,
    mass: str | None = "900 kg",
    loading: Mapping[str, Any] | None = None,
    head: str = "",
    aircraft: bool = True,
) -> dict[str, Any]:
    """Write log, aircraft (and rules, loading sheet), scan, and give the summary of the one recording.

    rules : names of built-in sets, or the text of a rules file. facts : changes to AIRCRAFT. columns : those written,
    of the quiet flight and of what changes add.
    """
    time = times(rate)
    made = quiet(time)
    before = set(made)
    for change in changes:
        change(time, made)
    kept = {name: values for name, values in made.items() if name in set(columns) or name not in before}
    gone = kept.pop(GONE, np.zeros(len(time), dtype=bool))
    log = write(folder / "log.csv", time[~gone], {name: np.asarray(kept[name])[~gone] for name in kept}, head)
    if aircraft:
        (folder / "aircraft.yaml").write_text(yaml.safe_dump(merged(AIRCRAFT, facts)))
    asked: list[str] = []
    for number, one in enumerate([rules] if isinstance(rules, str) else rules):
        if "\n" in one:
            (folder / f"rules{number}.yaml").write_text(one)
            one = str(folder / f"rules{number}.yaml")
        asked.append(one)
    if loading is not None:
        (folder / "loading.yaml").write_text(
            yaml.safe_dump({"format": "exceed-loading/1", "log": "log.csv"} | dict(loading))
        )
    result = exceed.scan(
        log, aircraft=folder / "aircraft.yaml" if aircraft else None, rules=asked,
        mass=None if loading is not None else mass,
        loading=folder / "loading.yaml" if loading is not None else None,
    )  # fmt: skip
    (recording,) = result.summary["recordings"]
    assert recording["problem"] is None, recording["problem"]
    found: dict[str, Any] = {**recording, "inspections": result.summary["inspections"]}
    return found


def events(recording: Mapping[str, Any], rule: str, undecided: bool = False) -> list[dict[str, Any]]:
    return [event for event in recording["undecided" if undecided else "events"] if event["rule"] == rule]


def coverage(recording: Mapping[str, Any], rule: str, flight: int | None = None) -> dict[str, Any]:
    (row,) = (one for one in recording["assessment"] if one["rule"] == rule and one["flight"] == flight)
    return row


def reason(recording: Mapping[str, Any], rule: str) -> str:
    """The reason for most of the time that a rule could not assess; '' where it assessed all."""
    rows = coverage(recording, rule)["reasons"]
    return rows[0]["reason"] if rows else ""
