"""Lines with terms of their own, and linked bonds, against the plain version."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace
from datetime import date, timedelta
from typing import Any

import numpy as np
import pytest

from desk.book import (
    Basis,
    Book,
    FlowTable,
    Holding,
    HoldingKind,
    Indexation,
    IndexationKind,
    Inflation,
    LiabilityMethod,
    LineTerms,
    PriceKind,
    Severity,
    Side,
)
from desk.valuation.detail import line_flows
from desk.valuation.holdings import price_holdings
from desk.valuation.priced import priced_flows
from desk.valuation.prices import holding_prices
from desk.valuation.standing import stand
from tests.valuation.books import TODAY, basis, flat_basis, small_book
from tests.valuation.plain import discount as plain_discount
from tests.valuation.plain_holdings import accrued, is_ex, payments, value
from tests.valuation.plain_inflation import growth, index, linked_value

LINKED, COLLARED, RISING = IndexationKind.LINKED, IndexationKind.COLLARED, IndexationKind.RISING
INFLATION = Inflation(
    np.array([1.0, 2.0, 5.0, 10.0, 30.0]),
    np.array([0.031, 0.027, 0.022, 0.024, 0.026]),
    volatility=0.013,
    recent=0.045,
)


def _basis(inflation: Inflation | None = INFLATION) -> Basis:
    return replace(basis(), inflation=inflation)


def _lines(*terms: LineTerms, inflation: Inflation | None = INFLATION) -> Book:
    return replace(small_book(), basis=_basis(inflation), line_terms=terms)


def _held(*holdings: Holding, inflation: Inflation | None = INFLATION) -> Book:
    return Book(_basis(inflation), FlowTable.empty(), holdings)


def test_lines_at_spreads_rates_and_indexations_of_their_own() -> None:
    """Each row of both sides against the curve, the growth and the discounting worked out in plain Python."""
    collar = Indexation(COLLARED, floor=0.0, cap=0.025)
    terms = {
        (Side.LIABILITIES, "In payment"): LineTerms(Side.LIABILITIES, "In payment", collar, rate=0.045),
        (Side.LIABILITIES, "With profits"): LineTerms(
            Side.LIABILITIES, "With profits", Indexation(LINKED, lag=0.25), spread=0.011
        ),
        (Side.ASSETS, "Contributions"): LineTerms(
            Side.ASSETS, "Contributions", Indexation(RISING, rise=0.03), spread=0.02
        ),
        (Side.ASSETS, "Rent"): LineTerms(Side.ASSETS, "Rent", Indexation(LINKED)),
    }
    book = _lines(*terms.values())
    standing = stand(book)
    assert standing.faults == stand(small_book()).faults
    on = index(INFLATION)
    for side, table in ((Side.LIABILITIES, book.liabilities), (Side.ASSETS, book.asset_flows)):
        for number, name in enumerate(table.line_names):
            own = terms.get((side, name), LineTerms(side, name))
            total = 0.0
            for row in np.flatnonzero((table.line == number) & (table.time > 0.0)):
                time, beta = float(table.time[row]), float(table.beta[row])
                spread = own.spread
                if spread is None:
                    spread = 0.004 if side is Side.LIABILITIES else 0.0
                factor = plain_discount(book, time) * math.exp(-spread * time)
                if own.rate is not None:
                    factor = (1.0 + own.rate) ** -time
                factor *= math.exp(-beta * 0.03 * time)
                total += float(table.amount[row]) * growth(own.indexation, time, on, 0.013) * factor
            line = next(line for line in standing.lines if line.side is side and line.line == name)
            assert line.measures.present_value == pytest.approx(total, rel=1e-9), name
    spreads = {line.line: line.spread for line in standing.lines if line.kind == "flows"}
    assert spreads["With profits"] == pytest.approx(0.011 + 0.4 * 0.03)
    assert spreads["In payment"] is None  # a flat rate is another spread for each row
    assert spreads["Contributions"] == 0.02


@pytest.mark.parametrize(
    ("changes", "discounted"),
    [
        (
            {"liability_method": LiabilityMethod.EXPECTED_RETURN, "expected_return": 0.06},
            lambda t, _: 1.06**-t,
        ),
        (
            {
                "liability_method": LiabilityMethod.TERM_SPREADS,
                "liability_terms": np.array([1.0, 11.0]),
                "liability_spreads": np.array([0.01, 0.02]),
            },
            lambda t, p: p * math.exp(-t * (0.01 + 0.001 * (min(max(t, 1.0), 11.0) - 1.0))),
        ),
    ],
)
def test_bases_of_the_liabilities(
    changes: dict[str, Any], discounted: Callable[[float, float], float]
) -> None:
    """The liability spread and beta count on top of each; a line's own terms stand in its place."""
    book = _lines(LineTerms(Side.LIABILITIES, "Mixed", spread=0.05))
    book = replace(book, basis=replace(book.basis, **changes))
    table = book.liabilities
    lines = {line.line: line.measures.present_value for line in stand(book).lines}
    for number, name in enumerate(table.line_names):
        total = 0.0
        for row in np.flatnonzero((table.line == number) & (table.time > 0.0)):
            time, beta = float(table.time[row]), float(table.beta[row])
            factor = plain_discount(book, time)
            own = factor * math.exp(-0.05 * time)
            if name != "Mixed":
                own = discounted(time, factor) * math.exp(-0.004 * time)
            total += float(table.amount[row]) * own * math.exp(-beta * 0.03 * time)
        assert lines[name] == pytest.approx(total, rel=1e-12)


