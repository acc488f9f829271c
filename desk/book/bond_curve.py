"""Curves drawn through sheets of bonds."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from desk.book.curve_source import BondFit, CurveBonds
from desk.rates.bootstrap import bootstrap
from desk.rates.curve import Curve, DiscountCurve, Interpolation
from desk.rates.curve_error import CurveError
from desk.rates.day_count import DayCount
from desk.rates.fitting import CurveFit, fit_nelson_siegel, fit_svensson, measured_fit
from desk.rates.quoted_flows import QuotedFlows
from desk.rates.quotes import bond_flows

__all__ = ["bond_curve", "bond_quotes", "exact_fit"]

_DAY = 1.0 / 3660.0
"""Years: bonds whose last payments are closer than a tenth of a day mature together."""
_ROUNDING = 1e-9

_Found = TypeVar("_Found")


def bond_quotes(bonds: CurveBonds | None, *, valuation_date: date, day_count: DayCount) -> QuotedFlows:
    """What bonds pay and what they are worth, per 100 of nominal, in the order of the sheet.

    Accrued interest of clean prices is Act/Act ICMA.

    Parameters
    ----------
    bonds : CurveBonds or None
    valuation_date : datetime.date
    day_count : DayCount
        Turns dates into years.

    Raises
    ------
    CurveError
        If there is no bond, or one has matured, has neither or both of price and yield, or a number that no
        bond can have; `rows` names the bonds.
    """
    if bonds is None or not len(bonds):
        raise CurveError("there is no bond", "Give at least one.")
    _refuse(~np.isfinite(bonds.coupon), "the coupon is not a number", "Give 0 for a bond without coupons.")
    _refuse(bonds.coupon < 0.0, "the coupon is below 0", "Correct it; a bond without coupons has 0.")
    return bond_flows(
        bonds.maturity,
        bonds.coupon,
        frequency=bonds.frequency,
        prices=bonds.price,
        yields=bonds.bond_yield,
        is_clean=bonds.is_clean,
        valuation_date=valuation_date,
        time_count=day_count,
    )


def bond_curve(
    bonds: CurveBonds,
    flows: QuotedFlows,
    *,
    fit: BondFit,
    interpolation: Interpolation,
    last_liquid_point: float | None = None,
) -> CurveFit:
    """The curve through bonds, and how far each bond is from it.

    Parameters
    ----------
    bonds : CurveBonds
        In any order.
    flows : QuotedFlows
        What they pay, see `bond_quotes`.
    fit : BondFit
    interpolation : Interpolation
        Of an exact fit.
    last_liquid_point : float, optional
        Bonds that mature later are left out [years]; by default none is. Beyond the bonds the curve goes on
        with its last forward rate, a fitted one by its formula.

    Raises
    ------
    CurveError
        If the bonds give no curve; `rows` names them.
    """
    if fit is BondFit.EXACT:
        return exact_fit(
            bonds,
            flows,
            lambda rising: bootstrap(rising, interpolation=interpolation),
            last_liquid_point=last_liquid_point,
        )
    used = _liquid(flows, last_liquid_point)
    rows = np.flatnonzero(used)
    search = fit_svensson if fit is BondFit.SVENSSON else fit_nelson_siegel
    found = _with_rows(rows, lambda: search(flows.taken(rows)))
    if used.all():
        return found
    return measured_fit(
        found.curve, flows, is_used=used, converged=found.converged, evaluations=found.evaluations
    )


def exact_fit(
    bonds: CurveBonds,
    flows: QuotedFlows,
    draw: Callable[[QuotedFlows], Curve],
    *,
    last_liquid_point: float | None = None,
) -> CurveFit:
    """A curve that reprices every bond, whatever the order of the sheet.

    Parameters
    ----------
    bonds : CurveBonds
    flows : QuotedFlows
        What they pay, see `bond_quotes`.
    draw : callable
        The curve through instruments whose terms rise.
    last_liquid_point : float, optional
        Bonds that mature later are left out [years].

    Raises
    ------
    CurveError
        If two bonds mature together or no curve reprices them; `rows` names them.
    """
    used = _liquid(flows, last_liquid_point)
    order = np.flatnonzero(used)
    order = order[np.argsort(flows.term[order], kind="stable")]
    close = np.diff(flows.term[order]) < _DAY
    if close.any():
        together = np.append(close, False) | np.append(False, close)
        first = int(np.flatnonzero(close)[0])
        day = bonds.maturity[order[first]]
        raise CurveError(
            f"bonds mature on the same day, {day} ({_names(bonds, order[first], order[first + 1])})",
            "Keep one of each such group, or fit a smooth curve through all.",
            rows=np.sort(order[together]).tolist(),
        )
    curve: DiscountCurve = _with_rows(order, lambda: draw(flows.taken(order)))
    return measured_fit(curve, flows, is_used=used)


def _liquid(flows: QuotedFlows, last_liquid_point: float | None) -> NDArray[np.bool_]:
    """Which instruments end at or before the last liquid point."""
    if last_liquid_point is None:
        return np.ones(len(flows), dtype=np.bool_)
    used = flows.term <= last_liquid_point + _ROUNDING
    if not used.any():
        raise CurveError(
            f"no bond matures at or before the last liquid point, {last_liquid_point:g} years",
            "Set it later.",
        )
    return np.asarray(used)


def _with_rows(rows: NDArray[np.intp], work: Callable[[], _Found]) -> _Found:
    """What `work` gives; its errors number the rows of the sheet."""
    try:
        return work()
    except CurveError as error:
        raise CurveError(error.found, error.mend, rows=rows[list(error.rows)].tolist()) from error


def _names(bonds: CurveBonds, first: np.intp, second: np.intp) -> str:
    return " and ".join(bonds.names[row] or f"bond {row + 1}" for row in sorted((int(first), int(second))))


def _refuse(wrong: NDArray[np.bool_], found: str, mend: str) -> None:
    if np.any(wrong):
        raise CurveError(found, mend, rows=np.flatnonzero(wrong).tolist())
