"""Amounts that follow a price index: their growth until they are paid, and how it moves with inflation.

The growth of every row is one number, whatever the kind of its indexation; what is assumed of inflation
stands with `desk.rates.inflation`. Rows of collared classes share a table of whole years a class.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.book import Indexation, IndexationKind, Inflation, PricedFlows
from desk.book.arrays import FloatArray, IntArray
from desk.rates.curve import DiscountCurve
from desk.rates.inflation import (
    MOST_YEARS,
    CollaredGrowth,
    collared_growth,
    floored_growth,
    floored_growth_slope,
    growth_factors,
    log_growth,
    unknown_years,
)

__all__ = [
    "CollarTables",
    "IndexClasses",
    "grown",
    "growth_deviation",
    "index_factors",
    "linked_slope",
    "reindexed",
    "row_factors",
]

_CELLS = 60_000  # years times classes of collars that are tabulated at once
_MOST_DEVIATION = 1e100  # sums with it stay finite


@dataclass(frozen=True, eq=False)
class IndexClasses:
    """Indexations as columns, each array shape (c,).

    Attributes
    ----------
    is_rising, is_linked, is_collared : ndarray of bool
    rise : ndarray
        Logarithm of the yearly factor of a rising class.
    lag : ndarray
        [years]
    least : ndarray
        Least growth of a linked class; NaN for none.
    floor, cap : ndarray
        Of a collared class, infinite for none [1/year].
    """

    is_rising: NDArray[np.bool_]
    is_linked: NDArray[np.bool_]
    is_collared: NDArray[np.bool_]
    rise: FloatArray
    lag: FloatArray
    least: FloatArray
    floor: FloatArray
    cap: FloatArray

    @classmethod
    def of(cls, indexations: Sequence[Indexation], *, lag: float | None = None) -> IndexClasses:
        """The columns of a list; `lag` [years] goes before the lags of the list."""
        kinds = [each.kind for each in indexations]
        lags = [each.lag if lag is None else lag for each in indexations]
        return cls(
            is_rising=_is(kinds, IndexationKind.RISING),
            is_linked=_is(kinds, IndexationKind.LINKED),
            is_collared=_is(kinds, IndexationKind.COLLARED),
            rise=np.log1p(np.array([each.rise for each in indexations], dtype=np.float64)),
            lag=np.array(lags, dtype=np.float64),
            least=np.array([each.least for each in indexations], dtype=np.float64),
            floor=np.array(
                [-np.inf if each.floor is None else each.floor for each in indexations], dtype=np.float64
            ),
            cap=np.array(
                [np.inf if each.cap is None else each.cap for each in indexations], dtype=np.float64
            ),
        )


def _is(kinds: Sequence[IndexationKind], kind: IndexationKind) -> NDArray[np.bool_]:
    """Which are of a kind."""
    return np.array([each is kind for each in kinds], dtype=np.bool_)


def index_factors(
    indexation: Indexation,
    time: ArrayLike,
    *,
    inflation: Inflation | None,
    curve: DiscountCurve | None = None,
    lag: float | None = None,
) -> FloatArray:
    """Growth from today to a time that is expected of amounts in today's money.

    Parameters
    ----------
    indexation : Indexation
    time : array_like, shape (n,)
        [years], at least 0.
    inflation : Inflation or None
        None will do for what follows no index.
    curve : DiscountCurve, optional
        Of expected inflation, in the place of ``inflation.curve``. What is known of the months just passed
        stays as `inflation` has it.
    lag : float, optional
        In the place of that of the indexation [years].

    Returns
    -------
    ndarray, shape (n,)

    Raises
    ------
    ValueError
        If the index plays a part and `inflation` is None or gives no curve.
    """
    times = np.asarray(time, dtype=np.float64)
    if inflation is None and indexation.follows_index:
        raise ValueError("`inflation` must be given for amounts that follow an index")
    return row_factors(
        IndexClasses.of((indexation,), lag=lag),
        np.zeros(times.size, dtype=np.int64),
        times.ravel(),
        inflation=inflation,
        curve=curve,
    ).reshape(times.shape)


def reindexed(flows: PricedFlows, *, inflation: Inflation, curve: DiscountCurve) -> PricedFlows:
    """The rows with amounts as they would be on another curve of expected inflation.

    Parameters
    ----------
    flows : PricedFlows
    inflation : Inflation
        Its volatility, and what is known of the months just passed.
    curve : DiscountCurve
        Of expected inflation.

    Returns
    -------
    PricedFlows
        Real amounts, spreads and rows that follow no index stay. On the curve of `inflation` the amounts are
        those of `flows`, to rounding.
    """
    if flows.real_amount is None or flows.index_class is None or not flows.indexations:
        return flows
    classes = IndexClasses.of(flows.indexations)
    follows = classes.is_linked | classes.is_collared
    grows = (flows.index_class >= 0) & follows[flows.index_class]
    rows = slice(None) if grows.all() else np.flatnonzero(grows)
    factor = row_factors(classes, flows.index_class[rows], flows.time[rows], inflation=inflation, curve=curve)
    amount = flows.amount.copy()
    amount[rows] = grown(flows.real_amount[rows], factor)
    payment = flows.payment
    if payment is not None:
        payment = payment.copy()
        payment[rows] = amount[rows]
    return replace(flows, amount=amount, payment=payment)


def grown(amount: FloatArray, factor: FloatArray) -> FloatArray:
    """Amounts in today's money times their growth; infinite where no number is as large."""
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        return np.asarray(amount * factor)


