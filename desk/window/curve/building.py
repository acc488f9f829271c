"""Curves of many bonds, which are built in the background."""

from __future__ import annotations

from collections.abc import Callable

from desk.book import Basis, CurveKind, LiabilityMethod
from desk.window.curve.faults import fault_of
from desk.window.curve.shown import shown_of
from desk.window.curve.targets import Part
from desk.window.jobs import Job, Jobs
from desk.window.parts import numbers

__all__ = ["Builder", "must_wait"]

_MOST_AT_ONCE = 60
"""Bonds: more are fitted in the background, lest the window pauses."""


def _bonds(basis: Basis, part: Part) -> int:
    """So many bonds a curve and the one below it are drawn through."""
    count = 0
    if part is not Part.INFLATION and basis.curve_kind is CurveKind.BONDS and basis.bonds is not None:
        count += len(basis.bonds)
    is_corporate = basis.liability_method is LiabilityMethod.CORPORATE_BONDS
    if part is Part.LIABILITIES and is_corporate and basis.liability_bonds is not None:
        count += len(basis.liability_bonds)
    return count


def must_wait(basis: Basis, part: Part) -> bool:
    """Whether a curve of a basis is too slow to build at once and is not there yet."""
    if _bonds(basis, part) <= _MOST_AT_ONCE:
        return False
    # What a basis has built it keeps under the name of the property.
    wanted = {"curve"} if part is Part.CURVE else {"curve", "liability_curve"}
    return not wanted <= vars(basis).keys()


class Builder:
    """Builds one curve at a time on a thread; the latest asked for takes the place of the one before.

    Attributes
    ----------
    words : str
        What is built, in one sentence; empty where nothing is.
    """

    def __init__(self, jobs: Jobs, key: str) -> None:
        self._jobs = jobs
        self._key = key
        self._job: Job | None = None
        self._asked: tuple[Basis, Part] | None = None
        self.words = ""

    def build(
        self, basis: Basis, part: Part, on_built: Callable[[str], None], on_stopped: Callable[[], None]
    ) -> None:
        """Build a curve into its basis.

        Parameters
        ----------
        basis : Basis
        part : Part
        on_built : callable
            Is told why the basis gives no such curve, or nothing, where it does.
        on_stopped : callable
            Called where the reader cancels it.

        Notes
        -----
        Neither is called once another curve is asked for, or `stop` is.
        """
        asked = (basis, part)
        if self._asked is not None and self._asked[0] is basis and self._asked[1] is part:
            return
        self.stop()
        self._asked = asked
        self.words = f"The curve is drawn through {numbers.integer(_bonds(basis, part))} bonds."

        def work(*, progress: Callable[[float], None], cancel: object) -> str:
            fault = fault_of(basis, part)
            if not fault:
                try:
                    shown_of(basis, part)
                except ValueError as error:
                    fault = f"{error}."
            return fault

        def ended(tell: Callable[[], None]) -> None:
            if self._asked is asked:
                self._job, self._asked, self.words = None, None, ""
                tell()

        self._job = self._jobs.start(
            "Drawing the curve",
            work,
            on_done=lambda fault: ended(lambda: on_built(fault)),
            on_failed=lambda error: ended(lambda: on_built(f"The curve could not be drawn: {error}.")),
            on_cancelled=lambda: ended(on_stopped),
            exclusive_key=self._key,
        )

    def stop(self) -> None:
        """Give up what is being built, unheard."""
        job, self._job, self._asked, self.words = self._job, None, None, ""
        if job is not None:
            self._jobs.cancel(job)
