"""The mode Two moves: two shocks against each other, as a heat picture and a table."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtWidgets import QWidget

from desk import tasks
from desk.book import Book
from desk.book.arrays import FloatArray
from desk.valuation.shock_grid import ShockGrid
from desk.window.jobs import Job
from desk.window.parts import numbers
from desk.window.parts.fields import Combo
from desk.window.parts.labels import well_broken
from desk.window.shocks.grid_axes import Axis, AxisFields, axes_of
from desk.window.shocks.grid_table import GridTable
from desk.window.shocks.heat_picture import HeatPicture
from desk.window.shocks.mode import Mode
from desk.window.standing.wording import amount
from desk.window.valued import is_outdated, reason

if TYPE_CHECKING:
    from desk.window.shocks.station import ShocksStation

__all__ = ["GridMode"]

_ANSWERED = frozenset({"basis", "liabilities", "holdings", "asset_flows", "line_terms"})
_SHOWN = ("Funding ratio", "Surplus", "Change in surplus")


@dataclass(frozen=True, eq=False)
class _Asked:
    """A grid as it was asked for."""

    book: Book
    first: Axis
    second: Axis


class GridMode(Mode):
    """Two moves against each other.

    Attributes
    ----------
    grid : ShockGrid or None
        The last one that came to its end.
    """

    key = "grid"
    title = "Two moves"
    purpose = "Two moves against each other"
    share = 40

    def __init__(self, station: ShocksStation) -> None:
        super().__init__(station)
        self.grid: ShockGrid | None = None
        self._asked: _Asked | None = None
        self._failure = ""
        self._job: Job | None = None
        self._drawn: tuple[object, int] = (None, -1)
        self.heat = HeatPicture(self.theme_switch)
        self.pictures = (self.heat,)
        self.values = GridTable(self)
        self.table = self.values
        self.shown = Combo()
        self.shown.addItems(list(_SHOWN))
        self.shown.setAccessibleName("Shown in the grid")
        self.shown.currentIndexChanged.connect(lambda _: self._show_grid())
        self.controls = (self.shown,)
        for teller in (self.heat, self.values):
            teller.message.connect(station.message)
        self.first = AxisFields(self, "Across")
        self.second = AxisFields(self, "Upwards")
        self.run_button = self.form.add_button("Run the grid", self.run, first=True)
        self.cancel_button = self.form.add_button("Cancel", self.cancel)
        self.cancel_button.hide()
        self.note = self.form.add_note("")

    # Showing

    def show_book(self, book: Book) -> None:
        """Offer the moves of the book, and show the last grid."""
        table = self.document.shocks.result
        shocks = () if table is None else tuple(result.shock for result in table.results)
        axes = axes_of(book, shocks)
        self.first.offer(axes, 0)
        self.second.offer(axes, 2 if len(axes) > 2 else 1)
        self._show_buttons()
        self._show_grid()

    def _show_buttons(self) -> None:
        running = self._job is not None
        self.run_button.setVisible(not running)
        self.cancel_button.setVisible(running)
        stale = self.is_stale and self.grid is not None
        self.note.setVisible(stale)
        self.note.setText(well_broken("This grid is from before your last change."))

    @property
    def is_stale(self) -> bool:
        """Whether the grid is of a former version of the book, or of a shock of it."""
        book, asked = self.document.book, self._asked
        if asked is None:
            return False
        shocks = [axis.shock for axis in (asked.first, asked.second) if not axis.is_standard]
        return (
            book is None
            or is_outdated(asked.book, book, _ANSWERED)
            or not all(self.still_stands(shock) for shock in shocks)
        )

    def _show_grid(self) -> None:
        grid, asked = self.grid, self._asked
        which = self.shown.currentIndex()
        if grid is None or asked is None:
            self.heat.clear()
            self.heat.set_axes("First move", "", "Second move", "")
            self.heat.set_description("Choose two moves, their ranges, and run the grid.")
            self._drawn = (None, -1)
            return
        if self._drawn == (grid, which):
            return
        self._drawn = (grid, which)
        currency, book = asked.book.basis.currency, asked.book
        if which == 0:
            thresholds = book.shock_settings.thresholds
            level = thresholds[-1] if thresholds else 1.0
            value, kind, unit = grid.funding_ratio, "rate", "ratio, %"
            level_text = numbers.ratio(level)
        else:
            base = grid.before.surplus if which == 2 else 0.0
            value, level, kind, unit = grid.surplus - base, 0.0, "money", currency
            level_text = "no surplus" if which == 1 else "no change"

        def text(number: float) -> str:
            return numbers.ratio(number) if kind == "rate" else amount(number, currency)

        self.heat.show_grid(
            grid.first_scale,
            grid.second_scale,
            value,
            axes=((asked.first.short_label, asked.first.unit), (asked.second.short_label, asked.second.unit)),
            level=level,
            level_text=level_text,
            text=text,
            sentence=_grid_sentence(value, text),
        )
        names = " and ".join(
            axis.label.casefold() if axis.is_standard else f"“{axis.short_label}”"
            for axis in (asked.first, asked.second)
        )
        self.heat.set_title(f"{_SHOWN[which]} under {names}")
        self.values.show_values((asked.first, asked.second), grid, value, unit, kind=kind)

    def words(self) -> str:
        """What the grid says."""
        if self._job is not None:
            return "The grid is being computed."
        if self._failure:
            return self._failure
        grid, asked = self.grid, self._asked
        if grid is None or asked is None:
            return "Each cell is a full revaluation under both moves together."
        old = "Before your last change: " if self.is_stale else ""
        empty = int(np.isnan(grid.surplus).sum())
        said = f" {grid.faults[0]}" if grid.faults else ""
        share = float((grid.surplus < 0.0).mean())
        count = f"{numbers.integer(grid.surplus.size)} cells"
        text = f"{old}In {numbers.rate(share, 0, with_unit=True)} of the {count} there is a deficit."
        return f"{text}{f' {empty} cells could not be computed.' if empty else ''}{said}"

    def home(self) -> QWidget:
        """The button that runs."""
        return self.cancel_button if self._job is not None else self.run_button

    def leave(self) -> None:
        """Forget the grid of a book that was closed."""
        if self._asked is not None and (self.document.book is None or self.document.shocks.result is None):
            self.cancel()
            self.grid = self._asked = None
            self._failure = ""

    # Running

    def run(self) -> None:
        """Compute the grid, in the background."""
        book, first, second = self.document.book, self.first.axis, self.second.axis
        if book is None or first is None or second is None or self._job is not None:
            return
        across, up = self.first.scale(), self.second.scale()
        if isinstance(across, str) or isinstance(up, str):
            self.refuse(across if isinstance(across, str) else str(up))
            return
        if first.key == second.key:
            self.refuse("Choose two different moves.")
            return
        self.station.accept_edit()
        self._failure = ""
        self._job = self.jobs.start(
            "Computing the grid",
            partial(
                tasks.grid,
                book,
                first.shock,
                second.shock,
                first_scale=across,
                second_scale=up,
            ),
            on_done=partial(self._done, _Asked(book, first, second)),
            on_failed=self._failed,
            on_cancelled=self._ended,
            exclusive_key=f"grid of {id(self)}",
        )
        had_focus = self.run_button.hasFocus()
        self._show_buttons()
        if had_focus:
            self.cancel_button.setFocus(Qt.FocusReason.OtherFocusReason)
        self.station.refresh_shown()

    def cancel(self) -> None:
        """Stop; the former grid stays."""
        if self._job is not None:
            self.jobs.cancel(self._job)

    def _done(self, asked: _Asked, grid: ShockGrid) -> None:
        self.grid, self._asked = grid, asked
        self._ended()

    def _failed(self, error: BaseException) -> None:
        why = reason(error)
        self._failure = f"{why[:1].upper()}{why[1:]}{'' if why.endswith('.') else '.'}"
        self._ended()

    def _ended(self) -> None:
        had_focus = self.cancel_button.hasFocus()
        self._job = None
        if self.document.book is not None and self.is_shown:
            self.station.refresh_shown()
            if had_focus:
                self.run_button.setFocus(Qt.FocusReason.OtherFocusReason)


def _grid_sentence(value: FloatArray, text: Callable[[float], str]) -> str:
    known = value[np.isfinite(value)]
    if not known.size:
        return "No cell could be computed."
    return f"From {text(float(known.min()))} to {text(float(known.max()))}."
