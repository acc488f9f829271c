"""The demo books valued again from nothing but their cells, and a run held against closed forms.

Written from the published definitions in plain Python, a row at a time: nothing of the program is used but
what its commands print.

Sources
-------
Zero rates and compounding: Hull, J.C., Options, Futures, and Other Derivatives, chapter 4.
Monotone convex curve: Hagan, P.S. and West, G., "Interpolation Methods for Curve Construction", Applied
Mathematical Finance 13(2), 2006, section 6.
Durations, convexity, dispersion: Macaulay, F.R. (1938); Hicks, J.R. (1939); Fong, H.G. and Vasicek, O.A.,
Journal of Finance 39(5), 1984.
Key rates: Ho, T.S.Y., "Key Rate Durations", Journal of Fixed Income 2(2), 1992.
Immunisation: Redington, F.M., Journal of the Institute of Actuaries 78, 1952.
Beta and premium: Sharpe, W.F., "Capital Asset Prices", Journal of Finance 19(3), 1964.
Gaussian rates: Hull, J.C. and White, A., "Pricing Interest-Rate-Derivative Securities", Review of Financial
Studies 3(4), 1990. Square-root rates: Cox, J.C., Ingersoll, J.E. and Ross, S.A., "A Theory of the Term
Structure of Interest Rates", Econometrica 53, 1985.
Coupons counted back from maturity, on the last day of a shorter month: common practice.
"""

from __future__ import annotations

import calendar
import json
import math
import os
import subprocess
import sys
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from datetime import date, datetime
from functools import cache
from pathlib import Path
from statistics import NormalDist
from typing import Any

import pytest
from openpyxl import load_workbook

ROOT = Path(__file__).resolve().parents[1]
BOOKS = ("pension_fund", "life_insurer", "small_endowment")
KEYS = (0.25, 0.5, 1, 2, 3, 5, 7, 10, 15, 20, 25, 30, 40, 50)
POINT = 1e-4
EXACT = 1e-9
"""Of the recomputation: both sides do the same sums in another order, in double precision."""

Curve = Callable[[float], float]
"""``-ln P(0, t)``."""


@cache
def printed(book: str, command: str) -> dict[str, Any]:
    """What a command prints with ``--json``."""
    done = subprocess.run(
        [sys.executable, "-m", "desk", command, f"demo_books/{book}.xlsx", "--json"],
        cwd=ROOT,
        env={**os.environ, "PYTHONWARNINGS": "error"},
        capture_output=True,
        check=False,
        text=True,
        encoding="utf-8",
    )
    assert (done.returncode, done.stderr) == (0, "")
    found: dict[str, Any] = json.loads(done.stdout)
    return found


@dataclass(frozen=True)
class Row:
    """One payment."""

    line: int
    time: float
    amount: float
    spread: float
    paid: bool = True


@dataclass(frozen=True)
class Workbook:
    """The cells of a book that a valuation needs."""

    basis: dict[str, Any]
    model: dict[str, Any]
    run: dict[str, Any]
    quotes: list[tuple[float, float]]
    liabilities: list[dict[str, Any]]
    holdings: list[dict[str, Any]]
    flows: list[dict[str, Any]]

    @property
    def today(self) -> date:
        """The valuation date."""
        return as_date(self.basis["Valuation date"])


@cache
def opened(book: str) -> Workbook:
    """The cells of a demo book."""
    file = load_workbook(ROOT / "demo_books" / f"{book}.xlsx", read_only=True, data_only=True)
    sheets = {sheet.title: list(sheet.iter_rows(values_only=True)) for sheet in file.worksheets}
    file.close()

    def table(name: str) -> list[dict[str, Any]]:
        rows = sheets.get(name, [()])
        return [dict(zip(rows[0], row, strict=False)) for row in rows[1:] if any(v is not None for v in row)]

    def items(name: str) -> dict[str, Any]:
        return {row["Item"]: row["Value"] for row in table(name)}

    quotes = [(float(row["Term"]), float(row["Rate"])) for row in table("Curve")]
    return Workbook(
        *(items(name) for name in ("Basis", "Rates model", "Run")),
        quotes,
        *(table(name) for name in ("Liabilities", "Holdings", "Asset flows")),
    )


def as_date(value: Any) -> date:
    """A date out of a cell."""
    assert isinstance(value, datetime)
    return value.date()


# The curve ---------------------------------------------------------------------------------------------


