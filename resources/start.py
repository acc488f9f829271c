"""Set the program up on a fresh machine and run it.

``python3 resources/start.py`` makes ``.venv`` in the project's folder, installs the program into it once
(and again only when ``pyproject.toml`` has changed) and opens the window on a demo book. With arguments
it runs that command instead: ``python3 resources/start.py value BOOK``. Where there is no display and no
argument, the program runs its main job on the demo book as a batch. ``python3 resources/start.py --tests``
does the set-up and runs every check of the project.

Standard library only; Python 3.11 or later; Linux, macOS and Windows.
"""

from __future__ import annotations

import ctypes
import hashlib
import importlib.util
import os
import shutil
import subprocess
import sys
import time
import venv
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path

PROJECT = Path(__file__).resolve().parent.parent
ENVIRONMENT = PROJECT / ".venv"
STAMP = ENVIRONMENT / "installed.txt"
OLDEST_PYTHON = (3, 11)
DEMO_BOOK = PROJECT / "demo_books" / "pension_fund.xlsx"

# Shared libraries that Qt's wheels expect of the system, and the Debian and Ubuntu package of each.
DRAWING_LIBRARIES = {
    "libGL.so.1": "libgl1",
    "libEGL.so.1": "libegl1",
    "libfontconfig.so.1": "libfontconfig1",
    "libdbus-1.so.3": "libdbus-1-3",
    "libglib-2.0.so.0": "libglib2.0-0",
    "libxkbcommon.so.0": "libxkbcommon0",
}
WINDOW_LIBRARIES = {
    "libxcb-cursor.so.0": "libxcb-cursor0",
    "libxkbcommon-x11.so.0": "libxkbcommon-x11-0",
    "libxcb-icccm.so.4": "libxcb-icccm4",
    "libxcb-keysyms.so.1": "libxcb-keysyms1",
    "libxcb-shape.so.0": "libxcb-shape0",
    "libxcb-xkb.so.1": "libxcb-xkb1",
    "libxcb-randr.so.0": "libxcb-randr0",
    "libxcb-render-util.so.0": "libxcb-render-util0",
    "libxcb-image.so.0": "libxcb-image0",
    "libX11-xcb.so.1": "libx11-xcb1",
}
# From these releases on the package's name ends in t64 (64-bit times).
RENAMED_SINCE = {"debian": 13.0, "ubuntu": 24.04}


def say(text: str) -> None:
    """Tell the user what happens, on standard error: standard output belongs to the command."""
    print(text, file=sys.stderr, flush=True)


def environment_python(environment: Path = ENVIRONMENT) -> Path:
    """The interpreter inside a virtual environment."""
    if os.name == "nt":
        return environment / "Scripts" / "python.exe"
    return environment / "bin" / "python"


def fingerprint(project: Path = PROJECT) -> str:
    """What the environment was made from: the project's settings, its place and this Python."""
    digest = hashlib.sha256((project / "pyproject.toml").read_bytes())
    digest.update(repr((sys.version_info[:3], str(project))).encode())
    return digest.hexdigest()


def installed_extras(stamp: Path = STAMP, wanted: str | None = None) -> frozenset[str] | None:
    """The extras installed from the present settings, or None where a set-up is needed."""
    try:
        made_from, *extras = stamp.read_text(encoding="utf-8").split()
    except (OSError, ValueError):
        return None
    return frozenset(extras) if made_from == (wanted or fingerprint()) else None


def works(python: Path) -> bool:
    """Whether an environment's interpreter runs and has pip."""
    try:
        done = subprocess.run([python, "-c", "import pip"], capture_output=True, check=False, timeout=60)
    except (OSError, subprocess.SubprocessError):
        return False
    return done.returncode == 0


def may_install_packages() -> bool:
    """Whether Debian's package tool is here and this process may use it."""
    return shutil.which("apt-get") is not None and hasattr(os, "geteuid") and os.geteuid() == 0


def install_packages(packages: Sequence[str]) -> bool:
    """Install Debian or Ubuntu packages as root, saying so."""
    say(f"Installing with apt-get, as root: {' '.join(packages)}")
    settings = {**os.environ, "DEBIAN_FRONTEND": "noninteractive"}
    for command in (
        ["apt-get", "update", "-qq"],
        ["apt-get", "install", "-y", "-qq", "--no-install-recommends", *packages],
    ):
        done = subprocess.run(command, env=settings, check=False, stdout=sys.stderr, stdin=subprocess.DEVNULL)
        if done.returncode != 0 and command[1] == "install":
            say("apt-get did not succeed; going on without.")
            return False
    return True


def make_environment(environment: Path = ENVIRONMENT) -> Path:
    """Make the virtual environment, or keep one that works.

    Raises
    ------
    SystemExit
        With status 1, when Python's own `venv` module cannot make one.
    """
    python = environment_python(environment)
    if works(python):
        return python
    say(f"Making the environment {environment.name} with Python {sys.version.split()[0]}.")
    package = f"python{sys.version_info.major}.{sys.version_info.minor}-venv"
    # Debian and Ubuntu keep the part of Python that puts pip into an environment in a package of its own.
    if importlib.util.find_spec("ensurepip") is None and may_install_packages():
        install_packages([package])
    try:
        venv.EnvBuilder(with_pip=True, clear=True).create(environment)
    except (OSError, subprocess.SubprocessError, SystemExit) as error:
        say(f"The environment could not be made ({error}).")
        say(f"On Debian and Ubuntu this helps:  sudo apt-get install {package}")
        raise SystemExit(1) from None
    return python


