"""Units by physics: what two columns of one flight must be to each other, whatever the recorder calls its figures."""

from __future__ import annotations

import numpy as np

from exceed.core.recording import Array
from exceed.core.units import UNITS
from exceed.read import angles
from exceed.read.evidence import ANGLES, RATES, SPEEDS, Evidence, Settled
from exceed.read.grid import decide, middle, origin_slope, ratio_of, slope

_G = 9.80665
_R = 287.05287
# the standard atmosphere, only as a yardstick here; the physics room has it exactly and with sources [ISO-2533]
_T0, _P0, _LAPSE = 288.15, 101325.0, -0.0065


def _temperature(height: Array) -> Array:
    return np.where(height < 11000.0, _T0 + _LAPSE * height, 216.65)


def _pressure(height: Array) -> Array:
    low = np.maximum(1.0 + _LAPSE * np.minimum(height, 11000.0) / _T0, 0.2) ** 5.25588
    return _P0 * low * np.where(height > 11000.0, np.exp(-(height - 11000.0) / 6341.6), 1.0)


def _height(pressure: Array) -> Array:
    with np.errstate(invalid="ignore"):
        low = (_T0 / -_LAPSE) * (1.0 - (pressure / _P0) ** (1 / 5.25588))
        return np.where(pressure > 22632.0, low, 11000.0 - 6341.6 * np.log(np.maximum(pressure, 1.0) / 22632.0))


def alternatives(evidence: Evidence) -> None:
    """Names that mean two quantities: LONG, SPD, FUEL."""
    for one in evidence.all:
        column = one.raw.column
        if not column.alternatives or one.problem:
            continue
        options = set(column.alternatives)
        if options == {"longitudinal_load_factor", "longitude"}:
            _long(evidence, one)
        elif options == {"indicated_airspeed", "ground_speed"}:
            _which_speed(evidence, one)
        else:
            kinds = [UNITS[unit].name for unit in column.units]
            one.problem = (
                f"{', '.join(kinds[:-1])} or {kinds[-1]} cannot be told" if kinds else "what it is cannot be told"
            )
            one.question = column.question or "Which quantity is it, and in which unit?"


def _long(evidence: Evidence, one: Settled) -> None:
    """A longitude creeps; an acceleration jumps about its middle."""
    figures = evidence.grid.value(one.raw)
    finite = figures[np.isfinite(figures)]
    moves = evidence.grid.rate(one.raw)
    creep = middle(np.abs(moves))
    if len(finite) and (
        np.max(np.abs(finite)) > 12.0
        or (creep < 2e-3 and np.ptp(finite) < 3.0 and abs(middle(finite)) > 3 * np.ptp(finite))
    ):
        one.quantity, one.raw.column = (
            "longitude",
            one.raw.column.with_(quantity="longitude", alternatives=(), units=("deg", "rad")),
        )
    elif len(finite) and abs(middle(finite)) < 2.0:
        one.quantity = "longitudinal_load_factor"
        one.raw.column = one.raw.column.with_(quantity=one.quantity, alternatives=(), units=("g", "m/s2", "ft/s2"))
    else:
        one.problem, one.question = (
            "longitudinal acceleration or longitude cannot be told",
            "Which quantity is it, and in which unit?",
        )


def _which_speed(evidence: Evidence, one: Settled) -> None:
    """A bare 'speed' is the ground speed if it is what the positions move by, exactly."""
    column = one.raw.column
    truth = _over_ground(evidence)
    if truth is not None:
        figures = evidence.grid.value(one.raw)
        with np.errstate(invalid="ignore", divide="ignore"):
            share = np.where(truth > 10.0, figures / truth, np.nan)
        finite = share[np.isfinite(share)]
        if len(finite) > 30:
            spread = float(np.percentile(finite, 75) - np.percentile(finite, 25)) / max(1e-9, abs(middle(finite)))
            units = (column.unit,) if column.unit else ("kt", "km/h", "mph", "m/s")
            fits = decide({u: np.log(middle(finite) * UNITS[u].factor) for u in units if u}, 0.03, 0.05)
            if fits and spread < 0.05:
                one.quantity = "ground_speed"
                one.raw.column = column.with_(quantity="ground_speed", alternatives=())
                one.take(fits, f"it is the speed at which the recorded position moves, in {fits}")
                return
    if column.unit:
        one.problem = f"'{column.name}' does not say which speed it is"
        one.question = column.question
        return
    one.problem = "kt, km/h, mph or m/s cannot be told, nor which speed it is"
    one.question = f"{column.question} In kt, km/h, mph or m/s?"


