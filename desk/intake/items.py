"""The items of the rates model, of the run and of the shock settings."""

from __future__ import annotations

import math
import re
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray

from desk.book import Bridge, Measure, ModelName, RatesModel, Run, Sampling, ShockSettings
from desk.book.run import MOST_PATHS, MOST_REPLICATES
from desk.intake.cells import Cells
from desk.intake.checks import (
    check_correlations,
    check_not_negative,
    check_rates,
    check_size,
    some,
)
from desk.intake.columns import Kind
from desk.intake.holding_columns import YesNo
from desk.intake.item_sheet import Check, ItemSheet

__all__ = ["MODEL_ITEMS", "missing_items", "read_rates_model", "read_run", "read_shock_settings"]

MODEL_ITEMS: dict[ModelName, tuple[str, ...]] = {
    ModelName.VASICEK: ("Mean reversion", "Volatility", "Long-run rate", "Starting rate"),
    ModelName.HO_LEE: ("Volatility",),
    ModelName.HULL_WHITE: ("Mean reversion", "Volatility"),
    ModelName.GAUSSIAN_2: (
        *("Mean reversion", "Volatility"),
        *("Second mean reversion", "Second volatility", "Factor correlation"),
    ),
    ModelName.CIR: ("Mean reversion", "Volatility", "Long-run rate", "Starting rate"),
    ModelName.CIR_SHIFTED: ("Mean reversion", "Volatility", "Long-run rate", "Starting rate"),
    ModelName.BLACK_KARASINSKI: ("Mean reversion", "Volatility"),
    ModelName.OUTSIDE: (),
}
"""The items that each model needs."""
_OF_INFLATION = ("Inflation mean reversion", "Inflation rate correlation", "Inflation risk price")
_SQUARE_ROOT = (ModelName.CIR, ModelName.CIR_SHIFTED)


def _or_zero(value: float | None) -> float:
    return 0.0 if value is None else value


def _check_reversion(cells: Cells, values: NDArray[np.float64], what: str) -> None:
    check_not_negative(cells, values, what)
    cells.each(
        values > 100.0, f"{what} is {{}}", f"{some(what)} of at most 100 a year", "Correct the figure."
    )


def _check_price(cells: Cells, values: NDArray[np.float64], what: str) -> None:
    check_size(cells, values, what, most=100.0)


def read_rates_model(sheet: ItemSheet) -> RatesModel | None:
    """The rates model; None where what it is cannot be told."""
    name = sheet.choice("Model", ModelName, "a model", required=True)
    needs = MODEL_ITEMS[name] if name is not None else ()

    def number(item: str, expected: str, *checks: Check) -> float | None:
        return sheet.number(item, expected, *checks, required=item in needs)

    reversion, volatility = "a speed of reversion a year", "a volatility a year"
    model = {
        "mean_reversion": number("Mean reversion", reversion, _check_reversion),
        "volatility": number("Volatility", volatility, check_not_negative, check_rates_above),
        "long_run_rate": number("Long-run rate", "a rate a year", check_rates),
        "starting_rate": number("Starting rate", "a rate a year", check_rates),
        "second_mean_reversion": number("Second mean reversion", reversion, _check_reversion),
        "second_volatility": number("Second volatility", volatility, check_not_negative, check_rates_above),
        "factor_correlation": number("Factor correlation", "a correlation", check_correlations),
    }
    risk_price = _or_zero(sheet.number("Risk price", "a price of risk", _check_price))
    second_price = sheet.number("Second risk price", "a price of risk", _check_price)
    inflation = _inflation_items(sheet)
    mend = sheet.choice("Mend correlation", YesNo, "an answer")
    if name is None:
        return None
    if second_price is not None and name is not ModelName.GAUSSIAN_2:
        _not_used(sheet, "Second risk price", f"the model {name} has no second factor")
    if name in _SQUARE_ROOT:
        if model["mean_reversion"] == 0.0:
            sheet.fault(
                "Mean reversion",
                "the mean reversion is 0",
                f"a speed above 0 for the model {name}",
                "Correct the figure.",
            )
        for item, value in (
            ("Long-run rate", model["long_run_rate"]),
            ("Starting rate", model["starting_rate"]),
        ):
            if value is not None and value < 0.0:
                sheet.fault(
                    item,
                    f"the {item.lower()} is {value:.12g}",
                    f"a rate of at least 0 for the model {name}",
                    "Correct the figure.",
                )
    for item, value in zip(sheet_parameters(), model.values(), strict=True):
        if value is not None and item not in needs:
            _not_used(sheet, item, f"the model {name} has no {item.lower()}")
    return RatesModel(
        name=name,
        risk_price=risk_price,
        second_risk_price=_or_zero(second_price),
        mend_correlation=mend is YesNo.YES,
        inflation_risk_price=_or_zero(inflation.pop("inflation_risk_price")),
        **model,
        **inflation,
    )


