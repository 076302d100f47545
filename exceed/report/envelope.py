"""The V-n diagram in words: `exceed/envelope/1` as JSON, corners and limits as tables, the diagram as a page."""

from __future__ import annotations

from typing import Any

import numpy as np

from exceed import __version__
from exceed.core.diagrams import Airspeeds, EnvelopeOutcome
from exceed.core.findings import CAUTIONS
from exceed.core.outcome import VnPlot
from exceed.report import figures
from exceed.report.layout import Column
from exceed.report.plots import Paper, Part, Sheet, render_paper, render_text
from exceed.report.show import shown
from exceed.report.summary import Scale

Dict = dict[str, Any]
FORMAT = "exceed/envelope/1"
KINDS = ("equivalent_airspeed", "calibrated_airspeed", "indicated_airspeed")
LETTERS = {
    "equivalent_airspeed": "EAS",
    "calibrated_airspeed": "CAS",
    "indicated_airspeed": "IAS",
    "true_airspeed": "TAS",
    "mach": "Mach",
}
_SPEED = Scale("indicated_airspeed", {})
_LOAD = Scale("load_factor", {})


def envelope_summary(found: EnvelopeOutcome) -> Dict:
    """The dict of `exceed/envelope/1`: trade units, named with each number; finite or None; the same every time."""
    aircraft = found.aircraft
    assumed = aircraft.limits == "assumed"
    gust_speed, height, angle, mass = (
        Scale(name, {}) for name in ("gust_velocity", "pressure_altitude", "flap_angle", "mass")
    )
    return {
        "format": FORMAT,
        "tool": {"name": "exceed", "version": __version__},
        "cautions": list(CAUTIONS),
        "aircraft": {
            "registration": aircraft.registration,
            "serial": aircraft.serial,
            "type": aircraft.type,
            "category": aircraft.category,
            "limits": aircraft.limits,
            "source": aircraft.source,
            "path": aircraft.path,
        },
        "conditions": {
            "mass": {"value": mass.value(found.mass), "unit": "kg", "source": found.mass_source},
            "pressure_altitude": {"value": height.value(found.pressure_altitude), "unit": "ft"},
            "flap_angle": {"value": angle.value(found.flaps), "unit": "deg"},
        },
        "corners": [
            {"name": row.name, **_kinds(row.speed), "load_factor_g": _LOAD.value(row.load_factor), "source": row.source}
            for row in found.corners
        ],
        "speeds": [
            {
                "symbol": row.symbol,
                "name": row.name,
                **_kinds(row.speed),
                "mach": row.mach,
                "given_as": row.given,
                "source": row.source,
                "notes": list(row.notes),
            }
            for row in found.speeds
        ],
        "limits": [
            {
                "condition": row.condition or None,
                "speed_from_kt": _SPEED.value(row.speed_from),
                "speed_to_kt": _SPEED.value(row.speed_to),
                "speed_kind": row.kind,
                "maximum_g": _LOAD.value(row.maximum),
                "minimum_g": _LOAD.value(row.minimum),
                "source": row.source,
                "assumed": assumed,
            }
            for row in found.limits
        ],
        "stall_speeds": [
            {"name": row.name, **_kinds(row.speed), "load_factor_g": _LOAD.value(row.load_factor), "source": row.source}
            for row in found.stalls
        ],
        "gusts": [
            {
                "gust_velocity_ft_s": gust_speed.value(row.velocity),
                "at": row.at,
                **_kinds(row.speed),
                "load_factor_up_g": _LOAD.value(row.up),
                "load_factor_down_g": _LOAD.value(row.down),
            }
            for row in found.gusts
        ],
        "missing": [{"what": what, "why": why} for what, why in found.missing],
        "notes": list(found.notes),
    }


def _kinds(speed: Airspeeds) -> Dict:
    values = (speed.equivalent, speed.calibrated, speed.indicated)
    return {f"{name}_kt": _SPEED.value(value) for name, value in zip(KINDS, values, strict=True)}