def _over_ground(evidence: Evidence) -> Array | None:
    """Ground speed from recorded positions in degrees, m/s."""
    latitude, longitude = evidence.of("latitude", known=False), evidence.of("longitude", known=False)
    if latitude is None or longitude is None:
        return None
    scale = []
    for one in (latitude, longitude):
        finite = evidence.grid.value(one.raw)
        top = np.nanmax(np.abs(finite)) if np.isfinite(finite).any() else 0.0
        scale.append(UNITS[one.unit].factor if one.unit else np.pi / 180.0 if top > 3.2 else np.nan)
    if not np.isfinite(scale).any():
        return None
    use = scale[0] if np.isfinite(scale[0]) else scale[1]
    north = evidence.grid.rate(latitude.raw) * use * 6.371e6
    east = evidence.grid.rate(longitude.raw) * use * 6.371e6 * np.cos(evidence.grid.value(latitude.raw) * use)
    return np.hypot(north, east)


def settle_unit(evidence: Evidence, one: Settled) -> None:
    """Try what the quantity's physics offer."""
    quantity = one.quantity
    if quantity in SPEEDS:
        _speed(evidence, one)
    elif quantity in ANGLES or quantity in ("latitude", "longitude"):
        angles.settle_angle(evidence, one)
    elif quantity in RATES:
        angles.settle_rate(evidence, one)
    elif quantity in ("pressure_altitude", "geometric_altitude", "height_above_ground"):
        _altitude(evidence, one)
    elif quantity == "vertical_speed":
        _vertical(evidence, one)
    elif quantity in ("static_air_temperature", "total_air_temperature"):
        _air_temperature(evidence, one)
    elif quantity in ("static_pressure", "altimeter_setting"):
        _by_ground_pressure(evidence, one)
    elif quantity == "flap_angle":
        _flaps(evidence, one)
    elif set(one.raw.column.units) == {"%", "1"}:
        top = float(np.max(np.abs(evidence.figures(one)), initial=0.0))
        if top > 2.0:
            one.take("%", f"figures up to {top:.3g} are per cent")


def _speed(evidence: Evidence, one: Settled) -> None:
    figures = evidence.grid.value(one.raw)
    for estimate, why, close, apart in _estimates(evidence, one):
        with np.errstate(invalid="ignore", divide="ignore"):
            share = np.where((estimate > 12.0) & (figures > 0), figures / estimate, np.nan)
        finite = share[np.isfinite(share)]
        if len(finite) < 20:
            continue
        centre = middle(finite)
        spread = float(np.percentile(finite, 75) - np.percentile(finite, 25)) / centre
        error = 1.25 * spread / 1.35 / np.sqrt(len(finite) / 4.0)
        if error > 0.03:
            continue
        unit = decide({u: np.log(centre * UNITS[u].factor) for u in one.raw.column.units}, close, apart)
        if unit:
            one.take(unit, f"{unit} by {why}, within {abs(centre * UNITS[unit].factor - 1) * 100:.0f} %")
            return


