"""The pictures of present values along the paths, of convergence, and of models side by side."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from desk.scenarios.records import Distribution
from desk.scenarios.sampling_records import Convergence
from desk.scenarios.shapes import histogram_density, middle_range
from desk.scenarios.tail_readings import histogram_reading
from desk.window.parts import numbers
from desk.window.parts.plots import Picture
from desk.window.parts.theme import ThemeSwitch
from desk.window.scenarios.pictures import drawn_bins, nice_width

__all__ = ["ConvergencePicture", "ValuesPicture"]


class ValuesPicture(Picture):
    """Pathwise present values of one side or of several, with their values on the curve."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Present values along the paths", theme_switch)
        self._distributions: tuple[Distribution, ...] = ()
        self._currency = ""

    def show_values(
        self, title: str, distributions: Sequence[Distribution], currency: str, *, fit_error: float = 0.0
    ) -> None:
        """Draw distributions; one alone as bars, several as outlines.

        `fit_error` is that of the values fitted at the nodes, as a part of the value.
        """
        self.clear()
        self._distributions, self._currency = tuple(distributions), currency
        self.set_title(title)
        ranges = [middle_range(each.histogram) for each in distributions]
        per = max(nice_width(each.histogram) for each in distributions)
        scaled = numbers.money_scaled(per, currency, digits=0)
        width = " ".join(part for part in (currency, scaled.text, scaled.scale.word) if part)
        self.set_axes(
            "Present value",
            currency,
            "Share of paths",
            f"% per {width}",
            x_kind="money",
            y_kind="rate",
            with_zero=True,
        )
        alone = len(distributions) == 1
        far = max(float(each.histogram.edges[-1]) for each in distributions)
        for each in distributions:
            name = each.name.capitalize()
            if alone:
                middles, heights, wide = drawn_bins(each.histogram, per)
                self.add_bars(name, middles, heights, each.name, width=wide)
            else:
                # All end at one place, so that no name stands on the outline of another.
                place = np.append(each.histogram.edges, far)
                density = np.append(histogram_density(each.histogram) * per, [0.0, 0.0])
                self.add_line(name, place, density, each.name, stepped=True)
            self.add_vertical(each.curve, "on the curve" if alone else f"{each.name} on the curve")
        if alone and ranges[0][0] < 0.0 < ranges[0][1]:
            self.add_vertical(0.0, "0")
        self.set_range(x=(min(low for low, _ in ranges), max(high for _, high in ranges)))
        self.set_description(_value_sentence(distributions, fit_error))
        self.reset_view()

    def readings_at(self, x: float) -> list[tuple[str, str]]:
        """Share of the paths at and below `x`, and their mean."""
        found = []
        for each in self._distributions:
            reading = histogram_reading(each.histogram, x)
            mean = numbers.money_scaled(reading.mean, "") if np.isfinite(reading.mean) else None
            below = "" if mean is None else f", their mean {mean.text} {mean.scale.word}".rstrip()
            found.append((each.name, f"{numbers.rate(reading.share, 1, with_unit=True)} below{below}"))
        return found


def _value_sentence(distributions: Sequence[Distribution], fit_error: float) -> str:
    if len(distributions) != 1 or distributions[0].name != "surplus":
        if not fit_error > 0.0:
            return "Flows discounted along each path."
        error = f"{fit_error:.0e}".replace("-", "\N{MINUS SIGN}")
        return f"Flows discounted along each path; error of the fit {error}."
    chance = numbers.rate(distributions[0].below_zero, 1, with_unit=True)
    error = numbers.rate(distributions[0].below_zero_se, 1, with_unit=True)
    return f"Below zero on {chance} ± {error} of the paths."


class ConvergencePicture(Picture):
    """A headline figure after part of the paths, with its interval."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Convergence", theme_switch)

    def show_figure(self, found: Convergence, currency: str) -> None:
        """Draw a figure against the number of paths, on a logarithmic axis."""
        self.clear()
        is_share = not found.is_money and "chance" in found.figure
        self.set_title(found.figure[:1].upper() + found.figure[1:])
        kind = "money" if found.is_money else "rate" if is_share else "number"
        unit = currency if found.is_money else "%" if is_share else ""
        self.set_axes("Paths", "", "Value", unit, y_kind=kind, y_digits=None if found.is_money else 4)
        place = np.log2(np.maximum(found.paths, 1).astype(float))
        self.add_band(
            "95 % interval",
            place,
            found.low,
            found.high,
            "neutral",
            strength=0.16,
            edge_names=("95 % from", "95 % to"),
        )
        self.add_line("Estimate", place, found.value, "rates")
        self.add_dots("Estimate after", place, found.value, "rates")
        self.set_x_names(
            {float(at): numbers.integer(int(paths)) for at, paths in zip(place, found.paths, strict=True)}
        )
        self.set_range(x=(float(place[0]) - 0.25, float(place[-1]) + 0.25))
        self.set_description(_convergence_sentence(found))
        self.reset_view()


def _convergence_sentence(found: Convergence) -> str:
    if found.paths.size < 2 or not found.se[-1] > 0.0:
        return "There are too few paths to see how it settles."
    moved = abs(float(found.value[-1] - found.value[-2])) / float(found.se[-2])
    last = f"Twice the paths moved it by {numbers.number(moved, 1)} of the standard errors it had"
    return f"{last}; from the first part to all paths the standard error fell " + (
        f"{numbers.number(float(found.se[0] / found.se[-1]), 1)} times."
    )
