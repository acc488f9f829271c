"""The station Scenarios: what rates may do, and what follows for both sides."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import partial

from PySide6.QtCore import QSignalBlocker, Qt, QTimer
from PySide6.QtGui import QKeySequence, QShortcut
from PySide6.QtWidgets import (
    QHBoxLayout,
    QLabel,
    QPushButton,
    QStackedWidget,
    QTabBar,
    QVBoxLayout,
    QWidget,
)

from desk import tasks
from desk.book import Book, ModelName
from desk.scenarios.outlook import RunOutlook
from desk.scenarios.suggestions import suggested_model
from desk.window.document import Document
from desk.window.jobs import Job, Jobs
from desk.window.parts import numbers
from desk.window.parts.labels import well_broken
from desk.window.parts.theme import GAP, HALF, STEP, WIDE, ThemeSwitch, keep_look
from desk.window.scenarios.export import PathExport
from desk.window.scenarios.fitting_door import FittingDoor
from desk.window.scenarios.form import RunForm
from desk.window.scenarios.further_parts import ConvergencePart, CurvePart, ValuesPart
from desk.window.scenarios.models_part import ModelsPart
from desk.window.scenarios.part import Part, ShownRun
from desk.window.scenarios.paths_part import PathsPart
from desk.window.scenarios.tables import run_sentence
from desk.window.station import STALE, Station

__all__ = ["ScenariosStation"]

_PARTS: tuple[type[Part], ...] = (PathsPart, CurvePart, ValuesPart, ConvergencePart, ModelsPart)
_MEGABYTE = 1e6
_BETWEEN_PARTS_MS = 100


class ScenariosStation(Station):
    """A run of the book's rates model, its pictures and tables.

    Attributes
    ----------
    tabs : QTabBar
        The parts.
    run_form : RunForm
    export : PathExport
    outlook : RunOutlook or None
        What is known of the run of the book as it stands; None while it is looked into.
    """

    key = "scenarios"
    title = "Scenarios"
    purpose = "What rates may do, and what follows"

    def __init__(
        self, document: Document, jobs: Jobs, theme_switch: ThemeSwitch, parent: QWidget | None = None
    ) -> None:
        super().__init__(document, jobs, theme_switch, parent)
        self._shown: ShownRun | None = None
        self._shown_book: Book | None = None
        self._job: Job | None = None
        self._failure = ""
        self.outlook: RunOutlook | None = None
        self._parts: dict[str, Part] = {}
        self._shown_part = ""
        # Parts take turns to be made before they are wanted: making one and showing it is too much at once.
        self._preparing = QTimer(self, singleShot=True, interval=_BETWEEN_PARTS_MS)
        self._preparing.timeout.connect(self._prepare)
        self.export = PathExport(self, jobs, say=self.message.emit, changed=self.request_refresh)
        self.run_form = RunForm(
            self.form,
            book=lambda: self.document.book,
            change=self._change,
            run=self.run,
            cancel=document.cancel_simulation,
            export=self.ask_export,
        )
        self.fitting = FittingDoor(self)
        self._make_bar()
        self._tables = QStackedWidget()
        self.set_pictures()
        self.set_table(self._tables, share=44)
        self.main.addWidget(self._make_invitation())
        self.set_form_visible()
        self._connect()

    def _make_bar(self) -> None:
        """The tabs of the parts, with the controls of the one that is shown."""
        self.tabs = QTabBar()
        self.tabs.setDrawBase(False)
        self.tabs.setExpanding(False)
        self.tabs.setAccessibleName("Parts of the station Scenarios")
        for each in _PARTS:
            place = self.tabs.addTab(each.title)
            self.tabs.setTabToolTip(place, each.purpose)
        self._bar = QWidget()
        self._row = QHBoxLayout(self._bar)
        self._row.setContentsMargins(GAP, 0, WIDE, HALF)
        self._row.setSpacing(WIDE - STEP)
        self._row.addWidget(self.tabs)
        self._row.addStretch(1)
        column = self.layout()
        if isinstance(column, QVBoxLayout):
            column.insertWidget(1, self._bar)
        self._bar.hide()

    def _make_invitation(self) -> QWidget:
        self.invitation = QWidget()
        self.invitation_text = QLabel()
        self.invitation_text.setWordWrap(True)
        self.invitation_text.setAlignment(Qt.AlignmentFlag.AlignHCenter)
        self.invitation_text.setFixedWidth(100 * STEP)
        self.invitation_button = QPushButton("Run the scenarios")
        keep_look(self.invitation_button, "first")
        self.invitation_button.clicked.connect(lambda _=False: self.run())
        column = QVBoxLayout(self.invitation)
        column.setSpacing(WIDE)
        column.addStretch(2)
        # In a row of its own: a wrapped label that is aligned would get the height of one line.
        row = QHBoxLayout()
        row.addStretch(1)
        row.addWidget(self.invitation_text)
        row.addStretch(1)
        column.addLayout(row)
        column.addWidget(self.invitation_button, 0, Qt.AlignmentFlag.AlignHCenter)
        column.addStretch(3)
        return self.invitation

    def _connect(self) -> None:
        self.tabs.currentChanged.connect(lambda place: self.show_part(_PARTS[place].key))
        self.jobs.progressed.connect(self._on_progress)
        self.document.failed.connect(self._on_failed)
        # They hold while the station is seen, wherever the keyboard is.
        QShortcut(QKeySequence("Ctrl+R"), self).activated.connect(self.run)
        for key, step in (("Ctrl+Tab", 1), ("Ctrl+Shift+Tab", -1)):
            shortcut = QShortcut(QKeySequence(key), self)
            shortcut.setContext(Qt.ShortcutContext.WidgetWithChildrenShortcut)
            shortcut.activated.connect(partial(self._step, step))

    def home(self) -> QWidget:
        """The button that runs, or the one that stops."""
        form = self.run_form
        return form.cancel_button if self.document.is_simulating else form.run_button

    def show_instead(self, page: QWidget) -> None:
        """Put a page in the place of everything under the heading."""
        self._bar.hide()
        super().show_instead(page)

    # Running

    def run(self) -> None:
        """Run the scenarios of the open book as its settings say."""
        book = self.document.book
        if book is None or self.document.is_simulating:
            return
        if book.rates_model is None:
            self.request_refresh()
            return
        self._failure = ""
        self._job = self.document.run_simulation()
        self._preparing.start()
        self.refresh_now()

    def add_model(self) -> None:
        """Give the book a model to begin with: Hull-White."""
        book = self.document.book
        if book is not None and book.rates_model is None:
            model = suggested_model(ModelName.HULL_WHITE, book.basis)
            self.document.edit("New rates model Hull-White", replace(book, rates_model=model))

    def ask_export(self) -> None:
        """Ask where the paths of the run that is shown are to go, and write them."""
        shown = self._shown
        if self.export.is_running and self.export.job is not None:
            self.jobs.cancel(self.export.job)
        elif shown is not None and shown.book is not None:
            name = self.document.path.stem if self.document.path is not None else "book"
            self.export.ask(shown.book, f"{name}_paths")

    def _change(self, text: str, book: Book) -> None:
        self._failure = ""
        self.document.edit(text, book)

    def _on_progress(self, job: Job) -> None:
        if job is self._job and job.is_running:
            done = numbers.ratio(job.progress, 0)
            self.run_form.state.setText("Stopping." if job.is_stopping else f"Running: {done} done.")

    def _on_failed(self, text: str) -> None:
        if text.startswith("The simulation"):
            self._failure = text
            self.request_refresh()

    # Looking ahead

    def _look_ahead(self, book: Book) -> None:
        """Find out in the background what stands in the way of a run, and what it takes."""
        self.outlook = None

        def take(found: RunOutlook) -> None:
            if book is self._shown_book:
                self.outlook = found
                self._show_state()

        self.jobs.start(
            "Looking ahead",
            partial(tasks.look_ahead, book),
            on_done=take,
            exclusive_key=f"outlook of {id(self)}",
        )

    # Showing

    def refresh(self) -> None:
        """Show the run of the open book, and say where it is stale."""
        if self.fitting.follow():
            return
        document = self.document
        book = document.book
        if book is None:
            self._forget()
            self._show_none(
                "Scenarios need a book: what is promised, what is held, and how rates move.",
                "Open a book",
                lambda: self.step_wanted.emit("open"),
            )
            return
        if book.rates_model is None:
            self._show_none(
                "The book does not say how rates move. A Hull-White model can be added to begin with: mean "
                "reversion 0.05 a year, volatility 0.9 % a year, fitted to the book's curve. It is an edit "
                "like any other: it can be changed and undone.",
                "Add a Hull-White model",
                self.add_model,
            )
            return
        self.show_content()
        if book is not self._shown_book:
            self._shown_book = book
            self.run_form.show_book(book)
            self._look_ahead(book)
            # Now, for during a run all goes slower.
            self._preparing.start()
        self._show_state()
        simulation = document.simulation
        if simulation is None:
            self._shown = None
            for part in self._parts.values():
                part.forget()
        elif self._shown is None or simulation is not self._shown.simulation:
            self._shown = ShownRun(simulation, document.simulation_book, book.basis.currency)
        self._show_parts()

    def _forget(self) -> None:
        self._shown = self._shown_book = None
        for part in self._parts.values():
            part.forget()

    def _show_none(self, text: str, button: str, act: Callable[[], object]) -> None:
        self.hide_stale()
        self._bar.hide()
        self.show_empty(text, button, act)

    def _show_state(self) -> None:
        """What runs, what is stale, what failed, what stands in the way."""
        document, form, outlook = self.document, self.run_form, self.outlook
        running = document.is_simulating
        obstacle = "" if outlook is None else outlook.obstacle
        if obstacle:
            obstacle = f"{obstacle[:1].upper()}{obstacle[1:]}."
        had_focus = form.run_button.hasFocus() or form.cancel_button.hasFocus()
        form.run_button.setEnabled(not obstacle)
        shown, hidden = (
            (form.cancel_button, form.run_button) if running else (form.run_button, form.cancel_button)
        )
        shown.show()
        if had_focus:
            # The other one goes: the keyboard would go with it.
            shown.setFocus(Qt.FocusReason.OtherFocusReason)
        hidden.hide()
        there = document.simulation
        about = obstacle or (run_sentence(there) if there is not None else "")
        form.state.setText("Running." if running else well_broken(about))
        form.state.setVisible(running or bool(about))
        form.memory.setText("" if outlook is None or obstacle else _memory_sentence(outlook))
        form.memory.setVisible(bool(form.memory.text()))
        can_export = there is not None and document.simulation_book is not None
        form.export_button.setVisible(can_export)
        form.export_button.setText("Stop the export" if self.export.is_running else "Export the paths…")
        self.invitation_button.setEnabled(not running and not obstacle)
        self.invitation_button.setVisible(not running)
        self.invitation_text.setText(
            "The scenarios run. Their pictures and tables will be here."
            if running
            else obstacle
            or "Draw how rates may move, and see the savings account, the short rate and the present values "
            "of both sides along every path."
        )
        if self._failure:
            self.show_stale("Close", self._close_failure, text=self._failure)
        elif there is not None and document.simulation_is_stale and not running:
            self.show_stale("Run again", self.run)
        elif there is not None and document.simulation_is_stale:
            self.show_stale(text=f"{STALE} A new run is under way.")
        else:
            self.hide_stale()

    def _close_failure(self) -> None:
        self._failure = ""
        self._show_state()

    def _show_parts(self) -> None:
        there = self._shown is not None
        self._bar.setVisible(there)
        self.pictures.setVisible(there)
        self._tables.setVisible(there)
        self.invitation.setVisible(not there)
        if there:
            self._preparing.start()
            self.show_part(self._shown_part or _PARTS[self.tabs.currentIndex()].key)

    # Parts

    @property
    def part(self) -> Part | None:
        """The part that is shown."""
        return self._parts.get(self._shown_part)

    def part_of(self, key: str) -> Part:
        """A part, made where it is not there yet.

        Raises
        ------
        ValueError
            If there is none of this key.
        """
        if key not in self._parts:
            made = next((each for each in _PARTS if each.key == key), None)
            if made is None:
                raise ValueError(f"`key` must be one of {', '.join(each.key for each in _PARTS)}, not {key}")
            part = made(self)
            self._parts[key] = part
            for picture in part.pictures:
                picture.hide()
                self.pictures.addWidget(picture)
            self._tables.addWidget(part.table)
            for control in part.controls:
                control.hide()
                self._row.addWidget(control)
        return self._parts[key]

    def _prepare(self) -> None:
        """Make the next part that is not there yet."""
        missing = next((each.key for each in _PARTS if each.key not in self._parts), None)
        if missing is not None and self.document.book is not None:
            self.part_of(missing)
            self._preparing.start()

    def show_part(self, key: str) -> None:
        """Show a part.

        Raises
        ------
        ValueError
            If there is none of this key.
        """
        if self._shown is None:
            return
        part, former = self.part_of(key), self.part
        place = next(place for place, each in enumerate(_PARTS) if each.key == key)
        with QSignalBlocker(self.tabs):
            self.tabs.setCurrentIndex(place)
        if former is not part:
            if former is not None:
                for widget in (*former.pictures, *former.controls):
                    widget.hide()
            self._shown_part = key
            self._tables.setCurrentWidget(part.table)
            for widget in (*part.pictures, *part.controls):
                widget.show()
            self.main.setSizes([10 * (100 - part.share), 10 * part.share, 0])
            # What was hidden has no width yet.
            QTimer.singleShot(0, self, self._share_pictures)
        part.show_run(self._shown)

    def _share_pictures(self) -> None:
        """Give the pictures of the part that is shown their shares of the width."""
        part = self.part
        if part is None:
            return
        shares = dict(zip(part.pictures, part.shares, strict=False))
        found = [self.pictures.widget(place) for place in range(self.pictures.count())]
        whole = max(self.pictures.width(), 1)
        self.pictures.setSizes([whole * shares.get(one, 0) for one in found])  # type: ignore[call-overload]

    def _step(self, step: int) -> None:
        self.tabs.setCurrentIndex((self.tabs.currentIndex() + step) % self.tabs.count())

    @property
    def is_busy(self) -> bool:
        """Whether something of the part that is shown is still to be drawn."""
        return self.part is not None and self.part.is_busy

    def views(self) -> tuple[Callable[[], object], ...]:
        """The further quantities, and the other parts."""
        if self._shown is None:
            return ()
        self.show_part(PathsPart.key)
        first = self.part_of(PathsPart.key)
        further = [each.key for each in _PARTS[1:] if each is not ModelsPart]
        return (*first.views(), *(partial(self.show_part, key) for key in further))


def _memory_sentence(outlook: RunOutlook) -> str:
    """What a run takes."""
    megabytes = outlook.memory / _MEGABYTE
    taken = f"{numbers.number(max(megabytes, 1.0), 0)}\N{NO-BREAK SPACE}MB"
    drawn = f"{numbers.integer(outlook.paths)} paths of {numbers.integer(outlook.steps)} steps"
    return f"A run draws {drawn} and takes about {taken} of memory."
