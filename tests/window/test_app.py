"""The start: a broken build of Qt is refused, and icons are there."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path
from xml.etree import ElementTree

import pytest
from PySide6.QtSvg import QSvgRenderer

from desk.places import resources
from desk.window import app
from desk.window.parts.icons import app_icon, icon
from desk.window.parts.theme import DARK, LIGHT, Theme
from desk.window.stations import all_stations


def test_this_build_of_qt_keeps_its_references() -> None:
    assert app.lost_references() < 100


def test_a_build_that_loses_references_is_refused(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(app, "lost_references", lambda: 200)
    assert app.run(None) == 1
    said = capsys.readouterr().err
    assert "below 6.12" in said
    assert "The commands work without it." in said


def test_the_window_opens_on_a_book_and_ends_with_status_0(tmp_path: Path) -> None:
    script = (
        "import sys\n"
        "from pathlib import Path\n"
        "from PySide6.QtCore import QTimer\n"
        "from PySide6.QtWidgets import QApplication\n"
        "from desk.window import app\n"
        "shown = []\n"
        "def look():\n"
        "    windows = [w for w in QApplication.topLevelWidgets() if hasattr(w, 'document')]\n"
        "    if windows and windows[0].document.standing is not None:\n"
        "        shown.append(windows[0].windowTitle())\n"
        "        windows[0].close()\n"
        "timer = QTimer()\n"
        "timer.timeout.connect(look)\n"
        "application = app._application()\n"
        "timer.start(20)\n"
        "status = app.run(Path(sys.argv[1]))\n"
        "print(shown)\n"
        "sys.exit(status)\n"
    )
    book = Path(app.__file__).parents[2] / "demo_books" / "small_endowment.xlsx"
    homes = {name: str(tmp_path) for name in ("HOME", "XDG_CONFIG_HOME", "XDG_STATE_HOME", "APPDATA")}
    done = subprocess.run(
        [sys.executable, "-c", script, str(book)],
        env={**os.environ, "QT_QPA_PLATFORM": "offscreen", **homes},
        capture_output=True,
        text=True,
        timeout=120,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    assert "small_endowment.xlsx[*] — Gapwright" in done.stdout
    assert list(tmp_path.rglob("gapwright.log")), "a log was kept"


def test_every_icon_can_be_drawn() -> None:
    files = sorted((resources() / "icons").glob("*.svg"))
    assert {entry.key for entry in all_stations()} <= {path.stem for path in files}
    for path in files:
        assert ElementTree.parse(path).getroot().tag.endswith("svg")
        assert QSvgRenderer(str(path)).isValid(), path.name


@pytest.mark.usefixtures("qapp")
def test_icons_take_the_colour_of_the_theme() -> None:
    def inks(theme: Theme) -> list[int]:
        image = icon("standing", theme).pixmap(32, 32).toImage()
        places = [(x, y) for x in range(image.width()) for y in range(image.height())]
        colours = [image.pixelColor(x, y) for x, y in places]
        return [colour.lightness() for colour in colours if colour.alpha() > 200]

    assert max(inks(DARK)) > 150 > min(inks(LIGHT))
    assert not app_icon().isNull()
