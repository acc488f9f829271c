"""What the checks against QuantLib share: its dates, schedules, day counts and a curve that is ours too."""

from __future__ import annotations

from datetime import date, timedelta

import numpy as np
import QuantLib as ql

from desk.book import Basis
from desk.rates.compounding import Compounding
from desk.rates.day_count import DayCount

__all__ = ["COUNTS", "DAYS", "PER_CENT", "TODAY", "MovedCurve", "basis", "day", "random_date", "schedule"]

TODAY = date(2026, 6, 30)
DAYS = [92, 184, 365, 731, 1096, 1826, 2557, 3652, 5479, 7305, 9131, 10957, 18262]
PER_CENT = [2.1, 2.05, 2.0, 1.98, 2.04, 2.26, 2.48, 2.7, 2.91, 2.96, 2.9, 2.81, 2.6]


def day(when: date) -> ql.Date:
    """A date of theirs."""
    return ql.Date(when.day, when.month, when.year)


def basis() -> Basis:
    """Continuous zero rates, log-linear discount factors."""
    return Basis(
        TODAY,
        "EUR",
        np.array(DAYS) / 365.0,
        np.array(PER_CENT) / 100.0,
        compounding=Compounding.CONTINUOUS,
    )


class MovedCurve:
    """Their copy of the curve of `basis`, its rates moved in parallel by `move`, and by `spread` above that.

    Discounting is at move and spread, projecting at move alone.
    """

    def __init__(self) -> None:
        today = day(TODAY)
        ql.Settings.instance().evaluationDate = today
        dates = [today, *(today + number for number in DAYS)]
        factors = basis().curve.discount(np.array(DAYS) / 365.0).tolist()
        base = ql.DiscountCurve(dates, [1.0, *factors], ql.Actual365Fixed())
        base.enableExtrapolation()
        self.move = ql.SimpleQuote(0.0)
        self.spread = ql.SimpleQuote(0.0)
        moved = ql.ZeroSpreadedTermStructure(ql.YieldTermStructureHandle(base), ql.QuoteHandle(self.move))
        moved.enableExtrapolation()
        self.projecting = ql.YieldTermStructureHandle(moved)
        spread = ql.ZeroSpreadedTermStructure(self.projecting, ql.QuoteHandle(self.spread))
        spread.enableExtrapolation()
        self.discounting = ql.YieldTermStructureHandle(spread)
        self._kept = (base, moved, spread)

    def index(self, name: str, months: int, count: ql.DayCounter) -> ql.IborIndex:
        """A floating rate of the projecting curve, without fixing days or holidays."""
        return ql.IborIndex(
            name,  # past rates are kept by name
            ql.Period(months, ql.Months),
            0,
            ql.EURCurrency(),
            ql.NullCalendar(),
            ql.Unadjusted,
            False,
            count,
            self.projecting,
        )


def schedule(start: date, end: date, months: int, *, first: date | None = None) -> ql.Schedule:
    """Dates counted back from the end, no holidays."""
    return ql.Schedule(
        day(start),
        day(end),
        ql.Period(months, ql.Months),
        ql.NullCalendar(),
        ql.Unadjusted,
        ql.Unadjusted,
        ql.DateGeneration.Backward,
        False,
        *(() if first is None else (day(first),)),
    )


def random_date(random: np.random.Generator, low: int, high: int) -> date:
    """A date some days after the valuation date, every fourth a month end."""
    when = TODAY + timedelta(days=int(random.integers(low, high)))
    if random.integers(4) == 0:
        when = when.replace(day=1) - timedelta(days=1)
    return when


COUNTS = {
    DayCount.ACT_360: ql.Actual360(),
    DayCount.ACT_365F: ql.Actual365Fixed(),
    DayCount.ACT_ACT_ISDA: ql.ActualActual(ql.ActualActual.ISDA),
    DayCount.THIRTY_360: ql.Thirty360(ql.Thirty360.BondBasis),
    DayCount.THIRTY_E_360: ql.Thirty360(ql.Thirty360.European),
}
