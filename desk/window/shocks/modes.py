"""The modes of the station, in the order of their tabs."""

from __future__ import annotations

from desk.window.shocks.mode import Mode
from desk.window.shocks.table_mode import TableMode

__all__ = ["MODES"]

MODES: tuple[type[Mode], ...] = (TableMode,)
