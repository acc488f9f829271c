"""Day counts against a second implementation and the laws they keep."""

from __future__ import annotations

import calendar
from datetime import date, timedelta

import numpy as np
import pytest
import QuantLib as ql
from hypothesis import given
from hypothesis import strategies as st

from desk.rates.day_count import DayCount, year_fraction

EVERY = list(DayCount)
THEIRS = {
    DayCount.ACT_365F: ql.Actual365Fixed(),
    DayCount.ACT_360: ql.Actual360(),
    DayCount.ACT_ACT_ISDA: ql.ActualActual(ql.ActualActual.ISDA),
    DayCount.THIRTY_360: ql.Thirty360(ql.Thirty360.BondBasis),
    DayCount.THIRTY_E_360: ql.Thirty360(ql.Thirty360.EurobondBasis),
}
DATES = st.dates(date(1901, 1, 1), date(2199, 12, 30))


def _one(start: date, end: date, day_count: DayCount) -> float:
    return float(year_fraction(np.datetime64(start), np.datetime64(end), day_count))


@pytest.mark.parametrize("day_count", EVERY)
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
