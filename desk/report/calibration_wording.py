"""Words for the figures of a fitted model: their names, units and meanings, and what a fit is called."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from desk.book import ModelName
from desk.rates.history_diagnostics import ResidualTests
from desk.scenarios.calibration_records import Calibration, CalibrationSource, Figure

__all__ = [
    "INTERVALS",
    "SOURCES",
    "FigureWording",
    "ResidualLine",
    "figure_wording",
    "fit_title",
    "residual_lines",
]

SOURCES = {
    CalibrationSource.HISTORY: "the history of short rates",
    CalibrationSource.VOLATILITIES: "quoted volatilities and today's curve",
    CalibrationSource.YIELDS: "the history of yields",
}

INTERVALS = (
    "95 % intervals are the estimate ± 1.96 standard errors; that of a mean reversion from a history ends "
    "where the likelihood profile has fallen by 1.92."
)


@dataclass(frozen=True)
class FigureWording:
    """How a figure is written.

    Attributes
    ----------
    title, unit, meaning : str
    is_rate : bool
        Whether it is a fraction that is written in per cent.
    """

    title: str
    unit: str
    meaning: str
    is_rate: bool = False


_RATE = "% a year"
_WORDING = {
    "mean_reversion": FigureWording(
        "Mean reversion", "a year", "Part of the way to its level made up in a year."
    ),
    "volatility": FigureWording(
        "Volatility", _RATE, "Deviation of a year's move of the short rate.", is_rate=True
    ),
    "long_run_rate": FigureWording("Long-run rate", _RATE, "Level that the rate goes back to.", is_rate=True),
    "starting_rate": FigureWording("Starting rate", _RATE, "Short rate at the last date.", is_rate=True),
    "second_mean_reversion": FigureWording("Second mean reversion", "a year", "Of the second factor."),
    "second_volatility": FigureWording("Second volatility", _RATE, "Of the second factor.", is_rate=True),
    "factor_correlation": FigureWording("Factor correlation", "", "Between the moves of the two factors."),
    "risk_price": FigureWording(
        "Risk price", "", "Extra drift in the real world for each unit of volatility."
    ),
    "second_risk_price": FigureWording("Second risk price", "", "Of the second factor."),
    "real_world_rate": FigureWording(
        "Real-world long-run rate", _RATE, "Level that the rate goes back to in the real world.", is_rate=True
    ),
    "measurement_error": FigureWording(
        "Error of a yield", _RATE, "Deviation of what is left unexplained.", is_rate=True
    ),
    "half_life": FigureWording("Half-life", "years", "Time to make up half the way to its level."),
    "stationary_deviation": FigureWording(
        "Long-run deviation", _RATE, "Deviation of the rate in the long run.", is_rate=True
    ),
    "corrected_mean_reversion": FigureWording(
        "Mean reversion less its bias",
        "a year",
        "Less what such estimates are too high by.",
    ),
}
_ROOT_VOLATILITY = FigureWording(
    "Volatility", "on √rate", "Multiplied by the root of the rate: a year's standard deviation."
)


def figure_wording(figure: Figure, model: ModelName) -> FigureWording:
    """How a figure of a fitted model is written."""
    if figure.name == "volatility" and model in (ModelName.CIR, ModelName.CIR_SHIFTED):
        return _ROOT_VOLATILITY
    return _WORDING[figure.name]


def fit_title(calibration: Calibration) -> str:
    """What was fitted to what, for example ``vasicek fitted to the history of short rates``."""
    return f"{calibration.name} fitted to {SOURCES[calibration.source]}"


@dataclass(frozen=True)
class ResidualLine:
    """A test of residuals.

    Attributes
    ----------
    name : str
    figure : float
    chance : float
        Of a figure as far off by chance alone; NaN where there is no test.
    meaning : str
        What a small chance means.
    """

    name: str
    figure: float
    chance: float
    meaning: str


def residual_lines(tests: ResidualTests) -> Sequence[ResidualLine]:
    """The tests of residuals, in words."""
    nan = float("nan")
    return (
        ResidualLine(
            "Ljung-Box",
            tests.ljung_box,
            tests.ljung_box_p,
            "Residuals follow one another: the rate has more memory.",
        ),
        ResidualLine(
            "Ljung-Box of squares",
            tests.squared_ljung_box,
            tests.squared_ljung_box_p,
            "Quiet and wild times come in stretches.",
        ),
        ResidualLine(
            "Jarque-Bera", tests.jarque_bera, tests.jarque_bera_p, "Residuals are not normal: tails or skew."
        ),
        ResidualLine(
            "Kolmogorov-Smirnov",
            tests.kolmogorov,
            tests.kolmogorov_p,
            "Their distribution is not the normal one.",
        ),
        ResidualLine("Skewness", tests.skewness, nan, "0 under the model."),
        ResidualLine("Kurtosis", tests.kurtosis, nan, "3 under the model."),
    )
