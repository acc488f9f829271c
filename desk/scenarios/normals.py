"""Where a block of paths gets its normal numbers from, other than from a generator as they come.

A walk draws its normals step by step, so many rows a step, each with one number a path. The sources here
stand in for the generator it draws from, and give numbers with the same law on each path: independent
standard normals. What differs is how paths depend on each other.

* Antithetic: paths 2k and 2k + 1 are mirror images.
* Sobol: along the most important directions of each row through time (`desk.scenarios.normals_directions`)
  the paths of a replicate take scrambled Sobol points; along all others they are independent.
* Matching: over the paths of a replicate that are in one block the numbers of each row of each step have
  mean 0 and variance 1. That ties the paths together, and moves the mean of what is no linear or quadratic
  function of the normals by a part of order 1/n of n paths. Boyle, P., Broadie, M. and Glasserman, P. (1997),
  Monte Carlo methods for security pricing, J. Economic Dynamics and Control 21.

References
----------
Sobol, I.M. (1967), On the distribution of points in a cube, USSR Computational Mathematics 7. Joe, S. and
Kuo, F.Y. (2008), Constructing Sobol sequences with better two-dimensional projections, SIAM J. Scientific
Computing 30. Matoušek, J. (1998), On the L2-discrepancy for anchored boxes, J. Complexity 14 (the
scrambling). Owen, A.B. (1997), Scrambled net variance for integrals of smooth functions, Annals of
Statistics 25.
"""

from __future__ import annotations

import threading
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from desk.book import Bridge, Sampling
from desk.book.arrays import FloatArray
from desk.scenarios.normals_directions import directions

__all__ = ["MOST_DIMENSIONS", "BlockNormals", "NormalSource", "PairedSource", "Segment", "sobol_directions"]

MOST_DIMENSIONS = 21_201
"""Dimensions for which Joe and Kuo's direction numbers are published."""

# Directions of one row that take Sobol points. Those after it carry less than 1 % of the variance of a
# Brownian motion and less than a thousandth of a percent of that of its integral.
_MOST_DIRECTIONS = 32
# Numbers worked on at a time.
_BATCH_NUMBERS = 40_000
# Points have 30 binary digits: the middle of each cell keeps the normals finite.
_HALF_CELL = 2.0**-31

_engine_lock = threading.Lock()


