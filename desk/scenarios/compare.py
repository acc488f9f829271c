"""Several models, or both measures, on the same book by the same run."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

from desk.book import Book, Measure, ModelName, PricedFlows, RatesModel
from desk.scenarios.models import missing_titles
from desk.scenarios.records import Simulation
from desk.scenarios.simulation import simulate
from desk.scenarios.suggestions import VolatilityKind, volatility_kind

__all__ = ["ModelRun", "compare_measures", "compare_models"]


@dataclass(frozen=True)
class ModelRun:
    """One model of a comparison.

    Attributes
    ----------
    model : ModelName
    simulation : Simulation or None
        None where the model cannot be drawn.
    problem : str
        Why it cannot; empty where it can.
    """

    model: ModelName
    simulation: Simulation | None
    problem: str


def compare_models(
    book: Book,
    models: Sequence[ModelName | RatesModel],
    assets: PricedFlows,
    liabilities: PricedFlows,
    *,
    progress: Callable[[float], None] | None = None,
    threads: int | None = None,
) -> tuple[ModelRun, ...]:
    """Draw several models on the same book with the same settings of the run.

    Parameters
    ----------
    book : Book
    models : sequence of ModelName or RatesModel
        A name takes the parameters that the book states; what the book's own model calls its volatility
        serves another only where it means the same.
    assets, liabilities, progress, threads
        See `desk.scenarios.simulation.simulate`.

    Returns
    -------
    tuple of ModelRun
        In the order asked for. A model that cannot be drawn says why, and the others are drawn.
    """
    runs = []
    for number, asked in enumerate(models):
        report = None if progress is None else _part(progress, number, len(models))
        name = asked.name if isinstance(asked, RatesModel) else ModelName(asked)
        stated, problem = (asked, "") if isinstance(asked, RatesModel) else _stated(book, name)
        simulation = None
        if not problem and (missing := missing_titles(stated)):
            wants = "it" if len(missing) == 1 else "them"
            problem = f"{', '.join(missing)} missing: the {name} model needs {wants}"
        if not problem:
            try:
                simulation = simulate(
                    replace(book, rates_model=stated), assets, liabilities, progress=report, threads=threads
                )
            except ValueError as error:
                problem = str(error)
        if simulation is None and report is not None:
            report(1.0)
        runs.append(ModelRun(name, simulation, problem))
    return tuple(runs)


def _stated(book: Book, name: ModelName) -> tuple[RatesModel, str]:
    """A model with the parameters of the book, and why they will not do."""
    own = book.rates_model
    if own is None:
        return RatesModel(name), ""
    kind, other = volatility_kind(name), volatility_kind(own.name)
    if VolatilityKind.NONE not in (kind, other) and kind is not other and own.volatility is not None:
        return own, (
            f"Volatility is stated for the {own.name} model, where it means something else than in the "
            f"{name} model: state the parameters of that"
        )
    return replace(own, name=name), ""


def compare_measures(
    book: Book,
    assets: PricedFlows,
    liabilities: PricedFlows,
    *,
    progress: Callable[[float], None] | None = None,
    threads: int | None = None,
) -> tuple[Simulation, Simulation]:
    """Draw the book's model under the pricing and under the real-world measure, from the same numbers.

    Raises
    ------
    ValueError
        As `desk.scenarios.simulation.simulate`.
    """
    pricing, real_world = (
        simulate(
            replace(book, run=replace(book.run, measure=measure)),
            assets,
            liabilities,
            progress=None if progress is None else _part(progress, number, 2),
            threads=threads,
        )
        for number, measure in enumerate((Measure.PRICING, Measure.REAL_WORLD))
    )
    return pricing, real_world


def _part(progress: Callable[[float], None], number: int, count: int) -> Callable[[float], None]:
    """Progress of one of several runs."""
    return lambda done: progress((number + done) / count)
