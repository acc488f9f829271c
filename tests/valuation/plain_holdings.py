"""Holdings once more, in plain Python: period by period, floating interest projected anew."""

from __future__ import annotations

import math
from calendar import monthrange
from collections.abc import Callable
from dataclasses import dataclass
from datetime import date, timedelta
from itertools import pairwise

from desk.book import Amortisation, Holding, HoldingKind
from desk.rates.day_count import DayCount

__all__ = ["Payment", "accrued", "is_ex", "payments", "value"]

Discount = Callable[[float], float]


@dataclass
class Payment:
    """What is paid on one day: interest, repayment, and what was owed before it."""

    when: date
    interest: float
    repaid: float
    owed: float


def back(end: date, months: int) -> date:
    """Months before a date, on its day or the last of a shorter month."""
    number = end.year * 12 + end.month - 1 - months
    year, month = number // 12, number % 12 + 1
    return date(year, month, min(end.day, monthrange(year, month)[1]))


def fraction(start: date, end: date, count: DayCount | None, maturity: date, months: int) -> float:
    """Years of interest from one day to another."""
    if count is DayCount.ACT_360:
        return (end - start).days / 360.0
    if count is DayCount.ACT_365F:
        return (end - start).days / 365.0
    if count is DayCount.THIRTY_E_360:
        one, two = min(start.day, 30), min(end.day, 30)
        return ((end.year - start.year) * 360 + (end.month - start.month) * 30 + two - one) / 360.0
    assert count is None
    total, number = 0.0, 0
    while True:  # Act/Act ICMA: regular period by regular period, back from the maturity
        last, first = back(maturity, number * months), back(maturity, (number + 1) * months)
        days = (min(end, last) - max(start, first)).days
        if days > 0:
            total += days / (last - first).days * months / 12.0
        if first <= start:
            return total
        number += 1


def _regular_dates(holding: Holding, months: int, today: date) -> list[date]:
    """Payment dates ahead, and before them the day on which the first of their periods begins."""
    assert holding.maturity is not None
    dates, number = [holding.maturity], 1
    while True:
        when = back(holding.maturity, number * months)
        number += 1
        start = holding.start_date
        if start is not None and when <= start:
            return [start, *dates]
        if holding.first_coupon is not None and when < holding.first_coupon:
            assert start is not None
            return [start, *dates]
        if dates[0] > today >= when:
            return [when, *dates]
        dates.insert(0, when)


def _leg(
    holding: Holding,
    months: int,
    count: DayCount | None,
    today: date,
    rate: Callable[[date, date, float], float],
    *,
    by_days: bool,
) -> list[Payment]:
    """Payments of one leg; `rate` is the interest on one unit from start, end and year fraction."""
    assert holding.maturity is not None
    dates = _regular_dates(holding, months, today)
    while dates[1] <= today:
        dates.pop(0)
    left = len(dates) - 1
    owed, rows = holding.nominal, []
    per_period = holding.coupon * months / 12.0
    level_payment = (
        holding.nominal * per_period / (1.0 - (1.0 + per_period) ** -left)
        if holding.amortisation is Amortisation.ANNUITY and per_period
        else holding.nominal / left
    )
    for start, end in pairwise(dates):
        whole = months / 12.0
        one_period = not by_days and _is_next(holding.maturity, start, end, months)
        years = whole if one_period else fraction(start, end, count, holding.maturity, months)
        interest = owed * rate(start, end, years)
        if holding.amortisation is Amortisation.BULLET:
            repaid = owed if end == holding.maturity else 0.0
        elif holding.amortisation is Amortisation.LEVEL or not per_period:
            repaid = holding.nominal / left
        else:
            repaid = level_payment - owed * per_period
        rows.append(Payment(end, interest, repaid, owed))
        owed -= repaid
    return rows


def _is_next(maturity: date, start: date, end: date, months: int) -> bool:
    """Whether two days are neighbouring regular dates."""
    number = 0
    while back(maturity, number * months) > end:
        number += 1
    return back(maturity, number * months) == end and back(maturity, (number + 1) * months) == start


