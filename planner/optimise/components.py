"""One cluster's problem: items with their admissible states, stores merged into components."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.optimise.problem import AS_TODAY, IN, OUT, AssortmentProblem, States

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class ClusterModel:
    """Cluster c as arrays.  R components (stores that answer alike), Q space rows.

    attraction, value (J,): v and money per unit.  segment (J,); ratio (G,): rho_g = lambda_g/lambda_c.
    power: lambda_c.  scale (R,); shoppers (R,) or None; weight (R,): stores merged in the component.
    carries (R, J): the component's stores carry the item today.
    room (Q,), uses (Q, J): space limit and space of an item that is AS_TODAY there; space (J,): when IN.
    today (J,): today's state.  allowed (J, 3): admissible states.  costs (J, 3): cost of each state.
    """

    attraction: Floats
    value: Floats
    segment: Ints
    ratio: Floats
    power: float
    scale: Floats
    shoppers: Floats | None
    weight: Floats
    carries: Bools
    room: Floats
    uses: Floats
    space: Floats
    least: float
    most: float
    today: States
    allowed: Bools
    costs: Floats

    @property
    def n_components(self) -> int:
        """R."""
        return int(self.scale.size)

    def presence(self, states: States) -> Bools:
        """(..., R, J) for states (..., J)."""
        listed = np.expand_dims(states == IN, -2)
        kept = np.expand_dims(states == AS_TODAY, -2)
        present: Bools = listed | (kept & self.carries)
        return present

    def demand(self, inclusive: Floats) -> Floats:
        """q (..., R) from W (..., R)."""
        safe = np.where(inclusive > 0.0, inclusive, 1.0)
        volume = np.where(inclusive > 0.0, self.scale * np.exp(self.power * np.log(safe)), 0.0)
        if self.shoppers is not None:
            volume = self.shoppers * volume / (1.0 + volume)
        result: Floats = self.weight * volume
        return result

    def slope(self, inclusive: Floats) -> Floats:
        """q'(W) (..., R), W > 0."""
        volume = self.scale * np.exp(self.power * np.log(inclusive))
        grow = self.power * volume / inclusive
        if self.shoppers is not None:
            grow = self.shoppers * grow / (1.0 + volume) ** 2
        result: Floats = self.weight * grow
        return result

    def revenue(self, inclusive: Floats, weighted: Floats) -> Floats:
        """R (..., R) = q(W) / W x Phi."""
        safe = np.where(inclusive > 0.0, inclusive, 1.0)
        result: Floats = np.where(inclusive > 0.0, self.demand(inclusive) / safe * weighted, 0.0)
        return result

    def objective(self, states: States) -> Floats:
        """Value of states (..., J), costs taken off."""
        present = self.presence(states).astype(np.float64)
        members = (self.segment[:, None] == np.arange(self.ratio.size)).astype(np.float64)
        total = (present * self.attraction) @ members
        money = (present * (self.attraction * self.value)) @ members
        inclusive, weighted = nest(total, money, self.ratio)
        worth = self.revenue(inclusive.sum(axis=-1), weighted.sum(axis=-1)).sum(axis=-1)
        result: Floats = worth - self.cost_of(states)
        return result

    def cost_of(self, states: States) -> Floats:
        """Cost of the changes (...)."""
        result: Floats = self.costs[np.arange(self.today.size), states].sum(axis=-1)
        return result

    def changes_of(self, states: States) -> Ints:
        """Number of changes (...)."""
        result: Ints = (states != self.today).sum(axis=-1)
        return result

    def use_of(self, states: States) -> Floats:
        """Space used (..., Q)."""
        listed = (states == IN) @ np.tile(self.space, (self.room.size, 1)).T
        result: Floats = listed + (states == AS_TODAY) @ self.uses.T
        return result

    def feasible(self, states: States, changes: int | None) -> Bools:
        """Which of states (..., J) meet every limit."""
        count = (states != OUT).sum(axis=-1)
        good = self.allowed[np.arange(self.today.size), states].all(axis=-1)
        good &= (self.use_of(states) <= self.room + 1e-9 * (1.0 + self.room)).all(axis=-1)
        good &= (count >= self.least) & (count <= self.most)
        if changes is not None:
            good &= self.changes_of(states) <= changes
        result: Bools = good
        return result


