"""Channels files: every key, and every kind of mistake at its line and column."""

from __future__ import annotations

import datetime

import pytest

from exceed.core.quantities import QUANTITIES
from exceed.documents.channels import AXES, load_channels, time_zone
from exceed.documents.lint import lint
from exceed.documents.schema import template
from exceed.errors import DocumentError

HEAD = "format: exceed-channels/1\n"


def test_every_key_of_the_starter_file_arrives() -> None:
    made = load_channels(template("channels"))
    clock = made.clock
    assert clock is not None
    assert (clock.columns, clock.kind, clock.zone, clock.offset) == (("Date", "Time"), "date_time", "UTC", 0.0)
    first, second, third, fourth = made.channels
    assert (first.column, first.quantity, first.unit, first.positive, first.datum, first.accuracy, first.sign) == (
        "NORM ACC", "load_factor", "m/s2", "up", "total", 0.05, 1,
    )  # fmt: skip
    assert (second.positive, second.sign) == ("right", 1)
    assert (third.quantity, third.unit, third.sign) == ("oil_temperature", "degC", None)
    assert fourth.unit == "%"
    assert (made.ignore, made.missing) == (("SPARE 1",), ("---", "n/a"))
    stuck, loose = made.faulty
    assert (stuck.column, stuck.start, stuck.end, stuck.reason) == (
        "AOA", datetime.datetime(2031, 5, 2, 9, 0, tzinfo=datetime.UTC), None, "vane stuck",
    )  # fmt: skip
    assert (loose.start, loose.end) == (120.0, 180.0)


def test_one_column_is_a_list_of_one() -> None:
    clock = load_channels(HEAD + "clock: {column: t, kind: elapsed, unit: ms, offset: -2 s}\n").clock
    assert clock is not None
    assert (clock.columns, clock.unit, clock.offset) == (("t",), "ms", -2.0)
    frame = load_channels(HEAD + "clock: {column: n, kind: frame, interval: 0.125 s}\n").clock
    assert frame is not None
    assert frame.interval == 0.125


def test_a_sense_other_than_our_own_turns_the_sign() -> None:
    for quantity, (ours, theirs) in AXES.items():
        assert quantity in QUANTITIES
        for word, sign in ((ours, 1), (theirs, -1)):
            made = load_channels(HEAD + f"channels: [{{column: X, quantity: {quantity}, positive: {word}}}]\n")
            assert made.channels[0].sign == sign


def test_the_words_for_senses_agree_with_the_quantities_table() -> None:
    # the table says 'up', 'to the right', 'right wing down', 'nose up', ...; the first word must be in it
    for quantity, (ours, theirs) in AXES.items():
        text = QUANTITIES[quantity].positive
        if quantity == "angle_of_attack":
            assert text == "air from below"  # that is nose up
            continue
        assert ours in text.replace("right wing", "right"), (quantity, text)
        assert theirs not in text.split(), (quantity, text)


