"""View-neutral tables: the window, the workbook and the command line show the same ones."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

# How a column's values are meant; every view has one format per kind.
KINDS = ("text", "count", "number", "money", "percent", "flag")


@dataclass(frozen=True)
class Column:
    """key: stable name; title: for people; unit: shown after the title ("" none).

    values: one per row; None = empty.  percent values are parts of 1.
    """

    key: str
    title: str
    kind: str
    values: Sequence[object]
    unit: str = ""
    decimals: int = 0


@dataclass(frozen=True)
class Table:
    """Columns of equal length, with the words that belong under it."""

    key: str
    title: str
    columns: tuple[Column, ...]
    notes: tuple[str, ...] = field(default=())

    def __post_init__(self) -> None:
        lengths = {len(column.values) for column in self.columns}
        if len(lengths) > 1:
            raise ValueError(f"Table {self.key}: columns of unequal length {sorted(lengths)}.")

    @property
    def n_rows(self) -> int:
        """Number of rows."""
        return len(self.columns[0].values) if self.columns else 0

    def column(self, key: str) -> Column:
        """The column with this key."""
        for column in self.columns:
            if column.key == key:
                return column
        raise KeyError(f"Table {self.key} has no column {key}.")
