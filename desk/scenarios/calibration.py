"""Short-rate models fitted to what the book holds: a history, quoted volatilities, a history of yields.

The estimates and their tests are those of `desk.rates`; here they are asked for by the book's names and
brought into one record, whatever the source.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import fields, replace
from typing import Any

import numpy as np

from desk.book import Book, Fault, ModelName, RatesModel
from desk.book.arrays import FloatArray
from desk.book.market import Volatilities, YieldHistory
from desk.book.model import History
from desk.rates.history_fit import HistoryFit
from desk.rates.history_square_root import fit_square_root
from desk.rates.history_vasicek import fit_vasicek
from desk.rates.kalman_fit import PanelFit, fit_yield_panel
from desk.rates.option_calibration import VolatilityFit, fit_volatilities
from desk.rates.option_instruments import OptionQuotes, OptionQuotesError, option_quotes
from desk.scenarios.calibration_band import history_band
from desk.scenarios.calibration_figures import figures_of, judged
from desk.scenarios.calibration_records import (
    Calibration,
    CalibrationError,
    CalibrationSource,
    HistoryBand,
    Profile,
)
from desk.scenarios.models import rate_model

__all__ = [
    "CALIBRATED_MODELS",
    "NEEDED",
    "calibrate",
    "calibration_sources",
    "calibrations",
    "usual_model",
]

CALIBRATED_MODELS: dict[CalibrationSource, tuple[ModelName, ...]] = {
    CalibrationSource.HISTORY: (ModelName.VASICEK, ModelName.CIR),
    CalibrationSource.VOLATILITIES: (
        ModelName.HULL_WHITE,
        ModelName.HO_LEE,
        ModelName.GAUSSIAN_2,
        ModelName.CIR_SHIFTED,
    ),
    CalibrationSource.YIELDS: (ModelName.VASICEK, ModelName.GAUSSIAN_2),
}
"""The models that can be fitted to each source; the first is the usual one."""

NEEDED: dict[CalibrationSource, tuple[str, str]] = {
    CalibrationSource.HISTORY: ("History", "the columns Date and Short rate (continuously compounded)"),
    CalibrationSource.VOLATILITIES: (
        "Volatilities",
        "the columns Instrument, Expiry and Volatility and, as they are needed, Length, Strike, Kind, Shift "
        "and Frequency",
    ),
    CalibrationSource.YIELDS: (
        "Yield history",
        "the column Date and one column a term in years, of continuously compounded zero rates",
    ),
}
"""The sheet that each source comes from, and its columns in words."""

_MEASURES = {
    CalibrationSource.HISTORY: (
        "The history shows how the rate moved in the real world. The figures are for forecasts; option and "
        "bond prices do not follow from them, for what the market pays for bearing the risk is not in a "
        "history. The price of risk is 0 in this model."
    ),
    CalibrationSource.VOLATILITIES: (
        "Prices show the pricing measure alone. The figures are for values: today's curve is repriced "
        "whatever they are. They are no forecast of how far rates will move; for forecasts state a price of "
        "risk of your own."
    ),
    CalibrationSource.YIELDS: (
        "A history of whole curves shows both measures: their shape gives the pricing measure, their "
        "movement the real world, and the price of risk is the difference. The figures reprice neither "
        "today's curve nor options exactly."
    ),
}
_FITTED = (
    "mean_reversion",
    "volatility",
    "long_run_rate",
    "starting_rate",
    "second_mean_reversion",
    "second_volatility",
    "factor_correlation",
    "risk_price",
    "second_risk_price",
)
_CHI_SQUARE_HALF = 1.920729410347062  # half the 95 % point of chi-square with one degree of freedom


def calibration_sources(book: Book) -> tuple[CalibrationSource, ...]:
    """The sources of data that a book has."""
    held = {
        CalibrationSource.HISTORY: book.history,
        CalibrationSource.VOLATILITIES: book.volatilities,
        CalibrationSource.YIELDS: book.yield_history,
    }
    return tuple(source for source, data in held.items() if data is not None)


def usual_model(book: Book, source: CalibrationSource) -> ModelName:
    """The model to fit to a source where none is named: the book's own where it can be."""
    own = None if book.rates_model is None else book.rates_model.name
    models = CALIBRATED_MODELS[source]
    return own if own in models else models[0]


