"""The page on which a short-rate model is fitted to data of the book; the book changes only on request."""

from __future__ import annotations

from dataclasses import replace
from functools import partial

from PySide6.QtCore import QSignalBlocker, Qt, Signal
from PySide6.QtGui import QKeyEvent
from PySide6.QtWidgets import QHBoxLayout, QLabel, QScrollArea, QSlider, QSplitter, QVBoxLayout, QWidget

from desk import tasks
from desk.book import Book
from desk.book.market import CalibrationSource, Volatilities, YieldHistory
from desk.report.calibration_wording import INTERVALS, SOURCES
from desk.scenarios.calibration import calibration_sources
from desk.scenarios.calibration_records import Calibration, CalibrationError
from desk.window.document import Document
from desk.window.jobs import Job, Jobs
from desk.window.parts import numbers
from desk.window.parts.fields import Combo
from desk.window.parts.models import MODEL_TITLES
from desk.window.parts.pages import Pages
from desk.window.parts.plots import Picture
from desk.window.parts.theme import GAP, STEP, WIDE, ThemeSwitch, keep_look
from desk.window.scenarios.fitting_panel import FittingPanel, missing_text
from desk.window.scenarios.fitting_pictures import (
    ErrorsPicture,
    HistoryPicture,
    ProfilePicture,
    QuantilesPicture,
    QuotesPicture,
    YieldsPicture,
)
from desk.window.scenarios.fitting_tables import FiguresTable, ResidualsTable, TestsTable

__all__ = ["FittingPage"]

_INVITATION = (
    "Choose the data and the model at the right, and fit it. The book stays as it is until you use the model."
)
_KEY = "fit of a model"
_MUCH = 1000  # more than there is: equal shares
_SECOND = {
    CalibrationSource.HISTORY: ("Likelihood", "Residuals"),
    CalibrationSource.YIELDS: ("Residuals by term", "Forecast residuals"),
}


