"""A basis from its items and the sheets beside them."""

from __future__ import annotations

from collections.abc import Collection, Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from desk.book import Basis, BondFit, CurveKind, Inflation, LiabilityMethod
from desk.intake.basis_items import QUOTED_KINDS, BasisItems
from desk.intake.cells import Cells
from desk.intake.checks import plain
from desk.intake.faults import FaultList
from desk.intake.layout import SHEETS, Table
from desk.intake.quotes import read_bonds, read_by_term
from desk.rates.curve_error import CurveError
from desk.rates.smith_wilson import CONVERGENCE

__all__ = ["FIRST", "SECOND", "BasisSheets", "read_basis", "report_missing", "unused_sheets"]

FloatArray = NDArray[np.float64]

_TRIED = np.array([0.25, 1.0, 10.0, 50.0])
"""Times at which a curve must discount [years]."""

_CONVERGENCE_ITEMS = ("Convergence point", "Convergence tolerance", "Ultimate forward rate")
"""Where a curve that does not converge is told: the first of them that is stated."""


@dataclass(frozen=True)
class BasisSheets:
    """Names of the sheets of one basis.

    Attributes
    ----------
    items, curve, bonds, liability_bonds, liability_spreads, inflation : str
    """

    items: str
    curve: str
    bonds: str
    liability_bonds: str
    liability_spreads: str
    inflation: str

    @property
    def beside(self) -> tuple[str, ...]:
        """The sheets beside that of the items."""
        return (self.curve, self.bonds, self.liability_bonds, self.liability_spreads, self.inflation)


_NAMES = tuple(SHEETS)
FIRST = BasisSheets(*_NAMES[:6])
"""Sheets of the first basis."""
SECOND = BasisSheets(*_NAMES[6:12])
"""Sheets of the second basis."""


def unused_sheets(items: BasisItems | None, names: BasisSheets) -> Iterator[tuple[str, str]]:
    """Sheets that a basis does not use, each with what would use it; none where that cannot be told."""
    if items is None:
        return
    kind, method = items.kind, items.method
    if kind is not None and kind not in QUOTED_KINDS:
        yield names.curve, "a curve of zero rates, par yields or swap rates uses it"
    if kind is not None and kind is not CurveKind.BONDS:
        yield names.bonds, f"a curve of the kind {CurveKind.BONDS} uses it"
    for sheet, own in (
        (names.liability_bonds, LiabilityMethod.CORPORATE_BONDS),
        (names.liability_spreads, LiabilityMethod.TERM_SPREADS),
    ):
        if method is not None and method is not own:
            yield sheet, f'the liability basis "{own}" uses it'


def report_missing(
    items: BasisItems | None, names: BasisSheets, found: Collection[str], faults: FaultList
) -> None:
    """Report sheets that a basis needs and the source does not have."""
    if items is None:
        return
    for sheet, needed in (
        (names.curve, items.kind in QUOTED_KINDS),
        (names.bonds, items.kind is CurveKind.BONDS),
        (names.liability_bonds, items.method is LiabilityMethod.CORPORATE_BONDS),
        (names.liability_spreads, items.method is LiabilityMethod.TERM_SPREADS),
    ):
        if needed and sheet not in found:
            faults.add(
                f'the sheet "{sheet}" is missing',
                f'a sheet "{sheet}" with the columns {", ".join(SHEETS[sheet].wanted)}',
                "Add the sheet.",
            )


def read_basis(
    items: BasisItems | None,
    names: BasisSheets,
    tables: dict[str, Table],
    faults: FaultList,
    *,
    first: Basis | None = None,
) -> Basis | None:
    """Read the sheets beside the items, and build the basis if they give one.

    Parameters
    ----------
    items : BasisItems or None
        None where the items could not be read.
    names : BasisSheets
    tables : dict of str to Table
    faults : FaultList
    first : Basis, optional
        The first basis, if this is the second: without a sheet of its own its inflation is that of the first.
    """
    before = faults.grave_count
    stated: dict[str, Any] = {} if items is None else items.fields
    found: dict[str, Any] = {}
    if names.curve in tables:
        found["terms"], found["rates"] = read_by_term(tables[names.curve], faults)
    for sheet, field, fit, used in (
        (names.bonds, "bonds", "bond_fit", stated.get("curve_kind") is CurveKind.BONDS),
        (
            names.liability_bonds,
            "liability_bonds",
            "liability_fit",
            stated.get("liability_method") is LiabilityMethod.CORPORATE_BONDS,
        ),
    ):
        if sheet in tables:
            found[field] = read_bonds(
                tables[sheet],
                faults,
                valuation_date=stated.get("valuation_date"),
                distinct=used and stated.get(fit) is BondFit.EXACT,
            )
    if names.liability_spreads in tables:
        found["liability_terms"], found["liability_spreads"] = read_by_term(
            tables[names.liability_spreads], faults, value="Spread", from_zero=True
        )
    found["inflation"] = _inflation(items, names, tables, faults, first=first)
    if items is None or faults.grave_count > before or not items.sound or not _complete(items, found):
        # What is wrong is reported already; what follows from it is not said twice.
        return None
    empty = np.zeros(0)
    basis = Basis(**{"terms": empty, "rates": empty, **stated, **found})
    sound = _gives_curve(basis, items, names, tables, faults)
    return basis if sound and _gives_liability_curve(basis, items, names, tables, faults) else None


