"""Prescribed sets as files: what a user may write, and what is told of what cannot be used."""

from __future__ import annotations

from pathlib import Path

import pytest

from desk.book import MoveKind
from desk.intake.prescribed_shocks import ShockSets, chosen_shocks, read_shock_sets, symmetric_adjustment
from desk.rates.compounding import Compounding

OWN = """# Set: House rules
# Source: the investment committee, 2026
# Status: until further notice
# Compounding: semi-annual
# Usual for: EUR, USD
# Note: kept by the actuary
Shock,Move,Size,Of,Term,Applies to
Bad spring,parallel,-1,parallel,,
Bad spring,spread,75,,,bond
"Thin, autumn",rate,20,,5,
"Thin, autumn",rate,40,,15,

Currency,parallel,short
EUR,120,200
usd,90,150
"""


def read(tmp_path: Path, text: str | bytes, currency: str = "EUR", name: str = "own.csv") -> ShockSets:
    """A folder with one file, read."""
    data = text if isinstance(text, bytes) else text.encode()
    (tmp_path / name).write_bytes(data)
    return read_shock_sets(tmp_path, currency=currency)


def test_a_set_of_ones_own(tmp_path: Path) -> None:
    """Sizes by currency, moves of one name together, in the order of the file."""
    found = read(tmp_path, OWN, "usd")
    assert found.faults == ()
    (own,) = found.sets
    assert (own.name, own.source) == ("House rules", "the investment committee, 2026")
    assert own.status == "until further notice kept by the actuary"
    assert own.is_usual
    spring, autumn = own.shocks
    assert (spring.name, autumn.name) == ("Bad spring", "Thin, autumn")
    assert (spring.compounding, spring.set_name) == (Compounding.SEMI_ANNUAL, "House rules")
    assert [(move.kind, move.size, move.target) for move in spring.moves] == [
        (MoveKind.PARALLEL, -90.0, ""),
        (MoveKind.SPREAD, 75.0, "bond"),
    ]
    assert [move.term for move in autumn.moves] == [5.0, 15.0]


def test_a_currency_without_sizes_has_no_shocks(tmp_path: Path) -> None:
    """And it is told in one line when the set is asked for."""
    found = read(tmp_path, OWN, "NOK")
    assert found.faults == ()
    assert found.sets[0].shocks == ()
    assert not found.sets[0].is_usual
    shocks, faults = chosen_shocks(found, asked=("house RULES",), currency="NOK", with_inflation=False)
    assert shocks == ()
    assert "no shocks that can be used for NOK" in str(faults[0])
    assert "\n" not in str(faults[0])


def test_a_currency_of_which_no_set_has_sizes_is_told_in_one_line(tmp_path: Path) -> None:
    """The sets that suit any currency are used; what is missing is never left out silently."""
    read(tmp_path, OWN)
    plain = "# Set: Plain\n# Usual for: all\nShock,Move,Size\nUp,parallel,10\n"
    found = read(tmp_path, plain, "XAU", "plain.csv")
    shocks, (fault,) = chosen_shocks(found, asked=(), currency="XAU", with_inflation=False)
    assert [shock.name for shock in shocks] == ["Up"]
    assert "no prescribed set with sizes for XAU" in str(fault)
    assert "\n" not in str(fault)
    found = read_shock_sets(tmp_path, currency="USD")
    assert chosen_shocks(found, asked=(), currency="USD", with_inflation=False)[1] == ()


@pytest.mark.parametrize(
    ("before", "after", "told"),
    [
        ("-1,parallel", "much,parallel", "line 8: 'much'; expected a number"),
        ("parallel,-1", "sideways,-1", "the move 'sideways'"),
        (",-1,parallel,,", ",-1,middle,,", "'middle' under Of"),
        (",,5,", ",,-5,", "at least 0"),
        (",,5,", ",,five,", "'five'"),
        (",,5,", ",,nan,", "'nan'"),
        ("EUR,120,200", "EUR,120,lots", "'lots'"),
        ("semi-annual", "weekly", "the compounding 'weekly'"),
        ("# Set: House rules\n", "", "no name of the set"),
    ],
)
def test_what_cannot_be_used_is_told_with_its_line(
    before: str, after: str, told: str, tmp_path: Path
) -> None:
    """The shock it is of is left out; the other one stays where the file still is a set."""
    assert before in OWN
    found = read(tmp_path, OWN.replace(before, after, 1))
    lines = [str(fault) for fault in found.faults]
    assert any(told in line for line in lines)
    assert all(line.startswith("own.csv!line ") and "\n" not in line for line in lines)
    for own in found.sets:
        assert len(own.shocks) < 2


