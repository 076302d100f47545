"""Our physics agrees with every published check value that it can compute, and every other row is listed."""

from __future__ import annotations

import csv
import dataclasses
import math
from importlib import resources

import pytest

from exceed.reference import check
from exceed.reference.computed import COMPUTED
from exceed.reference.rows import FILES, Row, all_rows, parse_inputs

ROWS = list(all_rows())
ASSERTED = [row for row in ROWS if check.reason_not_computed(row) is None]


@pytest.mark.parametrize("row", ASSERTED, ids=lambda row: row.id)
def test_our_answer_is_the_published_one(row: Row) -> None:
    result = check.check(row)
    assert result.passed, (
        f"{result.id} {result.quantity}: expected {result.expected} +- {result.tolerance} {result.unit},"
        f" got {result.got} ({result.source}; {result.how})"
    )


def test_every_row_of_every_file_is_either_asserted_or_listed_with_a_reason() -> None:
    in_files = []
    for file in FILES:
        text = resources.files("exceed.reference").joinpath(f"{file}.csv").read_text(encoding="utf-8")
        in_files += [record["id"] for record in csv.DictReader(text.splitlines())]
    asserted = [result.id for result in check.run_checks()]
    listed = [row.id for row in check.stated_rows()]
    assert sorted(asserted + listed) == sorted(in_files)
    assert len(set(in_files)) == len(in_files)
    assert all(row.reason for row in check.stated_rows())


def test_no_csv_of_the_package_is_left_out() -> None:
    present = {
        entry.name[:-4] for entry in resources.files("exceed.reference").iterdir() if entry.name.endswith(".csv")
    }
    assert present == set(FILES)


def test_the_counts_are_what_the_readme_of_a_release_would_say() -> None:
    """Pinned, so that a change of the reason table cannot quietly take rows out of the comparison."""
    assert (len(check.run_checks()), len(check.stated_rows())) == (1283, 171)


def test_no_quantity_is_both_computed_and_stated_and_no_entry_is_dead() -> None:
    quantities = {row.quantity for row in ROWS if row.file != "events"}
    assert not set(COMPUTED) & (set(check.STATED) - {"interval", "resolution"})
    assert set(COMPUTED) | set(check.STATED) == quantities


@pytest.mark.parametrize("row", [row for row in ASSERTED if row.quantity not in ("peaks_between_means",)][::7])
def test_a_figure_moved_by_three_tolerances_is_caught(row: Row) -> None:
    try:
        value = float(row.expected)
    except ValueError:
        moved = dataclasses.replace(row, expected=row.expected + "x")
    else:
        shift = 3.0 * float(row.tolerance) + 1e-8 * max(1.0, abs(value))
        moved = dataclasses.replace(row, expected=repr(value + shift))
        lower = dataclasses.replace(row, expected=repr(value - shift))
        assert not check.check(lower).passed
    assert not check.check(moved).passed


def test_a_quantity_that_nobody_knows_raises_instead_of_passing() -> None:
    row = dataclasses.replace(ASSERTED[0], quantity="no such thing")
    with pytest.raises(KeyError):
        check.check(row)


def test_a_nan_answer_does_not_pass() -> None:
    row = next(row for row in ASSERTED if row.quantity == "load_factor_from_bank")
    beyond = dataclasses.replace(row, inputs={"bank_deg": 89.0})
    result = check.check(beyond)
    assert not result.passed
    assert math.isnan(result.deviation)


def test_inputs_are_parsed_into_numbers_words_and_lists() -> None:
    assert parse_inputs("a=1.5;b=two;history=1,2") == {"a": 1.5, "b": "two", "history": "1,2"}
    assert parse_inputs("") == {}
