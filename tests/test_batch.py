"""The commands: what they print, where they say faults, and with which status they end."""

from __future__ import annotations

import io
import json
import os
import subprocess
import sys
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest
from openpyxl import load_workbook

import desk.__main__ as entry
from desk import __version__, batch, tasks
from desk.asked import complain_of_reading
from desk.book import Fault, Severity
from desk.intake.records import Reading
from desk.places import demo_books
from desk.report.wording import CAUTION
from desk.terminal import ProgressLine, say
from tests.report import examples

SOURCE = demo_books() / "small_endowment.xlsx"
QUICK = ["--paths", "200", "--years", "5", "--steps", "2", "--seed", "3"]

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str]) -> Run:
    """Runs a command and gives its status, standard output and standard error."""

    def call(*arguments: str | Path) -> tuple[int, str, str]:
        status = entry.main([str(argument) for argument in arguments])
        captured = capsys.readouterr()
        return status, captured.out, captured.err

    return call


@pytest.fixture
def spoilt(tmp_path: Path) -> Path:
    """A book with grave faults in two places."""
    workbook = load_workbook(SOURCE)
    sheet = workbook["Liabilities"]
    headings = [str(cell.value).lower() for cell in sheet[1]]
    amount = headings.index("amount") + 1
    sheet.cell(4, amount).value = "much"
    sheet.cell(9, amount).value = "more"
    path = tmp_path / "spoilt.xlsx"
    workbook.save(path)
    return path


def test_check_a_sound_book(run: Run) -> None:
    """Status 0, nothing on standard error."""
    status, out, err = run("check", SOURCE)
    assert (status, err) == (0, "")
    assert "0 grave faults" in out


def test_check_lists_every_fault_in_a_line(run: Run, spoilt: Path) -> None:
    """All of them at once, each with its cell; status 2."""
    status, out, err = run("check", spoilt)
    assert status == 2
    lines = err.strip().split("\n")
    assert len([line for line in lines if "much" in line or "more" in line]) == 2
    assert all("Liabilities!" in line for line in lines)
    assert "2 grave faults" in out


def test_of_very_many_faults_the_first_are_said_and_the_rest_counted(
    capsys: pytest.CaptureFixture[str],
) -> None:
    """By sheet and severity; a usual number is said whole."""
    faults = [Fault("x", "a number", "Mend it.", sheet="Liabilities", cell=f"C{n}") for n in range(1000)]
    faults += [Fault("y", "a date", "Mend it.", sheet="Curve", cell=f"A{n}") for n in range(200)]
    faults.append(Fault("old", "a later date", "None.", sheet="Liabilities", severity=Severity.MILD))
    complain_of_reading(Reading(Path("book.xlsx"), "", None, tuple(faults), ()))
    lines = capsys.readouterr().err.splitlines()
    assert len(lines) == 402
    assert sum(line.startswith("Curve!") for line in lines) == 200
    assert "mild: Liabilities" in lines[-2]
    assert lines[-1].startswith("800 further grave faults of the sheet Liabilities are left out here, 1,000")
    assert "--json" in lines[-1]


def test_check_json_is_printed_with_faults(run: Run, spoilt: Path) -> None:
    """One object on standard output, status 2."""
    status, out, err = run("check", spoilt, "--json")
    found = json.loads(out)
    assert status == 2
    assert err
    assert [fault["severity"] for fault in found["faults"]].count("grave") == 2
    assert len(found["book"]["sha256"]) == 64
    assert found["usable"] is False


@pytest.mark.parametrize("command", ["value", "simulate"])
def test_json_of_a_book_at_fault_is_one_object_of_faults(run: Run, spoilt: Path, command: str) -> None:
    """Standard output can be parsed whatever happens."""
    status, out, err = run(command, spoilt, "--json")
    assert status == 2
    assert set(json.loads(out)) == {"faults"}
    assert len(err.strip().split("\n")) == len(json.loads(out)["faults"])


def test_value_prints_tables_with_the_note(run: Run) -> None:
    """The headline, units and the caution."""
    status, out, err = run("value", SOURCE)
    assert (status, err) == (0, "")
    for text in ("Funding ratio", "Duration gap", "DV01 gap", "Redington", "[years]"):
        assert text in out
    assert " ".join(out.split()).endswith(CAUTION)


def test_value_json_is_the_standing(run: Run) -> None:
    """The same figures as the task gives, nothing rounded."""
    status, out, _ = run("value", SOURCE, "--json")
    book = tasks.read(SOURCE).book
    assert book is not None
    assert status == 0
    assert json.loads(out)["surplus"] == tasks.value(book).surplus


