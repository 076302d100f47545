"""Units as recorders write them: in brackets, suffixes, or a row of their own -> a row of the unit table."""

from __future__ import annotations

import re
from dataclasses import dataclass

from exceed.core.units import UNITS

# unit -> spellings, already reduced by `plain`: lower case, no blanks, dots, carets; deg for the degree sign, u for
# micro
_SPELLINGS: dict[str, str] = {
    "kt": "kt kts kn kns knot knots",
    "m/s": "m/s ms mps m/sec ms-1 meter/s metre/s meters/s metres/s meter/sec metre/sec meterspersecond "
    "metrespersecond",
    "km/h": "km/h kmh kph kmph km/hr kmhr kilometersperhour kilometresperhour",
    "mph": "mph mi/h mi/hr milesperhour",
    "ft/min": "ft/min fpm ft/mn feet/min feet/minute ft/minute ftmin feetperminute ftpermin",
    "ft/s": "ft/s fps ft/sec feet/s feet/sec feetpersecond",
    "g": "g gs gn g0 gee gees g's [g]",
    "m/s2": "m/s2 ms2 mps2 m/s/s m/sec2 m/sec/sec ms-2 m/ss meter/s2 metre/s2 meters/s2 metres/s2",
    "ft/s2": "ft/s2 fps2 ft/s/s ft/sec2 ft/sec/sec feet/s2 feet/sec2",
    "ft": "ft feet foot f ftmsl ftagl ftstd ftpa",
    "m": "m meter metre meters metres mtr mtrs mmsl magl mstd",
    "in": "in inch inches",
    "km": "km kilometer kilometre kilometers kilometres",
    "deg": "deg degs degree degrees degt degm degtrue degmag degmagnetic",
    "rad": "rad rads radian radians",
    "deg/s": "deg/s deg/sec dps degs/s degs/sec degrees/s degree/s degrees/sec degree/sec degps degreespersecond "
    "degs-1",
    "rad/s": "rad/s rad/sec rps rads/s radians/s radian/s radians/sec radps rads-1",
    "degC": "degc celsius centigrade c degreesc degreescelsius degcelsius",
    "degF": "degf fahrenheit f degreesf degfahrenheit",
    "K": "k kelvin degk kelvins",
    "kg": "kg kgs kilogram kilograms kilo",
    "lb": "lb lbs pound pounds lbm",
    "s": "s sec secs second seconds",
    "ms": "ms msec msecs millisecond milliseconds",
    "us": "us usec microsecond microseconds",
    "ns": "ns nsec nanosecond nanoseconds",
    "min": "min mins minute minutes mn",
    "h": "h hr hrs hour hours",
    "Pa": "pa pascal pascals",
    "kPa": "kpa",
    "hPa": "hpa hectopascal hectopascals",
    "mbar": "mbar mb millibar millibars mbars",
    "bar": "bar bars",
    "inHg": 'inhg inhga inchhg incheshg inchesofmercury "hg',
    "psi": "psi psia psig lb/in2 lbf/in2",
    "rpm": "rpm r/min rev/min revs/min 1/min",
    "%": "% percent pct perc %rpm %n1 prct",
    "1": "1 ratio mach m - none",
    "L": "l ltr litre liter litres liters ltrs",
    "USG": "usg gal gals usgal gallon gallons usgals galus",
    "m3": "m3",
    "kg/L": "kg/l",
    "kg/m3": "kg/m3",
    "kg/h": "kg/h kgh kg/hr kph kgph",
    "lb/h": "lb/h lbh lb/hr lbs/h lbs/hr pph lbsperhour",
    "kg/s": "kg/s kg/sec",
    "L/h": "l/h lh l/hr ltr/h lph litre/h liter/h litres/h liters/h",
    "USG/h": "usg/h gph gal/h gal/hr usgph usg/hr gals/h galh",
    "m2": "m2",
    "ft2": "ft2",
    "N.m": "nm newtonmeter newtonmetre",
    "lb.ft": "lbft ftlb ft-lb lb-ft ftlbs ft-lbs lbf-ft",
    "deg/s2": "deg/s2 deg/s/s deg/sec2",
    "rad/s2": "rad/s2 rad/s/s rad/sec2",
    "state": "state discrete disc bool boolean flag logical 0/1 enum status logic on/off bit -",
}
_BY_SPELLING: dict[str, list[str]] = {}
for _unit, _words in _SPELLINGS.items():
    for _word in _words.split():
        _BY_SPELLING.setdefault(_word, []).append(_unit)

