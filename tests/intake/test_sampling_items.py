"""How a run is sampled: what the sheet of the run states of it, and what is wrong with that."""

from __future__ import annotations

from pathlib import Path

import pytest

from desk.book import Bridge, Run, Sampling, Severity
from desk.intake.records import Reading
from desk.intake.workbook import read_workbook
from tests.intake.books import save, sound_sheets


def reading_with(folder: Path, *items: tuple[str, object]) -> Reading:
    """A sound workbook with further items of the run, from row 8 on."""
    sheets = sound_sheets()
    sheets["Run"] = [*sheets["Run"], *([name, value] for name, value in items)]
    return read_workbook(save(sheets, folder / "book.xlsx"))


def run_of(folder: Path, *items: tuple[str, object]) -> Run:
    reading = reading_with(folder, *items)
    assert not reading.faults, [str(fault) for fault in reading.faults]
    assert reading.book is not None
    return reading.book.run


def test_nothing_stated_is_plain(tmp_path: Path) -> None:
    run = run_of(tmp_path)
    assert (run.sampling, run.matching, run.is_reduced) == (Sampling.PLAIN, False, False)


def test_all_stated(tmp_path: Path) -> None:
    run = run_of(
        tmp_path,
        ("Sampling", "Sobol"),
        ("Bridge", "Brownian bridge"),
        ("Moment matching", "yes"),
        ("Replicates", 20),
    )
    assert (run.sampling, run.bridge, run.matching, run.replicates) == (
        Sampling.SOBOL,
        Bridge.BROWNIAN,
        True,
        20,
    )
    run = run_of(tmp_path, ("Sampling", "antithetic"), ("Moment matching", "no"))
    assert (run.sampling, run.matching, run.replicates) == (Sampling.ANTITHETIC, False, 16)
    assert run_of(tmp_path, ("Moment matching", "yes"), ("Replicates", 2)).replicates == 2


@pytest.mark.parametrize(
    ("items", "cell", "found", "severity"),
    [
        ([("Sampling", "halton")], "Run!B8", "no known way of drawing", Severity.GRAVE),
        (
            [("Sampling", "sobol"), ("Bridge", "London")],
            "Run!B9",
            "no known order",
            Severity.GRAVE,
        ),
        ([("Moment matching", "perhaps")], "Run!B8", "no known answer", Severity.GRAVE),
        ([("Sampling", "sobol"), ("Replicates", 1)], "Run!B9", "replicates is 1", Severity.GRAVE),
        ([("Sampling", "sobol"), ("Replicates", 2.5)], "Run!B9", "replicates is 2.5", Severity.GRAVE),
        ([("Sampling", "sobol"), ("Replicates", 1001)], "Run!B9", "replicates is 1001", Severity.GRAVE),
        ([("Sampling", "sobol"), ("Replicates", "many")], "Run!B9", "many", Severity.GRAVE),
        ([("Replicates", 20)], "Run!B8", "have no replicates", Severity.MILD),
        ([("Sampling", "antithetic"), ("Bridge", "brownian bridge")], "Run!B9", "no bridge", Severity.MILD),
    ],
)
def test_each_fault_is_found_where_it_is(
    items: list[tuple[str, object]], cell: str, found: str, severity: Severity, tmp_path: Path
) -> None:
    reading = reading_with(tmp_path, *items)
    (fault,) = reading.faults
    assert f"{fault.sheet}!{fault.cell}" == cell
    assert found in fault.found
    assert fault.severity is severity
    assert fault.mend
