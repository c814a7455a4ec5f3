"""A column's values as the window shows them, in the user's locale."""

from __future__ import annotations

import math
from datetime import date

from planner.base.text import _
from planner.gui.theme import numbers
from planner.tables.table import Column


def texts_of(column: Column) -> list[str]:
    """One text per row; empty for None and NaN."""
    return [cell_text(value, column.kind, column.decimals) for value in column.values]


def cell_text(value: object, kind: str, decimals: int = 0) -> str:
    """One value of a column of this kind."""
    if value is None:
        return ""
    if kind == "flag":
        return _("yes") if value else _("no")
    if kind == "text":
        return numbers.day(value) if isinstance(value, date) else str(value)
    amount = float(value)  # type: ignore[arg-type]
    if math.isnan(amount):
        return ""
    if kind == "percent":
        return numbers.percent(amount, decimals)
    return numbers.number(amount, 0 if kind == "count" else decimals)
