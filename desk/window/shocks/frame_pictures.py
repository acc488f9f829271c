"""Both sides before and with a what-if: present values by year, and the gap by key rate."""

from __future__ import annotations

import numpy as np

from desk.valuation.what_if import Frame
from desk.window.parts import numbers
from desk.window.parts.plots import Picture
from desk.window.parts.theme import ThemeSwitch
from desk.window.standing.wording import amount

__all__ = ["GapPicture", "YearsPicture"]


class YearsPicture(Picture):
    """Present values by year: bars as the book stands, lines with the what-if."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Present value of flows by year", theme_switch)

    def show_frames(self, before: Frame, after: Frame | None, currency: str) -> None:
        """Draw the book before, and after where there is that."""
        self.set_axes("Year", "", "Present value", currency, y_kind="money", with_zero=True)
        self.add_bars("Assets", before.year, before.assets, "assets", width=0.72)
        self.add_bars("Liabilities", before.year, -before.liabilities, "liabilities", width=0.72)
        if after is None:
            self.remove("Assets, what-if")
            self.remove("Liabilities, what-if")
            self.set_description("Liabilities downwards. Move something to see what becomes of it.")
            return
        # Steps from edge to edge of the bars.
        edges = np.append(after.year - 0.5, after.year[-1] + 0.5)
        for name, values in (("Assets", after.assets), ("Liabilities", -after.liabilities)):
            steps = np.append(values, values[-1])
            self.add_line(f"{name}, what-if", edges, steps, "what_if", stepped=True)
        change = after.change
        self.set_description(
            f"Assets {_signed(change.assets, currency)}, liabilities {_signed(change.liabilities, currency)}."
        )


class GapPicture(Picture):
    """DV01 gap by key rate, before and with the what-if."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("DV01 gap by key rate", theme_switch)

    def show_frames(self, before: Frame, after: Frame | None, currency: str) -> None:
        """Draw the book before, and after where there is that."""
        place = np.arange(before.term.size, dtype=float)
        self.set_axes("Key rate", "years", "DV01 gap", currency, y_kind="money", with_zero=True)
        self.set_x_names(
            {float(at): numbers.exact(float(term)) for at, term in zip(place, before.term, strict=True)}
        )
        gap = before.dv01_assets - before.dv01_liabilities
        self.add_bars("Before", place, gap, "surplus", width=0.36, offset=-0.2)
        if after is None:
            self.remove("With the what-if")
            self.set_description("Assets less liabilities, for +1 basis point at each key rate.")
            return
        moved = after.dv01_assets - after.dv01_liabilities
        self.add_bars("With the what-if", place, moved, "what_if", width=0.36, offset=0.2)
        self.set_description(f"DV01 gap {_signed(after.change.dv01_gap, currency)} with the what-if.")


def _signed(value: float, currency: str) -> str:
    text = amount(value, currency)
    return text if text.startswith(numbers.MINUS) else f"+{text}"
