"""The drawn scenarios in files: the paths of the run, whole or not at all, and back again."""

from __future__ import annotations

import csv
import gzip
import io
import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import openpyxl
import pytest

from desk import tasks
from desk.batch import main
from desk.book import Book, Inflation, ModelName, RatesModel, RiskyAssets, Sampling
from desk.report import scenario_export
from desk.report.book_workbook import write_book
from desk.report.scenario_export import scenario_size, write_scenarios
from desk.scenarios.plans import planned_run
from desk.scenarios.simulation import simulate
from tests.scenarios.books import ALL_MODELS, NO_FLOWS, assets, book, liabilities
from tests.window.benches import a_fund


def a_rich_book(*, paths: int = 40, name: ModelName = ModelName.HULL_WHITE) -> Book:
    """With two funds, one with an awkward name, and inflation."""
    base = book(ALL_MODELS[name], paths=paths, horizon_years=3)
    funds = RiskyAssets(
        ("=Shares/world: a fund with a very long name", "short rate"),
        np.array([100.0, 50.0]),
        np.array([0.04, 0.02]),
        np.array([0.18, 0.1]),
        np.zeros(2),
        np.array([[1.0, 0.4], [0.4, 1.0]]),
        np.array([-0.2, 0.1]) if name is not ModelName.CIR else np.zeros(2),
    )
    model = replace(ALL_MODELS[name], inflation_mean_reversion=0.3, inflation_volatility=0.008)
    inflation = Inflation(np.array([1.0, 10.0]), np.array([0.02, 0.025]))
    return replace(
        base, basis=replace(base.basis, inflation=inflation), rates_model=model, risky_assets=funds
    )


def lines_of(path: Path) -> tuple[list[str], list[list[str]]]:
    """The head of a compressed CSV file, and its table."""
    text = gzip.decompress(path.read_bytes()).decode("utf-8-sig")
    rows = list(csv.reader(io.StringIO(text)))
    head = [row[0] for row in rows if row[0].lstrip('"').startswith("#")]
    return head, rows[len(head) :]


def test_the_workbook_holds_the_paths_to_the_last_bit(tmp_path: Path) -> None:
    drawn = a_rich_book()
    run = simulate(drawn, NO_FLOWS, NO_FLOWS)
    path = write_scenarios(drawn, planned_run(drawn).plan, tmp_path / "paths.xlsx")
    found = openpyxl.load_workbook(path, read_only=True)
    assert found.sheetnames == [
        "About",
        "Scenario set",
        "Short rate",
        "Savings account",
        "=Shares world a fund with a ver",
        "short rate 2",
        "Price index",
    ]
    sheets = {name: list(found[name].iter_rows(values_only=True)) for name in found.sheetnames}
    for name in found.sheetnames[1:]:
        assert sheets[name][0] == ("Path", 1, 2, 3)
        assert [row[0] for row in sheets[name][1:]] == list(range(1, 41))
    account = np.array([row[1:] for row in sheets["Savings account"][1:]])
    assert account.tobytes() == np.ascontiguousarray(run.sample_paths[:40, 1:]).tobytes()
    rate = np.array([row[1:] for row in sheets["Short rate"][1:]])
    np.testing.assert_allclose(rate.mean(axis=0), run.short_rate.mean[1:], rtol=1e-13)
    assert run.risky is not None
    assert run.index is not None
    for asset, name in zip(run.risky.assets, found.sheetnames[4:6], strict=True):
        grown = np.array([row[1:] for row in sheets[name][1:]])
        np.testing.assert_allclose(grown.mean(axis=0), asset.total_return.mean[1:], rtol=1e-12)
    index = np.array([row[1:] for row in sheets["Price index"][1:]])
    np.testing.assert_allclose(index.mean(axis=0), run.index.index.mean[1:], rtol=1e-12)
    about = {row[0]: row[1] for row in sheets["About"][1:]}
    assert about["Book digest"] == drawn.digest
    assert (about["Seed"], about["Paths"], about["Model"]) == (3, 40, "hull-white")
    assert "estimates" in str(about["Caution"])
    assert "=Shares/world" in str(about["Sheet =Shares world a fund with a ver"])
    found.close()