def calibrate(book: Book, *, source: CalibrationSource, model: ModelName | None = None) -> Calibration:
    """Fit a model to data of the book.

    Parameters
    ----------
    book : Book
    source : CalibrationSource
    model : ModelName, optional
        One of `CALIBRATED_MODELS`; by default see `usual_model`.

    Raises
    ------
    CalibrationError
        If the book has no such data, the model cannot be fitted to it, or the data are not fit for it: too
        short, out of order, negative rates for the square-root model, quotes that cannot be meant.
    """
    sheet, columns = NEEDED[source]
    if source not in calibration_sources(book):
        raise CalibrationError(
            (
                Fault(
                    f"the book has no {_WORDS[source]}",
                    f"a sheet '{sheet}'",
                    f"Add a sheet '{sheet}' with {columns}.",
                    sheet,
                ),
            )
        )
    name = usual_model(book, source) if model is None else model
    if name not in CALIBRATED_MODELS[source]:
        listed = ", ".join(CALIBRATED_MODELS[source])
        raise CalibrationError(
            (
                Fault(
                    f"the model {name} cannot be fitted to the {_WORDS[source]}",
                    f"one of {listed}",
                    "Choose one of these models.",
                    sheet,
                ),
            )
        )
    if source is CalibrationSource.HISTORY:
        return _to_history(book, name)
    if source is CalibrationSource.VOLATILITIES:
        return _to_volatilities(book, name)
    return _to_yields(book, name)


def calibrations(
    book: Book, *, progress: Callable[[float], None] | None = None
) -> tuple[tuple[Calibration, ...], tuple[Fault, ...]]:
    """The usual model fitted to every source of data the book has, and why where it could not be."""
    found: list[Calibration] = []
    faults: list[Fault] = []
    sources = calibration_sources(book)
    for place, source in enumerate(sources):
        if progress is not None:
            progress(place / len(sources))
        try:
            found.append(calibrate(book, source=source))
        except CalibrationError as error:
            faults += error.faults
    return tuple(found), tuple(faults)


_WORDS = {
    CalibrationSource.HISTORY: "history of short rates",
    CalibrationSource.VOLATILITIES: "quoted volatilities",
    CalibrationSource.YIELDS: "history of yields",
}


def _refused(error: ValueError, source: CalibrationSource) -> CalibrationError:
    """What the estimate said, as a fault of its sheet."""
    text = str(error).rstrip(".")
    sheet = NEEDED[source][0]
    return CalibrationError(
        (
            Fault(
                text,
                "data that the model can be fitted to",
                "Mend the sheet, or choose another model.",
                sheet,
            ),
        )
    )


def _to_history(book: Book, name: ModelName) -> Calibration:
    data = book.history
    assert isinstance(data, History)
    estimate = fit_vasicek if name is ModelName.VASICEK else fit_square_root
    try:
        fit = estimate(data.date, data.rate)
    except ValueError as error:
        raise _refused(error, CalibrationSource.HISTORY) from error
    profile = Profile(
        fit.profile_mean_reversion, fit.profile_log_likelihood, fit.log_likelihood - _CHI_SQUARE_HALF
    )
    return _record(
        book,
        CalibrationSource.HISTORY,
        name,
        fit,
        data,
        profile=profile,
        observations=fit.steps,
        residual=fit.tests.residual,
        band=history_band(fit, data),
    )


