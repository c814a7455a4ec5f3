"""What models tell widgets: records both sides know, so that neither needs the other."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import NamedTuple

from PySide6.QtCore import Qt

from planner.base.text import _


class CellBar(NamedTuple):
    """A bar inside a cell, all in the column's own unit.

    bottom, top: the column's scale, containing 0.  low, high: interval, NaN for none.
    longest: the widest text of the column, so that all bars of a column end alike.
    """

    value: float
    low: float
    high: float
    bottom: float
    top: float
    longest: str = ""


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


@dataclass(frozen=True)
class BarRow:
    """kind: "item", "own" (own label), "leaves" (the category), "total" or "heading".

    identity: what is sent when the row is chosen; empty for none.
    value, low, high: in the list's unit; NaN low/high: no interval.
    text: the value formatted; interval: the interval formatted; note: shown faint after the label.
    A heading begins a group of rows with a scale of its own.
    """

    label: str
    value: float = math.nan
    low: float = math.nan
    high: float = math.nan
    text: str = ""
    interval: str = ""
    kind: str = "item"
    identity: str = ""
    note: str = ""

    def words(self) -> str:
        """The row as one sentence part, for tool tips and screen readers."""
        head = f"{self.label} ({self.note})" if self.note else self.label
        if self.kind == "heading":
            return head
        if not self.interval:
            return f"{head}: {self.text}"
        return _("{label}: {value}, interval {interval}").format(
            label=head, value=self.text, interval=self.interval
        )


@dataclass(frozen=True)
class TallyColumn:
    """One measure, formatted.  interval: of the change, empty when the change is exact.

    value, low, high: the change in numbers, for the mark under it; NaN for none.
    """

    title: str
    today: str
    plan: str
    change: str
    interval: str = ""
    value: float = math.nan
    low: float = math.nan
    high: float = math.nan

    def words(self) -> str:
        """The column as a sentence part."""
        text = _("{title}: today {today}, plan {plan}, change {change}").format(
            title=self.title, today=self.today, plan=self.plan, change=self.change
        )
        if not self.interval:
            return text
        return _("{text}, 80 % interval {interval}").format(text=text, interval=self.interval)