# a unit of speed that says which speed it is
_AIRSPEEDS = {
    f"{unit}{kind}": (name, quantity)
    for unit, name in (
        ("k", "kt"),
        ("kt", "kt"),
        ("kts", "kt"),
        ("kn", "kt"),
        ("knots", "kt"),
        ("km/h", "km/h"),
        ("kmh", "km/h"),
        ("mph", "mph"),
        ("m/s", "m/s"),
    )
    for kind, quantity in (
        ("ias", "indicated_airspeed"),
        ("cas", "calibrated_airspeed"),
        ("eas", "equivalent_airspeed"),
        ("tas", "true_airspeed"),
        ("gs", "ground_speed"),
    )
}
# what stands where a unit would and says that there is none
_NOTHING = {
    "",
    "-",
    "--",
    "none",
    "n/a",
    "na",
    "unitless",
    "dimensionless",
    "nil",
    "text",
    "string",
    "utc",
    "gmt",
    "local",
    "z",
    "hh:mm:ss",
    "hhmmss",
    "hms",
    "date",
    "time",
    "yyyy-mm-dd",
    "dd/mm/yyyy",
    "mm/dd/yyyy",
    "iso8601",
    "float",
    "int",
    "double",
    "units",
    "unit",
    "integer",
    "#",
    "num",
    "dd.mm.yyyy",
    "hh:mm:ss.sss",
    "hh:mm:ss.ss",
    "iso",
}
# units that a sensor's raw output has: the column is no physical quantity yet
RAW = {"count", "counts", "cnt", "raw", "adc", "mv", "v", "volt", "volts", "lsb", "bits", "hex", "octal", "ma", "dn"}


@dataclass(frozen=True, slots=True)
class UnitText:
    """What a unit's text can mean: rows of the unit table, and the airspeed it names (`KIAS`), if it does."""

    units: tuple[str, ...]
    quantity: str | None = None


def plain(text: str) -> str:
    """A unit's spelling, reduced: `° / sec` -> `deg/sec`, `m·s⁻²` -> `ms-2`."""
    text = text.strip().strip("[](){}<>").strip()
    for old, new in (
        ("°", "deg"),
        ("º", "deg"),
        ("˚", "deg"),
        ("µ", "u"),
        ("μ", "u"),
        ("²", "2"),
        ("⁻", "-"),
        ("¹", "1"),
        ("³", "3"),
        ("℃", "degc"),
        ("℉", "degf"),
        ("−", "-"),
        ("·", ""),
        ("⋅", ""),
    ):
        text = text.replace(old, new)
    text = text.lower().replace(" per ", "/").replace("**", "").replace("^", "")
    return re.sub(r"[\s._*]", "", text)


def unit_in(text: str) -> UnitText | None:
    """Units that a text can mean, most usual first, or None if it is no unit."""
    key = plain(text)
    if key in _AIRSPEEDS:
        name, quantity = _AIRSPEEDS[key]
        return UnitText((name,), quantity)
    if key in _BY_SPELLING:
        return UnitText(tuple(_BY_SPELLING[key]))
    return None


def is_unit_cell(text: str) -> bool:
    """Could this be a cell of a units row?"""
    return (
        plain(text) in _NOTHING or text.strip().lower() in _NOTHING or unit_in(text) is not None or plain(text) in RAW
    )


def says_nothing(text: str) -> bool:
    """A cell that stands for no unit."""
    return plain(text) in _NOTHING or text.strip().lower() in _NOTHING


def fitting(text: str, kinds: tuple[str, ...]) -> str | None:
    """The unit that a text means for a quantity of one of these kinds, or None."""
    found = unit_in(text)
    if found is None:
        return None
    for unit in found.units:
        if UNITS[unit].kind in kinds:
            return unit
    # a bare degree sign or 'deg' on a temperature leaves the scale open
    return None


_BRACKETS = re.compile(r"[\[({<]\s*([^\[\](){}<>]*?)\s*[\])}>]")


def split_unit(name: str) -> tuple[str, str]:
    """A heading -> (name without its unit, unit's text): brackets, `name, unit`, `name/unit`, `name_unit`, `name unit`.

    The last bracket that is a unit counts; brackets that are none stay in the name.
    """
    for match in reversed(list(_BRACKETS.finditer(name))):
        inside = match.group(1)
        if inside.strip() and (unit_in(inside) or plain(inside) in RAW) and not inside.strip().isdigit():
            return (name[: match.start()] + " " + name[match.end() :]).strip(" _-:,;"), inside.strip()
    for pattern in (r"^(.*?)\s*,\s*(\S+)$", r"^(.*?)\s+in\s+(\S+)$", r"^(.*?)\s*[:|]\s*(\S+)$"):
        match2 = re.match(pattern, name)
        if match2 and unit_in(match2.group(2)):
            return match2.group(1).strip(), match2.group(2)
    # suffix of one or two parts: alt_ft, roll_deg_s, accel m/s2, vs_ft_min, nz_m_s2
    parts = [part for part in re.split(r"[\s_\-.]+", name.strip()) if part]
    for count in (3, 2, 1):
        if len(parts) > count:
            tail = parts[-count:]
            for joined in ("/".join(tail), "".join(tail), " ".join(tail)):
                key = plain(joined)
                if joined[0].isdigit() or (
                    key in ("1", "-", "m", "c", "f", "k", "g's", "l", "h", "in", "s", "g", "min") and count > 1
                ):
                    continue
                found = unit_in(joined)
                if found and key not in (
                    "1",
                    "-",
                    "ratio",
                    "mach",
                    "none",
                    "state",
                    "status",
                    "flag",
                    "bit",
                    "in",
                    "gs",
                ):
                    head = re.split(r"[\s_\-.]+", name.strip())
                    return " ".join([p for p in head if p][:-count]), joined
    slash = re.match(r"^([^/]+)/([^/].*)$", name.strip())
    if slash and unit_in(slash.group(2)):
        return slash.group(1).strip(), slash.group(2)
    return name.strip(), ""
