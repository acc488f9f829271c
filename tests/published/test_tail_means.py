"""Tail means and exceptions against published values and closed forms."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import norm, t

from desk.scenarios.records import Simulation
from desk.scenarios.summaries import rank_confidence, sorted_quantile, tail_mean
from tests.published.test_savings_account import vasicek_run

__all__ = ["vasicek_run"]

LEVELS = (0.9, 0.95, 0.99)


@pytest.mark.parametrize(
    ("ordered", "value_at_risk", "shortfall"),
    [
        ("normal", (162.1, 208.1, 294.3), (222.0, 260.9, 337.1)),
        ("student", (137.1, 190.7, 335.1), (223.5, 286.5, 466.9)),
    ],
)
def test_value_at_risk_and_shortfall_of_a_stock_position(
    ordered: str, value_at_risk: tuple[float, ...], shortfall: tuple[float, ...]
) -> None:
    """McNeil, A.J., Frey, R. and Embrechts, P. (2005), Quantitative Risk Management, chapter 2: one day's
    loss on 10,000 at a volatility of 20 %, normal and with Student's law of 4 degrees scaled to the same
    variance (layout of the table from memory, figures recomputed). Here from two million losses, evenly
    spread."""
    share = (np.arange(2_000_000) + 0.5) / 2_000_000
    loss = norm.ppf(share) if ordered == "normal" else t.ppf(share, 4) / np.sqrt(2.0)
    loss = loss * 10_000 * 0.2 / np.sqrt(250.0)
    assert sorted_quantile(loss, LEVELS) == pytest.approx(value_at_risk, abs=0.06)
    assert [float(tail_mean(loss, level)) for level in LEVELS] == pytest.approx(shortfall, abs=0.06)


def test_tail_mean_of_the_savings_account(vasicek_run: Simulation) -> None:
    """Closed form of the lognormal law, checked by quadrature (computed): beyond the quantile at 95 % of the
    account of test_vasicek_over_ten_years the mean is 4.66334169."""
    law = vasicek_run.closed_form
    assert law is not None
    place = vasicek_run.savings_account.levels.index(95.0)
    assert law.percentile[10, place] == pytest.approx(4.16414331, abs=6e-9)
    assert law.tail_mean[10, place] == pytest.approx(4.66334169, abs=6e-9)
    found, error = vasicek_run.savings_account.tail_mean, vasicek_run.savings_account.tail_mean_se
    assert abs(found[10, place] - 4.66334169) < 4.0 * error[10, place]


def test_chance_of_a_few_exceptions_in_a_year() -> None:
    """Basel Committee on Banking Supervision (January 1996), Supervisory framework for the use of
    backtesting: chance of at most 0 to 4 exceptions in 250 days at 99 % (from memory, recomputed)."""
    found = [100.0 * rank_confidence(250, 0.01, 0, most + 1) for most in range(5)]
    assert found == pytest.approx([8.11, 28.58, 54.32, 75.81, 89.22], abs=0.0051)
