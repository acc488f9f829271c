"""The reading process: parses a source apart from the program, under limits of memory and time.

Run as ``python -m desk.intake.worker values|scan|extent PATH MEMORY SECONDS``. Writes one marshalled
dictionary to standard output: either what was asked for, or ``refused`` with a reason. A file that makes
the parser abort takes this process with it and nothing else.
"""

from __future__ import annotations

import gc
import marshal
import sys
from pathlib import Path
from typing import Any

from desk.intake.container import Refused, examine

__all__ = ["main"]


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
    try:
        # By its content, not by its name: a name proves nothing.
        with open(path, "rb") as file:
            workbook = calamine.CalamineWorkbook.from_filelike(file)
            for about in workbook.sheets_metadata:
                if about.typ != calamine.SheetTypeEnum.WorkSheet:
                    continue
                rows = workbook.get_sheet_by_name(about.name).to_python(skip_empty_area=False)
                hidden = about.visible != calamine.SheetVisibleEnum.Visible
                sheets.append((about.name, hidden, len(rows), pack_rows(rows)))
                del rows
    except calamine.PasswordError as error:
        raise Refused("password") from error
    except calamine.CalamineError as error:
        raise Refused("corrupt", str(error)) from error
    return {"form": form, "sheets": sheets}


def _answer(command: str, path: Path) -> dict[str, Any]:
    if command == "values":
        return read_values(path)
    from desk.intake.scan import extents, scan_workbook

    form = examine(path)
    if form != "xlsx":
        raise Refused("unscanned")
    return {"extents": extents(path)} if command == "extent" else {"facts": scan_workbook(path)}


def main(arguments: list[str]) -> int:
    """Do one command and write its answer."""
    command, path, memory_bytes, seconds = arguments
    _set_limits(int(memory_bytes), int(seconds))
    # The cells are millions of objects that live to the end: looking for rubbish among them only costs.
    gc.disable()
    try:
        answer = _answer(command, Path(path))
    except Refused as refusal:
        answer = {"refused": refusal.code, "detail": refusal.detail}
    except MemoryError:
        answer = {"refused": "memory", "detail": ""}
    except Exception as error:
        answer = {"refused": "corrupt", "detail": f"{type(error).__name__}: {error}"}
    sys.stdout.buffer.write(marshal.dumps(answer))
    sys.stdout.buffer.flush()
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
