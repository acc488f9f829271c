"""Cells and files that every workbook writer makes the same way.

A text never becomes a formula or an error, a number comes back bit for bit, and a file is written
whole or not at all.
"""

from __future__ import annotations

import math
import os
import re
import secrets
import stat
import time
from collections.abc import Callable
from contextlib import suppress
from datetime import date, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from openpyxl.cell import Cell

__all__ = [
    "CUT_MARK",
    "DATE_FORMAT",
    "LONGEST_TEXT",
    "NOT_A_NUMBER",
    "clean_text",
    "exact_number",
    "looks_like_formula",
    "put",
    "put_date",
    "put_number",
    "put_text",
    "stored_text",
    "write_whole",
]

LONGEST_TEXT = 32_767
"""Characters (UTF-16 units) that a cell can hold."""

CUT_MARK = " […]"
"""Ends a text that was too long for a cell."""

NOT_A_NUMBER = "n/a"
"""Stands where a number is not finite."""

DATE_FORMAT = "yyyy-mm-dd"

_REPLACEMENT = "\N{REPLACEMENT CHARACTER}"
# What XML 1.0, section 2.2, keeps out of a document: most control characters, surrogates, non-characters.
_FORBIDDEN = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff]")
# A spreadsheet reads _x0041_ in a text as the character U+0041 (ECMA-376 part 1, 22.9.2.19, ST_Xstring).
_ESCAPE_LIKE = re.compile("_(?=x[0-9A-Fa-f]{4}_)")
_NEIGHBOUR = re.compile(r"[0-9a-f]{12}\.part")
_FORSAKEN_SECONDS = 3600.0
"""No file takes so long to write: a neighbour that is older has nobody who writes it."""
_SUSPECT_START = tuple("=+-@#'\t\n＝＋－＠")


