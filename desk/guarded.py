"""How a command ends: its exit status, and what it does when it is stopped or cannot write."""

from __future__ import annotations

import os
import signal
import sys
import threading
import traceback
from collections.abc import Callable, Iterator
from contextlib import contextmanager

from desk.terminal import complain, say, use_standard_streams

__all__ = ["FAILED", "ended_by_signals", "run_guarded", "say_result"]

FAILED = 1


@contextmanager
def ended_by_signals() -> Iterator[None]:
    """Let a request to end stop the work as Ctrl-C does, so that nothing half done stays behind."""
    names = [name for name in ("SIGTERM", "SIGHUP") if hasattr(signal, name)]
    former = {}

    def end(number: int, frame: object) -> None:
        signal.signal(number, signal.SIG_IGN)
        raise KeyboardInterrupt

    if threading.current_thread() is threading.main_thread():
        for name in names:
            number = getattr(signal, name)
            # A process that is to outlive its terminal stays deaf to its end.
            if signal.getsignal(number) is not signal.SIG_IGN:
                former[number] = signal.signal(number, end)
    try:
        yield
    finally:
        for number, handler in former.items():
            signal.signal(number, handler)


class _CannotWrite(Exception):
    """Standard output takes nothing more."""


def run_guarded(work: Callable[[], int]) -> int:
    """Do `work` and turn whatever ends it early into an exit status."""
    use_standard_streams()
    try:
        status = work()
        _flush()
    except KeyboardInterrupt:
        complain("Stopped.")
        return FAILED
    except MemoryError:
        complain("There is not enough memory for this. Ask for fewer paths or a shorter horizon.")
        return FAILED
    except _CannotWrite as error:
        complain(f"The result cannot be written: {error}.")
        # What Python still holds for the stream must not raise again at exit.
        sys.stdout = open(os.devnull, "w", encoding="utf-8")  # noqa: SIM115
        return FAILED
    except BrokenPipeError:
        # The reader has gone: what Python still holds for it must not raise again at exit.
        sys.stdout = open(os.devnull, "w", encoding="utf-8")  # noqa: SIM115
        return FAILED
    except Exception as error:
        traceback.print_exc()
        complain(f"The program failed: {type(error).__name__}: {error}")
        return FAILED
    return status


def _flush() -> None:
    """Hand over what was said."""
    try:
        sys.stdout.flush()
    except BrokenPipeError:
        raise
    except OSError as error:
        raise _CannotWrite(error.strerror or str(error)) from error


def say_result(text: str) -> None:
    """Text on standard output, which may take nothing more."""
    try:
        say(text)
    except BrokenPipeError:
        raise
    except OSError as error:
        raise _CannotWrite(error.strerror or str(error)) from error
