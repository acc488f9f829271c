"""Paths shared among replicates and blocks."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from desk.book import Bridge, ModelName, Run, Sampling, Severity
from desk.scenarios.models import rate_model
from desk.scenarios.sampling import Replicates, replicates_of, sampling_faults
from tests.scenarios.books import ALL_MODELS, book


def replicates(*, count: int, paths: int, block_paths: int = 50) -> Replicates:
    return Replicates(count, paths, block_paths, 1, Sampling.SOBOL, Bridge.COMPONENTS, False)


@pytest.mark.parametrize(
    ("count", "paths"), [(2, 2), (7, 10), (16, 48), (3, 50), (4, 52), (5, 126), (2, 102), (2, 54), (3, 110)]
)
def test_blocks_and_segments_hold_every_path_once(count: int, paths: int) -> None:
    shared = replicates(count=count, paths=paths)
    place = 0
    seen = np.zeros((count, paths), int)
    for index in range(shared.blocks):
        columns = shared.columns(index)
        assert columns.start == place
        assert 0 < columns.stop - columns.start <= 50
        assert columns.start % 2 == 0
        assert columns.stop % 2 == 0
        place = columns.stop
        within = 0
        for segment in shared.segments(index):
            assert segment.columns.start == within
            within = segment.columns.stop
            size = segment.columns.stop - segment.columns.start
            first = columns.start + segment.columns.start
            assert segment.replicate * paths + segment.first == first
            seen[segment.replicate, segment.first : segment.first + size] += 1
        assert within == columns.stop - columns.start
    assert place == count * paths
    assert (seen == 1).all()


def test_paths_are_rounded_up_to_even_shares() -> None:
    plain = Run(paths=10_001)
    assert (plain.is_reduced, plain.drawn_paths, replicates_of(plain, block_paths=50)) == (
        False,
        10_001,
        None,
    )
    run = replace(plain, sampling=Sampling.ANTITHETIC)
    assert (run.replicate_paths, run.drawn_paths) == (626, 10_016)
    assert replace(plain, matching=True, replicates=7, paths=1).drawn_paths == 14
    with pytest.raises(ValueError, match="replicates"):
        Run(replicates=1)


def test_what_is_said_of_a_sampling() -> None:
    gaussian = rate_model(book(ALL_MODELS[ModelName.HULL_WHITE]))
    square_root = rate_model(book(ALL_MODELS[ModelName.CIR]))
    sound = Run(paths=16 * 512, sampling=Sampling.SOBOL)
    assert sampling_faults(sound, gaussian) == ()
    assert sampling_faults(Run(), square_root) == ()
    (told,) = sampling_faults(sound, square_root)
    assert "normal numbers" in told.found
    (told,) = sampling_faults(replace(sound, paths=10_000 + 240), gaussian)
    assert "640 Sobol points" in told.found
    assert "8,192 or 16,384" in told.mend
    told, few = sampling_faults(replace(sound, paths=100, sampling=Sampling.PLAIN, matching=True), gaussian)
    assert "128 paths are drawn" in told.mend
    assert "8 paths a replicate" in few.found
    assert {told.severity, few.severity} == {Severity.MILD}
