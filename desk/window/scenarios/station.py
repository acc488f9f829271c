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
    QSlider,
    QVBoxLayout,
    QWidget,
)

from desk.book import Book, ModelName
from desk.scenarios.models import rate_model
from desk.scenarios.records import Simulation
from desk.scenarios.suggestions import suggested_model
from desk.window.document import Document
from desk.window.jobs import Job, Jobs
from desk.window.parts import numbers
from desk.window.parts.boxes import TickBox
from desk.window.parts.fields import Combo
from desk.window.parts.labels import well_broken
from desk.window.parts.theme import STEP, WIDE, ThemeSwitch, keep_look
from desk.window.scenarios.fitting_door import FittingDoor
from desk.window.scenarios.form import RunForm
from desk.window.scenarios.pictures import FanPicture, HistogramPicture, ValuesPicture
from desk.window.scenarios.tables import PercentilesTable, RepricingTable, ValuesTable, run_sentence
from desk.window.standing.pages import Pages
from desk.window.station import STALE, Station

__all__ = ["ScenariosStation"]

_QUANTITIES = ("account", "rate", "values")
_SMALL_TABLE = 184
"""Height of the table of present values with its tabs [px]."""
_TITLES = ("Savings account", "Short rate", "Present values")


class ScenariosStation(Station):
    """A run of the book's rates model, its pictures and tables.

    Attributes
    ----------
    year : int
        Whose histogram is shown.
    """

    key = "scenarios"
    title = "Scenarios"
    purpose = "What rates may do, and what follows"

    def __init__(
        self, document: Document, jobs: Jobs, theme_switch: ThemeSwitch, parent: QWidget | None = None
    ) -> None:
        super().__init__(document, jobs, theme_switch, parent)
        self.year = 0
        self._shown: Simulation | None = None
        self._shown_book: Book | None = None
        self._job: Job | None = None
        self._failure = ""
        self._usual_sizes: list[int] = []
        self._values_pictures: tuple[ValuesPicture, ...] = ()
        # Pictures and tables take turns, so that the window never stops for all at once.
        self._waiting: list[Callable[[], None]] = []
        self._filling = QTimer(self, singleShot=True, interval=0)
        self._filling.timeout.connect(self._fill_next)
        self.run_form = RunForm(
            self.form,
            book=lambda: self.document.book,
            change=self._change,
            run=self.run,
            cancel=document.cancel_simulation,
        )
        self._make_controls()
        self.fitting = FittingDoor(self)
        self.fan = FanPicture(theme_switch)
        self.histogram = HistogramPicture(theme_switch)
        self.percentiles = PercentilesTable(theme_switch)
        self.repricing = RepricingTable(theme_switch)
        self.values = ValuesTable(theme_switch)
        for teller in (
            self.fan,
            self.histogram,
            self.percentiles,
            self.repricing,
            self.values,
        ):
            teller.message.connect(self.message)
        self.pages = Pages(theme_switch, name="Tables of the run")
        self.pages.add("percentiles", "Percentiles by year", self.percentiles)
        self.pages.add("repricing", "Check against the curve", self.repricing)
        self.pages.add("values", "Present values", self.values)
        self.in_full = TickBox("Intervals and closed form")
        self.in_full.setChecked(True)
        self.pages.add_control(self.in_full)
        self.set_pictures(self.fan, self.histogram)
        for place, share in enumerate((3, 2)):
            self.pictures.setStretchFactor(place, share)
        self.set_table(self.pages, share=44)
        self.main.addWidget(self._make_invitation())
        self.set_form_visible()
        self._connect()

    def _make_controls(self) -> None:
        self.quantity = Combo()
        self.quantity.addItems(list(_TITLES))
        self.quantity.setAccessibleName("Shown")
        self.logarithmic = TickBox("Log scale")
        self.with_paths = TickBox("Some paths")
        self.slider = QSlider(Qt.Orientation.Horizontal)
        self.slider.setFixedWidth(32 * STEP)
        self.slider.setAccessibleName("Year of the histogram")
        self.year_label = QLabel()
        self.year_label.setBuddy(self.slider)
        self.year_label.setFixedWidth(self.fontMetrics().horizontalAdvance("Year 200") + STEP)
        for widget in (self.quantity, self.logarithmic, self.with_paths, self.year_label, self.slider):
            self.add_to_heading(widget)

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
        self.quantity.currentIndexChanged.connect(lambda _: self._on_quantity())
        for box in (self.logarithmic, self.with_paths):
            box.toggled.connect(lambda _: self._soon(self._draw_fan))
        self.in_full.toggled.connect(lambda _: self._soon(self._fill_table))
        self.pages.changed.connect(lambda _: self._soon(self._share_height, self._fill_table))
        self.slider.valueChanged.connect(self.set_year)
        self.fan.year_chosen.connect(lambda year: self.set_year(round(year)))
        self.jobs.progressed.connect(self._on_progress)
        self.document.failed.connect(self._on_failed)
        # It holds while the station is seen, wherever the keyboard is.
        QShortcut(QKeySequence("Ctrl+R"), self).activated.connect(self.run)

    def home(self) -> QWidget:
        """The button that runs, or the one that stops."""
        form = self.run_form
        return form.cancel_button if self.document.is_simulating else form.run_button

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
        self.refresh_now()

    def add_model(self) -> None:
        """Give the book a model to begin with: Hull-White."""
        book = self.document.book
        if book is not None and book.rates_model is None:
            model = suggested_model(ModelName.HULL_WHITE, book.basis)
            self.document.edit("New rates model Hull-White", replace(book, rates_model=model))

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

    # Showing

    def refresh(self) -> None:
        """Show the run of the open book, and say where it is stale."""
        if self.fitting.follow():
            return
        document = self.document
        book = document.book
        if book is None:
            self._shown = self._shown_book = None
            self._show_none(
                "Scenarios need a book: what is promised, what is held, and how rates move.",
                "Open a book",
                "open",
            )
            return
        if book.rates_model is None:
            self._show_none(
                "The book does not say how rates move. A Hull-White model can be added to begin with: mean "
                "reversion 0.05 a year, volatility 0.9 % a year, fitted to the book's curve. It is an edit "
                "like any other: it can be changed and undone.",
                "Add a Hull-White model",
                "model",
            )
            return
        self.show_content()
        if book is not self._shown_book:
            self._shown_book = book
            self.run_form.show_book(book)
        self._show_state()
        simulation = document.simulation
        if simulation is None:
            self._shown = None
        elif simulation is not self._shown:
            self._shown = simulation
            self._show_run(simulation)
        self._show_parts()

    def _show_none(self, text: str, button: str, step: str) -> None:
        self.hide_stale()
        for widget in (self.quantity, self.logarithmic, self.with_paths, self.year_label, self.slider):
            widget.hide()
        act = self.add_model if step == "model" else lambda: self.step_wanted.emit(step)
        self.show_empty(text, button, act)

    def _show_state(self) -> None:
        """What runs, what is stale, what failed, what stands in the way."""
        document, form = self.document, self.run_form
        running = document.is_simulating
        obstacle = self._obstacle()
        had_focus = form.run_button.hasFocus() or form.cancel_button.hasFocus()
        form.run_button.setEnabled(not obstacle)
        for button, wanted in ((form.cancel_button, running), (form.run_button, not running)):
            if wanted:
                button.show()
                if had_focus:
                    # The other one goes: the keyboard would go with it.
                    button.setFocus(Qt.FocusReason.OtherFocusReason)
        form.run_button.setVisible(not running)
        form.cancel_button.setVisible(running)
        there = document.simulation
        about = obstacle or (run_sentence(there) if there is not None else "")
        form.state.setText("Running." if running else well_broken(about))
        form.state.setVisible(running or bool(about))
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
        elif document.simulation is not None and document.simulation_is_stale and not running:
            self.show_stale("Run again", self.run)
        elif document.simulation is not None and document.simulation_is_stale:
            self.show_stale(text=f"{STALE} A new run is under way.")
        else:
            self.hide_stale()

    def _close_failure(self) -> None:
        self._failure = ""
        self._show_state()

    def _obstacle(self) -> str:
        """Why the model of the book cannot be drawn; empty where it can."""
        book = self.document.book
        if book is None:
            return ""
        try:
            rate_model(book)
        except ValueError as error:
            return f"{error}."
        return ""

    @property
    def values_pictures(self) -> tuple[ValuesPicture, ...]:
        """Present values of both sides, and of the surplus; made when they are first wanted."""
        if not self._values_pictures:
            self._values_pictures = (ValuesPicture(self.theme_switch), ValuesPicture(self.theme_switch))
            for picture in self._values_pictures:
                picture.message.connect(self.message)
                self.pictures.addWidget(picture)
                self.pictures.setStretchFactor(self.pictures.count() - 1, 1)
                picture.hide()
        return self._values_pictures

    def views(self) -> tuple[Callable[[], object], ...]:
        """The short rate and the present values."""
        return tuple(partial(self.quantity.setCurrentIndex, place) for place in range(1, len(_QUANTITIES)))

    @property
    def shown_quantity(self) -> str:
        """``account``, ``rate`` or ``values``."""
        return _QUANTITIES[max(self.quantity.currentIndex(), 0)]

    def _show_parts(self) -> None:
        there = self._shown is not None
        quantity = self.shown_quantity
        of_values = quantity == "values"
        self.pictures.setVisible(there)
        self.pages.setVisible(there)
        self.invitation.setVisible(not there)
        for picture in (self.fan, self.histogram):
            picture.setVisible(not of_values)
        if of_values or self._values_pictures:
            for of_side in self.values_pictures:
                of_side.setVisible(of_values)
        self.quantity.setVisible(there)
        for control in (self.year_label, self.slider):
            control.setVisible(there and not of_values)
        for box in (self.logarithmic, self.with_paths):
            box.setVisible(there and quantity == "account")

    def _show_run(self, simulation: Simulation) -> None:
        last = len(simulation.savings_account.year) - 1
        if not 1 <= self.year <= last:
            self.year = max(1, last // 2)
        with QSignalBlocker(self.slider):
            self.slider.setRange(1, last)
        self._show_year_chosen()
        self._draw()

    def _share_height(self) -> None:
        """Give the pictures what a table of three rows does not need."""
        small = self.shown_quantity == "values" and self.pages.current == "values"
        if small and not self._usual_sizes:
            self._usual_sizes = self.main.sizes()
            self.main.setSizes([sum(self._usual_sizes) - _SMALL_TABLE, _SMALL_TABLE, 0])
        elif not small and self._usual_sizes:
            self.main.setSizes(self._usual_sizes)
            self._usual_sizes = []

    def _on_quantity(self) -> None:
        self._show_parts()
        if self.shown_quantity == "values":
            self.pages.show_page("values")
        elif self.pages.current == "values":
            self.pages.show_page("percentiles")
        self._draw()

    def _draw(self) -> None:
        self._soon(self._draw_fan, self._draw_year, self._draw_values, self._fill_table)

    def _soon(self, *steps: Callable[[], None]) -> None:
        """Do `steps`, one a turn, each once however often it was asked for."""
        self._waiting += [step for step in steps if step not in self._waiting]
        self._filling.start()

    def _fill_next(self) -> None:
        step = self._waiting.pop(0)
        if self._waiting:
            self._filling.start()
        step()

    def set_year(self, year: int) -> None:
        """Show the histogram of another year."""
        if self._shown is None:
            return
        year = min(max(year, 1), len(self._shown.savings_account.year) - 1)
        if year != self.year:
            self.year = year
            self._show_year_chosen()
            self._draw_year()

    def _show_year_chosen(self) -> None:
        with QSignalBlocker(self.slider):
            self.slider.setValue(self.year)
        self.year_label.setText(f"Year {self.year}")

    def _draw_fan(self) -> None:
        if self._shown is None or self.shown_quantity == "values":
            return
        self.fan.show_run(
            self._shown,
            self.shown_quantity,
            logarithmic=self.logarithmic.isChecked(),
            with_paths=self.with_paths.isChecked(),
        )
        self._mark_year()

    def _draw_year(self) -> None:
        if self._shown is not None and self.shown_quantity != "values":
            self.histogram.show_year(self._shown, self.shown_quantity, self.year)
            self._mark_year()

    def _mark_year(self) -> None:
        if self._shown is not None:
            self.fan.mark_year(float(self._shown.savings_account.year[self.year]))

    def _draw_values(self) -> None:
        book = self.document.book
        if self._shown is None or book is None or self.shown_quantity != "values":
            return
        by_name = {each.name: each for each in self._shown.present_value}
        sides = [by_name[name] for name in ("assets", "liabilities") if name in by_name]
        both, surplus = self.values_pictures
        both.show_values("Assets and liabilities", sides, book.basis.currency)
        if "surplus" in by_name:
            surplus.show_values("Surplus", [by_name["surplus"]], book.basis.currency)

    def _fill_table(self) -> None:
        """Fill the table that is shown."""
        book = self.document.book
        if self._shown is None or book is None:
            return
        in_full, page = self.in_full.isChecked(), self.pages.current
        self.in_full.setVisible(page != "repricing")
        if page == "percentiles":
            quantity = "rate" if self.shown_quantity == "rate" else "account"
            self.percentiles.show_run(self._shown, quantity, in_full=in_full)
        elif page == "repricing":
            self.repricing.show_run(self._shown)
        else:
            self.values.show_run(self._shown, book.basis.currency, in_full=in_full)
