"""Shocks applied to a book: every kind of move, their estimates, and what is told."""

from __future__ import annotations

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
from desk.book.shock import Move, MoveKind, Shock, ShockSettings
from desk.rates.compounding import Compounding
from desk.valuation.measures import BASIS_POINT, value_flows
from desk.valuation.moved_curve import CurveMove, MovedCurve
from desk.valuation.priced import priced_flows
from desk.valuation.shock_base import ShockBase, SideBase, shock_base
from desk.valuation.shock_effects import CannotShock, effects_of
from desk.valuation.shocks import estimated_change, run_shock, shock_table, side_after
from desk.valuation.standing import stand
from tests.valuation.books import TODAY, basis, small_book

UP = Shock("up", (Move(MoveKind.PARALLEL, 100.0),))


def one(kind: MoveKind, size: float, target: str = "", term: float | None = None) -> Shock:
    """A shock of one move."""
    return Shock(kind.value, (Move(kind, size, term, target),))


def rows(side: SideBase, line: str) -> PricedFlows:
    """Rows of one line."""
    kept = side.flows.line == side.flows.line_names.index(line)
    return replace(
        side.flows,
        line=np.zeros(int(kept.sum()), dtype=np.int64),
        line_names=(line,),
        time=side.flows.time[kept],
        amount=side.flows.amount[kept],
        spread=side.flows.spread[kept],
        is_flow=side.flows.is_flow[kept],
        payment=None,
        real_amount=None,
        index_class=None,
    )


def line_values(base: ShockBase, side: SideBase, shock: Shock) -> dict[str, float]:
    """What each line is worth after a shock."""
    value = side_after(base, side, shock, effects_of(shock, base), by_row=True)[1]
    sums = np.bincount(side.flows.line, weights=value, minlength=len(side.flows.line_names))
    named: dict[str, float] = {}
    for name, worth in zip(side.flows.line_names, sums.tolist(), strict=True):
        named[name] = named.get(name, 0.0) + worth
    return named


@pytest.fixture(scope="module")
def base() -> ShockBase:
    """The small book, priced."""
    return shock_base(small_book())


def test_the_base_is_the_standing(base: ShockBase) -> None:
    """Six figures, as the standing has them."""
    standing = stand(small_book())
    before = base.position
    assert before.assets == pytest.approx(standing.assets.present_value, rel=1e-13)
    assert before.liabilities == pytest.approx(standing.liabilities.present_value, rel=1e-13)
    assert before.surplus == pytest.approx(standing.surplus, rel=1e-12)
    assert before.funding_ratio == pytest.approx(standing.funding_ratio, rel=1e-13)
    assert before.duration_gap == pytest.approx(standing.duration_gap, rel=1e-11)
    assert before.dv01_gap == pytest.approx(standing.dv01_gap, rel=1e-11)


def test_one_basis_point_is_the_dv01(base: ShockBase) -> None:
    """The DV01 of the standing is the fall for a parallel move of one basis point."""
    standing = stand(small_book())
    result = run_shock(base, one(MoveKind.PARALLEL, 1.0))
    assert -result.change_in_assets == pytest.approx(standing.assets.dv01, rel=1e-9)
    assert -result.change_in_liabilities == pytest.approx(standing.liabilities.dv01, rel=1e-9)


def test_rates_move_under_the_spreads(base: ShockBase) -> None:
    """The same rows valued on the moved curve, and liabilities on a basis whose rates are higher."""
    shock = Shock("mixed", (Move(MoveKind.SHORT, 80.0), Move(MoveKind.RELATIVE, -0.3)))
    move = CurveMove.of_shock(shock)
    assert move is not None
    curve = MovedCurve(base.book.basis.curve, move)
    result = run_shock(base, shock)
    for side, found in ((base.assets, result.assets), (base.liabilities, result.liabilities)):
        assert found == pytest.approx(value_flows(side.flows, curve).value.sum(), rel=1e-13)
    continuous = replace(basis(), compounding=Compounding.CONTINUOUS)
    higher = replace(continuous, rates=continuous.rates + 0.01)
    book = small_book()
    parallel = run_shock(shock_base(replace(book, basis=continuous)), UP)
    assert parallel.liabilities == pytest.approx(
        stand(replace(book, basis=higher)).liabilities.present_value, rel=1e-13
    )


