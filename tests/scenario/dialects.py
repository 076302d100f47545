"""Writes one truth in many recorder habits: text logs here, Parquet in `parquet_dialect`, the list in `habits`.

A truth is a plain set of arrays in SI at one base rate, with the rate at which each channel is kept. What `write`
returns says what a reader should find: the column of each quantity, its unit and whether the log tells it.
"""

from __future__ import annotations

import bz2
import gzip
import io
import zipfile
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta, timezone
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from scenario.air import Array
from scenario.flight import Flight
from scenario.sensors import Sensor, sample
from scenario.vocabulary import STATE_WORDS, Unit, name_of, spelled, suffix, unit_of


@dataclass(frozen=True, eq=False)
class Truth:
    """Channels in SI, each `(n,)` at `rate_hz`; `rates` says which are recorded more slowly than that."""

    rate_hz: float
    channels: dict[str, Array]
    rates: dict[str, float] = field(default_factory=dict)
    start: float | None = None  # seconds since 1970 UTC; None: no absolute clock can be written
    registration: str | None = None
    recorder_serial: str | None = None
    phase_s: float = 0.0  # of the first row, in the time of the flight that was sampled
    gaps: tuple[tuple[float, float], ...] = ()  # stretches of rows that were never written, s from the first row

    @property
    def count(self) -> int:
        return len(next(iter(self.channels.values())))

    @property
    def time(self) -> Array:
        return np.arange(self.count) / self.rate_hz

    def every(self, name: str) -> int:
        """One recorded value every so many rows."""
        return max(1, round(self.rate_hz / self.rates.get(name, self.rate_hz)))


def truth_from_flight(
    flight: Flight,
    names: list[str],
    rate_hz: float,
    *,
    rates: dict[str, float] | None = None,
    sensors: dict[str, Sensor] | None = None,
    start: float | None = None,
    phase_s: float = 0.0,
    seed: int = 1,
    end: float | None = None,
    **facts: object,
) -> Truth:
    """Sample a flight onto one base rate, each channel by its sensor (perfect where none is given)."""
    channels = {}
    for index, name in enumerate(names):
        given = (sensors or {}).get(name, Sensor())
        made = Sensor(rate_hz, phase_s, given.bias, given.noise, given.step, given.low, given.high, given.position,
                      given.dropouts, given.spikes)  # fmt: skip
        _, channels[name] = sample(flight, name, made, seed * 1000 + index, end=end)
    return Truth(rate_hz, channels, rates or {}, start, phase_s=phase_s, **facts)  # type: ignore[arg-type]


@dataclass(frozen=True, slots=True)
class Habit:
    """One recorder's way of writing. The comments list what each option may be."""

    id: str = "plain"
    delimiter: str = ","  # , ; tab | or space (columns padded to a width)
    decimal_comma: bool = False
    thousands: str = ""  # "", "," or "." or "'"
    quoting: str = "none"  # none, text, all
    encoding: str = "utf-8"  # utf-8, utf-8-sig, utf-16, latin-1
    newline: str = "\n"
    compression: str = ""  # "", gz, bz2, zst, zip
    preamble: str = "none"  # none, facts, hash, long
    header: str = "brackets"  # name, brackets, parens, suffix, two-line, three-line
    repeat_header: int = 0  # rows after which the header comes again
    vocabulary: str = "trade"  # trade, plain, upper, snake
    units: str = "trade"  # trade, metric, si, mixed
    spelling: str = "plain"  # plain, signs, words
    clock: str = "elapsed_s"  # see CLOCKS
    rates: str = "same"  # same, blanks, held, subframe
    missing: str = ""  # "", ---, n/a, NaN, -
    states: str = "number"  # number, words
    tail: str = "none"  # none, blank, junk, cut
    ragged: str = "none"  # none, trailing, short, long
    midnight: bool = False  # the flight crosses midnight UTC
    parquet: str = ""  # "" or s, ms, us, ns, elapsed: kind of the time column
    zone: str = "UTC"  # of Parquet stamps: "" (naive), UTC, +02:00
    numbers: str = "double"  # of Parquet: double, float, decimal, text
    row_group: int = 0
    names: tuple[tuple[str, str], ...] = ()  # a quantity's own column name, instead of the vocabulary's
    unit_metadata: bool = False  # of Parquet: units in the fields' metadata instead of the names

    @property
    def extension(self) -> str:
        if self.parquet:
            return ".parquet"
        return ".csv" + (f".{self.compression}" if self.compression else "")