def row_factors(
    classes: IndexClasses,
    of_row: IntArray,
    time: FloatArray,
    *,
    inflation: Inflation | None,
    curve: DiscountCurve | None = None,
) -> FloatArray:
    """Growth of each row from today to its time.

    Parameters
    ----------
    classes : IndexClasses
    of_row : ndarray of int, shape (n,)
        Each row's class; -1 for a row that does not grow.
    time : ndarray, shape (n,)
        [years]
    inflation : Inflation or None
        None where no class follows an index; rows of such a class do not grow then.
    curve : DiscountCurve, optional
        Of expected inflation, in the place of ``inflation.curve``.

    Returns
    -------
    ndarray, shape (n,)
    """
    factor = np.ones(time.size)
    if not classes.lag.size:
        return factor
    grows = of_row >= 0
    for rows in _rows(classes.is_rising, of_row, grows):
        factor[rows] = growth_factors(classes.rise[of_row[rows]] * time[rows])
    if inflation is None:
        return factor
    expected = inflation.curve if curve is None else curve
    for rows in _rows(classes.is_linked, of_row, grows):
        own = of_row[rows]
        lag = classes.lag[own]
        growth = growth_factors(
            log_growth(time[rows], curve=expected, recent_rate=inflation.recent_rate, lag=lag)
        )
        floored = np.flatnonzero(~np.isnan(classes.least[own]))
        if floored.size:
            years = unknown_years(time[rows][floored], lag=lag[floored])
            growth[floored] = floored_growth(
                growth[floored],
                log_sd=growth_deviation(inflation, years),
                least=classes.least[own[floored]],
            )
        factor[rows] = growth
    for rows in _rows(classes.is_collared, of_row, grows):
        for tables in CollarTables.of(classes, of_row[rows], time[rows]):
            part = rows if tables.covers_all else np.arange(time.size)[rows][tables.rows]
            factor[part] = growth_factors(tables.between(tables.grown(inflation, expected).log_factor))
    return factor


def _rows(
    is_kind: NDArray[np.bool_], of_row: IntArray, grows: NDArray[np.bool_]
) -> Iterator[slice | NDArray[np.intp]]:
    """The rows whose class is of a kind, if there are any; a slice where all are, which is quicker."""
    if not is_kind.any():
        return
    if is_kind.all() and grows.all():
        yield slice(None)
        return
    rows = np.flatnonzero(grows & is_kind[of_row])
    if rows.size:
        yield rows


def growth_deviation(inflation: Inflation, years: FloatArray) -> FloatArray:
    """Standard deviation of the growth of the index over so many independent years, shape of `years`."""
    with np.errstate(over="ignore"):
        return np.asarray(np.minimum(inflation.volatility * np.sqrt(years), _MOST_DEVIATION))


