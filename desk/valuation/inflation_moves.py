"""How the value of one side follows expected inflation, nominal rates unchanged."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from desk.book import Inflation, PricedFlows
from desk.book.arrays import FloatArray, IntArray
from desk.rates.inflation import floored_growth, growth_factors, log_growth, unknown_years
from desk.valuation.indexing import CollarTables, IndexClasses, growth_deviation, linked_slope
from desk.valuation.measures import BASIS_POINT, KEY_TERMS, key_rate_weights
from desk.valuation.sums import blocks

__all__ = ["InflationMoves", "inflation_moves"]

_POWERS = 6  # of a series whose next term is below rounding while a year's part moves by `_SMALL` at most
_SMALL = 1e-2


@dataclass(frozen=True, eq=False)
class InflationMoves:
    """Moves of one side's value with expected inflation.

    Attributes
    ----------
    slope : ndarray, shape (k,)
        ``dPV/di`` for a triangular move of the continuous expected inflation rates at each key [currency].
    dv01 : ndarray, shape (k,)
        Rise in present value for +1 basis point at each key, revalued exactly [currency].
    line_dv01 : ndarray, shape (l,)
        Of each line, for +1 basis point on all of them [currency].
    """

    slope: FloatArray
    dv01: FloatArray
    line_dv01: FloatArray


def inflation_moves(flows: PricedFlows, value: FloatArray, inflation: Inflation) -> InflationMoves:
    """Moves of the value of one side for each of `KEY_TERMS`, and by line for all together.

    Parameters
    ----------
    flows : PricedFlows
    value : ndarray, shape (n,)
        Present value of each row [currency].
    inflation : Inflation

    Returns
    -------
    InflationMoves
        Slopes are exact derivatives, of floors and caps too; the rest revalues. What is known of the months
        just passed stays, so that a lagged row does not move in its first months.

    Raises
    ------
    ValueError
        If `inflation` gives no curve.
    """
    moves = InflationMoves(
        np.zeros(len(KEY_TERMS)), np.zeros(len(KEY_TERMS)), np.zeros(len(flows.line_names))
    )
    if flows.index_class is None or not flows.indexations:
        return moves
    classes = IndexClasses.of(flows.indexations)
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        for is_kind, add in ((classes.is_linked, _add_linked), (classes.is_collared, _add_collared)):
            if not is_kind.any():
                continue
            own = (flows.index_class >= 0) & is_kind[flows.index_class]
            rows = slice(None) if own.all() else np.flatnonzero(own)
            add(
                moves,
                _Rows(classes, flows.index_class[rows], flows.time[rows], value[rows], flows.line[rows]),
                inflation,
            )
    return moves


@dataclass(frozen=True, eq=False)
class _Rows:
    """Rows of one kind, each array shape (m,)."""

    classes: IndexClasses
    of_row: IntArray
    time: FloatArray
    value: FloatArray
    line: IntArray

    def add_by_line(self, moves: InflationMoves, change: FloatArray, line: IntArray) -> None:
        """Add changes in value to those of the lines."""
        moves.line_dv01[:] += np.bincount(line, weights=change, minlength=moves.line_dv01.size)


def _add_linked(moves: InflationMoves, rows: _Rows, inflation: Inflation) -> None:
    """Add the rows that follow the index up and down, a block at a time."""
    keys = len(KEY_TERMS)
    # dimensions: slope by lower and upper key, rise by lower and upper key; key
    sums = np.zeros((4, keys))
    for part in blocks(rows.time.size):
        own, value = rows.of_row[part], rows.value[part]
        years = unknown_years(rows.time[part], lag=rows.classes.lag[own])
        slope, change = _linked_response(rows, part, years, inflation)
        lower, share = key_rate_weights(years)
        above = years * share
        below = years - above
        worth = value if slope is None else value * slope
        sums += [
            np.bincount(lower, weights=weights, minlength=keys)
            for weights in (
                worth * below,
                worth * above,
                value * change(BASIS_POINT * below),
                value * change(BASIS_POINT * above),
            )
        ]
        rows.add_by_line(moves, value * change(BASIS_POINT * years), rows.line[part])
    slope_sums, rise = sums[0::2] + np.roll(sums[1::2], 1, axis=1)
    moves.slope[:] += slope_sums
    moves.dv01[:] += rise


def _linked_response(
    rows: _Rows, part: slice, years: FloatArray, inflation: Inflation
) -> tuple[FloatArray | None, Callable[[FloatArray], FloatArray]]:
    """How the growth of rows answers a move of the logarithm of the index.

    Returns
    -------
    slope : ndarray, shape (m,), or None
        Derivative of its logarithm; None where it is 1.
    change : callable
        The relative change of the growth for a move, shape (m,).
    """
    own = rows.of_row[part]
    least = rows.classes.least[own]
    floored = np.flatnonzero(~np.isnan(least))
    if not floored.size:
        return None, np.expm1
    lag = rows.classes.lag[own[floored]]
    log = log_growth(
        rows.time[part][floored], curve=inflation.curve, recent_rate=inflation.recent_rate, lag=lag
    )
    log_sd = growth_deviation(inflation, years[floored])

    def grown(move: FloatArray | float) -> FloatArray:
        return floored_growth(growth_factors(log + move), log_sd=log_sd, least=least[floored])

    slope = np.ones(years.size)
    slope[floored] = linked_slope(growth_factors(log), log_sd=log_sd, least=least[floored])
    base = grown(0.0)

    def change(move: FloatArray) -> FloatArray:
        found: FloatArray = np.expm1(move)
        found[floored] = (grown(move[floored]) - base) / base
        return found

    return slope, change


def _add_collared(moves: InflationMoves, rows: _Rows, inflation: Inflation) -> None:
    """Add the rows that follow the index between a floor and a cap."""
    for tables in CollarTables.of(rows.classes, rows.of_row, rows.time):
        value, line = rows.value[tables.rows], rows.line[tables.rows]
        # dimensions: key, collar, whole years; the last key is all of them together
        reach = _reach(tables.ends)
        base = tables.grown(inflation, inflation.curve)
        moved = tables.grown(inflation, inflation.curve, moves=BASIS_POINT * reach)
        log_move = moved.log_factor - base.log_factor
        slope = np.zeros(reach.shape)
        np.cumsum(base.log_slope * np.diff(reach, axis=-1), axis=-1, out=slope[..., 1:])
        rows.add_by_line(moves, value * np.expm1(tables.between(log_move[-1])), line)
        _add_cells(moves, tables, value, slope[:-1], log_move[:-1])


def _reach(years: FloatArray) -> FloatArray:
    """Move of the logarithm of the index for a unit move of each key, and of all, shape (k + 1, c, y)."""
    lower, share = key_rate_weights(years)
    reach = np.zeros((len(KEY_TERMS) + 1, *years.shape))
    np.put_along_axis(reach, lower[None], (years * (1.0 - share))[None], axis=0)
    above = np.take_along_axis(reach, lower[None] + 1, axis=0) + (years * share)[None]
    np.put_along_axis(reach, lower[None] + 1, above, axis=0)
    reach[-1] = years
    return reach


def _add_cells(
    moves: InflationMoves, tables: CollarTables, value: FloatArray, slope: FloatArray, log_move: FloatArray
) -> None:
    """Add the moves of the keys, shape (k, c, y + 1), by sums over the rows of each year.

    Between whole years the logarithm of a factor is straight, ``A + B · part``, so the sum of
    ``value · (exp(A + B · part) - 1)`` over a year's rows needs sums of ``value · part^p`` alone.
    """
    keys = len(KEY_TERMS)
    flat_slope, flat_move = slope.reshape(keys, -1), log_move.reshape(keys, -1)
    cells = flat_move.shape[1]
    rise_slope = np.diff(flat_slope, axis=1, append=0.0)
    rise_move = np.diff(flat_move, axis=1, append=0.0)
    used = np.zeros(cells, dtype=np.bool_)
    used[tables.cell] = True
    sums, power = [], value
    for _ in range(_POWERS):
        sums.append(np.bincount(tables.cell, weights=power, minlength=cells))
        power = power * tables.part
    moves.slope[:] += flat_slope @ sums[0] + np.where(used, rise_slope, 0.0) @ sums[1]

    longest = np.abs(rise_move[:, used]).max(initial=0.0) * tables.part.max(initial=0.0)
    if not longest <= _SMALL:
        for key in range(keys):
            moves.dv01[key] += float(value @ np.expm1(tables.between(log_move[key])))
        return
    rise_move[:, ~used] = 0.0
    series, term = np.zeros((keys, cells)), np.ones((keys, cells))
    for number in range(1, _POWERS):
        term = term * rise_move / number
        series += term * sums[number]
    moves.dv01[:] += np.expm1(flat_move) @ sums[0] + np.sum(np.exp(flat_move) * series, axis=1)
