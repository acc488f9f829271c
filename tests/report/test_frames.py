"""Data frames: the figures of the records under plain names."""

from __future__ import annotations

import numpy as np
import pytest

from desk.report import frames
from tests.report import examples


def test_lines_are_indexed_by_side_and_line() -> None:
    """One row a line with every measure."""
    frame = frames.line_frame(examples.standing())
    standing = examples.standing()
    assert frame.index.names == ["side", "line"]
    assert len(frame) == len(standing.lines)
    total = frame["present_value"].xs("liabilities", level="side").sum()
    assert total == pytest.approx(standing.liabilities.present_value, rel=1e-12)
    assert frame["dv01"].dtype == np.float64
    assert frame["spread"].isna().any()
    assert frame["expected_credit_loss"].isna().all()
    bond, fund = frame["spread_duration"].xs("assets", level="side").loc[["Bond", "Fund"]]
    assert bond == standing.lines[0].measures.effective_duration
    assert np.isnan(fund)


def test_key_rates_and_periods() -> None:
    """Columns as in the records."""
    standing = examples.standing()
    keys = frames.key_rate_frame(standing)
    assert keys["assets"].sum() == pytest.approx(standing.assets.effective_duration, rel=1e-12)
    periods = frames.period_frame(standing)
    np.testing.assert_array_equal(periods["cumulative"], standing.periods.cumulative)
    assert periods.index.name == "year"


def test_runs() -> None:
    """Savings account, short rate and distributions."""
    run = examples.simulation()
    account = frames.savings_account_frame(run)
    np.testing.assert_array_equal(account["p95"], run.savings_account.percentile[:, 5])
    np.testing.assert_array_equal(account["mean_discount"], run.repricing.mean_discount)
    rate = frames.short_rate_frame(run)
    assert list(rate.index) == list(range(13))
    sides = frames.distribution_frame(run)
    assert list(sides.index) == ["assets", "liabilities", "surplus"]
    assert sides.loc["surplus", "p50_low"] == run.present_value[2].percentile_low[3]
