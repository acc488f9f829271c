"""The mode Two moves: two shocks against each other, as a heat picture and a table."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtWidgets import QHBoxLayout, QWidget

from desk import tasks
from desk.book import Book, Move, MoveKind, Shock
from desk.book.arrays import FloatArray
from desk.valuation.shock_grid import ShockGrid
from desk.window.jobs import Job
from desk.window.parts import numbers
from desk.window.parts.fields import Choice, ChoiceField, Combo, IntegerField, NumberField
from desk.window.parts.labels import well_broken
from desk.window.parts.tables import Column, Table
from desk.window.parts.theme import GAP
from desk.window.shocks.hand import handles_of
from desk.window.shocks.heat_picture import HeatPicture
from desk.window.shocks.mode import Mode
from desk.window.standing.wording import amount
from desk.window.valued import is_outdated, reason

if TYPE_CHECKING:
    from desk.window.shocks.station import ShocksStation

__all__ = ["MOST_STEPS", "Axis", "GridMode", "axes_of"]

MOST_STEPS = 41
_ANSWERED = frozenset({"basis", "liabilities", "holdings", "asset_flows", "line_terms"})
_SHOWN = ("Funding ratio", "Surplus", "Change in surplus")


@dataclass(frozen=True)
class Axis:
    """One of the two moves.

    Attributes
    ----------
    shock : Shock
        At scale 1.
    label, unit : str
        Of its scale.
    low, high : float
        To begin with.
    """

    shock: Shock
    label: str
    unit: str
    low: float
    high: float

    @property
    def key(self) -> tuple[str, str]:
        """Tells it from others."""
        return (self.shock.name, self.shock.set_name)


def _one(name: str, move: Move, unit: str, low: float, high: float) -> Axis:
    return Axis(Shock(name, (move,), set_name="standard"), name, unit, low, high)


def axes_of(book: Book, shocks: tuple[Shock, ...]) -> tuple[Axis, ...]:
    """The moves that a grid of a book may have: standard ones, then its shocks."""
    there = handles_of(book)
    axes = [
        _one("All rates", Move(MoveKind.PARALLEL, 1.0), "bp", -200.0, 200.0),
        _one("Slope", Move(MoveKind.TWIST, 1.0, 10.0), "bp", -100.0, 100.0),
    ]
    for key, axis in (
        ("fund", _one("Funds", Move(MoveKind.VALUE, 0.01, target="fund"), "%", -50.0, 50.0)),
        ("property", _one("Property", Move(MoveKind.VALUE, 0.01, target="property"), "%", -50.0, 50.0)),
        ("spread", _one("Credit spreads", Move(MoveKind.SPREAD, 1.0), "bp", -100.0, 300.0)),
        ("inflation", _one("Inflation", Move(MoveKind.INFLATION, 1.0), "bp", -100.0, 100.0)),
    ):
        if key in there:
            axes.append(axis)
    axes.append(_one("Amounts promised", Move(MoveKind.AMOUNT, 0.01), "%", -20.0, 20.0))
    return (*axes, *(Axis(shock, shock.name, "times", -2.0, 2.0) for shock in shocks))


@dataclass(frozen=True, eq=False)
class _Asked:
    """A grid as it was asked for."""

    book: Book
    first: Axis
    second: Axis


class _AxisFields:
    """The fields of one of the two moves."""

    def __init__(self, mode: GridMode, heading: str) -> None:
        form = mode.form
        form.add_heading(heading)
        self.which = ChoiceField(heading, ())
        self.which.label.hide()
        combo = self.which.combo
        combo.setSizeAdjustPolicy(combo.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        combo.setMinimumContentsLength(12)
        self.low = NumberField("From", low=-10_000.0, high=10_000.0)
        self.high = NumberField("To", low=-10_000.0, high=10_000.0)
        self.steps = IntegerField("Sizes", low=2, high=MOST_STEPS)
        self.steps.set_value(21)
        form.add(self.which)
        range_row = QWidget()
        across = QHBoxLayout(range_row)
        across.setContentsMargins(0, 0, 0, 0)
        across.setSpacing(GAP)
        for field, share in ((self.low, 3), (self.high, 3), (self.steps, 2)):
            across.addWidget(field, share, Qt.AlignmentFlag.AlignTop)
        form.add_widget(range_row)
        for field, what in ((self.low, "from"), (self.high, "to"), (self.steps, "sizes")):
            field.set_hint("")
            field.editor.setAccessibleName(f"{heading}, {what}")
        self.which.committed.connect(lambda _: self.suggest())

    @property
    def axis(self) -> Axis | None:
        """The move chosen."""
        value = self.which.value
        return value if isinstance(value, Axis) else None

    def offer(self, axes: tuple[Axis, ...], wanted: int) -> None:
        """Offer moves; the one chosen stays, where it is still there."""
        former = self.axis
        self.which.set_choices([Choice(axis, _titled(axis)) for axis in axes])
        same = [axis for axis in axes if former is not None and axis.key == former.key]
        if same:
            self.which.set_value(same[0])
        else:
            self.which.set_value(axes[min(wanted, len(axes) - 1)])
            self.suggest()
        self._say()

    def suggest(self) -> None:
        """The range to begin with."""
        if self.axis is not None:
            self.low.set_value(self.axis.low)
            self.high.set_value(self.axis.high)
        self._say()

    def _say(self) -> None:
        axis = self.axis
        unit = axis.unit if axis is not None else ""
        self.which.set_hint(f"Its size is in {unit}." if unit != "times" else "Its size is in times itself.")

    def scale(self) -> FloatArray | str:
        """The sizes, or what is wrong with them."""
        low, high, steps = self.low.value, self.high.value, self.steps.value
        if low is None or high is None or steps is None or self.axis is None:
            return "A range needs where it begins, where it ends and how many sizes."
        if not low < high:
            return f"{self.axis.label}: the range must rise."
        if self.axis.unit == "%" and low < -100.0:
            return f"{self.axis.label}: a fall is at most 100 %."
        scale = np.linspace(low, high, int(steps))
        # Nothing at all is nothing, whatever the rounding.
        scale[np.abs(scale) < 1e-9 * (high - low)] = 0.0
        return scale


class GridTable(Table):
    """Rows are sizes of the first move, columns those of the second."""

    def __init__(self, mode: GridMode) -> None:
        super().__init__(
            (Column("size", "Size"),),
            mode.theme_switch,
            name="Two moves together",
            empty_text="Choose two moves and run the grid.",
        )

    def show_values(self, asked: _Asked, grid: ShockGrid, value: FloatArray, unit: str, *, kind: str) -> None:
        """Show a grid."""
        scale = numbers.ONE
        if kind == "money":
            known = np.abs(value[np.isfinite(value)])
            scale = numbers.scale_for(float(known.max()) / 10.0 if known.size else 0.0)
            unit, value = numbers.unit_with_scale(unit, scale), value / scale.factor
        second = asked.second
        columns = [
            Column("size", asked.first.label, asked.first.unit, "number", digits=_places(grid.first_scale))
        ]
        places = _places(grid.second_scale)
        for place, size in enumerate(grid.second_scale.tolist()):
            heading = f"{numbers.signed(size, places)} {second.unit}"
            columns.append(
                Column(
                    f"c{place}",
                    heading,
                    unit,
                    "rate" if kind == "rate" else "number",
                    digits=1,
                    is_change=kind == "money" and "change" in unit,
                    tooltip=f"{second.label} {heading}",
                )
            )
        self.set_columns(columns)
        self.set_rows(
            {"size": grid.first_scale, **{f"c{place}": value[:, place] for place in range(value.shape[1])}}
        )


def _places(scale: FloatArray) -> int:
    return next((places for places in range(3) if np.allclose(scale, np.round(scale, places), atol=1e-9)), 2)


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
        self.first = _AxisFields(self, "Across")
        self.second = _AxisFields(self, "Upwards")
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
        """Whether the grid is of a former version of the book."""
        book = self.document.book
        return self._asked is not None and (book is None or is_outdated(self._asked.book, book, _ANSWERED))

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
        table = self.document.shocks.result
        if which == 0:
            thresholds = book.shock_settings.thresholds
            level = thresholds[-1] if thresholds else 1.0
            value, kind, unit = grid.funding_ratio, "rate", "ratio, %"
            level_text = numbers.ratio(level)
        else:
            base = table.base.surplus if table is not None and which == 2 else 0.0
            value, level, kind, unit = grid.surplus - base, 0.0, "money", currency
            level_text = "no surplus" if which == 1 else "no change"

        def text(number: float) -> str:
            return numbers.ratio(number) if kind == "rate" else amount(number, currency)

        self.heat.show_grid(
            grid.first_scale,
            grid.second_scale,
            value,
            axes=((asked.first.label, asked.first.unit), (asked.second.label, asked.second.unit)),
            level=level,
            level_text=level_text,
            text=text,
            sentence=_grid_sentence(value, text),
        )
        names = " and ".join(
            axis.label.casefold() if axis.shock.set_name == "standard" else f"“{axis.label}”"
            for axis in (asked.first, asked.second)
        )
        self.heat.set_title(f"{_SHOWN[which]} under {names}")
        self.values.show_values(asked, grid, value, unit, kind=kind)

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


def _titled(axis: Axis) -> str:
    set_name = axis.shock.set_name
    text = axis.label if set_name in ("", "standard") else f"{axis.label} ({set_name})"
    return text if len(text) <= 48 else f"{text[:47]}…"


def _grid_sentence(value: FloatArray, text: Callable[[float], str]) -> str:
    known = value[np.isfinite(value)]
    if not known.size:
        return "No cell could be computed."
    return f"From {text(float(known.min()))} to {text(float(known.max()))}."
