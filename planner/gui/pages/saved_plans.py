"""Saved plans: kept under names, side by side, with the reason beside each decision."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import QByteArray, Qt, Signal
from PySide6.QtWidgets import (
    QComboBox,
    QHBoxLayout,
    QLabel,
    QPushButton,
    QSplitter,
    QTabWidget,
    QVBoxLayout,
    QWidget,
)

from planner.base.text import _
from planner.gui.bridge.review_bridge import Proposal, ReviewBridge
from planner.gui.models.plan_rows import key_parts, only_changes, plans_differ, plans_in_words
from planner.gui.models.table_model import Look, TableModel
from planner.gui.pages.page import Page
from planner.gui.widgets.table_view import TableView
from planner.gui.widgets.words import Words, heading
from planner.plan.plans import NamedPlan
from planner.tables.names import cluster_name
from planner.tables.plan import item_list_table, plans_compared_table

_PLANS = (
    "name",
    "items",
    "changes",
    "margin",
    "margin_change",
    "sales",
    "sales_change",
    "units",
    "units_change",
    "goal",
    "status",
    "gap",
    "created",
    "notes",
)
_ITEMS = (
    "action",
    "reason",
    "description",
    "cluster",
    "segment",
    "today",
    "plan",
    "units_today",
    "units",
    "item",
)


class SavedPlansPage(Page):
    """``keep_wanted``, ``export_wanted(kind)``: asked by the buttons, answered by the window."""

    watched = frozenset({"data", "fit", "states", "limits", "plans"})
    keep_wanted = Signal()
    export_wanted = Signal(str)

    def __init__(self, bridge: ReviewBridge) -> None:
        super().__init__(
            bridge,
            _("No plans yet"),
            _("Fit the share model on the Evidence page; then plans can be made, kept and compared here."),
        )
        # A tally takes some 20 ms; plans do not change, so each is valued once per fit.
        self._tallies: dict[bytes, Any] = {}
        column = self.content_column(8)
        column.addLayout(self._top())
        self._plans = TableModel(_looks(), identity="name", shown=_PLANS)
        self._view = TableView(self._plans, _("Plans side by side"))
        self._view.chosen.connect(self._choose)
        self._note = Words(_("Notes on the plans"))
        upper = QWidget()
        above = QVBoxLayout(upper)
        above.setContentsMargins(0, 0, 0, 0)
        above.addWidget(self._view, 1)
        above.addWidget(self._note)
        self._split = QSplitter(Qt.Orientation.Vertical)
        self._split.addWidget(upper)
        self._split.addWidget(self._tabs())
        self._split.setChildrenCollapsible(False)
        self._split.setSizes([220, 380])
        column.addWidget(self._split, 1)
        bridge.job_changed.connect(self._enable)

    # -- building --------------------------------------------------------------------------

    def _top(self) -> QHBoxLayout:
        row = QHBoxLayout()
        row.addWidget(heading(_("Plans side by side")))
        row.addStretch(1)

        def button(text: str, name: str) -> QPushButton:
            made = QPushButton(text)
            made.setAccessibleName(name)
            row.addWidget(made)
            return made

        self._keep = button(_("&Keep the present plan…"), _("Keep the present plan under a name"))
        self._keep.clicked.connect(self.keep_wanted)
        self._drop = button(_("&Drop"), _("Drop the chosen plan"))
        self._drop.clicked.connect(self._drop_chosen)
        self._take = button(_("&Take into the plan"), _("Take the chosen plan into the present plan"))
        self._take.clicked.connect(self.bridge.take)
        self._workbook = button(_("Export the &workbook…"), _("Export the chosen plan as a workbook"))
        self._workbook.clicked.connect(lambda: self.export_wanted.emit("workbook"))
        self._stores = button(_("&Stores list…"), _("Export the list for the stores"))
        self._stores.clicked.connect(lambda: self.export_wanted.emit("stores list"))
        return row

    def _tabs(self) -> QTabWidget:
        tabs = QTabWidget()
        tabs.setAccessibleName(_("Parts of the chosen plan"))
        tabs.setDocumentMode(True)
        self._items = TableModel({"reason": Look(editable=True)}, identity="key", shown=_ITEMS)
        self._items.typed.connect(self._reason_typed)
        items = QWidget()
        column = QVBoxLayout(items)
        column.setContentsMargins(0, 6, 0, 0)
        column.addWidget(TableView(self._items, _("What the chosen plan changes")), 1)
        self._reason_note = QLabel()
        self._reason_note.setWordWrap(True)
        column.addWidget(self._reason_note)
        tabs.addTab(items, _("What &changes, and why"))
        difference = QWidget()
        column = QVBoxLayout(difference)
        column.setContentsMargins(0, 6, 0, 0)
        row = QHBoxLayout()
        label = QLabel(_("Agai&nst"))
        self._other = QComboBox()
        self._other.setAccessibleName(_("Plan to compare with"))
        self._other.currentIndexChanged.connect(lambda _i: self._show_difference())
        label.setBuddy(self._other)
        row.addWidget(label)
        row.addWidget(self._other, 1)
        row.addStretch(2)
        column.addLayout(row)
        self._difference = TableModel()
        column.addWidget(TableView(self._difference, _("Where two plans differ")), 1)
        tabs.addTab(difference, _("Two &plans item by item"))
        return tabs

    # -- which plan ------------------------------------------------------------------------

    def _all(self) -> tuple[NamedPlan, ...]:
        """The present plan first, then the kept ones."""
        return (self.bridge.present_plan(), *self.bridge.review.plans)

    def chosen(self) -> NamedPlan:
        """The plan of the current row; the present plan when there is none."""
        name = self._view.current_identity()
        plans = self._all()
        return next((plan for plan in plans[1:] if plan.name == name), plans[0])

    def _is_present(self) -> bool:
        return self.chosen().name == self.bridge.present_plan().name

    # -- doing -----------------------------------------------------------------------------

    def _drop_chosen(self) -> None:
        name = self.chosen().name
        self.bridge.do(lambda: self.bridge.review.drop_plan(name))

    def _reason_typed(self, key: str, column: str, words: str) -> None:
        shown, item = key_parts(key)
        loaded = self.bridge.review.loaded
        if loaded is None or not self._is_present():
            return
        code = next(name for name in loaded.catalogue.clusters if cluster_name(name) == shown)
        self.bridge.do(lambda: self.bridge.review.set_reason(item, code, words))

    def _enable(self) -> None:
        kept = self.ready() and not self._is_present()
        self._drop.setEnabled(kept)
        self._take.setEnabled(kept)
        for button in (self._workbook, self._stores):
            button.setEnabled(self.ready() and self.bridge.idle)

    # -- showing ---------------------------------------------------------------------------

    def ready(self) -> bool:
        return self.bridge.review.fitted is not None

    def _tally(self, plan: NamedPlan) -> Any:
        key = plan.states.tobytes()
        if key not in self._tallies:
            # The review keeps its own plan's tally and does not work it out again.
            review = self.bridge.review
            present = review.states is not None and key == review.states.tobytes()
            self._tallies[key] = review.tally() if present else review.single_tally(plan.states)
        return self._tallies[key]

    def look(self, kinds: frozenset[str]) -> None:
        review = self.bridge.review
        assert review.loaded is not None
        if kinds & {"data", "fit"}:
            self._tallies.clear()
        plans = self._all()
        table = plans_compared_table(review.loaded, plans, [self._tally(plan) for plan in plans])
        self._plans.set_table(plans_in_words(table, plans[0].name))
        self._note.set_sentences(table.notes)
        self._other.blockSignals(True)
        kept = self._other.currentText()
        self._other.clear()
        self._other.addItems([plan.name for plan in plans])
        self._other.setCurrentIndex(max(self._other.findText(kept), 0))
        self._other.blockSignals(False)
        if not self._view.current_identity():
            self._view.choose(plans[0].name)
        self._show_chosen()

    def _choose(self, name: str) -> None:
        if name and self.isVisible():
            self._show_chosen()

    def _show_chosen(self) -> None:
        loaded = self.bridge.review.loaded
        if loaded is None or not self.ready():
            return
        plan = self.chosen()
        items = item_list_table(loaded, self._tally(plan).effects, plan.states, plan.reasons)
        self._items.set_table(only_changes(items))
        if self._is_present():
            self._reason_note.setText(
                _("Double-click or F2 in the column Reason writes why; reasons go into the workbook.")
            )
        else:
            self._reason_note.setText(
                _("Reasons are written into the present plan: take this plan into it to change them.")
            )
            self.bridge.propose(Proposal(plan.states, plan.name))
        self._show_difference()
        self._enable()

    def _show_difference(self) -> None:
        loaded = self.bridge.review.loaded
        if loaded is None or not self.ready():
            return
        plans = self._all()
        other = plans[max(self._other.currentIndex(), 0)]
        self._difference.set_table(plans_differ(loaded.catalogue, self.chosen(), other))

    def kept_state(self) -> QByteArray:
        return self._split.saveState()

    def restore(self, state: QByteArray) -> None:
        self._split.restoreState(state)


def _looks() -> dict[str, Look]:
    tip = _("Bar: the estimate; line: its 80 % interval, on the same draws for every plan.")
    return {
        "margin_change": Look(bar=True, low="margin_low", high="margin_high", tip=tip),
        "name": Look(title=_("Plan")),
    }
