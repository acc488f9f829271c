"""The tables of what a run comes to: present values, convergence and gains, curves, assets, models."""

from __future__ import annotations

from typing import Any

import numpy as np

from desk.scenarios.curve_fan import CurveFan
from desk.scenarios.market_records import RiskySummary
from desk.scenarios.records import Simulation
from desk.window.parts import numbers
from desk.window.parts.tables import Column
from desk.window.parts.theme import ThemeSwitch
from desk.window.scenarios.pictures import level_name
from desk.window.scenarios.tables import RunTable

__all__ = ["ConvergenceTable", "CovarianceTable", "CurveTable", "GainsTable", "ValuesTable"]

_SE = "standard error"


class ValuesTable(RunTable):
    """Present values along the paths, with tail means."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="Present values along the paths",
            description="With standard errors; intervals are 95 %.",
        )

    def show_run(self, simulation: Simulation, currency: str, *, in_full: bool) -> None:
        """Show the present values; `in_full` with the intervals of their percentiles."""
        found = simulation.present_value
        columns = [
            Column("name", "Side"),
            Column("mean", "Mean", currency, "money"),
            Column("se", "Mean", _SE, "money"),
            Column("curve", "On the curve", currency, "money", tooltip="With the spreads of the basis."),
            Column("sd", "Std deviation", currency, "money"),
            Column("below", "Below zero", "% of paths", "rate"),
            Column("below_se", "Below zero", "standard error, %", "rate"),
        ]
        data: dict[str, Any] = {
            "name": [each.name.capitalize() for each in found],
            "mean": [each.mean for each in found],
            "se": [each.se for each in found],
            "curve": [each.curve for each in found],
            "sd": [each.sd for each in found],
            "below": [each.below_zero for each in found],
            "below_se": [each.below_zero_se for each in found],
        }
        for place, level in enumerate(found[0].levels if found else ()):
            name = level_name(level)
            side = "at and below it" if level < 50.0 else "at and above it"
            wanted = [("", currency, "percentile", ""), ("_se", _SE, "percentile_se", "")]
            if in_full:
                wanted += [
                    ("_low", "95 % from", "percentile_low", ""),
                    ("_high", "95 % to", "percentile_high", ""),
                ]
            wanted += [
                ("_tail", "tail mean", "tail_mean", f"Mean of the values {side}."),
                ("_tail_se", "its error", "tail_mean_se", "Standard error of the tail mean."),
            ]
            for key, unit, attribute, tooltip in wanted:
                columns.append(Column(f"p{place}{key}", name, unit, "money", tooltip=tooltip))
                data[f"p{place}{key}"] = [float(getattr(each, attribute)[place]) for each in found]
        self.put(columns, data)


class ConvergenceTable(RunTable):
    """Headline figures after part of the paths, one row a figure."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="Convergence",
            description="Each headline figure after part of the paths, with its standard error.",
        )

    def show_run(self, simulation: Simulation, currency: str) -> None:
        """Show the convergence of a run."""
        found = simulation.convergence
        columns = [Column("figure", "Figure"), Column("unit", "Unit")]
        money = [each.is_money for each in found]
        data: dict[str, Any] = {
            "figure": [each.figure for each in found],
            "unit": [
                currency if each.is_money else "share" if "chance" in each.figure else "of 1 unit"
                for each in found
            ],
        }
        for place, paths in enumerate(found[0].paths.tolist() if found else ()):
            heading = f"{numbers.integer(paths)} paths"
            for key, unit in (("value", ""), ("se", _SE)):
                # Money and plain numbers stand in one column: each is written as it is usual.
                columns.append(Column(f"{key}{place}", heading, unit, holds_figures=True))
                data[f"{key}{place}"] = [
                    _figure(float(getattr(each, key)[place]), is_money)
                    if place < each.paths.size
                    else numbers.NOT_AVAILABLE
                    for each, is_money in zip(found, money, strict=True)
                ]
        self.put(columns, data)


