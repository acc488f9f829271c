"""Day counts and compounding against published figures."""

from __future__ import annotations

import numpy as np
import pytest

from desk.rates.compounding import Compounding, from_continuous, to_continuous
from desk.rates.day_count import DayCount, year_fraction

# ISDA, "The Actual/Actual Day Count Fraction" (memorandum, 1999), following EMU and Market Conventions
# (1998): the figures of its ISDA method.
ACT_ACT = [
    ("2003-11-01", "2004-05-01", 0.497724380567),
    ("1999-02-01", "1999-07-01", 0.41095890411),
    ("1999-07-01", "2000-07-01", 1.0013773486),
    ("2002-08-15", "2003-07-15", 0.915068493151),
    ("1999-07-30", "2000-01-30", 0.503892506924),
]

# ISDA, 30/360 day count conventions, worked spreadsheet (2008), as carried in the QuantLib test suite:
# days of 30/360 (bond basis) and of 30E/360.
THIRTY = [
    ("2006-08-20", "2007-02-20", 180, 180),
    ("2006-08-31", "2007-02-28", 178, 178),
    ("2007-02-28", "2007-08-31", 183, 182),
    ("2007-08-31", "2008-02-29", 179, 179),
    ("2008-02-29", "2008-08-31", 182, 181),
    ("2006-01-31", "2006-02-28", 28, 28),
    ("2006-01-30", "2006-02-28", 28, 28),
    ("2006-02-28", "2006-03-03", 5, 5),
    ("2006-02-14", "2006-02-28", 14, 14),
]

# YEARFRAC: Microsoft Excel function reference (2012 dates); Apple Numbers function reference (2009-2010);
# Apache OpenOffice documentation (2007 and 2008 dates); ExcelFinancialFunctions test data, values produced
# by Excel (1995-1998). Basis 0 is 30/360, 1 Act/Act, 2 Act/360, 3 Act/365, 4 30E/360. Basis 0 departs from
# the bond basis only where the first date is the end of February, basis 1 from the ISDA method only over
# years of different length: such dates are not among these.
YEAR_FRACTIONS = [
    ("2012-01-01", "2012-07-30", DayCount.THIRTY_360, 0.58055556, 5e-9),
    ("2012-01-01", "2012-07-30", DayCount.ACT_ACT_ISDA, 0.57650273, 5e-9),
    ("2012-01-01", "2012-07-30", DayCount.ACT_365F, 0.57808219, 5e-9),
    ("2009-12-15", "2010-06-30", DayCount.THIRTY_360, 0.541666666666667, 1e-14),
    ("2009-12-15", "2010-06-30", DayCount.ACT_ACT_ISDA, 0.53972602739726, 1e-14),
    ("2009-12-15", "2010-06-30", DayCount.ACT_360, 0.547222222222222, 1e-14),
    ("2009-12-15", "2010-06-30", DayCount.ACT_365F, 0.53972602739726, 1e-14),
    ("2009-12-15", "2010-06-30", DayCount.THIRTY_E_360, 0.541666666666667, 1e-14),
    ("2007-01-01", "2009-07-01", DayCount.THIRTY_360, 2.5, 5e-13),
    ("2008-01-01", "2008-07-01", DayCount.ACT_365F, 0.498630136986, 5e-13),
    ("1995-03-01", "1998-03-31", DayCount.THIRTY_360, 3.083333333333, 6e-12),
    ("1995-03-01", "1998-03-31", DayCount.ACT_360, 3.127777777778, 6e-12),
    ("1995-03-01", "1998-03-31", DayCount.ACT_365F, 3.084931506849, 6e-12),
    ("1995-03-01", "1998-03-31", DayCount.THIRTY_E_360, 3.080555555556, 6e-12),
]


def _years(start: str, end: str, day_count: DayCount) -> float:
    return float(year_fraction(np.datetime64(start), np.datetime64(end), day_count))


@pytest.mark.parametrize(("start", "end", "years"), ACT_ACT)
def test_actual_actual_isda(start: str, end: str, years: float) -> None:
    assert _years(start, end, DayCount.ACT_ACT_ISDA) == pytest.approx(years, abs=1e-11)


@pytest.mark.parametrize(("start", "end", "bond_basis", "european"), THIRTY)
def test_thirty_day_months(start: str, end: str, bond_basis: int, european: int) -> None:
    assert 360.0 * _years(start, end, DayCount.THIRTY_360) == pytest.approx(bond_basis, abs=1e-9)
    assert 360.0 * _years(start, end, DayCount.THIRTY_E_360) == pytest.approx(european, abs=1e-9)


@pytest.mark.parametrize(("start", "end", "day_count", "years", "tolerance"), YEAR_FRACTIONS)
def test_year_fractions_of_spreadsheets(
    start: str, end: str, day_count: DayCount, years: float, tolerance: float
) -> None:
    assert _years(start, end, day_count) == pytest.approx(years, abs=tolerance)


# Haug, E.G., The Complete Guide to Option Pricing Formulas, 1st edition, pp. 181-182, as carried in the
# QuantLib test suite.
@pytest.mark.parametrize(
    ("rate", "stated", "wanted", "printed"),
    [
        (0.08, Compounding.QUARTERLY, Compounding.CONTINUOUS, 0.0792),
        (0.12, Compounding.CONTINUOUS, Compounding.ANNUAL, 0.1275),
        (0.08, Compounding.QUARTERLY, Compounding.ANNUAL, 0.0824),
        (0.07, Compounding.QUARTERLY, Compounding.SEMI_ANNUAL, 0.0706),
    ],
)
def test_compounding(rate: float, stated: Compounding, wanted: Compounding, printed: float) -> None:
    found = from_continuous(to_continuous(rate, stated), wanted)
    assert found == pytest.approx(printed, abs=5e-5)
