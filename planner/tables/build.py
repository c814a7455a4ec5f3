"""Short constructors for columns, one per kind; arrays become Python numbers, NaN becomes empty."""

from __future__ import annotations

import math
from collections.abc import Iterable
from decimal import Decimal
from typing import cast

from planner.tables.table import Column

Cells = Iterable[object]


def _plain(values: Cells) -> tuple[object, ...]:
    """Python numbers; None for what is not finite."""
    found: list[object] = []
    for value in values:
        if value is None or isinstance(value, Decimal):
            found.append(value)
        else:
            amount = float(cast(float, value))
            found.append(amount if math.isfinite(amount) else None)
    return tuple(found)


def text(key: str, title: str, values: Cells) -> Column:
    """A column of text (or dates)."""
    return Column(key, title, "text", tuple(values))


def flag(key: str, title: str, values: Cells) -> Column:
    """A column of yes, no or empty."""
    return Column(key, title, "flag", tuple(None if value is None else bool(value) for value in values))


def count(key: str, title: str, values: Cells) -> Column:
    """A column of whole numbers."""
    return Column(
        key, title, "count", tuple(None if value is None else int(cast(int, value)) for value in values)
    )


def number(key: str, title: str, values: Cells, decimals: int = 1, unit: str = "") -> Column:
    """A column of numbers."""
    return Column(key, title, "number", _plain(values), unit, decimals)


def money(key: str, title: str, values: Cells, decimals: int = 2) -> Column:
    """A column of money."""
    return Column(key, title, "money", _plain(values), decimals=decimals)


def percent(key: str, title: str, values: Cells, decimals: int = 0) -> Column:
    """A column of parts of 1, shown as per cent."""
    return Column(key, title, "percent", _plain(values), decimals=decimals)
