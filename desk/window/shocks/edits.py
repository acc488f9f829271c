"""Edits of the shocks of a book: what is wrong with them, and what a spreadsheet's cells make of them."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

from desk.book import Book, Move, MoveKind, Shock
from desk.book.shock import RATE_MOVES
from desk.valuation.moved_curve import CurveMove
from desk.window.parts import numbers
from desk.window.shocks.wording import KINDS, kind_named, size_from

__all__ = [
    "Pasted",
    "free_name",
    "move_fault",
    "name_fault",
    "own_copy",
    "read_moves",
    "read_shocks",
    "shock_fault",
    "with_added",
    "with_shock",
    "without_shock",
]

_MOST_ROWS = 5_000
_LONGEST = 24
_MOST_SHOWN = 4
_WIDEST = {"bp": 10_000.0, "%": 10_000.0, "% a year": 1_000.0, "years": 100.0}
"""A size beyond it is a slip, in the unit shown."""


def free_name(book: Book, wanted: str) -> str:
    """A name that no shock of the book has: the one wanted, or that with the next number."""
    taken = {shock.name.casefold() for shock in book.shocks}
    wanted = wanted.strip() or "Shock"
    if wanted.casefold() not in taken:
        return wanted
    stem = re.sub(r"\s+\d+$", "", wanted)
    number = 2
    while f"{stem} {number}".casefold() in taken:
        number += 1
    return f"{stem} {number}"


def name_fault(book: Book, name: str, *, but: int = -1) -> str:
    """Why a shock cannot have this name; empty where it can. The one at place `but` may keep its own."""
    name = name.strip()
    if not name:
        return "A shock needs a name."
    for place, shock in enumerate(book.shocks):
        if place != but and shock.name.casefold() == name.casefold():
            return f"There is a shock “{shock.name}” already."
    return ""


def move_fault(move: Move) -> str:
    """Why a move makes no sense, in one line; empty where it does."""
    words = KINDS[move.kind]
    if words.needs_term and (move.term is None or (move.kind is MoveKind.TWIST and move.term <= 0.0)):
        least = "above 0" if move.kind is MoveKind.TWIST else "in years"
        return f"{words.name}: needs a term {least}."
    if move.term is not None and not (words.needs_term or words.may_have_term):
        return f"{words.name}: takes no term."
    if move.target and not words.targets:
        return f"{words.name}: applies to everything, not to “{move.target[:_LONGEST]}”."
    shown = abs(move.size * words.factor)
    if shown > _WIDEST[words.unit]:
        return f"{words.name}: a size of {numbers.number(shown, 0)} {words.unit} is out of all proportion."
    if move.kind is MoveKind.VALUE and move.size < -1.0:
        return f"{words.name}: a fall is at most 100 %."
    if move.kind is MoveKind.DECLINE and move.size <= -1.0:
        return f"{words.name}: a decline must be less than 100 % a year."
    return ""


def shock_fault(shock: Shock) -> str:
    """Why the moves of a shock do not go together, in one line; empty where they do."""
    for place, move in enumerate(shock.moves):
        fault = move_fault(move)
        if fault:
            return f"Move {place + 1}: {fault}" if len(shock.moves) > 1 else fault
    at_terms = [move for move in shock.moves if move.kind is MoveKind.INFLATION and move.term is not None]
    if len({move.term for move in at_terms}) < len(at_terms):
        return "A term stands twice among its moves of inflation."
    if any(move.kind in RATE_MOVES for move in shock.moves):
        try:
            CurveMove(shock.moves, shock.compounding)
        except ValueError as error:
            return f"{str(error)[:1].upper()}{str(error)[1:]}."
    return ""


def with_shock(book: Book, place: int, shock: Shock) -> Book:
    """The book with another shock in a place."""
    return replace(book, shocks=(*book.shocks[:place], shock, *book.shocks[place + 1 :]))


def with_added(book: Book, *shocks: Shock) -> Book:
    """The book with further shocks at the end."""
    return replace(book, shocks=(*book.shocks, *shocks))


def without_shock(book: Book, place: int) -> Book:
    """The book without the shock in a place."""
    return replace(book, shocks=(*book.shocks[:place], *book.shocks[place + 1 :]))


def own_copy(book: Book, shock: Shock) -> Shock:
    """A shock of the user's own with the same moves; its source says where they come from."""
    source = shock.source
    if shock.set_name:
        source = f"after {shock.set_name}: {shock.source}" if shock.source else f"after {shock.set_name}"
    return replace(shock, name=free_name(book, shock.name), source=source, set_name="")


# Cells of a spreadsheet


@dataclass(frozen=True)
class Pasted:
    """What pasted cells hold.

    Attributes
    ----------
    moves : tuple of Move
        Without names of shocks.
    shocks : tuple of Shock
        With them, in order.
    faults : tuple of str
        What could not be read, each with its row among the pasted ones.
    """

    moves: tuple[Move, ...] = ()
    shocks: tuple[Shock, ...] = ()
    faults: tuple[str, ...] = ()

    @property
    def fault(self) -> str:
        """All the faults in one text; empty where there is none."""
        if not self.faults:
            return ""
        more = len(self.faults) - _MOST_SHOWN
        return " ".join(self.faults[:_MOST_SHOWN]) + (f" And {more} more." if more > 0 else "")


