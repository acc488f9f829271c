"""The demo books valued again from nothing but their cells.

Written from the published definitions in plain Python, a row at a time: nothing of the program is used but
what its commands print.

Sources
-------
Zero rates and compounding: Hull, J.C., Options, Futures, and Other Derivatives, chapter 4.
Durations, convexity, dispersion: Macaulay, F.R. (1938); Hicks, J.R. (1939); Fong, H.G. and Vasicek, O.A.,
Journal of Finance 39(5), 1984.
Key rates: Ho, T.S.Y., "Key Rate Durations", Journal of Fixed Income 2(2), 1992.
Immunisation: Redington, F.M., Journal of the Institute of Actuaries 78, 1952.
Beta and premium: Sharpe, W.F., "Capital Asset Prices", Journal of Finance 19(3), 1964.
Gaussian rates: Hull, J.C. and White, A., "Pricing Interest-Rate-Derivative Securities", Review of Financial
Studies 3(4), 1990. Square-root rates: Cox, J.C., Ingersoll, J.E. and Ross, S.A., "A Theory of the Term
Structure of Interest Rates", Econometrica 53, 1985.
Coupons counted back from maturity, on the last day of a shorter month: common practice.
Curves: see `tests.recomputed_curves`.
Growth with a price index: normal yearly inflation for floors and caps (Bachelier, L., 1900) and lognormal
growth for a floor on the whole (Black, F., Journal of Financial Economics 3, 1976), from memory.
"""

from __future__ import annotations

import calendar
import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from datetime import date
from functools import cache
from typing import Any

from tests.recomputed_cells import BOOKS, SECOND, Workbook, as_date, opened, printed
from tests.recomputed_curves import Curve, linear_zero, log_linear, monotone_convex, through_swaps

__all__ = [
    "BOOKS", "KEYS", "POINT", "SECOND", "Curve", "Row", "Side", "Workbook", "bump", "close", "grown_sides",
    "opened", "own_curve", "price_index", "printed", "sides",
]  # fmt: skip

KEYS = (0.25, 0.5, 1, 2, 3, 5, 7, 10, 15, 20, 25, 30, 40, 50)
POINT = 1e-4
EXACT = 1e-9
"""Of the recomputation: both sides do the same sums in another order, in double precision."""


@dataclass(frozen=True)
class Row:
    """One payment."""

    line: int
    time: float
    amount: float
    spread: float
    paid: bool = True


Move = tuple[int | None, float]
"""A key of expected inflation, None for all together, and by how much it is moved [a year]."""


# The curve ---------------------------------------------------------------------------------------------


@cache
def curve_of(book: str) -> Curve:
    """``-ln P(0, t)`` of a book's basis."""
    workbook = opened(book)
    periods = {"annual": 1, "semi-annual": 2, "quarterly": 4, "monthly": 12, "continuous": 0}[
        workbook.basis["Compounding"]
    ]
    terms = [term for term, _ in workbook.quotes]
    rates = [periods * math.log(1 + rate / periods) if periods else rate for _, rate in workbook.quotes]
    draw = {"log-linear": log_linear, "linear-zero": linear_zero, "monotone-convex": monotone_convex}[
        workbook.basis["Interpolation"]
    ]
    if workbook.basis["Curve kind"] == "swap":
        return through_swaps(workbook.quotes, periods, draw)
    assert workbook.basis["Curve kind"] == "zero"
    return draw(terms, rates)


# Both sides --------------------------------------------------------------------------------------------


def years(workbook: Workbook, row: dict[str, Any]) -> float:
    """Time of a flow by its date, Act/365 Fixed, or its years."""
    assert workbook.basis["Day count"] == "Act/365F"
    if row.get("Date") is not None:
        return (as_date(row["Date"]) - workbook.today).days / 365
    return float(row["Year"])


