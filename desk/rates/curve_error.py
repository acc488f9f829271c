"""What is wrong with quotes that give no curve."""

from __future__ import annotations

from collections.abc import Iterable

__all__ = ["CurveError"]


class CurveError(ValueError):
    """Quotes that give no curve.

    Parameters
    ----------
    found : str
        What was found, as one clause.
    mend : str
        What would mend it, as one sentence.
    rows : iterable of int
        The quotes at fault, numbered from 0 in the order they were given; none where it is not one of them.
    subject : str
        What the rows are rows of, where there is more than one table: for example ``bonds`` or ``liability
        bonds``.

    Attributes
    ----------
    found, mend : str
    rows : tuple of int
    subject : str
    """

    def __init__(self, found: str, mend: str, *, rows: Iterable[int] = (), subject: str = "") -> None:
        super().__init__(f"{found}. {mend}")
        self.found = found
        self.mend = mend
        self.rows = tuple(int(row) for row in rows)
        self.subject = subject

    def __reduce__(self) -> tuple[object, ...]:
        """Rebuilt from its parts where it crosses from one process to another."""
        return _rebuilt, (self.found, self.mend, self.rows, self.subject)


def _rebuilt(found: str, mend: str, rows: tuple[int, ...], subject: str) -> CurveError:
    return CurveError(found, mend, rows=rows, subject=subject)
