"""What can be said of a run before it is made: its size, its memory, and what stands in its way."""

from __future__ import annotations

from dataclasses import dataclass

from desk.book import Book, Fault
from desk.scenarios.plans import planned_run, run_bytes

__all__ = ["RunOutlook", "run_outlook"]


@dataclass(frozen=True)
class RunOutlook:
    """A run that has not been made.

    Attributes
    ----------
    obstacle : str
        Why it cannot be made, with what would help; empty where it can.
    paths, steps : int
        That would be drawn; 0 where it cannot be made.
    memory : int
        About what it takes beside the book [bytes].
    faults : tuple of Fault
        What would be drawn otherwise than stated, all mild.
    """

    obstacle: str
    paths: int
    steps: int
    memory: int
    faults: tuple[Fault, ...]


def run_outlook(book: Book) -> RunOutlook:
    """Look ahead at the run of a book; nothing is drawn."""
    try:
        planned = planned_run(book)
    except ValueError as error:
        return RunOutlook(str(error), 0, 0, 0, ())
    plan = planned.plan
    return RunOutlook("", plan.paths, plan.steps, run_bytes(plan), planned.faults)
