"""The check values as rows, read from the CSV files of this package."""

from __future__ import annotations

import csv
from collections.abc import Iterator
from dataclasses import dataclass
from importlib import resources

FILES = (
    "atmosphere",
    "airspeed",
    "load_factor_turn",
    "limits",
    "gust",
    "kinematics",
    "counting",
    "certainty",
    "mass_balance",
    "recorder",
    "events",
)

# inputs that are lists of numbers or of pairs, kept as text
_LISTS = frozenset({"history", "series", "items", "n_over_N"})

Inputs = dict[str, float | str]


@dataclass(frozen=True, slots=True)
class Row:
    """One check value: `inputs` by name, as numbers where they are; `expected`, `tolerance` as the file has them."""

    file: str
    id: str
    quantity: str
    inputs: Inputs
    expected: str
    unit: str
    tolerance: str
    source: str
    how: str
    note: str


def parse_inputs(text: str) -> Inputs:
    """`a=1;b=two` as a dict; numbers become float, lists and words stay text."""
    inputs: Inputs = {}
    for pair in filter(None, text.split(";")):
        name, _, value = pair.partition("=")
        try:
            inputs[name] = value if name in _LISTS else float(value)
        except ValueError:
            inputs[name] = value
    return inputs


def rows(file: str) -> Iterator[Row]:
    """The rows of one file of FILES, in its order."""
    text = resources.files("exceed.reference").joinpath(f"{file}.csv").read_text(encoding="utf-8")
    for record in csv.DictReader(text.splitlines()):
        # the event families have free text in `inputs`, and nothing to compute
        inputs = {} if file == "events" else parse_inputs(record["inputs"])
        yield Row(
            file,
            record["id"],
            record["quantity"],
            inputs,
            record["expected"],
            record["unit"],
            record["tolerance"],
            record["source"],
            record["how"],
            record["note"],
        )


def all_rows() -> Iterator[Row]:
    """Every row of every file."""
    for file in FILES:
        yield from rows(file)
