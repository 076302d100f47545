"""One way to show a number with its unit, a time, a severity, a file name: table, page, describe and ledger use it."""

from __future__ import annotations

import math
import re
import unicodedata
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from functools import lru_cache
from typing import Any

from exceed.core.quantities import QUANTITIES
from exceed.core.units import UNITS

_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)

# word, mark and colour: colour may be lost, the others never (style of cockpit alerting, 14 CFR 25.1322)
MARKS: dict[str, str] = {"advisory": "*", "caution": "!", "warning": "!!"}
_SGR: dict[str, str] = {
    "advisory": "36",
    "caution": "33",
    "warning": "1;31",
    "strong": "1",
    "faint": "2",
}

# what `--units metric` shows instead; what is not listed is metric or has no other form in the trade
METRIC: dict[str, str] = {
    "kt": "km/h",
    "mph": "km/h",
    "ft": "m",
    "in": "m",
    "ft/min": "m/s",
    "ft/s": "m/s",
    "lb": "kg",
    "lb/h": "kg/h",
    "degF": "degC",
    "psi": "kPa",
    "inHg": "hPa",
    "USG": "L",
    "USG/h": "L/h",
    "lb.ft": "N.m",
    "ft2": "m2",
}
_BARE = {"1": "", "state": "", "SI": ""}

STATES: dict[str, tuple[str, str]] = {
    "gear_down": ("up", "down"),
    "airbrakes_out": ("in", "out"),
    "weight_on_wheels": ("in the air", "on the ground"),
    "stall_warning": ("silent", "on"),
    "on_tow": ("free", "on tow"),
}


@dataclass(frozen=True, slots=True)
class Shown:
    """A quantity as it is to be shown: value -> text with so many digits, and the unit's name (may be empty)."""

    quantity: str
    unit: str
    decimals: int
    factor: float
    offset: float

    def convert(self, value: float | None) -> float | None:
        """A value in the summary's unit in the unit shown."""
        return None if value is None else value * self.factor + self.offset

    def text(self, value: float | None, decimals: int | None = None) -> str:
        """Digits only; `-` for what is not known; a word for a state."""
        if value is None:
            return "-"
        if self.quantity in STATES:
            return STATES[self.quantity][value >= 0.5]
        return number(value * self.factor + self.offset, self.decimals if decimals is None else decimals)

    def with_unit(self, value: float | None, decimals: int | None = None) -> str:
        """Digits and unit."""
        text = self.text(value, decimals)
        return f"{text} {self.unit}" if self.unit and value is not None else text


@lru_cache(maxsize=512)
def shown(quantity: str, unit: str, system: str = "trade") -> Shown:
    """How a quantity in `unit` is shown in a system, `trade` or `metric`."""
    row = QUANTITIES.get(quantity)
    decimals = row.decimals if row is not None else 1
    target = METRIC.get(unit, unit) if system == "metric" else unit
    if target == unit:
        return Shown(quantity, _BARE.get(unit, unit), decimals, 1.0, 0.0)
    old, new = UNITS[unit], UNITS[target]
    factor = old.factor / new.factor
    # as many digits as say the same: a foot per minute is 0.005 m/s
    decimals = max(0, decimals + math.floor(0.3 - math.log10(factor)))
    return Shown(quantity, target, decimals, factor, (old.offset - new.offset) / new.factor)


def number(value: float, decimals: int) -> str:
    """Fixed digits, ASCII minus, no negative zero."""
    text = f"{value:.{decimals}f}"
    return text[1:] if text.startswith("-") and not text.strip("-0.") else text


def parting_decimals(form: Shown, value: float | None, limit: float | None) -> int:
    """The digits with which a value and a limit that differ also look different: up to two more than usual."""
    if value is None or limit is None or value == limit or form.quantity in STATES:
        return form.decimals
    for decimals in range(form.decimals, form.decimals + 3):
        if form.text(value, decimals) != form.text(limit, decimals):
            return decimals
    return form.decimals


def peak_texts(event: dict[str, Any], system: str = "trade") -> tuple[str, str, str, str]:
    """An event's peak, its 95 % interval, the limit, the unit, with the same digits for all.

    The peak is the estimate of the true extreme where there is one, else the value. An interval is
    written `6.12..6.37`, one with an open end `>= 6.12`.
    """
    peak, limit = event["peak"], event["limit"]["value"]
    form = shown(event["quantity"], peak["unit"], system)
    best = peak["estimate"] if peak["estimate"] is not None else peak["value"]
    decimals = parting_decimals(form, best, limit)
    low, high = peak["low"], peak["high"]
    if low is not None and high is not None:
        interval = f"{form.text(low, decimals)}..{form.text(high, decimals)}"
    elif low is not None:
        interval = f">= {form.text(low, decimals)}"
    else:
        interval = "" if high is None else f"<= {form.text(high, decimals)}"
    return form.text(best, decimals), interval, form.text(limit, decimals), form.unit


def iso_utc(epoch: float | None, *, trim: bool = False) -> str | None:
    """`2031-05-02T09:15:43.130Z` from seconds since 1970; `trim` leaves out a zero fraction. None stays None."""
    if epoch is None or not math.isfinite(epoch):
        return None
    try:
        # via integer milliseconds: a float of seconds would show 43.129
        moment = _EPOCH + timedelta(milliseconds=round(epoch * 1000.0))
    except OverflowError:
        return None
    text = moment.isoformat(timespec="milliseconds").removesuffix("+00:00")
    return (text.removesuffix(".000") if trim else text) + "Z"


