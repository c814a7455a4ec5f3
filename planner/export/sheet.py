"""One worksheet, from top to bottom: titles, sentences, tables, pictures."""

from __future__ import annotations

import math
from collections.abc import Collection, Sequence
from dataclasses import dataclass
from datetime import date
from decimal import Decimal

from openpyxl.cell.cell import ILLEGAL_CHARACTERS_RE, Cell
from openpyxl.styles import Alignment, Border, Font, PatternFill, Side
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.pagebreak import Break
from openpyxl.worksheet.worksheet import Worksheet

from planner.base.text import _
from planner.tables.format import column_title, value_text
from planner.tables.table import Column, Table

_INK, _FAINT = "1B1D1F", "5A5D60"
_HEADER = PatternFill("solid", fgColor="E7E7E3")
_MARKED = PatternFill("solid", fgColor="F5F1E4")
_LINE = Border(bottom=Side(style="thin", color="8C8C88"))
_MOST_TEXT = 32_767
_RISKY = ("=", "+", "-", "@")
# A column is as wide as its longest entry, between these, in signs.
_NARROW, _WIDE = 9.0, 46.0
_LINE_HEIGHT = 15.0
# Bold signs are wider.
_BOLD = 1.12
_NUMERIC = ("count", "number", "money", "percent")
# Columns of changes, by table: shown with their sign.
_SIGNED = {
    "tally": ("change", "low", "high"),
    "item_list": ("units_change",),
    "receivers": ("change", "low", "high", "share", "share_low", "share_high"),
    "ladder": ("gain",),
}


@dataclass(frozen=True)
class Place:
    """Where a table stands: first and last row of values, column number of every key."""

    header: int
    first: int
    last: int
    columns: dict[str, int]

    def letter(self, key: str) -> str:
        """Column letter of a key."""
        return str(get_column_letter(self.columns[key]))


def safe_text(text: str) -> str:
    """What a cell can hold: no control signs, not too long."""
    clean: str = ILLEGAL_CHARACTERS_RE.sub("\N{REPLACEMENT CHARACTER}", text)
    return clean if len(clean) <= _MOST_TEXT else clean[: _MOST_TEXT - 1] + "…"


def put_text(cell: Cell, text: str) -> None:
    """Write text that stays text, whatever it starts with, also after it is edited."""
    cell.value = safe_text(text)
    cell.data_type = "s"
    cell.number_format = "@"
    if text.startswith(_RISKY):
        cell.quotePrefix = True


def font(bold: bool = False, size: float = 11.0, faint: bool = False) -> Font:
    """The one typeface of the workbook."""
    return Font(name="Calibri", size=size, bold=bold, italic=faint, color=_FAINT if faint else _INK)


def number_format(column: Column, signed: bool = False) -> str:
    """The cell format of a column of numbers; ``signed``: gains with a plus."""
    decimals = 0 if column.kind == "count" else column.decimals
    part = column.kind == "percent"
    body = ("0" if part else "#,##0") + ("." + "0" * decimals if decimals else "") + ("%" if part else "")
    # What rounds to zero has no sign.
    least = f"{0.5 * 10.0 ** -(decimals + 2 * part):.{decimals + 2 * part + 1}f}"
    return f"[>={least}]+{body};[<=-{least}]-{body};{body}" if signed else body


def put_value(cell: Cell, value: object, column: Column, signed: bool = False) -> None:
    """Write one value of a table: numbers as numbers, dates as dates, everything else as text."""
    if value is None:
        return
    if column.kind == "flag":
        put_text(cell, value_text(value, "flag"))
    elif isinstance(value, date):
        cell.value = value
        cell.number_format = "yyyy-mm-dd"
    elif column.kind == "text":
        put_text(cell, str(value))
    else:
        amount = float(value) if isinstance(value, Decimal | int | float) else math.nan
        if math.isfinite(amount):
            cell.value = int(amount) if column.kind == "count" else amount
            cell.number_format = number_format(column, signed)


