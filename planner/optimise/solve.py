"""Best assortment of all clusters: cluster searches, and an allocation of the changes allowed."""

from __future__ import annotations

import time
from collections.abc import Callable
from concurrent.futures import FIRST_COMPLETED, Future, ThreadPoolExecutor, wait
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from planner.base.errors import RangewrightError
from planner.base.progress import NoProgress, Progress
from planner.base.text import _
from planner.optimise.clash import clashing_limits, feasible
from planner.optimise.cluster_search import ClusterSearch, blocks_or_none
from planner.optimise.components import ClusterModel, cluster_model
from planner.optimise.local_search import feasible_plan, improve
from planner.optimise.problem import (
    AssortmentProblem,
    AssortmentResult,
    Rung,
    SolverSettings,
    States,
    Status,
)
from planner.optimise.subsets import Block
from planner.optimise.verify import RawProblem, broken_limits, plan_value

Floats = NDArray[np.float64]

_REPORT_SECONDS = 0.3
_AT_ONCE = 2


class _Cluster:
    """The searches of one cluster by number of changes (None: any)."""

    def __init__(
        self,
        model: ClusterModel,
        settings: SolverSettings,
        most_changes: int | None,
        stopped: Callable[[], bool],
    ) -> None:
        self.model, self.settings, self.most_changes, self.stopped = model, settings, most_changes, stopped
        self.gap = 0.5 * settings.gap
        self.searches: dict[int | None, ClusterSearch] = {}
        self.priced: list[tuple[float, ClusterSearch]] = []
        self._listed: list[Block] | None = None

    def blocks(self) -> list[Block] | None:
        """Combinations of every segment, listed once and late; None when there are too many."""
        if self._listed is None:
            self._listed = blocks_or_none(self.model, self.most_changes)
        return self._listed

    def best_start(
        self, changes: int | None, known: list[States], starts: int, most_seconds: float = np.inf
    ) -> States | None:
        """Best of a few climbs: from today, from plans known and from random feasible plans."""
        model = self.model
        began = time.monotonic()
        rng = np.random.default_rng(self.settings.seed)
        worth = model.attraction * model.value
        tries: list[States | None] = [*known]
        if not known and bool(model.feasible(model.today, changes)):
            tries.append(model.today)
        found: list[tuple[float, States]] = []
        for number in range(starts + len(tries)):
            if number < len(tries):
                plan = tries[number]
            elif found and (self.stopped() or time.monotonic() - began > most_seconds):
                break
            else:
                wish = worth / max(float(np.abs(worth).max()), 1e-12) + rng.normal(0.0, 0.3, worth.size)
                plan = feasible_plan(model, wish, changes)
            if plan is not None and bool(model.feasible(plan, changes)):
                found.append(improve(model, plan, changes))
        return max(found, key=lambda pair: pair[0])[1] if found else None

    def price_changes(self, price: float, most: int, start: States) -> None:
        """A search in which every change costs ``price`` more: its bound + price x k holds for k changes."""
        costs = self.model.costs + price
        costs[np.arange(self.model.today.size), self.model.today] -= price
        model = replace(self.model, costs=costs)

        def blocks() -> list[Block] | None:
            listed = self.blocks()
            return None if listed is None else [block.with_price(price) for block in listed]

        search = ClusterSearch(model, blocks, most, start, self.gap, stopped=self.stopped)
        self.priced.append((price, search))

    def open(self, changes: int | None, start: States, known_bound: float = np.inf) -> ClusterSearch:
        """The search for this number of changes."""
        search = ClusterSearch(self.model, self.blocks, changes, start, self.gap, known_bound, self.stopped)
        self.searches[changes] = search
        return search


def raw_problem(problem: AssortmentProblem) -> RawProblem:
    """The problem's arrays for the verifier."""
    demand = problem.demand
    return RawProblem(
        attraction=demand.attraction[0],
        dissimilarity=demand.dissimilarity[0],
        category_dissimilarity=float(demand.category_dissimilarity[0]),
        scale=demand.scale[0],
        segment=demand.segment,
        cluster=demand.cluster,
        shoppers=demand.shoppers,
        today=problem.today,
        value=problem.value,
        space=problem.space,
        space_limit=problem.space_limit,
        min_items=problem.min_items,
        max_items=problem.max_items,
        keep=problem.keep,
        never=problem.never,
        locked=problem.locked,
        max_changes=problem.max_changes,
        listing_cost=problem.listing_cost,
        delisting_cost=problem.delisting_cost,
    )


