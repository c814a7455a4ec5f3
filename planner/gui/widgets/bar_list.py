"""A list with one painted bar per row: who gets the sales, with intervals."""

from __future__ import annotations

import math
from collections.abc import Sequence

from PySide6.QtCore import (
    QAbstractListModel,
    QMimeData,
    QModelIndex,
    QPersistentModelIndex,
    QRect,
    QSize,
    Qt,
    Signal,
)
from PySide6.QtGui import QAction, QColor, QFont, QGuiApplication, QKeySequence, QPainter
from PySide6.QtWidgets import (
    QAbstractItemView,
    QFrame,
    QListView,
    QStyle,
    QStyledItemDelegate,
    QStyleOptionViewItem,
    QWidget,
)

from planner.base.text import _
from planner.gui.theme.cells import BarRow, CellBar
from planner.gui.theme.colours import Marks, marks_of, mixed
from planner.gui.theme.numbers import MINUS
from planner.gui.widgets.interval_mark import paint_bar

Index = QModelIndex | QPersistentModelIndex
_NOWHERE = QModelIndex()
_RowRole = Qt.ItemDataRole.UserRole + 1
_PAD = 8


class _BarRows(QAbstractListModel):
    """Rows and the scale they share."""

    def __init__(self) -> None:
        super().__init__()
        self.rows: tuple[BarRow, ...] = ()
        self.scales: list[tuple[float, float]] = []
        self.longest = ""

    def set_rows(self, rows: tuple[BarRow, ...]) -> None:
        same = len(rows) == len(self.rows)
        if not same:
            self.beginResetModel()
        self.rows = rows
        self.scales = _scales(rows)
        self.longest = max((row.text for row in rows), key=len, default="")
        if not same:
            self.endResetModel()
        elif rows:
            self.dataChanged.emit(self.index(0), self.index(len(rows) - 1))

    def rowCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else len(self.rows)

    def data(self, index: Index, role: int = Qt.ItemDataRole.DisplayRole) -> object:
        if not index.isValid():
            return None
        row = self.rows[index.row()]
        if role == Qt.ItemDataRole.DisplayRole:
            return row.label
        if role in (Qt.ItemDataRole.ToolTipRole, Qt.ItemDataRole.AccessibleTextRole):
            return row.words()
        if role == _RowRole:
            return row
        return None

    def flags(self, index: Index) -> Qt.ItemFlag:
        if index.isValid() and self.rows[index.row()].kind == "heading":
            return Qt.ItemFlag.ItemIsEnabled
        return Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable


def _scales(rows: tuple[BarRow, ...]) -> list[tuple[float, float]]:
    """(bottom, top) for every row: one scale from heading to heading, containing zero."""
    starts = [row for row, entry in enumerate(rows) if entry.kind == "heading" or row == 0]
    scales: list[tuple[float, float]] = []
    for start, end in zip(starts, [*starts, len(rows)][1:], strict=True):
        numbers = [n for row in rows[start:end] for n in (row.value, row.low, row.high) if math.isfinite(n)]
        bottom, top = min([*numbers, 0.0]), max([*numbers, 0.0])
        scales += [(bottom, top if top > bottom else bottom + 1.0)] * (end - start)
    return scales


