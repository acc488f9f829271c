"""Lines opened into their flows."""

from __future__ import annotations

import numpy as np
import pytest

from desk.book import Side
from desk.valuation.detail import line_flows
from desk.valuation.standing import stand
from tests.valuation.books import small_book


@pytest.mark.parametrize("side", list(Side))
def test_every_line_opens_into_what_it_is_worth(side: Side) -> None:
    book = small_book()
    lines = [line for line in stand(book).lines if line.side is side]
    for number, line in enumerate(lines):
        detail = line_flows(book, side, number)
        assert detail.present_value.sum() == pytest.approx(line.measures.present_value, rel=1e-13)
        np.testing.assert_allclose(detail.amount * detail.discount_factor, detail.present_value, rtol=1e-15)
        if line.kind != "fund":
            assert detail.time.size == line.flow_count
        if line.kind not in ("fund", "flows"):
            days = (detail.date - np.datetime64(book.basis.valuation_date)).astype(float)
            np.testing.assert_allclose(detail.time, days / 365.0, rtol=1e-15)


def test_the_spread_is_in_the_discount_factor() -> None:
    book = small_book()
    spread = stand(book).lines[0].spread
    assert spread is not None
    detail = line_flows(book, Side.ASSETS, 0)
    expected = book.basis.curve.discount(detail.time) * np.exp(-spread * detail.time)
    np.testing.assert_allclose(detail.discount_factor, expected, rtol=1e-13)


@pytest.mark.parametrize("number", [-1, 11])
def test_no_such_line(number: int) -> None:
    with pytest.raises(IndexError, match=f"`line_number` must be from 0 to 9, not {number}"):
        line_flows(small_book(), Side.ASSETS, number)
