"""Faults told once: what a result sums up is left out where the reading has told each place of it."""

from __future__ import annotations

import re
from collections.abc import Iterable

from desk.book import Fault

__all__ = ["further_faults"]

_AFTER_TODAY = ("a date after the valuation date", "years above 0")
"""What the reading expects of a flow, or of a maturity, that is not in the future."""
_COUNT = re.compile(r"([\d,]+) flows? falls? on or before the valuation date")
_MATURED = re.compile(r"has maturity (\d{4}-\d{2}-\d{2})")
_HORIZON = re.compile(r"the horizon of \d+ years? goes beyond")
_NO_SUCH_LINE = re.compile(r"terms for a line (['\"])(.*)\1$", re.DOTALL)
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
    before = list(told)
    seen = set(before)
    further = []
    for fault in found:
        if fault not in seen and not _is_told(fault, before):
            further.append(fault)
        seen.add(fault)
    return tuple(further)


def _is_told(fault: Fault, told: list[Fault]) -> bool:
    """Whether `told` says of the cells what `fault` says of the whole."""
    places = [other for other in told if other.sheet == fault.sheet and other.cell]
    if count := _COUNT.match(fault.found):
        return int(count[1].replace(",", "")) == sum(other.expected in _AFTER_TODAY for other in places)
    if matured := _MATURED.search(fault.found):
        return any(other.expected in _AFTER_TODAY and matured[1] in other.found for other in places)
    if horizon := _HORIZON.match(fault.found):
        return any(other.found.startswith(horizon[0]) for other in places)
    terms = [other for other in told if other.sheet == "Line terms" and other.cell]
    if line := _NO_SUCH_LINE.match(fault.found):
        return any(f'are of the line "{line[2][:_LONGEST_NAME]}"' in other.found for other in terms)
    if fault.found.endswith(_NO_INFLATION) and fault.sheet in _OF_FLOWS:
        return any("needs expected inflation" in other.found for other in terms)
    return False
