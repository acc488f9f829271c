"""The sheets of control: summary, faults, provenance."""

from __future__ import annotations

import platform
import sys
import textwrap
from collections.abc import Iterator, Sequence
from datetime import datetime
from typing import Any

from desk import __version__
from desk.book import Fault, Side
from desk.intake.records import Reading
from desk.report.results.checks import TOLERANCE, Checks
from desk.report.results.flows import FlowSheet
from desk.report.results.key_rates import key_rate_chart
from desk.report.results.periods import flow_chart
from desk.report.results.plan import FIRST_ROW, HEADING_ROW, Block, Formula, SheetPlan
from desk.report.results.shocks import shock_notes, worst_of
from desk.report.said_once import further_faults
from desk.report.scenario_wording import checks_words, run_label
from desk.report.wording import CAUTION, MEASURES, QUANTILE_METHOD, liability_words
from desk.scenarios.records import Simulation
from desk.valuation.records import Standing
from desk.valuation.shock_records import ShockTable

__all__ = ["MASTER_CHECK_AREA", "plan_faults", "plan_provenance", "plan_summary"]

FAULT_CAP = 10_000
_NOTHING = (None, "", "")
NOTE_WIDTH = 112  # characters of the small print that fit beside the pictures
MASTER_CHECK_AREA = "Summary!$B$3"


def plan_summary(
    reading: Reading,
    standing: Standing,
    simulation: Simulation | None,
    *,
    sheets: dict[Side, FlowSheet],
    recomputed: dict[str, str],
    checks: Checks,
    charts_from: dict[str, SheetPlan],
    compared: Standing | None = None,
    shocks: ShockTable | None = None,
) -> SheetPlan:
    """The first sheet: the position, whether the workbook agrees with the program, and how to read it."""
    currency = standing.currency
    title = (reading.book.basis.title if reading.book else "") or reading.path.name
    plan = SheetPlan(
        "Summary",
        title,
        f"Valued at {standing.valuation_date.isoformat()}; amounts in {currency}; made by Gapwright "
        f"{__version__}",
        is_one_page=True,
    )
    plan.widths = {1: 34.0, 2: 9.0, 3: 19.0, 4: 19.0, 5: 10.5, 6: 10.5, 7: 8.5, 8: 2.0}
    plan.put(3, 1, "Workbook check", "text")
    area = checks.area
    plan.put(3, 2, Formula(f'=IF(COUNTIF({area},"OK")=ROWS({area}),"OK","CHECK")'), "check")
    plan.mark_checks(2, 3, 3)
    plan.headings(["Headline", "Unit", "Reported", "Recomputed", "Difference", "Tolerance", "Check"], left=2)
    row = _headline(plan, standing, recomputed, currency, shocks) + 1
    plan.headings(["Measure", "Unit", "Assets", "Liabilities"], row=row, left=2)
    for wording in MEASURES:
        row += 1
        form = {"money": "money", "rate": "rate", "years": "years", "years2": "years2"}[wording.kind]
        unit = currency if wording.unit == "currency" else wording.unit.removeprefix("% ")
        sides = (standing.assets, standing.liabilities)
        plan.table_row(
            row,
            1,
            [
                (wording.label, "text", "text"),
                (unit, "text", "text"),
                *((float(getattr(side, wording.name)), "reported", form) for side in sides),
            ],
        )
    row += 2
    plan.headings(["Redington's conditions", "", "Assets", "Liabilities", "Holds"], row=row, left=2)
    for condition in standing.redington:
        row += 1
        plan.table_row(
            row,
            1,
            [
                (condition.name.replace("_", " ").capitalize(), "text", "text"),
                ("", "text", "text"),
                (condition.assets, "reported", "money"),
                (condition.liabilities, "reported", "money"),
                ("yes" if condition.holds else "no", "check", "text"),
            ],
        )
    row = _notes(plan, row + 1, [condition.statement for condition in standing.redington]) - 1
    row = _bases(plan, row + 2, reading, standing, compared, currency) - 1
    row += 2
    for part in textwrap.wrap(CAUTION, NOTE_WIDTH - 10):
        plan.put(row, 1, part, "caution")
        row += 1
    row = _how_to_read(plan, row + 1, reading, simulation, sheets, shocks)
    row = _signatures(plan, row + 1)
    _pictures(plan, standing, charts_from)
    return plan


