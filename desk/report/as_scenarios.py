"""What a run drew beside the rates, and whether it was drawn right, as objects and as text."""

from __future__ import annotations

from typing import Any

import numpy as np

from desk.report.known_means import distances, judged
from desk.report.plain_numbers import percentile_name, plain_number, plain_rows
from desk.report.text_tables import MISSING, grouped, percent, printable, table, wrapped
from desk.scenarios.market_records import AssetSummary, IndexSummary, RiskySummary
from desk.scenarios.node_checks import FAR, NodeCheck, node_checks
from desk.scenarios.records import ClosedForm, NodeSummary, Simulation

__all__ = [
    "beside_text",
    "checks_object",
    "checks_text",
    "diagnostics_object",
    "levels_object",
    "price_index_object",
    "risky_assets_object",
    "summary_rows",
]

_ASSETS_SHOWN = 12
_BY_LEVEL = ("percentile_se", "percentile_low", "percentile_high", "tail_mean", "tail_mean_se")


def levels_object(levels: tuple[float, ...], values: Any) -> dict[str, float | int | None]:
    """A figure a percentile, under the names of the percentiles."""
    return {percentile_name(level): plain_number(value) for level, value in zip(levels, values, strict=True)}


def summary_rows(
    summary: NodeSummary, *, closed: ClosedForm | None = None, has_law: bool = False, **further: Any
) -> list[dict[str, Any]]:
    """A quantity by year: mean, standard deviation, percentiles, errors, tails, and what stands beside.

    Parameters
    ----------
    summary : NodeSummary
    closed : ClosedForm, optional
    has_law : bool
        Whether each row tells its closed form: None where there is none.
    further : ndarray, shape (n,)
        Columns by name.
    """
    percentiles = {
        percentile_name(level): summary.percentile[:, index] for index, level in enumerate(summary.levels)
    }
    rows: list[dict[str, Any]] = [
        dict(row)
        for row in plain_rows(
            year=summary.year,
            mean=summary.mean,
            sd=summary.sd,
            **percentiles,
            mean_se=summary.mean_se,
            sd_se=summary.sd_se,
            **further,
        )
    ]
    for number, row in enumerate(rows):
        for name in _BY_LEVEL:
            row[name] = levels_object(summary.levels, getattr(summary, name)[number])
        if has_law:
            row["closed_form"] = None if closed is None else _law(closed, summary.levels, number)
    return rows


def _law(closed: ClosedForm, levels: tuple[float, ...], number: int) -> dict[str, Any]:
    """The closed form in a year."""
    names = ("mean", "sd", "log_mean", "log_variance")
    return {
        **{name: plain_number(getattr(closed, name)[number]) for name in names},
        "percentile": levels_object(levels, closed.percentile[number]),
        "tail_mean": levels_object(levels, closed.tail_mean[number]),
    }


def risky_assets_object(risky: RiskySummary | None) -> dict[str, Any] | None:
    """The risky assets of a run; None where there are none."""
    if risky is None:
        return None
    mended = risky.mended
    return {
        "assets": [_asset(asset) for asset in risky.assets],
        "total": summary_rows(risky.total),
        "covariance": [[plain_number(value) for value in row] for row in risky.covariance.tolist()],
        "rates_correlation": [plain_number(value) for value in risky.rates_correlation.tolist()],
        "mended": None
        if mended is None
        else {
            "correlation": [[plain_number(value) for value in row] for row in mended.matrix.tolist()],
            "largest_change": plain_number(mended.largest_change),
            "least_eigenvalue": plain_number(mended.least_eigenvalue),
        },
        "counted": risky.counted,
    }


def _asset(asset: AssetSummary) -> dict[str, Any]:
    rows = summary_rows(
        asset.total_return,
        closed=asset.closed_form,
        has_law=True,
        mean_excess=asset.mean_excess,
        mean_excess_se=asset.mean_excess_se,
        expected_excess=asset.expected_excess,
    )
    return {"name": asset.name, "value": plain_number(asset.value), "total_return": rows}


def price_index_object(index: IndexSummary | None) -> dict[str, Any] | None:
    """The price index of a run; None where inflation is not drawn."""
    if index is None:
        return None
    rows = summary_rows(
        index.index,
        closed=index.closed_form,
        has_law=True,
        expected_index=index.expected_index,
        mean_discounted=index.mean_discounted,
        mean_discounted_se=index.mean_discounted_se,
        expected_discounted=index.expected_discounted,
    )
    return {"index": rows, "revalued": index.revalued, "matches_today": bool(index.matches_today)}


def checks_object(simulation: Simulation) -> list[dict[str, Any]]:
    """How the means of a run turned out that are known beforehand, over its years."""
    found = []
    for check in node_checks(simulation):
        result = judged(check)
        found.append(
            {
                "mean": check.title,
                "years": result.nodes,
                "beyond_3_se": result.far,
                "furthest_se": plain_number(result.worst),
                "furthest_year": plain_number(result.worst_year),
            }
        )
    return found


