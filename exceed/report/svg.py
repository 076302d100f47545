"""Small drawings as inline SVG: marks of severity, the ladder of limit levels, the samples around a peak.

They need no script, print as they are, and take their colours from the page's style sheet by class names. Every text
in them is a number, a unit or a word of ours, except what `escape` has passed.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from html import escape
from typing import Any

import numpy as np
from numpy.typing import NDArray

from exceed.report.show import STATES, Shown, number, parting_decimals, shown

Dict = dict[str, Any]
Array = NDArray[np.float64]

# a shape a severity, so that colour may be lost
_SHAPES = {
    "advisory": '<circle cx="8" cy="8" r="6"/>',
    "caution": '<path d="M8 1.5 L15 14 H1 Z"/>',
    "warning": '<path d="M5 1.5 H11 L14.5 5 V11 L11 14.5 H5 L1.5 11 V5 Z"/>',
}


def mark(severity: str) -> str:
    """A severity's shape in its colour, hidden from screen readers since its word stands beside it."""
    return f'<svg class="mark {severity}" viewBox="0 0 16 16" aria-hidden="true">{_SHAPES[severity]}</svg>'


def ladder(event: Dict, system: str = "trade") -> str:
    """The limit levels as rungs, with the peak and its 95 % interval beside them. Empty for states."""
    quantity, peak = event["quantity"], event["peak"]
    if quantity in STATES or event["side"] == "is":
        return ""
    form = shown(quantity, peak["unit"], system)
    best = peak["estimate"] if peak["estimate"] is not None else peak["value"]
    rungs = [(level["severity"], level["limit"]) for level in event["levels"] if level["limit"] is not None]
    limit = event["limit"]["value"]
    if limit is not None and not any(math.isclose(limit, value) for _, value in rungs):
        rungs.append(("limit", limit))
    ends = [value for value in (best, peak["low"], peak["high"], *(value for _, value in rungs)) if value is not None]
    if best is None or not rungs:
        return ""
    decimals = parting_decimals(form, best, limit)
    top, bottom, height = 14.0, 176.0, 190
    place = _scale(min(ends), max(ends), bottom, top, margin=0.14)
    parts = ['<line class="axis" x1="92" x2="92" y1="6" y2="184"/>']
    rungs.sort(key=lambda rung: -rung[1])
    spots = _spread([place(value) for _, value in rungs], 15.0, 8.0, height - 6.0)
    for (severity, value), spot in zip(rungs, spots, strict=True):
        y = place(value)
        parts.append(f'<line class="rung {severity}" x1="64" x2="120" y1="{y:.1f}" y2="{y:.1f}"/>')
        parts.append(f'<path class="lead" d="M120 {y:.1f} L132 {spot:.1f}"/>')
        if severity in _SHAPES:
            parts.append(
                f'<g class="mark {severity}" transform="translate(134 {spot - 6:.1f}) scale(0.75)">'
                f"{_SHAPES[severity]}</g>"
            )
        text = f"{severity} {form.with_unit(value, decimals)}"
        parts.append(f'<text x="150" y="{spot + 4:.1f}">{escape(text)}</text>')
    parts += _whisker(92.0, place, best, peak["low"], peak["high"], height)
    parts.append(
        f'<text class="peak" x="58" y="{place(best) + 4:.1f}" text-anchor="end">{form.text(best, decimals)}</text>'
    )
    label = f"Peak {form.with_unit(best, decimals)} on the ladder of levels: " + ", ".join(
        f"{severity} {form.with_unit(value, decimals)}" for severity, value in rungs
    )
    return _svg("ladder", 280, height, label, parts)


