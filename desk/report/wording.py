"""Words that every report shares: names of measures, their units, and the cautionary note."""

from __future__ import annotations

from dataclasses import dataclass

from desk.book import Side

__all__ = ["CAUTION", "MEASURES", "QUANTILE_METHOD", "SIDE_NAMES", "MeasureWording"]

CAUTION = (
    "These figures are estimates, not a certified valuation: the local standards that apply and a qualified "
    "actuary decide."
)

QUANTILE_METHOD = (
    "Percentiles interpolate linearly between order statistics of the paths (Hyndman and Fan 1996, "
    "definition 7); their 95 % intervals are order statistics."
)

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
