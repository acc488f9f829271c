"""Results as pandas data frames, for people who script.

Columns carry plain names; amounts are in the book's currency, times in years, rates per year.
"""

from __future__ import annotations

from dataclasses import asdict
from typing import TYPE_CHECKING, Any

from desk.book.curve_source import CurveBonds
from desk.rates.fitting import CurveFit
from desk.report.as_json import percentile_name
from desk.scenarios.records import NodeSummary, Simulation
from desk.valuation.records import InflationStanding, Standing

if TYPE_CHECKING:
    import pandas as pd

__all__ = [
    "bond_frame",
    "comparison_frame",
    "distribution_frame",
    "inflation_key_rate_frame",
    "key_rate_frame",
    "line_frame",
    "period_frame",
    "real_period_frame",
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
            "inflation_dv01": line.inflation_dv01,
            **asdict(line.measures),
        }
        for line in standing.lines
    ]
    may_miss = ["market_value", "spread", "spread_duration", "expected_credit_loss", "inflation_dv01"]
    columns = ["side", "line", "kind", "flow_count", *may_miss, *asdict(standing.assets)]
    frame = pd.DataFrame(rows, columns=columns)
    return frame.astype(dict.fromkeys(may_miss, float)).set_index(["side", "line"])


def key_rate_frame(standing: Standing) -> pd.DataFrame:
    """Key-rate durations and DV01 of both sides, indexed by term."""
    return _frame(standing.key_rates, "term", "assets", "liabilities", "dv01_assets", "dv01_liabilities")


def period_frame(standing: Standing) -> pd.DataFrame:
    """Undiscounted flows of both sides, indexed by year from the valuation date."""
    return _frame(standing.periods, "year", "assets", "liabilities", "net", "cumulative")


def inflation_key_rate_frame(standing: Standing) -> pd.DataFrame:
    """Key-rate durations and DV01 of expected inflation, indexed by term.

    Raises
    ------
    ValueError
        If the basis of the standing states no expected inflation.
    """
    frame = _frame(
        _inflation(standing),
        "term",
        "key_assets",
        "key_liabilities",
        "key_dv01_assets",
        "key_dv01_liabilities",
    )
    return frame.rename(columns=lambda name: name.removeprefix("key_"))


def real_period_frame(standing: Standing) -> pd.DataFrame:
    """Undiscounted flows of both sides in today's money, by year; see `inflation_key_rate_frame`."""
    periods = _inflation(standing).real_periods
    return _frame(periods, "year", "assets", "liabilities", "net", "cumulative")


def _inflation(standing: Standing) -> InflationStanding:
    """How a standing follows expected inflation."""
    if standing.inflation is None:
        raise ValueError("`standing` must be on a basis that states expected inflation")
    return standing.inflation


def comparison_frame(first: Standing, second: Standing) -> pd.DataFrame:
    """Each figure on two bases and the first less the second, indexed by side and measure.

    The gaps, the surplus and the funding ratio stand under the side ``both``.
    """
    import pandas as pd

    rows = [
        (side, name, value, asdict(getattr(second, side))[name])
        for side in ("assets", "liabilities")
        for name, value in asdict(getattr(first, side)).items()
    ]
    rows += [
        ("both", name, getattr(first, name), getattr(second, name))
        for name in ("surplus", "funding_ratio", "duration_gap", "dv01_gap")
    ]
    frame = pd.DataFrame(rows, columns=["side", "measure", "first", "second"])
    frame["difference"] = frame["first"] - frame["second"]
    return frame.set_index(["side", "measure"])


def bond_frame(bonds: CurveBonds, fit: CurveFit) -> pd.DataFrame:
    """Bonds of a curve in the order of their sheet, with how far each is from it.

    Residuals are in the unit of the prices and in basis points; those of the curve and those of the
    liabilities are both given this way.
    """
    import pandas as pd

    columns = {
        name: getattr(bonds, name)
        for name in ("maturity", "coupon", "frequency", "price", "bond_yield", "is_clean")
    }
    residuals = {name: getattr(fit, name) for name in ("residual_price", "residual_bp", "is_used")}
    return pd.DataFrame({"name": list(bonds.names), **columns, **residuals})


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
