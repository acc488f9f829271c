"""Prescribed sets of shocks, read from a folder of text tables that a user can put right.

A file holds one set; see `desk.intake.shock_file`.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass
from pathlib import Path

from desk.book import Fault, MoveKind, Shock
from desk.book.shock import ShockSet
from desk.intake.shock_file import ShockFile, shock_file_fault, symmetric_adjustment

__all__ = ["ShockSets", "chosen_shocks", "read_shock_sets", "symmetric_adjustment"]

_MOST_BYTES = 2_000_000
_MOST_FILES = 200


@dataclass(frozen=True)
class ShockSets:
    """The sets of a folder, as they stand for one currency.

    Attributes
    ----------
    sets : tuple of ShockSet
        By file name.
    faults : tuple of Fault
        What of the files could not be used; their sheet is the file's name.
    """

    sets: tuple[ShockSet, ...]
    faults: tuple[Fault, ...]


def read_shock_sets(folder: Path, *, currency: str) -> ShockSets:
    """Read every set of a folder.

    Parameters
    ----------
    folder : Path
        With one ``.csv`` a set.
    currency : str
        For which sizes are wanted.

    Returns
    -------
    ShockSets
        A row that cannot be used is told, and the shock it is of left out; the other shocks stay.
    """
    try:
        paths = sorted(path for path in folder.iterdir() if path.suffix.lower() == ".csv")
    except OSError as error:
        return ShockSets(
            (), (shock_file_fault(str(folder), "", f"no folder of shocks: {error.strerror}", "a folder"),)
        )
    sets, faults = [], []
    names: dict[str, str] = {}
    for path in paths[:_MOST_FILES]:
        found = ShockFile(path.name)
        try:
            if path.stat().st_size > _MOST_BYTES:
                raise ValueError(f"more than {_MOST_BYTES:,} bytes")
            text = path.read_text(encoding="utf-8-sig")
            found.take(text)
        except (OSError, ValueError, csv.Error) as error:
            why = error.strerror if isinstance(error, OSError) else str(error)
            faults.append(
                shock_file_fault(path.name, "", f"no table that can be read: {why}", "text in UTF-8")
            )
            continue
        made = found.made(currency.strip().upper())
        faults.extend(found.faults)
        if made is None:
            continue
        if made.name.casefold() in names:
            other = names[made.name.casefold()]
            faults.append(
                shock_file_fault(path.name, "", f"a set {made.name!r}, as {other} has", "a name of its own")
            )
            continue
        names[made.name.casefold()] = path.name
        sets.append(made)
    return ShockSets(tuple(sets), tuple(faults))


def chosen_shocks(
    found: ShockSets, *, asked: tuple[str, ...], currency: str, with_inflation: bool
) -> tuple[tuple[Shock, ...], tuple[Fault, ...]]:
    """The shocks of the sets asked for.

    Parameters
    ----------
    found : ShockSets
    asked : tuple of str
        Names of sets; none for those that are usual for the currency.
    currency : str
        For the wording.
    with_inflation : bool
        Whether the basis states expected inflation: without, a usual set's shocks of it are left out.

    Returns
    -------
    shocks : tuple of Shock
    faults : tuple of Fault
        A set that is not there, or holds nothing for the currency; or, where none is asked for, that no set
        has sizes for it.
    """
    if not asked:
        usual = [shock for own in found.sets if own.is_usual for shock in own.shocks]
        moves_inflation = {
            shock for shock in usual if all(move.kind is MoveKind.INFLATION for move in shock.moves)
        }
        chosen = tuple(shock for shock in usual if with_inflation or shock not in moves_inflation)
        by_currency = [own for own in found.sets if own.has_sizes_by_currency]
        if not by_currency or any(own.shocks for own in by_currency):
            return chosen, ()
        fault = shock_file_fault(
            "Shock settings",
            "",
            f"no prescribed set with sizes for {currency}",
            f"sizes for one of the currencies that {' or '.join(own.name for own in by_currency)} names",
            "Only sets that suit any currency are used; put sizes into the files, or state your own shocks.",
        )
        return chosen, (fault,)
    by_name = {own.name.casefold(): own for own in found.sets}
    shocks: list[Shock] = []
    faults: list[Fault] = []
    for name in dict.fromkeys(asked):
        own = by_name.get(name.strip().casefold())
        if own is None:
            listed = ", ".join(each.name for each in found.sets) or "none"
            faults.append(
                shock_file_fault(
                    "Shock settings", "", f"the set {name!r}, which is not there", f"one of: {listed}"
                )
            )
        elif not own.shocks:
            what = (
                f"the set {own.name!r}, which holds figures and no shocks"
                if own.figures
                else f"the set {own.name!r}, which has no shocks that can be used for {currency}"
            )
            faults.append(
                shock_file_fault(
                    "Shock settings",
                    "",
                    what,
                    "a set that holds shocks for the currency",
                    "It is left out; state shocks of your own in the sheet 'Shocks'.",
                )
            )
        else:
            shocks.extend(own.shocks)
    return tuple(shocks), tuple(faults)
