"""Expected payments of debtors who may default."""

from __future__ import annotations

import numpy as np

from desk.book.arrays import FloatArray
from desk.book.schedule import HoldingFlows

__all__ = ["ExpectedRows", "expected_rows"]


class ExpectedRows:
    """Expected payments, row by row.

    Parameters
    ----------
    survival : ndarray, shape (n,)
        Probability that no default has happened by the row.
    recovered : ndarray, shape (n,)
        Expected recovery paid at the row [currency].
    """

    __slots__ = ("recovered", "survival")

    def __init__(self, survival: FloatArray, recovered: FloatArray) -> None:
        self.survival = survival
        self.recovered = recovered


def expected_rows(
    flows: HoldingFlows, *, default_rate: FloatArray, recovery_rate: FloatArray
) -> ExpectedRows | None:
    """Survival and recovery of each row.

    Parameters
    ----------
    flows : HoldingFlows
        With n rows of m holdings.
    default_rate : ndarray, shape (m,)
        Probability of default within a year, the same in every year that is survived.
    recovery_rate : ndarray, shape (m,)
        Part of the outstanding nominal that is recovered.

    Returns
    -------
    ExpectedRows or None
        None where nobody defaults. A payment c of a row at time t is expected to be ``c · S(t)`` with
        ``S(t) = (1 - default_rate)^t``; a default within the period that ends at t brings
        ``recovery_rate · outstanding`` at t, with probability ``S(t') - S(t)``, where t' is the time of the
        holding's row before, or the valuation date. A default before a holding starts leaves nothing.

    References
    ----------
    A constant hazard rate ``-ln(1 - default_rate)`` and recovery of par at the next payment date are common
    practice; Duffie, D. and Singleton, K.J., Credit Risk (2003), chapters 3 and 5.
    """
    if not default_rate.any():
        return None
    growth = np.log1p(-default_rate)
    survival = np.exp(flows.time * growth[flows.holding])
    before = np.exp(flows.start_time * growth)[flows.holding]
    same = flows.holding[1:] == flows.holding[:-1]
    before[1:][same] = survival[:-1][same]
    recovered = recovery_rate[flows.holding] * flows.outstanding * (before - survival)
    return ExpectedRows(survival, recovered)
