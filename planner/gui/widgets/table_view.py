"""A table as every page shows it: sorting, copying, one painter for all cells."""

from __future__ import annotations

from collections.abc import Callable
from typing import Protocol, cast

from PySide6.QtCore import (
    QAbstractItemModel,
    QItemSelectionModel,
    QModelIndex,
    QPersistentModelIndex,
    QPoint,
    Qt,
    Signal,
)
from PySide6.QtGui import QAction, QGuiApplication, QKeyEvent, QKeySequence
from PySide6.QtWidgets import QAbstractItemView, QFrame, QHeaderView, QMenu, QTableView, QWidget

from planner.base.text import _
from planner.gui.widgets.cell_delegate import CellDelegate

Index = QModelIndex | QPersistentModelIndex
_SHORT = 40


class HasRows(Protocol):
    """What the view asks of its model beyond Qt's own questions."""

    def identity_of(self, row: int) -> str: ...

    def row_of(self, identity: str) -> int: ...

    def heading_rows(self) -> list[int]: ...

    def column_width(self, position: int, measure: Callable[[str], int]) -> int: ...

    def titles_with_contents(self) -> tuple[tuple[str, bool], ...]: ...


class TableView(QTableView):
    """``chosen(identity)`` is sent when the current row changes."""

    chosen = Signal(str)

    def __init__(self, model: QAbstractItemModel, name: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setAccessibleName(name)
        self.setModel(model)
        self._kept = ""
        self._widths_for: tuple[tuple[str, bool], ...] = ()
        self._spanned: list[int] = []
        self._most_rows = 0
        self._set_up()
        self._copy_action = QAction(_("&Copy"), self)
        self._copy_action.setShortcut(QKeySequence(QKeySequence.StandardKey.Copy))
        self._copy_action.setShortcutContext(Qt.ShortcutContext.WidgetShortcut)
        self._copy_action.triggered.connect(self.copy)
        self.addAction(self._copy_action)
        self._copy_all_action = QAction(_("Copy the &whole table"), self)
        self._copy_all_action.triggered.connect(self.copy_all)
        model.modelAboutToBeReset.connect(self._remember)
        model.modelReset.connect(self._restore)
        model.layoutChanged.connect(self._span)
        # A short table may also grow wider with every change; measuring a long one would be felt.
        model.dataChanged.connect(lambda _first, _last: self._set_widths(model.rowCount() <= _SHORT))
        self._restore()

    def _set_up(self) -> None:
        self.setItemDelegate(CellDelegate(self))
        self.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        self.setSelectionMode(QAbstractItemView.SelectionMode.ExtendedSelection)
        self.setFrameShape(QFrame.Shape.NoFrame)
        self.setShowGrid(False)
        self.setWordWrap(False)
        self.setTabKeyNavigation(False)
        self.setHorizontalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.setVerticalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.setContextMenuPolicy(Qt.ContextMenuPolicy.CustomContextMenu)
        self.customContextMenuRequested.connect(self._menu)
        rows = self.verticalHeader()
        rows.hide()
        rows.setSectionResizeMode(QHeaderView.ResizeMode.Fixed)
        rows.setDefaultSectionSize(self.fontMetrics().height() + 9)
        header = self.horizontalHeader()
        header.setHighlightSections(False)
        header.setMinimumSectionSize(36)
        header.setSectionsMovable(True)
        header.setDefaultAlignment(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter)
        self.setSortingEnabled(True)
        header.setSortIndicator(-1, Qt.SortOrder.AscendingOrder)
        header.setSortIndicatorClearable(True)

    # -- rows that survive a reset -----------------------------------------------------------

    def _rows(self) -> HasRows:
        return cast(HasRows, self.model())

    def current_identity(self) -> str:
        """Identity of the current row; empty for none."""
        return self._rows().identity_of(self.currentIndex().row())

    def choose(self, identity: str) -> None:
        """Make the row of ``identity`` current, if it is shown."""
        row = self._rows().row_of(identity)
        if row >= 0:
            index = self.model().index(row, max(self.currentIndex().column(), 0))
            # Said in full, because the view itself would heed a Ctrl or Shift that happens to be held.
            flags = QItemSelectionModel.SelectionFlag
            self.selectionModel().setCurrentIndex(index, flags.ClearAndSelect | flags.Rows)
            self.scrollTo(index)

    def _remember(self) -> None:
        self._kept = self.current_identity()

    def _restore(self) -> None:
        self._span()
        self._set_widths(grow=True)
        self._fit_height()
        if self._kept:
            self.choose(self._kept)

    def _span(self) -> None:
        columns = self.model().columnCount()
        if not self._spanned and not self._rows().heading_rows():
            return
        self.clearSpans()
        self._spanned = self._rows().heading_rows() if columns > 1 else []
        for row in self._spanned:
            self.setSpan(row, 0, 1, columns)

    def _set_widths(self, grow: bool = False) -> None:
        """Widths from titles and texts, for columns that are new or have just got contents.

        grow: also for those whose texts have become longer.
        """
        model = self.model()
        measure = self.fontMetrics().horizontalAdvance
        titles = self._rows().titles_with_contents()
        if not model.rowCount():
            return
        for column, title in enumerate(titles):
            new = title not in self._widths_for
            if new or grow:
                width = self._rows().column_width(column, measure)
                self.setColumnWidth(column, width if new else max(width, self.columnWidth(column)))
        self._widths_for = titles

    def fit_rows(self, most: int) -> None:
        """Be no higher than the rows, and no higher than ``most`` of them."""
        self._most_rows = most
        self._fit_height()

    def _fit_height(self) -> None:
        if self._most_rows:
            rows = min(max(self.model().rowCount(), 1), self._most_rows)
            head = self.horizontalHeader().sizeHint().height()
            bar = self.horizontalScrollBar().sizeHint().height()
            self.setFixedHeight(head + rows * self.verticalHeader().defaultSectionSize() + bar + 2)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """The space bar turns the box of the current row, whichever column is current."""
        row = self.currentIndex().row()
        if event.key() == Qt.Key.Key_Space and row >= 0:
            for column in range(self.model().columnCount()):
                index = self.model().index(row, column)
                if self.model().flags(index) & Qt.ItemFlag.ItemIsUserCheckable:
                    self.model().setData(index, None, Qt.ItemDataRole.CheckStateRole)
                    return
        super().keyPressEvent(event)

    def currentChanged(self, current: Index, previous: Index) -> None:
        super().currentChanged(current, previous)
        if current.row() != previous.row():
            self.chosen.emit(self._rows().identity_of(current.row()))

    # -- copying -------------------------------------------------------------------------------

    def copy(self) -> None:
        """Put the selected rows on the clipboard, as TSV and HTML."""
        indexes = self.selectionModel().selectedIndexes()
        QGuiApplication.clipboard().setMimeData(self.model().mimeData(indexes))

    def copy_all(self) -> None:
        """Put all shown rows on the clipboard."""
        QGuiApplication.clipboard().setMimeData(self.model().mimeData([]))

    def _menu(self, where: QPoint) -> None:
        menu = QMenu(self)
        menu.setAccessibleName(_("Table menu"))
        menu.addActions([self._copy_action, self._copy_all_action, *self.extra_actions()])
        menu.exec(self.viewport().mapToGlobal(where))
        menu.deleteLater()

    def extra_actions(self) -> list[QAction]:
        """Further actions of the context menu: those a page has added to the view."""
        return [a for a in self.actions() if a is not self._copy_action]
