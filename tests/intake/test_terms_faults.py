"""Faults of the sheets of line terms, shocks and market data, and of linked bonds."""

from __future__ import annotations

from datetime import date

import pytest

from desk.intake.records import Reading
from tests.intake.spoilt_books import MILD, Spoilt, add, check_spoilt, read_spoilt
from tests.intake.test_faults import both, drop_column, item, put

LT, V, Y = "Line terms", "Volatilities", "Yield history"

CASES = [
    # terms of lines
    Spoilt("line unknown", put(LT, "B2", "Pensioner"), f"{LT}!B2", 'of the line "Pensioner"', MILD),
    Spoilt("other side", put(LT, "A4", None), f"{LT}!B4", "no flows of the liabilities", MILD),
    Spoilt("side unknown", put(LT, "A3", "both"), f"{LT}!A3", "no known side"),
    Spoilt("line twice", put(LT, "B3", "Pensioners"), f"{LT}!B3", "stands twice, also in row 2"),
    Spoilt("no line", put(LT, "B3", None), f"{LT}!B3", "the cell is empty"),
    Spoilt("indexation", put(LT, "C2", "capped"), f"{LT}!C2", "no known indexation"),
    Spoilt("cap below floor", put(LT, "F2", -0.01), f"{LT}!F2", "the cap -0.01 is below the floor 0"),
    Spoilt("spread and rate", put(LT, "H2", 0.03), f"{LT}!H2", "stands beside a discount spread"),
    Spoilt("no rise", put(LT, "D3", None), f"{LT}!D3", "the cell is empty"),
    Spoilt("rise column", drop_column(LT, "Rise"), f"{LT}!B3", "by how much is not stated"),
    Spoilt("rise unused", put(LT, "D4", 0.01), f"{LT}!D4", "a line that is linked has no rise", MILD),
    Spoilt("floor unused", put(LT, "E4", 0), f"{LT}!E4", "a line that is linked has no floor", MILD),
    Spoilt("open collar", both(put(LT, "E2", None), put(LT, "F2", None)), f"{LT}!C2", "neither floor", MILD),
    # shocks
    Spoilt("move unknown", put("Shocks", "B2", "paralel"), "Shocks!B2", "no known move"),
    Spoilt("size missing", put("Shocks", "C2", None), "Shocks!C2", "the cell is empty"),
    Spoilt("size absurd", put("Shocks", "C2", 20_000), "Shocks!C2", "20000 basis points"),
    Spoilt("size a fraction", put("Shocks", "C2", -0.005), "Shocks!C2", "-0.005 basis points", MILD),
    Spoilt("funds below zero", put("Shocks", "C4", -1.5), "Shocks!C4", "funds and property below zero"),
    Spoilt("share in per cent", put("Shocks", "C4", 39), "Shocks!C4", "which is 3,900 %"),
    Spoilt(
        "gone at once",
        both(put("Shocks", "B6", "decline"), put("Shocks", "C6", -1)),
        "Shocks!C6",
        "nothing is",
    ),
    Spoilt(
        "time absurd", both(put("Shocks", "B6", "time"), put("Shocks", "C6", 900)), "Shocks!C6", "900 years"
    ),
    Spoilt("term missing", put("Shocks", "D2", None), "Shocks!D2", "the cell is empty"),
    Spoilt("term column", drop_column("Shocks", "Term"), "Shocks!B2", "has no term"),
    Spoilt(
        "twist about 0",
        both(put("Shocks", "B2", "twist"), put("Shocks", "D2", 0)),
        "Shocks!D2",
        "a twist is 0",
    ),
    Spoilt("term negative", put("Shocks", "D2", -1), "Shocks!D2", "the term is -1"),
    Spoilt("term unused", put("Shocks", "D4", 5), "Shocks!D4", "a value move has no term", MILD),
    Spoilt("terms out of order", put("Shocks", "D2", 30), "Shocks!D3", "shorter than the one above", MILD),
    Spoilt("terms twice", put("Shocks", "D2", 20), "Shocks!D3", "stands twice among the rate moves", MILD),
    Spoilt("target unknown", put("Shocks", "E5", "State 2 2036"), "Shocks!E5", "is no holding or kind", MILD),
    Spoilt("line target", put("Shocks", "E6", "Pensions"), "Shocks!E6", "is no line of liabilities", MILD),
    Spoilt(
        "target unused", put("Shocks", "E2", "fund"), "Shocks!E2", "a rate move applies to everything", MILD
    ),
    Spoilt("shock alone", add("Shocks", "Later"), "Shocks!A7", "has no move in this row", MILD),
    Spoilt("shock twice", put("Shocks", "A5", "crash"), "Shocks!A5", "only in case or blanks", MILD),
    Spoilt(
        "sources differ", put("Shocks", "F3", "else"), "Shocks!F3", "the source is not that of row 2", MILD
    ),
    Spoilt("least alone", put("Shocks", "B5", "least"), "Shocks!B5", "without a relative move", MILD),
    Spoilt(
        "thresholds rise", item("Shock settings", "Thresholds", "1; 1.1"), "Shock settings!B3", "do not fall"
    ),
    Spoilt(
        "thresholds in per cent",
        item("Shock settings", "Thresholds", "110; 100"),
        "Shock settings!B3",
        "110 is no",
    ),
    Spoilt("sets twice", item("Shock settings", "Sets", "a; a"), "Shock settings!B2", "stands twice", MILD),
    # market data
    Spoilt("instrument", put(V, "A2", "swaption"), f"{V}!A2", "no known instrument"),
    Spoilt("no length", put(V, "C2", None), f"{V}!C2", "the cell is empty"),
    Spoilt("length column", drop_column(V, "Length"), f"{V}!A2", "has no length"),
    Spoilt("length of cap", put(V, "C3", 5), f"{V}!C3", "a cap or floor has no length", MILD),
    Spoilt("expiry zero", put(V, "B3", 0), f"{V}!B3", "the expiry is 0"),
    Spoilt("volatility in points", put(V, "E2", 65), f"{V}!E2", "6,500 % a year"),
    Spoilt("volatility high", put(V, "E2", 0.3), f"{V}!E2", "is high", MILD),
    Spoilt("lognormal in per cent", put(V, "E3", 25), f"{V}!E3", "the lognormal volatility is 2,500 %"),
    Spoilt("volatility zero", put(V, "E3", 0), f"{V}!E3", "the volatility is 0"),
    Spoilt("shift unused", put(V, "G2", 0.01), f"{V}!G2", "a normal volatility has no shift", MILD),
    Spoilt("shift negative", put(V, "G3", -0.01), f"{V}!G3", "the shift is -0.01"),
    Spoilt("payments odd", put(V, "H3", 3), f"{V}!H3", "the frequency is 3"),
    Spoilt("payments empty", put(V, "H3", None), f"{V}!H3", "1 payment a year is taken", MILD),
    Spoilt(
        "quote twice", add(V, "cap", 7, None, 0.03, 0.25, "lognormal", 0.01, 4), f"{V}!A4", "in row 3", MILD
    ),
    Spoilt("term no number", put(Y, "C1", "6M"), f"{Y}!C1", '"6M" is no number of years'),
    Spoilt("term as a word", put(Y, "E1", "Source"), f"{Y}!E1", "not one of this sheet's", MILD),
    Spoilt("term of 0", put(Y, "B1", 0), f"{Y}!B1", "the heading is 0 years"),
    Spoilt("term a calendar year", put(Y, "B1", 2030), f"{Y}!B1", "the heading is 2030 years"),
    Spoilt("column twice", put(Y, "C1", 1), f"{Y}!C1", "the term 1 stands twice, also in B1"),
    Spoilt("columns fall", put(Y, "B1", 7), f"{Y}!C1", "the term 5 stands after 7", MILD),
    Spoilt("no terms", lambda s: s.update({Y: [["Date"], [date(2026, 1, 1)]]}), Y, "no column is headed"),
    Spoilt("dates fall", put(Y, "A3", date(2026, 7, 1)), f"{Y}!A3", "is before the date above"),
    Spoilt("dates ahead", put(Y, "A3", date(2027, 7, 1)), f"{Y}!A3", "after the valuation date", MILD),
    Spoilt("gap", put(Y, "C2", None), f"{Y}!C2", "there is no quote", MILD),
    Spoilt("gaps", both(put(Y, "C2", None), put(Y, "C3", None)), f"{Y}!C2", "in 2 cells down to C3", MILD),
    Spoilt("yield as text", put(Y, "C2", "n/a"), f"{Y}!C2", 'the text "n/a"'),
    Spoilt("yield in per cent", put(Y, "D3", 3.1), f"{Y}!D3", "which is 310 %"),
    Spoilt("scenario gap", put("Scenario set", "C3", None), "Scenario set!C3", "the cell is empty"),
    Spoilt("scenario text", put("Scenario set", "C3", "x"), "Scenario set!C3", 'the text "x"'),
    Spoilt("node twice", put("Scenario set", "C1", "1.0"), "Scenario set!C1", "the node 1 stands twice"),
    Spoilt(
        "nodes fall", put("Scenario set", "D1", 1.5), "Scenario set!D1", "the node 1.5 stands after 2", MILD
    ),
    Spoilt("node odd", put("Scenario set", "D1", "t=5"), "Scenario set!D1", '"t=5" is no number'),
    Spoilt(
        "node by date", put("Scenario set", "D1", date(2030, 1, 1)), "Scenario set!D1", "no number of years"
    ),
    Spoilt("path twice", put("Scenario set", "A3", 1), "Scenario set!A3", "the path 1 stands twice", MILD),
    Spoilt("no paths", lambda s: s.update({"Scenario set": [["Path", 1]]}), "Scenario set", "no paths", MILD),
    # linked bonds
    Spoilt(
        "lag",
        both(
            put("Holdings", "K1", "Index lag (months)"),
            put("Holdings", "B2", "linked bond"),
            put("Holdings", "K2", 2.5),
        ),
        "Holdings!K2",
        "the index lag is 2.5",
    ),
    Spoilt(
        "ratio",
        both(
            put("Holdings", "K1", "Index ratio"),
            put("Holdings", "B2", "linked bond"),
            put("Holdings", "K2", 0),
        ),
        "Holdings!K2",
        "the index ratio is 0",
    ),
    Spoilt(
        "index for ratio",
        both(
            put("Holdings", "K1", "Index ratio"),
            put("Holdings", "B2", "linked bond"),
            put("Holdings", "K2", 123.4),
        ),
        "Holdings!K2",
        "the index ratio is 123.4",
        MILD,
    ),
    Spoilt(
        "floor of a bond",
        both(put("Holdings", "K1", "Principal floor"), put("Holdings", "K2", "yes")),
        "Holdings!K2",
        "a bond has no principal floor",
        MILD,
    ),
]


@pytest.fixture(scope="module")
def readings(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Reading]:
    """What each case gives."""
    return read_spoilt(CASES, tmp_path_factory.mktemp("cases"))


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_each_fault_is_found_where_it_is(case: Spoilt, readings: dict[str, Reading]) -> None:
    check_spoilt(case, readings[case.name])
