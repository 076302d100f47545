"""What a summary adds to the ledger: new things once, known things not at all, newer judgements beside the old."""

from __future__ import annotations

import copy

import pytest

from exceed.ledger import acts, history
from exceed.ledger.history import Filters
from exceed.ledger.inspections import inspections
from exceed.ledger.record import known_digests, record
from exceed.ledger.schema import TABLES
from exceed.ledger.totals import flight_list, totals
from exceed.report.model import Summary
from ledger.days import DAY, event, flight, recording, sha, summary, utc

NOW = DAY.timestamp() + 86400.0


def all_events(book, **filters):
    return book.reading(lambda table: history.events(table, Filters(**filters)))[0]


def all_inspections(book):
    return book.reading(lambda table: inspections(table, Filters(), NOW))


def all_totals(book):
    return book.reading(lambda table: totals(table, Filters()))


def row_counts(book):
    def look(table):
        return {name: table.one(f"SELECT count(*) AS n FROM {name}")["n"] for name in TABLES}

    return book.reading(look)


def one_sortie(**extra):
    return recording("a.csv", flights=[flight(100.0, 3700.0)], events=[event(812.13, 812.94)], **extra)


def test_the_summaries_made_by_hand_have_the_published_form():
    undecided = [event(900.0, 901.0, rule="never-exceed", severity="warning")]
    Summary.model_validate(summary(one_sortie(undecided=undecided), recording("b.csv", start=None)))


def test_an_event_keeps_every_field_of_the_summary(book):
    made = summary(one_sortie())
    record(book, made)
    (found,) = all_events(book)
    original = made["recordings"][0]["events"][0]
    assert {key: found[key] for key in original} == original
    assert found["recording"] == {"path": "a.csv", "sha256": sha("a.csv"), "content_sha256": sha("a.csv")}
    assert found["decision"] is None


def test_the_same_content_twice_adds_no_row_at_all(book):
    record(book, summary(one_sortie()))
    before = row_counts(book)
    again = summary({**one_sortie(), "path": "renamed/copy.csv"})
    again["created"] = "2031-05-03T07:00:00Z"
    result = record(book, again)
    assert row_counts(book) == before
    assert result["scan"] is None
    assert result["recordings"] == {"added": 0, "known": 1, "judged_anew": 0}
    assert result["events"] == {"added": 0, "known": 1, "standing": 0}
    assert result["inspections"] == {"added": 0, "known": 1}


def test_the_same_content_twice_in_one_scan_is_one_recording(book):
    record(book, summary(one_sortie(), {**one_sortie(), "path": "b/a.csv"}))
    assert len(all_events(book)) == 1
    assert row_counts(book)["recordings"] == 1


def test_files_of_other_aeroplanes_that_come_and_go_are_no_newer_judgement(book):
    def loading(name, text):
        return {"kind": "loading", "path": name, "sha256": sha(text)}

    record(book, summary(one_sortie(), documents=[loading("1.yaml", "a")]))
    assert (
        record(book, summary(one_sortie(), documents=[loading("1.yaml", "a"), loading("2.yaml", "b")]))["scan"] is None
    )
    assert record(book, summary(one_sortie(), documents=[loading("1.yaml", "changed")]))["scan"] is not None


@pytest.mark.parametrize("shift", [0.0, -500.0])
def test_a_download_that_overlaps_an_earlier_one_adds_only_what_is_new(book, shift):
    record(book, summary(one_sortie()))
    # the next download begins earlier or at the same time, holds the same flight and another one after it
    later = recording(
        "a-and-b.csv", start=9 * 3600.0 + shift, length=12000.0,
        flights=[flight(100.0 - shift, 3700.0 - shift, 1), flight(8000.0, 9800.0, 2)],
        events=[event(812.13 - shift, 812.94 - shift), event(8100.0, 8101.0, flight=2, severity="warning")],
    )  # fmt: skip
    result = record(book, summary(later))
    assert result["flights"]["added"] == 1
    assert result["flights"]["known"] == 1
    assert result["events"] == {"added": 1, "known": 1, "standing": 0}
    assert [found["severity"] for found in all_events(book)] == ["caution", "warning"]
    (total,) = all_totals(book)
    assert total["flights"] == 2
    assert total["flight_h"] == pytest.approx((3600.0 + 1800.0) / 3600.0, abs=1e-4)
    assert total["landings"] == 2