def curve_of(workbook: Workbook) -> Curve:
    """``-ln P(0, t)`` of a book's basis."""
    periods = {"annual": 1, "semi-annual": 2, "quarterly": 4, "monthly": 12, "continuous": 0}[
        workbook.basis["Compounding"]
    ]
    terms = [term for term, _ in workbook.quotes]
    rates = [periods * math.log(1 + rate / periods) if periods else rate for _, rate in workbook.quotes]
    draw = {"log-linear": log_linear, "linear-zero": linear_zero, "monotone-convex": monotone_convex}
    return draw[workbook.basis["Interpolation"]](terms, rates)


def log_linear(terms: Sequence[float], rates: Sequence[float]) -> Curve:
    """Flat forwards; the last one goes on."""
    times = [0.0, *terms]
    logs = [0.0, *(term * rate for term, rate in zip(terms, rates, strict=True))]

    def exponent(time: float) -> float:
        right = next((n for n in range(1, len(times)) if time <= times[n]), len(times) - 1)
        share = (time - times[right - 1]) / (times[right] - times[right - 1])
        return logs[right - 1] + share * (logs[right] - logs[right - 1])

    return exponent


def linear_zero(terms: Sequence[float], rates: Sequence[float]) -> Curve:
    """Straight lines in the zero rate; the forward at the last term goes on."""

    def exponent(time: float) -> float:
        if time <= terms[0]:
            return rates[0] * time
        if time > terms[-1]:
            slope = (rates[-1] - rates[-2]) / (terms[-1] - terms[-2])
            return rates[-1] * terms[-1] + (rates[-1] + terms[-1] * slope) * (time - terms[-1])
        right = next(n for n in range(1, len(terms)) if time <= terms[n])
        share = (time - terms[right - 1]) / (terms[right] - terms[right - 1])
        return time * (rates[right - 1] + share * (rates[right] - rates[right - 1]))

    return exponent


def monotone_convex(terms: Sequence[float], rates: Sequence[float]) -> Curve:
    """Hagan and West's forwards, integrated by Simpson's rule, which is exact for their parabolas."""
    times = [0.0, *terms]
    logs = [0.0, *(term * rate for term, rate in zip(terms, rates, strict=True))]
    last = len(terms)
    discrete = [math.nan] + [(logs[n] - logs[n - 1]) / (times[n] - times[n - 1]) for n in range(1, last + 1)]
    assert min(discrete[1:]) > 0, "the bounds below are those for positive forwards"
    forward = [0.0] * (last + 1)
    for n in range(1, last):
        before, after = times[n] - times[n - 1], times[n + 1] - times[n]
        forward[n] = (before * discrete[n + 1] + after * discrete[n]) / (before + after)
        forward[n] = min(max(forward[n], 0.0), 2 * min(discrete[n], discrete[n + 1]))
    # The ends come from the forwards next to them as the paper has those, before they are bounded.
    inner = [
        ((times[n] - times[n - 1]) * discrete[n + 1] + (times[n + 1] - times[n]) * discrete[n])
        / (times[n + 1] - times[n - 1])
        for n in (1, last - 1)
    ]
    forward[0] = min(max(1.5 * discrete[1] - 0.5 * inner[0], 0.0), 2 * discrete[1])
    forward[last] = min(max(1.5 * discrete[last] - 0.5 * inner[1], 0.0), 2 * discrete[last])

    def exponent(time: float) -> float:
        if time > times[-1]:
            return logs[-1] + forward[-1] * (time - times[-1])
        n = next(n for n in range(1, last + 1) if time <= times[n])
        excess, turn = shape(forward[n - 1] - discrete[n], forward[n] - discrete[n])
        length = times[n] - times[n - 1]
        at = (time - times[n - 1]) / length
        area = sum(
            (end - start) / 6 * (excess(start) + 4 * excess((start + end) / 2) + excess(end))
            for start, end in ((0.0, min(at, turn)), (min(at, turn), at))
        )
        return logs[n - 1] + discrete[n] * (time - times[n - 1]) + length * area

    return exponent


