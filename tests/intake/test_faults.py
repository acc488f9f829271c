"""Every class of fault, each in a workbook of its own, and all of them in one."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from datetime import date, datetime, time
from pathlib import Path

import pytest

from desk.book import Fault, Severity
from desk.intake.records import Reading
from desk.intake.workbook import read_workbook
from tests.intake.books import Sheets, save, sound_sheets

GRAVE, MILD = Severity.GRAVE, Severity.MILD


@dataclass(frozen=True)
class Case:
    """One way of spoiling a sound workbook, and the fault it must give."""

    name: str
    spoil: Callable[[Sheets], object]
    place: str
    words: str
    severity: Severity


def put(sheet: str, cell: str, value: object) -> Callable[[Sheets], object]:
    """Put a value into a cell."""

    def spoil(sheets: Sheets) -> None:
        rows = sheets[sheet]
        row, column = int(cell[1:]) - 1, ord(cell[0]) - 65
        while len(rows) <= row:
            rows.append([])
        rows[row].extend([None] * (column + 1 - len(rows[row])))
        rows[row][column] = value

    return spoil


def item(sheet: str, name: str, value: object) -> Callable[[Sheets], object]:
    """Set the value of an item, adding the item where it is not there."""

    def spoil(sheets: Sheets) -> None:
        for row in sheets[sheet]:
            if row[0] == name:
                row[1] = value
                return
        sheets[sheet].append([name, value])

    return spoil


def drop_item(sheet: str, name: str) -> Callable[[Sheets], object]:
    """Remove an item."""

    def spoil(sheets: Sheets) -> None:
        sheets[sheet][:] = [row for row in sheets[sheet] if row[0] != name]

    return spoil


def drop_column(sheet: str, heading: str) -> Callable[[Sheets], object]:
    """Remove a column."""

    def spoil(sheets: Sheets) -> None:
        place = sheets[sheet][0].index(heading)
        for row in sheets[sheet]:
            del row[place]

    return spoil


def both(*spoils: Callable[[Sheets], object]) -> Callable[[Sheets], object]:
    """One after the other."""
    return lambda sheets: [spoil(sheets) for spoil in spoils]


def _cir(name: str, value: float | None) -> Callable[[Sheets], object]:
    def spoil(sheets: Sheets) -> None:
        values = {"Mean reversion": 0.1, "Volatility": 0.05, "Long-run rate": 0.03, "Starting rate": 0.02}
        values[name] = value  # type: ignore[assignment]
        sheets["Rates model"] = [
            ["Item", "Value"],
            ["Model", "cir"],
            *([key, own] for key, own in values.items()),
        ]

    return spoil


L, H, C, R = "Liabilities", "Holdings", "Curve", "Risky assets"

CASES = [
    Case("no basis", lambda s: s.pop("Basis"), "", 'sheet "Basis" is missing', GRAVE),
    Case("no curve", lambda s: s.pop(C), "", 'sheet "Curve" is missing', GRAVE),
    Case("no liabilities", lambda s: s.pop(L), "", 'sheet "Liabilities" is missing', GRAVE),
    Case("misspelt sheet", lambda s: s.update(Holding=s.pop(H)), "Holding", "not one of a book's", MILD),
    Case("foreign sheet", lambda s: s.update(Workings=[["a"]]), "Workings", "was not read", MILD),
    Case("empty sheet", lambda s: s.update({C: []}), C, "the sheet is empty", GRAVE),
    Case("no headings", lambda s: s.update({C: [[1, 0.02]]}), C, "no row holds the headings", GRAVE),
    Case("heading missing", drop_column(L, "Amount"), L, 'heading "Amount" is missing', GRAVE),
    Case("no date and no year", drop_column(L, "Date"), L, 'neither "Date" nor "Year"', GRAVE),
    Case("unknown heading", put(L, "E1", "Remark"), "Liabilities!E1", '"Remark" is not one', MILD),
    Case("misspelt heading", put(L, "D1", "Betta"), "Liabilities!D1", '"Betta" is not one', MILD),
    Case("heading twice", put(L, "E1", " amount "), "Liabilities!E1", '"Amount" stands twice', GRAVE),
    Case("no heading over data", put(L, "F3", "x"), "Liabilities!F1", "no heading", MILD),
    Case(
        "rows above",
        lambda s: s[L].insert(0, ["Our liabilities"]),
        "Liabilities!A1",
        "above the headings",
        MILD,
    ),
    Case(
        "note without data",
        both(put(L, "E1", "Remark"), put(L, "E5", "x")),
        "Liabilities!E5",
        "only a note",
        MILD,
    ),
    Case("text for a number", put(L, "C3", "12,5 Mio"), "Liabilities!C3", '"12,5 Mio"', GRAVE),
    Case("grouped text number", put(L, "C3", "1.234"), "Liabilities!C3", '"1.234"', GRAVE),
    Case("number as text", put(L, "C3", " 1234.5 "), "Liabilities!C3", "1234.5 is taken", MILD),
    Case("date for a number", put(L, "C3", date(2020, 1, 1)), "Liabilities!C3", "the date 2020-01-01", GRAVE),
    Case("truth for a number", put(L, "C3", True), "Liabilities!C3", "truth value TRUE", GRAVE),
    Case("error cell", put(L, "C3", "#N/A"), "Liabilities!C3", "the error #N/A", GRAVE),
    Case("error in an optional cell", put(L, "D3", "#DIV/0!"), "Liabilities!D3", "the error #DIV/0!", GRAVE),
    Case(
        "error in a note",
        both(put(L, "E1", "Remark"), put(L, "E2", "#REF!")),
        "Liabilities!E2",
        "the error #REF!",
        MILD,
    ),
    Case("formula never calculated", put(L, "C3", "=1+1"), "Liabilities!C3", "never stored", GRAVE),
    Case("last row never calculated", put(L, "C5", "=1+1"), "Liabilities!C5", "never stored", GRAVE),
    Case("amount beyond reason", put(L, "C3", 1e30), "Liabilities!C3", "the amount is 1e+30", GRAVE),
    Case("beta beyond reason", put(L, "D3", 1e6), "Liabilities!D3", "the beta is 1000000", GRAVE),
    Case("blank amount", put(L, "C3", None), "Liabilities!C3", "the cell is empty", GRAVE),
    Case("blank line", put(L, "A3", None), "Liabilities!A3", "the cell is empty", GRAVE),
    Case("number for a line", put(L, "A3", 101), "Liabilities!A3", "101 is no text", MILD),
    Case(
        "numbers for lines",
        both(put(L, "A3", 101), put(L, "A4", 102)),
        "Liabilities!A3",
        "2 cells of column A hold no text, the first 101",
        MILD,
    ),
    Case("lines alike", put(L, "A4", "pensioners "), "Liabilities!A4", "differs from", MILD),
    Case("no time", put(L, "B3", None), "Liabilities!B3", "states no time", GRAVE),
    Case(
        "past flow", put(L, "B3", date(2026, 9, 29)), "Liabilities!B3", "not after the valuation date", MILD
    ),
    Case(
        "flow today", put(L, "B3", date(2026, 9, 30)), "Liabilities!B3", "not after the valuation date", MILD
    ),
    Case("far date", put(L, "B3", date(9999, 12, 31)), "Liabilities!B3", "years away", MILD),
    Case("number for a date", put(L, "B3", 46112), "Liabilities!B3", "the number 46112", GRAVE),
    Case("text for a date", put(L, "B3", "next year"), "Liabilities!B3", "where a date belongs", GRAVE),
    Case("date as text", put(L, "B3", "2031-02-28"), "Liabilities!B3", "2031-02-28 is taken", MILD),
    Case("no such date", put(L, "B3", "2031-02-30"), "Liabilities!B3", "where a date belongs", GRAVE),
    Case("date with a time", put(L, "B3", datetime(2031, 2, 28, 12)), "Liabilities!B3", "time of day", MILD),
    Case("time for a date", put(L, "B3", time(12)), "Liabilities!B3", "where a date belongs", GRAVE),
    Case("past year", put("Asset flows", "B3", -0.5), "Asset flows!B3", "-0.5 years", MILD),
    Case("calendar year", put("Asset flows", "B3", 2031), "Asset flows!B3", "calendar year", GRAVE),
    Case(
        "date and year disagree",
        both(put(L, "E1", "Year"), put(L, "E3", 5)),
        "Liabilities!E3",
        "stand beside a date",
        GRAVE,
    ),
    Case("no flows", lambda s: s.update({L: s[L][:1]}), L, "holds no flows", MILD),
    Case("terms out of order", put(C, "A3", 0.5), "Curve!A3", "shorter than", GRAVE),
    Case("term twice", put(C, "A3", 1), "Curve!A3", "stands twice", GRAVE),
    Case("term zero", put(C, "A2", 0), "Curve!A2", "the term is 0", GRAVE),
    Case("rate in per cent", put(C, "B4", 3.5), "Curve!B4", "the rate is 3.5", GRAVE),
    Case("rate far below", put(C, "B4", -0.6), "Curve!B4", "below -50 % a year", GRAVE),
    Case("rate blank", put(C, "B4", None), "Curve!B4", "the cell is empty", GRAVE),
    Case("no quotes", lambda s: s.update({C: s[C][:1]}), C, "no quotes", GRAVE),
    Case("unknown item", item("Basis", "Prepared by", "me"), "Basis!A11", "not known", MILD),
    Case("misspelt item", item("Basis", "Market risk premum", 0.1), "Basis!A11", "not known", GRAVE),
    Case(
        "item twice",
        lambda s: s["Basis"].append(["currency", "USD"]),
        "Basis!A11",
        '"Currency" stands twice',
        GRAVE,
    ),
    Case("item missing", drop_item("Basis", "Currency"), "Basis", '"Currency" is missing', GRAVE),
    Case("item blank", item("Basis", "Currency", None), "Basis!B4", "the cell is empty", GRAVE),
    Case("currency unknown", item("Basis", "Currency", "Euro"), "Basis!B4", '"Euro" is no currency', GRAVE),
    Case("currency small", item("Basis", "Currency", "eur"), "Basis!B4", "taken as EUR", MILD),
    Case(
        "compounding unknown",
        item("Basis", "Compounding", "daily"),
        "Basis!B6",
        "no known compounding",
        GRAVE,
    ),
    Case("interpolation unknown", item("Basis", "Interpolation", "magic"), "Basis!B7", "no known", GRAVE),
    Case("curve kind unknown", item("Basis", "Curve kind", "forward"), "Basis!B5", "no known", GRAVE),
    Case("payments a year", item("Basis", "Payments a year", 3), "Basis!B11", "payments a year are 3", GRAVE),
    Case("payments unused", item("Basis", "Payments a year", 2), "Basis!B11", "is not used", MILD),
    Case("way on unknown", item("Basis", "Beyond the last quote", "up"), "Basis!B11", "no known way", GRAVE),
    Case(
        "no ultimate rate",
        item("Basis", "Beyond the last quote", "smith-wilson"),
        "Basis!B11",
        "no ultimate forward rate",
        GRAVE,
    ),
    Case("ultimate unused", item("Basis", "Ultimate forward rate", 0.03), "Basis!B11", "is not used", MILD),
    Case("ultimate in per cent", item("Basis", "Ultimate forward rate", 3.3), "Basis!B11", "is 3.3", GRAVE),
    Case("liquid at once", item("Basis", "Last liquid point", 0.0), "Basis!B11", "point is 0", GRAVE),
    Case("liquid too early", item("Basis", "Last liquid point", 0.1), "Curve", "no quote is at or", GRAVE),
    Case(
        "swap without a curve",
        both(item("Basis", "Curve kind", "swap"), put("Curve", "B4", 0.99)),
        "Curve!B4",
        "no curve",
        GRAVE,
    ),
    Case(
        "day count of bonds",
        item("Basis", "Day count", "Act/Act ICMA"),
        "Basis!B10",
        "needs the periods of a bond",
        GRAVE,
    ),
    Case(
        "day count unknown", item("Basis", "Day count", "Act/364"), "Basis!B10", "no known day count", GRAVE
    ),
    Case("spread in per cent", item("Basis", "Liability spread", 1.5), "Basis!B8", "spread is 1.5", GRAVE),
    Case("kind unknown", put(H, "B2", "bondd"), "Holdings!B2", "no known kind", GRAVE),
    Case("bond without maturity", put(H, "F2", None), "Holdings!F2", "the cell is empty", GRAVE),
    Case("bond without coupon", put(H, "D2", None), "Holdings!D2", "the cell is empty", GRAVE),
    Case("bond without frequency", put(H, "E2", None), "Holdings!E2", "the cell is empty", GRAVE),
    Case("frequency odd", put(H, "E2", 3), "Holdings!E2", "the frequency is 3", GRAVE),
    Case("coupon in per cent", put(H, "D2", 4.1), "Holdings!D2", "the coupon is 4.1", GRAVE),
    Case("matured", put(H, "F2", date(2026, 9, 30)), "Holdings!F2", "matured on 2026-09-30, not", MILD),
    Case("fund without value", put(H, "H5", None), "Holdings!H5", "the cell is empty", GRAVE),
    Case("fund without a column", drop_column(H, "Market value"), "Holdings!A5", "no market value", GRAVE),
    Case("short holding", both(put(H, "C3", -5)), "Holdings!C3", "the nominal is -5", MILD),
    Case("worth of the other sign", put(H, "H2", -5), "Holdings!H2", "-5, which no spread gives", GRAVE),
    Case("worth nothing", put(H, "H2", 0), "Holdings!H2", "0, which no spread gives", GRAVE),
    Case("holding twice", put(H, "A3", "state 2% 2036"), "Holdings!A3", "stands twice", MILD),
    Case(
        "deposit with a maturity",
        put(H, "F4", date(2030, 1, 1)),
        "Holdings!F4",
        "deposit has no maturity",
        MILD,
    ),
    Case("negative duration", put(H, "J5", -1), "Holdings!J5", "the duration is -1", GRAVE),
    Case("model unknown", item("Rates model", "Model", "heath"), "Rates model!B2", "no known model", GRAVE),
    Case(
        "volatility negative", item("Rates model", "Volatility", -0.01), "Rates model!B4", "is -0.01", GRAVE
    ),
    Case("volatility missing", drop_item("Rates model", "Volatility"), "Rates model", "is missing", GRAVE),
    Case("reversion negative", item("Rates model", "Mean reversion", -1), "Rates model!B3", "is -1", GRAVE),
    Case(
        "not of the model", item("Rates model", "Second volatility", 0.01), "Rates model!B6", "has no", MILD
    ),
    Case("start below zero", _cir("Starting rate", -0.01), "Rates model!B6", "-0.01", GRAVE),
    Case("no reversion", _cir("Mean reversion", 0.0), "Rates model!B3", "the mean reversion is 0", GRAVE),
    Case("correlation out of range", put(R, "H2", 1.2), "Risky assets!H2", "is 1.2", GRAVE),
    Case("matrix out of range", both(put(R, "G2", -3), put(R, "F3", -3)), "Risky assets!G2", "is -3", GRAVE),
    Case("matrix not symmetric", put(R, "G2", 0.4), "Risky assets!G2", "mirrored cell", GRAVE),
    Case("diagonal", put(R, "F2", 0.9), "Risky assets!F2", "with itself", GRAVE),
    Case(
        "contradiction",
        both(put(R, "G2", 0.9), put(R, "F3", 0.9), put(R, "H2", 0.9), put(R, "H3", -0.9)),
        "Risky assets!H1",
        "contradict",
        GRAVE,
    ),
    Case("matrix column missing", drop_column(R, "Property"), R, "correlation matrix is missing", GRAVE),
    Case("asset twice", put(R, "A3", "equity"), "Risky assets!A3", "stands twice", GRAVE),
    Case("asset named as a heading", put(R, "A3", "Rates"), "Risky assets!A3", "that of a heading", GRAVE),
    Case("asset volatility", put(R, "D2", -0.1), "Risky assets!D2", "is -0.1", GRAVE),
    Case("paths not whole", item("Run", "Paths", 10.5), "Run!B2", "number of paths is 10.5", GRAVE),
    Case("steps zero", item("Run", "Steps a year", 0), "Run!B4", "is 0", GRAVE),
    Case("seed negative", item("Run", "Seed", -1), "Run!B5", "the seed is -1", GRAVE),
    Case("seed missing", drop_item("Run", "Seed"), "Run", "1 is taken", MILD),
    Case("measure blank", item("Run", "Measure", None), "Run!B6", "pricing is taken", MILD),
    Case("measure unknown", item("Run", "Measure", "risk"), "Run!B6", "no known measure", GRAVE),
    Case("horizon too long", item("Run", "Horizon (years)", 90), "Run!B3", "goes beyond the last flow", MILD),
    Case(
        "percentile out of range",
        item("Run", "Percentiles", "5; 100"),
        "Run!B7",
        "100 is no percentile",
        GRAVE,
    ),
    Case("percentiles fall", item("Run", "Percentiles", "50; 5"), "Run!B7", "do not rise", GRAVE),
    Case("percentile no number", item("Run", "Percentiles", "5; x"), "Run!B7", "no number", GRAVE),
    Case("decimal commas", item("Run", "Percentiles", "2,5; 50"), "Run!B7", "no number", GRAVE),
    Case("history twice", put("History", "A3", date(2026, 7, 31)), "History!A3", "stands twice", GRAVE),
    Case(
        "history falls", put("History", "A3", date(2026, 7, 1)), "History!A3", "before the date above", GRAVE
    ),
    Case(
        "history ahead",
        put("History", "A4", date(2027, 1, 1)),
        "History!A4",
        "after the valuation date",
        MILD,
    ),
    Case("history in per cent", put("History", "B3", 2.1), "History!B3", "the short rate is 2.1", GRAVE),
]


def _matching(faults: tuple[Fault, ...], case: Case) -> list[Fault]:
    return [
        fault
        for fault in faults
        if fault.place == case.place and case.words in fault.found and fault.severity is case.severity
    ]


def test_a_sound_workbook_has_no_fault(tmp_path: Path) -> None:
    reading = read_workbook(save(sound_sheets(), tmp_path / "book.xlsx"))
    assert reading.faults == ()
    assert reading.book is not None
    assert reading.grave == ()


@pytest.fixture(scope="module")
def readings(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Reading]:
    """What each case gives, read two at a time: most of it is waiting for a process to start."""
    folder = tmp_path_factory.mktemp("cases")

    def read(numbered: tuple[int, Case]) -> tuple[str, Reading]:
        number, case = numbered
        sheets = sound_sheets()
        case.spoil(sheets)
        return case.name, read_workbook(save(sheets, folder / f"{number}.xlsx"))

    with ThreadPoolExecutor(2) as pool:
        found = dict(pool.map(read, enumerate(CASES)))
    assert len(found) == len(CASES)
    return found


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.name)
def test_each_fault_is_found_where_it_is(case: Case, readings: dict[str, Reading]) -> None:
    reading = readings[case.name]
    found = _matching(reading.faults, case)
    assert len(found) == 1, [str(fault) for fault in reading.faults]
    assert found[0].expected
    assert found[0].mend
    assert "\n" not in str(found[0])
    assert (reading.book is None) == (case.severity is GRAVE)
    if case.severity is GRAVE:
        others = [fault for fault in reading.grave if fault is not found[0]]
        # A fault may bring others of the same column with it, never one elsewhere.
        assert all(fault.sheet == found[0].sheet for fault in others), [str(fault) for fault in others]


def test_all_faults_of_one_file_are_listed_at_once(tmp_path: Path) -> None:
    chosen = [
        *(
            "unknown heading",
            "text for a number",
            "blank line",
            "past flow",
            "rate in per cent",
            "item missing",
        ),
        *(
            "frequency odd",
            "calendar year",
            "volatility negative",
            "correlation out of range",
            "seed negative",
        ),
        *("percentiles fall", "history twice", "foreign sheet", "fund without value", "compounding unknown"),
    ]
    cases = {case.name: case for case in CASES}
    sheets = sound_sheets()
    put(L, "B4", date(2020, 1, 1))(sheets)
    for name in chosen:
        if name not in ("past flow", "item missing"):
            cases[name].spoil(sheets)
    drop_item("Basis", "Interpolation")(sheets)
    reading = read_workbook(save(sheets, tmp_path / "book.xlsx"))
    for name in chosen:
        if name not in ("past flow", "item missing"):
            assert _matching(reading.faults, cases[name]), name
    assert [fault for fault in reading.faults if '"Interpolation" is missing' in fault.found]
    assert [fault for fault in reading.faults if fault.place == "Liabilities!B4"]
    assert reading.book is None


def test_faults_come_by_sheet_and_row(tmp_path: Path) -> None:
    sheets = sound_sheets()
    for cell in ("C4", "A2", "C2", "C3"):
        put(L, cell, None)(sheets)
    put(C, "B5", None)(sheets)
    put("History", "B3", "x")(sheets)
    reading = read_workbook(save(sheets, tmp_path / "book.xlsx"))
    places = [fault.place for fault in reading.faults]
    assert places == [
        *("Curve!B5", "Liabilities!A2", "Liabilities!C2", "Liabilities!C3", "Liabilities!C4", "History!B3"),
    ]


@pytest.mark.parametrize(
    ("spoil", "words"),
    [
        (put(L, "C2", 1e300), "expected an amount of at most 1e+18 either way"),
        (put(H, "I5", 1e300), "the number of units is 1e+300; expected a number of units of at most"),
        (item("Rates model", "Volatility", -0.1), "expected a volatility of at least 0"),
        (item("Rates model", "Mean reversion", 1e6), "expected a mean reversion of at most 100 a year"),
        (put(C, "B3", 2.5), "expected a rate as a fraction"),
        (lambda s: s[L].insert(0, ["Flows of the fund"]), "1 row above the headings was not read"),
        (item("Run", "Steps a year", 0.5), "the number of steps a year is 0.5"),
    ],
)
def test_faults_are_sentences(spoil: Callable[[Sheets], object], words: str, tmp_path: Path) -> None:
    sheets = sound_sheets()
    spoil(sheets)
    assert words in "\n".join(map(str, read_workbook(save(sheets, tmp_path / "book.xlsx")).faults))


def test_many_faults_of_one_kind_are_told_apart(tmp_path: Path) -> None:
    """They are found for whole columns at a time: each is still that of its own cell."""
    sheets = sound_sheets()
    odd: list[tuple[object, object, str]] = [
        (50000, 1.0, "the number 50000 stands where a date belongs"),
        ("1970-01-01", 1.0, 'the text "1970-01-01" stands where a date belongs; 1970-01-01 is taken'),
        ("next year", 1.0, 'the text "next year" stands where a date belongs'),
        (True, 1.0, "the truth value TRUE stands where a date belongs"),
        (datetime(2031, 1, 2), 1.0, ""),
        (datetime(2031, 1, 2, 12, 30), 1.0, "2031-01-02 12:30 holds a time of day"),
        (date(2031, 1, 2), "12", 'the text "12" stands where a number belongs; 12 is taken'),
        (date(2031, 1, 2), "12 Mio", 'the text "12 Mio" stands where a number belongs'),
        (date(2031, 1, 2), False, "the truth value FALSE stands where a number belongs"),
    ]
    sheets[L] += [["Odd", day, amount, None] for _ in range(3) for day, amount, _ in odd]
    reading = read_workbook(save(sheets, tmp_path / "book.xlsx"))
    found: dict[int, list[str]] = {}
    for fault in reading.faults:
        found.setdefault(int(fault.cell[1:]), []).append(fault.found)
    for row in range(5, 5 + 3 * len(odd)):
        words = odd[(row - 5) % len(odd)][2]
        assert any(words in text for text in found.get(row, [])) or not (words or found.get(row)), row


def test_every_faulty_row_is_listed(tmp_path: Path) -> None:
    sheets = sound_sheets()
    sheets[L] += [["Old", date(2001, 1, 1), 5.0, None] for _ in range(3000)]
    reading = read_workbook(save(sheets, tmp_path / "book.xlsx"))
    assert len(reading.faults) == 3000
    assert {fault.cell for fault in reading.faults} == {f"B{row}" for row in range(5, 3005)}
    assert reading.book is not None
    assert len(reading.book.liabilities) == 3003
    assert int(reading.book.liabilities.future.sum()) == 3
