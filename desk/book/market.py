"""Market data beside the curve: quoted volatilities, a history of yields, a set of scenarios from outside."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

from desk.book.arrays import FloatArray, owned_dates, owned_floats, same_fields

__all__ = ["CalibrationSource", "Instrument", "ScenarioSet", "Volatilities", "VolatilityKind", "YieldHistory"]


class CalibrationSource(StrEnum):
    """The data of the book that a model is fitted to."""

    HISTORY = "history"
    """Of short rates."""
    VOLATILITIES = "volatilities"
    """Quoted, of caps, floors and swaptions, with today's curve."""
    YIELDS = "yields"
    """A history of zero rates at several terms."""


class Instrument(StrEnum):
    """What a volatility is quoted for."""

    CAP = "cap"
    FLOOR = "floor"
    PAYER_SWAPTION = "payer swaption"
    RECEIVER_SWAPTION = "receiver swaption"


class VolatilityKind(StrEnum):
    """The law of the underlying rate that a quoted volatility belongs to."""

    NORMAL = "normal"
    LOGNORMAL = "lognormal"


@dataclass(frozen=True, eq=False)
class Volatilities:
    """Quoted volatilities, each array shape (m,).

    Attributes
    ----------
    instrument : tuple of Instrument
    expiry : ndarray
        Of a swaption; for a cap or floor the end of its last period [years].
    length : ndarray
        Of the swap beneath a swaption [years]; NaN for caps and floors.
    strike : ndarray
        In the compounding of the payments [1/year]; NaN for at the money.
    volatility : ndarray
        [1/year per root year], or per root year where lognormal.
    kind : tuple of VolatilityKind
    shift : ndarray
        Added to rate and strike of a lognormal quote [1/year].
    frequency : ndarray
        Payments a year of the swap or the cap.
    """

    instrument: tuple[Instrument, ...]
    expiry: FloatArray
    length: FloatArray
    strike: FloatArray
    volatility: FloatArray
    kind: tuple[VolatilityKind, ...]
    shift: FloatArray
    frequency: FloatArray

    def __post_init__(self) -> None:
        """Own the arrays and check that they go together."""
        for name in ("expiry", "length", "strike", "volatility", "shift", "frequency"):
            object.__setattr__(self, name, owned_floats(getattr(self, name)))
            if getattr(self, name).shape != (len(self.instrument),):
                raise ValueError(f"`{name}` must hold one number an instrument")
        if len(self.kind) != len(self.instrument):
            raise ValueError("`kind` must hold one entry an instrument")

    def __eq__(self, other: object) -> bool:
        """Equal when every column is."""
        return same_fields(self, other)

    __hash__ = None  # type: ignore[assignment]


@dataclass(frozen=True, eq=False)
class YieldHistory:
    """A history of zero rates at several terms.

    Attributes
    ----------
    date : ndarray of datetime64[D], shape (n,)
    terms : ndarray, shape (m,)
        [years]
    rates : ndarray, shape (n, m)
        Continuously compounded [1/year]; NaN where there is no quote.
    """

    date: NDArray[np.datetime64]
    terms: FloatArray
    rates: FloatArray

    def __post_init__(self) -> None:
        """Own the arrays and check that they go together."""
        object.__setattr__(self, "date", owned_dates(self.date))
        object.__setattr__(self, "terms", owned_floats(self.terms))
        object.__setattr__(self, "rates", owned_floats(self.rates))
        if self.rates.shape != (self.date.size, self.terms.size):
            raise ValueError("`rates` must hold one row a date and one column a term")

    def __eq__(self, other: object) -> bool:
        """Equal when every column is."""
        return same_fields(self, other)

    __hash__ = None  # type: ignore[assignment]


@dataclass(frozen=True, eq=False)
class ScenarioSet:
    """Paths of the short rate from outside.

    Attributes
    ----------
    node : ndarray, shape (n,)
        [years], rising and positive.
    rate : ndarray, shape (m, n)
        One row a path: the continuously compounded mean of the short rate from the node before (or from
        today) to the node [1/year].
    """

    node: FloatArray
    rate: FloatArray

    def __post_init__(self) -> None:
        """Own the arrays and check that they go together."""
        object.__setattr__(self, "node", owned_floats(self.node))
        object.__setattr__(self, "rate", owned_floats(self.rate))
        if self.node.ndim != 1 or self.rate.ndim != 2 or self.rate.shape[1] != self.node.size:
            raise ValueError("`rate` must hold one row a path and one column a node")
        if self.node.size and not (self.node[0] > 0.0 and (np.diff(self.node) > 0.0).all()):
            raise ValueError("`node` must be positive and rising")

    def __eq__(self, other: object) -> bool:
        """Equal when both arrays are."""
        return same_fields(self, other)

    __hash__ = None  # type: ignore[assignment]
