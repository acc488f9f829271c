"""What the commands say of bases, inflation and two bases: objects, tables and frames of one standing."""

from __future__ import annotations

import json
from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from desk import tasks
from desk.book import Book
from desk.report import as_json, as_text, frames
from desk.valuation.records import Standing
from tests.report import examples
from tests.report.full_books import curve_bases, full_book


@cache
def both() -> tuple[Book, Standing, Standing]:
    """A book with everything, valued on both bases."""
    book = full_book()
    other = book.on_second_basis
    assert other is not None
    return book, tasks.value(book), tasks.value(other)


def test_keys_are_the_same_for_every_book() -> None:
    book, first, second = both()
    plain = as_json.standing_object(examples.standing(), book=examples.book())
    full = as_json.standing_object(first, book=book, second=second)
    assert set(plain) == set(full)
    assert [set(row) for row in plain["lines"][:1]] == [set(row) for row in full["lines"][:1]]
    assert plain["inflation"] is None
    assert plain["second_basis"] is None
    assert plain["curve"] == {"kind": "zero", "last_quoted_term": 30.0, "fit": None}
    assert plain["liability_basis"]["method"] == "curve"
    assert plain["liability_basis"]["spreads"] is None
    json.loads(as_json.text(full))


def test_second_basis_has_the_keys_of_a_standing_and_the_differences() -> None:
    book, first, second = both()
    found = as_json.standing_object(first, book=book, second=second)
    other = found["second_basis"]
    assert set(other) == (set(found) - {"faults", "second_basis"}) | {"differences"}
    assert other["surplus"] == second.surplus
    assert other["differences"]["surplus"] == first.surplus - second.surplus
    assert other["differences"]["liabilities"]["dv01"] == first.liabilities.dv01 - second.liabilities.dv01
    assert other["curve"]["kind"] == "svensson"
    assert other["curve"]["last_quoted_term"] is None
    fit = other["liability_basis"]["fit"]
    assert book.second_basis is not None
    wanted = book.second_basis.liability_curve_fit
    assert wanted is not None
    assert fit["rmse_bp"] == wanted.rmse_bp
    assert [bond["residual_bp"] for bond in fit["bonds"]] == wanted.residual_bp.tolist()
    assert [bond["name"] for bond in fit["bonds"]][1] == "=Bond"
    assert other["liability_basis"]["single_equivalent_rate"] == second.liabilities.equivalent_rate


def test_inflation_and_lines_say_how_they_grow() -> None:
    book, first, _ = both()
    found = as_json.standing_object(first, book=book)
    assert first.inflation is not None
    assert found["inflation"]["real_duration_gap"] == first.inflation.real_duration_gap
    assert len(found["inflation"]["key_rates"]) == 14
    assert found["inflation"]["real_periods"][2]["net"] == first.inflation.real_periods.net[2]
    lines = {row["line"]: row for row in found["lines"] if row["side"] == "liabilities"}
    assert lines["Collared"]["indexation"] == {
        "kind": "collared", "rise": None, "floor": 0.0, "cap": 0.025, "lag": 0.0,
    }  # fmt: skip
    assert lines["Rising"]["indexation"]["rise"] == 0.015
    assert lines["Rising"]["inflation_dv01"] == 0.0
    assert lines[examples.HOSTILE]["indexation"] is None
    assert lines["Own spread"]["discounting"] == {"spread": 0.0075, "rate": None}
    assert lines["Own rate"]["discounting"] == {"spread": None, "rate": 0.031}
    held = {row["line"]: row for row in found["lines"] if row["side"] == "assets"}
    assert held["Linked"]["indexation"]["kind"] == "linked"
    assert held["Linked"]["indexation"]["lag"] == 0.25
    assert held["Bond"]["indexation"] is None


def test_text_tells_what_the_book_has_and_no_more() -> None:
    book, first, second = both()
    text = as_text.standing_text(first, book=book, second=second)
    for words in (
        "the curve and a spread by term, and a spread of 20 basis points",
        "Single equivalent rate of the liabilities",
        "Inflation DV01, the rise for +1 bp",
        "First less second",
        "a curve through high-quality corporate bonds, and a spread of −5 basis points",
    ):
        assert words in " ".join(text.split())
    assert max(len(line) for line in text.splitlines()) < 130
    plain = as_text.standing_text(examples.standing(), book=examples.book())
    assert "nflation" not in plain
    assert "Two bases" not in plain
    basis = curve_bases()["bonds, svensson"]
    fitted = replace(examples.book(), basis=basis)
    text = as_text.standing_text(tasks.value(fitted), book=fitted)
    assert "12 bonds, root mean square" in text
    assert "Residual" in text


def test_frames_of_bases_and_inflation() -> None:
    book, first, second = both()
    compared = frames.comparison_frame(first, second)
    assert compared.loc[("both", "surplus"), "difference"] == first.surplus - second.surplus
    assert compared.loc[("assets", "dv01"), "second"] == second.assets.dv01
    assert len(compared) == 2 * 8 + 4
    assert first.inflation is not None
    keys = frames.inflation_key_rate_frame(first)
    assert list(keys.columns) == ["assets", "liabilities", "dv01_assets", "dv01_liabilities"]
    np.testing.assert_array_equal(keys["dv01_assets"], first.inflation.key_dv01_assets)
    np.testing.assert_array_equal(frames.real_period_frame(first)["net"], first.inflation.real_periods.net)
    with pytest.raises(ValueError, match="expected inflation"):
        frames.inflation_key_rate_frame(examples.standing())
    lines = frames.line_frame(first)
    assert lines["inflation_dv01"].sum() == pytest.approx(
        first.inflation.dv01_assets + first.inflation.dv01_liabilities
    )
    assert book.second_basis is not None
    fit, bonds = book.second_basis.liability_curve_fit, book.second_basis.liability_bonds
    assert fit is not None
    assert bonds is not None
    frame = frames.bond_frame(bonds, fit)
    np.testing.assert_array_equal(frame["residual_bp"], fit.residual_bp)
    assert list(frame["name"]) == list(bonds.names)
