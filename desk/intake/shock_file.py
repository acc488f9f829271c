"""One prescribed set of shocks as a text table.

Lines that begin with ``#`` state ``name: value`` for `Set`, `Source`, `Status`, `Compounding`, `Usual for`
(currencies, ``all`` or ``none``) and `Note`. Then come up to three tables, each with its headings, in any
order:

- ``Shock, Move, Size, Of, Term, Applies to``: one row a move, rows of one shock together. With a name under
  `Of` that is a column of the table of currencies, the size is a factor of the size found there; with the
  name of a figure, that figure is taken off the size.
- ``Currency``, then one column a size.
- ``Figure, Value``.

A spreadsheet that writes such a file back fills its lines up with separators, and may write semicolons and
decimal commas: both are read.
"""

from __future__ import annotations

import csv
import math
from dataclasses import dataclass, field

from desk.book import Fault, Move, MoveKind, Severity, Shock
from desk.book.shock import ShockSet
from desk.rates.compounding import Compounding

__all__ = ["ShockFile", "shock_file_fault", "symmetric_adjustment"]

_ADJUSTMENT = "symmetric adjustment"
_INDEX, _AVERAGE = "equity index", "average of the index"
_ADJUSTMENT_BOUND = 0.10
_NEEDED = ("shock", "move", "size")


def symmetric_adjustment(index: float, average: float) -> float:
    """Symmetric adjustment of the equity stress.

    Parameters
    ----------
    index : float
        Level of the equity index.
    average : float
        Its average over the last 36 months, above 0.

    Returns
    -------
    float
        ``½ ((index - average) / average - 8 %)``, at most 10 % either way; it is added to the fall.

    References
    ----------
    Commission Delegated Regulation (EU) 2015/35, Article 172.
    """
    if not average > 0.0:
        raise ValueError("`average` must be above 0")
    return max(-_ADJUSTMENT_BOUND, min(_ADJUSTMENT_BOUND, 0.5 * ((index - average) / average - 0.08)))


def shock_file_fault(
    sheet: str, cell: str, found: str, expected: str, mend: str = "It is left out; mend the file or the name."
) -> Fault:
    """A mild fault of a file of shocks, or of what is asked of them."""
    return Fault(found, expected, mend, sheet=sheet, cell=cell, severity=Severity.MILD)


def _separator(lines: list[str]) -> str:
    """A semicolon where the first headings are parted by it, else a comma."""
    first = next((line for line in lines if line.strip(";, ") and not line.lstrip('"').startswith("#")), "")
    return ";" if ";" in first and "," not in first else ","


def _headings(cells: list[str]) -> tuple[str, ...]:
    """The headings of a table, folded; none where the row is no headings."""
    folded = tuple(cell.casefold() for cell in cells)
    is_one = folded[0] in ("shock", "currency", "figure") or {"shock", "move"} <= set(folded)
    return folded if is_one else ()


