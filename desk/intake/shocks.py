"""The sheet of shocks: one row a move."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from desk.book import Move, MoveKind, Shock
from desk.intake.cells import Cells
from desk.intake.faults import FaultList
from desk.intake.layout import Table, fold
from desk.intake.quotes import check_terms
from desk.intake.shock_checks import MoveMasks, check_sizes, check_targets, check_together
from desk.rates.compounding import Compounding

__all__ = ["read_shocks"]

FloatArray = NDArray[np.float64]

_JOINED = (MoveKind.RATE, MoveKind.RELATIVE, MoveKind.LEAST, MoveKind.FLOOR, MoveKind.INFLATION)
"""Moves of which several terms are joined by lines."""
_NEED_TERM = (MoveKind.RATE, MoveKind.RELATIVE, MoveKind.TWIST)
_MAY_HAVE_TERM = (*_JOINED, MoveKind.TWIST)


def read_shocks(
    table: Table,
    faults: FaultList,
    *,
    holdings: Sequence[str] | None,
    lines: Sequence[str] | None,
) -> tuple[Shock, ...]:
    """The shocks, in the order in which they first stand.

    Parameters
    ----------
    table : Table
    faults : FaultList
    holdings : sequence of str or None
        What moves of spreads and values may apply to beside kinds of holding; None where it is not known.
    lines : sequence of str or None
        Likewise of moves of liabilities.
    """
    rows = table.rows
    cells = {name: Cells(table.sheet, table.column(name), rows, faults) for name in table.layout.columns}
    if not rows.size:
        faults.mild(
            "the sheet holds no shocks",
            "one row a move",
            "Add rows, or remove the sheet.",
            sheet=table.sheet.name,
        )
        return ()
    names = cells["Shock"].texts_of("the name of a shock")
    # A row with nothing but a name is a shock yet to be filled.
    states = cells["Move"].filled | cells["Size"].filled | cells["Term"].filled | cells["Applies to"].filled
    kinds = cells["Move"].choices(MoveKind, "a move", required=states)
    size = cells["Size"].numbers("the size of the move", required=states)
    masks = MoveMasks(kinds)
    term = cells["Term"].numbers("a term in years", required=masks.among(_NEED_TERM))
    targets = cells["Applies to"].texts_of("what the move applies to", required=False)
    sources = cells["Source"].texts_of("a source", required=False)
    sets = cells["Set"].texts_of("a set", required=False)
    stated = cells["Compounding"].choices(Compounding, "a compounding", required=False)
    compoundings = [each or "" for each in stated]

    cells["Shock"].each(
        ~states,
        "the shock {} has no move in this row",
        "a move and its size",
        "Nothing moves by it; write a move, or remove the row.",
        mild=True,
    )
    if cells["Term"].column is None:
        cells["Move"].each(
            masks.among(_NEED_TERM), "the move {} has no term", "a term in years", 'Add the column "Term".'
        )
    check_terms(cells["Term"], term, from_zero=True)
    cells["Term"].each(
        masks.among([MoveKind.TWIST]) & (term == 0.0),
        "the term of a twist is {}",
        "a term above 0 years, about which rates turn",
        "Correct the figure.",
    )
    entries = np.flatnonzero(cells["Term"].filled & masks.known & ~masks.among(_MAY_HAVE_TERM))
    cells["Term"].each_with(
        entries,
        (f"a {kinds[entry]} move has no term" for entry in entries),
        "an empty cell",
        "It is kept and not used; remove it if it is not wanted.",
        mild=True,
    )
    check_sizes(cells["Size"], size, masks)
    check_targets(cells["Applies to"], kinds, masks, targets, holdings=holdings, lines=lines)
    _check_names(cells["Shock"], names)

    groups: dict[str, list[int]] = {}
    for entry, name in enumerate(names):
        if name:
            groups.setdefault(name, []).append(entry)
    spoilt = faults.grave_rows(table.sheet.name)
    shocks = []
    for name, members in groups.items():
        if any(int(rows[entry]) in spoilt for entry in members):
            continue
        check_together(cells, members, kinds, term)
        source = _one_of(cells["Source"], members, sources, "source")
        moves = _moves(cells["Term"], members, kinds, size, term, targets)
        compounding = _one_of(cells["Compounding"], members, compoundings, "compounding")
        shocks.append(
            Shock(
                name,
                tuple(moves),
                source,
                compounding=Compounding(compounding or Compounding.CONTINUOUS),
                set_name=_one_of(cells["Set"], members, sets, "set"),
            )
        )
    return tuple(shocks)


def _check_names(cells: Cells, names: list[str]) -> None:
    """Report shocks whose names differ only in case or blanks: they are easily one shock written twice."""
    seen: dict[str, str] = {}
    told: set[str] = set()
    for entry, name in enumerate(names):
        first = seen.setdefault(fold(name), name)
        if first != name and name not in told:
            told.add(name)
            cells.mild(
                entry,
                f'the shock "{name[:60]}" differs from "{first[:60]}" only in case or blanks',
                "the moves of one shock under one name",
                "It counts as a shock of its own; write both alike if they are one.",
            )


def _one_of(cells: Cells, members: list[int], texts: Sequence[str], what: str) -> str:
    """What the rows of a shock say of it as a whole: the first that is there, others being reported."""
    stated = [entry for entry in members if texts[entry].strip()]
    for entry in stated[1:]:
        if texts[entry] != texts[stated[0]]:
            cells.mild(
                entry,
                f"the {what} is not that of row {cells.rows[stated[0]] + 1}, which is of the same shock",
                f"one {what} a shock",
                f"The {what} of the first row is taken.",
            )
    return texts[stated[0]] if stated else ""


def _moves(
    cells: Cells,
    members: list[int],
    kinds: list[MoveKind | None],
    size: FloatArray,
    term: FloatArray,
    targets: list[str],
) -> list[Move]:
    """The moves of one shock, those that are joined by lines in the order of their terms."""
    moves: list[Move] = []
    for entry in members:
        kind = kinds[entry]
        if kind is not None and not np.isnan(size[entry]):
            own = None if np.isnan(term[entry]) else float(term[entry])
            moves.append(Move(kind, float(size[entry]), own, targets[entry]))
    for joined in _JOINED:
        places = [place for place, move in enumerate(moves) if move.kind is joined and move.term is not None]
        own_terms = [moves[place].term or 0.0 for place in places]
        if own_terms == sorted(own_terms):
            continue
        own_entries = [e for e in members if kinds[e] is joined and not np.isnan(term[e])]
        for before, after in pairwise(own_entries):
            if term[after] < term[before]:
                cells.mild(
                    after,
                    f"the term {term[after]:g} is shorter than the one above it",
                    "terms that rise within a shock",
                    "They are taken in the order of their terms; correct the term if it is a slip.",
                )
        ordered = sorted((moves[place] for place in places), key=lambda move: move.term or 0.0)
        for place, move in zip(places, ordered, strict=True):
            moves[place] = move
    return moves
