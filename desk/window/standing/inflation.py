"""Inflation in the standing: what a move of expected inflation does to both sides, beside a move of rates."""

from __future__ import annotations

import numpy as np
from PySide6.QtWidgets import QVBoxLayout, QWidget

from desk.book.arrays import FloatArray
from desk.valuation.estimates import key_rate_gap
from desk.valuation.records import InflationStanding, Standing
from desk.window.parts import numbers
from desk.window.parts.plots import Picture
from desk.window.parts.tables import Column, Table
from desk.window.parts.theme import ThemeSwitch
from desk.window.standing.wording import amount

__all__ = ["InflationPage", "InflationPicture"]


class InflationPicture(Picture):
    """Inflation DV01 of both sides and the gap at each key rate of expected inflation."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Inflation DV01 by key rate", theme_switch)

    def show_inflation(self, inflation: InflationStanding, currency: str) -> None:
        """Draw the key rates of inflation of a standing."""
        place = np.arange(inflation.term.size, dtype=float)
        gap = inflation.key_dv01_assets - inflation.key_dv01_liabilities
        self.set_axes("Key rate", "years", "Inflation DV01", currency, y_kind="money", with_zero=True)
        self.set_x_names(
            {float(at): numbers.exact(float(term)) for at, term in zip(place, inflation.term, strict=True)}
        )
        for name, heights, role, offset in (
            ("Assets", inflation.key_dv01_assets, "assets", -0.27),
            ("Liabilities", inflation.key_dv01_liabilities, "liabilities", 0.0),
            ("Gap", gap, "surplus", 0.27),
        ):
            self.add_bars(name, place, heights, role, width=0.25, offset=offset)
        self.set_description(_sentence(inflation, gap, currency))


def _sentence(inflation: InflationStanding, gap: FloatArray, currency: str) -> str:
    if not np.any(gap):
        return "Rise for +1 basis point at each key rate. There is no gap."
    widest = int(np.abs(gap).argmax())
    term = numbers.exact(float(inflation.term[widest]))
    return f"Widest gap at {term} years: {amount(float(gap[widest]), currency)} for +1 bp."


class InflationPage(QWidget):
    """Durations and DV01 of inflation beside those of rates, and under them the key rates of both.

    Attributes
    ----------
    totals, key_rates : Table
    """

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__()
        self._currency = ""
        self.totals = Table(
            self._total_columns(""),
            theme_switch,
            name="Sides under inflation and rates",
            description="How each side moves with expected inflation, and with rates.",
        )
        self.totals.setSortingEnabled(False)
        self.key_rates = Table(
            self._key_columns(""),
            theme_switch,
            name="Key rates of inflation",
            description="At each key rate, for a move of expected inflation and for one of rates.",
            empty_text="There are no key rates.",
        )
        row = self.totals.verticalHeader().defaultSectionSize()
        self.totals.setFixedHeight(self.totals.horizontalHeader().sizeHint().height() + 3 * row + 2)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.totals)
        column.addWidget(self.key_rates, 1)

    @staticmethod
    def _total_columns(currency: str) -> tuple[Column, ...]:
        return (
            Column("side", "Side"),
            Column(
                "inflation_duration",
                "Inflation duration",
                "years",
                "years",
                tooltip="Rise for a parallel move of expected inflation, nominal rates unchanged: the real "
                "duration. The gap weighs the liabilities by what they are of the assets.",
            ),
            Column(
                "inflation_dv01",
                "Inflation DV01",
                currency,
                "money",
                tooltip="Rise in present value for +1 basis point of expected inflation.",
            ),
            Column(
                "rate_duration",
                "Effective duration",
                "years",
                "years",
                tooltip="For a parallel move of the continuous zero rates.",
            ),
            Column(
                "rate_dv01",
                "DV01",
                currency,
                "money",
                tooltip="Fall in present value for +1 basis point on all zero rates.",
            ),
        )

    @staticmethod
    def _key_columns(currency: str) -> tuple[Column, ...]:
        duration = "Key-rate duration of expected inflation."
        dv01 = "Rise in present value for +1 basis point of expected inflation at this term."
        return (
            Column("term", "Key rate", "years", "years", tooltip="Term of the inflation rate that moves."),
            Column("assets", "Assets dur.", "years", "years", digits=3, tooltip=f"Of assets. {duration}"),
            Column(
                "liabilities",
                "Liabilities dur.",
                "years",
                "years",
                digits=3,
                tooltip=f"Of liabilities. {duration}",
            ),
            Column("dv01_assets", "Assets DV01", currency, "money", tooltip=f"Of assets. {dv01}"),
            Column(
                "dv01_liabilities",
                "Liabilities DV01",
                currency,
                "money",
                tooltip=f"Of liabilities. {dv01}",
            ),
            Column("gap", "DV01 gap", currency, "money", tooltip="Of inflation: assets less liabilities."),
            Column("rate_gap", "Of rates", currency, "money", tooltip="DV01 gap of rates at the same term."),
        )

    def show_standing(self, standing: Standing) -> None:
        """Show the inflation figures of a standing; nothing where it has none."""
        if standing.currency != self._currency:
            self._currency = standing.currency
            self.totals.set_columns(self._total_columns(standing.currency))
            self.key_rates.set_columns(self._key_columns(standing.currency))
        inflation = standing.inflation
        if inflation is None:
            self.totals.set_rows({column.key: () for column in self.totals.table_model.columns})
            self.key_rates.set_rows({column.key: () for column in self.key_rates.table_model.columns})
            return
        self.totals.set_rows(
            {
                "side": ["Assets", "Liabilities", "Gap"],
                "inflation_duration": [
                    inflation.assets_duration,
                    inflation.liabilities_duration,
                    inflation.real_duration_gap,
                ],
                "inflation_dv01": [inflation.dv01_assets, inflation.dv01_liabilities, inflation.dv01_gap],
                "rate_duration": [
                    standing.assets.effective_duration,
                    standing.liabilities.effective_duration,
                    standing.duration_gap,
                ],
                "rate_dv01": [standing.assets.dv01, standing.liabilities.dv01, standing.dv01_gap],
            },
            strong=(2,),
        )
        self.totals.fit_columns()
        self.key_rates.set_rows(
            {
                "term": inflation.term,
                "assets": inflation.key_assets,
                "liabilities": inflation.key_liabilities,
                "dv01_assets": inflation.key_dv01_assets,
                "dv01_liabilities": inflation.key_dv01_liabilities,
                "gap": inflation.key_dv01_assets - inflation.key_dv01_liabilities,
                "rate_gap": _at_terms(standing, inflation.term),
            }
        )


def _at_terms(standing: Standing, terms: FloatArray) -> FloatArray:
    """The DV01 gap of rates at these key rates; NaN where rates have none there."""
    gap = dict(zip(standing.key_rates.term.tolist(), key_rate_gap(standing.key_rates).tolist(), strict=True))
    return np.array([gap.get(term, np.nan) for term in terms.tolist()])
