"""Durations, DV01 and key rates of expected inflation, by revaluing on moved curves in plain Python."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace
from datetime import date

import numpy as np
import pytest

from desk.book import (
    Book,
    FlowTable,
    Holding,
    HoldingKind,
    Indexation,
    IndexationKind,
    Inflation,
    LineTerms,
    PricedFlows,
    Side,
)
from desk.rates.curve import Interpolation
from desk.valuation.inflation_moves import inflation_moves
from desk.valuation.priced import priced_flows
from desk.valuation.records import InflationStanding, Standing
from desk.valuation.standing import stand
from tests.valuation.books import TODAY, basis, flat_basis
from tests.valuation.plain import KEYS
from tests.valuation.plain import discount as plain_discount
from tests.valuation.plain_inflation import Index, bumped, growth, index

LINKED, COLLARED, RISING = IndexationKind.LINKED, IndexationKind.COLLARED, IndexationKind.RISING
INFLATION = Inflation(
    np.array([1.0, 2.0, 5.0, 10.0, 30.0]),
    np.array([0.031, 0.027, 0.022, 0.024, 0.026]),
    volatility=0.013,
)
TERMS = {
    "linked": Indexation(LINKED),
    "lagged": Indexation(LINKED, lag=0.25),
    "long lag": Indexation(LINKED, lag=1.75, least=1.05),
    "collared": Indexation(COLLARED, floor=0.0, cap=0.05),
    "tight": Indexation(COLLARED, floor=0.02, cap=0.03, lag=0.25),
    "rising": Indexation(RISING, rise=0.02),
    "fixed": Indexation(),
}


def _table(random: np.random.Generator) -> FlowTable:
    lines = [name for name in TERMS for _ in range(9)]
    return FlowTable.build(
        lines,
        np.concatenate(
            [[0.1, 1.0, 2.0, 0.5 + 60.0 * random.random(), *(50.0 * random.random(5))] for _ in TERMS]
        ),
        random.uniform(-2.0, 10.0, len(lines)),
    )


def _book(inflation: Inflation = INFLATION) -> Book:
    random = np.random.default_rng(5)
    terms = tuple(LineTerms(side, name, indexation) for side in Side for name, indexation in TERMS.items())
    return Book(
        replace(basis(), inflation=inflation),
        _table(random),
        (),
        _table(random),
        line_terms=terms,
    )


def _worth(book: Book, side: Side, on: Index, *, line: int | None = None) -> float:
    """Present value of a side, or of one line, for a given index."""
    table = book.liabilities if side is Side.LIABILITIES else book.asset_flows
    spread = 0.004 if side is Side.LIABILITIES else 0.0
    total = 0.0
    for row in range(len(table)):
        if line is not None and table.line[row] != line:
            continue
        time, kind = float(table.time[row]), TERMS[table.line_names[table.line[row]]]
        factor = plain_discount(book, time) * math.exp(-spread * time)
        total += float(table.amount[row]) * factor * growth(kind, time, on, 0.013)
    return total


def _parallel(size: float) -> Callable[[float], float]:
    """The same move at every time."""
    return lambda _: size


def _inflation(book: Book) -> tuple[Standing, InflationStanding]:
    standing = stand(book)
    assert standing.inflation is not None
    return standing, standing.inflation


def test_durations_are_derivatives() -> None:
    """Central differences of a revaluation whose collars are integrated numerically."""
    book, step = _book(), 1e-4
    standing, found = _inflation(book)
    for side, duration in (
        (Side.ASSETS, found.assets_duration),
        (Side.LIABILITIES, found.liabilities_duration),
    ):
        up, down = (_worth(book, side, index(INFLATION, _parallel(way))) for way in (step, -step))
        base = _worth(book, side, index(INFLATION))
        total = standing.assets if side is Side.ASSETS else standing.liabilities
        assert total.present_value == pytest.approx(base, rel=1e-9)
        assert duration == pytest.approx((up - down) / (2.0 * step) / base, rel=2e-5)
    gap = found.assets_duration - found.liabilities_duration / standing.funding_ratio
    assert found.real_duration_gap == pytest.approx(gap, rel=1e-12)


def test_dv01_is_a_whole_revaluation() -> None:
    book = _book()
    standing, found = _inflation(book)
    moved = index(INFLATION, _parallel(1e-4))
    for side, dv01 in ((Side.ASSETS, found.dv01_assets), (Side.LIABILITIES, found.dv01_liabilities)):
        rise = _worth(book, side, moved) - _worth(book, side, index(INFLATION))
        assert dv01 == pytest.approx(rise, rel=1e-6)
        lines = [line for line in standing.lines if line.side is side]
        assert sum(line.inflation_dv01 or 0.0 for line in lines) == pytest.approx(dv01, rel=1e-12)
        for number, line in enumerate(lines):
            rise = _worth(book, side, moved, line=number) - _worth(book, side, index(INFLATION), line=number)
            assert line.inflation_dv01 == pytest.approx(rise, rel=1e-6, abs=1e-9)
            if line.line in ("rising", "fixed"):
                assert line.inflation_dv01 == 0.0
    assert found.dv01_gap == found.dv01_assets - found.dv01_liabilities


def test_key_rates_are_moves_of_one_key_and_sum_to_the_duration() -> None:
    book, step = _book(), 1e-5
    _, found = _inflation(book)
    side, keys = Side.LIABILITIES, list(KEYS)
    base = _worth(book, side, index(INFLATION))
    assert found.term.tolist() == keys
    for number in range(len(keys)):
        up, down, whole = (
            _worth(book, side, index(INFLATION, bumped(keys, number, way))) for way in (step, -step, 1e-4)
        )
        slope = (up - down) / (2.0 * step) / base
        assert found.key_liabilities[number] == pytest.approx(slope, rel=1e-5, abs=2e-6)
        assert found.key_dv01_liabilities[number] == pytest.approx(whole - base, rel=1e-6, abs=1e-8)
    assert found.key_liabilities.sum() == pytest.approx(found.liabilities_duration, rel=1e-12)
    assert found.key_assets.sum() == pytest.approx(found.assets_duration, rel=1e-12)


def test_linked_without_a_lag_the_duration_is_that_of_time() -> None:
    """Growth by a zero rate of inflation undoes discounting by a zero rate: the two durations are one."""
    table = FlowTable.build(["linked"] * 3, [1.0, 7.3, 31.0], [5.0, 6.0, 7.0])
    terms = (LineTerms(Side.LIABILITIES, "linked", Indexation(LINKED)),)
    standing, found = _inflation(Book(replace(basis(), inflation=INFLATION), table, line_terms=terms))
    assert found.liabilities_duration == pytest.approx(standing.liabilities.effective_duration, rel=1e-13)
    np.testing.assert_allclose(found.key_liabilities, standing.key_rates.liabilities, rtol=1e-12, atol=1e-14)
    assert math.isnan(found.assets_duration)
    assert math.isnan(found.real_duration_gap)
    assert np.isnan(found.key_assets).all()


def test_a_collar_lies_between_fixed_and_linked() -> None:
    def duration(kind: Indexation) -> float:
        table = FlowTable.build(["line"] * 40, np.arange(1.0, 41.0), np.ones(40))
        terms = (LineTerms(Side.LIABILITIES, "line", kind),)
        return _inflation(Book(replace(basis(), inflation=INFLATION), table, line_terms=terms))[
            1
        ].liabilities_duration

    narrow, wide = (
        duration(Indexation(COLLARED, floor=low, cap=high)) for low, high in ((0.015, 0.03), (0.0, 0.05))
    )
    assert 0.0 == duration(Indexation()) == duration(Indexation(COLLARED, floor=0.02, cap=0.02))
    assert 0.0 < narrow < wide < duration(Indexation(LINKED))
    assert duration(Indexation(COLLARED)) == pytest.approx(duration(Indexation(LINKED)), rel=1e-12)


def test_a_linker_hedges_a_linked_line() -> None:
    """The same real payments on both sides at no spread: no inflation gap, in total and at every key."""
    holding = Holding(
        "linker",
        HoldingKind.LINKED_BOND,
        100.0,
        0.02,
        1,
        date(2040, 6, 30),
        index_ratio=1.2,
        index_lag_months=0,
    )
    days = [(date(2026 + year, 6, 30) - TODAY).days for year in range(1, 15)]
    real = 1.2 * (np.full(14, 2.0) + np.where(np.arange(14) == 13, 100.0, 0.0))
    book = Book(
        replace(basis(spread=0.0), inflation=INFLATION),
        FlowTable.build(["pensions"] * 14, np.array(days) / 365.0, real),
        (holding,),
        line_terms=(LineTerms(Side.LIABILITIES, "pensions", Indexation(LINKED)),),
    )
    standing, found = _inflation(book)
    assert standing.surplus == pytest.approx(0.0, abs=1e-10)
    assert found.dv01_assets > 0.05
    assert found.dv01_gap == pytest.approx(0.0, abs=1e-12)
    assert found.real_duration_gap == pytest.approx(0.0, abs=1e-12)
    np.testing.assert_allclose(found.key_dv01_assets, found.key_dv01_liabilities, atol=1e-12)
    np.testing.assert_allclose(found.real_periods.net, 0.0, atol=1e-12)
    paid = found.real_periods.assets
    np.testing.assert_allclose(paid[paid != 0.0], real, rtol=1e-12)  # a leap day leaves one year without
    # The same in fixed money is no hedge.
    fixed = replace(holding, kind=HoldingKind.BOND, index_ratio=1.0)
    _, unhedged = _inflation(replace(book, holdings=(fixed,)))
    assert unhedged.dv01_gap == -found.dv01_liabilities
    assert unhedged.real_duration_gap < -10.0


def test_real_periods_are_over_the_expected_index() -> None:
    """2 % inflation: 100 fixed at 3 years is 100 / 1.02³ in today's money, a linked 100 is 100."""
    inflation = Inflation(np.array([1.0]), np.array([0.02]))
    book = Book(
        replace(flat_basis(), inflation=inflation),
        FlowTable.build(["fixed", "linked"], [3.0, 2.0], [100.0, 100.0]),
        line_terms=(LineTerms(Side.LIABILITIES, "linked", Indexation(LINKED)),),
    )
    standing, found = _inflation(book)
    np.testing.assert_allclose(found.real_periods.liabilities, [0.0, 100.0, 100.0 / 1.02**3], rtol=1e-13)
    np.testing.assert_allclose(standing.periods.liabilities, [0.0, 100.0 * 1.02**2, 100.0], rtol=1e-13)
    np.testing.assert_allclose(found.real_periods.cumulative, np.cumsum(-found.real_periods.liabilities))