def _bases(
    plan: SheetPlan, row: int, reading: Reading, standing: Standing, compared: Standing | None, currency: str
) -> int:
    """What liabilities are discounted on, expected inflation, and the second basis; returns the row after."""
    rows: list[list[tuple[Any, str, str]]] = []
    if reading.book is not None:
        basis = reading.book.basis
        rows.append([("Curve", "text", "text"), _NOTHING, (basis.curve_kind.value, "reported", "word")])
        rows.append([("Liabilities on", "text", "text"), _NOTHING, (liability_words(basis), "note", "text")])
    if standing.inflation is not None:
        told = standing.inflation
        rows.append(
            [
                ("Inflation duration", "text", "text"),
                ("years", "text", "text"),
                (told.assets_duration, "reported", "years"),
                (told.liabilities_duration, "reported", "years"),
            ]
        )
        rows.append(
            [
                ("Inflation DV01, a rise", "text", "text"),
                (currency, "text", "text"),
                (told.dv01_assets, "reported", "money"),
                (told.dv01_liabilities, "reported", "money"),
            ]
        )
    if compared is not None:
        rows.append(
            [
                ("Surplus on the second basis", "text", "text"),
                (currency, "text", "text"),
                (compared.surplus, "reported", "money"),
            ]
        )
        rows.append(
            [
                ("Funding ratio on the second basis", "text", "text"),
                ("share", "text", "text"),
                (compared.funding_ratio, "reported", "share"),
            ]
        )
    plan.headings(["Basis", "Unit", "Assets, or the whole", "Liabilities"], row=row, left=2)
    rate = [("Single equivalent rate of the liabilities", "text", "text"), ("a year", "text", "text")]
    rows.insert(2, [*rate, _NOTHING, (standing.liabilities.equivalent_rate, "reported", "rate")])
    for cells in rows:
        row += 1
        plan.table_row(row, 1, cells)
    return row + 1


def _headline(
    plan: SheetPlan,
    standing: Standing,
    recomputed: dict[str, str],
    currency: str,
    shocks: ShockTable | None,
) -> int:
    """The six headline figures, and the worst that a shock does; returns the row after them."""
    figures: list[tuple[str, str, str, float, str]] = [
        ("Assets", currency, "money", standing.assets.present_value, "assets_present_value"),
        ("Liabilities", currency, "money", standing.liabilities.present_value, "liabilities_present_value"),
        ("Surplus", currency, "money", standing.surplus, "surplus"),
        ("Funding ratio", "share", "share", standing.funding_ratio, "funding_ratio"),
        ("Duration gap", "years", "years", standing.duration_gap, "duration_gap"),
        ("DV01 gap", currency, "money", standing.dv01_gap, "dv01_gap"),
    ]
    if shocks is not None and shocks.results:
        worst = worst_of(shocks).surplus
        figures.append(("Least surplus after a shock", currency, "money", worst, "least_surplus"))
    row = FIRST_ROW
    for label, unit, form, value, key in figures:
        cells: list[tuple[Any, str, str]] = [
            (label, "text", "text"),
            (unit, "text", "text"),
            (float(value), "reported", form),
        ]
        address = recomputed.get(key, "")
        if address:
            at = address.rsplit("$", 1)[1]
            cells += [
                (Formula(f"={address}"), "live", form),
                (Formula(f"=C{row}-D{row}"), "live", "tiny"),
                (Formula(f"=Checks!$G${at}"), "live", "tiny"),
                (Formula(f'=IF(ABS(E{row})<=F{row},"OK","CHECK")'), "check", "text"),
            ]
        else:
            cells.append(("not recomputed", "note", "text"))
        plan.table_row(row, 1, cells)
        row += 1
    plan.mark_checks(7, FIRST_ROW, row - 1)
    return row


def _how_to_read(
    plan: SheetPlan,
    row: int,
    reading: Reading,
    simulation: Simulation | None,
    sheets: dict[Side, FlowSheet],
    shocks: ShockTable | None,
) -> int:
    """Notes on colours, signs and what is not recomputed; returns the row after them."""
    plan.put(row, 1, "How to read this workbook", "heading_left")
    plan.put(row + 1, 1, "Input, as the book states it; may be changed", "input")
    plan.put(row + 2, 1, "Value, as the program reported it", "reported")
    plan.put(row + 3, 1, "Formula, recomputed by the spreadsheet", "live")
    notes = [
        "Assets are received and liabilities paid as positive amounts. Times are years from the valuation "
        "date.",
        "DV01 is the fall in value for +1 basis point on all continuously compounded zero rates; a gap is "
        "assets less liabilities.",
        "Formulas are recalculated when the workbook is opened. A difference above its tolerance shows CHECK "
        "here and in its row.",
        "Sheets are protected without a password against slips of the hand; inputs are open.",
    ]
    if simulation is None:
        has_model = reading.book is not None and reading.book.rates_model is not None
        why = (
            "Nothing was simulated" if has_model else "The book has no rates model, so nothing was simulated"
        )
        notes.append(f"{why}: those sheets are left out.")
    else:
        notes.append(f"Simulated: {run_label(simulation)}. {checks_words(simulation)} {QUANTILE_METHOD}")
    notes += shock_notes(shocks)
    notes += [
        f"{sheet.plan.name}: {sheet.rows_before:,} flows are summed by line and year."
        for sheet in sheets.values()
        if not sheet.is_by_row
    ]
    row += 4
    return _notes(plan, row, notes)


def _notes(plan: SheetPlan, row: int, notes: Sequence[str]) -> int:
    """Notes, each on as many rows as it needs; returns the row after them."""
    for note in notes:
        for part in textwrap.wrap(note, NOTE_WIDTH):
            plan.put(row, 1, part, "note")
            row += 1
    return row