class SheetWriter:
    """Writes downwards from the first row."""

    def __init__(self, sheet: Worksheet) -> None:
        self.sheet = sheet
        self.row = 1
        self._widths: dict[int, float] = {}
        # Rows of sentences: row, columns they run over, signs.
        self._long: list[tuple[int, int, float]] = []
        # Cells that may need several lines: row, column, signs.
        self._wrapped: list[tuple[int, int, float]] = []

    def title(self, text: str) -> None:
        """The sheet's title."""
        cell = self.sheet.cell(self.row, 1)
        put_text(cell, text)
        cell.font = font(bold=True, size=15.0)
        self.row += 1

    def heading(self, text: str) -> None:
        """A heading inside the sheet, after an empty row."""
        self.row += 1
        cell = self.sheet.cell(self.row, 1)
        put_text(cell, text)
        cell.font = font(bold=True)
        self.row += 1

    def sentences(
        self, texts: Sequence[str], columns: int = 9, faint: bool = False, strong: bool = False
    ) -> None:
        """Sentences, each over the first ``columns`` columns in a row of its own, high enough to be read."""
        for text in texts:
            cell = self.sheet.cell(self.row, 1)
            put_text(cell, text)
            cell.font = font(bold=strong, faint=faint)
            cell.alignment = Alignment(wrap_text=True, vertical="top")
            self.sheet.merge_cells(start_row=self.row, end_row=self.row, start_column=1, end_column=columns)
            self._long.append((self.row, columns, len(text) * (_BOLD if strong else 1.0)))
            self.row += 1

    def table(
        self, table: Table, leave_out: Collection[str] = (), mark: Sequence[bool] = (), left: int = 1
    ) -> Place:
        """A table with its header and its notes below.

        mark: rows shown bold on a tint; left: number of the first column.
        """
        columns = [column for column in table.columns if column.key not in leave_out]
        header = self.row
        signed = _SIGNED.get(table.key, ())
        for position, column in enumerate(columns, start=left):
            cell = self.sheet.cell(header, position)
            put_text(cell, column_title(column))
            cell.font = font(bold=True)
            cell.fill, cell.border = _HEADER, _LINE
            side = "right" if column.kind in _NUMERIC else "left"
            cell.alignment = Alignment(
                wrap_text=True, vertical="bottom", horizontal=side, indent=int(side == "left")
            )
            self._wrapped.append((header, position, _BOLD * len(column_title(column))))
            self._fill(column, position, header + 1, mark, column.key in signed)
        self.row = header + table.n_rows + 1
        if table.notes:
            self.sentences(table.notes, faint=True)
        numbers = {column.key: position for position, column in enumerate(columns, start=left)}
        return Place(header, header + 1, header + table.n_rows, numbers)

    def _fill(self, column: Column, position: int, first: int, mark: Sequence[bool], signed: bool) -> None:
        longest = max((_BOLD * len(word) + 1.0 for word in column_title(column).split()), default=0.0)
        words = column.kind in ("text", "flag")
        side = "left" if words else "right"
        alignment = Alignment(wrap_text=words, vertical="top", horizontal=side, indent=int(words))
        for row, value in enumerate(column.values, start=first):
            cell = self.sheet.cell(row, position)
            put_value(cell, value, column, signed)
            cell.alignment = alignment
            marked = bool(mark) and mark[row - first]
            cell.font = font(bold=marked)
            if marked:
                cell.fill = _MARKED
            signs = len(value_text(value, column.kind, column.decimals)) * (_BOLD if marked else 1.0)
            longest = max(longest, signs)
            if words and signs > _NARROW:
                self._wrapped.append((row, position, signs))
        width = min(max(longest * 1.05 + 2.5, _NARROW), _WIDE)
        self._widths[position] = max(self._widths.get(position, 0.0), width)

    def widen(self, position: int, width: float) -> None:
        """Make a column at least so wide (signs)."""
        self._widths[position] = max(self._widths.get(position, 0.0), width)

    def narrow(self, position: int, width: float) -> None:
        """Make a column at most so wide (signs); its texts wrap."""
        self._widths[position] = min(self._widths.get(position, width), width)

    def filter_and_freeze(self, place: Place, left: int) -> None:
        """Filter buttons on the header, header and the first ``left`` columns always in sight."""
        last = get_column_letter(max(place.columns.values()))
        self.sheet.auto_filter.ref = f"A{place.header}:{last}{max(place.last, place.header)}"
        self.sheet.freeze_panes = f"{get_column_letter(left + 1)}{place.header + 1}"
        self.sheet.print_title_rows = f"{place.header}:{place.header}"

    def break_pages(self, rows: Sequence[int]) -> None:
        """Start a new printed page after each of these rows."""
        for row in rows:
            self.sheet.row_breaks.append(Break(id=row))

    def finish(self, one_page: bool = False) -> None:
        """Widths, heights, print layout: A4, as wide as the page; ``one_page``: upright, all on one."""
        for position, width in self._widths.items():
            self.sheet.column_dimensions[get_column_letter(position)].width = width
        for row, lines in self._lines().items():
            self.sheet.row_dimensions[row].height = _LINE_HEIGHT * lines
        self.sheet.sheet_view.showGridLines = False
        page = self.sheet.page_setup
        page.orientation, page.paperSize = "portrait" if one_page else "landscape", 9
        page.fitToWidth, page.fitToHeight = 1, 1 if one_page else 0
        self.sheet.sheet_properties.pageSetUpPr.fitToPage = True
        margins = self.sheet.page_margins
        margins.left = margins.right = 0.45
        margins.top, margins.bottom, margins.footer = 0.5, 0.8, 0.35
        self.sheet.oddFooter.left.text = "&A"
        self.sheet.oddFooter.right.text = _("page {page} of {pages}").format(page="&P", pages="&N")

    def _lines(self) -> dict[int, int]:
        """Lines of text that every row needs, where more than one may be."""
        lines: dict[int, int] = {}
        for row, position, signs in self._wrapped:
            room = self._widths.get(position, _NARROW) - 1.2
            # Words do not fill their lines to the end.
            waste = 1.12 if signs > 2.0 * room else 1.0
            lines[row] = max(lines.get(row, 1), math.ceil(waste * signs / room))
        for row, columns, signs in self._long:
            room = sum(self._widths.get(position, _NARROW) for position in range(1, columns + 1))
            lines[row] = max(lines.get(row, 1), math.ceil(0.95 * signs / room))
        return lines
