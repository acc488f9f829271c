"""Day counts against a second implementation and the laws they keep."""

from __future__ import annotations

import calendar
from datetime import date, timedelta

import numpy as np
import pytest
import QuantLib as ql
from hypothesis import given
from hypothesis import strategies as st

from desk.rates.day_count import DateArray, DayCount, add_months, coupon_fraction, year_fraction

EVERY = list(DayCount)
THEIRS = {
    DayCount.ACT_365F: ql.Actual365Fixed(),
    DayCount.ACT_360: ql.Actual360(),
    DayCount.ACT_ACT_ISDA: ql.ActualActual(ql.ActualActual.ISDA),
    DayCount.THIRTY_360: ql.Thirty360(ql.Thirty360.BondBasis),
    DayCount.THIRTY_E_360: ql.Thirty360(ql.Thirty360.EurobondBasis),
    DayCount.THIRTY_E_360_ISDA: ql.Thirty360(ql.Thirty360.ISDA),
}
DATES = st.dates(date(1901, 1, 1), date(2199, 12, 30))


def _one(start: date, end: date, day_count: DayCount) -> float:
    return float(year_fraction(np.datetime64(start), np.datetime64(end), day_count))


@pytest.mark.parametrize("day_count", list(THEIRS))
def test_agrees_with_quantlib(day_count: DayCount) -> None:
    random = np.random.default_rng(3)
    start = np.datetime64("1990-01-01") + random.integers(0, 30_000, 1000)
    # Half of the pairs are thrown onto month ends, where conventions differ.
    start[::2] = start[::2].astype("M8[M]").astype("M8[D]") - np.timedelta64(1, "D")
    end = start + random.integers(0, 15_000, 1000)
    end[::3] = end[::3].astype("M8[M]").astype("M8[D]") - np.timedelta64(1, "D")
    end = np.maximum(start, end)
    ours = year_fraction(start, end, day_count)
    theirs = [
        THEIRS[day_count].yearFraction(ql.Date(str(one), "%Y-%m-%d"), ql.Date(str(two), "%Y-%m-%d"))
        for one, two in zip(start, end, strict=True)
    ]
    np.testing.assert_allclose(ours, theirs, rtol=1e-13, atol=1e-15)


def test_thirty_to_month_ends_agrees_with_quantlib_at_the_termination() -> None:
    random = np.random.default_rng(5)
    month = np.datetime64("1990-01", "M") + random.integers(0, 900, 600).astype("m8[M]")
    end = np.asarray(month.astype("M8[D]") - np.timedelta64(1, "D"), dtype="M8[D]")
    start = np.asarray(end - random.integers(1, 4000, 600).astype("m8[D]"), dtype="M8[D]")
    termination = np.where(random.random(600) < 0.5, end, end + np.timedelta64(30, "D"))
    ours = year_fraction(start, end, DayCount.THIRTY_E_360_ISDA, termination=termination)
    for one, two, last, years in zip(start, end, termination, ours, strict=True):
        first, second, ending = (ql.Date(str(day), "%Y-%m-%d") for day in (one, two, last))
        theirs = ql.Thirty360(ql.Thirty360.ISDA, ending)
        assert years == pytest.approx(theirs.yearFraction(first, second), abs=1e-15)


@pytest.mark.parametrize("frequency", [1, 2, 4, 12])
def test_coupon_fractions_agree_with_quantlib_on_schedules(frequency: int) -> None:
    """Regular coupons, short and long first ones, and accrued parts of them."""
    theirs = ql.ActualActual(ql.ActualActual.ISMA)
    random = np.random.default_rng(frequency)
    count, months = 400, 12 // frequency
    first = np.datetime64("2000-01", "M") + random.integers(0, 660, count)
    # The days that every month has: how a schedule passes the others is another matter.
    closing = np.asarray(first.astype("M8[D]") + random.integers(0, 28, count), dtype="M8[D]")
    opening = add_months(closing, -months)
    reach = random.uniform(0.0, 2.9, count) * (closing - opening).astype(float)
    start = closing - np.maximum(reach, 1.0).astype("m8[D]")
    ours = coupon_fraction(start, closing, period_start=opening, period_end=closing, frequency=frequency)
    for place in range(count):
        days = [ql.Date(str(day[place]), "%Y-%m-%d") for day in (start, closing, opening, closing)]
        assert ours[place] == pytest.approx(theirs.yearFraction(*days), rel=1e-13)


