"""Interactive figures as plain data for plotly.js: further channels of an event, V-n diagram, spectrum.

Colours are written as `$name`; the page's script puts in those of the light, dark or print palette.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from exceed.core.outcome import EventPlot, SpectrumPlot, VnPlot
from exceed.report.show import Shown, shown, visible, words
from exceed.report.summary import Scale

Dict = dict[str, Any]
Array = NDArray[np.float64]
MOST_POINTS = 1200
_MOST_DOTS = 3000
_BINS = (90, 60)
_DASHES = {"stall": "solid", "load factor": "solid", "speed": "dash", "gust": "dot"}


def thin(time: Array, values: Array, most: int = MOST_POINTS) -> tuple[Array, Array]:
    """Fewer points without losing an extreme: the smallest and the largest of each bucket, in their order.

    time, values : (n,). What is not finite stays as one gap in its bucket. Series of at most `most` stay as they are.
    """
    count = len(time)
    if count <= most:
        return time, values
    edges = np.unique(np.linspace(0, count, max(most // 3, 1) + 1).astype(np.int64))
    kept: list[int] = [0]
    for first, last in zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True):
        part = values[first:last]
        fine = np.flatnonzero(np.isfinite(part))
        if len(fine) < len(part):
            kept.append(first + int(np.flatnonzero(~np.isfinite(part))[0]))
        if len(fine):
            kept += [first + int(fine[np.argmin(part[fine])]), first + int(fine[np.argmax(part[fine])])]
    kept.append(count - 1)
    rows = np.unique(np.array(kept))
    return time[rows], values[rows]


def _rounded(values: Array, digits: int) -> Array:
    """Rounded where there is something to round: numpy scales first, and makes 1e308 infinite."""
    small = np.abs(values) < 1e15
    return np.where(small, np.round(np.where(small, values, 0.0), digits), values)


def plain(values: Array, digits: int) -> list[float | None]:
    """A JSON-ready list: rounded, None where not finite."""
    return [
        value if finite else None
        for value, finite in zip(_rounded(values, digits).tolist(), np.isfinite(values).tolist(), strict=True)
    ]


def form_of(quantity: str, declared: Mapping[str, str], system: str) -> tuple[Scale, Shown]:
    """How SI values of a quantity come to the shown unit, and that to the reader's system."""
    scale = Scale(quantity, declared)
    return scale, shown(quantity, scale.unit, system)


def shown_values(values: Array, quantity: str, declared: Mapping[str, str], system: str) -> Array:
    """SI values as shown."""
    scale, form = form_of(quantity, declared, system)
    return ((values - scale.offset) / scale.factor) * form.factor + form.offset


def channels(plot: EventPlot, peak_time: float, declared: Mapping[str, str], system: str) -> Dict:
    """The event's samples and its further channels, one below the other on one time axis."""
    series = [plot.samples, *plot.more]
    data: list[Dict] = []
    layout: Dict = {"height": 60 + 130 * len(series), "margin": {"l": 60, "r": 12, "t": 24, "b": 40}, "annotations": []}
    share = 1.0 / len(series)
    for turn, row in enumerate(series):
        _, form = form_of(row.quantity, declared, system)
        time, values = thin(row.time, shown_values(row.values, row.quantity, declared, system))
        tail = "" if turn == 0 else str(turn + 1)
        name = visible(words(row.quantity))
        data.append(
            {
                "type": "scatter",
                "mode": "lines+markers" if turn == 0 else "lines",
                "name": name,
                "x": plain(time - peak_time, 3),
                "y": plain(values, form.decimals + 1),
                "yaxis": f"y{tail}",
                "line": {"width": 1.2, "color": "$line"},
                "marker": {"size": 4, "color": "$line"},
                "hovertemplate": f"%{{x:.2f}} s: %{{y}} {form.unit}<extra></extra>",
                "showlegend": False,
            }
        )
        high = 1.0 - turn * share
        layout[f"yaxis{tail}"] = {"domain": [high - 0.78 * share, high - 0.02 * share], "title": {"text": form.unit}}
        layout["annotations"].append(
            {"text": name, "xref": "paper", "yref": "paper", "x": 0, "y": high, "showarrow": False, "yanchor": "bottom"}
        )
    layout["xaxis"] = {"title": {"text": "s from the peak"}, "anchor": f"y{len(series)}" if len(series) > 1 else "y"}
    return {"data": data, "layout": layout}