def test_fixed_terms_are_no_terms() -> None:
    plain, stated = _lines(), _lines(*(LineTerms(Side.LIABILITIES, name) for name in ("In payment", "Mixed")))
    flows, other = (priced_flows(book, Side.LIABILITIES).flows for book in (plain, stated))
    np.testing.assert_array_equal(flows.amount, other.amount)
    np.testing.assert_array_equal(flows.spread, other.spread)
    assert other.real_amount is None
    assert other.index_class is None


def test_the_plain_book_is_untouched_by_expected_inflation() -> None:
    plain, informed = stand(small_book()), stand(_lines())
    assert plain.inflation is None
    assert informed.inflation is not None
    assert (informed.assets, informed.liabilities) == (plain.assets, plain.liabilities)
    assert informed.inflation.dv01_assets == informed.inflation.dv01_liabilities == 0.0


def test_terms_that_fit_no_line_and_terms_given_twice() -> None:
    book = _lines(
        LineTerms(Side.LIABILITIES, "Nobody", spread=0.5),
        LineTerms(Side.ASSETS, "In payment", spread=0.5),
        LineTerms(Side.ASSETS, "Strip 2035", Indexation(LINKED)),
        LineTerms(Side.LIABILITIES, "Mixed", spread=0.01),
        LineTerms(Side.LIABILITIES, "Mixed", spread=0.09),
    )
    standing = stand(book)
    found = [fault for fault in standing.faults if fault.sheet == "Line terms"]
    assert {fault.severity for fault in found} == {Severity.MILD}
    assert sorted(fault.found for fault in found) == [
        "more than one row for the line 'Mixed'",
        "terms for a line 'In payment'",
        "terms for a line 'Nobody'",
        "terms for a line 'Strip 2035'",
    ]
    once = stand(_lines(LineTerms(Side.LIABILITIES, "Mixed", spread=0.01)))
    assert (once.assets, once.liabilities) == (standing.assets, standing.liabilities)


def test_without_expected_inflation_amounts_count_as_they_stand_today() -> None:
    names = ("In payment", "With profits", "Mixed")
    linker = Holding("Linker", HoldingKind.LINKED_BOND, 100.0, 0.01, 2, date(2040, 3, 1), index_ratio=1.4)
    book = replace(
        _lines(
            *(LineTerms(Side.LIABILITIES, name, Indexation(LINKED)) for name in names),
            LineTerms(Side.ASSETS, "Rent", Indexation(COLLARED, cap=0.03)),
            LineTerms(Side.ASSETS, "Contributions", Indexation(RISING, rise=0.01)),
            inflation=None,
        ),
        holdings=tuple(replace(linker, name=f"Linker {number}") for number in range(5)),
    )
    standing = stand(book)
    plain = stand(small_book())
    assert standing.liabilities == plain.liabilities
    assert standing.inflation is None
    assert all(line.inflation_dv01 is None for line in standing.lines)
    found = {fault.sheet: fault for fault in standing.faults if "no expected inflation" in fault.found}
    assert set(found) == {"Liabilities", "Holdings", "Asset flows"}
    assert found["Holdings"].found.startswith("'Linker 0', 'Linker 1', 'Linker 2' and 2 more following")
    assert found["Asset flows"].found.startswith("'Rent' following")
    assert {fault.severity for fault in found.values()} == {Severity.MILD}
    bond = replace(linker, kind=HoldingKind.BOND, nominal=140.0)
    worth = stand(Book(basis(), FlowTable.empty(), (bond,))).lines[0].measures.present_value
    assert standing.lines[0].measures.present_value == pytest.approx(worth, rel=1e-13)