_HEADINGS = {
    "shock": "name",
    "name": "name",
    "move": "kind",
    "kind": "kind",
    "size": "size",
    "term": "term",
    "term (years)": "term",
    "applies to": "target",
    "source": "source",
    "unit": "unit",
}


def _headed(row: Sequence[str]) -> dict[str, int] | None:
    """The place of each column that a first row of headings names; None where it is no such row."""
    places: dict[str, int] = {}
    for place, text in enumerate(row):
        folded = " ".join(text.casefold().split())
        key = _HEADINGS.get(folded) or ("size" if folded.startswith("size (") else None)
        if key is not None:
            places.setdefault(key, place)
    return places if "kind" in places and "size" in places else None


def _cell(row: Sequence[str], places: dict[str, int], key: str) -> str:
    place = places.get(key, -1)
    return row[place].strip() if 0 <= place < len(row) else ""


def _read_move(row: Sequence[str], places: dict[str, int], *, as_shares: bool) -> Move | str:
    """A move, or what is wrong with its row."""
    named = _cell(row, places, "kind")
    kind = kind_named(named)
    if kind is None:
        return f"“{named[:_LONGEST]}” is no kind of move" if named else "the kind of move is missing"
    words = KINDS[kind]
    text = _cell(row, places, "size")
    size = numbers.parse_number(text)
    if size is None:
        return f"“{text[:_LONGEST]}” is no size" if text else "the size is missing"
    is_share = words.factor != 1.0
    # A workbook holds shares; in the table here they stand in percent.
    if is_share and not as_shares and not text.endswith(("%", "٪", "‰")):
        size = size_from(kind, size)
    elif not is_share and text.endswith(("%", "٪", "‰")):
        return f"“{text[:_LONGEST]}” is no size in {words.unit}"
    at = _cell(row, places, "term")
    term = numbers.parse_number(at) if at else None
    if at and (term is None or term < 0.0):
        return f"“{at[:_LONGEST]}” is no term"
    move = Move(kind, size, term, _cell(row, places, "target"))
    fault = move_fault(move)
    return fault.rstrip(".") if fault else move


def _rows(grid: Sequence[Sequence[str]]) -> Iterable[tuple[int, Sequence[str]]]:
    return ((place, row) for place, row in enumerate(grid) if any(cell.strip() for cell in row))


def read_moves(grid: Sequence[Sequence[str]]) -> Pasted:
    """Moves from cells: kind, size, term, applies to; under headings in any order.

    Sizes of shares are in percent, as the table shows them.
    """
    if len(grid) > _MOST_ROWS:
        return Pasted(faults=(f"There are {numbers.integer(len(grid))} rows: too many for one shock.",))
    places, rows = {"kind": 0, "size": 1, "term": 2, "target": 3}, list(_rows(grid))
    if rows and (headed := _headed(rows[0][1])) is not None:
        places, rows = headed, rows[1:]
    moves, faults = [], []
    for place, row in rows:
        move = _read_move(row, places, as_shares=False)
        if isinstance(move, str):
            faults.append(f"Row {place + 1}: {move}.")
        else:
            moves.append(move)
    if not moves and not faults:
        faults.append("There is no move among what was pasted.")
    return Pasted(moves=tuple(moves), faults=tuple(faults))


def read_shocks(grid: Sequence[Sequence[str]]) -> Pasted:
    """Shocks from cells as a sheet ``Shocks`` has them: one row a move, rows of one name are one shock.

    Shares are read as a workbook holds them: ``-0.2`` and ``-20 %`` are the same.
    """
    if len(grid) > _MOST_ROWS:
        return Pasted(faults=(f"There are {numbers.integer(len(grid))} rows: too many to paste.",))
    places = {"name": 0, "kind": 1, "size": 2, "term": 3, "target": 4, "source": 5}
    rows = list(_rows(grid))
    if rows and (headed := _headed(rows[0][1])) is not None:
        places, rows = headed, rows[1:]
    moves: dict[str, list[Move]] = {}
    sources: dict[str, str] = {}
    faults = []
    for place, row in rows:
        name = _cell(row, places, "name")
        move = _read_move(row, places, as_shares=True)
        if not name:
            faults.append(f"Row {place + 1}: the name of the shock is missing.")
        elif isinstance(move, str):
            faults.append(f"Row {place + 1}: {move}.")
        else:
            moves.setdefault(name, []).append(move)
            sources[name] = sources.get(name) or _cell(row, places, "source")
    shocks = tuple(Shock(name, tuple(own), sources[name]) for name, own in moves.items())
    faults += [f"{shock.name}: {fault}" for shock in shocks if (fault := shock_fault(shock))]
    if not shocks and not faults:
        faults.append("There is no shock among what was pasted.")
    return Pasted(shocks=shocks, faults=tuple(faults))
