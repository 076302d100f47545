"""Which derivation gives which quantity: worked out from the channels and facts at hand, without looking at data.

For each quantity the first row whose inputs can be had without that quantity is taken, and then fixed, so that
inverse pairs may both stand in the table and nothing goes round in circles.
"""

from __future__ import annotations

import inspect
import re
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field, replace
from functools import lru_cache
from typing import Any

from exceed.core.quantities import QUANTITIES
from exceed.core.recording import GAP_INTERVALS, GAP_LEAST
from exceed.core.trace import TIME, Step
from exceed.derive.facts import Facts
from exceed.derive.table import DERIVATIONS, Derivation

RECORDED = "recorded_"
COMPUTED = ("width", "max_gap")
# facts that the first pass finds in the recording, and why they may be missing
FOUND_FACTS: dict[str, str] = {
    "airborne": "",
    "phases": "",
    "field_levels": "neither take-off nor landing is in the recording",
    "touchdown_windows": "no touchdown is in the recording",
    "touchdowns": "no touchdown is in the recording",
}
LOAD_FACTORS = ("load_factor", "longitudinal_load_factor", "lateral_load_factor")
# smoothing windows hold at least one sample either side of the slowest input
INTERVALS_EITHER_SIDE = 1.6


@lru_cache(maxsize=512)
def parameters(function: Callable[..., Any]) -> tuple[tuple[str, bool], ...]:
    """Names of a function's parameters, and whether each is optional."""
    return tuple(
        (name, row.default is not inspect.Parameter.empty)
        for name, row in inspect.signature(function).parameters.items()
    )


