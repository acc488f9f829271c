"""The sheet of the bonds that a curve is drawn through: quotes, payments, residuals, each bond repriced."""

from __future__ import annotations

from typing import Any

import numpy as np

from desk.book.curve_source import BondFit, CurveBonds
from desk.rates.fitting import CurveFit
from desk.rates.quoted_flows import QuotedFlows, flow_yields
from desk.report.results.checks import Checks
from desk.report.results.naming import Naming
from desk.report.results.plan import FIRST_ROW, Formula, SheetPlan

__all__ = ["BOND_WORK", "plan_bonds"]

BOND_WORK = 4_000_000
"""Payments times bonds that the formulas may cost a spreadsheet; above it bonds are not repriced there."""


def plan_bonds(
    bonds: CurveBonds,
    flows: QuotedFlows,
    fit: CurveFit,
    *,
    how: BondFit,
    name: str,
    title: str,
    naming: Naming,
    checks: Checks,
) -> SheetPlan:
    """Plan the sheet.

    Parameters
    ----------
    bonds : CurveBonds
    flows : QuotedFlows
        What they pay, per 100 of nominal, in their order.
    fit : CurveFit
    how : BondFit
    name, title : str
        Of the sheet on the first basis.
    naming : Naming
    checks : Checks
        Gains the check of this sheet.
    """
    count, payments = len(bonds), int(flows.time.size)
    is_live = count * payments <= BOND_WORK
    drawn = "Every bond used is repriced" if how is BondFit.EXACT else f"Fitted by {how.value}"
    note = (
        f"{drawn}; root mean square {fit.rmse_bp:.4g} and largest {fit.largest_bp:.4g} basis points. A "
        "residual is the yield on the curve less the yield quoted."
    )
    if not is_live:
        note += f" {payments:,} payments are too many to reprice here."
    plan = SheetPlan(naming.sheet(name), naming.title(title), note)
    plan.widths = {1: 26.0, 2: 12.0} | dict.fromkeys(range(3, 24), 12.5) | {17: 9.0, 18: 3.0}
    plan.headings(
        [
            "Bond", "Maturity", "Coupon [a year]", "Frequency [a year]", "Price quoted [per 100]",
            "Price kind", "Yield quoted [a year]", "Used", "Price with interest, quoted [per 100]",
            "Price on the curve, reported [per 100]", "Price on the curve, recomputed [per 100]",
            "Yield quoted, continuous [a year]", "Yield on the curve, continuous [a year]",
            "Residual, reported [basis points]", "Residual, recomputed [basis points]", "Difference", "Check",
        ],
    )  # fmt: skip
    worth = flows.target + fit.residual_price
    quoted, fitted = flow_yields(flows), flow_yields(flows, target=worth)
    first, last = FIRST_ROW, FIRST_ROW + payments - 1
    number, time, amount, value = (plan.area(column, first, last) for column in (19, 20, 21, 23))
    plan.headings(
        [
            "Payment: bond number",
            "Time [years]",
            "Amount [per 100]",
            "Zero rate [a year]",
            "Present value [per 100]",
        ],
        column=19,
        left=0,
    )
    for row in range(count):
        at = FIRST_ROW + row
        is_clean = bool(bonds.is_clean[row])
        has_price = bool(np.isfinite(bonds.price[row]))
        cells: list[tuple[Any, str, str]] = [
            (bonds.names[row] or f"bond {row + 1}", "text", "text"),
            (bonds.maturity[row].item(), "input", "date"),
            (float(bonds.coupon[row]), "input", "rate"),
            (int(bonds.frequency[row]), "input", "whole"),
            (float(bonds.price[row]) if has_price else None, "input", "money2"),
            (("clean" if is_clean else "dirty") if has_price else None, "text", "text"),
            (None if has_price else float(bonds.bond_yield[row]), "input", "rate"),
            ("yes" if fit.is_used[row] else "no", "text", "text"),
            (float(flows.target[row]), "reported", "years"),
            (float(worth[row]), "reported", "years"),
        ]
        if is_live:
            has_yield = bool(np.isfinite(quoted[row]) and np.isfinite(fitted[row]))
            mine = f"({number}={row + 1})*{amount}"
            away = f"ABS(J{at}-K{at})"
            cells.append((Formula(f"=SUMPRODUCT(({number}={row + 1})*{value})"), "live", "years"))
            cells.append((float(quoted[row]) if has_yield else None, "reported", "rate"))
            cells.append((float(fitted[row]) if has_yield else None, "reported", "rate"))
            cells.append((float(fit.residual_bp[row]), "reported", "years"))
            if has_yield:
                cells.append((Formula(f"=(M{at}-L{at})/basis_point"), "live", "years"))
                # A yield is one if it gives the price back.
                away += f"+ABS(I{at}-SUMPRODUCT({mine}*EXP(-L{at}*{time})))"
                away += f"+ABS(K{at}-SUMPRODUCT({mine}*EXP(-M{at}*{time})))+ABS(N{at}-O{at})*100*basis_point"
            plan.put(at, 16, Formula(f"={away}"), "live", "tiny")
            plan.put(at, 17, Formula(f'=IF(P{at}<=check_tolerance*MAX(1,ABS(I{at})),"OK","CHECK")'), "check")
        else:
            cells += [(None, "", "")] * 3 + [(float(fit.residual_bp[row]), "reported", "years")]
        plan.table_row(at, 1, cells)
    if is_live:
        zero = fit.curve.zero(flows.time)
        for row in range(payments):
            at = FIRST_ROW + row
            plan.table_row(
                at,
                19,
                [
                    (int(flows.instrument[row]) + 1, "reported", "whole"),
                    (float(flows.time[row]), "input", "years"),
                    (float(flows.amount[row]), "input", "years"),
                    (float(zero[row]), "input", "rate"),
                    (Formula(f"=U{at}*EXP(-V{at}*T{at})"), "live", "years"),
                ],
            )
        area = plan.mark_checks(17, FIRST_ROW, FIRST_ROW + count - 1)
        checks.add_column(naming.figure(f"{title}: bonds that differ"), plan, area)
    else:
        checks.left_out.append(naming.figure(f"{title}: not repriced, there are too many payments."))
    return plan
