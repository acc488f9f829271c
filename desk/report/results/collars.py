"""Collared growth by year: floors and caps on each year's increase, by Bachelier's formula in cells."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from desk.book import Indexation, IndexationKind, Inflation, PricedFlows, Side
from desk.rates.inflation import log_growth, unknown_years
from desk.report.results.checks import Checks
from desk.report.results.naming import Naming
from desk.report.results.plan import Formula, SheetPlan
from desk.valuation.indexing import CollarTables, IndexClasses

__all__ = ["COLLAR_ROWS", "ClassPlace", "plan_collars"]

COLLAR_ROWS = 4_000
"""Years of collared growth that are shown one by one; above it the growth of such rows is a value."""
_NO_DEVIATION = "1E-30"
_NEAR, _LEAST_DEVIATION = 1e-9, 1e-5


@dataclass(frozen=True)
class ClassPlace:
    """Where one way to grow stands.

    Attributes
    ----------
    number : int
        From 1.
    indexation : Indexation
    rise, lag, least : str
        Addresses of its terms.
    years : int
        Of the table of a collared one; 0 where there is none.
    log, log_up, slope : str
        Areas of the table: logarithm of growth, that for +1 basis point, its slope.
    """

    number: int
    indexation: Indexation
    rise: str
    lag: str
    least: str
    years: int = 0
    log: str = ""
    log_up: str = ""
    slope: str = ""


def plan_collars(
    plan: SheetPlan,
    inflation: Inflation,
    flows: Mapping[Side, PricedFlows],
    classes: dict[Side, tuple[ClassPlace, ...]],
    naming: Naming,
    checks: Checks,
    row: int,
) -> tuple[dict[Side, tuple[ClassPlace, ...]], bool, bool]:
    """The years of every collared class; returns the classes, and whether all is live and smooth."""
    years: dict[tuple[Side, int], int] = {}
    is_smooth = True
    for side, own in flows.items():
        for number, place in enumerate(classes[side]):
            if place.indexation.kind is IndexationKind.COLLARED and own.index_class is not None:
                time = own.time[own.index_class == number]
                if time.size:
                    years[side, number] = max(int(np.ceil(time.max())), 1)
            is_smooth &= _is_smooth(place.indexation, inflation, own)
    rows = sum(count + 1 for count in years.values())
    if rows > COLLAR_ROWS:
        plan.put(
            row, 1, f"{rows:,} years of collared growth, too many to recompute one by one: it is a value.",
            "note",
        )  # fmt: skip
        checks.left_out.append(naming.figure("Collared growth is not recomputed: it takes too many years."))
        return classes, False, is_smooth
    if not years:
        return classes, True, is_smooth
    plan.put(row, 1, "Collared growth by year", "title")
    plan.headings(
        [
            "Number",
            "Year",
            "Years of the index ahead",
            "Expected inflation to then, continuous [a year]",
            "ln of the index",
            "Deviation of the year",
            "Increase of the index in the year",
            "Increase expected between floor and cap",
            "ln of the growth",
            "Growth, reported",
            "Difference",
            "Check",
            "Increase of the index, +1 basis point",
            "Increase expected, +1 basis point",
            "ln of the growth, +1 basis point",
            "Slope of ln of the growth [years]",
        ],
        row=row + 1,
        left=0,
    )
    at = row + 2
    first = at
    classes = {side: tuple(places) for side, places in classes.items()}
    for (side, number), count in years.items():
        places = list(classes[side])
        places[number] = _collar(plan, inflation, places[number], count, at, naming)
        classes[side] = tuple(places)
        at += count + 1
    area = plan.mark_checks(12, first, at - 1)
    checks.add_column(naming.figure("Years of collared growth that differ"), plan, area)
    return classes, True, is_smooth


def _is_smooth(indexation: Indexation, inflation: Inflation, flows: PricedFlows) -> bool:
    """Whether growth has one slope everywhere, and rounding does not show in it."""
    deviation = inflation.volatility
    if deviation > _LEAST_DEVIATION or not flows.time.size:
        return True
    last = float(flows.time.max())
    if indexation.kind is IndexationKind.COLLARED:
        ends = np.arange(0.0, min(float(np.ceil(last)), 1000.0) + 1.0)
        edges = [edge for edge in (indexation.floor, indexation.cap) if edge is not None]
    elif indexation.least:
        ends, edges = flows.time, [float(np.log(indexation.least))]
        deviation *= float(np.sqrt(last))
    else:
        return True
    log = log_growth(ends, curve=inflation.curve, recent_rate=inflation.recent_rate, lag=indexation.lag)
    level = np.expm1(np.diff(log)) if indexation.kind is IndexationKind.COLLARED else log
    return all(bool((np.abs(level - edge) > _NEAR + 10.0 * deviation).all()) for edge in edges)


def _collar(
    plan: SheetPlan, inflation: Inflation, place: ClassPlace, count: int, first: int, naming: Naming
) -> ClassPlace:
    """The years of one collared class."""
    own = place.indexation
    recent, volatility = naming.name("inflation_recent"), naming.name("inflation_volatility")
    lag = place.lag.rsplit("!", 1)[1]
    class_row = lag.rsplit("$", 1)[1]
    floor = f"MAX($D${class_row},-1)" if own.floor is not None else "-1"
    cap = f"MAX($E${class_row},-1)" if own.cap is not None else ""
    ends = np.arange(count + 1.0)
    ahead = unknown_years(ends, lag=own.lag)
    zero = inflation.curve.zero(ahead)
    growth = np.exp(_log_factors(inflation, own, count))

    def expected(mean: str, deviation: str) -> str:
        size = f"MAX({deviation},{_NO_DEVIATION})"
        text = f"{mean}+{_excess(floor, mean, deviation, size)}"
        held = f"MAX({floor},{text}" + (f"-{_excess(mean, cap, deviation, size)}" if cap else "") + ")"
        return f"MIN({cap},{held})" if cap else held

    for offset in range(count + 1):
        row, before = first + offset, first + offset - 1
        cells: list[tuple[Any, str, str]] = [
            (place.number, "reported", "whole"),
            (offset, "reported", "whole"),
            (Formula(f"=MAX(B{row}-{lag},0)"), "live", "years"),
            (float(zero[offset]), "input", "rate"),
            (Formula(f"={recent}*MIN(B{row},{lag})+D{row}*C{row}"), "live", "factor"),
        ]
        if offset:
            cells += [
                (Formula(f"={volatility}*SQRT(C{row}-C{before})"), "live", "rate"),
                (Formula(f"=EXP(E{row}-E{before})-1"), "live", "rate"),
                (Formula("=" + expected(f"G{row}", f"F{row}")), "live", "rate"),
                (Formula(f"=I{before}+LN(MAX(1+H{row},1E-300))"), "live", "factor"),
            ]
        else:
            cells += [(None, "", "")] * 3 + [(0.0, "reported", "factor")]
        cells += [
            (float(growth[offset]), "reported", "factor"),
            (Formula(f"=J{row}-EXP(I{row})"), "live", "tiny"),
            (Formula(f'=IF(ABS(K{row})<=check_tolerance*MAX(1,J{row}),"OK","CHECK")'), "check", "text"),
        ]
        if offset:
            size = f"MAX(F{row},{_NO_DEVIATION})"
            above = f"NORMSDIST(({cap}-G{row})/{size})" if cap else "1"
            inside = f"({above}-NORMSDIST(({floor}-G{row})/{size}))"
            cells += [
                (Formula(f"=(1+G{row})*EXP(basis_point*(C{row}-C{before}))-1"), "live", "rate"),
                (Formula("=" + expected(f"M{row}", f"F{row}")), "live", "rate"),
                (Formula(f"=O{before}+LN(MAX(1+N{row},1E-300))"), "live", "factor"),
                (
                    Formula(f"=P{before}+{inside}*(1+G{row})/MAX(1+H{row},1E-300)*(C{row}-C{before})"),
                    "live",
                    "years",
                ),
            ]
        else:
            cells += [(None, "", "")] * 2 + [(0.0, "reported", "factor"), (0.0, "reported", "years")]
        plan.table_row(row, 1, cells)
    last = first + count
    log, log_up, slope = (plan.area(column, first, last) for column in (9, 15, 16))
    return ClassPlace(
        place.number, own, place.rise, place.lag, place.least, count, log=log, log_up=log_up, slope=slope
    )


def _excess(high: str, low: str, deviation: str, size: str) -> str:
    """Expected excess of `high` over `low`, one of which is normal: Bachelier's formula."""
    distance = f"({high}-{low})"
    scaled = f"({distance}/{size})"
    return f"({distance}*NORMSDIST{scaled}+{deviation}*EXP(-0.5*{scaled}*{scaled})/SQRT(2*PI()))"


def _log_factors(inflation: Inflation, indexation: Indexation, count: int) -> np.ndarray:
    """Logarithm of collared growth to the end of each year, as the program has it."""
    classes = IndexClasses.of((indexation,))
    (tables,) = CollarTables.of(classes, np.zeros(1, dtype=np.int64), np.array([float(count)]))
    table = tables.grown(inflation, inflation.curve).log_factor[0]
    if table.size >= count + 1:
        return np.asarray(table[: count + 1])
    # Beyond the years that are told apart the growth of the last goes on.
    beyond = np.arange(1, count + 2 - table.size)
    return np.concatenate((table, table[-1] + beyond * (table[-1] - table[-2])))
