"""When two stretches are the same: against the obvious loop, and downloads that overlap in any way and order."""

from __future__ import annotations

import tempfile
import threading
from pathlib import Path

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from exceed.ledger import history, stretch
from exceed.ledger.history import Filters
from exceed.ledger.record import record
from exceed.ledger.store import open_ledger
from exceed.ledger.totals import flight_list, totals
from ledger import writer
from ledger.days import event, flight, recording, summary

TIMES = st.integers(0, 60).map(lambda tenth: tenth / 10.0)


@st.composite
def occurrences(draw):
    start = draw(st.one_of(st.none(), TIMES))
    length = draw(st.sampled_from([0.0, 0.001, 0.5, 3.0]))
    return {
        "rule": draw(st.sampled_from(["a", "b"])), "part": draw(st.sampled_from(["", "1"])),
        "start_s": start or 0.0, "end_s": (start or 0.0) + length,
        "start_at": start, "end_at": None if start is None else start + length,
    }  # fmt: skip


@settings(deadline=None, max_examples=150)
@given(st.lists(occurrences(), max_size=25), occurrences(), st.booleans())
def test_occurrences_are_found_as_by_looking_at_each(rows, one, same_recording):
    rows = [{**row, "id": turn} for turn, row in enumerate(rows)]
    found = stretch.Occurrences(rows, "_s" if same_recording else "_at").of(one)
    obvious = [row for row in rows if stretch.same_occurrence(one, row, same_recording=same_recording)]
    assert [row["id"] for row in found] == [row["id"] for row in obvious]


# eight flights of 20 min, one an hour, each with one event ten minutes after take-off
FLIGHTS = 8
RANGES = st.tuples(st.integers(0, FLIGHTS - 1), st.integers(1, FLIGHTS)).map(
    lambda pair: (pair[0], min(sum(pair), FLIGHTS))
)
DOWNLOADS = st.lists(RANGES, min_size=1, max_size=6)


def download(first: int, last: int):
    """What a recorder gives that still holds the flights from `first` up to `last`; times count from its beginning."""
    rows, found = [], []
    for number, turn in enumerate(range(first, last), 1):
        start = (turn - first) * 3600.0 + 300.0
        rows.append(flight(start, start + 1200.0, number))
        found.append(event(start + 600.0, start + 601.0, flight=number))
    return recording(
        f"{first}-{last}.csv", start=first * 3600.0, length=(last - first) * 3600.0, flights=rows, events=found
    )


@settings(deadline=None, max_examples=12)
@given(DOWNLOADS)
@example([(0, 8), (0, 8), (3, 5)])
@example([(3, 5), (0, 8)])
@example([(0, 4), (2, 6), (5, 8), (0, 8)])
def test_downloads_that_overlap_in_any_way_and_order_show_each_flight_and_event_once(downloads):
    covered = {turn for first, last in downloads for turn in range(first, last)}
    with (
        tempfile.TemporaryDirectory() as folder,
        open_ledger(f"sqlite:///{Path(folder) / 'ledger.sqlite'}", create=True) as book,
    ):
        for first, last in downloads:
            record(book, summary(download(first, last)))
        flights = book.reading(lambda table: flight_list(table, Filters()))
        assert [row["start"][11:16] for row in flights] == [f"{turn:02d}:05" for turn in sorted(covered)]
        events, _ = book.reading(lambda table: history.events(table, Filters()))
        assert [row["start"][11:16] for row in events] == [f"{turn:02d}:15" for turn in sorted(covered)]
        (total,) = book.reading(lambda table: totals(table, Filters()))
        assert total["flight_h"] == pytest.approx(len(covered) / 3.0, abs=1e-3)
        assert total["landings"] == len(covered)


def test_writers_at_once_take_turns_on_either_database(place):
    problems: list[BaseException] = []

    def work(stem: str) -> None:
        try:
            for turn in range(4):
                for name in (f"{stem}-{turn}.csv", f"same-{turn}.csv"):
                    with open_ledger(place, create=True) as book:
                        record(book, writer.scan(name, turn + 100.0 * "abcs".index(name[0])))
        except BaseException as error:
            problems.append(error)

    crowd = [threading.Thread(target=work, args=(stem,)) for stem in "abc"]
    for one in crowd:
        one.start()
    for one in crowd:
        one.join()
    assert problems == []
    with open_ledger(place) as book:
        paths = book.reading(
            lambda table: [row["path"] for row in table.rows("SELECT path FROM recordings ORDER BY path")]
        )
        rows, _ = book.reading(lambda table: history.events(table, Filters()))
    assert paths == sorted(f"{stem}-{turn}.csv" for stem in ("a", "b", "c", "same") for turn in range(4))
    assert len(rows) == 16 * writer.EVENTS


@pytest.mark.parametrize(
    ("one", "other"), [("ZZ-NMA", "zznma"), ("zz nma", "ZZNMA"), ("D-É12", "dé12"), (None, ""), ("-", None)]
)
def test_registrations_compare_by_letters_and_digits(one, other):
    assert stretch.registration_key(one) == stretch.registration_key(other)


RULES = ("load-factor-high", "never-exceed")
FOUND = st.tuples(st.sampled_from(RULES), st.sampled_from([100.0, 300.0]), st.sampled_from(["caution", "warning"]))
JUDGEMENTS = st.tuples(
    st.sampled_from([RULES, RULES[:1], RULES[1:]]),  # rules applied
    st.sampled_from([(), RULES[:1]]),  # of these, not assessed
    st.lists(FOUND, max_size=3, unique_by=lambda row: row[:2]),
    st.sampled_from(["rules 1", "rules 2"]),
)


def judged(judgement):
    applied, lost, rows, rules = judgement
    able = [rule for rule in applied if rule not in lost]
    events = [event(start, start + 1.0, rule=rule, severity=severity) for rule, start, severity in rows if rule in able]
    return able, summary(recording("a.csv", events=events, rules=applied, unassessed=lost), rules=f"{rules} {applied}")


@settings(deadline=None, max_examples=25)
@given(st.lists(JUDGEMENTS, min_size=1, max_size=6))
@example([(RULES, (), [(RULES[0], 100.0, "caution")], "1"), (RULES[:1], (), [], "1"),
          (RULES, (), [(RULES[0], 100.0, "caution")], "1")])  # fmt: skip
def test_what_stands_is_what_the_newest_judgement_that_could_assess_a_rule_found(judgements):
    stands: dict[str, list[tuple[float, str]]] = {}
    with (
        tempfile.TemporaryDirectory() as folder,
        open_ledger(f"sqlite:///{Path(folder) / 'ledger.sqlite'}", create=True) as book,
    ):
        for judgement in judgements:
            able, made = judged(judgement)
            record(book, made)
            assert record(book, made)["scan"] is None
            for rule in able:
                found = [row for row in made["recordings"][0]["events"] if row["rule"] == rule]
                stands[rule] = sorted((row["start_s"], row["severity"]) for row in found)
        events, _ = book.reading(lambda table: history.events(table, Filters()))
        for rule, expected in stands.items():
            assert sorted((row["start_s"], row["severity"]) for row in events if row["rule"] == rule) == expected
        assert {row["rule"] for row in events} <= set(stands)
