"""Normals of a block that are not drawn as they come."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import ndtr
from scipy.stats import kstest

from desk.book import Bridge, Sampling
from desk.book.arrays import FloatArray
from desk.scenarios.normals import MOST_DIMENSIONS, BlockNormals, PairedSource, Segment, sobol_directions
from desk.scenarios.normals_directions import directions


def block(
    sampling: Sampling,
    *,
    width: int = 256,
    replicates: int = 1,
    steps: int = 12,
    bridge: Bridge = Bridge.COMPONENTS,
    matching: bool = False,
    seed: int = 5,
    number: int = 0,
) -> BlockNormals:
    each = width // replicates
    segments = [Segment(r, 0, slice(r * each, (r + 1) * each)) for r in range(replicates)]
    return BlockNormals(
        seed=seed,
        block=number,
        width=width,
        steps=steps,
        segments=segments,
        sampling=sampling,
        bridge=bridge,
        matching=matching,
    )


def drawn(
    sampling: Sampling,
    *,
    rows: int = 2,
    width: int = 256,
    replicates: int = 1,
    steps: int = 12,
    bridge: Bridge = Bridge.COMPONENTS,
    matching: bool = False,
    seed: int = 5,
) -> FloatArray:
    """All normals of a walk, shape (steps, rows, width)."""
    normals = block(
        sampling,
        width=width,
        replicates=replicates,
        steps=steps,
        bridge=bridge,
        matching=matching,
        seed=seed,
    )
    found = np.empty((steps, rows, width))
    normals.source(rows, steps, leading=rows - 1).standard_normal(out=found)
    return found


@pytest.mark.parametrize("bridge", Bridge)
@pytest.mark.parametrize("length", [1, 2, 3, 7, 40, 480])
def test_directions_are_orthonormal(bridge: Bridge, length: int) -> None:
    found = directions(bridge, length, length)
    assert found @ found.T == pytest.approx(np.eye(length), abs=1e-12)
    assert directions(bridge, length, (length + 1) // 2) == pytest.approx(found[: (length + 1) // 2])
    with pytest.raises(ValueError, match="count"):
        directions(bridge, length, length + 1)


def test_components_are_those_of_the_running_sum() -> None:
    """Numerically: the right singular vectors of the matrix that sums the steps up."""
    _, size, vectors = np.linalg.svd(np.tril(np.ones((30, 30))))
    found = directions(Bridge.COMPONENTS, 30, 30)
    assert np.abs(np.sum(found * vectors, axis=1)) == pytest.approx(np.ones(30), abs=1e-9)
    assert np.all(np.diff(size) < 0.0)


def test_a_bridge_moves_the_end_first_and_then_the_middle_given_the_end() -> None:
    found = directions(Bridge.BROWNIAN, 8, 8)
    moved = np.cumsum(found, axis=1)
    assert moved[0] == pytest.approx(np.arange(1, 9) / np.sqrt(8.0))
    assert moved[1:, -1] == pytest.approx(np.zeros(7), abs=1e-14)
    assert int(np.argmax(np.abs(moved[1]))) == 3
    assert np.abs(moved[1, 3]) == pytest.approx(np.sqrt(4.0 * 4.0 / 8.0))


@pytest.mark.parametrize("matching", [False, True])
@pytest.mark.parametrize("bridge", Bridge)
@pytest.mark.parametrize("sampling", Sampling)
@pytest.mark.parametrize("steps", [6, 40])
def test_each_path_has_independent_standard_normals(
    sampling: Sampling, bridge: Bridge, steps: int, matching: bool
) -> None:
    """Means and products over each of 125 replicates, which are independent of each other, are on average
    those of such normals: 3,240 of each at most, none beyond 5.2 standard errors."""
    normals = drawn(sampling, width=8_000, replicates=125, steps=steps, bridge=bridge, matching=matching)
    # dimensions: replicate, number within a path, path
    table = np.moveaxis(normals.reshape(2 * steps, 125, 64), 1, 0)
    products = table @ np.swapaxes(table, 1, 2) / 64.0
    for sample, known in ((table.mean(axis=-1), 0.0), (products, np.eye(2 * steps))):
        error = sample.std(axis=0, ddof=1) / np.sqrt(125)
        assert np.all(np.abs(sample.mean(axis=0) - known) < 5.2 * error + 1e-13)
    assert kstest(normals[0, 0, :: 2 if sampling is Sampling.ANTITHETIC else 1], ndtr).pvalue > 1e-4


def test_antithetic_paths_are_mirror_images() -> None:
    found = drawn(Sampling.ANTITHETIC)
    assert np.array_equal(found[..., 0::2], -found[..., 1::2])
    assert np.unique(np.abs(found)).size == found.size // 2


@pytest.mark.parametrize("sampling", Sampling)
def test_matched_normals_have_mean_0_and_variance_1_in_each_replicate(sampling: Sampling) -> None:
    found = drawn(sampling, replicates=4, matching=True).reshape(12, 2, 4, 64)
    assert np.abs(found.mean(axis=-1)).max() < 1e-14
    assert found.var(axis=-1) == pytest.approx(np.ones((12, 2, 4)), rel=1e-13)


@pytest.mark.parametrize("bridge", Bridge)
@pytest.mark.parametrize("steps", [5, 100])
def test_sobol_points_fill_each_direction_evenly(bridge: Bridge, steps: int) -> None:
    """Of 256 scrambled points one lies in each 256th of every coordinate: the projections of the normals on
    the directions, taken back to uniform numbers. Sobol (1967), property of a (t, s)-sequence."""
    count = sobol_directions(steps, 2)
    found = drawn(Sampling.SOBOL, replicates=2, width=512, steps=steps, bridge=bridge)
    for row in range(2):
        along = directions(bridge, steps, count) @ found[:, row]
        cells = np.floor(256.0 * ndtr(along)).astype(int).reshape(count, 2, 256)
        assert np.array_equal(np.sort(cells, axis=-1), np.broadcast_to(np.arange(256), cells.shape))
        assert not np.array_equal(cells[:, 0], cells[:, 1])


def test_sobol_points_of_a_replicate_go_on_from_block_to_block() -> None:
    """Two blocks of 128 paths hold the points of one of 256."""
    whole = drawn(Sampling.SOBOL, steps=6)
    halves = []
    for number in range(2):
        part = BlockNormals(
            seed=5,
            block=number,
            width=128,
            steps=6,
            segments=[Segment(0, 128 * number, slice(0, 128))],
            sampling=Sampling.SOBOL,
            bridge=Bridge.COMPONENTS,
            matching=False,
        )
        out = np.empty((6, 2, 128))
        part.source(2, 6, leading=1).standard_normal(out=out)
        halves.append(out)
    assert np.concatenate(halves, axis=-1) == pytest.approx(whole, abs=1e-14)


@pytest.mark.parametrize("sampling", Sampling)
@pytest.mark.parametrize("steps", [12, 50])
def test_numbers_are_the_same_however_many_are_asked_for_at_a_time(sampling: Sampling, steps: int) -> None:
    whole = drawn(sampling, steps=steps, matching=True).reshape(-1)
    source = block(sampling, steps=steps, matching=True).source(2, steps, leading=1)
    pieces, left = [], whole.size
    for size in (1, 255, 256, 1024, 300, 212, 2000, left):
        piece = np.empty(min(size, left))
        source.standard_normal(out=piece)
        pieces.append(piece)
        left -= piece.size
    assert np.concatenate(pieces) == pytest.approx(whole, abs=1e-13)
    with pytest.raises(ValueError, match="more normals are drawn"):
        source.standard_normal(out=np.empty(1))


def test_what_cannot_be_filled_is_refused() -> None:
    source = block(Sampling.ANTITHETIC).source(2, 12)
    with pytest.raises(ValueError, match="contiguous"):
        source.standard_normal(out=np.empty((4, 512))[:, ::2])
    with pytest.raises(ValueError, match="contiguous"):
        source.standard_normal()


def test_a_walk_without_normals_draws_from_a_plain_generator() -> None:
    normals = block(Sampling.SOBOL)
    source = normals.source(0, 12)
    plain = normals.generator(0)
    assert np.array_equal(source.standard_gamma(2.0, 5), plain.standard_gamma(2.0, 5))
    assert np.array_equal(source.standard_normal(3), plain.standard_normal(3))


@pytest.mark.parametrize("sampling", Sampling)
def test_what_stands_beside_the_rates_is_independent_of_them(sampling: Sampling) -> None:
    """Rates, the inflation factor with its integral, and two assets, all of a block."""
    normals = block(sampling, width=4096, replicates=16)
    rates = normals.source(2, 12, leading=1)
    inflation, *assets = rates.beside(2, inflates=True)
    assert isinstance(inflation, PairedSource)
    table, drawn_rates = np.empty((12, 6, 4096)), np.empty((12, 2, 4096))
    rates.standard_normal(out=drawn_rates)
    table[:, :2] = drawn_rates
    for step in range(12):
        # As companions are drawn: some columns of the factor, the same of its integral, then the next.
        for columns in (slice(0, 2500), slice(2500, 4096)):
            for row in (2, 3):
                inflation.standard_normal(out=table[step, row, columns])
            for row, asset in zip((4, 5), assets, strict=True):
                asset.standard_normal(out=table[step, row, columns])
    together = table.reshape(72, 4096)
    assert np.abs(together @ together.T / 4096 - np.eye(72)).max() < 5.2 * np.sqrt(2.0 / 4096)
    if sampling is Sampling.ANTITHETIC:
        assert np.array_equal(together[:, 0::2], -together[:, 1::2])


def test_the_published_dimensions_are_never_passed() -> None:
    for rows in (1, 3, 700, 5_000, 30_000):
        assert sobol_directions(480, rows) * rows <= MOST_DIMENSIONS
    assert sobol_directions(480, 700) == 30
    assert sobol_directions(5, 2) == 5
    found = drawn(Sampling.SOBOL, rows=300, width=64, steps=80)
    assert abs(found.var() - 1.0) < 0.01