def spread_by_term(workbook: Workbook, time: float) -> float:
    """What is added to the curve for liabilities, joined by lines and flat outside the terms."""
    if workbook.basis.get("Liability basis") is None:
        return 0.0
    assert workbook.basis["Liability basis"] == "spread by term"
    known = workbook.spreads
    if time <= known[0][0] or time >= known[-1][0]:
        return known[0][1] if time <= known[0][0] else known[-1][1]
    right = next(n for n in range(1, len(known)) if time <= known[n][0])
    (start, low), (end, high) = known[right - 1], known[right]
    return float(low + (high - low) * (time - start) / (end - start))


def promised(book: str, move: Move | None = None) -> tuple[list[str], list[Row]]:
    """Lines of the liabilities and their rows: beta times the market risk premium over the spread."""
    workbook = opened(book)
    names: list[str] = []
    rows = []
    terms = {row["Line"]: row for row in workbook.terms}
    assert all((row.get("Side") or "liabilities") == "liabilities" for row in workbook.terms)
    for row in workbook.liabilities:
        if row["Line"] not in names:
            names.append(row["Line"])
        time = years(workbook, row)
        spread = workbook.basis["Liability spread"] + spread_by_term(workbook, time)
        spread += (row.get("Beta") or 0.0) * workbook.basis["Market risk premium"]
        amount = row["Amount"] * growth(book, terms.get(row["Line"], {}), time, move)
        rows.append(Row(names.index(row["Line"]), time, amount, spread))
    return names, rows


# What follows prices -----------------------------------------------------------------------------------


@cache
def price_index(book: str, move: Move | None = None) -> Curve:
    """Logarithm of the index expected at a time over today's; before today it grew at the recent rate."""
    workbook = opened(book)
    assert workbook.basis.get("Inflation interpolation") is None
    terms, rates = zip(*workbook.inflation, strict=True)
    ahead = log_linear(terms, [math.log1p(rate) for rate in rates])
    recent = math.log1p(workbook.basis["Recent inflation"])
    height = (lambda time: 0.0) if move is None else shape_of(move)
    return lambda time: recent * time if time <= 0 else ahead(time) + height(time) * time


def shape_of(move: Move) -> Callable[[float], float]:
    """By how much the expected inflation to a time is moved."""
    key, size = move
    part = (lambda time: 1.0) if key is None else bump(key)
    return lambda time: size * part(time)


def growth(book: str, terms: dict[str, Any], time: float, move: Move | None = None) -> float:
    """How much an amount in today's money grows until it is paid."""
    kind = terms.get("Indexation") or "fixed"
    if kind == "fixed":
        return 1.0
    if kind == "rising":
        return float((1 + terms["Rise"]) ** time)
    if kind == "linked":
        return math.exp(price_index(book, move)(time))
    assert kind == "collared"
    whole = math.floor(time)
    total = math.prod(collared(book, year, terms["Floor"], terms["Cap"], move) for year in range(whole))
    return float(total * collared(book, whole, terms["Floor"], terms["Cap"], move) ** (time - whole))


@cache
def collared(book: str, year: int, floor: float, cap: float, move: Move | None = None) -> float:
    """Expected factor of one year whose normal increase is held between a floor and a cap."""
    index, deviation = price_index(book, move), float(opened(book).basis["Inflation volatility"])
    mean = math.expm1(index(year + 1) - index(year))

    def call(strike: float) -> float:
        far = (mean - strike) / deviation
        return (mean - strike) * normal(far) + deviation * math.exp(-far * far / 2) / math.sqrt(2 * math.pi)

    return 1 + floor + call(floor) - call(cap)


def normal(far: float) -> float:
    """Distribution function of the standard normal law."""
    return math.erfc(-far / math.sqrt(2)) / 2


