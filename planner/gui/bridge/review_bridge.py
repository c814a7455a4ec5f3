"""Between the open review and the window: changes become signals, jobs run in the child process."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from PySide6.QtCore import QObject, QTimer, Signal

from planner.base.errors import CallError, RangewrightError
from planner.base.runner import ChildRunner, Message
from planner.base.text import _
from planner.plan.limits import ItemLock
from planner.plan.plans import NamedPlan, SolverOutcome, States
from planner.review.jobs import ExportJob, FitJob, LoadJob, RecommendJob, load_request
from planner.review.review import Change, RangeReview

_POLL_MS = 40
_AUTOSAVE_MS = 30_000


@dataclass(frozen=True)
class Running:
    """The job that runs: its key ("load", "fit", "recommend", "export") and its name for people.

    accept: what is done with the result; rescue: with the last better answer of a cancelled job.
    """

    key: str
    title: str
    accept: Callable[[Any], object]
    rescue: Callable[[dict[str, object]], object] | None = None


@dataclass(frozen=True)
class Proposal:
    """States (C, J) that may be taken into the plan, and what they are called."""

    states: States
    label: str


class ReviewBridge(QObject):
    """Owns the review's place in the window and the one child process.

    changed(frozenset of kinds); progress(step, part 0..1 or None); improved(mapping);
    finished(key, result); cancelled(key); failed(error).
    """

    changed = Signal(object)
    job_changed = Signal()
    progress = Signal(str, object)
    improved = Signal(object)
    finished = Signal(str, object)
    cancelled = Signal(str)
    stopping = Signal()
    failed = Signal(object)
    proposal_changed = Signal()
    saved = Signal()
    folder_wanted = Signal()
    files_dropped = Signal(object)

    def __init__(self, review: RangeReview, runner: ChildRunner, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.review = review
        self._runner = runner
        self._running: Running | None = None
        self._proposal: Proposal | None = None
        self.last_label = ""
        self._timer = QTimer(self)
        self._timer.setInterval(_POLL_MS)
        self._timer.timeout.connect(self._poll)
        self._autosave = QTimer(self)
        self._autosave.setInterval(_AUTOSAVE_MS)
        self._autosave.timeout.connect(self.autosave)
        self._autosave.start()
        review.subscribe(self._review_changed)

    # -- commands --------------------------------------------------------------------------

    def do(self, command: Callable[[], object]) -> bool:
        """Run a command of the review; a refusal is shown and changes nothing."""
        try:
            command()
        except RangewrightError as error:
            self.failed.emit(error)
            return False
        return True

    def _review_changed(self, change: Change) -> None:
        self.last_label = change.label
        if change.kinds & {"data", "fit"}:
            self.propose(None)
        self.changed.emit(change.kinds)

    @property
    def proposal(self) -> Proposal | None:
        """What “Take into the plan” would take."""
        return self._proposal

    def propose(self, proposal: Proposal | None) -> None:
        """A page offers states to be taken."""
        self._proposal = proposal
        self.proposal_changed.emit()

    def take(self) -> None:
        """Take the proposal into the plan (undoable)."""
        proposal = self._proposal
        if proposal is not None:
            label = _("Take {what}").format(what=proposal.label)
            self.do(lambda: self.review.take_states(proposal.states, label))

    def keep(self, name: str) -> None:
        """Keep the present plan under a name (undoable)."""
        states = self.review.states
        if states is None:
            return
        if name == self.present_plan().name:
            self.failed.emit(
                CallError(
                    _("“{name}” is what the plan in work is called.").format(name=name),
                    remedy=_("Choose another name."),
                )
            )
            return
        self.do(lambda: self.review.keep_plan(name, states))

    def set_lock(self, lock: ItemLock) -> None:
        """Lock an item, in place of another lock of the same item and cluster (undoable)."""
        limits = self.review.limits
        rest = tuple(k for k in limits.locks if (k.item, k.cluster) != (lock.item, lock.cluster))
        self.do(lambda: self.review.set_limits(replace(limits, locks=(*rest, lock))))

    # -- files -----------------------------------------------------------------------------

    def open(self, path: Path) -> bool:
        """Open a plan file."""
        return self.do(lambda: self.review.open(path))

    def save(self, path: Path | None) -> bool:
        """Save the plan, where it is (None) or elsewhere."""
        done = self.do(lambda: self.review.save(path))
        if done:
            self.saved.emit()
        return done

    def autosave(self) -> None:
        """Save a changed plan that has a file; never while a job runs."""
        if self.review.path is not None and self.review.dirty and self.idle:
            self.save(None)

    # -- jobs ------------------------------------------------------------------------------

    @property
    def idle(self) -> bool:
        """No job runs."""
        return self._running is None

    @property
    def running(self) -> Running | None:
        """The job that runs."""
        return self._running

    def warm_up(self) -> None:
        """Start the child process, so that the first job does not wait for it."""
        self._runner.warm_up()

    def _start(self, running: Running, target: str, *arguments: object) -> bool:
        if self._running is not None:
            self.failed.emit(
                CallError(
                    _("“{job}” is still running.").format(job=self._running.title),
                    remedy=_("Wait until it is done, or cancel it."),
                )
            )
            return False
        self._running = running
        self._runner.start(f"planner.review.engine:{target}", arguments)
        self._timer.start()
        self.job_changed.emit()
        return True

    def load_folder(self, folder: Path, title: str) -> bool:
        """Load a folder that holds sales, items and whatever else there is."""
        running = Running("load", title, self.review.accept_loaded)
        return self._start(running, "run_load_folder", folder)

    def load_files(
        self,
        files: dict[str, Path | None],
        matches: tuple[tuple[str, str, str], ...] = (),
        category: str = "",
        segment_by: tuple[str, ...] = (),
        baseline_weeks: int = 13,
    ) -> bool:
        """Load chosen files, by table; matches: (table, our column, its name in the file)."""
        request = load_request(files, matches, category, segment_by)
        running = Running("load", _("Loading"), self.review.accept_loaded)
        return self._start(running, "run_load", LoadJob(replace(request, baseline_weeks=baseline_weeks)))

    def fit(self, model: str = "nested") -> bool:
        """Fit the share model."""
        loaded = self.review.loaded
        if loaded is None:
            return False
        running = Running("fit", _("Fitting the share model"), self.review.accept_fitted)
        return self._start(running, "run_fit", FitJob(loaded, model))

    def recommend(self, seconds: float) -> bool:
        """Find the best plan under the present limits."""
        review = self.review
        if review.loaded is None or review.fitted is None:
            return False
        names = {plan.name for plan in review.plans}
        number = next(n for n in range(1, len(names) + 2) if _best_name(n) not in names)
        job = RecommendJob(review.loaded, review.fitted, review.limits, _best_name(number), seconds)
        running = Running(
            "recommend",
            _("Finding the best plan"),
            review.accept_recommended,
            lambda answer: self._rescue(job, answer),
        )
        return self._start(running, "run_recommend", job)

    def _rescue(self, job: RecommendJob, answer: dict[str, Any]) -> None:
        """Keep the best plan that a stopped run has sent."""
        states = answer.get("states")
        if states is None:
            return
        value, bound = float(answer["value"]), float(answer["bound"])
        outcome = SolverOutcome(
            status="stopped early",
            value=value,
            bound=bound,
            gap=(bound - value) / abs(value) if value else float("nan"),
            seconds=float(answer.get("seconds", float("nan"))),
            today_value=float(answer.get("today_value", float("nan"))),
        )
        created = datetime.now(UTC).isoformat(timespec="seconds")
        self.review.accept_recommended(NamedPlan(job.name, states, created, job.limits, outcome))

    def present_plan(self) -> NamedPlan:
        """What an export writes: the plan in work."""
        return self.review.current_plan(_("Present plan"))

    def export(self, kind: str, path: Path, with_costs: bool, plan: NamedPlan | None = None) -> bool:
        """Write a "workbook" or a "stores list" of a plan (None: the plan in work)."""
        review = self.review
        if review.loaded is None or review.fitted is None:
            return False
        written = plan if plan is not None else self.present_plan()
        job = ExportJob(kind, path, review.loaded, review.fitted, written, with_costs)
        title = _("Writing {name}").format(name=path.name)
        return self._start(Running("export", title, lambda result: None), "run_export", job)

    def cancel(self) -> None:
        """Ask the job to stop; what it has found is kept."""
        if self._running is not None:
            self._runner.cancel()
            self.stopping.emit()

    def _poll(self) -> None:
        for message in self._runner.poll():
            self._hear(message)

    def _hear(self, message: Message) -> None:
        if message.kind == "progress":
            self.progress.emit(message.step, message.fraction)
            return
        if message.kind == "improved":
            self.improved.emit(message.answer or {})
            return
        running, self._running = self._running, None
        self._timer.stop()
        assert running is not None
        if message.kind == "done":
            if self.do(lambda: running.accept(message.result)):
                self.finished.emit(running.key, message.result)
        elif message.kind == "cancelled":
            rescue, answer = running.rescue, message.answer
            if rescue is not None and answer:
                self.do(lambda: rescue(answer))
            self.cancelled.emit(running.key)
        else:
            self.failed.emit(message.error)
        self.job_changed.emit()

    def close(self) -> None:
        """End the child process and let the plan file go."""
        self._timer.stop()
        self._autosave.stop()
        self._running = None
        self._runner.close()
        self.review.close()


def _best_name(number: int) -> str:
    return _("Best plan {number}").format(number=number)
