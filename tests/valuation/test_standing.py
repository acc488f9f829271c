"""The standing against the plain version, and its laws."""

from __future__ import annotations

from dataclasses import asdict, replace
from datetime import date

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from desk import __version__
from desk.book import Book, FlowTable, Holding, HoldingKind, PricedFlows, Side
from desk.rates.curve import Interpolation
from desk.valuation.measures import value_flows, value_rows
from desk.valuation.priced import priced_flows
from desk.valuation.records import Measures
from desk.valuation.standing import redington_conditions, stand, undiscounted_periods
from tests.valuation import plain
from tests.valuation.books import TODAY, basis, flat_basis, small_book

EMPTY = FlowTable.empty()


def _assert_measures(found: Measures, expected: dict[str, float]) -> None:
    for name, number in expected.items():
        assert getattr(found, name) == pytest.approx(number, rel=2e-10, abs=1e-11), name


def test_sides_against_the_plain_version() -> None:
    book = small_book()
    standing = stand(book)
    assets, liabilities = plain.asset_lines(book), plain.table_lines(book, Side.LIABILITIES)
    _assert_measures(standing.assets, plain.measures(book, assets))
    _assert_measures(standing.liabilities, plain.measures(book, liabilities))
    worth_a, worth_l = plain.worth(book, assets), plain.worth(book, liabilities)
    assert standing.surplus == pytest.approx(worth_a - worth_l, rel=1e-10)
    assert standing.funding_ratio == pytest.approx(worth_a / worth_l, rel=1e-12)
    first, second = plain.measures(book, assets), plain.measures(book, liabilities)
    gap = first["effective_duration"] - second["effective_duration"] * worth_l / worth_a
    assert standing.duration_gap == pytest.approx(gap, rel=1e-10)
    assert standing.dv01_gap == pytest.approx(first["dv01"] - second["dv01"], rel=1e-9)


def test_lines_against_the_plain_version() -> None:
    book = small_book()
    standing = stand(book)
    plain_lines = plain.asset_lines(book) + plain.table_lines(book, Side.LIABILITIES)
    assert [line.line for line in standing.lines] == [line.name for line in plain_lines]
    for line, expected in zip(standing.lines, plain_lines, strict=True):
        assert line.flow_count == sum(is_flow for _, _, _, is_flow in expected.rows)
        spreads = {spread for _, _, spread, _ in expected.rows}
        if len(spreads) == 1:
            assert line.spread == pytest.approx(spreads.pop(), abs=1e-12)
        else:
            assert line.spread is None
        if any(time > 0.0 for time, *_ in expected.rows):
            _assert_measures(line.measures, plain.measures(book, [expected]))
        else:
            assert line.measures.present_value == pytest.approx(plain.worth(book, [expected]))
            assert line.measures.effective_duration == line.measures.macaulay_duration == 0.0
            assert np.isnan(line.measures.equivalent_rate)
    assert [line.kind for line in standing.lines] == [
        *("bond", "bond", "bond", "zero", "bond", "deposit", "fund", "fund"),
        *["flows"] * 5,
    ]
    assert [line.market_value for line in standing.lines[:8]] == [
        holding.market_value for holding in book.holdings
    ]


def test_key_rates_against_the_plain_version() -> None:
    book = small_book()
    standing = stand(book)
    assert standing.key_rates.term.tolist() == list(plain.KEYS)
    step = 1e-6
    for side, durations, dv01 in (
        (plain.asset_lines(book), standing.key_rates.assets, standing.key_rates.dv01_assets),
        (
            plain.table_lines(book, Side.LIABILITIES),
            standing.key_rates.liabilities,
            standing.key_rates.dv01_liabilities,
        ),
    ):
        whole = plain.worth(book, side)
        for key in range(len(plain.KEYS)):
            fall = whole - plain.worth(book, side, plain.key_move(key, 0.0001))
            assert dv01[key] == pytest.approx(fall, abs=1e-10 * whole)
            up = plain.worth(book, side, plain.key_move(key, step))
            down = plain.worth(book, side, plain.key_move(key, -step))
            assert durations[key] == pytest.approx((down - up) / (2.0 * step) / whole, abs=2e-8)