def _random(random: np.random.Generator, number: int) -> Holding:
    """A linked bond, odd in every way it may be."""
    end = TODAY + timedelta(days=int(random.integers(40, 40 * 365)))
    start = min(TODAY + timedelta(days=int(random.integers(-1500, 700))), end - timedelta(days=3))
    return Holding(
        f"linker {number}",
        HoldingKind.LINKED_BOND,
        float(random.uniform(10.0, 1000.0)),
        float(random.choice([0.0, random.uniform(-0.005, 0.05)])),
        int(random.choice([1, 2, 4, 12])),
        end,
        start_date=start if random.integers(2) else None,
        ex_dividend_days=int(random.choice([0, 20])),
        index_lag_months=int(random.choice([0, 2, 3, 8])),
        index_ratio=float(random.uniform(0.8, 2.0)),
        has_principal_floor=bool(random.integers(2)),
    )


def _as_bond(holding: Holding) -> Holding:
    """The bond that pays the same before indexation."""
    return replace(holding, kind=HoldingKind.BOND, has_principal_floor=False)


def _payments(holding: Holding, *, for_buyer: bool = False) -> list[tuple[float, float, float]]:
    """Time, interest and repayment before indexation."""
    rows = payments(_as_bond(holding), TODAY, lambda time: 1.0)
    gone = for_buyer and is_ex(holding, TODAY, rows[0].when) and holding.coupon != 0.0
    return [
        ((row.when - TODAY).days / 365.0, 0.0 if gone and row is rows[0] else row.interest, row.repaid)
        for row in rows
    ]


def test_linked_bonds_against_the_plain_version() -> None:
    """150 of them, where floors count: value, and accrued interest in money and in real terms."""
    low = replace(INFLATION, rates=INFLATION.rates - 0.024, volatility=0.03)
    random = np.random.default_rng(40)
    holdings = [_random(random, number) for number in range(150)]
    book = _held(*holdings, inflation=low)
    on = index(low)
    floored = 0
    for holding, price in zip(holdings, holding_prices(book), strict=True):
        plain = linked_value(
            holding, _payments(holding), lambda time: plain_discount(book, time), on, volatility=0.03
        )
        assert price.present_value == pytest.approx(plain, rel=1e-9)
        interest = accrued(_as_bond(holding), TODAY, lambda time: 1.0) if holding.coupon else 0.0
        assert price.accrued_interest == pytest.approx(holding.index_ratio * interest, rel=1e-11, abs=1e-12)
        assert price.dirty_price - price.clean_price == pytest.approx(
            100.0 * interest / holding.nominal, rel=1e-9, abs=1e-11
        )
        free = stand(_held(replace(holding, has_principal_floor=False), inflation=low)).assets.present_value
        assert price.present_value >= free * (1.0 - 1e-14)
        floored += price.present_value > free * (1.0 + 1e-6)
    assert floored > 20


@pytest.mark.parametrize("kind", list(PriceKind))
def test_prices_in_real_terms_are_met_at_the_spread_found(kind: PriceKind) -> None:
    random = np.random.default_rng(41)
    holdings = [
        replace(_random(random, number), price=float(random.uniform(70.0, 125.0)), price_kind=kind)
        for number in range(80)
    ]
    book = _held(*holdings)
    on = index(INFLATION)
    for holding, line, price in zip(holdings, stand(book).lines, holding_prices(book), strict=True):
        assert line.spread is not None
        bought = linked_value(
            holding,
            _payments(holding, for_buyer=True),
            lambda time: plain_discount(book, time),
            on,
            spread=line.spread,
            volatility=0.013,
        )
        interest = accrued(_as_bond(holding), TODAY, lambda time: 1.0) if holding.coupon else 0.0
        real = holding.nominal * (holding.price or 0.0) / 100.0
        real += interest if kind is PriceKind.CLEAN else 0.0
        assert bought == pytest.approx(holding.index_ratio * real, rel=1e-9)
        stated = price.clean_price if kind is PriceKind.CLEAN else price.dirty_price
        assert stated == pytest.approx(holding.price, rel=1e-9)


