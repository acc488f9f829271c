"""Makes the demo books: invented funds with invented holdings, shaped like the real ones.

Run as ``python demo_books/make_demo_books.py``; it rewrites the workbooks beside it. Everything is drawn
from seeded generators, so the books come out the same each time.

The promised payments decay with the survivors of a Gompertz law, whose force of mortality at age x is
``exp((x - m) / b) / b`` with modal age m and spread b: of those aged x the part
``exp(-exp((x - m) / b) · (exp(t / b) - 1))`` is alive t years later (Gompertz, B., "On the nature of the
function expressive of the law of human mortality", Philosophical Transactions 115, 1825, in the
parametrisation by the mode that is common practice). Pensions in payment fall with the survivors,
deferred ones start at a later date, and each group spreads over many ages.

The curves, volatilities and spreads are of the size that markets showed in the middle of the 2020s;
none is a quotation. Names of issuers and states are made up.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))
sys.path.insert(1, str(Path(__file__).resolve().parent))

from demo_endowment import small_endowment
from demo_insurer import life_insurer
from demo_pension import pension_fund

from desk.book import Book
from desk.report.book_workbook import write_book
from desk.valuation.standing import stand

__all__ = ["BOOKS", "main"]

BOOKS: dict[str, Callable[[], Book]] = {
    "pension_fund.xlsx": pension_fund,
    "life_insurer.xlsx": life_insurer,
    "small_endowment.xlsx": small_endowment,
}


def main() -> None:
    """Rewrite the workbooks."""
    folder = Path(__file__).resolve().parent
    for name, make in BOOKS.items():
        book = make()

        write_book(book, folder / name)
        standing = stand(book)
        print(
            f"{name}: {len(book.liabilities):,} flows, {len(book.holdings)} holdings, "
            f"funding ratio {standing.funding_ratio:.2%}, duration of assets "
            f"{standing.assets.effective_duration:.2f} and of liabilities "
            f"{standing.liabilities.effective_duration:.2f} years"
        )


if __name__ == "__main__":
    main()