def test_periods_against_the_plain_version() -> None:
    book = small_book()
    periods = stand(book).periods
    assert periods.year.tolist() == list(range(1, 56))
    lines = {True: plain.asset_lines(book), False: plain.table_lines(book, Side.LIABILITIES)}
    cumulative = 0.0
    for number, year in enumerate(periods.year.tolist()):
        total = {
            is_assets: sum(
                amount
                for line in side
                for time, amount, _, is_flow in line.rows
                if is_flow and (year - 1 < time <= year or (year == 1 and time == 0.0))
            )
            for is_assets, side in lines.items()
        }
        cumulative += total[True] - total[False]
        assert periods.assets[number] == pytest.approx(total[True], abs=1e-10)
        assert periods.liabilities[number] == pytest.approx(total[False], abs=1e-10)
        assert periods.net[number] == pytest.approx(total[True] - total[False], abs=1e-10)
        assert periods.cumulative[number] == pytest.approx(cumulative, abs=1e-9)


def test_market_values_are_met() -> None:
    standing = stand(small_book())
    stated = [line for line in standing.lines if line.market_value is not None]
    assert len(stated) == 6
    for line in stated:
        assert line.measures.present_value == pytest.approx(line.market_value, rel=1e-12)


@pytest.mark.parametrize("interpolation", list(Interpolation))
def test_effective_measures_are_derivatives(interpolation: Interpolation) -> None:
    """Under a move of the zero rates themselves, on any interpolation."""
    book = small_book()
    book = replace(book, basis=replace(book.basis, interpolation=interpolation))
    standing = stand(book)
    for side, measures in ((Side.ASSETS, standing.assets), (Side.LIABILITIES, standing.liabilities)):
        flows = priced_flows(book, side).flows

        def worth(move: float, flows: PricedFlows = flows) -> float:
            rows = value_rows(flows.time, flows.amount, curve=book.basis.curve, spread=flows.spread + move)
            return float(rows.value.sum())

        slope = (worth(-1e-5) - worth(1e-5)) / 2e-5
        bend = (worth(-1e-4) - 2.0 * worth(0.0) + worth(1e-4)) / 1e-8
        assert measures.effective_duration == pytest.approx(slope / worth(0.0), rel=1e-7)
        assert measures.convexity == pytest.approx(bend / worth(0.0), rel=1e-5)
        assert measures.dv01 == pytest.approx(worth(0.0) - worth(1e-4), rel=1e-10)
        spread = measures.convexity - measures.effective_duration**2
        assert measures.dispersion == pytest.approx(spread, rel=1e-10)


Flow = tuple[str, float, float, float]
FLOWS = st.lists(
    st.tuples(
        st.sampled_from(["a", "b", "c"]),
        st.floats(0.001, 90.0),
        st.floats(0.01, 1e6),
        st.floats(-1.0, 2.0),
    ),
    min_size=1,
    max_size=30,
)


def _table(flows: list[Flow]) -> FlowTable:
    lines, times, amounts, betas = zip(*flows, strict=True)
    return FlowTable.build(lines, times, amounts, beta=betas)


@settings(max_examples=60, deadline=None)
@given(FLOWS, FLOWS)
def test_laws(assets: list[Flow], debts: list[Flow]) -> None:
    standing = stand(Book(basis(), _table(debts), (), _table(assets)))
    for measures, durations in (
        (standing.assets, standing.key_rates.assets),
        (standing.liabilities, standing.key_rates.liabilities),
    ):
        assert durations.sum() == pytest.approx(measures.effective_duration, rel=1e-12)
        assert measures.dispersion >= 0.0
        assert measures.modified_duration == pytest.approx(
            measures.macaulay_duration / (1.0 + measures.equivalent_rate), rel=1e-12
        )
    for side, total in ((Side.ASSETS, standing.assets), (Side.LIABILITIES, standing.liabilities)):
        of_side = [line.measures for line in standing.lines if line.side is side]
        assert sum(line.present_value for line in of_side) == pytest.approx(total.present_value, rel=1e-12)
        assert sum(line.dv01 for line in of_side) == pytest.approx(total.dv01, rel=1e-12)
    assert standing.surplus == standing.assets.present_value - standing.liabilities.present_value
    assert standing.periods.cumulative[-1] == pytest.approx(
        sum(flow[2] for flow in assets) - sum(flow[2] for flow in debts), rel=1e-9, abs=1e-6
    )


