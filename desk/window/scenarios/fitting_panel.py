"""The settings of a fit: which data of the book, which model, and what is done with the result."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QFrame, QScrollArea

from desk.book import Book, ModelName
from desk.book.market import CalibrationSource
from desk.scenarios.calibration import CALIBRATED_MODELS, NEEDED, calibration_sources, usual_model
from desk.window.parts.fields import FORM_WIDTH, Choice, ChoiceField, Form
from desk.window.parts.labels import well_broken
from desk.window.parts.models import MODEL_TITLES

__all__ = ["FittingPanel", "missing_text"]

_CHOICES = (
    Choice(
        CalibrationSource.HISTORY,
        "History of short rates",
        "How the rate moved in the real world: for forecasts, not for prices.",
    ),
    Choice(
        CalibrationSource.VOLATILITIES,
        "Quoted volatilities",
        "Caps, floors and swaptions, with today's curve: for values, not for forecasts.",
    ),
    Choice(
        CalibrationSource.YIELDS,
        "History of yields",
        "Whole curves over time: shows both measures, and the price of risk between them.",
    ),
)
_WHAT = {
    ModelName.VASICEK: "One rate that is pulled back to a level; it may turn negative.",
    ModelName.CIR: "A rate that never turns negative and moves less when it is low.",
    ModelName.HULL_WHITE: "One factor that is pulled back, about today's curve.",
    ModelName.HO_LEE: "Rates wander without being pulled back: one volatility for all terms.",
    ModelName.GAUSSIAN_2: "Two factors, so that short and long rates need not move together.",
    ModelName.CIR_SHIFTED: "A square-root factor about today's curve. This fit takes some seconds.",
}


def missing_text(source: CalibrationSource) -> str:
    """Which sheet brings a source of data."""
    sheet, columns = NEEDED[source]
    return f"The book has none of these data. Add a sheet “{sheet}” with {columns}."


class FittingPanel(QScrollArea):
    """The form beside a fit.

    Attributes
    ----------
    source, model : ChoiceField
    fit_button, cancel_button, use_button, back_button : QPushButton
    state : QLabel
        What runs, what is missing, what was done.
    """

    def __init__(
        self,
        *,
        changed: Callable[[], None],
        fit: Callable[[], object],
        cancel: Callable[[], object],
        use: Callable[[], object],
        back: Callable[[], object],
    ) -> None:
        super().__init__()
        self._changed = changed
        self._book: Book | None = None
        form = Form()
        self.setWidget(form)
        self.setWidgetResizable(True)
        self.setFrameShape(QFrame.Shape.NoFrame)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setFixedWidth(FORM_WIDTH)
        self.setAccessibleName("Settings of the fit")
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self.fit_button = form.add_button("Fit the model", fit, first=True)
        self.cancel_button = form.add_button("Cancel the fit", cancel)
        self.use_button = form.add_button("Use this model", use)
        self.use_button.setToolTip("Puts the fitted model into the book: an edit that can be undone.")
        self.back_button = form.add_button("Back to the scenarios", back)
        self.back_button.setToolTip("Esc")
        self.state = form.add_note("")
        self.state.setAccessibleName("State of the fit")
        form.add_heading("What is fitted to what")
        self.source = ChoiceField("Data", _CHOICES)
        self.model = ChoiceField("Model", ())
        form.add(self.source)
        form.add(self.model)
        self.note = form.add_note("")
        self.source.committed.connect(lambda _: self._on_source())
        self.model.committed.connect(lambda _: self._changed())

    def show_book(self, book: Book) -> bool:
        """Offer what a book has, and begin with the first data it has; whether it is another book."""
        is_first = self._book is None
        self._book = book
        held = calibration_sources(book)
        if is_first and held:
            self.source.set_value(held[0])
        if is_first:
            self._offer_models()
        return is_first

    def forget(self) -> None:
        """Another book is open."""
        self._book = None

    def say(self, text: str) -> None:
        """Say what is the case."""
        self.state.setText(well_broken(text))
        self.state.setVisible(bool(text))

    def _on_source(self) -> None:
        self._offer_models()
        self._changed()

    def _offer_models(self) -> None:
        source = self.source.value
        self.model.set_choices(
            [Choice(name, MODEL_TITLES[name], _WHAT[name]) for name in CALIBRATED_MODELS[source]]
        )
        if self._book is not None:
            self.model.set_value(usual_model(self._book, source))
