"""Dates and times as text -> whole nanoseconds, vectorised by the template that a column's cells share."""

from __future__ import annotations

import re
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

Whole = NDArray[np.int64]
SECOND = 1_000_000_000
DAY = 86400 * SECOND
UNKNOWN = np.iinfo(np.int64).min


# a date outside these years is that of a clock which was never set; nanoseconds in 64 bits end with 2262
FIRST_YEAR, LAST_YEAR = 1900, 2199
NO_DATE = f"no date in the log is of the years {FIRST_YEAR} to {LAST_YEAR}: times are elapsed, UTC is not given"
# hours east or west of UTC: no place on earth is further
MOST_ZONE = 14


@dataclass(frozen=True, slots=True)
class ClockPlan:
    """How time will be had. kind: elapsed, epoch, iso, date_time, frame, time_of_day, row or none.

    `columns` are places of the columns in the order that the kind needs (date, time, offset); `unit` of numbers in
    seconds; `zone` what the log says ('' if it says nothing); `anchor` a second clock column that gives the date.
    """

    kind: str
    columns: tuple[int, ...] = ()
    unit: float = 1.0
    zone: str = ""
    offset: float = 0.0
    order: str = ""  # dmy, mdy or ymd where the cells leave it open
    day: int | None = None  # days since 1970 that the preamble gives
    anchor: int | None = None
    typed: str = ""  # how the parser may read the cells: number, stamp, stamp_zone, time or text
    roles: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()
    problem: str = ""

    def with_(self, **changes: object) -> ClockPlan:
        return replace(self, **changes)  # type: ignore[arg-type]


MONTHS = {
    name: number
    for number, names in enumerate(
        (
            "jan january janv",
            "feb february fev",
            "mar march mars maerz mrz",
            "apr april avr",
            "may mai mayo",
            "jun june juin juni",
            "jul july juil juli",
            "aug august aout ago",
            "sep september sept",
            "oct october okt",
            "nov november",
            "dec december dez",
        ),
        1,
    )
    for name in names.split()
}

_DATE = (
    r"(?:(?P<year>\d{4})[-/. ](?P<month>\d{1,2})[-/. ](?P<day>\d{1,2})"
    r"|(?P<first>\d{1,2})(?P<mark>[-/. ])(?P<second>\d{1,2})(?P=mark)(?P<year2>\d{4}|\d{2})"
    r"|(?P<day3>\d{1,2})[-/. ]?(?P<name>[A-Za-z]{3,9})[-/. ,]*(?P<year3>\d{4}|\d{2})"
    r"|(?P<name4>[A-Za-z]{3,9})[-/. ]+(?P<day4>\d{1,2})[-/. ,]+(?P<year4>\d{4})"
    r"|(?P<year5>\d{4})-(?P<yearday>\d{3})"
    r"|(?P<year6>\d{4})(?P<month6>\d{2})(?P<day6>\d{2})"
    r"|(?P<first7>\d{2})(?P<second7>\d{2})(?P<year7>\d{2}))"
)
_TIME = (
    r"(?:(?P<hour>\d{1,2}):(?P<minute>\d{2})(?::(?P<sec>\d{2})(?:[.,:](?P<fraction>\d{1,9})\d*)?)?(?:\s*(?P<half>[AaPp])\.?[Mm]\.?)?"
    r"|(?P<hour2>\d{2})(?P<minute2>\d{2})(?P<sec2>\d{2})(?:[.,](?P<fraction2>\d{1,9})\d*)?)"
)
_ZONE = r"(?:\s*(?P<zone>Z|z|UTC|GMT|[+-]\d{2}:?\d{2}|[+-]\d{1,2}))?"
FULL = re.compile(rf"\s*{_DATE}(?:T|\s+|[-_,;/:]\s*){_TIME}{_ZONE}\s*")
DATE = re.compile(rf"\s*{_DATE}\s*")
TIME = re.compile(rf"\s*{_TIME}{_ZONE}\s*")


@dataclass(slots=True)
class Stamps:
    """Parsed cells: `date` days since 1970 (or the two open numbers), `clock` ns of the day, `shift` ns of the zone."""

    days: Whole
    first: Whole
    second: Whole
    year: Whole
    clock: Whole
    shift: Whole
    zoned: bool
    bad: NDArray[np.bool_]
    forms: set[str] = field(default_factory=set)


def days_of(year: Whole, month: Whole, day: Whole) -> Whole:
    """Days since 1970-01-01 of proleptic Gregorian dates; UNKNOWN where the date does not exist."""
    shifted = np.where(month > 2, year, year - 1)
    era = shifted // 400
    of_era = shifted - era * 400
    of_year = (153 * (month + np.where(month > 2, -3, 9)) + 2) // 5 + day - 1
    out = era * 146097 + of_era * 365 + of_era // 4 - of_era // 100 + of_year - 719468
    leap = (year % 4 == 0) & ((year % 100 != 0) | (year % 400 == 0))
    length = np.array([0, 31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31])[np.clip(month, 0, 12)] + (
        leap & (month == 2)
    )
    good = (month >= 1) & (month <= 12) & (day >= 1) & (day <= length) & (year >= FIRST_YEAR) & (year <= LAST_YEAR)
    return np.where(good, out, UNKNOWN).astype(np.int64)


