"""The best value found and the proven bound closing in on each other, over the seconds of a run."""

from __future__ import annotations

import math

from PySide6.QtCore import QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QPainter, QPaintEvent, QPen, QPolygonF
from PySide6.QtWidgets import QSizePolicy, QWidget

from planner.base.text import _
from planner.gui.theme import numbers
from planner.gui.theme.colours import Marks, marks_of

_LEFT, _RIGHT, _TOP, _BOTTOM = 12, 12, 26, 24


class GapPicture(QWidget):
    """Steps of value (from below) and bound (from above); the space between is the gap."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._times: list[float] = []
        self._values: list[float] = []
        self._bounds: list[float] = []
        self._today = math.nan
        self._running = False
        self.setAccessibleName(_("Best value found and proven bound"))
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Preferred)
        self.setMinimumHeight(120)

    def sizeHint(self) -> QSize:
        return QSize(420, 150)

    def begin(self) -> None:
        """A new run: forget the last one."""
        self._times, self._values, self._bounds, self._today = [], [], [], math.nan
        self._running = True
        self._tell()

    def end(self) -> None:
        """The run is over."""
        self._running = False
        self._tell()

    def add(self, seconds: float, value: float, bound: float, today: float = math.nan) -> None:
        """One more answer; NaN for what is not known yet."""
        self._times.append(seconds)
        self._values.append(value)
        self._bounds.append(bound)
        if math.isfinite(today):
            self._today = today
        self._tell()

    def points(self) -> tuple[tuple[float, float, float], ...]:
        """(seconds, value, bound) of every answer."""
        return tuple(zip(self._times, self._values, self._bounds, strict=True))

    def _tell(self) -> None:
        self.setAccessibleDescription(self.words())
        self.setToolTip(self.words())
        self.update()

    def words(self) -> str:
        """The present state in words."""
        if not self._times:
            return _("Running; no answer yet.") if self._running else _("No run yet.")
        value, bound = self._values[-1], self._bounds[-1]
        if not math.isfinite(value):
            return _("No assortment found yet.")
        text = numbers.number(value, numbers.sensible_decimals(value))
        if not math.isfinite(bound):
            return _("Best found {value}; no bound yet.").format(value=text)
        gap = (bound - value) / abs(value) if value else math.nan
        return _("Best found {value}, bound {bound}, gap {gap}.").format(
            value=text,
            bound=numbers.number(bound, numbers.sensible_decimals(bound)),
            gap=numbers.percent(max(gap, 0.0), 2),
        )

    def _scale(self) -> tuple[float, float]:
        """The vertical range: the last answers and today, with room, not the first loose bound."""
        values = [v for v in self._values if math.isfinite(v)]
        bounds = [b for b in self._bounds if math.isfinite(b)]
        if not values and not bounds:
            return 0.0, 1.0
        top = max([*values, min(bounds, default=-math.inf)])
        bottom = min(values[-1:] + ([self._today] if math.isfinite(self._today) else []), default=top)
        size = max(top - bottom, 1e-4 * max(abs(top), 1.0))
        highest = min(max([*bounds, top]), top + 1.0 * size)
        return bottom - 0.15 * size, highest + 0.15 * size

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        marks = marks_of(self.palette())
        painter.fillRect(self.rect(), marks.background)
        area = QRectF(self.rect().adjusted(_LEFT, _TOP, -_RIGHT, -_BOTTOM))
        painter.setPen(marks.faint)
        if not self._times:
            painter.drawText(self.rect(), Qt.AlignmentFlag.AlignCenter, self.words())
            return
        painter.setPen(QPen(marks.grid, 1.0))
        painter.drawRect(area)
        bottom, top = self._scale()
        end = 1.02 * max(self._times[-1], 0.1)
        low = self._steps(self._values, area, bottom, top, end)
        high = self._steps(self._bounds, area, bottom, top, end)
        painter.setClipRect(area.adjusted(-2, -2, 2, 2))
        if low.count() and high.count():
            painter.setPen(Qt.PenStyle.NoPen)
            painter.setBrush(marks.band)
            painter.drawPolygon(QPolygonF([*low.toList(), *reversed(high.toList())]))
        self._line(painter, low, QPen(marks.value, 2.2))
        self._line(painter, high, QPen(marks.bound, 2.0, Qt.PenStyle.DashLine))
        self._today_line(painter, area, bottom, top, marks)
        painter.setClipping(False)
        self._labels(painter, area, low, high, marks)
        self._legend(painter, area, self._times[-1], marks)

    def _steps(self, values: list[float], area: QRectF, bottom: float, top: float, end: float) -> QPolygonF:
        """A staircase in pixels, without the points that are not known."""
        points: list[QPointF] = []
        for seconds, value in zip(self._times, values, strict=True):
            if not math.isfinite(value):
                continue
            x = area.left() + seconds / end * area.width()
            y = area.bottom() - (value - bottom) / (top - bottom) * area.height()
            if points:
                points.append(QPointF(x, points[-1].y()))
            points.append(QPointF(x, max(y, area.top() - 40.0)))
        if points:
            points.append(QPointF(area.right(), points[-1].y()))
        return QPolygonF(points)

    @staticmethod
    def _line(painter: QPainter, points: QPolygonF, pen: QPen) -> None:
        painter.setPen(pen)
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.drawPolyline(points)

    def _labels(self, painter: QPainter, area: QRectF, low: QPolygonF, high: QPolygonF, marks: Marks) -> None:
        """The last value and the last bound in figures, kept apart when they nearly meet."""
        height = float(painter.fontMetrics().height())
        painter.setPen(marks.text)
        for points, values, above in ((high, self._bounds, True), (low, self._values, False)):
            if not points.count():
                continue
            known = [n for n in values if math.isfinite(n)]
            text = numbers.number(known[-1], numbers.sensible_decimals(known[-1]))
            y = (
                points.at(points.count() - 1).y() - height - 2.0
                if above
                else points.at(points.count() - 1).y() + 2.0
            )
            y = min(max(y, area.top()), area.bottom() - height)
            box = QRectF(area.left(), y, area.width() - 6.0, height)
            painter.drawText(box, Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter, text)

    def _today_line(self, painter: QPainter, area: QRectF, bottom: float, top: float, marks: Marks) -> None:
        if not math.isfinite(self._today):
            return
        y = area.bottom() - (self._today - bottom) / (top - bottom) * area.height()
        painter.setPen(QPen(marks.plain, 1.0, Qt.PenStyle.DotLine))
        painter.drawLine(QPointF(area.left(), y), QPointF(area.right(), y))
        painter.setPen(marks.faint)
        painter.drawText(QPointF(area.left() + 4.0, y - 3.0), _("today"))

    def _legend(self, painter: QPainter, area: QRectF, end: float, marks: Marks) -> None:
        metrics = painter.fontMetrics()
        entries = (
            (_("best found"), QPen(marks.value, 2.2)),
            (_("proven bound"), QPen(marks.bound, 2.0, Qt.PenStyle.DashLine)),
        )
        x, y = area.left(), float(_TOP) / 2.0 + 2.0
        for title, pen in entries:
            painter.setPen(pen)
            painter.drawLine(QPointF(x, y), QPointF(x + 24.0, y))
            painter.setPen(marks.text)
            painter.drawText(QPointF(x + 30.0, y + metrics.ascent() / 2.0 - 1.0), title)
            x += 48.0 + metrics.horizontalAdvance(title)
        painter.setPen(marks.faint)
        below = QRectF(area.left(), area.bottom() + 3.0, area.width(), float(_BOTTOM) - 4.0)
        painter.drawText(below, Qt.AlignmentFlag.AlignRight, numbers.duration(end))
        painter.drawText(below, Qt.AlignmentFlag.AlignLeft, numbers.duration(0.0))
