"""A book under shocks: prescribed and own, in reverse, and two against each other."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from desk.book import Book, Fault, Shock
from desk.book.arrays import FloatArray
from desk.places import resources
from desk.tasks.running import CancelToken, Progress, watched

if TYPE_CHECKING:
    from desk.intake.prescribed_shocks import ShockSets
    from desk.valuation.reverse import Goal, ReverseResult
    from desk.valuation.reverse_rates import LeastMove
    from desk.valuation.shock_grid import ShockGrid
    from desk.valuation.shock_records import ShockTable

__all__ = ["grid", "least_move", "reverse", "shock", "shock_sets", "shocks_of"]


def shock_sets(currency: str, *, folder: Path | None = None) -> ShockSets:
    """The prescribed sets of shocks, as they stand for a currency.

    Parameters
    ----------
    currency : str
        ISO 4217 code.
    folder : Path, optional
        Where the sets are; by default those that come with the program.

    Returns
    -------
    ShockSets
        With the faults of their files.
    """
    from desk.intake.prescribed_shocks import read_shock_sets

    return read_shock_sets(folder or resources() / "shocks", currency=currency)


def shocks_of(
    book: Book, *, sets: tuple[str, ...] = (), folder: Path | None = None
) -> tuple[tuple[Shock, ...], tuple[Fault, ...]]:
    """The shocks that a book is to be put under.

    Parameters
    ----------
    book : Book
    sets : tuple of str
        Names of prescribed sets in place of those the book asks for.
    folder : Path, optional
        See `shock_sets`.

    Returns
    -------
    shocks : tuple of Shock
        The book's own first, then those of the sets it asks for; where it asks for none, of the sets usual
        for its currency.
    faults : tuple of Fault
        Sets that could not be had.
    """
    shocks, faults, _ = _chosen(book, sets=sets, folder=folder)
    return shocks, faults


def _chosen(
    book: Book, *, sets: tuple[str, ...], folder: Path | None
) -> tuple[tuple[Shock, ...], tuple[Fault, ...], ShockSets]:
    """The shocks of a book with the faults, and the prescribed sets that there are."""
    from desk.intake.prescribed_shocks import chosen_shocks

    found = shock_sets(book.basis.currency, folder=folder)
    prescribed, faults = chosen_shocks(
        found,
        asked=sets or book.shock_settings.sets,
        currency=book.basis.currency,
        with_inflation=book.basis.inflation is not None,
    )
    return (*book.shocks, *prescribed), (*found.faults, *faults), found


def shock(
    book: Book,
    *,
    sets: tuple[str, ...] = (),
    folder: Path | None = None,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> ShockTable:
    """Put a book under its shocks.

    Parameters
    ----------
    book : Book
    sets, folder : optional
        See `shocks_of`.
    progress, cancel : optional
        See `read`.

    Returns
    -------
    ShockTable

    Raises
    ------
    ValueError
        If the basis of the book gives no curve.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.valuation.shocks import shock_table

    watch = watched(progress, cancel)
    watch(0.0)
    shocks, faults, found = _chosen(book, sets=sets, folder=folder)
    asked = sets or book.shock_settings.sets
    used = {one.set_name for one in shocks}
    settings = (
        ("sets", ", ".join(asked) if asked else f"usual for {book.basis.currency}"),
        *(
            (f"set {own.name}", " ".join(part for part in (own.source, own.status) if part))
            for own in found.sets
            if own.name in used
        ),
    )
    table = shock_table(book, shocks, settings=settings, progress=watch)
    watch(1.0)
    return replace(table, faults=(*faults, *table.faults))


def reverse(
    book: Book,
    *,
    goal: Goal,
    level: float,
    along: Shock | None = None,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> ReverseResult:
    """Find the size of a shock at which the funding ratio or the surplus comes to a level.

    Parameters
    ----------
    book : Book
    goal : Goal
    level : float
        As a ratio, or [currency].
    along : Shock, optional
        Its shape; by default a parallel move of all rates.
    progress, cancel : optional
        See `read`.

    Returns
    -------
    ReverseResult
        With the reason where there is no solution.

    Raises
    ------
    ValueError
        If the basis of the book gives no curve, or the shock can be computed at no size.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.valuation.reverse import reverse_along, reverse_parallel
    from desk.valuation.shock_base import shock_base

    watch = watched(progress, cancel)
    watch(0.0)
    base = shock_base(book)
    watch(0.2)
    if along is None:
        found = reverse_parallel(base, goal=goal, level=level)
    else:
        found = reverse_along(base, along, goal=goal, level=level)
    watch(1.0)
    return found


def least_move(
    book: Book,
    *,
    goal: Goal,
    level: float,
    from_history: bool = False,
    horizon: float = 1.0,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> LeastMove:
    """Find the likeliest move of the key rates that brings the funding ratio or the surplus to a level.

    Parameters
    ----------
    book : Book
    goal : Goal
    level : float
        As a ratio, or [currency].
    from_history : bool
        Whether the covariance is that of the book's yield history; by default that of its rates model.
    horizon : float
        Of the covariance [years].
    progress, cancel : optional
        See `read`.

    Returns
    -------
    LeastMove
        With the reason where there is no solution.

    Raises
    ------
    ValueError
        If the book has no such source of a covariance, or its basis gives no curve.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.rates.gaussian import GaussianRates
    from desk.scenarios.models import rate_model
    from desk.valuation.reverse_rates import covariance_of_history, covariance_of_model
    from desk.valuation.reverse_rates import least_move as find
    from desk.valuation.shock_base import shock_base

    watch = watched(progress, cancel)
    watch(0.0)
    if from_history:
        if book.yield_history is None:
            raise ValueError("the book has no history of yields, from which a covariance could be taken")
        covariance = covariance_of_history(book.yield_history, horizon=horizon)
    else:
        if book.rates_model is None:
            raise ValueError("the book has no rates model, which would give a covariance")
        model = rate_model(book)
        if not isinstance(model, GaussianRates):
            raise ValueError(f"the model {book.rates_model.name} is not Gaussian: it gives no one covariance")
        covariance = covariance_of_model(model, horizon=horizon)
    base = shock_base(book)
    watch(0.2)
    found = find(base, covariance, goal=goal, level=level)
    watch(1.0)
    return found


def grid(
    book: Book,
    first: Shock,
    second: Shock,
    *,
    first_scale: FloatArray,
    second_scale: FloatArray,
    progress: Progress | None = None,
    cancel: CancelToken | None = None,
) -> ShockGrid:
    """Put a book under two shocks together, each in many sizes.

    Parameters
    ----------
    book : Book
    first, second : Shock
    first_scale, second_scale : ndarray, shapes (m,) and (k,)
        What the sizes are multiplied by.
    progress, cancel : optional
        See `read`.

    Returns
    -------
    ShockGrid

    Raises
    ------
    ValueError
        If the basis of the book gives no curve, or one of the shocks can be computed at no scale.
    Cancelled
        If `cancel` was set before the work was done.
    """
    from desk.valuation.shock_base import shock_base
    from desk.valuation.shock_grid import shock_grid

    watch = watched(progress, cancel)
    watch(0.0)
    return shock_grid(
        shock_base(book),
        first,
        second,
        first_scale=first_scale,
        second_scale=second_scale,
        progress=watch,
    )
