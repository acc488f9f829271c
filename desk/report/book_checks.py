"""What a workbook does not hold as it is, refused before anything is written."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence

from desk.book import Basis, Book, Indexation, Notes
from desk.intake.sheets import SHEETS, find_known, fold, heading_years, looks_like_years
from desk.report.safe_cells import clean_text

__all__ = ["check_book"]

_LARGEST_WHOLE = 2**53
"""Beyond this a cell, which holds a float, does not hold every whole number."""


def check_book(book: Book) -> None:
    """Refuse what would not come back as it is.

    Raises
    ------
    ValueError
        If a name, a note or a number is one that the workbook does not hold.
    """
    for what, names in _names(book):
        for name in names:
            if not name.strip():
                raise ValueError(f"a workbook holds no {what} without a name")
            if clean_text(name) != name:
                raise ValueError(f"a workbook does not hold the name of the {what} {name[:40]!r} as it is")
    for what, texts in _texts(book):
        for text in texts:
            if text and (not text.strip() or clean_text(text) != text):
                raise ValueError(f"a workbook does not hold the {what} {text[:40]!r} as it is")
    assets = () if book.risky_assets is None else book.risky_assets.names
    for name in assets:
        if find_known(name, SHEETS["Risky assets"].columns) is not None:
            raise ValueError(f"no asset can be called {name!r}: the sheet has a heading of that name")
    if len(set(map(fold, assets))) != len(assets):
        raise ValueError("the names of the assets must differ by more than case and blanks")
    for notes in book.notes:
        _check_notes(notes, assets)
    if book.run.seed > _LARGEST_WHOLE:
        raise ValueError(f"a workbook holds no seed above {_LARGEST_WHOLE}")
    _check_shocks(book)
    for terms in book.line_terms:
        usual = Indexation()
        if (terms.indexation.lag, terms.indexation.least) != (usual.lag, usual.least):
            raise ValueError(f"a workbook holds no lag and no least growth of the line {terms.line[:40]!r}")


def _names(book: Book) -> Iterator[tuple[str, Iterable[str]]]:
    """What must have a name, with the names."""
    yield "line", book.liabilities.line_names
    yield "line", book.asset_flows.line_names
    yield "line", [terms.line for terms in book.line_terms]
    yield "holding", [holding.name for holding in book.holdings]
    yield "asset", () if book.risky_assets is None else book.risky_assets.names
    yield "shock", [shock.name for shock in book.shocks]
    yield "set of shocks", book.shock_settings.sets


def _texts(book: Book) -> Iterator[tuple[str, Iterable[str]]]:
    """Texts that may be empty, with what they are."""
    for basis in filter(None, (book.basis, book.second_basis)):
        yield "name of the bond", _bond_names(basis)
    yield "source", [shock.source for shock in book.shocks]
    yield "set", [shock.set_name for shock in book.shocks]
    yield "name", [move.target for shock in book.shocks for move in shock.moves]


def _bond_names(basis: Basis) -> Iterator[str]:
    for bonds in filter(None, (basis.bonds, basis.liability_bonds)):
        yield from bonds.names


def _check_shocks(book: Book) -> None:
    """Refuse shocks that would come back as others."""
    names = [shock.name for shock in book.shocks]
    if len(set(names)) != len(names):
        raise ValueError("a workbook tells shocks apart by their names: each must have one of its own")
    for name in book.shock_settings.sets:
        if ";" in name or name.strip() != name:
            raise ValueError(f"a workbook does not hold the name of the set {name[:40]!r} as it is")


def _check_notes(notes: Notes, assets: Sequence[str]) -> None:
    """Refuse notes that would be taken for something else."""
    layout = SHEETS.get(notes.sheet)
    if layout is None:
        raise ValueError(f"a book workbook has no sheet {notes.sheet!r} for notes")
    for heading in notes.headings[1:] if layout.items else notes.headings:
        if not heading or heading.strip() != heading or clean_text(heading) != heading:
            raise ValueError(f"a workbook does not hold the heading {heading[:40]!r} as it is")
        taken = layout.more and fold(heading) in map(fold, assets)
        if layout.years and (heading_years(heading) is not None or looks_like_years(heading)):
            taken = True
        if taken or find_known(heading, layout.columns) is not None:
            raise ValueError(
                f"no note can have the heading {heading[:40]!r}: the sheet has a column of that name"
            )
