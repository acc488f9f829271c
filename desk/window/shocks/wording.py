"""Shocks in words: what each kind of move is called, the unit of its size, and what the answers say."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from desk.book import Book, Move, MoveKind, Shock, Side
from desk.book.shock import RATE_MOVES
from desk.valuation.shock_records import ShockResult, ShockTable, band_name
from desk.window.parts import numbers
from desk.window.standing.wording import amount

__all__ = [
    "KINDS",
    "KindWords",
    "band_words",
    "in_short",
    "kind_named",
    "moves_words",
    "set_words",
    "short",
    "shown_size",
    "size_from",
    "table_words",
    "targets_of",
    "thresholds_words",
    "verdict_of",
]


@dataclass(frozen=True)
class KindWords:
    """A kind of move for the reader.

    Attributes
    ----------
    name : str
    unit : str
        Of its size as shown.
    factor : float
        What is shown is the size times this.
    needs_term, may_have_term : bool
    targets : str
        What it may apply to: ``""`` for everything at once, ``holdings``, ``funds`` or ``lines``.
    explanation : str
        One sentence.
    """

    name: str
    unit: str
    explanation: str
    factor: float = 1.0
    needs_term: bool = False
    may_have_term: bool = False
    targets: str = ""


_BP = "bp"
KINDS = {
    MoveKind.PARALLEL: KindWords("All rates", _BP, "All rates by one size."),
    MoveKind.SHORT: KindWords("Short rates", _BP, "Most at 0 years, fading towards long terms."),
    MoveKind.LONG: KindWords("Long rates", _BP, "Nothing at 0 years, growing towards long terms."),
    MoveKind.TWIST: KindWords(
        "Twist about a term", _BP, "Down by it at 0 years, up by it at twice the term.", needs_term=True
    ),
    MoveKind.RATE: KindWords(
        "Rate at a term", _BP, "Several terms are joined by lines, flat outside them.", needs_term=True
    ),
    MoveKind.RELATIVE: KindWords(
        "Share of the rate",
        "%",
        "As a share of the rate itself, where it is above 0.",
        100.0,
        may_have_term=True,
    ),
    MoveKind.LEAST: KindWords(
        "Least move", _BP, "The least size of the shares of rates beside it.", may_have_term=True
    ),
    MoveKind.FLOOR: KindWords(
        "Floor", _BP, "Shocked rates come to lie no lower than this.", may_have_term=True
    ),
    MoveKind.INFLATION: KindWords(
        "Expected inflation", _BP, "All expected inflation, or that at a term.", may_have_term=True
    ),
    MoveKind.SPREAD: KindWords(
        "Credit spreads", _BP, "Of a holding, of a kind of holding, or of all.", targets="holdings"
    ),
    MoveKind.VALUE: KindWords(
        "Funds and property", "%", "A fall is below 0; of one, of a kind, or of all.", 100.0, targets="funds"
    ),
    MoveKind.AMOUNT: KindWords(
        "Amounts promised", "%", "More, or below 0 less, of a line or of all.", 100.0, targets="lines"
    ),
    MoveKind.TIME: KindWords(
        "Payments later", "years", "Of a line or of all; below 0 sooner.", targets="lines"
    ),
    MoveKind.DECLINE: KindWords(
        "Amounts by year", "% a year", "Growing with time; a decline is below 0.", 100.0, targets="lines"
    ),
}
"""Every kind of move."""


def kind_named(text: str) -> MoveKind | None:
    """The kind that a text names, as it is shown or as a workbook has it."""
    folded = " ".join(text.casefold().split())
    for kind, words in KINDS.items():
        if folded in (kind.value, words.name.casefold()):
            return kind
    return None


def shown_size(move: Move) -> float:
    """The size of a move in the unit of its kind, without the dust of a multiplication."""
    return float(f"{move.size * KINDS[move.kind].factor:.12g}")


def size_from(kind: MoveKind, shown: float) -> float:
    """The size that is shown so."""
    factor = KINDS[kind].factor
    return shown if factor == 1.0 else float(f"{shown / factor:.15g}")


def targets_of(book: Book, kind: MoveKind) -> tuple[str, ...]:
    """What a move of a kind may apply to in a book: kinds of holding first, then names."""
    which = KINDS[kind].targets
    if which == "lines":
        return tuple(dict.fromkeys(book.liabilities.line_names))
    if which not in ("holdings", "funds"):
        return ()
    valued = ("fund", "property")
    holdings = [
        holding
        for holding in book.holdings
        if (holding.kind.value in valued) == (which == "funds") and holding.kind.value != "deposit"
    ]
    kinds = dict.fromkeys(holding.kind.value for holding in holdings)
    return (*kinds, *dict.fromkeys(holding.name for holding in holdings))


def _move_words(move: Move) -> str:
    words = KINDS[move.kind]
    size = f"{numbers.signed(shown_size(move), _digits(shown_size(move)))} {words.unit}"
    at = "" if move.term is None else f" at {numbers.exact(move.term)} years"
    of = f" of {move.target}" if move.target else ""
    return f"{words.name}{of} {size}{at}"


def _digits(value: float) -> int:
    return next((digits for digits in range(4) if abs(round(value, digits) - value) < 1e-9), 4)


def moves_words(moves: Sequence[Move], most: int = 3) -> str:
    """Moves in a line: the first few and how many more."""
    if not moves:
        return "no moves yet"
    shown = "; ".join(_move_words(move) for move in moves[:most])
    more = len(moves) - most
    return f"{shown}; and {numbers.integer(more)} more" if more > 0 else shown


def in_short(shock: Shock) -> str:
    """What a shock moves, in a word or two."""
    kinds = {move.kind for move in shock.moves}
    parts = ["rates"] if kinds & RATE_MOVES else []
    for kind, word in (
        (MoveKind.INFLATION, "inflation"),
        (MoveKind.SPREAD, "spreads"),
        (MoveKind.VALUE, "funds"),
    ):
        if kind in kinds:
            parts.append(word)
    if kinds & {MoveKind.AMOUNT, MoveKind.TIME, MoveKind.DECLINE}:
        parts.append(Side.LIABILITIES.value)
    return ", ".join(parts) or "nothing"


def short(name: str, most: int = 60) -> str:
    """A name in a sentence: its beginning, where it is long."""
    return name if len(name) <= most else f"{name[: most - 1].rstrip()}…"


def set_words(result: ShockResult) -> str:
    """The set of a shock; the user's own are said to be."""
    return result.set_name or "own"


