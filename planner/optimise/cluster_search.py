"""Branch and bound in one cluster, one node at a time: best plan found and proven bound."""

from __future__ import annotations

import heapq
import itertools
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.optimise.components import ClusterModel
from planner.optimise.local_search import feasible_plan, improve
from planner.optimise.problem import OUT, States
from planner.optimise.relaxation import Bound, Box, Relaxation, contradictory, value_box
from planner.optimise.subsets import MOST_COMBINATIONS, Block, blocks_of, combinations, within_limits

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

# So many whole plans are simply valued.
_FEW_PLANS = 60_000
_REDUCE_ROUNDS = 6
_ROOT_ROUNDS = 30
# Ranges are sought at the root, and wherever pricing all combinations is cheap.
_SHORT_LISTS = 20_000
_LONG_LISTS = 100_000
_RANGE_TOLERANCE = 1e-2


@dataclass
class _Node:
    """Combinations left per segment, ranges that hold for every plan worth looking for, a bound."""

    blocks: list[Block]
    box: Box
    bound: float


class ClusterSearch:
    """Best plan of one cluster with at most ``changes`` changes (None: any number).

    value, states: the best found; bound: proven; ``step`` works on one node and returns quickly.
    stopped: asked between programs; a step that is interrupted keeps its node's bound.
    gap: relative; nodes that cannot beat the value by more than it are closed.
    """

    def __init__(
        self,
        model: ClusterModel,
        blocks: Callable[[], list[Block] | None],
        changes: int | None,
        start: States,
        gap: float,
        known_bound: float = np.inf,
        stopped: Callable[[], bool] = lambda: False,
    ) -> None:
        self.stopped = stopped
        self.model, self.changes, self.gap = model, changes, gap
        self.value, self.states = float(model.objective(start)), start
        self.nodes = 0
        self._heap: list[tuple[float, int, _Node]] = []
        self._counter = itertools.count()
        self._closed = -np.inf
        self._in_work = -np.inf
        self._turn = 0
        self._blocks = blocks
        # Until the root is bounded: a bound that needs no list of combinations.
        self._unopened: float | None = min(known_bound, coarse_bound(model))

    def _open(self) -> None:
        """List the root's combinations; done late, since many searches are never refined."""
        assert self._unopened is not None
        blocks = self._blocks()
        if blocks is None:
            # Too many combinations to list: the coarse bound stands.
            self._closed = self._unopened
            self._unopened = None
            return
        left = within_limits(self.model, blocks, self.changes)
        if all(block.size for block in left):
            free = np.full(self.model.n_components, np.inf)
            _centre, mu = self._centre()
            self._push(_Node(left, Box(-free, free, -free, free, mu), self._unopened))
        self._unopened = None

    def _push(self, node: _Node) -> None:
        heapq.heappush(self._heap, (-node.bound, next(self._counter), node))

    @property
    def target(self) -> float:
        """Bounds up to here need no more work."""
        return self.value + self.gap * abs(self.value)

    @property
    def bound(self) -> float:
        """Proven: no plan of this cluster is worth more."""
        if self._unopened is not None:
            return max(self._unopened, self.value)
        open_bound = -self._heap[0][0] if self._heap else -np.inf
        return max(self.value, self._closed, open_bound, self._in_work)

    @property
    def done(self) -> bool:
        """The bound is within the gap, or nothing can be refined."""
        if self._unopened is not None:
            return self._unopened <= self.target
        return not self._heap or -self._heap[0][0] <= self.target

    def offer(self, states: States) -> None:
        """A plan found elsewhere, feasible here."""
        value = float(self.model.objective(states))
        if value > self.value:
            self.value, self.states = value, states

    def step(self) -> None:
        """Bound, reduce and branch the open node with the highest bound."""
        if self.done:
            return
        if self._unopened is not None:
            self._open()
            if not self._heap:
                return
        _key, _n, node = heapq.heappop(self._heap)
        self.nodes += 1
        # Others may read the bound while this node is off the heap.
        self._in_work = node.bound
        survivor = self._reduced(node)
        if survivor is not None:
            for child in [survivor] if self.stopped() else self._children(survivor):
                self._push(child)
        self._in_work = -np.inf

    def _close(self, bound: float) -> None:
        """Keep the bound of what needs no more work."""
        self._closed = max(self._closed, bound)

    def _reduced(self, node: _Node) -> _Node | None:
        """Bound a node again and again while combinations drop out; None when it is closed."""
        root = self.nodes == 1
        rounds = _ROOT_ROUNDS if root else _REDUCE_ROUNDS
        for _number in range(rounds):
            if self.stopped():
                break
            if self._enumerated(node):
                return None
            before, old = sum(block.size for block in node.blocks), node.bound
            box = value_box(node.blocks, node.box)
            if contradictory(box):
                self._close(self.target)
                return None
            found = self._program(node, box).solve(stop_below=self.target)
            if found is not None:
                node.bound = min(node.bound, found.value)
            if found is None or node.bound <= self.target:
                # Without an answer the bound stands as it was.
                self._close(node.bound)
                return None
            self._round_up(node, found)
            node.blocks = self._surviving(node, found)
            if any(block.size == 0 for block in node.blocks):
                return None
            after = sum(block.size for block in node.blocks)
            width = float((box.high - box.low).sum())
            if root or after <= _SHORT_LISTS:
                node.box = self._ranges(node)
                narrow = float((node.box.high - node.box.low).sum())
            else:
                narrow = width
            gained = old - node.bound > 0.1 * (node.bound - self.target)
            if after > 0.8 * before and narrow > 0.99 * width and not gained:
                break
        return node

    def _centre(self) -> tuple[Floats, Floats]:
        """W (R,) at the best plan and mu = e R / q there, e = 1 - lambda_c (1 - q / N)."""
        model = self.model
        present = model.presence(self.states).astype(np.float64) * model.attraction
        members = (model.segment[:, None] == np.arange(model.ratio.size)).astype(np.float64)
        total, money = present @ members, (present * model.value) @ members
        safe = np.where(total > 0.0, total, 1.0)
        level = np.where(total > 0.0, safe**model.ratio, 0.0)
        inclusive = level.sum(axis=1)
        weighted = (level / safe * money).sum(axis=1)
        q = model.demand(inclusive)
        part = np.zeros_like(q) if model.shoppers is None else q / (model.weight * model.shoppers)
        worth = weighted / np.where(inclusive > 0.0, inclusive, 1.0)
        return inclusive, np.maximum((1.0 - model.power * (1.0 - part)) * worth, 0.0)

    def _program(self, node: _Node, box: Box, at_least: float | None = None) -> Relaxation:
        """The node's relaxation, seeded with the best plan's combinations and short lists."""
        program = Relaxation(self.model, node.blocks, box, self._centre()[0], self.changes, at_least)
        self._seed(program, node)
        return program

    def _seed(self, program: Relaxation, node: _Node) -> None:
        for g, block in enumerate(node.blocks):
            same = np.flatnonzero((block.states == self.states[block.items]).all(axis=1))
            program.add(g, same)
            if block.size <= 40:
                program.add(g, np.arange(block.size))

    def _round_up(self, node: _Node, found: Bound) -> None:
        """Improve from the plan nearest to the program's answer."""
        if self.nodes > 3 and self.nodes % 8:
            return
        wish = np.full(self.model.today.size, -0.5)
        for block, weights in zip(node.blocks, found.chosen, strict=True):
            share = sum(
                (w * (block.states[k] != OUT) for k, w in weights.items()), np.zeros(block.items.size)
            )
            wish[block.items] = 2.0 * share - 1.0
        plan = feasible_plan(self.model, wish, self.changes)
        if plan is not None and bool(self.model.feasible(plan, self.changes)):
            value, states = improve(self.model, plan, self.changes)
            if value > self.value:
                self.value, self.states = value, states

    def _surviving(self, node: _Node, found: Bound) -> list[Block]:
        """Combinations whose best plan may still reach the target."""
        spare = found.value - self.target + 1e-9 * abs(found.value)
        kept = []
        for block, gain, top in zip(node.blocks, found.reduced, found.tops, strict=True):
            stays = np.flatnonzero(gain >= top - spare)
            if stays.size < block.size:
                self._close(self.target)
            kept.append(block.only(stays))
        return kept

    def _ranges(self, node: _Node) -> Box:
        """Least and largest W and T of every component over plans worth at least the best one."""
        box = value_box(node.blocks, node.box)
        if contradictory(box):
            return box
        program = self._program(node, box, at_least=self.value)
        n = self.model.n_components
        edges = {"low": box.low.copy(), "high": box.high.copy()}
        edges |= {"t_low": box.t_low.copy(), "t_high": box.t_high.copy()}
        # Long lists are priced slowly: a third of the components at a time, others in later rounds.
        long = sum(block.size for block in node.blocks) > _LONG_LISTS
        self._turn += 1
        for r in range(self._turn % 3 if long else 0, n, 3 if long else 1):
            if self.stopped():
                break
            for names, by_phi in ((("low", "high"), 0.0), (("t_low",), 1.0)):
                for name, sign in zip(names, (-1.0, 1.0), strict=False):
                    objective = np.zeros(4 * n)
                    objective[r] = sign * (1.0 if by_phi == 0.0 else -float(box.mu[r]))
                    objective[n + r] = sign * by_phi
                    program.aim(objective)
                    found = program.solve(tolerance=_RANGE_TOLERANCE)
                    if found is None:
                        continue
                    edge = sign * found.value + sign * 1e-9 * (1.0 + abs(found.value))
                    pick = min if sign > 0.0 else max
                    edges[name][r] = pick(edges[name][r], edge)
        return Box(edges["low"], edges["high"], edges["t_low"], edges["t_high"], box.mu)

    def _enumerated(self, node: _Node) -> bool:
        """Value every whole plan when few are left."""
        sizes = [block.size for block in node.blocks]
        if float(np.prod([float(size) for size in sizes])) > _FEW_PLANS:
            return False
        model, index = self.model, np.indices(sizes).reshape(len(sizes), -1)

        def total(name: str) -> Floats:
            parts = [getattr(b, name)[i] for b, i in zip(node.blocks, index, strict=True)]
            return np.asarray(np.sum(parts, axis=0), dtype=np.float64)

        use, count = total("use"), total("count")
        good = (use <= model.room + 1e-9 * (1.0 + model.room)).all(axis=1)
        good &= (count >= model.least) & (count <= model.most)
        if self.changes is not None:
            good &= total("changes") <= self.changes
        index = index[:, good]
        if index.shape[1]:
            worth = model.revenue(total("inclusive"), total("weighted")).sum(axis=1) - total("cost")
            best = int(worth.argmax())
            states = np.zeros(model.today.size, dtype=np.int8)
            for block, i in zip(node.blocks, index, strict=True):
                states[block.items] = block.states[i[best]]
            self.offer(states)
            # Rounding of the two ways to add up.
            self._close(float(worth[best]) + 1e-11 * abs(float(worth[best])))
        return True

    def _children(self, node: _Node) -> list[_Node]:
        """Halve the list of the segment whose W differs most, at the middle of its weighted W."""
        high = np.maximum(value_box(node.blocks, node.box).high, 1e-300)
        weight = self.model.demand(high) / high
        n = self.model.n_components
        spread = [float((b.highest[:n] - b.lowest[:n]) @ weight) if b.size > 1 else -1.0 for b in node.blocks]
        g = int(np.argmax(spread))
        block = node.blocks[g]
        key = block.inclusive @ weight
        lower = key <= 0.5 * (key.min() + key.max())
        if lower.all() or not lower.any():
            lower = np.arange(block.size) < block.size // 2
        children = []
        for part in (lower, ~lower):
            blocks = list(node.blocks)
            blocks[g] = block.only(part)
            children.append(_Node(blocks, node.box, node.bound))
        return children


def coarse_bound(model: ClusterModel) -> float:
    """A valid bound without listing combinations: every admissible item on the shelf, best margin."""
    states = np.where(model.allowed[:, 1], 1, np.where(model.allowed[:, 2], 2, 0)).astype(np.int8)
    present = model.presence(states).astype(np.float64) * model.attraction
    members = (model.segment[:, None] == np.arange(model.ratio.size)).astype(np.float64)
    total = present @ members
    inclusive = np.where(total > 0.0, np.maximum(total, 1e-300) ** model.ratio, 0.0).sum(axis=1)
    usable = model.allowed[:, 1] | model.allowed[:, 2]
    top = max(float(model.value[usable].max(initial=0.0)), 0.0)
    cheapest = float(np.where(model.allowed, model.costs, np.inf).min(axis=1).sum())
    return float(model.demand(inclusive).sum()) * top - cheapest


def blocks_or_none(model: ClusterModel, most_changes: int | None) -> list[Block] | None:
    """Listed combinations, None when a segment has too many."""
    if combinations(model) > MOST_COMBINATIONS:
        return None
    return blocks_of(model, most_changes)
