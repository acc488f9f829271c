"""Results as plain objects for JSON: text, truth values, finite numbers, lists; nothing else.

A number that is not finite becomes None, which JSON writes as ``null``.
"""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Sequence
from typing import Any

from desk.book import Fault
from desk.intake.records import Reading
from desk.report.said_once import further_faults
from desk.scenarios.records import Distribution, NodeSummary, Simulation
from desk.valuation.records import LineStanding, Measures, Standing

__all__ = ["check_object", "fault_object", "percentile_name", "simulation_object", "standing_object", "text"]

MEASURE_NAMES = (
    "present_value",
    "equivalent_rate",
    "macaulay_duration",
    "modified_duration",
    "effective_duration",
    "convexity",
    "dispersion",
    "dv01",
)


def text(value: object) -> str:
    """One JSON object as text.

    Raises
    ------
    ValueError
        If a number in it is not finite.
    """
    return json.dumps(value, allow_nan=False, indent=2)


def percentile_name(level: float) -> str:
    """The key of a percentile: ``p05`` for 5, ``p97.5`` for 97.5."""
    whole, _, part = repr(float(level)).partition(".")
    return f"p{whole:>02}" if part == "0" else f"p{whole:>02}.{part}"


def fault_object(fault: Fault) -> dict[str, str]:
    """One fault, with the place it stands at."""
    return {
        "sheet": fault.sheet,
        "cell": fault.cell,
        "found": fault.found,
        "expected": fault.expected,
        "mend": fault.mend,
        "severity": fault.severity.value,
    }


def check_object(reading: Reading) -> dict[str, Any]:
    """What reading a book gave.

    Parameters
    ----------
    reading : Reading

    Returns
    -------
    dict
        ``book`` (``file``, ``sha256`` of its bytes, ``digest`` of its contents or None, and how many
        rows of each kind it holds), ``usable`` and ``faults``.
    """
    book = reading.book
    return {
        "book": {
            "file": reading.path.name,
            "sha256": reading.sha256,
            "digest": None if book is None else book.digest,
            "liability_flows": None if book is None else len(book.liabilities),
            "holdings": None if book is None else len(book.holdings),
            "asset_flows": None if book is None else len(book.asset_flows),
        },
        "usable": book is not None,
        "faults": [fault_object(fault) for fault in reading.faults],
    }


def standing_object(standing: Standing, faults: Iterable[Fault] = ()) -> dict[str, Any]:
    """A standing.

    Parameters
    ----------
    standing : Standing
    faults : iterable of Fault
        Those of the reading; the standing's own are added where they say something new.

    Returns
    -------
    dict
        Rates and durations in years or per year, amounts in the book's currency, nothing rounded.
    """
    keys = standing.key_rates
    periods = standing.periods
    return {
        "valuation_date": standing.valuation_date.isoformat(),
        "currency": standing.currency,
        "assets": _measures(standing.assets),
        "liabilities": _measures(standing.liabilities),
        "surplus": _number(standing.surplus),
        "funding_ratio": _number(standing.funding_ratio),
        "duration_gap": _number(standing.duration_gap),
        "dv01_gap": _number(standing.dv01_gap),
        "redington": {condition.name: bool(condition.holds) for condition in standing.redington},
        "key_rates": _rows(
            term=keys.term,
            assets=keys.assets,
            liabilities=keys.liabilities,
            dv01_assets=keys.dv01_assets,
            dv01_liabilities=keys.dv01_liabilities,
        ),
        "lines": [_line(line) for line in standing.lines],
        "periods": _rows(
            year=periods.year,
            assets=periods.assets,
            liabilities=periods.liabilities,
            net=periods.net,
            cumulative=periods.cumulative,
        ),
        "faults": [fault_object(fault) for fault in _together(faults, standing.faults)],
    }


def simulation_object(simulation: Simulation, faults: Iterable[Fault] = ()) -> dict[str, Any]:
    """A run.

    Parameters
    ----------
    simulation : Simulation
    faults : iterable of Fault
        Those of the reading; the run's own are added where they say something new.

    Returns
    -------
    dict
        Years in years, rates continuously compounded per year, amounts in the book's currency.
    """
    check = simulation.repricing
    return {
        "paths": simulation.paths,
        "steps_per_year": simulation.steps_per_year,
        "seed": simulation.seed,
        "measure": simulation.measure.value,
        "model": str(simulation.model),
        "savings_account": _summary(
            simulation.savings_account,
            mean_discount=check.mean_discount,
            mean_discount_se=check.mean_discount_se,
            curve_discount=check.curve_discount,
        ),
        "short_rate": _summary(simulation.short_rate),
        "present_value": {side.name: _distribution(side) for side in simulation.present_value},
        "faults": [fault_object(fault) for fault in _together(faults, simulation.faults)],
    }


def _together(told: Iterable[Fault], found: Iterable[Fault]) -> tuple[Fault, ...]:
    """The faults of a reading, and those of a result that say something new."""
    told = tuple(told)
    return (*told, *further_faults(told, found))


def _number(value: Any) -> float | int | None:
    """A plain finite number, or None."""
    if value is None:
        return None
    plain = value.item() if hasattr(value, "item") else value
    if isinstance(plain, int):
        return int(plain)
    return float(plain) if math.isfinite(plain) else None


def _measures(measures: Measures) -> dict[str, float | int | None]:
    """The measures of one side."""
    return {name: _number(getattr(measures, name)) for name in MEASURE_NAMES}


def _line(line: LineStanding) -> dict[str, Any]:
    """One line of one side."""
    return {
        "side": line.side.value,
        "line": line.line,
        "present_value": _number(line.measures.present_value),
        "effective_duration": _number(line.measures.effective_duration),
        "spread": _number(line.spread),
        "spread_duration": _number(line.spread_duration),
        "expected_credit_loss": _number(line.expected_credit_loss),
    }


def _rows(**columns: Sequence[Any] | Any) -> list[dict[str, float | int | None]]:
    """Columns of one length as one object a row."""
    return [
        {name: _number(value) for name, value in zip(columns, row, strict=True)}
        for row in zip(*columns.values(), strict=True)
    ]


def _summary(summary: NodeSummary, **further: Any) -> list[dict[str, float | int | None]]:
    """A quantity by year: mean, standard deviation, percentiles, and what stands beside them."""
    percentiles = {
        percentile_name(level): summary.percentile[:, index] for index, level in enumerate(summary.levels)
    }
    return _rows(year=summary.year, mean=summary.mean, sd=summary.sd, **percentiles, **further)


def _distribution(side: Distribution) -> dict[str, float | int | None]:
    """The pathwise present value of one side."""
    percentiles = {
        percentile_name(level): _number(value)
        for level, value in zip(side.levels, side.percentile, strict=True)
    }
    return {
        "mean": _number(side.mean),
        "se": _number(side.se),
        "sd": _number(side.sd),
        **percentiles,
        "curve": _number(side.curve),
    }
