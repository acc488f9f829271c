"""Year fractions on a schedule counted back from a maturity."""

from __future__ import annotations

import numpy as np
import pytest

from desk.book.accrual import ICMA, accrual_fraction, day_count_codes, period_around, periods_left
from desk.rates.day_count import DayCount, add_months, coupon_fraction, year_fraction

COUNT = 500
START = np.datetime64("2019-01-01")


def _cases() -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    random = np.random.default_rng(8)
    first = START + random.integers(0, 3000, COUNT)
    last = first + random.integers(1, 800, COUNT)
    maturity = last + random.integers(0, 4000, COUNT)
    return first, last, maturity, random.choice([1, 3, 6, 12], COUNT)


def test_a_day_lies_in_its_period() -> None:
    day, _, maturity, months = _cases()
    number, first, last = period_around(day, maturity=maturity, months=months)
    assert (first <= day).all()
    assert (day < last).all()
    np.testing.assert_array_equal(first, add_months(maturity, -number * months))
    np.testing.assert_array_equal(last, add_months(maturity, -(number - 1) * months))
    # The last period begins one period before the maturity; at the maturity the next one begins.
    number, first, _ = period_around(maturity, maturity=maturity, months=months)
    assert (number == 0).all()
    np.testing.assert_array_equal(first, maturity)


def test_periods_left_fall_from_day_to_day() -> None:
    day, _, maturity, months = _cases()
    left = periods_left(day, maturity=maturity, months=months)
    next_day = np.asarray(day + np.timedelta64(1, "D"), dtype="M8[D]")
    later = periods_left(next_day, maturity=maturity, months=months)
    assert (later < left).all()
    assert (left - later <= 1.0 / 28.0 + 1e-12).all()


def test_act_act_icma_is_that_of_the_day_counts_where_no_month_end_is_clipped() -> None:
    first, last, maturity, months = _cases()
    maturity = maturity - (maturity - maturity.astype("M8[M]").astype("M8[D]")) + np.timedelta64(14, "D")
    maturity = np.maximum(maturity, add_months(maturity, np.where(maturity < last, 1, 0)))
    found = accrual_fraction(first, last, code=np.full(COUNT, ICMA), maturity=maturity, months=months)
    expected = coupon_fraction(
        first, last, period_start=add_months(maturity, -months), period_end=maturity, frequency=12 // months
    )
    np.testing.assert_allclose(found, expected, rtol=1e-12)


@pytest.mark.parametrize("day_count", [count for count in DayCount if count is not DayCount.ACT_ACT_ICMA])
def test_other_day_counts_are_taken_as_they_are(day_count: DayCount) -> None:
    first, last, maturity, months = _cases()
    code = day_count_codes([day_count, None, DayCount.ACT_ACT_ICMA])
    assert code[1] == code[2] == ICMA
    found = accrual_fraction(first, last, code=np.full(COUNT, code[0]), maturity=maturity, months=months)
    np.testing.assert_array_equal(found, year_fraction(first, last, day_count, termination=maturity))
