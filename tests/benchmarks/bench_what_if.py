"""How long one pull at a what-if slider takes, from the pull until the window is drawn again.

Run as ``python tests/benchmarks/bench_what_if.py``. Of every case it prints the frame, which is both sides
revalued, and the whole turn with headline, pictures and table: medians of processor time, and how many of
16 ms they are. 100,000 flows fall on 720 different months or on as many different times as there are rows.
It is drawn without a screen unless ``QT_QPA_PLATFORM`` names a platform.
"""

from __future__ import annotations

import os
import sys
import tempfile
import time
from collections.abc import Callable
from datetime import date
from pathlib import Path
from statistics import median

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

import numpy as np
from PySide6.QtWidgets import QApplication

from desk.book import Basis, Book, FlowTable, Holding, HoldingKind, Inflation
from desk.intake.records import Reading
from desk.window.document import Document
from desk.window.jobs import Jobs
from desk.window.main_window import MainWindow
from desk.window.parts.theme import ThemeSwitch
from desk.window.settings import Settings
from desk.window.shocks.station import ShocksStation
from desk.window.shocks.what_if_mode import WhatIfMode
from desk.window.stations import all_stations

__all__ = ["main"]

ROWS, HOLDINGS, PULLS = 100_000, 200, 80
TARGET_MS = 16.0
_PATIENCE_SECONDS = 60.0


def _book(*, by_month: bool) -> Book:
    """A large book with bonds and a fund."""
    random = np.random.default_rng(1)
    time_of = random.integers(1, 721, ROWS) / 12.0 if by_month else random.uniform(0.1, 60.0, ROWS)
    terms = np.array([1.0, 2.0, 5.0, 10.0, 20.0, 30.0])
    basis = Basis(
        date(2031, 3, 31),
        "EUR",
        terms,
        0.02 + 0.0004 * terms,
        inflation=Inflation(np.array([1.0, 20.0]), np.array([0.02, 0.022])),
    )
    bonds = (
        Holding(
            f"bond {number}",
            HoldingKind.BOND,
            1e8,
            0.03,
            1,
            date(2033 + number % 28, 3, 31),
            market_value=1e8,
        )
        for number in range(HOLDINGS)
    )
    fund = Holding("fund", HoldingKind.FUND, 1.0, market_value=1e9)
    lines = [f"line {number % 20}" for number in range(ROWS)]
    flows = FlowTable.build(lines, time_of, random.uniform(1e4, 1e5, ROWS))
    return Book(basis, flows, holdings=(*bonds, fund))


def _wait(app: QApplication, is_over: Callable[[], bool]) -> None:
    end = time.monotonic() + _PATIENCE_SECONDS
    while not is_over():
        if time.monotonic() > end:
            raise SystemExit("the window did not come to rest")
        app.processEvents()
        time.sleep(0.002)


def _pulled(app: QApplication, mode: WhatIfMode, key: str) -> tuple[float, float]:
    """Medians of a frame and of a turn [ms of processor time]."""
    what_if = mode.document.what_if
    row = mode.rows[key]
    turns, frames = [], []
    for number in range(PULLS):
        begin = time.process_time()
        row.slider.setValue(number - PULLS // 2 or PULLS)
        app.processEvents()
        _wait(app, lambda: what_if.shock is not None and not mode.jobs.running)
        app.processEvents()
        turns.append(1e3 * (time.process_time() - begin))
        engine, shock = what_if.engine, what_if.shock
        if engine is None or shock is None:
            raise SystemExit("the book is not ready to be moved")
        begin = time.process_time()
        engine.frame(shock)
        frames.append(1e3 * (time.process_time() - begin))
    mode.put_back()
    return median(frames), median(turns)


def _mode(app: QApplication, window: MainWindow, book: Book) -> WhatIfMode:
    """The mode What-if of a window with the book, ready to be moved."""
    jobs, document = window.jobs, window.document
    document.open_reading(Reading(Path("book.xlsx"), "ab" * 32, book, (), ()))
    _wait(app, lambda: not jobs.running)
    window.show_station("shocks")
    station = window.station("shocks")
    if not isinstance(station, ShocksStation):
        raise SystemExit("the station is another one")
    station.refresh_now()
    _wait(app, lambda: document.shocks.result is not None)
    station.refresh_now()
    station.show_mode("what_if")
    _wait(app, lambda: document.what_if.is_ready)
    if not isinstance(station.mode, WhatIfMode):
        raise SystemExit("the mode is another one")
    return station.mode


def _measure(app: QApplication, folder: Path) -> None:
    for by_month in (True, False):
        jobs = Jobs()
        window = MainWindow(
            jobs=jobs,
            document=Document(jobs),
            settings=Settings(folder / f"{by_month}.ini"),
            theme_switch=ThemeSwitch(app, "light"),
            stations=all_stations(),
        )
        window.resize(1440, 900)
        window.show()
        mode = _mode(app, window, _book(by_month=by_month))
        print(f"{ROWS:,} flows at {'720 months' if by_month else 'different times'}")
        for key in ("level", "term_10", "inflation", "spread", "fund"):
            frame, turn = _pulled(app, mode, key)
            shares = f"{frame / TARGET_MS:.2f} and {turn / TARGET_MS:.2f} of {TARGET_MS:.0f} ms"
            print(f"  {mode.rows[key].handle.label}: frame {frame:.1f} ms, turn {turn:.1f} ms; {shares}")
        window.discard_changes()
        window.close()


def main() -> None:
    """Print the figures."""
    app = QApplication.instance() or QApplication(sys.argv[:1])
    if not isinstance(app, QApplication):
        raise SystemExit("there is no window system")
    with tempfile.TemporaryDirectory() as folder:
        _measure(app, Path(folder))


if __name__ == "__main__":
    main()
