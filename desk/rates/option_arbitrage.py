"""Quotes of options that cannot hold together, for money could be made of nothing.

References
----------
Merton, R.C. (1973), Theory of rational option pricing, Bell Journal of Economics and Management Science 4,
theorems 1 to 4: an option is worth no less at a strike that pays more, its price is convex in the strike, and
call and put of one strike differ by the forward.
"""

from __future__ import annotations

from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from desk.rates.option_instruments import OptionQuotes

__all__ = ["arbitrage_faults"]

FloatArray = NDArray[np.float64]

_SLACK = 1e-9
# Quotes are rounded, and a normal and a lognormal one of the same price are rounded apart.
_ROUNDING = 0.01


def arbitrage_faults(quotes: OptionQuotes, frequency: FloatArray) -> list[tuple[int, str]]:
    """Quotes that contradict others.

    Caps worth less though they run longer; options worth less at a strike that pays more; a price that is not
    convex in the strike; one instrument, or a cap and a floor or a payer and a receiver of the same terms, at
    two volatilities.

    Parameters
    ----------
    quotes : OptionQuotes
    frequency : ndarray, shape (m,)
        Payments a year.

    Returns
    -------
    list of (int, str)
        Row, numbered from 0, and what is wrong with it in one sentence.
    """
    prices = quotes.prices(quotes.volatility)
    by_term: dict[tuple[object, ...], list[int]] = {}
    by_strike: dict[tuple[object, ...], list[int]] = {}
    for row, name in enumerate(quotes.instrument):
        strike, often = round(float(quotes.strike[row]), 12), float(frequency[row])
        length = float(quotes.length[row]) if quotes.swaption[row] else 0.0
        if not quotes.swaption[row]:
            by_term.setdefault((name, strike, often), []).append(row)
        key = (bool(quotes.swaption[row]), float(quotes.expiry[row]), length, often)
        by_strike.setdefault(key, []).append(row)
    faults = _falling_with_term(quotes, prices, list(by_term.values()))
    for rows in by_strike.values():
        twins = _twins(quotes, prices, rows)
        faults += twins
        if not twins:
            for call in (True, False):
                faults += _in_strike(quotes, prices, [row for row in rows if quotes.call[row] == call])
    return sorted(faults)


def _falling_with_term(
    quotes: OptionQuotes, prices: FloatArray, groups: list[list[int]]
) -> list[tuple[int, str]]:
    """Caps and floors of one strike that are worth less though they run longer."""
    faults = []
    for rows in groups:
        ordered = sorted(rows, key=lambda row: (float(quotes.expiry[row]), float(prices[row])))
        for before, row in pairwise(ordered):
            if quotes.expiry[row] > quotes.expiry[before] and _less(prices[row], prices[before]):
                text = (
                    f"at its volatility this {quotes.instrument[row]} to {quotes.expiry[row]:g} years is "
                    f"worth {1e4 * prices[row]:.2f} basis points, less than the one to "
                    f"{quotes.expiry[before]:g} years in quote {before + 1} "
                    f"({1e4 * prices[before]:.2f}), though it insures more: one of the two is wrong."
                )
                faults.append((row, text))
    return faults


def _twins(quotes: OptionQuotes, prices: FloatArray, rows: list[int]) -> list[tuple[int, str]]:
    """Quotes of the same terms and strike that differ in what they say of volatility."""
    faults = []
    first: dict[float, int] = {}
    forward = np.sum(quotes.weight * (quotes.forward - quotes.strike[:, None]), axis=1)
    # By the parity of call and put: what each is worth as a call.
    calls = prices + np.where(quotes.call, 0.0, forward)
    for row in rows:
        before = first.setdefault(round(float(quotes.strike[row]), 12), row)
        least = min(float(prices[row]), float(prices[before]))
        if before != row and abs(calls[row] - calls[before]) > _ROUNDING * least + _SLACK:
            other = quotes.instrument[before]
            text = (
                f"it is quote {before + 1} over again, at another volatility: one of the two is wrong."
                if quotes.instrument[row] == other
                else f"it has the terms and the strike of the {other} of quote {before + 1}, so that the two "
                "must have one volatility, and they have not: one of them is wrong."
            )
            faults.append((row, text))
    return faults


def _in_strike(quotes: OptionQuotes, prices: FloatArray, rows: list[int]) -> list[tuple[int, str]]:
    """Options of the same terms whose prices fall where they must rise, or bend the wrong way."""
    faults = []
    place = np.where(quotes.call, -1.0, 1.0) * quotes.strike
    ordered = sorted(rows, key=lambda row: float(place[row]))
    for before, row in pairwise(ordered):
        if place[row] > place[before] and _less(prices[row], prices[before]):
            text = (
                f"at its strike of {100.0 * quotes.strike[row]:.4g} % this "
                f"{quotes.instrument[row]} pays more than that of quote {before + 1} at "
                f"{100.0 * quotes.strike[before]:.4g} %, yet by its volatility it is worth less: "
                "one of the two is wrong."
            )
            faults.append((row, text))
    if faults:
        return faults
    for before, row, after in zip(ordered, ordered[1:], ordered[2:], strict=False):
        width = float(place[after] - place[before])
        if not place[before] < place[row] < place[after]:
            continue
        share = float(place[row] - place[before]) / width
        between = (1.0 - share) * float(prices[before]) + share * float(prices[after])
        if _less(between, prices[row]):
            text = (
                f"its price is above the straight line between those of quotes {before + 1} and {after + 1}, "
                "whose strikes lie to either side, so that money could be made of nothing: its volatility is "
                "too high or one of theirs too low."
            )
            faults.append((row, text))
    return faults


def _less(one: float, other: float) -> bool:
    """Whether a price is below another by more than rounding."""
    return one < other - _SLACK * other
