"""One direction: what each folder may import is written down here and read from the code, not remembered."""

from __future__ import annotations

import ast
import importlib
import subprocess
import sys
from pathlib import Path

import pytest

import exceed

ROOT = Path(exceed.__file__).parent
HEAVY = {"pandas", "pyarrow", "scipy", "rich", "typer", "plotly", "jinja2"}
# folder or module -> what of ours it may import; the first name that fits counts
MAY = {
    "errors": set(),
    "settings": set(),
    "core": {"core", "errors"},
    "physics": {"physics", "core"},
    "reference": {"reference", "physics", "core"},
    "documents": {"documents", "core", "errors", "physics"},
    "read": {"read", "core", "errors", "documents"},
    "derive": {"derive", "core", "errors", "documents", "physics"},
    "judge": {"judge", "core", "errors", "documents"},
    "report": {"report", "core", "errors"},
    # of the report room only `show`
    "ledger": {"ledger", "core", "errors", "report"},
    "prepare": {"core", "documents", "errors", "settings"},
    "outcomes": {"core", "documents", "judge", "prepare"},
    "boundary": {"core", "documents", "derive", "physics"},
    "envelope_notes": {"boundary", "core", "documents", "derive", "physics"},
    "envelopes": {"boundary", "envelope_notes", "core", "documents", "derive", "errors", "physics"},
    "tallies": {"core", "physics"},
    "spectra": {"core", "documents", "errors", "pipeline", "prepare", "read", "settings", "tallies"},
    "drawing": {"core", "documents", "derive", "envelopes", "judge", "physics"},
    "tables": {"core", "derive", "errors", "report"},
    "batch": {"core", "errors", "pipeline", "prepare", "read", "worker"},
    "lean": set(),
    "worker": {"lean"},
    "cluster": {"batch", "core", "errors", "pipeline", "prepare", "read"},
    "pipeline": {
        "core", "errors", "settings", "documents", "read", "derive", "judge", "prepare", "outcomes", "drawing", "batch",
        "cluster",
    },
    "api": {"pipeline", "report", "settings", "tables"},
    "cli": {
        "cli", "pipeline", "report", "errors", "core", "documents", "read", "settings", "tables", "reference",
        "envelopes", "lean", "ledger", "spectra",
    },
    "__init__": {"api", "errors"},
    "__main__": {"cli"},
}  # fmt: skip
# libraries that must not appear at the top of a module of these folders (inside functions where first needed is fine)
NEVER_AT_TOP = {
    "core": HEAVY,
    "physics": HEAVY | {"pydantic", "yaml"},
    "documents": HEAVY,
    "derive": HEAVY,
    "judge": HEAVY,
    "read": HEAVY - {"pyarrow"},
    "ledger": HEAVY,
    "cli": HEAVY - {"typer"},
}
MODULES = sorted(ROOT.rglob("*.py"))


def room(path: Path) -> str:
    inside = path.relative_to(ROOT)
    return inside.parts[0] if len(inside.parts) > 1 else inside.stem


def imports(path: Path, top_only: bool = False) -> set[str]:
    tree = ast.parse(path.read_text(encoding="utf-8"))
    found: set[str] = set()
    for node in tree.body if top_only else ast.walk(tree):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and node.module and node.level == 0:
            found.add(node.module)
            found |= {f"{node.module}.{alias.name}" for alias in node.names} if node.module == "exceed" else set()
    return found


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_a_room_imports_only_from_rooms_before_it(path):
    allowed = MAY[room(path)]
    ours = {name.split(".")[1] for name in imports(path) if name.startswith("exceed.")} - {"__version__"}
    assert ours <= allowed, f"{path.relative_to(ROOT)} imports {sorted(ours - allowed)}"


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_heavy_libraries_load_where_they_are_needed(path):
    forbidden = NEVER_AT_TOP.get(room(path), set())
    found = {name.split(".")[0] for name in imports(path, top_only=True)}
    assert not found & forbidden


@pytest.mark.parametrize("room_name", ["physics", "judge"])
def test_pure_rooms_touch_no_file_and_no_screen(room_name):
    for path in MODULES:
        if room(path) != room_name:
            continue
        tree = ast.parse(path.read_text(encoding="utf-8"))
        calls = {
            node.func.id for node in ast.walk(tree) if isinstance(node, ast.Call) and isinstance(node.func, ast.Name)
        }
        assert not calls & {"open", "print", "input"}, path
        assert not {name.split(".")[0] for name in imports(path)} & {"os", "io", "pathlib", "sys", "logging"}, path


def modules_after(code: str) -> set[str]:
    script = f"{code}\nimport sys\nprint('\\n'.join(sys.modules))"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    return {name.split(".")[0] for name in done.stdout.split()}


def test_help_loads_no_heavy_library():
    code = (
        "from exceed.cli.app import main\ntry:\n    main(['scan', '--help'])\nexcept SystemExit as done:\n"
        "    assert not done.code"
    )
    # typer itself brings pydantic along in its newer versions
    assert not modules_after(code) & {
        "numpy", "pandas", "pyarrow", "scipy", "yaml", "plotly", "jinja2", "sqlalchemy",
    }  # fmt: skip


def test_importing_the_package_loads_nothing_of_it():
    assert not modules_after("import exceed") & {"numpy", "pydantic", "typer", "pandas"}


def test_the_api_is_there_when_asked_for():
    assert callable(exceed.scan)
    assert callable(exceed.trace)
    assert importlib.import_module("exceed.api").Result is exceed.Result
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        exceed.nothing  # noqa: B018
