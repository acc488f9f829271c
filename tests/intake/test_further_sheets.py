"""What the sheets of bases, line terms, shocks and market data give, and how they stand in a source."""

from __future__ import annotations

from datetime import date
from pathlib import Path

import numpy as np
import pytest
from openpyxl import load_workbook

from desk.book import (
    BondFit,
    Book,
    CurveKind,
    Indexation,
    IndexationKind,
    Instrument,
    LiabilityMethod,
    LineTerms,
    Move,
    MoveKind,
    Notes,
    PriceKind,
    Severity,
    Shock,
    ShockSettings,
    Side,
    VolatilityKind,
)
from desk.intake.records import Reading
from desk.intake.sheets import SHEETS
from desk.intake.workbook import read_workbook
from desk.rates.compounding import Compounding
from tests.intake.books import Rows, Sheets, save, sound_sheets
from tests.intake.further_books import bond_rows, by_bonds, by_formula, wide_sheets, with_items
from tests.intake.test_faults import put


def read(sheets: Sheets, folder: Path) -> Reading:
    """The workbook with these sheets, read."""
    return read_workbook(save(sheets, folder / "book.xlsx"))


def book_of(sheets: Sheets, folder: Path) -> Book:
    """The book with these sheets."""
    reading = read(sheets, folder)
    assert reading.book is not None, [str(fault) for fault in reading.faults]
    return reading.book


