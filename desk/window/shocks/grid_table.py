"""A grid of two moves as a table."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from desk.book.arrays import FloatArray
from desk.valuation.shock_grid import ShockGrid
from desk.window.parts import numbers
from desk.window.parts.tables import Column, Table
from desk.window.shocks.grid_axes import Axis

if TYPE_CHECKING:
    from desk.window.shocks.mode import Mode

__all__ = ["GridTable"]


class GridTable(Table):
    """As in the picture: columns are sizes of the first move, rows of the second, the greatest on top."""

    def __init__(self, mode: Mode) -> None:
        super().__init__(
            (Column("size", "Size"),),
            mode.theme_switch,
            name="Two moves together",
            empty_text="Choose two moves and run the grid.",
        )

    def show_values(
        self, axes: tuple[Axis, Axis], grid: ShockGrid, value: FloatArray, unit: str, *, kind: str
    ) -> None:
        """Show a grid; `axes` are its first and its second move."""
        scale = numbers.ONE
        if kind == "money":
            known = np.abs(value[np.isfinite(value)])
            scale = numbers.scale_for(float(known.max()) / 10.0 if known.size else 0.0)
            unit, value = numbers.unit_with_scale(unit, scale), value / scale.factor
        across, up = axes
        columns = [
            Column(
                "size",
                up.short_label,
                up.unit,
                "number",
                digits=_places(grid.second_scale),
                tooltip=up.label if up.short_label != up.label else "",
            )
        ]
        places = _places(grid.first_scale)
        for place, size in enumerate(grid.first_scale.tolist()):
            heading = f"{numbers.signed(size, places)} {across.unit}"
            columns.append(
                Column(
                    f"c{place}",
                    heading,
                    unit,
                    "rate" if kind == "rate" else "number",
                    digits=1,
                    is_change=kind == "money" and "change" in unit,
                    tooltip=f"{across.label} {heading}",
                )
            )
        self.set_columns(columns)
        cells = {f"c{place}": row[::-1] for place, row in enumerate(value)}
        self.set_rows({"size": grid.second_scale[::-1], **cells})


def _places(scale: FloatArray) -> int:
    return next((places for places in range(3) if np.allclose(scale, np.round(scale, places), atol=1e-9)), 2)
