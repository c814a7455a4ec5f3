"""Delimited text files: encoding, delimiter and cells, found by looking at the file."""

from __future__ import annotations

import codecs
import csv
import gzip
import io
import zlib
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.csv as arrow_csv

from planner.base.errors import DataError
from planner.base.text import _
from planner.sales.columns import RawTable, text_column

DELIMITERS = (",", ";", "\t", "|")
_BOMS = (
    (codecs.BOM_UTF8, "utf-8"),
    (codecs.BOM_UTF16_LE, "utf-16-le"),
    (codecs.BOM_UTF16_BE, "utf-16-be"),
)
_PIECE = 1 << 24


def read_text_file(path: Path, name: str) -> RawTable:
    """A delimited text file (.csv .tsv .txt, each also .gz) with a header row."""
    data = _utf8(_bytes(path), path)
    data, skipped = _without_leading_blank_lines(data)
    if not data[:4096].strip() and not data.strip():
        raise DataError(
            _("the file is empty; expected a header row and one row per record."),
            place=path.name,
            remedy=_("Export the table again."),
        )
    delimiter = _delimiter(data)
    headers = _headers(data, delimiter, path)
    table = _fast(data, delimiter, headers)
    if table is not None:
        columns = {header: text_column(table.column(k)) for k, header in enumerate(headers)}
        rows = np.arange(2, 2 + table.num_rows, dtype=np.int64) + skipped
        return RawTable(name, path.name, columns, rows, delimiter, np.zeros(rows.size, dtype=bool))
    return _careful(data, delimiter, headers, skipped, path, name)


def _bytes(path: Path) -> bytes:
    try:
        data = path.read_bytes()
        if data[:2] == b"\x1f\x8b":
            return gzip.decompress(data)
    except (EOFError, gzip.BadGzipFile, zlib.error) as error:
        raise DataError(
            _("the compressed file ends early or is damaged ({why}).").format(why=error),
            place=path.name,
            remedy=_("Copy or export the file again."),
        ) from error
    except OSError as error:
        raise DataError(
            _("the file cannot be read ({why}).").format(why=error.strerror or error),
            place=str(path),
            remedy=_("Check the path and that you may read it."),
        ) from error
    return data


def _utf8(data: bytes, path: Path) -> bytes:
    """The same text in UTF-8 without a byte order mark; what is not UTF-8 is Windows-1252."""
    for mark, encoding in _BOMS:
        if data.startswith(mark):
            rest = data[len(mark) :]
            if encoding != "utf-8":
                return rest.decode(encoding, "replace").encode()
            return rest if _is_utf8(rest) else rest.decode("utf-8", "replace").encode()
    head = data[:4000]
    if b"\x00" in head:
        odd, even = head[1::2].count(0), head[0::2].count(0)
        # Western text in UTF-16 has a zero in nearly every second byte, and only there.
        if max(odd, even) > 0.4 * len(head) and min(odd, even) < 0.01 * len(head):
            return data.decode("utf-16-le" if odd > even else "utf-16-be", "replace").encode()
        raise DataError(
            _("this is not a text table: it holds binary bytes."),
            place=path.name,
            remedy=_("Give a CSV, TSV, XLSX or Parquet file under its own ending."),
        )
    return data if _is_utf8(data) else data.decode("cp1252", "replace").encode()


def _is_utf8(data: bytes) -> bool:
    decoder = codecs.getincrementaldecoder("utf-8")()
    try:
        for start in range(0, len(data), _PIECE):
            decoder.decode(data[start : start + _PIECE])
        decoder.decode(b"", final=True)
    except UnicodeDecodeError:
        return False
    return True


def _without_leading_blank_lines(data: bytes) -> tuple[bytes, int]:
    skipped = 0
    while data[:1] in (b"\n", b"\r"):
        data = data[2:] if data[:2] == b"\r\n" else data[1:]
        skipped += 1
    return data, skipped


def _sample(data: bytes) -> list[str]:
    text = data[:65536].decode("utf-8", "replace")
    lines = text.splitlines()
    return lines[:50] if len(lines) < 3 or len(data) <= 65536 else lines[: min(50, len(lines) - 1)]


