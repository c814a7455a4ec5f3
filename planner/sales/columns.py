"""A table as it was read: every column as text, each different text stored once."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from planner.base.text import _

Codes = NDArray[np.int32]
Ints = NDArray[np.int64]

HEADERS_SHOWN = 40


@dataclass(frozen=True)
class TextColumn:
    """Cells as text without surrounding blanks.

    codes (n,): position of the cell's text in ``values``; -1 for a blank cell.
    values: the different texts.
    padded (n,): cells that had blanks around their text in the file; None when none had.
    """

    codes: Codes
    values: pa.StringArray
    padded: NDArray[np.bool_] | None = None

    def take(self, rows: Ints) -> TextColumn:
        """The same column for some rows."""
        return TextColumn(self.codes[rows], self.values)

    def spread(self, distinct: list[bool] | NDArray[np.bool_], blank: bool = False) -> NDArray[np.bool_]:
        """A property (n,) of every cell from that of the different texts; ``blank``: of blank cells."""
        if not (any(distinct) or (blank and self.has_blank())):
            return np.zeros(self.codes.size, dtype=bool)
        cells: NDArray[np.bool_] = np.append(np.asarray(distinct, dtype=bool), blank)[self.codes]
        return cells

    def has_blank(self) -> bool:
        """Whether some cell is blank."""
        return self.codes.size > 0 and int(self.codes.min()) < 0

    def texts(self) -> list[str]:
        """The different texts as Python strings."""
        found: list[str] = self.values.to_pylist()
        return found

    def cells(self, rows: Ints) -> list[str]:
        """The cells of some rows, blank as ''."""
        picked = self.codes[rows]
        if len(self.values) == 0:
            return [""] * len(rows)
        texts: list[str] = self.values.take(pa.array(np.maximum(picked, 0))).to_pylist()
        return ["" if code < 0 else text for code, text in zip(picked, texts, strict=True)]


def text_column(column: pa.ChunkedArray | pa.Array) -> TextColumn:
    """Any arrow column as text; surrounding blanks removed, empty cells blank."""
    if isinstance(column, pa.ChunkedArray):
        column = column.combine_chunks() if column.num_chunks != 1 else column.chunk(0)
        if isinstance(column, pa.ChunkedArray):
            column = pa.concat_arrays(column.chunks)
    if not pa.types.is_dictionary(column.type):
        column = column.dictionary_encode()
    codes = column.indices.fill_null(-1).to_numpy(zero_copy_only=False).astype(np.int32, copy=False)
    return _tidied(codes, as_text(column.dictionary))


def as_text(values: pa.Array) -> pa.StringArray:
    """Numbers, dates and booleans as the text that reads back to the same value."""
    kind = values.type
    if pa.types.is_timestamp(kind):
        return pc.strftime(values, "%Y-%m-%d %H:%M:%S")
    if pa.types.is_decimal(kind) or pa.types.is_floating(kind) or not pa.types.is_string(kind):
        values = values.cast(pa.string())
    return values


def _tidied(codes: Codes, values: pa.StringArray) -> TextColumn:
    """Blanks removed around every text; texts that become equal share one position."""
    trimmed = pc.utf8_trim(pc.fill_null(values, ""), " \t\r\n\v\f\u00a0\u202f\ufeff")
    again = trimmed.dictionary_encode()
    texts = again.dictionary
    empty = pc.index(texts, "").as_py()
    changed = pc.not_equal(trimmed, values).fill_null(False).to_numpy(zero_copy_only=False)
    padded = np.append(changed, False)[codes] if changed.any() else None
    if len(texts) == len(values) and empty < 0:
        return TextColumn(codes, trimmed, padded)
    place = again.indices.to_numpy(zero_copy_only=False).astype(np.int32)
    if empty >= 0:
        place = np.where(place == empty, -1, place - (place > empty)).astype(np.int32)
        texts = pa.concat_arrays([texts.slice(0, empty), texts.slice(empty + 1)])
    moved = np.append(place, np.int32(-1))[codes]
    return TextColumn(moved, texts, padded)


def column_of(cells: list[str]) -> TextColumn:
    """A column from Python strings."""
    return text_column(pa.array(cells, pa.string()))


@dataclass(frozen=True)
class RawTable:
    """One file's table.

    name: table of ours ("sales"); file: the file's name, for messages.
    columns: header -> cells, in file order.  rows (n,): row number in the file, header included.
    delimiter: the one found in a text file, else ''.
    crooked (n,): rows with another number of cells than the header (text files only).
    """

    name: str
    file: str
    columns: dict[str, TextColumn]
    rows: Ints
    delimiter: str = ""
    crooked: NDArray[np.bool_] = field(default_factory=lambda: np.zeros(0, dtype=bool))

    def __len__(self) -> int:
        return int(self.rows.size)

    def repeats(self) -> NDArray[np.bool_]:
        """Rows (n,) that repeat an earlier row in every cell."""
        cells = {k: column.codes for k, column in enumerate(self.columns.values())}
        repeated: NDArray[np.bool_] = pd.DataFrame(cells).duplicated(keep="first").to_numpy()
        return repeated

    def headers(self) -> str:
        """The headers that are there, for messages."""
        names = list(self.columns)
        more = len(names) - HEADERS_SHOWN
        shown = ", ".join(name[:60] for name in names[:HEADERS_SHOWN])
        return shown if more <= 0 else _("{shown} and {n} more").format(shown=shown, n=more)

    def frame(self, picked: Ints, reasons: list[str]) -> pd.DataFrame:
        """Some rows as text with file, row and reason in front."""
        data: dict[str, object] = {
            "file": [self.file] * len(picked),
            "row": self.rows[picked],
            "reason": reasons,
        }
        for header, column in self.columns.items():
            label = header if header not in data else f"{header} (file)"
            data[label] = pd.Series(column.cells(picked), dtype="str")
        return pd.DataFrame(data)

    def line(self, row: int) -> str:
        """One row as words, for an example."""
        at = np.array([row])
        cells = [f"{header}={column.cells(at)[0]}" for header, column in self.columns.items()]
        return ", ".join(cells)
