"""The pictures of the standing: flows of both sides by year, and DV01 by key rate."""

from __future__ import annotations

import numpy as np

from desk.book.arrays import FloatArray
from desk.valuation.estimates import key_rate_gap
from desk.valuation.records import KeyRates, Periods
from desk.window.parts import numbers
from desk.window.parts.plots import Picture
from desk.window.parts.theme import ThemeSwitch
from desk.window.standing.wording import amount

__all__ = ["FLOWS", "FLOWS_IN_REAL", "FlowPicture", "KeyRatePicture"]

FLOWS = "Flows of both sides by year"
FLOWS_IN_REAL = "Flows by year in today's money"

_CUMULATIVE = "Cumulative net"
_LEAST_ROOM = 0.25
"""Part of the height that the cumulative line has on each side of zero where it goes there."""


class FlowPicture(Picture):
    """Flows by year, assets up and liabilities down, with the cumulative net on an axis of its own.

    Both axes have their zero on one line.
    """

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(FLOWS, theme_switch)

    def show_periods(self, periods: Periods, currency: str) -> None:
        """Draw the periods of a standing."""
        self.set_axes("Year", "", "A year", currency, y_kind="money", with_zero=True)
        self.set_right_axis("Cumulative", currency, kind="money", alike=True)
        self.add_bars("Assets", periods.year, periods.assets, "assets", width=0.72)
        self.add_bars("Liabilities", periods.year, -periods.liabilities, "liabilities", width=0.72)
        self.add_line(_CUMULATIVE, periods.year, periods.cumulative, "surplus", right=True)
        self.set_description(_flow_sentence(periods, currency))

    def readings_at(self, x: float) -> list[tuple[str, str]]:
        """Each value with its own unit: the two axes may differ in theirs."""
        return [
            (name, f"{(scale := self._right if series.on_right else self._y).text(value)} {scale.shown_unit}")
            for series in self._series.values()
            for name, value in series.readings(x)
        ]

    def settle(self) -> None:
        """Bring the picture up to date, both zeros on one line."""
        super().settle()
        if self._home is None or not self._has_right:
            return
        bars, line = self._span(on_right=False), self._span(on_right=True)
        below = _below(bars, line)
        low_1, high_1 = _around_zero(*bars, below=below)
        low_2, high_2 = _around_zero(*line, below=below)
        self._home = (self._home[0], self._home[1], low_1, high_1)
        self._home_right = (low_2, high_2)
        self._right_box.setYRange(low_2, high_2, padding=0)
        if self._is_home:
            self._go_home()
        self._place_names()

    def _span(self, *, on_right: bool) -> tuple[float, float]:
        """The least and the greatest value on one axis, zero among them."""
        extents = [each.extent() for each in self._series.values() if each.on_right == on_right]
        values = np.array([[0.0, 0.0], *(extent[2:] for extent in extents)])
        return float(np.nanmin(values)), float(np.nanmax(values))


def _below(bars: tuple[float, float], line: tuple[float, float]) -> float:
    """The part of the height under zero: what the bars take, with some room for a line they leave none."""
    low, high = bars if bars[1] > bars[0] else line
    share = -low / (high - low) if high > low else 0.5
    # The line's own axis stretches to suit, but not without end: a quarter of the height is room enough.
    least = _LEAST_ROOM if line[0] < 0.0 else 0.0
    most = 1.0 - _LEAST_ROOM if line[1] > 0.0 else 1.0
    return float(np.clip(share, least, most))


def _around_zero(low: float, high: float, *, below: float) -> tuple[float, float]:
    """A range that holds `low` to `high`, with this part of it under zero."""
    needed = [size / part for size, part in ((-low, below), (high, 1.0 - below)) if part > 0.0]
    whole = 1.06 * max(needed, default=0.0) or 1.0
    return -below * whole, (1.0 - below) * whole


def _flow_sentence(periods: Periods, currency: str) -> str:
    if not periods.year.size:
        return "There are no flows after the valuation date."
    lowest = int(periods.cumulative.argmin())
    value = float(periods.cumulative[lowest])
    if value >= 0.0:
        return "Undiscounted. Receipts so far cover payments so far in every year."
    year = int(periods.year[lowest])
    return f"Undiscounted. Lowest total: {amount(value, currency)}, year {year}."


class KeyRatePicture(Picture):
    """DV01 of both sides and the gap at each key rate."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("DV01 by key rate", theme_switch)

    def show_key_rates(self, key_rates: KeyRates, currency: str) -> None:
        """Draw the key rates of a standing."""
        place = np.arange(key_rates.term.size, dtype=float)
        gap = key_rate_gap(key_rates)
        self.set_axes("Key rate", "years", "DV01", currency, y_kind="money", with_zero=True)
        self.set_x_names(
            {float(at): numbers.exact(float(term)) for at, term in zip(place, key_rates.term, strict=True)}
        )
        for name, heights, role, offset in (
            ("Assets", key_rates.dv01_assets, "assets", -0.27),
            ("Liabilities", key_rates.dv01_liabilities, "liabilities", 0.0),
            ("Gap", gap, "surplus", 0.27),
        ):
            self.add_bars(name, place, heights, role, width=0.25, offset=offset)
        self.set_description(_key_sentence(key_rates, gap, currency))


def _key_sentence(key_rates: KeyRates, gap: FloatArray, currency: str) -> str:
    if not np.any(gap):
        return "For +1 basis point at each key rate. There is no gap."
    widest = int(np.abs(gap).argmax())
    term = numbers.exact(float(key_rates.term[widest]))
    return f"Widest gap at {term} years: {amount(float(gap[widest]), currency)} for +1 bp."
