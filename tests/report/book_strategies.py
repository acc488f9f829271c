"""Random books with anything that a workbook can hold."""

from __future__ import annotations

from calendar import monthrange
from datetime import date
from typing import Any

import numpy as np
from hypothesis import strategies as st

from desk.book import (
    Amortisation,
    Book,
    FlowTable,
    History,
    Holding,
    HoldingKind,
    Measure,
    ModelName,
    Notes,
    PriceKind,
    RatesModel,
    RiskyAssets,
    Run,
)
from desk.book.holding import SWAP_KINDS
from desk.book.run import MOST_PATHS, MOST_REPLICATES, Bridge, Sampling
from desk.intake.sheets import SHEETS, find_known, fold
from desk.rates.day_count import TIME_COUNTS, DayCount, year_fraction
from tests.report.basis_strategies import TODAY, bases, maybe, names, rates
from tests.report.market_strategies import (
    line_terms,
    scenario_sets,
    shock_settings,
    shocks,
    volatilities,
    yield_histories,
)

__all__ = ["TODAY", "books", "holdings"]

amounts = st.floats(-1e15, 1e15)
dates = st.dates(date(2026, 10, 1), date(2200, 12, 31))


@st.composite
def flow_tables(draw: st.DrawFn, day_count: DayCount, *, beta: bool) -> FlowTable:
    """Flows of which some state a date and some the years."""
    lines = draw(st.lists(names, min_size=1, max_size=6))
    days = [draw(st.one_of(st.none(), dates)) for _ in lines]
    stated = np.array(days, dtype="M8[D]")
    years = np.array([draw(st.floats(-3.0, 150.0)) for _ in lines])
    time = np.where(np.isnat(stated), years, year_fraction(np.datetime64(TODAY), stated, day_count))
    betas = [draw(st.one_of(st.just(0.0), st.floats(-2, 2))) for _ in lines] if beta else None
    return FlowTable.build(lines, time, [draw(amounts) for _ in lines], beta=betas, date=stated)


LINKED = HoldingKind.LINKED_BOND
QUOTED = (HoldingKind.BOND, LINKED, HoldingKind.ZERO, HoldingKind.FLOATER, HoldingKind.BILL)
WITH_COUPONS = (HoldingKind.BOND, LINKED, HoldingKind.FLOATER, *SWAP_KINDS)
STATED = (HoldingKind.FUND, HoldingKind.PROPERTY)


def months_before(day: date, months: int) -> date:
    """A date some months earlier, month ends clipped."""
    year, month = divmod(day.year * 12 + day.month - 1 - months, 12)
    return date(year, month + 1, min(day.day, monthrange(year, month + 1)[1]))


@st.composite
def dated_terms(draw: st.DrawFn, kind: HoldingKind, frequency: int) -> dict[str, Any]:
    """Maturity, start, first coupon, ex-dividend days and amortisation of a kind that has a maturity."""
    maturity = draw(dates)
    start = draw(st.one_of(st.none(), st.dates(date(1990, 1, 1), date(2026, 9, 1))))
    first = None
    if kind in (HoldingKind.BOND, LINKED, HoldingKind.FLOATER):
        apart = 12 // frequency * draw(st.integers(0, 8))
        first = draw(st.sampled_from([None, months_before(maturity, apart)]))
        if first is not None and first <= (start or first):
            first = None
    days = draw(st.integers(0, 25)) if kind in WITH_COUPONS else 0
    repaid = [Amortisation.BULLET]
    if kind in WITH_COUPONS and kind is not LINKED:
        repaid.append(Amortisation.LEVEL)
    if kind is HoldingKind.BOND:
        repaid.append(Amortisation.ANNUITY)
    return {
        "maturity": maturity,
        "start_date": start,
        "first_coupon": first,
        "ex_dividend_days": days,
        "bought_ex_dividend": days > 0 and draw(st.booleans()),
        "amortisation": draw(st.sampled_from(repaid)),
    }


@st.composite
def holdings(draw: st.DrawFn) -> Holding:
    """A holding of any kind with anything that it may state."""
    kind = draw(st.sampled_from(HoldingKind))
    worth, rate, day_count = st.floats(1e-3, 1e12), st.floats(-0.05, 0.2), st.sampled_from(DayCount)
    frequency = draw(st.sampled_from([1, 2, 4, 12])) if kind in (*WITH_COUPONS, HoldingKind.ZERO) else 1
    terms: dict[str, Any] = {}
    if kind not in (HoldingKind.DEPOSIT, *STATED):
        terms = draw(dated_terms(kind, frequency))
    if kind in QUOTED:
        by_rate = kind is HoldingKind.BILL and draw(st.booleans())
        terms["discount_rate" if by_rate else "price"] = draw(maybe(st.floats(1e-3, 0.9)))
        terms["price_kind"] = draw(st.sampled_from(PriceKind))
    if kind in (*QUOTED, HoldingKind.TERM_DEPOSIT):
        terms["default_rate"] = draw(st.floats(0.0, 0.99))
        terms["recovery_rate"] = draw(st.floats(0.0, 1.0))
    if kind in (HoldingKind.FLOATER, *SWAP_KINDS):
        terms |= {"current_rate": draw(maybe(rate)), "margin": draw(rate)}
    if kind in SWAP_KINDS:
        terms["floating_frequency"] = draw(maybe(st.sampled_from([1, 2, 4, 12])))
        terms["floating_day_count"] = draw(maybe(day_count))
    if kind is LINKED:
        terms["index_lag_months"] = draw(st.integers(0, 60))
        terms["index_ratio"] = draw(st.floats(0.01, 99.0))
        terms["has_principal_floor"] = draw(st.booleans())
    pays_fixed = kind in (HoldingKind.BOND, LINKED, *SWAP_KINDS) or terms.get("start_date") is not None
    return Holding(
        name=draw(names),
        kind=kind,
        nominal=0.0 if kind in STATED else draw(worth),
        coupon=draw(st.floats(0.0, 0.2)) if pays_fixed else 0.0,
        frequency=frequency,
        day_count=draw(maybe(day_count)),
        market_value=draw(worth if kind in STATED else maybe(worth)),
        units=draw(maybe(worth)),
        duration=draw(maybe(st.floats(0, 50))) if kind in STATED else None,
        **terms,
    )


