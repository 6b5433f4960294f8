"""The layers hold: who may import whom, what stays in the standard library, what never loads what."""

from __future__ import annotations

import ast
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent
PACKAGE = ROOT / "sheetcal"
ALLOWED = {
    "errors": set(),
    "model": set(),
    "cells": set(),
    "units": {"model"},
    "profiles": {"model", "units"},
    "kinds": {"model", "units", "profiles"},
    "formulas": {"model", "cells", "kinds"},
    "check": {"model", "units", "profiles", "kinds"},
    "office": {"model", "cells", "kinds"},
    "inputs": {"model", "units", "profiles"},
    "bench": {"model", "units", "profiles", "inputs"},
    "excel": {"model", "units", "kinds", "profiles", "formulas", "cells"},
    "reports": {"model", "units"},
    "planting": {"model", "kinds", "bench", "excel", "formulas"},
    "archive": {"model", "units", "profiles", "kinds", "inputs", "check", "excel", "office"},
    "cli": {"verbs"},
    "__main__": {"cli"},
    "__init__": set(),
}
FILES = sorted(PACKAGE.rglob("*.py"))
OLD_SYNTAX = [*sorted((PACKAGE / "cells").glob("*.py")), PACKAGE / "errors.py"]


def layer(path: Path) -> str:
    """The first name below the package."""
    return path.relative_to(PACKAGE).parts[0].removesuffix(".py")


def imported(path: Path) -> Iterator[str]:
    """Every module a file imports, also inside functions."""
    for node in ast.walk(ast.parse(path.read_text("utf-8"))):
        if isinstance(node, ast.Import):
            yield from (one.name for one in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module and not node.level:
            if node.module == "sheetcal":
                yield from (f"sheetcal.{one.name}" for one in node.names)
            else:
                yield node.module


@pytest.mark.parametrize("path", FILES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_imports_go_only_in_the_allowed_directions(path: Path) -> None:
    """A file imports only what the table allows its layer."""
    own = layer(path)
    if own == "verbs":
        return
    names = {name.split(".")[1] for name in imported(path) if name.startswith("sheetcal.")}
    extra = names - ALLOWED[own] - {own, "errors", "__version__"}
    assert not extra, f"{own} imports {sorted(extra)}"


@pytest.mark.parametrize("path", sorted((PACKAGE / "cells").glob("*.py")), ids=lambda path: path.name)
def test_cells_need_only_the_standard_library(path: Path) -> None:
    """The cell functions also run inside LibreOffice's Python."""
    outside = {name.split(".")[0] for name in imported(path)} - {"sheetcal"} - set(sys.stdlib_module_names)
    assert not outside


@pytest.mark.parametrize("path", OLD_SYNTAX, ids=lambda path: path.name)
def test_cells_and_errors_keep_to_older_syntax(path: Path) -> None:
    """LibreOffice ships older Pythons: 3.9 must be able to parse these files."""
    ast.parse(path.read_text("utf-8"), feature_version=(3, 9))


def test_the_checker_never_loads_cells_or_formulas() -> None:
    """All of sheetcal.check imports in a fresh interpreter without the cell functions and the translator."""
    modules = [
        ".".join(path.relative_to(ROOT).with_suffix("").parts).removesuffix(".__init__")
        for path in sorted((PACKAGE / "check").rglob("*.py"))
    ]
    assert len(modules) >= 10
    code = (
        "import importlib, sys\n"
        f"for name in {modules!r}: importlib.import_module(name)\n"
        "bad = [m for m in sys.modules if m.startswith(('sheetcal.cells', 'sheetcal.formulas', 'openpyxl'))]\n"
        "sys.exit(repr(bad) if bad else 0)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, cwd=ROOT, check=False)
    assert done.returncode == 0, done.stderr


def test_help_loads_no_heavy_library() -> None:
    """`--help` imports neither numpy, pint nor openpyxl."""
    code = (
        "import sys\nfrom sheetcal.cli import main\n"
        "try: main(['--help'])\nexcept SystemExit: pass\n"
        "sys.exit(' '.join(m for m in ('numpy', 'pint', 'openpyxl') if m in sys.modules) or 0)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, cwd=ROOT, check=False)
    assert done.returncode == 0, done.stderr
    assert "issue" in done.stdout


@pytest.mark.parametrize("path", FILES, ids=lambda path: str(path.relative_to(PACKAGE)))
def test_files_stay_short(path: Path) -> None:
    """No file of the product is longer than 500 lines."""
    assert len(path.read_text("utf-8").splitlines()) <= 500


def test_top_level_is_the_fixed_set() -> None:
    """The top level holds what the user fixed, and nothing else."""
    listed = subprocess.run(["git", "ls-files"], capture_output=True, text=True, cwd=ROOT, check=True).stdout.split(
        "\n"
    )
    names = {one.split("/")[0] for one in listed if one}
    fixed = {"sheetcal", "tests", "workbooks", "pyproject.toml", "README.md", "DEVELOPERS.md"}
    assert {one for one in names if not one.startswith(".")} <= fixed
