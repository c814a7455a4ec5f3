"""Panels simulated from the nested model itself, for recovery tests."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date, timedelta

import numpy as np

from planner.catalogue.items import Catalogue, Item, Store
from planner.sales.panel import BaseWeek, MarketPanel


@dataclass(frozen=True)
class Recipe:
    """Sizes and true values of a simulated panel."""

    items: int = 24
    ratio: tuple[float, ...] = (0.35, 0.6, 0.85)
    category: float = 0.4
    stores: int = 12
    weeks: int = 52
    units_per_item: float = 12.0
    price: float = -2.0
    promotion: float = 0.4
    shoppers: float | None = None
    changes: float = 0.35
    seed: int = 5


def simulate(recipe: Recipe) -> tuple[MarketPanel, Catalogue, BaseWeek, np.ndarray]:
    """Panel, catalogue, base week and the true scaled item effects (C, J)."""
    rng = np.random.default_rng(recipe.seed)
    n, s, w, g = recipe.items, recipe.stores, recipe.weeks, len(recipe.ratio)
    segment = np.sort(np.arange(n) % g)
    cluster = np.arange(s) % 2
    effects = rng.normal(0.0, 0.8, n) + rng.normal(0.0, 0.2, (2, n))
    listed = np.repeat(rng.random((s, 1, n)) < 0.7, w, axis=1)
    for i, j in zip(*np.nonzero(rng.random((s, n)) < recipe.changes), strict=True):
        at = rng.integers(6, w - 6)
        listed[i, at:, j] = ~listed[i, at:, j]
    listed[:, :, ::g] |= ~listed.any(axis=2, keepdims=True)
    on_sale = listed * (rng.random((s, w, n)) > 0.02)
    regular = np.exp(rng.normal(1.0, 0.3, n)) * np.exp(np.cumsum(rng.normal(0.0, 0.03, (w, n)), axis=0))
    promo = rng.random((w, n)) < 0.08
    price = np.where(promo, 0.8, 1.0) * regular
    base_price = regular[-1]
    utility = (
        effects[cluster][:, None] + recipe.price * np.log(regular / base_price) + recipe.promotion * promo
    )
    weight = on_sale * np.exp(utility)
    members = (segment[:, None] == np.arange(g)).astype(float)
    total = weight @ members
    ratio = np.array(recipe.ratio)
    level = np.where(total > 0, np.exp(ratio * np.log(np.maximum(total, 1e-300))), 0.0)
    inclusive = level.sum(axis=2)
    store = rng.normal(0.0, 0.2, s)
    week = rng.normal(0.0, 0.1, w)
    eta = store[:, None] + week + recipe.category * np.log(inclusive)
    share = (weight / np.maximum(total, 1e-300)[:, :, segment]) * (level / inclusive[:, :, None])[
        :, :, segment
    ]
    if recipe.shoppers is None:
        eta = eta - eta.mean() + np.log(recipe.units_per_item * n * 0.6)
        category = rng.poisson(np.exp(eta))
        shoppers = None
    else:
        eta = eta - eta.mean() + np.log(0.3)
        visits = rng.poisson(recipe.shoppers, (s, w))
        category = rng.binomial(visits, 1.0 / (1.0 + np.exp(-eta)))
        shoppers = visits.reshape(-1).astype(float)
    flat = share.reshape(-1, n)
    units = np.stack([rng.multinomial(k, p / p.sum()) for k, p in zip(category.ravel(), flat, strict=True)])
    full = np.broadcast_to
    panel = MarketPanel(
        weeks=tuple(date(2024, 1, 1) + timedelta(weeks=k) for k in range(w)),
        store_index=np.repeat(np.arange(s), w),
        week_index=np.tile(np.arange(w), s),
        units=units.astype(float),
        listed=listed.reshape(-1, n),
        on_sale=on_sale.reshape(-1, n).astype(float),
        regular_price=full(regular, (s, w, n)).reshape(-1, n).copy(),
        price=full(price, (s, w, n)).reshape(-1, n).copy(),
        promotion=full(promo, (s, w, n)).reshape(-1, n).astype(float),
        display=np.zeros((s * w, n)),
        shoppers=shoppers,
    )
    catalogue = Catalogue(
        "simulated",
        tuple(Item(f"i{j:02d}", segment=f"segment {segment[j]}", brand=f"brand {j % 5}") for j in range(n)),
        tuple(Store(f"s{i:02d}", cluster=f"cluster {cluster[i]}") for i in range(s)),
    )
    window = panel.week_index >= w - 13
    mean_units = np.stack([units[window & (panel.store_index == i)].mean(axis=0) for i in range(s)])
    visits_now = None
    if shoppers is not None:
        visits_now = np.array([shoppers[window & (panel.store_index == i)].mean() for i in range(s)])
    base = BaseWeek(
        today=listed[:, -1],
        units=mean_units,
        weeks=13,
        first_week=panel.weeks[-13],
        price=np.tile(base_price, (2, 1)),
        cost=0.6 * base_price,
        margin=np.tile(0.4 * base_price, (2, 1)),
        net_price=np.tile(base_price, (2, 1)),
        shoppers=visits_now,
        space_cm=np.ones(n),
        space_limit=listed[:, -1].sum(axis=1).astype(float),
        space_known=False,
    )
    return panel, catalogue, base, effects
