"""The commands under hardship: full disks, signals, odd places, and faults told just once."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from datetime import date
from pathlib import Path
from typing import Any

import pytest

import desk.__main__ as entry
from desk import tasks
from desk.book import Fault, Severity
from desk.places import demo_books
from desk.report import safe_cells
from desk.report.safe_cells import write_whole
from desk.report.said_once import further_faults
from tests.intake.books import Sheets, save, sound_sheets

SOURCE = demo_books() / "small_endowment.xlsx"
ROOT = Path(__file__).resolve().parents[1]
Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str]) -> Run:
    """Runs a command and gives its status, standard output and standard error."""

    def call(*arguments: str | Path) -> tuple[int, str, str]:
        status = entry.main([str(argument) for argument in arguments])
        captured = capsys.readouterr()
        return status, captured.out, captured.err

    return call


def shell(*arguments: str | Path, **settings: Any) -> subprocess.CompletedProcess[str]:
    """A command as a shell runs it."""
    command = [sys.executable, "-m", "desk", *map(str, arguments)]
    return subprocess.run(
        command, cwd=ROOT, stderr=subprocess.PIPE, encoding="utf-8", check=False, **settings
    )


class Full:
    """A stream on a disk that is full."""

    encoding = "utf-8"

    def write(self, text: str) -> int:
        """Takes nothing."""
        raise OSError(28, "No space left on device")

    def flush(self) -> None:
        """Has nothing."""

    def isatty(self) -> bool:
        """It is a file."""
        return False


def test_a_full_disk_under_the_result_is_one_line(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """Status 1, no traceback."""
    monkeypatch.setattr(sys, "stdout", Full())
    assert entry.main(["value", str(SOURCE), "--json"]) == 1
    sys.stdout.close()
    assert capsys.readouterr().err == "The result cannot be written: No space left on device.\n"


def test_complaints_that_cannot_be_said_change_no_status(monkeypatch: pytest.MonkeyPatch) -> None:
    """A missing book is the book's fault, even where nobody can be told."""
    monkeypatch.setattr(sys, "stderr", Full())
    assert entry.main(["value", "missing.xlsx"]) == 2


@pytest.mark.parametrize(
    ("number", "status", "said"),
    [
        (28, 1, "{}: the report cannot be written: it is so."),
        (30, 2, "--out is {}: it is so; expected a place"),
    ],
)
def test_a_report_that_cannot_be_written_is_one_line(
    run: Run, monkeypatch: pytest.MonkeyPatch, tmp_path: Path, number: int, status: int, said: str
) -> None:
    """A full disk is nobody's fault; a folder that cannot be written to was asked for."""

    def refuse(*_: object, **__: object) -> Path:
        raise OSError(number, "it is so")

    monkeypatch.setattr(tasks, "report", refuse)
    target = tmp_path / "report.xlsx"
    found, _, err = run("report", SOURCE, "--out", target)
    assert found == status
    assert err.startswith(said.format(target))
    assert err.count("\n") == 1


def test_a_full_disk_leaves_the_former_report(tmp_path: Path) -> None:
    """The file is whole or untouched, nothing stays beside it, and there is one line."""
    resource = pytest.importorskip("resource")
    target, scratch = tmp_path / "report.xlsx", tmp_path / "scratch"
    target.write_bytes(b"former")
    scratch.mkdir()
    done = shell(
        *("report", SOURCE, "--out", target),
        env={**os.environ, "TMPDIR": str(scratch), "PYTHONWARNINGS": "default"},
        preexec_fn=lambda: resource.setrlimit(resource.RLIMIT_FSIZE, (60_000, 60_000)),
    )
    assert done.returncode == 1
    assert done.stderr == f"{target}: the report cannot be written: File too large.\n"
    assert target.read_bytes() == b"former"
    assert sorted(tmp_path.iterdir()) == [target, scratch]
    assert list(scratch.iterdir()) == []