def linked_payments(
    book: str, holding: dict[str, Any], move: Move | None = None
) -> Iterable[tuple[float, float]]:
    """What a linked bond pays: that of a bond times its index ratio and the growth of the lagged index."""
    workbook = opened(book)
    index, ratio = price_index(book, move), float(holding["Index ratio"])
    lag = holding["Index lag (months)"] / 12
    maturity = (as_date(holding["Maturity"]) - workbook.today).days / 365
    for time, amount in payments(workbook.today, {**holding, "Kind": "bond"}):
        grown = math.exp(index(time - lag) - index(-lag))
        yield time, amount * ratio * grown
        if time == maturity and holding.get("Principal floor") == "yes":
            # Beside the nominal, a put on the growth from today at the inverse of the index ratio.
            deviation = workbook.basis["Inflation volatility"] * math.sqrt(max(time - lag, 0.0))
            far = math.log(grown * ratio) / deviation + deviation / 2
            put = normal(deviation - far) / ratio - grown * normal(-far)
            yield time, holding["Nominal"] * ratio * put


def held(book: str, curve: Curve) -> tuple[list[str], list[Row]]:
    """Holdings and ready-made flows, one line a holding."""
    workbook = opened(book)
    names: list[str] = []
    rows: list[Row] = []
    for line, holding in enumerate(workbook.holdings):
        names.append(holding["Name"])
        market = holding.get("Market value")
        if holding["Kind"] == "deposit":
            rows.append(Row(line, 0.0, holding["Nominal"] if market is None else market, 0.0))
        elif holding["Kind"] in ("fund", "property"):
            time = float(holding.get("Duration") or 0.0)
            rows.append(Row(line, time, float(market or 0.0) * math.exp(curve(time)), 0.0, paid=False))
        else:
            if holding["Kind"] == "linked bond":
                own = list(linked_payments(book, holding))
                market = real_price(book, holding) if holding.get("Price") is not None else market
            else:
                assert holding.get("Price") is None
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


def real_price(book: str, holding: dict[str, Any]) -> float:
    """Money for a clean price in real terms, with interest accrued by the days of the running period."""
    today, frequency = opened(book).today, int(holding["Frequency"])
    assert holding["Price kind"] == "clean"
    maturity, ahead = as_date(holding["Maturity"]), as_date(holding["Maturity"])
    back = 0
    while True:
        back += 12 // frequency
        year, month = divmod(maturity.year * 12 + maturity.month - 1 - back, 12)
        when = date(year, month + 1, min(maturity.day, calendar.monthrange(year, month + 1)[1]))
        if when <= today:
            break
        ahead = when
    accrued = 100 * holding["Coupon"] / frequency * ((today - when) / (ahead - when))
    return float(holding["Nominal"] * holding["Index ratio"] * (holding["Price"] + accrued) / 100)


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
    curve = curve_of(book)
    return Side(*held(book, curve), curve), Side(*promised(book), curve)


def grown_sides(book: str, move: Move) -> tuple[Side, Side]:
    """Both sides with amounts as they would be on moved expected inflation; spreads stay."""
    curve, still = curve_of(book), sides(book)[0]
    linked = {
        line: holding
        for line, holding in enumerate(opened(book).holdings)
        if holding["Kind"] == "linked bond"
    }
    rows = [row for row in still.rows if row.line not in linked]
    for line, holding in linked.items():
        spread = next(row.spread for row in still.rows if row.line == line)
        rows += [Row(line, time, amount, spread) for time, amount in linked_payments(book, holding, move)]
    rows.sort(key=lambda row: row.line)
    return Side(still.names, rows, curve), Side(*promised(book, move), curve)


def close(found: Any, wanted: float, scale: float = 0.0) -> bool:
    """Within 1e-9 of the wanted figure, or of the size of what it is a difference of."""
    return isinstance(found, int | float) and abs(found - wanted) <= EXACT * max(abs(wanted), scale)


def own_curve(book: str, *, real_world: bool = False) -> Curve:
    """``-ln P(0, t)`` of the model: the book's for Hull and White, its own for Cox, Ingersoll and Ross."""
    workbook = opened(book)
    if workbook.model["Model"] == "hull-white":
        return curve_of(book)
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