def _estimates(evidence: Evidence, one: Settled) -> list[tuple[Array, str, float, float]]:
    """Independent estimates of a speed in m/s: (values, why, how close, how far apart in the logarithm)."""
    out: list[tuple[Array, str, float, float]] = []
    quantity = one.quantity
    height = evidence.of("pressure_altitude", "geometric_altitude")
    at = evidence.si(height) if height is not None else None
    mach = evidence.of("mach")
    warm = evidence.of("static_air_temperature")
    if quantity == "ground_speed":
        over = _over_ground(evidence)
        if over is not None:
            out.append((over, "the speed at which the position moves", 0.04, 0.08))
        return out
    if mach is not None and (at is not None or warm is not None):
        number = evidence.si(mach)
        kelvin = evidence.si(warm) if warm is not None else _temperature(at if at is not None else np.zeros(1))
        with np.errstate(invalid="ignore"):
            true = number * np.sqrt(1.4 * _R * kelvin)
        true = np.where(number > 0.12, true, np.nan)
        if quantity == "true_airspeed":
            out.append((true, "the recorded Mach number", 0.06, 0.07))
        elif at is not None:
            out.append((_calibrated(number, _pressure(at)), "the recorded Mach number and altitude", 0.05, 0.08))
    for other in evidence.all:
        if (
            other is one
            or other.open
            or other.problem
            or other.quantity not in SPEEDS
            or other.quantity == "ground_speed"
        ):
            continue
        speed = evidence.si(other)
        if quantity == other.quantity or {quantity, other.quantity} <= {"indicated_airspeed", "calibrated_airspeed"}:
            out.append((speed, f"'{other.raw.column.name}'", 0.06, 0.07))
        elif at is not None:
            thin = np.sqrt(_pressure(at) / _P0 * _T0 / _temperature(at))
            factor = {"true_airspeed": 1.0}.get(quantity, 0.0) - {"true_airspeed": 1.0}.get(other.quantity, 0.0)
            out.append((speed * thin ** (-factor), f"'{other.raw.column.name}' at the recorded altitude", 0.06, 0.07))
    turned = _turning(evidence)
    if turned is not None:
        estimate = turned
        if quantity != "true_airspeed" and at is not None:
            estimate = turned * np.sqrt(_pressure(at) / _P0 * _T0 / _temperature(at))
        if quantity == "true_airspeed" or at is not None:
            out.append((estimate, "the rate of turn at the recorded bank", 0.08, 0.12))
    return out


def _calibrated(mach: Array, pressure: Array) -> Array:
    with np.errstate(invalid="ignore"):
        impact = pressure * ((1.0 + 0.2 * mach**2) ** 3.5 - 1.0)
        return 340.294 * np.sqrt(5.0 * ((impact / _P0 + 1.0) ** (2.0 / 7.0) - 1.0))


def _turning(evidence: Evidence) -> Array | None:
    """True airspeed from bank and rate of turn in level coordinated turns, m/s; wind moves a heading's turn little."""
    bank, heading = evidence.of("bank_angle"), evidence.of("heading")
    if bank is None or heading is None:
        return None
    angle, rate = np.abs(evidence.si(bank)), np.abs(evidence.si_rate(heading, wraps=True))
    rolling = np.abs(evidence.si_rate(bank))
    steady = (
        (angle > np.radians(12)) & (angle < np.radians(50)) & (rate > np.radians(0.8)) & (rolling < np.radians(2.0))
    )
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(steady, _G * np.tan(angle) / rate, np.nan)


