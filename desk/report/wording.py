"""Words that every report shares: names of measures, their units, and the cautionary note."""

from __future__ import annotations

from dataclasses import dataclass

from desk.book import Basis, Indexation, IndexationKind, LiabilityMethod, Side

__all__ = [
    "CAUTION",
    "LIABILITY_METHODS",
    "MEASURES",
    "QUANTILE_METHOD",
    "SIDE_NAMES",
    "MeasureWording",
    "indexation_words",
    "liability_words",
    "within_a_sentence",
]

CAUTION = (
    "These figures are estimates, not a certified valuation: the local standards that apply and a qualified "
    "actuary decide."
)

QUANTILE_METHOD = (
    "Percentiles interpolate linearly between order statistics of the paths (Hyndman and Fan 1996, "
    "definition 7); their 95 % intervals run from one to another, by the binomial law for independent paths, "
    "by the spread of the replicates for others."
)

LIABILITY_METHODS = {
    LiabilityMethod.CURVE: "the curve",
    LiabilityMethod.TERM_SPREADS: "the curve and a spread by term",
    LiabilityMethod.CORPORATE_BONDS: "a curve through high-quality corporate bonds",
    LiabilityMethod.EXPECTED_RETURN: "the return expected on the assets",
}

SIDE_NAMES = {Side.ASSETS: "Assets", Side.LIABILITIES: "Liabilities"}


@dataclass(frozen=True)
class MeasureWording:
    """How a measure is shown.

    Attributes
    ----------
    name : str
        Its field in `desk.valuation.records.Measures`.
    label : str
    unit : str
        ``currency`` stands for the currency of the book.
    kind : str
        ``money``, ``rate``, ``years`` or ``years2``: which number format it takes.
    """

    name: str
    label: str
    unit: str
    kind: str


MEASURES = (
    MeasureWording("present_value", "Present value", "currency", "money"),
    MeasureWording("equivalent_rate", "Equivalent rate, annual effective", "% a year", "rate"),
    MeasureWording("macaulay_duration", "Macaulay duration", "years", "years"),
    MeasureWording("modified_duration", "Modified duration", "years", "years"),
    MeasureWording("effective_duration", "Effective duration", "years", "years"),
    MeasureWording("convexity", "Convexity", "years²", "years2"),
    MeasureWording("dispersion", "Dispersion", "years²", "years2"),
    MeasureWording("dv01", "DV01", "currency", "money"),
)


def within_a_sentence(label: str) -> str:
    """The label of a measure after other words; a name keeps its capital."""
    return label if label.startswith(("Macaulay", "DV01")) else label[0].lower() + label[1:]


def liability_words(basis: Basis) -> str:
    """What liabilities are discounted on, in a few words."""
    words = LIABILITY_METHODS[basis.liability_method]
    if basis.liability_method is LiabilityMethod.EXPECTED_RETURN and basis.expected_return is not None:
        words += f", {_share(basis.expected_return)} a year"
    if basis.liability_spread:
        points = f"{1e4 * basis.liability_spread:g}".replace("-", "\N{MINUS SIGN}")
        words += f", and a spread of {points} basis points"
    return words


def indexation_words(indexation: Indexation | None) -> str:
    """How amounts grow, in a few words; empty for fixed ones."""
    if indexation is None or indexation.kind is IndexationKind.FIXED:
        return ""
    if indexation.kind is IndexationKind.RISING:
        return f"rising {_share(indexation.rise)} a year"
    words = indexation.kind.value
    if indexation.floor is not None:
        words += f", floor {_share(indexation.floor)}"
    if indexation.cap is not None:
        words += f", cap {_share(indexation.cap)}"
    return words


def _share(rate: float) -> str:
    """A rate in per cent with a true minus."""
    return f"{rate:.3%}".replace("-", "\N{MINUS SIGN}")
