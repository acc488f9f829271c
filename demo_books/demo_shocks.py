"""Shocks that an invented insurer and an invented endowment ask themselves about: every kind of move."""

from __future__ import annotations

from desk.book import Move, MoveKind, Shock

__all__ = ["endowment_shocks", "insurer_shocks"]

_OWN = "own view of the risk committee (invented)"


def insurer_shocks() -> tuple[Shock, ...]:
    """Eight shocks, every kind of move among them."""
    by_term = ((1.0, 175.0), (5.0, 125.0), (10.0, 90.0), (20.0, 60.0), (30.0, 45.0))
    shares = ((1.0, -0.45), (5.0, -0.38), (10.0, -0.32), (20.0, -0.28))
    annuities = (
        *("Annuities in payment, level", "Annuities in payment, rising", "Joint-life annuities"),
        *("Bulk annuities", "Deferred annuities"),
    )
    return (
        Shock(
            "Policy rate up, long rates follow",
            tuple(Move(MoveKind.RATE, size, term) for term, size in by_term),
            _OWN,
        ),
        Shock("Twist about ten years", (Move(MoveKind.TWIST, 60.0, 10.0),), _OWN),
        Shock("Short squeeze, long relief", (Move(MoveKind.SHORT, 150.0), Move(MoveKind.LONG, -40.0)), _OWN),
        Shock(
            "Rates fall by shares",
            (
                *(Move(MoveKind.RELATIVE, share, term) for term, share in shares),
                Move(MoveKind.LEAST, -75.0),
                Move(MoveKind.FLOOR, 0.0),
            ),
            _OWN,
        ),
        Shock(
            "Credit and markets fall together",
            (
                Move(MoveKind.PARALLEL, -50.0),
                Move(MoveKind.SPREAD, 110.0, target="bond"),
                Move(MoveKind.VALUE, -0.35, target="With-profits equity portfolio"),
                Move(MoveKind.VALUE, -0.08, target="Commercial mortgages"),
                Move(MoveKind.VALUE, -0.25, target="property"),
            ),
            _OWN,
        ),
        Shock(
            "Inflation stays high",
            (
                Move(MoveKind.INFLATION, 150.0, 1.0),
                Move(MoveKind.INFLATION, 60.0, 10.0),
                Move(MoveKind.PARALLEL, 40.0),
            ),
            _OWN,
        ),
        Shock(
            "Annuitants live longer",
            tuple(Move(MoveKind.DECLINE, 0.006, target=line) for line in annuities),
            "own estimate: survivors grow by 0.6 % a year of those expected (invented)",
        ),
        Shock(
            "Mass lapse, claims drawn out",
            (
                Move(MoveKind.AMOUNT, -0.4, target="With-profits savings"),
                Move(MoveKind.AMOUNT, -0.25, target="Term insurance"),
                Move(MoveKind.AMOUNT, 0.1, target="Disability income"),
                Move(MoveKind.TIME, 0.5, target="Disability income"),
            ),
            "own estimate: two in five savers leave (invented)",
        ),
    )


def endowment_shocks() -> tuple[Shock, ...]:
    """Two plain shocks."""
    return (
        Shock("Markets fall by a fifth", (Move(MoveKind.VALUE, -0.2, target="fund"),), "own view (invented)"),
        Shock("Costs rise 1 % a year faster", (Move(MoveKind.DECLINE, 0.01),), "own view (invented)"),
    )
