"""The starter script: what it decides, without making an environment."""

from __future__ import annotations

import ctypes.util
import runpy
import subprocess
import sys
import tomllib
from pathlib import Path
from types import SimpleNamespace

import pytest

PROJECT = Path(__file__).resolve().parent.parent


@pytest.fixture
def start() -> SimpleNamespace:
    """The script's names, without running it."""
    return SimpleNamespace(**runpy.run_path(str(PROJECT / "resources" / "start.py")))


def project_with(folder: Path, settings: str) -> Path:
    """A project folder that holds only its settings."""
    folder.mkdir(exist_ok=True)
    (folder / "pyproject.toml").write_text(settings, encoding="utf-8")
    return folder


def test_the_fingerprint_changes_with_the_settings_alone(start: SimpleNamespace, tmp_path: Path) -> None:
    project = project_with(tmp_path / "project", "[project]\nname = 'one'\n")
    before = start.fingerprint(project)
    (project / "README.md").write_text("changed", encoding="utf-8")
    assert start.fingerprint(project) == before
    project_with(project, "[project]\nname = 'two'\n")
    assert start.fingerprint(project) != before


@pytest.mark.parametrize(
    ("stamp", "extras"),
    [
        (None, None),
        ("", None),
        ("other", None),
        ("print", frozenset()),
        ("print\nwork", frozenset({"work"})),
    ],
)
def test_a_stamp_counts_only_for_the_settings_it_was_made_from(
    start: SimpleNamespace, tmp_path: Path, stamp: str | None, extras: frozenset[str] | None
) -> None:
    path = tmp_path / "installed.txt"
    if stamp is not None:
        path.write_text(stamp, encoding="utf-8")
    assert start.installed_extras(path, "print") == extras


@pytest.mark.parametrize(
    ("system", "package"),
    [
        (("debian", 12.0), "libglib2.0-0"),
        (("debian", 13.0), "libglib2.0-0t64"),
        (("ubuntu", 22.04), "libglib2.0-0"),
        (("ubuntu", 24.04), "libglib2.0-0t64"),
        (("", 0.0), "libglib2.0-0"),
    ],
)
def test_packages_are_named_as_the_distribution_names_them(
    start: SimpleNamespace, system: tuple[str, float], package: str
) -> None:
    absent = {"libof-no-system.so.77": "libglib2.0-0"}
    assert start.missing_packages(absent, system) == [package]


def test_a_library_that_is_there_is_not_asked_for(start: SimpleNamespace) -> None:
    present = ctypes.util.find_library("c") or "kernel32"
    assert not start.lacks(present)
    assert start.missing_packages({present: "libc6"}, ("debian", 12.0)) == []


def test_fonts_are_looked_for_in_every_folder(start: SimpleNamespace, tmp_path: Path) -> None:
    assert not start.has_fonts([tmp_path])
    (tmp_path / "family").mkdir()
    (tmp_path / "family" / "Face.TTF").touch()
    assert start.has_fonts([tmp_path / "none", tmp_path])


def test_an_environment_that_does_not_run_is_not_kept(start: SimpleNamespace, tmp_path: Path) -> None:
    assert start.works(Path(sys.executable))
    assert not start.works(tmp_path / "python")


def test_the_script_uses_the_standard_library_only() -> None:
    # -S and -I: no site-packages, no user settings, no current folder.
    command = [sys.executable, "-I", "-S", "-c", "import runpy, sys; runpy.run_path(sys.argv[1])"]
    subprocess.run([*command, str(PROJECT / "resources" / "start.py")], check=True, timeout=60)


def test_every_folder_of_the_program_is_packaged() -> None:
    settings = tomllib.loads((PROJECT / "pyproject.toml").read_text(encoding="utf-8"))
    found = {"desk"} | {
        ".".join(path.parent.relative_to(PROJECT).parts) for path in (PROJECT / "desk").rglob("__init__.py")
    }
    assert set(settings["tool"]["setuptools"]["packages"]) == found | {"desk.resources", "desk.demo_books"}
