"""Where a report may go."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

from desk import places
from desk.window.dialogs import documents
from desk.window.parts.paths import is_inside, is_same_file

__all__ = ["suggested_target", "target_problem"]


def target_problem(text: str, books: Iterable[Path | None]) -> str:
    """What is wrong with a place for the report; empty where nothing is.

    Parameters
    ----------
    text : str
        As entered.
    books : iterable of Path or None
        Files that it must not replace.
    """
    if not text:
        return "Enter where the report goes."
    path = Path(text).expanduser()
    if path.suffix.casefold() != ".xlsx":
        return "The name must end in .xlsx."
    if not path.parent.is_dir():
        return f"There is no folder {path.parent}."
    if path.is_dir():
        return "This is a folder."
    if any(book is not None and is_same_file(path, book) for book in books):
        return "This is the book itself: the report would replace it."
    return ""


def suggested_target(source: Path, remembered: Path | None) -> Path:
    """A place for the report of a book: where the last one went, or beside the book.

    The demo books come with the program: reports of them go among the reader's documents.
    """
    name = f"{source.stem}_report.xlsx"
    if remembered is not None and remembered.is_dir():
        return remembered / name
    folder = (
        documents() if is_inside(source, places.demo_books()) or not source.parent.is_dir() else source.parent
    )
    return folder / name
