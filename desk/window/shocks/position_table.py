"""The balance sheet before and after a shock, in six figures."""

from __future__ import annotations

from desk.valuation.shock_records import Position
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
        old = [getattr(before, key) * factor for key, _, _, factor in _ROWS]
        new = [getattr(after, key) * factor for key, _, _, factor in _ROWS]
        self.set_rows(
            {
                "name": [name for _, name, _, _ in _ROWS],
                "unit": [unit or currency for _, _, unit, _ in _ROWS],
                "before": old,
                "after": new,
                "change": [two - one for one, two in zip(old, new, strict=True)],
            }
        )
        self.fit_columns()
