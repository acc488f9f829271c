"""The arrows between the rooms: who may import whom, and who may know Qt."""

from __future__ import annotations

import ast
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

import desk

PACKAGE = Path(desk.__file__).parent

NUMERIC = ("rates", "book", "valuation", "scenarios", "projection")
MAY_IMPORT: dict[str, tuple[str, ...]] = {
    "": (),
    "places": (),
    "terminal": (),
    "rates": (),
    "book": ("rates",),
    "valuation": ("rates", "book"),
    "scenarios": ("rates", "book"),
    "projection": ("rates", "book", "valuation", "scenarios"),
    "intake": ("rates", "book"),
    "report": (*NUMERIC, "intake", "places"),
    "store": (*NUMERIC, "intake", "places"),
    "tasks": (*NUMERIC, "intake", "report", "store", "places"),
    "arguments": ("rates", "book", "report", "terminal"),
    "guarded": ("terminal",),
    "asked": (*NUMERIC, "intake", "report", "tasks", "terminal"),
    "batch": (
        *NUMERIC,
        *("intake", "report", "store", "tasks", "places", "terminal", "arguments", "asked", "guarded"),
    ),
    "window": (*NUMERIC, "intake", "report", "store", "tasks", "places"),
    "__main__": (*NUMERIC, "intake", "report", "store", "tasks", "places", "terminal", "batch", "window"),
}
QT = {"PySide6", "PyQt6", "PyQt5", "PySide2", "shiboken6", "pyqtgraph"}
QT_CORE_ONLY = {"window.document", "window.jobs"}
LIBRARIES_OF_RATES = {"numpy", "scipy"}
FILE_LIBRARIES = {
    "csv",
    "io",
    "openpyxl",
    "pandas",
    "pathlib",
    "pickle",
    "python_calamine",
    "shutil",
    "sqlite3",
    "tempfile",
    "zipfile",
}


def imported_names(tree: ast.Module) -> Iterator[str]:
    """Every dotted name that a module imports, wherever it stands in it."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, "relative import"
            for alias in node.names:
                yield f"{node.module}.{alias.name}"
        elif isinstance(node, ast.Call) and node.args and isinstance(node.args[0], ast.Constant):
            function = node.func
            name = function.attr if isinstance(function, ast.Attribute) else getattr(function, "id", "")
            if name in {"import_module", "__import__"}:
                yield str(node.args[0].value)


def opens_files(tree: ast.Module) -> bool:
    """Whether a module calls the built-in `open`."""
    return any(
        isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id == "open"
        for node in ast.walk(tree)
    )


def offences(module: str, source: str) -> list[str]:
    """What a module (dotted, below ``desk``) imports against the arrows."""
    tree = ast.parse(source)
    room = module.split(".")[0]
    found = []
    for name in imported_names(tree):
        parts = name.split(".")
        library = parts[0]
        if library == "desk":
            other = parts[1] if len(parts) > 1 and parts[1] in MAY_IMPORT else ""
            if other not in ("", room, *MAY_IMPORT[room]):
                found.append(f"{module} imports {name}")
        elif library in QT:
            if room != "window":
                found.append(f"{module} imports {name}: only the window knows Qt")
            elif module in QT_CORE_ONLY and (len(parts) < 2 or parts[1] != "QtCore"):
                found.append(f"{module} imports {name}: it may know QtCore only")
        elif room in NUMERIC and library in FILE_LIBRARIES:
            found.append(f"{module} imports {name}: a numeric room reads and writes no files")
        elif room == "rates" and library not in LIBRARIES_OF_RATES | sys.stdlib_module_names:
            found.append(f"{module} imports {name}: rates stand on numpy and scipy alone")
    if room in NUMERIC and opens_files(tree):
        found.append(f"{module} opens files")
    return found


def modules() -> dict[str, Path]:
    """Every module of the package by its dotted name below ``desk``."""
    found = {}
    for path in sorted(PACKAGE.rglob("*.py")):
        parts = path.relative_to(PACKAGE).with_suffix("").parts
        found[".".join(part for part in parts if part != "__init__")] = path
    return found


def test_every_room_imports_from_below_only() -> None:
    """No module imports from its own floor or above, nor Qt outside the window."""
    every = modules()
    assert {"book.book", "rates.curve", "tasks"} <= set(every)
    unknown = {name.split(".")[0] for name in every} - set(MAY_IMPORT)
    assert not unknown, f"rooms that the arrows do not name: {unknown}"
    found = [line for name, path in every.items() for line in offences(name, path.read_text("utf-8"))]
    assert not found, "\n".join(found)


@pytest.mark.parametrize(
    ("module", "source"),
    [
        ("rates.curve", "from desk.book import Book"),
        ("rates.curve", "import pandas"),
        ("book.book", "def f():\n    from desk.valuation.records import Standing"),
        ("valuation.standing", "from desk import scenarios"),
        ("valuation.standing", "def f(path):\n    return open(path)"),
        ("scenarios.simulation", "from pathlib import Path"),
        (
            "scenarios.simulation",
            "from typing import TYPE_CHECKING\nif TYPE_CHECKING:\n    import desk.report.frames",
        ),
        ("report.frames", "import desk.tasks"),
        ("batch", "from desk.window.app import run"),
        ("tasks", "from PySide6 import QtCore"),
        ("batch", "import importlib\nimportlib.import_module('pyqtgraph')"),
        ("window.document", "from PySide6.QtWidgets import QWidget"),
        ("window.jobs", "import pyqtgraph"),
    ],
)
def test_a_planted_import_is_caught(module: str, source: str) -> None:
    """The checker sees imports at the top, inside functions, under TYPE_CHECKING and by name."""
    assert len(offences(module, source)) == 1


@pytest.mark.parametrize(
    ("module", "source"),
    [
        ("rates.curve", "import numpy\nfrom scipy.interpolate import CubicSpline\nimport math"),
        ("valuation.standing", "from desk import __version__\nfrom desk.book.basis import Basis"),
        ("window.document", "from PySide6.QtCore import QObject"),
        ("window.app", "import pyqtgraph\nfrom PySide6 import QtWidgets\nfrom desk.tasks import read"),
    ],
)
def test_a_right_import_passes(module: str, source: str) -> None:
    """What the arrows allow is not reported."""
    assert offences(module, source) == []
