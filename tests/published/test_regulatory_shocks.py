"""Prescribed shocks against the rules they come from."""

from __future__ import annotations

import numpy as np
import pytest

from desk.book.shock import Move, MoveKind, Shock, ShockSet
from desk.intake.prescribed_shocks import read_shock_sets, symmetric_adjustment
from desk.places import resources
from desk.rates.compounding import Compounding, from_continuous, to_continuous
from desk.valuation.moved_curve import CurveMove

FOLDER = resources() / "shocks"

# Basel Committee on Banking Supervision, Interest rate risk in the banking book (April 2016, d368), Annex 2,
# Table 1, from memory; Commission Delegated Regulation (EU) 2024/856, Annex Part A, carries the same figures
# for these currencies. Basis points: parallel, short, long.
BASEL = {
    "ARS": (400, 500, 300), "AUD": (300, 450, 200), "BRL": (400, 500, 300), "CAD": (200, 300, 150),
    "CHF": (100, 150, 100), "CNY": (250, 300, 150), "EUR": (200, 250, 100), "GBP": (250, 300, 150),
    "HKD": (200, 250, 100), "IDR": (400, 500, 350), "INR": (400, 500, 300), "JPY": (100, 100, 100),
    "KRW": (300, 400, 200), "MXN": (400, 500, 300), "RUB": (400, 500, 300), "SAR": (200, 300, 150),
    "SEK": (200, 300, 150), "SGD": (150, 200, 100), "TRY": (400, 500, 300), "USD": (200, 300, 150),
    "ZAR": (400, 500, 300),
}  # fmt: skip
# Commission Delegated Regulation (EU) 2024/856, Annex Part A.
FURTHER = {
    "BGN": (250, 350, 150), "CZK": (200, 250, 100), "DKK": (200, 250, 150), "HUF": (300, 450, 200),
    "PLN": (250, 350, 150), "RON": (350, 500, 250),
}  # fmt: skip


def of_set(name: str, currency: str) -> ShockSet:
    """A set that comes with the program."""
    found = read_shock_sets(FOLDER, currency=currency)
    assert found.faults == ()
    return next(own for own in found.sets if own.name == name)


def by_name(own: ShockSet) -> dict[str, Shock]:
    """Its shocks."""
    return {shock.name: shock for shock in own.shocks}


def change(shock: Shock, times: list[float], annual: list[float] | None = None) -> list[float]:
    """What a shock adds to zero rates, in basis points; the rates before are 5 % by default."""
    time = np.array(times)
    zero = np.full(time.size, 0.05) if annual is None else to_continuous(annual, Compounding.ANNUAL)
    move = CurveMove.of_shock(shock)
    assert move is not None
    return [float(size) for size in move.change(time, zero) / 1e-4]


@pytest.mark.parametrize("name", ["Basel 2016", "EU 2024/856"])
@pytest.mark.parametrize("currency", sorted({**BASEL, **FURTHER}))
def test_sizes_by_currency(name: str, currency: str) -> None:
    """Parallel moves are of their size; short ones at time 0, long ones far out."""
    own = of_set(name, currency)
    if name == "Basel 2016" and currency in FURTHER:
        assert own.shocks == ()
        return
    parallel, short, long = {**BASEL, **FURTHER}[currency]
    shocks = by_name(own)
    assert len(shocks) == 6
    assert change(shocks["Parallel up"], [7.0]) == pytest.approx([parallel])
    assert change(shocks["Parallel down"], [7.0]) == pytest.approx([-parallel])
    assert change(shocks["Short rates up"], [0.0]) == pytest.approx([short])
    assert change(shocks["Short rates down"], [0.0]) == pytest.approx([-short])
    assert change(shocks["Steepener"], [0.0, 400.0]) == pytest.approx([-0.65 * short, 0.9 * long])
    assert change(shocks["Flattener"], [0.0, 400.0]) == pytest.approx([0.8 * short, -0.6 * long])


def test_worked_example() -> None:
    """d368, Annex 2, example (from memory): 100 basis points short and long, at 3.5 years."""
    short = Shock("short", (Move(MoveKind.SHORT, 100.0),))
    steeper = Shock("steeper", (Move(MoveKind.SHORT, -65.0), Move(MoveKind.LONG, 90.0)))
    flatter = Shock("flatter", (Move(MoveKind.SHORT, 80.0), Move(MoveKind.LONG, -60.0)))
    assert change(short, [3.5]) == pytest.approx([41.7], abs=0.05)
    assert change(steeper, [3.5]) == pytest.approx([25.4], abs=0.05)
    assert change(flatter, [3.5]) == pytest.approx([-1.6], abs=0.05)


