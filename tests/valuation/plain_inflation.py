"""Growth with a price index once more, in plain Python: one time after the other, collars by quadrature."""

from __future__ import annotations

import math
from collections.abc import Callable

from desk.book import Holding, Indexation, IndexationKind, Inflation

__all__ = ["bumped", "growth", "index", "linked_value"]

Index = Callable[[float], float]


def index(inflation: Inflation, move: Callable[[float], float] = lambda time: 0.0) -> Index:
    """The index expected at a time, over today's: log-linear between the terms, each zero rate moved.

    Before today it has grown at the rate of the months just passed, which never moves.
    """
    terms = [0.0, *(float(term) for term in inflation.terms)]
    logs = [0.0] + [
        float(term) * math.log(1.0 + float(rate))
        for term, rate in zip(inflation.terms, inflation.rates, strict=True)
    ]
    recent = math.log(1.0 + inflation.recent) if inflation.recent is not None else logs[1] / terms[1]

    def found(time: float) -> float:
        if time <= 0.0:
            return math.exp(recent * time)
        number = 1
        while number < len(terms) - 1 and time > terms[number]:
            number += 1
        slope = (logs[number] - logs[number - 1]) / (terms[number] - terms[number - 1])
        return math.exp(logs[number - 1] + slope * (time - terms[number - 1]) + move(time) * time)

    return found


def bumped(keys: list[float], number: int, size: float) -> Callable[[float], float]:
    """A triangular move of one key of zero rates, flat before the first and after the last."""

    def move(time: float) -> float:
        if time <= keys[0]:
            return size if number == 0 else 0.0
        if time >= keys[-1]:
            return size if number == len(keys) - 1 else 0.0
        upper = next(place for place, key in enumerate(keys) if key >= time)
        share = (time - keys[upper - 1]) / (keys[upper] - keys[upper - 1])
        return size * (share if number == upper else 1.0 - share if number == upper - 1 else 0.0)

    return move


def _mean_held(mean: float, sd: float, floor: float, cap: float) -> float:
    """Expected value of a normal held between a floor and a cap, from its distribution function.

    ``E = floor + ∫ P(X > x) dx`` over the span from floor to cap, by Simpson's rule.
    """
    if sd == 0.0:
        return min(max(mean, floor), cap)
    low, high = max(floor, mean - 12.0 * sd), min(cap, mean + 12.0 * sd)
    if high <= low:
        return floor if mean < floor else cap
    count = 1000
    width = (high - low) / count

    def above(x: float) -> float:
        return 0.5 * math.erfc((x - mean) / sd / math.sqrt(2.0))

    total = above(low) + above(high)
    total += 4.0 * sum(above(low + width * place) for place in range(1, count, 2))
    total += 2.0 * sum(above(low + width * place) for place in range(2, count, 2))
    return low + total * width / 3.0


def growth(indexation: Indexation, time: float, on: Index, volatility: float) -> float:
    """Growth from today to a time."""
    lag = indexation.lag

    def lagged(when: float) -> float:
        return on(when - lag) / on(-lag)

    if indexation.kind is IndexationKind.FIXED:
        return 1.0
    if indexation.kind is IndexationKind.RISING:
        return float((1.0 + indexation.rise) ** time)
    if indexation.kind is IndexationKind.LINKED:
        if indexation.least is None:
            return lagged(time)
        deviation = volatility * math.sqrt(max(time - lag, 0.0))
        return _greater(lagged(time), deviation, indexation.least)
    total, year = 1.0, 1
    floor = -math.inf if indexation.floor is None else indexation.floor
    cap = math.inf if indexation.cap is None else indexation.cap
    while year - 1 < time:
        mean = lagged(year) / lagged(year - 1) - 1.0
        unknown = max(year - lag, 0.0) - max(year - 1 - lag, 0.0)
        factor = 1.0 + _mean_held(mean, volatility * math.sqrt(unknown), max(floor, -1.0), cap)
        total *= factor ** min(time - (year - 1), 1.0)
        year += 1
    return total


def _greater(mean: float, deviation: float, least: float) -> float:
    """Expected value of the greater of a lognormal of a mean and a floor, by Simpson's rule."""
    if deviation == 0.0:
        return max(mean, least)
    count, span = 4000, 12.0

    def part(z: float) -> float:
        density = math.exp(-0.5 * z * z) / math.sqrt(2.0 * math.pi)
        return density * max(mean * math.exp(deviation * z - 0.5 * deviation**2), least)

    # From where the two are equal on both sides, so that the rule sees no kink.
    kink = min(max((math.log(least / mean) + 0.5 * deviation**2) / deviation, -span), span)
    total = 0.0
    for low, high in ((-span, kink), (kink, span)):
        width = (high - low) / count
        own = part(low) + part(high) + 4.0 * sum(part(low + width * place) for place in range(1, count, 2))
        own += 2.0 * sum(part(low + width * place) for place in range(2, count, 2))
        total += own * width / 3.0
    return total


def linked_value(
    holding: Holding,
    payments: list[tuple[float, float, float]],
    discount: Callable[[float], float],
    on: Index,
    *,
    spread: float = 0.0,
    volatility: float = 0.0,
) -> float:
    """Present value of a linked bond whose payments before indexation are (time, interest, repaid)."""
    lag, ratio = holding.index_lag_months / 12.0, holding.index_ratio
    plain = Indexation(IndexationKind.LINKED, lag=lag)
    floored = Indexation(IndexationKind.LINKED, lag=lag, least=1.0 / ratio)
    total = 0.0
    for time, interest, repaid in payments:
        of_principal = floored if holding.has_principal_floor else plain
        paid = interest * growth(plain, time, on, volatility)
        if repaid:
            paid += repaid * growth(of_principal, time, on, volatility)
        total += ratio * paid * discount(time) * math.exp(-spread * time)
    return total
