"""Text tables: units, grouping, true minus signs, and nothing that moves the cursor."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest

from desk.book import Fault, Severity
from desk.report import as_text
from desk.report.wording import CAUTION
from tests.report import examples


@pytest.mark.parametrize(
    ("value", "places", "text"),
    [
        (1234567.4, 0, "1,234,567"),
        (-1234.56, 1, "−1,234.6"),
        (-0.0001, 2, "0.00"),
        (np.nan, 0, "n/a"),
        (None, 0, "n/a"),
        (-np.inf, 0, "n/a"),
        (0.0, 0, "0"),
    ],
)
def test_numbers(value: float | None, places: int, text: str) -> None:
    """A number shown as zero has no sign; what is no number is said to be none."""
    assert as_text.grouped(value, places) == text


def test_columns_line_up() -> None:
    """Right edges of figures agree, wide characters count twice, combining ones not at all."""
    text = as_text.table(("Name", "Figure\n[EUR]"), [("年金", "1"), ("e\u0301tat", "−1,000")])
    assert text.split("\n") == [
        "      Figure",
        "Name   [EUR]",
        "────────────",
        "年金       1",
        "e\u0301tat  −1,000",
    ]


def test_standing_says_everything_with_units() -> None:
    """The facts of the standing stand in the text."""
    standing = examples.standing()
    text = as_text.standing_text(standing, title="A fund")
    lines = text.split("\n")
    assert lines[0] == "A fund"
    assert "2026-03-31" in lines[1]
    assert "EUR" in lines[1]
    assert as_text.grouped(standing.surplus) in text
    assert as_text.grouped(standing.liabilities.effective_duration, 3) in text
    assert "DV01 gap" in text
    assert " ".join(text.split()).endswith(CAUTION)
    assert re.findall(r"-\d+", text) == ["-03", "-31"]
    assert re.findall(r"−\d+", text)
    assert max(len(line) for line in lines) <= 110


def test_many_lines_are_cut_to_the_largest() -> None:
    """The others are summed, so the column still adds up."""
    standing = examples.standing()
    many = tuple(
        replace(line, line=f"{line.line} {number}") for number in range(30) for line in standing.lines[:1]
    )
    text = as_text.standing_text(replace(standing, lines=many))
    assert "11 others" in text
    assert as_text.grouped(11 * many[0].measures.present_value) in text


def test_simulation_shows_errors_and_the_check() -> None:
    """Standard errors, the check of the mean of 1/R, the method of the percentiles, the note."""
    run = examples.simulation()
    text = as_text.simulation_text(run, currency="EUR")
    assert "400 paths of hull-white over 12 years, 2 steps a year, pricing measure, seed 7" in text
    assert as_text.grouped(run.repricing.mean_discount[12], 6) in text
    assert "Standard" in text
    assert "order" in text
    assert as_text.grouped(run.present_value[2].below_zero * 100, 2) in text


def test_names_cannot_drive_the_terminal() -> None:
    """Escape sequences and line feeds from a source are made visible and kept on one line."""
    fault = Fault("a\x1b[2J\nname", "text", "Mend it.", "Sheet\r", "A1", Severity.MILD)
    assert as_text.fault_line(fault) == "mild: Sheet !A1: a\ufffd[2J name; expected text. Mend it."
    bad = replace(examples.standing(), currency="\x1b[31m")
    assert "\x1b" not in as_text.standing_text(bad, title="\x1b[0m")


def test_check_counts() -> None:
    """What the book holds and how many faults it has."""
    text = as_text.check_text(examples.reading())
    assert "0 grave faults, 1 mild fault" in text
    assert "90 liability flows, 5 holdings, 2 ready-made asset flows" in text
    unusable = as_text.check_text(replace(examples.reading(), book=None))
    assert "cannot be used" in unusable
