"""HABITS: text habits that together meet every allowed pair of options where they can, and a dozen Parquet ones."""

from __future__ import annotations

import random
from dataclasses import asdict
from itertools import combinations

from scenario.dialects import CLOCKS, Habit

OPTIONS: dict[str, tuple[object, ...]] = {
    "delimiter": (",", ";", "\t", "|", " "),
    "decimal_comma": (False, True),
    "thousands": ("", "", ",", ".", "'"),
    "quoting": ("none", "text", "all"),
    "encoding": ("utf-8", "utf-8-sig", "utf-16", "latin-1"),
    "newline": ("\n", "\r\n", "\r"),
    "compression": ("", "gz", "bz2", "zst", "zip"),
    "preamble": ("none", "facts", "hash", "long"),
    "header": ("name", "brackets", "parens", "suffix", "two-line", "three-line"),
    "repeat_header": (0, 0, 200),
    "vocabulary": ("trade", "plain", "upper", "snake"),
    "units": ("trade", "metric", "si", "mixed"),
    "spelling": ("plain", "signs", "words"),
    "clock": CLOCKS,
    "rates": ("same", "blanks", "held", "subframe"),
    "missing": ("", "---", "n/a", "NaN", "-"),
    "states": ("number", "words"),
    "tail": ("none", "blank", "junk", "cut"),
    "ragged": ("none", "trailing", "short", "long"),
    "midnight": (False, True),
}


def allowed(habit: Habit) -> bool:
    """Whether a combination can be read back at all: no reader could settle the ones that this refuses."""
    padded = habit.delimiter == " "
    clash = habit.decimal_comma and habit.delimiter == "," and habit.quoting != "all"
    mark = "," if habit.decimal_comma else "."
    return not any((
        clash,
        habit.thousands == mark,
        habit.thousands == "," and habit.delimiter == "," and habit.quoting != "all",
        padded and (habit.missing == "" or habit.quoting != "none" or habit.ragged != "none"),
        padded and (habit.clock == "iso_space" or habit.vocabulary == "plain"),
        padded and habit.header == "three-line",
        habit.clock == "frame" and habit.preamble == "none",
        habit.rates == "subframe" and habit.clock in ("coarse", "iso_coarse"),
        habit.header == "suffix" and habit.vocabulary != "snake",
        # without units only the trade's own can be presumed
        habit.header == "name" and (habit.units != "trade" or habit.spelling != "plain"),
        habit.header == "name" and habit.clock in ("elapsed_ms", "elapsed_us"),
        habit.midnight and habit.clock.startswith(("elapsed", "frame")),
        habit.ragged == "short" and habit.missing != "",
        habit.repeat_header and habit.header == "three-line",
    ))  # fmt: skip


def _pairs(values: dict[str, object]) -> set[tuple[str, object, str, object]]:
    return {(a, values[a], b, values[b]) for a, b in combinations(OPTIONS, 2)}


def _text_habits(count: int) -> list[Habit]:
    """Greedy: of some random allowed combinations take the one that shows most pairs not yet seen (seeded)."""
    rng = random.Random(20310502)
    seen: set[tuple[str, object, str, object]] = set()
    made: list[Habit] = []
    while len(made) < count:
        candidates: list[dict[str, object]] = []
        while len(candidates) < 25:
            values = {name: rng.choice(options) for name, options in OPTIONS.items()}
            if allowed(Habit(**values)):  # type: ignore[arg-type]
                candidates.append(values)
        best = max(candidates, key=lambda values: len(_pairs(values) - seen))
        seen |= _pairs(best)
        delimiter = {",": "comma", ";": "semicolon", "\t": "tab", "|": "pipe", " ": "padded"}[str(best["delimiter"])]
        name = f"t{len(made):02d}-{delimiter}-{best['encoding']}-{best['clock']}-{best['rates']}-{best['header']}"
        made.append(Habit(**{**best, "id": name}))  # type: ignore[arg-type]
    return made


PLAIN = Habit(id="plain")

PARQUET = [
    Habit(id="p00-utc-ms", parquet="ms"),
    Habit(id="p01-utc-us-metadata", parquet="us", unit_metadata=True, units="metric"),
    Habit(id="p02-naive-ns-snake", parquet="ns", zone="", vocabulary="snake", header="suffix"),
    Habit(id="p03-offset-us-si", parquet="us", zone="+02:00", units="si", vocabulary="upper", unit_metadata=True),
    Habit(id="p04-elapsed-si-upper", parquet="elapsed", units="si", vocabulary="upper"),
    Habit(id="p05-elapsed-metadata", parquet="elapsed", vocabulary="plain", unit_metadata=True, spelling="signs"),
    Habit(id="p06-decimals", parquet="ms", numbers="decimal", vocabulary="snake", header="suffix", units="mixed"),
    Habit(id="p07-words-dictionary", parquet="ms", states="words", vocabulary="plain", units="mixed"),
    Habit(id="p08-row-groups", parquet="us", row_group=500, numbers="float"),
    Habit(id="p09-blanks", parquet="ms", rates="blanks", unit_metadata=True, states="words", vocabulary="upper"),
    Habit(id="p10-coarse-stamps", parquet="s", rates="held", units="metric", spelling="words"),
    Habit(id="p11-numbers-as-text", parquet="ms", numbers="text", vocabulary="plain", spelling="words"),
    Habit(id="p12-midnight", parquet="ms", midnight=True, units="mixed", spelling="signs"),
]

HABITS: list[Habit] = [PLAIN, *_text_habits(64), *PARQUET]


def described(habit: Habit) -> str:
    """The options of a habit that differ from the plain one, for a failure's message."""
    plain = asdict(Habit())
    return ", ".join(f"{k}={v!r}" for k, v in asdict(habit).items() if k != "id" and v != plain[k])