def nest(total: Floats, money: Floats, ratio: Floats) -> tuple[Floats, Floats]:
    """W_g = D ** rho and Phi_g = D ** (rho - 1) x sum of v m, zero for an empty segment."""
    safe = np.where(total > 0.0, total, 1.0)
    level = np.where(total > 0.0, np.exp(ratio * np.log(safe)), 0.0)
    return level, level / safe * money


def _allowed(problem: AssortmentProblem, c: int, today: States) -> Bools:
    """Admissible states (J, 3) from the locks; AS_TODAY only where the item is partly listed."""
    allowed = np.ones((today.size, 3), dtype=bool)
    allowed[:, AS_TODAY] = today == AS_TODAY
    allowed[problem.keep[c], OUT] = False
    allowed[problem.never[c], IN] = False
    allowed[problem.never[c], AS_TODAY] = False
    for j in np.flatnonzero(problem.locked[c]):
        stay = np.zeros(3, dtype=bool)
        stay[today[j]] = True
        allowed[j] &= stay
    return allowed


def _costs(problem: AssortmentProblem, today: States) -> Floats:
    """Cost (J, 3) of every state against today: extending counts as listing, withdrawing as delisting."""
    costs = np.zeros((today.size, 3))
    costs[today != IN, IN] = problem.listing_cost
    costs[today != OUT, OUT] = problem.delisting_cost
    return costs


def cluster_model(problem: AssortmentProblem, c: int) -> ClusterModel:
    """Cluster ``c`` of the problem.

    Stores that carry the same of the partly listed items merge: without shoppers their scales
    add up, with shoppers only identical stores do.
    """
    demand = problem.demand
    stores = np.flatnonzero(demand.cluster == c)
    carries = problem.today[stores]
    today = np.where(carries.all(axis=0), IN, np.where(carries.any(axis=0), AS_TODAY, OUT)).astype(np.int8)
    partly = today == AS_TODAY
    scale = demand.scale[0, stores]
    shoppers = None if demand.shoppers is None else demand.shoppers[stores]
    groups: dict[tuple[object, ...], list[int]] = {}
    for k in range(stores.size):
        key: tuple[object, ...] = (carries[k, partly].tobytes(),)
        if shoppers is not None:
            key = (*key, float(scale[k]), float(shoppers[k]))
        groups.setdefault(key, []).append(k)
    firsts = np.array([members[0] for members in groups.values()])
    sizes = np.array([float(len(members)) for members in groups.values()])
    if shoppers is None:
        merged = np.array([scale[members].sum() for members in groups.values()])
        weight = np.ones(firsts.size)
    else:
        merged, weight = scale[firsts], sizes
    rooms: dict[bytes, tuple[float, int]] = {}
    for k in range(stores.size):
        pattern = carries[k, partly].tobytes()
        limit = float(problem.space_limit[stores[k]])
        if pattern not in rooms or limit < rooms[pattern][0]:
            rooms[pattern] = (limit, k)
    return ClusterModel(
        attraction=demand.attraction[0, c],
        value=problem.value[c],
        segment=demand.segment,
        ratio=demand.dissimilarity[0] / demand.category_dissimilarity[0],
        power=float(demand.category_dissimilarity[0]),
        scale=merged,
        shoppers=None if shoppers is None else shoppers[firsts],
        weight=weight,
        carries=carries[firsts],
        room=np.array([limit for limit, _k in rooms.values()]),
        uses=np.array([carries[k] * problem.space for _limit, k in rooms.values()]),
        space=problem.space,
        least=float(problem.min_items[c]),
        most=float(problem.max_items[c]),
        today=today,
        allowed=_allowed(problem, c, today),
        costs=_costs(problem, today),
    )
