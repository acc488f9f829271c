"""The standing: the balance sheet valued at one date on one basis."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from desk import __version__
from desk.book import Book, HoldingKind, Inflation, PricedFlows, Provenance, Side
from desk.book.arrays import FloatArray, IntArray
from desk.rates.curve import DiscountCurve
from desk.valuation.indexing import grown
from desk.valuation.inflation_moves import InflationMoves, inflation_moves
from desk.valuation.measures import (
    KEY_TERMS,
    ValuedRows,
    key_rate_durations,
    measure,
    measure_groups,
    value_flows,
)
from desk.valuation.priced import PricedSide, priced_flows
from desk.valuation.records import (
    Condition,
    InflationStanding,
    KeyRates,
    LineStanding,
    Measures,
    Periods,
    Standing,
)

__all__ = ["DURATION_TOLERANCE", "redington_conditions", "stand", "undiscounted_periods"]

DURATION_TOLERANCE = 1e-4
"""How far the duration condition may be missed, as a part of the liabilities' figure."""

_WITHOUT_SPREAD = frozenset(
    {
        HoldingKind.FUND.value,
        HoldingKind.PROPERTY.value,
        HoldingKind.PAYER_SWAP.value,
        HoldingKind.RECEIVER_SWAP.value,
    }
)
_YEARS_LISTED_WITHOUT_GAPS = 1000
_YEAR_SLACK = 1e-9  # a twelfth added twelve times is still the first year


def stand(book: Book, *, progress: Callable[[float], None] | None = None) -> Standing:
    """Value a book.

    Parameters
    ----------
    book : Book
    progress : callable, optional
        Called with the part done, from 0 to 1; it may stop the work by raising.

    Returns
    -------
    Standing
        An empty side is worth 0, with NaN for what has no meaning then.

    Raises
    ------
    ValueError
        If the basis gives no curve, or states expected inflation that gives none.
    """
    report = progress or (lambda _: None)
    report(0.0)
    curve = book.basis.curve
    priced = {side: priced_flows(book, side) for side in Side}
    report(0.3)
    rows = {side: value_flows(priced[side].flows, curve) for side in Side}
    total = {side: measure(rows[side]) for side in Side}
    report(0.5)
    inflation = book.basis.inflation
    moves: dict[Side, InflationMoves] = {}
    if inflation is not None:
        moves = {side: inflation_moves(priced[side].flows, rows[side].value, inflation) for side in Side}
    lines = tuple(line for side in Side for line in _lines(book, priced[side], rows[side], moves.get(side)))
    report(0.8)
    assets, liabilities = total[Side.ASSETS], total[Side.LIABILITIES]
    first = {side: _moments(rows[side])[1] for side in Side}
    worth_a, worth_l = assets.present_value, liabilities.present_value
    standing = Standing(
        valuation_date=book.basis.valuation_date,
        currency=book.basis.currency,
        assets=assets,
        liabilities=liabilities,
        surplus=worth_a - worth_l,
        funding_ratio=worth_a / worth_l if worth_l else np.nan,
        # D_A - D_L · L / A, written with the sums so that an empty side needs no duration
        duration_gap=(first[Side.ASSETS] - first[Side.LIABILITIES]) / worth_a if worth_a else np.nan,
        dv01_gap=assets.dv01 - liabilities.dv01,
        redington=redington_conditions(rows[Side.ASSETS], rows[Side.LIABILITIES]),
        key_rates=_key_rates(rows[Side.ASSETS], rows[Side.LIABILITIES]),
        periods=undiscounted_periods(priced[Side.ASSETS].flows, priced[Side.LIABILITIES].flows),
        lines=lines,
        faults=tuple(fault for side in Side for fault in priced[side].faults),
        provenance=Provenance(book_digest=book.digest, program_version=__version__),
        inflation=None
        if inflation is None
        else _inflation_standing(inflation, {side: priced[side].flows for side in Side}, total, moves),
    )
    report(1.0)
    return standing


def _moments(rows: ValuedRows) -> tuple[float, float, float]:
    """Sums of value, value times time, and value times time squared."""
    with np.errstate(over="ignore", invalid="ignore"):
        timed = rows.value * rows.time
        return float(rows.value.sum()), float(timed.sum()), float((timed * rows.time).sum())


