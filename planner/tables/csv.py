"""Tables as CSV for scripts: UTF-8, comma, decimal point, ISO dates, keys as header."""

from __future__ import annotations

import csv
import math
from datetime import date
from decimal import Decimal
from pathlib import Path

from planner.base.target_file import replacing
from planner.tables.table import Table

ENDINGS = (".csv", ".txt")


def cell_text(value: object) -> str:
    """A value as a script reads it back: shortest exact number, parts of 1, ISO date, empty for NaN."""
    if value is None:
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, Decimal):
        return format(value, "f")
    if isinstance(value, float):
        return repr(float(value)) if math.isfinite(value) else ""
    return value.isoformat() if isinstance(value, date) else str(value)


def write_csv(table: Table, path: Path) -> None:
    """Write every row, in place of an earlier file in one step.

    Raises CallError when the target cannot be written.
    """
    with replacing(path, ENDINGS) as part, part.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow([column.key for column in table.columns])
        for row in zip(*(column.values for column in table.columns), strict=True):
            writer.writerow([cell_text(value) for value in row])
