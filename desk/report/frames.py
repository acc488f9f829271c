"""Results as pandas data frames, for people who script.

Columns carry plain names; amounts are in the book's currency, times in years, rates per year.
"""

from __future__ import annotations

from dataclasses import asdict
from typing import TYPE_CHECKING, Any

from desk.report.as_json import percentile_name
from desk.scenarios.records import NodeSummary, Simulation
from desk.valuation.records import Standing

if TYPE_CHECKING:
    import pandas as pd

__all__ = [
    "distribution_frame",
    "key_rate_frame",
    "line_frame",
    "period_frame",
    "savings_account_frame",
    "short_rate_frame",
]


def line_frame(standing: Standing) -> pd.DataFrame:
    """The lines of both sides, one row each, with every measure; indexed by side and line."""
    import pandas as pd

    rows = [
        {
            "side": line.side.value,
            "line": line.line,
            "kind": line.kind,
            "flow_count": line.flow_count,
            "market_value": line.market_value,
            "spread": line.spread,
            "spread_duration": line.spread_duration,
            "expected_credit_loss": line.expected_credit_loss,
            **asdict(line.measures),
        }
        for line in standing.lines
    ]
    may_miss = ["market_value", "spread", "spread_duration", "expected_credit_loss"]
    columns = ["side", "line", "kind", "flow_count", *may_miss, *asdict(standing.assets)]
    frame = pd.DataFrame(rows, columns=columns)
    return frame.astype(dict.fromkeys(may_miss, float)).set_index(["side", "line"])


def key_rate_frame(standing: Standing) -> pd.DataFrame:
    """Key-rate durations and DV01 of both sides, indexed by term."""
    return _frame(standing.key_rates, "term", "assets", "liabilities", "dv01_assets", "dv01_liabilities")


def period_frame(standing: Standing) -> pd.DataFrame:
    """Undiscounted flows of both sides, indexed by year from the valuation date."""
    return _frame(standing.periods, "year", "assets", "liabilities", "net", "cumulative")


def savings_account_frame(simulation: Simulation) -> pd.DataFrame:
    """The savings account by year with standard errors, intervals and the repricing check."""
    frame = _summary_frame(simulation.savings_account)
    check = simulation.repricing
    for name in ("mean_discount", "mean_discount_se", "curve_discount", "expected_discount"):
        frame[name] = getattr(check, name)
    return frame


def short_rate_frame(simulation: Simulation) -> pd.DataFrame:
    """The short rate by year with standard errors and intervals."""
    return _summary_frame(simulation.short_rate)


def distribution_frame(simulation: Simulation) -> pd.DataFrame:
    """The pathwise present values: one row each for assets, liabilities and surplus."""
    import pandas as pd

    rows: dict[str, dict[str, float]] = {}
    for side in simulation.present_value:
        row = {"mean": side.mean, "se": side.se, "sd": side.sd}
        for index, level in enumerate(side.levels):
            name = percentile_name(level)
            row[name] = float(side.percentile[index])
            row[f"{name}_low"] = float(side.percentile_low[index])
            row[f"{name}_high"] = float(side.percentile_high[index])
        row |= {
            "curve": side.curve,
            "below_zero": side.below_zero,
            "below_zero_se": side.below_zero_se,
        }
        rows[side.name] = row
    return pd.DataFrame.from_dict(rows, orient="index").rename_axis("side")


def _frame(record: Any, index: str, *columns: str) -> pd.DataFrame:
    """Some arrays of a record as the columns of a frame."""
    import pandas as pd

    frame = pd.DataFrame({name: getattr(record, name) for name in (index, *columns)})
    return frame.set_index(index)


def _summary_frame(summary: NodeSummary) -> pd.DataFrame:
    """A quantity by year."""
    frame = _frame(summary, "year", "mean", "mean_se", "sd", "sd_se")
    for index, level in enumerate(summary.levels):
        name = percentile_name(level)
        frame[name] = summary.percentile[:, index]
        frame[f"{name}_low"] = summary.percentile_low[:, index]
        frame[f"{name}_high"] = summary.percentile_high[:, index]
    return frame