def test_compressed_csv_holds_the_same(tmp_path: Path) -> None:
    drawn = a_rich_book()
    plan = planned_run(drawn).plan
    path = write_scenarios(drawn, plan, tmp_path / "paths.csv.gz", every_step=True)
    head, rows = lines_of(path)
    assert f"# Book digest: {drawn.digest}" in head
    assert rows[0][:3] == [
        "Path",
        "Node (years)",
        "Mean short rate since the node before (a year, continuous)",
    ]
    # A text that a spreadsheet would take for a formula is escaped.
    assert rows[0][5].startswith("'=Shares")
    assert len(rows) == 1 + 40 * 12
    assert rows[1][:2] == ["1", "0.25"]
    values = np.array(rows[1:], dtype=float).reshape(40, 12, 8)
    run = simulate(drawn, NO_FLOWS, NO_FLOWS)
    assert values[:, 3::4, 4].tobytes() == np.ascontiguousarray(run.sample_paths[:40, 1:]).tobytes()
    np.testing.assert_allclose(np.exp(values[:, :, 2].cumsum(axis=1) / 4.0), values[:, :, 4], rtol=1e-12)
    again = write_scenarios(drawn, plan, tmp_path / "again.csv.gz", every_step=True)
    assert again.read_bytes() == path.read_bytes()


@pytest.mark.parametrize("name", [ModelName.HULL_WHITE, ModelName.CIR, ModelName.BLACK_KARASINSKI])
def test_an_export_read_back_as_a_scenario_set_discounts_the_same(tmp_path: Path, name: ModelName) -> None:
    drawn = replace(book(ALL_MODELS[name], paths=300, horizon_years=8), liabilities=a_fund().liabilities)
    run = simulate(drawn, assets(), liabilities())
    exported = tasks.export_scenarios(drawn, tmp_path / "paths.xlsx")
    # As a user does: the sheet is copied into the workbook of the book.
    target = write_book(drawn, tmp_path / "book.xlsx")
    whole, source = openpyxl.load_workbook(target), openpyxl.load_workbook(exported, read_only=True)
    copied = whole.create_sheet("Scenario set")
    for row in source["Scenario set"].iter_rows(values_only=True):
        copied.append(row)
    source.close()
    whole.save(target)
    reading = tasks.read(target)
    assert reading.book is not None
    assert reading.book.scenario_set is not None
    assert reading.book.scenario_set.node.tolist() == list(range(1, 9))
    outside = replace(reading.book, rates_model=RatesModel(ModelName.OUTSIDE))
    again = simulate(outside, assets(), liabilities())
    assert again.paths == 300
    np.testing.assert_allclose(again.repricing.mean_discount, run.repricing.mean_discount, rtol=1e-13)
    np.testing.assert_allclose(again.savings_account.percentile, run.savings_account.percentile, rtol=1e-12)
    # And a set can itself be exported.
    once_more = tasks.export_scenarios(outside, tmp_path / "set.csv.gz")
    _, rows = lines_of(once_more)
    shown = np.array(rows[1:], dtype=float).reshape(300, 8, 5)
    np.testing.assert_allclose(shown[:, :, 2], reading.book.scenario_set.rate, rtol=1e-11)


def test_variance_reduced_paths_are_exported_too(tmp_path: Path) -> None:
    drawn = book(ALL_MODELS[ModelName.HULL_WHITE], paths=64, horizon_years=2)
    drawn = replace(drawn, run=replace(drawn.run, sampling=Sampling.SOBOL, replicates=4))
    _, rows = lines_of(tasks.export_scenarios(drawn, tmp_path / "p.csv.gz"))
    account = np.array(rows[1:], dtype=float).reshape(64, 2, 5)[:, :, 4]
    run = simulate(drawn, NO_FLOWS, NO_FLOWS)
    np.testing.assert_allclose(account.mean(axis=0), run.savings_account.mean[1:], rtol=1e-13)


