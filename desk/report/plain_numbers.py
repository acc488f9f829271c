"""Numbers as JSON and comparisons take them: plain and finite, or None."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

__all__ = ["percentile_name", "plain_number", "plain_rows"]


def plain_number(value: Any) -> float | int | None:
    """A plain finite number, or None."""
    if value is None:
        return None
    plain = value.item() if hasattr(value, "item") else value
    if isinstance(plain, int):
        return int(plain)
    return float(plain) if math.isfinite(plain) else None


def plain_rows(**columns: Sequence[Any] | Any) -> list[dict[str, float | int | None]]:
    """Columns of one length as one object a row."""
    return [
        {name: plain_number(value) for name, value in zip(columns, row, strict=True)}
        for row in zip(*columns.values(), strict=True)
    ]


def percentile_name(level: float) -> str:
    """The key of a percentile: ``p05`` for 5, ``p97.5`` for 97.5."""
    whole, _, part = repr(float(level)).partition(".")
    return f"p{whole:>02}" if part == "0" else f"p{whole:>02}.{part}"
