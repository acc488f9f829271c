"""The start of the window.

Order of events: the build of Qt is checked; the application gets its name, look and log; the window
comes up on the welcome, or on a book; then, while the reader looks at it, the stations' libraries load.
"""

from __future__ import annotations

import gc
import logging
import sys
from functools import partial
from pathlib import Path

from PySide6 import __version__ as pyside_version
from PySide6.QtCore import QObject, QTimer
from PySide6.QtWidgets import QApplication

from desk import __version__

__all__ = ["lost_references", "run"]

_log = logging.getLogger(__name__)

_CALLS = 200
_SWITCH_SECONDS = 0.001


def lost_references() -> int:
    """How many references to None a couple of hundred calls into Qt lose; 0 in a sound build.

    Notes
    -----
    PySide6 6.12.0 takes one reference off None with every call that returns it. Before Python 3.12 None can
    be used up so, and the process ends in the middle of the work.
    """
    thing = QObject()
    before = sys.getrefcount(None)
    for _ in range(_CALLS):
        thing.parent()
    return max(0, before - sys.getrefcount(None))


def _refusal() -> str:
    """Why the window must not open on this build of Qt; empty where it may."""
    if lost_references() < _CALLS // 2:
        return ""
    return (
        f"gapwright: PySide6 {pyside_version} is broken on Python {sys.version.split()[0]}: it loses "
        "references to "
        "None, and the window would end without warning. Install PySide6-Essentials below 6.12, or use "
        "Python "
        "3.12 or later. The commands work without it."
    )


def run(path: Path | None) -> int:
    """Open the window and stay until it is closed.

    Parameters
    ----------
    path : Path or None
        A book to open.

    Returns
    -------
    int
        Exit status: 1 where the window must not open on this build of Qt.
    """
    refusal = _refusal()
    if refusal:
        print(refusal, file=sys.stderr)  # noqa: T201
        return 1
    from desk.window.document import Document
    from desk.window.errors import ErrorKeeper, start_log
    from desk.window.jobs import Jobs
    from desk.window.main_window import MainWindow
    from desk.window.parts.icons import app_icon
    from desk.window.parts.theme import ThemeSwitch
    from desk.window.settings import Settings
    from desk.window.stations import all_stations

    app = _application()
    keeper = ErrorKeeper(app, log_path=start_log())
    keeper.install()
    _log.info("Gapwright %s started", __version__)
    settings = Settings()
    app.setWindowIcon(app_icon())
    theme_switch = ThemeSwitch(app, settings.theme_mode, app)
    jobs = Jobs()
    document = Document(jobs)
    window = MainWindow(
        jobs=jobs,
        document=document,
        settings=settings,
        theme_switch=theme_switch,
        stations=all_stations(),
    )
    keeper.window = window
    keeper.book_is_open = lambda: document.book is not None
    keeper.save_copy = window.files.ask_save
    window.show()
    if path is not None:
        window.files.open(path)
    # A thread that computes in Python hands over after this long: the window repaints in many small steps.
    sys.setswitchinterval(_SWITCH_SECONDS)

    def warm() -> None:
        # What is loaded by now stays: the collector need not look through it again and again, nor, while
        # it is loaded, through what there is so far.
        gc.freeze()
        gc.enable()
        window.make_ahead()

    gc.disable()
    QTimer.singleShot(0, partial(window.warm_up, warm))
    try:
        return app.exec()
    finally:
        gc.enable()
        keeper.uninstall()
        jobs.shutdown()
        from desk.window.parts.plot_parts import clear_store

        clear_store()


def _application() -> QApplication:
    """The application with its names."""
    QApplication.setOrganizationName("Gapwright")
    QApplication.setApplicationName("Gapwright")
    QApplication.setApplicationVersion(__version__)
    QApplication.setDesktopFileName("gapwright")
    found = QApplication.instance()
    return found if isinstance(found, QApplication) else QApplication(sys.argv[:1])
