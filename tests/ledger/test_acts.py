"""What people add: decisions, closings, reassignments, totals, blanked names; every act is a row, none is lost."""

from __future__ import annotations

import contextlib
import sqlite3
from datetime import timedelta

import pytest

from exceed.errors import ExceedError, UsageError
from exceed.ledger import acts, history
from exceed.ledger.history import Filters
from exceed.ledger.inspections import inspections, resolve
from exceed.ledger.record import record
from exceed.ledger.totals import Airframe, Flown, flight_list, totals
from ledger.days import DAY, TASK, event, flight, recording, summary

NINE = DAY.timestamp() + 9 * 3600.0
NOW = NINE + 86400.0


def all_events(book, **filters):
    return book.reading(lambda table: history.events(table, Filters(**filters)))[0]


def work(book, **filters):
    return book.reading(lambda table: inspections(table, Filters(**filters), NOW))


def sortie(path="a.csv", **extra):
    return recording(path, flights=[flight(100.0, 3700.0)], events=[event(812.13, 812.94)], **extra)


def test_an_inspection_is_due_until_somebody_closes_it(book):
    record(book, summary(sortie()))
    (due,) = work(book)
    assert due["status"] == "due"
    assert (due["task"], due["closed_by"], due["reference"]) == (TASK, None, None)
    assert due["events"] == [all_events(book)[0]["id"]]
    acts.close(book, due["id"][:6], "R. Singh", "work order 31-204")
    (closed,) = work(book)
    assert (closed["status"], closed["closed_by"], closed["reference"]) == ("closed", "R. Singh", "work order 31-204")
    with pytest.raises(UsageError, match="is closed already"):
        acts.close(book, due["id"], "R. Singh", "again")
    acts.reopen(book, due["id"], "R. Singh", "wrong wing")
    assert work(book)[0]["status"] == "due"
    assert book.reading(lambda table: table.rows("SELECT kind FROM inspection_acts ORDER BY id")) == [
        {"kind": "close"}, {"kind": "reopen"},
    ]  # fmt: skip
    with pytest.raises(UsageError, match="is open"):
        acts.reopen(book, due["id"], "R. Singh", None)


def test_a_rescan_neither_doubles_nor_reopens_a_closed_inspection(book):
    record(book, summary(sortie()))
    acts.close(book, work(book)[0]["id"], "R. Singh", "31-204")
    record(book, summary(sortie()))
    record(book, summary(sortie(), rules="rules 2"))
    assert [row["status"] for row in work(book)] == ["closed"]


def test_a_new_event_after_the_closing_asks_for_a_new_inspection(book):
    record(book, summary(sortie()))
    acts.close(book, work(book)[0]["id"], "R. Singh", "31-204")
    afternoon = recording("b.csv", start=15 * 3600.0, events=[event(812.0, 813.0)])
    record(book, summary(sortie(), afternoon))
    assert sorted(row["status"] for row in work(book)) == ["closed", "due"]


def test_what_is_judged_worse_than_what_was_inspected_is_to_be_decided(book):
    record(book, summary(sortie()))
    acts.close(book, work(book)[0]["id"], "R. Singh", "31-204")
    worse = recording("a.csv", flights=[flight(100.0, 3700.0)], events=[event(812.13, 812.94, severity="warning")])
    record(book, summary(worse, rules="rules 2"))
    (row,) = work(book)
    assert row["status"] == "to_be_decided"
    assert "worse than what was inspected" in row["notes"][0]
    acts.close(book, row["id"], "R. Singh", "31-205")
    assert work(book)[0]["status"] == "closed"


def test_an_inspection_whose_events_a_newer_judgement_no_longer_finds_waits_for_a_person(book):
    record(book, summary(sortie()))
    record(book, summary(recording("a.csv", flights=[flight(100.0, 3700.0)]), rules="rules 2"))
    (row,) = work(book)
    assert row["status"] == "to_be_decided"
    assert "no longer finds" in row["notes"][0]


def test_deciding_that_it_was_no_exceedance_closes_nothing_but_asks_for_a_decision(book):
    record(book, summary(sortie()))
    acts.decide(book, all_events(book)[0]["id"], "sensor-fault", "A. Miller", None)
    (row,) = work(book)
    assert row["status"] == "to_be_decided"
    assert "were decided to be no exceedance" in row["notes"][0]
    acts.decide(book, all_events(book)[0]["id"], "agreed", "A. Miller", "it was real")
    assert work(book)[0]["status"] == "due"