def diagnostics_object(simulation: Simulation) -> dict[str, Any]:
    """Means that are known beforehand, the short rate against its law, and the error of fitted values."""
    found = simulation.diagnostics
    rows = None
    if found is not None:
        rows = plain_rows(
            year=found.year,
            mean=found.rate_mean,
            sd=found.rate_sd,
            autoregression=found.autoregression,
            autoregression_se=found.autoregression_se,
            expected_autoregression=found.expected_autoregression,
        )
    return {
        "checks": checks_object(simulation),
        "short_rate_law": rows,
        "fit_error": fit_error(simulation),
    }


def fit_error(simulation: Simulation) -> float | None:
    """Of the values of later flows fitted at the nodes, as a part of the value; None where none is told."""
    told = dict(simulation.provenance.settings).get("surface_error")
    return None if told is None else float(told)


def beside_text(simulation: Simulation, *, currency: str) -> list[str]:
    """Risky assets and price index at the horizon as tables; nothing where there are none."""
    blocks = []
    horizon = f"{simulation.savings_account.year[-1]:g}"
    if simulation.risky is not None:
        blocks.append(
            f"Risky assets in year {horizon}: what 1 becomes, dividends reinvested\n"
            + _assets_table(simulation.risky, printable(currency))
        )
    if simulation.index is not None:
        levels = simulation.index.index.levels
        figures = _at_horizon(simulation.index.index)
        expected = grouped(float(simulation.index.expected_index[-1]), 4)
        blocks.append(
            f"Price index in year {horizon}, today's is 1\n"
            + table((*_headings(levels), "Expected today"), [(*figures, expected)], left=0)
            + "\n"
            + wrapped(simulation.index.revalued)
        )
    return blocks


def _assets_table(risky: RiskySummary, currency: str) -> str:
    rows = [
        (printable(asset.name)[:32], grouped(asset.value), *_at_horizon(asset.total_return))
        for asset in risky.assets[:_ASSETS_SHOWN]
    ]
    levels = risky.total.levels
    made = table(("Asset", f"Today\n[{currency}]", *_headings(levels)), rows)
    if len(risky.assets) > _ASSETS_SHOWN:
        made += f"\nThe first {_ASSETS_SHOWN} of {len(risky.assets):,}."
    return f"{made}\n{wrapped(risky.counted)}"


def _headings(levels: tuple[float, ...]) -> tuple[str, ...]:
    return ("Mean", "Standard\nerror", "Standard\ndeviation", *(f"{level:g} %" for level in levels))


def _at_horizon(summary: NodeSummary) -> tuple[str, ...]:
    """The last year of a quantity."""
    figures = (summary.mean[-1], summary.mean_se[-1], summary.sd[-1], *summary.percentile[-1].tolist())
    return tuple(grouped(float(value), 4) for value in figures)


def checks_text(simulation: Simulation) -> str:
    """How the means turned out that are known beforehand, a line each, and the short rate at the horizon."""
    made = "Means over the paths that are known beforehand\n" + table(
        (
            "Mean",
            "Years\ncompared",
            f"Beyond {FAR:g}\nstandard errors",
            "Furthest off\n[standard errors]",
            "In year",
        ),
        [_check_row(check) for check in node_checks(simulation)],
    )
    worst = fit_error(simulation)
    if worst is not None and worst > 0.0:
        made += f"\n\nValues of later flows are fitted at the nodes, to {worst:.0e} of the value at worst."
    found, rate = simulation.diagnostics, simulation.short_rate
    if found is None or not np.isfinite(found.rate_mean).any():
        return made
    rows = []
    for title, value, error, expected in (
        ("Mean", rate.mean, rate.mean_se, found.rate_mean),
        ("Standard deviation", rate.sd, rate.sd_se, found.rate_sd),
    ):
        distance = float(distances(value, error, expected).distance[-1])
        figures = (float(value[-1]), float(error[-1]), float(expected[-1]))
        rows.append((title, *(percent(figure, 4) for figure in figures), grouped(distance, 2)))
    slope = (found.autoregression, found.autoregression_se, found.expected_autoregression)
    told = (grouped(float(column[-1]), 6) for column in slope)
    distance = float(distances(*slope).distance[-1])
    rows.append(("Slope on a step before", *told, grouped(distance, 2)))
    headings = ("", "Paths", "Standard\nerror", "Closed form", "Difference\n[standard errors]")
    year = f"{found.year[-1]:g}"
    return f"{made}\n\nShort rate in year {year} against its law [% a year; the slope as it is]\n" + table(
        headings, rows
    )


def _check_row(check: NodeCheck) -> tuple[str, ...]:
    result = judged(check)
    return (
        printable(check.title)[:44],
        f"{result.nodes:,}",
        f"{result.far:,}",
        grouped(result.worst, 2),
        f"{result.worst_year:g}" if result.nodes else MISSING,
    )
