"""The sheet of checks: each figure as the program reported it beside the same one recomputed in the sheet."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

from desk.report.results.plan import FIRST_ROW, Formula, SheetPlan

__all__ = ["TOLERANCE", "Check", "Checks"]

TOLERANCE = 1e-10
FIRST_CHECK = FIRST_ROW + 2


@dataclass(frozen=True)
class Check:
    """One figure.

    Attributes
    ----------
    figure, sheet, unit, form : str
        What it is, where its parts stand, its unit, its number format.
    reported : float
    formula : str
        Of the recomputed figure.
    scale : str
        Expression of the size that the tolerance is a part of.
    """

    figure: str
    sheet: str
    unit: str
    form: str
    reported: float
    formula: str
    scale: str


@dataclass
class Checks:
    """The checks of a workbook, gathered while its sheets are planned.

    Attributes
    ----------
    rows : list of Check
    left_out : list of str
        Figures that could not be checked, with the reason.
    """

    rows: list[Check] = field(default_factory=list)
    left_out: list[str] = field(default_factory=list)

    def add(
        self,
        figure: str,
        *,
        sheet: str,
        unit: str,
        form: str,
        reported: float,
        formula: str,
        scale: str = "",
    ) -> str:
        """Plan the check of a figure and return the address of the recomputed one.

        A figure without meaning (NaN) gains no check; its address then is that of the reported text.
        """
        if not math.isfinite(reported):
            self.left_out.append(f"{figure} has no meaning for this book and is not checked.")
            return ""
        row = FIRST_CHECK + len(self.rows)
        self.rows.append(Check(figure, sheet, unit, form, reported, formula, scale or f"D{row}"))
        return f"Checks!$E${row}"

    def add_column(self, figure: str, plan: SheetPlan, area: str) -> None:
        """Plan the count of rows of a sheet whose own check does not say OK."""
        formula = f'=ROWS({area})-COUNTIF({area},"OK")'
        self.add(figure, sheet=plan.name, unit="rows", form="whole", reported=0.0, formula=formula)

    def reported_address(self, *, ahead: int) -> str:
        """Address of the reported figure of a check yet to be planned, `ahead` checks from the next."""
        return f"Checks!$D${FIRST_CHECK + len(self.rows) + ahead}"

    @property
    def area(self) -> str:
        """Absolute address of the column of checks."""
        return f"Checks!$H${FIRST_CHECK}:$H${FIRST_CHECK + max(len(self.rows), 1) - 1}"

    def plan(self) -> SheetPlan:
        """The sheet."""
        plan = SheetPlan(
            "Checks",
            "Checks",
            "Each figure that the program reported, a value, beside the same figure recomputed from the rows "
            "of this workbook.",
        )
        plan.widths = {1: 52.0, 2: 17.0, 3: 14.0, 4: 22.0, 5: 22.0, 6: 14.0, 7: 14.0, 8: 10.0}
        plan.headings(
            ["Figure", "Sheet", "Unit", "Reported", "Recomputed", "Difference", "Tolerance", "Check"], left=3
        )
        plan.put(FIRST_ROW, 1, "Tolerance, as a part of the figure or, below 1, absolute", "text")
        plan.put(FIRST_ROW, 4, TOLERANCE, "input", "tiny")
        plan.put(FIRST_ROW + 1, 1, "One basis point", "text")
        plan.put(FIRST_ROW + 1, 3, "a year", "text")
        plan.put(FIRST_ROW + 1, 4, 1e-4, "input", "rate")
        for row, check in enumerate(self.rows, start=FIRST_CHECK):
            plan.table_row(
                row,
                1,
                [
                    (check.figure, "text", "text"),
                    (check.sheet, "text", "text"),
                    (check.unit, "text", "text"),
                    (check.reported, "reported", check.form),
                    (Formula(check.formula), "live", check.form),
                    (Formula(f"=D{row}-E{row}"), "live", "tiny"),
                    (Formula(f"=check_tolerance*MAX(1,ABS({check.scale}))"), "live", "tiny"),
                    (Formula(f'=IF(ABS(F{row})<=G{row},"OK","CHECK")'), "check", "text"),
                ],
            )
        last = FIRST_CHECK + len(self.rows) - 1
        plan.mark_checks(8, FIRST_CHECK, last)
        for offset, line in enumerate(self.left_out, start=2):
            plan.put(last + offset, 1, line, "note")
        return plan

    def names(self) -> dict[str, str]:
        """Names that the workbook defines for this sheet."""
        return {
            "check_tolerance": f"Checks!$D${FIRST_ROW}",
            "basis_point": f"Checks!$D${FIRST_ROW + 1}",
        }
