"""The sheets of shocks: what each does to both sides, what it is made of, and its revaluation."""

from __future__ import annotations

import math
from dataclasses import dataclass

from desk.book import PricedFlows, Side
from desk.rates.curve import DiscountCurve
from desk.report.results.checks import Checks
from desk.report.results.flows import FlowSheet
from desk.report.results.plan import SheetPlan
from desk.report.results.shocks_moves import plan_moves
from desk.report.results.shocks_profile import gap_turns_text, plan_profile
from desk.report.results.shocks_rates import plan_rates, terms_of
from desk.report.results.shocks_recomputed import plan_recomputed
from desk.report.results.shocks_results import FIRST_RESULT, SHOCKS_SHEET, last_row, names_of, plan_results
from desk.valuation.shock_records import ShockResult, ShockTable

__all__ = ["SHOCKS_SHEET", "ShockPlans", "plan_shocks", "shock_notes", "worst_of"]


@dataclass(frozen=True)
class ShockPlans:
    """The planned sheets of shocks.

    Attributes
    ----------
    sheets : list of SheetPlan
        In their order.
    names : dict of str to str
        Names that the workbook defines.
    least_surplus : str
        Address of the least surplus after a shock, recomputed.
    """

    sheets: list[SheetPlan]
    names: dict[str, str]
    least_surplus: str


def plan_shocks(
    found: ShockTable,
    *,
    flows: dict[Side, PricedFlows],
    sheets: dict[Side, FlowSheet],
    recomputed: dict[str, str],
    curve: DiscountCurve,
    checks: Checks,
) -> ShockPlans:
    """Plan every sheet of shocks.

    Parameters
    ----------
    found : ShockTable
        With at least one result.
    flows : dict of Side to PricedFlows
    sheets : dict of Side to FlowSheet
    recomputed : dict of str to str
        Addresses of recomputed figures of the standing: see `desk.report.results.standing.check_measures`.
    curve : DiscountCurve
        Before any shock.
    checks : Checks
        Gains the checks of these sheets.
    """
    terms, reason = terms_of(found, flows, sheets, curve)
    if reason:
        checks.left_out.append(reason)
    moves, places, names = plan_moves(found)
    plan = plan_results(found, reason=reason, recomputed=recomputed, checks=checks)
    names |= names_of(plan, found)
    planned = [plan, moves]
    if terms is not None:
        rates, own = plan_rates(found, terms, sheets, places, checks)
        names |= own
        one, own = plan_recomputed(
            found, terms, shocks_sheet=plan.name, first_result=FIRST_RESULT, reason=reason, checks=checks
        )
        names |= own
        planned += [rates, one]
    planned.append(plan_profile(found, terms, checks))
    least = checks.add(
        "Least surplus after a shock",
        sheet=plan.name,
        unit=found.currency,
        form="money2",
        reported=min(result.surplus for result in found.results),
        formula=f"=MIN({plan.area(14, FIRST_RESULT, last_row(found))})",
        scale="MAX(shock_base_assets,shock_base_liabilities)",
    )
    return ShockPlans(planned, names, least)


def worst_of(found: ShockTable) -> ShockResult:
    """The shock after which the surplus is least."""
    return min(found.results, key=lambda result: result.surplus)


def shock_notes(found: ShockTable | None) -> list[str]:
    """What the summary says of shocks.

    Parameters
    ----------
    found : ShockTable or None

    Returns
    -------
    list of str
        One paragraph each.
    """
    if found is None or not found.results:
        return ["No shocks were computed: those sheets are left out."]
    worst = worst_of(found)
    after = f"the surplus is least, {_grouped(worst.surplus)} {found.currency}"
    if math.isfinite(worst.funding_ratio):
        after += f", and the funding ratio {100.0 * worst.funding_ratio:.2f} %"
    whole = f"{worst.set_name}: {worst.name}" if worst.set_name else worst.name
    notes = [f"Of {len(found.results):,} shocks, {after}, after “{whole}”."]
    ratios = [result.funding_ratio for result in found.results]
    if found.thresholds and all(math.isfinite(ratio) for ratio in ratios):
        listed = ", ".join(
            f"{sum(ratio < threshold for ratio in ratios)} below {100.0 * threshold:g} %"
            for threshold in found.thresholds
        )
        notes[0] += f" Funding ratios by threshold: {listed}."
    notes.append(gap_turns_text(found.profile))
    return notes


def _grouped(figure: float) -> str:
    return f"{figure:,.0f}".replace("-", "−")
