"""Blocks of paths, and the crew that draws them."""

from __future__ import annotations

import threading
import time
from functools import partial

import numpy as np
import pytest

from desk.book import ModelName
from desk.scenarios.draws import BLOCK_PATHS, Block, Crew, Plan, block_generator
from desk.scenarios.fans import percentile_fan
from desk.scenarios.models import rate_model
from tests.scenarios.books import ALL_MODELS, book


def _drawn(name: ModelName, *, paths: int, threads: int = 1, rows: tuple[int, ...] = (2, 5, 9)) -> np.ndarray:
    """``ln R_t`` and r(t) at some steps, shape (2, k, paths)."""
    plan = Plan(rate_model(book(ALL_MODELS[name])), paths, 4, 9, 5, False)
    out = np.empty((2, len(rows), paths))
    with Crew(threads, 1.0) as crew:
        blocks = [Block(plan, index) for index in range(plan.blocks)]
        # In two goes, as a long run is.
        for part in (slice(0, 1), slice(1, None)):
            crew.grouped(blocks, partial(_advance, rows[part], out[0, part], out[1, part], crew))
    return out


def _advance(rows: tuple[int, ...], account: np.ndarray, rate: np.ndarray, crew: Crew, block: Block) -> None:
    block.advance(rows, account, rate, crew=crew)


@pytest.mark.parametrize("name", ALL_MODELS)
def test_the_same_bits_for_any_number_of_threads(name: ModelName) -> None:
    one = _drawn(name, paths=2 * BLOCK_PATHS + 17)
    for threads in (2, 4):
        assert np.array_equal(one, _drawn(name, paths=2 * BLOCK_PATHS + 17, threads=threads))


@pytest.mark.parametrize("name", [ModelName.HULL_WHITE, ModelName.CIR])
def test_more_paths_begin_with_the_fewer(name: ModelName) -> None:
    few, many = _drawn(name, paths=BLOCK_PATHS + 3), _drawn(name, paths=2 * BLOCK_PATHS + 40)
    assert np.array_equal(few, many[:, :, : BLOCK_PATHS + 3])


def test_other_reported_steps_leave_the_paths_alone() -> None:
    all_steps = _drawn(ModelName.GAUSSIAN_2, paths=300, rows=tuple(range(1, 10)))
    assert np.array_equal(all_steps[:, [1, 4, 8]], _drawn(ModelName.GAUSSIAN_2, paths=300))


def test_four_draws_then_four_are_eight() -> None:
    whole = block_generator(3, 7).standard_normal(8)
    again = block_generator(3, 7)
    assert np.array_equal(np.concatenate([again.standard_normal(4), again.standard_normal(4)]), whole)


def test_blocks_and_seeds_are_apart() -> None:
    firsts = {
        float(block_generator(seed, block).standard_normal()) for seed in range(9) for block in range(9)
    }
    assert len(firsts) == 81


def test_neighbouring_blocks_are_not_correlated() -> None:
    size = 200_000
    one, two = (block_generator(1, index).standard_normal(size) for index in (0, 1))
    assert abs(float(np.corrcoef(one, two)[0, 1])) * np.sqrt(size) < 4.5


def test_results_come_in_order() -> None:
    def late(number: int) -> int:
        time.sleep(0.01 * (3 - number))
        return number

    with Crew(3, 1.0) as crew:
        assert crew.run([partial(late, number) for number in range(3)]) == [0, 1, 2]
        assert crew.run([]) == []


def test_an_error_of_a_task_comes_out_and_ends_the_threads() -> None:
    before = set(threading.enumerate())

    def fail() -> None:
        raise KeyError("broken")

    with pytest.raises(KeyError, match="broken"), Crew(2, 1.0) as crew:
        crew.run([fail] * 5)
    assert set(threading.enumerate()) == before


def test_no_threads_are_refused() -> None:
    with pytest.raises(ValueError, match="`threads`"):
        Crew(0, 1.0)


@pytest.mark.parametrize("threads", [1, 2, 4])
def test_a_fan_is_the_percentiles_of_the_paths(threads: int) -> None:
    model = rate_model(book(ALL_MODELS[ModelName.HULL_WHITE]))
    fan = percentile_fan(
        model, paths=BLOCK_PATHS + 500, steps_per_year=4, steps=9, seed=5, levels=(5.0, 50.0), threads=threads
    )
    drawn = _drawn(ModelName.HULL_WHITE, paths=BLOCK_PATHS + 500, rows=tuple(range(1, 10)))
    assert fan.time == pytest.approx(np.arange(1, 10) / 4.0)
    assert fan.savings_account == pytest.approx(np.percentile(np.exp(drawn[0]), (5, 50), axis=1).T, rel=1e-13)
    assert fan.short_rate == pytest.approx(np.percentile(drawn[1], (5, 50), axis=1).T, rel=1e-12)
