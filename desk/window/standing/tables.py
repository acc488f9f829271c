"""The further tables of the standing: periods, key rates and Redington's conditions."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QLabel, QVBoxLayout, QWidget

from desk.valuation.estimates import key_rate_gap
from desk.valuation.records import Periods, Standing
from desk.window.parts import numbers
from desk.window.parts.tables import Column, Mark, Table
from desk.window.parts.theme import GAP, ThemeSwitch, keep_look
from desk.window.standing.wording import condition_name, verdict

__all__ = ["ConditionsPage", "KeyRatesTable", "PeriodsTable"]


class PeriodsTable(Table):
    """Undiscounted flows by year, in money or in today's."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(self._make(""), theme_switch, name="Flows by year", empty_text="There are no flows.")
        self._unit = ""

    @staticmethod
    def _make(currency: str) -> tuple[Column, ...]:
        return (
            Column("year", "Year", "from the valuation date", "number", digits=0),
            Column("assets", "Assets", currency, "money", tooltip="To be received, undiscounted."),
            Column("liabilities", "Liabilities", currency, "money", tooltip="To be paid, undiscounted."),
            Column("net", "Net", currency, "money"),
            Column("cumulative", "Cumulative net", currency, "money"),
        )

    def show_periods(self, periods: Periods, unit: str) -> None:
        """Show the periods of a standing; `unit` is the currency, or that of today."""
        if unit != self._unit:
            self._unit = unit
            self.set_columns(self._make(unit))
        self.set_rows(vars(periods))


class KeyRatesTable(Table):
    """Key-rate durations and DV01 of both sides."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(self._make(""), theme_switch, name="Key rates", empty_text="There are no key rates.")
        self._currency = ""

    @staticmethod
    def _make(currency: str) -> tuple[Column, ...]:
        share = "years"
        return (
            Column("term", "Key rate", "years", "years", tooltip="Term of the zero rate that moves."),
            Column("assets", "Duration of assets", share, "years", digits=3, tooltip="Key-rate duration."),
            Column(
                "liabilities",
                "Duration of liabilities",
                share,
                "years",
                digits=3,
                tooltip="Key-rate duration.",
            ),
            Column("dv01_assets", "DV01 of assets", currency, "money"),
            Column("dv01_liabilities", "DV01 of liabilities", currency, "money"),
            Column("gap", "DV01 gap", currency, "money", tooltip="Assets less liabilities."),
        )

    def show_standing(self, standing: Standing) -> None:
        """Show the key rates of a standing."""
        if standing.currency != self._currency:
            self._currency = standing.currency
            self.set_columns(self._make(standing.currency))
        self.set_rows({**vars(standing.key_rates), "gap": key_rate_gap(standing.key_rates)})


class ConditionsPage(QWidget):
    """Redington's conditions: a table of the figures compared, and under it what each says.

    Attributes
    ----------
    table : Table
    words : QLabel
    """

    _UNITS = ("{}", "{} × years", "{} × years²")

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__()
        self.table = Table(
            (
                Column("name", "Condition"),
                Column("verdict", "Verdict"),
                Column("assets", "Assets", "in the unit", "money"),
                Column("liabilities", "Liabilities", "in the unit", "money"),
                Column("unit", "Unit"),
            ),
            theme_switch,
            name="Redington's conditions",
            description="For immunisation against a small move of all rates.",
        )
        rows = self.table.verticalHeader().defaultSectionSize()
        self.table.setFixedHeight(self.table.horizontalHeader().sizeHint().height() + 3 * rows + 16)
        self.words = QLabel()
        self.words.setWordWrap(True)
        self.words.setTextFormat(Qt.TextFormat.PlainText)
        self.words.setContentsMargins(GAP, GAP, GAP, GAP)
        keep_look(self.words, "soft")
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.table)
        column.addWidget(self.words)
        column.addStretch(1)

    def show_standing(self, standing: Standing) -> None:
        """Show the conditions of a standing."""
        conditions = standing.redington
        units = [self._UNITS[min(place, 2)].format(standing.currency) for place in range(len(conditions))]
        self.table.set_rows(
            {
                "name": [condition_name(each) for each in conditions],
                "verdict": [verdict(each.holds) for each in conditions],
                "assets": [each.assets for each in conditions],
                "liabilities": [each.liabilities for each in conditions],
                "unit": units,
            },
            marks={
                (place, "verdict"): Mark(f"This does not hold: {each.statement}", grave=False)
                for place, each in enumerate(conditions)
                if not each.holds
            },
        )
        self.table.fit_columns()
        said = " ".join(each.statement for each in conditions)
        kept = sum(each.holds for each in conditions)
        count = numbers.integer(kept) if kept else "none"
        self.words.setText(
            f"{said} Where all three hold, a small move of all rates together leaves the surplus no smaller; "
            f"{count} of the three {'holds' if kept == 1 else 'hold'} here. After Redington (1952)."
        )
