"""The pictures of a fit: the data with the model through them, the likelihood, and what is left over."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from PySide6.QtWidgets import QWidget

from desk.book.arrays import FloatArray
from desk.book.market import Volatilities, YieldHistory
from desk.book.model import History
from desk.rates.kalman_fit import PanelFit
from desk.rates.option_calibration import VolatilityFit
from desk.scenarios.calibration_records import Calibration
from desk.window.parts import numbers
from desk.window.parts.plots import Picture
from desk.window.parts.theme import ThemeSwitch

__all__ = [
    "ErrorsPicture",
    "HistoryPicture",
    "ProfilePicture",
    "QuantilesPicture",
    "QuotesPicture",
    "YieldsPicture",
    "quote_label",
]

_ROLE = "rates"
_MOST_NAMES, _MOST_QUOTES = 6, 4
"""Names under an axis: so many stay apart where the picture is narrow."""


class HistoryPicture(Picture):
    """The history with the mean of the fitted model and its band, as seen from the first rate."""

    def __init__(self, theme_switch: ThemeSwitch, parent: QWidget | None = None) -> None:
        super().__init__("Short rate and fitted model", theme_switch, parent=parent)
        self._dates: dict[float, str] = {}

    def show_fit(self, found: Calibration) -> None:
        """Draw a fit to a history."""
        data, band = found.data, found.band
        assert isinstance(data, History)
        assert band is not None
        self.clear()
        self.set_axes("Date", "", "Short rate", "% a year, continuous", y_kind="rate", y_digits=2)
        year = _years(data.date)
        self._dates = {place: numbers.day(day) for place, day in zip(year.tolist(), data.date, strict=True)}
        self.set_x_names(_year_names(float(year[0]), float(year[-1])))
        self.add_band("95 % band", year, band.low, band.high, _ROLE, edge_names=("2.5 %", "97.5 %"))
        self.add_line("Fitted mean", year, band.mean, _ROLE, dashed=True)
        self.add_line("History", year, data.rate, "ink")
        inside = np.mean((data.rate[1:] >= band.low[1:]) & (data.rate[1:] <= band.high[1:]))
        share = numbers.rate(float(inside), 0, with_unit=True)
        self.set_description(f"{share} of the rates lie in the band; 95 % are expected.")
        self.reset_view()

    def _x_text(self, x: float) -> str:
        return self._dates.get(x) or super()._x_text(x)


def _years(date: NDArray[np.datetime64]) -> FloatArray:
    """Dates as years with their parts."""
    start = date.astype("datetime64[Y]")
    length = (start + np.timedelta64(1, "Y")).astype("datetime64[D]") - start.astype("datetime64[D]")
    part = (date - start.astype("datetime64[D]")) / length
    return np.asarray(1970.0 + start.astype(np.float64) + part)


def _year_names(first: float, last: float) -> dict[float, str]:
    """Some whole years between two places, without the grouping of other figures."""
    step = next(step for step in (1, 2, 5, 10, 20, 50, 100, 1000) if (last - first) / step <= _MOST_NAMES)
    years = range(int(np.ceil(first / step)) * step, int(last) + 1, step)
    return {float(year): str(year) for year in years}


class ProfilePicture(Picture):
    """The log-likelihood along the mean reversion, with the cut at which its interval ends."""

    def __init__(self, theme_switch: ThemeSwitch, parent: QWidget | None = None) -> None:
        super().__init__("Likelihood of the mean reversion", theme_switch, parent=parent)

    def show_fit(self, found: Calibration) -> None:
        """Draw a fit to a history."""
        profile = found.profile
        assert profile is not None
        self.clear()
        self.set_axes("Mean reversion", "a year", "Log-likelihood", "", y_digits=2, x_digits=3)
        speed, height = profile.mean_reversion, profile.log_likelihood
        self.add_line("Profile", speed, height, _ROLE)
        self.add_line("95 % cut", speed[[0, -1]], [profile.cut, profile.cut], "ink_soft", dashed=True)
        estimate = found.figure("mean_reversion")
        self.add_vertical(estimate.value, "estimate")
        ends = f"{numbers.number(estimate.low, 3)} to {numbers.number(estimate.high, 3)}"
        self.set_description(f"95 % interval: {ends} a year, above the cut.")
        self.reset_view()


class QuantilesPicture(Picture):
    """Standardised residuals in order against the normal quantiles they would be at."""

    def __init__(self, theme_switch: ThemeSwitch, parent: QWidget | None = None) -> None:
        super().__init__("Residuals against the normal law", theme_switch, parent=parent)

    def show_fit(self, found: Calibration) -> None:
        """Draw a fit to a history of rates or yields."""
        from scipy.special import ndtri

        ordered = np.sort(found.residual)
        # Blom (1958): the expected order statistics of normal numbers, nearly.
        place = ndtri((np.arange(1, ordered.size + 1) - 0.375) / (ordered.size + 0.25))
        self.clear()
        self.set_axes("Normal quantile", "", "Residual", "standard deviations", x_digits=2, y_digits=2)
        self.add_line("As the model says", place[[0, -1]], place[[0, -1]], "ink_soft", dashed=True)
        self.add_dots("Residual", place, ordered, _ROLE)
        edge = 1.08 * float(place[-1])
        self.set_range(x=(-edge, edge))
        tests = found.tests
        assert tests is not None
        self.set_description(
            f"Skewness {numbers.signed(tests.skewness)}, kurtosis {numbers.number(tests.kurtosis, 2)}; under "
            "the model 0 and 3."
        )
        self.reset_view()


def quote_label(data: Volatilities, row: int) -> str:
    """A short name of a quote: ``cap 5y`` or ``5y into 10y``."""
    expiry, length = f"{data.expiry[row]:g}y", float(data.length[row])
    name = data.instrument[row].value
    if "swaption" not in name:
        return f"{name} {expiry}"
    return f"{expiry} into {length:g}y"


class _OverQuotes(Picture):
    """A picture over quotes in their order: some are named under the axis, each in the reading."""

    _labels: dict[float, str]

    def name_quotes(self, data: Volatilities, rows: NDArray[np.int64]) -> None:
        """Name the quotes of these rows."""
        self._labels = {float(at): quote_label(data, row) for at, row in enumerate(rows.tolist(), start=1)}
        step = max(1, -(-len(self._labels) // _MOST_QUOTES))
        self.set_x_names({at: name for at, name in self._labels.items() if (int(at) - 1) % step == 0})

    def _x_text(self, x: float) -> str:
        return self._labels.get(x) or super()._x_text(x)


class QuotesPicture(_OverQuotes):
    """Quoted volatilities of one kind beside those of the model."""

    def __init__(self, theme_switch: ThemeSwitch, parent: QWidget | None = None) -> None:
        super().__init__("Quoted and fitted volatility", theme_switch, parent=parent)
        self._labels = {}

    def show_fit(self, found: Calibration, kind: str) -> None:
        """Draw the quotes of a kind, ``normal`` or ``lognormal``."""
        data, fit = found.data, found.fit
        assert isinstance(data, Volatilities)
        assert isinstance(fit, VolatilityFit)
        rows = rows_of_kind(data, kind)
        place = np.arange(1.0, rows.size + 1.0)
        self.clear()
        self.set_title(f"Quoted and fitted {kind} volatility")
        unit = "% a year" if kind == "normal" else "%"
        self.set_axes("Quote", "", "Volatility", unit, y_kind="rate", y_digits=3)
        self.name_quotes(data, rows)
        self.add_dots("Quoted", place, fit.quoted_volatility[rows], "ink")
        self.add_dots("Fitted", place, fit.model_volatility[rows], _ROLE, symbol="x")
        self.set_range(x=(0.4, rows.size + 0.6))
        self.set_description("Circles: quoted. Crosses: the fitted model.")
        self.reset_view()


def rows_of_kind(data: Volatilities, kind: str) -> NDArray[np.int64]:
    """The quotes of a kind, in their order."""
    return np.flatnonzero(np.array([each.value == kind for each in data.kind]))


class ErrorsPicture(_OverQuotes):
    """What the model leaves over, by quote or by term."""

    def __init__(self, theme_switch: ThemeSwitch, parent: QWidget | None = None) -> None:
        super().__init__("Residuals", theme_switch, parent=parent)
        self._labels = {}

    def show_quotes(self, found: Calibration, kind: str) -> None:
        """Draw model less quote for the quotes of a kind."""
        data, fit = found.data, found.fit
        assert isinstance(data, Volatilities)
        assert isinstance(fit, VolatilityFit)
        rows = rows_of_kind(data, kind)
        place = np.arange(1.0, rows.size + 1.0)
        self._draw("Residuals by quote", "Quote", "", "Fitted less quoted", place, fit.residual_bp[rows])
        self.name_quotes(data, rows)
        worst = int(rows[np.argmax(np.abs(fit.residual_bp[rows]))])
        size = numbers.signed(float(fit.residual_bp[worst]), 1)
        self.set_description(f"Largest: {size} basis points for the {fit.instruments[worst]}.")

    def show_terms(self, found: Calibration) -> None:
        """Draw the root mean square by term of yields."""
        fit = found.fit
        assert isinstance(fit, PanelFit)
        place = np.arange(1.0, fit.term.size + 1.0)
        self._labels = {}
        self._draw("Residuals by term", "Term", "years", "Root mean square", place, fit.rmse_bp)
        self.set_x_names(
            {float(at): numbers.exact(float(term)) for at, term in zip(place, fit.term, strict=True)}
        )
        worst = int(np.argmax(fit.rmse_bp))
        self.set_description(
            f"Largest: {numbers.number(float(fit.rmse_bp[worst]), 1)} basis points at "
            f"{numbers.exact(float(fit.term[worst]))} years."
        )

    def _draw(
        self, title: str, across: str, unit: str, upward: str, place: FloatArray, heights: FloatArray
    ) -> None:
        self.clear()
        self.set_title(title)
        self.set_axes(across, unit, upward, "basis points", y_digits=1, with_zero=True)
        self.add_bars(upward, place, heights, _ROLE)
        self.set_range(x=(0.4, place.size + 0.6))
        self.reset_view()


class YieldsPicture(Picture):
    """Yields of one date by term, observed and fitted."""

    def __init__(self, theme_switch: ThemeSwitch, parent: QWidget | None = None) -> None:
        super().__init__("Yields, observed and fitted", theme_switch, parent=parent)

    def show_date(self, found: Calibration, row: int) -> None:
        """Draw the date at `row`."""
        data, fit = found.data, found.fit
        assert isinstance(data, YieldHistory)
        assert isinstance(fit, PanelFit)
        order = np.argsort(data.terms)
        self.clear()
        self.set_title(f"Yields on {numbers.day(data.date[row])}")
        self.set_axes("Term", "years", "Zero rate", "% a year, continuous", y_kind="rate", y_digits=3)
        self.add_line("Fitted", data.terms[order], fit.fitted[row][order], _ROLE)
        self.add_dots("Observed", data.terms[order], data.rates[row][order], "ink")
        low, high = float(data.terms.min()), float(data.terms.max())
        room = max(0.04 * (high - low), 0.1)
        self.set_range(x=(low - room, high + room))
        left = fit.residual_bp[row]
        known = left[np.isfinite(left)]
        size = f"{np.sqrt(np.mean(known**2)):.1f} basis points" if known.size else "nothing was quoted"
        self.set_description(f"Residuals, root mean square: {size}.")
        self.reset_view()
