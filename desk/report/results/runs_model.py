"""The sheet of what was drawn: the model with its parameters, the measure and what it may be used for."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any

from desk.book import Book, ModelName, RatesModel
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, SheetPlan
from desk.report.results.runs_law import FactorCells
from desk.report.results.runs_tables import plan_notes
from desk.report.scenario_wording import checks_words, is_outside, measure_use, own_curve, run_label
from desk.report.wording import QUANTILE_METHOD
from desk.scenarios.records import Simulation
from desk.scenarios.suggestions import MODEL_ITEMS, VolatilityKind, volatility_kind

__all__ = ["PlannedModel", "plan_model"]

_ONE_FACTOR = (ModelName.VASICEK, ModelName.HO_LEE, ModelName.HULL_WHITE)
_VOLATILITY_UNITS = {
    VolatilityKind.ABSOLUTE: "a year, of the rate",
    VolatilityKind.ROOT: "a year, of the rate, times the root of the factor",
    VolatilityKind.RELATIVE: "a year, of the logarithm of the rate",
    VolatilityKind.NONE: "",
}
_UNITS = {
    "mean_reversion": ("a year", "years"),
    "second_mean_reversion": ("a year", "years"),
    "inflation_mean_reversion": ("a year", "years"),
    "long_run_rate": ("a year, continuous", "rate"),
    "starting_rate": ("a year, continuous", "rate"),
    "inflation_volatility": ("a year, of expected inflation", "rate"),
    "factor_correlation": ("-", "years"),
    "inflation_rate_correlation": ("-", "years"),
    "risk_price": ("real world only", "years"),
    "second_risk_price": ("real world only", "years"),
    "inflation_risk_price": ("real world only", "years"),
}


@dataclass(frozen=True, eq=False)
class PlannedModel:
    """The sheet and where the parameters of a model with one Gaussian factor stand; empty for others.

    Attributes
    ----------
    plan : SheetPlan
    mean_reversion, volatility, risk_price : str
        Addresses; `mean_reversion` is empty where rates do not revert.
    """

    plan: SheetPlan
    mean_reversion: str = ""
    volatility: str = ""
    risk_price: str = ""


def plan_model(book: Book | None, simulation: Simulation) -> PlannedModel:
    """Plan the sheet.

    Parameters
    ----------
    book : Book or None
        That was drawn; None where its parameters are not at hand.
    simulation : Simulation
    """
    plan = SheetPlan("Scenario model", "Scenarios: what was drawn", f"{run_label(simulation)}.")
    plan.widths = {1: 34.0, 2: 22.0, 3: 42.0}
    plan.headings(["Item", "Value"])
    plan.put(HEADING_ROW, 3, "Unit", "heading_unit")
    stated = None if book is None else book.rates_model
    if stated is not None and str(stated.name) != simulation.model:
        stated = None
    rows: list[tuple[str, str, Any, str, str, str]] = [
        ("", "Model", simulation.model, "", "reported", "word")
    ]
    if stated is not None:
        rows += [
            (name, name.replace("_", " ").capitalize(), value, unit, "input", form)
            for name, value, unit, form in _parameters(stated, simulation)
        ]
    rows += [("", *row) for row in _settings(simulation)]
    places: dict[str, str] = {}
    row = FIRST_ROW
    for name, label, value, unit, role, form in rows:
        plan.put(row, 1, label, "text")
        address = plan.put(row, 2, value, role, form)
        plan.put(row, 3, unit, "unit")
        if name:
            places[name] = address
        row += 1
    row += 1
    for heading, text in _sentences(simulation):
        plan.put(row, 1, heading, "heading_left")
        row = plan_notes(plan, row + 1, text)
    if stated is None or stated.name not in _ONE_FACTOR:
        return PlannedModel(plan)
    speed = 0.0 if stated.mean_reversion is None or stated.name is ModelName.HO_LEE else stated.mean_reversion
    if not FactorCells.serves(speed):
        return PlannedModel(plan)
    return PlannedModel(
        plan, places["mean_reversion"] if speed else "", places["volatility"], places["risk_price"]
    )


def _parameters(stated: RatesModel, simulation: Simulation) -> list[tuple[str, Any, str, str]]:
    """Name, value, unit and format of what a model was drawn with."""
    names = list(MODEL_ITEMS[stated.name])
    if names:
        names.append("risk_price")
    if stated.name is ModelName.GAUSSIAN_2:
        names.append("second_risk_price")
    if simulation.index is not None:
        names += [field.name for field in fields(stated) if field.name.startswith("inflation_")]
    if simulation.risky is not None and simulation.risky.mended is not None:
        names.append("mend_correlation")
    found: list[tuple[str, Any, str, str]] = []
    for name in names:
        value = getattr(stated, name)
        if name == "mend_correlation":
            found.append((name, "yes" if value else "no", "", "word"))
        elif value is not None:
            unit, form = _UNITS.get(name, (_VOLATILITY_UNITS[volatility_kind(stated.name)], "rate"))
            found.append((name, value, unit, form))
    return found


def _settings(simulation: Simulation) -> list[tuple[str, Any, str, str, str]]:
    """Label, value, unit, role and format of how the paths were drawn."""
    settings = dict(simulation.provenance.settings)
    horizon = float(simulation.savings_account.year[-1])
    rows: list[tuple[str, Any, str, str, str]] = []
    if not is_outside(simulation) or simulation.risky is not None:
        rows += [
            ("Measure", simulation.measure.value, "", "reported", "word"),
            ("Seed", str(simulation.seed), "", "reported", "word"),
        ]
    rows += [
        ("Paths", simulation.paths, "", "reported", "whole"),
        ("Steps a year", simulation.steps_per_year, "", "reported", "whole"),
        ("Horizon", horizon, "years", "reported", "term"),
        ("Sampling", settings.get("sampling", "plain"), "", "reported", "word"),
    ]
    if "bridge" in settings:
        rows.append(("Bridge", settings["bridge"], "", "reported", "word"))
    if "moment_matching" in settings:
        rows.append(("Moment matching", settings["moment_matching"], "", "reported", "word"))
    if simulation.replicates > 1:
        rows.append(("Replicates", simulation.replicates, "of equally many paths each", "reported", "whole"))
    if "surface_error" in settings:
        error = float(settings["surface_error"])
        rows.append(("Error of the fitted values", error, "as a part of the value", "reported", "tiny"))
    return rows


def _sentences(simulation: Simulation) -> list[tuple[str, str]]:
    """What stands below the items, under headings."""
    found = [
        ("What these figures may be used for", measure_use(simulation)),
        ("Curve", own_curve(simulation)),
        ("Means that are known beforehand", checks_words(simulation)),
    ]
    if simulation.risky is not None:
        found.append(("Risky assets", simulation.risky.counted))
    if simulation.index is not None:
        found.append(("Price index", simulation.index.revalued))
    found.append(("Percentiles", QUANTILE_METHOD))
    return found
