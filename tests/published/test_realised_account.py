"""The savings account that one-month bills have given since 1926, as a set of scenarios from outside."""

from __future__ import annotations

import math

import numpy as np
import pytest

from desk.book import ScenarioSet
from desk.rates.flat import flat_curve
from desk.scenarios.given import GivenRates
from tests.published.open_rates import bill_returns


def test_bills_rolled_over_for_ninety_two_years() -> None:
    """Open data of `arch`, one-month bills July 1926 to November 2018 [per cent a month]: 1 rolled over
    becomes 20.76787186, its logarithm 3.03340717, which is 3.336778 % a year effective. The product of
    (1 + RF/100), by a separate script. A step of the set is a month, at the continuous rate of that month."""
    monthly = bill_returns()
    node = np.arange(1, monthly.size + 1) / 12.0
    rate = 12.0 * np.log1p(monthly / 100.0)
    rates = GivenRates(ScenarioSet(node, rate[None, :]), flat_curve(0.03))
    walk = rates.walk_of(slice(0, 1))
    for _ in walk.run(monthly.size):
        pass
    assert float(walk.integral[0]) == pytest.approx(3.03340717, abs=6e-9)
    account = math.exp(float(walk.integral[0]))
    assert account == pytest.approx(20.76787186, abs=6e-8)
    assert account ** (12.0 / monthly.size) - 1.0 == pytest.approx(0.03336778, abs=6e-9)
