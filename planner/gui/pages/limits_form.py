"""The left side of the Best plan page: the goal and every limit, each change undoable."""

from __future__ import annotations

from dataclasses import replace

from PySide6.QtCore import QSignalBlocker
from PySide6.QtWidgets import (
    QComboBox,
    QDoubleSpinBox,
    QFormLayout,
    QHBoxLayout,
    QLabel,
    QPushButton,
    QSpinBox,
    QVBoxLayout,
    QWidget,
)

from planner.base.text import _
from planner.gui.bridge.review_bridge import ReviewBridge
from planner.gui.models.limit_rows import (
    LOCK_KINDS,
    cluster_rows,
    lock_key,
    lock_rows,
    lock_words,
    with_cluster_value,
)
from planner.gui.models.table_model import Look, TableModel
from planner.gui.widgets.lock_dialog import LockDialog
from planner.gui.widgets.table_view import TableView
from planner.gui.widgets.words import heading
from planner.plan.limits import ItemLock

# Below the fewest changes stands "no limit".
_FREE, _MOST = -1, 9_999


class LimitsForm(QWidget):
    """Reads and writes ``review.limits``."""

    def __init__(self, bridge: ReviewBridge) -> None:
        super().__init__()
        self._bridge = bridge
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 8, 0)
        column.addLayout(self._form())
        column.addWidget(heading(_("Limits per cluster"), 1.0))
        self._clusters = TableModel(
            {key: Look(editable=True) for key in ("space", "min_items", "max_items")}, identity="cluster"
        )
        self._clusters.typed.connect(self._typed)
        clusters = TableView(self._clusters, _("Limits per cluster"))
        clusters.fit_rows(8)
        column.addWidget(clusters)
        hint = QLabel(_("Double-click or F2 types a limit; empty: none. The stores' own space always binds."))
        hint.setWordWrap(True)
        column.addWidget(hint)
        column.addWidget(heading(_("Items kept, never listed or left as today"), 1.0))
        self._locks = TableModel(identity="key", shown=("rule", "item", "cluster", "reason", "until"))
        self._lock_view = TableView(self._locks, _("Locks"))
        column.addWidget(self._lock_view, 1)
        row = QHBoxLayout()
        add = QPushButton(_("&Add a lock…"))
        add.setAccessibleName(_("Add a lock"))
        add.clicked.connect(self.add_lock)
        remove = QPushButton(_("Take the loc&k off"))
        remove.setAccessibleName(_("Take the selected locks off"))
        remove.clicked.connect(self._remove_locks)
        row.addWidget(add)
        row.addWidget(remove)
        row.addStretch(1)
        column.addLayout(row)

    def _form(self) -> QFormLayout:
        self._goal = QComboBox()
        self._goal.setAccessibleName(_("Goal"))
        for key, title in (
            ("margin", _("Category margin")),
            ("sales", _("Sales without VAT")),
            ("units", _("Units")),
        ):
            self._goal.addItem(title, key)
        self._goal.activated.connect(lambda _i: self._set(goal=str(self._goal.currentData())))
        self._changes = QSpinBox()
        self._changes.setAccessibleName(_("Changes at most"))
        self._changes.setRange(_FREE, _MOST)
        self._changes.setSpecialValueText(_("no limit"))
        self._changes.setKeyboardTracking(False)
        self._changes.setToolTip(_("One change: one item in one cluster."))
        self._changes.valueChanged.connect(self._changes_typed)
        self._listing, self._delisting = QDoubleSpinBox(), QDoubleSpinBox()
        for box, name in (
            (self._listing, _("Cost of a listing, money a week")),
            (self._delisting, _("Cost of a delisting, money a week")),
        ):
            box.setAccessibleName(name)
            box.setRange(0.0, 1e6)
            box.setDecimals(2)
            box.setKeyboardTracking(False)
            box.setSuffix(" " + _("a week"))
        self._listing.valueChanged.connect(lambda cost: self._set(listing_cost=float(cost)))
        self._delisting.valueChanged.connect(lambda cost: self._set(delisting_cost=float(cost)))
        self._seconds = QSpinBox()
        self._seconds.setAccessibleName(_("Time allowed"))
        self._seconds.setRange(1, 3600)
        self._seconds.setValue(20)
        self._seconds.setSuffix(" " + _("s"))
        form = QFormLayout()
        form.addRow(_("&Goal"), self._goal)
        form.addRow(_("Cha&nges at most"), self._changes)
        form.addRow(_("Cost of a li&sting"), self._listing)
        form.addRow(_("Cost of a &delisting"), self._delisting)
        form.addRow(_("T&ime allowed"), self._seconds)
        return form

    # -- doing -----------------------------------------------------------------------------

    @property
    def seconds(self) -> float:
        """Time allowed for a run."""
        return float(self._seconds.value())

    def _set(self, **values: object) -> None:
        limits = replace(self._bridge.review.limits, **values)  # type: ignore[arg-type]
        if limits != self._bridge.review.limits:
            self._bridge.do(lambda: self._bridge.review.set_limits(limits))

    def _changes_typed(self, count: int) -> None:
        self.set_changes(None if count == _FREE else count)

    def set_changes(self, count: int | None) -> None:
        """At most so many changes; None: no limit."""
        self._set(max_changes=count)

    def _typed(self, cluster: str, key: str, text: str) -> None:
        review = self._bridge.review
        self._bridge.do(lambda: review.set_limits(with_cluster_value(review.limits, cluster, key, text)))

    def add_lock(self) -> None:
        """Ask for a lock and set it."""
        loaded = self._bridge.review.loaded
        if loaded is None:
            return
        words = lock_words()
        dialog = LockDialog(
            [(item.code, item.description) for item in loaded.catalogue.items],
            loaded.catalogue.clusters,
            [(kind, words[kind]) for kind in LOCK_KINDS],
            self,
        )
        if dialog.exec():
            item, kind, cluster, until, reason = dialog.answer()
            self._bridge.set_lock(ItemLock(item, kind, cluster, reason, until))

    def _remove_locks(self) -> None:
        rows = {index.row() for index in self._lock_view.selectionModel().selectedIndexes()}
        gone = {self._locks.identity_of(row) for row in rows}
        limits = self._bridge.review.limits
        kept = tuple(lock for lock in limits.locks if lock_key(lock) not in gone)
        if len(kept) != len(limits.locks):
            self._bridge.do(lambda: self._bridge.review.set_limits(replace(limits, locks=kept)))

    # -- showing ---------------------------------------------------------------------------

    def look(self) -> None:
        """Read the limits again."""
        review = self._bridge.review
        if review.loaded is None:
            return
        limits = review.limits
        boxes = (self._goal, self._changes, self._listing, self._delisting)
        blockers = [QSignalBlocker(box) for box in boxes]
        self._goal.setCurrentIndex(self._goal.findData(limits.goal))
        self._changes.setValue(_FREE if limits.max_changes is None else limits.max_changes)
        self._listing.setValue(limits.listing_cost)
        self._delisting.setValue(limits.delisting_cost)
        for blocker in blockers:
            blocker.unblock()
        catalogue = review.loaded.catalogue
        self._clusters.set_table(cluster_rows(catalogue, limits, review.loaded.base.space_known))
        self._locks.set_table(lock_rows(catalogue, limits))
