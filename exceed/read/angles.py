"""Angles and angular rates without a unit: degrees or radians, by size, turns, climbs and each other."""

from __future__ import annotations

import numpy as np

from exceed.core.recording import Array
from exceed.core.units import UNITS
from exceed.read.evidence import ANGLES, RATES, SPEEDS, Evidence, Settled
from exceed.read.grid import decide, middle, origin_slope, slope

_G = 9.80665


def _turn_rate(evidence: Evidence) -> Array | None:
    """rad/s, from heading or track, else a recorded rate."""
    for name in ("heading", "track_angle"):
        found = evidence.of(name)
        if found is not None:
            return evidence.si_rate(found, wraps=True)
    found = evidence.of("turn_rate")
    return evidence.si(found) if found is not None else None


def settle_angle(evidence: Evidence, one: Settled) -> None:
    finite = evidence.figures(one)
    if not len(finite):
        return
    top = float(np.percentile(np.abs(finite), 99.5)) if len(finite) > 50 else float(np.max(np.abs(finite)))
    if top > 2 * np.pi * 1.01:
        one.take("deg", f"figures up to {top:.4g} are no radians")
        return
    if one.quantity == "latitude" and top > np.pi / 2 * 1.01:
        one.take("deg", f"figures up to {top:.4g} are no radians of latitude")
        return
    if one.quantity in ("heading", "track_angle"):
        before, after, _ = evidence.grid.pair(one.raw)
        jumps = np.abs(after - before)
        if np.count_nonzero(jumps > 5.5) >= 1 and np.ptp(finite) > 5.0:
            one.take("rad", "it wraps at a full circle of 6.28")
        return
    if one.quantity == "bank_angle":
        rate = _turn_rate(evidence)
        if rate is None:
            return
        figures = evidence.grid.value(one.raw)
        speeds = {}
        for unit in ("deg", "rad"):
            angle = np.abs(figures * UNITS[unit].factor)
            use = (angle > np.radians(1.0)) & (angle < 1.2) & (np.abs(rate) > np.radians(0.5))
            with np.errstate(invalid="ignore", divide="ignore"):
                speeds[unit] = middle(np.where(use, _G * np.tan(angle) / np.abs(rate), np.nan))
        # an aeroplane flies between 15 and 300 m/s; the two readings differ 57 times
        good = [unit for unit, speed in speeds.items() if 12.0 < speed < 400.0]
        if len(good) == 1:
            one.take(good[0], f"the rate of turn fits a bank in {good[0]}")
        return
    if one.quantity == "pitch_angle":
        height, speed = (
            evidence.of("pressure_altitude", "geometric_altitude", known=False),
            evidence.of(*SPEEDS[3::-1], known=False),
        )
        if height is None or speed is None:
            return
        with np.errstate(invalid="ignore", divide="ignore"):
            path = evidence.grid.rate(height.raw) / np.where(
                evidence.grid.value(speed.raw) > 0, evidence.grid.value(speed.raw), np.nan
            )
        moves, alike, _ = slope(evidence.grid.value(one.raw), path)
        if abs(alike) > 0.5:
            # whatever the units of height and speed, radians give 0.25 to 3.3 and degrees 57 times less
            one.take(
                "rad" if abs(moves) > 0.12 else "deg",
                "climb and speed fit a pitch in " + ("rad" if abs(moves) > 0.12 else "deg"),
            )


_DERIVATIVE = {
    "roll_rate": ("bank_angle",),
    "pitch_rate": ("pitch_angle",),
    "yaw_rate": ("heading", "track_angle"),
    "turn_rate": ("heading", "track_angle"),
}


def settle_rate(evidence: Evidence, one: Settled) -> None:
    finite = evidence.figures(one)
    if not len(finite):
        return
    angle = evidence.of(*_DERIVATIVE[one.quantity])
    if angle is not None:
        moves = evidence.si_rate(angle, wraps=True)
        # the rate's mean over the two seconds that the angle's change spans
        ratio, alike, _ = origin_slope(evidence.grid.value(one.raw), moves)
        if abs(alike) > 0.5:
            unit = decide({u: np.log(abs(ratio) / UNITS[u].factor) for u in ("deg/s", "rad/s")}, 1.2, 1.0)
            if unit:
                one.take(unit, f"'{angle.raw.column.name}' moves as {unit} would")
                return
    top = float(np.max(np.abs(finite)))
    if top > 14.0:
        one.take("deg/s", f"figures up to {top:.3g} are no rad/s")


def last_resort(evidence: Evidence, one: Settled) -> None:
    """Angles and rates without a witness: the other angles of the same log, if their unit was settled by the data."""
    if one.quantity in ANGLES:
        family: tuple[str, ...] = ANGLES
    elif one.quantity in RATES:
        family = (*RATES, *ANGLES)
    elif one.quantity in ("latitude", "longitude"):
        family = ("latitude", "longitude")
    else:
        return
    known = {
        other.unit.split("/")[0]: other
        for other in evidence.all
        if other.quantity in family and other.unit and not other.problem
    }
    if len(known) == 1:
        unit, witness = next(iter(known.items()))
        unit = unit + ("/s" if one.quantity in RATES else "")
        one.take(unit, f"'{witness.raw.column.name}' beside it is in {witness.unit}")