@settings(max_examples=40, deadline=None)
@given(FLOWS, FLOWS, FLOWS)
def test_surplus_adds_up(
    assets: list[Flow],
    debts: list[Flow],
    more: list[Flow],
) -> None:
    """Further debts lower the surplus by what they are worth alone."""
    together = stand(Book(basis(), _table(debts + more), (), _table(assets)))
    apart = stand(Book(basis(), _table(debts), (), _table(assets)))
    alone = stand(Book(basis(), _table(more)))
    scale = together.liabilities.present_value + together.assets.present_value
    assert together.surplus == pytest.approx(apart.surplus + alone.surplus, abs=1e-12 * scale)
    assert together.dv01_gap == pytest.approx(apart.dv01_gap + alone.dv01_gap, abs=1e-12 * scale)


class TestEmptySides:
    """Nothing held, nothing promised, or neither: figures or NaN, and never a warning."""

    def test_neither(self) -> None:
        standing = stand(Book(basis(), EMPTY))
        for measures in (standing.assets, standing.liabilities):
            assert (measures.present_value, measures.dv01) == (0.0, 0.0)
            ratios = [
                number for name, number in asdict(measures).items() if name not in ("present_value", "dv01")
            ]
            assert len(ratios) == 6
            assert np.isnan(ratios).all()
        assert (standing.surplus, standing.dv01_gap) == (0.0, 0.0)
        assert np.isnan([standing.funding_ratio, standing.duration_gap]).all()
        assert standing.periods.year.size == standing.periods.cumulative.size == 0
        assert standing.lines == ()
        assert standing.faults == ()
        assert standing.key_rates.dv01_assets.tolist() == [0.0] * 14
        assert [condition.holds for condition in standing.redington] == [True, True, False]

    def test_no_liabilities(self) -> None:
        standing = stand(replace(small_book(), liabilities=EMPTY))
        assert standing.surplus == standing.assets.present_value > 0.0
        assert np.isnan(standing.funding_ratio)
        assert standing.duration_gap == pytest.approx(standing.assets.effective_duration, rel=1e-14)
        assert standing.dv01_gap == standing.assets.dv01

    def test_no_assets(self) -> None:
        standing = stand(replace(small_book(), holdings=(), asset_flows=EMPTY))
        assert standing.surplus == -standing.liabilities.present_value < 0.0
        assert standing.funding_ratio == 0.0
        assert np.isnan(standing.duration_gap)
        assert [condition.holds for condition in standing.redington] == [False, False, False]

    def test_only_past_flows(self) -> None:
        past = FlowTable.build(["old", "old"], [-3.0, 0.0], [5.0, 6.0])
        standing = stand(Book(basis(), past, (), past))
        assert [line.measures.present_value for line in standing.lines] == [0.0, 0.0]
        assert [line.spread for line in standing.lines] == [None, None]
        assert [fault.sheet for fault in standing.faults] == ["Asset flows", "Liabilities"]
        assert "2 flows fall on or before the valuation date" in str(standing.faults[0])


class TestRedington:
    """The three conditions hold and fail one by one."""

    @staticmethod
    def _holds(assets: list[tuple[float, float]], liabilities: list[tuple[float, float]]) -> list[bool]:
        curve = flat_basis(0.0).curve
        sides = [
            value_rows([row[0] for row in side], [row[1] for row in side], curve=curve)
            for side in (assets, liabilities)
        ]
        conditions = redington_conditions(*sides)
        assert [condition.name for condition in conditions] == ["present_value", "duration", "convexity"]
        return [condition.holds for condition in conditions]

    def test_all_hold(self) -> None:
        assert self._holds([(5.0, 50.0), (15.0, 50.0)], [(10.0, 100.0)]) == [True, True, True]

    def test_worth_too_little(self) -> None:
        assert self._holds([(5.0, 49.0), (15.0, 49.9)], [(10.0, 100.0)])[0] is False

    def test_duration_within_its_tolerance(self) -> None:
        assert self._holds([(9.9991, 100.0)], [(10.0, 100.0)])[1] is True
        assert self._holds([(9.9989, 100.0)], [(10.0, 100.0)])[1] is False
        assert self._holds([(10.0011, 100.0)], [(10.0, 100.0)])[1] is False

    def test_less_spread_out_than_the_liabilities(self) -> None:
        assert self._holds([(10.0, 100.0)], [(5.0, 50.0), (15.0, 50.0)]) == [True, True, False]
        assert self._holds([(10.0, 100.0)], [(10.0, 100.0)]) == [True, True, False]


