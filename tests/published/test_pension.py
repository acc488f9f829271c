"""Pension and annuity figures."""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest

from desk.book import Basis, Book, FlowTable
from desk.rates.compounding import Compounding, to_continuous
from desk.rates.curve import Curve
from desk.valuation.measures import measure, value_rows
from desk.valuation.standing import stand


def _flat(rate: float) -> Curve:
    return Curve([1.0], to_continuous([rate], Compounding.ANNUAL))


# Institute and Faculty of Actuaries, Formulae and Tables for Examinations (2002), compound interest tables
# (from memory).
@pytest.mark.parametrize(
    ("years", "rate", "immediate", "due", "accumulated", "discount", "increasing"),
    [
        (10, 0.04, 8.1109, 8.4353, 12.0061, 0.675564, 41.9922),
        (20, 0.05, 12.4622, 13.0853, 33.066, 0.376889, 110.9506),
    ],
)
def test_annuities_certain(
    years: int,
    rate: float,
    immediate: float,
    due: float,
    accumulated: float,
    discount: float,
    increasing: float,
) -> None:
    curve = _flat(rate)
    ends = np.arange(1.0, years + 1.0)

    def worth(times: np.ndarray, amounts: np.ndarray) -> float:
        return measure(value_rows(times, amounts, curve=curve)).present_value

    ones = np.ones(years)
    assert worth(ends, ones) == pytest.approx(immediate, abs=5.1e-5)
    assert worth(ends - 1.0, ones) == pytest.approx(due, abs=5.1e-5)
    assert worth(ends, ones) / curve.discount(years) == pytest.approx(accumulated, abs=5.1e-5)
    assert curve.discount(years) == pytest.approx(discount, abs=5.1e-7)
    assert worth(ends, ends) == pytest.approx(increasing, abs=5.1e-5)


def test_duration_of_pension_payments() -> None:
    """Bodie, Z., Kane, A. and Marcus, A.J., Investments, chapter 16 problem (from memory)."""
    found = measure(value_rows([1.0, 2.0, 3.0], [1.0, 2.0, 1.0], curve=_flat(0.1)))
    assert found.macaulay_duration == pytest.approx(1.9523, abs=1e-4)


def test_single_equivalent_rate() -> None:
    """Hull, J.C., Options, Futures, and Other Derivatives, chapter 4, bond yield (the yield from memory):
    the one rate that gives flows the value they have on a zero curve."""
    times = [0.5, 1.0, 1.5, 2.0]
    curve = Curve(times, [0.05, 0.058, 0.064, 0.068])
    found = measure(value_rows(times, [3.0, 3.0, 3.0, 103.0], curve=curve))
    single = to_continuous(found.equivalent_rate, Compounding.ANNUAL)
    assert single == pytest.approx(0.0676, abs=5e-5)


def test_funding_ratio_and_its_first_order_change() -> None:
    """By definition: A (1 - D_A Δ) / (L (1 - D_L Δ)) with A = 90, L = 100, durations 8 and 16, Δ = -1 %."""
    rate = 0.03
    basis = Basis(date(2026, 6, 30), "GBP", np.array([1.0]), np.array([rate]))
    book = Book(
        basis,
        FlowTable.build(["pensions"], [16.0], [100.0 * (1.0 + rate) ** 16]),
        (),
        FlowTable.build(["bonds"], [8.0], [90.0 * (1.0 + rate) ** 8]),
    )
    standing = stand(book)
    assert standing.funding_ratio == pytest.approx(0.9, abs=1e-12)
    moved = [
        side.present_value * (1.0 - side.effective_duration * -0.01)
        for side in (standing.assets, standing.liabilities)
    ]
    assert moved[0] / moved[1] == pytest.approx(0.8379310344827587, abs=1e-12)
