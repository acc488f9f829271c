"""What a scan finds, and the general scan by an XML parser's events."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import IO, Any
from xml.parsers import expat

__all__ = ["Facts", "ScanFailed", "elements", "scan_by_events"]

_MOST_FACTS = 3_000_000


class ScanFailed(Exception):
    """A sheet that cannot be scanned; its values may stand all the same."""


@dataclass
class Facts:
    """What a scan of one sheet found; rows and columns are 0-based, runs have a first and a last."""

    errors: list[tuple[int, int, str]] = field(default_factory=list)
    unvalued: list[tuple[int, int]] = field(default_factory=list)
    hidden_rows: list[tuple[int, int]] = field(default_factory=list)
    hidden_columns: list[tuple[int, int]] = field(default_factory=list)
    failed: str = ""

    def add_error(self, row: int, column: int, code: str) -> None:
        """Note an error cell."""
        self.errors.append((row, column, code[:20]))
        self._bound()

    def add_unvalued(self, row: int, column: int) -> None:
        """Note a formula whose result is not stored."""
        self.unvalued.append((row, column))
        self._bound()

    def hide_row(self, row: int) -> None:
        """Note a hidden row, joining it to the run before."""
        if self.hidden_rows and self.hidden_rows[-1][1] == row - 1:
            self.hidden_rows[-1] = (self.hidden_rows[-1][0], row)
        else:
            self.hidden_rows.append((row, row))
            self._bound()

    def hide_columns(self, first: int, last: int) -> None:
        """Note a run of hidden columns."""
        self.hidden_columns.append((first, last))
        self._bound()

    def _bound(self) -> None:
        if (
            len(self.errors) + len(self.unvalued) + len(self.hidden_rows) + len(self.hidden_columns)
            > _MOST_FACTS
        ):
            raise ScanFailed("it holds too many errors, formulas without values or hidden rows to be listed")

    def as_dict(self) -> dict[str, Any]:
        """The facts as plain values, for another process."""
        return {
            "errors": self.errors,
            "unvalued": self.unvalued,
            "hidden_rows": self.hidden_rows,
            "hidden_columns": self.hidden_columns,
            "failed": self.failed,
        }


def _parser() -> expat.XMLParserType:
    parser = expat.ParserCreate()

    def refuse(*_: object) -> None:
        raise ScanFailed("it declares a document type")

    # A document type is where entities come from, and entities are how a small file grows without bound.
    parser.StartDoctypeDeclHandler = refuse
    parser.buffer_text = True
    return parser


def _local(name: str) -> str:
    return name.rpartition(":")[2]


def elements(document: bytes) -> list[tuple[str, dict[str, str]]]:
    """Name and attributes of every element, without prefixes."""
    found: list[tuple[str, dict[str, str]]] = []

    def start(name: str, attributes: dict[str, str]) -> None:
        found.append((_local(name), {_local(key): value for key, value in attributes.items()}))

    parser = _parser()
    parser.StartElementHandler = start
    parser.Parse(document, True)
    return found


def scan_by_events(stream: IO[bytes], facts: Facts) -> None:
    """Scan a sheet however it is written: prefixes, any encoding, cells without addresses."""
    scan = _EventScan(facts)
    parser = _parser()
    parser.StartElementHandler = scan.start
    parser.EndElementHandler = scan.end
    parser.CharacterDataHandler = scan.text
    parser.ParseFile(stream)


class _EventScan:
    """The state of a scan by events."""

    def __init__(self, facts: Facts) -> None:
        self._facts = facts
        self._row = -1
        self._column = -1
        self._kind = ""
        self._has_formula = False
        self._has_value = False
        self._in_value = False
        self._value = ""

    def start(self, tag: str, attributes: dict[str, str]) -> None:
        """An element begins."""
        name = _local(tag)
        if name == "c":
            place = attributes.get("r", "")
            letters = place.rstrip("0123456789")
            if letters:
                self._column = _column_index(letters)
            else:
                self._column += 1
            self._kind = attributes.get("t", "n")
            self._has_formula = self._has_value = False
            self._value = ""
        elif name == "v":
            self._in_value = self._has_value = True
        elif name == "f":
            self._has_formula = True
        elif name == "is":
            self._has_value, self._value = True, "text"
        elif name == "row":
            self._row = int(attributes["r"]) - 1 if "r" in attributes else self._row + 1
            self._column = -1
            if attributes.get("hidden") in ("1", "true"):
                self._facts.hide_row(self._row)
        elif name == "col" and attributes.get("hidden") in ("1", "true"):
            self._facts.hide_columns(int(attributes["min"]) - 1, int(attributes["max"]) - 1)

    def text(self, data: str) -> None:
        """Text within an element."""
        if self._in_value and len(self._value) < 64:
            self._value += data

    def end(self, tag: str) -> None:
        """An element ends."""
        name = _local(tag)
        if name == "v":
            self._in_value = False
        elif name == "c":
            if self._kind == "e":
                self._facts.add_error(self._row, self._column, self._value)
            elif self._has_formula and not self._value and not (self._has_value and self._kind == "str"):
                self._facts.add_unvalued(self._row, self._column)


def _column_index(letters: str) -> int:
    number = 0
    for letter in letters.upper():
        number = number * 26 + ord(letter) - 64
    return number - 1
