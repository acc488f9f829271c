"""The terms of a line in words, and what is wrong with them."""

from __future__ import annotations

from desk.book import Indexation, IndexationKind, LineTerms
from desk.window.parts import numbers
from desk.window.parts.fields import Choice

__all__ = ["INDEXATIONS", "collar_fault", "discount_words", "indexation_words", "rate_words"]

INDEXATIONS = (
    Choice(IndexationKind.FIXED, "Fixed", "The amounts are those that will be paid."),
    Choice(
        IndexationKind.LINKED,
        "Follows prices",
        "The amounts are in today's money and grow with expected inflation, up and down.",
    ),
    Choice(
        IndexationKind.COLLARED,
        "Follows prices within limits",
        "Each year's rise follows inflation, but no less than the floor and no more than the cap.",
    ),
    Choice(
        IndexationKind.RISING,
        "Rises at a fixed rate",
        "The amounts are in today's money and grow at one rate each year.",
    ),
)


def rate_words(value: float) -> str:
    """A rate with the figures it has: ``2.5 %``."""
    text = numbers.exact(value, percent=True).replace("-", numbers.MINUS, 1)
    return f"{text}\N{NARROW NO-BREAK SPACE}%"


def indexation_words(indexation: Indexation) -> str:
    """How the amounts of a line grow, in a few words; nothing where they do not."""
    if indexation.kind is IndexationKind.FIXED:
        return ""
    if indexation.kind is IndexationKind.LINKED:
        return "prices"
    if indexation.kind is IndexationKind.RISING:
        return f"{rate_words(indexation.rise)} a year"
    floor, cap = indexation.floor, indexation.cap
    if floor is not None and cap is not None:
        return f"prices, {rate_words(floor)} to {rate_words(cap)}"
    if floor is not None:
        return f"prices, at least {rate_words(floor)}"
    return "prices" if cap is None else f"prices, at most {rate_words(cap)}"


def discount_words(terms: LineTerms) -> str:
    """What a line is discounted at in its own right; nothing where the basis says it."""
    if terms.rate is not None:
        return rate_words(terms.rate)
    if terms.spread is not None:
        sign = "+" if terms.spread >= 0.0 else numbers.MINUS
        return f"curve {sign} {rate_words(abs(terms.spread))}"
    return ""


def collar_fault(floor: float | None, cap: float | None) -> str:
    """What is wrong with a floor and a cap, in one sentence; empty where nothing is."""
    if floor is None or cap is None or cap >= floor:
        return ""
    return (
        f"The cap of {rate_words(cap)} is below the floor of {rate_words(floor)}: raise the cap or lower the "
        "floor."
    )
