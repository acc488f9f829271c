"""The drawn scenarios as a workbook or as compressed CSV: every path, node by node, as plain numbers.

In the workbook each quantity has a sheet with one row a path and one column a node. Its sheet `Scenario set`
is that of a book: moved into one, the same paths are taken as a set from outside. In the CSV file each line
is a path at a node, after a head of lines that begin with ``#`` and say where the figures come from. Both are
written path by path, so that memory does not grow with the run.

References
----------
Shafranovich, Y. (2005), RFC 4180: Common Format for CSV Files. Deutsch, P. (1996), RFC 1952: GZIP file format
specification. That a sheet has at most 1,048,576 rows and 16,384 columns is common practice.
"""

from __future__ import annotations

import gzip
import math
import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from desk import __version__
from desk.book import Book, Measure, ModelName, Sampling
from desk.book.arrays import FloatArray
from desk.report.as_csv import csv_text, plain_value
from desk.report.plain_workbook import PlainSheet, Style, Value, write_sheets
from desk.report.safe_cells import write_whole
from desk.scenarios.drawn_paths import DrawnPaths, drawn_blocks

if TYPE_CHECKING:
    from desk.scenarios.draws import Plan

__all__ = [
    "ENDINGS",
    "MOST_SHEET_NODES",
    "MOST_SHEET_PATHS",
    "ScenarioSize",
    "scenario_size",
    "write_scenarios",
]

ENDINGS = (".xlsx", ".csv.gz")
"""How the names of the files end that can be written."""

MOST_SHEET_PATHS = 1_048_575
"""Rows of a sheet under its headings."""
MOST_SHEET_NODES = 16_383
"""Columns of a sheet beside the path's number."""

_CAUTION = (
    "Figures are estimates drawn at random, not a certified valuation. Local standards and a qualified "
    "actuary decide."
)
_FORBIDDEN = re.compile(r"[\[\]:*?/\\]")
_LONGEST_NAME = 31
_TAKEN = ("About", "Scenario set", "Short rate", "Savings account", "Price index")
# Part of the work that drawing a block takes, for the progress only.
_DRAWING = 0.1
# Between two looks at whether to stop.
_ROWS_AT_ONCE = 500

Progress = Callable[[float], None]


@dataclass(frozen=True)
class ScenarioSize:
    """How much an export holds.

    Attributes
    ----------
    paths, nodes : int
        Nodes without today.
    sheets : int
        Quantities of a path.
    """

    paths: int
    nodes: int
    sheets: int

    @property
    def numbers(self) -> int:
        """Figures in all, as a workbook holds them."""
        return self.paths * self.nodes * self.sheets

    @property
    def obstacle(self) -> str:
        """Why a sheet cannot hold it; empty where it can."""
        if self.paths > MOST_SHEET_PATHS:
            return (
                f"a sheet holds at most {MOST_SHEET_PATHS:,} paths, one a row, and the run has "
                f"{self.paths:,}: export them as .csv.gz, or draw fewer"
            )
        if self.nodes > MOST_SHEET_NODES:
            return (
                f"a sheet holds at most {MOST_SHEET_NODES:,} nodes, one a column, and the paths have "
                f"{self.nodes:,}: export them as .csv.gz, or only at the reported years"
            )
        return ""


def _steps(plan: Plan, every_step: bool) -> tuple[int, ...]:
    return tuple(range(1, plan.steps + 1)) if every_step else tuple(plan.reported_steps)


def scenario_size(plan: Plan, *, every_step: bool = False) -> ScenarioSize:
    """How much an export of a run would hold."""
    beside = 0
    if plan.market is not None:
        beside = plan.market.asset_count + (plan.market.index is not None)
    return ScenarioSize(plan.paths, len(_steps(plan, every_step)), 3 + beside)


def write_scenarios(
    book: Book, plan: Plan, path: Path, *, every_step: bool = False, progress: Progress | None = None
) -> Path:
    """Write the paths of a run.

    Parameters
    ----------
    book : Book
        Whose run it is.
    plan : Plan
        What the run draws: see `desk.scenarios.plans.planned_run`.
    path : Path
        Its name ends in ``.xlsx`` or ``.csv.gz``; it is written whole or not at all.
    every_step : bool
        Every node of the paths; otherwise those that the run reports, the whole years.
    progress : callable, optional
        Called with the part done; an exception it raises stops the writing and leaves no file behind.

    Returns
    -------
    Path
        `path`.

    Raises
    ------
    ValueError
        If the name ends otherwise, or a sheet cannot hold the paths.
    OSError
        If the file cannot be written.
    """
    name = path.name.casefold()
    if not name.endswith(ENDINGS):
        raise ValueError(f"the name of the file must end in {' or '.join(ENDINGS)}, not {path.name}")
    is_workbook = name.endswith(".xlsx")
    size = scenario_size(plan, every_step=every_step)
    if is_workbook and size.obstacle:
        raise ValueError(size.obstacle)
    source = _Source(book, plan, _steps(plan, every_step), progress or (lambda part: None))
    source.tell(0.0)
    writer = source.write_workbook if is_workbook else source.write_csv
    written = write_whole(path, writer)
    source.tell(1.0)
    return written


