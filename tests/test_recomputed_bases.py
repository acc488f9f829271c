"""Expected inflation and a second basis as the command prints them, against the books valued again.

Moves of inflation are recomputed by moving the index itself: nothing is differentiated. The sources stand in
`tests.recomputed`.
"""

from __future__ import annotations

import math
from functools import cache
from pathlib import Path
from typing import Any

import pytest
from openpyxl import load_workbook

from tests.recomputed import (
    BOOKS,
    KEYS,
    POINT,
    SECOND,
    Side,
    close,
    grown_sides,
    opened,
    price_index,
    printed,
    sides,
)
from tests.recomputed_cells import ROOT

INFLATED = [book for book in BOOKS if opened(book).inflation]
STEP = 1e-5
"""Of central differences: their error is of the order of its square."""


@cache
def rise(book: str, key: int | None, size: float) -> tuple[float, float]:
    """How much both sides gain from a move of expected inflation."""
    (held, promised), before = grown_sides(book, (key, size)), sides(book)
    return _gain(held, before[0]), _gain(promised, before[1])


def _gain(after: Side, before: Side) -> float:
    """How much more one side is worth."""
    return math.fsum((*after.values, *(-value for value in before.values)))


def test_some_demo_books_follow_prices() -> None:
    assert INFLATED


@pytest.mark.parametrize("book", INFLATED)
def test_inflation_dv01_and_durations(book: str) -> None:
    stated = printed(book, "value")["inflation"]
    worth = [side.total() for side in sides(book)]
    up, down = rise(book, None, STEP), rise(book, None, -STEP)
    slopes = [(one - other) / (2 * STEP) for one, other in zip(up, down, strict=True)]
    dv01 = rise(book, None, POINT)
    for name, value, slope, gain in zip(("assets", "liabilities"), worth, slopes, dv01, strict=True):
        assert close(stated[f"dv01_{name}"], gain, POINT * value)
        assert stated[f"{name}_duration"] == pytest.approx(slope / value, rel=2e-6)
    assert close(stated["dv01_gap"], dv01[0] - dv01[1], POINT * worth[0])
    gap = (slopes[0] - slopes[1]) / worth[0]
    assert stated["real_duration_gap"] == pytest.approx(gap, rel=2e-6)


@pytest.mark.parametrize("book", INFLATED)
def test_key_rates_of_inflation(book: str) -> None:
    stated = printed(book, "value")["inflation"]
    assert [row["term"] for row in stated["key_rates"]] == list(KEYS)
    for number, (name, side) in enumerate(zip(("assets", "liabilities"), sides(book), strict=True)):
        worth = side.total()
        for key in (0, 4, 7, len(KEYS) - 1):
            row = stated["key_rates"][key]
            assert close(row[f"dv01_{name}"], rise(book, key, POINT)[number], POINT * worth)
            slope = (rise(book, key, STEP)[number] - rise(book, key, -STEP)[number]) / (2 * STEP)
            assert row[name] == pytest.approx(slope / worth, rel=1e-5, abs=1e-7)
        total = math.fsum(row[name] for row in stated["key_rates"])
        assert close(total, stated[f"{name}_duration"])


@pytest.mark.parametrize("book", INFLATED)
def test_periods_in_todays_money(book: str) -> None:
    stated, index = printed(book, "value")["inflation"]["real_periods"], price_index(book)
    scale = max(row["liabilities"] for row in stated)
    for number, name in enumerate(("assets", "liabilities")):
        for row in stated:
            real = math.fsum(
                flow.amount * math.exp(-index(flow.time))
                for flow in sides(book)[number].rows
                if flow.paid and max(math.ceil(flow.time - 1e-9), 1) == row["year"]
            )
            assert close(row[name], real, scale)
    for row in stated:
        assert close(row["net"], row["assets"] - row["liabilities"], scale)


@pytest.mark.parametrize("book", INFLATED)
def test_lines_that_follow_prices(book: str) -> None:
    stated = printed(book, "value")["lines"]
    moved, still = grown_sides(book, (None, POINT)), sides(book)
    wanted = [
        after.only(number).total() - before.only(number).total()
        for after, before in zip(moved, still, strict=True)
        for number in range(len(before.names))
    ]
    for row, gain in zip(stated, wanted, strict=True):
        assert close(row["inflation_dv01"], gain, POINT * abs(row["present_value"]))
        assert (gain == 0.0) or (row["indexation"] is not None)


@pytest.fixture(scope="module")
def with_spreads(tmp_path_factory: pytest.TempPathFactory) -> str:
    """A demo book whose second basis has spreads by term and inflation of its own."""
    file = load_workbook(ROOT / "demo_books" / "pension_fund.xlsx")
    del file["Second liability bonds"]
    for row in file["Second basis"].iter_rows():
        if row[0].value == "Liability basis":
            row[1].value = "spread by term"
        if row[0].value == "Liability spread":
            row[1].value = 0.001
    file["Second basis"].append(("Inflation volatility", 0.009))
    file["Second basis"].append(("Recent inflation", 0.024))
    for name, headings, rows in (
        ("Second liability spreads", ("Term", "Spread"), [(2, 0.004), (10, 0.0065), (25, 0.005)]),
        ("Second inflation", ("Term", "Rate"), [(1, 0.021), (5, 0.0195), (30, 0.0235)]),
    ):
        sheet: Any = file.create_sheet(name)
        sheet.append(headings)
        for cells in rows:
            sheet.append(cells)
    path = tmp_path_factory.mktemp("books") / "two_bases"
    file.save(Path(f"{path}.xlsx"))
    return str(path)


def test_both_bases_are_valued_from_their_own_cells(with_spreads: str) -> None:
    found = printed(with_spreads, "value")
    second = found["second_basis"]
    assert second["liability_basis"]["method"] == "spread by term"
    for stated, name in ((found, with_spreads), (second, with_spreads + SECOND)):
        held, promised = sides(name)
        for key, side in (("assets", held), ("liabilities", promised)):
            wanted = side.measures()
            assert {at: stated[key][at] for at in wanted if not close(stated[key][at], wanted[at])} == {}
        assert close(stated["surplus"], held.total() - promised.total(), held.total())
        _lines_agree(stated["lines"], (held, promised))
        rate = stated["liability_basis"]["single_equivalent_rate"]
        assert close(rate, promised.measures()["equivalent_rate"])
    assert second["liabilities"]["present_value"] != found["liabilities"]["present_value"]


def _lines_agree(stated: list[dict[str, Any]], both: tuple[Side, Side]) -> None:
    """Each line is worth what its rows are."""
    wanted = [side.only(number).total() for side in both for number in range(len(side.names))]
    assert len(stated) == len(wanted)
    assert all(close(row["present_value"], value) for row, value in zip(stated, wanted, strict=True))


def test_differences_are_the_first_basis_less_the_second(with_spreads: str) -> None:
    found = printed(with_spreads, "value")
    second, differences = found["second_basis"], found["second_basis"]["differences"]
    for side in ("assets", "liabilities"):
        for name, value in differences[side].items():
            assert value == found[side][name] - second[side][name]
    for name in ("surplus", "funding_ratio", "duration_gap", "dv01_gap"):
        assert differences[name] == found[name] - second[name]
