"""The note on a log: says how each column was understood, and what the log can be used for."""

from __future__ import annotations

from dataclasses import replace

import pytest

from exceed.core.outcome import ChannelRow, MethodRow
from exceed.report.describe import describe
from exceed.report.show import breadth
from report import examples, golden


@pytest.mark.parametrize("name", sorted(golden.NOTES))
def test_the_golden_notes_have_not_changed(name: str) -> None:
    assert golden.note(name) == (golden.FOLDER / name).read_text(encoding="utf-8")


@pytest.mark.parametrize("log", ["aerobatic", "touring", "bare", "failed"])
@pytest.mark.parametrize("width", [60, 80, 132])
def test_the_note_fits_and_sends_nothing_hidden(log: str, width: int) -> None:
    text = describe(getattr(examples, log)(), width=width)
    assert max(map(breadth, text.splitlines())) <= width
    assert [letter for letter in text if not letter.isprintable() and letter != "\n"] == []


def test_the_note_says_how_a_column_was_understood_and_which_rules_it_feeds() -> None:
    text = describe(examples.aerobatic())
    for said in (
        "content sha256 a1a1",
        "read as date time, from 2031-05-02T09:02:11Z; zone UTC; 0 resets; 1 gap",
        "median 9.8 in steady flight: m/s2, datum total",
        "uncertainty: aircraft file",
        "SPD: not understood: kt or km/h cannot be told",
        "ask: which unit has SPD?",
        "not used: SPARE 1",
        "calibrated airspeed: indicated airspeed from IAS; assumes: no position error known: CAS = IAS",
        "flap angle: cannot be had: no column gives it",
        "airframe: 2 of 3 rules: Positive load factor, Never-exceed speed",
        "not: Flaps-extended speed: flap angle not recorded",
        "not: Hard landing, Bounced landing: height above ground not recorded, vertical speed not recorded",
        "accelerometer calibrated: 2031-01-10",
    ):
        assert said in text, said


def test_a_log_that_lost_a_sample_is_not_called_wholly_valid() -> None:
    from dataclasses import replace

    log = examples.touring()
    channel = replace(log.channels[0], valid_share=0.99996)
    assert " 99.9 % " in describe(replace(log, channels=(channel,)))


def test_a_column_keeps_its_own_name_where_a_quantity_comes_from() -> None:
    log = examples.aerobatic()
    channels = (*log.channels, ChannelRow("vert_acc_g", "load_factor", "g", 8.0, "name"))
    methods = (MethodRow("load_factor", "accelerometer", ("vert_acc_g", "roll_rate")),)
    assert "accelerometer from vert_acc_g, roll rate" in describe(replace(log, channels=channels, methods=methods))