CLOCKS = (
    "elapsed_s", "elapsed_ms", "elapsed_us", "epoch_s", "epoch_ms", "epoch_us", "epoch_ns", "iso_z", "iso_offset",
    "iso_space", "date_time_iso", "date_time_dmy", "date_time_mdy", "time_only", "frame", "coarse", "iso_coarse",
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Written:
    """What stands in the log: by quantity its column names (several in a sub-frame), unit, rate."""

    path: Path
    habit: Habit
    columns: dict[str, list[str]]
    units: dict[str, Unit]
    rates: dict[str, float]
    units_told: bool
    absolute: bool  # the clock gives date and time
    start: float | None  # of the first row, seconds since 1970
    rows: int
    last_row_cut: bool


def write(truth: Truth, path: Path | str, habit: Habit) -> Written:
    """Write a truth in a habit. The path is used as it is; `habit.extension` is the usual ending."""
    if habit.parquet:
        from scenario.parquet_dialect import write_parquet

        return write_parquet(truth, Path(path), habit)
    table, heading, columns, units, rates = _table(truth, habit)
    lines = _preamble(truth, habit)
    if habit.repeat_header:
        chunks = [table[i : i + habit.repeat_header] for i in range(0, len(table), habit.repeat_header)]
        body = [row for chunk in chunks for row in (*heading, *chunk)]
    else:
        body = [*heading, *table]
    lines += _joined(body, habit, len(heading))
    if habit.tail == "cut":
        lines[-1] = lines[-1][: max(3, len(lines[-1]) * 2 // 3)]
    text = habit.newline.join(lines) + ("" if habit.tail == "cut" else habit.newline)
    if habit.tail == "blank":
        text += habit.newline * 2
    if habit.tail == "junk":
        text += f"# END OF DATA{habit.newline}"
    _store(Path(path), text.encode(habit.encoding), habit.compression)
    absolute = habit.clock.startswith(("epoch", "iso", "date"))
    return Written(Path(path), habit, columns, units, rates, habit.header != "name", absolute,
                   start_of(truth, habit) if absolute else None, len(table), habit.tail == "cut")  # fmt: skip


def start_of(truth: Truth, habit: Habit) -> float:
    """The stamp of the first row; a habit that crosses midnight does so in the middle of the log."""
    start = truth.start if truth.start is not None else 1_937_640_000.0
    if not habit.midnight:
        return start
    half = round(truth.count / truth.rate_hz / 2.0)
    return float(np.floor(start / 86400.0) * 86400.0 + 86400.0 - half)


def _store(path: Path, data: bytes, compression: str) -> None:
    if compression == "gz":
        data = gzip.compress(data, mtime=0)
    elif compression == "bz2":
        data = bz2.compress(data)
    elif compression == "zst":
        import pyarrow

        data = pyarrow.Codec("zstd").compress(data, asbytes=True)
    elif compression == "zip":
        box = io.BytesIO()
        with zipfile.ZipFile(box, "w", zipfile.ZIP_DEFLATED) as packed:
            packed.writestr(zipfile.ZipInfo("log.csv", (2031, 5, 2, 0, 0, 0)), data)
        data = box.getvalue()
    path.write_bytes(data)


def _preamble(truth: Truth, habit: Habit) -> list[str]:
    if habit.preamble == "none":
        return []
    mark = "# " if habit.preamble == "hash" else ""
    facts = [("Registration", truth.registration), ("Recorder serial", truth.recorder_serial)]
    if habit.clock == "frame":
        per_second = 1.0 if habit.rates == "subframe" else truth.rate_hz
        facts.append(("Frame rate", f"{per_second:g} Hz"))
    lines = [f"{mark}{name}: {value}" for name, value in facts if value]
    if habit.preamble == "long":
        lines = [f"Setting {i:02d}: default" for i in range(24)] + lines + ["", "Recorded data"]
    return lines or [f"{mark}Recorder: invented"]


def _heading_cell(name: str, unit: str, habit: Habit) -> str:
    if habit.header == "brackets" and unit:
        return f"{name}[{unit}]" if habit.delimiter == " " else f"{name} [{unit}]"
    if habit.header == "parens" and unit:
        return f"{name}({unit})" if habit.delimiter == " " else f"{name} ({unit})"
    return name


def _table(
    truth: Truth, habit: Habit
) -> tuple[list[list[str]], list[list[str]], dict[str, list[str]], dict[str, Unit], dict[str, float]]:
    """Cells, heading rows, and what they mean."""
    per_row = round(truth.rate_hz) if habit.rates == "subframe" else 1
    rows = np.arange(0, truth.count - truth.count % per_row, per_row)
    keep = np.ones(len(rows), dtype=bool)
    for begin, finish in truth.gaps:
        stamps = rows / truth.rate_hz
        keep &= ~((stamps >= begin) & (stamps < finish))
    rows = rows[keep]
    names, unit_labels, cells = clock_columns(truth, habit, rows)
    columns: dict[str, list[str]] = {}
    units: dict[str, Unit] = {}
    rates: dict[str, float] = {}
    for quantity, values in truth.channels.items():
        unit = unit_of(quantity, habit.units)
        every = truth.every(quantity) if habit.rates != "same" else 1
        text = _cells(quantity, values, unit, habit)
        name = dict(habit.names).get(quantity) or name_of(quantity, habit.vocabulary)
        label = spelled(unit, habit.spelling)
        if habit.delimiter == " ":
            name = name.replace(" ", "_")
        tail = f"_{suffix(unit)}" if habit.header == "suffix" and unit.label else ""
        units[quantity], rates[quantity] = unit, truth.rate_hz / every
        if habit.rates == "subframe":
            inside = range(0, per_row, every)
            many = len(inside) > 1
            here = [f"{name}{k + 1}{tail}" if many else name + tail for k in range(len(inside))]
            columns[quantity] = [_heading_cell(one, label, habit) for one in here]
            names += here
            unit_labels += [label] * len(inside)
            cells += [[text[row + shift] for row in rows] for shift in inside]
            continue
        columns[quantity] = [_heading_cell(name + tail, label, habit)]
        names.append(name + tail)
        unit_labels.append(label)
        if habit.rates == "blanks":
            cells.append([text[row] if row % every == 0 else habit.missing for row in rows])
        elif habit.rates == "held":
            cells.append([text[row - row % every] for row in rows])
        else:
            cells.append([text[row] for row in rows])
    return _rows(cells, habit), _heading(names, unit_labels, habit), columns, units, rates


def _rows(cells: list[list[str]], habit: Habit) -> list[list[str]]:
    table = [list(row) for row in zip(*cells, strict=True)]
    if habit.ragged == "trailing":
        return [[*row, ""] for row in table]
    if habit.ragged == "short":  # empty cells at the end of a row are left off
        for row in table:
            while len(row) > 2 and row[-1] == habit.missing == "":
                row.pop()
    if habit.ragged == "long":  # now and then a stray cell at the end
        for row in table[50::97]:
            row.append("")
    return table


def _heading(names: list[str], units: list[str], habit: Habit) -> list[list[str]]:
    extra = [""] if habit.ragged == "trailing" else []
    if habit.header == "two-line":
        blank = "-" if habit.delimiter == " " else ""
        return [names + extra, [unit or blank for unit in units] + extra]
    if habit.header == "three-line":
        numbers = [f"ch{i:02d}" for i in range(len(names))]
        blank = "-" if habit.delimiter == " " else ""
        return [numbers + extra, names + extra, [unit or blank for unit in units] + extra]
    return [[_heading_cell(name, unit, habit) for name, unit in zip(names, units, strict=True)] + extra]


def _cells(quantity: str, values: Array, unit: Unit, habit: Habit) -> list[str]:
    words = STATE_WORDS.get(quantity) if habit.states == "words" else None
    written = (values - unit.offset) / unit.scale
    out = []
    for value in written.tolist():
        if value != value:
            out.append(habit.missing)
        elif words:
            out.append(words[int(value > 0.5)])
        else:
            out.append(number(value, unit.decimals, habit))
    return out


def number(value: float, decimals: int, habit: Habit) -> str:
    """A number as the habit writes it."""
    # one decimal more keeps a thousands mark from being taken for a decimal mark
    places = max(decimals, 1) if habit.thousands and abs(value) >= 999.5 else decimals
    text = f"{value:,.{places}f}" if habit.thousands else f"{value:.{places}f}"
    if float(text.replace(",", "")) == 0.0:
        text = text.lstrip("-")
    if habit.thousands or habit.decimal_comma:
        point = "," if habit.decimal_comma else "."
        text = text.replace(",", "\0").replace(".", point).replace("\0", habit.thousands)
    return text


def clock_columns(truth: Truth, habit: Habit, rows: NDArray[np.int64]) -> tuple[list[str], list[str], list[list[str]]]:
    """Names, units and cells of the time columns."""
    seconds = rows / truth.rate_hz
    start = start_of(truth, habit)
    micro = np.round((start + seconds) * 1e6).astype(np.int64)
    whole = habit.vocabulary in ("trade", "upper")
    name = "TIME" if whole else "time"
    clock = habit.clock
    if clock == "elapsed_s":
        return [name], ["s"], [[number(t, 3, habit) for t in seconds.tolist()]]
    if clock in ("elapsed_ms", "elapsed_us"):
        factor = 1e3 if clock.endswith("ms") else 1e6
        return [name], [clock[-2:]], [[str(t) for t in np.round(seconds * factor).astype(np.int64).tolist()]]
    if clock == "epoch_s":
        mark = "," if habit.decimal_comma else "."
        return ["epoch"], ["s"], [[f"{t // 1_000_000}{mark}{t % 1_000_000 // 1000:03d}" for t in micro.tolist()]]
    if clock.startswith("epoch"):
        factor = {"ms": 1000, "us": 1, "ns": 0}[clock[-2:]]
        values = micro * 1000 if factor == 0 else micro // factor
        return ["epoch"], [clock[-2:]], [[str(t) for t in values.tolist()]]
    if clock == "frame":
        counts = np.round(rows / (1 if habit.rates != "subframe" else truth.rate_hz)).astype(int)
        return ["FRAME" if whole else "frame"], [""], [[str(count) for count in counts.tolist()]]
    return _stamps(clock, micro, whole)


def _stamps(clock: str, micro: NDArray[np.int64], whole: bool) -> tuple[list[str], list[str], list[list[str]]]:
    moments = [datetime(1970, 1, 1, tzinfo=UTC) + timedelta(microseconds=t) for t in micro.tolist()]
    if clock.startswith("iso"):
        zone = timezone(timedelta(hours=2)) if clock == "iso_offset" else UTC
        spec = "seconds" if clock == "iso_coarse" else "milliseconds"
        gap = " " if clock == "iso_space" else "T"
        text = [m.astimezone(zone).isoformat(gap, spec).replace("+00:00", "" if gap == " " else "Z") for m in moments]
        return ["UTC" if whole else "utc"], [""], [text]
    fine = [f"{m:%H:%M:%S}.{m.microsecond // 1000:03d}" for m in moments]
    if clock in ("time_only", "coarse"):
        text = fine if clock == "time_only" else [f"{m:%H:%M:%S}" for m in moments]
        return ["TIME" if whole else "time"], [""], [text]
    form = {"date_time_iso": "%Y-%m-%d", "date_time_dmy": "%d.%m.%Y", "date_time_mdy": "%m/%d/%Y"}[clock]
    names = ["DATE", "TIME"] if whole else ["date", "time"]
    return names, ["", ""], [[format(m, form) for m in moments], fine]


def _joined(body: list[list[str]], habit: Habit, heading_rows: int) -> list[str]:
    if habit.delimiter == " ":
        width = max(len(cell) for row in body for cell in row) + 2
        return ["".join(cell.rjust(width) for cell in row) for row in body]
    if habit.quoting == "all":
        body = [[f'"{cell}"' for cell in row] for row in body]
    elif habit.quoting == "text":
        body = [[cell if _numeric(cell) else f'"{cell}"' for cell in row] for row in body]
    return [habit.delimiter.join(row) for row in body]


def _numeric(cell: str) -> bool:
    return cell == "" or cell.lstrip("-")[:1].isdigit()