def test_too_little_memory_is_one_line(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    """It says what would need less."""

    def greedy(*_: object, **__: object) -> None:
        raise MemoryError

    monkeypatch.setattr(tasks, "simulate", greedy)
    status, out, err = run("simulate", SOURCE)
    assert (status, out) == (1, "")
    assert err.startswith("There is not enough memory")
    assert err.count("\n") == 1


@pytest.mark.parametrize("name", ["SIGTERM", "SIGHUP"])
def test_a_request_to_end_leaves_nothing_behind(
    name: str, run: Run, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    """It works as Ctrl-C does, in the midst of writing too; afterwards it is as it was."""
    number = getattr(signal, name, signal.SIGTERM)
    former = signal.getsignal(number)

    def write(reading: object, target: Path, **_: object) -> Path:
        def fill(neighbour: Path) -> None:
            neighbour.write_bytes(b"half")
            signal.raise_signal(number)

        return write_whole(target, fill)

    monkeypatch.setattr(tasks, "report", write)
    assert run("report", SOURCE, "--out", tmp_path / "report.xlsx") == (1, "", "Stopped.\n")
    assert list(tmp_path.iterdir()) == []
    assert signal.getsignal(number) is former


def test_what_a_killed_process_left_is_removed_at_the_next_writing(tmp_path: Path) -> None:
    """But not what another process may still be writing, and no other file."""
    target = tmp_path / "report.xlsx"
    stale, fresh = tmp_path / ".report.xlsx.0123456789ab.part", tmp_path / ".report.xlsx.ba9876543210.part"
    others = [tmp_path / ".report.xlsx.mine.part", tmp_path / ".other.xlsx.0123456789ab.part"]
    for path in (stale, fresh, *others):
        path.write_bytes(b"half")
        if path is not fresh:
            os.utime(path, (time.time() - 2 * safe_cells._FORSAKEN_SECONDS,) * 2)
    write_whole(target, lambda neighbour: neighbour.write_bytes(b"whole"))
    assert sorted(tmp_path.iterdir()) == sorted([target, fresh, *others])


def test_odd_names_of_files_and_folders(tmp_path: Path) -> None:
    """Blanks, quotes, other scripts, a plain locale and a relative path."""
    folder = tmp_path / "ä 年 'q\" $x"
    folder.mkdir()
    (folder / "bü ch.xlsx").write_bytes(SOURCE.read_bytes())
    done = subprocess.run(
        [sys.executable, "-m", "desk", "report", "bü ch.xlsx", "--out", "rép ort.XLSX"],
        cwd=folder,
        env={
            **os.environ,
            "LC_ALL": "C",
            "PYTHONPATH": str(ROOT),
            "PYTHONCOERCECLOCALE": "0",
            "COLUMNS": "9",
        },
        stdin=subprocess.DEVNULL,
        capture_output=True,
        check=False,
    )
    assert (done.returncode, done.stderr) == (0, b"")
    assert {path.name for path in folder.iterdir()} == {"bü ch.xlsx", "rép ort.XLSX"}


def test_a_fault_of_the_file_names_the_file(run: Run, tmp_path: Path) -> None:
    """Who reads many books must know which."""
    path = tmp_path / "missing.xlsx"
    for command in ("check", "value"):
        assert run(command, path)[2].startswith(f"{path}: there is no such file; ")


def test_a_word_that_is_no_command_is_said_to_be_none(run: Run) -> None:
    """With the commands there are."""
    status, out, err = run(SOURCE, "--json")
    assert (status, out) == (2, "")
    assert "is no command; the commands are check, value, " in err
    assert "invalid" not in err


def test_every_item_that_a_model_lacks_is_said(run: Run, tmp_path: Path) -> None:
    """All at once, on standard error and in the object."""
    path = save(sound_sheets(), tmp_path / "book.xlsx")
    status, out, err = run("simulate", path, "--model", "gaussian-2", "--json")
    assert status == 2
    for item in ("Second mean reversion", "Second volatility", "Factor correlation"):
        assert f'the item "{item}" is missing' in err
    assert len(json.loads(out)["faults"]) == err.count("\n") == 3


def _past_and_matured(sheets: Sheets) -> None:
    sheets["Liabilities"][1][1] = date(2026, 9, 30)
    sheets["Liabilities"].append(["Old", date(2001, 1, 1), 5.0, None])
    sheets["Asset flows"][1][1] = -1.0
    sheets["Holdings"][1][5] = date(2026, 9, 1)
    sheets["Run"][2][1] = 120


@pytest.mark.parametrize("command", ["value", "simulate"])
def test_a_fault_is_told_once(run: Run, tmp_path: Path, command: str) -> None:
    """The reading tells each cell; the result does not sum them up again."""
    sheets = sound_sheets()
    _past_and_matured(sheets)
    path = save(sheets, tmp_path / "book.xlsx")
    checked = json.loads(run("check", path, "--json")[1])["faults"]
    assert {fault["cell"] for fault in checked} == {"B2", "B5", "F2", "B3"}
    status, out, err = run(command, path, "--json")
    assert status == 0
    assert json.loads(out)["faults"] == checked
    assert err.count("\n") == len(checked) == 5


def test_a_new_fault_is_told_beside_those_of_the_reading(run: Run, tmp_path: Path) -> None:
    """A spread that cannot be solved is found in the valuation alone, and counts along the paths too."""
    sheets = sound_sheets()
    sheets["Holdings"][1][2] = 0
    path = save(sheets, tmp_path / "book.xlsx")
    told = {
        command: json.loads(run(command, path, "--json")[1])["faults"] for command in ("value", "simulate")
    }
    assert told["value"] == told["simulate"]
    assert [fault["sheet"] for fault in told["value"]] == ["Holdings"]


def test_a_longer_horizon_than_the_books_own_is_told(run: Run, tmp_path: Path) -> None:
    """What the reading says of the book's horizon is not said of another."""
    path = save(sound_sheets(), tmp_path / "book.xlsx")
    status, _, err = run("simulate", path, "--paths", "10", "--years", "100", "--json")
    assert status == 0
    assert "the horizon of 100 years goes beyond the flows" in err


def test_faults_of_a_changed_book_are_kept() -> None:
    """Another count or another date than the reading told is news."""
    told = [
        Fault("the flow of 2020-01-01 ...", "a date after the valuation date", "", "Liabilities", "B2"),
        Fault("the holding matured on 2020-01-01", "a date after the valuation date", "", "Holdings", "F2"),
    ]

    def past(count: str) -> Fault:
        return Fault(
            f"{count} on or before the valuation date", "", "", "Liabilities", severity=Severity.MILD
        )

    def matured(day: str) -> Fault:
        return Fault(f"holding 'A' has maturity {day}", "", "", "Holdings", severity=Severity.MILD)

    assert further_faults(told, [past("1 flow falls"), matured("2020-01-01")]) == ()
    news = (past("2 flows fall"), matured("2021-01-01"))
    assert further_faults(told, [*news, *news]) == news
