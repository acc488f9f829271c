"""The demo books are what they are said to be, and come out of their script as they stand."""

from __future__ import annotations

import importlib.util
from collections.abc import Callable
from itertools import pairwise
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest

from desk.book import (
    Book,
    CurveKind,
    HoldingKind,
    IndexationKind,
    Instrument,
    LiabilityMethod,
    ModelName,
    MoveKind,
)
from desk.intake.prescribed_shocks import read_shock_sets
from desk.intake.records import Reading
from desk.intake.workbook import read_workbook
from desk.places import demo_books, resources
from desk.rates.gaussian import hull_white
from desk.rates.option_instruments import option_quotes
from desk.rates.option_models import gaussian_option_prices
from desk.valuation.shocks import shock_table
from desk.valuation.standing import stand

NAMES = ("pension_fund.xlsx", "life_insurer.xlsx", "small_endowment.xlsx")


def _script(name: str = "make_demo_books") -> ModuleType:
    path = demo_books() / f"{name}.py"
    found = importlib.util.spec_from_file_location(name, path)
    assert found is not None
    assert found.loader is not None
    module = importlib.util.module_from_spec(found)
    found.loader.exec_module(module)
    return module


@pytest.fixture(scope="module")
def readings() -> dict[str, Reading]:
    """Each workbook, read once."""
    return {name: read_workbook(demo_books() / name) for name in NAMES}


@pytest.fixture(scope="module")
def books(readings: dict[str, Reading]) -> dict[str, Book]:
    """Each book."""
    found = {name: reading.book for name, reading in readings.items() if reading.book is not None}
    assert set(found) == set(NAMES)
    return found


@pytest.mark.parametrize("name", NAMES)
def test_a_demo_book_has_no_fault_and_every_sheet(name: str, readings: dict[str, Reading]) -> None:
    assert readings[name].faults == ()
    sheets = {grid.name for grid in readings[name].sheets}
    assert {
        "Basis",
        "Curve",
        "Liabilities",
        "Holdings",
        "Rates model",
        "Risky assets",
        "Run",
        "History",
    } <= sheets
    assert (demo_books() / name).stat().st_size < 1.5e6


def test_the_script_makes_them_as_they_stand(books: dict[str, Book]) -> None:
    makers: dict[str, Callable[[], Book]] = _script().BOOKS
    assert set(makers) == set(NAMES)
    for name, make in makers.items():
        made = make()
        assert made == books[name], name
        assert made.digest == books[name].digest, name


