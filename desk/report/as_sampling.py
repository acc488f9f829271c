"""How a run was sampled and how far its figures can be trusted, as an object and as text."""

from __future__ import annotations

import math
from typing import Any

from desk.report.plain_numbers import plain_number, plain_rows
from desk.report.text_tables import grouped, percent, printable, table, wrapped
from desk.scenarios.records import Simulation
from desk.scenarios.sampling_records import Convergence, SamplingGain

__all__ = ["convergence_objects", "gain_objects", "sampling_object", "sampling_text"]


def sampling_object(simulation: Simulation) -> dict[str, Any]:
    """How a run was sampled.

    Parameters
    ----------
    simulation : Simulation

    Returns
    -------
    dict
        `method` (plain, antithetic, sobol), `bridge` (None without Sobol points), `moment_matching`,
        `replicates` (1 for independent paths).
    """
    stated = dict(simulation.provenance.settings)
    return {
        "method": stated.get("sampling", "plain"),
        "bridge": stated.get("bridge"),
        "moment_matching": "moment_matching" in stated,
        "replicates": simulation.replicates,
    }


def convergence_objects(simulation: Simulation) -> list[dict[str, Any]] | None:
    """The headline figures after part of the paths; None where they were not followed."""
    return [_convergence(one) for one in simulation.convergence] or None


def gain_objects(simulation: Simulation) -> list[dict[str, Any]] | None:
    """Gains over plain sampling; None for a plain run."""
    return [_gain(one) for one in simulation.gains] if simulation.replicates > 1 else None


def _convergence(settled: Convergence) -> dict[str, Any]:
    rows = plain_rows(
        paths=settled.paths, value=settled.value, se=settled.se, low=settled.low, high=settled.high
    )
    return {"figure": settled.figure, "is_money": settled.is_money, "parts": rows}


def _gain(gain: SamplingGain) -> dict[str, Any]:
    numbers = {name: plain_number(getattr(gain, name)) for name in ("plain_se", "se", "gain", "low", "high")}
    return {"figure": gain.figure, **numbers}


def sampling_text(simulation: Simulation, *, currency: str) -> str:
    """Tail means, convergence and gains of a run as tables."""
    blocks = [
        "Means beyond the percentiles, at and below those under 50 %, at and above the others\n"
        + _tail_table(simulation, printable(currency)),
        "Headline figures after part of the paths, with their 95 % intervals\n"
        + _convergence_table(simulation, printable(currency)),
    ]
    if simulation.replicates > 1:
        if simulation.gains:
            blocks.append("Gain over plain sampling with as many paths\n" + _gain_table(simulation))
        blocks.append(
            wrapped(
                f"The paths are shared among {simulation.replicates} independent replicates, within which "
                "they depend on each other. Standard errors and intervals come from the spread of the "
                "replicates, by Student's law; a gain is the ratio of variances, and plain sampling would "
                "need as many times more paths."
            )
        )
    return "\n\n".join(blocks)


def _tail_table(simulation: Simulation, currency: str) -> str:
    sides = simulation.present_value
    rows = []
    for number, level in enumerate(sides[0].levels if sides else ()):
        pairs = [(float(side.tail_mean[number]), float(side.tail_mean_se[number])) for side in sides]
        rows.append((f"{level:g} %", *(grouped(figure) for pair in pairs for figure in pair)))
    headings = [heading for side in sides for heading in (side.name.capitalize(), "Standard\nerror")]
    return table((f"Beyond [{currency}]", *headings), rows)


def _convergence_table(simulation: Simulation, currency: str) -> str:
    rows = []
    for settled in simulation.convergence:
        unit = currency if settled.is_money else "%" if "chance" in settled.figure else ""
        for number, paths in enumerate(settled.paths.tolist()):
            columns = (settled.value, settled.se, settled.low, settled.high)
            figures = [_shown(float(column[number]), unit, settled.is_money) for column in columns]
            first = (settled.figure.capitalize(), unit) if number == 0 else ("", "")
            rows.append((*first, f"{paths:,}", *figures))
    return table(("Figure", "Unit", "Paths", "Value", "Standard\nerror", "From", "To"), rows, left=2)


def _shown(value: float, unit: str, is_money: bool) -> str:
    if is_money:
        return grouped(value)
    return percent(value, 2) if unit == "%" else grouped(value, 5)


def _gain_table(simulation: Simulation) -> str:
    rows = [
        (gain.figure.capitalize(), *(_times(value) for value in (gain.gain, gain.low, gain.high)))
        for gain in simulation.gains
    ]
    return table(("Figure", "Times", "From", "To"), rows)


def _times(value: float) -> str:
    return "no error left" if math.isinf(value) else grouped(value, 1)
