"""The stations of this version, in the order of the work."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from desk.window.station import Station

__all__ = ["StationEntry", "all_stations"]


@dataclass(frozen=True)
class StationEntry:
    """A station before it is made.

    Attributes
    ----------
    number : int
        Alt and this figure show it: its place among all eight of the work, so that it never moves.
    key, title, purpose : str
    load : callable
        Gives its class. It imports what the station needs only then: the window is up before.
    """

    number: int
    key: str
    title: str
    purpose: str
    load: Callable[[], type[Station]]


def _intake() -> type[Station]:
    from desk.window.intake.station import IntakeStation

    return IntakeStation


def _curve() -> type[Station]:
    from desk.window.curve.station import CurveStation

    return CurveStation


def _standing() -> type[Station]:
    from desk.window.standing.station import StandingStation

    return StandingStation


def _shocks() -> type[Station]:
    from desk.window.shocks.station import ShocksStation

    return ShocksStation


def _scenarios() -> type[Station]:
    from desk.window.scenarios.station import ScenariosStation

    return ScenariosStation


def _report() -> type[Station]:
    from desk.window.report.station import ReportStation

    return ReportStation


def all_stations() -> tuple[StationEntry, ...]:
    """Every station of this version, in the order of the work."""
    return (
        StationEntry(1, "intake", "Intake", "What was read, and what is wrong with it", _intake),
        StationEntry(2, "curve", "Curve", "The curve that everything is discounted on", _curve),
        StationEntry(3, "standing", "Standing", "What both sides are worth, and the gap", _standing),
        StationEntry(4, "shocks", "Shocks", "What happens when markets move", _shocks),
        StationEntry(5, "scenarios", "Scenarios", "What rates may do, and what follows", _scenarios),
        StationEntry(8, "report", "Report", "The workbook for colleagues", _report),
    )