def sobol_directions(length: int, rows: int) -> int:
    """Directions of each of `rows` rows of `length` steps that take Sobol points."""
    return min(length, _MOST_DIRECTIONS, MOST_DIMENSIONS // max(rows, 1))


@dataclass(frozen=True)
class Segment:
    """Paths of one replicate that stand side by side in a block.

    Attributes
    ----------
    replicate : int
    first : int
        Number of the first of them within the replicate.
    columns : slice
        Their place in the block.
    """

    replicate: int
    first: int
    columns: slice


class BlockNormals:
    """The normals of one block, for one or several walks that go through time together.

    Parameters
    ----------
    seed, block : int
    width : int
        Number of paths; even for antithetic ones, with segments that begin at even places.
    steps : int
        Of each path.
    segments : sequence of Segment
        They cover the block, in order.
    sampling : Sampling
    bridge : Bridge
    matching : bool
    """

    def __init__(
        self,
        *,
        seed: int,
        block: int,
        width: int,
        steps: int,
        segments: Sequence[Segment],
        sampling: Sampling,
        bridge: Bridge,
        matching: bool,
    ) -> None:
        self.width, self.steps = width, steps
        self.segments, self.sampling, self.bridge, self.matching = segments, sampling, bridge, matching
        self._seed, self._block = seed, block
        self._sources: list[NormalSource] = []
        self._coefficients: dict[int, FloatArray] = {}

    def source(self, rows: int, length: int, *, leading: int | None = None) -> NormalSource:
        """A further source; all that a block needs are asked for before the first number is drawn.

        Parameters
        ----------
        rows : int
            Rows drawn a step; 0 where the walk draws no normals.
        length : int
            Steps the walk makes.
        leading : int, optional
            Rows that matter most; the others come after them in importance. All when left out.
        """
        number = len(self._sources)
        source = NormalSource(self, number, rows, length, leading=rows if leading is None else leading)
        self._sources.append(source)
        return source

    def generator(self, number: int) -> np.random.Generator:
        """The generator of a source, at its beginning."""
        key = (self._block, number - 1) if number else (self._block,)
        return np.random.Generator(np.random.SFC64(np.random.SeedSequence(self._seed, spawn_key=key)))

    def coefficients(self, number: int) -> FloatArray:
        """Normals from Sobol points for the directions of a source, shape (rows, directions, width)."""
        if not self._coefficients:
            self._draw_coefficients()
        return self._coefficients[number]

    def _draw_coefficients(self) -> None:
        total = sum(source.rows for source in self._sources)
        places: list[tuple[float, int, int, int]] = []
        for source in self._sources:
            count = sobol_directions(source.length, total)
            self._coefficients[source.number] = np.empty((source.rows, count, self.width))
            # The part of the integral over a step that the ends do not tell carries 1/(4 n²) of what the
            # ends do, which is what the directions from about √(2n) on carry.
            later = (2.0 * source.length) ** 0.5
            places += [
                (direction + (later if row >= source.leading else 0.0), source.number, row, direction)
                for row in range(source.rows)
                for direction in range(count)
            ]
        places.sort()
        for segment in self.segments:
            points = self._points(segment, len(places))
            for normals, (_, number, row, direction) in zip(points, places, strict=True):
                self._coefficients[number][row, direction, segment.columns] = normals

    def _points(self, segment: Segment, dimensions: int) -> FloatArray:
        """Normals from Sobol points, shape (dimensions, paths of the segment)."""
        from scipy.special import ndtri
        from scipy.stats import qmc

        key = (segment.replicate, 0, 1)
        rng = np.random.Generator(np.random.PCG64(np.random.SeedSequence(self._seed, spawn_key=key)))
        # Direction numbers are read at first use, which two threads must not do at once.
        with _engine_lock:
            engine = qmc.Sobol(dimensions, seed=rng)
        count = segment.columns.stop - segment.columns.start
        if segment.first:
            engine.fast_forward(segment.first)
            points = engine.random(count)
        else:
            # A first call for a number that is no power of two would warn of lost balance.
            points = np.concatenate([engine.random(1), engine.random(count - 1)])
        return np.asarray(ndtri(np.ascontiguousarray(points.T) + _HALF_CELL))


class NormalSource:
    """Stands in for the generator of a walk where its normals are not drawn as they come.

    Whatever else a walk asks of its generator it gets from a plain one.

    Parameters
    ----------
    block : BlockNormals
    number : int
        Among the sources of the block.
    rows, length, leading : int
        See `BlockNormals.source`.
    """

    def __init__(self, block: BlockNormals, number: int, rows: int, length: int, *, leading: int) -> None:
        self.number, self.rows, self.length, self.leading = number, rows, length, leading
        self._block = block
        self._rng = block.generator(number)
        self._width = block.width
        self._place = 0
        self._row = np.empty((1, block.width)) if rows else np.empty((0, 0))
        self._basis: FloatArray | None = None
        self._moved: FloatArray = np.empty(0)

    def __getattr__(self, name: str) -> Any:
        """Whatever else a generator does."""
        if name.startswith("_"):
            raise AttributeError(name)
        return getattr(self._rng, name)

    def beside(self, assets: int, *, inflates: bool) -> list[NormalSource | PairedSource]:
        """Sources for what is drawn beside the rates: inflation and each of so many risky assets."""
        steps, block = self._block.steps, self._block
        rows = 1 if inflates else 0
        inflation = PairedSource(block.source(rows, steps), block.source(rows, steps))
        return [inflation, *(block.source(1, steps) for _ in range(assets))]

    def standard_normal(self, size: Any = None, *, out: FloatArray | None = None) -> Any:
        """The next numbers, into `out`: step by step, within a step row by row, within a row path by path."""
        if not self.rows:
            return self._rng.standard_normal(size, out=out)
        if out is None or not out.flags.c_contiguous:
            raise ValueError("`out` must be a contiguous array")
        flat, width = out.reshape(-1), self._width
        done = 0
        while done < flat.size:
            row, column = divmod(self._place, width)
            whole = (flat.size - done) // width
            if column == 0 and whole:
                self._fill(row, flat[done : done + whole * width].reshape(whole, width))
                taken = whole * width
            else:
                if column == 0:
                    self._fill(row, self._row)
                taken = min(width - column, flat.size - done)
                flat[done : done + taken] = self._row[0, column : column + taken]
            done += taken
            self._place += taken
        return out

    def _fill(self, first: int, table: FloatArray) -> None:
        """The rows from `first` on, counted from the first step, shape (k, width)."""
        if first + len(table) > self.rows * self.length:
            raise ValueError(f"more normals are drawn than {self.length} steps take")
        match self._block.sampling:
            case Sampling.PLAIN:
                self._rng.standard_normal(out=table)
            case Sampling.ANTITHETIC:
                half = self._rng.standard_normal((len(table), self._width // 2))
                table[:, 0::2] = half
                np.negative(half, out=table[:, 1::2])
            case Sampling.SOBOL:
                self._fill_sobol(first, table)
        if self._block.matching:
            for segment in self._block.segments:
                _match(table[:, segment.columns])

    def _fill_sobol(self, first: int, table: FloatArray) -> None:
        """``z = w + Qᵀ(u - Q w)``: w drawn plainly, u from Sobol points, Q the directions."""
        if self._basis is None:
            self._moved = self._block.coefficients(self.number)
            self._basis = directions(self._block.bridge, self.length, self._moved.shape[1])
            if self._moved.shape[1] < self.length:
                self._remove_drawn(self._basis)
        basis = self._basis
        if len(basis) < self.length:
            self._rng.standard_normal(out=table)
        else:
            table[:] = 0.0
        for row in range(self.rows):
            start = (row - first) % self.rows
            chosen = table[start :: self.rows]
            step = (first + start) // self.rows
            chosen += np.einsum("dk,ds->ks", basis[:, step : step + len(chosen)], self._moved[row])

    def _remove_drawn(self, basis: FloatArray) -> None:
        """Take off what the plain numbers, which will be drawn again step by step, hold of the directions."""
        rng = self._block.generator(self.number)
        batch = max(1, _BATCH_NUMBERS // (self.rows * self._width))
        buffer = np.empty((batch, self.rows, self._width))
        for start in range(0, self.length, batch):
            drawn = buffer[: min(batch, self.length - start)]
            rng.standard_normal(out=drawn)
            part = basis[:, start : start + len(drawn)]
            for row in range(self.rows):
                self._moved[row] -= np.einsum("dk,ks->ds", part, drawn[:, row])


class PairedSource:
    """Two sources that are drawn from in turn: those of a factor and of its integral."""

    def __init__(self, first: NormalSource, second: NormalSource) -> None:
        self._turn, self._other = first, second

    def standard_normal(self, *, out: FloatArray) -> FloatArray:
        """The next numbers of the source whose turn it is, into `out`."""
        self._turn.standard_normal(out=out)
        self._turn, self._other = self._other, self._turn
        return out


def _match(rows: FloatArray) -> None:
    """Move and stretch each row to mean 0 and variance 1 (divisor n)."""
    np.subtract(rows, rows.mean(axis=1, keepdims=True), out=rows)
    scale = np.sqrt(np.einsum("ks,ks->k", rows, rows) / rows.shape[1])
    # Numbers that are all alike cannot be stretched.
    scale[scale == 0.0] = 1.0
    np.divide(rows, scale[:, None], out=rows)
