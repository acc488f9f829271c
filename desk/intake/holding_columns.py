"""Which columns of the sheet of holdings each kind of holding needs and uses."""

from __future__ import annotations

from collections.abc import Iterable
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

from desk.book import HoldingKind
from desk.book.holding import SWAP_KINDS

__all__ = [
    "FLOATER",
    "LEFT_OUT",
    "LINKED",
    "NEEDED",
    "SAYS_NOTHING",
    "USED",
    "USUAL",
    "WITH_SPREAD",
    "KindMasks",
    "YesNo",
]

BoolArray = NDArray[np.bool_]


class YesNo(StrEnum):
    """An answer."""

    YES = "yes"
    NO = "no"


_BOND, _ZERO, _BILL, FLOATER = HoldingKind.BOND, HoldingKind.ZERO, HoldingKind.BILL, HoldingKind.FLOATER
LINKED = HoldingKind.LINKED_BOND
_DEPOSIT, _TERM_DEPOSIT = HoldingKind.DEPOSIT, HoldingKind.TERM_DEPOSIT
_STATED = (HoldingKind.FUND, HoldingKind.PROPERTY)
_COUPONS = (_BOND, LINKED, FLOATER)
_QUOTED = (_BOND, LINKED, _ZERO, _BILL, FLOATER)
WITH_SPREAD = (*_QUOTED, _TERM_DEPOSIT)
_DATED = (*WITH_SPREAD, *SWAP_KINDS)

NEEDED: dict[str, tuple[HoldingKind, ...]] = {
    "Nominal": (*_DATED, _DEPOSIT),
    "Coupon": (_BOND, LINKED, *SWAP_KINDS),
    "Frequency": (*_COUPONS, *SWAP_KINDS),
    "Maturity": _DATED,
    "Market value": _STATED,
}
"""Kinds that cannot do without a column."""
USED: dict[str, tuple[HoldingKind, ...]] = {
    "Nominal": NEEDED["Nominal"],
    "Coupon": (*NEEDED["Coupon"], _TERM_DEPOSIT),
    "Frequency": (*NEEDED["Frequency"], _ZERO),
    "Maturity": _DATED,
    "Duration": _STATED,
    "Start date": (*_COUPONS, _TERM_DEPOSIT, *SWAP_KINDS),
    "First coupon": _COUPONS,
    "Ex-dividend days": _COUPONS,
    "Bought ex-dividend": _COUPONS,
    "Amortisation": (_BOND, FLOATER, *SWAP_KINDS),
    "Price": _QUOTED,
    "Price kind": _QUOTED,
    "Discount rate": (_BILL,),
    "Current rate": (FLOATER, *SWAP_KINDS),
    "Margin": (FLOATER, *SWAP_KINDS),
    "Floating frequency": SWAP_KINDS,
    "Floating day count": SWAP_KINDS,
    "Default rate": WITH_SPREAD,
    "Recovery rate": WITH_SPREAD,
    "Index lag (months)": (LINKED,),
    "Index ratio": (LINKED,),
    "Principal floor": (LINKED,),
}
"""Kinds that have a use for a column; the columns that are not here are for every kind."""
LEFT_OUT = frozenset(
    {"First coupon", "Amortisation", "Price", "Discount rate", "Default rate", "Principal floor"}
)
"""Columns that a holding of a kind without a use for them cannot even keep."""
SAYS_NOTHING = {
    "Amortisation": "bullet",
    "Price kind": "clean",
    "Bought ex-dividend": "no",
    "Principal floor": "no",
}
"""Words that stand for what holds anyway."""
USUAL = {"Index lag (months)": 3.0, "Index ratio": 1.0}
"""Numbers that do."""


class KindMasks:
    """Masks of the holdings of some kinds.

    Parameters
    ----------
    kinds : list of HoldingKind or None
        Of each holding, None where it is not known.
    """

    def __init__(self, kinds: list[HoldingKind | None]) -> None:
        codes = {kind: code for code, kind in enumerate(HoldingKind)}
        self._code = np.array([-1 if kind is None else codes[kind] for kind in kinds], dtype=np.int64)
        self._codes = codes

    def among(self, kinds: Iterable[HoldingKind]) -> BoolArray:
        """Which holdings are of one of some kinds."""
        return np.isin(self._code, [self._codes[kind] for kind in kinds])
