"""The sheet of holdings: every kind with its terms, and a fault at the cell of each slip."""

from __future__ import annotations

from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from desk.book import Amortisation, Holding, HoldingKind, PriceKind, Severity
from desk.intake.columns import address
from desk.intake.layout import SHEETS
from desk.intake.records import Reading
from desk.intake.workbook import read_workbook
from desk.rates.day_count import DayCount
from tests.intake.books import save, sound_sheets

GRAVE, MILD = Severity.GRAVE, Severity.MILD
HEADINGS = SHEETS["Holdings"].columns
END = date(2036, 5, 31)

SOUND: dict[str, dict[str, Any]] = {
    "bond": {"Nominal": 100, "Coupon": 0.03, "Frequency": 2, "Maturity": END},
    "zero": {"Nominal": 100, "Maturity": END},
    "deposit": {"Nominal": 100},
    "fund": {"Market value": 100},
    "floater": {"Nominal": 100, "Frequency": 4, "Maturity": END, "Current rate": 0.02},
    "bill": {"Nominal": 100, "Maturity": date(2027, 3, 31)},
    "term deposit": {"Nominal": 100, "Maturity": date(2027, 3, 31)},
    "payer swap": {"Nominal": 100, "Coupon": 0.03, "Frequency": 1, "Maturity": END, "Current rate": 0.02},
    "receiver swap": {"Nominal": 100, "Coupon": 0.03, "Frequency": 1, "Maturity": END, "Current rate": 0.02},
    "property": {"Market value": 100},
    "linked bond": {"Nominal": 100, "Coupon": 0.01, "Frequency": 2, "Maturity": END},
}
"""What each kind needs, and no more."""


def read(tmp_path: Path, *rows: dict[str, Any], headings: tuple[str, ...] = HEADINGS) -> Reading:
    """A sound book with these holdings, read."""
    stated = [
        [{"Name": f"H{number}", **row}.get(name) for name in headings] for number, row in enumerate(rows)
    ]
    sheets = sound_sheets() | {
        "Holdings": [list(headings), *stated],
        "Inflation": [["Term", "Rate"], [10, 0.02]],
    }
    return read_workbook(save(sheets, tmp_path / "book.xlsx"))


def held(reading: Reading) -> tuple[Holding, ...]:
    """The holdings of a reading without a fault."""
    assert not reading.faults, [str(fault) for fault in reading.faults]
    assert reading.book is not None
    return reading.book.holdings


def test_each_kind_needs_no_more_than_this(tmp_path: Path) -> None:
    holdings = held(read(tmp_path, *({"Kind": kind, **terms} for kind, terms in SOUND.items())))
    assert [holding.kind.value for holding in holdings] == list(SOUND) == [kind.value for kind in HoldingKind]


def test_terms_are_read_as_they_stand(tmp_path: Path) -> None:
    bond, swap, bill = held(
        read(
            tmp_path,
            {
                "Kind": "Bond", **SOUND["bond"], "Day count": "Act/Act ICMA", "Start date": date(2025, 1, 15),
                "First coupon": date(2025, 11, 30), "Ex-dividend days": 7, "Bought ex-dividend": "Yes",
                "Amortisation": "Annuity", "Price": 99.5, "Price kind": "dirty", "Default rate": 0.01,
                "Recovery rate": 0.4,
            },
            {
                "Kind": "payer-swap", **SOUND["payer swap"], "Day count": "30E/360 ISDA",
                "Start date": date(2027, 1, 15), "Margin": -0.001, "Floating frequency": 4,
                "Floating day count": "act/360", "Amortisation": "level",
            },
            {"Kind": "BILL", **SOUND["bill"], "Discount rate": 0.021},
        )
    )  # fmt: skip
    assert bond == Holding(
        "H0", HoldingKind.BOND, 100.0, 0.03, 2, END, DayCount.ACT_ACT_ICMA, start_date=date(2025, 1, 15),
        first_coupon=date(2025, 11, 30), ex_dividend_days=7, bought_ex_dividend=True,
        amortisation=Amortisation.ANNUITY, price=99.5, price_kind=PriceKind.DIRTY, default_rate=0.01,
        recovery_rate=0.4,
    )  # fmt: skip
    assert swap == Holding(
        "H1", HoldingKind.PAYER_SWAP, 100.0, 0.03, 1, END, DayCount.THIRTY_E_360_ISDA,
        start_date=date(2027, 1, 15), amortisation=Amortisation.LEVEL, current_rate=0.02, margin=-0.001,
        floating_frequency=4, floating_day_count=DayCount.ACT_360,
    )  # fmt: skip
    assert (bill.kind, bill.discount_rate, bill.price) == (HoldingKind.BILL, 0.021, None)


NEEDED = [(kind, name) for kind, terms in SOUND.items() for name in terms if name != "Current rate"]


