"""The command that shocks a book, and the tasks behind it."""

from __future__ import annotations

import json
import math
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import desk.__main__ as entry
from desk import tasks
from desk.book import Book, ModelName, Move, MoveKind, RatesModel, Shock, ShockSettings, YieldHistory
from desk.places import demo_books
from desk.report.wording import CAUTION
from desk.valuation.reverse import Goal

SOURCE = demo_books() / "life_insurer.xlsx"

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str]) -> Run:
    """Runs a command and gives its status, standard output and standard error."""

    def call(*arguments: str | Path) -> tuple[int, str, str]:
        status = entry.main([str(argument) for argument in arguments])
        captured = capsys.readouterr()
        return status, captured.out, captured.err

    return call


@pytest.fixture(scope="module")
def insurer() -> Book:
    """The insurer's demo book."""
    book = tasks.read(SOURCE).book
    assert book is not None
    return book


def test_json_keeps_the_contract(run: Run, insurer: Book) -> None:
    """One object with a list of shocks, each with the figures promised; the numbers are the task's."""
    status, out, err = run("shock", SOURCE, "--json")
    assert (status, err) == (0, "")
    found = json.loads(out)
    table = tasks.shock(insurer)
    assert len(found["shocks"]) == len(table.results) > 10
    for plain, result in zip(found["shocks"], table.results, strict=True):
        assert {
            "name", "source", "assets", "liabilities", "surplus", "funding_ratio", "change_in_surplus",
        } <= set(plain)  # fmt: skip
        assert plain["name"] == result.name
        assert plain["source"] == result.source != ""
        assert plain["surplus"] == result.surplus
        assert plain["change_in_surplus"] == pytest.approx(plain["surplus"] - found["base"]["surplus"])
        assert plain["funding_ratio"] == pytest.approx(plain["assets"] / plain["liabilities"])
    standing = json.loads(run("value", SOURCE, "--json")[1])
    assert found["base"]["surplus"] == pytest.approx(standing["surplus"], rel=1e-12)
    assert found["base"]["dv01_gap"] == pytest.approx(standing["dv01_gap"], rel=1e-9)
    assert [row["move"] for row in found["parallel"]][::60] == [-300.0, 300.0]


def test_text_names_sets_sources_and_bands(run: Run) -> None:
    """A table, the turn of the gap, each source once, and the caution."""
    status, out, _ = run("shock", SOURCE)
    assert status == 0
    for part in ("Basel 2016", "Steepener", "d368", "good", "poor", "duration gap", "full revaluation"):
        assert part in out
    assert out.count("d368") == 1
    assert CAUTION.split()[0] in out


def test_sets_by_name_and_from_a_folder(run: Run, insurer: Book, tmp_path: Path) -> None:
    """In place of those the book asks for, after its own; a set that is not there is told."""
    text = "# Set: House\n# Source: us\nShock,Move,Size\nSmall,parallel,5\nWild,parallel,-9000\n"
    (tmp_path / "house.csv").write_text(text, encoding="utf-8")
    status, out, err = run(
        "shock", SOURCE, "--json", "--set", "house", "--set", "Nothing", "--sets-from", tmp_path
    )
    assert status == 0
    names = [shock["name"] for shock in json.loads(out)["shocks"]]
    assert names == [*(shock.name for shock in insurer.shocks), "Small"]
    lines = err.strip().split("\n")
    assert len(lines) == 2
    assert "'Nothing'" in lines[0]
    assert "'House: Wild'" in lines[1]
    assert len(json.loads(out)["faults"]) == 2


def test_reaching_a_ratio(run: Run) -> None:
    """The moves found are in both outputs; one that is not there is told."""
    status, out, err = run("shock", SOURCE, "--json", "--reach", "0.97")
    assert (status, err) == (0, "")
    reached = json.loads(out)["reached"]
    assert reached["funding_ratio"] == 0.97
    assert len(reached["parallel"]) == 1
    assert reached["least_moves"][0]["distance"] > 0.0
    assert reached["least_moves"][0]["covariance"].startswith("the rates model")
    status, out, _ = run("shock", SOURCE, "--reach", "0.97")
    assert "standard deviations away by the rates model" in out
    status, out, err = run("shock", SOURCE, "--reach", "77")
    assert status == 0
    assert "None was found." in out
    assert len(err.strip().split("\n")) == 2


@pytest.mark.parametrize(
    ("arguments", "told"),
    [
        (("--reach", "none"), "is no funding ratio"),
        (("--reach", "-1"), "is no funding ratio"),
        (("--reach", "inf"), "is no funding ratio"),
        (("--sets-from", "/nowhere/at/all"), "a folder that exists"),
    ],
)
def test_arguments_at_fault(run: Run, arguments: tuple[str, ...], told: str) -> None:
    """Status 2 and one line."""
    status, out, err = run("shock", SOURCE, *arguments)
    assert (status, out) == (2, "")
    assert told in err
    assert err.count("\n") == 1


