"""Curves drawn again in plain Python, each as ``-ln P(0, t)`` of a time.

Sources
-------
Monotone convex curve: Hagan, P.S. and West, G., "Interpolation Methods for Curve Construction", Applied
Mathematical Finance 13(2), 2006, section 6; that a bootstrap is repeated until nothing moves: the same paper,
section 2, from memory.
Swap rates: Hull, J.C., Options, Futures, and Other Derivatives, chapter 7: the fixed leg with its nominal is
worth par.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

__all__ = ["Curve", "linear_zero", "log_linear", "monotone_convex", "through_swaps"]

Curve = Callable[[float], float]
"""``-ln P(0, t)``."""


def through_swaps(
    quotes: Sequence[tuple[float, float]],
    payments_a_year: int,
    draw: Callable[[Sequence[float], Sequence[float]], Curve],
) -> Curve:
    """The curve on which every swap is worth par: the last discount factors, again and again."""
    terms = [term for term, _ in quotes]
    zeros = [rate for _, rate in quotes]
    for _ in range(200):
        curve = draw(terms, zeros)
        count = round(terms[-1] * payments_a_year)
        # dimensions: payment, from today
        paid = [math.exp(-curve(n / payments_a_year)) for n in range(count + 1)]
        found = []
        for term, rate in quotes:
            count = round(term * payments_a_year)
            assert count == term * payments_a_year
            before = math.fsum(paid[1:count])
            last = (1 - rate / payments_a_year * before) / (1 + rate / payments_a_year)
            found.append(-math.log(last) / term)
        moved = max(abs(new - old) for new, old in zip(found, zeros, strict=True))
        zeros = found
        if moved < 1e-14:
            break
    else:
        raise AssertionError(f"the swaps are not repriced: the rates still move by {moved}")
    return draw(terms, zeros)


def log_linear(terms: Sequence[float], rates: Sequence[float]) -> Curve:
    """Flat forwards; the last one goes on."""
    times = [0.0, *terms]
    logs = [0.0, *(term * rate for term, rate in zip(terms, rates, strict=True))]

    def exponent(time: float) -> float:
        right = next((n for n in range(1, len(times)) if time <= times[n]), len(times) - 1)
        share = (time - times[right - 1]) / (times[right] - times[right - 1])
        return logs[right - 1] + share * (logs[right] - logs[right - 1])

    return exponent


def linear_zero(terms: Sequence[float], rates: Sequence[float]) -> Curve:
    """Straight lines in the zero rate; the forward at the last term goes on."""

    def exponent(time: float) -> float:
        if time <= terms[0]:
            return rates[0] * time
        if time > terms[-1]:
            slope = (rates[-1] - rates[-2]) / (terms[-1] - terms[-2])
            return rates[-1] * terms[-1] + (rates[-1] + terms[-1] * slope) * (time - terms[-1])
        right = next(n for n in range(1, len(terms)) if time <= terms[n])
        share = (time - terms[right - 1]) / (terms[right] - terms[right - 1])
        return time * (rates[right - 1] + share * (rates[right] - rates[right - 1]))

    return exponent


def monotone_convex(terms: Sequence[float], rates: Sequence[float]) -> Curve:
    """Hagan and West's forwards, integrated by Simpson's rule, which is exact for their parabolas."""
    times = [0.0, *terms]
    logs = [0.0, *(term * rate for term, rate in zip(terms, rates, strict=True))]
    last = len(terms)
    discrete = [math.nan] + [(logs[n] - logs[n - 1]) / (times[n] - times[n - 1]) for n in range(1, last + 1)]
    assert min(discrete[1:]) > 0, "the bounds below are those for positive forwards"
    forward = [0.0] * (last + 1)
    for n in range(1, last):
        before, after = times[n] - times[n - 1], times[n + 1] - times[n]
        forward[n] = (before * discrete[n + 1] + after * discrete[n]) / (before + after)
        forward[n] = min(max(forward[n], 0.0), 2 * min(discrete[n], discrete[n + 1]))
    # The ends come from the forwards next to them as the paper has those, before they are bounded.
    inner = [
        ((times[n] - times[n - 1]) * discrete[n + 1] + (times[n + 1] - times[n]) * discrete[n])
        / (times[n + 1] - times[n - 1])
        for n in (1, last - 1)
    ]
    forward[0] = min(max(1.5 * discrete[1] - 0.5 * inner[0], 0.0), 2 * discrete[1])
    forward[last] = min(max(1.5 * discrete[last] - 0.5 * inner[1], 0.0), 2 * discrete[last])

    def exponent(time: float) -> float:
        if time > times[-1]:
            return logs[-1] + forward[-1] * (time - times[-1])
        n = next(n for n in range(1, last + 1) if time <= times[n])
        excess, turn = shape(forward[n - 1] - discrete[n], forward[n] - discrete[n])
        length = times[n] - times[n - 1]
        at = (time - times[n - 1]) / length
        area = sum(
            (end - start) / 6 * (excess(start) + 4 * excess((start + end) / 2) + excess(end))
            for start, end in ((0.0, min(at, turn)), (min(at, turn), at))
        )
        return logs[n - 1] + discrete[n] * (time - times[n - 1]) + length * area

    return exponent


def shape(left: float, right: float) -> tuple[Callable[[float], float], float]:
    """g(x) of the paper between g(0) and g(1), and where its formula changes."""
    if left == 0 and right == 0:
        return (lambda x: 0.0), 1.0
    if left * right < 0 and 0.5 * abs(left) <= abs(right) <= 2 * abs(left):
        return (lambda x: left * (1 - 4 * x + 3 * x * x) + right * (3 * x * x - 2 * x)), 1.0
    if left * right < 0 and abs(right) > 2 * abs(left):
        turn = (right + 2 * left) / (right - left)
        return (lambda x: left if x <= turn else left + (right - left) * ((x - turn) / (1 - turn)) ** 2), turn
    if left * right < 0:
        turn = 3 * right / (right - left)
        return (lambda x: right + (left - right) * ((turn - x) / turn) ** 2 if x < turn else right), turn
    turn = right / (left + right)
    low = -left * right / (left + right)
    return (
        lambda x: (
            low + (left - low) * ((turn - x) / turn) ** 2
            if x <= turn and turn > 0
            else low + (right - low) * ((x - turn) / (1 - turn)) ** 2
        )
    ), turn
