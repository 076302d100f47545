"""The page: one self-contained HTML file of a day, to read, to keep and to print; it asks the network for nothing."""

from __future__ import annotations

import importlib.resources
import json
from collections.abc import Iterable, Mapping, Sequence
from functools import lru_cache
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from exceed.core.outcome import EventPlot, LogPlots, SpectrumPlot, VnPlot
from exceed.errors import OutputError, Problem
from exceed.report import figures, svg
from exceed.report.arrange import severity_order
from exceed.report.pageview import View
from exceed.report.sheets import sheets
from exceed.report.show import find_zone, visible

if TYPE_CHECKING:
    from jinja2 import Environment

Dict = dict[str, Any]
_TEMPLATES = Path(__file__).parent / "templates"
# a card is some 10 kB, and nobody reads more; the table of events and the JSON hold them all
MOST_CARDS = 200
_MOST_ROWS = 5000


def render_page(
    summary: Dict,
    plots: Iterable[LogPlots] = (),
    *,
    units: str = "trade",
    certainty_floor: str = "possible",
    time_zone: str | None = None,
) -> str:
    """The whole page as HTML text.

    Parameters
    ----------
    summary : the dict of `exceed/summary/1`; every figure on the page comes from it
    plots : the stretches to draw, found by the log's path and by rule and extreme row; what is missing is not drawn
    units, certainty_floor, time_zone : as for the table
    """
    view = View(summary, units, find_zone(time_zone or summary.get("time_zone")), certainty_floor)
    by_path = {log.path: log for log in plots}
    drawn = {path: _by_event(log) for path, log in by_path.items()}
    events, undecided = view.groups("events"), view.groups("undecided")
    data: dict[str, Dict] = {}
    rows = [row for group in events for row in group["rows"]]
    open_rows = [row for group in undecided for row in group["rows"]]
    order = sorted(rows, key=_worst_first)
    carded = [*order[:MOST_CARDS], *open_rows[: max(MOST_CARDS - len(order), 50)]]
    for row in carded:
        path, event = row["recording"]["path"], row["event"]
        plot = drawn.get(path, {}).get((event["rule"], event["row"], event["quantity"]))
        _card(view, row, plot, by_path[path].declared if plot is not None else {}, data)
    shown_rows = _cut(events, _MOST_ROWS)
    vn = _vn(view, by_path, data)
    spectra = [
        (view.owner(recording) + f", {recording['path']}", by_path[recording["path"]].spectrum)
        for recording in view.recordings
        if recording["path"] in by_path and by_path[recording["path"]].spectrum is not None
    ]
    if spectra:
        data["spectrum"] = figures.spectrum([(name, plot) for name, plot in spectra if plot is not None])
    return (
        _environment()
        .get_template("page.html.j2")
        .render(
            view=view,
            summary=summary,
            title=_title(summary),
            verdict=view.verdict(),
            fleet=view.fleet(),
            events=shown_rows,
            rows_left=max(len(rows) - _MOST_ROWS, 0),
            undecided=undecided,
            cards=[row for row in rows if "card" in row],
            open_cards=[row for row in open_rows if "card" in row],
            cards_left=sum("card" not in row for row in [*rows, *open_rows]),
            hidden=view.hidden(),
            flights=view.flights(),
            vn=vn,
            has_spectrum=bool(spectra),
            spectrum_notes=list(dict.fromkeys(plot.note for _, plot in spectra if plot is not None and plot.note)),
            sheets=sheets(view),
            assessment=view.assessment(),
            **_static(data),
        )
    )


def _worst_first(row: Dict) -> tuple[Any, ...]:
    return severity_order(row["event"])


def _cut(groups: Sequence[Dict], most: int) -> list[Dict]:
    kept = []
    for group in groups:
        rows = group["rows"][:most]
        most -= len(rows)
        if rows:
            kept.append({**group, "rows": rows})
    return kept


def _card(view: View, row: Dict, plot: EventPlot | None, declared: Mapping[str, str], data: dict[str, Dict]) -> None:
    from markupsafe import Markup

    event, recording = row["event"], row["recording"]
    undecided = row["anchor"].startswith("u")
    card: Dict = {
        "sentence": view.sentence(recording, event, undecided=undecided),
        "values": view.values(recording, event),
        "context": view.context(event),
        "ladder": Markup(svg.ladder(event, view.system)),
        "samples": "",
        "more": [],
    }
    if plot is not None:
        zero = event["peak"]["time_s"]
        scale, _ = figures.form_of(event["quantity"], declared, "trade")

        def stretch(series: Any) -> Any:
            if series is None or len(series.time) == 0:
                return None
            time, values = figures.thin(series.time - zero, (series.values - scale.offset) / scale.factor, 400)
            return np.asarray(time), np.asarray(values)

        points = stretch(plot.samples)
        if points is not None:
            drawn = svg.samples(event, points, stretch(plot.estimate), stretch(plot.limit), view.system)
            card["samples"] = Markup(drawn)
            data[row["anchor"]] = figures.channels(plot, zero, declared, view.system)
            card["more"] = [series.quantity for series in plot.more]
    row["card"] = card