def _not_used(sheet: ItemSheet, item: str, found: str) -> None:
    """Say that an item is stated for nothing."""
    sheet.fault(item, found, "no value", "It is kept and not used; remove it if it is not wanted.", mild=True)


def _inflation_items(sheet: ItemSheet) -> dict[str, float | None]:
    """How the inflation factor moves, by field; the factor is drawn where its volatility is stated."""
    volatility = sheet.number(
        "Inflation factor volatility", "a volatility a year", check_not_negative, check_rates_above
    )
    stated = {
        "inflation_volatility": volatility,
        "inflation_mean_reversion": sheet.number(
            "Inflation mean reversion",
            "a speed of reversion a year",
            _check_reversion,
            required=volatility is not None,
        ),
        "inflation_rate_correlation": sheet.number(
            "Inflation rate correlation", "a correlation", check_correlations
        ),
        "inflation_risk_price": sheet.number("Inflation risk price", "a price of risk", _check_price),
    }
    if "Inflation factor volatility" not in sheet.rows:
        for item, value in zip(_OF_INFLATION, list(stated.values())[1:], strict=True):
            if value is not None:
                _not_used(sheet, item, "no Inflation factor volatility is stated: inflation is not drawn")
    return stated


def missing_items(model: RatesModel) -> tuple[str, ...]:
    """The items that a model needs and does not have."""
    return tuple(
        item
        for item in MODEL_ITEMS[model.name]
        if getattr(model, item.lower().replace(" ", "_").replace("-", "_")) is None
    )


def sheet_parameters() -> tuple[str, ...]:
    """The items of a model's parameters, in the order of the fields of `RatesModel`."""
    return (
        *("Mean reversion", "Volatility", "Long-run rate", "Starting rate"),
        *("Second mean reversion", "Second volatility", "Factor correlation"),
    )


def check_rates_above(cells: Cells, values: NDArray[np.float64], what: str) -> None:
    """Report rates that are plainly meant in per cent; negative ones are reported elsewhere."""
    check_rates(cells, values, what, least=-np.inf)


def read_run(sheet: ItemSheet) -> Run:
    """The run; what is wrong or missing is as in `Run`'s defaults."""
    default = Run()
    measure = sheet.choice("Measure", Measure, "a measure", instead=str(default.measure))
    return Run(
        paths=sheet.whole("Paths", "number of paths", least=1, most=MOST_PATHS, instead=default.paths),
        horizon_years=sheet.whole(
            "Horizon (years)", "horizon", least=1, most=200, instead=default.horizon_years
        ),
        steps_per_year=sheet.whole(
            "Steps a year", "number of steps a year", least=1, most=366, instead=default.steps_per_year
        ),
        seed=sheet.whole("Seed", "seed", least=0, most=2**53, instead=default.seed),
        measure=measure or default.measure,
        percentiles=_percentiles(sheet, default.percentiles),
        **_sampling(sheet, default),
    )


def _sampling(sheet: ItemSheet, default: Run) -> dict[str, Any]:
    """How the paths are drawn, by field; none of it need be stated."""
    sampling = sheet.choice("Sampling", Sampling, "a way of drawing") or default.sampling
    bridge = sheet.choice("Bridge", Bridge, "an order of the directions of a path")
    matching = sheet.choice("Moment matching", YesNo, "an answer") is YesNo.YES
    is_reduced = matching or sampling is not Sampling.PLAIN
    replicates = default.replicates
    if sheet.states("Replicates"):
        replicates = sheet.whole(
            "Replicates", "number of replicates", least=2, most=MOST_REPLICATES, instead=replicates
        )
        if not is_reduced:
            _not_used(sheet, "Replicates", "paths drawn plainly have no replicates")
    if bridge is not None and sampling is not Sampling.SOBOL:
        _not_used(sheet, "Bridge", f"paths drawn by {sampling} sampling have no bridge")
    return {
        "sampling": sampling,
        "bridge": bridge or default.bridge,
        "matching": matching,
        "replicates": replicates,
    }


