"""The reading process: parses a source apart from the program, under limits of memory and time.

Run as ``python -m desk.intake.worker values|scan|both|extent PATH MEMORY SECONDS``. Writes one marshalled
dictionary to standard output: either what was asked for, or ``refused`` with a reason. A file that makes
the parser abort takes this process with it and nothing else.
"""

from __future__ import annotations

import gc
import marshal
import os
import signal
import sys
import threading
from collections.abc import Callable
from contextlib import suppress
from pathlib import Path
from typing import Any

from desk.intake.container import Refused, examine

__all__ = ["main"]

_MOST_CELLS = 32_000_000
"""That the sheets span together, blank ones included: a million rows of thirty columns."""


def _set_limits(memory_bytes: int, seconds: int) -> None:
    """Bound this process where the platform can; the program's own clock bounds it everywhere."""
    if sys.platform == "win32":
        return
    import resource

    for limit, wanted in (
        (resource.RLIMIT_AS, memory_bytes),
        (resource.RLIMIT_CPU, seconds),
        (resource.RLIMIT_CORE, 0),
    ):
        _, hard = resource.getrlimit(limit)
        bound = wanted if hard == resource.RLIM_INFINITY else min(wanted, hard)
        try:
            resource.setrlimit(limit, (bound, hard))
        except (OSError, ValueError):  # macOS refuses some limits
            continue


def read_values(path: Path) -> dict[str, Any]:
    """Every sheet as packed columns."""
    form = examine(path)
    import python_calamine as calamine

    from desk.intake.columns import pack_rows

    sheets = []
    cells = 0
    try:
        # By its content, not by its name: a name proves nothing.
        with open(path, "rb") as file:
            workbook = calamine.CalamineWorkbook.from_filelike(file)
            for about in workbook.sheets_metadata:
                if about.typ != calamine.SheetTypeEnum.WorkSheet:
                    continue
                sheet = workbook.get_sheet_by_name(about.name)
                cells += sheet.total_height * sheet.total_width
                if cells > _MOST_CELLS:
                    raise Refused("memory")
                rows = sheet.to_python(skip_empty_area=False)
                hidden = about.visible != calamine.SheetVisibleEnum.Visible
                sheets.append((about.name, hidden, len(rows), pack_rows(rows)))
                del rows
    except calamine.PasswordError as error:
        raise Refused("password") from error
    except calamine.CalamineError as error:
        raise Refused("corrupt", str(error)) from error
    return {"form": form, "sheets": sheets}


def scan_facts(path: Path) -> dict[str, Any]:
    """What the values do not tell, by sheet."""
    from desk.intake.scan import scan_workbook

    if examine(path) != "xlsx":
        raise Refused("unscanned")
    return {"facts": scan_workbook(path)}


def furthest_cells(path: Path) -> dict[str, Any]:
    """How far each sheet reaches."""
    from desk.intake.scan import extents

    if examine(path) != "xlsx":
        raise Refused("unscanned")
    return {"extents": extents(path)}


def read_both(path: Path) -> dict[str, Any]:
    """The values and then the facts; what goes wrong with the facts leaves the values standing."""
    return {**read_values(path), "scan": _answer(scan_facts, path)}


_COMMANDS: dict[str, Callable[[Path], dict[str, Any]]] = {
    "values": read_values,
    "scan": scan_facts,
    "both": read_both,
    "extent": furthest_cells,
}


def _answer(command: Callable[[Path], dict[str, Any]], path: Path) -> dict[str, Any]:
    """What a command gives, or why it gives nothing."""
    try:
        return command(path)
    except Refused as refusal:
        return {"refused": refusal.code, "detail": refusal.detail}
    except MemoryError:
        return {"refused": "memory", "detail": ""}
    except Exception as error:
        return {"refused": "corrupt", "detail": f"{type(error).__name__}: {error}"}


def _end_with_starter() -> None:
    """End this process once the one that started it is gone: that one holds the other end of the input."""
    with suppress(OSError):
        # Below the streams of Python, which a thread must not hold when the process ends.
        os.read(0, 1)
        os._exit(1)


def main(arguments: list[str]) -> int:
    """Do one command and write its answer."""
    command, path, memory_bytes, seconds = arguments
    # Ctrl-C reaches every process of a terminal; this one is ended by the one that started it.
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threading.Thread(target=_end_with_starter, name="starter", daemon=True).start()
    _set_limits(int(memory_bytes), int(seconds))
    # The cells are millions of objects that live to the end: looking for rubbish among them only costs.
    gc.disable()
    answer = _answer(_COMMANDS[command], Path(path))
    sys.stdout.buffer.write(marshal.dumps(answer))
    sys.stdout.buffer.flush()
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
