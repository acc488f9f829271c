"""The columns by which rows of flows grow, each with its formula.

Amounts in today's money times the growth expected until they are paid are the amounts that are discounted.
What is assumed of inflation stands with `desk.rates.inflation`.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from desk.book import IndexationKind, PricedFlows
from desk.rates.inflation import unknown_years
from desk.report.results.collars import ClassPlace
from desk.report.results.further_columns import FurtherColumn, FurtherColumns
from desk.report.results.growth import Growth
from desk.report.results.plan import Formula
from desk.valuation.indexing import IndexClasses, row_factors

__all__ = ["add_growth", "add_real_payments"]


def add_growth(further: FurtherColumns, flows: PricedFlows, growth: Growth, *, currency: str) -> None:
    """Add the columns of one side; nothing where no row of it grows."""
    if flows.real_amount is None or flows.index_class is None:
        return
    real, of_row = flows.real_amount.tolist(), flows.index_class.tolist()
    places = growth.classes[flows.side]
    inflation = growth.inflation
    rates: list[float | None] = [None] * len(flows)
    if inflation is not None:
        classes = IndexClasses.of(flows.indexations)
        is_linked = (flows.index_class >= 0) & classes.is_linked[flows.index_class]
        ahead = unknown_years(flows.time, lag=classes.lag[flows.index_class])
        zero = inflation.curve.zero(np.where(is_linked, ahead, 0.0)).tolist()
        rates = [rate if linked else None for rate, linked in zip(zero, is_linked.tolist(), strict=True)]
    values = row_factors(
        IndexClasses.of(flows.indexations), flows.index_class, flows.time, inflation=inflation
    ).tolist()
    formulas = {
        number: _Formulas(place, growth, rate_letter=_after(further, 2))
        for number, place in enumerate(places)
    }

    def by_class(
        kind: Callable[[_Formulas, int], str], otherwise: Callable[[int], float]
    ) -> Callable[[int, int], object]:
        def cell(row: int, number: int) -> object:
            own = formulas.get(of_row[number])
            text = "" if own is None else kind(own, row)
            return Formula(text) if text else otherwise(number)

        return cell

    real_letter = further.add(
        FurtherColumn(
            "real_amount", f"Amount in today's money [{currency}]", "input", "money2",
            lambda row, number: real[number], is_summed=True, width=17.0,
        )
    )  # fmt: skip
    further.add(
        FurtherColumn(
            "growth_number", "Growth number [0 = none]", "reported", "whole",
            lambda row, number: places[of_row[number]].number if of_row[number] >= 0 else 0, width=11.0,
        )
    )  # fmt: skip
    further.add(
        FurtherColumn(
            "", "Expected inflation to the index date, continuous [a year]", "input", "rate",
            lambda row, number: rates[number],
        )
    )  # fmt: skip
    factor = further.add(
        FurtherColumn(
            "growth", "Growth until paid", "live", "factor",
            by_class(_Formulas.factor, lambda number: values[number]),
        )
    )  # fmt: skip
    further.amount = lambda row, number: Formula(f"={real_letter}{row}*{factor}{row}")
    if flows.payment is not None:
        paid = flows.paid.tolist()
        further.paid = lambda row, number: Formula(f"=G{row}") if of_row[number] >= 0 else paid[number]
    if inflation is None or not growth.is_live:
        return
    for own in formulas.values():
        own.factor_letter = factor
    moved = further.add(
        FurtherColumn(
            "growth_up", "Growth, +1 basis point of expected inflation", "live", "factor",
            by_class(_Formulas.moved, lambda number: values[number]),
        )
    )  # fmt: skip
    further.add(
        FurtherColumn(
            "inflation_rise",
            f"Rise in value, +1 basis point of expected inflation [{currency}]",
            "live",
            "money2",
            lambda row, number: Formula(f"=K{row}*({moved}{row}/{factor}{row}-1)"),
            is_summed=True,
        )
    )
    further.add(
        FurtherColumn(
            "inflation_years", "Inflation duration [years]", "live", "years",
            by_class(_Formulas.years, lambda number: 0.0),
        )
    )  # fmt: skip


def add_real_payments(further: FurtherColumns, flows: PricedFlows, growth: Growth, *, currency: str) -> None:
    """Add what each row pays in today's money; nothing without expected inflation."""
    if growth.inflation is None:
        return
    rates = growth.inflation.curve.zero(flows.time).tolist()
    paid = "G" if flows.payment is None else "P"
    rate = further.add(
        FurtherColumn(
            "", "Expected inflation to the time of payment, continuous [a year]", "input", "rate",
            lambda row, number: rates[number],
        )
    )  # fmt: skip
    further.add(
        FurtherColumn(
            "real_paid", f"Paid, in today's money [{currency}]", "live", "money2",
            lambda row, number: Formula(f"={paid}{row}*EXP(-{rate}{row}*D{row})"), width=17.0,
        )
    )  # fmt: skip


