"""Starting, watching and stopping the reading processes."""

from __future__ import annotations

import marshal
import os
import signal
import subprocess
import sys
import tempfile
import threading
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import desk

__all__ = ["Answer", "Limits", "ask"]

_LOOK_SECONDS = 0.02


@dataclass(frozen=True)
class Limits:
    """What a reading process may use.

    Attributes
    ----------
    memory_bytes : int
        Address space, where the platform can bound it.
    seconds : float
        Time by the clock.
    """

    memory_bytes: int = 3 << 30
    seconds: float = 240.0


@dataclass(frozen=True)
class Answer:
    """What became of one command.

    Attributes
    ----------
    content : dict
        What the process answered; empty if it was refused.
    refused : str
        Why there is no content: one of the codes of `desk.intake.container.Refused`, or ``memory``,
        ``time`` or ``crash``.
    detail : str
    """

    content: dict[str, Any]
    refused: str = ""
    detail: str = ""

    @classmethod
    def of(cls, answer: dict[str, Any]) -> Answer:
        """What a reading process said."""
        if "refused" in answer:
            return cls({}, answer["refused"], answer["detail"])
        return cls(answer)


class _Process:
    """One reading process, its output gathered by a thread so that its pipe never fills."""

    def __init__(self, command: str, path: Path, limits: Limits) -> None:
        self._errors = tempfile.TemporaryFile()  # noqa: SIM115 - closed with the process
        self._output = b""
        home = Path(desk.__file__).resolve().parents[1]
        words = [command, str(path), str(limits.memory_bytes), str(int(limits.seconds) + 1)]
        self._child = subprocess.Popen(
            [sys.executable, "-m", "desk.intake.worker", *words],
            # Never written to: its end tells the process that this one is gone.
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=self._errors,
            cwd=home,
            # The threads of a numeric library would reserve address space that is never used.
            env={**os.environ, "OPENBLAS_NUM_THREADS": "1", "OMP_NUM_THREADS": "1", "MKL_NUM_THREADS": "1"},
            creationflags=getattr(subprocess, "CREATE_NO_WINDOW", 0),
        )
        self._reader = threading.Thread(target=self._gather, name=f"intake {command}", daemon=True)
        self._reader.start()

    def _gather(self) -> None:
        assert self._child.stdout is not None
        self._output = self._child.stdout.read()

    def wait(self, seconds: float) -> bool:
        """Wait at most so long; whether the process has ended."""
        self._reader.join(seconds)
        return not self._reader.is_alive()

    def close(self) -> None:
        """End the process at once if it still runs, and release what it held."""
        if self._child.poll() is None and self._reader.is_alive():
            self._child.kill()
        self._child.wait()
        self._reader.join()
        for stream in (self._child.stdin, self._child.stdout):
            if stream is not None:
                stream.close()
        self._errors.close()

    def answer(self) -> Answer:
        """What it answered."""
        status = self._child.wait()
        if status == 0 and self._output:
            return Answer.of(marshal.loads(self._output))
        self._errors.seek(0)
        said = self._errors.read(1 << 16).decode("utf-8", "replace").strip()
        if sys.platform != "win32" and status == -signal.SIGXCPU:
            return Answer({}, "time")
        if "memory allocation" in said or "MemoryError" in said:
            return Answer({}, "memory")
        return Answer({}, "crash", said.splitlines()[-1][:200] if said else f"status {status}")


def ask(
    commands: Sequence[str], path: Path, limits: Limits, *, watch: Callable[[float], object] | None = None
) -> list[Answer]:
    """Run the commands on `path` beside each other and give their answers in order.

    Parameters
    ----------
    commands : sequence of str
        Of ``values``, ``scan``, ``both`` (the two in one process) and ``extent``.
    path : Path
    limits : Limits
        For each process. One that takes longer is ended and answered ``time``.
    watch : callable, optional
        Called now and then with the seconds passed. If it raises, every process is ended at once.

    Returns
    -------
    list of Answer
    """
    started: list[_Process] = []
    start = time.monotonic()
    try:
        # One by one, so that the first is ended if the second cannot be started.
        for command in commands:
            started.append(_Process(command, path, limits))  # noqa: PERF401
        running = list(started)
        while running:
            passed = time.monotonic() - start
            if watch is not None:
                watch(passed)
            if passed > limits.seconds:
                break
            running[0].wait(_LOOK_SECONDS)
            running = [process for process in running if not process.wait(0.0)]
        late = set(map(id, running))
        return [Answer({}, "time") if id(process) in late else process.answer() for process in started]
    finally:
        for process in started:
            process.close()