def test_a_market_value_goes_before_the_price_and_default_takes_real_payments() -> None:
    holding = Holding(
        "linker",
        HoldingKind.LINKED_BOND,
        100.0,
        0.02,
        1,
        date(2036, 6, 30),
        market_value=150.0,
        price=103.0,
        default_rate=0.02,
        recovery_rate=0.4,
        index_ratio=1.3,
    )
    standing = stand(_held(holding))
    line = standing.lines[0]
    assert line.measures.present_value == pytest.approx(150.0, rel=1e-12)
    assert any("a price that comes to 133.9" in fault.found for fault in standing.faults)
    assert line.spread is not None
    bond = replace(_as_bond(holding), market_value=None, price=None)
    on, spread = index(INFLATION), line.spread
    lagged = Indexation(LINKED, lag=0.25)

    def factor(time: float) -> float:
        indexed = 1.3 * growth(lagged, time, on, 0.0)
        return plain_discount(_held(holding), time) * indexed

    assert value(bond, TODAY, factor, spread=spread) == pytest.approx(150.0, rel=1e-9)
    loss = value(bond, TODAY, factor, spread=spread, default=False) - 150.0
    assert line.expected_credit_loss == pytest.approx(loss, rel=1e-9)
    assert line.spread_duration == pytest.approx(line.measures.effective_duration)


def test_a_floor_counts_for_defaulting_bonds_too() -> None:
    """Recovery comes once: the row of the principal adds none to that of the last coupon."""
    terms: dict[str, Any] = {"default_rate": 0.05, "recovery_rate": 0.5, "index_ratio": 1.2}
    free = Holding("a", HoldingKind.LINKED_BOND, 100.0, 0.02, 2, date(2031, 6, 30), **terms)
    floored = replace(free, has_principal_floor=True)
    high = Inflation(np.array([1.0]), np.array([0.2]))
    one, other = (stand(_held(bond, inflation=high)).lines[0] for bond in (free, floored))
    assert other.measures.present_value == pytest.approx(one.measures.present_value, rel=1e-12)
    assert other.expected_credit_loss == pytest.approx(one.expected_credit_loss, rel=1e-11)
    assert other.flow_count == one.flow_count + 1


def test_flat_curves_by_hand() -> None:
    """Nominal rate 5 %, inflation 2 % past and to come: a linker is worth what a real bond is at 5/2 %.

    Discounting grown payments at 1.05 is discounting real ones at 1.05 / 1.02 (Fisher, I., The Theory of
    Interest, 1930).
    """
    even = Inflation(np.array([1.0]), np.array([0.02]))
    holding = Holding("linker", HoldingKind.LINKED_BOND, 100.0, 0.03, 1, date(2036, 6, 30), index_ratio=1.5)
    book = Book(replace(flat_basis(), inflation=even), FlowTable.empty(), (holding,))
    times = np.array([(date(2026 + year, 6, 30) - TODAY).days / 365.0 for year in range(1, 11)])
    real = np.full(10, 3.0) + np.where(np.arange(10) == 9, 100.0, 0.0)
    worth = 1.5 * real * (1.02 / 1.05) ** times
    line = stand(book).lines[0]
    assert line.measures.present_value == pytest.approx(worth.sum(), rel=1e-13)
    assert line.measures.effective_duration == pytest.approx((worth * times).sum() / worth.sum(), rel=1e-13)
    price = holding_prices(book)[0]
    assert price.effective_yield == pytest.approx(0.05, abs=6e-5)
    assert price.real_yield == pytest.approx(1.05 / 1.02 - 1.0, abs=6e-5)
    assert price.real_modified_duration == pytest.approx(
        price.modified_duration * 1.05 / (1.05 / 1.02), rel=1e-4
    )
    detail = line_flows(book, Side.ASSETS, 0)
    assert detail.real_amount is not None
    assert detail.index_factor is not None
    np.testing.assert_allclose(detail.real_amount, 1.5 * real, rtol=1e-13)
    np.testing.assert_allclose(detail.index_factor, 1.02**times, rtol=1e-13)
    np.testing.assert_allclose(detail.amount, detail.real_amount * detail.index_factor, rtol=1e-14)