def test_the_newest_decision_holds_and_the_older_ones_stay(book):
    record(book, summary(sortie()))
    name = all_events(book)[0]["id"]
    acts.decide(book, name, "agreed", "A. Miller", "first")
    done = acts.decide(book, name[:5], "wrong-data", "B. Smith", "second")
    assert done["earlier"]["as"] == "agreed"
    decision = all_events(book)[0]["decision"]
    assert (decision["as"], decision["by"], decision["note"], decision["carried"]) == (
        "wrong-data", "B. Smith", "second", False,
    )  # fmt: skip
    assert book.reading(lambda table: table.one("SELECT count(*) AS n FROM decisions"))["n"] == 2


@pytest.mark.parametrize(
    ("name", "problem"),
    [("ffffffffffff", "there is no such event"), ("ab", "is no event"), ("%%%%", "is no event"), ("", "is no event")],
)
def test_an_event_that_is_not_there_is_said_with_what_lists_them(book, name, problem):
    record(book, summary(sortie()))
    with pytest.raises(UsageError, match=problem) as told:
        acts.decide(book, name, "agreed", "A. Miller", None)
    assert "exceed ledger events" in str(told.value)


def test_reassigning_a_flight_takes_its_events_decisions_and_duties_along(book):
    record(book, summary(sortie()))
    name = all_events(book)[0]["id"]
    acts.decide(book, name, "agreed", "A. Miller", None)
    acts.close(book, work(book)[0]["id"], "R. Singh", "31-204")
    (before,) = book.reading(lambda table: flight_list(table, Filters()))
    done = acts.reassign(book, before["id"], "ZZ-NMC")
    assert done["from"] == "ZZ-NMA"
    (moved,) = all_events(book)
    assert (moved["registration"], moved["recorded_as"]) == ("ZZ-NMC", "ZZ-NMA")
    assert moved["decision"]["as"] == "agreed"
    rows = {row["registration"]: row for row in work(book)}
    assert rows["ZZ-NMC"]["status"] == "due"  # it was closed on another aeroplane
    assert rows["ZZ-NMA"]["status"] == "closed"
    # scanning the log again, which still names the old registration, changes nothing
    assert record(book, summary(sortie()))["scan"] is None
    assert record(book, summary(sortie("other.csv", content="other")))["flights"]["known"] == 1
    assert [row["registration"] for row in all_events(book)] == ["ZZ-NMC"]
    with pytest.raises(UsageError, match="already"):
        acts.reassign(book, before["id"], "zznmc")


def test_what_a_reassigned_flight_asks_for_later_is_asked_of_its_new_owner(book):
    record(book, summary(sortie()))
    acts.reassign(book, book.reading(lambda table: flight_list(table, Filters()))[0]["id"], "ZZ-NMC")
    more = recording("a.csv", flights=[flight(100.0, 3700.0)], events=[
        event(812.13, 812.94), event(2000.0, 2001.0),
        event(3000.0, 3001.0, rule="never-exceed", task="Overspeed inspection"),
    ])  # fmt: skip
    record(book, summary(more, rules="rules 2"))
    rows = [row for row in work(book) if row["status"] == "due"]
    assert {(row["registration"], row["task"], len(row["events"])) for row in rows} == {
        ("ZZ-NMC", TASK, 2), ("ZZ-NMC", "Overspeed inspection", 1),
    }  # fmt: skip


def test_of_one_duty_for_two_flights_each_owner_gets_its_part(book):
    def morning_and_noon(*more):
        return recording(
            "day.csv", length=12000.0, flights=[flight(100.0, 3700.0, 1), flight(8000.0, 9800.0, 2)],
            events=[event(812.0, 813.0), event(8100.0, 8101.0, flight=2), *more],
        )  # fmt: skip

    record(book, summary(morning_and_noon()))
    acts.reassign(book, book.reading(lambda table: flight_list(table, Filters()))[0]["id"], "ZZ-NMC")
    assert {row["registration"]: len(row["events"]) for row in work(book)} == {"ZZ-NMA": 1, "ZZ-NMC": 1}
    more = (event(2000.0, 2001.0), event(8200.0, 8201.0, flight=2), event(8300.0, 8301.0, flight=2))
    record(book, summary(morning_and_noon(*more), rules="rules 2"))
    assert {row["registration"]: len(row["events"]) for row in work(book)} == {"ZZ-NMA": 3, "ZZ-NMC": 2}
    assert len(work(book)) == 2


def test_reassigning_into_another_flight_of_that_aeroplane_is_said(book):
    record(book, summary(sortie(), recording("c.csv", registration="ZZ-NMC")))
    first = book.reading(lambda table: flight_list(table, Filters(registration="ZZ-NMA")))[0]
    other = book.reading(lambda table: flight_list(table, Filters(registration="ZZ-NMC")))[0]
    assert acts.reassign(book, first["id"], "ZZ-NMC")["clashes"] == [other["id"]]


