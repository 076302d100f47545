"""The page: self-contained, escaped, complete, the same for the same day."""

from __future__ import annotations

import itertools
import json
import re
from html.parser import HTMLParser
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from exceed.core.outcome import DayOutcome, LogOutcome
from exceed.report import figures, svg
from exceed.report.page import MOST_CARDS, plotly_js, render_envelope, render_page, render_spectrum
from exceed.report.summary import summarise
from report import examples


def page_of(day: DayOutcome, **more: Any) -> str:
    return render_page(summarise(day), [log.plots for log in day.logs if log.plots is not None], **more)


@pytest.fixture(scope="module")
def page() -> str:
    return page_of(examples.day())


class Reader(HTMLParser):
    """Tags in order with their attributes, and the text outside scripts and styles."""

    VOID = frozenset({"meta", "link", "br", "img", "input", "hr"})

    def __init__(self, html: str) -> None:
        super().__init__()
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.text = ""
        self.open: list[str] = []
        self.crossed: list[str] = []
        self.feed(html)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))
        if tag not in self.VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))

    def handle_endtag(self, tag: str) -> None:
        if not self.open or self.open.pop() != tag:
            self.crossed.append(tag)

    def handle_data(self, data: str) -> None:
        if not self.open or self.open[-1] not in ("script", "style"):
            self.text += data + " "


@pytest.fixture(scope="module")
def read(page: str) -> Reader:
    return Reader(page)


def words_of(reader: Reader) -> str:
    return " ".join(reader.text.split())


def test_every_element_is_closed_and_ids_are_unique(read: Reader) -> None:
    assert read.crossed == []
    assert read.open == []
    ids = [attributes["id"] for _, attributes in read.tags if "id" in attributes]
    assert len(ids) == len(set(ids))


def test_every_link_of_the_page_leads_to_a_place_on_it(read: Reader) -> None:
    ids = {attributes.get("id") for _, attributes in read.tags}
    links = [attributes["href"] for tag, attributes in read.tags if tag == "a"]
    assert len(links) > 10
    assert [link for link in links if link is None or link[0] != "#" or link[1:] not in ids] == []


def test_nothing_on_the_page_is_fetched(read: Reader) -> None:
    for tag, attributes in read.tags:
        assert "src" not in attributes, tag
        assert tag not in ("iframe", "object", "embed", "base", "form")
        if tag == "link":
            assert attributes["href"] == "data:,"
    policy = next(
        a["content"] for t, a in read.tags if t == "meta" and a.get("http-equiv") == "Content-Security-Policy"
    )
    assert policy is not None
    assert policy.startswith("default-src 'none';")


def test_foreign_text_stays_text(page: str, read: Reader) -> None:
    assert "<script>alert" not in page
    assert words_of(read).count("<script>alert('x')</script> [red]bold[/red] \\x1b[31mred") >= 3
    assert [c for c in page.replace(plotly_js(), "") if not c.isprintable() and c != "\n"] == []
    assert sum(tag == "script" for tag, _ in read.tags) == 3


def test_the_page_with_plotly_stays_below_eight_megabytes(page: str) -> None:
    assert page.count(plotly_js()) == 1
    assert len(page.encode()) < 8_000_000


def test_the_same_day_gives_the_same_page(page: str) -> None:
    assert page_of(examples.day()) == page


def test_the_page_says_what_the_table_says(read: Reader) -> None:
    text = words_of(read)
    for said in (
        "3 flights, 3 h 13 min: 1 warning, 5 cautions, 1 advisory.",
        "ZZ-NMA in flight 1, manoeuvring: load factor reached 6.24 g (95 %: 6.12 to 6.37 g) against a limit of 6.00 g",
        "ZZ-NMA in flight 2, manoeuvring: load factor fell to -3.06 g",
        "The samples stayed inside; the true value may not have.",
        "no column looks like time",
        "no limits known for this aeroplane",
        "Flaps-extended speed: no flap channel",
        "1 sample rejected (spike)",
        "1 event of lower certainty not shown: 1 caution (doubtful).",
        "at least 8.90",
        "not sized, the channel is too slow for this peak",
        "local 11:15:43.0 +02:00",
        "accelerometer calibrated 2031-01-10",
        examples.digest("e1"),
        examples.digest("a1"),
        "905 to 880 kg (loading sheet and fuel used)",
        "mass between 640 and 960 kg (unknown)",
        "no limit",
        "Release reference",
        "rules airframe e1e1e1e1e1e1e1e1; aircraft aircraft/larkspur.yaml e2e2e2e2e2e2e2e2; --mass 900 kg",
    ):
        assert said in text, said
    for caution in summarise(examples.empty_day())["cautions"]:
        assert text.count(caution) == 1