# Formulas and sizes of d368, values computed independently: basis points at 0.25, 1, 2, 5, 10, 20, 30 years.
EURO = {
    "Short rates up": [234.8533, 194.7002, 151.6327, 71.6262, 20.5212, 1.6845, 0.1383],
    "Steepener": [-147.2018, -106.6472, -63.149, 17.6575, 69.2735, 88.2987, 89.8603],
    "Flattener": [184.2474, 142.4882, 97.698, 14.4912, -38.6579, -58.2481, -59.8562],
}


@pytest.mark.parametrize("name", sorted(EURO))
def test_euro_shocks_by_tenor(name: str) -> None:
    """From the set as it comes."""
    shock = by_name(of_set("Basel 2016", "EUR"))[name]
    assert change(shock, [0.25, 1, 2, 5, 10, 20, 30]) == pytest.approx(EURO[name], abs=5.1e-5)


def test_floor_by_term() -> None:
    """Commission Delegated Regulation (EU) 2024/856 (from memory): -150 basis points, by 3 a year to 0."""
    shocks = by_name(of_set("EU 2024/856", "EUR"))
    move = CurveMove.of_shock(shocks["Parallel down"])
    assert move is not None
    time = np.array([0.0, 10.0, 50.0, 70.0, 0.0, 10.0])
    zero = np.array([0.0, 0.0, 0.001, 0.001, -0.02, 0.04])
    after = (zero + move.change(time, zero)) / 1e-4
    assert list(after) == pytest.approx([-150.0, -120.0, 0.0, 0.0, -200.0, 200.0])
    assert not any(own.kind is MoveKind.FLOOR for own in shocks["Parallel up"].moves)


# Commission Delegated Regulation (EU) 2015/35, Articles 166(1) and 167(1): per cent by maturity.
UP = {
    1: 70, 2: 70, 3: 64, 4: 59, 5: 55, 6: 52, 7: 49, 8: 47, 9: 44, 10: 42, 11: 39, 12: 37, 13: 35, 14: 34,
    15: 33, 16: 31, 17: 30, 18: 29, 19: 27, 20: 26, 90: 20,
}  # fmt: skip
DOWN = {
    1: 75, 2: 65, 3: 56, 4: 50, 5: 46, 6: 42, 7: 39, 8: 36, 9: 33, 10: 31, 11: 30, 12: 29, 13: 28, 14: 28,
    15: 27, 16: 28, 17: 28, 18: 28, 19: 29, 20: 29, 90: 20,
}  # fmt: skip
# Interpolated between the maturities listed, Articles 166(1) and 167(1); values computed independently.
BETWEEN = [0.5, 2.5, 12.5, 30, 60, 100, 7.5, 25, 40, 50, 75, 90]
UP_BETWEEN = [
    0.7, 0.67, 0.36, 0.251428571429, 0.225714285714, 0.2,
    0.48, 0.255714285714, 0.242857142857, 0.234285714286, 0.212857142857, 0.2,
]  # fmt: skip
DOWN_BETWEEN = [
    0.75, 0.605, 0.285, 0.277142857143, 0.238571428571, 0.2,
    0.375, 0.283571428571, 0.264285714286, 0.251428571429, 0.219285714286, 0.2,
]  # fmt: skip


def relative(shock: Shock, times: list[float], annual: float) -> list[float]:
    """Shock of annual rates as a share of them."""
    rates = [annual] * len(times)
    zero = to_continuous(rates, Compounding.ANNUAL)
    move = CurveMove.of_shock(shock)
    assert move is not None
    after = from_continuous(zero + move.change(np.array(times), zero), Compounding.ANNUAL)
    return [float(share) for share in after / annual - 1.0]


def test_relative_shocks_by_maturity() -> None:
    """At each maturity listed and between, on rates so high that the least rise of a point binds nowhere."""
    shocks = by_name(of_set("Solvency II rates", "EUR"))
    listed = [float(term) for term in UP]
    up, down = shocks["Rates up"], shocks["Rates down"]
    assert relative(up, listed, 0.1) == pytest.approx([0.01 * share for share in UP.values()], abs=1e-9)
    assert relative(down, listed, 0.1) == pytest.approx([-0.01 * share for share in DOWN.values()], abs=1e-9)
    assert relative(up, BETWEEN, 0.1) == pytest.approx(UP_BETWEEN, abs=1e-9)
    assert relative(down, BETWEEN, 0.1) == pytest.approx([-share for share in DOWN_BETWEEN], abs=1e-9)