@dataclass
class ShockFile:
    """One file on its way to a set."""

    name: str
    stated: dict[str, str] = field(default_factory=dict)
    moves: list[tuple[int, dict[str, str]]] = field(default_factory=list)
    sizes: dict[str, dict[str, float]] = field(default_factory=dict)
    size_names: tuple[str, ...] = ()
    figures: dict[str, float] = field(default_factory=dict)
    faults: list[Fault] = field(default_factory=list)
    _has_semicolons: bool = False

    def take(self, text: str) -> None:
        """Take in the text of the file."""
        lines = text.splitlines()
        self._has_semicolons = _separator(lines) == ";"
        headings: tuple[str, ...] = ()
        reader = csv.reader(lines, delimiter=_separator(lines))
        for row in reader:
            line = reader.line_num
            cells = [cell.strip() for cell in row]
            if not any(cells):
                continue
            if cells[0].startswith("#"):
                self._state(row)
                continue
            found = _headings(cells)
            if found:
                headings = found
                if found[0] == "currency":
                    self.size_names = tuple(name for name in found[1:] if name)
                lacking = [name.capitalize() for name in _NEEDED if name not in found]
                if lacking and (found[0] == "shock" or "move" in found):
                    self.tell(line, f"no column {' and no column '.join(lacking)}", "Shock, Move and Size")
                continue
            kind = "shock" if "move" in headings else headings[0] if headings else ""
            entry = dict.fromkeys(headings, "") | dict(zip(headings, cells, strict=False))
            if kind == "shock":
                self._take_move(line, entry)
            elif kind == "currency":
                self._take_sizes(line, cells[0].upper(), entry)
            elif kind == "figure":
                self._take_figure(line, cells[0].casefold(), entry)
            else:
                self.tell(line, f"{cells[0]!r} before any headings", "Shock, Currency or Figure first")

    def _state(self, row: list[str]) -> None:
        """Take in a line that states something about the set."""
        # A spreadsheet writes lines of one length: what follows the text is no part of it.
        while row and not row[-1].strip():
            row = row[:-1]
        name, colon, value = ",".join(row).lstrip("# ").partition(":")
        if colon:
            self.stated[name.strip().casefold()] = value.strip()

    def _take_move(self, line: int, entry: dict[str, str]) -> None:
        if any(name not in entry for name in _NEEDED):
            return
        if not entry["shock"]:
            self.tell(line, "a move of no shock", "the name of a shock under Shock")
            return
        self.moves.append((line, entry))

    def _take_sizes(self, line: int, currency: str, entry: dict[str, str]) -> None:
        sizes = {name: self._number(line, entry.get(name, "")) for name in self.size_names}
        if currency in self.sizes:
            self.tell(line, f"the currency {currency!r} once more", "each currency once")
        elif None not in sizes.values():
            self.sizes[currency] = {key: size for key, size in sizes.items() if size is not None}

    def _take_figure(self, line: int, name: str, entry: dict[str, str]) -> None:
        figure = self._number(line, entry.get("value", ""))
        if name in self.figures:
            self.tell(line, f"the figure {name!r} once more", "each figure once")
        elif figure is not None:
            self.figures[name] = figure

    def tell(self, line: int, found: str, expected: str) -> None:
        """Tell of a line of the file."""
        self.faults.append(
            shock_file_fault(self.name, f"line {line}", found, expected, "It is left out; mend the file.")
        )

    def _number(self, line: int, text: str) -> float | None:
        """A finite number, or None with a fault."""
        plain = text.replace(",", ".") if self._has_semicolons and "." not in text else text
        try:
            value = float(plain)
        except ValueError:
            value = math.nan
        if not math.isfinite(value):
            self.tell(line, f"{text!r}", "a number")
            return None
        return value

    def made(self, currency: str) -> ShockSet | None:
        """The set for a currency; None where the file states none."""
        name = self.stated.get("set", "")
        if not name:
            self.tell(1, "no name of the set", "a line '# Set: NAME'")
            return None
        self._adjust()
        try:
            compounding = Compounding(self.stated.get("compounding", "continuous").casefold())
        except ValueError:
            self.tell(1, f"the compounding {self.stated['compounding']!r}", ", ".join(Compounding))
            return None
        moves: dict[str, list[Move]] = {}
        spoilt: set[str] = set()
        needs_sizes = False
        for line, entry in self.moves:
            of = entry.get("of", "").casefold()
            if of in self.size_names and currency not in self.sizes:
                needs_sizes = True
                spoilt.add(entry["shock"])
                continue
            move = self._move(line, entry, of, currency)
            if move is None:
                spoilt.add(entry["shock"])
            else:
                moves.setdefault(entry["shock"], []).append(move)
        source = self.stated.get("source", "")
        shocks = tuple(
            Shock(shock, tuple(own), source, compounding, name)
            for shock, own in moves.items()
            if shock not in spoilt
        )
        usual = {entry.strip().upper() for entry in self.stated.get("usual for", "all").split(",")}
        return ShockSet(
            name=name,
            source=source,
            status=" ".join(self.stated[key] for key in ("status", "note") if key in self.stated),
            shocks=() if needs_sizes else shocks,
            is_usual="ALL" in usual or currency in usual,
            figures=tuple(self.figures.items()),
            has_sizes_by_currency=bool(self.size_names),
        )

    def _adjust(self) -> None:
        """Put the symmetric adjustment in, from the index where the file states that, within its bounds."""
        if _INDEX in self.figures and _AVERAGE in self.figures:
            try:
                self.figures[_ADJUSTMENT] = symmetric_adjustment(self.figures[_INDEX], self.figures[_AVERAGE])
            except ValueError:
                self.tell(1, f"an average of the index of {self.figures[_AVERAGE]:g}", "a number above 0")
        stated = self.figures.get(_ADJUSTMENT, 0.0)
        if abs(stated) > _ADJUSTMENT_BOUND:
            self.tell(1, f"a symmetric adjustment of {stated:.2%}", "at most 10 % either way")
            self.figures[_ADJUSTMENT] = math.copysign(_ADJUSTMENT_BOUND, stated)

    def _move(self, line: int, entry: dict[str, str], of: str, currency: str) -> Move | None:
        """One row as a move."""
        try:
            kind = MoveKind(entry.get("move", "").casefold())
        except ValueError:
            self.tell(line, f"the move {entry.get('move', '')!r}", ", ".join(MoveKind))
            return None
        size = self._number(line, entry.get("size", ""))
        term_text = entry.get("term", "")
        term = self._number(line, term_text) if term_text else None
        if size is None or (term_text and term is None):
            return None
        if of in self.size_names:
            size *= self.sizes[currency][of]
        elif of in self.figures:
            size -= self.figures[of]
        elif of:
            self.tell(line, f"{of!r} under Of", "a column of the table of currencies, or a figure")
            return None
        try:
            return Move(kind, size, term, entry.get("applies to", ""))
        except ValueError as error:
            self.tell(line, str(error), "a term of at least 0")
            return None
