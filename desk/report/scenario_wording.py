"""Words of a run: what was drawn, and what it may be used for."""

from __future__ import annotations

from desk.book import Measure, ModelName
from desk.report.known_means import judged
from desk.scenarios.node_checks import FAR, node_checks
from desk.scenarios.records import Simulation

__all__ = [
    "MEASURE_USES",
    "OUTSIDE_SET",
    "checks_words",
    "far_chance",
    "is_outside",
    "measure_use",
    "own_curve",
    "run_label",
]

MEASURE_USES = {
    Measure.PRICING: "For values: what flows are worth. Every asset earns the short rate on average; it is "
    "no forecast.",
    Measure.REAL_WORLD: "For forecasts: what may happen, with prices of risk and premiums. Its averages are "
    "no prices.",
}

OUTSIDE_SET = (
    "The paths are those of the book's set of scenarios, as it states them: no model of rates was drawn, and "
    "seed and measure do not apply to the rates. The set need not reprice the book's curve: the check of 1/R "
    "shows how far it is from it. Flows after its last node are discounted from there by the book's curve."
)

_OWN_CURVE = (ModelName.VASICEK, ModelName.CIR)


def is_outside(simulation: Simulation) -> bool:
    """Whether the rates of a run are a set of scenarios from outside."""
    return simulation.model == ModelName.OUTSIDE


def measure_use(simulation: Simulation) -> str:
    """What the figures of a run may be used for."""
    if is_outside(simulation):
        return "For what the set was made for: whether it is one of prices or of forecasts, its maker says."
    return MEASURE_USES[simulation.measure]


def own_curve(simulation: Simulation) -> str:
    """Which curve the rates of a run are about, in a sentence."""
    if is_outside(simulation):
        return OUTSIDE_SET
    if simulation.model in _OWN_CURVE:
        return "The model makes a curve of its own, which is not the book's: present values are on that one."
    return "The model is fitted to the book's curve and reprices it exactly."


def run_label(simulation: Simulation, *, horizon: str = "") -> str:
    """What was drawn, in one sentence without its stop; `horizon` in words is told where it is given."""
    over = f" over {horizon}" if horizon else ""
    paths = f"{simulation.paths:,} {'path' if simulation.paths == 1 else 'paths'}"
    steps = f"{simulation.steps_per_year} {'step' if simulation.steps_per_year == 1 else 'steps'} a year"
    drawn = f"{simulation.measure} measure, seed {simulation.seed}"
    if is_outside(simulation):
        label = f"{paths} of the book's own set of scenarios{over}, about {steps}"
        return label if simulation.risky is None else f"{label}; risky assets drawn beside them, {drawn}"
    return f"{paths} of {simulation.model}{over}, {steps}, {drawn}"


def far_chance(simulation: Simulation) -> str:
    """How often chance alone puts a mean further than 3 standard errors off, in words: Student's law."""
    from scipy.special import stdtr

    apart = simulation.replicates if simulation.replicates > 1 else simulation.paths
    chance = 2.0 * float(stdtr(max(apart - 1, 1), -FAR))
    return f"once in {1.0 / chance:.0f} times by chance alone"


def checks_words(simulation: Simulation) -> str:
    """How the means turned out that are known beforehand, in a sentence."""
    found = [judged(check) for check in node_checks(simulation)]
    nodes, far = sum(each.nodes for each in found), sum(each.far for each in found)
    if nodes == 0:
        return "No mean of this run is known beforehand."
    if far == 0:
        return f"All {nodes:,} means that are known beforehand lie within 3 standard errors."
    return (
        f"{far:,} of {nodes:,} means that are known beforehand lie further than 3 standard errors off, as "
        f"happens {far_chance(simulation)}."
    )
