"""What a table model tells the delegate about one cell: the one record both sides know."""

from __future__ import annotations

from typing import NamedTuple

from PySide6.QtCore import Qt


class CellBar(NamedTuple):
    """A bar inside a cell, all in the column's own unit.

    bottom, top: the column's scale, containing 0.  low, high: interval, NaN for none.
    """

    value: float
    low: float
    high: float
    bottom: float
    top: float


class Cell(NamedTuple):
    """text: formatted.  right: aligned right.  check: None when there is no box.

    heading: the row names a group.  strong: a cell that differs from today.
    editable: the user may type here.
    """

    text: str
    right: bool = False
    bar: CellBar | None = None
    check: Qt.CheckState | None = None
    heading: bool = False
    strong: bool = False
    editable: bool = False
