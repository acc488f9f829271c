"""The tables of a fit: its figures with errors and intervals, and what is left over."""

from __future__ import annotations

from typing import Any

import numpy as np

from desk.book.market import Volatilities, YieldHistory
from desk.book.model import History
from desk.rates.kalman_fit import PanelFit
from desk.rates.option_calibration import VolatilityFit
from desk.report.calibration_wording import figure_wording, residual_lines
from desk.scenarios.calibration_records import Calibration
from desk.window.parts.tables import Column, Table
from desk.window.parts.theme import ThemeSwitch

__all__ = ["FiguresTable", "ResidualsTable", "TestsTable"]

_EMPTY = "Fit the model first."


class FiguresTable(Table):
    """Estimates with standard errors and 95 % intervals."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            (
                Column("title", "Figure"),
                Column("unit", "Unit"),
                Column("value", "Estimate", "", "number", digits=4),
                Column("error", "Error", "standard", "number", digits=4),
                Column("low", "95 %", "from", "number", digits=4),
                Column("high", "95 %", "to", "number", digits=4),
                Column("meaning", "What it is"),
            ),
            theme_switch,
            name="Estimates",
            description="Parameters of the fitted model, then what is derived from them.",
            empty_text=_EMPTY,
        )

    def show_fit(self, found: Calibration) -> None:
        """Show the figures of a fit."""
        words = [figure_wording(figure, found.name) for figure in found.figures]
        data: dict[str, Any] = {
            "title": [each.title for each in words],
            "unit": [each.unit for each in words],
            "meaning": [each.meaning for each in words],
        }
        for key in ("value", "error", "low", "high"):
            data[key] = [
                getattr(figure, key) * (100.0 if each.is_rate else 1.0)
                for figure, each in zip(found.figures, words, strict=True)
            ]
        self.set_rows(data)
        self.fit_columns()


class TestsTable(Table):
    """Tests of standardised residuals."""

    __test__ = False  # not a test for pytest, whatever its name

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            (
                Column("name", "Test of the residuals"),
                Column("figure", "Figure", "", "number", digits=3),
                Column("chance", "Chance", "%", "rate", tooltip="Of a figure as far off under the model."),
                Column("meaning", "What a small chance means"),
            ),
            theme_switch,
            name="Tests of the residuals",
            description="Under the model residuals are independent and normal.",
            empty_text=_EMPTY,
        )

    def show_fit(self, found: Calibration) -> None:
        """Show the tests of a fit to a history of rates or yields."""
        lines = () if found.tests is None else residual_lines(found.tests)
        self.set_rows(
            {
                "name": [line.name for line in lines],
                "figure": [line.figure for line in lines],
                "chance": [line.chance for line in lines],
                "meaning": [line.meaning for line in lines],
            }
        )
        self.fit_columns()


class ResidualsTable(Table):
    """What the model leaves over: by date, by quote or by term."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            (Column("name", "Residual"),),
            theme_switch,
            name="Residuals",
            description="Data, what the model makes of them, and the difference.",
            empty_text=_EMPTY,
        )

    def show_fit(self, found: Calibration) -> None:
        """Show the residuals of a fit."""
        if isinstance(found.data, History):
            columns, data = _by_date(found)
        elif isinstance(found.data, Volatilities):
            columns, data = _by_quote(found)
        else:
            columns, data = _by_term(found)
        self.set_columns(columns)
        self.set_rows(data)
        self.fit_columns()


def _by_date(found: Calibration) -> tuple[tuple[Column, ...], dict[str, Any]]:
    data, band = found.data, found.band
    assert isinstance(data, History)
    assert band is not None
    columns = (
        Column("date", "Date", "", "date"),
        Column("rate", "Short rate", "%", "rate", digits=3),
        Column("forecast", "Forecast", "from the date before, %", "rate", digits=3),
        Column("deviation", "Deviation", "of the forecast, %", "rate", digits=3),
        Column("residual", "Residual", "standard deviations", "number", digits=2, is_change=True),
    )
    return columns, {
        "date": data.date[1:],
        "rate": data.rate[1:],
        "forecast": band.forecast,
        "deviation": band.deviation,
        "residual": found.residual,
    }


def _by_quote(found: Calibration) -> tuple[tuple[Column, ...], dict[str, Any]]:
    data, fit = found.data, found.fit
    assert isinstance(data, Volatilities)
    assert isinstance(fit, VolatilityFit)
    assert found.quotes is not None
    columns = (
        Column("name", "Quote"),
        Column("kind", "Kind"),
        Column("strike", "Strike", "%", "rate", digits=3),
        Column("quoted", "Quoted", "volatility, %", "rate", digits=3),
        Column("model", "Fitted", "volatility, %", "rate", digits=3),
        Column("residual", "Residual", "basis points", "number", digits=1, is_change=True),
        Column("price", "Quoted price", "bp of nominal", "number", digits=2),
        Column("model_price", "Fitted price", "bp of nominal", "number", digits=2),
    )
    return columns, {
        "name": list(fit.instruments),
        "kind": [each.value for each in data.kind],
        "strike": found.quotes.strike,
        "quoted": fit.quoted_volatility,
        "model": fit.model_volatility,
        "residual": fit.residual_bp,
        "price": 1e4 * fit.quoted_price,
        "model_price": 1e4 * fit.model_price,
    }


def _by_term(found: Calibration) -> tuple[tuple[Column, ...], dict[str, Any]]:
    data, fit = found.data, found.fit
    assert isinstance(data, YieldHistory)
    assert isinstance(fit, PanelFit)
    known = np.isfinite(fit.residual_bp)
    columns = (
        Column("term", "Term", "years", "years"),
        Column("count", "Yields", "", "integer"),
        Column("rmse", "Root mean square", "basis points", "number", digits=1),
        Column("mean", "Mean", "basis points", "number", digits=1, is_change=True),
        Column("largest", "Largest", "basis points", "number", digits=1),
        Column("last", "Last observed", "%", "rate", digits=3),
        Column("fitted", "Last fitted", "%", "rate", digits=3),
    )
    return columns, {
        "term": fit.term,
        "count": known.sum(axis=0),
        "rmse": fit.rmse_bp,
        "mean": np.nanmean(fit.residual_bp, axis=0),
        "largest": np.nanmax(np.abs(fit.residual_bp), axis=0),
        "last": data.rates[-1],
        "fitted": fit.fitted[-1],
    }
