"""Accelerometers: unit, datum and sign by what gravity makes them show in steady flight and at a standstill."""

from __future__ import annotations

import numpy as np

from exceed.core.units import UNITS
from exceed.read.evidence import Evidence, Settled
from exceed.read.grid import middle, origin_slope, slope

_UNITS = ("g", "m/s2", "ft/s2")
# the level reading must lie within these of 1 g; the units differ by factors of 3 and 10
_LOW, _HIGH = 0.75, 1.35


def settle(evidence: Evidence) -> None:
    """The normal load factor: every column of it."""
    for one in evidence.all:
        if one.quantity == "load_factor" and not one.problem:
            _normal(evidence, one)


def _normal(evidence: Evidence, one: Settled) -> None:
    column = one.raw.column
    figures = evidence.grid.value(one.raw)
    level = middle(figures)
    if not np.isfinite(level):
        one.problem = "holds no value"
        return
    if one.forced and one.unit and column.datum and column.positive:
        return
    stated = one.unit
    fits = [(unit, np.sign(level)) for unit in _UNITS if _LOW <= abs(level) * UNITS[unit].factor <= _HIGH]
    if stated and any(unit == stated for unit, _ in fits):
        fits = [(unit, sign) for unit, sign in fits if unit == stated]
    total_possible = bool(fits) and column.datum != "increment"
    near_zero = abs(level) * (UNITS[stated].factor if stated else 1.0) <= 0.25 and (
        bool(stated) or abs(level) <= 0.25 * _spread_g(figures)
    )
    if stated and near_zero and fits and not (one.forced and column.datum):
        # an increment with a bias, or a total under a wrong unit? turns tell; else a level reading of 1.00 is no bias
        shown = _increment_unit(evidence, figures - level)
        near_zero = not (
            shown == fits[0][0] or (shown is None and abs(abs(level) * UNITS[fits[0][0]].factor - 1.0) < 0.06)
        )
    if total_possible and (not stated or fits[0][0] == stated or not near_zero):
        unit, sign = fits[0]
        if stated and unit != stated:
            if one.forced:
                one.notes.append(
                    f"the channels file says {stated}, but the level reading of {level:.3g} is that of {unit}"
                )
                return
            one.notes.append(f"'{column.unit_text}' is written, but the level reading of {level:.3g} is that of {unit}")
        why = f"level flight and standing read {level:.3g}: {unit}, total, positive {'up' if sign > 0 else 'down'}"
        if not column.positive:
            one.take(unit, why)
            if sign < 0:
                one.scale = -one.scale
            one.sign = "up" if sign > 0 else "down"
        elif not stated:
            turned = one.scale < 0
            one.take(unit, why)
            one.scale = -one.scale if turned else one.scale
        else:
            one.reason = f"{one.reason}; {why}"
        one.datum = one.datum or "total"
        return
    if not near_zero or column.datum == "total":
        if one.forced:
            return
        # a log of one long turn has no level reading; the unit may still be plain, and the mean of n is never below 1
        wide = [unit for unit in _UNITS if 0.5 <= abs(level) * UNITS[unit].factor <= 2.6]
        if (stated and stated in wide) or (not stated and len(wide) == 1):
            one.take(
                stated or wide[0],
                f"its median of {level:.3g} is that of a total in {stated or wide[0]}, though of no level flight",
            )
            one.scale = -one.scale if level < 0 and not column.positive else one.scale
            one.sign = one.sign or ("up" if level > 0 else "down")
            one.datum = one.datum or "total"
            one.notes.append("no long level flight in this log: unit, sign and datum rest on its median alone")
            return
        one.problem = (
            f"its level reading of {level:.3g} is neither that of a total nor of an increment in g, m/s2 or ft/s2"
        )
        one.question = "Which unit and datum has it?"
        return
    _increment(evidence, one, figures, level)


def _spread_g(figures: np.ndarray) -> float:
    finite = figures[np.isfinite(figures)]
    return max(1.0, float(np.percentile(np.abs(finite), 99))) if len(finite) else 1.0


def _increment(evidence: Evidence, one: Settled, figures: np.ndarray, level: float) -> None:
    """Reads 0 in level flight: the sign needs a witness, the unit as well if it is not written."""
    column = one.raw.column
    one.datum = "increment"
    if not one.unit:
        unit = _increment_unit(evidence, figures - level)
        if unit is None:
            one.problem = "reads 0 in level flight, an increment, but g or m/s2 cannot be told"
            one.question = "Is it in g or m/s2?"
            return
        one.take(unit, f"level flight reads {level:.2g}: an increment; turns show {unit}")
    else:
        one.reason = f"{one.reason}; level flight reads {level:.2g}: an increment"
    if not column.positive:
        sign, why = _increment_sign(evidence, (figures - level) * UNITS[one.unit].factor)
        if sign == 0:
            one.problem = "reads 0 in level flight, an increment, but whether up or down is positive cannot be told"
            one.question = "Is it positive up or down?"
            return
        one.sign = "up" if sign > 0 else "down"
        one.reason = f"{one.reason}; {why}: positive {one.sign}"
        one.found_by = "name and data"
        if sign < 0:
            one.scale = -one.scale
    if not (one.forced and column.datum):
        one.offset = 1.0
    one.notes.append("1 g is added to the increment as written")


