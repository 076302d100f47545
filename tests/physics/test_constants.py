"""Constants are what the standards and an independent library say, and every cited source is a row."""

from __future__ import annotations

import ast
import importlib.util
import re
from pathlib import Path

import numpy as np
import pint
import pytest

from exceed.core import constants
from exceed.core.constants import CONSTANTS
from exceed.core.sources import SOURCES
from exceed.physics import category, uncertainty

UNITS = pint.UnitRegistry()
PACKAGE = Path(next(iter(importlib.util.find_spec("exceed").submodule_search_locations)))  # type: ignore[union-attr, arg-type]
MODULES = sorted((PACKAGE / "physics").glob("*.py"))


@pytest.mark.parametrize(
    ("name", "theirs", "unit"),
    [
        ("FOOT", "foot", "m"),
        ("INCH", "inch", "m"),
        ("POUND", "pound", "kg"),
        ("NAUTICAL_MILE", "nautical_mile", "m"),
        ("KNOT", "knot", "m/s"),
        ("US_GALLON", "gallon", "m**3"),
        ("POUND_FORCE", "force_pound", "N"),
        ("SLUG", "slug", "kg"),
        ("STANDARD_GRAVITY", "standard_gravity", "m/s**2"),
    ],
)
def test_factors_are_those_of_an_independent_unit_library(name: str, theirs: str, unit: str) -> None:
    assert getattr(constants, name) == pytest.approx(UNITS.Quantity(1, theirs).to(unit).magnitude, rel=1e-12)


def test_every_constant_of_the_module_is_a_row_with_the_same_value() -> None:
    names = {name for name, value in vars(constants).items() if name.isupper() and isinstance(value, float)}
    assert names == set(CONSTANTS)
    assert all(getattr(constants, name) == row.value for name, row in CONSTANTS.items())


def test_sea_level_density_and_sound_are_the_printed_ones() -> None:
    """1.225 kg/m3 and 340.294 m/s: ICAO Doc 7488, from memory."""
    assert pytest.approx(1.225, abs=5e-6) == constants.DENSITY_0
    assert pytest.approx(340.294, abs=5e-4) == constants.SPEED_OF_SOUND_0


def test_every_source_cited_by_a_constant_a_limit_or_an_accuracy_is_a_row() -> None:
    cited = {row.source for row in CONSTANTS.values()}
    cited |= {key for row in category.CATEGORIES.values() for key in (row.source, row.flaps_source)}
    cited |= {row.source for row in (*uncertainty.DEFAULT_ACCURACY.values(), *uncertainty.OLDER_ACCURACY.values())}
    assert cited <= set(SOURCES)
    assert all(key == row.key for key, row in SOURCES.items())


@pytest.mark.parametrize("path", MODULES, ids=lambda path: path.name)
def test_every_public_function_cites_a_source_that_is_a_row(path: Path) -> None:
    tree = ast.parse(path.read_text(encoding="utf-8"))
    for node in tree.body:
        if not isinstance(node, ast.FunctionDef) or node.name.startswith("_") or path.name == "_arrays.py":
            continue
        text = ast.get_docstring(node) or ""
        if node.name in ("freeze",):
            continue
        cited = re.findall(r"\[([A-Z0-9][A-Z0-9-]+)\]", text)
        if "as in `" not in text:
            assert cited, f"{path.name}: {node.name} cites no source"
            assert "Returns" in text, f"{path.name}: {node.name} does not say what it returns"
        assert set(cited) <= set(SOURCES), f"{path.name}: {node.name} cites {set(cited) - set(SOURCES)}"


@pytest.mark.parametrize("path", MODULES, ids=lambda path: path.name)
def test_physics_imports_only_numpy_and_the_constants(path: Path) -> None:
    allowed = {"__future__", "dataclasses", "itertools", "math", "typing", "numpy", "numpy.typing"}
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        names = [alias.name for alias in node.names] if isinstance(node, ast.Import) else []
        if isinstance(node, ast.ImportFrom):
            names = [node.module or ""]
        for name in names:
            ours = name.startswith("exceed.physics") or name in ("exceed.core.constants", "exceed.core.sources")
            assert name in allowed or ours, f"{path.name} imports {name}"


def test_default_accuracies_are_positive_and_say_where_a_value_is_needed() -> None:
    for name, row in uncertainty.DEFAULT_ACCURACY.items():
        assert row.half_width > 0 or row.relative > 0, name
        assert name not in uncertainty.NO_PUBLISHED_ACCURACY
    speed = uncertainty.DEFAULT_ACCURACY["indicated_airspeed"].at(np.array([100.0, np.nan]))
    np.testing.assert_allclose(speed, [3.0, np.nan])
    assert uncertainty.OLDER_ACCURACY["indicated_airspeed"].at(10.0) == pytest.approx(10 * constants.KNOT)
