"""Faults told once: what a result sums up is left out where the reading has told each place of it."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterable

from desk.book import Fault

__all__ = ["further_faults"]

_AFTER_TODAY = ("a date after the valuation date", "years above 0")
"""What the reading expects of a flow, or of a maturity, that is not in the future."""
_COUNT = re.compile(r"([\d,]+) flows? falls? on or before the valuation date")
_MATURED = re.compile(r"has maturity (\d{4}-\d{2}-\d{2})")
_DAY = re.compile(r"\d{4}-\d{2}-\d{2}")
_HORIZON = re.compile(r"the horizon of \d+ years? goes beyond")
_NO_SUCH_LINE = re.compile(r"terms for a line (['\"])(.*)\1$", re.DOTALL)
_NOT_OF_LINE = re.compile(r'are of the line "(.*)"$', re.DOTALL)
_LONGEST_NAME = 60
"""Characters of a line's name that the reading repeats."""
_NO_INFLATION = ", and no expected inflation"
_OF_FLOWS = ("Liabilities", "Asset flows")


def further_faults(told: Iterable[Fault], found: Iterable[Fault]) -> tuple[Fault, ...]:
    """Those of `found` that say something new.

    Parameters
    ----------
    told : iterable of Fault
        Those of the reading, each with its cell.
    found : iterable of Fault
        Those of a standing or a run.

    Returns
    -------
    tuple of Fault
        Without those that are in `told`, those that stand twice, and those that say of a sheet or a holding
        what `told` says of its cells: flows that are past, holdings that have matured, a horizon beyond the
        last flow, terms of lines that are not there or follow prices of which nothing is expected. A book
        that was changed since it was read has other counts and dates, and keeps them.
    """
    before = tuple(told)
    seen = set(before)
    cells = _ToldOfCells(before)
    further = []
    for fault in found:
        if fault not in seen and not cells.tell(fault):
            further.append(fault)
        seen.add(fault)
    return tuple(further)


class _ToldOfCells:
    """What a reading told of cells, put in order once: it and a result may each hold a fault a row."""

    def __init__(self, told: Iterable[Fault]) -> None:
        self._past: Counter[str] = Counter()
        self._dates: set[tuple[str, str]] = set()
        self._horizons: set[tuple[str, str]] = set()
        self._lines: set[str] = set()
        self._lacks_inflation = False
        for fault in told:
            if fault.cell:
                self._note(fault)

    def _note(self, fault: Fault) -> None:
        """Put one fault of a cell where it is found again."""
        if fault.expected in _AFTER_TODAY:
            self._past[fault.sheet] += 1
            self._dates.update((fault.sheet, day) for day in _DAY.findall(fault.found))
        if horizon := _HORIZON.match(fault.found):
            self._horizons.add((fault.sheet, horizon[0]))
        if fault.sheet == "Line terms":
            if line := _NOT_OF_LINE.search(fault.found):
                self._lines.add(line[1])
            self._lacks_inflation |= "needs expected inflation" in fault.found

    def tell(self, fault: Fault) -> bool:
        """Whether they say of the cells what a fault says of the whole."""
        if count := _COUNT.match(fault.found):
            return int(count[1].replace(",", "")) == self._past[fault.sheet]
        if matured := _MATURED.search(fault.found):
            return (fault.sheet, matured[1]) in self._dates
        if horizon := _HORIZON.match(fault.found):
            return (fault.sheet, horizon[0]) in self._horizons
        if line := _NO_SUCH_LINE.match(fault.found):
            return line[2][:_LONGEST_NAME] in self._lines
        if fault.found.endswith(_NO_INFLATION) and fault.sheet in _OF_FLOWS:
            return self._lacks_inflation
        return False
