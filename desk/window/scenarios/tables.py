"""The tables of a run by year: percentiles, checks, moments, and one path."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from desk.book import Measure, ModelName
from desk.book.arrays import FloatArray
from desk.scenarios.drawn_paths import DrawnPaths
from desk.scenarios.node_checks import FAR, NodeCheck, check_result
from desk.scenarios.records import Simulation
from desk.window.parts import numbers
from desk.window.parts.models import model_title
from desk.window.parts.tables import Column, Mark, Table
from desk.window.parts.theme import ThemeSwitch
from desk.window.scenarios.pictures import level_name
from desk.window.scenarios.quantities import Quantity

__all__ = [
    "ChecksTable",
    "MomentsTable",
    "PathTable",
    "PercentilesTable",
    "RunTable",
    "check_sentence",
    "run_sentence",
]

_SE = "standard error"
_CLOSED = "closed form"
_FAR_TEXT = f"More than {FAR:g} standard errors off: chance alone rarely gives that."


class RunTable(Table):
    """A table whose columns follow from the run."""

    def __init__(self, theme_switch: ThemeSwitch, *, name: str, description: str, empty: str = "") -> None:
        super().__init__(
            (Column("year", "Year"),),
            theme_switch,
            name=name,
            description=description,
            empty_text=empty or "Run the scenarios first.",
        )
        self._made: tuple[Column, ...] = ()

    def put(
        self,
        columns: Sequence[Column],
        data: dict[str, Any],
        marks: dict[tuple[int, str], Mark] | None = None,
        *,
        strong: Sequence[int] = (),
    ) -> None:
        """Show columns and rows."""
        if tuple(columns) != self._made:
            self._made = tuple(columns)
            self.set_columns(columns)
        self.set_rows(data, marks=marks, strong=strong)


class PercentilesTable(RunTable):
    """Mean, deviation and percentiles by year, with errors, tail means, intervals and the closed form."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="Percentiles by year",
            description="With standard errors; intervals are 95 %.",
        )

    def show_run(self, quantity: Quantity, *, in_full: bool) -> None:
        """Show a quantity; `in_full` with intervals, tail means and the closed form."""
        summary = quantity.summary
        closed = quantity.closed if in_full else None
        digits = 0 if quantity.kind == "money" else quantity.digits + 1
        unit = "% a year" if quantity.kind == "rate" else quantity.unit
        columns = [Column("year", "Year", "", "number", digits=_year_digits(summary.year))]
        data: dict[str, Any] = {"year": summary.year}

        def add(key: str, heading: str, beside: str, values: Any, tooltip: str = "") -> None:
            # Errors of a variance-reduced run are small.
            places = digits + 1 if key.endswith("_se") and quantity.kind != "money" else digits
            columns.append(
                Column(key, heading, beside or unit, quantity.kind, digits=places, tooltip=tooltip)
            )
            data[key] = values

        add("mean", "Mean", "", summary.mean)
        add("mean_se", "Mean", _SE, summary.mean_se)
        if closed is not None:
            add("mean_closed", "Mean", _CLOSED, closed.mean)
        add("sd", "Std deviation", "", summary.sd)
        add("sd_se", "Std deviation", _SE, summary.sd_se)
        if closed is not None:
            add("sd_closed", "Std deviation", _CLOSED, closed.sd)
        for place, level in enumerate(summary.levels):
            name = level_name(level)
            add(f"p{place}", name, "", summary.percentile[:, place])
            add(f"p{place}_se", name, _SE, summary.percentile_se[:, place])
            if in_full:
                add(f"p{place}_low", name, "95 % from", summary.percentile_low[:, place])
                add(f"p{place}_high", name, "95 % to", summary.percentile_high[:, place])
            if closed is not None:
                add(f"p{place}_closed", name, _CLOSED, closed.percentile[:, place])
            if in_full:
                side = "at and below it" if level < 50.0 else "at and above it"
                add(f"p{place}_tail", name, "tail mean", summary.tail_mean[:, place], f"Mean {side}.")
                add(f"p{place}_tail_se", name, "its error", summary.tail_mean_se[:, place])
        self.put(columns, data)


