"""The assortment problem as arrays: what the solvers take and give back.

A state is kept per cluster and item: OUT of all stores of the cluster, IN all of
them, or AS_TODAY (only offered for partly listed items: present in its present
stores).  One change = one item whose state changes in one cluster.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

from planner.demand.store_demand import StoreDemand

Floats = NDArray[np.float64]
States = NDArray[np.int8]
Bools = NDArray[np.bool_]

OUT, IN, AS_TODAY = 0, 1, 2


class Status(StrEnum):
    """The closed set of outcomes."""

    OPTIMAL = "optimal"
    WITHIN_TARGET = "within target"
    STOPPED_EARLY = "stopped early"
    IMPOSSIBLE = "impossible"


@dataclass(frozen=True)
class AssortmentProblem:
    """Best assortment of every cluster, own assortments, joint limit on changes.

    demand: StoreDemand with K = 1.
    today (S, J): present range.  value (C, J): money (or units) per unit sold, may be negative.
    space (J,): space an item takes; space_limit (S,): per store, always binding.
    min_items, max_items (C,): number of items IN or AS_TODAY in the cluster.
    keep (C, J): must not be OUT.  never (C, J): must be OUT.  locked (C, J): must stay as today.
    max_changes: over all clusters together; None: no limit.
    listing_cost, delisting_cost: per change, in the unit of the objective (per week).
    """

    demand: StoreDemand
    today: Bools
    value: Floats
    space: Floats
    space_limit: Floats
    min_items: Floats
    max_items: Floats
    keep: Bools
    never: Bools
    locked: Bools
    max_changes: int | None = None
    listing_cost: float = 0.0
    delisting_cost: float = 0.0
    cluster_names: tuple[str, ...] = ()
    store_names: tuple[str, ...] = ()

    def cluster_name(self, c: int) -> str:
        """Name of cluster c for people."""
        return self.cluster_names[c] if 0 <= c < len(self.cluster_names) else str(c)

    def store_name(self, s: int) -> str:
        """Name of store s for people."""
        return self.store_names[s] if s < len(self.store_names) else str(s)


@dataclass(frozen=True)
class SolverSettings:
    """seconds: time allowed; gap: relative target; seed: of the local search; starts: its restarts."""

    seconds: float = 20.0
    gap: float = 1e-3
    seed: int = 1
    starts: int = 12


@dataclass(frozen=True)
class Rung:
    """Best plan found for at most ``changes`` changes, and the proven bound on any such plan."""

    changes: int
    value: float
    bound: float
    states: States


@dataclass(frozen=True)
class AssortmentResult:
    """states (C, J); value and bound in units of the objective per week; gap = (bound - value)/|value|."""

    status: Status
    states: States | None
    value: float
    bound: float
    gap: float
    seconds: float
    iterations: int
    today_value: float
    rungs: tuple[Rung, ...] = ()
    clashing: tuple[str, ...] = field(default=())
