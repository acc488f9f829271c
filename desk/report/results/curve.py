"""The sheet of the curve by term, with the formula of a curve that is stated or fitted as one."""

from __future__ import annotations

from typing import Any

import numpy as np

from desk.book import Basis, CurveKind
from desk.rates.parametric import NelsonSiegel, Svensson
from desk.rates.quoted_flows import QuotedFlows
from desk.rates.smith_wilson import SmithWilsonCurve
from desk.report.results.checks import Checks
from desk.report.results.naming import FIRST, Naming
from desk.report.results.plan import FIRST_ROW, Formula, SheetPlan

__all__ = ["grid_terms", "plan_curve"]

SHORTEST_GRID, LONGEST_GRID = 10, 100
WILSON_WORK = 1_000_000
"""Terms times payments that the formula of Smith and Wilson may cost a spreadsheet."""
_PARAMETERS, _VALUES = 12, 13


def grid_terms(basis: Basis, *, last_time: float) -> np.ndarray:
    """Half-years up to the last quote and the last flow [years], shape (n,)."""
    furthest = max(last_time, basis.last_quoted_term or 0.0, float(basis.terms.max(initial=0.0)))
    end = int(np.clip(np.ceil(furthest), SHORTEST_GRID, LONGEST_GRID))
    return np.arange(0.0, end + 0.25, 0.5)


def plan_curve(basis: Basis, *, last_time: float, checks: Checks, naming: Naming = FIRST) -> SheetPlan:
    """The curve by half-years.

    Parameters
    ----------
    basis : Basis
    last_time : float
        Of the last flow of either side [years].
    checks : Checks
        Gains the check of this sheet.
    naming : Naming
    """
    terms = grid_terms(basis, last_time=last_time)
    note = (
        "Zero and forward rates are continuously compounded; a forward rate is that of the half-year before "
        "the term."
    )
    plan = SheetPlan(naming.sheet("Curve by term"), naming.title("Curve by term"), note)
    plan.widths = dict.fromkeys(range(1, 9), 16.0)
    plan.headings(
        [
            "Term [years]",
            "Zero rate, reported [a year]",
            "Forward rate, reported [a year]",
            "Forward rate, recomputed [a year]",
            "Discount factor, reported",
            "Discount factor, recomputed",
            "Difference",
            "Check",
        ],
        left=0,
    )
    zero, discount = basis.curve.zero(terms), basis.curve.discount(terms)
    forward = basis.curve.forward(np.maximum(terms - 0.5, 0.0), terms)
    formula = _formula(plan, basis, terms.size)
    if formula is not None:
        plan.headings(["Zero rate, by the formula [a year]", "Difference"], column=9, left=0)
        plan.widths |= {9: 16.0, 10: 12.0, 11: 3.0, _PARAMETERS: 30.0, _VALUES: 16.0, 14: 16.0, 15: 16.0}
    for offset in range(terms.size):
        row = FIRST_ROW + offset
        ahead: list[tuple[Any, str, str]] = [(None, "", ""), (None, "", "")]
        away = f"=ABS(E{row}-F{row})"
        if offset:
            live = Formula(f"=LN(F{row - 1}/F{row})/(A{row}-A{row - 1})")
            ahead = [(float(forward[offset]), "reported", "rate"), (live, "live", "rate")]
            away += f"+ABS(C{row}-D{row})"
        cells: list[tuple[Any, str, str]] = [
            (float(terms[offset]), "reported", "term"),
            (float(zero[offset]), "reported", "rate"),
            *ahead,
            (float(discount[offset]), "reported", "factor"),
            (Formula(f"=EXP(-B{row}*A{row})"), "live", "factor"),
        ]
        if formula is not None and (offset or not formula.needs_time):
            away += f"+ABS(J{row})"
            plan.put(row, 9, Formula("=" + formula.text.format(row=row)), "live", "rate")
            plan.put(row, 10, Formula(f"=B{row}-I{row}"), "live", "tiny")
        cells += [
            (Formula(away), "live", "tiny"),
            (Formula(f'=IF(G{row}<=check_tolerance,"OK","CHECK")'), "check", "text"),
        ]
        plan.table_row(row, 1, cells)
    area = plan.mark_checks(8, FIRST_ROW, FIRST_ROW + terms.size - 1)
    checks.add_column(naming.figure("Terms of the curve that differ"), plan, area)
    return plan


class _Live:
    """A formula of the continuous zero rate at the term in column A."""

    def __init__(self, text: str, *, needs_time: bool) -> None:
        self.text, self.needs_time = text, needs_time