def thresholds_words(thresholds: Sequence[float]) -> str:
    """What the thresholds part, in a sentence."""
    if not thresholds:
        return "No thresholds: the funding ratio is not judged."
    shown = [numbers.ratio(threshold, _digits(100 * threshold)) for threshold in thresholds]
    if len(shown) == 2:
        return f"Good from {shown[0]}, fair from {shown[1]}, poor below."
    if len(shown) == 1:
        return f"Good from {shown[0]}; below it, missed."
    return f"Good from {shown[0]}; then as many thresholds are missed as the ratio falls short of."


def band_words(band: int, thresholds: Sequence[float]) -> str:
    """A band in words with the threshold that it falls short of."""
    if not thresholds:
        return ""
    name = band_name(band, tuple(thresholds))
    if band == 0:
        return name
    missed = thresholds[band - 1]
    return f"{name}: below {numbers.ratio(missed, _digits(100 * missed))}"


def verdict_of(funding_ratio: float, band: int, thresholds: Sequence[float]) -> str:
    """The verdict on a funding ratio in words."""
    if not math.isfinite(funding_ratio):
        return "no liabilities"
    return band_words(band, thresholds) or "not judged"


def table_words(table: ShockTable) -> str:
    """What a table of shocks says, in a sentence or two."""
    if not table.results:
        return "No shock could be computed." if table.faults else "There are no shocks yet."
    currency = table.currency
    worst = min(table.results, key=lambda result: result.change_in_surplus)
    best = max(table.results, key=lambda result: result.change_in_surplus)
    count = len(table.results)
    of = "the one shock" if count == 1 else f"{numbers.integer(count)} shocks"
    if worst.change_in_surplus >= 0.0:
        head = f"No loss under {of}."
    else:
        ratio = (
            f", to a funding ratio of {numbers.ratio(worst.funding_ratio)}"
            if math.isfinite(worst.funding_ratio)
            else ""
        )
        head = (
            f"Worst of {of}: {short(worst.name)} takes {amount(-worst.change_in_surplus, currency)} off the "
            f"surplus{ratio}."
        )
    tail = ""
    if best is not worst and best.change_in_surplus > 0.0:
        tail = f" Best: {short(best.name)} adds {amount(best.change_in_surplus, currency)}."
    return head + tail