@dataclass(frozen=True, eq=False)
class CollarTables:
    """Rows of some collars, and where in a table of whole years each stands.

    Attributes
    ----------
    rows : ndarray of int, shape (m,)
        Among those given.
    covers_all : bool
        Whether these are all the rows given, in their order.
    lag, floor, cap : ndarray, shape (c,)
        Of each collar.
    years : int
        Of the table.
    cell : ndarray of int, shape (m,)
        ``collar · (years + 1) + whole years``.
    part : ndarray, shape (m,)
        Of a year after those; above 1 where the table has come to its end.
    """

    rows: NDArray[np.intp]
    covers_all: bool
    lag: FloatArray
    floor: FloatArray
    cap: FloatArray
    years: int
    cell: IntArray
    part: FloatArray

    @classmethod
    def of(cls, classes: IndexClasses, of_row: IntArray, time: FloatArray) -> Iterator[CollarTables]:
        """The rows in portions, so that a table stays small however many collars there are."""
        # dimensions: class; lag, floor and cap
        terms = np.stack((classes.lag, classes.floor, classes.cap), axis=1)
        collars, of_class = np.unique(terms, axis=0, return_inverse=True)
        of_class = of_class.reshape(-1)
        used = np.unique(of_class[np.bincount(of_row, minlength=of_class.size) > 0])
        number = np.zeros(collars.shape[0], dtype=np.int64)
        number[used] = np.arange(used.size)
        collar = number[of_class[of_row]]
        years = int(np.clip(np.ceil(time.max(initial=1.0)), 1, MOST_YEARS))
        portion = max(_CELLS // (years + 1), 1)
        whole = np.minimum(time, years - 1.0).astype(np.int64)
        for first in range(0, used.size, portion):
            own = collars[used[first : first + portion]]
            covers_all = used.size <= portion
            rows = np.flatnonzero((collar >= first) & (collar < first + portion)) if not covers_all else None
            at = np.arange(time.size) if rows is None else rows
            yield cls(
                rows=at,
                covers_all=covers_all,
                lag=own[:, 0],
                floor=own[:, 1],
                cap=own[:, 2],
                years=years,
                cell=(collar[at] - first) * (years + 1) + whole[at],
                part=time[at] - whole[at],
            )

    @property
    def ends(self) -> FloatArray:
        """Years of the index that lie ahead at the end of each whole year, shape (c, years + 1)."""
        return unknown_years(np.arange(self.years + 1.0), lag=self.lag[:, None])

    def grown(
        self, inflation: Inflation, curve: DiscountCurve, *, moves: FloatArray | None = None
    ) -> CollaredGrowth:
        """Growth to the end of whole years on a curve of expected inflation.

        Parameters
        ----------
        inflation : Inflation
            Its volatility, and what is known of the months just passed.
        curve : DiscountCurve
        moves : ndarray, shape (g, c, years + 1), optional
            Added to the logarithm of the growth of the index to `ends`.

        Returns
        -------
        CollaredGrowth
            Of shape (c, …), or (g, c, …) with moves.
        """
        ahead = self.ends
        known = inflation.recent_rate * np.minimum(np.arange(self.years + 1.0), self.lag[:, None])
        log_index = known + curve.zero(ahead) * ahead
        return collared_growth(
            log_index if moves is None else log_index + moves,
            sd=growth_deviation(inflation, np.diff(ahead, axis=-1)),
            floor=self.floor[:, None],
            cap=self.cap[:, None],
        )

    def between(self, table: FloatArray) -> FloatArray:
        """A table, shape (c, years + 1), at the rows: straight between whole years, and beyond them."""
        flat = table.ravel()
        low = flat[self.cell]
        return np.asarray(low + self.part * (flat[self.cell + 1] - low))


def linked_slope(growth: FloatArray, *, log_sd: FloatArray, least: FloatArray) -> FloatArray:
    """Derivative of the logarithm of floored growth by that of the growth of the index.

    Parameters
    ----------
    growth : ndarray, shape (n,)
        Expected of the index.
    log_sd : ndarray, shape (n,)
        Standard deviation of its logarithm.
    least : ndarray, shape (n,)
        Least growth.

    Returns
    -------
    ndarray, shape (n,)
    """
    slope = floored_growth_slope(growth, log_sd=log_sd, least=least)
    return np.asarray(slope * growth / floored_growth(growth, log_sd=log_sd, least=least))
