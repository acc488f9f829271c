"""The items of a basis."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import partial
from typing import Any

import numpy as np
from numpy.typing import NDArray

from desk.book import BondFit, CurveKind, CurveParameters, LiabilityMethod
from desk.intake.cells import Cells
from desk.intake.checks import check_not_negative, check_rates
from desk.intake.item_sheet import ItemSheet
from desk.rates.compounding import Compounding
from desk.rates.curve import Interpolation
from desk.rates.day_count import TIME_COUNTS, DayCount
from desk.rates.smith_wilson import Extrapolation

__all__ = ["QUOTED_KINDS", "BasisItems", "read_basis_items"]

QUOTED_KINDS = (CurveKind.ZERO, CurveKind.PAR, CurveKind.SWAP)
"""Kinds whose quotes are one rate a term."""
_FORMULAS = (CurveKind.NELSON_SIEGEL, CurveKind.SVENSSON)
_PAYMENTS = (1.0, 2.0, 4.0, 12.0)
_PARAMETERS = {
    "Beta 0": "beta_0",
    "Beta 1": "beta_1",
    "Beta 2": "beta_2",
    "Tau 1 (years)": "tau_1",
    "Beta 3": "beta_3",
    "Tau 2 (years)": "tau_2",
}
"""Items of a formula by the field of `CurveParameters`; the last two are for Svensson alone."""
_SECOND_HUMP = ("Beta 3", "Tau 2 (years)")
_BEYOND = ("Beyond the last quote", "Last liquid point")
_CONVERGENCE = ("Ultimate forward rate", "Convergence point", "Convergence tolerance")
_INFLATION = ("Inflation volatility", "Recent inflation", "Inflation interpolation")


@dataclass
class BasisItems:
    """What the items of a basis give.

    Attributes
    ----------
    sheet : ItemSheet
    fields : dict of str to object
        By the name of the field of `Basis`; None stands for what is wrong, and what has a usual value and is
        not stated is not there.
    inflation : dict of str to object
        Likewise by the field of `Inflation`.
    """

    sheet: ItemSheet
    fields: dict[str, Any] = field(default_factory=dict)
    inflation: dict[str, Any] = field(default_factory=dict)

    @property
    def kind(self) -> CurveKind | None:
        """Kind of the curve; None where it is not known."""
        found: CurveKind | None = self.fields.get("curve_kind")
        return found

    @property
    def method(self) -> LiabilityMethod | None:
        """What liabilities are discounted on; None where it is not known."""
        found: LiabilityMethod | None = self.fields.get("liability_method", LiabilityMethod.CURVE)
        return found

    @property
    def sound(self) -> bool:
        """Whether every item is as it should be."""
        return all(value is not None for value in self.fields.values())

    def tell_unused_inflation(self, why: str) -> None:
        """Report items of expected inflation where there is none."""
        for item in _INFLATION:
            if item in self.sheet.rows:
                _tell_unused(self.sheet, item, why)


def read_basis_items(sheet: ItemSheet, *, first: BasisItems | None = None) -> BasisItems:
    """The items of a basis.

    Parameters
    ----------
    sheet : ItemSheet
    first : BasisItems, optional
        Of the first basis, if this is the second: date, currency and day count are then those of the first.
    """
    kind = sheet.choice("Curve kind", CurveKind, "a curve kind", required=True)
    fit = sheet.choice("Bond fit", BondFit, "a bond fit")
    liability_fit = sheet.choice("Liability bond fit", BondFit, "a bond fit")
    method = sheet.choice("Liability basis", LiabilityMethod, "a liability basis")
    premium = sheet.number("Market risk premium", "a rate a year", check_rates)
    by_bonds = kind is CurveKind.BONDS
    joined = kind in QUOTED_KINDS or BondFit.EXACT in (
        fit if by_bonds else None,
        liability_fit if method is LiabilityMethod.CORPORATE_BONDS else None,
    )
    fields: dict[str, Any] = {
        "title": sheet.text("Title", "a title"),
        **(_dated(sheet) if first is None else _dated_like(sheet, first)),
        "curve_kind": kind,
        **_choice_or_usual(
            sheet, "Compounding", Compounding, "a compounding", required=kind is not None and not by_bonds
        ),
        **_choice_or_usual(sheet, "Interpolation", Interpolation, "an interpolation", required=joined),
        "liability_spread": sheet.number("Liability spread", "a rate a year", check_rates, required=True),
        "market_risk_premium": 0.0 if premium is None else premium,
        **_curve_items(sheet, kind),
        **_formula_items(sheet, kind),
    }
    rate = partial(sheet.number, "Flat rate", "a rate a year", check_rates)
    expected = partial(sheet.number, "Expected return", "a rate a year", check_rates)
    flat, by_return = kind is CurveKind.FLAT, method is LiabilityMethod.EXPECTED_RETURN
    fields |= _stated(flat_rate=rate(required=flat), bond_fit=fit, liability_fit=liability_fit)
    fields |= _stated(expected_return=expected(required=by_return), liability_method=method)
    for needed, own in ((flat, "flat_rate"), (by_return, "expected_return")):
        if needed:
            fields.setdefault(own, None)
    if sheet.states("Liability basis") and method is None:
        fields["liability_method"] = None
    if kind is not None:
        _tell_unless(by_bonds, sheet, "Bond fit", "a curve of bonds uses it")
        _tell_unless(flat, sheet, "Flat rate", "a flat curve uses it")
    if method is not None or not sheet.states("Liability basis"):
        by_corporates = method is LiabilityMethod.CORPORATE_BONDS
        _tell_unless(by_corporates, sheet, "Liability bond fit", "the basis of corporate bonds uses it")
        _tell_unless(by_return, sheet, "Expected return", "the basis of the expected return uses it")
    return BasisItems(sheet, fields, _inflation_items(sheet))


def _stated(**values: Any) -> dict[str, Any]:
    return {name: value for name, value in values.items() if value is not None}


def _choice_or_usual(
    sheet: ItemSheet, item: str, choices: Any, expected: str, *, required: bool
) -> dict[str, Any]:
    """A choice; nothing where it is not needed and not stated."""
    value = sheet.choice(item, choices, expected, required=required)
    return {item.lower(): value} if required or value is not None else {}


def _dated(sheet: ItemSheet) -> dict[str, Any]:
    """Date, currency and day count of the first basis."""
    return {
        "valuation_date": sheet.date("Valuation date", "the valuation date"),
        "currency": _currency(sheet, required=True),
        "day_count": _time_count(sheet) or DayCount.ACT_365F,
    }


def _dated_like(sheet: ItemSheet, first: BasisItems) -> dict[str, Any]:
    """Date, currency and day count of the second basis, which are those of the first."""
    stated = {
        "Valuation date": sheet.date("Valuation date", "the valuation date", required=False),
        "Currency": _currency(sheet, required=False) or None,
        "Day count": _time_count(sheet),
    }
    found: dict[str, Any] = {}
    for item, value in stated.items():
        name = item.lower().replace(" ", "_")
        own = first.fields.get(name)
        found[name] = own
        if value is not None and own is not None and value != own:
            sheet.fault(
                item,
                f"the {item.lower()} {value} is not that of the first basis, {own}",
                f"the {item.lower()} of the first basis, or no value",
                "Remove the row: both bases value one book on one day.",
            )
    return found


def _currency(sheet: ItemSheet, *, required: bool) -> str:
    currency = sheet.text("Currency", "a currency's three letters", required=required)
    code = currency.strip().upper()
    if currency and not (len(code) == 3 and code.isascii() and code.isalpha()):
        sheet.fault(
            "Currency",
            f'"{currency[:40]}" is no currency',
            "the three letters of ISO 4217",
            "Write for example EUR.",
        )
    elif currency != code:
        sheet.fault(
            "Currency",
            f'"{currency}" is taken as {code}',
            "three capital letters",
            f"Write {code}.",
            mild=True,
        )
    return code


def _time_count(sheet: ItemSheet) -> DayCount | None:
    """The day count of the basis, which needs the two dates only; None where it is not stated or wrong."""
    count = sheet.choice("Day count", DayCount, "a day count")
    if count is None or count in TIME_COUNTS:
        return count
    sheet.fault(
        "Day count",
        f"the day count {count} needs the periods of a bond",
        f"one of {', '.join(TIME_COUNTS)}",
        "Write one of these words.",
    )
    return None


def _years(sheet: ItemSheet, item: str, *, required: bool = False) -> float | None:
    above_zero = partial(check_not_negative, zero_allowed=False)
    value = sheet.number(item, "years above 0", above_zero, required=required)
    return value if value is not None and value > 0.0 else None


def _curve_items(sheet: ItemSheet, kind: CurveKind | None) -> dict[str, Any]:
    """What is stated of how the curve is built and how it goes on, by the name of the field of `Basis`."""
    payments = sheet.number("Payments a year", "1, 2, 4 or 12", _check_payments)
    found = {
        "payments_per_year": int(payments) if payments in _PAYMENTS else None,
        "extrapolation": sheet.choice("Beyond the last quote", Extrapolation, "a way to go on"),
        "ultimate_forward_rate": sheet.number("Ultimate forward rate", "a rate a year", check_rates),
        "last_liquid_point": _years(sheet, "Last liquid point"),
        "convergence_point": _years(sheet, "Convergence point"),
        "convergence_tolerance": sheet.number("Convergence tolerance", "a rate a year", check_rates),
    }
    if kind not in (CurveKind.PAR, CurveKind.SWAP, None) and payments is not None:
        _tell_unused(sheet, "Payments a year", "par yields and swap rates use it")
    by_method = found["extrapolation"] is Extrapolation.SMITH_WILSON
    goes_on = kind not in (*_FORMULAS, CurveKind.FLAT)
    if not goes_on:
        for item in _BEYOND if not by_method else _BEYOND[1:]:
            _tell_unless(False, sheet, item, f"a {kind} curve has a rate for every term")
    if by_method and not goes_on:
        sheet.fault(
            "Beyond the last quote",
            f"a {kind} curve has no quotes from which it could go on by {Extrapolation.SMITH_WILSON}",
            str(Extrapolation.FLAT_FORWARD),
            "Remove the row, or give bonds or rates by term.",
        )
        found["extrapolation"] = None
    elif not by_method:
        for item in _CONVERGENCE:
            use = f"a curve that goes on by {Extrapolation.SMITH_WILSON} uses it"
            _tell_unless(False, sheet, item, use)
    elif "Ultimate forward rate" not in sheet.rows:
        sheet.fault(
            "Beyond the last quote",
            "there is no ultimate forward rate for the curve to come to",
            'a row with the item "Ultimate forward rate" and its value',
            "Add the row.",
        )
        found["extrapolation"] = None
    return _stated(**found)


def _formula_items(sheet: ItemSheet, kind: CurveKind | None) -> dict[str, Any]:
    """The parameters of a curve given by a formula; kept, where all are there, if nothing uses them."""
    needed: set[str] = set()
    if kind in _FORMULAS:
        needed = {item for item in _PARAMETERS if kind is CurveKind.SVENSSON or item not in _SECOND_HUMP}
    found: dict[str, float | None] = {}
    for item, name in _PARAMETERS.items():
        must = item in needed
        if item.startswith("Tau"):
            found[name] = _years(sheet, item, required=must)
        else:
            found[name] = sheet.number(item, "a rate a year", check_rates, required=must)
        if kind is not None:
            which = "a Svensson curve" if item in _SECOND_HUMP else "a Nelson-Siegel or Svensson curve"
            _tell_unless(must, sheet, item, f"{which} uses it")
    if any(found[_PARAMETERS[item]] is None for item in needed):
        return {"parameters": None}
    main = ("beta_0", "beta_1", "beta_2", "tau_1")
    if any(found[name] is None for name in main):
        return {}
    return {"parameters": CurveParameters(**found)}  # type: ignore[arg-type] # those four are numbers here


def _inflation_items(sheet: ItemSheet) -> dict[str, Any]:
    """What is stated of expected inflation beside its curve."""
    above = partial(check_rates, least=-np.inf)
    volatility = sheet.number("Inflation volatility", "a volatility a year", check_not_negative, above)
    recent = sheet.number("Recent inflation", "a rate a year", check_rates)
    return _stated(
        volatility=None if volatility is None else max(volatility, 0.0),
        recent=None if recent is None else max(recent, -0.5),
        interpolation=sheet.choice("Inflation interpolation", Interpolation, "an interpolation"),
    )


def _tell_unless(used: bool, sheet: ItemSheet, item: str, use: str) -> None:
    if not used and item in sheet.rows:
        _tell_unused(sheet, item, use)


def _tell_unused(sheet: ItemSheet, item: str, use: str) -> None:
    sheet.fault(item, f"{item} is not used", f"nothing here: {use}", "Remove the row.", mild=True)


def _check_payments(cells: Cells, values: NDArray[np.float64], what: str) -> None:
    known = np.isin(values, _PAYMENTS) | np.isnan(values)
    cells.each(~known, f"{what} are {{}}", "1, 2, 4 or 12", "Correct the figure.")