@st.composite
def risky(draw: st.DrawFn) -> RiskyAssets:
    """Assets whose correlations hold together: those of one common driver."""
    own = names.filter(lambda name: find_known(name, SHEETS["Risky assets"].columns) is None)
    called = draw(st.lists(own, min_size=1, max_size=4, unique_by=fold))
    count = len(called)
    loading = np.array([draw(st.floats(-0.9, 0.9)) for _ in range(count + 1)])
    joint = np.outer(loading, loading)
    np.fill_diagonal(joint, 1.0)

    def column(low: float, high: float) -> Any:
        return np.array([draw(st.floats(low, high)) for _ in called])

    return RiskyAssets(
        tuple(called),
        column(0, 1e9),
        column(-0.1, 0.2),
        column(0, 0.9),
        column(0, 0.1),
        joint[1:, 1:],
        joint[0, 1:],
    )


@st.composite
def books(draw: st.DrawFn) -> Book:
    """A book with anything a workbook can hold."""
    day_count = draw(st.sampled_from(TIME_COUNTS))
    basis = draw(bases(day_count))
    second = draw(maybe(bases(day_count, first=basis)))
    liabilities = draw(flow_tables(day_count, beta=True))
    heading = names.map(str.strip).filter(
        lambda text: find_known(text, SHEETS["Liabilities"].columns) is None
    )
    headings = draw(st.lists(heading, max_size=2, unique_by=fold))
    note = st.one_of(st.none(), names, amounts)
    notes: tuple[Notes, ...] = ()
    if headings:
        rows = tuple(tuple(draw(note) for _ in headings) for _ in range(len(liabilities)))
        notes = (Notes("Liabilities", tuple(headings), rows),)
    model = st.builds(
        RatesModel,
        name=st.sampled_from([ModelName.HULL_WHITE, ModelName.HO_LEE, ModelName.BLACK_KARASINSKI]),
        mean_reversion=st.floats(0, 5),
        volatility=st.floats(0, 0.9),
        long_run_rate=st.one_of(st.none(), rates),
        risk_price=st.floats(-3, 3),
        second_risk_price=st.floats(-3, 3),
        inflation_mean_reversion=st.floats(0, 5),
        inflation_volatility=st.one_of(st.none(), st.floats(0, 0.9)),
        inflation_rate_correlation=st.one_of(st.none(), st.floats(-1, 1)),
        inflation_risk_price=st.floats(-3, 3),
        mend_correlation=st.booleans(),
    )
    history_days = sorted(draw(st.sets(st.dates(date(1950, 1, 1), TODAY), max_size=4)))
    asset_flows = draw(st.one_of(st.just(FlowTable.empty()), flow_tables(day_count, beta=False)))
    return Book(
        basis=basis,
        liabilities=liabilities,
        holdings=tuple(draw(st.lists(holdings(), max_size=4))),
        asset_flows=asset_flows,
        rates_model=draw(st.one_of(st.none(), model)),
        risky_assets=draw(st.one_of(st.none(), risky())),
        run=Run(
            paths=draw(st.integers(1, MOST_PATHS)),
            horizon_years=draw(st.integers(1, 200)),
            steps_per_year=draw(st.integers(1, 366)),
            seed=draw(st.integers(0, 2**53)),
            measure=draw(st.sampled_from(Measure)),
            percentiles=tuple(sorted(draw(st.sets(st.floats(1e-3, 99.9), min_size=1, max_size=7)))),
            sampling=draw(st.sampled_from(Sampling)),
            bridge=draw(st.sampled_from(Bridge)),
            matching=draw(st.booleans()),
            replicates=draw(st.integers(2, MOST_REPLICATES)),
        ),
        history=None
        if not history_days
        else History(np.array(history_days, "M8[D]"), np.array([draw(rates) for _ in history_days])),
        notes=notes,
        second_basis=second,
        line_terms=draw(line_terms(liabilities, asset_flows)),
        shocks=tuple(draw(st.lists(shocks(), max_size=3, unique_by=lambda shock: shock.name))),
        shock_settings=draw(shock_settings),
        volatilities=draw(maybe(volatilities())),
        yield_history=draw(maybe(yield_histories())),
        scenario_set=draw(maybe(scenario_sets())),
    )
