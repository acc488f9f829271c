"""The sheet of a model fitted to a history of short rates: likelihood and estimates recomputed in the sheet.

Given the mean reversion, the long-run rate and the volatility of the model of Vasicek are a weighted least
squares fit, and its log-likelihood is a sum over the steps: all live. Where the steps are equal the mean
reversion follows from the regression of each rate on the one before too.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Any

import numpy as np

from desk.book import ModelName
from desk.book.model import History
from desk.report.results.charts import Column, lines
from desk.report.results.checks import Checks
from desk.report.results.look import ASSETS, INK
from desk.report.results.plan import Block, Formula, SheetPlan
from desk.scenarios.calibration_records import Calibration

__all__ = ["plan_history"]

_CHART_ROWS = 20
_PROFILE_COLUMN = 14
_SHORT = "IF(E{r}<0.001,E{r}*(1-E{r}/2*(1-E{r}/3*(1-E{r}/4))),1-EXP(-E{r}))"
"""``1 - e^(-x)``, by its series where x is small and the difference would lose its figures."""


def plan_history(plan: SheetPlan, found: Calibration, rows: dict[str, int], row: int, checks: Checks) -> None:
    """Fill a sheet from `row` on; `rows` says where the figures stand."""
    data, profile = found.data, found.profile
    assert isinstance(data, History)
    assert profile is not None
    # The rows of the history come after all others: also after those of the profile beside the chart.
    start = row + max(_CHART_ROWS, profile.mean_reversion.size + 3)
    plan.page_breaks.append(row - 1)
    _plan_profile(plan, found, row)
    first, last = start + 1, start + data.date.size
    is_vasicek = found.name is ModelName.VASICEK
    has_law = found.figure("mean_reversion").value > 0.0
    headings = ["Date", "Short rate", "Rate before", "Step [years]"]
    if has_law:
        headings += ["Mean reversion × step", "1 − e^(−that)", "Forecast", "Deviation"]
        if is_vasicek:
            headings += ["Residual [deviations]", "Reported", "Check", "Log-density"]
        else:
            headings += ["Reported forecast", "Reported deviation", "Check", "Residual [deviations]"]
    else:
        headings += ["Forecast", "Deviation", "Residual [deviations]"]
    plan.headings(headings, row=start)
    plan.block = _live_block(plan, found, rows, first, is_vasicek) if has_law else _plain_block(found, first)
    _plan_regression(plan, found, rows, (first, last), checks, is_vasicek=is_vasicek)
    if not has_law:
        return
    area = plan.mark_checks(11, first + 1, last)
    what = "Residuals" if is_vasicek else "Forecasts and deviations"
    checks.add_column(f"{what} of the history, by step", plan, area)
    if is_vasicek:
        _plan_estimates(plan, found, rows, (first, last), checks)


def _plan_profile(plan: SheetPlan, found: Calibration, row: int) -> None:
    """The likelihood profile as a chart, with its figures beside it."""
    profile = found.profile
    assert profile is not None
    column = _PROFILE_COLUMN
    plan.headings(
        ["Mean reversion [a year]", "Log-likelihood, greatest over the others", "95 % cut"],
        row=row,
        column=column,
        left=0,
    )
    pairs = zip(profile.mean_reversion.tolist(), profile.log_likelihood.tolist(), strict=True)
    last = row
    for last, (speed, height) in enumerate(pairs, start=row + 1):
        plan.table_row(
            last,
            column,
            [
                (speed, "reported", "years"),
                (height, "reported", "years"),
                (profile.cut, "reported", "years"),
            ],
        )
    chart = lines(
        [
            Column("Log-likelihood", plan.area(column + 1, row + 1, last), ASSETS),
            Column("95 % cut", plan.area(column + 2, row + 1, last), INK, dash="dash"),
        ],
        plan.area(column, row + 1, last),
        title="Likelihood of the mean reversion",
        across="Mean reversion [a year]",
        upward="Log-likelihood",
        number_format="0.0",
    )
    chart.x_axis.number_format = "0.00"
    plan.charts.append((chart, f"A{row}"))


def _live_block(
    plan: SheetPlan, found: Calibration, rows: dict[str, int], first: int, is_vasicek: bool
) -> Block:
    """The history with forecasts, deviations and residuals as formulas of the estimates."""
    speed, level, sigma = (f"$C${rows[name]}" for name in ("mean_reversion", "long_run_rate", "volatility"))
    data, band = found.data, found.band
    assert isinstance(data, History)
    assert band is not None
    dates, rates = data.date.tolist(), data.rate.tolist()
    residual, deviation, forecast = (
        values.tolist() for values in (found.residual, band.deviation, band.forecast)
    )

    def values() -> Iterator[list[Any]]:
        yield [dates[0], rates[0], *[None] * 10]
        for place in range(1, len(dates)):
            r = first + place
            line: list[Any] = [
                dates[place],
                rates[place],
                Formula(f"=B{r - 1}"),
                Formula(f"=(A{r}-A{r - 1})/365"),
                Formula(f"={speed}*D{r}"),
                Formula(f"={_SHORT.format(r=r)}"),
                Formula(f"=C{r}*(1-F{r})+{level}*F{r}"),
            ]
            if is_vasicek:
                line += [
                    Formula(f"={sigma}*SQRT(F{r}*(2-F{r})/(2*{speed}))"),
                    Formula(f"=(B{r}-G{r})/H{r}"),
                    residual[place - 1],
                    Formula(f'=IF(ABS(I{r}-J{r})<=check_tolerance*MAX(1,ABS(J{r})),"OK","CHECK")'),
                    Formula(f"=-0.5*(I{r}*I{r}+LN(2*PI()*H{r}*H{r}))"),
                ]
            else:
                # The residual is by the exact law, which a sheet has no function for.
                line += [
                    Formula(f"={sigma}*SQRT(F{r}/{speed}*(C{r}*(1-F{r})+{level}*F{r}/2))"),
                    forecast[place - 1],
                    deviation[place - 1],
                    Formula(f'=IF(ABS(G{r}-I{r})+ABS(H{r}-J{r})<=check_tolerance,"OK","CHECK")'),
                    residual[place - 1],
                ]
            yield line

    roles = ["input", "input", *["live"] * 6]
    forms = ["date", "rate", "rate", "years", "factor", "factor", "rate", "rate"]
    if is_vasicek:
        roles += ["live", "reported", "check", "live"]
        forms += ["ratio", "ratio", "text", "years"]
    else:
        roles += ["reported", "reported", "check", "reported"]
        forms += ["rate", "rate", "text", "ratio"]
    return Block(first, len(dates), tuple(roles), tuple(forms), values)


def _plain_block(found: Calibration, first: int) -> Block:
    """The history with values, where no mean reversion was found and the formulas would divide by it."""
    data, band = found.data, found.band
    assert isinstance(data, History)
    assert band is not None
    dates, rates = data.date.tolist(), data.rate.tolist()

    def values() -> Iterator[list[Any]]:
        yield [dates[0], rates[0], *[None] * 5]
        steps = zip(band.forecast.tolist(), band.deviation.tolist(), found.residual.tolist(), strict=True)
        for place, (forecast, deviation, residual) in enumerate(steps, start=1):
            r = first + place
            yield [
                dates[place],
                rates[place],
                Formula(f"=B{r - 1}"),
                Formula(f"=(A{r}-A{r - 1})/365"),
                forecast,
                deviation,
                residual,
            ]

    roles = ("input", "input", "live", "live", "reported", "reported", "reported")
    return Block(first, len(dates), roles, ("date", "rate", "rate", "years", "rate", "rate", "ratio"), values)


def _plan_estimates(
    plan: SheetPlan, found: Calibration, rows: dict[str, int], span: tuple[int, int], checks: Checks
) -> None:
    """Long-run rate, volatility and log-likelihood from the rows of the history, given the mean reversion."""
    first, last = span[0] + 1, span[1]

    def area(letter: str) -> str:
        return f"{letter}{first}:{letter}{last}"

    speed = f"$C${rows['mean_reversion']}"
    sigma = f"$C${rows['volatility']}"
    # Weights 1/(F(2-F)): the variance of a step but for a factor that all have.
    free = f"({area('B')}-{area('C')}*(1-{area('F')}))"
    formulas = {
        "long_run_rate": f"=SUMPRODUCT({free}/(2-{area('F')}))/SUMPRODUCT({area('F')}/(2-{area('F')}))",
        "volatility": f"={sigma}*SQRT(SUMPRODUCT({area('I')},{area('I')})/ROWS({area('I')}))",
        "log_likelihood": f"=SUM({area('L')})",
        "starting_rate": f"=B{last}",
        "half_life": f"=LN(2)/{speed}",
        "stationary_deviation": f"={sigma}/SQRT(2*{speed})",
    }
    for name, formula in formulas.items():
        if name in rows and math.isfinite(_reported(found, name)):
            form = "rate" if name in ("long_run_rate", "volatility", "starting_rate") else "years"
            form = "rate" if name == "stationary_deviation" else form
            plan.put(rows[name], 7, Formula(formula), "live", form)
            checks.add(
                f"History: {name.replace('_', ' ')}",
                sheet=plan.name,
                unit="-" if name == "log_likelihood" else "years" if name == "half_life" else "a year",
                form=form,
                reported=_reported(found, name),
                formula=f"='{plan.name}'!G{rows[name]}",
            )


def _reported(found: Calibration, name: str) -> float:
    return found.log_likelihood if name == "log_likelihood" else found.figure(name).value


def _plan_regression(
    plan: SheetPlan,
    found: Calibration,
    rows: dict[str, int],
    span: tuple[int, int],
    checks: Checks,
    *,
    is_vasicek: bool,
) -> None:
    """The regression of each rate on the one before; its estimates are the likeliest if steps are equal."""
    data = found.data
    assert isinstance(data, History)
    step = np.diff(data.date).astype(np.float64)
    regular = is_vasicek and float(np.ptp(step)) == 0.0 and found.figure("mean_reversion").value > 0.0
    first, last = span[0] + 1, span[1]
    after, before = f"B{first}:B{last}", f"C{first}:C{last}"
    column, row = 9, rows["mean_reversion"]
    words = "steps are equal" if regular else "steps taken as equal: for comparison"
    plan.put(row - 1, column, f"Regression of each rate on the one before ({words})", "note")
    slope, intercept, error, mean_step = (f"$K${row + offset}" for offset in range(4))
    table = [
        ("Slope", f"=SLOPE({after},{before})", "factor"),
        ("Intercept", f"=INTERCEPT({after},{before})", "factor"),
        ("Standard error of the residuals", f"=STEYX({after},{before})", "factor"),
        ("Mean step [years]", f"=SUM(D{first}:D{last})/ROWS(D{first}:D{last})", "factor"),
        ("Mean reversion [a year]", f"=-LN({slope})/{mean_step}", "years"),
        ("Long-run rate [a year]", f"={intercept}/(1-{slope})", "rate"),
        (
            "Volatility [a year]",
            f"={error}*SQRT((1-2/ROWS({after}))*2*$K${row + 4}/(1-{slope}*{slope}))",
            "rate",
        ),
    ]
    count = 7 if is_vasicek else 4
    for offset, (label, formula, form) in enumerate(table[:count]):
        plan.put(row + offset, column, label, "text")
        plan.put(row + offset, column + 2, Formula(formula), "live", form)
    if regular:
        for offset, name in ((4, "mean_reversion"), (5, "long_run_rate"), (6, "volatility")):
            checks.add(
                f"History, by regression: {name.replace('_', ' ')}",
                sheet=plan.name,
                unit="a year",
                form=table[offset][2],
                reported=found.figure(name).value,
                formula=f"='{plan.name}'!K{row + offset}",
            )
