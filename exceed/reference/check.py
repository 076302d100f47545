"""Compares our physics with the published check values: the same code for the tests and for users' machines."""

from __future__ import annotations

import math
from dataclasses import dataclass

from exceed.reference.computed import COMPUTED
from exceed.reference.computed_flight import CATEGORIES_COMPUTED, Answer, numbers
from exceed.reference.computed_records import RECORDED_COMPUTED
from exceed.reference.rows import Row, all_rows

# A published figure is printed with about ten digits; this much is rounding, whatever the row's tolerance
_ROUNDING = 1e-9

_NOT_USED = "stated figure of a rule that no function of ours uses"
_FACT = "stated figure of a recording rule, not used: a log shows its own"
# Quantities that nothing of ours computes, and why
STATED: dict[str, str] = {
    "handbook_radius_ft": "the handbook's rounded 11.26; ours is the exact constant (see exact_radius_constant)",
    "handbook_rate": "the handbook's rounded 1091; ours is the exact constant (see exact_rate_constant)",
    "standard_rate_bank_rule_of_thumb": "a rule of thumb that we do not use",
    "asymmetric_wing_share_23_normal": _NOT_USED,
    "asymmetric_wing_share_23_acrobatic": _NOT_USED,
    "vd_over_vc_min_23": _NOT_USED,
    "vc_over_vd_max_25": _NOT_USED,
    "upset_pull_up_load_factor": _NOT_USED,
    "vne_over_vdf_max_22": _NOT_USED,
    "vfe_over_vf_max_22": _NOT_USED,
    "vne_over_vd_max_23": _NOT_USED,
    "vs0_max_22_brakes_in_no_ballast": _NOT_USED,
    "vs0_max_22_brakes_in_with_ballast": _NOT_USED,
    "vlight_max_stall": _NOT_USED,
    "interval": _FACT,
    "resolution": _FACT,
}


@dataclass(frozen=True, slots=True)
class CheckResult:
    """One row compared. `deviation` is |got - expected| (NaN for words and lists, which must be equal); `how` says how
    the published value was had."""

    id: str
    quantity: str
    source: str
    expected: str
    got: str
    deviation: float
    tolerance: float
    passed: bool
    how: str
    unit: str = ""
    file: str = ""


@dataclass(frozen=True, slots=True)
class StatedRow:
    """A row that nothing of ours computes, with the reason."""

    id: str
    quantity: str
    source: str
    reason: str


def reason_not_computed(row: Row) -> str | None:
    """Why a row is listed rather than computed; None where it is computed."""
    if row.file == "events":
        return "describes a family of events, no figure to compute"
    if row.quantity in STATED:
        return STATED[row.quantity]
    if row.quantity.endswith("_category") and row.inputs["category"] not in CATEGORIES_COMPUTED:
        return "rotorcraft are not a category of ours"
    if row.quantity in ("accuracy", "range_min", "range_max"):
        return _reason_recorder(row)
    return None


def _reason_recorder(row: Row) -> str | None:
    parameter = row.inputs["parameter"]
    if parameter not in RECORDED_COMPUTED or parameter == "flap":
        return _FACT
    if row.quantity != "accuracy" and not str(parameter).endswith(
        ("normal_acceleration", "longitudinal_acceleration", "lateral_acceleration", "vertical_acceleration")
    ):
        return _FACT
    return None


def check(row: Row) -> CheckResult:
    """One computed row compared with our own answer.

    Raises: KeyError for a quantity that is neither computed nor stated, so that a new row cannot slip by.
    """
    answer = COMPUTED[row.quantity](row.inputs)
    tolerance = float(row.tolerance or 0.0)
    deviation, passed = _compare(answer, row.expected, tolerance)
    return CheckResult(
        row.id,
        row.quantity,
        row.source,
        row.expected,
        _text(answer),
        deviation,
        tolerance,
        passed,
        row.how,
        row.unit,
        row.file,
    )


def _compare(answer: Answer, expected: str, tolerance: float) -> tuple[float, bool]:
    if isinstance(answer, str):
        return math.nan, answer == expected
    if isinstance(answer, list):
        return math.nan, answer == ([] if expected == "none" else numbers(expected))
    wanted = float(expected)
    deviation = abs(float(answer) - wanted)
    return deviation, deviation <= tolerance + _ROUNDING * abs(wanted) if tolerance else deviation == 0.0


def _text(answer: Answer) -> str:
    if isinstance(answer, str):
        return answer
    if isinstance(answer, list):
        return ",".join(f"{value:.10g}" for value in answer) or "none"
    return f"{float(answer):.10g}"


def run_checks() -> list[CheckResult]:
    """Every row that our physics computes, compared; in the order of the files."""
    return [check(row) for row in all_rows() if reason_not_computed(row) is None]


def stated_rows() -> list[StatedRow]:
    """Every row that is listed only, with its reason; with `run_checks` this is every row there is."""
    pairs = ((row, reason_not_computed(row)) for row in all_rows())
    return [StatedRow(row.id, row.quantity, row.source, reason) for row, reason in pairs if reason is not None]