@pytest.mark.parametrize(("kind", "name"), NEEDED)
def test_what_a_kind_needs_must_be_there(kind: str, name: str, tmp_path: Path) -> None:
    reading = read(tmp_path, {"Kind": kind, **SOUND[kind], name: None})
    place = f"Holdings!{address(1, HEADINGS.index(name))}"
    assert [(fault.place, fault.found) for fault in reading.faults] == [(place, "the cell is empty")]
    assert reading.book is None


SLIPS: list[tuple[str, dict[str, Any], str, str, Severity]] = [
    ("bond", {"Kind": "bonds"}, "Kind", 'Did you mean "bond"', GRAVE),
    ("bond", {"Amortisation": "anuity"}, "Amortisation", 'Did you mean "annuity"', GRAVE),
    ("bond", {"Price": 99, "Price kind": "flat"}, "Price kind", "no known price kind", GRAVE),
    ("bond", {"Bought ex-dividend": "perhaps"}, "Bought ex-dividend", "one of yes, no", GRAVE),
    ("payer swap", {"Floating day count": "365"}, "Floating day count", "no known day count", GRAVE),
    ("payer swap", {"Coupon": 3}, "Coupon", "300 % a year", GRAVE),
    ("floater", {"Current rate": 2.1}, "Current rate", "210 % a year", GRAVE),
    ("floater", {"Margin": 1.5}, "Margin", "150 % a year", GRAVE),
    ("bill", {"Discount rate": 2.5}, "Discount rate", "250 % a year", GRAVE),
    ("bond", {"Price": 0}, "Price", "the price is 0", GRAVE),
    ("zero", {"Price": -5}, "Price", "the price is -5", GRAVE),
    ("bond", {"Price": 1e9}, "Price", "the price is 1000000000", GRAVE),
    ("bond", {"Price": 0.98}, "Price", "the price is 0.98 per 100", MILD),
    ("bill", {"Price": 99, "Discount rate": 0.02}, "Discount rate", "beside a price", GRAVE),
    ("bond", {"Start date": END}, "Start date", "is not before the maturity", GRAVE),
    ("payer swap", {"Start date": date(2040, 1, 1)}, "Start date", "is not before the maturity", GRAVE),
    ("term deposit", {"Coupon": 0.02}, "Start date", "the cell is empty", GRAVE),
    ("bond", {"First coupon": date(2027, 5, 31)}, "First coupon", "without a start date", GRAVE),
    (
        "bond", {"Start date": date(2026, 1, 1), "First coupon": date(2025, 11, 30)}, "First coupon",
        "outside the life from 2026-01-01 to 2036-05-31", GRAVE,
    ),
    (
        "floater", {"Start date": date(2026, 1, 1), "First coupon": date(2036, 8, 31)}, "First coupon",
        "outside the life", GRAVE,
    ),
    (
        "bond", {"Start date": date(2026, 1, 1), "First coupon": date(2027, 6, 30)}, "First coupon",
        "is no coupon date", GRAVE,
    ),
    (
        "bond", {"Start date": date(2026, 1, 1), "First coupon": date(2026, 11, 29)}, "First coupon",
        "is no coupon date", GRAVE,
    ),
    ("bond", {"Ex-dividend days": -1}, "Ex-dividend days", "is -1, not from 0 to 150", GRAVE),
    ("bond", {"Ex-dividend days": 151}, "Ex-dividend days", "is 151, not from 0 to 150", GRAVE),
    ("bond", {"Ex-dividend days": 6.5}, "Ex-dividend days", "is 6.5", GRAVE),
    ("bond", {"Bought ex-dividend": "yes"}, "Bought ex-dividend", "are not stated", GRAVE),
    (
        "bond", {"Bought ex-dividend": "yes", "Ex-dividend days": 0}, "Bought ex-dividend",
        "there are 0 ex-dividend days", GRAVE,
    ),
    ("floater", {"Amortisation": "annuity"}, "Amortisation", "for bonds alone", GRAVE),
    ("receiver swap", {"Amortisation": "annuity"}, "Amortisation", "for bonds alone", GRAVE),
    ("payer swap", {"Floating frequency": 3}, "Floating frequency", "the floating frequency is 3", GRAVE),
    ("floater", {"Frequency": 5}, "Frequency", "the frequency is 5", GRAVE),
    ("bond", {"Default rate": 1}, "Default rate", "the default rate is 1", GRAVE),
    ("bill", {"Default rate": -0.01}, "Default rate", "the default rate is -0.01", GRAVE),
    ("bond", {"Default rate": 0.01, "Recovery rate": 40}, "Recovery rate", "the recovery rate is 40", GRAVE),
    ("zero", {"Recovery rate": -0.4}, "Recovery rate", "the recovery rate is -0.4", GRAVE),
    ("property", {"Duration": -3}, "Duration", "the duration is -3", GRAVE),
    ("term deposit", {"Market value": -3}, "Market value", "which no spread gives", GRAVE),
    ("payer swap", {"Market value": -3}, "Market value", "the market value of a swap is -3", MILD),
    ("payer swap", {"Nominal": -100}, "Nominal", "It turns the swap round", MILD),
    ("floater", {"Maturity": date(2026, 9, 30)}, "Maturity", "matured on 2026-09-30", MILD),
]  # fmt: skip


