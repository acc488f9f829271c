"""The columns of the lines of both sides, and what stands in them."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from desk.book import LineTerms, Side
from desk.valuation.records import LineStanding, Measures, Standing
from desk.window.parts.tables import Column
from desk.window.standing.line_words import discount_words, indexation_words

__all__ = ["flow_columns", "line_columns", "line_rows", "side_name", "total_rows"]

_MEASURES = tuple(name for name in Measures.__dataclass_fields__)


def side_name(side: Side) -> str:
    """A side as it stands in a table."""
    return {Side.ASSETS: "Assets", Side.LIABILITIES: "Liabilities"}[side]


def line_columns(
    currency: str, *, with_terms: bool = False, with_second: bool = False, with_inflation: bool = False
) -> tuple[Column, ...]:
    """The columns; those of terms, of the second basis and of inflation where they are wanted."""
    terms = (
        Column(
            "indexation",
            "Indexation",
            tooltip="How the amounts of the line grow from today's money until they are paid.",
        ),
        Column(
            "discounting",
            "Discounted at",
            tooltip="What the line is discounted at, where that is not what the basis says.",
        ),
    )
    second = (
        Column(
            "second_value",
            "On the second",
            currency,
            "money",
            tooltip="Present value on the second basis.",
        ),
        Column(
            "second_difference",
            "Difference",
            currency,
            "money",
            tooltip="Present value on the first basis less that on the second.",
            is_change=True,
        ),
    )
    return (
        Column("side", "Side"),
        Column("line", "Line"),
        Column("kind", "Kind", tooltip="The kind of holding, or flows as the source states them."),
        Column("present_value", "Present value", currency, "money"),
        *(second if with_second else ()),
        *(terms if with_terms else ()),
        *_measure_columns(currency, with_inflation=with_inflation),
    )


def _measure_columns(currency: str, *, with_inflation: bool) -> tuple[Column, ...]:
    inflation = Column(
        "inflation_dv01",
        "Inflation DV01",
        currency,
        "money",
        tooltip="Rise in present value for +1 basis point of expected inflation.",
    )
    return (
        Column(
            "dv01",
            "DV01",
            currency,
            "money",
            tooltip="Fall in present value for +1 basis point on all zero rates.",
        ),
        *((inflation,) if with_inflation else ()),
        Column(
            "effective_duration",
            "Effective dur.",
            "years",
            "years",
            tooltip="Effective duration: for a parallel move of the continuous zero rates.",
        ),
        Column(
            "spread",
            "Spread",
            "% a year",
            "rate",
            tooltip="Over the curve, continuously compounded; none where it differs between flows.",
        ),
        Column(
            "equivalent_rate",
            "Equivalent rate",
            "% a year",
            "rate",
            tooltip="The single annual effective rate with the same present value.",
        ),
        Column(
            "spread_duration",
            "Spread dur.",
            "years",
            "years",
            tooltip="Spread duration: for a move of the spread alone; none where no spread plays a part.",
        ),
        Column(
            "market_value",
            "Market value",
            currency,
            "money",
            tooltip="As the source states it, or what its price comes to.",
        ),
        Column(
            "expected_credit_loss",
            "Credit loss",
            currency,
            "money",
            tooltip="Expected credit loss: what expected default takes off the present value.",
        ),
        Column("macaulay_duration", "Macaulay dur.", "years", "years", tooltip="At the equivalent rate."),
        Column("modified_duration", "Modified dur.", "years", "years", tooltip="At the equivalent rate."),
        Column("convexity", "Convexity", "years²", "number", digits=1),
        Column(
            "dispersion",
            "Dispersion",
            "years²",
            "number",
            digits=1,
            tooltip="Variance of the times of the flows, weighted by present value.",
        ),
        Column("flow_count", "Flows", "", "integer", tooltip="After the valuation date, today's included."),
    )


def flow_columns(currency: str, *, with_real: bool = False) -> tuple[Column, ...]:
    """The columns of the flows of one line; with those in today's money where it follows an index."""
    real = (
        Column(
            "real_amount",
            "In today's money",
            currency,
            "money",
            digits=2,
            tooltip="Before it grows with prices, or at its fixed rate.",
        ),
        Column(
            "index_factor",
            "Growth",
            "times",
            "number",
            digits=4,
            tooltip="What is expected of it until the amount is due.",
        ),
    )
    return (
        Column("date", "Date", "", "date"),
        Column("time", "Time", "years", "years", digits=4),
        *(real if with_real else ()),
        Column(
            "amount",
            "Amount",
            currency,
            "money",
            digits=2,
            tooltip="What is paid: floating interest as projected on today's curve, prices and default as "
            "expected.",
        ),
        Column("discount_factor", "Discount factor", "", "number", digits=6, tooltip="With the spread."),
        Column("present_value", "Present value", currency, "money", digits=2),
    )


