"""What the shoppers really do in one ordinary week, for any assortment."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True)
class TrueMarket:
    """Expected demand of the same households in an ordinary week at the end of the history.

    Regular prices of the last week, everything on the shelf, no promotion, the mean
    season of the last weeks.  Nothing is drawn: each kind of need of each household
    takes the first item of its order of liking that is on its store's shelf.

    items (J): codes, offers last; resized packs under their new code.
    stores (S), clusters (C): codes.  cluster (S,): position of each store's cluster.
    today (S, J): the range of the last week.
    price (C, J): regular consumer price.  cost (J,): unit cost ex VAT.  vat (J,).
    space_cm (J,), space_limit (S,).  is_offer (J,).
    order (N, L): items in falling order of liking, J after the last accepted one.
    needs (N,): per week.  store (N,): position.
    """

    items: tuple[str, ...]
    stores: tuple[str, ...]
    clusters: tuple[str, ...]
    cluster: Ints
    today: Bools
    price: Floats
    cost: Floats
    vat: Floats
    space_cm: Floats
    space_limit: Floats
    is_offer: Bools
    order: Ints
    needs: Floats
    store: Ints

    @property
    def unit_margin(self) -> Floats:
        """Cash margin per unit ex VAT, (C, J)."""
        return self.price / (1.0 + self.vat) - self.cost

    def units(self, present: Bools) -> Floats:
        """Expected units per ordinary week (S, J) with ``present`` (S, J) on the shelves."""
        n_stores, n_items = self.today.shape
        shelf = np.zeros((n_stores, n_items + 1), dtype=bool)
        shelf[:, :n_items] = present
        cell = self.store[:, None] * (n_items + 1) + self.order
        found = shelf.ravel()[cell]
        first = found.argmax(axis=1)
        rows = np.arange(first.size)
        buys = found[rows, first]
        taken = cell[rows, first][buys]
        bought = np.bincount(taken, weights=self.needs[buys], minlength=shelf.size).astype(np.float64)
        return bought.reshape(n_stores, n_items + 1)[:, :n_items]

    def margin(self, present: Bools) -> float:
        """Expected cash margin ex VAT per ordinary week over all stores."""
        return float((self.units(present) * self.unit_margin[self.cluster]).sum())

    def with_item(self, item: int, clusters: Bools) -> Bools:
        """Today's range (S, J) with one more item in every store of the marked clusters (C,)."""
        wider = self.today.copy()
        wider[clusters[self.cluster], item] = True
        return wider
