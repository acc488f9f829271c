"""Curves that are stated as such: parameters of a formula, one rate for all terms, spreads by term."""

from __future__ import annotations

import math

import numpy as np

from desk.book.arrays import FloatArray
from desk.book.curve_source import CurveParameters
from desk.rates.compounding import Compounding, to_continuous
from desk.rates.curve import Curve
from desk.rates.curve_error import CurveError
from desk.rates.flat import flat_curve
from desk.rates.parametric import NelsonSiegel, Svensson

__all__ = ["continuous_quotes", "formula_curve", "require_spreads", "stated_flat_curve"]

_LATEST = 1000.0  # years: as far as any quote may reach
_SPREADS = "liability spreads"


def formula_curve(
    parameters: CurveParameters | None, *, second_hump: bool, compounding: Compounding
) -> NelsonSiegel | Svensson:
    """The curve of a formula.

    Parameters
    ----------
    parameters : CurveParameters or None
    second_hump : bool
        Whether the formula is that of Svensson.
    compounding : Compounding
        Of the zero rates that it gives.

    Raises
    ------
    CurveError
        If a parameter is missing, is no finite number, is a decay not above 0, or if they give a rate that
        leaves nothing of the principal.
    """
    if parameters is None:
        raise CurveError("there are no parameters of the curve", "Give beta 0 to beta 2 and tau 1.")
    stated = {
        "beta 0": parameters.beta_0,
        "beta 1": parameters.beta_1,
        "beta 2": parameters.beta_2,
        "tau 1": parameters.tau_1,
    }
    if second_hump:
        for name, value in (("beta 3", parameters.beta_3), ("tau 2", parameters.tau_2)):
            if value is None:
                raise CurveError(
                    f"there is no {name}",
                    "Give it, or take the curve of Nelson and Siegel, which needs none.",
                )
            stated[name] = value
    for name, value in stated.items():
        if not math.isfinite(value):
            raise CurveError(f"{name} is not a number", "Give one.")
        if name.startswith("tau") and value <= 0.0:
            raise CurveError(f"{name}, {value:g} years, is not above 0", "Give the decay in years.")
    curve: NelsonSiegel | Svensson
    level, slope, curvature, decay = parameters.beta_0, parameters.beta_1, parameters.beta_2, parameters.tau_1
    if second_hump:
        curve = Svensson(level, slope, curvature, stated["beta 3"], decay, stated["tau 2"], compounding)
    else:
        curve = NelsonSiegel(level, slope, curvature, decay, compounding)
    try:
        curve.zero(np.concatenate(([0.0], np.geomspace(1e-3, _LATEST, 2000))))
    except ValueError as error:
        raise CurveError(
            f"the parameters give a rate that is not above {-compounding.per_year * 100} %",
            "Give them as parts of 1 and not in percent, and check the compounding.",
        ) from error
    return curve


def stated_flat_curve(rate: float | None, *, compounding: Compounding, name: str) -> Curve:
    """One rate for all terms.

    Parameters
    ----------
    rate : float or None
        [1/year]
    compounding : Compounding
        How it is stated.
    name : str
        What the rate is, for the error.

    Raises
    ------
    CurveError
        If there is none, or it leaves nothing of the principal.
    """
    if rate is None:
        raise CurveError(f"there is no {name}", "Give it.")
    if not math.isfinite(rate):
        raise CurveError(f"the {name} is not a number", "Give one.")
    try:
        return flat_curve(rate, compounding)
    except ValueError as error:
        raise CurveError(
            f"the {name}, {rate:g}, leaves nothing of the principal", "Give a higher one."
        ) from error


def continuous_quotes(rates: FloatArray, compounding: Compounding) -> FloatArray:
    """Quoted rates with continuous compounding.

    Raises
    ------
    CurveError
        If a rate leaves nothing of the principal; `rows` names the quotes.
    """
    periods = compounding.per_year
    wrong = rates <= -periods if periods else np.zeros(rates.shape, dtype=np.bool_)
    if wrong.any():
        raise CurveError(
            f"the rate is not above {-periods * 100} %, compounded {compounding}",
            "Correct it or leave it out.",
            rows=np.flatnonzero(wrong).tolist(),
        )
    return to_continuous(rates, compounding)


def require_spreads(terms: FloatArray, spreads: FloatArray) -> None:
    """Raise CurveError, naming the rows, unless these are spreads by term."""
    if not terms.size or terms.shape != spreads.shape:
        raise CurveError(
            "there is no spread by term", "Give at least one term with its spread.", subject=_SPREADS
        )
    wrong = ~(np.isfinite(terms) & np.isfinite(spreads)) | (terms < 0.0)
    if wrong.any():
        raise CurveError(
            "liability spreads: the row is not a spread at a term of 0 years or more",
            "Correct it or leave it out.",
            rows=np.flatnonzero(wrong).tolist(),
            subject=_SPREADS,
        )
    falls = np.flatnonzero(np.diff(terms) <= 0.0)
    if falls.size:
        row = int(falls[0]) + 1
        raise CurveError(
            f"liability spreads: {terms[row]:g} years stands after {terms[row - 1]:g} years",
            "Put the terms in order, each once.",
            rows=(row,),
            subject=_SPREADS,
        )
