"""Both sides of a book priced once, ready to be shocked as often as one likes.

Spreads are solved here, on the basis as it stands, and kept: a shock moves the curve under them.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from desk.book import Book, Fault, HoldingKind, PricedFlows, Side
from desk.book.arrays import FloatArray, IntArray
from desk.rates.curve import DiscountCurve
from desk.valuation.measures import BASIS_POINT, value_flows
from desk.valuation.priced import priced_flows
from desk.valuation.shock_records import Position

__all__ = ["READY_MADE", "ShockBase", "SideBase", "folded", "position", "shock_base"]

READY_MADE = "flows"
"""The kind of a line that is no holding."""

_VALUED = frozenset({HoldingKind.FUND.value, HoldingKind.PROPERTY.value})
_WITHOUT_SPREAD = _VALUED | {
    HoldingKind.DEPOSIT.value,
    HoldingKind.PAYER_SWAP.value,
    HoldingKind.RECEIVER_SWAP.value,
}


def folded(name: str) -> str:
    """A name as it is compared: without case, blanks once."""
    return " ".join(name.casefold().split())


@dataclass(frozen=True, eq=False)
class SideBase:
    """One side before a shock: n rows of k lines.

    Attributes
    ----------
    flows : PricedFlows
    kinds : tuple of str, length k
        ``flows``, or the kind of holding.
    exponent : ndarray, shape (n,)
        ``(z(time) + spread) · time``.
    value : ndarray, shape (n,)
        Present value [currency].
    curve : DiscountCurve
    """

    flows: PricedFlows
    kinds: tuple[str, ...]
    exponent: FloatArray
    value: FloatArray
    curve: DiscountCurve

    @cached_property
    def _unique(self) -> tuple[FloatArray, IntArray]:
        times, place = np.unique(self.flows.time, return_inverse=True)
        return times, place.astype(np.int64)

    @property
    def times(self) -> FloatArray:
        """The times at which there are rows, rising, shape (u,) [years]."""
        return self._unique[0]

    @property
    def place(self) -> IntArray:
        """Of each row among `times`, shape (n,)."""
        return self._unique[1]

    @cached_property
    def folded_names(self) -> NDArray[np.object_]:
        """Names of the lines as they are compared, shape (k,)."""
        return np.array([folded(name) for name in self.flows.line_names], dtype=object)

    @cached_property
    def kind_names(self) -> NDArray[np.object_]:
        """`kinds`, shape (k,)."""
        return np.array(self.kinds, dtype=object)

    @cached_property
    def is_ready_made(self) -> NDArray[np.bool_]:
        """Which lines are no holdings, shape (k,)."""
        return np.array([kind == READY_MADE for kind in self.kinds], dtype=np.bool_)

    @cached_property
    def has_value(self) -> NDArray[np.bool_]:
        """Which lines are funds or property, shape (k,)."""
        return np.array([kind in _VALUED for kind in self.kinds], dtype=np.bool_)

    @cached_property
    def has_spread(self) -> NDArray[np.bool_]:
        """Which lines are discounted at a spread that can move, shape (k,)."""
        return np.array([kind not in _WITHOUT_SPREAD for kind in self.kinds], dtype=np.bool_)

    @cached_property
    def zero(self) -> FloatArray:
        """Continuous zero rates at `times`, shape (u,) [1/year]."""
        return self.curve.zero(self.times)

    @cached_property
    def value_by_time(self) -> FloatArray:
        """Present values summed by `times`, shape (u,) [currency]."""
        return self.summed(self.value)

    def summed(self, figure: FloatArray) -> FloatArray:
        """A figure of the rows, summed by `times`, shape (u,)."""
        return np.bincount(self.place, weights=figure, minlength=self.times.size).astype(np.float64)

    @cached_property
    def held(self) -> FloatArray:
        """What of each row's amount stands for floating interest of the period that begins there, shape (n,).

        A row k of a floating-rate note holds the fixed amounts that replicate its interest (see
        `desk.valuation.floating`): ``amount_k - payment_k = held_k - f_k P_{k-1} / P_k`` and
        ``held_{k-1} = f_k exp(-s (t_k - t_{k-1}))``, where f is what the interest is earned on. So from the
        last row, which holds nothing, each row gives the one before it.
        """
        flows = self.flows
        held = np.zeros(len(flows))
        kinds = np.array([kind == HoldingKind.FLOATER.value for kind in self.kinds], dtype=np.bool_)
        rows = np.flatnonzero(kinds[flows.line])
        if not rows.size:
            return held
        line = flows.line[rows]
        is_first = np.concatenate(([True], line[1:] != line[:-1]))
        is_last = np.concatenate((line[1:] != line[:-1], [True]))
        last_place = np.flatnonzero(is_last)
        # dimensions: row of a floater; counted from the end of its own line
        from_end = last_place[np.cumsum(is_first) - 1] - np.arange(rows.size)
        order = np.argsort(from_end, kind="stable")
        bounds = np.searchsorted(from_end[order], np.arange(int(from_end.max()) + 2))
        curve_part = self.zero[self.place] * flows.time
        for begin, end in pairwise(bounds.tolist()):
            here = order[begin:end]
            here = rows[here[~is_first[here]]]
            if not here.size:
                continue
            before = here - 1
            earned = held[here] - (flows.amount[here] - flows.paid[here])
            earned = earned * np.exp(curve_part[before] - curve_part[here])
            held[before] = earned * np.exp(-flows.spread[here] * (flows.time[here] - flows.time[before]))
        return held

    @cached_property
    def next_period(self) -> FloatArray:
        """Years from each row to the next of its line; 0 from the last, shape (n,)."""
        length = np.zeros(len(self.flows))
        same = self.flows.line[1:] == self.flows.line[:-1]
        length[:-1][same] = np.diff(self.flows.time)[same]
        return length


@dataclass(frozen=True, eq=False)
class ShockBase:
    """A book priced once.

    Attributes
    ----------
    book : Book
    assets, liabilities : SideBase
    position : Position
        Before any shock.
    faults : tuple of Fault
        Of the pricing, all of the mild kind.
    """

    book: Book
    assets: SideBase
    liabilities: SideBase
    position: Position
    faults: tuple[Fault, ...]


def shock_base(book: Book) -> ShockBase:
    """Price both sides of a book once.

    Parameters
    ----------
    book : Book

    Returns
    -------
    ShockBase

    Raises
    ------
    ValueError
        If the basis gives no curve.
    """
    curve = book.basis.curve
    sides: dict[Side, SideBase] = {}
    faults: list[Fault] = []
    for side in Side:
        priced = priced_flows(book, side)
        faults.extend(priced.faults)
        count = len(priced.flows.line_names)
        holdings = book.holdings if side is Side.ASSETS else ()
        kinds = (*(holding.kind.value for holding in holdings), *[READY_MADE] * (count - len(holdings)))
        rows = value_flows(priced.flows, curve)
        sides[side] = SideBase(priced.flows, kinds, rows.exponent, rows.value, curve)
    assets, liabilities = sides[Side.ASSETS], sides[Side.LIABILITIES]
    before = position((assets.flows.time, assets.value), (liabilities.flows.time, liabilities.value))
    return ShockBase(book, assets, liabilities, before, tuple(faults))


def position(assets: tuple[FloatArray, FloatArray], liabilities: tuple[FloatArray, FloatArray]) -> Position:
    """The balance sheet in six figures.

    Parameters
    ----------
    assets, liabilities : (ndarray, ndarray)
        Times [years] and present values [currency] of the rows of each side.
    """
    # Sums of products, not dot products: the same bits on any number of threads, and no waiting for them.
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        worth, first, fall = [], [], []
        for time, value in (assets, liabilities):
            worth.append(float(value.sum()))
            first.append(float((time * value).sum()))
            fall.append(float(-(np.expm1(-BASIS_POINT * time) * value).sum()))
        return Position(
            assets=worth[0],
            liabilities=worth[1],
            surplus=worth[0] - worth[1],
            funding_ratio=worth[0] / worth[1] if worth[1] else np.nan,
            # D_A - D_L · L / A, written with the sums so that an empty side needs no duration
            duration_gap=(first[0] - first[1]) / worth[0] if worth[0] else np.nan,
            dv01_gap=fall[0] - fall[1],
        )
