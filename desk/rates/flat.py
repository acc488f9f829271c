"""One rate for every term."""

from __future__ import annotations

from desk.rates.compounding import Compounding, to_continuous
from desk.rates.curve import Curve

__all__ = ["flat_curve"]


def flat_curve(rate: float, compounding: Compounding = Compounding.ANNUAL) -> Curve:
    """A curve with one rate for every term.

    Parameters
    ----------
    rate : float
        As stated [1/year].
    compounding : Compounding
        How it is stated.

    Raises
    ------
    ValueError
        If the rate is not finite or leaves nothing of the principal.
    """
    return Curve([1.0], to_continuous([rate], compounding))
