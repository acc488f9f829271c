"""Checks of the moves of shocks."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from desk.book import HoldingKind, MoveKind
from desk.intake.cells import Cells
from desk.intake.checks import near_name
from desk.intake.layout import fold

__all__ = ["MoveMasks", "check_sizes", "check_targets", "check_together"]

BoolArray = NDArray[np.bool_]
FloatArray = NDArray[np.float64]

_IN_BASIS_POINTS = (
    *(MoveKind.PARALLEL, MoveKind.SHORT, MoveKind.LONG, MoveKind.TWIST, MoveKind.RATE),
    *(MoveKind.LEAST, MoveKind.FLOOR, MoveKind.INFLATION, MoveKind.SPREAD),
)
_SHARES = (MoveKind.RELATIVE, MoveKind.VALUE, MoveKind.AMOUNT, MoveKind.DECLINE)
_OF_HOLDINGS = (MoveKind.SPREAD, MoveKind.VALUE)
_OF_LINES = (MoveKind.AMOUNT, MoveKind.TIME, MoveKind.DECLINE)
_ONCE_A_TERM = (MoveKind.RATE, MoveKind.RELATIVE, MoveKind.LEAST, MoveKind.FLOOR)
_MOST_BASIS_POINTS = 10_000.0
_MOST_SHARE = 10.0
_MOST_YEARS = 200.0
_CORRECT = "Correct the figure."


class MoveMasks:
    """Masks of the moves of some kinds.

    Parameters
    ----------
    kinds : list of MoveKind or None
        Of each move, None where it is not known.
    """

    def __init__(self, kinds: list[MoveKind | None]) -> None:
        self._kinds = kinds
        self.known = np.array([kind is not None for kind in kinds], dtype=np.bool_)

    def among(self, kinds: Iterable[MoveKind]) -> BoolArray:
        """Which moves are of one of some kinds."""
        chosen = frozenset(kinds)
        return np.array([kind in chosen for kind in self._kinds], dtype=np.bool_)


def check_sizes(cells: Cells, size: FloatArray, masks: MoveMasks) -> None:
    """Report sizes that can only be slips."""
    points, shares = masks.among(_IN_BASIS_POINTS), masks.among(_SHARES)
    with np.errstate(invalid="ignore"):
        far = points & (np.abs(size) > _MOST_BASIS_POINTS)
        tiny = points & (np.abs(size) < 0.5) & (size != 0.0)
        below = shares & (size < -1.0)
        gone = masks.among([MoveKind.DECLINE]) & (size == -1.0)
        above = np.flatnonzero(shares & (size > _MOST_SHARE))
        late = masks.among([MoveKind.TIME]) & (np.abs(size) > _MOST_YEARS)
    expected = "a size in basis points, at most 10,000 either way"
    cells.each(far, "the size is {} basis points", expected, "Correct the figure; 1 % is 100.")
    cells.each(
        tiny,
        "the size is {} basis points",
        "a size in basis points",
        "It counts as it stands; multiply it by 10,000 if it is a fraction.",
        mild=True,
    )
    for kind, what in (
        (MoveKind.VALUE, "which brings funds and property below zero"),
        (MoveKind.AMOUNT, "which turns payments into receipts"),
        (MoveKind.DECLINE, "which turns payments into receipts"),
        (MoveKind.RELATIVE, "which turns the sign of rates"),
    ):
        flagged = below & masks.among([kind])
        cells.each(flagged, f"the size is {{}}, {what}", "a share of at least -1, which is -100 %", _CORRECT)
    cells.each(gone, "the size is {}: nothing is left at once", "a share above -1 a year", _CORRECT)
    cells.each_with(
        above,
        (f"the size is {size[entry]:.12g}, which is {100.0 * size[entry]:,.6g} %" for entry in above),
        "a share as a fraction or in a cell formatted as per cent",
        "Divide it by 100 if per cent is meant.",
    )
    cells.each(late, "the size is {} years", "years, at most 200 either way", _CORRECT)


def check_targets(
    cells: Cells,
    kinds: list[MoveKind | None],
    masks: MoveMasks,
    targets: list[str],
    *,
    holdings: Sequence[str] | None,
    lines: Sequence[str] | None,
) -> None:
    """Report targets that the book does not hold, and those of moves that apply to everything."""
    filled = np.array([bool(text.strip()) for text in targets], dtype=np.bool_)
    entries = np.flatnonzero(filled & masks.known & ~masks.among((*_OF_HOLDINGS, *_OF_LINES)))
    cells.each_with(
        entries,
        (f"a {kinds[entry]} move applies to everything" for entry in entries),
        "an empty cell",
        "It is kept and not used; remove it if it is not wanted.",
        mild=True,
    )
    for moves, names, what in (
        (_OF_HOLDINGS, holdings, "holding or kind of holding"),
        (_OF_LINES, lines, "line of liabilities"),
    ):
        if names is None:
            continue
        known = [*names, *([kind.value for kind in HoldingKind] if moves is _OF_HOLDINGS else [])]
        folded = {fold(name) for name in known}
        for entry in np.flatnonzero(filled & masks.among(moves)).tolist():
            if fold(targets[entry]) not in folded:
                cells.mild(
                    entry,
                    f'"{targets[entry][:60]}" is no {what} of the book',
                    f"the name of a {what}, or nothing for all",
                    f"{near_name(targets[entry], known) or 'Correct the name.'} The move has no effect.",
                )


def check_together(
    cells: dict[str, Cells], members: list[int], kinds: list[MoveKind | None], term: FloatArray
) -> None:
    """Report moves of one shock that do not go together."""
    places = {kind: [entry for entry in members if kinds[entry] is kind] for kind in MoveKind}
    for kind in (*_ONCE_A_TERM, MoveKind.INFLATION):
        seen: dict[float, int] = {}
        own = places[kind]
        if kind is MoveKind.INFLATION:
            own = [entry for entry in own if not np.isnan(term[entry])]
        for entry in own:
            stated = float(term[entry])
            if np.isnan(stated):
                if len(own) > 1:
                    cells["Move"].mild(
                        entry,
                        f"a {kind} move without a term stands beside others of the shock",
                        "a term each, or one alone for all terms",
                        "The shock cannot be computed until this is mended.",
                    )
            elif seen.setdefault(stated, entry) != entry:
                cells["Term"].mild(
                    entry,
                    f"the term {stated:g} stands twice among the {kind} moves of the shock, "
                    f"also in row {cells['Term'].rows[seen[stated]] + 1}",
                    "each term once",
                    "The shock cannot be computed until one of the two is removed.",
                )
    if places[MoveKind.LEAST] and not places[MoveKind.RELATIVE]:
        cells["Move"].mild(
            places[MoveKind.LEAST][0],
            "a least size stands without a relative move whose size it could be",
            f"a {MoveKind.RELATIVE} move in the same shock",
            "The shock cannot be computed until there is one.",
        )