class ChecksTable(RunTable):
    """A discounted mean against what it should be, by year."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="Checks by year",
            description=f"Marked where the difference is more than {FAR:g} standard errors.",
        )

    def show_check(self, check: NodeCheck, curve: FloatArray | None) -> None:
        """Show a check; beside that of 1/R the discount factors of the model's curve."""
        distance = check.in_standard_errors
        columns = [
            Column("year", "Year", "", "number", digits=_year_digits(check.year)),
            Column("mean", check.title, "over the paths", "number", digits=6),
            Column("se", check.title, _SE, "number", digits=6),
            Column("expected", "Expected", "under the measure", "number", digits=6),
            Column("difference", "Difference", "", "number", digits=6, is_change=True),
            Column("errors", "Difference", "in standard errors", "number", digits=2, is_change=True),
            Column("verdict", "Verdict"),
        ]
        far = np.nan_to_num(np.abs(distance)) > FAR
        data: dict[str, Any] = {
            "year": check.year,
            "mean": check.mean,
            "se": check.se,
            "expected": check.expected,
            "difference": check.difference,
            "errors": distance,
            "verdict": [
                "–" if not known else "too far off" if off else "agrees"
                for known, off in zip(np.isfinite(distance), far, strict=True)
            ],
        }
        if curve is not None:
            columns.append(Column("curve", "Discount factor", "of the model's curve", "number", digits=6))
            data["curve"] = curve
        marks = {(int(row), "errors"): Mark(_FAR_TEXT, grave=True) for row in np.flatnonzero(far)}
        self.put(columns, data, marks)


class MomentsTable(RunTable):
    """The short rate against its law: mean, deviation and what one step keeps of a deviation."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="Moments of the short rate",
            description="Over the paths and in closed form; empty where none is known.",
        )

    def show_run(self, simulation: Simulation) -> None:
        """Show the moments of a run."""
        found, rate = simulation.diagnostics, simulation.short_rate
        if found is None:
            self.put([Column("year", "Year")], {"year": []})
            return
        unit = "% a year"
        columns = [
            Column("year", "Year", "", "number", digits=_year_digits(found.year)),
            Column("mean", "Mean", unit, "rate", digits=4),
            Column("mean_se", "Mean", _SE, "rate", digits=4),
            Column("mean_law", "Mean", _CLOSED, "rate", digits=4),
            Column("mean_off", "Mean", "in standard errors", "number", digits=2, is_change=True),
            Column("sd", "Std deviation", unit, "rate", digits=4),
            Column("sd_se", "Std deviation", _SE, "rate", digits=4),
            Column("sd_law", "Std deviation", _CLOSED, "rate", digits=4),
            Column("sd_off", "Std deviation", "in standard errors", "number", digits=2, is_change=True),
            Column(
                "auto",
                "Autocorrelation",
                "one step",
                "number",
                digits=5,
                tooltip="Slope of the rate (lognormal model: of its logarithm) on that one step before.",
            ),
            Column("auto_se", "Autocorrelation", _SE, "number", digits=5),
            Column("auto_law", "Autocorrelation", _CLOSED, "number", digits=5),
            Column("auto_off", "Autocorrelation", "in standard errors", "number", digits=2, is_change=True),
        ]
        data: dict[str, Any] = {"year": found.year}
        marks: dict[tuple[int, str], Mark] = {}
        for key, value, error, law in (
            ("mean", rate.mean, rate.mean_se, found.rate_mean),
            ("sd", rate.sd, rate.sd_se, found.rate_sd),
            ("auto", found.autoregression, found.autoregression_se, found.expected_autoregression),
        ):
            off = NodeCheck(key, key, found.year, value, error, law).in_standard_errors
            data |= {key: value, f"{key}_se": error, f"{key}_law": law, f"{key}_off": off}
            far = np.flatnonzero(np.nan_to_num(np.abs(off)) > FAR)
            marks |= {(int(row), f"{key}_off"): Mark(_FAR_TEXT, grave=True) for row in far}
        self.put(columns, data, marks)


class PathTable(RunTable):
    """One path, node by node."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="One path",
            description="What happens on the path chosen, node by node.",
            empty="Choose a path by its number, or click one in the picture where some are shown.",
        )

    def show_path(self, paths: DrawnPaths | None) -> None:
        """Show the first of some paths; None for none."""
        if paths is None:
            self.put([Column("year", "Year")], {"year": []})
            return
        columns = [
            Column("year", "Year", "", "number", digits=_year_digits(paths.time)),
            Column("mean_rate", "Mean short rate", "% a year since the node before", "rate", digits=4),
            Column("rate", "Short rate", "% a year", "rate", digits=4),
            Column("account", "Savings account", "of 1 unit", "number", digits=6),
            Column("discount", "1/R", "", "number", digits=6),
        ]
        account = paths.account[:, 0]
        with np.errstate(divide="ignore"):
            data: dict[str, Any] = {
                "year": paths.time,
                "mean_rate": np.append(np.nan, paths.mean_rate[:, 0]),
                "rate": paths.short_rate[:, 0],
                "account": account,
                "discount": 1.0 / account,
            }
        for place, name in enumerate(paths.asset_names):
            columns.append(Column(f"asset{place}", name, "of 1 unit", "number", digits=6))
            data[f"asset{place}"] = paths.assets[place, :, 0]
        if paths.price_index is not None:
            columns.append(Column("index", "Price index", "1 today", "number", digits=6))
            data["index"] = paths.price_index[:, 0]
        self.put(columns, data)


