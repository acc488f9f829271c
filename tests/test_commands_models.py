"""The command that simulates, with models and settings it must take or refuse."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import desk.__main__ as entry
from desk import tasks
from desk.book import ModelName, RatesModel, ScenarioSet
from desk.places import demo_books

SOURCE = demo_books() / "pension_fund.xlsx"
SMALL = ("--paths", "200", "--years", "3", "--steps", "1")

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str]) -> Run:
    """Runs a command and gives its status, standard output and standard error."""

    def call(*arguments: str | Path) -> tuple[int, str, str]:
        status = entry.main([str(argument) for argument in arguments])
        captured = capsys.readouterr()
        return status, captured.out, captured.err

    return call


def test_a_run_that_does_not_fit_is_refused_with_what_would(run: Run) -> None:
    status, out, err = run("simulate", SOURCE, "--paths", "20000000")
    assert (status, out) == (2, "")
    assert "set Paths to at most" in err
    assert "Traceback" not in err


def test_an_outside_model_without_a_set_is_refused(run: Run) -> None:
    status, out, err = run("simulate", SOURCE, "--model", "outside", *SMALL)
    assert (status, out) == (2, "")
    assert "Scenario set is missing" in err


def test_a_volatility_of_another_kind_is_said(run: Run) -> None:
    status, out, err = run("simulate", SOURCE, "--model", "black-karasinski", *SMALL, "--json")
    assert status == 0
    assert json.loads(out)["model"] == "black-karasinski"
    assert "expected a volatility of the logarithm of the rate" in err


def test_a_set_in_the_book_is_drawn(run: Run, tmp_path: Path) -> None:
    book = tasks.read(SOURCE).book
    assert book is not None
    rate = 0.02 + 0.01 * np.random.default_rng(3).standard_normal((150, 4))
    outside = replace(
        book,
        rates_model=RatesModel(ModelName.OUTSIDE),
        scenario_set=ScenarioSet(np.array([1.0, 2.0, 3.0, 4.0]), rate),
    )
    path = tasks.save_copy(outside, tmp_path / "outside.xlsx")
    status, out, _ = run("simulate", path, *SMALL, "--json")
    assert status == 0
    found = json.loads(out)
    assert found["paths"] == 150
    account = np.exp(np.cumsum(rate, axis=1))
    assert found["savings_account"][3]["mean"] == pytest.approx(account[:, 2].mean(), rel=1e-9)
