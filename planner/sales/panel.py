"""The market panel: what was on the shelf and what sold, per store, week and item.

A market is one store in one week.  T markets (sorted by store, then week),
J items, S stores, W weeks.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class MarketPanel:
    """Sales history as arrays.  Item order is the catalogue's (offers included, never on sale).

    weeks: Monday of each week (W), consecutive.
    store_index, week_index (T,): the market's store and week.
    units (T, J): units sold, net of returns, >= 0 (weighed items: content).
    listed (T, J): the item was in the store's range that week.
    on_sale (T, J) in [0, 1]: part of the week on the shelf; 0 where not listed.
    regular_price, price (T, J): consumer price, money per unit; filled for every
        cell (unsold cells carry the price in force), never 0 for items ever sold.
    promotion, display (T, J): 0/1 flags as floats.
    shoppers (T,): shoppers who could have bought; None when not loaded.
    """

    weeks: tuple[date, ...]
    store_index: Ints
    week_index: Ints
    units: Floats
    listed: Bools
    on_sale: Floats
    regular_price: Floats
    price: Floats
    promotion: Floats
    display: Floats
    shoppers: Floats | None

    @property
    def n_markets(self) -> int:
        """T."""
        return int(self.units.shape[0])

    @property
    def n_items(self) -> int:
        """J."""
        return int(self.units.shape[1])


@dataclass(frozen=True)
class BaseWeek:
    """One ordinary week today: regular prices, no promotions, everything fully on sale.

    today (S, J): the item is in the store's range now.
    units (S, J): mean units per week over the baseline window, all weeks counted.
    weeks (n): how many weeks the baseline window holds; first_week its Monday.
    price (C, J): regular consumer price now, per cluster (offers: their price).
    cost (J,): unit cost now, NaN where unknown.
    margin (C, J): price / (1 + VAT) - cost: cash margin per unit ex VAT, NaN where cost is unknown.
    net_price (C, J): price / (1 + VAT).
    shoppers (S,): mean per week over the window, None when not loaded.
    space_cm (J,): shelf space an item takes (1 for every item when none is known).
    space_limit (S,): space of each store, in the unit of space_cm.
    space_known: False when the limit is today's number of items, not cm.
    notes: assumptions that were made, in words, to be shown.
    """

    today: Bools
    units: Floats
    weeks: int
    first_week: date
    price: Floats
    cost: Floats
    margin: Floats
    net_price: Floats
    shoppers: Floats | None
    space_cm: Floats
    space_limit: Floats
    space_known: bool
    notes: tuple[str, ...] = ()


def dense(panel: MarketPanel, values: Floats | Bools, n_stores: int, fill: float) -> Floats:
    """(T, J) as (S, W, J); store-weeks without a market get ``fill``."""
    cube = np.full((n_stores, len(panel.weeks), values.shape[1]), fill)
    cube[panel.store_index, panel.week_index] = values
    return cube
