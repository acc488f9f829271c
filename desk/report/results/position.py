"""The sheets of one basis: its curve, the basis of the liabilities, expected inflation, and the flows."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from desk.book import Book, PricedFlows, Side
from desk.report.results.bonds import plan_bonds
from desk.report.results.checks import Checks
from desk.report.results.curve import plan_curve
from desk.report.results.flows import ROW_CAP, FlowSheet, further_columns, plan_flows
from desk.report.results.growth import Growth, plan_growth
from desk.report.results.growth_columns import add_growth, add_real_payments
from desk.report.results.inputs import plan_basis
from desk.report.results.liability_basis import add_spreads, plan_liability_basis
from desk.report.results.measure_checks import check_inflation, check_measures
from desk.report.results.naming import Naming
from desk.report.results.plan import SheetPlan
from desk.valuation.priced import priced_flows
from desk.valuation.records import Standing

__all__ = ["Position", "plan_position"]


@dataclass(frozen=True)
class Position:
    """The planned sheets of one basis.

    Attributes
    ----------
    before : list of SheetPlan
        Basis, curve and what belongs to them, in their order.
    sheets : dict of Side to FlowSheet
    flows : dict of Side to PricedFlows
    growth : Growth or None
    recomputed : dict of str to str
        Addresses of recomputed figures; those of inflation begin with ``inflation_``.
    names : dict of str to str
        Names that the workbook defines.
    largest : float
        Sum of the amounts of one side without their signs [currency].
    """

    before: list[SheetPlan]
    sheets: dict[Side, FlowSheet]
    flows: dict[Side, PricedFlows]
    growth: Growth | None
    recomputed: dict[str, str]
    names: dict[str, str] = field(default_factory=dict)
    largest: float = 0.0


def plan_position(book: Book, standing: Standing, naming: Naming, checks: Checks) -> Position:
    """Plan the sheets of one basis.

    Parameters
    ----------
    book : Book
        On that basis.
    standing : Standing
    naming : Naming
    checks : Checks
        Gains the checks of these sheets.
    """
    basis = book.basis
    priced = {side: priced_flows(book, side) for side in Side}
    flows = {side: own.flows for side, own in priced.items()}
    by_row = {side: own for side, own in flows.items() if len(own) <= ROW_CAP}
    growth = plan_growth(basis.inflation, by_row, naming, checks)
    sheets: dict[Side, FlowSheet] = {}
    for side, own in flows.items():
        further = further_columns(own)
        if side in by_row:
            if growth is not None:
                add_growth(further, own, growth, currency=standing.currency)
                add_real_payments(further, own, growth, currency=standing.currency)
            if side is Side.LIABILITIES:
                add_spreads(further, own, book, naming)
        sheets[side] = plan_flows(
            own, priced[side].date, basis.curve, currency=standing.currency, further=further, naming=naming
        )
    recomputed = check_measures(standing, sheets, checks, naming=naming)
    if standing.inflation is not None and growth is not None:
        found = check_inflation(
            standing.inflation,
            sheets,
            recomputed,
            checks,
            is_live=growth.is_live,
            is_smooth=growth.is_smooth,
            currency=standing.currency,
            naming=naming,
        )
        recomputed |= {f"inflation_{name}": place for name, place in found.items()}
    last = max(float(own.time.max(initial=0.0)) for own in flows.values())
    names: dict[str, str] = {}
    curve = plan_curve(basis, last_time=last, checks=checks, naming=naming)
    before = [plan_basis(book, curve, checks, naming=naming, names=names), curve]
    if basis.curve_fit is not None and basis.bonds is not None:
        before.append(
            plan_bonds(
                basis.bonds,
                basis.quoted_bonds,
                basis.curve_fit,
                how=basis.bond_fit,
                name="Curve bonds",
                title="Bonds of the curve",
                naming=naming,
                checks=checks,
            )
        )
    rate = recomputed.get("liabilities_equivalent_rate", "")
    liability = plan_liability_basis(basis, standing, naming, rate_address=rate)
    names |= liability.names
    if liability.plan is not None:
        before.append(liability.plan)
    if basis.liability_curve_fit is not None and basis.liability_bonds is not None:
        before.append(
            plan_bonds(
                basis.liability_bonds,
                basis.liability_bonds_quoted,
                basis.liability_curve_fit,
                how=basis.liability_fit,
                name="Liability bonds",
                title="High-quality corporate bonds",
                naming=naming,
                checks=checks,
            )
        )
    if growth is not None:
        before.append(growth.plan)
        names |= growth.names
    for sheet in sheets.values():
        names |= sheet.names
    largest = max(float(np.abs(own.amount).sum()) for own in flows.values())
    return Position(before, sheets, flows, growth, recomputed, names, largest)
