"""Holdings into flows: what each pays, and when."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date
from typing import Any

import numpy as np
from numpy.typing import NDArray

from desk.book.accrual import ICMA, accrual_fraction, period_around
from desk.book.arrays import FloatArray, IntArray
from desk.book.holding import Amortisation, Holding
from desk.book.legs import Legs, holding_legs
from desk.rates.day_count import DateArray, DayCount, add_months, year_fraction

__all__ = ["HoldingFlows", "RunningPeriods", "add_months", "holding_flows"]

_LEVEL = tuple(Amortisation).index(Amortisation.LEVEL)
_ANNUITY = tuple(Amortisation).index(Amortisation.ANNUITY)


@dataclass(frozen=True, eq=False)
class RunningPeriods:
    """The periods in which the valuation date lies, one a leg that bears interest, each array shape (p,).

    Attributes
    ----------
    holding : ndarray of int
        Index into the list of holdings.
    row : ndarray of int
        The row of the flows that ends the period.
    nominal : ndarray
        On which it pays, with the sign of the leg [currency].
    rate : ndarray
        Interest rate; NaN where that of a floating leg is not stated [1/year].
    margin : ndarray
        Of a floating leg [1/year].
    fraction : ndarray
        The whole period in the day count of the leg [years].
    accrued_fraction : ndarray
        From its start to the valuation date, likewise [years].
    length : ndarray
        The whole period in the day count of the times [years].
    is_ex : ndarray of bool
        Whether a buyer no longer gets the coupon that ends it.
    is_received : ndarray of bool
        Whether the holder gets it.
    """

    holding: IntArray
    row: IntArray
    nominal: FloatArray
    rate: FloatArray
    margin: FloatArray
    fraction: FloatArray
    accrued_fraction: FloatArray
    length: FloatArray
    is_ex: NDArray[np.bool_]
    is_received: NDArray[np.bool_]


@dataclass(frozen=True, eq=False)
class HoldingFlows:
    """Flows of a list of holdings, by holding and then by date.

    A row pays ``amount`` and, where ``floating`` is not 0, the interest of the curve on it over its period:
    ``floating · (P(start) / P(end) - 1)``, see `desk.valuation.floating`.

    Attributes
    ----------
    holding : ndarray of int, shape (n,)
        Each row's holding, as an index into the list.
    date : ndarray of datetime64[D], shape (n,)
    time : ndarray, shape (n,)
        Years from the valuation date.
    amount : ndarray, shape (n,)
        What is known of the amount received: fixed interest, margin, repayment [currency].
    interest : ndarray, shape (n,)
        The interest in `amount` [currency].
    floating : ndarray, shape (n,)
        What earns the floating rate over the period the row ends [currency]; 0 where none.
    period_row : ndarray of int, shape (n,)
        The row at which that period begins; -1 where nothing floats.
    outstanding : ndarray, shape (n,)
        What a debtor owes over the period the row ends; 0 for a swap [currency].
    periods_after : ndarray of int, shape (n,)
        Regular periods from the row to the maturity.
    is_start : ndarray of bool, shape (n,)
        The row stands for the start of a floating leg that lies ahead; nothing is paid.
    is_principal : ndarray of bool, shape (n,)
        The row repays the nominal and nothing else, coupons having rows of their own or there being none.
    start_time : ndarray, shape (m,)
        Years from the valuation date to the start of each holding; 0 where it has begun.
    running : RunningPeriods
    """

    holding: IntArray
    date: NDArray[np.datetime64]
    time: FloatArray
    amount: FloatArray
    interest: FloatArray
    floating: FloatArray
    period_row: IntArray
    outstanding: FloatArray
    periods_after: IntArray
    is_start: NDArray[np.bool_]
    is_principal: NDArray[np.bool_]
    start_time: FloatArray
    running: RunningPeriods


def holding_flows(
    holdings: Sequence[Holding], *, valuation_date: date, day_count: DayCount = DayCount.ACT_365F
) -> HoldingFlows:
    """What the holdings pay after the valuation date.

    Parameters
    ----------
    holdings : sequence of Holding, length m
    valuation_date : datetime.date
    day_count : DayCount
        Turns dates into years.

    Returns
    -------
    HoldingFlows
        Coupons run back from the maturity by whole months, each on the day of the maturity or the last day
        of a shorter month, as far as the valuation date, the start or the first coupon.

        A bond pays ``nominal · coupon / frequency``, the next one whole, whatever the ex-dividend days,
        unless it was bought ex-dividend; an odd first coupon pays ``nominal · coupon · fraction``, with the
        fraction of its day count. The last comes with the nominal in one row; an amortising bond repays in
        parts, the interest of each period on what is then outstanding. A zero or bill pays its nominal at
        maturity, a term deposit with simple interest from its start; a deposit its nominal on the valuation
        date; a fund or property nothing. A linked bond pays what a bond does, before indexation; the nominal
        is a row of its own where it has a floor.

        A floater pays `current_rate` for the running period, then the rate of the curve and the margin. A
        payer swap receives that without the nominal and pays the fixed rate, every period by its day count; a
        receiver swap the other way round.

    Notes
    -----
    The rule for the days is common practice for schedules without adjustment for business days: every
    coupon date is counted from the maturity itself, so that a bond of the 31st pays on the 30th in
    November and on the 31st again in May.

    With n payments left of N outstanding, level repayment is ``N / n`` with each; after k annuity payments
    ``N · (1 - v^(n - k)) / (1 - v^n)`` is outstanding, v the discount factor of one regular period at the
    coupon (Kellison, S.G., The Theory of Interest, loan repayment).
    """
    legs = holding_legs(holdings, valuation_date=valuation_date)
    today = np.datetime64(valuation_date, "D")
    leg, after, when = _payment_dates(legs, today)
    head = np.flatnonzero(np.diff(leg, prepend=-1))  # the first row of each leg that pays
    own = legs.taken(leg[head])
    paid = np.diff(head, append=leg.size)  # rows of each
    begin, quasi = _first_periods(own, when[head])

    outstanding, repaid = _outstanding(legs, leg, after, np.repeat(paid, paid))
    from_day = np.empty_like(when)
    from_day[1:] = when[:-1]
    from_day[head] = begin
    interest, first_fraction = _interest(legs, leg, outstanding, from_day, when, head, own, begin == quasi)

    is_ahead = own.start > today  # where none is stated the comparison is False
    running = _running(own, head, outstanding, begin, when[head], first_fraction, today, day_count, ~is_ahead)
    floats = legs.is_floating[leg]
    floats[running.row] = False
    now = own.is_floating[~is_ahead]
    stated = np.where(np.isnan(running.rate), 0.0, running.rate)
    interest[running.row[now]] = (running.nominal * stated * running.fraction)[now]
    interest[running.row[~running.is_received]] = 0.0
    floating = np.where(floats, outstanding, 0.0)
    columns = HoldingFlows(
        holding=legs.holding[leg],
        date=when,
        time=np.empty(0),
        amount=interest + np.where(legs.repays[leg], repaid, 0.0),
        interest=interest,
        floating=floating,
        period_row=np.where(floating != 0.0, np.arange(leg.size) - 1, -1),
        outstanding=np.where(legs.is_swap[leg], 0.0, outstanding),
        periods_after=after,
        is_start=np.zeros(leg.size, dtype=np.bool_),
        is_principal=~legs.pays_coupons[leg] & legs.repays[leg],
        start_time=_start_times(legs, today, day_count, len(holdings)),
        running=running,
    )
    ahead = np.flatnonzero(is_ahead & own.is_floating)
    if ahead.size:
        columns = _with_starts(columns, head[ahead], begin[ahead])
    if (legs.holding[1:] == legs.holding[:-1]).any():
        columns = _by_date(columns)
    return replace(columns, time=year_fraction(today, columns.date, day_count))


def _start_times(legs: Legs, today: np.datetime64, day_count: DayCount, count: int) -> FloatArray:
    """Years to the start of each holding, 0 where it has begun."""
    times = np.zeros(count)
    ahead = np.flatnonzero(legs.start > today)
    times[legs.holding[ahead]] = year_fraction(today, legs.start[ahead], day_count)
    return times


def _payment_dates(legs: Legs, today: np.datetime64) -> tuple[IntArray, IntArray, DateArray]:
    """Leg, regular periods after it, and date of each payment, by leg and date."""
    months_left = (legs.end.astype("M8[M]") - today.astype("M8[M]")).astype(np.int64)
    count = np.where(legs.pays_coupons, months_left // legs.months + 1, 1)
    count[(legs.end <= today) & ~legs.is_deposit] = 0
    leg = np.repeat(np.arange(len(legs)), count)
    after = np.repeat(np.cumsum(count), count) - 1 - np.arange(leg.size)
    when = add_months(legs.end[leg], -after * legs.months[leg])
    # The earliest date counted may still fall in the month of the valuation date, before its day.
    kept = (when > today) | legs.is_deposit[leg]
    bounded = legs.pays_coupons & ~np.isnat(legs.start)
    if bounded.any():
        # Comparisons with no date are False.
        kept &= ~(bounded[leg] & (when <= legs.start[leg])) & ~(when < legs.first[leg])
    return leg[kept], after[kept], when[kept]


def _first_periods(own: Legs, first: DateArray) -> tuple[DateArray, DateArray]:
    """Where the period that ends with the first payment ahead begins, and the regular date before it."""
    _, before, _ = period_around(first - np.timedelta64(1, "D"), maturity=own.end, months=own.months)
    starts = ~np.isnat(own.start)
    is_first = starts & ((first == own.first) | (own.start > before) | ~own.pays_coupons)
    return np.where(is_first, own.start, before), before


def _outstanding(
    legs: Legs, leg: IntArray, after: IntArray, rows_of_leg: IntArray
) -> tuple[FloatArray, FloatArray]:
    """What is outstanding over the period each row ends, and what the row repays."""
    nominal = legs.nominal[leg]
    kind = legs.amortisation[leg]
    outstanding, repaid = nominal.copy(), np.where(after == 0, nominal, 0.0)
    level = np.flatnonzero(kind == _LEVEL)
    if level.size:
        part = nominal[level] / rows_of_leg[level]
        outstanding[level], repaid[level] = part * (after[level] + 1), part
    annuity = np.flatnonzero(kind == _ANNUITY)
    if annuity.size:
        growth: FloatArray = np.log1p(legs.rate[leg[annuity]] * legs.months[leg[annuity]] / 12.0)
        rows, left = rows_of_leg[annuity].astype(np.float64), after[annuity].astype(np.float64) + 1.0

        def part_left(periods: FloatArray) -> FloatArray:
            # Written with exponents that do not rise, whatever the sign of the interest.
            whole = np.expm1(-np.abs(growth) * rows)
            none = whole == 0.0  # no interest: repaid in equal parts
            ratio = np.expm1(-np.abs(growth) * periods) / np.where(none, 1.0, whole)
            ratio = ratio * np.exp(np.minimum(growth, 0.0) * (rows - periods))
            return np.asarray(np.where(none, periods / rows, ratio))

        outstanding[annuity] = nominal[annuity] * part_left(left)
        repaid[annuity] = outstanding[annuity] - nominal[annuity] * part_left(left - 1.0)
    return outstanding, repaid


def _interest(
    legs: Legs,
    leg: IntArray,
    outstanding: FloatArray,
    from_day: DateArray,
    when: DateArray,
    head: IntArray,
    own: Legs,
    is_regular: NDArray[np.bool_],
) -> tuple[FloatArray, FloatArray]:
    """Interest at the fixed rate or margin of each row, and the year fraction of each leg's first period."""
    per_year = 12 // legs.months
    bears = legs.pays_coupons
    interest = np.where(bears[leg], outstanding * legs.rate[leg] / per_year[leg], 0.0)
    # Floaters and swaps count the days of every period; bonds those of an odd first one.
    counted = np.flatnonzero((legs.is_floating | legs.is_swap)[leg] & (legs.count[leg] != ICMA))
    if counted.size:
        of_leg = leg[counted]
        years = accrual_fraction(
            from_day[counted],
            when[counted],
            code=legs.count[of_leg],
            maturity=legs.end[of_leg],
            months=legs.months[of_leg],
        )
        interest[counted] = outstanding[counted] * legs.rate[of_leg] * years
    fraction = accrual_fraction(
        from_day[head], when[head], code=own.count, maturity=own.end, months=own.months
    )
    by_days = (own.is_floating | own.is_swap) & (own.count != ICMA)
    fraction = np.where(is_regular & own.pays_coupons & ~by_days, own.months / 12.0, fraction)
    odd = ~is_regular | (~own.pays_coupons & (own.rate != 0.0) & ~np.isnat(own.start))
    rows = head[odd]
    interest[rows] = outstanding[rows] * own.rate[odd] * fraction[odd]
    return interest, fraction


