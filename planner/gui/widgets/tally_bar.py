"""The tally: the plan against today, one column per measure, always in sight."""

from __future__ import annotations

import math
from collections.abc import Sequence

from PySide6.QtCore import QPointF, QRect, QSize, Qt
from PySide6.QtGui import QAction, QFont, QGuiApplication, QKeySequence, QPainter, QPaintEvent, QPalette, QPen
from PySide6.QtWidgets import QSizePolicy, QWidget

from planner.base.text import _
from planner.gui.theme.cells import CellBar, TallyColumn
from planner.gui.theme.colours import Marks, marks_of
from planner.gui.theme.numbers import MINUS
from planner.gui.widgets.interval_mark import paint_interval, place

_PAD = 10


class TallyBar(QWidget):
    """Painted, because it changes with every tick."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._columns: tuple[TallyColumn, ...] = ()
        self._hint = ""
        self.setAccessibleName(_("Tally: the plan against today"))
        self.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        self.setBackgroundRole(QPalette.ColorRole.Base)
        self.setAutoFillBackground(True)
        self.setContextMenuPolicy(Qt.ContextMenuPolicy.ActionsContextMenu)
        copy = QAction(_("&Copy the tally"), self)
        copy.setShortcut(QKeySequence(QKeySequence.StandardKey.Copy))
        copy.setShortcutContext(Qt.ShortcutContext.WidgetShortcut)
        copy.triggered.connect(self.copy)
        self.addAction(copy)

    def columns(self) -> tuple[TallyColumn, ...]:
        """What is shown."""
        return self._columns

    def set_columns(self, columns: Sequence[TallyColumn], hint: str = "") -> None:
        """Show the measures; with none, ``hint`` says what to do to get them."""
        self._columns, self._hint = tuple(columns), hint
        words = "; ".join(column.words() for column in self._columns) or hint
        self.setAccessibleDescription(words)
        self.setToolTip(words.replace("; ", "\n"))
        self.update()

    def _line(self) -> int:
        return self.fontMetrics().height() + 1

    def sizeHint(self) -> QSize:
        return QSize(900, 4 * self._line() + 2 * 7 + 8)

    def minimumSizeHint(self) -> QSize:
        return QSize(560, self.sizeHint().height())

    def copy(self) -> None:
        """The tally on the clipboard, tab-separated."""
        head = "\t".join(("", _("Today"), _("Plan"), _("Change"), _("80 % interval")))
        lines = ["\t".join((c.title, c.today, c.plan, c.change, c.interval)) for c in self._columns]
        QGuiApplication.clipboard().setText("\n".join([head, *lines]).replace(MINUS, "-") + "\n")

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self)
        marks = marks_of(self.palette())
        painter.setPen(QPen(marks.grid, 1.0))
        painter.drawLine(0, 0, self.width(), 0)
        if self.hasFocus():
            painter.setPen(QPen(marks.selected, 2.0))
            painter.drawRect(self.rect().adjusted(1, 1, -1, -1))
        if not self._columns:
            painter.setPen(marks.faint)
            box = self.rect().adjusted(_PAD, 0, -_PAD, 0)
            painter.drawText(box, Qt.AlignmentFlag.AlignCenter | Qt.TextFlag.TextWordWrap, self._hint)
            return
        labels = ("", _("Today"), _("Plan"), _("Change"))
        first = max(painter.fontMetrics().horizontalAdvance(text) for text in labels) + 2 * _PAD
        painter.setPen(marks.faint)
        for row, text in enumerate(labels):
            self._text(painter, QRect(_PAD, 7 + row * self._line(), first - _PAD, self._line()), text)
        width = (self.width() - first - _PAD) // len(self._columns)
        for number, column in enumerate(self._columns):
            self._column(painter, first + number * width, width - _PAD, column, marks)

    @staticmethod
    def _text(painter: QPainter, box: QRect, text: str) -> None:
        elided = painter.fontMetrics().elidedText(text, Qt.TextElideMode.ElideRight, box.width())
        painter.drawText(box, Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter, elided)

    def _column(self, painter: QPainter, left: int, width: int, column: TallyColumn, marks: Marks) -> None:
        line = self._line()
        bold = QFont(self.font())
        bold.setBold(True)
        painter.setPen(marks.text)
        painter.setFont(bold)
        self._text(painter, QRect(left, 7, width, line), column.title)
        painter.setFont(self.font())
        for row, text in enumerate((column.today, column.plan)):
            self._text(painter, QRect(left, 7 + (row + 1) * line, width, line), text)
        change = QRect(left, 7 + 3 * line, width, line)
        painter.setFont(bold)
        self._text(painter, change, column.change)
        used = painter.fontMetrics().horizontalAdvance(column.change) + 8
        painter.setFont(self.font())
        if column.interval:
            painter.setPen(marks.faint)
            self._text(painter, change.adjusted(used, 0, 0, 0), f"({column.interval})")
            self._mark(painter, QRect(left, 7 + 4 * line + 1, min(width, 160), 8), column, marks)

    @staticmethod
    def _mark(painter: QPainter, rect: QRect, column: TallyColumn, marks: Marks) -> None:
        """Zero line, whisker and a point at the estimate: filled for gains, open for losses."""
        numbers = (column.value, column.low, column.high)
        if not all(math.isfinite(n) for n in numbers) or not any(numbers):
            return
        bottom, top = min(0.0, *numbers), max(0.0, *numbers)
        bar = CellBar(column.value, column.low, column.high, bottom, top)
        low, high, value, zero = (
            place(n, bar.bottom, bar.top, rect.adjusted(5, 0, -5, 0))
            for n in (bar.low, bar.high, bar.value, 0.0)
        )
        middle = rect.center().y() + 0.5
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setPen(QPen(marks.line, 1.0))
        painter.drawLine(QPointF(zero, rect.top()), QPointF(zero, rect.bottom() + 1.0))
        paint_interval(painter, low, high, middle, marks.line)
        loss = column.value < 0.0
        painter.setPen(QPen(marks.loss if loss else marks.gain, 1.6))
        painter.setBrush(marks.background if loss else marks.gain)
        painter.drawEllipse(QPointF(value, middle), 3.4, 3.4)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