class _BarPainter(QStyledItemDelegate):
    """Label, bar with whisker, value."""

    def sizeHint(self, option: QStyleOptionViewItem, index: Index) -> QSize:
        return QSize(220, option.fontMetrics.height() + 9)

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: Index) -> None:
        model = index.model()
        assert isinstance(model, _BarRows)
        row = model.rows[index.row()]
        marks = marks_of(option.palette)
        selected = bool(option.state & QStyle.StateFlag.State_Selected)
        colour = marks.selected_text if selected else marks.text
        rect: QRect = option.rect
        painter.save()
        if selected:
            painter.fillRect(rect, marks.selected)
        font = QFont(option.font)
        font.setBold(row.kind in ("heading", "total", "leaves"))
        painter.setFont(font)
        if row.kind == "heading":
            painter.fillRect(rect, marks.band)
            inside = rect.adjusted(_PAD, 0, -_PAD, 0)
            self._text(painter, inside, row.label, marks.text)
            painter.setFont(option.font)
            self._text(painter, inside, row.note, marks.faint, right=True)
        else:
            self._row(painter, rect, index.row(), model, marks, colour, selected)
        if option.state & QStyle.StateFlag.State_HasFocus:
            painter.setPen(colour)
            painter.setBrush(Qt.BrushStyle.NoBrush)
            painter.drawRect(rect.adjusted(0, 0, -1, -1))
        painter.restore()

    @staticmethod
    def _text(painter: QPainter, rect: QRect, text: str, colour: QColor, right: bool = False) -> None:
        painter.setPen(colour)
        side = Qt.AlignmentFlag.AlignRight if right else Qt.AlignmentFlag.AlignLeft
        elided = painter.fontMetrics().elidedText(text, Qt.TextElideMode.ElideRight, rect.width())
        painter.drawText(rect, side | Qt.AlignmentFlag.AlignVCenter, elided)

    def _row(
        self,
        painter: QPainter,
        rect: QRect,
        number_of_row: int,
        model: _BarRows,
        marks: Marks,
        colour: QColor,
        selected: bool,
    ) -> None:
        row, scale = model.rows[number_of_row], model.scales[number_of_row]
        widest = painter.fontMetrics().horizontalAdvance(model.longest) + 8
        number = QRect(rect.right() - widest - _PAD, rect.top(), widest, rect.height())
        label = QRect(rect.left() + _PAD, rect.top(), int((rect.width() - widest) * 0.6), rect.height())
        bars = QRect(label.right() + _PAD, rect.top() + 4, number.left() - label.right() - 2 * _PAD, 1)
        bars.setHeight(rect.height() - 8)
        self._text(painter, label, row.label, colour)
        metrics = painter.fontMetrics()
        used = metrics.horizontalAdvance(row.label) + _PAD
        if row.note and used + metrics.horizontalAdvance(row.note) <= label.width():
            self._text(painter, label.adjusted(used, 0, 0, 0), row.note, colour if selected else marks.faint)
        self._text(painter, number, row.text, colour, right=True)
        if not math.isfinite(row.value) or bars.width() < 20:
            return
        own = {"own": marks.own, "leaves": marks.leaves, "total": marks.plain}
        fill = mixed(marks.selected_text, marks.selected, 0.55) if selected else own.get(row.kind)
        pattern = Qt.BrushStyle.BDiagPattern if row.kind == "leaves" else Qt.BrushStyle.SolidPattern
        bar = CellBar(row.value, row.low, row.high, *scale)
        painter.setClipRect(bars.adjusted(-6, -4, 6, 4))
        paint_bar(painter, bars, bar, marks, colour if selected else marks.line, fill, pattern)
        painter.setClipping(False)


class BarList(QListView):
    """``chosen(identity)``: the user moved to a row that has one."""

    chosen = Signal(str)

    def __init__(self, name: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._rows = _BarRows()
        self.setModel(self._rows)
        self.setAccessibleName(name)
        self.setItemDelegate(_BarPainter(self))
        self.setUniformItemSizes(True)
        self.setFrameShape(QFrame.Shape.NoFrame)
        self.setVerticalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setContextMenuPolicy(Qt.ContextMenuPolicy.ActionsContextMenu)
        copy = QAction(_("&Copy the list"), self)
        copy.setShortcut(QKeySequence(QKeySequence.StandardKey.Copy))
        copy.setShortcutContext(Qt.ShortcutContext.WidgetShortcut)
        copy.triggered.connect(self.copy)
        self.addAction(copy)

    def rows(self) -> tuple[BarRow, ...]:
        """What is shown."""
        return self._rows.rows

    def set_rows(self, rows: Sequence[BarRow]) -> None:
        """Show other rows; rows under one heading share a scale that holds values and intervals."""
        self._rows.set_rows(tuple(rows))

    def currentChanged(self, current: Index, previous: Index) -> None:
        super().currentChanged(current, previous)
        if current.isValid() and self._rows.rows[current.row()].identity:
            self.chosen.emit(self._rows.rows[current.row()].identity)

    def copy(self) -> None:
        """All rows on the clipboard, tab-separated."""
        lines = [
            "\t".join((row.label, row.note, row.text, row.interval)).replace(MINUS, "-")
            for row in self._rows.rows
        ]
        data = QMimeData()
        data.setText("\n".join(lines) + "\n")
        QGuiApplication.clipboard().setMimeData(data)
