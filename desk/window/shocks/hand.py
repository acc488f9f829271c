"""What the hand can move, and the shock that its positions come to."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from desk.book import Book, Move, MoveKind, Shock
from desk.valuation.what_if import curve_moves
from desk.window.parts.numbers import MINUS, exact
from desk.window.shocks.wording import size_from, targets_of
from desk.window.what_if import WHAT_IF

__all__ = ["HANDLES", "TERMS", "Handle", "handles_of", "places_words", "shock_of"]

TERMS = (1.0, 2.0, 5.0, 10.0, 20.0, 30.0)
"""Whose rates have a handle each [years]."""


@dataclass(frozen=True)
class Handle:
    """Something to pull.

    Attributes
    ----------
    key, label, unit : str
    low, high : float
        Of the slider, in the unit.
    most : float
        What may be typed goes from the opposite of it to it, in the unit; of a share no lower than -100 %.
    explanation : str
        One sentence.
    group : str
        The heading it stands under.
    term : float or None
        Whose rate it moves.
    """

    key: str
    label: str
    unit: str
    low: float
    high: float
    most: float
    explanation: str
    group: str
    term: float | None = None

    @property
    def least(self) -> float:
        """The least that may be typed."""
        return -100.0 if self.unit == "%" else -self.most


_SHAPE, _TERMS, _OTHER = "The curve by its shape", "The curve by its terms", "Other markets"
HANDLES = (
    Handle("level", "Level", "bp", -300, 300, 2_000, "All rates by one size.", _SHAPE),
    Handle(
        "slope",
        "Slope",
        "bp",
        -200,
        200,
        2_000,
        "Short rates down and rates from 20 years on up by it, about 10 years.",
        _SHAPE,
    ),
    Handle(
        "bend",
        "Bend",
        "bp",
        -150,
        150,
        2_000,
        "The rate at 10 years up by it, both ends of the curve down by it.",
        _SHAPE,
    ),
    *(
        Handle(
            f"term_{term:g}",
            "1 year" if term == 1.0 else f"{term:g} years",
            "bp",
            -300,
            300,
            2_000,
            f"The zero rate at {term:g} years, joined by lines to those beside it.",
            _TERMS,
            term,
        )
        for term in TERMS
    ),
    Handle("inflation", "Inflation", "bp", -200, 200, 2_000, "All expected inflation by one size.", _OTHER),
    Handle("spread", "Credit spreads", "bp", -100, 400, 2_000, "Of all holdings that have one.", _OTHER),
    Handle("fund", "Funds", "%", -60, 60, 500, "The value of all funds; a fall is below 0.", _OTHER),
    Handle(
        "property", "Property", "%", -60, 60, 500, "The value of all property; a fall is below 0.", _OTHER
    ),
)
"""Every handle, in the order they stand in."""


def handles_of(book: Book) -> frozenset[str]:
    """The handles that move something in a book."""
    found = {handle.key for handle in HANDLES if handle.group != _OTHER}
    if book.basis.inflation is not None:
        found.add("inflation")
    without = {"fund", "property", "payer swap", "receiver swap"}
    if set(targets_of(book, MoveKind.SPREAD)) - without:
        found.add("spread")
    found |= {"fund", "property"} & set(targets_of(book, MoveKind.VALUE))
    return frozenset(found)


def places_words(places: Mapping[str, float]) -> str:
    """Where the handles stand, in a line; empty where all stand at nothing."""
    moved = [(handle, places.get(handle.key, 0.0)) for handle in HANDLES]
    return ", ".join(
        f"{handle.label} {'+' if value > 0.0 else ''}{exact(value).replace('-', MINUS)} {handle.unit}"
        for handle, value in moved
        if value
    )


def shock_of(places: Mapping[str, float], *, name: str = WHAT_IF) -> Shock:
    """The shock that the handles come to; `places` are in their units, 0 where one is missing."""

    def at(key: str) -> float:
        return float(places.get(key, 0.0))

    moves = list(
        curve_moves(
            level=at("level"),
            slope=at("slope"),
            bend=at("bend"),
            by_term={term: at(f"term_{term:g}") for term in TERMS},
        )
    )
    for key, kind, target in (
        ("inflation", MoveKind.INFLATION, ""),
        ("spread", MoveKind.SPREAD, ""),
        ("fund", MoveKind.VALUE, "fund"),
        ("property", MoveKind.VALUE, "property"),
    ):
        if at(key):
            moves.append(Move(kind, size_from(kind, at(key)), target=target))
    return Shock(name, tuple(moves))