def _percentiles(sheet: ItemSheet, default: tuple[float, ...]) -> tuple[float, ...]:
    """Percentiles in one cell, as "1; 5; 25", or in several of the row."""
    item, expected = "Percentiles", "percentiles that rise, each above 0 and below 100"
    shown = ", ".join(f"{level:g}" for level in default)
    if item not in sheet.rows:
        sheet.number(item, expected, instead=shown)
        return default
    cells = sheet.spread_out(item)
    if len(cells) == 1 and not cells[0].filled[0]:
        cells[0].mild(0, f"the cell is empty; {shown} is taken", expected, "Write them, as 5; 50; 95.")
        return default
    levels = _listed_numbers(cells, expected, "5; 50; 95")
    if levels is None:
        return default
    if not all(0.0 < level < 100.0 for level in levels):
        wrong = ", ".join(f"{level:g}" for level in levels if not 0.0 < level < 100.0)
        sheet.fault(item, f"{wrong} is no percentile", expected, "Correct or remove it.")
        return default
    if any(first >= second for first, second in pairwise(levels)):
        sheet.fault(item, "the percentiles do not rise", expected, "Sort them and remove repeated ones.")
        return default
    return tuple(levels)


def _listed_numbers(cells: list[Cells], expected: str, example: str) -> list[float] | None:
    """Numbers in one cell or several; None where one is wrong, which is reported."""
    numbers: list[float] = []
    for cell in cells:
        if cell.kinds[0] != Kind.TEXT:
            numbers += cell.numbers(expected).tolist()
            continue
        text = cell.texts[int(cell.values[0])].strip().rstrip(";,")
        for word in re.split(r"\s*;\s*" if ";" in text else r"\s*,\s*|\s+", text):
            try:
                numbers.append(float(word))
            except ValueError:
                cell.fault(
                    0, f"{cell.stated(0)} holds what is no number", expected, f"Write for example {example}."
                )
                return None
    return None if any(math.isnan(number) for number in numbers) else numbers


_NONE = "none"
"""What stands in a cell for an empty list, where a blank one stands for the usual."""
_MOST_RATIO = 10.0


def read_shock_settings(sheet: ItemSheet) -> ShockSettings:
    """Which prescribed sets are asked for, and the thresholds; what is not stated is as usual."""
    usual = ShockSettings()
    return ShockSettings(sets=_sets(sheet), thresholds=_thresholds(sheet, usual.thresholds))


def _sets(sheet: ItemSheet) -> tuple[str, ...]:
    """Names in one cell, with ; between them, or in several cells of the row."""
    if "Sets" not in sheet.rows:
        return ()
    names: list[str] = []
    for cell in sheet.spread_out("Sets"):
        (text,) = cell.texts_of("names of prescribed sets", required=False)
        for name in filter(None, map(str.strip, text.split(";"))):
            if name in names:
                cell.mild(
                    0, f'the set "{name[:60]}" stands twice', "each set once", "It counts once; remove one."
                )
            else:
                names.append(name)
    return tuple(names)


def _thresholds(sheet: ItemSheet, usual: tuple[float, ...]) -> tuple[float, ...]:
    """Funding ratios that fall."""
    item, expected = "Thresholds", "funding ratios above 0 that fall, the best first"
    if item not in sheet.rows:
        return usual
    cells = sheet.spread_out(item)
    if len(cells) == 1 and not cells[0].filled[0]:
        shown = "; ".join(f"{ratio:g}" for ratio in usual)
        cells[0].mild(0, f"the cell is empty; {shown} is taken", expected, f"Write them, or {_NONE}.")
        return usual
    if len(cells) == 1 and cells[0].texts_of(expected, required=False)[0].strip().casefold() == _NONE:
        return ()
    ratios = _listed_numbers(cells, expected, "1.05; 1")
    if ratios is None:
        return usual
    for ratio in ratios:
        if not 0.0 < ratio <= _MOST_RATIO:
            sheet.fault(
                item,
                f"{ratio:.12g} is no funding ratio that parts good from poor",
                f"{expected}, as fractions: 1.05 for 105 %",
                f"Write {ratio / 100:.12g} if {ratio:.12g} % is meant."
                if ratio > _MOST_RATIO
                else "Correct or remove it.",
            )
            return usual
    if any(first <= second for first, second in pairwise(ratios)):
        sheet.fault(item, "the thresholds do not fall", expected, "Sort them and remove repeated ones.")
        return usual
    return tuple(ratios)