def _inflation_standing(
    inflation: Inflation,
    flows: dict[Side, PricedFlows],
    total: dict[Side, Measures],
    moves: dict[Side, InflationMoves],
) -> InflationStanding:
    """How both sides follow expected inflation."""
    worth = {side: total[side].present_value for side in Side}
    slope = {side: float(moves[side].slope.sum()) for side in Side}
    dv01 = {side: float(moves[side].line_dv01.sum()) for side in Side}
    # Without an effective duration the side has no value to measure against.
    base = {side: np.nan if np.isnan(total[side].effective_duration) else worth[side] for side in Side}
    worth_a = worth[Side.ASSETS]
    return InflationStanding(
        assets_duration=slope[Side.ASSETS] / base[Side.ASSETS],
        liabilities_duration=slope[Side.LIABILITIES] / base[Side.LIABILITIES],
        real_duration_gap=(slope[Side.ASSETS] - slope[Side.LIABILITIES]) / worth_a if worth_a else np.nan,
        dv01_assets=dv01[Side.ASSETS],
        dv01_liabilities=dv01[Side.LIABILITIES],
        dv01_gap=dv01[Side.ASSETS] - dv01[Side.LIABILITIES],
        term=np.array(KEY_TERMS),
        key_assets=moves[Side.ASSETS].slope / base[Side.ASSETS],
        key_liabilities=moves[Side.LIABILITIES].slope / base[Side.LIABILITIES],
        key_dv01_assets=moves[Side.ASSETS].dv01,
        key_dv01_liabilities=moves[Side.LIABILITIES].dv01,
        real_periods=undiscounted_periods(
            flows[Side.ASSETS], flows[Side.LIABILITIES], inflation_curve=inflation.curve
        ),
    )


def _lines(
    book: Book, priced: PricedSide, rows: ValuedRows, moves: InflationMoves | None
) -> list[LineStanding]:
    """The lines of one side, in the order of the book."""
    flows = priced.flows
    count = len(flows.line_names)
    measures = measure_groups(rows, flows.line, count)
    flow_count = np.bincount(flows.line[flows.is_flow], minlength=count).tolist()
    spread = _common_spread(flows, count)
    holdings = book.holdings if flows.side is Side.ASSETS else ()
    kinds = [holding.kind.value for holding in holdings] + ["flows"] * (count - len(holdings))
    market, loss = _or_none(priced.stated_value), _or_none(priced.credit_loss)
    durations = _spread_durations(flows, rows, measures, kinds)
    linked: list[float | None] = [None] * count if moves is None else moves.line_dv01.tolist()
    return [
        LineStanding(flows.side, name, kind, of_line, None if np.isnan(own) else own, *figures)
        for name, kind, of_line, own, *figures in zip(
            flows.line_names,
            kinds,
            measures,
            spread,
            market,
            flow_count,
            durations,
            loss,
            linked,
            strict=True,
        )
    ]


def _or_none(figures: FloatArray) -> list[float | None]:
    """Figures, with None for NaN."""
    return [
        None if missing else figure
        for figure, missing in zip(figures.tolist(), np.isnan(figures), strict=True)
    ]


def _spread_durations(
    flows: PricedFlows, rows: ValuedRows, measures: Sequence[Measures], kinds: Sequence[str]
) -> list[float | None]:
    """How each line's value falls with its spread; the effective duration where payments are fixed."""
    durations: list[float | None] = [
        None if kind in _WITHOUT_SPREAD else own.effective_duration
        for own, kind in zip(measures, kinds, strict=True)
    ]
    floats = np.array([kind == HoldingKind.FLOATER.value for kind in kinds], dtype=np.bool_)
    kept = np.flatnonzero(floats[flows.line])
    if kept.size:
        line = flows.line[kept]
        with np.errstate(over="ignore", under="ignore", invalid="ignore", divide="ignore"):
            worth = flows.paid[kept] * np.exp(-rows.exponent[kept])
            first = np.bincount(line, weights=worth * flows.time[kept], minlength=len(kinds))
        for number in np.unique(line).tolist():
            present = measures[number].present_value
            durations[number] = float(first[number]) / present if present else np.nan
    return durations


