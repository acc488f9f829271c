"""First estimates from a standing: what a small move of all rates would do."""

from __future__ import annotations

from desk.valuation.records import Standing

__all__ = ["BASIS_POINT", "surplus_change"]

BASIS_POINT = 1e-4


def surplus_change(standing: Standing, rate_move: float) -> float:
    """First estimate of the change in surplus when all zero rates move together.

    Parameters
    ----------
    standing : Standing
    rate_move : float
        Move of the continuous zero rates [1/year]; negative for a fall.

    Returns
    -------
    float
        ``-G · rate_move / 0.0001`` [currency], with G the DV01 gap. Convexity is left out, so for a large
        move it is a first estimate only.
    """
    return -standing.dv01_gap * rate_move / BASIS_POINT
