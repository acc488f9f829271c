"""Shocks as JSON and as text: finite numbers alone, names made safe, bands by the thresholds."""

from __future__ import annotations

from dataclasses import replace

import pytest

from desk.book import Book, Fault, FlowTable
from desk.book.shock import Move, MoveKind, Shock, ShockSettings
from desk.report import as_json
from desk.report.as_shocks import Reached, finite, shocks_object, shocks_text
from desk.valuation.reverse import Goal, reverse_parallel
from desk.valuation.shock_base import shock_base
from desk.valuation.shock_records import band_name
from desk.valuation.shocks import shock_table
from tests.valuation.books import basis, small_book

SHOCKS = (
    Shock("up\x1b[2J\nnext", (Move(MoveKind.PARALLEL, 100.0),), "a rule"),
    Shock("a name that is much longer than any table would have it", (Move(MoveKind.SHORT, 5.0, None),)),
    Shock("of a set", (Move(MoveKind.RATE, 5.0, 2.0),), "another rule", set_name="The set"),
)


def test_an_empty_book_gives_null_and_not_nan() -> None:
    """A ratio without liabilities is no number; the text says n/a."""
    table = shock_table(Book(basis(), FlowTable.empty()), SHOCKS)
    plain = shocks_object(table)
    assert plain["shocks"][0]["funding_ratio"] is None
    assert plain["shocks"][0]["band"] == ""
    assert plain["base"]["duration_gap"] is None
    assert '"funding_ratio": null' in as_json.text(plain)
    assert "n/a" in shocks_text(table)


def test_the_text_is_safe_and_complete() -> None:
    """Control characters are shown, long names cut, a set named above its shocks."""
    table = shock_table(replace(small_book(), shock_settings=ShockSettings(thresholds=(3.0, 1.0))), SHOCKS)
    text = shocks_text(table, title="A book\x07")
    assert "\x1b" not in text
    assert "\x07" not in text
    lines = text.split("\n")
    place = next(number for number, line in enumerate(lines) if line.startswith("The set"))
    assert lines[place + 1].startswith("of a set")
    assert "fair" in lines[place + 1]
    assert any(line.startswith("a name that is much longer") and "…" in line for line in lines)
    assert "The set: another rule" in text
    assert "changes its sign at a parallel move of −105.2 basis points" in text


def test_each_source_is_told_once() -> None:
    """After all that have it; of many the first few."""
    own = tuple(
        Shock(f"own {number}", (Move(MoveKind.PARALLEL, 1.0 + number),), "our rule") for number in range(9)
    )
    table = shock_table(small_book(), (*own[:2], Shock("other", own[0].moves, "a law"), *own[2:]))
    text = " ".join(shocks_text(table).split())
    assert text.count("our rule") == text.count("a law") == 1
    assert "own 0, own 1, own 2, own 3, own 4, own 5 and 3 more: our rule" in text
    table = shock_table(small_book(), own[:2])
    assert "own 0 and own 1: our rule" in shocks_text(table)


def test_faults_are_told_once() -> None:
    """Those of the reading first; what the shocks found after them."""
    table = shock_table(small_book(), (*SHOCKS, Shock("none", ())))
    told = table.faults[0]
    plain = shocks_object(table, (told,))
    assert len(plain["faults"]) == len(table.faults)
    assert plain["faults"][-1]["found"] == "the shock 'none' has no moves"


def test_what_was_reached_and_what_was_not() -> None:
    """The moves, or that there are none."""
    base = shock_base(small_book())
    table = shock_table(small_book(), SHOCKS)
    found = reverse_parallel(base, goal=Goal.FUNDING_RATIO, level=1.9)
    reached = Reached(1.9, found, (), ())
    assert shocks_object(table, reached=reached)["reached"]["parallel"] == list(found.scales)
    assert "bring the funding ratio to 190.00 %" in shocks_text(table, reached=reached)
    none = reverse_parallel(base, goal=Goal.FUNDING_RATIO, level=99.0)
    assert isinstance(none.fault, Fault)
    nothing = Reached(99.0, none, (), (none.fault,))
    assert "None was found." in shocks_text(table, reached=nothing)
    assert shocks_object(table, reached=nothing)["faults"][-1]["found"] == none.fault.found


@pytest.mark.parametrize(
    ("band", "thresholds", "name"),
    [(0, (1.05, 1.0), "good"), (1, (1.05, 1.0), "fair"), (2, (1.05, 1.0), "poor"), (0, (), ""),
     (0, (1.1, 1.0, 0.9), "good"), (2, (1.1, 1.0, 0.9), "2 missed"), (1, (1.0,), "1 missed")],
)  # fmt: skip
def test_bands(band: int, thresholds: tuple[float, ...], name: str) -> None:
    """In words where two thresholds part them."""
    assert band_name(band, thresholds) == name


def test_finite() -> None:
    """None for what is no number."""
    assert [finite(figure) for figure in (1.5, float("nan"), float("inf"), -float("inf"))] == [
        1.5, None, None, None,
    ]  # fmt: skip
