"""Single paths of a run, node by node: for looking at one, and for handing them on.

The paths are those of the run itself, drawn once more from the same seed: a run keeps none of them.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from desk.book.arrays import FloatArray, owned_floats
from desk.scenarios.draws import Block, Crew, Paths, Plan

__all__ = ["DrawnPaths", "block_of", "draw_block", "drawn_blocks", "drawn_path_range"]


@dataclass(frozen=True, eq=False)
class DrawnPaths:
    """Some paths of a run, one beside the other, at n nodes.

    Attributes
    ----------
    first : int
        Number of the first of them, from 0.
    time : ndarray, shape (n,)
        Rising from 0 [years].
    log_account : ndarray, shape (n, m)
        ``ln R_t``.
    short_rate : ndarray, shape (n, m)
        ``r(t)``; of a set from outside the rate of the step just ended [1/year].
    asset_names : tuple of str, length k
    assets : ndarray, shape (k, n, m)
        ``S_t/S_0``: what one unit grows to with dividends reinvested.
    price_index : ndarray, shape (n, m), or None
        ``I(t)/I(0)``; None where inflation is not drawn.
    """

    first: int
    time: FloatArray
    log_account: FloatArray
    short_rate: FloatArray
    asset_names: tuple[str, ...]
    assets: FloatArray
    price_index: FloatArray | None

    @property
    def count(self) -> int:
        """Number m of paths."""
        return int(self.log_account.shape[1])

    @property
    def account(self) -> FloatArray:
        """``R_t``, shape (n, m)."""
        with np.errstate(over="ignore"):
            return np.exp(self.log_account)

    @property
    def mean_rate(self) -> FloatArray:
        """Mean of the short rate from each node to the next, shape (n - 1, m) [1/year].

        ``ln(R_t/R_s)/(t - s)``: what a set of scenarios from outside states.
        """
        return np.asarray(np.diff(self.log_account, axis=0) / np.diff(self.time)[:, None])

    def part(self, start: int, stop: int) -> DrawnPaths:
        """Those with the numbers from `start` to `stop` - 1, counted as in the run."""
        columns = slice(max(start - self.first, 0), max(stop - self.first, 0))
        index = self.price_index
        return DrawnPaths(
            first=self.first + columns.start,
            time=self.time,
            log_account=owned_floats(self.log_account[:, columns]),
            short_rate=owned_floats(self.short_rate[:, columns]),
            asset_names=self.asset_names,
            assets=owned_floats(self.assets[:, :, columns]),
            price_index=None if index is None else owned_floats(index[:, columns]),
        )


def block_of(plan: Plan, path: int) -> int:
    """The block that holds a path.

    Raises
    ------
    ValueError
        If the run has no path of that number, counted from 0.
    """
    if not 0 <= path < plan.paths:
        raise ValueError(f"`path` must be from 0 to {plan.paths - 1:,}, not {path:,}")
    # Blocks hold rising numbers of paths, in order.
    low, high = 0, plan.blocks - 1
    while low < high:
        middle = (low + high) // 2
        if plan.columns(middle).stop > path:
            high = middle
        else:
            low = middle + 1
    return low


def draw_block(
    plan: Plan, index: int, *, asset_names: Sequence[str] = (), steps: Sequence[int] | None = None
) -> DrawnPaths:
    """Draw the paths of one block.

    Parameters
    ----------
    plan : Plan
    index : int
        Of the block.
    asset_names : sequence of str, optional
        Of the risky assets beside the rates, in their order; numbered when left out.
    steps : sequence of int, optional
        Those that are wanted, rising from at least 1; what the run reports when left out.

    Returns
    -------
    DrawnPaths
        At today and at the steps wanted.
    """
    wanted = tuple(plan.reported_steps if steps is None else steps)
    block = Block(plan, index)
    width = block.columns.stop - block.columns.start
    count = 0 if plan.market is None else plan.market.asset_count
    rows = {step: row for row, step in enumerate(wanted, start=1)}
    log_account = np.zeros((len(wanted) + 1, width))
    rate = np.empty((len(wanted) + 1, width))
    rate[0] = float(plan.model.curve.forward(0.0, 0.0))
    assets = np.ones((count, len(wanted) + 1, width))
    index_level = None
    if plan.market is not None and plan.market.index is not None:
        index_level = np.ones((len(wanted) + 1, width))

    def visit(step: int, paths: Paths) -> None:
        row = rows.get(step)
        if row is None:
            return
        np.add(paths.integral, plan.account_offset[step], out=log_account[row])
        np.add(paths.state[0], plan.rate_offset[step], out=rate[row])
        for factor in paths.state[1:]:
            rate[row] += factor
        for number in range(count):
            np.exp(paths.excess[number] + log_account[row], out=assets[number, row])
        if index_level is not None:
            np.exp(paths.index_integral + plan.index_offset[step], out=index_level[row])

    nothing = np.empty((0, 0))
    with Crew(1, 1.0) as crew, np.errstate(over="ignore", invalid="ignore", under="ignore"):
        block.advance((), nothing, nothing, visit=visit, crew=crew, until=wanted[-1] if wanted else 0)
    names = tuple(asset_names) or tuple(f"Asset {number}" for number in range(1, count + 1))
    if len(names) != count:
        raise ValueError(f"`asset_names` must hold {count} names")
    return DrawnPaths(
        first=block.columns.start,
        time=owned_floats(plan.time[[0, *wanted]]),
        log_account=owned_floats(log_account),
        short_rate=owned_floats(rate),
        asset_names=names,
        assets=owned_floats(assets),
        price_index=None if index_level is None else owned_floats(index_level),
    )


def drawn_blocks(
    plan: Plan, *, asset_names: Sequence[str] = (), steps: Sequence[int] | None = None
) -> Iterator[DrawnPaths]:
    """All paths of a run, a block at a time in their order; see `draw_block`."""
    for index in range(plan.blocks):
        yield draw_block(plan, index, asset_names=asset_names, steps=steps)


def drawn_path_range(
    plan: Plan, *, first: int, count: int, asset_names: Sequence[str] = ()
) -> tuple[DrawnPaths, ...]:
    """Paths `first` to `first` + `count` - 1 of a run at its reported times, in as many parts as blocks.

    Raises
    ------
    ValueError
        If the run has no path number `first`, counted from 0.
    """
    last = min(first + count, plan.paths) - 1
    return tuple(
        draw_block(plan, index, asset_names=asset_names).part(first, last + 1)
        for index in range(block_of(plan, first), block_of(plan, last) + 1)
    )
