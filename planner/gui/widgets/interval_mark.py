"""Bars and intervals: the one way they are drawn in tables, lists and the tally."""

from __future__ import annotations

import math

from PySide6.QtCore import QPointF, QRect, QRectF, Qt
from PySide6.QtGui import QBrush, QColor, QPainter, QPen

from planner.gui.theme.cells import CellBar
from planner.gui.theme.colours import Marks, mixed

_CAP = 3.0


def place(value: float, bottom: float, top: float, rect: QRect) -> float:
    """Position in pixels of ``value`` on a scale from ``bottom`` to ``top`` across ``rect``."""
    return rect.left() + (value - bottom) / (top - bottom) * rect.width()


def paint_interval(painter: QPainter, low: float, high: float, middle: float, colour: QColor) -> None:
    """A whisker with caps from ``low`` to ``high`` (pixels) at the height ``middle``."""
    painter.setPen(QPen(colour, 1.2))
    painter.drawLine(QPointF(low, middle), QPointF(high, middle))
    painter.drawLine(QPointF(low, middle - _CAP), QPointF(low, middle + _CAP))
    painter.drawLine(QPointF(high, middle - _CAP), QPointF(high, middle + _CAP))


def paint_bar(
    painter: QPainter,
    rect: QRect,
    bar: CellBar,
    marks: Marks,
    line: QColor,
    fill: QColor | None = None,
    pattern: Qt.BrushStyle = Qt.BrushStyle.SolidPattern,
) -> None:
    """A bar from zero to the value, its whisker over it, and the zero line when bars go both ways.

    Losses stand left of zero and are hatched, so that colour alone tells nothing.
    """
    zero = place(0.0, bar.bottom, bar.top, rect)
    end = place(bar.value, bar.bottom, bar.top, rect)
    loss = bar.value < 0.0
    colour = fill or (marks.loss if loss else marks.gain)
    if loss and pattern == Qt.BrushStyle.SolidPattern:
        pattern = Qt.BrushStyle.Dense3Pattern
    body = QRectF(min(zero, end), rect.top(), max(abs(end - zero), 1.0), rect.height())
    painter.setPen(QPen(mixed(colour, marks.text, 0.75), 1.0))
    painter.setBrush(QBrush(colour, pattern))
    painter.drawRect(body)
    if math.isfinite(bar.low) and math.isfinite(bar.high):
        low, high = (place(v, bar.bottom, bar.top, rect) for v in (bar.low, bar.high))
        paint_interval(painter, low, high, rect.center().y() + 0.5, line)
    if bar.bottom < 0.0 < bar.top:
        painter.setPen(QPen(line, 1.0))
        painter.drawLine(QPointF(zero, rect.top() - 3.0), QPointF(zero, rect.bottom() + 3.0))
