"""Talking to a terminal: results on standard output, faults and progress on standard error."""

from __future__ import annotations

import os
import sys
import time
from collections.abc import Callable
from contextlib import suppress
from typing import IO

__all__ = ["ProgressLine", "complain", "say", "use_standard_streams"]

_PLAINER = str.maketrans("−─’", "--'", "")


class ProgressLine:
    """One line on standard error that says what is done and how long it will take, on a terminal only."""

    def __init__(
        self, what: str, stream: IO[str] | None = None, *, clock: Callable[[], float] = time.monotonic
    ) -> None:
        """Begin the clock, which tells seconds."""
        self._clock = clock
        self._what = what
        self._stream = sys.stderr if stream is None else stream
        self._shown = self._stream.isatty()
        self._start = clock()
        self._last = self._start

    def __enter__(self) -> ProgressLine:
        """Nothing to prepare."""
        return self

    def __exit__(self, *raised: object) -> None:
        """Clear the line."""
        if self._shown:
            self._stream.write("\r\x1b[K")
            self._stream.flush()

    def __call__(self, part: float) -> None:
        """Show the part done, at most ten times a second."""
        if not self._shown:
            return
        now = self._clock()
        if now - self._last < 0.1:
            return
        self._last = now
        line = f"{self._what} {100 * part:3.0f} %"
        passed = now - self._start
        if part > 0.02 and passed > 1.0:
            line += f", {passed * (1 - part) / part:.0f} s left"
        self._stream.write(f"\r\x1b[K{line}")
        self._stream.flush()


def complain(line: str) -> None:
    """One line on standard error."""
    with suppress(OSError):  # a complaint that cannot be said changes nothing else
        sys.stderr.write(_encodable(f"{line}\n", sys.stderr))


def say(text: str) -> None:
    """Text on standard output."""
    sys.stdout.write(_encodable(f"{text}\n", sys.stdout))


def _encodable(text: str, stream: IO[str]) -> str:
    """`text` with signs that the stream's encoding lacks put in plainer ones."""
    encoding = getattr(stream, "encoding", None) or "utf-8"
    try:
        text.encode(encoding)
    except (UnicodeEncodeError, LookupError):
        plain = text.translate(_PLAINER).replace("²", "^2").replace("…", "...")
        return plain.encode(encoding, "replace").decode(encoding)
    return text


def use_standard_streams() -> None:
    """Give a process that was started without streams (a windowed start) something to write to."""
    for name in ("stdout", "stderr"):
        if getattr(sys, name) is None:
            setattr(sys, name, open(os.devnull, "w", encoding="utf-8"))  # noqa: SIM115
