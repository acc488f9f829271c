"""Intake: what was read, as it is, and everything that is wrong with it."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import Qt, QUrl
from PySide6.QtGui import QDesktopServices
from PySide6.QtWidgets import QHBoxLayout, QLabel, QPushButton, QTabBar, QVBoxLayout, QWidget

from desk.book import Fault, Severity
from desk.intake.records import Reading
from desk.window.document import Document
from desk.window.intake.sheet_view import EMPTY, SheetView, cell_place
from desk.window.jobs import Jobs
from desk.window.parts import numbers
from desk.window.parts.columns import Column, Mark
from desk.window.parts.facts import Facts
from desk.window.parts.models import model_title
from desk.window.parts.tables import Table
from desk.window.parts.theme import GAP, HALF, ThemeSwitch, keep_look
from desk.window.station import Station

__all__ = ["IntakeStation", "marks_of"]

_NO_LIMIT = 16_777_215
"""What Qt takes for no greatest height [px]."""

_COLUMNS = (
    Column(
        "severity", "Severity", tooltip="Grave: the book cannot be used. Mild: it can; what was done is said."
    ),
    Column("place", "Place", tooltip="Sheet and cell"),
    Column("found", "Found"),
    Column("expected", "Expected"),
    Column("mend", "What mends it"),
)


def marks_of(faults: Sequence[Fault], sheet: str) -> dict[tuple[int, int], Mark]:
    """The faults of a sheet by their cells, from 0; several in one cell become one mark.

    Parameters
    ----------
    faults : sequence of Fault
    sheet : str
        Its name.
    """
    marks: dict[tuple[int, int], Mark] = {}
    for fault in faults:
        place = cell_place(fault.cell) if fault.sheet == sheet else None
        if place is None:
            continue
        text = f"{fault.found}; expected {fault.expected}. {fault.mend}"
        grave = fault.severity is Severity.GRAVE
        former = marks.get(place)
        if former is not None:
            text, grave = f"{former.text}\n{text}", grave or former.grave
        marks[place] = Mark(text, grave)
    return marks


class IntakeStation(Station):
    """The sheets of the source, the faults, and where it came from.

    Attributes
    ----------
    tabs : QTabBar
        One tab a sheet.
    sheet : SheetView
    faults : Table
    whole_fault : QLabel
        The fault that has the keyboard, written out.
    no_faults : QLabel
        In the place of the table where there are none.
    """

    key = "intake"
    title = "Intake"
    purpose = "What was read, as it is, and everything that is wrong with it"

    def __init__(
        self, document: Document, jobs: Jobs, theme_switch: ThemeSwitch, parent: QWidget | None = None
    ) -> None:
        super().__init__(document, jobs, theme_switch, parent)
        self._reading: Reading | None = None
        self._told: tuple[Fault, ...] = ()
        self._has_faults: bool | None = None
        self._by_sheet: dict[str, dict[tuple[int, int], Mark]] = {}
        self.tabs = QTabBar()
        self.tabs.setExpanding(False)
        self.tabs.setDrawBase(False)
        self.tabs.setUsesScrollButtons(True)
        self.tabs.setElideMode(Qt.TextElideMode.ElideRight)
        self.tabs.setAccessibleName("Sheets of the workbook")
        self.tabs.currentChanged.connect(self._on_tab)
        self.sheet = SheetView(theme_switch)
        self.sheet.message.connect(self.message)
        upper = QWidget()
        column = QVBoxLayout(upper)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.tabs)
        column.addWidget(self.sheet, 1)
        self.set_pictures(upper)
        self.faults = Table(
            _COLUMNS,
            theme_switch,
            name="Faults",
            description="Return leads to the cell of a fault.",
        )
        self.faults.setSelectionBehavior(Table.SelectionBehavior.SelectRows)
        self.faults.fit_columns()
        self.faults.activated_row.connect(self.go_to_fault)
        self.faults.message.connect(self.message)
        self.faults.current_row_changed.connect(self._tell_fault)
        self.whole_fault = QLabel()
        self.whole_fault.setWordWrap(True)
        self.whole_fault.setTextFormat(Qt.TextFormat.PlainText)
        self.whole_fault.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self.whole_fault.setContentsMargins(GAP, HALF, GAP, HALF)
        self.no_faults = QLabel("No faults: everything in the workbook was understood.")
        keep_look(self.no_faults, "soft")
        self.no_faults.setContentsMargins(GAP, GAP, GAP, GAP)
        self._lower = QWidget()
        below = QVBoxLayout(self._lower)
        below.setContentsMargins(0, 0, 0, 0)
        below.setSpacing(0)
        below.addWidget(self.faults, 1)
        below.addWidget(self.whole_fault)
        below.addWidget(self.no_faults)
        self.set_table(self._lower, share=34)
        self._make_form()

    def _make_form(self) -> None:
        self.form.add_heading("Source")
        self._source = Facts()
        self.form.add_widget(self._source)
        again, folder = QPushButton("Read again"), QPushButton("Show folder")
        again.setToolTip("Reads the file once more, as it is on the disk now (F5)")
        again.clicked.connect(lambda: self.step_wanted.emit("read_again"))
        folder.clicked.connect(self._open_folder)
        buttons = QWidget()
        row = QHBoxLayout(buttons)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(GAP)
        row.addWidget(again)
        row.addWidget(folder)
        self.form.add_widget(buttons)
        self.form.add_heading("The open book")
        self._book = Facts()
        self.form.add_widget(self._book)
        self._edited: QLabel = self.form.add_note("")
        self.set_form_visible()

    def home(self) -> QWidget:
        """The faults where there are any, the sheet otherwise."""
        return self.faults if self._has_faults else self.sheet

    def refresh(self) -> None:
        """Show the reading made last."""
        reading = self.document.reading
        if reading is None:
            self.show_empty(
                "Intake shows the workbook a book is read from, sheet by sheet, with whatever is wrong "
                "marked in "
                "its cell. Open a workbook to begin.",
                "Open a workbook…",
                lambda: self.step_wanted.emit("open"),
            )
            return
        self.show_content()
        faults = self.document.faults
        if reading is not self._reading or faults != self._told:
            self._told = faults
            self._show_reading(reading)
        self._show_book()
        self._show_state(reading)

    def _show_reading(self, reading: Reading) -> None:
        former = self.tabs.tabText(self.tabs.currentIndex()).split("  ")[0] if self.tabs.count() else ""
        self._reading = reading
        self._by_sheet = {grid.name: marks_of(self._told, grid.name) for grid in reading.sheets}
        self.tabs.blockSignals(True)
        while self.tabs.count():
            self.tabs.removeTab(0)
        current = 0
        for place, grid in enumerate(reading.sheets):
            of_sheet = [fault for fault in self._told if fault.sheet == grid.name]
            count = f"  ({numbers.integer(len(of_sheet))})" if of_sheet else ""
            hidden = ", hidden" if grid.hidden else ""
            shown = grid.name.replace("&", "&&")
            self.tabs.addTab(f"{shown}{hidden}{count}")
            told = f"{numbers.integer(len(of_sheet))} {'fault' if len(of_sheet) == 1 else 'faults'}"
            self.tabs.setTabToolTip(place, f"{grid.name}: {numbers.integer(len(grid.rows))} rows, {told}")
            if grid.name == former:
                current = place
        self.tabs.blockSignals(False)
        if reading.sheets:
            self.tabs.setCurrentIndex(current)
        self._on_tab(current if reading.sheets else -1)
        self._show_faults(self._told)
        self._source.set_rows(
            [
                ("File", reading.path.name),
                ("Folder", str(reading.path.parent)),
                ("SHA-256", reading.sha256[:16] if reading.sha256 else "could not be read"),
                ("Sheets", numbers.integer(len(reading.sheets))),
                ("Grave faults", numbers.integer(len(reading.grave))),
                ("Mild faults", numbers.integer(len(self._told) - len(reading.grave))),
            ]
        )

    def _show_faults(self, faults: Sequence[Fault]) -> None:
        marks = {
            (row, "severity"): Mark(fault.severity.value, fault.severity is Severity.GRAVE)
            for row, fault in enumerate(faults)
        }
        self.faults.set_rows(
            {
                "severity": [fault.severity.value for fault in faults],
                "place": [fault.place or "the workbook" for fault in faults],
                "found": [fault.found for fault in faults],
                "expected": [fault.expected for fault in faults],
                "mend": [fault.mend for fault in faults],
            },
            marks=marks,
        )
        self._tell_fault(self.faults.current_source_row())
        if bool(faults) != self._has_faults:
            # Without faults there is one line to read below: the sheet gets the room.
            self._has_faults = bool(faults)
            self.faults.setVisible(self._has_faults)
            self.no_faults.setVisible(not self._has_faults)
            self._lower.setMaximumHeight(_NO_LIMIT if faults else self.no_faults.sizeHint().height())
            if faults:
                self.main.setSizes(self.chosen_sizes.get("main", [660, 340]))

    def _show_book(self) -> None:
        book = self.document.book
        if book is None:
            self._book.set_rows([("", "No book is open.")])
            self._edited.hide()
            return
        basis = book.basis
        lines = len(book.liabilities.line_names)
        self._book.set_rows(
            [
                ("Title", basis.title or "none"),
                ("Valuation date", numbers.day(basis.valuation_date)),
                ("Amounts in", basis.currency),
                ("Compounding", basis.compounding.value),
                ("Curve quotes", numbers.integer(len(basis.terms))),
                ("Liability lines", numbers.integer(lines)),
                ("Liability flows", numbers.integer(len(book.liabilities))),
                ("Holdings", numbers.integer(len(book.holdings))),
                ("Asset flows", numbers.integer(len(book.asset_flows))),
                ("Rates model", model_title(book.rates_model.name) if book.rates_model else "none"),
            ]
        )
        self._edited.setText("The book was changed in this window since it was read or saved.")
        self._edited.setVisible(self.document.is_modified)

    def _show_state(self, reading: Reading) -> None:
        if reading.book is not None:
            self.hide_stale()
            return
        count = len(reading.grave)
        faults = f"{numbers.integer(count)} grave {'fault' if count == 1 else 'faults'}"
        told = f"{reading.path.name} has {faults} and was not opened."
        source = self.document.source
        if source is not None:
            name = self.document.path.name if self.document.path else source.path.name
            told += f" The open book, {name}, is unchanged."
        told += " Mend the workbook in your spreadsheet program, then read it again."
        self.show_stale("Read again", lambda: self.step_wanted.emit("read_again"), text=told)

    def _on_tab(self, place: int) -> None:
        reading = self._reading
        if reading is None or not 0 <= place < len(reading.sheets):
            self.sheet.show_sheet(EMPTY, {})
            return
        grid = reading.sheets[place]
        self.sheet.show_sheet(grid, self._by_sheet.get(grid.name, {}))

    def go_to_fault(self, place: int) -> None:
        """Show the cell of a fault, counted in the order of the reading."""
        reading = self._reading
        if reading is None or not 0 <= place < len(self._told):
            return
        fault = self._told[place]
        names = [grid.name for grid in reading.sheets]
        if fault.sheet not in names:
            about = f"a sheet named {fault.sheet}" if fault.sheet else "the workbook as a whole"
            self.message.emit(f"There is no cell to show: this fault is about {about}.")
            return
        sheet = names.index(fault.sheet)
        if self.tabs.currentIndex() != sheet:
            self.tabs.setCurrentIndex(sheet)
        cell = cell_place(fault.cell) or (reading.sheets[sheet].heading_row or 0, 0)
        if self.sheet.go_to(*cell):
            self.sheet.setFocus(Qt.FocusReason.OtherFocusReason)

    def _tell_fault(self, place: int) -> None:
        """Write out the fault that has the keyboard: its cells may be too narrow for it."""
        faults = self._told
        fault = faults[place] if 0 <= place < len(faults) else None
        self.whole_fault.setText(str(fault) if fault is not None else "")
        self.whole_fault.setVisible(fault is not None)

    def _open_folder(self) -> None:
        if self._reading is not None:
            folder = str(self._reading.path.parent)
            if not QDesktopServices.openUrl(QUrl.fromLocalFile(folder)):
                self.message.emit(f"The folder could not be opened: {folder}")
