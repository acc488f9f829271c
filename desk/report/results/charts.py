"""The charts of the report, native to the spreadsheet, in the colours of the house."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from desk.report.results.look import QUIET
from desk.report.safe_cells import clean_text

if TYPE_CHECKING:
    from openpyxl.chart import AreaChart, BarChart, LineChart, ScatterChart
    from openpyxl.chart.series import Series

__all__ = [
    "Column",
    "band_colours",
    "bars",
    "bars_with_line",
    "fan",
    "histogram",
    "lines",
    "money_axis",
]

WIDTH_CM, HEIGHT_CM = 19.0, 9.0
# Nested bands of one hue, from the outermost to the middle.
BAND_COLOURS = ("D6E6F2", "A9CCE5", "6FA8D1", "3D87BF", "0072B2")


@dataclass(frozen=True)
class Column:
    """A series of a chart.

    Attributes
    ----------
    title : str
    area : str
        Absolute address of the values.
    colour : str
        Hexadecimal.
    dash : str or None
        How a line is dashed, so that series differ in more than colour.
    """

    title: str
    area: str
    colour: str
    dash: str | None = None


def money_axis(largest: float, currency: str) -> tuple[str, str]:
    """Number format and unit of an axis of amounts up to `largest`, so that its labels stay short."""
    for size, commas, word in ((1e9, ",,,", "billion"), (1e6, ",,", "million"), (1e3, ",", "thousand")):
        if abs(largest) >= 2.0 * size:
            digits = "#,##0" if abs(largest) >= 20.0 * size else "#,##0.0"
            return f'{digits}{commas};"−"{digits}{commas}', f"{currency} {word}"
    return '#,##0;"−"#,##0', currency


def bars(
    columns: Sequence[Column], categories: str, *, title: str, across: str, upward: str, number_format: str,
    is_stacked: bool = False, skip: int = 1,
) -> BarChart:  # fmt: skip
    """Bars beside each other, or stacked about the axis."""
    from openpyxl.chart import BarChart

    chart = BarChart()
    chart.type = "col"
    chart.grouping = "stacked" if is_stacked else "clustered"
    chart.overlap = 100 if is_stacked else 0
    chart.gapWidth = 40
    for column in columns:
        series = _series(chart, column, categories)
        series.graphicalProperties.solidFill = column.colour
        series.graphicalProperties.line.noFill = True
        series.invertIfNegative = False
    _finish(chart, title=title, across=across, upward=upward, number_format=number_format, skip=skip)
    return chart


def bars_with_line(
    columns: Sequence[Column], line: Column, categories: str, *, title: str, across: str, upward: str,
    line_upward: str, number_format: str, line_format: str, skip: int = 1,
) -> BarChart:  # fmt: skip
    """Stacked bars with one line on an axis of its own at the right."""
    from openpyxl.chart import LineChart

    chart = bars(
        columns, categories, title=title, across=across, upward=upward, number_format=number_format,
        is_stacked=True, skip=skip,
    )  # fmt: skip
    over = LineChart()
    series = _series(over, line, categories)
    _draw_line(series, line, width_points=2.0)
    # An axis pair of its own: on a shared one some programs draw the axis below twice.
    over.x_axis.axId, over.y_axis.axId = 500, 200
    over.x_axis.crossAx, over.y_axis.crossAx = 200, 500
    over.x_axis.delete = True
    over.y_axis.crosses = "max"
    over.y_axis.delete = False
    over.y_axis.majorGridlines = None
    over.y_axis.number_format = line_format
    over.y_axis.numFmt.sourceLinked = False
    over.y_axis.title = _title(line_upward, size=900)
    over.y_axis.txPr = _small_text()
    chart += over
    return chart


def lines(
    columns: Sequence[Column], along: str, *, title: str, across: str, upward: str, number_format: str
) -> ScatterChart:
    """Straight lines over a scale of numbers."""
    from openpyxl.chart import Reference, ScatterChart
    from openpyxl.chart.series_factory import SeriesFactory

    chart = ScatterChart()
    chart.style = 2
    chart.scatterStyle = "lineMarker"
    for column in columns:
        series = SeriesFactory(
            Reference(range_string=column.area), Reference(range_string=along), title=column.title
        )
        series.marker.symbol = "none"
        _draw_line(series, column, width_points=1.75)
        chart.series.append(series)
    _finish(chart, title=title, across=across, upward=upward, number_format=number_format)
    chart.x_axis.number_format = "0"
    chart.x_axis.scaling.min = 0
    chart.x_axis.majorGridlines = None
    return chart


def fan(
    base: Column, bands: Sequence[Column], line: Column, categories: str, *, title: str, across: str,
    upward: str, number_format: str, skip: int,
) -> AreaChart:  # fmt: skip
    """Nested bands, stacked upon a base that is not drawn, with one line over them."""
    from openpyxl.chart import AreaChart, LineChart
    from openpyxl.chart.legend import LegendEntry

    chart = AreaChart()
    chart.grouping = "stacked"
    hidden = _series(chart, base, categories)
    hidden.graphicalProperties.noFill = True
    hidden.graphicalProperties.line.noFill = True
    for band in bands:
        series = _series(chart, band, categories)
        series.graphicalProperties.solidFill = band.colour
        series.graphicalProperties.line.noFill = True
    _finish(chart, title=title, across=across, upward=upward, number_format=number_format, skip=skip)
    legend: Any = chart.legend
    legend.legendEntry = [LegendEntry(idx=0, delete=True)]
    over = LineChart()
    _draw_line(_series(over, line, categories), line, width_points=2.0)
    chart += over
    return chart


def histogram(
    counts: Column,
    expected: Column | None,
    categories: str,
    *,
    title: str,
    across: str,
    number_format: str,
    skip: int,
) -> BarChart:
    """Counts in bins without gaps, with what a closed form expects as a line over them."""
    from openpyxl.chart import LineChart

    chart = bars(
        [counts], categories, title=title, across=across, upward="Paths", number_format="#,##0", skip=skip
    )
    chart.gapWidth = 0
    chart.x_axis.number_format = number_format
    chart.x_axis.numFmt.sourceLinked = False
    if expected is None:
        chart.legend = None
        return chart
    over = LineChart()
    _draw_line(_series(over, expected, categories), expected, width_points=2.0)
    chart += over
    return chart


def band_colours(count: int) -> list[str]:
    """Colours of `count` bands, symmetric about the middle."""
    half = [min(number, count - 1 - number) for number in range(count)]
    deepest = max(half, default=0)
    return [BAND_COLOURS[min(len(BAND_COLOURS) - 1, number + max(0, 2 - deepest))] for number in half]


def _series(chart: BarChart | LineChart | AreaChart, column: Column, categories: str) -> Series:
    """A series with its title and categories, added to a chart."""
    from openpyxl.chart import Reference
    from openpyxl.chart.series_factory import SeriesFactory

    series: Series = SeriesFactory(Reference(range_string=column.area), title=clean_text(column.title))
    chart.series.append(series)
    chart.set_categories(Reference(range_string=categories))
    return series


def _draw_line(series: Series, column: Column, *, width_points: float) -> None:
    """A straight line without markers."""
    series.smooth = False
    series.graphicalProperties.line.solidFill = column.colour
    series.graphicalProperties.line.width = int(width_points * 12_700)
    series.graphicalProperties.line.dashStyle = column.dash


def _finish(chart: Any, *, title: str, across: str, upward: str, number_format: str, skip: int = 1) -> None:
    """Size, titles, axes and legend."""
    chart.width, chart.height = WIDTH_CM, HEIGHT_CM
    chart.title = _title(title, size=1200, is_bold=True)
    chart.legend.position = "b"
    chart.legend.txPr = _small_text()
    for axis, text in ((chart.x_axis, across), (chart.y_axis, upward)):
        axis.delete = False
        axis.title = _title(text, size=900)
        axis.txPr = _small_text()
        axis.title.overlay = False
    chart.title.overlay = False
    chart.y_axis.number_format = number_format
    chart.y_axis.numFmt.sourceLinked = False
    chart.y_axis.majorGridlines.spPr = _hairline()
    chart.x_axis.tickLblPos = "low"
    if hasattr(chart.x_axis, "tickLblSkip"):
        chart.x_axis.tickLblSkip = skip
        chart.x_axis.tickMarkSkip = skip


def _title(text: str, *, size: int, is_bold: bool = False) -> Any:
    """A title in the house's quiet ink."""
    from openpyxl.chart.text import RichText, Text
    from openpyxl.chart.title import Title
    from openpyxl.drawing.text import CharacterProperties, Paragraph, ParagraphProperties, RegularTextRun

    looks = CharacterProperties(sz=size, b=is_bold, solidFill=QUIET)
    paragraph = Paragraph(
        pPr=ParagraphProperties(defRPr=looks), r=[RegularTextRun(rPr=looks, t=clean_text(text))]
    )
    return Title(tx=Text(rich=RichText(p=[paragraph])), overlay=False)


def _small_text() -> Any:
    """Small print for axes and legends."""
    from openpyxl.chart.text import RichText
    from openpyxl.drawing.text import CharacterProperties, Paragraph, ParagraphProperties

    looks = CharacterProperties(sz=800, solidFill=QUIET)
    return RichText(p=[Paragraph(pPr=ParagraphProperties(defRPr=looks), endParaRPr=looks)])


def _hairline() -> Any:
    """A light grid line."""
    from openpyxl.chart.shapes import GraphicalProperties

    shape = GraphicalProperties()
    shape.line.solidFill = "DDDAD2"
    shape.line.width = 6_350
    return shape
