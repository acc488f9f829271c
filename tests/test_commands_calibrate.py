"""The command that fits a model to data of a book."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import desk.__main__ as entry
from desk import tasks
from desk.book import ModelName
from desk.book.market import CalibrationSource
from desk.report.wording import CAUTION
from desk.scenarios.calibration_records import CalibrationError
from tests.scenarios.fitted_books import bare_book, history, quoted, with_all

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
def source(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A workbook with data of every kind."""
    book = with_all()
    assert book.yield_history is not None
    # A quote that is missing is a mild fault, told on standard error.
    whole = replace(book.yield_history, rates=np.nan_to_num(book.yield_history.rates, nan=0.03))
    path = tmp_path_factory.mktemp("calibrate") / "fund.xlsx"
    return tasks.save_copy(replace(book, yield_history=whole), path)


@pytest.fixture(scope="module")
def bare(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A workbook with none."""
    return tasks.save_copy(bare_book(), tmp_path_factory.mktemp("calibrate") / "bare.xlsx")


@pytest.mark.parametrize("data", list(CalibrationSource))
def test_json_is_one_object_with_the_tasks_figures(run: Run, source: Path, data: CalibrationSource) -> None:
    status, out, err = run("calibrate", source, "--to", data, "--json")
    assert (status, err) == (0, "")
    plain = json.loads(out)
    book = tasks.read(source).book
    assert book is not None
    found = tasks.calibrate(book, source=data)
    assert plain["source"] == data
    assert plain["saved"] is None
    for row, figure in zip(plain["figures"], found.figures, strict=True):
        assert row["value"] == figure.value


def test_text_ends_with_the_caution(run: Run, source: Path) -> None:
    status, out, err = run("calibrate", source, "--to", "volatilities", "--model", "ho-lee")
    assert (status, err) == (0, "")
    assert "ho-lee fitted to quoted volatilities" in out
    assert " ".join(out.split()).endswith(CAUTION)


def test_save_writes_a_copy_with_the_model(run: Run, source: Path, tmp_path: Path) -> None:
    before = source.read_bytes()
    target = tmp_path / "fitted.xlsx"
    status, out, _ = run("calibrate", source, "--to", "volatilities", "--save", target, "--json")
    assert status == 0
    plain = json.loads(out)
    assert plain["saved"] == str(target)
    saved, former = tasks.read(target).book, tasks.read(source).book
    assert saved is not None
    assert former is not None
    assert saved.rates_model is not None
    assert saved.rates_model.name is ModelName.HULL_WHITE
    assert saved.rates_model.volatility == pytest.approx(plain["rates_model"]["volatility"], rel=1e-15)
    assert replace(saved, rates_model=None) == replace(former, rates_model=None)
    assert source.read_bytes() == before
    status, out, _ = run("calibrate", source, "--to", "history", "--save", target)
    assert status == 0
    assert f"The book with the fitted model is in {target}" in out


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ((), "--to"),
        (("--to", "rumours"), "history, volatilities, yields"),
        (("--to", "history", "--model", "no-such"), "is no model"),
        (("--to", "history", "--model", "hull-white"), "hull-white cannot be fitted"),
        (("--to", "history", "--save", "fitted.csv"), "--save is fitted.csv"),
        (("--to", "history", "--save", "/no/such/folder/a.xlsx"), "a folder that exists"),
    ],
)
def test_arguments_at_fault(run: Run, source: Path, arguments: tuple[str, ...], words: str) -> None:
    status, out, err = run("calibrate", source, *arguments)
    assert (status, out) == (2, "")
    assert words in err
    assert len(err.splitlines()) == 1


def test_the_book_itself_is_not_written_over(run: Run, source: Path) -> None:
    before = source.read_bytes()
    status, _, err = run("calibrate", source, "--to", "history", "--save", source)
    assert status == 2
    assert "--save is the book itself" in err
    assert source.read_bytes() == before


@pytest.mark.parametrize("data", list(CalibrationSource))
def test_no_data_names_the_sheet_in_one_line(run: Run, bare: Path, data: CalibrationSource) -> None:
    status, out, err = run("calibrate", bare, "--to", data, "--json")
    assert status == 2
    assert len(err.splitlines()) == 1
    assert "Add a sheet" in err
    (fault,) = json.loads(out)["faults"]
    assert fault["sheet"] in ("History", "Volatilities", "Yield history")


def test_negative_rates_and_a_short_history(run: Run, tmp_path: Path) -> None:
    data = history(weeks=40)
    low = tasks.save_copy(
        replace(bare_book(), history=replace(data, rate=data.rate - 0.03)), tmp_path / "low.xlsx"
    )
    status, _, err = run("calibrate", low, "--to", "history", "--model", "cir")
    assert status == 2
    assert "0 or negative" in err
    short = tasks.save_copy(replace(bare_book(), history=history(weeks=6)), tmp_path / "short.xlsx")
    status, _, err = run("calibrate", short, "--to", "history")
    assert status == 2
    assert "too short" in err


def test_arbitrage_is_told_by_quote(run: Run, tmp_path: Path) -> None:
    book = bare_book()
    data = quoted(book)
    volatility = data.volatility.copy()
    rows = [place for place, each in enumerate(data.instrument) if each == "cap"]
    longest = max(rows, key=lambda place: float(data.expiry[place]))
    strike = data.strike.copy()
    strike[rows] = 0.03
    frequency = data.frequency.copy()
    frequency[rows] = 1.0
    volatility[longest] /= 20.0
    odd = replace(data, volatility=volatility, strike=strike, frequency=frequency)
    path = tasks.save_copy(replace(book, volatilities=odd), tmp_path / "odd.xlsx")
    status, _, err = run("calibrate", path, "--to", "volatilities")
    assert status == 2
    assert f"quote {longest + 1}" in err
    assert "one of the two is wrong" in err


def test_the_task_stops_on_request(source: Path) -> None:
    book = tasks.read(source).book
    assert book is not None
    token = tasks.CancelToken()
    token.set()
    with pytest.raises(tasks.Cancelled):
        tasks.calibrate(book, source=CalibrationSource.HISTORY, cancel=token)
    with pytest.raises(CalibrationError):
        tasks.calibrate(bare_book(), source=CalibrationSource.HISTORY)
