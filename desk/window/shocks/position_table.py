"""The balance sheet before and after a shock, in six figures."""

from __future__ import annotations

from typing import Any

from desk.valuation.shock_records import Position
from desk.window.parts import numbers
from desk.window.parts.tables import Column, Table
from desk.window.parts.theme import ThemeSwitch

__all__ = ["PositionTable"]

_ROWS = (
    ("assets", "Assets", "", 1.0),
    ("liabilities", "Liabilities", "", 1.0),
    ("surplus", "Surplus", "", 1.0),
    ("funding_ratio", "Funding ratio", "%", 100.0),
    ("duration_gap", "Duration gap", "years", 1.0),
    ("dv01_gap", "DV01 gap", "", 1.0),
)


class PositionTable(Table):
    """Six figures before and after."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            (
                Column("name", "Figure"),
                Column("unit", "Unit"),
                Column("before", "Before", "in the unit", "number", digits=2),
                Column("after", "After", "in the unit", "number", digits=2),
                Column("change", "Change", "in the unit", "number", digits=2, is_change=True),
            ),
            theme_switch,
            name="The balance sheet before and after",
            empty_text="Nothing is found yet.",
        )

    def show_positions(self, before: Position | None, after: Position | None, currency: str) -> None:
        """Show two positions; nothing where one is missing."""
        if before is None or after is None:
            self.set_rows({column.key: () for column in self.table_model.columns})
            return
        rows = [self._row(before, after, currency, *row) for row in _ROWS]
        keys = [column.key for column in self.table_model.columns]
        self.set_rows({key: [row[key] for row in rows] for key in keys})
        self.fit_columns()

    @staticmethod
    def _row(
        before: Position, after: Position, currency: str, key: str, name: str, unit: str, factor: float
    ) -> dict[str, Any]:
        old, new = float(getattr(before, key)), float(getattr(after, key))
        if not unit:
            # One scale for both, so that they can be subtracted by eye, with four figures at least.
            scale = numbers.scale_for([old / 10.0, new / 10.0])
            unit, factor = numbers.unit_with_scale(currency, scale), 1.0 / scale.factor
        return {
            "name": name,
            "unit": unit,
            "before": factor * old,
            "after": factor * new,
            "change": factor * (new - old),
        }
