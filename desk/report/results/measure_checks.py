"""The checks of every measure of both sides, of the gaps between them, and of expected inflation."""

from __future__ import annotations

import math

from desk.book import Side
from desk.report.results.checks import Checks
from desk.report.results.flows import FlowSheet
from desk.report.results.naming import FIRST, Naming
from desk.report.wording import SIDE_NAMES
from desk.valuation.records import InflationStanding, Measures, Standing

__all__ = ["check_inflation", "check_measures"]


def check_measures(
    standing: Standing, sheets: dict[Side, FlowSheet], checks: Checks, *, naming: Naming = FIRST
) -> dict[str, str]:
    """Plan the checks of every measure of both sides and of the gaps between them.

    Parameters
    ----------
    standing : Standing
    sheets : dict of Side to FlowSheet
    checks : Checks
    naming : Naming

    Returns
    -------
    dict of str to str
        Addresses of recomputed figures: ``surplus``, ``funding_ratio``, ``duration_gap``, ``dv01_gap``, and
        for each side ``assets_present_value`` and so on; empty where a figure has no meaning.
    """
    found: dict[str, str] = {}
    for side, measures in ((Side.ASSETS, standing.assets), (Side.LIABILITIES, standing.liabilities)):
        found |= _check_side(side, measures, sheets[side], checks, standing.currency, naming)
    worth_a, worth_l = found["assets_present_value"], found["liabilities_present_value"]
    if not (worth_a and worth_l):
        return found
    place = naming.sheet("Standing")
    timed = [f"SUM({sheets[side].prefix}_timed)" for side in (Side.ASSETS, Side.LIABILITIES)]
    money = {"sheet": place, "unit": standing.currency, "form": "money2"}
    found["surplus"] = checks.add(
        naming.figure("Surplus"),
        reported=standing.surplus,
        formula=f"={worth_a}-{worth_l}",
        scale=f"ABS({worth_a})+ABS({worth_l})",
        **money,
    )
    found["funding_ratio"] = checks.add(
        naming.figure("Funding ratio"),
        sheet=place,
        unit="share",
        form="share",
        reported=standing.funding_ratio,
        formula=f"={worth_a}/{worth_l}",
    )
    found["duration_gap"] = checks.add(
        naming.figure("Duration gap"),
        sheet=place,
        unit="years",
        form="years",
        reported=standing.duration_gap,
        formula=f"=({timed[0]}-{timed[1]})/{worth_a}",
    )
    if found.get("assets_dv01") and found.get("liabilities_dv01"):
        found["dv01_gap"] = checks.add(
            _kept_capitals(naming, "DV01 gap"),
            reported=standing.dv01_gap,
            formula=f"={found['assets_dv01']}-{found['liabilities_dv01']}",
            scale=f"ABS({found['assets_dv01']})+ABS({found['liabilities_dv01']})",
            **money,
        )
    return found


def _check_side(
    side: Side, measures: Measures, sheet: FlowSheet, checks: Checks, currency: str, naming: Naming
) -> dict[str, str]:
    """The checks of one side."""
    prefix, name, place = sheet.prefix, naming.figure(SIDE_NAMES[side]), sheet.plan.name
    found: dict[str, str] = {}

    def add(key: str, label: str, unit: str, form: str, formula: str, scale: str = "") -> None:
        found[f"{side.value}_{key}"] = checks.add(
            f"{name}: {label}",
            sheet=place,
            unit=unit,
            form=form,
            reported=getattr(measures, key),
            formula=formula,
            scale=scale,
        )

    add("present_value", "present value", currency, "money2", f"=SUM({prefix}_value)")
    worth = found[f"{side.value}_present_value"]
    if not worth:
        return found
    checks.add(
        f"{name}: rows' present values, sum of differences",
        sheet=place,
        unit=currency,
        form="tiny",
        reported=0.0,
        formula=f"=SUMPRODUCT(ABS({prefix}_difference))",
        scale=worth,
    )
    if sheet.has_paid and sheet.is_by_row:
        checks.add(
            f"{name}: present value of what is paid, as projected",
            sheet=place,
            unit=currency,
            form="money2",
            reported=measures.present_value,
            formula=f"=SUMPRODUCT({prefix}_paid,{prefix}_discount)",
            scale=f"SUMPRODUCT(ABS({prefix}_value))",
        )
    if math.isfinite(measures.effective_duration):
        add("effective_duration", "effective duration", "years", "years", f"=SUM({prefix}_timed)/{worth}")
        add("convexity", "convexity", "years²", "years2", f"=SUM({prefix}_timed_twice)/{worth}")
        duration, convexity = found[f"{side.value}_effective_duration"], found[f"{side.value}_convexity"]
        add("dispersion", "dispersion", "years²", "years2", f"={convexity}-{duration}*{duration}", convexity)
    if not sheet.is_by_row:
        checks.left_out.append(
            f"{name}: DV01, equivalent rate and the durations at it need every flow; {sheet.rows_before:,} "
            "are too many to show one by one, so they are not recomputed here."
        )
        return found
    add(
        "dv01", "DV01", currency, "money2",
        f"=SUMPRODUCT({prefix}_value,1-EXP(-basis_point*{prefix}_time))",
    )  # fmt: skip
    if math.isfinite(measures.equivalent_rate):
        rate = checks.reported_address(ahead=3)
        at_rate = f"{prefix}_amount*EXP(-LN(1+{rate})*{prefix}_time)"
        worth_at_rate = checks.add(
            f"{name}: present value at the equivalent rate",
            sheet=place,
            unit=currency,
            form="money2",
            reported=measures.present_value,
            formula=f"=SUMPRODUCT({at_rate})",
        )
        add("macaulay_duration", "Macaulay duration", "years", "years",
            f"=SUMPRODUCT({prefix}_time*{at_rate})/{worth_at_rate}")  # fmt: skip
        macaulay = found[f"{side.value}_macaulay_duration"]
        add("modified_duration", "modified duration", "years", "years", f"={macaulay}/(1+{rate})")
        # One Newton step from the reported rate: it stays where it is only if it is the root.
        add("equivalent_rate", "equivalent rate, one Newton step on", "a year", "rate",
            f"=(1+{rate})*EXP(({worth_at_rate}-{worth})/({worth_at_rate}*{macaulay}))-1")  # fmt: skip
    return found