def clean_text(text: str) -> str:
    """`text` as a cell can hold it.

    Line ends become line feeds, characters that XML forbids become U+FFFD, and a text that is too long
    is cut and ends in `CUT_MARK`.
    """
    if "\r" in text:
        text = text.replace("\r\n", "\n").replace("\r", "\n")
    text = _FORBIDDEN.sub(_REPLACEMENT, text)
    if 2 * len(_escaped(text)) > LONGEST_TEXT and _cell_length(text) > LONGEST_TEXT:
        room = LONGEST_TEXT - len(CUT_MARK)
        text = text[:room]
        while _cell_length(text) > room:
            text = text[: -max(1, (_cell_length(text) - room) // 7)]
        text += CUT_MARK
    return text


def stored_text(text: str) -> str:
    """`text` cleaned and written so that a spreadsheet reads it as it stands."""
    return _escaped(clean_text(text))


def looks_like_formula(text: str) -> bool:
    """Whether a spreadsheet might take `text` for a formula, an error or a command when it is typed again."""
    return text.startswith(_SUSPECT_START)


def exact_number(value: float) -> str:
    """The shortest decimal that reads in again as the same float. Raises ValueError if it is not finite."""
    number = float(value)
    if not math.isfinite(number):
        raise ValueError(f"a workbook holds no number that is {number}")
    exact = repr(number)
    return exact[:-2] if exact.endswith(".0") and number != 0 else exact


def put_text(cell: Cell, text: str, *, number_format: str | None = None) -> Cell:
    """Put `text` into `cell` as text, whatever it begins with, and return the cell.

    Raises
    ------
    TypeError
        If `text` is not a str.
    """
    if not isinstance(text, str):
        raise TypeError(f"`text` must be a str, not {type(text).__name__}")
    cell.value = stored_text(text)
    cell.data_type = "s"
    if looks_like_formula(text):
        cell.quotePrefix = True
    if number_format is not None:
        cell.number_format = number_format
    return cell


def put_number(cell: Cell, value: float, *, number_format: str | None = None) -> Cell:
    """Put a number into `cell` so that it reads in again bit for bit, and return the cell.

    What is not finite becomes the text `NOT_A_NUMBER`. openpyxl rounds a float to 16 digits; a text
    declared to be a number it writes as it stands, so the shortest exact decimal is handed over.
    """
    number = float(value)
    if not np.isfinite(number):
        return put_text(cell, NOT_A_NUMBER)
    cell.value = exact_number(number)
    cell.data_type = "n"
    if number_format is not None:
        cell.number_format = number_format
    return cell


def put_date(cell: Cell, value: date | np.datetime64, *, number_format: str = DATE_FORMAT) -> Cell:
    """Put a date into `cell` and return the cell; NaT leaves it empty.

    Raises
    ------
    ValueError
        If the date is before 1 March 1900: a spreadsheet's calendar is not sound before that day.
    """
    if isinstance(value, np.datetime64):
        if np.isnat(value):
            return cell
        value = value.astype("datetime64[D]").item()
    if isinstance(value, datetime):
        value = value.date()
    if not isinstance(value, date) or value < date(1900, 3, 1):
        raise ValueError(f"a workbook holds no date before 1900-03-01: {value}")
    cell.value = value
    cell.number_format = number_format
    return cell


def put(cell: Cell, value: Any, *, number_format: str | None = None) -> Cell:
    """Put a text, truth value, number, date or nothing into `cell`, each by its own rule."""
    if value is None:
        return cell
    if isinstance(value, bool | np.bool_):
        cell.value = bool(value)
        return cell
    if isinstance(value, str):
        return put_text(cell, value, number_format=number_format)
    if isinstance(value, date | np.datetime64):
        return put_date(cell, value, number_format=number_format or DATE_FORMAT)
    return put_number(cell, value, number_format=number_format)


def write_whole(path: Path, writer: Callable[[Path], object]) -> Path:
    """Write a file whole or not at all.

    Parameters
    ----------
    path : Path
        The file to be written; a former one keeps its permissions and stands untouched until the
        new one is complete and flushed to the disk.
    writer : callable
        Called with the path of a neighbour file, which it fills.

    Returns
    -------
    Path
        `path`.

    Raises
    ------
    OSError
        If the file cannot be written. Whatever is raised, the neighbour file is removed first.
    """
    target = Path(path).resolve()
    if target.is_dir():
        raise IsADirectoryError(f"{path} is a folder")
    former = target.stat() if target.exists() else None
    if former is not None and not os.access(target, os.W_OK):
        raise PermissionError(f"{path} must not be written to")
    _remove_forsaken(target)
    neighbour = target.with_name(f"{_neighbour_prefix(target)}{secrets.token_hex(6)}.part")
    os.close(os.open(neighbour, os.O_CREAT | os.O_EXCL | os.O_WRONLY, 0o666))
    try:
        writer(neighbour)
        with open(neighbour, "rb+") as written:
            os.fsync(written.fileno())
        if former is not None:
            neighbour.chmod(stat.S_IMODE(former.st_mode))
        os.replace(neighbour, target)
    except BaseException:
        with suppress(OSError):
            neighbour.unlink()
        raise
    _flush_folder(target.parent)
    return path


def _neighbour_prefix(target: Path) -> str:
    """How the names of a file's neighbours begin."""
    return f".{target.name[:100]}."


def _remove_forsaken(target: Path) -> None:
    """Remove neighbours of `target` that a process left when it was killed or the power went."""
    prefix = _neighbour_prefix(target)
    with suppress(OSError):
        for entry in list(os.scandir(target.parent)):
            if not entry.name.startswith(prefix) or not _NEIGHBOUR.fullmatch(entry.name[len(prefix) :]):
                continue
            with suppress(OSError):
                if time.time() - entry.stat(follow_symlinks=False).st_mtime > _FORSAKEN_SECONDS:
                    os.unlink(entry.path)


def _flush_folder(folder: Path) -> None:
    """Flush the new name to the disk where the platform can; the file itself is flushed already."""
    if os.name != "posix":
        return
    with suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _escaped(text: str) -> str:
    """`text` with an underscore that would begin an escape written as an escape itself."""
    return _ESCAPE_LIKE.sub("_x005F_", text) if "_x" in text else text


def _cell_length(text: str) -> int:
    """UTF-16 units of `text` as it is written."""
    return len(_escaped(text).encode("utf-16-le")) // 2