def _figure(value: float, is_money: bool) -> str:
    return numbers.money(value) if is_money else numbers.number(value, 6)


class GainsTable(RunTable):
    """What the method of drawing gains over plain sampling."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="Gain of the sampling",
            description="As many times more paths plain sampling would need for the same error.",
            empty="Plain sampling gains nothing over itself: choose antithetic or Sobol points in the form.",
        )

    def show_run(self, simulation: Simulation) -> None:
        """Show the gains of a run; none of a plain one."""
        found = simulation.gains
        columns = [
            Column("figure", "Figure"),
            Column("gain", "Gain", "times fewer paths", "number", digits=1),
            Column("low", "Gain", "95 % from", "number", digits=1),
            Column("high", "Gain", "95 % to", "number", digits=1),
            Column("plain", "Standard error", "plain sampling", holds_figures=True),
            Column("se", "Standard error", "this run", holds_figures=True),
        ]
        money = {each.figure for each in simulation.convergence if each.is_money}
        data: dict[str, Any] = {
            "figure": [each.figure for each in found],
            "gain": [each.gain for each in found],
            "low": [each.low for each in found],
            "high": [each.high for each in found],
            "plain": [_figure(each.plain_se, each.figure in money) for each in found],
            "se": [_figure(each.se, each.figure in money) for each in found],
        }
        self.put(columns, data)


class CurveTable(RunTable):
    """Zero rates by term at a horizon."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="Zero rates by term",
            description="Over the paths, beside the forward rates of today's curve.",
            empty="The curve is drawn when a year is chosen.",
        )

    def show_fan(self, fan: CurveFan | None) -> None:
        """Show a fan of curves; None for none."""
        if fan is None:
            self.put([Column("term", "Term")], {"term": []})
            return
        unit = "% a year"
        columns = [
            Column("term", "Term", "years", "years"),
            Column("mean", "Mean", unit, "rate", digits=3),
            Column("se", "Mean", _SE, "rate", digits=3),
            Column("sd", "Std deviation", unit, "rate", digits=3),
            Column("forward", "Forward today", unit, "rate", digits=3),
            Column("today", "Zero rate today", unit, "rate", digits=3),
        ]
        data: dict[str, Any] = {
            "term": fan.term,
            "mean": fan.mean,
            "se": fan.mean_se,
            "sd": fan.sd,
            "forward": fan.forward,
            "today": fan.today,
        }
        for place, level in enumerate(fan.levels):
            name = level_name(level)
            columns += [
                Column(f"p{place}", name, unit, "rate", digits=3),
                Column(f"p{place}_se", name, _SE, "rate", digits=3),
            ]
            data |= {f"p{place}": fan.percentile[:, place], f"p{place}_se": fan.percentile_se[:, place]}
        self.put(columns, data)


class CovarianceTable(RunTable):
    """The risky assets as they were drawn: volatility, correlations and covariance a year."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="Covariance of the risky assets",
            description="σσᵀ a year, and the correlation with the first rate factor.",
            empty="The book has no risky assets.",
        )

    def show_risky(self, risky: RiskySummary | None) -> None:
        """Show the assets of a run."""
        if risky is None:
            self.put([Column("name", "Asset")], {"name": []})
            return
        names = [asset.name for asset in risky.assets]
        volatility = np.sqrt(np.diag(risky.covariance))
        columns = [
            Column("name", "Asset"),
            Column("volatility", "Volatility", "% a year", "rate"),
            Column("rates", "Rates", "correlation", "number", digits=4),
        ]
        data: dict[str, Any] = {
            "name": names,
            "volatility": volatility,
            "rates": risky.rates_correlation,
        }
        for place, name in enumerate(names):
            columns.append(Column(f"c{place}", name, "covariance a year", "number", digits=6))
            data[f"c{place}"] = risky.covariance[:, place]
        self.put(columns, data)