def test_what_a_sheet_cannot_hold_is_refused_with_what_would_fit(tmp_path: Path) -> None:
    many = planned_run(book(ALL_MODELS[ModelName.HO_LEE], paths=1_048_576)).plan
    target = tmp_path / "paths.xlsx"
    with pytest.raises(ValueError, match=r"at most 1,048,575 paths.*1,048,576.*csv\.gz"):
        write_scenarios(book(ALL_MODELS[ModelName.HO_LEE]), many, target)
    long = planned_run(book(ALL_MODELS[ModelName.HO_LEE], horizon_years=100, steps_per_year=200)).plan
    with pytest.raises(ValueError, match="at most 16,383 nodes"):
        write_scenarios(book(ALL_MODELS[ModelName.HO_LEE]), long, target, every_step=True)
    assert scenario_size(long).obstacle == ""
    assert scenario_size(long).numbers == 2_000 * 100 * 3
    with pytest.raises(ValueError, match="must end in"):
        write_scenarios(book(ALL_MODELS[ModelName.HO_LEE]), long, tmp_path / "paths.txt")
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("ending", scenario_export.ENDINGS)
def test_stopped_it_leaves_nothing_behind_and_a_former_file_as_it_was(tmp_path: Path, ending: str) -> None:
    drawn = book(ALL_MODELS[ModelName.HULL_WHITE], paths=3_000)
    target = tmp_path / f"paths{ending}"
    target.write_bytes(b"former")
    cancel = tasks.CancelToken()
    told: list[float] = []

    def progress(part: float) -> None:
        told.append(part)
        if part > 0.4:
            cancel.set()

    with pytest.raises(tasks.Cancelled):
        tasks.export_scenarios(drawn, target, progress=progress, cancel=cancel)
    assert told == sorted(told)
    assert target.read_bytes() == b"former"
    assert list(tmp_path.iterdir()) == [target]


@pytest.mark.parametrize("ending", scenario_export.ENDINGS)
def test_values_too_large_for_a_number_are_left_empty(tmp_path: Path, ending: str) -> None:
    wild = RatesModel(ModelName.HO_LEE, volatility=5.0)
    drawn = book(wild, paths=20, horizon_years=40, steps_per_year=1)
    path = tasks.export_scenarios(drawn, tmp_path / f"paths{ending}")
    if ending == ".xlsx":
        found = openpyxl.load_workbook(path, read_only=True)
        cells = [
            cell for row in found["Savings account"].iter_rows(min_row=2, values_only=True) for cell in row
        ]
        found.close()
        known = [cell for cell in cells if isinstance(cell, int | float)]
        assert 20 < len(known) < 20 * 41
        assert np.isfinite(known).all()
    else:
        _, rows = lines_of(path)
        assert "" in {row[4] for row in rows[1:]}
        assert not any("inf" in cell or "nan" in cell for row in rows[1:] for cell in row)


# The command


def test_the_command_writes_the_paths(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    source = write_book(replace(a_fund(), run=replace(a_fund().run, paths=50)), tmp_path / "book.xlsx")
    target = tmp_path / "paths.csv.gz"
    status = main(["simulate", str(source), "--paths-out", str(target), "--every-step", "--json"])
    assert status == 0
    answer = json.loads(capsys.readouterr().out)
    assert answer["paths_out"] == str(target)
    _, rows = lines_of(target)
    assert len(rows) == 1 + 50 * 16
    last = [float(row[4]) for row in rows[1:] if row[1] == "8"]
    assert np.mean(last) == pytest.approx(answer["savings_account"][-1]["mean"], rel=1e-13)


@pytest.mark.parametrize(
    ("given", "said"),
    [
        (["--paths-out", "paths.txt"], "ends in .xlsx or .csv.gz"),
        (["--every-step"], "without --paths-out"),
        (["--paths-out", "{book}"], "the book itself"),
        (["--paths-out", "{folder}/none/p.xlsx"], "a folder that exists"),
        (["--paths-out", "{folder}/p.xlsx", "--paths", "2000000"], "at most 1,048,575 paths"),
    ],
)
def test_the_command_says_what_is_wrong_with_the_place(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], given: list[str], said: str
) -> None:
    source = write_book(a_fund(), tmp_path / "book.xlsx")
    before = source.read_bytes()
    words = [word.format(book=source, folder=tmp_path) for word in given]
    assert main(["simulate", str(source), *words]) == 2
    assert said in capsys.readouterr().err
    assert source.read_bytes() == before
    assert list(tmp_path.iterdir()) == [source]
