"""The commands: check, value, shock, simulate, calibrate and report, without a window.

Exit status: 0 done; 1 the program failed; 2 the book or the arguments are at fault, said on standard
error in one line a fault. With ``--json`` standard output is one JSON object and nothing else.
"""

from __future__ import annotations

import argparse
import errno
import os
import signal
import sys
import threading
import traceback
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from desk import tasks
from desk.arguments import COMMANDS, parser, range_faults, target_fault
from desk.book import Book, Fault, RatesModel, Severity
from desk.intake.records import Reading
from desk.report import as_json, as_text
from desk.report.said_once import further_faults
from desk.scenarios.records import Simulation
from desk.terminal import ProgressLine, complain, say, use_standard_streams
from desk.valuation.records import Standing

if TYPE_CHECKING:
    from desk.report.as_shocks import Reached

__all__ = ["COMMANDS", "BadRequest", "demonstrate", "main", "read_usable", "run_guarded"]

DONE, FAILED, AT_FAULT = 0, 1, 2

_NO_PLACE_TO_WRITE = (errno.EACCES, errno.EPERM, errno.EROFS, errno.ENAMETOOLONG, errno.ENOENT)
"""Reasons why a file cannot be written that lie in the place asked for."""


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

    def work() -> int:
        with _ended_by_signals():
            return _command(given)

    return run_guarded(work)


@contextmanager
def _ended_by_signals() -> Iterator[None]:
    """Let a request to end stop the work as Ctrl-C does, so that nothing half done stays behind."""
    names = [name for name in ("SIGTERM", "SIGHUP") if hasattr(signal, name)]
    former = {}

    def end(number: int, frame: object) -> None:
        signal.signal(number, signal.SIG_IGN)
        raise KeyboardInterrupt

    if threading.current_thread() is threading.main_thread():
        for name in names:
            number = getattr(signal, name)
            # A process that is to outlive its terminal stays deaf to its end.
            if signal.getsignal(number) is not signal.SIG_IGN:
                former[number] = signal.signal(number, end)
    try:
        yield
    finally:
        for number, handler in former.items():
            signal.signal(number, handler)


class _CannotWrite(Exception):
    """Standard output takes nothing more."""


class _NotWritten(Exception):
    """A file cannot be written, for no reason that lies in its place."""


def run_guarded(work: Callable[[], int]) -> int:
    """Do `work` and turn whatever ends it early into an exit status."""
    use_standard_streams()
    try:
        status = work()
        _flush()
    except KeyboardInterrupt:
        complain("Stopped.")
        return FAILED
    except MemoryError:
        complain("There is not enough memory for this. Ask for fewer paths or a shorter horizon.")
        return FAILED
    except _CannotWrite as error:
        complain(f"The result cannot be written: {error}.")
        # What Python still holds for the stream must not raise again at exit.
        sys.stdout = open(os.devnull, "w", encoding="utf-8")  # noqa: SIM115
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


def _flush() -> None:
    """Hand over what was said."""
    try:
        sys.stdout.flush()
    except BrokenPipeError:
        raise
    except OSError as error:
        raise _CannotWrite(error.strerror or str(error)) from error


def _say(text: str) -> None:
    """Text on standard output, which may take nothing more."""
    try:
        say(text)
    except BrokenPipeError:
        raise
    except OSError as error:
        raise _CannotWrite(error.strerror or str(error)) from error


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
    second = _on_second_basis(book)
    _say(as_text.standing_text(standing, title=book.basis.title, book=book, second=second))
    if simulation is not None:
        _say("")
        _say(as_text.simulation_text(simulation, currency=book.basis.currency))
    folder.mkdir(parents=True, exist_ok=True)
    target = folder / f"{path.stem}_report.xlsx"
    with ProgressLine("Writing") as progress:
        tasks.report(
            reading, target, standing=standing, simulation=simulation, second=second, progress=progress
        )
    _say(f"\nThe report is in {target}")
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
    _complain_of_reading(reading)
    if reading.book is None or reading.grave:
        raise _Reported(reading.faults)
    return reading, reading.book


