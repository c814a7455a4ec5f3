"""The one place that turns the values of a column into text, whatever the locale.

The window has its own, with the user's locale; the command line and the workbook's words use these.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from datetime import date

from planner.base.text import _
from planner.tables.table import Column, Table

_RIGHT = ("count", "number", "money", "percent")


def number(value: float, decimals: int = 0, signed: bool = False) -> str:
    """1,234.5; ``signed`` puts a plus before gains; what rounds to zero has no sign; empty for NaN."""
    if not math.isfinite(value):
        return ""
    text = f"{abs(value):,.{decimals}f}"
    if not any(mark in "123456789" for mark in text):
        return text
    if value < 0.0:
        return f"-{text}"
    return f"+{text}" if signed else text


def percent(part: float, decimals: int = 0, signed: bool = False) -> str:
    """A part of 1 as per cent: 0.123 -> "12 %"."""
    text = number(100.0 * part, decimals, signed)
    return _("{number} %").format(number=text) if text else ""


def span(low: float, high: float, decimals: int = 0, signed: bool = False) -> str:
    """An interval: "+3 to +9"; empty when either end is unknown."""
    if not (math.isfinite(low) and math.isfinite(high)):
        return ""
    return _("{low} to {high}").format(low=number(low, decimals, signed), high=number(high, decimals, signed))


def percent_span(low: float, high: float, decimals: int = 0) -> str:
    """An interval of parts of 1: "12 to 19 %"."""
    text = span(100.0 * low, 100.0 * high, decimals)
    return _("{number} %").format(number=text) if text else ""


def sensible_decimals(values: Iterable[float]) -> int:
    """Decimals that leave about three figures of the largest value."""
    largest = max((abs(value) for value in values if math.isfinite(value)), default=0.0)
    if largest >= 100.0 or largest == 0.0:
        return 0
    return 1 if largest >= 10.0 else 2


def value_text(value: object, kind: str, decimals: int = 0) -> str:
    """One value of a column of this kind; empty for None and NaN."""
    if value is None:
        return ""
    if kind == "flag":
        return _("yes") if value else _("no")
    if kind == "text":
        return value.isoformat() if isinstance(value, date) else str(value)
    amount = float(value)  # type: ignore[arg-type]
    if kind == "percent":
        return percent(amount, decimals)
    return number(amount, 0 if kind == "count" else decimals)


def column_texts(column: Column) -> list[str]:
    """One text per row."""
    return [value_text(value, column.kind, column.decimals) for value in column.values]


def column_title(column: Column) -> str:
    """Title with the unit behind it."""
    return _("{title} ({unit})").format(title=column.title, unit=column.unit) if column.unit else column.title


def table_text(table: Table, keys: tuple[str, ...] = (), rows: int | None = None) -> str:
    """The table in columns of even width, for a terminal; keys: which columns, empty for all.

    rows: the first so many, then a line that says how many more there are.
    """
    columns = [table.column(key) for key in keys] if keys else list(table.columns)
    shown = table.n_rows if rows is None else min(rows, table.n_rows)
    parts = []
    for column in columns:
        texts = [column_title(column), *column_texts(column)[:shown]]
        width = max(map(len, texts))
        right = column.kind in _RIGHT
        parts.append([text.rjust(width) if right else text.ljust(width) for text in texts])
    lines = ["  ".join(cells).rstrip() for cells in zip(*parts, strict=True)]
    if shown < table.n_rows:
        lines.append(_("... and {n} more rows").format(n=table.n_rows - shown))
    return "\n".join(lines)
