"""Prescribed sets of shocks, read from a folder of text tables that a user can put right.

A file holds one set. Lines that begin with ``#`` state ``name: value`` for `Set`, `Source`, `Status`,
`Compounding`, `Usual for` (currencies, ``all`` or ``none``) and `Note`. Then come up to three tables, each
with its headings, in any order:

- ``Shock, Move, Size, Of, Term, Applies to``: one row a move, rows of one shock together. With a name under
  `Of` that is a column of the table of currencies, the size is a factor of the size found there; with the
  name of a figure, that figure is taken off the size.
- ``Currency``, then one column a size.
- ``Figure, Value``.
"""

from __future__ import annotations

import csv
import math
from dataclasses import dataclass, field
from pathlib import Path

from desk.book import Fault, Move, MoveKind, Severity, Shock
from desk.book.shock import ShockSet
from desk.rates.compounding import Compounding

__all__ = ["ShockSets", "chosen_shocks", "read_shock_sets", "symmetric_adjustment"]

_MOST_BYTES = 2_000_000
_MOST_FILES = 200
_ADJUSTMENT = "symmetric adjustment"
_INDEX, _AVERAGE = "equity index", "average of the index"
_ADJUSTMENT_BOUND = 0.10


@dataclass(frozen=True)
class ShockSets:
    """The sets of a folder, as they stand for one currency.

    Attributes
    ----------
    sets : tuple of ShockSet
        By file name.
    faults : tuple of Fault
        What of the files could not be used; their sheet is the file's name.
    """

    sets: tuple[ShockSet, ...]
    faults: tuple[Fault, ...]


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


def read_shock_sets(folder: Path, *, currency: str) -> ShockSets:
    """Read every set of a folder.

    Parameters
    ----------
    folder : Path
        With one ``.csv`` a set.
    currency : str
        For which sizes are wanted.

    Returns
    -------
    ShockSets
        A row that cannot be used is told, and the shock it is of left out; the other shocks stay.
    """
    try:
        paths = sorted(path for path in folder.iterdir() if path.suffix.lower() == ".csv")
    except OSError as error:
        return ShockSets((), (_fault(str(folder), "", f"no folder of shocks: {error.strerror}", "a folder"),))
    sets, faults = [], []
    names: dict[str, str] = {}
    for path in paths[:_MOST_FILES]:
        found = _File(path.name)
        try:
            if path.stat().st_size > _MOST_BYTES:
                raise ValueError(f"more than {_MOST_BYTES:,} bytes")
            text = path.read_text(encoding="utf-8-sig")
            found.take(text)
        except (OSError, ValueError, csv.Error) as error:
            faults.append(_fault(path.name, "", f"no table that can be read: {error}", "text in UTF-8"))
            continue
        made = found.made(currency.strip().upper())
        faults.extend(found.faults)
        if made is None:
            continue
        if made.name.casefold() in names:
            other = names[made.name.casefold()]
            faults.append(_fault(path.name, "", f"a set {made.name!r}, as {other} has", "a name of its own"))
            continue
        names[made.name.casefold()] = path.name
        sets.append(made)
    return ShockSets(tuple(sets), tuple(faults))


def chosen_shocks(
    found: ShockSets, *, asked: tuple[str, ...], currency: str, with_inflation: bool
) -> tuple[tuple[Shock, ...], tuple[Fault, ...]]:
    """The shocks of the sets asked for.

    Parameters
    ----------
    found : ShockSets
    asked : tuple of str
        Names of sets; none for those that are usual for the currency.
    currency : str
        For the wording.
    with_inflation : bool
        Whether the basis states expected inflation: without, a usual set's shocks of it are left out.

    Returns
    -------
    shocks : tuple of Shock
    faults : tuple of Fault
        A set that is not there, or has no sizes for the currency.
    """
    if not asked:
        usual = [shock for own in found.sets if own.is_usual for shock in own.shocks]
        moves_inflation = {
            shock for shock in usual if all(move.kind is MoveKind.INFLATION for move in shock.moves)
        }
        return tuple(shock for shock in usual if with_inflation or shock not in moves_inflation), ()
    by_name = {own.name.casefold(): own for own in found.sets}
    shocks: list[Shock] = []
    faults: list[Fault] = []
    for name in dict.fromkeys(asked):
        own = by_name.get(name.strip().casefold())
        if own is None:
            listed = ", ".join(each.name for each in found.sets) or "none"
            faults.append(
                _fault("Shock settings", "", f"the set {name!r}, which is not there", f"one of: {listed}")
            )
        elif not own.shocks:
            what = (
                f"the set {own.name!r}, which holds figures and no shocks"
                if own.figures
                else f"the set {own.name!r}, which has no sizes for {currency}"
            )
            faults.append(
                _fault(
                    "Shock settings",
                    "",
                    what,
                    "a set that holds shocks for the currency",
                    "It is left out; state shocks of your own in the sheet 'Shocks'.",
                )
            )
        else:
            shocks.extend(own.shocks)
    return tuple(shocks), tuple(faults)


def _fault(
    sheet: str, cell: str, found: str, expected: str, mend: str = "It is left out; mend the file or the name."
) -> Fault:
    return Fault(found, expected, mend, sheet=sheet, cell=cell, severity=Severity.MILD)


@dataclass
class _File:
    """One file on its way to a set."""

    name: str
    stated: dict[str, str] = field(default_factory=dict)
    moves: list[tuple[int, dict[str, str]]] = field(default_factory=list)
    sizes: dict[str, dict[str, float]] = field(default_factory=dict)
    size_names: tuple[str, ...] = ()
    figures: dict[str, float] = field(default_factory=dict)
    faults: list[Fault] = field(default_factory=list)

    def take(self, text: str) -> None:
        """Take in the text of the file."""
        headings: tuple[str, ...] = ()
        reader = csv.reader(text.splitlines())
        for row in reader:
            line = reader.line_num
            cells = [cell.strip() for cell in row]
            if not any(cells):
                continue
            if cells[0].startswith("#"):
                name, colon, value = ",".join(row).lstrip("# ").partition(":")
                if colon:
                    self.stated[name.strip().casefold()] = value.strip()
                continue
            first = cells[0].casefold()
            if first in ("shock", "currency", "figure"):
                headings = tuple(cell.casefold() for cell in cells)
                if first == "currency":
                    self.size_names = tuple(name for name in headings[1:] if name)
                continue
            entry = dict(zip(headings, cells, strict=False))
            kind = headings[0] if headings else ""
            if kind == "shock":
                self.moves.append((line, entry))
            elif kind == "currency":
                sizes = {name: self._number(line, entry.get(name, "")) for name in self.size_names}
                if None not in sizes.values():
                    self.sizes[cells[0].upper()] = {
                        key: size for key, size in sizes.items() if size is not None
                    }
            elif kind == "figure":
                figure = self._number(line, entry.get("value", ""))
                if figure is not None:
                    self.figures[first] = figure
            else:
                self.tell(line, f"{cells[0]!r} before any headings", "Shock, Currency or Figure first")

    def tell(self, line: int, found: str, expected: str) -> None:
        """Tell of a line of the file."""
        self.faults.append(
            _fault(self.name, f"line {line}", found, expected, "It is left out; mend the file.")
        )

    def _number(self, line: int, text: str) -> float | None:
        """A finite number, or None with a fault."""
        try:
            value = float(text)
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
