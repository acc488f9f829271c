"""A fit of a short-rate model to data of the book: its records."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from desk.book import Fault, ModelName, RatesModel
from desk.book.arrays import FloatArray
from desk.book.market import CalibrationSource, Volatilities, YieldHistory
from desk.book.model import History

if TYPE_CHECKING:
    from desk.rates.history_diagnostics import ResidualTests
    from desk.rates.history_fit import HistoryFit
    from desk.rates.kalman_fit import PanelFit
    from desk.rates.option_calibration import VolatilityFit
    from desk.rates.option_instruments import OptionQuotes

__all__ = [
    "Calibration",
    "CalibrationError",
    "CalibrationSource",
    "Figure",
    "HistoryBand",
    "Profile",
]


class CalibrationError(ValueError):
    """A fit that cannot be had.

    Attributes
    ----------
    faults : tuple of Fault
        Why, each with the sheet it lies in.
    """

    def __init__(self, faults: tuple[Fault, ...]) -> None:
        super().__init__("; ".join(str(fault) for fault in faults))
        self.faults = faults

    def __reduce__(self) -> tuple[object, ...]:
        """Rebuilt from its faults where it crosses from one process to another."""
        return CalibrationError, (self.faults,)


@dataclass(frozen=True)
class Figure:
    """An estimated figure.

    Attributes
    ----------
    name : str
        Of the field of `RatesModel` it is for; or, where it is derived, a name of its own.
    value : float
        NaN where there is none.
    error : float
        Standard error; NaN where there is none.
    low, high : float
        95 % interval: the estimate less and plus 1.96 standard errors, within what the figure can be; that of
        the mean reversion estimated from a history is where the likelihood profile is 1.92 below its top.
    is_derived : bool
        Whether it follows from the parameters rather than being one.
    """

    name: str
    value: float
    error: float
    low: float
    high: float
    is_derived: bool = False


@dataclass(frozen=True, eq=False)
class Profile:
    """The log-likelihood along the mean reversion, greatest over the other parameters.

    Attributes
    ----------
    mean_reversion, log_likelihood : ndarray, shape (k,)
        [1/year] and as a number.
    cut : float
        Log-likelihood at which the 95 % interval ends: 1.92 below the top.
    """

    mean_reversion: FloatArray
    log_likelihood: FloatArray
    cut: float


@dataclass(frozen=True, eq=False)
class HistoryBand:
    """What a fitted model says of a history: from its first rate on, and from each rate to the next.

    Attributes
    ----------
    mean, low, high : ndarray, shape (n,)
        Mean and 95 % band of the rate at each date as seen from the first [1/year].
    forecast, deviation : ndarray, shape (n - 1,)
        Mean and standard deviation of each rate but the first, as seen from the one before [1/year].
    """

    mean: FloatArray
    low: FloatArray
    high: FloatArray
    forecast: FloatArray
    deviation: FloatArray


@dataclass(frozen=True, eq=False)
class Calibration:
    """A model fitted to data of the book.

    Attributes
    ----------
    source : CalibrationSource
    name : ModelName
        The model that was fitted.
    model : RatesModel or None
        As the book would hold it; None where it could not be drawn, and `obstacle` says why.
    obstacle : str
        Empty where there is a model.
    figures : tuple of Figure
        Parameters with errors and intervals, then what is derived from them.
    log_likelihood : float
    profile : Profile or None
        For a history alone.
    observations : int
        Steps of a history, quotes, or dates of the yields.
    residual : ndarray
        History and yields: standardised, shape (n,), independent standard normal under the model; of yields
        that of the forecast from date to date. Volatilities: model less quote [basis points], shape (m,).
    tests : ResidualTests or None
        Of a history's or the yields' residuals.
    is_poor : bool
        Whether the fit is not to be relied on as it stands.
    verdict : str
        One sentence that says how good the fit is, and whether it is poor.
    remarks : tuple of str
        What a user should know before relying on it, each a sentence.
    measure : str
        Under which measure the figures hold, and what they are and are not for.
    fit : HistoryFit, VolatilityFit or PanelFit
        All there is to know about it.
    data : History, Volatilities or YieldHistory
        What it was fitted to.
    quotes : OptionQuotes or None
        Volatilities laid out with what their prices need.
    band : HistoryBand or None
        For a history alone.
    """

    source: CalibrationSource
    name: ModelName
    model: RatesModel | None
    obstacle: str
    figures: tuple[Figure, ...]
    log_likelihood: float
    profile: Profile | None
    observations: int
    residual: FloatArray
    tests: ResidualTests | None
    is_poor: bool
    verdict: str
    remarks: tuple[str, ...]
    measure: str
    fit: HistoryFit | VolatilityFit | PanelFit
    data: History | Volatilities | YieldHistory
    quotes: OptionQuotes | None = None
    band: HistoryBand | None = None

    def figure(self, name: str) -> Figure:
        """The figure of a name.

        Raises
        ------
        KeyError
            If there is none.
        """
        for figure in self.figures:
            if figure.name == name:
                return figure
        raise KeyError(name)

    @property
    def date(self) -> NDArray[np.datetime64]:
        """Dates of the data, shape (n,); none of volatilities."""
        return np.empty(0, "datetime64[D]") if isinstance(self.data, Volatilities) else self.data.date
