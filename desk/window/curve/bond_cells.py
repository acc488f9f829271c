"""Bonds of a curve, edited: cells typed over, rows pasted from a spreadsheet, rows added and removed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date
from typing import Any

import numpy as np

from desk.book import CurveBonds
from desk.window.curve.dates import read_dates
from desk.window.parts import numbers

__all__ = [
    "BOND_KEYS",
    "PastedBonds",
    "added",
    "merged_bonds",
    "no_bonds",
    "read_bonds",
    "removed",
    "with_cell",
]

BOND_KEYS = ("name", "maturity", "coupon", "frequency", "price", "price_kind", "yield")
"""Columns of a bond that can be typed and pasted, in their order."""
_HEADINGS = {
    "name": ("name", "bond", "security", "issue", "isin", "description"),
    "maturity": ("maturity", "maturity date", "due", "redemption", "matures"),
    "coupon": ("coupon", "coupon rate", "cpn"),
    "frequency": ("frequency", "coupons a year", "a year", "payments a year", "freq"),
    "price": ("price", "quoted price"),
    "price_kind": ("price kind", "quoted", "clean or dirty", "kind"),
    "yield": ("yield", "yield to maturity", "ytm"),
}
_FIELDS = {
    "maturity": "maturity",
    "coupon": "coupon",
    "frequency": "frequency",
    "price": "price",
    "price_kind": "is_clean",
    "yield": "bond_yield",
}
_FREQUENCY_WORDS = {
    "annual": 1,
    "annually": 1,
    "yearly": 1,
    "semi-annual": 2,
    "semi-annually": 2,
    "half-yearly": 2,
    "quarterly": 4,
    "monthly": 12,
}
_KINDS = {"clean": True, "dirty": False}
_MOST_ROWS = 5_000
_MOST_SHOWN = 6
_LONGEST = 24


@dataclass(frozen=True)
class PastedBonds:
    """What pasted cells hold.

    Attributes
    ----------
    columns : dict of str to list
        By key of `BOND_KEYS`, all of one length; None for a blank cell.
    faults : tuple of str
        Each cell that holds nothing of its column, with its place among the pasted ones.
    """

    columns: dict[str, list[Any]]
    faults: tuple[str, ...]

    @property
    def count(self) -> int:
        """Rows."""
        return max((len(values) for values in self.columns.values()), default=0)

    @property
    def fault(self) -> str:
        """All the faults in one text; empty where there is none."""
        more = len(self.faults) - _MOST_SHOWN
        tail = f" And {more} more." if more > 0 else ""
        return " ".join(self.faults[:_MOST_SHOWN]) + tail


def no_bonds() -> CurveBonds:
    """A sheet without a bond."""
    none = np.zeros(0)
    return CurveBonds(
        (), np.zeros(0, "datetime64[D]"), none, np.zeros(0, np.int64), none, none, np.zeros(0, bool)
    )


def read_bonds(grid: Sequence[Sequence[str]], first: str = "name") -> PastedBonds:
    """Read bonds that were copied from a spreadsheet.

    Parameters
    ----------
    grid : sequence of rows of texts
        A first row of words that names columns gives their order, and columns it does not know are left out.
        Without it the columns are those of `BOND_KEYS` from `first` on. Empty rows are left out. Coupons and
        yields are in percent, prices per 100 of nominal.
    first : str
        Of `BOND_KEYS`: where the first column goes.
    """
    if len(grid) > _MOST_ROWS:
        return PastedBonds({}, (f"There are {numbers.integer(len(grid))} rows: too many for a curve.",))
    places, faults = _places(grid, first)
    has_headings = bool(grid) and _headed(grid[0])
    rows = [
        (number + 1, row)
        for number, row in enumerate(grid)
        if any(cell.strip() for cell in row) and not (number == 0 and has_headings)
    ]
    if faults or not rows:
        return PastedBonds({}, tuple(faults or ["There is no bond among what was pasted."]))
    columns: dict[str, list[Any]] = {}
    found: list[tuple[int, str]] = []
    for key, place in places.items():
        texts = [row[place].strip() if place < len(row) else "" for _, row in rows]
        values, wrong = _read_column(key, texts)
        columns[key] = values
        found += [(number, text) for (number, _), text in zip(rows, wrong, strict=True) if text]
    if has_headings and {"price", "yield"} <= columns.keys():
        _leave_out_what_follows(columns, grid[0], [row for _, row in rows])
    found.sort(key=lambda one: one[0])
    return PastedBonds(columns, tuple(f"Row {number}: {text}." for number, text in found))


def _leave_out_what_follows(
    columns: dict[str, list[Any]], headings: Sequence[str], rows: Sequence[Sequence[str]]
) -> None:
    """Where a column says which of price and yield was given, the other one is taken as blank."""
    place = next((place for place, text in enumerate(headings) if text.strip().casefold() == "given"), None)
    if place is None:
        return
    for number, row in enumerate(rows):
        given = row[place].strip().casefold() if place < len(row) else ""
        other = {"price": "yield", "yield": "price"}.get(given)
        if other is not None and columns[given][number] is not None:
            columns[other][number] = None


def _headed(row: Sequence[str]) -> bool:
    """Whether a row holds headings: two or more that are known, or nothing but known ones."""
    texts = [cell.strip() for cell in row if cell.strip()]
    known = sum(_key_of(text) is not None for text in texts)
    return known >= 2 or (known == len(texts) > 0)


def _key_of(text: str) -> str | None:
    plain = " ".join(text.casefold().split("(")[0].replace("_", " ").split()).rstrip(" %:,")
    return next((key for key, names in _HEADINGS.items() if plain in names), None)


def _places(grid: Sequence[Sequence[str]], first: str) -> tuple[dict[str, int], list[str]]:
    """Which pasted column holds what."""
    if grid and _headed(grid[0]):
        places: dict[str, int] = {}
        for place, text in enumerate(grid[0]):
            key = _key_of(text)
            if key is not None and key in places:
                return {}, [f"Two columns are headed as the {_name(key)}."]
            if key is not None:
                places[key] = place
        return places, []
    keys = BOND_KEYS[BOND_KEYS.index(first) :]
    wide = max((len(row) for row in grid), default=0)
    if wide > len(keys):
        most = ", ".join(_name(key) for key in keys)
        return {}, [f"There are {wide} columns where a row holds at most {len(keys)}: {most}."]
    return {key: place for place, key in enumerate(keys[:wide])}, []


def _name(key: str) -> str:
    return key.replace("_", " ")


def _read_column(key: str, texts: Sequence[str]) -> tuple[list[Any], list[str]]:
    """Values of one column, and what is wrong with each of its cells."""
    if key == "maturity":
        dates, wrong = read_dates(texts)
        return list(dates), wrong
    values: list[Any] = []
    faults = []
    for text in texts:
        value = _read_cell(key, text)
        bad = value is None and bool(text)
        values.append(value)
        faults.append(f"“{text[:_LONGEST]}” is no {_name(key)}{_EXPECTED.get(key, '')}" if bad else "")
    return values, faults


_EXPECTED = {"frequency": " (1, 2, 4 or 12)", "price_kind": " (clean or dirty)", "price": " above 0"}


def _read_cell(key: str, text: str) -> Any:
    if not text:
        return None
    if key == "name":
        return text
    if key == "price_kind":
        return _KINDS.get(text.casefold())
    if key in ("coupon", "yield"):
        return numbers.parse_rate(text)
    if key == "frequency" and text.casefold() in _FREQUENCY_WORDS:
        return _FREQUENCY_WORDS[text.casefold()]
    value = numbers.parse_number(text)
    if key == "frequency":
        return int(value) if value in (1, 2, 4, 12) else None
    return value if value is not None and value > 0.0 else None


def merged_bonds(bonds: CurveBonds, pasted: PastedBonds, start: int) -> tuple[CurveBonds, str]:
    """The bonds with pasted ones over them from row `start` on, and further ones after the last.

    A price that is pasted takes the place of a yield, and a yield that of a price; where both are, the price
    counts. Blank cells leave a bond's figure as it is, and give a new bond what is usual: one coupon a year,
    or as many as the bond before; a clean price.

    Returns
    -------
    bonds : CurveBonds
    fault : str
        Why they do not go in; empty where they do.
    """
    rows = _as_rows(bonds)
    count = pasted.count
    beyond = start + count - len(rows)
    if beyond > 0 and not {"maturity", "coupon"} <= pasted.columns.keys():
        return bonds, "A new bond needs its maturity, its coupon and a price or a yield."
    for number in range(count):
        given = {key: values[number] for key, values in pasted.columns.items() if values[number] is not None}
        place = start + number
        if place >= len(rows):
            missing = [key for key in ("maturity", "coupon") if key not in given]
            if not {"price", "yield"} & given.keys():
                missing.append("price or yield")
            if missing:
                return bonds, f"Row {number + 1}: the {' and the '.join(missing)} of the bond is missing."
            each = rows[-1]["frequency"] if rows else 1
            rows.append({"name": f"Bond {place + 1}", "frequency": each, "price_kind": True})
        _put(rows[place], given)
    return _from_rows(rows), ""


def _put(row: dict[str, Any], given: dict[str, Any]) -> None:
    row.update(given)
    if "price" in given:
        row["yield"] = np.nan
    elif "yield" in given:
        row["price"] = np.nan


def with_cell(bonds: CurveBonds, row: int, key: str, value: Any) -> CurveBonds:
    """The bonds with one cell changed; a price takes the place of a yield and the other way about."""
    rows = _as_rows(bonds)
    _put(rows[row], {key: value})
    return _from_rows(rows)


def added(bonds: CurveBonds, after: int, **cells: Any) -> CurveBonds:
    """The bonds with one more after row `after`."""
    rows = _as_rows(bonds)
    row: dict[str, Any] = {"name": "", "frequency": 1, "price_kind": True}
    _put(row, cells)
    rows.insert(after + 1, row)
    return _from_rows(rows)


def removed(bonds: CurveBonds, rows: Sequence[int]) -> CurveBonds:
    """The bonds without those at `rows`."""
    kept = np.delete(np.arange(len(bonds)), list(rows))
    arrays: dict[str, Any] = {field: getattr(bonds, field)[kept] for field in _FIELDS.values()}
    return replace(bonds, names=tuple(bonds.names[place] for place in kept.tolist()), **arrays)


def _as_rows(bonds: CurveBonds) -> list[dict[str, Any]]:
    return [
        {"name": name, **{key: getattr(bonds, field)[row] for key, field in _FIELDS.items()}}
        for row, name in enumerate(bonds.names)
    ]


def _from_rows(rows: Sequence[dict[str, Any]]) -> CurveBonds:
    def day(value: object) -> np.datetime64:
        if isinstance(value, np.datetime64):
            return np.datetime64(value.item(), "D") if not np.isnat(value) else value
        return np.datetime64(value, "D") if isinstance(value, date) else np.datetime64("NaT", "D")

    return CurveBonds(
        names=tuple(str(row["name"]) for row in rows),
        maturity=np.array([day(row.get("maturity")) for row in rows], "datetime64[D]"),
        coupon=np.array([row.get("coupon", np.nan) for row in rows], np.float64),
        frequency=np.array([row["frequency"] for row in rows], np.int64),
        price=np.array([row.get("price", np.nan) for row in rows], np.float64),
        bond_yield=np.array([row.get("yield", np.nan) for row in rows], np.float64),
        is_clean=np.array([row["price_kind"] for row in rows], bool),
    )
