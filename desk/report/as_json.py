"""Results as plain objects for JSON: text, truth values, finite numbers, lists; nothing else.

A number that is not finite becomes None, which JSON writes as ``null``.
"""

from __future__ import annotations

import json
from collections.abc import Iterable
from typing import Any

from desk.book import Book, Fault
from desk.intake.records import Reading
from desk.report.as_sampling import convergence_objects, gain_objects, sampling_object
from desk.report.as_scenarios import (
    diagnostics_object,
    levels_object,
    price_index_object,
    risky_assets_object,
    summary_rows,
)
from desk.report.basis_objects import (
    curve_object,
    inflation_object,
    liability_basis_object,
    line_objects,
)
from desk.report.plain_numbers import percentile_name, plain_number, plain_rows
from desk.report.said_once import further_faults
from desk.scenarios.records import Distribution, Simulation
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


def standing_object(
    standing: Standing,
    faults: Iterable[Fault] = (),
    *,
    book: Book | None = None,
    second: Standing | None = None,
) -> dict[str, Any]:
    """A standing.

    Parameters
    ----------
    standing : Standing
    faults : iterable of Fault
        Those of the reading; the standings' own are added where they say something new.
    book : Book, optional
        That was valued. With it the curve, the basis of the liabilities and the terms of the lines are said;
        without it they are None.
    second : Standing, optional
        On the second basis of the book.

    Returns
    -------
    dict
        Rates and durations in years or per year, amounts in the book's currency, nothing rounded. The keys
        are the same for every book; what a book does not have is None. Under ``second_basis`` stand the keys
        of a standing but for the faults, and ``differences``: the first basis less the second.
    """
    found = _position(standing, book)
    found["second_basis"] = None
    told = _together(faults, standing.faults)
    if second is not None:
        found["second_basis"] = {
            **_position(second, None if book is None else book.on_second_basis),
            "differences": _differences(standing, second),
        }
        told = (*told, *further_faults(told, second.faults))
    found["faults"] = [fault_object(fault) for fault in told]
    return found


def _position(standing: Standing, book: Book | None) -> dict[str, Any]:
    """A standing on one basis, without its faults."""
    keys = standing.key_rates
    periods = standing.periods
    further = line_objects(book, standing)
    return {
        "valuation_date": standing.valuation_date.isoformat(),
        "currency": standing.currency,
        "assets": _measures(standing.assets),
        "liabilities": _measures(standing.liabilities),
        "surplus": plain_number(standing.surplus),
        "funding_ratio": plain_number(standing.funding_ratio),
        "duration_gap": plain_number(standing.duration_gap),
        "dv01_gap": plain_number(standing.dv01_gap),
        "redington": {condition.name: bool(condition.holds) for condition in standing.redington},
        "key_rates": plain_rows(
            term=keys.term,
            assets=keys.assets,
            liabilities=keys.liabilities,
            dv01_assets=keys.dv01_assets,
            dv01_liabilities=keys.dv01_liabilities,
        ),
        "lines": [_line(line) | of_line for line, of_line in zip(standing.lines, further, strict=True)],
        "periods": plain_rows(
            year=periods.year,
            assets=periods.assets,
            liabilities=periods.liabilities,
            net=periods.net,
            cumulative=periods.cumulative,
        ),
        "curve": None if book is None else curve_object(book.basis),
        "liability_basis": None if book is None else liability_basis_object(book.basis, standing),
        "inflation": inflation_object(standing.inflation),
    }


def _differences(first: Standing, second: Standing) -> dict[str, Any]:
    """Each figure on the first basis less that on the second."""

    def less(of: Any, other: Any, names: Iterable[str]) -> dict[str, float | int | None]:
        return {name: plain_number(getattr(of, name) - getattr(other, name)) for name in names}

    return {
        "assets": less(first.assets, second.assets, MEASURE_NAMES),
        "liabilities": less(first.liabilities, second.liabilities, MEASURE_NAMES),
        **less(first, second, ("surplus", "funding_ratio", "duration_gap", "dv01_gap")),
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
        Years in years, rates continuously compounded per year, amounts in the book's currency, nothing
        rounded. The keys are the same for every run; what a run does not have is None.
    """
    check = simulation.repricing
    return {
        "paths": simulation.paths,
        "steps_per_year": simulation.steps_per_year,
        "seed": simulation.seed,
        "measure": simulation.measure.value,
        "model": str(simulation.model),
        "savings_account": summary_rows(
            simulation.savings_account,
            closed=simulation.closed_form,
            has_law=True,
            mean_discount=check.mean_discount,
            mean_discount_se=check.mean_discount_se,
            curve_discount=check.curve_discount,
            expected_discount=check.expected_discount,
        ),
        "short_rate": summary_rows(simulation.short_rate),
        "present_value": {side.name: _distribution(side) for side in simulation.present_value},
        "risky_assets": risky_assets_object(simulation.risky),
        "price_index": price_index_object(simulation.index),
        "diagnostics": diagnostics_object(simulation),
        "sampling": sampling_object(simulation),
        "convergence": convergence_objects(simulation),
        "gains": gain_objects(simulation),
        "faults": [fault_object(fault) for fault in _together(faults, simulation.faults)],
    }


def _together(told: Iterable[Fault], found: Iterable[Fault]) -> tuple[Fault, ...]:
    """The faults of a reading, and those of a result that say something new."""
    told = tuple(told)
    return (*told, *further_faults(told, found))


def _measures(measures: Measures) -> dict[str, float | int | None]:
    """The measures of one side."""
    return {name: plain_number(getattr(measures, name)) for name in MEASURE_NAMES}


def _line(line: LineStanding) -> dict[str, Any]:
    """One line of one side."""
    return {
        "side": line.side.value,
        "line": line.line,
        "present_value": plain_number(line.measures.present_value),
        "effective_duration": plain_number(line.measures.effective_duration),
        "spread": plain_number(line.spread),
        "spread_duration": plain_number(line.spread_duration),
        "expected_credit_loss": plain_number(line.expected_credit_loss),
    }


def _distribution(side: Distribution) -> dict[str, Any]:
    """The pathwise present value of one side."""
    by_level = ("percentile_se", "percentile_low", "percentile_high", "tail_mean", "tail_mean_se")
    return {
        "mean": plain_number(side.mean),
        "se": plain_number(side.se),
        "sd": plain_number(side.sd),
        **levels_object(side.levels, side.percentile),
        "curve": plain_number(side.curve),
        "below_zero": plain_number(side.below_zero),
        "below_zero_se": plain_number(side.below_zero_se),
        **{name: levels_object(side.levels, getattr(side, name)) for name in by_level},
    }
