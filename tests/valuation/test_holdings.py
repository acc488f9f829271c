"""Every kind of holding against the plain version, and what expected default, prices and faults do."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace
from datetime import date, timedelta

import numpy as np
import pytest

from desk.book import Amortisation, Basis, Book, FlowTable, Holding, HoldingKind, PriceKind, Severity, Side
from desk.rates.day_count import DayCount
from desk.valuation.detail import line_flows
from desk.valuation.holdings import price_holdings
from desk.valuation.priced import priced_flows
from desk.valuation.prices import holding_prices
from desk.valuation.records import LineStanding, Standing
from desk.valuation.standing import stand
from tests.valuation.books import TODAY, basis
from tests.valuation.plain import discount as plain_discount
from tests.valuation.plain_holdings import accrued, payments, value

EMPTY = FlowTable.empty()
COUNTS = (None, DayCount.ACT_360, DayCount.ACT_365F, DayCount.THIRTY_E_360)


def _book(*holdings: Holding, on: Basis | None = None) -> Book:
    return Book(on or basis(), EMPTY, holdings)


def _stand(*holdings: Holding) -> Standing:
    return stand(_book(*holdings))


def _line(holding: Holding) -> LineStanding:
    return _stand(holding).lines[0]


def _curve(move: float = 0.0) -> Callable[[float], float]:
    """Plain discount factors with every zero rate moved."""
    book = _book()
    return lambda time: plain_discount(book, time) * math.exp(-move * time)


def _day(random: np.random.Generator, low: int, high: int) -> date:
    return TODAY + timedelta(days=int(random.integers(low, high)))


def _random(kind: HoldingKind, random: np.random.Generator) -> Holding:
    """A holding of a kind, odd in every way its kind allows."""
    frequency = int(random.choice([1, 2, 4, 12]))
    end = _day(random, 40, 20 * 365)
    start = min(_day(random, -1500, 700), end - timedelta(days=3)) if random.integers(3) else None
    has_coupons = kind in (HoldingKind.BOND, HoldingKind.FLOATER)
    is_swap = kind in (HoldingKind.PAYER_SWAP, HoldingKind.RECEIVER_SWAP)
    amortisations = list(Amortisation)[: 3 if kind is HoldingKind.BOND else 2]
    return Holding(
        kind.value,
        kind,
        float(random.uniform(10.0, 1000.0)),
        float(random.choice([0.0, random.uniform(-0.01, 0.08)])),
        frequency,
        end,
        COUNTS[int(random.integers(len(COUNTS)))],
        start_date=start if start or kind is not HoldingKind.TERM_DEPOSIT else TODAY - timedelta(days=20),
        ex_dividend_days=int(random.choice([0, 20])) if has_coupons else 0,
        amortisation=amortisations[int(random.integers(len(amortisations)))]
        if has_coupons or is_swap
        else Amortisation.BULLET,
        current_rate=None if random.integers(4) == 0 else float(random.uniform(0.0, 0.06)),
        margin=float(random.choice([0.0, random.uniform(-0.01, 0.03)])),
        floating_frequency=int(random.choice([1, 2, 4, 12])) if is_swap and random.integers(2) else None,
        floating_day_count=COUNTS[int(random.integers(len(COUNTS)))],
        default_rate=0.0 if is_swap else float(random.choice([0.0, random.uniform(0.0, 0.1)])),
        recovery_rate=float(random.uniform(0.0, 1.0)),
    )


WITH_FLOWS = [
    HoldingKind.BOND,
    HoldingKind.ZERO,
    HoldingKind.FLOATER,
    HoldingKind.BILL,
    HoldingKind.TERM_DEPOSIT,
    HoldingKind.PAYER_SWAP,
    HoldingKind.RECEIVER_SWAP,
]


@pytest.mark.parametrize("kind", WITH_FLOWS)
def test_values_and_rate_moves_against_the_plain_version(kind: HoldingKind) -> None:
    """80 of a kind: value, DV01 with the payments projected anew, expected credit loss, value by a spread."""
    random = np.random.default_rng(WITH_FLOWS.index(kind))
    holdings = [_random(kind, random) for _ in range(80)]
    moved = _curve(1e-4)
    for holding, line in zip(holdings, _stand(*holdings).lines, strict=True):
        scale = holding.nominal
        plain = value(holding, TODAY, _curve())
        assert line.measures.present_value == pytest.approx(plain, rel=1e-11, abs=1e-12 * scale)
        if holding.current_rate is not None or kind is HoldingKind.BOND:
            fall = plain - value(holding, TODAY, moved)
            assert line.measures.dv01 == pytest.approx(fall, rel=1e-8, abs=1e-11 * scale)
        if holding.default_rate:
            loss = value(holding, TODAY, _curve(), default=False) - plain
            assert line.expected_credit_loss == pytest.approx(loss, rel=1e-9, abs=1e-11 * scale)
        else:
            assert line.expected_credit_loss is None


@pytest.mark.parametrize("kind", [HoldingKind.BOND, HoldingKind.FLOATER])
def test_accrued_interest_against_the_plain_version(kind: HoldingKind) -> None:
    random = np.random.default_rng(20)
    holdings = [_random(kind, random) for _ in range(150)]
    holdings = [replace(holding, current_rate=0.03) for holding in holdings]
    negative = 0
    for holding, price in zip(holdings, holding_prices(_book(*holdings)), strict=True):
        expected = accrued(holding, TODAY, _curve()) if holding.coupon or kind is HoldingKind.FLOATER else 0.0
        assert price.accrued_interest == pytest.approx(expected, rel=1e-11, abs=1e-12)
        negative += price.is_ex_dividend and price.accrued_interest < 0.0
    assert negative > 3


@pytest.mark.parametrize("kind", [HoldingKind.BOND, HoldingKind.FLOATER, HoldingKind.ZERO])
def test_prices_are_met_by_the_plain_version_at_the_spread_found(kind: HoldingKind) -> None:
    """A clean price, with accrued interest, is what a buyer pays for the expected payments at the spread."""
    random = np.random.default_rng(30)
    holdings = [_random(kind, random) for _ in range(80)]
    holdings = [
        replace(holding, current_rate=0.03, price=float(random.uniform(70.0, 125.0))) for holding in holdings
    ]
    book = _book(*holdings)
    for holding, line, price in zip(holdings, stand(book).lines, holding_prices(book), strict=True):
        assert line.spread is not None
        bought = value(holding, TODAY, _curve(), spread=line.spread, for_buyer=True)
        assert holding.price == pytest.approx(
            100.0 * (bought - price.accrued_interest) / holding.nominal, rel=1e-11
        )
        assert price.clean_price == pytest.approx(holding.price, rel=1e-11)
        whole = value(holding, TODAY, _curve(), spread=line.spread)
        assert line.measures.present_value == pytest.approx(whole, rel=1e-11)
        assert line.market_value == pytest.approx(whole, rel=1e-11)
        # The spread moves the discounting of payments that stay as they are.
        sides = [value(holding, TODAY, _curve(), spread=line.spread + move) for move in (-1e-5, 1e-5)]
        duration = (sides[0] - sides[1]) / 2e-5 / whole
        assert line.spread_duration == pytest.approx(duration, rel=1e-7)
        assert price.spread_duration == pytest.approx(duration, rel=1e-7)


def test_a_floater_is_worth_its_nominal_at_a_reset_and_moves_like_a_short_one() -> None:
    note = Holding(
        "note",
        HoldingKind.FLOATER,
        500.0,
        frequency=2,
        maturity=date(2046, 6, 30),
        start_date=TODAY,
        current_rate=0.0,
    )
    first = date(2026, 12, 30)
    years = (first - TODAY).days / 365.0
    fair = 2.0 * (1.0 / plain_discount(_book(), years) - 1.0)
    line = _line(replace(note, current_rate=fair))
    assert line.measures.present_value == pytest.approx(500.0, rel=1e-13)
    assert line.measures.effective_duration == pytest.approx(years, rel=1e-12)
    assert line.spread_duration is not None
    assert line.spread_duration > 12.0


@pytest.mark.parametrize("count", [None, DayCount.ACT_360, DayCount.THIRTY_E_360, DayCount.ACT_365F])
def test_what_is_set_today_at_the_curve_needs_no_rate_stated(count: DayCount | None) -> None:
    """A new note is worth its nominal and a new par swap nothing, whatever the day count of the rate."""
    end = date(2036, TODAY.month, TODAY.day)
    note = Holding("note", HoldingKind.FLOATER, 500.0, 0.0, 4, end, count, start_date=TODAY)
    assert _line(note).measures.present_value == pytest.approx(500.0, rel=1e-13)
    years = [(date(TODAY.year + k, TODAY.month, TODAY.day) - TODAY).days / 365.0 for k in range(1, 11)]
    factors = [plain_discount(_book(), year) for year in years]
    swap = Holding(
        *("swap", HoldingKind.PAYER_SWAP, 500.0, (1.0 - factors[-1]) / sum(factors), 1, end),
        start_date=TODAY,
        floating_frequency=4,
        floating_day_count=count,
    )
    assert _line(swap).measures.present_value == pytest.approx(0.0, abs=1e-11)


def test_payer_and_receiver_swaps_cancel() -> None:
    payer = Holding(
        "payer", HoldingKind.PAYER_SWAP, 800.0, 0.03, 1, date(2041, 3, 31), start_date=date(2028, 3, 31)
    )
    standing = _stand(payer, replace(payer, name="receiver", kind=HoldingKind.RECEIVER_SWAP))
    one, two = standing.lines
    assert one.measures.present_value == -two.measures.present_value != 0.0
    assert one.measures.dv01 == pytest.approx(-two.measures.dv01, rel=1e-12)
    # Rates above rise: who pays the fixed rate gains.
    assert one.measures.dv01 < 0.0 < two.measures.dv01
    np.testing.assert_allclose(standing.key_rates.dv01_assets, 0.0, atol=1e-12)


def test_periods_and_details_show_what_is_projected_to_be_paid() -> None:
    note = Holding(
        "note",
        HoldingKind.FLOATER,
        500.0,
        frequency=4,
        maturity=date(2029, 9, 30),
        current_rate=0.04,
        margin=0.01,
        market_value=480.0,
    )
    swap = Holding(
        "swap",
        HoldingKind.RECEIVER_SWAP,
        300.0,
        0.02,
        1,
        date(2033, 5, 15),
        start_date=date(2027, 5, 15),
        floating_frequency=2,
    )
    book = _book(note, swap)
    standing = stand(book)
    total: dict[int, float] = {}
    for holding in (note, swap):
        for row in payments(holding, TODAY, _curve()):
            year = math.ceil((row.when - TODAY).days / 365.0)
            total[year] = total.get(year, 0.0) + row.interest + row.repaid
    expected = [total.get(year, 0.0) for year in standing.periods.year.tolist()]
    np.testing.assert_allclose(standing.periods.assets, expected, rtol=1e-11, atol=1e-11)
    for number, line in enumerate(standing.lines):
        detail = line_flows(book, Side.ASSETS, number)
        assert detail.present_value.sum() == pytest.approx(line.measures.present_value, rel=1e-12, abs=1e-11)
        np.testing.assert_allclose(detail.present_value, detail.amount * detail.discount_factor, rtol=1e-15)
    assert standing.lines[0].flow_count == len(payments(note, TODAY, _curve()))
    assert standing.lines[1].flow_count == len(payments(swap, TODAY, _curve()))


def test_what_was_bought_ex_dividend_does_not_get_the_coupon() -> None:
    bond = Holding(
        "bond", HoldingKind.BOND, 100.0, 0.06, 2, date(2031, 7, 4), ex_dividend_days=7, price=101.0
    )
    held, bought = _line(bond), _line(replace(bond, bought_ex_dividend=True))
    assert held.spread == pytest.approx(bought.spread, rel=1e-12)
    time = 4.0 / 365.0
    assert held.spread is not None
    coupon = 3.0 * plain_discount(_book(), time) * math.exp(-held.spread * time)
    worth = held.measures.present_value - bought.measures.present_value
    assert worth == pytest.approx(coupon, rel=1e-12)
    assert held.flow_count == bought.flow_count == 11
    # Days before, the buyer still gets it.
    early = replace(bond, ex_dividend_days=3, bought_ex_dividend=True)
    assert _line(early).measures.present_value == pytest.approx(
        101.0 + holding_prices(_book(early))[0].accrued_interest, rel=1e-12
    )


def test_certain_recovery_of_par_and_certain_default_bound_the_value() -> None:
    bond = Holding("bond", HoldingKind.BOND, 100.0, 0.05, 1, date(2036, 6, 30))
    sound = _line(bond).measures.present_value
    worse = [_line(replace(bond, default_rate=rate)).measures.present_value for rate in (0.01, 0.05, 0.999)]
    assert sound > worse[0] > worse[1] > worse[2] > 0.0
    assert worse[2] < 0.2
    # Who is repaid in full at the next date loses the later coupons alone.
    full = replace(bond, default_rate=0.999999999, recovery_rate=1.0)
    assert _line(full).measures.present_value == pytest.approx(100.0 * plain_discount(_book(), 1.0), rel=1e-6)


def test_expected_default_is_named_beside_a_market_value_too() -> None:
    bond = Holding(
        "bond",
        HoldingKind.BOND,
        100.0,
        0.05,
        2,
        date(2036, 6, 30),
        market_value=97.0,
        default_rate=0.02,
        recovery_rate=0.4,
    )
    line = _line(bond)
    assert line.measures.present_value == pytest.approx(97.0, rel=1e-12)
    assert line.spread is not None
    promised = value(bond, TODAY, _curve(), spread=line.spread, default=False)
    assert line.expected_credit_loss == pytest.approx(promised - 97.0, rel=1e-10)
    sound = _line(replace(bond, default_rate=0.0)).spread
    assert sound is not None
    # What was the whole spread is now spread and expected loss: 2 % a year, 60 % of it lost.
    assert sound - line.spread == pytest.approx(0.02 * 0.6, abs=2e-3)


def test_bills_by_price_and_by_discount_rate() -> None:
    """A bill of 91 days at a bank discount of 8 %: 100 (1 - 0.08 · 91/360)."""
    end = TODAY + timedelta(days=91)
    by_rate = Holding("bill", HoldingKind.BILL, 1000.0, maturity=end, discount_rate=0.08)
    price = 100.0 * (1.0 - 0.08 * 91.0 / 360.0)
    by_price = replace(by_rate, discount_rate=None, price=price)
    lines = _stand(by_rate, by_price).lines
    for line in lines:
        assert line.measures.present_value == pytest.approx(10.0 * price, rel=1e-13)
    quoted, _ = holding_prices(_book(by_rate, by_price))
    assert quoted.clean_price == quoted.dirty_price == pytest.approx(price, rel=1e-13)
    assert quoted.street_yield == pytest.approx((100.0 / price - 1.0) * 360.0 / 91.0, rel=1e-12)
    assert quoted.effective_yield == pytest.approx((100.0 / price) ** (365.0 / 91.0) - 1.0, rel=1e-12)
    assert quoted.modified_duration == pytest.approx(91.0 / 360.0 * price / 100.0, rel=1e-12)


def test_funds_and_property_count_at_their_market_value() -> None:
    fund = Holding("fund", HoldingKind.FUND, market_value=70.0, duration=4.0)
    standing = _stand(fund, replace(fund, name="offices", kind=HoldingKind.PROPERTY))
    one, two = standing.lines
    assert one.measures == two.measures
    assert two.measures.present_value == pytest.approx(70.0, rel=1e-15)
    assert two.measures.effective_duration == pytest.approx(4.0, rel=1e-15)
    assert two.spread_duration is None
    assert (two.kind, two.flow_count) == ("property", 0)
    for price in holding_prices(_book(fund)):
        assert price.present_value == 70.0
        assert math.isnan(price.clean_price)
        assert math.isnan(price.street_yield)


def test_a_market_value_goes_before_a_price_and_a_gap_is_said() -> None:
    bond = Holding(
        "bond",
        HoldingKind.BOND,
        1000.0,
        0.05,
        2,
        date(2031, 6, 30),
        market_value=990.0,
        price=98.0,
        price_kind=PriceKind.DIRTY,
    )
    standing = _stand(bond)
    assert standing.lines[0].measures.present_value == pytest.approx(990.0, rel=1e-13)
    (fault,) = standing.faults
    assert fault.severity is Severity.MILD
    assert "holding 'bond' has a market value of 990.00 and a price that comes to 980.00" in str(fault)
    assert not _stand(replace(bond, price=98.5)).faults


@pytest.mark.parametrize(
    ("holding", "found"),
    [
        (
            Holding("b", HoldingKind.BOND, 0.0, 0.05, 2, date(2031, 6, 30), price=98.0),
            "holding 'b' has a clean price of 98 that no spread gives",
        ),
        (
            Holding("b", HoldingKind.BILL, 100.0, maturity=date(2027, 6, 30), discount_rate=1.5),
            "holding 'b' has a discount rate of 1.5 that no spread gives",
        ),
        (
            Holding("b", HoldingKind.FLOATER, 100.0, frequency=2, maturity=date(2031, 6, 30)),
            "holding 'b' has no current rate",
        ),
        (
            Holding("b", HoldingKind.PAYER_SWAP, 100.0, 0.02, 2, TODAY),
            f"holding 'b' has maturity {TODAY}",
        ),
        (Holding("b", HoldingKind.PROPERTY), "holding 'b' has no market value"),
    ],
)
def test_faults_name_the_holding(holding: Holding, found: str) -> None:
    standing = _stand(Holding("sound", HoldingKind.ZERO, 10.0, maturity=date(2030, 1, 1)), holding)
    assert [fault.found for fault in standing.faults] == [found]
    assert math.isfinite(standing.assets.present_value)


def test_extreme_holdings_leave_finite_figures_or_faults() -> None:
    end = date(2999, 1, 31)
    holdings = (
        Holding("dear", HoldingKind.FLOATER, 1e-300, 0.0, 12, end, price=1e300, current_rate=1e6, margin=1e6),
        Holding("cheap", HoldingKind.BOND, 1e300, 1e-300, 1, end, price=1e-300, default_rate=0.999999),
        Holding("swap", HoldingKind.PAYER_SWAP, -1e300, -5.0, 12, end, start_date=date(2998, 1, 31)),
        Holding("loan", HoldingKind.BOND, 1.0, -0.999, 1, end, amortisation=Amortisation.ANNUITY),
        Holding("lost", HoldingKind.ZERO, 5.0, maturity=end, default_rate=1.0 - 1e-16, recovery_rate=1.0),
    )
    standing = _stand(*holdings)
    assert len(standing.lines) == len(holding_prices(_book(*holdings))) == 5
    assert len(price_holdings((), basis()).faults) == 0
    assert holding_prices(_book()) == ()


def test_rows_of_every_kind_come_by_line_and_then_by_time() -> None:
    random = np.random.default_rng(40)
    holdings = [_random(kind, random) for _ in range(12) for kind in WITH_FLOWS]
    flows = priced_flows(_book(*holdings), Side.ASSETS).flows
    np.testing.assert_array_equal(np.lexsort((flows.time, flows.line)), np.arange(len(flows)))
    # Only the start of a floating leg that lies ahead is no payment.
    assert not flows.paid[~flows.is_flow].any()
    assert flows.amount[~flows.is_flow].all()
