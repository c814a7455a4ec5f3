"""Random small assortment problems and their enumeration, which shares nothing with the solver."""

from __future__ import annotations

import itertools

import numpy as np

from planner.demand.store_demand import StoreDemand
from planner.optimise.problem import AS_TODAY, IN, OUT, AssortmentProblem
from planner.transfer.what_if import today_states


def random_case(seed: int) -> AssortmentProblem:
    """1-3 clusters, 1-3 stores each, 5-7 items, all limits at random, some impossible."""
    rng = np.random.default_rng(seed)
    n_clusters, n_items = int(rng.integers(1, 4)), int(rng.integers(5, 8))
    cluster = np.repeat(np.arange(n_clusters), rng.integers(1, 4, n_clusters))
    n_stores, n_segments = cluster.size, int(rng.integers(1, 4))
    category = float(rng.uniform(0.05, 1.0))
    segment = rng.integers(0, n_segments, n_items)
    shoppers = rng.uniform(80.0, 200.0, n_stores) if rng.random() < 0.5 else None
    demand = StoreDemand(
        attraction=np.exp(rng.normal(0.0, 0.8, (1, n_clusters, n_items))),
        dissimilarity=category * rng.uniform(0.15, 1.0, (1, n_segments)),
        category_dissimilarity=np.array([category]),
        scale=np.exp(rng.normal(-1.0 if shoppers is not None else 3.0, 0.4, (1, n_stores))),
        segment=segment,
        cluster=cluster,
        shoppers=shoppers,
    )
    today = rng.random((n_stores, n_items)) < rng.uniform(0.3, 0.9)
    today[:, -1] = False
    value = rng.uniform(0.2, 3.0, (n_clusters, n_items))
    if rng.random() < 0.3:
        value -= 0.8
    space = rng.uniform(1.0, 4.0, n_items)
    shape = (n_clusters, n_items)
    keep = rng.random(shape) < 0.08
    return AssortmentProblem(
        demand=demand,
        today=today,
        value=value,
        space=space,
        space_limit=rng.uniform(0.25, 0.9) * space.sum() * rng.uniform(0.8, 1.2, n_stores),
        min_items=rng.integers(0, 3, n_clusters).astype(float),
        max_items=rng.integers(2, n_items + 1, n_clusters).astype(float),
        keep=keep,
        never=(rng.random(shape) < 0.08) & (~keep | (rng.random(shape) < 0.05)),
        locked=rng.random(shape) < 0.08,
        max_changes=int(rng.integers(0, 7)) if rng.random() < 0.5 else None,
        listing_cost=float(rng.uniform(0.0, 2.0)) if rng.random() < 0.4 else 0.0,
        delisting_cost=float(rng.uniform(0.0, 1.0)) if rng.random() < 0.4 else 0.0,
    )


def _cluster_plans(problem: AssortmentProblem, c: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Every feasible plan of cluster c: states (n, J), value (n,), changes (n,)."""
    demand = problem.demand
    stores = np.flatnonzero(demand.cluster == c)
    today = today_states(problem.today[stores], np.zeros(stores.size, dtype=int), 1)[0]
    n_items = today.size
    options = [(OUT, IN, AS_TODAY) if today[j] == AS_TODAY else (OUT, IN) for j in range(n_items)]
    states = np.array(list(itertools.product(*options)), dtype=np.int8)
    present = (states[:, None] == IN) | ((states[:, None] == AS_TODAY) & problem.today[stores][None])
    count, changes = (states != OUT).sum(axis=1), (states != today).sum(axis=1)
    good = (present @ problem.space <= problem.space_limit[stores] + 1e-9).all(axis=1)
    good &= (count >= problem.min_items[c]) & (count <= problem.max_items[c])
    good &= ~((states == OUT) & problem.keep[c]).any(axis=1)
    good &= ~((states != OUT) & problem.never[c]).any(axis=1)
    good &= ~((states != today) & problem.locked[c]).any(axis=1)
    states, changes, present = states[good], changes[good], present[good]
    n = states.shape[0]
    if n == 0:
        return states, np.zeros(0), changes
    each = StoreDemand(
        attraction=demand.attraction[:, c : c + 1],
        dissimilarity=demand.dissimilarity,
        category_dissimilarity=demand.category_dissimilarity,
        scale=np.tile(demand.scale[:, stores], n),
        segment=demand.segment,
        cluster=np.zeros(n * stores.size, dtype=int),
        shoppers=None if demand.shoppers is None else np.tile(demand.shoppers[stores], n),
    )
    units = each.units(present.reshape(-1, n_items))[0].reshape(n, stores.size, n_items)
    listing = ((states != today) & (states == IN)).sum(axis=1)
    delisting = ((states != today) & (states == OUT)).sum(axis=1)
    cost = problem.listing_cost * listing + problem.delisting_cost * delisting
    return states, units.sum(axis=1) @ problem.value[c] - cost, changes


def enumerate_case(problem: AssortmentProblem, most: int | None = None) -> float | None:
    """Best value over every assortment that meets the limits; None when there is none."""
    limit = problem.max_changes if most is None else most
    best = {0: 0.0}
    for c in range(problem.value.shape[0]):
        _states, values, changes = _cluster_plans(problem, c)
        own: dict[int, float] = {}
        for value, k in zip(values, changes, strict=True):
            own[int(k)] = max(own.get(int(k), -np.inf), float(value))
        merged: dict[int, float] = {}
        for k, value in best.items():
            for i, more in own.items():
                if limit is None or k + i <= limit:
                    merged[k + i] = max(merged.get(k + i, -np.inf), value + more)
        best = merged
    return max(best.values()) if best else None
