"""The tables of a run: percentiles by year, the repricing check, present values."""

from __future__ import annotations

from typing import Any

import numpy as np

from desk.scenarios.records import Simulation
from desk.scenarios.shapes import repricing_error
from desk.window.parts import numbers
from desk.window.parts.models import model_title
from desk.window.parts.tables import Column, Kind, Mark, Table
from desk.window.parts.theme import ThemeSwitch
from desk.window.scenarios.pictures import level_name

__all__ = ["TOO_FAR", "PercentilesTable", "RepricingTable", "ValuesTable", "run_sentence"]

TOO_FAR = 3.0
"""A check further off than this many standard errors is marked."""

_SE = "standard error"


class _Tabled(Table):
    """A table whose columns follow from the run."""

    def __init__(self, theme_switch: ThemeSwitch, *, name: str, description: str) -> None:
        super().__init__(
            (Column("year", "Year"),),
            theme_switch,
            name=name,
            description=description,
            empty_text="Run the scenarios first.",
        )
        self._made: tuple[Column, ...] = ()

    def _put(self, columns: list[Column], data: dict[str, Any], marks: dict[Any, Mark] | None = None) -> None:
        if tuple(columns) != self._made:
            self._made = tuple(columns)
            self.set_columns(columns)
        self.set_rows(data, marks=marks)


class PercentilesTable(_Tabled):
    """Mean, deviation and percentiles by year, with errors, intervals and the closed form."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="Percentiles by year",
            description="Intervals are those of order statistics, 95 %.",
        )

    def show_run(self, simulation: Simulation, quantity: str, *, in_full: bool) -> None:
        """Show the ``account`` or the ``rate``; `in_full` with intervals and the closed form."""
        is_account = quantity == "account"
        summary = simulation.savings_account if is_account else simulation.short_rate
        closed = simulation.closed_form if is_account and in_full else None
        kind: Kind = "number" if is_account else "rate"
        digits = 4 if is_account else 3
        columns = [Column("year", "Year", "", "number", digits=0)]
        data: dict[str, Any] = {"year": summary.year}

        def add(key: str, heading: str, unit: str, values: Any) -> None:
            plain = unit or ("" if is_account else "% a year")
            columns.append(Column(key, heading, plain, kind, digits=digits))
            data[key] = values

        add("mean", "Mean", "", summary.mean)
        add("mean_se", "Mean", _SE, summary.mean_se)
        if closed is not None:
            add("mean_closed", "Mean", "closed form", closed.mean)
        add("sd", "Std deviation", "", summary.sd)
        add("sd_se", "Std deviation", _SE, summary.sd_se)
        if closed is not None:
            add("sd_closed", "Std deviation", "closed form", closed.sd)
        for place, level in enumerate(summary.levels):
            name = level_name(level)
            add(f"p{place}", name, "", summary.percentile[:, place])
            if in_full:
                add(f"p{place}_low", name, "95 % from", summary.percentile_low[:, place])
                add(f"p{place}_high", name, "95 % to", summary.percentile_high[:, place])
            if closed is not None:
                add(f"p{place}_closed", name, "closed form", closed.percentile[:, place])
        self._put(columns, data)


class RepricingTable(_Tabled):
    """The mean of ``1/R`` against what it should be, by year."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="Repricing check",
            description=f"Marked where the difference is more than {TOO_FAR:g} standard errors.",
        )

    def show_run(self, simulation: Simulation) -> None:
        """Show the check of a run."""
        check, error = simulation.repricing, repricing_error(simulation.repricing)
        columns = [
            Column("year", "Year", "", "number", digits=0),
            Column("mean", "Mean of 1/R", "", "number", digits=6),
            Column("se", "Mean of 1/R", _SE, "number", digits=6),
            Column("expected", "Expected", "under the measure", "number", digits=6),
            Column("difference", "Difference", "", "number", digits=6, is_change=True),
            Column("errors", "Difference", "in standard errors", "number", digits=2, is_change=True),
            Column("curve", "Discount factor", "of the model's curve", "number", digits=6),
        ]
        far = np.flatnonzero(np.nan_to_num(np.abs(error.in_standard_errors)) > TOO_FAR)
        marks = {
            (int(row), "errors"): Mark(
                f"More than {TOO_FAR:g} standard errors off: chance alone rarely gives that.", grave=True
            )
            for row in far
        }
        data = {
            "year": check.year,
            "mean": check.mean_discount,
            "se": check.mean_discount_se,
            "expected": check.expected_discount,
            "difference": error.difference,
            "errors": error.in_standard_errors,
            "curve": check.curve_discount,
        }
        self._put(columns, data, marks)


class ValuesTable(_Tabled):
    """Present values along the paths."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            theme_switch,
            name="Present values along the paths",
            description="Intervals are those of order statistics, 95 %.",
        )

    def show_run(self, simulation: Simulation, currency: str, *, in_full: bool) -> None:
        """Show the present values; `in_full` with the intervals of their percentiles."""
        found = simulation.present_value
        columns = [
            Column("name", "Side"),
            Column("mean", "Mean", currency, "money"),
            Column("se", "Mean", _SE, "money"),
            Column("curve", "On the curve", currency, "money", tooltip="With the spreads of the basis."),
            Column("sd", "Std deviation", currency, "money"),
            Column("below", "Below zero", "% of paths", "rate"),
            Column("below_se", "Below zero", "standard error, %", "rate"),
        ]
        data: dict[str, Any] = {
            "name": [each.name.capitalize() for each in found],
            "mean": [each.mean for each in found],
            "se": [each.se for each in found],
            "curve": [each.curve for each in found],
            "sd": [each.sd for each in found],
            "below": [each.below_zero for each in found],
            "below_se": [each.below_zero_se for each in found],
        }
        for place, level in enumerate(found[0].levels if found else ()):
            name = level_name(level)
            columns.append(Column(f"p{place}", name, currency, "money"))
            data[f"p{place}"] = [float(each.percentile[place]) for each in found]
            if in_full:
                for key, unit in (("low", "95 % from"), ("high", "95 % to")):
                    columns.append(Column(f"p{place}_{key}", name, unit, "money"))
                    values = [getattr(each, f"percentile_{key}")[place] for each in found]
                    data[f"p{place}_{key}"] = [float(value) for value in values]
        self._put(columns, data)


def run_sentence(simulation: Simulation) -> str:
    """What a run was, in one line."""
    title = model_title(simulation.model)
    return (
        f"Shown: {numbers.integer(simulation.paths)} paths of {title} over "
        f"{numbers.integer(simulation.horizon_years)} years, {simulation.measure} measure, "
        f"seed {numbers.exact(float(simulation.seed))}."
    )