def test_the_script_writes_the_same_bytes_each_time(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    script = _script()
    monkeypatch.setattr(script, "__file__", str(tmp_path / "make_demo_books.py"))
    monkeypatch.setattr(script, "BOOKS", {"small_endowment.xlsx": script.BOOKS["small_endowment.xlsx"]})
    script.main()
    first = (tmp_path / "small_endowment.xlsx").read_bytes()
    script.main()
    assert (tmp_path / "small_endowment.xlsx").read_bytes() == first


def test_the_pension_fund(books: dict[str, Book]) -> None:
    book = books["pension_fund.xlsx"]
    assert len(book.liabilities) == 2_000
    assert len(book.liabilities.line_names) == 4
    assert 69.0 < book.liabilities.time.max() < 71.0
    assert len(book.holdings) == 47
    assert {holding.kind for holding in book.holdings} == {
        *(HoldingKind.BOND, HoldingKind.ZERO, HoldingKind.DEPOSIT, HoldingKind.FUND),
        HoldingKind.LINKED_BOND,
    }
    assert stand(book).funding_ratio == pytest.approx(0.92, abs=0.005)
    kinds = {terms.line: terms.indexation.kind for terms in book.line_terms}
    assert len(kinds) == 3
    assert set(kinds.values()) == set(IndexationKind) - {IndexationKind.FIXED}
    history = book.yield_history
    assert history is not None
    assert history.rates.shape == (120, 6)
    assert np.abs(history.rates[-1] - book.basis.curve.zero(history.terms)).max() < 1e-5


def test_the_accounts_of_the_pension_fund(books: dict[str, Book]) -> None:
    """Its corporate bonds lie above the curve and near one smooth curve, so the accounts show less owed."""
    book = books["pension_fund.xlsx"]
    second = book.second_basis
    assert second is not None
    assert book.on_second_basis is not None
    assert second.liability_method is LiabilityMethod.CORPORATE_BONDS
    fit = second.liability_curve_fit
    assert fit is not None
    assert fit.converged
    assert len(fit.residual_bp) == 32
    assert 1.0 < fit.rmse_bp < 5.0
    terms = np.arange(1.0, 31.0)
    spread = fit.curve.zero(terms) - second.curve.zero(terms)
    assert ((spread > 0.0) & (spread < 0.0125)).all()
    assert 0.95 < stand(book.on_second_basis).funding_ratio < 0.98


def test_the_life_insurer(books: dict[str, Book]) -> None:
    book = books["life_insurer.xlsx"]
    assert len(book.liabilities) == 15_000
    assert len(book.liabilities.line_names) == 12
    assert 49.0 < book.liabilities.time.max() < 51.0
    bonds = [holding for holding in book.holdings if holding.kind is HoldingKind.BOND]
    assert len(bonds) == 400
    assert book.basis.curve_kind is CurveKind.SWAP
    assert book.basis.liability_method is LiabilityMethod.TERM_SPREADS
    assert len(book.holdings) > 400
    standing = stand(book)
    assert 1.05 < standing.funding_ratio < 1.10
    assets, liabilities = standing.assets, standing.liabilities
    assert assets.effective_duration * assets.present_value < (
        liabilities.effective_duration * liabilities.present_value
    )


def test_the_shocks_of_the_life_insurer_show_every_move(books: dict[str, Book]) -> None:
    """Each can be computed whole: none is left out, none of its moves is."""
    book = books["life_insurer.xlsx"]
    assert len(book.shocks) == 8
    assert {move.kind for shock in book.shocks for move in shock.moves} == set(MoveKind)
    table = shock_table(book, book.shocks)
    assert table.faults == ()
    assert [result.name for result in table.results] == [shock.name for shock in book.shocks]
    assert all(result.change_in_surplus != 0.0 for result in table.results)
    named = read_shock_sets(resources() / "shocks", currency="GBP").sets
    assert set(book.shock_settings.sets) <= {shocks.name for shocks in named}


def test_the_volatilities_of_the_life_insurer_let_nobody_gain(books: dict[str, Book]) -> None:
    """They are laid out without an objection, and a Hull-White model comes near each."""
    book = books["life_insurer.xlsx"]
    quoted = book.volatilities
    assert quoted is not None
    assert set(quoted.instrument) >= {Instrument.CAP, Instrument.FLOOR, Instrument.PAYER_SWAPTION}
    laid_out = option_quotes(
        book.basis.curve,
        instrument=quoted.instrument,
        expiry=quoted.expiry,
        length=quoted.length,
        strike=quoted.strike,
        volatility=quoted.volatility,
        kind=quoted.kind,
        shift=quoted.shift,
        frequency=quoted.frequency,
    )
    model = book.rates_model
    assert model is not None
    assert model.mean_reversion is not None
    assert model.volatility is not None
    rates = hull_white(book.basis.curve, mean_reversion=model.mean_reversion, volatility=model.volatility)
    found = laid_out.volatilities(gaussian_option_prices(rates, laid_out))
    np.testing.assert_allclose(quoted.volatility, found, rtol=0.04)


def test_the_small_endowment(books: dict[str, Book]) -> None:
    book = books["small_endowment.xlsx"]
    assert 29.0 < book.liabilities.time.max() < 31.0
    kinds = [holding.kind for holding in book.holdings]
    assert kinds.count(HoldingKind.BOND) == 6
    assert kinds.count(HoldingKind.FUND) == kinds.count(HoldingKind.DEPOSIT) == 1
    assert stand(book).surplus > 0
    table = shock_table(book, book.shocks)
    assert table.faults == ()
    assert [result.change_in_surplus < 0.0 for result in table.results] == [True, True]


def test_they_look_like_the_markets_of_today(books: dict[str, Book]) -> None:
    """Sizes of the middle of the 2020s; common practice for the parameters of the models."""
    assert sorted(book.basis.currency for book in books.values()) == ["EUR", "GBP", "USD"]
    for book in books.values():
        assert book.basis.valuation_date.isoformat() == "2026-09-30"
        assert ((book.basis.rates >= 0.02) & (book.basis.rates <= 0.05)).all()
        model, history = book.rates_model, book.history
        assert model is not None
        assert model.mean_reversion is not None
        assert 0.03 <= model.mean_reversion <= 0.1
        assert history is not None
        assert history.rate.size == 120
        assert abs(history.rate[-1] - book.basis.curve.zero(0.25)) < 0.003
        assert model.volatility is not None
        absolute = model.volatility * (np.sqrt(0.04) if model.name is ModelName.CIR else 1.0)
        assert 0.007 <= absolute <= 0.011
        priced = [line for line in stand(book).lines if line.kind == "bond" and line.market_value is not None]
        spreads = np.array([line.spread for line in priced], dtype=np.float64)
        assert priced
        assert ((spreads > 0.0049) & (spreads < 0.0201)).all()
        assert len({holding.name for holding in book.holdings}) == len(book.holdings)


def test_the_law_of_survival_is_gompertz() -> None:
    """The force of mortality, by differences, is ``exp((x - m) / b) / b`` at every age."""
    script = _script("demo_parts")
    years = np.linspace(0.0, 40.0, 4001)
    alive = script.survivors(60.0, years)
    force = -np.gradient(np.log(alive), years)
    assert alive[0] == 1.0
    assert all(first > second for first, second in pairwise(alive.tolist()))
    np.testing.assert_allclose(force[1:-1], np.exp((60.0 + years[1:-1] - 88.0) / 9.5) / 9.5, rtol=1e-5)