def test_an_event_can_be_named_by_the_id_it_has_in_the_other_download(book):
    record(book, summary(one_sortie()))
    other = recording("other.csv", flights=[flight(100.0, 3700.0)], events=[event(812.13, 812.94)])
    record(book, summary(other))
    acts.decide(book, other["events"][0]["id"], "agreed", "A. Miller", None)
    (found,) = all_events(book)
    assert found["decision"]["as"] == "agreed"
    assert found["recording"]["path"] == "a.csv"


def test_the_same_content_under_two_registrations_in_one_scan_is_taken_once_and_said(book):
    made = summary(one_sortie(), {**one_sortie(registration="ZZ-NMC"), "path": "c/a.csv"})
    result = record(book, made)
    assert [row["path"] for row in result["left_out"]] == ["c/a.csv"]
    assert [row["registration"] for row in all_events(book)] == ["ZZ-NMA"]
    assert record(book, made)["scan"] is None


def test_events_on_the_ground_of_an_aeroplane_that_never_flew_are_counted(book):
    ground = {**recording("g.csv", events=[event(5.0, 6.0, flight=None)]), "flights": []}
    record(book, summary(ground))
    (row,) = all_totals(book)
    assert (row["registration"], row["flights"], row["events"]["caution"]) == ("ZZ-NMA", 0, 1)


def test_another_aeroplane_at_the_same_time_is_another_flight(book):
    record(book, summary(one_sortie()))
    record(book, summary(recording("c.csv", registration="ZZ-NMC", events=[event(812.13, 812.94)])))
    assert [row["registration"] for row in all_totals(book)] == ["ZZ-NMA", "ZZ-NMC"]
    assert len(all_events(book)) == 2


def test_registrations_are_compared_without_case_and_punctuation(book):
    record(book, summary(one_sortie()))
    record(book, summary(recording("c.csv", registration="zznma", flights=[flight(100.0, 3700.0)])))
    assert len(all_totals(book)) == 1
    assert all_totals(book)[0]["flights"] == 1


def test_a_flight_broken_off_by_one_download_goes_on_in_the_next(book):
    first = recording("1.csv", length=2000.0, flights=[flight(100.0, 2000.0, landings=0, broken="end")])
    second = recording(
        "2.csv", start=9 * 3600.0 + 2001.0, length=2000.0, flights=[flight(0.0, 1500.0, landings=1, broken="start")]
    )
    record(book, summary(first))
    record(book, summary(second))
    (total,) = all_totals(book)
    assert total["flights"] == 1
    assert total["landings"] == 1
    assert total["flight_h"] == pytest.approx((1900.0 + 1500.0) / 3600.0, abs=1e-4)


def test_a_flight_with_another_take_off_at_the_same_time_is_counted_and_said(book):
    # a recorder whose clock starts anew each day gives every day's flights the same time
    record(book, summary(one_sortie()))
    result = record(book, summary(recording("next.csv", flights=[flight(900.0, 3000.0)], length=4000.0)))
    assert len(result["flights"]["clashes"]) == 1
    (total,) = all_totals(book)
    assert total["flights"] == 2
    assert total["clashes"] == 1
    assert total["flight_h"] == pytest.approx((3600.0 + 2100.0) / 3600.0, abs=1e-4)


def test_without_a_clock_a_flight_is_known_by_content_only(book):
    def undated(path):
        return recording(path, start=None, events=[event(812.0, 813.0)])

    record(book, summary(undated("a.csv")))
    record(book, summary(undated("a.csv")))
    assert all_totals(book)[0]["flights"] == 1
    record(book, summary(undated("b.csv")))
    (total,) = all_totals(book)
    assert total["flights"] == 2
    assert total["undated_flights"] == 2


