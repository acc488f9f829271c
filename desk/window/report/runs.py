"""The reports written since the window was opened, side by side."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from desk.scenarios.records import Simulation
from desk.valuation.records import Standing
from desk.window.parts.columns import Column
from desk.window.parts.tables import Table
from desk.window.parts.theme import ThemeSwitch

__all__ = ["ReportRuns", "WrittenReport"]

_COLUMNS = (
    Column("written", "Written", tooltip="Today's time of day"),
    Column("file", "File"),
    Column("currency", "Currency", tooltip="Of the amounts beside it"),
    Column("assets", "Assets", kind="money"),
    Column("liabilities", "Liabilities", kind="money"),
    Column("surplus", "Surplus", kind="money"),
    Column("ratio", "Funding ratio", kind="rate"),
    Column("paths", "Paths", kind="integer", tooltip="Of the simulation in it"),
    Column("seed", "Seed", tooltip="Of the simulation in it; the same seed gives the same figures"),
    Column("book", "Book", tooltip="The first figures of the book's SHA-256: equal books have equal ones"),
    Column("folder", "Folder"),
)


@dataclass(frozen=True)
class WrittenReport:
    """A report written since the window was opened.

    Attributes
    ----------
    path : Path
    at : str
        Time of day.
    book_digest : str
    standing : Standing or None
        That is in it; None where it was computed while writing.
    simulation : Simulation or None
        Likewise.
    seed : int or None
        Of the simulation in it; None where the book has no model.
    paths : int or None
        Likewise.
    currency : str
    """

    path: Path
    at: str
    book_digest: str
    standing: Standing | None
    simulation: Simulation | None
    seed: int | None
    paths: int | None
    currency: str


class ReportRuns(Table):
    """A table of reports, the latest first."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            _COLUMNS,
            theme_switch,
            name="Reports written",
            description="Return opens a report in the program for workbooks.",
            empty_text="Reports written in this session are listed here, to be compared and opened.",
        )
        self.setSelectionBehavior(Table.SelectionBehavior.SelectRows)
        self.fit_columns()

    def show_reports(self, reports: Sequence[WrittenReport]) -> None:
        """Show other reports."""
        standings = [made.standing for made in reports]
        self.set_rows(
            {
                "written": [made.at for made in reports],
                "file": [made.path.name for made in reports],
                "currency": [made.currency for made in reports],
                "assets": [one.assets.present_value if one else None for one in standings],
                "liabilities": [one.liabilities.present_value if one else None for one in standings],
                "surplus": [one.surplus if one else None for one in standings],
                "ratio": [one.funding_ratio if one else None for one in standings],
                "paths": [made.paths for made in reports],
                "seed": ["" if made.seed is None else str(made.seed) for made in reports],
                "book": [made.book_digest[:12] for made in reports],
                "folder": [str(made.path.parent) for made in reports],
            }
        )
        self.fit_columns()