def _bytes_of(array: object) -> tuple[NDArray[np.uint8], Whole, NDArray[np.bool_]]:
    """(data, offsets, valid) of an arrow string array."""
    import pyarrow as pa

    if isinstance(array, pa.ChunkedArray):
        array = array.combine_chunks() if array.num_chunks != 1 else array.chunk(0)
        if isinstance(array, pa.ChunkedArray):
            array = pa.concat_arrays(array.chunks)
    if pa.types.is_dictionary(array.type):  # type: ignore[attr-defined]
        array = array.cast(pa.string())  # type: ignore[attr-defined]
    if array.type != pa.large_string():  # type: ignore[attr-defined]
        array = array.cast(pa.large_string())  # type: ignore[attr-defined]
    _, ends, data = array.buffers()  # type: ignore[attr-defined]
    count, shift = len(array), array.offset  # type: ignore[arg-type, attr-defined]
    offsets = (
        np.frombuffer(ends, dtype=np.int64)[shift : shift + count + 1]
        if ends is not None
        else np.zeros(count + 1, np.int64)
    )
    raw = np.frombuffer(data, dtype=np.uint8) if data is not None and data.size else np.zeros(0, np.uint8)
    valid = np.asarray(array.is_valid().to_numpy(zero_copy_only=False), dtype=np.bool_)  # type: ignore[attr-defined]
    return raw, offsets, valid


def parse(array: object, pattern: re.Pattern[str]) -> Stamps:
    """Parse a column of text by a pattern (FULL, DATE or TIME). Cells that do not fit are `bad`."""
    raw, offsets, valid = _bytes_of(array)
    count = len(offsets) - 1

    def zeros() -> Whole:
        return np.zeros(count, np.int64)

    unknown = np.full(count, UNKNOWN, np.int64)
    out = Stamps(unknown, zeros(), zeros(), zeros(), zeros(), zeros(), False, np.ones(count, np.bool_))
    lengths = np.where(valid, np.diff(offsets), 0)
    for length in np.unique(lengths):
        if length == 0 or length > 48:
            continue
        rows = np.flatnonzero(lengths == length)
        # in blocks, so that the letters of millions of stamps never stand side by side in memory
        for begin in range(0, len(rows), 1 << 18):
            some = rows[begin : begin + (1 << 18)]
            letters = raw[offsets[some][:, None] + np.arange(length)]
            _by_template(out, some, letters, pattern)
    return out


def _by_template(out: Stamps, rows: Whole, letters: NDArray[np.uint8], pattern: re.Pattern[str]) -> None:
    digit = (letters >= 48) & (letters <= 57)
    shape = np.where(digit, np.uint8(48), letters)
    left = np.ones(len(rows), bool)
    for _ in range(64):
        where = np.flatnonzero(left)
        if len(where) == 0:
            return
        same = left & (shape == shape[where[0]]).all(axis=1)
        left &= ~same
        example = letters[where[0]].tobytes().decode("utf-8", "replace")
        match = pattern.fullmatch(example)
        if match:
            _fill(out, rows[same], letters[same], match)
            out.forms.add(example)


def _fill(out: Stamps, rows: Whole, letters: NDArray[np.uint8], match: re.Match[str]) -> None:
    spans = {key: match.span(key) for key, value in match.groupdict().items() if value is not None}

    def number(*keys: str) -> Whole | None:
        for key in keys:
            if key in spans:
                start, end = spans[key]
                value = np.zeros(len(rows), np.int64)
                for place in range(start, end):
                    value = value * 10 + (letters[:, place].astype(np.int64) - 48)
                return value
        return None

    year = number("year", "year2", "year3", "year4", "year5", "year6", "year7")
    bad = np.zeros(len(rows), bool)
    if year is not None:
        key = next(k for k in ("year", "year2", "year3", "year4", "year5", "year6", "year7") if k in spans)
        if spans[key][1] - spans[key][0] == 2:
            year = year + np.where(year < 70, 2000, 1900)
        out.year[rows] = year
        month, day = number("month", "month6"), number("day", "day3", "day4", "day6")
        name = match.groupdict().get("name") or match.groupdict().get("name4")
        if name is not None:
            known = MONTHS.get(name.lower())
            if known is None:
                return
            month = np.full(len(rows), known, np.int64)
        if "yearday" in spans:
            of_year = number("yearday")
            assert of_year is not None
            out.days[rows] = days_of(year, np.ones_like(year), np.ones_like(year)) + of_year - 1
        elif "first" in spans or "first7" in spans:
            first, second = number("first", "first7"), number("second", "second7")
            assert first is not None
            assert second is not None
            out.first[rows], out.second[rows] = first, second
        else:
            assert month is not None
            assert day is not None
            # a date that is none leaves the time of day standing
            out.days[rows] = days_of(year, month, day)
    hour = number("hour", "hour2")
    if hour is not None:
        minute, second = number("minute", "minute2"), number("sec", "sec2")
        assert minute is not None
        seconds = second if second is not None else np.zeros(len(rows), np.int64)
        fraction = number("fraction", "fraction2")
        nano = np.zeros(len(rows), np.int64)
        if fraction is not None:
            start, end = spans["fraction" if "fraction" in spans else "fraction2"]
            nano = fraction * 10 ** (9 - (end - start))
        half = match.groupdict().get("half")
        if half:
            bad |= (hour < 1) | (hour > 12)
            hour = hour % 12 + (12 if half.lower() == "p" else 0)
        # 24:00:00 and a leap second are times; minute 60 is none
        bad |= (minute > 59) | (seconds > 60) | (hour > 24) | ((hour == 24) & (minute + seconds > 0))
        out.clock[rows] = ((hour * 60 + minute) * 60 + seconds) * SECOND + nano
    zone = match.groupdict().get("zone")
    if zone:
        out.zoned = True
        if zone[0] in "+-":
            start, end = spans["zone"]
            figures = [
                letters[:, place].astype(np.int64) - 48
                for place in range(start + 1, end)
                if chr(letters[0, place]) != ":"
            ]
            hours = figures[0] * 10 + figures[1] if len(figures) > 1 else figures[0]
            minutes = figures[2] * 10 + figures[3] if len(figures) > 3 else np.zeros(len(rows), np.int64)
            bad |= (hours > MOST_ZONE) | (minutes > 59)
            sign = -1 if zone[0] == "-" else 1
            out.shift[rows] = sign * (hours * 60 + minutes) * 60 * SECOND
    out.bad[rows] = bad