class _Reported(BadRequest):
    """Faults that stand on standard error already."""


def _command(given: Sequence[str]) -> int:
    """Parse the arguments and do what they ask."""
    try:
        options = parser().parse_args(given)
    except SystemExit as ended:
        return ended.code if isinstance(ended.code, int) else AT_FAULT
    if options.command is None:
        parser().print_help(sys.stderr)
        return AT_FAULT
    try:
        return _ACTIONS[options.command](options)
    except _NotWritten as error:
        complain(as_text.printable(f"{error}"))
        return FAILED
    except BadRequest as bad:
        if not isinstance(bad, _Reported):
            for fault in bad.faults:
                complain(as_text.fault_line(fault))
        if getattr(options, "json", False):
            _say(as_json.text({"faults": [as_json.fault_object(fault) for fault in bad.faults]}))
        return AT_FAULT


def _check(options: argparse.Namespace) -> int:
    """Read a book and list its faults."""
    with ProgressLine("Reading") as progress:
        reading = tasks.read(options.book, progress=progress)
    _complain_of_reading(reading)
    _say(as_json.text(as_json.check_object(reading)) if options.json else as_text.check_text(reading))
    return AT_FAULT if reading.grave or reading.book is None else DONE


def _value(options: argparse.Namespace) -> int:
    """The standing."""
    reading, book = read_usable(options.book)
    _insist_on(book, model=False)
    with ProgressLine("Valuing") as progress:
        standing = tasks.value(book, progress=progress)
    second = _on_second_basis(book)
    found = standing.faults if second is None else (*standing.faults, *second.faults)
    _complain_of(further_faults(reading.faults, found))
    if options.json:
        _say(as_json.text(as_json.standing_object(standing, reading.faults, book=book, second=second)))
    else:
        _say(as_text.standing_text(standing, title=book.basis.title, book=book, second=second))
    return DONE


def _on_second_basis(book: Book) -> Standing | None:
    """The standing on the second basis, if the book has one that gives a curve."""
    other = book.on_second_basis
    if other is None:
        return None
    _insist_on(other, model=False, sheet="Second basis")
    with ProgressLine("Valuing on the second basis") as progress:
        return tasks.value(other, progress=progress)


def _shock(options: argparse.Namespace) -> int:
    """The standing under each shock."""
    from desk.report import as_shocks

    if options.sets_from is not None and not options.sets_from.is_dir():
        raise BadRequest(
            [
                Fault(
                    f"--sets-from is {options.sets_from}",
                    "a folder that exists",
                    "Name one, or leave it out.",
                )
            ]
        )
    reading, book = read_usable(options.book)
    _insist_on(book, model=False)
    with ProgressLine("Shocking") as progress:
        table = tasks.shock(book, sets=tuple(options.set), folder=options.sets_from, progress=progress)
    reached = None if options.reach is None else _reach(book, options.reach)
    found = table.faults if reached is None else (*table.faults, *reached.faults)
    _complain_of(further_faults(reading.faults, found))
    if options.json:
        _say(as_json.text(as_shocks.shocks_object(table, reading.faults, reached=reached)))
    else:
        _say(as_shocks.shocks_text(table, title=book.basis.title, reached=reached))
    return DONE


def _reach(book: Book, level: float) -> Reached:
    """The moves of rates that bring the funding ratio to a level."""
    from desk.intake.checks import plain
    from desk.report.as_shocks import Reached
    from desk.valuation.reverse import Goal

    parallel = tasks.reverse(book, goal=Goal.FUNDING_RATIO, level=level)
    least, faults = [], [] if parallel.fault is None else [parallel.fault]
    for from_history, is_there in (
        (False, book.rates_model is not None),
        (True, book.yield_history is not None),
    ):
        if not is_there:
            continue
        try:
            found = tasks.least_move(book, goal=Goal.FUNDING_RATIO, level=level, from_history=from_history)
        except ValueError as error:
            faults.append(Fault(plain(error), "a covariance of rates", "State another model or history."))
            continue
        if found.fault is None:
            least.append(found)
        else:
            faults.append(found.fault)
    return Reached(level, parallel, tuple(least), tuple(faults))


