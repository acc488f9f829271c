"""Random line terms, shocks and market data."""

from __future__ import annotations

from datetime import date
from typing import Any

import numpy as np
from hypothesis import strategies as st

from desk.book import (
    FlowTable,
    Indexation,
    IndexationKind,
    Instrument,
    LineTerms,
    Move,
    MoveKind,
    ScenarioSet,
    Shock,
    ShockSettings,
    Side,
    Volatilities,
    VolatilityKind,
    YieldHistory,
)
from desk.rates.compounding import Compounding
from tests.report.basis_strategies import TODAY, maybe, names, rates, rising

__all__ = [
    "line_terms",
    "scenario_sets",
    "shock_settings",
    "shocks",
    "volatilities",
    "yield_histories",
]

SHARES = (MoveKind.RELATIVE, MoveKind.VALUE, MoveKind.AMOUNT, MoveKind.DECLINE)
NEED_TERM = (MoveKind.RATE, MoveKind.RELATIVE, MoveKind.TWIST)

text = st.one_of(st.just(""), names)


@st.composite
def line_terms(draw: st.DrawFn, liabilities: FlowTable, asset_flows: FlowTable) -> tuple[LineTerms, ...]:
    """Terms of some lines, not all of which need be there."""
    found = []
    for side, lines in ((Side.LIABILITIES, liabilities.line_names), (Side.ASSETS, asset_flows.line_names)):
        for line in dict.fromkeys([*lines, draw(names)]):
            if draw(st.booleans()):
                floor = draw(maybe(rates))
                cap = draw(maybe(st.floats(0.9 if floor is None else floor, 1.0)))
                kind = draw(st.sampled_from(IndexationKind))
                own = draw(st.sampled_from(["spread", "rate", ""]))
                stated = {own: draw(rates)} if own else {}
                indexation = Indexation(kind, draw(st.one_of(st.just(0.0), rates)), floor, cap)
                found.append(LineTerms(side, line, indexation, **stated))
    return tuple(draw(st.permutations(found)))


@st.composite
def shocks(draw: st.DrawFn) -> Shock:
    """A shock whose terms are in order."""
    moves = []
    for kind in draw(st.lists(st.sampled_from(MoveKind), max_size=5)):
        size = draw(st.floats(-0.99, 9.0) if kind in SHARES else st.floats(-199.0, 199.0))
        has_term = kind in NEED_TERM or draw(st.booleans())
        moves.append(Move(kind, size, draw(st.floats(0.01, 190.0)) if has_term else None, draw(text)))
    for kind in MoveKind:
        places = [place for place, move in enumerate(moves) if move.kind is kind and move.term is not None]
        ordered = sorted((moves[place] for place in places), key=lambda move: move.term or 0.0)
        for place, move in zip(places, ordered, strict=True):
            moves[place] = move
    return Shock(
        draw(names),
        tuple(moves),
        draw(text),
        compounding=draw(st.sampled_from(Compounding)),
        set_name=draw(text),
    )


set_names = names.map(str.strip).filter(lambda name: bool(name) and ";" not in name)
shock_settings = st.builds(
    ShockSettings,
    sets=st.lists(set_names, max_size=3, unique=True).map(tuple),
    thresholds=st.one_of(
        st.just(ShockSettings.thresholds),
        st.sets(st.floats(1e-3, 10.0), max_size=4).map(lambda ratios: tuple(sorted(ratios, reverse=True))),
    ),
)


@st.composite
def volatilities(draw: st.DrawFn) -> Volatilities:
    """Quotes of any instruments."""
    instruments = draw(st.lists(st.sampled_from(Instrument), min_size=1, max_size=5))

    def column(strategy: st.SearchStrategy[Any]) -> np.ndarray:
        return np.array([draw(strategy) for _ in instruments])

    years = st.floats(0.01, 60.0)
    lengths = column(years)
    of_swap = ["swaption" in instrument for instrument in instruments]
    return Volatilities(
        tuple(instruments),
        column(years),
        np.where(of_swap, lengths, np.nan),
        column(st.one_of(st.just(np.nan), rates)),
        column(st.floats(1e-6, 1.0)),
        tuple(draw(st.sampled_from(VolatilityKind)) for _ in instruments),
        column(st.floats(0.0, 0.1)),
        column(st.sampled_from([1.0, 2.0, 4.0, 12.0])),
    )


@st.composite
def yield_histories(draw: st.DrawFn) -> YieldHistory:
    """A history in which quotes may be missing, but not all of one date."""
    days = sorted(draw(st.sets(st.dates(date(1950, 1, 1), TODAY), min_size=1, max_size=4)))
    terms = rising(draw)
    quotes = np.array([[draw(st.one_of(st.just(np.nan), rates)) for _ in terms] for _ in days])
    return YieldHistory(np.array(days, "M8[D]"), terms, quotes)


@st.composite
def scenario_sets(draw: st.DrawFn) -> ScenarioSet:
    """A few paths."""
    nodes = rising(draw)
    count = draw(st.integers(1, 4))
    return ScenarioSet(nodes, np.array([[draw(rates) for _ in nodes] for _ in range(count)]))