def test_failed_logs_are_left_out_and_said(book):
    failed = {**recording("bad.csv"), "status": "failed", "content_sha256": None, "sha256": None, "flights": []}
    result = record(book, summary(failed))
    assert [row["path"] for row in result["left_out"]] == ["bad.csv"]
    assert row_counts(book)["recordings"] == 0


def test_digests_of_files_and_of_contents_are_known(book):
    packed = {**one_sortie(), "sha256": sha("the packed file")}
    record(book, summary(packed))
    asked = [sha("the packed file"), sha("a.csv"), sha("new")]
    assert known_digests(book, asked) == {sha("the packed file"), sha("a.csv")}


def newer(*events, rules="rules 2", **extra):
    return summary(recording("a.csv", flights=[flight(100.0, 3700.0)], events=list(events), **extra), rules=rules)


def test_newer_rules_add_a_judgement_beside_the_old_and_say_what_changed(book):
    first = record(book, newer(event(812.13, 812.94), event(1200.0, 1201.0), rules="rules 1"))
    result = record(book, newer(event(812.0, 813.0, severity="warning"), event(2000.0, 2001.0)))
    assert result["replaces"] == first["scan"]
    assert result["recordings"] == {"added": 0, "known": 0, "judged_anew": 1}
    changes = {row["kind"]: row for row in result["changes"]}
    assert set(changes) == {"changed", "added", "removed"}
    assert "severity: caution -> warning" in changes["changed"]["difference"]
    assert changes["removed"]["start"] == utc(9 * 3600.0 + 1200.0)
    assert changes["added"]["start"] == utc(9 * 3600.0 + 2000.0)
    assert [(row["severity"], row["start_s"]) for row in all_events(book)] == [("warning", 812.0), ("caution", 2000.0)]
    older, newest = book.reading(lambda table: history.judgements(table, Filters()))
    assert older["replaces"] is None
    assert newest["replaces"] == {"scan": first["scan"], "turn": 1}
    assert sorted(row["kind"] for row in newest["changes"]) == ["added", "changed", "removed"]
    assert row_counts(book)["events"] == 4
    assert all_totals(book)[0]["flights"] == 1


def test_another_finding_by_the_same_rules_is_a_newer_judgement(book):
    # another loading sheet, another version of a channels file: the rules are the same, the finding is not
    record(book, newer(event(812.13, 812.94), rules="rules 1"))
    result = record(book, newer(event(812.13, 812.94, limit=4.4), rules="rules 1"))
    assert result["recordings"]["judged_anew"] == 1
    assert result["changes"][0]["difference"] == "limit: 6.0 -> 4.4"


def test_a_second_recorder_that_saw_worse_takes_the_place_of_the_first(book):
    record(book, summary(one_sortie()))
    other = recording("qar.csv", flights=[flight(100.0, 3700.0)], events=[event(812.2, 812.9, severity="warning")])
    result = record(book, summary(other))
    assert [row["kind"] for row in result["changes"]] == ["changed"]
    assert [row["severity"] for row in all_events(book)] == ["warning"]
    # and one that saw less does not
    third = recording("third.csv", flights=[flight(100.0, 3700.0)], events=[event(812.2, 812.9, severity="advisory")])
    assert record(book, summary(third))["changes"] == []
    assert [row["severity"] for row in all_events(book)] == ["warning"]


def test_a_judgement_by_other_rules_takes_nothing_from_rules_it_did_not_apply(book):
    record(book, newer(event(812.13, 812.94), rules="rules 1"))
    engine = recording(
        "a.csv", flights=[flight(100.0, 3700.0)], rules=["oil-hot"], events=[event(900.0, 901.0, rule="oil-hot")]
    )
    result = record(book, summary(engine, rules="engine"))
    assert [row["kind"] for row in result["changes"]] == ["added"]
    assert result["replaces"] is None
    assert {row["rule"] for row in all_events(book)} == {"load-factor-high", "oil-hot"}
    # and both judgements hold now: neither scan adds anything again
    assert record(book, newer(event(812.13, 812.94), rules="rules 1"))["scan"] is None