def _formula(plan: SheetPlan, basis: Basis, terms: int) -> _Live | None:
    """The formula of the curve with its parameters in cells; None where it has none."""
    curve = basis.curve
    if isinstance(curve, SmithWilsonCurve):
        return _wilson(plan, basis, curve, terms)
    if isinstance(curve, NelsonSiegel | Svensson):
        return _parametric(plan, curve)
    if basis.curve_kind is CurveKind.FLAT and basis.flat_rate is not None:
        place = _parameters(
            plan,
            [
                ("Flat rate [a year]", basis.flat_rate, "rate"),
                ("Compounding periods a year", basis.compounding.per_year, "whole"),
            ],
        )
        return _Live(_continuous(place[0], place[1]), needs_time=False)
    return None


def _parameters(plan: SheetPlan, items: list[tuple[str, float, str]]) -> list[str]:
    """Parameters in cells beside the curve; returns their addresses."""
    plan.headings(["Parameter", "Value"], column=_PARAMETERS)
    places = []
    for row, (label, value, form) in enumerate(items, start=FIRST_ROW):
        plan.put(row, _PARAMETERS, label, "text")
        places.append(plan.put(row, _VALUES, value, "input", form).split("!", 1)[1])
    return places


def _continuous(rate: str, periods: str) -> str:
    """A rate restated with continuous compounding."""
    return f"IF({periods}=0,{rate},{periods}*LN(1+({rate})/MAX(1,{periods})))"


def _parametric(plan: SheetPlan, curve: NelsonSiegel | Svensson) -> _Live:
    """Nelson and Siegel's formula, or Svensson's."""
    has_second = isinstance(curve, Svensson)
    items: list[tuple[str, float, str]] = [
        ("Compounding periods a year", curve.compounding.per_year, "whole"),
        ("Beta 0: level [a year]", curve.level, "rate"),
        ("Beta 1: slope [a year]", curve.slope, "rate"),
        ("Beta 2: curvature [a year]", curve.curvature, "rate"),
        ("Tau 1: decay [years]", curve.decay, "years"),
    ]
    if isinstance(curve, Svensson):
        items += [
            ("Beta 3: second curvature [a year]", curve.second_curvature, "rate"),
            ("Tau 2: second decay [years]", curve.second_decay, "years"),
        ]
    place = _parameters(plan, items)
    periods, level, slope, curvature, decay = place[:5]
    text = f"{level}+{slope}*{_tilt(decay)}+{curvature}*({_tilt(decay)}-EXP(-A{{row}}/{decay}))"
    if has_second:
        text += f"+{place[5]}*({_tilt(place[6])}-EXP(-A{{row}}/{place[6]}))"
    return _Live(_continuous(text, periods), needs_time=True)


def _tilt(decay: str) -> str:
    """``(1 - e^{-x})/x`` with x the term over the decay."""
    return f"(1-EXP(-A{{row}}/{decay}))*{decay}/A{{row}}"


def _wilson(plan: SheetPlan, basis: Basis, curve: SmithWilsonCurve, terms: int) -> _Live | None:
    """Smith and Wilson's formula, with the weight of each time at which an instrument pays."""
    flows = _instruments(basis)
    times, place = np.unique(flows.time, return_inverse=True)
    if times.size * terms > WILSON_WORK:
        return None
    ultimate = float(np.log1p(curve.ultimate_forward_rate))
    deflated = flows.amount * np.exp(-ultimate * flows.time) * curve.zeta[flows.instrument]
    weight = np.bincount(place.reshape(-1), weights=deflated, minlength=times.size)
    rate, alpha = _parameters(
        plan,
        [
            ("Ultimate forward rate, annual [a year]", curve.ultimate_forward_rate, "rate"),
            ("Alpha: speed of convergence [a year]", curve.alpha, "rate"),
        ],
    )
    plan.headings(["Time paid [years]", "Weight"], column=_VALUES + 1, left=0)
    for row, (time, own) in enumerate(zip(times.tolist(), weight.tolist(), strict=True), start=FIRST_ROW):
        plan.put(row, _VALUES + 1, time, "input", "years")
        plan.put(row, _VALUES + 2, own, "input", "factor")
    last = FIRST_ROW + times.size - 1
    when, weights = plan.area(_VALUES + 1, FIRST_ROW, last), plan.area(_VALUES + 2, FIRST_ROW, last)
    lesser = f"(0.5*({when}+A{{row}}-ABS({when}-A{{row}})))"
    kernel = f"{alpha}*{lesser}-0.5*EXP(-{alpha}*ABS({when}-A{{row}}))+0.5*EXP(-{alpha}*({when}+A{{row}}))"
    return _Live(f"LN(1+{rate})-LN(1+SUMPRODUCT({weights}*({kernel})))/A{{row}}", needs_time=True)


def _instruments(basis: Basis) -> QuotedFlows:
    """The instruments that a Smith-Wilson curve goes through, in its order."""
    fit = basis.curve_fit
    if fit is not None:
        flows = basis.quoted_bonds
        used = np.flatnonzero(fit.is_used)
        return flows.taken(used[np.argsort(flows.term[used], kind="stable")])
    flows = basis.quoted_flows
    return flows if basis.last_liquid_point is None else flows.liquid(basis.last_liquid_point)
