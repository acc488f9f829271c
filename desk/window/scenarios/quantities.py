"""What a run sums up by year, as the station shows it."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from desk.book.arrays import FloatArray
from desk.scenarios.drawn_paths import DrawnPaths
from desk.scenarios.records import ClosedForm, NodeSummary, Simulation
from desk.scenarios.tail_readings import Law, law_of_account, law_of_rate
from desk.window.parts import numbers
from desk.window.parts.tables import Kind

__all__ = ["Quantity", "quantities_of", "year_name"]


_LONG_NAME = 28


@dataclass(frozen=True, eq=False)
class Quantity:
    """One quantity of a run.

    Attributes
    ----------
    key : str
        ``account``, ``rate``, ``index``, ``total`` or ``asset 0`` and so on.
    title, heading : str
        What it is called, and what a picture says of it.
    axis, unit : str
        Of the axis of its values.
    kind : str
        ``number``, ``rate`` or ``money``.
    digits : int
    summary : NodeSummary
    closed : ClosedForm or None
        Lognormal, by year.
    """

    key: str
    title: str
    heading: str
    axis: str
    unit: str
    kind: Kind
    digits: int
    summary: NodeSummary
    closed: ClosedForm | None

    @property
    def short_title(self) -> str:
        """The title, cut where it would fill a picture's."""
        return _short(self.title)

    @property
    def can_be_logarithmic(self) -> bool:
        """Whether it may stand on a logarithmic axis: the short rate never does, it may be negative."""
        shown = self.summary.percentile
        return self.key != "rate" and bool(((shown > 0.0) & np.isfinite(shown)).all())

    def shown(self, value: float, digits: int | None = None) -> str:
        """A value in words."""
        places = self.digits if digits is None else digits
        if self.kind == "rate":
            return numbers.rate(value, places, with_unit=True)
        if self.kind == "money":
            scaled = numbers.money_scaled(value, self.unit)
            return f"{scaled.text} {scaled.unit}".strip()
        return numbers.number(value, places)

    def shown_error(self, value: float) -> str:
        """A standard error in words: with two figures that count."""
        if self.kind == "money" or not 0.0 < value < float("inf"):
            return self.shown(value)
        size = value * 100.0 if self.kind == "rate" else value
        return self.shown(value, min(max(1 - math.floor(math.log10(size)), 2), 8))

    def law(self, simulation: Simulation, row: int) -> Law | None:
        """Its law at one reported year, where it is known."""
        if self.key == "rate":
            return law_of_rate(simulation, row)
        return law_of_account(self.closed, row)

    def of_paths(self, paths: DrawnPaths) -> FloatArray | None:
        """Its values on single paths, shape (n, m); None for what is not kept by path."""
        if self.key == "account":
            return paths.account
        if self.key == "rate":
            return paths.short_rate
        if self.key == "index":
            return paths.price_index
        if self.key.startswith("asset "):
            place = int(self.key.split()[1])
            return paths.assets[place] if place < len(paths.assets) else None
        return None


def quantities_of(simulation: Simulation, currency: str) -> tuple[Quantity, ...]:
    """What a run sums up by year: account and rate, then assets and prices where they are drawn."""
    number: Kind = "number"
    found = [
        Quantity(
            "account",
            "Savings account",
            "Savings account: one unit rolled over",
            "Value of 1 unit",
            "",
            number,
            3,
            simulation.savings_account,
            simulation.closed_form,
        ),
        Quantity(
            "rate",
            "Short rate",
            "Short rate",
            "Rate",
            "% a year, continuous",
            "rate",
            2,
            simulation.short_rate,
            None,
        ),
    ]
    if simulation.risky is not None:
        for place, asset in enumerate(simulation.risky.assets):
            found.append(
                Quantity(
                    f"asset {place}",
                    asset.name,
                    f"{_short(asset.name)}: total return",
                    "Value of 1 unit, dividends reinvested",
                    "",
                    number,
                    3,
                    asset.total_return,
                    asset.closed_form,
                )
            )
        if len(simulation.risky.assets) > 1:
            found.append(
                Quantity(
                    "total",
                    "All risky assets",
                    "All risky assets together",
                    "Value",
                    currency,
                    "money",
                    0,
                    simulation.risky.total,
                    None,
                )
            )
    if simulation.index is not None:
        found.append(
            Quantity(
                "index",
                "Price index",
                "Price index: 1 today",
                "Index",
                "",
                number,
                3,
                simulation.index.index,
                simulation.index.closed_form,
            )
        )
    return tuple(found)


def _short(name: str) -> str:
    """A name that leaves room in a title."""
    return name if len(name) <= _LONG_NAME else f"{name[: _LONG_NAME - 1].rstrip()}…"


def year_name(year: float) -> str:
    """A year in words: ``Year 12`` or, of a set with odd nodes, ``Year 2.5``."""
    return f"Year {numbers.exact(year)}"