def _kept_capitals(naming: Naming, label: str) -> str:
    """A figure whose name begins with an abbreviation."""
    return f"Second basis: {label}" if naming.is_second else label


def check_inflation(
    inflation: InflationStanding,
    sheets: dict[Side, FlowSheet],
    recomputed: dict[str, str],
    checks: Checks,
    *,
    is_live: bool,
    is_smooth: bool,
    currency: str,
    naming: Naming = FIRST,
) -> dict[str, str]:
    """Plan the checks of how both sides follow expected inflation.

    Parameters
    ----------
    inflation : InflationStanding
    sheets : dict of Side to FlowSheet
    recomputed : dict of str to str
        See `check_measures`.
    checks : Checks
    is_live : bool
        Whether all growth is recomputed.
    is_smooth : bool
        Whether the durations have one value.
    currency : str
    naming : Naming

    Returns
    -------
    dict of str to str
        Addresses of recomputed figures by the names of `InflationStanding`.
    """
    found: dict[str, str] = {}
    worths = {side: recomputed.get(f"{side.value}_present_value", "") for side in Side}
    if not is_live or not all(sheet.is_by_row for sheet in sheets.values()):
        checks.left_out.append(
            naming.figure(
                "Inflation durations and DV01 need the growth of every flow; they are not recomputed here."
            )
        )
        return found
    slopes = {
        side: f"SUMPRODUCT({sheet.prefix}_value,{sheet.prefix}_inflation_years)"
        if sheet.follows_inflation
        else "0"
        for side, sheet in sheets.items()
    }
    place = naming.sheet("Standing")
    for side in (Side.ASSETS, Side.LIABILITIES):
        sheet = sheets[side]
        rise = f"SUM({sheet.prefix}_inflation_rise)" if sheet.follows_inflation else "0"
        gross = f"SUMPRODUCT(ABS({sheet.prefix}_value))"
        name = f"dv01_{side.value}"
        found[name] = checks.add(
            naming.figure(f"{SIDE_NAMES[side]}: inflation DV01"),
            sheet=sheet.plan.name,
            unit=currency,
            form="money2",
            reported=getattr(inflation, name),
            formula=f"={rise}",
            scale=f"0.01*{gross}" if sheet.follows_inflation else "",
        )
        if is_smooth and worths[side]:
            name = f"{side.value}_duration"
            found[name] = checks.add(
                naming.figure(f"{SIDE_NAMES[side]}: inflation duration"),
                sheet=sheet.plan.name,
                unit="years",
                form="years",
                reported=getattr(inflation, name),
                formula=f"={slopes[side]}/{worths[side]}",
            )
    if is_smooth and worths[Side.ASSETS]:
        found["real_duration_gap"] = checks.add(
            naming.figure("Real duration gap"),
            sheet=place,
            unit="years",
            form="years",
            reported=inflation.real_duration_gap,
            formula=f"=({slopes[Side.ASSETS]}-{slopes[Side.LIABILITIES]})/{worths[Side.ASSETS]}",
        )
    if not is_smooth:
        checks.left_out.append(
            naming.figure(
                "Inflation durations are not recomputed: without deviation they jump where expected "
                "inflation meets a floor or a cap."
            )
        )
    if found["dv01_assets"] and found["dv01_liabilities"]:
        found["dv01_gap"] = checks.add(
            naming.figure("Inflation DV01 gap"),
            sheet=place,
            unit=currency,
            form="money2",
            reported=inflation.dv01_gap,
            formula=f"={found['dv01_assets']}-{found['dv01_liabilities']}",
            scale=f"ABS({found['dv01_assets']})+ABS({found['dv01_liabilities']})",
        )
    return found
