"""Which way is positive, and what a figure of 1 means: settled by what else moved in the same flight."""

from __future__ import annotations

import numpy as np

from exceed.read import states
from exceed.read.evidence import Evidence, Settled
from exceed.read.grid import middle, slope

KNOT = 1852.0 / 3600.0


def settle(evidence: Evidence) -> None:
    """Signs of angles and rates first, since others lean on them; then the discrete channels."""
    _bank(evidence)
    _pitch(evidence)
    for rate, angle in (
        ("roll_rate", "bank_angle"),
        ("pitch_rate", "pitch_angle"),
        ("yaw_rate", "heading"),
        ("turn_rate", "heading"),
    ):
        for one in _all(evidence, rate):
            _rate(evidence, one, angle)
    for one in _all(evidence, "vertical_speed"):
        _rise(evidence, one)
    for one in _all(evidence, "weight_on_wheels"):
        _wheels(evidence, one)
    for one in _all(evidence, "gear_down"):
        _gear(evidence, one)
    for name in ("airbrakes_out", "stall_warning", "on_tow"):
        for one in _all(evidence, name):
            _mostly_off(one)


def _all(evidence: Evidence, quantity: str) -> list[Settled]:
    return [one for one in evidence.all if one.quantity == quantity and one.unit and not one.problem]


def _turns(evidence: Evidence) -> np.ndarray | None:
    for name in ("heading", "track_angle"):
        found = evidence.of(name)
        if found is not None:
            return evidence.si_rate(found, wraps=True)
    return None


def _told(one: Settled) -> bool:
    return bool(one.raw.column.positive)


def _bank(evidence: Evidence) -> None:
    rate = _turns(evidence)
    for one in _all(evidence, "bank_angle"):
        if rate is None or _told(one):
            continue
        angle = evidence.si(one)
        use = (np.abs(angle) > np.radians(8)) & (np.abs(angle) < np.radians(65)) & (np.abs(rate) > np.radians(0.5))
        if np.count_nonzero(use) < 20:
            continue
        alike = float(np.mean(np.sign(angle[use]) == np.sign(rate[use])))
        if alike < 0.15:
            one.flip("the heading turns the other way: positive is left wing down")
            one.sign = "left"
        elif alike > 0.85:
            one.sign = "right"


def _pitch(evidence: Evidence) -> None:
    height = evidence.of("pressure_altitude", "geometric_altitude")
    bank = evidence.of("bank_angle")
    for one in _all(evidence, "pitch_angle"):
        if height is None or _told(one):
            continue
        angle = evidence.si(one)
        use = np.abs(angle) < np.radians(35)
        if bank is not None:
            use &= np.abs(evidence.si(bank)) < np.radians(60)
        _, alike, count = slope(np.where(use, angle, np.nan), evidence.si_rate(height))
        if count > 40 and alike < -0.6:
            one.flip("the aeroplane sinks as it rises: positive is nose down")
            one.sign = "down"
        elif count > 40 and alike > 0.6:
            one.sign = "up"


def _rate(evidence: Evidence, one: Settled, angle_name: str) -> None:
    angle = evidence.of(angle_name)
    if angle is None or _told(one):
        return
    moves = evidence.si_rate(angle, wraps=angle_name != "pitch_angle")
    bank, pitch = evidence.of("bank_angle"), evidence.of("pitch_angle")
    use = np.ones(len(moves), bool)
    # body rates are the angle's rates only near level flight
    if one.quantity in ("pitch_rate", "yaw_rate") and bank is not None:
        use &= np.abs(evidence.si(bank)) < np.radians(45 if one.quantity == "yaw_rate" else 25)
    if pitch is not None:
        use &= np.abs(evidence.si(pitch)) < np.radians(40)
    _, alike, count = slope(np.where(use, evidence.si(one), np.nan), moves)
    plus, minus = ("up", "down") if one.quantity == "pitch_rate" else ("right", "left")
    if count > 40 and alike < -0.6:
        one.flip(f"'{angle.raw.column.name}' moves the other way: positive is {minus}")
        one.sign = minus
    elif count > 40 and alike > 0.6:
        one.sign = plus