class _Run:
    """One call of best_assortment: clusters, clock, progress."""

    def __init__(self, problem: AssortmentProblem, settings: SolverSettings, progress: Progress) -> None:
        self.problem, self.settings, self.progress = problem, settings, progress
        self.began = time.monotonic()
        self.deadline = self.began + settings.seconds
        self.clusters = [
            _Cluster(cluster_model(problem, c), settings, problem.max_changes, self.stopped)
            for c in range(problem.value.shape[0])
        ]
        self.iterations = 0
        self._reported = 0.0

    def stopped(self) -> bool:
        """Time is over or the user asked to stop."""
        return time.monotonic() > self.deadline or self.progress.cancelled()

    def show(self, value: float, bound: float, states: States) -> None:
        """Stream the best so far, a few times a second; the states outlive a process that is ended."""
        now = time.monotonic()
        if now - self._reported >= _REPORT_SECONDS:
            self._reported = now
            part = min(0.99, (now - self.began) / self.settings.seconds)
            self.progress.report(_("Searching for the best plan"), part)
            self.progress.improved(
                {"value": value, "bound": bound, "states": states, "seconds": now - self.began}
            )

    # -- any number of changes ---------------------------------------------------------------

    def free(self) -> tuple[States, float, tuple[Rung, ...]] | None:
        """Clusters are independent; work on the one with the largest gap."""
        starts = []
        for cluster in self.clusters:
            start = cluster.best_start(None, [], 1)
            if start is None:
                return None
            starts.append(start)
        searches = [c.open(None, s) for c, s in zip(self.clusters, starts, strict=True)]
        self._show_all(searches)
        for cluster, search in zip(self.clusters, searches, strict=True):
            if self.stopped():
                break
            seconds = 0.1 * self.settings.seconds / len(self.clusters)
            better = cluster.best_start(None, [search.states], self.settings.starts - 1, seconds)
            if better is not None:
                search.offer(better)
            self._show_all(searches)
        self._together(searches)
        return np.stack([s.states for s in searches]), sum(s.bound for s in searches), ()

    def _show_all(self, searches: list[ClusterSearch]) -> tuple[float, float]:
        """Stream the sum over the clusters; value and bound."""
        value, bound = sum(s.value for s in searches), sum(s.bound for s in searches)
        self.show(value, bound, np.stack([s.states for s in searches]))
        return value, bound

    def _together(self, searches: list[ClusterSearch]) -> None:
        """Step the searches with the largest gaps until the sum is within the target.

        Two at a time: they share nothing, and the arithmetic runs outside the interpreter's lock.
        """
        with ThreadPoolExecutor(_AT_ONCE) as pool:
            running: dict[int, Future[None]] = {}
            while True:
                value, bound = self._show_all(searches)
                enough = bound - value <= self.settings.gap * abs(value) or self.stopped()
                waiting = [k for k, s in enumerate(searches) if k not in running and not s.done]
                if not running and (enough or not waiting):
                    return
                waiting.sort(key=lambda k: searches[k].value - searches[k].bound)
                for k in [] if enough else waiting[: _AT_ONCE - len(running)]:
                    running[k] = pool.submit(searches[k].step)
                    self.iterations += 1
                wait(running.values(), timeout=_REPORT_SECONDS, return_when=FIRST_COMPLETED)
                for k in [k for k, work in running.items() if work.done()]:
                    running.pop(k).result()

    # -- at most so many changes -------------------------------------------------------------

    def limited(self, most: int) -> tuple[States, float, tuple[Rung, ...]] | None:
        """Value and bound of every cluster by number of changes, allocated by a dynamic programme."""
        for cluster in self.clusters:
            known: list[States] = []
            for k in range(most + 1):
                start = cluster.best_start(k, known, 2 if not known or k == most else 0)
                if start is not None:
                    known = [start]
                    cluster.open(k, start)
            if not cluster.searches:
                return None
        lower, picks = self._allocation(most, value=True)
        if not np.isfinite(lower[most]):
            return None
        self._price_changes(lower, picks[most], most)
        while not self.stopped():
            lower, picks = self._allocation(most, value=True)
            upper, ways = self._allocation(most, value=False)
            self.show(float(lower[most]), float(upper[most]), self._plan(picks[most]))
            if upper[most] - lower[most] <= self.settings.gap * abs(lower[most]):
                break
            cells = self._next_cells(ways[most])
            if not cells:
                break
            self._step_all(cells, float(lower[most]), float(upper[most]), self._plan(picks[most]))
        lower, picks = self._allocation(most, value=True)
        upper, _ways = self._allocation(most, value=False)
        rungs = tuple(
            Rung(k, float(lower[k]), float(max(upper[k], lower[k])), self._plan(picks[k]))
            for k in range(most + 1)
            if np.isfinite(lower[k])
        )
        return self._plan(picks[most]), float(upper[most]), rungs

    def _price_changes(self, lower: Floats, pick: tuple[int, ...], most: int) -> None:
        """Price a change at what the last ones bring (the slope of the ladder's concave hull at its end)."""
        rungs = np.flatnonzero(np.isfinite(lower[:most]))
        slopes = (lower[most] - lower[rungs]) / (most - rungs)
        price = max(float(slopes.min()), 0.0) if rungs.size else 0.0
        for cluster, k in zip(self.clusters, pick, strict=True):
            cluster.price_changes(price, most, cluster.searches[k].states)

    def _step_all(self, cells: list[ClusterSearch], value: float, bound: float, states: States) -> None:
        """One step of each, side by side, streaming the best so far meanwhile."""
        with ThreadPoolExecutor(_AT_ONCE) as pool:
            works = [pool.submit(cell.step) for cell in cells]
            while not all(work.done() for work in works):
                wait(works, timeout=_REPORT_SECONDS)
                self.show(value, bound, states)
            for work in works:
                work.result()
        self.iterations += len(cells)

    def _next_cells(self, way: tuple[int, ...]) -> list[ClusterSearch]:
        """First the priced searches, which bound every rung at once; then the rung's own cells."""
        priced = [search for cluster in self.clusters for _price, search in cluster.priced]
        for searches in (priced, [self.clusters[c].searches[k] for c, k in enumerate(way)]):
            unfinished = [search for search in searches if not search.done]
            if unfinished:
                unfinished.sort(key=lambda search: search.value - search.bound)
                return unfinished[:_AT_ONCE]
        return []

    def _plan(self, pick: tuple[int, ...]) -> States:
        return np.stack([self.clusters[c].searches[k].states for c, k in enumerate(pick)])

    def _curve(self, c: int, most: int, value: bool) -> tuple[Floats, list[int]]:
        """Best value (or bound) of cluster c with at most k changes, and the search it comes from.

        Values rise with k; a bound for more changes holds for fewer.
        """
        searches = self.clusters[c].searches
        curve, source = np.full(most + 1, -np.inf), [-1] * (most + 1)
        if value:
            best, at = -np.inf, -1
            for k in range(most + 1):
                if k in searches and searches[k].value > best:
                    best, at = searches[k].value, k
                curve[k], source[k] = best, at
            return curve, source
        best, at = np.inf, -1
        for k in range(most, -1, -1):
            if k in searches and searches[k].bound < best:
                best, at = searches[k].bound, k
            priced = min((s.bound + price * k for price, s in self.clusters[c].priced), default=np.inf)
            # The bound may come from a search with more changes; the one to refine is its own.
            first = min(key for key in searches if key is not None)
            least = max(min(best, priced), searches[max(first, k)].value if k in searches else -np.inf)
            curve[k], source[k] = (least, k if k in searches else at) if k >= first else (-np.inf, -1)
        return curve, source

    def _allocation(self, most: int, value: bool) -> tuple[Floats, list[tuple[int, ...]]]:
        """Best split of 0..most changes over the clusters."""
        total = np.zeros(most + 1)
        picks: list[tuple[int, ...]] = [()] * (most + 1)
        for c in range(len(self.clusters)):
            curve, source = self._curve(c, most, value)
            new = np.full(most + 1, -np.inf)
            chosen: list[tuple[int, ...]] = [()] * (most + 1)
            for k in range(most + 1):
                split = total[k::-1] + curve[: k + 1]
                own = int(split.argmax())
                new[k] = split[own]
                chosen[k] = (*picks[k - own], source[own])
            total, picks = new, chosen
        return total, picks


