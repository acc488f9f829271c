"""Why a basis gives no curve, in one line that names the quote or the bond and what would mend it."""

from __future__ import annotations

import numpy as np

from desk.book import Basis, BondFit, CurveBonds, CurveKind, LiabilityMethod
from desk.rates.bootstrap import MENDS
from desk.rates.curve_error import CurveError
from desk.window.curve.edits import LEAST_RATE, MOST_RATE, quotes_fault
from desk.window.curve.targets import Part, bonds_of
from desk.window.parts import numbers

__all__ = ["NO_BONDS", "QUOTED_KINDS", "fault_of", "least_bonds"]

QUOTED_KINDS = (CurveKind.ZERO, CurveKind.PAR, CurveKind.SWAP)
"""Kinds of curve with one rate a term."""
NO_BONDS = "There are no bonds yet: paste them, or add them one by one."
_MOST_NAMED = 3
_MOST_PRICE = 1e6
"""Per 100 of nominal, as in a workbook."""


def least_bonds(fit: BondFit) -> int:
    """So many bonds a fit needs."""
    return {BondFit.EXACT: 1, BondFit.NELSON_SIEGEL: 4, BondFit.SVENSSON: 6}[fit]


def fault_of(basis: Basis, part: Part) -> str:
    """Why a basis gives no such curve, and what would mend it; empty where it does."""
    if part is Part.INFLATION:
        inflation = basis.inflation
        if inflation is None:
            return ""
        return quotes_fault(inflation.terms, inflation.rates) or _tried(basis, part)
    if part is Part.CURVE:
        return _source_fault(basis) or _tried(basis, part)
    method = basis.liability_method
    if method is LiabilityMethod.CORPORATE_BONDS:
        return _bonds_fault(basis.liability_bonds, basis.liability_fit) or _tried(basis, part)
    if method is LiabilityMethod.TERM_SPREADS:
        return quotes_fault(basis.liability_terms, basis.liability_spreads, what="spread", from_zero=True)
    if method is LiabilityMethod.EXPECTED_RETURN and basis.expected_return is None:
        return "There is no expected return: give it as a yearly rate."
    return _tried(basis, part)


def _source_fault(basis: Basis) -> str:
    kind = basis.curve_kind
    if kind in QUOTED_KINDS:
        return quotes_fault(basis.terms, basis.rates)
    if kind is CurveKind.BONDS:
        return _bonds_fault(basis.bonds, basis.bond_fit)
    if kind is CurveKind.FLAT:
        return "" if basis.flat_rate is not None else "There is no flat rate: give it."
    return "" if basis.parameters is not None else "There are no parameters: give them."


def _bonds_fault(bonds: CurveBonds | None, fit: BondFit) -> str:
    if bonds is None or not len(bonds):
        return NO_BONDS
    least = least_bonds(fit)
    if len(bonds) < least:
        count = f"There {'is one bond' if len(bonds) == 1 else f'are {len(bonds)} bonds'}"
        return f"{count}, and this fit needs {least}: add more, or choose a fit of fewer parameters."
    with np.errstate(invalid="ignore"):  # where one of price and yield is given the other is none
        for wrong, what in (
            (bonds.coupon > MOST_RATE, f"a coupon is at most {_shown(MOST_RATE)} a year"),
            (bonds.bond_yield > MOST_RATE, f"a yield is at most {_shown(MOST_RATE)} a year"),
            (bonds.bond_yield < LEAST_RATE, f"a yield is at least {_shown(LEAST_RATE)} a year"),
            (bonds.price > _MOST_PRICE, "a price is at most 1,000,000 per 100 of nominal"),
        ):
            for row in np.flatnonzero(wrong)[:1].tolist():
                return f"{bonds.names[row] or f'Bond {row + 1}'}: {what}."
    return ""


def _shown(rate: float) -> str:
    return numbers.rate(rate, 0, with_unit=True)


def _tried(basis: Basis, part: Part) -> str:
    """What the curve itself says."""
    try:
        if part is Part.INFLATION:
            _ = basis.inflation.curve if basis.inflation is not None else None
        elif part is Part.CURVE:
            _ = basis.curve
        else:
            _ = basis.liability_curve
    except CurveError as error:
        mend = error.mend
        if mend in MENDS and bonds_of(basis, part) is not None:
            mend += " Or choose a smooth fit through the bonds."
        return f"{_places(basis, part, error.rows)}{_ended(error.found)} {mend}".strip()
    except (ValueError, ArithmeticError) as error:
        return _ended(str(error))
    return ""


def _places(basis: Basis, part: Part, rows: tuple[int, ...]) -> str:
    """The quotes or bonds at fault, before what is wrong with them."""
    if not rows:
        return ""
    names: list[str] = []
    bonds = basis.bonds if part is Part.CURVE else basis.liability_bonds
    by_bonds = part is Part.LIABILITIES or basis.curve_kind is CurveKind.BONDS
    for row in rows[:_MOST_NAMED]:
        if by_bonds and bonds is not None and row < len(bonds):
            name = bonds.names[row] or f"Bond {row + 1}"
            day = bonds.maturity[row]
            names.append(name if np.isnat(day) else f"{name}, due {numbers.day(day)}")
        elif not by_bonds and row < basis.terms.size:
            names.append(f"Quote at {numbers.exact(float(basis.terms[row]))} years")
    more = len(rows) - len(names)
    tail = f" and {more} more" if more > 0 else ""
    return f"{'; '.join(names)}{tail}: " if names else ""


def _ended(text: str) -> str:
    text = text.strip().rstrip(".")
    return f"{text[:1].upper()}{text[1:]}." if text else ""
