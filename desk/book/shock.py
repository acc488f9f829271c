"""Shocks: named moves of markets, and of the promises themselves."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from enum import StrEnum

from desk.rates.compounding import Compounding

__all__ = ["RATE_MOVES", "Move", "MoveKind", "Shock", "ShockSet", "ShockSettings"]


class MoveKind(StrEnum):
    """What a move moves. Sizes of rates are in basis points, of zero rates compounded as the shock says."""

    PARALLEL = "parallel"
    """All rates by one size."""
    SHORT = "short"
    """Short rates by the size, fading with ``exp(-t / 4)``."""
    LONG = "long"
    """Long rates by the size, growing with ``1 - exp(-t / 4)``."""
    TWIST = "twist"
    """No move at the term stated, minus the size at 0, the size at twice the term and beyond, on a line."""
    RATE = "rate"
    """The rate at the term stated; several terms of one shock are joined by lines, flat outside them."""
    RELATIVE = "relative"
    """Likewise, as a share of the rate itself; a rate below 0 is left as it is."""
    LEAST = "least"
    """The least absolute size, up or down by its sign, of relative moves."""
    FLOOR = "floor"
    """Shocked rates come to lie no lower than this [basis points], at the term stated, joined by lines; a
    rate that is lower to begin with is left as it is."""
    INFLATION = "inflation"
    """All expected inflation rates by one size; at the term stated, where there is one."""
    SPREAD = "spread"
    """Credit spreads of a holding or of a kind of holding."""
    VALUE = "value"
    """The value of funds and property, by holding or kind, as a share of it."""
    AMOUNT = "amount"
    """The amounts of a line of liabilities, as a share of them."""
    TIME = "time"
    """Payments of a line of liabilities later by so many years."""
    DECLINE = "decline"
    """Amounts of a line of liabilities by a share of them that grows with time: ``(1 + size)^t - 1``."""


RATE_MOVES = frozenset(
    {
        MoveKind.PARALLEL,
        MoveKind.SHORT,
        MoveKind.LONG,
        MoveKind.TWIST,
        MoveKind.RATE,
        MoveKind.RELATIVE,
        MoveKind.LEAST,
        MoveKind.FLOOR,
    }
)
"""Moves of the curve."""


@dataclass(frozen=True)
class Move:
    """One move of a shock.

    Attributes
    ----------
    kind : MoveKind
    size : float
        Basis points for rates, inflation and spreads; a share for relative moves, values, amounts and
        decline; years for time.
    term : float or None
        [years]
    target : str
        A holding, a kind of holding or a line; empty for all.
    """

    kind: MoveKind
    size: float
    term: float | None = None
    target: str = ""

    def __post_init__(self) -> None:
        """Check that the numbers are some."""
        if not math.isfinite(self.size):
            raise ValueError("`size` must be finite")
        if self.term is not None and not (math.isfinite(self.term) and self.term >= 0.0):
            raise ValueError("`term` must be at least 0")


@dataclass(frozen=True)
class Shock:
    """A named shock: its moves happen together.

    Attributes
    ----------
    name : str
    moves : tuple of Move
    source : str
        Where it comes from: a rule with its year and article, or empty for the user's own.
    compounding : Compounding
        Of the zero rates and the expected inflation rates that its moves change: a rule that moves annual
        rates is met exactly only on annual rates.
    set_name : str
        The set it is of; empty for the user's own.
    """

    name: str
    moves: tuple[Move, ...]
    source: str = ""
    compounding: Compounding = Compounding.CONTINUOUS
    set_name: str = ""

    def scaled(self, scale: float, *, name: str | None = None) -> Shock:
        """The shock with every size times `scale`; floors stay where they are.

        Parameters
        ----------
        scale : float
            Negative for the opposite move.
        name : str, optional
            Of the new shock; by default the same.
        """
        moves = tuple(
            move if move.kind is MoveKind.FLOOR else replace(move, size=scale * move.size)
            for move in self.moves
        )
        return replace(self, moves=moves, name=self.name if name is None else name)


@dataclass(frozen=True)
class ShockSet:
    """A prescribed or customary set of shocks, as it stands for one currency.

    Attributes
    ----------
    name : str
    source : str
        The rule with its year and article, or what custom it is.
    status : str
        From when and until when it holds, and what of it is not confirmed.
    shocks : tuple of Shock
        None where the set has no sizes for the currency, or states figures alone.
    is_usual : bool
        Whether a book in the currency that names no sets asks for this one.
    figures : tuple of (str, float)
        Stated figures that are no moves of a curve or of flows, such as a fall in mortality: what they do to
        a line of liabilities is for the user to state.
    has_sizes_by_currency : bool
        Whether the sizes are stated currency by currency.
    """

    name: str
    source: str
    status: str = ""
    shocks: tuple[Shock, ...] = ()
    is_usual: bool = True
    figures: tuple[tuple[str, float], ...] = ()
    has_sizes_by_currency: bool = False


@dataclass(frozen=True)
class ShockSettings:
    """Which shocks a book asks for beside its own, and how the answers are judged.

    Attributes
    ----------
    sets : tuple of str
        Prescribed sets, by name; empty for those that suit the currency.
    thresholds : tuple of float
        Funding ratios that part good from fair and fair from poor, falling.
    """

    sets: tuple[str, ...] = ()
    thresholds: tuple[float, ...] = (1.05, 1.0)