def shape(left: float, right: float) -> tuple[Callable[[float], float], float]:
    """g(x) of the paper between g(0) and g(1), and where its formula changes."""
    if left == 0 and right == 0:
        return (lambda x: 0.0), 1.0
    if left * right < 0 and 0.5 * abs(left) <= abs(right) <= 2 * abs(left):
        return (lambda x: left * (1 - 4 * x + 3 * x * x) + right * (3 * x * x - 2 * x)), 1.0
    if left * right < 0 and abs(right) > 2 * abs(left):
        turn = (right + 2 * left) / (right - left)
        return (lambda x: left if x <= turn else left + (right - left) * ((x - turn) / (1 - turn)) ** 2), turn
    if left * right < 0:
        turn = 3 * right / (right - left)
        return (lambda x: right + (left - right) * ((turn - x) / turn) ** 2 if x < turn else right), turn
    turn = right / (left + right)
    low = -left * right / (left + right)
    return (
        lambda x: (
            low + (left - low) * ((turn - x) / turn) ** 2
            if x <= turn and turn > 0
            else low + (right - low) * ((x - turn) / (1 - turn)) ** 2
        )
    ), turn


# Both sides --------------------------------------------------------------------------------------------


def years(workbook: Workbook, row: dict[str, Any]) -> float:
    """Time of a flow by its date, Act/365 Fixed, or its years."""
    assert workbook.basis["Day count"] == "Act/365F"
    if row.get("Date") is not None:
        return (as_date(row["Date"]) - workbook.today).days / 365
    return float(row["Year"])


def promised(workbook: Workbook) -> tuple[list[str], list[Row]]:
    """Lines of the liabilities and their rows: beta times the market risk premium over the spread."""
    names: list[str] = []
    rows = []
    for row in workbook.liabilities:
        if row["Line"] not in names:
            names.append(row["Line"])
        spread = workbook.basis["Liability spread"]
        spread += (row.get("Beta") or 0.0) * workbook.basis["Market risk premium"]
        rows.append(Row(names.index(row["Line"]), years(workbook, row), row["Amount"], spread))
    return names, rows


def held(workbook: Workbook, curve: Curve) -> tuple[list[str], list[Row]]:
    """Holdings and ready-made flows, one line a holding."""
    names: list[str] = []
    rows: list[Row] = []
    for line, holding in enumerate(workbook.holdings):
        names.append(holding["Name"])
        market = holding.get("Market value")
        if holding["Kind"] == "deposit":
            rows.append(Row(line, 0.0, holding["Nominal"] if market is None else market, 0.0))
        elif holding["Kind"] == "fund":
            time = float(holding.get("Duration") or 0.0)
            rows.append(Row(line, time, market * math.exp(curve(time)), 0.0, paid=False))
        else:
            own = list(payments(workbook.today, holding))
            spread = 0.0 if market is None else spread_for(own, float(market), curve)
            rows += [Row(line, time, amount, spread) for time, amount in own]
    ready = list(dict.fromkeys(row["Line"] for row in workbook.flows))
    for row in workbook.flows:
        rows.append(Row(len(names) + ready.index(row["Line"]), years(workbook, row), row["Amount"], 0.0))
    return names + ready, rows


def payments(today: date, holding: dict[str, Any]) -> Iterable[tuple[float, float]]:
    """Time and amount of what a bond or zero pays."""
    maturity = as_date(holding["Maturity"])
    coupon, frequency = holding.get("Coupon") or 0.0, int(holding.get("Frequency") or 1)
    back, when = 0, maturity
    while when > today:
        amount = holding["Nominal"] * coupon / frequency if holding["Kind"] == "bond" else 0.0
        amount += holding["Nominal"] if back == 0 else 0.0
        if amount:
            yield (when - today).days / 365, amount
        if holding["Kind"] == "zero":
            return
        back += 12 // frequency
        month = maturity.year * 12 + maturity.month - 1 - back
        year, month = divmod(month, 12)
        when = date(year, month + 1, min(maturity.day, calendar.monthrange(year, month + 1)[1]))


def bisect(function: Callable[[float], float], low: float, high: float) -> float:
    """The root of a falling function."""
    for _ in range(200):
        middle = (low + high) / 2
        low, high = (middle, high) if function(middle) > 0 else (low, middle)
    return (low + high) / 2


def spread_for(flows: list[tuple[float, float]], market: float, curve: Curve) -> float:
    """The spread over the continuous zero rates at which flows are worth their market value."""

    def excess(spread: float) -> float:
        return (
            math.fsum(amount * math.exp(-curve(time) - spread * time) for time, amount in flows) / market - 1
        )

    return bisect(excess, -1.0, 5.0)


# Measures ----------------------------------------------------------------------------------------------


