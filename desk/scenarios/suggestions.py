"""What a model needs, and parameters to begin with where a book states none."""

from __future__ import annotations

from dataclasses import replace
from enum import StrEnum
from typing import Any

from desk.book import Basis, ModelName, RatesModel

__all__ = ["MODEL_ITEMS", "MODEL_TRAITS", "VolatilityKind", "suggested_model", "volatility_kind"]

_CURVE_MAKING = ("mean_reversion", "volatility", "long_run_rate", "starting_rate")

MODEL_ITEMS: dict[ModelName, tuple[str, ...]] = {
    ModelName.VASICEK: _CURVE_MAKING,
    ModelName.HO_LEE: ("volatility",),
    ModelName.HULL_WHITE: ("mean_reversion", "volatility"),
    ModelName.GAUSSIAN_2: (
        *("mean_reversion", "volatility", "second_mean_reversion", "second_volatility"),
        "factor_correlation",
    ),
    ModelName.CIR: _CURVE_MAKING,
    ModelName.CIR_SHIFTED: _CURVE_MAKING,
    ModelName.BLACK_KARASINSKI: ("mean_reversion", "volatility"),
    ModelName.OUTSIDE: (),
}
"""The fields of `RatesModel` that each model needs, beside the prices of risk."""


class VolatilityKind(StrEnum):
    """What the volatility of a model is multiplied by."""

    ABSOLUTE = "absolute"
    """By nothing: it is one of the rate itself."""
    ROOT = "root"
    """By the root of the rate."""
    RELATIVE = "relative"
    """By the rate: it is one of its logarithm."""
    NONE = "none"
    """There is none: rates are not drawn."""


def volatility_kind(name: ModelName) -> VolatilityKind:
    """What the volatility of a model means: figures of different kinds cannot take one another's place."""
    match name:
        case ModelName.CIR | ModelName.CIR_SHIFTED:
            return VolatilityKind.ROOT
        case ModelName.BLACK_KARASINSKI:
            return VolatilityKind.RELATIVE
        case ModelName.OUTSIDE:
            return VolatilityKind.NONE
        case _:
            return VolatilityKind.ABSOLUTE


MODEL_TRAITS: dict[ModelName, tuple[bool, bool]] = {
    name: (
        name not in (ModelName.VASICEK, ModelName.CIR, ModelName.OUTSIDE),
        name in (ModelName.CIR, ModelName.CIR_SHIFTED),
    )
    for name in ModelName
}
"""Whether a model is fitted to the curve of the book, and whether its volatility multiplies a square root."""

_FIXED = {
    "mean_reversion": 0.05,
    "second_mean_reversion": 0.5,
    "second_volatility": 0.006,
    "factor_correlation": -0.7,
}
_VOLATILITIES = {
    VolatilityKind.ABSOLUTE: 0.009,
    VolatilityKind.ROOT: 0.05,
    VolatilityKind.RELATIVE: 0.2,
}
_LONG = 30.0  # years: the long end of a curve that is stated for every term


def suggested_model(name: ModelName, basis: Basis, former: RatesModel | None = None) -> RatesModel:
    """A model that can be drawn: what `former` states, and for what it lacks a figure to begin with.

    Parameters
    ----------
    name : ModelName
    basis : Basis
    former : RatesModel, optional
        Its parameters are kept, those the new model does not use too. Its volatility is kept only where it
        means the same; see `VolatilityKind`.

    Returns
    -------
    RatesModel
        The figures to begin with are of the size usual for rates of a few percent, not calibrated: mean
        reversion 0.05, volatility 0.9 % (0.05 on the root of the rate, 20 % of the rate); for a second
        factor 0.5, 0.6 % and a correlation of -0.7. The starting rate is the curve's today and the long-run
        rate its zero rate at the last term; for a square-root model at least 0.1 %. They are rounded to
        0.01 %.

    Raises
    ------
    ValueError
        If a rate of the curve is needed and the basis gives none.
    """
    kind = volatility_kind(name)
    model = replace(former, name=name) if former is not None else RatesModel(name)
    if former is not None and kind is not VolatilityKind.NONE and volatility_kind(former.name) is not kind:
        model = replace(model, volatility=None)
    for item in MODEL_ITEMS[name]:
        if getattr(model, item) is None:
            begin: dict[str, Any] = {item: _begin(item, basis, kind)}
            model = replace(model, **begin)
    return model


def _begin(item: str, basis: Basis, kind: VolatilityKind) -> float:
    if item == "volatility":
        return _VOLATILITIES[kind]
    if item in _FIXED:
        return _FIXED[item]
    curve = basis.curve
    rate = float(
        curve.forward(0.0, 0.0) if item == "starting_rate" else curve.zero(basis.last_quoted_term or _LONG)
    )
    return max(round(rate, 4), 0.001) if kind is VolatilityKind.ROOT else round(rate, 4)
