"""What the commands print for the demo books, against the books valued again and runs against closed forms.

The sources of the formulas stand in `tests.recomputed` and beside the laws below.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from statistics import NormalDist
from typing import Any

import pytest

from tests.recomputed import BOOKS, KEYS, POINT, Row, bump, close, opened, own_curve, printed, sides


@pytest.mark.parametrize("book", BOOKS)
def test_measures_of_both_sides(book: str) -> None:
    for name, side in zip(("assets", "liabilities"), sides(book), strict=True):
        stated = printed(book, "value")[name]
        wanted = side.measures()
        assert set(stated) == set(wanted)
        assert {key: stated[key] for key in wanted if not close(stated[key], wanted[key])} == {}


@pytest.mark.parametrize("book", BOOKS)
def test_gaps_and_redington(book: str) -> None:
    stated = printed(book, "value")
    held_, promised_ = sides(book)
    assets, liabilities = held_.measures(), promised_.measures()
    worth_a, worth_l = assets["present_value"], liabilities["present_value"]
    duration_a, duration_l = assets["effective_duration"], liabilities["effective_duration"]
    assert close(stated["surplus"], worth_a - worth_l, worth_a)
    assert close(stated["funding_ratio"], worth_a / worth_l)
    assert close(stated["duration_gap"], duration_a - duration_l * worth_l / worth_a, duration_a)
    assert close(stated["dv01_gap"], assets["dv01"] - liabilities["dv01"], assets["dv01"])
    wanted = {
        "present_value": worth_a >= worth_l,
        "duration": abs(worth_a * duration_a / (worth_l * duration_l) - 1) <= 1e-4,
        "convexity": worth_a * assets["convexity"] > worth_l * liabilities["convexity"],
    }
    assert stated["redington"] == wanted
    assert stated["valuation_date"] == opened(book).today.isoformat()
    assert stated["currency"] == opened(book).basis["Currency"]


@pytest.mark.parametrize("book", BOOKS)
def test_key_rates(book: str) -> None:
    stated = printed(book, "value")["key_rates"]
    assert [row["term"] for row in stated] == list(KEYS)
    for name, side in zip(("assets", "liabilities"), sides(book), strict=True):
        worth = side.total()
        for key, row in enumerate(stated):
            height = bump(key)

            def share(flow: Row, height: Callable[[float], float] = height) -> float:
                return height(flow.time) * flow.time

            duration = side.total(share) / worth
            assert close(row[name], duration, 1.0)
            assert close(row[f"dv01_{name}"], side.fall(height), worth * POINT)
        whole = printed(book, "value")[name]["effective_duration"]
        assert close(math.fsum(row[name] for row in stated), whole)


@pytest.mark.parametrize("book", BOOKS)
def test_lines_and_solved_spreads(book: str) -> None:
    stated = printed(book, "value")["lines"]
    wanted = [
        (name, number, side)
        for name, side in zip(("assets", "liabilities"), sides(book), strict=True)
        for number in range(len(side.names))
    ]
    assert [(row["side"], row["line"]) for row in stated] == [
        (name, side.names[number]) for name, number, side in wanted
    ]
    for row, (_, number, side) in zip(stated, wanted, strict=True):
        line = side.only(number)
        spreads = {flow.spread for flow in line.rows}
        worth = line.total()
        assert close(row["present_value"], worth)
        assert close(row["effective_duration"], line.total(lambda flow: flow.time) / worth, 1.0)
        if len(spreads) == 1:
            assert close(row["spread"], spreads.pop(), 1e-2)
        else:
            assert row["spread"] is None
    market = [holding.get("Market value") for holding in opened(book).holdings]
    assert any(value is not None for value in market)
    for row, value in zip(stated, market, strict=False):
        assert value is None or close(row["present_value"], value)


@pytest.mark.parametrize("book", BOOKS)
def test_periods(book: str) -> None:
    stated = printed(book, "value")["periods"]
    held_, promised_ = sides(book)
    last = max(math.ceil(row.time) for side in (held_, promised_) for row in side.rows if row.paid)
    assert [row["year"] for row in stated] == list(range(1, last + 1))
    scale = max(row["liabilities"] for row in stated)
    running = 0.0
    for row in stated:
        amounts = [
            math.fsum(
                flow.amount
                for flow in side.rows
                # A flow today falls in the first year.
                if flow.paid and max(math.ceil(flow.time - 1e-9), 1) == row["year"]
            )
            for side in (held_, promised_)
        ]
        running += amounts[0] - amounts[1]
        wanted = {
            "assets": amounts[0],
            "liabilities": amounts[1],
            "net": amounts[0] - amounts[1],
            "cumulative": running,
        }
        assert all(close(row[key], value, scale) for key, value in wanted.items())


# A run -------------------------------------------------------------------------------------------------

ERRORS = 4.5
"""Standard errors that a sampled figure may be off: with some 400 figures, once in 400 seeds."""


@pytest.mark.parametrize("book", BOOKS)
def test_a_run_says_what_it_was(book: str) -> None:
    stated, workbook = printed(book, "simulate"), opened(book)
    assert stated["paths"] == workbook.run["Paths"]
    assert stated["steps_per_year"] == workbook.run["Steps a year"]
    assert stated["seed"] == workbook.run["Seed"]
    assert stated["measure"] == workbook.run["Measure"]
    assert stated["model"] == workbook.model["Model"]
    horizon = list(range(workbook.run["Horizon (years)"] + 1))
    for table in ("savings_account", "short_rate"):
        assert [row["year"] for row in stated[table]] == horizon


@pytest.mark.parametrize("book", BOOKS)
def test_discount_factors_and_present_values_on_the_models_own_curve(book: str) -> None:
    """The curve's figures are exact; under the pricing measure the means of the paths are near them."""
    stated, workbook = printed(book, "simulate"), opened(book)
    curve = own_curve(book)
    pricing = workbook.run["Measure"] == "pricing"
    for row in stated["savings_account"]:
        wanted = math.exp(-curve(row["year"]))
        assert close(row["curve_discount"], wanted)
        assert not pricing or abs(row["mean_discount"] - wanted) <= ERRORS * row["mean_discount_se"]
    held_, promised_ = sides(book)
    worth = {"assets": 0.0, "liabilities": 0.0}
    for name, side in zip(worth, (held_, promised_), strict=True):
        worth[name] = math.fsum(
            row.amount * math.exp(-curve(row.time) - row.spread * row.time) for row in side.rows
        )
    worth["surplus"] = worth["assets"] - worth["liabilities"]
    for name, value in worth.items():
        row = stated["present_value"][name]
        assert close(row["curve"], value, worth["assets"])
        assert row["se"] == pytest.approx(row["sd"] / math.sqrt(stated["paths"]), rel=1e-12)
        assert not pricing or abs(row["mean"] - value) <= ERRORS * row["se"]


