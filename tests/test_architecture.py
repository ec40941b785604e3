"""The order of the folders, the packages each may import, and the length of modules."""

import ast
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parent.parent / "tidescour"
MOST_LINES = 400

# Each step may import those before it; `handoff` and `report` take finished results; only `cli` sees everything.
ORDER = ("plan", "gauge", "tide", "gap", "bed", "scour", "study", "handoff", "report", "pipeline", "cli")
FOUNDATION = {"errors", "units", "table", "compiled"}

THIRD_PARTY = {
    "errors": set(),
    "units": {"numpy"},
    "table": set(),
    "compiled": {"numba"},
    "plan": {"numpy", "pydantic", "pydantic_core", "openpyxl"},
    "gauge": {"numpy", "scipy", "pandas"},
    "tide": {"numpy", "scipy", "utide"},
    "gap": {"numpy", "scipy"},
    "bed": {"numpy", "scipy"},
    "scour": {"numpy", "scipy"},
    "study": {"numpy", "scipy"},
    "handoff": {"numpy", "pandas"},
    "report": {"numpy", "matplotlib"},
    "pipeline": {"numpy"},
    "cli": {"click"},
}

# Files are opened in these folders only.
OPENERS = {"plan", "gauge", "handoff"}
OPENING_CALLS = {"open", "read_text", "read_bytes", "write_text", "write_bytes"}

MODULES = sorted(PACKAGE.rglob("*.py"))


def step_of(path: Path) -> str:
    """Return the folder of a module, or its own name at the top."""
    parts = path.relative_to(PACKAGE).parts
    return parts[0] if len(parts) > 1 else path.stem


def imported(tree: ast.AST) -> set[str]:
    """Return the full names that a module imports, wherever it does."""
    names: set[str] = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            names.update(alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module:
            names.update(f"{node.module}.{alias.name}" for alias in node.names)
    return names


@pytest.fixture(params=MODULES, ids=lambda path: str(path.relative_to(PACKAGE)))
def module(request):
    return request.param


def test_a_step_imports_only_steps_before_it(module):
    step = step_of(module)
    if step == "__init__":
        return
    allowed = FOUNDATION if step in FOUNDATION else FOUNDATION | set(ORDER[: ORDER.index(step) + 1])
    for name in imported(ast.parse(module.read_text(encoding="utf-8"))):
        parts = name.split(".")
        if parts[0] == "tidescour" and len(parts) > 1 and parts[1] != "__version__":
            assert parts[1] in allowed, f"{step} must not import {name}"


def test_third_party_packages_stay_where_they_belong(module):
    step = step_of(module)
    allowed = THIRD_PARTY.get(step, set()) | {"tidescour", "__future__"} | set(sys.stdlib_module_names)
    for name in imported(ast.parse(module.read_text(encoding="utf-8"))):
        assert name.split(".")[0] in allowed, f"{step} must not import {name}"


def test_files_are_opened_only_where_they_may_be(module):
    if step_of(module) in OPENERS:
        return
    for node in ast.walk(ast.parse(module.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Call):
            called = node.func.attr if isinstance(node.func, ast.Attribute) else getattr(node.func, "id", "")
            assert called not in OPENING_CALLS, f"line {node.lineno} opens a file"


def test_modules_stay_short(module):
    assert len(module.read_text(encoding="utf-8").splitlines()) <= MOST_LINES


def test_every_module_has_a_step():
    for path in MODULES:
        assert step_of(path) in FOUNDATION | set(ORDER) | {"__init__"}, path