def _common_spread(flows: PricedFlows, count: int) -> list[float]:
    """The spread of each line; NaN where its rows differ or it has none."""
    common = np.full(count, np.nan)
    common[flows.line] = flows.spread
    differs = flows.line[flows.spread != common[flows.line]]
    common[differs] = np.nan
    return list(common.tolist())


def _key_rates(assets: ValuedRows, liabilities: ValuedRows) -> KeyRates:
    """Key-rate figures of both sides."""
    durations_a, dv01_a = key_rate_durations(assets)
    durations_l, dv01_l = key_rate_durations(liabilities)
    return KeyRates(np.array(KEY_TERMS), durations_a, durations_l, dv01_a, dv01_l)


def redington_conditions(assets: ValuedRows, liabilities: ValuedRows) -> tuple[Condition, ...]:
    """Redington's three conditions, each with the two figures it compares.

    Parameters
    ----------
    assets, liabilities : ValuedRows

    Returns
    -------
    tuple of Condition
        ``present_value``, ``duration``, ``convexity``: the sums of value, value times time and value
        times time squared.

    Notes
    -----
    The duration condition, an equality, holds within `DURATION_TOLERANCE` of the liabilities' figure.

    References
    ----------
    Redington, F.M., "Review of the Principles of Life-Office Valuations", Journal of the Institute of
    Actuaries 78, 1952, pp. 286-340.
    """
    worth_a, first_a, second_a = _moments(assets)
    worth_l, first_l, second_l = _moments(liabilities)
    return (
        Condition(
            "present_value",
            "The assets are worth at least as much as the liabilities.",
            worth_a,
            worth_l,
            worth_a >= worth_l,
        ),
        Condition(
            "duration",
            "Present value times duration is the same on both sides, "
            f"within {DURATION_TOLERANCE:.2%} of the liabilities' figure.",
            first_a,
            first_l,
            abs(first_a - first_l) <= DURATION_TOLERANCE * abs(first_l),
        ),
        Condition(
            "convexity",
            "Present value times convexity is greater for the assets than for the liabilities.",
            second_a,
            second_l,
            second_a > second_l,
        ),
    )


def undiscounted_periods(
    assets: PricedFlows, liabilities: PricedFlows, *, inflation_curve: DiscountCurve | None = None
) -> Periods:
    """Undiscounted flows of both sides by year from the valuation date.

    Parameters
    ----------
    assets, liabilities : PricedFlows
    inflation_curve : DiscountCurve, optional
        Of expected inflation: the flows are then in today's money, each over the index expected when it is
        paid.

    Returns
    -------
    Periods
        From year 1 to the year of the last flow. Beyond year 1,000 years without a flow are left out.
    """
    years = [_year(side) for side in (assets, liabilities)]
    last = max((int(year.max()) for year in years if year.size), default=0)
    if last <= _YEARS_LISTED_WITHOUT_GAPS:
        listed = np.arange(1, last + 1)
        places = [year - 1 for year in years]
    else:
        listed = np.unique(np.concatenate(years))
        places = [np.searchsorted(listed, year) for year in years]
    amounts: list[FloatArray] = [
        np.bincount(place, weights=_counted(side, inflation_curve), minlength=listed.size).astype(np.float64)
        for place, side in zip(places, (assets, liabilities), strict=True)
    ]
    with np.errstate(over="ignore", invalid="ignore"):
        net = amounts[0] - amounts[1]
        return Periods(listed, amounts[0], amounts[1], net, np.cumsum(net))


def _counted(flows: PricedFlows, inflation_curve: DiscountCurve | None) -> FloatArray:
    """What each payment counts, in money or in today's money."""
    paid = flows.paid[flows.is_flow]
    if inflation_curve is None:
        return paid
    return grown(paid, inflation_curve.discount(flows.time[flows.is_flow]))


def _year(flows: PricedFlows) -> IntArray:
    """The year each payment falls in, counted from 1."""
    time = np.minimum(flows.time[flows.is_flow], 2.0**53)
    return np.asarray(np.maximum(np.ceil(time - _YEAR_SLACK), 1.0), dtype=np.int64)
