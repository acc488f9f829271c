"""How a task tells how far it is, and how it is stopped."""

from __future__ import annotations

import threading
from collections.abc import Callable

__all__ = ["CancelToken", "Cancelled", "Progress", "part_of", "watched"]

Progress = Callable[[float], None]
"""Called with the part done, from 0 to 1, from the thread that does the work."""

CancelToken = threading.Event
"""Set it to stop a task at its next step."""


class Cancelled(Exception):
    """A task was stopped on request."""


def watched(progress: Progress | None, cancel: CancelToken | None) -> Progress:
    """A callback that stops the work once the token is set and passes progress on."""

    def watch(part: float) -> None:
        if cancel is not None and cancel.is_set():
            raise Cancelled
        if progress is not None:
            progress(part)

    return watch


def part_of(progress: Progress, start: float, end: float) -> Progress:
    """Progress of one step of a task that goes from `start` to `end`."""
    return lambda part: progress(start + (end - start) * part)
