"""The short-rate model a book asks for."""

from __future__ import annotations

import math

from desk.book import Book, ModelName, RatesModel
from desk.rates.black_karasinski import BlackKarasinskiRates
from desk.rates.gaussian import GaussianRates, RateFactor, ho_lee, hull_white, vasicek
from desk.rates.square_root import SquareRootRates
from desk.scenarios.drawn_model import DrawnModel
from desk.scenarios.given import GivenRates
from desk.scenarios.suggestions import MODEL_ITEMS

__all__ = ["missing_titles", "rate_model"]


# Steps a year on which the lognormal model is worked out, at least.
_LEAST_STEPS = 12


def rate_model(book: Book, *, last_flow: float = 0.0) -> DrawnModel:
    """The short-rate model of a book.

    Vasicek and Cox-Ingersoll-Ross (``cir``) make their own curve; the other models are fitted to the curve of
    the book's basis.

    Parameters
    ----------
    book : Book
    last_flow : float
        When the last flow that is to be valued falls due [years]: the lognormal model is worked out up to it,
        or up to the horizon of the run where that is later.

    Raises
    ------
    ValueError
        If the book has no rates model, an item of it is missing or out of range, or the basis gives no
        curve. The message names the item as the workbook does.
    """
    stated = book.rates_model
    if stated is None:
        raise ValueError("the book has no rates model")
    speed = _Item(stated, "mean_reversion", least=0.0)
    volatility = _Item(stated, "volatility", least=0.0)
    risk_price = _Item(stated, "risk_price").value()
    match stated.name:
        case ModelName.HO_LEE:
            return ho_lee(book.basis.curve, volatility=volatility.value(), risk_price=risk_price)
        case ModelName.HULL_WHITE:
            return hull_white(
                book.basis.curve,
                mean_reversion=speed.value(),
                volatility=volatility.value(),
                risk_price=risk_price,
            )
        case ModelName.GAUSSIAN_2:
            correlation = _Item(stated, "factor_correlation", least=-1.0, most=1.0).value()
            return GaussianRates(
                book.basis.curve,
                (
                    RateFactor(speed.value(), volatility.value(), risk_price),
                    RateFactor(
                        _Item(stated, "second_mean_reversion", least=0.0).value(),
                        _Item(stated, "second_volatility", least=0.0).value(),
                        _Item(stated, "second_risk_price").value(),
                    ),
                ),
                [[1.0, correlation], [correlation, 1.0]],
            )
        case ModelName.VASICEK:
            return vasicek(
                mean_reversion=speed.value(),
                long_run_rate=_Item(stated, "long_run_rate").value(),
                volatility=volatility.value(),
                starting_rate=_Item(stated, "starting_rate").value(),
                risk_price=risk_price,
            )
        case ModelName.CIR | ModelName.CIR_SHIFTED:
            return SquareRootRates(
                mean_reversion=speed.value(),
                long_run_rate=_Item(stated, "long_run_rate", least=0.0).value(),
                volatility=volatility.value(),
                starting_rate=_Item(stated, "starting_rate", least=0.0).value(),
                curve=book.basis.curve if stated.name is ModelName.CIR_SHIFTED else None,
                risk_price=risk_price,
            )
        case ModelName.BLACK_KARASINSKI:
            yearly = book.run.steps_per_year
            return BlackKarasinskiRates(
                book.basis.curve,
                mean_reversion=speed.value(),
                volatility=volatility.value(),
                horizon=max(float(book.run.horizon_years), last_flow),
                # Every step of the run is a whole number of the model's.
                steps_per_year=yearly * -(-_LEAST_STEPS // yearly),
                risk_price=risk_price,
            )
        case ModelName.OUTSIDE:
            if book.scenario_set is None:
                raise ValueError("the sheet Scenario set is missing: the outside model is the set it holds")
            return GivenRates(book.scenario_set, book.basis.curve)


def missing_titles(stated: RatesModel) -> tuple[str, ...]:
    """The items that a model needs and does not state, as the workbook names them."""
    return tuple(_TITLES[field] for field in MODEL_ITEMS[stated.name] if getattr(stated, field) is None)


class _Item:
    """One item of a stated model with the range it must lie in."""

    def __init__(
        self, stated: RatesModel, field: str, *, least: float = -math.inf, most: float = math.inf
    ) -> None:
        self._stated, self._field, self._least, self._most = stated, field, least, most

    def value(self) -> float:
        """The item's value; ValueError if it is missing or out of range."""
        value: float | None = getattr(self._stated, self._field)
        title = _TITLES[self._field]
        if value is None:
            raise ValueError(f"{title} is missing: the {self._stated.name} model needs it")
        if not math.isfinite(value):
            raise ValueError(f"{title} must be a number, not {value}")
        if value < self._least or value > self._most:
            span = f"between {self._least:g} and {self._most:g}" if math.isfinite(self._most) else None
            raise ValueError(f"{title} must be {span or f'at least {self._least:g}'}, not {value:g}")
        return value


_TITLES = {
    "mean_reversion": "Mean reversion",
    "volatility": "Volatility",
    "long_run_rate": "Long-run rate",
    "starting_rate": "Starting rate",
    "second_mean_reversion": "Second mean reversion",
    "second_volatility": "Second volatility",
    "factor_correlation": "Factor correlation",
    "risk_price": "Risk price",
    "second_risk_price": "Second risk price",
}