def test_a_spread_move_reaches_its_holdings_alone(base: ShockBase) -> None:
    """By name in any case, by kind, and all of them: funds, deposits and ready-made flows stay."""
    before = line_values(base, base.assets, Shock("nothing", (Move(MoveKind.PARALLEL, 0.0),)))
    by_name = line_values(base, base.assets, one(MoveKind.SPREAD, 50.0, " western  2044 "))
    by_kind = line_values(base, base.assets, one(MoveKind.SPREAD, 50.0, "zero"))
    everything = line_values(base, base.assets, one(MoveKind.SPREAD, 50.0))
    moved = {"Northern 2031", "Western 2044", "Strip 2035", "Monthly payer"}
    for name, worth in before.items():
        assert (by_name[name] != worth) == (name == "Western 2044")
        assert (by_kind[name] != worth) == (name == "Strip 2035")
        assert (everything[name] != worth) == (name in moved)
    flows = rows(base.assets, "Strip 2035")
    wanted = flows.amount[0] * base.book.basis.curve.discount(flows.time[0])
    wanted *= np.exp(-(flows.spread[0] + 0.005) * flows.time[0])
    assert by_kind["Strip 2035"] == pytest.approx(float(wanted), rel=1e-13)
    named = line_values(base, base.assets, one(MoveKind.SPREAD, 50.0, "Rent"))
    assert named["Rent"] < before["Rent"]


def test_a_spread_move_of_a_floater_keeps_its_payments() -> None:
    """Its payments are those projected on the moved curve; only their discounting changes."""
    notes = (
        Holding(
            "Note", HoldingKind.FLOATER, 500.0, 0.0, 4, date(2033, 8, 15), market_value=488.0,
            start_date=date(2023, 8, 15), current_rate=0.03, margin=0.008, default_rate=0.01,
            recovery_rate=0.4,
        ),
        Holding("Bond", HoldingKind.BOND, 100.0, 0.03, 1, date(2030, 2, 1), market_value=99.0),
        Holding(
            "Other", HoldingKind.FLOATER, 90.0, 0.0, 2, date(2028, 1, 31), market_value=90.5,
            start_date=date(2024, 1, 31), current_rate=0.025,
        ),
    )  # fmt: skip
    book = Book(basis(), FlowTable.build(["a"], [5.0], [100.0]), notes)
    base = shock_base(book)
    for size in (25.0, -40.0):
        shock = Shock("both", (Move(MoveKind.PARALLEL, 60.0), Move(MoveKind.SPREAD, size, target="floater")))
        found = line_values(base, base.assets, shock)
        # The same notes on a basis whose curve is moved, held at the spread of before and the shock's.
        continuous = np.log1p(basis().rates) + 60.0 * BASIS_POINT
        moved = replace(basis(), rates=continuous, compounding=Compounding.CONTINUOUS)
        for note in (notes[0], notes[2]):
            own = base.assets.flows.line == base.assets.flows.line_names.index(note.name)
            spread = float(base.assets.flows.spread[own][0])
            plain = replace(note, market_value=None)
            projected = priced_flows(replace(book, basis=moved, holdings=(plain,)), Side.ASSETS).flows
            discount = moved.curve.discount(projected.time)
            after = projected.paid * discount * np.exp(-(spread + size * BASIS_POINT) * projected.time)
            assert found[note.name] == pytest.approx(after.sum(), rel=1e-12)


def test_value_moves_reach_funds_and_property_alone(base: ShockBase) -> None:
    """All of them, one by name, and none below zero."""
    before = line_values(base, base.assets, UP.scaled(0.0))
    after = line_values(base, base.assets, one(MoveKind.VALUE, -0.25))
    for name, worth in before.items():
        share = 0.75 if name in ("Property fund", "Equity fund") else 1.0
        assert after[name] == pytest.approx(share * worth, rel=1e-14)
    single = line_values(base, base.assets, one(MoveKind.VALUE, -0.25, "Equity fund"))
    assert single["Property fund"] == pytest.approx(before["Property fund"], rel=1e-14)
    effects = effects_of(one(MoveKind.VALUE, -1.5), base)
    assert "funds below zero" in str(effects.faults[0])
    gone = line_values(base, base.assets, one(MoveKind.VALUE, -1.5))
    assert gone["Equity fund"] == 0.0


def test_moves_of_liabilities_by_line(base: ShockBase) -> None:
    """Amounts, growth with time, and later payment, each by hand."""
    flows = rows(base.liabilities, "Mixed")
    curve = base.book.basis.curve

    def worth(amount: np.ndarray, time: np.ndarray) -> float:
        return float((amount * curve.discount(time) * np.exp(-flows.spread * time)).sum())

    before = line_values(base, base.liabilities, UP.scaled(0.0))
    for shock, wanted in (
        (one(MoveKind.AMOUNT, 0.07, "mixed"), worth(1.07 * flows.amount, flows.time)),
        (one(MoveKind.DECLINE, -0.01, "mixed"), worth(flows.amount * 0.99**flows.time, flows.time)),
        (one(MoveKind.TIME, 1.5, "mixed"), worth(flows.amount, flows.time + 1.5)),
        (one(MoveKind.TIME, -3.0, "mixed"), worth(flows.amount, np.maximum(flows.time - 3.0, 0.0))),
    ):
        after = line_values(base, base.liabilities, shock)
        assert after["Mixed"] == pytest.approx(wanted, rel=1e-13)
        assert after["In payment"] == pytest.approx(before["In payment"], rel=1e-13)
    both = Shock("both", (Move(MoveKind.PARALLEL, 100.0), Move(MoveKind.TIME, 1.5, target="mixed")))
    later = flows.time + 1.5
    wanted = float((flows.amount * curve.discount(later) * np.exp(-(flows.spread + 0.01) * later)).sum())
    assert line_values(base, base.liabilities, both)["Mixed"] == pytest.approx(wanted, rel=1e-13)


