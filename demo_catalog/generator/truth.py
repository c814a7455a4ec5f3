"""What delistings and offers would really do, from the same shoppers."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from demo_catalog.generator.market import TrueMarket

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class Truth:
    """Clusters C, one more row for all of them together (last); items J.

    units (C+1, J): units in an ordinary week today.
    moved (C+1, J, J+1): units receiver k gains when item i is delisted there; the last
        column leaves the category; own column 0; all zero where i is not sold today.
    offers (C+1, n, J+1): change of units of item k when offer n is listed in every store of
        the clusters it is offered to; its own column its units; last column: incremental.
    offer_items (n,): positions.  offered_to (n, C).
    """

    units: Floats
    moved: Floats
    offers: Floats
    offer_items: NDArray[np.int64]
    offered_to: Bools

    def shares(self) -> Floats:
        """moved / units, (C+1, J, J+1); NaN where the item is not sold today."""
        sold = np.where(self.units > 0.0, self.units, np.nan)
        return self.moved / sold[:, :, None]


def _by_cluster(market: TrueMarket, by_store: Floats) -> Floats:
    """Sums over the stores of each cluster, then over all, (C+1, J)."""
    rows = [by_store[market.cluster == c].sum(axis=0) for c in range(len(market.clusters))]
    return np.stack([*rows, by_store.sum(axis=0)])


def work_out(market: TrueMarket, offered_to: dict[int, Bools]) -> Truth:
    """Every single delisting and every offer, exactly.

    offered_to: item position of an offer -> clusters (C,) it is offered to.
    Stores do not touch each other, so one pass over all stores answers every cluster at once.
    """
    n_items = len(market.items)
    before = market.units(market.today)
    units = _by_cluster(market, before)
    moved = np.zeros((*units.shape, n_items + 1))
    for i in np.flatnonzero(market.today.any(axis=0)):
        without = market.today.copy()
        without[:, i] = False
        change = _by_cluster(market, market.units(without) - before)
        change[:, i] = 0.0
        moved[:, i, :n_items] = change
        moved[:, i, n_items] = units[:, i] - change.sum(axis=1)
    offers = np.zeros((units.shape[0], len(offered_to), n_items + 1))
    for n, (j, clusters) in enumerate(offered_to.items()):
        change = _by_cluster(market, market.units(market.with_item(j, clusters)) - before)
        offers[:, n, :n_items] = change
        offers[:, n, n_items] = change.sum(axis=1)
    return Truth(units, moved, offers, np.array(list(offered_to)), np.stack(list(offered_to.values())))