@given(DATES, DATES, DATES, st.sampled_from([1, 2, 3, 4, 6, 12]), st.integers(0, 40))
def test_coupon_fractions_add_up(
    start: date, middle: date, opening: date, frequency: int, periods: int
) -> None:
    begin = np.asarray(opening.replace(day=min(opening.day, 28)), dtype="M8[D]")
    closing = add_months(begin, 12 // frequency)
    first, second = np.asarray(start, dtype="M8[D]"), np.asarray(middle, dtype="M8[D]")
    later = add_months(begin, periods * 12 // frequency)

    def between(one: DateArray, two: DateArray) -> float:
        years = coupon_fraction(one, two, period_start=begin, period_end=closing, frequency=frequency)
        return float(years)

    whole = between(first, later)
    assert whole == pytest.approx(between(first, second) + between(second, later), abs=1e-11)
    assert whole == -between(later, first)
    # Whole periods are whole parts of a year.
    assert between(begin, later) == pytest.approx(periods / frequency, abs=1e-13)


def test_coupon_fractions_refuse_what_is_no_period() -> None:
    day = np.datetime64("2026-06-30")
    with pytest.raises(ValueError, match="frequency"):
        coupon_fraction(day, day, period_start=day, period_end=day + np.timedelta64(181, "D"), frequency=5)
    with pytest.raises(ValueError, match="period_end"):
        coupon_fraction(day, day, period_start=day, period_end=day, frequency=2)


def test_icma_without_a_coupon_counts_anniversaries() -> None:
    ends = np.array(["2027-06-30", "2031-06-30", "2026-12-31", "2025-06-30"], dtype="M8[D]")
    years = year_fraction(np.datetime64("2026-06-30"), ends, DayCount.ACT_ACT_ICMA)
    np.testing.assert_allclose(years, [1.0, 5.0, 184.0 / 365.0, -1.0], rtol=1e-14)


@given(DATES, DATES)
def test_actual_actual_day_by_day(start: date, end: date) -> None:
    first, last = min(start, end), min(max(start, end), min(start, end) + timedelta(days=1500))
    total, day = 0.0, first
    while day < last:
        total += 1.0 / (366 if calendar.isleap(day.year) else 365)
        day += timedelta(days=1)
    assert _one(first, last, DayCount.ACT_ACT_ISDA) == pytest.approx(total, abs=1e-11)
    assert _one(last, first, DayCount.ACT_ACT_ISDA) == pytest.approx(-total, abs=1e-11)


@given(DATES, DATES, st.sampled_from([DayCount.ACT_365F, DayCount.ACT_360, DayCount.ACT_ACT_ISDA]))
def test_actual_counts_turn_round_and_add_up(start: date, end: date, day_count: DayCount) -> None:
    middle = date(2024, 2, 29)
    there = _one(start, end, day_count)
    assert there == -_one(end, start, day_count)
    parts = _one(start, middle, day_count) + _one(middle, end, day_count)
    assert there == pytest.approx(parts, abs=1e-11)


def test_broadcasts_and_marks_what_is_no_date() -> None:
    ends = np.array([["2027-06-30", "NaT"], ["2028-06-30", "2026-06-30"]], dtype="M8[D]")
    for day_count in EVERY:
        years = year_fraction(np.datetime64("2026-06-30"), ends, day_count)
        assert years.shape == (2, 2)
        np.testing.assert_array_equal(np.isnan(years), [[False, True], [False, False]])
        assert years[1, 1] == 0.0
