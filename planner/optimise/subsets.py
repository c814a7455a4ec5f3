"""Every admissible combination of states inside a segment, with what it contributes."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from planner.optimise.components import ClusterModel, nest
from planner.optimise.problem import OUT, States

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]

# Above this many combinations a segment is not listed; its bound is then coarse, and honest.
MOST_COMBINATIONS = 600_000


@dataclass(frozen=True)
class Block:
    """n combinations of a segment's items.

    items (k,): positions; states (n, k); terms (2R + Q + 3, n): what a combination contributes,
    W_g and Phi_g per component, space per row, count, changes and cost; short (same shape): terms
    in single precision, for pricing; largest (2R + Q + 3,): no term is larger; n_components: R.
    """

    items: Ints
    states: States
    terms: Floats
    short: NDArray[np.float32]
    largest: Floats
    n_components: int

    @cached_property
    def lowest(self) -> Floats:
        """Least of every term (2R + Q + 3,)."""
        return np.asarray(self.terms.min(axis=1, initial=np.inf), dtype=np.float64)

    @cached_property
    def highest(self) -> Floats:
        """Largest of every term (2R + Q + 3,)."""
        return np.asarray(self.terms.max(axis=1, initial=-np.inf), dtype=np.float64)

    def t_range(self, mu: Floats) -> tuple[Floats, Floats]:
        """Least and largest Phi - mu W per component."""
        n = self.n_components
        t = self.terms[n : 2 * n] - mu[:, None] * self.terms[:n]
        return t.min(axis=1), t.max(axis=1)

    @property
    def inclusive(self) -> Floats:
        """W_g (n, R)."""
        return self.terms[: self.n_components].T

    @property
    def weighted(self) -> Floats:
        """Phi_g (n, R)."""
        return self.terms[self.n_components : 2 * self.n_components].T

    @property
    def use(self) -> Floats:
        """Space (n, Q)."""
        return self.terms[2 * self.n_components : -3].T

    @property
    def count(self) -> Floats:
        """Items on the list (n,)."""
        row: Floats = self.terms[-3]
        return row

    @property
    def changes(self) -> Floats:
        """Changes against today (n,)."""
        row: Floats = self.terms[-2]
        return row

    @property
    def cost(self) -> Floats:
        """Cost of the changes (n,)."""
        row: Floats = self.terms[-1]
        return row

    def only(self, kept: Bools | Ints) -> Block:
        """The block with some combinations left."""
        if kept.dtype != np.bool_ and kept.size == self.size:
            return self
        return Block(
            self.items,
            self.states[kept],
            self.terms[:, kept],
            self.short[:, kept],
            self.largest,
            self.n_components,
        )

    def with_price(self, price: float) -> Block:
        """The block with every change costing ``price`` more."""
        terms = self.terms.copy()
        terms[-1] += price * terms[-2]
        return made_block(self.items, self.states, terms, self.n_components)

    @property
    def size(self) -> int:
        """n."""
        return int(self.terms.shape[1])


def made_block(items: Ints, states: States, terms: Floats, n_components: int) -> Block:
    """A block from its terms."""
    largest = np.maximum(terms.max(axis=1, initial=0.0), -terms.min(axis=1, initial=0.0))
    return Block(items, states, terms, terms.astype(np.float32), largest, n_components)


def combinations(model: ClusterModel) -> float:
    """Most combinations that any segment has."""
    per_item = model.allowed.sum(axis=1).astype(np.float64)
    sizes = [float(np.prod(per_item[model.segment == g])) for g in range(model.ratio.size)]
    return max(sizes)


def _block(model: ClusterModel, g: int, most_changes: int | None) -> Block:
    """All combinations of segment g with at most so many changes."""
    items = np.flatnonzero(model.segment == g)
    grids = np.meshgrid(*[np.flatnonzero(model.allowed[j]) for j in items], indexing="ij")
    states = np.stack([grid.ravel() for grid in grids], axis=1).astype(np.int8)
    changes = (states != model.today[items]).sum(axis=1)
    if most_changes is not None:
        states, changes = states[changes <= most_changes], changes[changes <= most_changes]
    listed, kept = (states.T == 1).astype(np.float64), (states.T == 2).astype(np.float64)
    v = model.attraction[items]
    vm = v * model.value[items]
    carries = model.carries[:, items].astype(np.float64)
    total = v @ listed + (carries * v) @ kept
    money = vm @ listed + (carries * vm) @ kept
    inclusive, weighted = nest(total, money, model.ratio[g])
    terms = np.vstack(
        [
            inclusive,
            weighted,
            model.space[items] @ listed + model.uses[:, items] @ kept,
            (states != OUT).sum(axis=1),
            changes,
            model.costs[items, states].sum(axis=1),
        ]
    )
    return made_block(items, states, terms, model.n_components)


def blocks_of(model: ClusterModel, most_changes: int | None) -> list[Block]:
    """One block per segment that has items."""
    present = [g for g in range(model.ratio.size) if (model.segment == g).any()]
    return [_block(model, g, most_changes) for g in present]


def within_limits(model: ClusterModel, blocks: list[Block], changes: int | None) -> list[Block]:
    """Drop combinations that no choice in the other segments can make feasible."""
    n = model.n_components
    least_use = [block.lowest[2 * n : -3] for block in blocks]
    least_changes = [float(block.lowest[-2]) for block in blocks]
    most_count = [float(block.highest[-3]) for block in blocks]
    kept = []
    for k, block in enumerate(blocks):
        others = sum(use for i, use in enumerate(least_use) if i != k)
        good = (block.use + others <= model.room + 1e-9 * (1.0 + model.room)).all(axis=1)
        good &= block.count <= model.most
        good &= block.count + sum(most_count) - most_count[k] >= model.least
        if changes is not None:
            good &= block.changes + sum(least_changes) - least_changes[k] <= changes
        kept.append(block.only(np.flatnonzero(good)))
    return kept
