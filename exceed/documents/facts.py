"""The facts of an aeroplane that rules point at: their names, their kinds, and why one is missing."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from exceed.core.quantities import QUANTITIES
from exceed.documents.fields import Faults, Path, an, nearest
from exceed.documents.values import Value, expected_of

if TYPE_CHECKING:
    from exceed.documents.aircraft import Aircraft

_SPEEDS = {
    "manoeuvring": "manoeuvring speed",
    "normal_operating": "normal operating speed",
    "never_exceed": "never-exceed speed",
    "maximum_operating": "maximum operating speed",
    "flaps_extended": "flaps extended speed",
    "gear_operating": "gear operating speed",
    "gear_extended": "gear extended speed",
    "turbulence": "turbulence speed",
    "airbrakes": "airbrakes speed",
    "aerotow": "aerotow speed",
    "winch": "winch speed",
}

# name -> kind of quantity; `limits.ANYTHING` is known as well, of any kind
KNOWN: dict[str, str] = {
    "load_factor.maximum": "load factor",
    "load_factor.minimum": "load factor",
    **{f"speeds.{name}": "speed" for name in _SPEEDS},
    "mach.maximum_operating": "ratio",
    "mach.never_exceed": "ratio",
    "mass.empty": "mass",
    "mass.maximum_take_off": "mass",
    "mass.maximum_landing": "mass",
    "mass.maximum_zero_fuel": "mass",
    "loading.forward": "length",
    "loading.aft": "length",
}


@dataclass(frozen=True, slots=True)
class Fact:
    """One fact as looked up.

    `value` is a Value, a SpeedLimit, or the tuple of rows it is to be taken from (load factors, flap speeds, CG
    envelope); None where it is missing, and `missing` says why in a user's words. `kind` is its kind of quantity,
    `airspeed` the kind of airspeed it is given in, `name` the full name as rules write it.
    """

    name: str
    kind: str
    value: Any = None
    airspeed: str | None = None
    missing: str = ""
    assumed: bool = False
    source: str | None = None


def plain_name(name: str) -> str:
    """The name without a leading 'aircraft.'."""
    return name.removeprefix("aircraft.")


def kind_of_fact(name: str) -> str | None:
    """Kind of quantity of a fact's name: '' for `limits.NAME` (any kind), None for a name that is not known."""
    short = plain_name(name)
    if short.startswith("limits.") and len(short) > len("limits."):
        return ""
    return KNOWN.get(short)


def nearest_fact(name: str) -> str | None:
    near = nearest(plain_name(name), KNOWN)
    return f"aircraft.{near}" if near else None


def look_up(aircraft: Aircraft, name: str) -> Fact:
    """The fact, or the reason why it is missing. Raises KeyError for a name that is not known at all."""
    short = plain_name(name)
    full = f"aircraft.{short}"
    kind = kind_of_fact(short)
    if kind is None:
        raise KeyError(f"'{full}' is not a fact of an aeroplane")
    about: dict[str, Any] = {"assumed": aircraft.assumed, "source": aircraft.source}
    group, _, key = short.partition(".")

    def missing(reason: str) -> Fact:
        return Fact(full, kind or "", missing=reason, **about)

    if group == "limits":
        own = aircraft.limits.get(key)
        if own is None:
            return missing(f"the aircraft file has no limits.{key}")
        return Fact(full, own.kind, own, own.airspeed, **about)
    if group == "load_factor":
        factors = tuple(row for row in aircraft.load_factor if getattr(row, key) is not None)
        return Fact(full, kind, factors, **about) if factors else missing(f"the aircraft file has no {key} load factor")
    if group == "loading":
        envelope = aircraft.loading.envelope
        return Fact(full, kind, envelope, **about) if envelope else missing("the aircraft file has no loading envelope")
    if short == "speeds.flaps_extended":
        if aircraft.flaps == "none":
            return missing("the aeroplane has no flaps")
        rows = aircraft.speeds.flaps_extended
        if not rows:
            return missing("the aircraft file has no flaps extended speed")
        return Fact(full, kind, rows, rows[0].maximum.airspeed, **about)
    if short in ("speeds.gear_operating", "speeds.gear_extended") and aircraft.gear == "fixed":
        return missing("the gear is fixed")
    value = getattr(getattr(aircraft, group), key)
    if value is None:
        what = {
            "speeds": _SPEEDS.get(key, key),
            "mach": f"{key.replace('_', ' ')} Mach number",
            "mass": f"{key.replace('_', ' ')} mass",
        }[group]
        return missing(f"the aircraft file has no {what}")
    return Fact(full, kind, value, getattr(value, "airspeed", None), **about)


_UP = Value(0.0, "angle", "deg", "flaps up")


def flaps_in_order(here: Value | None, before: Value | None, found: Faults, path: Path) -> None:
    """Note a row whose flap setting does not come after that of the row before."""
    if here is None or before is None:
        found.note(
            path,
            "a row for all flap settings stands beside another row",
            "one row, or 'flaps' in each row",
            "say which setting each row is for",
        )
    elif not here > before:
        found.note(
            path,
            f"flaps '{here}' are not above '{before}' before them",
            "rows in ascending order of flaps",
            "put the rows in order, each setting once",
        )


