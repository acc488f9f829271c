"""How soon the window is up, and how long its event loop pauses while a large book goes through it.

Run as ``python tests/benchmarks/bench_window.py``. Targets: up within 2 s, and no pause longer than 50 ms
while anything runs. It is drawn without a screen unless ``QT_QPA_PLATFORM`` names a platform.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from statistics import median

__all__ = ["main"]

ROOT = Path(__file__).resolve().parents[2]
BOOK = ROOT / "demo_books" / "life_insurer.xlsx"
STARTS = 5
UP_TARGET_SECONDS = 2.0
PAUSE_TARGET_MS = 50.0
_TICK_MS = 10
_PATIENCE_SECONDS = 120.0
_SETTLED = 20
"""Looks, 15 ms apart, for which a step must be over."""

_BARE = """
import os, time
from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QApplication, QWidget
class Bare(QWidget):
    def paintEvent(self, event):
        print(time.time() - float(os.environ["STARTED_AT"]), flush=True)
        QTimer.singleShot(0, self.close)
app = QApplication([])
window = Bare()
window.show()
app.exec()
"""


def _environment(folder: Path) -> dict[str, str]:
    """Settings, log and report in a folder of their own."""
    names = ("WORK_FOLDER", "XDG_CONFIG_HOME", "XDG_STATE_HOME", "XDG_DATA_HOME")
    places = {name: str(folder) for name in names}
    return {"QT_QPA_PLATFORM": "offscreen", **os.environ, **places, "PYTHONPATH": str(ROOT)}


def _child(arguments: list[str]) -> str:
    with tempfile.TemporaryDirectory() as folder:
        environment = _environment(Path(folder)) | {"STARTED_AT": repr(time.time())}
        ended = subprocess.run(
            [sys.executable, *arguments], env=environment, capture_output=True, text=True, check=True
        )
    return ended.stdout.strip().splitlines()[-1]


class _Longest:
    """The longest pause of the event loop in each step of the work, seen by a timer of 10 ms."""

    def __init__(self) -> None:
        from PySide6.QtCore import Qt, QTimer

        self.longest: dict[str, float] = {}
        self.step = "start"
        self._last = time.perf_counter()
        self._timer = QTimer(interval=_TICK_MS, timerType=Qt.TimerType.PreciseTimer)
        self._timer.timeout.connect(self._tick)
        self._timer.start()

    def enter(self, step: str) -> None:
        """Count what follows under another name."""
        self._tick()
        self.step = step

    def _tick(self) -> None:
        now = time.perf_counter()
        pause = 1e3 * (now - self._last) - _TICK_MS
        self._last = now
        self.longest[self.step] = max(self.longest.get(self.step, 0.0), pause)


def _watch_start() -> None:
    """In a process of its own: the window until its first paint."""
    from PySide6.QtCore import QEvent, QObject
    from PySide6.QtWidgets import QApplication, QMainWindow

    from desk.window.app import run

    class First(QObject):
        """Tells when a main window is painted first, and closes it."""

        def eventFilter(self, watched: QObject, event: QEvent) -> bool:
            """Look at every event."""
            if event.type() is QEvent.Type.Paint and isinstance(watched, QMainWindow):
                print(time.time() - float(os.environ["STARTED_AT"]), flush=True)
                QApplication.quit()
            return False

    app = QApplication(sys.argv[:1])
    first = First()
    app.installEventFilter(first)
    run(None)
    app.removeEventFilter(first)


def _steps(window: object, folder: Path, longest: _Longest) -> Iterator[Callable[[], bool]]:
    """What a reader does, one step after the other; each yields whether it is over."""
    from desk.window.main_window import MainWindow

    assert isinstance(window, MainWindow)
    document, jobs = window.document, window.jobs

    def quiet() -> bool:
        return not jobs.running

    yield lambda: quiet() and all(key in window._stations for key in window._entries)
    # Only now, for the window loads them beside its event loop.
    from desk.window.report.station import ReportStation
    from desk.window.scenarios.further_parts import ValuesPart
    from desk.window.scenarios.station import ScenariosStation

    longest.enter("book opened and valued")
    window.files.open(BOOK)
    yield lambda: quiet() and document.standing is not None
    for key in ("intake", "curve", "standing", "scenarios", "report"):
        longest.enter(f"first sight of {window.station(key).title}")
        window.show_station(key)
        yield quiet
    longest.enter("run simulated and shown")
    window.show_station("scenarios")
    document.run_simulation()
    yield lambda: quiet() and document.simulation is not None
    longest.enter("present values shown")
    scenarios = window.station("scenarios")
    assert isinstance(scenarios, ScenariosStation)
    scenarios.show_part(ValuesPart.key)
    yield quiet
    longest.enter("report laid out")
    window.show_station("report")
    yield quiet
    longest.enter("report written")
    report = window.station("report")
    assert isinstance(report, ReportStation)
    report.target.set_value(str(folder / "report.xlsx"))
    report.write()
    yield lambda: quiet() and (folder / "report.xlsx").exists()


def _watch_work() -> None:
    """In a process of its own: the insurer's book from the welcome to the report."""
    from PySide6.QtCore import QTimer
    from PySide6.QtWidgets import QApplication

    from desk.window.app import run
    from desk.window.main_window import MainWindow

    app = QApplication(sys.argv[:1])
    end = time.monotonic() + _PATIENCE_SECONDS
    longest: _Longest | None = None
    steps: Iterator[Callable[[], bool]] = iter(())
    is_over: Callable[[], bool] = bool
    settled, done = 0, False

    def look() -> None:
        nonlocal longest, steps, is_over, settled, done
        window = next((each for each in app.topLevelWidgets() if isinstance(each, MainWindow)), None)
        if window is None or time.monotonic() > end:
            app.quit()
            return
        if longest is None:
            longest = _Longest()
            steps = _steps(window, Path(os.environ["WORK_FOLDER"]), longest)
            is_over = next(steps)
        # What a step led to, single shots and repaints, belongs to it.
        settled = settled + 1 if is_over() else 0
        if settled < _SETTLED:
            return
        settled = 0
        try:
            is_over = next(steps)
        except StopIteration:
            done = True
            app.quit()

    watch = QTimer(interval=15)
    watch.timeout.connect(look)
    watch.start()
    run(None)
    told = longest.longest if longest is not None else {}
    print(json.dumps({"done": done, "longest": told}))


def main() -> int:
    """Print the figures."""
    here = str(Path(__file__).resolve())
    bare = median(float(_child(["-c", _BARE])) for _ in range(STARTS))
    ours = median(float(_child([here, "--start"])) for _ in range(STARTS))
    print(f"a bare window is up after {bare:.2f} s, ours after {ours:.2f} s: {ours / bare:.1f} times")
    print(f"  target: within {UP_TARGET_SECONDS:.0f} s")
    told = json.loads(_child([here, "--work"]))
    print(f"longest pause of the event loop [ms], {BOOK.name}; target: {PAUSE_TARGET_MS:.0f}")
    for step, pause in told["longest"].items():
        print(f"  {pause:6.1f}  {step}")
    if not told["done"]:
        print("  the work did not come to its end in time")
        return 1
    return 0


if __name__ == "__main__":
    if sys.argv[1:] == ["--start"]:
        _watch_start()
    elif sys.argv[1:] == ["--work"]:
        _watch_work()
    else:
        sys.exit(main())