def test_nominal_durations_keep_the_expected_amounts() -> None:
    """A move of nominal rates leaves expected inflation where it is."""
    book = _book()
    standing, _ = _inflation(book)
    flows = priced_flows(book, Side.LIABILITIES).flows
    curve = book.basis.curve
    worth, moved = (
        float(np.sum(flows.spread_discounted * curve.discount(flows.time) * np.exp(-move * flows.time)))
        for move in (0.0, 1e-4)
    )
    assert standing.liabilities.dv01 == pytest.approx(worth - moved, rel=1e-9)


def _flows(time: np.ndarray, kinds: list[Indexation], of_row: np.ndarray) -> PricedFlows:
    return PricedFlows(
        Side.LIABILITIES,
        ("line",),
        np.zeros(time.size, dtype=int),
        time,
        np.ones(time.size),
        np.zeros(time.size),
        np.ones(time.size, dtype=bool),
        real_amount=np.ones(time.size),
        index_class=of_row,
        indexations=tuple(kinds),
    )


def test_sums_by_year_give_what_row_by_row_gives(monkeypatch: pytest.MonkeyPatch) -> None:
    random = np.random.default_rng(6)
    time, of_row = random.uniform(0.0, 70.0, 4000), random.integers(0, 4, 4000)
    value = random.normal(1.0, 1.0, 4000)
    kinds = [Indexation(COLLARED, floor=0.0, cap=0.02 + 0.01 * number) for number in range(4)]
    flows = _flows(time, kinds, of_row)
    quick = inflation_moves(flows, value, INFLATION)
    monkeypatch.setattr("desk.valuation.inflation_moves._SMALL", 0.0)
    plain = inflation_moves(flows, value, INFLATION)
    np.testing.assert_allclose(quick.dv01, plain.dv01, rtol=1e-10, atol=1e-13 * np.abs(value).sum())
    np.testing.assert_array_equal(quick.slope, plain.slope)