def test_mild_faults_are_marked_and_do_not_change_the_status(
    run: Run, monkeypatch: pytest.MonkeyPatch
) -> None:
    """They stand on standard error and in the object."""
    monkeypatch.setattr(tasks, "read", lambda path, progress=None: examples.reading())
    status, out, err = run("value", "any.xlsx", "--json")
    assert status == 0
    assert err.startswith("mild: Liabilities!C14: ")
    assert json.loads(out)["faults"][0]["severity"] == "mild"


def test_simulate_takes_its_settings_from_the_command(run: Run) -> None:
    """Paths, years, steps and seed in place of the book's; the same seed gives the same figures."""
    status, out, _ = run("simulate", SOURCE, *QUICK, "--json")
    found = json.loads(out)
    assert status == 0
    assert (found["paths"], found["steps_per_year"], found["seed"]) == (200, 2, 3)
    assert [row["year"] for row in found["savings_account"]] == [0, 1, 2, 3, 4, 5]
    assert run("simulate", SOURCE, *QUICK, "--json")[1] == out
    other = json.loads(run("simulate", SOURCE, *QUICK[:-1], "4", "--json")[1])
    assert other["savings_account"][5]["mean"] != found["savings_account"][5]["mean"]


def test_simulate_with_another_model(run: Run) -> None:
    """The name replaces the book's model, with its figures."""
    status, out, _ = run("simulate", SOURCE, *QUICK, "--model", "ho-lee")
    assert status == 0
    assert "of ho-lee over 5 years" in out


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["--years", "0"], "--years is 0"),
        (["--years", "100000"], "--years is 100000"),
        (["--paths", "-5"], "--paths is -5"),
        (["--steps", "1000"], "--steps is 1000"),
        (["--seed", "-1"], "--seed is -1"),
        (["--years", "soon"], '"soon" is no whole number'),
        (["--model", "guess"], '"guess" is no model'),
        (["--speed", "3"], "unrecognized arguments"),
    ],
)
def test_wrong_settings_are_said_in_one_line(run: Run, arguments: list[str], said: str) -> None:
    """Status 2, nothing computed."""
    status, out, err = run("simulate", SOURCE, *arguments)
    assert (status, out) == (2, "")
    assert said in err
    assert err.count("\n") == 1


def test_several_wrong_settings_are_said_together(run: Run) -> None:
    """One line each."""
    status, _, err = run("simulate", SOURCE, "--paths", "0", "--years", "0")
    assert status == 2
    assert err.count("\n") == 2


@pytest.mark.parametrize(
    ("name", "told"), [("cir", 0), ("cir-shifted", 0), ("vasicek", 1), ("hull-white", 1)]
)
def test_a_volatility_of_another_kind_of_model_is_told(
    name: str, told: int, capsys: pytest.CaptureFixture[str]
) -> None:
    book = str(demo_books() / "small_endowment.xlsx")  # its model is a square-root one
    assert batch.main(["simulate", book, *QUICK, "--model", name, "--json"]) == 0
    out, err = capsys.readouterr()
    assert err.count("was stated for cir and is used for") == told
    found = [fault["found"] for fault in json.loads(out)["faults"]]
    assert sum("was stated for cir and is used for" in text for text in found) == told