def set_up(*, extras: frozenset[str] = frozenset()) -> Path:
    """Make the environment and install the program into it, unless that is done already.

    Raises
    ------
    SystemExit
        With status 1, when the installation fails.
    """
    present = installed_extras()
    python = environment_python()
    if present is not None and extras <= present and works(python):
        return python
    python = make_environment()
    wanted = extras | (present or frozenset())
    target = f"{PROJECT}[{','.join(sorted(wanted))}]" if wanted else str(PROJECT)
    say("Installing the program and its libraries. The first time this takes a minute or two.")
    began = time.monotonic()
    command = [
        str(python),
        "-m",
        "pip",
        "install",
        "--quiet",
        "--disable-pip-version-check",
        "--editable",
        target,
    ]
    if subprocess.run(command, check=False, stdout=sys.stderr).returncode != 0:
        say("The installation failed; the lines above say why. A network connection is needed for it.")
        raise SystemExit(1)
    STAMP.write_text("\n".join([fingerprint(), *sorted(wanted)]), encoding="utf-8")
    say(f"Installed in {time.monotonic() - began:.0f} s.")
    return python


def lacks(library: str) -> bool:
    """Whether the system's loader cannot find a shared library."""
    try:
        ctypes.CDLL(library)
    except OSError:
        return True
    return False


def release() -> tuple[str, float]:
    """The distribution and its number, from ``/etc/os-release``; empty where unknown."""
    try:
        text = Path("/etc/os-release").read_text(encoding="utf-8")
    except OSError:
        return "", 0.0
    items = dict(line.split("=", 1) for line in text.splitlines() if "=" in line)
    number = items.get("VERSION_ID", "0").strip('"')
    try:
        return items.get("ID", "").strip('"'), float(number)
    except ValueError:
        return items.get("ID", "").strip('"'), 0.0


def has_fonts(folders: Iterable[Path] | None = None) -> bool:
    """Whether any outline font is installed."""
    places = folders or [Path("/usr/share/fonts"), Path("/usr/local/share/fonts"), Path.home() / ".fonts"]
    return any(
        path.suffix.lower() in {".ttf", ".otf", ".ttc"} for place in places for path in place.rglob("*")
    )


def missing_packages(libraries: Mapping[str, str], system: tuple[str, float]) -> list[str]:
    """The packages of the libraries that are not there, by the names of this distribution."""
    name, number = system
    renamed = number >= RENAMED_SINCE.get(name, float("inf"))
    packages = [package for library, package in libraries.items() if lacks(library)]
    return [f"{package}t64" if package == "libglib2.0-0" and renamed else package for package in packages]


def has_display() -> bool:
    """Whether a window can be shown."""
    if sys.platform in {"win32", "darwin"}:
        return True
    return any(os.environ.get(name) for name in ("DISPLAY", "WAYLAND_DISPLAY", "QT_QPA_PLATFORM"))


def provide_libraries() -> None:
    """On Linux, see to the shared libraries that Qt needs: install them as root, else name them."""
    if not sys.platform.startswith("linux"):
        return
    shown = bool(os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY"))
    wanted = {**DRAWING_LIBRARIES, **(WINDOW_LIBRARIES if shown else {})}
    packages = missing_packages(wanted, release())
    if not has_fonts():
        packages.append("fonts-dejavu-core")
    if not packages:
        return
    if may_install_packages():
        install_packages(packages)
    else:
        say("The window needs shared libraries that this system lacks. On Debian and Ubuntu:")
        say(f"  sudo apt-get install --no-install-recommends {' '.join(packages)}")


def run_tests(python: Path, arguments: Sequence[str]) -> int:
    """Run every check; the tests come last, and the first status that is not 0 is the result."""
    settings = {**os.environ, "QT_QPA_PLATFORM": "offscreen"}
    status = 0
    for title, command in (
        ("format", ["ruff", "format", "--check", "."]),
        ("lint", ["ruff", "check", "."]),
        ("types", ["mypy"]),
        # A file to one process: what its tests share is made once.
        ("tests", ["pytest", "-n", "auto", "--dist", "loadfile", *arguments]),
    ):
        say(f"— {title}")
        done = subprocess.run([python, "-m", *command], cwd=PROJECT, env=settings, check=False)
        status = status or done.returncode
    return status


def main(arguments: Sequence[str]) -> int:
    """Set up, then run the tests, the command given, or the window."""
    if sys.version_info < OLDEST_PYTHON:
        oldest = ".".join(map(str, OLDEST_PYTHON))
        say(f"Python {oldest} or later is needed; this is {sys.version.split()[0]}.")
        return 1
    tests = arguments[:1] == ["--tests"]
    python = set_up(extras=frozenset({"work"}) if tests else frozenset())
    provide_libraries()
    if tests:
        return run_tests(python, arguments[1:])
    if not arguments and has_display():
        arguments = [str(DEMO_BOOK)]
    return subprocess.run([python, "-m", "desk", *arguments], check=False).returncode


if __name__ == "__main__":
    try:
        sys.exit(main(sys.argv[1:]))
    except KeyboardInterrupt:
        sys.exit(1)