def contradictions(aircraft: Aircraft) -> Faults:
    """What cannot be true together; each at its path in the file."""
    found = Faults()
    _stall_rows(aircraft, found)
    _load_factor_rows(aircraft, found)
    if aircraft.flaps == "none":
        settings_of: tuple[tuple[str, list[Value | None]], ...] = (
            ("stall_speed", [row.flaps for row in aircraft.stall_speed]),
            ("load_factor", [row.flaps for row in aircraft.load_factor]),
        )
        for name, listed in settings_of:
            for index, flaps in enumerate(listed):
                if flaps is not None and abs(flaps) > 1e-9:
                    found.note(
                        (name, index, "flaps"),
                        f"flaps '{flaps}' are given and the aeroplane has none",
                        "'flaps: recorded' or 'not_recorded', or no rows with flaps",
                        "correct one of the two",
                    )
        if aircraft.speeds.flaps_extended:
            found.note(
                ("speeds", "flaps_extended"),
                "flap speeds are given and the aeroplane has no flaps",
                "'flaps: recorded' or 'not_recorded'",
                "correct one of the two",
            )
    if aircraft.gear == "fixed":
        for name in ("gear_operating", "gear_extended"):
            if getattr(aircraft.speeds, name) is not None:
                found.note(
                    ("speeds", name),
                    "a gear speed is given and the gear is fixed",
                    "'gear: recorded' or 'not_recorded'",
                    "correct one of the two",
                )
    envelope, empty = aircraft.loading.envelope, aircraft.mass.empty
    if envelope and empty is not None and envelope[-1][0] < empty:
        problem = f"the envelope ends at '{envelope[-1][0]}', below empty mass '{empty}'"
        path = ("loading", "envelope", len(envelope) - 1)
        found.note(path, problem, "an envelope up to maximum take-off mass", "check the figures")
    _named_limits(aircraft, found)
    settings = [row.flaps for row in aircraft.position_error]
    for index in range(1, len(settings)):
        flaps_in_order(settings[index], settings[index - 1], found, ("position_error", index))
    return found


def _stall_rows(aircraft: Aircraft, found: Faults) -> None:
    rows = aircraft.stall_speed
    for index in range(1, len(rows)):
        here, before = rows[index], rows[index - 1]
        flaps, flaps_before = here.flaps or 0.0, before.flaps or 0.0
        flaps_in_order(here.flaps, before.flaps or _UP, found, ("stall_speed", index))
        same = here.upright.airspeed == before.upright.airspeed and here.mass == before.mass
        if flaps > flaps_before and same and here.upright > before.upright:
            found.note(
                ("stall_speed", index, "upright"),
                f"stall speed '{here.upright}' with more flaps is above '{before.upright}' with fewer",
                "a stall speed that does not grow with flaps",
                "check both figures",
            )
    if not rows:
        return
    clean = rows[0].upright
    for name in ("manoeuvring", "normal_operating", "never_exceed", "maximum_operating"):
        limit = getattr(aircraft.speeds, name)
        # indicated and calibrated differ by the position error, far less than these two may ever be apart
        if limit is not None and limit.greatest <= clean:
            found.note(
                ("speeds", name),
                f"{_SPEEDS[name]} '{limit.greatest}' is not above stall speed '{clean}'",
                f"above {clean}",
                "check both figures",
            )


def _load_factor_rows(aircraft: Aircraft, found: Faults) -> None:
    seen: dict[tuple[Any, ...], int] = {}
    for index, row in enumerate(aircraft.load_factor):
        for side in ("maximum", "minimum"):
            if getattr(row, side) is None:
                continue
            key = (row.flaps, row.mass_up_to, row.speed_up_to, row.airbrakes, side)
            if key in seen:
                found.note(
                    ("load_factor", index),
                    f"this row has the same conditions as row {seen[key] + 1}",
                    "each set of conditions once",
                    "remove one, or tell them apart",
                )
                break
            seen[key] = index


# a word in the name of a limit -> the kinds it can have; a bare number is none of them
_WORDS = {
    "temperature": ("temperature",),
    "pressure": ("pressure",),
    "altitude": ("length",),
    "mass": ("mass",),
    "load_factor": ("load factor",),
    "time": ("time",),
}


def _named_limits(aircraft: Aircraft, found: Faults) -> None:
    """Limits of one's own whose name says what they are."""
    for name, value in aircraft.limits.items():
        base = name.removesuffix("_minimum").removesuffix("_maximum")
        kinds = (QUANTITIES[base].kind,) if base in QUANTITIES else ()
        kinds = kinds or next((kinds for word, kinds in _WORDS.items() if word in base), ())
        if kinds and value.kind not in kinds:
            what = "has no unit" if value.bare else f"is {an(value.kind)}"
            expected = expected_of(kinds, bare="ratio" in kinds)
            found.note(("limits", name), f"'{value}' {what}", expected, "give the limit with its unit")
