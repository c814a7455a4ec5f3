"""Best plan: goal and limits, a run that closes in, the answer, the ladder, and what would change."""

from __future__ import annotations

import math
import time

from PySide6.QtCore import QByteArray, Qt
from PySide6.QtWidgets import (
    QHBoxLayout,
    QPushButton,
    QSplitter,
    QTabWidget,
    QVBoxLayout,
    QWidget,
)

from planner.base.text import _
from planner.gui.bridge.review_bridge import Proposal, ReviewBridge
from planner.gui.models.answer_words import answer_words
from planner.gui.models.plan_rows import only_changes
from planner.gui.models.table_model import TableModel
from planner.gui.pages.limits_form import LimitsForm
from planner.gui.pages.page import Page
from planner.gui.widgets.gap_picture import GapPicture
from planner.gui.widgets.table_view import TableView
from planner.gui.widgets.words import Words
from planner.plan.plans import NamedPlan, PlanRung, States
from planner.tables.limits import limits_table
from planner.tables.plan import item_list_table

_CHANGES = (
    "action",
    "description",
    "cluster",
    "segment",
    "today",
    "plan",
    "units_today",
    "units",
    "margin",
    "space",
    "item",
    "brand",
)


class BestPlanPage(Page):
    """Runs the optimiser in the child process."""

    watched = frozenset({"data", "fit", "states", "limits", "plans"})

    def __init__(self, bridge: ReviewBridge) -> None:
        super().__init__(
            bridge,
            _("No share model yet"),
            _("The best plan needs to know how sales move. Fit the share model on the Evidence page first."),
        )
        self._started, self._today = 0.0, math.nan
        self._form = LimitsForm(bridge)
        self._split = QSplitter(Qt.Orientation.Horizontal)
        self._split.addWidget(self._form)
        self._split.addWidget(self._right())
        self._split.setChildrenCollapsible(False)
        self._split.setStretchFactor(1, 1)
        self._split.setSizes([390, 700])
        self.content_column(8).addWidget(self._split)
        bridge.job_changed.connect(self._job_changed)
        bridge.improved.connect(self._improved)
        bridge.finished.connect(self._finished)
        self._job_changed()

    # -- building --------------------------------------------------------------------------

    def _right(self) -> QWidget:
        right = QWidget()
        column = QVBoxLayout(right)
        column.setContentsMargins(6, 0, 0, 0)
        row = QHBoxLayout()
        self._run = QPushButton(_("Find the &best plan"))
        self._run.setAccessibleName(_("Find the best plan"))
        self._run.clicked.connect(self.run)
        self._stop = QPushButton(_("St&op"))
        self._stop.setAccessibleName(_("Stop and keep the best plan so far"))
        self._stop.setToolTip(_("Stop and keep the best plan so far"))
        self._stop.clicked.connect(self.bridge.cancel)
        self._take = QPushButton(_("&Take into the plan"))
        self._take.setAccessibleName(_("Take the answer into the plan"))
        self._take.clicked.connect(self.bridge.take)
        row.addWidget(self._run)
        row.addWidget(self._stop)
        row.addStretch(1)
        row.addWidget(self._take)
        column.addLayout(row)
        self._picture = GapPicture()
        column.addWidget(self._picture)
        self._words = Words(_("The answer"), spaced=False)
        column.addWidget(self._words)
        column.addWidget(self._tables(), 1)
        return right

    def _tables(self) -> QWidget:
        self._changes = TableModel(identity="key", shown=_CHANGES)
        self._ladder = TableModel(identity="changes")
        self._limits = TableModel(shown=("limit", "where", "value", "used", "room", "met", "words"))
        self._tabs = QTabWidget()
        self._tabs.setAccessibleName(_("Parts of the answer"))
        self._tabs.setDocumentMode(True)
        self._tabs.addTab(TableView(self._changes, _("What changes")), _("&What changes"))
        self._ladder_view = TableView(self._ladder, _("Ladder of changes"))
        self._ladder_view.chosen.connect(self._choose_rung)
        self._tabs.addTab(self._ladder_view, _("&Ladder of changes"))
        self._tabs.addTab(TableView(self._limits, _("Limits and what the answer uses")), _("Limits &used"))
        return self._tabs

    def limit_changes(self, count: int | None) -> None:
        """At most so many changes (undoable); None: no limit."""
        self._form.set_changes(count)

    # -- doing -----------------------------------------------------------------------------

    def run(self) -> None:
        """Find the best plan in the child process."""
        if self.bridge.recommend(self._form.seconds):
            self._picture.begin()
            self._started = time.monotonic()
            figures = self.bridge.review.tally()
            goals = {"margin": figures.margin, "sales": figures.sales, "units": figures.units}
            self._today = goals[self.bridge.review.limits.goal].today

    def _improved(self, answer: dict[str, object]) -> None:
        elapsed = time.monotonic() - self._started
        self._picture.add(elapsed, _number(answer.get("value")), _number(answer.get("bound")), self._today)

    def _finished(self, key: str, result: object) -> None:
        if key == "recommend" and isinstance(result, NamedPlan) and result.outcome is not None:
            outcome = result.outcome
            elapsed = max(outcome.seconds, time.monotonic() - self._started)
            self._picture.add(elapsed, outcome.value, outcome.bound, outcome.today_value)
            self._tabs.setCurrentIndex(0)

    def _job_changed(self) -> None:
        running = self.bridge.running
        if running is None:
            self._picture.end()
        self._run.setEnabled(running is None)
        self._stop.setEnabled(running is not None and running.key == "recommend")

    # -- showing ---------------------------------------------------------------------------

    def ready(self) -> bool:
        return self.bridge.review.fitted is not None

    def _answer(self) -> NamedPlan | None:
        """The latest plan that a run has found."""
        found = [plan for plan in self.bridge.review.plans if plan.outcome is not None]
        return found[-1] if found else None

    def look(self, kinds: frozenset[str]) -> None:
        self._form.look()
        plan = self._answer()
        self._take.setVisible(plan is not None)
        self._tabs.setTabVisible(0, plan is not None)
        has_ladder = plan is not None and len(plan.rungs) > 1
        self._tabs.setTabVisible(1, has_ladder)
        if plan is None:
            self._words.set_sentences(
                (
                    _("Set goal and limits on the left, then run. Stop keeps the best plan found so far."),
                    _("Below stand the limits and what the present plan uses of each."),
                )
            )
            self._limits.set_table(self.bridge.review.table("limits"))
            return
        if kinds <= {"limits", "states"}:
            return
        if has_ladder:
            self._ladder.set_table(self.bridge.review.table("ladder", name=plan.name))
        self._show(plan, plan.states, plan.name)

    def _show(self, plan: NamedPlan, states: States, label: str, rung: PlanRung | None = None) -> None:
        """Words and tables of the plan or one of its rungs; both may be taken."""
        review = self.bridge.review
        loaded = review.loaded
        assert loaded is not None
        tally = review.single_tally(states)
        self._words.set_sentences(answer_words(plan, tally, review.words("cautions")[0], rung))
        items = item_list_table(loaded, tally.effects, states, plan.reasons)
        self._changes.set_table(only_changes(items))
        self._limits.set_table(limits_table(loaded, plan.limits, states))
        self.bridge.propose(Proposal(states, label))

    def _choose_rung(self, changes: str) -> None:
        plan = self._answer()
        if plan is None or not changes:
            return
        for rung in plan.rungs:
            if str(rung.changes) == changes:
                label = _("{plan}, at most {n} changes").format(plan=plan.name, n=rung.changes)
                self._show(plan, rung.states, label, rung)

    def kept_state(self) -> QByteArray:
        return self._split.saveState()

    def restore(self, state: QByteArray) -> None:
        self._split.restoreState(state)


def _number(value: object) -> float:
    return float(value) if isinstance(value, int | float) else math.nan