def test_shocked_zero_rates() -> None:
    """Articles 166 and 167: the least rise of one percentage point (from memory) binds in the first three."""
    shocks = by_name(of_set("Solvency II rates", "EUR"))
    time, annual = np.array([1.0, 5.0, 10.0, 10.0]), [0.005, 0.01, 0.02, 0.03]
    zero = to_continuous(annual, Compounding.ANNUAL)
    for name, wanted in (
        ("Rates up", [0.015, 0.02, 0.03, 0.0426]),
        ("Rates down", [0.00125, 0.0054, 0.0138, 0.0207]),
    ):
        move = CurveMove.of_shock(shocks[name])
        assert move is not None
        after = from_continuous(zero + move.change(time, zero), Compounding.ANNUAL)
        assert list(after) == pytest.approx(wanted, abs=1e-12)


def test_negative_rates_do_not_fall_and_rise_by_a_point() -> None:
    """Article 167(2): the shock down is nil for negative rates."""
    shocks = by_name(of_set("Solvency II rates", "EUR"))
    assert change(shocks["Rates down"], [3.0], [-0.004]) == pytest.approx([0.0], abs=1e-9)
    zero = to_continuous([-0.004], Compounding.ANNUAL)
    move = CurveMove.of_shock(shocks["Rates up"])
    assert move is not None
    after = from_continuous(zero + move.change(np.array([3.0]), zero), Compounding.ANNUAL)
    assert list(after) == pytest.approx([0.006], abs=1e-12)


def test_equity_longevity_and_lapse_figures() -> None:
    """Regulation (EU) 2015/35, Articles 138(1), 142(2), 142(6), 169; lapse down, 142(3), from memory."""
    equity = by_name(of_set("Solvency II equity", "EUR"))
    sizes = {name: shock.moves[0].size for name, shock in equity.items()}
    assert sizes == {
        "Type 1 equity falls": -0.39,
        "Type 2 equity falls": -0.49,
        "Strategic or long-term equity falls": -0.22,
    }
    life = of_set("Solvency II life", "EUR")
    assert life.shocks == ()
    assert dict(life.figures) == {
        "mortality falls by (longevity)": 0.2,
        "lapse rates rise by": 0.5,
        "lapse rates rise to at most": 1.0,
        "lapse rates fall by": 0.5,
        "lapse rates fall by at most": 0.2,
        "mass lapse": 0.4,
        "mass lapse of group business": 0.7,
    }


@pytest.mark.parametrize(
    ("index", "adjustment", "type_1", "type_2"),
    [
        (100.0, -0.04, 0.35, 0.45),
        (110.0, 0.01, 0.40, 0.50),
        (130.0, 0.1, 0.49, 0.59),
        (80.0, -0.1, 0.29, 0.39),
    ],
)
def test_symmetric_adjustment(
    index: float, adjustment: float, type_1: float, type_2: float, tmp_path_factory: pytest.TempPathFactory
) -> None:
    """Article 172: the formula from memory, the bound stated; through the table as a user fills it."""
    assert symmetric_adjustment(index, 100.0) == pytest.approx(adjustment, abs=1e-12)
    text = (FOLDER / "solvency_ii_equity.csv").read_text("utf-8")
    folder = tmp_path_factory.mktemp("sets")
    filled = f"{text}equity index,{index}\naverage of the index,100\n"
    (folder / "equity.csv").write_text(filled, encoding="utf-8")
    (own,) = read_shock_sets(folder, currency="EUR").sets
    sizes = {name: shock.moves[0].size for name, shock in by_name(own).items()}
    assert sizes["Type 1 equity falls"] == pytest.approx(-type_1, abs=1e-12)
    assert sizes["Type 2 equity falls"] == pytest.approx(-type_2, abs=1e-12)


def test_every_file_states_its_source_and_status() -> None:
    """A set without a source is hearsay."""
    found = read_shock_sets(FOLDER, currency="EUR")
    assert len(found.sets) == len(list(FOLDER.glob("*.csv"))) == 7
    assert all(own.source and own.status for own in found.sets)
    assert all(shock.source == own.source for own in found.sets for shock in own.shocks)
