"""Expected inflation, and how lines follow it."""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum
from functools import cached_property

from desk.book.arrays import FloatArray, owned_floats, same_fields
from desk.book.flows import Side
from desk.rates.compounding import Compounding, to_continuous
from desk.rates.curve import Curve, Interpolation

__all__ = ["Indexation", "IndexationKind", "Inflation", "LineTerms"]


class IndexationKind(StrEnum):
    """How the amounts of a line, stated in today's money, grow until they are paid."""

    FIXED = "fixed"
    """Not at all: the amounts are those that will be paid."""
    LINKED = "linked"
    """With the price index, up and down."""
    COLLARED = "collared"
    """Each year with the index, but no less than a floor and no more than a cap."""
    RISING = "rising"
    """By a fixed rate each year."""


@dataclass(frozen=True)
class Indexation:
    """The growth of a line's amounts.

    Attributes
    ----------
    kind : IndexationKind
    rise : float
        Of a rising line, a year [1/year].
    floor, cap : float or None
        Of a collared line, on each year's increase; None for none [1/year].
    lag : float
        How long the index takes to count, of a linked or collared line [years].
    least : float or None
        Of a linked line, the least growth from today to the payment, as a factor; None for none. A bond that
        repays no less than its nominal has the inverse of its index ratio here.
    """

    kind: IndexationKind = IndexationKind.FIXED
    rise: float = 0.0
    floor: float | None = None
    cap: float | None = None
    lag: float = 0.0
    least: float | None = None

    def __post_init__(self) -> None:
        """Check that the terms go together."""
        if self.rise <= -1.0:
            raise ValueError("`rise` must be above -1")
        if self.floor is not None and self.cap is not None and self.cap < self.floor:
            raise ValueError("`cap` must be at least `floor`")
        if not 0.0 <= self.lag < math.inf:
            raise ValueError("`lag` must be finite and at least 0")
        if self.least is not None and not 0.0 <= self.least < math.inf:
            raise ValueError("`least` must be finite and at least 0")

    @property
    def follows_index(self) -> bool:
        """Whether expected inflation plays a part."""
        return self.kind in (IndexationKind.LINKED, IndexationKind.COLLARED)


@dataclass(frozen=True)
class LineTerms:
    """What holds for one line of flows and not for the others of its side.

    Attributes
    ----------
    side : Side
    line : str
    indexation : Indexation
    spread : float or None
        Over the curve, in the place of what the basis adds to it; the line's beta counts on top [1/year].
    rate : float or None
        A flat annual effective rate in the place of curve and spread [1/year].
    """

    side: Side
    line: str
    indexation: Indexation = Indexation()
    spread: float | None = None
    rate: float | None = None

    def __post_init__(self) -> None:
        """Check that the terms go together."""
        if self.spread is not None and self.rate is not None:
            raise ValueError(f"`spread` must not be given beside `rate` for {self.line!r}")
        if self.rate is not None and self.rate <= -1.0:
            raise ValueError(f"`rate` must be above -1 for {self.line!r}")


@dataclass(frozen=True, eq=False)
class Inflation:
    """Expected inflation.

    Attributes
    ----------
    terms : ndarray, shape (q,)
        [years], rising and positive.
    rates : ndarray, shape (q,)
        Zero-coupon inflation swap rates or break-even rates: the index expected at a term T is today's times
        ``(1 + rate)^T`` [1/year].
    interpolation : Interpolation
        Of the continuous rates.
    volatility : float
        Standard deviation of one year's inflation, the same for every year [1/year].
    recent : float or None
        Inflation over the months just passed, of which a lagged index has yet to take notice [1/year,
        annual]; None for the start of the curve.
    """

    terms: FloatArray
    rates: FloatArray
    interpolation: Interpolation = Interpolation.LOG_LINEAR
    volatility: float = 0.0
    recent: float | None = None

    def __post_init__(self) -> None:
        """Own the quotes."""
        object.__setattr__(self, "terms", owned_floats(self.terms))
        object.__setattr__(self, "rates", owned_floats(self.rates))
        if not 0.0 <= self.volatility < math.inf:
            raise ValueError("`volatility` must be finite and at least 0")
        if self.recent is not None and not -1.0 < self.recent < math.inf:
            raise ValueError("`recent` must be finite and above -1")

    def __eq__(self, other: object) -> bool:
        """Equal when every item is."""
        return same_fields(self, other)

    __hash__ = None  # type: ignore[assignment]

    @cached_property
    def curve(self) -> Curve:
        """The curve whose continuous zero rate at a term is the expected inflation until then.

        The index expected at t is today's over ``curve.discount(t)``.

        Raises
        ------
        ValueError
            If the quotes give no curve.
        """
        return Curve(self.terms, to_continuous(self.rates, Compounding.ANNUAL), self.interpolation)

    @cached_property
    def recent_rate(self) -> float:
        """Inflation over the months just passed, continuously compounded [1/year].

        Raises
        ------
        ValueError
            If it is not stated and the quotes give no curve.
        """
        return float(self.curve.zero(0.0)) if self.recent is None else math.log1p(self.recent)