def test_a_model_that_lacks_an_item_is_a_fault_of_the_book(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    """Vasicek makes its own curve and needs a long-run rate."""
    monkeypatch.setattr(tasks, "read", lambda path, progress=None: examples.reading())
    status, out, err = run("simulate", "any.xlsx", *QUICK, "--model", "vasicek")
    assert (status, out) == (2, "")
    assert "Long-run rate" in err


def test_a_book_without_a_model_cannot_be_simulated(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    """The line says which sheet is missing."""
    bare = examples.reading(replace(examples.book(), rates_model=None))
    monkeypatch.setattr(tasks, "read", lambda path, progress=None: bare)
    status, _, err = run("simulate", "any.xlsx")
    assert status == 2
    assert "Rates model: the book has no rates model" in err


def test_report_writes_the_workbook(run: Run, tmp_path: Path) -> None:
    """And says where it is."""
    target = tmp_path / "report.xlsx"
    status, out, err = run("report", SOURCE, "--out", target)
    assert (status, err) == (0, "")
    assert str(target) in out
    assert "Summary" in load_workbook(target, read_only=True).sheetnames


@pytest.mark.parametrize("name", ["report.csv", "report", "missing/report.xlsx", "folder.xlsx"])
def test_a_target_that_will_not_do_is_refused_before_any_work(run: Run, tmp_path: Path, name: str) -> None:
    """One line, status 2, nothing written."""
    (tmp_path / "folder.xlsx").mkdir()
    before = sorted(tmp_path.rglob("*"))
    status, _, err = run("report", SOURCE, "--out", tmp_path / name)
    assert status == 2
    assert err.count("\n") == 1
    assert sorted(tmp_path.rglob("*")) == before


def test_the_report_never_replaces_the_book(run: Run, tmp_path: Path) -> None:
    """Whatever name it is given by."""
    book = tmp_path / "book.xlsx"
    book.write_bytes(SOURCE.read_bytes())
    (tmp_path / "link.xlsx").hardlink_to(book)
    for target in (book, tmp_path / "link.xlsx"):
        status, _, err = run("report", book, "--out", target)
        assert status == 2
        assert "the book itself" in err
    assert book.read_bytes() == SOURCE.read_bytes()


@pytest.mark.parametrize("name", ["missing.xlsx", "."])
def test_a_book_that_is_not_there(run: Run, tmp_path: Path, name: str) -> None:
    """One clear line, status 2."""
    status, _, err = run("value", tmp_path / name)
    assert status == 2
    assert err.count("\n") == 1


def test_what_is_not_offered_is_refused(run: Run) -> None:
    """An unknown command, a missing book, a missing target."""
    for arguments in (["shocks", SOURCE], ["value"], ["report", SOURCE], ["--frob"]):
        status, out, err = run(*arguments)
        assert (status, out) == (2, "")
        assert err.count("\n") == 1


def test_version_and_help(run: Run) -> None:
    """Status 0, on standard output."""
    assert run("--version")[:2] == (0, f"Gapwright {__version__}\n")
    status, out, _ = run("--help")
    assert status == 0
    assert all(name in out for name in batch.COMMANDS)


def test_a_failure_of_the_program_is_status_1(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    """A mistake of ours is not blamed on the book."""

    def broken(*arguments: Any, **settings: Any) -> None:
        raise ValueError("shapes do not match")

    monkeypatch.setattr(tasks, "value", broken)
    status, out, err = run("value", SOURCE)
    assert (status, out) == (1, "")
    assert err.strip().endswith("The program failed: ValueError: shapes do not match")


def test_an_interrupt_ends_in_one_line(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    """Ctrl-C: no traceback."""

    def interrupted(*arguments: Any, **settings: Any) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(tasks, "value", interrupted)
    assert run("value", SOURCE) == (1, "", "Stopped.\n")


def test_a_reader_that_goes_away_is_no_crash(monkeypatch: pytest.MonkeyPatch) -> None:
    """A broken pipe ends the program quietly."""

    class Gone(io.StringIO):
        def write(self, text: str) -> int:
            raise BrokenPipeError

    monkeypatch.setattr(sys, "stdout", Gone())
    error = io.StringIO()
    monkeypatch.setattr(sys, "stderr", error)
    assert entry.main(["check", str(SOURCE)]) == 1
    assert error.getvalue() == ""
    sys.stdout.close()


def test_demonstrate_does_the_whole_job(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The standing is printed, the report written, and the results handed back for pictures."""
    reading, standing, simulation = batch.demonstrate(SOURCE, tmp_path / "out")
    assert reading.book is not None
    assert simulation is not None
    out = capsys.readouterr().out
    assert "Funding ratio" in out
    assert "Savings account" in out
    assert standing.provenance.book_digest == reading.book.digest
    assert [path.name for path in (tmp_path / "out").iterdir()] == ["small_endowment_report.xlsx"]


@pytest.mark.parametrize(
    ("environment", "platform", "found"),
    [
        ({}, "linux", False),
        ({"DISPLAY": ""}, "linux", False),
        ({"DISPLAY": ":0"}, "linux", True),
        ({"WAYLAND_DISPLAY": "wayland-0"}, "linux", True),
        ({"QT_QPA_PLATFORM": "offscreen"}, "linux", True),
        ({}, "darwin", True),
        ({}, "win32", True),
    ],
)
def test_whether_there_is_a_display(environment: dict[str, str], platform: str, found: bool) -> None:
    """Only Linux can be without one."""
    assert entry.has_display(environment, platform=platform) is found


@pytest.fixture
def window(monkeypatch: pytest.MonkeyPatch) -> list[Path | None]:
    """Stands in for the window, and keeps what it was opened on."""
    opened: list[Path | None] = []
    module = ModuleType("desk.window.app")

    def open_on(path: Path | None) -> int:
        opened.append(path)
        return 0

    module.__dict__["run"] = open_on
    monkeypatch.setitem(sys.modules, "desk.window.app", module)
    return opened


def test_a_book_or_nothing_opens_the_window(
    run: Run, monkeypatch: pytest.MonkeyPatch, window: list[Path | None]
) -> None:
    """What is no command is a book."""
    monkeypatch.setattr(entry, "has_display", lambda environment: True)
    assert run(SOURCE)[0] == 0
    assert run()[0] == 0
    assert window == [SOURCE, None]


def test_a_mistyped_command_is_said(run: Run, window: list[Path | None]) -> None:
    """It is no book either."""
    status, out, err = run("vlaue")
    assert (status, out, window) == (2, "", [])
    assert "no file vlaue" in err
    assert "check, value, shock, simulate, calibrate, report" in err


def test_without_a_display_the_window_says_why(
    run: Run, monkeypatch: pytest.MonkeyPatch, window: list[Path | None]
) -> None:
    """Status 1 and one line."""
    monkeypatch.setattr(entry, "has_display", lambda environment: False)
    status, out, err = run(SOURCE)
    assert (status, out, window) == (1, "", [])
    assert "no display" in err


def test_without_a_display_the_main_job_runs_on_a_demo_book(
    run: Run, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    """Standing, report and pictures into the folder out; without the library, a reason for no pictures."""
    drawn: list[Path] = []
    module = ModuleType("desk.window.pictures")

    def draw_all(reading: object, standing: object, simulation: object, folder: Path) -> list[Path]:
        assert os.environ["QT_QPA_PLATFORM"] == "offscreen"
        drawn.append(folder)
        return [folder / "flows.png"]

    module.__dict__["draw_all"] = draw_all
    monkeypatch.setattr(entry, "has_display", lambda environment: False)
    monkeypatch.setenv("QT_QPA_PLATFORM", "")
    monkeypatch.chdir(tmp_path)
    monkeypatch.setitem(sys.modules, "desk.window.pictures", module)
    status, out, err = run()
    assert (status, err) == (0, "")
    assert drawn == [tmp_path / "out"]
    assert "Funding ratio" in out
    assert "pension_fund_report.xlsx" in out
    assert "flows.png" in out
    monkeypatch.setitem(sys.modules, "desk.window.pictures", None)
    status, out, _ = run()
    assert status == 0
    assert "Pictures are left out: " in out


class Terminal(io.StringIO):
    """A stream that says it is a terminal."""

    def isatty(self) -> bool:
        """Always."""
        return True


def test_progress_shows_on_a_terminal_only() -> None:
    """One line, rewritten, with part done and time left; cleared at the end."""
    terminal, pipe = Terminal(), io.StringIO()
    now = iter([0.0, 2.0, 2.01, 4.0])
    with ProgressLine("Drawing", terminal, clock=lambda: next(now)) as line:
        line(0.5)
        line(0.51)
        line(0.75)
    shown = terminal.getvalue()
    assert "Drawing  50 %, 2 s left" in shown
    assert "51 %" not in shown
    assert "Drawing  75 %, 1 s left" in shown
    assert "\n" not in shown
    assert shown.endswith("\r\x1b[K")
    with ProgressLine("Drawing", pipe) as line:
        line(0.5)
    assert pipe.getvalue() == ""


def test_text_fits_the_encoding_of_the_stream(monkeypatch: pytest.MonkeyPatch) -> None:
    """Where a minus sign cannot be written a hyphen stands for it: a sign is never lost."""
    raw = io.BytesIO()
    monkeypatch.setattr(sys, "stdout", io.TextIOWrapper(raw, encoding="cp1252", newline="\n"))
    say("−5 years² Ω")
    sys.stdout.flush()
    assert raw.getvalue().decode("cp1252") == "-5 years^2 ?\n"


def test_statuses_of_a_real_process(tmp_path: Path, spoilt: Path) -> None:
    """As a shell sees them, with nothing but JSON on standard output and no progress in a pipe."""

    def shell(*arguments: str | Path) -> subprocess.CompletedProcess[str]:
        command = [sys.executable, "-m", "desk", *map(str, arguments)]
        return subprocess.run(command, capture_output=True, encoding="utf-8", check=False)

    sound = shell("value", SOURCE, "--json")
    assert (sound.returncode, sound.stderr) == (0, "")
    assert json.loads(sound.stdout)["currency"] == "USD"
    assert shell("value", spoilt).returncode == 2
    assert shell("simulate", SOURCE, "--years", "0").returncode == 2
