"""Shocks as plain objects for JSON and as plain-text tables."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from desk.book import Fault, MoveKind
from desk.report.as_json import fault_object
from desk.report.as_text import LINE_WIDTH, grouped, percent, printable, table
from desk.report.said_once import further_faults
from desk.report.wording import CAUTION
from desk.valuation.reverse import ReverseResult
from desk.valuation.reverse_rates import LeastMove
from desk.valuation.shock_records import Position, ShockResult, ShockTable, band_name

__all__ = ["Reached", "shocks_object", "shocks_text"]

_POSITION = ("assets", "liabilities", "surplus", "funding_ratio", "duration_gap", "dv01_gap")
_CHANGES = (
    "change_in_assets",
    "change_in_liabilities",
    "change_in_surplus",
    "change_in_funding_ratio",
    "estimated_change_in_assets",
    "estimated_change_in_liabilities",
    "estimated_change_in_surplus",
)
_LONGEST_NAME = 36
_MOST_NAMES = 6


@dataclass(frozen=True)
class Reached:
    """The moves of rates that bring the funding ratio to a level.

    Attributes
    ----------
    level : float
    parallel : ReverseResult
    least : tuple of LeastMove
        Under each covariance there is.
    faults : tuple of Fault
        What could not be found.
    """

    level: float
    parallel: ReverseResult
    least: tuple[LeastMove, ...]
    faults: tuple[Fault, ...]


def shocks_object(
    found: ShockTable, faults: Iterable[Fault] = (), *, reached: Reached | None = None
) -> dict[str, Any]:
    """A book under its shocks.

    Parameters
    ----------
    found : ShockTable
    faults : iterable of Fault
        Those of the reading; those of the shocks are added where they say something new.
    reached : Reached, optional

    Returns
    -------
    dict
        ``valuation_date``, ``currency``, ``base``, ``shocks`` (one object each, in order), ``thresholds``,
        ``parallel`` (by move in basis points), ``duration_gap_turns_at`` [basis points], ``faults``, and
        ``reached`` where that was asked for. Amounts are in the book's currency.
    """
    told = tuple(faults)
    profile = found.profile
    plain: dict[str, Any] = {
        "valuation_date": found.valuation_date.isoformat(),
        "currency": found.currency,
        "base": _position(found.base),
        "shocks": [_result(result, found.thresholds) for result in found.results],
        "thresholds": list(found.thresholds),
        "parallel": [
            dict(zip(("move", "surplus", "tangent", "funding_ratio", "duration_gap"), row, strict=True))
            for row in zip(
                *(
                    [finite(figure) for figure in column.tolist()]
                    for column in (
                        profile.move,
                        profile.surplus,
                        profile.tangent,
                        profile.funding_ratio,
                        profile.duration_gap,
                    )
                ),
                strict=True,
            )
        ],
        "duration_gap_turns_at": list(profile.gap_turns),
    }
    every = (*told, *further_faults(told, found.faults))
    if reached is not None:
        every = (*every, *further_faults(every, reached.faults))
        plain["reached"] = {
            "funding_ratio": reached.level,
            "parallel": [finite(scale) for scale in reached.parallel.scales],
            "least_moves": [
                {
                    "covariance": least.source,
                    "distance": finite(least.distance),
                    "moves": [
                        {"term": term, "move": finite(move)}
                        for term, move in zip(least.terms.tolist(), least.move.tolist(), strict=True)
                    ],
                }
                for least in reached.least
            ],
        }
    plain["faults"] = [fault_object(fault) for fault in every]
    return plain


def _position(position: Position) -> dict[str, float | None]:
    return {name: finite(getattr(position, name)) for name in _POSITION}


def _result(result: ShockResult, thresholds: tuple[float, ...]) -> dict[str, Any]:
    """One shock."""
    return {
        "name": result.name,
        "set": result.set_name,
        "source": result.source,
        **_position(result),
        **{name: finite(getattr(result, name)) for name in _CHANGES},
        "band": _band(result, thresholds),
        "moves": [
            {
                "move": move.kind.value,
                "size": move.size,
                "term": move.term,
                "applies_to": move.target,
            }
            for move in result.shock.moves
        ],
    }


def finite(figure: float) -> float | None:
    """A plain finite number, or None."""
    return figure if -float("inf") < figure < float("inf") else None


def _band(result: ShockResult, thresholds: tuple[float, ...]) -> str:
    """The band in a word; none where there is no funding ratio to judge."""
    return "" if finite(result.funding_ratio) is None else band_name(result.band, thresholds)


def shocks_text(found: ShockTable, *, title: str = "", reached: Reached | None = None) -> str:
    """A book under its shocks, as tables.

    Parameters
    ----------
    found : ShockTable
    title : str
        Of the book.
    reached : Reached, optional

    Returns
    -------
    str
    """
    currency = printable(found.currency)
    head = f"{printable(title)}, " if title else ""
    base = found.base
    rows = [
        (
            "As it stands",
            grouped(base.assets),
            grouped(base.liabilities),
            grouped(base.surplus),
            percent(base.funding_ratio, 2),
            "",
            "",
            "",
        )
    ]
    last_set = ""
    for result in found.results:
        if result.set_name != last_set:
            last_set = result.set_name
            rows.append((printable(last_set), "", "", "", "", "", "", ""))
        name = printable(result.name)
        rows.append(
            (
                name if len(name) <= _LONGEST_NAME else f"{name[: _LONGEST_NAME - 1]}…",
                grouped(result.assets),
                grouped(result.liabilities),
                grouped(result.surplus),
                percent(result.funding_ratio, 2),
                grouped(result.change_in_surplus),
                grouped(result.estimated_change_in_surplus),
                _band(result, found.thresholds),
            )
        )
    parts = [
        f"{head}shocks at {found.valuation_date.isoformat()}",
        table(
            (
                "Shock\n",
                f"Assets\n{currency}",
                f"Liabilities\n{currency}",
                f"Surplus\n{currency}",
                "Funding\nratio\n%",
                f"Change in\nsurplus\n{currency}",
                f"Estimated\nchange\n{currency}",
                "Band\n",
            ),
            rows,
        ),
        _wrapped(
            "Every shock is a full revaluation from where the book stands. The estimate beside it is by "
            "duration and convexity."
        ),
        _wrapped(_turns(found)),
        *_sources(found),
    ]
    if reached is not None:
        parts.append(_reached(reached))
    parts.append(_wrapped(CAUTION))
    return "\n\n".join(part for part in parts if part)


def _wrapped(text: str) -> str:
    """A paragraph in lines."""
    return "\n".join(textwrap.wrap(text, LINE_WIDTH))


def _turns(found: ShockTable) -> str:
    """Where the duration gap changes its sign."""
    low, high = found.profile.move[0], found.profile.move[-1]
    if not found.profile.gap_turns:
        return (
            f"The duration gap keeps its sign for parallel moves from {grouped(low)} to "
            f"{grouped(high)} basis points."
        )
    listed = ", ".join(grouped(move, 1) for move in found.profile.gap_turns)
    return f"The duration gap changes its sign at a parallel move of {listed} basis points."


def _sources(found: ShockTable) -> list[str]:
    """Each source once, after the sets or shocks that have it."""
    names: dict[str, dict[str, None]] = {}
    for result in found.results:
        if result.source:
            names.setdefault(result.source, {})[result.set_name or result.name] = None
    return [
        "\n".join(_wrapped(f"{_listed(list(own))}: {printable(source)}") for source, own in names.items())
    ]


def _listed(names: list[str]) -> str:
    """Names in words; of many the first few and how many more."""
    shown = [printable(name) for name in names[:_MOST_NAMES]]
    if len(names) > _MOST_NAMES:
        shown.append(f"{grouped(len(names) - _MOST_NAMES)} more")
    return shown[0] if len(shown) == 1 else f"{', '.join(shown[:-1])} and {shown[-1]}"


def _reached(reached: Reached) -> str:
    """The moves of rates that bring the funding ratio to a level."""
    lines = [f"Moves of rates that bring the funding ratio to {percent(reached.level, 2)} %"]
    if reached.parallel.scales:
        listed = ", ".join(grouped(scale, 2) for scale in reached.parallel.scales)
        lines.append(f"Parallel: {listed} basis points")
    for least in reached.least:
        away = f"Likeliest, {grouped(least.distance, 2)} standard deviations away"
        lines.append(_wrapped(f"{away} by {printable(least.source)}:"))
        moves = [] if least.shock is None else [m for m in least.shock.moves if m.kind is MoveKind.RATE]
        lines.append(
            table(
                ("Term\nyears", "Move\nbasis points"),
                [(grouped(move.term, 2), grouped(move.size, 2)) for move in moves],
                left=0,
            )
        )
    if len(lines) == 1:
        lines.append("None was found.")
    return "\n".join(lines)
