"""The building blocks of the demo books: payments that decay with survivors, bonds, a history of rates."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from datetime import date

import numpy as np
from numpy.typing import NDArray

from desk.book import Basis, Book, FlowTable, History, Holding, HoldingKind
from desk.book.schedule import holding_flows
from desk.rates.day_count import DayCount, year_fraction
from desk.valuation.standing import stand

__all__ = [
    "TODAY",
    "VALUATION_DATE",
    "Flows",
    "bond",
    "flow_table",
    "history",
    "issuers",
    "month_starts",
    "own_names",
    "pension",
    "scaled",
    "survivors",
    "years_to",
]

FloatArray = NDArray[np.float64]
DateArray = NDArray[np.datetime64]

VALUATION_DATE = date(2026, 9, 30)
TODAY = np.datetime64(VALUATION_DATE, "D")
_PLACES = (
    *("Larkmoor", "Tarnbeck", "Osierfield", "Quillhaven", "Brackwell", "Corvale", "Dunmarrow", "Elverstone"),
    *(
        "Farrowgate",
        "Grimsholt",
        "Harrowmere",
        "Inglemoss",
        "Kestrelby",
        "Lindenfold",
        "Marlfleet",
        "Northgate",
    ),
    *("Oxfallow", "Pellbrook", "Ravensholt", "Saltmarch", "Thornwick", "Umberdale", "Velmoor", "Wrenhollow"),
)
_TRADES = (
    *("Water", "Rail", "Grid", "Telecom", "Ports", "Foods", "Housing", "Cement", "Paper", "Airports"),
    *("Gas Networks", "Retail", "Chemicals", "Motorways", "Hospitals", "Shipping", "Glass"),
)


def survivors(age: float, years: FloatArray, *, modal_age: float = 88.0, spread: float = 9.5) -> FloatArray:
    """Part of those of an age alive `years` later under the Gompertz law."""
    return np.asarray(np.exp(-np.exp((age - modal_age) / spread) * np.expm1(years / spread)))


def years_to(dates: DateArray) -> FloatArray:
    """Years from the valuation date."""
    return year_fraction(TODAY, dates, DayCount.ACT_365F)


def month_starts(first_month: int, count: int, step: int = 1) -> DateArray:
    """First days of months, counted from the month of the valuation date."""
    ahead = np.arange(first_month, first_month + count * step, step).astype("timedelta64[M]")
    months = TODAY.astype("M8[M]") + ahead
    return np.asarray(months.astype("M8[D]"))


def pension(
    dates: DateArray, *, ages: tuple[float, float, float], yearly: float, per_year: int, increase: float
) -> FloatArray:
    """Payments to a group spread evenly over ages from the first to the second by steps of the third."""
    years = years_to(dates)
    low, high, step = ages
    alive = np.mean([survivors(age, years) for age in np.arange(low, high, step)], axis=0)
    return np.asarray(yearly / per_year * alive * (1.0 + increase) ** years)


@dataclass(frozen=True)
class Flows:
    """Rows of one line."""

    line: str
    dates: DateArray
    amounts: FloatArray
    beta: float = 0.0


def flow_table(parts: Sequence[Flows], scale: float) -> FlowTable:
    """The rows as a table, every amount scaled and rounded to cents."""
    dates = np.concatenate([part.dates for part in parts])
    return FlowTable.build(
        [part.line for part in parts for _ in range(part.dates.size)],
        years_to(dates),
        np.round(scale * np.concatenate([part.amounts for part in parts]), 2),
        beta=np.concatenate([np.full(part.dates.size, part.beta) for part in parts]),
        date=dates,
    )


def issuers(rng: np.random.Generator, count: int) -> list[str]:
    """Made-up names of companies, no two alike."""
    pairs = [f"{place} {trade}" for place in _PLACES for trade in _TRADES]
    return [pairs[number] for number in rng.permutation(len(pairs))[:count]]


def bond(
    rng: np.random.Generator,
    basis: Basis,
    issuer: str,
    *,
    years: float,
    nominal: float,
    spread: float | None,
    frequency: int,
) -> Holding:
    """A bond issued near today's rates; with a spread it has the market value the spread gives."""
    maturity = (TODAY + np.timedelta64(round(365.25 * years), "D")).item()
    maturity = maturity.replace(day=15)
    rate = float(np.expm1(basis.curve.zero(years))) + (spread or 0.0) + rng.normal(0.0, 0.009)
    coupon = max(round(400 * rate) / 400, 0.0025)
    made = Holding(
        name=f"{issuer} {100 * coupon:.4g}% {maturity.year}",
        kind=HoldingKind.BOND,
        nominal=nominal,
        coupon=round(coupon, 4),
        frequency=frequency,
        maturity=maturity,
    )
    return made if spread is None else replace(made, market_value=_worth(made, basis, spread))


def _worth(holding: Holding, basis: Basis, spread: float) -> float:
    flows = holding_flows([holding], valuation_date=basis.valuation_date)
    return round(
        float(np.sum(flows.amount * basis.curve.discount(flows.time) * np.exp(-spread * flows.time))), 2
    )


def own_names(holdings: Sequence[Holding]) -> tuple[Holding, ...]:
    """The holdings, those of one name told apart by a letter."""
    seen: dict[str, int] = {}
    named = []
    for holding in holdings:
        count = seen[holding.name] = seen.get(holding.name, 0) + 1
        named.append(holding if count == 1 else replace(holding, name=f"{holding.name} {chr(64 + count)}"))
    return tuple(named)


def history(seed: int, *, start: float, long_run: float, end: float, volatility: float) -> History:
    """Ten years of month ends: a rate drawn back to its long-run level, bent to end on the curve."""
    rng = np.random.default_rng(seed)
    rate, rates = start, []
    for shock in rng.standard_normal(120):
        rate += 0.25 * (long_run - rate) / 12.0 + volatility * shock / np.sqrt(12.0)
        rates.append(rate)
    bent = np.array(rates) + np.linspace(0.0, end - rates[-1], 120)
    months = TODAY.astype("M8[M]") + np.arange(-118, 2).astype("timedelta64[M]")
    return History(months.astype("M8[D]") - np.timedelta64(1, "D"), np.round(bent, 6))


def scaled(make: Callable[[float], Book], funding_ratio: float) -> Book:
    """The book whose liabilities are scaled so that its funding ratio is the one asked for."""
    return make(stand(make(1.0)).funding_ratio / funding_ratio)