def _complete(items: BasisItems, found: dict[str, Any]) -> bool:
    """Whether the sheets that the basis uses are there and sound."""
    needed = ["terms"] if items.kind in QUOTED_KINDS else []
    needed += ["bonds"] if items.kind is CurveKind.BONDS else []
    if items.method is LiabilityMethod.CORPORATE_BONDS:
        needed.append("liability_bonds")
    if items.method is LiabilityMethod.TERM_SPREADS:
        needed.append("liability_terms")
    if any(found.get(name) is None for name in needed):
        return False
    return all(
        bool(np.isfinite(values).all() and values.size)
        for name, values in found.items()
        if isinstance(values, np.ndarray)
    )


def _inflation(
    items: BasisItems | None,
    names: BasisSheets,
    tables: dict[str, Table],
    faults: FaultList,
    *,
    first: Basis | None,
) -> Inflation | None:
    """Expected inflation; that of the first basis where there is no sheet, None where there is none."""
    table = tables.get(names.inflation)
    if table is None:
        if items is not None:
            items.tell_unused_inflation(f'the sheet "{names.inflation}" uses it')
        return None if first is None else first.inflation
    if not table.rows.size:
        faults.mild(
            "the sheet holds no rates: there is no expected inflation on this basis",
            "one row a term",
            "Add terms and rates, or remove the sheet.",
            sheet=table.sheet.name,
        )
        if items is not None:
            items.tell_unused_inflation(f'rates in the sheet "{names.inflation}" use it')
        return None
    before = faults.grave_count
    terms, rates = read_by_term(table, faults)
    if faults.grave_count > before or not (np.isfinite(terms).all() and np.isfinite(rates).all()):
        return None
    inflation = Inflation(terms, rates, **({} if items is None else items.inflation))
    try:
        inflation.curve.discount(terms)
    except ValueError as error:
        _tell(error, faults, "rates", table, ["Rate"])
        return None
    return inflation


def _gives_curve(
    basis: Basis, items: BasisItems, names: BasisSheets, tables: dict[str, Table], faults: FaultList
) -> bool:
    """Whether the basis has a curve; if not, why is reported where it can be mended."""
    kind = basis.curve_kind
    try:
        basis.curve.discount(basis.terms if basis.terms.size else _TRIED)
    except ValueError as error:
        if isinstance(error, CurveError) and error.subject == CONVERGENCE:
            stated = [item for item in _CONVERGENCE_ITEMS if items.sheet.states(item)]
            items.sheet.fault(
                stated[0], error.found, "a curve that comes to its ultimate forward rate", error.mend
            )
        elif kind in QUOTED_KINDS:
            _tell(error, faults, "quotes", tables[names.curve], ["Rate"])
        elif kind is CurveKind.BONDS:
            _tell(error, faults, "bonds", tables[names.bonds], ["Price", "Yield"])
        else:
            item = "Flat rate" if kind is CurveKind.FLAT else "Beta 0"
            items.sheet.fault(
                item, f"the {_plain_end(error)}", "a curve that discounts", "Correct the figures."
            )
        return False
    return True


def _gives_liability_curve(
    basis: Basis, items: BasisItems, names: BasisSheets, tables: dict[str, Table], faults: FaultList
) -> bool:
    """Whether liabilities can be discounted; if not, why is reported where it can be mended."""
    method = basis.liability_method
    if method is LiabilityMethod.CURVE:
        return True
    try:
        if method is LiabilityMethod.TERM_SPREADS:
            basis.liability_spread_at(_TRIED)
        else:
            basis.liability_curve.discount(_TRIED)
    except ValueError as error:
        if method is LiabilityMethod.CORPORATE_BONDS:
            _tell(error, faults, "bonds", tables[names.liability_bonds], ["Price", "Yield"])
        elif method is LiabilityMethod.TERM_SPREADS:
            _tell(error, faults, "spreads", tables[names.liability_spreads], ["Spread"])
        else:
            mend = "Correct the figure."
            items.sheet.fault("Expected return", plain(error), "a rate that discounts", mend)
        return False
    return True


def _plain_end(error: ValueError) -> str:
    return f"formula gives no curve: {error.found if isinstance(error, CurveError) else plain(error)}"


def _tell(error: ValueError, faults: FaultList, what: str, table: Table, headings: list[str]) -> None:
    """Report quotes that give no curve, each at its row in the first of some columns that is filled there."""
    expected = f"{what} from which a curve can be drawn"
    if not isinstance(error, CurveError):
        faults.add(
            f"the {what} give no curve: {plain(error)}",
            expected,
            f"Correct the {what}, or choose another interpolation.",
            sheet=table.sheet.name,
        )
        return
    found = error.found.removeprefix("liability bonds: ")
    for number in error.rows or (-1,):
        row = int(table.rows[number]) if number >= 0 else -1
        faults.add(
            f"the {what} give no curve: {found}",
            expected,
            error.mend,
            sheet=table.sheet.name,
            row=row,
            column=_filled_column(table, number, headings, faults),
        )


def _filled_column(table: Table, number: int, headings: list[str], faults: FaultList) -> int:
    known = [heading for heading in headings if heading in table.fields]
    for heading in known:
        cells = Cells(table.sheet, table.column(heading), table.rows, faults)
        if number >= 0 and cells.filled[number]:
            return table.fields[heading]
    return table.fields[known[0]] if known else -1
