"""The sheets of a basis."""

from __future__ import annotations

from dataclasses import fields

import numpy as np

from desk.book import Basis, CurveBonds, Inflation, Notes
from desk.intake.basis import BasisSheets
from desk.intake.basis_items import QUOTED_KINDS
from desk.intake.sheets import SHEETS
from desk.report.book_sheets import items_sheet, table_sheet, unless_zero
from desk.report.plain_workbook import PlainSheet, Value, date_serials

__all__ = ["basis_sheets"]

_PARAMETERS = ("Beta 0", "Beta 1", "Beta 2", "Tau 1 (years)", "Beta 3", "Tau 2 (years)")
"""In the order of the fields of `CurveParameters`."""


def basis_sheets(
    basis: Basis, names: BasisSheets, notes: dict[str, Notes], *, first: Basis | None = None
) -> dict[str, PlainSheet]:
    """The sheets of a basis that hold something, by name.

    Parameters
    ----------
    basis : Basis
    names : BasisSheets
    notes : dict of str to Notes
        By sheet.
    first : Basis, optional
        The first basis, if this is the second: what it has in common with it is left out.

    Raises
    ------
    ValueError
        If the second basis is not of the date, currency and day count of the first.
    """
    sheets = {names.items: items_sheet(names.items, _items(basis, first), notes.get(names.items))}
    tables: dict[str, list[tuple[Value, ...]]] = {
        names.curve: _by_term(basis.terms, basis.rates),
        names.bonds: _bonds(basis.bonds),
        names.liability_bonds: _bonds(basis.liability_bonds),
        names.liability_spreads: _by_term(basis.liability_terms, basis.liability_spreads),
        names.inflation: [],
    }
    kept = set(notes)
    if basis.curve_kind in QUOTED_KINDS:
        kept.add(names.curve)
    inherited = None if first is None else first.inflation
    if basis.inflation is None:
        # A sheet without rows says that there is none; without the sheet it would be that of the first basis.
        kept |= {names.inflation} if inherited is not None else set()
    elif basis.inflation != inherited:
        tables[names.inflation] = _by_term(basis.inflation.terms, basis.inflation.rates)
    for sheet, rows in tables.items():
        if rows or sheet in kept:
            sheets[sheet] = table_sheet(sheet, rows, notes.get(sheet))
    return sheets


def _items(basis: Basis, first: Basis | None) -> dict[str, Value]:
    found: dict[str, Value] = {
        "Title": basis.title or None,
        **_dated(basis, first),
        "Curve kind": str(basis.curve_kind),
        "Compounding": str(basis.compounding),
        "Interpolation": str(basis.interpolation),
        "Liability spread": basis.liability_spread,
        "Market risk premium": basis.market_risk_premium,
        **_curve_items(basis),
        **_formula_items(basis),
        "Flat rate": basis.flat_rate,
        "Liability basis": _unless_usual(basis, "liability_method"),
        "Liability bond fit": _unless_usual(basis, "liability_fit"),
        "Expected return": basis.expected_return,
        **_inflation_items(basis, first),
    }
    return {item: found[item] for item in SHEETS["Basis"].items}


def _dated(basis: Basis, first: Basis | None) -> dict[str, Value]:
    if first is None:
        return {
            "Valuation date": basis.valuation_date,
            "Currency": basis.currency,
            "Day count": str(basis.day_count),
        }
    for name in ("valuation_date", "currency", "day_count"):
        if getattr(basis, name) != getattr(first, name):
            raise ValueError(f"the second basis must have the {name.replace('_', ' ')} of the first")
    return dict.fromkeys(("Valuation date", "Currency", "Day count"))


def _unless_usual(basis: Basis, name: str) -> str | None:
    """A choice, where it is not the one of a basis that says nothing of it."""
    value = getattr(basis, name)
    return None if value is getattr(Basis, name) else str(value)


def _curve_items(basis: Basis) -> dict[str, Value]:
    """How the curve is built and goes on, where that is not as for a basis that says nothing of it."""
    tolerance = basis.convergence_tolerance
    return {
        "Payments a year": basis.payments_per_year,
        "Beyond the last quote": _unless_usual(basis, "extrapolation"),
        "Ultimate forward rate": basis.ultimate_forward_rate,
        "Last liquid point": basis.last_liquid_point,
        "Convergence point": basis.convergence_point,
        "Convergence tolerance": None if tolerance == Basis.convergence_tolerance else tolerance,
        "Bond fit": _unless_usual(basis, "bond_fit"),
    }


def _formula_items(basis: Basis) -> dict[str, Value]:
    parameters = basis.parameters
    if parameters is None:
        return dict.fromkeys(_PARAMETERS)
    stated = [getattr(parameters, field.name) for field in fields(parameters)]
    return dict(zip(_PARAMETERS, stated, strict=True))


def _inflation_items(basis: Basis, first: Basis | None) -> dict[str, Value]:
    inflation = basis.inflation
    if inflation is None or (first is not None and inflation == first.inflation):
        return dict.fromkeys(("Inflation volatility", "Recent inflation", "Inflation interpolation"))
    drawn = inflation.interpolation
    return {
        "Inflation volatility": unless_zero(inflation.volatility),
        "Recent inflation": inflation.recent,
        "Inflation interpolation": None if drawn is Inflation.interpolation else str(drawn),
    }


def _by_term(terms: np.ndarray, rates: np.ndarray) -> list[tuple[Value, ...]]:
    return list(zip(terms.tolist(), rates.tolist(), strict=True))


def _bonds(bonds: CurveBonds | None) -> list[tuple[Value, ...]]:
    if bonds is None:
        return []
    columns = (
        [name or None for name in bonds.names],
        date_serials(bonds.maturity),
        bonds.coupon.tolist(),
        bonds.frequency.tolist(),
        _or_none(bonds.price),
        [None if clean else "dirty" for clean in bonds.is_clean.tolist()],
        _or_none(bonds.bond_yield),
    )
    return list(zip(*columns, strict=True))


def _or_none(values: np.ndarray) -> list[float | None]:
    return [None if value != value else value for value in values.tolist()]
