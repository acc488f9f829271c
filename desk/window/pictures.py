"""Pictures without a screen: those of every station for a batch, and the whole window for looking at.

``python -m desk.window.pictures OUT BOOK [--size 1440x900] [--dark]`` draws every station of the window.
"""

from __future__ import annotations

import argparse
import os
import re
import sys
import time
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from PySide6.QtCore import QEventLoop, QLocale, QSize, Qt, QTimer
from PySide6.QtWidgets import QApplication

from desk.intake.records import Reading
from desk.scenarios.records import Simulation
from desk.valuation.records import Standing
from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.parts.theme import ThemeSwitch
from desk.window.stations import all_stations

if TYPE_CHECKING:
    from desk.window.main_window import MainWindow
    from desk.window.parts.plots import Picture
    from desk.window.station import Station

__all__ = ["draw_all", "draw_window", "main"]

_SIZE = QSize(960, 540)
"""Of a picture [px]; in a PNG there are twice as many."""
_PATIENCE_SECONDS = 600.0


def draw_all(reading: Reading, standing: Standing, simulation: Simulation | None, folder: Path) -> list[Path]:
    """Draw the pictures of every station from results that are there.

    Parameters
    ----------
    reading : Reading
        With the book.
    standing : Standing
    simulation : Simulation or None
        None leaves its pictures out.
    folder : Path
        Where they go; it is made where it is missing.

    Returns
    -------
    list of Path
        A PNG at twice the size and an SVG of each picture, named by station and title.

    Raises
    ------
    ValueError
        If the reading has no book.
    OSError
        If a file cannot be written.
    """
    if reading.book is None:
        raise ValueError("`reading` must have a book")
    folder.mkdir(parents=True, exist_ok=True)
    app = _application()
    with _PlainFigures():
        jobs = Jobs()
        switch = ThemeSwitch(app, "light")
        document = Document(jobs, value=_given(standing), simulate=_given(simulation))
        try:
            document.open_reading(reading)
            if simulation is not None:
                document.run_simulation()
            _wait(lambda: not jobs.running)
            written: list[Path] = []
            stations: list[Station] = []
            taken: list[Picture] = []
            for entry in all_stations():
                if entry.key == "scenarios" and simulation is None:
                    continue
                station = entry.load()(document, jobs, switch)
                stations.append(station)
                written += _draw_station(station, jobs, folder, taken)
                station.hide()
            for drawn in (*taken, *stations):
                drawn.close()
                drawn.deleteLater()
        finally:
            document.stop()
            jobs.shutdown()
        return written


def _draw_station(station: Station, jobs: Jobs, folder: Path, taken: list[Picture]) -> list[Path]:
    """The pictures of one station, also those on parts of it that are not seen at first.

    They are `taken` out of it, and live on: pyqtgraph does not bear that one is destroyed while the next one
    is made, and the station goes on to show and to hide them.
    """
    from desk.window.parts.plots import Picture

    station.setAttribute(Qt.WidgetAttribute.WA_DontShowOnScreen)
    station.show()
    station.refresh_now()
    _wait(lambda: not jobs.running)
    written: list[Path] = []
    names: set[str] = set()
    own: list[Picture] = []
    for view in (None, *station.views()):
        if view is not None:
            view()
            _wait(lambda: not jobs.running)
            station.refresh_now()
            _settle()
        found = [one for one in station.findChildren(Picture) if one.isVisible()]
        for picture in found:
            # On its own it has the same shape whatever room the station would have given it.
            picture.setParent(None)
            picture.setAttribute(Qt.WidgetAttribute.WA_DontShowOnScreen)
            picture.resize(_SIZE)
            picture.show()
        own += found
        for picture in own:
            name = re.sub(r"[^a-z0-9]+", "-", picture.title.casefold()).strip("-") or "picture"
            if not picture.isVisible() or name in names:
                continue
            names.add(name)
            _settle()
            picture.settle()
            for ending in ("png", "svg"):
                path = folder / f"{station.key}-{name}.{ending}"
                picture.save(path)
                written.append(path)
    for picture in own:
        picture.hide()
    taken += own
    return written