def _simulate(options: argparse.Namespace) -> int:
    """A run."""
    faults = [*range_faults(options), *_paths_faults(options)]
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
    stated = book.rates_model
    book = _with_options(book, options)
    _insist_on(book, model=True)
    saved: Path | None = options.paths_out
    if saved is not None:
        # Before the run: what stands in the way is told at once.
        _write_paths(book, saved, every_step=options.every_step)
    with ProgressLine("Simulating") as progress:
        simulation = tasks.simulate(book, progress=progress)
    told = (*reading.faults, *_volatility_faults(stated, book.rates_model))
    _complain_of((*told[len(reading.faults) :], *further_faults(reading.faults, simulation.faults)))
    if options.json:
        plain = as_json.simulation_object(simulation, told)
        _say(as_json.text(plain if saved is None else plain | {"paths_out": str(saved)}))
        return DONE
    title, currency = book.basis.title, book.basis.currency
    _say(as_text.simulation_text(simulation, currency=currency, title=title))
    if saved is not None:
        _say(f"\nThe paths are in {as_text.printable(str(saved))}")
    return DONE


def _paths_faults(options: argparse.Namespace) -> Iterable[Fault]:
    """What is wrong with where the paths are to go."""
    from desk.report.scenario_export import ENDINGS

    if options.paths_out is None:
        if options.every_step:
            yield Fault("--every-step is given without --paths-out", "both", "Name a file, or leave it out.")
        return
    fault = target_fault(options.paths_out, options.book, option="--paths-out", endings=ENDINGS)
    if fault is not None:
        yield fault


def _write_paths(book: Book, target: Path, *, every_step: bool) -> None:
    """Write the paths of the book's run."""

    def write() -> Path:
        with ProgressLine("Writing the paths") as progress:
            return tasks.export_scenarios(book, target, every_step=every_step, progress=progress)

    try:
        _write_to(target, "--paths-out", "file of paths", write)
    except ValueError as error:
        raise BadRequest([Fault(f"{error}", "paths that the file can hold", "Ask for fewer.")]) from error


def _calibrate(options: argparse.Namespace) -> int:
    """A short-rate model fitted to data of the book."""
    from desk.report import as_calibration
    from desk.scenarios.calibration_records import CalibrationError

    saved: Path | None = options.save
    fault = None if saved is None else target_fault(saved, options.book, option="--save")
    if fault is not None:
        raise BadRequest([fault])
    reading, book = read_usable(options.book)
    try:
        with ProgressLine("Fitting") as progress:
            found = tasks.calibrate(book, source=options.to, model=options.model, progress=progress)
    except CalibrationError as error:
        raise BadRequest(error.faults) from error
    if saved is not None:
        if found.model is None:
            raise BadRequest([Fault(found.obstacle, "a model that can be used", "Leave --save out.")])
        with_model = replace(book, rates_model=found.model)
        try:
            _write_to(saved, "--save", "book", lambda: tasks.save_copy(with_model, saved))
        except ValueError as error:
            raise BadRequest([Fault(f"{error}", "a book that a workbook can hold", "Mend it.")]) from error
    if options.json:
        plain = as_calibration.calibration_object(found, reading.faults)
        _say(as_json.text(plain | {"saved": None if saved is None else str(saved)}))
        return DONE
    _say(as_calibration.calibration_text(found, title=book.basis.title))
    if saved is not None:
        _say(f"\nThe book with the fitted model is in {as_text.printable(str(saved))}")
    return DONE


def _report(options: argparse.Namespace) -> int:
    """The report as a workbook."""
    fault = target_fault(options.out, options.book)
    if fault is not None:
        raise BadRequest([fault])
    reading, book = read_usable(options.book)
    _insist_on(book, model=book.rates_model is not None)
    second = _on_second_basis(book)
    with ProgressLine("Reporting") as progress:
        written = _write_to(
            options.out,
            "--out",
            "report",
            lambda: tasks.report(reading, options.out, second=second, progress=progress),
        )
    _say(f"The report is in {written}")
    return DONE