def levels(row: dict[str, Any]) -> list[tuple[float, float]]:
    """Share and figure of each percentile."""
    return [(float(key[1:]) / 100, row[key]) for key in row if key[0] == "p" and key[1:3].isdigit()]


@pytest.mark.parametrize("book", ["pension_fund", "life_insurer"])
def test_gaussian_rates_follow_their_laws(book: str) -> None:
    """Under the pricing measure ``ln R_t`` and ``r_t`` are normal.

    The variance of ``ln R_t`` is the integral of ``σ² B(a, s)²`` from 0 to t, taken numerically here. A
    sample percentile is off by so much that the chance it stands for, with n paths, is off by a few times
    ``√(p(1-p)/n)`` (David and Nagaraja, Order Statistics, 2003, section 2.5).
    """
    stated, workbook = printed(book, "simulate"), opened(book)
    assert stated["measure"] == "pricing"
    speed, volatility = workbook.model["Mean reversion"], workbook.model["Volatility"]
    curve, count = own_curve(book), stated["paths"]

    def exposure(time: float) -> float:
        return float(-math.expm1(-speed * time) / speed)

    for account, rate in zip(stated["savings_account"][1:], stated["short_rate"][1:], strict=True):
        time = account["year"]
        parts = 200
        width = time / parts
        variance = math.fsum(
            weight * volatility**2 * exposure(n * width) ** 2 * width / 3
            for n in range(parts + 1)
            for weight in [1 if n in (0, parts) else 2 + 2 * (n % 2)]
        )
        law = NormalDist(curve(time) + variance / 2, math.sqrt(variance))
        for share, figure in levels(account):
            assert abs(law.cdf(math.log(figure)) - share) <= ERRORS * math.sqrt(share * (1 - share) / count)
        mean = math.exp(law.mean + variance / 2)
        spread = mean * math.sqrt(math.expm1(variance))
        assert abs(account["mean"] - mean) <= ERRORS * spread / math.sqrt(count)

        # r_t has the variance of the factor and the mean f(0, t) + ½ σ² B²: Hull and White (1990). The
        # forward jumps at the terms of a log-linear curve; there the limits of both sides are tried.
        deviation = volatility * math.sqrt(-math.expm1(-2 * speed * time) / (2 * speed))
        forwards = [(curve(time + step) - curve(time)) / step for step in (1e-6, -1e-6)]
        means = [forward + 0.5 * (volatility * exposure(time)) ** 2 for forward in forwards]
        nearest = min(means, key=lambda value: abs(rate["mean"] - value))
        assert abs(rate["mean"] - nearest) <= ERRORS * deviation / math.sqrt(count)
        assert abs(rate["sd"] - deviation) <= ERRORS * deviation / math.sqrt(2 * count)
        for share, figure in levels(rate):
            found = NormalDist(nearest, deviation).cdf(figure)
            assert abs(found - share) <= ERRORS * math.sqrt(share * (1 - share) / count)


def test_square_root_rates_follow_their_laws() -> None:
    """Mean and variance of r_t under the real-world measure: Cox, Ingersoll and Ross (1985), equation 19.

    A price of risk ``λ√r`` moves the speed to ``κ - σλ`` and leaves κθ as it is.
    """
    stated, workbook = printed("small_endowment", "simulate"), opened("small_endowment")
    assert stated["measure"] == "real-world"
    pull = workbook.model["Mean reversion"] * workbook.model["Long-run rate"]
    volatility, start = workbook.model["Volatility"], workbook.model["Starting rate"]
    speed = workbook.model["Mean reversion"] - volatility * workbook.model["Risk price"]
    level, count = pull / speed, stated["paths"]
    expected = own_curve("small_endowment", real_world=True)
    for row in stated["savings_account"][1:]:
        wanted = math.exp(-expected(row["year"]))
        assert abs(row["mean_discount"] - wanted) <= ERRORS * row["mean_discount_se"]
    for row in stated["short_rate"][1:]:
        kept = math.exp(-speed * row["year"])
        mean = start * kept + level * (1 - kept)
        variance = volatility**2 / speed * (1 - kept) * (start * kept + level * (1 - kept) / 2)
        assert abs(row["mean"] - mean) <= ERRORS * math.sqrt(variance / count)
        # The law's fourth moment is above the normal one by less than 6 times its squared variance.
        assert abs(row["sd"] / math.sqrt(variance) - 1) <= ERRORS * math.sqrt(2.0 / count)
        shares = [figure for _, figure in levels(row)]
        assert shares == sorted(shares)
        assert shares[0] > 0