def _rise(evidence: Evidence, one: Settled) -> None:
    height = evidence.of("pressure_altitude", "geometric_altitude")
    if height is None or _told(one):
        return
    _, alike, count = slope(evidence.si(one), evidence.si_rate(height))
    if count > 40 and alike < -0.6:
        one.flip("the altitude falls as it rises: positive is down")
        one.sign = "down"
    elif count > 40 and alike > 0.6:
        one.sign = "up"


def _speed(evidence: Evidence) -> np.ndarray | None:
    found = evidence.of("indicated_airspeed", "calibrated_airspeed", "true_airspeed", "ground_speed")
    return evidence.si(found) if found is not None else None


def _turn_round(one: Settled, why: str) -> None:
    one.scale, one.offset = -one.scale, 1.0 - one.offset
    one.reason = f"{one.reason}; {why}"
    one.found_by = "name and data"


def _wheels(evidence: Evidence, one: Settled) -> None:
    """On the ground an aeroplane is slow; in the air it is not."""
    if one.raw.sense_sure or _told(one):
        return
    sense = states.heading_sense("weight_on_wheels", one.raw.column.name)
    speed = _speed(evidence)
    verdict = 0
    if speed is not None:
        state = evidence.si(one)
        on, off = middle(np.where(state > 0.5, speed, np.nan)), middle(np.where(state < 0.5, speed, np.nan))
        fast = float(np.nanpercentile(speed, 95)) if np.isfinite(speed).any() else 0.0
        if np.isfinite(on) and np.isfinite(off) and fast > 20.0:
            verdict = 1 if on < 0.45 * off else -1 if off < 0.45 * on else 0
        elif np.isfinite(on) != np.isfinite(off) and fast > 20.0:
            # only one state in the log: all of it fast is all of it flown
            here = on if np.isfinite(on) else off
            flown = here > 0.6 * fast and float(np.nanpercentile(speed, 5)) > 0.35 * fast
            if flown:
                verdict = -1 if np.isfinite(on) else 1
    if verdict < 0:
        _turn_round(one, "the speed shows that its figures are the other way round")
        one.notes.append("figures turned round: at speed the recorder says 'on the ground'")
    elif verdict == 0 and sense == 0:
        one.problem = "whether 1 means air or ground cannot be told"
        one.question = "Does 1 mean on the ground?"
    elif verdict > 0:
        one.reason = f"{one.reason}; it agrees with the speed"


def _gear(evidence: Evidence, one: Settled) -> None:
    """At a standstill on the ground the gear is down."""
    if one.raw.sense_sure or _told(one):
        return
    sense = states.heading_sense("gear_down", one.raw.column.name)
    speed, wheels = _speed(evidence), evidence.of("weight_on_wheels")
    state = evidence.si(one)
    ground = np.zeros(len(state), bool)
    if wheels is not None:
        ground |= evidence.si(wheels) > 0.5
    elif speed is not None:
        ground |= speed < 8.0
    some = state[ground & np.isfinite(state)]
    if len(some) >= 5:
        down = float(np.mean(some))
        if down < 0.1:
            _turn_round(one, "on the ground it shows the other state, where the gear is down")
            return
        if down > 0.9:
            one.reason = f"{one.reason}; on the ground it shows down"
            return
    if sense == 0:
        one.problem = "whether 1 means down or up cannot be told"
        one.question = "Does 1 mean down?"


def _mostly_off(one: Settled) -> None:
    """A warning or a brake that is on nearly throughout is more probably inverted; it is not turned, but said."""
    finite = one.raw.values[np.isfinite(one.raw.values)]
    if one.raw.sense_sure or not len(finite):
        return
    if float(np.mean(finite)) > 0.9:
        one.notes.append("it is on nearly throughout: if the recorder writes 0 for on, say so in a channels file")