def _running(
    own: Legs,
    head: IntArray,
    outstanding: FloatArray,
    begin: DateArray,
    first: DateArray,
    fraction: FloatArray,
    today: np.datetime64,
    day_count: DayCount,
    kept: NDArray[np.bool_],
) -> RunningPeriods:
    """The periods that have begun."""
    legs, rows = own.taken(np.flatnonzero(kept)), head[kept]
    day = np.full(rows.size, today)
    accrued = accrual_fraction(begin[kept], day, code=legs.count, maturity=legs.end, months=legs.months)
    ex_day = first[kept] - legs.ex_days.astype("m8[D]")
    is_ex = (legs.ex_days > 0) & (today >= ex_day) & legs.pays_coupons
    return RunningPeriods(
        holding=legs.holding,
        row=rows,
        nominal=outstanding[rows],
        rate=np.where(legs.is_floating, legs.current_rate, legs.rate),
        margin=np.where(legs.is_floating, legs.rate, 0.0),
        fraction=fraction[kept],
        accrued_fraction=accrued,
        length=year_fraction(begin[kept], first[kept], day_count),
        is_ex=is_ex,
        is_received=~(is_ex & legs.bought_ex),
    )


def _with_starts(columns: HoldingFlows, head: IntArray, begin: DateArray) -> HoldingFlows:
    """The flows with a row before each of `head` for the start of its floating leg."""
    size = columns.holding.size
    place = np.arange(size) + np.searchsorted(head, np.arange(size), side="right")
    at_start: dict[str, Any] = {
        "holding": columns.holding[head],
        "date": begin,
        "amount": 0.0,
        "interest": 0.0,
        "floating": 0.0,
        "outstanding": 0.0,
        "periods_after": 0,
        "is_start": True,
        "is_principal": False,
    }
    moved = {name: np.insert(getattr(columns, name), head, value) for name, value in at_start.items()}
    return replace(
        columns,
        **moved,
        period_row=np.where(moved["floating"] != 0.0, np.arange(size + head.size) - 1, -1),
        running=replace(columns.running, row=place[columns.running.row]),
    )


def _by_date(columns: HoldingFlows) -> HoldingFlows:
    """The rows of each holding in the order of their dates."""
    key = columns.holding * np.int64(2**32) + columns.date.astype(np.int64)
    order = np.argsort(key, kind="stable")
    place = np.empty_like(order)
    place[order] = np.arange(order.size)
    period_row = columns.period_row[order]
    moved = {
        name: getattr(columns, name)[order]
        for name in (
            "holding",
            "date",
            "amount",
            "interest",
            "floating",
            "outstanding",
            "periods_after",
            "is_start",
            "is_principal",
        )
    }
    return replace(
        columns,
        **moved,
        period_row=np.where(period_row >= 0, place[period_row], -1),
        running=replace(columns.running, row=place[columns.running.row]),
    )
