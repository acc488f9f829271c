"""The standing once more, in plain Python: one flow after the other, no arrays, roots by halving."""

from __future__ import annotations

import calendar
import math
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import date

from desk.book import Book, Holding, HoldingKind, Side

KEYS = (0.25, 0.5, 1.0, 2.0, 3.0, 5.0, 7.0, 10.0, 15.0, 20.0, 25.0, 30.0, 40.0, 50.0)


@dataclass
class PlainLine:
    """Flows of one line: time, amount, spread; and whether each is a payment."""

    name: str
    rows: list[tuple[float, float, float, bool]] = field(default_factory=list)


def discount(book: Book, time: float) -> float:
    """Log-linear discount factor of annually compounded zero rates."""
    terms = [float(term) for term in book.basis.terms]
    logs = [-term * math.log(1.0 + float(rate)) for term, rate in zip(terms, book.basis.rates, strict=True)]
    terms, logs = [0.0, *terms], [0.0, *logs]
    number = 1
    while number < len(terms) - 1 and time > terms[number]:
        number += 1
    slope = (logs[number] - logs[number - 1]) / (terms[number] - terms[number - 1])
    return math.exp(logs[number - 1] + slope * (time - terms[number - 1]))


def halve(function: Callable[[float], float], low: float, high: float) -> float:
    """The root of a falling function."""
    for _ in range(200):
        middle = 0.5 * (low + high)
        if function(middle) > 0.0:
            low = middle
        else:
            high = middle
    return 0.5 * (low + high)


def bond_rows(holding: Holding, today: date) -> list[tuple[float, float]]:
    """Time and amount of each flow of a bond or zero."""
    assert holding.maturity is not None
    step = 12 // holding.frequency if holding.kind is HoldingKind.BOND else 12 * 500
    coupon = holding.nominal * holding.coupon / holding.frequency if holding.kind is HoldingKind.BOND else 0.0
    rows = []
    months, back = holding.maturity.year * 12 + holding.maturity.month - 1, 0
    while months - back > 12 * 1900:
        year, month = (months - back) // 12, (months - back) % 12 + 1
        when = date(year, month, min(holding.maturity.day, calendar.monthrange(year, month)[1]))
        if when <= today:
            break
        rows.append(((when - today).days / 365.0, coupon + (holding.nominal if back == 0 else 0.0)))
        back += step
    return rows[::-1]


def asset_lines(book: Book) -> list[PlainLine]:
    """The lines of the asset side."""
    lines = []
    for holding in book.holdings:
        line = PlainLine(holding.name)
        market = holding.market_value
        if holding.kind is HoldingKind.FUND:
            duration = holding.duration or 0.0
            line.rows.append((duration, (market or 0.0) / discount(book, duration), 0.0, False))
        elif holding.kind is HoldingKind.DEPOSIT:
            line.rows.append((0.0, holding.nominal if market is None else market, 0.0, True))
        else:
            rows = bond_rows(holding, book.basis.valuation_date)
            spread = 0.0
            if market is not None:
                spread = halve(
                    lambda s, r=rows, v=market: (
                        sum(  # type: ignore[misc]
                            amount * discount(book, time) * math.exp(-s * time) for time, amount in r
                        )
                        - v
                    ),
                    -2.0,
                    5.0,
                )
            line.rows.extend((time, amount, spread, True) for time, amount in rows)
        lines.append(line)
    return lines + table_lines(book, Side.ASSETS)


def table_lines(book: Book, side: Side) -> list[PlainLine]:
    """The lines of a table of flows."""
    table = book.asset_flows if side is Side.ASSETS else book.liabilities
    lines = [PlainLine(name) for name in table.line_names]
    for line, time, amount, beta in zip(table.line, table.time, table.amount, table.beta, strict=True):
        if time > 0.0:
            spread = 0.0
            if side is Side.LIABILITIES:
                spread = book.basis.liability_spread + float(beta) * book.basis.market_risk_premium
            lines[int(line)].rows.append((float(time), float(amount), spread, True))
    return lines


def worth(book: Book, lines: list[PlainLine], move: Callable[[float], float] = lambda _: 0.0) -> float:
    """Present value with every zero rate moved by ``move(time)``."""
    return sum(
        amount * discount(book, time) * math.exp(-(spread + move(time)) * time)
        for line in lines
        for time, amount, spread, _ in line.rows
    )


def measures(book: Book, lines: list[PlainLine]) -> dict[str, float]:
    """Every measure of the lines together, flows of one sign, not all today."""
    rows = [row for line in lines for row in line.rows]
    values = [amount * discount(book, time) * math.exp(-spread * time) for time, amount, spread, _ in rows]
    total = sum(values)
    times = [row[0] for row in rows]
    rate = halve(
        lambda y: sum(row[1] * (1.0 + y) ** -row[0] for row in rows) - total,
        -0.9,
        9.0,
    )
    at_rate = [row[1] * (1.0 + rate) ** -row[0] for row in rows]
    macaulay = sum(t * w for t, w in zip(times, at_rate, strict=True)) / sum(at_rate)
    effective = sum(t * v for t, v in zip(times, values, strict=True)) / total
    return {
        "present_value": total,
        "equivalent_rate": rate,
        "macaulay_duration": macaulay,
        "modified_duration": macaulay / (1.0 + rate),
        "effective_duration": effective,
        "convexity": sum(t * t * v for t, v in zip(times, values, strict=True)) / total,
        "dispersion": sum((t - effective) ** 2 * v for t, v in zip(times, values, strict=True)) / total,
        "dv01": worth(book, lines) - worth(book, lines, lambda _: 0.0001),
    }


def triangle(key: int, time: float) -> float:
    """The triangular move of one key rate at a time, flat outside the ends."""
    if key == 0 and time <= KEYS[0]:
        return 1.0
    if key == len(KEYS) - 1 and time >= KEYS[-1]:
        return 1.0
    if key > 0 and KEYS[key - 1] <= time <= KEYS[key]:
        return (time - KEYS[key - 1]) / (KEYS[key] - KEYS[key - 1])
    if key < len(KEYS) - 1 and KEYS[key] <= time <= KEYS[key + 1]:
        return (KEYS[key + 1] - time) / (KEYS[key + 1] - KEYS[key])
    return 0.0


def key_move(key: int, size: float) -> Callable[[float], float]:
    """The move of the zero rates when one key rate moves by `size`."""
    return lambda time: size * triangle(key, time)