def _year_digits(years: FloatArray) -> int:
    """Decimals that years need."""
    return next((digits for digits in range(4) if np.allclose(np.round(years, digits), years)), 3)


def check_sentence(check: NodeCheck, simulation: Simulation) -> str:
    """The verdict on a check, in words."""
    found = check_result(check)
    if not found.nodes:
        return "There is nothing to check: no closed form is known, or there are too few paths."
    where = f"the farthest {numbers.number(found.worst, 1)} at year {numbers.exact(found.worst_year)}"
    among = f"{numbers.integer(found.nodes)} years" if found.nodes > 1 else "one year"
    if simulation.model == ModelName.OUTSIDE and check.key == "account":
        if not found.far:
            return (
                f"The set reprices the book's curve at all {among} within {FAR:g} standard errors, {where}."
            )
        return (
            f"The set does not reprice the book's curve: {numbers.integer(found.far)} of {among} are more "
            f"than {FAR:g} standard errors off, {where}. A set need not; its means are then no prices."
        )
    what = "the curve" if check.key == "account" else "what it should be"
    if simulation.measure is Measure.REAL_WORLD:
        what = "the closed form under the real-world measure"
    if not found.far:
        return f"Agrees with {what}: all {among} within {FAR:g} standard errors, {where}."
    return (
        f"Doubtful: {numbers.integer(found.far)} of {among} are more than {FAR:g} standard errors from "
        f"{what}, {where}. Run it with another seed, or more paths."
    )


def run_sentence(simulation: Simulation) -> str:
    """What a run was, in one line."""
    title = model_title(simulation.model)
    if simulation.model == ModelName.OUTSIDE:
        return (
            f"Shown: {numbers.integer(simulation.paths)} paths from outside over "
            f"{numbers.integer(simulation.horizon_years)} years."
        )
    return (
        f"Shown: {numbers.integer(simulation.paths)} paths of {title} over "
        f"{numbers.integer(simulation.horizon_years)} years, {simulation.measure} measure, "
        f"seed {numbers.exact(float(simulation.seed))}."
    )
