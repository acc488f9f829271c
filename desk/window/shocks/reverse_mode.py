"""The mode Reverse: the move that brings the funding ratio or the surplus to a level."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import partial
from typing import TYPE_CHECKING

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtWidgets import QSplitter, QWidget

from desk import tasks
from desk.book import Book, Shock
from desk.valuation.reverse import Goal, ReverseResult
from desk.valuation.reverse_rates import LeastMove
from desk.valuation.shock_records import Position
from desk.window.jobs import Job
from desk.window.parts import numbers
from desk.window.parts.fields import Choice, ChoiceField, NumberField
from desk.window.parts.labels import well_broken
from desk.window.parts.theme import GAP
from desk.window.shocks.curve_pictures import MovedCurvePicture, MovePicture
from desk.window.shocks.edits import free_name, with_added
from desk.window.shocks.mode import Mode
from desk.window.shocks.moved import moved_rates
from desk.window.shocks.moves_tables import TermsTable
from desk.window.shocks.position_table import PositionTable
from desk.window.shocks.wording import short
from desk.window.standing.wording import amount
from desk.window.valued import is_outdated, reason

if TYPE_CHECKING:
    from desk.window.shocks.station import ShocksStation

__all__ = ["ReverseMode", "answer_words"]

_PARALLEL, _MODEL, _HISTORY = "parallel", "model", "history"
_GOALS = (
    Choice(Goal.FUNDING_RATIO, "The funding ratio", "Assets over liabilities."),
    Choice(Goal.SURPLUS, "The surplus", "Assets less liabilities."),
)
_ANSWERED = frozenset({"basis", "liabilities", "holdings", "asset_flows", "line_terms"})
_MOST_MONEY = 1e15
_NO_MODEL = "The book has no rates model: add one in Scenarios."
_NO_HISTORY = "The book has no history of yields: put it in the sheet Yield history."


@dataclass(frozen=True, eq=False)
class _Asked:
    """A question as it was asked."""

    book: Book
    goal: Goal
    level: float
    along: str | Shock


def answer_words(found: ReverseResult | LeastMove, along: str | Shock, currency: str) -> str:
    """An answer in a sentence."""
    if found.fault is not None or found.result is None or found.shock is None:
        said = str(found.fault) if found.fault is not None else "There is no such move."
        return said[:1].upper() + said[1:]
    what = (
        f"the funding ratio to {numbers.ratio(found.level, 2)}"
        if found.goal is Goal.FUNDING_RATIO
        else f"the surplus to {amount(found.level, currency)}"
    )
    if isinstance(found, LeastMove):
        widest = int(np.abs(found.move).argmax())
        move = numbers.signed(float(found.move[widest]), 1)
        term = numbers.exact(float(found.terms[widest]))
        head = (
            f"The least move, {numbers.number(found.distance, 2)} standard deviations away and widest at "
            f"{term} years ({move} bp), brings {what}"
        )
    elif isinstance(along, Shock):
        times = numbers.number(found.scales[0], 3)
        others = [numbers.number(scale, 3) for scale in found.scales[1:3]]
        also = f" (so do {' and '.join(others)} times it)" if others else ""
        head = f"{times} times “{short(along.name)}” brings {what}{also}"
    else:
        size = numbers.signed(found.scales[0], 1)
        others = [numbers.signed(scale, 1) for scale in found.scales[1:3]]
        also = f" (so does one of {' and '.join(others)} bp)" if others else ""
        head = f"A parallel move of {size} bp brings {what}{also}"
    result = found.result
    # What the search leaves of nothing is nothing.
    is_none = abs(result.surplus) < 1e-9 * max(abs(result.assets), abs(result.liabilities))
    surplus = 0.0 if is_none else result.surplus
    return (
        f"{head}: assets {amount(result.assets, currency)}, liabilities "
        f"{amount(result.liabilities, currency)}, surplus {amount(surplus, currency)}."
    )


class ReverseMode(Mode):
    """Shocks in reverse.

    Attributes
    ----------
    found : ReverseResult, LeastMove or None
        The last answer.
    """

    key = "reverse"
    title = "Reverse"
    purpose = "The move that brings the funding ratio or the surplus to a level"
    share = 44

    def __init__(self, station: ShocksStation) -> None:
        super().__init__(station)
        self.found: ReverseResult | LeastMove | None = None
        self._asked: _Asked | None = None
        self._failure = ""
        self._job: Job | None = None
        self._drawn: tuple[object, ...] = ()
        self._before: Position | None = None
        self.curve = MovedCurvePicture(self.theme_switch)
        self.move = MovePicture(self.theme_switch)
        self.pictures = (self.curve, self.move)
        self.terms = TermsTable(self.theme_switch)
        self.position = PositionTable(self.theme_switch)
        split = QSplitter(Qt.Orientation.Horizontal)
        split.setChildrenCollapsible(False)
        split.setHandleWidth(GAP)
        for table in (self.position, self.terms):
            split.addWidget(table)
        split.setSizes([640, 350])
        self.table = split
        for teller in (*self.pictures, self.terms, self.position):
            teller.message.connect(station.message)
        self._make_form()

    def _make_form(self) -> None:
        form = self.form
        form.add_heading("What is to be reached")
        self.goal = ChoiceField("Goal", _GOALS)
        self.ratio = NumberField(
            "Level",
            unit="%",
            percent=True,
            low=0.01,
            high=100.0,
            sensible=(0.5, 2.0),
            hint="The funding ratio to reach.",
        )
        self.ratio.set_value(1.0)
        self.surplus = NumberField(
            "Level",
            unit="",
            low=-_MOST_MONEY,
            high=_MOST_MONEY,
            hint="The surplus to reach; 0 for none left.",
        )
        self.surplus.set_value(0.0)
        self.along = ChoiceField("Move", (Choice(_PARALLEL, "A parallel move"),))
        combo = self.along.combo
        combo.setSizeAdjustPolicy(combo.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        combo.setMinimumContentsLength(12)
        self.horizon = NumberField(
            "Horizon",
            unit="years",
            low=0.01,
            high=100.0,
            sensible=(0.25, 10.0),
            hint="Over which the rates move so much.",
        )
        self.horizon.set_value(1.0)
        for field in (self.goal, self.ratio, self.surplus):
            form.add(field)
        form.add_heading("Along which move")
        for field in (self.along, self.horizon):
            form.add(field)
        self.goal.committed.connect(lambda _: self._show_fields())
        self.along.committed.connect(lambda _: self._show_fields())
        self.find_button = form.add_button("Find the move", self.find, first=True)
        self.cancel_button = form.add_button("Cancel", self.cancel)
        self.keep_button = form.add_button("Keep as a shock", self.keep)
        self.keep_button.setToolTip("As a shock of your own, named after what it reaches")
        self.note = form.add_note("")

    # Showing

    def show_book(self, book: Book) -> None:
        """Offer the shocks of the book, and show the last answer."""
        self._offer(book)
        self._show_fields()
        self._show_answer(book)

    def _offer(self, book: Book) -> None:
        table = self.document.shocks.result
        shocks = [] if table is None else [result.shock for result in table.results]
        has_model, has_history = book.rates_model is not None, book.yield_history is not None
        former = self.along.value
        choices = [
            Choice(_PARALLEL, "A parallel move", "All continuous zero rates by one size."),
            Choice(
                _MODEL,
                "The least move, by the model",
                "The likeliest move of the key rates under the covariance of the book's rates model."
                if has_model
                else _NO_MODEL,
            ),
            Choice(
                _HISTORY,
                "The least move, by the history",
                "The likeliest move of the key rates under the covariance of the book's history of yields."
                if has_history
                else _NO_HISTORY,
            ),
            *(Choice(shock, _titled(shock), "So many times this shock.") for shock in shocks),
        ]
        self.along.set_choices(choices)
        if isinstance(former, Shock):
            same = [
                shock for shock in shocks if (shock.name, shock.set_name) == (former.name, former.set_name)
            ]
            self.along.set_value(same[0] if same else _PARALLEL)
        else:
            self.along.set_value(former or _PARALLEL)

    def _show_fields(self) -> None:
        by_ratio = self.goal.value is Goal.FUNDING_RATIO
        self.ratio.setVisible(by_ratio)
        self.surplus.setVisible(not by_ratio)
        book = self.document.book
        if book is not None:
            self.surplus.label.setText(f"Level, {book.basis.currency}")
            self.surplus.editor.setAccessibleName(f"Level, {book.basis.currency}")
        self.horizon.setVisible(self.along.value in (_MODEL, _HISTORY))
        running = self._job is not None
        self.find_button.setVisible(not running)
        self.cancel_button.setVisible(running)

    @property
    def is_stale(self) -> bool:
        """Whether the answer is of a former version of the book, or of the shock it goes along."""
        book, asked = self.document.book, self._asked
        if asked is None:
            return False
        along = asked.along
        further = {_MODEL: {"rates_model"}, _HISTORY: {"yield_history"}}
        names = _ANSWERED | further.get(along, set()) if isinstance(along, str) else _ANSWERED
        return (
            book is None
            or is_outdated(asked.book, book, names)
            or (isinstance(along, Shock) and not self.still_stands(along))
        )

    def _show_answer(self, book: Book) -> None:
        found = self.found
        shock = found.shock if found is not None else None
        self.keep_button.setEnabled(shock is not None)
        # An answer is shown on the book that it was found on.
        of = book if self._asked is None or found is None else self._asked.book
        table = self.document.shocks.result
        if table is not None and not self.document.shocks.is_stale and not self.is_stale:
            self._before = table.base
        if self._drawn != (of.basis, found, self._before) or found is None:
            self._drawn = (of.basis, found, self._before)
            rates = moved_rates(of, shock)
            self.curve.show_rates(rates)
            self.move.show_rates(rates)
            self.terms.show_rates(rates if shock is not None else None)
            result = found.result if found is not None else None
            self.position.show_positions(self._before, result, of.basis.currency)
        self.note.setVisible(self.is_stale and found is not None)
        self.note.setText(well_broken("This answer is from before your last change."))

    def words(self) -> str:
        """The answer in a sentence."""
        if self._job is not None:
            return "The move is being searched for."
        if self._failure:
            return self._failure
        if self.found is None or self._asked is None:
            return "Say what is to be reached and along which move; the answer is fully revalued."
        old = "Before your last change: " if self.is_stale else ""
        return old + answer_words(self.found, self._asked.along, self._asked.book.basis.currency)

    def home(self) -> QWidget:
        """The button that finds."""
        return self.cancel_button if self._job is not None else self.find_button

    def leave(self) -> None:
        """Forget the answer of a book that was closed."""
        book = self.document.book
        if self._asked is not None and (book is None or self.document.shocks.result is None):
            self.cancel()
            self.found = self._asked = None
            self._failure = ""

    # Finding

    def find(self) -> None:
        """Search for the move, in the background."""
        book = self.document.book
        by_ratio = self.goal.value is Goal.FUNDING_RATIO
        level = self.ratio.value if by_ratio else self.surplus.value
        if book is None or level is None or self._job is not None:
            return
        along = self.along.value
        lacks_model = along == _MODEL and book.rates_model is None
        if lacks_model or (along == _HISTORY and book.yield_history is None):
            self.found = self._asked = None
            self._failure = _NO_MODEL if lacks_model else _NO_HISTORY
            self._ended()
            return
        work: Callable[..., ReverseResult | LeastMove]
        asked = _Asked(book, self.goal.value, level, along)
        if along in (_MODEL, _HISTORY):
            work = partial(
                tasks.least_move,
                book,
                goal=asked.goal,
                level=level,
                from_history=along == _HISTORY,
                horizon=self.horizon.value or 1.0,
            )
        else:
            shape = along if isinstance(along, Shock) else None
            work = partial(tasks.reverse, book, goal=asked.goal, level=level, along=shape)
        self._failure = ""
        self._job = self.jobs.start(
            "Searching for the move",
            work,
            on_done=partial(self._done, asked),
            on_failed=partial(self._failed, asked),
            on_cancelled=self._ended,
            exclusive_key=f"reverse of {id(self)}",
        )
        had_focus = self.find_button.hasFocus()
        self._show_fields()
        if had_focus:
            self.cancel_button.setFocus(Qt.FocusReason.OtherFocusReason)
        self.station.say(self.words())

    def cancel(self) -> None:
        """Stop searching; the former answer stays."""
        if self._job is not None:
            self.jobs.cancel(self._job)

    def _done(self, asked: _Asked, found: ReverseResult | LeastMove) -> None:
        self.found, self._asked = found, asked
        self._ended()

    def _failed(self, asked: _Asked, error: BaseException) -> None:
        self.found, self._asked = None, asked
        why = reason(error)
        self._failure = f"{why[:1].upper()}{why[1:]}{'' if why.endswith('.') else '.'}"
        self._ended()

    def _ended(self) -> None:
        had_focus = self.cancel_button.hasFocus()
        self._job = None
        book = self.document.book
        if book is not None and self.is_shown:
            self.show_book(book)
            self.station.say(self.words())
            if had_focus:
                self.find_button.setFocus(Qt.FocusReason.OtherFocusReason)

    def keep(self) -> None:
        """Keep the move found as a shock of the user's own."""
        book, found, asked = self.document.book, self.found, self._asked
        if book is None or found is None or found.shock is None or asked is None:
            return
        level = (
            numbers.ratio(asked.level)
            if asked.goal is Goal.FUNDING_RATIO
            else amount(asked.level, asked.book.basis.currency)
        )
        name = free_name(book, f"{asked.goal.value.capitalize()} to {level}".replace("\u202f", " "))
        kept = replace(found.shock, name=name, set_name="", source="found in reverse")
        self.edit(f"Reverse shock kept as {name}", with_added(book, kept))
        self.message(f"Kept as the shock {name}; it stands among all shocks.")


def _titled(shock: Shock) -> str:
    text = f"{shock.name} ({shock.set_name})" if shock.set_name else shock.name
    return text if len(text) <= 48 else f"{text[:47]}…"
