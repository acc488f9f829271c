"""The work of the program, as the window and the commands call it.

Every task takes a `progress` callback and a `cancel` token. The rooms below know only the callback:
the one they are given looks at the token first and stops the work by raising `Cancelled`.
"""

from __future__ import annotations

from desk.tasks.calibration import calibrate
from desk.tasks.results import read, report, save_copy, simulate, value
from desk.tasks.running import Cancelled, CancelToken, Progress
from desk.tasks.scenarios import compare_models, curve_at, export_scenarios, look_ahead, paths_of
from desk.tasks.shocks import grid, least_move, reverse, shock, shock_sets, shocks_of

__all__ = [
    "CancelToken",
    "Cancelled",
    "Progress",
    "calibrate",
    "compare_models",
    "curve_at",
    "export_scenarios",
    "grid",
    "least_move",
    "look_ahead",
    "paths_of",
    "read",
    "report",
    "reverse",
    "save_copy",
    "shock",
    "shock_sets",
    "shocks_of",
    "simulate",
    "value",
]
