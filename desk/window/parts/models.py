"""What the models of rates are called."""

from __future__ import annotations

from desk.book import ModelName

__all__ = ["MODEL_TITLES", "model_title"]

MODEL_TITLES = {
    ModelName.VASICEK: "Vasicek",
    ModelName.HO_LEE: "Ho-Lee",
    ModelName.HULL_WHITE: "Hull-White",
    ModelName.GAUSSIAN_2: "Gaussian, two factors",
    ModelName.CIR: "Cox-Ingersoll-Ross",
    ModelName.CIR_SHIFTED: "Cox-Ingersoll-Ross, shifted",
    ModelName.BLACK_KARASINSKI: "Black-Karasinski",
    ModelName.OUTSIDE: "Scenarios from outside",
}


def model_title(name: str) -> str:
    """The title of a model by its name in a workbook; the name itself where it has none."""
    return next((title for model, title in MODEL_TITLES.items() if model == name), name)