WRONG = [
    ("clock: {kind: elapsed}", 8, "no column is named"),
    ("clock: {column: t, kind: elaped}", 26, "'elaped' is not a kind of clock"),
    ("clock: {column: t}", 8, "key 'kind' is missing"),
    ("clock: {column: t, columns: [a, b], kind: date_time}", 17, "both 'column' and 'columns' are given"),
    ("clock: {columns: [a, b], kind: elapsed}", 18, "2 columns are too many for the kind elapsed"),
    ("clock: {column: t, kind: iso, unit: s}", 37, "a clock of the kind iso has no unit"),
    ("clock: {column: t, kind: elapsed, unit: kt}", 41, "'kt' is not a unit of time"),
    ("clock: {column: t, kind: elapsed, zone: UTC}", 41, "a clock of the kind elapsed has no zone"),
    ("clock: {column: t, kind: iso, zone: Mars/Olympus}", 37, "'Mars/Olympus' is not a time zone"),
    ('clock: {column: t, kind: iso, zone: "+25:00"}', 37, "'+25:00' is not a time zone"),
    ("clock: {column: t, kind: iso, interval: 1 s}", 41, "only a frame counter has an interval"),
    ("clock: {column: t, kind: iso, offset: 5}", 39, "'5' has no unit"),
    ("channels: {a: b}", 11, "a mapping stands where a list is due"),
    ("channels: [{quantity: mach}]", 12, "key 'column' is missing"),
    ("channels: [{column: A}]", 12, "key 'quantity' is missing"),
    ("channels: [{column: A, quantity: Oil Temp}]", 34, "'Oil Temp' is no name for a quantity"),
    ("channels: [{column: A, quantity: mach, unit: kt}]", 46, "'kt' is a unit of speed and mach is a ratio"),
    ("channels: [{column: A, quantity: oil, unit: degc}]", 45, "unit 'degc' is not known"),
    ("channels: [{column: A, quantity: oil, unit: [a]}]", 45, "a list stands where a unit is due"),
    ("channels: [{column: A, quantity: indicated_airspeed, unit: KCAS}]", 60,
     "'KCAS' is calibrated airspeed and not indicated_airspeed"),
    ("channels: [{column: A, quantity: mach, positive: up}]", 50, "mach has no sense to choose"),
    ("channels: [{column: A, quantity: load_factor, positive: left}]", 57, "'left' does not fit load_factor"),
    ("channels: [{column: A, quantity: load_factor, positive: upwards}]", 57, "'upwards' is not a side"),
    ("channels: [{column: A, quantity: mach, datum: total}]", 47, "mach has no datum to choose"),
    ("channels: [{column: A, quantity: load_factor, datum: sum}]", 54, "'sum' is not a datum"),
    ("channels: [{column: A, quantity: load_factor, accuracy: 2 kt}]", 57, "'2 kt' is a speed and load_factor is a load factor"),  # noqa: E501
    ("channels: [{column: A, quantity: oil, unit: degC, accuracy: 2 kt}]", 61, "'2 kt' is a speed and oil is a temperature"),  # noqa: E501
    ("channels: [{column: A, quantity: oil}, {column: A, quantity: mach}]", 49, "column 'A' is there twice, first as channel 1"),  # noqa: E501
    ("channels: [{column: A, quantity: oil}, {column: B, quantity: oil}]", 62, "quantity 'oil' is there twice, first as channel 1"),  # noqa: E501
    ("channels: [{column: A, quantity: oil}]\nignore: [A]", None, "column 'A' is both used and ignored"),
    ("ignore: {a: b}", 9, "a mapping stands where a list is due"),
    ("missing: [[a]]", 11, "a list stands where text is due"),
    ("faulty: [{from: 1 s}]", 10, "key 'column' is missing"),
    ('faulty: [{column: A, from: "2031-05-02"}]', 28, "'2031-05-02' is not a time with its zone"),
    ('faulty: [{column: A, from: "2031-05-02T09:00"}]', 28, "'2031-05-02T09:00' is not a time with its zone"),
    ("faulty: [{column: A, from: 9 s, to: 3 s}]", 37, "the end is not after the start"),
    ('faulty: [{column: A, from: 9 s, to: "2031-05-02T09:00Z"}]', 37,
     "one end is a time of day and the other is counted from the first sample"),
]  # fmt: skip


@pytest.mark.parametrize(("text", "column", "problem"), WRONG, ids=[row[2][:60] for row in WRONG])
def test_each_mistake_is_told_once_at_its_line_and_column(text: str, column: int | None, problem: str) -> None:
    with pytest.raises(DocumentError) as caught:
        load_channels(HEAD + text + "\n")
    place = "text:3:10" if column is None else f"text:2:{column}"
    assert [(row.place, row.problem) for row in caught.value.problems] == [(place, problem)]
    assert all(row.expected and row.do for row in caught.value.problems)


def test_a_name_close_to_a_quantity_is_allowed_and_lint_says_so() -> None:
    text = HEAD + "channels: [{column: A, quantity: load_facter}]\n"
    assert load_channels(text).channels[0].quantity == "load_facter"
    (advice,) = lint(text)
    assert (advice.place, advice.do) == ("text:2:34", "write 'load_factor' if that is meant")
    assert (
        lint(HEAD + "channels: [{column: A, quantity: oil_temperature}, {column: B, quantity: engine_speed_2}]\n") == []
    )


def test_zones_become_offsets() -> None:
    noon = datetime.datetime(2031, 7, 1, 12)
    for text, hours in (("UTC", 0), ("Z", 0), ("+02:00", 2), ("-05:30", -5.5)):
        assert time_zone(text).utcoffset(noon) == datetime.timedelta(hours=hours)


def test_an_unknown_unit_is_answered_with_what_is_meant() -> None:
    for unit, do in (("kph", "write 'km/h' if you meant kilometres per hour"), ("degc", "write 'degC' if that is meant"),  # noqa: E501
                     ("zorkmid", "use a unit of the list")):  # fmt: skip
        with pytest.raises(DocumentError) as caught:
            load_channels(HEAD + f"channels: [{{column: A, quantity: oil, unit: {unit}}}]\n")
        assert caught.value.problems[0].do == do


@pytest.mark.parametrize(
    ("zone", "right"), [("+14:00", True), ("+14:01", True), ("+15:00", False), ("-00:59", True), ("+01:60", False)]
)
def test_offsets_of_zones_stay_within_a_day(zone: str, right: bool) -> None:
    found = lint(HEAD + f'clock: {{column: t, kind: iso, zone: "{zone}"}}\n')
    assert (found == []) is right
