"""The sheets of line terms and of shocks."""

from __future__ import annotations

from collections.abc import Sequence

from desk.book import IndexationKind, LineTerms, Shock, ShockSettings, Side
from desk.rates.compounding import Compounding
from desk.report.book_sheets import unless_zero
from desk.report.plain_workbook import Value

__all__ = ["line_terms_row", "shock_rows", "shock_settings"]


def line_terms_row(terms: LineTerms) -> tuple[Value, ...]:
    """The row of one line; what is as usual is left empty."""
    indexation = terms.indexation
    kind = indexation.kind
    return (
        None if terms.side is Side.LIABILITIES else str(terms.side),
        terms.line,
        None if kind is IndexationKind.FIXED else str(kind),
        indexation.rise if kind is IndexationKind.RISING else unless_zero(indexation.rise),
        indexation.floor,
        indexation.cap,
        terms.spread,
        terms.rate,
    )


def shock_rows(shocks: Sequence[Shock]) -> list[tuple[Value, ...]]:
    """One row a move; a shock without moves has one with its name alone."""
    rows: list[tuple[Value, ...]] = []
    for shock in shocks:
        source = shock.source or None
        compounding = None if shock.compounding is Compounding.CONTINUOUS else str(shock.compounding)
        common = (source, compounding, shock.set_name or None)
        rows += [
            (shock.name, str(move.kind), move.size, move.term, move.target or None, *common)
            for move in shock.moves
        ]
        if not shock.moves:
            rows.append((shock.name, None, None, None, None, *common))
    return rows


def shock_settings(settings: ShockSettings) -> dict[str, Value]:
    """The items of the shock settings that are not as usual."""
    thresholds = "; ".join(repr(float(ratio)).removesuffix(".0") for ratio in settings.thresholds) or "none"
    return {
        "Sets": "; ".join(settings.sets) or None,
        "Thresholds": None if settings.thresholds == ShockSettings.thresholds else thresholds,
    }
