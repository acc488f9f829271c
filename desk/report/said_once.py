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
        last flow. A book that was changed since it was read has other counts and dates, and keeps them.
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
    return False
