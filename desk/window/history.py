"""The versions of a book: what each edit led to, and which of them is the open one."""

from __future__ import annotations

from dataclasses import dataclass

from desk.book import Book

__all__ = ["History"]

_LONGEST = 200
"""So many edits can be undone."""


@dataclass(frozen=True, eq=False)
class _Version:
    """A book in the history; `text` says what edit led to it."""

    text: str
    book: Book
    merge_key: object = None


class History:
    """Versions in their order, one of them open and one of them saved."""

    def __init__(self) -> None:
        self._versions: list[_Version] = []
        self._place = -1
        self._saved: _Version | None = None

    @property
    def book(self) -> Book | None:
        """The open version; None before there is any."""
        return self._versions[self._place].book if self._versions else None

    def start(self, book: Book) -> None:
        """Begin again from a book that is as it is saved."""
        self._versions = [_Version("", book)]
        self._place = 0
        self._saved = self._versions[0]

    def add(self, text: str, book: Book, *, merge_key: object = None) -> None:
        """Open a new version after the open one, whose former successors are gone.

        It takes the place of the open one where both have one `text` and one `merge_key` that is not None,
        and the open one is neither saved nor followed by others.
        """
        last = self._versions[self._place]
        merges = (
            merge_key is not None
            and last.merge_key == merge_key
            and last.text == text
            and last is not self._saved
            and self._place == len(self._versions) - 1
        )
        del self._versions[self._place + (0 if merges else 1) :]
        self._versions.append(_Version(text, book, merge_key))
        del self._versions[: -_LONGEST - 1]
        self._place = len(self._versions) - 1

    @property
    def can_undo(self) -> bool:
        """Whether there is a version before the open one."""
        return self._place > 0

    @property
    def can_redo(self) -> bool:
        """Whether there is a version after the open one."""
        return 0 <= self._place < len(self._versions) - 1

    @property
    def undo_text(self) -> str:
        """What led to the open version; empty where nothing did."""
        return self._versions[self._place].text if self.can_undo else ""

    @property
    def redo_text(self) -> str:
        """What led to the next version; empty where there is none."""
        return self._versions[self._place + 1].text if self.can_redo else ""

    def step(self, steps: int) -> bool:
        """Open the version before (-1) or after (1) the open one; whether there is one."""
        if not (self.can_undo if steps < 0 else self.can_redo):
            return False
        self._place += steps
        return True

    @property
    def is_modified(self) -> bool:
        """Whether the open version is another than the saved one."""
        return bool(self._versions) and self._versions[self._place] is not self._saved

    def mark_saved(self, book: Book | None = None) -> None:
        """Note that the version with this book was saved, by default the open one."""
        saved = self._versions[self._place]
        if book is not None:
            saved = next(
                (version for version in self._versions if version.book is book), self._saved or saved
            )
        self._saved = saved
