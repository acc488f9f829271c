"""Checks that several sheets share."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from numpy.typing import NDArray

from desk.intake.cells import Cells
from desk.intake.sheets import fold

__all__ = [
    "check_correlations",
    "check_not_negative",
    "check_rates",
    "check_size",
    "near_name",
    "plain",
    "some",
]

FloatArray = NDArray[np.float64]


def some(what: str) -> str:
    """ "the amount" as "an amount": what is expected is not what was found."""
    name = what.removeprefix("the ")
    return f"{'an' if name[0] in 'aeiou' else 'a'} {name}"


def near_name(text: str, names: Iterable[str]) -> str:
    """A question after the name that is meant; "" where none is near."""
    import difflib

    by_fold: dict[str, str] = {}
    for name in names:
        by_fold.setdefault(fold(name), name)
    close = difflib.get_close_matches(fold(text), list(by_fold), 1, 0.6)
    return f'Did you mean "{by_fold[close[0]][:60]}"?' if close else ""


def plain(error: Exception) -> str:
    """What an error says, without the marks that are for those who write programs."""
    return str(error).replace("`", "").replace("_", " ")


def check_rates(
    cells: Cells, values: FloatArray, what: str, *, most: float = 1.0, least: float = -0.5
) -> None:
    """Report rates that are plainly meant in per cent, or that no rate can be."""
    with np.errstate(invalid="ignore"):
        high, low = np.flatnonzero(values > most), np.flatnonzero(values < least)
    for entry in high.tolist():
        value = float(values[entry])
        cells.fault(
            entry,
            f"{what} is {value:.12g}, which is {value * 100:.6g} % a year",
            f"{some(what)} as a fraction or in a cell formatted as per cent",
            f"Write {value:.12g} % or {value / 100:.12g}.",
        )
    for entry in low.tolist():
        value = float(values[entry])
        cells.fault(
            entry,
            f"{what} is {value:.12g}, below {100.0 * least:g} % a year",
            f"{some(what)} as a fraction or in a cell formatted as per cent",
            f"Write {value:.12g} % or {value / 100:.12g}, or correct the figure.",
        )


def check_size(cells: Cells, values: FloatArray, what: str, *, most: float = 1e18) -> None:
    """Report numbers so large that they can only be slips, and that sums would not bear."""
    with np.errstate(invalid="ignore"):
        flagged = np.abs(values) > most
    cells.each(
        flagged, f"{what} is {{}}", f"{some(what)} of at most {most:g} either way", "Correct the figure."
    )


def check_not_negative(cells: Cells, values: FloatArray, what: str, *, zero_allowed: bool = True) -> None:
    """Report numbers that must not be negative."""
    with np.errstate(invalid="ignore"):
        flagged = values < 0.0 if zero_allowed else values <= 0.0
    wanted = "of at least 0" if zero_allowed else "above 0"
    cells.each(flagged, f"{what} is {{}}", f"{some(what)} {wanted}", "Correct the figure.")


def check_correlations(cells: Cells, values: FloatArray, what: str) -> None:
    """Report numbers that are no correlation."""
    with np.errstate(invalid="ignore"):
        flagged = np.abs(values) > 1.0
    cells.each(flagged, f"{what} is {{}}", "a correlation between -1 and 1", "Correct the figure.")
