"""Prices for every cell: what was paid, the regular price, and the price in force where nothing sold."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.sales.runs import carry, upper_median

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True)
class PriceSettings:
    """window: weeks that a price cut may last and still be a promotion.  promotion_cut: a price this
    far below the regular one is a promotion when no flag says so.  same: store prices this near to
    their cluster's are the same price.
    """

    window: int = 6
    promotion_cut: float = 0.05
    same: float = 0.01


@dataclass(frozen=True)
class CellPrices:
    """price, regular, promotion (S, W, J); price and regular NaN for items without any price."""

    price: Floats
    regular: Floats
    promotion: Floats


def running_level(paid: Floats, window: int, axis: int = 0) -> Floats:
    """The upper level of a price over weeks: cuts shorter than ``window`` are bridged, steps are kept.

    The lower of the highest price in the weeks behind and in the weeks ahead (both with the week
    itself).  Where fewer than ``window`` weeks lie on one side, the other side alone decides, so that
    a promotion at the end of the history is not taken for a new price.
    """
    values = np.moveaxis(carry(paid, axis), axis, 0)
    n = values.shape[0]
    behind, ahead = values.copy(), values.copy()
    for k in range(1, min(window, n - 1) + 1):
        behind[k:] = np.fmax(behind[k:], values[:-k])
        ahead[:-k] = np.fmax(ahead[:-k], values[k:])
    level = np.minimum(behind, ahead)
    if n > window:
        level[:window] = ahead[:window]
        level[n - window :] = behind[n - window :]
    else:
        level = np.fmax(behind, ahead)
    result: Floats = np.moveaxis(level, 0, axis)
    return result


def by_cluster(cells: Floats, cluster: Ints, n_clusters: int) -> Floats:
    """Upper median over the stores of every cluster: (C, W, J) from (S, W, J)."""
    return np.stack([upper_median(cells[cluster == c]) for c in range(n_clusters)])


def with_chain(levels: Floats) -> Floats:
    """Clusters (C, W, J) without a price that week take the other clusters', each times the usual
    ratio between the two clusters' prices of the item.
    """
    filled = levels.copy()
    for c in range(levels.shape[0]):
        missing = np.isnan(levels[c])
        if not missing.any():
            continue
        others = [k for k in range(levels.shape[0]) if k != c]
        guesses = [levels[k] * _usual(levels[c] / levels[k]) for k in others]
        if guesses:
            filled[c] = np.where(missing, upper_median(np.stack(guesses)), levels[c])
    return filled


def _usual(ratio: Floats) -> Floats:
    """The median over weeks (J,) of a ratio (W, J), 1 where it is never known."""
    middle = upper_median(ratio)
    return np.where(np.isnan(middle), 1.0, middle)


def _store_factor(cells: Floats, level: Floats, cluster: Ints, same: float) -> Floats:
    """How far (S, J) a store's prices lie from its cluster's, 1 within ``same``."""
    factor = np.ones((cells.shape[0], cells.shape[2]))
    for s, c in enumerate(cluster):
        ratio = cells[s] / level[c]
        middle = upper_median(ratio)
        known = (~np.isnan(ratio)).sum(axis=0) >= 3
        apart = known & (np.abs(middle - 1.0) > same)
        factor[s] = np.where(apart, middle, 1.0)
    return factor


def fill_prices(
    paid: Floats,
    shown: Floats,
    regular: Floats | None,
    promotion: Floats | None,
    cluster: Ints,
    settings: PriceSettings,
) -> CellPrices:
    """Prices and promotions of every cell (S, W, J).

    paid: money per unit where something sold, else NaN.  shown: a price column's value, NaN where
    none.  regular, promotion: columns' values, NaN where the cell has no row; None: no such column.
    An unsold cell carries the price of its cluster that week, else of the chain, else the regular
    price, which carries forward and back.
    """
    n_clusters = int(cluster.max()) + 1 if cluster.size else 0
    known = np.where(np.isnan(paid), shown, paid)
    flagged = None
    if promotion is not None:
        share = np.stack([_mean(promotion[cluster == c]) for c in range(n_clusters)])
        flagged = np.where(np.isnan(promotion), np.nan_to_num(share)[cluster] > 0.5, promotion > 0.5)
    source = _regular_source(known, regular, flagged)
    level = by_cluster(source, cluster, n_clusters)
    level = with_chain(level)
    if regular is None and flagged is None:
        level = running_level(level, settings.window, axis=1)
    week_level = with_chain(by_cluster(known, cluster, n_clusters))
    # An item that was only ever sold on promotion has no other price.
    level = carry(level)
    level = np.where(np.isnan(level), carry(week_level), level)
    factor = _store_factor(known, week_level, cluster, settings.same)
    full = level[cluster] * factor[:, None, :]
    if regular is not None:
        full = np.where(np.isnan(regular), full, regular)
    week_price = week_level[cluster] * factor[:, None, :]
    price = np.where(np.isnan(known), np.where(np.isnan(week_price), full, week_price), known)
    if flagged is None:
        with np.errstate(invalid="ignore"):
            flagged = price < (1.0 - settings.promotion_cut) * full
    return CellPrices(price, full, flagged.astype(np.float64))


def _regular_source(known: Floats, regular: Floats | None, flagged: NDArray[np.bool_] | None) -> Floats:
    """The cells that tell the regular price."""
    if regular is not None:
        return regular
    return known if flagged is None else np.where(flagged, np.nan, known)


def _mean(cells: Floats) -> Floats:
    """Mean over axis 0 of the known values, NaN when none."""
    known = ~np.isnan(cells)
    count = known.sum(axis=0)
    total = np.where(known, cells, 0.0).sum(axis=0)
    mean: Floats = np.where(count > 0, total / np.maximum(count, 1), np.nan)
    return mean
