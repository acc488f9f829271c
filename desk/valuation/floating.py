r"""Floating interest on the curve: what it is projected to pay, and the fixed amounts that replicate it.

On one curve, the interest for the period from :math:`T_{i-1}` to :math:`T_i` is projected at the simple
forward rate, so that it pays :math:`N (P(T_{i-1}) / P(T_i) - 1)` at :math:`T_i`, whatever the day count. With
the holding discounted at a spread s over the curve, that payment is worth

.. math:: N (P_{i-1} / P_i - 1) P_i e^{-s T_i}
          = N e^{-s (T_i - T_{i-1})} \cdot P_{i-1} e^{-s T_{i-1}} - N \cdot P_i e^{-s T_i}.

So it is worth what two fixed amounts are worth: :math:`N e^{-s (T_i - T_{i-1})}` received when the period
begins and N paid when it ends. Neither changes when the curve does and the spread stays, and the identity
holds on every curve: valued on a moved curve the two amounts give what the payments projected anew would.
Sums over the fixed amounts therefore give the right effective duration, convexity, DV01 and key rates, which
for a floating-rate note are those of the time to its next reset.

A change of the spread is another matter: the projected payments stay and their discounting changes, so that
:math:`dV/ds = -\sum T_i c_i P_i e^{-s T_i}` over the payments :math:`c_i`, the nominal among them. Rate and
spread duration differ, and the second is nearly that of a fixed bond.

References
----------
Hull, J.C., Options, Futures, and Other Derivatives, chapter on swaps (a floating-rate bond is worth its
nominal on every reset date). Brigo, D. and Mercurio, F., Interest Rate Models: Theory and Practice (2006),
sections 1.4 and 1.5.
"""

from __future__ import annotations

import numpy as np

from desk.book.arrays import FloatArray
from desk.book.schedule import HoldingFlows
from desk.rates.curve import DiscountCurve

__all__ = ["floating_interest", "implied_current_rates", "replicating_amounts"]


def floating_interest(flows: HoldingFlows, curve: DiscountCurve) -> FloatArray:
    """What the floating interest of each row is projected to pay.

    Parameters
    ----------
    flows : HoldingFlows
    curve : DiscountCurve

    Returns
    -------
    ndarray, shape (n,)
        ``floating · (P(start) / P(end) - 1)`` [currency]; 0 where nothing floats.
    """
    paid = np.zeros(flows.time.size)
    rows = np.flatnonzero(flows.period_row >= 0)
    if rows.size:
        ends = curve.discount(flows.time[rows])
        begins = curve.discount(flows.time[flows.period_row[rows]])
        paid[rows] = flows.floating[rows] * (begins - ends) / ends
    return paid


def replicating_amounts(
    flows: HoldingFlows, *, known: FloatArray, floating: FloatArray, spread: FloatArray
) -> FloatArray:
    """Fixed amounts worth what the rows pay, on any curve.

    Parameters
    ----------
    flows : HoldingFlows
        With n rows of m holdings.
    known : ndarray, shape (n,)
        The part of each payment that does not float [currency].
    floating : ndarray, shape (n,)
        On what the rate of the curve is earned over the period each row ends [currency].
    spread : ndarray, shape (m,)
        Of each holding [1/year].

    Returns
    -------
    ndarray, shape (n,)
        [currency]
    """
    rows = np.flatnonzero(flows.period_row >= 0)
    if not rows.size:
        return known
    begins = flows.period_row[rows]
    amount = known - floating
    with np.errstate(over="ignore"):
        held = floating[rows] * np.exp(-spread[flows.holding[rows]] * (flows.time[rows] - flows.time[begins]))
    # No two periods of a leg begin at one row, and every leg has rows of its own.
    amount[begins] += held
    return amount


def implied_current_rates(flows: HoldingFlows, curve: DiscountCurve) -> FloatArray:
    """The rate of each running period, that of the curve where none is stated.

    Parameters
    ----------
    flows : HoldingFlows
    curve : DiscountCurve

    Returns
    -------
    ndarray, shape (p,)
        In the order of `flows.running` [1/year]. In place of a floating rate that is not stated stands the
        simple rate of the curve from the valuation date to the end of the period, stated in the day count of
        the leg, and the margin: an estimate, since the rate was set on an earlier day. For a period that
        begins on the valuation date it is the rate that will be set.
    """
    running = flows.running
    missing = np.flatnonzero(np.isnan(running.rate))
    if not missing.size:
        return running.rate
    rate = running.rate.copy()
    time = flows.time[running.row[missing]]
    # The difference of two zero-like quantities keeps its digits as an exponential less one.
    simple = np.expm1(curve.zero(time) * time) / time
    fraction = running.fraction[missing]
    # From the 30th to the 31st some day counts see no time: there is nothing to state the rate in.
    stated_in = np.where(
        fraction > 0.0, running.length[missing] / np.where(fraction > 0.0, fraction, 1.0), 1.0
    )
    rate[missing] = simple * stated_in + running.margin[missing]
    return rate
