"""A streaming look at the XML of a workbook for what the parser of its values does not tell.

Error cells, formulas whose result was never stored, hidden rows and columns. The cells themselves are not
read again: where nothing of the kind occurs, a sheet costs little more than its unpacking.

References
----------
ECMA-376 part 1, Office Open XML File Formats: 18.3.1.4 (c), 18.3.1.13 (col), 18.3.1.40 (f), 18.3.1.73 (row).
"""

from __future__ import annotations

import posixpath
import re
import zipfile
from collections.abc import Iterator
from pathlib import Path
from typing import IO
from xml.parsers import expat

from desk.intake.scan_events import Facts, ScanFailed, elements, scan_by_events

__all__ = ["extents", "scan_workbook"]

_CHUNK = 1 << 20
_LONGEST_ROW = 64 << 20
_LARGEST_INDEX = 16 << 20
_ADDRESS = re.compile(rb"""\br=["']([A-Z]{1,3})([0-9]{1,7})["']""")
_ROW_NUMBER = re.compile(rb"""\br=["']([0-9]{1,7})["']""")
_HIDDEN = re.compile(rb"""\bhidden=["'](?:1|true)["']""")
_FIRST_CELL = re.compile(rb"<c[\s>/][^>]*>?")
_ATTRIBUTE = re.compile(rb"""\b(min|max)=["']([0-9]+)["']""")
_VALUE = re.compile(rb"<v(?:\s[^>]*)?>([^<]*)</v>")
_TEXT_RESULT = re.compile(rb"""\bt=["']str["']""")
_PLACES = re.compile(rb"""\br=["']([A-Z]{1,3})([0-9]{1,7})["']""")


class _Unusual(Exception):
    """A sheet that is written in an unusual way: it is left to the slower, general reader."""


def scan_workbook(path: Path) -> dict[str, dict[str, list[tuple[int, ...] | tuple[int, int, str]]]]:
    """The facts of each sheet of an ``.xlsx`` or ``.xlsm`` file, by the sheet's name.

    Returns
    -------
    dict
        For each sheet ``errors`` (row, column, code), ``unvalued`` (row, column), ``hidden_rows`` and
        ``hidden_columns`` (first, last); rows and columns are 0-based. A sheet that could not be scanned
        has a ``failed`` entry with the reason.

    Raises
    ------
    ScanFailed
        If the list of the sheets cannot be read.
    """
    found = {}
    with zipfile.ZipFile(path) as package:
        for name, part in _sheet_parts(package):
            facts = Facts()
            try:
                try:
                    with package.open(part) as stream:
                        _scan_plain(stream, facts)
                except _Unusual:
                    facts = Facts()
                    with package.open(part) as stream:
                        scan_by_events(stream, facts)
            except (ScanFailed, KeyError, zipfile.BadZipFile, EOFError, expat.ExpatError) as error:
                facts.failed = str(error) or type(error).__name__
            found[name] = facts.as_dict()
    return found


def extents(path: Path) -> dict[str, tuple[int, int, str]]:
    """For each sheet the number of rows and columns its cells span, and the address of its furthest cell."""
    found = {}
    with zipfile.ZipFile(path) as package:
        for name, part in _sheet_parts(package):
            last_row = last_column = 0
            furthest = "A1"
            with package.open(part) as stream:
                for block in _blocks(stream, b""):
                    for letters, digits in _PLACES.findall(block):
                        row, column = int(digits), _column_number(letters)
                        if row > last_row or column > last_column:
                            last_row, last_column = max(row, last_row), max(column, last_column)
                            furthest = (letters + digits).decode("ascii")
            found[name] = (last_row, last_column, furthest)
    return found


def _sheet_parts(package: zipfile.ZipFile) -> list[tuple[str, str]]:
    """Name and part of each worksheet, found through the package's relationships."""
    try:
        main = _targets(package, "_rels/.rels", "")
        book = next(target for kind, target in main.values() if kind.endswith("/officeDocument"))
        folder, file = posixpath.split(book)
        parts = _targets(package, f"{folder}/_rels/{file}.rels", folder)
        sheets = []
        for name, attributes in elements(_index(package, book)):
            if name != "sheet":
                continue
            kind, target = parts[attributes["id"]]
            if kind.endswith("/worksheet"):
                sheets.append((attributes["name"], target))
    except (KeyError, StopIteration, expat.ExpatError) as error:
        raise ScanFailed(f"the list of its sheets cannot be read: {error}") from error
    return sheets


