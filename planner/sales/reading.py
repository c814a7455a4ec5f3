"""From a file or folder to a table of text cells."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.dataset as arrow_dataset

from planner.base.errors import DataError
from planner.base.text import _
from planner.sales.columns import RawTable, text_column
from planner.sales.text_files import read_text_file
from planner.sales.xlsx import read_sheet

ENDINGS = (".csv", ".csv.gz", ".tsv", ".tsv.gz", ".txt", ".txt.gz", ".xlsx", ".parquet")


def read_table(path: Path, name: str) -> RawTable:
    """The table ``name`` ("sales", "items" ...) from a text file, workbook, or Parquet file or folder.

    Cells stay text, so that codes keep their leading zeros.
    Raises DataError naming the file when it is missing, empty or of another kind.
    """
    if not path.exists():
        raise DataError(
            _("there is no such file."),
            place=str(path),
            remedy=_("Check the path of the {name} table.").format(name=name),
        )
    ending = path.name.casefold()
    if path.is_dir() or ending.endswith((".parquet", ".pq")):
        table = _read_parquet(path, name)
    elif ending.endswith((".xlsx", ".xlsm")):
        headers, rows, numbers = read_sheet(path, name)
        columns = {
            header: text_column(pa.array([row[k] for row in rows], pa.string()))
            for k, header in enumerate(headers)
        }
        table = RawTable(name, path.name, columns, np.array(numbers, dtype=np.int64))
    elif ending.endswith((".csv", ".tsv", ".txt", ".gz")):
        table = read_text_file(path, name)
    else:
        raise DataError(
            _("files ending in '{ending}' are not read.").format(ending=path.suffix),
            place=path.name,
            remedy=_("Give one of: {endings}.").format(endings=" ".join(ENDINGS)),
        )
    if name in ("sales", "items") and len(table) == 0:
        raise DataError(
            _("the file holds a header but no rows (columns: {columns}).").format(columns=table.headers()),
            place=table.file,
            remedy=_("Export the table again with its rows."),
        )
    return table


def _read_parquet(path: Path, name: str) -> RawTable:
    try:
        data = arrow_dataset.dataset(path, format="parquet").to_table()
    except (pa.ArrowInvalid, pa.ArrowNotImplementedError, OSError) as error:
        raise DataError(
            _("this is not a readable Parquet file or folder ({why}).").format(
                why=str(error).splitlines()[0]
            ),
            place=path.name,
            remedy=_("Export it again, or give CSV."),
        ) from error
    columns: dict[str, object] = {}
    for header in data.column_names:
        if pa.types.is_nested(data.schema.field(header).type):
            continue
        columns[header] = text_column(data.column(header))
    rows = np.arange(1, 1 + data.num_rows, dtype=np.int64)
    return RawTable(name, path.name, columns, rows)  # type: ignore[arg-type]
