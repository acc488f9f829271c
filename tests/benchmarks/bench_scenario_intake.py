"""Intake of a large set of scenarios against the bare read by the library that parses the file.

Run as ``python tests/benchmarks/bench_scenario_intake.py [paths] [nodes]``. Prints the ratio for a clean set,
for one with a wrong cell in each of a thousand rows, and for one that is in per cent throughout.
"""

from __future__ import annotations

import sys
import tempfile
from datetime import date
from functools import partial
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from desk.book import Book, FlowTable, ScenarioSet
from desk.book.basis import Basis
from desk.report.book_workbook import write_book
from tests.benchmarks.bench_intake import bare_read, seconds


def make_book(path: Path, paths: int, nodes: int, *, unit: float, wrong: bool) -> Path:
    """A book with a set of scenarios, in the unit given; with `wrong`, one row of a thousand has a slip."""
    rng = np.random.default_rng(20260930)
    rates = unit * np.round(0.02 + 0.01 * rng.standard_normal((paths, nodes)), 6)
    if wrong:
        rates[::1000, nodes // 2] = 5.0
    basis = Basis(date(2026, 9, 30), "EUR", np.array([10.0]), np.array([0.02]))
    flows = FlowTable.build(["Pensions"], [1.0], [1.0])
    book = Book(basis, flows, scenario_set=ScenarioSet(np.arange(1.0, nodes + 1.0), rates))
    return write_book(book, path)


def main(paths: int = 100_000, nodes: int = 100) -> None:
    """Print the ratios, each the median of three turns taken in alternation."""
    from desk.intake.workbook import read_workbook

    with tempfile.TemporaryDirectory() as folder:
        for name, unit, wrong in (("clean", 1.0, False), ("slips", 1.0, True), ("per cent", 100.0, False)):
            path = make_book(Path(folder) / f"{name}.xlsx", paths, nodes, unit=unit, wrong=wrong)
            bare, whole = [], []
            for _ in range(3):
                bare.append(seconds(partial(bare_read, path)))
                whole.append(seconds(partial(read_workbook, path)))
            reading = read_workbook(path)
            print(
                f"{paths:,} paths x {nodes} nodes, {name}: {len(reading.faults):,} faults, "
                f"bare read {np.median(bare):.2f} s, intake {np.median(whole):.2f} s, "
                f"ratio {np.median(whole) / np.median(bare):.2f}"
            )
            if reading.book is None and reading.faults:
                print("   first:", reading.faults[0])


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))
