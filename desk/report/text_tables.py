"""Tables of plain text for a terminal: units in the headings, thousands grouped, a true minus."""

from __future__ import annotations

import math
import textwrap
import unicodedata
from collections.abc import Iterable, Sequence

__all__ = ["LINE_WIDTH", "MISSING", "grouped", "percent", "printable", "table", "wrapped"]

MISSING = "n/a"
LINE_WIDTH = 96


def wrapped(text: str) -> str:
    """Prose in lines that a terminal can hold."""
    return textwrap.fill(text, LINE_WIDTH)


def printable(text: str) -> str:
    """`text` on one line, with characters that would move the cursor shown as U+FFFD."""
    return "".join(
        letter if letter.isprintable() else " " if letter.isspace() else "\ufffd" for letter in text
    )


def grouped(value: float | None, places: int = 0) -> str:
    """A number with grouped thousands and a true minus sign; ``n/a`` where there is none."""
    if value is None or not math.isfinite(value):
        return MISSING
    text = f"{value:,.{places}f}"
    if text.startswith("-"):
        # A negative number that is shown as zero has no sign.
        text = f"−{text[1:]}" if text.strip("-0.,") else text[1:]
    return text


def percent(value: float | None, places: int = 3) -> str:
    """A rate in per cent, without the sign for it."""
    return grouped(None if value is None else 100.0 * value, places)


def table(headings: Sequence[str], rows: Iterable[Sequence[str]], *, left: int = 1) -> str:
    """A table in columns.

    Parameters
    ----------
    headings : sequence of str
        One a column; a line feed divides a heading into the name and the unit below it.
    rows : iterable of sequences of str
    left : int
        How many columns, from the first, are set flush left; the others are set flush right.

    Returns
    -------
    str
        Without a line feed at the end.
    """
    tall = max(heading.count("\n") for heading in headings) + 1
    parts = [[""] * (tall - 1 - heading.count("\n")) + heading.split("\n") for heading in headings]
    head = [tuple(column[line] for column in parts) for line in range(tall)]
    body = [tuple(row) for row in rows]
    widths = [max(_width(row[number]) for row in (*head, *body)) for number in range(len(headings))]
    rule = "─" * (sum(widths) + 2 * (len(widths) - 1))
    return "\n".join(
        [*(_row(row, widths, left) for row in head), rule, *(_row(row, widths, left) for row in body)]
    )


def _width(text: str) -> int:
    """Columns that a text takes in a terminal."""
    return sum(
        0 if unicodedata.combining(letter) else 2 if unicodedata.east_asian_width(letter) in "WF" else 1
        for letter in text
    )


def _row(cells: Sequence[str], widths: Sequence[int], left: int) -> str:
    """One row of a table."""
    parts = []
    for number, (cell, width) in enumerate(zip(cells, widths, strict=True)):
        space = " " * (width - _width(cell))
        parts.append(cell + space if number < left else space + cell)
    return "  ".join(parts).rstrip()
