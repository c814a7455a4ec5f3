"""How much the sales history can say, before any model is fitted."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.catalogue.items import Catalogue
from planner.sales.panel import MarketPanel, dense

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True)
class History:
    """Plain counts of what varied.

    changes (G, C): listings and delistings of single items in single stores, per segment and cluster.
    price_variation (G,): median over items of the standard deviation of ln regular price over weeks.
    zero_share: part of the item-store-weeks on sale that sold nothing.
    thin_items: items that sold less than 50 units in all.
    """

    weeks: int
    stores: int
    items_sold: int
    thin_items: int
    changes: Ints
    price_variation: Floats
    promotion_share: float
    zero_share: float


def history(panel: MarketPanel, catalogue: Catalogue) -> History:
    """Count what varied in the panel."""
    n_stores, n_segments = len(catalogue.stores), len(catalogue.segments)
    cluster = np.array(catalogue.cluster_of_store(), dtype=np.int64)
    segment = np.array(catalogue.segment_of_item(), dtype=np.int64)
    listed = dense(panel, panel.listed, n_stores, np.nan)
    moved = (np.abs(np.nan_to_num(np.diff(listed, axis=1))) > 0.5).sum(axis=1)
    changes = np.zeros((n_segments, len(catalogue.clusters)), dtype=np.int64)
    np.add.at(changes, (segment[None, :], cluster[:, None]), moved)
    shelf = panel.on_sale > 0.0
    with np.errstate(divide="ignore"):
        price = np.log(panel.regular_price)
    variation = np.zeros(n_segments)
    for g in range(n_segments):
        spreads = [
            float(np.std(price[shelf[:, j], j])) for j in np.flatnonzero(segment == g) if shelf[:, j].any()
        ]
        variation[g] = float(np.median(spreads)) if spreads else 0.0
    units = panel.units.sum(axis=0)
    return History(
        weeks=len(panel.weeks),
        stores=n_stores,
        items_sold=int((units > 0.0).sum()),
        thin_items=int(((units > 0.0) & (units < 50.0)).sum()),
        changes=changes,
        price_variation=variation,
        promotion_share=float(panel.promotion[shelf].mean()) if shelf.any() else 0.0,
        zero_share=float((panel.units[shelf] == 0.0).mean()) if shelf.any() else 0.0,
    )
