"""Results of shocks: immutable records."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

from desk.book import Fault, Provenance
from desk.book.arrays import FloatArray
from desk.book.shock import Shock

__all__ = ["BAND_NAMES", "ParallelProfile", "Position", "ShockResult", "ShockTable", "band_name"]

BAND_NAMES = ("good", "fair", "poor")
"""What the bands are called where two thresholds part them."""


@dataclass(frozen=True, kw_only=True)
class Position:
    """The balance sheet in six figures.

    Attributes
    ----------
    assets, liabilities : float
        Present values [currency].
    surplus : float
        Assets less liabilities [currency].
    funding_ratio : float
        Assets over liabilities; NaN without liabilities.
    duration_gap : float
        ``D_A - D_L · L / A`` with effective durations [years]; NaN without assets.
    dv01_gap : float
        DV01 of assets less that of liabilities [currency].
    """

    assets: float
    liabilities: float
    surplus: float
    funding_ratio: float
    duration_gap: float
    dv01_gap: float


@dataclass(frozen=True, kw_only=True)
class ShockResult(Position):
    """Both sides fully revalued after one shock.

    Attributes
    ----------
    shock : Shock
    change_in_assets, change_in_liabilities, change_in_surplus : float
        [currency]
    change_in_funding_ratio : float
    estimated_change_in_assets, estimated_change_in_liabilities, estimated_change_in_surplus : float
        By duration and convexity: see `desk.valuation.shocks.estimated_change` [currency].
    band : int
        How many of the thresholds the funding ratio falls short of: 0 for none.
    """

    shock: Shock
    change_in_assets: float
    change_in_liabilities: float
    change_in_surplus: float
    change_in_funding_ratio: float
    estimated_change_in_assets: float
    estimated_change_in_liabilities: float
    estimated_change_in_surplus: float
    band: int

    @property
    def name(self) -> str:
        """Of the shock."""
        return self.shock.name

    @property
    def source(self) -> str:
        """Of the shock."""
        return self.shock.source

    @property
    def set_name(self) -> str:
        """The set the shock is of; empty for the user's own."""
        return self.shock.set_name


@dataclass(frozen=True, eq=False)
class ParallelProfile:
    """Both sides against a parallel move of all continuous zero rates, each array shape (m,).

    Attributes
    ----------
    move : ndarray
        [basis points], rising, 0 among them.
    assets, liabilities, surplus : ndarray
        Fully revalued [currency].
    tangent : ndarray
        The line that touches the surplus at 0 [currency].
    funding_ratio : ndarray
    duration_gap : ndarray
        [years]
    gap_turns : tuple of float
        Moves at which the duration gap changes its sign, and the surplus turns [basis points].
    """

    move: FloatArray
    assets: FloatArray
    liabilities: FloatArray
    surplus: FloatArray
    tangent: FloatArray
    funding_ratio: FloatArray
    duration_gap: FloatArray
    gap_turns: tuple[float, ...]


@dataclass(frozen=True, eq=False)
class ShockTable:
    """A book under its shocks.

    Attributes
    ----------
    valuation_date : datetime.date
    currency : str
    base : Position
        Before any shock.
    results : tuple of ShockResult
        In the order asked for; a shock that could not be computed is missing and stands among the faults.
    profile : ParallelProfile
    thresholds : tuple of float
        Funding ratios, falling, by which the results are judged.
    faults : tuple of Fault
        What could not be done as asked.
    provenance : Provenance
    """

    valuation_date: date
    currency: str
    base: Position
    results: tuple[ShockResult, ...]
    profile: ParallelProfile
    thresholds: tuple[float, ...]
    faults: tuple[Fault, ...]
    provenance: Provenance


def band_name(band: int, thresholds: tuple[float, ...]) -> str:
    """A band in a word: good, fair or poor where there are two thresholds, else how many are missed."""
    if len(thresholds) == len(BAND_NAMES) - 1:
        return BAND_NAMES[band]
    if not thresholds:
        return ""
    return BAND_NAMES[0] if band == 0 else f"{band} missed"
