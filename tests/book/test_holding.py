"""Holdings that make no sense are refused, with the argument named."""

from __future__ import annotations

from dataclasses import replace
from datetime import date

import pytest

from desk.book import Amortisation, Book, FlowTable, Holding, HoldingKind, PriceKind
from desk.rates.day_count import DayCount
from tests.valuation.books import basis

END = date(2031, 8, 31)
BOND = Holding("x", HoldingKind.BOND, 100.0, 0.03, 2, END)
SWAP = Holding("x", HoldingKind.PAYER_SWAP, 100.0, 0.03, 2, END)


@pytest.mark.parametrize(
    ("holding", "fields", "message"),
    [
        (
            BOND,
            {"kind": HoldingKind.FLOATER, "maturity": None},
            "`maturity` must be given for the floater 'x'",
        ),
        (BOND, {"kind": HoldingKind.BILL, "maturity": None}, "`maturity` must be given for the bill 'x'"),
        (SWAP, {"maturity": None}, "`maturity` must be given for the payer swap 'x'"),
        (SWAP, {"frequency": 0}, "`frequency` must be 1, 2, 4 or 12 for the payer swap 'x'"),
        (SWAP, {"floating_frequency": 3}, "`floating_frequency` must be 1, 2, 4 or 12 for 'x'"),
        (
            BOND,
            {"frequency": 0, "amortisation": Amortisation.LEVEL},
            "`frequency` must be 1, 2, 4 or 12 for the bond 'x'",
        ),
        (BOND, {"start_date": END}, "`start_date` must be before the maturity of 'x'"),
        (BOND, {"start_date": date(2032, 1, 1)}, "`start_date` must be before the maturity of 'x'"),
        (
            BOND,
            {"kind": HoldingKind.TERM_DEPOSIT},
            "`start_date` must be given for the term deposit 'x'",
        ),
        (BOND, {"first_coupon": date(2027, 2, 28)}, "`start_date` must be given beside the first coupon"),
        (
            BOND,
            {"first_coupon": date(2027, 2, 28), "start_date": date(2027, 2, 28)},
            "`first_coupon` must be after the start and by the maturity of 'x'",
        ),
        (
            BOND,
            {"first_coupon": date(2032, 2, 29), "start_date": date(2026, 1, 1)},
            "`first_coupon` must be after the start and by the maturity of 'x'",
        ),
        (
            BOND,
            {"first_coupon": date(2027, 2, 27), "start_date": date(2026, 1, 1)},
            "`first_coupon` must be a coupon date of 'x', counted back from its maturity",
        ),
        (
            BOND,
            {"first_coupon": date(2027, 3, 31), "start_date": date(2026, 1, 1)},
            "`first_coupon` must be a coupon date of 'x'",
        ),
        (
            SWAP,
            {"first_coupon": date(2027, 2, 28), "start_date": date(2026, 1, 1)},
            "`first_coupon` must not be given for the payer swap 'x'",
        ),
        (BOND, {"ex_dividend_days": -1}, "`ex_dividend_days` must be from 0 to 150 for 'x'"),
        (BOND, {"ex_dividend_days": 151}, "`ex_dividend_days` must be from 0 to 150 for 'x'"),
        (BOND, {"bought_ex_dividend": True}, "`ex_dividend_days` must be given for 'x', bought ex-dividend"),
        (
            SWAP,
            {"amortisation": Amortisation.ANNUITY},
            "`amortisation` must be bullet or level for the payer swap 'x'",
        ),
        (
            BOND,
            {"kind": HoldingKind.ZERO, "amortisation": Amortisation.LEVEL},
            "`amortisation` must be bullet for the zero 'x'",
        ),
        (
            BOND,
            {"amortisation": Amortisation.ANNUITY, "coupon": -2.0},
            "`coupon` must be above -2 for the annuity 'x'",
        ),
        (BOND, {"price": 0.0}, "`price` must be above 0 for 'x'"),
        (BOND, {"price": -3.0}, "`price` must be above 0 for 'x'"),
        (BOND, {"price": float("nan")}, "`price` must be finite for 'x'"),
        (SWAP, {"price": 100.0}, "`price` must not be given for the payer swap 'x'"),
        (BOND, {"discount_rate": 0.02}, "`discount_rate` must not be given for the bond 'x'"),
        (
            BOND,
            {"kind": HoldingKind.BILL, "discount_rate": 0.02, "price": 99.0},
            "`price` must not be given beside a discount rate for 'x'",
        ),
        (BOND, {"default_rate": 1.0}, "`default_rate` must be at least 0 and below 1 for 'x'"),
        (BOND, {"default_rate": -0.01}, "`default_rate` must be at least 0 and below 1 for 'x'"),
        (BOND, {"default_rate": float("nan")}, "`default_rate` must be at least 0 and below 1 for 'x'"),
        (BOND, {"recovery_rate": 1.01}, "`recovery_rate` must be from 0 to 1 for 'x'"),
        (BOND, {"recovery_rate": -0.01}, "`recovery_rate` must be from 0 to 1 for 'x'"),
        (SWAP, {"default_rate": 0.01}, "`default_rate` must be 0 for the payer swap 'x'"),
        (BOND, {"kind": HoldingKind.FUND, "default_rate": 0.01}, "`default_rate` must be 0 for the fund 'x'"),
        (BOND, {"current_rate": float("inf")}, "`current_rate` must be finite for 'x'"),
        (BOND, {"margin": float("nan")}, "`margin` must be finite for 'x'"),
    ],
)
def test_what_makes_no_holding_is_refused(holding: Holding, fields: dict[str, object], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        replace(holding, **fields)  # type: ignore[arg-type]  # the fields are wrong on purpose


@pytest.mark.parametrize("first", [date(2027, 2, 28), date(2028, 2, 29), date(2030, 8, 31), END])
def test_first_coupons_on_the_regular_dates_are_taken(first: date) -> None:
    holding = replace(BOND, start_date=date(2026, 1, 1), first_coupon=first)
    assert holding.first_coupon == first


@pytest.mark.parametrize(
    "fields",
    [
        {"start_date": date(2026, 1, 1)},
        {"start_date": date(2026, 1, 1), "first_coupon": date(2027, 2, 28)},
        {"ex_dividend_days": 7},
        {"ex_dividend_days": 7, "bought_ex_dividend": True},
        {"amortisation": Amortisation.ANNUITY},
        {"price": 99.0},
        {"price": 99.0, "price_kind": PriceKind.DIRTY},
        {"current_rate": 0.01},
        {"margin": 0.01},
        {"floating_frequency": 4},
        {"floating_day_count": DayCount.ACT_360},
        {"default_rate": 0.01},
        {"recovery_rate": 0.4},
        {"day_count": DayCount.ACT_360},
        {"units": 2**70},
        {"name": "y"},
        {"kind": HoldingKind.ZERO},
    ],
)
def test_every_field_of_a_holding_enters_the_digest(fields: dict[str, object]) -> None:
    other = replace(BOND, **fields)  # type: ignore[arg-type]  # fields of several types
    digests = {Book(basis(), FlowTable.empty(), held).digest for held in ((BOND,), (other,), (BOND, other))}
    assert len(digests) == 3
    again = Book(basis(), FlowTable.empty(), (replace(other),))
    assert again.digest in digests
