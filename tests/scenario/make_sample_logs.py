"""Write `sample_logs/` (logs, loading sheets, README) and the truth beside this file, always the same.

Run: python tests/scenario/make_sample_logs.py [FOLDER]
"""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import Any

HERE = Path(__file__).resolve().parent
if __name__ == "__main__":  # run as a script: `scenario` is the folder's name
    sys.path.insert(0, str(HERE.parent))

import numpy as np  # noqa: E402

from scenario.air import FT_MIN, KT  # noqa: E402
from scenario.airframes import interpolate  # noqa: E402
from scenario.day import DAY, Sortie, flown, recorded  # noqa: E402
from scenario.dialects import Truth, write  # noqa: E402
from scenario.flight import STEP, Flight  # noqa: E402
from scenario.limits import excesses  # noqa: E402
from scenario.sensors import beyond  # noqa: E402

FAMILIES = ("positive load factor", "negative load factor", "maximum speed", "flap speed", "maximum Mach number",
            "gear speed", "stall")  # fmt: skip


def true_stalls(flight: Flight, shift: float) -> list[dict[str, Any]]:
    """Where the wing let go: the instant, the margin there, and the stall warning's stretch around it."""
    warnings = beyond(flight.time, flight["stall_warning"], 0.5)
    found = []
    for when in flight.marked("stall"):
        at = round(when / STEP)
        around = [(begin, finish) for begin, finish, _, _ in warnings if begin - 0.1 <= when <= finish + 3.0]
        flaps = float(np.degrees(flight["flap_angle"][at]))
        speed = interpolate(flaps, flight.airframe.stall_kcas)
        load, mass = float(flight["load_factor"][at]), float(flight["mass"][at])
        stall_speed = speed * (load * mass / flight.airframe.reference_mass) ** 0.5
        found.append({
            "family": "stall", "expect": "found", "time_s": _round(when - shift), "load_factor_g": _round(load),
            "calibrated_airspeed_kt": _round(flight["calibrated_airspeed"][at] / KT),
            "stall_speed_kt": _round(stall_speed),
            "warning_s": [[_round(a - shift), _round(b - shift)] for a, b in around],
        })  # fmt: skip
    return found


def true_touchdowns(flight: Flight, truth: Truth) -> list[dict[str, Any]]:
    found = []
    load = truth.channels["load_factor"]
    for when in flight.marked("touchdown"):
        at = round(when / STEP)
        window = (truth.time + truth.phase_s >= when - 0.5) & (truth.time + truth.phase_s <= when + 1.0)
        found.append({
            "time_s": _round(when - truth.phase_s),
            "sink_rate_ft_min": _round(-flight["vertical_speed"][at] / FT_MIN, 1),
            "peak_load_factor_g": _round(np.max(flight["load_factor"][at : at + 40])),
            "recorded_load_factor_g": _round(np.nanmax(load[window])),
        })  # fmt: skip
    return found


def truth_of(sortie: Sortie, flight: Flight, truth: Truth) -> dict[str, Any]:
    """What is true of a log; times in s from its first row."""
    shift = truth.phase_s
    expected: list[dict[str, Any]] = []
    for excess in excesses(flight):
        row = {
            "family": excess.family, "expect": "found", "quantity": excess.quantity, "side": excess.side,
            "unit": excess.unit, "limit": _round(excess.limit), "true_peak": _round(excess.peak),
            "true_peak_s": _round(excess.peak_s - shift), "true_start_s": _round(excess.start_s - shift),
            "true_end_s": _round(excess.end_s - shift), "cut_by": None,
        }  # fmt: skip
        if excess.family == "positive load factor" and sortie.hide_peak:
            row["expect"] = "hidden"
            row["largest_sample"] = _round(np.nanmax(truth.channels["load_factor"]))
        if any(begin < excess.end_s - shift < finish for begin, finish in truth.gaps):
            row["cut_by"] = "gap"
        expected.append(row)
    expected += true_stalls(flight, shift)
    families = {row["family"] for row in expected}
    return {
        "registration": sortie.airframe.registration,
        "start": sortie.start.isoformat().replace("+00:00", "Z") if sortie.start else None,
        "habit": sortie.habit.id,
        "rate_hz": truth.rate_hz,
        "recorded_s": _round((truth.count - 1) / truth.rate_hz),
        "flights": [{"take_off_s": _round(a - shift), "landing_s": _round(b - shift)}
                    for a, b in zip(flight.marked("take_off"), flight.marked("touchdown"), strict=True)],
        "mass_kg": {"take_off": _round(flight["mass"][round(flight.marked("take_off")[0] / STEP)], 1),
                    "landing": _round(flight["mass"][round(flight.marked("touchdown")[-1] / STEP)], 1)},
        "load_factor_g": {"maximum": _round(np.max(flight["load_factor"])),
                          "minimum": _round(np.min(flight["load_factor"]))},
        "expected": expected,
        "absent": [family for family in FAMILIES if family not in families],
        "touchdowns": true_touchdowns(flight, truth),
        "spikes": [{"time_s": _round(when), "load_factor_g": value} for when, value in sortie.spikes],
        "gaps": [[_round(begin), _round(finish)] for begin, finish in truth.gaps],
    }  # fmt: skip


def _round(value: float, places: int = 3) -> float:
    return round(float(value), places)