def test_expected_inflation_moves_what_follows_it() -> None:
    """Linked amounts grow with the move, by hand; collared ones stay within their collar; others stay."""
    terms = (
        LineTerms(Side.LIABILITIES, "linked", Indexation(IndexationKind.LINKED)),
        LineTerms(Side.LIABILITIES, "collared", Indexation(IndexationKind.COLLARED, floor=0.0, cap=0.03)),
    )
    inflation = Inflation(np.array([1.0, 10.0, 30.0]), np.array([0.02, 0.022, 0.025]), volatility=0.01)
    times = np.array([2.0, 12.0, 25.0])
    table = FlowTable.build(
        ["linked"] * 3 + ["collared"] * 3 + ["fixed"] * 3, np.tile(times, 3), np.full(9, 100.0)
    )
    book = Book(replace(basis(), inflation=inflation), table, small_book().holdings, line_terms=terms)
    base = shock_base(book)
    before = line_values(base, base.liabilities, UP.scaled(0.0))
    shock = one(MoveKind.INFLATION, 80.0)
    after = line_values(base, base.liabilities, shock)
    flows = rows(base.liabilities, "linked")
    discount = book.basis.curve.discount(times) * np.exp(-flows.spread * times)
    wanted = float((flows.amount * np.exp(0.008 * times) * discount).sum())
    assert after["linked"] == pytest.approx(wanted, rel=1e-12)
    assert before["collared"] < after["collared"] < before["collared"] * after["linked"] / before["linked"]
    assert after["fixed"] == pytest.approx(before["fixed"], rel=1e-14)
    small = shock.scaled(0.01)
    effects = effects_of(small, base)
    exact = sum(line_values(base, base.liabilities, small).values()) - sum(before.values())
    assert estimated_change(base, base.liabilities, effects) == pytest.approx(exact, rel=2e-3)
    at_terms = Shock("at terms", (Move(MoveKind.INFLATION, 50.0, 5.0), Move(MoveKind.INFLATION, 10.0, 20.0)))
    found = line_values(base, base.liabilities, at_terms)["linked"]
    size = np.interp(times, [5.0, 20.0], [0.005, 0.001])
    assert found == pytest.approx(float((flows.amount * np.exp(size * times) * discount).sum()), rel=1e-12)


SMALL = [
    one(MoveKind.PARALLEL, 1.0),
    one(MoveKind.SHORT, 1.0),
    one(MoveKind.RELATIVE, 0.001),
    one(MoveKind.SPREAD, 1.0),
    one(MoveKind.VALUE, -0.001),
    one(MoveKind.AMOUNT, 0.001, "Mixed"),
    one(MoveKind.DECLINE, 0.0001),
    one(MoveKind.TIME, 0.001, "With profits"),
]


@pytest.mark.parametrize("shock", SMALL, ids=[shock.name for shock in SMALL])
def test_the_estimate_is_right_to_its_order(base: ShockBase, shock: Shock) -> None:
    """Its error falls fourfold where the move is halved, eightfold for moves of rates (or is rounding)."""
    is_rate = shock.moves[0].kind in (MoveKind.PARALLEL, MoveKind.SHORT, MoveKind.RELATIVE)
    errors = []
    for scale in (60.0, 30.0):
        result = run_shock(base, shock.scaled(scale))
        errors.append(abs(result.estimated_change_in_surplus - result.change_in_surplus))
    order = 8.0 if is_rate else 4.0
    assert errors[0] < 1e-9 or errors[0] / errors[1] == pytest.approx(order, rel=0.15)


def test_the_estimate_of_a_parallel_move_is_duration_and_convexity(base: ShockBase) -> None:
    """``PV (-D Δ + ½ C Δ²)`` with the measures of the standing."""
    assets = stand(small_book()).assets
    result = run_shock(base, one(MoveKind.PARALLEL, -150.0))
    move = -0.015
    wanted = assets.present_value * (-assets.effective_duration * move + 0.5 * assets.convexity * move**2)
    assert result.estimated_change_in_assets == pytest.approx(wanted, rel=1e-12)
    assert abs(result.change_in_assets / wanted - 1.0) < 0.02


