"""Bench: every item with a box, and beside it where the sales go."""

from __future__ import annotations

from functools import partial

import numpy as np
from PySide6.QtCore import QByteArray, Qt, QTimer
from PySide6.QtGui import QAction, QKeySequence, QShortcut
from PySide6.QtWidgets import (
    QComboBox,
    QHBoxLayout,
    QLabel,
    QLineEdit,
    QMenu,
    QSplitter,
    QToolButton,
    QVBoxLayout,
    QWidget,
)

from planner.base.text import _
from planner.gui.bridge.review_bridge import ReviewBridge
from planner.gui.models.receivers import bar_rows, caption
from planner.gui.models.table_model import Look, TableModel
from planner.gui.pages.page import Page
from planner.gui.widgets.bar_list import BarList
from planner.gui.widgets.table_view import TableView
from planner.gui.widgets.words import Words, heading
from planner.tables.table import Table

_SHOWN = (
    "plan",
    "description",
    "today",
    "lock",
    "stays",
    "margin_lost",
    "price",
    "margin",
    "rate_of_sale",
    "rate_on_promotion",
    "space",
    "units",
    "item",
    "brand",
    "supplier",
)


class BenchPage(Page):
    """Ticking an item changes the plan, the tally and the bars at once."""

    watched = frozenset({"data", "fit", "states", "limits"})

    def __init__(self, bridge: ReviewBridge) -> None:
        super().__init__(
            bridge,
            _("Nothing on the bench yet"),
            _("Open sales on the Sales page: every item then stands here with a box to tick."),
        )
        self._model = TableModel(_looks(), identity="item", group="segment", shown=_SHOWN, strong="changed")
        self._view = TableView(self._model, _("Items by segment"))
        self._model.checked.connect(self.toggle)
        self._view.chosen.connect(self._choose)
        # Moving through the rows with the keys held down asks for one answer, not for fifty.
        self._later = QTimer(self)
        self._later.setSingleShot(True)
        self._later.setInterval(30)
        self._later.timeout.connect(self._show_receivers)
        self._item = ""
        self._split = QSplitter(Qt.Orientation.Horizontal)
        self._split.addWidget(self._left())
        self._split.addWidget(self._right())
        self._split.setChildrenCollapsible(False)
        self._split.setStretchFactor(0, 3)
        self._split.setStretchFactor(1, 2)
        self._split.setSizes([760, 420])
        self.content_column(8).addWidget(self._split)
        find = QShortcut(QKeySequence(QKeySequence.StandardKey.Find), self.content)
        find.activated.connect(self._filter.setFocus)

    # -- building --------------------------------------------------------------------------

    def _left(self) -> QWidget:
        left = QWidget()
        column = QVBoxLayout(left)
        column.setContentsMargins(0, 0, 4, 0)
        row = QHBoxLayout()
        self._filter = QLineEdit()
        self._filter.setAccessibleName(_("Find items"))
        self._filter.setPlaceholderText(_("Find items (Ctrl+F)"))
        self._filter.setClearButtonEnabled(True)
        self._filter.textChanged.connect(self._model.filter)
        label = QLabel(_("C&luster"))
        self._cluster = QComboBox()
        self._cluster.setAccessibleName(_("Cluster shown and changed"))
        self._cluster.currentIndexChanged.connect(lambda _i: self.look(self.watched))
        label.setBuddy(self._cluster)
        self._only = QToolButton()
        self._only.setText(_("&Only changes"))
        self._only.setCheckable(True)
        self._only.setAccessibleName(_("Show only items that differ from today"))
        self._only.toggled.connect(self._only_toggled)
        row.addWidget(self._filter, 1)
        row.addWidget(label)
        row.addWidget(self._cluster)
        row.addWidget(self._only)
        row.addWidget(self._lock_button())
        column.addLayout(row)
        column.addWidget(self._view, 1)
        self._note = QLabel()
        self._note.setAccessibleName(_("Notes on the bench"))
        self._note.setWordWrap(True)
        column.addWidget(self._note)
        return left

    def _lock_button(self) -> QToolButton:
        button = QToolButton()
        button.setText(_("Loc&k"))
        button.setAccessibleName(_("Lock the selected items"))
        button.setPopupMode(QToolButton.ToolButtonPopupMode.InstantPopup)
        menu = QMenu(button)
        menu.setAccessibleName(_("Locks"))
        choices = (
            ("keep", _("&Keep on the list")),
            ("never", _("&Never list")),
            ("as today", _("Leave as &today")),
            ("", _("Take the lock &off")),
        )
        for kind, title in choices:
            action = QAction(title, self)
            action.triggered.connect(lambda _checked=False, kind=kind: self._lock(kind))
            menu.addAction(action)
            self._view.addAction(action)
        button.setMenu(menu)
        return button

    def _right(self) -> QWidget:
        right = QWidget()
        column = QVBoxLayout(right)
        column.setContentsMargins(6, 0, 0, 0)
        column.addWidget(heading(_("Where sales go"), 1.1))
        row = QHBoxLayout()
        self._scope = QComboBox()
        self._scope.setAccessibleName(_("What changes"))
        self._scope.addItem(_("Selected item"), "item")
        self._scope.addItem(_("All changes of the plan"), "plan")
        self._measure = QComboBox()
        self._measure.setAccessibleName(_("Measure"))
        for key, title in (("units", _("Units")), ("content", _("Content")), ("money", _("Money"))):
            self._measure.addItem(title, key)
        for box in (self._scope, self._measure):
            box.currentIndexChanged.connect(lambda _i: self._show_receivers())
            row.addWidget(box, 2 if box is self._scope else 1)
        column.addLayout(row)
        self._caption = Words(_("Where sales go, in words"))
        column.addWidget(self._caption)
        self._bars = BarList(_("Receivers"))
        self._bars.chosen.connect(self._view.choose)
        column.addWidget(self._bars, 1)
        return right

    # -- doing -----------------------------------------------------------------------------

    def toggle(self, item: str) -> None:
        """Turn an item's box, in the chosen cluster or in all."""
        self.bridge.do(lambda: self.bridge.review.toggle(item, self._chosen_cluster()))

    def show_all_changes(self) -> None:
        """Where the sales of the whole plan go, instead of one item's."""
        self._scope.setCurrentIndex(self._scope.findData("plan"))

    def _lock(self, kind: str) -> None:
        rows = {index.row() for index in self._view.selectionModel().selectedIndexes()}
        items = [code for code in (self._model.identity_of(row) for row in sorted(rows)) if code]
        review, cluster = self.bridge.review, self._chosen_cluster()
        for item in items:
            self.bridge.do(partial(review.set_lock, item, kind or None, cluster))

    def _chosen_cluster(self) -> str:
        return str(self._cluster.currentData() or "")

    def _choose(self, item: str) -> None:
        if item:
            self._item = item
            self._later.start()

    def _only_toggled(self, on: bool) -> None:
        # A pressed button alone is hardly seen on dark palettes.
        self._only.setText(_("✓ &Only changes") if on else _("&Only changes"))
        self._mask()

    def _mask(self) -> None:
        table = self._model.table()
        if not self._only.isChecked() or not table.columns:
            self._model.set_mask(None)
        else:
            self._model.set_mask(np.array([bool(v) for v in table.column("changed").values]))

    # -- showing ---------------------------------------------------------------------------

    def ready(self) -> bool:
        return self.bridge.review.loaded is not None

    def look(self, kinds: frozenset[str]) -> None:
        review = self.bridge.review
        if review.loaded is None:
            return
        if "data" in kinds:
            self._fill_clusters(review.loaded.catalogue.clusters)
        table = review.table("bench", cluster=self._chosen_cluster() or None)
        self._model.set_table(table)
        self._note.setText("  ".join(table.notes))
        if self._only.isChecked():
            self._mask()
        if not self._view.current_identity() and self._model.rowCount() > 1:
            self._view.choose(self._model.identity_of(1))
        self._later.stop()
        self._show_receivers()

    def _fill_clusters(self, clusters: tuple[str, ...]) -> None:
        kept = self._chosen_cluster()
        self._cluster.blockSignals(True)
        self._cluster.clear()
        self._cluster.addItem(_("All clusters"), "")
        for name in clusters:
            self._cluster.addItem(name or _("all stores"), name)
        self._cluster.setCurrentIndex(max(self._cluster.findData(kept), 0))
        self._cluster.blockSignals(False)

    def _show_receivers(self) -> None:
        review = self.bridge.review
        if review.fitted is None:
            self._bars.set_rows(())
            self._caption.set_sentences(
                (_("Fit the share model on the Evidence page to see where sales go."),)
            )
            return
        cluster = self._chosen_cluster() or None
        measure = str(self._measure.currentData())
        item = self._item if self._scope.currentData() == "item" else None
        table = review.table("receivers", item=item, measure=measure, cluster=cluster)
        self._bars.set_rows(bar_rows(table))
        self._caption.set_sentences((self._caption_for(table, item), *table.notes[1:]))

    def _caption_for(self, table: Table, code: str | None) -> str:
        loaded = self.bridge.review.loaded
        if code is None or loaded is None:
            return caption(table, "", True)
        j = loaded.catalogue.item_index()[code]
        return caption(
            table, loaded.catalogue.items[j].description or code, bool(loaded.base.today[:, j].any())
        )

    def kept_state(self) -> QByteArray:
        return self._split.saveState()

    def restore(self, state: QByteArray) -> None:
        self._split.restoreState(state)


def _looks() -> dict[str, Look]:
    interval = _("Bar: the estimate; line: its 80 % interval.")
    return {
        "plan": Look(
            title=_("Plan"), check="in_plan", tip=_("Ticked: on the list. Space or a click changes it.")
        ),
        "description": Look(title=_("Item")),
        "item": Look(title=_("Code")),
        "today": Look(title=_("Stores today"), tip=_("Part of the stores that list the item today.")),
        "stays": Look(
            title=_("Stays if delisted"), bar=True, low="stays_low", high="stays_high", tip=interval
        ),
        "margin_lost": Look(
            title=_("Margin lost if delisted"),
            bar=True,
            low="margin_lost_low",
            high="margin_lost_high",
            tip=interval,
        ),
    }
