"""First estimates from a standing."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import numpy as np
import pytest

from desk.book import Basis, Book, FlowTable
from desk.rates.compounding import Compounding
from desk.valuation.estimates import key_rate_gap, surplus_change
from desk.valuation.standing import stand


def a_book(move: float) -> Book:
    basis = Basis(
        date(2031, 3, 31),
        "EUR",
        np.array([1.0, 30.0]),
        np.array([0.02, 0.03]) + move,
        compounding=Compounding.CONTINUOUS,
    )
    return Book(
        basis,
        FlowTable.build(["a", "a"], [10.0, 25.0], [100.0, 200.0]),
        asset_flows=FlowTable.build(["b"], [4.0], [210.0]),
    )


@pytest.mark.parametrize(("move", "tolerance"), [(1e-4, 1e-9), (-1e-4, 5e-3), (1e-6, 5e-3)])
def test_it_is_near_what_a_revaluation_gives(move: float, tolerance: float) -> None:
    # The DV01 is the fall for a whole basis point up: there the estimate is exact, about it nearly so.
    standing = stand(a_book(0.0))
    change = stand(a_book(move)).surplus - standing.surplus
    assert surplus_change(standing, move) == pytest.approx(change, rel=tolerance)


def test_it_follows_the_gap() -> None:
    standing = replace(stand(a_book(0.0)), dv01_gap=-0.5)
    assert surplus_change(standing, -0.01) == pytest.approx(-50.0)


def test_the_gaps_at_the_key_rates_add_up_to_the_gap() -> None:
    standing = stand(a_book(0.0))
    # Key-rate figures are of first order, the DV01 is not: see the record.
    assert float(key_rate_gap(standing.key_rates).sum()) == pytest.approx(standing.dv01_gap, rel=5e-3)
