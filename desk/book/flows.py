"""Flows: amounts due at times, by line."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.book.arrays import FloatArray, IntArray, owned_dates, owned_floats, owned_integers, same_fields

if TYPE_CHECKING:
    from desk.book.inflation import Indexation

__all__ = ["FlowTable", "PricedFlows", "Side"]


class Side(StrEnum):
    """The two sides of the balance sheet."""

    ASSETS = "assets"
    LIABILITIES = "liabilities"


@dataclass(frozen=True, eq=False)
class FlowTable:
    """Flows as the source states them, one row each, in the order of the source.

    Rows on or before the valuation date stay in the table, so that nothing of the source is lost;
    `future` leaves them out.

    Attributes
    ----------
    line_names : tuple of str
        The lines, in order of first appearance.
    line : ndarray of int, shape (n,)
        Each row's line, as an index into `line_names`.
    time : ndarray, shape (n,)
        Years from the valuation date.
    amount : ndarray, shape (n,)
        Amount in the book's currency; positive is paid for liabilities, received for assets.
    beta : ndarray, shape (n,)
        Multiple of the market risk premium added to the discount rate; 0 for risk that diversifies.
    date : ndarray of datetime64[D], shape (n,)
        The date stated; NaT where the source states the year.
    """

    line_names: tuple[str, ...]
    line: IntArray
    time: FloatArray
    amount: FloatArray
    beta: FloatArray
    date: NDArray[np.datetime64]

    def __post_init__(self) -> None:
        """Own the arrays and check that they go together."""
        object.__setattr__(self, "line_names", tuple(self.line_names))
        object.__setattr__(self, "line", owned_integers(self.line))
        for name in ("time", "amount", "beta"):
            object.__setattr__(self, name, owned_floats(getattr(self, name)))
        object.__setattr__(self, "date", owned_dates(self.date))
        shape = self.time.shape
        if len(shape) != 1 or any(
            array.shape != shape for array in (self.line, self.amount, self.beta, self.date)
        ):
            raise ValueError("`line`, `time`, `amount`, `beta` and `date` must be of one length")
        if self.line.size and not 0 <= self.line.min() <= self.line.max() < len(self.line_names):
            raise ValueError("`line` must index `line_names`")
        if not all(np.isfinite(array).all() for array in (self.time, self.amount, self.beta)):
            raise ValueError("`time`, `amount` and `beta` must be finite")

    @classmethod
    def build(
        cls,
        lines: Sequence[str],
        time: ArrayLike,
        amount: ArrayLike,
        *,
        beta: ArrayLike | None = None,
        date: ArrayLike | None = None,
    ) -> FlowTable:
        """A table from one line name a row; `beta` defaults to 0 and `date` to none."""
        names = tuple(dict.fromkeys(lines))
        index = {name: number for number, name in enumerate(names)}
        count = len(lines)
        return cls(
            line_names=names,
            line=owned_integers([index[name] for name in lines]),
            time=owned_floats(time),
            amount=owned_floats(amount),
            beta=np.zeros(count) if beta is None else owned_floats(beta),
            date=np.full(count, np.datetime64("NaT", "D")) if date is None else owned_dates(date),
        )

    @classmethod
    def empty(cls) -> FlowTable:
        """A table with no rows."""
        return cls.build([], [], [])

    def __len__(self) -> int:
        """Number of rows."""
        return int(self.time.size)

    def __eq__(self, other: object) -> bool:
        """Equal when every column is."""
        return same_fields(self, other)

    __hash__ = None  # type: ignore[assignment]

    @property
    def future(self) -> NDArray[np.bool_]:
        """Which rows fall after the valuation date, shape (n,)."""
        return self.time > 0.0


@dataclass(frozen=True, eq=False)
class PricedFlows:
    """The future flows of one side with the spread at which each is discounted.

    A row is worth ``amount · P(0, time) · exp(-spread · time)`` today. A fund or property, which has no
    flows, stands here as one row at its stated duration that is worth its market value on the book's curve;
    a deposit is a row at time 0. Floating interest stands here as the fixed amounts that replicate it on any
    curve (see `desk.valuation.floating`), so that the rows keep their meaning when rates move; what is
    expected to be paid on today's curve stands beside them.

    Attributes
    ----------
    side : Side
    line_names : tuple of str
        The lines, in order: for assets the holdings, then the lines of ready-made flows.
    line : ndarray of int, shape (n,)
        Each row's line.
    time : ndarray, shape (n,)
        Years from the valuation date, at least 0.
    amount : ndarray, shape (n,)
        Amount in the book's currency.
    spread : ndarray, shape (n,)
        Continuously compounded spread over the curve [1/year].
    is_flow : ndarray of bool, shape (n,)
        False for the row that stands for a fund: it is no payment and no period shows it.
    payment : ndarray, shape (n,), optional
        What the row pays, as projected on today's curve [currency]; by default its amount. By line the two
        are worth the same.
    real_amount : ndarray, shape (n,), optional
        The amount in today's money: that of a row that follows no index is its amount [currency].
    index_class : ndarray of int, shape (n,), optional
        How each row's real amount grows, as an index into `indexations`; -1 where it does not. Given where,
        and only where, `real_amount` is. ``amount`` is the real amount times the growth expected today, and
        a payment that grows is its amount.
    indexations : tuple of Indexation
        The classes, each with its lag.
    """

    side: Side
    line_names: tuple[str, ...]
    line: IntArray
    time: FloatArray
    amount: FloatArray
    spread: FloatArray
    is_flow: NDArray[np.bool_]
    payment: FloatArray | None = None
    real_amount: FloatArray | None = None
    index_class: IntArray | None = None
    indexations: tuple[Indexation, ...] = ()

    def __post_init__(self) -> None:
        """Own the arrays and check that they go together."""
        object.__setattr__(self, "line_names", tuple(self.line_names))
        object.__setattr__(self, "line", owned_integers(self.line))
        for name in ("time", "amount", "spread"):
            object.__setattr__(self, name, owned_floats(getattr(self, name)))
        flags = np.array(self.is_flow, dtype=np.bool_)
        flags.flags.writeable = False
        object.__setattr__(self, "is_flow", flags)
        shape = self.time.shape
        if len(shape) != 1 or any(
            array.shape != shape for array in (self.line, self.amount, self.spread, self.is_flow)
        ):
            raise ValueError("`line`, `time`, `amount`, `spread` and `is_flow` must be of one length")
        if self.payment is not None:
            object.__setattr__(self, "payment", owned_floats(self.payment))
            if self.paid.shape != shape:
                raise ValueError("`payment` must be of the length of `amount`")
        self._own_indexation()

    def _own_indexation(self) -> None:
        """Own the arrays of the indexation and check that they go together."""
        object.__setattr__(self, "indexations", tuple(self.indexations))
        if self.real_amount is None or self.index_class is None:
            if self.real_amount is not None or self.index_class is not None:
                raise ValueError("`real_amount` and `index_class` must be given together")
            return
        object.__setattr__(self, "real_amount", owned_floats(self.real_amount))
        object.__setattr__(self, "index_class", owned_integers(self.index_class))
        shape, of_row = self.time.shape, self.index_class
        if self.real_amount.shape != shape or of_row.shape != shape:
            raise ValueError("`real_amount` and `index_class` must be of the length of `amount`")
        if of_row.size and not -1 <= of_row.min() <= of_row.max() < len(self.indexations):
            raise ValueError("`index_class` must index `indexations`, or be -1")

    def __len__(self) -> int:
        """Number of rows."""
        return int(self.time.size)

    @property
    def paid(self) -> FloatArray:
        """What each row pays, as projected on today's curve, shape (n,) [currency]."""
        return self.amount if self.payment is None else self.payment

    @property
    def spread_discounted(self) -> FloatArray:
        """``amount · exp(-spread · time)``, shape (n,): what remains to be discounted on the curve."""
        return np.asarray(self.amount * np.exp(-self.spread * self.time))