def date_order(first: Whole, second: Whole) -> str | None:
    """dmy or mdy, where numbers above 12 or a step of one day settle it; None where both stay possible."""
    if len(first) == 0:
        return None
    if first.max() > 12 and second.max() <= 12:
        return "dmy"
    if second.max() > 12 and first.max() <= 12:
        return "mdy"
    # a log that runs past midnight steps its day by one
    step_first, step_second = np.diff(first), np.diff(second)
    if (
        step_first.any()
        and not step_second.any()
        and set(np.unique(step_first[step_first != 0])) == {1}
        and np.count_nonzero(step_first) == 1
    ):
        return "dmy"
    if (
        step_second.any()
        and not step_first.any()
        and set(np.unique(step_second[step_second != 0])) == {1}
        and np.count_nonzero(step_second) == 1
    ):
        return "mdy"
    return None


def one_date(text: str) -> tuple[int | None, tuple[int, int, int] | None]:
    """One date in a fact: (days since 1970, None), or (None, (first, second, year)) while its order is open."""
    match = re.search(_DATE, text)
    if not match:
        return None, None
    part = {key: value for key, value in match.groupdict().items() if value is not None}

    def pick(*keys: str) -> int:
        return next((int(part[key]) for key in keys if key in part), 0)

    year = pick("year", "year2", "year3", "year4", "year5", "year6", "year7")
    year += (2000 if year < 70 else 1900) if year < 100 else 0
    if "first" in part or "first7" in part:
        first, second = pick("first", "first7"), pick("second", "second7")
        if first > 12 or second > 12 or first == second:
            day, month = (first, second) if second <= 12 else (second, first)
            found = int(days_of(np.array([year]), np.array([month]), np.array([day]))[0])
            return (found if found != UNKNOWN else None), None
        return None, (first, second, year)
    name = part.get("name") or part.get("name4")
    month = MONTHS.get(name.lower(), 0) if name else pick("month", "month6")
    if "yearday" in part:
        return int(days_of(np.array([year]), np.array([1]), np.array([1]))[0]) + int(part["yearday"]) - 1, None
    found = int(days_of(np.array([year]), np.array([month]), np.array([pick("day", "day3", "day4", "day6")]))[0])
    return (found if found != UNKNOWN else None), None


def zone_offset(text: str) -> float | None:
    """Seconds east of UTC that a zone's text says; None for one that is not fixed (a place's name)."""
    plain = text.strip().upper().replace(" ", "").replace("(", "").replace(")", "").replace("\u2212", "-")
    if plain in ("UTC", "Z", "GMT", "ZULU", "UT", "UTC+0", "UTC0", "UTCTIME", "COORDINATEDUNIVERSALTIME"):
        return 0.0
    match = re.fullmatch(r"(?:UTC|GMT)?([+-])(\d{1,2})(?::?(\d{2}))?(?::\d{2})?(?:H|HRS?|HOURS?)?", plain)
    if match:
        sign = -1.0 if match.group(1) == "-" else 1.0
        if int(match.group(2)) > MOST_ZONE:
            return None
        return sign * (int(match.group(2)) * 3600.0 + int(match.group(3) or 0) * 60.0)
    match = re.fullmatch(r"(\d{1,2}):(\d{2})", plain)
    if match:
        return int(match.group(1)) * 3600.0 + int(match.group(2)) * 60.0
    return None