def moment(text: str) -> datetime:
    """The instant that an ISO text of ours says."""
    return datetime.fromisoformat(text)


def local_text(text: str | None, zone: Any, *, digits: int = 0) -> str:
    """Local time of day of a UTC text, with its offset: `11:15:43 +02:00`; empty where there is no time or zone."""
    if text is None or zone is None:
        return ""
    there = moment(text).astimezone(zone)
    clock = there.strftime("%H:%M:%S")
    if digits:
        clock += f".{there.microsecond:06d}"[: digits + 1]
    offset = there.strftime("%z")
    return f"{clock} {offset[:3]}:{offset[3:5]}"


def find_zone(name: str | None) -> Any:
    """The tzinfo of a zone that differs from UTC, or None (also where this machine has no table of zones)."""
    if not name or name.upper() in ("UTC", "Z", "ETC/UTC", "GMT"):
        return None
    from zoneinfo import ZoneInfo

    try:
        return ZoneInfo(name)
    except (KeyError, ValueError, OSError):
        return None


def elapsed(time: float | None) -> str:
    """`0:12:31.2` from seconds."""
    if time is None:
        return "-"
    sign = "-" if time < 0 else ""
    tenths = round(abs(time) * 10.0)
    hours, rest = divmod(tenths, 36000)
    minutes, rest = divmod(rest, 600)
    return f"{sign}{hours}:{minutes:02d}:{rest // 10:02d}.{rest % 10}"


def duration(time: float | None) -> str:
    """How long, in words short enough for a column: `0.81 s`, `53.6 s`, `12 min 31 s`, `1 h 26 min`."""
    if time is None:
        return "-"
    if time < 9.995:
        return f"{number(time, 2)} s"
    if time < 99.95:
        return f"{number(time, 1)} s"
    whole = round(time)
    if whole < 3600:
        return f"{whole} s" if whole < 120 else f"{whole // 60} min {whole % 60} s"
    minutes = round(time / 60.0)
    return f"{minutes // 60} h {minutes % 60:02d} min"


def count(many: int, one: str, more: str | None = None) -> str:
    """`1 flight`, `2 flights`."""
    return f"{many} {one if many == 1 else (more or one + 's')}"


def words(name: str) -> str:
    """A name of ours as words: `load_factor` -> `load factor`."""
    return name.replace("_", " ").replace("rate of:", "rate of ")


def probability(p: float | None) -> str:
    """A probability in per cent, never as a certainty that it is not: `> 99.9 %`."""
    if p is None:
        return "not known"
    if p >= 0.9995:
        return "> 99.9 %"
    if p <= 0.0005:
        return "< 0.1 %"
    return f"{number(p * 100.0, 1)} %"


# C0, C1, delete, line and paragraph separators, direction overrides, invisible joiners, lone surrogates
_UNSAFE = re.compile(
    "[\x00-\x1f\x7f-\x9f\u00ad\u061c\u180e\u200b-\u200f\u2028-\u202e\u2060-\u206f\ufeff\ufff9-\ufffb\ud800-\udfff"
    "\U000e0000-\U000e0fff]"
)
_SHORT = {"\n": "\\n", "\r": "\\r", "\t": "\\t"}


def _escape(match: re.Match[str]) -> str:
    letter = match.group()
    code = ord(letter)
    if 0xDC80 <= code <= 0xDCFF:  # a byte of a file name that was no UTF-8
        return f"\\x{code - 0xDC00:02x}"
    short = f"\\x{code:02x}" if code < 256 else f"\\u{code:04x}" if code < 65536 else f"\\U{code:08x}"
    return _SHORT.get(letter, short)


def visible(text: object, *, unicode: bool = True) -> str:
    """Text of foreign origin made safe to print: control characters are shown, not sent."""
    safe = _UNSAFE.sub(_escape, str(text))
    return safe if unicode or safe.isascii() else safe.encode("ascii", "backslashreplace").decode("ascii")


def breadth(text: str) -> int:
    """Columns that a text takes on a terminal: wide characters two, combining ones none."""
    if text.isascii():
        return len(text)
    return sum(
        0 if unicodedata.combining(letter) else 2 if unicodedata.east_asian_width(letter) in "WF" else 1
        for letter in text
    )


def clip(text: str, room: int, ellipsis: str = "~") -> str:
    """Text cut to so many columns, the cut shown."""
    if breadth(text) <= room:
        return text
    kept = text[: max(room - len(ellipsis), 0)]
    while kept and breadth(kept) + len(ellipsis) > room:
        kept = kept[:-1]
    return (kept + ellipsis)[: max(room, 0)]


def fill(text: str, room: int, *, right: bool = False) -> str:
    """Text padded to so many columns."""
    gap = " " * max(room - breadth(text), 0)
    return gap + text if right else text + gap


def paint(text: str, kind: str, colour: bool) -> str:
    """Text in a severity's colour (or `strong`, `faint`), if colour is wanted."""
    return f"\x1b[{_SGR[kind]}m{text}\x1b[0m" if colour and text else text


def wants_colour(environment: dict[str, str], *, terminal: bool, no_colour: bool = False) -> bool:
    """Whether a stream gets colour: only a terminal that is not dumb, and nobody said no (NO_COLOR, not empty)."""
    return terminal and not no_colour and not environment.get("NO_COLOR") and environment.get("TERM") != "dumb"


def wants_unicode(encoding: str | None) -> bool:
    """Whether a stream's encoding takes more than ASCII without loss."""
    return (encoding or "").lower().replace("_", "-") in ("utf-8", "utf8", "utf-16", "utf-32", "utf-8-sig")
