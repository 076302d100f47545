"""Totals and trends: hours counted once, rates with exact bounds."""

from __future__ import annotations

from datetime import timedelta

import pytest
from scipy.stats import poisson

from exceed.ledger import acts, history
from exceed.ledger.history import Filters
from exceed.ledger.record import record
from exceed.ledger.store import open_ledger
from exceed.ledger.totals import totals, union
from exceed.ledger.trends import poisson_bounds, trends
from ledger.days import DAY, event, flight, recording, summary


@pytest.fixture
def book(tmp_path):
    with open_ledger(f"sqlite:///{tmp_path / 'ledger.sqlite'}", create=True) as opened:
        yield opened


# two-sided 95 % limits of a Poisson mean as handbooks of statistics and of epidemiology print them; from memory
@pytest.mark.parametrize(
    ("count", "low", "high"), [(0, 0.0, 3.689), (1, 0.0253, 5.572), (5, 1.623, 11.668), (10, 4.795, 18.390)]
)
def test_poisson_bounds_are_the_published_ones(count, low, high):
    assert poisson_bounds(count) == pytest.approx((low, high), abs=5e-4)


@pytest.mark.parametrize("count", [0, 1, 2, 7, 40, 400])
@pytest.mark.parametrize("confidence", [0.5, 0.9, 0.95, 0.99])
def test_poisson_bounds_leave_just_the_tails_by_the_definition(count, confidence):
    # Garwood's definition, by the distribution itself instead of chi-squared
    low, high = poisson_bounds(count, confidence)
    tail = (1.0 - confidence) / 2.0
    assert poisson.cdf(count, high) == pytest.approx(tail, rel=1e-6)
    if count:
        assert poisson.sf(count - 1, low) == pytest.approx(tail, rel=1e-6)
    else:
        assert low == 0.0


@pytest.mark.parametrize(("count", "confidence"), [(-1, 0.95), (1, 0.0), (1, 1.0)])
def test_poisson_bounds_of_nonsense_are_refused(count, confidence):
    with pytest.raises(ValueError, match="not negative"):
        poisson_bounds(count, confidence)


def test_union_counts_time_once():
    assert union([(5.0, 6.0), (0.0, 2.0), (1.0, 3.0), (3.0, 4.0), (5.2, 5.3)]) == [(0.0, 4.0), (5.0, 6.0)]


def test_times_beyond_limits_add_up_without_what_was_decided_away(book):
    rows = [event(100.0, 101.0), event(200.0, 200.5), event(300.0, 310.0), event(400.0, 402.0, rule="never-exceed")]
    record(book, summary(recording("a.csv", events=rows, undecided=[event(500.0, 501.0)])))
    longest = max(book.reading(lambda table: history.events(table, Filters()))[0], key=lambda row: row["duration_s"])
    acts.decide(book, longest["id"], "sensor-fault", "A. Miller", None)
    (row,) = book.reading(lambda table: totals(table, Filters()))
    assert row["beyond"] == [
        {"rule": "load-factor-high", "events": 2, "seconds": 1.5},
        {"rule": "never-exceed", "events": 1, "seconds": 2.0},
    ]
    assert (row["events"]["caution"], row["undecided"], row["decided_away"], row["open"]) == (3, 1, 1, 4)


def test_trends_give_each_month_its_flights_hours_and_rates(book):
    may = [recording(f"may{turn}.csv", day=DAY + timedelta(days=turn), flights=[flight(0.0, 1800.0)],
                     events=[event(10.0, 11.0)] if turn < 2 else []) for turn in range(4)]  # fmt: skip
    july = recording("july.csv", day=DAY + timedelta(days=70), flights=[flight(0.0, 3600.0)])
    record(book, summary(*may, july, recording("u.csv", start=None, flights=[flight(0.0, 900.0)])))
    rows = {row["period"]: row for row in book.reading(lambda table: trends(table, Filters()))}
    assert list(rows) == ["2031-05", "2031-06", "2031-07", "undated", "all"]
    assert (rows["2031-05"]["events"], rows["2031-05"]["flights"], rows["2031-05"]["hours"]) == (2, 4, 2.0)
    low, high = poisson_bounds(2)
    assert rows["2031-05"]["per_1000_flights"] == pytest.approx(
        {"value": 500.0, "low": low * 250.0, "high": high * 250.0}, abs=1e-3
    )
    assert rows["2031-05"]["per_1000_hours"]["value"] == 1000.0
    assert rows["2031-06"]["per_1000_flights"] is None  # nothing was flown: no rate, and not zero
    assert rows["2031-07"]["per_1000_flights"]["low"] == 0.0
    assert rows["2031-07"]["per_1000_flights"]["high"] == pytest.approx(3688.879, abs=0.001)
    assert (rows["all"]["events"], rows["all"]["flights"], rows["all"]["hours"]) == (2, 6, 3.25)


def test_trends_leave_out_what_was_decided_to_be_none_and_count_it(book):
    record(book, summary(recording("a.csv", events=[event(10.0, 11.0), event(20.0, 21.0)])))
    acts.decide(book, book.reading(lambda table: history.events(table, Filters()))[0][0]["id"], "wrong-data", "A", None)
    (month, everything) = book.reading(lambda table: trends(table, Filters()))
    assert (month["events"], month["decided_away"]) == (1, 1)
    assert everything["period"] == "all"


def test_an_empty_ledger_has_lists_all_the_same(book):
    assert book.reading(lambda table: totals(table, Filters())) == []
    assert [row["period"] for row in book.reading(lambda table: trends(table, Filters()))] == ["all"]
