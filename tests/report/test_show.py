"""Numbers, times and foreign text as all outputs show them."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from exceed.core.quantities import QUANTITIES
from exceed.report import show


@pytest.mark.parametrize(
    ("time", "text"),
    [(0.0, "0:00:00.0"), (751.2, "0:12:31.2"), (59.96, "0:01:00.0"), (36000.04, "10:00:00.0"), (-1.5, "-0:00:01.5")],
)
def test_elapsed_time_is_in_hours_minutes_and_tenths(time: float, text: str) -> None:
    assert show.elapsed(time) == text


@pytest.mark.parametrize(
    ("epoch", "text"),
    # `date -u -d @1784020351` of GNU coreutils gives 2026-07-14 09:12:31
    [
        (1784020351.25, "2026-07-14T09:12:31.250Z"),
        (0.0, "1970-01-01T00:00:00.000Z"),
        (0.1299999, "1970-01-01T00:00:00.130Z"),
    ],
)
def test_utc_is_written_to_the_millisecond(epoch: float, text: str) -> None:
    assert show.iso_utc(epoch) == text


@pytest.mark.parametrize("epoch", [None, math.nan, math.inf, 1e18, -1e18])
def test_an_instant_that_no_calendar_has_is_none(epoch: float | None) -> None:
    assert show.iso_utc(epoch) is None


def test_local_time_carries_its_offset() -> None:
    zone = show.find_zone("Europe/Paris")
    assert show.local_text("2031-05-02T09:15:43.130Z", zone) == "11:15:43 +02:00"  # summer time, UTC + 2 h
    assert show.local_text("2031-01-02T09:15:43.130Z", zone, digits=1) == "10:15:43.1 +01:00"


@pytest.mark.parametrize("name", [None, "", "UTC", "utc", "No/Such", "../etc/passwd", "\x00"])
def test_no_zone_is_made_of_utc_or_of_nonsense(name: str | None) -> None:
    assert show.find_zone(name) is None


@pytest.mark.parametrize(
    ("seconds", "text"),
    [
        (0.0, "0.00 s"),
        (0.814, "0.81 s"),
        (9.996, "10.0 s"),
        (53.6, "53.6 s"),
        (751.0, "12 min 31 s"),
        (5153.6, "1 h 26 min"),
        (7199.0, "2 h 00 min"),
    ],
)
def test_how_long_is_short_enough_for_a_column(seconds: float, text: str) -> None:
    assert show.duration(seconds) == text


def test_numbers_have_no_negative_zero_and_an_ascii_minus() -> None:
    assert show.number(-0.004, 2) == "0.00"
    assert show.number(-0.006, 2) == "-0.01"


def test_a_probability_is_never_rounded_to_a_certainty() -> None:
    assert [show.probability(p) for p in (1.0, 0.9999, 0.95, 0.0, None)] == [
        "> 99.9 %",
        "> 99.9 %",
        "95.0 %",
        "< 0.1 %",
        "not known",
    ]


@pytest.mark.parametrize(
    ("text", "safe"),
    [
        ("a\x1b[31mb", "a\\x1b[31mb"),
        ("a\nb\tc\rd", "a\\nb\\tc\\rd"),
        ("\x9b31m", "\\x9b31m"),
        ("x\u202egpj", "x\\u202egpj"),
        ("\u200b\ufeff", "\\u200b\\ufeff"),
        ("\udcff", "\\xff"),
        ("größe", "größe"),
        ("[red]", "[red]"),
    ],
)
def test_foreign_text_is_shown_and_not_sent(text: str, safe: str) -> None:
    assert show.visible(text) == safe


@given(st.text())
def test_visible_text_prints_on_one_line_and_stays_so(text: str) -> None:
    safe = show.visible(text)
    assert not any(ord(letter) < 32 or 127 <= ord(letter) < 160 for letter in safe)
    assert len((safe + ".").splitlines()) == 1
    assert show.visible(safe) == safe
    assert show.visible(text, unicode=False).isascii()


@given(st.text(), st.integers(1, 30))
def test_a_clipped_text_fits(text: str, room: int) -> None:
    assert show.breadth(show.clip(show.visible(text), room)) <= room


def test_metric_digits_say_as_much_as_the_trades() -> None:
    sink = show.shown("touchdown_sink_rate", "ft/min", "metric")
    assert sink.with_unit(600.0) == "3.05 m/s"  # 600 ft/min = 600 * 0.3048 / 60 = 3.048 m/s
    assert show.shown("indicated_airspeed", "kt", "metric").with_unit(100.0) == "185.2 km/h"
    assert show.shown("load_factor", "g", "metric").with_unit(3.8) == "3.80 g"


@pytest.mark.parametrize("name", sorted(QUANTITIES))
def test_every_quantity_can_be_shown_in_both_systems(name: str) -> None:
    row = QUANTITIES[name]
    for system in ("trade", "metric"):
        form = show.shown(name, row.shown, system)
        assert form.text(1.0)
        if row.metric and system == "metric":
            assert form.unit == row.metric
    assert show.shown(name, row.shown).text(None) == "-"


def test_a_state_is_a_word() -> None:
    assert show.shown("gear_down", "state").with_unit(1.0) == "down"
    assert show.shown("stall_warning", "state").text(1.0) == "on"


def test_colour_needs_a_terminal_that_nobody_objected_to() -> None:
    assert show.wants_colour({"TERM": "xterm"}, terminal=True)
    assert show.wants_colour({"TERM": "xterm", "NO_COLOR": ""}, terminal=True)
    assert not show.wants_colour({"TERM": "xterm", "NO_COLOR": "1"}, terminal=True)
    assert not show.wants_colour({"TERM": "dumb"}, terminal=True)
    assert not show.wants_colour({"TERM": "xterm"}, terminal=False)
    assert not show.wants_colour({"TERM": "xterm"}, terminal=True, no_colour=True)