def vn(plot: VnPlot, declared: Mapping[str, str] | None = None, system: str = "trade") -> Dict:
    """The V-n diagram: flown points (a density where they are many) inside the envelope."""
    known = declared or {}
    _, speed_form = form_of(plot.speed_kind, known, system)
    speed = shown_values(np.asarray(plot.speed, dtype=np.float64), plot.speed_kind, known, system)
    load = np.asarray(plot.load_factor, dtype=np.float64)
    fine = np.isfinite(speed) & np.isfinite(load)
    speed, load = speed[fine], load[fine]
    data: list[Dict] = []
    if len(speed) > _MOST_DOTS:
        data.append(_density(speed, load))
    elif len(speed):
        data.append(
            {
                "type": "scatter",
                "mode": "markers",
                "name": "flown",
                "x": plain(speed, 1),
                "y": plain(load, 3),
                "marker": {"size": 3, "color": "$line", "opacity": 0.6},
                "hovertemplate": f"%{{x}} {speed_form.unit}, %{{y}} g<extra></extra>",
            }
        )
    for line in plot.envelope:
        data.append(
            {
                "type": "scatter",
                "mode": "lines",
                "name": visible(line.label),
                "x": plain(shown_values(line.speed, plot.speed_kind, known, system), 1),
                "y": plain(line.load_factor, 3),
                "line": {"color": "$ink", "width": 2, "dash": _DASHES.get(line.kind, "dashdot")},
                "hovertemplate": f"%{{x}} {speed_form.unit}, %{{y}} g<extra>{_no_tags(line.label)}</extra>",
            }
        )
    layout = {
        "height": 440,
        "margin": {"l": 56, "r": 12, "t": 12, "b": 60},
        "xaxis": {"title": {"text": f"{words(plot.speed_kind)}, {speed_form.unit}"}, **_room(data, "x", 0.0)},
        "yaxis": {"title": {"text": "load factor, g"}, **_room(data, "y", None)},
        "legend": {"orientation": "h", "y": 1.02, "yanchor": "bottom"},
        "showlegend": True,
    }
    return {"data": data, "layout": layout}


def _room(data: list[Dict], axis: str, least: float | None) -> Dict:
    """A range with air about it, so that a boundary does not lie on the frame; nothing where there is no value."""
    values = [value for row in data for value in row[axis] if value is not None]
    if least is not None:
        values.append(least)
    if len(values) < 2 or max(values) == min(values):
        return {}
    air = 0.05 * (max(values) - min(values))
    return {"range": [round(min(values) - air, 3), round(max(values) + air, 3)]}


def _no_tags(text: str) -> str:
    """plotly reads some HTML in its texts."""
    return visible(text).replace("<", "&lt;").replace(">", "&gt;").replace("%{", "% {")


def _density(speed: Array, load: Array) -> Dict:
    counts, x_edges, y_edges = np.histogram2d(speed, load, bins=_BINS)
    cells = counts.T
    # a cell visited once must still be seen: the scale is logarithmic, and an empty cell is a hole
    shade = [[None if n == 0 else round(float(np.log10(n) + 0.3), 3) for n in row] for row in cells.tolist()]
    return {
        "type": "heatmap",
        "name": "flown",
        "x": plain((x_edges[:-1] + x_edges[1:]) / 2.0, 2),
        "y": plain((y_edges[:-1] + y_edges[1:]) / 2.0, 4),
        "z": shade,
        "text": [["" if n == 0 else str(int(n)) for n in row] for row in cells.tolist()],
        "colorscale": [[0, "$density0"], [1, "$density1"]],
        "showscale": False,
        "hoverongaps": False,
        "hovertemplate": "%{text} samples near %{x:.0f}, %{y:.2f} g<extra></extra>",
    }


def spectrum(plots: Sequence[tuple[str, SpectrumPlot]]) -> Dict:
    """Level crossings of load factor per flight hour, one line a log or aeroplane."""
    data = []
    for turn, (name, plot) in enumerate(plots):
        rate = np.where(np.asarray(plot.per_hour) > 0.0, plot.per_hour, np.nan)
        data.append(
            {
                "type": "scatter",
                "mode": "lines+markers",
                "name": visible(name),
                "x": plain(np.asarray(plot.level, dtype=np.float64), 3),
                "y": plain(rate, 5),
                "line": {"color": f"$series{turn % 4}", "dash": ("solid", "dash", "dot", "dashdot")[turn // 4 % 4]},
                "marker": {"symbol": turn % 8, "size": 6},
                "hovertemplate": "%{x} g: %{y} per hour<extra></extra>",
            }
        )
    layout = {
        "height": 400,
        "margin": {"l": 64, "r": 12, "t": 12, "b": 60},
        "xaxis": {"title": {"text": "load factor, g"}},
        "yaxis": {"title": {"text": "crossings per flight hour"}, "type": "log"},
        "legend": {"orientation": "h", "y": 1.02, "yanchor": "bottom"},
        "showlegend": True,
    }
    return {"data": data, "layout": layout}
