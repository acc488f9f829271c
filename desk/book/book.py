"""A book: the basis, what is promised, what is held, and how rates move."""

from __future__ import annotations

import hashlib
from collections.abc import Iterator
from dataclasses import dataclass, field, fields, is_dataclass, replace
from datetime import date
from enum import StrEnum
from functools import cached_property
from typing import Any

import numpy as np

from desk.book.basis import Basis
from desk.book.flows import FlowTable
from desk.book.holding import Holding
from desk.book.inflation import LineTerms
from desk.book.market import ScenarioSet, Volatilities, YieldHistory
from desk.book.model import History, RatesModel, RiskyAssets
from desk.book.run import Run
from desk.book.shock import Shock, ShockSettings

__all__ = ["Book", "Notes"]

NoteValue = str | float | None


@dataclass(frozen=True)
class Notes:
    """Further columns of one sheet, kept as they stand.

    Attributes
    ----------
    sheet : str
        Name of the sheet.
    headings : tuple of str
    rows : tuple of tuple
        One entry a data row of the sheet, in its order, each with one value a heading.
    """

    sheet: str
    headings: tuple[str, ...]
    rows: tuple[tuple[NoteValue, ...], ...]


@dataclass(frozen=True)
class Book:
    """A book.

    Attributes
    ----------
    basis : Basis
    liabilities : FlowTable
    holdings : tuple of Holding
    asset_flows : FlowTable
        Ready-made flows on the asset side.
    rates_model : RatesModel or None
    risky_assets : RiskyAssets or None
    run : Run
    history : History or None
    notes : tuple of Notes
        Further columns, by sheet.
    line_terms : tuple of LineTerms
        At most one a line of flows of either side; a line without is fixed, on the basis.
    second_basis : Basis or None
        A basis to compare the first one with, of the same date, currency and day count.
    shocks : tuple of Shock
        The user's own.
    shock_settings : ShockSettings
    volatilities : Volatilities or None
    yield_history : YieldHistory or None
    scenario_set : ScenarioSet or None
    """

    basis: Basis
    liabilities: FlowTable
    holdings: tuple[Holding, ...] = ()
    asset_flows: FlowTable = field(default_factory=FlowTable.empty)
    rates_model: RatesModel | None = None
    risky_assets: RiskyAssets | None = None
    run: Run = field(default_factory=Run)
    history: History | None = None
    notes: tuple[Notes, ...] = ()
    line_terms: tuple[LineTerms, ...] = ()
    second_basis: Basis | None = None
    shocks: tuple[Shock, ...] = ()
    shock_settings: ShockSettings = field(default_factory=ShockSettings)
    volatilities: Volatilities | None = None
    yield_history: YieldHistory | None = None
    scenario_set: ScenarioSet | None = None

    @cached_property
    def on_second_basis(self) -> Book | None:
        """The book as it stands on its second basis alone; None where it has none."""
        if self.second_basis is None:
            return None
        return replace(self, basis=self.second_basis, second_basis=None)

    @cached_property
    def digest(self) -> str:
        """SHA-256 of everything in the book, hexadecimal: equal books have equal digests."""
        digest = hashlib.sha256()
        for piece in _pieces(self):
            digest.update(len(piece).to_bytes(8, "little"))
            digest.update(piece)
        return digest.hexdigest()


def _pieces(value: Any) -> Iterator[bytes]:
    """The contents of a record as bytes, in the order of its fields."""
    if is_dataclass(value):
        yield type(value).__name__.encode()
        for item in fields(value):
            yield item.name.encode()
            yield from _pieces(getattr(value, item.name))
    elif isinstance(value, np.ndarray):
        yield repr((value.dtype.str, value.shape)).encode()
        yield value.tobytes()
    elif isinstance(value, tuple) and value and all(type(entry) is Holding for entry in value):
        yield from _holding_pieces(value)
    elif isinstance(value, tuple):
        yield f"tuple {len(value)}".encode()
        for entry in value:
            yield from _pieces(entry)
    elif isinstance(value, (int, float)) and not isinstance(value, bool) and float(value) == value:
        yield repr(float(value)).encode()  # 5 and 5.0 are equal, and so are books that hold them
    else:
        yield repr(value).encode()


def _holding_pieces(holdings: tuple[Holding, ...]) -> Iterator[bytes]:
    """The contents of holdings by column: there may be many, and a column is quick to write."""
    yield f"holdings {len(holdings)}".encode()
    for item in fields(Holding):
        column = [getattr(holding, item.name) for holding in holdings]
        yield item.name.encode()
        types = set(map(type, column)) - {type(None)}
        if types <= {float, int} and _fit_floats(column, types):
            yield np.array([entry is None for entry in column], dtype=np.bool_).tobytes()
            yield (np.array(column, dtype=np.float64) + 0.0).tobytes()  # a negative zero equals zero
        elif types == {date}:
            days = [0 if entry is None else entry.toordinal() for entry in column]
            yield np.array(days, dtype=np.int64).tobytes()
        elif len(types) == 1 and issubclass(next(iter(types)), StrEnum):
            yield "\n".join("" if entry is None else entry for entry in column).encode()
        else:
            yield repr(column).encode()


def _fit_floats(column: list[float | None], types: set[type]) -> bool:
    """Whether every whole number of a column is a float too."""
    if int not in types:
        return True
    return all(not isinstance(entry, int) or abs(entry) <= 2**53 for entry in column)