def render_envelope(summary: Dict, *, width: int | None = None, unicode: bool = True, units: str = "trade") -> str:
    """The diagram's figures as plain text. summary : of `envelope_summary`."""
    return render_text(_paper(summary, units), width=width, unicode=unicode)


def envelope_page(summary: Dict, found: EnvelopeOutcome, *, units: str = "trade") -> str:
    """The diagram and its figures as one HTML page."""
    drawn: dict[str, Dict] = {}
    if found.lines:
        plot = VnPlot("equivalent_airspeed", np.empty(0), np.empty(0), found.lines)
        drawn["envelope"] = _figure(figures.vn(plot, None, units), summary, units)
    return render_paper(_paper(summary, units, figure=bool(found.lines)), drawn)


def _figure(figure: Dict, summary: Dict, units: str) -> Dict:
    """The diagram with its corners marked, and room beyond the speed limit."""
    form = shown("equivalent_airspeed", "kt", units)
    rows = [row for row in summary["corners"] if row["equivalent_airspeed_kt"] is not None]
    speeds = [form.convert(row["equivalent_airspeed_kt"]) for row in rows]
    figure["data"].append(
        {
            "type": "scatter",
            "mode": "markers",
            "name": "corners",
            "x": speeds,
            "y": [row["load_factor_g"] for row in rows],
            "text": [row["name"] for row in rows],
            "marker": {"size": 7, "color": "$line"},
            "hovertemplate": f"%{{text}}: %{{x:.1f}} {form.unit}, %{{y}} g<extra></extra>",
        }
    )
    for line in figure["data"]:
        # one line among many in one colour: what is no boundary is thinner
        if line["mode"] == "lines" and "boundary" not in line["name"]:
            line["line"]["width"] = 1.2
    ends = [value for line in figure["data"] for value in line["x"] if value is not None]
    figure["layout"]["xaxis"]["range"] = [0.0, round(1.04 * max(ends), 1)]
    return figure


def _paper(summary: Dict, units: str, *, figure: bool = False) -> Paper:
    aircraft = summary["aircraft"]
    names = [aircraft["registration"] or "", aircraft["type"] or ""]
    named = " ".join(name for name in names if name)
    category = f"category {aircraft['category']}" if aircraft["category"] else ""
    title = "V-n diagram: " + (", ".join(text for text in (named, category) if text) or "aeroplane without a name")
    said = [_conditions(summary["conditions"], units)]
    mark = " (assumed)" if aircraft["limits"] == "assumed" else ""
    if aircraft["limits"] == "assumed":
        said.append(aircraft["source"])
    else:
        said.append(f"limits from {aircraft['path'] or 'its file'}; source: {aircraft['source'] or 'not stated'}")
    # in a category's diagram nothing has corners: the table says so by its absence among what is missing
    sheets = [
        _points("Corners", summary["corners"], units),
        _speeds(summary["speeds"], units),
        _limits(summary["limits"], units, mark),
        _points("Stall speeds, idle", summary["stall_speeds"], units),
        _gusts(summary["gusts"], units),
    ]
    caption = "equivalent airspeed against load factor; dotted: gusts from 1 g"
    part = Part("", (), (("envelope", caption),) if figure else (), tuple(sheet for sheet in sheets if sheet.rows))
    missing = tuple(f"{row['what']}: {row['why']}" for row in summary["missing"])
    lists = (("Not known", missing), ("Notes", tuple(summary["notes"])))
    return Paper(title, tuple(said), (part,), lists, tuple(summary["cautions"]))


def _conditions(conditions: Dict, units: str) -> str:
    mass, height, flaps = (conditions[name] for name in ("mass", "pressure_altitude", "flap_angle"))
    weight = "mass not known"
    if mass["value"] is not None:
        weight = f"{shown('mass', 'kg', units).with_unit(mass['value'])} ({mass['source']})"
    altitude = shown("pressure_altitude", "ft", units).with_unit(height["value"])
    angle = shown("flap_angle", "deg", units).with_unit(flaps["value"])
    setting = "flaps up" if abs(flaps["value"]) <= 1.0 else f"flaps {angle}"
    return f"at {weight}, pressure altitude {altitude}, {setting}"


