"""The surplus against a parallel move, and a curve before and after a shock."""

from __future__ import annotations

import numpy as np

from desk.book.arrays import FloatArray
from desk.valuation.shock_records import ParallelProfile
from desk.window.parts import numbers
from desk.window.parts.plots import Picture
from desk.window.parts.theme import ThemeSwitch
from desk.window.shocks.moved import MovedRates

__all__ = ["MovePicture", "MovedCurvePicture", "ProfilePicture"]


class ProfilePicture(Picture):
    """The surplus against a parallel move of all rates, with its tangent."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Surplus against a parallel move", theme_switch)

    def show_profile(self, profile: ParallelProfile, currency: str) -> None:
        """Draw a profile."""
        self.clear()
        self.set_axes("Parallel move", "bp", "Surplus", currency, y_kind="money")
        self.set_x_names({})
        self.add_line("Tangent", profile.move, profile.tangent, "ink_soft", dashed=True, strong=False)
        self.add_line("Surplus", profile.move, profile.surplus, "surplus")
        self.add_vertical(0.0, "today")
        for turn in profile.gap_turns[:3]:
            self.add_vertical(turn, f"gap turns at {numbers.signed(turn, 0)} bp")
        self.set_description(_profile_sentence(profile))


def _profile_sentence(profile: ParallelProfile) -> str:
    if profile.gap_turns:
        turns = ", ".join(numbers.signed(turn, 0) for turn in profile.gap_turns[:3])
        return f"The duration gap changes its sign at {turns} bp."
    gap = profile.duration_gap[np.isfinite(profile.duration_gap)]
    if not gap.size:
        return "Fully revalued; the tangent is what duration alone says."
    low, high = (numbers.signed(float(profile.move[end]), 0) for end in (0, -1))
    sign = "above" if gap[0] > 0.0 else "below"
    return f"The duration gap stays {sign} 0 from {low} to {high} bp."


class MovedCurvePicture(Picture):
    """Zero rates before and after a shock."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("The curve before and after", theme_switch)

    def show_rates(self, rates: MovedRates) -> None:
        """Draw both."""
        self.set_axes("Term", "years", "Zero rate", "% a year, continuous", y_kind="rate", y_digits=3)
        self.add_line("Before", rates.time, rates.before, "rates", dashed=True)
        self.add_line("After", rates.time, rates.after, "what_if")
        self.set_description(_curve_sentence(rates))


class MovePicture(Picture):
    """Moves of zero rates by term."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Move of zero rates by term", theme_switch)

    def show_rates(self, rates: MovedRates) -> None:
        """Draw the moves."""
        self.set_axes("Term", "years", "Move", "bp", y_digits=1, with_zero=True)
        self.add_line("Move", rates.time, rates.move_bp, "what_if")
        self.set_description(_curve_sentence(rates))


def _curve_sentence(rates: MovedRates) -> str:
    if rates.fault:
        return rates.fault
    move: FloatArray = rates.move_bp
    if not np.any(move):
        return "The curve is not moved."
    if np.ptp(move) < 1e-6:
        return f"All zero rates move by {numbers.signed(float(move[0]), 1)} bp."
    widest = int(np.abs(rates.term_move_bp).argmax())
    term = numbers.exact(float(rates.term[widest]))
    size = numbers.signed(float(rates.term_move_bp[widest]), 1)
    return f"Widest of the key rates at {term} years: {size} bp."
