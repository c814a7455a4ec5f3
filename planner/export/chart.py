"""The native bar chart of receivers."""

from __future__ import annotations

from openpyxl.chart import BarChart, Reference
from openpyxl.chart.data_source import NumDataSource, NumRef
from openpyxl.chart.error_bar import ErrorBars
from openpyxl.chart.shapes import GraphicalProperties
from openpyxl.chart.text import RichText, Text
from openpyxl.chart.title import Title
from openpyxl.drawing.line import LineProperties
from openpyxl.drawing.text import CharacterProperties, Paragraph, ParagraphProperties, RegularTextRun
from openpyxl.utils import get_column_letter, quote_sheetname
from openpyxl.worksheet.worksheet import Worksheet

from planner.base.text import _

BLUE, VERMILLION, INK, FAINT = "0072B2", "D55E00", "1B1D1F", "D9D9D5"


def _series_range(sheet: Worksheet, column: int, first: int, last: int) -> NumDataSource:
    letter = get_column_letter(column)
    return NumDataSource(
        numRef=NumRef(f=f"{quote_sheetname(sheet.title)}!${letter}${first}:${letter}${last}")
    )


def _title(words: str) -> Title:
    """A title of the size of ordinary text."""
    look = CharacterProperties(sz=1100, b=True, solidFill=INK)
    run = RegularTextRun(rPr=look, t=words)
    rich = RichText(p=[Paragraph(pPr=ParagraphProperties(defRPr=look), r=[run])])
    return Title(tx=Text(rich=rich), overlay=False)


def chart_height(rows: int) -> float:
    """Height in cm for so many bars."""
    return max(6.5, 2.8 + 0.62 * rows)


def receivers_chart(sheet: Worksheet, column: int, header: int, first: int, last: int) -> BarChart:
    """Bars of a block of five columns from ``column``: label, gain, loss, below, above; first row on top.

    gain and loss exclude each other; below, above: distances from the bar's end to the ends of its
    80 % interval.
    """
    chart = BarChart()
    chart.type, chart.style = "bar", 10
    chart.title = _title(_("Who gains and who loses, with 80 % intervals"))
    chart.legend = None
    chart.add_data(
        Reference(sheet, min_col=column + 1, max_col=column + 2, min_row=header, max_row=last),
        titles_from_data=True,
    )
    chart.set_categories(Reference(sheet, min_col=column, min_row=first, max_row=last))
    # Bar charts run bottom-up by default; the largest stands on top.
    chart.x_axis.scaling.orientation = "maxMin"
    chart.x_axis.tickLblPos = "low"
    chart.x_axis.delete = chart.y_axis.delete = False
    chart.y_axis.crosses = "max"
    chart.y_axis.numFmt = "#,##0"
    chart.y_axis.majorGridlines.spPr = GraphicalProperties(ln=LineProperties(solidFill=FAINT, w=6_350))
    whisker = GraphicalProperties(ln=LineProperties(solidFill=INK, w=12_700))
    for series, colour in zip(chart.series, (BLUE, VERMILLION), strict=True):
        series.invertIfNegative = False
        series.graphicalProperties = GraphicalProperties(solidFill=colour)
        series.errBars = ErrorBars(
            errBarType="both",
            errValType="cust",
            noEndCap=False,
            plus=_series_range(sheet, column + 4, first, last),
            minus=_series_range(sheet, column + 3, first, last),
            spPr=whisker,
        )
    chart.overlap, chart.gapWidth = 100, 45
    chart.width, chart.height = 22.0, chart_height(last - first + 1)
    return chart
