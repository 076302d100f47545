"""Spectra in words: text, JSON and page of values made by hand."""

from __future__ import annotations

import json
import re

import numpy as np
import pytest

from exceed.core.diagrams import SpectrumLog, SpectrumOutcome
from exceed.core.outcome import JudgedWith
from exceed.errors import Problem
from exceed.report.spectrum import NO_LIFE, render_spectrum, spectrum_page, spectrum_summary
from exceed.report.write import to_json
from exceed.spectra import Growing
from exceed.tallies import count_stretch


def growing(registration: str | None, load: list[float], **more: object) -> Growing:
    found = Growing(registration, logs=1, flights=1, airborne=float(len(load)), stretches=1, samples=len(load))
    time, values = np.arange(len(load)) / 8.0, np.array(load)
    phases = np.where(np.arange(len(load)) < len(load) // 2, 6, 8).astype(np.int8)
    causes = np.full(len(load), 2, dtype=np.int8)
    found.whole.add(count_stretch(time, values, [(phases, found.phases), (causes, found.causes)]))
    found.cycles.add_history(values)
    found.rates = {8.0}
    for name, value in more.items():
        setattr(found, name, value)
    return found


def outcome(name: str = "a.csv") -> SpectrumOutcome:
    steep = [1.0, 2.6, 0.4, 6.1, -2.2, 3.0, 1.0] * 40
    one = growing("ZZ-NMA", steep, unweighted={"mass known only as a range": 1}, derived=True)
    two = growing(None, [1.0, 1.3, 0.8, 1.1] * 30, flights_known=False, untold={"gusts not told: no mass": 1})
    whole = Growing(None)
    for part in (one, two):
        whole.add(part)
    logs = (
        SpectrumLog(name, "counted", registration="ZZ-NMA", method="accelerometer", interval=0.125, flights=1,
                    airborne=280.0, counted=270.0, stretches=2, samples=280, not_counted=(("gap", 10.0),), at_end=3,
                    notes=("datum taken off",)),
        SpectrumLog("b.csv", "failed", Problem("b.csv", "no load factor", "a load factor", "name its column")),
        SpectrumLog("c.csv", "not counted", notes=("the same content as a.csv: counted once",)),
    )  # fmt: skip
    return SpectrumOutcome(
        logs, (one.row(), two.row(), whole.row(everything=True)), 0.25, 1.0,
        (JudgedWith("option", name="--mass", value="900 kg"),), (("notes.txt", "no log"),), ("fleet file used: f",),
    )  # fmt: skip


def test_the_summary_is_finite_complete_and_says_how_it_was_counted() -> None:
    summary = spectrum_summary(outcome())
    text = to_json(summary)  # refuses NaN
    assert json.loads(text) == summary
    assert summary["standard"] == "ASTM E1049"
    assert NO_LIFE in summary["cautions"]
    assert any("not rebuilt" in line for line in summary["counted_as"])
    assert summary["totals"] == {"recordings": 3, "counted": 1, "not_counted": 1, "failed": 1}
    for row in summary["spectra"]:
        for level in row["levels"]:
            assert level["level_g"] % 0.25 == 0.0
            assert row["lowest_g"] <= level["level_g"] <= row["highest_g"]
            assert level["crossings_per_h"] == pytest.approx(3600.0 * level["crossings"] / row["counted_s"], rel=1e-3)
            assert level["crossings_per_1000_h"] == pytest.approx(1000.0 * level["crossings_per_h"], rel=1e-3)
        cycles = row["cycles"]
        assert sum(one["cycles"] for one in cycles["by_range"]) == cycles["whole"] + 0.5 * cycles["half"]
        assert sum(one["whole"] for one in cycles["by_range_and_mean"]) == cycles["whole"]


def test_the_text_fits_80_columns_and_a_pipe_gets_it_unsqueezed() -> None:
    summary = spectrum_summary(outcome())
    narrow = render_spectrum(summary, width=80, unicode=False)
    assert max(map(len, narrow.splitlines())) <= 80
    assert narrow.isascii()
    wide = render_spectrum(summary)
    for words in (
        "ZZ-NMA",
        "no registration",
        "altogether",
        "flights not known, all recorded time counts as airborne",
        "load factor was derived, not recorded",
        "3 samples at the sensor's end: the true load lies beyond",
        "not counted: gap, 10.0 s",
        "b.csv: failed: no load factor; expected: a load factor; do: name its column",
        "c.csv: not counted: the same content as a.csv: counted once",
        "notes.txt: no log",
        "half cycles that the stretches leave open",
        "gusts not told: no mass (1 log)",
        "not counted: mass known only as a range (1 log)",
        "No fatigue life is claimed",
    ):
        assert words in wide, words


def test_names_of_files_cannot_speak_to_the_terminal_or_the_page() -> None:
    name = "a\x1b[31m<b>.csv"
    found = outcome(name)
    summary = spectrum_summary(found)
    assert "\x1b" not in render_spectrum(summary)
    page = spectrum_page(summary, found)
    assert "<b>.csv" not in page
    assert "\\x1b[31m&lt;b&gt;.csv" in page


def test_the_page_draws_crossings_and_cycles_of_each_aeroplane() -> None:
    found = outcome()
    page = spectrum_page(spectrum_summary(found), found)
    data = json.loads(re.search(r'id="plot-data">(.*?)</script>', page, re.S).group(1))
    for figure in (data["crossings"], data["cycles"]):
        assert [line["name"] for line in figure["data"]] == ["ZZ-NMA", "no registration", "altogether"]
    first = data["cycles"]["data"][0]
    assert first["y"] == sorted(first["y"], reverse=True)
    assert "No fatigue life is claimed" in page


def test_nothing_counted_is_said_and_nothing_is_drawn() -> None:
    found = SpectrumOutcome((SpectrumLog("b.csv", "failed", Problem("b.csv", "no load factor")),), (), 0.25, 1.0)
    summary = spectrum_summary(found)
    assert "0 logs counted, 1 failed" in render_spectrum(summary)
    assert "data-plot" not in spectrum_page(summary, found)