class _Source:
    """The paths of a run and what is to be said of them."""

    def __init__(self, book: Book, plan: Plan, steps: tuple[int, ...], tell: Progress) -> None:
        self._book, self._plan, self._steps = book, plan, steps
        self.tell = tell
        assets = book.risky_assets
        market = plan.market
        self._assets = () if assets is None or market is None or not market.asset_count else assets.names
        self._has_index = market is not None and market.index is not None
        self._node = plan.time[list(steps)]

    def _blocks(self) -> Iterator[DrawnPaths]:
        return drawn_blocks(self._plan, asset_names=self._assets, steps=self._steps)

    # A workbook

    def write_workbook(self, path: Path) -> None:
        """One sheet a quantity: its paths are drawn for it, which takes far less time than the writing."""
        quantities = self._quantities()
        sheets = [self._about([(name, text) for name, text, _, _ in quantities])]
        for place, (name, _, style, pick) in enumerate(quantities):
            sheets.append(
                PlainSheet(
                    name,
                    ["Path", *self._node.tolist()],
                    [12.0, *[14.0] * self._node.size],
                    self._rows(pick, style, place / len(quantities), 1.0 / len(quantities)),
                )
            )
        write_sheets(path, sheets)

    def _quantities(self) -> list[tuple[str, str, Style, Callable[[DrawnPaths], FloatArray]]]:
        """Name of the sheet, what it holds, how it looks, and where it comes from, as rows of nodes."""
        found: list[tuple[str, str, Style, Callable[[DrawnPaths], FloatArray]]] = [
            (
                "Scenario set",
                "mean of the short rate from the node before to the node, a year, continuously compounded: "
                "moved into a book, a set of scenarios from outside",
                Style.PERCENT,
                lambda paths: paths.mean_rate,
            ),
            (
                "Short rate",
                "the short rate at the node, a year, continuously compounded",
                Style.PERCENT,
                lambda paths: paths.short_rate[1:],
            ),
            (
                "Savings account",
                "what one unit rolled over from today has grown to",
                Style.PLAIN,
                lambda paths: paths.account[1:],
            ),
        ]
        names = list(_TAKEN)
        for place, asset in enumerate(self._assets):
            names.append(_sheet_name(asset, names))
            found.append(
                (
                    names[-1],
                    f"what one unit of {asset} has grown to, dividends reinvested",
                    Style.PLAIN,
                    partial(_asset, place),
                )
            )
        if self._has_index:
            found.append(
                ("Price index", "the price index, 1 today", Style.PLAIN, lambda paths: _index(paths)[1:])
            )
        return found

    def _rows(
        self, pick: Callable[[DrawnPaths], FloatArray], style: Style, start: float, share: float
    ) -> Iterator[tuple[Sequence[Value], Sequence[Style]]]:
        styles = [Style.WHOLE, *[style] * self._node.size]
        for paths in self._blocks():
            values = np.ascontiguousarray(pick(paths).T)
            whole = bool(np.isfinite(values).all())
            for row in range(paths.count):
                number = paths.first + row
                if row % _ROWS_AT_ONCE == 0:
                    self.tell(start + share * number / self._plan.paths)
                cells: list[Value] = values[row].tolist()
                if not whole:
                    # A cell without a number is left empty.
                    cells = [cell if math.isfinite(cell) else None for cell in values[row].tolist()]
                yield [number + 1, *cells], styles

    def _about(self, sheets: Sequence[tuple[str, str]]) -> PlainSheet:
        rows: list[tuple[Value, Value]] = [*self._provenance()]
        rows += [(f"Sheet {name}", text) for name, text in sheets]
        rows.append(("Columns", "nodes in years from the valuation date; one row a path"))
        styles = [Style.PLAIN, Style.PLAIN]
        return PlainSheet("About", ["Item", "Value"], [26.0, 90.0], ((row, styles) for row in rows))

    # CSV

    def write_csv(self, path: Path) -> None:
        """One line a path and node; the same run gives the same bytes."""
        with open(path, "wb") as raw, gzip.GzipFile("", "wb", 6, raw, mtime=0) as packed:
            packed.write(self._csv_head().encode("utf-8", errors="replace"))
            times = [plain_value(time) for time in self._node.tolist()]
            for paths in self._blocks():
                columns = [paths.mean_rate, paths.short_rate[1:], paths.account[1:], *paths.assets[:, 1:]]
                if paths.price_index is not None:
                    columns.append(paths.price_index[1:])
                # dimensions: paths, nodes, quantities
                values = np.stack(columns, axis=-1).transpose(1, 0, 2)
                whole = bool(np.isfinite(values).all())
                for start in range(0, paths.count, _ROWS_AT_ONCE):
                    self.tell((paths.first + start) / self._plan.paths)
                    lines: list[str] = []
                    for row, path_values in enumerate(values[start : start + _ROWS_AT_ONCE].tolist(), start):
                        number = paths.first + row + 1
                        for time, cells in zip(times, path_values, strict=True):
                            texts = map(repr if whole else _text, cells)
                            lines.append(f"{number},{time},{','.join(texts)}\r\n")
                    packed.write("".join(lines).encode("ascii"))

    def _csv_head(self) -> str:
        headings = [
            "Path",
            "Node (years)",
            "Mean short rate since the node before (a year, continuous)",
            "Short rate (a year, continuous)",
            "Savings account (1 today)",
            *[f"{name} (1 today, dividends reinvested)" for name in self._assets],
        ]
        if self._has_index:
            headings.append("Price index (1 today)")
        # One field a line: nothing in it can be taken for another cell.
        notes = [csv_text([f"# {item}: {plain_value(value)}"], ()) for item, value in self._provenance()]
        return "".join(["\N{ZERO WIDTH NO-BREAK SPACE}", *notes, csv_text(headings, ())])

    # Where the figures come from

    def _provenance(self) -> list[tuple[str, Value]]:
        book, plan, run = self._book, self._plan, self._book.run
        model = book.rates_model
        given = model is not None and model.name is ModelName.OUTSIDE
        stated: list[tuple[str, Value]] = [
            ("Program", f"Gapwright {__version__}"),
            ("Book", book.basis.title or "untitled"),
            ("Book digest", book.digest),
            ("Valuation date", book.basis.valuation_date.isoformat()),
            ("Model", "" if model is None else str(model.name)),
            ("Measure", str(run.measure)),
            ("Use", _use(run.measure)),
            ("Paths", plan.paths),
            ("Nodes", len(self._steps)),
        ]
        if not given:
            stated += [("Steps a year", plan.steps_per_year), ("Seed", run.seed)]
            stated.append(("Sampling", _sampling(book)))
        stated.append(("Caution", _CAUTION))
        return stated


