"""The commands: check, value, simulate and report, without a window.

Exit status: 0 done; 1 the program failed; 2 the book or the arguments are at fault, said on standard
error in one line a fault. With ``--json`` standard output is one JSON object and nothing else.
"""

from __future__ import annotations

import argparse
import os
import sys
import traceback
from collections.abc import Callable, Iterable, Sequence
from dataclasses import replace
from pathlib import Path
from typing import NoReturn

from desk import __version__, tasks
from desk.book import Book, Fault, ModelName, RatesModel, Run, Severity
from desk.intake.records import Reading
from desk.report import as_json, as_text
from desk.scenarios.records import Simulation
from desk.terminal import ProgressLine, complain, say, use_standard_streams
from desk.valuation.records import Standing

__all__ = ["COMMANDS", "BadRequest", "demonstrate", "main", "read_usable", "run_guarded"]

DONE, FAILED, AT_FAULT = 0, 1, 2
COMMANDS = ("check", "value", "simulate", "report")

LIMITS = {"paths": (1, 100_000_000), "years": (1, 200), "steps": (1, 366), "seed": (0, 2**53)}
"""Sensible range of each number that a command takes."""


class BadRequest(Exception):
    """The book or the arguments are at fault.

    Attributes
    ----------
    faults : tuple of Fault
    """

    def __init__(self, faults: Iterable[Fault]) -> None:
        """Hold the faults."""
        self.faults = tuple(faults)
        super().__init__("; ".join(str(fault) for fault in self.faults))


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status.

    Parameters
    ----------
    arguments : sequence of str, optional
        As on the command line, without the program's name; by default those of the process.
    """
    given = list(sys.argv[1:] if arguments is None else arguments)
    return run_guarded(lambda: _command(given))


def run_guarded(work: Callable[[], int]) -> int:
    """Do `work` and turn whatever ends it early into an exit status."""
    use_standard_streams()
    try:
        status = work()
        sys.stdout.flush()
    except KeyboardInterrupt:
        complain("Stopped.")
        return FAILED
    except BrokenPipeError:
        # The reader has gone: what Python still holds for it must not raise again at exit.
        sys.stdout = open(os.devnull, "w", encoding="utf-8")  # noqa: SIM115
        return FAILED
    except Exception as error:
        traceback.print_exc()
        complain(f"The program failed: {type(error).__name__}: {error}")
        return FAILED
    return status


def demonstrate(path: Path, folder: Path) -> tuple[Reading, Standing, Simulation | None]:
    """Do the whole main job without a window: print the standing, write the report.

    Parameters
    ----------
    path : Path
        A book.
    folder : Path
        Where the report goes; it is made where it is missing.

    Returns
    -------
    (Reading, Standing, Simulation or None)
        For pictures.

    Raises
    ------
    BadRequest
        If the book has grave faults.
    OSError
        If the report cannot be written.
    """
    reading, book = read_usable(path)
    with ProgressLine("Valuing") as progress:
        standing = tasks.value(book, progress=progress)
    simulation = None
    if book.rates_model is not None:
        with ProgressLine("Simulating") as progress:
            simulation = tasks.simulate(book, progress=progress)
    say(as_text.standing_text(standing, title=book.basis.title))
    if simulation is not None:
        say("")
        say(as_text.simulation_text(simulation, currency=book.basis.currency))
    folder.mkdir(parents=True, exist_ok=True)
    target = folder / f"{path.stem}_report.xlsx"
    with ProgressLine("Writing") as progress:
        tasks.report(reading, target, standing=standing, simulation=simulation, progress=progress)
    say(f"\nThe report is in {target}")
    return reading, standing, simulation


def read_usable(path: Path) -> tuple[Reading, Book]:
    """Read a book, complain about its faults, and insist that it can be used.

    Raises
    ------
    BadRequest
        If the book has grave faults; its faults are on standard error already.
    """
    with ProgressLine("Reading") as progress:
        reading = tasks.read(path, progress=progress)
    for fault in reading.faults:
        complain(as_text.fault_line(fault))
    if reading.book is None or reading.grave:
        raise _Reported(reading.faults)
    return reading, reading.book


class _Reported(BadRequest):
    """Faults that stand on standard error already."""


def _command(given: Sequence[str]) -> int:
    """Parse the arguments and do what they ask."""
    try:
        options = _parser().parse_args(given)
    except SystemExit as ended:
        return ended.code if isinstance(ended.code, int) else AT_FAULT
    if options.command is None:
        _parser().print_help(sys.stderr)
        return AT_FAULT
    try:
        return _ACTIONS[options.command](options)
    except BadRequest as bad:
        if not isinstance(bad, _Reported):
            for fault in bad.faults:
                complain(as_text.fault_line(fault))
        if getattr(options, "json", False):
            say(as_json.text({"faults": [as_json.fault_object(fault) for fault in bad.faults]}))
        return AT_FAULT


def _check(options: argparse.Namespace) -> int:
    """Read a book and list its faults."""
    with ProgressLine("Reading") as progress:
        reading = tasks.read(options.book, progress=progress)
    for fault in reading.faults:
        complain(as_text.fault_line(fault))
    say(as_json.text(as_json.check_object(reading)) if options.json else as_text.check_text(reading))
    return AT_FAULT if reading.grave or reading.book is None else DONE


def _value(options: argparse.Namespace) -> int:
    """The standing."""
    reading, book = read_usable(options.book)
    _insist_on(book, model=False)
    with ProgressLine("Valuing") as progress:
        standing = tasks.value(book, progress=progress)
    _complain_of(standing.faults)
    if options.json:
        say(as_json.text(as_json.standing_object(standing, reading.faults)))
    else:
        say(as_text.standing_text(standing, title=book.basis.title))
    return DONE


def _simulate(options: argparse.Namespace) -> int:
    """A run."""
    faults = [fault for name in LIMITS if (fault := _range_fault(name, getattr(options, name))) is not None]
    try:
        reading, book = read_usable(options.book)
    except BadRequest as bad:
        for fault in faults:
            complain(as_text.fault_line(fault))
        raise _Reported((*bad.faults, *faults)) from None
    asked = options.model or book.rates_model
    if asked is None:
        faults.append(
            Fault(
                "the book has no rates model",
                "a sheet 'Rates model', or --model NAME",
                "Add the sheet, or name a model.",
                sheet="Rates model",
            )
        )
    if faults:
        raise BadRequest(faults)
    book = _with_options(book, options)
    _insist_on(book, model=True)
    with ProgressLine("Simulating") as progress:
        simulation = tasks.simulate(book, progress=progress)
    _complain_of(simulation.faults)
    if options.json:
        say(as_json.text(as_json.simulation_object(simulation, reading.faults)))
    else:
        title, currency = book.basis.title, book.basis.currency
        say(as_text.simulation_text(simulation, currency=currency, title=title))
    return DONE


def _report(options: argparse.Namespace) -> int:
    """The report as a workbook."""
    fault = _target_fault(options.out, options.book)
    if fault is not None:
        raise BadRequest([fault])
    reading, book = read_usable(options.book)
    _insist_on(book, model=book.rates_model is not None)
    with ProgressLine("Reporting") as progress:
        written = tasks.report(reading, options.out, progress=progress)
    say(f"The report is in {written}")
    return DONE


_ACTIONS: dict[str, Callable[[argparse.Namespace], int]] = {
    "check": _check,
    "value": _value,
    "simulate": _simulate,
    "report": _report,
}


def _with_options(book: Book, options: argparse.Namespace) -> Book:
    """The book with the settings that the command names in place of its own."""
    run = book.run
    run = Run(
        paths=run.paths if options.paths is None else options.paths,
        horizon_years=run.horizon_years if options.years is None else options.years,
        steps_per_year=run.steps_per_year if options.steps is None else options.steps,
        seed=run.seed if options.seed is None else options.seed,
        measure=run.measure,
        percentiles=run.percentiles,
    )
    model = book.rates_model
    if options.model is not None:
        name = ModelName(options.model)
        model = RatesModel(name) if model is None else replace(model, name=name)
    return replace(book, run=run, rates_model=model)


def _insist_on(book: Book, *, model: bool) -> None:
    """Raise BadRequest where the basis gives no curve, or the model, if it is needed, cannot be drawn."""
    from desk.scenarios.models import rate_model

    try:
        sheet = "Basis"
        _ = book.basis.curve
        if model:
            sheet = "Rates model"
            rate_model(book)
    except ValueError as error:
        wanted = "a curve" if sheet == "Basis" else "a model that can be drawn"
        raise BadRequest([Fault(str(error), wanted, "Mend it in the book.", sheet=sheet)]) from error


def _range_fault(name: str, given: int | None) -> Fault | None:
    """What is wrong with a number that a command was given."""
    low, high = LIMITS[name]
    if given is None or low <= given <= high:
        return None
    return Fault(
        f"--{name} is {given}",
        f"a whole number from {low} to {high}",
        f"Give --{name} a number in that range.",
    )


def _target_fault(target: Path, source: Path) -> Fault | None:
    """What is wrong with the place a report is to go to."""
    if target.suffix.lower() != ".xlsx":
        return Fault(f"--out is {target}", "a name that ends in .xlsx", "Name a workbook.")
    if target.is_dir():
        return Fault(f"--out is {target}, a folder", "a file", "Name a file in it.")
    if not target.absolute().parent.is_dir():
        return Fault(f"--out is {target}", "a folder that exists", "Make the folder first.")
    if target.exists() and source.exists() and target.samefile(source):
        return Fault("--out is the book itself", "another file", "Name another file: the book is not lost.")
    return None


class _Parser(argparse.ArgumentParser):
    """A parser whose complaint is one line."""

    def error(self, message: str) -> NoReturn:
        """Say what is wrong in one line and end with the status of a fault."""
        complain(as_text.printable(f"{self.prog}: {message}"))
        self.exit(AT_FAULT)


def _parser() -> argparse.ArgumentParser:
    """The commands and their options."""
    parser = _Parser(
        prog="gapwright",
        description="What promised payments are worth, whether the assets held will meet them, and how "
        "both move with rates.",
        epilog="Without a command the window opens: gapwright [BOOK]. Exit status: 0 done, 1 the program "
        "failed, 2 the book or the arguments are at fault.",
        allow_abbrev=False,
    )
    parser.add_argument("--version", action="version", version=f"Gapwright {__version__}")
    commands = parser.add_subparsers(dest="command", metavar="COMMAND", parser_class=_Parser)

    def command(name: str, text: str, *, has_json: bool = True) -> argparse.ArgumentParser:
        added = commands.add_parser(name, help=text, description=text, allow_abbrev=False)
        added.add_argument("book", metavar="BOOK", type=Path, help="a book workbook")
        if has_json:
            added.add_argument("--json", action="store_true", help="print one JSON object and nothing else")
        return added

    command("check", "Read a book and list its faults.")
    command("value", "Print the standing: both sides valued, with their gaps.")
    simulate = command("simulate", "Draw the rates model and value both sides along the paths.")
    for name, text in (
        ("paths", "number of paths"),
        ("years", "length of every path in years"),
        ("steps", "steps a year"),
        ("seed", "seed of the draws"),
    ):
        low, high = LIMITS[name]
        wording = f"{text}, from {low} to {high}; without it as the book says"
        simulate.add_argument(f"--{name}", type=int, metavar="N", help=wording)
    simulate.add_argument(
        "--model",
        choices=[name.value for name in ModelName],
        metavar="NAME",
        help=f"rates model in place of the book's: {', '.join(ModelName)}",
    )
    report = command("report", "Write the report as a workbook.", has_json=False)
    report.add_argument("--out", type=Path, required=True, metavar="FILE.xlsx", help="the workbook to write")
    return parser


def _complain_of(faults: Iterable[Fault]) -> None:
    """Say the mild faults of a result."""
    for fault in faults:
        complain(as_text.fault_line(replace(fault, severity=Severity.MILD)))
