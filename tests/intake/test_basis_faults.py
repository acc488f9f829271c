"""Faults of the sheets of bases: bonds, formulas, spreads, inflation, the second basis."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date
from functools import partial
from pathlib import Path

import pytest

from desk.intake.records import Reading
from desk.intake.workbook import read_workbook
from tests.intake.books import Sheets, save, sound_sheets
from tests.intake.further_books import by_bonds, by_formula, wide_sheets
from tests.intake.spoilt_books import MILD, Spoilt, add, check_spoilt, drop, read_spoilt
from tests.intake.test_faults import both, drop_column, drop_item, item, put

exact = partial(by_bonds, Bond_fit="exact")
svensson, flat = partial(by_formula, "svensson"), partial(by_formula, "flat")
B, S, LT = "Curve bonds", "Second liability bonds", "Line terms"

CASES = [
    # curves of bonds
    Spoilt("bond sheet missing", drop(B), "", 'sheet "Curve bonds" is missing', start=by_bonds),
    Spoilt("bond past", put(B, "B3", date(2026, 9, 30)), f"{B}!B3", "matured on 2026-09-30", start=by_bonds),
    Spoilt("bond far", put(B, "B3", date(2300, 1, 1)), f"{B}!B3", "more than 200 years", start=by_bonds),
    Spoilt("no maturity", put(B, "B3", None), f"{B}!B3", "the cell is empty", start=by_bonds),
    Spoilt("neither", put(B, "E3", None), f"{B}!E3", "neither a price nor a yield", start=by_bonds),
    Spoilt("both", put(B, "G3", 0.03), f"{B}!G3", "stands beside a price", start=by_bonds),
    Spoilt("price zero", put(B, "E3", 0), f"{B}!E3", "the price is 0", start=by_bonds),
    Spoilt("price per 1", put(B, "E3", 0.99), f"{B}!E3", "per 100 of nominal", MILD, by_bonds),
    Spoilt("bond yield in per cent", put(B, "G8", 3.1), f"{B}!G8", "which is 310 %", start=by_bonds),
    Spoilt("coupon negative", put(B, "C3", -0.01), f"{B}!C3", "the coupon is -0.01", start=by_bonds),
    Spoilt("bond frequency", put(B, "D3", 3), f"{B}!D3", "the frequency is 3", start=by_bonds),
    Spoilt("frequency empty", put(B, "D3", None), f"{B}!D3", "1 coupon a year is taken", MILD, by_bonds),
    Spoilt("no frequencies", drop_column(B, "Frequency"), B, '"Frequency" is missing; 1', MILD, by_bonds),
    Spoilt(
        "no prices",
        both(drop_column(B, "Price"), drop_column(B, "Yield")),
        B,
        'neither "Price"',
        start=by_bonds,
    ),
    Spoilt("price kind", put(B, "F3", "net"), f"{B}!F3", "no known price kind", start=by_bonds),
    Spoilt("no bonds", lambda s: s.update({B: s[B][:1]}), B, "holds no bonds", start=by_bonds),
    Spoilt("few bonds", lambda s: s.update({B: s[B][:4]}), B, "the bonds give no curve", start=by_bonds),
    Spoilt("bonds twice", put(B, "B5", date(2030, 5, 15)), f"{B}!B5", "in row 3 already", start=exact),
    Spoilt("bonds impossible", put(B, "E4", 1e-3), f"{B}!E4", "give no curve", start=exact),
    Spoilt(
        "bond fit odd", item("Basis", "Bond fit", "cubic"), "Basis!B11", "no known bond fit", start=by_bonds
    ),
    Spoilt("interpolation of exact", drop_item("Basis", "Interpolation"), "Basis", "is missing", start=exact),
    Spoilt(
        "unused curve",
        add("Basis"),
        "Curve",
        "is not used and was not read",
        MILD,
        lambda: by_bonds() | {"Curve": [["Term", "Rate"], ["x", None]]},
    ),
    Spoilt(
        "unused and kept",
        add("Basis"),
        "Liability spreads",
        "not used, though it is kept",
        MILD,
        lambda: by_bonds() | {"Liability spreads": [["Term", "Spread"], [1, 0.01]]},
    ),
    Spoilt(
        "unused bonds",
        add("Basis"),
        B,
        "is not used and was not read",
        MILD,
        lambda: flat() | {B: [["Maturity", "Coupon"], ["x", 0.02]]},
    ),
    # curves that come to an ultimate forward rate
    Spoilt(
        "alpha",
        both(
            item("Basis", "Beyond the last quote", "smith-wilson"),
            item("Basis", "Ultimate forward rate", 0.042),
            item("Basis", "Convergence point", 31),
            item("Basis", "Convergence tolerance", 1e-12),
        ),
        "Basis!B13",
        "no alpha brings the forward rate at 31 years",
        start=sound_sheets,
    ),
    Spoilt(
        "converged before",
        both(
            item("Basis", "Beyond the last quote", "smith-wilson"),
            item("Basis", "Ultimate forward rate", 0.042),
            item("Basis", "Convergence point", 20),
        ),
        "Basis!B13",
        "is not after the last liquid point",
        start=sound_sheets,
    ),
    # formulas and flat curves
    Spoilt(
        "tau zero", item("Basis", "Tau 1 (years)", 0), "Basis!B14", "the tau 1 (years) is 0", start=svensson
    ),
    Spoilt(
        "tau missing", drop_item("Basis", "Tau 2 (years)"), "Basis", 'item "Tau 2 (years)" is', start=svensson
    ),
    Spoilt("beta missing", drop_item("Basis", "Beta 1"), "Basis", '"Beta 1" is missing', start=svensson),
    Spoilt("beta in per cent", item("Basis", "Beta 1", -2.1), "Basis!B12", "below -50 %", start=svensson),
    Spoilt(
        "one hump",
        item("Basis", "Beta 3", 0.01),
        "Basis!B15",
        "Beta 3 is not used",
        MILD,
        partial(by_formula, "nelson-siegel"),
    ),
    Spoilt("no flat rate", drop_item("Basis", "Flat rate"), "Basis", '"Flat rate" is missing', start=flat),
    Spoilt("flat rate unused", item("Basis", "Flat rate", 0.01), "Basis!B13", "Flat rate is not used", MILD),
    Spoilt(
        "flat by Smith-Wilson",
        both(
            item("Basis", "Beyond the last quote", "smith-wilson"),
            item("Basis", "Ultimate forward rate", 0.03),
        ),
        "Basis!B12",
        "has no quotes from which",
        start=flat,
    ),
    Spoilt("flat and payments", item("Basis", "Payments a year", 2), "Basis!B12", "not used", MILD, flat),
    # liabilities
    Spoilt(
        "liability basis", item("Basis", "Liability basis", "swap"), "Basis!B11", "no known liability basis"
    ),
    Spoilt("spreads missing", drop("Liability spreads"), "", '"Liability spreads" is missing'),
    Spoilt("spread term", put("Liability spreads", "A2", -1), "Liability spreads!A2", "the term is -1"),
    Spoilt("spread order", put("Liability spreads", "A3", 0), "Liability spreads!A3", "stands twice"),
    Spoilt("spread in per cent", put("Liability spreads", "B3", 60), "Liability spreads!B3", "6000 %"),
    Spoilt(
        "no expected return",
        item("Basis", "Liability basis", "expected return"),
        "Basis",
        '"Expected return" is missing',
    ),
    Spoilt("corporate past", put(S, "B4", date(2020, 1, 1)), f"{S}!B4", "matured on"),
    Spoilt("corporates missing", drop(S), "", f'"{S}" is missing'),
    # the second basis
    Spoilt(
        "other date",
        item("Second basis", "Valuation date", date(2026, 6, 30)),
        "Second basis!B8",
        "is not that of the first basis, 2026-09-30",
    ),
    Spoilt("other currency", item("Second basis", "Currency", "USD"), "Second basis!B8", "USD is not that"),
    Spoilt("other day count", item("Second basis", "Day count", "Act/360"), "Second basis!B8", "not that of"),
    Spoilt(
        "second kind", item("Second basis", "Curve kind", "zeros"), "Second basis!B2", "no known curve kind"
    ),
    Spoilt(
        "second curve unused",
        lambda s: s.update({"Second curve": [["Term", "Rate"], [1, 0.02]]}),
        "Second curve",
        "is not used",
        MILD,
    ),
    Spoilt("no second basis", both(drop("Second basis")), S, "is not used", MILD),
    Spoilt(
        "no inflation of its own",
        lambda s: s.update({"Second inflation": [["Term", "Rate"]]}),
        "Second inflation",
        "no expected inflation on this basis",
        MILD,
    ),
    Spoilt(
        "second inflation",
        lambda s: s.update({"Second inflation": [["Term", "Rate"], [0, 0.02]]}),
        "Second inflation!A2",
        "the term is 0",
    ),
    # inflation
    Spoilt("inflation twice", put("Inflation", "A3", 1), "Inflation!A3", "stands twice"),
    Spoilt("inflation in per cent", put("Inflation", "B2", 2.5), "Inflation!B2", "which is 250 %"),
    Spoilt("inflation volatility", item("Basis", "Inflation volatility", -0.1), "Basis!B12", "is -0.1"),
    Spoilt("inflation items alone", drop("Inflation"), "Basis!B12", "Inflation volatility is not used", MILD),
    Spoilt(
        "linked beside an empty sheet",
        lambda s: s.update({"Inflation": [["Term", "Rate"]]}),
        f"{LT}!C4",
        "needs expected inflation",
        MILD,
    ),
    Spoilt("linked without", drop("Inflation"), f"{LT}!C4", "needs expected inflation", MILD),
    Spoilt(
        "linked bond without",
        both(drop("Inflation"), put("Holdings", "B2", "linked bond")),
        "Holdings!B2",
        "needs expected inflation",
        MILD,
    ),
]


@pytest.fixture(scope="module")
def readings(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Reading]:
    """What each case gives."""
    return read_spoilt(CASES, tmp_path_factory.mktemp("cases"))


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_each_fault_is_found_where_it_is(case: Spoilt, readings: dict[str, Reading]) -> None:
    check_spoilt(case, readings[case.name])


@pytest.mark.parametrize(
    "start",
    [wide_sheets, by_bonds, exact, svensson, flat, partial(by_formula, "nelson-siegel")],
    ids=["wide", "bonds", "exact", "svensson", "flat", "nelson-siegel"],
)
def test_sound_workbooks_have_no_fault(start: Callable[[], Sheets], tmp_path: Path) -> None:
    reading = read_workbook(save(start(), tmp_path / "book.xlsx"))
    assert reading.faults == ()
    assert reading.book is not None