def _altitude(evidence: Evidence, one: Settled) -> None:
    figures = evidence.grid.value(one.raw)
    pressure = evidence.of("static_pressure")
    if pressure is not None and one.quantity == "pressure_altitude":
        true = _height(evidence.si(pressure))
        ratio, alike, _ = slope(true, figures)
        if alike > 0.9:
            unit = decide({u: np.log(abs(ratio) * UNITS[u].factor) for u in ("ft", "m")}, 0.15, 0.5)
            if unit:
                one.take(unit, f"the static pressure fits {unit}")
                return
    climb = evidence.grid.rate(one.raw)
    for other in evidence.all:
        if (
            other is one
            or other.open
            or other.problem
            or other.quantity not in ("pressure_altitude", "geometric_altitude")
        ):
            continue
        ratio, alike, _ = origin_slope(evidence.si_rate(other), climb)
        if alike > 0.8:
            unit = decide({u: np.log(abs(ratio) * UNITS[u].factor) for u in ("ft", "m")}, 0.2, 0.5)
            if unit:
                one.take(unit, f"'{other.raw.column.name}' climbs as {unit} would")
                return
    rise = evidence.of("vertical_speed", known=False)
    if rise is not None and rise is not one:
        ratio, alike, _ = ratio_of(evidence.grid.long_mean(rise.raw), evidence.grid.long_rate(one.raw))
        if abs(alike) > 0.7 and ratio:
            if rise.unit:
                unit = decide(
                    {u: np.log(abs(ratio) / UNITS[rise.unit].factor * UNITS[u].factor) for u in ("ft", "m")}, 0.3, 0.5
                )
                if unit:
                    one.take(unit, f"the vertical speed fits {unit}")
                    return
            else:
                # both open: the ratio names the pair, if only one pair has it
                pairs = {
                    ("ft", "ft/min"): 1 / 60,
                    ("m", "m/s"): 1.0,
                    ("m", "ft/min"): 0.3048 / 60,
                    ("ft", "m/s"): 1 / 0.3048,
                }
                near = decide({f"{a} {b}": np.log(abs(ratio) / value) for (a, b), value in pairs.items()}, 0.3, 0.5)
                if near in ("ft ft/min", "m ft/min", "ft m/s"):
                    unit, other_unit = near.split(" ")
                    one.take(unit, f"altitude and vertical speed fit only as {unit} and {other_unit}")
                    rise.take(other_unit, f"altitude and vertical speed fit only as {unit} and {other_unit}")
                    return
    slow, fast = (
        evidence.of("indicated_airspeed", "calibrated_airspeed", known=False),
        evidence.of("true_airspeed", known=False),
    )
    same_unit = slow is not None and fast is not None and (slow.unit == fast.unit)
    if same_unit and slow is not None and fast is not None and one.quantity != "height_above_ground":
        a, b = evidence.grid.value(slow.raw), evidence.grid.value(fast.raw)
        with np.errstate(invalid="ignore", divide="ignore"):
            thin = np.where((a > 0) & (b > 0), (a / b) ** 2, np.nan)
        # density ratio falls by about a tenth a kilometre: enough to part feet from metres above a few hundred metres
        for_metres, alike, _ = slope(figures, np.log(thin))
        if slow.unit and alike < -0.9 and np.isfinite(for_metres):
            unit = decide({u: np.log(abs(for_metres) / (1.0e-4 * UNITS[u].factor)) for u in ("ft", "m")}, 0.4, 0.6)
            if unit:
                one.take(unit, f"the ratio of true to indicated airspeed fits {unit}")
                return
    mach, cas = evidence.of("mach"), evidence.of("calibrated_airspeed", "indicated_airspeed")
    if mach is not None and cas is not None and one.quantity == "pressure_altitude":
        options = {}
        for unit in ("ft", "m"):
            made = _calibrated(evidence.si(mach), _pressure(figures * UNITS[unit].factor))
            with np.errstate(invalid="ignore", divide="ignore"):
                options[unit] = np.log(middle(np.where(evidence.si(mach) > 0.15, made / evidence.si(cas), np.nan)))
        unit = decide(options, 0.06, 0.08)
        if unit:
            one.take(unit, f"Mach number and airspeed fit {unit}")
            return
    pitch, speed = evidence.of("pitch_angle"), evidence.of("true_airspeed", "calibrated_airspeed", "indicated_airspeed")
    if pitch is not None and speed is not None:
        ratio, alike, _ = slope(evidence.si(speed) * np.sin(evidence.si(pitch)), climb)
        if alike > 0.7:
            unit = decide({u: np.log(abs(ratio) * UNITS[u].factor) for u in ("ft", "m")}, 0.45, 0.4)
            if unit:
                one.take(unit, f"climb, pitch and airspeed fit {unit}")
                return
    warm = evidence.of("static_air_temperature")
    if warm is not None:
        falls, alike, _ = slope(figures, evidence.si(warm))
        if alike < -0.93:
            unit = decide({u: np.log(abs(falls) / (0.0065 * UNITS[u].factor)) for u in ("ft", "m")}, 0.35, 0.5)
            if unit and np.nanmax(figures) - np.nanmin(figures) > (2000.0 if unit == "m" else 6000.0):
                one.take(unit, f"the air cools with height as {unit} would have it")