def _by_event(log: LogPlots) -> dict[tuple[str, int, str], EventPlot]:
    return {(plot.rule, plot.row, plot.samples.quantity): plot for plot in log.events}


def _vn(view: View, plots: Mapping[str, LogPlots], data: dict[str, Dict]) -> list[Dict]:
    found: list[Dict] = []
    for recording in view.recordings:
        log = plots.get(recording["path"])
        if log is None or log.vn is None:
            continue
        name = f"vn-{len(found)}"
        data[name] = figures.vn(log.vn, log.declared, view.system)
        title = f"{view.owner(recording)}, {recording['path']}"
        found.append({"id": name, "title": title, "note": log.vn.note, "points": len(log.vn.speed)})
    return found


def render_envelope(title: str, plot: VnPlot, table: Sequence[tuple[str, str]], *, units: str = "trade") -> str:
    """A page with one V-n diagram and its corners as rows (name, value), for `exceed envelope --html`."""
    return _figure_page(title, figures.vn(plot, None, units), plot.note, table)


def render_spectrum(title: str, plots: Sequence[tuple[str, SpectrumPlot]], table: Sequence[tuple[str, str]]) -> str:
    """A page with the level crossings of load factor and a table, for `exceed spectrum --html`."""
    return _figure_page(title, figures.spectrum(plots), "; ".join(plot.note for _, plot in plots if plot.note), table)


def _figure_page(title: str, figure: Dict, note: str, table: Sequence[tuple[str, str]]) -> str:
    from exceed.core.findings import CAUTIONS

    template = _environment().get_template("figure.html.j2")
    return template.render(title=title, note=note, table=table, cautions=CAUTIONS, **_static({"figure": figure}))


def _title(summary: Dict) -> str:
    days = sorted(
        {row["clock"]["start"][:10] for row in summary["recordings"] if row["clock"] and row["clock"]["start"]}
    )
    span = "" if not days else days[0] if len(days) == 1 else f"{days[0]} to {days[-1]}"
    return ", ".join(part for part in (summary["operator"] or "Flights", span) if part)


def _static(data: dict[str, Dict]) -> Dict:
    """Style, scripts and data as they go into the page, and the hashes by which it admits its own scripts."""
    from markupsafe import Markup

    # `<` inside a script element would end it or open a comment; in JSON it may be written as an escape
    text = json.dumps(data, allow_nan=False, separators=(",", ":")).replace("<", "\\u003c")
    return {
        "css": Markup(_file("page.css")),
        "script": Markup(_file("page.js")),
        "plotly": Markup(plotly_js()) if data else "",
        "data": Markup(text),
    }


@lru_cache(maxsize=4)
def _file(name: str) -> str:
    return (_TEMPLATES / name).read_text(encoding="utf-8")


@lru_cache(maxsize=1)
def plotly_js() -> str:
    """plotly.js as the Python package ships it, safe inside a script element."""
    try:
        text = (importlib.resources.files("plotly") / "package_data" / "plotly.min.js").read_text(encoding="utf-8")
    except (ModuleNotFoundError, FileNotFoundError) as error:
        problem = "plotly is not installed, or without its script"
        raise OutputError(Problem("page", problem, "the plotly package", "python -m pip install plotly")) from error
    return text.replace("</script", "<\\/script").replace("<!--", "<\\!--")


@lru_cache(maxsize=1)
def _environment() -> Environment:
    from jinja2 import Environment, FileSystemLoader, StrictUndefined

    def readable(value: Any) -> Any:
        # what is no markup of ours is shown, control characters and all, before it is escaped
        if value is None:
            return ""
        return visible(value) if isinstance(value, str) and not hasattr(value, "__html__") else value

    environment = Environment(
        loader=FileSystemLoader(_TEMPLATES),
        autoescape=True,
        undefined=StrictUndefined,
        finalize=readable,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    from markupsafe import Markup

    environment.globals["mark"] = lambda severity: Markup(svg.mark(severity))
    environment.filters["words"] = lambda name: name.replace("_", " ")
    environment.filters["digest"] = lambda text: text or "not known"
    return environment
