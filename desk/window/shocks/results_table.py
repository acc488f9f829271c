"""The main table: the book under every shock, fully revalued and estimated."""

from __future__ import annotations

from typing import Any

from desk.valuation.shock_records import ShockResult, ShockTable
from desk.valuation.shocks import band_of
from desk.window.parts import numbers
from desk.window.parts.numbers import Scale
from desk.window.parts.tables import Column, Mark, Table
from desk.window.parts.theme import ThemeSwitch
from desk.window.shocks.wording import set_words, verdict_of

__all__ = ["BEFORE", "ResultsTable"]

BEFORE = "Before any shock"


class ResultsTable(Table):
    """One row a shock, under the row of the book as it stands.

    Attributes
    ----------
    results : tuple of ShockResult
        Those shown; result i stands in source row i + 1.
    """

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            self._make("", numbers.ONE),
            theme_switch,
            name="Shocks",
            description="Both sides fully revalued under each shock, with the estimate from duration and "
            "convexity. Return shows what a shock moves. Rows of a sheet Shocks can be pasted.",
            empty_text="No shocks. Choose a set, or add one of your own.",
        )
        self._scale, self._currency = numbers.ONE, ""
        self.results: tuple[ShockResult, ...] = ()

    @staticmethod
    def _make(currency: str, scale: Scale) -> tuple[Column, ...]:
        unit = numbers.unit_with_scale(currency, scale)
        places = 0 if scale is numbers.ONE else 1

        def money(key: str, heading: str, tooltip: str, *, change: bool = False) -> Column:
            return Column(key, heading, unit, "money", digits=places, tooltip=tooltip, is_change=change)

        return (
            Column("name", "Shock"),
            money("change", "Change in surplus", "Both sides fully revalued.", change=True),
            money(
                "estimate",
                "Estimated",
                "The same from duration and convexity, or the first derivative where there is no other.",
                change=True,
            ),
            Column("ratio", "Funding ratio", "%", "rate", digits=1, tooltip="Assets over liabilities."),
            Column("verdict", "Verdict", tooltip="Of the funding ratio, by the thresholds."),
            money(
                "difference",
                "Difference",
                "Full less estimated: what the estimate leaves out.",
                change=True,
            ),
            money("surplus", "Surplus", "Assets less liabilities."),
            money("assets", "Assets", "Present value."),
            money("liabilities", "Liabilities", "Present value."),
            Column("set", "Set", tooltip="The set that the shock is of."),
            Column("source", "Source", tooltip="The rule, or what custom it is."),
        )

    def show_table(self, table: ShockTable) -> None:
        """Show a book under its shocks."""
        base = table.base
        largest = max((abs(value) for value in (base.assets, base.liabilities)), default=0.0)
        # In the scale in which a change of a thousandth still has figures.
        scale = numbers.scale_for(largest / 100.0)
        if (scale, table.currency) != (self._scale, self._currency):
            self._scale, self._currency = scale, table.currency
            self.set_columns(self._make(table.currency, scale))
        self.results = table.results
        rows: list[dict[str, Any]] = [
            {
                "name": BEFORE,
                "change": None,
                "estimate": None,
                "difference": None,
                "ratio": base.funding_ratio,
                "verdict": verdict_of(
                    base.funding_ratio, band_of(base.funding_ratio, table.thresholds), table.thresholds
                ),
                "surplus": base.surplus / scale.factor,
                "assets": base.assets / scale.factor,
                "liabilities": base.liabilities / scale.factor,
                "set": "",
                "source": "",
            }
        ]
        rows += [self._row(result, scale.factor, table.thresholds) for result in table.results]
        lost = len(table.thresholds)
        marks = {
            (place + 1, "verdict"): Mark("The funding ratio falls short of every threshold.", grave=False)
            for place, result in enumerate(table.results)
            if lost and result.band >= lost
        }
        keys = [column.key for column in self.table_model.columns]
        self.set_rows({key: [row[key] for row in rows] for key in keys}, marks=marks, strong=(0,))

    @staticmethod
    def _row(result: ShockResult, factor: float, thresholds: tuple[float, ...]) -> dict[str, Any]:
        full, estimate = result.change_in_surplus / factor, result.estimated_change_in_surplus / factor
        return {
            "name": result.name,
            "change": full,
            "estimate": estimate,
            "difference": full - estimate,
            "ratio": result.funding_ratio,
            "verdict": verdict_of(result.funding_ratio, result.band, thresholds),
            "surplus": result.surplus / factor,
            "assets": result.assets / factor,
            "liabilities": result.liabilities / factor,
            "set": set_words(result),
            "source": result.source,
        }

    def current_result(self) -> ShockResult | None:
        """The shock whose row has the keyboard."""
        place = self.current_source_row() - 1
        return self.results[place] if 0 <= place < len(self.results) else None

    def result_at(self, source_row: int) -> ShockResult | None:
        """The shock of a source row; None for the row of the book as it stands."""
        return self.results[source_row - 1] if 1 <= source_row <= len(self.results) else None
