"""What a model needs, and parameters to begin with where a book states none."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from desk.book import Basis, ModelName, RatesModel

__all__ = ["MODEL_ITEMS", "MODEL_TRAITS", "suggested_model"]

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
}
"""The fields of `RatesModel` that each model uses, beside the risk price, which all of them use."""

MODEL_TRAITS: dict[ModelName, tuple[bool, bool]] = {
    name: (
        name not in (ModelName.VASICEK, ModelName.CIR),
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
_VOLATILITY = 0.009
_SQUARE_ROOT_VOLATILITY = 0.05
_LONG = 30.0  # years: the long end of a curve that is stated for every term


def suggested_model(name: ModelName, basis: Basis, former: RatesModel | None = None) -> RatesModel:
    """A model that can be drawn: what `former` states, and for what it lacks a figure to begin with.

    Parameters
    ----------
    name : ModelName
    basis : Basis
    former : RatesModel, optional
        Its parameters are kept, those the new model does not use too. Its volatility is kept only where it
        means the same: that of a square-root model multiplies the root of the rate.

    Returns
    -------
    RatesModel
        The figures to begin with are of the size usual for rates of a few percent, not calibrated: mean
        reversion 0.05, volatility 0.9 % (0.05 on the root of the rate); for a second factor 0.5, 0.6 % and
        a correlation of -0.7. The starting rate is the curve's today and the long-run rate its zero rate
        at the last term; for a square-root model at least 0.1 %. They are rounded to 0.01 %.

    Raises
    ------
    ValueError
        If a rate of the curve is needed and the basis gives none.
    """
    _, square_root = MODEL_TRAITS[name]
    model = replace(former, name=name) if former is not None else RatesModel(name)
    if former is not None and MODEL_TRAITS[former.name][1] != square_root:
        model = replace(model, volatility=None)
    for item in MODEL_ITEMS[name]:
        if getattr(model, item) is None:
            begin: dict[str, Any] = {item: _begin(item, basis, square_root=square_root)}
            model = replace(model, **begin)
    return model


def _begin(item: str, basis: Basis, *, square_root: bool) -> float:
    if item == "volatility":
        return _SQUARE_ROOT_VOLATILITY if square_root else _VOLATILITY
    if item in _FIXED:
        return _FIXED[item]
    curve = basis.curve
    rate = float(
        curve.forward(0.0, 0.0) if item == "starting_rate" else curve.zero(basis.last_quoted_term or _LONG)
    )
    return max(round(rate, 4), 0.001) if square_root else round(rate, 4)
