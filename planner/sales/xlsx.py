"""Workbooks: the one place of this package that opens them."""

from __future__ import annotations

import warnings
import zipfile
import zlib
from datetime import date, datetime, time
from pathlib import Path
from typing import Any

import openpyxl
from openpyxl.utils.exceptions import InvalidFileException

from planner.base.errors import DataError
from planner.base.text import _

# What a damaged workbook makes its parts raise: archive, XML and cell values.
_DAMAGE = (
    InvalidFileException, zipfile.BadZipFile, zlib.error, SyntaxError, OSError, EOFError, KeyError,
    ValueError, TypeError, IndexError, AttributeError, NotImplementedError, RuntimeError, OverflowError,
)  # fmt: skip


def read_sheet(path: Path, name: str) -> tuple[list[str], list[list[str]], list[int]]:
    """Headers, rows of text cells and their row numbers of one sheet.

    The sheet called like the table ("sales"), else the first one that holds something.
    """
    try:
        found = _first_table(path, name)
    except _DAMAGE as error:
        raise DataError(
            _("this workbook cannot be opened ({why}); it may be damaged or protected.").format(
                why=error or type(error).__name__
            ),
            place=path.name,
            remedy=_("Save it again as .xlsx without a password, or export CSV."),
        ) from error
    if found is None:
        raise DataError(
            _("the workbook holds no table; expected a header row and one row per record."),
            place=path.name,
            remedy=_("Export the table again."),
        )
    return found


def _first_table(path: Path, name: str) -> tuple[list[str], list[list[str]], list[int]] | None:
    with warnings.catch_warnings():
        # Styles and validations that cannot be kept do not matter to a reader.
        warnings.simplefilter("ignore", UserWarning)
        book = openpyxl.load_workbook(path, read_only=True, data_only=True)
    try:
        sheets = [sheet for sheet in book.worksheets if sheet.title.strip().casefold() == name]
        found = (_rows(sheet, path) for sheet in sheets or book.worksheets)
        return next((table for table in found if table is not None), None)
    finally:
        book.close()


def _rows(sheet: Any, path: Path) -> tuple[list[str], list[list[str]], list[int]] | None:
    headers: list[str] = []
    rows: list[list[str]] = []
    numbers: list[int] = []
    # Some exporters write a wrong size of the sheet; without it every row is read.
    sheet.reset_dimensions()
    for number, values in enumerate(sheet.iter_rows(values_only=True), start=1):
        cells = [_text(value) for value in values]
        if not any(cells):
            continue
        if not headers:
            while cells and not cells[-1]:
                cells.pop()
            headers = [cell or _("column {n}").format(n=k + 1) for k, cell in enumerate(cells)]
            twice = sorted({header for header in headers if headers.count(header) > 1})
            if twice:
                raise DataError(
                    _("two columns are called '{header}'.").format(header=twice[0]),
                    place=path.name,
                    remedy=_("Give every column its own name in the header row."),
                )
            continue
        width = len(headers)
        rows.append((cells + [""] * width)[:width])
        numbers.append(number)
    return (headers, rows, numbers) if headers else None


def _text(value: object) -> str:
    """A cell's value as text: whole numbers without a point, dates ISO."""
    if value is None:
        return ""
    if isinstance(value, bool):
        return "1" if value else "0"
    if isinstance(value, float):
        return str(int(value)) if value.is_integer() and abs(value) < 1e15 else repr(value)
    if isinstance(value, datetime):
        whole_day = value.time() == time(0)
        return value.date().isoformat() if whole_day else value.isoformat(sep=" ", timespec="seconds")
    if isinstance(value, date):
        return value.isoformat()
    return str(value).strip()
