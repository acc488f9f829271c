"""One part of the station: its pictures, its table and its controls."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from PySide6.QtCore import QObject, QTimer
from PySide6.QtWidgets import QWidget

from desk.book import Book
from desk.scenarios.records import Simulation
from desk.window.jobs import Job
from desk.window.parts.plots import Picture
from desk.window.parts.theme import ThemeSwitch

if TYPE_CHECKING:
    from desk.window.scenarios.station import ScenariosStation

__all__ = ["Part", "ShownRun"]


@dataclass(frozen=True, eq=False)
class ShownRun:
    """A run with the book it was made from.

    Attributes
    ----------
    simulation : Simulation
    book : Book or None
        None where that version of the book is gone: then its paths cannot be drawn once more.
    currency : str
    """

    simulation: Simulation
    book: Book | None
    currency: str


class Part(QObject):
    """A part; it is made when it is first shown.

    Attributes
    ----------
    key, title, purpose : str
        Of the class: a plain name, what its tab says, and one sentence.
    share : int
        Part of the height that the table takes, in percent.
    pictures : tuple of Picture
    shares : tuple of int
        How the pictures share the width.
    table : QWidget
    controls : tuple of QWidget
        Beside the tabs while the part is shown.
    """

    key = ""
    title = ""
    purpose = ""
    share = 44
    shares: tuple[int, ...] = (1, 1)

    def __init__(self, station: ScenariosStation) -> None:
        super().__init__(station)
        self.station = station
        self.pictures: tuple[Picture, ...] = ()
        self.table: QWidget = QWidget()
        self.controls: tuple[QWidget, ...] = ()
        self.run: ShownRun | None = None
        # Pictures and tables take turns, so that the window never stops for all at once.
        self._waiting: list[Callable[[], None]] = []
        self._filling = QTimer(self, singleShot=True, interval=0)
        self._filling.timeout.connect(self._fill_next)

    @property
    def theme_switch(self) -> ThemeSwitch:
        """The theme in use."""
        return self.station.theme_switch

    @property
    def is_busy(self) -> bool:
        """Whether something is still to be drawn."""
        return bool(self._waiting)

    def show_run(self, run: ShownRun) -> None:
        """Show a run, another one or the same once more."""
        is_other = self.run is None or run.simulation is not self.run.simulation
        self.run = run
        if is_other:
            self.take_run(run)

    def take_run(self, run: ShownRun) -> None:
        """Bring everything shown up to date with another run."""
        raise NotImplementedError

    def forget(self) -> None:
        """There is no run any more."""
        self.run = None
        self._waiting.clear()

    def home(self) -> QWidget:
        """What matters most."""
        return self.table

    def views(self) -> tuple[Callable[[], object], ...]:
        """What brings further pictures of it into view."""
        return ()

    # Taking turns

    def soon(self, *steps: Callable[[], None]) -> None:
        """Do `steps`, one a turn, each once however often it was asked for."""
        self._waiting += [step for step in steps if step not in self._waiting]
        self._filling.start()

    def _fill_next(self) -> None:
        if not self._waiting:
            return
        step = self._waiting.pop(0)
        if self._waiting:
            self._filling.start()
        if self.run is not None:
            step()

    # Background work

    def start(
        self, title: str, function: Callable[..., Any], on_done: Callable[[Any], None], *, failed: str
    ) -> Job:
        """Work on the run that is shown; its result is dropped when another run has come meanwhile.

        Parameters
        ----------
        title : str
            What runs, in words.
        function : callable
            A task with all but `progress` and `cancel` given.
        on_done : callable
        failed : str
            What could not be done, for the foot.
        """
        asked = self.run

        def done(result: Any) -> None:
            if self.run is not None and asked is not None and self.run.simulation is asked.simulation:
                on_done(result)

        def fail(error: BaseException) -> None:
            self.station.message.emit(f"{failed}: {error}.")

        return self.station.jobs.start(
            title,
            function,
            on_done=done,
            on_failed=fail,
            exclusive_key=f"{self.key} {title} of {id(self.station)}",
        )