def _whisker(x: float, place: Any, best: float, low: float | None, high: float | None, height: float) -> list[str]:
    parts = []
    if low is not None or high is not None:
        first = place(low) if low is not None else height - 4.0
        last = place(high) if high is not None else 4.0
        parts.append(f'<line class="whisker" x1="{x}" x2="{x}" y1="{first:.1f}" y2="{last:.1f}"/>')
        for end, y, way in ((low, first, -1.0), (high, last, 1.0)):
            if end is None:  # an open end is an arrow
                parts.append(
                    f'<path class="whisker" d="M{x - 5} {y + 7 * way:.1f} L{x} {y:.1f} L{x + 5} {y + 7 * way:.1f}"/>'
                )
            else:
                parts.append(f'<line class="whisker" x1="{x - 6}" x2="{x + 6}" y1="{y:.1f}" y2="{y:.1f}"/>')
    y = place(best)
    parts.append(f'<path class="best" d="M{x} {y - 6:.1f} L{x + 6} {y:.1f} L{x} {y + 6:.1f} L{x - 6} {y:.1f} Z"/>')
    return parts


def samples(
    event: Dict,
    points: tuple[Array, Array],
    curve: tuple[Array, Array] | None,
    limit: tuple[Array, Array] | None,
    system: str = "trade",
) -> str:
    """The samples around a peak as points, the estimate as a curve, the levels as lines.

    points, curve, limit : time in s from the peak, values in the unit of the event's peak (not yet metric).
    """
    form = shown(event["quantity"], event["peak"]["unit"], system)
    time, values = points[0], _convert(form, points[1])
    finite = np.isfinite(values) & np.isfinite(time)
    if not finite.any():
        return ""
    seen = [float(np.min(values[finite])), float(np.max(values[finite]))]
    line = None
    if curve is not None:
        line = curve[0], _convert(form, curve[1])
        ok = line[1][np.isfinite(line[1])]
        seen += [float(ok.min()), float(ok.max())] if len(ok) else []
    levels = [
        (level["severity"], value)
        for level in event["levels"]
        if (value := form.convert(level["limit"])) is not None
        and (level["beyond_s"] > 0.0 or level is event["levels"][0])
    ]
    ends = [*seen, *(value for _, value in levels)]
    span = max(ends) - min(ends)
    width, height, left, right, top, bottom = 420, 210, 46.0, 410.0, 12.0, 176.0
    x_of = _scale(float(np.min(time[finite])), float(np.max(time[finite])), left, right, margin=0.02)
    y_of = _scale(min(ends), max(ends), bottom, top, margin=0.08 if span else 1.0)
    parts = _axes(x_of, y_of, (left, right, top, bottom), form)
    levels.sort(key=lambda level: -level[1])
    spots = _spread([y_of(value) - 3.0 for _, value in levels], 12.0, top, bottom)
    for severity, value in levels:
        y = y_of(value)
        parts.append(f'<line class="level {severity}" x1="{left}" x2="{right}" y1="{y:.1f}" y2="{y:.1f}"/>')
    for (severity, _), spot in zip(levels, spots, strict=True):
        parts.append(f'<text class="small halo" x="{right}" y="{spot:.1f}" text-anchor="end">{severity}</text>')
    if limit is not None:
        parts.append(_path("limit-line", limit[0], _convert(form, limit[1]), x_of, y_of))
    if line is not None:
        parts.append(_path("curve", line[0], line[1], x_of, y_of))
    dots = "".join(
        f'<circle cx="{x_of(t):.1f}" cy="{y_of(v):.1f}" r="2.2"/>'
        for t, v in zip(time[finite].tolist(), values[finite].tolist(), strict=True)
    )
    parts.append(f'<g class="dots">{dots}</g>')
    about = number(time[finite][0], 1), number(time[finite][-1], 1)
    label = f"{len(time[finite])} samples from {about[0]} s to {about[1]} s about the peak"
    return _svg("samples", width, height, label, parts)


def _convert(form: Shown, values: Array) -> Array:
    return values * form.factor + form.offset