def _vertical(evidence: Evidence, one: Settled) -> None:
    height = evidence.of("pressure_altitude", "geometric_altitude")
    if height is None:
        return
    ratio, alike, _ = ratio_of(evidence.grid.long_mean(one.raw), evidence.grid.long_rate(height.raw) * height.scale)
    if abs(alike) > 0.7 and ratio:
        unit = decide({u: np.log(abs(ratio) / UNITS[u].factor) for u in ("ft/min", "m/s", "ft/s")}, 0.35, 0.5)
        if unit:
            one.take(unit, f"the altitude moves as {unit} would")


def _air_temperature(evidence: Evidence, one: Settled) -> None:
    finite = evidence.figures(one)
    if not len(finite):
        return
    if np.min(finite) > 150.0:
        one.take("K", f"figures from {np.min(finite):.0f} to {np.max(finite):.0f} are kelvins")
        return
    height = evidence.of("pressure_altitude", "geometric_altitude")
    if height is None:
        return
    figures, standard = evidence.grid.value(one.raw), _temperature(evidence.si(height))
    off = {unit: figures * UNITS[unit].factor + UNITS[unit].offset - standard for unit in ("degC", "degF")}
    # no air is 40 K off the standard at every height, and none is 60 K off anywhere
    good = [
        u
        for u, gap in off.items()
        if np.isfinite(gap).any() and abs(middle(gap)) < 35.0 and np.nanmax(np.abs(gap)) < 55.0
    ]
    if len(good) == 1:
        one.take(good[0], f"only {good[0]} lies near the air of that height")
        return
    falls, alike, _ = slope(evidence.si(height), figures)
    if alike < -0.93 and np.ptp(evidence.si(height)[np.isfinite(evidence.si(height))]) > 800.0:
        unit = decide({u: np.log(abs(falls) * UNITS[u].factor / 0.0065) for u in ("degC", "degF")}, 0.25, 0.2)
        if unit and unit in good:
            one.take(unit, f"it falls with height as {unit} would")


def _by_ground_pressure(evidence: Evidence, one: Settled) -> None:
    finite = evidence.figures(one)
    if not len(finite):
        return
    top = float(np.max(finite))
    # at the aerodrome, from sea level to some 3,000 m
    for unit, low, high in (
        ("Pa", 68e3, 107e3),
        ("hPa", 680.0, 1075.0),
        ("kPa", 68.0, 107.0),
        ("inHg", 20.0, 31.9),
        ("psi", 9.9, 15.6),
    ):
        if low <= top <= high:
            one.take(unit, f"its highest figure of {top:.4g} is air pressure near the ground in {unit}")
            return


def _flaps(evidence: Evidence, one: Settled) -> None:
    finite = one.raw.values[np.isfinite(one.raw.values)]
    if not len(finite):
        return
    top = float(np.max(np.abs(finite)))
    if top == 0.0:
        one.take("deg", "it is zero throughout, in any unit")
    elif 5.0 < top <= 60.0 and not _fraction(finite):
        one.take("deg", f"figures up to {top:.3g} fit degrees, not radians, steps or per cent")
    else:
        one.problem = f"figures up to {top:.3g} may be degrees, per cent or detents"
        one.question = "What is the flap angle in deg for each figure?"


def _fraction(values: Array) -> bool:
    return bool(np.max(values) <= 1.0)
