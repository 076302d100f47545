"""The note on a log: says how each column was understood, and what the log can be used for."""

from __future__ import annotations

import pytest

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
        "not: Flaps-extended speed (lacks a flap channel)",
        "not: Hard landing, Bounced landing (lacks height above ground, vertical speed)",
        "accelerometer calibrated: 2031-01-10",
    ):
        assert said in text, said


def test_a_log_that_lost_a_sample_is_not_called_wholly_valid() -> None:
    from dataclasses import replace

    log = examples.touring()
    channel = replace(log.channels[0], valid_share=0.99996)
    assert " 99.9 % " in describe(replace(log, channels=(channel,)))
