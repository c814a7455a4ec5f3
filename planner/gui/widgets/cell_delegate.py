"""Paints the cells of a table: text, box and in-cell bar with its interval."""

from __future__ import annotations

from typing import Protocol, cast

from PySide6.QtCore import (
    QAbstractItemModel,
    QEvent,
    QModelIndex,
    QPersistentModelIndex,
    QPointF,
    QRect,
    QRectF,
    Qt,
)
from PySide6.QtGui import QColor, QFont, QFontMetrics, QKeyEvent, QMouseEvent, QPainter, QPen
from PySide6.QtWidgets import QStyle, QStyledItemDelegate, QStyleOptionViewItem

from planner.gui.theme.cells import Cell
from planner.gui.theme.colours import Marks, marks_of, mixed
from planner.gui.widgets.interval_mark import paint_bar

Index = QModelIndex | QPersistentModelIndex
_PAD = 6
_BOX = 16


class HasCells(Protocol):
    """A model that hands out cells without a round trip per role."""

    def cell(self, row: int, position: int) -> Cell: ...


class CellDelegate(QStyledItemDelegate):
    """Paints ``model.cell(row, column)``; a click or the space bar turns a box."""

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: Index) -> None:
        cell = cast(HasCells, index.model()).cell(index.row(), index.column())
        marks = marks_of(option.palette)
        rect: QRect = option.rect
        painter.save()
        selected = bool(option.state & QStyle.StateFlag.State_Selected)
        colour = marks.selected_text if selected else marks.text
        if cell.heading:
            self._heading(painter, rect, cell, marks, option.font)
        else:
            if selected:
                painter.fillRect(rect, marks.selected)
            elif cell.strong:
                painter.fillRect(rect, marks.band)
            self._content(painter, option, cell, marks, colour)
            if option.state & QStyle.StateFlag.State_HasFocus:
                painter.setPen(QPen(colour, 1.0, Qt.PenStyle.DotLine))
                painter.drawRect(rect.adjusted(1, 1, -2, -2))
        painter.restore()

    @staticmethod
    def _heading(painter: QPainter, rect: QRect, cell: Cell, marks: Marks, font: QFont) -> None:
        painter.fillRect(rect, marks.band)
        painter.setPen(marks.grid)
        painter.drawLine(rect.bottomLeft(), rect.bottomRight())
        bold = QFont(font)
        bold.setBold(True)
        painter.setFont(bold)
        painter.setPen(marks.text)
        inside = rect.adjusted(_PAD, 0, -_PAD, 0)
        painter.drawText(inside, Qt.AlignmentFlag.AlignVCenter | Qt.AlignmentFlag.AlignLeft, cell.text)

    def _content(
        self, painter: QPainter, option: QStyleOptionViewItem, cell: Cell, marks: Marks, colour: QColor
    ) -> None:
        inside = option.rect.adjusted(_PAD, 0, -_PAD, 0)
        if cell.check is not None:
            self._box(painter, option.rect, cell.check, colour)
            inside.setLeft(inside.left() + _BOX + 6)
        metrics = painter.fontMetrics()
        align = Qt.AlignmentFlag.AlignVCenter | (
            Qt.AlignmentFlag.AlignRight if cell.right else Qt.AlignmentFlag.AlignLeft
        )
        if cell.bar is not None:
            selected = bool(option.state & QStyle.StateFlag.State_Selected)
            # On the selection's colour a bar in its own would hardly be seen.
            fill = mixed(marks.selected_text, marks.selected, 0.55) if selected else None
            inside = self._bar(painter, inside, cell, marks, colour, fill)
        if cell.strong:
            font = QFont(option.font)
            font.setBold(True)
            painter.setFont(font)
            metrics = painter.fontMetrics()
        painter.setPen(colour)
        text = metrics.elidedText(cell.text, Qt.TextElideMode.ElideRight, inside.width())
        painter.drawText(inside, align, text)

    @staticmethod
    def _bar(
        painter: QPainter, inside: QRect, cell: Cell, marks: Marks, colour: QColor, fill: QColor | None
    ) -> QRect:
        """Paint the bar at the left, give back the room for the number."""
        assert cell.bar is not None
        bold = QFont(painter.font())
        bold.setBold(True)
        widest = QFontMetrics(bold).horizontalAdvance(cell.bar.longest) + 6
        text_width = min(widest, inside.width() * 2 // 3)
        room = QRect(inside)
        room.setWidth(inside.width() - (text_width if cell.text else 0))
        paint_bar(painter, room.adjusted(0, 5, -4, -5), cell.bar, marks, colour, fill)
        return QRect(room.right(), inside.top(), inside.right() - room.right(), inside.height())

    @staticmethod
    def _box_rect(rect: QRect) -> QRect:
        return QRect(rect.left() + _PAD, rect.center().y() - _BOX // 2 + 1, _BOX, _BOX)

    def _box(self, painter: QPainter, rect: QRect, state: Qt.CheckState, line: QColor) -> None:
        """A box whose outline is seen on every palette; a tick for in, a bar for in between."""
        box = QRectF(self._box_rect(rect)).adjusted(1.5, 1.5, -1.5, -1.5)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setPen(QPen(line, 1.2))
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.drawRoundedRect(box, 2.0, 2.0)
        painter.setPen(QPen(line, 2.2, c=Qt.PenCapStyle.RoundCap, j=Qt.PenJoinStyle.RoundJoin))
        if state == Qt.CheckState.Checked:
            left, middle, right = box.left() + 3.0, box.left() + 5.5, box.right() - 2.6
            painter.drawPolyline(
                [
                    QPointF(left, box.center().y() + 0.5),
                    QPointF(middle, box.bottom() - 3.2),
                    QPointF(right, box.top() + 3.4),
                ]
            )
        elif state == Qt.CheckState.PartiallyChecked:
            painter.drawLine(
                QPointF(box.left() + 3.2, box.center().y()), QPointF(box.right() - 3.2, box.center().y())
            )
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)

    def editorEvent(
        self, event: QEvent, model: QAbstractItemModel, option: QStyleOptionViewItem, index: Index
    ) -> bool:
        """Turn the box on a click into its cell or on the space bar."""
        cell = cast(HasCells, index.model()).cell(index.row(), index.column())
        if cell.check is None:
            return super().editorEvent(event, model, option, index)
        role = Qt.ItemDataRole.CheckStateRole
        if isinstance(event, QMouseEvent):
            left = event.button() == Qt.MouseButton.LeftButton
            hit = self._box_rect(option.rect).adjusted(-_PAD, -4, 8, 4).contains(event.position().toPoint())
            if event.type() == QEvent.Type.MouseButtonRelease and left and hit:
                return model.setData(index, None, role)
            return hit
        if isinstance(event, QKeyEvent) and event.key() in (Qt.Key.Key_Space, Qt.Key.Key_Select):
            return model.setData(index, None, role)
        return super().editorEvent(event, model, option, index)
