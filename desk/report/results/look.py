"""How the report looks: colours, typefaces, number formats, page set-up.

A cell has a role, which gives its colours, and a format, which gives its digits. Each pair is one named
style of the workbook, made when it is first used.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from openpyxl import Workbook
    from openpyxl.styles import NamedStyle
    from openpyxl.worksheet.worksheet import Worksheet

__all__ = [
    "ASSETS",
    "FORMATS",
    "INK",
    "LIABILITIES",
    "QUIET",
    "ROLES",
    "SURPLUS",
    "Styles",
    "set_up_page",
]

ASSETS, LIABILITIES, SURPLUS = "0072B2", "D55E00", "009E73"
INK, QUIET, HAIRLINE = "1F2A33", "5B6670", "C9C6BC"
INPUT_INK, INPUT_GROUND, LIVE_GROUND, HEAD_GROUND = "0000FF", "FFFBE6", "F1F3F1", "E9E7E0"
TYPEFACE = "Calibri"

# The quoted sign is a true minus.
FORMATS = {
    "text": "General",
    "word": "General",
    "whole": '#,##0;"−"#,##0',
    "money": '#,##0;"−"#,##0',
    "money2": '#,##0.00;"−"#,##0.00',
    "rate": '0.0000%;"−"0.0000%',
    "share": '0.00%;"−"0.00%',
    "years": '0.0000;"−"0.0000',
    "years2": '#,##0.000;"−"#,##0.000',
    "factor": '0.00000000;"−"0.00000000',
    "ratio": '0.000;"−"0.000',
    "term": "General",
    "tiny": '0.0E+00;"−"0.0E+00;0',
    "date": "yyyy-mm-dd",
}

ROLES = (
    "title",
    "note",
    "caution",
    "heading",
    "heading_left",
    "text",
    "input",
    "reported",
    "live",
    "check",
    "sign",
    "unit",
    "heading_unit",
)


class Styles:
    """The named styles of one workbook."""

    def __init__(self, workbook: Workbook) -> None:
        """Begin with none."""
        self._workbook = workbook
        self._made: set[str] = set()

    def name(self, role: str, form: str) -> str:
        """The style for a role and a format.

        Raises
        ------
        KeyError
            If the format is none of `FORMATS`.
        """
        name = f"desk {role} {form}"
        if name not in self._made:
            self._workbook.add_named_style(_style(name, role, FORMATS[form], is_text=form == "text"))
            self._made.add(name)
        return name


def _style(name: str, role: str, number_format: str, *, is_text: bool) -> NamedStyle:
    """One named style."""
    from openpyxl.styles import Alignment, Border, Font, NamedStyle, PatternFill, Protection, Side

    sizes = {"title": 15.0}
    inks = {"note": QUIET, "caution": LIABILITIES, "input": INPUT_INK, "title": INK}
    grounds = {
        "input": INPUT_GROUND,
        "live": LIVE_GROUND,
        "check": LIVE_GROUND,
        "heading": HEAD_GROUND,
        "heading_left": HEAD_GROUND,
        "heading_centre": HEAD_GROUND,
        "heading_unit": HEAD_GROUND,
    }
    style = NamedStyle(name=name, number_format=number_format)
    style.font = Font(
        name=TYPEFACE,
        size=sizes.get(role, 10.0),
        bold=role in ("title", "check", "caution") or role.startswith("heading"),
        color=inks.get(role, INK),
    )
    if role in grounds:
        style.fill = PatternFill("solid", fgColor=grounds[role])
    hairline = Side(style="hair", color=HAIRLINE)
    if role.startswith("heading"):
        style.border = Border(bottom=Side(style="thin", color=QUIET))
    elif role == "sign":
        style.border = Border(bottom=Side(style="thin", color=INK))
    elif role in ("text", "unit", "input", "reported", "live", "check"):
        style.border = Border(bottom=hairline)
    flush = (
        "left"
        if role in ("title", "note", "caution", "heading_left", "sign", "unit", "heading_unit")
        else None
    )
    if role == "heading":
        flush = "right"
    elif role in ("check", "heading_centre"):
        flush = "center"
    elif flush is None:
        flush = "left" if is_text else "right"
    style.alignment = Alignment(
        indent=1 if role in ("unit", "heading_unit") else 0,
        horizontal=flush,
        vertical="bottom" if role.startswith("heading") else "center",
        wrap_text=role.startswith("heading"),
    )
    style.protection = Protection(locked=role not in ("input", "sign"))
    return style


def set_up_page(sheet: Worksheet, *, title_rows: str, is_one_page: bool = False) -> None:
    """A4 landscape, one page wide, headings on every page, page numbers in the footer."""
    from openpyxl.worksheet.properties import PageSetupProperties

    sheet.page_setup.orientation = "landscape"
    sheet.page_setup.paperSize = 9
    sheet.page_setup.fitToWidth = 1
    sheet.page_setup.fitToHeight = 1 if is_one_page else 0
    sheet.sheet_properties.pageSetUpPr = PageSetupProperties(fitToPage=True)
    sheet.print_title_rows = title_rows
    margins = sheet.page_margins
    margins.left = margins.right = 0.5
    margins.top, margins.bottom = 0.6, 0.75
    margins.footer = 0.35
    footer: Any = sheet.oddFooter
    footer.left.text, footer.center.text, footer.right.text = "&F", "&A", "Page &P of &N"