def test_a_flight_without_a_registration_gets_one(book):
    record(book, summary(sortie(registration=None)))
    (row,) = book.reading(lambda table: flight_list(table, Filters()))
    assert row["registration"] is None
    acts.reassign(book, row["id"], "ZZ-NMA")
    assert all_events(book)[0]["registration"] == "ZZ-NMA"
    assert {one["registration"]: one["status"] for one in work(book)} == {None: "closed", "ZZ-NMA": "due"}


def test_totals_go_on_from_what_was_set(book):
    record(book, summary(sortie(), recording("b.csv", start=15 * 3600.0, flights=[flight(0.0, 1800.0)])))
    acts.set_totals(book, "ZZ-NMA", 1234.5, 2210, NINE - 3600.0)
    (row,) = book.reading(lambda table: totals(table, Filters()))
    assert row["airframe"]["hours"] == pytest.approx(1234.5 + 1.5)
    assert row["airframe"]["landings"] == 2212
    # set again between the two flights: only the second comes on top
    acts.set_totals(book, "zz nma", 1236.0, 2212, NINE + 3 * 3600.0)
    (row,) = book.reading(lambda table: totals(table, Filters()))
    assert (row["airframe"]["hours"], row["airframe"]["landings"]) == (1236.5, 2213)


def test_totals_that_run_backwards_are_kept_and_said(book):
    acts.set_totals(book, "ZZ-NMA", 1234.5, None, NINE)
    done = acts.set_totals(book, "ZZ-NMA", 1200.0, None, NINE + 60.0)
    assert "less than the 1234.5 set for" in done["notes"][0]


@pytest.mark.parametrize(
    ("hours", "landings", "problem"),
    [
        (None, None, "nothing is set"),
        (float("nan"), None, "cannot be"),
        (-1.0, None, "cannot be"),
        (None, -1, "cannot be"),
    ],
)
def test_totals_that_cannot_be_are_refused(book, hours, landings, problem):
    with pytest.raises(UsageError, match=problem):
        acts.set_totals(book, "ZZ-NMA", hours, landings, NINE)


def frame(*spans, hours=None, landings=None, at=NINE - 3600.0):
    flights = [
        Flown(str(turn), "ZZ-NMA", "ZZNMA", (span,), span[1] - span[0], 1, True, False, ())
        for turn, span in enumerate(spans)
    ]
    bases = [] if hours is None else [{"id": 1, "hours": hours, "landings": landings, "valid_at": at}]
    return Airframe("ZZ-NMA", "ZZNMA", flights, bases)


# the event ends at 09:30, an hour's flight began at 09:00; a two-hour flight at 12:00, three landings in all
FLOWN = ((NINE, NINE + 3600.0), (NINE + 10800.0, NINE + 18000.0), (NINE + 20000.0, NINE + 20001.0))


@pytest.mark.parametrize(
    ("before", "kind", "passed", "at", "left"),
    [
        ("next flight", "next flight", True, None, None),
        ("10 h", "hours", False, 1010.5, 7.5),
        ("within 2.5 flight hours", "hours", False, 1003.0, 0.0),
        ("2 h", "hours", True, 1002.5, -0.5),
        ("5 landings", "landings", False, 2005.0, 2.0),
        ("2031-06-01", "date", False, "2031-06-01", 28.6),
        ("2031-05-01", "date", True, "2031-05-01", None),
        ("30 days", "date", False, "2031-06-01", 29.0),
        ("as the manual has it", "words", None, None, None),
    ],
)
def test_before_is_worked_out_against_the_airframe(before, kind, passed, at, left):
    airframe = frame(*FLOWN, hours=1000.0, landings=2000)
    due = resolve(before, NINE + 1700.0, NINE + 1800.0, airframe, NOW)
    assert (due["kind"], due["passed"], due["at"]) == (kind, passed, at)
    if left is not None:
        assert due["left"] == pytest.approx(left, abs=0.06)


def test_before_without_totals_counts_what_was_seen_flown():
    due = resolve("10 h", NINE, NINE + 1800.0, frame(*FLOWN), NOW)
    assert (due["at"], due["left"]) == (None, 7.5)
    assert "totals not set" in due["words"]


def test_before_of_an_event_without_a_date_is_not_known():
    for before in ("next flight", "10 h", "30 days"):
        due = resolve(before, None, None, frame(*FLOWN), NOW)
        assert due["passed"] is None
        assert "no date" in due["words"]
    assert resolve(None, NINE, NINE, frame(), NOW) is None


def test_an_impossible_date_is_left_as_words():
    assert resolve("2031-02-31", NINE, NINE, frame(), NOW)["kind"] == "words"


