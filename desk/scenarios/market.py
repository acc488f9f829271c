"""What is drawn beside the rates of a book: its risky assets and its inflation."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from desk.book import Book, Fault, RatesModel, RiskyAssets, Severity
from desk.book.arrays import FloatArray
from desk.rates.correlation import (
    MendedCorrelation,
    correlation_problem,
    joined_correlation,
    mended_correlation,
)
from desk.rates.gaussian import GaussianRates
from desk.rates.risky import RiskyMarket
from desk.rates.risky_inflation import InflationFactor
from desk.scenarios.drawn_model import DrawnModel
from desk.scenarios.given import GivenRates

__all__ = ["Beside", "beside_rates"]


@dataclass(frozen=True, eq=False)
class Beside:
    """What is drawn beside the rates.

    Attributes
    ----------
    market : RiskyMarket or None
        None where nothing is.
    mended : MendedCorrelation or None
        Of the first rate factor and the risky assets, where their correlations contradicted one another and
        were mended as the book asks.
    faults : tuple of Fault
        What could not be drawn as stated, all mild.
    """

    market: RiskyMarket | None
    mended: MendedCorrelation | None
    faults: tuple[Fault, ...]


def beside_rates(book: Book, model: DrawnModel) -> Beside:
    """The risky assets and the inflation of a book beside its model.

    Raises
    ------
    ValueError
        If a figure is missing or out of range, or the correlations contradict one another and the book does
        not ask for them to be mended. The message names the item as the workbook does.
    """
    faults: list[Fault] = []
    assets = book.risky_assets if book.risky_assets is not None and book.risky_assets.names else None
    inflation = _inflation(book, model, faults)
    if assets is None and inflation is None:
        return Beside(None, None, tuple(faults))
    gaussian = isinstance(model, GaussianRates)
    stated = book.rates_model
    link = 0.0 if stated is None else _link(stated)
    own = model.correlation if isinstance(model, GaussianRates) else np.eye(model.factor_count)
    if inflation is not None and link != 0.0 and not gaussian:
        faults.append(_apart("Inflation rate correlation", "inflation", model, "Rates model"))
        link = 0.0
    whole = own if inflation is None else joined_correlation(own, [[1.0]], [link])
    mended = None
    if assets is not None:
        _check(assets)
        among, links = assets.correlation, assets.rates_correlation
        if not gaussian and links.any():
            faults.append(_apart("Rates", "the risky assets", model, "Risky assets"))
            links = np.zeros(links.size)
        among, links, mended = _consistent(among, links, mend=stated is not None and stated.mend_correlation)
        if mended is not None:
            faults.append(_mended_fault(mended, assets.names))
        whole = joined_correlation(whole, among, links)
    market = RiskyMarket(
        model,
        volatility=() if assets is None else assets.volatility,
        premium=() if assets is None else assets.premium,
        inflation=inflation,
        correlation=whole,
    )
    return Beside(market, mended, tuple(faults))


def _inflation(book: Book, model: DrawnModel, faults: list[Fault]) -> InflationFactor | None:
    """How expected inflation moves; None where it is not to be drawn, or cannot be."""
    stated = book.rates_model
    if stated is None or stated.inflation_volatility is None:
        return None
    if book.basis.inflation is None:
        faults.append(
            Fault(
                found="Inflation factor volatility is stated, but the basis expects no inflation",
                expected="a sheet Inflation beside it",
                mend="Add the sheet Inflation, or remove the item: no inflation is drawn.",
                sheet="Rates model",
                severity=Severity.MILD,
            )
        )
        return None
    if isinstance(model, GivenRates):
        faults.append(
            Fault(
                found="inflation is not drawn beside a set of scenarios from outside, which holds none",
                expected="a model of rates where inflation is to be drawn",
                mend="Choose a model: linked flows stay as they are expected today.",
                sheet="Rates model",
                severity=Severity.MILD,
            )
        )
        return None
    speed, volatility = stated.inflation_mean_reversion, stated.inflation_volatility
    if speed is None:
        raise ValueError("Inflation mean reversion is missing: the inflation factor needs it")
    for title, value in (("Inflation mean reversion", speed), ("Inflation factor volatility", volatility)):
        if not 0.0 <= value < math.inf:
            raise ValueError(f"{title} must be a number of at least 0, not {value:g}")
    if not math.isfinite(stated.inflation_risk_price):
        raise ValueError(f"Inflation risk price must be a number, not {stated.inflation_risk_price}")
    return InflationFactor(book.basis.inflation.curve, speed, volatility, stated.inflation_risk_price)


def _link(stated: RatesModel) -> float:
    """The correlation of inflation with the first rate factor."""
    link = 0.0 if stated.inflation_rate_correlation is None else stated.inflation_rate_correlation
    if not -1.0 <= link <= 1.0:
        raise ValueError(f"Inflation rate correlation must be between -1 and 1, not {link:g}")
    return link


def _apart(item: str, what: str, model: DrawnModel, sheet: str) -> Fault:
    """Says that something is drawn independently of the rates although a correlation is stated."""
    outside = isinstance(model, GivenRates)
    reason = "are given" if outside else "are not Gaussian and have no joint law that can be drawn exactly"
    return Fault(
        found=f"{what} {'is' if what == 'inflation' else 'are'} drawn independently of rates that {reason}",
        expected=f"0 for {item}, or a Gaussian model",
        mend="Choose a Gaussian model where the correlation matters.",
        sheet=sheet,
        severity=Severity.MILD,
    )


def _check(assets: RiskyAssets) -> None:
    """Raise where a figure of an asset will not do."""
    columns = (
        ("Value", assets.value, 0.0),
        ("Premium", assets.premium, -math.inf),
        ("Volatility", assets.volatility, 0.0),
    )
    for title, column, least in columns:
        for name, value in zip(assets.names, column.tolist(), strict=True):
            if not (math.isfinite(value) and value >= least):
                wanted = "a number" if least < 0.0 else "a number of at least 0"
                raise ValueError(
                    f"{title} of {name} in the sheet Risky assets must be {wanted}, not {value:g}"
                )


def _consistent(
    among: FloatArray, links: FloatArray, *, mend: bool
) -> tuple[FloatArray, FloatArray, MendedCorrelation | None]:
    """The correlations of the assets and with the first rate factor, mended if need be and asked for."""
    joint = joined_correlation([[1.0]], among, links)
    problem = correlation_problem(joint)
    if problem is None:
        return among, links, None
    try:
        mended = mended_correlation(joint)
    except ValueError as error:
        raise ValueError(
            f"the correlations in the sheet Risky assets will not do: of Rates and the assets, {problem}"
        ) from error
    if not mend:
        raise ValueError(
            "the correlations in the sheet Risky assets will not do: of the matrix of Rates and the assets, "
            f"in this order, {problem}. The nearest matrix that will do changes no entry by more than "
            f"{mended.largest_change:.2g}: set Mend correlation to yes in the sheet Rates model to take it"
        )
    return mended.matrix[1:, 1:], mended.matrix[0, 1:], mended


def _mended_fault(mended: MendedCorrelation, names: tuple[str, ...]) -> Fault:
    """Says what was changed."""
    titles = ("the rates", *names)
    one, two = (titles[place] for place in mended.largest_at)
    return Fault(
        found=f"the correlations contradicted one another (least eigenvalue {mended.least_eigenvalue:.3g}) "
        f"and were mended; the largest change, that between {one} and {two}, is "
        f"{mended.largest_change:.3g}",
        expected="correlations that can hold together",
        mend="State the correlations as they were mended, or others.",
        sheet="Risky assets",
        severity=Severity.MILD,
    )
