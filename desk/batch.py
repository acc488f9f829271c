"""The commands: check, value, shock, simulate, calibrate and report, without a window.

Exit status: 0 done; 1 the program failed; 2 the book or the arguments are at fault, said on standard
error in one line a fault. With ``--json`` standard output is one JSON object and nothing else.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable, Iterable, Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from desk import tasks
from desk.arguments import COMMANDS, parser, range_faults, target_fault
from desk.asked import (
    BadRequest,
    NotWritten,
    Reported,
    complain_of,
    complain_of_reading,
    insist_on,
    read_usable,
    write_to,
)
from desk.book import Book, Fault, RatesModel, Severity
from desk.guarded import ended_by_signals, run_guarded, say_result
from desk.intake.records import Reading
from desk.report import as_json, as_text
from desk.report.said_once import further_faults
from desk.scenarios.records import Simulation
from desk.terminal import ProgressLine, complain
from desk.valuation.records import Standing

if TYPE_CHECKING:
    from desk.report.as_shocks import Reached

__all__ = ["COMMANDS", "BadRequest", "demonstrate", "main", "read_usable", "run_guarded"]

DONE, FAILED, AT_FAULT = 0, 1, 2


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status.

    Parameters
    ----------
    arguments : sequence of str, optional
        As on the command line, without the program's name; by default those of the process.
    """
    given = list(sys.argv[1:] if arguments is None else arguments)

    def work() -> int:
        with ended_by_signals():
            return _command(given)

    return run_guarded(work)


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
    say_result(as_text.standing_text(standing, title=book.basis.title, book=book, second=second))
    if simulation is not None:
        say_result("")
        say_result(as_text.simulation_text(simulation, currency=book.basis.currency))
    folder.mkdir(parents=True, exist_ok=True)
    target = folder / f"{path.stem}_report.xlsx"
    with ProgressLine("Writing") as progress:
        tasks.report(
            reading, target, standing=standing, simulation=simulation, second=second, progress=progress
        )
    say_result(f"\nThe report is in {target}")
    return reading, standing, simulation


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
    except NotWritten as error:
        complain(as_text.printable(f"{error}"))
        return FAILED
    except BadRequest as bad:
        if not isinstance(bad, Reported):
            for fault in bad.faults:
                complain(as_text.fault_line(fault))
        if getattr(options, "json", False):
            say_result(as_json.text({"faults": [as_json.fault_object(fault) for fault in bad.faults]}))
        return AT_FAULT


def _check(options: argparse.Namespace) -> int:
    """Read a book and list its faults."""
    with ProgressLine("Reading") as progress:
        reading = tasks.read(options.book, progress=progress)
    complain_of_reading(reading)
    say_result(as_json.text(as_json.check_object(reading)) if options.json else as_text.check_text(reading))
    return AT_FAULT if reading.grave or reading.book is None else DONE


def _value(options: argparse.Namespace) -> int:
    """The standing."""
    reading, book = read_usable(options.book)
    insist_on(book, model=False)
    with ProgressLine("Valuing") as progress:
        standing = tasks.value(book, progress=progress)
    second = _on_second_basis(book)
    found = standing.faults if second is None else (*standing.faults, *second.faults)
    complain_of(further_faults(reading.faults, found))
    if options.json:
        say_result(as_json.text(as_json.standing_object(standing, reading.faults, book=book, second=second)))
    else:
        say_result(as_text.standing_text(standing, title=book.basis.title, book=book, second=second))
    return DONE


def _on_second_basis(book: Book) -> Standing | None:
    """The standing on the second basis, if the book has one that gives a curve."""
    other = book.on_second_basis
    if other is None:
        return None
    insist_on(other, model=False, sheet="Second basis")
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
    insist_on(book, model=False)
    with ProgressLine("Shocking") as progress:
        table = tasks.shock(book, sets=tuple(options.set), folder=options.sets_from, progress=progress)
    reached = None if options.reach is None else _reach(book, options.reach)
    found = table.faults if reached is None else (*table.faults, *reached.faults)
    complain_of(further_faults(reading.faults, found))
    if options.json:
        say_result(as_json.text(as_shocks.shocks_object(table, reading.faults, reached=reached)))
    else:
        say_result(as_shocks.shocks_text(table, title=book.basis.title, reached=reached))
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
        raise Reported((*bad.faults, *faults)) from None
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
    insist_on(book, model=True)
    saved: Path | None = options.paths_out
    if saved is not None:
        # Before the run: what stands in the way is told at once.
        _write_paths(book, saved, every_step=options.every_step)
    with ProgressLine("Simulating") as progress:
        simulation = tasks.simulate(book, progress=progress)
    told = (*reading.faults, *_volatility_faults(stated, book.rates_model))
    complain_of((*told[len(reading.faults) :], *further_faults(reading.faults, simulation.faults)))
    if options.json:
        plain = as_json.simulation_object(simulation, told)
        say_result(as_json.text(plain if saved is None else plain | {"paths_out": str(saved)}))
        return DONE
    title, currency = book.basis.title, book.basis.currency
    say_result(as_text.simulation_text(simulation, currency=currency, title=title))
    if saved is not None:
        say_result(f"\nThe paths are in {as_text.printable(str(saved))}")
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
        write_to(target, "--paths-out", "file of paths", write)
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
            write_to(saved, "--save", "book", lambda: tasks.save_copy(with_model, saved))
        except ValueError as error:
            raise BadRequest([Fault(f"{error}", "a book that a workbook can hold", "Mend it.")]) from error
    if options.json:
        plain = as_calibration.calibration_object(found, reading.faults)
        say_result(as_json.text(plain | {"saved": None if saved is None else str(saved)}))
        return DONE
    say_result(as_calibration.calibration_text(found, title=book.basis.title))
    if saved is not None:
        say_result(f"\nThe book with the fitted model is in {as_text.printable(str(saved))}")
    return DONE


def _report(options: argparse.Namespace) -> int:
    """The report as a workbook."""
    fault = target_fault(options.out, options.book)
    if fault is not None:
        raise BadRequest([fault])
    reading, book = read_usable(options.book)
    insist_on(book, model=book.rates_model is not None)
    second = _on_second_basis(book)
    with ProgressLine("Reporting") as progress:
        written = write_to(
            options.out,
            "--out",
            "report",
            lambda: tasks.report(reading, options.out, second=second, progress=progress),
        )
    say_result(f"The report is in {written}")
    return DONE


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
    from desk.scenarios.suggestions import VolatilityKind, volatility_kind

    if stated is None or drawn is None or drawn.volatility is None:
        return ()
    kind = volatility_kind(drawn.name)
    if kind in (volatility_kind(stated.name), VolatilityKind.NONE):
        return ()
    kinds = {
        VolatilityKind.ABSOLUTE: "a volatility a year of the rate itself",
        VolatilityKind.ROOT: "a factor of the root of the rate",
        VolatilityKind.RELATIVE: "a volatility of the logarithm of the rate",
    }
    return (
        Fault(
            f"the volatility {drawn.volatility:g} was stated for {stated.name} and is used for {drawn.name}",
            kinds[kind],
            f"State one for {drawn.name} in the book.",
            sheet="Rates model",
            severity=Severity.MILD,
        ),
    )