def draw_window(
    book: Path,
    folder: Path,
    *,
    size: QSize,
    dark: bool = False,
    progress: Callable[[str], None] | None = None,
) -> list[Path]:
    """Draw the whole window at every station, with a book valued and simulated.

    Parameters
    ----------
    book : Path
    folder : Path
        Where the pictures go; it is made where it is missing.
    size : QSize
        Of the window [px].
    dark : bool, optional
    progress : callable, optional
        Called with the name of what is drawn.

    Returns
    -------
    list of Path
        One PNG a station, and one of the welcome.

    Raises
    ------
    ValueError
        If the book cannot be used: the message holds its faults.
    """
    from desk.window.main_window import MainWindow
    from desk.window.settings import Settings

    folder.mkdir(parents=True, exist_ok=True)
    tell = progress or (lambda _: None)
    app = _application()
    jobs = Jobs()
    switch = ThemeSwitch(app, "dark" if dark else "light")
    document = Document(jobs)
    settings = Settings(folder / "settings.ini")
    window = MainWindow(
        jobs=jobs, document=document, settings=settings, theme_switch=switch, stations=all_stations()
    )
    written: list[Path] = []
    try:
        window.setAttribute(Qt.WidgetAttribute.WA_DontShowOnScreen)
        window.resize(size)
        window.show()
        _wait(lambda: not jobs.running)
        written.append(_grab(window, folder / "welcome.png"))
        window.files.open(book)
        _wait(lambda: not jobs.running)
        if document.book is None:
            faults = document.reading.faults if document.reading else ()
            raise ValueError("; ".join(str(fault) for fault in faults) or f"{book} could not be read")
        if document.book.rates_model is not None:
            tell("simulation")
            document.run_simulation()
            _wait(lambda: not jobs.running)
        for entry in all_stations():
            tell(entry.title)
            window.show_station(entry.key)
            window.station(entry.key).refresh_now()
            _wait(lambda: not jobs.running)
            window.foot.show_caution()
            written.append(_grab(window, folder / f"{entry.key}.png"))
    finally:
        window.close()
        document.stop()
        jobs.shutdown()
        window.deleteLater()
        settings.path.unlink(missing_ok=True)
    return written


def _grab(window: MainWindow, path: Path) -> Path:
    _settle()
    if not window.grab().save(str(path)):
        raise OSError(f"{path} cannot be written")
    return path


def _given(result: Any) -> Callable[..., Any]:
    """A task that gives a result that is there."""

    def give(_book: object, *, progress: Callable[[float], None], cancel: object) -> Any:
        del progress, cancel
        return result

    return give


def _wait(is_over: Callable[[], bool]) -> None:
    """Let the event loop run until something is over, and what it led to is drawn."""
    end = time.monotonic() + _PATIENCE_SECONDS
    loop = QEventLoop()
    watch = QTimer(interval=5)
    watch.timeout.connect(lambda: loop.quit() if is_over() or time.monotonic() > end else None)
    watch.start()
    loop.exec()
    watch.stop()
    if not is_over():
        raise TimeoutError("the results did not come")
    _settle()


def _settle() -> None:
    """Let posted events and single-shot timers have their turn."""
    loop = QEventLoop()
    QTimer.singleShot(60, loop.quit)
    loop.exec()


class _PlainFigures:
    """Files show figures in one way whatever the machine's locale."""

    def __enter__(self) -> None:
        self._former = QLocale()
        QLocale.setDefault(QLocale(QLocale.Language.English, QLocale.Country.World))

    def __exit__(self, *_: object) -> None:
        QLocale.setDefault(self._former)


def _application() -> QApplication:
    """The application, without a screen where none was made yet."""
    found = QApplication.instance()
    if isinstance(found, QApplication):
        return found
    os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
    return QApplication(sys.argv[:1])


def main(arguments: Sequence[str] | None = None) -> int:
    """Draw the window for a command line; returns the exit status."""
    parser = argparse.ArgumentParser(prog="python -m desk.window.pictures", description=main.__doc__)
    parser.add_argument("out", type=Path, metavar="OUT", help="the folder that the pictures go to")
    parser.add_argument("book", type=Path, metavar="BOOK", help="the book to show")
    parser.add_argument("--size", default="1440x900", help="of the window, in pixels")
    parser.add_argument("--dark", action="store_true", help="in the dark theme")
    options = parser.parse_args(arguments)
    size = re.fullmatch(r"(\d{3,4})x(\d{3,4})", options.size)
    if size is None:
        parser.error("--size is a width and a height, such as 1440x900")
    os.environ["QT_QPA_PLATFORM"] = "offscreen"
    QLocale.setDefault(QLocale(QLocale.Language.English, QLocale.Country.World))
    try:
        written = draw_window(
            options.book, options.out, size=QSize(int(size[1]), int(size[2])), dark=options.dark
        )
    except (OSError, ValueError) as error:
        print(error, file=sys.stderr)  # noqa: T201
        return 2
    for path in written:
        print(path)  # noqa: T201
    return 0


if __name__ == "__main__":
    sys.exit(main())