def _to_volatilities(book: Book, name: ModelName) -> Calibration:
    data = book.volatilities
    assert isinstance(data, Volatilities)
    try:
        curve = book.basis.curve
    except ValueError as error:
        fault = Fault(str(error).rstrip("."), "a curve", "Mend the basis: options need its curve.", "Basis")
        raise CalibrationError((fault,)) from error
    try:
        quotes = option_quotes(
            curve,
            instrument=[entry.value for entry in data.instrument],
            expiry=data.expiry,
            length=data.length,
            strike=data.strike,
            volatility=data.volatility,
            kind=[entry.value for entry in data.kind],
            shift=data.shift,
            frequency=data.frequency,
        )
        fit = fit_volatilities(quotes, model=name.value)
    except OptionQuotesError as error:
        raise CalibrationError(
            tuple(
                Fault(
                    f"quote {row + 1}: {text.rstrip('.')}",
                    "quotes that can hold together",
                    "Mend the quote or leave it out.",
                    NEEDED[CalibrationSource.VOLATILITIES][0],
                )
                for row, text in error.faults
            )
        ) from error
    except ValueError as error:
        raise _refused(error, CalibrationSource.VOLATILITIES) from error
    return _record(
        book,
        CalibrationSource.VOLATILITIES,
        name,
        fit,
        data,
        observations=quotes.count,
        residual=fit.residual_bp,
        quotes=quotes,
    )


def _to_yields(book: Book, name: ModelName) -> Calibration:
    data = book.yield_history
    assert isinstance(data, YieldHistory)
    try:
        fit = fit_yield_panel(
            data.date, data.terms, data.rates, factors=2 if name is ModelName.GAUSSIAN_2 else 1
        )
    except ValueError as error:
        raise _refused(error, CalibrationSource.YIELDS) from error
    return _record(
        book,
        CalibrationSource.YIELDS,
        name,
        fit,
        data,
        observations=data.date.size,
        residual=fit.tests.residual,
    )


def _record(
    book: Book,
    source: CalibrationSource,
    name: ModelName,
    fit: HistoryFit | VolatilityFit | PanelFit,
    data: History | Volatilities | YieldHistory,
    *,
    observations: int,
    residual: FloatArray,
    profile: Profile | None = None,
    quotes: OptionQuotes | None = None,
    band: HistoryBand | None = None,
) -> Calibration:
    """What every source brings into the record alike."""
    is_poor, verdict = judged(fit, unit=None if quotes is None else _kind_means(quotes))
    model, obstacle = _usable(book, name, fit)
    return Calibration(
        source=source,
        name=name,
        model=model,
        obstacle=obstacle,
        figures=figures_of(fit),
        log_likelihood=fit.log_likelihood,
        profile=profile,
        observations=observations,
        residual=residual,
        tests=None if isinstance(fit, VolatilityFit) else fit.tests,
        is_poor=is_poor,
        verdict=verdict,
        remarks=fit.remarks,
        measure=_MEASURES[source],
        fit=fit,
        data=data,
        quotes=quotes,
        band=band,
    )


def _kind_means(quotes: OptionQuotes) -> FloatArray:
    """For each quote the mean of its kind: lognormal quotes are many times the normal ones."""
    mean = np.empty(quotes.count)
    for rows in (quotes.normal, ~quotes.normal):
        if rows.any():
            mean[rows] = quotes.volatility[rows].mean()
    return mean


def _usable(
    book: Book, name: ModelName, fit: HistoryFit | VolatilityFit | PanelFit
) -> tuple[RatesModel | None, str]:
    """The fitted model as the book would hold it, or why it cannot be used."""
    stated: dict[str, Any] = {}
    for field in fields(RatesModel):
        value = getattr(fit, field.name, None)
        if field.name in _FITTED and value is not None:
            stated[field.name] = float(value)
    missing = [key.replace("_", " ") for key, value in stated.items() if not math.isfinite(value)]
    if missing:
        return None, f"There is no estimate of the {' and '.join(missing)}: the model cannot be used."
    # What is not of the short rate, such as inflation beside it, stays as the book has it.
    kept = (
        {}
        if book.rates_model is None
        else {
            field.name: getattr(book.rates_model, field.name)
            for field in fields(RatesModel)
            if field.name not in _FITTED and field.name != "name"
        }
    )
    model = RatesModel(name, **stated, **kept)
    try:
        rate_model(replace(book, rates_model=model))
    except ValueError as error:
        return None, f"The fitted model cannot be drawn: {str(error).rstrip('.')}."
    return model, ""
