"""The lines of both sides as a table, with totals that stay in view; a line opens into its flows."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QKeySequence, QShortcut
from PySide6.QtWidgets import (
    QAbstractItemView,
    QHBoxLayout,
    QLabel,
    QLineEdit,
    QPushButton,
    QStackedWidget,
    QVBoxLayout,
    QWidget,
)

from desk.book import Side
from desk.valuation.records import FlowDetail, LineStanding, Measures, Standing
from desk.window.parts import numbers
from desk.window.parts.fields import Combo
from desk.window.parts.tables import Column, Table
from desk.window.parts.theme import GAP, HALF, ThemeSwitch, keep_look
from desk.window.standing.wording import amount

__all__ = ["LinesPage", "side_name"]

_MEASURES = tuple(name for name in Measures.__dataclass_fields__)
_SHOWN = ("all", "assets", "liabilities")


def side_name(side: Side) -> str:
    """A side as it stands in a table."""
    return {Side.ASSETS: "Assets", Side.LIABILITIES: "Liabilities"}[side]


def _columns(currency: str) -> tuple[Column, ...]:
    return (
        Column("side", "Side"),
        Column("line", "Line"),
        Column("kind", "Kind", tooltip="The kind of holding, or flows as the source states them."),
        Column("present_value", "Present value", currency, "money"),
        Column(
            "dv01",
            "DV01",
            currency,
            "money",
            tooltip="Fall in present value for +1 basis point on all zero rates.",
        ),
        Column(
            "effective_duration",
            "Effective dur.",
            "years",
            "years",
            tooltip="Effective duration: for a parallel move of the continuous zero rates.",
        ),
        Column(
            "spread",
            "Spread",
            "% a year",
            "rate",
            tooltip="Over the curve, continuously compounded; none where it differs between flows.",
        ),
        Column(
            "equivalent_rate",
            "Equivalent rate",
            "% a year",
            "rate",
            tooltip="The single annual effective rate with the same present value.",
        ),
        Column(
            "spread_duration",
            "Spread dur.",
            "years",
            "years",
            tooltip="Spread duration: for a move of the spread alone; none where no spread plays a part.",
        ),
        Column(
            "market_value",
            "Market value",
            currency,
            "money",
            tooltip="As the source states it, or what its price comes to.",
        ),
        Column(
            "expected_credit_loss",
            "Credit loss",
            currency,
            "money",
            tooltip="Expected credit loss: what expected default takes off the present value.",
        ),
        Column("macaulay_duration", "Macaulay dur.", "years", "years", tooltip="At the equivalent rate."),
        Column("modified_duration", "Modified dur.", "years", "years", tooltip="At the equivalent rate."),
        Column("convexity", "Convexity", "years²", "number", digits=1),
        Column(
            "dispersion",
            "Dispersion",
            "years²",
            "number",
            digits=1,
            tooltip="Variance of the times of the flows, weighted by present value.",
        ),
        Column("flow_count", "Flows", "", "integer", tooltip="After the valuation date, today's included."),
    )


def _flow_columns(currency: str) -> tuple[Column, ...]:
    return (
        Column("date", "Date", "", "date"),
        Column("time", "Time", "years", "years", digits=4),
        Column(
            "amount",
            "Amount",
            currency,
            "money",
            digits=2,
            tooltip="What is paid: floating interest as projected on today's curve, default as expected.",
        ),
        Column("discount_factor", "Discount factor", "", "number", digits=6, tooltip="With the spread."),
        Column("present_value", "Present value", currency, "money", digits=2),
    )


def _measures_of(rows: Sequence[Measures]) -> dict[str, Any]:
    return {name: np.array([getattr(row, name) for row in rows]) for name in _MEASURES}


def _total(figures: Sequence[float | None]) -> float | None:
    """The sum of what there is; None where there is nothing."""
    stated = [figure for figure in figures if figure is not None]
    return sum(stated) if stated else None


class LinesPage(QWidget):
    """Lines, filtered and opened.

    Attributes
    ----------
    table, totals, flows : Table
    shown_sides : Combo
        All lines, or those of one side.
    finder : QLineEdit
        Shows the lines whose name holds its text.
    open_line : callable or None
        Gives the flows of a line by its side and its place on the side.

    Signals
    -------
    message(str)
    """

    message = Signal(str)

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__()
        self.open_line: Callable[[Side, int], FlowDetail] | None = None
        self._lines: tuple[LineStanding, ...] = ()
        self._currency = ""
        self._opened: int | None = None
        self.table = Table(
            _columns(""),
            theme_switch,
            name="Lines of both sides",
            description="Return or a double click opens a line into its flows.",
            empty_text="No line matches.",
        )
        self.totals = Table(_columns(""), theme_switch, name="Totals by side")
        self.flows = Table(
            _flow_columns(""), theme_switch, name="Flows of a line", empty_text="This line has no flows."
        )
        self.shown_sides = Combo()
        self.shown_sides.addItems(["All lines", "Assets", "Liabilities"])
        self.shown_sides.setAccessibleName("Side shown")
        self.finder = QLineEdit()
        self.finder.setPlaceholderText("Find a line")
        self.finder.setAccessibleName("Find a line")
        self.finder.setClearButtonEnabled(True)
        self.finder.setFixedWidth(160)
        self.back = QPushButton("Back to the lines")
        self.back.setToolTip("Escape")
        self.heading = QLabel()
        keep_look(self.heading, "strong")
        self.heading.setTextFormat(Qt.TextFormat.PlainText)
        self.about = QLabel()
        keep_look(self.about, "soft")
        self._stack = QStackedWidget()
        self._stack.addWidget(self._make_list())
        self._stack.addWidget(self._make_opened())
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.addWidget(self._stack)
        self._connect()

    def _make_list(self) -> QWidget:
        page = QWidget()
        column = QVBoxLayout(page)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.table, 1)
        # As wide as the cells above: the bar beside them takes its room here too.
        under = QWidget()
        keep_look(under, "surface")
        under.setAttribute(Qt.WidgetAttribute.WA_StyledBackground)
        self._under = QHBoxLayout(under)
        self._under.setContentsMargins(0, 0, 0, 0)
        self._under.addWidget(self.totals)
        column.addWidget(under)
        self.totals.horizontalHeader().hide()
        self.totals.setSortingEnabled(False)
        self.totals.setFixedHeight(2 * self.totals.verticalHeader().defaultSectionSize() + 2)
        never = Qt.ScrollBarPolicy.ScrollBarAlwaysOff
        self.totals.setHorizontalScrollBarPolicy(never)
        self.totals.setVerticalScrollBarPolicy(never)
        self.table.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        return page

    def _make_opened(self) -> QWidget:
        page = QWidget()
        row = QHBoxLayout()
        row.setContentsMargins(0, HALF, GAP, HALF)
        row.setSpacing(2 * GAP)
        row.addWidget(self.back)
        row.addWidget(self.heading)
        row.addWidget(self.about)
        row.addStretch(1)
        column = QVBoxLayout(page)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addLayout(row)
        column.addWidget(self.flows, 1)
        escape = QShortcut(QKeySequence(Qt.Key.Key_Escape), page)
        escape.setContext(Qt.ShortcutContext.WidgetWithChildrenShortcut)
        escape.activated.connect(self.close_line)
        return page

    def _connect(self) -> None:
        for table in (self.table, self.totals, self.flows):
            table.message.connect(self.message)
        self.table.activated_row.connect(self.open_row)
        self.back.clicked.connect(self.close_line)
        self.shown_sides.currentIndexChanged.connect(lambda _: self._filter())
        self.finder.textChanged.connect(lambda _: self._filter())
        headings = self.table.horizontalHeader()
        headings.sectionResized.connect(lambda place, _, size: self.totals.setColumnWidth(place, size))
        bar, follower = self.table.horizontalScrollBar(), self.totals.horizontalScrollBar()
        bar.rangeChanged.connect(lambda *_: follower.setRange(bar.minimum(), bar.maximum()))
        bar.valueChanged.connect(follower.setValue)
        beside = self.table.verticalScrollBar()
        beside.rangeChanged.connect(
            lambda low, high: self._under.setContentsMargins(
                0, 0, beside.sizeHint().width() if high > low else 0, 0
            )
        )

    # Showing

    def show_standing(self, standing: Standing) -> None:
        """Show the lines of a standing; an opened line stays open where it is still there."""
        if standing.currency != self._currency:
            self._currency = standing.currency
            self.table.set_columns(_columns(standing.currency))
            self.totals.set_columns(_columns(standing.currency))
            self.flows.set_columns(_flow_columns(standing.currency))
        self._lines = standing.lines
        lines = self._lines
        self.table.set_rows(
            {
                "side": [side_name(line.side) for line in lines],
                "line": [line.line for line in lines],
                "kind": [line.kind for line in lines],
                "spread": [line.spread for line in lines],
                "spread_duration": [line.spread_duration for line in lines],
                "market_value": [line.market_value for line in lines],
                "expected_credit_loss": [line.expected_credit_loss for line in lines],
                "flow_count": [line.flow_count for line in lines],
                **_measures_of([line.measures for line in lines]),
            }
        )
        losses = [_total([line.expected_credit_loss for line in lines if line.side is side]) for side in Side]
        counts = [sum(line.flow_count for line in lines if line.side is side) for side in Side]
        self.totals.set_rows(
            {
                "side": [side_name(side) for side in Side],
                "line": ["All lines"] * 2,
                "kind": [""] * 2,
                "spread": [None] * 2,
                "spread_duration": [None] * 2,
                "market_value": [None] * 2,
                "expected_credit_loss": losses,
                "flow_count": counts,
                **_measures_of([standing.assets, standing.liabilities]),
            },
            strong=(0, 1),
        )
        self._fit()
        self._filter()
        if self._opened is not None and self._opened < len(lines):
            self.open_row(self._opened)
        else:
            self.close_line()

    def _fit(self) -> None:
        """Columns wide enough for the totals too."""
        self.totals.fit_columns()
        for place in range(len(self.table.table_model.columns)):
            width = max(self.table.columnWidth(place), self.totals.columnWidth(place))
            self.table.setColumnWidth(place, width)
            self.totals.setColumnWidth(place, width)

    def _filter(self) -> None:
        side = _SHOWN[max(self.shown_sides.currentIndex(), 0)]
        text = self.finder.text().strip().casefold()
        if side == "all" and not text:
            self.table.table_model.show_only(None)
            return
        wanted = [
            (side == "all" or line.side.value == side) and text in line.line.casefold()
            for line in self._lines
        ]
        self.table.table_model.show_only(np.array(wanted, dtype=bool))

    def show_side(self, side: str, *, by: str = "") -> None:
        """Show the lines of one side (``assets``, ``liabilities`` or ``all``), the greatest `by` first."""
        self.close_line()
        self.finder.clear()
        self.shown_sides.setCurrentIndex(_SHOWN.index(side))
        if by:
            self.table.sortByColumn(self.table.table_model.column_of(by), Qt.SortOrder.DescendingOrder)
        else:
            self.table.sortByColumn(-1, Qt.SortOrder.AscendingOrder)
        if self.table.table_model.rowCount():
            self.table.setCurrentIndex(self.table.table_model.index(0, 0))
            self.table.setFocus()

    # Opening a line

    @property
    def is_open(self) -> bool:
        """Whether the flows of a line are shown."""
        return self._stack.currentIndex() == 1

    def open_row(self, row: int) -> None:
        """Show the flows of the line at a source row."""
        if self.open_line is None or not 0 <= row < len(self._lines):
            return
        line = self._lines[row]
        first = next(place for place, each in enumerate(self._lines) if each.side is line.side)
        try:
            detail = self.open_line(line.side, row - first)
        except (IndexError, ValueError) as error:
            self.close_line()
            self.message.emit(f"The flows of {line.line} cannot be shown: {error}")
            return
        was_open = self._opened == row
        self._opened = row
        self.heading.setText(line.line)
        value = amount(line.measures.present_value, self._currency)
        count = numbers.integer(detail.time.size)
        self.about.setText(
            f"{side_name(line.side)}, {line.kind}: {count} {'row' if detail.time.size == 1 else 'rows'}, "
            f"worth {value}"
        )
        self.flows.set_rows(
            {
                "date": detail.date,
                "time": detail.time,
                "amount": detail.amount,
                "discount_factor": detail.discount_factor,
                "present_value": detail.present_value,
            }
        )
        self.flows.setColumnHidden(0, bool(np.isnat(detail.date).all()))
        self._stack.setCurrentIndex(1)
        if not was_open:
            self.flows.fit_columns()
            self.flows.setFocus()

    def close_line(self) -> None:
        """Go back to the lines."""
        row, self._opened = self._opened, None
        self._stack.setCurrentIndex(0)
        if row is not None:
            self.table.go_to(row)
            self.table.setFocus()
