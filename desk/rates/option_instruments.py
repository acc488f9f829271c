"""Quoted caps, floors and swaptions: their payments, their prices by the closed forms, and what is wrong.

Conventions (common practice): one curve projects and discounts; periods have equal lengths of a year over the
frequency, counted back from the end, a short one first; the period already fixed today belongs to no cap; at
the money a cap has the swap rate of the periods it covers as its strike, a swaption the forward swap rate.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike, NDArray

from desk.rates.curve import DiscountCurve
from desk.rates.option_arbitrage import arbitrage_faults
from desk.rates.option_formulas import forward_option, implied_volatility

__all__ = ["OptionQuotes", "OptionQuotesError", "option_quotes"]

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

_INSTRUMENTS = ("cap", "floor", "payer swaption", "receiver swaption")
_KINDS = ("normal", "lognormal")
_LONGEST = 100.0  # years
_ODD = 1e-9


class OptionQuotesError(ValueError):
    """Quotes that cannot be meant.

    Attributes
    ----------
    faults : tuple of (int, str)
        Row, numbered from 0 in the order the quotes were given, and what is wrong with it in one sentence.
    """

    def __init__(self, faults: Sequence[tuple[int, str]]) -> None:
        super().__init__(" ".join(f"Quote {row + 1}: {text}" for row, text in faults))
        self.faults = tuple(faults)

    def __reduce__(self) -> tuple[object, ...]:
        """Rebuilt from its faults where it crosses from one process to another."""
        return OptionQuotesError, (self.faults,)


@dataclass(frozen=True, eq=False)
class OptionQuotes:
    """Quotes with all that their prices need; made by `option_quotes`. Rows are quotes, m of them.

    The options beneath a quote are the caplets of a cap, or one for a swaption. Unused places have weight 0.

    Attributes
    ----------
    curve : DiscountCurve
    instrument : tuple of str
    expiry, length : ndarray, shape (m,)
        As quoted [years].
    strike : ndarray, shape (m,)
        At the money filled in [1/year].
    volatility : ndarray, shape (m,)
        As quoted.
    normal, call, swaption : ndarray of bool, shape (m,)
        Normal quote; cap or payer; swaption.
    shift : ndarray, shape (m,)
        [1/year].
    fixing, forward, weight : ndarray, shape (m, k)
        Of the options beneath: expiry [years], forward rate [1/year], annuity [years].
    time, accrual : ndarray, shape (m, n)
        Payments of the swap or cap [years] and the years each is for; accrual 0 where unused.
    start : ndarray, shape (m, n)
        Begin of the period of each payment [years].
    """

    curve: DiscountCurve
    instrument: tuple[str, ...]
    expiry: FloatArray
    length: FloatArray
    strike: FloatArray
    volatility: FloatArray
    normal: BoolArray
    call: BoolArray
    swaption: BoolArray
    shift: FloatArray
    fixing: FloatArray
    forward: FloatArray
    weight: FloatArray
    time: FloatArray
    accrual: FloatArray
    start: FloatArray

    @property
    def count(self) -> int:
        """Number m of quotes."""
        return len(self.instrument)

    @cached_property
    def discounts(self) -> tuple[FloatArray, FloatArray]:
        """Discount factors at the begin and at the payment of each period, shape (m, n) each."""
        return self.curve.discount(self.start), self.curve.discount(self.time)

    @property
    def names(self) -> tuple[str, ...]:
        """A name for each quote, as ``cap 5y`` or ``payer swaption 5y into 10y``."""
        return tuple(
            f"{kind} {expiry:g}y into {length:g}y" if swaption else f"{kind} {expiry:g}y"
            for kind, expiry, length, swaption in zip(
                self.instrument, self.expiry.tolist(), self.length.tolist(), self.swaption, strict=True
            )
        )

    def prices(self, volatility: ArrayLike) -> FloatArray:
        """Prices per unit of nominal at volatilities of the quoted kind, shape (m,)."""
        level = np.broadcast_to(np.asarray(volatility, dtype=np.float64), (self.count,))
        each = forward_option(
            self.forward,
            self.strike[:, None],
            level[:, None],
            self.fixing,
            call=self.call[:, None],
            normal=self.normal[:, None],
            shift=self.shift[:, None],
        )
        return np.asarray(np.sum(np.where(self.weight > 0.0, self.weight * each, 0.0), axis=1))

    def volatilities(self, price: ArrayLike, *, guess: FloatArray | None = None) -> FloatArray:
        """Volatilities of the quoted kind at which the prices hold, shape (m,); NaN where there is none.

        `guess`, the quoted ones by default, only makes it faster.
        """
        return implied_volatility(
            price,
            self.forward,
            np.broadcast_to(self.strike[:, None], self.forward.shape),
            self.fixing,
            weight=self.weight,
            call=self.call,
            normal=self.normal,
            shift=self.shift,
            guess=self.volatility if guess is None else guess,
        )


def option_quotes(
    curve: DiscountCurve,
    *,
    instrument: Sequence[str],
    expiry: ArrayLike,
    length: ArrayLike,
    strike: ArrayLike,
    volatility: ArrayLike,
    kind: Sequence[str],
    shift: ArrayLike,
    frequency: ArrayLike,
) -> OptionQuotes:
    """Quotes of caps, floors and swaptions, checked and laid out.

    Parameters
    ----------
    curve : DiscountCurve
        Projects and discounts.
    instrument : sequence of str, length m
        ``cap``, ``floor``, ``payer swaption`` or ``receiver swaption``.
    expiry : array_like, shape (m,)
        Of a swaption; the end of the last period of a cap or floor [years].
    length : array_like, shape (m,)
        Of the swap [years]; not looked at for caps and floors.
    strike : array_like, shape (m,)
        Paid as often as the frequency says [1/year]; NaN for at the money.
    volatility : array_like, shape (m,)
        Of the kind stated.
    kind : sequence of str, length m
        ``normal`` or ``lognormal``.
    shift : array_like, shape (m,)
        Added to rate and strike of a lognormal quote [1/year].
    frequency : array_like, shape (m,)
        Payments a year.

    Raises
    ------
    OptionQuotesError
        With every fault of every row: what cannot be priced; what lets money be made of nothing.
    """
    columns = {
        "expiry": expiry,
        "length": length,
        "strike": strike,
        "volatility": volatility,
        "shift": shift,
        "frequency": frequency,
    }
    arrays = {name: np.array(values, dtype=np.float64) for name, values in columns.items()}
    names, kinds = tuple(str(entry) for entry in instrument), tuple(str(entry) for entry in kind)
    for name, values in arrays.items():
        if values.shape != (len(names),):
            raise ValueError(f"`{name}` must hold one number an instrument")
    if len(kinds) != len(names):
        raise ValueError("`kind` must hold one entry an instrument")
    if not names:
        raise ValueError("there are no quotes")
    faults = [
        (row, text)
        for row in range(len(names))
        for text in _row_faults(
            names[row], kinds[row], {key: float(values[row]) for key, values in arrays.items()}
        )
    ]
    if faults:
        raise OptionQuotesError(faults)
    quotes = _laid_out(curve, names, kinds, arrays)
    faults = _shift_faults(quotes) or arbitrage_faults(quotes, arrays["frequency"])
    if faults:
        raise OptionQuotesError(faults)
    return quotes


def _row_faults(instrument: str, kind: str, row: dict[str, float]) -> list[str]:
    """What is wrong with one quote by itself."""
    faults = []
    if instrument not in _INSTRUMENTS:
        faults.append(f"the instrument is {instrument!r}; it must be one of {', '.join(_INSTRUMENTS)}.")
    if kind not in _KINDS:
        faults.append(f"the kind is {kind!r}; it must be normal or lognormal.")
    if not (math.isfinite(row["volatility"]) and row["volatility"] > 0.0):
        faults.append(f"the volatility is {row['volatility']:g}; it must be above 0.")
    elif row["volatility"] > (0.5 if kind == "normal" else 10.0):
        unit = "a year (normal)" if kind == "normal" else "(lognormal)"
        faults.append(
            f"the volatility is {100.0 * row['volatility']:g} % {unit}, beyond any sense; state it as a "
            "fraction."
        )
    if not 0.0 < row["expiry"] <= _LONGEST:
        faults.append(f"the expiry is {row['expiry']:g}; it must be above 0 and at most {_LONGEST:g} years.")
    if "swaption" in instrument and not 0.0 < row["length"] <= _LONGEST:
        faults.append(
            f"the length of the swap is {row['length']:g}; it must be above 0 and at most {_LONGEST:g} years."
        )
    if row["frequency"] not in (1.0, 2.0, 4.0, 12.0):
        faults.append(f"the frequency is {row['frequency']:g}; it must be 1, 2, 4 or 12.")
    elif instrument in ("cap", "floor") and row["expiry"] <= 1.0 / row["frequency"] + _ODD:
        faults.append(
            "it ends with the period already fixed, so that nothing is left to insure; it must end later."
        )
    if math.isinf(row["strike"]):
        faults.append("the strike is not finite.")
    if not math.isfinite(row["shift"]):
        faults.append("the shift is not a number.")
    return faults


def _laid_out(
    curve: DiscountCurve, names: tuple[str, ...], kinds: tuple[str, ...], arrays: dict[str, FloatArray]
) -> OptionQuotes:
    """Payments and options of every quote, padded to one width."""
    rows = len(names)
    swaption = np.array(["swaption" in name for name in names])
    first = np.where(swaption, arrays["expiry"], 0.0)
    last = np.where(swaption, arrays["expiry"] + arrays["length"], arrays["expiry"])
    frequency = arrays["frequency"]
    counts = np.ceil((last - first) * frequency - _ODD).astype(np.int64)
    # dimensions: quote, payment counted from the last
    back = np.arange(int(counts.max()))
    end = last[:, None] - back / frequency[:, None]
    begin = np.maximum(end - 1.0 / frequency[:, None], first[:, None])
    # A first period that starts today is fixed already.
    used = (back < counts[:, None]) & (swaption[:, None] | (begin > _ODD))
    order = slice(None, None, -1)
    time = np.where(used, end, last[:, None])[:, order]
    start = np.where(used, begin, last[:, None])[:, order]
    accrual = np.where(used, end - begin, 0.0)[:, order]
    at_start, at_end = curve.discount(start), curve.discount(time)
    length = np.where(accrual > 0.0, accrual, 1.0)
    rate = np.where(accrual > 0.0, (at_start / at_end - 1.0) / length, 0.0)
    annuity = np.sum(accrual * at_end, axis=1)
    swap_rate = np.sum(accrual * at_end * rate, axis=1) / annuity
    strike = np.where(np.isnan(arrays["strike"]), swap_rate, arrays["strike"])
    width = 1 if swaption.all() else time.shape[1]
    fixing, forward, weight = (np.zeros((rows, width)) for _ in range(3))
    caps = ~swaption
    fixing[caps], forward[caps] = start[caps, :width], rate[caps, :width]
    weight[caps] = (accrual * at_end)[caps, :width]
    fixing[swaption, 0], forward[swaption, 0], weight[swaption, 0] = (
        arrays["expiry"][swaption],
        swap_rate[swaption],
        annuity[swaption],
    )
    return OptionQuotes(
        curve=curve,
        instrument=names,
        expiry=arrays["expiry"],
        length=arrays["length"],
        strike=strike,
        volatility=arrays["volatility"],
        normal=np.array([kind == "normal" for kind in kinds]),
        call=np.array([name in ("cap", "payer swaption") for name in names]),
        swaption=swaption,
        shift=arrays["shift"],
        fixing=fixing,
        forward=forward,
        weight=weight,
        time=time,
        accrual=accrual,
        start=start,
    )


def _shift_faults(quotes: OptionQuotes) -> list[tuple[int, str]]:
    """Lognormal quotes on rates that are not above 0."""
    faults = []
    lowest = np.min(np.where(quotes.weight > 0.0, quotes.forward, np.inf), axis=1) + quotes.shift
    for row in np.flatnonzero(~quotes.normal).tolist():
        for name, value in (
            ("forward rate", float(lowest[row])),
            ("strike", float(quotes.strike[row] + quotes.shift[row])),
        ):
            if value <= 0.0:
                faults.append(
                    (
                        row,
                        f"a lognormal volatility needs a {name} above 0, and with its shift it is "
                        f"{100.0 * value:.4g} %; give a larger shift or a normal volatility.",
                    )
                )
                break
    return faults
