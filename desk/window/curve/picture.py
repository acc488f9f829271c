"""The picture of a curve."""

from __future__ import annotations

import numpy as np

from desk.book import Basis
from desk.rates.compounding import Compounding, from_continuous
from desk.rates.curve import Curve
from desk.rates.sampling import sample_curve
from desk.rates.smith_wilson import Extrapolation
from desk.window.parts import numbers
from desk.window.parts.plots import Picture
from desk.window.parts.theme import ThemeSwitch

__all__ = ["CurvePicture", "stated_as"]

_ZERO, _FORWARD, _DISCOUNT, _QUOTES = "Zero", "Forward", "Discount", "Quote"
_MOST_BEYOND = 3.0
"""Shown at most this many times as far as the last term."""


def stated_as(compounding: Compounding) -> str:
    """How rates are stated, after a unit: ``annual``, ``continuous``."""
    return {
        Compounding.ANNUAL: "compounded annually",
        Compounding.SEMI_ANNUAL: "compounded semi-annually",
        Compounding.QUARTERLY: "compounded quarterly",
        Compounding.MONTHLY: "compounded monthly",
        Compounding.CONTINUOUS: "compounded continuously",
    }[compounding]


class CurvePicture(Picture):
    """Zero and forward rates and, on the right-hand axis, discount factors over one time axis."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Zero rates, forward rates and discount factors", theme_switch)
        self.set_right_axis("Discount factor", "", digits=4)

    def show_basis(self, basis: Basis, last_flow: float, compounding: Compounding) -> None:
        """Draw the curve of a basis.

        Parameters
        ----------
        basis : Basis
        last_flow : float
            Time of the last flow of the book [years]: the picture reaches it, within reason.
        compounding : Compounding
            How the rates are shown.
        """
        curve = basis.curve
        last = curve.last_term
        until = max(1.2 * last, min(np.ceil(last_flow), _MOST_BEYOND * last))
        sample = sample_curve(curve, until=until)
        self.set_axes(
            "Term",
            "years",
            "Rate",
            f"% a year, {stated_as(compounding)}",
            y_kind="rate",
            y_digits=3,
        )
        self.add_line(_DISCOUNT, sample.time, sample.discount, "ink_soft", dashed=True, right=True)
        self.add_line(_FORWARD, sample.time, from_continuous(sample.forward, compounding), "accent")
        self.add_line(_ZERO, sample.time, from_continuous(sample.zero, compounding), "rates")
        self.add_dots(_QUOTES, curve.terms, from_continuous(curve.zero_rates, compounding), "rates")
        self.shade_from(last, "beyond the last quote")
        ultimate = None
        if basis.extrapolation is Extrapolation.SMITH_WILSON:
            ultimate = basis.ultimate_forward_rate
        self.set_description(_sentence(curve, compounding, ultimate))


def _sentence(curve: Curve, compounding: Compounding, ultimate: float | None) -> str:
    rates = from_continuous(curve.zero_rates, compounding)
    beyond = float(from_continuous(curve.forward(curve.last_term, curve.last_term), compounding))

    def at(place: int) -> str:
        term = float(curve.terms[place])
        unit = "year" if term == 1.0 else "years"
        return f"{numbers.rate(float(rates[place]), 2, with_unit=True)} at {numbers.exact(term)} {unit}"

    known = f"Zero rates from {at(0)} to {at(-1)}" if curve.terms.size > 1 else f"One zero rate, {at(0)}"
    if ultimate is not None:
        goal = f"{numbers.rate(ultimate, with_unit=True)}, compounded annually"
        return f"{known}; beyond the last quote the forward rate goes to {goal}."
    return f"{known}; beyond the last quote the forward rate stays at {numbers.rate(beyond, with_unit=True)}."
