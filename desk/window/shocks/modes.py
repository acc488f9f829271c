"""The modes of the station, in the order of their tabs."""

from __future__ import annotations

from desk.window.shocks.grid_mode import GridMode
from desk.window.shocks.mode import Mode
from desk.window.shocks.reverse_mode import ReverseMode
from desk.window.shocks.shock_mode import ShockMode
from desk.window.shocks.table_mode import TableMode
from desk.window.shocks.what_if_mode import WhatIfMode

__all__ = ["MODES"]

MODES: tuple[type[Mode], ...] = (TableMode, ShockMode, WhatIfMode, ReverseMode, GridMode)