def _signatures(plan: SheetPlan, row: int) -> int:
    """A place to sign; returns the row after it."""
    plan.headings(["Signed off", "Date", "Name"], row=row, left=3)
    for offset, label in enumerate(("Prepared by", "Reviewed by"), start=1):
        plan.put(row + offset, 1, label, "text")
        for column in (2, 3, 4):
            plan.put(row + offset, column, "", "sign")
    return row + 3


def _pictures(plan: SheetPlan, standing: Standing, charts_from: dict[str, SheetPlan]) -> None:
    """Flows and key rates, drawn from their own sheets."""
    charts = [key_rate_chart(charts_from["Key rates"], standing.key_rates, standing.currency)]
    if charts_from["Periods"].charts:
        charts.insert(0, flow_chart(charts_from["Periods"], standing.periods, standing.currency))
    for number, chart in enumerate(charts):
        chart.width, chart.height = 16, 9
        plan.charts.append((chart, f"I{HEADING_ROW + 19 * number}"))


def plan_faults(
    reading: Reading,
    standing: Standing,
    simulation: Simulation | None,
    *,
    second: Standing | None = None,
    shocks: ShockTable | None = None,
) -> SheetPlan:
    """Everything that was found wrong, and what was done about it."""
    told = reading.faults
    of_standing = further_faults(told, standing.faults)
    sources: list[tuple[str, Sequence[Fault]]] = [("Reading", told), ("Valuation", of_standing)]
    if second is not None:
        of_second = further_faults((*told, *of_standing), second.faults)
        sources.append(("Second basis", of_second))
        of_standing = (*of_standing, *of_second)
    if shocks is not None:
        of_shocks = further_faults((*told, *of_standing), shocks.faults)
        sources.append(("Shocks", of_shocks))
        of_standing = (*of_standing, *of_shocks)
    if simulation is not None:
        sources.append(("Simulation", further_faults((*told, *of_standing), simulation.faults)))
    faults = [(source, fault) for source, found in sources for fault in found]
    shown = faults[:FAULT_CAP]
    note = "A mild fault leaves the book usable; what was done is said."
    if len(shown) < len(faults):
        note = f"The first {len(shown):,} of {len(faults):,} faults. {note}"
    plan = SheetPlan("Faults", "Faults", note)
    plan.widths = {1: 16.0, 2: 10.0, 3: 12.0, 4: 12.0, 5: 56.0, 6: 46.0, 7: 60.0}
    plan.headings(["Sheet", "Cell", "Severity", "Met while", "Found", "Expected", "What mends it"], left=7)

    def rows() -> Iterator[Sequence[Any]]:
        for source, fault in shown:
            yield (
                *(fault.sheet, fault.cell, fault.severity.value, source),
                *(fault.found, fault.expected, fault.mend),
            )

    plan.block = Block(FIRST_ROW, len(shown), ("text",) * 7, ("text",) * 7, rows)
    if not shown:
        plan.put(FIRST_ROW, 1, "No faults were found.", "note")
    return plan


def plan_provenance(
    reading: Reading,
    standing: Standing,
    simulation: Simulation | None,
    *,
    shocks: ShockTable | None = None,
    written_at: datetime,
) -> SheetPlan:
    """Where every figure comes from."""
    import numpy
    import openpyxl

    plan = SheetPlan(
        "Provenance", "Provenance", "The same book, settings, seed and version give the same figures."
    )
    plan.widths = {1: 40.0, 2: 90.0}
    plan.headings(["Item", "Value"], left=2)
    items: list[tuple[str, str]] = [
        ("Program", f"Gapwright {standing.provenance.program_version}"),
        ("Written at, UTC", written_at.strftime("%Y-%m-%d %H:%M:%S")),
        ("Source file", reading.path.name),
        ("SHA-256 of the source file", reading.sha256),
        ("SHA-256 of the book's contents", standing.provenance.book_digest),
        ("Valuation date", standing.valuation_date.isoformat()),
        *((f"Valuation: {name.replace('_', ' ')}", value) for name, value in standing.provenance.settings),
    ]
    if shocks is not None:
        items += [
            ("Shocks: SHA-256 of the book's contents", shocks.provenance.book_digest),
            *((f"Shocks: {name}", value) for name, value in shocks.provenance.settings),
        ]
    if simulation is not None:
        items += [
            ("Simulation: SHA-256 of the book's contents", simulation.provenance.book_digest),
            ("Simulation: model", str(simulation.model)),
            ("Simulation: seed", str(simulation.seed)),
            *(
                (f"Simulation: {name.replace('_', ' ')}", value)
                for name, value in simulation.provenance.settings
            ),
            ("Simulation: quantile method", QUANTILE_METHOD),
        ]
    items += [
        ("Tolerance of the checks", f"{TOLERANCE:g}"),
        ("Python", platform.python_version()),
        ("numpy", numpy.__version__),
        ("openpyxl", openpyxl.__version__),
        ("System", f"{platform.system()} {platform.machine()}, {sys.byteorder}-endian"),
        ("Caution", CAUTION),
    ]
    for row, (label, value) in enumerate(items, start=FIRST_ROW):
        plan.put(row, 1, label, "text")
        plan.put(row, 2, value, "text")
    return plan