class FittingPage(QWidget):
    """A fit with its pictures, tables and words.

    Attributes
    ----------
    found : Calibration or None
        The fit that is shown.

    Signals
    -------
    closed()
        The reader goes back to the scenarios.
    message(str)
        Something to tell the reader in the foot.
    """

    closed = Signal()
    message = Signal(str)

    def __init__(self, document: Document, jobs: Jobs, theme_switch: ThemeSwitch) -> None:
        super().__init__()
        self.document, self.jobs = document, jobs
        self.found: Calibration | None = None
        self._fitted_book: Book | None = None
        self._failure = ""
        self._job: Job | None = None
        self._pair: tuple[Picture, ...] = ()
        self.setAccessibleName("Fit of a model to data")
        self.panel = FittingPanel(
            changed=self._on_choice, fit=self.fit, cancel=self.cancel, use=self.use, back=self.closed.emit
        )
        self._make_pictures(theme_switch)
        self._make_tables(theme_switch)
        self._make_controls()
        self._lay_out()
        document.reading_changed.connect(self._on_reading)

    # Making it

    def _make_pictures(self, theme_switch: ThemeSwitch) -> None:
        self.history = HistoryPicture(theme_switch)
        self.quotes = QuotesPicture(theme_switch)
        self.yields = YieldsPicture(theme_switch)
        self.profile = ProfilePicture(theme_switch)
        self.quantiles = QuantilesPicture(theme_switch)
        self.errors = ErrorsPicture(theme_switch)
        self._firsts = (self.history, self.quotes, self.yields)
        self._seconds = (self.profile, self.quantiles, self.errors)
        self.pictures = QSplitter(Qt.Orientation.Horizontal)
        for picture in (*self._firsts, *self._seconds):
            picture.message.connect(self.message)
            picture.hide()
            self.pictures.addWidget(picture)

    def _make_tables(self, theme_switch: ThemeSwitch) -> None:
        self.figures = FiguresTable(theme_switch)
        self.residuals = ResidualsTable(theme_switch)
        self.tests = TestsTable(theme_switch)
        for table in (self.figures, self.residuals, self.tests):
            table.message.connect(self.message)
        self.words = QLabel()
        self.words.setWordWrap(True)
        self.words.setTextFormat(Qt.TextFormat.PlainText)
        self.words.setAlignment(Qt.AlignmentFlag.AlignTop | Qt.AlignmentFlag.AlignLeft)
        self.words.setTextInteractionFlags(
            Qt.TextInteractionFlag.TextSelectableByMouse | Qt.TextInteractionFlag.TextSelectableByKeyboard
        )
        self.words.setContentsMargins(GAP, GAP, GAP, GAP)
        self.words.setAccessibleName("What the fit says")
        words = QScrollArea()
        words.setWidget(self.words)
        words.setWidgetResizable(True)
        words.setFrameShape(QScrollArea.Shape.NoFrame)
        words.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        words.setAccessibleName("What the fit says")
        self.pages = Pages(theme_switch, name="Tables of the fit")
        self.pages.add("figures", "Estimates", self.figures)
        self.pages.add("words", "In words", words)
        self.pages.add("residuals", "Residuals", self.residuals)
        self.pages.add("tests", "Tests", self.tests)

    def _make_controls(self) -> None:
        self.kind = Combo()
        self.kind.setAccessibleName("Kind of volatility shown")
        self.second = Combo()
        self.second.setAccessibleName("Second picture")
        for combo in (self.kind, self.second):
            combo.setSizeAdjustPolicy(Combo.SizeAdjustPolicy.AdjustToContents)
        self.day = QSlider(Qt.Orientation.Horizontal)
        self.day.setFixedWidth(32 * STEP)
        self.day.setAccessibleName("Date of the yields shown")
        self.day_label = QLabel()
        self.day_label.setBuddy(self.day)
        self.kind.currentIndexChanged.connect(lambda _: self._draw())
        self.second.currentIndexChanged.connect(lambda _: self._draw())
        self.day.valueChanged.connect(lambda _: self._draw_day())

    def _lay_out(self) -> None:
        self.heading = QLabel()
        keep_look(self.heading, "strong")
        self.verdict = QLabel(_INVITATION)
        self.verdict.setWordWrap(True)
        self.verdict.setTextFormat(Qt.TextFormat.PlainText)
        self.verdict.setAccessibleName("Verdict on the fit")
        row = QHBoxLayout()
        row.setSpacing(WIDE)
        row.addWidget(self.heading, 1)
        for control in (self.day_label, self.day, self.kind, self.second):
            row.addWidget(control)
            control.hide()
        self.main = QSplitter(Qt.Orientation.Vertical)
        self.main.addWidget(self.pictures)
        self.main.addWidget(self.pages)
        self.main.setStretchFactor(0, 56)
        self.main.setStretchFactor(1, 44)
        self.main.setSizes([560, 440])
        for splitter in (self.main, self.pictures):
            splitter.setChildrenCollapsible(False)
            splitter.setHandleWidth(GAP)
        self.main.hide()
        left = QVBoxLayout()
        left.setSpacing(GAP)
        left.addLayout(row)
        left.addWidget(self.verdict)
        left.addWidget(self.main, 1)
        left.addStretch()
        whole = QHBoxLayout(self)
        whole.setContentsMargins(WIDE, GAP, 0, 0)
        whole.setSpacing(0)
        whole.addLayout(left, 1)
        whole.addWidget(self.panel)

    # Fitting

    def fit(self) -> None:
        """Fit the chosen model to the chosen data of the open book."""
        book = self.document.book
        source = self.panel.source.value
        if book is None or source not in calibration_sources(book):
            return
        self._failure = ""
        self._job = self.jobs.start(
            "Fitting the model",
            partial(tasks.calibrate, book, source=source, model=self.panel.model.value),
            on_done=partial(self._on_done, book),
            on_failed=self._on_failed,
            on_cancelled=self._on_ended,
            exclusive_key=f"{_KEY} {id(self)}",
        )
        self.show_state()

    def cancel(self) -> None:
        """Give up the fit under way."""
        if self._job is not None:
            self.jobs.cancel(self._job)

    @property
    def is_fitting(self) -> bool:
        """Whether a fit is under way."""
        return self._job is not None and self._job.is_running

    def _on_done(self, book: Book, found: Calibration) -> None:
        if self.document.book is None:
            return
        self.found, self._fitted_book = found, book
        self._on_ended()
        self._show_fit()

    def _on_failed(self, error: BaseException) -> None:
        if isinstance(error, CalibrationError):
            first = error.faults[0]
            more = len(error.faults) - 1
            also = f" ({more} more like it.)" if more else ""
            self._failure = f"{first.found[:1].upper()}{first.found[1:]}. {first.mend}{also}"
        else:
            self._failure = f"The fit came to nothing: {error}"
        self._on_ended()

    def _on_ended(self) -> None:
        self._job = None
        self.show_state()

    def use(self) -> None:
        """Put the fitted model into the book."""
        book, found = self.document.book, self.found
        if book is None or found is None or found.model is None or self.is_stale:
            return
        title = MODEL_TITLES[found.name]
        self.document.edit(
            f"Model {title} fitted to {SOURCES[found.source]}", replace(book, rates_model=found.model)
        )
        self.message.emit(f"{title} as fitted is now the model of the book; Undo takes it back.")
        self.show_state()

    # Showing

    @property
    def is_stale(self) -> bool:
        """Whether the data that were fitted to are no longer those of the book."""
        book, fitted, found = self.document.book, self._fitted_book, self.found
        if book is None or fitted is None or found is None:
            return False
        if found.source is CalibrationSource.HISTORY:
            return book.history is not fitted.history
        if found.source is CalibrationSource.YIELDS:
            return book.yield_history is not fitted.yield_history
        return book.volatilities is not fitted.volatilities or book.basis != fitted.basis

    def refresh(self) -> None:
        """Follow the book."""
        book = self.document.book
        if book is None:
            return
        is_first = self.panel.show_book(book)
        if is_first and calibration_sources(book):
            # There is something to look at from the start; nothing is changed by it.
            self.fit()
        self.show_state()

    def _on_reading(self) -> None:
        """Another book was opened, or none came of it."""
        if self.document.reading is not self.document.source:
            return
        self.cancel()
        self.found = self._fitted_book = None
        self._failure = ""
        self.panel.forget()
        self.main.hide()
        for control in (self.day_label, self.day, self.kind, self.second):
            control.hide()

    def _on_choice(self) -> None:
        self._failure = ""
        self.show_state()

    def show_state(self) -> None:
        """What runs, what is missing, what can be done."""
        book, panel, found = self.document.book, self.panel, self.found
        if book is None:
            return
        source = panel.source.value
        missing = "" if source in calibration_sources(book) else missing_text(source)
        fitting = self.is_fitting
        had_focus = panel.fit_button.hasFocus() or panel.cancel_button.hasFocus()
        panel.fit_button.setEnabled(not missing)
        panel.fit_button.setVisible(not fitting)
        panel.cancel_button.setVisible(fitting)
        if had_focus:
            button = panel.cancel_button if fitting else panel.fit_button
            button.setFocus(Qt.FocusReason.OtherFocusReason)
        is_used = found is not None and found.model is not None and book.rates_model == found.model
        panel.use_button.setEnabled(
            found is not None and found.model is not None and not is_used and not self.is_stale
        )
        panel.note.setText(self._note(is_used=is_used))
        panel.note.setVisible(bool(panel.note.text()))
        panel.say("The fit runs." if fitting else missing)
        self.heading.setText(self._title())
        self.verdict.setText(self._sentence(missing))
        warns = bool(self._failure) or (found is not None and (found.is_poor or self.is_stale))
        keep_look(self.verdict, "mild" if warns and not self._failure else "grave" if warns else "")

    def _note(self, *, is_used: bool) -> str:
        if self.found is None:
            return ""
        if self.found.obstacle:
            return self.found.obstacle
        if is_used:
            return "This is the model of the book."
        return self.found.measure

    def _title(self) -> str:
        if self.found is None:
            return "Fit a model to data"
        return f"{MODEL_TITLES[self.found.name]} fitted to {SOURCES[self.found.source]}"

    def _sentence(self, missing: str) -> str:
        if self._failure:
            return self._failure
        if self.found is None:
            return missing or _INVITATION
        if self.is_stale:
            return f"The data have changed since this fit: fit again. {self.found.verdict}"
        return self.found.verdict

    def _show_fit(self) -> None:
        found = self.found
        assert found is not None
        self.figures.show_fit(found)
        self.residuals.show_fit(found)
        self.tests.show_fit(found)
        self.pages.set_page_visible("tests", found.tests is not None)
        self.words.setText(_in_words(found))
        self._offer_views(found)
        self.main.show()
        self._draw()

    def _offer_views(self, found: Calibration) -> None:
        seconds = _SECOND.get(found.source, ())
        kinds = (
            list(dict.fromkeys(each.value for each in found.data.kind))
            if isinstance(found.data, Volatilities)
            else []
        )
        for combo, texts in ((self.second, seconds), (self.kind, kinds)):
            with QSignalBlocker(combo):
                combo.clear()
                combo.addItems([text.capitalize() for text in texts])
            combo.setVisible(len(texts) > 1)
        is_panel = isinstance(found.data, YieldHistory)
        self.day.setVisible(is_panel)
        self.day_label.setVisible(is_panel)
        if is_panel:
            with QSignalBlocker(self.day):
                self.day.setRange(0, found.date.size - 1)
                self.day.setValue(found.date.size - 1)
            self.day_label.setText(numbers.day(found.date[-1]))

    def _draw(self) -> None:
        found = self.found
        if found is None:
            return
        pair = self._drawn_pair(found)
        if pair != self._pair:
            self._pair = pair
            for picture in (*self._firsts, *self._seconds):
                picture.setVisible(picture in pair)
            self.pictures.setSizes([_MUCH] * self.pictures.count())

    def _drawn_pair(self, found: Calibration) -> tuple[Picture, Picture]:
        """Draw what is looked at, and say which two pictures it is in."""
        is_second = self.second.currentIndex() == 1
        if found.source is CalibrationSource.VOLATILITIES:
            kind = self.kind.currentText().casefold()
            self.quotes.show_fit(found, kind)
            self.errors.show_quotes(found, kind)
            return self.quotes, self.errors
        if is_second:
            self.quantiles.show_fit(found)
        if found.source is CalibrationSource.HISTORY:
            self.history.show_fit(found)
            if is_second:
                return self.history, self.quantiles
            self.profile.show_fit(found)
            return self.history, self.profile
        self._draw_day()
        if is_second:
            return self.yields, self.quantiles
        self.errors.show_terms(found)
        return self.yields, self.errors

    def _draw_day(self) -> None:
        if self.found is not None and self.found.source is CalibrationSource.YIELDS:
            self.day_label.setText(numbers.day(self.found.date[self.day.value()]))
            self.yields.show_date(self.found, self.day.value())

    def focus_home(self) -> None:
        """Give the keyboard to the button that fits, or to the choice of data where nothing can be."""
        button = self.panel.fit_button
        target = button if button.isEnabled() else self.panel.source
        target.setFocus(Qt.FocusReason.OtherFocusReason)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Escape goes back."""
        if event.key() == Qt.Key.Key_Escape:
            self.closed.emit()
            return
        super().keyPressEvent(event)


def _in_words(found: Calibration) -> str:
    """All that a fit has to say, in paragraphs."""
    counted = f"Log-likelihood {numbers.number(found.log_likelihood, 2)}; {found.observations} observations."
    parts = [found.verdict, *found.remarks, found.measure, found.obstacle, INTERVALS, counted]
    return "\n\n".join(part for part in parts if part)
