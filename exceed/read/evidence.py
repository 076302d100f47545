"""What data settle: unit, sign and datum of columns whose headings leave them open. The rest stays open."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from exceed.core.quantities import QUANTITIES
from exceed.core.recording import Array
from exceed.core.units import UNITS
from exceed.read.grid import Grid
from exceed.read.look import Column
from exceed.read.raw import RawChannel

SPEEDS = ("indicated_airspeed", "calibrated_airspeed", "equivalent_airspeed", "true_airspeed", "ground_speed")
ANGLES = ("bank_angle", "pitch_angle", "heading", "track_angle", "angle_of_attack", "sideslip_angle")
RATES = ("roll_rate", "pitch_rate", "yaw_rate", "turn_rate")
LOADS = ("load_factor", "longitudinal_load_factor", "lateral_load_factor")


@dataclass(slots=True, eq=False)
class Settled:
    """A raw channel whose quantity, unit, sign and datum stand; or, with `problem`, do not.

    SI value = figure * scale + offset. `forced`: a channels file says so.
    """

    raw: RawChannel
    quantity: str
    unit: str = ""
    scale: float = 1.0
    offset: float = 0.0
    sign: str | None = None
    datum: str | None = None
    found_by: str = ""
    reason: str = ""
    plausible: float = 1.0
    forced: bool = False
    problem: str = ""
    question: str = ""
    notes: list[str] = field(default_factory=list)

    @property
    def open(self) -> bool:
        return not self.unit and not self.problem

    def take(self, unit: str, why: str) -> None:
        """The unit stands, by the data."""
        self.unit = unit
        row = UNITS[unit]
        self.scale, self.offset = row.factor, row.offset
        self.found_by = "name and data"
        self.reason = f"{self.reason}; {why}"

    def flip(self, why: str) -> None:
        """The recorder's positive sense is the opposite of ours."""
        self.scale = -self.scale
        self.found_by = "name and data"
        self.reason = f"{self.reason}; {why}"


class Evidence:
    """All columns of a log side by side."""

    def __init__(self, settled: Sequence[Settled], time: Array) -> None:
        self.all = list(settled)
        self.grid = Grid(time, [one.raw for one in settled])
        self.duration = float(time[-1] - time[0]) if len(time) else 0.0

    def of(self, *quantities: str, known: bool = True) -> Settled | None:
        """The first column of one of the quantities; `known`: only if its unit stands."""
        for quantity in quantities:
            found = [
                one
                for one in self.all
                if one.quantity == quantity
                and not one.problem
                and not one.raw.column.alternatives
                and (one.unit or not known)
            ]
            if found:
                return max(
                    found, key=lambda one: (bool(one.raw.column.unit_text), one.raw.column.score, len(one.raw.values))
                )
        return None

    def figures(self, one: Settled) -> Array:
        """Finite figures as written at the grid's instants."""
        found = self.grid.value(one.raw)
        return found[np.isfinite(found)]

    def si(self, one: Settled) -> Array:
        """Values in SI at the grid's instants."""
        return self.grid.value(one.raw) * one.scale + one.offset

    def si_rate(self, one: Settled, wraps: bool = False) -> Array:
        """Rates in SI; angles that wrap take the short way."""
        turn = abs(2 * np.pi / one.scale) if wraps else 0.0
        return self.grid.rate(one.raw, turn) * one.scale

    def fresh(self) -> list[Settled]:
        """Columns whose unit is still open."""
        return [one for one in self.all if one.open]


def is_open(column: Column) -> bool:
    """Does a column leave something open that other columns may settle?"""
    quantity = column.quantity or ""
    # a sense can be the other way round even where the unit is written
    signs = (
        *LOADS,
        "bank_angle",
        "pitch_angle",
        "roll_rate",
        "pitch_rate",
        "yaw_rate",
        "turn_rate",
        "vertical_speed",
        "weight_on_wheels",
        "gear_down",
    )
    return (
        column.unit is None or bool(column.alternatives) or (quantity in signs and column.found_by != "channels file")
    )


def settle(raws: Sequence[RawChannel], time: Array, declared: Mapping[str, str]) -> list[Settled]:
    """Let units be settled one by the other until nothing more follows; then signs; then name what stays open."""
    from exceed.read import angles, loads, relations, senses

    made = [_begin(raw) for raw in raws]
    evidence = Evidence(made, time)
    for one in made:
        one.plausible = 1.0
    relations.alternatives(evidence)
    loads.settle(evidence)
    for _ in range(5):
        before = len(evidence.fresh())
        if not before:
            break
        for one in evidence.fresh():
            relations.settle_unit(evidence, one)
        if len(evidence.fresh()) == before:
            break
    loads.companions(evidence)
    for one in evidence.fresh():
        angles.last_resort(evidence, one)
    for one in evidence.fresh():
        _unsettled(one, declared)
    senses.settle(evidence)
    for one in made:
        _plausible(evidence, one)
    return made


def _begin(raw: RawChannel) -> Settled:
    column = raw.column
    one = Settled(
        raw,
        column.quantity or "",
        found_by=column.found_by,
        reason=column.reason,
        forced=column.found_by == "channels file",
    )
    if len(raw.values) == 0:
        one.problem = "holds no value"
        return one
    if column.unit is not None:
        one.unit = column.unit
        one.scale, one.offset = UNITS[column.unit].factor, UNITS[column.unit].offset
    if column.positive in ("down", "aft", "left", "up") and one.quantity:
        own = {"flap_angle": "down"}.get(one.quantity, "")
        words = QUANTITIES[one.quantity].positive if one.quantity in QUANTITIES else ""
        turned = column.positive == "down" if not own else column.positive == "up"
        if column.positive in ("aft", "left") or (column.positive in ("up", "down") and turned):
            one.scale = -one.scale
            one.offset = -one.offset
        one.sign = column.positive
        del words
    elif column.positive:
        one.sign = column.positive
    if column.datum:
        one.datum = column.datum
        if column.datum == "increment" and one.quantity == "load_factor":
            one.offset += 1.0
    return one


def _unsettled(one: Settled, declared: Mapping[str, str]) -> None:
    from exceed.read.recognise import QUESTIONS, kind_of

    units = one.raw.column.units
    *most, last = units or ("its unit",)
    told = f"{', '.join(most)} or {last}" if most else last
    one.problem = f"{told} cannot be told" if units else "its unit cannot be told"
    one.question = one.raw.column.question or QUESTIONS.get(kind_of(one.quantity, declared), "Which unit is it in?")


def _plausible(evidence: Evidence, one: Settled) -> None:
    """Share of instants at which the value could be flight."""
    row = QUANTITIES.get(one.quantity)
    if one.problem or row is None or row.discrete:
        return
    values = evidence.si(one)
    finite = values[np.isfinite(values)]
    if not len(finite):
        one.plausible = 0.0
        return
    low, high = sorted((row.unit.to_si(row.plausible[0]), row.unit.to_si(row.plausible[1])))
    one.plausible = float(np.mean((finite >= low) & (finite <= high)))
    if np.ptp(finite) == 0.0 and one.quantity in (*SPEEDS, *ANGLES, *LOADS, "pressure_altitude"):
        # a column that never moves is the poorer of two
        one.plausible *= 0.5