def test_a_rule_that_can_no_longer_be_assessed_takes_nothing_back(book):
    record(book, newer(event(812.13, 812.94), rules="rules 1"))
    result = record(book, newer(unassessed=["load-factor-high"]))
    assert result["changes"] == []
    assert result["events"]["standing"] == 1
    assert len(all_events(book)) == 1
    # nor does it stand between the judgement that could and the same one again
    assert record(book, newer(event(812.13, 812.94), rules="rules 1"))["scan"] is None


def test_going_back_to_older_rules_is_a_judgement_again(book):
    record(book, newer(event(812.13, 812.94), rules="rules 1"))
    record(book, newer())
    assert all_events(book) == []
    record(book, newer(event(812.13, 812.94), rules="rules 1"))
    assert len(all_events(book)) == 1
    assert row_counts(book)["judgements"] == 3


def test_a_decision_follows_the_stretch_to_a_newer_judgement_and_is_marked(book):
    made = newer(event(812.13, 812.94), rules="rules 1")
    record(book, made)
    acts.decide(book, made["recordings"][0]["events"][0]["id"], "not-an-exceedance", "A. Miller", "strap pulled")
    moved = event(812.3, 813.4)
    moved["row"] = 6502  # another extreme sample: another id
    result = record(book, newer(moved))
    assert result["changes"][0]["decision"] == "not-an-exceedance"
    (found,) = all_events(book)
    assert found["id"] != made["recordings"][0]["events"][0]["id"]
    assert found["decision"]["as"] == "not-an-exceedance"
    assert found["decision"]["by"] == "A. Miller"
    assert found["decision"]["carried"] is True
    assert found["decision"]["about"]["event"] == made["recordings"][0]["events"][0]["id"]
    assert found["open"] is False


def test_a_decision_about_less_than_what_is_found_now_leaves_the_event_open(book):
    made = newer(event(812.13, 812.94), rules="rules 1")
    record(book, made)
    acts.decide(book, made["recordings"][0]["events"][0]["id"], "not-an-exceedance", "A. Miller", None)
    record(book, newer(event(812.13, 812.94, severity="warning", value=6.9)))
    (found,) = all_events(book)
    assert found["decision"]["worse_since"] is True
    assert all_events(book, state="open") == [found]
    assert all_events(book, state="decided") == []


def test_a_decision_does_not_reach_another_rule_time_or_aeroplane(book):
    made = summary(
        one_sortie(), recording("c.csv", registration="ZZ-NMC", events=[event(812.13, 812.94)]),
        recording("d.csv", start=15 * 3600.0, events=[event(812.13, 812.94), event(812.2, 812.8, rule="never-exceed")]),
    )  # fmt: skip
    record(book, made)
    acts.decide(book, made["recordings"][0]["events"][0]["id"], "agreed", "A. Miller", None)
    assert [row["recording"]["path"] for row in all_events(book) if row["decision"]] == ["a.csv"]


def test_two_engines_are_two_occurrences(book):
    both = [event(812.0, 815.0, rule="rpm", quantity=f"engine_speed_{turn}") for turn in (1, 2)]
    record(book, newer(*both, rules="rules 1"))
    first, second = all_events(book)
    acts.decide(book, first["id"], "agreed", "A. Miller", None)
    decided = {row["quantity"]: row["decision"] for row in all_events(book)}
    assert decided[first["quantity"]] is not None
    assert decided[second["quantity"]] is None


def test_a_better_view_of_a_cut_event_takes_its_place_and_a_poorer_one_does_not(book):
    record(book, summary(recording("1.csv", length=813.0, flights=[flight(100.0, 813.0, broken="end")],
                                   events=[event(812.1, 813.0, cut_by="recording_end")])))  # fmt: skip
    result = record(book, summary(recording("2.csv", events=[event(812.1, 816.0)])))
    assert [row["kind"] for row in result["changes"]] == ["changed"]
    (found,) = all_events(book)
    assert (found["end_s"], found["severity"]) == (816.0, "caution")
    poorer = recording(
        "3.csv", start=9 * 3600.0 + 814.0, length=400.0, flights=[flight(0.0, 400.0, broken="startend")],
        events=[event(0.0, 2.0, cut_by="recording_start")],
    )  # fmt: skip
    assert record(book, summary(poorer))["changes"] == []
    assert all_events(book) == [found]