def _turning(evidence: Evidence) -> np.ndarray | None:
    """1/cos(bank) - 1 where it is a fair measure: 15 to 70 degrees."""
    bank = evidence.of("bank_angle", known=False)
    if bank is None:
        return None
    angle = evidence.grid.value(bank.raw)
    finite = angle[np.isfinite(angle)]
    if not len(finite):
        return None
    scale = UNITS[bank.unit].factor if bank.unit else (np.pi / 180.0 if np.max(np.abs(finite)) > 6.4 else 1.0)
    angle = np.abs(angle * scale)
    with np.errstate(invalid="ignore"):
        return np.where(angle < np.radians(70.0), 1.0 / np.cos(np.minimum(angle, 1.3)) - 1.0, np.nan)


def _increment_unit(evidence: Evidence, change: np.ndarray) -> str | None:
    turn = _turning(evidence)
    if turn is None:
        return None
    steep = np.where(turn > 0.05, turn, np.nan)
    ratio, cosine, count = origin_slope(steep, change)
    if count < 20 or abs(cosine) < 0.7:
        return None
    fits = [unit for unit in _UNITS if 0.55 <= abs(ratio) * UNITS[unit].factor <= 1.8]
    return fits[0] if len(fits) == 1 else None


def _increment_sign(evidence: Evidence, change: np.ndarray) -> tuple[int, str]:
    """(+1, -1 or 0, why)."""
    turn = _turning(evidence)
    if turn is not None:
        _, alike, count = slope(turn, change)
        if count > 50 and abs(alike) > 0.5:
            return (1 if alike > 0 else -1), "in turns it moves with the bank"
    rise = evidence.of("vertical_speed", known=False)
    if rise is not None:
        _, alike, count = slope(evidence.grid.rate(rise.raw), change)
        if count > 50 and abs(alike) > 0.4:
            return (1 if alike > 0 else -1), "it moves with the change of the vertical speed"
    pitching = evidence.of("pitch_rate", known=False)
    if pitching is not None:
        _, alike, count = slope(evidence.grid.value(pitching.raw), change)
        if count > 50 and abs(alike) > 0.5:
            return (1 if alike > 0 else -1), "it moves with the pitch rate"
    # in steady flight the lift's vertical part must on average carry the weight, and turns need more: the mean
    # lies above
    finite = change[np.isfinite(change)]
    if len(finite) > 300:
        mean = float(np.mean(finite))
        if abs(mean) > max(0.01, 4.0 * float(np.std(finite)) / np.sqrt(len(finite))):
            return (1 if mean > 0 else -1), "its mean lies off its level reading, as turns demand"
    return 0, ""


def companions(evidence: Evidence) -> None:
    """Longitudinal and lateral load factor: unit by attitude or the normal one beside them, sign by attitude."""
    normal = evidence.of("load_factor")
    pitch = evidence.of("pitch_angle")
    for one in evidence.all:
        if one.quantity not in ("longitudinal_load_factor", "lateral_load_factor") or one.problem:
            continue
        figures = evidence.grid.value(one.raw)
        finite = figures[np.isfinite(figures)]
        if not len(finite):
            one.problem = "holds no value"
            continue
        ratio, alike = float("nan"), 0.0
        if one.quantity == "longitudinal_load_factor" and pitch is not None:
            ratio, alike, _ = slope(np.sin(evidence.si(pitch)), figures)
        if one.open:
            fits = (
                [unit for unit in _UNITS if 0.5 <= abs(ratio) * UNITS[unit].factor <= 2.0] if abs(alike) > 0.6 else []
            )
            largest = float(np.max(np.abs(finite)))
            if len(fits) == 1:
                one.take(fits[0], f"it moves with the pitch angle as {fits[0]} would")
            elif normal is not None and not normal.raw.column.unit_text and normal.unit:
                one.take(
                    normal.unit,
                    f"no unit is written on '{normal.raw.column.name}' either, which the data show in {normal.unit}",
                )
            elif normal is not None and largest * UNITS["g"].factor > 4.0 and normal.unit == "m/s2":
                one.take("m/s2", "its figures are too large for g")
        if one.unit and not one.raw.column.positive and abs(alike) > 0.6:
            if alike < 0:
                one.flip("it falls as the nose rises: positive aft")
                one.sign = "aft"
            else:
                one.sign = "forward"
                one.reason = f"{one.reason}; it rises with the nose: positive forward"
        one.datum = one.datum or None
