"""The sheet of moves: what each shock is made of, and the formula of its shift by term."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

from desk.book.shock import RATE_MOVES, Move, MoveKind, Shock
from desk.rates.compounding import Compounding
from desk.report.results.plan import FIRST_ROW, Formula, SheetPlan
from desk.valuation.moved_curve import DECAY
from desk.valuation.shock_records import ShockTable

__all__ = ["MOVES_SHEET", "MoveRows", "plan_moves", "shift_formula", "size_unit"]

MOVES_SHEET = "Shock moves"
MOVE_CAP = 20_000
LONGEST_FORMULA = 215
"""Characters of a formula that a reviewer can still follow; a longer one is given as a value."""
_SIZE, _TERM, _SLOPE, _LENGTH = "E", "G", "H", "I"
_JOINED = (MoveKind.RATE, MoveKind.RELATIVE, MoveKind.LEAST, MoveKind.FLOOR)
_SHARES = (MoveKind.RELATIVE, MoveKind.VALUE, MoveKind.AMOUNT)
_MOVED = {
    MoveKind.SPREAD: "Spreads of holdings",
    MoveKind.VALUE: "Funds and property",
    MoveKind.AMOUNT: "All lines of liabilities",
    MoveKind.TIME: "All lines of liabilities",
    MoveKind.DECLINE: "All lines of liabilities",
    MoveKind.INFLATION: "Expected inflation",
}


@dataclass
class MoveRows:
    """Where the moves of one shock stand.

    Attributes
    ----------
    rows : dict of MoveKind to list of int
        Rows of the sheet of moves, one a move.
    moves : dict of MoveKind to list of Move
        The moves there, in the same order.
    """

    rows: dict[MoveKind, list[int]] = field(default_factory=dict)
    moves: dict[MoveKind, list[Move]] = field(default_factory=dict)

    def add(self, move: Move, row: int) -> None:
        """Remember the row of a move."""
        self.rows.setdefault(move.kind, []).append(row)
        self.moves.setdefault(move.kind, []).append(move)


def size_unit(kind: MoveKind) -> str:
    """Unit of the size of a move."""
    if kind in _SHARES:
        return "share"
    if kind is MoveKind.DECLINE:
        return "share a year"
    return "years" if kind is MoveKind.TIME else "basis points"


def in_order(shock: Shock) -> list[Move]:
    """The moves of a shock, kind by kind as they first appear, those joined by lines by rising term."""
    kinds = list(dict.fromkeys(move.kind for move in shock.moves))
    return sorted(
        shock.moves,
        key=lambda move: (kinds.index(move.kind), (move.term or 0.0) if move.kind in _JOINED else 0.0),
    )


def plan_moves(found: ShockTable) -> tuple[SheetPlan, list[MoveRows], dict[str, str]]:
    """Plan the sheet of moves.

    Parameters
    ----------
    found : ShockTable

    Returns
    -------
    plan : SheetPlan
    places : list of MoveRows
        One a shock; without rows where there are more moves than are listed.
    names : dict of str to str
        Names that the workbook defines.
    """
    count = sum(len(result.shock.moves) for result in found.results)
    note = (
        "The moves of one shock happen together. Sizes of rates are of zero rates compounded as it says; "
        "moves of one kind at several terms are joined by straight lines, flat outside them."
    )
    if count > MOVE_CAP:
        note = f"The shocks that make up the first {MOVE_CAP:,} of {count:,} moves. {note}"
    plan = SheetPlan(MOVES_SHEET, "Shock moves: what each shock is made of", note)
    plan.widths = dict(enumerate((7.0, 34.0, 24.0, 11.0, 11.0, 13.0, 9.0, 13.0, 10.0, 32.0, 13.0), start=1))
    plan.widths[12] = 60.0
    plan.headings(
        [
            "Shock number",
            "Shock",
            "Set",
            "Move",
            "Size",
            "Unit",
            "Term [years]",
            "Size to the next term [unit a year]",
            "Years to the next term",
            "Applies to",
            "Compounding",
            "Source",
        ],
        left=0,
    )
    for column in (2, 3, 4, 6, 10, 11, 12):
        plan.put(4, column, plan.cells[4][column].value, "heading_left")
    places: list[MoveRows] = []
    row = FIRST_ROW
    for number, result in enumerate(found.results, start=1):
        place = MoveRows()
        places.append(place)
        moves = in_order(result.shock)
        if row - FIRST_ROW + len(moves) > MOVE_CAP:
            break
        for position, move in enumerate(moves):
            following = moves[position + 1] if position + 1 < len(moves) else None
            _move_row(plan, row, number, result.shock, move, following)
            place.add(move, row)
            row += 1
    places += [MoveRows() for _ in range(len(found.results) - len(places))]
    plan.put(row + 1, 2, "Years over which short moves fade", "text")
    address = plan.put(row + 1, 5, DECAY, "input", "term")
    plan.put(row + 1, 6, "years", "text")
    plan.put(row + 1, 12, "Basel Committee, Interest rate risk in the banking book, 2016, Annex 2", "text")
    return plan, places, {"shock_decay": address}


def _move_row(
    plan: SheetPlan, row: int, number: int, shock: Shock, move: Move, following: Move | None
) -> None:
    """One move."""
    form = "share" if move.kind in (*_SHARES, MoveKind.DECLINE) else "term"
    target = move.target or _MOVED.get(move.kind, "All rates" if move.term is None else "Rates")
    joined = (
        move.kind in _JOINED
        and following is not None
        and following.kind is move.kind
        and None not in (move.term, following.term)
    )
    step = f"({_SIZE}{row + 1}-{_SIZE}{row})/{_LENGTH}{row}"
    plan.table_row(
        row,
        1,
        [
            (number, "text", "whole"),
            (shock.name, "text", "text"),
            (shock.set_name or "Own", "text", "text"),
            (move.kind.value, "text", "text"),
            (move.size, "input", form),
            (size_unit(move.kind), "text", "text"),
            (move.term, "input", "term"),
            (Formula(f"={step}") if joined else None, "live", "years"),
            (Formula(f"={_TERM}{row + 1}-{_TERM}{row}") if joined else None, "live", "term"),
            (target, "text", "text"),
            (shock.compounding.value, "text", "text"),
            (shock.source or "The book's own", "text", "text"),
        ],
    )


def shift_formula(shock: Shock, place: MoveRows, row: int) -> Formula | None:
    """The shift of the continuous zero rate at one term, from the moves as they are listed.

    Parameters
    ----------
    shock : Shock
    place : MoveRows
        Where its moves stand.
    row : int
        Of the sheet of rates, whose columns hold the term (A), the zero rate (D) and the fading of short
        moves (E).

    Returns
    -------
    Formula or None
        None where it would be too long to follow, or the moves are not listed.
    """
    if not any(move.kind in RATE_MOVES for move in shock.moves):
        return Formula("=0")
    if not place.rows or (MoveKind.LEAST in place.rows and _least_sign(place) == 0):
        return None
    text = _shift(shock, place, row)
    return Formula(text) if len(text) <= LONGEST_FORMULA else None


def _least_sign(place: MoveRows) -> int:
    """1 or -1 where all least sizes are of one sign, else 0."""
    sizes = [move.size for move in place.moves[MoveKind.LEAST]]
    if all(size >= 0.0 for size in sizes):
        return 1
    return -1 if all(size < 0.0 for size in sizes) else 0


def _shift(shock: Shock, place: MoveRows, row: int) -> str:
    """The formula of the shift, however long."""
    plain = "+".join(_plain_parts(place, row))
    size = f"({plain})*basis_point" if plain else ""
    per_year = shock.compounding.per_year
    is_continuous = shock.compounding is Compounding.CONTINUOUS
    if is_continuous:
        before = f"$D{row}"
    else:
        before = f"(EXP($D{row})-1)" if per_year == 1 else f"{per_year}*(EXP($D{row}/{per_year})-1)"
    if MoveKind.RELATIVE in place.rows:
        own = f"({_knots(place, MoveKind.RELATIVE, row)})*MAX({before},0)"
        if MoveKind.LEAST in place.rows:
            chosen = "MAX" if _least_sign(place) > 0 else "MIN"
            own = f"{chosen}({own},({_knots(place, MoveKind.LEAST, row)})*basis_point)"
        size = f"{size}+{own}" if size else own
    has_floor = MoveKind.FLOOR in place.rows
    if is_continuous and not has_floor:
        return f"={size or '0'}"
    after = f"{before}+{size}" if size else before
    if has_floor:
        floor = f"({_knots(place, MoveKind.FLOOR, row)})*basis_point"
        after = f"MAX({after},MIN({floor},{before}))"
    if is_continuous:
        return f"={after}-$D{row}"
    grown = f"LN(1+{after})" if per_year == 1 else f"{per_year}*LN(1+({after})/{per_year})"
    return f"={grown}-$D{row}"


def _plain_parts(place: MoveRows, row: int) -> Iterator[str]:
    """The parts of the shift that depend on the term alone [basis points]."""
    for kind, factor in (
        (MoveKind.PARALLEL, ""),
        (MoveKind.SHORT, f"*$E{row}"),
        (MoveKind.LONG, f"*(1-$E{row})"),
    ):
        for at in place.rows.get(kind, ()):
            yield f"{_cell(_SIZE, at)}{factor}"
    for at in place.rows.get(MoveKind.TWIST, ()):
        yield f"{_cell(_SIZE, at)}*(MIN($A{row}/{_cell(_TERM, at)},2)-1)"
    if MoveKind.RATE in place.rows:
        yield _knots(place, MoveKind.RATE, row)


def _knots(place: MoveRows, kind: MoveKind, row: int) -> str:
    """Straight lines between the terms of a kind of move, flat outside them.

    Between two terms the way gone is ``(|t - x₁| - |t - x₂| + x₂ - x₁) / 2``, held at its ends outside.
    """
    rows = place.rows[kind]
    first = _cell(_SIZE, rows[0])
    if len(rows) == 1:
        return first
    slope, length = _area(_SLOPE, rows[:-1]), _area(_LENGTH, rows[:-1])
    start, end = _area(_TERM, rows[:-1]), _area(_TERM, rows[1:])
    gone = f"ABS($A{row}-{start})-ABS($A{row}-{end})+{length}"
    return f"{first}+SUMPRODUCT({slope}*({gone}))/2"


def _cell(letter: str, row: int) -> str:
    return f"'{MOVES_SHEET}'!${letter}${row}"


def _area(letter: str, rows: Sequence[int]) -> str:
    return f"'{MOVES_SHEET}'!${letter}${rows[0]}:${letter}${rows[-1]}"
