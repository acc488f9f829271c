"""Act/Act ICMA and 30E/360 ISDA against published figures."""

from __future__ import annotations

import numpy as np
import pytest

from desk.rates.day_count import DayCount, coupon_fraction, year_fraction

# ISDA, "The Actual/Actual Day Count Fraction" (memorandum, 1999), following EMU and Market Conventions
# (1998): start, end, the regular period, coupons a year, fraction by the ISMA (now ICMA) method.
ICMA = [
    ("2003-11-01", "2004-05-01", "2003-11-01", "2004-05-01", 2, 0.5),
    ("1999-02-01", "1999-07-01", "1998-07-01", "1999-07-01", 1, 0.41095890411),
    ("1999-07-01", "2000-07-01", "1999-07-01", "2000-07-01", 1, 1.0),
    ("2002-08-15", "2003-07-15", "2003-01-15", "2003-07-15", 2, 0.915760869565),
    ("1999-07-30", "2000-01-30", "1999-07-30", "2000-01-30", 2, 0.5),
]

# ISDA, 30/360 day count conventions, worked spreadsheet (2008), as carried in the QuantLib test suite: days
# of 30E/360 ISDA with the termination date in the last column.
MONTH_ENDS = [
    ("2006-08-20", "2007-02-20", 180, "2012-02-29"),
    ("2006-08-31", "2007-02-28", 180, "2012-02-29"),
    ("2007-02-28", "2007-08-31", 180, "2012-02-29"),
    ("2007-08-31", "2008-02-29", 180, "2012-02-29"),
    ("2008-02-29", "2008-08-31", 180, "2012-02-29"),
    ("2006-01-31", "2006-02-28", 30, "2009-02-28"),
    ("2006-01-30", "2006-02-28", 30, "2009-02-28"),
    ("2006-02-28", "2006-03-03", 3, "2009-02-28"),
    ("2006-02-14", "2006-02-28", 16, "2009-02-28"),
]


@pytest.mark.parametrize(("start", "end", "opening", "closing", "frequency", "years"), ICMA)
def test_actual_actual_icma(
    start: str, end: str, opening: str, closing: str, frequency: int, years: float
) -> None:
    found = coupon_fraction(
        np.datetime64(start),
        np.datetime64(end),
        period_start=np.datetime64(opening),
        period_end=np.datetime64(closing),
        frequency=frequency,
    )
    assert found == pytest.approx(years, abs=1e-11)


def test_a_long_first_period_counts_from_either_regular_period() -> None:
    """The regular period before is as good a place to count from: 153/(184 · 2) + 181/(181 · 2)."""
    found = coupon_fraction(
        np.datetime64("2002-08-15"),
        np.datetime64("2003-07-15"),
        period_start=np.datetime64("2002-07-15"),
        period_end=np.datetime64("2003-01-15"),
        frequency=2,
    )
    assert found == pytest.approx(0.915760869565, abs=1e-11)


@pytest.mark.parametrize(("start", "end", "days", "termination"), MONTH_ENDS)
def test_thirty_day_months_to_month_ends(start: str, end: str, days: int, termination: str) -> None:
    found = year_fraction(
        np.datetime64(start),
        np.datetime64(end),
        DayCount.THIRTY_E_360_ISDA,
        termination=np.datetime64(termination),
    )
    assert 360.0 * found == pytest.approx(days, abs=1e-9)


def test_the_termination_date_at_the_end_of_february_keeps_its_days() -> None:
    """ISDA 2006 Definitions, section 4.16(h): the last day of February is the 30th, save at the end."""
    start, end = np.datetime64("2011-08-31"), np.datetime64("2012-02-29")
    whole = year_fraction(start, end, DayCount.THIRTY_E_360_ISDA)
    ended = year_fraction(start, end, DayCount.THIRTY_E_360_ISDA, termination=end)
    assert 360.0 * whole == pytest.approx(180.0, abs=1e-9)
    assert 360.0 * ended == pytest.approx(179.0, abs=1e-9)
