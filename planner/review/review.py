"""The open range review: one document, undoable commands, and the tables that views read."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from contextlib import ExitStack, contextmanager
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from planner.base.errors import CallError
from planner.base.text import _
from planner.plan.limits import ItemLock, Limits
from planner.plan.plans import NamedPlan, PlanRung, SolverOutcome, States
from planner.review import engine, reading
from planner.review.carry_over import carried_over, kept_reasons, marked_as_earlier_fit
from planner.review.changes import KINDS, Change
from planner.review.history import History, Snapshot, changed_kinds
from planner.review.jobs import FitDone
from planner.review.problem import LOCKS, check_codes
from planner.tables.table import Table
from planner.transfer.tally import Tally
from planner.transfer.tally import tally as tally_of
from planner.transfer.what_if import AS_TODAY, IN, OUT, WhatIf, today_states

if TYPE_CHECKING:
    from planner.demand.fitted import FittedModel
    from planner.sales.report import LoadedData
    from planner.transfer.delistings import DelistingTransfers

__all__ = ["Change", "RangeReview"]


class RangeReview:
    """Data, fit, the plan in work, limits and kept plans of one category.

    Every command returns the Change it made and tells the subscribers; results of jobs come in
    through the accept methods.  Not thread-safe: it belongs to one thread.
    """

    def __init__(self) -> None:
        self._loaded: LoadedData | None = None
        self._fitted: FittedModel | None = None
        self._history = History()
        self._path: Path | None = None
        self._lock: Any = None
        self._dirty = False
        self._subscribers: list[Callable[[Change], None]] = []
        self._delistings: DelistingTransfers | None = None
        self._words: tuple[str, ...] | None = None
        self._tally: tuple[bytes, Tally] | None = None

    # -- what is there -----------------------------------------------------------------------

    @property
    def loaded(self) -> LoadedData | None:
        """The data, None before loading."""
        return self._loaded

    @property
    def fitted(self) -> FittedModel | None:
        """The share model, None before fitting."""
        return self._fitted

    @property
    def states(self) -> States | None:
        """The plan in work (C, J), None before loading.  Do not write into it."""
        return self._history.present.states

    @property
    def limits(self) -> Limits:
        """Limits of the next recommendation."""
        return self._history.present.limits

    @property
    def plans(self) -> tuple[NamedPlan, ...]:
        """Kept plans, oldest first."""
        return self._history.present.plans

    @property
    def reasons(self) -> tuple[tuple[str, str, str], ...]:
        """(item, cluster or "", words) beside decisions of the plan in work."""
        return self._history.present.reasons

    @property
    def path(self) -> Path | None:
        """The plan file, None when never saved."""
        return self._path

    @property
    def dirty(self) -> bool:
        """Something changed since the last save."""
        return self._dirty

    @property
    def can_undo(self) -> bool:
        """A command can be undone."""
        return bool(self._history.past)

    @property
    def can_redo(self) -> bool:
        """An undone command can be done again."""
        return bool(self._history.future)

    @property
    def undo_label(self) -> str:
        """What undo would take back."""
        return self._history.past[-1][0] if self._history.past else ""

    @property
    def redo_label(self) -> str:
        """What redo would do again."""
        return self._history.future[-1][0] if self._history.future else ""

    def subscribe(self, callback: Callable[[Change], None]) -> None:
        """Call ``callback`` with every Change from now on."""
        self._subscribers.append(callback)

    def need_loaded(self) -> LoadedData:
        """The data, or CallError when nothing is loaded."""
        if self._loaded is None:
            raise CallError(_("No sales are loaded."), remedy=_("Load sales and items first."))
        return self._loaded

    def need_fitted(self) -> FittedModel:
        """The fit, or CallError when there is none."""
        self.need_loaded()
        if self._fitted is None:
            raise CallError(_("No share model is fitted."), remedy=_("Fit the share model first."))
        return self._fitted

    def has_costs(self) -> bool:
        """Any cost is known, so there is a margin to speak of."""
        return bool(np.isfinite(self.need_loaded().base.margin).any())

    def _need_states(self) -> States:
        self.need_loaded()
        states = self.states
        assert states is not None
        return states

    def today_states(self) -> States:
        """States (C, J) of today's range."""
        loaded = self.need_loaded()
        cluster = np.array(loaded.catalogue.cluster_of_store(), dtype=np.int64)
        return today_states(loaded.base.today, cluster, len(loaded.catalogue.clusters))

    # -- commands ----------------------------------------------------------------------------

    def _tell(self, change: Change, dirty: bool = True) -> Change:
        self._dirty = self._dirty or dirty
        for callback in self._subscribers:
            callback(change)
        return change

    def _do(self, label: str, kinds: set[str], items: tuple[str, ...] = (), **parts: Any) -> Change:
        """One undoable command: the present snapshot with ``parts`` replaced."""
        self._history.do(label, replace(self._history.present, **parts))
        return self._tell(Change(frozenset(kinds | {"history"}), label, items))

    def position(self, item: str) -> int:
        """Place of an item on the item axis; CallError for an unknown code."""
        index = self.need_loaded().catalogue.item_index()
        if item not in index:
            raise CallError(
                _("Unknown item '{item}'.").format(item=item),
                remedy=_("Use a code of the items table, with its leading zeros."),
            )
        return index[item]

    def _clusters(self, cluster: str) -> list[int]:
        clusters = self.need_loaded().catalogue.clusters
        if not cluster:
            return list(range(len(clusters)))
        if cluster not in clusters:
            raise CallError(
                _("Unknown cluster '{name}'.").format(name=cluster),
                remedy=_("Clusters are: {names}.").format(names=", ".join(clusters)),
            )
        return [clusters.index(cluster)]

    def open_to(self, j: int, rows: list[int]) -> list[int]:
        """Those of the clusters ``rows`` in which item j may be listed; CallError when there is none."""
        catalogue = self.need_loaded().catalogue
        offered_to = catalogue.items[j].offered_to
        found = [c for c in rows if not offered_to or catalogue.clusters[c] in offered_to]
        if not found:
            raise CallError(
                _("{item} is not offered to this cluster.").format(item=catalogue.items[j].code),
                remedy=_("It is offered to: {names}.").format(names=", ".join(offered_to)),
            )
        return found

    def set_state(self, item: str, cluster: str, state: int) -> Change:
        """Put an item IN, OUT or AS_TODAY in one cluster ("": in every one that it is open to)."""
        j, rows = self.position(item), self._clusters(cluster)
        today = self.today_states()
        if state == IN:
            rows = self.open_to(j, rows)
        states = self._need_states().copy()
        # As today means the state that leaves the cluster's stores alone.
        states[rows, j] = today[rows, j] if state == AS_TODAY else state
        names = {IN: _("List {item}"), OUT: _("Delist {item}"), AS_TODAY: _("Leave {item} as today")}
        return self._do(names[state].format(item=item), {"states"}, (item,), states=states)

    def toggle(self, item: str, cluster: str = "") -> Change:
        """Tick or untick: off every list when it is on one of them, else back to today (or listed)."""
        j, rows = self.position(item), self._clusters(cluster)
        if (self._need_states()[rows, j] != OUT).any():
            return self.set_state(item, cluster, OUT)
        listed = (self.today_states()[rows, j] != OUT).any()
        return self.set_state(item, cluster, AS_TODAY if listed else IN)

    def set_lock(self, item: str, kind: str | None, cluster: str = "", reason: str = "") -> Change:
        """Lock an item ("keep", "never", "as today"), or take its locks off (None)."""
        self.position(item)
        self._clusters(cluster)
        rest = tuple(lock for lock in self.limits.locks if (lock.item, lock.cluster) != (item, cluster))
        if kind is None:
            label = _("Unlock {item}").format(item=item)
        else:
            if kind not in LOCKS:
                raise CallError(
                    _("Unknown kind of lock '{kind}'.").format(kind=kind),
                    remedy=_("Use one of: {kinds}.").format(kinds=", ".join(LOCKS)),
                )
            rest = (*rest, ItemLock(item, kind, cluster, reason))
            label = _("Lock {item}").format(item=item)
        return self._do(label, {"limits"}, (item,), limits=replace(self.limits, locks=rest))

    def set_limits(self, limits: Limits) -> Change:
        """Replace all limits."""
        check_codes(self.need_loaded(), limits)
        return self._do(_("Change the limits"), {"limits"}, limits=limits)

    def take_states(self, states: States, label: str) -> Change:
        """Make ``states`` (C, J) the plan in work."""
        if states.shape != self._need_states().shape:
            raise CallError(
                _("The plan has {found} clusters and items, the data {expected}.").format(
                    found=states.shape, expected=self._need_states().shape
                ),
                remedy=_("It was made on other data; run the recommendation again."),
            )
        return self._do(label, {"states"}, states=states.copy())

    def back_to_today(self) -> Change:
        """Drop every change of the plan in work."""
        return self.take_states(self.today_states(), _("Back to today"))

    def keep_plan(
        self,
        name: str,
        states: States,
        outcome: SolverOutcome | None = None,
        rungs: tuple[PlanRung, ...] = (),
        reasons: tuple[tuple[str, str, str], ...] = (),
        limits: Limits | None = None,
    ) -> Change:
        """Keep ``states`` under a name; a plan of that name is replaced."""
        self.need_loaded()
        if not name.strip():
            raise CallError(_("A kept plan needs a name."))
        plan = NamedPlan(
            name=name.strip(),
            states=states.copy(),
            created=datetime.now(UTC).isoformat(timespec="seconds"),
            limits=limits if limits is not None else self.limits,
            outcome=outcome,
            rungs=rungs,
            reasons=reasons or self.reasons,
        )
        return self._keep(plan)

    def _keep(self, plan: NamedPlan) -> Change:
        rest = tuple(kept for kept in self.plans if kept.name != plan.name)
        return self._do(_("Keep plan {name}").format(name=plan.name), {"plans"}, plans=(*rest, plan))

    def drop_plan(self, name: str) -> Change:
        """Forget a kept plan."""
        self.plan(name)
        rest = tuple(kept for kept in self.plans if kept.name != name)
        return self._do(_("Drop plan {name}").format(name=name), {"plans"}, plans=rest)

    def plan(self, name: str | None = None) -> NamedPlan:
        """The kept plan of this name, or the latest one."""
        if not self.plans:
            raise CallError(_("No plan is kept."), remedy=_("Run a recommendation, or keep a plan first."))
        if name is None:
            return self.plans[-1]
        for kept in self.plans:
            if kept.name == name:
                return kept
        raise CallError(
            _("No plan is called '{name}'.").format(name=name),
            remedy=_("Kept plans: {names}.").format(names=", ".join(kept.name for kept in self.plans)),
        )

    def current_plan(self, name: str) -> NamedPlan:
        """The plan in work as a record, for export; nothing is kept."""
        created = datetime.now(UTC).isoformat(timespec="seconds")
        return NamedPlan(name, self._need_states(), created, self.limits, reasons=self.reasons)

    def set_reason(self, item: str, cluster: str, words: str) -> Change:
        """Write the reason beside a decision; empty words take it away."""
        self.position(item)
        rest = tuple(kept for kept in self.reasons if kept[:2] != (item, cluster))
        reasons = (*rest, (item, cluster, words)) if words.strip() else rest
        return self._do(_("Reason for {item}").format(item=item), {"states"}, (item,), reasons=reasons)

    def undo(self) -> Change:
        """Take the last command back."""
        if not self.can_undo:
            raise CallError(_("There is nothing to undo."))
        return self._move(self._history.undo)

    def redo(self) -> Change:
        """Do the last undone command again."""
        if not self.can_redo:
            raise CallError(_("There is nothing to redo."))
        return self._move(self._history.redo)

    def _move(self, step: Callable[[], str]) -> Change:
        before = self._history.present
        label = step()
        return self._tell(Change(changed_kinds(before, self._history.present), label))

    # -- results of jobs ---------------------------------------------------------------------

    def _forget_caches(self) -> None:
        self._delistings, self._words, self._tally = None, None, None

    def accept_loaded(self, loaded: LoadedData) -> Change:
        """New data: the fit and the plan in work go, what still fits of limits and kept plans stays.

        Not undoable.  The label says what was lost.
        """
        old = self._loaded.catalogue if self._loaded is not None else None
        self._loaded, self._fitted = loaded, None
        self._forget_caches()
        snapshot, lost = carried_over(self._history.present, old, loaded.catalogue, self.today_states())
        self._history.restart(snapshot)
        label = _("Load sales (dropped: {lost})").format(lost=lost) if lost else _("Load sales")
        return self._tell(Change(KINDS - {"file"}, label))

    def accept_fitted(self, done: FittedModel | FitDone) -> Change:
        """A new fit of the loaded data.  Not undoable."""
        self.need_loaded()
        if self._fitted is not None:
            self._history.rewrite(marked_as_earlier_fit)
        self._forget_caches()
        if isinstance(done, FitDone):
            self._fitted, self._delistings = done.fitted, done.delistings
        else:
            self._fitted = done
        return self._tell(Change(frozenset({"fit", "states", "plans"}), _("Fit the share model")))

    def accept_recommended(self, plan: NamedPlan) -> Change:
        """Keep a recommended plan; today and the plan in work stay as they are."""
        self.need_fitted()
        return self._keep(plan)

    # -- reads -------------------------------------------------------------------------------

    def delistings(self) -> DelistingTransfers:
        """Every single delisting on the present fit (computed once per fit)."""
        if self._delistings is None:
            self._delistings = engine.delistings_of(self.need_loaded(), self.need_fitted())
        return self._delistings

    def tally(self, states: States | None = None) -> Tally:
        """The plan in work (or ``states``) against today."""
        wanted = self._need_states() if states is None else states
        key = wanted.tobytes()
        if self._tally is None or self._tally[0] != key:
            self._tally = (key, tally_of(self.need_fitted(), self.need_loaded().base, wanted))
        return self._tally[1]

    def effects(self, states: States | None = None) -> WhatIf:
        """Units per cluster and item of the plan in work (or ``states``) against today."""
        return self.tally(states).effects

    def single_tally(self, states: States) -> Tally:
        """Any plan against today, without touching the cache of the plan in work."""
        return tally_of(self.need_fitted(), self.need_loaded().base, states)

    def single_effects(self, states: States) -> WhatIf:
        """Units of any plan against today."""
        return self.single_tally(states).effects

    def table(self, key: str, **choices: Any) -> Table:
        """One of the tables of ``reading.TABLES``; choices are that table's own."""
        return reading.table(self, key, **choices)

    def words(self, key: str) -> Sequence[str]:
        """Plain sentences: "evidence", "cautions" or "notes"."""
        if key == "evidence" and self._fitted is not None:
            if self._words is None:
                self._words = reading.evidence(self)
            return self._words
        return reading.words(self, key)

    # -- file --------------------------------------------------------------------------------

    def new(self) -> Change:
        """An empty review."""
        self._release()
        self._loaded, self._fitted, self._path = None, None, None
        self._forget_caches()
        self._history.restart(Snapshot())
        self._dirty = False
        return self._tell(Change(KINDS, _("New")), dirty=False)

    def _release(self) -> None:
        if self._lock is not None:
            self._lock.release()
            self._lock = None

    def close(self) -> None:
        """Let the plan file go."""
        self._release()

    def open(self, path: Path) -> Change:
        """Open a plan file; it is held until another is opened or the review is closed."""
        path = path.resolve()
        with self._held(path):
            contents = engine.read_plan_file(path)
            reasons = kept_reasons(contents.settings, path)
        self._path = path
        self._loaded, self._fitted = contents.loaded, contents.fitted
        self._forget_caches()
        states = contents.states
        if states is None and self._loaded is not None:
            states = self.today_states()
        self._history.restart(Snapshot(states, contents.limits, contents.plans, reasons))
        self._dirty = False
        return self._tell(Change(KINDS, _("Open")), dirty=False)

    def save(self, path: Path | None = None) -> Change:
        """Save to ``path``, or to the file it came from."""
        target = path.resolve() if path is not None else self._path
        if target is None:
            raise CallError(_("The plan has no file yet."), remedy=_("Save it under a name."))
        present = self._history.present
        contents: dict[str, object] = {
            "loaded": self._loaded,
            "fitted": self._fitted,
            "states": present.states,
            "limits": present.limits,
            "plans": present.plans,
            "settings": {"reasons": present.reasons},
        }
        with self._held(target):
            engine.write_plan_file(target, contents)
        self._path, self._dirty = target, False
        return self._tell(Change(frozenset({"file"}), _("Save")), dirty=False)

    @contextmanager
    def _held(self, path: Path) -> Iterator[None]:
        """Hold ``path`` in place of the present file, unless the block fails."""
        if self._lock is not None and path == self._path:
            yield
            return
        with ExitStack() as undo:
            lock = engine.lock_plan_file(path)
            undo.callback(lock.release)
            yield
            undo.pop_all()
        self._release()
        self._lock = lock