def _targets(package: zipfile.ZipFile, part: str, folder: str) -> dict[str, tuple[str, str]]:
    """Kind and part of each relationship, by its identifier."""
    return {
        attributes["Id"]: (
            attributes["Type"],
            posixpath.normpath(posixpath.join("/" + folder, attributes["Target"])).lstrip("/"),
        )
        for name, attributes in elements(_index(package, part))
        if name == "Relationship"
    }


def _index(package: zipfile.ZipFile, part: str) -> bytes:
    if package.getinfo(part).file_size > _LARGEST_INDEX:
        raise ScanFailed(f"{part} is too long")
    return package.read(part)


def _blocks(stream: IO[bytes], start: bytes) -> Iterator[bytes]:
    """The rest of a sheet in pieces that end where a row ends."""
    kept = start
    while chunk := stream.read(_CHUNK):
        kept += chunk
        end = kept.rfind(b"</row>")
        if end >= 0:
            yield kept[: end + 6]
            kept = kept[end + 6 :]
        elif len(kept) > _LONGEST_ROW:
            raise ScanFailed("a row is too long")
    if kept:
        yield kept


def _scan_plain(stream: IO[bytes], facts: Facts) -> None:
    """Scan a sheet as nearly all programs write it: UTF-8, no prefix, an address in every cell."""
    head = b""
    while b"<sheetData" not in head:
        chunk = stream.read(_CHUNK)
        head += chunk
        if not chunk or len(head) > _LONGEST_ROW:
            raise _Unusual
    before, _, rest = head.partition(b"<sheetData")
    if b"<worksheet" not in before or b"<!" in before:
        raise _Unusual
    for tag in re.findall(rb"<col\s[^>]*>", before):
        if _HIDDEN.search(tag):
            bounds = {name: int(number) for name, number in _ATTRIBUTE.findall(tag)}
            facts.hide_columns(bounds[b"min"] - 1, bounds[b"max"] - 1)
    addressed = False
    for block in _blocks(stream, rest):
        if not addressed and (cell := _FIRST_CELL.search(block)):
            if not _ADDRESS.search(cell.group()):
                raise _Unusual
            addressed = True
        if b"<!" in block:
            raise _Unusual
        _errors(block, facts)
        _formulas(block, facts)
        _hidden_rows(block, facts)


def _tag_around(block: bytes, place: int) -> bytes:
    """The tag that `place` lies in."""
    return block[block.rfind(b"<", 0, place) : block.find(b">", place) + 1]


def _place_of(tag: bytes) -> tuple[int, int]:
    """0-based row and column of a cell's tag."""
    match = _ADDRESS.search(tag)
    if match is None:
        raise _Unusual
    return int(match.group(2)) - 1, _column_number(match.group(1)) - 1


def _column_number(letters: bytes) -> int:
    number = 0
    for letter in letters:
        number = number * 26 + letter - 64
    return number


def _errors(block: bytes, facts: Facts) -> None:
    for mark in (b't="e"', b"t='e'"):
        place = block.find(mark)
        while place >= 0:
            tag = _tag_around(block, place)
            if tag.startswith(b"<c "):
                value = _VALUE.search(block, place, block.find(b"</c>", place))
                row, column = _place_of(tag)
                facts.add_error(row, column, value.group(1).decode("utf-8", "replace") if value else "")
            place = block.find(mark, place + 1)


def _formulas(block: bytes, facts: Facts) -> None:
    place = block.find(b"<f")
    while place >= 0:
        following = place + 2
        if block[following : following + 1] in (b">", b" ", b"/"):
            start = block.rfind(b"<c", 0, place)
            end = block.find(b"</c>", place)
            tag = block[start : block.find(b">", start) + 1]
            if start >= 0 and end >= 0:
                value = _VALUE.search(block, place, end)
                has_text = b"<v" in block[place:end] and _TEXT_RESULT.search(tag)
                if (value is None or not value.group(1)) and not has_text and b"<is" not in block[place:end]:
                    facts.add_unvalued(*_place_of(tag))
                following = end
        place = block.find(b"<f", following)


def _hidden_rows(block: bytes, facts: Facts) -> None:
    place = block.find(b"hidden=")
    while place >= 0:
        tag = _tag_around(block, place)
        if tag.startswith(b"<row") and _HIDDEN.search(tag):
            number = _ROW_NUMBER.search(tag)
            if number is None:
                raise _Unusual
            facts.hide_row(int(number.group(1)) - 1)
        place = block.find(b"hidden=", place + 1)
