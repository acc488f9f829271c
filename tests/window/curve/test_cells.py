"""Cells pasted from a spreadsheet: dates in their forms, bonds under headings and without."""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from PySide6.QtCore import QLocale

from desk.window.curve.bond_cells import added, merged_bonds, no_bonds, read_bonds, removed, with_cell
from desk.window.curve.dates import read_dates
from tests.window.curve.books import some_bonds

THE_DAY = date(2036, 3, 31)


@pytest.mark.parametrize(
    "text",
    [
        "2036-03-31",
        "2036/3/31",
        "2036-03-31 00:00:00",
        "31/03/2036",
        "31.3.2036",
        "31-03-2036",
        "03/31/2036",
        "31 March 2036",
        "31-Mar-2036",
        "31 Mar. 2036",
        "March 31, 2036",
        "  31/03/2036 ",
    ],
)
def test_a_date_is_read_in_every_form(text: str) -> None:
    assert read_dates([text]) == ([THE_DAY], [""])


def test_the_column_says_whether_days_come_first() -> None:
    assert read_dates(["03/31/2036", "05/04/2036"])[0] == [THE_DAY, date(2036, 5, 4)]
    assert read_dates(["31/03/2036", "05/04/2036"])[0] == [THE_DAY, date(2036, 4, 5)]


def test_without_a_hint_the_locale_says_it() -> None:
    assert read_dates(["05/04/2036"])[0] == [date(2036, 4, 5)]
    QLocale.setDefault(QLocale(QLocale.Language.English, QLocale.Country.UnitedStates))
    assert read_dates(["05/04/2036"])[0] == [date(2036, 5, 4)]


def test_a_column_in_both_orders_is_refused() -> None:
    dates, faults = read_dates(["31/03/2036", "03/31/2036", "2036-03-31", ""])
    assert dates == [None, None, THE_DAY, None]
    assert ["days before months" in fault for fault in faults] == [True, True, False, False]


@pytest.mark.parametrize(
    ("text", "part"),
    [
        ("31/03/36", "four-figure year"),
        ("31-Mar-36", "four-figure year"),
        ("49765", "format the cells as dates"),
        ("2036-02-30", "is no date"),
        ("40/40/2036", "is no date"),
        ("31 Brumaire 2036", "is no date"),
        ("#REF!", "is no date"),
        ("x" * 10_000, "is no date"),
    ],
)
def test_what_is_no_date_is_said(text: str, part: str) -> None:
    (found,), (fault,) = read_dates([text])
    assert found is None
    assert part in fault
    assert len(fault) < 100


@given(st.lists(st.text(max_size=20), max_size=6))
def test_any_text_is_a_date_or_a_fault(texts: list[str]) -> None:
    dates, faults = read_dates(texts)
    assert len(dates) == len(faults) == len(texts)
    for text, found, fault in zip(texts, dates, faults, strict=True):
        assert bool(text.strip()) == (found is not None or bool(fault))


# Bonds


def test_headings_may_be_in_any_order_with_others_between() -> None:
    grid = [
        ["YTM (%)", "ISIN", "Rating", "Maturity Date", "Coupon rate"],
        ["2.4", "XX01", "AA", "31/03/2036", "2.5 %"],
        ["", "", "", "", ""],
        ["2.6 %", "XX02", "AA", "30/04/2040", "3"],
    ]
    found = read_bonds(grid)
    assert not found.faults
    assert found.columns == {
        "yield": [0.024, 0.026],
        "name": ["XX01", "XX02"],
        "maturity": [THE_DAY, date(2040, 4, 30)],
        "coupon": [0.025, 0.03],
    }


def test_a_heading_twice_is_refused() -> None:
    assert read_bonds([["Yield", "YTM", "Coupon"], ["1", "2", "3"]]).fault == (
        "Two columns are headed as the yield."
    )


def test_words_for_frequencies_and_kinds_are_known() -> None:
    found = read_bonds(
        [["Frequency", "Price kind", "Price"], ["Semi-annual", "DIRTY", "99"], ["12", "clean", "1"]]
    )
    assert found.columns["frequency"] == [2, 12]
    assert found.columns["price_kind"] == [False, True]
    wrong = read_bonds([["Frequency", "Price kind", "Price"], ["3", "net", "0"]])
    assert wrong.fault == (
        "Row 2: “3” is no frequency (1, 2, 4 or 12). Row 2: “net” is no price kind (clean or dirty). "
        "Row 2: “0” is no price above 0."
    )


@pytest.mark.parametrize("grid", [[], [[]], [["", ""]], [["Name", "Maturity", "Coupon"]]])
def test_cells_without_a_bond_are_said_to_hold_none(grid: list[list[str]]) -> None:
    assert read_bonds(grid).faults == ("There is no bond among what was pasted.",)


def test_too_many_columns_and_rows_are_refused() -> None:
    assert "8 columns" in read_bonds([["1"] * 8]).fault
    assert "2 columns where a row holds at most 1: yield" in read_bonds([["1", "2"]], "yield").fault
    assert "too many" in read_bonds([["a"]] * 5_001).fault


def test_a_long_list_of_faults_is_cut() -> None:
    found = read_bonds([["Name", "Coupon"], *[["a", "x"]] * 40])
    assert len(found.faults) == 40
    assert found.fault.endswith("And 34 more.")


def test_a_new_bond_has_what_is_usual_where_its_cells_are_blank() -> None:
    found = read_bonds(
        [["", "31/03/2036", "2.5", "", "99", ""], ["B", "31/03/2037", "2.5", "2", "98", "dirty"]]
    )
    bonds, fault = merged_bonds(no_bonds(), found, 0)
    assert not fault
    assert bonds.names == ("Bond 1", "B")
    assert bonds.frequency.tolist() == [1, 2]
    assert bonds.is_clean.tolist() == [True, False]


def test_the_price_counts_where_both_are_pasted() -> None:
    found = read_bonds([["Maturity", "Coupon", "Price", "Yield"], ["2036-03-31", "2", "99", "2.1"]])
    bonds, _ = merged_bonds(no_bonds(), found, 0)
    assert bonds.price.tolist() == [99.0]
    assert np.isnan(bonds.bond_yield).all()


def test_rows_beyond_the_last_need_a_whole_bond() -> None:
    bonds = some_bonds()
    found = read_bonds([["2.1"], ["2.2"]], "yield")
    after, fault = merged_bonds(bonds, found, len(bonds) - 1)
    assert after is bonds
    assert fault == "A new bond needs its maturity, its coupon and a price or a yield."


def test_blank_cells_leave_a_bond_as_it_is() -> None:
    bonds = some_bonds()
    after, _ = merged_bonds(bonds, read_bonds([["Coupon", "Yield"], ["", "2.9"], ["4", ""]]), 1)
    assert after.coupon.tolist()[:3] == [0.025, 0.025, 0.04]
    assert after.bond_yield.tolist()[1:3] == [0.029, bonds.bond_yield[2]]


def test_bonds_that_go_in_and_out_leave_the_others_alone() -> None:
    bonds = some_bonds()
    cells = {
        "name": "N",
        "maturity": np.datetime64("2050-01-01"),
        "coupon": 0.03,
        "frequency": 2,
        "price": 101.0,
    }
    more = added(bonds, 2, **cells)
    assert more.names[3] == "N"
    assert np.isnan(more.bond_yield[3])
    assert removed(more, [3]) == bonds
    assert with_cell(with_cell(bonds, 0, "coupon", 0.05), 0, "coupon", 0.025) == bonds
