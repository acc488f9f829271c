"""The lines of both sides as a table, with totals that stay in view; a line opens into its flows."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QAction, QKeySequence, QShortcut
from PySide6.QtWidgets import (
    QAbstractItemView,
    QHBoxLayout,
    QLabel,
    QLineEdit,
    QMenu,
    QPushButton,
    QStackedWidget,
    QVBoxLayout,
    QWidget,
)

from desk.book import LineTerms, Side
from desk.valuation.records import FlowDetail, LineStanding, Standing
from desk.window.parts import numbers
from desk.window.parts.fields import Combo
from desk.window.parts.tables import Column, Table
from desk.window.parts.theme import GAP, HALF, ThemeSwitch, keep_look
from desk.window.standing.line_columns import (
    flow_columns,
    line_columns,
    line_rows,
    side_name,
    total_rows,
)
from desk.window.standing.line_words import discount_words, indexation_words
from desk.window.standing.wording import amount

__all__ = ["LinesPage"]

_SHOWN = ("all", "assets", "liabilities")
_TERMS_KEYS = "Ctrl+Return"


class _LinesTable(Table):
    """Lines, with the step to the terms of one in the menu on its cells."""

    def make_menu(self) -> QMenu:
        """The menu on the cells."""
        menu = super().make_menu()
        menu.addSeparator()
        menu.addAction(self.terms_action)
        return menu

    terms_action: QAction


class LinesPage(QWidget):
    """Lines, filtered and opened.

    Attributes
    ----------
    table, totals, flows : Table
    shown_sides : Combo
        All lines, or those of one side.
    finder : QLineEdit
        Shows the lines whose name holds its text.
    terms_button : QPushButton
        Asks for the terms of the selected line; only ready-made flows have any.
    open_line : callable or None
        Gives the flows of a line by its side and its place on the side.

    Signals
    -------
    message(str)
    terms_wanted(LineStanding)
        The reader asked to change the terms of a line.
    """

    message = Signal(str)
    terms_wanted = Signal(object)

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__()
        self.open_line: Callable[[Side, int], FlowDetail] | None = None
        self._lines: tuple[LineStanding, ...] = ()
        self._currency = ""
        self._columns: tuple[Column, ...] = ()
        self._terms: tuple[LineTerms, ...] = ()
        self._opened: int | None = None
        self.table = _LinesTable(
            line_columns(""),
            theme_switch,
            name="Lines of both sides",
            description="Return or a double click opens a line into its flows.",
            empty_text="No line matches.",
        )
        self.totals = Table(line_columns(""), theme_switch, name="Totals by side")
        self.flows = Table(
            flow_columns(""), theme_switch, name="Flows of a line", empty_text="This line has no flows."
        )
        self.shown_sides = Combo()
        self.shown_sides.addItems(["All lines", "Assets", "Liabilities"])
        self.shown_sides.setAccessibleName("Side shown")
        self.finder = QLineEdit()
        self.finder.setPlaceholderText("Find a line")
        self.finder.setAccessibleName("Find a line")
        self.finder.setClearButtonEnabled(True)
        self.finder.setFixedWidth(128)
        self.terms_button = QPushButton("Terms…")
        self.terms_button.setAccessibleName("Terms of the selected line")
        self.terms_button.setToolTip(
            f"Indexation and discounting of the selected line of flows ({_TERMS_KEYS})"
        )
        action = self.table.terms_action = QAction("Terms of the line…", self.table)
        action.setShortcut(QKeySequence(_TERMS_KEYS))
        action.setShortcutContext(Qt.ShortcutContext.WidgetShortcut)
        action.triggered.connect(lambda _=False: self.ask_terms())
        self.table.addAction(action)
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
        self.table.current_row_changed.connect(self._offer_terms)
        self.terms_button.clicked.connect(lambda _=False: self.ask_terms())
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

    def show_standing(
        self, standing: Standing, *, terms: tuple[LineTerms, ...] = (), second: Standing | None = None
    ) -> None:
        """Show the lines of a standing; an opened line stays open where it is still there.

        Parameters
        ----------
        standing : Standing
        terms : tuple of LineTerms, optional
            Of the lines that state any.
        second : Standing, optional
            On the second basis, to be shown beside it.
        """
        current = self.table.current_source_row()
        self._lines, self._terms = standing.lines, terms
        columns = line_columns(
            standing.currency,
            with_terms=bool(terms),
            with_second=second is not None,
            with_inflation=standing.inflation is not None,
        )
        order = self._set_columns(columns)
        self._currency = standing.currency
        self.table.set_rows(line_rows(standing, terms=terms, second=second))
        self.totals.set_rows(total_rows(standing, second=second), strong=(0, 1))
        if order is not None:
            self.table.sortByColumn(*order)
        if self.table.current_source_row() < 0 <= current < len(self._lines):
            self.table.go_to(current)
        self._fit()
        self._filter()
        self._offer_terms()
        if self._opened is not None and self._opened < len(self._lines):
            self.open_row(self._opened)
        else:
            self.close_line()

    def _set_columns(self, columns: tuple[Column, ...]) -> tuple[int, Qt.SortOrder] | None:
        """Show other columns; the order that was chosen, where columns changed and its own is still there."""
        if columns == self._columns:
            return None
        headings = self.table.horizontalHeader()
        place, direction = headings.sortIndicatorSection(), headings.sortIndicatorOrder()
        key = self._columns[place].key if 0 <= place < len(self._columns) else ""
        self._columns = columns
        self.table.set_columns(columns)
        self.totals.set_columns(columns)
        found = next((place for place, column in enumerate(columns) if column.key == key), -1)
        return (found, direction) if found >= 0 else None

    def _fit(self) -> None:
        """Columns wide enough for the totals too."""
        self.totals.fit_columns()
        for place in range(len(self.table.table_model.columns)):
            width = max(self.table.columnWidth(place), self.totals.columnWidth(place))
            self.table.setColumnWidth(place, width)
            self.totals.setColumnWidth(place, width)

    def _filter(self) -> None:
        current = self.table.current_source_row()
        self._show_wanted()
        if current >= 0 and self.table.current_source_row() < 0:
            self.table.go_to(current)

    def _show_wanted(self) -> None:
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

    # The terms of a line

    def _current_line(self) -> LineStanding | None:
        """The selected line, if it is one of ready-made flows."""
        row = self.table.current_source_row()
        line = self._lines[row] if 0 <= row < len(self._lines) else None
        return line if line is not None and line.kind == "flows" else None

    def _offer_terms(self, _row: int = -1) -> None:
        there = self._current_line() is not None
        self.terms_button.setEnabled(there)
        self.table.terms_action.setEnabled(there)

    def ask_terms(self) -> None:
        """Ask for the terms of the selected line."""
        line = self._current_line()
        if line is not None:
            self.terms_wanted.emit(line)

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
            f"worth {value}{self._terms_text(line)}"
        )
        columns = flow_columns(self._currency, with_real=detail.real_amount is not None)
        if columns != self.flows.table_model.columns:
            self.flows.set_columns(columns)
        self.flows.set_rows(
            {
                "date": detail.date,
                "time": detail.time,
                "amount": detail.amount,
                "real_amount": () if detail.real_amount is None else detail.real_amount,
                "index_factor": () if detail.index_factor is None else detail.index_factor,
                "discount_factor": detail.discount_factor,
                "present_value": detail.present_value,
            }
        )
        self.flows.setColumnHidden(0, bool(np.isnat(detail.date).all()))
        self._stack.setCurrentIndex(1)
        if not was_open:
            self.flows.fit_columns()
            self.flows.setFocus()

    def _terms_text(self, line: LineStanding) -> str:
        """The terms of a line after what it is worth; nothing where it states none."""
        own = next((each for each in self._terms if (each.side, each.line) == (line.side, line.line)), None)
        if own is None or line.kind != "flows":
            return ""
        grows, rate = indexation_words(own.indexation), discount_words(own)
        parts = [f"rising with {grows}" if grows.startswith("prices") else grows and f"rising {grows}"]
        parts.append(rate and f"discounted at {rate}")
        return "".join(f"; {part}" for part in parts if part)

    def close_line(self) -> None:
        """Go back to the lines."""
        row, self._opened = self._opened, None
        self._stack.setCurrentIndex(0)
        if row is not None:
            self.table.go_to(row)
            self.table.setFocus()
