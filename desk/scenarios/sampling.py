"""How the paths of a variance-reduced run are shared among replicates and blocks.

A run is repeated a few times with fewer paths, and the repetitions, the replicates, are independent of each
other. Within one the paths may depend on each other in any way: the spread of the replicates' results still
tells the error of their mean. Path c of a run belongs to replicate ``c // replicate_paths``.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from desk.book import Bridge, Fault, Run, Sampling, Severity
from desk.rates.black_karasinski import BlackKarasinskiRates
from desk.rates.gaussian import GaussianRates
from desk.scenarios.normals import BlockNormals, NormalSource, Segment, sobol_directions

__all__ = ["Replicates", "replicates_of", "sampling_faults"]


@dataclass(frozen=True)
class Replicates:
    """The replicates of a run.

    Attributes
    ----------
    count, paths : int
        Replicates, and paths of each, an even number.
    block_paths : int
        Most paths of a block, at least 2.
    seed : int
    sampling : Sampling
    bridge : Bridge
    matching : bool
    """

    count: int
    paths: int
    block_paths: int
    seed: int
    sampling: Sampling
    bridge: Bridge
    matching: bool

    @property
    def _parts(self) -> int:
        """Blocks that a replicate is parted into; 1 where a block holds several replicates."""
        return -(-self.paths // self.block_paths)

    @property
    def _together(self) -> int:
        """Replicates that a block holds."""
        return max(1, self.block_paths // self.paths)

    @property
    def blocks(self) -> int:
        """Number of blocks."""
        return self.count * self._parts if self._parts > 1 else -(-self.count // self._together)

    def columns(self, index: int) -> slice:
        """Paths of a block."""
        if self._parts == 1:
            start = index * self._together * self.paths
            return slice(start, min(start + self._together * self.paths, self.count * self.paths))
        replicate, part = divmod(index, self._parts)
        # Even, so that no pair is parted.
        width = 2 * -(-self.paths // (2 * self._parts))
        base = replicate * self.paths
        return slice(base + min(part * width, self.paths), base + min((part + 1) * width, self.paths))

    def segments(self, index: int) -> Iterator[Segment]:
        """Paths of each replicate in a block."""
        columns = self.columns(index)
        for replicate in range(columns.start // self.paths, -(-columns.stop // self.paths)):
            start = max(replicate * self.paths, columns.start)
            end = min((replicate + 1) * self.paths, columns.stop)
            yield Segment(
                replicate,
                start - replicate * self.paths,
                slice(start - columns.start, end - columns.start),
            )

    def kept_numbers(self, steps: int, rows: int) -> int:
        """Numbers a path that are kept from its beginning to its end, of so many rows of normals a step."""
        return rows * sobol_directions(steps, rows) if self.sampling is Sampling.SOBOL else 0

    def source(self, index: int, model: object, *, steps_per_year: int, steps: int) -> NormalSource:
        """What a block's walk of the rates draws from, in place of a generator.

        What is drawn beside the rates takes its sources from it by `NormalSource.spawn`.

        Parameters
        ----------
        index : int
            Of the block.
        model : object
            The short-rate model.
        steps_per_year, steps : int
        """
        columns = self.columns(index)
        block = BlockNormals(
            seed=self.seed,
            block=index,
            width=columns.stop - columns.start,
            steps=steps,
            segments=tuple(self.segments(index)),
            sampling=self.sampling,
            bridge=self.bridge,
            matching=self.matching,
        )
        if isinstance(model, GaussianRates):
            return block.source(model.factor_count + 1, steps, leading=model.factor_count)
        if isinstance(model, BlackKarasinskiRates):
            return block.source(1, steps * round(model.steps_per_year / steps_per_year))
        return block.source(0, steps)


def replicates_of(run: Run, *, block_paths: int) -> Replicates | None:
    """The replicates of a run; None of a plain one."""
    if not run.is_reduced:
        return None
    return Replicates(
        count=run.replicates,
        paths=run.replicate_paths,
        block_paths=block_paths,
        seed=run.seed,
        sampling=run.sampling,
        bridge=run.bridge,
        matching=run.matching,
    )


def sampling_faults(run: Run, model: object) -> tuple[Fault, ...]:
    """What is to be said of the sampling of a run, all of the mild kind."""
    found: list[Fault] = []
    if not run.is_reduced:
        return ()
    if not isinstance(model, GaussianRates | BlackKarasinskiRates):
        found.append(
            _remark(
                "the rates of this model are not drawn from normal numbers",
                "a Gaussian or lognormal model, where paths are to be drawn otherwise than plainly",
                "Choose plain sampling, or leave it: the rates are drawn plainly, the errors are right.",
            )
        )
    paths, asked = run.drawn_paths, run.paths
    if paths != asked:
        found.append(
            _remark(
                f"{asked:,} {'path is' if asked == 1 else 'paths are'} no equal even shares for "
                f"{run.replicates} replicates",
                f"a multiple of {2 * run.replicates}",
                f"Set Paths to {paths:,}, or leave it: {paths:,} paths are drawn.",
            )
        )
    each = run.replicate_paths
    if run.sampling is Sampling.SOBOL and each & (each - 1):
        power = 2 ** int(np.floor(np.log2(each)))
        found.append(
            _remark(
                f"the {each:,} Sobol points of each of {run.replicates} replicates are no power of two",
                "a power of two, at which such points are spread most evenly",
                f"Set Paths to {power * run.replicates:,} or {2 * power * run.replicates:,}, or leave it: "
                "the values are right.",
            )
        )
    if run.matching and each < _FEW_TO_MATCH:
        found.append(
            _remark(
                f"moments are matched over {each} paths a replicate",
                f"at least {_FEW_TO_MATCH}, so that the matching moves the results little",
                "Take more paths or fewer replicates.",
            )
        )
    return tuple(found)


_FEW_TO_MATCH = 100


def _remark(found: str, expected: str, mend: str) -> Fault:
    return Fault(found=found, expected=expected, mend=mend, sheet="Run", severity=Severity.MILD)