def test_a_table_keeps_order_and_tells_what_it_left_out() -> None:
    """One line each; the others are computed."""
    shocks = (
        UP,
        one(MoveKind.SPREAD, 10.0, "nobody"),
        Shock("part", (Move(MoveKind.PARALLEL, 10.0), Move(MoveKind.AMOUNT, 0.1, target="nobody"))),
        one(MoveKind.PARALLEL, -3000.0),
        one(MoveKind.INFLATION, 50.0),
        Shock("empty", ()),
        Shock("order", (Move(MoveKind.RATE, 1.0, 5.0), Move(MoveKind.RATE, 2.0, 1.0))),
        Shock("twice", (Move(MoveKind.RATE, 1.0, 5.0), Move(MoveKind.RATE, 2.0, 5.0))),
        one(MoveKind.VALUE, 0.1, "Northern 2031"),
        one(MoveKind.DECLINE, -1.0),
        one(MoveKind.AMOUNT, 1e308),
    )
    seen: list[float] = []
    book = replace(small_book(), shock_settings=ShockSettings(thresholds=(2.1, 2.0)))
    table = shock_table(book, shocks, progress=seen.append)
    assert [result.name for result in table.results] == ["up", "part", "order"]
    told = [str(fault) for fault in table.faults if fault.sheet == "Shocks"]
    assert len(told) == 10
    assert not any("\n" in line for line in told)
    for part in (
        "'nobody'", "a zero rate of -2", "of which the basis has none", "has no moves", "terms out of order",
        "the term 5 stands twice", "none of the funds and property", "100 % a year",
    ):  # fmt: skip
        assert any(part in line for line in told), part
    assert seen == sorted(seen)
    assert (seen[0], seen[-1]) == (0.0, 1.0)
    assert [result.band for result in table.results] == [
        sum(result.funding_ratio < threshold for threshold in (2.1, 2.0)) for result in table.results
    ]
    assert table.results[0].change_in_surplus == pytest.approx(
        table.results[0].surplus - table.base.surplus, rel=1e-12
    )


def test_empty_sides_are_shocked_too() -> None:
    """A book without assets or without liabilities."""
    nothing = Book(basis(), FlowTable.empty())
    table = shock_table(nothing, (UP,))
    assert (table.results[0].assets, table.results[0].liabilities) == (0.0, 0.0)
    assert np.isnan(table.results[0].funding_ratio)
    assert table.results[0].band == 0
    with pytest.raises(CannotShock, match="of which the book has none"):
        effects_of(one(MoveKind.VALUE, -0.1), shock_base(nothing))


def test_the_profile_touches_its_tangent_and_turns_where_the_gap_is_nothing() -> None:
    """A liability that lies between two assets: the surplus is least where both sides lose the same."""
    curve = basis().curve
    owned = [36.0 / float(curve.discount(4.0)), 36.5 / float(curve.discount(16.3))]
    table = FlowTable.build(["a"], [10.0], [73.4 / float(curve.discount(10.0))])
    book = Book(
        replace(basis(), liability_spread=0.0),
        table,
        asset_flows=FlowTable.build(["x", "y"], [4.0, 16.3], owned),
    )
    profile = shock_table(book, ()).profile
    middle = int(np.flatnonzero(profile.move == 0.0)[0])
    assert profile.tangent[middle] == profile.surplus[middle]
    slope = (profile.surplus[middle + 1] - profile.surplus[middle - 1]) / 20.0
    assert (profile.tangent[1] - profile.tangent[0]) / 10.0 == pytest.approx(slope, rel=1e-2)
    (turn,) = profile.gap_turns
    base = shock_base(book)
    assert run_shock(base, one(MoveKind.PARALLEL, turn)).duration_gap == pytest.approx(0.0, abs=1e-9)
    values = [run_shock(base, one(MoveKind.PARALLEL, turn + step)).surplus for step in (-1.0, 0.0, 1.0)]
    assert values[1] == min(values)
    for place in (0, middle, -1):
        result = run_shock(base, one(MoveKind.PARALLEL, float(profile.move[place])))
        assert profile.surplus[place] == pytest.approx(result.surplus, abs=1e-9)
        assert profile.duration_gap[place] == pytest.approx(result.duration_gap, abs=1e-9)


def test_dates_of_the_table() -> None:
    """Where a result comes from."""
    book = small_book()
    table = shock_table(book, (UP,), settings=(("sets", "none"),))
    assert (table.valuation_date, table.currency) == (TODAY, "EUR")
    assert table.provenance.book_digest == book.digest
    assert table.provenance.settings == (("sets", "none"),)
