"""The demo books valued again from nothing but their cells.

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
from typing import Any

from openpyxl import load_workbook

__all__ = [
    "BOOKS", "KEYS", "POINT", "Curve", "Row", "Side", "Workbook", "bump", "close", "opened", "own_curve",
    "printed", "sides",
]  # fmt: skip

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
        headings, *rows = sheets.get(name, [()])
        names = [str(heading) for heading in headings]
        return [
            dict(zip(names, row, strict=False)) for row in rows if any(value is not None for value in row)
        ]

    def items(name: str) -> dict[str, Any]:
        return {row["Item"]: row["Value"] for row in table(name)}

    quotes = [(float(row["Term"]), float(row["Rate"])) for row in table("Curve")]
    return Workbook(
        basis=items("Basis"),
        model=items("Rates model"),
        run=items("Run"),
        quotes=quotes,
        liabilities=table("Liabilities"),
        holdings=table("Holdings"),
        flows=table("Asset flows"),
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
            rows.append(Row(line, time, float(market or 0.0) * math.exp(curve(time)), 0.0, paid=False))
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


def own_curve(workbook: Workbook, *, real_world: bool = False) -> Curve:
    """``-ln P(0, t)`` of the model: the book's for Hull and White, its own for Cox, Ingersoll and Ross."""
    if workbook.model["Model"] == "hull-white":
        return curve_of(workbook)
    assert workbook.model["Model"] == "cir"
    speed, level, volatility, start = (
        workbook.model[item] for item in ("Mean reversion", "Long-run rate", "Volatility", "Starting rate")
    )
    pull = speed * level
    if real_world:
        # A price of risk λ√r makes the drift κθ - (κ - σλ) r: the same formulas with another speed.
        speed -= volatility * workbook.model["Risk price"]
    root = math.sqrt(speed**2 + 2 * volatility**2)

    def exponent(time: float) -> float:
        grown = math.expm1(root * time)
        below = (speed + root) * grown + 2 * root
        share = math.log(2 * root) + (speed + root) * time / 2 - math.log(below)
        return float(2 * grown / below * start - 2 * pull / volatility**2 * share)

    return exponent
