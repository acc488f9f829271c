"""The lognormal law beside simulated figures, recomputed in the sheet from the law of the logarithm.

Mean ``e^(m + v/2)``, standard deviation, percentiles ``e^(m + z√v)`` and means beyond them follow from the
mean m and the variance v of the logarithm: Johnson, Kotz and Balakrishnan (1994), Continuous univariate
distributions, volume 1, chapter 14. With one Gaussian factor m and v follow from the model's parameters too.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from desk.report.results.checks import Checks
from desk.report.results.plan import FIRST_ROW, Formula, SheetPlan, column_letter
from desk.report.results.runs_tables import plan_table, tail_words
from desk.scenarios.records import ClosedForm, NodeSummary

__all__ = ["FactorCells", "law_first_row", "plan_law"]

LOG_MEAN, LOG_VARIANCE, MEAN, DEVIATION, LEVELS = 2, 3, 4, 5, 6
_LEAST_REVERSION = 1e-3
"""Below this the closed form of the variance loses its figures in a spreadsheet."""


@dataclass(frozen=True)
class FactorCells:
    """Where the parameters of a model with one Gaussian factor stand.

    Attributes
    ----------
    mean_reversion, volatility, risk_price : str
        Addresses; the first is empty where rates do not revert.
    discount : str
        ``P(0, t)``: address of the first year, in a column of the same sheet.
    """

    mean_reversion: str
    volatility: str
    risk_price: str
    discount: tuple[str, int]

    @staticmethod
    def serves(mean_reversion: float) -> bool:
        """Whether the formulas hold their figures."""
        return mean_reversion == 0.0 or mean_reversion >= _LEAST_REVERSION


def law_first_row(row: int) -> int:
    """Row of year 0 in a table of the law that begins at `row`."""
    return row + 2


def plan_law(
    plan: SheetPlan,
    row: int,
    closed: ClosedForm,
    summary: NodeSummary,
    checks: Checks,
    *,
    figure: str,
    symbol: str,
    form: str,
    factor: FactorCells | None = None,
    real_world: bool = False,
) -> int:
    """Plan the closed form and the same recomputed; returns the row after a gap.

    Parameters
    ----------
    plan : SheetPlan
        Has the simulated figures from `FIRST_ROW` on.
    row : int
    closed : ClosedForm
    summary : NodeSummary
        Simulated.
    checks : Checks
        Gains the check of the rows.
    figure, symbol : str
        What is lognormal, in words and as a symbol.
    form : str
        Number format.
    factor : FactorCells, optional
        Where mean and variance of the logarithm can be recomputed as well.
    real_world : bool
    """
    count = len(summary.levels)
    tails = LEVELS + count
    first = law_first_row(row)
    plan.put(row, 1, "Closed form, under the measure of the run", "title")
    labels = [
        *("Year", f"Mean of ln {symbol}", f"Variance of ln {symbol}", "Mean", "Standard deviation"),
        *(f"{level:g} %" for level in summary.levels),
        *(tail_words(level) for level in summary.levels),
        "Mean, simulated less this, in standard errors",
        "Standard deviation, simulated less this, in standard errors",
    ]
    columns: list[tuple[Any, str]] = [
        (summary.year, "term"),
        (closed.log_mean, "factor"),
        (closed.log_variance, "factor"),
        (closed.mean, form),
        (closed.sd, form),
        *((closed.percentile[:, index], form) for index in range(count)),
        *((closed.tail_mean[:, index], form) for index in range(count)),
    ]
    last = plan_table(plan, row + 1, labels, columns)
    _plan_distances(plan, first, closed, summary, tails + count)
    row = last + 2
    plan.put(row, 1, f"Recomputed from the law of ln {symbol}", "title")
    row += 1
    if factor is not None:
        row = _plan_factor(plan, row, factor)
    _plan_levels(plan, row, summary.levels)
    plan.headings([*labels[: tails + count - 1], "Check"], row=row + 2, left=0)
    known = _known(closed)
    start = row + 3
    for offset in range(summary.year.size):
        plan.put(start + offset, 1, float(summary.year[offset]), "reported", "term")
        if not known[offset]:
            continue
        own = start + offset
        cells = _row_formulas(summary.levels, own, first + offset, quantiles=row + 1)
        if factor is not None:
            cells = _factor_formulas(own, first + offset, offset, factor, row, real_world) | cells
        for column, text in cells.items():
            plan.put(own, column, Formula(text), "live", "factor" if column <= LOG_VARIANCE else form)
        begin, end = column_letter(LOG_MEAN if factor is not None else MEAN), column_letter(tails + count - 1)
        reported, scale = f"{begin}{first + offset}:{end}{first + offset}", column_letter(MEAN)
        plan.put(
            own,
            tails + count,
            Formula(
                f"=IF(SUMPRODUCT(ABS({reported}-{begin}{own}:{end}{own}))<=check_tolerance*"
                f'MAX(1,SUM({scale}{first + offset}:{end}{first + offset})),"OK","CHECK")'
            ),
            "check",
        )
    end_row = start + summary.year.size - 1
    area = plan.mark_checks(tails + count, start, end_row)
    checks.add(
        f"{figure}: closed form, years that agree",
        sheet=plan.name,
        unit="rows",
        form="whole",
        reported=float(known.sum()),
        formula=f'=COUNTIF({area},"OK")',
    )
    return end_row + 2


def _known(closed: ClosedForm) -> np.ndarray:
    """The years whose figures are all numbers."""
    columns = (closed.log_mean, closed.log_variance, closed.mean, closed.sd)
    return np.asarray(
        np.isfinite(columns).all(axis=0)
        & np.isfinite(closed.percentile).all(axis=1)
        & np.isfinite(closed.tail_mean).all(axis=1)
    )


def _plan_distances(
    plan: SheetPlan, first: int, closed: ClosedForm, summary: NodeSummary, column: int
) -> None:
    """How far the simulated mean and standard deviation are off."""
    pairs = (
        (closed.mean, summary.mean, summary.mean_se, "B", "C"),
        (closed.sd, summary.sd, summary.sd_se, "D", "E"),
    )
    for number, (law, value, error, own, beside) in enumerate(pairs):
        letter = column_letter(MEAN + number)
        for offset in range(summary.year.size):
            figures = (law[offset], value[offset], error[offset])
            if np.isfinite(figures).all() and error[offset] > 0.0:
                source = FIRST_ROW + offset
                text = f"=({own}{source}-{letter}{first + offset})/{beside}{source}"
                plan.put(first + offset, column + number, Formula(text), "live", "ratio")


def _plan_levels(plan: SheetPlan, row: int, levels: tuple[float, ...]) -> None:
    """The levels of the percentiles and their normal quantiles, in two rows over percentiles and tails."""
    plan.put(row, 1, "Level", "text")
    plan.put(row + 1, 1, "Normal quantile", "text")
    for column, level in enumerate((*levels, *levels), start=LEVELS):
        letter = column_letter(column)
        plan.put(row, column, level / 100.0, "reported", "share")
        plan.put(row + 1, column, Formula(f"=NORMSINV({letter}{row})"), "live", "years")


def _row_formulas(levels: tuple[float, ...], own: int, source: int, *, quantiles: int) -> dict[int, str]:
    """Column and formula of what follows from mean and variance of the logarithm, in row `source`."""
    mean, variance = f"$B{source}", f"$C{source}"
    # By its series where the variance is small and the difference would lose its figures.
    series = f"{variance}*(1+{variance}/2*(1+{variance}/3*(1+{variance}/4)))"
    growth = f"IF({variance}<0.001,{series},EXP({variance})-1)"
    cells = {MEAN: f"=EXP({mean}+{variance}/2)", DEVIATION: f"=D{own}*SQRT({growth})"}
    for place, level in enumerate(levels):
        letter = column_letter(LEVELS + place)
        quantile = f"{letter}${quantiles}"
        cells[LEVELS + place] = f"=EXP({mean}+{quantile}*SQRT({variance}))"
        share = f"{letter}${quantiles - 1}"
        part = f"NORMSDIST({quantile}-SQRT({variance}))/{share}"
        if level >= 50.0:
            part = f"NORMSDIST(SQRT({variance})-{quantile})/(1-{share})"
        cells[LEVELS + len(levels) + place] = f"=$D{own}*{part}"
    return cells


def _plan_factor(plan: SheetPlan, row: int, factor: FactorCells) -> int:
    """Links to the parameters of the model; returns the row after."""
    cells = (
        ("Mean reversion", factor.mean_reversion, "years"),
        ("Volatility", factor.volatility, "rate"),
        ("Risk price", factor.risk_price, "years"),
    )
    for label, address, form in cells:
        plan.put(row, 1, label, "text")
        plan.put(row, LOG_MEAN, Formula(f"={address}") if address else 0.0, "live", form)
        row += 1
    return row


def _factor_formulas(
    own: int, source: int, offset: int, factor: FactorCells, levels: int, real_world: bool
) -> dict[int, str]:
    """Mean and variance of the logarithm of the savings account, from the parameters above the levels."""
    speed, volatility, price = (f"$B${levels - above}" for above in (3, 2, 1))
    letter, first = factor.discount
    variance = f"{volatility}*{volatility}*A{own}*A{own}*A{own}/3"
    drift = f"{volatility}*{price}*A{own}*A{own}/2"
    if factor.mean_reversion:
        once, twice = f"(1-EXP(-{speed}*A{own}))/{speed}", f"(1-EXP(-2*{speed}*A{own}))/(2*{speed})"
        variance = f"{volatility}*{volatility}/({speed}*{speed})*(A{own}-2*{once}+{twice})"
        drift = f"{volatility}*{price}/{speed}*(A{own}-{once})"
    mean = f"=-LN({letter}{first + offset})+C{own}/2"
    if real_world:
        mean += f"+{drift}"
    return {LOG_MEAN: mean, LOG_VARIANCE: f"={variance}"}
