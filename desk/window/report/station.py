"""Report: the workbook for colleagues, page by page, and those written so far."""

from __future__ import annotations

import time
from collections.abc import Callable
from datetime import UTC, datetime
from functools import partial
from pathlib import Path

from PySide6.QtCore import Qt, QUrl
from PySide6.QtGui import QDesktopServices
from PySide6.QtWidgets import QWidget

from desk import tasks
from desk.book import Book
from desk.intake.records import Reading
from desk.report.results.plan import SheetPlan
from desk.report.wording import CAUTION
from desk.scenarios.records import Simulation
from desk.valuation.records import Standing
from desk.valuation.shock_records import ShockTable
from desk.window.dialogs import Dialogs
from desk.window.document import Document
from desk.window.jobs import Job, Jobs
from desk.window.parts import numbers
from desk.window.parts.columns import Column
from desk.window.parts.fields import TextField
from desk.window.parts.models import model_title
from desk.window.parts.paths import is_same_file
from desk.window.parts.tables import Table
from desk.window.parts.theme import GAP, ThemeSwitch
from desk.window.report.page_preview import PagePreview
from desk.window.report.runs import ReportRuns, WrittenReport
from desk.window.report.target import suggested_target, target_problem
from desk.window.settings import Settings
from desk.window.station import Station

__all__ = ["ReportStation"]

_SHEET_COLUMNS = (
    Column("sheet", "Sheet", tooltip="In the order of the workbook"),
    Column("rows", "Rows", kind="integer"),
    Column("pages", "Pages", kind="integer", tooltip="When printed on A4, landscape"),
)
_Wanted = tuple[Book, Standing, Simulation | None]
"""What pages are laid out from."""


def _lay_out(
    reading: Reading,
    standing: Standing,
    simulation: Simulation | None,
    shocks: ShockTable | None,
    *,
    progress: Callable[[float], None],
    cancel: tasks.CancelToken,
) -> list[SheetPlan]:
    from desk.report.results.workbook import plan_sheets

    progress(0.0)
    if reading.book is None:
        raise ValueError("`reading` must have a book")
    if shocks is None:
        shocks = tasks.shock(reading.book, progress=lambda part: progress(0.5 * part), cancel=cancel)
    plans, _ = plan_sheets(
        reading, reading.book, standing, simulation, shocks=shocks, written_at=datetime.now(UTC)
    )
    progress(1.0)
    return plans