@dataclass(slots=True)
class Resolver:
    """Chooses and fixes steps. `intervals`: s between samples of each channel; `found`: facts of the first pass."""

    intervals: Mapping[str, float]
    facts: Facts
    found: Mapping[str, Any]
    preset: Mapping[str, Step] = field(default_factory=dict)  # series and constants made for the whole log
    rows: tuple[Derivation, ...] = DERIVATIONS
    steps: dict[str, Step] = field(default_factory=dict)
    missing: dict[str, str] = field(default_factory=dict)
    _by_quantity: dict[str, list[Derivation]] = field(default_factory=dict)
    _can: dict[frozenset[str], frozenset[str]] = field(default_factory=dict)

    def __post_init__(self) -> None:
        for row in self.rows:
            self._by_quantity.setdefault(row.quantity, []).append(row)

    def resolve(self, name: str) -> bool:
        """Fix a step for the quantity, and for all that it rests on; False (and why in `missing`) if there is none."""
        if self._fix(name, frozenset()):
            return True
        self.missing[name] = self._why(name)
        return False

    def _fix(self, name: str, without: frozenset[str]) -> bool:
        if name in self.steps:
            return True
        if name in self.preset:
            self.steps[name] = self.preset[name]
            return True
        ahead = without | {name}
        rows = self._by_quantity.get(name, [])
        for row in (row for row in rows if row.corrects):
            if self._take(row, ahead):
                return True
        if name in self.intervals:
            method = "accelerometer" if name in LOAD_FACTORS else "recorded"
            self.steps[name] = Step(name, method, None)
            return True
        return any(self._take(row, ahead) for row in rows if not row.corrects)

    def _take(self, row: Derivation, without: frozenset[str]) -> bool:
        if self._lacks(row, self._attainable(without)):
            return False
        inputs: dict[str, str] = {}
        bound: dict[str, Any] = {}
        assumed = [row.assumes] if row.assumes else []
        for name, optional in parameters(row.function):
            if name in COMPUTED:
                continue
            kind, target = self._target(name)
            if kind == "unneeded":
                continue
            if kind == "time":
                inputs[name] = TIME
            elif kind == "channel" and target in self.intervals:
                inputs[name] = f"recorded:{target}"
            elif kind == "quantity" and target not in without and self._fix(target, without):
                inputs[name] = target
            elif kind == "fact" and self._has_fact(name):
                bound[name] = self.facts.values.get(name, self.found.get(name))
            elif name in row.without:
                assumed.append(row.without[name])
            elif not optional:
                return False
        reach = 0.0
        if row.width:
            slowest = max((self._slowest(value) for value in inputs.values()), default=1.0)
            width = max(row.width, INTERVALS_EITHER_SIDE * slowest)
            names = {name for name, _ in parameters(row.function)}
            bound |= {"width": width} if "width" in names else {}
            bound |= {"max_gap": max(GAP_INTERVALS * slowest, GAP_LEAST)} if "max_gap" in names else {}
            reach = row.looks * width * (1.0 + 1e-5) + 1e-6
        self.steps[row.quantity] = Step(
            row.quantity, row.method, row.function, inputs, bound, reach, "; ".join(assumed) or None,
            row.uncertainty, row.one_sided, row.cap, None, row.source,
            tuple(inputs[name] for name in row.main if name in inputs), row.spread,
        )  # fmt: skip
        return True

    def _target(self, name: str) -> tuple[str, str]:
        """What a parameter stands for: (time | channel | quantity | fact | unneeded, name)."""
        if name == TIME:
            return "time", name
        if name.startswith(RECORDED):
            return "channel", name.removeprefix(RECORDED)
        if _aliased(name):
            target = self.facts.aliases.get(name)
            if target is None or (target == "flap_angle" and self.facts.flaps == "none"):
                return "unneeded", name
            return "quantity", target
        if name == "flap_angle" and self.facts.flaps == "none":
            return "unneeded", name
        if name in QUANTITIES:
            return "quantity", name
        return "fact", name

    def _has_fact(self, name: str) -> bool:
        return name in self.facts.values or self.found.get(name) is not None

    def _lacks(self, row: Derivation, attainable: frozenset[str]) -> list[str]:
        """What a row needs and cannot have."""
        lacking = []
        for name, optional in parameters(row.function):
            if name in COMPUTED:
                continue
            kind, target = self._target(name)
            if kind == "channel" and target not in self.intervals:
                lacking.append(f"{_words(target)} is not recorded")
            elif kind == "quantity" and target not in attainable and self._must(row, name, optional):
                lacking.append(f"no {_words(target)}")
            elif kind == "fact" and not optional and not self._has_fact(name):
                lacking.append(FOUND_FACTS.get(name) or self.facts.why_missing(name))
        if row.when is not None and (reason := row.when(self.intervals)):
            lacking.append(reason)
        return lacking

    @staticmethod
    def _must(row: Derivation, name: str, optional: bool) -> bool:
        """A quantity that a limit's rows ask for is needed, unless the row says what its lack means."""
        return not optional or (_aliased(name) and name not in row.without)

    def _attainable(self, without: frozenset[str]) -> frozenset[str]:
        """Everything that can be had when these quantities cannot: grown until nothing is added."""
        if without not in self._can:
            have = {name for name in (*self.intervals, *self.preset, *self.steps) if name not in without}
            grown = True
            while grown:
                grown = False
                for name, rows in self._by_quantity.items():
                    if name in have or name in without:
                        continue
                    if any(not self._lacks(row, frozenset(have)) for row in rows):
                        have.add(name)
                        grown = True
            self._can[without] = frozenset(have)
        return self._can[without]

    def _slowest(self, source: str) -> float:
        """Interval of the slowest channel that a source rests on."""
        if source == TIME:
            return 0.0
        if source.startswith("recorded:"):
            return self.intervals[source.removeprefix("recorded:")]
        step = self.steps[source]
        if step.function is None:
            return self.intervals.get(source, 0.0)
        return max((self._slowest(value) for value in step.inputs.values()), default=0.0)

    def _why(self, name: str) -> str:
        rows = self._by_quantity.get(name, [])
        if not rows:
            return "not recorded"
        attainable = self._attainable(frozenset({name}))
        lacking = [(len(found), found) for row in rows if (found := self._lacks(row, attainable))]
        if not lacking:
            return "not recorded"
        fewest = min(lacking, key=lambda pair: pair[0])[1]
        row = QUANTITIES.get(name)
        start = "not recorded, and cannot be derived: " if row is None or row.recorded else ""
        return start + "; ".join(dict.fromkeys(fewest))


def _aliased(name: str) -> bool:
    """Does a parameter stand for whatever quantity the aeroplane's tables ask for?"""
    return name.startswith(("limit_", "error_")) or name == "manoeuvring_over"


def base_name(name: str) -> str:
    """The quantity of a channel that is one of several, by index: engine_speed_2 -> engine_speed."""
    return name if name in QUANTITIES else re.sub(r"(_\d+)+$", "", name)


def _words(name: str) -> str:
    return name.replace("_", " ")


def closure(steps: Mapping[str, Step], names: Iterable[str]) -> set[str]:
    """The quantities that these rest on, themselves included."""
    found: set[str] = set()
    todo = [name for name in names if name in steps]
    while todo:
        name = todo.pop()
        if name in found:
            continue
        found.add(name)
        todo.extend(value for value in steps[name].inputs.values() if value in steps)
    return found


def leaves(steps: Mapping[str, Step], names: Iterable[str]) -> set[str]:
    """The channels that these quantities rest on."""
    found = set()
    for name in closure(steps, names):
        step = steps[name]
        if step.function is None and step.constant is None:
            found.add(name)
        found.update(value[9:] for value in step.inputs.values() if value.startswith("recorded:"))
    return found


def with_uncertainty(step: Step, uncertainty: float, assumes: str | None) -> Step:
    """The same step with a further standard uncertainty and assumption."""
    said = "; ".join(text for text in (step.assumes, assumes) if text) or None
    return replace(step, uncertainty=(step.uncertainty**2 + uncertainty**2) ** 0.5, assumes=said)