def test_a_books_own_shocks_come_first(insurer: Book) -> None:
    """Then those of the sets it asks for, and of no others."""
    own = Shock("Mine", (Move(MoveKind.PARALLEL, 12.0),))
    book = replace(insurer, shocks=(own,), shock_settings=ShockSettings(sets=("Solvency II rates",)))
    table = tasks.shock(book)
    assert [result.name for result in table.results] == ["Mine", "Rates up", "Rates down"]
    asked, stated = table.provenance.settings
    assert asked == ("sets", "Solvency II rates")
    assert stated[0] == "set Solvency II rates"
    assert "Articles 166 and 167" in stated[1]
    usual = tasks.shock(replace(book, shock_settings=ShockSettings()))
    assert usual.provenance.settings[0] == ("sets", "usual for GBP")
    assert "Steepener" in [result.name for result in usual.results]
    none = tasks.shock(
        replace(book, basis=replace(book.basis, currency="XTS"), shock_settings=ShockSettings())
    )
    assert "Steepener" not in [result.name for result in none.results]
    (fault,) = none.faults
    assert "no prescribed set with sizes for XTS" in str(fault)


def test_progress_and_stopping(insurer: Book) -> None:
    """From 0 to 1, never back; a set token stops the work from inside."""
    down = Shock("down", (Move(MoveKind.PARALLEL, -10.0),))
    scales = np.array([0.0, 1.0])
    works: dict[str, Callable[[tasks.Progress | None, tasks.CancelToken | None], object]] = {
        "shock": lambda progress, cancel: tasks.shock(insurer, progress=progress, cancel=cancel),
        "reverse": lambda progress, cancel: tasks.reverse(
            insurer, goal=Goal.SURPLUS, level=0.0, along=down, progress=progress, cancel=cancel
        ),
        "least move": lambda progress, cancel: tasks.least_move(
            insurer, goal=Goal.SURPLUS, level=0.0, progress=progress, cancel=cancel
        ),
        "grid": lambda progress, cancel: tasks.grid(
            insurer, down, down, first_scale=scales, second_scale=scales, progress=progress, cancel=cancel
        ),
    }
    for name, work in works.items():
        seen: list[float] = []
        assert work(seen.append, None) is not None
        assert seen == sorted(seen), name
        assert (seen[0], seen[-1]) == (0.0, 1.0), name
        token = tasks.CancelToken()

        def stop_soon(part: float, token: tasks.CancelToken = token) -> None:
            if part > 0.0:
                token.set()

        with pytest.raises(tasks.Cancelled):
            work(stop_soon, token)


def test_a_covariance_from_model_or_history(insurer: Book) -> None:
    """Either brings the surplus to nothing; where there is none, it says so."""
    random = np.random.default_rng(1)
    dates = np.datetime64("2020-01-01") + 30 * np.arange(60)
    rates = 0.02 + np.cumsum(random.normal(0.0, 0.002, (60, 1)), axis=0) + np.zeros((1, 3))
    history = YieldHistory(dates, np.array([1.0, 10.0, 30.0]), rates)
    by_model = tasks.least_move(insurer, goal=Goal.SURPLUS, level=0.0)
    by_history = tasks.least_move(
        replace(insurer, yield_history=history), goal=Goal.SURPLUS, level=0.0, from_history=True
    )
    for found in (by_model, by_history):
        assert found.result is not None
        assert found.result.surplus == pytest.approx(0.0, abs=1e-6 * found.result.assets)
    # All rates of the history move together, so the least move is the parallel one.
    parallel = tasks.reverse(insurer, goal=Goal.SURPLUS, level=0.0)
    assert by_history.move == pytest.approx(np.full(14, parallel.scales[0]), rel=1e-6)
    with pytest.raises(ValueError, match="no history of yields"):
        tasks.least_move(insurer, goal=Goal.SURPLUS, level=0.0, from_history=True)
    with pytest.raises(ValueError, match="no rates model"):
        tasks.least_move(replace(insurer, rates_model=None), goal=Goal.SURPLUS, level=0.0)
    square = RatesModel(
        ModelName.CIR, mean_reversion=0.2, volatility=0.05, long_run_rate=0.03, starting_rate=0.02
    )
    with pytest.raises(ValueError, match="not Gaussian"):
        tasks.least_move(replace(insurer, rates_model=square), goal=Goal.SURPLUS, level=0.0)


def test_a_grid_of_the_insurer(insurer: Book) -> None:
    """Rates against funds: the middle is the standing."""
    rates = Shock("rates", (Move(MoveKind.PARALLEL, -10.0),))
    funds = Shock("funds", (Move(MoveKind.VALUE, -0.05),))
    scales = np.linspace(-2.0, 2.0, 5)
    grid = tasks.grid(insurer, rates, funds, first_scale=scales, second_scale=scales)
    assert grid.surplus[2, 2] == pytest.approx(tasks.value(insurer).surplus, rel=1e-9)
    assert math.isfinite(grid.funding_ratio.sum())
