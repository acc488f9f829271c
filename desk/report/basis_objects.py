"""Bases and expected inflation as plain objects for JSON: the curve, what liabilities are discounted on."""

from __future__ import annotations

from typing import Any

import numpy as np

from desk.book import Basis, Book, Indexation, IndexationKind, LineTerms, Side
from desk.book.curve_source import CurveBonds
from desk.rates.fitting import CurveFit
from desk.report.plain_numbers import plain_number, plain_rows
from desk.valuation.linked import is_linked
from desk.valuation.records import InflationStanding, Standing

__all__ = [
    "curve_object",
    "indexation_object",
    "inflation_object",
    "liability_basis_object",
    "line_objects",
]


def curve_object(basis: Basis) -> dict[str, Any]:
    """The curve of a basis.

    Parameters
    ----------
    basis : Basis

    Returns
    -------
    dict
        ``kind``, ``last_quoted_term`` [years], None for a curve that is stated for every term, and ``fit``:
        None unless the curve is one of bonds.
    """
    return {
        "kind": basis.curve_kind.value,
        "last_quoted_term": plain_number(basis.last_quoted_term),
        "fit": _fit(basis.curve_fit, basis.bonds),
    }


def liability_basis_object(basis: Basis, standing: Standing) -> dict[str, Any]:
    """What liabilities are discounted on.

    Parameters
    ----------
    basis : Basis
    standing : Standing
        On that basis.

    Returns
    -------
    dict
        ``method``; ``single_equivalent_rate``, annual effective, at which the liabilities are worth the same;
        ``spread``, continuous; ``spreads`` by term, ``expected_return`` and ``fit``, None where the method
        has none.
    """
    has_spreads = basis.liability_terms.size > 0
    return {
        "method": basis.liability_method.value,
        "single_equivalent_rate": plain_number(standing.liabilities.equivalent_rate),
        "spread": plain_number(basis.liability_spread),
        "spreads": plain_rows(term=basis.liability_terms, spread=basis.liability_spreads)
        if has_spreads
        else None,
        "expected_return": plain_number(basis.expected_return),
        "fit": _fit(basis.liability_curve_fit, basis.liability_bonds),
    }


def _fit(fit: CurveFit | None, bonds: CurveBonds | None) -> dict[str, Any] | None:
    """How far bonds are from their curve [basis points]."""
    if fit is None or bonds is None:
        return None
    return {
        "rmse_bp": plain_number(fit.rmse_bp),
        "largest_bp": plain_number(fit.largest_bp),
        "bonds": [
            {"name": name, "residual_bp": plain_number(residual), "used": bool(used)}
            for name, residual, used in zip(
                bonds.names, fit.residual_bp.tolist(), fit.is_used.tolist(), strict=True
            )
        ],
    }


def inflation_object(inflation: InflationStanding | None) -> dict[str, Any] | None:
    """How both sides follow expected inflation; None where the basis states none."""
    if inflation is None:
        return None
    periods = inflation.real_periods
    names = (
        "assets_duration",
        "liabilities_duration",
        "real_duration_gap",
        "dv01_assets",
        "dv01_liabilities",
        "dv01_gap",
    )
    return {
        **{name: plain_number(getattr(inflation, name)) for name in names},
        "key_rates": plain_rows(
            term=inflation.term,
            assets=inflation.key_assets,
            liabilities=inflation.key_liabilities,
            dv01_assets=inflation.key_dv01_assets,
            dv01_liabilities=inflation.key_dv01_liabilities,
        ),
        "real_periods": plain_rows(
            year=periods.year,
            assets=periods.assets,
            liabilities=periods.liabilities,
            net=periods.net,
            cumulative=periods.cumulative,
        ),
    }


def line_objects(book: Book | None, standing: Standing) -> list[dict[str, Any]]:
    """What is said of each line beyond its measures, in the order of the standing.

    Parameters
    ----------
    book : Book or None
        Without it nothing is known of how lines grow and are discounted.
    standing : Standing

    Returns
    -------
    list of dict
        ``inflation_dv01`` [currency]; ``indexation``, None for fixed amounts; ``discounting``, None where the
        basis says how the line is discounted, else its own ``spread`` over the curve or flat ``rate``.
    """
    terms: dict[tuple[Side, str], LineTerms] = {}
    if book is not None:
        for own in book.line_terms:
            terms.setdefault((own.side, own.line), own)
    holdings = () if book is None else book.holdings
    found = []
    for number, line in enumerate(standing.lines):
        indexation = discounting = None
        if line.side is Side.ASSETS and number < len(holdings):
            holding = holdings[number]
            if is_linked(holding):
                indexation = indexation_object(
                    Indexation(IndexationKind.LINKED, lag=holding.index_lag_months / 12.0)
                )
        elif (line.side, line.line) in terms:
            of_line = terms[line.side, line.line]
            indexation = indexation_object(of_line.indexation)
            if of_line.spread is not None or of_line.rate is not None:
                discounting = {"spread": plain_number(of_line.spread), "rate": plain_number(of_line.rate)}
        found.append(
            {
                "inflation_dv01": plain_number(line.inflation_dv01),
                "indexation": indexation,
                "discounting": discounting,
            }
        )
    return found


def indexation_object(indexation: Indexation) -> dict[str, Any] | None:
    """How amounts grow; None where they do not."""
    if indexation.kind is IndexationKind.FIXED:
        return None
    rise = indexation.rise if indexation.kind is IndexationKind.RISING else np.nan
    return {
        "kind": indexation.kind.value,
        "rise": plain_number(rise),
        "floor": plain_number(indexation.floor),
        "cap": plain_number(indexation.cap),
        "lag": plain_number(indexation.lag),
    }