class Side:
    """One side valued row by row."""

    def __init__(self, names: list[str], rows: list[Row], curve: Curve) -> None:
        self.names, self.rows, self.curve = names, rows, curve
        self.values = [row.amount * math.exp(-curve(row.time) - row.spread * row.time) for row in rows]

    def total(self, weight: Callable[[Row], float] = lambda row: 1.0) -> float:
        """Present value, each row with a weight."""
        return math.fsum(value * weight(row) for row, value in zip(self.rows, self.values, strict=True))

    def fall(self, part: Callable[[float], float] = lambda time: 1.0) -> float:
        """How much present value is lost when all zero rates rise by a part of a basis point."""
        return self.total(lambda row: 1 - math.exp(-POINT * part(row.time) * row.time))

    def measures(self) -> dict[str, float]:
        """Every measure of the design."""
        worth = self.total()
        duration = self.total(lambda row: row.time) / worth

        def at(rate: float) -> float:
            return math.fsum(row.amount * (1 + rate) ** -row.time for row in self.rows)

        rate = bisect(lambda rate: at(rate) - worth, -0.5, 2.0)
        macaulay = math.fsum(row.time * row.amount * (1 + rate) ** -row.time for row in self.rows) / at(rate)
        return {
            "present_value": worth,
            "equivalent_rate": rate,
            "macaulay_duration": macaulay,
            "modified_duration": macaulay / (1 + rate),
            "effective_duration": duration,
            "convexity": self.total(lambda row: row.time**2) / worth,
            "dispersion": self.total(lambda row: (row.time - duration) ** 2) / worth,
            "dv01": self.fall(),
        }

    def only(self, line: int) -> Side:
        """One line."""
        return Side([self.names[line]], [row for row in self.rows if row.line == line], self.curve)


def bump(key: int) -> Callable[[float], float]:
    """The triangle of one key rate, flat outside the ends."""

    def height(time: float) -> float:
        if (key == 0 and time <= KEYS[0]) or (key == len(KEYS) - 1 and time >= KEYS[-1]):
            return 1.0
        if key > 0 and KEYS[key - 1] <= time <= KEYS[key]:
            return (time - KEYS[key - 1]) / (KEYS[key] - KEYS[key - 1])
        if key < len(KEYS) - 1 and KEYS[key] <= time <= KEYS[key + 1]:
            return (KEYS[key + 1] - time) / (KEYS[key + 1] - KEYS[key])
        return 0.0

    return height


@cache
def sides(book: str) -> tuple[Side, Side]:
    """Assets and liabilities of a demo book."""
    workbook = opened(book)
    curve = curve_of(workbook)
    return Side(*held(workbook, curve), curve), Side(*promised(workbook), curve)


def close(found: Any, wanted: float, scale: float = 0.0) -> bool:
    """Within 1e-9 of the wanted figure, or of the size of what it is a difference of."""
    return isinstance(found, int | float) and abs(found - wanted) <= EXACT * max(abs(wanted), scale)


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
            duration = side.total(lambda flow, height=height: height(flow.time) * flow.time) / worth
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


def own_curve(workbook: Workbook) -> Curve:
    """``-ln P(0, t)`` of the model: the book's for Hull and White, its own for Cox, Ingersoll and Ross."""
    if workbook.model["Model"] == "hull-white":
        return curve_of(workbook)
    assert workbook.model["Model"] == "cir"
    speed, level, volatility, start = (
        workbook.model[item] for item in ("Mean reversion", "Long-run rate", "Volatility", "Starting rate")
    )
    root = math.sqrt(speed**2 + 2 * volatility**2)

    def exponent(time: float) -> float:
        grown = math.expm1(root * time)
        below = (speed + root) * grown + 2 * root
        share = math.log(2 * root) + (speed + root) * time / 2 - math.log(below)
        return 2 * grown / below * start - 2 * speed * level / volatility**2 * share

    return exponent


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
    curve = own_curve(workbook)
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

    The variance of ``ln R_t`` is the integral of ``σ² B(a, s)²`` from 0 to t, taken numerically here. A sample
    percentile is off by so much that the chance it stands for, with n paths, is off by a few times
    ``√(p(1-p)/n)`` (David and Nagaraja, Order Statistics, 2003, section 2.5).
    """
    stated, workbook = printed(book, "simulate"), opened(book)
    assert stated["measure"] == "pricing"
    speed, volatility = workbook.model["Mean reversion"], workbook.model["Volatility"]
    curve, count = own_curve(workbook), stated["paths"]

    def exposure(time: float) -> float:
        return -math.expm1(-speed * time) / speed

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