def test_names_and_notes_are_blanked_and_nothing_else(book, place):
    record(book, summary(sortie()))
    secret = "Zacharias Quillfeather"
    # long enough to lie on pages of its own, which are freed and not overwritten by the next row
    acts.decide(book, all_events(book)[0]["id"], "agreed", secret, f"told by {secret} " * 500)
    acts.close(book, work(book)[0]["id"], secret, "31-204", note=secret)
    acts.set_totals(book, "ZZ-NMA", 1.0, 1, NINE, secret)
    assert sum(acts.blank_names(book, "2000-01-01T00:00:00Z")[0].values()) == 0
    with contextlib.ExitStack() as others:
        if place.startswith("sqlite"):  # the log ahead stays while anybody has the file open
            raw = others.enter_context(contextlib.closing(sqlite3.connect(book.where.file)))
            raw.execute("SELECT count(*) FROM events").fetchone()
        counts, clean = acts.blank_names(book, "2100-01-01T00:00:00Z")
        assert (sum(counts.values()), clean) == (3, True)
        if place.startswith("sqlite"):
            files = list(book.where.file.parent.iterdir())
            assert any(file.name.endswith("-wal") for file in files)
            assert [file.name for file in files if secret.encode() in file.read_bytes()] == []
    decision = all_events(book)[0]["decision"]
    assert (decision["as"], decision["by"], decision["note"]) == ("agreed", None, None)
    assert work(book)[0]["reference"] == "31-204"


@pytest.mark.parametrize(
    "sql",
    [
        "DELETE FROM events", "DELETE FROM decisions", "UPDATE events SET severity = 'advisory'",
        "UPDATE decisions SET verdict = 'agreed'", "UPDATE inspection_acts SET reference = NULL",
        "UPDATE recordings SET path = 'x'", "DELETE FROM schema_version",
    ],
)  # fmt: skip
def test_the_database_itself_refuses_to_lose_or_change_a_row(book, sql):
    record(book, summary(sortie()))
    acts.decide(book, all_events(book)[0]["id"], "agreed", "A. Miller", None)
    acts.close(book, work(book)[0]["id"], "R. Singh", "31-204")
    with pytest.raises(ExceedError, match="rows of the ledger are never"):
        book.writing(lambda table: table.connection.exec_driver_sql(sql))


def test_filters_choose_by_aeroplane_time_rule_severity_and_state(book):
    record(book, summary(
        sortie(), recording("c.csv", registration="ZZ-NMC", events=[event(812.0, 813.0, severity="warning")]),
        recording("n.csv", day=DAY + timedelta(days=1),
                  events=[event(5.0, 6.0, rule="never-exceed", certainty="possible")]),
        recording("u.csv", start=None, events=[event(5.0, 6.0)]),
    ))  # fmt: skip

    def paths(**filters):
        return sorted(row["recording"]["path"] for row in all_events(book, **filters))

    day = DAY.timestamp()
    assert paths(registration="zz-nmc") == ["c.csv"]
    assert paths(since=day + 86400.0) == ["n.csv"]
    assert paths(until=day + 86400.0) == ["a.csv", "c.csv"]
    assert paths(rule="never-exceed") == ["n.csv"]
    assert paths(severity="warning") == ["c.csv"]
    assert paths(certainty="likely") == ["a.csv", "c.csv", "u.csv"]
    acts.decide(book, all_events(book, registration="ZZ-NMC")[0]["id"], "agreed", "A. Miller", None)
    assert paths(state="decided") == ["c.csv"]
    assert paths(state="open") == ["a.csv", "n.csv", "u.csv"]
    # what has no date cannot be placed, and that is counted
    assert book.reading(lambda table: history.events(table, Filters(since=day)))[1] == 1


def test_a_backup_is_a_ledger_of_its_own(tmp_path):
    from exceed.ledger.store import open_ledger

    with open_ledger(f"sqlite:///{tmp_path / 'l.sqlite'}", create=True) as book:
        record(book, summary(sortie()))
        book.backup(tmp_path / "copy.sqlite")
        with pytest.raises(ExceedError, match="is there already"):
            book.backup(tmp_path / "copy.sqlite")
        with pytest.raises(ExceedError, match="copy failed"):
            book.backup(tmp_path / "nowhere" / "copy.sqlite")
        expected = all_events(book)
    assert (tmp_path / "copy.sqlite").stat().st_mode & 0o777 == 0o600
    with open_ledger(f"sqlite:///{tmp_path / 'copy.sqlite'}") as copied:
        assert all_events(copied) == expected
    with contextlib.closing(sqlite3.connect(tmp_path / "copy.sqlite")) as raw:
        assert raw.execute("PRAGMA integrity_check").fetchone() == ("ok",)
