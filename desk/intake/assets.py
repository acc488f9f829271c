"""The sheet of risky assets."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from desk.book import RiskyAssets
from desk.intake.cells import Cells
from desk.intake.checks import check_correlations, check_not_negative, check_rates, check_size
from desk.intake.faults import FaultList
from desk.intake.layout import SHEETS, Table, find_known, fold

__all__ = ["further_columns", "read_risky_assets"]

FloatArray = NDArray[np.float64]

_LEAST_EIGENVALUE = -1e-10
"""Of a correlation matrix whose entries are rounded to what a float holds."""


def read_risky_assets(table: Table, faults: FaultList, *, mend: bool = False) -> RiskyAssets | None:
    """The risky assets; None where a row could not be read or there is none.

    Parameters
    ----------
    table : Table
    faults : FaultList
    mend : bool
        Whether correlations that contradict one another are to be mended: then they are a mild fault.
    """
    before = len(faults)
    sheet, rows = table.sheet, table.rows
    if not rows.size:
        faults.mild(
            "the sheet holds no assets",
            "one row an asset",
            "Add rows, or remove the sheet.",
            sheet=sheet.name,
        )
        return None
    cells = {name: Cells(sheet, table.column(name), rows, faults) for name in table.layout.columns}
    names = cells["Name"].texts_of("the name of the asset")
    value = cells["Value"].numbers("a value")
    premium = cells["Premium"].numbers("an excess return a year")
    volatility = cells["Volatility"].numbers("a volatility a year")
    dividend_yield = cells["Dividend yield"].numbers("a dividend yield a year", required=False)
    rates_correlation = cells["Rates"].numbers("a correlation")
    check_not_negative(cells["Value"], value, "the value")
    check_size(cells["Value"], value, "the value")
    check_rates(cells["Premium"], premium, "the premium")
    check_not_negative(cells["Volatility"], volatility, "the volatility")
    check_rates(cells["Volatility"], volatility, "the volatility", most=3.0, least=-np.inf)
    check_rates(cells["Dividend yield"], dividend_yield, "the dividend yield")
    check_correlations(cells["Rates"], rates_correlation, "the correlation with the rates")
    correlation = _read_matrix(table, names, faults)
    dividend_yield = np.where(np.isnan(dividend_yield), 0.0, dividend_yield)
    if correlation is None or not all(names):
        return None
    if any(np.isnan(column).any() for column in (value, premium, volatility, rates_correlation)):
        return None
    joint = np.block(
        [[np.ones((1, 1)), rates_correlation[None, :]], [rates_correlation[:, None], correlation]]
    )
    if len(faults) == before or np.abs(joint).max() <= 1.0:
        least = float(np.linalg.eigvalsh((joint + joint.T) / 2.0)[0])
        if least < _LEAST_EIGENVALUE:
            add = faults.mild if mend else faults.add
            add(
                f"the correlations contradict each other: the least eigenvalue is {least:.3g}",
                "correlations, those with the rates included, that can hold together",
                "The nearest ones that do are taken in a simulation."
                if mend
                else "Move the strongest ones towards 0, or set Mend correlation to yes in the sheet Rates "
                "model.",
                sheet=sheet.name,
                row=table.heading_row,
                column=table.fields["Rates"],
            )
    return RiskyAssets(
        tuple(names), value, premium, volatility, dividend_yield, correlation, rates_correlation
    )


def _read_matrix(table: Table, names: list[str], faults: FaultList) -> FloatArray | None:
    """The correlation matrix, from one column a name; None where a column is missing or an entry is wrong."""
    sheet, rows = table.sheet, table.rows
    headings = SHEETS["Risky assets"].columns
    columns: dict[str, int] = {}
    for heading, column in table.further:
        if fold(heading) in columns:
            faults.add(
                f'the heading "{heading[:60]}" stands twice',
                "each heading once",
                "Remove or rename one of the two columns.",
                sheet=sheet.name,
                row=table.heading_row,
                column=column,
            )
        columns.setdefault(fold(heading), column)
    matrix = np.full((len(names), len(names)), np.nan)
    places: list[Cells | None] = []
    seen: set[str] = set()
    for entry, name in enumerate(names):
        key = fold(name)
        reserved = find_known(name, headings) is not None
        if name and (reserved or key in seen):
            faults.add(
                f'the name "{name[:60]}" ' + ("is that of a heading" if reserved else "stands twice"),
                "each asset under a name of its own",
                "Rename the asset.",
                sheet=sheet.name,
                row=int(rows[entry]),
                column=table.fields.get("Name", 0),
            )
        elif name and key not in columns:
            faults.add(
                f'the column "{name[:60]}" of the correlation matrix is missing',
                "one column a name",
                f'Add the column "{name[:60]}" with its correlations.',
                sheet=sheet.name,
                row=table.heading_row,
            )
        seen.add(key)
        cells = Cells(sheet, columns[key], rows, faults) if name and key in columns else None
        places.append(cells)
        if cells is not None:
            matrix[:, entry] = cells.numbers("a correlation")
            check_correlations(cells, matrix[:, entry], "the correlation")
    _check_matrix(matrix, places)
    return None if np.isnan(matrix).any() else matrix


def _check_matrix(matrix: FloatArray, places: list[Cells | None]) -> None:
    for entry, cells in enumerate(places):
        if cells is None:
            continue
        own = matrix[entry, entry]
        if not np.isnan(own) and own != 1.0:
            cells.fault(entry, f"the correlation with itself is {own:.12g}", "1", "Write 1.")
        for other in range(entry):
            one, two = matrix[other, entry], matrix[entry, other]
            if np.isfinite(one) and np.isfinite(two) and one != two:
                cells.fault(
                    other,
                    f"the correlation is {one:.12g}, but {two:.12g} in the mirrored cell",
                    "the same on both sides of the diagonal",
                    "Write the same figure in both cells.",
                )


def further_columns(table: Table, names: tuple[str, ...]) -> list[tuple[str, int]]:
    """The further columns of the sheet of risky assets that are no part of the correlation matrix."""
    taken = {fold(name) for name in names}
    return [(heading, column) for heading, column in table.further if fold(heading) not in taken]
