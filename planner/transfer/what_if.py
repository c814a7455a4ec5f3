"""What a change of the assortment does to every item's units, store by store, then summed."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.demand.fitted import FittedModel
from planner.demand.store_demand import StoreDemand

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]
States = NDArray[np.int8]

# The states of optimise.problem; that layer stands above this one.
OUT, IN, AS_TODAY = 0, 1, 2


@dataclass(frozen=True)
class WhatIf:
    """Units per week.

    before, after (C, J): the estimate; draws_before, draws_after (K, C, J): parameter draws.
    """

    before: Floats
    after: Floats
    draws_before: Floats
    draws_after: Floats


def today_states(today: Bools, cluster: Ints, n_clusters: int) -> States:
    """States (C, J) of today's range ``today`` (S, J): all stores IN, none OUT, else AS_TODAY."""
    states = np.empty((n_clusters, today.shape[1]), dtype=np.int8)
    for c in range(n_clusters):
        inside = today[cluster == c]
        states[c] = np.where(inside.all(axis=0), IN, np.where(inside.any(axis=0), AS_TODAY, OUT))
    return states


def presence(states: States, today: Bools, cluster: Ints) -> Bools:
    """Range of every store (S, J) under ``states`` (C, J)."""
    of_store = states[cluster]
    present: Bools = (of_store == IN) | ((of_store == AS_TODAY) & today)
    return present


def interval(draws: Floats, level: float = 0.8, axis: int = 0) -> tuple[Floats, Floats]:
    """Central interval of draws along ``axis``: (low, high)."""
    tail = (1.0 - level) / 2.0
    low, high = np.quantile(draws, [tail, 1.0 - tail], axis=axis)
    return low, high


def _of_stores(demand: StoreDemand, stores: Ints) -> StoreDemand:
    """The demand of some stores only."""
    shoppers = None if demand.shoppers is None else demand.shoppers[stores]
    return replace(demand, scale=demand.scale[:, stores], cluster=demand.cluster[stores], shoppers=shoppers)


def units_by_cluster(demand: StoreDemand, present: Bools) -> Floats:
    """Units per week (K, C, J) of every draw when ``present`` (S, J) is on the shelf.

    The sum over a cluster's stores of StoreDemand.units, without the (K, S, J) array: stores of a
    cluster share v, so that D (K, S, G) and the units per attraction are matrix products.
    """
    n_draws, n_clusters, n_items = demand.attraction.shape
    membership = demand.segment[:, None] == np.arange(demand.dissimilarity.shape[1])[None, :]
    power = demand.power()[:, None, :]
    units = np.empty((n_draws, n_clusters, n_items))
    for c in range(n_clusters):
        stores = np.flatnonzero(demand.cluster == c)
        shelf = present[stores].astype(np.float64).T[:, :, None] * membership[:, None, :]
        flat = shelf.reshape(n_items, -1)
        attraction = np.ascontiguousarray(demand.attraction[:, c])
        total = (attraction @ flat).reshape(n_draws, stores.size, -1)
        level = np.where(total > 0.0, np.exp(power * np.log(np.where(total > 0.0, total, 1.0))), 0.0)
        inclusive = level.sum(axis=2)
        category = _of_stores(demand, stores).category_of(inclusive)
        rate = category / np.where(inclusive > 0.0, inclusive, 1.0)
        per_attraction = rate[:, :, None] * level / np.where(total > 0.0, total, 1.0)
        units[:, c] = attraction * (per_attraction.reshape(n_draws, -1) @ flat.T)
    return units


def what_if(fitted: FittedModel, before: Bools, after: Bools, price_ratio: Floats | None = None) -> WhatIf:
    """Compare two ranges ``before`` and ``after`` (S, J) on the same draws.

    The whole change is recomputed as one set (Conlon & Mortimer 2021), never summed from
    single transfers.  price_ratio (C, J): new regular price over today's, for the after side.
    """
    estimate, draws = fitted.estimate, fitted.draws
    if price_ratio is not None:
        estimate, draws = estimate.with_prices(price_ratio), draws.with_prices(price_ratio)
    return WhatIf(
        before=units_by_cluster(fitted.estimate, before)[0],
        after=units_by_cluster(estimate, after)[0],
        draws_before=units_by_cluster(fitted.draws, before),
        draws_after=units_by_cluster(draws, after),
    )
