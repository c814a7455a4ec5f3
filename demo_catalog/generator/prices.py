"""Hidden quality, costs, regular prices and the promotion calendar."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from demo_catalog.generator.lists import BRANDS, CHAI, CLUSTERS, KEPT, ItemFacts, key_of
from demo_catalog.generator.settings import DemoSettings

Floats = NDArray[np.float64]

# Consumer price of twenty servings at a level of 1, by segment.
_SEGMENT_PRICE = np.array([1.95, 2.25, 1.99, 2.49, 2.15, 2.29, 3.15])
_ZONE = np.array([1.0, 0.97, 1.04])
_DEPTHS = np.array([0.15, 0.20, 0.25, 0.33])


@dataclass(frozen=True)
class ItemMoney:
    """What items cost, sell for and are worth.  J items, C clusters, W weeks.

    quality (J,): hidden, known to shoppers only.  drift (W, J): how liking moves over time.
    regular (W, C, J): regular consumer price.  cost (W, J): unit cost ex VAT.
    depth (W, J): price cut of the chain-wide promotion, 0 where there is none.
    vat (J,).  width_cm, facings, min_facings, case_size (J,).  keep (J,).
    """

    quality: Floats
    drift: Floats
    regular: Floats
    cost: Floats
    depth: Floats
    vat: Floats
    width_cm: Floats
    facings: NDArray[np.int64]
    min_facings: NDArray[np.int64]
    case_size: NDArray[np.int64]
    keep: NDArray[np.bool_]

    @property
    def space_cm(self) -> Floats:
        """Shelf space of each item, (J,)."""
        return self.width_cm * self.facings


def price_point(price: Floats) -> Floats:
    """The nearest price that ends in 9 cents (5 or 9 below one fifty)."""
    cents = np.rint(price * 100.0)
    nines = np.rint((cents + 1.0) / 10.0) * 10.0 - 1.0
    return np.maximum(nines, 49.0) / 100.0


def draw_money(items: tuple[ItemFacts, ...], settings: DemoSettings, rng: np.random.Generator) -> ItemMoney:
    """Everything about money and packs; prices lean on hidden quality, as buyers' prices do."""
    level = np.array([BRANDS[item.brand].level for item in items])
    own = np.array([BRANDS[item.brand].own_label for item in items])
    bags = np.array([item.bags for item in items], dtype=np.float64)
    segment = np.array([item.segment for item in items])
    organic = np.array([item.organic for item in items])
    quality = rng.normal(0.0, 0.35, len(items)) + 0.2 * rng.laplace(0.0, 1.0, len(items))
    quality += 0.8 * np.log(level)
    place = {key_of(item): j for j, item in enumerate(items)}
    for j, item in enumerate(items):
        if item.like:
            quality[j] = 0.8 * quality[place[item.like]] + 0.2 * quality[j]
    wanted = (
        _SEGMENT_PRICE[segment]
        * level
        * (bags / 20.0) ** 0.72
        * np.where(organic, 1.14, 1.0)
        * np.exp(0.18 * quality + rng.normal(0.0, 0.07, len(items)))
    )
    vat = np.where(segment == CHAI, 0.20, 0.10)
    rate = np.where(own, rng.uniform(0.36, 0.46, len(items)), rng.uniform(0.24, 0.36, len(items)))
    cost0 = np.round(wanted / (1.0 + vat) * (1.0 - rate), 2)
    cost = _costs(items, cost0, settings, rng)
    drift = _drift(len(items), settings, rng)
    regular = _regular(wanted, cost, drift, settings, rng)
    facings = np.where(bags >= 40, 1, 2) + (rng.random(len(items)) < 0.35)
    widths = np.where(bags >= 80, 15.5, np.where(bags >= 40, 12.8, 7.6)) + np.round(
        rng.uniform(0, 2, len(items)), 1
    )
    return ItemMoney(
        quality=quality,
        drift=drift,
        regular=regular,
        cost=cost,
        depth=_promotions(items, settings, rng),
        vat=vat,
        width_cm=widths,
        facings=facings,
        min_facings=np.minimum(facings, np.where(bags >= 40, 1, 1 + (rng.random(len(items)) < 0.3))),
        case_size=rng.choice(np.array([6, 8, 10, 12]), len(items)),
        keep=np.array([key_of(item) in KEPT for item in items]),
    )


def _costs(
    items: tuple[ItemFacts, ...], cost0: Floats, settings: DemoSettings, rng: np.random.Generator
) -> Floats:
    """Unit cost by week: each supplier's yearly round, and single items now and then."""
    weeks = settings.weeks
    factor = np.ones((weeks, len(items)))
    for supplier in sorted({brand.supplier for brand in BRANDS}):
        mine = np.array([BRANDS[item.brand].supplier == supplier for item in items])
        for start in (rng.integers(6, 24), rng.integers(44, 66)):
            touched = mine & (rng.random(len(items)) < 0.75)
            factor[start:, touched] *= 1.0 + rng.uniform(0.01, 0.05)
    for j in np.flatnonzero(rng.random(len(items)) < 0.25):
        factor[rng.integers(4, weeks - 6) :, j] *= 1.0 + rng.uniform(-0.05, 0.04)
    return np.round(cost0[None, :] * factor, 2)


def _drift(n_items: int, settings: DemoSettings, rng: np.random.Generator) -> Floats:
    """Liking moves slowly: a damped walk in steps of a month, fresh for every item."""
    months = settings.weeks // 4 + 2
    walk = np.zeros((months, n_items))
    for m in range(1, months):
        walk[m] = 0.9 * walk[m - 1] + rng.normal(0.0, 0.05, n_items)
    return np.repeat(walk, 4, axis=0)[: settings.weeks]


def _regular(
    wanted: Floats, cost: Floats, drift: Floats, settings: DemoSettings, rng: np.random.Generator
) -> Floats:
    """Regular price by week and price zone; changed a few times, zones not on the same Monday."""
    weeks, n_items = settings.weeks, wanted.size
    regular = np.empty((weeks, len(CLUSTERS), n_items))
    regular[:] = price_point(wanted[None, :] * _ZONE[:, None])[None]
    for j in range(n_items):
        changes = np.sort(rng.choice(np.arange(5, weeks - 4), size=rng.integers(1, 4), replace=False))
        for week in changes:
            pass_on = (cost[week, j] / cost[0, j]) ** 0.8
            lean = np.exp(0.25 * drift[week, j] + rng.normal(0.0, 0.045))
            later = rng.integers(0, 4, len(CLUSTERS))
            for c in range(len(CLUSTERS)):
                start = min(week + later[c], weeks - 1)
                zone = _ZONE[c] * np.exp(rng.normal(0.0, 0.012))
                regular[start:, c, j] = price_point(np.array([wanted[j] * zone * pass_on * lean]))[0]
    return regular


def _promotions(items: tuple[ItemFacts, ...], settings: DemoSettings, rng: np.random.Generator) -> Floats:
    """Chain-wide calendar: a brand is on promotion for two weeks with some of its items."""
    depth = np.zeros((settings.weeks, len(items)))
    for k, brand in enumerate(BRANDS):
        mine = np.array([j for j, item in enumerate(items) if item.brand == k and item.launch < 3])
        week = int(rng.integers(1, brand.promotion_gap))
        while week < settings.weeks:
            chosen = mine[rng.random(mine.size) < (0.3 if brand.own_label else 0.55)]
            depth[week : week + 2, chosen] = rng.choice(_DEPTHS)
            week += 3 + int(rng.poisson(max(brand.promotion_gap - 3, 1)))
    return depth
