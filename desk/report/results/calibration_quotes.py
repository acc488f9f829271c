"""The sheet of a model fitted to quoted volatilities: residuals and the prices at the quotes recomputed."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np

from desk.book.market import Volatilities
from desk.rates.option_calibration import VolatilityFit
from desk.rates.option_instruments import OptionQuotes
from desk.report.results.charts import Column, bars
from desk.report.results.checks import Checks
from desk.report.results.look import ASSETS
from desk.report.results.plan import Block, Formula, SheetPlan
from desk.scenarios.calibration_records import Calibration

__all__ = ["plan_quotes"]

_CHART_ROWS = 20
_MOST_OPTIONS = 20_000
"""Options beneath the quotes: of more the sheet would take long to recalculate."""
_HEADINGS = [
    "Quote",
    "No.",
    "Expiry [years]",
    "Length [years]",
    "Strike",
    "Kind",
    "Quoted volatility",
    "Fitted volatility",
    "Residual [bp]",
    "Reported [bp]",
    "Check",
    "Price at the quote [1]",
    "Recomputed [1]",
    "Price of the model [1]",
    "Check",
]


def plan_quotes(plan: SheetPlan, found: Calibration, rows: dict[str, int], row: int, checks: Checks) -> None:
    """Fill a sheet from `row` on; `rows` says where the figures stand."""
    data, fit, quotes = found.data, found.fit, found.quotes
    assert isinstance(data, Volatilities)
    assert isinstance(fit, VolatilityFit)
    assert quotes is not None
    plan.page_breaks.append(row - 1)
    start = row + _CHART_ROWS
    first, last = start + 1, start + quotes.count
    used = quotes.weight > 0.0
    is_live = int(used.sum()) <= _MOST_OPTIONS
    options = last + 3
    plan.headings(_HEADINGS, row=start)
    for place in range(quotes.count):
        r = first + place
        cells: list[tuple[Any, str, str]] = [
            (fit.instruments[place], "text", "text"),
            (place + 1, "text", "whole"),
            (float(quotes.expiry[place]), "input", "years2"),
            (_known(float(quotes.length[place])), "input", "years2"),
            (float(quotes.strike[place]), "input", "rate"),
            (data.kind[place].value, "text", "text"),
            (float(fit.quoted_volatility[place]), "input", "rate"),
            (_known(float(fit.model_volatility[place])), "reported", "rate"),
            (Formula(f"=(H{r}-G{r})*10000"), "live", "ratio"),
            (_known(float(fit.residual_bp[place])), "reported", "ratio"),
            (Formula(f'=IF(ABS(I{r}-J{r})<=check_tolerance*MAX(1,ABS(J{r})),"OK","CHECK")'), "check", "text"),
            (float(fit.quoted_price[place]), "reported", "factor"),
        ]
        plan.table_row(r, 1, cells)
        if is_live:
            ends = options + 1, options + int(used.sum())
            sums = f"SUMIFS($N${ends[0]}:$N${ends[1]},$B${ends[0]}:$B${ends[1]},B{r})"
            plan.put(r, 13, Formula(f"={sums}"), "live", "factor")
            plan.put(
                r,
                15,
                Formula(f'=IF(ABS(L{r}-M{r})<=check_tolerance*MAX(1,ABS(L{r})),"OK","CHECK")'),
                "check",
                "text",
            )
        plan.put(r, 14, _known(float(fit.model_price[place])), "reported", "factor")
    checks.add_column("Residuals of the volatilities, by quote", plan, plan.mark_checks(11, first, last))
    _plan_sizes(plan, fit, rows, (first, last), checks)
    chart = bars(
        [Column("Fitted less quoted", plan.area(9, first, last), ASSETS)],
        plan.area(2, first, last),
        title="Residuals by quote",
        across="Number of the quote",
        upward="Basis points of volatility",
        number_format='0.0;"−"0.0',
        skip=max(1, quotes.count // 15),
    )
    plan.charts.append((chart, f"A{row}"))
    if not is_live:
        plan.put(options - 1, 1, "There are too many options beneath the quotes to be priced here.", "note")
        return
    checks.add_column("Prices at the quoted volatilities", plan, plan.mark_checks(15, first, last))
    _plan_options(plan, quotes, options, first)


def _known(value: float) -> float | None:
    """A figure, or nothing where there is none."""
    return value if np.isfinite(value) else None


def _plan_sizes(
    plan: SheetPlan, fit: VolatilityFit, rows: dict[str, int], span: tuple[int, int], checks: Checks
) -> None:
    """Root of the mean square of the residuals, and their mean."""
    area = f"I{span[0]}:I{span[1]}"
    row = rows["log_likelihood"]
    for offset, (label, value, formula) in enumerate(
        (
            (
                "Residuals, root mean square [bp]",
                fit.rmse_bp,
                f"=SQRT(SUMPRODUCT({area},{area})/ROWS({area}))",
            ),
            ("Mean residual [bp]", float(np.mean(fit.residual_bp)), f"=SUM({area})/ROWS({area})"),
        )
    ):
        plan.put(row + offset, 5, label, "text")
        plan.put(row + offset, 7, Formula(formula), "live", "ratio")
        checks.add(
            f"Volatilities: {label[: label.index(' [')].lower()}",
            sheet=plan.name,
            unit="bp",
            form="ratio",
            reported=value,
            formula=f"='{plan.name}'!G{row + offset}",
        )


def _plan_options(plan: SheetPlan, quotes: OptionQuotes, start: int, quote_row: int) -> None:
    """The options beneath the quotes, priced by the normal or the shifted lognormal closed form."""
    plan.put(
        start - 1,
        1,
        "Options beneath the quotes at the quoted volatilities: the normal law (Bachelier 1900), or the "
        "lognormal law of rate and strike plus shift (Black 1976).",
        "note",
    )
    plan.headings(
        [
            "Option", "Quote no.", "Fixing [years]", "Forward rate", "Strike", "Annuity [years]", "Sign",
            "Shift", "Law", "Volatility", "Deviation", "d", "Price of 1 a year", "Price [1]",
        ],
        row=start,
    )  # fmt: skip
    places = np.argwhere(quotes.weight > 0.0)

    def values() -> Iterator[list[Any]]:
        counts: dict[int, int] = {}
        for offset, (quote, option) in enumerate(places.tolist()):
            r, q = start + 1 + offset, quote_row + quote
            counts[quote] = counts.get(quote, 0) + 1
            if quotes.normal[quote]:
                ahead = f"=(D{r}-E{r})/K{r}"
                price = f"=G{r}*(D{r}-E{r})*NORMSDIST(G{r}*L{r})+K{r}*EXP(-L{r}*L{r}/2)/SQRT(2*PI())"
            else:
                ahead = f"=LN((D{r}+H{r})/(E{r}+H{r}))/K{r}+K{r}/2"
                price = f"=G{r}*((D{r}+H{r})*NORMSDIST(G{r}*L{r})-(E{r}+H{r})*NORMSDIST(G{r}*(L{r}-K{r})))"
            yield [
                f"{quotes.instrument[quote]} {quote + 1}, {counts[quote]}",
                quote + 1,
                float(quotes.fixing[quote, option]),
                float(quotes.forward[quote, option]),
                Formula(f"=$E${q}"),
                float(quotes.weight[quote, option]),
                1 if quotes.call[quote] else -1,
                0.0 if quotes.normal[quote] else float(quotes.shift[quote]),
                "normal" if quotes.normal[quote] else "lognormal",
                Formula(f"=$G${q}"),
                Formula(f"=J{r}*SQRT(C{r})"),
                Formula(ahead),
                Formula(price),
                Formula(f"=F{r}*M{r}"),
            ]

    roles = ("text", "text", "reported", "reported", "live", "reported", "text", "reported", "text")
    forms = ("text", "whole", "years", "rate", "rate", "factor", "whole", "rate", "text", "rate")
    plan.block = Block(start + 1, len(places), (*roles, *["live"] * 5), (*forms, *["factor"] * 4), values)
