"""Edits of shocks: names, faults, and what a spreadsheet's cells make of them."""

from __future__ import annotations

import pytest

from desk.book import Move, MoveKind, Shock
from desk.window.shocks.edits import (
    free_name,
    move_fault,
    name_fault,
    own_copy,
    read_moves,
    read_shocks,
    shock_fault,
)
from desk.window.shocks.settings_form import read_thresholds
from desk.window.shocks.wording import KINDS, kind_named, shown_size, size_from
from tests.window.shocks.books import FALL, a_shocked_fund


def test_every_kind_of_move_has_words_and_is_read_back_by_them() -> None:
    assert set(KINDS) == set(MoveKind)
    for kind, words in KINDS.items():
        assert kind_named(f"  {words.name.upper()} ") is kind
        assert kind_named(kind.value) is kind
        assert size_from(kind, shown_size(Move(kind, 0.07))) == pytest.approx(0.07, rel=1e-14)
    assert kind_named("sideways") is None


def test_a_free_name_is_the_next_number() -> None:
    book = a_shocked_fund(FALL, Shock("rates FALL 2", FALL.moves))
    assert free_name(book, "Rates fall") == "Rates fall 3"
    assert free_name(book, "Rates fall 2") == "Rates fall 3"
    assert free_name(book, "Another") == "Another"
    assert name_fault(book, "RATES FALL")
    assert not name_fault(book, "RATES FALL", but=0)
    assert name_fault(book, "  ")


def test_a_copy_says_where_it_comes_from() -> None:
    copy = own_copy(a_shocked_fund(FALL), Shock("Rates fall", FALL.moves, "a rule", set_name="A set"))
    assert (copy.name, copy.set_name, copy.source) == ("Rates fall 2", "", "after A set: a rule")
    assert copy.moves == FALL.moves


@pytest.mark.parametrize(
    ("move", "said"),
    [
        (Move(MoveKind.RATE, 10.0), "needs a term"),
        (Move(MoveKind.TWIST, 10.0, 0.0), "above 0"),
        (Move(MoveKind.PARALLEL, 10.0, 5.0), "takes no term"),
        (Move(MoveKind.PARALLEL, 10.0, target="bond"), "applies to everything"),
        (Move(MoveKind.PARALLEL, 1e6), "out of all proportion"),
        (Move(MoveKind.VALUE, -1.5), "at most 100"),
        (Move(MoveKind.DECLINE, -1.0), "less than 100"),
    ],
)
def test_a_move_that_makes_no_sense_is_told_in_one_line(move: Move, said: str) -> None:
    fault = move_fault(move)
    assert said in fault
    assert "\n" not in fault
    assert said in shock_fault(Shock("x", (move,)))


def test_moves_that_do_not_go_together_are_told() -> None:
    twice = Shock("x", (Move(MoveKind.RATE, 1.0, 5.0), Move(MoveKind.RATE, 2.0, 5.0)))
    assert "twice" in shock_fault(twice)
    prices = Shock("x", (Move(MoveKind.INFLATION, 1.0, 5.0), Move(MoveKind.INFLATION, 2.0, 5.0)))
    assert "twice" in shock_fault(prices)
    assert not shock_fault(FALL)


def test_moves_are_read_with_and_without_headings() -> None:
    plain = read_moves([["Rate at a term", "25", "5", ""], ["value", "-20", "", "shares"]])
    assert plain.moves == (Move(MoveKind.RATE, 25.0, 5.0), Move(MoveKind.VALUE, -0.2, None, "shares"))
    headed = read_moves([["Term", "Size (bp)", "Move"], ["5", "25", "rate"], ["", "", ""]])
    assert headed.moves == plain.moves[:1]
    with_sign = read_moves([["value", "-20 %"]])
    assert with_sign.moves == (Move(MoveKind.VALUE, -0.2),)


def test_shares_in_rows_of_a_workbook_are_read_as_a_workbook_has_them() -> None:
    read = read_shocks(
        [
            ["Shock", "Move", "Size", "Term", "Applies to", "Source"],
            ["A", "value", "-0.2", "", "", "a view"],
            ["B", "parallel", "50", "", "", ""],
            ["A", "spread", "100", "", "bond", ""],
        ]
    )
    assert read.shocks == (
        Shock("A", (Move(MoveKind.VALUE, -0.2), Move(MoveKind.SPREAD, 100.0, None, "bond")), "a view"),
        Shock("B", (Move(MoveKind.PARALLEL, 50.0),)),
    )


@pytest.mark.parametrize(
    ("grid", "said"),
    [
        ([["sideways", "5"]], "no kind of move"),
        ([["parallel", ""]], "size is missing"),
        ([["parallel", "5 %"]], "no size in bp"),
        ([["rate", "5", "soon"]], "no term"),
        ([["parallel", "1e999"]], "no size"),
        ([], "no move"),
        ([["parallel", "1"]] * 6_000, "too many"),
    ],
)
def test_cells_that_are_no_moves_are_told_by_row(grid: list[list[str]], said: str) -> None:
    read = read_moves(grid)
    assert said in read.fault
    assert not read.moves or len(read.faults) == 1


def test_many_faults_are_summed_up() -> None:
    read = read_shocks([["A", "sideways", "1"]] * 9)
    assert "And 5 more." in read.fault
    assert not read.shocks


def test_thresholds_are_read_in_any_order() -> None:
    assert read_thresholds("100; 105 %") == (1.05, 1.0)
    assert read_thresholds("") == ()
    for bad in ("x", "-5", "100 100", "1 2 3 4 5 6 7"):
        assert isinstance(read_thresholds(bad), str)