def test_only_a_line_that_grows_opens_with_real_amounts() -> None:
    book = _lines(LineTerms(Side.LIABILITIES, "Mixed", Indexation(LINKED)))
    assert line_flows(book, Side.LIABILITIES, 0).real_amount is None
    nothing = replace(book.liabilities, amount=np.where(book.liabilities.time == 2.2, 0.0, 40.0))
    for table, real in ((book.liabilities, [40.0, 25.0]), (nothing, [0.0, 40.0])):
        detail = line_flows(replace(book, liabilities=table), Side.LIABILITIES, 2)
        assert detail.real_amount is not None
        assert detail.index_factor is not None
        expected = [growth(Indexation(LINKED), time, index(INFLATION), 0.0) for time in (2.2, 17.0)]
        np.testing.assert_array_equal(detail.real_amount, real)
        np.testing.assert_allclose(detail.index_factor, expected, rtol=1e-12)
        np.testing.assert_allclose(detail.amount, detail.real_amount * detail.index_factor)
    rising = _lines(LineTerms(Side.LIABILITIES, "Mixed", Indexation(RISING, rise=0.5)), inflation=None)
    factor = line_flows(rising, Side.LIABILITIES, 2).index_factor
    assert factor is not None
    np.testing.assert_allclose(factor, [1.5**2.2, 1.5**17.0])


def test_assets_of_many_kinds_keep_their_places() -> None:
    """Linked bonds, a floater and linked flows beside one another: amounts are real amounts times growth."""
    linker = Holding(
        "L", HoldingKind.LINKED_BOND, 100.0, 0.01, 1, date(2031, 6, 30), has_principal_floor=True
    )
    book = replace(
        _lines(LineTerms(Side.ASSETS, "Rent", Indexation(COLLARED, cap=0.02))),
        holdings=(
            Holding("Fund", HoldingKind.FUND, market_value=10.0),
            linker,
            Holding("F", HoldingKind.FLOATER, 50.0, 0.0, 2, date(2029, 3, 31), current_rate=0.03),
            replace(linker, index_lag_months=8, has_principal_floor=False),
        ),
    )
    flows = priced_flows(book, Side.ASSETS).flows
    assert flows.index_class is not None
    assert flows.real_amount is not None
    kinds = [
        {
            None if number < 0 else flows.indexations[number]
            for number in flows.index_class[flows.line == line]
        }
        for line in range(len(flows.line_names))
    ]
    assert kinds == [
        {None},
        {Indexation(LINKED, lag=0.25), Indexation(LINKED, lag=0.25, least=1.0)},
        {None},
        {Indexation(LINKED, lag=8.0 / 12.0)},
        {None},
        {Indexation(COLLARED, cap=0.02)},
    ]
    on = index(INFLATION)
    for real, amount, paid, number, time in zip(
        flows.real_amount, flows.amount, flows.paid, flows.index_class, flows.time, strict=True
    ):
        kind = Indexation() if number < 0 else flows.indexations[number]
        assert amount == pytest.approx(real * growth(kind, float(time), on, 0.013), rel=1e-9)
        if number >= 0:
            assert paid == amount


def test_many_linked_bonds_share_their_classes() -> None:
    holdings = [
        Holding(
            str(number), HoldingKind.LINKED_BOND, 100.0, 0.01, 1, date(2031, 6, 30), index_ratio=1.0 + number
        )
        for number in range(40)
    ]
    priced = price_holdings(holdings, _basis())
    assert priced.indexations == (Indexation(LINKED, lag=0.25),)


@pytest.mark.parametrize(
    ("terms", "match"),
    [
        ({"index_lag_months": -1}, "`index_lag_months` must be from 0 to 60"),
        ({"index_lag_months": 61}, "`index_lag_months` must be from 0 to 60"),
        ({"index_ratio": 0.0}, "`index_ratio` must be finite and above 0"),
        ({"index_ratio": math.nan}, "`index_ratio` must be finite and above 0"),
        ({"kind": HoldingKind.BOND, "has_principal_floor": True}, "`has_principal_floor` must not be given"),
        ({"maturity": None}, "`maturity` must be given"),
        ({"frequency": 3}, "`frequency` must be 1, 2, 4 or 12"),
    ],
)
def test_linked_bonds_that_make_no_sense(terms: dict[str, Any], match: str) -> None:
    holding = Holding("L", HoldingKind.LINKED_BOND, 100.0, 0.01, 1, date(2031, 6, 30))
    with pytest.raises(ValueError, match=match):
        replace(holding, **terms)


def test_a_bond_past_its_maturity_and_a_price_that_fits_no_spread() -> None:
    past = Holding(
        "Past", HoldingKind.LINKED_BOND, 100.0, 0.01, 1, date(2020, 6, 30), has_principal_floor=True
    )
    odd = replace(past, name="Odd", maturity=date(2030, 6, 30), market_value=-5.0)
    standing = stand(_held(past, odd))
    assert [fault.found for fault in standing.faults] == [
        "holding 'Past' has maturity 2020-06-30",
        "holding 'Odd' has a market value of -5 that no spread gives",
    ]
    assert standing.lines[0].measures.present_value == 0.0
