"""Counts of what varied, against a hand-made panel."""

from datetime import date, timedelta

import numpy as np

from planner.catalogue.items import Catalogue, Item, Store
from planner.evidence.history import history
from planner.sales.panel import MarketPanel


def test_counts_of_a_hand_made_history():
    """Two stores, four weeks: item b comes in store 1, item c leaves store 0; a's price moves once."""
    listed = np.ones((2, 4, 3), dtype=bool)
    listed[1, :2, 1] = False
    listed[0, 3:, 2] = False
    units = np.where(listed, 5.0, 0.0)
    units[0, 0, 0] = 0.0
    price = np.ones((2, 4, 3))
    price[:, 2:, 0] = np.e
    promotion = np.zeros((2, 4, 3))
    promotion[0, 1, 0] = 1.0
    flat = (8, 3)
    panel = MarketPanel(
        weeks=tuple(date(2026, 1, 5) + timedelta(weeks=k) for k in range(4)),
        store_index=np.repeat(np.arange(2), 4),
        week_index=np.tile(np.arange(4), 2),
        units=units.reshape(flat),
        listed=listed.reshape(flat),
        on_sale=listed.reshape(flat).astype(float),
        regular_price=price.reshape(flat),
        price=price.reshape(flat),
        promotion=promotion.reshape(flat),
        display=np.zeros(flat),
        shoppers=None,
    )
    catalogue = Catalogue(
        "test",
        (Item("a", segment="one"), Item("b", segment="one"), Item("c", segment="two")),
        (Store("0", cluster="x"), Store("1", cluster="y")),
    )
    found = history(panel, catalogue)
    np.testing.assert_array_equal(found.changes, [[0, 1], [1, 0]])
    assert (found.weeks, found.stores, found.items_sold, found.thin_items) == (4, 2, 3, 3)
    assert found.zero_share == 1 / 21
    assert found.promotion_share == 1 / 21
    # Median over a (half the weeks dearer by one log point) and b (never).
    np.testing.assert_allclose(found.price_variation, [0.25, 0.0])
