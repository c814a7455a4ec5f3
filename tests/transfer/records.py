"""Small random fitted models for transfer tests."""

from __future__ import annotations

from datetime import date

import numpy as np

from planner.demand.fitted import FittedModel
from planner.demand.store_demand import StoreDemand
from planner.sales.panel import BaseWeek


def random_demand(seed: int, n_draws: int, with_shoppers: bool) -> tuple[StoreDemand, np.ndarray]:
    """Three clusters, six stores, nine items in three segments (one of a single item); today (S, J)."""
    rng = np.random.default_rng(seed)
    category = rng.uniform(0.1, 1.0, n_draws)
    demand = StoreDemand(
        attraction=np.exp(rng.normal(0.0, 0.7, (n_draws, 3, 9))),
        dissimilarity=category[:, None] * rng.uniform(0.2, 1.0, (n_draws, 3)),
        category_dissimilarity=category,
        scale=np.exp(rng.normal(-1.0 if with_shoppers else 3.0, 0.2, (n_draws, 6))),
        segment=np.array([0, 0, 0, 0, 1, 1, 1, 1, 2]),
        cluster=np.array([0, 0, 1, 1, 2, 2]),
        shoppers=rng.uniform(80.0, 120.0, 6) if with_shoppers else None,
    )
    today = rng.random((6, 9)) < 0.7
    today[:, 0] = True
    today[:, 3] = False
    return demand, today


def random_fit(seed: int, with_shoppers: bool = False) -> tuple[FittedModel, BaseWeek]:
    """A FittedModel with 30 draws and its base week."""
    estimate, today = random_demand(seed, 1, with_shoppers)
    draws, _ = random_demand(seed + 1000, 30, with_shoppers)
    rng = np.random.default_rng(seed)
    fitted = FittedModel(
        model="nested",
        with_shoppers=with_shoppers,
        log_likelihood=-1.0,
        parameters=(),
        segments=(),
        category_dissimilarity=0.5,
        category_low=0.4,
        category_high=0.6,
        dispersion=1.0,
        estimate=estimate,
        draws=draws,
        converged=True,
        iterations=5,
        evaluations=7,
        decrement=1e-9,
        seconds=0.1,
        seed=seed,
        notes=(),
    )
    price = rng.uniform(1.0, 4.0, (3, 9))
    base = BaseWeek(
        today=today,
        units=estimate.units(today)[0],
        weeks=13,
        first_week=date(2026, 1, 5),
        price=price,
        cost=rng.uniform(0.5, 1.0, 9),
        margin=price * 0.8 - 0.7,
        net_price=price * 0.8,
        shoppers=estimate.shoppers,
        space_cm=rng.uniform(5.0, 20.0, 9),
        space_limit=np.full(6, 150.0),
        space_known=True,
    )
    return fitted, base