def best_assortment(
    problem: AssortmentProblem, settings: SolverSettings | None = None, progress: Progress | None = None
) -> AssortmentResult:
    """Best plan found and a proven bound on any plan that meets the limits.

    Stops at the relative gap, at the time allowed or when cancelled; keeps the best either way.
    The answer's limits and value are verified by code that shares nothing with this one.
    """
    chosen = settings if settings is not None else SolverSettings()
    run = _Run(problem, chosen, progress if progress is not None else NoProgress())
    found = None
    if feasible(problem):
        found = run.free() if problem.max_changes is None else run.limited(problem.max_changes)
    today_value = sum(float(c.model.objective(c.model.today)) for c in run.clusters)
    if found is None:
        nothing = float("nan")
        seconds = time.monotonic() - run.began
        clash = clashing_limits(problem)
        return AssortmentResult(
            Status.IMPOSSIBLE, None, nothing, nothing, nothing, seconds, 0, today_value, (), clash
        )
    states, bound, rungs = found
    value = _verified(problem, states)
    bound = max(bound, value)
    gap = (bound - value) / max(abs(value), 1e-12)
    if gap <= 1e-9:
        status = Status.OPTIMAL
    else:
        status = Status.WITHIN_TARGET if gap <= chosen.gap else Status.STOPPED_EARLY
    seconds = time.monotonic() - run.began
    return AssortmentResult(status, states, value, bound, gap, seconds, run.iterations, today_value, rungs)


def _verified(problem: AssortmentProblem, states: States) -> float:
    """The value by the verifier's own arithmetic; an internal error when anything disagrees."""
    raw = raw_problem(problem)
    broken = broken_limits(raw, states)
    value = plan_value(raw, states)
    own = sum(float(cluster_model(problem, c).objective(states[c])) for c in range(states.shape[0]))
    if broken or abs(value - own) > 1e-9 * max(1.0, abs(value)):
        raise RangewrightError(
            _("The recommended plan failed its check: {what}.").format(
                what="; ".join(broken) or f"value {own!r} against {value!r}"
            ),
            remedy=_("Please report this; do not use the plan."),
        )
    return value