def test_an_undecided_stretch_that_turns_out_an_event_is_a_change(book):
    record(book, newer(rules="rules 1", undecided=[event(812.1, 812.4)]))
    assert all_inspections(book)[0]["status"] == "to_be_decided"
    result = record(book, newer(event(812.1, 812.4)))
    assert "list: undecided -> event" in result["changes"][0]["difference"]
    (work,) = all_inspections(book)
    assert work["status"] == "due"


def test_the_same_recording_under_another_registration_moves_its_flight(book):
    record(book, summary(one_sortie()))
    record(book, summary(one_sortie(registration="ZZ-NMC"), rules="rules 2"))
    assert [row["registration"] for row in all_totals(book) if row["flights"]] == ["ZZ-NMC"]
    assert [row["registration"] for row in all_events(book)] == ["ZZ-NMC"]


def test_a_recording_judged_without_its_registration_in_between_stays_its_aeroplanes(book):
    record(book, summary(one_sortie()))
    (row,) = book.reading(lambda table: flight_list(table, Filters()))
    acts.reassign(book, row["id"], "ZZ-NMC", "A. Miller")
    record(book, summary(one_sortie(registration=None), rules="rules 2"))
    record(book, summary(one_sortie(), rules="rules 3"))
    assert [row["registration"] for row in all_events(book)] == ["ZZ-NMC"]  # a person said so


def test_a_flight_known_first_without_a_registration_is_not_counted_twice(book):
    record(book, summary(one_sortie(registration=None)))
    record(book, summary(recording("other.csv", flights=[flight(100.0, 3700.0)])))
    assert sorted(row["flights"] for row in all_totals(book)) == [1, 1]
    record(book, summary(one_sortie(), rules="rules 2"))
    (row,) = [row for row in all_totals(book) if row["registration"] == "ZZ-NMA"]
    assert (row["flights"], row["landings"], row["flight_h"]) == (1, 1, 1.0)


def test_flights_told_apart_count_before_a_later_judgement_that_could_not(book):
    def judged(*flights, rules):
        record(book, summary(recording("a.csv", length=12000.0, flights=flights), rules=rules))
        (row,) = all_totals(book)
        return row["flights"], row["undivided_recordings"], row["flight_h"]

    whole = flight(0.0, 12000.0, None, landings=None)
    assert judged(whole, rules="1") == (0, 1, pytest.approx(3.3333))
    apart = (flight(100.0, 3700.0, 1), flight(8000.0, 9800.0, 2))
    assert judged(*apart, rules="2") == (2, 0, 1.5)
    assert judged(whole, rules="3") == (2, 0, 1.5)
    assert judged(flight(100.0, 3700.0, 1), rules="4") == (1, 0, 1.0)


def test_a_scan_that_fails_in_the_middle_leaves_nothing(book):
    broken = copy.deepcopy(summary(one_sortie(), recording("z.csv", events=[event(5.0, 6.0)])))
    broken["recordings"][1]["events"][0]["severity"] = None
    before = row_counts(book)
    with pytest.raises(Exception):  # noqa: B017, PT011 - whatever the database calls it
        record(book, broken)
    assert row_counts(book) == before


def test_flights_have_ids_and_are_listed_in_order(book):
    record(book, summary(recording("b.csv", start=15 * 3600.0), recording("a.csv"), recording("u.csv", start=None)))
    rows = book.reading(lambda table: flight_list(table, Filters()))
    assert [row["recordings"] for row in rows] == [["a.csv"], ["b.csv"], ["u.csv"]]
    assert len({row["id"] for row in rows}) == 3


def test_hostile_text_is_kept_as_data(book):
    name = "x'); DROP TABLE events;--\x00\ud800\u202e.csv"
    made = summary({**one_sortie(), "path": name})
    made["recordings"][0]["events"][0]["notes"] = [name]
    record(book, made)
    (found,) = all_events(book)
    assert found["notes"] == [name]
    assert "DROP TABLE" in found["recording"]["path"]
    assert "\x00" not in found["recording"]["path"]