def _axes(x_of: Any, y_of: Any, box: tuple[float, float, float, float], form: Shown) -> list[str]:
    left, right, top, bottom = box
    parts = []
    for value in ticks(y_of.ends, 5):
        y = y_of(value)
        if top - 1 <= y <= bottom + 1:
            parts.append(f'<line class="grid" x1="{left}" x2="{right}" y1="{y:.1f}" y2="{y:.1f}"/>')
            parts.append(f'<text class="small" x="{left - 5}" y="{y + 4:.1f}" text-anchor="end">{_tick(value)}</text>')
    for value in ticks(x_of.ends, 7):
        x = x_of(value)
        if left - 1 <= x <= right + 1:
            parts.append(f'<line class="axis" x1="{x:.1f}" x2="{x:.1f}" y1="{bottom}" y2="{bottom + 4}"/>')
            parts.append(
                f'<text class="small" x="{x:.1f}" y="{bottom + 15}" text-anchor="middle">{_tick(value)}</text>'
            )
    parts.append(f'<path class="axis" d="M{left} {top} V{bottom} H{right}"/>')
    middle = (left + right) / 2
    parts.append(f'<text class="small" x="{middle}" y="{bottom + 30}" text-anchor="middle">s from the peak</text>')
    parts.append(f'<text class="small" x="4" y="{top - 2}">{escape(form.unit)}</text>')
    return parts


def _path(kind: str, time: Array, values: Array, x_of: Any, y_of: Any) -> str:
    steps, pen = [], "M"
    low, high = x_of.ends
    for t, v in zip(time.tolist(), values.tolist(), strict=True):
        if not (math.isfinite(t) and math.isfinite(v)) or t < low or t > high:
            pen = "M"
            continue
        steps.append(f"{pen}{x_of(t):.1f} {y_of(v):.1f}")
        pen = "L"
    return f'<path class="{kind}" d="{" ".join(steps)}"/>'


class _scale:  # noqa: N801 - used as a function
    """A linear map from values to places; `ends` are the values at its two ends, the margin included."""

    def __init__(self, low: float, high: float, first: float, last: float, margin: float) -> None:
        span = (high - low) or max(abs(high), 1.0)
        self.ends = (low - margin * span, high + margin * span)
        self._first = first
        self._slope = (last - first) / (self.ends[1] - self.ends[0])

    def __call__(self, value: float) -> float:
        return self._first + (value - self.ends[0]) * self._slope


def _spread(places: Sequence[float], gap: float, low: float, high: float) -> list[float]:
    """Places in ascending order moved apart to at least `gap`, inside [low, high] where that is possible."""
    spots = list(places)
    for turn in range(1, len(spots)):
        spots[turn] = max(spots[turn], spots[turn - 1] + gap)
    excess = spots[-1] - high if spots else 0.0
    if excess > 0.0:
        spots[-1] = high
        for turn in range(len(spots) - 2, -1, -1):
            spots[turn] = min(spots[turn], spots[turn + 1] - gap)
    return [max(spot, low) for spot in spots]


def ticks(ends: tuple[float, float], most: int) -> list[float]:
    """At most so many round values inside a range."""
    low, high = ends
    span = high - low
    if not span > 0.0 or not math.isfinite(span):
        return []
    raw = span / most
    power = 10.0 ** math.floor(math.log10(raw))
    step = next(power * m for m in (1.0, 2.0, 5.0, 10.0) if power * m >= raw * 0.999999)
    first = math.ceil(low / step - 1e-9)
    last = math.floor(high / step + 1e-9)
    return [turn * step for turn in range(first, last + 1)]


def _tick(value: float) -> str:
    return f"{value:.6g}" if value else "0"


def _svg(kind: str, width: int, height: int, label: str, parts: Iterable[str]) -> str:
    return (
        f'<svg class="{kind}" viewBox="0 0 {width} {height}" role="img" aria-label="{escape(label)}">'
        + "".join(parts)
        + "</svg>"
    )
