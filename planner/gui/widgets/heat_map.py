"""A heat map drawn as one image: rows with names, columns with a few labels."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QEvent, QPoint, QRect, QRectF, QSize, Qt
from PySide6.QtGui import QHelpEvent, QImage, QPainter, QPaintEvent
from PySide6.QtWidgets import QSizePolicy, QToolTip, QWidget

from planner.base.text import _
from planner.gui.theme.colours import heat_colours, marks_of
from planner.gui.theme.numbers import percent

# Height of the colour key and the week labels above the picture.
_HEAD = 46
_ROW = 13


class HeatMap(QWidget):
    """``parts`` (rows, columns) in 0..1, NaN for nothing there."""

    def __init__(self, name: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setAccessibleName(name)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Preferred)
        self._parts: NDArray[np.float64] = np.empty((0, 0))
        self._rows: tuple[str, ...] = ()
        self._columns: tuple[str, ...] = ()
        self._image = QImage()
        self._colours = heat_colours()

    def set_parts(
        self, parts: NDArray[np.float64], rows: Sequence[str], columns: Sequence[str], words: str
    ) -> None:
        """Show ``parts``; ``words`` describe the picture for those who do not see it."""
        self._parts, self._rows, self._columns = parts, tuple(rows), tuple(columns)
        self.setAccessibleDescription(words)
        self._draw()
        self.setMinimumHeight(_ROW * len(self._rows) + _HEAD + 6)
        self.updateGeometry()
        self.update()

    def sizeHint(self) -> QSize:
        return QSize(600, max(_ROW * len(self._rows) + _HEAD + 6, 200))

    def _draw(self) -> None:
        if not self._parts.size:
            self._image = QImage()
            return
        known = np.isfinite(self._parts)
        level = np.rint(np.clip(np.nan_to_num(self._parts), 0.0, 1.0) * 255.0).astype(np.intp)
        pixels = np.where(known, self._colours[level], np.uint32(0)).astype(np.uint32)
        pixels = np.ascontiguousarray(pixels)
        height, width = pixels.shape
        view = QImage(pixels.data, width, height, 4 * width, QImage.Format.Format_ARGB32)
        self._image = view.copy()

    def _name_width(self) -> int:
        metrics = self.fontMetrics()
        longest = max((metrics.horizontalAdvance(name) for name in self._rows), default=0)
        return min(longest + 12, self.width() // 3)

    def _area(self) -> QRect:
        left = self._name_width()
        return QRect(left, _HEAD, self.width() - left - 10, _ROW * len(self._rows))

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self)
        marks = marks_of(self.palette())
        painter.fillRect(self.rect(), marks.background)
        if self._image.isNull():
            return
        area = self._area()
        painter.fillRect(area, marks.grid)
        painter.drawImage(QRectF(area), self._image)
        font = painter.font()
        font.setPixelSize(_ROW - 2)
        painter.setFont(font)
        painter.setPen(marks.text)
        metrics = painter.fontMetrics()
        for row, name in enumerate(self._rows):
            box = QRect(4, area.top() + row * _ROW, area.left() - 10, _ROW)
            text = metrics.elidedText(name, Qt.TextElideMode.ElideRight, box.width())
            painter.drawText(box, Qt.AlignmentFlag.AlignVCenter | Qt.AlignmentFlag.AlignLeft, text)
        self._weeks(painter, area)
        self._key(painter, area)

    def _weeks(self, painter: QPainter, area: QRect) -> None:
        metrics = painter.fontMetrics()
        count = len(self._columns)
        width = metrics.horizontalAdvance(self._columns[0]) + 24
        step = max(1, -(-count * width // max(area.width(), 1)))
        for column in range(0, count, step):
            x = area.left() + column * area.width() // count
            painter.drawLine(x, area.top() - 4, x, area.top() - 1)
            if x + width - 24 <= self.width():
                painter.drawText(QPoint(x, area.top() - 6), self._columns[column])

    def _key(self, painter: QPainter, area: QRect) -> None:
        """The colour key: none to all stores."""
        metrics = painter.fontMetrics()
        ramp = np.ascontiguousarray(self._colours[None, :])
        image = QImage(ramp.data, 256, 1, 1024, QImage.Format.Format_ARGB32).copy()
        low, high = _("no store"), _("all stores")
        x, y = area.left(), 6
        painter.drawText(x, y + metrics.ascent(), low)
        x += metrics.horizontalAdvance(low) + 8
        painter.drawImage(QRectF(x, y + 1, 120, _ROW - 2), image)
        painter.drawText(x + 128, y + metrics.ascent(), high)

    def event(self, event: QEvent) -> bool:
        """Tool tip of the cell under the pointer."""
        if isinstance(event, QHelpEvent) and event.type() == QEvent.Type.ToolTip:
            text = self.words_at(event.pos())
            if text:
                QToolTip.showText(event.globalPos(), text, self)
            else:
                QToolTip.hideText()
            return True
        return super().event(event)

    def words_at(self, where: QPoint) -> str:
        """Row, column and value under a point; empty outside the picture."""
        area = self._area()
        if self._image.isNull() or not area.contains(where):
            return ""
        row = (where.y() - area.top()) // _ROW
        column = (where.x() - area.left()) * len(self._columns) // area.width()
        part = float(self._parts[row, column])
        return f"{self._rows[row]}\n{self._columns[column]}: {percent(part) or _('nothing')}"