def loading_sheet(sortie: Sortie, take_off_s: float) -> tuple[str, str] | None:
    """Name and text of the loading sheet; the first sortie of the day went without one."""
    if sortie is DAY[0]:
        return None
    cells = ", ".join(f"{name}: {value:g} {'L' if name == 'main_fuel' else 'kg'}" for name, value in sortie.load)
    lines = [
        "# Invented for the demonstration.",
        "format: exceed-loading/1",
        f"registration: {sortie.airframe.registration}",
    ]
    name = Path(sortie.path).name
    if sortie.start is None:
        lines.append(f"log: {name}")
        stem = name.split(".")[0].split("_")[-1]
    else:
        minute = int(sortie.start.timestamp() + take_off_s) // 60 * 60
        stamp = np.datetime64(minute, "s").item()
        lines.append(f'take_off: "{stamp:%Y-%m-%dT%H:%MZ}"')
        stem = f"{sortie.start:%H%M}"
    lines.append(f"stations: {{{cells}}}")
    return f"{sortie.airframe.registration.split('-')[1].lower()}-{stem}.yaml", "\n".join(lines) + "\n"


def make(folder: Path) -> dict[str, Any]:
    """Write all logs and sheets into a folder and return the truth."""
    logs: dict[str, Any] = {}
    for sortie in DAY:
        flight = flown(sortie)
        truth = recorded(sortie, flight)
        path = folder / sortie.path
        path.parent.mkdir(parents=True, exist_ok=True)
        written = write(truth, path, sortie.habit)
        logs[sortie.path] = {**truth_of(sortie, flight, truth), "rows": written.rows}
        sheet = loading_sheet(sortie, logs[sortie.path]["flights"][0]["take_off_s"])
        if sheet:
            (folder / "loading").mkdir(exist_ok=True)
            (folder / "loading" / sheet[0]).write_text(sheet[1])
    return {"note": "Invented. Times in seconds from each log's first row; truth at 100 Hz.", "logs": logs}


def in_words(row: dict[str, Any]) -> str:
    """An expected event as one phrase for the README."""
    if row["family"] == "stall":
        return (f"stall at {row['time_s']:.1f} s: {row['calibrated_airspeed_kt']:.1f} KCAS at "
                f"{row['load_factor_g']:.2f} g, stall speed {row['stall_speed_kt']:.1f} KCAS")  # fmt: skip
    places = 1 if row["unit"] == "kt" else 3
    tail = {"hidden": ", between samples", "found": ""}[row["expect"]] + (", cut by the gap" if row["cut_by"] else "")
    peak = f"{row['true_peak']:.{places}f} {row['unit']}".rstrip()
    lasting = row["true_end_s"] - row["true_start_s"]
    return (f"{row['family']} {peak} (limit {row['limit']:g}) at {row['true_peak_s']:.1f} s, "
            f"beyond for {lasting:.2f} s{tail}")  # fmt: skip


def readme(truth: dict[str, Any]) -> str:
    """The stories of the day as Markdown."""
    lines = [
        "# A day at Northmoor, invented",
        "",
        "Everything here is invented: the Northmoor Flying Group, its three aeroplanes, its recorders and its flights.",
        "No real aircraft, operator, recorder or place is meant.",
        "The logs were made by `python tests/scenario/make_sample_logs.py` from a flight model that knows the truth;",
        "`tests/scenario/truth.json` holds that truth in full, with times in seconds from each log's first row.",
        "",
        "    exceed scan sample_logs",
        "",
        "`fleet.yaml` names the aeroplanes, `aircraft/` their limits, `loading/` who and what was on board;",
        "`channels/larkspur.yaml` settles what one recorder leaves open.",
        "The figures below are the truth; a tool sees it only through recorders that sample and add noise.",
        "",
    ]  # fmt: skip
    for sortie in DAY:
        facts = truth["logs"][sortie.path]
        start = facts["start"] or "no date"
        lines += [
            f"## {sortie.path}",
            "",
            f"{facts['registration']}, {start}, {facts['recorded_s'] / 60:.1f} min at {facts['rate_hz']:g} Hz.",
            sortie.story,
            "",
            f"- recorder: {sortie.habit_words}",
        ]
        lines += [f"- truth: {in_words(row)}" for row in facts["expected"]] or ["- truth: nothing beyond a limit"]
        touch = facts["touchdowns"][-1]
        if touch["sink_rate_ft_min"] > 400:
            felt = f"{touch['peak_load_factor_g']:.2f} g (recorded: {touch['recorded_load_factor_g']:.2f} g)"
            lines.append(
                f"- truth: touchdown at {touch['time_s']:.1f} s, {touch['sink_rate_ft_min']:.0f} ft/min, {felt}"
            )
        lines += [f"- not flight: one sample of {s['load_factor_g']:g} g at {s['time_s']:g} s" for s in facts["spikes"]]
        lines += [f"- no rows from {a:.1f} s to {b:.1f} s" for a, b in facts["gaps"]]
        lines.append("")
    return "\n".join(lines)


def main() -> None:
    """Write everything into the repository, or into the folder given."""
    folder = Path(sys.argv[1]) if len(sys.argv) > 1 else HERE.parents[1] / "sample_logs"
    truth = make(folder)
    (folder / "README.md").write_text(readme(truth))
    home = folder if len(sys.argv) > 1 else HERE
    (home / "truth.json").write_text(json.dumps(truth, indent=1) + "\n")


if __name__ == "__main__":
    main()