def _after(further: FurtherColumns, count: int) -> str:
    """Letter of the column that stands `count` after the next one."""
    from desk.report.results.plan import column_letter

    return column_letter(further.first + len(further.columns) + count)


class _Formulas:
    """Formulas of one way to grow, by row of the sheet; empty for what does not move."""

    def __init__(self, place: ClassPlace, growth: Growth, *, rate_letter: str) -> None:
        self.place = place
        self.recent = growth.naming.name("inflation_recent")
        self.volatility = growth.naming.name("inflation_volatility")
        self.rate_letter = rate_letter
        self.factor_letter = ""
        self.is_live = growth.is_live

    def factor(self, row: int) -> str:
        """Growth."""
        own = self.place
        if own.indexation.kind is IndexationKind.RISING:
            return f"=EXP(LN(1+{own.rise})*D{row})"
        if own.indexation.kind is IndexationKind.COLLARED:
            return self._between(row, own.log)
        return self._linked(row, "")

    def moved(self, row: int) -> str:
        """Growth for +1 basis point of expected inflation."""
        own = self.place
        if own.indexation.kind is IndexationKind.RISING:
            return f"={self.factor_letter}{row}"
        if own.indexation.kind is IndexationKind.COLLARED:
            return self._between(row, own.log_up)
        return self._linked(row, f"+basis_point*{self._ahead(row)}")

    def years(self, row: int) -> str:
        """Derivative of the logarithm of growth by expected inflation."""
        own = self.place
        if own.indexation.kind is IndexationKind.RISING:
            return ""
        if own.indexation.kind is IndexationKind.COLLARED:
            text = self._between(row, own.slope)
            return f"={text.removeprefix('=EXP(').removesuffix(')')}"
        if not own.indexation.least:
            return f"={self._ahead(row)}"
        log = self._log(row, "")
        return f"={self._ahead(row)}*NORMSDIST({self._d(row, log)})*EXP({log})/{self.factor_letter}{row}"

    def _ahead(self, row: int) -> str:
        return f"MAX(D{row}-{self.place.lag},0)"

    def _log(self, row: int, move: str) -> str:
        own = f"{self.rate_letter}{row}*{self._ahead(row)}"
        return f"({self.recent}*MIN(D{row},{self.place.lag})+{own}{move})"

    def _deviation(self, row: int) -> str:
        return f"({self.volatility}*SQRT({self._ahead(row)}))"

    def _d(self, row: int, log: str) -> str:
        size = self._deviation(row)
        return f"({log}-LN({self.place.least}))/MAX({size},1E-30)+{size}/2"

    def _linked(self, row: int, move: str) -> str:
        log = self._log(row, move)
        if not self.place.indexation.least:
            return f"=EXP({log})"
        d = self._d(row, log)
        return f"=EXP({log})*NORMSDIST({d})+{self.place.least}*NORMSDIST({self._deviation(row)}-({d}))"

    def _between(self, row: int, area: str) -> str:
        """Straight between whole years of a table."""
        if not area:
            return ""
        whole = f"MIN(INT(D{row}),{self.place.years - 1})"
        low = f"INDEX({area},{whole}+1)"
        return f"=EXP({low}+(D{row}-{whole})*(INDEX({area},{whole}+2)-{low}))"
