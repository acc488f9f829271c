"""The arguments of the commands: what can be asked for, and one line for what cannot."""

from __future__ import annotations

import argparse
import math
from collections.abc import Iterable
from pathlib import Path
from typing import Any, NoReturn

from desk import __version__
from desk.book import Fault, ModelName
from desk.book.market import CalibrationSource
from desk.book.run import MOST_PATHS
from desk.report.as_text import printable
from desk.terminal import complain

__all__ = ["COMMANDS", "LIMITS", "parser", "range_faults", "target_fault"]

COMMANDS = ("check", "value", "shock", "simulate", "calibrate", "report")

LIMITS = {"paths": (1, MOST_PATHS), "years": (1, 200), "steps": (1, 366), "seed": (0, 2**53)}
"""Sensible range of each number that a command takes."""

_AT_FAULT = 2


def parser() -> argparse.ArgumentParser:
    """The commands and their options; a wrong argument is said in one line, with exit status 2."""
    whole = _Parser(
        prog="gapwright",
        description="What promised payments are worth, whether the assets held will meet them, and how "
        "both move with rates.",
        epilog="Without a command the window opens: gapwright [BOOK]. Exit status: 0 done, 1 the program "
        "failed, 2 the book or the arguments are at fault.",
        allow_abbrev=False,
    )
    whole.add_argument("--version", action="version", version=f"Gapwright {__version__}")
    commands = whole.add_subparsers(dest="command", metavar="COMMAND", parser_class=_Parser)

    def command(name: str, text: str, *, has_json: bool = True) -> argparse.ArgumentParser:
        added = commands.add_parser(name, help=text, description=text, allow_abbrev=False)
        added.add_argument("book", metavar="BOOK", type=Path, help="a book workbook")
        if has_json:
            added.add_argument("--json", action="store_true", help="print one JSON object and nothing else")
        return added

    command("check", "Read a book and list its faults.")
    command("value", "Print the standing: both sides valued, with their gaps.")
    shock = command("shock", "Print the standing under each shock.")
    shock.add_argument(
        "--set",
        action="append",
        default=[],
        metavar="NAME",
        help="a prescribed set of shocks in place of those the book asks for; may be given more than once",
    )
    shock.add_argument(
        "--sets-from",
        type=Path,
        metavar="FOLDER",
        help="folder with prescribed sets in place of the program's",
    )
    shock.add_argument(
        "--reach",
        type=_ratio,
        metavar="RATIO",
        help="also find the moves of rates that bring the funding ratio to this, for example 0.95",
    )
    simulate = command("simulate", "Draw the rates model and value both sides along the paths.")
    for name, text in (
        ("paths", "number of paths"),
        ("years", "length of every path in years"),
        ("steps", "steps a year"),
        ("seed", "seed of the draws"),
    ):
        low, high = LIMITS[name]
        wording = f"{text}, from {low:,} to {high:,}; without it as the book says"
        simulate.add_argument(f"--{name}", type=_whole_number, metavar="N", help=wording)
    names = ", ".join(ModelName)
    simulate.add_argument(
        "--model", type=_model, metavar="NAME", help=f"rates model in place of the book's: {names}"
    )
    simulate.add_argument(
        "--paths-out",
        type=Path,
        metavar="FILE",
        help="also write every path, by year, to FILE.xlsx or FILE.csv.gz",
    )
    simulate.add_argument(
        "--every-step", action="store_true", help="with --paths-out: every step of the paths, not the years"
    )
    calibrate = command("calibrate", "Fit a short-rate model to data of the book; the book stays as it is.")
    calibrate.add_argument(
        "--to",
        type=_source,
        required=True,
        metavar="DATA",
        help=f"what it is fitted to: {', '.join(CalibrationSource)}",
    )
    calibrate.add_argument(
        "--model", type=_model, metavar="NAME", help="the model; without it the book's, or the usual one"
    )
    calibrate.add_argument(
        "--save", type=Path, metavar="FILE.xlsx", help="also write a copy of the book with the fitted model"
    )
    report = command("report", "Write the report as a workbook.", has_json=False)
    report.add_argument("--out", type=Path, required=True, metavar="FILE.xlsx", help="the workbook to write")
    return whole


class _Parser(argparse.ArgumentParser):
    """A parser whose complaint is one line."""

    def error(self, message: str) -> NoReturn:
        """Say what is wrong in one line and end with the status of a fault."""
        complain(printable(f"{self.prog}: {message}"))
        self.exit(_AT_FAULT)

    def _check_value(self, action: argparse.Action, value: Any) -> None:
        """Say of an unknown command what the commands are."""
        if isinstance(action, argparse._SubParsersAction) and value not in action.choices:
            listed = ", ".join(COMMANDS)
            self.error(f'"{value}" is no command; the commands are {listed}. To open a book, give it alone')
        super()._check_value(action, value)


def _whole_number(text: str) -> int:
    """A whole number as it is written on a command line."""
    try:
        return int(text)
    except ValueError:
        raise argparse.ArgumentTypeError(f'"{text}" is no whole number') from None


def _ratio(text: str) -> float:
    """A funding ratio as it is written on a command line."""
    try:
        ratio = float(text)
    except ValueError:
        ratio = math.nan
    if not (math.isfinite(ratio) and ratio > 0.0):
        raise argparse.ArgumentTypeError(
            f'"{text}" is no funding ratio; it is a number above 0, such as 0.95'
        )
    return ratio


def _model(text: str) -> ModelName:
    """A rates model by its name."""
    try:
        return ModelName(text)
    except ValueError:
        names = ", ".join(ModelName)
        raise argparse.ArgumentTypeError(f'"{text}" is no model; the models are {names}') from None


def _source(text: str) -> CalibrationSource:
    """Data that a model can be fitted to, by their name."""
    try:
        return CalibrationSource(text)
    except ValueError:
        names = ", ".join(CalibrationSource)
        raise argparse.ArgumentTypeError(f'"{text}" is no data to fit to; there are {names}') from None


def range_faults(options: argparse.Namespace) -> Iterable[Fault]:
    """What is wrong with the numbers that a command was given."""
    for name, (low, high) in LIMITS.items():
        given = getattr(options, name)
        if given is not None and not low <= given <= high:
            yield Fault(
                f"--{name} is {given}",
                f"a whole number from {low:,} to {high:,}",
                f"Give --{name} a number in that range.",
            )


def target_fault(
    target: Path, source: Path, *, option: str = "--out", endings: tuple[str, ...] = (".xlsx",)
) -> Fault | None:
    """What is wrong with the place that `option` says a workbook, or another file, is to go to."""
    if not target.name.lower().endswith(endings):
        wanted = f"a name that ends in {' or '.join(endings)}"
        return Fault(
            f"{option} is {target}", wanted, f"Name a {'workbook' if len(endings) == 1 else 'file'}."
        )
    if target.is_dir():
        return Fault(f"{option} is {target}, a folder", "a file", "Name a file in it.")
    if target.exists() and not target.is_file():
        return Fault(f"{option} is {target}, a device or a pipe", "a file", "Name a file.")
    if not target.absolute().parent.is_dir():
        return Fault(f"{option} is {target}", "a folder that exists", "Make the folder first.")
    if target.exists() and source.exists() and target.samefile(source):
        return Fault(
            f"{option} is the book itself", "another file", "Name another file: the book is not lost."
        )
    return None
