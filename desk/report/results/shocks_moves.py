"""The sheet of moves: what each shock is made of, and the formula of its shift by term."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

from desk.book.shock import RATE_MOVES, Move, MoveKind, Shock
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Formula, SheetPlan
from desk.valuation.moved_curve import DECAY
from desk.valuation.shock_records import ShockTable

__all__ = [
    "MOVES_SHEET",
    "MoveRows",
    "flush_left",
    "joined_formula",
    "joined_kinds",
    "plan_moves",
    "shift_formula",
    "size_unit",
]

MOVES_SHEET = "Shock moves"
MOVE_CAP = 20_000
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


def flush_left(plan: SheetPlan, row: int, columns: Sequence[int]) -> None:
    """Move headings to the left of their columns, with room between them and figures before."""
    for column in columns:
        plan.put(row, column, plan.cells[row][column].value, "heading_unit")


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
    flush_left(plan, HEADING_ROW, (2, 3, 4, 6, 10, 11, 12))
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
    plan.put(row + 1, 2, "Years over which short moves fade", "unit")
    address = plan.put(row + 1, 5, DECAY, "input", "term")
    plan.put(row + 1, 6, "years", "unit")
    plan.put(row + 1, 12, "Basel Committee, Interest rate risk in the banking book, 2016, Annex 2", "unit")
    return plan, places, {"shock_decay": address}


def _move_row(
    plan: SheetPlan, row: int, number: int, shock: Shock, move: Move, following: Move | None
) -> None:
    """One move."""
    form = "whole" if move.size == round(move.size) else "years2"
    if move.kind in (*_SHARES, MoveKind.DECLINE):
        form = "share"
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
            (shock.name, "unit", "text"),
            (shock.set_name or "Own", "unit", "text"),
            (move.kind.value, "unit", "text"),
            (move.size, "input", form),
            (size_unit(move.kind), "unit", "text"),
            (move.term, "input", "term"),
            (Formula(f"={step}") if joined else None, "live", "years"),
            (Formula(f"={_TERM}{row + 1}-{_TERM}{row}") if joined else None, "live", "term"),
            (target, "unit", "text"),
            (shock.compounding.value, "unit", "text"),
            (shock.source or "The book's own", "unit", "text"),
        ],
    )


def joined_kinds(place: MoveRows) -> list[MoveKind]:
    """The kinds of move of a shock that stand at several terms: each has a column of workings."""
    return [kind for kind, rows in place.rows.items() if kind in _JOINED and len(rows) > 1]


def joined_formula(place: MoveRows, kind: MoveKind, row: int) -> Formula:
    """Straight lines between the terms of a kind of move, flat outside them.

    Parameters
    ----------
    place : MoveRows
    kind : MoveKind
        One of `joined_kinds`.
    row : int
        Of the sheet of rates, whose column A holds the term.

    Notes
    -----
    Between two terms the way gone is ``(|t - x₁| - |t - x₂| + x₂ - x₁) / 2``, held at its ends outside: no
    search is needed, and every spreadsheet can do it.
    """
    rows = place.rows[kind]
    slope, length = _area(_SLOPE, rows[:-1]), _area(_LENGTH, rows[:-1])
    start, end = _area(_TERM, rows[:-1]), _area(_TERM, rows[1:])
    gone = f"ABS($A{row}-{start})-ABS($A{row}-{end})+{length}"
    return Formula(f"={_cell(_SIZE, rows[0])}+SUMPRODUCT({slope}*({gone}))/2")


def shift_formula(shock: Shock, place: MoveRows, row: int, workings: dict[MoveKind, str]) -> Formula | None:
    """The shift of the continuous zero rate at one term, from the moves as they are listed.

    Parameters
    ----------
    shock : Shock
    place : MoveRows
        Where its moves stand.
    row : int
        Of the sheet of rates, whose columns hold the term (A), the zero rate (D) and the fading of short
        moves (E).
    workings : dict of MoveKind to str
        Columns of the same sheet that hold the size of the moves that stand at several terms.

    Returns
    -------
    Formula or None
        None where the moves are not listed, or least sizes are up at one term and down at another.
    """
    if not any(move.kind in RATE_MOVES for move in shock.moves):
        return Formula("=0")
    if not place.rows or (MoveKind.LEAST in place.rows and _least_sign(place) == 0):
        return None
    size = "+".join(_plain_parts(place, row, workings))
    size = f"({size})*basis_point" if size else ""
    before, per_year = f"$D{row}", shock.compounding.per_year
    if per_year:
        before = f"(EXP($D{row})-1)" if per_year == 1 else f"{per_year}*(EXP($D{row}/{per_year})-1)"
    if MoveKind.RELATIVE in place.rows:
        own = f"{_joined(place, MoveKind.RELATIVE, row, workings)}*MAX({before},0)"
        if MoveKind.LEAST in place.rows:
            chosen = "MAX" if _least_sign(place) > 0 else "MIN"
            own = f"{chosen}({own},{_joined(place, MoveKind.LEAST, row, workings)}*basis_point)"
        size = f"{size}+{own}" if size else own
    has_floor = MoveKind.FLOOR in place.rows
    if not (per_year or has_floor):
        return Formula(f"={size}")
    after = f"{before}+{size}" if size else before
    if has_floor:
        floor = f"{_joined(place, MoveKind.FLOOR, row, workings)}*basis_point"
        after = f"MAX({after},MIN({floor},{before}))"
    if per_year:
        after = f"LN(1+{after})" if per_year == 1 else f"{per_year}*LN(1+({after})/{per_year})"
    return Formula(f"={after}-$D{row}")


def _least_sign(place: MoveRows) -> int:
    """1 or -1 where all least sizes are of one sign, else 0."""
    sizes = [move.size for move in place.moves[MoveKind.LEAST]]
    if all(size >= 0.0 for size in sizes):
        return 1
    return -1 if all(size < 0.0 for size in sizes) else 0


def _plain_parts(place: MoveRows, row: int, workings: dict[MoveKind, str]) -> Iterator[str]:
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
        yield _joined(place, MoveKind.RATE, row, workings)


def _joined(place: MoveRows, kind: MoveKind, row: int, workings: dict[MoveKind, str]) -> str:
    """Size of a kind of move at the term of a row: its own cell, or the column of workings."""
    return f"${workings[kind]}{row}" if kind in workings else _cell(_SIZE, place.rows[kind][0])


def _cell(letter: str, row: int) -> str:
    return f"'{MOVES_SHEET}'!${letter}${row}"


def _area(letter: str, rows: Sequence[int]) -> str:
    return f"'{MOVES_SHEET}'!${letter}${rows[0]}:${letter}${rows[-1]}"