def test_beyond_the_table_of_years_every_row_is_revalued() -> None:
    time = np.array([3.0, 1200.0, 4000.5])
    flows = _flows(time, [Indexation(COLLARED, floor=-0.5, cap=0.5)], np.zeros(3, dtype=int))
    found = inflation_moves(flows, np.ones(3), replace(INFLATION, volatility=0.0))
    assert found.line_dv01[0] == pytest.approx(np.expm1(1e-4 * time).sum(), rel=1e-9)
    assert found.dv01[-1] == pytest.approx(np.expm1(1e-4 * time[1:]).sum(), rel=1e-9)


def test_what_is_known_already_does_not_move() -> None:
    """Within the lag a payment is fixed, whatever is expected."""
    flows = _flows(np.array([0.1, 0.25]), [Indexation(LINKED, lag=0.25)], np.zeros(2, dtype=int))
    found = inflation_moves(flows, np.ones(2), INFLATION)
    assert found.line_dv01.tolist() == [0.0]
    assert not found.slope.any()


@pytest.mark.parametrize("volatility", [0.0, 0.01, 10.0])
@pytest.mark.parametrize("rate", [-0.5, -0.01, 0.0, 3.0])
@pytest.mark.parametrize("interpolation", list(Interpolation))
def test_hostile_inflation_gives_figures(
    volatility: float, rate: float, interpolation: Interpolation
) -> None:
    inflation = Inflation(np.array([0.5, 9.0]), np.array([rate, rate]), interpolation, volatility=volatility)
    standing, found = _inflation(_book(inflation))
    for figure in (found.dv01_assets, found.dv01_liabilities, standing.surplus, found.real_duration_gap):
        assert math.isfinite(figure)
    assert np.isfinite(found.key_dv01_assets).all()
    assert found.key_assets.sum() == pytest.approx(found.assets_duration, rel=1e-9)