@pytest.mark.parametrize(("kind", "slip", "name", "words", "severity"), SLIPS)
def test_each_slip_is_found_in_its_cell(
    kind: str, slip: dict[str, Any], name: str, words: str, severity: Severity, tmp_path: Path
) -> None:
    reading = read(tmp_path, {"Kind": kind, **SOUND[kind], **slip})
    places = [fault.place for fault in reading.faults]
    assert places == [f"Holdings!{address(1, HEADINGS.index(name))}"], list(map(str, reading.faults))
    assert words in str(reading.faults[0])
    assert reading.faults[0].severity is severity
    assert (reading.book is None) == (severity is GRAVE)


@pytest.mark.parametrize(
    ("kind", "name", "value", "is_kept"),
    [
        ("deposit", "Price", 99, False),
        ("payer swap", "Price", 99, False),
        ("zero", "First coupon", date(2027, 5, 31), False),
        ("bond", "Discount rate", 0.02, False),
        ("fund", "Default rate", 0.02, False),
        ("receiver swap", "Default rate", 0.02, False),
        ("zero", "Amortisation", "level", False),
        ("property", "Coupon", 0.02, True),
        ("bond", "Margin", 0.02, True),
        ("bond", "Floating frequency", 2, True),
        ("bill", "Current rate", 0.02, True),
        ("zero", "Start date", date(2026, 1, 1), True),
        ("bond", "Duration", 5, True),
    ],
)
def test_what_a_kind_has_no_use_for_is_told(
    kind: str, name: str, value: Any, is_kept: bool, tmp_path: Path
) -> None:
    """It does no harm; what even the record of a holding refuses is left out of the book."""
    plain = read(tmp_path, {"Kind": kind, **SOUND[kind]})
    found = read(tmp_path, {"Kind": kind, **SOUND[kind], name: value})
    (fault,) = found.faults
    assert fault.place == f"Holdings!{address(1, HEADINGS.index(name))}"
    assert fault.severity is MILD
    assert f"a {kind} has no {name.lower()}" in fault.found
    assert plain.book is not None
    assert found.book is not None
    assert (found.book.holdings != plain.book.holdings) == is_kept


def test_words_that_say_nothing_are_no_fault(tmp_path: Path) -> None:
    """A column filled down with what holds anyway."""
    usual = {"Amortisation": "bullet", "Price kind": "Clean", "Bought ex-dividend": "no", "Margin": 0}
    held(read(tmp_path, *({"Kind": kind, **terms, **usual} for kind, terms in SOUND.items())))


def test_a_column_that_a_kind_needs_may_be_missing(tmp_path: Path) -> None:
    headings = ("Name", "Kind", "Nominal", "Coupon", "Frequency", "Maturity")
    deposit = {"Kind": "term deposit", **SOUND["term deposit"], "Coupon": 0.02}
    reading = read(tmp_path, deposit, {"Kind": "property"}, headings=headings)
    assert [(fault.place, fault.found) for fault in reading.faults] == [
        ("Holdings!A2", "the term deposit has no start date"),
        ("Holdings!A3", "the property has no market value"),
    ]


def test_no_row_is_refused_without_its_cell(tmp_path: Path) -> None:
    """Rows of anything: what the record of a holding refuses was found in a cell before."""
    generator = np.random.default_rng(11)
    days = [date(2020, 2, 29), date(2026, 9, 30), date(2027, 5, 31), date(2036, 5, 31), date(2036, 8, 30)]
    offered: dict[str, list[Any]] = {
        "Maturity": days,
        "Start date": days,
        "First coupon": days,
        "Frequency": [1, 2, 4, 12, 3],
        "Day count": [str(count) for count in DayCount],
        "Floating day count": [str(count) for count in DayCount],
        "Amortisation": ["bullet", "level", "annuity"],
        "Price kind": ["clean", "dirty"],
        "Bought ex-dividend": ["yes", "no"],
        "Ex-dividend days": [0, 7, 20, 25.0, 26, 151, 301],
        "Floating frequency": [1, 2, 4, 12, 0],
    }
    rates = [-2.0, -0.1, 0, 0.01, 0.5, 1, 1.5]
    rows = []
    for number in range(4000):
        kind = list(SOUND)[number % len(SOUND)]
        picked = generator.choice(HEADINGS[2:], size=generator.integers(5), replace=False).tolist()
        odd = {name: generator.choice(np.array(offered.get(name, rates), dtype=object)) for name in picked}
        rows.append({"Kind": kind, **SOUND[kind], **odd})
    reading = read(tmp_path, *rows)
    refused = [str(fault) for fault in reading.faults if "makes no holding" in fault.found]
    assert not refused
    spoilt = {
        fault.cell.lstrip("ABCDEFGHIJKLMNOPQRSTUVWXYZ") for fault in reading.faults if fault.severity is GRAVE
    }
    assert 500 < len(spoilt) < 3000
