"""What the tests of the station Curve share: bonds in code, and the station's controls."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
from PySide6.QtGui import QGuiApplication

from desk.book import Basis, Book, CurveBonds, CurveKind
from desk.book.arrays import FloatArray
from desk.window.curve.station import CurveStation
from desk.window.parts.fields import ChoiceField
from desk.window.parts.tables import Table
from tests.window.benches import a_fund

HEADINGS = "Name\tMaturity\tCoupon\tFrequency\tPrice\tPrice kind\tYield"
TERMS = np.array([2.0, 3.0, 4.0, 5.0, 7.0, 9.0, 12.0, 16.0, 20.0, 30.0])
YIELDS = np.array([0.021, 0.0228, 0.0239, 0.0251, 0.0268, 0.0277, 0.0291, 0.0299, 0.0301, 0.0297])


def some_bonds(terms: FloatArray = TERMS, yields: FloatArray = YIELDS) -> CurveBonds:
    """Yearly bonds with coupons of 2.5 % by their yields, maturing on 31 March."""
    count = len(terms)
    maturity = np.array([f"{2031 + int(term)}-03-31" for term in terms], "datetime64[D]")
    return CurveBonds(
        tuple(f"Gilt {2031 + int(term)}" for term in terms),
        maturity,
        np.full(count, 0.025),
        np.ones(count, np.int64),
        np.full(count, np.nan),
        np.array(yields, dtype=np.float64),
        np.ones(count, dtype=bool),
    )


def as_cells(bonds: CurveBonds, *, headings: bool = True) -> str:
    """Bonds as a spreadsheet copies them."""
    rows = [
        f"{bonds.names[row]}\t{bonds.maturity[row]}\t{100 * bonds.coupon[row]:g} %\t{bonds.frequency[row]}"
        f"\t\t\t{100 * bonds.bond_yield[row]:.6g} %"
        for row in range(len(bonds))
    ]
    return "\n".join([HEADINGS, *rows] if headings else rows)


def with_bonds(**changes: Any) -> Book:
    """The small fund on a curve of bonds."""
    book, none = a_fund(), np.zeros(0)
    fields = {"curve_kind": CurveKind.BONDS, "bonds": some_bonds(), "terms": none, "rates": none, **changes}
    basis: Basis = replace(book.basis, **fields)
    return replace(book, basis=basis)


def put_on_clipboard(text: str) -> None:
    """Have `text` on the clipboard."""
    QGuiApplication.clipboard().setText(text)


def edit(table: Table, row: int, key: str, text: str) -> bool:
    """Type into a cell; whether it was taken."""
    model = table.table_model
    return model.setData(model.index(row, model.column_of(key)), text)


def shown(table: Table, row: int, key: str) -> str:
    """What a cell shows."""
    model = table.table_model
    return str(model.data(model.index(row, model.column_of(key))))


def choose(field: ChoiceField, text: str) -> None:
    """Choose an entry as the reader does."""
    place = field.combo.findText(text)
    assert place >= 0, f"{text} is not offered"
    field.combo.setCurrentIndex(place)
    field.combo.activated.emit(place)


def choices(field: ChoiceField) -> list[str]:
    """The entries offered."""
    return [field.combo.itemText(place) for place in range(field.combo.count())]


def tabs(station: CurveStation) -> list[str]:
    """The titles of the tables offered."""
    bar = station.pages.tabs
    return [bar.tabText(place) for place in range(bar.count()) if bar.isTabVisible(place)]