def _speed_heads(units: str) -> tuple[Column, ...]:
    unit = shown("indicated_airspeed", "kt", units).unit
    # where there is no room IAS is what the needle shows and EAS what the diagram is drawn in
    drops = {"calibrated_airspeed": 2}
    return tuple(Column(f"{LETTERS[name]} {unit}", right=True, drop=drops.get(name, 0)) for name in KINDS)


def _speed_cells(row: Dict, units: str) -> tuple[str, ...]:
    form = shown("indicated_airspeed", "kt", units)
    return tuple(form.text(row[f"{name}_kt"]) for name in KINDS)


def _load(value: float | None) -> str:
    return shown("load_factor", "g").text(value)


def _key(source: str) -> str:
    """The last part of a fact's name, as the aircraft file has it; of Mach numbers the first."""
    group, _, name = source.rpartition(".")
    return group if group == "mach" else name


def _points(title: str, rows: list[Dict], units: str) -> Sheet:
    heads = (
        Column("point", least=16),
        *_speed_heads(units),
        Column("n g", right=True),
        Column("source", drop=1, least=8),
    )
    cells = tuple(
        (row["name"], *_speed_cells(row, units), _load(row["load_factor_g"]), _key(row["source"])) for row in rows
    )
    return Sheet(title, heads, cells)


def _speeds(rows: list[Dict], units: str) -> Sheet:
    heads = (Column("symbol"), *_speed_heads(units), Column("given as", drop=1), Column("speed", drop=3, least=18))
    cells, said = [], []
    for row in rows:
        given = LETTERS.get(row["given_as"] or "", "-")
        if row["mach"] is not None:
            given = f"Mach {row['mach']:.3f}"
        name = row["name"] if row["source"] != "computed" else "stall line meets limit (*)"
        cells.append((row["symbol"] or "-", *_speed_cells(row, units), given, name))
        if row["source"] == "computed":
            said.append(f"(*) {row['name']}")
        said += [f"{row['symbol'] or row['name']}: {text}" for text in row["notes"]]
    return Sheet("Speeds", heads, tuple(cells), tuple(said))


def _limits(rows: list[Dict], units: str, mark: str) -> Sheet:
    form = shown("indicated_airspeed", "kt", units)
    heads = (
        Column("holds", least=16),
        Column("max g", right=True),
        Column("min g", right=True),
        Column("source", drop=1),
    )
    cells = []
    for row in rows:
        letters = LETTERS.get(row["speed_kind"] or "", "")
        low, high = (
            "" if row[key] is None else f"{form.with_unit(row[key])} {letters}".strip()
            for key in ("speed_from_kt", "speed_to_kt")
        )
        where = "at all speeds" if not low and not high else f"up to {high}" if not low else f"above {low}"
        if low and high:
            where = f"above {low} up to {high}"
        holds = where
        if row["condition"]:
            holds = f"{row['condition']}, {where}" if low or high else row["condition"]
        cells.append((holds, _load(row["maximum_g"]), _load(row["minimum_g"]), row["source"] + mark))
    return Sheet(f"Limit load factors{mark}", heads, tuple(cells))


def _gusts(rows: list[Dict], units: str) -> Sheet:
    form = shown("gust_velocity", "ft/s", units)
    heads = (
        Column(f"gust {form.unit}", right=True),
        Column("at"),
        *_speed_heads(units),
        Column("up g", right=True),
        Column("down g", right=True),
    )
    cells = tuple(
        (
            form.text(row["gust_velocity_ft_s"]),
            row["at"],
            *_speed_cells(row, units),
            _load(row["load_factor_up_g"]),
            _load(row["load_factor_down_g"]),
        )
        for row in rows
    )
    return Sheet("Gusts, from 1 g", heads, cells)