def _write_to(target: Path, option: str, what: str, write: Callable[[], Path]) -> Path:
    """Where `write` has written; a place that it cannot write to is a fault of the option that names it."""
    try:
        return write()
    except OSError as error:
        reason = error.strerror or str(error)
        if error.errno not in _NO_PLACE_TO_WRITE:
            raise _NotWritten(f"{target}: the {what} cannot be written: {reason}.") from error
        fault = Fault(f"{option} is {target}: {reason}", "a place that can be written to", "Name another.")
        raise BadRequest([fault]) from error


_ACTIONS: dict[str, Callable[[argparse.Namespace], int]] = {
    "check": _check,
    "value": _value,
    "shock": _shock,
    "simulate": _simulate,
    "calibrate": _calibrate,
    "report": _report,
}


def _with_options(book: Book, options: argparse.Namespace) -> Book:
    """The book with the settings that the command names in place of its own."""
    run = book.run
    run = replace(
        run,
        paths=run.paths if options.paths is None else options.paths,
        horizon_years=run.horizon_years if options.years is None else options.years,
        steps_per_year=run.steps_per_year if options.steps is None else options.steps,
        seed=run.seed if options.seed is None else options.seed,
    )
    model = book.rates_model
    if options.model is not None:
        model = RatesModel(options.model) if model is None else replace(model, name=options.model)
    return replace(book, run=run, rates_model=model)


def _volatility_faults(stated: RatesModel | None, drawn: RatesModel | None) -> tuple[Fault, ...]:
    """Says so where a volatility is drawn as something else than it was stated as."""
    from desk.scenarios.suggestions import MODEL_TRAITS

    if stated is None or drawn is None or drawn.volatility is None:
        return ()
    if MODEL_TRAITS[stated.name][1] == MODEL_TRAITS[drawn.name][1]:
        return ()
    kinds = ("a volatility a year of the rate itself", "a factor of the root of the rate")
    return (
        Fault(
            f"the volatility {drawn.volatility:g} was stated for {stated.name} and is used for {drawn.name}",
            kinds[MODEL_TRAITS[drawn.name][1]],
            f"State one for {drawn.name} in the book.",
            sheet="Rates model",
            severity=Severity.MILD,
        ),
    )


def _insist_on(book: Book, *, model: bool, sheet: str = "Basis") -> None:
    """Raise BadRequest where the basis gives no curve, or the model, if it is needed, cannot be drawn."""
    from desk.intake.checks import plain
    from desk.intake.items import missing_items
    from desk.scenarios.models import rate_model

    if model and book.rates_model is not None and (missing := missing_items(book.rates_model)):
        name = book.rates_model.name
        raise BadRequest(
            Fault(
                f'the item "{item}" is missing, which the model {name} needs',
                f'a row with the item "{item}" and its value',
                "Add the row, or name another model.",
                sheet="Rates model",
            )
            for item in missing
        )
    wanted = "a curve"
    try:
        _ = book.basis.curve, book.basis.liability_spread_at([1.0])
        if book.basis.inflation is not None:
            _ = book.basis.inflation.curve
        if model:
            sheet, wanted = "Rates model", "a model that can be drawn"
            rate_model(book)
    except ValueError as error:
        raise BadRequest([Fault(plain(error), wanted, "Mend it in the book.", sheet=sheet)]) from error


def _complain_of(faults: Iterable[Fault]) -> None:
    """Say the mild faults of a result."""
    for fault in faults:
        complain(as_text.fault_line(replace(fault, severity=Severity.MILD)))


def _complain_of_reading(reading: Reading) -> None:
    """Say the faults of a reading; one that has no place in the book says which file it is of."""
    for fault in reading.faults:
        line = as_text.fault_line(fault)
        complain(line if fault.place else f"{as_text.printable(str(reading.path))}: {line}")