def test_there_is_one_sheet_for_each_inspection(read: Reader) -> None:
    sheets = [attributes for tag, attributes in read.tags if tag == "article" and attributes.get("class") == "sheet"]
    assert len(sheets) == len(summarise(examples.day())["inspections"]) == 3


def test_every_severity_has_word_and_shape_beside_its_colour(read: Reader, page: str) -> None:
    for severity in ("advisory", "caution", "warning"):
        assert re.search(
            rf'<span class="badge {severity}"><svg class="mark {severity}".*?</svg> {severity}</span>', page
        )
    assert len({svg.mark(severity).split("<", 2)[2] for severity in ("advisory", "caution", "warning")}) == 3


def test_a_clean_a_failed_and_an_empty_day_have_pages_that_do_not_read_as_cleared() -> None:
    assert "no event in what could be assessed" in words_of(Reader(page_of(examples.clean_day())))
    assert "No log could be read, so nothing was assessed." in words_of(Reader(page_of(examples.empty_day())))
    failed = DayOutcome((examples.failed(),), "")
    assert "No log could be read, so nothing was assessed." in words_of(Reader(page_of(failed)))


def test_a_page_without_figures_carries_no_plotly() -> None:
    assert len(page_of(examples.clean_day())) < 60_000


def test_thousands_of_events_keep_a_row_each_but_not_a_card_each() -> None:
    reader = Reader(page_of(examples.long_day(1500)))
    rows = sum(tag == "span" and (a.get("class") or "").startswith("badge") for tag, a in reader.tags)
    cards = sum(tag == "article" and (a.get("class") or "").startswith("card") for tag, a in reader.tags)
    assert cards == MOST_CARDS
    assert rows == 1500 + cards + 1  # and one on the sheet
    assert "1300 less severe events have no card here" in words_of(reader)
    # the cards that stay are the worst ones
    severe = [a.get("class") for t, a in reader.tags if t == "article" and (a.get("class") or "").startswith("card")]
    assert severe == ["card warning"] * MOST_CARDS


def test_the_same_content_scanned_twice_still_gives_unique_anchors() -> None:
    from dataclasses import replace

    log = examples.aerobatic()
    reader = Reader(page_of(DayOutcome((log, replace(log, path="copy.csv")), "")))
    ids = [attributes["id"] for _, attributes in reader.tags if "id" in attributes]
    assert len(ids) == len(set(ids))


def test_the_data_of_the_plots_cannot_leave_its_script_element(page: str) -> None:
    text = page.split('<script type="application/json" id="plot-data">')[1].split("</script>")[0]
    assert "<" not in text
    data = json.loads(text)
    assert {"vn-0", "spectrum"} < set(data)
    assert any(name.startswith("e-") for name in data)
    assert any(name.startswith("u-") for name in data)


def test_metric_units_reach_page_and_figures() -> None:
    text = page_of(examples.day(), units="metric")
    assert "324.7" in words_of(Reader(text))
    data = json.loads(text.split('id="plot-data">')[1].split("</script>")[0])
    assert data["vn-0"]["layout"]["xaxis"]["title"]["text"] == "equivalent airspeed, km/h"


def test_the_floor_hides_and_counts() -> None:
    text = words_of(Reader(page_of(examples.day(), certainty_floor="established")))
    assert "5 events of lower certainty not shown: 1 caution (likely), 2 caution (possible)" in text


def test_envelope_and_spectrum_have_pages_of_their_own() -> None:
    envelope = Reader(render_envelope("ZZ-NMA <V-n>", examples.vn_plot(), [("corner", "6 g at 129 kt")]))
    assert "ZZ-NMA <V-n>" in envelope.text
    assert "6 g at 129 kt" in envelope.text
    plots = examples.aerobatic().plots
    assert plots is not None
    assert plots.spectrum is not None
    spectrum = Reader(render_spectrum("Spectrum", [("ZZ-NMA", plots.spectrum)], []))
    for reader in (envelope, spectrum):
        assert reader.crossed == []
        assert "This informs; it releases no aeroplane." in reader.text