def _delimiter(data: bytes) -> str:
    """The delimiter that splits the first lines into equally many cells, and most of them."""
    lines = [line for line in _sample(data) if line.strip()]
    best, best_score = ",", (-1.0, 0)
    for mark in DELIMITERS:
        widths = [len(row) for row in csv.reader(lines, delimiter=mark)]
        if widths[0] < 2:
            continue
        score = (sum(width == widths[0] for width in widths) / len(widths), widths[0])
        if score > best_score:
            best, best_score = mark, score
    return best


def _headers(data: bytes, delimiter: str, path: Path) -> list[str]:
    head = io.StringIO(data[:1_000_000].decode("utf-8", "replace"), newline="")
    try:
        row = next(csv.reader(head, delimiter=delimiter))
    except csv.Error as error:
        raise DataError(
            _("the first row cannot be read as column names ({why}).").format(why=error),
            place=path.name,
            remedy=_("Check that the file is a text table with a header row."),
        ) from error
    headers = [cell.strip() for cell in row]
    named: list[str] = []
    for k, header in enumerate(headers):
        label = header or _("column {n}").format(n=k + 1)
        if label in named:
            if header:
                raise DataError(
                    _("two columns are called '{header}'.").format(header=header),
                    place=path.name,
                    remedy=_("Give every column its own name in the header row."),
                )
            label += "'"
        named.append(label)
    return named


def _is_plain(data: bytes) -> bool:
    """No blank lines inside and no lone carriage returns: row numbers follow from the order."""
    if data.find(b"\r") < 0:
        marks: tuple[bytes, ...] = (b"\n\n",)
    else:
        marks = (b"\n\n", b"\n\r\n", b"\r\r")
    end = len(data)
    while end and data[end - 1] in b"\r\n":
        end -= 1
    return all(data.find(mark, 0, end) < 0 for mark in marks)


def _fast(data: bytes, delimiter: str, headers: list[str]) -> pa.Table | None:
    """Cells by arrow; None when rows are not one line each of equally many cells."""
    names = [str(k) for k in range(len(headers))]
    kind = pa.dictionary(pa.int32(), pa.string())
    if not _is_plain(data) or (b'"' in data and _quotes_hold_newlines(data)):
        return None
    try:
        table = arrow_csv.read_csv(
            pa.BufferReader(data),
            read_options=arrow_csv.ReadOptions(column_names=names, skip_rows=1, block_size=1 << 22),
            parse_options=arrow_csv.ParseOptions(delimiter=delimiter, newlines_in_values=False),
            convert_options=arrow_csv.ConvertOptions(
                column_types=dict.fromkeys(names, kind), strings_can_be_null=False, check_utf8=False
            ),
        )
    except pa.ArrowInvalid:
        return None
    return table.unify_dictionaries()


def _quotes_hold_newlines(data: bytes) -> bool:
    """A quoted cell may span lines when some line holds an odd number of quotes."""
    marks = np.frombuffer(data, dtype=np.uint8)
    ends = np.flatnonzero(marks == 10)
    quotes = np.searchsorted(np.flatnonzero(marks == 34), ends)
    return bool((np.diff(quotes, prepend=0) % 2).any())


def _careful(
    data: bytes, delimiter: str, headers: list[str], skipped: int, path: Path, name: str
) -> RawTable:
    """Row by row: blank lines are passed over, rows of another width are marked."""
    width = len(headers)
    cells: list[list[str]] = [[] for _header in headers]
    rows: list[int] = []
    crooked: list[bool] = []
    reader = csv.reader(io.StringIO(data.decode("utf-8", "replace"), newline=""), delimiter=delimiter)
    try:
        next(reader)
        number = reader.line_num + 1
        for record in reader:
            if any(cell.strip() for cell in record):
                rows.append(number + skipped)
                # Empty cells beyond the header are a trailing delimiter, not another shape.
                crooked.append(len(record) < width or any(cell.strip() for cell in record[width:]))
                padded = record + [""] * (width - len(record))
                for column, cell in zip(cells, padded, strict=False):
                    column.append(cell)
            number = reader.line_num + 1
    except csv.Error as error:
        raise DataError(
            _("row {row} cannot be read as cells ({why}).").format(row=reader.line_num, why=error),
            place=path.name,
            remedy=_("Check the quotes in that row."),
        ) from error
    columns = {
        header: text_column(pa.array(column, pa.string()))
        for header, column in zip(headers, cells, strict=True)
    }
    return RawTable(
        name, path.name, columns, np.array(rows, dtype=np.int64), delimiter, np.array(crooked, dtype=bool)
    )
