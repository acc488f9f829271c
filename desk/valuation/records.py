"""Results of a valuation: immutable records."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

import numpy as np
from numpy.typing import NDArray

from desk.book import Fault, Provenance, Side
from desk.book.arrays import FloatArray, IntArray

__all__ = [
    "Condition",
    "FlowDetail",
    "InflationStanding",
    "KeyRates",
    "LineStanding",
    "Measures",
    "Periods",
    "Standing",
]


@dataclass(frozen=True)
class Measures:
    """Measures of a set of flows on a curve and a spread; NaN where a measure has no meaning.

    Attributes
    ----------
    present_value : float
        [currency]
    equivalent_rate : float
        The single annual effective rate with the same present value [1/year].
    macaulay_duration, modified_duration : float
        At the equivalent rate [years].
    effective_duration : float
        For a parallel move of the continuous zero rates [years].
    convexity : float
        Second order, likewise [years²].
    dispersion : float
        Present-value-weighted variance of the times [years²].
    dv01 : float
        Fall in present value for +1 basis point on all zero rates [currency].
    """

    present_value: float
    equivalent_rate: float
    macaulay_duration: float
    modified_duration: float
    effective_duration: float
    convexity: float
    dispersion: float
    dv01: float


@dataclass(frozen=True)
class LineStanding:
    """The measures of one line.

    Attributes
    ----------
    side : Side
    line : str
    kind : str
        ``flows``, or the kind of holding.
    measures : Measures
    spread : float or None
        Continuously compounded spread over the curve [1/year]; None where it differs between the flows
        of the line.
    market_value : float or None
        As the source states it, by its price if it states that [currency].
    flow_count : int
        Flows after the valuation date, today's included. The principal of a linked bond counts as a flow of
        its own where it has a floor.
    spread_duration : float or None
        ``-(1/PV) dPV/ds`` for the spread s, the payments as projected today [years]; None where no spread
        plays a part: a fund, property or swap.
    expected_credit_loss : float or None
        What expected default takes off the present value [currency]; None where none is expected.
    inflation_dv01 : float or None
        Rise in present value for +1 basis point on all expected inflation rates [currency]; None where the
        basis states no expected inflation.
    """

    side: Side
    line: str
    kind: str
    measures: Measures
    spread: float | None
    market_value: float | None
    flow_count: int
    spread_duration: float | None = None
    expected_credit_loss: float | None = None
    inflation_dv01: float | None = None


@dataclass(frozen=True)
class KeyRates:
    """Key-rate durations and DV01 of both sides, each shape (k,), by term.

    Attributes
    ----------
    term : ndarray
        [years]
    assets, liabilities : ndarray
        Key-rate durations [years]; they sum to the effective duration of the side.
    dv01_assets, dv01_liabilities : ndarray
        Fall in present value for +1 basis point at that key rate [currency].
    """

    term: FloatArray
    assets: FloatArray
    liabilities: FloatArray
    dv01_assets: FloatArray
    dv01_liabilities: FloatArray


@dataclass(frozen=True)
class Periods:
    """Undiscounted flows by year from the valuation date, each shape (n,) [currency].

    Year k holds the flows after k - 1 and up to k years; a flow today is in year 1.
    """

    year: IntArray
    assets: FloatArray
    liabilities: FloatArray
    net: FloatArray
    cumulative: FloatArray


@dataclass(frozen=True)
class Condition:
    """One of Redington's conditions.

    Attributes
    ----------
    name : str
        ``present_value``, ``duration`` or ``convexity``.
    statement : str
        The condition in words.
    assets, liabilities : float
        The two figures compared.
    holds : bool
    """

    name: str
    statement: str
    assets: float
    liabilities: float
    holds: bool


@dataclass(frozen=True)
class FlowDetail:
    """The flows of one line, opened, each array shape (n,).

    Attributes
    ----------
    date : ndarray of datetime64[D]
        NaT where the source states the year.
    time : ndarray
        [years]
    amount : ndarray
        [currency]
    discount_factor : ndarray
        With the row's spread.
    present_value : ndarray
        [currency]
    real_amount : ndarray or None
        In today's money; None where the line follows no index and does not rise [currency].
    index_factor : ndarray or None
        Growth from today that is expected until the row is due: `amount` over `real_amount`.
    """

    date: NDArray[np.datetime64]
    time: FloatArray
    amount: FloatArray
    discount_factor: FloatArray
    present_value: FloatArray
    real_amount: FloatArray | None = None
    index_factor: FloatArray | None = None


@dataclass(frozen=True)
class InflationStanding:
    """How both sides follow expected inflation, nominal rates unchanged.

    Attributes
    ----------
    assets_duration, liabilities_duration : float
        ``(1/PV) dPV/di`` for a parallel move of the continuous expected inflation rates [years]. It is also
        the fall for a rise of real rates while nominal rates stay, the real duration.
    real_duration_gap : float
        ``D_A - D_L · L / A`` with these [years].
    dv01_assets, dv01_liabilities, dv01_gap : float
        Rise in present value for +1 basis point on all expected inflation rates [currency].
    term : ndarray, shape (k,)
        Of the key rates of expected inflation [years].
    key_assets, key_liabilities : ndarray, shape (k,)
        Key-rate durations of expected inflation [years]; they sum to the durations.
    key_dv01_assets, key_dv01_liabilities : ndarray, shape (k,)
        [currency]
    real_periods : Periods
        The undiscounted flows by year in today's money: each over the expected index.
    """

    assets_duration: float
    liabilities_duration: float
    real_duration_gap: float
    dv01_assets: float
    dv01_liabilities: float
    dv01_gap: float
    term: FloatArray
    key_assets: FloatArray
    key_liabilities: FloatArray
    key_dv01_assets: FloatArray
    key_dv01_liabilities: FloatArray
    real_periods: Periods


@dataclass(frozen=True)
class Standing:
    """The balance sheet valued at one date on one basis.

    Attributes
    ----------
    valuation_date : datetime.date
    currency : str
    assets, liabilities : Measures
    surplus : float
        Assets less liabilities [currency].
    funding_ratio : float
        Assets over liabilities; NaN without liabilities.
    duration_gap : float
        ``D_A - D_L · L / A`` with effective durations [years].
    dv01_gap : float
        DV01 of assets less that of liabilities [currency].
    redington : tuple of Condition
    key_rates : KeyRates
    periods : Periods
    lines : tuple of LineStanding
        Assets first, each side in the order of the book.
    faults : tuple of Fault
        What the valuation could not do as asked.
    provenance : Provenance
    inflation : InflationStanding or None
        None where the basis states no expected inflation.
    """

    valuation_date: date
    currency: str
    assets: Measures
    liabilities: Measures
    surplus: float
    funding_ratio: float
    duration_gap: float
    dv01_gap: float
    redington: tuple[Condition, ...]
    key_rates: KeyRates
    periods: Periods
    lines: tuple[LineStanding, ...]
    faults: tuple[Fault, ...]
    provenance: Provenance
    inflation: InflationStanding | None = None