class TestPeriods:
    """Where a flow falls."""

    @staticmethod
    def _flows(times: list[float], is_flow: list[bool] | None = None) -> PricedFlows:
        count = len(times)
        return PricedFlows(
            Side.ASSETS,
            ("a",),
            np.zeros(count, np.int64),
            np.array(times),
            np.ones(count),
            np.zeros(count),
            np.array(is_flow if is_flow is not None else [True] * count),
        )

    def test_a_year_ends_with_its_last_day(self) -> None:
        twelfths = float(np.nextafter(1.0, 2.0))  # what twelve twelfths may add up to
        periods = undiscounted_periods(
            self._flows([0.0, 0.01, twelfths, 1.0, 1.001, 2.0]), self._flows([3.0])
        )
        assert periods.assets.tolist() == [4.0, 2.0, 0.0]
        assert periods.liabilities.tolist() == [0.0, 0.0, 1.0]
        assert periods.cumulative.tolist() == [4.0, 6.0, 5.0]

    def test_a_fund_is_no_payment(self) -> None:
        periods = undiscounted_periods(self._flows([1.0, 9.0], [True, False]), self._flows([]))
        assert periods.year.tolist() == [1]

    def test_absurdly_late_flows_leave_gaps(self) -> None:
        periods = undiscounted_periods(self._flows([1.0, 5e8]), self._flows([1e300, 2.0]))
        assert periods.year.tolist() == [1, 2, 500_000_000, 2**53]
        assert periods.net.tolist() == [1.0, -1.0, 1.0, -1.0]


def test_carries_its_provenance_and_reports_progress() -> None:
    book, parts = small_book(), list[float]()
    standing = stand(book, progress=parts.append)
    assert standing.provenance.book_digest == book.digest
    assert standing.provenance.program_version == __version__
    assert (standing.valuation_date, standing.currency) == (TODAY, "EUR")
    assert parts[0] == 0.0
    assert parts[-1] == 1.0
    assert parts == sorted(parts)


def test_progress_may_stop_the_work() -> None:
    class Stopped(Exception):
        pass

    def stop(part: float) -> None:
        if part > 0.4:
            raise Stopped

    with pytest.raises(Stopped):
        stand(small_book(), progress=stop)


def test_the_same_book_gives_the_same_bits() -> None:
    first, second = stand(small_book()), stand(small_book())
    assert repr(first) == repr(second)


def test_absurd_amounts_and_times_raise_nothing() -> None:
    flows = FlowTable.build(["a", "a", "b"], [1e300, 1e-300, 2.0], [1e300, -1e300, 1e-300])
    holdings = (
        Holding("tiny", HoldingKind.BOND, 1e-300, 1e-300, 12, date(2999, 1, 31), market_value=1e300),
        Holding("huge", HoldingKind.ZERO, 1e300, maturity=date(2026, 7, 1), market_value=1e-300),
    )
    for interpolation in Interpolation:
        changed = replace(basis(), interpolation=interpolation)
        standing = stand(Book(changed, flows, holdings, flows))
        assert len(standing.lines) == 6


def test_a_negative_curve_is_valued() -> None:
    below = replace(basis(spread=0.0, premium=0.0), rates=np.full(7, -0.02))
    standing = stand(Book(below, FlowTable.build(["a", "a"], [1.0, 10.0], [1.0, 1.0])))
    assert standing.liabilities.equivalent_rate == pytest.approx(-0.02, rel=1e-12)
    assert standing.liabilities.present_value == pytest.approx(0.98**-1 + 0.98**-10, rel=1e-12)


def test_a_basis_without_a_curve_is_refused() -> None:
    with pytest.raises(ValueError, match="two quotes stand at 3 years"):
        stand(replace(small_book(), basis=replace(basis(), terms=np.array([1, 2, 3, 3, 5, 6, 7.0]))))


def test_values_of_rows_are_those_of_the_protocol() -> None:
    book = small_book()
    flows = priced_flows(book, Side.LIABILITIES).flows
    rows = value_flows(flows, book.basis.curve)
    expected = flows.spread_discounted * book.basis.curve.discount(flows.time)
    np.testing.assert_allclose(rows.value, expected, rtol=1e-13)