def test_a_declared_quantity_can_be_drawn() -> None:
    from dataclasses import replace

    log = examples.aerobatic()
    event = replace(log.findings.events[1], quantity="oil_temperature", context={})
    plot = examples.plot_of(event)
    assert log.plots is not None
    known = {"oil_temperature": "degC"}
    log = replace(
        log,
        declared=known,
        findings=replace(log.findings, events=(event,), undecided=()),
        plots=replace(log.plots, events=(plot,), declared=known),
    )
    made = summarise(DayOutcome((log,), ""))
    assert made["recordings"][0]["events"][0]["peak"]["unit"] == "degC"
    assert "oil temperature" in words_of(Reader(page_of(DayOutcome((log,), ""))))


@given(
    st.lists(st.one_of(st.floats(-1e6, 1e6), st.just(float("nan"))), max_size=400),
    st.integers(3, 60),
)
def test_thinning_keeps_every_extreme_the_ends_and_the_gaps(values: list[float], most: int) -> None:
    array = np.array(values, dtype=np.float64)
    time = np.arange(len(array), dtype=np.float64)
    thin_time, thin = figures.thin(time, array, most)
    assert len(thin) <= most + 4 or len(thin) == len(array)
    assert np.all(np.diff(thin_time) > 0)
    if np.isfinite(array).any():
        assert np.nanmin(thin) == np.nanmin(array)
        assert np.nanmax(thin) == np.nanmax(array)
    if len(array):
        assert thin_time[0] == time[0]
        assert thin_time[-1] == time[-1]
    assert np.isnan(array).any() == np.isnan(thin).any()


@given(st.floats(-1e6, 1e6), st.floats(1e-6, 1e6), st.integers(2, 9))
def test_ticks_are_round_and_inside(low: float, span: float, most: int) -> None:
    assume(span >= 1e-8 * abs(low))  # a range that floats still tell apart
    found = svg.ticks((low, low + span), most)
    assert len(found) <= most + 1
    assert all(low - 1e-6 * span <= tick <= low + span * (1 + 1e-6) for tick in found)


def test_the_density_of_flown_points_shows_a_point_that_was_met_once() -> None:
    plot = examples.vn_plot()
    speed = np.append(plot.speed, 100.0)
    load = np.append(plot.load_factor, 7.7)
    from dataclasses import replace

    heat = figures.vn(replace(plot, speed=speed, load_factor=load))["data"][0]
    assert heat["type"] == "heatmap"
    cells = [value for row in heat["z"] for value in row if value is not None]
    assert min(cells) > 0.0
    assert sum(int(n) for row in heat["text"] for n in row if n) == len(speed)
    top = [value for value in heat["z"][-1] if value is not None]
    assert len(top) == 1


def test_a_ladder_keeps_its_labels_apart_and_points_at_an_open_end() -> None:
    event = next(
        event
        for event in summarise(DayOutcome((examples.aerobatic(),), ""))["recordings"][0]["events"]
        if event["severity"] == "warning"
    )
    drawn = svg.ladder(event)
    spots = [float(y) for y in re.findall(r'<text x="150" y="([\d.]+)"', drawn)]
    assert len(spots) == 3
    assert min(b - a for a, b in itertools.pairwise(spots)) >= 14.9
    assert '<path class="whisker"' in drawn
    assert 'aria-label="Peak 8.98 g on the ladder of levels: warning 6.60 g' in drawn


def test_a_log_without_anything_still_has_a_page() -> None:
    text = words_of(Reader(page_of(DayOutcome((LogOutcome("a.csv"),), ""))))
    assert "No flight." in text


def test_the_row_of_an_event_names_the_level_that_its_certainty_speaks_of(page: str) -> None:
    # 8.98 g against a limit of 6.00 g is a warning from 6.60 g on; what is at its limit's own level needs no word
    rows = re.findall(r'data-name="limit">(.*?)</td>', page)
    assert any(row.startswith("6.00 g") and "warning from 6.60 g" in row for row in rows)
    assert not any("caution from 6.00 g" in row for row in rows)
