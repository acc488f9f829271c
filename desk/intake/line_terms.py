"""The sheet of terms that hold for one line of flows."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from desk.book import Indexation, IndexationKind, LineTerms, Side
from desk.intake.cells import Cells
from desk.intake.checks import check_rates, near_name
from desk.intake.columns import Kind
from desk.intake.faults import FaultList
from desk.intake.layout import Table

__all__ = ["read_line_terms"]

FloatArray = NDArray[np.float64]

_USES = {
    "Rise": (IndexationKind.RISING,),
    "Floor": (IndexationKind.COLLARED,),
    "Cap": (IndexationKind.COLLARED,),
}
"""Indexations that have a use for a column."""
_BY_INDEX = (IndexationKind.LINKED, IndexationKind.COLLARED)


def read_line_terms(
    table: Table,
    faults: FaultList,
    *,
    lines: dict[Side, Sequence[str] | None],
    has_inflation: bool,
) -> tuple[LineTerms, ...]:
    """The terms of lines; those with a grave fault are left out.

    Parameters
    ----------
    table : Table
    faults : FaultList
    lines : dict of Side to sequence of str
        The lines of each side; None where they could not be read.
    has_inflation : bool
        Whether there is expected inflation.
    """
    rows = table.rows
    cells = {name: Cells(table.sheet, table.column(name), rows, faults) for name in table.layout.columns}
    if not rows.size:
        faults.mild(
            "the sheet holds no terms",
            "one row a line",
            "Add rows, or remove the sheet.",
            sheet=table.sheet.name,
        )
    stated_sides = cells["Side"].choices(Side, "a side", required=False)
    side_filled = cells["Side"].filled.tolist()
    sides = [
        Side.LIABILITIES if side is None and not filled else side
        for side, filled in zip(stated_sides, side_filled, strict=True)
    ]
    names = cells["Line"].texts_of("the name of a line")
    stated_kinds = cells["Indexation"].choices(IndexationKind, "an indexation", required=False)
    kinds = [kind or IndexationKind.FIXED for kind in stated_kinds]
    rising = np.array([kind is IndexationKind.RISING for kind in kinds], dtype=np.bool_)
    rise = cells["Rise"].numbers("a rise a year", required=rising)
    numbers = {
        name: cells[name].numbers(f"a {name.lower()} a year", required=False)
        for name in ("Floor", "Cap", "Discount spread", "Discount rate")
    }
    for name, values in (("Rise", rise), *numbers.items()):
        check_rates(cells[name], values, f"the {name.lower()}")
    if cells["Rise"].column is None:
        cells["Line"].each(
            rising, "{} rises, but by how much is not stated", "a rise a year", 'Add the column "Rise".'
        )
    _check_collars(cells, numbers["Floor"], numbers["Cap"], kinds)
    _check_unused(cells, kinds)
    cells["Discount rate"].each(
        cells["Discount spread"].filled & cells["Discount rate"].filled,
        "the discount rate {} stands beside a discount spread",
        "either a spread over the curve or a rate in its place",
        "Remove one of the two.",
    )
    if not has_inflation:
        follows = np.array([kind in _BY_INDEX for kind in kinds], dtype=np.bool_)
        cells["Indexation"].each(
            follows,
            "{} needs expected inflation, which the book does not have",
            'a sheet "Inflation" with terms and rates',
            "The amounts count as they stand today; add the sheet.",
            mild=True,
        )
    _check_lines(cells["Line"], sides, names, lines)

    spoilt = faults.grave_rows(table.sheet.name)
    listed = {
        name: [None if np.isnan(value) else value for value in values.tolist()]
        for name, values in numbers.items()
    }
    return tuple(_built(rows, spoilt, sides, names, kinds, rise, listed))


def _built(
    rows: NDArray[np.int64],
    spoilt: set[int],
    sides: Sequence[Side | None],
    names: Sequence[str],
    kinds: Sequence[IndexationKind],
    rise: FloatArray,
    listed: dict[str, list[float | None]],
) -> Iterator[LineTerms]:
    """The terms of the sound rows."""
    for entry, (side, name, kind) in enumerate(zip(sides, names, kinds, strict=True)):
        if int(rows[entry]) in spoilt or side is None or not name:
            continue
        yield LineTerms(
            side,
            name,
            Indexation(
                kind,
                rise=0.0 if np.isnan(rise[entry]) else float(rise[entry]),
                floor=listed["Floor"][entry],
                cap=listed["Cap"][entry],
            ),
            spread=listed["Discount spread"][entry],
            rate=listed["Discount rate"][entry],
        )


def _check_collars(
    cells: dict[str, Cells], floor: FloatArray, cap: FloatArray, kinds: list[IndexationKind]
) -> None:
    """Report caps below their floors, and collars without either."""
    with np.errstate(invalid="ignore"):
        crossed = np.flatnonzero(cap < floor)
    cells["Cap"].each_with(
        crossed,
        (f"the cap {cap[entry]:.12g} is below the floor {floor[entry]:.12g}" for entry in crossed),
        "a cap of at least the floor",
        "Correct one of the two.",
    )
    open_ended = np.array([kind is IndexationKind.COLLARED for kind in kinds], dtype=np.bool_)
    open_ended &= ~cells["Floor"].filled & ~cells["Cap"].filled
    cells["Indexation"].each(
        open_ended,
        "the line is collared, but has neither floor nor cap",
        "a floor, a cap or both",
        f"It counts as {IndexationKind.LINKED}; state them, or write {IndexationKind.LINKED}.",
        mild=True,
    )


def _check_unused(cells: dict[str, Cells], kinds: list[IndexationKind]) -> None:
    """Report figures that the indexation of their row has no use for."""
    for name, uses in _USES.items():
        own = cells[name]
        flagged = own.filled & np.array([kind not in uses for kind in kinds], dtype=np.bool_)
        flagged &= ~((own.kinds == Kind.NUMBER) & (own.values == 0.0) & (name == "Rise"))
        entries = np.flatnonzero(flagged)
        own.each_with(
            entries,
            (f"a line that is {kinds[entry]} has no {name.lower()}" for entry in entries),
            "an empty cell",
            "It is kept and not used; remove it if it is not wanted.",
            mild=True,
        )


def _check_lines(
    cells: Cells,
    sides: Sequence[Side | None],
    names: Sequence[str],
    lines: dict[Side, Sequence[str] | None],
) -> None:
    """Report lines that stand twice, and those that the book does not hold."""
    first: dict[tuple[Side, str], int] = {}
    for entry, (side, name) in enumerate(zip(sides, names, strict=True)):
        if side is None or not name:
            continue
        earlier = first.setdefault((side, name), entry)
        if earlier != entry:
            cells.fault(
                entry,
                f'the line "{name[:60]}" stands twice, also in row {cells.rows[earlier] + 1}',
                "one row a line and side",
                "Remove one of the two rows.",
            )
        known = lines[side]
        if known is None or name in known:
            continue
        other = lines[Side.ASSETS if side is Side.LIABILITIES else Side.LIABILITIES]
        hint = near_name(name, known)
        if not hint and other is not None and name in other:
            hint = f"It is a line of the other side: correct the side. {hint}"
        cells.mild(
            entry,
            f'no flows of the {side} are of the line "{name[:60]}"',
            f"the name of a line of the {side}, as its flows have it",
            f"{hint or 'Correct the name.'} The terms are kept and not used.",
        )
