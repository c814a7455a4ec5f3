"""Every admissible combination of states inside a segment, with what it contributes."""

from __future__ import annotations

from dataclasses import dataclass

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

    items (k,): positions; states (n, k); inclusive, weighted (n, R): W_g and Phi_g;
    use (n, Q): space; count, changes, cost (n,).
    """

    items: Ints
    states: States
    inclusive: Floats
    weighted: Floats
    use: Floats
    count: Floats
    changes: Floats
    cost: Floats

    def only(self, kept: Bools | Ints) -> Block:
        """The block with some combinations left."""
        return Block(
            self.items,
            self.states[kept],
            self.inclusive[kept],
            self.weighted[kept],
            self.use[kept],
            self.count[kept],
            self.changes[kept],
            self.cost[kept],
        )

    @property
    def size(self) -> int:
        """n."""
        return int(self.count.size)


def combinations(model: ClusterModel) -> float:
    """Most combinations that any segment has."""
    per_item = model.allowed.sum(axis=1).astype(np.float64)
    sizes = [float(np.prod(per_item[model.segment == g])) for g in range(model.ratio.size)]
    return max(sizes)


def _block(model: ClusterModel, g: int) -> Block:
    """All combinations of segment g."""
    items = np.flatnonzero(model.segment == g)
    grids = np.meshgrid(*[np.flatnonzero(model.allowed[j]) for j in items], indexing="ij")
    states = np.stack([grid.ravel() for grid in grids], axis=1).astype(np.int8)
    listed, kept = (states == 1).astype(np.float64), (states == 2).astype(np.float64)
    v = model.attraction[items]
    vm = v * model.value[items]
    carries = model.carries[:, items].astype(np.float64)
    total = (listed @ v)[:, None] + kept @ (carries * v).T
    money = (listed @ vm)[:, None] + kept @ (carries * vm).T
    inclusive, weighted = nest(total, money, model.ratio[g])
    today = model.today[items]
    return Block(
        items=items,
        states=states,
        inclusive=inclusive,
        weighted=weighted,
        use=(listed @ model.space[items])[:, None] + kept @ model.uses[:, items].T,
        count=(states != OUT).sum(axis=1).astype(np.float64),
        changes=(states != today).sum(axis=1).astype(np.float64),
        cost=model.costs[items, states].sum(axis=1),
    )


def blocks_of(model: ClusterModel) -> list[Block]:
    """One block per segment that has items."""
    present = [g for g in range(model.ratio.size) if (model.segment == g).any()]
    return [_block(model, g) for g in present]


def within_limits(model: ClusterModel, blocks: list[Block], changes: int | None) -> list[Block]:
    """Drop combinations that no choice in the other segments can make feasible."""
    least_use = [block.use.min(axis=0) for block in blocks]
    least_changes = [block.changes.min() for block in blocks]
    most_count = [block.count.max() for block in blocks]
    kept = []
    for k, block in enumerate(blocks):
        others = sum(use for i, use in enumerate(least_use) if i != k)
        good = (block.use + others <= model.room + 1e-9 * (1.0 + model.room)).all(axis=1)
        good &= block.count <= model.most
        good &= block.count + sum(most_count) - most_count[k] >= model.least
        if changes is not None:
            good &= block.changes + sum(least_changes) - least_changes[k] <= changes
        kept.append(block.only(good))
    return kept