def _use(measure: Measure) -> str:
    if measure is Measure.PRICING:
        return "for values: averages of discounted payments are prices; no forecast"
    return "for forecasts: what may happen; averages of discounted payments are no prices"


def _sampling(book: Book) -> str:
    run = book.run
    if not run.is_reduced:
        return "plain"
    parts = [str(run.sampling)]
    if run.sampling is Sampling.SOBOL:
        parts.append(str(run.bridge))
    if run.matching:
        parts.append("moments matched")
    return ", ".join([*parts, f"{run.replicates} replicates"])


def _index(paths: DrawnPaths) -> FloatArray:
    assert paths.price_index is not None
    return paths.price_index


def _asset(place: int, paths: DrawnPaths) -> FloatArray:
    return paths.assets[place, 1:]


def _text(value: float) -> str:
    return repr(value) if math.isfinite(value) else ""


def _sheet_name(asset: str, taken: Sequence[str]) -> str:
    """A name that a sheet may have and no other has; ECMA-376 part 1, 18.2.19, and what programs allow."""
    plain = " ".join(_FORBIDDEN.sub(" ", asset).split()).strip("'")
    plain = "".join(letter for letter in plain if letter.isprintable())[:_LONGEST_NAME].strip() or "Asset"
    folded = {name.casefold() for name in taken} | {"history"}
    name, number = plain, 2
    while name.casefold() in folded:
        end = f" {number}"
        name, number = plain[: _LONGEST_NAME - len(end)] + end, number + 1
    return name