class ReportStation(Station):
    """What goes into the report, where it goes, and what was written.

    Attributes
    ----------
    sheets : Table
        The sheets that the report will have.
    preview : PagePreview
    target : TextField
        Where it goes.
    runs : ReportRuns
        Reports written since the window was opened.
    written : list of WrittenReport
        Likewise, the latest first.
    """

    key = "report"
    title = "Report"
    purpose = "The workbook for colleagues, as its pages will come out"

    def __init__(
        self,
        document: Document,
        jobs: Jobs,
        theme_switch: ThemeSwitch,
        parent: QWidget | None = None,
        *,
        report: Callable[..., Path] | None = None,
        dialogs: Dialogs | None = None,
    ) -> None:
        """`report` stands in for the task of that name, `dialogs` for the questions."""
        super().__init__(document, jobs, theme_switch, parent)
        self._report = report or tasks.report
        self._dialogs = dialogs or Dialogs(self)
        self._settings: Settings | None = None
        self._writing: Job | None = None
        self._gave_way_to: QWidget | None = None
        self._laid_out: _Wanted | None = None
        self._target_source: Path | None = None
        self.written: list[WrittenReport] = []
        self.sheets = Table(
            _SHEET_COLUMNS,
            theme_switch,
            name="Sheets of the report",
            description="The sheet that is chosen is shown beside.",
        )
        self.sheets.setSelectionBehavior(Table.SelectionBehavior.SelectRows)
        self.sheets.fit_columns()
        self.sheets.current_row_changed.connect(self._on_sheet)
        self.sheets.message.connect(self.message)
        self.preview = PagePreview(theme_switch)
        self.set_pictures(self.sheets, self.preview)
        self.pictures.setStretchFactor(0, 0)
        self.pictures.setStretchFactor(1, 1)
        self.pictures.setSizes([290, 710])
        self.runs = ReportRuns(theme_switch)
        self.runs.activated_row.connect(self._open_report)
        self.runs.message.connect(self.message)
        self.set_table(self.runs, share=20)
        self._make_form()

    def use_settings(self, settings: Settings) -> None:
        """Remember the folder in `settings`."""
        self._settings = settings

    def _make_form(self) -> None:
        form = self.form
        form.add_heading("Where it goes")
        self.target = TextField(
            "File",
            hint="The workbook (.xlsx) to write. It is written whole or not at all.",
            most=4_000,
            check=self._target_problem,
        )
        form.add(self.target)
        self.browse = form.add_button("Choose…", self._browse)
        form.add_heading("What goes in")
        self._contents = form.add_note("")
        self.run_button = form.add_button("Run the simulation now", self._run_simulation)
        self.write_button = form.add_button("Write the report", self.write, first=True)
        self.folder_button = form.add_button("Show the folder", self._show_folder)
        self.folder_button.setToolTip("The folder of the report chosen below, or of the last one")
        form.add_note(CAUTION)
        self.set_form_visible()

    # Keeping up

    def home(self) -> QWidget:
        """The button that writes."""
        return self.write_button

    def refresh(self) -> None:
        """Show the report that the book as it stands would give."""
        document = self.document
        reading = document.current_reading
        if reading is None or reading.book is None:
            self.show_empty(
                "The report puts every figure into a workbook in which a colleague can check it. It needs "
                "an open "
                "book.",
                "Open a workbook…",
                lambda: self.step_wanted.emit("open"),
            )
            return
        self.show_content()
        self._suggest_target()
        self._tell_contents()
        standing = None if document.standing_is_stale else document.standing
        if standing is None:
            self._await_standing()
            return
        self.hide_stale()
        simulation = self._fresh_simulation()
        wanted = (reading.book, standing, simulation)
        former = self._laid_out
        if former is None or any(one is not other for one, other in zip(wanted, former, strict=True)):
            self._laid_out = wanted
            self.jobs.start(
                "Laying out the report",
                partial(_lay_out, reading, standing, simulation, self._fresh_shocks()),
                on_done=partial(self._show_plans, wanted),
                on_failed=self._on_layout_failed,
                exclusive_key=f"pages of {id(self)}",
            )

    def _fresh_simulation(self) -> Simulation | None:
        document = self.document
        return None if document.simulation_is_stale else document.simulation

    def _fresh_shocks(self) -> ShockTable | None:
        shocks = self.document.shocks
        return None if shocks.is_stale else shocks.result

    def _await_standing(self) -> None:
        failure = self.document.standing_failure
        if failure:
            self._laid_out = None
            self.preview.show_plans((), "", "There are no pages: the book could not be valued.")
            self.sheets.set_rows({column.key: () for column in _SHEET_COLUMNS})
            self.show_stale(text=f"No report can be written: the book could not be valued. {failure}")
        elif self._laid_out is not None:
            self.show_stale(text="These pages are from before your last change; the book is being valued.")
        else:
            self.preview.show_plans((), "", "The pages appear once the book is valued.")
        self._arm()

    def _show_plans(self, wanted: _Wanted, plans: list[SheetPlan]) -> None:
        if wanted is not self._laid_out:
            return
        self.preview.show_plans(plans, self._file_name(), "")
        counts = [len(plan.cells) + (plan.block.count if plan.block else 0) for plan in plans]
        self.sheets.set_rows(
            {
                "sheet": [plan.name for plan in plans],
                "rows": counts,
                "pages": [self.preview.page_count(plan.name) for plan in plans],
            }
        )
        self.sheets.fit_columns()
        self.sheets.setMaximumWidth(self.sheets.horizontalHeader().length() + 2 * GAP)
        shown = self.preview.shown[0]
        names = [plan.name for plan in plans]
        if shown in names:
            self.sheets.go_to(names.index(shown))

    def _on_layout_failed(self, error: BaseException) -> None:
        self._laid_out = None
        self.preview.show_plans((), "", f"The pages could not be laid out: {error}")
        raise error

    def _tell_contents(self) -> None:
        document = self.document
        book = document.book
        if book is None:
            return
        has_model = book.rates_model is not None
        simulation = self._fresh_simulation()
        if not has_model:
            told = "The book has no rates model: the report has no sheets of a simulation."
        elif simulation is not None:
            told = (
                f"The run at hand goes in: {numbers.integer(simulation.paths)} paths of "
                f"{model_title(simulation.model)}, seed {simulation.seed}."
            )
        else:
            run = book.run
            why = "The last run is out of date" if document.simulation is not None else "No run was made yet"
            told = (
                f"{why}, so the pages are shown without the sheets of a simulation. Writing the report "
                "runs it "
                f"first ({numbers.integer(run.paths)} paths over {run.horizon_years} years, seed "
                f"{run.seed}) and "
                "puts them in."
            )
        self._contents.setText(told)
        self.run_button.setVisible(has_model and simulation is None)
        self.run_button.setEnabled(not document.is_simulating)
        self._arm()

    def _arm(self) -> None:
        """Switch the button on where a report can be written."""
        able = self.document.book is not None and not self.document.standing_failure and self._writing is None
        had_focus = self.write_button.hasFocus()
        self.write_button.setEnabled(able)
        if had_focus and not able:
            # The keyboard leaves what is switched off, and comes back unless the reader took it elsewhere.
            self._gave_way_to = self.window().focusWidget()
        elif able and self._gave_way_to is not None:
            if self._gave_way_to is self.window().focusWidget() and self.isVisible():
                self.write_button.setFocus(Qt.FocusReason.OtherFocusReason)
            self._gave_way_to = None
        self.folder_button.setEnabled(bool(self.written))

    # Where it goes

    def _suggest_target(self) -> None:
        source = self.document.source
        if source is None or source.path == self._target_source:
            return
        self._target_source = source.path
        remembered = self._settings.report_folder if self._settings is not None else None
        self.target.set_value(str(suggested_target(source.path, remembered)))
        self._show_file_name()

    def _target_problem(self, text: str) -> str:
        source = self.document.source
        return target_problem(text, (self.document.path, source.path if source else None))

    def _browse(self) -> None:
        def chosen(path: Path) -> None:
            problem = self._target_problem(str(path))
            self.target.set_value(str(path))
            self.target.set_problem(problem)
            self._asked = path
            self._show_file_name()

        self._dialogs.ask_save("Write the report", Path(self.target.value or "report.xlsx"), chosen)

    _asked: Path | None = None
    """A file that the reader has already agreed to replace."""

    def _file_name(self) -> str:
        return Path(self.target.value).name if self.target.value else ""

    def _show_file_name(self) -> None:
        # The end of a long path says more than its beginning.
        self.target.line.end(False)
        self.target.line.setToolTip(self.target.value)
        self.preview.set_file_name(self._file_name())

    # Writing

    def _run_simulation(self) -> None:
        if self.document.book is not None and not self.document.is_simulating:
            self.document.run_simulation()
            self.run_button.setEnabled(False)

    def write(self) -> None:
        """Write the report to the file named in the form."""
        if self.document.current_reading is None or self._writing is not None:
            return
        text = self.target.line.text().strip()
        problem = self._target_problem(text)
        if problem:
            self.target.set_problem(problem)
            self.target.setFocus(Qt.FocusReason.OtherFocusReason)
            return
        path = Path(text).expanduser()
        if str(path) != self.target.value:
            self.target.set_value(str(path))
            self._show_file_name()
        own = any(is_same_file(path, made.path) for made in self.written)
        if path.exists() and not own and path != self._asked:
            self._dialogs.ask_overwrite(
                f"Replace “{path.name}”?",
                "There is a file of this name, and this window did not write it.",
                partial(self._start, path),
            )
        else:
            self._start(path)

    def _start(self, path: Path) -> None:
        document = self.document
        reading = document.current_reading
        if reading is None or reading.book is None or self._writing is not None:
            return
        standing = None if document.standing_is_stale else document.standing
        simulation = self._fresh_simulation()
        self._writing = self.jobs.start(
            f"Writing {path.name}",
            partial(
                self._report,
                reading,
                path,
                standing=standing,
                simulation=simulation,
                shocks=self._fresh_shocks(),
            ),
            on_done=partial(self._on_written, reading, standing, simulation),
            on_failed=partial(self._on_failed, path),
            on_cancelled=partial(self._on_cancelled, path),
        )
        self._arm()

    def _on_written(
        self, reading: Reading, standing: Standing | None, simulation: Simulation | None, path: Path
    ) -> None:
        self._writing = None
        book = reading.book
        if book is None:
            return
        has_run = book.rates_model is not None
        made = WrittenReport(
            path=path,
            at=time.strftime("%H:%M:%S"),
            book_digest=book.digest,
            standing=standing,
            simulation=simulation,
            seed=book.run.seed if has_run else None,
            paths=book.run.paths if has_run else None,
            currency=book.basis.currency,
        )
        self.written.insert(0, made)
        if self._settings is not None:
            self._settings.report_folder = path.parent
        self._asked = None
        self.runs.show_reports(self.written)
        self._arm()
        self.message.emit(f"The report is in {path}.")

    def _on_failed(self, path: Path, error: BaseException) -> None:
        self._writing = None
        self._arm()
        if not isinstance(error, OSError | ValueError):
            raise error
        reason = (error.strerror if isinstance(error, OSError) else "") or str(error)
        self.target.set_problem(f"The report was not written: {reason}")
        self.message.emit(f"{path.name} was not written: {reason}")

    def _on_cancelled(self, path: Path) -> None:
        self._writing = None
        self._arm()
        self.message.emit(f"{path.name} was not written: it was cancelled.")

    # Opening

    def _on_sheet(self, row: int) -> None:
        if row >= 0:
            name = str(self.sheets.table_model.column_values("sheet")[row])
            if name != self.preview.shown[0]:
                self.preview.show_sheet(name)

    def _open_report(self, row: int) -> None:
        if 0 <= row < len(self.written):
            self._open(self.written[row].path)

    def _show_folder(self) -> None:
        if self.written:
            row = max(self.runs.current_source_row(), 0)
            self._open(self.written[row].path.parent)

    def _open(self, path: Path) -> None:
        if not path.exists():
            self.message.emit(f"There is no {path} any more.")
        elif not QDesktopServices.openUrl(QUrl.fromLocalFile(str(path))):
            self.message.emit(f"Nothing here opens {path}.")