def _measures_of(rows: Sequence[Measures]) -> dict[str, Any]:
    return {name: np.array([getattr(row, name) for row in rows]) for name in _MEASURES}


def line_rows(
    standing: Standing, *, terms: Sequence[LineTerms] = (), second: Standing | None = None
) -> dict[str, Any]:
    """What stands in the columns, a row a line."""
    lines = standing.lines
    stated = {(each.side, each.line): each for each in terms}
    own = [stated.get((line.side, line.line)) if line.kind == "flows" else None for line in lines]
    present = np.array([line.measures.present_value for line in lines])
    other = _second_values(lines, second)
    return {
        "side": [side_name(line.side) for line in lines],
        "line": [line.line for line in lines],
        "kind": [line.kind for line in lines],
        "indexation": ["" if each is None else indexation_words(each.indexation) for each in own],
        "discounting": ["" if each is None else discount_words(each) for each in own],
        "second_value": other,
        "second_difference": present - other,
        "spread": [line.spread for line in lines],
        "spread_duration": [line.spread_duration for line in lines],
        "market_value": [line.market_value for line in lines],
        "expected_credit_loss": [line.expected_credit_loss for line in lines],
        "inflation_dv01": [line.inflation_dv01 for line in lines],
        "flow_count": [line.flow_count for line in lines],
        **_measures_of([line.measures for line in lines]),
    }


def _second_values(lines: Sequence[LineStanding], second: Standing | None) -> Any:
    """Present values on the second basis; NaN for a line that the two do not share."""
    found = np.full(len(lines), np.nan)
    others = () if second is None else second.lines
    for place, (line, other) in enumerate(zip(lines, others, strict=False)):
        if (line.side, line.line) == (other.side, other.line):
            found[place] = other.measures.present_value
    return found


def total_rows(standing: Standing, *, second: Standing | None = None) -> dict[str, Any]:
    """What stands in the columns of the totals, a row a side."""
    lines = standing.lines
    losses = [_total([line.expected_credit_loss for line in lines if line.side is side]) for side in Side]
    sides = [standing.assets, standing.liabilities]
    inflation = standing.inflation
    moved = [None, None] if inflation is None else [inflation.dv01_assets, inflation.dv01_liabilities]
    other = np.full(2, np.nan)
    if second is not None:
        other = np.array([second.assets.present_value, second.liabilities.present_value])
    return {
        "side": [side_name(side) for side in Side],
        "line": ["All lines"] * 2,
        "kind": [""] * 2,
        "indexation": [""] * 2,
        "discounting": [""] * 2,
        "second_value": other,
        "second_difference": np.array([side.present_value for side in sides]) - other,
        "spread": [None] * 2,
        "spread_duration": [None] * 2,
        "market_value": [None] * 2,
        "expected_credit_loss": losses,
        "inflation_dv01": moved,
        "flow_count": [sum(line.flow_count for line in lines if line.side is side) for side in Side],
        **_measures_of(sides),
    }


def _total(figures: Sequence[float | None]) -> float | None:
    """The sum of what there is; None where there is nothing."""
    stated = [figure for figure in figures if figure is not None]
    return sum(stated) if stated else None
