"""Intake of a large book against the bare read by the library that parses the file.

Run as ``python tests/benchmarks/bench_intake.py [rows]``. Prints the ratio for a clean book and for one
with faults in one row of a hundred; the design asks for at most 2.
"""

from __future__ import annotations

import sys
import tempfile
import time
from collections.abc import Callable
from functools import partial
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from tests.intake.raw_workbook import DATE_STYLE, raw_workbook, sheet_xml

_LINES = [f"Line {number}" for number in range(12)]
_SHARED = [
    *_LINES,
    *("Item", "Value", "Valuation date", "Currency", "EUR", "Curve kind", "zero", "Compounding", "annual"),
    *(
        "Interpolation",
        "log-linear",
        "Liability spread",
        "Term",
        "Rate",
        "Line",
        "Date",
        "Amount",
        "12,5 Mio",
    ),
]


def _text(address: str, text: str) -> str:
    return f'<c r="{address}" t="s"><v>{_SHARED.index(text)}</v></c>'


def make_book(path: Path, rows: int, *, faults: bool) -> Path:
    """A book of `rows` liability rows; with `faults`, one row of a hundred is wrong."""
    rng = np.random.default_rng(20260930)
    line = rng.integers(0, len(_LINES), rows)
    day = rng.integers(46_300, 46_300 + 18_000, rows)
    amount = np.round(rng.gamma(2.0, 5_000.0, rows), 2)
    basis = [
        ("Valuation date", f'<c r="B2" s="{DATE_STYLE}"><v>46295</v></c>'),
        ("Currency", _text("B3", "EUR")),
        ("Curve kind", _text("B4", "zero")),
        ("Compounding", _text("B5", "annual")),
        ("Interpolation", _text("B6", "log-linear")),
        ("Liability spread", '<c r="B7"><v>0</v></c>'),
    ]
    basis_rows = f'<row r="1">{_text("A1", "Item")}{_text("B1", "Value")}</row>' + "".join(
        f'<row r="{number}">{_text(f"A{number}", item)}{cell}</row>'
        for number, (item, cell) in enumerate(basis, start=2)
    )
    curve_rows = f'<row r="1">{_text("A1", "Term")}{_text("B1", "Rate")}</row>' + "".join(
        f'<row r="{number}"><c r="A{number}"><v>{term}</v></c>'
        f'<c r="B{number}"><v>{0.02 + term / 4000}</v></c></row>'
        for number, term in enumerate((1, 2, 5, 10, 20, 30, 60), start=2)
    )
    pieces = [f'<row r="1">{_text("A1", "Line")}{_text("B1", "Date")}{_text("C1", "Amount")}</row>']
    wrong = _SHARED.index("12,5 Mio")
    for row, (name, date, money) in enumerate(zip(line, day, amount, strict=True), start=2):
        cell = f'<c r="C{row}"><v>{money}</v></c>'
        if faults and row % 100 == 0:
            cell = (
                f'<c r="C{row}" t="s"><v>{wrong}</v></c>',
                f'<c r="C{row}" t="e"><v>#N/A</v></c>',
                f'<c r="C{row}"><f>A1*2</f></c>',
                "",
            )[row // 100 % 4]
        pieces.append(
            f'<row r="{row}"><c r="A{row}" t="s"><v>{name}</v></c>'
            f'<c r="B{row}" s="{DATE_STYLE}"><v>{date}</v></c>{cell}</row>'
        )
    return raw_workbook(
        path,
        {
            "Basis": sheet_xml(basis_rows),
            "Curve": sheet_xml(curve_rows),
            "Liabilities": sheet_xml("".join(pieces)),
        },
        shared=_SHARED,
    )


def bare_read(path: Path) -> None:
    from python_calamine import CalamineWorkbook

    workbook = CalamineWorkbook.from_path(path)
    for name in workbook.sheet_names:
        workbook.get_sheet_by_name(name).to_python(skip_empty_area=False)


def seconds(work: Callable[[], object]) -> float:
    start = time.perf_counter()
    work()
    return time.perf_counter() - start


def main(rows: int = 500_000) -> None:
    """Print the ratios, each the median of three turns taken in alternation."""
    from desk.intake.workbook import read_workbook

    with tempfile.TemporaryDirectory() as folder:
        for faults in (False, True):
            path = make_book(Path(folder) / f"faults_{faults}.xlsx", rows, faults=faults)
            bare, whole = [], []
            for _ in range(3):
                bare.append(seconds(partial(bare_read, path)))
                whole.append(seconds(partial(read_workbook, path)))
            count = len(read_workbook(path).faults)
            print(
                f"{rows:,} rows, {count:,} faults: bare read {np.median(bare):.2f} s, "
                f"intake {np.median(whole):.2f} s, ratio {np.median(whole) / np.median(bare):.2f}"
            )


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))