@pytest.mark.parametrize("rate", [-0.999999, 0.0, 1e300])
@pytest.mark.parametrize("recent", [None, -0.9999, 1e300])
@pytest.mark.parametrize(
    "kind",
    [
        Indexation(COLLARED, floor=-1e308, cap=1e308),
        Indexation(COLLARED, floor=1e308),
        Indexation(COLLARED, cap=-1e308, lag=1e4),
        Indexation(RISING, rise=1e308),
        Indexation(RISING, rise=-0.9999999999),
        Indexation(LINKED, lag=1e6),
        Indexation(LINKED, least=1e300),
    ],
)
def test_absurd_figures_are_no_reason_to_fail(kind: Indexation, recent: float | None, rate: float) -> None:
    """No warning and no error; the line that is sound keeps its value."""
    table = FlowTable.build(
        ["absurd"] * 5 + ["sound"], [1e-12, 30.0, 1e4, 1e300, 2.0, 2.0], [1.0, 1e300, 1.0, -1.0, 1e-300, 5.0]
    )
    terms = (LineTerms(Side.LIABILITIES, "absurd", kind), LineTerms(Side.LIABILITIES, "sound", rate=0.0))
    for volatility in (0.0, 1e-300, 1e308):
        inflation = Inflation(np.array([1.0]), np.array([rate]), volatility=volatility, recent=recent)
        book = Book(replace(basis(), inflation=inflation), table, line_terms=terms)
        absurd, sound = stand(book).lines
        assert sound.measures.present_value == pytest.approx(5.0)
        assert sound.inflation_dv01 == 0.0
        assert absurd.flow_count == 5


def test_quotes_that_give_no_curve() -> None:
    bad = Inflation(np.array([2.0, 1.0]), np.array([0.02, 0.02]))
    with pytest.raises(ValueError, match="`terms` must rise"):
        stand(_book(bad))


def test_an_empty_book_with_expected_inflation() -> None:
    standing, found = _inflation(Book(replace(basis(), inflation=INFLATION), FlowTable.empty()))
    assert found.dv01_gap == 0.0
    assert math.isnan(found.real_duration_gap)
    assert found.real_periods.year.size == 0
    assert standing.surplus == 0.0