@pytest.mark.parametrize(
    "text",
    [
        b"",
        b"\xff\xfe\x00\x01garbage",
        b"Shock\n" + b"," * 1000 + b"\nx",
        b"# Set: a\nloose row\nShock,Move\nx\n",
        b'# Set: a\nShock,Move,Size\n"x\n' + b"y" * 200_000,
        b"\x00" * 1000,
        b"#" * 2_500_000,
    ],
)
def test_hostile_files_give_faults_and_no_shocks(text: bytes, tmp_path: Path) -> None:
    """In bounded time, each in one line."""
    found = read(tmp_path, text)
    assert all(not own.shocks for own in found.sets)
    assert found.faults
    assert all("\n" not in str(fault) for fault in found.faults)


def test_folders_and_names(tmp_path: Path) -> None:
    """No folder, two sets of one name, other files beside."""
    missing = read_shock_sets(tmp_path / "nowhere", currency="EUR")
    assert missing.sets == ()
    assert "no folder of shocks" in str(missing.faults[0])
    (tmp_path / "notes.txt").write_text("nothing", encoding="utf-8")
    read(tmp_path, OWN, name="a.csv")
    found = read(tmp_path, OWN, name="b.csv")
    assert len(found.sets) == 1
    assert "as a.csv has" in str(found.faults[0])


def test_the_symmetric_adjustment_is_bounded(tmp_path: Path) -> None:
    """Stated beyond its bound it is brought back and told."""
    text = "# Set: e\nShock,Move,Size,Of\nfall,value,-0.39,symmetric adjustment\n\nFigure,Value\n"
    found = read(tmp_path, f"{text}symmetric adjustment,0.3\n")
    assert found.sets[0].shocks[0].moves[0].size == pytest.approx(-0.49)
    assert "at most 10 %" in str(found.faults[0])
    found = read(tmp_path, f"{text}equity index,100\naverage of the index,0\n")
    assert "a number above 0" in str(found.faults[0])
    with pytest.raises(ValueError, match="`average` must be above 0"):
        symmetric_adjustment(100.0, 0.0)


def test_inflation_is_left_out_where_the_basis_has_none(tmp_path: Path) -> None:
    """Of the usual sets; one asked for by name keeps it, and the shock says so."""
    found = read(tmp_path, "# Set: i\nShock,Move,Size\nup,inflation,50\nboth,parallel,5\n")
    names = {
        with_inflation: [
            shock.name
            for shock in chosen_shocks(found, asked=(), currency="EUR", with_inflation=with_inflation)[0]
        ]
        for with_inflation in (True, False)
    }
    assert names == {True: ["up", "both"], False: ["both"]}
    asked, _ = chosen_shocks(found, asked=("i",), currency="EUR", with_inflation=False)
    assert [shock.name for shock in asked] == ["up", "both"]


def test_a_file_that_a_spreadsheet_wrote_back_is_the_same(tmp_path: Path) -> None:
    """Lines filled up with separators; semicolons and decimal commas in much of the world."""
    (before,) = read(tmp_path, OWN).sets
    filled = "\n".join(f"{line},,,,,," for line in OWN.splitlines())
    assert read(tmp_path, filled) == ShockSets((before,), ())
    # Here as written where the comma is the decimal mark: what holds commas is no longer quoted.
    text = OWN.replace(",", ";").replace('"Thin; autumn"', "Thin, autumn")
    text = text.replace("Usual for: EUR; USD", "Usual for: EUR, USD").replace(
        "committee; 2026", "committee, 2026"
    )
    with_commas = "\n".join(f"{line.replace(';20;', ';20,0;')};;;" for line in text.splitlines())
    assert "20,0" in with_commas
    assert read(tmp_path, with_commas) == ShockSets((before,), ())


def test_headings_of_moves_stand_in_any_order(tmp_path: Path) -> None:
    found = read(tmp_path, "# Set: A\nTerm,Move,Size,Shock\n5,rate,20,Up\n")
    assert found.faults == ()
    (move,) = found.sets[0].shocks[0].moves
    assert (move.kind, move.size, move.term) == (MoveKind.RATE, 20.0, 5.0)


@pytest.mark.parametrize(
    ("text", "line", "said"),
    [
        ("Shock,Move\nUp,parallel\n", 2, "no column Size"),
        ("Shock,Size\nUp,3\n", 2, "no column Move"),
        ("Move,Size,Shock\nparallel,3\n", 3, "a move of no shock"),
        ("Shock,Move,Size\nUp,parallel\n", 3, "''"),
        ("Shock,Move,Size,Of\nUp,parallel,1,p\nCurrency,p\nEUR,5\neur,6\n", 6, "'EUR' once more"),
        ("Shock,Move,Size,Of\nUp,value,-1,a\nFigure,Value\na,0.1\na,0.2\n", 6, "'a' once more"),
    ],
)
def test_what_is_missing_or_stands_twice_is_told_in_its_line(
    tmp_path: Path, text: str, line: int, said: str
) -> None:
    """The first of two holds; nothing is taken silently."""
    found = read(tmp_path, f"# Set: A\n{text}")
    (fault,) = found.faults
    assert fault.cell == f"line {line}"
    assert said in fault.found
    sizes = [move.size for shock in found.sets[0].shocks for move in shock.moves]
    assert sizes in ([], [5.0], [-1.1])