def payments(holding: Holding, today: date, discount: Discount) -> list[Payment]:
    """What a holding is promised, on a curve; the two legs of a swap after each other."""

    def factor(when: date) -> float:
        return discount((when - today).days / 365.0)

    def fixed(_: date, __: date, years: float) -> float:
        return holding.coupon * years

    def floating(start: date, end: date, years: float) -> float:
        if start <= today:
            if holding.current_rate is not None:
                return holding.current_rate * years
            part_left = (end - today).days / (end - start).days
            return (1.0 / factor(end) - 1.0) / part_left + holding.margin * years
        return factor(start) / factor(end) - 1.0 + holding.margin * years

    months = 12 // holding.frequency
    kind, count = holding.kind, holding.day_count
    if kind is HoldingKind.BOND and (holding.coupon or holding.amortisation is not Amortisation.BULLET):
        return _leg(holding, months, count, today, fixed, by_days=False)
    if kind is HoldingKind.FLOATER:
        return _leg(holding, months, count, today, floating, by_days=count is not None)
    if kind in (HoldingKind.PAYER_SWAP, HoldingKind.RECEIVER_SWAP):
        sign = 1.0 if kind is HoldingKind.PAYER_SWAP else -1.0
        other = 12 // (holding.floating_frequency or holding.frequency)
        other_count = holding.floating_day_count or count
        received = _leg(holding, other, other_count, today, floating, by_days=other_count is not None)
        paid = _leg(holding, months, count, today, fixed, by_days=count is not None)
        return [Payment(row.when, sign * row.interest, 0.0, 0.0) for row in received] + [
            Payment(row.when, -sign * row.interest, 0.0, 0.0) for row in paid
        ]
    assert holding.maturity is not None
    interest = 0.0
    if kind is HoldingKind.TERM_DEPOSIT and holding.start_date is not None:
        years = fraction(
            holding.start_date, holding.maturity, count or DayCount.ACT_360, holding.maturity, 12
        )
        interest = holding.nominal * holding.coupon * years
    return [Payment(holding.maturity, interest, holding.nominal, holding.nominal)]


def is_ex(holding: Holding, today: date, first: date) -> bool:
    """Whether a buyer no longer gets the coupon of a day."""
    days = holding.ex_dividend_days
    return days > 0 and today >= first - timedelta(days=days)


def value(
    holding: Holding,
    today: date,
    discount: Discount,
    *,
    spread: float = 0.0,
    for_buyer: bool = False,
    default: bool = True,
) -> float:
    """Present value at a spread, floating interest projected on the curve given."""
    total, alive_before = 0.0, 1.0
    rows = payments(holding, today, discount)
    first = rows[0].when
    gone = is_ex(holding, today, first) and (for_buyer or holding.bought_ex_dividend)
    yearly = holding.default_rate if default else 0.0
    if holding.start_date is not None and holding.start_date > today:
        alive_before = (1.0 - yearly) ** ((holding.start_date - today).days / 365.0)
    for row in rows:
        time = (row.when - today).days / 365.0
        alive = (1.0 - yearly) ** time
        interest = 0.0 if gone and row.when == first else row.interest
        paid = alive * (interest + row.repaid) + (alive_before - alive) * holding.recovery_rate * row.owed
        total += paid * discount(time) * math.exp(-spread * time)
        alive_before = alive
    return total


def accrued(holding: Holding, today: date, discount: Discount) -> float:
    """Accrued interest of a bond or floater."""
    assert holding.maturity is not None
    months = 12 // holding.frequency
    rows = payments(holding, today, discount)
    dates = _regular_dates(holding, months, today)
    begin = max(when for when in dates if when < rows[0].when)
    if begin > today:
        return 0.0
    count = holding.day_count
    rate = holding.coupon if holding.kind is HoldingKind.BOND else holding.current_rate
    assert rate is not None
    found = rows[0].owed * rate * fraction(begin, today, count, holding.maturity, months)
    return found - (rows[0].interest if is_ex(holding, today, rows[0].when) else 0.0)