@pytest.fixture(scope="module")
def wide(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A book with every kind of sheet."""
    return book_of(wide_sheets(), tmp_path_factory.mktemp("wide"))


def test_two_bases(wide: Book) -> None:
    first, second = wide.basis, wide.second_basis
    assert first.liability_method is LiabilityMethod.TERM_SPREADS
    np.testing.assert_array_equal(first.liability_terms, [0.0, 10.0])
    np.testing.assert_array_equal(first.liability_spreads, [0.004, 0.006])
    assert second is not None
    assert (second.valuation_date, second.currency, second.day_count) == (
        first.valuation_date, first.currency, first.day_count,
    )  # fmt: skip
    assert (second.curve_kind, second.flat_rate, second.terms.size) == (CurveKind.FLAT, 0.03, 0)
    assert second.liability_fit is BondFit.NELSON_SIEGEL
    assert second.liability_bonds is not None
    assert second.inflation is first.inflation
    assert first.inflation is not None
    assert (first.inflation.volatility, first.inflation.recent) == (0.01, None)


def test_inflation_of_the_second_basis(tmp_path: Path) -> None:
    own: dict[str, Rows] = {"Second inflation": [["Term", "Rate"], [5, 0.03]]}
    sheets = wide_sheets() | own
    sheets["Second basis"] = with_items(
        sheets["Second basis"], Inflation_volatility=0.02, Recent_inflation=0.04
    )
    second = book_of(sheets, tmp_path).second_basis
    assert second is not None
    assert second.inflation is not None
    assert (second.inflation.rates.tolist(), second.inflation.volatility) == ([0.03], 0.02)
    assert second.inflation.recent == 0.04


def test_prices_are_clean_where_nothing_is_said_and_an_index_lags_three_months(tmp_path: Path) -> None:
    sheets = by_bonds()
    kind = sheets["Curve bonds"][0].index("Price kind")
    for row, stated in ((1, None), (2, "dirty"), (3, "clean")):
        sheets["Curve bonds"][row][kind] = stated
    sheets["Holdings"] = [
        ["Name", "Kind", "Nominal", "Coupon", "Frequency", "Maturity", "Price"],
        ["Linked 2040", "linked bond", 100, 0.01, 2, date(2040, 3, 22), 99],
    ]
    book = book_of(sheets, tmp_path)
    assert book.basis.bonds is not None
    assert book.basis.bonds.is_clean[:3].tolist() == [True, False, True]
    (holding,) = book.holdings
    assert holding.price_kind is PriceKind.CLEAN
    assert (holding.index_lag_months, holding.index_ratio, holding.has_principal_floor) == (3, 1.0, False)


def test_terms_of_lines(wide: Book) -> None:
    collared = Indexation(IndexationKind.COLLARED, floor=0.0, cap=0.05)
    assert wide.line_terms == (
        LineTerms(Side.LIABILITIES, "Pensioners", collared, spread=0.001),
        LineTerms(Side.LIABILITIES, "Deferred", Indexation(IndexationKind.RISING, rise=0.02), rate=0.03),
        LineTerms(Side.ASSETS, "Rents", Indexation(IndexationKind.LINKED)),
    )


def test_shocks_keep_the_order_of_the_sheet(wide: Book) -> None:
    steeper = (Move(MoveKind.RATE, -50.0, 1.0), Move(MoveKind.RATE, 50.0, 20.0))
    crash = (
        Move(MoveKind.VALUE, -0.39, target="fund"),
        Move(MoveKind.SPREAD, 100.0, target="State 2% 2036"),
    )
    assert wide.shocks == (
        Shock("Steeper", steeper, "own"),
        Shock("Crash", crash),
        Shock("Longer lives", (Move(MoveKind.AMOUNT, 0.05, target="Pensioners"),)),
    )
    assert wide.shock_settings == ShockSettings(("one", "two"), (1.1, 1.0))


def test_terms_of_a_shock_are_sorted_and_its_rows_may_stand_apart(tmp_path: Path) -> None:
    sheets = sound_sheets()
    sheets["Shocks"] = [
        ["Source", "Size", "Move", "Shock", "Term", "Compounding", "Set"],
        ["a rule", 30, "rate", "Bend", 10, "annual", "mine"],
        [None, 5, "parallel", "Other", None, None, None],
        [None, 20, "Rate", "Bend", 2, None, None],
        [None, 7, "parallel", "Bend", None, None, None],
        [None, 10, "rate", "Bend", 1, None, None],
    ]
    reading = read(sheets, tmp_path)
    assert reading.book is not None
    moves = (
        Move(MoveKind.RATE, 10.0, 1.0), Move(MoveKind.RATE, 20.0, 2.0), Move(MoveKind.PARALLEL, 7.0),
        Move(MoveKind.RATE, 30.0, 10.0),
    )  # fmt: skip
    assert reading.book.shocks == (
        Shock("Bend", moves, "a rule", Compounding.ANNUAL, "mine"),
        Shock("Other", (Move(MoveKind.PARALLEL, 5.0),)),
    )
    assert [fault.place for fault in reading.faults] == ["Shocks!E4", "Shocks!E6"]


@pytest.mark.parametrize(
    ("stated", "thresholds"),
    [([1.1, 1.0, 0.9], (1.1, 1.0, 0.9)), (["None"], ()), (["1.2; 0.8"], (1.2, 0.8)), ([1.5], (1.5,))],
)
def test_thresholds(stated: list[object], thresholds: tuple[float, ...], tmp_path: Path) -> None:
    rows: Rows = [["Item", "Value"], ["Thresholds", *stated], ["Sets", "a", "b; c"]]
    settings = book_of(sound_sheets() | {"Shock settings": rows}, tmp_path).shock_settings
    assert settings == ShockSettings(("a", "b", "c"), thresholds)


def test_market_data(wide: Book) -> None:
    quotes, yields, scenarios = wide.volatilities, wide.yield_history, wide.scenario_set
    assert quotes is not None
    assert yields is not None
    assert scenarios is not None
    assert quotes.instrument == (Instrument.PAYER_SWAPTION, Instrument.CAP)
    assert quotes.kind == (VolatilityKind.NORMAL, VolatilityKind.LOGNORMAL)
    np.testing.assert_array_equal(quotes.length, [10.0, np.nan])
    np.testing.assert_array_equal(quotes.strike, [np.nan, 0.03])
    np.testing.assert_array_equal(quotes.shift, [0.0, 0.01])
    np.testing.assert_array_equal(yields.terms, [1.0, 5.0, 10.0])
    np.testing.assert_array_equal(yields.date, np.array(["2026-07-31", "2026-08-31"], "M8[D]"))
    np.testing.assert_array_equal(yields.rates, [[0.02, 0.025, 0.03], [0.021, 0.026, 0.031]])
    np.testing.assert_array_equal(scenarios.node, [1.0, 2.0, 5.0])
    np.testing.assert_array_equal(scenarios.rate, [[0.02, 0.021, 0.03], [0.01, 0.015, 0.02]])


def test_columns_of_years_may_come_in_any_order_and_without_paths(tmp_path: Path) -> None:
    rows: Rows = [["From outside"], [None, 5, "1 year", 0.25], [7, 0.05, 0.01, 0.002], [8, 0.06, 0.02, 0.003]]
    reading = read(sound_sheets() | {"Scenario set": rows}, tmp_path)
    assert reading.book is not None
    scenarios = reading.book.scenario_set
    assert scenarios is not None
    np.testing.assert_array_equal(scenarios.node, [0.25, 1.0, 5.0])
    np.testing.assert_array_equal(scenarios.rate, [[0.002, 0.01, 0.05], [0.003, 0.02, 0.06]])
    assert {fault.severity for fault in reading.faults} == {Severity.MILD}
    notes = [note for note in reading.book.notes if note.sheet == "Scenario set"]
    assert notes == [Notes("Scenario set", ("Column A",), ((7.0,), (8.0,)))]
    grid = next(grid for grid in reading.sheets if grid.name == "Scenario set")
    assert (grid.heading_row, grid.fields) == (1, {1: "Node 5", 2: "Node 1", 3: "Node 0.25"})


def test_a_set_in_the_wrong_unit_gives_a_bounded_list(tmp_path: Path) -> None:
    """Rates in per cent throughout are told cell by cell at first, then as one for the rest of the column."""
    rows: Rows = [["Path", 1, 2], *([path, 2.5, "x"] for path in range(1, 1001))]
    reading = read(sound_sheets() | {"Scenario set": rows}, tmp_path)
    assert reading.book is None
    assert len(reading.faults) == 2 * 101
    rest = [fault for fault in reading.faults if "900 further cells" in fault.found]
    assert [fault.cell for fault in rest] == ["B102", "C102"]
    assert all("row 1001" in fault.found for fault in rest)


def test_a_history_full_of_gaps_gives_a_bounded_list(tmp_path: Path) -> None:
    days = np.arange("2025-01-01", "2026-03-01", dtype="M8[D]").astype(object).tolist()
    rows: Rows = [
        ["Date", 1, 2],
        *([day, 0.02, 0.02 if place % 2 else None] for place, day in enumerate(days)),
    ]
    reading = read(sound_sheets() | {"Yield history": rows}, tmp_path)
    assert reading.book is not None
    gaps = (len(days) + 1) // 2
    assert [fault.cell for fault in reading.faults[:2]] == ["C2", "C4"]
    assert len(reading.faults) == 101
    assert f"{gaps - 100} further cells of this column begin a gap" in reading.faults[-1].found


def test_order_of_bonds_is_free(tmp_path: Path) -> None:
    sheets = by_bonds(Bond_fit="exact")
    sheets["Curve bonds"][1:] = sheets["Curve bonds"][:0:-1]
    book = book_of(sheets, tmp_path)
    assert book.basis.bonds is not None
    assert book.basis.bonds.names[0] == "Strip 2051"
    fit = book.basis.curve_fit
    assert fit is not None
    assert fit.largest_bp < 1e-6


@pytest.mark.parametrize("kind", ["nelson-siegel", "svensson", "flat"])
def test_a_formula_needs_no_sheet_and_no_interpolation(kind: str, tmp_path: Path) -> None:
    sheets = by_formula(kind)
    sheets["Basis"] = with_items(sheets["Basis"], Interpolation=None)
    basis = book_of(sheets, tmp_path).basis
    assert basis.curve_kind == kind
    assert (basis.parameters is None) == (kind == "flat")
    assert float(basis.curve.discount(10.0)) < 1.0


def test_what_a_basis_does_not_use_is_kept_where_it_is_sound(tmp_path: Path) -> None:
    sheets = sound_sheets() | {"Curve bonds": bond_rows(), "Liability bonds": bond_rows()}
    put("Liability bonds", "E3", -1)(sheets)
    reading = read(sheets, tmp_path)
    assert reading.book is not None
    assert reading.book.basis.bonds is not None
    assert reading.book.basis.liability_bonds is None
    assert [(fault.sheet, fault.severity) for fault in reading.faults] == [
        ("Curve bonds", Severity.MILD), ("Liability bonds", Severity.MILD),
    ]  # fmt: skip


NOTED = [
    name for name, layout in SHEETS.items() if name in wide_sheets() and not layout.items and not layout.more
]


def test_notes_and_hidden_rows_on_every_sheet(tmp_path: Path) -> None:
    sheets = wide_sheets()
    for name in NOTED:
        width = len(sheets[name][0])
        for number, row in enumerate(sheets[name]):
            row += [None] * (width - len(row))
            row.append(f"seen {number}" if number else "Remark")
    path = save(sheets, tmp_path / "book.xlsx")
    workbook = load_workbook(path)
    for name in NOTED:
        workbook[name].row_dimensions[2].hidden = True
        workbook[name].column_dimensions["B"].hidden = True
    workbook.save(path)
    reading = read_workbook(path)
    assert reading.book is not None, [str(fault) for fault in reading.grave]
    assert {note.sheet: note.headings for note in reading.book.notes} == dict.fromkeys(NOTED, ("Remark",))
    for note in reading.book.notes:
        assert note.rows[0] == ("seen 1",)
    for name in NOTED:
        found = [fault.found for fault in reading.faults if fault.sheet == name]
        assert any("row 2 is hidden" in text for text in found), name
        assert any("is hidden and was read" in text and "column" in text for text in found), name


def test_error_cells_of_every_sheet_are_told(tmp_path: Path) -> None:
    sheets = wide_sheets()
    for name in NOTED:
        put(name, "B2", "=1/0")(sheets)
    reading = read(sheets, tmp_path)
    places = {fault.place for fault in reading.grave}
    assert places >= {f"{name}!B2" for name in NOTED}


def test_sheets_that_are_missing_are_named_from_one_list(tmp_path: Path) -> None:
    reading = read(sound_sheets() | {"Something": [["x"]]}, tmp_path)
    (fault,) = reading.faults
    assert fault.expected == f"one of the sheets {', '.join(SHEETS)}"
    assert len(SHEETS) == 25


def test_today_counts_as_past_for_a_bond_and_one_day_more_does_not(tmp_path: Path) -> None:
    sheets = by_bonds()
    put("Curve bonds", "B2", date(2026, 10, 1))(sheets)
    book = book_of(sheets, tmp_path)
    assert book.basis.bonds is not None
    assert book.basis.bonds.maturity[0] == np.datetime64("2026-10-01")


def _without(name: str, headings: set[object]) -> Sheets:
    """The wide book with some columns of a sheet taken out."""
    sheets = wide_sheets()
    kept = [place for place, heading in enumerate(sheets[name][0]) if heading not in headings]
    sheets[name] = [[row[place] for place in kept if place < len(row)] for row in sheets[name]]
    return sheets


@pytest.mark.parametrize("name", NOTED)
def test_any_heading_may_be_missing(name: str, tmp_path: Path) -> None:
    """The book is read to its end, and what is missing is said on that sheet."""
    for heading in SHEETS[name].wanted:
        if heading in wide_sheets()[name][0]:
            reading = read(_without(name, {heading}), tmp_path)
            assert f'the heading "{heading}" is missing' in [fault.found for fault in reading.grave]
            assert {fault.sheet for fault in reading.grave} == {name}
    reading = read(_without(name, set(SHEETS[name].optional)), tmp_path)
    assert {fault.sheet for fault in reading.grave} <= {name}
    assert (reading.book is None) == bool(reading.grave)
