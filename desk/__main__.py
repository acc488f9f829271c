"""The entry: a command runs without a window, anything else opens it.

Order of events: the first argument decides. A command goes to `desk.batch`, which knows no window; a
book, or nothing, opens the window; nothing on a machine without a display does the whole main job on a
demo book.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Mapping, Sequence
from pathlib import Path

from desk import batch

__all__ = ["has_display", "main"]


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the program and return its exit status."""
    given = list(sys.argv[1:] if arguments is None else arguments)
    if given and (given[0] in batch.COMMANDS or given[0].startswith("-") or len(given) > 1):
        return batch.main(given)
    if not given and not has_display(os.environ):
        return batch.run_guarded(_demonstrate)
    return batch.run_guarded(lambda: _open_window(Path(given[0]) if given else None))


def has_display(environment: Mapping[str, str], *, platform: str = sys.platform) -> bool:
    """Whether a window can be shown.

    Parameters
    ----------
    environment : mapping
        Environment variables.
    platform : str, optional
        As `sys.platform` names it.
    """
    if not platform.startswith("linux"):
        return True
    return any(environment.get(name) for name in ("DISPLAY", "WAYLAND_DISPLAY", "QT_QPA_PLATFORM"))


def _open_window(path: Path | None) -> int:
    """Open the window, on a book where one is named."""
    if path is not None and not path.exists():
        names = ", ".join(batch.COMMANDS)
        print(f"gapwright: there is no file {path}, and the commands are {names}", file=sys.stderr)
        return 2
    if not has_display(os.environ):
        print("gapwright: there is no display for the window; the commands need none", file=sys.stderr)
        return 1
    try:
        from desk.window.app import run
    except ImportError as error:
        print(f"gapwright: the window cannot open here: {error}", file=sys.stderr)
        return 1
    return run(path)


def _demonstrate() -> int:
    """The whole main job on the pension fund's demo book, into the folder ``out``."""
    from desk.places import demo_books

    folder = Path.cwd() / "out"
    source = demo_books() / "pension_fund.xlsx"
    print(f"There is no display, so the main job runs on {source.name} without a window.\n")
    try:
        reading, standing, simulation = batch.demonstrate(source, folder)
    except batch.BadRequest:
        return 2
    os.environ["QT_QPA_PLATFORM"] = "offscreen"
    # Qt's off-screen platform says of every window that it cannot hint at sizes.
    os.environ.setdefault("QT_LOGGING_RULES", "default.warning=false")
    try:
        from desk.window.pictures import draw_all

        pictures = draw_all(reading, standing, simulation, folder)
    except ImportError as error:
        print(f"Pictures are left out: {error}")
        return 0
    for picture in pictures:
        print(f"A picture is in {picture}")
    return 0


if __name__ == "__main__":
    sys.exit(main())
